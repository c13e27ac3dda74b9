/* A time course as rows: integrate from the file's initial state and read the
 * dense output at evenly spaced times, so the rows do not shorten the steps.
 *
 * Row k stands at k*every, computed as a product so that nothing drifts; the
 * last one stands at the end exactly.  Rows that were reached are kept whatever
 * happens after them.
 *
 * A loose tolerance can miss a pulse without a sign in any step's error.  So a run
 * above LOOSE is made again a hundred times tighter and compared; where they
 * disagree, or the loose one failed, the tighter one takes its place and is compared
 * in turn.  (analysis/run_compare.c) */
#include <math.h>
#include <string.h>

#include "analysis/integrate.h"
#include "analysis/run_compare.h"
#include "base/memory.h"
#include "base/status.h"

#define DEFAULT_ROWS 200
#define MOST_ROWS 1e8
#define LOOSE 1e-6               /* relative tolerances above are checked against tighter ones */
#define TIGHTER 0.01

typedef struct course {
    lb_run *run;
    integrator *it;
    lb_evaluator *evaluator;
    double until, every;
    size_t last;                /* index of the row at the end */
    size_t capacity_t, capacity_x, capacity_reading;   /* in rows */
    double *x;                  /* [n] */
} course;

void lb_run_free(lb_run *run)
{
    if (!run)
        return;
    memory_free(run->reading);
    memory_free(run->x);
    memory_free(run->t);
    memory_free(run);
}

static double row_time(const course *c, size_t row)
{
    return row >= c->last ? c->until : (double)row * c->every;
}

/* One row; a reading without a finite value (a logarithm of zero) is NAN. */
static lb_status add_row(course *c, double t, const double *x, lb_error *err)
{
    lb_run *run = c->run;
    size_t row = run->rows, n = (size_t)run->states, readings = (size_t)run->readings;
    if (memory_grow(&run->t, &c->capacity_t, row, sizeof *run->t) ||
        memory_grow(&run->x, &c->capacity_x, row, n * sizeof *run->x) ||
        memory_grow(&run->reading, &c->capacity_reading, row, readings * sizeof *run->reading))
        return status_no_memory(err);
    run->t[row] = t;
    memcpy(run->x + row * n, x, n * sizeof *x);
    if (readings > 0)
        lb_readings(c->evaluator, x, run->reading + row * readings);
    for (size_t i = row * readings; i < (row + 1) * readings; i++)
        if (!isfinite(run->reading[i]))
            run->reading[i] = NAN;
    run->rows++;
    return LB_OK;
}

/* The rows up to the time reached. */
static lb_status add_rows(course *c, lb_error *err)
{
    lb_status status = LB_OK;
    while (status == LB_OK && c->run->rows <= c->last && row_time(c, c->run->rows) <= integrator_time(c->it)) {
        double t = row_time(c, c->run->rows);
        status = integrator_dense(c->it, t, c->x, err);
        if (status == LB_OK)
            status = add_row(c, t, c->x, err);
    }
    return status;
}

static lb_status follow(course *c, const lb_monitor *monitor, lb_error *err)
{
    lb_initial(c->evaluator, c->x);
    integrator_start(c->it, 0, c->x);
    lb_status status = add_row(c, 0, c->x, err);
    while (status == LB_OK && integrator_time(c->it) < c->until) {
        status = integrator_step(c->it, c->until, err);
        if (status == LB_OK)
            status = add_rows(c, err);
        if (monitor && monitor->progress && integrator_steps(c->it) % 64 == 0)
            monitor->progress(monitor->context, "run", integrator_time(c->it) / c->until);
    }
    c->run->tolerance = integrator_tolerance(c->it);
    c->run->method = integrator_method(c->it);
    c->run->why = integrator_reason(c->it);
    c->run->steps = integrator_steps(c->it);
    c->run->rejected = integrator_rejected(c->it);
    c->run->interrupted = status == LB_E_STOPPED;
    return c->run->interrupted ? LB_OK : status;
}

static lb_status check_options(const lb_run_options *options, lb_error *err)
{
    if (!(options->until > 0 && options->until < INFINITY))
        return status_raise(err, LB_E_ARG, NULL, "the end time must be positive, not %g", options->until);
    if (!(options->every >= 0 && options->every < INFINITY))
        return status_raise(err, LB_E_ARG, NULL, "the spacing of rows must be positive, not %g", options->every);
    if (options->every > 0 && options->until / options->every > MOST_ROWS)
        return status_raise(err, LB_E_LIMIT, "choose a wider spacing", "more than %g rows", MOST_ROWS);
    return LB_OK;
}

/* The end takes the place of a row that is within rounding of it. */
static size_t index_of_end(double until, double every)
{
    double count = until / every, whole = floor(count);
    return (size_t)whole + (count - whole > 1e-9 * count || whole == 0);
}

/* One run with the options as they are; *out NULL without memory. */
static lb_status solve(const lb_system *system, const lb_run_options *options, lb_run **out, lb_error *err)
{
    *out = NULL;
    lb_status status = LB_OK;
    const integrator_options how = {.tolerance = options->tolerance, .absolute = options->absolute,
                                    .method = options->method, .monitor = options->monitor};
    course c = {.until = options->until};
    c.every = options->every > 0 ? options->every : options->until / DEFAULT_ROWS;
    c.last = index_of_end(c.until, c.every);
    c.run = memory_zeroed(1, sizeof *c.run);
    c.x = memory_array((size_t)system->n, sizeof *c.x);
    if (!c.run || !c.x) {
        status = status_no_memory(err);
        goto done;
    }
    c.run->states = system->n;
    c.run->readings = lb_network_readings(system->network);
    status = lb_evaluator_new(system, &c.evaluator, err);
    if (status == LB_OK)
        status = integrator_new(c.evaluator, &how, &c.it, err);
    if (status != LB_OK)
        goto done;
    status = follow(&c, options->monitor, err);
    if (status != LB_E_NOMEM) {
        *out = c.run;
        c.run = NULL;
    }
done:
    integrator_free(c.it);
    lb_evaluator_free(c.evaluator);
    lb_run_free(c.run);
    memory_free(c.x);
    return status;
}

static bool may_be_loose(lb_status status)
{
    return status == LB_E_STEP || status == LB_E_NEGATIVE || status == LB_E_FINITE;
}

/* Another run, TIGHTER times as tight; absolute [n] is room for its tolerances. */
static lb_status solve_tighter(const lb_system *system, const lb_run_options *options, double tolerance,
                               double *absolute, lb_run **out, lb_error *err)
{
    lb_run_options tighter = *options;
    tighter.tolerance = tolerance * TIGHTER;
    for (int i = 0; options->absolute && i < system->n; i++)
        absolute[i] = options->absolute[i] * (tighter.tolerance / options->tolerance);
    tighter.absolute = options->absolute ? absolute : NULL;
    return solve(system, &tighter, out, err);
}

/* *run, which ended with `status`, is replaced by tighter ones until two agree. */
static lb_status validate(const lb_system *system, const lb_run_options *options, lb_status status, lb_run **run,
                          lb_error *err)
{
    double *absolute = memory_array((size_t)system->n, sizeof *absolute);
    if (!absolute) {
        lb_run_free(*run);
        *run = NULL;
        return status_no_memory(err);
    }
    while ((*run)->tolerance > LOOSE && !(*run)->interrupted) {
        lb_run *tighter = NULL;
        lb_error other = {0};
        lb_status tighter_status = solve_tighter(system, options, (*run)->tolerance, absolute, &tighter, &other);
        if (!tighter) {
            lb_run_free(*run);
            *run = NULL;
            status = status_raise(err, tighter_status, NULL, "%s", other.message);
            break;
        }
        if (tighter->interrupted || (tighter_status == status && run_agree(*run, tighter))) {
            lb_run_free(tighter);
            break;
        }
        tighter->tightened = may_be_loose(status) ? run_failed_text : run_differed_text;
        lb_run_free(*run);
        *run = tighter;
        status = tighter_status;
        if (err)
            *err = other;
    }
    memory_free(absolute);
    return status;
}

lb_status lb_run_solve(const lb_system *system, const lb_run_options *options, lb_run **out, lb_error *err)
{
    *out = NULL;
    lb_status status = check_options(options, err);
    if (status == LB_OK)
        status = solve(system, options, out, err);
    if (*out && (status == LB_OK || may_be_loose(status)))
        status = validate(system, options, status, out, err);
    return status;
}

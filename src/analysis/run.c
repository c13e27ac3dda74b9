/* A time course as rows: integrate from the file's initial state and read the
 * dense output at evenly spaced times, so the rows do not shorten the steps.
 *
 * Row k stands at k*every, computed as a product so that nothing drifts; the
 * last one stands at the end exactly.  Rows that were reached are kept whatever
 * happens after them. */
#include <math.h>
#include <string.h>

#include "analysis/integrate.h"
#include "base/memory.h"
#include "base/status.h"

#define DEFAULT_ROWS 200
#define MOST_ROWS 1e8

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

lb_status lb_run_solve(const lb_system *system, const lb_run_options *options, lb_run **out, lb_error *err)
{
    *out = NULL;
    lb_status status = check_options(options, err);
    if (status != LB_OK)
        return status;
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

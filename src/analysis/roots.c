/* Multistart search for the roots of the steady-state equations.
 *
 * Newton's method from low-discrepancy starts, then from more starts with the
 * roots found so far divided out, which reaches roots with small basins.  Three
 * starts in four are relaxed a little or a lot before.  A root is new when it is
 * further from each known one than their errors.
 *
 * A root with singular derivatives may be isolated (a fold) or one point of a
 * continuum.  That is decided by going along the null direction and solving
 * again: in a continuum the solution stays away and is singular too. */
#include "analysis/roots.h"

#include <math.h>
#include <string.h>

#include "analysis/newton.h"
#include "analysis/starts.h"
#include "base/memory.h"
#include "base/status.h"

enum { MOST_ROUNDS = 60 };

static const double CONTINUUM_STEP = 0.2;
static const double VANISHING = 10;         /* decades below the natural range */
static const double UNBOUNDED = 8;          /* decades above it */

struct search {
    equations *eq;
    newton newton;
    starts starts;
    const roots_options *options;
    roots *out;
    double *u, *walked;     /* [count] */
    lb_error *err;
};

void roots_clear(roots *r)
{
    for (int i = 0; i < r->count; i++)
        memory_free(r->u[i]);
    memory_free(r->u);
    *r = (roots){0};
}

/* ---- Keeping roots ------------------------------------------------------------------ */

/* In the unknowns: relative for what is unsigned. */
static double distance(const equations *eq, const double *a, const double *b)
{
    double largest = 0;
    for (int i = 0; i < eq->count; i++) {
        double scale = eq->is_signed[i] ? 1 + fabs(b[i]) : 1;
        largest = fmax(largest, fabs(a[i] - b[i]) / scale);
    }
    return largest;
}

static bool is_known(const struct search *s, const double *u, double tolerance)
{
    for (int i = 0; i < s->out->count; i++)
        if (distance(s->eq, u, s->out->u[i]) <= tolerance)
            return true;
    return false;
}

static lb_status keep(struct search *s, const double *u)
{
    roots *out = s->out;
    size_t bytes = (size_t)s->eq->count * sizeof *u;
    double *copy = memory_alloc(bytes);
    if (!copy)
        return status_no_memory(s->err);
    if (memory_grow(&out->u, &out->capacity, (size_t)out->count, sizeof *out->u) != 0) {
        memory_free(copy);
        return status_no_memory(s->err);
    }
    memcpy(copy, u, bytes);
    for (int i = 0; i < s->eq->count; i++)
        if (s->eq->is_signed[i] && fabs(copy[i]) < 1e-14)
            copy[i] = 0;    /* zero to rounding of the unit */
    out->u[out->count++] = copy;
    return LB_OK;
}

/* Is the singular root u one point of a continuum? */
static lb_status test_continuum(struct search *s, const double *u, bool *is_continuum)
{
    newton_report report;
    *is_continuum = false;
    lb_status status = newton_null_direction(&s->newton, u, s->walked, s->err);
    if (status != LB_OK)
        return status == LB_E_NUMERIC || status == LB_E_FINITE ? LB_OK : status;
    for (int i = 0; i < s->eq->count; i++)
        s->walked[i] = u[i] + CONTINUUM_STEP * s->walked[i];
    status = newton_solve(&s->newton, s->walked, NULL, 0, &report, s->err);
    if (status == LB_OK && report.converged && report.rank < s->eq->count)
        *is_continuum = distance(s->eq, s->walked, u) > CONTINUUM_STEP / 10 / sqrt(s->eq->count);
    return status;
}

/* Close to zero any power of a species is zero to rounding, and its balance with
 * it; far up a rate that saturates has lost what it still lacks.  Where the
 * derivatives are singular there too, that is no state but the way to a face, which
 * has its own turn, or to infinity. */
static bool is_out_of_range(const struct search *s, const double *u)
{
    for (int i = 0; i < s->eq->count; i++) {
        double decade = s->eq->is_signed[i] ? log10(fabs(u[i]) * s->eq->unit[i]) : u[i] / log(10);
        if (decade > s->starts.high[i] + UNBOUNDED ||
            (!s->eq->is_signed[i] && decade < s->starts.high[i] - VANISHING))
            return true;
    }
    return false;
}

static lb_status take_root(struct search *s, const double *u, const newton_report *report)
{
    bool is_singular = report->rank < s->eq->count, is_continuum = false;
    double tolerance = is_singular ? 1e-3 : fmax(1e-6, 100 * report->step);
    if (is_singular && is_out_of_range(s, u))
        return LB_OK;
    s->out->converged++;
    if (is_known(s, u, tolerance) || (is_singular && s->out->continuum > 0))
        return LB_OK;
    lb_status status = is_singular ? test_continuum(s, u, &is_continuum) : LB_OK;
    if (status != LB_OK)
        return status;
    if (is_continuum) {
        s->out->continuum = s->eq->count - report->rank;
        s->out->continuum_root = s->out->count;
    }
    return keep(s, u);
}

/* ---- Starts --------------------------------------------------------------------------- */

/* Every other start combines the roots that are known, once there are two. */
static bool is_combination(const struct search *s, uint64_t i)
{
    return i % 2 == 1 && s->out->count > 1;
}

static void set_start(struct search *s, uint64_t i)
{
    if (is_combination(s, i))
        starts_combine(&s->starts, i, s->out->u, s->out->count, s->u);
    else
        starts_point(&s->starts, i, s->u);
}

/* How far start i is relaxed first: to rest, not at all, until most species have
 * settled, until the fastest have.  Newton's method then succeeds more often, and
 * reaches other roots: at once it prefers saddles, from rest it never finds any.
 * Combinations of roots are near others as they are, half of them. */
static int relaxation_of(const struct search *s, uint64_t i)
{
    static const int steps[] = {250, 0, 30, 10}, of_combination[] = {0, 30, 0, 10};
    return is_combination(s, i) ? of_combination[i / 2 % 4] : steps[(i + i / 4) % 4];
}

static lb_status try_start(struct search *s, uint64_t i, bool is_deflated)
{
    newton_report report;
    set_start(s, i);
    s->out->starts++;
    lb_status status = newton_relax(&s->newton, s->u, relaxation_of(s, i), s->err);
    if (status == LB_OK)
        status = newton_solve(&s->newton, s->u, s->out->u, is_deflated ? s->out->count : 0, &report, s->err);
    return status == LB_OK && report.converged ? take_root(s, s->u, &report) : status;
}

static bool must_stop(struct search *s, size_t done, size_t all)
{
    const lb_monitor *monitor = s->options->monitor;
    if (monitor && monitor->progress)
        monitor->progress(monitor->context, "steady states", (double)done / (double)all);
    if (monitor && monitor->stop && monitor->stop(monitor->context))
        s->out->interrupted = true;
    return s->out->interrupted;
}

/* Plain starts, and more of them as long as one in `starts` finds a new root, or one
 * in eight times as many as there are roots, since each of many is rarely hit; then
 * deflated ones. */
static lb_status run_starts(struct search *s)
{
    size_t wanted = s->options->starts, deflated = wanted / 2, i = 0, end = wanted;
    lb_status status = LB_OK;
    for (; status == LB_OK && i < end && !must_stop(s, i, end + deflated); i++) {
        int before = s->out->count;
        status = try_start(s, i, false);
        if (s->out->count > before && !s->options->is_fixed) {
            size_t gap = 8 * (size_t)s->out->count > wanted ? 8 * (size_t)s->out->count : wanted;
            end = i + 1 + gap < MOST_ROUNDS * wanted ? i + 1 + gap : MOST_ROUNDS * wanted;
        }
    }
    end = s->out->count > 0 ? i + deflated : i;
    for (; status == LB_OK && i < end && !must_stop(s, i, end); i++)
        status = try_start(s, i, true);
    return status;
}

lb_status roots_find(equations *eq, const roots_options *options, roots *out, lb_error *err)
{
    *out = (roots){0};
    struct search s = {.eq = eq, .options = options, .out = out, .err = err};
    s.u = memory_array((size_t)eq->count, sizeof *s.u);
    s.walked = memory_array((size_t)eq->count, sizeof *s.walked);
    lb_status status = s.u && s.walked ? LB_OK : status_no_memory(err);
    if (status == LB_OK && eq->count == 0) {
        status = keep(&s, s.u);
        goto done;
    }
    if (status == LB_OK)
        status = newton_init(&s.newton, eq, err);
    if (status == LB_OK)
        status = starts_init(&s.starts, eq, options->x0, options->bound, options->seed, err);
    if (status == LB_OK)
        status = run_starts(&s);
done:
    starts_clear(&s.starts);
    newton_clear(&s.newton);
    memory_free(s.walked);
    memory_free(s.u);
    return status;
}

/* Has u stayed beside x: what is present there within a factor e, the rest far below? */
static bool is_beside(const equations *eq, const double *u, const double *x, double scale)
{
    for (int i = 0; i < eq->count; i++) {
        double value = x[eq->state[i]];
        if (eq->is_signed[i] ? fabs(u[i] - value / eq->unit[i]) > 1 + fabs(u[i])
                             : value > 0 ? fabs(u[i] - log(value)) > 1 : u[i] > log(1e-2 * scale))
            return false;
    }
    return true;
}

/* Beside an end the species that vanish are tiny and the rest is as at x: a
 * singular root is then within reach of such a point, and stays beside it. */
lb_status roots_end_at(equations *eq, const double *x, double scale, bool *is_end, lb_error *err)
{
    const double tiny = 1e-8;
    newton w;
    newton_report report;
    *is_end = false;
    lb_status status = newton_init(&w, eq, err);
    if (status != LB_OK)
        return status;
    double *u = memory_array((size_t)eq->count, sizeof *u);
    if (!u) {
        status = status_no_memory(err);
        goto done;
    }
    for (int i = 0; i < eq->count; i++) {
        double value = x[eq->state[i]];
        u[i] = eq->is_signed[i] ? value / eq->unit[i] : log(value > 0 ? value : tiny * scale);
    }
    status = newton_solve(&w, u, NULL, 0, &report, err);
    if (status == LB_OK && report.converged && report.rank < eq->count)
        *is_end = is_beside(eq, u, x, scale);
done:
    memory_free(u);
    newton_clear(&w);
    return status;
}

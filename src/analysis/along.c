/* Folds and Hopf points along one constant.
 *
 * Steady states are searched at several values in the constant's range, and the branch
 * through each, unless an earlier one passed there, is followed to both sides.  Between
 * two points of a branch a fold shows in the tangent, whose part along the constant
 * changes its sign, and a Hopf point in the eigenvalues, of which a complex pair changes
 * sides; a real pair with the sum zero (a neutral saddle) does not.  Either is narrowed
 * down to rounding, each trial point corrected back to the branch.
 *
 * Source: Yu. A. Kuznetsov, Elements of Applied Bifurcation Theory, 3rd ed. (2004),
 * chapter 10 (predictor-corrector continuation, test functions). */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "analysis/branch.h"
#include "base/memory.h"
#include "base/status.h"
#include "limbeck.h"
#include "system/system.h"

enum { VALUES = 12, MOST_STEPS = 4000, MOST_CROSSINGS = 6, HALVINGS = 60 };

static const double FIRST_STEP = 0.02;
static const double LONGEST_STEP = 0.1;
static const double SHORTEST_STEP = 1e-8;
static const double FAR = 80;               /* e^-80: on the way to zero or infinity */

/* A state that a branch has at one of the values where states are searched. */
struct visit {
    int value;              /* which */
    double *x;              /* [n] */
};

struct search {
    const lb_system *system;
    const lb_along_options *options;
    lb_evaluator *evaluator;
    double *k;              /* [m] */
    double value[VALUES + 1];
    int value_count;
    struct visit *visit;
    size_t visit_count, visit_capacity;
    lb_along *out;
    size_t capacity;        /* of out->special */
    lb_error *err;
};

/* One end of a step along a branch. */
struct point {
    double *z, *tangent;    /* [size] */
    int unstable;
};

struct trace {
    struct search *s;
    branch *b;
    struct point from, to, trial;
    double *guess, *first;  /* [size] */
    double *x;              /* [n] */
};

/* ---- What was found --------------------------------------------------------------------- */

static bool is_near(int n, const double *a, const double *b, double tolerance)
{
    for (int i = 0; i < n; i++)
        if (fabs(a[i] - b[i]) > tolerance * fmax(fabs(a[i]), fabs(b[i])) && fabs(a[i] - b[i]) > 1e-12)
            return false;
    return true;
}

static bool is_interrupted(struct search *s)
{
    const lb_monitor *monitor = s->options->monitor;
    if (monitor && monitor->stop && monitor->stop(monitor->context))
        s->out->interrupted = true;
    return s->out->interrupted;
}

static lb_status keep_special(struct trace *t, const double *z, lb_special_kind kind, double omega)
{
    struct search *s = t->s;
    lb_along *out = s->out;
    double value = branch_value(t->b, z[t->b->near.count]);
    if (value < t->b->low || value > t->b->high)
        return LB_OK;
    branch_state(t->b, z, t->x);
    for (size_t i = 0; i < out->count; i++)
        if (out->special[i].kind == kind && fabs(out->special[i].value - value) <= 1e-7 * (t->b->high - t->b->low) &&
            is_near(out->states, out->special[i].x, t->x, 1e-4))
            return LB_OK;
    double *x = memory_array((size_t)out->states, sizeof *x);
    if (!x || memory_grow(&out->special, &s->capacity, out->count, sizeof *out->special) != 0) {
        memory_free(x);
        return status_no_memory(s->err);
    }
    memcpy(x, t->x, (size_t)out->states * sizeof *x);
    out->special[out->count++] = (lb_special){.kind = kind, .value = value, .x = x, .omega = omega};
    return LB_OK;
}

static lb_status keep_visit(struct search *s, int value, const double *x)
{
    double *copy = memory_array((size_t)s->system->n, sizeof *copy);
    if (!copy || memory_grow(&s->visit, &s->visit_capacity, s->visit_count, sizeof *s->visit) != 0) {
        memory_free(copy);
        return status_no_memory(s->err);
    }
    memcpy(copy, x, (size_t)s->system->n * sizeof *copy);
    s->visit[s->visit_count++] = (struct visit){value, copy};
    return LB_OK;
}

static bool was_visited(const struct search *s, int value, const double *x)
{
    for (size_t i = 0; i < s->visit_count; i++)
        if (s->visit[i].value == value && is_near(s->system->n, s->visit[i].x, x, 1e-5))
            return true;
    return false;
}

/* ---- Between two points ------------------------------------------------------------------- */

/* The point a length `s` ahead of t->from, into t->trial. */
static bool go(struct trace *t, double length)
{
    for (int i = 0; i < t->b->size; i++)
        t->guess[i] = t->from.z[i] + length * t->from.tangent[i];
    return branch_correct(t->b, t->guess, t->from.tangent, t->trial.z);
}

static bool go_with_tangent(struct trace *t, double length)
{
    return go(t, length) && branch_tangent(t->b, t->trial.z, t->from.tangent, t->trial.tangent);
}

static lb_status find_fold(struct trace *t, double step)
{
    int last = t->b->size - 1;
    double low = 0, high = step;
    if ((t->from.tangent[last] > 0) == (t->to.tangent[last] > 0))
        return LB_OK;
    for (int i = 0; i < HALVINGS; i++) {
        double middle = (low + high) / 2;
        if (!go_with_tangent(t, middle))
            return LB_OK;
        if ((t->trial.tangent[last] > 0) == (t->from.tangent[last] > 0))
            low = middle;
        else
            high = middle;
    }
    return go(t, high) ? keep_special(t, t->trial.z, LB_FOLD, 0) : LB_OK;
}

/* The eigenvalue with the least real part by magnitude, of those last found. */
static lb_complex nearest_to_axis(const branch *b)
{
    lb_complex nearest = {INFINITY, 0};
    for (int i = 0; i < b->near.system->rank; i++)
        if (fabs(b->values[i].re) < fabs(nearest.re))
            nearest = b->values[i];
    return nearest;
}

/* Real part of the complex eigenvalue next to i omega at a length; *size: the largest
 * magnitude of all.  NAN: none. */
static double real_part_at(struct trace *t, double length, double omega, double *size)
{
    double least = INFINITY, re = NAN;
    if (!go(t, length) || branch_unstable(t->b, t->trial.z) < 0)
        return NAN;
    *size = 0;
    for (int i = 0; i < t->s->system->rank; i++) {
        lb_complex value = t->b->values[i];
        *size = fmax(*size, hypot(value.re, value.im));
        if (value.im > 0 && hypot(value.re, value.im - omega) < least) {
            least = hypot(value.re, value.im - omega);
            re = value.re;
        }
    }
    return re;
}

/* Does the pair really go through the axis, beyond what rounding can do? */
static bool crosses(struct trace *t, double at, double step, double omega)
{
    double size_before, size_after, width = 0.1 * step;
    double before = real_part_at(t, at - width, omega, &size_before);
    double after = real_part_at(t, at + width, omega, &size_after);
    return (before < 0) != (after < 0) && fabs(before) > 1e-12 * size_before && fabs(after) > 1e-12 * size_after;
}

/* The first place from `low` on where the count of unstable eigenvalues changes: a Hopf
 * point where two do that are complex.  *low and *unstable move on behind it. */
static lb_status find_crossing(struct trace *t, double step, double *low, int *unstable)
{
    double left = *low, right = step;
    int before = *unstable;
    for (int i = 0; i < HALVINGS; i++) {
        double middle = (left + right) / 2;
        int count = go(t, middle) ? branch_unstable(t->b, t->trial.z) : -1;
        if (count < 0)
            break;
        if (count == before)
            left = middle;
        else
            right = middle;
    }
    *low = right;
    *unstable = go(t, right) ? branch_unstable(t->b, t->trial.z) : -1;
    if (*unstable < 0 || abs(*unstable - before) != 2)
        return LB_OK;
    lb_complex value = nearest_to_axis(t->b);
    double omega = fabs(value.im);
    if (!(omega > 0) || !crosses(t, right, step, omega) || !go(t, right))
        return LB_OK;
    return keep_special(t, t->trial.z, LB_HOPF, omega);
}

static lb_status find_hopf(struct trace *t, double step)
{
    lb_status status = LB_OK;
    double low = 0;
    int unstable = t->from.unstable;
    for (int i = 0; status == LB_OK && i < MOST_CROSSINGS && unstable >= 0 && unstable != t->to.unstable; i++)
        status = find_crossing(t, step, &low, &unstable);
    return status;
}

/* Note the states that the branch has between the two points at the values of the search. */
static lb_status note_visits(struct trace *t)
{
    lb_status status = LB_OK;
    int last = t->b->size - 1;
    for (int v = 0; status == LB_OK && v < t->s->value_count; v++) {
        double at = branch_coordinate(t->b, t->s->value[v]), a = t->from.z[last], b = t->to.z[last];
        if ((a - at) * (b - at) > 0 || a == b)
            continue;
        for (int i = 0; i <= last; i++) {
            t->guess[i] = t->from.z[i] + (at - a) / (b - a) * (t->to.z[i] - t->from.z[i]);
            t->trial.tangent[i] = i == last;
        }
        if (!branch_correct(t->b, t->guess, t->trial.tangent, t->trial.z))
            continue;
        branch_state(t->b, t->trial.z, t->x);
        status = keep_visit(t->s, v, t->x);
    }
    return status;
}

/* ---- One branch --------------------------------------------------------------------------- */

static double distance(const branch *b, const double *p, const double *q)
{
    double sum = 0;
    for (int i = 0; i < b->size; i++)
        sum += (p[i] - q[i]) * (p[i] - q[i]);
    return sqrt(sum);
}

static double product(const branch *b, const double *p, const double *q)
{
    double sum = 0;
    for (int i = 0; i < b->size; i++)
        sum += p[i] * q[i];
    return sum;
}

/* One step of at most *step, which is halved until the branch turns little on it. */
static bool advance(struct trace *t, double *step)
{
    for (; *step > SHORTEST_STEP; *step /= 2) {
        if (!go_with_tangent(t, *step) || distance(t->b, t->guess, t->trial.z) > 0.2 * *step)
            continue;
        if (product(t->b, t->from.tangent, t->trial.tangent) > 0.95)
            return true;
    }
    return false;
}

static bool has_left(const struct trace *t)
{
    const branch *b = t->b;
    for (int i = 0; i < b->near.count; i++)
        if (!b->near.is_signed[i] && fabs(t->from.z[i]) > FAR)
            return true;
    double value = branch_value(b, t->from.z[b->near.count]);
    return value < b->low || value > b->high;
}

static void swap_points(struct point *a, struct point *b)
{
    struct point c = *a;
    *a = *b;
    *b = c;
}

/* From t->from on until the branch leaves the range, ends, or closes. */
static lb_status follow(struct trace *t, bool *is_closed)
{
    double step = FIRST_STEP;
    lb_status status = LB_OK;
    *is_closed = false;
    for (int i = 0; status == LB_OK && i < MOST_STEPS && !has_left(t) && !*is_closed && !is_interrupted(t->s); i++) {
        if (!advance(t, &step))
            break;
        swap_points(&t->to, &t->trial);
        t->to.unstable = branch_unstable(t->b, t->to.z);
        t->s->out->points++;
        status = find_fold(t, step);
        if (status == LB_OK)
            status = find_hopf(t, step);
        if (status == LB_OK)
            status = note_visits(t);
        double turn = product(t->b, t->from.tangent, t->to.tangent);
        *is_closed = i > 5 && distance(t->b, t->to.z, t->first) < step && product(t->b, t->to.tangent, t->from.tangent) > 0;
        swap_points(&t->from, &t->to);
        step = fmin(turn > 0.99 ? 1.5 * step : step, LONGEST_STEP);
    }
    return status;
}

static lb_status trace_init(struct trace *t, struct search *s, branch *b)
{
    *t = (struct trace){.s = s, .b = b};
    size_t size = (size_t)b->size;
    double **blocks[] = {&t->from.z, &t->from.tangent, &t->to.z, &t->to.tangent, &t->trial.z, &t->trial.tangent,
                         &t->guess, &t->first};
    for (size_t i = 0; i < sizeof blocks / sizeof *blocks; i++)
        if (!(*blocks[i] = memory_array(size, sizeof(double))))
            return status_no_memory(s->err);
    t->x = memory_array((size_t)s->system->n, sizeof *t->x);
    return t->x ? LB_OK : status_no_memory(s->err);
}

static void trace_clear(struct trace *t)
{
    double *blocks[] = {t->from.z, t->from.tangent, t->to.z, t->to.tangent, t->trial.z, t->trial.tangent,
                        t->guess, t->first, t->x};
    for (size_t i = 0; i < sizeof blocks / sizeof *blocks; i++)
        memory_free(blocks[i]);
}

/* Set t->from to the first point, looking up or down the constant. */
static bool begin(struct trace *t, double sense)
{
    int last = t->b->size - 1;
    memcpy(t->from.z, t->first, (size_t)t->b->size * sizeof *t->first);
    for (int i = 0; i <= last; i++)
        t->guess[i] = i == last ? sense : 0;
    t->from.unstable = branch_unstable(t->b, t->from.z);
    return branch_tangent(t->b, t->first, t->guess, t->from.tangent);
}

static lb_status trace_branch(struct search *s, double value, const double *x)
{
    branch b;
    struct trace t = {0};
    bool is_closed = false;
    lb_status status = branch_init(&b, s->evaluator, s->out->constant, x, s->err);
    if (status == LB_OK)
        status = trace_init(&t, s, &b);
    if (status != LB_OK)
        goto done;
    near_take(&b.near, x, t.first);
    t.first[b.size - 1] = branch_coordinate(&b, value);
    s->out->branches++;
    for (int side = 0; status == LB_OK && side < 2 && !is_closed; side++)
        if (begin(&t, side == 0 ? 1 : -1))
            status = follow(&t, &is_closed);
done:
    trace_clear(&t);
    branch_clear(&b);
    return status;
}

/* ---- All of them ---------------------------------------------------------------------------- */

static lb_status search_at(struct search *s, int v)
{
    lb_steady *steady = NULL;
    s->k[s->out->constant] = s->value[v];
    lb_steady_options options = {.k = s->k, .seed = s->options->seed, .monitor = s->options->monitor};
    lb_status status = lb_steady_solve(s->system, &options, &steady, s->err);
    if (status != LB_OK)
        return status;
    s->out->interrupted = s->out->interrupted || steady->interrupted;
    for (size_t i = 0; status == LB_OK && i < steady->count && steady->continuum == 0 && !is_interrupted(s); i++) {
        if (was_visited(s, v, steady->state[i].x))
            continue;
        status = lb_evaluator_bind(s->evaluator, s->k, s->err);
        if (status == LB_OK)
            status = trace_branch(s, s->value[v], steady->state[i].x);
    }
    lb_steady_free(steady);
    return status;
}

/* The value that the constant has, then values spread over its range. */
static lb_status choose_values(struct search *s)
{
    const lb_network *net = s->system->network;
    bool is_logarithmic;
    int c = s->options->constant;
    lb_along *out = s->out;
    if (c < 0 || c >= s->system->m)
        return status_raise(s->err, LB_E_ARG, NULL, "there is no constant of number %d", c);
    if (!lb_network_range(net, c, &out->low, &out->high, &is_logarithmic))
        return status_raise(s->err, LB_E_ARG, "give it one where it has its value: `in LOW .. HIGH`",
                            "`%s` has no range along which states could be followed", lb_network_constant_name(net, c));
    for (int m = 0; m < s->system->m; m++)
        s->k[m] = s->options->k ? s->options->k[m] : lb_network_default(net, m);
    if (s->k[c] >= out->low && s->k[c] <= out->high)
        s->value[s->value_count++] = s->k[c];
    for (int i = 0; i < VALUES; i++) {
        double at = (i + 0.5) / VALUES;
        s->value[s->value_count++] = is_logarithmic ? out->low * pow(out->high / out->low, at)
                                                    : out->low + at * (out->high - out->low);
    }
    return LB_OK;
}

static void sort_special(lb_along *out)
{
    for (size_t i = 1; i < out->count; i++) {
        lb_special special = out->special[i];
        size_t place = i;
        for (; place > 0 && out->special[place - 1].value > special.value; place--)
            out->special[place] = out->special[place - 1];
        out->special[place] = special;
    }
}

lb_status lb_along_solve(const lb_system *system, const lb_along_options *options, lb_along **out, lb_error *err)
{
    *out = NULL;
    struct search s = {.system = system, .options = options, .err = err};
    s.out = memory_zeroed(1, sizeof *s.out);
    s.k = memory_array((size_t)system->m, sizeof *s.k);
    lb_status status = s.out && s.k ? system_require_laws(system, err) : status_no_memory(err);
    if (status == LB_OK) {
        s.out->states = system->n;
        s.out->constant = options->constant;
        status = choose_values(&s);
    }
    if (status == LB_OK)
        status = lb_evaluator_new(system, &s.evaluator, err);
    for (int v = 0; status == LB_OK && v < s.value_count && !is_interrupted(&s); v++)
        status = search_at(&s, v);
    if (status == LB_OK) {
        sort_special(s.out);
        *out = s.out;
        s.out = NULL;
    }
    for (size_t i = 0; i < s.visit_count; i++)
        memory_free(s.visit[i].x);
    memory_free(s.visit);
    lb_along_free(s.out);
    memory_free(s.k);
    lb_evaluator_free(s.evaluator);
    return status;
}

void lb_along_free(lb_along *along)
{
    if (!along)
        return;
    for (size_t i = 0; i < along->count; i++)
        memory_free(along->special[i].x);
    memory_free(along->special);
    memory_free(along);
}

const char *lb_special_text(lb_special_kind kind)
{
    return kind == LB_HOPF ? "Hopf" : "fold";
}

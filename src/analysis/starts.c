/* Start points for the search for steady states.
 *
 * A species' natural range spans the concentrations that the mechanism itself
 * names: initial and feed concentrations, conserved totals, the quotients of
 * rate constants of different order, (ka/kb)^(1/(order_b - order_a)), and the
 * constants written in general rate laws.  Samples are log-uniform in that range
 * and in wider ones, up to WIDE decades beyond it, since steady states sit far
 * from any scale that a person would guess (1e-11 M in a bromate bath).  Those
 * points are scaled into the class: iterative proportional fitting (W. E. Deming
 * and F. F. Stephan, Ann. Math. Stat. 11 (1940) 427) on the positive laws. */
#include "analysis/starts.h"

#include <math.h>
#include <string.h>

#include "analysis/sample.h"
#include "base/memory.h"
#include "base/status.h"

enum { WIDE = 6, MOST_ORDERS = 8, FITTING_SWEEPS = 8, WIDEST_RANGE = 16 };

/* Extent of the scales seen so far, in decades; empty while low > high. */
struct range {
    double low, high;
};

static void include(struct range *range, double value)
{
    double decade = log10(value);
    if (!(value > 1e-30 && value < 1e30))
        return;
    range->low = fmin(range->low, decade);
    range->high = fmax(range->high, decade);
}

/* ---- Scales of the mechanism --------------------------------------------------------- */

/* Slowest and fastest power law of one overall order. */
struct order_group {
    double order, slowest, fastest;
};

static int group_orders(equations *eq, struct order_group *groups)
{
    const lb_network *net = eq->system->network;
    int count = 0;
    for (int i = 0; i < eq->system->n; i++)
        eq->x[i] = 1;
    evaluator_step_rates(eq->evaluator, eq->x, eq->rate);
    for (int s = 0; s < eq->system->steps; s++) {
        if (!eq->is_alive[s] || !net->steps[s].is_power_law || !(eq->rate[s] > 0))
            continue;
        double order = 0;
        for (int o = 0; o < net->steps[s].order_count; o++)
            order += net->steps[s].orders[o].order;
        int g = 0;
        while (g < count && groups[g].order != order)
            g++;
        if (g == count && count == MOST_ORDERS)
            continue;
        if (g == count)
            groups[count++] = (struct order_group){order, eq->rate[s], eq->rate[s]};
        groups[g].slowest = fmin(groups[g].slowest, eq->rate[s]);
        groups[g].fastest = fmax(groups[g].fastest, eq->rate[s]);
    }
    return count;
}

/* Concentrations at which a step of one order keeps up with one of another. */
static void include_quotients(equations *eq, struct range *range)
{
    struct order_group groups[MOST_ORDERS];
    int count = group_orders(eq, groups);
    for (int a = 0; a < count; a++)
        for (int b = 0; b < count; b++) {
            double power = groups[b].order - groups[a].order;
            if (!(power > 0))
                continue;
            include(range, pow(groups[a].slowest / groups[b].fastest, 1 / power));
            include(range, pow(groups[a].fastest / groups[b].slowest, 1 / power));
        }
}

/* Constants and numbers in the rates that are no power laws: half-saturation
 * constants are among them. */
static lb_status include_constants(const equations *eq, struct range *range, lb_error *err)
{
    const lb_network *net = eq->system->network;
    const double *k = evaluator_constants(eq->evaluator);
    unsigned char *needed = memory_zeroed(net->graph.count, 1);
    if (!needed)
        return status_no_memory(err);
    for (int s = 0; s < eq->system->steps; s++)
        if (eq->is_alive[s] && !net->steps[s].is_power_law)
            expression_mark(&net->graph, net->steps[s].rate, needed);
    for (size_t i = 0; i < net->graph.count; i++) {
        const expression_node *node = &net->graph.nodes[i];
        if (needed[i] && node->kind == EXPRESSION_CONSTANT)
            include(range, fabs(k[node->left]));
        else if (needed[i] && node->kind == EXPRESSION_NUMBER)
            include(range, fabs(node->value));
    }
    memory_free(needed);
    return LB_OK;
}

static void include_concentrations(const equations *eq, const double *x0, struct range *range)
{
    const lb_network *net = eq->system->network;
    const double *k = evaluator_constants(eq->evaluator);
    for (int i = 0; i < eq->count; i++) {
        const network_species *species = &net->species[net->state_species[eq->state[i]]];
        include(range, fabs(x0[eq->state[i]]));
        if (species->feed != EXPRESSION_NONE)
            include(range, fabs(expression_value(&net->graph, species->feed, k, NULL)));
    }
}

void starts_bounds(const lb_system *system, const double *x0, double *bound)
{
    const lb_network *net = system->network;
    for (int i = 0; i < system->n; i++)
        bound[i] = INFINITY;
    for (int row = 0; row < system->laws.semipositive; row++) {
        const int64_t *law = system->laws.law + (size_t)row * (size_t)system->laws.width;
        double total = 0;
        bool has_signed = false;
        for (int i = 0; i < system->n; i++) {
            total += (double)law[i] * x0[i];
            has_signed = has_signed || (law[i] != 0 && net->species[net->state_species[i]].is_signed);
        }
        for (int i = 0; i < system->n && !has_signed; i++)
            if (law[i] > 0)
                bound[i] = fmin(bound[i], total / (double)law[i]);
    }
}

/* ---- The box --------------------------------------------------------------------------- */

static lb_status find_range(equations *eq, const double *x0, const double *bound, struct range *range, lb_error *err)
{
    *range = (struct range){INFINITY, -INFINITY};
    include_concentrations(eq, x0, range);
    include_quotients(eq, range);
    for (int i = 0; i < eq->count; i++)
        if (isfinite(bound[eq->state[i]]))
            include(range, bound[eq->state[i]]);
    lb_status status = include_constants(eq, range, err);
    if (range->low > range->high)
        *range = (struct range){0, 0};
    double excess = range->high - range->low - WIDEST_RANGE;
    if (excess > 0) {
        range->low += excess / 2;
        range->high -= excess / 2;
    }
    return status;
}

lb_status starts_init(starts *s, equations *eq, const double *x0, const double *bound_state, uint64_t seed,
                      lb_error *err)
{
    size_t count = (size_t)eq->count;
    memset(s, 0, sizeof *s);
    s->eq = eq;
    s->x0 = x0;
    s->seed = seed;
    s->low = memory_array(count, sizeof *s->low);
    s->high = memory_array(count, sizeof *s->high);
    s->bound = memory_array(count, sizeof *s->bound);
    s->point = memory_array(2 * count + 1, sizeof *s->point);
    struct range range = {0, 0};
    lb_status status = s->low && s->high && s->bound && s->point ? find_range(eq, x0, bound_state, &range, err)
                                                                 : status_no_memory(err);
    if (status != LB_OK) {
        starts_clear(s);
        return status;
    }
    for (int i = 0; i < eq->count; i++) {
        double bound = bound_state[eq->state[i]];
        s->bound[i] = !isfinite(bound) ? INFINITY : bound > 0 ? log10(bound) : -30;
        s->high[i] = fmin(range.high, s->bound[i]);
        s->low[i] = fmin(range.low, s->high[i]);
    }
    for (int i = 0; i < eq->system->n; i++)
        eq->x[i] = eq->unknown[i] < 0 && eq->system->core_index[i] >= 0 ? 0 : x0[i];
    return LB_OK;
}

void starts_clear(starts *s)
{
    memory_free(s->low);
    memory_free(s->high);
    memory_free(s->bound);
    memory_free(s->point);
    memset(s, 0, sizeof *s);
}

/* ---- Points ------------------------------------------------------------------------------- */

/* Scale the unknowns of each positive law in turn, so that it has its total. */
static const double FRESH = 0.1;            /* share of unknowns that a combination draws anew */
static void fit_laws(const equations *eq, double *u)
{
    for (int sweep = 0; sweep < FITTING_SWEEPS; sweep++)
        for (int l = 0; l < eq->law_count; l++) {
            const double *law = eq->laws->law + (size_t)eq->law[l] * (size_t)eq->laws->width;
            double sum = 0;
            if (!eq->laws->is_positive[eq->law[l]])
                continue;
            for (int i = 0; i < eq->count; i++)
                sum += law[eq->system->core_index[eq->state[i]]] * exp(u[i]);
            double shift = log(eq->laws->total[eq->law[l]] / sum);
            for (int i = 0; i < eq->count && isfinite(shift); i++)
                if (law[eq->system->core_index[eq->state[i]]] > 0)
                    u[i] += shift;
        }
}

/* |x| = 10^decade, with a sign from `side` for a signed unknown. */
static double unknown_at(const equations *eq, int i, double decade, double side)
{
    if (eq->is_signed[i])
        return (side < 0.5 ? -1 : 1) * pow(10, decade) / eq->unit[i];
    return decade * log(10);
}

static void start_from_x0(const starts *s, double *u)
{
    const equations *eq = s->eq;
    for (int i = 0; i < eq->count; i++) {
        double x = s->x0[eq->state[i]];
        if (eq->is_signed[i])
            u[i] = x / eq->unit[i];
        else
            u[i] = x > 0 ? log(x) : (s->low[i] - 1) * log(10);
    }
}

/* Four kinds of samples in turn: in the natural range; a decade or two beyond;
 * all species within a decade of one common level; and the widest box.  What is
 * far below the range of a signed unknown is all near zero alike. */
static void widen(uint64_t i, double level, bool is_signed, double *low, double *high)
{
    double below = is_signed ? 1 : i % 4 == 3 ? WIDE : 2, above = is_signed || i % 4 == 3 ? WIDE : 1;
    double middle = *low - below + level * (*high - *low + below + above);
    switch (i % 4) {
    case 1:
    case 3:
        *low -= below;
        *high += above;
        break;
    case 2:
        *low = middle - 1;
        *high = middle + 1;
        break;
    default:
        break;
    }
}

void starts_point(starts *s, uint64_t i, double *u)
{
    const equations *eq = s->eq;
    if (i == 0) {
        start_from_x0(s, u);
        return;
    }
    sample_point(s->seed, i, 2 * eq->count + 1, s->point);
    for (int j = 0; j < eq->count; j++) {
        double low = s->low[j], high = s->high[j], at = i == 1 ? 0.5 : s->point[j];
        if (i > 1)
            widen(i, s->point[2 * eq->count], eq->is_signed[j], &low, &high);
        high = fmin(high, s->bound[j]);
        low = fmin(low, high);
        u[j] = unknown_at(eq, j, low + at * (high - low), s->point[eq->count + j]);
    }
    fit_laws(eq, u);
}

void starts_combine(starts *s, uint64_t i, double *const *known, int known_count, double *u)
{
    starts_point(s, i, u);
    for (int j = 0; j < s->eq->count; j++) {
        double draw = sample_uniform(s->seed, i, (uint64_t)j) / (1 - FRESH);
        if (draw < 1)
            u[j] = known[(int)(known_count * draw)][j];
    }
    fit_laws(s->eq, u);
}

/* Steady-state equations in logarithms.
 *
 * The balance of a species that only power laws change is written as
 * ln(gain/loss) = 0: in log concentrations that is linear as soon as one term
 * dominates on each side, so Newton's method reaches the root from decades
 * away.  Any other balance is f scaled by its size, the sum of its terms'
 * magnitudes and of |df/dx| x, which also sees terms that cancel inside one
 * rate law.  A law with positive coefficients is ln(sum/total) = 0.
 *
 * Source of the ratio form: M. A. Savageau, J. Theor. Biol. 25 (1969) 365
 * (power laws are linear in logarithms), applied to sums as tangents by Newton. */
#include "analysis/equations.h"

#include <math.h>
#include <string.h>

#include "analysis/sample.h"
#include "base/memory.h"
#include "base/status.h"

static bool is_signed_state(const lb_system *system, int state)
{
    const lb_network *net = system->network;
    return net->species[net->state_species[state]].is_signed;
}

/* ---- Which steps are alive -------------------------------------------------- */

enum { PROBES = 3, MOST_POOLS = 32 };

/* A point in general position: powers of different species do not cancel there. */
static void probe_point(const lb_system *system, int probe, double *x)
{
    for (int i = 0; i < system->n; i++)
        x[i] = 0.5 + sample_uniform(0x70726f6265, (uint64_t)probe, (uint64_t)i);
}

lb_status equations_find_alive(lb_evaluator *evaluator, const bool *is_zero, bool *is_alive, lb_error *err)
{
    const lb_system *system = evaluator_system(evaluator);
    double *x = memory_array((size_t)system->n, sizeof *x);
    double *v = memory_array((size_t)system->steps, sizeof *v);
    if (!x || !v) {
        memory_free(v);
        memory_free(x);
        return status_no_memory(err);
    }
    memset(is_alive, 0, (size_t)system->steps * sizeof *is_alive);
    for (int probe = 0; probe < PROBES; probe++) {
        probe_point(system, probe, x);
        for (int i = 0; i < system->n; i++)
            if (is_zero && is_zero[i])
                x[i] = 0;
        evaluator_step_rates(evaluator, x, v);
        for (int s = 0; s < system->steps; s++)
            if (system->core_step[s] && v[s] != 0)
                is_alive[s] = true;
    }
    memory_free(v);
    memory_free(x);
    return LB_OK;
}

/* ---- Conservation laws -------------------------------------------------------- */

static void fill_law(equations_laws *laws, int row, const int64_t *coefficient, const lb_system *system,
                     const double *x0)
{
    laws->is_positive[row] = true;
    for (int i = 0; i < laws->width; i++) {
        double w = (double)coefficient[i], x = x0[system->core_state[i]];
        laws->law[(size_t)row * laws->width + i] = w;
        laws->total[row] += w * x;
        laws->size[row] += fabs(w * x);
        if (w < 0 || (w != 0 && is_signed_state(system, system->core_state[i])))
            laws->is_positive[row] = false;
    }
}

/* Constants of zero switch steps off, and what they leave may conserve more. */
static lb_status laws_at_constants(lb_evaluator *evaluator, bool *is_alive, conservation *found, bool *is_own,
                                   lb_error *err)
{
    const lb_system *system = evaluator_system(evaluator);
    lb_status status = equations_find_alive(evaluator, NULL, is_alive, err);
    *is_own = false;
    for (int s = 0; status == LB_OK && s < system->steps && !*is_own; s++)
        *is_own = system->core_step[s] && !is_alive[s];
    if (status != LB_OK || !*is_own)
        return status;
    return conservation_find(system->network, system->core_state, system->core, is_alive, found, err);
}

/* Does the step bring in or take out one species, independently of all others? */
static bool is_flow(const network_step *step)
{
    if (!step->is_power_law || step->entry_count != 1 || step->order_count > 1)
        return false;
    return step->order_count == 0 || step->orders[0].state == step->entries[0].state;
}

static void keep_pool(equations_laws *laws, const int64_t *weight)
{
    int support = 0;
    for (int i = 0; i < laws->width; i++) {
        if (weight[i] < 0)
            return;
        support += weight[i] > 0;
    }
    if (support < 2)
        return;
    for (int i = 0; i < laws->width; i++)
        laws->pool[(size_t)laws->pool_count * (size_t)laws->width + (size_t)i] = (double)weight[i];
    laws->pool_count++;
}

/* What the steps conserve that are no flows.  A network too large for that has no
 * pools. */
static lb_status find_pools(equations_laws *laws, const lb_system *system, bool *use, lb_error *err)
{
    conservation found = {0};
    bool has_flow = false;
    for (int s = 0; s < system->steps; s++) {
        has_flow = has_flow || (use[s] && is_flow(&system->network->steps[s]));
        use[s] = use[s] && !is_flow(&system->network->steps[s]);
    }
    if (!has_flow)
        return LB_OK;
    lb_status status = conservation_find(system->network, system->core_state, system->core, use, &found, NULL);
    if (status == LB_E_LIMIT)
        return LB_OK;
    if (status == LB_OK) {
        int most = found.count < MOST_POOLS ? found.count : MOST_POOLS;
        laws->pool = memory_array((size_t)most * (size_t)laws->width, sizeof *laws->pool);
        for (int row = 0; laws->pool && row < most; row++)
            keep_pool(laws, found.law + (size_t)row * (size_t)found.width);
    }
    conservation_clear(&found);
    return status == LB_OK && laws->pool ? LB_OK : status_no_memory(err);
}

lb_status equations_laws_init(equations_laws *laws, lb_evaluator *evaluator, const double *x0, lb_error *err)
{
    const lb_system *system = evaluator_system(evaluator);
    memset(laws, 0, sizeof *laws);
    conservation own = {0};
    bool is_own = false;
    bool *is_alive = memory_array((size_t)system->steps, sizeof *is_alive);
    lb_status status = is_alive ? laws_at_constants(evaluator, is_alive, &own, &is_own, err) : status_no_memory(err);
    if (status != LB_OK)
        goto done;
    const conservation *source = is_own ? &own : &system->core_laws;
    laws->count = source->count;
    laws->width = system->core;
    laws->basis = source->basis;
    laws->law = memory_array((size_t)laws->count * (size_t)laws->width, sizeof *laws->law);
    laws->total = memory_zeroed((size_t)laws->count, sizeof *laws->total);
    laws->size = memory_zeroed((size_t)laws->count, sizeof *laws->size);
    laws->is_positive = memory_array((size_t)laws->count, sizeof *laws->is_positive);
    if (!laws->law || !laws->total || !laws->size || !laws->is_positive) {
        status = status_no_memory(err);
        goto done;
    }
    for (int row = 0; row < laws->count; row++)
        fill_law(laws, row, source->law + (size_t)row * (size_t)source->width, system, x0);
    status = find_pools(laws, system, is_alive, err);
done:
    if (is_own)
        conservation_clear(&own);
    memory_free(is_alive);
    return status;
}

void equations_laws_clear(equations_laws *laws)
{
    memory_free(laws->law);
    memory_free(laws->total);
    memory_free(laws->size);
    memory_free(laws->is_positive);
    memory_free(laws->pool);
    memset(laws, 0, sizeof *laws);
}

/* ---- Building ------------------------------------------------------------------- */

static bool law_has_unknown(const equations *eq, int law)
{
    for (int i = 0; i < eq->laws->width; i++)
        if (eq->laws->law[(size_t)law * (size_t)eq->laws->width + (size_t)i] != 0 &&
            eq->unknown[eq->system->core_state[i]] >= 0)
            return true;
    return false;
}

/* The rows of the basis that still have an unknown in them.  A law that has none
 * left needs the total zero; a positive one that has some needs another total. */
static void choose_laws(equations *eq)
{
    for (int row = 0; row < eq->laws->count; row++) {
        bool has_unknown = law_has_unknown(eq, row);
        bool is_zero = fabs(eq->laws->total[row]) <= 1e-14 * eq->laws->size[row];
        if (has_unknown ? eq->laws->is_positive[row] && is_zero : !is_zero)
            eq->is_inconsistent = true;
        if (has_unknown && row < eq->laws->basis)
            eq->law[eq->law_count++] = row;
    }
}

/* Terms of each balance, compressed: count, then fill. */
static bool make_terms(equations *eq)
{
    const lb_network *net = eq->system->network;
    for (int s = 0; s < eq->system->steps; s++)
        for (int e = 0; eq->is_alive[s] && e < net->steps[s].entry_count; e++)
            if (eq->unknown[net->steps[s].entries[e].state] >= 0)
                eq->start[eq->unknown[net->steps[s].entries[e].state] + 1]++;
    for (int i = 0; i < eq->count; i++)
        eq->start[i + 1] += eq->start[i];
    eq->term_capacity = (size_t)eq->start[eq->count];
    eq->term = memory_array(eq->term_capacity, sizeof *eq->term);
    int *next = memory_array((size_t)eq->count, sizeof *next);
    if (!eq->term || !next) {
        memory_free(next);
        return false;
    }
    memcpy(next, eq->start, (size_t)eq->count * sizeof *next);
    for (int s = 0; s < eq->system->steps; s++) {
        const double *coefficient = evaluator_coefficients(eq->evaluator, s);
        for (int e = 0; eq->is_alive[s] && e < net->steps[s].entry_count; e++) {
            int i = eq->unknown[net->steps[s].entries[e].state];
            if (i >= 0)
                eq->term[next[i]++] = (equations_term){s, coefficient[e]};
        }
    }
    memory_free(next);
    return true;
}

/* The sum of the balances of a pool's species, step by step: what the pool's own
 * steps change cancels, being exact in small integers.  Kept when what is left has
 * gains and losses at positive rates.  sum [steps] is zero before and after. */
static lb_status add_pool(equations *eq, int pool, double *sum, lb_error *err)
{
    const double *weight = eq->laws->pool + (size_t)pool * (size_t)eq->laws->width;
    bool is_positive = true, has_gain = false, has_loss = false;
    size_t end = (size_t)eq->start[eq->balances];
    lb_status status = LB_OK;
    for (int i = 0; i < eq->count; i++)
        for (int t = eq->start[i]; t < eq->start[i + 1]; t++)
            sum[eq->term[t].step] += weight[eq->system->core_index[eq->state[i]]] * eq->term[t].coefficient;
    for (int s = 0; s < eq->system->steps; s++) {
        if (fabs(sum[s]) > 1e-9 && status == LB_OK) {
            is_positive = is_positive && eq->is_positive[s];
            has_gain = has_gain || sum[s] > 0;
            has_loss = has_loss || sum[s] < 0;
            if (memory_grow(&eq->term, &eq->term_capacity, end, sizeof *eq->term) != 0)
                status = status_no_memory(err);
            else
                eq->term[end++] = (equations_term){s, sum[s]};
        }
        sum[s] = 0;
    }
    if (status == LB_OK && is_positive && has_gain && has_loss) {
        eq->is_ratio[eq->balances] = true;
        eq->start[++eq->balances] = (int)end;
        eq->pool[eq->pool_count++] = pool;
    }
    return status;
}

static lb_status add_pools(equations *eq, lb_error *err)
{
    double *sum = memory_zeroed((size_t)eq->system->steps, sizeof *sum);
    lb_status status = sum ? LB_OK : status_no_memory(err);
    eq->balances = eq->count;
    for (int pool = 0; status == LB_OK && pool < eq->laws->pool_count; pool++)
        status = add_pool(eq, pool, sum, err);
    eq->rows = eq->balances + eq->law_count;
    memory_free(sum);
    return status;
}

static bool is_positive_power_law(const equations *eq, int step)
{
    const network_step *s = &eq->system->network->steps[step];
    if (!s->is_power_law || !(eq->rate[step] > 0))
        return false;
    for (int o = 0; o < s->order_count; o++)
        if (is_signed_state(eq->system, s->orders[o].state))
            return false;
    return true;
}

/* A balance takes the ratio form when every step in it is a power law of
 * positive rate, some of them gains and some losses. */
static void choose_forms(equations *eq)
{
    probe_point(eq->system, 0, eq->x);
    evaluator_step_rates(eq->evaluator, eq->x, eq->rate);
    for (int s = 0; s < eq->system->steps; s++)
        eq->is_positive[s] = eq->is_alive[s] && is_positive_power_law(eq, s);
    for (int i = 0; i < eq->count; i++) {
        bool is_power = true, has_gain = false, has_loss = false;
        for (int t = eq->start[i]; t < eq->start[i + 1]; t++) {
            is_power = is_power && eq->is_positive[eq->term[t].step];
            has_gain = has_gain || eq->term[t].coefficient > 0;
            has_loss = has_loss || eq->term[t].coefficient < 0;
        }
        eq->is_ratio[i] = is_power && has_gain && has_loss;
        if (!eq->is_ratio[i] && eq->start[i] < eq->start[i + 1])
            eq->is_general = true;
    }
}

static bool allocate(equations *eq)
{
    size_t n = (size_t)eq->system->n, core = (size_t)eq->system->core, pools = (size_t)eq->laws->pool_count;
    eq->state = memory_array(core, sizeof *eq->state);
    eq->unknown = memory_array(n, sizeof *eq->unknown);
    eq->is_signed = memory_array(core, sizeof *eq->is_signed);
    eq->unit = memory_array(core, sizeof *eq->unit);
    eq->law = memory_array((size_t)eq->laws->count, sizeof *eq->law);
    eq->is_alive = memory_array((size_t)eq->system->steps, sizeof *eq->is_alive);
    eq->is_positive = memory_array((size_t)eq->system->steps, sizeof *eq->is_positive);
    eq->pool = memory_array(pools, sizeof *eq->pool);
    eq->start = memory_zeroed(core + pools + 1, sizeof *eq->start);
    eq->is_ratio = memory_array(core + pools, sizeof *eq->is_ratio);
    eq->size = memory_array(core, sizeof *eq->size);
    eq->law_size = memory_array((size_t)eq->laws->count, sizeof *eq->law_size);
    eq->x = memory_array(n, sizeof *eq->x);
    eq->rate = memory_array((size_t)eq->system->steps, sizeof *eq->rate);
    eq->jacobian = memory_array((size_t)eq->system->nonzeros, sizeof *eq->jacobian);
    return eq->state && eq->unknown && eq->is_signed && eq->unit && eq->law && eq->is_alive && eq->is_positive && eq->pool && eq->start &&
           eq->is_ratio && eq->size && eq->law_size && eq->x && eq->rate && eq->jacobian;
}

static void choose_unknowns(equations *eq, const double *x0, const bool *is_zero)
{
    for (int i = 0; i < eq->system->n; i++)
        eq->unknown[i] = -1;
    for (int c = 0; c < eq->system->core; c++) {
        int state = eq->system->core_state[c];
        if (is_zero && is_zero[state])
            continue;
        eq->unknown[state] = eq->count;
        eq->state[eq->count] = state;
        eq->is_signed[eq->count] = is_signed_state(eq->system, state);
        eq->unit[eq->count] = eq->is_signed[eq->count] && x0[state] != 0 ? fabs(x0[state]) : 1;
        eq->count++;
    }
}

lb_status equations_new(lb_evaluator *evaluator, const equations_laws *laws, const double *x0, const bool *is_zero,
                        equations **out, lb_error *err)
{
    *out = NULL;
    equations *eq = memory_zeroed(1, sizeof *eq);
    if (!eq)
        return status_no_memory(err);
    eq->evaluator = evaluator;
    eq->system = evaluator_system(evaluator);
    eq->laws = laws;
    lb_status status = allocate(eq) ? equations_find_alive(evaluator, is_zero, eq->is_alive, err)
                                    : status_no_memory(err);
    if (status == LB_OK) {
        choose_unknowns(eq, x0, is_zero);
        choose_laws(eq);
        status = make_terms(eq) ? LB_OK : status_no_memory(err);
    }
    if (status == LB_OK) {
        choose_forms(eq);
        status = add_pools(eq, err);
    }
    if (status != LB_OK) {
        equations_free(eq);
        return status;
    }
    for (int i = 0; i < eq->system->n; i++)
        eq->x[i] = eq->system->core_index[i] < 0 ? x0[i] : 0;
    *out = eq;
    return LB_OK;
}

void equations_free(equations *eq)
{
    if (!eq)
        return;
    memory_free(eq->state);
    memory_free(eq->unknown);
    memory_free(eq->is_signed);
    memory_free(eq->unit);
    memory_free(eq->law);
    memory_free(eq->is_alive);
    memory_free(eq->is_positive);
    memory_free(eq->pool);
    memory_free(eq->start);
    memory_free(eq->term);
    memory_free(eq->is_ratio);
    memory_free(eq->size);
    memory_free(eq->law_size);
    memory_free(eq->x);
    memory_free(eq->rate);
    memory_free(eq->jacobian);
    memory_free(eq);
}

/* ---- Values ------------------------------------------------------------------------ */

void equations_place(equations *eq, const double *u)
{
    for (int i = 0; i < eq->count; i++)
        eq->x[eq->state[i]] = eq->is_signed[i] ? u[i] * eq->unit[i] : exp(u[i]);
}

void equations_take(const equations *eq, const double *x, double *u)
{
    for (int i = 0; i < eq->count; i++)
        u[i] = eq->is_signed[i] ? x[eq->state[i]] / eq->unit[i] : log(x[eq->state[i]]);
}

static void gain_and_loss(const equations *eq, int i, double *gain, double *loss)
{
    *gain = *loss = 0;
    for (int t = eq->start[i]; t < eq->start[i + 1]; t++) {
        double term = eq->term[t].coefficient * eq->rate[eq->term[t].step];
        if (term > 0)
            *gain += term;
        else
            *loss -= term;
    }
}

/* Coefficient of unknown i in a law. */
static double law_entry(const equations *eq, int law, int i)
{
    return eq->laws->law[(size_t)law * (size_t)eq->laws->width + (size_t)eq->system->core_index[eq->state[i]]];
}

static void law_sums(const equations *eq, int law, double *sum, double *size)
{
    *sum = 0;
    *size = fabs(eq->laws->total[law]);
    for (int i = 0; i < eq->count; i++) {
        double term = law_entry(eq, law, i) * eq->x[eq->state[i]];
        *sum += term;
        *size += fabs(term);
    }
}

static double law_value(const equations *eq, int l)
{
    double sum, size;
    law_sums(eq, eq->law[l], &sum, &size);
    if (eq->laws->is_positive[eq->law[l]])
        return log(sum / eq->laws->total[eq->law[l]]);
    return (sum - eq->laws->total[eq->law[l]]) / eq->law_size[l];
}

static double balance_value(const equations *eq, int i, bool is_plain)
{
    double gain, loss;
    if (eq->start[i] == eq->start[i + 1] || (is_plain && i >= eq->count))
        return 0;
    gain_and_loss(eq, i, &gain, &loss);
    return eq->is_ratio[i] && !is_plain ? log(gain / loss) : (gain - loss) / eq->size[i];
}

static bool fill_values(equations *eq, bool is_plain, double *F)
{
    double sum = 0;
    for (int i = 0; i < eq->balances; i++)
        F[i] = balance_value(eq, i, is_plain);
    for (int l = 0; l < eq->law_count; l++)
        F[eq->balances + l] = law_value(eq, l);
    for (int row = 0; row < eq->rows; row++)
        sum += F[row] * F[row];
    return isfinite(sum);
}

bool equations_values(equations *eq, const double *u, double *F)
{
    equations_place(eq, u);
    evaluator_step_rates(eq->evaluator, eq->x, eq->rate);
    return fill_values(eq, false, F);
}

/* ---- Derivatives ---------------------------------------------------------------------- */

/* d x / d u of an unknown. */
static double slope_of(const equations *eq, int i)
{
    return eq->is_signed[i] ? eq->unit[i] : eq->x[eq->state[i]];
}

/* Power laws know their own logarithmic derivatives. */
static void ratio_row(const equations *eq, int i, double *A)
{
    double gain, loss;
    gain_and_loss(eq, i, &gain, &loss);
    for (int t = eq->start[i]; t < eq->start[i + 1]; t++) {
        const network_step *s = &eq->system->network->steps[eq->term[t].step];
        double term = eq->term[t].coefficient * eq->rate[eq->term[t].step];
        double share = term > 0 ? term / gain : term / loss;
        for (int o = 0; o < s->order_count; o++) {
            int j = eq->unknown[s->orders[o].state];
            if (j >= 0)
                A[i + (size_t)j * (size_t)eq->rows] += share * s->orders[o].order;
        }
    }
}

/* Plain balances: unscaled rows of the Jacobian in u. */
static void plain_rows(const equations *eq, bool is_all, double *A)
{
    for (int j = 0; j < eq->count; j++)
        for (int p = eq->system->column_start[eq->state[j]]; p < eq->system->column_start[eq->state[j] + 1]; p++) {
            int i = eq->unknown[eq->system->row[p]];
            if (i >= 0 && (is_all || !eq->is_ratio[i]))
                A[i + (size_t)j * (size_t)eq->rows] = eq->jacobian[p] * slope_of(eq, j);
        }
}

static void start_sizes(equations *eq)
{
    for (int i = 0; i < eq->count; i++) {
        double gain, loss;
        gain_and_loss(eq, i, &gain, &loss);
        eq->size[i] = gain + loss;
    }
}

/* Terms that cancel inside one rate law show in its derivatives. */
static void add_reaches(equations *eq)
{
    for (int j = 0; j < eq->count; j++) {
        int state = eq->state[j];
        double reach = eq->is_signed[j] ? fmax(eq->unit[j], fabs(eq->x[state])) : eq->x[state];
        for (int p = eq->system->column_start[state]; p < eq->system->column_start[state + 1]; p++)
            if (eq->unknown[eq->system->row[p]] >= 0)
                eq->size[eq->unknown[eq->system->row[p]]] += fabs(eq->jacobian[p]) * reach;
    }
}

static void scale_plain_rows(equations *eq, double inertia, double *A)
{
    for (int i = 0; i < eq->count; i++) {
        if (eq->is_ratio[i] && inertia <= 0)
            continue;
        if (!(eq->size[i] > 0))
            eq->size[i] = 1;
        if (inertia > 0)
            A[i + (size_t)i * (size_t)eq->rows] -= inertia * slope_of(eq, i);
        for (int j = 0; j < eq->count; j++)
            A[i + (size_t)j * (size_t)eq->rows] /= eq->size[i];
    }
}

static void law_row(equations *eq, int l, double *A)
{
    int law = eq->law[l];
    double sum, size;
    law_sums(eq, law, &sum, &size);
    eq->law_size[l] = size > 0 ? size : 1;
    double scale = eq->laws->is_positive[law] ? sum : eq->law_size[l];
    for (int j = 0; j < eq->count; j++)
        A[eq->balances + l + (size_t)j * (size_t)eq->rows] = law_entry(eq, law, j) * slope_of(eq, j) / scale;
}

bool equations_matrix(equations *eq, const double *u, double inertia, double *F, double *A)
{
    bool is_plain = inertia > 0;
    equations_place(eq, u);
    evaluator_step_rates(eq->evaluator, eq->x, eq->rate);
    memset(A, 0, (size_t)eq->rows * (size_t)eq->count * sizeof *A);
    start_sizes(eq);
    if (eq->is_general || is_plain) {
        lb_jacobian_sparse(eq->evaluator, eq->x, eq->jacobian);
        add_reaches(eq);
        plain_rows(eq, is_plain, A);
    }
    for (int i = 0; i < eq->balances && !is_plain; i++)
        if (eq->is_ratio[i])
            ratio_row(eq, i, A);
    scale_plain_rows(eq, inertia, A);
    for (int l = 0; l < eq->law_count; l++)
        law_row(eq, l, A);
    return fill_values(eq, is_plain, F);
}

double equations_residual(const equations *eq, const double *F)
{
    double residual = 0;
    for (int row = 0; row < eq->rows; row++)
        residual = fmax(residual, fabs(F[row]));
    return residual;
}

double equations_balance_error(equations *eq, const double *u)
{
    double error = 0;
    equations_place(eq, u);
    evaluator_step_rates(eq->evaluator, eq->x, eq->rate);
    lb_jacobian_sparse(eq->evaluator, eq->x, eq->jacobian);
    start_sizes(eq);
    add_reaches(eq);
    for (int i = 0; i < eq->count; i++)
        if (eq->size[i] > 0)
            error = fmax(error, fabs(balance_value(eq, i, true)));
    return error;
}

/* Steady-state equations in logarithms.
 *
 * The balance of a species whose gains and losses are all positive is written as
 * ln(gain/loss) = 0: in log concentrations that is linear as soon as one power law
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

/* ---- Values ------------------------------------------------------------------------ */

void equations_place(equations *eq, const double *u)
{
    for (int i = 0; i < eq->count; i++)
        eq->x[eq->state[i]] = eq->is_signed[i] ? u[i] * eq->unit[i] : exp(u[i]);
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

/* In the form of the ratio? */
static bool is_ratio(const equations *eq, int i)
{
    return eq->is_ratio[i] && (i >= eq->count || !eq->is_plain);
}

static double balance_value(const equations *eq, int i)
{
    double gain, loss;
    if (eq->start[i] == eq->start[i + 1])
        return 0;
    gain_and_loss(eq, i, &gain, &loss);
    return is_ratio(eq, i) ? log(gain / loss) : (gain - loss) / eq->size[i];
}

static bool fill_values(equations *eq, double *F)
{
    double sum = 0;
    for (int i = 0; i < eq->balances; i++)
        F[i] = balance_value(eq, i);
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
    return fill_values(eq, F);
}

/* ---- Derivatives ---------------------------------------------------------------------- */

/* d x / d u of an unknown. */
static double slope_of(const equations *eq, int i)
{
    return eq->is_signed[i] ? eq->unit[i] : eq->x[eq->state[i]];
}

/* A row of ln(gain/loss).  Power laws know their own logarithmic derivatives.  Where one
 * side has other laws too, A holds df/du when it comes in, and they are what that has
 * beyond the power laws; they count as constant where their side is so small that it
 * drowns in the rounding of the other. */
static void ratio_row(const equations *eq, int i, double *A)
{
    double gain, loss, weight = 0;
    gain_and_loss(eq, i, &gain, &loss);
    if (i < eq->count && eq->is_general_gain[i] && loss < 1e8 * gain)
        weight = 1 / gain;
    if (i < eq->count && eq->is_general_loss[i] && gain < 1e8 * loss)
        weight = 1 / loss;
    for (int j = 0; j < eq->count; j++)
        A[i + (size_t)j * (size_t)eq->rows] *= weight;
    for (int t = eq->start[i]; t < eq->start[i + 1]; t++) {
        const network_step *s = &eq->system->network->steps[eq->term[t].step];
        double term = eq->term[t].coefficient * eq->rate[eq->term[t].step];
        double share = term * (1 / (term > 0 ? gain : loss) - weight);
        for (int o = 0; s->is_power_law && o < s->order_count; o++) {
            int j = eq->unknown[s->orders[o].state];
            if (j >= 0)
                A[i + (size_t)j * (size_t)eq->rows] += share * s->orders[o].order;
        }
    }
}

/* Is the row of a balance made from the Jacobian? */
static bool needs_jacobian(const equations *eq, int i)
{
    return !is_ratio(eq, i) || eq->is_general_gain[i] || eq->is_general_loss[i];
}

/* Unscaled rows of the Jacobian in u. */
static void jacobian_rows(const equations *eq, double *A)
{
    for (int j = 0; j < eq->count; j++)
        for (int p = eq->system->column_start[eq->state[j]]; p < eq->system->column_start[eq->state[j] + 1]; p++) {
            int i = eq->unknown[eq->system->row[p]];
            if (i >= 0 && needs_jacobian(eq, i))
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

/* Terms that cancel inside one rate law show in its derivatives.  is_own: in the state
 * as it is; else a signed unknown is taken to reach its unit at least. */
static void add_reaches(equations *eq, bool is_own)
{
    for (int j = 0; j < eq->count; j++) {
        int state = eq->state[j];
        double reach = fmax(eq->is_signed[j] && !is_own ? eq->unit[j] : 0, fabs(eq->x[state]));
        for (int p = eq->system->column_start[state]; p < eq->system->column_start[state + 1]; p++)
            if (eq->unknown[eq->system->row[p]] >= 0)
                eq->size[eq->unknown[eq->system->row[p]]] += fabs(eq->jacobian[p]) * reach;
    }
}

static void scale_plain_rows(equations *eq, double *A)
{
    for (int i = 0; i < eq->count; i++) {
        if (is_ratio(eq, i))
            continue;
        if (!(eq->size[i] > 0))
            eq->size[i] = 1;
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

bool equations_matrix(equations *eq, const double *u, double *F, double *A)
{
    equations_place(eq, u);
    evaluator_step_rates(eq->evaluator, eq->x, eq->rate);
    memset(A, 0, (size_t)eq->rows * (size_t)eq->count * sizeof *A);
    start_sizes(eq);
    if (eq->is_general || eq->is_plain) {
        lb_jacobian_sparse(eq->evaluator, eq->x, eq->jacobian);
        add_reaches(eq, false);
        jacobian_rows(eq, A);
    }
    for (int i = 0; i < eq->balances; i++)
        if (is_ratio(eq, i))
            ratio_row(eq, i, A);
    scale_plain_rows(eq, A);
    for (int l = 0; l < eq->law_count; l++)
        law_row(eq, l, A);
    return fill_values(eq, F);
}

/* The pools' balances follow from the species' in a steady state, not on the way. */
void equations_add_inertia(const equations *eq, double inertia, double *F, double *A)
{
    for (int i = 0; i < eq->count; i++)
        A[i + (size_t)i * (size_t)eq->rows] -= inertia * slope_of(eq, i) / eq->size[i];
    for (int i = eq->count; i < eq->balances; i++) {
        F[i] = 0;
        for (int j = 0; j < eq->count; j++)
            A[i + (size_t)j * (size_t)eq->rows] = 0;
    }
}

double equations_residual(const equations *eq, const double *F)
{
    double residual = 0;
    for (int row = 0; row < eq->rows; row++)
        residual = fmax(residual, fabs(F[row]));
    return residual;
}

/* Sizes of the balances in the state in hand. */
static void measure(equations *eq, bool is_own)
{
    evaluator_step_rates(eq->evaluator, eq->x, eq->rate);
    lb_jacobian_sparse(eq->evaluator, eq->x, eq->jacobian);
    start_sizes(eq);
    add_reaches(eq, is_own);
}

static double largest_error(const equations *eq)
{
    double error = 0, gain, loss;
    for (int i = 0; i < eq->count; i++) {
        gain_and_loss(eq, i, &gain, &loss);
        if (eq->size[i] > 0)
            error = fmax(error, fabs(gain - loss) / eq->size[i]);
    }
    return error;
}

double equations_balance_error(equations *eq, const double *u)
{
    equations_place(eq, u);
    measure(eq, false);
    return largest_error(eq);
}

/* Is nothing left of some balance, even with the signed unknowns near zero moved away? */
static bool has_lost_balance(equations *eq, const double *u)
{
    equations_place(eq, u);
    for (int i = 0; i < eq->count; i++)
        if (eq->is_signed[i] && fabs(u[i]) < 1e-3)
            eq->x[eq->state[i]] = eq->unit[i];
    measure(eq, true);
    for (int i = 0; i < eq->count; i++)
        if (eq->start[i] < eq->start[i + 1] && eq->size[i] == 0)
            return true;
    return false;
}

double equations_own_error(equations *eq, const double *u)
{
    if (has_lost_balance(eq, u))
        return 1;
    equations_place(eq, u);
    measure(eq, true);
    return largest_error(eq);
}

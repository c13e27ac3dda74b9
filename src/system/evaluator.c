/* Evaluation by tables: rates, right-hand side, Jacobian, constant derivatives; where
 * the system has native code, the public calls go there.
 *
 * Rates of power laws are products of looked-up factors, those of general laws
 * come from a program; dx/dt, J and df/dk are compressed sums over them in
 * network order.  Nothing here allocates, and nothing divides by a state. */
#include "system/evaluator.h"

#include <math.h>
#include <string.h>

#include "system/native.h"

/* ---- Rates ---------------------------------------------------------------------- */

static void load_state(lb_evaluator *ev, const double *x)
{
    memcpy(ev->x, x, (size_t)ev->table->n * sizeof *x);
}

static double follow_links(const table_chains *chains, const table_chain *chain, const double *x, double product)
{
    for (size_t i = chain->first; i < chain->last; i++) {
        const table_link *link = &chains->link[i];
        double concentration = x[link->state];
        if (link->operation == LINK_PLAIN)
            product *= concentration;
        else if (link->operation == LINK_POWER)
            product *= expression_power(concentration, link->order);
        else
            product *= expression_slope(concentration, link->order);
    }
    return product;
}

/* Power laws with the given factors [steps]. */
static void power_law_rates(const table *t, const double *x, const double *factor, double *v)
{
    for (size_t i = 0; i < t->rate_count; i++) {
        const table_rate *rate = &t->rates[i];
        v[rate->step] = factor[rate->step] * x[rate->a] * x[rate->b] * x[rate->c];
    }
    for (size_t i = 0; i < t->rate_chains.count; i++) {
        const table_chain *chain = &t->rate_chains.chain[i];
        v[chain->target] = follow_links(&t->rate_chains, chain, x, factor[chain->step]);
    }
}

/* All rates into ev->v; ev->x holds the state. */
static void all_rates(lb_evaluator *ev)
{
    const table *t = ev->table;
    power_law_rates(t, ev->x, ev->factor, ev->v);
    program_run(&t->rate_program, ev->x, ev->values);
    for (size_t i = 0; i < t->rate_law_count; i++)
        ev->v[t->rate_laws[i].target] = ev->values[t->rate_laws[i].node];
}

void evaluator_step_rates(lb_evaluator *ev, const double *x, double *v)
{
    load_state(ev, x);
    all_rates(ev);
    memcpy(v, ev->v, (size_t)ev->table->steps * sizeof *v);
}

void lb_rates(lb_evaluator *ev, const double x[], double v[])
{
    if (ev->system->native) {
        ev->system->native->rates(0, x, ev->k, v);
        return;
    }
    load_state(ev, x);
    all_rates(ev);
    memcpy(v, ev->v, (size_t)ev->system->r * sizeof *v);
}

/* ---- Right-hand side --------------------------------------------------------------- */

void lb_rhs(lb_evaluator *ev, const double x[], double dxdt[])
{
    const table *t = ev->table;
    if (ev->system->native) {
        ev->system->native->rhs(0, x, ev->k, dxdt);
        return;
    }
    load_state(ev, x);
    all_rates(ev);
    for (int i = 0; i < t->n; i++) {
        double sum = 0;
        for (int e = t->row_start[i]; e < t->row_start[i + 1]; e++)
            sum += ev->row_coefficient[e] * ev->v[t->row_step[e]];
        dxdt[i] = sum;
    }
}

void evaluator_rhs_scaled(lb_evaluator *ev, const double *x, double *dxdt, double *magnitude)
{
    const table *t = ev->table;
    lb_rhs(ev, x, dxdt);
    if (magnitude && ev->system->native) {
        load_state(ev, x);
        all_rates(ev);
    }
    for (int i = 0; magnitude && i < t->n; i++) {
        double sum = 0;
        for (int e = t->row_start[i]; e < t->row_start[i + 1]; e++)
            sum += fabs(ev->row_coefficient[e] * ev->v[t->row_step[e]]);
        magnitude[i] = sum;
    }
}

/* ---- Jacobian ------------------------------------------------------------------------ */

/* Derivatives of all rates into ev->slot. */
static void all_slopes(lb_evaluator *ev)
{
    const table *t = ev->table;
    const double *x = ev->x;
    for (size_t i = 0; i < t->slope_count; i++) {
        const table_slope *slope = &t->slopes[i];
        ev->slot[slope->slot] = slope->multiplier * ev->factor[slope->step] * x[slope->a] * x[slope->b];
    }
    for (size_t i = 0; i < t->slope_chains.count; i++) {
        const table_chain *chain = &t->slope_chains.chain[i];
        ev->slot[chain->target] =
            follow_links(&t->slope_chains, chain, x, chain->multiplier * ev->factor[chain->step]);
    }
    program_run(&t->slope_program, x, ev->values);
    for (size_t i = 0; i < t->slope_law_count; i++)
        ev->slot[t->slope_laws[i].target] = ev->values[t->slope_laws[i].node];
}

void lb_jacobian_sparse(lb_evaluator *ev, const double x[], double values[])
{
    const table *t = ev->table;
    if (ev->system->native) {
        ev->system->native->jacobian_sparse(0, x, ev->k, values);
        return;
    }
    load_state(ev, x);
    all_slopes(ev);
    for (int s = 0; s < t->single_terms; s++) {
        int z = t->nonzero_order[s];
        size_t i = t->term_start[z];
        values[z] = 0 + ev->term_coefficient[i] * ev->slot[t->term_slot[i]];
    }
    for (int s = t->single_terms; s < t->nonzeros; s++) {
        int z = t->nonzero_order[s];
        double sum = 0;
        for (size_t i = t->term_start[z]; i < t->term_start[z + 1]; i++)
            sum += ev->term_coefficient[i] * ev->slot[t->term_slot[i]];
        values[z] = sum;
    }
}

void lb_jacobian(lb_evaluator *ev, const double x[], double J[])
{
    const lb_system *system = ev->system;
    size_t n = (size_t)system->n;
    lb_jacobian_sparse(ev, x, ev->sparse);
    memset(J, 0, n * n * sizeof *J);
    for (size_t j = 0; j < n; j++)
        for (int z = system->column_start[j]; z < system->column_start[j + 1]; z++)
            J[(size_t)system->row[z] + j * n] = ev->sparse[z];
}

/* ---- Derivatives by constants ------------------------------------------------------------ */

/* D[:, constant] += coefficients of the step times dv. */
static void add_step_column(const lb_evaluator *ev, int step, int constant, double dv, double *D)
{
    const table *t = ev->table;
    double *column = D + (size_t)constant * (size_t)t->n;
    for (int e = t->entry_start[step]; e < t->entry_start[step + 1]; e++)
        column[t->entry_state[e]] += ev->coefficient[e] * dv;
}

/* Rates' derivatives, factors and whole laws merged by step so that sums keep network order;
 * then those of coefficients. */
void lb_dfdk(lb_evaluator *ev, const double x[], double D[])
{
    const table *t = ev->table;
    if (ev->system->native) {
        ev->system->native->dfdk(0, x, ev->k, D);
        return;
    }
    load_state(ev, x);
    all_rates(ev);
    power_law_rates(t, ev->x, t->ones, ev->unit);
    program_run(&t->law_program, ev->x, ev->values);
    memset(D, 0, (size_t)t->n * (size_t)ev->system->m * sizeof *D);
    size_t f = 0, l = 0;
    while (f < t->factors.count || l < t->laws.count) {
        bool is_factor = l == t->laws.count || (f < t->factors.count && t->factors.list[f].of < t->laws.list[l].of);
        const table_parameter *p = is_factor ? &t->factors.list[f++] : &t->laws.list[l++];
        double dv = ev->values[p->node] * (is_factor ? ev->unit[p->of] : 1);
        add_step_column(ev, p->of, p->constant, dv, D);
    }
    for (size_t i = 0, s = 0; i < t->coefficients.count; i++) {
        const table_parameter *p = &t->coefficients.list[i];
        while (t->entry_start[s + 1] <= p->of)
            s++;
        D[(size_t)t->entry_state[p->of] + (size_t)p->constant * (size_t)t->n] += ev->values[p->node] * ev->v[s];
    }
}

/* ---- The rest ------------------------------------------------------------------------------ */

void lb_initial(lb_evaluator *ev, double x[])
{
    const lb_network *net = ev->system->network;
    for (int i = 0; i < ev->table->n; i++)
        x[i] = ev->values[ev->table->node_of[net->species[net->state_species[i]].initial]];
}

void lb_readings(lb_evaluator *ev, const double x[], double values[])
{
    const lb_network *net = ev->system->network;
    program_run(&ev->table->reading_program, x, ev->values);
    for (int i = 0; i < net->reading_count; i++)
        values[i] = ev->values[ev->table->node_of[net->readings[i].value]];
}

const lb_system *evaluator_system(const lb_evaluator *ev)
{
    return ev->system;
}

const double *evaluator_constants(const lb_evaluator *ev)
{
    return ev->k;
}

const double *evaluator_coefficients(const lb_evaluator *ev, int step)
{
    return ev->coefficient + ev->table->entry_start[step];
}

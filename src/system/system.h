/* The system behind its one interface: tables, conservation laws, the core.
 *
 * Core: what takes part in the dynamics.  A species that enters no rate is set
 * aside, steps that change nothing else are dropped, repeatedly (design: "What
 * is analysed").  Laws, rank and the reaction space exist for the whole network
 * (for totals and for species set aside) and for the core (for steady states,
 * eigenvalues, cycles).
 *
 * Laws of very large networks may be out of reach (conservation.h, LB_E_LIMIT):
 * the system is then made without them, so that it can be integrated; `laws_known`
 * is false, and what needs laws or the reaction space must refuse. */
#ifndef LIMBECK_SYSTEM_SYSTEM_H
#define LIMBECK_SYSTEM_SYSTEM_H

#include <stdbool.h>
#include <stdint.h>

#include "exact/conservation.h"
#include "limbeck.h"
#include "model/network.h"

struct lb_system {
    const lb_network *network;
    int n, m, r;                    /* states, constants, reaction steps (without flows) */
    int steps;                      /* with flows */
    int nonzeros;
    int *column_start, *row;        /* Jacobian pattern, [n+1], [nonzeros] */
    bool laws_known;                /* else: no laws, rank -1, nothing independent or dependent */
    conservation laws;              /* of all n states */

    int core;                       /* number of core states */
    int *core_state;                /* [core] state of each, ascending */
    int *core_index;                /* [n] place in core_state, or -1 when set aside */
    bool *core_step;                /* [steps] takes part */
    conservation core_laws;         /* over core indices */
    int rank;                       /* dimension of the core's reaction space */
    int *independent;               /* [rank] core indices */
    int *dependent;                 /* [core - rank] core indices */
    double *elimination;            /* [(core-rank)*rank] L, column-major:
                                     * x_dependent[d] = const_d - sum_i L[d + i*(core-rank)] x_independent[i] */
    int fixed_count;                /* species set aside whose value the laws fix */
    int *fixed_state;               /* [fixed_count] */
    double *fixed_weight;           /* [fixed_count*n] row w of each: w x is conserved, w has 1 at the species
                                     * and 0 at all others set aside */
    struct table *table;            /* system/table.h */
    struct native *native;          /* system/native.h; NULL: tables are used */
    char engine_note[sizeof ((lb_error *)0)->message]; /* why native code is not, though asked for; "" */
};

/* LB_OK, or LB_E_LIMIT with a message when the laws are not known: the first question of
 * every analysis that needs them. */
lb_status system_require_laws(const lb_system *system, lb_error *err);

/* Reduced Jacobian of the core on its reaction space, [rank*rank]:
 * d f_independent / d x_independent with the dependent species eliminated; its
 * eigenvalues are those of J on the image of N.  J is the full [n*n] Jacobian. */
void system_reduce(const lb_system *system, const double *J, double *reduced);

/* Totals of the core's laws at x [n]: out [core_laws.count]. */
void system_core_totals(const lb_system *system, const double *x, double *out);

/* Give x [n] the values of the species set aside that the laws of the whole
 * network fix, from the totals of x0 [n]; NAN where none does. */
void system_complete(const lb_system *system, const double *x0, double *x);

const lb_system *evaluator_system(const lb_evaluator *evaluator);
const double *evaluator_constants(const lb_evaluator *evaluator);      /* [m] bound */
/* Rates of all steps, flows included: v [steps]; and the sum of the terms' magnitudes
 * of each dx/dt: magnitude [n] (NULL allowed), for scaled residuals. */
void evaluator_step_rates(lb_evaluator *evaluator, const double *x, double *v);
void evaluator_rhs_scaled(lb_evaluator *evaluator, const double *x, double *dxdt, double *magnitude);
/* Net coefficient of every entry of step s at the bound constants, in the order of
 * network->steps[s].entries. */
const double *evaluator_coefficients(const lb_evaluator *evaluator, int step);
/* An evaluator of its own for another thread or another binding, bound the same. */
lb_status evaluator_copy(const lb_evaluator *evaluator, lb_evaluator **out, lb_error *err);

#endif

/* The steady-state equations of the core, or of what is left of it on a face
 * where some species are zero, in one compatibility class.
 *
 * Unknowns u [count]: ln x of an unsigned species, x/unit of a signed one.
 * Rows: one balance per unknown, then the balances of pools, then one per
 * conservation law.  There are more rows than unknowns when there are pools or
 * laws, and they are consistent at a root.
 *
 * A pool is a weighted sum of species that only some steps change: all but flows,
 * or the reversible ones, would conserve it.  Its balance follows from those of its species, but there
 * it is a small difference of large terms, so it is better had directly. */
#ifndef LIMBECK_ANALYSIS_EQUATIONS_H
#define LIMBECK_ANALYSIS_EQUATIONS_H

#include <stdbool.h>

#include "limbeck.h"
#include "system/system.h"

/* Conservation laws in numbers, with their values in the class. */
typedef struct equations_laws {
    int count, width;       /* width: core species */
    int basis;              /* the first `basis` rows are independent and span the rest */
    double *law;            /* [count*width], row after row */
    double *total;          /* [count] */
    double *size;           /* [count] sum of |coefficient * x0|: what rounding of the total is measured by */
    bool *is_positive;      /* [count] no negative coefficient, and no signed species in it */
    int pool_count;
    double *pool;           /* [pool_count*width] non-negative weights */
} equations_laws;

/* One step's part in one balance. */
typedef struct equations_term {
    int step;
    double coefficient;
} equations_term;

typedef struct equations {
    lb_evaluator *evaluator;        /* borrowed */
    const lb_system *system;
    const equations_laws *laws;     /* borrowed */
    int count;                      /* unknowns */
    int *state;                     /* [count] state of each */
    int *unknown;                   /* [n] place in state, or -1 */
    bool *is_signed;                /* [count] */
    double *unit;                   /* [count] of a signed unknown; 1 for the others */
    int *law;                       /* [law_count] rows of laws with an unknown in them */
    int law_count;
    int *pool;                      /* [pool_count] pools of laws that have a balance here */
    int pool_count;
    int balances;                   /* count + pool_count */
    int rows;                       /* balances + law_count */
    bool *is_alive;                 /* [steps] takes part, and its rate does not vanish on the face */
    bool *is_positive;              /* [steps] of positive rate wherever the unsigned unknowns are positive */
    int *start;                     /* [balances+1] terms of each balance */
    equations_term *term;
    size_t term_capacity;
    bool *is_ratio;                 /* [balances] positive gains and losses: ln(gain/loss), else (gain - loss)/size */
    bool *is_general_gain, *is_general_loss; /* [count] some gain, some loss is no power law; not both in a ratio */
    bool is_plain;                  /* set by who asks: no ratios but in the balances of pools */
    bool is_general;                /* some balance needs the Jacobian */
    bool is_inconsistent;           /* a total cannot be met on this face */
    double *size;                   /* [count] scale of each plain balance, of the last equations_matrix */
    double *law_size;               /* [law_count] the same for laws with signs */
    double *x;                      /* [n] state in hand: zero on the face, x0 for species set aside */
    double *rate;                   /* [steps] */
    double *jacobian;               /* [nonzeros] */
} equations;

/* Laws of the core (of the steps that are alive at the bound constants) with
 * the totals of x0 [n], and pools.  Clear laws after a failure too. */
lb_status equations_laws_init(equations_laws *laws, lb_evaluator *evaluator, const double *x0, lb_error *err);
void equations_laws_clear(equations_laws *laws);

bool equations_is_signed(const lb_system *system, int state);

/* A point x [n] in general position, close to one: powers of different species do
 * not cancel there. */
void equations_probe(const lb_system *system, int probe, double *x);

/* Which steps of the core have a rate that does not vanish identically when the
 * states with is_zero [n] are zero: by evaluation at several points. */
lb_status equations_find_alive(lb_evaluator *evaluator, const bool *is_zero, bool *is_alive, lb_error *err);

/* is_zero [n]: the face; NULL: none.  x0 [n] gives the values of species set
 * aside and the unit of signed ones. */
lb_status equations_new(lb_evaluator *evaluator, const equations_laws *laws, const double *x0, const bool *is_zero,
                        equations **out, lb_error *err);
void equations_free(equations *eq);

/* Sets eq->x from u. */
void equations_place(equations *eq, const double *u);

/* Residuals F [rows] at u, plain rows scaled by the sizes of the last
 * equations_matrix.  False when something is not finite. */
bool equations_values(equations *eq, const double *u, double *F);

/* Residuals and their derivatives A [rows*count], column-major, with fresh sizes. */
bool equations_matrix(equations *eq, const double *u, double *F, double *A);

/* Turns F and A of the plain form into one implicit Euler step of 1/inertia: with
 * A du = -F, the balances of pools left out (zero). */
void equations_add_inertia(const equations *eq, double inertia, double *F, double *A);

/* The largest of |F| [rows]. */
double equations_residual(const equations *eq, const double *F);

/* max_i |f_i| / size_i at u, with the sizes of all balances in the plain form. */
double equations_balance_error(equations *eq, const double *u);

/* The same against the terms that each balance has in this very state: signed species
 * near zero add none, a balance of one term is off by all of itself, and so is one
 * whose terms and derivatives have all underflowed. */
double equations_own_error(equations *eq, const double *u);

#endif

/* Which species the conservation laws give, in the linear systems of the stiff
 * method. */
#ifndef LIMBECK_ANALYSIS_STIFF_LAWS_H
#define LIMBECK_ANALYSIS_STIFF_LAWS_H

#include <stdbool.h>

#include "limbeck.h"
#include "system/system.h"

/* Reduced laws: 1 at a law's own species, 0 at those of the others. */
typedef struct stiff_laws {
    const lb_system *system;
    int count;                  /* independent laws */
    int *dependent;             /* [count] the species that each law gives; -1: law not in use */
    int free;                   /* species that no law gives */
    int *place;                 /* [n] number of a species among the free ones; -1: a law gives it */
    size_t *start;              /* [count+1] */
    int *species;               /* [start[count]] free species of each law */
    double *weight;             /* their coefficients: u_dependent = -sum weight u_species */
    double *dense;              /* [count*n] room for the reduction */
    bool is_chosen;
} stiff_laws;

lb_status stiff_laws_init(stiff_laws *laws, const lb_system *system);   /* LB_E_NOMEM */
void stiff_laws_clear(stiff_laws *laws);
void stiff_laws_forget(stiff_laws *laws);       /* the next choice depends on its sizes alone */

/* Choose by the sizes [n] >= 0 of all species; false when the choice made before
 * still fits and stays. */
bool stiff_laws_choose(stiff_laws *laws, const double *size);

/* u [n]: give the dependent species their values from the free ones. */
void stiff_laws_complete(const stiff_laws *laws, double *u);

#endif

/* The linear systems of the stiff method: W u = b with W = I/(h gamma) - J. */
#ifndef LIMBECK_ANALYSIS_STIFF_MATRIX_H
#define LIMBECK_ANALYSIS_STIFF_MATRIX_H

#include <stdbool.h>

#include "limbeck.h"
#include "system/system.h"

typedef struct stiff_matrix {
    const lb_system *system;
    int n;
    int laws;                   /* independent conservation laws */
    int free;                   /* equations that are left: n less the laws in use */
    double *law;                /* [laws*n] row after row, reduced: 1 at its own species, 0 at the other laws' */
    int *dependent;             /* [laws] the species that each law gives; -1: law not in use */
    int *place;                 /* [n] number of a species among the free ones; -1: a law gives it */
    double *W;                  /* [free*free] factored */
    int *pivot;                 /* [free] */
    double *compact;            /* [free*columns] right-hand sides of the free species */
} stiff_matrix;

/* Room for right-hand sides of up to so many columns.  LB_E_NOMEM. */
lb_status stiff_matrix_init(stiff_matrix *matrix, const lb_system *system, int columns);
void stiff_matrix_clear(stiff_matrix *matrix);

/* Choose the species that the laws give, by the sizes [n] >= 0 of all, for the
 * factorisations that follow. */
void stiff_matrix_choose(stiff_matrix *matrix, const double *size);
/* diagonal = 1/(h gamma), J by its values [nonzeros]; false when singular. */
bool stiff_matrix_factor(stiff_matrix *matrix, double diagonal, const double *values);
/* Right-hand sides B [n*columns], each a combination of columns of N, in place. */
void stiff_matrix_solve(const stiff_matrix *matrix, int columns, double *B);

#endif

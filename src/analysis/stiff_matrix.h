/* The linear systems of the stiff method: W u = b with W = I/(h gamma) - J. */
#ifndef LIMBECK_ANALYSIS_STIFF_MATRIX_H
#define LIMBECK_ANALYSIS_STIFF_MATRIX_H

#include <stdbool.h>

#include "analysis/sparse.h"
#include "analysis/stiff_laws.h"
#include "limbeck.h"
#include "system/system.h"

#define STIFF_DENSE_LIMIT 4000          /* species: 128 MB of dense matrix */
#define STIFF_SPARSE_LIMIT 1e8          /* entries of L and U: 1.2 GB */

typedef struct stiff_matrix {
    const lb_system *system;
    int n;
    stiff_laws laws;
    bool is_sparse;             /* which of the two forms below the last choice came to */
    /* dense: the free species alone */
    double *W;                  /* [free*free] factored; NULL until it is needed */
    size_t room;                /* numbers that W holds */
    int *pivot;                 /* [n] */
    double *inverse;            /* [n] of the pivots' values */
    double *compact;            /* [n] a right-hand side of the free species */
    /* sparse: all species, a law in place of the row of the species that it gives */
    int *start, *row;           /* pattern, [n+1] and [start[n]] */
    int *origin;                /* [start[n]] entry of J that an entry comes from; -1: of a law or the diagonal alone */
    double *multiple;           /* [start[n]] what the diagonal 1/(h gamma) is multiplied by in an entry */
    double *values;             /* [start[n]] */
    sparse_lu *lu;
} stiff_matrix;

lb_status stiff_matrix_init(stiff_matrix *matrix, const lb_system *system);     /* LB_E_NOMEM */
void stiff_matrix_clear(stiff_matrix *matrix);
/* What follows depends on the sizes that are given from now on alone. */
void stiff_matrix_forget(stiff_matrix *matrix);

/* Choose the species that the laws give, by the sizes [n] >= 0 of all, and the form of
 * the matrix by the work of a factorisation, for those that follow.  LB_OK,
 * LB_E_NOMEM, LB_E_LIMIT (beyond both limits above). */
lb_status stiff_matrix_choose(stiff_matrix *matrix, const double *size);
/* Floating-point operations of one factorisation in the form chosen, estimated. */
double stiff_matrix_work(const stiff_matrix *matrix);
/* diagonal = 1/(h gamma), J by its values [nonzeros].  LB_OK, LB_E_NUMERIC
 * (singular), LB_E_NOMEM. */
lb_status stiff_matrix_factor(stiff_matrix *matrix, double diagonal, const double *values);
/* Right-hand sides B [n*columns], each a combination of columns of N, in place. */
void stiff_matrix_solve(const stiff_matrix *matrix, int columns, double *B);

#endif

/* Sparse LU: analysed once for a pattern, factored many times; KLU is known to
 * sparse.c alone. */
#ifndef LIMBECK_ANALYSIS_SPARSE_H
#define LIMBECK_ANALYSIS_SPARSE_H

#include "limbeck.h"

typedef struct sparse_lu sparse_lu;

/* Analyse a pattern of compressed columns: start [n+1], row [start[n]] ascending in
 * each column; both are borrowed for the object's life.  LB_E_NOMEM, LB_E_NUMERIC
 * (structurally singular). */
lb_status sparse_new(int n, int *start, int *row, sparse_lu **out);
void sparse_free(sparse_lu *lu);

/* Estimates from the analysis, without pivoting: floating-point operations of one
 * factorisation, and entries of L and U together. */
double sparse_work(const sparse_lu *lu);
double sparse_entries(const sparse_lu *lu);

/* Factor the matrix with these values [start[n]].  LB_OK; LB_E_NUMERIC when it is
 * singular or not finite; LB_E_NOMEM. */
lb_status sparse_factor(sparse_lu *lu, double *values);
/* Solve with the last factors, `columns` right-hand sides B [n*columns] in place. */
void sparse_solve(const sparse_lu *lu, int columns, double *B);

#endif

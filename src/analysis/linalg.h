/* Checked dense solves and eigenvalues; LAPACK is known to linalg.c alone. */
#ifndef LIMBECK_ANALYSIS_LINALG_H
#define LIMBECK_ANALYSIS_LINALG_H

#include <stdbool.h>

#include "limbeck.h"

/* LU with partial pivoting of A [n*n], column-major, in place; pivot [n], for
 * linalg_solve alone.  False when A is singular or not finite. */
bool linalg_factor(int n, double *A, int *pivot);
/* Solve with the factors, `columns` right-hand sides B [n*columns] in place. */
void linalg_solve(int n, const double *LU, const int *pivot, int columns, double *B);
/* Estimated reciprocal condition number in the 1-norm from the factors and the
 * 1-norm of A before it was factored; 0 also without memory. */
double linalg_rcond(int n, const double *LU, const int *pivot, double norm1);

/* Eigenvalues of A [n*n] (destroyed), sorted: falling real part, then falling
 * imaginary part, pairs adjacent.  Vectors (right) [n*n] in LAPACK's packed real
 * form when vectors is not NULL, in the same order.  LB_E_NUMERIC, LB_E_NOMEM. */
lb_status linalg_eigenvalues(int n, double *A, lb_complex *values, double *vectors, lb_error *err);

/* Least-norm least-squares solution of A x = b by QR with column pivoting (A
 * [rows*columns] destroyed, b [max(rows,columns)] overwritten by x); rank out. */
lb_status linalg_least_squares(int rows, int columns, double *A, double *b, double rcond, int *rank, lb_error *err);

/* Number of eigenvalues of A with positive real part, by Hessenberg form,
 * characteristic polynomial and Routh array (routh.c); -1 when a leading entry
 * of the array is zero within its rounding error, as it is with eigenvalues on
 * the imaginary axis, and when A is not finite.  A [n*n]; n up to the limit. */
#define LINALG_ROUTH_LIMIT 20
int linalg_routh_unstable(int n, const double *A);

double linalg_norm1(int n, const double *A);

#endif

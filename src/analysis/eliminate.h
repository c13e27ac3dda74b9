/* Gaussian elimination of dense matrices. */
#ifndef LIMBECK_ANALYSIS_ELIMINATE_H
#define LIMBECK_ANALYSIS_ELIMINATE_H

#include <stdbool.h>

/* LU of A [n*n], column-major, in place, as LAPACK's dgetrf leaves it; pivot [n],
 * rows counted from one.  The diagonal entry is the pivot when it is at least
 * `threshold` (0..1) of the largest below it, else the largest is.  False when a pivot is
 * zero or not finite.  Entries that are not finite are the caller's to look for. */
bool eliminate(int n, double *A, int *pivot, double threshold);

/* Reciprocals of the pivots, [n]: a division takes as long as the rest of a small
 * solution. */
void eliminate_invert(int n, const double *LU, double *inverse);
/* Solve with the factors and those, b [n] in place. */
void eliminate_solve(int n, const double *LU, const int *pivot, const double *inverse, double *b);

#endif

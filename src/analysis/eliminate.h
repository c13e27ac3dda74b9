/* Gaussian elimination of dense matrices. */
#ifndef LIMBECK_ANALYSIS_ELIMINATE_H
#define LIMBECK_ANALYSIS_ELIMINATE_H

#include <stdbool.h>

/* LU of A [n*n], column-major, in place, as LAPACK's dgetrf leaves it; pivot [n],
 * rows counted from one.  The diagonal entry is the pivot when it is at least
 * `threshold` (0..1) of the largest below it, else the largest is.  False when a pivot is
 * zero or not finite.  Entries that are not finite are the caller's to look for. */
bool eliminate(int n, double *A, int *pivot, double threshold);

#endif

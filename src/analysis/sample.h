/* Low-discrepancy points and counter-based random streams: the value of sample i
 * depends on (seed, i) alone, so any number of threads gives the same answer. */
#ifndef LIMBECK_ANALYSIS_SAMPLE_H
#define LIMBECK_ANALYSIS_SAMPLE_H

#include <stdint.h>

/* Point i of a scrambled low-discrepancy sequence in (0,1)^dimensions: Halton's
 * points with nested scrambling by the seed, any number of dimensions.  point
 * [dimensions]. */
void sample_point(uint64_t seed, uint64_t i, int dimensions, double *point);

/* Uniform in (0,1) and standard normal from a counter. */
double sample_uniform(uint64_t seed, uint64_t i, uint64_t j);
double sample_normal(uint64_t seed, uint64_t i, uint64_t j);

#endif

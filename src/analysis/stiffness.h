/* How fast the fastest motion of the linearised system is. */
#ifndef LIMBECK_ANALYSIS_STIFFNESS_H
#define LIMBECK_ANALYSIS_STIFFNESS_H

#include "limbeck.h"
#include "system/system.h"

typedef struct stiffness {
    int n;
    double *v, *w;              /* [n] the dominant direction so far; image */
    double *jitter;             /* [n] a little of every direction */
    double *values;             /* [nonzeros] room for a Jacobian */
} stiffness;

lb_status stiffness_init(stiffness *estimate, const lb_system *system);
void stiffness_clear(stiffness *estimate);
void stiffness_reset(stiffness *estimate);     /* forget the direction */

/* Estimated magnitude of the largest eigenvalue of J (values [nonzeros]), and
 * whether it damps (its real part is clearly negative).  scale [n]: sizes of the
 * states.  A few power iterations from the direction of the call before. */
double stiffness_radius(stiffness *estimate, const lb_system *system, const double *values, const double *scale,
                        bool *is_damped);

#endif

/* Newton's method for a closed orbit, its period unknown. */
#ifndef LIMBECK_ANALYSIS_SHOOTING_H
#define LIMBECK_ANALYSIS_SHOOTING_H

#include "analysis/orbit.h"
#include "analysis/space.h"
#include "limbeck.h"

typedef struct shooting {
    bool converged;
    double residual;              /* space_distance of the state after one period from the start */
    int iterations;
    size_t steps;                 /* of the last pass */
    double *map;                  /* [rank*rank] derivative of the state after one period, in scaled coordinates */
    double *flow;                 /* [rank] dx/dt at the point, in the same coordinates */
} shooting;

/* Close the orbit near x [n] with a period near *period; scale [n] from
 * orbit_scale.  On convergence x and *period are the orbit's, otherwise they are
 * unchanged.  The step is the least-norm one, so that in a family of closed orbits
 * the one nearest to x is found; with hold [rank, scaled coordinates; else NULL] the
 * point does not move along that direction.  The residual is driven down as far as the
 * tolerance of the integration lets it go; `goal` is what counts as closed.
 * Not converged is a result; errors are LB_E_NOMEM and LB_E_STOPPED.  out is
 * cleared by the caller, also after an error. */
lb_status shooting_close(const space *s, double *x, double *period, const double *scale, const double *hold,
                         double goal, const orbit_options *options, shooting *out, lb_error *err);
void shooting_clear(shooting *out);

/* Non-trivial multipliers [rank-1], largest first: eigenvalues of the map on the
 * plane across the flow.  trivial_error: how far the map is from taking the flow
 * to itself, which measures the error of the multipliers. */
lb_status shooting_multipliers(const shooting *shot, int rank, lb_complex *multipliers,
                               double *trivial_error, lb_error *err);

/* The direction across the flow [rank, scaled coordinates, length 1] that the map
 * changes least: along it lies the next orbit where closed orbits form a family. */
lb_status shooting_neutral(const shooting *shot, int rank, double *direction, lb_error *err);

#endif

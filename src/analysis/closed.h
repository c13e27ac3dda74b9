/* A closed orbit with everything that is known of it. */
#ifndef LIMBECK_ANALYSIS_CLOSED_H
#define LIMBECK_ANALYSIS_CLOSED_H

#include "analysis/orbit.h"
#include "analysis/shooting.h"
#include "analysis/space.h"
#include "limbeck.h"

typedef struct closed_orbit {
    space s;
    bool converged;               /* the rest has meaning only then */
    double *x;                    /* [n] a point of it */
    double period;
    double *low, *high, *scale;   /* [n] */
    double closure;               /* space_distance after one period, integrated without tangents */
    size_t steps;
    lb_method method;             /* the cheaper one: explicit unless the orbit is stiff */
    double tolerance;
    shooting shot;
    lb_complex *multipliers;      /* [rank-1] */
    double multiplier_error;
    lb_answer stable;
} closed_orbit;

/* Close the orbit near x [n] with a period near `period`.  An orbit that shrinks to
 * a point, or another one far away, is not converged.  closed_clear also after an
 * error (LB_E_NOMEM, LB_E_STOPPED). */
lb_status closed_find(closed_orbit *c, lb_evaluator *evaluator, const double *x, double period,
                      double tolerance, const lb_monitor *monitor, lb_error *err);
void closed_clear(closed_orbit *c);

/* Relative difference of the period found on a second path: from a state pushed off
 * the orbit, with the other method where it can go the way, else with another
 * tolerance, closed again.  NAN when that fails. */
lb_status closed_confirm(const closed_orbit *c, const lb_monitor *monitor, double *difference, lb_error *err);

/* Closed orbits on both sides of this one, held at a distance of a tenth of its
 * amplitude: it belongs to a family (a centre). */
lb_status closed_is_family(const closed_orbit *c, const lb_monitor *monitor, bool *is_family, lb_error *err);

/* A public record of the orbit. */
lb_status closed_record(const closed_orbit *c, double confirmed, lb_cycle **out, lb_error *err);

#endif

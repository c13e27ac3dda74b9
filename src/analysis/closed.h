/* A closed orbit with everything that is known of it. */
#ifndef LIMBECK_ANALYSIS_CLOSED_H
#define LIMBECK_ANALYSIS_CLOSED_H

#include "analysis/orbit.h"
#include "analysis/shooting.h"
#include "analysis/space.h"
#include "limbeck.h"

#define CLOSED_LIMIT 1000         /* states; the tangents are a square of them, and more are not carried */
#define CLOSED_GOAL 1e-8          /* residual of the shooting, in amplitudes */
#define CLOSED_CLOSURE 1e-9       /* closure of an orbit that is reported, in amplitudes */

typedef struct closed_orbit {
    space s;
    bool converged;               /* the rest has meaning only then */
    double *x;                    /* [n] a point of it */
    double period;
    double *low, *high, *scale;   /* [n] */
    double growth;                /* largest swing relative to the scale of the loop it was closed from */
    double closure;               /* space_distance after one period, integrated without tangents */
    size_t steps;
    lb_method method;             /* the cheaper one: explicit unless the orbit is stiff */
    double tolerance;
    shooting shot;
    lb_complex *multipliers;      /* [rank-1] */
    double multiplier_error;
    lb_answer stable;
} closed_orbit;

/* Close the orbit near x [n] with a period near `period`; keeps_start: of a family, the
 * one through x.  An orbit that shrinks to
 * a point, or another one far away, is not converged.  closed_clear also after an
 * error (LB_E_NOMEM, LB_E_STOPPED). */
lb_status closed_find(closed_orbit *c, lb_evaluator *evaluator, const double *x, double period,
                      bool keeps_start, double tolerance, const lb_monitor *monitor, lb_error *err);
void closed_clear(closed_orbit *c);

/* A failed integration means only that there is no orbit to be had: true for the
 * statuses that do end everything, LB_E_NOMEM and LB_E_STOPPED. */
bool closed_is_fatal(lb_status status);

/* Options to integrate along the orbit with its own method. */
orbit_options closed_options(const closed_orbit *c, double tolerance, const lb_monitor *monitor);

/* A public record of the orbit, with what was done for it in words: is_family, it was found to
 * be one of many; confirmed, see lb_cycle. */
lb_status closed_record(const closed_orbit *c, bool is_family, double confirmed, lb_cycle **out, lb_error *err);

#endif

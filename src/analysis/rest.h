/* Is a trajectory going to rest here? */
#ifndef LIMBECK_ANALYSIS_REST_H
#define LIMBECK_ANALYSIS_REST_H

#include "analysis/space.h"
#include "limbeck.h"

/* Dimension of the reaction space above which no dense matrix is made: rest is then
 * known by standing still alone. */
#define REST_LIMIT 1500

typedef struct rest {
    bool found;                   /* Newton from the state led to a steady state */
    lb_answer stable;             /* of that state */
    double distance;              /* of the state from it, relative (see rest_near) */
    double *x;                    /* [n] the steady state */
    double *work;                 /* scratch */
    int *pivot;
} rest;

lb_status rest_init(rest *r, const space *s, lb_error *err);
void rest_clear(rest *r);

/* Newton in the reaction space from x [n]; not found above REST_LIMIT.  The distance is measured in each
 * species' steady value or a thousandth of reach [n] (its largest magnitude so
 * far), whichever is larger.  Stability is asked only where the distance is
 * below `close`; it is undecided otherwise. */
lb_status rest_near(rest *r, const space *s, const double *x, const double *reach, double close, lb_error *err);

/* The terms of each core species' rate cancel to rounding at x. */
bool rest_is_balanced(rest *r, const space *s, const double *x);

/* is_still: as much time again as `elapsed` would move no core species by more than
 * `fraction` of its reach.  rate: the largest real part of the eigenvalues at x (on
 * the face of the species that were zero from the start), filled where is_still; zero
 * above REST_LIMIT. */
lb_status rest_is_still(rest *r, const space *s, const double *x, const double *reach, double elapsed,
                        double fraction, bool *is_still, double *rate, lb_error *err);

/* Does x [n], next to a steady state that is not stable, lie on a face that it cannot leave
 * (species that were zero from the start), with nothing on the face that grows? */
lb_status rest_holds_on_face(rest *r, const space *s, const double *x, bool *holds, lb_error *err);

#endif

/* Weights of the error control, per species, that follow the run. */
#ifndef LIMBECK_ANALYSIS_TOLERANCE_H
#define LIMBECK_ANALYSIS_TOLERANCE_H

#include <stdbool.h>

#include "limbeck.h"
#include "model/network.h"

/* A species is followed with the relative tolerance down to this fraction of
 * the largest value it has had (a signed one, which passes through zero: to the
 * second fraction), and one that has had none down to a fraction of the largest
 * value of any. */
#define TOLERANCE_FRACTION 1e-6
#define TOLERANCE_SIGNED_FRACTION 1e-2
#define TOLERANCE_NEWBORN_FRACTION 1e-12

typedef struct tolerance {
    int n;
    double relative;
    double *given;              /* [n] absolute tolerances of the caller, or NULL */
    double *absolute;           /* [n] in force */
    double *seen;               /* [n] largest magnitude so far */
    double reference;           /* largest magnitude of any state so far; expected, while all are zero */
    bool *is_signed;            /* [n] */
} tolerance;

/* absolute [n] is copied, or NULL.  LB_E_NOMEM. */
lb_status tolerance_init(tolerance *control, const lb_network *network, double relative, const double *absolute);
void tolerance_clear(tolerance *control);

/* Forget the run so far: start at x [n].  amount: the magnitude that is expected,
 * used while all states are zero. */
void tolerance_start(tolerance *control, const double *x, double amount);
/* Take x [n], an accepted state, into account. */
void tolerance_follow(tolerance *control, const double *x);

/* Weight of one species in a step from x to x_new. */
double tolerance_weight(const tolerance *control, int state, double x, double x_new);
/* max_i |error_i| / weight_i, and the state where it is; accepted up to 1. */
double tolerance_norm(const tolerance *control, const double *x, const double *x_new, const double *error, int *worst);
/* The same for a column of derivatives of the state by something of size `from`, ten
 * times looser: in coordinates scaled by the states' magnitudes, by its own size. */
double tolerance_column_norm(const tolerance *control, double from, const double *column, const double *column_new,
                             const double *error);
/* Largest value of a state so far, or a trace of the largest of any. */
double tolerance_magnitude(const tolerance *control, int state);

/* The unsigned state that is furthest below minus its absolute tolerance (and
 * the rounding of the step from x), in units of that; -1 when there is none. */
int tolerance_negative(const tolerance *control, const double *x, const double *x_new);

#endif

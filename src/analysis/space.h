/* The core's reaction space through one state: the coordinates of everything
 * that closes, rests or repeats.
 *
 * y [rank] are the independent core species; the dependent ones follow from the
 * totals of the state that the space was made from, and the species set aside
 * keep the values they had there. */
#ifndef LIMBECK_ANALYSIS_SPACE_H
#define LIMBECK_ANALYSIS_SPACE_H

#include "limbeck.h"
#include "system/system.h"

typedef struct space {
    lb_evaluator *evaluator;      /* borrowed */
    const lb_system *system;
    int n, core, rank;
    double *offset;               /* [core-rank] x_dependent + L x_independent, constant in time */
    double *base;                 /* [n] the state it was made from */
} space;

/* LB_OK or LB_E_NOMEM; clear takes a space that init left half built. */
lb_status space_init(space *s, lb_evaluator *evaluator, const double *x, lb_error *err);
void space_clear(space *s);

/* State of coordinates, x [n] from y [rank], and back. */
void space_place(const space *s, const double *y, double *x);
void space_take(const space *s, const double *x, double *y);
/* The change dx [n] of the state that belongs to the change dy [rank]; zero for
 * the species set aside. */
void space_lift(const space *s, const double *dy, double *dx);

/* State index of coordinate i. */
int space_state(const space *s, int i);

/* max over core species of |a_i - b_i| / scale_i; scale [n], entries above zero. */
double space_distance(const space *s, const double *a, const double *b, const double *scale);

/* No unsigned core species of x is below zero. */
bool space_is_inside(const space *s, const double *x);

#endif

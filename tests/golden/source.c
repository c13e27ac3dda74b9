/* source.c: a reaction mechanism
 *
 * Written by limbeck 0.1.0.  This file belongs to whoever made it with limbeck, who
 * may use, change and pass it on under any terms.
 *
 * Units: none.
 * x: 0 X
 * k: none
 *
 * How to use it, units and values of the constants are in source.h.
 */
#include "source.h"

#include <stddef.h>

const char *const source_state_names[1] = {
    "X",  /* 0 */
};

const char *const source_constant_names[1] = {
    ""
};

const char *const source_reaction_labels[1] = {
    "R1",  /* 0 */
};

const double source_initial[1] = {
    0.0,  /* X */
};

const double source_defaults[1] = {
    0.0
};

const int source_column_start[2] = {
    0, 0
};

const int source_row[1] = {
    0
};

void source_rates(double t, const double x[], const double k[], double v[])
{
    (void)t;
    (void)x;
    (void)k;
    v[0] = 1.4142135623730951;  /* R1: -> X */
}

void source_rhs(double t, const double x[], const double k[], double dxdt[])
{
    (void)t;
    (void)x;
    (void)k;
    dxdt[0] = 1.4142135623730951;  /* [X] */
}

void source_jacobian_sparse(double t, const double x[], const double k[], double values[])
{
    (void)t;
    (void)x;
    (void)k;
    (void)values;
}

void source_jacobian(double t, const double x[], const double k[], double J[])
{
    (void)t;
    (void)x;
    (void)k;
    for (size_t i = 0; i < (size_t)source_STATES*source_STATES; i++)
        J[i] = 0.0;
}

void source_dfdk(double t, const double x[], const double k[], double D[])
{
    (void)t;
    (void)x;
    (void)k;
    (void)D;
}

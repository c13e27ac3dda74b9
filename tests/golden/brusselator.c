/* brusselator.c: Brusselator
 *
 * Written by limbeck 0.1.0.  This file belongs to whoever made it with limbeck, who
 * may use, change and pass it on under any terms.
 *
 * Units: none.
 * x: 0 X, 1 Y, 2 D, 3 E
 * k: 0 [A], 1 [B], 2 B1.k, 3 B2.k, 4 B3.k, 5 B4.k
 *
 * How to use it, units and values of the constants are in brusselator.h.
 */
#include "brusselator.h"

#include <stddef.h>

const char *const brusselator_state_names[4] = {
    "X",  /* 0 */
    "Y",  /* 1 */
    "D",  /* 2 */
    "E",  /* 3 */
};

const char *const brusselator_constant_names[6] = {
    "[A]",  /* 0 */
    "[B]",  /* 1 */
    "B1.k",  /* 2 */
    "B2.k",  /* 3 */
    "B3.k",  /* 4 */
    "B4.k",  /* 5 */
};

const char *const brusselator_reaction_labels[4] = {
    "B1",  /* 0 */
    "B2",  /* 1 */
    "B3",  /* 2 */
    "B4",  /* 3 */
};

const double brusselator_initial[4] = {
    1.0,  /* X */
    1.0,  /* Y */
    0.0,  /* D */
    0.0,  /* E */
};

const double brusselator_defaults[6] = {
    1.0,  /* [A] */
    3.0,  /* [B] */
    1.0,  /* B1.k */
    1.0,  /* B2.k */
    1.0,  /* B3.k */
    1.0,  /* B4.k */
};

const int brusselator_column_start[5] = {
    0, 4, 6, 6, 6
};

const int brusselator_row[6] = {
    0, 1, 2, 3, 0, 1
};

void brusselator_rates(double t, const double x[], const double k[], double v[])
{
    (void)t;
    v[0] = k[2]*k[0];            /* B1: A -> X */
    v[1] = k[3]*x[0]*x[0]*x[1];  /* B2: 2 X + Y -> 3 X */
    v[2] = k[4]*k[1]*x[0];       /* B3: B + X -> Y + D */
    v[3] = k[5]*x[0];            /* B4: X -> E */
}

void brusselator_rhs(double t, const double x[], const double k[], double dxdt[])
{
    (void)t;
    const double v0 = k[2]*k[0];            /* B1: A -> X */
    const double v1 = k[3]*x[0]*x[0]*x[1];  /* B2: 2 X + Y -> 3 X */
    const double v2 = k[4]*k[1]*x[0];       /* B3: B + X -> Y + D */
    const double v3 = k[5]*x[0];            /* B4: X -> E */

    dxdt[0] = v0 + v1 - v2 - v3;  /* [X] */
    dxdt[1] = -v1 + v2;           /* [Y] */
    dxdt[2] = v2;                 /* [D] */
    dxdt[3] = v3;                 /* [E] */
}

void brusselator_jacobian_sparse(double t, const double x[], const double k[], double values[])
{
    (void)t;
    const double dv1_dx0 = 2.0*k[3]*x[0]*x[1];  /* B2 by [X] */
    const double dv1_dx1 = k[3]*x[0]*x[0];      /* B2 by [Y] */
    const double dv2_dx0 = k[4]*k[1];           /* B3 by [X] */

    values[0] = dv1_dx0 - dv2_dx0 - k[5];  /* [X] by [X] */
    values[1] = -dv1_dx0 + dv2_dx0;        /* [Y] by [X] */
    values[2] = dv2_dx0;                   /* [D] by [X] */
    values[3] = k[5];                      /* [E] by [X] */
    values[4] = dv1_dx1;                   /* [X] by [Y] */
    values[5] = -dv1_dx1;                  /* [Y] by [Y] */
}

void brusselator_jacobian(double t, const double x[], const double k[], double J[])
{
    (void)t;
    for (size_t i = 0; i < (size_t)brusselator_STATES*brusselator_STATES; i++)
        J[i] = 0.0;

    const double dv1_dx0 = 2.0*k[3]*x[0]*x[1];  /* B2 by [X] */
    const double dv1_dx1 = k[3]*x[0]*x[0];      /* B2 by [Y] */
    const double dv2_dx0 = k[4]*k[1];           /* B3 by [X] */

    J[0] = dv1_dx0 - dv2_dx0 - k[5];  /* [X] by [X] */
    J[1] = -dv1_dx0 + dv2_dx0;        /* [Y] by [X] */
    J[2] = dv2_dx0;                   /* [D] by [X] */
    J[3] = k[5];                      /* [E] by [X] */
    J[4] = dv1_dx1;                   /* [X] by [Y] */
    J[5] = -dv1_dx1;                  /* [Y] by [Y] */
}

void brusselator_dfdk(double t, const double x[], const double k[], double D[])
{
    (void)t;
    for (size_t i = 0; i < (size_t)brusselator_STATES*brusselator_CONSTANTS; i++)
        D[i] = 0.0;

    const double dv1_dk3 = x[0]*x[0]*x[1];  /* B2 by B2.k */
    const double dv2_dk1 = k[4]*x[0];       /* B3 by [B] */
    const double dv2_dk4 = k[1]*x[0];       /* B3 by B3.k */

    D[0] = k[2];       /* [X] by [A] */
    D[4] = -dv2_dk1;   /* [X] by [B] */
    D[5] = dv2_dk1;    /* [Y] by [B] */
    D[6] = dv2_dk1;    /* [D] by [B] */
    D[8] = k[0];       /* [X] by B1.k */
    D[12] = dv1_dk3;   /* [X] by B2.k */
    D[13] = -dv1_dk3;  /* [Y] by B2.k */
    D[16] = -dv2_dk4;  /* [X] by B3.k */
    D[17] = dv2_dk4;   /* [Y] by B3.k */
    D[18] = dv2_dk4;   /* [D] by B3.k */
    D[20] = -x[0];     /* [X] by B4.k */
    D[23] = x[0];      /* [E] by B4.k */
}

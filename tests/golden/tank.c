/* tank.c: Stirred tank with an immobilised enzyme
 *
 * Written by limbeck 0.1.0.  This file belongs to whoever made it with limbeck, who
 * may use, change and pass it on under any terms.
 *
 * Units: concentrations in mM, time in min.
 * x: 0 S, 1 P, 2 I, 3 Br-, 4 E
 * k: 0 temperature, 1 residence, 2 [buffer], 3 [S]in, 4 Vmax, 5 Km, 6 Ki, 7 hill, 8 f, 9 R2.kf,
 *    10 R2.K, 11 R3.A, 12 R3.n, 13 R3.Ea
 *
 * How to use it, units and values of the constants are in tank.h.
 */
#include "tank.h"

#include <math.h>
#include <stddef.h>

const char *const tank_state_names[5] = {
    "S",  /* 0 */
    "P",  /* 1 */
    "I",  /* 2 */
    "Br-",  /* 3 */
    "E",  /* 4 */
};

const char *const tank_constant_names[14] = {
    "temperature",  /* 0 */
    "residence",  /* 1 */
    "[buffer]",  /* 2 */
    "[S]in",  /* 3 */
    "Vmax",  /* 4 */
    "Km",  /* 5 */
    "Ki",  /* 6 */
    "hill",  /* 7 */
    "f",  /* 8 */
    "R2.kf",  /* 9 */
    "R2.K",  /* 10 */
    "R3.A",  /* 11 */
    "R3.n",  /* 12 */
    "R3.Ea",  /* 13 */
};

const char *const tank_reaction_labels[7] = {
    "R1",  /* 0 */
    "R2.forward",  /* 1 */
    "R2.reverse",  /* 2 */
    "R3",  /* 3 */
    "R4",  /* 4 */
    "R5",  /* 5 */
    "R6",  /* 6 */
};

const double tank_initial[5] = {
    4.0,  /* S */
    0.0,  /* P */
    0.0,  /* I */
    0.0,  /* Br- */
    0.01,  /* E */
};

const double tank_defaults[14] = {
    310.0,  /* temperature */
    20.0,  /* residence */
    5.0,  /* [buffer] */
    10.0,  /* [S]in */
    3.0,  /* Vmax */
    0.4,  /* Km */
    2.0,  /* Ki */
    2.5,  /* hill */
    1.0,  /* f */
    0.5,  /* R2.kf */
    4.0,  /* R2.K */
    1e9,  /* R3.A */
    0.0,  /* R3.n */
    50000.0,  /* R3.Ea */
};

const int tank_column_start[6] = {
    0, 4, 6, 9, 10, 12
};

const int tank_row[12] = {
    0, 1, 2, 3, 1, 2, 0, 1, 2, 3, 0, 2
};

/* The square root of x, 0 below zero. */
static double real_root(double x)
{
    return x < 0.0 ? 0.0 : sqrt(x);
}

/* The derivative of the square root of x, 0 where it is infinite or undefined. */
static double root_slope(double x)
{
    return x <= 0.0 ? 0.0 : 0.5/sqrt(x);
}

/* x^n, 0 where x is negative and n not whole. */
static double real_power(double x, double n)
{
    return x < 0.0 && n != floor(n) ? 0.0 : pow(x, n);
}

/* n x^(n-1), the derivative of x^n by x; 0 where that is infinite or undefined. */
static double real_slope(double x, double n)
{
    if ((x <= 0.0 && n != floor(n)) || (x == 0.0 && n < 1.0))
        return 0.0;
    return n*pow(x, n - 1.0);
}

/* x^n ln x, the derivative of x^n by n; 0 where x is not positive. */
static double real_power_log(double x, double n)
{
    return x <= 0.0 ? 0.0 : pow(x, n)*log(x);
}

void tank_rates(double t, const double x[], const double k[], double v[])
{
    (void)t;
    const double d_kcat = 0.2*k[4]/k[5];       /* kcat */
    const double d_grip = 1.0 + x[2]/k[6];     /* grip */
    const double s3 = real_power(x[3], k[7]);

    v[0] = k[4]*x[0]/(k[5]*d_grip + x[0]);           /* R1: S -> P */
    v[1] = k[9]*x[1]*x[1];                           /* R2.forward: 2 P <-> I */
    v[2] = k[9]/k[10]*x[2];                          /* R2.reverse: 2 P <-> I */
    v[3] = k[11]*real_power(k[0], k[12])*exp(-k[13]/(8.31446261815324*k[0]))*k[2]*x[0];  /* R3: S + buffer -> "Br-" */
    v[4] = d_kcat*x[0]*x[4];                         /* R4: E + S -> (f/2) I + E */
    v[5] = d_kcat*s3/(real_power(k[5], k[7]) + s3);  /* R5: "Br-" -> */
    v[6] = 0.1*real_root(x[2]);                      /* R6: I -> P */
}

void tank_rhs(double t, const double x[], const double k[], double dxdt[])
{
    (void)t;
    const double d_kcat = 0.2*k[4]/k[5];       /* kcat */
    const double d_grip = 1.0 + x[2]/k[6];     /* grip */
    const double s3 = real_power(x[3], k[7]);
    const double c4 = 1.0/k[1];

    const double v0 = k[4]*x[0]/(k[5]*d_grip + x[0]);  /* R1: S -> P */
    const double v1 = k[9]*x[1]*x[1];                  /* R2.forward: 2 P <-> I */
    const double v2 = k[9]/k[10]*x[2];                 /* R2.reverse: 2 P <-> I */
    /* R3: S + buffer -> "Br-" */
    const double v3 = k[11]*real_power(k[0], k[12])*exp(-k[13]/(8.31446261815324*k[0]))*k[2]*x[0];
    const double v4 = d_kcat*x[0]*x[4];                /* R4: E + S -> (f/2) I + E */
    const double v5 = d_kcat*s3/(real_power(k[5], k[7]) + s3);  /* R5: "Br-" -> */
    const double v6 = 0.1*real_root(x[2]);             /* R6: I -> P */

    dxdt[0] = -v0 - v3 - v4 + k[3]/k[1] - c4*x[0];   /* [S] */
    dxdt[1] = v0 - 2.0*v1 + 2.0*v2 + v6 - c4*x[1];   /* [P] */
    dxdt[2] = v1 - v2 + k[8]/2.0*v4 - v6 - c4*x[2];  /* [I] */
    dxdt[3] = v3 - v5 - c4*x[3];                     /* [Br-] */
    dxdt[4] = 0.0;                                   /* [E] */
}

void tank_jacobian_sparse(double t, const double x[], const double k[], double values[])
{
    (void)t;
    const double d_kcat = 0.2*k[4]/k[5];            /* kcat */
    const double d_grip = 1.0 + x[2]/k[6];          /* grip */
    const double s3 = k[5]*d_grip + x[0];
    const double s4 = k[4]*x[0]/s3;
    const double c5 = k[8]/2.0;
    const double s6 = real_power(x[3], k[7]);
    const double s7 = real_power(k[5], k[7]) + s6;
    const double c8 = 1.0/k[1];
    const double s9 = real_slope(x[3], k[7]);

    const double dv0_dx0 = (k[4] - s4)/s3;        /* R1 by [S] */
    const double dv0_dx2 = -s4*k[5]/k[6]/s3;      /* R1 by [I] */
    const double dv1_dx1 = 2.0*k[9]*x[1];         /* R2.forward by [P] */
    const double dv2_dx2 = k[9]/k[10];            /* R2.reverse by [I] */
    const double dv3_dx0 = k[11]*real_power(k[0], k[12])*exp(-k[13]/(8.31446261815324*k[0]))*k[2];  /* R3 by [S] */
    const double dv4_dx0 = d_kcat*x[4];           /* R4 by [S] */
    const double dv4_dx4 = d_kcat*x[0];           /* R4 by [E] */
    const double dv5_dx3 = (d_kcat*s9 - d_kcat*s6/s7*s9)/s7;  /* R5 by [Br-] */
    const double dv6_dx2 = 0.1*root_slope(x[2]);  /* R6 by [I] */

    values[0] = -dv0_dx0 - dv3_dx0 - dv4_dx0 - c8;  /* [S] by [S] */
    values[1] = dv0_dx0;                            /* [P] by [S] */
    values[2] = c5*dv4_dx0;                         /* [I] by [S] */
    values[3] = dv3_dx0;                            /* [Br-] by [S] */
    values[4] = -2.0*dv1_dx1 - c8;                  /* [P] by [P] */
    values[5] = dv1_dx1;                            /* [I] by [P] */
    values[6] = -dv0_dx2;                           /* [S] by [I] */
    values[7] = dv0_dx2 + 2.0*dv2_dx2 + dv6_dx2;    /* [P] by [I] */
    values[8] = -dv2_dx2 - dv6_dx2 - c8;            /* [I] by [I] */
    values[9] = -dv5_dx3 - c8;                      /* [Br-] by [Br-] */
    values[10] = -dv4_dx4;                          /* [S] by [E] */
    values[11] = c5*dv4_dx4;                        /* [I] by [E] */
}

void tank_jacobian(double t, const double x[], const double k[], double J[])
{
    (void)t;
    for (size_t i = 0; i < (size_t)tank_STATES*tank_STATES; i++)
        J[i] = 0.0;

    const double d_kcat = 0.2*k[4]/k[5];            /* kcat */
    const double d_grip = 1.0 + x[2]/k[6];          /* grip */
    const double s3 = k[5]*d_grip + x[0];
    const double s4 = k[4]*x[0]/s3;
    const double c5 = k[8]/2.0;
    const double s6 = real_power(x[3], k[7]);
    const double s7 = real_power(k[5], k[7]) + s6;
    const double c8 = 1.0/k[1];
    const double s9 = real_slope(x[3], k[7]);

    const double dv0_dx0 = (k[4] - s4)/s3;        /* R1 by [S] */
    const double dv0_dx2 = -s4*k[5]/k[6]/s3;      /* R1 by [I] */
    const double dv1_dx1 = 2.0*k[9]*x[1];         /* R2.forward by [P] */
    const double dv2_dx2 = k[9]/k[10];            /* R2.reverse by [I] */
    const double dv3_dx0 = k[11]*real_power(k[0], k[12])*exp(-k[13]/(8.31446261815324*k[0]))*k[2];  /* R3 by [S] */
    const double dv4_dx0 = d_kcat*x[4];           /* R4 by [S] */
    const double dv4_dx4 = d_kcat*x[0];           /* R4 by [E] */
    const double dv5_dx3 = (d_kcat*s9 - d_kcat*s6/s7*s9)/s7;  /* R5 by [Br-] */
    const double dv6_dx2 = 0.1*root_slope(x[2]);  /* R6 by [I] */

    J[0] = -dv0_dx0 - dv3_dx0 - dv4_dx0 - c8;  /* [S] by [S] */
    J[1] = dv0_dx0;                            /* [P] by [S] */
    J[2] = c5*dv4_dx0;                         /* [I] by [S] */
    J[3] = dv3_dx0;                            /* [Br-] by [S] */
    J[6] = -2.0*dv1_dx1 - c8;                  /* [P] by [P] */
    J[7] = dv1_dx1;                            /* [I] by [P] */
    J[10] = -dv0_dx2;                          /* [S] by [I] */
    J[11] = dv0_dx2 + 2.0*dv2_dx2 + dv6_dx2;   /* [P] by [I] */
    J[12] = -dv2_dx2 - dv6_dx2 - c8;           /* [I] by [I] */
    J[18] = -dv5_dx3 - c8;                     /* [Br-] by [Br-] */
    J[20] = -dv4_dx4;                          /* [S] by [E] */
    J[22] = c5*dv4_dx4;                        /* [I] by [E] */
}

static void dfdk_shared_1(const double x[], const double k[], double c[])
{
    (void)x;
    c[0] = 0.2*k[4]/k[5];  /* kcat */
    c[1] = 0.2/k[5];
    c[2] = c[0]/k[5];
}

/* R1 to R4 */
static void dfdk_1(const double x[], const double k[], const double c[], double D[])
{
    const double s1 = x[2]/k[6];
    const double d_grip = 1.0 + s1;                   /* grip */
    const double s3 = k[5]*d_grip + x[0];
    const double s4 = k[4]*x[0]/s3;
    const double c5 = real_power(k[0], k[12]);
    const double c6 = k[13]/(8.31446261815324*k[0]);
    const double c7 = exp(-c6);
    const double c8 = k[8]/2.0;

    const double dv0_dk4 = x[0]/s3;                  /* R1 by Vmax */
    const double dv0_dk5 = -s4*d_grip/s3;            /* R1 by Km */
    const double dv0_dk6 = s4*k[5]*(s1/k[6])/s3;     /* R1 by Ki */
    const double dv1_dk9 = x[1]*x[1];                /* R2.forward by R2.kf */
    const double dv2_dk9 = 1.0/k[10]*x[2];           /* R2.reverse by R2.kf */
    const double dv2_dk10 = -k[9]/k[10]/k[10]*x[2];  /* R2.reverse by R2.K */
    /* R3 by temperature */
    const double dv3_dk0 = (k[11]*real_slope(k[0], k[12])*c7
        + k[11]*c5*c7*(c6*8.31446261815324/(8.31446261815324*k[0])))*k[2]*x[0];
    const double dv3_dk2 = k[11]*c5*c7*x[0];         /* R3 by [buffer] */
    const double dv3_dk11 = c5*c7*k[2]*x[0];         /* R3 by R3.A */
    const double dv3_dk12 = k[11]*real_power_log(k[0], k[12])*c7*k[2]*x[0];  /* R3 by R3.n */
    const double dv3_dk13 = -k[11]*c5*c7/(8.31446261815324*k[0])*k[2]*x[0];  /* R3 by R3.Ea */
    const double dv4_dk4 = c[1]*x[0]*x[4];           /* R4 by Vmax */
    const double dv4_dk5 = -c[2]*x[0]*x[4];          /* R4 by Km */
    const double v4 = c[0]*x[0]*x[4];                /* R4: E + S -> (f/2) I + E */

    D[0] = -dv3_dk0;                     /* [S] by temperature */
    D[3] = dv3_dk0;                      /* [Br-] by temperature */
    D[10] = -dv3_dk2;                    /* [S] by [buffer] */
    D[13] = dv3_dk2;                     /* [Br-] by [buffer] */
    D[20] = -dv0_dk4 - dv4_dk4;          /* [S] by Vmax */
    D[21] = dv0_dk4;                     /* [P] by Vmax */
    D[22] = c8*dv4_dk4;                  /* [I] by Vmax */
    D[25] = -dv0_dk5 - dv4_dk5;          /* [S] by Km */
    D[26] = dv0_dk5;                     /* [P] by Km */
    D[27] = c8*dv4_dk5;                  /* [I] by Km */
    D[30] = -dv0_dk6;                    /* [S] by Ki */
    D[31] = dv0_dk6;                     /* [P] by Ki */
    D[42] = 0.5*v4;                      /* [I] by f */
    D[46] = -2.0*dv1_dk9 + 2.0*dv2_dk9;  /* [P] by R2.kf */
    D[47] = dv1_dk9 - dv2_dk9;           /* [I] by R2.kf */
    D[51] = 2.0*dv2_dk10;                /* [P] by R2.K */
    D[52] = -dv2_dk10;                   /* [I] by R2.K */
    D[55] = -dv3_dk11;                   /* [S] by R3.A */
    D[58] = dv3_dk11;                    /* [Br-] by R3.A */
    D[60] = -dv3_dk12;                   /* [S] by R3.n */
    D[63] = dv3_dk12;                    /* [Br-] by R3.n */
    D[65] = -dv3_dk13;                   /* [S] by R3.Ea */
    D[68] = dv3_dk13;                    /* [Br-] by R3.Ea */
}

/* R5 to [Br-] outflow */
static void dfdk_2(const double x[], const double k[], const double c[], double D[])
{
    const double s1 = real_power(x[3], k[7]);
    const double s2 = real_power(k[5], k[7]) + s1;
    const double s3 = c[0]*s1/s2;
    const double c4 = 1.0/k[1];
    const double s5 = real_power_log(x[3], k[7]);
    const double c6 = c4/k[1];

    const double dv5_dk4 = c[1]*s1/s2;  /* R5 by Vmax */
    const double dv5_dk5 = (-c[2]*s1 - s3*real_slope(k[5], k[7]))/s2;  /* R5 by Km */
    const double dv5_dk7 = (c[0]*s5 - s3*(real_power_log(k[5], k[7]) + s5))/s2;  /* R5 by hill */

    D[5] = -k[3]/k[1]/k[1] + c6*x[0];  /* [S] by residence */
    D[6] = c6*x[1];                    /* [P] by residence */
    D[7] = c6*x[2];                    /* [I] by residence */
    D[8] = c6*x[3];                    /* [Br-] by residence */
    D[15] = c4;                        /* [S] by [S]in */
    D[23] = -dv5_dk4;                  /* [Br-] by Vmax */
    D[28] = -dv5_dk5;                  /* [Br-] by Km */
    D[38] = -dv5_dk7;                  /* [Br-] by hill */
}

void tank_dfdk(double t, const double x[], const double k[], double D[])
{
    (void)t;
    double c[3];
    dfdk_shared_1(x, k, c);
    for (size_t i = 0; i < (size_t)tank_STATES*tank_CONSTANTS; i++)
        D[i] = 0.0;
    dfdk_1(x, k, c, D);
    dfdk_2(x, k, c, D);
}

/* laws.c: Rate laws with common parts
 *
 * Written by limbeck 0.1.0.  This file belongs to whoever made it with limbeck, who
 * may use, change and pass it on under any terms.
 *
 * Units: none.
 * x: 0 S, 1 P
 * k: 0 Vm, 1 K, 2 n, 3 L, 4 c
 *
 * How to use it, units and values of the constants are in laws.h.
 */
#include "laws.h"

#include <math.h>
#include <stddef.h>

const char *const laws_state_names[2] = {
    "S",  /* 0 */
    "P",  /* 1 */
};

const char *const laws_constant_names[5] = {
    "Vm",  /* 0 */
    "K",  /* 1 */
    "n",  /* 2 */
    "L",  /* 3 */
    "c",  /* 4 */
};

const char *const laws_reaction_labels[4] = {
    "G",  /* 0 */
    "H",  /* 1 */
    "M",  /* 2 */
    "N",  /* 3 */
};

const double laws_initial[2] = {
    1.0,  /* S */
    0.1,  /* P */
};

const double laws_defaults[5] = {
    2.0,  /* Vm */
    0.5,  /* K */
    4.0,  /* n */
    1e6,  /* L */
    0.01,  /* c */
};

const int laws_column_start[3] = {
    0, 2, 4
};

const int laws_row[4] = {
    0, 1, 0, 1
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

void laws_rates(double t, const double x[], const double k[], double v[])
{
    (void)t;
    const double s1 = x[1] - k[0] + 0.1*x[1];
    const double s2 = x[1]*x[1]*x[1]*x[1];
    const double s3 = x[0]/k[1];
    const double s4 = 1.0 + s3;
    const double s5 = 1.0 + k[4]*x[0]/k[1];
    const double s6 = real_power(x[1], k[2]);

    v[0] = 2.0*k[0]*0.1*0.2*x[0]/(s1 + real_root(s1*s1 + 1.2*k[0]*x[0]));  /* G: S -> P */
    v[1] = k[0]*s2/(k[1]*k[1]*k[1]*k[1] + s2);     /* H: P -> S */
    v[2] = k[0]*(s3*s4*s4*s4 + k[3]*k[4]*x[0]/k[1]*s5*s5*s5)/(s4*s4*s4*s4 + k[3]*s5*s5*s5*s5);  /* M: S -> P */
    v[3] = k[0]*s6/(real_power(k[1], k[2]) + s6);  /* N: P -> S */
}

void laws_rhs(double t, const double x[], const double k[], double dxdt[])
{
    (void)t;
    const double s1 = x[1] - k[0] + 0.1*x[1];
    const double s2 = x[1]*x[1]*x[1]*x[1];
    const double s3 = x[0]/k[1];
    const double s4 = 1.0 + s3;
    const double s5 = 1.0 + k[4]*x[0]/k[1];
    const double s6 = real_power(x[1], k[2]);

    const double v0 = 2.0*k[0]*0.1*0.2*x[0]/(s1 + real_root(s1*s1 + 1.2*k[0]*x[0]));  /* G: S -> P */
    const double v1 = k[0]*s2/(k[1]*k[1]*k[1]*k[1] + s2);  /* H: P -> S */
    /* M: S -> P */
    const double v2 = k[0]*(s3*s4*s4*s4 + k[3]*k[4]*x[0]/k[1]*s5*s5*s5)/(s4*s4*s4*s4
        + k[3]*s5*s5*s5*s5);
    const double v3 = k[0]*s6/(real_power(k[1], k[2]) + s6);  /* N: P -> S */

    dxdt[0] = -v0 + v1 - v2 + v3;  /* [S] */
    dxdt[1] = v0 - v1 + v2 - v3;   /* [P] */
}

void laws_jacobian_sparse(double t, const double x[], const double k[], double values[])
{
    (void)t;
    const double c1 = 2.0*k[0]*0.1*0.2;
    const double s2 = x[1] - k[0] + 0.1*x[1];
    const double s3 = s2*s2 + 1.2*k[0]*x[0];
    const double s4 = s2 + real_root(s3);
    const double s5 = c1*x[0]/s4;
    const double s6 = x[1]*x[1]*x[1]*x[1];
    const double s7 = k[1]*k[1]*k[1]*k[1] + s6;
    const double s8 = x[0]/k[1];
    const double s9 = 1.0 + s8;
    const double s10 = s9*s9*s9;
    const double s11 = k[3]*k[4]*x[0]/k[1];
    const double s12 = 1.0 + k[4]*x[0]/k[1];
    const double s13 = s12*s12*s12;
    const double s14 = s9*s9*s9*s9 + k[3]*s12*s12*s12*s12;
    const double s15 = real_power(x[1], k[2]);
    const double s16 = real_power(k[1], k[2]) + s15;
    const double s17 = root_slope(s3);
    const double s18 = 4.0*x[1]*x[1]*x[1];
    const double c19 = 1.0/k[1];
    const double c20 = k[4]/k[1];
    const double s21 = real_slope(x[1], k[2]);

    const double dv0_dx0 = (c1 - s5*1.2*s17*k[0])/s4;  /* G by [S] */
    const double dv0_dx1 = -s5*(1.1 + s17*2.0*s2*1.1)/s4;  /* G by [P] */
    const double dv1_dx1 = (k[0]*s18 - k[0]*s6/s7*s18)/s7;  /* H by [P] */
    /* M by [S] */
    const double dv2_dx0 = (k[0]*(c19*s10 + s8*3.0*s9*s9*c19 + (k[3]*k[4]/k[1]*s13
        + s11*3.0*s12*s12*c20)) - k[0]*(s8*s10 + s11*s13)/s14*(4.0*s10*c19 + k[3]*4.0*s13*c20))/s14;
    const double dv3_dx1 = (k[0]*s21 - k[0]*s15/s16*s21)/s16;  /* N by [P] */

    values[0] = -dv0_dx0 - dv2_dx0;            /* [S] by [S] */
    values[1] = dv0_dx0 + dv2_dx0;             /* [P] by [S] */
    values[2] = -dv0_dx1 + dv1_dx1 + dv3_dx1;  /* [S] by [P] */
    values[3] = dv0_dx1 - dv1_dx1 - dv3_dx1;   /* [P] by [P] */
}

void laws_jacobian(double t, const double x[], const double k[], double J[])
{
    (void)t;
    const double c1 = 2.0*k[0]*0.1*0.2;
    const double s2 = x[1] - k[0] + 0.1*x[1];
    const double s3 = s2*s2 + 1.2*k[0]*x[0];
    const double s4 = s2 + real_root(s3);
    const double s5 = c1*x[0]/s4;
    const double s6 = x[1]*x[1]*x[1]*x[1];
    const double s7 = k[1]*k[1]*k[1]*k[1] + s6;
    const double s8 = x[0]/k[1];
    const double s9 = 1.0 + s8;
    const double s10 = s9*s9*s9;
    const double s11 = k[3]*k[4]*x[0]/k[1];
    const double s12 = 1.0 + k[4]*x[0]/k[1];
    const double s13 = s12*s12*s12;
    const double s14 = s9*s9*s9*s9 + k[3]*s12*s12*s12*s12;
    const double s15 = real_power(x[1], k[2]);
    const double s16 = real_power(k[1], k[2]) + s15;
    const double s17 = root_slope(s3);
    const double s18 = 4.0*x[1]*x[1]*x[1];
    const double c19 = 1.0/k[1];
    const double c20 = k[4]/k[1];
    const double s21 = real_slope(x[1], k[2]);

    const double dv0_dx0 = (c1 - s5*1.2*s17*k[0])/s4;  /* G by [S] */
    const double dv0_dx1 = -s5*(1.1 + s17*2.0*s2*1.1)/s4;  /* G by [P] */
    const double dv1_dx1 = (k[0]*s18 - k[0]*s6/s7*s18)/s7;  /* H by [P] */
    /* M by [S] */
    const double dv2_dx0 = (k[0]*(c19*s10 + s8*3.0*s9*s9*c19 + (k[3]*k[4]/k[1]*s13
        + s11*3.0*s12*s12*c20)) - k[0]*(s8*s10 + s11*s13)/s14*(4.0*s10*c19 + k[3]*4.0*s13*c20))/s14;
    const double dv3_dx1 = (k[0]*s21 - k[0]*s15/s16*s21)/s16;  /* N by [P] */

    J[0] = -dv0_dx0 - dv2_dx0;            /* [S] by [S] */
    J[1] = dv0_dx0 + dv2_dx0;             /* [P] by [S] */
    J[2] = -dv0_dx1 + dv1_dx1 + dv3_dx1;  /* [S] by [P] */
    J[3] = dv0_dx1 - dv1_dx1 - dv3_dx1;   /* [P] by [P] */
}

void laws_dfdk(double t, const double x[], const double k[], double D[])
{
    (void)t;
    for (size_t i = 0; i < (size_t)laws_STATES*laws_CONSTANTS; i++)
        D[i] = 0.0;

    const double s1 = x[1] - k[0] + 0.1*x[1];
    const double s2 = s1*s1 + 1.2*k[0]*x[0];
    const double s3 = s1 + real_root(s2);
    const double s4 = x[1]*x[1]*x[1]*x[1];
    const double s5 = k[1]*k[1]*k[1]*k[1] + s4;
    const double s6 = x[0]/k[1];
    const double s7 = 1.0 + s6;
    const double s8 = s7*s7*s7;
    const double s9 = k[3]*k[4]*x[0]/k[1];
    const double s10 = k[4]*x[0]/k[1];
    const double s11 = 1.0 + s10;
    const double s12 = s11*s11*s11;
    const double s13 = s6*s8 + s9*s12;
    const double s14 = s11*s11*s11*s11;
    const double s15 = s7*s7*s7*s7 + k[3]*s14;
    const double s16 = k[0]*s13/s15;
    const double s17 = real_power(x[1], k[2]);
    const double s18 = real_power(k[1], k[2]) + s17;
    const double s19 = k[0]*s17/s18;
    const double s20 = 3.0*s11*s11;
    const double s21 = s6/k[1];
    const double s22 = s10/k[1];
    const double s23 = real_power_log(x[1], k[2]);

    /* G by Vm */
    const double dv0_dk0 = (0.04000000000000001*x[0]
        - 2.0*k[0]*0.1*0.2*x[0]/s3*(root_slope(s2)*(1.2*x[0] - 2.0*s1) - 1.0))/s3;
    const double dv1_dk0 = s4/s5;                         /* H by Vm */
    const double dv1_dk1 = -4.0*k[0]*s4/s5*k[1]*k[1]*k[1]/s5;  /* H by K */
    const double dv2_dk0 = s13/s15;                       /* M by Vm */
    /* M by K */
    const double dv2_dk1 = (k[0]*(-s21*s8 - s6*3.0*s7*s7*s21 + (-s9/k[1]*s12 - s9*s20*s22))
        - s16*(-4.0*s8*s21 - k[3]*4.0*s12*s22))/s15;
    const double dv2_dk3 = (k[0]*s10*s12 - s16*s14)/s15;  /* M by L */
    const double dv2_dk4 = (k[0]*(k[3]*x[0]/k[1]*s12 + s9*s20*s6) - s16*k[3]*4.0*s12*s6)/s15;  /* M by c */
    const double dv3_dk0 = s17/s18;                       /* N by Vm */
    const double dv3_dk1 = -s19*real_slope(k[1], k[2])/s18;  /* N by K */
    const double dv3_dk2 = (k[0]*s23 - s19*(real_power_log(k[1], k[2]) + s23))/s18;  /* N by n */

    D[0] = -dv0_dk0 + dv1_dk0 - dv2_dk0 + dv3_dk0;  /* [S] by Vm */
    D[1] = dv0_dk0 - dv1_dk0 + dv2_dk0 - dv3_dk0;   /* [P] by Vm */
    D[2] = dv1_dk1 - dv2_dk1 + dv3_dk1;             /* [S] by K */
    D[3] = -dv1_dk1 + dv2_dk1 - dv3_dk1;            /* [P] by K */
    D[4] = dv3_dk2;                                 /* [S] by n */
    D[5] = -dv3_dk2;                                /* [P] by n */
    D[6] = -dv2_dk3;                                /* [S] by L */
    D[7] = dv2_dk3;                                 /* [P] by L */
    D[8] = -dv2_dk4;                                /* [S] by c */
    D[9] = dv2_dk4;                                 /* [P] by c */
}

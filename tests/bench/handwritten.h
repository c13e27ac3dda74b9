/* Right-hand sides and Jacobians as someone who programs well writes them out for one
 * model, to measure emitted C against.  Constants are arguments, Jacobians dense and
 * column-major; the order of species and constants is that of the mechanism files. */
#ifndef LIMBECK_TESTS_HANDWRITTEN_H
#define LIMBECK_TESTS_HANDWRITTEN_H

#include <string.h>

/* ---- Brusselator: networks/brusselator.mech, D and E included ------------------------ */

static void brusselator_rhs(double t, const double *x, const double *k, double *f)
{
    (void)t;
    double feed = k[2]*k[0], cubic = k[3]*x[0]*x[0]*x[1], exchange = k[4]*k[1]*x[0], loss = k[5]*x[0];
    f[0] = feed + cubic - exchange - loss;
    f[1] = exchange - cubic;
    f[2] = exchange;
    f[3] = loss;
}

static void brusselator_jacobian(double t, const double *x, const double *k, double *J)
{
    (void)t;
    double by_x = 2*k[3]*x[0]*x[1], by_y = k[3]*x[0]*x[0], exchange = k[4]*k[1];
    memset(J, 0, 16*sizeof *J);
    J[0] = by_x - exchange - k[5];
    J[1] = exchange - by_x;
    J[2] = exchange;
    J[3] = k[5];
    J[4] = by_y;
    J[5] = -by_y;
}

/* ---- HIRES: networks/hires.mech -------------------------------------------------------- */

enum { Y1, Y2, Y4, Y3, Y6, Y5, Y8, Y7 };

static void hires_rhs(double t, const double *y, const double *k, double *f)
{
    (void)t;
    double binding = k[6]*y[Y6]*y[Y8], release = (k[4] + k[2] + k[4])*y[Y7];
    f[Y1] = k[0] - k[1]*y[Y1] + k[2]*y[Y2] + k[3]*y[Y3];
    f[Y2] = k[1]*y[Y1] - (k[2] + k[3])*y[Y2];
    f[Y3] = k[2]*y[Y4] + k[5]*y[Y5] - (k[3] + k[1])*y[Y3];
    f[Y4] = k[3]*y[Y2] + k[1]*y[Y3] - (k[2] + k[4])*y[Y4];
    f[Y5] = k[2]*(y[Y6] + y[Y7]) - (k[5] + k[1])*y[Y5];
    f[Y6] = k[4]*(y[Y4] + y[Y7]) + k[1]*y[Y5] - k[2]*y[Y6] - binding;
    f[Y7] = binding - release;
    f[Y8] = release - binding;
}

static void hires_jacobian(double t, const double *y, const double *k, double *J)
{
    (void)t;
#define J(i, j) J[(i) + 8*(j)]
    double by_6 = k[6]*y[Y8], by_8 = k[6]*y[Y6], release = k[4] + k[2] + k[4];
    memset(J, 0, 64*sizeof *J);
    J(Y1, Y1) = -k[1];
    J(Y2, Y1) = k[1];
    J(Y1, Y2) = k[2];
    J(Y2, Y2) = -(k[2] + k[3]);
    J(Y4, Y2) = k[3];
    J(Y1, Y3) = k[3];
    J(Y3, Y3) = -(k[3] + k[1]);
    J(Y4, Y3) = k[1];
    J(Y3, Y4) = k[2];
    J(Y4, Y4) = -(k[2] + k[4]);
    J(Y6, Y4) = k[4];
    J(Y3, Y5) = k[5];
    J(Y5, Y5) = -(k[5] + k[1]);
    J(Y6, Y5) = k[1];
    J(Y5, Y6) = k[2];
    J(Y6, Y6) = -k[2] - by_6;
    J(Y7, Y6) = by_6;
    J(Y8, Y6) = -by_6;
    J(Y5, Y7) = k[2];
    J(Y6, Y7) = k[4];
    J(Y7, Y7) = -release;
    J(Y8, Y7) = release;
    J(Y6, Y8) = -by_8;
    J(Y7, Y8) = by_8;
    J(Y8, Y8) = -by_8;
#undef J
}

/* ---- POLLU: networks/pollu.mech, rates and sums as in Verwer (1994) --------------------- */

enum { NO2, NO, O3P, O3, HO2, OH, HCHO, CO, ALD, MEO2, C2O3, CO2, PAN, CH3O, HNO3, O1D, SO2, SO4, NO3, N2O5 };

static void pollu_rhs(double t, const double *y, const double *k, double *f)
{
    (void)t;
    double r1 = k[0]*y[NO2], r2 = k[1]*y[NO]*y[O3], r3 = k[2]*y[HO2]*y[NO], r4 = k[3]*y[HCHO], r5 = k[4]*y[HCHO];
    double r6 = k[5]*y[HCHO]*y[OH], r7 = k[6]*y[ALD], r8 = k[7]*y[ALD]*y[OH], r9 = k[8]*y[C2O3]*y[NO];
    double r10 = k[9]*y[C2O3]*y[NO2], r11 = k[10]*y[PAN], r12 = k[11]*y[MEO2]*y[NO], r13 = k[12]*y[CH3O];
    double r14 = k[13]*y[NO2]*y[OH], r15 = k[14]*y[O3P], r16 = k[15]*y[O3], r17 = k[16]*y[O3], r18 = k[17]*y[O1D];
    double r19 = k[18]*y[O1D], r20 = k[19]*y[SO2]*y[OH], r21 = k[20]*y[NO3], r22 = k[21]*y[NO3];
    double r23 = k[22]*y[NO2]*y[O3], r24 = k[23]*y[NO3]*y[NO2], r25 = k[24]*y[N2O5];
    f[NO2] = r2 + r3 + r9 + r11 + r12 + r22 + r25 - r1 - r10 - r14 - r23 - r24;
    f[NO] = r1 + r21 - r2 - r3 - r9 - r12;
    f[O3P] = r1 + r17 + r19 + r22 - r15;
    f[O3] = r15 - r2 - r16 - r17 - r23;
    f[HO2] = 2*r4 + r6 + r7 + r13 + r20 - r3;
    f[OH] = r3 + 2*r18 - r6 - r8 - r14 - r20;
    f[HCHO] = r13 - r4 - r5 - r6;
    f[CO] = r4 + r5 + r6 + r7;
    f[ALD] = -r7 - r8;
    f[MEO2] = r7 + r9 - r12;
    f[C2O3] = r8 + r11 - r9 - r10;
    f[CO2] = r9;
    f[PAN] = r10 - r11;
    f[CH3O] = r12 - r13;
    f[HNO3] = r14;
    f[O1D] = r16 - r18 - r19;
    f[SO2] = -r20;
    f[SO4] = r20;
    f[NO3] = r23 + r25 - r21 - r22 - r24;
    f[N2O5] = r24 - r25;
}

static void pollu_jacobian(double t, const double *y, const double *k, double *J)
{
    (void)t;
#define J(i, j) J[(i) + 20*(j)]
    double a, b, c, d;
    memset(J, 0, 400*sizeof *J);
    a = k[9]*y[C2O3], b = k[13]*y[OH], c = k[22]*y[O3], d = k[23]*y[NO3];
    J(NO2, NO2) = -k[0] - a - b - c - d, J(NO, NO2) = k[0], J(O3P, NO2) = k[0], J(C2O3, NO2) = -a, J(PAN, NO2) = a;
    J(OH, NO2) = -b, J(HNO3, NO2) = b, J(O3, NO2) = -c, J(NO3, NO2) = c - d, J(N2O5, NO2) = d;
    a = k[1]*y[O3], b = k[2]*y[HO2], c = k[8]*y[C2O3], d = k[11]*y[MEO2];
    J(NO, NO) = -a - b - c - d, J(NO2, NO) = a + b + c + d, J(O3, NO) = -a, J(HO2, NO) = -b, J(OH, NO) = b;
    J(C2O3, NO) = -c, J(MEO2, NO) = c - d, J(CO2, NO) = c, J(CH3O, NO) = d;
    J(O3P, O3P) = -k[14], J(O3, O3P) = k[14];
    a = k[1]*y[NO], d = k[22]*y[NO2];
    J(NO, O3) = -a, J(O3, O3) = -a - k[15] - k[16] - d, J(NO2, O3) = a - d, J(O1D, O3) = k[15], J(O3P, O3) = k[16];
    J(NO3, O3) = d;
    a = k[2]*y[NO];
    J(HO2, HO2) = -a, J(NO, HO2) = -a, J(NO2, HO2) = a, J(OH, HO2) = a;
    a = k[5]*y[HCHO], b = k[7]*y[ALD], c = k[13]*y[NO2], d = k[19]*y[SO2];
    J(HCHO, OH) = -a, J(OH, OH) = -a - b - c - d, J(HO2, OH) = a + d, J(CO, OH) = a, J(ALD, OH) = -b, J(C2O3, OH) = b;
    J(NO2, OH) = -c, J(HNO3, OH) = c, J(SO2, OH) = -d, J(SO4, OH) = d;
    c = k[5]*y[OH];
    J(HCHO, HCHO) = -k[3] - k[4] - c, J(HO2, HCHO) = 2*k[3] + c, J(CO, HCHO) = k[3] + k[4] + c, J(OH, HCHO) = -c;
    b = k[7]*y[OH];
    J(ALD, ALD) = -k[6] - b, J(MEO2, ALD) = k[6], J(HO2, ALD) = k[6], J(CO, ALD) = k[6], J(OH, ALD) = -b, J(C2O3, ALD) = b;
    d = k[11]*y[NO];
    J(MEO2, MEO2) = -d, J(NO, MEO2) = -d, J(CH3O, MEO2) = d, J(NO2, MEO2) = d;
    c = k[8]*y[NO], d = k[9]*y[NO2];
    J(C2O3, C2O3) = -c - d, J(NO, C2O3) = -c, J(NO2, C2O3) = c - d, J(MEO2, C2O3) = c, J(CO2, C2O3) = c, J(PAN, C2O3) = d;
    J(PAN, PAN) = -k[10], J(C2O3, PAN) = k[10], J(NO2, PAN) = k[10];
    J(CH3O, CH3O) = -k[12], J(HCHO, CH3O) = k[12], J(HO2, CH3O) = k[12];
    J(O1D, O1D) = -k[17] - k[18], J(OH, O1D) = 2*k[17], J(O3P, O1D) = k[18];
    d = k[19]*y[OH];
    J(SO2, SO2) = -d, J(OH, SO2) = -d, J(SO4, SO2) = d, J(HO2, SO2) = d;
    a = k[23]*y[NO2];
    J(NO3, NO3) = -k[20] - k[21] - a, J(NO, NO3) = k[20], J(NO2, NO3) = k[21] - a, J(O3P, NO3) = k[21], J(N2O5, NO3) = a;
    J(N2O5, N2O5) = -k[24], J(NO3, N2O5) = k[24], J(NO2, N2O5) = k[24];
#undef J
}

/* ---- Any network of A + B -> C + w D, as loops over packed arrays ------------------------- */

typedef struct packed {
    int states, reactions, nonzeros;
    int *a, *b, *c, *d;      /* [reactions] states */
    double *w;               /* [reactions] how often D is made */
    int *place;              /* [8*reactions] entries of the compressed Jacobian: A, B, C, D by A, then by B */
} packed;

static packed network;

static void packed_rhs(double t, const double *x, const double *k, double *f)
{
    (void)t;
    const packed p = network;
    memset(f, 0, (size_t)p.states*sizeof *f);
    for (int i = 0; i < p.reactions; i++) {
        double v = k[i]*x[p.a[i]]*x[p.b[i]];
        f[p.a[i]] -= v;
        f[p.b[i]] -= v;
        f[p.c[i]] += v;
        f[p.d[i]] += p.w[i]*v;
    }
}

static void packed_jacobian(double t, const double *x, const double *k, double *values)
{
    (void)t;
    const packed p = network;
    memset(values, 0, (size_t)p.nonzeros*sizeof *values);
    for (int i = 0; i < p.reactions; i++) {
        const int *place = &p.place[8*i];
        double by_a = k[i]*x[p.b[i]], by_b = k[i]*x[p.a[i]];
        values[place[0]] -= by_a;
        values[place[1]] -= by_a;
        values[place[2]] += by_a;
        values[place[3]] += p.w[i]*by_a;
        values[place[4]] -= by_b;
        values[place[5]] -= by_b;
        values[place[6]] += by_b;
        values[place[7]] += p.w[i]*by_b;
    }
}

#endif

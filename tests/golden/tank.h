/* tank.h: Stirred tank with an immobilised enzyme
 *
 * Written by limbeck 0.1.0.  This file belongs to whoever made it with limbeck, who
 * may use, change and pass it on under any terms.
 *
 * C99, needs libm alone:
 *
 *     cc -std=c99 -O2 -c tank.c
 *     cc -o program program.o tank.o -lm
 *
 * In a CMakeLists.txt:
 *
 *     add_library(tank STATIC tank.c)
 *     target_include_directories(tank PUBLIC ${CMAKE_CURRENT_SOURCE_DIR})
 *     target_link_libraries(tank PUBLIC m)
 *
 * As an installed library with a tank.pc for pkg-config:
 *
 *     prefix=/usr/local
 *     Name: tank
 *     Description: a reaction mechanism
 *     Version: 1
 *     Cflags: -I${prefix}/include
 *     Libs: -L${prefix}/lib -ltank -lm
 *
 * Start from x = tank_initial and k = tank_defaults, or from your own copies of
 * them.  The functions keep nothing between calls and may run in many threads at
 * once; the output array must not overlap x or k.  t is the time; no rate depends
 * on it yet.
 *
 * Units: concentrations in mM, time in min.
 *
 * Species, x[]:
 *     0  S
 *     1  P
 *     2  I
 *     3  Br-
 *     4  E
 *
 * Constants, k[], with their values in the mechanism:
 *     0  temperature = 310.0 K
 *     1  residence = 20.0 min
 *     2  [buffer] = 5.0 mM
 *     3  [S]in = 10.0 mM
 *     4  Vmax = 3.0 mM/min
 *     5  Km = 0.4 mM
 *     6  Ki = 2.0 mM
 *     7  hill = 2.5
 *     8  f = 1.0
 *     9  R2.kf = 0.5 mM^-1 min^-1
 *    10  R2.K = 4.0 mM^-1
 *    11  R3.A = 1e9 mM^-1 min^-1
 *    12  R3.n = 0.0
 *    13  R3.Ea = 50000.0 J/mol
 */
#ifndef LIMBECK_MODEL_tank_H
#define LIMBECK_MODEL_tank_H

#ifdef __cplusplus
extern "C" {
#endif

enum {
    tank_STATES = 5,
    tank_CONSTANTS = 14,
    tank_REACTIONS = 7,
    tank_NONZEROS = 12
};

extern const char *const tank_state_names[5];
extern const char *const tank_constant_names[14];
extern const char *const tank_reaction_labels[7];
extern const double tank_initial[5];   /* x at the start */
extern const double tank_defaults[14];  /* k in the mechanism */

/* Pattern of the Jacobian in compressed columns: the entries of column j are
 * column_start[j] .. column_start[j + 1] - 1, their rows ascend. */
extern const int tank_column_start[6];
extern const int tank_row[12];

/* Rates of the one-way reactions, v[REACTIONS]. */
void tank_rates(double t, const double x[], const double k[], double v[]);
/* Time derivatives, dxdt[STATES]. */
void tank_rhs(double t, const double x[], const double k[], double dxdt[]);
/* J[i + j*STATES] = d(dxdt[i])/d(x[j]). */
void tank_jacobian(double t, const double x[], const double k[], double J[]);
/* The same, values[NONZEROS] in the pattern above. */
void tank_jacobian_sparse(double t, const double x[], const double k[], double values[]);
/* D[i + j*STATES] = d(dxdt[i])/d(k[j]). */
void tank_dfdk(double t, const double x[], const double k[], double D[]);

#ifdef __cplusplus
}
#endif

#endif

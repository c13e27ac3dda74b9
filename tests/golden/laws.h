/* laws.h: Rate laws with common parts
 *
 * Written by limbeck 0.1.0.  This file belongs to whoever made it with limbeck, who
 * may use, change and pass it on under any terms.
 *
 * C99, needs libm alone:
 *
 *     cc -std=c99 -O2 -c laws.c
 *     cc -o program program.o laws.o -lm
 *
 * In a CMakeLists.txt:
 *
 *     add_library(laws STATIC laws.c)
 *     target_include_directories(laws PUBLIC ${CMAKE_CURRENT_SOURCE_DIR})
 *     target_link_libraries(laws PUBLIC m)
 *
 * As an installed library with a laws.pc for pkg-config:
 *
 *     prefix=/usr/local
 *     Name: laws
 *     Description: a reaction mechanism
 *     Version: 1
 *     Cflags: -I${prefix}/include
 *     Libs: -L${prefix}/lib -llaws -lm
 *
 * Start from x = laws_initial and k = laws_defaults, or from your own copies of
 * them.  The functions keep nothing between calls and may run in many threads at
 * once; the output array must not overlap x or k.  t is the time; no rate depends
 * on it yet.
 *
 * Units: none.
 *
 * Species, x[]:
 *     0  S
 *     1  P
 *
 * Constants, k[], with their values in the mechanism:
 *     0  Vm = 2.0
 *     1  K = 0.5
 *     2  n = 4.0
 *     3  L = 1e6
 *     4  c = 0.01
 */
#ifndef LIMBECK_MODEL_laws_H
#define LIMBECK_MODEL_laws_H

#ifdef __cplusplus
extern "C" {
#endif

enum {
    laws_STATES = 2,
    laws_CONSTANTS = 5,
    laws_REACTIONS = 4,
    laws_NONZEROS = 4
};

extern const char *const laws_state_names[2];
extern const char *const laws_constant_names[5];
extern const char *const laws_reaction_labels[4];
extern const double laws_initial[2];   /* x at the start */
extern const double laws_defaults[5];  /* k in the mechanism */

/* Pattern of the Jacobian in compressed columns: the entries of column j are
 * column_start[j] .. column_start[j + 1] - 1, their rows ascend. */
extern const int laws_column_start[3];
extern const int laws_row[4];

/* Rates of the one-way reactions, v[REACTIONS]. */
void laws_rates(double t, const double x[], const double k[], double v[]);
/* Time derivatives, dxdt[STATES]. */
void laws_rhs(double t, const double x[], const double k[], double dxdt[]);
/* J[i + j*STATES] = d(dxdt[i])/d(x[j]). */
void laws_jacobian(double t, const double x[], const double k[], double J[]);
/* The same, values[NONZEROS] in the pattern above. */
void laws_jacobian_sparse(double t, const double x[], const double k[], double values[]);
/* D[i + j*STATES] = d(dxdt[i])/d(k[j]). */
void laws_dfdk(double t, const double x[], const double k[], double D[]);

#ifdef __cplusplus
}
#endif

#endif

/* brusselator.h: Brusselator
 *
 * Written by limbeck 0.1.0.  This file belongs to whoever made it with limbeck, who
 * may use, change and pass it on under any terms.
 *
 * C99, needs libm alone:
 *
 *     cc -std=c99 -O2 -c brusselator.c
 *     cc -o program program.o brusselator.o -lm
 *
 * In a CMakeLists.txt:
 *
 *     add_library(brusselator STATIC brusselator.c)
 *     target_include_directories(brusselator PUBLIC ${CMAKE_CURRENT_SOURCE_DIR})
 *     target_link_libraries(brusselator PUBLIC m)
 *
 * As an installed library with a brusselator.pc for pkg-config:
 *
 *     prefix=/usr/local
 *     Name: brusselator
 *     Description: a reaction mechanism
 *     Version: 1
 *     Cflags: -I${prefix}/include
 *     Libs: -L${prefix}/lib -lbrusselator -lm
 *
 * Start from x = brusselator_initial and k = brusselator_defaults, or from your own copies of
 * them.  The functions keep nothing between calls and may run in many threads at
 * once; the output array must not overlap x or k.  t is the time; no rate depends
 * on it yet.
 *
 * Units: none.
 *
 * Species, x[]:
 *     0  X
 *     1  Y
 *     2  D
 *     3  E
 *
 * Constants, k[], with their values in the mechanism:
 *     0  [A] = 1.0
 *     1  [B] = 3.0
 *     2  B1.k = 1.0
 *     3  B2.k = 1.0
 *     4  B3.k = 1.0
 *     5  B4.k = 1.0
 */
#ifndef LIMBECK_MODEL_brusselator_H
#define LIMBECK_MODEL_brusselator_H

#ifdef __cplusplus
extern "C" {
#endif

enum {
    brusselator_STATES = 4,
    brusselator_CONSTANTS = 6,
    brusselator_REACTIONS = 4,
    brusselator_NONZEROS = 6
};

extern const char *const brusselator_state_names[4];
extern const char *const brusselator_constant_names[6];
extern const char *const brusselator_reaction_labels[4];
extern const double brusselator_initial[4];   /* x at the start */
extern const double brusselator_defaults[6];  /* k in the mechanism */

/* Pattern of the Jacobian in compressed columns: the entries of column j are
 * column_start[j] .. column_start[j + 1] - 1, their rows ascend. */
extern const int brusselator_column_start[5];
extern const int brusselator_row[6];

/* Rates of the one-way reactions, v[REACTIONS]. */
void brusselator_rates(double t, const double x[], const double k[], double v[]);
/* Time derivatives, dxdt[STATES]. */
void brusselator_rhs(double t, const double x[], const double k[], double dxdt[]);
/* J[i + j*STATES] = d(dxdt[i])/d(x[j]). */
void brusselator_jacobian(double t, const double x[], const double k[], double J[]);
/* The same, values[NONZEROS] in the pattern above. */
void brusselator_jacobian_sparse(double t, const double x[], const double k[], double values[]);
/* D[i + j*STATES] = d(dxdt[i])/d(k[j]). */
void brusselator_dfdk(double t, const double x[], const double k[], double D[]);

#ifdef __cplusplus
}
#endif

#endif

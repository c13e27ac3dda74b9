/* source.h: a reaction mechanism
 *
 * Written by limbeck 0.1.0.  This file belongs to whoever made it with limbeck, who
 * may use, change and pass it on under any terms.
 *
 * C99, needs libm alone:
 *
 *     cc -std=c99 -O2 -c source.c
 *     cc -o program program.o source.o -lm
 *
 * In a CMakeLists.txt:
 *
 *     add_library(source STATIC source.c)
 *     target_include_directories(source PUBLIC ${CMAKE_CURRENT_SOURCE_DIR})
 *     target_link_libraries(source PUBLIC m)
 *
 * As an installed library with a source.pc for pkg-config:
 *
 *     prefix=/usr/local
 *     Name: source
 *     Description: a reaction mechanism
 *     Version: 1
 *     Cflags: -I${prefix}/include
 *     Libs: -L${prefix}/lib -lsource -lm
 *
 * Start from x = source_initial and k = source_defaults, or from your own copies of
 * them.  The functions keep nothing between calls and may run in many threads at
 * once; the output array must not overlap x or k.  t is the time; no rate depends
 * on it yet.
 *
 * Units: none.
 *
 * Species, x[]:
 *     0  X
 *
 * There are no constants: k may be NULL.
 */
#ifndef LIMBECK_MODEL_source_H
#define LIMBECK_MODEL_source_H

#ifdef __cplusplus
extern "C" {
#endif

enum {
    source_STATES = 1,
    source_CONSTANTS = 0,
    source_REACTIONS = 1,
    source_NONZEROS = 0
};

extern const char *const source_state_names[1];
extern const char *const source_constant_names[1];
extern const char *const source_reaction_labels[1];
extern const double source_initial[1];   /* x at the start */
extern const double source_defaults[1];  /* k in the mechanism */

/* Pattern of the Jacobian in compressed columns: the entries of column j are
 * column_start[j] .. column_start[j + 1] - 1, their rows ascend. */
extern const int source_column_start[2];
extern const int source_row[1];

/* Rates of the one-way reactions, v[REACTIONS]. */
void source_rates(double t, const double x[], const double k[], double v[]);
/* Time derivatives, dxdt[STATES]. */
void source_rhs(double t, const double x[], const double k[], double dxdt[]);
/* J[i + j*STATES] = d(dxdt[i])/d(x[j]). */
void source_jacobian(double t, const double x[], const double k[], double J[]);
/* The same, values[NONZEROS] in the pattern above. */
void source_jacobian_sparse(double t, const double x[], const double k[], double values[]);
/* D[i + j*STATES] = d(dxdt[i])/d(k[j]). */
void source_dfdk(double t, const double x[], const double k[], double D[]);

#ifdef __cplusplus
}
#endif

#endif

/* limbeck: reaction mechanisms from text to dynamics.
 *
 * The whole public interface, one section per stage, in the order of the
 * pipeline: read a mechanism, make a system, analyse it, write the results.
 *
 * Conventions.  n states, m constants, r steps (one-way reactions).  Numbers
 * are in the units of the mechanism file (`units`), time included.  Dense
 * matrices are column-major, J[i + j*n] = d f_i / d x_j; sparse ones are
 * compressed columns.  Whatever can fail returns lb_status, results come
 * through pointers, and the last argument lb_error *err may be NULL.  On
 * failure an out-pointer is NULL and nothing is held.  Every *_free takes NULL.
 * Arguments are borrowed for the call; results own copies, unless a comment
 * says otherwise.
 *
 * The library never prints, exits or keeps global state.  A program that links
 * it must call gsl_set_error_handler_off() before anything else, since GSL's
 * default handler aborts.  Linking against the library inherits the GPL; the C
 * that lb_emit writes is its user's, under any terms. */
#ifndef LIMBECK_H
#define LIMBECK_H

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#ifdef __cplusplus
extern "C" {
#endif

#define LB_VERSION "0.1.0"

/* ---- Status and errors ------------------------------------------------- */

#define LB_STATUS_LIST(X)                                                              \
    X(LB_OK,          "no error")                                                      \
    X(LB_E_ARG,       "an argument is outside its domain")                             \
    X(LB_E_NOMEM,     "memory is exhausted")                                           \
    X(LB_E_IO,        "a file could not be read or written")                           \
    X(LB_E_MECHANISM, "the mechanism has faults")                                      \
    X(LB_E_NAME,      "a name is not known")                                           \
    X(LB_E_LIMIT,     "a size is beyond what is supported")                            \
    X(LB_E_NEGATIVE,  "a concentration fell below zero")                               \
    X(LB_E_STEP,      "the integration could not go on")                               \
    X(LB_E_FINITE,    "a value is not finite")                                         \
    X(LB_E_NUMERIC,   "a numerical routine failed")                                    \
    X(LB_E_STOPPED,   "interrupted")

typedef enum lb_status {
#define LB_STATUS_ENUM(name, text) name,
    LB_STATUS_LIST(LB_STATUS_ENUM)
#undef LB_STATUS_ENUM
} lb_status;

typedef struct lb_error {
    lb_status code;
    char message[600];   /* what is wrong, one sentence, UTF-8 */
    char remedy[300];    /* what to do instead; may be empty */
} lb_error;

const char *lb_status_text(lb_status status);

/* Growing text that the writers below append to. */
typedef struct lb_text lb_text;
lb_text    *lb_text_new(void);                              /* NULL without memory */
const char *lb_text_get(const lb_text *text, size_t *length); /* borrowed; length may be NULL */
void        lb_text_free(lb_text *text);

/* Asked from time to time by long work; true means: stop now with what you
 * have.  May be NULL.  `done` in 0..1, or negative when not known. */
typedef struct lb_monitor {
    bool (*stop)(void *context);
    void (*progress)(void *context, const char *what, double done);
    void *context;
} lb_monitor;

/* ---- Reading a mechanism ------------------------------------------------ */

/* A fault (the mechanism cannot be used) or a warning, with its place. */
typedef struct lb_diagnostic {
    bool is_fault;
    int line, column, length;     /* from 1; columns count characters */
    const char *message;          /* borrowed from the list */
    const char *remedy;           /* what to write instead; "" when not known */
} lb_diagnostic;

typedef struct lb_diagnostics lb_diagnostics;
size_t lb_diagnostics_count(const lb_diagnostics *list);
size_t lb_diagnostics_faults(const lb_diagnostics *list);     /* how many are faults */
lb_diagnostic lb_diagnostics_get(const lb_diagnostics *list, size_t i); /* sorted by place */
/* Append each as `file:line:column: error: message`, the source line, a caret,
 * and the remedy.  colour: ANSI colours. */
lb_status lb_diagnostics_write(const lb_diagnostics *list, bool colour, lb_text *out);
void lb_diagnostics_free(lb_diagnostics *list);

/* NAME=VALUE from a user: name as in the file (`k2`, `R3.kf`, `[A]`, `[X]0`,
 * `[X]in`, `residence`, `temperature`), value a plain number, with a unit or
 * without. */
typedef struct lb_setting {
    const char *name;
    const char *value;
} lb_setting;

typedef struct lb_network lb_network;   /* immutable once built; may be shared by threads */

/* Read a mechanism from length bytes of text; `file` names it in messages.
 * Settings replace numbers of the file before anything is computed.
 *
 *   network      out  NULL when there are faults
 *   diagnostics  out  faults and warnings, also on success; NULL only without memory
 *
 * Returns LB_OK, LB_E_MECHANISM (faults are in the list), LB_E_NAME or LB_E_ARG
 * (a setting is wrong, see err), LB_E_NOMEM. */
lb_status lb_network_parse(const char *file, const char *text, size_t length,
                           const lb_setting *settings, size_t setting_count,
                           lb_network **network, lb_diagnostics **diagnostics, lb_error *err);

/* The same from a file; LB_E_IO when it cannot be read. "-" is standard input. */
lb_status lb_network_read(const char *path, const lb_setting *settings, size_t setting_count,
                          lb_network **network, lb_diagnostics **diagnostics, lb_error *err);
void lb_network_free(lb_network *network);

/* What a caller may ask of a network.  Strings are borrowed. */
const char *lb_network_title(const lb_network *network);      /* "" when none */
int  lb_network_states(const lb_network *network);            /* n */
int  lb_network_constants(const lb_network *network);         /* m: whatever has a number in the file */
int  lb_network_steps(const lb_network *network);             /* r: one-way reactions, without the flows of a tank */
int  lb_network_readings(const lb_network *network);
bool lb_network_is_open(const lb_network *network);           /* matter crosses its boundary */
const char *lb_network_state_name(const lb_network *network, int state);
const char *lb_network_constant_name(const lb_network *network, int constant);
const char *lb_network_step_name(const lb_network *network, int step);
const char *lb_network_reading_name(const lb_network *network, int reading);
int  lb_network_find_state(const lb_network *network, const char *name);     /* -1 when there is none */
int  lb_network_find_constant(const lb_network *network, const char *name);  /* -1 when there is none */
double lb_network_default(const lb_network *network, int constant);
/* Range of a constant; false when it has none. */
bool lb_network_range(const lb_network *network, int constant, double *low, double *high, bool *logarithmic);
/* A time with a unit, or without (the file's): `3600`, `1 h`. */
lb_status lb_network_time(const lb_network *network, const char *text, double *time, lb_error *err);

/* The candidate that is nearest to a wrong word, and another word (edit distance with
 * transpositions, an eighth of an edit for a wrong case), or NULL when none is near. */
const char *lb_nearest(const char *word, const char *const *candidates, size_t count);

/* ---- The system --------------------------------------------------------- */

/* n states, m constants, and all that numeric analyses see of a mechanism.
 * Immutable, may be shared by threads.  Borrows the network, which must live
 * longer. */
typedef struct lb_system lb_system;
lb_status lb_system_new(const lb_network *network, lb_system **system, lb_error *err);
void lb_system_free(lb_system *system);

int        lb_system_nonzeros(const lb_system *system);       /* z of the Jacobian */
const int *lb_system_column_start(const lb_system *system);   /* [n+1] */
const int *lb_system_rows(const lb_system *system);           /* [z], ascending in each column */

/* Conservation laws of the whole network, minimal non-negative integer vectors
 * where they exist, completed to a basis by signed ones. */
int lb_system_laws(const lb_system *system);
const int64_t *lb_system_law(const lb_system *system, int law);  /* [n] coefficients */

/* Two engines evaluate a system: tables, which are always there, and native code, the C of
 * lb_emit compiled by the system's compiler and loaded; they agree to rounding.  Native code
 * pays where a small network is evaluated very often (design: below some 300 reactions). */
typedef struct lb_native_options {
    const char *cache;         /* folder for compiled models; NULL: $XDG_CACHE_HOME/limbeck or ~/.cache/limbeck */
    const char *compiler;      /* a name on PATH or a path; NULL: cc */
    const lb_monitor *monitor; /* a stop ends the compiler */
} lb_native_options;

/* Let the system use native code from now on; before it is shared and before evaluators are
 * made.  options may be NULL.  The cache folder must be the user's own with mode 0700; a
 * compiled model is found there again by a digest of its text, the compiler and the flags.  No
 * shell is involved.
 *
 * Returns LB_E_IO with the reason when there is no native code to be had (no compiler, no safe
 * folder), LB_E_STOPPED, LB_E_NOMEM: tables are used as before, and lb_system_engine_note says why. */
lb_status lb_system_use_native(lb_system *system, const lb_native_options *options, lb_error *err);
const char *lb_system_engine(const lb_system *system);       /* "tables" or "native" */
const char *lb_system_engine_note(const lb_system *system);  /* why tables, where native code was asked for; "" */

/* A system with its constants bound, and the workspace of one thread. */
typedef struct lb_evaluator lb_evaluator;
lb_status lb_evaluator_new(const lb_system *system, lb_evaluator **evaluator, lb_error *err);
void lb_evaluator_free(lb_evaluator *evaluator);

/* Bind constants k [m] (NULL: the file's) and compute what derives from them.
 * LB_E_ARG when a rate constant comes out negative or not finite; the binding
 * is then as before. */
lb_status lb_evaluator_bind(lb_evaluator *evaluator, const double *k, lb_error *err);

/* None of these allocates or fails; values may come out non-finite, which the
 * analyses check.  x is never changed. */
void lb_initial(lb_evaluator *evaluator, double x[]);                       /* [n] at the bound constants */
void lb_rates(lb_evaluator *evaluator, const double x[], double v[]);       /* [r] one-way rates */
void lb_rhs(lb_evaluator *evaluator, const double x[], double dxdt[]);      /* [n] */
void lb_jacobian(lb_evaluator *evaluator, const double x[], double J[]);    /* [n*n] */
void lb_jacobian_sparse(lb_evaluator *evaluator, const double x[], double values[]); /* [z] */
void lb_dfdk(lb_evaluator *evaluator, const double x[], double D[]);        /* [n*m] */
void lb_readings(lb_evaluator *evaluator, const double x[], double values[]);

/* Eight bindings and eight states at once, for whatever sweeps: each lane gives the very
 * numbers that an evaluator gives, at a fraction of the time.  Every array holds the lanes of
 * one quantity side by side: number i of lane l stands at i*LB_LANES + l.  One thread at a
 * time; the system must live longer. */
#define LB_LANES 8
typedef struct lb_batch lb_batch;
lb_status lb_batch_new(const lb_system *system, lb_batch **batch, lb_error *err); /* bound to the file's constants */
void lb_batch_free(lb_batch *batch);

/* Bind constants k [m*LB_LANES] (NULL: the file's in every lane).  A lane whose rate constant
 * comes out negative or not finite keeps what was bound before: its bit is set in *refused
 * (which may be NULL), the call returns LB_E_ARG with the reason of the first such lane, and
 * the other lanes are bound. */
lb_status lb_batch_bind(lb_batch *batch, const double *k, unsigned *refused, lb_error *err);

/* As with an evaluator; these do not allocate or fail. */
void lb_batch_initial(lb_batch *batch, double x[]);                       /* [n*LB_LANES] */
void lb_batch_rates(lb_batch *batch, const double x[], double v[]);       /* [r*LB_LANES] */
void lb_batch_rhs(lb_batch *batch, const double x[], double dxdt[]);      /* [n*LB_LANES] */
void lb_batch_jacobian_sparse(lb_batch *batch, const double x[], double values[]); /* [z*LB_LANES] */

/* ---- Emitted C ----------------------------------------------------------- */

/* Whose solvers the emitted C is for (lb_emit_glue). */
typedef enum lb_solver { LB_SOLVER_NONE, LB_SOLVER_GSL, LB_SOLVER_CVODES } lb_solver;

typedef struct lb_emit_options {
    const char *name;        /* a C identifier: prefix of all names and the files' stem */
    lb_solver solver;
    size_t lines;            /* a function of more terms than this runs over tables; 0: chosen (docs/emitted-code.md) */
} lb_emit_options;

/* A valid C identifier from a file's path ("bath 2.mech" gives "bath_2"); NULL
 * without memory; the caller frees it with free(). */
char *lb_emit_name(const char *path);

/* Write NAME.h and NAME.c as text.  The interface of the C is in docs/emitted-code.md.
 * Returns LB_E_ARG when the name is no identifier or a word of C. */
lb_status lb_emit(const lb_network *network, const lb_emit_options *options,
                  lb_text *header, lb_text *source, lb_error *err);

/* Write the glue between this C and a solver, NAME_gsl.h and NAME_gsl.c (or NAME_cvodes...),
 * and an example program, NAME_gsl_main.c, that integrates from the initial state and prints
 * comma-separated values.  LB_E_ARG as above, and where options name no solver. */
lb_status lb_emit_glue(const lb_network *network, const lb_emit_options *options,
                       lb_text *header, lb_text *source, lb_text *example, lb_error *err);

/* ---- Time courses -------------------------------------------------------- */

typedef enum lb_method { LB_METHOD_AUTO, LB_METHOD_EXPLICIT, LB_METHOD_STIFF } lb_method;

typedef struct lb_run_options {
    double until;            /* end time; must be positive */
    double every;            /* spacing of rows; 0: 200 rows */
    double tolerance;        /* relative, from 1e-13; 0: 1e-8; above 1e-2, where runs go wrong silently, 1e-2 */
    const double *absolute;  /* [n] absolute tolerances, or NULL: relative tolerance times a scale per species */
    lb_method method;
    const lb_monitor *monitor;
} lb_run_options;

typedef struct lb_run {
    int states, readings;
    size_t rows;
    double *t;               /* [rows] */
    double *x;               /* [rows*states], row after row */
    double *reading;         /* [rows*readings], row after row; NAN where a reading has no finite value */
    double tolerance;        /* relative, as used */
    const char *tightened;   /* why that is tighter than asked for, in words; static; NULL when it is not */
    const char *method;      /* which method ran, in words; static */
    const char *why;         /* and why; static */
    size_t steps, rejected;
    bool interrupted;        /* stopped by the monitor: the rows end early */
} lb_run;

/* Integrate from the file's initial state.  A relative tolerance above 1e-6 is checked by
 * a second run, a hundred times tighter; where the two disagree the tighter one is taken and
 * checked in turn (`tightened`).
 * Returns LB_E_NEGATIVE (message: the time, the species and the reaction that
 * did it) when an unsigned concentration falls below zero by more than its
 * tolerance; LB_E_STEP, LB_E_FINITE.  After these *out holds the rows so far.
 * LB_E_ARG, LB_E_LIMIT (rows, or species when stiff), LB_E_NOMEM.  An
 * interrupted run is LB_OK with `interrupted`. */
lb_status lb_run_solve(const lb_system *system, const lb_run_options *options, lb_run **out, lb_error *err);
void lb_run_free(lb_run *run);

/* ---- Steady states ------------------------------------------------------- */

typedef struct lb_complex { double re, im; } lb_complex;

typedef enum lb_kind {
    LB_STABLE_NODE, LB_STABLE_FOCUS, LB_UNSTABLE_NODE, LB_UNSTABLE_FOCUS,
    LB_SADDLE, LB_SADDLE_FOCUS, LB_CENTRE, LB_KIND_UNDECIDED,
    LB_KIND_FIXED            /* reaction space of dimension zero */
} lb_kind;
const char *lb_kind_text(lb_kind kind);   /* "stable node", ... */

typedef enum lb_answer { LB_NO, LB_YES, LB_UNDECIDED } lb_answer;

/* One eigenvalue, or one complex pair, as a motion near the steady state. */
typedef struct lb_mode {
    lb_complex eigenvalue;   /* im >= 0: the upper one of a pair */
    double time;             /* 1/|re|: relaxation time, or growth time when re > 0; infinite when re is 0 */
    double period;           /* 2 pi/im; 0 for a real eigenvalue */
    double damping;          /* factor by which the swing shrinks per period, exp(2 pi re/im); 0 when real */
    double error;            /* bound of rounding and residual on the eigenvalue; a smaller re may have either sign */
} lb_mode;

typedef struct lb_steady_state {
    double *x;               /* [n]; NAN where a species accumulates or no law fixes it */
    lb_complex *eigenvalues; /* [rank], in the reaction space, by falling real part, pairs adjacent with im > 0 first */
    lb_mode *modes;          /* [mode_count], slowest first */
    int mode_count;
    double real_part_error;  /* the mode's error whose sign is the least certain */
    lb_answer stable;
    lb_kind kind;
    bool is_boundary;        /* some core species is zero */
    double residual;         /* max_i |f_i| / (sum of |terms of f_i| + sum_j |df_i/dx_j| |x_j|) */
    bool routh_hurwitz_agrees; /* the count of unstable eigenvalues by the Routh array is the same (or not asked: rank above 8) */
    double *sensitivity;     /* [n*m] d ln x_i / d ln k_j at i + j*n, the totals moving with the initial state; NAN where x_i
                              * is 0 or the state is degenerate; NULL: not asked */
    lb_complex *leading_sensitivity; /* [m] d eigenvalues[0] / d ln k_j; NULL: not asked */
} lb_steady_state;

typedef struct lb_steady_options {
    size_t starts;           /* 0: chosen by size */
    uint64_t seed;
    const double *x0;        /* [n] state whose totals define the class; NULL: the file's initial state */
    const double *k;         /* [m] constants; NULL: the file's */
    bool skip_boundary;
    bool sensitivities;      /* by all constants, of every state */
    const lb_monitor *monitor;
} lb_steady_options;

typedef struct lb_steady {
    int states;              /* n */
    int rank;                /* dimension of the reaction space: eigenvalues per state */
    int zero_eigenvalues;    /* left out: core species minus rank */
    size_t count;
    lb_steady_state *state;  /* [count] positive ones first, then boundary, each by falling x lexicographically */
    int law_count;
    double *total;           /* [law_count] value of each conservation law of the system in the class */
    bool *accumulating;      /* [n] set aside, grows or is not fixed by a law */
    int continuum;           /* dimension of a continuum of steady states that was met, of which one is listed; 0: none */
    size_t starts, converged; /* effort of the search */
    bool all_faces;          /* false: there are more faces than were visited */
    bool interrupted;
} lb_steady;

/* All steady states found in the compatibility class of x0.  "Found" is a
 * search's word: low-discrepancy starts, Newton in log concentrations, merged
 * duplicates, reduced networks on the faces that trajectories cannot leave. */
lb_status lb_steady_solve(const lb_system *system, const lb_steady_options *options,
                          lb_steady **out, lb_error *err);
void lb_steady_free(lb_steady *steady);

/* Where the steady states change in kind as one constant turns through its range. */
typedef enum lb_special_kind { LB_FOLD, LB_HOPF } lb_special_kind;
const char *lb_special_text(lb_special_kind kind);   /* "fold", "Hopf" */

typedef struct lb_special {
    lb_special_kind kind;
    double value;            /* of the constant */
    double *x;               /* [n] the state there; NAN where a species accumulates */
    double omega;            /* of a Hopf point: the imaginary part of the pair; else 0 */
} lb_special;

typedef struct lb_along_options {
    int constant;            /* it must have a range */
    uint64_t seed;
    const double *k;         /* [m] the other constants; NULL: the file's */
    const lb_monitor *monitor;
} lb_along_options;

typedef struct lb_along {
    int states;              /* n */
    int constant;
    double low, high;        /* its range */
    size_t count;
    lb_special *special;     /* [count] by rising value */
    size_t branches, points; /* followed */
    bool interrupted;
} lb_along;

/* Folds and Hopf points within the range, on the branches through the states that searches
 * at several values find, each located to rounding.  Totals are those of the initial state
 * at the constants.  LB_E_ARG when the constant has no range; LB_E_NOMEM. */
lb_status lb_along_solve(const lb_system *system, const lb_along_options *options, lb_along **out, lb_error *err);
void lb_along_free(lb_along *along);

/* ---- Cycles and oscillation ---------------------------------------------- */

typedef struct lb_cycle {
    int states;              /* n */
    double *x;               /* [n] one point of the orbit */
    double period;
    double *low, *high;      /* [n] extrema over one period; NAN for species set aside */
    lb_complex *multipliers; /* [multiplier_count] non-trivial ones (rank - 1), largest first */
    int multiplier_count;
    lb_answer stable;        /* all of them inside the unit circle */
    double closure;          /* max_i |x_i(T) - x_i(0)| / (high_i - low_i) */
    double confirmed;        /* relative difference of the period found by a second method and tolerance; NAN: not confirmed */
    size_t steps;            /* integration steps in one period */
    const char *method;      /* static */
} lb_cycle;
void lb_cycle_free(lb_cycle *cycle);

typedef enum lb_scope { LB_SCOPE_GIVEN, LB_SCOPE_RANGES } lb_scope;
typedef enum lb_verdict { LB_OSCILLATES, LB_IS_CENTRE, LB_NOT_FOUND } lb_verdict;
const char *lb_scope_text(lb_scope scope);        /* "given", "ranges" */
const char *lb_verdict_text(lb_verdict verdict);  /* "oscillates", "centre", "not found" */

typedef struct lb_oscillate_options {
    bool given, ranges;      /* the scopes asked for; ranges is left out when no constant has one */
    size_t samples;          /* of the box; 0: chosen */
    double seconds;          /* 0: no limit of time */
    uint64_t seed;
    const lb_monitor *monitor;
} lb_oscillate_options;

typedef struct lb_oscillate_answer {
    lb_scope scope;
    lb_verdict verdict;
    lb_cycle *cycle;         /* the witness's orbit; NULL when not found */
    double *k;               /* [m] constants of the witness; NULL when not found */
    double *start;           /* [n] state from which the orbit was reached; NULL when not found */
    char *witness;           /* text of a .mech file that runs; NULL when not found */
    bool keeps_moving;       /* some trajectory stays bounded and neither rests nor closes: chaos, a torus, or very slow */
    bool runs_away;          /* some trajectory grows without bound */
    int swings;              /* transient oscillation on the way to rest: swings above a thousandth of the largest,
                              * led on by their ratio where they last too long to follow; 0: none */
    double swing_decay;      /* ratio of successive swings, 0 when none */
    int swing_species;       /* state in which the swings are largest; -1: none */
    size_t unstable;         /* unstable steady states met */
    size_t steady;           /* steady states met */
    size_t samples;          /* sets of constants tried */
    size_t integrations;
    double seconds;          /* wall clock; reported, decides nothing */
    const char *method;      /* static, one sentence */
    char *limits;            /* what the search did not cover, one sentence */
    bool interrupted;
} lb_oscillate_answer;

typedef struct lb_oscillate {
    int states, constants;
    size_t count;
    lb_oscillate_answer *answer;
    lb_steady *steady;       /* of the constants given; NULL when that scope was not asked */
} lb_oscillate;

lb_status lb_oscillate_solve(const lb_system *system, const lb_oscillate_options *options,
                             lb_oscillate **out, lb_error *err);
void lb_oscillate_free(lb_oscillate *oscillate);

/* ---- Output -------------------------------------------------------------- */

typedef struct lb_layout {
    int width;               /* columns of the page; 0: 80 */
    bool colour;             /* ANSI colours */
} lb_layout;

/* Text for a person.  Each appends to out. */
lb_status lb_text_check(const lb_network *network, const lb_layout *layout, lb_text *out);
lb_status lb_text_steady(const lb_system *system, const lb_steady *steady, const lb_layout *layout, lb_text *out);
lb_status lb_text_along(const lb_system *system, const lb_along *along, const lb_layout *layout, lb_text *out);
lb_status lb_text_oscillate(const lb_system *system, const lb_oscillate *oscillate, const lb_layout *layout, lb_text *out);
/* The one-page answer: what the mechanism is, what it conserves, where it rests, whether it oscillates. */
lb_status lb_text_page(const lb_system *system, const lb_oscillate *oscillate, const lb_layout *layout, lb_text *out);
/* CSV with units in the header, numbers in the shortest form that reads back to the same bits. */
lb_status lb_csv_run(const lb_system *system, const lb_run *run, lb_text *out);

/* One JSON object (docs/json.md), ending in a newline. */
lb_status lb_json_check(const lb_network *network, const lb_diagnostics *diagnostics, lb_text *out);
/* error: why the run ended early, beside the rows so far; NULL when it did not. */
lb_status lb_json_run(const lb_system *system, const lb_diagnostics *diagnostics, const lb_run *run, const lb_error *error, lb_text *out);
/* along: NULL where it was not asked. */
lb_status lb_json_steady(const lb_system *system, const lb_diagnostics *diagnostics, const lb_steady *steady,
                         const lb_along *along, lb_text *out);
lb_status lb_json_oscillate(const lb_system *system, const lb_diagnostics *diagnostics, const lb_oscillate *oscillate, lb_text *out);
/* The keys of check, steady and oscillate in one object. */
lb_status lb_json_page(const lb_system *system, const lb_diagnostics *diagnostics, const lb_oscillate *oscillate, lb_text *out);
/* Paths of the files written; those of the glue NULL where there is none. */
typedef struct lb_emit_paths {
    const char *header, *source, *glue_header, *glue_source, *example;
} lb_emit_paths;
lb_status lb_json_emit(const lb_network *network, const lb_diagnostics *diagnostics, const lb_emit_paths *paths, lb_text *out);
/* {"limbeck": ..., "command": ..., "file": ..., "error": {"code", "message", "remedy", "faults": [...]}} */
lb_status lb_json_error(const char *command, const char *file, const lb_error *error, const lb_diagnostics *diagnostics, lb_text *out);

#ifdef __cplusplus
}
#endif

#endif

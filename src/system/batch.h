/* Eight bindings and eight states at once: lanes, and the kernels that run over them. */
#ifndef LIMBECK_SYSTEM_BATCH_H
#define LIMBECK_SYSTEM_BATCH_H

#include "limbeck.h"
#include "system/table.h"

/* One number of each lane.  The compiler makes of an operation whatever the target has:
 * one instruction with AVX-512, two with AVX2, four with SSE2, eight without vectors. */
typedef double lanes __attribute__((vector_size(LB_LANES * sizeof(double))));

typedef void batch_kernel(lb_batch *batch);
typedef void batch_output_kernel(const lb_batch *batch, double *out);
typedef void batch_program_kernel(const program *p, const lanes *leaves, lanes *values);

/* The same code, compiled for one kind of processor. */
typedef struct batch_kernels {
    const char *target;             /* "avx512f", "avx2" or "generic" */
    batch_program_kernel *run;
    batch_kernel *rates;            /* into v, at x */
    batch_kernel *slopes;           /* into slot, at x */
    batch_output_kernel *rhs;       /* from v, to out [n*LB_LANES] */
    batch_output_kernel *jacobian;  /* from slot, to out [nonzeros*LB_LANES] */
} batch_kernels;

struct lb_batch {
    const lb_system *system;
    const table *table;
    const batch_kernels *kernels;
    void *memory;                   /* all that follows, aligned to a cache line within it */
    /* bound with the constants */
    lanes *k, *k_spare;             /* [m] */
    lanes *values, *spare;          /* [nodes] */
    lanes *factor;                  /* [steps] */
    lanes *coefficient;             /* [entries], or none when no coefficient is computed */
    double *row_coefficient;        /* [entries] state after state, the same in all lanes */
    double *term_coefficient;       /* [terms] */
    double *scratch;                /* [nodes] one lane, for messages */
    /* workspace */
    lanes *x;                       /* [n+1] the state and a one */
    lanes *v;                       /* [steps] */
    lanes *slot;                    /* [slots] */
};

/* What runs on this processor: the widest first; NULL after the last.  Index 0 is the best. */
const batch_kernels *batch_kernels_get(int index);

#endif

/* Kernels over eight lanes.
 *
 * Tables are those of the scalar engine, numbers are structures of arrays: one
 * index is looked up for eight products.  Each lane does what the scalar engine
 * does, operation for operation in the same order and without contraction, so
 * that results are the same bits.  The bodies are compiled once for each kind of
 * processor; which one runs is asked when a batch is made. */
#include "system/batch.h"

#include <math.h>

#define BODY static inline __attribute__((always_inline)) void

/* Lanes in a caller's array, which promises no alignment. */
typedef double loose_lanes __attribute__((vector_size(LB_LANES * sizeof(double)), aligned(8), may_alias));

/* ---- Programs ---------------------------------------------------------------- */

/* out[l] = function(a[l], b[l]): the mathematical library knows no lanes. */
#define EACH_LANE(out, call)                 \
    for (int l = 0; l < LB_LANES; l++)       \
        (out)[l] = (call)

BODY run_body(const program *p, const lanes *leaves, lanes *values)
{
    for (size_t i = 0; i < p->count; i++) {
        const instruction *code = &p->code[i];
        lanes *out = &values[code->out];
        const lanes *a = code->kind <= EXPRESSION_STATE ? &leaves[code->left] : &values[code->left];
        const lanes *b = code->right >= 0 ? &values[code->right] : a;
        switch (code->kind) {
        case EXPRESSION_NUMBER:
        case EXPRESSION_SQRT:      break; /* never in a program */
        case EXPRESSION_CONSTANT:
        case EXPRESSION_STATE:     *out = *a; break;
        case EXPRESSION_ADD:       *out = *a + *b; break;
        case EXPRESSION_SUBTRACT:  *out = *a - *b; break;
        case EXPRESSION_MULTIPLY:  *out = *a * *b; break;
        case EXPRESSION_DIVIDE:    *out = *a / *b; break;
        case EXPRESSION_NEGATE:    *out = -*a; break;
        case EXPRESSION_POWER:     EACH_LANE(*out, expression_power((*a)[l], (*b)[l])); break;
        case EXPRESSION_SLOPE:     EACH_LANE(*out, expression_slope((*a)[l], (*b)[l])); break;
        case EXPRESSION_POWER_LOG: EACH_LANE(*out, expression_power_log((*a)[l], (*b)[l])); break;
        case EXPRESSION_EXP:       EACH_LANE(*out, exp((*a)[l])); break;
        case EXPRESSION_LN:        EACH_LANE(*out, log((*a)[l])); break;
        case EXPRESSION_LOG10:     EACH_LANE(*out, log10((*a)[l])); break;
        }
    }
}

/* ---- Rates and their derivatives ------------------------------------------------ */

BODY follow_links(const table_chains *chains, const table_chain *chain, const lanes *x, lanes *product)
{
    for (size_t i = chain->first; i < chain->last; i++) {
        const table_link *link = &chains->link[i];
        const lanes *concentration = &x[link->state];
        lanes power;
        if (link->operation == LINK_PLAIN)
            power = *concentration;
        else if (link->operation == LINK_POWER)
            EACH_LANE(power, expression_power((*concentration)[l], link->order));
        else
            EACH_LANE(power, expression_slope((*concentration)[l], link->order));
        *product *= power;
    }
}

BODY rates_body(lb_batch *batch)
{
    const table *t = batch->table;
    const lanes *x = batch->x, *factor = batch->factor;
    lanes *v = batch->v;
    for (size_t i = 0; i < t->rate_count; i++) {
        const table_rate *rate = &t->rates[i];
        v[rate->step] = factor[rate->step] * x[rate->a] * x[rate->b] * x[rate->c];
    }
    for (size_t i = 0; i < t->rate_chains.count; i++) {
        const table_chain *chain = &t->rate_chains.chain[i];
        lanes product = factor[chain->step];
        follow_links(&t->rate_chains, chain, x, &product);
        v[chain->target] = product;
    }
    run_body(&t->rate_program, x, batch->values);
    for (size_t i = 0; i < t->rate_law_count; i++)
        v[t->rate_laws[i].target] = batch->values[t->rate_laws[i].node];
}

BODY slopes_body(lb_batch *batch)
{
    const table *t = batch->table;
    const lanes *x = batch->x, *factor = batch->factor;
    lanes *slot = batch->slot;
    for (size_t i = 0; i < t->slope_count; i++) {
        const table_slope *slope = &t->slopes[i];
        slot[slope->slot] = slope->multiplier * factor[slope->step] * x[slope->a] * x[slope->b];
    }
    for (size_t i = 0; i < t->slope_chains.count; i++) {
        const table_chain *chain = &t->slope_chains.chain[i];
        lanes product = chain->multiplier * factor[chain->step];
        follow_links(&t->slope_chains, chain, x, &product);
        slot[chain->target] = product;
    }
    run_body(&t->slope_program, x, batch->values);
    for (size_t i = 0; i < t->slope_law_count; i++)
        slot[t->slope_laws[i].target] = batch->values[t->slope_laws[i].node];
}

/* ---- Sums ------------------------------------------------------------------------ */

BODY rhs_body(const lb_batch *batch, double *out)
{
    const table *t = batch->table;
    const lanes *v = batch->v;
    for (int i = 0; i < t->n; i++) {
        lanes sum = {0};
        if (!batch->coefficient) {
            for (int e = t->row_start[i]; e < t->row_start[i + 1]; e++)
                sum += batch->row_coefficient[e] * v[t->row_step[e]];
        } else {
            for (int e = t->row_start[i]; e < t->row_start[i + 1]; e++)
                sum += batch->coefficient[t->row_entry[e]] * v[t->row_step[e]];
        }
        ((loose_lanes *)out)[i] = sum;
    }
}

BODY jacobian_body(const lb_batch *batch, double *out)
{
    const table *t = batch->table;
    const lanes *slot = batch->slot, zero = {0};
    for (int s = 0; s < t->single_terms; s++) {
        int z = t->nonzero_order[s];
        size_t i = t->term_start[z];
        if (!batch->coefficient)
            ((loose_lanes *)out)[z] = zero + batch->term_coefficient[i] * slot[t->term_slot[i]];
        else
            ((loose_lanes *)out)[z] = zero + batch->coefficient[t->term_entry[i]] * slot[t->term_slot[i]];
    }
    for (int s = t->single_terms; s < t->nonzeros; s++) {
        int z = t->nonzero_order[s];
        lanes sum = {0};
        if (!batch->coefficient) {
            for (size_t i = t->term_start[z]; i < t->term_start[z + 1]; i++)
                sum += batch->term_coefficient[i] * slot[t->term_slot[i]];
        } else {
            for (size_t i = t->term_start[z]; i < t->term_start[z + 1]; i++)
                sum += batch->coefficient[t->term_entry[i]] * slot[t->term_slot[i]];
        }
        ((loose_lanes *)out)[z] = sum;
    }
}

/* ---- For each kind of processor ------------------------------------------------------ */

#define KERNELS(suffix, attribute, name)                                                           \
    attribute static void run_##suffix(const program *p, const lanes *leaves, lanes *values)       \
    {                                                                                              \
        run_body(p, leaves, values);                                                               \
    }                                                                                              \
    attribute static void rates_##suffix(lb_batch *batch) { rates_body(batch); }                   \
    attribute static void slopes_##suffix(lb_batch *batch) { slopes_body(batch); }                 \
    attribute static void rhs_##suffix(const lb_batch *batch, double *out) { rhs_body(batch, out); } \
    attribute static void jacobian_##suffix(const lb_batch *batch, double *out)                    \
    {                                                                                              \
        jacobian_body(batch, out);                                                                 \
    }                                                                                              \
    static const batch_kernels kernels_##suffix = {name, run_##suffix, rates_##suffix, slopes_##suffix, \
                                                   rhs_##suffix, jacobian_##suffix};

KERNELS(generic, , "generic")

#if defined(__x86_64__)

KERNELS(avx2, __attribute__((target("avx2"))), "avx2")
KERNELS(avx512, __attribute__((target("avx512f"))), "avx512f")

const batch_kernels *batch_kernels_get(int index)
{
    const batch_kernels *list[3];
    int count = 0;
    if (__builtin_cpu_supports("avx512f"))
        list[count++] = &kernels_avx512;
    if (__builtin_cpu_supports("avx2"))
        list[count++] = &kernels_avx2;
    list[count++] = &kernels_generic;
    return index < count ? list[index] : NULL;
}

#else

const batch_kernels *batch_kernels_get(int index)
{
    return index == 0 ? &kernels_generic : NULL;
}

#endif

/* Eight at once: life, binding, and the calls that a sweep makes.
 *
 * Arrays hold the lanes of one quantity side by side (structure of arrays), here
 * and in the caller's arguments: number i of lane l stands at i*LB_LANES + l.  All
 * memory is one block. */
#include "system/batch.h"

#include <stdint.h>
#include <string.h>

#include "base/memory.h"
#include "base/status.h"
#include "system/evaluator.h"

enum { CACHE_LINE = 64 };

/* ---- Life ------------------------------------------------------------------------- */

void lb_batch_free(lb_batch *batch)
{
    if (!batch)
        return;
    memory_free(batch->memory);
    memory_free(batch);
}

typedef struct part {
    void *array;                /* address of the pointer to it */
    size_t count, size;
} part;

/* Parts one after another in one block, each on a cache line; zeroed.  False without memory. */
static bool allocate_parts(lb_batch *batch, const part *parts, size_t count)
{
    size_t total = CACHE_LINE;
    for (size_t i = 0; i < count; i++)
        total += (parts[i].count * parts[i].size + CACHE_LINE - 1) / CACHE_LINE * CACHE_LINE;
    batch->memory = memory_zeroed(total, 1);
    if (!batch->memory)
        return false;
    char *at = (char *)batch->memory + (CACHE_LINE - (uintptr_t)batch->memory % CACHE_LINE);
    for (size_t i = 0; i < count; i++) {
        memcpy(parts[i].array, &at, sizeof at);
        at += (parts[i].count * parts[i].size + CACHE_LINE - 1) / CACHE_LINE * CACHE_LINE;
    }
    return true;
}

static lb_batch *allocate(const lb_system *system)
{
    lb_batch *batch = memory_zeroed(1, sizeof *batch);
    if (!batch)
        return NULL;
    const table *t = system->table;
    batch->system = system;
    batch->table = t;
    batch->kernels = batch_kernels_get(0);
    size_t steps = (size_t)t->steps, entries = (size_t)t->entry_start[t->steps], m = (size_t)system->m;
    const part parts[] = {
        {&batch->k, m, sizeof(lanes)}, {&batch->k_spare, m, sizeof(lanes)},
        {&batch->values, t->graph.count, sizeof(lanes)}, {&batch->spare, t->graph.count, sizeof(lanes)},
        {&batch->factor, steps, sizeof(lanes)},
        {&batch->coefficient, t->has_varied_coefficient ? entries : 0, sizeof(lanes)},
        {&batch->row_coefficient, entries, sizeof(double)}, {&batch->term_coefficient, t->terms, sizeof(double)},
        {&batch->scratch, t->graph.count, sizeof(double)}, {&batch->x, (size_t)t->n + 1, sizeof(lanes)},
        {&batch->v, steps, sizeof(lanes)}, {&batch->slot, (size_t)t->slot_start[t->steps], sizeof(lanes)},
    };
    if (!allocate_parts(batch, parts, sizeof parts / sizeof *parts)) {
        lb_batch_free(batch);
        return NULL;
    }
    if (!t->has_varied_coefficient)
        batch->coefficient = NULL;
    return batch;
}

/* The same number in every lane. */
static void spread(lanes *out, double value)
{
    for (int l = 0; l < LB_LANES; l++)
        (*out)[l] = value;
}

/* What no binding changes. */
static void fill_fixed(lb_batch *batch)
{
    const table *t = batch->table;
    int entries = t->entry_start[t->steps];
    spread(&batch->x[t->n], 1);
    evaluator_fill_numbers(t, batch->scratch);
    for (size_t e = 0; e < t->graph.count; e++) {
        spread(&batch->values[e], batch->scratch[e]);
        spread(&batch->spare[e], batch->scratch[e]);
    }
    for (int i = 0; i < entries; i++)
        batch->row_coefficient[i] = t->entry_value[t->row_entry[i]];
    for (size_t i = 0; i < t->terms; i++)
        batch->term_coefficient[i] = t->entry_value[t->term_entry[i]];
    for (int e = 0; batch->coefficient && e < entries; e++)
        spread(&batch->coefficient[e], t->entry_value[e]);
}

lb_status lb_batch_new(const lb_system *system, lb_batch **out, lb_error *err)
{
    *out = NULL;
    lb_batch *batch = allocate(system);
    if (!batch)
        return status_no_memory(err);
    fill_fixed(batch);
    lb_status status = lb_batch_bind(batch, NULL, NULL, err);
    if (status != LB_OK) {
        lb_batch_free(batch);
        return status;
    }
    *out = batch;
    return LB_OK;
}

/* ---- Binding ------------------------------------------------------------------------ */

typedef int64_t lane_flags __attribute__((vector_size(LB_LANES * sizeof(int64_t))));

/* Bits of the lanes with a value out of bounds. */
static unsigned lanes_out_of_bounds(const lb_batch *batch)
{
    const table *t = batch->table;
    const lanes zero = {0};
    lane_flags bad = {0};
    for (size_t i = 0; i < t->check_count; i++) {
        const lanes *value = &batch->spare[t->checks[i].node];
        bad |= (lane_flags)(*value - *value != zero);   /* not finite */
        if (t->checks[i].bound == BOUND_POSITIVE)
            bad |= (lane_flags)(*value <= zero);
        else if (t->checks[i].bound == BOUND_NOT_NEGATIVE)
            bad |= (lane_flags)(*value < zero);
    }
    unsigned mask = 0;
    for (int l = 0; l < LB_LANES; l++)
        mask |= (unsigned)(bad[l] != 0) << l;
    return mask;
}

/* A refused lane keeps its constants; what is wrong with the first one is said. */
static lb_status refuse(lb_batch *batch, unsigned mask, lb_error *err)
{
    const table *t = batch->table;
    lb_status status = LB_OK;
    for (int l = 0; l < LB_LANES; l++) {
        if (!(mask >> l & 1))
            continue;
        for (size_t e = 0; e < t->graph.count && status == LB_OK; e++)
            batch->scratch[e] = batch->spare[e][l];
        if (status == LB_OK)
            status = evaluator_check(batch->system->network, t, batch->scratch, err);
        for (size_t e = 0; e < t->graph.count; e++)
            batch->spare[e][l] = batch->values[e][l];
        for (int j = 0; j < batch->system->m; j++)
            batch->k_spare[j][l] = batch->k[j][l];
    }
    return status;
}

static void bind_numbers(lb_batch *batch)
{
    const table *t = batch->table;
    for (int s = 0; s < t->steps; s++)
        if (t->factor_node[s] != EXPRESSION_NONE)
            batch->factor[s] = batch->values[t->factor_node[s]];
    for (int e = 0; batch->coefficient && e < t->entry_start[t->steps]; e++)
        if (t->entry_node[e] != EXPRESSION_NONE)
            batch->coefficient[e] = batch->values[t->entry_node[e]];
}

static void swap(lanes **a, lanes **b)
{
    lanes *old = *a;
    *a = *b;
    *b = old;
}

lb_status lb_batch_bind(lb_batch *batch, const double *k, unsigned *refused, lb_error *err)
{
    const lb_network *net = batch->system->network;
    if (k)
        memcpy(batch->k_spare, k, (size_t)batch->system->m * sizeof(lanes));
    for (int j = 0; !k && j < batch->system->m; j++)
        spread(&batch->k_spare[j], net->constants[j].value);
    batch->kernels->run(&batch->table->constant_program, batch->k_spare, batch->spare);
    unsigned mask = lanes_out_of_bounds(batch);
    lb_status status = mask ? refuse(batch, mask, err) : LB_OK;
    if (refused)
        *refused = mask;
    swap(&batch->k, &batch->k_spare);
    swap(&batch->values, &batch->spare);
    bind_numbers(batch);
    return status;
}

/* ---- Evaluation ----------------------------------------------------------------------- */

static void load_state(lb_batch *batch, const double *x)
{
    memcpy(batch->x, x, (size_t)batch->table->n * sizeof(lanes));
}

void lb_batch_initial(lb_batch *batch, double x[])
{
    const lb_network *net = batch->system->network;
    for (int i = 0; i < batch->table->n; i++)
        memcpy(x + (size_t)i * LB_LANES,
               &batch->values[batch->table->node_of[net->species[net->state_species[i]].initial]], sizeof(lanes));
}

void lb_batch_rates(lb_batch *batch, const double x[], double v[])
{
    load_state(batch, x);
    batch->kernels->rates(batch);
    memcpy(v, batch->v, (size_t)batch->system->r * sizeof(lanes));
}

void lb_batch_rhs(lb_batch *batch, const double x[], double dxdt[])
{
    load_state(batch, x);
    batch->kernels->rates(batch);
    batch->kernels->rhs(batch, dxdt);
}

void lb_batch_jacobian_sparse(lb_batch *batch, const double x[], double values[])
{
    load_state(batch, x);
    batch->kernels->slopes(batch);
    batch->kernels->jacobian(batch, values);
}

/* Sparse elimination over the integers, or modulo a prime.
 *
 * Equations come one after the other.  Each is reduced by the rows before it, the
 * earliest first: a row holds no pivot of an earlier row, so a pivot that has been
 * eliminated never returns.  Rows stay whole and primitive (their content is
 * divided out), so that entries of stoichiometric matrices stay small; FLINT's
 * integers hold them whatever they become.  Pivots are taken where the caller
 * prefers, units first, in the spirit of Markowitz, Manag. Sci. 3 (1957) 255.
 * Modulo 2^31 - 1 every product fits FLINT's small integers, and rows are monic. */
#include "exact/elimination.h"

#include <string.h>

#include "base/memory.h"

lb_status elimination_init(elimination *e, int width, const int *preference, bool is_modular)
{
    *e = (elimination){.width = width, .preference = preference, .work_left = ELIMINATION_WORK,
                       .is_modular = is_modular};
    fmpz_init_set_ui(e->prime, ELIMINATION_PRIME);
    size_t n = (size_t)width;
    e->row_of = memory_array(n, sizeof *e->row_of);
    e->work = memory_zeroed(n, sizeof *e->work);    /* the zero of FLINT is all bits zero */
    e->is_listed = memory_zeroed(n, sizeof *e->is_listed);
    e->list = memory_array(n, sizeof *e->list);
    e->heap = memory_array(n, sizeof *e->heap);
    if (!e->row_of || !e->work || !e->is_listed || !e->list || !e->heap) {
        elimination_clear(e);
        return LB_E_NOMEM;
    }
    for (size_t j = 0; j < n; j++)
        e->row_of[j] = -1;
    return LB_OK;
}

static void clear_row(elimination_row *row)
{
    for (int i = 0; row->value && i < row->count; i++)
        fmpz_clear(&row->value[i]);
    for (int i = 0; row->solved_value && i < row->solved_count; i++)
        fmpq_clear(&row->solved_value[i]);
    fmpz_clear(row->pivot_value);
    memory_free(row->column);
    memory_free(row->value);
    memory_free(row->solved_column);
    memory_free(row->solved_value);
}

void elimination_clear(elimination *e)
{
    for (size_t i = 0; i < e->rank; i++)
        clear_row(&e->row[i]);
    for (int j = 0; e->work && j < e->width; j++)
        fmpz_clear(&e->work[j]);
    memory_free(e->row);
    memory_free(e->row_of);
    memory_free(e->work);
    memory_free(e->is_listed);
    memory_free(e->list);
    memory_free(e->heap);
    *e = (elimination){0};
}

/* ---- Reduction -------------------------------------------------------------------- */

static void heap_push(int *heap, int *count, int value)
{
    int at = (*count)++;
    while (at > 0 && heap[(at - 1) / 2] > value) {
        heap[at] = heap[(at - 1) / 2];
        at = (at - 1) / 2;
    }
    heap[at] = value;
}

static int heap_pop(int *heap, int *count)
{
    int top = heap[0], value = heap[--(*count)], at = 0;
    for (;;) {
        int child = 2 * at + 1;
        if (child >= *count)
            break;
        if (child + 1 < *count && heap[child + 1] < heap[child])
            child++;
        if (heap[child] >= value)
            break;
        heap[at] = heap[child];
        at = child;
    }
    heap[at] = value;
    return top;
}

/* A column comes into use; if it is a pivot, its row is due. */
static void list_column(elimination *e, int column, int *listed, int *due)
{
    if (e->is_listed[column])
        return;
    e->is_listed[column] = true;
    e->list[(*listed)++] = column;
    if (e->row_of[column] >= 0)
        heap_push(e->heap, due, e->row_of[column]);
}

static void reduce_residue(const elimination *e, fmpz *value)
{
    if (e->is_modular)
        fmpz_mod(value, value, e->prime);
}

/* a - b*c modulo the prime.  FLINT stores an integer below 2^62 as itself, so residues are
 * plain words. */
static fmpz residue_submul(fmpz a, fmpz b, fmpz c)
{
    return (fmpz)(((uint64_t)a + (uint64_t)b * (ELIMINATION_PRIME - (uint64_t)c)) % ELIMINATION_PRIME);
}

/* work := (p/g) work - (c/g) row, where c is work's entry at the row's pivot, p the row's, g their gcd. */
static void reduce_by(elimination *e, const elimination_row *row, int *listed, int *due)
{
    fmpz_t common, own, other;
    fmpz_init(common);
    fmpz_init(own);
    fmpz_init(other);
    fmpz_gcd(common, row->pivot_value, &e->work[row->pivot]);
    fmpz_divexact(own, row->pivot_value, common);
    fmpz_divexact(other, &e->work[row->pivot], common);
    for (int i = 0; i < row->count; i++)
        list_column(e, row->column[i], listed, due);
    e->work_left -= row->count;
    if (!fmpz_is_one(own)) {
        e->work_left -= *listed;
        for (int i = 0; i < *listed; i++)
            fmpz_mul(&e->work[e->list[i]], &e->work[e->list[i]], own);
    }
    for (int i = 0; i < row->count; i++) {
        fmpz *to = &e->work[row->column[i]];
        if (e->is_modular)
            *to = residue_submul(*to, row->value[i], *other);
        else
            fmpz_submul(to, &row->value[i], other);
    }
    fmpz_zero(&e->work[row->pivot]);
    fmpz_clear(common);
    fmpz_clear(own);
    fmpz_clear(other);
}

/* The best pivot of the reduced equation, or -1. */
static int choose_pivot(const elimination *e, int listed)
{
    int best = -1;
    bool best_is_unit = false;
    for (int i = 0; i < listed; i++) {
        int j = e->list[i];
        if (fmpz_is_zero(&e->work[j]) || e->preference[j] == ELIMINATION_NEVER)
            continue;
        bool is_unit = e->is_modular || fmpz_is_pm1(&e->work[j]);
        bool is_better = best < 0 || is_unit > best_is_unit ||
                         (is_unit == best_is_unit &&
                          (e->preference[j] < e->preference[best] ||
                           (e->preference[j] == e->preference[best] && j < best)));
        if (is_better) {
            best = j;
            best_is_unit = is_unit;
        }
    }
    return best;
}

/* Divides the equation in use by its content, with the sign that makes the pivot positive: a
 * row of units then never needs to be multiplied. */
static void make_primitive(elimination *e, int pivot, int listed)
{
    fmpz_t content;
    fmpz_init(content);
    for (int i = 0; i < listed && !fmpz_is_one(content); i++)
        fmpz_gcd(content, content, &e->work[e->list[i]]);
    if (fmpz_sgn(&e->work[pivot]) < 0)
        fmpz_neg(content, content);
    for (int i = 0; i < listed && !fmpz_is_one(content); i++)
        fmpz_divexact(&e->work[e->list[i]], &e->work[e->list[i]], content);
    fmpz_clear(content);
}

/* Divides the equation in use by its pivot, modulo the prime. */
static void make_monic(elimination *e, int pivot, int listed)
{
    fmpz_t inverse;
    fmpz_init(inverse);
    fmpz_invmod(inverse, &e->work[pivot], e->prime);
    for (int i = 0; i < listed && !fmpz_is_one(inverse); i++) {
        fmpz_mul(&e->work[e->list[i]], &e->work[e->list[i]], inverse);
        reduce_residue(e, &e->work[e->list[i]]);
    }
    fmpz_clear(inverse);
}

static lb_status store_row(elimination *e, int pivot, int listed)
{
    if (memory_grow(&e->row, &e->capacity, e->rank, sizeof *e->row) != 0)
        return LB_E_NOMEM;
    elimination_row row = {.pivot = pivot};
    int count = 0;
    for (int i = 0; i < listed; i++)
        count += !fmpz_is_zero(&e->work[e->list[i]]);
    row.column = memory_array((size_t)count, sizeof *row.column);
    row.value = memory_zeroed((size_t)count, sizeof *row.value);
    if (!row.column || !row.value) {
        memory_free(row.column);
        memory_free(row.value);
        return LB_E_NOMEM;
    }
    fmpz_init_set(row.pivot_value, &e->work[pivot]);
    for (int i = 0; i < listed; i++) {
        int j = e->list[i];
        if (j == pivot || fmpz_is_zero(&e->work[j]))
            continue;
        row.column[row.count] = j;
        fmpz_set(&row.value[row.count++], &e->work[j]);
    }
    e->row[e->rank] = row;
    e->row_of[pivot] = (int)e->rank++;
    return LB_OK;
}

lb_status elimination_add(elimination *e, const int *column, const fmpz *value, int count, bool *is_new)
{
    int listed = 0, due = 0;
    for (int i = 0; i < count; i++) {
        list_column(e, column[i], &listed, &due);
        fmpz_set(&e->work[column[i]], &value[i]);
        reduce_residue(e, &e->work[column[i]]);
    }
    while (due > 0 && e->work_left > 0) {
        const elimination_row *row = &e->row[heap_pop(e->heap, &due)];
        if (!fmpz_is_zero(&e->work[row->pivot]))
            reduce_by(e, row, &listed, &due);
    }
    lb_status status = e->work_left > 0 ? LB_OK : LB_E_LIMIT;
    int pivot = status == LB_OK ? choose_pivot(e, listed) : -1;
    if (pivot >= 0) {
        if (e->is_modular)
            make_monic(e, pivot, listed);
        else
            make_primitive(e, pivot, listed);
        status = store_row(e, pivot, listed);
    }
    e->work_left -= listed;
    for (int i = 0; i < listed; i++) {
        fmpz_zero(&e->work[e->list[i]]);
        e->is_listed[e->list[i]] = false;
    }
    if (is_new)
        *is_new = pivot >= 0;
    return status;
}

/* ---- Solved form ------------------------------------------------------------------- */

/* sum[column] += factor * value, in a scattered vector with its list of columns. */
static void scatter(elimination *e, fmpq *sum, int column, const fmpz *factor, const fmpq *value, int *listed)
{
    fmpq_t part;
    fmpq_init(part);
    fmpq_mul_fmpz(part, value, factor);
    fmpq_add(&sum[column], &sum[column], part);
    reduce_residue(e, fmpq_numref(&sum[column]));
    fmpq_clear(part);
    if (!e->is_listed[column]) {
        e->is_listed[column] = true;
        e->list[(*listed)++] = column;
    }
}

/* Moves the scattered sum, divided by minus the pivot, into the row. */
static lb_status store_solved(elimination *e, elimination_row *row, fmpq *sum, int listed)
{
    lb_status status = LB_OK;
    row->solved_column = memory_array((size_t)listed, sizeof *row->solved_column);
    row->solved_value = memory_array((size_t)listed, sizeof *row->solved_value);
    if (!row->solved_column || !row->solved_value)
        status = LB_E_NOMEM;
    for (int i = 0; i < listed; i++) {
        int j = e->list[i];
        if (status == LB_OK && !fmpq_is_zero(&sum[j])) {
            fmpq *value = &row->solved_value[row->solved_count];
            fmpq_init(value);
            fmpq_div_fmpz(value, &sum[j], row->pivot_value);
            fmpq_neg(value, value);
            reduce_residue(e, fmpq_numref(value));
            row->solved_column[row->solved_count++] = j;
        }
        fmpq_zero(&sum[j]);
        e->is_listed[j] = false;
    }
    return status;
}

lb_status elimination_solve(elimination *e, size_t limit)
{
    fmpq *sum = memory_array((size_t)e->width, sizeof *sum);
    if (!sum)
        return LB_E_NOMEM;
    for (int j = 0; j < e->width; j++)
        fmpq_init(&sum[j]);
    fmpq_t one;
    fmpq_init(one);
    fmpq_one(one);
    lb_status status = LB_OK;
    size_t entries = 0;
    /* The last row has no pivots but its own; each earlier one only those of later rows. */
    for (size_t r = e->rank; r-- > 0 && status == LB_OK;) {
        elimination_row *row = &e->row[r];
        int listed = 0;
        for (int i = 0; i < row->count; i++) {
            int pivot_row = e->row_of[row->column[i]];
            if (pivot_row < 0) {
                scatter(e, sum, row->column[i], &row->value[i], one, &listed);
                continue;
            }
            const elimination_row *later = &e->row[pivot_row];
            for (int k = 0; k < later->solved_count; k++)
                scatter(e, sum, later->solved_column[k], &row->value[i], &later->solved_value[k], &listed);
        }
        status = store_solved(e, row, sum, listed);
        entries += (size_t)row->solved_count;
        if (status == LB_OK && entries > limit)
            status = LB_E_LIMIT;
    }
    for (int j = 0; j < e->width; j++)
        fmpq_clear(&sum[j]);
    fmpq_clear(one);
    memory_free(sum);
    return status;
}

bool elimination_lift(elimination *e)
{
    fmpz_t residue;
    fmpz_init(residue);
    bool ok = true;
    for (size_t r = 0; r < e->rank && ok; r++) {
        elimination_row *row = &e->row[r];
        for (int k = 0; k < row->solved_count && ok; k++) {
            fmpz_set(residue, fmpq_numref(&row->solved_value[k]));
            ok = fmpq_reconstruct_fmpz(&row->solved_value[k], residue, e->prime) != 0;
        }
    }
    fmpz_clear(residue);
    return ok;
}

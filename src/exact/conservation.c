/* Conservation laws in exact integers.
 *
 * The left kernel of the stoichiometric matrix by sparse elimination (one basis
 * vector for each free species), then the extreme rays of its non-negative part,
 * then a basis: independent rays of least support first, as a greedy choice over
 * a matroid, completed by vectors of the kernel's basis (cf. Schuster and Hoefer,
 * J. Chem. Soc. Faraday Trans. 87 (1991) 2561). */
#include "exact/conservation.h"

#include <stdlib.h>
#include <string.h>

#include "base/memory.h"
#include "base/status.h"
#include "exact/balance.h"
#include "exact/cone.h"
#include "exact/elimination.h"

void conservation_clear(conservation *laws)
{
    memory_free(laws->law);
    *laws = (conservation){0};
}

lb_status conservation_copy(const conservation *laws, conservation *out)
{
    *out = *laws;
    size_t entries = (size_t)laws->count * (size_t)laws->width;
    out->law = memory_array(entries, sizeof *out->law);
    if (!out->law) {
        *out = (conservation){0};
        return LB_E_NOMEM;
    }
    if (entries > 0)
        memcpy(out->law, laws->law, entries * sizeof *out->law);
    return LB_OK;
}

/* ---- The kernel ----------------------------------------------------------------- */

typedef struct ranked {
    size_t key, index;
} ranked;

static int by_key(const void *a, const void *b)
{
    const ranked *left = a, *right = b;
    if (left->key != right->key)
        return left->key < right->key ? -1 : 1;
    return (left->index > right->index) - (left->index < right->index);
}

/* Short equations first: they keep the rows sparse. */
static lb_status eliminate_balance(elimination *e, const balance *b)
{
    ranked *order = memory_array(b->count, sizeof *order);
    if (!order)
        return LB_E_NOMEM;
    for (size_t i = 0; i < b->count; i++)
        order[i] = (ranked){b->start[i + 1] - b->start[i], i};
    if (b->count > 0)
        qsort(order, b->count, sizeof *order, by_key);
    lb_status status = LB_OK;
    for (size_t i = 0; i < b->count && status == LB_OK; i++) {
        size_t first = b->start[order[i].index];
        status = elimination_add(e, b->column + first, b->value + first, (int)order[i].key, NULL);
    }
    memory_free(order);
    return status;
}

static bool to_int64(const fmpz *value, int64_t *out)
{
    if (!fmpz_fits_si(value))
        return false;
    *out = fmpz_get_si(value);
    return *out != INT64_MIN;
}

/* Multiplies vector i by the least common denominator of what the solved rows put into it. */
static void common_denominators(const elimination *e, const int *number_of, fmpz *scale)
{
    for (size_t r = 0; r < e->rank; r++) {
        const elimination_row *row = &e->row[r];
        for (int k = 0; k < row->solved_count; k++) {
            fmpz *own = &scale[number_of[row->solved_column[k]]];
            fmpz_lcm(own, own, fmpq_denref(&row->solved_value[k]));
        }
    }
}

static bool fill_kernel(const elimination *e, const int *number_of, const int *free_column, const fmpz *scale,
                        int nullity, int64_t *kernel)
{
    size_t width = (size_t)e->width;
    bool fits = true;
    for (int i = 0; i < nullity && fits; i++)
        fits = to_int64(&scale[i], &kernel[(size_t)i * width + (size_t)free_column[i]]);
    fmpz_t value;
    fmpz_init(value);
    for (size_t r = 0; r < e->rank && fits; r++) {
        const elimination_row *row = &e->row[r];
        for (int k = 0; k < row->solved_count && fits; k++) {
            int i = number_of[row->solved_column[k]];
            fmpz_divexact(value, &scale[i], fmpq_denref(&row->solved_value[k]));
            fmpz_mul(value, value, fmpq_numref(&row->solved_value[k]));
            fits = to_int64(value, &kernel[(size_t)i * width + (size_t)row->pivot]);
        }
    }
    fmpz_clear(value);
    return fits;
}

/* The kernel of what was eliminated: nullity vectors, one for each free column. */
static lb_status find_kernel(const elimination *e, int nullity, int *free_column, int64_t **kernel)
{
    lb_status status = LB_E_NOMEM;
    int *number_of = memory_array((size_t)e->width, sizeof *number_of);
    fmpz *scale = memory_zeroed((size_t)nullity, sizeof *scale);
    *kernel = memory_zeroed((size_t)nullity * (size_t)e->width, sizeof **kernel);
    if (!number_of || !scale || !*kernel)
        goto done;
    for (int j = 0, i = 0; j < e->width; j++) {
        if (e->row_of[j] >= 0)
            continue;
        number_of[j] = i;
        fmpz_one(&scale[i]);
        free_column[i++] = j;
    }
    common_denominators(e, number_of, scale);
    status = fill_kernel(e, number_of, free_column, scale, nullity, *kernel) ? LB_OK : LB_E_LIMIT;
    for (int i = 0; i < nullity; i++)
        cone_make_primitive(*kernel + (size_t)i * (size_t)e->width, e->width);
done:
    for (int i = 0; scale && i < nullity; i++)
        fmpz_clear(&scale[i]);
    memory_free(scale);
    memory_free(number_of);
    if (status != LB_OK) {
        memory_free(*kernel);
        *kernel = NULL;
    }
    return status;
}

/* ---- Choosing a basis -------------------------------------------------------------- */

/* Candidates for the basis: rays, then vectors of the kernel, and who was chosen. */
typedef struct choice {
    int width, nullity;
    const int *free_column;
    elimination chosen;         /* their entries at the free columns, which tell a vector of the kernel */
    int *preference;            /* [nullity] */
    fmpz *values;               /* [nullity] */
    int *columns;               /* [nullity] */
} choice;

static void choice_clear(choice *c)
{
    elimination_clear(&c->chosen);
    memory_free(c->preference);
    memory_free(c->values);
    memory_free(c->columns);
}

static lb_status choice_init(choice *c, int width, int nullity, const int *free_column)
{
    *c = (choice){.width = width, .nullity = nullity, .free_column = free_column};
    c->preference = memory_zeroed((size_t)nullity, sizeof *c->preference);
    c->values = memory_zeroed((size_t)nullity, sizeof *c->values);
    c->columns = memory_array((size_t)nullity, sizeof *c->columns);
    if (!c->preference || !c->values || !c->columns)
        return LB_E_NOMEM;
    return elimination_init(&c->chosen, nullity, c->preference, false);
}

static lb_status is_independent(choice *c, const int64_t *vector, bool *result)
{
    int count = 0;
    for (int i = 0; i < c->nullity; i++) {
        if (vector[c->free_column[i]] == 0)
            continue;
        c->columns[count] = i;
        fmpz_set_si(&c->values[count++], vector[c->free_column[i]]);
    }
    lb_status status = elimination_add(&c->chosen, c->columns, c->values, count, result);
    for (int i = 0; i < count; i++)
        fmpz_zero(&c->values[i]);
    return status;
}

static size_t support(const int64_t *vector, int width)
{
    size_t count = 0;
    for (int j = 0; j < width; j++)
        count += vector[j] != 0;
    return count;
}

static size_t first_species(const int64_t *vector, int width)
{
    size_t j = 0;
    while (j < (size_t)width && vector[j] == 0)
        j++;
    return j;
}

static bool is_non_negative(const int64_t *vector, int width)
{
    for (int j = 0; j < width; j++)
        if (vector[j] < 0)
            return false;
    return true;
}

/* Takes the independent ones of `vectors`, those of least support first, until the basis is
 * full: their indices to taken, the rest (when asked) to left. */
static lb_status take(choice *c, const int64_t *vectors, size_t count, size_t *taken, size_t *taken_count,
                      size_t *left, size_t *left_count)
{
    ranked *order = memory_array(count, sizeof *order);
    if (!order)
        return LB_E_NOMEM;
    size_t width = (size_t)c->width;
    for (size_t i = 0; i < count; i++)
        order[i] = (ranked){support(vectors + i * width, c->width), i};
    if (count > 0)
        qsort(order, count, sizeof *order, by_key);
    lb_status status = LB_OK;
    for (size_t i = 0; i < count && status == LB_OK; i++) {
        bool is_new = false;
        if (c->chosen.rank < (size_t)c->nullity)
            status = is_independent(c, vectors + order[i].index * width, &is_new);
        if (is_new)
            taken[(*taken_count)++] = order[i].index;
        else if (left)
            left[(*left_count)++] = order[i].index;
    }
    memory_free(order);
    return status;
}

/* ---- Putting laws together ------------------------------------------------------------ */

/* Appends the vectors by their first species; signed ones get a positive first entry. */
static lb_status append(conservation *out, const int64_t *vectors, const size_t *index, size_t count)
{
    size_t width = (size_t)out->width;
    ranked *order = memory_array(count, sizeof *order);
    if (!order)
        return LB_E_NOMEM;
    for (size_t i = 0; i < count; i++)
        order[i] = (ranked){first_species(vectors + index[i] * width, out->width), index[i]};
    if (count > 0)
        qsort(order, count, sizeof *order, by_key);
    for (size_t i = 0; i < count; i++) {
        const int64_t *from = vectors + order[i].index * width;
        int64_t *to = out->law + (size_t)out->count++ * width;
        bool turn = order[i].key < width && from[order[i].key] < 0;
        for (size_t j = 0; j < width; j++)
            to[j] = turn ? -from[j] : from[j];
    }
    memory_free(order);
    return LB_OK;
}

/* How many of the first `basis` rows are non-negative, those before the first that is not. */
static int leading_non_negative(const conservation *laws)
{
    int count = 0;
    while (count < laws->basis && is_non_negative(laws->law + (size_t)count * (size_t)laws->width, laws->width))
        count++;
    return count;
}

/* Indices of those kernel vectors that are (or are not) non-negative. */
static size_t split_by_sign(const int64_t *vectors, int width, const size_t *index, size_t count, bool wanted,
                            size_t *out)
{
    size_t found = 0;
    for (size_t i = 0; i < count; i++)
        if (is_non_negative(vectors + index[i] * (size_t)width, width) == wanted)
            out[found++] = index[i];
    return found;
}

/* rays (may be none) and the kernel's basis -> laws. */
static lb_status assemble(conservation *out, const cone *rays, const int64_t *kernel, int nullity,
                          const int *free_column)
{
    lb_status status = LB_E_NOMEM;
    size_t taken_count = 0, left_count = 0, signed_count = 0, part_count;
    size_t most = rays->count + (size_t)nullity;
    size_t *taken = memory_array(most, sizeof *taken), *left = memory_array(most, sizeof *left);
    size_t *completing = memory_array((size_t)nullity, sizeof *completing);
    size_t *part = memory_array((size_t)nullity, sizeof *part);
    out->law = memory_array(most * (size_t)out->width, sizeof *out->law);
    choice c;
    status = choice_init(&c, out->width, nullity, free_column);
    if (!taken || !left || !completing || !part || !out->law)
        status = LB_E_NOMEM;
    if (status == LB_OK)
        status = take(&c, rays->ray, rays->count, taken, &taken_count, left, &left_count);
    if (status == LB_OK)
        status = take(&c, kernel, (size_t)nullity, completing, &signed_count, NULL, NULL);
    if (status == LB_OK)
        status = append(out, rays->ray, taken, taken_count);
    for (int wanted = 1; wanted >= 0 && status == LB_OK; wanted--) {
        part_count = split_by_sign(kernel, out->width, completing, signed_count, wanted, part);
        status = append(out, kernel, part, part_count);
    }
    out->basis = out->count;
    if (status == LB_OK)
        status = append(out, rays->ray, left, left_count);
    out->semipositive = leading_non_negative(out);
    choice_clear(&c);
    memory_free(taken);
    memory_free(left);
    memory_free(completing);
    memory_free(part);
    return status;
}

/* Do all vectors of the kernel obey all equations? */
static bool obeys(const balance *b, const int64_t *kernel, int nullity, int width)
{
    bool ok = true;
    fmpz_t sum;
    fmpz_init(sum);
    for (int v = 0; v < nullity && ok; v++) {
        const int64_t *vector = kernel + (size_t)v * (size_t)width;
        for (size_t i = 0; i < b->count && ok; i++) {
            fmpz_zero(sum);
            for (size_t at = b->start[i]; at < b->start[i + 1]; at++)
                if (vector[b->column[at]] != 0)
                    fmpz_addmul_si(sum, &b->value[at], vector[b->column[at]]);
            ok = fmpz_is_zero(sum);
        }
    }
    fmpz_clear(sum);
    return ok;
}

/* The kernel of the balance, one vector for each free column (the caller's arrays).  Modulo a
 * prime first: a kernel there has at least the dimension of the true one, so when all its
 * lifted vectors obey the equations over the integers, they span the true one.  *is_lifted is
 * false when they do not: then only exact elimination can tell. */
static lb_status kernel_of_balance(const balance *b, int width, const int *preference, bool is_modular,
                                   int *nullity, int **free_column, int64_t **kernel, bool *is_lifted)
{
    elimination e;
    lb_status status = elimination_init(&e, width, preference, is_modular);
    *free_column = NULL;
    *kernel = NULL;
    *is_lifted = true;
    if (status == LB_OK)
        status = eliminate_balance(&e, b);
    *nullity = width - (int)e.rank;
    if (status == LB_OK && (size_t)*nullity * (size_t)width > CONSERVATION_LIMIT)
        status = LB_E_LIMIT;
    if (status == LB_OK)
        status = elimination_solve(&e, CONSERVATION_LIMIT);
    if (status == LB_OK && is_modular)
        *is_lifted = elimination_lift(&e);
    if (status == LB_OK && *is_lifted) {
        *free_column = memory_array((size_t)*nullity, sizeof **free_column);
        status = *free_column ? find_kernel(&e, *nullity, *free_column, kernel) : LB_E_NOMEM;
    }
    if (status == LB_OK && *is_lifted && is_modular)
        *is_lifted = obeys(b, *kernel, *nullity, width);
    elimination_clear(&e);
    return status;
}

static lb_status laws_of_balance(const balance *b, const int *preference, conservation *out)
{
    int nullity;
    int *free_column;
    int64_t *kernel;
    cone rays = {0};
    bool is_lifted;
    lb_status status = kernel_of_balance(b, out->width, preference, true, &nullity, &free_column, &kernel,
                                         &is_lifted);
    if (status == LB_OK && !is_lifted) {
        memory_free(free_column);
        memory_free(kernel);
        status = kernel_of_balance(b, out->width, preference, false, &nullity, &free_column, &kernel, &is_lifted);
    }
    out->is_complete = true;
    if (status == LB_OK && nullity > 0)
        status = cone_find(kernel, nullity, out->width, free_column, &rays, &out->is_complete);
    if (status == LB_OK && nullity > 0)
        status = assemble(out, &rays, kernel, nullity, free_column);
    cone_clear(&rays);
    memory_free(kernel);
    memory_free(free_column);
    return status;
}

lb_status conservation_report(lb_error *err, lb_status status)
{
    if (status == LB_E_LIMIT)
        return status_raise(err, status, NULL,
                            "the conservation laws of this network are beyond what is supported");
    return status == LB_OK ? LB_OK : status_no_memory(err);
}

/* How many equations a species is in: one in few makes a sparse elimination. */
static lb_status count_equations(const balance *b, int width, int **preference)
{
    *preference = memory_zeroed((size_t)width, sizeof **preference);
    if (!*preference)
        return LB_E_NOMEM;
    for (size_t i = 0; i < b->start[b->count]; i++)
        (*preference)[b->column[i]]++;
    return LB_OK;
}

lb_status conservation_find(const lb_network *net, const int *state, int width, const bool *use,
                            conservation *out, lb_error *err)
{
    *out = (conservation){.width = width};
    balance b = {0};
    int *preference = NULL;
    int *column_of = memory_array((size_t)net->states, sizeof *column_of);
    lb_status status = column_of ? LB_OK : LB_E_NOMEM;
    for (int i = 0; column_of && i < net->states; i++)
        column_of[i] = -1;
    for (int j = 0; column_of && j < width; j++)
        column_of[state[j]] = j;
    if (status == LB_OK)
        status = balance_collect(net, column_of, use, &b);
    if (status == LB_OK)
        status = count_equations(&b, width, &preference);
    if (status == LB_OK)
        status = laws_of_balance(&b, preference, out);
    balance_clear(&b);
    memory_free(preference);
    memory_free(column_of);
    if (status != LB_OK)
        conservation_clear(out);
    return conservation_report(err, status);
}

/* Extreme rays of the non-negative part of a subspace, by double description.
 *
 * The vectors of the basis are the rays of the cone where only their own columns
 * are required to be non-negative.  One column with negative entries after the
 * other is made non-negative: rays with a negative entry go, and each pair of
 * adjacent rays of opposite sign gives the ray between them (Motzkin, Raiffa,
 * Thompson and Thrall 1953; Fukuda and Prodon, Lect. Notes Comput. Sci. 1120
 * (1996) 91).  Two rays are adjacent when no third one is zero wherever both are.
 * The column with the fewest pairs goes first.  The result are the vectors of
 * minimal support that Farkas' elimination gives, without its redundant ones.
 *
 * The search gives up, and says so, beyond RAY_LIMIT rays or WORK_LIMIT word
 * operations, since cones of large networks can have very many rays. */
#include "exact/cone.h"

#include <limits.h>
#include <string.h>

#include "base/memory.h"

enum { RAY_LIMIT = 4096, WORD = 64 };
#define WORK_LIMIT UINT64_C(300000000)
#define CELL_LIMIT ((size_t)1 << 24)

void cone_clear(cone *c)
{
    memory_free(c->ray);
    *c = (cone){0};
}

void cone_make_primitive(int64_t *vector, int width)
{
    uint64_t content = 0;
    for (int j = 0; j < width && content != 1; j++) {
        uint64_t a = content, b = vector[j] < 0 ? 0 - (uint64_t)vector[j] : (uint64_t)vector[j];
        while (b != 0) {
            uint64_t rest = a % b;
            a = b, b = rest;
        }
        content = a;
    }
    if (content > 1 && content <= INT64_MAX)
        for (int j = 0; j < width; j++)
            vector[j] /= (int64_t)content;
}

typedef struct description {
    cone rays;
    int dimension, words;
    uint64_t *zero;             /* [count*words] columns where a ray is zero */
    size_t zero_capacity;
    uint64_t *settled;          /* [words] columns where no ray is negative */
    uint64_t work;
    bool gave_up;
} description;

static int64_t *ray_at(const description *d, size_t i)
{
    return d->rays.ray + i * (size_t)d->rays.width;
}

static uint64_t *zeros_at(const description *d, size_t i)
{
    return d->zero + i * (size_t)d->words;
}

/* Room for one more ray; it is not counted yet. */
static lb_status reserve(description *d)
{
    if (d->rays.count >= RAY_LIMIT || (d->rays.count + 1) * (size_t)d->rays.width > CELL_LIMIT) {
        d->gave_up = true;
        return LB_OK;
    }
    size_t capacity = d->rays.capacity;
    if (memory_grow(&d->rays.ray, &d->rays.capacity, d->rays.count, (size_t)d->rays.width * sizeof(int64_t)) != 0)
        return LB_E_NOMEM;
    if (d->zero && capacity == d->rays.capacity)
        return LB_OK;
    uint64_t *grown = memory_resize(d->zero, d->rays.capacity, (size_t)d->words * sizeof *grown);
    if (!grown)
        return LB_E_NOMEM;
    d->zero = grown;
    return LB_OK;
}

static void note_zeros(description *d, size_t i)
{
    const int64_t *ray = ray_at(d, i);
    uint64_t *zeros = zeros_at(d, i);
    memset(zeros, 0, (size_t)d->words * sizeof *zeros);
    for (int j = 0; j < d->rays.width; j++)
        if (ray[j] == 0)
            zeros[j / WORD] |= UINT64_C(1) << j % WORD;
}

static lb_status start(description *d, const int64_t *basis, int dimension, int width)
{
    *d = (description){.dimension = dimension, .words = (width + WORD - 1) / WORD};
    d->rays.width = width;
    d->settled = memory_zeroed((size_t)d->words, sizeof *d->settled);
    if (!d->settled)
        return LB_E_NOMEM;
    for (int i = 0; i < dimension && !d->gave_up; i++) {
        if (reserve(d) != LB_OK)
            return LB_E_NOMEM;
        if (d->gave_up)
            break;
        memcpy(ray_at(d, d->rays.count), basis + (size_t)i * (size_t)width, (size_t)width * sizeof *basis);
        note_zeros(d, d->rays.count++);
    }
    return LB_OK;
}

/* The column with the fewest pairs of opposite sign, or -1 when none has a negative entry;
 * settles the others. */
static int next_column(description *d, int *positive, int *negative)
{
    int width = d->rays.width;
    memset(positive, 0, (size_t)width * sizeof *positive);
    memset(negative, 0, (size_t)width * sizeof *negative);
    for (size_t i = 0; i < d->rays.count; i++) {
        const int64_t *ray = ray_at(d, i);
        for (int j = 0; j < width; j++) {
            positive[j] += ray[j] > 0;
            negative[j] += ray[j] < 0;
        }
    }
    d->work += d->rays.count * (uint64_t)width;
    int best = -1;
    int64_t fewest = 0;
    for (int j = 0; j < width; j++) {
        if (negative[j] == 0) {
            d->settled[j / WORD] |= UINT64_C(1) << j % WORD;
            continue;
        }
        int64_t pairs = (int64_t)positive[j] * negative[j];
        if (best < 0 || pairs < fewest) {
            best = j;
            fewest = pairs;
        }
    }
    return best;
}

static bool are_adjacent(description *d, size_t a, size_t b, size_t count)
{
    const uint64_t *left = zeros_at(d, a), *right = zeros_at(d, b);
    for (size_t i = 0; i < count; i++) {
        if (i == a || i == b)
            continue;
        const uint64_t *third = zeros_at(d, i);
        int w = 0;
        while (w < d->words && (left[w] & right[w] & d->settled[w] & ~third[w]) == 0)
            w++;
        d->work += (uint64_t)w + 1;
        if (w == d->words)
            return false;
    }
    return true;
}

/* to = p*a + q*b without common divisor; false when an entry leaves 64 bits. */
static bool combine(int64_t *to, const int64_t *a, int64_t p, const int64_t *b, int64_t q, int width)
{
    for (int j = 0; j < width; j++) {
        int64_t left, right;
        if (__builtin_mul_overflow(a[j], p, &left) || __builtin_mul_overflow(b[j], q, &right) ||
            __builtin_add_overflow(left, right, &to[j]))
            return false;
    }
    cone_make_primitive(to, width);
    return true;
}

static lb_status add_between(description *d, size_t a, size_t b, int column)
{
    if (reserve(d) != LB_OK)
        return LB_E_NOMEM;
    if (d->gave_up)
        return LB_OK;
    const int64_t *positive = ray_at(d, a), *negative = ray_at(d, b);
    if (negative[column] == INT64_MIN || !combine(ray_at(d, d->rays.count), positive, -negative[column], negative,
                                                  positive[column], d->rays.width)) {
        d->gave_up = true;
        return LB_OK;
    }
    note_zeros(d, d->rays.count++);
    return LB_OK;
}

static void drop_negative(description *d, int column)
{
    size_t kept = 0;
    for (size_t i = 0; i < d->rays.count; i++) {
        if (ray_at(d, i)[column] < 0)
            continue;
        if (kept != i) {
            memcpy(ray_at(d, kept), ray_at(d, i), (size_t)d->rays.width * sizeof(int64_t));
            memcpy(zeros_at(d, kept), zeros_at(d, i), (size_t)d->words * sizeof(uint64_t));
        }
        kept++;
    }
    d->rays.count = kept;
}

static lb_status settle_column(description *d, int column)
{
    size_t count = d->rays.count;
    for (size_t a = 0; a < count; a++) {
        if (ray_at(d, a)[column] <= 0)
            continue;
        for (size_t b = 0; b < count && !d->gave_up; b++) {
            if (ray_at(d, b)[column] >= 0 || !are_adjacent(d, a, b, count))
                continue;
            if (add_between(d, a, b, column) != LB_OK)
                return LB_E_NOMEM;
        }
        d->gave_up = d->gave_up || d->work > WORK_LIMIT;
    }
    drop_negative(d, column);
    return LB_OK;
}

lb_status cone_find(const int64_t *basis, int dimension, int width, const int *own, cone *out, bool *is_complete)
{
    *out = (cone){.width = width};
    *is_complete = true;
    description d;
    lb_status status = start(&d, basis, dimension, width);
    int *signs = memory_array(2 * (size_t)width, sizeof *signs);
    if (!signs)
        status = LB_E_NOMEM;
    for (int i = 0; status == LB_OK && i < dimension; i++)
        d.settled[own[i] / WORD] |= UINT64_C(1) << own[i] % WORD;
    while (status == LB_OK && !d.gave_up) {
        int column = next_column(&d, signs, signs + width);
        if (column < 0)
            break;
        status = settle_column(&d, column);
        d.gave_up = d.gave_up || d.work > WORK_LIMIT;
    }
    if (status == LB_OK && !d.gave_up) {
        *out = d.rays;
        d.rays.ray = NULL;
    }
    *is_complete = !d.gave_up;
    memory_free(signs);
    memory_free(d.settled);
    memory_free(d.zero);
    memory_free(d.rays.ray);
    return status;
}

/* Positive flux vectors by non-negative least squares.
 *
 * v = 1 + w with w >= 0 must satisfy N v = 0; so the distance from -N 1 to the cone
 * of the columns of N is found, and is zero when there is such a v.  A rate of
 * unknown sign gives its column with both signs.  Rows are species, columns are
 * scaled to length one.  When the distance is not zero, its direction d has
 * d N <= 0 in every column, so d N v = 0 makes each v zero whose column has d N < 0
 * (Farkas' lemma).
 *
 * Source: C. L. Lawson and R. J. Hanson, Solving Least Squares Problems (1974),
 * chapter 23. */
#include "analysis/flux.h"

#include <math.h>
#include <string.h>

#include "analysis/linalg.h"
#include "base/memory.h"
#include "base/status.h"

enum { MOST_ENTRIES = 40000 };

struct cone {
    int rows, columns;
    double *A;              /* [rows*columns] */
    double *target;         /* [rows] */
    double *rest;           /* [rows] target - A w */
    double *w;              /* [columns] the weights */
    int *passive;           /* [columns] the first passive_count are free to be positive */
    bool *is_passive;       /* [columns] */
    int passive_count;
    double *work, *right;   /* [rows*columns], [max(rows, columns)] */
};

static void cone_clear(struct cone *c)
{
    memory_free(c->A);
    memory_free(c->target);
    memory_free(c->rest);
    memory_free(c->w);
    memory_free(c->passive);
    memory_free(c->is_passive);
    memory_free(c->work);
    memory_free(c->right);
}

static lb_status cone_init(struct cone *c, int rows, int columns, lb_error *err)
{
    size_t size = (size_t)rows * (size_t)columns, longer = (size_t)(rows > columns ? rows : columns);
    memset(c, 0, sizeof *c);
    c->rows = rows;
    c->columns = columns;
    c->A = memory_zeroed(size, sizeof *c->A);
    c->target = memory_zeroed((size_t)rows, sizeof *c->target);
    c->rest = memory_array((size_t)rows, sizeof *c->rest);
    c->w = memory_zeroed((size_t)columns, sizeof *c->w);
    c->passive = memory_array((size_t)columns, sizeof *c->passive);
    c->is_passive = memory_zeroed((size_t)columns, sizeof *c->is_passive);
    c->work = memory_array(size, sizeof *c->work);
    c->right = memory_array(longer, sizeof *c->right);
    if (c->A && c->target && c->rest && c->w && c->passive && c->is_passive && c->work && c->right)
        return LB_OK;
    return status_no_memory(err);
}

/* Columns of the steps that are alive, with their negatives where the sign of the
 * rate is not known; the target counts each known one once. */
static void fill_cone(struct cone *c, const equations *eq, const int *column)
{
    int steps = eq->system->steps;
    for (int i = 0; i < eq->count; i++)
        for (int t = eq->start[i]; t < eq->start[i + 1]; t++) {
            int step = eq->term[t].step;
            double coefficient = eq->term[t].coefficient;
            c->A[i + (size_t)column[step] * (size_t)c->rows] = coefficient;
            if (column[steps + step] >= 0)
                c->A[i + (size_t)column[steps + step] * (size_t)c->rows] = -coefficient;
            else
                c->target[i] -= coefficient;
        }
    for (int j = 0; j < c->columns; j++) {
        double *a = c->A + (size_t)j * (size_t)c->rows, length = 0;
        for (int i = 0; i < c->rows; i++)
            length = hypot(length, a[i]);
        for (int i = 0; i < c->rows && length > 0; i++)
            a[i] /= length;
    }
}

/* column [2*steps]: place of each step's column and of its negative, or -1. */
static int number_columns(const equations *eq, int *column)
{
    int steps = eq->system->steps, count = 0;
    for (int s = 0; s < 2 * steps; s++)
        column[s] = -1;
    for (int t = 0; t < eq->start[eq->count]; t++) {
        int step = eq->term[t].step;
        if (column[step] >= 0)
            continue;
        column[step] = count++;
        if (!eq->is_positive[step])
            column[steps + step] = count++;
    }
    return count;
}

static double update_rest(struct cone *c)
{
    double square = 0;
    memcpy(c->rest, c->target, (size_t)c->rows * sizeof *c->rest);
    for (int p = 0; p < c->passive_count; p++)
        for (int i = 0; i < c->rows; i++)
            c->rest[i] -= c->A[i + (size_t)c->passive[p] * (size_t)c->rows] * c->w[c->passive[p]];
    for (int i = 0; i < c->rows; i++)
        square += c->rest[i] * c->rest[i];
    return sqrt(square);
}

/* The column outside the passive set along which the distance falls fastest. */
static int steepest(const struct cone *c, double least)
{
    int best = -1;
    for (int j = 0; j < c->columns; j++) {
        double slope = 0;
        for (int i = 0; i < c->rows && !c->is_passive[j]; i++)
            slope += c->A[i + (size_t)j * (size_t)c->rows] * c->rest[i];
        if (slope > least) {
            least = slope;
            best = j;
        }
    }
    return best;
}

static lb_status solve_passive(struct cone *c, lb_error *err)
{
    int rank;
    for (int p = 0; p < c->passive_count; p++)
        memcpy(c->work + (size_t)p * (size_t)c->rows, c->A + (size_t)c->passive[p] * (size_t)c->rows,
               (size_t)c->rows * sizeof *c->work);
    memcpy(c->right, c->target, (size_t)c->rows * sizeof *c->right);
    return linalg_least_squares(c->rows, c->passive_count, c->work, c->right, 1e-12, &rank, err);
}

/* Go towards the solution until the first weight is zero; drop what is.  True:
 * the solution was reached. */
static bool move_weights(struct cone *c)
{
    double fraction = 1;
    for (int p = 0; p < c->passive_count; p++) {
        double now = c->w[c->passive[p]], next = c->right[p];
        if (next <= 0 && now > next)
            fraction = fmin(fraction, now / (now - next));
    }
    int kept = 0, before = c->passive_count;
    for (int p = 0; p < before; p++) {
        int j = c->passive[p];
        double next = c->w[j] + fraction * (c->right[p] - c->w[j]);
        bool is_dropped = c->right[p] <= 0 && next <= 1e-14;
        c->w[j] = is_dropped ? 0 : next;
        c->is_passive[j] = !is_dropped;
        if (!is_dropped)
            c->passive[kept++] = j;
    }
    c->passive_count = kept;
    return kept == before;
}

static lb_status solve_cone(struct cone *c, bool *is_possible, lb_error *err)
{
    double size = update_rest(c), rest = size;
    *is_possible = true;
    for (int i = 0; i < 3 * c->columns + 10; i++) {
        int next = steepest(c, 1e-10 * (1 + size));
        if (next < 0 || rest <= 1e-8 * (1 + size)) {
            *is_possible = rest <= 1e-7 * (1 + size);
            return LB_OK;
        }
        c->is_passive[next] = true;
        c->passive[c->passive_count++] = next;
        for (bool is_reached = false; !is_reached;) {
            lb_status status = solve_passive(c, err);
            if (status != LB_OK)
                return status == LB_E_NUMERIC ? LB_OK : status;
            is_reached = move_weights(c);
        }
        rest = update_rest(c);
    }
    return LB_OK;
}

/* Steps whose column points away from what is missing. */
static void mark_steps(const struct cone *c, const equations *eq, const int *column, bool *must_vanish)
{
    double length = 0;
    for (int i = 0; i < c->rows; i++)
        length = hypot(length, c->rest[i]);
    for (int s = 0; s < eq->system->steps; s++) {
        double along = 0;
        for (int i = 0; column[s] >= 0 && i < c->rows; i++)
            along += c->rest[i] * c->A[i + (size_t)column[s] * (size_t)c->rows];
        must_vanish[s] = along < -1e-6 * length;
    }
}

/* A species that is only made, or only used, at positive rates needs no search. */
static bool mark_unbalanced(const equations *eq, bool *must_vanish)
{
    bool is_found = false;
    for (int i = 0; i < eq->count; i++) {
        bool is_power = eq->start[i] < eq->start[i + 1], has_gain = false, has_loss = false;
        for (int t = eq->start[i]; t < eq->start[i + 1]; t++) {
            is_power = is_power && eq->is_positive[eq->term[t].step];
            has_gain = has_gain || eq->term[t].coefficient > 0;
            has_loss = has_loss || eq->term[t].coefficient < 0;
        }
        for (int t = eq->start[i]; t < eq->start[i + 1] && is_power && has_gain != has_loss; t++)
            is_found = must_vanish[eq->term[t].step] = true;
    }
    return is_found;
}

lb_status flux_check(const equations *eq, bool *is_possible, bool *must_vanish, lb_error *err)
{
    struct cone c = {0};
    memset(must_vanish, 0, (size_t)eq->system->steps * sizeof *must_vanish);
    *is_possible = !mark_unbalanced(eq, must_vanish);
    int *column = *is_possible ? memory_array(2 * (size_t)eq->system->steps, sizeof *column) : NULL;
    if (!column)
        return *is_possible ? status_no_memory(err) : LB_OK;
    int columns = number_columns(eq, column);
    lb_status status = LB_OK;
    if (columns > 0 && (long)columns * eq->count <= MOST_ENTRIES) {
        status = cone_init(&c, eq->count, columns, err);
        if (status == LB_OK) {
            fill_cone(&c, eq, column);
            status = solve_cone(&c, is_possible, err);
        }
        if (status == LB_OK && !*is_possible)
            mark_steps(&c, eq, column, must_vanish);
        cone_clear(&c);
    }
    memory_free(column);
    return status;
}

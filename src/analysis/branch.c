/* Points of a branch of steady states.
 *
 * The corrector solves the balances and laws together with one row that keeps it on the
 * plane perpendicular to the predictor's direction (pseudo-arclength: H. B. Keller, in
 * Applications of Bifurcation Theory (1977), p. 359): that system is regular at folds
 * too.  The same bordered matrix gives the tangent.  How the rows move with the constant
 * is had from central differences, which only steer the iteration. */
#include "analysis/branch.h"

#include <float.h>
#include <math.h>
#include <string.h>

#include "analysis/linalg.h"
#include "base/memory.h"
#include "base/status.h"

enum { MOST_CORRECTIONS = 12 };

lb_status branch_init(branch *b, lb_evaluator *evaluator, int constant, const double *x, lb_error *err)
{
    const lb_system *system = evaluator_system(evaluator);
    *b = (branch){.constant = constant};
    lb_network_range(system->network, constant, &b->low, &b->high, &b->is_logarithmic);
    b->unit = (b->high - b->low) / 10;
    lb_status status = near_init(&b->near, evaluator, x, NULL, err);
    if (status != LB_OK)
        return status;
    size_t rows = (size_t)b->near.rows, n = (size_t)system->n, rank = (size_t)system->rank;
    b->size = b->near.count + 1;
    struct { double **block; size_t size; } blocks[] = {
        {&b->F, rows}, {&b->F_low, rows}, {&b->F_high, rows}, {&b->A, rows * (size_t)b->near.count},
        {&b->work, (rows + 1) * (size_t)b->size}, {&b->right, rows + 1}, {&b->J, n * n}, {&b->reduced, rank * rank}};
    for (size_t i = 0; i < sizeof blocks / sizeof *blocks; i++)
        if (!(*blocks[i].block = memory_array(blocks[i].size, sizeof(double))))
            return status_no_memory(err);
    b->values = memory_array(rank, sizeof *b->values);
    return b->values ? LB_OK : status_no_memory(err);
}

void branch_clear(branch *b)
{
    near_clear(&b->near);
    memory_free(b->F);
    memory_free(b->F_low);
    memory_free(b->F_high);
    memory_free(b->A);
    memory_free(b->work);
    memory_free(b->right);
    memory_free(b->J);
    memory_free(b->reduced);
    memory_free(b->values);
}

double branch_value(const branch *b, double coordinate)
{
    return b->is_logarithmic ? exp(coordinate) : coordinate * b->unit;
}

double branch_coordinate(const branch *b, double value)
{
    return b->is_logarithmic ? log(value) : value / b->unit;
}

static bool rows_at(branch *b, const double *z, double shift, double *F, double *A)
{
    double value = branch_value(b, z[b->near.count] + shift);
    return near_bind(&b->near, b->constant, value, NULL) == LB_OK && near_rows(&b->near, z, F, A);
}

/* work = [F_u F_q; direction], F at z; the evaluator is left bound at z. */
static bool fill_bordered(branch *b, const double *z, const double *direction)
{
    const double h = 1e-5;
    int count = b->near.count, rows = b->near.rows;
    size_t stride = (size_t)rows + 1;
    if (!rows_at(b, z, h, b->F_high, NULL) || !rows_at(b, z, -h, b->F_low, NULL) || !rows_at(b, z, 0, b->F, b->A))
        return false;
    for (int j = 0; j < count; j++)
        memcpy(b->work + (size_t)j * stride, b->A + (size_t)j * (size_t)rows, (size_t)rows * sizeof *b->work);
    for (int i = 0; i < rows; i++)
        b->work[(size_t)i + (size_t)count * stride] = (b->F_high[i] - b->F_low[i]) / (2 * h);
    for (int j = 0; j < b->size; j++)
        b->work[(size_t)rows + (size_t)j * stride] = direction[j];
    return true;
}

static bool solve_bordered(branch *b)
{
    int rank;
    return linalg_least_squares(b->near.rows + 1, b->size, b->work, b->right, DBL_MIN, &rank, NULL) == LB_OK &&
           rank == b->size;
}

static double scale_of(const branch *b, const double *z, int i)
{
    return i < b->near.count && !b->near.is_signed[i] ? 1 : 1 + fabs(z[i]);
}

bool branch_correct(branch *b, const double *guess, const double *direction, double *z)
{
    double last = INFINITY;
    memmove(z, guess, (size_t)b->size * sizeof *z);
    for (int iteration = 0; iteration < MOST_CORRECTIONS; iteration++) {
        double off = 0, step = 0;
        if (!fill_bordered(b, z, direction))
            return false;
        for (int i = 0; i < b->near.rows; i++)
            b->right[i] = -b->F[i];
        for (int i = 0; i < b->size; i++)
            off += direction[i] * (guess[i] - z[i]);
        b->right[b->near.rows] = off;
        if (!solve_bordered(b))
            return false;
        for (int i = 0; i < b->size; i++)
            step = fmax(step, fabs(b->right[i]) / scale_of(b, z, i));
        if (!(step < 2) || (step >= last && last > 1e-7))
            return false;
        if (step >= last)
            return true;    /* down to rounding */
        for (int i = 0; i < b->size; i++)
            z[i] += b->right[i];
        if (step < 1e-14)
            return true;
        last = step;
    }
    return last < 1e-7;
}

bool branch_tangent(branch *b, const double *z, const double *along, double *tangent)
{
    double length = 0;
    if (!fill_bordered(b, z, along))
        return false;
    memset(b->right, 0, (size_t)b->near.rows * sizeof *b->right);
    b->right[b->near.rows] = 1;
    if (!solve_bordered(b))
        return false;
    for (int i = 0; i < b->size; i++)
        length = hypot(length, b->right[i]);
    for (int i = 0; i < b->size; i++)
        tangent[i] = b->right[i] / length;
    return isfinite(length) && length > 0;
}

int branch_unstable(branch *b, const double *z)
{
    const lb_system *system = b->near.system;
    int unstable = 0;
    double value = branch_value(b, z[b->near.count]);
    if (near_bind(&b->near, b->constant, value, NULL) != LB_OK)
        return -1;
    near_place(&b->near, z);
    lb_jacobian(b->near.evaluator, b->near.x, b->J);
    system_reduce(system, b->J, b->reduced);
    if (linalg_eigenvalues(system->rank, b->reduced, b->values, NULL, NULL) != LB_OK)
        return -1;
    for (int i = 0; i < system->rank; i++)
        unstable += b->values[i].re > 0;
    return unstable;
}

void branch_state(branch *b, const double *z, double *x)
{
    near_bind(&b->near, b->constant, branch_value(b, z[b->near.count]), NULL);
    near_place(&b->near, z);
    memcpy(x, b->near.x, (size_t)b->near.system->n * sizeof *x);
    system_complete(b->near.system, b->near.start, x);
}

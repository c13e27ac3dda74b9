/* Checked evaluations for the one-step methods: a value that is not finite is
 * found here and goes no further. */
#include "analysis/stepper.h"

#include <math.h>

int stepper_rhs(lb_evaluator *evaluator, const double *x, double *f)
{
    int n = evaluator_system(evaluator)->n;
    double sum = 0;             /* 0 times what is not finite is not a number */
    lb_rhs(evaluator, x, f);
    for (int i = 0; i < n; i++)
        sum += 0.0 * f[i];
    for (int i = 0; sum != 0 && i < n; i++)
        if (!isfinite(f[i]))
            return i;
    return -1;
}

bool stepper_jacobian(lb_evaluator *evaluator, const double *x, double *values)
{
    int nonzeros = evaluator_system(evaluator)->nonzeros;
    lb_jacobian_sparse(evaluator, x, values);
    for (int e = 0; e < nonzeros; e++)
        if (!isfinite(values[e]))
            return false;
    return true;
}

void stepper_multiply_add(const lb_system *system, const double *values, double factor, int columns, const double *X,
                          double *Y)
{
    int n = system->n;
    for (int c = 0; c < columns; c++)
        for (int j = 0; j < n; j++) {
            double scaled = factor * X[j + (size_t)c * n];
            if (scaled != 0)
                for (int e = system->column_start[j]; e < system->column_start[j + 1]; e++)
                    Y[system->row[e] + (size_t)c * n] += values[e] * scaled;
        }
}

int stepper_column_count(const stepper_columns *columns)
{
    return columns ? columns->tangents + columns->constants : 0;
}

void stepper_add_forcing(lb_evaluator *evaluator, const stepper_columns *columns, const double *x, double factor,
                         double *room, double *Y)
{
    if (columns->constants == 0)
        return;
    size_t n = (size_t)evaluator_system(evaluator)->n;
    lb_dfdk(evaluator, x, room);
    for (int c = 0; c < columns->constants; c++) {
        const double *from = room + (size_t)columns->constant[c] * n;
        double *to = Y + (size_t)(columns->tangents + c) * n;
        for (size_t i = 0; i < n; i++)
            to[i] += factor * from[i];
    }
}

/* Weights of the error control.
 *
 * An error e_i passes when |e_i| <= a_i + r max(|x_i|, |x_i new|), in the largest
 * norm: every species counts, not the mean.  Concentrations of one mechanism
 * lie ten decades apart and move over six, so one absolute tolerance for all is
 * either useless or blind (a run with a_i above the values passes every test
 * and means nothing).  Where the caller gives none,
 *     a_i = r * 1e-6 * (largest |x_i| so far, at least 1e-12 of the largest of any).
 * A decaying species is thus followed over six decades below its peak, which
 * costs some 14 of its time constants, and then let go; a species that is not
 * there yet is followed nearly relatively from its first trace. */
#include "analysis/tolerance.h"

#include <float.h>
#include <math.h>
#include <string.h>

#include "base/memory.h"

void tolerance_clear(tolerance *control)
{
    memory_free(control->is_signed);
    memory_free(control->seen);
    memory_free(control->absolute);
    memory_free(control->given);
    *control = (tolerance){0};
}

lb_status tolerance_init(tolerance *control, const lb_network *network, double relative, const double *absolute)
{
    int n = network->states;
    *control = (tolerance){.n = n, .relative = relative};
    control->absolute = memory_zeroed((size_t)n, sizeof *control->absolute);
    control->seen = memory_zeroed((size_t)n, sizeof *control->seen);
    control->is_signed = memory_zeroed((size_t)n, sizeof *control->is_signed);
    control->given = absolute ? memory_array((size_t)n, sizeof *control->given) : NULL;
    if (!control->absolute || !control->seen || !control->is_signed || (absolute && !control->given)) {
        tolerance_clear(control);
        return LB_E_NOMEM;
    }
    if (absolute)
        memcpy(control->given, absolute, (size_t)n * sizeof *absolute);
    for (int i = 0; i < n; i++)
        control->is_signed[i] = network->species[network->state_species[i]].is_signed;
    return LB_OK;
}

static void set_absolute(tolerance *control)
{
    if (control->given) {
        memcpy(control->absolute, control->given, (size_t)control->n * sizeof *control->given);
        return;
    }
    double newborn = TOLERANCE_NEWBORN_FRACTION * control->reference;
    for (int i = 0; i < control->n; i++) {
        double fraction = control->is_signed[i] ? TOLERANCE_SIGNED_FRACTION : TOLERANCE_FRACTION;
        control->absolute[i] = control->relative * fraction * fmax(control->seen[i], newborn);
    }
}

void tolerance_start(tolerance *control, const double *x, double amount)
{
    memset(control->seen, 0, (size_t)control->n * sizeof *control->seen);
    control->reference = amount;
    tolerance_follow(control, x);
}

void tolerance_follow(tolerance *control, const double *x)
{
    double most = 0;
    for (int i = 0; i < control->n; i++) {
        control->seen[i] = fmax(control->seen[i], fabs(x[i]));
        most = fmax(most, control->seen[i]);
    }
    if (most > 0)
        control->reference = most;
    set_absolute(control);
}

double tolerance_weight(const tolerance *control, int state, double x, double x_new)
{
    return control->absolute[state] + control->relative * fmax(fabs(x), fabs(x_new));
}

/* 0/0 is no error: a species that is zero and stays zero. */
static double ratio(double error, double weight)
{
    return error == 0 ? 0 : fabs(error) / weight;
}

double tolerance_norm(const tolerance *control, const double *x, const double *x_new, const double *error, int *worst)
{
    double norm = 0;
    *worst = 0;
    for (int i = 0; i < control->n; i++) {
        double scaled = ratio(error[i], tolerance_weight(control, i, x[i], x_new[i]));
        if (!(scaled <= norm)) {
            norm = scaled;
            *worst = i;
        }
    }
    return norm;
}

double tolerance_magnitude(const tolerance *control, int state)
{
    return fmax(control->seen[state], 1e-9 * control->reference);
}

double tolerance_column_norm(const tolerance *control, double from, const double *column, const double *column_new,
                             const double *error)
{
    double size = 0, off = 0;
    for (int i = 0; i < control->n; i++) {
        double scale = from / tolerance_magnitude(control, i);
        size = fmax(size, scale * fmax(fabs(column[i]), fabs(column_new[i])));
        off = fmax(off, scale * fabs(error[i]));
    }
    /* The identity that tangents start from has columns of size one. */
    return ratio(off, 10 * control->relative * (size + TOLERANCE_FRACTION));
}

int tolerance_negative(const tolerance *control, const double *x, const double *x_new)
{
    double furthest = 1;
    int state = -1;
    for (int i = 0; i < control->n; i++) {
        if (x_new[i] >= 0 || control->is_signed[i])
            continue;
        double below = -x_new[i] / (control->absolute[i] + 16 * DBL_EPSILON * fabs(x[i]));
        if (below > furthest) {
            furthest = below;
            state = i;
        }
    }
    return state;
}

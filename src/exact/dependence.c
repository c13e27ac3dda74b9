/* What conservation laws determine: dependent species by others, and species
 * that nothing else is needed for.
 *
 * Exact elimination of the laws, read as equations sum_j w_j x_j = const, in solved
 * form: each pivot species as a combination of free ones. */
#include <stdint.h>
#include <string.h>

#include "base/memory.h"
#include "exact/conservation.h"
#include "exact/elimination.h"

/* Eliminates the basis rows of the laws, with pivots where the preference allows them. */
static lb_status eliminate_laws(const conservation *laws, const int *preference, elimination *e)
{
    lb_status status = elimination_init(e, laws->width, preference, false);
    int *column = memory_array((size_t)laws->width, sizeof *column);
    fmpz *value = memory_zeroed((size_t)laws->width, sizeof *value);
    if (!column || !value)
        status = LB_E_NOMEM;
    for (int l = 0; l < laws->basis && status == LB_OK; l++) {
        const int64_t *law = laws->law + (size_t)l * (size_t)laws->width;
        int count = 0;
        for (int j = 0; j < laws->width; j++) {
            if (law[j] == 0)
                continue;
            column[count] = j;
            fmpz_set_si(&value[count++], law[j]);
        }
        status = elimination_add(e, column, value, count, NULL);
    }
    for (int j = 0; value && j < laws->width; j++)
        fmpz_clear(&value[j]);
    memory_free(value);
    memory_free(column);
    return status == LB_OK ? elimination_solve(e, SIZE_MAX) : status;
}

/* A rational as the nearest double, up to a rounding. */
static double to_double(const fmpq *value)
{
    return fmpz_get_d(fmpq_numref(value)) / fmpz_get_d(fmpq_denref(value));
}

/* How many of the laws a species is in: a species in few makes a sparse elimination. */
static void count_laws(const conservation *laws, int *preference)
{
    for (int l = 0; l < laws->basis; l++)
        for (int j = 0; j < laws->width; j++)
            preference[j] += laws->law[(size_t)l * (size_t)laws->width + (size_t)j] != 0;
}

static void fill_elimination(const elimination *e, const int *number_of, double *out)
{
    for (size_t d = 0; d < e->rank; d++) {
        const elimination_row *row = &e->row[d];
        for (int k = 0; k < row->solved_count; k++)
            out[d + (size_t)number_of[row->solved_column[k]] * e->rank] = -to_double(&row->solved_value[k]);
    }
}

lb_status conservation_eliminate(const conservation *laws, int *dependent, int *independent,
                                 double *out, lb_error *err)
{
    int width = laws->width, rank = width - laws->basis;
    elimination e = {0};
    lb_status status = LB_E_NOMEM;
    int *preference = memory_zeroed((size_t)width, sizeof *preference);
    int *number_of = memory_array((size_t)width, sizeof *number_of);
    if (!preference || !number_of)
        goto done;
    count_laws(laws, preference);
    status = eliminate_laws(laws, preference, &e);
    if (status != LB_OK)
        goto done;
    for (size_t d = 0; d < e.rank; d++)
        dependent[d] = e.row[d].pivot;
    for (int j = 0, i = 0; j < width; j++) {
        number_of[j] = i;
        if (e.row_of[j] < 0)
            independent[i++] = j;
    }
    memset(out, 0, (size_t)laws->basis * (size_t)rank * sizeof *out);
    fill_elimination(&e, number_of, out);
done:
    elimination_clear(&e);
    memory_free(preference);
    memory_free(number_of);
    return conservation_report(err, status);
}

/* Is the row's pivot given by columns outside the list alone? */
static bool is_isolated(const elimination_row *row, const int *preference)
{
    for (int k = 0; k < row->solved_count; k++)
        if (preference[row->solved_column[k]] != ELIMINATION_NEVER)
            return false;
    return true;
}

static lb_status collect_isolated(const elimination *e, int *count, int **column, double **weight)
{
    size_t width = (size_t)e->width;
    for (size_t r = 0; r < e->rank; r++)
        *count += is_isolated(&e->row[r], e->preference);
    if ((size_t)*count * width > CONSERVATION_LIMIT)
        return LB_E_LIMIT;
    *column = memory_array((size_t)*count, sizeof **column);
    *weight = memory_zeroed((size_t)*count * width, sizeof **weight);
    if (!*column || !*weight)
        return LB_E_NOMEM;
    int at = 0;
    for (size_t r = 0; r < e->rank; r++) {
        const elimination_row *row = &e->row[r];
        if (!is_isolated(row, e->preference))
            continue;
        double *into = *weight + (size_t)at * width;
        (*column)[at++] = row->pivot;
        into[row->pivot] = 1;
        for (int k = 0; k < row->solved_count; k++)
            into[row->solved_column[k]] = -to_double(&row->solved_value[k]);
    }
    return LB_OK;
}

lb_status conservation_isolate(const conservation *laws, const int *columns, int column_count,
                               int *count, int **column, double **weight, lb_error *err)
{
    *count = 0;
    *column = NULL;
    *weight = NULL;
    elimination e = {0};
    lb_status status = LB_E_NOMEM;
    int *preference = memory_array((size_t)laws->width, sizeof *preference);
    if (!preference)
        goto done;
    for (int j = 0; j < laws->width; j++)
        preference[j] = ELIMINATION_NEVER;
    for (int i = 0; i < column_count; i++)
        preference[columns[i]] = 0;
    status = eliminate_laws(laws, preference, &e);
    if (status == LB_OK)
        status = collect_isolated(&e, count, column, weight);
done:
    elimination_clear(&e);
    memory_free(preference);
    if (status != LB_OK) {
        memory_free(*column);
        memory_free(*weight);
        *column = NULL;
        *weight = NULL;
        *count = 0;
    }
    return conservation_report(err, status);
}

/* Species that conservation laws give, chosen by size.
 *
 * The laws are reduced by elimination, each by the species that is largest in it:
 * the increments of the others do not cancel there.  The choice is kept until
 * such a species falls below a tenth of the largest of its law, since a new one
 * costs an elimination, and for sparse systems an analysis. */
#include "analysis/stiff_laws.h"

#include <math.h>

#include "base/memory.h"

#define KEEP_FRACTION 0.1
#define SMALLEST_WEIGHT 1e-9    /* what is below is the rounding of an integer that is zero */

void stiff_laws_clear(stiff_laws *laws)
{
    memory_free(laws->dense);
    memory_free(laws->weight);
    memory_free(laws->species);
    memory_free(laws->start);
    memory_free(laws->place);
    memory_free(laws->dependent);
    *laws = (stiff_laws){0};
}

lb_status stiff_laws_init(stiff_laws *laws, const lb_system *system)
{
    size_t n = (size_t)system->n, count = (size_t)system->laws.basis;
    *laws = (stiff_laws){.system = system, .count = system->laws.basis};
    laws->dependent = memory_array(count, sizeof *laws->dependent);
    laws->place = memory_array(n, sizeof *laws->place);
    laws->start = memory_array(count + 1, sizeof *laws->start);
    laws->species = memory_array(count * n, sizeof *laws->species);
    laws->weight = memory_array(count * n, sizeof *laws->weight);
    laws->dense = memory_array(count * n, sizeof *laws->dense);
    if (!laws->dependent || !laws->place || !laws->start || !laws->species || !laws->weight || !laws->dense) {
        stiff_laws_clear(laws);
        return LB_E_NOMEM;
    }
    return LB_OK;
}

void stiff_laws_forget(stiff_laws *laws)
{
    laws->is_chosen = false;
}

/* Scale one law to 1 at its species, and take that species out of the others. */
static void reduce(stiff_laws *laws, int law, int species)
{
    size_t n = (size_t)laws->system->n;
    double *own = laws->dense + (size_t)law * n, leading = own[species];
    for (size_t i = 0; i < n; i++)
        own[i] /= leading;
    for (int other = 0; other < laws->count; other++) {
        double *row = laws->dense + (size_t)other * n, factor = other == law ? 0 : row[species];
        if (factor == 0)
            continue;
        for (size_t i = 0; i < n; i++)
            row[i] -= factor * own[i];
        row[species] = 0;
    }
}

/* Does every law still give a species that is large in it? */
static bool still_fits(const stiff_laws *laws, const double *size)
{
    for (int law = 0; law < laws->count; law++) {
        if (laws->dependent[law] < 0)
            continue;
        double most = size[laws->dependent[law]] / KEEP_FRACTION;
        for (size_t e = laws->start[law]; e < laws->start[law + 1]; e++)
            if (fabs(laws->weight[e]) * size[laws->species[e]] > most)
                return false;
    }
    return true;
}

/* The reduced laws without their zeros. */
static void compress(stiff_laws *laws)
{
    size_t n = (size_t)laws->system->n, used = 0;
    for (int law = 0; law < laws->count; law++) {
        laws->start[law] = used;
        const double *row = laws->dense + (size_t)law * n;
        for (size_t i = 0; laws->dependent[law] >= 0 && i < n; i++)
            if (laws->place[i] >= 0 && fabs(row[i]) > SMALLEST_WEIGHT) {
                laws->species[used] = (int)i;
                laws->weight[used++] = row[i];
            }
    }
    laws->start[laws->count] = used;
}

bool stiff_laws_choose(stiff_laws *laws, const double *size)
{
    if (laws->is_chosen && still_fits(laws, size))
        return false;
    laws->is_chosen = true;
    int n = laws->system->n;
    for (size_t e = 0; e < (size_t)laws->count * (size_t)n; e++)
        laws->dense[e] = (double)laws->system->laws.law[e];
    for (int i = 0; i < n; i++)
        laws->place[i] = 0;
    for (int law = 0; law < laws->count; law++) {
        const double *row = laws->dense + (size_t)law * (size_t)n;
        int best = -1;
        for (int i = 0; i < n; i++)
            if (laws->place[i] == 0 && fabs(row[i]) > SMALLEST_WEIGHT &&
                (best < 0 || fabs(row[i]) * size[i] > fabs(row[best]) * size[best]))
                best = i;
        laws->dependent[law] = best;    /* -1: a law that rounding has lost; its species stay free */
        if (best < 0)
            continue;
        laws->place[best] = -1;
        reduce(laws, law, best);
    }
    laws->free = 0;
    for (int i = 0; i < n; i++)
        if (laws->place[i] == 0)
            laws->place[i] = laws->free++;
    compress(laws);
    return true;
}

void stiff_laws_complete(const stiff_laws *laws, double *u)
{
    for (int law = 0; law < laws->count; law++) {
        if (laws->dependent[law] < 0)
            continue;
        double sum = 0;
        for (size_t e = laws->start[law]; e < laws->start[law + 1]; e++)
            sum += laws->weight[e] * u[laws->species[e]];
        u[laws->dependent[law]] = -sum;
    }
}

/* Poincare section: a level of one species, crossed upwards.
 *
 * Any closed orbit on which that species moves crosses the middle of its range.
 * An orbit that takes several loops is found by comparing a return with older
 * ones, not only with the last. */
#include "analysis/section.h"

#include <math.h>
#include <string.h>

#include "analysis/orbit.h"
#include "base/memory.h"
#include "base/status.h"

lb_status section_init(section *c, int n, lb_error *err)
{
    memset(c, 0, sizeof *c);
    c->n = n;
    size_t width = (size_t)n;
    c->block = memory_zeroed(width, (5 + 3 * (SECTION_LOOPS + 1)) * sizeof(double));
    if (!c->block)
        return status_no_memory(err);
    c->weight = c->block;
    c->low = c->block + width;
    c->high = c->block + 2 * width;
    c->loops_low = c->block + 3 * width;
    c->loops_high = c->block + 4 * width;
    for (size_t k = 0; k <= SECTION_LOOPS; k++) {
        c->ring[k].x = c->block + (5 + 3 * k) * width;
        c->ring[k].low = c->ring[k].x + width;
        c->ring[k].high = c->ring[k].low + width;
    }
    return LB_OK;
}

void section_clear(section *c)
{
    memory_free(c->block);
    c->block = NULL;
}

static void forget_range(section *c)
{
    for (int i = 0; i < c->n; i++) {
        c->low[i] = INFINITY;
        c->high[i] = -INFINITY;
    }
}

static void widen_range(section *c, const double *x)
{
    for (int i = 0; i < c->n; i++) {
        c->low[i] = fmin(c->low[i], x[i]);
        c->high[i] = fmax(c->high[i], x[i]);
    }
}

void section_place(section *c, int state, double low, double high)
{
    memset(c->weight, 0, (size_t)c->n * sizeof *c->weight);
    c->weight[state] = 1;
    c->state = state;
    c->level = 0.5 * (low + high);
    c->returns = 0;
    c->is_placed = true;
    forget_range(c);
}

lb_status section_watch(section *c, integrator *it, bool *returned, lb_error *err)
{
    double before = integrator_last_state(it)[c->state], after = integrator_state(it)[c->state];
    *returned = false;
    widen_range(c, integrator_last_state(it));
    if (before < c->level && after >= c->level) {
        section_return *next = &c->ring[c->returns % (SECTION_LOOPS + 1)];
        lb_status status = integrator_crossing(it, c->weight, c->level, +1, returned, &next->t, next->x, err);
        if (status != LB_OK)
            return status;
        if (*returned) {
            widen_range(c, next->x);
            memcpy(next->low, c->low, (size_t)c->n * sizeof *c->low);
            memcpy(next->high, c->high, (size_t)c->n * sizeof *c->high);
            forget_range(c);
            c->returns++;
        }
    }
    widen_range(c, integrator_state(it));
    return LB_OK;
}

const section_return *section_back(const section *c, size_t back)
{
    return &c->ring[(c->returns - 1 - back) % (SECTION_LOOPS + 1)];
}

int section_repeats(section *c, const space *s, double threshold, double *scale)
{
    size_t known = c->returns < SECTION_LOOPS + 1 ? c->returns : SECTION_LOOPS + 1;
    for (int i = 0; i < c->n; i++) {
        c->loops_low[i] = INFINITY;
        c->loops_high[i] = -INFINITY;
    }
    for (size_t loops = 1; loops < known; loops++) {
        const section_return *last = section_back(c, loops - 1);
        for (int i = 0; i < c->n; i++) {
            c->loops_low[i] = fmin(c->loops_low[i], last->low[i]);
            c->loops_high[i] = fmax(c->loops_high[i], last->high[i]);
        }
        orbit_scale(s, c->loops_low, c->loops_high, scale);
        if (space_distance(s, section_back(c, 0)->x, section_back(c, loops)->x, scale) < threshold)
            return (int)loops;
    }
    return 0;
}

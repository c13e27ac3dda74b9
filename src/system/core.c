/* The core: species and steps that take part in the dynamics, and their
 * reaction space.
 *
 * A species that enters no rate of a step that counts is set aside; a step that
 * changes no species that counts is dropped; repeatedly, by a queue, so that the
 * work is linear in the tables.  In the core, each conservation law eliminates
 * one dependent species; the Jacobian reduced by that has the eigenvalues of J
 * on the image of N, since it is J in coordinates of that space. */
#include "system/core.h"

#include <math.h>
#include <string.h>

#include "base/memory.h"
#include "system/table.h"

/* ---- Selection --------------------------------------------------------------------- */

typedef struct selection {
    const table *t;
    int *uses;          /* [n] steps that count and whose rate has the state in it */
    int *changes;       /* [steps] entries on states that count */
    bool *is_aside;     /* [n] */
    bool *counts;       /* [steps] */
    int *queue;         /* [n] states set aside, in turn */
    int queued;
} selection;

static void drop_step(selection *sel, int s)
{
    const table *t = sel->t;
    sel->counts[s] = false;
    for (int d = t->slot_start[s]; d < t->slot_start[s + 1]; d++) {
        int state = t->slot_state[d];
        if (--sel->uses[state] == 0)
            sel->queue[sel->queued++] = state;
    }
}

static void set_aside(selection *sel, int state)
{
    const table *t = sel->t;
    sel->is_aside[state] = true;
    for (int e = t->row_start[state]; e < t->row_start[state + 1]; e++)
        if (--sel->changes[t->row_step[e]] == 0 && sel->counts[t->row_step[e]])
            drop_step(sel, t->row_step[e]);
}

static void select_all(selection *sel)
{
    const table *t = sel->t;
    for (int s = 0; s < t->steps; s++) {
        sel->counts[s] = true;
        sel->changes[s] = t->entry_start[s + 1] - t->entry_start[s];
        for (int d = t->slot_start[s]; d < t->slot_start[s + 1]; d++)
            sel->uses[t->slot_state[d]]++;
    }
    for (int i = 0; i < t->n; i++)
        if (sel->uses[i] == 0)
            sel->queue[sel->queued++] = i;
    for (int s = 0; s < t->steps; s++)
        if (sel->changes[s] == 0)
            drop_step(sel, s);
    for (int next = 0; next < sel->queued; next++)
        set_aside(sel, sel->queue[next]);
}

static void number_core(lb_system *system, const bool *is_aside)
{
    system->core = 0;
    for (int i = 0; i < system->n; i++) {
        system->core_index[i] = is_aside[i] ? -1 : system->core;
        if (!is_aside[i])
            system->core_state[system->core++] = i;
    }
}

lb_status core_select(lb_system *system)
{
    size_t n = (size_t)system->n, steps = (size_t)system->steps;
    lb_status status = LB_E_NOMEM;
    selection sel = {.t = system->table};
    sel.uses = memory_zeroed(n, sizeof *sel.uses);
    sel.changes = memory_zeroed(steps, sizeof *sel.changes);
    sel.is_aside = memory_zeroed(n, sizeof *sel.is_aside);
    sel.queue = memory_array(n, sizeof *sel.queue);
    sel.counts = system->core_step = memory_zeroed(steps, sizeof *system->core_step);
    system->core_state = memory_array(n, sizeof *system->core_state);
    system->core_index = memory_array(n, sizeof *system->core_index);
    if (sel.uses && sel.changes && sel.is_aside && sel.queue && sel.counts && system->core_state &&
        system->core_index) {
        select_all(&sel);
        number_core(system, sel.is_aside);
        status = LB_OK;
    }
    memory_free(sel.uses);
    memory_free(sel.changes);
    memory_free(sel.is_aside);
    memory_free(sel.queue);
    return status;
}

/* ---- Reaction space ------------------------------------------------------------------- */

lb_status core_reduce(lb_system *system, lb_error *err)
{
    size_t laws = (size_t)system->core_laws.basis;
    system->rank = system->core - system->core_laws.basis;
    system->independent = memory_array((size_t)system->rank, sizeof *system->independent);
    system->dependent = memory_array(laws, sizeof *system->dependent);
    system->elimination = memory_array(laws * (size_t)system->rank, sizeof *system->elimination);
    if (!system->independent || !system->dependent || !system->elimination)
        return LB_E_NOMEM;
    return conservation_eliminate(&system->core_laws, system->dependent, system->independent,
                                  system->elimination, err);
}

void system_reduce(const lb_system *system, const double *J, double *reduced)
{
    int n = system->n, rank = system->rank, laws = system->core - rank;
    for (int j = 0; j < rank; j++) {
        const double *column = J + (size_t)system->core_state[system->independent[j]] * (size_t)n;
        const double *through = system->elimination + (size_t)j * (size_t)laws;
        double *out = reduced + (size_t)j * (size_t)rank;
        for (int i = 0; i < rank; i++)
            out[i] = column[system->core_state[system->independent[i]]];
        for (int d = 0; d < laws; d++) {
            if (through[d] == 0)
                continue;
            const double *dependent = J + (size_t)system->core_state[system->dependent[d]] * (size_t)n;
            for (int i = 0; i < rank; i++)
                out[i] -= dependent[system->core_state[system->independent[i]]] * through[d];
        }
    }
}

void system_core_totals(const lb_system *system, const double *x, double *out)
{
    const conservation *laws = &system->core_laws;
    for (int l = 0; l < laws->count; l++) {
        const int64_t *law = laws->law + (size_t)l * (size_t)laws->width;
        double sum = 0;
        for (int i = 0; i < laws->width; i++)
            if (law[i] != 0)
                sum += (double)law[i] * x[system->core_state[i]];
        out[l] = sum;
    }
}

/* ---- Species set aside ---------------------------------------------------------------- */

void system_complete(const lb_system *system, const double *x0, double *x)
{
    for (int i = 0; i < system->n; i++)
        if (system->core_index[i] < 0)
            x[i] = NAN;
    for (int f = 0; f < system->fixed_count; f++) {
        const double *weight = system->fixed_weight + (size_t)f * (size_t)system->n;
        double value = x0[system->fixed_state[f]];
        for (int i = 0; i < system->n; i++)
            if (system->core_index[i] >= 0 && weight[i] != 0)
                value += weight[i] * (x0[i] - x[i]);
        x[system->fixed_state[f]] = value;
    }
}

lb_status core_fix(lb_system *system, lb_error *err)
{
    int aside = system->n - system->core;
    if (aside == 0 || system->laws.basis == 0)
        return LB_OK;
    int *columns = memory_array((size_t)aside, sizeof *columns);
    if (!columns)
        return LB_E_NOMEM;
    for (int i = 0, at = 0; i < system->n; i++)
        if (system->core_index[i] < 0)
            columns[at++] = i;
    lb_status status = conservation_isolate(&system->laws, columns, aside, &system->fixed_count,
                                            &system->fixed_state, &system->fixed_weight, err);
    memory_free(columns);
    return status;
}

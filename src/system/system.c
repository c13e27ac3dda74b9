/* The system: pattern, tables, core and laws of one network, put together. */
#include "system/system.h"

#include <stdio.h>

#include "base/memory.h"
#include "base/status.h"
#include "system/core.h"
#include "system/native.h"
#include "system/table.h"

void lb_system_free(lb_system *system)
{
    if (!system)
        return;
    table_free(system->table);
    native_free(system->native);
    conservation_clear(&system->laws);
    conservation_clear(&system->core_laws);
    void *blocks[] = {system->column_start, system->row, system->core_state, system->core_index, system->core_step,
                      system->independent, system->dependent, system->elimination, system->fixed_state,
                      system->fixed_weight};
    for (size_t i = 0; i < sizeof blocks / sizeof *blocks; i++)
        memory_free(blocks[i]);
    memory_free(system);
}

static lb_status build_tables(lb_system *system)
{
    const lb_network *net = system->network;
    lb_status status = network_pattern(net, &system->column_start, &system->row);
    if (status != LB_OK)
        return status;
    system->nonzeros = system->column_start[system->n];
    status = table_new(net, system->column_start, system->row, &system->table);
    return status == LB_OK ? core_select(system) : status;
}

static lb_status find_laws(lb_system *system, lb_error *err)
{
    const lb_network *net = system->network;
    int *all = memory_array((size_t)system->n, sizeof *all);
    if (!all)
        return LB_E_NOMEM;
    for (int i = 0; i < system->n; i++)
        all[i] = i;
    lb_status status = conservation_find(net, all, system->n, NULL, &system->laws, err);
    if (status == LB_OK && system->core == system->n)
        status = conservation_copy(&system->laws, &system->core_laws);
    else if (status == LB_OK)
        status = conservation_find(net, system->core_state, system->core, system->core_step,
                                   &system->core_laws, err);
    if (status == LB_OK)
        status = core_reduce(system, err);
    if (status == LB_OK)
        status = core_fix(system, err);
    memory_free(all);
    return status;
}

/* A system whose laws are out of reach keeps none of them. */
static void forget_laws(lb_system *system)
{
    conservation_clear(&system->laws);
    conservation_clear(&system->core_laws);
    memory_free(system->independent);
    memory_free(system->dependent);
    memory_free(system->elimination);
    memory_free(system->fixed_state);
    memory_free(system->fixed_weight);
    system->independent = system->dependent = system->fixed_state = NULL;
    system->elimination = system->fixed_weight = NULL;
    system->fixed_count = 0;
    system->rank = -1;
}

lb_status lb_system_new(const lb_network *network, lb_system **out, lb_error *err)
{
    *out = NULL;
    lb_system *system = memory_zeroed(1, sizeof *system);
    if (!system)
        return status_no_memory(err);
    system->network = network;
    system->n = network->states;
    system->m = network->constant_count;
    system->r = network->reaction_steps;
    system->steps = network->step_count;
    lb_status status = build_tables(system);
    if (status == LB_OK) {
        status = find_laws(system, err);
        system->laws_known = status == LB_OK;
    }
    if (status == LB_E_LIMIT && system->table) {
        forget_laws(system);
        status = LB_OK;
    }
    if (status != LB_OK) {
        lb_system_free(system);
        return status_raise(err, status, NULL, "%s", lb_status_text(status));
    }
    *out = system;
    return LB_OK;
}

lb_status system_require_laws(const lb_system *system, lb_error *err)
{
    if (system->laws_known)
        return LB_OK;
    return status_raise(err, LB_E_LIMIT, "a time course can still be run",
                        "the conservation laws of this network are beyond what is supported");
}

lb_status lb_system_use_native(lb_system *system, const lb_native_options *options, lb_error *err)
{
    lb_error reason = {.code = LB_OK};
    if (system->native)
        return LB_OK;
    lb_status status = native_load(system->network, system->column_start, system->row, options, &system->native, &reason);
    snprintf(system->engine_note, sizeof system->engine_note, "%s", status == LB_OK ? "" : reason.message);
    if (status != LB_OK && err)
        *err = reason;
    return status;
}

const char *lb_system_engine(const lb_system *system)
{
    return system->native ? "native" : "tables";
}

const char *lb_system_engine_note(const lb_system *system)
{
    return system->engine_note;
}

int lb_system_nonzeros(const lb_system *system)
{
    return system->nonzeros;
}

const int *lb_system_column_start(const lb_system *system)
{
    return system->column_start;
}

const int *lb_system_rows(const lb_system *system)
{
    return system->row;
}

int lb_system_laws(const lb_system *system)
{
    return system->laws.count;
}

const int64_t *lb_system_law(const lb_system *system, int law)
{
    return system->laws.law + (size_t)law * (size_t)system->laws.width;
}

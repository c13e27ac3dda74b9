/* Why an integration cannot go on, in words: the time, the species, and for one
 * that falls below zero the reaction that takes it away. */
#include <stdio.h>
#include <string.h>

#include "analysis/integrate_state.h"
#include "base/memory.h"
#include "base/status.h"

const char *integrate_species(const integrator *it, int state)
{
    const lb_network *network = it->system->network;
    return network->species[network->state_species[state]].name;
}

integrate_time integrate_moment(const integrator *it, double t)
{
    const unit_system *units = &it->system->network->units;
    integrate_time m;
    snprintf(m.text, sizeof m.text, "%.6g%s%.16s", t, units->none ? "" : " ", units->none ? "" : units->time_text);
    return m;
}

/* The step that takes most of a species away while there is none of it, at the
 * last accepted state; -1 when the species does not fall there. */
static int find_remover(integrator *it, int state)
{
    const lb_network *network = it->system->network;
    double *rates = memory_array((size_t)it->system->steps, sizeof *rates);
    int remover = -1;
    if (!rates)
        return -1;
    memcpy(it->x_new, it->x, (size_t)it->n * sizeof *it->x);
    it->x_new[state] = 0;
    evaluator_step_rates(it->evaluator, it->x_new, rates);
    double most = 0, total = 0;
    for (int s = 0; s < it->system->steps; s++) {
        const double *coefficients = evaluator_coefficients(it->evaluator, s);
        for (int e = 0; e < network->steps[s].entry_count; e++) {
            if (network->steps[s].entries[e].state != state)
                continue;
            double change = coefficients[e] * rates[s];
            total += change;
            if (change < most) {
                most = change;
                remover = s;
            }
        }
    }
    memory_free(rates);
    return total < 0 ? remover : -1;
}

static lb_status fail_negative(integrator *it, const char *when, lb_error *err)
{
    const char *name = integrate_species(it, it->culprit);
    int remover = find_remover(it, it->culprit);
    if (remover < 0)
        return status_raise(err, LB_E_STEP, "try a tighter tolerance",
                            "at t = %s no step keeps [%s] above minus its tolerance", when, name);
    return status_raise(err, LB_E_NEGATIVE,
                        "give that reaction a rate that vanishes with the species, or declare the species signed",
                        "[%s] falls below zero at t = %s: %s takes it away though there is none left", name, when,
                        it->system->network->steps[remover].name);
}

static lb_status fail_not_finite(const integrator *it, const char *when, lb_error *err)
{
    if (it->culprit < 0)
        return status_raise(err, LB_E_FINITE, NULL, "a rate or its derivative is not finite just after t = %s", when);
    return status_raise(err, LB_E_FINITE, "look at the rate laws of that species",
                        "the rate of change of [%s] is not finite just after t = %s",
                        integrate_species(it, it->culprit), when);
}

lb_status integrate_fail(integrator *it, lb_error *err)
{
    const integrate_time when = integrate_moment(it, it->t);
    switch (it->refused) {
    case REFUSED_NEGATIVE:
        return fail_negative(it, when.text, err);
    case REFUSED_NOT_FINITE:
        return fail_not_finite(it, when.text, err);
    case REFUSED_SINGULAR:
        return status_raise(err, LB_E_STEP, NULL, "the stiff method's matrix stays singular at t = %s", when.text);
    case REFUSED_NO_MEMORY:
        return status_no_memory(err);
    case REFUSED_ERROR:
        break;
    }
    return status_raise(err, LB_E_STEP, "the solution may grow without bound or a rate law may jump there",
                        "at t = %s no step is short enough for [%s], which is %.6g", when.text,
                        integrate_species(it, it->worst), it->x[it->worst]);
}

/* JSON of steady states, their eigenvalues and the conserved totals. */
#include "output/json.h"
#include "system/system.h"

static json_t *mode_value(json_writer *w, const lb_mode *mode)
{
    json_t *object = json_object();
    json_put(w, object, "eigenvalue", json_complex(mode->eigenvalue));
    json_put(w, object, "time", json_number(mode->time));
    json_put(w, object, "grows", json_boolean(mode->eigenvalue.re > 0));
    json_put(w, object, "period", mode->period > 0 ? json_number(mode->period) : json_null());
    json_put(w, object, "damping", mode->period > 0 ? json_number(mode->damping) : json_null());
    json_put(w, object, "error", json_number(mode->error));
    return object;
}

/* {constant: {x: {species: slope}, eigenvalue: [re, im]}} */
static json_t *sensitivities_value(json_writer *w, const lb_network *net, const lb_steady_state *state)
{
    if (!state->sensitivity)
        return json_null();
    json_t *all = json_object();
    for (int j = 0; j < lb_network_constants(net); j++) {
        json_t *one = json_object();
        json_put(w, one, "x", json_states(w, net, state->sensitivity + (size_t)j * (size_t)lb_network_states(net)));
        json_put(w, one, "eigenvalue", json_complex(state->leading_sensitivity[j]));
        json_put(w, all, lb_network_constant_name(net, j), one);
    }
    return all;
}

static json_t *state_value(json_writer *w, const lb_network *net, const lb_steady *steady, const lb_steady_state *state)
{
    json_t *eigenvalues = json_array(), *modes = json_array();
    for (int i = 0; i < steady->rank; i++)
        json_add(w, eigenvalues, json_complex(state->eigenvalues[i]));
    for (int i = 0; i < state->mode_count; i++)
        json_add(w, modes, mode_value(w, &state->modes[i]));
    json_t *object = json_object();
    json_put(w, object, "x", json_states(w, net, state->x));
    json_put(w, object, "eigenvalues", eigenvalues);
    json_put(w, object, "stable", json_answer(state->stable));
    json_put(w, object, "kind", json_text(lb_kind_text(state->kind)));
    json_put(w, object, "certified", json_false());
    json_put(w, object, "boundary", json_boolean(state->is_boundary));
    json_put(w, object, "residual", json_number(state->residual));
    json_put(w, object, "real_part_error", json_number(state->real_part_error));
    json_put(w, object, "routh_hurwitz_agrees", json_boolean(state->routh_hurwitz_agrees));
    json_put(w, object, "modes", modes);
    json_put(w, object, "sensitivities", sensitivities_value(w, net, state));
    return object;
}

static json_t *totals_value(json_writer *w, const lb_system *system, const double *total)
{
    const lb_network *net = system->network;
    json_t *list = json_array();
    for (int i = 0; i < lb_system_laws(system); i++) {
        const int64_t *coefficient = lb_system_law(system, i);
        json_t *law = json_object(), *object = json_object();
        for (int s = 0; s < net->states; s++)
            if (coefficient[s] != 0)
                json_put(w, law, lb_network_state_name(net, s), json_integer(coefficient[s]));
        json_put(w, object, "law", law);
        json_put(w, object, "total", json_number(total[i]));
        json_add(w, list, object);
    }
    return list;
}

void json_put_steady(json_writer *w, const lb_system *system, const lb_steady *steady)
{
    json_t *states = json_array(), *effort = json_object();
    for (size_t i = 0; i < steady->count; i++)
        json_add(w, states, state_value(w, system->network, steady, &steady->state[i]));
    json_put(w, effort, "starts", json_count(steady->starts));
    json_put(w, effort, "converged", json_count(steady->converged));
    json_put(w, w->root, "steady_states", states);
    json_put(w, w->root, "complete", json_text("searched"));
    json_put(w, w->root, "conservation_totals", totals_value(w, system, steady->total));
    json_put(w, w->root, "accumulating", json_flagged(w, system->network, steady->accumulating));
    json_put(w, w->root, "rank", json_integer(steady->rank));
    json_put(w, w->root, "zero_eigenvalues", json_integer(steady->zero_eigenvalues));
    json_put(w, w->root, "continuum", json_integer(steady->continuum));
    json_put(w, w->root, "all_faces", json_boolean(steady->all_faces));
    json_put(w, w->root, "effort", effort);
    json_put(w, w->root, "interrupted", json_boolean(steady->interrupted));
}

static json_t *special_value(json_writer *w, const lb_network *net, const lb_special *special)
{
    json_t *object = json_object();
    json_put(w, object, "kind", json_text(lb_special_text(special->kind)));
    json_put(w, object, "value", json_number(special->value));
    json_put(w, object, "x", json_states(w, net, special->x));
    json_put(w, object, "omega", special->kind == LB_HOPF ? json_number(special->omega) : json_null());
    return object;
}

static void put_along(json_writer *w, const lb_network *net, const lb_along *along)
{
    json_t *list = json_array(), *object = json_object();
    for (size_t i = 0; i < along->count; i++)
        json_add(w, list, special_value(w, net, &along->special[i]));
    json_put(w, object, "constant", json_text(lb_network_constant_name(net, along->constant)));
    json_put(w, object, "low", json_number(along->low));
    json_put(w, object, "high", json_number(along->high));
    json_put(w, object, "branches", json_count(along->branches));
    json_put(w, object, "points", json_count(along->points));
    json_put(w, object, "interrupted", json_boolean(along->interrupted));
    json_put(w, w->root, "special", list);
    json_put(w, w->root, "along", object);
}

lb_status lb_json_steady(const lb_system *system, const lb_diagnostics *diagnostics, const lb_steady *steady,
                         const lb_along *along, lb_text *out)
{
    json_writer w;
    json_begin(&w, "steady", system->network->file, diagnostics);
    json_put_steady(&w, system, steady);
    if (along)
        put_along(&w, system->network, along);
    json_put_engine(&w, system);
    return json_finish(&w, out);
}

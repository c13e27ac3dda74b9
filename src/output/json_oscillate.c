/* JSON of the verdict on oscillation, and of the page, which holds all answers. */
#include "output/json.h"
#include "system/system.h"

static json_t *amplitude_value(json_writer *w, const lb_network *net, const lb_cycle *cycle)
{
    json_t *object = json_object();
    for (int i = 0; i < cycle->states; i++) {
        json_t *pair = json_array();
        json_add(w, pair, json_number(cycle->low[i]));
        json_add(w, pair, json_number(cycle->high[i]));
        json_put(w, object, lb_network_state_name(net, i), pair);
    }
    return object;
}

static json_t *constants_value(json_writer *w, const lb_network *net, const double *k)
{
    json_t *object = json_object();
    for (int i = 0; i < net->constant_count; i++)
        json_put(w, object, net->constants[i].name, json_number(k[i]));
    return object;
}

static json_t *witness_value(json_writer *w, const lb_network *net, const lb_oscillate_answer *answer)
{
    const lb_cycle *cycle = answer->cycle;
    json_t *multipliers = json_array();
    for (int i = 0; i < cycle->multiplier_count; i++)
        json_add(w, multipliers, json_complex(cycle->multipliers[i]));
    json_t *object = json_object();
    json_put(w, object, "constants", constants_value(w, net, answer->k));
    json_put(w, object, "x", json_states(w, net, cycle->x));
    if (answer->start)
        json_put(w, object, "start", json_states(w, net, answer->start));
    json_put(w, object, "period", json_number(cycle->period));
    json_put(w, object, "amplitude", amplitude_value(w, net, cycle));
    json_put(w, object, "multipliers", multipliers);
    json_put(w, object, "stable", json_answer(cycle->stable));
    json_put(w, object, "closure", json_number(cycle->closure));
    json_put(w, object, "confirmed", json_number(cycle->confirmed));
    json_put(w, object, "method", json_text(cycle->method ? cycle->method : ""));
    json_put(w, object, "file", answer->witness ? json_text(answer->witness) : json_null());
    return object;
}

static json_t *transient_value(json_writer *w, const lb_network *net, const lb_oscillate_answer *answer)
{
    json_t *object = json_object();
    json_put(w, object, "swings", json_integer(answer->swings));
    json_put(w, object, "decay", json_number(answer->swing_decay));
    if (answer->swing_species >= 0)
        json_put(w, object, "species", json_text(lb_network_state_name(net, answer->swing_species)));
    return object;
}

static json_t *effort_value(json_writer *w, const lb_oscillate_answer *answer)
{
    json_t *object = json_object();
    json_put(w, object, "samples", json_count(answer->samples));
    json_put(w, object, "seconds", json_number(answer->seconds));
    json_put(w, object, "method", json_text(answer->method ? answer->method : ""));
    json_put(w, object, "steady_states", json_count(answer->steady));
    json_put(w, object, "unstable", json_count(answer->unstable));
    json_put(w, object, "integrations", json_count(answer->integrations));
    return object;
}

static json_t *answer_value(json_writer *w, const lb_network *net, const lb_oscillate_answer *answer)
{
    json_t *object = json_object();
    json_put(w, object, "scope", json_text(lb_scope_text(answer->scope)));
    json_put(w, object, "verdict", json_text(lb_verdict_text(answer->verdict)));
    json_put(w, object, "basis", json_text(answer->cycle ? "witness" : "search"));
    if (answer->cycle)
        json_put(w, object, "witness", witness_value(w, net, answer));
    if (answer->swings > 0)
        json_put(w, object, "transient", transient_value(w, net, answer));
    json_put(w, object, "effort", effort_value(w, answer));
    json_put(w, object, "keeps_moving", json_boolean(answer->keeps_moving));
    json_put(w, object, "runs_away", json_boolean(answer->runs_away));
    json_put(w, object, "limits", json_text(answer->limits ? answer->limits : ""));
    json_put(w, object, "interrupted", json_boolean(answer->interrupted));
    return object;
}

void json_put_oscillate(json_writer *w, const lb_system *system, const lb_oscillate *oscillate)
{
    json_t *answers = json_array();
    for (size_t i = 0; i < oscillate->count; i++)
        json_add(w, answers, answer_value(w, system->network, &oscillate->answer[i]));
    json_put(w, w->root, "answers", answers);
}

lb_status lb_json_oscillate(const lb_system *system, const lb_diagnostics *diagnostics, const lb_oscillate *oscillate,
                            lb_text *out)
{
    json_writer w;
    json_begin(&w, "oscillate", system->network->file, diagnostics);
    json_put_oscillate(&w, system, oscillate);
    json_put_engine(&w, system);
    return json_finish(&w, out);
}

lb_status lb_json_page(const lb_system *system, const lb_diagnostics *diagnostics, const lb_oscillate *oscillate,
                       lb_text *out)
{
    json_writer w;
    json_begin(&w, "page", system->network->file, diagnostics);
    json_put_check(&w, system->network);
    if (oscillate->steady)
        json_put_steady(&w, system, oscillate->steady);
    json_put_oscillate(&w, system, oscillate);
    json_put_engine(&w, system);
    return json_finish(&w, out);
}

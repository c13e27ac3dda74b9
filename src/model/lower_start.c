/* Warnings about the start: species that are zero there and stay so.
 *
 * What is present at the start, and what can be made from it, is found by
 * following the steps: a step runs when everything that its rate vanishes with
 * is present.  A species that is never reached stays zero, and so does each one
 * of a conserved total that is zero.  The set of such species is a siphon
 * (Angeli, De Leenheer and Sontag 2007, Math. Biosci. 210, 598): the start lies
 * on a face that the trajectory cannot leave. */
#include <math.h>
#include <string.h>

#include "exact/conservation.h"
#include "model/lower.h"
#include "model/probe.h"

enum { LAWS_UP_TO = 200, SHOWN = 6 };   /* conservation laws only for so many species */

struct reach {
    lower *l;
    const lb_network *net;
    probe p;
    unsigned char *is_zero;     /* [states] not reached so far */
    unsigned char *is_made;     /* [states] some step makes it */
    unsigned char *is_done;     /* [steps] has run */
    int *start, *user;          /* steps whose rate may depend on state i: user[start[i]..start[i+1]) */
    int *queue;                 /* [states] reached, to be followed */
    int queued;
};

/* ---- Which steps look at which states ---------------------------------------------------------- */

/* States in the rate of a step: of a power law those of its orders. */
static int dependencies(struct reach *r, int step, const int **states)
{
    const network_step *s = &r->net->steps[step];
    if (s->is_power_law)
        return s->order_count;
    if (probe_take(&r->p, s->rate) != LB_OK)
        lower_no_memory(r->l);
    *states = r->p.states;
    return (int)r->p.state_count;
}

static int dependency(const struct reach *r, int step, const int *states, int i)
{
    const network_step *s = &r->net->steps[step];
    return s->is_power_law ? s->orders[i].state : states[i];
}

static bool index_users(struct reach *r)
{
    const int *states = NULL;
    size_t total = 0;
    r->start = memory_zeroed((size_t)r->net->states + 2, sizeof *r->start);
    for (int s = 0; s < r->net->step_count && r->start && r->l->status == LB_OK; s++) {
        int count = dependencies(r, s, &states);
        for (int i = 0; i < count; i++)
            r->start[dependency(r, s, states, i) + 2]++;
        total += (size_t)count;
    }
    r->user = memory_array(total, sizeof *r->user);
    if (!r->start || !r->user || r->l->status != LB_OK)
        return lower_no_memory(r->l);
    for (int i = 0; i < r->net->states; i++)
        r->start[i + 2] += r->start[i + 1];
    for (int s = 0; s < r->net->step_count && r->l->status == LB_OK; s++) {
        int count = dependencies(r, s, &states);
        for (int i = 0; i < count; i++)
            r->user[r->start[dependency(r, s, states, i) + 1]++] = s;
    }
    return r->l->status == LB_OK;
}

/* ---- What can be reached ---------------------------------------------------------------------------- */

static void reach_state(struct reach *r, int state)
{
    if (!r->is_zero[state])
        return;
    r->is_zero[state] = 0;
    r->queue[r->queued++] = state;
}

/* Signs of the rate with what is absent (NULL: nothing) at zero: 1 positive, 2 negative, 3 either. */
static int signs_of_rate(struct reach *r, int step, const unsigned char *is_absent)
{
    const network_step *s = &r->net->steps[step];
    int signs = 0;
    for (int i = 0; s->is_power_law && is_absent && i < s->order_count; i++)
        if (s->orders[i].order > 0 && is_absent[s->orders[i].state])
            return 0;
    if (probe_take(&r->p, s->rate) != LB_OK) {
        lower_no_memory(r->l);
        return 0;
    }
    for (int point = 0; point < PROBE_POINTS; point++) {
        double v = probe_value(&r->p, point, is_absent, -1);
        signs |= isnan(v) ? 3 : v > 0 ? 1 : v < 0 ? 2 : 0;
    }
    return signs;
}

/* Net coefficients that are expressions belong to products. */
static bool is_gain(const network_entry *e)
{
    return e->expression != EXPRESSION_NONE || e->num > 0;
}

static void run_step(struct reach *r, int step)
{
    const network_step *s = &r->net->steps[step];
    int signs = r->is_done[step] == 3 ? 0 : signs_of_rate(r, step, r->is_zero) & ~r->is_done[step];
    r->is_done[step] |= (unsigned char)signs;
    for (int i = 0; signs && i < s->entry_count; i++) {
        if (signs & (is_gain(&s->entries[i]) ? 1 : 2))
            reach_state(r, s->entries[i].state);
    }
}

static void follow(struct reach *r)
{
    for (int i = 0; i < r->queued && r->p.work < PROBE_LIMIT; i++)
        for (int u = r->start[r->queue[i]]; u < r->start[r->queue[i] + 1]; u++)
            run_step(r, r->user[u]);
    r->queued = 0;
}

/* What is there at the start, and what follows from it. */
static void explore(struct reach *r)
{
    memset(r->is_zero, 1, (size_t)r->net->states);
    for (int i = 0; i < r->net->states; i++) {
        const network_species *s = &r->net->species[r->net->state_species[i]];
        if (s->is_signed || s->initial_value != 0)
            reach_state(r, i);
    }
    for (int s = 0; s < r->net->step_count && r->l->status == LB_OK; s++)
        run_step(r, s);
    follow(r);
}

/* A species that some step makes; a law that changes its sign makes both sides. */
static void mark_made(struct reach *r)
{
    for (int s = 0; s < r->net->step_count && r->l->status == LB_OK; s++) {
        const network_step *step = &r->net->steps[s];
        int signs = step->is_power_law ? 1 : signs_of_rate(r, s, NULL);
        for (int i = 0; i < step->entry_count; i++)
            if (signs & (is_gain(&step->entries[i]) ? 1 : 2))
                r->is_made[step->entries[i].state] = 1;
    }
}

/* ---- The warnings -------------------------------------------------------------------------------------- */

static const network_species *species_of(const struct reach *r, int state)
{
    return &r->net->species[r->net->state_species[state]];
}

static span place_of(const struct reach *r, int state)
{
    return r->l->species[lower_find_species(r->l, species_of(r, state)->name)].where;
}

/* "`X`, `Y` and 3 more" of the states that are marked. */
static const char *list_states(const struct reach *r, const unsigned char *is_listed, int count)
{
    const char *list = "";
    int shown = 0;
    for (int i = 0; i < r->net->states && shown < SHOWN; i++) {
        if (!is_listed[i])
            continue;
        const char *between = shown == 0 ? "" : shown == count - 1 ? " and " : ", ";
        list = lower_text(r->l, "%s%s`%s`", list, between, species_of(r, i)->name);
        shown++;
    }
    return count > shown ? lower_text(r->l, "%s and %d more", list, count - shown) : list;
}

/* Never made and zero: as good as not there. */
static void warn_unmade(struct reach *r)
{
    for (int i = 0; i < r->net->states; i++) {
        if (!r->is_zero[i] || r->is_made[i])
            continue;
        const lower_species *p = &r->l->species[lower_find_species(r->l, species_of(r, i)->name)];
        diagnostics_warn(
            r->l->list, p->where,
            lower_text(r->l, "give it an initial concentration, `%s = ...`", lower_bracket(r->l, p->name, "0")),
            "nothing makes `%s`, and it starts at zero", p->name);
        reach_state(r, i);
    }
}

/* One conserved total that is zero: all its species are zero, for ever. */
static void warn_total(struct reach *r, const int64_t *law)
{
    const char *sum = "";
    int first = -1;
    for (int i = 0; i < r->net->states; i++)
        if (law[i] != 0 && !r->is_zero[i])
            return;
    for (int i = 0; i < r->net->states; i++) {
        if (law[i] == 0)
            continue;
        const char *factor = law[i] == 1 ? "" : lower_text(r->l, "%lld ", (long long)law[i]);
        sum = lower_text(r->l, "%s%s%s%s", sum, first < 0 ? "" : " + ", factor, species_of(r, i)->bracket);
        first = first < 0 ? i : first;
    }
    diagnostics_warn(r->l->list, place_of(r, first), "give one of them an initial concentration",
                     "the conserved total %s is zero at the start, so its species stay zero", sum);
    for (int i = 0; i < r->net->states; i++)
        if (law[i] != 0)
            reach_state(r, i);
}

static void warn_totals(struct reach *r)
{
    conservation laws;
    int *states = memory_array((size_t)r->net->states, sizeof *states);
    if (!states) {
        lower_no_memory(r->l);
        return;
    }
    for (int i = 0; i < r->net->states; i++)
        states[i] = i;
    lb_status status = conservation_find(r->net, states, r->net->states, NULL, &laws, NULL);
    if (status == LB_E_NOMEM)
        lower_no_memory(r->l);
    for (int i = 0; status == LB_OK && i < laws.semipositive; i++)
        warn_total(r, laws.law + (size_t)i * (size_t)laws.width);
    if (status == LB_OK)
        conservation_clear(&laws);
    memory_free(states);
}

static int count_zero(const struct reach *r)
{
    int count = 0;
    for (int i = 0; i < r->net->states; i++)
        count += r->is_zero[i];
    return count;
}

static void warn_face(struct reach *r)
{
    int count = count_zero(r), first = 0;
    if (count == 0)
        return;
    while (!r->is_zero[first])
        first++;
    diagnostics_warn(r->l->list, place_of(r, first),
                     count == 1 ? "give it an initial concentration"
                                : "give one of them an initial concentration",
                     "nothing that is there at the start can make %s, so %s zero",
                     list_states(r, r->is_zero, count), count == 1 ? "it stays" : "they stay");
}

/* Products that go nowhere: in no rate, in no reading, on no left side. */
static void warn_unused(struct reach *r)
{
    unsigned char *is_unused = r->is_made;      /* no longer needed: reused for this list */
    int count = 0, first = -1;
    for (int i = 0; i < r->net->states; i++) {
        const lower_species *p = &r->l->species[lower_find_species(r->l, species_of(r, i)->name)];
        is_unused[i] = !p->is_used && !p->is_read && (!r->net->is_tank || p->is_retained);
        first = is_unused[i] && first < 0 ? i : first;
        count += is_unused[i];
    }
    if (count > 0)
        diagnostics_warn(r->l->list, place_of(r, first), NULL, "nothing uses %s: %s",
                         list_states(r, is_unused, count),
                         count == 1 ? "it only accumulates" : "they only accumulate");
}

/* ---- All of it ------------------------------------------------------------------------------------------- */

static bool begin(struct reach *r, lower *l)
{
    size_t states = (size_t)l->net->states;
    *r = (struct reach){.l = l, .net = l->net};
    r->is_zero = memory_zeroed(states, 1);
    r->is_made = memory_zeroed(states, 1);
    r->is_done = memory_zeroed((size_t)l->net->step_count, 1);
    r->queue = memory_array(states, sizeof *r->queue);
    if (!r->is_zero || !r->is_made || !r->is_done || !r->queue || probe_init(&r->p, l->net) != LB_OK)
        return lower_no_memory(l);
    return index_users(r);
}

static void end(struct reach *r)
{
    memory_free(r->is_zero);
    memory_free(r->is_made);
    memory_free(r->is_done);
    memory_free(r->start);
    memory_free(r->user);
    memory_free(r->queue);
    probe_clear(&r->p);
}

void lower_start_warnings(lower *l)
{
    struct reach r;
    if (begin(&r, l)) {
        explore(&r);
        mark_made(&r);
        warn_unmade(&r);
        if (count_zero(&r) > 0 && r.net->states <= LAWS_UP_TO && l->status == LB_OK)
            warn_totals(&r);
        follow(&r);
        if (r.p.work < PROBE_LIMIT && l->status == LB_OK)
            warn_face(&r);
        if (l->status == LB_OK)
            warn_unused(&r);
    }
    end(&r);
}

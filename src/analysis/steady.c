/* All steady states in one compatibility class.
 *
 * The core's equations are searched for positive roots; then each face that
 * trajectories cannot leave is searched in the same way with its species set to
 * zero, and within each face the faces of the network that is left on it, so
 * that in the end every siphon has had its turn.  Species set aside get the value
 * that the laws of the whole network give them.
 *
 * Source: M. Feinberg, Foundations of Chemical Reaction Network Theory (2019),
 * chapters 3 and 18 (compatibility classes, boundary steady states). */
#include <math.h>
#include <string.h>

#include "analysis/equations.h"
#include "analysis/faces.h"
#include "analysis/flux.h"
#include "analysis/roots.h"
#include "analysis/sensitivity.h"
#include "analysis/stability.h"
#include "analysis/starts.h"
#include "base/memory.h"
#include "base/status.h"
#include "limbeck.h"
#include "system/system.h"

enum { FULL_FACES = 32 };

struct search {
    const lb_system *system;
    const lb_steady_options *options;
    lb_evaluator *evaluator;
    double *x0;             /* [n] */
    double *bound;          /* [n] see starts.h */
    double slack;           /* a species set aside is zero to rounding of the totals above minus this */
    equations_laws laws;
    faces faces;
    faces continua;         /* those that have a continuum of steady states */
    size_t continuum_state; /* the one state of out that stands for it, when out->continuum > 0 */
    lb_steady *out;
    size_t capacity;        /* of out->state */
    lb_error *err;
};

/* ---- One state ------------------------------------------------------------------------ */

static void state_clear(lb_steady_state *state)
{
    memory_free(state->x);
    memory_free(state->eigenvalues);
    memory_free(state->modes);
    memory_free(state->sensitivity);
    memory_free(state->leading_sensitivity);
}

/* A species set aside that comes out negative: the class ends before this state. */
static bool is_in_class(const struct search *s, const double *x)
{
    const lb_network *net = s->system->network;
    for (int i = 0; i < s->system->n; i++)
        if (s->system->core_index[i] < 0 && !net->species[net->state_species[i]].is_signed &&
            x[i] < 0)
            return false;
    return true;
}

static void complete(const struct search *s, double *x)
{
    system_complete(s->system, s->x0, x);
    const lb_network *net = s->system->network;
    for (int i = 0; i < s->system->n; i++)
        if (s->system->core_index[i] < 0 && !net->species[net->state_species[i]].is_signed && x[i] < 0 &&
            x[i] >= -s->slack)
            x[i] = 0;
}

static lb_status add_state(struct search *s, equations *eq, const double *u)
{
    lb_steady *out = s->out;
    lb_steady_state state = {.is_boundary = eq->count < s->system->core};
    size_t bytes = (size_t)s->system->n * sizeof *state.x;
    state.x = memory_alloc(bytes);
    if (!state.x)
        return status_no_memory(s->err);
    equations_place(eq, u);
    memcpy(state.x, eq->x, bytes);
    state.residual = equations_balance_error(eq, u);
    complete(s, state.x);
    lb_status status = LB_OK;
    if (!is_in_class(s, state.x))
        goto done;
    status = stability_classify(s->evaluator, &state, s->err);
    if (status == LB_E_FINITE) {
        status = LB_OK;     /* out there where derivatives overflow nothing is a state */
        goto done;
    }
    if (status == LB_OK && memory_grow(&out->state, &s->capacity, out->count, sizeof *out->state) != 0)
        status = status_no_memory(s->err);
    if (status == LB_OK) {
        out->state[out->count++] = state;
        return LB_OK;
    }
done:
    state_clear(&state);
    return status;
}

/* ---- Faces -------------------------------------------------------------------------------- */

/* The class itself lies on a face when a positive law has the total zero. */
static lb_status add_first_face(struct search *s)
{
    bool *is_zero = memory_zeroed((size_t)s->system->n, sizeof *is_zero);
    if (!is_zero)
        return status_no_memory(s->err);
    for (int i = 0; i < s->system->n; i++)
        is_zero[i] = s->system->core_index[i] >= 0 && s->bound[i] <= 0;
    lb_status status = faces_add(&s->faces, is_zero, s->err);
    memory_free(is_zero);
    return status;
}

/* A quarter on the later ones of many faces. */
static size_t starts_for(const struct search *s, int unknowns, int face)
{
    size_t count = s->options->starts, n = (size_t)unknowns;
    if (count == 0)
        count = n <= 15 ? 40 + 20 * n : n <= 640 ? 5100 / n : 8;
    return face < FULL_FACES || count <= 6 ? count : count / 4 > 6 ? count / 4 : 6;
}

static bool is_within(int n, const bool *is_zero, const bool *outer)
{
    for (int i = 0; i < n; i++)
        if (outer[i] && !is_zero[i])
            return false;
    return true;
}

/* The largest concentration of the state that stands for the continua. */
static double continuum_scale(const struct search *s)
{
    double scale = 0;
    const double *x = s->out->continuum > 0 ? s->out->state[s->continuum_state].x : NULL;
    for (int c = 0; x && c < s->system->core; c++)
        scale = fmax(scale, fabs(x[s->system->core_state[c]]));
    return scale > 0 ? scale : 1;
}

/* A state on a face within a face that has a continuum may be the end of that. */
static lb_status ends_continuum(struct search *s, const bool *is_zero, equations *eq, const double *u, bool *is_end)
{
    lb_status status = LB_OK;
    *is_end = false;
    for (int c = 0; status == LB_OK && c < s->continua.count && !*is_end; c++) {
        equations *outer = NULL;
        if (!is_within(s->system->n, is_zero, s->continua.is_zero[c]))
            continue;
        status = equations_new(s->evaluator, &s->laws, s->x0, s->continua.is_zero[c], &outer, s->err);
        equations_place(eq, u);
        if (status == LB_OK)
            status = roots_end_at(outer, eq->x, continuum_scale(s), is_end, s->err);
        equations_free(outer);
    }
    return status;
}

/* One state stands for all continua: a point of the first one of the highest
 * dimension. */
static lb_status add_continuum(struct search *s, const bool *is_zero, equations *eq, const double *u, int extent)
{
    lb_steady *out = s->out;
    lb_status status = faces_add(&s->continua, is_zero, s->err);
    if (status != LB_OK || extent <= out->continuum)
        return status;
    size_t before = out->count;
    status = add_state(s, eq, u);
    if (status != LB_OK || out->count == before)
        return status;
    if (out->continuum > 0) {
        state_clear(&out->state[s->continuum_state]);
        out->state[s->continuum_state] = out->state[--out->count];
    } else {
        s->continuum_state = before;
    }
    out->continuum = extent;
    return LB_OK;
}

static lb_status add_states(struct search *s, const bool *is_zero, equations *eq, const roots *found)
{
    lb_status status = LB_OK;
    for (int i = 0; status == LB_OK && i < found->count; i++) {
        bool is_end = false;
        status = ends_continuum(s, is_zero, eq, found->u[i], &is_end);
        if (status != LB_OK || is_end)
            continue;
        if (found->continuum > 0 && i == found->continuum_root)
            status = add_continuum(s, is_zero, eq, found->u[i], found->continuum);
        else
            status = add_state(s, eq, found->u[i]);
    }
    return status;
}

static lb_status search_roots(struct search *s, const bool *is_zero, int face, equations *eq)
{
    roots found = {0};
    roots_options options = {.starts = starts_for(s, eq->count, face),
                             .is_fixed = s->options->starts > 0,
                             .seed = s->options->seed,
                             .x0 = s->x0,
                             .bound = s->bound,
                             .monitor = s->options->monitor};
    lb_status status = roots_find(eq, &options, &found, s->err);
    if (status == LB_OK)
        status = add_states(s, is_zero, eq, &found);
    s->out->starts += found.starts;
    s->out->converged += found.converged;
    s->out->interrupted = s->out->interrupted || found.interrupted;
    roots_clear(&found);
    return status;
}

/* The roots of a face, then the faces within it.  Nothing lies within a face that
 * the totals forbid. */
static lb_status search_face(struct search *s, const bool *is_zero, int face, bool *must_vanish)
{
    equations *eq = NULL;
    bool is_possible = false;
    lb_status status = equations_new(s->evaluator, &s->laws, s->x0, is_zero, &eq, s->err);
    if (status != LB_OK || eq->is_inconsistent)
        goto done;
    status = flux_check(eq, &is_possible, must_vanish, s->err);
    if (status == LB_OK && is_possible)
        status = search_roots(s, is_zero, face, eq);
    if (status == LB_OK && !s->options->skip_boundary && !s->out->interrupted)
        status = faces_find(eq, is_zero, is_possible ? NULL : must_vanish, &s->faces, s->err);
done:
    equations_free(eq);
    return status;
}

/* The list grows while it is walked: the faces of a face come behind it. */
static lb_status search_faces(struct search *s)
{
    bool *must_vanish = memory_array((size_t)s->system->steps, sizeof *must_vanish);
    lb_status status = must_vanish ? add_first_face(s) : status_no_memory(s->err);
    for (int i = 0; status == LB_OK && i < s->faces.count && !s->out->interrupted; i++)
        status = search_face(s, s->faces.is_zero[i], i, must_vanish);
    memory_free(must_vanish);
    return status;
}

/* ---- The result ------------------------------------------------------------------------------ */

/* Positive states first, then by falling concentrations. */
static int compare_states(const lb_steady_state *a, const lb_steady_state *b, int n)
{
    if (a->is_boundary != b->is_boundary)
        return a->is_boundary ? 1 : -1;
    for (int i = 0; i < n; i++)
        if (a->x[i] != b->x[i] && !isnan(a->x[i]) && !isnan(b->x[i]))
            return a->x[i] > b->x[i] ? -1 : 1;
    return 0;
}

static void sort_states(lb_steady *out)
{
    for (size_t i = 1; i < out->count; i++) {
        lb_steady_state state = out->state[i];
        size_t place = i;
        for (; place > 0 && compare_states(&out->state[place - 1], &state, out->states) > 0; place--)
            out->state[place] = out->state[place - 1];
        out->state[place] = state;
    }
}

static lb_status describe_class(struct search *s)
{
    const lb_system *system = s->system;
    lb_steady *out = s->out;
    out->states = system->n;
    out->rank = system->rank;
    out->zero_eigenvalues = system->core - system->rank;
    out->law_count = lb_system_laws(system);
    out->total = memory_zeroed((size_t)out->law_count, sizeof *out->total);
    out->accumulating = memory_zeroed((size_t)system->n, sizeof *out->accumulating);
    double *x = memory_array((size_t)system->n, sizeof *x);
    if (!out->total || !out->accumulating || !x) {
        memory_free(x);
        return status_no_memory(s->err);
    }
    for (int law = 0; law < out->law_count; law++)
        for (int i = 0; i < system->n; i++)
            out->total[law] += (double)lb_system_law(system, law)[i] * s->x0[i];
    memcpy(x, s->x0, (size_t)system->n * sizeof *x);
    system_complete(system, s->x0, x);
    for (int i = 0; i < system->n; i++)
        out->accumulating[i] = isnan(x[i]);
    memory_free(x);
    return LB_OK;
}

/* ---- The question --------------------------------------------------------------------------------- */

static lb_status check_x0(const struct search *s)
{
    const lb_network *net = s->system->network;
    for (int i = 0; i < s->system->n; i++) {
        const network_species *species = &net->species[net->state_species[i]];
        if (!isfinite(s->x0[i]) || (s->x0[i] < 0 && !species->is_signed))
            return status_raise(s->err, LB_E_ARG, "give a concentration of zero or more",
                                "[%s] = %g cannot define the class of steady states", species->name, s->x0[i]);
    }
    return LB_OK;
}

static lb_status prepare(struct search *s)
{
    size_t n = (size_t)s->system->n;
    lb_status status = lb_evaluator_new(s->system, &s->evaluator, s->err);
    if (status == LB_OK)
        status = lb_evaluator_bind(s->evaluator, s->options->k, s->err);
    if (status != LB_OK)
        return status;
    s->x0 = memory_array(n, sizeof *s->x0);
    s->bound = memory_array(n, sizeof *s->bound);
    if (!s->x0 || !s->bound)
        return status_no_memory(s->err);
    if (s->options->x0)
        memcpy(s->x0, s->options->x0, n * sizeof *s->x0);
    else
        lb_initial(s->evaluator, s->x0);
    status = check_x0(s);
    if (status != LB_OK)
        return status;
    for (int i = 0; i < s->system->n; i++)
        s->slack = fmax(s->slack, 1e-9 * fabs(s->x0[i]));
    starts_bounds(s->system, s->x0, s->bound);
    return equations_laws_init(&s->laws, s->evaluator, s->x0, s->err);
}

lb_status lb_steady_solve(const lb_system *system, const lb_steady_options *options, lb_steady **out, lb_error *err)
{
    static const lb_steady_options defaults = {0};
    *out = NULL;
    struct search s = {.system = system, .options = options ? options : &defaults, .err = err};
    faces_init(&s.faces, system->n);
    faces_init(&s.continua, system->n);
    s.out = memory_zeroed(1, sizeof *s.out);
    lb_status status = s.out ? system_require_laws(system, err) : status_no_memory(err);
    if (status == LB_OK)
        status = prepare(&s);
    if (status == LB_OK)
        status = describe_class(&s);
    if (status == LB_OK)
        status = search_faces(&s);
    for (size_t i = 0; status == LB_OK && s.options->sensitivities && i < s.out->count; i++)
        status = sensitivity_find(s.evaluator, &s.out->state[i], s.options->x0, err);
    if (status == LB_OK) {
        sort_states(s.out);
        s.out->all_faces = s.faces.is_complete && !s.out->interrupted;
        *out = s.out;
        s.out = NULL;
    }
    lb_steady_free(s.out);
    equations_laws_clear(&s.laws);
    faces_clear(&s.continua);
    faces_clear(&s.faces);
    memory_free(s.bound);
    memory_free(s.x0);
    lb_evaluator_free(s.evaluator);
    return status;
}

void lb_steady_free(lb_steady *steady)
{
    if (!steady)
        return;
    for (size_t i = 0; i < steady->count; i++)
        state_clear(&steady->state[i]);
    memory_free(steady->state);
    memory_free(steady->total);
    memory_free(steady->accumulating);
    memory_free(steady);
}

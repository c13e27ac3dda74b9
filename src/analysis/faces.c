/* Siphons by branching.
 *
 * A set Z of species is a siphon when each step that changes one of them needs
 * one of them: then they stay zero once they all are.  From each species, a step
 * that violates this is repaired by adding one of the species that it needs, in
 * every way; a step that needs none closes the branch.  Sets that contain another
 * are thrown away.  Where some step is known to be dead in every steady state, only
 * the siphons that kill it are wanted.  What a step needs is found by evaluating its rate with each
 * species zero in turn, so general rate laws count as well as mass action.
 *
 * Source: D. Angeli, P. De Leenheer and E. D. Sontag, Math. Biosci. 210 (2007)
 * 598 (siphons and faces); the search is plain branch and bound. */
#include "analysis/faces.h"

#include <string.h>

#include "base/memory.h"
#include "base/status.h"

enum { MOST_NODES = 20000, MOST_FACES = 400 };

struct search {
    const lb_system *system;
    const bool *is_outside;     /* [n] zero already */
    const bool *is_alive;       /* [steps] */
    int *need_start, *need;     /* states that each step needs: [steps+1], [need_start[steps]] */
    bool *is_in;                /* [n] the set in hand */
    faces *found;               /* without the outside */
    int nodes;
    lb_error *err;
};

/* ---- Lists of sets -------------------------------------------------------------------- */

void faces_init(faces *f, int n)
{
    *f = (faces){.n = n, .is_complete = true};
}

void faces_clear(faces *f)
{
    for (int i = 0; i < f->count; i++)
        memory_free(f->is_zero[i]);
    memory_free(f->is_zero);
    faces_init(f, f->n);
}

lb_status faces_add(faces *f, const bool *is_zero, lb_error *err)
{
    size_t bytes = (size_t)f->n * sizeof *is_zero;
    for (int i = 0; i < f->count; i++)
        if (memcmp(f->is_zero[i], is_zero, bytes) == 0)
            return LB_OK;
    if (f->count >= MOST_FACES) {
        f->is_complete = false;
        return LB_OK;
    }
    if (memory_grow(&f->is_zero, &f->capacity, (size_t)f->count, sizeof *f->is_zero) != 0)
        return status_no_memory(err);
    bool *copy = memory_alloc(bytes);
    if (!copy)
        return status_no_memory(err);
    memcpy(copy, is_zero, bytes);
    f->is_zero[f->count++] = copy;
    return LB_OK;
}

/* Is `small` part of `large`? */
static bool is_subset(int n, const bool *small, const bool *large)
{
    for (int i = 0; i < n; i++)
        if (small[i] && !large[i])
            return false;
    return true;
}

/* Keep only minimal sets. */
static lb_status add_minimal(faces *f, const bool *set, lb_error *err)
{
    int kept = 0;
    for (int i = 0; i < f->count; i++)
        if (is_subset(f->n, f->is_zero[i], set))
            return LB_OK;
    for (int i = 0; i < f->count; i++) {
        if (is_subset(f->n, set, f->is_zero[i]))
            memory_free(f->is_zero[i]);
        else
            f->is_zero[kept++] = f->is_zero[i];
    }
    f->count = kept;
    return faces_add(f, set, err);
}

/* ---- What steps need --------------------------------------------------------------------- */

static bool may_vanish(const struct search *s, int state)
{
    const lb_network *net = s->system->network;
    return s->system->core_index[state] >= 0 && !s->is_outside[state] &&
           !net->species[net->state_species[state]].is_signed;
}

struct pair {
    int step, state;
};

/* With each state zero in turn, beside the face: the steps that die need it. */
static lb_status collect_needs(const struct search *s, lb_evaluator *evaluator, bool *is_zero, bool *is_alive,
                               struct pair **pairs, int *count)
{
    size_t capacity = 0, bytes = (size_t)s->system->n * sizeof *is_zero;
    for (int i = 0; i < s->system->n; i++) {
        if (!may_vanish(s, i))
            continue;
        memcpy(is_zero, s->is_outside, bytes);
        is_zero[i] = true;
        lb_status status = equations_find_alive(evaluator, is_zero, is_alive, s->err);
        if (status != LB_OK)
            return status;
        for (int step = 0; step < s->system->steps; step++) {
            if (!s->is_alive[step] || is_alive[step])
                continue;
            if (memory_grow(pairs, &capacity, (size_t)*count, sizeof **pairs) != 0)
                return status_no_memory(s->err);
            (*pairs)[(*count)++] = (struct pair){step, i};
        }
    }
    return LB_OK;
}

/* Pairs sorted by step into need_start and need. */
static lb_status sort_needs(struct search *s, const struct pair *pairs, int count)
{
    int steps = s->system->steps;
    int *next = memory_array((size_t)steps, sizeof *next);
    s->need = memory_array((size_t)count, sizeof *s->need);
    if (!next || !s->need) {
        memory_free(next);
        return status_no_memory(s->err);
    }
    for (int p = 0; p < count; p++)
        s->need_start[pairs[p].step + 1]++;
    for (int step = 0; step < steps; step++) {
        s->need_start[step + 1] += s->need_start[step];
        next[step] = s->need_start[step];
    }
    for (int p = 0; p < count; p++)
        s->need[next[pairs[p].step]++] = pairs[p].state;
    memory_free(next);
    return LB_OK;
}

static lb_status find_needs(struct search *s, lb_evaluator *evaluator)
{
    int count = 0;
    struct pair *pairs = NULL;
    bool *is_zero = memory_array((size_t)s->system->n, sizeof *is_zero);
    bool *is_alive = memory_array((size_t)s->system->steps, sizeof *is_alive);
    lb_status status = is_zero && is_alive ? collect_needs(s, evaluator, is_zero, is_alive, &pairs, &count)
                                           : status_no_memory(s->err);
    if (status == LB_OK)
        status = sort_needs(s, pairs, count);
    memory_free(is_alive);
    memory_free(is_zero);
    memory_free(pairs);
    return status;
}

/* ---- Branching ------------------------------------------------------------------------------ */

static bool step_changes_set(const struct search *s, int step)
{
    const network_step *of = &s->system->network->steps[step];
    for (int e = 0; e < of->entry_count; e++)
        if (s->is_in[of->entries[e].state])
            return true;
    return false;
}

static bool step_needs_set(const struct search *s, int step)
{
    for (int p = s->need_start[step]; p < s->need_start[step + 1]; p++)
        if (s->is_in[s->need[p]])
            return true;
    return false;
}

/* A step that changes the set without needing it; -1: the set is a siphon. */
static int find_violation(const struct search *s)
{
    for (int step = 0; step < s->system->steps; step++)
        if (s->is_alive[step] && step_changes_set(s, step) && !step_needs_set(s, step))
            return step;
    return -1;
}

static bool contains_found(const struct search *s)
{
    for (int i = 0; i < s->found->count; i++)
        if (is_subset(s->found->n, s->found->is_zero[i], s->is_in))
            return true;
    return false;
}

static lb_status branch(struct search *s)
{
    if (++s->nodes > MOST_NODES) {
        s->found->is_complete = false;
        return LB_OK;
    }
    if (contains_found(s))
        return LB_OK;
    int step = find_violation(s);
    if (step < 0)
        return add_minimal(s->found, s->is_in, s->err);
    lb_status status = LB_OK;
    for (int p = s->need_start[step]; status == LB_OK && p < s->need_start[step + 1]; p++) {
        s->is_in[s->need[p]] = true;
        status = branch(s);
        s->is_in[s->need[p]] = false;
    }
    return status;
}

static lb_status search_from(struct search *s, int state)
{
    s->is_in[state] = true;
    lb_status status = branch(s);
    s->is_in[state] = false;
    return status;
}

static lb_status add_joined(struct search *s, faces *out)
{
    lb_status status = LB_OK;
    for (int i = 0; status == LB_OK && i < s->found->count; i++) {
        for (int j = 0; j < s->system->n; j++)
            s->is_in[j] = s->found->is_zero[i][j] || s->is_outside[j];
        status = faces_add(out, s->is_in, s->err);
    }
    memset(s->is_in, 0, (size_t)s->system->n * sizeof *s->is_in);
    return status;
}

/* All minimal siphons. */
static lb_status search_all(struct search *s, faces *out)
{
    lb_status status = LB_OK;
    for (int i = 0; status == LB_OK && i < s->system->n; i++)
        if (may_vanish(s, i))
            status = search_from(s, i);
    return status == LB_OK ? add_joined(s, out) : status;
}

/* Siphons that kill a step: for each species that it needs the minimal ones among
 * those that have that species. */
static lb_status search_killers(struct search *s, int step, faces *out)
{
    lb_status status = LB_OK;
    for (int p = s->need_start[step]; status == LB_OK && p < s->need_start[step + 1]; p++) {
        faces_clear(s->found);
        status = search_from(s, s->need[p]);
        if (status == LB_OK)
            status = add_joined(s, out);
    }
    return status;
}

/* The step with the fewest ways to kill it. */
static int easiest_step(const struct search *s, const bool *must_vanish)
{
    int best = -1;
    for (int step = 0; step < s->system->steps; step++)
        if (must_vanish[step] && (best < 0 || s->need_start[step + 1] - s->need_start[step] <
                                                  s->need_start[best + 1] - s->need_start[best]))
            best = step;
    return best;
}

lb_status faces_find(equations *eq, const bool *is_zero, const bool *must_vanish, faces *out, lb_error *err)
{
    const lb_system *system = eq->system;
    faces found;
    faces_init(&found, system->n);
    struct search s = {
        .system = system, .is_outside = is_zero, .is_alive = eq->is_alive, .found = &found, .err = err};
    s.need_start = memory_zeroed((size_t)system->steps + 1, sizeof *s.need_start);
    s.is_in = memory_zeroed((size_t)system->n, sizeof *s.is_in);
    lb_status status = s.need_start && s.is_in ? find_needs(&s, eq->evaluator) : status_no_memory(err);
    int step = status == LB_OK && must_vanish ? easiest_step(&s, must_vanish) : -1;
    if (status == LB_OK)
        status = step >= 0 ? search_killers(&s, step, out) : search_all(&s, out);
    out->is_complete = out->is_complete && found.is_complete;
    faces_clear(&found);
    memory_free(s.need);
    memory_free(s.is_in);
    memory_free(s.need_start);
    return status;
}

/* Dimensions that are not known yet: linear equations over the rationals.
 *
 * Gauss-Jordan elimination, one equation at a time: what is solved is kept in
 * terms of unsolved unknowns alone, so an equation is reduced in one pass.  Of
 * the unknowns in an equation the one that occurs in the fewest solved ones is
 * eliminated, which makes chains of equalities cheap.  Work is bounded: files
 * that would fill in densely are refused, not waited for. */
#include "model/infer.h"

static const size_t WORK_LIMIT = 100000000;

struct infer_use {
    int solved;
    struct infer_use *next;
};

int infer_init(inference *inf)
{
    *inf = (inference){.memory = arena_new()};
    return inf->memory ? 0 : -1;
}

void infer_clear(inference *inf)
{
    for (size_t i = 0; i < inf->count; i++)
        memory_free(inf->unknowns[i].part);
    memory_free(inf->unknowns);
    memory_free(inf->sum);
    memory_free(inf->touched);
    arena_free(inf->memory);
    *inf = (inference){.memory = NULL};
}

int infer_new(inference *inf)
{
    if (memory_grow(&inf->unknowns, &inf->capacity, inf->count, sizeof *inf->unknowns)
        || memory_grow(&inf->sum, &inf->sum_capacity, inf->count, sizeof *inf->sum)) {
        inf->has_no_memory = true;
        return -1;
    }
    inf->unknowns[inf->count] = (infer_unknown){.known = dimension_none()};
    inf->sum[inf->count] = (rational){0, 1};
    return (int)inf->count++;
}

/* ---- Forms ----------------------------------------------------------------- */

form form_none(void)
{
    return (form){dimension_none(), NULL, NULL};
}

form form_known(const dimension *d)
{
    return (form){*d, NULL, NULL};
}

static bool append_term(inference *inf, form *f, int unknown, rational power)
{
    form_term *term = arena_alloc(inf->memory, sizeof *term);
    if (!term) {
        inf->has_no_memory = true;
        return false;
    }
    *term = (form_term){unknown, power, NULL};
    if (f->last)
        f->last->next = term;
    else
        f->first = term;
    f->last = term;
    return true;
}

bool form_unknown(inference *inf, int unknown, form *out)
{
    *out = form_none();
    return append_term(inf, out, unknown, (rational){1, 1});
}

bool form_copy(inference *inf, const form *f, form *out)
{
    *out = form_known(&f->known);
    for (const form_term *t = f->first; t; t = t->next)
        if (!append_term(inf, out, t->unknown, t->power))
            return false;
    return true;
}

bool form_multiply(form *left, form *right, int sign)
{
    bool fits = sign > 0 ? dimension_multiply(&left->known, &right->known, &left->known)
                         : dimension_divide(&left->known, &right->known, &left->known);
    for (form_term *t = sign < 0 ? right->first : NULL; t; t = t->next)
        t->power.num = -t->power.num;
    if (!left->first)
        left->first = right->first;
    else
        left->last->next = right->first;
    if (right->last)
        left->last = right->last;
    right->first = right->last = NULL;
    return fits;
}

bool form_power(form *f, rational power)
{
    if (power.num > 1000000 || power.num < -1000000 || power.den > 1000000)
        return false;
    bool fits = dimension_power(&f->known, (int)power.num, (int)power.den, &f->known);
    for (form_term *t = f->first; t; t = t->next)
        fits = rational_multiply(t->power, power, &t->power) && fits;
    return fits;
}

/* ---- Equations --------------------------------------------------------------- */

/* known *= d^power. */
static bool multiply_known(dimension *known, const dimension *d, rational power)
{
    dimension scaled;
    return power.num <= 1000000 && power.num >= -1000000 && power.den <= 1000000
           && dimension_power(d, (int)power.num, (int)power.den, &scaled)
           && dimension_multiply(known, &scaled, known);
}

static infer_outcome touch(inference *inf, int unknown, rational power)
{
    if (memory_grow(&inf->touched, &inf->touched_capacity, inf->touched_count, sizeof *inf->touched)) {
        inf->has_no_memory = true;
        return INFER_NOMEM;
    }
    inf->touched[inf->touched_count++] = unknown;
    return rational_add(inf->sum[unknown], power, &inf->sum[unknown]) ? INFER_FITS : INFER_TOO_MUCH;
}

/* Add form^sign to the sum, with what is solved replaced. */
static infer_outcome accumulate(inference *inf, const form *f, int sign, dimension *known)
{
    if (!multiply_known(known, &f->known, (rational){sign, 1}))
        return INFER_TOO_MUCH;
    infer_outcome outcome = INFER_FITS;
    for (const form_term *t = f->first; t && outcome == INFER_FITS; t = t->next) {
        const infer_unknown *u = &inf->unknowns[t->unknown];
        rational power = {sign * t->power.num, t->power.den};
        inf->work += 1 + u->parts;
        if (!u->is_solved) {
            outcome = touch(inf, t->unknown, power);
            continue;
        }
        if (!multiply_known(known, &u->known, power))
            return INFER_TOO_MUCH;
        for (size_t i = 0; i < u->parts && outcome == INFER_FITS; i++) {
            rational product;
            if (!rational_multiply(u->part[i].power, power, &product))
                return INFER_TOO_MUCH;
            outcome = touch(inf, u->part[i].unknown, product);
        }
    }
    return inf->work > WORK_LIMIT ? INFER_TOO_MUCH : outcome;
}

/* Empty the workspace. */
static void forget(inference *inf)
{
    for (size_t i = 0; i < inf->touched_count; i++)
        inf->sum[inf->touched[i]] = (rational){0, 1};
    inf->touched_count = 0;
}

/* The unknown of the equation that occurs least often elsewhere; -1: none. */
static int choose_pivot(const inference *inf)
{
    int pivot = -1;
    for (size_t i = 0; i < inf->touched_count; i++) {
        int u = inf->touched[i];
        if (inf->sum[u].num != 0 && (pivot < 0 || inf->unknowns[u].use_count < inf->unknowns[pivot].use_count))
            pivot = u;
    }
    return pivot;
}

static infer_outcome add_part(inference *inf, int solved, int unknown, rational power)
{
    infer_unknown *u = &inf->unknowns[solved];
    inf->work += u->parts;
    for (size_t i = 0; i < u->parts; i++) {
        if (u->part[i].unknown != unknown)
            continue;
        if (!rational_add(u->part[i].power, power, &u->part[i].power))
            return INFER_TOO_MUCH;
        if (u->part[i].power.num == 0)
            u->part[i] = u->part[--u->parts];
        return INFER_FITS;
    }
    struct infer_use *use = arena_alloc(inf->memory, sizeof *use);
    if (!use || memory_grow(&u->part, &u->capacity, u->parts, sizeof *u->part)) {
        inf->has_no_memory = true;
        return INFER_NOMEM;
    }
    u->part[u->parts].unknown = unknown;
    u->part[u->parts++].power = power;
    *use = (struct infer_use){solved, inf->unknowns[unknown].uses};
    inf->unknowns[unknown].uses = use;
    inf->unknowns[unknown].use_count++;
    return INFER_FITS;
}

/* known * prod sum = 1 solved for the pivot. */
static infer_outcome solve_pivot(inference *inf, int pivot, const dimension *known, int line)
{
    infer_unknown *u = &inf->unknowns[pivot];
    rational inverse = rational_of(-inf->sum[pivot].den, inf->sum[pivot].num);
    u->known = dimension_none();
    u->is_solved = true;
    u->line = line;
    if (!multiply_known(&u->known, known, inverse))
        return INFER_TOO_MUCH;
    infer_outcome outcome = INFER_FITS;
    inf->sum[pivot] = (rational){0, 1};
    for (size_t i = 0; i < inf->touched_count && outcome == INFER_FITS; i++) {
        int other = inf->touched[i];
        rational power;
        if (inf->sum[other].num == 0)
            continue;
        if (!rational_multiply(inf->sum[other], inverse, &power))
            return INFER_TOO_MUCH;
        inf->sum[other] = (rational){0, 1};
        outcome = add_part(inf, pivot, other, power);
    }
    return outcome;
}

/* Replace the pivot in one solved unknown that may contain it. */
static infer_outcome replace_in(inference *inf, int solved, int pivot, int line)
{
    infer_unknown *u = &inf->unknowns[solved];
    size_t at = 0;
    inf->work += u->parts;
    while (at < u->parts && u->part[at].unknown != pivot)
        at++;
    if (at == u->parts)
        return INFER_FITS;
    rational power = u->part[at].power;
    u->part[at] = u->part[--u->parts];
    const infer_unknown *p = &inf->unknowns[pivot];
    if (!multiply_known(&u->known, &p->known, power))
        return INFER_TOO_MUCH;
    infer_outcome outcome = INFER_FITS;
    for (size_t i = 0; i < p->parts && outcome == INFER_FITS; i++) {
        rational product;
        if (!rational_multiply(p->part[i].power, power, &product))
            return INFER_TOO_MUCH;
        outcome = add_part(inf, solved, p->part[i].unknown, product);
    }
    if (u->parts == 0)
        u->line = line;
    return outcome;
}

infer_outcome infer_equal(inference *inf, const form *a, const form *b, int line)
{
    if (inf->work > WORK_LIMIT)
        return INFER_TOO_MUCH;
    dimension known = dimension_none();
    infer_outcome outcome = accumulate(inf, a, 1, &known);
    if (outcome == INFER_FITS)
        outcome = accumulate(inf, b, -1, &known);
    int pivot = outcome == INFER_FITS ? choose_pivot(inf) : -1;
    if (outcome == INFER_FITS && pivot < 0)
        outcome = dimension_is_none(&known) ? INFER_FITS : INFER_CONFLICT;
    if (pivot >= 0) {
        outcome = solve_pivot(inf, pivot, &known, line);
        struct infer_use *use = inf->unknowns[pivot].uses;
        inf->unknowns[pivot].uses = NULL;
        for (; use && outcome == INFER_FITS; use = use->next)
            outcome = replace_in(inf, use->solved, pivot, line);
    }
    forget(inf);
    return inf->work > WORK_LIMIT && outcome == INFER_FITS ? INFER_TOO_MUCH : outcome;
}

bool infer_resolve(inference *inf, const form *f, dimension *out)
{
    *out = dimension_none();
    bool is_known = accumulate(inf, f, 1, out) == INFER_FITS && choose_pivot(inf) < 0;
    forget(inf);
    return is_known;
}

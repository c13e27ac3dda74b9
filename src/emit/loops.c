/* Loops over tables.
 *
 * For each batch of 64 products: fill an array with the factors that every product
 * has, multiply the others in, add the terms to their sums.  Sums get their terms in
 * the order of the network, as in straight lines.  The tables are static and constant:
 *
 *   VERB_first_k, VERB_first_x          a factor of every product, padded to whole batches
 *   VERB_k, VERB_k_slot, VERB_k_end     further factors: index, product in its batch, end of each batch
 *   VERB_target, VERB_slot, VERB_weight the terms, ended for each batch by VERB_term_end
 *
 * and the same with x and c. */
#include "emit/loops.h"

#include <limits.h>

#include "emit/parts.h"
#include "emit/spell.h"

enum { LINE = 100 };

static const char letters[PRODUCTS_KINDS] = {'k', 'x', 'c'};

/* ---- Tables -------------------------------------------------------------------------- */

static void begin_table(const function *f, const char *type, const char *what, size_t count)
{
    buffer_printf(&f->file->code, "static const %s %s_%s[%zu] = {\n   ", type, f->verb, what, count);
}

/* Another element, on a new line where this one is full; *line: where it began. */
static void begin_element(buffer *code, size_t *line)
{
    if (code->length - *line > LINE - 12) {
        *line = code->length + 1;
        buffer_append(code, "\n   ");
    }
    buffer_char(code, ' ');
}

static void append_element(buffer *code, size_t *line, size_t value)
{
    begin_element(code, line);
    buffer_printf(code, "%zu,", value);
}

static void end_table(const function *f)
{
    buffer_append(&f->file->code, "\n};\n");
}

/* An index into k or x as it is, that of a shared expression by its place in c. */
static size_t index_of(const function *f, products_kind kind, int index)
{
    return (size_t)(kind == PRODUCTS_C ? f->plan->number[index] : index);
}

static void append_ends(const function *f, const char *what, const size_t *end, size_t batches)
{
    size_t line = f->file->code.length;
    begin_table(f, "int", what, batches);
    for (size_t b = 0; b < batches; b++)
        append_element(&f->file->code, &line, end[b]);
    end_table(f);
}

/* The first factors; the last batch is filled up with the first index, whose product is not used. */
static void append_first(const function *f, const products *p, products_kind kind)
{
    char what[] = "first_k";
    what[6] = letters[kind];
    size_t line = f->file->code.length, count = p->batches * PRODUCTS_BATCH;
    const int *first = p->factors[kind].first;
    begin_table(f, "int", what, count);
    for (size_t i = 0; i < count; i++)
        append_element(&f->file->code, &line, index_of(f, kind, first[i < p->items ? i : 0]));
    end_table(f);
}

static void append_others(const function *f, const products *p, products_kind kind)
{
    const products_factors *factors = &p->factors[kind];
    char name[] = "k", slot[] = "k_slot", end[] = "k_end";
    name[0] = slot[0] = end[0] = letters[kind];
    size_t line = f->file->code.length;
    begin_table(f, "int", name, factors->count);
    for (size_t i = 0; i < factors->count; i++)
        append_element(&f->file->code, &line, index_of(f, kind, factors->index[i]));
    end_table(f);
    line = f->file->code.length;
    begin_table(f, "unsigned char", slot, factors->count);
    for (size_t i = 0; i < factors->count; i++)
        append_element(&f->file->code, &line, factors->slot[i]);
    end_table(f);
    append_ends(f, end, factors->end, p->batches);
}

/* ---- Terms --------------------------------------------------------------------------- */

static bool has_weights(const products *p)
{
    for (size_t i = 0; i < p->term_count; i++)
        if (p->terms[i].weight != 1)
            return true;
    return false;
}

/* Product number i is output number i: no tables of terms. */
static bool is_direct(const products *p)
{
    for (size_t i = 0; i < p->term_count; i++)
        if (p->terms[i].target != i || p->terms[i].slot != i % PRODUCTS_BATCH)
            return false;
    return p->term_count == p->items && !has_weights(p);
}

/* Are all weights whole and small?  Then a byte holds one. */
static bool are_small(const products *p)
{
    for (size_t i = 0; i < p->term_count; i++) {
        double weight = p->terms[i].weight;
        if (!(weight >= SCHAR_MIN && weight <= SCHAR_MAX) || weight != (double)(int)weight)
            return false;
    }
    return true;
}

static void append_weights(const function *f, const products *p)
{
    buffer *code = &f->file->code;
    bool is_small = are_small(p);
    size_t line = code->length;
    begin_table(f, is_small ? "signed char" : "double", "weight", p->term_count);
    for (size_t i = 0; i < p->term_count; i++) {
        begin_element(code, &line);
        if (is_small)
            buffer_printf(code, "%d", (int)p->terms[i].weight);
        else
            spell_number(code, p->terms[i].weight);
        buffer_char(code, ',');
    }
    end_table(f);
}

static void append_terms(const function *f, const products *p)
{
    buffer *code = &f->file->code;
    size_t line = code->length, largest = 0;
    for (size_t i = 0; i < p->term_count; i++)
        largest = p->terms[i].target > largest ? p->terms[i].target : largest;
    begin_table(f, largest > INT_MAX ? "size_t" : "int", "target", p->term_count);
    for (size_t i = 0; i < p->term_count; i++)
        append_element(code, &line, p->terms[i].target);
    end_table(f);
    line = code->length;
    begin_table(f, "unsigned char", "slot", p->term_count);
    for (size_t i = 0; i < p->term_count; i++)
        append_element(code, &line, p->terms[i].slot);
    end_table(f);
    if (has_weights(p))
        append_weights(f, p);
    append_ends(f, "term_end", p->term_end, p->batches);
}

static void append_tables(const function *f, const products *p)
{
    buffer_printf(&f->file->code, "/* Tables of %s_%s, for batches of %d products. */\n", f->file->name, f->verb,
                  PRODUCTS_BATCH);
    for (products_kind kind = 0; kind < PRODUCTS_KINDS; kind++) {
        if (p->factors[kind].is_dense)
            append_first(f, p, kind);
        if (p->factors[kind].count > 0)
            append_others(f, p, kind);
    }
    if (!is_direct(p))
        append_terms(f, p);
    buffer_char(&f->file->code, '\n');
}

/* ---- The function ------------------------------------------------------------------------ */

/* `product[i] = k[...]*x[...];`: what every product has. */
static void append_start(const function *f, const products *p, buffer *body)
{
    const char *times = "";
    buffer_printf(body, "        for (int i = 0; i < %d; i++)\n            product[i] = ", PRODUCTS_BATCH);
    for (products_kind kind = 0; kind < PRODUCTS_KINDS; kind++)
        if (p->factors[kind].is_dense) {
            buffer_printf(body, "%s%c[%s_first_%c[%d*b + i]]", times, letters[kind], f->verb, letters[kind],
                          PRODUCTS_BATCH);
            times = "*";
        }
    buffer_append(body, *times ? ";\n" : "1.0;\n");
}

static void append_cursors(const products *p, buffer *body)
{
    for (products_kind kind = 0; kind < PRODUCTS_KINDS; kind++)
        if (p->factors[kind].count > 0)
            buffer_printf(body, "    int %c_next = 0;\n", letters[kind]);
    if (!is_direct(p))
        buffer_append(body, "    int next = 0;\n");
}

static void append_loops(const function *f, const products *p, buffer *body)
{
    const char *verb = f->verb;
    append_start(f, p, body);
    for (products_kind kind = 0; kind < PRODUCTS_KINDS; kind++) {
        char c = letters[kind];
        if (p->factors[kind].count > 0)
            buffer_printf(body, "        for (; %c_next < %s_%c_end[b]; %c_next++)\n"
                                "            product[%s_%c_slot[%c_next]] *= %c[%s_%c[%c_next]];\n",
                          c, verb, c, c, verb, c, c, c, verb, c, c);
    }
    if (is_direct(p)) {
        buffer_printf(body, "        for (int i = 0; i < %d && %d*b + i < %zu; i++)\n            %s[%d*b + i] = product[i];\n",
                      PRODUCTS_BATCH, PRODUCTS_BATCH, p->items, f->out, PRODUCTS_BATCH);
        return;
    }
    buffer_printf(body, "        for (; next < %s_term_end[b]; next++)\n            %s[%s_target[next]] += ", verb,
                  f->out, verb);
    if (has_weights(p))
        buffer_printf(body, "%s_weight[next]*", verb);
    buffer_printf(body, "product[%s_slot[next]];\n", verb);
}

static void mark_arguments(const function *f, const products *p)
{
    writer *w = &f->file->writer;
    w->uses_k = w->uses_k || p->factors[PRODUCTS_K].is_dense || p->factors[PRODUCTS_K].count > 0;
    w->uses_x = w->uses_x || p->factors[PRODUCTS_X].is_dense || p->factors[PRODUCTS_X].count > 0;
}

lb_status loops_append(const function *f, const products *p)
{
    buffer body;
    int shared = parts_shared(f);
    function g = *f;
    if (is_direct(p))
        g.zero_size = NULL;
    append_tables(f, p);
    parts_begin(f, &body);
    parts_prologue(&g, shared, &body);
    append_cursors(p, &body);
    buffer_printf(&body, "    for (int b = 0; b < %zu; b++) {\n        double product[%d];\n", p->batches, PRODUCTS_BATCH);
    append_loops(f, p, &body);
    buffer_append(&body, "    }\n");
    mark_arguments(f, p);
    parts_public(f, &body);
    buffer_clear(&body);
    return f->file->code.status;
}

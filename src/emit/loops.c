/* Loops over tables.
 *
 * For each batch of 64 products: fill an array with the factors that every product has,
 * multiply the others in, put negatives and multiples behind the products, add each term
 * to its sum.  Sums get their terms in the order of the network, as in straight lines.
 * The tables are static and constant:
 *
 *   VERB_k1, VERB_x1, VERB_x2           factors that every product has, padded to whole batches
 *   VERB_k, VERB_k_slot, VERB_k_end     further factors: index, slot, end of each batch
 *   VERB_multiple, VERB_multiple_slot   multiples: factor, slot, with VERB_multiple_end
 *   VERB_target, VERB_slot              the terms: output, slot, with VERB_term_end
 *
 * and the same with x and c in place of k. */
#include "emit/loops.h"

#include <limits.h>
#include <stdio.h>

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

/* One factor of every product; the last batch is filled up with the first index, whose product
 * is not used. */
static void append_round(const function *f, const products *p, products_kind kind, int round)
{
    char what[16];
    snprintf(what, sizeof what, "%c%d", letters[kind], round + 1);
    size_t line = f->file->code.length, count = p->batches * PRODUCTS_BATCH;
    const int *index = p->factors[kind].round[round];
    begin_table(f, "int", what, count);
    for (size_t i = 0; i < count; i++)
        append_element(&f->file->code, &line, index_of(f, kind, index[i < p->items ? i : 0]));
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

static void append_multiples(const function *f, const products *p)
{
    buffer *code = &f->file->code;
    size_t line = code->length;
    begin_table(f, "double", "multiple", p->multiple_count);
    for (size_t i = 0; i < p->multiple_count; i++) {
        begin_element(code, &line);
        spell_number(code, p->multiples[i].weight);
        buffer_char(code, ',');
    }
    end_table(f);
    line = code->length;
    begin_table(f, "unsigned char", "multiple_slot", p->multiple_count);
    for (size_t i = 0; i < p->multiple_count; i++)
        append_element(code, &line, p->multiples[i].slot);
    end_table(f);
    append_ends(f, "multiple_end", p->multiple_end, p->batches);
}

static const char *type_of_target(const products *p)
{
    for (size_t i = 0; i < p->term_count; i++)
        if (p->terms[i].target > INT_MAX)
            return "size_t";
    return "int";
}

static void append_terms(const function *f, const products *p)
{
    buffer *code = &f->file->code;
    size_t line = code->length;
    begin_table(f, type_of_target(p), "target", p->term_count);
    for (size_t i = 0; i < p->term_count; i++)
        append_element(code, &line, p->terms[i].target);
    end_table(f);
    line = code->length;
    begin_table(f, p->slots <= 256 ? "unsigned char" : "int", "slot", p->term_count);
    for (size_t i = 0; i < p->term_count; i++)
        append_element(code, &line, p->terms[i].slot);
    end_table(f);
    append_ends(f, "term_end", p->term_end, p->batches);
}

static void append_tables(const function *f, const products *p)
{
    buffer_printf(&f->file->code, "/* Tables of %s_%s, for batches of %d products. */\n", f->file->name, f->verb,
                  PRODUCTS_BATCH);
    for (products_kind kind = 0; kind < PRODUCTS_KINDS; kind++) {
        for (int round = 0; round < p->factors[kind].rounds; round++)
            append_round(f, p, kind, round);
        if (p->factors[kind].count > 0)
            append_others(f, p, kind);
    }
    if (p->multiple_count > 0)
        append_multiples(f, p);
    if (!p->is_direct)
        append_terms(f, p);
    buffer_char(&f->file->code, '\n');
}

/* ---- The function ------------------------------------------------------------------------ */

/* `value[i] = k[...]*x[...];`: what every product has. */
static void append_start(const function *f, const products *p, buffer *body)
{
    const char *times = "";
    buffer_printf(body, "        for (int i = 0; i < %d; i++)\n            value[i] = ", PRODUCTS_BATCH);
    for (products_kind kind = 0; kind < PRODUCTS_KINDS; kind++)
        for (int round = 0; round < p->factors[kind].rounds; round++) {
            buffer_printf(body, "%s%c[%s_%c%d[%d*b + i]]", times, letters[kind], f->verb, letters[kind], round + 1,
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
    if (p->multiple_count > 0)
        buffer_append(body, "    int multiple_next = 0;\n");
    if (!p->is_direct)
        buffer_append(body, "    int next = 0;\n");
}

static void append_factors(const function *f, products_kind kind, buffer *body)
{
    char c = letters[kind];
    buffer_printf(body, "        for (; %c_next < %s_%c_end[b]; %c_next++)\n"
                        "            value[%s_%c_slot[%c_next]] *= %c[%s_%c[%c_next]];\n",
                  c, f->verb, c, c, f->verb, c, c, c, f->verb, c, c);
}

static void append_variants(const function *f, const products *p, buffer *body)
{
    const char *verb = f->verb;
    if (p->has_negatives)
        buffer_printf(body, "        for (int i = 0; i < %d; i++)\n            value[%d + i] = -value[i];\n",
                      PRODUCTS_BATCH, PRODUCTS_BATCH);
    if (p->multiple_count > 0)
        buffer_printf(body, "        for (int i = %d; multiple_next < %s_multiple_end[b]; multiple_next++)\n"
                            "            value[i++] = %s_multiple[multiple_next]*value[%s_multiple_slot[multiple_next]];\n",
                      2 * PRODUCTS_BATCH, verb, verb, verb);
}

static void append_loops(const function *f, const products *p, buffer *body)
{
    append_start(f, p, body);
    for (products_kind kind = 0; kind < PRODUCTS_KINDS; kind++)
        if (p->factors[kind].count > 0)
            append_factors(f, kind, body);
    append_variants(f, p, body);
    if (p->is_direct)
        buffer_printf(body, "        for (int i = 0; i < %d && %d*b + i < %zu; i++)\n            %s[%d*b + i] = value[i];\n",
                      PRODUCTS_BATCH, PRODUCTS_BATCH, p->items, f->out, PRODUCTS_BATCH);
    else
        buffer_printf(body, "        for (; next < %s_term_end[b]; next++)\n"
                            "            %s[%s_target[next]] += value[%s_slot[next]];\n",
                      f->verb, f->out, f->verb, f->verb);
}

static bool has_factors(const products_factors *f)
{
    return f->rounds > 0 || f->count > 0;
}

static void mark_arguments(const function *f, const products *p)
{
    writer *w = &f->file->writer;
    w->uses_k = w->uses_k || has_factors(&p->factors[PRODUCTS_K]);
    w->uses_x = w->uses_x || has_factors(&p->factors[PRODUCTS_X]);
}

lb_status loops_append(const function *f, const products *p)
{
    buffer body;
    int shared = parts_shared(f);
    function g = *f;
    if (p->is_direct)
        g.zero_size = NULL;
    append_tables(f, p);
    parts_begin(f, &body);
    parts_prologue(&g, shared, &body);
    append_cursors(p, &body);
    buffer_printf(&body, "    for (int b = 0; b < %zu; b++) {\n        double value[%zu];\n", p->batches, p->slots);
    append_loops(f, p, &body);
    buffer_append(&body, "    }\n");
    mark_arguments(f, p);
    parts_public(f, &body);
    buffer_clear(&body);
    return f->file->code.status;
}

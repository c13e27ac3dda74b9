/* The functions of an emitted file.
 *
 * A function of one block holds everything: locals, then rates (or derivatives
 * of rates) as v0, dv1_dx0, dv1_dk2, then one sum per output.  A longer one is
 * cut into static functions NAME_1, NAME_2, ... that each take a few steps of the
 * network and add their share; what they have in common is computed before them,
 * by NAME_shared_1, ..., into an array c.  Functions that only call others are cut
 * the same way, so none is long however large the network. */
#include "emit/function.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/memory.h"
#include "emit/statement.h"

enum {
    CALLS = 40,              /* in one function that only calls others */
    DENSE_LIMIT = 4096       /* values of a Jacobian that is written out a second time as a dense one */
};

static const char *out_name(sums_kind kind)
{
    switch (kind) {
    case SUMS_RATES:    return "v";
    case SUMS_RHS:      return "dxdt";
    case SUMS_JACOBIAN: return "J";
    case SUMS_SPARSE:   return "values";
    case SUMS_DFDK:     return "D";
    }
    return "";
}

static const char *verb_of(sums_kind kind)
{
    switch (kind) {
    case SUMS_RATES:    return "rates";
    case SUMS_RHS:      return "rhs";
    case SUMS_JACOBIAN: return "jacobian";
    case SUMS_SPARSE:   return "jacobian_sparse";
    case SUMS_DFDK:     return "dfdk";
    }
    return "";
}

/* ---- Blocks ------------------------------------------------------------------------ */

static int by_target(const void *a, const void *b)
{
    const statement_place *left = a, *right = b;
    if (left->target != right->target)
        return left->target < right->target ? -1 : 1;
    return (left->term > right->term) - (left->term < right->term);
}

/* is_set [plan.distinct]: targets that an earlier block has set. */
static lb_status write_sums(const function *f, int block, unsigned char *is_set)
{
    size_t first = f->plan->block_start[block], count = f->plan->block_start[block + 1] - first;
    statement_place *places = memory_array(count, sizeof *places);
    if (!places)
        return LB_E_NOMEM;
    for (size_t i = 0; i < count; i++)
        places[i] = (statement_place){f->sums->terms[first + i].target, first + i};
    qsort(places, count, sizeof *places, by_target);
    for (size_t i = 0, end; i < count; i = end) {
        for (end = i + 1; end < count && places[end].target == places[i].target; end++)
            ;
        unsigned char *set = &is_set[f->plan->target_id[places[i].term]];
        statement_sum(f, places + i, end - i, !*set);
        *set = 1;
    }
    memory_free(places);
    return LB_OK;
}

static void end_paragraph(const function *f, buffer *body)
{
    if (f->file->listing.count > 0 && body->length > 0)
        buffer_char(body, '\n');
    listing_flush(&f->file->listing, body);
}

static lb_status write_block(const function *f, int block, unsigned char *is_set, buffer *body)
{
    const plan *p = f->plan;
    for (int i = p->local_start[block]; i < p->local_start[block + 1]; i++)
        statement_local(f, p->locals[i]);
    end_paragraph(f, body);
    int last = -1;
    for (size_t i = p->block_start[block]; i < p->block_start[block + 1]; i++) {
        int item = f->sums->terms[i].item;
        if (item > last && statement_is_named(f, &f->sums->items[item]))
            statement_item(f, &f->sums->items[item]);
        last = item > last ? item : last;
    }
    end_paragraph(f, body);
    lb_status status = write_sums(f, block, is_set);
    end_paragraph(f, body);
    return status;
}

/* ---- Static functions ------------------------------------------------------------- */

/* A family of static functions: NAME_1, NAME_shared_1; at level 1 NAME_group_1,
 * which call those of level 0, and so on. */
struct part {
    bool is_shared;
    int level;
};

static void append_part_name(const function *f, struct part part, int number, buffer *out)
{
    buffer_printf(out, "%s%s", f->verb, part.is_shared ? "_shared" : "");
    for (int i = 0; i < part.level; i++)
        buffer_append(out, "_group");
    buffer_printf(out, "_%d", number);
}

static void begin_body(const function *f, buffer *body)
{
    buffer_init(body);
    f->file->writer.uses_x = f->file->writer.uses_k = f->file->writer.uses_shared = false;
}

/* The body, after a word to compilers, which warn of parameters without a use. */
static void append_body(const function *f, bool has_time, bool has_shared, const buffer *body)
{
    const writer *w = &f->file->writer;
    buffer *code = &f->file->code;
    buffer_append(code, "{\n");
    if (has_time)
        buffer_append(code, "    (void)t;\n");
    if (!w->uses_x)
        buffer_append(code, "    (void)x;\n");
    if (!w->uses_k)
        buffer_append(code, "    (void)k;\n");
    if (has_shared && !w->uses_shared)
        buffer_append(code, "    (void)c;\n");
    buffer_append(code, buffer_get(body));
    buffer_append(code, "}\n\n");
    if (body->status != LB_OK && code->status == LB_OK)
        code->status = body->status;
}

static void append_static(const function *f, struct part part, int number, const buffer *body)
{
    buffer *code = &f->file->code;
    bool has_shared = f->plan->shared_count > 0;
    buffer_append(code, "static void ");
    append_part_name(f, part, number, code);
    buffer_append(code, "(const double x[], const double k[]");
    if (has_shared)
        buffer_append(code, part.is_shared ? ", double c[]" : ", const double c[]");
    if (!part.is_shared)
        buffer_printf(code, ", double %s[]", f->out);
    buffer_append(code, ")\n");
    append_body(f, false, has_shared, body);
}

static void append_call(const function *f, struct part part, int number, buffer *body)
{
    f->file->writer.uses_x = f->file->writer.uses_k = f->file->writer.uses_shared = true;
    buffer_append(body, "    ");
    append_part_name(f, part, number, body);
    buffer_append(body, f->plan->shared_count > 0 ? "(x, k, c" : "(x, k");
    if (!part.is_shared)
        buffer_printf(body, ", %s", f->out);
    buffer_append(body, ");\n");
}

/* Calls of a family's 1..count into body; where there are many, through functions
 * that group them. */
static void append_calls(const function *f, bool is_shared, int count, buffer *body)
{
    struct part part = {is_shared, 0};
    while (count > CALLS) {
        struct part grouped = {is_shared, part.level + 1};
        int groups = (count + CALLS - 1) / CALLS;
        for (int g = 0; g < groups; g++) {
            buffer group;
            begin_body(f, &group);
            for (int i = g * CALLS; i < count && i < (g + 1) * CALLS; i++)
                append_call(f, part, i + 1, &group);
            append_static(f, grouped, g + 1, &group);
            buffer_clear(&group);
        }
        part = grouped;
        count = groups;
    }
    for (int i = 0; i < count; i++)
        append_call(f, part, i + 1, body);
}

/* NAME_shared_1, ...: what several blocks need. */
static int append_shared(const function *f)
{
    const plan *p = f->plan;
    int parts = 0;
    for (int first = 0; first < p->shared_count; first += CALLS) {
        buffer body;
        begin_body(f, &body);
        for (int i = first; i < p->shared_count && i < first + CALLS; i++)
            statement_local(f, p->shared[i]);
        listing_flush(&f->file->listing, &body);
        append_static(f, (struct part){true, 0}, ++parts, &body);
        buffer_clear(&body);
    }
    return parts;
}

/* "R1 to R9": the steps whose terms a block adds. */
static void append_block_comment(const function *f, int block)
{
    const sums *s = f->sums;
    int first = s->terms[f->plan->block_start[block]].item;
    int last = s->terms[f->plan->block_start[block + 1] - 1].item;
    if (first < 0 || last < 0)
        return;
    const network_step *steps = f->file->net->steps;
    buffer *code = &f->file->code;
    buffer_append(code, "/* ");
    statement_comment_name(code, steps[s->items[first].step].name);
    if (s->items[first].step != s->items[last].step) {
        buffer_append(code, " to ");
        statement_comment_name(code, steps[s->items[last].step].name);
    }
    buffer_append(code, " */\n");
}

static lb_status append_blocks(const function *f, unsigned char *is_set)
{
    lb_status status = LB_OK;
    for (int b = 0; status == LB_OK && b < f->plan->blocks; b++) {
        buffer body;
        begin_body(f, &body);
        status = write_block(f, b, is_set, &body);
        append_block_comment(f, b);
        append_static(f, (struct part){false, 0}, b + 1, &body);
        buffer_clear(&body);
    }
    return status;
}

/* ---- Public functions --------------------------------------------------------------- */

static void append_public(const function *f, const buffer *body)
{
    buffer_printf(&f->file->code, "void %s_%s(double t, const double x[], const double k[], double %s[])\n",
                  f->file->name, f->verb, f->out);
    append_body(f, true, false, body);
}

static void append_zero_fill(const function *f, buffer *body)
{
    if (f->zero_size)
        buffer_printf(body, "    for (size_t i = 0; i < %s; i++)\n        %s[i] = 0.0;\n", f->zero_size, f->out);
}

/* The whole function where it is one block. */
static lb_status append_single(const function *f, unsigned char *is_set, buffer *body)
{
    int parts = append_shared(f);
    begin_body(f, body);
    if (parts > 0) {
        buffer_printf(body, "    double c[%d];\n", f->plan->shared_count);
        append_calls(f, true, parts, body);
    }
    append_zero_fill(f, body);
    lb_status status = write_block(f, 0, is_set, body);
    if (f->sums->term_count == 0 && !f->zero_size)
        buffer_printf(body, "    (void)%s;\n", f->out);
    return status;
}

static lb_status append_driver(const function *f, unsigned char *is_set, buffer *body)
{
    int parts = append_shared(f);
    lb_status status = append_blocks(f, is_set);
    begin_body(f, body);
    if (parts > 0) {
        buffer_printf(body, "    double c[%d];\n", f->plan->shared_count);
        append_calls(f, true, parts, body);
    }
    append_zero_fill(f, body);
    append_calls(f, false, f->plan->blocks, body);
    return status;
}

static lb_status append_function(function *f)
{
    f->verb = verb_of(f->sums->kind);
    f->out = out_name(f->sums->kind);
    f->file->writer.plan = f->plan;
    unsigned char *is_set = memory_zeroed(f->plan->distinct, 1);
    if (!is_set)
        return LB_E_NOMEM;
    buffer body;
    buffer_init(&body);
    lb_status status = f->plan->blocks == 1 ? append_single(f, is_set, &body) : append_driver(f, is_set, &body);
    append_public(f, &body);
    buffer_clear(&body);
    memory_free(is_set);
    return status == LB_OK ? f->file->code.status : status;
}

/* The nodes that derivatives have added to the graph are no definitions. */
static lb_status extend_definitions(function_file *file)
{
    int *longer = memory_resize(file->definition, file->graph.count, sizeof *longer);
    if (!longer)
        return LB_E_NOMEM;
    for (size_t e = file->definition_count; e < file->graph.count; e++)
        longer[e] = -1;
    file->definition = longer;
    file->definition_count = file->graph.count;
    file->writer.definition = longer;
    return LB_OK;
}

static lb_status make_plan(function_file *file, const sums *s, plan *p)
{
    memset(p, 0, sizeof *p);
    unsigned char *is_defined = memory_zeroed(file->graph.count, 1);
    lb_status status = is_defined ? extend_definitions(file) : LB_E_NOMEM;
    for (size_t e = 0; status == LB_OK && e < file->graph.count; e++)
        is_defined[e] = file->definition[e] >= 0;
    if (status == LB_OK)
        status = plan_make(&file->graph, s, is_defined, p);
    memory_free(is_defined);
    return status;
}

static lb_status append_plain(function_file *file, sums *s, lb_status status, const char *zero_size)
{
    plan p = {0};
    if (status == LB_OK)
        status = make_plan(file, s, &p);
    if (status == LB_OK)
        status = append_function(&(function){.file = file, .sums = s, .plan = &p, .zero_size = zero_size});
    plan_clear(&p);
    sums_clear(s);
    return status;
}

lb_status function_rates(function_file *file)
{
    sums s = {0};
    lb_status status = sums_of_rates(file->net, &file->graph, &s);
    return append_plain(file, &s, status, NULL);
}

lb_status function_rhs(function_file *file)
{
    sums s = {0};
    lb_status status = sums_of_rhs(file->net, &file->graph, &s);
    return append_plain(file, &s, status, NULL);
}

lb_status function_dfdk(function_file *file)
{
    sums s = {0};
    char size[256] = "";
    snprintf(size, sizeof size, "(size_t)%.100s_STATES*%.100s_CONSTANTS", file->name, file->name);
    lb_status status = sums_of_dfdk(file->net, &file->graph, &s);
    return append_plain(file, &s, status, file->net->constant_count > 0 ? size : NULL);
}

/* ---- The two Jacobians ------------------------------------------------------------------ */

/* Dense from compressed values, without a second array: beyond DENSE_LIMIT. */
static void append_spreading(function_file *file)
{
    const char *name = file->name;
    buffer *code = &file->code;
    buffer_printf(code, "void %s_jacobian(double t, const double x[], const double k[], double J[])\n{\n", name);
    buffer_append(code, "    /* The values fit into the front of J and are spread out from the last one on: no\n"
                        "     * entry's place lies before that of its value. */\n");
    buffer_printf(code, "    size_t place = (size_t)%s_STATES*%s_STATES;\n", name, name);
    buffer_printf(code, "    %s_jacobian_sparse(t, x, k, J);\n", name);
    buffer_printf(code, "    for (size_t j = %s_STATES; j-- > 0;) {\n", name);
    buffer_printf(code, "        for (int p = %s_column_start[j + 1]; p-- > %s_column_start[j];) {\n", name, name);
    buffer_append(code, "            const double value = J[p];\n");
    buffer_printf(code, "            const size_t target = (size_t)%s_row[p] + j*%s_STATES;\n", name, name);
    buffer_append(code, "            while (place > target + 1)\n"
                        "                J[--place] = 0.0;\n"
                        "            J[--place] = value;\n"
                        "        }\n    }\n"
                        "    while (place > 0)\n"
                        "        J[--place] = 0.0;\n}\n\n");
}

/* Targets of the compressed form become places in the dense one. */
static void make_dense(sums *s, const sums_pattern *pattern)
{
    for (size_t i = 0; i < s->term_count; i++) {
        size_t *target = &s->terms[i].target;
        *target = (size_t)pattern->row[*target] + (size_t)pattern->column[*target] * (size_t)pattern->n;
    }
    s->kind = SUMS_JACOBIAN;
}

static lb_status append_dense(function_file *file, sums *s)
{
    char size[256] = "";
    snprintf(size, sizeof size, "(size_t)%.100s_STATES*%.100s_STATES", file->name, file->name);
    make_dense(s, &file->pattern);
    size_t n = (size_t)file->net->states;
    bool is_full = (size_t)file->pattern.nonzeros == n * n;
    return append_plain(file, s, LB_OK, is_full ? NULL : size);
}

lb_status function_jacobians(function_file *file)
{
    sums s = {0};
    plan p = {0};
    lb_status status = sums_of_jacobian(file->net, &file->pattern, &file->graph, &s);
    if (status == LB_OK)
        status = make_plan(file, &s, &p);
    if (status == LB_OK)
        status = append_function(&(function){.file = file, .sums = &s, .plan = &p});
    plan_clear(&p);
    if (status == LB_OK && file->pattern.nonzeros <= DENSE_LIMIT)
        return append_dense(file, &s);
    if (status == LB_OK)
        append_spreading(file);
    sums_clear(&s);
    return status;
}

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
#include "emit/spell.h"

enum {
    CALLS = 40,              /* in one function that only calls others */
    SCATTER_LIMIT = 4096,    /* values of a Jacobian that go onto the stack, 32 kB */
    NAME_LIMIT = 60, EQUATION_LIMIT = 100
};

/* One public function being written. */
struct function {
    function_file *file;
    sums *sums;
    plan *plan;
    const char *verb;        /* "rates": in the names */
    const char *out;         /* "v": the array that it fills */
    const char *zero_size;   /* zero-filled first, this many; NULL: every element is set */
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

/* ---- Comments ------------------------------------------------------------------ */

static void comment_name(buffer *out, const char *name)
{
    spell_comment(out, name, NAME_LIMIT);
}

static void comment_state(const function_file *file, buffer *out, int state)
{
    buffer_char(out, '[');
    comment_name(out, file->net->species[file->net->state_species[state]].name);
    buffer_char(out, ']');
}

static void comment_constant(const function_file *file, buffer *out, int constant)
{
    comment_name(out, file->net->constants[constant].name);
}

/* "R1: A -> X", or the name of a flow. */
static void comment_step(const function_file *file, buffer *out, int step)
{
    const network_step *of = &file->net->steps[step];
    comment_name(out, of->name);
    if (of->reaction >= 0) {
        buffer_append(out, ": ");
        spell_comment(out, file->net->reactions[of->reaction].equation, EQUATION_LIMIT);
    }
}

static void comment_item(const struct function *f, buffer *out, const sums_item *item)
{
    if (item->by < 0) {
        comment_step(f->file, out, item->step);
        return;
    }
    comment_name(out, f->file->net->steps[item->step].name);
    buffer_append(out, " by ");
    if (f->sums->kind == SUMS_DFDK)
        comment_constant(f->file, out, item->by);
    else
        comment_state(f->file, out, item->by);
}

static void comment_target(const struct function *f, buffer *out, size_t target)
{
    const sums_pattern *pattern = &f->file->pattern;
    size_t n = (size_t)f->file->net->states;
    switch (f->sums->kind) {
    case SUMS_RATES:
        comment_step(f->file, out, (int)target);
        return;
    case SUMS_RHS:
        comment_state(f->file, out, (int)target);
        return;
    case SUMS_SPARSE:
        comment_state(f->file, out, pattern->row[target]);
        buffer_append(out, " by ");
        comment_state(f->file, out, pattern->column[target]);
        return;
    case SUMS_JACOBIAN:
    case SUMS_DFDK:
        comment_state(f->file, out, (int)(target % n));
        buffer_append(out, " by ");
        if (f->sums->kind == SUMS_DFDK)
            comment_constant(f->file, out, (int)(target / n));
        else
            comment_state(f->file, out, (int)(target / n));
        return;
    }
}

/* ---- Statements ------------------------------------------------------------------ */

static void write_local(const struct function *f, expression e)
{
    function_file *file = f->file;
    listing_begin(&file->listing);
    if (f->plan->home[e] != PLAN_SHARED)
        buffer_append(file->writer.out, "const double ");
    write_local_name(&file->writer, e);
    buffer_append(file->writer.out, " = ");
    write_operation(&file->writer, e, WRITE_SUM);
    buffer_char(file->writer.out, ';');
    if (file->definition[e] >= 0) {
        int d = file->definition[e], derived = file->net->derived_count;
        listing_comment(&file->listing);
        comment_name(&file->listing.text,
                     d < derived ? file->net->derived[d].name : file->net->readings[d - derived].name);
    }
    listing_end(&file->listing);
}

static void write_item_name(const struct function *f, const sums_item *item)
{
    buffer *out = f->file->writer.out;
    if (item->by < 0)
        buffer_printf(out, "v%d", item->step);
    else
        buffer_printf(out, "dv%d_d%c%d", item->step, f->sums->kind == SUMS_DFDK ? 'k' : 'x', item->by);
}

/* Leaves and what has a name already are written where they are used. */
static bool has_own_name(const struct function *f, const sums_item *item)
{
    bool is_leaf = f->file->graph.nodes[item->value].kind <= EXPRESSION_STATE;
    return !item->is_inline && !is_leaf && !f->plan->is_local[item->value];
}

static void write_item(const struct function *f, const sums_item *item)
{
    function_file *file = f->file;
    listing_begin(&file->listing);
    buffer_append(file->writer.out, "const double ");
    write_item_name(f, item);
    buffer_append(file->writer.out, " = ");
    write_expression(&file->writer, item->value, WRITE_SUM);
    buffer_char(file->writer.out, ';');
    listing_comment(&file->listing);
    comment_item(f, &file->listing.text, item);
    listing_end(&file->listing);
}

/* number * coefficient * item, with its sign joined to what stands before. */
static void write_term(const struct function *f, const sums_term *term, bool is_first)
{
    writer *w = &f->file->writer;
    const sums_item *item = &f->sums->items[term->item];
    const expression_node *nodes = f->file->graph.nodes;
    double number = term->number;
    expression value = item->value;
    bool is_named = has_own_name(f, item);
    if (!is_named && nodes[value].kind == EXPRESSION_NEGATE && !f->plan->is_local[value]) {
        value = nodes[value].left;
        number = -number;
    }
    expression coefficient = term->coefficient;
    if (coefficient != EXPRESSION_NONE && nodes[coefficient].kind == EXPRESSION_NUMBER) {
        number *= nodes[coefficient].value;
        coefficient = EXPRESSION_NONE;
    }
    bool is_number = nodes[value].kind == EXPRESSION_NUMBER && coefficient == EXPRESSION_NONE;
    if (is_number)
        number *= nodes[value].value;

    bool is_negative = number < 0;
    double magnitude = is_negative ? -number : number;
    buffer_append(w->out, is_first ? (is_negative ? "-" : "") : is_negative ? " - " : " + ");
    bool has_factor = is_number || magnitude != 1;
    if (has_factor)
        spell_number(w->out, magnitude);
    if (is_number)
        return;
    if (coefficient != EXPRESSION_NONE) {
        if (has_factor)
            buffer_char(w->out, '*');
        write_expression(w, coefficient, has_factor ? WRITE_FACTOR : WRITE_TERM);
        has_factor = true;
    }
    if (has_factor)
        buffer_char(w->out, '*');
    if (is_named)
        write_item_name(f, item);
    else
        write_expression(w, value, has_factor ? WRITE_FACTOR : is_first && !is_negative ? WRITE_SUM : WRITE_TERM);
}

/* ---- Blocks ------------------------------------------------------------------------ */

/* A term of a block with its target; sorted by target, in network order within. */
struct place {
    size_t target, term;
};

static int by_target(const void *a, const void *b)
{
    const struct place *left = a, *right = b;
    if (left->target != right->target)
        return left->target < right->target ? -1 : 1;
    return (left->term > right->term) - (left->term < right->term);
}

static void write_sum(const struct function *f, const struct place *places, size_t count, bool is_first)
{
    function_file *file = f->file;
    listing_begin(&file->listing);
    const sums_term *only = count == 1 ? &f->sums->terms[places[0].term] : NULL;
    bool is_less = !is_first && only && only->item >= 0 && only->number < 0;
    buffer_printf(file->writer.out, "%s[%zu] %s ", f->out, places[0].target,
                  is_first ? "=" : is_less ? "-=" : "+=");
    if (f->sums->terms[places[0].term].item < 0)
        buffer_append(file->writer.out, "0.0");
    else
        for (size_t i = 0; i < count; i++) {
            sums_term term = f->sums->terms[places[i].term];
            term.number = is_less ? -term.number : term.number;
            write_term(f, &term, i == 0);
        }
    buffer_char(file->writer.out, ';');
    listing_comment(&file->listing);
    comment_target(f, &file->listing.text, places[0].target);
    listing_end(&file->listing);
}

/* is_set [plan.distinct]: targets that an earlier block has set. */
static lb_status write_sums(const struct function *f, int block, unsigned char *is_set)
{
    size_t first = f->plan->block_start[block], count = f->plan->block_start[block + 1] - first;
    struct place *places = memory_array(count, sizeof *places);
    if (!places)
        return LB_E_NOMEM;
    for (size_t i = 0; i < count; i++)
        places[i] = (struct place){f->sums->terms[first + i].target, first + i};
    qsort(places, count, sizeof *places, by_target);
    for (size_t i = 0, end; i < count; i = end) {
        for (end = i + 1; end < count && places[end].target == places[i].target; end++)
            ;
        unsigned char *set = &is_set[f->plan->target_id[places[i].term]];
        write_sum(f, places + i, end - i, !*set);
        *set = 1;
    }
    memory_free(places);
    return LB_OK;
}

static void end_paragraph(const struct function *f, buffer *body)
{
    if (f->file->listing.count > 0 && body->length > 0)
        buffer_char(body, '\n');
    listing_flush(&f->file->listing, body);
}

static lb_status write_block(const struct function *f, int block, unsigned char *is_set, buffer *body)
{
    const plan *p = f->plan;
    for (int i = p->local_start[block]; i < p->local_start[block + 1]; i++)
        write_local(f, p->locals[i]);
    end_paragraph(f, body);
    int last = -1;
    for (size_t i = p->block_start[block]; i < p->block_start[block + 1]; i++) {
        int item = f->sums->terms[i].item;
        if (item > last && has_own_name(f, &f->sums->items[item]))
            write_item(f, &f->sums->items[item]);
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

static void append_part_name(const struct function *f, struct part part, int number, buffer *out)
{
    buffer_printf(out, "%s%s", f->verb, part.is_shared ? "_shared" : "");
    for (int i = 0; i < part.level; i++)
        buffer_append(out, "_group");
    buffer_printf(out, "_%d", number);
}

static void begin_body(const struct function *f, buffer *body)
{
    buffer_init(body);
    f->file->writer.uses_x = f->file->writer.uses_k = f->file->writer.uses_shared = false;
}

/* The body, after a word to compilers, which warn of parameters without a use. */
static void append_body(const struct function *f, bool has_time, bool has_shared, const buffer *body)
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

static void append_static(const struct function *f, struct part part, int number, const buffer *body)
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

static void append_call(const struct function *f, struct part part, int number, buffer *body)
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
static void append_calls(const struct function *f, bool is_shared, int count, buffer *body)
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
static int append_shared(const struct function *f)
{
    const plan *p = f->plan;
    int parts = 0;
    for (int first = 0; first < p->shared_count; first += CALLS) {
        buffer body;
        begin_body(f, &body);
        for (int i = first; i < p->shared_count && i < first + CALLS; i++)
            write_local(f, p->shared[i]);
        listing_flush(&f->file->listing, &body);
        append_static(f, (struct part){true, 0}, ++parts, &body);
        buffer_clear(&body);
    }
    return parts;
}

/* "R1 to R9": the steps whose terms a block adds. */
static void append_block_comment(const struct function *f, int block)
{
    const sums *s = f->sums;
    int first = s->terms[f->plan->block_start[block]].item;
    int last = s->terms[f->plan->block_start[block + 1] - 1].item;
    if (first < 0 || last < 0)
        return;
    const network_step *steps = f->file->net->steps;
    buffer *code = &f->file->code;
    buffer_append(code, "/* ");
    comment_name(code, steps[s->items[first].step].name);
    if (s->items[first].step != s->items[last].step) {
        buffer_append(code, " to ");
        comment_name(code, steps[s->items[last].step].name);
    }
    buffer_append(code, " */\n");
}

static lb_status append_blocks(const struct function *f, unsigned char *is_set)
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

static void append_public(const struct function *f, const buffer *body)
{
    buffer_printf(&f->file->code, "void %s_%s(double t, const double x[], const double k[], double %s[])\n",
                  f->file->name, f->verb, f->out);
    append_body(f, true, false, body);
}

static void append_zero_fill(const struct function *f, buffer *body)
{
    if (f->zero_size)
        buffer_printf(body, "    for (size_t i = 0; i < %s; i++)\n        %s[i] = 0.0;\n", f->zero_size, f->out);
}

/* The whole function where it is one block. */
static lb_status append_single(const struct function *f, unsigned char *is_set, buffer *body)
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

static lb_status append_driver(const struct function *f, unsigned char *is_set, buffer *body)
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

static lb_status append_function(struct function *f)
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
        status = append_function(&(struct function){.file = file, .sums = s, .plan = &p, .zero_size = zero_size});
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

/* Dense from compressed values, for functions of more than one block. */
static void append_scatter(function_file *file)
{
    const char *name = file->name;
    buffer *code = &file->code;
    buffer_printf(code, "void %s_jacobian(double t, const double x[], const double k[], double J[])\n{\n", name);
    if (file->pattern.nonzeros <= SCATTER_LIMIT) {
        buffer_printf(code, "    double values[%s_NONZEROS];\n", name);
        buffer_printf(code, "    %s_jacobian_sparse(t, x, k, values);\n", name);
        buffer_printf(code, "    for (size_t i = 0; i < (size_t)%s_STATES*%s_STATES; i++)\n", name, name);
        buffer_append(code, "        J[i] = 0.0;\n");
        buffer_printf(code, "    for (size_t j = 0; j < %s_STATES; j++)\n", name);
        buffer_printf(code, "        for (int p = %s_column_start[j]; p < %s_column_start[j + 1]; p++)\n", name, name);
        buffer_printf(code, "            J[(size_t)%s_row[p] + j*%s_STATES] = values[p];\n}\n\n", name, name);
        return;
    }
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

/* Targets of the compressed form become places in the dense one; zeros are filled in. */
static void make_dense(sums *s, const sums_pattern *pattern)
{
    size_t n = (size_t)pattern->n, kept = 0;
    for (size_t i = 0; i < s->term_count; i++) {
        sums_term term = s->terms[i];
        if (term.item < 0)
            continue;
        term.target = (size_t)pattern->row[term.target] + (size_t)pattern->column[term.target] * n;
        s->terms[kept++] = term;
    }
    s->term_count = kept;
    s->kind = SUMS_JACOBIAN;
}

lb_status function_jacobians(function_file *file)
{
    sums s = {0};
    plan p = {0};
    lb_status status = sums_of_jacobian(file->net, &file->pattern, &file->graph, &s);
    if (status == LB_OK)
        status = make_plan(file, &s, &p);
    bool is_single = status == LB_OK && p.blocks == 1;
    if (status == LB_OK)
        status = append_function(&(struct function){.file = file, .sums = &s, .plan = &p});
    plan_clear(&p);
    if (status == LB_OK && !is_single)
        append_scatter(file);
    if (!is_single) {
        sums_clear(&s);
        return status;
    }
    char size[256] = "";
    snprintf(size, sizeof size, "(size_t)%.100s_STATES*%.100s_STATES", file->name, file->name);
    make_dense(&s, &file->pattern);
    bool is_full = (size_t)file->pattern.nonzeros == (size_t)file->net->states * (size_t)file->net->states &&
                   s.term_count > 0;
    return append_plain(file, &s, status, is_full ? NULL : size);
}

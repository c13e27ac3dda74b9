/* The functions of an emitted file.
 *
 * A function of more than FUNCTION_LINES terms runs over tables (loops.c): compilers
 * take some milliseconds for every line.  Otherwise it is written out.
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
#include "emit/loops.h"
#include "emit/parts.h"
#include "emit/statement.h"

enum {
    DENSE_LIMIT = 4096       /* values of a Jacobian that is written out a second time as a dense one */
};

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

/* ---- Blocks as functions ------------------------------------------------------------- */

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
        parts_begin(f, &body);
        status = write_block(f, b, is_set, &body);
        append_block_comment(f, b);
        parts_static(f, b + 1, &body);
        buffer_clear(&body);
    }
    return status;
}

/* The whole function where it is one block. */
static lb_status append_single(const function *f, unsigned char *is_set, buffer *body)
{
    int shared = parts_shared(f);
    parts_begin(f, body);
    parts_prologue(f, shared, body);
    lb_status status = write_block(f, 0, is_set, body);
    if (f->sums->term_count == 0 && !f->zero_size)
        buffer_printf(body, "    (void)%s;\n", f->out);
    return status;
}

static lb_status append_driver(const function *f, unsigned char *is_set, buffer *body)
{
    int shared = parts_shared(f);
    lb_status status = append_blocks(f, is_set);
    parts_begin(f, body);
    parts_prologue(f, shared, body);
    parts_calls(f, f->plan->blocks, body);
    return status;
}

static lb_status append_function(function *f)
{
    f->verb = parts_verb(f->sums->kind);
    f->out = parts_out_name(f->sums->kind);
    f->file->writer.plan = f->plan;
    unsigned char *is_set = memory_zeroed(f->plan->distinct, 1);
    if (!is_set)
        return LB_E_NOMEM;
    buffer body;
    buffer_init(&body);
    lb_status status = f->plan->blocks == 1 ? append_single(f, is_set, &body) : append_driver(f, is_set, &body);
    parts_public(f, &body);
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

/* s of a table: each item gets a place in the array of what is shared. */
static lb_status make_plan(function_file *file, const sums *s, bool is_table, plan *p)
{
    memset(p, 0, sizeof *p);
    unsigned char *is_defined = memory_zeroed(file->graph.count, 1);
    lb_status status = is_defined ? extend_definitions(file) : LB_E_NOMEM;
    for (size_t e = 0; status == LB_OK && e < file->graph.count; e++)
        is_defined[e] = file->definition[e] >= 0;
    for (size_t i = 0; status == LB_OK && is_table && i < s->item_count; i++)
        is_defined[s->items[i].value] = 1;
    if (status == LB_OK)
        status = plan_make(&file->graph, s, is_defined, is_table, p);
    memory_free(is_defined);
    return status;
}

/* ---- Straight lines or tables ------------------------------------------------------------ */

static bool is_definition(const void *context, expression e)
{
    const function_file *file = context;
    return (size_t)e < file->definition_count && file->definition[e] >= 0;
}

static lb_status append_lines(function_file *file, sums *s, const char *zero_size)
{
    plan p = {0};
    lb_status status = make_plan(file, s, false, &p);
    if (status == LB_OK)
        status = append_function(&(function){.file = file, .sums = s, .plan = &p, .zero_size = zero_size});
    plan_clear(&p);
    return status;
}

static lb_status append_table(function_file *file, sums *s, const char *size)
{
    products table;
    plan p = {0};
    lb_status status = products_make(s, &file->graph, is_definition, file, &table);
    if (status == LB_OK)
        status = make_plan(file, &table.shared, true, &p);
    file->writer.plan = &p;
    if (status == LB_OK)
        status = loops_append(&(function){.file = file, .sums = s, .plan = &p, .zero_size = size,
                                          .verb = parts_verb(s->kind), .out = parts_out_name(s->kind)}, &table);
    plan_clear(&p);
    products_clear(&table);
    return status;
}

static bool is_table(const function_file *file, const sums *s)
{
    return s->term_count > file->lines;
}

/* size: elements of the output, as C; is_sparse: many of them are zero whatever x is. */
static lb_status append_sums(function_file *file, sums *s, lb_status status, const char *size, bool is_sparse)
{
    if (status == LB_OK)
        status = is_table(file, s) ? append_table(file, s, size) : append_lines(file, s, is_sparse ? size : NULL);
    sums_clear(s);
    return status;
}

/* "NAME_STATES", or with a second dimension "(size_t)NAME_STATES*NAME_CONSTANTS". */
static void write_size(const function_file *file, const char *rows, const char *columns, char size[256])
{
    if (columns)
        snprintf(size, 256, "(size_t)%.100s_%s*%.100s_%s", file->name, rows, file->name, columns);
    else
        snprintf(size, 256, "%.100s_%s", file->name, rows);
}

lb_status function_rates(function_file *file)
{
    sums s = {0};
    char size[256];
    write_size(file, "REACTIONS", NULL, size);
    return append_sums(file, &s, sums_of_rates(file->net, &file->graph, &s), size, false);
}

lb_status function_rhs(function_file *file)
{
    sums s = {0};
    char size[256];
    write_size(file, "STATES", NULL, size);
    return append_sums(file, &s, sums_of_rhs(file->net, &file->graph, &s), size, false);
}

lb_status function_dfdk(function_file *file)
{
    sums s = {0};
    char size[256];
    write_size(file, "STATES", "CONSTANTS", size);
    return append_sums(file, &s, sums_of_dfdk(file->net, &file->graph, &s), size, file->net->constant_count > 0);
}

/* ---- The two Jacobians ------------------------------------------------------------------ */

/* Dense from compressed values, without a second array: beyond DENSE_LIMIT, and with tables. */
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
    char size[256];
    write_size(file, "STATES", "STATES", size);
    make_dense(s, &file->pattern);
    size_t n = (size_t)file->net->states;
    return append_lines(file, s, (size_t)file->pattern.nonzeros == n * n ? NULL : size);
}

lb_status function_jacobians(function_file *file)
{
    sums s = {0};
    char size[256];
    write_size(file, "NONZEROS", NULL, size);
    lb_status status = sums_of_jacobian(file->net, &file->pattern, &file->graph, &s);
    bool is_short = !is_table(file, &s) && file->pattern.nonzeros <= DENSE_LIMIT;
    if (status == LB_OK)
        status = is_table(file, &s) ? append_table(file, &s, size) : append_lines(file, &s, NULL);
    if (status == LB_OK && is_short)
        status = append_dense(file, &s);
    else if (status == LB_OK)
        append_spreading(file);
    sums_clear(&s);
    return status;
}

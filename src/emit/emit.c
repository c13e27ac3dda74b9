/* From a network to NAME.h and NAME.c.
 *
 * This file decides the layout of the two files: head comments, the interface of
 * docs/emitted-code.md, the tables of names and numbers.  What the functions
 * compute is in sums.c, how they are cut is in plan.c, and function.c writes
 * them.  The same network gives the same bytes. */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/memory.h"
#include "base/status.h"
#include "emit/function.h"
#include "emit/head.h"
#include "emit/spell.h"
#include "limbeck.h"

enum { TEXT_LIMIT = HEAD_TEXT_LIMIT };

/* ---- Local names of definitions ---------------------------------------------------- */

struct spelled {
    char *text;
    int index;
};

static int by_text(const void *a, const void *b)
{
    return strcmp(((const struct spelled *)a)->text, ((const struct spelled *)b)->text);
}

/* d_NAME; where two names have the same letters and digits, or none, d3_NAME. */
static lb_status join_name(const struct spelled *spelled, bool is_unique, char **out)
{
    buffer name;
    buffer_init(&name);
    if (is_unique && *spelled->text)
        buffer_printf(&name, "d_%s", spelled->text);
    else
        buffer_printf(&name, "d%d_%s", spelled->index + 1, spelled->text);
    *out = buffer_take(&name);
    return *out ? LB_OK : LB_E_NOMEM;
}

static lb_status join_names(const struct spelled *sorted, int count, char **out)
{
    for (int i = 0; i < count; i++) {
        bool is_unique = (i == 0 || strcmp(sorted[i].text, sorted[i - 1].text) != 0) &&
                         (i + 1 == count || strcmp(sorted[i].text, sorted[i + 1].text) != 0);
        if (join_name(&sorted[i], is_unique, &out[sorted[i].index]) != LB_OK)
            return LB_E_NOMEM;
    }
    return LB_OK;
}

static lb_status name_definitions(function_file *file)
{
    const lb_network *net = file->net;
    int count = net->derived_count + net->reading_count;
    struct spelled *spelled = memory_zeroed((size_t)count, sizeof *spelled);
    file->definition_name = memory_zeroed((size_t)count, sizeof *file->definition_name);
    lb_status status = spelled && file->definition_name ? LB_OK : LB_E_NOMEM;
    for (int i = 0; status == LB_OK && i < count; i++) {
        buffer text;
        buffer_init(&text);
        const network_definition *of =
            i < net->derived_count ? &net->derived[i] : &net->readings[i - net->derived_count];
        spell_identifier(&text, of->name);
        spelled[i] = (struct spelled){buffer_take(&text), i};
        status = spelled[i].text ? LB_OK : LB_E_NOMEM;
    }
    if (status == LB_OK) {
        if (count > 1)
            qsort(spelled, (size_t)count, sizeof *spelled, by_text);
        status = join_names(spelled, count, file->definition_name);
    }
    for (int i = 0; spelled && i < count; i++)
        memory_free(spelled[i].text);
    memory_free(spelled);
    return status;
}

/* ---- The file's working state ----------------------------------------------------------- */

static lb_status copy_graph(const expression_graph *from, expression_graph *to)
{
    int *map = memory_array(from->count, sizeof *map);
    lb_status status = map ? LB_OK : LB_E_NOMEM;
    for (size_t e = 0; status == LB_OK && e < from->count; e++)
        status = expression_import(to, from, (expression)e, map);
    memory_free(map);
    return status;
}

/* Definitions that are a mere number, constant or state need no name. */
static lb_status copy_definitions(function_file *file)
{
    size_t count = file->net->graph.count;
    file->definition = memory_array(count, sizeof *file->definition);
    if (!file->definition)
        return LB_E_NOMEM;
    for (size_t e = 0; e < count; e++) {
        bool is_operation = file->net->graph.nodes[e].kind > EXPRESSION_STATE;
        file->definition[e] = file->net->definition_of && is_operation ? file->net->definition_of[e] : -1;
    }
    file->definition_count = count;
    return LB_OK;
}

static lb_status file_init(function_file *file, const lb_network *net, const char *name)
{
    memset(file, 0, sizeof *file);
    file->net = net;
    file->name = name;
    expression_graph_init(&file->graph);
    listing_init(&file->listing);
    buffer_init(&file->code);
    lb_status status = copy_graph(&net->graph, &file->graph);
    if (status == LB_OK)
        status = copy_definitions(file);
    if (status == LB_OK)
        status = name_definitions(file);
    if (status == LB_OK)
        status = sums_pattern_find(net, &file->pattern);
    file->writer.graph = &file->graph;
    file->writer.definition_name = (const char *const *)file->definition_name;
    file->writer.out = &file->listing.text;
    return status;
}

static void file_clear(function_file *file)
{
    int names = file->net->derived_count + file->net->reading_count;
    for (int i = 0; file->definition_name && i < names; i++)
        memory_free(file->definition_name[i]);
    memory_free(file->definition_name);
    memory_free(file->definition);
    sums_pattern_clear(&file->pattern);
    expression_graph_clear(&file->graph);
    listing_clear(&file->listing);
    buffer_clear(&file->code);
}

/* ---- Head comments -------------------------------------------------------------------- */

static void write_head(const function_file *file, const char *extension, buffer *out)
{
    char name[HEAD_LONGEST_NAME + 3];
    snprintf(name, sizeof name, "%s%s", file->name, extension);
    head_begin(file->net, name, out);
}

static void write_units(const lb_network *net, buffer *out)
{
    if (net->units.none) {
        buffer_append(out, " * Units: none.\n");
        return;
    }
    buffer_append(out, " * Units: concentrations in ");
    spell_comment(out, net->units.concentration_text, TEXT_LIMIT);
    buffer_append(out, ", time in ");
    spell_comment(out, net->units.time_text, TEXT_LIMIT);
    buffer_append(out, ".\n");
}

static const char *name_of_state(const lb_network *net, int state)
{
    return net->species[net->state_species[state]].name;
}

static const char *name_of_constant(const lb_network *net, int constant)
{
    return net->constants[constant].name;
}

static void write_species(const lb_network *net, buffer *out)
{
    buffer_append(out, " *\n * Species, x[]:\n");
    for (int i = 0; i < net->states; i++) {
        buffer_printf(out, " *   %3d  ", i);
        spell_comment(out, name_of_state(net, i), TEXT_LIMIT);
        buffer_char(out, '\n');
    }
}

static void write_constants(const lb_network *net, buffer *out)
{
    if (net->constant_count == 0) {
        buffer_append(out, " *\n * There are no constants: k may be NULL.\n");
        return;
    }
    buffer_append(out, " *\n * Constants, k[], with their values in the mechanism:\n");
    for (int i = 0; i < net->constant_count; i++) {
        const network_constant *constant = &net->constants[i];
        buffer_printf(out, " *   %3d  ", i);
        spell_comment(out, constant->name, TEXT_LIMIT);
        buffer_append(out, " = ");
        spell_number(out, constant->value);
        if (constant->unit && *constant->unit) {
            buffer_char(out, ' ');
            spell_comment(out, constant->unit, TEXT_LIMIT);
        }
        buffer_char(out, '\n');
    }
}

/* "x: 0 A, 1 B, ...", as many to a line as fit. */
static void write_index(const lb_network *net, const char *what, int count,
                        const char *(*text)(const lb_network *, int), buffer *out)
{
    enum { WIDTH = 92 };
    size_t line = out->length;
    buffer_printf(out, " * %s", what);
    for (int i = 0; i < count; i++) {
        if (out->length - line > WIDTH) {
            line = out->length + 1;
            buffer_append(out, "\n *   ");
        }
        buffer_printf(out, " %d ", i);
        spell_comment(out, text(net, i), TEXT_LIMIT);
        if (i + 1 < count)
            buffer_char(out, ',');
    }
    buffer_append(out, count > 0 ? "\n" : " none\n");
}

/* ---- The header ------------------------------------------------------------------------- */

/* C has no arrays of no elements: those get one. */
static int at_least_one(int count)
{
    return count > 0 ? count : 1;
}

static void write_prototype(const function_file *file, const char *what, const char *out_name, const char *comment,
                            buffer *out)
{
    buffer_printf(out, "%s\nvoid %s_%s(double t, const double x[], const double k[], double %s[]);\n", comment,
                  file->name, what, out_name);
}

static void write_declarations(const function_file *file, buffer *out)
{
    const lb_network *net = file->net;
    const char *name = file->name;
    int constants = at_least_one(net->constant_count), nonzeros = at_least_one(file->pattern.nonzeros);
    buffer_printf(out, "enum {\n    %s_STATES = %d,\n    %s_CONSTANTS = %d,\n", name, net->states, name,
                  net->constant_count);
    buffer_printf(out, "    %s_REACTIONS = %d,\n    %s_NONZEROS = %d\n};\n\n", name, net->reaction_steps, name,
                  file->pattern.nonzeros);
    buffer_printf(out, "extern const char *const %s_state_names[%d];\n", name, net->states);
    buffer_printf(out, "extern const char *const %s_constant_names[%d];\n", name, constants);
    buffer_printf(out, "extern const char *const %s_reaction_labels[%d];\n", name, at_least_one(net->reaction_steps));
    buffer_printf(out, "extern const double %s_initial[%d];   /* x at the start */\n", name, net->states);
    buffer_printf(out, "extern const double %s_defaults[%d];  /* k in the mechanism */\n\n", name, constants);
    buffer_append(out, "/* Pattern of the Jacobian in compressed columns: the entries of column j are\n"
                       " * column_start[j] .. column_start[j + 1] - 1, their rows ascend. */\n");
    buffer_printf(out, "extern const int %s_column_start[%d];\n", name, net->states + 1);
    buffer_printf(out, "extern const int %s_row[%d];\n\n", name, nonzeros);
    write_prototype(file, "rates", "v", "/* Rates of the one-way reactions, v[REACTIONS]. */", out);
    write_prototype(file, "rhs", "dxdt", "/* Time derivatives, dxdt[STATES]. */", out);
    write_prototype(file, "jacobian", "J", "/* J[i + j*STATES] = d(dxdt[i])/d(x[j]). */", out);
    write_prototype(file, "jacobian_sparse", "values", "/* The same, values[NONZEROS] in the pattern above. */", out);
    write_prototype(file, "dfdk", "D", "/* D[i + j*STATES] = d(dxdt[i])/d(k[j]). */", out);
}

/* What CMake and pkg-config want to read. */
static void write_build_files(const char *name, buffer *out)
{
    buffer_append(out, " * In a CMakeLists.txt:\n *\n");
    buffer_printf(out, " *     add_library(%s STATIC %s.c)\n", name, name);
    buffer_printf(out, " *     target_include_directories(%s PUBLIC ${CMAKE_CURRENT_SOURCE_DIR})\n", name);
    buffer_printf(out, " *     target_link_libraries(%s PUBLIC m)\n *\n", name);
    buffer_printf(out, " * As an installed library with a %s.pc for pkg-config:\n *\n", name);
    buffer_printf(out, " *     prefix=/usr/local\n *     Name: %s\n *     Description: a reaction mechanism\n", name);
    buffer_printf(out, " *     Version: 1\n *     Cflags: -I${prefix}/include\n"
                       " *     Libs: -L${prefix}/lib -l%s -lm\n *\n", name);
}

static void write_header(const function_file *file, buffer *out)
{
    const char *name = file->name;
    write_head(file, ".h", out);
    buffer_append(out, " *\n * C99, needs libm alone:\n *\n");
    buffer_printf(out, " *     cc -std=c99 -O2 -c %s.c\n *     cc -o program program.o %s.o -lm\n *\n", name, name);
    write_build_files(name, out);
    buffer_printf(out, " * Start from x = %s_initial and k = %s_defaults, or from your own copies of\n", name, name);
    buffer_append(out, " * them.  The functions keep nothing between calls and may run in many threads at\n"
                       " * once; the output array must not overlap x or k.  t is the time; no rate depends\n"
                       " * on it yet.\n *\n");
    write_units(file->net, out);
    write_species(file->net, out);
    write_constants(file->net, out);
    buffer_append(out, " */\n");
    buffer_printf(out, "#ifndef LIMBECK_MODEL_%s_H\n#define LIMBECK_MODEL_%s_H\n\n", name, name);
    buffer_append(out, "#ifdef __cplusplus\nextern \"C\" {\n#endif\n\n");
    write_declarations(file, out);
    buffer_append(out, "\n#ifdef __cplusplus\n}\n#endif\n\n#endif\n");
}

/* ---- The tables of the source -------------------------------------------------------------- */

/* Strings, one a line, with the place of each beside it. */
static void write_strings(const function_file *file, const char *what, int count,
                          const char *(*text)(const lb_network *, int), buffer *out)
{
    buffer_printf(out, "const char *const %s_%s[%d] = {\n", file->name, what, at_least_one(count));
    for (int i = 0; i < count; i++) {
        buffer_append(out, "    ");
        spell_string(out, text(file->net, i));
        buffer_printf(out, ",  /* %d */\n", i);
    }
    buffer_append(out, count > 0 ? "};\n\n" : "    \"\"\n};\n\n");
}

static const char *name_of_step(const lb_network *net, int step)
{
    return net->steps[step].name;
}

static void write_numbers(const function_file *file, const char *what, int count,
                          double (*value)(const lb_network *, int), const char *(*text)(const lb_network *, int),
                          buffer *out)
{
    buffer_printf(out, "const double %s_%s[%d] = {\n", file->name, what, at_least_one(count));
    for (int i = 0; i < count; i++) {
        buffer_append(out, "    ");
        spell_number(out, value(file->net, i));
        buffer_append(out, ",  /* ");
        spell_comment(out, text(file->net, i), TEXT_LIMIT);
        buffer_append(out, " */\n");
    }
    buffer_append(out, count > 0 ? "};\n\n" : "    0.0\n};\n\n");
}

static double initial_of(const lb_network *net, int state)
{
    return net->species[net->state_species[state]].initial_value;
}

static double value_of(const lb_network *net, int constant)
{
    return net->constants[constant].value;
}

static void write_integers(const function_file *file, const char *what, const int *values, int count, buffer *out)
{
    enum { PER_LINE = 12 };
    buffer_printf(out, "const int %s_%s[%d] = {", file->name, what, at_least_one(count));
    for (int i = 0; i < at_least_one(count); i++)
        buffer_printf(out, "%s%d%s", i % PER_LINE ? " " : "\n    ", count > 0 ? values[i] : 0,
                      i + 1 < count ? "," : "");
    buffer_append(out, "\n};\n\n");
}

static bool has_numbers_to_name(const function_file *file)
{
    const lb_network *net = file->net;
    for (int i = 0; i < net->states; i++)
        if (!(initial_of(net, i) - initial_of(net, i) == 0))
            return true;
    return false;
}

static void write_source(function_file *file, buffer *out)
{
    const lb_network *net = file->net;
    write_head(file, ".c", out);
    buffer_append(out, " *\n");
    write_units(net, out);
    write_index(net, "x:", net->states, name_of_state, out);
    write_index(net, "k:", net->constant_count, name_of_constant, out);
    buffer_printf(out, " *\n * How to use it, units and values of the constants are in %s.h.\n */\n", file->name);
    buffer_printf(out, "#include \"%s.h\"\n\n", file->name);
    bool needs_math = file->writer.uses_math || has_numbers_to_name(file);
    buffer_append(out, needs_math ? "#include <math.h>\n#include <stddef.h>\n\n" : "#include <stddef.h>\n\n");
    write_strings(file, "state_names", net->states, name_of_state, out);
    write_strings(file, "constant_names", net->constant_count, name_of_constant, out);
    write_strings(file, "reaction_labels", net->reaction_steps, name_of_step, out);
    write_numbers(file, "initial", net->states, initial_of, name_of_state, out);
    write_numbers(file, "defaults", net->constant_count, value_of, name_of_constant, out);
    write_integers(file, "column_start", file->pattern.column_start, net->states + 1, out);
    write_integers(file, "row", file->pattern.row, file->pattern.nonzeros, out);
    write_helpers(&file->writer, out);
    buffer_append(out, buffer_get(&file->code));
    /* The last function ends the file, not a blank line. */
    if (out->status == LB_OK && out->length > 0)
        out->data[--out->length] = '\0';
}

lb_status lb_emit(const lb_network *network, const lb_emit_options *options, lb_text *header, lb_text *source,
                  lb_error *err)
{
    lb_status status = head_check_name(options, err);
    if (status != LB_OK)
        return status;
    function_file file;
    status = file_init(&file, network, options->name);
    file.lines = options->lines > 0 ? options->lines : FUNCTION_LINES;
    if (status == LB_OK)
        status = function_rates(&file);
    if (status == LB_OK)
        status = function_rhs(&file);
    if (status == LB_OK)
        status = function_jacobians(&file);
    if (status == LB_OK)
        status = function_dfdk(&file);
    if (status == LB_OK)
        status = file.code.status;
    if (status == LB_OK) {
        write_header(&file, header);
        write_source(&file, source);
        status = header->status != LB_OK ? header->status : source->status;
    }
    file_clear(&file);
    return status == LB_OK ? LB_OK : status_raise(err, status, NULL, "%s", lb_status_text(status));
}

/* NAME_SOLVER.h, NAME_SOLVER.c and NAME_SOLVER_main.c: templates filled in.
 *
 * Nothing of the mechanism stands in these files but its title, in the head comments,
 * and its units, as strings; the names of species are taken from the model at run time. */
#include "emit/glue.h"

#include <string.h>

#include "base/status.h"
#include "emit/head.h"
#include "emit/spell.h"
#include "model/network.h"

/* ---- What the examples have in common ------------------------------------------------- */

static const char includes[] =
    "#include <math.h>\n"
    "#include <stdio.h>\n"
    "#include <stdlib.h>\n"
    "#include <string.h>\n"
    "\n";

static const char functions[] =
    "/* Argument i, a positive number; given where there is none. */\n"
    "static double argument(int argc, char **argv, int i, double given)\n"
    "{\n"
    "    char *end = NULL;\n"
    "    const double value = i < argc ? strtod(argv[i], &end) : given;\n"
    "    if ((end && (end == argv[i] || *end)) || !(value > 0.0 && value <= 1e300)) {\n"
    "        fprintf(stderr, \"usage: %s [UNTIL [ROWS [TOLERANCE]]]\\n\", argv[0]);\n"
    "        exit(2);\n"
    "    }\n"
    "    return value;\n"
    "}\n"
    "\n"
    "/* What is small beside the largest concentration at the start.  Species that matter at far\n"
    " * smaller concentrations want tolerances of their own. */\n"
    "static double absolute_tolerance(const double x[], double relative)\n"
    "{\n"
    "    double largest = 0.0;\n"
    "    for (int i = 0; i < @_STATES; i++)\n"
    "        largest = fmax(largest, fabs(x[i]));\n"
    "    return 1e-6*relative*(largest > 0.0 ? largest : 1.0);\n"
    "}\n"
    "\n"
    "/* A field of the heading, in quotes where it must be (RFC 4180). */\n"
    "static void print_field(const char *open, const char *name, const char *close, const char *unit)\n"
    "{\n"
    "    const char *const part[4] = {open, name, close, unit};\n"
    "    const int is_quoted = strpbrk(name, \",\\\"\\r\\n\") || strpbrk(unit, \",\\\"\\r\\n\");\n"
    "    if (is_quoted)\n"
    "        putchar('\"');\n"
    "    for (int i = 0; i < 4; i++) {\n"
    "        for (const char *c = part[i]; *c; c++) {\n"
    "            if (*c == '\"')\n"
    "                putchar('\"');\n"
    "            putchar(*c);\n"
    "        }\n"
    "    }\n"
    "    if (is_quoted)\n"
    "        putchar('\"');\n"
    "}\n"
    "\n"
    "/* t and the species, with their units. */\n"
    "static void print_heading(void)\n"
    "{\n"
    "    static const char *const concentration = $c, *const time = $t;\n"
    "    print_field(\"\", \"t\", \"\", time);\n"
    "    for (int i = 0; i < @_STATES; i++) {\n"
    "        putchar(',');\n"
    "        print_field(\"[\", @_state_names[i], \"]\", concentration);\n"
    "    }\n"
    "    putchar('\\n');\n"
    "}\n"
    "\n"
    "static void print_line(double t, const double x[])\n"
    "{\n"
    "    printf(\"%.17g\", t);\n"
    "    for (int i = 0; i < @_STATES; i++)\n"
    "        printf(\",%.17g\", x[i]);\n"
    "    printf(\"\\n\");\n"
    "}\n"
    "\n";

/* ---- Filling in ------------------------------------------------------------------------- */

/* " [mM]" as a C string, or "" where there is no unit. */
static void append_unit(const lb_network *net, const char *symbol, buffer *out)
{
    buffer text;
    buffer_init(&text);
    if (!net->units.none && symbol && *symbol)
        buffer_printf(&text, " [%s]", symbol);
    if (text.status != LB_OK)
        out->status = text.status;
    spell_string(out, buffer_get(&text));
    buffer_clear(&text);
}

static void expand(const lb_network *net, const char *name, const char *text, buffer *out)
{
    for (size_t plain; *text; text++) {
        plain = strcspn(text, "@$");
        buffer_append_n(out, text, plain);
        text += plain;
        if (*text == '@') {
            buffer_append(out, name);
            continue;
        }
        if (!*text)
            return;
        switch (*++text) {
        case 'c': append_unit(net, net->units.concentration_text, out); break;
        case 't': append_unit(net, net->units.time_text, out); break;
        case 'i': buffer_append(out, includes); break;
        case 'p': expand(net, name, functions, out); break;
        default:  buffer_char(out, *text); break;
        }
    }
}

static void begin_file(const lb_network *net, const char *name, const char *solver, const char *ending, buffer *out)
{
    buffer file;
    buffer_init(&file);
    buffer_printf(&file, "%s_%s%s", name, solver, ending);
    head_begin(net, buffer_get(&file), out);
    if (file.status != LB_OK)
        out->status = file.status;
    buffer_clear(&file);
}

static void write_example(const lb_network *net, const char *name, const glue_template *glue, buffer *out)
{
    begin_file(net, name, glue->solver, "_main.c", out);
    buffer_append(out, " *\n");
    buffer_printf(out, " *     %s_%s_main [UNTIL [ROWS [TOLERANCE]]]\n *\n", name, glue->solver);
    buffer_append(out, " * integrates the model from its initial state and prints comma-separated values: 200 rows\n"
                       " * up to the time 100 at a relative tolerance of 1e-8, unless told otherwise.\n");
    buffer_printf(out, " * How to build it is in %s_%s.h. */\n", name, glue->solver);
    expand(net, name, glue->example, out);
}

lb_status lb_emit_glue(const lb_network *network, const lb_emit_options *options, lb_text *header, lb_text *source,
                       lb_text *example, lb_error *err)
{
    lb_status status = head_check_name(options, err);
    if (status != LB_OK)
        return status;
    const glue_template *glue = options->solver == LB_SOLVER_GSL ? &glue_gsl
                                : options->solver == LB_SOLVER_CVODES ? &glue_cvodes : NULL;
    if (!glue)
        return status_raise(err, LB_E_ARG, "choose GSL or CVODES", "there is no glue without a solver");
    begin_file(network, options->name, glue->solver, ".h", header);
    buffer_append(header, " *\n");
    expand(network, options->name, glue->header, header);
    begin_file(network, options->name, glue->solver, ".c", source);
    expand(network, options->name, glue->source, source);
    write_example(network, options->name, glue, example);
    const buffer *texts[] = {header, source, example};
    for (int i = 0; i < 3 && status == LB_OK; i++)
        status = texts[i]->status;
    return status == LB_OK ? LB_OK : status_raise(err, status, NULL, "%s", lb_status_text(status));
}

/* limbeck emit: the model as C, two files in a folder, and three more for a solver. */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "cli/files.h"
#include "cli/session.h"

enum { HEADER, SOURCE, GLUE_HEADER, GLUE_SOURCE, EXAMPLE, MOST_FILES };

/* The files on their way to the disk: two, or five with the glue to a solver. */
typedef struct output {
    char *name;
    int count;
    lb_text *text[MOST_FILES];
    char *path[MOST_FILES];
    pending_file pending[MOST_FILES];
} output;

static void output_clear(output *o)
{
    for (int i = 0; i < MOST_FILES; i++) {
        files_abandon(&o->pending[i]);
        lb_text_free(o->text[i]);
        free(o->path[i]);
    }
    free(o->name);
}

static char *choose_name(const options *given)
{
    if (given->name)
        return strdup(given->name);
    return lb_emit_name(strcmp(given->file, "-") == 0 ? "mechanism" : given->file);
}

static const char *const endings[][MOST_FILES] = {
    [LB_SOLVER_NONE] = {".h", ".c", NULL, NULL, NULL},
    [LB_SOLVER_GSL] = {".h", ".c", "_gsl.h", "_gsl.c", "_gsl_main.c"},
    [LB_SOLVER_CVODES] = {".h", ".c", "_cvodes.h", "_cvodes.c", "_cvodes_main.c"},
};

/* The texts and the paths, nothing on the disk yet. */
static lb_status compose(const session *s, output *o, lb_error *error)
{
    lb_emit_options emit_options = {.solver = s->given->solver};
    *error = (lb_error){.code = LB_E_NOMEM};
    o->count = emit_options.solver == LB_SOLVER_NONE ? GLUE_HEADER : MOST_FILES;
    emit_options.name = o->name = choose_name(s->given);
    if (!o->name)
        return LB_E_NOMEM;
    for (int i = 0; i < o->count; i++) {
        o->text[i] = lb_text_new();
        o->path[i] = files_join(s->given->output, o->name, endings[emit_options.solver][i]);
        if (!o->text[i] || !o->path[i])
            return LB_E_NOMEM;
    }
    lb_status status = lb_emit(s->network, &emit_options, o->text[HEADER], o->text[SOURCE], error);
    if (status == LB_OK && o->count == MOST_FILES)
        status = lb_emit_glue(s->network, &emit_options, o->text[GLUE_HEADER], o->text[GLUE_SOURCE],
                              o->text[EXAMPLE], error);
    return status;
}

/* All files or none: each is complete beside its place before one is renamed. */
static lb_status save(const session *s, output *o, lb_error *error)
{
    lb_status status = files_make_folder(s->given->output, error);
    for (int i = 0; status == LB_OK && i < o->count; i++) {
        size_t length;
        const char *bytes = lb_text_get(o->text[i], &length);
        status = files_prepare(o->path[i], bytes, length, &o->pending[i], error);
    }
    for (int i = 0; status == LB_OK && i < o->count; i++)
        status = files_commit(&o->pending[i], error);
    return status;
}

/* What was written, on standard output. */
static int announce(session *s, const output *o)
{
    if (s->given->json) {
        lb_emit_paths paths = {o->path[HEADER], o->path[SOURCE], o->path[GLUE_HEADER], o->path[GLUE_SOURCE],
                               o->path[EXAMPLE]};
        return session_print(s, lb_json_emit(s->network, s->diagnostics, &paths, s->text));
    }
    bool has_failed = false;
    for (int i = 0; !s->given->quiet && i < o->count; i++)
        has_failed = has_failed || printf("%s\n", o->path[i]) < 0;
    if (has_failed || fflush(stdout))
        return session_fail_status(s, LB_E_IO);
    return EXIT_ANSWERED;
}

static int emit(session *s)
{
    output o = {0};
    lb_error error;
    int result;
    lb_status status = compose(s, &o, &error);
    if (status == LB_E_ARG && s->given->name)
        result = session_fail_usage(s, &error);
    else if (status != LB_OK || save(s, &o, &error) != LB_OK)
        result = session_fail(s, &error);
    else
        result = announce(s, &o);
    output_clear(&o);
    return result;
}

static int run(const options *given)
{
    if (!given->output) {
        lb_error error = {.code = LB_E_ARG,
                          .message = "emit needs the folder to write to",
                          .remedy = "write -o FOLDER; it is made if it is missing, and `-o .` is this one"};
        return session_report(given, &error, NULL, EXIT_USAGE);
    }
    session s;
    int result = session_open(&s, given);
    if (result == EXIT_ANSWERED) {
        session_warn(&s);
        result = emit(&s);
    }
    session_close(&s);
    return result;
}

static const option_spec own[] = {
    {OPTION_OUTPUT, "--output", 'o', "FOLDER", "where NAME.h and NAME.c go; made if missing"},
    {OPTION_NAME, "--name", 0, "NAME", "prefix of the names in the C, and of the files (the file's name)"},
    {OPTION_FOR, "--for", 0, "LIBRARY", "gsl or cvodes: glue to its solvers and an example program as well"},
};

const command command_emit = {
    .name = "emit",
    .usage = "emit FILE -o FOLDER [options]",
    .summary = "the model as C: right-hand side, Jacobian, parameter derivatives",
    .about = "Write NAME.h and NAME.c: rates, right-hand side, dense and sparse analytic\n"
             "Jacobian and derivatives by the constants, in C99 that needs nothing but the\n"
             "mathematical library. The C is yours, under any terms. With --for, NAME_gsl.h,\n"
             "NAME_gsl.c and NAME_gsl_main.c (or NAME_cvodes...) as well: callbacks for that\n"
             "library and a program that integrates and prints comma-separated values.\n",
    .examples = "  limbeck emit bath.mech -o model/\n"
                "  limbeck emit bath.mech -o . --name bath_2\n"
                "  cc -std=c99 -c model/bath.c\n"
                "  limbeck emit bath.mech -o model/ --for cvodes\n",
    .own = own,
    .own_count = sizeof own / sizeof *own,
    .run = run,
};

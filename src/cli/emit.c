/* limbeck emit: the model as C, two files in a folder. */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "cli/files.h"
#include "cli/session.h"

/* The two files on their way to the disk. */
typedef struct output {
    char *name, *header_path, *source_path;
    lb_text *header, *source;
    pending_file pending_header, pending_source;
} output;

static void output_clear(output *o)
{
    files_abandon(&o->pending_header);
    files_abandon(&o->pending_source);
    lb_text_free(o->header);
    lb_text_free(o->source);
    free(o->name);
    free(o->header_path);
    free(o->source_path);
}

static char *choose_name(const options *given)
{
    if (given->name)
        return strdup(given->name);
    return lb_emit_name(strcmp(given->file, "-") == 0 ? "mechanism" : given->file);
}

/* The texts and the paths, nothing on the disk yet. */
static lb_status compose(const session *s, output *o, lb_error *error)
{
    const lb_status no_memory = LB_E_NOMEM;
    *error = (lb_error){.code = no_memory};
    o->name = choose_name(s->given);
    o->header = lb_text_new();
    o->source = lb_text_new();
    if (!o->name || !o->header || !o->source)
        return no_memory;
    o->header_path = files_join(s->given->output, o->name, ".h");
    o->source_path = files_join(s->given->output, o->name, ".c");
    if (!o->header_path || !o->source_path)
        return no_memory;
    lb_emit_options emit_options = {.name = o->name};
    return lb_emit(s->network, &emit_options, o->header, o->source, error);
}

/* Both files or neither: both are complete beside their places before one is renamed. */
static lb_status save(const session *s, output *o, lb_error *error)
{
    size_t header_length, source_length;
    const char *header = lb_text_get(o->header, &header_length), *source = lb_text_get(o->source, &source_length);
    lb_status status = files_make_folder(s->given->output, error);
    if (status == LB_OK)
        status = files_prepare(o->header_path, header, header_length, &o->pending_header, error);
    if (status == LB_OK)
        status = files_prepare(o->source_path, source, source_length, &o->pending_source, error);
    if (status == LB_OK)
        status = files_commit(&o->pending_header, error);
    if (status == LB_OK)
        status = files_commit(&o->pending_source, error);
    return status;
}

/* What was written, on standard output. */
static int announce(session *s, const output *o)
{
    if (s->given->json)
        return session_print(s, lb_json_emit(s->network, s->diagnostics, o->header_path, o->source_path, s->text));
    if (!s->given->quiet && (printf("%s\n%s\n", o->header_path, o->source_path) < 0 || fflush(stdout)))
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
};

const command command_emit = {
    .name = "emit",
    .usage = "emit FILE -o FOLDER [options]",
    .summary = "the model as C: right-hand side, Jacobian, parameter derivatives",
    .about = "Write NAME.h and NAME.c: rates, right-hand side, dense and sparse analytic\n"
             "Jacobian and derivatives by the constants, in C99 that needs nothing but the\n"
             "mathematical library. The C is yours, under any terms.\n",
    .examples = "  limbeck emit bath.mech -o model/\n"
                "  limbeck emit bath.mech -o . --name bath_2\n"
                "  cc -std=c99 -c model/bath.c\n",
    .own = own,
    .own_count = sizeof own / sizeof *own,
    .run = run,
};

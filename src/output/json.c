/* One JSON object per answer (docs/json.md): the common keys, values, errors.
 *
 * Numbers have 17 significant digits, so that reading them gives the same bits;
 * JSON has no infinity and no NaN, both are null. */
#include "output/json.h"

#include <math.h>
#include <string.h>

#include "base/buffer.h"
#include "base/memory.h"

void json_put(json_writer *w, json_t *object, const char *key, json_t *value)
{
    if (json_object_set_new(object, key, value))
        w->failed = true;
}

void json_add(json_writer *w, json_t *array, json_t *value)
{
    if (json_array_append_new(array, value))
        w->failed = true;
}

json_t *json_number(double value)
{
    return isfinite(value) ? json_real(value) : json_null();
}

json_t *json_count(size_t value)
{
    return json_integer((json_int_t)value);
}

/* Length of the UTF-8 character at text; 0 where there is none. */
static size_t character_length(const unsigned char *text)
{
    size_t length = text[0] < 0x80 ? 1 : text[0] >= 0xc2 && text[0] < 0xe0 ? 2 : text[0] >= 0xe0 && text[0] < 0xf0 ? 3
                  : text[0] >= 0xf0 && text[0] < 0xf5 ? 4 : 0;
    for (size_t i = 1; i < length; i++)
        if ((text[i] & 0xc0) != 0x80)
            return 0;
    if (length == 3 && ((text[0] == 0xe0 && text[1] < 0xa0) || (text[0] == 0xed && text[1] >= 0xa0)))
        return 0; /* overlong, surrogate */
    if (length == 4 && ((text[0] == 0xf0 && text[1] < 0x90) || (text[0] == 0xf4 && text[1] >= 0x90)))
        return 0; /* overlong, beyond U+10FFFF */
    return length;
}

json_t *json_text(const char *text)
{
    buffer valid;
    buffer_init(&valid);
    for (const char *c = text; *c;) {
        size_t length = character_length((const unsigned char *)c);
        if (length)
            buffer_append_n(&valid, c, length);
        else
            buffer_append(&valid, "\xef\xbf\xbd");
        c += length ? length : 1;
    }
    json_t *value = buffer_status(&valid) == LB_OK ? json_string(buffer_get(&valid)) : NULL;
    buffer_clear(&valid);
    return value;
}

json_t *json_complex(lb_complex value)
{
    json_t *pair = json_array();
    if (!pair || json_array_append_new(pair, json_number(value.re)) || json_array_append_new(pair, json_number(value.im))) {
        json_decref(pair);
        return NULL;
    }
    return pair;
}

json_t *json_answer(lb_answer answer)
{
    return answer == LB_UNDECIDED ? json_null() : json_boolean(answer == LB_YES);
}

json_t *json_states(json_writer *w, const lb_network *net, const double *x)
{
    json_t *object = json_object();
    for (int i = 0; i < net->states; i++)
        json_put(w, object, lb_network_state_name(net, i), json_number(x[i]));
    return object;
}

json_t *json_flagged(json_writer *w, const lb_network *net, const bool *flag)
{
    json_t *list = json_array();
    for (int i = 0; i < net->states; i++)
        if (flag[i])
            json_add(w, list, json_text(lb_network_state_name(net, i)));
    return list;
}

static json_t *diagnostic_value(json_writer *w, const lb_diagnostic *diagnostic)
{
    json_t *object = json_object();
    json_put(w, object, "line", json_integer(diagnostic->line));
    json_put(w, object, "column", json_integer(diagnostic->column));
    json_put(w, object, "message", json_text(diagnostic->message));
    if (diagnostic->remedy && *diagnostic->remedy)
        json_put(w, object, "remedy", json_text(diagnostic->remedy));
    return object;
}

/* The faults, or the warnings, of a list that may be NULL. */
static json_t *diagnostics_value(json_writer *w, const lb_diagnostics *diagnostics, bool faults)
{
    json_t *list = json_array();
    for (size_t i = 0; diagnostics && i < lb_diagnostics_count(diagnostics); i++) {
        lb_diagnostic diagnostic = lb_diagnostics_get(diagnostics, i);
        if (diagnostic.is_fault == faults)
            json_add(w, list, diagnostic_value(w, &diagnostic));
    }
    return list;
}

void json_begin(json_writer *w, const char *command, const char *file, const lb_diagnostics *diagnostics)
{
    w->failed = false;
    w->root = json_object();
    json_put(w, w->root, "limbeck", json_text(LB_VERSION));
    json_put(w, w->root, "command", command ? json_text(command) : json_null());
    json_put(w, w->root, "file", file ? json_text(file) : json_null());
    json_put(w, w->root, "warnings", diagnostics_value(w, diagnostics, false));
}

static int append_to_text(const char *bytes, size_t size, void *out)
{
    buffer_append_n(out, bytes, size);
    return buffer_status(out) == LB_OK ? 0 : -1;
}

lb_status json_finish(json_writer *w, lb_text *out)
{
    lb_status status = LB_E_NOMEM;
    if (!w->failed) {
        int dumped = json_dump_callback(w->root, append_to_text, out, JSON_REAL_PRECISION(17));
        buffer_char(out, '\n');
        status = buffer_status(out);
        if (status == LB_OK && dumped)
            status = LB_E_NOMEM;
    }
    json_decref(w->root);
    w->root = NULL;
    return status;
}

/* LB_E_ARG gives "argument": the name of the code in lower case, without its prefix. */
static const char *code_name(lb_status code)
{
    switch (code) {
    case LB_OK: break;
    case LB_E_ARG: return "argument";
    case LB_E_NOMEM: return "memory";
    case LB_E_IO: return "file";
    case LB_E_MECHANISM: return "mechanism";
    case LB_E_NAME: return "name";
    case LB_E_LIMIT: return "limit";
    case LB_E_NEGATIVE: return "negative";
    case LB_E_STEP: return "step";
    case LB_E_FINITE: return "finite";
    case LB_E_NUMERIC: return "numeric";
    case LB_E_STOPPED: return "interrupted";
    }
    return "none";
}

void json_put_error(json_writer *w, const lb_error *error, const lb_diagnostics *diagnostics)
{
    json_t *object = json_object();
    json_put(w, object, "code", json_text(code_name(error->code)));
    json_put(w, object, "message", json_text(*error->message ? error->message : lb_status_text(error->code)));
    json_put(w, object, "remedy", json_text(error->remedy));
    json_put(w, object, "faults", diagnostics_value(w, diagnostics, true));
    json_put(w, w->root, "error", object);
}

lb_status lb_json_error(const char *command, const char *file, const lb_error *error, const lb_diagnostics *diagnostics,
                        lb_text *out)
{
    json_writer w;
    json_begin(&w, command, file, diagnostics);
    json_put_error(&w, error, diagnostics);
    return json_finish(&w, out);
}

void json_put_engine(json_writer *w, const lb_system *system)
{
    json_put(w, w->root, "engine", json_text(lb_system_engine(system)));
    json_put(w, w->root, "engine_note", json_text(lb_system_engine_note(system)));
}

/* From text, or a file, to a network: parse, lower, hand over. */
#include <errno.h>
#include <stdio.h>
#include <string.h>

#include "base/status.h"
#include "model/lower.h"

static lb_status keep_text(lb_network *net, const source *s)
{
    char *name = memory_text(source_name(s));
    char *copy = memory_text_n(source_text(s), source_length(s));
    if (!name || !copy) {
        memory_free(name);
        memory_free(copy);
        return LB_E_NOMEM;
    }
    memory_free(net->file);
    memory_free(net->source);
    net->file = name;
    net->source = copy;
    return LB_OK;
}

/* Parse and lower what the list's source holds. */
static lb_status read_source(lb_diagnostics *list, const lb_setting *settings, size_t setting_count,
                             lb_network **network, lb_error *err)
{
    syntax_tree *tree = NULL;
    lb_status status = syntax_parse(list, &tree);
    if (status != LB_OK)
        return status_raise(err, status, NULL, "%s", lb_status_text(status));
    status = lower_tree(tree, list, settings, setting_count, network, err);
    syntax_free(tree);
    if (status != LB_OK)
        return status;
    diagnostics_sort(list);
    size_t faults = lb_diagnostics_faults(list);
    if (faults > 0)
        return status_raise(err, LB_E_MECHANISM, NULL, "the mechanism has %zu fault%s", faults,
                            faults == 1 ? "" : "s");
    return keep_text(*network, diagnostics_source(list));
}

/* The same; takes the source, and gives the list. */
static lb_status take_source(source *s, const lb_setting *settings, size_t setting_count, lb_network **network,
                             lb_diagnostics **diagnostics, lb_error *err)
{
    lb_status status = diagnostics_new(s, diagnostics);
    if (status == LB_OK)
        status = read_source(*diagnostics, settings, setting_count, network, err);
    if (status == LB_E_NOMEM) {
        lb_network_free(*network);
        lb_diagnostics_free(*diagnostics);
        *network = NULL;
        *diagnostics = NULL;
        return status_no_memory(err);
    }
    return status;
}

lb_status lb_network_parse(const char *file, const char *text, size_t length, const lb_setting *settings,
                           size_t setting_count, lb_network **network, lb_diagnostics **diagnostics,
                           lb_error *err)
{
    source *s = NULL;
    *network = NULL;
    *diagnostics = NULL;
    lb_status status = source_new(file, text, length, &s);
    if (status != LB_OK)
        return status_raise(err, status, NULL, "%s", lb_status_text(status));
    return take_source(s, settings, setting_count, network, diagnostics, err);
}

/* ---- Files ------------------------------------------------------------------------------------ */

static lb_status read_all(FILE *stream, const char *path, buffer *text, lb_error *err)
{
    char block[65536];
    size_t count;
    errno = 0;
    while ((count = fread(block, 1, sizeof block, stream)) > 0)
        buffer_append_n(text, block, count);
    if (ferror(stream))
        return status_raise(err, LB_E_IO, NULL, "%s cannot be read: %s", path, strerror(errno));
    lb_status status = buffer_status(text);
    return status == LB_OK ? LB_OK : status_raise(err, status, NULL, "%s: %s", path, lb_status_text(status));
}

lb_status lb_network_read(const char *path, const lb_setting *settings, size_t setting_count,
                          lb_network **network, lb_diagnostics **diagnostics, lb_error *err)
{
    bool is_input = strcmp(path, "-") == 0;
    *network = NULL;
    *diagnostics = NULL;
    FILE *stream = is_input ? stdin : fopen(path, "rb");
    if (!stream)
        return status_raise(err, LB_E_IO, NULL, "%s cannot be read: %s", path, strerror(errno));
    buffer text;
    buffer_init(&text);
    lb_status status = read_all(stream, is_input ? "standard input" : path, &text, err);
    if (!is_input)
        fclose(stream);
    source *s = NULL;
    if (status == LB_OK && (status = source_new(path, buffer_get(&text), text.length, &s)) != LB_OK)
        status_raise(err, status, NULL, "%s: %s", path, lb_status_text(status));
    buffer_clear(&text);
    return status == LB_OK ? take_source(s, settings, setting_count, network, diagnostics, err) : status;
}

/* ---- Times -------------------------------------------------------------------------------------- */

lb_status lb_network_time(const lb_network *network, const char *text, double *time, lb_error *err)
{
    lb_network shell = {.units = network->units};
    const lower l = {.net = &shell};
    double number;
    unit measure;
    bool has_unit;
    lb_diagnostics *list;
    lb_status status = lower_read_number(&l, text, &number, &measure, &has_unit, &list);
    dimension wanted = dimension_none();
    wanted.num[DIMENSION_TIME] = 1;
    lb_diagnostic first = {.message = "it is no plain number", .remedy = ""};
    if (list && lb_diagnostics_count(list) > 0)
        first = lb_diagnostics_get(list, 0);
    if (status == LB_E_ARG)
        status_raise(err, status, first.remedy[0] ? first.remedy : "write a number, such as `3600` or `1 h`",
                     "`%s` is no time: %s", text, first.message);
    else if (status == LB_E_NOMEM)
        status_no_memory(err);
    else if (has_unit && !dimension_equal(&measure.dim, &wanted))
        status = status_raise(err, LB_E_ARG, "write a unit of time: s, ms, min or h",
                              "`%s` is no time: the unit does not fit", text);
    else
        *time = has_unit ? unit_to_stored(&network->units, &measure, number) : number;
    lb_diagnostics_free(list);
    return status;
}

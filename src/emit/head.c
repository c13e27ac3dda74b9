/* Names of models, and how every emitted file begins. */
#include "emit/head.h"

#include <ctype.h>
#include <string.h>

#include "base/memory.h"
#include "base/status.h"
#include "emit/spell.h"
#include "model/network.h"

/* The last part of a path without its last extension. */
static char *stem_of(const char *path)
{
    const char *slash = strrchr(path, '/');
    const char *first = slash ? slash + 1 : path;
    const char *dot = strrchr(first, '.');
    size_t length = dot && dot > first ? (size_t)(dot - first) : strlen(first);
    return memory_text_n(first, length);
}

char *lb_emit_name(const char *path)
{
    char *stem = stem_of(path);
    if (!stem)
        return NULL;
    buffer name;
    buffer_init(&name);
    bool is_plain = true;
    for (const char *c = stem; *c; c++)
        is_plain = is_plain && ((unsigned char)*c < 0x80) && (isalnum((unsigned char)*c) || *c == '_');
    if (is_plain && strlen(stem) <= HEAD_LONGEST_NAME)
        buffer_append(&name, stem);
    else
        spell_identifier(&name, stem);
    memory_free(stem);
    if (name.status == LB_OK && !spell_is_prefix(buffer_get(&name))) {
        char *rest = buffer_take(&name);
        if (rest)
            buffer_printf(&name, "model%s%s", *rest && *rest != '_' ? "_" : "", rest);
        else
            name.status = LB_E_NOMEM;
        memory_free(rest);
    }
    return buffer_take(&name);
}

lb_status head_check_name(const lb_emit_options *options, lb_error *err)
{
    const char *name = options && options->name ? options->name : "";
    if (spell_is_prefix(name) && strlen(name) <= HEAD_LONGEST_NAME)
        return LB_OK;
    return status_raise(err, LB_E_ARG, "write a name of letters, digits and `_` that begins with a letter",
                        "`%.100s` cannot be the name of C functions", name);
}

void head_begin(const lb_network *net, const char *file, buffer *out)
{
    buffer_printf(out, "/* %s: ", file);
    spell_comment(out, *net->title ? net->title : "a reaction mechanism", HEAD_TEXT_LIMIT);
    buffer_append(out, "\n *\n"
                       " * Written by limbeck " LB_VERSION ".  This file belongs to whoever made it with limbeck, who\n"
                       " * may use, change and pass it on under any terms.\n");
}

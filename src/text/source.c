/* Input text with its line map.
 *
 * The text is kept without a leading byte-order mark, so that columns and
 * offsets start at the first character that counts.  A line ends in LF, CR LF
 * or CR; the map holds the offset at which each line starts. */
#include "text/source.h"

#include <limits.h>
#include <string.h>

#include "base/memory.h"

struct source {
    char   *name;
    char   *text;       /* terminated */
    size_t  length;
    size_t *start;      /* [lines] */
    size_t  lines, capacity;
};

static int add_line(source *s, size_t offset)
{
    if (memory_grow(&s->start, &s->capacity, s->lines, sizeof *s->start))
        return -1;
    s->start[s->lines++] = offset;
    return 0;
}

static int map_lines(source *s)
{
    if (add_line(s, 0))
        return -1;
    for (size_t i = 0; i < s->length; i++) {
        if (s->text[i] == '\r' && s->text[i + 1] == '\n')
            i++;
        else if (s->text[i] != '\n' && s->text[i] != '\r')
            continue;
        if (add_line(s, i + 1))
            return -1;
    }
    return 0;
}

lb_status source_new(const char *name, const char *text, size_t length, source **out)
{
    *out = NULL;
    if (length >= 3 && memcmp(text, "\xEF\xBB\xBF", 3) == 0) {
        text += 3;
        length -= 3;
    }
    if (length >= INT_MAX)
        return LB_E_LIMIT;
    source *s = memory_zeroed(1, sizeof *s);
    if (!s)
        return LB_E_NOMEM;
    s->name = memory_text(name);
    s->text = memory_text_n(text, length);
    s->length = length;
    if (!s->name || !s->text || map_lines(s)) {
        source_free(s);
        return LB_E_NOMEM;
    }
    *out = s;
    return LB_OK;
}

void source_free(source *s)
{
    if (!s)
        return;
    memory_free(s->start);
    memory_free(s->text);
    memory_free(s->name);
    memory_free(s);
}

const char *source_name(const source *s)
{
    return s->name;
}

const char *source_text(const source *s)
{
    return s->text;
}

size_t source_length(const source *s)
{
    return s->length;
}

bool source_line(const source *s, int line, const char **start, size_t *length)
{
    if (line < 1 || (size_t)line > s->lines)
        return false;
    size_t first = s->start[line - 1];
    size_t end = (size_t)line < s->lines ? s->start[line] : s->length;
    while (end > first && (s->text[end - 1] == '\n' || s->text[end - 1] == '\r'))
        end--;
    *start = s->text + first;
    *length = end - first;
    return true;
}

/* docs/language.md, example by example.
 *
 * A block `mech` is a file without a fault.  A block `fault`, `warning` or
 * `setting` holds a file, lines `--set NAME=VALUE`, and then exactly what limbeck
 * says: `! line:column: message` of a fault, `~ ...` of a warning, `? ...` what to
 * write instead.  A row of a table of faults has a text, a place, a message and what
 * to write instead; the text has that fault (and, being no whole file, others). */
#include <check.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/buffer.h"
#include "support.h"

enum { MOST_SETTINGS = 4, TEXT = 1000 };

struct example {
    char kind[16];
    int line;                               /* of its first line in the document */
    buffer text, wanted;
    char name[MOST_SETTINGS][TEXT];
    lb_setting setting[MOST_SETTINGS];
    size_t settings;
};

static void clear(struct example *e)
{
    buffer_clear(&e->text);
    buffer_clear(&e->wanted);
    e->settings = 0;
}

/* ---- What limbeck says ------------------------------------------------------------ */

static void write_remedy(buffer *out, const char *remedy)
{
    if (remedy[0])
        buffer_printf(out, "? %s\n", remedy);
}

static void write_diagnostics(const lb_diagnostics *list, buffer *out)
{
    for (size_t i = 0; i < lb_diagnostics_count(list); i++) {
        lb_diagnostic d = lb_diagnostics_get(list, i);
        buffer_printf(out, "%c %d:%d: %s\n", d.is_fault ? '!' : '~', d.line, d.column, d.message);
        write_remedy(out, d.remedy);
    }
}

static void check_example(const struct example *e)
{
    lb_network *net = NULL;
    lb_diagnostics *list = NULL;
    lb_error err = {.code = LB_OK};
    buffer got;
    buffer_init(&got);
    lb_status status =
        lb_network_parse("f", buffer_get(&e->text), e->text.length, e->setting, e->settings, &net, &list, &err);
    bool is_file_at_fault = status == LB_OK || status == LB_E_MECHANISM;
    if (is_file_at_fault) {
        write_diagnostics(list, &got);
    } else {
        buffer_printf(&got, "! %s\n", err.message);
        write_remedy(&got, err.remedy);
    }
    if (strcmp(e->kind, "mech") == 0)
        ck_assert_msg(status == LB_OK, "line %d of docs/language.md:\n%s", e->line, buffer_get(&got));
    else
        ck_assert_msg(strcmp(buffer_get(&got), buffer_get(&e->wanted)) == 0,
                      "line %d of docs/language.md wants\n%sand limbeck says\n%s", e->line,
                      buffer_get(&e->wanted), buffer_get(&got));
    lb_status wanted = strcmp(e->kind, "fault") == 0 ? LB_E_MECHANISM : LB_OK;
    ck_assert_msg(strcmp(e->kind, "setting") == 0 ? !is_file_at_fault : status == wanted, "line %d: status %d",
                  e->line, status);
    lb_network_free(net);
    lb_diagnostics_free(list);
    buffer_clear(&got);
}

/* ---- Rows of tables ----------------------------------------------------------------- */

/* Replace every `what` in the text. */
static void replace(char *text, const char *what, const char *by)
{
    buffer out;
    buffer_init(&out);
    for (const char *at = text, *next; *at; at = next) {
        next = strstr(at, what);
        buffer_append_n(&out, at, next ? (size_t)(next - at) : strlen(at));
        if (next)
            buffer_append(&out, by);
        next = next ? next + strlen(what) : at + strlen(at);
    }
    snprintf(text, TEXT, "%s", buffer_get(&out));
    buffer_clear(&out);
}

/* The next cell of `| a | b |`, trimmed; moves *at behind it. */
static bool take_cell(char **at, char *cell)
{
    char *end = strstr(*at, " |");
    if (!end)
        return false;
    *end = '\0';
    snprintf(cell, TEXT, "%s", *at + strspn(*at, " "));
    *at = end + 2;
    return true;
}

/* The text of the first cell, without its marks of code; unchanged when the cell is empty. */
static void take_text(char *cell, char *text)
{
    size_t length = strlen(cell);
    if (length < 4)
        return;
    bool is_padded = cell[2] == ' ' && cell[length - 3] == ' ';
    cell[length - (is_padded ? 3 : 2)] = '\0';
    snprintf(text, TEXT, "%s", cell + (is_padded ? 3 : 2));
    replace(text, "\xE2\x8F\x8E ", "\n");     /* the sign for the end of a line */
}

static bool has_fault(const char *text, const char *place, const char *message, const char *remedy)
{
    lb_network *net = NULL;
    lb_diagnostics *list = NULL;
    bool is_found = false;
    lb_network_parse("f", text, strlen(text), NULL, 0, &net, &list, NULL);
    for (size_t i = 0; i < lb_diagnostics_count(list) && !is_found; i++) {
        lb_diagnostic d = lb_diagnostics_get(list, i);
        char got[32];
        snprintf(got, sizeof got, "%d:%d", d.line, d.column);
        is_found = strcmp(got, place) == 0 && strcmp(d.message, message) == 0 && strcmp(d.remedy, remedy) == 0;
    }
    lb_network_free(net);
    lb_diagnostics_free(list);
    return is_found;
}

/* Texts with bytes that cannot be shown, or shortened, are left to other tests. */
static bool can_be_run(const char *text)
{
    return !strstr(text, "<U+") && !strstr(text, "<byte") && !strstr(text, "\xE2\x80\xA6" "``");
}

static int check_row(char *line, char *text, int number)
{
    char *at = line + 1, cell[4][TEXT];
    for (int i = 0; i < 4; i++)
        if (!take_cell(&at, cell[i]))
            return 0;
    if (!can_be_run(cell[0]))
        text[0] = '\0';
    else
        take_text(cell[0], text);
    if (text[0] == '\0' || !strchr(cell[1], ':'))
        return 0;
    ck_assert_msg(has_fault(text, cell[1], cell[2], cell[3]),
                  "line %d of docs/language.md: `%s` has no such fault", number, text);
    return 1;
}

/* ---- The document ------------------------------------------------------------------- */

static void add_setting(struct example *e, const char *text)
{
    ck_assert_uint_lt(e->settings, MOST_SETTINGS);
    char *name = e->name[e->settings];
    snprintf(name, TEXT, "%s", text);
    char *equals = strchr(name, '=');
    ck_assert_ptr_nonnull(equals);
    *equals = '\0';
    e->setting[e->settings++] = (lb_setting){name, equals + 1};
}

static void add_line(struct example *e, const char *line)
{
    bool is_answer = line[0] && strchr("!?~", line[0]) && line[1] == ' ';
    if (strncmp(line, "--set ", 6) == 0)
        add_setting(e, line + 6);
    else
        buffer_printf(is_answer ? &e->wanted : &e->text, "%s\n", line);
}

static bool is_kind(const char *kind)
{
    return strcmp(kind, "mech") == 0 || strcmp(kind, "fault") == 0 || strcmp(kind, "warning") == 0
           || strcmp(kind, "setting") == 0;
}

static FILE *open_document(void)
{
    char path[TEXT];
    const char *folder = getenv("LB_SOURCE_DIR");
    snprintf(path, sizeof path, "%s/docs/language.md", folder ? folder : ".");
    FILE *in = fopen(path, "rb");
    ck_assert_msg(in != NULL, "%s cannot be read", path);
    return in;
}

static int check_document(FILE *in)
{
    struct example e = {.kind = ""};
    char line[TEXT], text[TEXT] = "";
    int number = 0, count = 0;
    bool is_inside = false;
    while (fgets(line, sizeof line, in)) {
        number++;
        line[strcspn(line, "\n")] = '\0';
        if (!is_inside && strncmp(line, "```", 3) == 0 && is_kind(line + 3)) {
            clear(&e);
            snprintf(e.kind, sizeof e.kind, "%.15s", line + 3);
            e.line = number + 1;
            is_inside = true;
        } else if (is_inside && strcmp(line, "```") == 0) {
            check_example(&e);
            count++;
            is_inside = false;
        } else if (is_inside) {
            add_line(&e, line);
        } else if (line[0] == '|') {
            count += check_row(line, text, number);
        }
    }
    clear(&e);
    return count;
}

START_TEST(test_the_document_says_what_limbeck_says)
{
    FILE *in = open_document();
    int count = check_document(in);
    fclose(in);
    ck_assert_int_gt(count, 280);
}
END_TEST

Suite *language_suite(void)
{
    Suite *s = suite_create("language");
    TCase *t = tcase_create("language");
    tcase_set_timeout(t, 60);
    tcase_add_test(t, test_the_document_says_what_limbeck_says);
    suite_add_tcase(s, t);
    return s;
}

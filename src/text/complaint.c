/* The wording of a fault of syntax.
 *
 * The parser knows which token it met and which it could have used.  For the
 * usual slips that is enough to say what went wrong and what to write instead:
 * each is a row of the table at the end, tried in turn.  What no row knows
 * becomes "unexpected ..., expected ...". */
#include "text/lexical.h"

#include <stdio.h>
#include <string.h>

#include "parser.h"
#include "text/outlook.h"

enum { MESSAGE = 400, EXCERPT = 40 };

/* One fault while its words are found. */
typedef struct complaint {
    lexical *l;
    uint64_t expected;
    int      got;
    span     where;
    char     text[4 * EXCERPT + 8];   /* what stands there */
    char     message[MESSAGE], remedy[MESSAGE];
} complaint;

#define SAY(c, ...) snprintf((c)->message, MESSAGE, __VA_ARGS__)
#define ADVISE(c, ...) snprintf((c)->remedy, MESSAGE, __VA_ARGS__)

static bool expects(const complaint *c, int token)
{
    return c->expected >> (token - NEWLINE) & 1;
}

/* The text of a span, cut after EXCERPT characters. */
static void copy_span(const source *s, span where, char *out, size_t size)
{
    const char *start, *end;
    size_t length;
    out[0] = '\0';
    if (!source_line(s, where.line, &start, &length))
        return;
    end = start + length;
    int column = 1;
    size_t used = 0;
    for (; start < end && column < where.column + where.length && column < where.column + EXCERPT; start++) {
        bool is_last = start + 1 == end || ((unsigned char)start[1] & 0xC0) != 0x80;
        if (column >= where.column && used + 1 < size)
            out[used++] = *start;
        column += is_last;
    }
    out[used] = '\0';
}

/* ---- Names of tokens ------------------------------------------------------- */

static const char *token_name(int token)
{
    switch (token) {
    case NEWLINE: return "the end of the line";
    case END: return "the end of the file";
    case NAME: return "a name";
    case QUOTED: return "a name in quotes";
    case NUMBER: return "a number";
    case LABEL: return "a label";
    case FORMULA_TEXT: return "a formula";
    case HELD: return "a concentration `[X]`";
    case INITIAL_VALUE: return "an initial value `[X]0`";
    case FEED: return "a feed `[X]in`";
    case ARROW: return "`->`";
    case REVERSIBLE: return "`<->`";
    case EMPTY_SIDE: return "`0`";
    case NONE: return "`none`";
    case IN: return "a range `in ...`";
    case EQUALS: return "`=`";
    case COMMA: return "`,`";
    case OPEN: return "`(`";
    case CLOSE: return "`)`";
    case DOTS: return "`..`";
    default: return NULL;
    }
}

/* ---- The common wording ---------------------------------------------------- */

typedef struct word_list {
    const char *word[16];
    int count;
} word_list;

static void add_word(word_list *list, const char *word)
{
    if (list->count < 16)
        list->word[list->count++] = word;
}

/* Tokens that belong together are named together. */
static word_list expected_words(const complaint *c)
{
    word_list list = {{0}, 0};
    if (expects(c, TITLE)) {
        add_word(&list, "a statement");
        return list;
    }
    bool is_value = expects(c, NUMBER) && expects(c, MINUS);
    bool is_operator = expects(c, TIMES);
    bool is_species = !is_value && expects(c, QUOTED);
    if (is_value)
        add_word(&list, "a value");
    else if (is_species)
        add_word(&list, "a species");
    if (is_operator)
        add_word(&list, "an operator");
    if (is_operator && expects(c, NAME) && !is_value)
        add_word(&list, "a unit");
    static const int single[] = {FORMULA_TEXT, NAME, NUMBER, ARROW, REVERSIBLE, EQUALS, IN, DOTS, COMMA, CLOSE, OPEN,
                                 PLUS, NONE, NEWLINE};
    for (size_t i = 0; i < sizeof single / sizeof single[0]; i++) {
        int token = single[i];
        bool is_covered = ((is_value || is_operator || is_species) && (token == NAME || token == NUMBER))
                          || (is_value && token == OPEN) || ((is_value || is_operator) && token == PLUS)
                          || (is_species && token == OPEN);
        if (expects(c, token) && !is_covered)
            add_word(&list, token == PLUS ? "`+`" : token_name(token));
    }
    return list;
}

static void name_what_came(const complaint *c, char *out, size_t size)
{
    if (c->got == NEWLINE)
        snprintf(out, size, "unexpected end of the %s", c->l->is_file_end ? "file" : "line");
    else
        snprintf(out, size, "unexpected `%s`", c->text);
}

static void say_expected(complaint *c)
{
    char what[sizeof c->text + 32];
    name_what_came(c, what, sizeof what);
    word_list list = expected_words(c);
    int used = snprintf(c->message, MESSAGE, "%s", what);
    for (int i = 0; i < list.count && used < MESSAGE; i++)
        used += snprintf(c->message + used, (size_t)(MESSAGE - used), "%s%s",
                         i == 0 ? ", expected " : i == list.count - 1 ? " or " : ", ", list.word[i]);
}

/* The same word but for capitals, and an `s` or a `d` at the end. */
static bool is_nearly(const char *word, const char *keyword)
{
    size_t i = 0;
    while (keyword[i] && (word[i] == keyword[i] || word[i] == keyword[i] - 'a' + 'A'))
        i++;
    size_t rest = strlen(word + i), missing = strlen(keyword + i);
    return i >= 4 && rest <= 1 && missing <= 2;
}

/* ---- The usual slips ------------------------------------------------------- */

/* The faulty token continues a line that should have ended. */
static bool swallowed_line(complaint *c)
{
    lexical *l = c->l;
    if (!lexical_is_swallowed(l))
        return false;
    static const struct { int token; const char *text; } ending[] = {
        {PLUS, "+"}, {MINUS, "-"}, {TIMES, "*"}, {OVER, "/"}, {POWER, "^"}, {EQUALS, "="}, {COMMA, ","},
        {OPEN, "("}, {DOTS, ".."}, {IN, "in"},
    };
    const char *end = ",";
    for (size_t i = 0; i < sizeof ending / sizeof ending[0]; i++)
        if (ending[i].token == l->above)
            end = ending[i].text;
    char what[sizeof c->text + 32];
    name_what_came(c, what, sizeof what);
    SAY(c, "%s: the line above ends in `%s` and goes on here", what, end);
    ADVISE(c, "finish the line above, or take the `%s` at its end away", end);
    return true;
}

static bool blank_behind_bracket(complaint *c)
{
    if (c->l->previous != HELD || c->l->first != HELD || !expects(c, EQUALS)
        || (c->got != IN && strcmp(c->text, "0") != 0))
        return false;
    SAY(c, "a blank between the bracket and `%s`", c->text);
    ADVISE(c, "write `[X]%s` in one piece", c->text);
    return true;
}

/* `[A]_0 = 1`, `[A](0) = 1`, `d[A]/dt = ...`. */
static bool odd_bracket(complaint *c)
{
    if (c->got == HELD && c->l->first == NAME && c->l->previous == NAME && expects(c, EQUALS)) {
        say_expected(c);
        ADVISE(c, "write reactions; a rate law is `A -> B, v = ...`");
        return true;
    }
    if (c->l->first != HELD || c->l->previous != HELD || !expects(c, EQUALS))
        return false;
    say_expected(c);
    if (outlook_has_arrow(lexical_rest(c->l))) {
        ADVISE(c, "in a reaction write species without brackets, and a label in parentheses");
        return true;
    }
    ADVISE(c, "write `[X] = ...` for a held, `[X]0 = ...` for an initial, `[X]in = ...` for a feed concentration");
    return true;
}

/* `// a remark`. */
static bool foreign_comment(complaint *c)
{
    const char *rest = lexical_rest(c->l);
    if (c->got != OVER || (c->l->previous != OVER && *rest != '/' && *rest != '*'))
        return false;
    say_expected(c);
    ADVISE(c, "a comment starts with `#`");
    return true;
}

/* `Title "..."`, `unit M s`. */
static bool odd_keyword(complaint *c)
{
    static const char *keyword[] = {"title", "units", "retained", "signed", "formula"};
    bool is_second = c->l->previous == NAME && c->l->first == NAME && c->where.line == c->l->first_where.line;
    if (!is_second || (c->got != NAME && c->got != QUOTED) || !expects(c, EQUALS) || c->l->arrows)
        return false;
    char word[4 * EXCERPT + 8];
    copy_span(c->l->source, c->l->first_where, word, sizeof word);
    for (size_t i = 0; i < sizeof keyword / sizeof keyword[0]; i++) {
        if (!is_nearly(word, keyword[i]))
            continue;
        c->where = c->l->first_where;
        SAY(c, "there is no statement `%s`", word);
        ADVISE(c, "did you mean `%s`?", keyword[i]);
        return true;
    }
    return false;
}

static bool equals_for_arrow(complaint *c)
{
    if (c->got != EQUALS || !expects(c, ARROW) || c->l->previous == QUOTED || c->l->previous == NEWLINE)
        return false;
    SAY(c, "`=` is no arrow");
    ADVISE(c, "write `->`, or `<->` for a reversible reaction");
    return true;
}

static bool quoted_definition(complaint *c)
{
    if (c->got != EQUALS || !expects(c, ARROW) || c->l->previous != QUOTED)
        return false;
    SAY(c, "a quoted name is a species and cannot be defined");
    ADVISE(c, "write `[\"X\"] = ...` for its concentration, or a plain name for a constant");
    return true;
}

static bool definition_for_reaction(complaint *c)
{
    if (c->got != COMMA || c->l->first != NAME || c->l->arrows || c->l->level
        || !outlook_is_setting(outlook_skip_blanks(lexical_rest(c->l))))
        return false;
    SAY(c, "a definition has no settings");
    ADVISE(c, "if this is a reaction, write `->` for `=`");
    return true;
}

static bool unclosed_parenthesis(complaint *c)
{
    if (c->got != NEWLINE || c->l->level == 0 || !expects(c, CLOSE))
        return false;
    c->where = c->l->opened[c->l->level];
    SAY(c, "the parenthesis is not closed");
    ADVISE(c, "write `)`; a line that goes on ends in an operator, `,` or `(`");
    return true;
}

static bool stray_close(complaint *c)
{
    if (c->got != CLOSE || expects(c, CLOSE) || !c->l->is_stray_close)
        return false;
    SAY(c, "`)` without `(`");
    if (c->l->first == NAME && expects(c, ARROW))
        ADVISE(c, "write a label as `(R1)`");
    return true;
}

static bool missing_arrow(complaint *c)
{
    if (!expects(c, ARROW) || c->got != NEWLINE)
        return false;
    if (expects(c, EQUALS) && c->l->first == NAME) {
        SAY(c, "neither a reaction nor a definition");
        ADVISE(c, "write `A -> B, k = ...` or `name = value`");
    } else {
        SAY(c, "the reaction has no arrow");
        ADVISE(c, "write `->`, or `<->` for a reversible reaction");
    }
    return true;
}

static bool second_arrow(complaint *c)
{
    if ((c->got != ARROW && c->got != REVERSIBLE) || c->l->arrows < 2)
        return false;
    SAY(c, "a second arrow in one reaction");
    ADVISE(c, "write each reaction on its own line");
    return true;
}

static bool nameless_setting(complaint *c)
{
    if (c->l->previous != COMMA || c->l->arrows == 0 || c->l->level || !expects(c, NAME) || expects(c, NUMBER))
        return false;
    char what[sizeof c->text + 32];
    name_what_came(c, what, sizeof what);
    SAY(c, "%s, expected a setting", what);
    ADVISE(c, "write `k = ...`, `kf = ..., kr = ...`, `kf = ..., K = ...` or `v = ...`");
    return true;
}

/* `A -- B`. */
static bool dashes_for_arrow(complaint *c)
{
    if (c->got != MINUS || !expects(c, ARROW) || lexical_rest(c->l)[0] != '-')
        return false;
    SAY(c, "`--` is no arrow");
    ADVISE(c, "write `->`");
    return true;
}

/* `H+ + OH-`: a charge or a star behind a species. */
static bool unquoted_name(complaint *c)
{
    bool is_mark = c->got == PLUS || c->got == MINUS || c->got == TIMES || c->got == POWER || c->got == OVER
                   || c->got == OPEN || c->got == ARROW || c->got == REVERSIBLE;
    if (!is_mark || c->l->level > 0)
        return false;
    bool is_after_species = (c->l->previous == NAME || c->l->previous == QUOTED)
                            && (expects(c, ARROW) || (expects(c, COMMA) && !expects(c, TIMES)));
    bool is_after_plus = c->l->previous == PLUS && expects(c, QUOTED);
    bool is_in_list = c->l->previous == NAME
                      && (c->l->first == FORMULA || c->l->first == RETAINED || c->l->first == SIGNED);
    if (c->l->first == NUMBER && c->got == TIMES && c->l->previous == NUMBER) {
        ADVISE(c, "write `2 X` without `*`");
        return false;
    }
    if (!is_after_species && !is_after_plus && !is_in_list)
        return false;
    say_expected(c);
    ADVISE(c, "put a species whose name has more than letters and digits in quotes: `\"H+\"`, `\"Br-\"`");
    return true;
}

/* `A B -> C`. */
static bool missing_plus(complaint *c)
{
    if ((c->got != NAME && c->got != QUOTED && c->got != NUMBER) || c->l->level > 0 || !expects(c, PLUS)
        || expects(c, TIMES) || (c->l->previous != NAME && c->l->previous != QUOTED))
        return false;
    SAY(c, "a `+` or an arrow is missing before `%s`", c->text);
    ADVISE(c, "write `A + B -> C`; a name with a blank in it stands in quotes");
    return true;
}

static bool bracketed_species(complaint *c)
{
    if ((c->got != HELD && c->got != INITIAL_VALUE && c->got != FEED) || !expects(c, QUOTED) || expects(c, HELD))
        return false;
    SAY(c, "`%s` is a concentration, not a species", c->text);
    ADVISE(c, "write the species without brackets");
    return true;
}

static bool bracket_in_reaction(complaint *c)
{
    if (c->l->first != HELD || c->l->previous != HELD || !expects(c, EQUALS)
        || (c->got != PLUS && c->got != ARROW && c->got != REVERSIBLE))
        return false;
    SAY(c, "unexpected `%s`, expected `=`", c->text);
    ADVISE(c, "in a reaction write species without brackets");
    return true;
}

static bool initial_in_expression(complaint *c)
{
    if (c->got != INITIAL_VALUE || !expects(c, HELD))
        return false;
    SAY(c, "an initial value cannot stand in an expression");
    ADVISE(c, "give it a name: `x0 = 1 M` and `[X]0 = x0`");
    return true;
}

static bool missing_operator(complaint *c)
{
    if (!expects(c, TIMES)
        || (c->got != HELD && c->got != FEED && c->got != OPEN && c->got != NUMBER && c->got != INITIAL_VALUE))
        return false;
    SAY(c, "an operator is missing before `%s`", c->text);
    ADVISE(c, "write `*` for a product");
    return true;
}

static bool quoted_in_expression(complaint *c)
{
    if (c->got != QUOTED || expects(c, QUOTED) || !(expects(c, HELD) || expects(c, TIMES)))
        return false;
    SAY(c, "unexpected `%s`", c->text);
    ADVISE(c, "write `[%s]` for a concentration", c->text);
    return true;
}

static bool bare_title(complaint *c)
{
    if (c->l->previous != TITLE)
        return false;
    SAY(c, "a title stands in quotes");
    ADVISE(c, "write `title \"...\"`");
    return true;
}

static bool bare_units(complaint *c)
{
    if (c->l->previous != UNITS)
        return false;
    say_expected(c);
    ADVISE(c, "write `units M s`, or `units none`");
    return true;
}

static bool range_without_dots(complaint *c)
{
    bool is_bare = c->got == DOTS && expects(c, IN);
    if (!is_bare && (!expects(c, DOTS) || (c->got != COMMA && c->got != MINUS && c->got != NEWLINE && c->got != NAME
                              && c->got != NUMBER)))
        return false;
    say_expected(c);
    ADVISE(c, "write a range as `in 0.5 .. 2`");
    return true;
}

static bool within_without_factor(complaint *c)
{
    if (c->l->previous != NAME || c->got != NUMBER || !c->l->is_within)
        return false;
    SAY(c, "unexpected `%s` behind `within`", c->text);
    ADVISE(c, "write `within factor %s`", c->text);
    return true;
}

static bool leading_operator(complaint *c)
{
    if (c->l->current != c->l->first || !expects(c, TITLE) || c->got == BAD)
        return false;
    say_expected(c);
    bool is_operator = c->got == PLUS || c->got == MINUS || c->got == TIMES || c->got == OVER || c->got == POWER
                       || c->got == COMMA;
    if (is_operator)
        ADVISE(c, "to go on from the line above, end that line with `%s`", c->text);
    return true;
}

static bool reserved_in(complaint *c)
{
    if (c->got != IN || !(expects(c, QUOTED) || expects(c, TITLE)))
        return false;
    SAY(c, "`in` is reserved");
    ADVISE(c, "write a species of that name as `\"in\"`");
    return true;
}

static bool bad_label(complaint *c)
{
    if (c->l->first != OPEN || c->l->arrows || c->l->level == 0 || c->got == NEWLINE)
        return false;
    SAY(c, "unexpected `%s` in parentheses before a reaction", c->text);
    ADVISE(c, "a label has letters, digits and . _ + - ' * only, without blanks: `(R1)`");
    return true;
}

void complaint_report(lexical *l, uint64_t expected)
{
    static bool (*const slips[])(complaint *) = {
        swallowed_line, bare_title, bare_units, dashes_for_arrow, foreign_comment, odd_keyword,
        bad_label, blank_behind_bracket, bracket_in_reaction, odd_bracket, equals_for_arrow, quoted_definition,
        definition_for_reaction, unclosed_parenthesis, stray_close, missing_arrow, second_arrow,
        nameless_setting, unquoted_name, bracketed_species, initial_in_expression, within_without_factor,
        range_without_dots, missing_operator, quoted_in_expression, reserved_in, leading_operator, missing_plus,
    };
    if (l->current == BAD)
        return;
    complaint c = {.l = l, .expected = expected, .got = l->current};
    c.where = l->current == NEWLINE ? (span){l->where.line, l->where.column + l->where.length, 1} : l->where;
    if (c.got != NEWLINE)
        copy_span(l->source, c.where, c.text, sizeof c.text);
    bool is_known = false;
    for (size_t i = 0; i < sizeof slips / sizeof slips[0] && !is_known; i++)
        is_known = slips[i](&c);
    if (!is_known)
        say_expected(&c);
    builder_fault(&l->build, c.where, c.remedy[0] ? c.remedy : NULL, "%s", c.message);
}

/* The parser: every kind of statement and expression, continuation, places,
 * recovery, limits, memory.  What each slip of typing says is in check_slips.c. */
#include <check.h>
#include <locale.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/memory.h"
#include "parsed.h"

/* ---- Statements ------------------------------------------------------------ */

typedef struct reading { const char *text, *wanted; } reading;

#define ALL_READ(rows)                                                   \
    for (size_t i = 0; i < sizeof(rows) / sizeof *(rows); i++)           \
        assert_statements((rows)[i].text, (rows)[i].wanted)

START_TEST(test_definitions_are_read)
{
    static const reading rows[] = {
        {"title \"Tank # 2\" # a remark", "title <Tank # 2>"},
        {"title \"\"", "title <>"},
        {"units M s", "units (M_s)"},
        {"units molecule/cm^3 s", "units (molecule/((cm^3)_s))"},
        {"units none", "units"},
        {"k2 = 1.0 M^-2 s^-1 in 1e-2 .. 1e2", "k2 = ((1.0_(M^(-2)))_(s^(-1))) R 1e-2..1e2"},
        {"k6 = 3 s^-1 within factor 5", "k6 = (3_(s^(-1))) F 5"},
        {"x = 1 in -1 M/s .. +2.5 M/s", "x = 1 R ((-(1_M))/s)..((2.5_M)/s)"},
        {"x = 300 s in 60..3000", "x = (300_s) R 60..3000"},
        {"[A] = 1.0 M", "[A] = (1.0_M)"},
        {"[\"H+\"] = 10^(-pH) * 1 M", "[H+] = ((10^{(-pH)})*(1_M))"},
        {"[ Br- ] = 2", "[Br-] = 2"},
        {"[\"a]b\"]0 = 2", "[a]b]0 = 2"},
        {"[X]0 = 0.5 M in 0 .. 1", "[X]0 = (0.5_M) R 0..1"},
        {"[S]in = 0.1 M", "[S]in = (0.1_M)"},
        {"retained W", "retained W"},
        {"retained W, \"Br-\" , X", "retained W Br- X"},
        {"signed U, V", "signed U V"},
        {"formula \"H+\" = H^+", "formula H+ <H^+>"},
        {"formula X = CuSO4.5H2O   # blue", "formula X <CuSO4.5H2O>"},
        {"formula e = e^-\nx = 1", "formula e <e^->\nx = 1"},
        {"\xCE\xB1_1 = \xC2\xB5 + \xCE\xA9", "\xCE\xB1_1 = (\xC2\xB5+\xCE\xA9)"},
        {"", ""},
        {"\n\n  # nothing\n", ""},
    };
    ALL_READ(rows);
}
END_TEST

START_TEST(test_reactions_are_read)
{
    static const reading rows[] = {
        {"A -> B, k = 1", "A -> B, k=1"},
        {"(R2) 2 X + Y -> 3 X, k = k2", "(R2) 2 X + Y -> 3 X, k=k2"},
        {"(a.b_c+d-e'f*1) 2X -> 0.5X", "(a.b_c+d-e'f*1) 2 X -> 0.5 X"},
        {"(\xCE\xB1) A -> B", "(\xCE\xB1) A -> B"},
        {"B + X <-> Y + D, kf = 2.0 M^-1 s^-1, kr = 1e-3", "B + X <-> Y + D, kf=((2.0_(M^(-1)))_(s^(-1))), kr=1e-3"},
        {"X <-> W, kf = 40 s^-1, K = 1e4", "X <-> W, kf=(40_(s^(-1))), K=1e4"},
        {"S -> P, v = Vmax*[S]/(Km + [S])", "S -> P, v=((Vmax*[S])/{(Km+[S])})"},
        {"W -> (f/2) Y + 2 Z, k = k6 in 1 .. 2", "W -> (f/2) Y + 2 Z, k=k6 R 1..2"},
        {"-> X, k = 1e-3 M/s", " -> X, k=((1e-3_M)/s)"},
        {"X ->, k = 1 s^-1", "X -> , k=(1_(s^(-1)))"},
        {"X ->\nY -> Z", "X -> \nY -> Z"},
        {"0 -> X", " -> X"},
        {"\xE2\x88\x85 \xE2\x86\x92 X", " -> X"},
        {"X \xE2\x87\x8C 0", "X <-> "},
        {"HBr <-> \"H+\" + \"Br-\", kf = 1", "HBr <-> \"H+\" + \"Br-\", kf=1"},
        {"P -> Q, k = arrhenius(A = 1e13 s^-1 in 1e12 .. 1e14, n = 0, Ea = 80 kJ/mol)",
         "P -> Q, k=arrhenius(A=(1e13_(s^(-1))) R 1e12..1e14, n=0, Ea=((80_kJ)/mol))"},
        {"2 E1 + .5 X -> 3E", "2 E1 + 0.5 X -> 3 E"},
        {"A\xC2\xA0+ B\xE2\x80\x89-> C", "A + B -> C"},
    };
    ALL_READ(rows);
}
END_TEST

START_TEST(test_words_are_keywords_only_in_their_place)
{
    static const reading rows[] = {
        {"title + X -> factor, k = factor", "title + X -> factor, k=factor"},
        {"title = 3", "title = 3"},
        {"signed -> X", "signed -> X"},
        {"retained <-> X", "retained <-> X"},
        {"units \xE2\x86\x92 X", "units -> X"},
        {"A -> title + units + signed", "A -> title + units + signed"},
        {"factor = 2\nwithin = factor", "factor = 2\nwithin = factor"},
        {"k = 2 within factor 3", "k = 2 F 3"},
        {"none = 1", "none = 1"},
        {"A -> \"in\", k = [in]", "A -> \"in\", k=[in]"},
        {"formula formula = C", "formula formula <C>"},
        {"inn -> index", "inn -> index"},
    };
    ALL_READ(rows);
}
END_TEST

/* ---- Expressions ----------------------------------------------------------- */

START_TEST(test_expressions_have_the_precedence_of_mathematics)
{
    static const reading rows[] = {
        {"a+b*c-d", "((a+(b*c))-d)"},      {"a/b/c*d", "(((a/b)/c)*d)"},
        {"a^b^c", "(a^(b^c))"},            {"-x^2", "(-(x^2))"},
        {"2^-3^2", "(2^(-(3^2)))"},        {"a - -b", "(a-(-b))"},
        {"+a + +b", "(a+b)"},              {"-2 M", "(-(2_M))"},
        {"2 M^2 s", "((2_(M^2))_s)"},      {"1 M/s", "((1_M)/s)"},
        {"J/(mol K)", "(J/{(mol_K)})"},    {"2 J/mol K", "((2_J)/(mol_K))"},
        {"2k2", "(2_k2)"},                 {"1 cm3", "(1_cm3)"},
        {"2^3 M", "((2^3)_M)"},            {"k-1", "(k-1)"},
        {"[A]^2*[B]in", "(([A]^2)*[B]in)"}, {"exp(-E/(R*T))", "exp(((-E)/{(R*T)}))"},
        {"f()", "f()"},                    {"f(a, x = b)", "f(a, x=b)"},
        {"1.5e-3*1.E2*.5*2.", "(((1.5e-3*1.E2)*.5)*2.)"},
        {"[\"a b\"]", "[a b]"},            {"M^(-1/2)", "(M^{((-1)/2)})"},
    };
    for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
        parsed p = parsed_value(rows[i].text);
        ck_assert_msg(p.value != NULL, "%s is no value", rows[i].text);
        char *got = parsed_expression(p.value);
        ck_assert_str_eq(got, rows[i].wanted);
        ck_assert_uint_eq(lb_diagnostics_faults(p.list), 0);
        free(got);
        parsed_free(&p);
    }
}
END_TEST

static int depth_of(const syntax_expression *e)
{
    int deepest = 0;
    if (!e)
        return 0;
    for (const syntax_argument *a = e->first; a; a = a->next)
        deepest = depth_of(a->value) > deepest ? depth_of(a->value) : deepest;
    deepest = depth_of(e->left) > deepest ? depth_of(e->left) : deepest;
    deepest = depth_of(e->right) > deepest ? depth_of(e->right) : deepest;
    ck_assert_int_eq(e->depth, deepest + 1);
    return e->depth;
}

/* The last two have a forgotten `^`, which takes the tree apart. */
START_TEST(test_each_node_knows_its_depth)
{
    static const struct { const char *text; int wanted; } rows[] = {
        {"1", 1}, {"a+b*c", 3}, {"f(a, x = b*c)", 3}, {"-(a^2)", 4}, {"1 M-1*a*b/c", 7}, {"1 M-1 s-1", 5},
    };
    for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
        parsed p = parsed_value(rows[i].text);
        ck_assert_int_eq(depth_of(p.value), rows[i].wanted);
        parsed_free(&p);
    }
}
END_TEST

START_TEST(test_a_number_has_its_value)
{
    static const struct { const char *text; double wanted; } rows[] = {
        {"0.1", 0.1}, {"1.5e-3", 1.5e-3}, {"2.", 2}, {".5", 0.5}, {"1e308", 1e308}, {"5e-324", 5e-324}, {"0e-999", 0},
        {"123456789012345678", 123456789012345678.0},
    };
    for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
        parsed p = parsed_value(rows[i].text);
        ck_assert_int_eq(p.value->kind, SYNTAX_NUMBER);
        ck_assert(p.value->number == rows[i].wanted);
        parsed_free(&p);
    }
}
END_TEST

/* Where a locale with a decimal comma is installed. */
START_TEST(test_numbers_do_not_depend_on_the_locale)
{
    const char *found = setlocale(LC_ALL, "de_DE.UTF-8");
    parsed p = parsed_value("1.5");
    ck_assert(p.value->number == 1.5);
    ck_assert_str_eq(setlocale(LC_ALL, NULL), found ? found : "C");
    parsed_free(&p);
    setlocale(LC_ALL, "C");
}
END_TEST

START_TEST(test_a_value_is_one_expression_and_no_more)
{
    static const reading rows[] = {
        {"", "1:1+1 unexpected end of the line, expected a value | "},
        {"1 2", "1:3+1 an operator is missing before `2` | write `*` for a product"},
        {"1\n2", "2:1+1 unexpected `2` | "},
        {"k = 2", "1:3+1 unexpected `=`, expected an operator, a unit, `(` or the end of the line | "},
        {"(2", "1:1+1 the parenthesis is not closed | write `)`; a line that goes on ends in an operator, `,` or `(`"},
        {"1,5", "1:1+3 a comma inside a number | write `1.5` with a point"},
    };
    for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
        parsed p = parsed_value(rows[i].text);
        char *got = parsed_faults(p.list);
        ck_assert_str_eq(got, rows[i].wanted);
        free(got);
        parsed_free(&p);
    }
}
END_TEST

/* ---- Lines ----------------------------------------------------------------- */

START_TEST(test_a_line_that_wants_more_goes_on)
{
    static const reading rows[] = {
        {"x = 1 +\n\n  # a remark\n 2", "x = (1+2)"},
        {"x =\n 1 - # a remark\n 2 *\n3 /\n4 ^\n5", "x = (1-((2*3)/(4^5)))"},
        {"x = (\n1)", "x = {1}"},
        {"x = 1 in\n 0 ..\n 2", "x = 1 R 0..2"},
        {"A +\n B -> C,\n k = 1,\n v = 2", "A + B -> C, k=1, v=2"},
        {"k = f(A = 1,\n n = 2)", "k = f(A=1, n=2)"},
        {"retained A,\nB", "retained A B"},
        {"formula X =\n  CH4\ny = 1", "formula X <CH4>\ny = 1"},
        {"formula X = H^+\ny = 1", "formula X <H^+>\ny = 1"},
        {"x = [A]in\ny = 1", "x = [A]in\ny = 1"},
        {"A ->\nB -> C", "A -> \nB -> C"},
    };
    ALL_READ(rows);
}
END_TEST

START_TEST(test_line_ends_and_a_byte_order_mark_make_no_difference)
{
    static const char *ends[] = {"\n", "\r\n", "\r"};
    for (size_t i = 0; i < 3; i++) {
        char text[80];
        snprintf(text, sizeof text, "\xEF\xBB\xBFx = 1 +%s 2 # r%sformula A = C%sA -> B", ends[i], ends[i], ends[i]);
        assert_statements(text, "x = (1+2)\nformula A <C>\nA -> B");
        snprintf(text, sizeof text, "\xEF\xBB\xBFx = )%sy = )%s", ends[i], ends[i]);
        assert_faults(text, "1:5+1 `)` without `(` | \n2:5+1 `)` without `(` | ");
    }
}
END_TEST

/* ---- Places ---------------------------------------------------------------- */

static void assert_span(span got, int line, int column, int length)
{
    ck_assert_msg(got.line == line && got.column == column && got.length == length, "%d:%d+%d, wanted %d:%d+%d",
                  got.line, got.column, got.length, line, column, length);
}

START_TEST(test_places_count_characters)
{
    const char *text = "# \xCE\xB1\n\t(\xCE\xB2" "1)  2 \xCE\xB3\xCE\xB4 \xE2\x86\x92 (f/2) Y,\tk = 2*\xCE\xBA +\n 1 in 0 .. 3";
    parsed p = parsed_new(text, strlen(text));
    const syntax_statement *s = p.tree->first;
    ck_assert_uint_eq(lb_diagnostics_count(p.list), 0);
    assert_span(s->where, 2, 2, 31);
    assert_span(s->label_where, 2, 2, 4);
    assert_span(s->left->coefficient->where, 2, 8, 1);
    assert_span(s->left->species.where, 2, 10, 2);
    assert_span(s->arrow_where, 2, 13, 1);
    assert_span(s->right->coefficient->where, 2, 15, 5);
    assert_span(s->right->species.where, 2, 21, 1);
    assert_span(s->settings->name_where, 2, 24, 1);
    assert_span(s->settings->value->where, 2, 28, 5);
    assert_span(s->settings->value->operator_where, 2, 32, 1);
    assert_span(s->settings->value->left->right->where, 2, 30, 1);
    assert_span(s->settings->value->right->where, 3, 2, 1);
    assert_span(s->settings->range->where, 3, 4, 9);
    assert_span(s->settings->range->high->where, 3, 12, 1);
    parsed_free(&p);
}
END_TEST

START_TEST(test_places_of_definitions)
{
    const char *text = "[A]0 = 1 M^-1\nformula \"B\" = C^+ # r\nretained A, \"B\"";
    parsed p = parsed_new(text, strlen(text));
    const syntax_statement *s = p.tree->first;
    assert_span(s->text_where, 1, 1, 4);
    assert_span(s->value->where, 1, 8, 6);
    assert_span(s->value->operator_where, 1, 10, 4);
    assert_span(s->value->right->operator_where, 1, 11, 1);
    s = s->next;
    assert_span(s->text_where, 2, 9, 3);
    assert_span(s->formula_where, 2, 15, 3);
    ck_assert(s->is_quoted);
    s = s->next;
    assert_span(s->names->where, 3, 10, 1);
    assert_span(s->names->next->where, 3, 13, 3);
    parsed_free(&p);
}
END_TEST

/* ---- Recovery -------------------------------------------------------------- */

static void assert_recovery(const char *text, const char *faults, const char *statements, const char *broken)
{
    parsed p = parsed_new(text, strlen(text));
    char *got = parsed_faults(p.list);
    ck_assert_str_eq(got, faults);
    free(got);
    got = parsed_statements(p.tree->first);
    ck_assert_str_eq(got, statements);
    free(got);
    got = parsed_statements(p.tree->first_broken);
    ck_assert_str_eq(got, broken);
    free(got);
    parsed_free(&p);
}

START_TEST(test_one_run_reports_every_fault)
{
    assert_recovery("x = )\n"
                    "A => B, k = 1\n"
                    "y = 1\n"
                    "A + B\n"
                    "[Q = 3\n"
                    "(R7) B -> C, k = 2 3, v = 4\n"
                    "z = 2",
                    "1:5+1 `)` without `(` | \n"
                    "2:3+2 `=>` is no arrow | write `->`\n"
                    "4:6+1 the reaction has no arrow | write `->`, or `<->` for a reversible reaction\n"
                    "5:1+6 the bracket is not closed | close it with `]`\n"
                    "6:20+1 an operator is missing before `3` | write `*` for a product",
                    "A -> B, k=1\ny = 1\nz = 2",
                    "x =\nA + B -> \n(R7) B -> C");
}
END_TEST

START_TEST(test_a_line_swallowed_by_a_comma_is_read_again)
{
    assert_recovery("(R1) A -> X, k = 1,\n"
                    "(R2) X -> Y, k = 2\n"
                    "x = 1 +\n"
                    "k2 = 3\n"
                    "y =\n"
                    "[A] = 2\n"
                    "B -> C,\n"
                    "retained D\n",
                    "2:1+1 unexpected `(`: the line above ends in `,` and goes on here | "
                    "finish the line above, or take the `,` at its end away\n"
                    "4:4+1 unexpected `=`: the line above ends in `+` and goes on here | "
                    "finish the line above, or take the `+` at its end away\n"
                    "6:5+1 unexpected `=`: the line above ends in `=` and goes on here | "
                    "finish the line above, or take the `=` at its end away\n"
                    "8:10+1 unexpected `D`: the line above ends in `,` and goes on here | "
                    "finish the line above, or take the `,` at its end away",
                    "(R2) X -> Y, k=2\nk2 = 3\n[A] = 2\nretained D",
                    "(R1) A -> X, k=1\nx =\ny =\nB -> C");
}
END_TEST

START_TEST(test_a_line_read_again_does_not_repeat_its_fault)
{
    assert_recovery("x = 1 +\n"
                    "A 2 -> B\n"
                    "y = 1 +\n"
                    "C => D 2",
                    "2:3+1 unexpected `2`: the line above ends in `+` and goes on here | "
                    "finish the line above, or take the `+` at its end away\n"
                    "4:3+2 `=>` is no arrow | write `->`\n"
                    "4:3+2 unexpected `=>`: the line above ends in `+` and goes on here | "
                    "finish the line above, or take the `+` at its end away\n"
                    "4:8+1 a `+` or an arrow is missing before `2` | "
                    "write `A + B -> C`; a name with a blank in it stands in quotes",
                    "",
                    "x =\ny =\nC -> D");
}
END_TEST

START_TEST(test_skipping_a_faulty_statement_stops_at_the_next)
{
    assert_recovery("(R1) A -> B, k = ),\n"
                    "     kr = 2,\n"
                    "(R2) C -> D, k = f(1 2,\n"
                    "     A = 3,\n"
                    "     k = 4)\n"
                    "x = 1",
                    "1:18+1 `)` without `(` | \n"
                    "3:22+1 an operator is missing before `2` | write `*` for a product",
                    "x = 1",
                    "(R1) A -> B\n(R2) C -> D");
}
END_TEST

START_TEST(test_a_fault_on_a_line_that_goes_on_rightly_is_reported_once)
{
    assert_recovery("A + B +\n"
                    "  C -> D -> E, k = 1\n"
                    "x = 1 *\n"
                    "  2 2\n"
                    "y = 3",
                    "2:10+2 a second arrow in one reaction | write each reaction on its own line\n"
                    "4:5+1 an operator is missing before `2` | write `*` for a product",
                    "y = 3",
                    "A + B + C -> D\nx =");
}
END_TEST

/* ---- Limits ---------------------------------------------------------------- */

/* count times a, then b, then count times c. */
static char *wrapped(const char *before, const char *a, size_t count, const char *b, const char *c)
{
    size_t room = strlen(before) + count * (strlen(a) + strlen(c)) + strlen(b) + 1;
    char *text = calloc(room, 1), *at = text + strlen(before);
    strcpy(text, before);
    for (size_t i = 0; i < count; i++, at += strlen(a))
        memcpy(at, a, strlen(a));
    memcpy(at, b, strlen(b));
    at += strlen(b);
    for (size_t i = 0; i < count; i++, at += strlen(c))
        memcpy(at, c, strlen(c));
    return text;
}

static size_t faults_of(const char *text, int *statements)
{
    parsed p = parsed_new(text, strlen(text));
    size_t faults = lb_diagnostics_faults(p.list);
    *statements = p.tree->statement_count;
    parsed_free(&p);
    return faults;
}

START_TEST(test_a_thousand_levels_of_nesting_are_read_and_no_more)
{
    static const struct { const char *open, *close; } rows[] = {{"(", ")"}, {"-", ""}, {"a^", ""}, {"f(x = 1+2*-(", "))"},
                                                              {"a+b*f(c, x = ", ")"}};
    static const size_t levels[] = {1, 1, 1, 3, 1};
    for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
        int count;
        char *text = wrapped("x = ", rows[i].open, 1000 / levels[i], "1", rows[i].close);
        ck_assert_uint_eq(faults_of(text, &count), 0);
        ck_assert_int_eq(count, 1);
        free(text);
        text = wrapped("y = 1\nx = ", rows[i].open, 1000 / levels[i] + 1, "1", rows[i].close);
        ck_assert_uint_eq(faults_of(text, &count), 1);
        ck_assert_int_eq(count, 1);
        free(text);
    }
}
END_TEST

START_TEST(test_signs_in_sums_are_no_nesting)
{
    int count;
    char *text = wrapped("x = ", "-a^2*-b + ", 2000, "1", "");
    ck_assert_uint_eq(faults_of(text, &count), 0);
    ck_assert_int_eq(count, 1);
    free(text);
}
END_TEST

START_TEST(test_ten_thousand_parentheses_are_one_fault)
{
    char *text = wrapped("x = ", "(", 10000, "1", ")");
    assert_faults(text, "1:1005+1 parentheses, powers and signs are nested deeper than 1000 levels | "
                        "give the inner parts names of their own");
    free(text);
}
END_TEST

START_TEST(test_a_sum_of_a_hundred_thousand_terms_records_its_depth)
{
    char *text = wrapped("", "a+", 100000, "a", "");
    parsed p = parsed_value(text);
    ck_assert_uint_eq(lb_diagnostics_faults(p.list), 0);
    ck_assert_int_eq(p.value->depth, 100001);
    parsed_free(&p);
    free(text);
}
END_TEST

START_TEST(test_a_line_of_ten_megabytes_is_read)
{
    static const struct { const char *piece; size_t faults; } rows[] = {
        {"+ a         ", 0}, {"- - - - - - ", 1}, {"(((((((((((", 1}, {";a ; a; a; a", 4 * 873813},
        {"[ [ [ [ [ [ ", 1}, {"\"a\" \"b\" \"c\" ", 1}, {"\xFF\xFF\xFF\xFF\xFF\xFF\xFF\xFF\xFF\xFF\xFF\xFF", 1},
    };
    for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
        int count;
        char *text = wrapped("x = 1 ", rows[i].piece, 873813, "\nA -> B", "");
        size_t faults = faults_of(text, &count);
        ck_assert_msg(rows[i].faults > 1 ? faults >= rows[i].faults : faults == rows[i].faults, "row %zu: %zu faults", i, faults);
        ck_assert_int_ge(count, 1);
        free(text);
    }
}
END_TEST

/* ---- Memory ---------------------------------------------------------------- */

START_TEST(test_lack_of_memory_is_told_and_leaks_nothing)
{
    const char *text = "title \"t\"\nunits M s\nk2 = 1 M-1 s^-1 in 1 .. 2\n(R1) 2 A + (f) B -> (f/2) C, k = f(A = 1, 2)\n"
                       "A => B; k = 1\nformula \"H+\" = H^+\nretained A, B\nx = )\ny = 1,5\n";
    for (long k = 0;; k++) {
        source *s;
        lb_diagnostics *list;
        syntax_tree *tree;
        memory_fail_after(k);
        lb_status status = source_new("t.mech", text, strlen(text), &s);
        if (status == LB_OK)
            status = diagnostics_new(s, &list);
        if (status == LB_OK) {
            status = syntax_parse(list, &tree);
            ck_assert(status == LB_OK || tree == NULL);
            memory_fail_after(-1);
            lb_diagnostics_free(list);
            if (status == LB_OK)
                syntax_free(tree);
        }
        memory_fail_after(-1);
        ck_assert(status == LB_OK || status == LB_E_NOMEM);
        if (status == LB_OK) {
            ck_assert_int_gt(k, 20);
            break;
        }
    }
}
END_TEST

Suite *parse_suite(void);

Suite *parse_suite(void)
{
    Suite *suite = suite_create("parse");
    TCase *c = tcase_create("parse");
    tcase_set_timeout(c, 60);
    tcase_add_test(c, test_definitions_are_read);
    tcase_add_test(c, test_reactions_are_read);
    tcase_add_test(c, test_words_are_keywords_only_in_their_place);
    tcase_add_test(c, test_expressions_have_the_precedence_of_mathematics);
    tcase_add_test(c, test_each_node_knows_its_depth);
    tcase_add_test(c, test_a_number_has_its_value);
    tcase_add_test(c, test_numbers_do_not_depend_on_the_locale);
    tcase_add_test(c, test_a_value_is_one_expression_and_no_more);
    tcase_add_test(c, test_a_line_that_wants_more_goes_on);
    tcase_add_test(c, test_line_ends_and_a_byte_order_mark_make_no_difference);
    tcase_add_test(c, test_places_count_characters);
    tcase_add_test(c, test_places_of_definitions);
    tcase_add_test(c, test_one_run_reports_every_fault);
    tcase_add_test(c, test_a_line_swallowed_by_a_comma_is_read_again);
    tcase_add_test(c, test_a_line_read_again_does_not_repeat_its_fault);
    tcase_add_test(c, test_skipping_a_faulty_statement_stops_at_the_next);
    tcase_add_test(c, test_a_fault_on_a_line_that_goes_on_rightly_is_reported_once);
    tcase_add_test(c, test_a_thousand_levels_of_nesting_are_read_and_no_more);
    tcase_add_test(c, test_signs_in_sums_are_no_nesting);
    tcase_add_test(c, test_ten_thousand_parentheses_are_one_fault);
    tcase_add_test(c, test_a_sum_of_a_hundred_thousand_terms_records_its_depth);
    tcase_add_test(c, test_a_line_of_ten_megabytes_is_read);
    tcase_add_test(c, test_lack_of_memory_is_told_and_leaks_nothing);
    suite_add_tcase(suite, c);
    return suite;
}

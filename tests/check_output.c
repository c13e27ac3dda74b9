/* Layout, tables, CSV and JSON: what a person or a program reads. */
#include <jansson.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/buffer.h"
#include "base/memory.h"
#include "output/grid.h"
#include "output/layout.h"
#include "support.h"

/* ---- layout ---- */

static void assert_number(double value, int digits, const char *want)
{
    char text[LAYOUT_NUMBER];
    layout_number(value, digits, text);
    ck_assert_str_eq(text, want);
}

START_TEST(test_numbers_are_short_and_without_padded_exponents)
{
    assert_number(0.1, 5, "0.1");
    assert_number(7.15691992, 6, "7.15692");
    assert_number(3.1e-7, 4, "3.1e-7");
    assert_number(1e10, 5, "1e10");
    assert_number(-2.5e-120, 5, "-2.5e-120");
    assert_number(-0.0, 5, "0");
    assert_number(NAN, 5, "undefined");
    assert_number(-INFINITY, 5, "-infinite");
}
END_TEST

START_TEST(test_complex_numbers_show_pairs_with_both_signs)
{
    char text[LAYOUT_COMPLEX];
    layout_complex((lb_complex){-0.15, 0.98868599666425949}, 5, text);
    ck_assert_str_eq(text, "-0.15 ± 0.98869 i");
    layout_complex((lb_complex){-0.15, 0}, 5, text);
    ck_assert_str_eq(text, "-0.15");
    layout_complex((lb_complex){2, -1}, 5, text);
    ck_assert_str_eq(text, "2 - 1 i");
}
END_TEST

START_TEST(test_columns_count_characters_not_bytes)
{
    ck_assert_int_eq(layout_columns("α + β⇌"), 6);
    ck_assert_int_eq(layout_columns("e\xcc\x81"), 1); /* e and a combining acute accent */
    ck_assert_int_eq(layout_columns(""), 0);
}
END_TEST

/* Widest line of text, in columns. */
static int widest(const char *text)
{
    int most = 0;
    while (*text) {
        size_t length = strcspn(text, "\n");
        char *line = memory_text_n(text, length);
        most = layout_columns(line) > most ? layout_columns(line) : most;
        memory_free(line);
        text += length + (text[length] == '\n');
    }
    return most;
}

START_TEST(test_paragraphs_keep_to_the_width)
{
    static const char words[] = "Δ of the whole class of Ångström units, μM and mM alike, are shown here with as many words as it "
                                "takes to fill more than one line of the page.";
    for (int width = 40; width <= 100; width += 7) {
        lb_layout layout = {.width = width};
        buffer out;
        buffer_init(&out);
        layout_paragraph(&out, &layout, 4, 2, words);
        ck_assert_int_le(widest(buffer_get(&out)), width);
        ck_assert_int_ge(widest(buffer_get(&out)), width - 10);
        ck_assert_ptr_nonnull(strstr(buffer_get(&out), "\n      ")); /* the hanging lines */
        buffer_clear(&out);
    }
}
END_TEST

START_TEST(test_a_word_wider_than_the_page_stays_whole)
{
    lb_layout layout = {.width = 40};
    buffer out;
    buffer_init(&out);
    layout_paragraph(&out, &layout, 0, 0, "short verylongwordverylongwordverylongwordverylongword short");
    ck_assert_str_eq(buffer_get(&out), "short\nverylongwordverylongwordverylongwordverylongword\nshort\n");
    buffer_clear(&out);
}
END_TEST

/* ---- tables ---- */

START_TEST(test_decimal_points_stand_under_each_other)
{
    grid g;
    grid_init(&g, "lnl", true);
    static const char *const cells[] = {"", "value", "unit", "k1", "0.25", "s^-1", "k10", "1200", "", "K", "-3.5e-7", "M"};
    for (size_t i = 0; i < sizeof cells / sizeof *cells; i++)
        grid_cell(&g, "%s", cells[i]);
    buffer out;
    buffer_init(&out);
    grid_write(&g, NULL, 2, &out);
    ck_assert_str_eq(buffer_get(&out), "       value      unit\n"
                                       "  k1      0.25    s^-1\n"
                                       "  k10  1200\n"
                                       "  K      -3.5e-7  M\n");
    buffer_clear(&out);
}
END_TEST

START_TEST(test_empty_columns_are_left_out)
{
    grid g;
    grid_init(&g, "lll", true);
    static const char *const cells[] = {"name", "range", "unit", "a", "", "M", "b", "", "s"};
    for (size_t i = 0; i < sizeof cells / sizeof *cells; i++)
        grid_cell(&g, "%s", cells[i]);
    buffer out;
    buffer_init(&out);
    grid_write(&g, NULL, 0, &out);
    ck_assert_str_eq(buffer_get(&out), "name  unit\na     M\nb     s\n");
    buffer_clear(&out);
}
END_TEST

START_TEST(test_long_last_cells_are_wrapped_within_the_page)
{
    lb_layout layout = {.width = 60};
    grid g;
    grid_init(&g, "lll", false);
    grid_cell(&g, "R1");
    grid_cell(&g, "A + B -> C");
    grid_cell(&g, "v = k1 * [A] * [B] / (Km + [A] + [B] + [A] * [B] / Ki) * exp(-[C])");
    buffer out;
    buffer_init(&out);
    grid_write(&g, &layout, 2, &out);
    ck_assert_int_le(widest(buffer_get(&out)), 60);
    ck_assert_ptr_nonnull(strstr(buffer_get(&out), "\n                  ")); /* under the cell's start */
    buffer_clear(&out);
}
END_TEST

/* ---- answers ---- */

static const char brusselator[] = "title \"Brusselator\"\nunits M s\n[A] = 1 M\n[B] = 3 M in 0.5 .. 5\n[X]0 = 1.2 M\n[Y]0 = 3 M\n"
                                  "share = [X]/([X] + [Y])\n"
                                  "A -> X, k = 1 s^-1\n2 X + Y -> 3 X, k = 1 M^-2 s^-1\n"
                                  "B + X -> Y + D, k = 1 M^-1 s^-1\nX -> E, k = 1 s^-1\n2 Y -> F, k = 0 M^-1 s^-1\n";

/* A time course that was not computed: the writers take any. */
static lb_run made_up_run(double *t, double *x, double *reading)
{
    return (lb_run){.states = 5, .readings = 1, .rows = 2, .t = t, .x = x, .reading = reading, .method = "none", .why = "made up"};
}

START_TEST(test_csv_has_units_and_reads_back_to_the_same_bits)
{
    double t[2] = {0, 0.1}, reading[2] = {0.25, NAN};
    double x[10] = {1.2, 3, 0, 0, 0, 1.0 / 3, 1e-300, -0.0, 6.02214076e23, 2};
    lb_network *net = support_network(brusselator);
    lb_system *system;
    ck_assert_int_eq(lb_system_new(net, &system, NULL), LB_OK);
    lb_run run = made_up_run(t, x, reading);
    lb_text *out = lb_text_new();
    ck_assert_int_eq(lb_csv_run(system, &run, out), LB_OK);
    const char *text = lb_text_get(out, NULL);
    static const char headings[] = "t [s],[X] [M],[Y] [M],[D] [M],[E] [M],[F] [M],share\n";
    ck_assert_msg(strncmp(text, headings, sizeof headings - 1) == 0, "%s", text);
    const char *row = strchr(strchr(text, '\n') + 1, '\n') + 1;
    char *end;
    ck_assert(strtod(row, &end) == t[1]);
    for (int i = 5; i < 10; i++)
        ck_assert(strtod(end + 1, &end) == x[i]);
    ck_assert_str_eq(end, ",\n"); /* the reading that has no value */
    lb_text_free(out);
    lb_system_free(system);
    lb_network_free(net);
}
END_TEST

START_TEST(test_csv_quotes_names_with_commas_and_quotes)
{
    lb_network *net = support_network("units none\n\"a,b\" -> \"c\xce\xb1\", k = 1\n");
    lb_system *system;
    ck_assert_int_eq(lb_system_new(net, &system, NULL), LB_OK);
    double t = 0, x[2] = {1, 2};
    lb_run run = {.states = 2, .rows = 1, .t = &t, .x = x, .reading = NULL};
    lb_text *out = lb_text_new();
    ck_assert_int_eq(lb_csv_run(system, &run, out), LB_OK);
    ck_assert_str_eq(lb_text_get(out, NULL), "t,\"[a,b]\",[c\xce\xb1]\n0,1,2\n");
    lb_text_free(out);
    lb_system_free(system);
    lb_network_free(net);
}
END_TEST

static json_t *parsed(const lb_text *out)
{
    size_t length;
    const char *text = lb_text_get(out, &length);
    json_error_t error;
    json_t *root = json_loadb(text, length, JSON_REJECT_DUPLICATES, &error);
    ck_assert_msg(root != NULL, "%s in %s", error.text, text);
    ck_assert_int_eq(text[length - 1], '\n');
    return root;
}

START_TEST(test_json_numbers_keep_their_bits_and_nan_is_null)
{
    double t[2] = {0, 0.1}, reading[2] = {0.25, NAN};
    double x[10] = {1.2, 3, 0, 0, 0, 1.0 / 3, 1e-300, -0.0, 6.02214076e23, INFINITY};
    lb_network *net = support_network(brusselator);
    lb_system *system;
    ck_assert_int_eq(lb_system_new(net, &system, NULL), LB_OK);
    lb_run run = made_up_run(t, x, reading);
    lb_text *out = lb_text_new();
    ck_assert_int_eq(lb_json_run(system, NULL, &run, NULL, out), LB_OK);
    json_t *root = parsed(out);
    json_t *values = json_object_get(root, "x");
    ck_assert(json_real_value(json_array_get(json_object_get(values, "X"), 1)) == 1.0 / 3);
    ck_assert(json_real_value(json_array_get(json_object_get(values, "Y"), 1)) == 1e-300);
    ck_assert(json_real_value(json_array_get(json_object_get(values, "E"), 1)) == 6.02214076e23);
    ck_assert(json_is_null(json_array_get(json_object_get(values, "F"), 1)));
    ck_assert(json_is_null(json_array_get(json_object_get(json_object_get(root, "readings"), "share"), 1)));
    ck_assert_uint_eq(json_array_size(json_object_get(root, "t")), 2);
    ck_assert_ptr_null(json_object_get(root, "error"));
    json_decref(root);
    lb_text_free(out);
    lb_system_free(system);
    lb_network_free(net);
}
END_TEST

START_TEST(test_json_of_check_has_the_promised_keys)
{
    lb_network *net = support_network(brusselator);
    lb_text *out = lb_text_new();
    ck_assert_int_eq(lb_json_check(net, NULL, out), LB_OK);
    json_t *root = parsed(out);
    static const char *const keys[] = {"limbeck", "command", "file", "warnings", "species", "constants", "reactions", "open"};
    for (size_t i = 0; i < sizeof keys / sizeof *keys; i++)
        ck_assert_msg(json_object_get(root, keys[i]) != NULL, "%s is missing", keys[i]);
    ck_assert_uint_eq(json_array_size(json_object_get(root, "species")), 7);
    json_t *held = json_array_get(json_object_get(root, "species"), 0);
    ck_assert_str_eq(json_string_value(json_object_get(held, "name")), "A");
    ck_assert_str_eq(json_string_value(json_object_get(held, "role")), "held");
    json_t *b = json_array_get(json_object_get(root, "constants"), 1);
    ck_assert_str_eq(json_string_value(json_object_get(b, "name")), "[B]");
    ck_assert(json_real_value(json_object_get(b, "low")) == 0.5);
    ck_assert_str_eq(json_string_value(json_object_get(b, "unit")), "M");
    json_t *dimer = json_array_get(json_object_get(root, "reactions"), 4);
    ck_assert(json_real_value(json_object_get(json_object_get(dimer, "balance"), "Y")) == -2);
    ck_assert(json_is_true(json_object_get(root, "open")));
    json_decref(root);
    lb_text_free(out);
    lb_network_free(net);
}
END_TEST

START_TEST(test_json_error_survives_text_that_is_not_utf8)
{
    lb_error err = {.code = LB_E_IO, .message = "bad\xff\xc3(\xe2\x82 byte", .remedy = ""};
    lb_text *out = lb_text_new();
    ck_assert_int_eq(lb_json_error("check", "odd\x80.mech", &err, NULL, out), LB_OK);
    json_t *root = parsed(out);
    ck_assert_str_eq(json_string_value(json_object_get(root, "file")), "odd\xef\xbf\xbd.mech");
    json_t *error = json_object_get(root, "error");
    ck_assert_str_eq(json_string_value(json_object_get(error, "code")), "file");
    ck_assert_ptr_nonnull(strstr(json_string_value(json_object_get(error, "message")), "bad\xef\xbf\xbd\xef\xbf\xbd("));
    json_decref(root);
    lb_text_free(out);
}
END_TEST

START_TEST(test_check_shows_roles_ranges_and_the_factor_of_a_rate)
{
    lb_network *net = support_network(brusselator);
    lb_text *out = lb_text_new();
    ck_assert_int_eq(lb_text_check(net, NULL, out), LB_OK);
    const char *text = lb_text_get(out, NULL);
    ck_assert_ptr_nonnull(strstr(text, "Open: [A], [B] held constant"));
    ck_assert_ptr_nonnull(strstr(text, "in 0.5 .. 5"));
    ck_assert_ptr_nonnull(strstr(text, "; Y used at 2 v"));
    ck_assert_int_le(widest(text), 80);
    lb_text_free(out);
    lb_network_free(net);
}
END_TEST

/* Oscillation of the Brusselator, solved once per test: a real result for the writers. */
typedef struct solved {
    lb_network *net;
    lb_system *system;
    lb_oscillate *oscillate;
} solved;

static solved solve_brusselator(void)
{
    solved s = {.net = support_network(brusselator)};
    lb_oscillate_options options = {.given = true};
    ck_assert_int_eq(lb_system_new(s.net, &s.system, NULL), LB_OK);
    ck_assert_int_eq(lb_oscillate_solve(s.system, &options, &s.oscillate, NULL), LB_OK);
    return s;
}

static void solved_clear(solved *s)
{
    lb_oscillate_free(s->oscillate);
    lb_system_free(s->system);
    lb_network_free(s->net);
}

static void assert_keys(const json_t *object, const char *const *keys)
{
    for (; *keys; keys++)
        ck_assert_msg(json_object_get(object, *keys) != NULL, "the key %s is missing", *keys);
}

static const char *const common_keys[] = {"limbeck", "command", "file", "warnings", NULL};

START_TEST(test_json_of_steady_has_the_promised_keys)
{
    static const char *const keys[] = {"steady_states", "complete", "conservation_totals", "accumulating", NULL};
    static const char *const state_keys[] = {"x", "eigenvalues", "stable", "kind", "certified", NULL};
    solved s = solve_brusselator();
    lb_text *out = lb_text_new();
    ck_assert_int_eq(lb_json_steady(s.system, NULL, s.oscillate->steady, NULL, out), LB_OK);
    json_t *root = parsed(out);
    assert_keys(root, common_keys);
    assert_keys(root, keys);
    ck_assert_str_eq(json_string_value(json_object_get(root, "complete")), "searched");
    json_t *state = json_array_get(json_object_get(root, "steady_states"), 0);
    assert_keys(state, state_keys);
    assert_close(json_real_value(json_object_get(json_object_get(state, "x"), "X")), 1, 1e-12, 0);
    ck_assert(json_is_null(json_object_get(json_object_get(state, "x"), "D"))); /* accumulates */
    ck_assert(json_is_false(json_object_get(state, "stable")));
    ck_assert(json_is_false(json_object_get(state, "certified")));
    json_t *first = json_array_get(json_object_get(state, "eigenvalues"), 0);
    assert_close(json_real_value(json_array_get(first, 0)), 0.5, 1e-9, 0); /* trace B - 1 - A^2 = 1 */
    assert_close(json_real_value(json_array_get(first, 1)), sqrt(0.75), 1e-9, 0);
    json_decref(root);
    lb_text_free(out);
    solved_clear(&s);
}
END_TEST

START_TEST(test_json_of_oscillate_has_a_witness_that_reads)
{
    static const char *const keys[] = {"scope", "verdict", "basis", "witness", "effort", NULL};
    static const char *const witness_keys[] = {"constants", "x", "period", "amplitude", "multipliers", "stable", "file", NULL};
    static const char *const effort_keys[] = {"samples", "seconds", "method", NULL};
    solved s = solve_brusselator();
    lb_text *out = lb_text_new();
    ck_assert_int_eq(lb_json_oscillate(s.system, NULL, s.oscillate, out), LB_OK);
    json_t *root = parsed(out);
    assert_keys(root, common_keys);
    json_t *answer = json_array_get(json_object_get(root, "answers"), 0);
    assert_keys(answer, keys);
    assert_keys(json_object_get(answer, "effort"), effort_keys);
    ck_assert_str_eq(json_string_value(json_object_get(answer, "verdict")), "oscillates");
    ck_assert_str_eq(json_string_value(json_object_get(answer, "basis")), "witness");
    ck_assert_ptr_null(json_object_get(answer, "theorem"));
    json_t *witness = json_object_get(answer, "witness");
    assert_keys(witness, witness_keys);
    assert_close(json_real_value(json_object_get(witness, "period")), 7.15691992, 1e-8, 0); /* 113-bit shooting */
    ck_assert_uint_eq(json_object_size(json_object_get(witness, "constants")), 7);
    lb_network_free(support_network(json_string_value(json_object_get(witness, "file"))));
    json_decref(root);
    lb_text_free(out);
    solved_clear(&s);
}
END_TEST

START_TEST(test_json_of_a_failed_run_keeps_the_rows)
{
    double t[2] = {0, 0.1}, reading[2] = {0.25, 0.5}, x[10] = {0};
    lb_network *net = support_network(brusselator);
    lb_system *system;
    ck_assert_int_eq(lb_system_new(net, &system, NULL), LB_OK);
    lb_run run = made_up_run(t, x, reading);
    lb_error err = {.code = LB_E_NEGATIVE, .message = "below zero"};
    lb_text *out = lb_text_new();
    ck_assert_int_eq(lb_json_run(system, NULL, &run, &err, out), LB_OK);
    json_t *root = parsed(out);
    ck_assert_uint_eq(json_array_size(json_object_get(root, "t")), 2);
    ck_assert_str_eq(json_string_value(json_object_get(json_object_get(root, "error"), "code")), "negative");
    json_decref(root);
    lb_text_free(out);
    lb_system_free(system);
    lb_network_free(net);
}
END_TEST

START_TEST(test_page_tells_the_witness_and_the_totals)
{
    solved s = solve_brusselator();
    lb_text *out = lb_text_new();
    ck_assert_int_eq(lb_text_page(s.system, s.oscillate, NULL, out), LB_OK);
    const char *text = lb_text_get(out, NULL);
    ck_assert_ptr_nonnull(strstr(text, "\nConserved\n  nothing\n"));
    ck_assert_ptr_nonnull(strstr(text, "1: unstable focus"));
    ck_assert_ptr_nonnull(strstr(text, "Oscillates (witnessed): attracting limit cycle, period 7.15692 s."));
    ck_assert_int_le(widest(text), 80);
    lb_text_free(out);
    solved_clear(&s);
}
END_TEST

typedef lb_status writer(const solved *s, lb_text *out);

static lb_status write_check(const solved *s, lb_text *out) { return lb_text_check(s->net, NULL, out); }
static lb_status write_steady(const solved *s, lb_text *out) { return lb_text_steady(s->system, s->oscillate->steady, NULL, out); }
static lb_status write_oscillate(const solved *s, lb_text *out) { return lb_text_oscillate(s->system, s->oscillate, NULL, out); }
static lb_status write_page(const solved *s, lb_text *out) { return lb_text_page(s->system, s->oscillate, NULL, out); }
static lb_status write_json(const solved *s, lb_text *out) { return lb_json_page(s->system, NULL, s->oscillate, out); }

/* Each allocation fails in turn: the writer says so, or its text is whole. */
static void assert_reports_exhausted_memory(writer *write, const solved *s)
{
    lb_text *whole = lb_text_new();
    ck_assert_int_eq(write(s, whole), LB_OK);
    lb_status status = LB_E_NOMEM;
    long k = 0;
    for (; k < 5000 && status != LB_OK; k++) {
        lb_text *out = lb_text_new();
        memory_fail_after(k);
        status = write(s, out);
        memory_fail_after(-1);
        ck_assert_msg(status == LB_OK || status == LB_E_NOMEM, "%s", lb_status_text(status));
        if (status == LB_OK)
            ck_assert_str_eq(lb_text_get(out, NULL), lb_text_get(whole, NULL));
        lb_text_free(out);
    }
    ck_assert_int_gt(k, 20);
    ck_assert_int_eq(status, LB_OK);
    lb_text_free(whole);
}

START_TEST(test_writers_report_exhausted_memory)
{
    static writer *const writers[] = {write_check, write_steady, write_oscillate, write_page, write_json};
    solved s = solve_brusselator();
    for (size_t i = 0; i < sizeof writers / sizeof *writers; i++)
        assert_reports_exhausted_memory(writers[i], &s);
    solved_clear(&s);
}
END_TEST

Suite *output_suite(void)
{
    Suite *suite = suite_create("output");
    TCase *layout = tcase_create("layout");
    tcase_add_test(layout, test_numbers_are_short_and_without_padded_exponents);
    tcase_add_test(layout, test_complex_numbers_show_pairs_with_both_signs);
    tcase_add_test(layout, test_columns_count_characters_not_bytes);
    tcase_add_test(layout, test_paragraphs_keep_to_the_width);
    tcase_add_test(layout, test_a_word_wider_than_the_page_stays_whole);
    suite_add_tcase(suite, layout);
    TCase *tables = tcase_create("tables");
    tcase_add_test(tables, test_decimal_points_stand_under_each_other);
    tcase_add_test(tables, test_empty_columns_are_left_out);
    tcase_add_test(tables, test_long_last_cells_are_wrapped_within_the_page);
    suite_add_tcase(suite, tables);
    TCase *answers = tcase_create("answers");
    tcase_add_test(answers, test_csv_has_units_and_reads_back_to_the_same_bits);
    tcase_add_test(answers, test_csv_quotes_names_with_commas_and_quotes);
    tcase_add_test(answers, test_json_numbers_keep_their_bits_and_nan_is_null);
    tcase_add_test(answers, test_json_of_check_has_the_promised_keys);
    tcase_add_test(answers, test_json_error_survives_text_that_is_not_utf8);
    tcase_add_test(answers, test_check_shows_roles_ranges_and_the_factor_of_a_rate);
    tcase_add_test(answers, test_json_of_steady_has_the_promised_keys);
    tcase_add_test(answers, test_json_of_oscillate_has_a_witness_that_reads);
    tcase_add_test(answers, test_json_of_a_failed_run_keeps_the_rows);
    tcase_add_test(answers, test_page_tells_the_witness_and_the_totals);
    tcase_add_test(answers, test_writers_report_exhausted_memory);
    suite_add_tcase(suite, answers);
    return suite;
}

/* The source's line map, the list of faults and warnings, and how it is shown. */
#include <check.h>
#include <stdlib.h>
#include <string.h>

#include "base/buffer.h"
#include "base/memory.h"
#include "text/source.h"
#include "text/utf8.h"

static lb_diagnostics *list_of(const char *text)
{
    source *s;
    lb_diagnostics *list;
    ck_assert_int_eq(source_new("bath.mech", text, strlen(text), &s), LB_OK);
    ck_assert_int_eq(diagnostics_new(s, &list), LB_OK);
    return list;
}

static void assert_shown(const lb_diagnostics *list, bool colour, const char *wanted)
{
    buffer text;
    buffer_init(&text);
    ck_assert_int_eq(lb_diagnostics_write(list, colour, &text), LB_OK);
    ck_assert_str_eq(buffer_get(&text), wanted);
    buffer_clear(&text);
}

/* ---- Source ----------------------------------------------------------------- */

static void assert_line(const source *s, int line, const char *wanted)
{
    const char *start;
    size_t length;
    ck_assert(source_line(s, line, &start, &length));
    ck_assert_uint_eq(length, strlen(wanted));
    ck_assert(memcmp(start, wanted, length) == 0);
}

START_TEST(test_lines_end_in_any_of_three_ways)
{
    lb_diagnostics *list = list_of("\xEF\xBB\xBF" "a\nb\r\nc\rd\n\n\re");
    const source *s = diagnostics_source(list);
    static const char *wanted[] = {"a", "b", "c", "d", "", "", "e"};
    const char *start;
    size_t length;
    for (int i = 0; i < 7; i++)
        assert_line(s, i + 1, wanted[i]);
    ck_assert(!source_line(s, 0, &start, &length));
    ck_assert(!source_line(s, 8, &start, &length));
    ck_assert_str_eq(source_name(s), "bath.mech");
    ck_assert_uint_eq(source_length(s), strlen(source_text(s)));
    lb_diagnostics_free(list);
}
END_TEST

START_TEST(test_an_empty_text_has_one_empty_line)
{
    lb_diagnostics *list = list_of("");
    assert_line(diagnostics_source(list), 1, "");
    lb_diagnostics_free(list);
}
END_TEST

START_TEST(test_utf8_is_decoded_as_the_standard_has_it)
{
    static const struct { const char *bytes; size_t length; int taken; uint32_t code; } rows[] = {
        {"a", 1, 1, 'a'}, {"\xCE\xB1", 2, 2, 0x3B1}, {"\xE2\x86\x92", 3, 3, 0x2192}, {"\xF0\x9F\x98\x80", 4, 4, 0x1F600},
        {"", 0, 0, 0}, {"\xCE", 1, 0, 0}, {"\xC0\x80", 2, 0, 0}, {"\xE0\x80\x80", 3, 0, 0}, {"\xED\xA0\x80", 3, 0, 0},
        {"\xF4\x90\x80\x80", 4, 0, 0}, {"\xFF", 1, 0, 0}, {"\x80", 1, 0, 0}, {"\xE2\x86(", 3, 0, 0},
        {"\xF4\x8F\xBF\xBF", 4, 4, 0x10FFFF}, {"\xF0\x80\x80\x80", 4, 0, 0},
    };
    for (size_t i = 0; i < sizeof rows / sizeof *rows; i++) {
        uint32_t code = 0;
        ck_assert_int_eq(utf8_decode(rows[i].bytes, rows[i].length, &code), rows[i].taken);
        if (rows[i].taken)
            ck_assert_uint_eq(code, rows[i].code);
    }
    ck_assert_uint_eq(utf8_count("\xCE\xB1\xFF" "b", 4), 3);
}
END_TEST

/* ---- The list ----------------------------------------------------------------- */

START_TEST(test_the_list_is_sorted_by_place_and_repeats_are_dropped)
{
    lb_diagnostics *list = list_of("abc\ndef");
    diagnostics_warn(list, (span){2, 1, 1}, NULL, "w%d", 1);
    diagnostics_fault(list, (span){2, 1, 1}, "r", "f%d", 1);
    diagnostics_fault(list, (span){1, 3, 1}, NULL, "f2");
    diagnostics_fault(list, (span){2, 1, 2}, "other", "f1");
    diagnostics_fault(list, (span){1, 1, 1}, NULL, "f2");
    diagnostics_sort(list);
    static const char *wanted[] = {"f2", "f2", "f1", "w1"};
    ck_assert_uint_eq(lb_diagnostics_count(list), 4);
    ck_assert_uint_eq(lb_diagnostics_faults(list), 3);
    for (size_t i = 0; i < 4; i++)
        ck_assert_str_eq(lb_diagnostics_get(list, i).message, wanted[i]);
    ck_assert_str_eq(lb_diagnostics_get(list, 2).remedy, "r");
    ck_assert_str_eq(lb_diagnostics_get(list, 0).remedy, "");
    ck_assert(!lb_diagnostics_get(list, 3).is_fault);
    lb_diagnostics_free(list);
}
END_TEST

START_TEST(test_beyond_a_hundred_faults_the_rest_are_counted)
{
    lb_diagnostics *list = list_of("");
    for (int i = 0; i < 101; i++)
        diagnostics_fault(list, (span){1, 1 + i, 1}, NULL, "f");
    for (int i = 0; i < 103; i++)
        diagnostics_warn(list, (span){1, 1 + i, 1}, NULL, "w");
    ck_assert_uint_eq(lb_diagnostics_count(list), 200);
    ck_assert_uint_eq(lb_diagnostics_faults(list), 101);
    buffer text;
    buffer_init(&text);
    lb_diagnostics_write(list, false, &text);
    const char *wanted = "bath.mech: 1 more error not shown\nbath.mech: 3 more warnings not shown\n";
    ck_assert_str_eq(buffer_get(&text) + text.length - strlen(wanted), wanted);
    buffer_clear(&text);
    lb_diagnostics_free(list);
}
END_TEST

START_TEST(test_no_message_can_steer_a_terminal)
{
    lb_diagnostics *list = list_of("a\033[31mb");
    diagnostics_fault(list, (span){1, 7, 1}, "\033\n", "name `%.2s` \x07\xC2\x9B", "\xE2\x86\x92");
    assert_shown(list, false, "bath.mech:1:7: error: name `\?\?` \?\?\?\n    a?[31mb\n          ^\n    \?\?\n");
    lb_diagnostics_free(list);
}
END_TEST

/* ---- How it is shown ------------------------------------------------------------ */

START_TEST(test_a_caret_stands_under_the_place)
{
    lb_diagnostics *list = list_of("title \"x\"\n(R1)\tA => \xCE\xB1\xCE\xB2, k = 1\n");
    diagnostics_fault(list, (span){2, 8, 2}, "write `->`", "`=>` is no arrow");
    diagnostics_warn(list, (span){2, 11, 2}, NULL, "nothing uses `\xCE\xB1\xCE\xB2`");
    assert_shown(list, false,
                 "bath.mech:2:8: error: `=>` is no arrow\n"
                 "    (R1) A => \xCE\xB1\xCE\xB2, k = 1\n"
                 "           ^~\n"
                 "    write `->`\n"
                 "bath.mech:2:11: warning: nothing uses `\xCE\xB1\xCE\xB2`\n"
                 "    (R1) A => \xCE\xB1\xCE\xB2, k = 1\n"
                 "              ^~\n");
    lb_diagnostics_free(list);
}
END_TEST

START_TEST(test_wide_characters_and_stray_bytes_keep_the_caret_in_place)
{
    lb_diagnostics *list = list_of("\xE6\xB0\xB4\xFF" "e\xCC\x81x");
    diagnostics_fault(list, (span){1, 5, 1}, NULL, "here");
    assert_shown(list, false,
                 "bath.mech:1:5: error: here\n"
                 "    \xE6\xB0\xB4\xEF\xBF\xBD" "e\xCC\x81x\n"
                 "        ^\n");
    lb_diagnostics_free(list);
}
END_TEST

START_TEST(test_a_place_behind_the_line_and_an_empty_line_are_shown)
{
    lb_diagnostics *list = list_of("x =\n\n");
    diagnostics_fault(list, (span){1, 4, 1}, NULL, "end");
    diagnostics_fault(list, (span){2, 1, 1}, NULL, "empty");
    assert_shown(list, false, "bath.mech:1:4: error: end\n    x =\n       ^\nbath.mech:2:1: error: empty\n");
    lb_diagnostics_free(list);
}
END_TEST

/* A line of 300 characters, `*` at the places pointed at, which are in no order. */
START_TEST(test_a_long_line_is_shown_through_a_window)
{
    char text[301];
    memset(text, '.', 300);
    text[300] = '\0';
    text[9] = text[149] = text[299] = '*';
    lb_diagnostics *list = list_of(text);
    diagnostics_fault(list, (span){1, 10, 1}, NULL, "left");
    diagnostics_fault(list, (span){1, 300, 1}, NULL, "right");
    diagnostics_fault(list, (span){1, 150, 1}, NULL, "middle");
    buffer shown;
    buffer_init(&shown);
    lb_diagnostics_write(list, false, &shown);
    char *line = strtok(shown.data, "\n");
    static const struct { size_t length; int caret; } wanted[] = {{4 + 96 + 3, 13}, {4 + 3 + 49, 55}, {4 + 3 + 96 + 3, 55}};
    for (int i = 0; i < 3; i++) {
        ck_assert_ptr_nonnull(strstr(line, "error: "));
        line = strtok(NULL, "\n");
        char *caret = strtok(NULL, "\n");
        ck_assert_uint_eq(strlen(line), wanted[i].length);
        ck_assert_uint_eq(strlen(caret), (size_t)wanted[i].caret + 1);
        ck_assert(caret[wanted[i].caret] == '^' && line[wanted[i].caret] == '*');
        line = strtok(NULL, "\n");
    }
    buffer_clear(&shown);
    lb_diagnostics_free(list);
}
END_TEST

START_TEST(test_colours_are_for_those_who_ask)
{
    lb_diagnostics *list = list_of("ab");
    diagnostics_fault(list, (span){1, 1, 2}, "r", "f");
    diagnostics_warn(list, (span){1, 2, 1}, NULL, "w");
    assert_shown(list, true,
                 "\033[1mbath.mech:1:1:\033[0m \033[1;31merror:\033[0m f\n    ab\n    \033[32m^~\033[0m\n    r\n"
                 "\033[1mbath.mech:1:2:\033[0m \033[1;35mwarning:\033[0m w\n    ab\n     \033[32m^\033[0m\n");
    lb_diagnostics_free(list);
}
END_TEST

/* ---- Memory --------------------------------------------------------------------- */

START_TEST(test_lack_of_memory_is_remembered)
{
    for (long k = 0; k < 6; k++) { /* message and its fit, remedy, the array */
        lb_diagnostics *list = list_of("ab");
        memory_fail_after(k);
        diagnostics_fault(list, (span){1, 1, 1}, "remedy", "message");
        memory_fail_after(-1);
        ck_assert_int_eq(diagnostics_status(list), k < 4 ? LB_E_NOMEM : LB_OK);
        ck_assert_uint_eq(lb_diagnostics_faults(list), 1);
        ck_assert_uint_eq(lb_diagnostics_count(list), k < 4 ? 0 : 1);
        lb_diagnostics_free(list);
    }
}
END_TEST

START_TEST(test_a_source_without_memory_is_none)
{
    source *s;
    lb_diagnostics *list;
    for (long k = 0; k < 4; k++) {
        memory_fail_after(k);
        ck_assert_int_eq(source_new("n", "a\nb", 3, &s), LB_E_NOMEM);
        ck_assert_ptr_null(s);
    }
    memory_fail_after(-1);
    ck_assert_int_eq(source_new("n", "a\nb", 3, &s), LB_OK);
    memory_fail_after(0);
    ck_assert_int_eq(diagnostics_new(s, &list), LB_E_NOMEM);
    ck_assert_ptr_null(list);
    memory_fail_after(-1);
    lb_diagnostics_free(NULL);
}
END_TEST

Suite *diagnostics_suite(void);

Suite *diagnostics_suite(void)
{
    Suite *suite = suite_create("diagnostics");
    TCase *c = tcase_create("diagnostics");
    tcase_add_test(c, test_lines_end_in_any_of_three_ways);
    tcase_add_test(c, test_an_empty_text_has_one_empty_line);
    tcase_add_test(c, test_utf8_is_decoded_as_the_standard_has_it);
    tcase_add_test(c, test_the_list_is_sorted_by_place_and_repeats_are_dropped);
    tcase_add_test(c, test_beyond_a_hundred_faults_the_rest_are_counted);
    tcase_add_test(c, test_no_message_can_steer_a_terminal);
    tcase_add_test(c, test_a_caret_stands_under_the_place);
    tcase_add_test(c, test_wide_characters_and_stray_bytes_keep_the_caret_in_place);
    tcase_add_test(c, test_a_place_behind_the_line_and_an_empty_line_are_shown);
    tcase_add_test(c, test_a_long_line_is_shown_through_a_window);
    tcase_add_test(c, test_colours_are_for_those_who_ask);
    tcase_add_test(c, test_lack_of_memory_is_remembered);
    tcase_add_test(c, test_a_source_without_memory_is_none);
    suite_add_tcase(suite, c);
    return suite;
}

/* Texts and numbers of a mechanism as C spells them. */
#include <math.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#include "emit/spell.h"
#include "support.h"

typedef void speller(buffer *out, const char *text);

static void comment_whole(buffer *out, const char *text)
{
    spell_comment(out, text, 0);
}

static void assert_spelled(speller *spell, const char *text, const char *want)
{
    buffer out;
    buffer_init(&out);
    spell(&out, text);
    ck_assert_str_eq(buffer_get(&out), want);
    buffer_clear(&out);
}

START_TEST(test_strings_escape_whatever_is_not_plain)
{
    assert_spelled(spell_string, "k2", "\"k2\"");
    assert_spelled(spell_string, "a\"b\\c", "\"a\\\"b\\\\c\"");
    assert_spelled(spell_string, "\?\?/", "\"\\?\\?/\"");
    assert_spelled(spell_string, "\n\r\t\x7f", "\"\\012\\015\\011\\177\"");
    assert_spelled(spell_string, "%s%n", "\"%s%n\"");
    assert_spelled(spell_string, "\xce\xb1" "1", "\"\\316\\2611\"");
    assert_spelled(spell_string, "\xff", "\"\\377\"");
}
END_TEST

START_TEST(test_long_strings_become_arrays_of_characters)
{
    char *text = malloc(4002);
    memset(text, 'a', 4001);
    text[4001] = '\0';
    buffer out;
    buffer_init(&out);
    spell_string(&out, text);
    ck_assert_int_eq(strncmp(buffer_get(&out), "(const char[]){'\\141', ", 23), 0);
    buffer_clear(&out);
    text[4000] = '\0';
    spell_string(&out, text);
    ck_assert_uint_eq(out.length, 4002);
    buffer_clear(&out);
    free(text);
}
END_TEST

START_TEST(test_comments_cannot_end_or_begin_within)
{
    assert_spelled(comment_whole, "*/ x /*", "* / x / *");
    assert_spelled(comment_whole, "**//**", "** // **");
    assert_spelled(comment_whole, "*/*/*", "* / * / *");
    assert_spelled(comment_whole, "\?\?/\?\?\?/", "? ?/? ? ?/");
    assert_spelled(comment_whole, "a\\\nb", "a<U+005C><U+000A>b");
    assert_spelled(comment_whole, "2 X \xe2\x86\x92 \xce\xb1", "2 X \xe2\x86\x92 \xce\xb1");
}
END_TEST

START_TEST(test_comments_show_hidden_characters_by_number)
{
    assert_spelled(comment_whole, "\xe2\x80\xae" "x", "<U+202E>x");          /* right-to-left override */
    assert_spelled(comment_whole, "\xe2\x81\xa6", "<U+2066>");               /* isolate */
    assert_spelled(comment_whole, "\xe2\x80\x8b\xef\xbb\xbf", "<U+200B><U+FEFF>");
    assert_spelled(comment_whole, "\xc2\x85\xe2\x80\xa8", "<U+0085><U+2028>"); /* line ends of Unicode */
    assert_spelled(comment_whole, "\xff\x80", "<0xFF><0x80>");
    assert_spelled(comment_whole, "\xc0\xaf", "<0xC0><0xAF>");               /* an overlong `/` */
    assert_spelled(comment_whole, "\xed\xa0\x80", "<0xED><0xA0><0x80>");     /* a surrogate */
    assert_spelled(comment_whole, "\xf4\x90\x80\x80", "<0xF4><0x90><0x80><0x80>");
    assert_spelled(comment_whole, "\xe2\x82", "<0xE2><0x82>");               /* cut off */
}
END_TEST

START_TEST(test_comments_are_cut_between_characters)
{
    buffer out;
    buffer_init(&out);
    spell_comment(&out, "\xce\xb1\xce\xb2\xce\xb3", 3);
    ck_assert_str_eq(buffer_get(&out), "\xce\xb1\xce\xb2...");
    buffer_clear(&out);
}
END_TEST

static void assert_number(double value, const char *want)
{
    buffer out;
    buffer_init(&out);
    spell_number(&out, value);
    ck_assert_str_eq(buffer_get(&out), want);
    buffer_clear(&out);
}

START_TEST(test_numbers_are_short_and_doubles)
{
    assert_number(1, "1.0");
    assert_number(-2.5, "-2.5");
    assert_number(0.1, "0.1");
    assert_number(1.6e9, "1.6e9");
    assert_number(123456789, "123456789.0");
    assert_number(1e-300, "1e-300");
    assert_number(5e-324, "4.94065645841247e-324");
    assert_number(1.0 / 3, "0.3333333333333333");
    assert_number(NAN, "NAN");
    assert_number(-INFINITY, "-INFINITY");
}
END_TEST

START_TEST(test_numbers_read_back_as_themselves)
{
    uint64_t state = 1;
    for (int i = 0; i < 200000; i++) {
        state = state * UINT64_C(6364136223846793005) + UINT64_C(1442695040888963407);
        double value;
        uint64_t bits = state ^ state >> 29;
        memcpy(&value, &bits, sizeof value);
        if (!isfinite(value))
            continue;
        buffer out;
        buffer_init(&out);
        spell_number(&out, value);
        ck_assert_msg(strtod(buffer_get(&out), NULL) == value, "%.17g became %s", value, buffer_get(&out));
        ck_assert(strpbrk(buffer_get(&out), ".e") != NULL);
        buffer_clear(&out);
    }
}
END_TEST

START_TEST(test_identifiers_keep_letters_and_digits)
{
    assert_spelled(spell_identifier, "k2", "k2");
    assert_spelled(spell_identifier, "[H+]in", "H_in");
    assert_spelled(spell_identifier, "R3.kf", "R3_kf");
    assert_spelled(spell_identifier, "\xce\xb1", "");
    assert_spelled(spell_identifier, "--a--b--", "a_b");
}
END_TEST

START_TEST(test_prefixes_are_identifiers_of_the_user)
{
    ck_assert(spell_is_prefix("bath_2"));
    ck_assert(spell_is_prefix("X"));
    ck_assert(!spell_is_prefix(""));
    ck_assert(!spell_is_prefix("2bath"));
    ck_assert(!spell_is_prefix("_bath"));
    ck_assert(!spell_is_prefix("bath-2"));
    ck_assert(!spell_is_prefix("int"));
    ck_assert(!spell_is_prefix("restrict"));
    ck_assert(!spell_is_prefix("\xce\xb1"));
    ck_assert(!spell_is_prefix("a b"));
}
END_TEST

Suite *spell_suite(void)
{
    Suite *suite = suite_create("spell");
    TCase *strings = tcase_create("strings"), *comments = tcase_create("comments");
    tcase_add_test(strings, test_strings_escape_whatever_is_not_plain);
    tcase_add_test(strings, test_long_strings_become_arrays_of_characters);
    tcase_add_test(comments, test_comments_cannot_end_or_begin_within);
    tcase_add_test(comments, test_comments_show_hidden_characters_by_number);
    tcase_add_test(comments, test_comments_are_cut_between_characters);
    TCase *numbers = tcase_create("numbers"), *identifiers = tcase_create("identifiers");
    tcase_add_test(numbers, test_numbers_are_short_and_doubles);
    tcase_add_test(numbers, test_numbers_read_back_as_themselves);
    tcase_add_test(identifiers, test_identifiers_keep_letters_and_digits);
    tcase_add_test(identifiers, test_prefixes_are_identifiers_of_the_user);
    suite_add_tcase(suite, strings);
    suite_add_tcase(suite, comments);
    suite_add_tcase(suite, numbers);
    suite_add_tcase(suite, identifiers);
    return suite;
}

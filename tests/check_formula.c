/* Chemical formulas: atoms, charge, and where a fault is. */
#include <check.h>
#include <stdlib.h>
#include <string.h>

#include "base/memory.h"
#include "model/formula.h"
#include "support.h"

static int64_t count_of(const formula *f, const char *symbol)
{
    for (int i = 0; i < f->atom_count; i++)
        if (strcmp(formula_symbol(f->atoms[i].element), symbol) == 0)
            return f->atoms[i].count;
    return 0;
}

static formula read_formula(const char *text)
{
    formula f;
    formula_fault fault;
    ck_assert_msg(formula_parse(text, &f, &fault) == LB_OK, "%s: %s", text, fault.message);
    return f;
}

START_TEST(test_atoms_are_counted)
{
    formula f = read_formula("C6H12O6");
    ck_assert_int_eq(f.atom_count, 3);
    ck_assert_int_eq(count_of(&f, "C"), 6);
    ck_assert_int_eq(count_of(&f, "H"), 12);
    ck_assert_int_eq(count_of(&f, "O"), 6);
    ck_assert_int_eq(f.charge, 0);
    formula_clear(&f);
}
END_TEST

START_TEST(test_two_letters_are_one_element)
{
    formula carbon_oxide = read_formula("CO"), cobalt = read_formula("Co"), bromate = read_formula("BrO3^-");
    ck_assert(carbon_oxide.atom_count == 2 && cobalt.atom_count == 1);
    ck_assert_int_eq(count_of(&cobalt, "Co"), 1);
    ck_assert_int_eq(count_of(&bromate, "Br"), 1);
    ck_assert_int_eq(count_of(&bromate, "O"), 3);
    ck_assert_int_eq(bromate.charge, -1);
    formula_clear(&carbon_oxide);
    formula_clear(&cobalt);
    formula_clear(&bromate);
}
END_TEST

START_TEST(test_groups_multiply)
{
    formula f = read_formula("Fe(C5H5(OH)2)3");
    ck_assert_int_eq(count_of(&f, "Fe"), 1);
    ck_assert_int_eq(count_of(&f, "C"), 15);
    ck_assert_int_eq(count_of(&f, "H"), 21);
    ck_assert_int_eq(count_of(&f, "O"), 6);
    formula_clear(&f);
    f = read_formula("[Fe(CN)6]^3-");
    ck_assert_int_eq(count_of(&f, "N"), 6);
    ck_assert_int_eq(f.charge, -3);
    formula_clear(&f);
}
END_TEST

START_TEST(test_a_dot_joins_a_hydrate)
{
    static const char *const texts[] = {"CuSO4.5H2O", "CuSO4\xC2\xB7""5H2O"};
    for (int i = 0; i < 2; i++) {
        formula f = read_formula(texts[i]);
        ck_assert_int_eq(count_of(&f, "Cu"), 1);
        ck_assert_int_eq(count_of(&f, "S"), 1);
        ck_assert_int_eq(count_of(&f, "O"), 9);
        ck_assert_int_eq(count_of(&f, "H"), 10);
        formula_clear(&f);
    }
}
END_TEST

START_TEST(test_charges_have_a_number_and_a_sign)
{
    static const struct { const char *text; int charge; } cases[] = {
        {"Ce^4+", 4}, {"H^+", 1}, {"Br^-", -1}, {"SO4^2-", -2}, {"e^-", -1}, {"O2", 0}};
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        formula f = read_formula(cases[i].text);
        ck_assert_int_eq(f.charge, cases[i].charge);
        formula_clear(&f);
    }
}
END_TEST

START_TEST(test_the_electron_has_no_atoms)
{
    formula f = read_formula("e^-");
    ck_assert_int_eq(f.atom_count, 0);
    formula_clear(&f);
}
END_TEST

START_TEST(test_faults_have_their_place)
{
    static const struct { const char *text; int offset, length; const char *message; } cases[] = {
        {"Xx2", 0, 2, "there is no element `Xx`"},
        {"H2Zz", 2, 2, "there is no element `Zz`"},
        {"hbr", 0, 1, "an element symbol begins with a capital letter"},
        {"", 0, 1, "an element symbol is missing here"},
        {"2H2O", 0, 1, "an element symbol is missing here"},
        {"H0", 1, 1, "a count in a formula is at least 1"},
        {"C1.5", 4, 1, "an element symbol is missing here"},
        {"H1000001", 1, 7, "a count in a formula is at most 1000000"},
        {"Fe(CN6", 2, 1, "this group is not closed by `)`"},
        {"Fe(CN]6", 2, 1, "this group is not closed by `)`"},
        {"Ce^4", 2, 2, "a charge is a number and a sign"},
        {"Ce4+", 3, 1, "`+` has no meaning in a formula"},
        {"H2 O", 2, 1, "` ` has no meaning in a formula"},
        {"H^+H", 3, 1, "`H` has no meaning in a formula"},
        {"H\xCE\xB1", 1, 1, "`\xCE\xB1` has no meaning in a formula"},
        {"((((((((((((((((((((((H))))))))))))))))))))))", 20, 1, "a formula has at most 20 groups inside one another"},
        {"(((H1000000)1000000)1000000)", 2, 17, "the formula has more than 1000000000 atoms of H"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        formula f;
        formula_fault fault;
        ck_assert_msg(formula_parse(cases[i].text, &f, &fault) == LB_E_ARG, "%s", cases[i].text);
        ck_assert_str_eq(fault.message, cases[i].message);
        ck_assert_msg(fault.offset == cases[i].offset, "%s: offset %d", cases[i].text, fault.offset);
        ck_assert_msg(fault.length == cases[i].length, "%s: length %d", cases[i].text, fault.length);
        ck_assert_ptr_null(f.atoms);
    }
}
END_TEST

START_TEST(test_the_table_has_every_element_once)
{
    for (int i = 0; i < FORMULA_ELEMENTS; i++) {
        formula f = read_formula(formula_symbol(i));
        ck_assert_int_eq(f.atoms[0].element, i);
        formula_clear(&f);
    }
}
END_TEST

START_TEST(test_lack_of_memory_is_reported)
{
    formula f;
    formula_fault fault;
    memory_fail_after(0);
    lb_status status = formula_parse("H2O", &f, &fault);
    memory_fail_after(-1);
    ck_assert_int_eq(status, LB_E_NOMEM);
}
END_TEST

Suite *formula_suite(void)
{
    Suite *s = suite_create("formula");
    TCase *t = tcase_create("formula");
    tcase_add_test(t, test_atoms_are_counted);
    tcase_add_test(t, test_two_letters_are_one_element);
    tcase_add_test(t, test_groups_multiply);
    tcase_add_test(t, test_a_dot_joins_a_hydrate);
    tcase_add_test(t, test_charges_have_a_number_and_a_sign);
    tcase_add_test(t, test_the_electron_has_no_atoms);
    tcase_add_test(t, test_faults_have_their_place);
    tcase_add_test(t, test_the_table_has_every_element_once);
    tcase_add_test(t, test_lack_of_memory_is_reported);
    suite_add_tcase(s, t);
    return s;
}

/* The usual slips of typing, each with the exact words it gets: what is wrong |
 * what to write instead.  Most are read as what was meant, so that one slip is
 * one fault; the statement then stands behind the faults. */
#include <check.h>
#include <stdlib.h>
#include <string.h>

#include "parsed.h"

typedef struct slip {
    const char *text;
    size_t length;
    const char *faults;      /* one a line: line:column+length message | remedy */
    const char *statements;  /* what is read nevertheless */
} slip;

#define TEXT(literal) literal, sizeof literal - 1

static void check_slips(const slip *row, size_t count)
{
    for (size_t i = 0; i < count; i++) {
        parsed p = parsed_new(row[i].text, row[i].length);
        char *faults = parsed_faults(p.list), *statements = parsed_statements(p.tree->first);
        ck_assert_msg(strcmp(faults, row[i].faults) == 0, "\"%s\" has faults\n%s\nwanted\n%s", row[i].text, faults,
                      row[i].faults);
        ck_assert_msg(strcmp(statements, row[i].statements) == 0, "\"%s\" read as\n%s\nwanted\n%s", row[i].text,
                      statements, row[i].statements);
        free(statements);
        free(faults);
        parsed_free(&p);
    }
}

#define CHECK(rows) check_slips(rows, sizeof(rows) / sizeof *(rows))

START_TEST(test_slips_of_arrows_are_named)
{
    static const slip rows[] = {
        {TEXT("A => B"), "1:3+2 `=>` is no arrow | write `->`", "A -> B"},
        {TEXT("A ==> B"), "1:3+3 `==>` is no arrow | write `->`", "A -> B"},
        {TEXT("A --> B"), "1:3+3 `-->` is no arrow | write `->`", "A -> B"},
        {TEXT("A <=> B"), "1:3+3 `<=>` is no arrow | write `<->`", "A <-> B"},
        {TEXT("A <--> B"), "1:3+4 `<-->` is no arrow | write `<->`", "A <-> B"},
        {TEXT("A ⇄ B"), "1:3+1 `⇄` is no arrow | write `<->`", "A <-> B"},
        {TEXT("A ⟶ B"), "1:3+1 `⟶` is no arrow | write `->`", "A -> B"},
        {TEXT("A <- B"), "1:3+2 `<-` points to the left | swap the sides and write `->`", "A -> B"},
        {TEXT("A ← B"), "1:3+1 `←` points to the left | swap the sides and write `->`", "A -> B"},
        {TEXT("A -- B"), "1:3+1 `--` is no arrow | write `->`", ""},
        {TEXT("2 A = B"), "1:5+1 `=` is no arrow | write `->`, or `<->` for a reversible reaction", ""},
        {TEXT("A + B = C, k = 1"), "1:7+1 `=` is no arrow | write `->`, or `<->` for a reversible reaction", ""},
        {TEXT("(R1) A = B"), "1:8+1 `=` is no arrow | write `->`, or `<->` for a reversible reaction", ""},
        {TEXT("A = B, k = 1"),
         "1:6+1 a definition has no settings | if this is a reaction, write `->` for `=`",
         ""},
        {TEXT("A -> B -> C"), "1:8+2 a second arrow in one reaction | write each reaction on its own line", ""},
        {TEXT("A <-> B -> C"), "1:9+2 a second arrow in one reaction | write each reaction on its own line", ""},
        {TEXT("A + B"), "1:6+1 the reaction has no arrow | write `->`, or `<->` for a reversible reaction", ""},
        {TEXT("A"), "1:2+1 neither a reaction nor a definition | write `A -> B, k = ...` or `name = value`", ""},
        {TEXT("(R1) A"), "1:7+1 the reaction has no arrow | write `->`, or `<->` for a reversible reaction", ""},
        {TEXT("A + 2 B"), "1:8+1 the reaction has no arrow | write `->`, or `<->` for a reversible reaction", ""},
        {TEXT("A + B k = 1"),
         "1:7+1 a `+` or an arrow is missing before `k` | "
         "write `A + B -> C`; a name with a blank in it stands in quotes",
         ""},
    };
    CHECK(rows);
}
END_TEST

START_TEST(test_slips_of_labels_are_named)
{
    static const slip rows[] = {
        {TEXT("R1: A -> B"), "1:1+3 a label stands in parentheses, without a colon | write `(R1)`", "(R1) A -> B"},
        {TEXT("R-1 : A -> B"),
         "1:1+5 a label stands in parentheses, without a colon | write `(R-1)`",
         "(R-1) A -> B"},
        {TEXT("(R1): A -> B"), "1:5+1 a colon behind a label | leave it out", "(R1) A -> B"},
        {TEXT("R1) A -> B"), "1:3+1 `)` without `(` | write a label as `(R1)`", ""},
        {TEXT("(R 1) A -> B"),
         "1:4+1 unexpected `1` in parentheses before a reaction | "
         "a label has letters, digits and . _ + - ' * only, without blanks: `(R1)`",
         ""},
        {TEXT("(R/1) A -> B"),
         "1:1+5 a coefficient on the left is a plain number | "
         "write a number; a label in front has letters, digits and . _ + - ' * only",
         "(R/1) A -> B"},
        {TEXT("[R1] A -> B"),
         "1:6+1 unexpected `A`, expected `=` | "
         "in a reaction write species without brackets, and a label in parentheses",
         ""},
        {TEXT("(R1)"), "1:5+1 the reaction has no arrow | write `->`, or `<->` for a reversible reaction", ""},
        {TEXT("(f/2) A -> B"),
         "1:1+5 a coefficient on the left is a plain number | "
         "write a number; a label in front has letters, digits and . _ + - ' * only",
         "(f/2) A -> B"},
    };
    CHECK(rows);
}
END_TEST

START_TEST(test_slips_of_separators_are_named)
{
    static const slip rows[] = {
        {TEXT("A -> B; k = 1"), "1:7+1 `;` does not separate anything | write `,`", "A -> B, k=1"},
        {TEXT("A -> B, k = 1;"),
         "1:14+1 `;` does not separate anything | leave it out: the line's end ends a statement",
         "A -> B, k=1"},
        {TEXT("A -> B, k = 1; C -> D"),
         "1:14+1 `;` does not separate anything | write each statement on its own line",
         "A -> B, k=1\nC -> D"},
        {TEXT("; A -> B"), "1:1+1 `;` does not separate anything | write each statement on its own line", "A -> B"},
        {TEXT("x = 1;y = 2"),
         "1:6+1 `;` does not separate anything | write each statement on its own line",
         "x = 1\ny = 2"},
        {TEXT("A -> B k = 1"), "1:8+1 a comma is missing before `k` | write `, k = ...`", "A -> B, k=1"},
        {TEXT("A -> B, kf = 1 kr = 2"),
         "1:16+2 a comma is missing before `kr` | write `, kr = ...`",
         "A -> B, kf=1, kr=2"},
        {TEXT("A -> B, k = 1 M^-1 K = 2"),
         "1:20+1 a comma is missing before `K` | write `, K = ...`",
         "A -> B, k=(1_(M^(-1))), K=2"},
        {TEXT("A -> B,, k = 1"),
         "1:8+1 unexpected `,`, expected a setting | "
         "write `k = ...`, `kf = ..., kr = ...`, `kf = ..., K = ...` or `v = ...`",
         ""},
        {TEXT("A -> B, 2"),
         "1:9+1 unexpected `2`, expected a setting | "
         "write `k = ...`, `kf = ..., kr = ...`, `kf = ..., K = ...` or `v = ...`",
         ""},
        {TEXT("A -> B, k 2"), "1:11+1 unexpected `2`, expected `=` | ", ""},
        {TEXT("A -> B, k == 2"), "1:11+2 `==` defines nothing | write `=`", "A -> B, k=2"},
        {TEXT("A -> B, k = 1, "),
         "1:15+1 unexpected end of the file, expected a setting | "
         "write `k = ...`, `kf = ..., kr = ...`, `kf = ..., K = ...` or `v = ...`",
         ""},
        {TEXT("title \"a\", b"), "1:10+1 unexpected `,`, expected the end of the line | ", ""},
        {TEXT("k1: 3 s^-1"), "1:3+1 `:` defines nothing | write `=`", "k1 = (3_(s^(-1)))"},
        {TEXT("x = 1, 2"),
         "1:6+1 unexpected `,`, expected an operator, a unit, a range `in ...` or the end of the line | ",
         ""},
    };
    CHECK(rows);
}
END_TEST

START_TEST(test_slips_of_numbers_are_named)
{
    static const slip rows[] = {
        {TEXT("x = 1,5"), "1:5+3 a comma inside a number | write `1.5` with a point", "x = 1.5"},
        {TEXT("x = 1,000"), "1:5+5 a comma inside a number | write `1.000` with a point, or `1000`", "x = 1.000"},
        {TEXT("x = 1,5e3"), "1:5+5 a comma inside a number | write `1.5e3` with a point", "x = 1.5e3"},
        {TEXT("x = 1.5.2"), "1:8+2 an operator is missing before `.2` | write `*` for a product", ""},
        {TEXT("x = 1e999"),
         "1:5+5 `1e999` is too large to be held as a double | write a number below 1.8e308",
         "x = 1e999"},
        {TEXT("x = -1e999 M"),
         "1:6+5 `1e999` is too large to be held as a double | write a number below 1.8e308",
         "x = (-(1e999_M))"},
        {TEXT("x = 1e-999"),
         "1:5+6 `1e-999` is too small to be held as a double | write 0, or a number above 4.9e-324",
         "x = 1e-999"},
        {TEXT("x = 2 3"), "1:7+1 an operator is missing before `3` | write `*` for a product", ""},
        {TEXT("x = 2 [A]"), "1:7+3 an operator is missing before `[A]` | write `*` for a product", ""},
        {TEXT("x = 2 (a)"), "1:7+1 an operator is missing before `(` | write `*` for a product", ""},
        {TEXT("x = [A] [B]"), "1:9+3 an operator is missing before `[B]` | write `*` for a product", ""},
        {TEXT("x = 1 M-1 s-1"), "1:7+3 `M-1` is a subtraction, not a power of a unit | write `M^-1`\n"
         "1:11+3 `s-1` is a subtraction, not a power of a unit | write `s^-1`", "x = ((1_(M^(-1)))_(s^(-1)))"},
        {TEXT("x = 1 M s-2/s"),
         "1:9+3 `s-2` is a subtraction, not a power of a unit | write `s^-2`",
         "x = (((1_M)_(s^(-2)))/s)"},
        {TEXT("x = 5 %"), "1:7+1 unexpected character `%` (U+0025) | a comment starts with `#`", ""},
        {TEXT("x = 2*R2.k"),
         "1:9+1 unexpected character `.` (U+002E) | "
         "a constant of a reaction cannot be used by its label here: define it, `k2 = ...`, and use `k2` in both places",
         ""},
    };
    CHECK(rows);
}
END_TEST

START_TEST(test_slips_of_coefficients_are_named)
{
    static const slip rows[] = {
        {TEXT("1e3 A -> B"), "1:1+3 a coefficient has no exponent | write it without `e`", "1000 A -> B"},
        {TEXT("2E1X -> P"),
         "1:1+3 a coefficient has no exponent | write it without `e`; a species `E1X` needs a blank before it",
         "20 X -> P"},
        {TEXT("2E1 -> P"),
         "1:1+3 `2E1` is a number without a species | for a species called `E1` write `2 E1`",
         "2 E1 -> P"},
        {TEXT("1.5e-3 -> P"),
         "1:1+6 `1.5e-3` is a number without a species | write `2 X`, or `0` alone for an empty side",
         ""},
        {TEXT("5 -> P"),
         "1:1+1 `5` is a number without a species | write `2 X`, or `0` alone for an empty side",
         ""},
        {TEXT("A -> 2"),
         "1:6+1 `2` is a number without a species | write `2 X`, or `0` alone for an empty side",
         ""},
        {TEXT("2 * A -> B"),
         "1:3+1 unexpected `*`, expected a species, `->` or `<->` | write `2 X` without `*`",
         ""},
        {TEXT("A + 0 -> B"), "1:7+2 unexpected `->`, expected a species | ", ""},
        {TEXT("0 + A -> B"), "1:3+1 unexpected `+`, expected a species, `->` or `<->` | ", ""},
    };
    CHECK(rows);
}
END_TEST

START_TEST(test_slips_of_species_are_named)
{
    static const slip rows[] = {
        {TEXT("H+ + OH- -> H2O"),
         "1:4+1 unexpected `+`, expected a species | "
         "put a species whose name has more than letters and digits in quotes: `\"H+\"`, `\"Br-\"`",
         ""},
        {TEXT("A* -> B"),
         "1:2+1 unexpected `*`, expected `->`, `<->`, `=` or `+` | "
         "put a species whose name has more than letters and digits in quotes: `\"H+\"`, `\"Br-\"`",
         ""},
        {TEXT("A -> B*"),
         "1:7+1 unexpected `*`, expected `,`, `+` or the end of the line | "
         "put a species whose name has more than letters and digits in quotes: `\"H+\"`, `\"Br-\"`",
         ""},
        {TEXT("A -> Br-"),
         "1:8+1 unexpected `-`, expected `,`, `+` or the end of the line | "
         "put a species whose name has more than letters and digits in quotes: `\"H+\"`, `\"Br-\"`",
         ""},
        {TEXT("A' -> B"),
         "1:2+1 unexpected character `'` (U+0027) | "
         "names that are not plain stand in straight double quotes: `\"X'\"`",
         ""},
        {TEXT("A B -> C"),
         "1:3+1 a `+` or an arrow is missing before `B` | "
         "write `A + B -> C`; a name with a blank in it stands in quotes",
         ""},
        {TEXT("A -> B C"),
         "1:8+1 a `+` or an arrow is missing before `C` | "
         "write `A + B -> C`; a name with a blank in it stands in quotes",
         ""},
        {TEXT("A -> 2 B 2 C"),
         "1:10+1 a `+` or an arrow is missing before `2` | "
         "write `A + B -> C`; a name with a blank in it stands in quotes",
         ""},
        {TEXT("[A] + [B] -> C"),
         "1:5+1 unexpected `+`, expected `=` | in a reaction write species without brackets",
         ""},
        {TEXT("A + [B] -> C"),
         "1:5+3 `[B]` is a concentration, not a species | write the species without brackets",
         ""},
        {TEXT("A -> [B]0"),
         "1:6+4 `[B]0` is a concentration, not a species | write the species without brackets",
         ""},
        {TEXT("in -> A"), "1:1+2 `in` is reserved | write a species of that name as `\"in\"`", ""},
        {TEXT("A -> in"), "1:6+2 `in` is reserved | write a species of that name as `\"in\"`", ""},
        {TEXT("retained in"), "1:10+2 `in` is reserved | write a species of that name as `\"in\"`", ""},
        {TEXT("retained Br-"),
         "1:12+1 unexpected `-`, expected `,` or the end of the line | "
         "put a species whose name has more than letters and digits in quotes: `\"H+\"`, `\"Br-\"`",
         ""},
        {TEXT("formula H+ = H^+"),
         "1:10+1 unexpected `+`, expected `=` | "
         "put a species whose name has more than letters and digits in quotes: `\"H+\"`, `\"Br-\"`",
         ""},
        {TEXT("\"\" -> A"), "1:1+2 empty quotes name nothing | write a name between them", "\"\" -> A"},
        {TEXT("\"x\" = 3"),
         "1:5+1 a quoted name is a species and cannot be defined | "
         "write `[\"X\"] = ...` for its concentration, or a plain name for a constant",
         ""},
        {TEXT("x = \"Br\""), "1:5+4 unexpected `\"Br\"` | write `[\"Br\"]` for a concentration", ""},
        {TEXT("Öl -> A"),
         "1:1+1 unexpected character `Ö` (U+00D6) | "
         "names have the letters A to Z and Greek ones, digits and `_`; put any other name in double quotes",
         ""},
        {TEXT("“A” -> B"), "1:1+1 unexpected character `“` (U+201C) | write straight double quotes, `\"`", ""},
        {TEXT("A{2} -> B"), "1:2+1 unexpected character `{` (U+007B) | write parentheses", ""},
        {TEXT("A⁺ -> B"),
         "1:2+1 unexpected raised `⁺` | write a power as in `s^-1`; a name with such characters stands in quotes",
         ""},
        {TEXT("H₂ -> B"), "1:2+1 unexpected character `₂` (U+2082) | write plain digits: `H2O`", ""},
    };
    CHECK(rows);
}
END_TEST

START_TEST(test_slips_of_brackets_and_quotes_are_named)
{
    static const slip rows[] = {
        {TEXT("[X] 0 = 5"), "1:5+1 a blank between the bracket and `0` | write `[X]0` in one piece", ""},
        {TEXT("[X] in = 5"), "1:5+2 a blank between the bracket and `in` | write `[X]in` in one piece", ""},
        {TEXT("[X]_0 = 5"),
         "1:4+2 unexpected `_0`, expected `=` | "
         "write `[X] = ...` for a held, `[X]0 = ...` for an initial, `[X]in = ...` for a feed concentration",
         ""},
        {TEXT("[X](0) = 5"),
         "1:4+1 unexpected `(`, expected `=` | "
         "write `[X] = ...` for a held, `[X]0 = ...` for an initial, `[X]in = ...` for a feed concentration",
         ""},
        {TEXT("[X] -> Y"),
         "1:5+2 unexpected `->`, expected `=` | in a reaction write species without brackets",
         ""},
        {TEXT("[X = 5"), "1:1+6 the bracket is not closed | close it with `]`", ""},
        {TEXT("[X\n= 5"), "1:1+2 the bracket is not closed | close it with `]`\n"
         "2:1+1 unexpected `=`, expected a statement | ", ""},
        {TEXT("[] = 5"), "1:1+2 no species in the brackets | write the species between the brackets: `[X]`", ""},
        {TEXT("[ \"\" ] = 5"),
         "1:1+6 no species in the brackets | write the species between the brackets: `[X]`",
         ""},
        {TEXT("x = [A]0"),
         "1:5+4 an initial value cannot stand in an expression | give it a name: `x0 = 1 M` and `[X]0 = x0`",
         ""},
        {TEXT("x = 2*[A]0"),
         "1:7+4 an initial value cannot stand in an expression | give it a name: `x0 = 1 M` and `[X]0 = x0`",
         ""},
        {TEXT("A + \"B -> C"), "1:5+7 the quote is not closed | close it with `\"` on the same line", ""},
        {TEXT("title \"a"), "1:7+2 the quote is not closed | close it with `\"` on the same line", ""},
        {TEXT("title a"), "1:7+1 a title stands in quotes | write `title \"...\"`", ""},
        {TEXT("title"), "1:6+1 a title stands in quotes | write `title \"...\"`", ""},
        {TEXT("x = [\"A] + 1"), "1:5+1 the bracket is not closed | close it with `]`", ""},
        {TEXT("x = ]"), "1:5+1 unexpected character `]` (U+005D) | it closes no bracket", ""},
        {TEXT("d[A]/dt = 2"),
         "1:2+3 unexpected `[A]`, expected `->`, `<->`, `=` or `+` | "
         "write reactions; a rate law is `A -> B, v = ...`",
         ""},
    };
    CHECK(rows);
}
END_TEST

START_TEST(test_slips_of_parentheses_are_named)
{
    static const slip rows[] = {
        {TEXT("x = (1 + 2"),
         "1:5+1 the parenthesis is not closed | write `)`; a line that goes on ends in an operator, `,` or `(`",
         ""},
        {TEXT("x = f(1, (2 + 3)"),
         "1:6+1 the parenthesis is not closed | write `)`; a line that goes on ends in an operator, `,` or `(`",
         ""},
        {TEXT("x = 1)"), "1:6+1 `)` without `(` | ", ""},
        {TEXT("x = )"), "1:5+1 `)` without `(` | ", ""},
        {TEXT("x = ()"), "1:6+1 unexpected `)`, expected a value | ", ""},
        {TEXT("x = (1 2)"), "1:8+1 an operator is missing before `2` | write `*` for a product", ""},
        {TEXT("x = f(1 2)"), "1:9+1 an operator is missing before `2` | write `*` for a product", ""},
        {TEXT("x = f(,1)"), "1:7+1 unexpected `,`, expected a value or `)` | ", ""},
    };
    CHECK(rows);
}
END_TEST

START_TEST(test_slips_of_operators_are_named)
{
    static const slip rows[] = {
        {TEXT("x = a ** 2"), "1:7+2 `**` is no operator | write `^`", "x = (a^2)"},
        {TEXT("x = 3 − 2"), "1:7+1 `−` is no minus sign | write `-`", "x = (3-2)"},
        {TEXT("x = 1e−3"), "1:5+4 `−` is no minus sign | write `-`", "x = 1e-3"},
        {TEXT("x = 2 × 3"), "1:7+1 `×` is no multiplication sign | write `*`", "x = (2*3)"},
        {TEXT("x = 2 · 3"), "1:7+1 `·` is no multiplication sign | write `*`", "x = (2*3)"},
        {TEXT("x = 1 s⁻¹"),
         "1:8+2 unexpected raised `⁻¹` | write a power as in `s^-1`; a name with such characters stands in quotes",
         ""},
        {TEXT("x = 10⁵"),
         "1:7+1 unexpected raised `⁵` | write a power as in `s^-1`; a name with such characters stands in quotes",
         ""},
        {TEXT("+ 3"),
         "1:1+1 unexpected `+`, expected a statement | to go on from the line above, end that line with `+`",
         ""},
        {TEXT("* 2"),
         "1:1+1 unexpected `*`, expected a statement | to go on from the line above, end that line with `*`",
         ""},
        {TEXT("x = * 2"), "1:5+1 unexpected `*`, expected a value | ", ""},
        {TEXT("x = 2 *"), "1:8+1 unexpected end of the file, expected a value | ", ""},
        {TEXT("x = a ! b"), "1:7+1 unexpected character `!` (U+0021) | a comment starts with `#`", ""},
        {TEXT("// x"), "1:1+1 unexpected `/`, expected a statement | a comment starts with `#`", ""},
        {TEXT("x = 1 // x"), "1:8+1 unexpected `/`, expected a value | a comment starts with `#`", ""},
        {TEXT("/* x */"), "1:1+1 unexpected `/`, expected a statement | a comment starts with `#`", ""},
        {TEXT("% x"), "1:1+1 unexpected character `%` (U+0025) | a comment starts with `#`", ""},
        {TEXT("x = 1 & 2"), "1:7+1 unexpected character `&` (U+0026) | ", ""},
    };
    CHECK(rows);
}
END_TEST

START_TEST(test_slips_of_ranges_are_named)
{
    static const slip rows[] = {
        {TEXT("x = 2 within 5"), "1:14+1 unexpected `5` behind `within` | write `within factor 5`", ""},
        {TEXT("x = 2 within factor"), "1:20+1 unexpected end of the line, expected a number | ", ""},
        {TEXT("x = 2 within factor -3"), "1:21+1 unexpected `-`, expected a number | ", ""},
        {TEXT("x = 2 within factor a"), "1:21+1 unexpected `a`, expected a number | ", ""},
        {TEXT("x = 2 in 1, 3"),
         "1:11+1 unexpected `,`, expected an operator, a unit or `..` | write a range as `in 0.5 .. 2`",
         ""},
        {TEXT("x = 2 in 1 to 3"),
         "1:15+1 unexpected `3`, expected an operator, a unit or `..` | write a range as `in 0.5 .. 2`",
         ""},
        {TEXT("x = 2 in 1 - 3"),
         "1:15+1 unexpected end of the line, expected an operator, a unit or `..` | write a range as `in 0.5 .. 2`",
         ""},
        {TEXT("x = 2 in 1"),
         "1:11+1 unexpected end of the line, expected an operator, a unit or `..` | write a range as `in 0.5 .. 2`",
         ""},
        {TEXT("x = 2 in [1, 3]"),
         "1:16+1 unexpected end of the line, expected an operator, a unit or `..` | write a range as `in 0.5 .. 2`",
         ""},
        {TEXT("x = 2 in 1...3"), "1:11+3 `...` is no range | write two points, `a .. b`", "x = 2 R 1..3"},
        {TEXT("x = 2 in 1 … 3"), "1:12+1 `…` is no range | write two points, `a .. b`", "x = 2 R 1..3"},
        {TEXT("x = 2 in a .. 3"),
         "1:10+1 an end of a range is a plain number | write a number, with a unit or without",
         "x = 2"},
        {TEXT("x = 2 in 1 .. 2*b"),
         "1:15+3 an end of a range is a plain number | write a number, with a unit or without",
         "x = 2"},
        {TEXT("x = 2 in 1 .. 2 in 3 .. 4"),
         "1:17+2 unexpected `in`, expected an operator, a unit or the end of the line | ",
         ""},
        {TEXT("x = 2 ..3"),
         "1:7+2 unexpected `..`, expected an operator, a unit, a range `in ...` or the end of the line | "
         "write a range as `in 0.5 .. 2`",
         ""},
    };
    CHECK(rows);
}
END_TEST

START_TEST(test_slips_of_statements_are_named)
{
    static const slip rows[] = {
        {TEXT("Title \"foo\""), "1:1+5 there is no statement `Title` | did you mean `title`?", ""},
        {TEXT("unit M s"), "1:1+4 there is no statement `unit` | did you mean `units`?", ""},
        {TEXT("retain W"), "1:1+6 there is no statement `retain` | did you mean `retained`?", ""},
        {TEXT("Formula X = C"), "1:1+7 there is no statement `Formula` | did you mean `formula`?", ""},
        {TEXT("units"),
         "1:6+1 unexpected end of the line, expected a value or `none` | write `units M s`, or `units none`",
         ""},
        {TEXT("units M s, K"), "1:10+1 unexpected `,`, expected an operator, a unit or the end of the line | ", ""},
        {TEXT("units = M s\nunits -> 3"),
         "2:10+1 `3` is a number without a species | write `2 X`, or `0` alone for an empty side",
         "units = (M_s)"},
        {TEXT("retained"), "1:9+1 unexpected end of the line, expected a species | ", ""},
        {TEXT("signed A B"), "1:10+1 unexpected `B`, expected `,` or the end of the line | ", ""},
        {TEXT("formula"), "1:8+1 unexpected end of the line, expected a species | ", ""},
        {TEXT("formula X"), "1:10+1 unexpected end of the line, expected `=` | ", ""},
        {TEXT("formula X ="), "1:12+1 unexpected end of the file, expected a formula | ", ""},
        {TEXT("formula X C"), "1:11+1 unexpected `C`, expected `=` | ", ""},
        {TEXT("none\n"),
         "1:5+1 neither a reaction nor a definition | write `A -> B, k = ...` or `name = value`",
         ""},
        {TEXT("x"), "1:2+1 neither a reaction nor a definition | write `A -> B, k = ...` or `name = value`", ""},
        {TEXT("x ="), "1:4+1 unexpected end of the file, expected a value | ", ""},
        {TEXT("= 3"), "1:1+1 unexpected `=`, expected a statement | ", ""},
    };
    CHECK(rows);
}
END_TEST

START_TEST(test_bytes_that_are_no_text_are_named)
{
    static const slip rows[] = {
        {TEXT("x = 1\000 2"), "1:6+1 a NUL byte | delete it; if there are many, the file is not UTF-8 text", ""},
        {TEXT("# a\000b\000c"), "1:4+1 a NUL byte | delete it; if there are many, the file is not UTF-8 text", ""},
        {TEXT("x = \377 + 1"), "1:5+1 the byte 0xFF is not UTF-8 | save the file as UTF-8", ""},
        {TEXT("# caf\351 \351\ny = \351"), "1:6+1 the byte 0xE9 is not UTF-8 | save the file as UTF-8\n"
         "2:5+1 the byte 0xE9 is not UTF-8 | save the file as UTF-8", ""},
        {TEXT("x = 1\033[31m"), "1:6+1 a control character (U+001B) | delete it", ""},
        {TEXT("# \177"), "1:3+1 a control character (U+007F) | delete it", ""},
        {TEXT("\302\205"), "1:1+1 a control character (U+0085) | delete it", ""},
        {TEXT("\357\273\277\357\273\277x = 1"),
         "1:1+1 unexpected character `\357\273\277` (U+FEFF) | "
         "delete it: it cannot be seen, and came with pasted text",
         ""},
        {TEXT("x = a\342\200\213"),
         "1:6+1 unexpected character `\342\200\213` (U+200B) | "
         "delete it: it cannot be seen, and came with pasted text",
         ""},
    };
    CHECK(rows);
}
END_TEST

Suite *slips_suite(void);

Suite *slips_suite(void)
{
    Suite *suite = suite_create("slips");
    TCase *c = tcase_create("slips");
    tcase_add_test(c, test_slips_of_arrows_are_named);
    tcase_add_test(c, test_slips_of_labels_are_named);
    tcase_add_test(c, test_slips_of_separators_are_named);
    tcase_add_test(c, test_slips_of_numbers_are_named);
    tcase_add_test(c, test_slips_of_coefficients_are_named);
    tcase_add_test(c, test_slips_of_species_are_named);
    tcase_add_test(c, test_slips_of_brackets_and_quotes_are_named);
    tcase_add_test(c, test_slips_of_parentheses_are_named);
    tcase_add_test(c, test_slips_of_operators_are_named);
    tcase_add_test(c, test_slips_of_ranges_are_named);
    tcase_add_test(c, test_slips_of_statements_are_named);
    tcase_add_test(c, test_bytes_that_are_no_text_are_named);
    suite_add_tcase(suite, c);
    return suite;
}

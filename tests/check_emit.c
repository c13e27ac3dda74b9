/* The emitted files: bytes, names, compilers, limits.  What the functions compute is
 * compared in check_derivatives.c.
 *
 * After a wanted change of the layout, LB_UPDATE_GOLDEN=1 in the environment writes
 * tests/golden/ anew; read the difference before it is committed. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

#include "base/memory.h"
#include "emitted.h"
#include "model/network.h"
#include "random_network.h"
#include "support.h"

enum { PATH = 1024, FILE_NAME = 256 };

/* ---- Helpers -------------------------------------------------------------------- */

static void source_path(char *path, const char *file)
{
    const char *folder = getenv("LB_SOURCE_DIR");
    snprintf(path, PATH, "%s/%s", folder ? folder : ".", file);
}

static char *read_text(const char *file)
{
    char path[PATH];
    source_path(path, file);
    FILE *in = fopen(path, "rb");
    ck_assert_msg(in != NULL, "%s cannot be read", path);
    char *text = calloc(1, 1 << 20);
    ck_assert_uint_lt(fread(text, 1, (1 << 20) - 1, in), (1 << 20) - 1);
    fclose(in);
    return text;
}

static void emit_texts(const lb_network *net, const char *name, lb_text **header, lb_text **source)
{
    lb_error err = {.code = LB_OK};
    *header = lb_text_new();
    *source = lb_text_new();
    ck_assert_msg(lb_emit(net, &(lb_emit_options){.name = name}, *header, *source, &err) == LB_OK, "%s", err.message);
}

static int compile(const emitted_folder *folder, const char *compiler, const char *file, char **output)
{
    return emitted_run(folder, (const char *const[]){compiler, "-std=c99", "-O1", "-Wall", "-Wextra", "-Wpedantic",
                                                     "-Wconversion", "-Werror", "-c", file, NULL}, output);
}

static void assert_compiles(const emitted_folder *folder, const char *compiler, const char *file)
{
    char *output = NULL;
    ck_assert_msg(compile(folder, compiler, file, &output) == 0, "%s:\n%s", compiler, output);
    free(output);
}

/* ---- Golden files ------------------------------------------------------------------- */

static void compare_golden(const char *name, const char *extension, const char *text)
{
    char file[FILE_NAME];
    snprintf(file, sizeof file, "tests/golden/%s.%s", name, extension);
    if (getenv("LB_UPDATE_GOLDEN")) {
        char path[PATH];
        source_path(path, file);
        FILE *out = fopen(path, "wb");
        ck_assert(out != NULL);
        fputs(text, out);
        ck_assert_int_eq(fclose(out), 0);
        return;
    }
    char *want = read_text(file);
    ck_assert_msg(strcmp(text, want) == 0, "%s is not what is emitted now", file);
    free(want);
}

static const char *const golden[] = {"brusselator", "tank", "source", "laws"};

START_TEST(test_golden_mechanisms_are_emitted_byte_for_byte)
{
    char file[FILE_NAME];
    snprintf(file, sizeof file, "tests/golden/%s.mech", golden[_i]);
    lb_network *net = support_network_file(file);
    lb_text *header, *source;
    emit_texts(net, golden[_i], &header, &source);
    compare_golden(golden[_i], "h", lb_text_get(header, NULL));
    compare_golden(golden[_i], "c", lb_text_get(source, NULL));
    lb_text_free(header);
    lb_text_free(source);
    lb_network_free(net);
}
END_TEST

START_TEST(test_same_network_gives_same_bytes)
{
    for (uint64_t seed = 0; seed < 20; seed++) {
        lb_text *text[2][2];
        for (int i = 0; i < 2; i++) {
            lb_network *net = random_network(seed);
            emit_texts(net, "m", &text[i][0], &text[i][1]);
            lb_network_free(net);
        }
        for (int part = 0; part < 2; part++) {
            ck_assert_str_eq(lb_text_get(text[0][part], NULL), lb_text_get(text[1][part], NULL));
            lb_text_free(text[0][part]);
            lb_text_free(text[1][part]);
        }
    }
}
END_TEST

/* ---- Compilers ------------------------------------------------------------------------ */

static const char *const compilers[] = {"gcc", "clang"};

START_TEST(test_strict_compilers_have_nothing_to_say)
{
    const char *compiler = compilers[_i];
    if (!emitted_has(compiler)) {
        printf("%s is not installed: not tried\n", compiler);
        return;
    }
    emitted_folder folder = emitted_begin();
    for (uint64_t seed = 300; seed < 306; seed++) {
        lb_network *net = random_network(seed);
        emitted_write(&folder, net, "model");
        assert_compiles(&folder, compiler, "model.c");
        lb_network_free(net);
    }
    emitted_end(&folder);
}
END_TEST

START_TEST(test_networks_without_constants_or_derivatives_are_valid_c)
{
    emitted_folder folder = emitted_begin();
    lb_network *net = support_network("units none\n-> X, v = 2^0.5\n");
    ck_assert_int_eq(lb_network_constants(net), 0);
    emitted_write(&folder, net, "source");
    lb_network_free(net);
    for (size_t i = 0; i < sizeof compilers / sizeof *compilers; i++)
        if (emitted_has(compilers[i]))
            assert_compiles(&folder, compilers[i], "source.c");
    emitted_load(&folder, "-O0");
    emitted_model model = emitted_find(&folder, "source");
    double x = 7, dxdt = 0, J = 1;
    model.rhs(0, &x, NULL, &dxdt);
    model.jacobian(0, &x, NULL, &J);
    model.jacobian_sparse(0, &x, NULL, NULL);
    model.dfdk(0, &x, NULL, NULL);
    ck_assert_double_eq(dxdt, sqrt(2));
    ck_assert_double_eq(J, 0);
    emitted_end(&folder);
}
END_TEST

START_TEST(test_cplusplus_programs_link_with_the_model)
{
    if (!emitted_has("g++")) {
        printf("g++ is not installed: not tried\n");
        return;
    }
    emitted_folder folder = emitted_begin();
    lb_network *net = support_network_file("tests/golden/brusselator.mech");
    emitted_write(&folder, net, "brusselator");
    lb_network_free(net);
    emitted_write_file(&folder, "main.cc",
                       "#include \"brusselator.h\"\n"
                       "int main()\n{\n"
                       "    double dxdt[brusselator_STATES];\n"
                       "    brusselator_rhs(0, brusselator_initial, brusselator_defaults, dxdt);\n"
                       "    return dxdt[0] == -2 ? 0 : 1;\n}\n");
    char *output = NULL;
    assert_compiles(&folder, "gcc", "brusselator.c");
    ck_assert_msg(emitted_run(&folder, (const char *const[]){"g++", "-Wall", "-Wextra", "-Wpedantic", "-Wconversion",
                                                             "-Werror", "-o", "main", "main.cc", "brusselator.o",
                                                             "-lm", NULL}, &output) == 0, "%s", output);
    free(output);
    ck_assert_int_eq(emitted_run(&folder, (const char *const[]){"./main", NULL}, NULL), 0);
    emitted_end(&folder);
}
END_TEST

/* Statements of the longest function: lines of its body that end in a semicolon. */
static int longest_function(const char *source)
{
    int longest = 0, statements = 0;
    for (const char *line = source; *line; line = strchr(line, '\n') + 1) {
        size_t length = strcspn(line, "\n");
        if (line[0] == '{')
            statements = 0;
        const char *semicolon = memchr(line, ';', length);
        if (line[0] == ' ' && semicolon)
            statements++;
        if (line[0] == '}' && statements > longest)
            longest = statements;
    }
    return longest;
}

START_TEST(test_no_function_is_longer_than_some_fifty_statements)
{
    for (uint64_t seed = 0; seed < 60; seed++) {
        lb_network *net = random_network(seed);
        lb_text *header, *source;
        emit_texts(net, "m", &header, &source);
        ck_assert_int_le(longest_function(lb_text_get(source, NULL)), 60);
        lb_text_free(header);
        lb_text_free(source);
        lb_network_free(net);
    }
}
END_TEST

static void emit_lines(const lb_network *net, size_t lines, lb_text **header, lb_text **source)
{
    lb_error err = {.code = LB_OK};
    lb_emit_options options = {.name = "large", .lines = lines};
    *header = lb_text_new();
    *source = lb_text_new();
    ck_assert_msg(lb_emit(net, &options, *header, *source, &err) == LB_OK, "%s", err.message);
}

/* A function of 3000 reactions as one piece takes compilers a minute. */
START_TEST(test_three_thousand_reactions_in_lines_are_cut)
{
    lb_network *net = random_mass_action(1, 1000, 3000);
    lb_text *header, *source;
    emit_lines(net, SIZE_MAX, &header, &source);
    ck_assert_int_le(longest_function(lb_text_get(source, NULL)), 60);
    lb_text_free(header);
    lb_text_free(source);
    lb_network_free(net);
}
END_TEST

/* In lines they take minutes, however they are cut. */
START_TEST(test_thirty_thousand_reactions_compile_in_seconds)
{
    emitted_folder folder = emitted_begin();
    lb_network *net = random_mass_action(1, 10000, 30000);
    lb_text *header, *source;
    emit_lines(net, 0, &header, &source);
    ck_assert_int_le(longest_function(lb_text_get(source, NULL)), 60);
    emitted_write_file(&folder, "large.h", lb_text_get(header, NULL));
    emitted_write_file(&folder, "large.c", lb_text_get(source, NULL));
    struct timespec begin, end;
    clock_gettime(CLOCK_MONOTONIC, &begin);
    assert_compiles(&folder, "cc", "large.c");
    clock_gettime(CLOCK_MONOTONIC, &end);
    ck_assert_int_lt((int)(end.tv_sec - begin.tv_sec), 45);
    lb_text_free(header);
    lb_text_free(source);
    lb_network_free(net);
    emitted_end(&folder);
}
END_TEST

/* K/(1 + K/(1 + ...)), which is 1 at any depth when K = 2 and the innermost is 1. */
static expression deep_quotient(expression_graph *g, expression x)
{
    expression one = expression_number(g, 1), law = x;
    for (int i = 0; i < 2000; i++)
        law = expression_binary(g, EXPRESSION_DIVIDE, expression_constant(g, 0),
                                expression_binary(g, EXPRESSION_ADD, one, law));
    return law;
}

/* ln(exp(ln(exp(...)))), which is x at any depth. */
static expression deep_call(expression_graph *g, expression x)
{
    expression law = x;
    for (int i = 0; i < 1000; i++)
        law = expression_unary(g, EXPRESSION_LN, expression_unary(g, EXPRESSION_EXP, law));
    return law;
}

static lb_network *one_law(expression (*law)(expression_graph *, expression))
{
    lb_network *net = network_new();
    network_add_species(net, "X", ROLE_DYNAMIC);
    network_add_constant(net, "K", CONSTANT_NAMED, 2);
    int reaction = network_add_reaction(net, "R1", false);
    network_add_term(net, reaction, false, 0, 1, 1, EXPRESSION_NONE);
    expression rate = law(&net->graph, expression_state(&net->graph, 0));
    ck_assert_int_ge(network_add_step(net, reaction, STEP_FORWARD, rate), 0);
    ck_assert_int_eq(network_finish(net), LB_OK);
    return net;
}

/* Compilers limit the depth of parentheses (clang: 256). */
START_TEST(test_deep_rate_laws_compile)
{
    emitted_folder folder = emitted_begin();
    lb_network *net = one_law(_i ? deep_call : deep_quotient);
    emitted_write(&folder, net, "deep");
    lb_network_free(net);
    for (size_t i = 0; i < sizeof compilers / sizeof *compilers; i++)
        if (emitted_has(compilers[i]))
            assert_compiles(&folder, compilers[i], "deep.c");
    emitted_load(&folder, "-O0");
    emitted_model model = emitted_find(&folder, "deep");
    double x = 1, k = 2, v = 0;
    model.rates(0, &x, &k, &v);
    assert_close(v, 1, 1e-12, 0);
    emitted_end(&folder);
}
END_TEST

/* ---- Hostile names ----------------------------------------------------------------------- */

static const char *const hostile[] = {
    "INJECT*/ int INJECT; /*", "INJECT\?\?/\nint INJECT;", "INJECT\\", "INJECT\\\nint INJECT;", "\"INJECT\"; int INJECT;",
    "INJECT%s%n%d", "INJECT\n#error INJECT", "INJECT\xe2\x80\xae", "INJECT\xff\xfe", "\xce\xb1INJECT\xe2\x86\x92",
    "INJECT//", "/*INJECT", "*/INJECT", "INJECT\r\nint INJECT;", "\?\?/INJECT", "'INJECT'", "INJECT\t\x01\x7f",
    "#define INJECT", "INJECT\xe2\x80\xa8int INJECT;", "INJECT*\xe2\x80\x8b/",
};

enum { HOSTILE = sizeof hostile / sizeof *hostile };

/* Names that mean something to C or to <math.h>. */
static const char *const words[] = {
    "int", "double", "return", "static", "M_PI", "y0", "j1", "I", "x", "k", "t", "v", "c", "pow", "exp", "NAN",
    "main", "const", "J", "D", "values", "real_power", "power_5", "s1", "c1", "v0", "dv0_dx0", "d_a", "STATES",
};

enum { WORDS = sizeof words / sizeof *words };

/* A chain of reactions from each species to the next, all named by the list, and with
 * derived constants of the same names. */
static lb_network *chain_network(const char *const *names, int count, const char *title)
{
    lb_network *net = network_new();
    expression_graph *g = &net->graph;
    memory_free(net->title);
    net->title = memory_text(title);
    for (int i = 0; i < count; i++) {
        network_add_species(net, names[i], ROLE_DYNAMIC);
        network_add_constant(net, names[i], CONSTANT_NAMED, i + 1);
    }
    for (int i = 0; i < count; i++) {
        expression power = expression_binary(g, EXPRESSION_POWER, expression_constant(g, i), expression_number(g, 5));
        network_add_definition(net, false, names[i], power);
        int reaction = network_add_reaction(net, names[i], false);
        network_add_term(net, reaction, false, i, 1, 1, EXPRESSION_NONE);
        network_add_term(net, reaction, true, (i + 1) % count, 1, 1, EXPRESSION_NONE);
        network_add_mass_action(net, reaction, STEP_FORWARD, power);
    }
    ck_assert_int_eq(network_finish(net), LB_OK);
    return net;
}

/* The program prints each name back in hexadecimal. */
static const char print_names[] =
    "#include <stdio.h>\n#include \"model.h\"\n"
    "int main(void)\n{\n"
    "    for (int i = 0; i < model_STATES; i++) {\n"
    "        for (const char *c = model_state_names[i]; *c; c++)\n"
    "            printf(\"%02x\", (unsigned)(unsigned char)*c);\n"
    "        printf(\"\\n\");\n    }\n    return 0;\n}\n";

static void assert_names_survive(const emitted_folder *folder, const char *const *names, int count)
{
    char *output = NULL;
    emitted_write_file(folder, "main.c", print_names);
    ck_assert_int_eq(emitted_run(folder, (const char *const[]){"cc", "-std=c99", "-o", "main", "main.c", "model.c",
                                                               "-lm", NULL}, &output), 0);
    free(output);
    ck_assert_int_eq(emitted_run(folder, (const char *const[]){"./main", NULL}, &output), 0);
    const char *at = output;
    for (int i = 0; i < count; i++) {
        for (const char *c = names[i]; *c; c++, at += 2) {
            char want[3];
            snprintf(want, sizeof want, "%02x", (unsigned)(unsigned char)*c);
            ck_assert_msg(strncmp(at, want, 2) == 0, "name %d has changed", i);
        }
        ck_assert_int_eq(*at++, '\n');
    }
    free(output);
}

static void check_names(const char *const *names, int count, const char *title)
{
    lb_network *net = chain_network(names, count, title);
    lb_text *header, *source;
    emit_texts(net, "model", &header, &source);
    emitted_assert_harmless(lb_text_get(header, NULL));
    emitted_assert_harmless(lb_text_get(source, NULL));
    emitted_folder folder = emitted_begin();
    emitted_write_file(&folder, "model.h", lb_text_get(header, NULL));
    emitted_write_file(&folder, "model.c", lb_text_get(source, NULL));
    for (size_t i = 0; i < sizeof compilers / sizeof *compilers; i++)
        if (emitted_has(compilers[i]))
            assert_compiles(&folder, compilers[i], "model.c");
    assert_names_survive(&folder, names, count);
    emitted_end(&folder);
    lb_text_free(header);
    lb_text_free(source);
    lb_network_free(net);
}

START_TEST(test_hostile_names_stay_in_strings_and_comments)
{
    check_names(hostile, HOSTILE, "INJECT */ int INJECT; \?\?/\n\\\n\" \xff\xe2\x80\xae");
}
END_TEST

START_TEST(test_words_of_c_may_name_anything)
{
    check_names(words, WORDS, "");
}
END_TEST

START_TEST(test_names_of_thousands_of_characters_survive)
{
    char *name = malloc(6001);
    memset(name, 'q', 6000);
    name[6000] = '\0';
    const char *const names[] = {name, "b"};
    check_names(names, 2, name);
    free(name);
}
END_TEST

/* ---- Names of models ------------------------------------------------------------------------ */

static void assert_name(const char *path, const char *want)
{
    char *name = lb_emit_name(path);
    ck_assert_str_eq(name, want);
    lb_network *net = support_network("units none\nX ->, k = 1\n");
    lb_text *header, *source;
    emit_texts(net, name, &header, &source);
    lb_text_free(header);
    lb_text_free(source);
    lb_network_free(net);
    free(name);
}

START_TEST(test_file_names_become_identifiers)
{
    assert_name("bath.mech", "bath");
    assert_name("some/folder.x/bath_2.mech", "bath_2");
    assert_name("bath 2.mech", "bath_2");
    assert_name("archive.tar.mech", "archive_tar");
    assert_name("2bath.mech", "model_2bath");
    assert_name("int.mech", "model_int");
    assert_name("_x.mech", "model_x");
    assert_name("\xce\xb1.mech", "model");
    assert_name(".mech", "mech");
    assert_name("", "model");
    assert_name("*/ evil \"", "evil");
}
END_TEST

START_TEST(test_names_that_are_no_identifiers_are_refused)
{
    static const char *const wrong[] = {"", "2x", "a-b", "int", "_x", "a b", "x;", "\xce\xb1", NULL};
    lb_network *net = support_network("units none\nX ->, k = 1\n");
    for (size_t i = 0; i < sizeof wrong / sizeof *wrong; i++) {
        lb_text *header = lb_text_new(), *source = lb_text_new();
        lb_error err = {.code = LB_OK};
        ck_assert_int_eq(lb_emit(net, &(lb_emit_options){.name = wrong[i]}, header, source, &err), LB_E_ARG);
        ck_assert_str_ne(err.message, "");
        ck_assert_str_ne(err.remedy, "");
        ck_assert_str_eq(lb_text_get(source, NULL), "");
        lb_text_free(header);
        lb_text_free(source);
    }
    lb_network_free(net);
}
END_TEST

/* ---- Memory ------------------------------------------------------------------------------------ */

START_TEST(test_every_failing_allocation_is_reported)
{
    lb_network *net = random_network(3);
    bool finished = false;
    for (long k = 0; !finished; k++) {
        lb_text *header = lb_text_new(), *source = lb_text_new();
        lb_error err = {.code = LB_OK};
        memory_fail_after(k);
        lb_status status = lb_emit(net, &(lb_emit_options){.name = "m", .lines = _i ? 1 : 0}, header, source, &err);
        memory_fail_after(-1);
        finished = status == LB_OK;
        ck_assert(finished || (status == LB_E_NOMEM && err.code == LB_E_NOMEM));
        lb_text_free(header);
        lb_text_free(source);
    }
    lb_network_free(net);
}
END_TEST

/* ---- Documentation ---------------------------------------------------------------------------------- */

/* The n-th fenced block of a language, NULL when there is none; the caller's. */
static char *fenced(const char *text, const char *language)
{
    char fence[32];
    snprintf(fence, sizeof fence, "\n```%s\n", language);
    const char *begin = strstr(text, fence);
    ck_assert_msg(begin != NULL, "no %s block", language);
    begin += strlen(fence);
    const char *end = strstr(begin, "```\n");
    ck_assert(end != NULL);
    char *block = calloc((size_t)(end - begin) + 1, 1);
    memcpy(block, begin, (size_t)(end - begin));
    return block;
}

START_TEST(test_example_of_the_documentation_prints_what_it_says)
{
    char *text = read_text("docs/emitted-code.md");
    char *mechanism = fenced(text, "mech"), *program = fenced(text, "c"), *want = fenced(text, "text");
    emitted_folder folder = emitted_begin();
    lb_network *net = support_network(mechanism);
    emitted_write(&folder, net, "brusselator");
    emitted_write_file(&folder, "main.c", program);
    assert_compiles(&folder, "gcc", "main.c");
    char *output = NULL;
    ck_assert_int_eq(emitted_run(&folder, (const char *const[]){"cc", "-std=c99", "-O2", "-o", "main", "main.c",
                                                                "brusselator.c", "-lm", NULL}, &output), 0);
    free(output);
    ck_assert_int_eq(emitted_run(&folder, (const char *const[]){"./main", NULL}, &output), 0);
    ck_assert_str_eq(output, want);
    free(output);
    emitted_end(&folder);
    lb_network_free(net);
    free(mechanism);
    free(program);
    free(want);
    free(text);
}
END_TEST

static TCase *new_case(Suite *suite, const char *name)
{
    TCase *tcase = tcase_create(name);
    tcase_set_timeout(tcase, 120);
    suite_add_tcase(suite, tcase);
    return tcase;
}

Suite *emit_suite(void)
{
    Suite *suite = suite_create("emit");
    TCase *bytes = new_case(suite, "bytes");
    tcase_add_loop_test(bytes, test_golden_mechanisms_are_emitted_byte_for_byte, 0, 4);
    tcase_add_test(bytes, test_same_network_gives_same_bytes);
    TCase *compiling = new_case(suite, "compilers");
    tcase_add_loop_test(compiling, test_strict_compilers_have_nothing_to_say, 0, 2);
    tcase_add_test(compiling, test_networks_without_constants_or_derivatives_are_valid_c);
    tcase_add_test(compiling, test_cplusplus_programs_link_with_the_model);
    tcase_add_test(compiling, test_no_function_is_longer_than_some_fifty_statements);
    tcase_add_test(compiling, test_three_thousand_reactions_in_lines_are_cut);
    tcase_add_test(compiling, test_thirty_thousand_reactions_compile_in_seconds);
    tcase_add_loop_test(compiling, test_deep_rate_laws_compile, 0, 2);
    TCase *names = new_case(suite, "names");
    tcase_add_test(names, test_hostile_names_stay_in_strings_and_comments);
    tcase_add_test(names, test_words_of_c_may_name_anything);
    tcase_add_test(names, test_names_of_thousands_of_characters_survive);
    tcase_add_test(names, test_file_names_become_identifiers);
    tcase_add_test(names, test_names_that_are_no_identifiers_are_refused);
    TCase *other = new_case(suite, "memory and documentation");
    tcase_add_loop_test(other, test_every_failing_allocation_is_reported, 0, 2);
    tcase_add_test(other, test_example_of_the_documentation_prints_what_it_says);
    return suite;
}

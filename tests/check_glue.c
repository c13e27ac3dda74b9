/* The glue to GSL and CVODES: the example programs against `run`, sensitivities against
 * the steady state, and hostile texts in every emitted file.
 *
 * CVODES is tried only where SUNDIALS is installed, and the test says so where it is not. */
#include <math.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/memory.h"
#include "emitted.h"
#include "model/network.h"
#include "support.h"

#define STRICT "-std=c99", "-O1", "-Wall", "-Wextra", "-Wpedantic", "-Wconversion", "-Werror"
#define CVODES_LIBRARIES                                                                                        \
    "-lsundials_cvodes", "-lsundials_sunlinsolklu", "-lsundials_sunmatrixsparse", "-lsundials_nvecserial", "-lklu"
#define KLU_FOLDER "-isystem", "/usr/include/suitesparse"

/* ---- Building ---------------------------------------------------------------------- */

static void run_well(const emitted_folder *folder, const char *const argv[])
{
    char *output = NULL;
    ck_assert_msg(emitted_run(folder, argv, &output) == 0, "%s failed:\n%s", argv[0], output);
    free(output);
}

static bool has_cvodes(void)
{
    emitted_folder folder = emitted_begin();
    emitted_write_file(&folder, "try.c", "#include <cvodes/cvodes.h>\n#include <sunlinsol/sunlinsol_klu.h>\n"
                                         "int main(void) { return 0; }\n");
    bool found = emitted_run(&folder, (const char *const[]){"cc", KLU_FOLDER, "-o", "try", "try.c", CVODES_LIBRARIES,
                                                            NULL}, NULL) == 0;
    emitted_end(&folder);
    if (!found)
        printf("SUNDIALS (libsundials-dev) is not installed: CVODES is not tried\n");
    return found;
}

static void build_example(const emitted_folder *folder, lb_solver solver, const char *compiler)
{
    if (solver == LB_SOLVER_GSL)
        run_well(folder, (const char *const[]){compiler, STRICT, "-o", "main", "m_gsl_main.c", "m_gsl.c", "m.c", "-lgsl",
                                               "-lgslcblas", "-lm", NULL});
    else
        run_well(folder, (const char *const[]){compiler, STRICT, KLU_FOLDER, "-o", "main", "m_cvodes_main.c",
                                               "m_cvodes.c", "m.c", CVODES_LIBRARIES, "-lm", NULL});
}

/* ---- Against run --------------------------------------------------------------------- */

enum { ROWS = 10 };

struct course { const char *file; double until; };

static const struct course courses[] = {
    {"networks/brusselator.mech", 20}, {"networks/hires.mech", 321.8122}, {"networks/rober.mech", 1e4},
    {"networks/pollu.mech", 60}, {"networks/demo.mech", 20}, {"tests/golden/tank.mech", 100},
};

enum { COURSES = sizeof courses / sizeof *courses };

static lb_run *solve(const lb_network *net, double until, double tolerance)
{
    lb_system *system = NULL;
    lb_run *run = NULL;
    lb_error err = {.code = LB_OK};
    lb_run_options options = {.until = until, .every = until / ROWS, .tolerance = tolerance};
    ck_assert_msg(lb_system_new(net, &system, &err) == LB_OK, "%s", err.message);
    ck_assert_msg(lb_run_solve(system, &options, &run, &err) == LB_OK, "%s", err.message);
    lb_system_free(system);
    return run;
}

static double largest(const lb_run *run, int state)
{
    double most = 0;
    for (size_t row = 0; row < run->rows; row++)
        most = fmax(most, fabs(run->x[row * (size_t)run->states + (size_t)state]));
    return most;
}

/* Rows of the program's output against those of the run; bound: of the difference, in each species'
 * largest value. */
static void compare_rows(const char *output, const lb_run *run, const char *file, double bound)
{
    const char *at = strchr(output, '\n');
    ck_assert_int_eq((int)run->rows, ROWS + 1);
    for (size_t row = 0; row < run->rows; row++) {
        char *end;
        ck_assert_msg(at != NULL, "%s: row %zu is missing in\n%s", file, row, output);
        assert_close(strtod(at + 1, &end), run->t[row], 1e-12, 0);
        for (int i = 0; i < run->states; i++) {
            ck_assert_int_eq(*end, ',');
            double got = strtod(end + 1, &end), want = run->x[row * (size_t)run->states + (size_t)i];
            ck_assert_msg(fabs(got - want) <= bound * largest(run, i), "%s, row %zu, species %d: %.12g, run has %.12g",
                          file, row, i, got, want);
        }
        at = strchr(end, '\n');
    }
}

static void compare_heading(const lb_network *net, const lb_run *run, const char *output)
{
    lb_system *system = NULL;
    lb_text *csv = lb_text_new();
    ck_assert_int_eq(lb_system_new(net, &system, NULL), LB_OK);
    ck_assert_int_eq(lb_csv_run(system, run, csv), LB_OK);
    size_t length = strcspn(output, "\n");
    ck_assert_msg(strncmp(output, lb_text_get(csv, NULL), length) == 0, "heading: %.*s", (int)length, output);
    lb_text_free(csv);
    lb_system_free(system);
}

/* Both run at 1e-10: errors of single steps, which add up to some thousand times that here. */
static void compare_example(lb_solver solver, const struct course *course)
{
    char until[40], rows[40];
    snprintf(until, sizeof until, "%.17g", course->until);
    snprintf(rows, sizeof rows, "%d", ROWS);
    emitted_folder folder = emitted_begin();
    lb_network *net = support_network_file(course->file);
    lb_emit_options options = {.name = "m", .solver = solver};
    emitted_write_as(&folder, net, &options);
    emitted_write_glue(&folder, net, &options);
    build_example(&folder, solver, "cc");
    char *output = NULL;
    int status = emitted_run(&folder, (const char *const[]){"./main", until, rows, "1e-10", NULL}, &output);
    ck_assert_msg(status == 0, "%s: %s", course->file, output);
    lb_run *run = solve(net, course->until, 1e-10);
    compare_heading(net, run, output);
    compare_rows(output, run, course->file, 1e-6);
    free(output);
    lb_run_free(run);
    lb_network_free(net);
    emitted_end(&folder);
}

START_TEST(test_example_for_gsl_reproduces_run)
{
    compare_example(LB_SOLVER_GSL, &courses[_i]);
}
END_TEST

START_TEST(test_example_for_cvodes_reproduces_run)
{
    if (has_cvodes())
        compare_example(LB_SOLVER_CVODES, &courses[_i]);
}
END_TEST

/* The Brusselator with [B] = 1.7 comes to rest at (A, B/A): dX/d[B] = 0, dY/d[B] = 1, dX/d[A] = 1,
 * dY/d[A] = -1.7. */
static const char sensitivity_program[] =
    "#include <cvodes/cvodes.h>\n#include <nvector/nvector_serial.h>\n#include <sunlinsol/sunlinsol_klu.h>\n"
    "#include <sunmatrix/sunmatrix_sparse.h>\n#include <stdio.h>\n#include \"m_cvodes.h\"\n"
    "int main(void)\n{\n"
    "    SUNContext context;\n"
    "    double k[6] = {1, 1.7, 1, 1, 1, 1}, values[m_NONZEROS], dfdk[m_STATES*m_CONSTANTS], t;\n"
    "    int which[2] = {0, 1};\n"
    "    m_cvodes_model model = {k, which, values, dfdk};\n"
    "    if (m_CONSTANTS != 6 || m_STATES != 4 || SUNContext_Create(NULL, &context)) return 1;\n"
    "    N_Vector x = N_VNew_Serial(m_STATES, context), *s = N_VCloneVectorArray(2, x);\n"
    "    SUNMatrix J = SUNSparseMatrix(m_STATES, m_STATES, m_NONZEROS + m_STATES, CSC_MAT, context);\n"
    "    SUNLinearSolver linear = SUNLinSol_KLU(x, J, context);\n"
    "    void *solver = CVodeCreate(CV_BDF, context);\n"
    "    N_VConst(1.0, x);\n    N_VConst(0.0, s[0]);\n    N_VConst(0.0, s[1]);\n"
    "    if (CVodeInit(solver, m_cvodes_rhs, 0.0, x) || CVodeSetUserData(solver, &model) ||\n"
    "        CVodeSStolerances(solver, 1e-10, 1e-14) || CVodeSetLinearSolver(solver, linear, J) ||\n"
    "        CVodeSetJacFn(solver, m_cvodes_jacobian) || CVodeSetMaxNumSteps(solver, 100000) ||\n"
    "        CVodeSensInit(solver, 2, CV_SIMULTANEOUS, m_cvodes_sensitivity, s) ||\n"
    "        CVodeSensEEtolerances(solver) ||\n"
    "        CVode(solver, 200.0, x, &t, CV_NORMAL) < 0 || CVodeGetSens(solver, &t, s)) return 1;\n"
    "    for (int i = 0; i < 2; i++)\n"
    "        printf(\"%.9f %.9f\\n\", N_VGetArrayPointer(s[i])[0], N_VGetArrayPointer(s[i])[1]);\n"
    "    return 0;\n}\n";

START_TEST(test_sensitivities_of_cvodes_end_at_those_of_the_steady_state)
{
    if (!has_cvodes())
        return;
    emitted_folder folder = emitted_begin();
    lb_network *net = support_network_file("tests/golden/brusselator.mech");
    lb_emit_options options = {.name = "m", .solver = LB_SOLVER_CVODES};
    emitted_write_as(&folder, net, &options);
    emitted_write_glue(&folder, net, &options);
    emitted_write_file(&folder, "main.c", sensitivity_program);
    run_well(&folder, (const char *const[]){"cc", "-std=c99", KLU_FOLDER, "-o", "main", "main.c", "m_cvodes.c", "m.c",
                                            CVODES_LIBRARIES, "-lm", NULL});
    char *output = NULL, *end;
    ck_assert_int_eq(emitted_run(&folder, (const char *const[]){"./main", NULL}, &output), 0);
    const double want[4] = {1, -1.7, 0, 1};
    end = output;
    for (int i = 0; i < 4; i++)
        assert_close(strtod(end, &end), want[i], 0, 1e-6);
    free(output);
    lb_network_free(net);
    emitted_end(&folder);
}
END_TEST

START_TEST(test_both_compilers_and_cplusplus_take_the_glue)
{
    emitted_folder folder = emitted_begin();
    lb_network *net = support_network("units none\n-> X, v = 2^0.5\n");
    lb_emit_options options = {.name = "m"};
    for (options.solver = LB_SOLVER_GSL; options.solver <= LB_SOLVER_CVODES; options.solver++) {
        if (options.solver == LB_SOLVER_CVODES && !has_cvodes())
            break;
        emitted_write_as(&folder, net, &options);
        emitted_write_glue(&folder, net, &options);
        if (emitted_has("clang"))
            build_example(&folder, options.solver, "clang");
        build_example(&folder, options.solver, "cc");
        const char *header = options.solver == LB_SOLVER_GSL ? "m_gsl.h" : "m_cvodes.h";
        if (emitted_has("g++"))
            run_well(&folder, (const char *const[]){"g++", "-Wall", "-Wextra", "-Werror", "-fsyntax-only", "-x", "c++",
                                                    "-include", header, "/dev/null", NULL});
    }
    lb_network_free(net);
    emitted_end(&folder);
}
END_TEST

START_TEST(test_wrong_arguments_end_the_example)
{
    static const char *const wrong[] = {"-1", "0", "x", "1x", "nan", "inf", ""};
    emitted_folder folder = emitted_begin();
    lb_network *net = support_network_file("tests/golden/brusselator.mech");
    lb_emit_options options = {.name = "m", .solver = LB_SOLVER_GSL};
    emitted_write_as(&folder, net, &options);
    emitted_write_glue(&folder, net, &options);
    build_example(&folder, LB_SOLVER_GSL, "cc");
    for (size_t i = 0; i < sizeof wrong / sizeof *wrong; i++)
        ck_assert_int_eq(emitted_run(&folder, (const char *const[]){"./main", wrong[i], NULL}, NULL), 2);
    lb_network_free(net);
    emitted_end(&folder);
}
END_TEST

/* ---- Hostile texts ------------------------------------------------------------------------ */

/* What could end a comment or a string, splice a line, be a directive, a format or a placeholder. */
static const char *const pieces[] = {
    "*/", "/*", "//", "\?\?/", "\\", "'", "%s%n", "@", "$", "$p", "#error ", "#define x ", ";", "}", "{", "INJECT", "int INJECT;",
    "\xe2\x80\xae", "\xe2\x80\xa8", "\xc2\x85", "\xe2\x80\x8b", "\xf0\x9f\x92\xa3", "\xce\xb1", "*", "/", "?", "\?\?", "\t", " ",
    "__FILE__", "_Pragma(\"x\")", "0", "x[0]", "\xef\xbb\xbf", "\x7f", "\x01", "\x1b[31m", "\xff", "\xc0\xaf", "\\\n", "\r",
};

static uint64_t next_random(uint64_t *state)
{
    uint64_t z = *state += 0x9e3779b97f4a7c15u;    /* SplitMix64 */
    z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9u;
    z = (z ^ (z >> 27)) * 0x94d049bb133111ebu;
    return z ^ (z >> 31);
}

/* Pieces, and bytes of any value. */
static void hostile_text(uint64_t *state, char text[128])
{
    size_t length = 0, count = 1 + next_random(state) % 6;
    for (size_t i = 0; i < count; i++) {
        const char *piece = pieces[next_random(state) % (sizeof pieces / sizeof *pieces)];
        char byte[2] = {(char)(1 + next_random(state) % 255), '\0'};
        const char *chosen = next_random(state) % 4 ? piece : byte;
        length += (size_t)snprintf(text + length, 128 - length, "%s", chosen);
    }
}

/* Names, title, labels, units and texts of laws from such texts, beyond what the language admits. */
static lb_network *hostile_network(uint64_t *state)
{
    enum { SPECIES = 4 };
    char text[128];
    lb_network *net = network_new();
    ck_assert(net != NULL);
    hostile_text(state, text);
    memory_free(net->title);
    net->title = memory_text(text);
    for (int i = 0; i < SPECIES; i++) {
        hostile_text(state, text);
        network_add_species(net, text, ROLE_DYNAMIC);
        hostile_text(state, text);
        network_add_constant(net, text, CONSTANT_NAMED, i + 1);
        network_set_unit(&net->constants[i].unit, memory_text(text));
    }
    for (int i = 0; i < SPECIES; i++) {
        expression_graph *g = &net->graph;
        expression power = expression_binary(g, EXPRESSION_POWER, expression_constant(g, i), expression_number(g, 5));
        hostile_text(state, text);
        network_add_definition(net, false, text, power);
        hostile_text(state, text);
        int reaction = network_add_reaction(net, text, false);
        network_add_term(net, reaction, false, i, 1, 1, EXPRESSION_NONE);
        network_add_term(net, reaction, true, (i + 1) % SPECIES, 1, 1, EXPRESSION_NONE);
        network_add_mass_action(net, reaction, STEP_FORWARD, power);
    }
    ck_assert_int_eq(network_finish(net), LB_OK);
    hostile_text(state, text);
    snprintf(net->units.concentration_text, sizeof net->units.concentration_text, "%.60s", text);
    hostile_text(state, text);
    snprintf(net->units.time_text, sizeof net->units.time_text, "%.15s", text);
    net->units.none = false;
    return net;
}

/* Every file that emit can write of it, in both forms. */
static void check_hostile(const lb_network *net, uint64_t seed)
{
    lb_emit_options options = {.name = "m", .lines = seed % 2};
    lb_text *text[8];
    for (int i = 0; i < 8; i++)
        text[i] = lb_text_new();
    ck_assert_int_eq(lb_emit(net, &options, text[0], text[1], NULL), LB_OK);
    options.solver = LB_SOLVER_GSL;
    ck_assert_int_eq(lb_emit_glue(net, &options, text[2], text[3], text[4], NULL), LB_OK);
    options.solver = LB_SOLVER_CVODES;
    ck_assert_int_eq(lb_emit_glue(net, &options, text[5], text[6], text[7], NULL), LB_OK);
    for (int i = 0; i < 8; i++) {
        emitted_assert_harmless(lb_text_get(text[i], NULL));
        lb_text_free(text[i]);
    }
}

START_TEST(test_random_hostile_texts_stay_in_strings_and_comments)
{
    for (uint64_t seed = 0; seed < 1000; seed++) {
        uint64_t state = seed;
        lb_network *net = hostile_network(&state);
        check_hostile(net, seed);
        lb_network_free(net);
    }
}
END_TEST

START_TEST(test_models_with_hostile_texts_compile_and_print_them)
{
    emitted_folder folder = emitted_begin();
    for (uint64_t seed = 5000; seed < 5006; seed++) {
        uint64_t state = seed;
        lb_network *net = hostile_network(&state);
        lb_emit_options options = {.name = "m", .solver = LB_SOLVER_GSL, .lines = seed % 2};
        emitted_write_as(&folder, net, &options);
        emitted_write_glue(&folder, net, &options);
        build_example(&folder, LB_SOLVER_GSL, "cc");
        run_well(&folder, (const char *const[]){"./main", "1e-9", "1", NULL});
        lb_network_free(net);
    }
    emitted_end(&folder);
}
END_TEST

START_TEST(test_glue_without_memory_is_an_error)
{
    lb_network *net = support_network_file("tests/golden/brusselator.mech");
    lb_emit_options options = {.name = "m", .solver = LB_SOLVER_CVODES};
    bool finished = false;
    for (long k = 0; !finished; k++) {
        lb_text *text[3] = {lb_text_new(), lb_text_new(), lb_text_new()};
        memory_fail_after(k);
        lb_status status = lb_emit_glue(net, &options, text[0], text[1], text[2], NULL);
        memory_fail_after(-1);
        finished = status == LB_OK;
        ck_assert(finished || status == LB_E_NOMEM);
        for (int i = 0; i < 3; i++)
            lb_text_free(text[i]);
    }
    options.solver = LB_SOLVER_NONE;
    lb_text *text = lb_text_new();
    ck_assert_int_eq(lb_emit_glue(net, &options, text, text, text, NULL), LB_E_ARG);
    lb_text_free(text);
    lb_network_free(net);
}
END_TEST

Suite *glue_suite(void)
{
    Suite *suite = suite_create("glue");
    TCase *examples = tcase_create("examples"), *texts = tcase_create("texts");
    tcase_set_timeout(examples, 120);
    tcase_set_timeout(texts, 120);
    tcase_add_loop_test(examples, test_example_for_gsl_reproduces_run, 0, COURSES);
    tcase_add_loop_test(examples, test_example_for_cvodes_reproduces_run, 0, COURSES);
    tcase_add_test(examples, test_sensitivities_of_cvodes_end_at_those_of_the_steady_state);
    tcase_add_test(examples, test_both_compilers_and_cplusplus_take_the_glue);
    tcase_add_test(examples, test_wrong_arguments_end_the_example);
    tcase_add_test(texts, test_random_hostile_texts_stay_in_strings_and_comments);
    tcase_add_test(texts, test_models_with_hostile_texts_compile_and_print_them);
    tcase_add_test(texts, test_glue_without_memory_is_an_error);
    suite_add_tcase(suite, examples);
    suite_add_tcase(suite, texts);
    return suite;
}

/* The meaning of a mechanism file: names, numbers, dimensions, reactions, settings.
 *
 * What each fault and warning says is tested by check_language.c, example by
 * example from docs/language.md. */
#include <check.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/buffer.h"
#include "base/memory.h"
#include "model/network.h"
#include "support.h"

/* ---- Helpers -------------------------------------------------------------------- */

static const network_constant *constant_of(const lb_network *net, const char *name)
{
    int i = lb_network_find_constant(net, name);
    ck_assert_msg(i >= 0, "no constant %s", name);
    return &net->constants[i];
}

static void assert_constant(const lb_network *net, const char *name, double value, const char *in)
{
    const network_constant *c = constant_of(net, name);
    assert_close(c->value, value, 1e-15, 0);
    ck_assert_msg(strcmp(c->unit, in) == 0, "%s is in `%s`, wanted `%s`", name, c->unit, in);
}

/* A setting applied; the caller frees the network, NULL on failure. */
static lb_status set_one(const char *text, const char *name, const char *value, lb_network **net, lb_error *err)
{
    lb_setting setting = {name, value};
    lb_diagnostics *list = NULL;
    lb_status status = lb_network_parse("test.mech", text, strlen(text), &setting, 1, net, &list, err);
    lb_diagnostics_free(list);
    return status;
}

/* Every fault and warning as "line:column message\n". */
static void list_all(const char *text, buffer *out, lb_status *status)
{
    lb_network *net = NULL;
    lb_diagnostics *list = NULL;
    *status = lb_network_parse("test.mech", text, strlen(text), NULL, 0, &net, &list, NULL);
    for (size_t i = 0; i < lb_diagnostics_count(list); i++) {
        lb_diagnostic d = lb_diagnostics_get(list, i);
        buffer_printf(out, "%d:%d %s\n", d.line, d.column, d.message);
    }
    lb_network_free(net);
    lb_diagnostics_free(list);
}

static void assert_says(const char *text, lb_status want, const char *messages)
{
    buffer out;
    lb_status status;
    buffer_init(&out);
    list_all(text, &out, &status);
    ck_assert_str_eq(buffer_get(&out), messages);
    ck_assert_int_eq(status, want);
    buffer_clear(&out);
}

static double step_rate(const lb_network *net, int step, const double *x)
{
    double *k = malloc((size_t)(net->constant_count + 1) * sizeof *k);
    for (int i = 0; i < net->constant_count; i++)
        k[i] = net->constants[i].value;
    double v = expression_value(&net->graph, net->steps[step].rate, k, x);
    free(k);
    return v;
}

/* ---- A file with everything --------------------------------------------------------- */

static const char everything[] =
    "title  \"Stirred tank\"\n"
    "units  M s\n"
    "temperature = 298.15 K\n"
    "residence   = 300 s   in 60 .. 3000\n"
    "retained W\n"
    "[A]     = 1.0 M\n"
    "[B]     = 3.0 M   in 0.5 .. 5\n"
    "[\"H+\"]  = 10^(-pH) * 1 M\n"
    "[X]0    = 0.5 M\n"
    "[S]in   = 0.1 M\n"
    "pH   = 1.2\n"
    "k2   = 1.0 M^-2 s^-1   in 1e-2 .. 1e2\n"
    "k6   = 3 s^-1   within factor 5\n"
    "k5   = 0.1*k2*[A]\n"
    "Vmax = 2e-3 M/s\n"
    "Km   = 0.05 M\n"
    "f    = 1   in 0.5 .. 2\n"
    "pX   = -log10([X] / 1 M)\n"
    "formula HBr = HBr\n"
    "formula \"H+\" = H^+\n"
    "formula \"Br-\" = Br^-\n"
    "signed U\n"
    "(R1)  A -> X,                 k = 1.0 s^-1\n"
    "(R2)  2 X + Y -> 3 X,         k = k2\n"
    "(R3)  B + X <-> Y + D,        kf = 2.0 M^-1 s^-1, kr = 1e-3 M^-1 s^-1\n"
    "(R4)  X <-> W,                kf = 40 s^-1, K = 1e4\n"
    "(R5)  S -> P,                 v = Vmax*[S]/(Km + [S])\n"
    "(R6)  W -> (f/2) Y,           k = k6\n"
    "(R7)  -> X,                   k = 1e-3 M/s\n"
    "(R8)  P -> Q,                 k = arrhenius(A = 1e13 s^-1, n = 0, Ea = 80 kJ/mol)\n"
    "(R9)  HBr <-> \"H+\" + \"Br-\",   kf = 1e9 s^-1, K = 1e9 M\n"
    "(R10) 2 Y -> D,               k = k5\n"
    "(R11) -> U,                   v = ([X] - [Y])/(10 s)\n";

START_TEST(test_constants_stand_in_file_order_with_their_units)
{
    static const struct { const char *name, *unit; double value; network_constant_kind kind; } want[] = {
        {"temperature", "K", 298.15, CONSTANT_TEMPERATURE}, {"residence", "s", 300, CONSTANT_RESIDENCE},
        {"[A]", "M", 1, CONSTANT_HELD}, {"[B]", "M", 3, CONSTANT_HELD}, {"[S]in", "M", 0.1, CONSTANT_FEED},
        {"pH", "", 1.2, CONSTANT_NAMED}, {"k2", "M^-2 s^-1", 1, CONSTANT_NAMED}, {"k6", "s^-1", 3, CONSTANT_NAMED},
        {"Vmax", "M/s", 2e-3, CONSTANT_NAMED}, {"Km", "M", 0.05, CONSTANT_NAMED}, {"f", "", 1, CONSTANT_NAMED},
        {"R1.k", "s^-1", 1, CONSTANT_INLINE}, {"R3.kf", "M^-1 s^-1", 2, CONSTANT_INLINE},
        {"R3.kr", "M^-1 s^-1", 1e-3, CONSTANT_INLINE}, {"R4.kf", "s^-1", 40, CONSTANT_INLINE},
        {"R4.K", "", 1e4, CONSTANT_INLINE}, {"R7.k", "M/s", 1e-3, CONSTANT_INLINE},
        {"R8.A", "s^-1", 1e13, CONSTANT_INLINE}, {"R8.n", "", 0, CONSTANT_INLINE},
        {"R8.Ea", "J/mol", 80000, CONSTANT_INLINE}, {"R9.kf", "s^-1", 1e9, CONSTANT_INLINE},
        {"R9.K", "M", 1e9, CONSTANT_INLINE}};
    lb_network *net = support_network(everything);
    ck_assert_int_eq(net->constant_count, (int)(sizeof want / sizeof *want));
    for (int i = 0; i < net->constant_count; i++) {
        ck_assert_str_eq(net->constants[i].name, want[i].name);
        ck_assert_int_eq(net->constants[i].kind, want[i].kind);
        assert_constant(net, want[i].name, want[i].value, want[i].unit);
    }
    lb_network_free(net);
}
END_TEST

START_TEST(test_species_have_their_roles_and_the_order_of_the_reactions)
{
    static const char *const states[] = {"X", "Y", "D", "W", "S", "P", "Q", "HBr", "Br-", "U"};
    lb_network *net = support_network(everything);
    ck_assert_int_eq(lb_network_states(net), 10);
    for (int i = 0; i < 10; i++) {
        ck_assert_str_eq(lb_network_state_name(net, i), states[i]);
        ck_assert_int_eq(lb_network_find_state(net, states[i]), i);
    }
    ck_assert_int_eq(lb_network_find_state(net, "A"), -1);
    ck_assert(net->species[net->state_species[3]].is_retained);
    ck_assert(net->species[net->state_species[9]].is_signed);
    ck_assert_double_eq(net->species[net->state_species[0]].initial_value, 0.5);
    ck_assert_double_eq(net->species[net->state_species[4]].feed_value, 0.1);
    ck_assert(net->is_tank && lb_network_is_open(net));
    ck_assert_str_eq(lb_network_title(net), "Stirred tank");
    lb_network_free(net);
}
END_TEST

START_TEST(test_definitions_are_derived_constants_or_readings)
{
    lb_network *net = support_network(everything);
    ck_assert_int_eq(net->derived_count, 2);
    ck_assert_str_eq(net->derived[0].name, "[H+]");
    assert_close(net->derived[0].number, pow(10, -1.2), 1e-15, 0);
    ck_assert_str_eq(net->derived[0].unit, "M");
    ck_assert_str_eq(net->derived[1].name, "k5");
    ck_assert_str_eq(net->derived[1].unit, "M^-1 s^-1");
    assert_close(net->derived[1].number, 0.1, 1e-15, 0);
    ck_assert_int_eq(lb_network_readings(net), 1);
    ck_assert_str_eq(lb_network_reading_name(net, 0), "pX");
    lb_network_free(net);
}
END_TEST

START_TEST(test_ranges_are_logarithmic_above_zero)
{
    double low, high;
    bool logarithmic;
    lb_network *net = support_network(everything);
    ck_assert(lb_network_range(net, lb_network_find_constant(net, "k6"), &low, &high, &logarithmic));
    assert_close(low, 0.6, 1e-15, 0);
    assert_close(high, 15, 1e-15, 0);
    ck_assert(logarithmic);
    ck_assert(!lb_network_range(net, lb_network_find_constant(net, "pH"), &low, &high, &logarithmic));
    lb_network_free(net);
    net = support_network("a = 1 in -2 .. 3\nA -> B, v = a*[A]*1 s^-1\n");
    ck_assert(lb_network_range(net, 0, &low, &high, &logarithmic));
    ck_assert(low == -2 && high == 3 && !logarithmic);
    lb_network_free(net);
    net = support_network("k = 1 in 0 .. 3\nA -> B, k = k\n");
    ck_assert(lb_network_range(net, 0, &low, &high, &logarithmic));
    ck_assert(low == 0 && !logarithmic);
    lb_network_free(net);
}
END_TEST

START_TEST(test_steps_are_power_laws_where_they_can_be)
{
    lb_network *net = support_network(everything);
    ck_assert_int_eq(lb_network_steps(net), 14);
    for (int s = 0; s < 14; s++) {
        bool is_law =
            strcmp(lb_network_step_name(net, s), "R5") == 0 || strcmp(lb_network_step_name(net, s), "R11") == 0;
        ck_assert_msg(net->steps[s].is_power_law == !is_law, "%s", net->steps[s].name);
    }
    lb_network_free(net);
}
END_TEST

/* ---- Bare numbers and their dimensions ------------------------------------------------- */

START_TEST(test_bare_numbers_take_the_dimension_of_their_use)
{
    lb_network *net = support_network(
        "units mM min\n"
        "k1 = 2\nk2 = 3\nk3 = 4\nKm = 5\nVmax = 6\nk7 = 7\nhill = 2\n"
        "[E] = 1\n[A]0 = 1\n[C]in = 1\nresidence = 9\n"
        "A -> B, k = k1\n"
        "2 B -> C, k = k2*k1/k3\n"
        "C <-> A + B, kf = 1, K = 0.5\n"
        "-> A, k = 8\n"
        "A -> C, v = Vmax*[A]^hill/(Km^hill + [A]^hill)\n"
        "B -> C, v = k3*[E]*[B]\n"
        "0.5 A -> C, k = 11\n"
        "C -> A, k = k7\n");
    assert_constant(net, "k1", 2, "min^-1");
    assert_constant(net, "k3", 4, "mM^-1 min^-1");
    assert_constant(net, "k2", 3, "mM^-2 min^-1");
    assert_constant(net, "Km", 5, "mM");
    assert_constant(net, "Vmax", 6, "mM/min");
    assert_constant(net, "[E]", 1, "mM");
    assert_constant(net, "[C]in", 1, "mM");
    assert_constant(net, "residence", 9, "min");
    assert_constant(net, "R3.K", 0.5, "mM");
    assert_constant(net, "R4.k", 8, "mM/min");
    assert_constant(net, "R7.k", 11, "mM^(1/2)/min");
    assert_constant(net, "hill", 2, "");
    lb_network_free(net);
}
END_TEST

START_TEST(test_numbers_with_units_are_stored_in_the_units_of_the_file)
{
    lb_network *net = support_network(
        "units uM min\n"
        "[A]0 = 2 mM\n[E] = 3 nM\n"
        "A + E -> B, k = 5e6 M^-1 s^-1\n"
        "B -> A, k = 2 s^-1\n"
        "-> A, k = 1 mM/h\n"
        "A -> B, v = (3 M/h)*[A]/(1 mM + [A])\n");
    ck_assert_double_eq(net->species[net->state_species[0]].initial_value, 2000);
    assert_constant(net, "[E]", 0.003, "uM");
    assert_constant(net, "R1.k", 300, "uM^-1 min^-1");
    assert_constant(net, "R2.k", 120, "min^-1");
    assert_constant(net, "R3.k", 1000.0 / 60, "uM/min");
    double x[2] = {1000, 0};
    assert_close(step_rate(net, 3, x), 3e6 / 60 * 0.5, 1e-15, 0);
    lb_network_free(net);
}
END_TEST

START_TEST(test_gas_phase_units_are_known)
{
    lb_network *net = support_network(
        "units molecule/cm^3 s\n[M] = 2.5e19\n"
        "O + O2 + M -> O3 + M, k = 6e-34 cm^6/molecule^2/s\n"
        "O + O3 -> 2 O2, k = 8e-15\n[O]0 = 1e8\n[O2]0 = 5e18\n");
    assert_constant(net, "R1.k", 6e-34, "cm^6/molecule^2/s");
    assert_constant(net, "R2.k", 8e-15, "cm^3/molecule/s");
    assert_constant(net, "[M]", 2.5e19, "molecule/cm^3");
    lb_network_free(net);
}
END_TEST

START_TEST(test_units_none_checks_no_dimension)
{
    lb_network *net =
        support_network("units none\nM = 2\ns = 3\n[A]0 = 1\nA -> B, v = M*[A] + s*[A]^2 + [A]/(1 + [A])\n");
    assert_constant(net, "M", 2, "");
    double x[2] = {2, 0};
    assert_close(step_rate(net, 0, x), 4 + 12 + 2.0 / 3, 1e-15, 0);
    lb_network_free(net);
}
END_TEST

START_TEST(test_a_zero_fits_anywhere)
{
    lb_network *net =
        support_network("k = 0\n[A]0 = 0\nA -> B, v = k*([A] - 0) + 0\n[B]0 = 1\nB -> A, k = 0*k\n");
    assert_constant(net, "k", 0, "s^-1");
    lb_network_free(net);
}
END_TEST

START_TEST(test_a_conflict_names_both_uses)
{
    assert_says("k = 3\nA + B -> C, k = k\nC -> A, k = k\n", LB_E_MECHANISM,
                "3:13 `k` is used as s^-1 here and as M^-1 s^-1 in line 2\n");
}
END_TEST

START_TEST(test_dimensions_flow_through_derived_constants)
{
    assert_says(
        "a = 2\nb = a*[E]\nc = b + 3 s^-1\n[E] = 1\nA + E -> B, k = a\nB -> A, k = c\n[A]0 = 1\nA -> B, k = a\n",
        LB_E_MECHANISM, "8:13 `a` is used as s^-1 here and as M^-1 s^-1 in line 3\n");
}
END_TEST

START_TEST(test_energies_need_a_unit_and_temperatures_do_not)
{
    lb_network *net = support_network("temperature = 310\nT0 = 300\n[A]0 = 1\n"
                                      "A -> B, k = arrhenius_ref(k = 2, Tref = T0, Ea = 50 kJ/mol)\n");
    assert_constant(net, "T0", 300, "K");
    assert_constant(net, "R1.k", 2, "s^-1");
    lb_network_free(net);
    assert_says("temperature = 310\nE = 50\nA -> B, k = arrhenius(A = 1, Ea = E)\n", LB_E_MECHANISM,
                "2:5 `E` is a quantity in J/mol, and a number without a unit carries only concentration and time\n");
}
END_TEST

/* ---- Temperature laws ---------------------------------------------------------------------- */

static double rate_of_first_step(const char *text, const double *x)
{
    lb_network *net = support_network(text);
    double v = step_rate(net, 0, x);
    lb_network_free(net);
    return v;
}

START_TEST(test_arrhenius_has_its_three_parameters)
{
    double x[2] = {1, 0}, T = 350, R = 8.31446261815324;
    double want = 1e13 * pow(T, 0.5) * exp(-80000 / (R * T));
    assert_close(rate_of_first_step(
                     "temperature = 350 K\nA -> B, k = arrhenius(A = 1e13 s^-1, n = 0.5, Ea = 80 kJ/mol)\n", x),
                 want, 1e-13, 0);
    want = 1e13 * exp(-80000 / (R * T)) * 60;
    assert_close(
        rate_of_first_step(
            "units M min\ntemperature = 350 K\nA -> B, k = arrhenius(A = 1e13 s^-1, Ea = 80 kJ/mol)\n", x),
        want, 1e-13, 0);
}
END_TEST

START_TEST(test_arrhenius_ref_gives_k_at_the_reference)
{
    double x[2] = {1, 0}, R = 8.31446261815324;
    assert_close(
        rate_of_first_step(
            "temperature = 298.15\nA -> B, k = arrhenius_ref(k = 2, Tref = 298.15, Ea = 80 kJ/mol)\n", x),
        2, 1e-14, 0);
    double want = 2 * exp(-80000 / R * (1 / 350.0 - 1 / 298.15));
    assert_close(rate_of_first_step(
                     "temperature = 350\nA -> B, k = arrhenius_ref(k = 2, Tref = 298.15, Ea = 80 kJ/mol)\n", x),
                 want, 1e-12, 0);
}
END_TEST

/* kB T/h at 300 K: 1.380649e-23*300/6.62607015e-34 (SI 2019, exact). */
START_TEST(test_eyring_takes_its_standard_concentration_from_the_order)
{
    double x[3] = {2, 3, 0}, kTh = 1.380649e-23 * 300 / 6.62607015e-34, R = 8.31446261815324;
    double factor = kTh * exp(-20 / R) * exp(-50000 / (R * 300));
    assert_close(
        rate_of_first_step("temperature = 300\nA -> B, k = eyring(dH = 50 kJ/mol, dS = -20 J/mol/K)\n", x),
        factor * 2, 1e-12, 0);
    /* second order in mM and min: M^-1 s^-1 is 60/1000 mM^-1 min^-1 */
    assert_close(
        rate_of_first_step(
            "units mM min\ntemperature = 300\nA + B -> C, k = eyring(dH = 50 kJ/mol, dS = -20 J/mol/K)\n", x),
        factor * 60 / 1000 * 6, 1e-12, 0);
}
END_TEST

START_TEST(test_eyring_in_a_definition_is_first_order)
{
    assert_says("temperature = 300\nk = eyring(dH = 50 kJ/mol, dS = -20 J/mol/K)\n[A]0 = 1\n2 A -> B, k = k\n",
                LB_E_MECHANISM, "4:15 the rate constant k must be in M^-1 s^-1, but this is in s^-1\n");
    lb_network *net =
        support_network("temperature = 300\nk = eyring(dH = 50 kJ/mol, dS = -20 J/mol/K)/M\n2 A -> B, k = k\n");
    ck_assert_str_eq(net->derived[0].unit, "M^-1 s^-1");
    assert_constant(net, "k.dH", 50000, "J/mol");
    assert_constant(net, "k.dS", -20, "J/mol/K");
    lb_network_free(net);
}
END_TEST

/* ---- Reactions -------------------------------------------------------------------------------- */

START_TEST(test_unlabelled_reactions_are_numbered_past_the_written_ones)
{
    lb_network *net = support_network("A -> B, k = 1\n(R1) B -> A, k = 1\nA -> C, k = 1\n(R3) C -> A, k = 1\n");
    ck_assert_str_eq(net->reactions[0].label, "R2");
    ck_assert_str_eq(net->reactions[1].label, "R1");
    ck_assert_str_eq(net->reactions[2].label, "R4");
    ck_assert_str_eq(net->reactions[3].label, "R3");
    ck_assert_int_ge(lb_network_find_constant(net, "R4.k"), 0);
    lb_network_free(net);
}
END_TEST

START_TEST(test_names_of_numbers_inside_reactions_are_unique)
{
    lb_network *net = support_network("temperature = 300\n[A]0 = 1\n"
                                      "A -> B, k = arrhenius(A = 1, Ea = 2 J/mol) + arrhenius(A = 3, Ea = 4 J/mol)\n"
                                      "A <-> B, kf = arrhenius(A = 5, Ea = 6 J/mol), kr = 7\n");
    assert_constant(net, "R1.A", 1, "s^-1");
    assert_constant(net, "R1.A.2", 3, "s^-1");
    assert_constant(net, "R1.Ea.2", 4, "J/mol");
    assert_constant(net, "R2.kf.A", 5, "s^-1");
    assert_constant(net, "R2.kr", 7, "s^-1");
    lb_network_free(net);
}
END_TEST

START_TEST(test_coefficients_are_exact)
{
    lb_network *net = support_network("[A]0 = 1\nA + 0.1 B -> 0.3 B + 1.5 C, k = 1\n");
    const network_step *s = &net->steps[0];
    ck_assert_int_eq(s->entry_count, 3);
    ck_assert(s->entries[1].num == 1 && s->entries[1].den == 5);
    ck_assert(s->entries[2].num == 3 && s->entries[2].den == 2);
    assert_constant(net, "R1.k", 1, "M^(-1/10) s^-1");
    lb_network_free(net);
}
END_TEST

START_TEST(test_a_held_species_counts_in_the_rate_and_not_in_the_balance)
{
    lb_network *net = support_network("[A] = 3\n2 A + X -> A + 2 X, k = 5\n");
    double x[1] = {7};
    assert_close(step_rate(net, 0, x), 5 * 9 * 7, 1e-15, 0);
    ck_assert_int_eq(net->steps[0].entry_count, 1);
    ck_assert_int_eq(net->steps[0].entries[0].num, 1);
    assert_constant(net, "R1.k", 5, "M^-2 s^-1");
    lb_network_free(net);
}
END_TEST

START_TEST(test_the_reverse_constant_follows_from_the_equilibrium)
{
    lb_network *net = support_network("[A]0 = 1\nA <-> 2 B, kf = 6, K = 1.5\n");
    double x[2] = {2, 3};
    assert_close(step_rate(net, 0, x), 12, 1e-15, 0);
    assert_close(step_rate(net, 1, x), 4 * 9, 1e-15, 0);
    assert_constant(net, "R1.K", 1.5, "M");
    lb_network_free(net);
}
END_TEST

START_TEST(test_coefficients_may_be_expressions_of_constants)
{
    lb_network *net = support_network("f = 0.5\n[A]0 = 1\nA -> (f/2) B + (1 - f) A, k = 1\n");
    ck_assert_int_eq(net->reaction_count, 1);
    lb_network_free(net);
    assert_says("[A]0 = 1\nA -> ([A]/M) B, k = 1\n", LB_E_MECHANISM,
                "2:7 `[A]` changes with time, so it cannot stand in a coefficient\n");
}
END_TEST

/* Oxidation of oxalate by permanganate. */
START_TEST(test_atoms_and_charge_are_balanced)
{
    static const char species[] = "formula \"MnO4-\" = MnO4^-\nformula Ox = C2O4^2-\nformula \"H+\" = H^+\n"
                                  "formula \"Mn2+\" = Mn^2+\nformula CO2 = CO2\nformula W = H2O\nformula e = e^-\n"
                                  "[\"H+\"] = 1\n";
    char text[600];
    snprintf(text, sizeof text, "%s2 \"MnO4-\" + 5 Ox + 16 \"H+\" -> 2 \"Mn2+\" + 10 CO2 + 8 W, v = 1\n",
             species);
    lb_network *net = NULL;
    lb_diagnostics *list = NULL;
    ck_assert_int_eq(lb_network_parse("t", text, strlen(text), NULL, 0, &net, &list, NULL), LB_OK);
    lb_network_free(net);
    lb_diagnostics_free(list);
    snprintf(text, sizeof text, "%s0.4 \"MnO4-\" + Ox + 3 \"H+\" -> 0.4 \"Mn2+\" + 2 CO2 + 1.6 W, v = 1\n",
             species);
    assert_says(text, LB_E_MECHANISM,
                "9:27 `R1` is not balanced in H (3 on the left, 3.2 on the right), charge (0.6 on the left, 0.8 on the right)\n");
    snprintf(text, sizeof text, "%s\"MnO4-\" + 8 \"H+\" + 5 e -> \"Mn2+\" + 4 W, v = 1\n", species);
    ck_assert_int_eq(lb_network_parse("t", text, strlen(text), NULL, 0, &net, &list, NULL), LB_OK);
    lb_network_free(net);
    lb_diagnostics_free(list);
}
END_TEST

/* 0.1 + 0.2 is 0.3 in decimals, and is not in doubles. */
START_TEST(test_the_balance_is_exact)
{
    assert_says(
        "formula A = H\nformula B = H\nformula C = H\n[A]0 = 1\n[B]0 = 1\n[C]0 = 1\n0.1 A + 0.2 B -> 0.3 C, v = 0\nC -> C, k = 1\n",
        LB_OK, "");
    assert_says("formula A = H\nformula B = H\nformula C = H\n0.1 A + 0.2 B -> 0.300000000000001 C, v = 0\n",
                LB_E_MECHANISM, "4:15 `R1` is not balanced in H (0.3 on the left, 0.3 on the right)\n");
}
END_TEST

/* ---- Settings ------------------------------------------------------------------------------------ */

static void assert_set(const char *name, const char *value, const char *constant, double want)
{
    lb_network *net = NULL;
    lb_error err = {.code = LB_OK};
    ck_assert_msg(set_one(everything, name, value, &net, &err) == LB_OK, "%s", err.message);
    assert_close(constant_of(net, constant)->value, want, 1e-15, 0);
    lb_network_free(net);
}

START_TEST(test_settings_replace_plain_numbers)
{
    assert_set("k2", "7", "k2", 7);
    assert_set("k2", "7e6 mM^-1 M^-1 s^-1", "k2", 7e9);
    assert_set("[A]", "2 mM", "[A]", 0.002);
    assert_set("[S]in", "0", "[S]in", 0);
    assert_set("[Y]in", "3 mM", "[Y]in", 0.003);
    assert_set("residence", "1 h", "residence", 3600);
    assert_set("temperature", "310", "temperature", 310);
    assert_set("R8.Ea", "20 kcal/mol", "R8.Ea", 83680);
    assert_set("R3.kf", "500", "R3.kf", 500);
    assert_set(" k6 ", "1000", "k6", 1000);        /* outside its range: allowed */
}
END_TEST

START_TEST(test_settings_reach_what_derives_from_them)
{
    lb_network *net = NULL;
    lb_error err = {.code = LB_OK};
    ck_assert_int_eq(set_one(everything, "k2", "4", &net, &err), LB_OK);
    assert_close(net->derived[1].number, 0.4, 1e-15, 0);
    lb_network_free(net);
}
END_TEST

START_TEST(test_settings_reach_initial_concentrations)
{
    static const struct {
        const char *name;
        int state;
    } cases[] = {{"[X]0", 0}, {"[Y]0", 1}, {"[Br-]0", 8}, {"[\"Br-\"]0", 8}};
    for (int i = 0; i < 4; i++) {
        lb_network *net = NULL;
        lb_error err = {.code = LB_OK};
        ck_assert_msg(set_one(everything, cases[i].name, "20 mM", &net, &err) == LB_OK, "%s", err.message);
        ck_assert_double_eq(net->species[net->state_species[cases[i].state]].initial_value, 0.02);
        lb_network_free(net);
    }
}
END_TEST

START_TEST(test_wrong_settings_say_what_is_wrong)
{
    static const struct { const char *name, *value; lb_status status; const char *message, *remedy; } cases[] = {
        {"kk2", "1", LB_E_NAME, "nothing that can be set is called `kk2`", "did you mean `k2`?"},
        {"T", "300", LB_E_NAME, "nothing that can be set is called `T`", "write `temperature`"},
        {"X", "1", LB_E_NAME, "nothing that can be set is called `X`", "its initial concentration is `[X]0`"},
        {"k5", "1", LB_E_ARG, "`k5` cannot be set: the file derives it from `k2`, `[A]`", "set those"},
        {"[H+]", "1", LB_E_ARG, "`[H+]` cannot be set: the file derives it from `pH`", "set those"},
        {"pX", "1", LB_E_ARG, "`pX` cannot be set: the file derives it from `[X]`", "set those"},
        {"R2.k", "1", LB_E_ARG, "`R2.k` cannot be set: the file derives it from `k2`", "set those"},
        {"R4.kr", "1", LB_E_ARG, "`R4.kr` cannot be set: the file derives it from kf and K", "set those"},
        {"[A]0", "1", LB_E_ARG, "`[A]0` cannot be set: `A` is held", ""},
        {"[W]in", "1", LB_E_ARG, "`[W]in` cannot be set: `W` is retained", ""},
        {"k2", "1 s", LB_E_ARG, "`k2` cannot be set to `1 s`: the unit does not fit", "`k2` is in M^-2 s^-1"},
        {"pH", "1 s", LB_E_ARG, "`pH` cannot be set to `1 s`: the unit does not fit", "`pH` is a pure number"},
        {"k2", "-1", LB_E_ARG, "`k2` cannot be set to `-1`: a rate constant is not negative", ""},
        {"residence", "0", LB_E_ARG, "`residence` cannot be set to `0`: a residence time is positive", ""},
        {"R8.Ea", "80", LB_E_ARG, "`R8.Ea` cannot be set to `80`: a number without a unit carries only concentration and time",
         "write a unit, such as `kJ/mol`"},
        {"k2", "2*3", LB_E_ARG, "`k2` is set to `2*3`, which is no plain number", "write a number, with a unit or without"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        lb_network *net = NULL;
        lb_error err = {.code = LB_OK};
        ck_assert_int_eq(set_one(everything, cases[i].name, cases[i].value, &net, &err), cases[i].status);
        ck_assert_ptr_null(net);
        ck_assert_str_eq(err.message, cases[i].message);
        ck_assert_str_eq(err.remedy, cases[i].remedy);
    }
}
END_TEST

START_TEST(test_a_feed_needs_a_tank_in_settings_too)
{
    lb_network *net = NULL;
    lb_error err;
    ck_assert_int_eq(set_one("A -> B, k = 1\n", "[A]in", "1", &net, &err), LB_E_ARG);
    ck_assert_str_eq(err.message, "`[A]in` cannot be set: the file has no residence time");
}
END_TEST

/* ---- Times ------------------------------------------------------------------------------------------ */

START_TEST(test_times_have_the_files_unit_or_their_own)
{
    lb_network *net = support_network("units mM min\nA -> B, k = 1\n");
    double t = 0;
    lb_error err;
    ck_assert_int_eq(lb_network_time(net, "90", &t, &err), LB_OK);
    ck_assert_double_eq(t, 90);
    ck_assert_int_eq(lb_network_time(net, "1.5 h", &t, &err), LB_OK);
    ck_assert_double_eq(t, 90);
    ck_assert_int_eq(lb_network_time(net, "30 s", &t, &err), LB_OK);
    ck_assert_double_eq(t, 0.5);
    ck_assert_int_eq(lb_network_time(net, "3 M", &t, &err), LB_E_ARG);
    ck_assert_str_eq(err.message, "`3 M` is no time: the unit does not fit");
    ck_assert_int_eq(lb_network_time(net, "soon", &t, &err), LB_E_ARG);
    ck_assert_str_eq(err.message, "`soon` is no time: it is no plain number");
    lb_network_free(net);
}
END_TEST

/* ---- Faults: all of them, and each once ---------------------------------------------------------------- */

START_TEST(test_all_faults_are_reported_in_one_run)
{
    assert_says("k1 = 1 s\nA -> B, k = k1\nB -> C, k = kk\n[C]0 = -1\n0 C -> A, k = 1\n", LB_E_MECHANISM,
                "2:13 the rate constant k must be in s^-1, but this is in s\n"
                "3:13 nothing is called `kk`\n"
                "4:8 the initial concentration `[C]0` is negative\n"
                "5:1 the coefficient of `C` is zero\n");
}
END_TEST

START_TEST(test_one_mistake_gives_one_message)
{
    assert_says("a = nix\nb = a + 1\nc = b*a\n[A] = c\nA -> B, k = c\nB -> A, v = a*[B]\n", LB_E_MECHANISM,
                "1:5 nothing is called `nix`\n");
    assert_says("min = 3\nA -> B, k = min\n", LB_E_MECHANISM, "1:1 `min` is a unit and cannot be defined\n");
    assert_says("a = b\nb = a\nA -> B, k = a + b\n", LB_E_MECHANISM,
                "1:1 the definition of `a` refers to itself: a -> b -> a\n");
}
END_TEST

START_TEST(test_what_a_broken_line_defines_is_known)
{
    buffer out;
    lb_status status;
    buffer_init(&out);
    list_all("k = 3 +* 2\nA -> B, k = k\nC -> , k ==\nB -> C, v = [C]*k\n", &out, &status);
    ck_assert_int_eq(status, LB_E_MECHANISM);
    ck_assert_ptr_null(strstr(buffer_get(&out), "nothing is called"));
    ck_assert_ptr_null(strstr(buffer_get(&out), "no species"));
    buffer_clear(&out);
}
END_TEST

/* ---- Warnings about the start ------------------------------------------------------------------------------ */

START_TEST(test_what_can_be_made_is_not_warned_about)
{
    assert_says("f = 1\n[A]0 = 1\nA -> (f) B, k = 1\nB -> A, k = 1\n", LB_OK, ""); /* by an expression */
    assert_says("residence = 2\n[A]in = 1\nA -> B, k = 1\nB -> A, k = 1\n", LB_OK, ""); /* from the feed */
    assert_says("[B]0 = 1\nA -> B, v = ([A] - [B])/s\nC -> B, k = 1\nA -> C, k = 1\n", LB_OK, ""); /* backwards */
    assert_says("signed A\nA -> B, k = 1\nB -> A, k = 1\n", LB_OK, "");
    assert_says("[A] = 1\nA -> B, k = 1\nB + C -> 2 C, k = 1\nC -> B, k = 1\nB -> C, k = 1\n", LB_OK, "");
}
END_TEST

START_TEST(test_a_law_is_tried_with_all_that_is_absent_at_zero)
{
    assert_says("-> A, v = ([A] + [B])/s\n-> B, v = ([A] + [B])/s\n", LB_OK,
                "1:4 nothing that is there at the start can make `A` and `B`, so they stay zero\n");
}
END_TEST

START_TEST(test_a_rate_of_zero_makes_nothing)
{
    assert_says("[A]0 = 1\nA -> B, k = 0\nB -> A, k = 1\n", LB_OK,
                "2:6 nothing that is there at the start can make `B`, so it stays zero\n");
}
END_TEST

/* ---- Size ------------------------------------------------------------------------------------------------ */

START_TEST(test_a_chain_of_definitions_needs_no_stack)
{
    enum { LENGTH = 100000 };
    buffer text;
    buffer_init(&text);
    buffer_append(&text, "[A]0 = 1\nA -> A + A, k = a0\n");
    for (int i = 0; i < LENGTH; i++)
        buffer_printf(&text, "a%d = a%d\n", i, i + 1);
    buffer_printf(&text, "a%d = 3\n", LENGTH);
    lb_network *net = support_network(buffer_get(&text));
    char name[16];
    snprintf(name, sizeof name, "a%d", LENGTH);
    assert_constant(net, name, 3, "s^-1");
    lb_network_free(net);
    buffer_clear(&text);
}
END_TEST

START_TEST(test_a_cycle_of_many_definitions_is_found)
{
    enum { LENGTH = 100000 };
    buffer text, out;
    lb_status status;
    buffer_init(&text);
    buffer_init(&out);
    buffer_append(&text, "A -> B, k = 1\n");
    for (int i = 0; i < LENGTH; i++)
        buffer_printf(&text, "a%d = a%d\n", i, (i + 1) % LENGTH);
    list_all(buffer_get(&text), &out, &status);
    ck_assert_str_eq(buffer_get(&out),
                     "2:1 the definition of `a0` refers to itself: a0 -> a1 -> a2 -> a3 -> a4 -> a5 -> ... -> a0\n");
    buffer_clear(&text);
    buffer_clear(&out);
}
END_TEST

START_TEST(test_a_sum_of_many_terms_needs_no_stack)
{
    enum { LENGTH = 100000 };
    buffer text;
    buffer_init(&text);
    buffer_append(&text, "[A]0 = 1\nk = 2\nB -> A, k = 1\nA -> B, v = 0");
    for (int i = 0; i < LENGTH; i++)
        buffer_append(&text, " + k*[A]");
    buffer_append(&text, "\n");
    lb_network *net = support_network(buffer_get(&text));
    double x[2] = {0, 3};       /* B is met first */
    assert_close(step_rate(net, 1, x), 6.0 * LENGTH, 1e-12, 0);
    lb_network_free(net);
    buffer_clear(&text);
}
END_TEST

START_TEST(test_many_unknown_names_take_no_quadratic_time)
{
    enum { COUNT = 20000 };
    buffer text, out;
    lb_status status;
    buffer_init(&text);
    buffer_init(&out);
    for (int i = 0; i < COUNT; i++)
        buffer_printf(&text, "S%d -> P%d, k = nix%d\n", i, i, i);
    list_all(buffer_get(&text), &out, &status);
    ck_assert_int_eq(status, LB_E_MECHANISM);
    buffer_clear(&text);
    buffer_clear(&out);
}
END_TEST

/* ---- Memory ------------------------------------------------------------------------------------------------ */

static void fail_each_allocation(const char *text, const lb_setting *settings, size_t count)
{
    lb_status status = LB_E_NOMEM;
    for (long k = 0; status == LB_E_NOMEM; k++) {
        lb_network *net = NULL;
        lb_diagnostics *list = NULL;
        lb_error err;
        memory_fail_after(k);
        status = lb_network_parse("test.mech", text, strlen(text), settings, count, &net, &list, &err);
        memory_fail_after(-1);
        ck_assert_msg(status != LB_E_NOMEM || (!net && !list), "allocation %ld", k);
        lb_network_free(net);
        lb_diagnostics_free(list);
        ck_assert_int_lt(k, 100000);
    }
}

START_TEST(test_every_allocation_may_fail)
{
    lb_setting settings[] = {{"k2", "3"}, {"[Y]in", "1 mM"}};
    fail_each_allocation(everything, settings, 2);
}
END_TEST

START_TEST(test_every_allocation_may_fail_with_faults)
{
    fail_each_allocation(
        "k1 = 1 s\na = b\nb = a\nA -> B, k = k1\nB -> C, k = kk\n[C]0 = -1\n0 C -> A, k = foo(3)\n"
        "formula A = Xx\nformula B = H\nformula C = He\nC -> B, k = 3 cm3\nA -> B, v = 1 + [Q]\n",
        NULL, 0);
}
END_TEST

Suite *lower_suite(void)
{
    Suite *s = suite_create("lower");
    TCase *t = tcase_create("a whole file");
    tcase_add_test(t, test_constants_stand_in_file_order_with_their_units);
    tcase_add_test(t, test_species_have_their_roles_and_the_order_of_the_reactions);
    tcase_add_test(t, test_definitions_are_derived_constants_or_readings);
    tcase_add_test(t, test_ranges_are_logarithmic_above_zero);
    tcase_add_test(t, test_steps_are_power_laws_where_they_can_be);
    suite_add_tcase(s, t);
    t = tcase_create("dimensions");
    tcase_add_test(t, test_bare_numbers_take_the_dimension_of_their_use);
    tcase_add_test(t, test_numbers_with_units_are_stored_in_the_units_of_the_file);
    tcase_add_test(t, test_gas_phase_units_are_known);
    tcase_add_test(t, test_units_none_checks_no_dimension);
    tcase_add_test(t, test_a_zero_fits_anywhere);
    tcase_add_test(t, test_a_conflict_names_both_uses);
    tcase_add_test(t, test_dimensions_flow_through_derived_constants);
    tcase_add_test(t, test_energies_need_a_unit_and_temperatures_do_not);
    suite_add_tcase(s, t);
    t = tcase_create("temperature");
    tcase_add_test(t, test_arrhenius_has_its_three_parameters);
    tcase_add_test(t, test_arrhenius_ref_gives_k_at_the_reference);
    tcase_add_test(t, test_eyring_takes_its_standard_concentration_from_the_order);
    tcase_add_test(t, test_eyring_in_a_definition_is_first_order);
    suite_add_tcase(s, t);
    t = tcase_create("reactions");
    tcase_add_test(t, test_unlabelled_reactions_are_numbered_past_the_written_ones);
    tcase_add_test(t, test_names_of_numbers_inside_reactions_are_unique);
    tcase_add_test(t, test_coefficients_are_exact);
    tcase_add_test(t, test_a_held_species_counts_in_the_rate_and_not_in_the_balance);
    tcase_add_test(t, test_the_reverse_constant_follows_from_the_equilibrium);
    tcase_add_test(t, test_coefficients_may_be_expressions_of_constants);
    tcase_add_test(t, test_atoms_and_charge_are_balanced);
    tcase_add_test(t, test_the_balance_is_exact);
    suite_add_tcase(s, t);
    t = tcase_create("settings");
    tcase_add_test(t, test_settings_replace_plain_numbers);
    tcase_add_test(t, test_settings_reach_what_derives_from_them);
    tcase_add_test(t, test_settings_reach_initial_concentrations);
    tcase_add_test(t, test_wrong_settings_say_what_is_wrong);
    tcase_add_test(t, test_a_feed_needs_a_tank_in_settings_too);
    tcase_add_test(t, test_times_have_the_files_unit_or_their_own);
    suite_add_tcase(s, t);
    t = tcase_create("faults");
    tcase_add_test(t, test_all_faults_are_reported_in_one_run);
    tcase_add_test(t, test_one_mistake_gives_one_message);
    tcase_add_test(t, test_what_a_broken_line_defines_is_known);
    suite_add_tcase(s, t);
    t = tcase_create("warnings");
    tcase_add_test(t, test_what_can_be_made_is_not_warned_about);
    tcase_add_test(t, test_a_law_is_tried_with_all_that_is_absent_at_zero);
    tcase_add_test(t, test_a_rate_of_zero_makes_nothing);
    suite_add_tcase(s, t);
    t = tcase_create("size and memory");
    tcase_set_timeout(t, 60);
    tcase_add_test(t, test_a_chain_of_definitions_needs_no_stack);
    tcase_add_test(t, test_a_cycle_of_many_definitions_is_found);
    tcase_add_test(t, test_a_sum_of_many_terms_needs_no_stack);
    tcase_add_test(t, test_many_unknown_names_take_no_quadratic_time);
    tcase_add_test(t, test_every_allocation_may_fail);
    tcase_add_test(t, test_every_allocation_may_fail_with_faults);
    suite_add_tcase(s, t);
    return s;
}

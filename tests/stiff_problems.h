/* Published stiff test problems with their end values.
 *
 * End values: Test Set for IVP Solvers (University of Bari; F. Mazzia and
 * C. Magherini, 2008), also E. Hairer and G. Wanner, Solving Ordinary Differential
 * Equations II (1996), recomputed in 113-bit arithmetic by linearly implicit Euler
 * extrapolation at tolerance 1e-18 to 1e-20; the largest relative difference to
 * the published digits is 1.5e-13. */
#ifndef LIMBECK_TESTS_STIFF_PROBLEMS_H
#define LIMBECK_TESTS_STIFF_PROBLEMS_H

typedef struct stiff_end {
    const char *species;
    double value;
} stiff_end;

typedef struct stiff_problem {
    const char *name, *text;
    double until;
    const stiff_end *end;       /* closed by a NULL name */
} stiff_problem;

static const stiff_end rober_end[] = {
    {"A", 2.08334014970129423e-8},
    {"B", 8.3333607703347834e-14},
    {"C", 0.999999979166515169},
    {0}
};

static const stiff_end hires_end[] = {
    {"Y1", 0.000737131257332566781},
    {"Y2", 0.000144248572631618466},
    {"Y3", 0.0000588872974096757501},
    {"Y4", 0.00117565134328314915},
    {"Y5", 0.00238635619883133047},
    {"Y6", 0.00623896825274279579},
    {"Y7", 0.00284999839518576866},
    {"Y8", 0.00285000160481423134},
    {0}
};

static const stiff_end orego_end[] = {
    {"Y1", 1.00081487031852272},
    {"Y2", 1228.17852154988798},
    {"Y3", 132.055494284650829},
    {0}
};

static const stiff_end pollu_end[] = {
    {"NO2", 0.0564625548002276928}, {"NO", 0.134248413042233852},
    {"O3P", 4.13973433109942697e-9}, {"O3", 0.00552314020748435994},
    {"HO2", 2.01897726230219604e-7}, {"OH", 1.46454186349396579e-7},
    {"HCHO", 0.0778424911899796415}, {"CO", 0.324507535339601822},
    {"ALD", 0.00749401338388040555}, {"MEO2", 1.62229315730156035e-8},
    {"C2O3", 1.13586383325707482e-8}, {"CO2", 0.00223050597572135986},
    {"PAN", 0.000208716288279863004}, {"CH3O", 0.0000139692101684015772},
    {"HNO3", 0.00896488485689829418}, {"O1D", 4.35284636933010367e-18},
    {"SO2", 0.0068992196962634054}, {"SO4", 0.000100780303736594595},
    {"NO3", 1.77214651396998454e-6}, {"N2O5", 0.0000568294329231639344},
    {0}
};

/* H. H. Robertson (1966). */
#define ROBER_TEXT                                   \
    "units none\n"                                   \
    "[A]0 = 1\n"                                     \
    "A -> B, k = 0.04\n"                             \
    "2 B -> B + C, k = 3e7\n"                        \
    "B + C -> A + C, k = 1e4\n"

/* E. Schaefer, J. Math. Biol. 2 (1975) 41. */
#define HIRES_TEXT                                                  \
    "units none\n"                                                  \
    "[Y1]0 = 1\n"                                                   \
    "[Y8]0 = 0.0057\n"                                              \
    "k1 = 1.71\nk2 = 0.43\nk3 = 8.32\nk4 = 0.69\nk5 = 0.035\nk6 = 280\n" \
    "-> Y1, k = 0.0007\n"                                           \
    "Y1 <-> Y2, kf = k1, kr = k2\n"                                 \
    "Y2 -> Y4, k = k3\n"                                            \
    "Y3 -> Y1, k = k3\n"                                            \
    "Y3 <-> Y4, kf = k1, kr = k2\n"                                 \
    "Y4 -> Y6, k = k4\n"                                            \
    "Y5 -> Y3, k = k5\n"                                            \
    "Y5 <-> Y6, kf = k1, kr = k2\n"                                 \
    "Y6 + Y8 <-> Y7, kf = k6, kr = k4\n"                            \
    "Y7 -> Y5 + Y8, k = k2\n"                                       \
    "Y7 -> Y8, k = k4\n"

/* R. J. Field and R. M. Noyes, J. Chem. Phys. 60 (1974) 1877, in the scaled form
 * of the test sets. */
#define OREGO_TEXT                                                  \
    "units none\n"                                                  \
    "s = 77.27\nq = 8.375e-6\nw = 0.161\n"                          \
    "[Y1]0 = 1\n[Y2]0 = 2\n[Y3]0 = 3\n"                             \
    "-> Y1, v = s*([Y2] - [Y1]*[Y2] + [Y1] - q*[Y1]^2)\n"           \
    "-> Y2, v = (-[Y2] - [Y1]*[Y2] + [Y3])/s\n"                     \
    "-> Y3, v = w*([Y1] - [Y3])\n"

/* J. G. Verwer, SIAM J. Sci. Comput. 15 (1994) 1243. */
#define POLLU_TEXT                                                  \
    "units none\n"                                                  \
    "[NO]0 = 0.2\n[O3]0 = 0.04\n[HCHO]0 = 0.1\n[CO]0 = 0.3\n"       \
    "[ALD]0 = 0.01\n[SO2]0 = 0.007\n"                               \
    "NO2 -> NO + O3P, k = 0.35\n"                                   \
    "NO + O3 -> NO2, k = 26.6\n"                                    \
    "HO2 + NO -> NO2 + OH, k = 12300\n"                             \
    "HCHO -> 2 HO2 + CO, k = 0.00086\n"                             \
    "HCHO -> CO, k = 0.00082\n"                                     \
    "HCHO + OH -> HO2 + CO, k = 15000\n"                            \
    "ALD -> MEO2 + HO2 + CO, k = 0.00013\n"                         \
    "ALD + OH -> C2O3, k = 24000\n"                                 \
    "C2O3 + NO -> NO2 + MEO2 + CO2, k = 16500\n"                    \
    "C2O3 + NO2 -> PAN, k = 9000\n"                                 \
    "PAN -> C2O3 + NO2, k = 0.022\n"                                \
    "MEO2 + NO -> CH3O + NO2, k = 12000\n"                          \
    "CH3O -> HCHO + HO2, k = 1.88\n"                                \
    "NO2 + OH -> HNO3, k = 16300\n"                                 \
    "O3P -> O3, k = 4800000\n"                                      \
    "O3 -> O1D, k = 0.00035\n"                                      \
    "O3 -> O3P, k = 0.0175\n"                                       \
    "O1D -> 2 OH, k = 100000000\n"                                  \
    "O1D -> O3P, k = 444000000000\n"                                \
    "SO2 + OH -> SO4 + HO2, k = 1240\n"                             \
    "NO3 -> NO, k = 2.1\n"                                          \
    "NO3 -> NO2 + O3P, k = 5.78\n"                                  \
    "NO2 + O3 -> NO3, k = 0.0474\n"                                 \
    "NO3 + NO2 -> N2O5, k = 1780\n"                                 \
    "N2O5 -> NO3 + NO2, k = 3.12\n"

static const stiff_problem stiff_problems[] = {
    {"ROBER", ROBER_TEXT, 1e11, rober_end},
    {"HIRES", HIRES_TEXT, 321.8122, hires_end},
    {"OREGO", OREGO_TEXT, 360, orego_end},
    {"POLLU", POLLU_TEXT, 60, pollu_end},
};
enum { STIFF_PROBLEMS = sizeof stiff_problems / sizeof *stiff_problems };

#endif

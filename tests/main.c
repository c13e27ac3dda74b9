/* Runs all suites; names on the command line run only those.
 *
 * tests/check_NAME.c defines `Suite *NAME_suite(void)`; the list of suites is
 * made from the file names. */
#include <check.h>
#include <gsl/gsl_errno.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#define SUITE(name) Suite *name##_suite(void);
#include "suites.h"
#undef SUITE

struct entry {
    const char *name;
    Suite *(*make)(void);
};

static const struct entry entries[] = {
#define SUITE(name) {#name, name##_suite},
#include "suites.h"
#undef SUITE
};

static int is_wanted(const char *name, int argc, char **argv)
{
    for (int i = 1; i < argc; i++)
        if (strcmp(argv[i], name) == 0)
            return 1;
    return argc == 1;
}

int main(int argc, char **argv)
{
    gsl_set_error_handler_off();
    SRunner *runner = srunner_create(NULL);
    int suites = 0;
    for (size_t i = 0; i < sizeof entries / sizeof *entries; i++) {
        if (is_wanted(entries[i].name, argc, argv)) {
            srunner_add_suite(runner, entries[i].make());
            suites++;
        }
    }
    if (suites == 0) {
        fprintf(stderr, "no suite of that name\n");
        srunner_free(runner);
        return EXIT_FAILURE;
    }
    srunner_run_all(runner, CK_NORMAL);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed ? EXIT_FAILURE : EXIT_SUCCESS;
}

/* Helpers shared by the suites. */
#ifndef LIMBECK_TESTS_SUPPORT_H
#define LIMBECK_TESTS_SUPPORT_H

#include <check.h>

#include "limbeck.h"

/* |got - want| <= absolute + relative*|want|, with both printed on failure. */
#define assert_close(got, want, relative, absolute)                                              \
    do {                                                                                         \
        double got_ = (got), want_ = (want), tol_ = (absolute) + (relative) * fabs(want_);       \
        ck_assert_msg(fabs(got_ - want_) <= tol_, "%s = %.17g, wanted %.17g +- %.3g", #got, got_, \
                      want_, tol_);                                                              \
    } while (0)

/* A network from text; the test fails with the faults when there are any. */
lb_network *support_network(const char *text);
/* A network from a file below the source folder (LB_SOURCE_DIR or "."). */
lb_network *support_network_file(const char *path);

#endif

/* Two runs of one mechanism with different tolerances, row by row.
 *
 * An error of r per step grows along a run, and in an oscillation the phase drifts, so
 * a hundred times r is what a sound run may differ by.  The 5 % keep a run with the
 * loosest tolerance from passing with a pulse that is missing. */
#include "analysis/run_compare.h"

#include <math.h>
#include <stddef.h>

#define ALLOWED_GROWTH 100
#define ALLOWED_DIFFERENCE 0.05

const char *const run_failed_text = "with a looser tolerance the integration failed";
const char *const run_differed_text = "a looser tolerance changed the time course";

bool run_agree(const lb_run *loose, const lb_run *tight)
{
    if (loose->rows != tight->rows)
        return false;
    double allowed = fmin(ALLOWED_GROWTH * loose->tolerance, ALLOWED_DIFFERENCE);
    size_t n = (size_t)tight->states;
    for (size_t i = 0; i < n; i++) {
        double largest = 0, difference = 0;
        for (size_t row = 0; row < tight->rows; row++) {
            largest = fmax(largest, fabs(tight->x[row * n + i]));
            difference = fmax(difference, fabs(tight->x[row * n + i] - loose->x[row * n + i]));
        }
        if (difference > allowed * largest)
            return false;
    }
    return true;
}

/* Poincare section: where it lies, and how well returns to it repeat. */
#ifndef LIMBECK_ANALYSIS_SECTION_H
#define LIMBECK_ANALYSIS_SECTION_H

#include "analysis/integrate.h"
#include "analysis/space.h"
#include "limbeck.h"

/* Most loops that a closed orbit may take before it closes. */
#define SECTION_LOOPS 16

typedef struct section_return {
    double t;
    double *x;                    /* [n] */
    double *low, *high;           /* [n] range of the loop that ended here */
} section_return;

typedef struct section {
    int n;
    bool is_placed;
    int state;                    /* the species whose rising crossing of the level is a return */
    double level;
    double *weight;               /* [n] */
    double *low, *high;           /* [n] range since the last return */
    section_return ring[SECTION_LOOPS + 1];
    double *loops_low, *loops_high; /* [n] scratch: range of several loops */
    size_t returns;               /* since it was placed */
    double *block;
} section;

lb_status section_init(section *c, int n, lb_error *err);
void section_clear(section *c);

/* Lay the section through the middle of the range [low, high] of one species; old
 * returns are forgotten. */
void section_place(section *c, int state, double low, double high);

/* Take note of the integrator's last step; returned: it crossed the section. */
lb_status section_watch(section *c, integrator *it, bool *returned, lb_error *err);

/* The least number of loops after which the newest return repeats an older one
 * within `threshold` amplitudes; 0 when none does.  scale [n] is scratch. */
int section_repeats(section *c, const space *s, double threshold, double *scale);

/* The return `back` loops before the newest (0: the newest itself). */
const section_return *section_back(const section *c, size_t back);

#endif

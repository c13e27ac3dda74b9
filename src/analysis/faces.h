/* Faces that trajectories cannot leave: sets of species that stay zero. */
#ifndef LIMBECK_ANALYSIS_FACES_H
#define LIMBECK_ANALYSIS_FACES_H

#include <stdbool.h>

#include "limbeck.h"
#include "system/system.h"

/* Sets of states, each [n], that are zero on a face. */
typedef struct faces {
    int n;
    int count;
    size_t capacity;
    bool **is_zero;         /* [count] each [n]; owned */
    bool is_complete;       /* false: the search hit its limit */
} faces;

void faces_init(faces *f, int n);
void faces_clear(faces *f);
/* Add a copy of a set; nothing happens when it is there already. */
lb_status faces_add(faces *f, const bool *is_zero, lb_error *err);

/* Minimal siphons of the network that is left on the face is_zero [n], each
 * joined with that face, are added to out.  A siphon: every step that is alive
 * and changes one of its species has a rate that vanishes with one of them. */
lb_status faces_find(lb_evaluator *evaluator, const bool *is_zero, faces *out, lb_error *err);

#endif

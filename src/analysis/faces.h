/* Faces that trajectories cannot leave: sets of species that stay zero. */
#ifndef LIMBECK_ANALYSIS_FACES_H
#define LIMBECK_ANALYSIS_FACES_H

#include <stdbool.h>

#include "analysis/equations.h"
#include "limbeck.h"

/* Sets of states, each [n], that are zero on a face. */
typedef struct faces {
    int n;
    int count;
    size_t capacity;
    bool **is_zero;         /* [count] each [n]; owned */
    bool is_complete;       /* false: a limit was hit, there are more */
} faces;

void faces_init(faces *f, int n);
void faces_clear(faces *f);
/* Add a copy of a set; nothing happens when it is there already. */
lb_status faces_add(faces *f, const bool *is_zero, lb_error *err);

/* Siphons of the network that is left on the face is_zero [n], whose equations are
 * eq, each joined with that face, are added to out: every siphon there contains
 * one of them.  A siphon: every step that is alive and changes one of its species
 * has a rate that vanishes with one of them.
 * must_vanish [steps] (NULL: nothing): only siphons on which a certain one of those
 * steps is dead; nothing is added when none can be. */
lb_status faces_find(equations *eq, const bool *is_zero, const bool *must_vanish, faces *out, lb_error *err);

#endif

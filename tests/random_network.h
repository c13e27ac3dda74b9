/* Random networks for tests of the system and of emitted C: the same seed gives
 * the same network, through the builder of model/network.h. */
#ifndef LIMBECK_TESTS_RANDOM_NETWORK_H
#define LIMBECK_TESTS_RANDOM_NETWORK_H

#include <stdint.h>

#include "model/network.h"

/* 2-60 species with mass action (orders 0-3, coefficients 0.5, 1, 2, 3), power laws with
 * orders that are not whole, Michaelis-Menten, Hill, inhibition, exp(-E/(R T)), logarithm and
 * root laws, held species, derived constants, product coefficients of constants, and in
 * every third a tank with feeds and retained species.  The caller's; NULL without memory. */
lb_network *random_network(uint64_t seed);

/* A network of mass action alone, of the given size, each reaction with up to two
 * reactants and two products. */
lb_network *random_mass_action(uint64_t seed, int species, int reactions);

/* Concentrations x [n] between 0.05 and 5, on a log scale. */
void random_state(uint64_t seed, int n, double *x);

#endif

/* What a caller of the library may ask of a network. */
#include <string.h>

#include "model/network.h"

const char *lb_network_title(const lb_network *network)
{
    return network->title;
}

int lb_network_states(const lb_network *network)
{
    return network->states;
}

int lb_network_constants(const lb_network *network)
{
    return network->constant_count;
}

int lb_network_steps(const lb_network *network)
{
    return network->reaction_steps;
}

int lb_network_readings(const lb_network *network)
{
    return network->reading_count;
}

bool lb_network_is_open(const lb_network *network)
{
    return network->is_open;
}

const char *lb_network_state_name(const lb_network *network, int state)
{
    return network->species[network->state_species[state]].name;
}

const char *lb_network_constant_name(const lb_network *network, int constant)
{
    return network->constants[constant].name;
}

const char *lb_network_step_name(const lb_network *network, int step)
{
    return network->steps[step].name;
}

const char *lb_network_reading_name(const lb_network *network, int reading)
{
    return network->readings[reading].name;
}

int lb_network_find_state(const lb_network *network, const char *name)
{
    for (int i = 0; i < network->states; i++)
        if (strcmp(lb_network_state_name(network, i), name) == 0)
            return i;
    return -1;
}

int lb_network_find_constant(const lb_network *network, const char *name)
{
    for (int i = 0; i < network->constant_count; i++)
        if (strcmp(network->constants[i].name, name) == 0)
            return i;
    return -1;
}

double lb_network_default(const lb_network *network, int constant)
{
    return network->constants[constant].value;
}

bool lb_network_range(const lb_network *network, int constant, double *low, double *high, bool *logarithmic)
{
    const network_constant *c = &network->constants[constant];
    if (!c->has_range)
        return false;
    *low = c->low;
    *high = c->high;
    *logarithmic = c->is_logarithmic;
    return true;
}

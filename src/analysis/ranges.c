/* The search for a cycle within the ranges of the file.
 *
 * Points of a low-discrepancy sequence in the box of the constants (on a log scale
 * where the file says so) and of the initial concentrations that have a range.  At
 * each the steady states are found from few starts and screened by their
 * eigenvalues; only where one is unstable a trajectory is followed from beside it.
 * Nothing depends on the clock but where a limit of seconds ends the search. */
#include "analysis/ranges.h"

#include <math.h>
#include <string.h>
#include <time.h>

#include "analysis/sample.h"
#include "base/memory.h"
#include "base/status.h"
#include "model/network.h"

enum {
    DEFAULT_SAMPLES = 400,
    SAMPLE_STARTS = 6,            /* of the search for steady states */
    SAMPLE_RETURNS = 400,
    SAMPLE_STEPS = 40000
};

/* One coordinate of the box. */
typedef struct side {
    int constant;                 /* or -1 */
    int state;                    /* whose initial value it is, or -1 */
    double low, high;
    bool is_logarithmic;
} side;

typedef struct box {
    const lb_network *net;
    side *sides;
    int count;
    double *point;                /* [count] */
    double *k;                    /* [m] */
    double *x0;                   /* [n] */
} box;

bool ranges_exist(const lb_network *net)
{
    for (int i = 0; i < net->constant_count; i++)
        if (net->constants[i].has_range)
            return true;
    for (int i = 0; i < net->states; i++)
        if (net->species[net->state_species[i]].has_initial_range)
            return true;
    return false;
}

double ranges_clock(void)
{
    struct timespec now;
    clock_gettime(CLOCK_MONOTONIC, &now);
    return (double)now.tv_sec + 1e-9 * (double)now.tv_nsec;
}

static lb_status box_init(box *b, const lb_network *net, lb_error *err)
{
    memset(b, 0, sizeof *b);
    b->net = net;
    size_t most = (size_t)net->constant_count + (size_t)net->states;
    b->sides = memory_array(most, sizeof *b->sides);
    b->point = memory_array(most, sizeof *b->point);
    b->k = memory_array((size_t)net->constant_count, sizeof *b->k);
    b->x0 = memory_array((size_t)net->states, sizeof *b->x0);
    if (!b->sides || !b->point || !b->k || !b->x0)
        return status_no_memory(err);
    for (int i = 0; i < net->constant_count; i++) {
        const network_constant *c = &net->constants[i];
        if (c->has_range)
            b->sides[b->count++] = (side){i, -1, c->low, c->high, c->is_logarithmic};
    }
    for (int i = 0; i < net->states; i++) {
        const network_species *s = &net->species[net->state_species[i]];
        if (s->has_initial_range)
            b->sides[b->count++] = (side){-1, i, s->initial_low, s->initial_high, s->initial_low > 0};
    }
    return LB_OK;
}

static void box_clear(box *b)
{
    memory_free(b->sides);
    memory_free(b->point);
    memory_free(b->k);
    memory_free(b->x0);
}

static double side_value(const side *s, double u)
{
    double value = s->is_logarithmic ? s->low * pow(s->high / s->low, u) : s->low + u * (s->high - s->low);
    return fmin(fmax(value, s->low), s->high);
}

/* Bind sample i (0: the file's own values) and give its initial state; LB_E_ARG when
 * a rate constant comes out wrong there. */
static lb_status box_bind(box *b, lb_evaluator *evaluator, uint64_t seed, uint64_t i, lb_error *err)
{
    for (int j = 0; j < b->net->constant_count; j++)
        b->k[j] = b->net->constants[j].value;
    if (i > 0)
        sample_point(seed, i, b->count, b->point);
    for (int j = 0; i > 0 && j < b->count; j++)
        if (b->sides[j].constant >= 0)
            b->k[b->sides[j].constant] = side_value(&b->sides[j], b->point[j]);
    lb_status status = lb_evaluator_bind(evaluator, b->k, err);
    if (status != LB_OK)
        return status;
    lb_initial(evaluator, b->x0);
    for (int j = 0; i > 0 && j < b->count; j++)
        if (b->sides[j].state >= 0)
            b->x0[b->sides[j].state] = side_value(&b->sides[j], b->point[j]);
    return LB_OK;
}

static lb_status search_sample(hunt *h, box *b, const lb_oscillate_options *options, uint64_t i, lb_error *err)
{
    lb_steady *steady = NULL;
    lb_steady_options how = {.starts = SAMPLE_STARTS, .seed = options->seed, .x0 = b->x0, .k = b->k,
                             .skip_boundary = true, .monitor = options->monitor};
    lb_status status = lb_steady_solve(evaluator_system(h->evaluator), &how, &steady, err);
    if (status != LB_OK)
        return status;
    h->answer->steady += steady->count;
    for (size_t j = 0; j < steady->count; j++)
        h->answer->unstable += steady->state[j].stable == LB_NO;
    if (i == 0)
        status = hunt_from(h, b->x0, false, err);
    if (status == LB_OK && h->answer->verdict == LB_NOT_FOUND)
        status = hunt_near_states(h, steady, b->x0, err);
    lb_steady_free(steady);
    return status;
}

static bool should_stop(const lb_oscillate_options *options, double deadline)
{
    const lb_monitor *monitor = options->monitor;
    return (deadline > 0 && ranges_clock() > deadline) ||
           (monitor && monitor->stop && monitor->stop(monitor->context));
}

lb_status ranges_search(hunt *h, const lb_oscillate_options *options, double deadline, lb_error *err)
{
    box b;
    const lb_monitor *monitor = options->monitor;
    size_t samples = options->samples ? options->samples : DEFAULT_SAMPLES;
    h->options.max_returns = SAMPLE_RETURNS;
    h->options.max_steps = SAMPLE_STEPS;
    lb_status status = box_init(&b, evaluator_system(h->evaluator)->network, err);
    for (size_t i = 0; i < samples && status == LB_OK && h->answer->verdict == LB_NOT_FOUND; i++) {
        if (should_stop(options, deadline)) {
            h->answer->interrupted = true;
            break;
        }
        if (monitor && monitor->progress)
            monitor->progress(monitor->context, "searching the ranges", (double)i / (double)samples);
        status = box_bind(&b, h->evaluator, options->seed, i, err);
        if (status == LB_OK)
            status = search_sample(h, &b, options, i, err);
        else if (status == LB_E_ARG)
            status = LB_OK;
        h->answer->samples++;
    }
    box_clear(&b);
    return status;
}

/* Building one JSON object; jansson is known to the json files alone.
 *
 * A writer remembers the first failure, so that a chain of calls is checked
 * once, by json_finish. */
#ifndef LIMBECK_OUTPUT_JSON_H
#define LIMBECK_OUTPUT_JSON_H

#include <jansson.h>

#include "limbeck.h"
#include "model/network.h"

typedef struct json_writer {
    json_t *root;
    bool failed;            /* memory was short somewhere */
} json_writer;

/* Start an object with the keys that all have: limbeck, command, file, warnings. */
void json_begin(json_writer *w, const char *command, const char *file, const lb_diagnostics *diagnostics);
/* Write the object to out, ending in a newline, and free it. */
lb_status json_finish(json_writer *w, lb_text *out);

/* Each takes `value` and gives it to the container; NULL marks the failure. */
void json_put(json_writer *w, json_t *object, const char *key, json_t *value);
void json_add(json_writer *w, json_t *array, json_t *value);

/* New values.  A number that is not finite is null; text that is not UTF-8 gets
 * U+FFFD in place of each byte that does not fit. */
json_t *json_number(double value);
json_t *json_count(size_t value);
json_t *json_text(const char *text);
json_t *json_complex(lb_complex value);                    /* [re, im] */
json_t *json_answer(lb_answer answer);                     /* true, false, null */

/* species: value over the states of the network. */
json_t *json_states(json_writer *w, const lb_network *net, const double *x);
/* Names of the states with flag[state]. */
json_t *json_flagged(json_writer *w, const lb_network *net, const bool *flag);

/* The keys of `error`, also beside what a failed command has to show. */
void json_put_error(json_writer *w, const lb_error *error, const lb_diagnostics *diagnostics);

/* The keys of the engine that evaluated the system. */
void json_put_engine(json_writer *w, const lb_system *system);

/* The keys of each command, put into the root object. */
void json_put_check(json_writer *w, const lb_network *net);
void json_put_steady(json_writer *w, const lb_system *system, const lb_steady *steady);
void json_put_oscillate(json_writer *w, const lb_system *system, const lb_oscillate *oscillate);

#endif

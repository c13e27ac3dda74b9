/* Fuzz target: any bytes as a mechanism, through every stage that reads it:
 * network, texts, JSON, emitted C, system, one evaluation.
 *
 * Built like fuzz_parse.c.  Besides the sanitizers' checks: faults and success
 * exclude each other, and what was read can be written. */
#include <assert.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>

#include "limbeck.h"

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size);

enum { MOST_STATES = 200 };  /* beyond, an evaluation tells nothing new */

static void evaluate(const lb_network *network)
{
    lb_system *system = NULL;
    lb_evaluator *evaluator = NULL;
    lb_error error;
    size_t n = (size_t)lb_network_states(network);
    if (n > MOST_STATES || lb_system_new(network, &system, &error) != LB_OK)
        return;
    if (lb_evaluator_new(system, &evaluator, &error) == LB_OK && lb_evaluator_bind(evaluator, NULL, &error) == LB_OK) {
        double *x = calloc(2 * n + n * n + 1, sizeof *x);
        if (!x)
            abort();
        lb_initial(evaluator, x);
        lb_rhs(evaluator, x, x + n);
        lb_jacobian(evaluator, x, x + 2 * n);
        free(x);
    }
    lb_evaluator_free(evaluator);
    lb_system_free(system);
}

static void write_all(const lb_network *network, const lb_diagnostics *list)
{
    lb_layout layout = {80, false};
    lb_emit_options options = {.name = "fuzz"};
    lb_error error;
    lb_text *page = lb_text_new(), *json = lb_text_new(), *header = lb_text_new(), *code = lb_text_new();
    if (!page || !json || !header || !code)
        abort();
    assert(lb_text_check(network, &layout, page) == LB_OK);
    assert(lb_json_check(network, list, json) == LB_OK);
    lb_emit(network, &options, header, code, &error);
    lb_text_free(page);
    lb_text_free(json);
    lb_text_free(header);
    lb_text_free(code);
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    lb_network *network;
    lb_diagnostics *list;
    lb_error error;
    lb_status status = lb_network_parse("fuzz.mech", (const char *)data, size, NULL, 0, &network, &list, &error);
    assert(list && (status == LB_OK || status == LB_E_MECHANISM));
    assert((status == LB_OK) == (network != NULL) && (status == LB_OK) == (lb_diagnostics_faults(list) == 0));
    if (network) {
        write_all(network, list);
        evaluate(network);
    }
    lb_text *shown = lb_text_new();
    assert(shown && lb_diagnostics_write(list, false, shown) == LB_OK);
    lb_text_free(shown);
    lb_network_free(network);
    lb_diagnostics_free(list);
    return 0;
}

#ifdef FUZZ_MAIN
int main(int count, char **arguments)
{
    FILE *in = count > 1 ? fopen(arguments[1], "rb") : stdin;
    static uint8_t data[1 << 24];
    if (!in)
        return 1;
    LLVMFuzzerTestOneInput(data, fread(data, 1, sizeof data, in));
    return 0;
}
#endif

/* Straight-line programs over the nodes of an expression graph.
 *
 * A node's number is its register.  Registers of constants alone are filled once
 * when constants are bound, by a program of their own; the others hold only what
 * changes with the state, so that one evaluation is one pass over the code. */
#include "system/program.h"

#include <math.h>

#include "base/memory.h"

lb_status program_compile(const expression_graph *g, const expression *roots, size_t count, program *out)
{
    *out = (program){0};
    if (count == 0)
        return LB_OK;
    unsigned char *needed = memory_zeroed(g->count, 1);
    if (!needed)
        return LB_E_NOMEM;
    for (size_t i = 0; i < count; i++)
        expression_mark(g, roots[i], needed);
    size_t length = 0;
    for (size_t e = 0; e < g->count; e++)
        length += needed[e] && g->nodes[e].has_state;
    out->code = memory_array(length, sizeof *out->code);
    for (size_t e = 0; out->code && e < g->count; e++) {
        const expression_node *node = &g->nodes[e];
        if (needed[e] && node->has_state)
            out->code[out->count++] = (instruction){node->kind, (int)e, node->left, node->right};
    }
    memory_free(needed);
    return out->code ? LB_OK : LB_E_NOMEM;
}

lb_status program_compile_constants(const expression_graph *g, program *out)
{
    *out = (program){.code = memory_array(g->count, sizeof *out->code)};
    for (size_t e = 0; out->code && e < g->count; e++) {
        const expression_node *node = &g->nodes[e];
        if (!node->has_state && node->kind != EXPRESSION_NUMBER)
            out->code[out->count++] = (instruction){node->kind, (int)e, node->left, node->right};
    }
    return out->code ? LB_OK : LB_E_NOMEM;
}

void program_clear(program *p)
{
    memory_free(p->code);
    *p = (program){0};
}

void program_run(const program *p, const double *leaves, double *values)
{
    for (size_t i = 0; i < p->count; i++) {
        const instruction *code = &p->code[i];
        const int left = code->left;
        double *out = &values[code->out];
        switch (code->kind) {
        case EXPRESSION_NUMBER:
        case EXPRESSION_SQRT:      break; /* never in a program */
        case EXPRESSION_CONSTANT:
        case EXPRESSION_STATE:     *out = leaves[left]; break;
        case EXPRESSION_ADD:       *out = values[left] + values[code->right]; break;
        case EXPRESSION_SUBTRACT:  *out = values[left] - values[code->right]; break;
        case EXPRESSION_MULTIPLY:  *out = values[left] * values[code->right]; break;
        case EXPRESSION_DIVIDE:    *out = values[left] / values[code->right]; break;
        case EXPRESSION_NEGATE:    *out = -values[left]; break;
        case EXPRESSION_POWER:     *out = expression_power(values[left], values[code->right]); break;
        case EXPRESSION_SLOPE:     *out = expression_slope(values[left], values[code->right]); break;
        case EXPRESSION_POWER_LOG: *out = expression_power_log(values[left], values[code->right]); break;
        case EXPRESSION_EXP:       *out = exp(values[left]); break;
        case EXPRESSION_LN:        *out = log(values[left]); break;
        case EXPRESSION_LOG10:     *out = log10(values[left]); break;
        }
    }
}

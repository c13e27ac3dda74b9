/* The functions of an emitted file, from their sums. */
#ifndef LIMBECK_EMIT_FUNCTION_H
#define LIMBECK_EMIT_FUNCTION_H

#include "emit/listing.h"
#include "emit/sums.h"
#include "emit/write.h"

/* Unless told otherwise, a function whose sums have more terms than this runs over tables. */
enum { FUNCTION_LINES = 3000 };

/* What the functions of one file have in common. */
typedef struct function_file {
    const lb_network *net;
    const char *name;                    /* prefix */
    size_t lines;                        /* terms of a function without tables */
    expression_graph graph;              /* the network's and the derivatives */
    sums_pattern pattern;
    char **definition_name;              /* local names of derived constants, then of readings */
    int *definition;                     /* [definition_count] node -> definition, or -1 */
    size_t definition_count;
    writer writer;
    listing listing;
    buffer code;                         /* the functions so far */
} function_file;

/* Append one public function with the static functions that it needs. */
lb_status function_rates(function_file *file);
lb_status function_rhs(function_file *file);
lb_status function_jacobians(function_file *file);   /* dense and sparse */
lb_status function_dfdk(function_file *file);

#endif

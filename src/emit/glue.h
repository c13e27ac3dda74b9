/* Glue between emitted C and the solvers of a library: their texts, and how they are filled in. */
#ifndef LIMBECK_EMIT_GLUE_H
#define LIMBECK_EMIT_GLUE_H

/* In a template `@` stands for the model's name, `$c` for its unit of concentration and `$t`
 * for its unit of time, both as C strings, `$i` and `$p` for what the examples have in common
 * (the standard headers; reading arguments and printing), and `$$` for a dollar sign.  Head
 * comments are begun by who fills in the template. */
typedef struct glue_template {
    const char *solver;      /* "gsl": of NAME_gsl.h, NAME_gsl.c and NAME_gsl_main.c */
    const char *header, *source, *example;
} glue_template;

extern const glue_template glue_gsl, glue_cvodes;

#endif

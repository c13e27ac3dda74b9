#!/bin/sh
# The demo: from a mechanism file to the one-page answer and to an emitted model,
# compiled and run.
#   sh networks/demo.sh BUILD
set -eu
build=$1
folder=$build/demo
rm -rf "$folder"
mkdir -p "$folder"

say() { printf '\n$ %s\n\n' "$*"; "$@"; }

say "$build/limbeck" networks/demo.mech
say "$build/limbeck" emit networks/demo.mech -o "$folder"

cat > "$folder/main.c" <<'C'
/* Explicit fourth-order Runge-Kutta steps with the emitted right-hand side. */
#include <stdio.h>
#include <string.h>
#include "demo.h"

int main(void)
{
    double x[demo_STATES], a[demo_STATES], b[demo_STATES], c[demo_STATES], d[demo_STATES], y[demo_STATES];
    const double h = 1e-3;
    const long steps = 60000, row = 5000;
    memcpy(x, demo_initial, sizeof x);
    printf("%8s", "min");
    for (int i = 0; i < demo_STATES; i++)
        printf("%12s", demo_state_names[i]);
    printf("\n");
    for (long s = 0; s <= steps; s++) {
        if (s % row == 0) {
            printf("%8.1f", (double)s * h);
            for (int i = 0; i < demo_STATES; i++)
                printf("%12.6f", x[i]);
            printf("\n");
        }
        demo_rhs(0, x, demo_defaults, a);
        for (int i = 0; i < demo_STATES; i++) y[i] = x[i] + h / 2 * a[i];
        demo_rhs(0, y, demo_defaults, b);
        for (int i = 0; i < demo_STATES; i++) y[i] = x[i] + h / 2 * b[i];
        demo_rhs(0, y, demo_defaults, c);
        for (int i = 0; i < demo_STATES; i++) y[i] = x[i] + h * c[i];
        demo_rhs(0, y, demo_defaults, d);
        for (int i = 0; i < demo_STATES; i++) x[i] += h / 6 * (a[i] + 2 * b[i] + 2 * c[i] + d[i]);
    }
    return 0;
}
C
say "${CC:-cc}" -std=c99 -O2 -Wall -Wextra -o "$folder/demo" "$folder/main.c" "$folder/demo.c" -lm
say "$folder/demo"

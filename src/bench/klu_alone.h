/*
 * klu_alone.h: KLU without this program: what refactoring and solving cost by themselves.
 */
#ifndef BENCH_KLU_ALONE_H
#define BENCH_KLU_ALONE_H

#include <klu.h>
#include <stdbool.h>

#include "numerics/pattern.h"

struct klu_alone {
    struct pattern pattern; /* a copy; its arrays are borrowed */
    klu_common common;
    klu_symbolic *symbolic;
    klu_numeric *numeric;
};

/* Analyses and factors once, with the settings of numerics/linear_klu.c. False when that fails; the
 * caller ends with klu_alone_close in any case. */
bool klu_alone_open(struct klu_alone *alone, const struct pattern *pattern, double *values);
void klu_alone_close(struct klu_alone *alone);

/* klu_refactor and klu_solve; b in: right side, out: solution. */
bool klu_alone_run(struct klu_alone *alone, double *values, double *b);

#endif

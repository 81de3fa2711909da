/*
 * klu_alone.c: klu_refactor and klu_solve by themselves.
 */
#include "bench/klu_alone.h"

enum { SCALE_BY_ROW_MAXIMUM = 2 };

bool klu_alone_open(struct klu_alone *alone, const struct pattern *pattern, double *values)
{
    alone->pattern = *pattern;
    klu_defaults(&alone->common);
    alone->common.btf = 1;
    alone->common.scale = SCALE_BY_ROW_MAXIMUM;
    alone->symbolic = klu_analyze(pattern->n, pattern->start, pattern->row, &alone->common);
    if (alone->symbolic == NULL) {
        return false;
    }
    alone->numeric =
        klu_factor(pattern->start, pattern->row, values, alone->symbolic, &alone->common);
    return alone->numeric != NULL;
}

void klu_alone_close(struct klu_alone *alone)
{
    klu_free_numeric(&alone->numeric, &alone->common);
    klu_free_symbolic(&alone->symbolic, &alone->common);
}

bool klu_alone_run(struct klu_alone *alone, double *values, double *b)
{
    return klu_refactor(alone->pattern.start, alone->pattern.row, values, alone->symbolic,
                        alone->numeric, &alone->common) &&
           klu_solve(alone->symbolic, alone->numeric, alone->pattern.n, 1, b, &alone->common);
}

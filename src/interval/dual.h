/*
 * dual.h: a range with the ranges of its derivatives: forward automatic differentiation (Griewank
 * and Walther 2008, chapter 3) in interval arithmetic.
 *
 * Every function takes the number of derivatives that are carried; `out` may be an operand.
 */
#ifndef INTERVAL_DUAL_H
#define INTERVAL_DUAL_H

#include "interval/interval.h"

enum { DUAL_LIMIT = 16 };

struct dual {
    struct interval v;
    struct interval d[DUAL_LIMIT];
};

void dual_constant(struct dual *out, struct interval value, int count);
void dual_variable(struct dual *out, struct interval value, int which, int count);

/* out = f(u) with the ranges of f and f' given. */
void dual_chain(struct dual *out, struct interval value, struct interval slope,
                const struct dual *u, int count);
/* out = f(u, w) with the ranges of f and both partial derivatives given. */
void dual_chain2(struct dual *out, struct interval value, struct interval by_u,
                 const struct dual *u, struct interval by_w, const struct dual *w, int count);
void dual_product(struct dual *out, const struct dual *u, const struct dual *w, int count);
void dual_quotient(struct dual *out, const struct dual *u, const struct dual *w, int count);

#endif

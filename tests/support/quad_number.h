/*
 * quad_number.h: quadruple precision and dual numbers over it (a value with its exact derivatives;
 * forward mode of Griewank and Walther 2008, chapter 3).
 *
 * The mathematical functions are those of libquadmath, declared here because its header is only
 * on the search path of one compiler.
 */
#ifndef SUPPORT_QUAD_NUMBER_H
#define SUPPORT_QUAD_NUMBER_H

#include <stdbool.h>

__extension__ typedef __float128 quad;

extern quad expq(quad);
extern quad logq(quad);
extern quad sqrtq(quad);
extern quad powq(quad, quad);
extern quad tanhq(quad);
extern quad fabsq(quad);

enum { DUAL_LIMIT = 18 };

struct dual {
    quad v;
    int n; /* derivatives in use; the rest are zero */
    quad d[DUAL_LIMIT];
};

static inline bool quad_finite(quad x)
{
    return x - x == 0;
}

/* A number that does not depend on any unknown. */
static inline struct dual constant(quad v)
{
    struct dual r;
    r.v = v;
    r.n = 0;
    return r;
}

/* Unknown k of n. */
static inline struct dual unknown(quad v, int k, int n)
{
    struct dual r;
    r.v = v;
    r.n = n;
    for (int j = 0; j < n; j++) {
        r.d[j] = j == k ? 1 : 0;
    }
    return r;
}

/* f(a, b) with value v and the partial derivatives fa, fb. */
static inline struct dual chain2(quad v, quad fa, const struct dual *a, quad fb,
                                 const struct dual *b)
{
    struct dual r;
    r.v = v;
    r.n = a->n > b->n ? a->n : b->n;
    for (int j = 0; j < r.n; j++) {
        r.d[j] = (j < a->n ? fa * a->d[j] : 0) + (j < b->n ? fb * b->d[j] : 0);
    }
    return r;
}

static inline struct dual chain(quad v, quad fa, const struct dual *a)
{
    struct dual r;
    r.v = v;
    r.n = a->n;
    for (int j = 0; j < r.n; j++) {
        r.d[j] = fa * a->d[j];
    }
    return r;
}

static inline struct dual add(struct dual a, struct dual b)
{
    return chain2(a.v + b.v, 1, &a, 1, &b);
}

static inline struct dual sub(struct dual a, struct dual b)
{
    return chain2(a.v - b.v, 1, &a, -1, &b);
}

static inline struct dual mul(struct dual a, struct dual b)
{
    return chain2(a.v * b.v, b.v, &a, a.v, &b);
}

static inline struct dual div_by(struct dual a, struct dual b)
{
    const quad v = a.v / b.v;
    return chain2(v, 1 / b.v, &a, -v / b.v, &b);
}

/* c * a */
static inline struct dual scaled(struct dual a, quad c)
{
    return chain(c * a.v, c, &a);
}

/* a + c */
static inline struct dual shifted(struct dual a, quad c)
{
    return chain(a.v + c, 1, &a);
}

static inline struct dual dual_sqrt(struct dual a)
{
    const quad v = sqrtq(a.v);
    return chain(v, 1 / (2 * v), &a);
}

static inline struct dual dual_log(struct dual a)
{
    return chain(logq(a.v), 1 / a.v, &a);
}

static inline struct dual dual_exp(struct dual a)
{
    const quad v = expq(a.v);
    return chain(v, v, &a);
}

static inline struct dual dual_tanh(struct dual a)
{
    const quad v = tanhq(a.v);
    return chain(v, 1 - v * v, &a);
}

/* a to a constant power */
static inline struct dual dual_power(struct dual a, quad e)
{
    const quad v = powq(a.v, e);
    return chain(v, a.v == 0 ? 0 : e * v / a.v, &a);
}

#endif

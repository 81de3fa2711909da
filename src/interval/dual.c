/* dual.c: ranges with derivatives. */
#include "interval/dual.h"

void dual_constant(struct dual *out, struct interval value, int count)
{
    out->v = value;
    for (int k = 0; k < count; k++) {
        out->d[k] = interval_point(0);
    }
}

void dual_variable(struct dual *out, struct interval value, int which, int count)
{
    dual_constant(out, value, count);
    if (which >= 0) {
        out->d[which] = interval_point(1);
    }
}

static bool is_zero(struct interval a)
{
    return !(a.lo < 0) && !(a.hi > 0);
}

void dual_chain(struct dual *out, struct interval value, struct interval slope,
                const struct dual *u, int count)
{
    for (int k = 0; k < count; k++) {
        out->d[k] = is_zero(u->d[k]) ? u->d[k] : interval_mul(slope, u->d[k]);
    }
    out->v = value;
}

void dual_chain2(struct dual *out, struct interval value, struct interval by_u,
                 const struct dual *u, struct interval by_w, const struct dual *w, int count)
{
    for (int k = 0; k < count; k++) {
        const bool no_u = is_zero(u->d[k]), no_w = is_zero(w->d[k]);
        const struct interval a = no_u ? u->d[k] : interval_mul(by_u, u->d[k]);
        const struct interval b = no_w ? w->d[k] : interval_mul(by_w, w->d[k]);
        out->d[k] = no_u ? b : no_w ? a : interval_add(a, b);
    }
    out->v = value;
}

void dual_product(struct dual *out, const struct dual *u, const struct dual *w, int count)
{
    dual_chain2(out, interval_mul(u->v, w->v), w->v, u, u->v, w, count);
}

void dual_quotient(struct dual *out, const struct dual *u, const struct dual *w, int count)
{
    const struct interval inverse = interval_div(interval_point(1), w->v);
    const struct interval value = interval_mul(u->v, inverse);
    dual_chain2(out, value, inverse, u, interval_neg(interval_mul(value, inverse)), w, count);
}

/* element_junction.c: exponentials of junctions, and the amplifier's limited gain. */
#include "devices/opamp.h"
#include "devices/smooth.h"
#include "proof/element.h"
#include "proof/junction_range.h"

static struct interval expm1_at(double u)
{
    const double limit = EXPONENT_LIMIT;
    if (!(u > limit)) {
        return interval_expm1(interval_point(u));
    }
    const struct interval over = interval_sub(interval_point(u), interval_point(limit));
    return interval_add(interval_expm1(interval_point(limit)),
                        interval_mul(interval_exp(interval_point(limit)), over));
}

struct interval junction_expm1(struct interval u, struct interval *slope)
{
    const double limit = EXPONENT_LIMIT;
    const struct interval within = {fmin(u.lo, limit), fmin(u.hi, limit)};
    *slope = interval_exp(within);
    return (struct interval){expm1_at(u.lo).lo, expm1_at(u.hi).hi};
}

static void junction_range(const struct element *e, const struct interval *x,
                           struct interval *value, struct interval *slopes)
{
    const struct interval thermal = interval_point(e->thermal);
    struct interval slope;
    const struct interval grown = junction_expm1(interval_div(x[0], thermal), &slope);
    *value = interval_scale(e->coefficient, grown);
    slopes[0] = interval_div(interval_scale(e->coefficient, slope), thermal);
}

const struct element_kind element_junction = {"junction", junction_range, 1};

static void breakdown_range(const struct element *e, const struct interval *x,
                            struct interval *value, struct interval *slopes)
{
    const struct interval thermal = interval_point(e->thermal);
    const struct interval beyond = interval_neg(interval_add(x[0], interval_point(e->shift)));
    struct interval slope;
    const struct interval grown = junction_expm1(interval_div(beyond, thermal), &slope);
    *value = interval_scale(-e->coefficient, interval_add(grown, interval_point(1)));
    slopes[0] = interval_div(interval_scale(e->coefficient, slope), thermal);
}

const struct element_kind element_breakdown = {"breakdown", breakdown_range, -1};

/* 1/cosh^2 over an interval: falls with the size of its argument. */
static struct interval bell(struct interval u)
{
    const double far = interval_magnitude(u);
    const double near = u.lo <= 0 && u.hi >= 0 ? 0 : fmin(fabs(u.lo), fabs(u.hi));
    const struct interval ends[2] = {interval_tanh(interval_point(far)),
                                     interval_tanh(interval_point(near))};
    /* 1 - tanh^2 has no digits left far out: there it is below 4 exp(-2u) */
    struct interval low = interval_sub(interval_point(1), interval_square(ends[0]));
    struct interval high = interval_sub(interval_point(1), interval_square(ends[1]));
    const double tail = interval_scale(4, interval_exp(interval_point(-2 * near))).hi;
    high.hi = fmin(high.hi, tail);
    low.lo = fmax(low.lo, 0);
    return (struct interval){low.lo, fmax(high.hi, low.lo)};
}

static void amplifier_range(const struct element *e, const struct interval *x,
                            struct interval *value, struct interval *slopes)
{
    const struct opamp_prepared *p = e->prepared;
    const struct interval high = x[1], low = x[2];
    const double least = 0.001; /* as in opamp_current.c */
    const struct interval span = interval_scale(0.5, interval_sub(high, low));
    const struct interval mid = interval_scale(0.5, interval_add(high, low));
    struct interval half = span;
    struct interval half_slope = interval_point(1);
    if (span.lo < least) { /* floor_positive: between 0 and its value at `least` */
        half = (struct interval){span.lo > 0 ? span.lo : 1e-9, fmax(span.hi, least)};
        half_slope = (struct interval){0, 1};
    }
    const struct interval input =
        interval_scale(p->gain, interval_add(x[0], interval_point(p->offset)));
    const struct interval u = interval_div(input, half);
    const struct interval swing = interval_tanh(u);
    const struct interval gain = bell(u);
    struct interval by_half = interval_sub(swing, interval_mul(u, gain));
    by_half.lo = fmax(by_half.lo, -1); /* |tanh u - u/cosh^2 u| <= 1 */
    by_half.hi = fmin(by_half.hi, 1);
    by_half = interval_scale(0.5, interval_mul(by_half, half_slope));
    *value = interval_add(mid, interval_mul(half, swing));
    slopes[0] = interval_scale(p->gain, gain);
    slopes[1] = interval_add(interval_point(0.5), by_half);
    slopes[2] = interval_sub(interval_point(0.5), by_half);
}

const struct element_kind element_amplifier = {"amplifier", amplifier_range, 0};

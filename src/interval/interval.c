/* interval.c: products, quotients and functions. */
#include "interval/interval.h"

bool interval_meet(struct interval *a, struct interval b)
{
    const double lo = a->lo > b.lo ? a->lo : b.lo;
    const double hi = a->hi < b.hi ? a->hi : b.hi;
    if (!(lo <= hi)) {
        return false;
    }
    *a = (struct interval){lo, hi};
    return true;
}

/* 0 times infinity is 0 here: an unbounded factor is a bound never reached. */
static double times(double a, double b)
{
    return (a < 0 || a > 0) && (b < 0 || b > 0) ? a * b : 0;
}

struct interval interval_mul(struct interval a, struct interval b)
{
    const double p = times(a.lo, b.lo), q = times(a.lo, b.hi);
    const double r = times(a.hi, b.lo), s = times(a.hi, b.hi);
    const double least = fmin(fmin(p, q), fmin(r, s)), most = fmax(fmax(p, q), fmax(r, s));
    return interval_checked(interval_down(least), interval_up(most));
}

struct interval interval_scale(double factor, struct interval a)
{
    const double p = times(factor, a.lo), q = times(factor, a.hi);
    return interval_checked(interval_down(fmin(p, q)), interval_up(fmax(p, q)));
}

struct interval interval_div(struct interval a, struct interval b)
{
    if (b.lo <= 0 && b.hi >= 0) {
        return interval_line();
    }
    const struct interval inverse = {interval_down(1 / b.hi), interval_up(1 / b.lo)};
    return interval_mul(a, inverse);
}

struct interval interval_around(double value)
{
    const double margin = fabs(value) * INTERVAL_LIBRARY_MARGIN + 1e-320;
    return interval_checked(value - margin, value + margin);
}

struct interval interval_sqrt(struct interval a)
{
    const double lo = a.lo > 0 ? interval_down(sqrt(a.lo)) : 0;
    const double hi = a.hi > 0 ? interval_up(sqrt(a.hi)) : 0;
    return (struct interval){lo > 0 ? lo : 0, hi};
}

struct interval interval_exp(struct interval a)
{
    const double lo = interval_around(exp(a.lo)).lo;
    return (struct interval){lo > 0 ? lo : 0, interval_around(exp(a.hi)).hi};
}

struct interval interval_expm1(struct interval a)
{
    const double lo = interval_around(expm1(a.lo)).lo;
    return (struct interval){lo > -1 ? lo : -1, interval_around(expm1(a.hi)).hi};
}

struct interval interval_log(struct interval a)
{
    return (struct interval){a.lo > 0 ? interval_around(log(a.lo)).lo : -INFINITY,
                             a.hi > 0 ? interval_around(log(a.hi)).hi : -INFINITY};
}

struct interval interval_log1p(struct interval a)
{
    return (struct interval){a.lo > -1 ? interval_around(log1p(a.lo)).lo : -INFINITY,
                             a.hi > -1 ? interval_around(log1p(a.hi)).hi : -INFINITY};
}

struct interval interval_tanh(struct interval a)
{
    const double lo = interval_around(tanh(a.lo)).lo, hi = interval_around(tanh(a.hi)).hi;
    return (struct interval){lo > -1 ? lo : -1, hi < 1 ? hi : 1};
}

struct interval interval_square(struct interval a)
{
    const double p = a.lo * a.lo, q = a.hi * a.hi;
    const bool crosses = a.lo <= 0 && a.hi >= 0;
    const double lo = crosses ? 0 : interval_down(fmin(p, q));
    return (struct interval){lo > 0 ? lo : 0, interval_up(fmax(p, q))};
}

struct interval interval_power(struct interval a, int exponent)
{
    if (exponent == 0) {
        return interval_point(1);
    }
    if (exponent < 0) {
        return interval_div(interval_point(1), interval_power(a, -exponent));
    }
    const struct interval low = interval_around(pow(a.lo, exponent));
    const struct interval high = interval_around(pow(a.hi, exponent));
    if (exponent % 2 != 0) {
        return (struct interval){low.lo, high.hi};
    }
    struct interval both = interval_hull(low, high);
    if (a.lo <= 0 && a.hi >= 0) {
        both.lo = 0;
    }
    return both;
}

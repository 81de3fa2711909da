/*
 * interval.h: closed intervals that surely hold the exact result.
 *
 * Moore, Kearfott and Cloud, Introduction to Interval Analysis (2009), chapters 2 and 5. Every
 * operation is done to nearest and its ends are then moved outward by at least one unit in the last
 * place, so that no rounding mode has to be switched. Functions of the C library are moved by
 * INTERVAL_LIBRARY_MARGIN relative: 16 units, where glibc states at most 2 for those used here.
 */
#ifndef INTERVAL_INTERVAL_H
#define INTERVAL_INTERVAL_H

#include <math.h>
#include <stdbool.h>

#define INTERVAL_LIBRARY_MARGIN 3.6e-15

struct interval {
    double lo, hi; /* lo <= hi; either may be infinite, neither is NaN */
};

/* One unit or more down and up: |x| 2^-52 is one to two units of x. */
static inline double interval_down(double x)
{
    return x - (fabs(x) * 2.220446049250313e-16 + 4.9e-324);
}

static inline double interval_up(double x)
{
    return x + (fabs(x) * 2.220446049250313e-16 + 4.9e-324);
}

static inline struct interval interval_line(void)
{
    return (struct interval){-INFINITY, INFINITY};
}

static inline struct interval interval_point(double x)
{
    return (struct interval){x, x};
}

/* Ends that came from inf - inf are opened to the whole line. */
static inline struct interval interval_checked(double lo, double hi)
{
    return (struct interval){isnan(lo) ? -INFINITY : lo, isnan(hi) ? INFINITY : hi};
}

static inline struct interval interval_add(struct interval a, struct interval b)
{
    return interval_checked(interval_down(a.lo + b.lo), interval_up(a.hi + b.hi));
}

static inline struct interval interval_sub(struct interval a, struct interval b)
{
    return interval_checked(interval_down(a.lo - b.hi), interval_up(a.hi - b.lo));
}

static inline struct interval interval_neg(struct interval a)
{
    return (struct interval){-a.hi, -a.lo};
}

static inline double interval_width(struct interval a)
{
    return a.hi - a.lo;
}

/* A point inside, finite where the interval is. */
static inline double interval_middle(struct interval a)
{
    return a.lo + (a.hi - a.lo) / 2;
}

static inline double interval_magnitude(struct interval a)
{
    return fmax(fabs(a.lo), fabs(a.hi));
}

static inline bool interval_holds(struct interval a, double x)
{
    return a.lo <= x && x <= a.hi;
}

static inline bool interval_inside(struct interval a, struct interval b)
{
    return b.lo <= a.lo && a.hi <= b.hi;
}

static inline struct interval interval_hull(struct interval a, struct interval b)
{
    return (struct interval){a.lo < b.lo ? a.lo : b.lo, a.hi > b.hi ? a.hi : b.hi};
}

/* *a becomes what a and b share; false, and *a unchanged, when they share nothing. */
bool interval_meet(struct interval *a, struct interval b);

struct interval interval_mul(struct interval a, struct interval b);
/* The whole line when b holds 0. */
struct interval interval_div(struct interval a, struct interval b);
struct interval interval_scale(double factor, struct interval a);

/* Ranges over a; arguments outside the domain are cut off. */
struct interval interval_sqrt(struct interval a);
struct interval interval_exp(struct interval a);
struct interval interval_expm1(struct interval a);
struct interval interval_log(struct interval a);
struct interval interval_log1p(struct interval a);
struct interval interval_tanh(struct interval a);
struct interval interval_square(struct interval a);
/* A whole power, negative ones too. */
struct interval interval_power(struct interval a, int exponent);

/* A result of a library function with its margin. */
struct interval interval_around(double value);

#endif

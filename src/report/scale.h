/* scale.h: one axis of a picture: its range, its ticks, and the prefix its numbers are written in.
 */
#ifndef REPORT_SCALE_H
#define REPORT_SCALE_H

#include "report/figure.h"

struct scale {
    double low, high;             /* SI */
    double step;                  /* between ticks */
    double factor;                /* a tick is written as value * factor ... */
    int decimals;                 /* ... with so many digits behind the point */
    char unit[32];                /* "nA", "V", "ppm", "" */
    double linear;                /* 0, or a logarithmic scale of both signs, straight between
                                     -linear and linear; its ticks carry their own prefix */
    double pixel_low, pixel_high; /* where low and high are drawn */
};

/*
 * scale_make: a scale over low..high with about `ticks` round steps.
 *
 * widens  the range grows to whole steps; else it is kept and ticks lie inside
 */
struct scale scale_make(const struct figure_axis *axis, double low, double high, int ticks,
                        bool widens);

/* For shares: "%", "ppm" or "ppb", by the size. */
struct scale scale_make_share(double low, double high, int ticks);

/* Logarithmic on both sides of zero, in whole decades; linear > 0. */
struct scale scale_make_signed(const struct figure_axis *axis, double low, double high,
                               double linear);

/* The ticks, rising, at most SCALE_TICK_LIMIT; how many. */
enum { SCALE_TICK_LIMIT = 40 };
int scale_ticks(const struct scale *scale, double *ticks);

/* What stands beside a tick: "0.5", or "-10 µA" on a logarithmic scale. */
void scale_put_tick(const struct scale *scale, double tick, struct buffer *out);

double scale_pixel(const struct scale *scale, double value);

#endif

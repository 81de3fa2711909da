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

double scale_pixel(const struct scale *scale, double value);
double scale_first_tick(const struct scale *scale);

/* From the first on, each a step above the one before; 0 of a range without digits. */
int scale_tick_count(const struct scale *scale);

#endif

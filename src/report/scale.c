/* scale.c: round ticks, and numbers written with the prefix that keeps them short. */
#include "report/scale.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

enum { TICK_LIMIT = 1000 }; /* more come only of a range without digits */

/* The nearest of 1, 2, 5 times a power of ten at or above a positive size. */
static double round_step(double size)
{
    double decade = pow(10.0, floor(log10(size)));
    double rest = size / decade;
    double step = rest <= 1.0 + 1e-9   ? 1.0
                  : rest <= 2.0 + 1e-9 ? 2.0
                  : rest <= 5.0 + 1e-9 ? 5.0
                                       : 10.0;
    return step * decade;
}

/* Prefix and factor for a range: the greatest size is written between 1 and 1000. */
static void choose_prefix(struct scale *scale, const struct figure_axis *axis, double size)
{
    static const char *const prefixes[] = {"f", "p", "n", "\xC2\xB5", "m", "", "k", "M", "G", "T"};
    enum { NONE = 5, COUNT = 10 };
    int power = size > 0.0 ? (int)floor(log10(size * (1.0 + 1e-9)) / 3.0) : 0;
    scale->factor = 1.0;
    if (!axis->takes_prefix || axis->unit[0] == '\0') {
        if (power == 0 || power == -1 || axis->unit[0] == '%') {
            snprintf(scale->unit, sizeof scale->unit, "%s", axis->unit);
            return;
        }
        scale->factor = pow(10.0, -3.0 * power);
        snprintf(scale->unit, sizeof scale->unit, "10^%d%s%s", 3 * power,
                 axis->unit[0] != '\0' ? " " : "", axis->unit);
        return;
    }
    power = power < -NONE ? -NONE : power > COUNT - 1 - NONE ? COUNT - 1 - NONE : power;
    scale->factor = pow(10.0, -3.0 * power);
    snprintf(scale->unit, sizeof scale->unit, "%s%s", prefixes[NONE + power], axis->unit);
}

static void count_decimals(struct scale *scale)
{
    double shown = scale->step * scale->factor;
    int decimals = (int)ceil(-log10(shown) - 1e-9);
    scale->decimals = decimals < 0 ? 0 : decimals > 9 ? 9 : decimals;
}

static struct scale make_range(double low, double high, int ticks, bool widens)
{
    struct scale scale = {.low = low, .high = high};
    if (!(high > low)) {
        double room = fabs(low) > 0.0 ? 0.05 * fabs(low) : 1.0;
        scale.low -= room;
        scale.high += room;
    }
    scale.step = round_step((scale.high - scale.low) / (double)ticks);
    if (widens) {
        scale.low = floor(scale.low / scale.step + 1e-9) * scale.step;
        scale.high = ceil(scale.high / scale.step - 1e-9) * scale.step;
    }
    return scale;
}

struct scale scale_make(const struct figure_axis *axis, double low, double high, int ticks,
                        bool widens)
{
    struct scale scale = make_range(low, high, ticks, widens);
    choose_prefix(&scale, axis, fmax(fabs(scale.low), fabs(scale.high)));
    count_decimals(&scale);
    return scale;
}

struct scale scale_make_share(double low, double high, int ticks)
{
    struct scale scale = make_range(low, high, ticks, true);
    double size = fmax(fabs(scale.low), fabs(scale.high));
    bool in_percent = size >= 0.999e-3, in_ppm = size >= 0.999e-6;
    scale.factor = in_percent ? 1e2 : in_ppm ? 1e6 : 1e9;
    snprintf(scale.unit, sizeof scale.unit, "%s", in_percent ? "%" : in_ppm ? "ppm" : "ppb");
    count_decimals(&scale);
    return scale;
}

double scale_pixel(const struct scale *scale, double value)
{
    double share = (value - scale->low) / (scale->high - scale->low);
    double pixel = scale->pixel_low + share * (scale->pixel_high - scale->pixel_low);
    return fmin(fmax(pixel, -1e5), 1e5);
}

double scale_first_tick(const struct scale *scale)
{
    return ceil(scale->low / scale->step - 1e-9) * scale->step;
}

int scale_tick_count(const struct scale *scale)
{
    const double count = floor((scale->high - scale_first_tick(scale)) / scale->step + 1e-6) + 1;
    return count > 0 && count < TICK_LIMIT ? (int)count : 0;
}

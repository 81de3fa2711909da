/* scale.c: round ticks, and numbers written with the prefix that keeps them short. */
#include "report/scale.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#include "report/markup.h"

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
        if ((power >= -1 && power <= 1) || axis->unit[0] == '%') {
            snprintf(scale->unit, sizeof scale->unit, "%s", axis->unit);
            return;
        }
        scale->factor = pow(10.0, -3.0 * power);
        snprintf(scale->unit, sizeof scale->unit, "10^%d%s%.20s", 3 * power,
                 axis->unit[0] != '\0' ? " " : "", axis->unit);
        return;
    }
    power = power < -NONE ? -NONE : power > COUNT - 1 - NONE ? COUNT - 1 - NONE : power;
    scale->factor = pow(10.0, -3.0 * power);
    snprintf(scale->unit, sizeof scale->unit, "%s%.20s", prefixes[NONE + power], axis->unit);
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

/* Where a value lies on a scale, in any unit that is even along it. */
static double even(const struct scale *scale, double value)
{
    return scale->linear > 0.0 ? asinh(0.5 * value / scale->linear) : value;
}

double scale_pixel(const struct scale *scale, double value)
{
    double low = even(scale, scale->low), high = even(scale, scale->high);
    double share = (even(scale, value) - low) / (high - low);
    double pixel = scale->pixel_low + share * (scale->pixel_high - scale->pixel_low);
    return fmin(fmax(pixel, -1e5), 1e5);
}

struct scale scale_make_signed(const struct figure_axis *axis, double low, double high,
                               double linear)
{
    enum { ABOUT = 9 };
    struct scale scale = {.linear = linear};
    double ends[] = {high, -low};
    for (int k = 0; k < 2; k++) {
        ends[k] = ends[k] > linear ? pow(10.0, ceil(log10(ends[k]) - 1e-9))
                  : ends[k] > 0.0  ? linear
                                   : 0.0;
        scale.step += ends[k] > 0.0 ? log10(ends[k] / linear) + 1.0 : 0.0;
    }
    scale.high = ends[0] > 0.0 || ends[1] > 0.0 ? ends[0] : linear;
    scale.low = -ends[1];
    scale.step = fmax(1.0, ceil(scale.step / ABOUT)); /* decades between ticks */
    scale.factor = 1.0;
    snprintf(scale.unit, sizeof scale.unit, "%s", axis->unit);
    return scale;
}

static int signed_ticks(const struct scale *scale, double *ticks)
{
    int count = 0, below = 0;
    double factor = pow(10.0, scale->step);
    while (below < SCALE_TICK_LIMIT / 2 - 1 &&
           -scale->linear * pow(factor, below + 1) >= scale->low * (1.0 + 1e-9)) {
        below++;
    }
    for (int k = below; k > 0; k--) {
        ticks[count++] = -scale->linear * pow(factor, k);
    }
    ticks[count++] = 0.0;
    double above = scale->linear * factor;
    while (above <= scale->high * (1.0 + 1e-9) && count < SCALE_TICK_LIMIT) {
        ticks[count++] = above;
        above *= factor;
    }
    return count;
}

int scale_ticks(const struct scale *scale, double *ticks)
{
    int count = 0;
    if (scale->linear > 0.0) {
        return signed_ticks(scale, ticks);
    }
    double first = ceil(scale->low / scale->step - 1e-9) * scale->step;
    for (int k = 0; k < SCALE_TICK_LIMIT; k++) {
        double v = first + k * scale->step;
        if (!(v <= scale->high + 1e-6 * scale->step)) {
            break;
        }
        ticks[count++] = fabs(v) < 1e-9 * scale->step ? 0.0 : v;
    }
    return count;
}

void scale_put_tick(const struct scale *scale, double tick, struct buffer *out)
{
    if (!(scale->linear > 0.0)) {
        markup_fixed(out, tick * scale->factor, scale->decimals);
        return;
    }
    const struct figure_axis axis = {"", scale->unit, true};
    struct scale own = {.low = tick};
    choose_prefix(&own, &axis, fabs(tick));
    markup_fixed(out, tick * own.factor, 0);
    if (tick != 0.0) {
        buffer_text(out, " ");
        markup_text(out, own.unit);
    }
}

/* element_table.c: a measured curve, piece by piece: cubics between points, straight outside. */
#include "devices/curve.h"
#include "proof/element.h"

/* Range of the piece between point k and the next for v within x; its slope too. */
static void piece_range(const struct curve *curve, int k, struct interval x, struct interval *value,
                        struct interval *slope)
{
    const struct interval v0 = interval_point(curve->v[k]);
    const struct interval h = interval_sub(interval_point(curve->v[k + 1]), v0);
    struct interval t = interval_div(interval_sub(x, v0), h);
    t.lo = fmax(t.lo, 0);
    t.hi = fmin(t.hi, 1);
    t.hi = fmax(t.hi, t.lo);
    const struct interval i0 = interval_point(curve->i[k]);
    const struct interval rise = interval_sub(interval_point(curve->i[k + 1]), i0);
    const struct interval d0 = interval_scale(curve->slope[k], h);
    const struct interval d1 = interval_scale(curve->slope[k + 1], h);
    /* c2 = 3 rise - 2 d0 - d1, c3 = d0 + d1 - 2 rise */
    const struct interval c2 =
        interval_sub(interval_sub(interval_scale(3, rise), interval_scale(2, d0)), d1);
    const struct interval c3 = interval_sub(interval_add(d0, d1), interval_scale(2, rise));
    struct interval inner = interval_add(c2, interval_mul(c3, t));
    inner = interval_add(d0, interval_mul(t, inner));
    *value = interval_add(i0, interval_mul(t, inner));
    inner = interval_add(interval_scale(2, c2), interval_mul(interval_scale(3, c3), t));
    *slope = interval_div(interval_add(d0, interval_mul(t, inner)), h);
}

static void straight_range(const struct curve *curve, int k, struct interval x,
                           struct interval *value, struct interval *slope)
{
    *slope = interval_point(curve->slope[k]);
    *value = interval_add(interval_point(curve->i[k]),
                          interval_mul(*slope, interval_sub(x, interval_point(curve->v[k]))));
}

static void table_range(const struct element *e, const struct interval *x, struct interval *value,
                        struct interval *slopes)
{
    const struct curve *curve = e->prepared;
    const int last = curve->count - 1;
    bool any = false;
    for (int k = -1; k <= last; k++) {
        const double from = k < 0 ? -INFINITY : curve->v[k];
        const double to = k == last ? INFINITY : curve->v[k + 1];
        struct interval part = {from, to}, v, s;
        if (!interval_meet(&part, x[0])) {
            continue;
        }
        if (k < 0 || k == last) {
            straight_range(curve, k < 0 ? 0 : last, part, &v, &s);
        } else {
            piece_range(curve, k, part, &v, &s);
        }
        *value = any ? interval_hull(*value, v) : v;
        slopes[0] = any ? interval_hull(slopes[0], s) : s;
        any = true;
    }
}

const struct element_kind element_table = {"table", table_range, 0};

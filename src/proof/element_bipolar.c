/*
 * element_bipolar.c: transport current (IF - IR)/qb with Early effect and high injection; symbols
 * as in devices/bipolar_current.c.
 */
#include "devices/bipolar.h"
#include "proof/element.h"
#include "proof/junction_range.h"

enum { BE, BC, COUNT };

/* 1/q1 = 1 - VBC/V_A - VBE/V_B, above its floor; both rise with the width. */
static void width_of(const struct bipolar_prepared *p, const struct dual *be, const struct dual *bc,
                     struct dual *out)
{
    const double least = 0.05; /* CHARGE_LEAST */
    struct dual width;
    const struct interval a = interval_point(-p->per_early);
    const struct interval b = interval_point(-p->per_early_reverse);
    struct interval value = interval_add(interval_point(1), interval_mul(a, bc->v));
    value = interval_add(value, interval_mul(b, be->v));
    dual_chain2(&width, value, b, be, a, bc, COUNT);
    double ends[2] = {width.v.lo, width.v.hi};
    struct interval kept[2], slope[2];
    for (int k = 0; k < 2; k++) {
        if (ends[k] >= least) {
            kept[k] = interval_point(ends[k]);
            slope[k] = interval_point(1);
        } else {
            const struct interval c = interval_point(least);
            const struct interval below =
                interval_sub(interval_scale(2, c), interval_point(ends[k]));
            kept[k] = interval_div(interval_mul(c, c), below);
            slope[k] = interval_square(interval_div(c, below));
        }
    }
    dual_chain(out, (struct interval){fmax(kept[0].lo, 0), kept[1].hi},
               (struct interval){slope[0].lo, slope[1].hi}, &width, COUNT);
}

static void junction_dual(double saturation, double thermal, const struct dual *u, struct dual *out)
{
    struct interval slope;
    const struct interval t = interval_point(thermal);
    const struct interval value = junction_expm1(interval_div(u->v, t), &slope);
    dual_chain(out, interval_scale(saturation, value),
               interval_div(interval_scale(saturation, slope), t), u, COUNT);
}

/* 1/qb = (1/q1) 2/(1 + sqrt(1 + 4 q2)) */
static void share_dual(const struct bipolar_prepared *p, const struct dual *be,
                       const struct dual *bc, const struct dual *IF, const struct dual *IR,
                       struct dual *out)
{
    struct dual width, q2, share;
    width_of(p, be, bc, &width);
    if (!(p->per_knee > 0) && !(p->per_knee_reverse > 0)) {
        *out = width;
        return;
    }
    const struct interval f = interval_point(p->per_knee), r = interval_point(p->per_knee_reverse);
    dual_chain2(&q2, interval_add(interval_mul(f, IF->v), interval_mul(r, IR->v)), f, IF, r, IR,
                COUNT);
    /* h = 2/(1 + s), s = sqrt(1 + 4 q2); dh/dq2 = -h^2/s; the smooth floor of the model is 1e-20
     * off */
    const struct interval inside = interval_add(
        interval_add(interval_point(1), interval_scale(4, q2.v)), (struct interval){-1e-19, 2e-10});
    struct interval s = interval_sqrt(inside);
    s.lo = fmax(s.lo, 1e-12);
    const struct interval h = interval_div(interval_point(2), interval_add(interval_point(1), s));
    const struct interval slope = interval_neg(interval_div(interval_square(h), s));
    dual_chain(&share, h, slope, &q2, COUNT);
    dual_product(out, &width, &share, COUNT);
}

static void transport_range(const struct element *e, const struct interval *x,
                            struct interval *value, struct interval *slopes)
{
    const struct bipolar_prepared *p = e->prepared;
    struct dual be, bc, IF, IR, share, difference;
    dual_variable(&be, x[BE], BE, COUNT);
    dual_variable(&bc, x[BC], BC, COUNT);
    junction_dual(p->saturation, p->thermal_f, &be, &IF);
    junction_dual(p->saturation, p->thermal_r, &bc, &IR);
    share_dual(p, &be, &bc, &IF, &IR, &share);
    dual_chain2(&difference, interval_sub(IF.v, IR.v), interval_point(1), &IF, interval_point(-1),
                &IR, COUNT);
    dual_product(&difference, &difference, &share, COUNT);
    *value = difference.v;
    for (int k = 0; k < COUNT; k++) {
        slopes[k] = difference.d[k];
    }
}

const struct element_kind element_transport = {"transport", transport_range, 0};

struct interval element_transport_share(const struct element *e, const struct interval *x)
{
    const struct bipolar_prepared *p = e->prepared;
    struct dual be, bc, IF, IR, share;
    dual_variable(&be, x[BE], BE, COUNT);
    dual_variable(&bc, x[BC], BC, COUNT);
    junction_dual(p->saturation, p->thermal_f, &be, &IF);
    junction_dual(p->saturation, p->thermal_r, &bc, &IR);
    share_dual(p, &be, &bc, &IF, &IR, &share);
    return share.v;
}

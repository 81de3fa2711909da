/*
 * element_jfet.c: with F(v) = max(v - VP, 0)^2 both regions of the model are one,
 *
 *   ID = B (F(VGS) - F(VGD)) (1 + |VDS|/VA),   VDS = VGS - VGD.
 */
#include "devices/jfet.h"
#include "proof/element.h"

enum { GS, GD, COUNT };

static void square_part(const struct jfet_prepared *p, const struct dual *u, struct dual *out)
{
    struct interval over = interval_sub(u->v, interval_point(p->pinchoff));
    over.lo = fmax(over.lo, 0);
    over.hi = fmax(over.hi, 0);
    dual_chain(out, interval_scale(p->B, interval_square(over)), interval_scale(2 * p->B, over), u,
               COUNT);
}

static void jfet_range(const struct element *e, const struct interval *x, struct interval *value,
                       struct interval *slopes)
{
    const struct jfet_prepared *p = e->prepared;
    struct dual gs, gd, f, r, early;
    dual_variable(&gs, x[GS], GS, COUNT);
    dual_variable(&gd, x[GD], GD, COUNT);
    square_part(p, &gs, &f);
    square_part(p, &gd, &r);
    dual_chain2(&f, interval_sub(f.v, r.v), interval_point(1), &f, interval_point(-1), &r, COUNT);
    const struct interval vds = interval_sub(x[GS], x[GD]);
    const bool crosses = vds.lo < 0 && vds.hi > 0;
    const struct interval size = {crosses ? 0 : fmin(fabs(vds.lo), fabs(vds.hi)),
                                  interval_magnitude(vds)};
    const struct interval sign = {vds.lo >= 0 ? 1 : -1, vds.hi <= 0 ? -1 : 1};
    const struct interval way = sign.lo <= sign.hi ? sign : (struct interval){-1, 1};
    const struct interval slope = interval_scale(p->per_early, way);
    dual_chain2(&early, interval_add(interval_point(1), interval_scale(p->per_early, size)), slope,
                &gs, interval_neg(slope), &gd, COUNT);
    dual_product(&f, &f, &early, COUNT);
    *value = f.v;
    slopes[GS] = f.d[GS];
    slopes[GD] = f.d[GD];
}

const struct element_kind element_jfet = {"field effect", jfet_range, 0};

/*
 * element_mos.c: channel current of a MOS transistor over a box of (VG, VS, VD) to bulk, in the
 * n-channel frame; symbols and steps as in devices/mos_current.c.
 *
 * With v = (VP - a)/U and F(q) = q^2 + q, dF(q(v))/dv = q exactly, so the charge part
 *
 *   C = F(qs) - F(qd),   dC = qs dvs - qd dvd
 *
 * needs no difference of derivatives, and its signs (rising in gate and drain, falling in source)
 * are proved on boxes of any width. Each one-variable function below is monotone with a monotone
 * derivative, so that its range is found at the ends.
 */
#include "devices/mos.h"
#include "proof/element.h"

enum { G, A, B, COUNT };

/* S(x, e) of devices/smooth.h and its slope at one point. */
static struct interval smooth_at(double x, double e, struct interval *slope)
{
    const struct interval u = interval_point(x);
    const struct interval four =
        interval_mul(interval_scale(4, interval_point(e)), interval_point(e));
    const struct interval root = interval_sqrt(interval_add(interval_square(u), four));
    struct interval value;
    if (x > 0) {
        value = interval_scale(0.5, interval_add(u, root));
    } else {
        value = interval_div(interval_scale(0.5, four), interval_sub(root, u));
    }
    *slope = interval_div(value, root);
    return value;
}

static struct interval smooth_range(struct interval x, double e, struct interval *slope)
{
    struct interval low_slope, high_slope;
    const struct interval low = smooth_at(x.lo, e, &low_slope);
    const struct interval high = smooth_at(x.hi, e, &high_slope);
    *slope = (struct interval){fmax(low_slope.lo, 0), fmin(high_slope.hi, 1)};
    return (struct interval){fmax(low.lo, 0), high.hi};
}

/* 2q + ln q - v at a trial q: its sign tells on which side of the root q lies. */
static struct interval charge_error(double q, double v)
{
    const struct interval p = interval_point(q);
    return interval_sub(interval_add(interval_scale(2, p), interval_log(p)), interval_point(v));
}

/* q with 2q + ln q = v at one point: a guess by Newton, then proved from both sides. */
static struct interval charge_at(double v)
{
    if (v < -50) {
        struct interval q = interval_exp(interval_point(v > -690 ? v : -690));
        q.lo = q.lo * (1 - 1e-14); /* 2q in the equation shifts ln q by less than e^-49 */
        return q;
    }
    double q = v > 1 ? v / 2 : exp(v) / (1 + exp(v));
    for (int k = 0; k < 60; k++) {
        const double l = log(q);
        const double next = q * (1 + v - l) / (1 + 2 * q); /* Newton, always from one side */
        const double kept = next > 0 ? next : q / 2;
        const bool done = fabs(kept - q) <= 1e-15 * q;
        q = kept;
        if (done) {
            break;
        }
    }
    double margin = 1e-15;
    struct interval found = {0, INFINITY};
    for (int k = 0; k < 12; k++, margin *= 8) {
        const double lo = q * (1 - margin), hi = q * (1 + margin);
        if (!(found.lo > 0) && charge_error(lo, v).hi <= 0) {
            found.lo = lo;
        }
        if (isinf(found.hi) && charge_error(hi, v).lo >= 0) {
            found.hi = hi;
        }
        if (found.lo > 0 && isfinite(found.hi)) {
            break;
        }
    }
    return found;
}

static struct interval charge_range(const struct mos_prepared *p, struct interval v)
{
    if (p->w > 0) {
        const struct interval low = charge_at(v.lo);
        const struct interval high = v.hi > v.lo ? charge_at(v.hi) : low;
        return (struct interval){low.lo, high.hi};
    }
    return (struct interval){fmax(v.lo, 0) / 2, fmax(v.hi, 0) / 2};
}

/* q/(1 + 2q) of one charge */
static struct interval charge_share(double q)
{
    const struct interval at = interval_point(q);
    return interval_div(at, interval_add(interval_point(1), interval_scale(2, at)));
}

/* dq/dv = q/(1 + 2q), rising. */
static struct interval charge_slope(const struct mos_prepared *p, struct interval v,
                                    struct interval q)
{
    if (!(p->w > 0)) {
        return (struct interval){v.lo >= 0 ? 0.5 : 0, v.hi > 0 ? 0.5 : 0};
    }
    return (struct interval){fmax(charge_share(q.lo).lo, 0), fmin(charge_share(q.hi).hi, 0.5)};
}

/* (qs + qd + w)(qs - qd) as F(qs) - F(qd), F(q) = q^2 + w q */
static struct interval full_charge(const struct mos_prepared *p, double q)
{
    const struct interval u = interval_point(q);
    return interval_mul(u, interval_add(u, interval_point(p->w)));
}

struct bias {
    struct dual g, a, b, x;
};

struct parts {
    struct dual vt, VP, n, sb, Vx, xe, beyond, qs, qd, difference, charges;
    struct dual vs, vd; /* normalised arguments of the charges */
};

static void find_threshold(const struct mos_prepared *p, const struct bias *s, struct parts *out)
{
    const struct interval corner = interval_point(0.01);
    struct dual xs, body;
    struct interval value = {0, 0}, slope = {0, 0};
    for (int k = 0; k < 2; k++) {
        const struct interval x = interval_point(k == 0 ? s->x.v.lo : s->x.v.hi);
        const struct interval root =
            interval_sqrt(interval_add(interval_square(x), interval_square(corner)));
        const struct interval at = interval_div(interval_square(x), interval_add(root, corner));
        const struct interval rate = interval_div(x, root);
        if (k == 0) {
            value.lo = at.lo;
            slope.lo = rate.lo;
        } else {
            value.hi = at.hi;
            slope.hi = rate.hi;
        }
    }
    dual_chain(&xs, value, slope, &s->x, COUNT);
    const struct interval shifted =
        interval_add(interval_point(1), interval_scale(p->dibl_body, s->a.v));
    value = smooth_range(shifted, 0.1, &slope);
    dual_chain(&body, value, interval_scale(p->dibl_body, slope), &s->a, COUNT);
    dual_product(&xs, &xs, &body, COUNT);
    dual_chain(&out->vt, interval_sub(interval_point(p->vt), interval_scale(p->sigma, xs.v)),
               interval_point(-p->sigma), &xs, COUNT);
}

/* Square root part of the body effect at one y: r and half. */
static struct interval root_at(double g, double y, struct interval *half)
{
    const struct interval gg = interval_scale(0.25, interval_square(interval_point(g)));
    *half = interval_sqrt(interval_add(interval_point(y), gg));
    const struct interval sum = interval_add(*half, interval_scale(0.5, interval_point(g)));
    return interval_div(interval_point(y), sum);
}

static void find_pinch_off(const struct mos_prepared *p, const struct bias *s, struct parts *out)
{
    struct dual u;
    dual_chain2(&u, interval_sub(s->g.v, out->vt.v), interval_point(1), &s->g, interval_point(-1),
                &out->vt, COUNT);
    if (!(p->g > 0)) {
        out->VP = u;
        dual_constant(&out->n, interval_point(1), COUNT);
        dual_constant(&out->sb, interval_point(0), COUNT);
        return;
    }
    const struct interval g = interval_point(p->g);
    struct interval slope;
    const struct interval offset =
        interval_add(interval_point(p->phi), interval_mul(g, interval_point(p->root_phi)));
    const struct interval y = smooth_range(interval_add(u.v, offset), 0.001, &slope);
    struct interval half_low, half_high;
    const struct interval low = root_at(p->g, y.lo, &half_low);
    const struct interval high = root_at(p->g, y.hi, &half_high);
    const struct interval root = {fmax(low.lo, 0), high.hi};
    /* dVP/du = 2 r dr/dy S' = (r/half) S', both factors rising with y */
    const struct interval share = {fmax(interval_div(low, half_low).lo, 0),
                                   fmin(interval_div(high, half_high).hi, 1)};
    dual_chain(&out->VP, interval_sub(interval_square(root), interval_point(p->phi)),
               interval_mul(share, slope), &u, COUNT);
    const struct interval square = interval_add(interval_square(root), interval_point(p->four_ut));
    const struct interval sb = interval_sqrt(square);
    /* dsb/du = (r/sb) S'/(2 half); dn/du = -g/(2 sb^2) of it */
    const struct interval half = {half_low.lo, half_high.hi};
    const struct interval rate = interval_div(interval_scale(0.5, slope), half);
    const struct interval sb_slope = interval_mul(interval_div(root, sb), rate);
    dual_chain(&out->sb, sb, sb_slope, &u, COUNT);
    const struct interval n =
        interval_add(interval_point(1), interval_div(interval_scale(0.5, g), sb));
    const struct interval n_slope =
        interval_neg(interval_mul(interval_div(interval_scale(0.5, g), square), sb_slope));
    dual_chain(&out->n, n, n_slope, &u, COUNT);
}

/* Vx of the charge at the source end. */
static void find_saturation(const struct mos_prepared *p, struct parts *s)
{
    const struct interval lam = interval_point(p->lam), w = interval_point(p->w);
    const struct interval wl = interval_mul(w, lam), q = s->qs.v;
    const struct interval end = {0.0366312777774683, 0.0366312777774685}; /* 2 exp(-4) */
    const struct interval base = interval_add(interval_point(2), wl);
    const struct interval R =
        interval_sqrt(interval_add(interval_square(base), interval_scale(8, interval_mul(lam, q))));
    const struct interval R_slope = interval_div(interval_scale(4, lam), R);
    const struct interval lq = interval_scale(2, interval_mul(lam, q));
    const struct interval sum = interval_add(interval_add(base, lq), R);
    const struct interval sum_slope = interval_add(interval_scale(2, lam), R_slope);
    const struct interval factor = interval_add(interval_sub(interval_point(2), wl), R);
    const struct interval drop = interval_div(interval_mul(q, factor), sum);
    const struct interval top_slope = interval_add(factor, interval_mul(q, R_slope));
    const struct interval drop_slope =
        interval_div(interval_sub(top_slope, interval_mul(drop, sum_slope)), sum);
    const struct interval rest = interval_add(interval_mul(lam, interval_add(w, q)), end);
    struct interval value = interval_scale(2, drop), slope = interval_scale(2, drop_slope);
    if (p->w > 0) {
        value = interval_add(value, interval_log(interval_div(sum, interval_scale(2, rest))));
        slope = interval_add(slope,
                             interval_sub(interval_div(sum_slope, sum), interval_div(lam, rest)));
    }
    value = interval_scale(p->U, value);
    value.lo = fmax(value.lo, 0); /* a voltage of saturation is never negative */
    value.hi = fmax(value.hi, value.lo);
    dual_chain(&s->Vx, value, interval_scale(p->U, slope), &s->qs, COUNT);
}

/* low (1 - factor) and factor^13 for the knee at one ratio: xe = low * factor. */
static struct interval knee_factor(double ratio, double power)
{
    const struct interval r12 = interval_power(interval_point(ratio), 12);
    const struct interval shrink = interval_scale(power / 12, interval_log1p(r12));
    return interval_exp(interval_neg(shrink));
}

static struct interval effective_at(double x, double X)
{
    const double low = fmin(x, X), high = fmax(x, X);
    if (!(low > 0)) {
        return interval_point(0);
    }
    const struct interval ratio = interval_div(interval_point(low), interval_point(high));
    const struct interval factor = {knee_factor(ratio.hi, 1).lo, knee_factor(ratio.lo, 1).hi};
    return interval_scale(low, factor);
}

/* d xe/dx at one ratio x/X; d xe/dX is that of the inverse ratio. */
static struct interval effective_slope(struct interval x, struct interval X)
{
    struct interval slope = {0, 1};
    const double most = X.lo > 0 ? interval_up(x.hi / X.lo) : INFINITY;
    const double least = X.hi > 0 ? interval_down(x.lo / X.hi) : INFINITY;
    slope.lo = isfinite(most) && most < 1e20 ? knee_factor(most, 13).lo : 0;
    slope.hi = least > 0 && least < 1e20 ? knee_factor(least, 13).hi : least > 0 ? 1e-200 : 1;
    slope.lo = fmax(slope.lo, 0);
    slope.hi = fmin(fmax(slope.hi, slope.lo), 1);
    return slope;
}

static void find_effective_drain(const struct mos_prepared *p, const struct bias *s,
                                 struct parts *out)
{
    struct dual X;
    dual_chain(&X, interval_scale(p->knee, out->Vx.v), interval_point(p->knee), &out->Vx, COUNT);
    X.v.lo = fmax(X.v.lo, 0);
    const struct interval x = s->x.v;
    const struct interval low = effective_at(x.lo, X.v.lo), high = effective_at(x.hi, X.v.hi);
    const struct interval by_x = effective_slope(x, X.v), by_X = effective_slope(X.v, x);
    struct interval xe = {fmax(low.lo, 0), fmin(high.hi, x.hi)};
    xe.hi = fmax(xe.hi, xe.lo);
    dual_chain2(&out->xe, xe, by_x, &s->x, by_X, &X, COUNT);
    struct interval beyond = interval_sub(interval_point(x.lo), effective_at(x.lo, X.v.hi));
    beyond.hi = interval_sub(interval_point(x.hi), effective_at(x.hi, X.v.lo)).hi;
    beyond.lo = fmax(beyond.lo, 0);
    beyond.hi = fmax(beyond.hi, beyond.lo);
    struct interval rest = interval_sub(interval_point(1), by_x);
    rest.lo = fmax(rest.lo, 0);
    dual_chain2(&out->beyond, beyond, rest, &s->x, interval_neg(by_X), &X, COUNT);
}

static void find_charges(const struct mos_prepared *p, const struct bias *s, struct parts *out)
{
    const struct interval per_U = interval_div(interval_point(1), interval_point(p->U));
    struct dual drop;
    dual_chain2(&out->vs, interval_mul(interval_sub(out->VP.v, s->a.v), per_U), per_U, &out->VP,
                interval_neg(per_U), &s->a, COUNT);
    dual_chain(&out->qs, charge_range(p, out->vs.v), interval_point(0), &out->vs, COUNT);
    const struct interval slope = charge_slope(p, out->vs.v, out->qs.v);
    dual_chain(&out->qs, out->qs.v, slope, &out->vs, COUNT);
    const bool needs_knee = p->lam > 0 || (p->inverse_early > 0 && p->knee_share > 0);
    if (needs_knee) {
        find_saturation(p, out);
        find_effective_drain(p, s, out);
    }
    if (p->lam > 0) {
        drop = out->xe;
        dual_chain2(&out->vd, interval_sub(out->vs.v, interval_mul(drop.v, per_U)),
                    interval_point(1), &out->vs, interval_neg(per_U), &drop, COUNT);
    } else {
        drop = s->x;
        dual_chain2(&out->vd, interval_mul(interval_sub(out->VP.v, s->b.v), per_U), per_U, &out->VP,
                    interval_neg(per_U), &s->b, COUNT);
    }
    const struct interval qd = charge_range(p, out->vd.v);
    dual_chain(&out->qd, qd, charge_slope(p, out->vd.v, qd), &out->vd, COUNT);

    /* qs - qd, directly and by the mean value theorem: z times a slope between both ends */
    struct interval difference = interval_sub(out->qs.v, qd);
    const struct interval z = interval_mul(drop.v, per_U);
    const struct interval first = charge_slope(p, out->vd.v, qd);
    const struct interval between = {first.lo, fmax(slope.hi, first.hi)};
    interval_meet(&difference, interval_mul(z, between));
    difference.lo = fmax(difference.lo, 0);
    difference.hi = fmax(difference.hi, difference.lo);
    dual_chain2(&out->difference, difference, interval_point(1), &out->qs, interval_point(-1),
                &out->qd, COUNT);

    struct interval charges = {
        interval_sub(full_charge(p, out->qs.v.lo), full_charge(p, qd.hi)).lo,
        interval_sub(full_charge(p, out->qs.v.hi), full_charge(p, qd.lo)).hi};
    const struct interval level = interval_add(interval_add(out->qs.v, qd), interval_point(p->w));
    interval_meet(&charges, interval_mul(difference, level));
    charges.lo = fmax(charges.lo, 0);
    charges.hi = fmax(charges.hi, charges.lo);
    out->charges.v = charges;
    for (int k = 0; k < COUNT; k++) {
        /* qs dvs - qd dvd; without velocity saturation what both share counts with qs - qd */
        if (p->lam > 0) {
            out->charges.d[k] =
                interval_sub(interval_mul(out->qs.v, out->vs.d[k]), interval_mul(qd, out->vd.d[k]));
            /* the same as (qs - qd) dvs + qd d(drop)/U */
            const struct interval other =
                interval_add(interval_mul(difference, out->vs.d[k]),
                             interval_mul(qd, interval_mul(per_U, drop.d[k])));
            interval_meet(&out->charges.d[k], other);
        } else {
            struct interval d = interval_mul(difference, interval_mul(per_U, out->VP.d[k]));
            if (k == A) {
                d = interval_sub(d, interval_mul(out->qs.v, per_U));
            } else if (k == B) {
                d = interval_add(d, interval_mul(qd, per_U));
            }
            out->charges.d[k] = d;
        }
    }
}

static void modulate(const struct mos_prepared *p, const struct bias *s, const struct parts *parts,
                     struct dual *current)
{
    if (!(p->inverse_early > 0)) {
        return;
    }
    const struct dual *beyond = p->knee_share > 0 ? &parts->beyond : &s->x;
    const struct interval per_volt = interval_point(p->inverse_early);
    struct dual factor;
    if (p->early_onset > 0) {
        const struct interval onset = interval_point(p->early_onset);
        const struct interval share = interval_div(beyond->v, onset);
        const struct interval gain =
            interval_mul(interval_mul(per_volt, onset), interval_log1p(share));
        dual_chain(&factor, interval_add(interval_point(1), gain),
                   interval_div(per_volt, interval_add(interval_point(1), share)), beyond, COUNT);
    } else {
        dual_chain(&factor, interval_add(interval_point(1), interval_mul(per_volt, beyond->v)),
                   per_volt, beyond, COUNT);
    }
    dual_product(current, current, &factor, COUNT);
}

/* From the end at b >= a to the end at a, over the box where that holds. */
static void one_way(const struct mos_prepared *p, struct interval vg, struct interval a,
                    struct interval b, struct dual *current)
{
    struct bias s;
    struct parts parts;
    a.hi = fmin(a.hi, b.hi);
    b.lo = fmax(a.lo, b.lo);
    dual_variable(&s.g, vg, G, COUNT);
    dual_variable(&s.a, a, A, COUNT);
    dual_variable(&s.b, b, B, COUNT);
    struct interval x = interval_sub(b, a);
    x.lo = fmax(x.lo, 0);
    x.hi = fmax(x.hi, 0);
    dual_chain2(&s.x, x, interval_point(-1), &s.a, interval_point(1), &s.b, COUNT);
    find_threshold(p, &s, &parts);
    find_pinch_off(p, &s, &parts);
    find_charges(p, &s, &parts);

    struct dual sum, gate, mu, speed;
    dual_chain2(&sum, interval_add(parts.qs.v, parts.qd.v), interval_point(1), &parts.qs,
                interval_point(1), &parts.qd, COUNT);
    dual_product(&gate, &parts.n, &sum, COUNT);
    const struct interval ti = interval_mul(interval_point(p->gate_mobility), interval_point(p->U));
    const struct interval bulk = interval_point(p->bulk_mobility);
    const struct interval mobility = interval_add(
        interval_add(interval_point(1), interval_mul(bulk, parts.sb.v)), interval_mul(ti, gate.v));
    dual_chain2(&mu, mobility, bulk, &parts.sb, ti, &gate, COUNT);
    const struct interval lam = interval_point(p->lam);
    dual_chain(&speed, interval_add(interval_point(1), interval_mul(lam, parts.difference.v)), lam,
               &parts.difference, COUNT);
    dual_product(current, &parts.n, &parts.charges, COUNT);
    if (p->gate_mobility > 0 || p->bulk_mobility > 0) {
        dual_quotient(current, current, &mu, COUNT);
    }
    if (p->lam > 0) {
        dual_quotient(current, current, &speed, COUNT);
    }
    modulate(p, &s, &parts, current);
    const struct interval U = interval_point(p->U);
    const struct interval scale =
        interval_mul(interval_scale(2, interval_point(p->beta)), interval_mul(U, U));
    dual_chain(current, interval_mul(scale, current->v), scale, current, COUNT);
}

static void channel_range(const struct element *e, const struct interval *x, struct interval *value,
                          struct interval *slopes)
{
    const struct mos_prepared *p = e->prepared;
    const struct interval vg = x[0], vs = x[1], vd = x[2];
    struct dual current;
    const bool forward = vd.hi >= vs.lo, backward = vs.hi > vd.lo;
    if (forward) {
        one_way(p, vg, vs, vd, &current);
        *value = current.v;
        slopes[0] = current.d[G];
        slopes[1] = current.d[A];
        slopes[2] = current.d[B];
    }
    if (backward) {
        one_way(p, vg, vd, vs, &current);
        const struct interval back[4] = {interval_neg(current.v), interval_neg(current.d[G]),
                                         interval_neg(current.d[B]), interval_neg(current.d[A])};
        *value = forward ? interval_hull(*value, back[0]) : back[0];
        for (int k = 0; k < COUNT; k++) {
            slopes[k] = forward ? interval_hull(slopes[k], back[k + 1]) : back[k + 1];
        }
    }
}

const struct element_kind element_channel = {"channel", channel_range, 0};

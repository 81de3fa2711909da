/*
 * mos_current.c: drain current of a MOS transistor in all regions, with exact derivatives.
 *
 * Core: Enz, Krummenacher and Vittoz, Analog Integr. Circ. Sig. Proc. 8 (1995) 83-114, and the
 * unified charge-control form of Cunha, Schneider and Galup-Montoro, IEEE J. Solid-State Circuits
 * 33 (1998) 1510: 2q + ln q = v. The extensions are described in docs/devices.md. Symbols:
 *
 *   VG, a, x   gate and source-end voltage to bulk, magnitude of the drain-source voltage
 *   VP, n      pinch-off voltage and slope        qs, qd  charge at source and drain end
 *   U          slope_factor kT/q                  lam     velocity saturation
 *
 * Everything is a function of (VG, a, x); drain and source only choose the sign, so exchanging
 * them exchanges the currents exactly. `w` is 1, or 0 for the strong-inversion limit, in which
 * q = max(v, 0)/2 and q^2 replaces q^2 + q: the square law.
 */
#include "devices/mos.h"

#include <stdbool.h>

#include "devices/smooth.h"

/* A value with its derivatives in VG, a and x. */
struct dual {
    real v, g, a, x;
};

static inline struct dual constant(double value)
{
    return (struct dual){REAL(value), REAL(0), REAL(0), REAL(0)};
}

static inline struct dual choose(truth where, struct dual yes, struct dual no)
{
    return (struct dual){CHOOSE(where, yes.v, no.v), CHOOSE(where, yes.g, no.g),
                         CHOOSE(where, yes.a, no.a), CHOOSE(where, yes.x, no.x)};
}

/* x itself. */
static inline struct dual drain_voltage(real x)
{
    return (struct dual){x, REAL(0), REAL(0), REAL(1)};
}

static inline struct dual chain(real value, real slope, struct dual u)
{
    return (struct dual){value, slope * u.g, slope * u.a, slope * u.x};
}

static inline struct dual chain2(real value, real u_slope, struct dual u, real w_slope,
                                 struct dual w)
{
    return (struct dual){value, u_slope * u.g + w_slope * w.g, u_slope * u.a + w_slope * w.a,
                         u_slope * u.x + w_slope * w.x};
}

static inline struct dual product(struct dual u, struct dual w)
{
    return chain2(u.v * w.v, w.v, u, u.v, w);
}

static inline struct dual quotient(struct dual u, struct dual w)
{
    real inverse = 1 / w.v;
    real value = u.v * inverse;
    return chain2(value, inverse, u, -value * inverse, w);
}

/* All that the current and the report need. */
struct state {
    struct dual vt, VP, n, sb, qs, qd, difference, Vx, xe, beyond, current;
};

/* Below this v the charge is exp(v) to the last digit of either type. */
#define CHARGE_WEAK (-50)
/* The least charge, exp of this: still a normal number of its type, so that ratios are safe. */
#ifdef REAL_EXTENDED
#define CHARGE_FLOOR (-11000)
#define CHARGE_STEPS 3
#else
#define CHARGE_FLOOR (-690)
#define CHARGE_STEPS 2
#endif

/*
 * charge: q with 2q + ln q = v, that is 2q = W(2 e^v).
 *
 * Steps of the fourth-order iteration of Fritsch, Shafer and Crowley, Comm. ACM 16 (1973) 123, from
 * the logarithm of 1 + 2 e^v, which is at most 0.39 off relative to 2q. Worst errors after each
 * step in exact arithmetic (measured in quad precision): 6e-5, 2e-19, 8e-33.
 */
static real charge_not_weak(real v)
{
    real top = v + REAL(0.693147180559945309417232L); /* ln(2 e^v) */
    real W = CHOOSE(top > REAL(0), top, REAL(0)) + log1p(exp(-fabs(top)));
    for (int step = 0; step < CHARGE_STEPS; step++) {
        real z = top - log(W) - W;
        real p = 1 + W;
        real r = 2 * p * (p + z * REAL(2 / 3.0L));
        W *= 1 + z * (r - z) / (p * (r - 2 * z));
    }
    return W / 2;
}

static real charge(real v)
{
    truth weak = v < REAL(CHARGE_WEAK);
    if (EVERY(weak)) {
        return exp(CHOOSE(v > REAL(CHARGE_FLOOR), v, REAL(CHARGE_FLOOR)));
    }
    real q = charge_not_weak(CHOOSE(weak, REAL(CHARGE_WEAK), v));
    if (SOME(weak)) {
        q = CHOOSE(weak, exp(CHOOSE(v > REAL(CHARGE_FLOOR), v, REAL(CHARGE_FLOOR))), q);
    }
    return q;
}

static struct dual charge_of(const struct mos_prepared *p, struct dual v)
{
    if (p->w > 0) { /* 2 q + w ln(q/w) = v */
        const real w = REAL(p->w);
        real q = charge(v.v * INVERSE(p->w));
        return chain(w * q, q / (1 + 2 * q), v);
    }
    return choose(v.v > REAL(0), chain(v.v / 2, REAL(0.5L), v), constant(0));
}

/* VG - vt: threshold with drain-induced barrier lowering. */
static void find_threshold(const struct mos_prepared *p, real a, real x, struct state *s)
{
    const real corner = REAL(0.01L); /* V */
    if (!(p->sigma > 0) && !(p->sigma < 0)) {
        s->vt = constant(0);
        s->vt.v = MOVED(p, MOS_MOVED_VT, vt);
        return;
    }
    real root = sqrt(x * x + corner * corner);
    real xs = x * x / (root + corner);
    real slope;
    real body = smooth_positive(1 + REAL(p->dibl_body) * a, REAL(0.1L), &slope);
    s->vt = (struct dual){MOVED(p, MOS_MOVED_VT, vt) - p->sigma * xs * body, REAL(0),
                          -p->sigma * xs * slope * p->dibl_body, -p->sigma * (x / root) * body};
}

static void find_pinch_off(const struct mos_prepared *p, real vg, struct state *s)
{
    struct dual u = {vg - s->vt.v, REAL(1), -s->vt.a, -s->vt.x};
    if (!(p->g > 0)) {
        s->VP = u;
        s->n = constant(1);
        s->sb = constant(0);
        return;
    }
    real g = REAL(p->g);
    real slope;
    real y = smooth_positive(u.v + REAL(p->phi) + g * REAL(p->root_phi), REAL(0.001L), &slope);
    real half = sqrt(y + g * g / 4);
    real root = y / (half + g / 2); /* sqrt(y + g^2/4) - g/2 without cancellation */
    struct dual r = chain(root, slope / (2 * half), u);
    s->VP = chain(root * root - REAL(p->phi), 2 * root, r);
    real sb = sqrt(root * root + REAL(p->four_ut));
    real inverse = 1 / sb, share = g / 2 * inverse;
    s->sb = chain(sb, root * inverse, r);
    s->n = chain(1 + share, -share * inverse, s->sb);
}

/* Vx, the drain-source voltage at which the current stops rising. */
static void find_saturation(const struct mos_prepared *p, struct state *s)
{
    real lam = REAL(p->lam), w = REAL(p->w), qs = s->qs.v;
    real end = 2 * REAL(0.0183156388887341802937L); /* 2 exp(-4) */
    real R = sqrt((2 + w * lam) * (2 + w * lam) + 8 * lam * qs);
    real sum = 2 + w * lam + 2 * lam * qs + R;
    real R_slope = 4 * lam / R;
    real sum_slope = 2 * lam + R_slope;
    /* qs - qx with qx = 2 lam (qs^2 + w qs)/(A + R), brought to one fraction */
    real top = qs * (2 - w * lam + R);
    real top_slope = 2 - w * lam + R + qs * R_slope;
    real per_sum = 1 / sum;
    real drop = top * per_sum;
    real drop_slope = (top_slope - drop * sum_slope) * per_sum;
    real rest = lam * (w + qs) + end;
    real per_rest = 1 / rest;
    real value = 2 * drop + w * log(sum * per_rest / 2);
    real slope = 2 * drop_slope + w * (sum_slope * per_sum - lam * per_rest);
    s->Vx = chain(REAL(p->U) * value, REAL(p->U) * slope, s->qs);
}

/*
 * xe = x/(1 + (x/X)^12)^(1/12) with X = knee Vx, and x - xe without cancellation.
 *
 * Symmetric in x and X, so it is written with the smaller and the larger of them: the ratio never
 * exceeds 1 and both may be 0.
 */
static void find_effective_drain(const struct mos_prepared *p, real x_value, struct state *s)
{
    struct dual x = drain_voltage(x_value);
    struct dual X = chain(REAL(p->knee) * s->Vx.v, REAL(p->knee), s->Vx);
    truth triode = x.v <= X.v;
    struct dual low = choose(triode, x, X), high = choose(triode, X, x);
    real ratio = CHOOSE(high.v > REAL(0), low.v / high.v, REAL(0));
    real r2 = ratio * ratio, r4 = r2 * r2, r12 = r4 * r4 * r4;
    real shrink = log1p(r12) * REAL(1 / 12.0L); /* -ln of the factor on `low` */
    real factor;
    real less = expm1_and_exp(-shrink, &factor); /* factor - 1 */
    real low_slope = factor / (1 + r12);         /* factor^13 */
    real high_slope = low_slope * r12 * ratio;
    s->xe = chain2(low.v * factor, low_slope, low, high_slope, high);
    s->beyond = chain2((x.v - low.v) - low.v * less, REAL(1), x, REAL(-1), s->xe);
}

/* qd and qs - qd; the difference keeps its relative accuracy at small drain voltages. */
static void find_drain_charge(const struct mos_prepared *p, struct dual source_v, struct dual drop,
                              struct state *s)
{
    struct dual z = chain(drop.v * INVERSE(p->U), INVERSE(p->U), drop);
    s->qd = charge_of(p, chain2(source_v.v - z.v, REAL(1), source_v, REAL(-1), z));
    real qs = s->qs.v, qd = s->qd.v, w = REAL(p->w);
    if (!(p->w > 0)) {
        s->difference = choose(qd > REAL(0), chain(z.v / 2, REAL(0.5L), z), s->qs);
        return;
    }
    real difference = qs - qd;
    real per_qs = 1 / qs, scale = 1 / (2 * qd + w);
    truth close = qd > qs / 2;
    if (SOME(close)) {
        /* one Newton step on 2 d - w ln(1 - d/qs) = z; its start is right to an ulp of qs */
        real error = 2 * difference - w * log1p(-difference * per_qs) - z.v;
        real better = difference - error * qd * scale;
        difference = CHOOSE(close, better, difference);
    }
    /* the derivatives of the same equation */
    s->difference = chain2(difference, qd * scale, z, w * difference * per_qs * scale, s->qs);
}

/* 1 + channel-length modulation. */
static struct dual modulation(const struct mos_prepared *p, real x, const struct state *s)
{
    if (!(p->inverse_early > 0)) {
        return constant(1);
    }
    struct dual beyond = p->knee_share > 0 ? s->beyond : drain_voltage(x);
    real per_volt = REAL(p->inverse_early);
    if (p->early_onset > 0) {
        real share = beyond.v * INVERSE(p->early_onset);
        return chain(1 + per_volt * REAL(p->early_onset) * log1p(share), per_volt / (1 + share),
                     beyond);
    }
    return chain(1 + per_volt * beyond.v, per_volt, beyond);
}

/* The current from the end at b to the end at a, both and the gate against bulk. */
static void find_current(const struct mos_prepared *p, real vg, real a, real x, struct state *s)
{
    find_threshold(p, a, x, s);
    find_pinch_off(p, vg, s);
    real U = REAL(p->U), per_U = INVERSE(p->U);
    struct dual source_v = {(s->VP.v - a) * per_U, s->VP.g * per_U, (s->VP.a - 1) * per_U,
                            s->VP.x * per_U};
    s->qs = charge_of(p, source_v);
    find_saturation(p, s);
    find_effective_drain(p, x, s);
    find_drain_charge(p, source_v, p->lam > 0 ? s->xe : drain_voltage(x), s);

    struct dual sum = chain2(s->qs.v + s->qd.v, REAL(1), s->qs, REAL(1), s->qd);
    real ti_U = REAL(p->gate_mobility) * U;
    struct dual gate = product(s->n, sum);
    struct dual mu = chain2(1 + REAL(p->bulk_mobility) * s->sb.v + ti_U * gate.v,
                            REAL(p->bulk_mobility), s->sb, ti_U, gate);
    struct dual speed = chain(1 + REAL(p->lam) * s->difference.v, REAL(p->lam), s->difference);
    struct dual level = chain(sum.v + REAL(p->w), REAL(1), sum); /* qs^2 + qs - qd^2 - qd = */
    struct dual charges = product(s->difference, level);         /* (qs - qd)(qs + qd + 1)  */
    struct dual current = quotient(product(s->n, charges), product(mu, speed));
    current = product(current, modulation(p, x, s));
    real scale = 2 * MOVED(p, MOS_MOVED_BETA, beta) * U * U;
    s->current = chain(scale * current.v, scale, current);
}

/* Diode from bulk to one of the ends. */
static void add_junction(const struct mos_prepared *p, const real *x, int end, real *f, real *jac)
{
    real slope;
    real scale = REAL(p->polarity) * REAL(p->junction_current);
    real forward = REAL(p->polarity) * (x[MOS_B] - x[end]) * INVERSE(p->junction_ut);
    real current = scale * limited_expm1(forward, &slope);
    real conductance = REAL(p->junction_current) * slope * INVERSE(p->junction_ut);
    f[MOS_B] += current;
    f[end] -= current;
    jac[MOS_TERMINALS * MOS_B + MOS_B] += conductance;
    jac[MOS_TERMINALS * MOS_B + end] -= conductance;
    jac[MOS_TERMINALS * end + MOS_B] -= conductance;
    jac[MOS_TERMINALS * end + end] += conductance;
}

void REAL_NAME(mos_evaluate)(const void *prepared, const real *x, real *f, real *jac)
{
    const struct mos_prepared *p = prepared;
    real polarity = REAL(p->polarity);
    truth forward = polarity * (x[MOS_D] - x[MOS_S]) >= REAL(0); /* the source has more charge */
    real high = CHOOSE(forward, x[MOS_D], x[MOS_S]);             /* the end at b */
    real low = CHOOSE(forward, x[MOS_S], x[MOS_D]);              /* the end at a */
    struct state s;
    find_current(p, polarity * (x[MOS_G] - x[MOS_B]), polarity * (low - x[MOS_B]),
                 polarity * (high - low), &s);

    /* slopes of the current into the end at b */
    real by_low = s.current.a - s.current.x, by_bulk = -(s.current.g + s.current.a);
    real into_drain = polarity * s.current.v;
    real *drain = jac + MOS_TERMINALS * MOS_D, *source = jac + MOS_TERMINALS * MOS_S;
    drain[MOS_D] = CHOOSE(forward, s.current.x, -by_low);
    drain[MOS_S] = CHOOSE(forward, by_low, -s.current.x);
    drain[MOS_G] = CHOOSE(forward, s.current.g, -s.current.g);
    drain[MOS_B] = CHOOSE(forward, by_bulk, -by_bulk);
    f[MOS_D] = CHOOSE(forward, into_drain, -into_drain);
    f[MOS_S] = -f[MOS_D];
    f[MOS_G] = f[MOS_B] = REAL(0);
    for (int k = 0; k < MOS_TERMINALS; k++) {
        source[k] = -drain[k];
        jac[MOS_TERMINALS * MOS_G + k] = REAL(0);
        jac[MOS_TERMINALS * MOS_B + k] = REAL(0);
    }
    if (p->junction_current > 0) {
        add_junction(p, x, MOS_S, f, jac);
        add_junction(p, x, MOS_D, f, jac);
    }
}

#if !defined REAL_EXTENDED && !defined LANES
void mos_inspect(const struct mos_prepared *p, const double *x, struct mos_inspection *out)
{
    bool forward = p->polarity * (x[MOS_D] - x[MOS_S]) >= 0;
    int high = forward ? MOS_D : MOS_S;
    int low = forward ? MOS_S : MOS_D;
    double vg = p->polarity * (x[MOS_G] - x[MOS_B]);
    double a = p->polarity * (x[low] - x[MOS_B]);
    struct state s;
    find_current(p, vg, a, p->polarity * (x[high] - x[low]), &s);
    out->qs = s.qs.v;
    out->qd = s.qd.v;
    out->inversion = s.qs.v * (s.qs.v + p->w);
    out->vdsat = s.Vx.v;
    out->vth = s.vt.v + p->g * (sqrt(fmax(p->phi + a, 0)) - p->root_phi);
    out->overdrive = (vg - a) - out->vth;
}
#endif

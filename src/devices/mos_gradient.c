/*
 * mos_gradient.c: the equations of mos_current.c once more, differentiated in their constants.
 *
 * A jet is a value with its derivatives in all constants (forward differentiation: Griewank and
 * Walther, Evaluating Derivatives, 2nd ed. 2008, section 3.1). Symbols and sources as in
 * mos_current.c; a change there is a change here, and the test of this file says so.
 */
#include "devices/mos_gradient.h"

#include <math.h>

#include "devices/mos.h"
#include "devices/smooth.h"

struct jet {
    double v, d[MOS_CONSTANTS];
};

static struct jet fixed(double value)
{
    struct jet it = {.v = value};
    return it;
}

static struct jet variable(double value, enum mos_constant constant)
{
    struct jet it = {.v = value};
    it.d[constant] = 1;
    return it;
}

/* A function of u, v and w with the given value and slopes. */
static struct jet chain3(double value, double u_slope, const struct jet *u, double v_slope,
                         const struct jet *v, double w_slope, const struct jet *w)
{
    struct jet it;
    it.v = value;
    for (int k = 0; k < MOS_CONSTANTS; k++) {
        it.d[k] = u_slope * u->d[k] + v_slope * v->d[k] + w_slope * w->d[k];
    }
    return it;
}

static struct jet chain2(double value, double u_slope, const struct jet *u, double v_slope,
                         const struct jet *v)
{
    struct jet it;
    it.v = value;
    for (int k = 0; k < MOS_CONSTANTS; k++) {
        it.d[k] = u_slope * u->d[k] + v_slope * v->d[k];
    }
    return it;
}

static struct jet chain(double value, double slope, const struct jet *u)
{
    struct jet it;
    it.v = value;
    for (int k = 0; k < MOS_CONSTANTS; k++) {
        it.d[k] = slope * u->d[k];
    }
    return it;
}

static struct jet product(const struct jet *u, const struct jet *v)
{
    return chain2(u->v * v->v, v->v, u, u->v, v);
}

static struct jet quotient(const struct jet *u, const struct jet *v)
{
    double value = u->v / v->v;
    return chain2(value, 1 / v->v, u, -value / v->v, v);
}

/* Constants as variables, then what mos_current.c calls by the same names. */
struct state {
    struct jet U, vt0, g, phi, sigma, dibl_body, beta, lam, knee, bulk_mobility, gate_mobility,
        inverse_early, early_onset;
    double four_ut;
    struct jet VP, n, sb, source_v, qs, qd, difference, Vx, xe, beyond;
};

/* q with 2q + ln q = v, the value as in mos_current.c: steps of Fritsch, Shafer
 * and Crowley, Comm. ACM 16 (1973) 123, for 2q = W(2 e^v). */
static struct jet charge(const struct jet *v)
{
    double q;
    if (v->v < -50) {
        q = exp(v->v > -690 ? v->v : -690);
    } else {
        double top = v->v + 0.693147180559945309417232;
        double W = (top > 0 ? top : 0) + log1p(exp(-fabs(top)));
        for (int step = 0; step < 2; step++) {
            double z = top - log(W) - W;
            double p = 1 + W;
            double r = 2 * p * (p + 2 * z / 3);
            W *= 1 + z / p * (r - z) / (r - 2 * z);
        }
        q = W / 2;
    }
    return chain(q, q / (1 + 2 * q), v);
}

static struct jet threshold(const struct state *s, double a, double x)
{
    const double corner = 0.01; /* V */
    double slope;
    double xs = x * x / (sqrt(x * x + corner * corner) + corner);
    double body = smooth_positive(1 + s->dibl_body.v * a, 0.1, &slope);
    return chain3(s->vt0.v - s->sigma.v * xs * body, 1, &s->vt0, -xs * body, &s->sigma,
                  -s->sigma.v * xs * slope * a, &s->dibl_body);
}

static void find_source_end(struct state *s, double a)
{
    double scaled = (s->VP.v - a) / s->U.v;
    s->source_v = chain2(scaled, 1 / s->U.v, &s->VP, -scaled / s->U.v, &s->U);
}

static void find_pinch_off(struct state *s, double vg, double a, double x)
{
    struct jet vt = threshold(s, a, x);
    if (!(s->g.v > 0)) { /* no body effect: no slope in it either */
        s->VP = chain(vg - vt.v, -1, &vt);
        s->n = fixed(1);
        s->sb = fixed(0);
        return;
    }
    double root_phi = sqrt(s->phi.v), g = s->g.v;
    double slope;
    double y = smooth_positive(vg - vt.v + s->phi.v + g * root_phi, 0.001, &slope);
    double half = sqrt(y + g * g / 4);
    double root = y / (half + g / 2);
    /* root = sqrt(y + g^2/4) - g/2 */
    double y_slope = 1 / (2 * half);
    struct jet r = chain3(root, -slope * y_slope, &vt, slope * y_slope * (1 + g / (2 * root_phi)),
                          &s->phi, slope * y_slope * root_phi + g / (4 * half) - 0.5, &s->g);
    s->VP = chain2(root * root - s->phi.v, 2 * root, &r, -1, &s->phi);
    double sb = sqrt(root * root + s->four_ut);
    s->sb = chain(sb, root / sb, &r);
    s->n = chain2(1 + g / (2 * sb), 1 / (2 * sb), &s->g, -g / (2 * sb * sb), &s->sb);
}

static void find_saturation(struct state *s)
{
    double lam = s->lam.v, qs = s->qs.v;
    double end = 2 * 0.0183156388887341802937; /* 2 exp(-4) */
    double R = sqrt((2 + lam) * (2 + lam) + 8 * lam * qs);
    double R_lam = (2 + lam + 4 * qs) / R, R_qs = 4 * lam / R;
    double sum = 2 + lam + 2 * lam * qs + R;
    double sum_lam = 1 + 2 * qs + R_lam, sum_qs = 2 * lam + R_qs;
    double drop = qs * (2 - lam + R) / sum;
    double drop_qs = (2 - lam + R + qs * R_qs - drop * sum_qs) / sum;
    double drop_lam = (qs * (R_lam - 1) - drop * sum_lam) / sum;
    double rest = lam * (1 + qs) + end;
    double value = 2 * drop + log(sum / (2 * rest));
    double value_qs = 2 * drop_qs + sum_qs / sum - lam / rest;
    double value_lam = 2 * drop_lam + sum_lam / sum - (1 + qs) / rest;
    s->Vx = chain3(s->U.v * value, value, &s->U, s->U.v * value_qs, &s->qs, s->U.v * value_lam,
                   &s->lam);
}

static void find_effective_drain(struct state *s, double x_value)
{
    struct jet x = fixed(x_value), X = product(&s->knee, &s->Vx);
    int triode = x.v <= X.v;
    const struct jet *low = triode ? &x : &X, *high = triode ? &X : &x;
    double ratio = high->v > 0 ? low->v / high->v : 0;
    double r2 = ratio * ratio, r4 = r2 * r2, r12 = r4 * r4 * r4;
    double shrink = log1p(r12) / 12;
    double low_slope = exp(-13 * shrink);
    double high_slope = low_slope * r12 * ratio;
    s->xe = chain2(low->v * exp(-shrink), low_slope, low, high_slope, high);
    s->beyond = chain((x.v - low->v) - low->v * expm1(-shrink), -1, &s->xe);
}

static void find_drain_charge(struct state *s, double x)
{
    struct jet free_drain = fixed(x);
    const struct jet *drop = s->lam.v > 0 ? &s->xe : &free_drain;
    double scaled = drop->v / s->U.v;
    struct jet z = chain2(scaled, 1 / s->U.v, drop, -scaled / s->U.v, &s->U);
    struct jet drain_v = chain2(s->source_v.v - z.v, 1, &s->source_v, -1, &z);
    s->qd = charge(&drain_v);
    double qs = s->qs.v, qd = s->qd.v;
    double difference = qs - qd;
    if (qd > qs / 2) {
        double error = 2 * difference - log1p(-difference / qs) - z.v;
        difference -= error * qd / (2 * qd + 1);
    }
    double scale = 1 / (2 * qd + 1);
    s->difference = chain2(difference, qd * scale, &z, difference / qs * scale, &s->qs);
}

static struct jet modulation(const struct state *s)
{
    double per_volt = s->inverse_early.v, onset = s->early_onset.v, beyond = s->beyond.v;
    if (onset > 0) {
        double share = beyond / onset, grown = log1p(share);
        return chain3(1 + per_volt * onset * grown, onset * grown, &s->inverse_early,
                      per_volt * (grown - share / (1 + share)), &s->early_onset,
                      per_volt / (1 + share), &s->beyond);
    }
    return chain2(1 + per_volt * beyond, beyond, &s->inverse_early, per_volt, &s->beyond);
}

void mos_constants(const void *prepared, double *constants)
{
    const struct mos_prepared *p = prepared;
    constants[MOS_U] = p->U;
    constants[MOS_VT] = p->vt;
    constants[MOS_BODY] = p->g;
    constants[MOS_PHI] = p->phi;
    constants[MOS_SIGMA] = p->sigma;
    constants[MOS_DIBL_BODY] = p->dibl_body;
    constants[MOS_BETA] = p->beta;
    constants[MOS_LAM] = p->lam;
    constants[MOS_KNEE] = p->knee;
    constants[MOS_BULK_MOBILITY] = p->bulk_mobility;
    constants[MOS_GATE_MOBILITY] = p->gate_mobility;
    constants[MOS_INVERSE_EARLY] = p->inverse_early;
    constants[MOS_EARLY_ONSET] = p->early_onset;
}

static void begin(struct state *s, const struct mos_prepared *p)
{
    s->four_ut = p->four_ut;
    s->U = variable(p->U, MOS_U);
    s->vt0 = variable(p->vt, MOS_VT);
    s->g = variable(p->g, MOS_BODY);
    s->phi = variable(p->phi, MOS_PHI);
    s->sigma = variable(p->sigma, MOS_SIGMA);
    s->dibl_body = variable(p->dibl_body, MOS_DIBL_BODY);
    s->beta = variable(p->beta, MOS_BETA);
    s->lam = variable(p->lam, MOS_LAM);
    s->knee = variable(p->knee, MOS_KNEE);
    s->bulk_mobility = variable(p->bulk_mobility, MOS_BULK_MOBILITY);
    s->gate_mobility = variable(p->gate_mobility, MOS_GATE_MOBILITY);
    s->inverse_early = variable(p->inverse_early, MOS_INVERSE_EARLY);
    s->early_onset = variable(p->early_onset, MOS_EARLY_ONSET);
}

double mos_gradient(const void *prepared, double vgs, double vds, double vsb, double *gradient)
{
    struct state s;
    begin(&s, prepared);
    find_pinch_off(&s, vgs + vsb, vsb, vds);
    find_source_end(&s, vsb);
    s.qs = charge(&s.source_v);
    find_saturation(&s);
    find_effective_drain(&s, vds);
    find_drain_charge(&s, vds);

    struct jet sum = chain2(s.qs.v + s.qd.v, 1, &s.qs, 1, &s.qd);
    struct jet gate = product(&s.n, &sum);
    struct jet ti_U = product(&s.gate_mobility, &s.U);
    struct jet gate_part = product(&ti_U, &gate);
    struct jet bulk_part = product(&s.bulk_mobility, &s.sb);
    struct jet mu = chain2(1 + bulk_part.v + gate_part.v, 1, &bulk_part, 1, &gate_part);
    struct jet slow = product(&s.lam, &s.difference);
    slow.v += 1;
    struct jet level = chain(sum.v + 1, 1, &sum);
    struct jet charges = product(&s.difference, &level);
    struct jet top = product(&s.n, &charges);
    struct jet bottom = product(&mu, &slow);
    struct jet current = quotient(&top, &bottom);
    struct jet growth = modulation(&s);
    current = product(&current, &growth);
    struct jet scale = chain2(2 * s.beta.v * s.U.v * s.U.v, 2 * s.U.v * s.U.v, &s.beta,
                              4 * s.beta.v * s.U.v, &s.U);
    current = product(&scale, &current);
    for (int k = 0; k < MOS_CONSTANTS; k++) {
        gradient[k] = current.d[k];
    }
    return current.v;
}

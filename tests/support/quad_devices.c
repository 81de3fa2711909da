/*
 * quad_devices.c: the device equations of the reference, written again from their sources (named
 * at each), with no eye on speed.
 */
#include "support/quad_devices.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "devices/curve.h"
#include "devices/law.h"

/* One device under one question. */
struct context {
    const struct quad_question *question;
    const struct instance *instance;
    quad kelvin, measured; /* K */
    quad ut;               /* kT/q at kelvin */
};

static quad not_a_number(void)
{
    const quad zero = 0;
    return zero / zero;
}

static bool is_number(quad value)
{
    return value == value;
}

static quad thermal_voltage(quad kelvin)
{
    /* k = 1.380649e-23 J/K and q = 1.602176634e-19 C, exact in the SI of 2019 */
    return kelvin * 1380649 / 16021766340;
}

static bool on(const struct context *c, unsigned effect)
{
    return (c->question->effects & effect) != 0;
}

/* Instance parameter by name; not a number when there is none or it is off. */
static quad own(const struct context *c, const char *name)
{
    const struct device_type *type = c->instance->type;
    const int k = parameter_find(type->parameters, type->parameter_count, name);
    return k < 0 ? not_a_number() : (quad)c->instance->own[k];
}

static quad own_or(const struct context *c, const char *name, quad absent)
{
    const quad value = own(c, name);
    return is_number(value) ? value : absent;
}

/* Model parameter by name; the table's default when the device names no model. */
static quad model(const struct context *c, const char *name)
{
    const struct device_type *type = c->instance->type;
    const int k = parameter_find(type->model_parameters, type->model_parameter_count, name);
    if (k < 0) {
        return not_a_number();
    }
    if (c->instance->model != NULL) {
        return (quad)c->instance->model->values[k];
    }
    return type->model_parameters[k].when_absent == DEFAULT_NONE
               ? not_a_number()
               : (quad)type->model_parameters[k].standard;
}

static quad model_if(const struct context *c, unsigned effect, const char *name)
{
    return on(c, effect) ? model(c, name) : 0;
}

static int terminal(const struct context *c, const char *name)
{
    for (int k = 0; k < c->instance->type->terminal_count; k++) {
        if (strcmp(c->instance->type->terminals[k].name, name) == 0) {
            return k;
        }
    }
    return -1;
}

/* I_S of a junction: I_S (T/T0)^(p/n) exp(E_g/(n UT) (T/T0 - 1)). */
static quad saturation_at(const struct context *c, quad at_measured, quad emission, quad bandgap,
                          quad exponent)
{
    const quad ratio = c->kelvin / c->measured;
    return at_measured * powq(ratio, exponent / emission) *
           expq(bandgap / (emission * c->ut) * (ratio - 1));
}

/* I_S (exp(v/(n UT)) - 1) */
static struct dual junction(const struct context *c, quad saturation, quad emission, struct dual v)
{
    return scaled(shifted(dual_exp(scaled(v, 1 / (emission * c->ut))), -1), saturation);
}

/* df/dx[k], 0 where f does not depend on it. */
static quad slope_of(const struct dual *f, int k)
{
    return k >= 0 && k < f->n ? f->d[k] : 0;
}

/* ---- MOS transistor: Enz, Krummenacher and Vittoz 1995; Cunha et al. 1998 ---- */

/* q with 2 q + ln q = v, or its strong-inversion limit max(v, 0)/2. */
static struct dual charge(struct dual v, bool all_regions)
{
    if (!all_regions) {
        return v.v > 0 ? scaled(v, (quad)1 / 2) : constant(0);
    }
    quad y = v.v > 0 ? logq((v.v + 1) / 2) : v.v;
    for (int k = 0; k < 200; k++) {
        const quad e = 2 * expq(y);
        const quad step = (e + y - v.v) / (e + 1);
        y -= step;
        if (fabsq(step) <= 1e-33 * (1 + fabsq(y))) {
            break;
        }
    }
    const quad q = expq(y);
    return chain(q, q / (1 + 2 * q), &v);
}

/* (x + sqrt(x^2 + 4 e^2))/2 */
static struct dual smooth_positive(struct dual x, quad e)
{
    return scaled(add(x, dual_sqrt(shifted(mul(x, x), 4 * e * e))), (quad)1 / 2);
}

struct mos {
    quad length, width, h; /* effective, m; h = sqrt(1 um / length) */
    quad threshold, beta, body, phi, dibl, dibl_body;
    quad unit;   /* slope_factor UT */
    quad lambda; /* 2 U / (critical_field length), 0: none */
    quad bulk_mobility, gate_mobility, knee;
    quad early, onset; /* not a number: none */
    bool is_hand;
};

static struct mos mos_values(const struct context *c)
{
    const quad um = (quad)1 / 1000000;
    struct mos p = {.onset = not_a_number(), .early = not_a_number(), .knee = 1, .phi = 1};
    const quad shift = own_or(c, "threshold_shift", 0);
    const quad gain = (1 + own_or(c, "gain_shift", 0)) * own_or(c, "m", 1);
    if (is_number(own(c, "conduction"))) {
        p.is_hand = true;
        p.threshold = own(c, "threshold") + shift;
        p.beta = 2 * own(c, "conduction") * gain;
        p.unit = own_or(c, "slope", 1) * c->ut;
        p.early = on(c, EFFECT_MODULATION) ? own(c, "early") : not_a_number();
        return p;
    }
    p.length = own(c, "L") - model_if(c, EFFECT_GEOMETRY, "length_offset");
    p.width = own(c, "W") - model_if(c, EFFECT_GEOMETRY, "width_offset");
    p.h = sqrtq(um / p.length);
    const quad pile = model(c, "halo_length");
    const quad halo = is_number(pile) ? (sqrtq(1 + pile / p.length) - 1) / sqrtq(pile / um) : p.h;
    const quad narrow = um / p.width;
    p.threshold = model(c, "threshold") + shift +
                  model(c, "threshold_tempco") * (c->kelvin - c->measured) +
                  model_if(c, EFFECT_GEOMETRY, "halo_threshold") * halo +
                  model_if(c, EFFECT_GEOMETRY, "narrow_threshold") * narrow;
    p.beta = gain * model(c, "kprime") *
             powq(c->kelvin / c->measured, -model(c, "mobility_exponent")) * p.width / p.length;
    p.phi = model(c, "phi");
    p.body = model_if(c, EFFECT_BODY, "body_effect") *
             (1 - model_if(c, EFFECT_GEOMETRY, "halo_body") * halo -
              model_if(c, EFFECT_GEOMETRY, "narrow_body") * narrow);
    if (on(c, EFFECT_BARRIER)) {
        p.dibl = model(c, "dibl") * p.h +
                 model(c, "dibl_short") *
                     expq(-(p.length - model(c, "short_length")) / model(c, "short_decay"));
        p.dibl_body = model(c, "dibl_body");
    }
    p.unit = model(c, "slope_factor") * c->ut *
             (1 + model_if(c, EFFECT_GEOMETRY, "narrow_slope") * narrow /
                      (1 + model(c, "narrow_slope_length") / p.length));
    p.knee = model(c, "saturation_knee");
    if (on(c, EFFECT_MOBILITY)) {
        const quad field = model(c, "critical_field");
        p.lambda = is_number(field) ? 2 * p.unit / (field * p.length) : 0;
        p.bulk_mobility = model(c, "mobility_bulk");
        p.gate_mobility =
            model(c, "mobility_gate") + model(c, "mobility_gate_short") * um / p.length;
    }
    if (on(c, EFFECT_MODULATION)) {
        p.early = model(c, "early") * powq(p.length / um, model(c, "early_exponent"));
        p.onset = model(c, "early_onset");
    }
    return p;
}

/* Saturation voltage with velocity saturation. w is 1 in all regions, 0 in strong inversion. */
static struct dual saturation_voltage(const struct mos *p, struct dual qs, quad w)
{
    const quad lam = p->lambda;
    const struct dual a = shifted(scaled(qs, 2 * lam), 2 + lam * w);
    const struct dual r = dual_sqrt(shifted(scaled(qs, 8 * lam), (2 + lam * w) * (2 + lam * w)));
    const struct dual qx = div_by(scaled(add(mul(qs, qs), scaled(qs, w)), 2 * lam), add(a, r));
    struct dual vx = scaled(sub(qs, qx), 2);
    if (w > 0) {
        const struct dual low = shifted(scaled(shifted(qs, 1), lam), 2 * expq(-4));
        vx = add(vx, dual_log(div_by(add(a, r), scaled(low, 2))));
    }
    return scaled(vx, p->unit);
}

/* x / (1 + (x/(knee Vx))^12)^(1/12), in the form whose power stays below 1 */
static struct dual limited(struct dual x, struct dual vx, quad knee)
{
    const struct dual limit = scaled(vx, knee);
    if (limit.v <= 0 || x.v <= 0) {
        return limit.v <= 0 ? limit : x;
    }
    const bool below = x.v <= limit.v;
    const struct dual r = below ? div_by(x, limit) : div_by(limit, x);
    const struct dual root = dual_power(shifted(dual_power(r, 12), 1), (quad)1 / 12);
    return div_by(below ? x : limit, root);
}

/* Drain current for voltages to bulk, of the n-channel form. */
static struct dual mos_current(const struct context *c, const struct mos *p, struct dual vg,
                               struct dual vs, struct dual vd, struct quad_device_state *state)
{
    const bool forward = vd.v >= vs.v;
    const struct dual a = forward ? vs : vd;
    const struct dual x = forward ? sub(vd, vs) : sub(vs, vd);
    const bool all = on(c, EFFECT_INVERSION);
    const quad w = all ? 1 : 0;
    const quad ten_mv = (quad)1 / 100;

    struct dual vt = constant(p->threshold);
    if (p->dibl != 0) {
        const struct dual xs = shifted(dual_sqrt(shifted(mul(x, x), ten_mv * ten_mv)), -ten_mv);
        const struct dual body = smooth_positive(shifted(scaled(a, p->dibl_body), 1), (quad)1 / 10);
        vt = sub(vt, scaled(mul(xs, body), p->dibl));
    }
    struct dual vp = sub(vg, vt);
    struct dual n = constant(1), sb = constant(0);
    if (p->body != 0) {
        const struct dual y =
            smooth_positive(shifted(vp, p->phi + p->body * sqrtq(p->phi)), (quad)1 / 1000);
        const struct dual s = shifted(dual_sqrt(shifted(y, p->body * p->body / 4)), -p->body / 2);
        vp = shifted(mul(s, s), -p->phi);
        sb = dual_sqrt(shifted(mul(s, s), 4 * c->ut));
        n = shifted(div_by(constant(p->body / 2), sb), 1);
    }
    const struct dual qs = charge(scaled(sub(vp, a), 1 / p->unit), all);
    struct dual vx = saturation_voltage(p, qs, w);
    struct dual xe = limited(x, vx, p->knee);
    const struct dual xd = p->lambda > 0 ? xe : x;
    const struct dual qd = charge(scaled(sub(sub(vp, a), xd), 1 / p->unit), all);
    const struct dual mobility =
        shifted(add(scaled(sb, p->bulk_mobility * p->body),
                    scaled(mul(n, add(qs, qd)), p->gate_mobility * p->unit)),
                1);
    struct dual modulation = constant(1);
    if (is_number(p->early)) {
        const struct dual beyond = p->is_hand ? x : sub(x, xe);
        modulation = is_number(p->onset)
                         ? shifted(scaled(dual_log(shifted(scaled(beyond, 1 / p->onset), 1)),
                                          p->onset / p->early),
                                   1)
                         : shifted(scaled(beyond, 1 / p->early), 1);
    }
    const struct dual velocity = shifted(scaled(sub(qs, qd), p->lambda), 1);
    const struct dual charges =
        sub(add(mul(qs, qs), scaled(qs, w)), add(mul(qd, qd), scaled(qd, w)));
    struct dual current = scaled(mul(mul(n, charges), modulation), 2 * p->beta * p->unit * p->unit);
    current = div_by(current, mul(mobility, velocity));

    const quad root = p->body == 0 ? 0 : sqrtq(p->phi + a.v) - sqrtq(p->phi);
    state->vth = vt.v + p->body * root;
    state->inversion = qs.v * qs.v + w * qs.v;
    state->vdsat = vx.v;
    return forward ? current : scaled(current, -1);
}

static void mos(const struct context *c, const struct dual *x, struct dual *f,
                struct quad_device_state *state)
{
    const quad sign = c->instance->type->polarity;
    const int d = terminal(c, "d"), g = terminal(c, "g"), s = terminal(c, "s");
    const int b = terminal(c, "b");
    const struct mos p = mos_values(c);
    const struct dual vb = b < 0 ? x[s] : x[b];
    const struct dual vg = scaled(sub(x[g], vb), sign);
    const struct dual vs = scaled(sub(x[s], vb), sign);
    const struct dual vd = scaled(sub(x[d], vb), sign);
    struct dual id = mos_current(c, &p, vg, vs, vd, state);
    state->headroom = vd.v - vs.v - state->vdsat;
    struct dual is = scaled(id, -1), ib = constant(0);
    const quad leak = p.is_hand ? 0 : model_if(c, EFFECT_LEAKAGE, "junction_leak");
    if (leak != 0 && b >= 0) {
        const quad saturation =
            saturation_at(c, leak * own(c, "W") * own_or(c, "m", 1), 1, (quad)112 / 100, 3);
        const struct dual to_source = junction(c, saturation, 1, scaled(vs, -1));
        const struct dual to_drain = junction(c, saturation, 1, scaled(vd, -1));
        id = sub(id, to_drain);
        is = sub(is, to_source);
        ib = add(to_source, to_drain);
    }
    state->current = id.v; /* at the terminal, with the leakage of the junction */
    state->gm = slope_of(&id, g) * sign;
    state->gds = slope_of(&id, d) * sign;
    state->gmb = slope_of(&id, b) * sign;
    f[d] = scaled(id, sign);
    f[s] = scaled(is, sign);
    f[g] = constant(0);
    if (b >= 0) {
        f[b] = scaled(ib, sign);
    }
}

/* ---- diode: exponential law with breakdown ---- */

static void diode(const struct context *c, const struct dual *x, struct dual *f,
                  struct quad_device_state *state)
{
    const quad n = model(c, "emission");
    const quad scale = own_or(c, "area", 1) * own_or(c, "m", 1);
    const quad saturation = saturation_at(c, model(c, "saturation_current"), n, model(c, "bandgap"),
                                          model(c, "saturation_exponent"));
    const struct dual v = sub(x[0], x[1]);
    struct dual i = junction(c, saturation, n, v);
    quad vz = model(c, "breakdown_voltage");
    if (is_number(vz)) {
        vz *= 1 + model(c, "breakdown_tempco") * (c->kelvin - c->measured);
        const struct dual over =
            scaled(shifted(v, vz), -1 / (model(c, "breakdown_emission") * c->ut));
        i = sub(i, scaled(dual_exp(over), model(c, "breakdown_current")));
    }
    f[0] = scaled(i, scale);
    f[1] = scaled(f[0], -1);
    state->current = f[0].v;
}

/* ---- bipolar transistor: Gummel and Poon 1970 ---- */

static quad bipolar_leak(const struct context *c, const char *current, const char *emission)
{
    const quad n = model(c, emission);
    const quad ratio = c->kelvin / c->measured;
    return model_if(c, EFFECT_LEAKAGE, current) *
           powq(ratio, model(c, "saturation_exponent") / n - model(c, "beta_exponent")) *
           expq(model(c, "bandgap") / (n * c->ut) * (ratio - 1));
}

static struct dual base_charge(const struct context *c, struct dual vbe, struct dual vbc,
                               struct dual forward, struct dual reverse)
{
    struct dual below = constant(1);
    if (on(c, EFFECT_MODULATION)) {
        const quad va = model(c, "early"), vb = model(c, "early_reverse");
        below = is_number(va) ? sub(below, scaled(vbc, 1 / va)) : below;
        below = is_number(vb) ? sub(below, scaled(vbe, 1 / vb)) : below;
    }
    struct dual q2 = constant(0);
    if (on(c, EFFECT_GAIN)) {
        const quad ik = model(c, "knee"), ikr = model(c, "knee_reverse");
        q2 = is_number(ik) ? add(q2, scaled(forward, 1 / ik)) : q2;
        q2 = is_number(ikr) ? add(q2, scaled(reverse, 1 / ikr)) : q2;
    }
    const struct dual root = dual_sqrt(shifted(scaled(q2, 4), 1));
    return div_by(scaled(shifted(root, 1), (quad)1 / 2), below);
}

static void bipolar(const struct context *c, const struct dual *x, struct dual *f,
                    struct quad_device_state *state)
{
    const quad sign = c->instance->type->polarity;
    const int tc = terminal(c, "c"), tb = terminal(c, "b"), te = terminal(c, "e");
    const struct dual vbe = scaled(sub(x[tb], x[te]), sign);
    const struct dual vbc = scaled(sub(x[tb], x[tc]), sign);
    const quad saturation =
        saturation_at(c, model(c, "saturation_current") * (1 + own_or(c, "saturation_shift", 0)), 1,
                      model(c, "bandgap"), model(c, "saturation_exponent"));
    const struct dual forward = junction(c, saturation, model(c, "emission"), vbe);
    const struct dual reverse = junction(c, saturation, model(c, "emission_reverse"), vbc);
    const struct dual leak_e = junction(c, bipolar_leak(c, "leak_emitter", "leak_emitter_emission"),
                                        model(c, "leak_emitter_emission"), vbe);
    const struct dual leak_c =
        junction(c, bipolar_leak(c, "leak_collector", "leak_collector_emission"),
                 model(c, "leak_collector_emission"), vbc);
    struct dual base_f = constant(0), base_r = constant(0);
    if (on(c, EFFECT_GAIN)) {
        const quad rise = powq(c->kelvin / c->measured, model(c, "beta_exponent"));
        base_f = scaled(forward, 1 / (model(c, "beta") * rise));
        base_r = scaled(reverse, 1 / (model(c, "beta_reverse") * rise));
    }
    const struct dual qb = base_charge(c, vbe, vbc, forward, reverse);
    const struct dual ic = sub(sub(div_by(sub(forward, reverse), qb), base_r), leak_c);
    const struct dual ib = add(add(base_f, base_r), add(leak_e, leak_c));
    const quad scale = own_or(c, "area", 1) * own_or(c, "m", 1);
    f[tc] = scaled(ic, sign * scale);
    f[tb] = scaled(ib, sign * scale);
    f[te] = scaled(add(f[tc], f[tb]), -1);
    state->current = ic.v * scale;
    state->gm = slope_of(&f[tc], tb);
}

/* ---- junction field-effect transistor: Shichman and Hodges 1968 ---- */

static void jfet(const struct context *c, const struct dual *x, struct dual *f,
                 struct quad_device_state *state)
{
    const quad sign = c->instance->type->polarity;
    const int d = terminal(c, "d"), g = terminal(c, "g"), s = terminal(c, "s");
    const quad dt = c->kelvin - c->measured;
    const quad idss = model(c, "idss") * (1 + model(c, "idss_tempco") * dt);
    const quad vp = sign * (model(c, "pinchoff") + model(c, "pinchoff_tempco") * dt);
    const quad scale = own_or(c, "area", 1) * own_or(c, "m", 1);
    const struct dual vgs = scaled(sub(x[g], x[s]), sign);
    const struct dual vgd = scaled(sub(x[g], x[d]), sign);
    const bool forward = vgs.v >= vgd.v;
    const struct dual over = shifted(forward ? vgs : vgd, -vp);
    const struct dual vds = forward ? sub(vgs, vgd) : sub(vgd, vgs);
    struct dual id = constant(0);
    if (over.v > 0) {
        id = vds.v >= over.v ? mul(over, over) : mul(vds, sub(scaled(over, 2), vds));
    }
    const quad va = model(c, "early");
    if (on(c, EFFECT_MODULATION) && is_number(va)) {
        id = mul(id, shifted(scaled(vds, 1 / va), 1));
    }
    id = scaled(id, idss / (vp * vp) * scale * (forward ? 1 : -1));
    state->headroom = vgs.v - vgd.v - (vgs.v - vp);
    struct dual is = scaled(id, -1), ig = constant(0);
    if (on(c, EFFECT_LEAKAGE)) {
        const quad n = model(c, "emission");
        const quad leak =
            scale * saturation_at(c, model(c, "saturation_current"), n, (quad)112 / 100, 3);
        const struct dual to_source = junction(c, leak, n, vgs);
        const struct dual to_drain = junction(c, leak, n, vgd);
        id = sub(id, to_drain);
        is = sub(is, to_source);
        ig = add(to_source, to_drain);
    }
    state->current = id.v; /* at the terminal, with the leakage of the junction */
    state->gm = slope_of(&id, g) * sign;
    state->gds = slope_of(&id, d) * sign;
    f[d] = scaled(id, sign);
    f[g] = scaled(ig, sign);
    f[s] = scaled(is, sign);
}

/* ---- resistor, sources, opamp ---- */

static quad held_or_own(const struct context *c, const char *name)
{
    const struct quad_question *question = c->question;
    const bool is_held =
        question->held >= 0 && &question->circuit->instances[question->held] == c->instance;
    return is_held ? (quad)question->held_value : own(c, name);
}

static void resistor(const struct context *c, const struct dual *x, struct dual *f,
                     struct quad_device_state *state)
{
    const quad dt = c->kelvin - c->measured;
    const quad r = held_or_own(c, "resistance") * (quad)c->question->circuit->resistor_factor *
                   (1 + own_or(c, "value_shift", 0)) *
                   (1 + own_or(c, "tempco", 0) * dt + own_or(c, "tempco2", 0) * dt * dt);
    f[0] = scaled(sub(x[0], x[1]), 1 / r);
    f[1] = scaled(f[0], -1);
    state->current = f[0].v;
}

/* A branch current i from a to b with the equation v(a) - v(b) = drop + r i. */
static void branch(const struct dual *x, quad drop, quad r, struct dual *f,
                   struct quad_device_state *state)
{
    f[0] = x[2];
    f[1] = scaled(x[2], -1);
    f[2] = shifted(sub(sub(x[0], x[1]), scaled(x[2], r)), -drop);
    state->current = x[2].v;
}

/* v(out) = mid + half tanh(gain (plus - minus + offset)/half) */
static void opamp(const struct context *c, const struct dual *x, struct dual *f)
{
    const int count = c->instance->type->terminal_count;
    const int out = terminal(c, "out"), plus = terminal(c, "plus"), minus = terminal(c, "minus");
    const quad high_value = own(c, "high"), low_value = own(c, "low");
    const struct dual high = is_number(high_value) ? constant(high_value) : x[terminal(c, "high")];
    const struct dual low = is_number(low_value) ? constant(low_value) : x[terminal(c, "low")];
    const struct dual mid = scaled(add(high, low), (quad)1 / 2);
    const struct dual half = scaled(sub(high, low), (quad)1 / 2);
    const struct dual in =
        scaled(shifted(sub(x[plus], x[minus]), own_or(c, "offset", 0)), own(c, "gain"));
    for (int k = 0; k < count; k++) {
        f[k] = constant(0);
    }
    f[out] = x[count];
    const struct dual swing = half.v == 0 ? constant(0) : mul(half, dual_tanh(div_by(in, half)));
    f[count] = sub(x[out], add(mid, swing));
}

/* ---- law and table ---- */

static struct dual law_power(struct dual a, struct dual b)
{
    if (b.n == 0) {
        return dual_power(a, b.v);
    }
    const quad v = powq(a.v, b.v);
    return chain2(v, b.v * v / a.v, &a, v * logq(a.v), &b);
}

static struct dual law_binary(enum law_operation operation, struct dual a, struct dual b)
{
    switch (operation) {
    case LAW_ADD:
        return add(a, b);
    case LAW_SUBTRACT:
        return sub(a, b);
    case LAW_MULTIPLY:
        return mul(a, b);
    case LAW_DIVIDE:
        return div_by(a, b);
    case LAW_POWER:
        return law_power(a, b);
    case LAW_MIN:
        return a.v <= b.v ? a : b;
    default: /* LAW_MAX */
        return a.v >= b.v ? a : b;
    }
}

static struct dual law_unary(enum law_operation operation, struct dual a)
{
    switch (operation) {
    case LAW_NEGATE:
        return scaled(a, -1);
    case LAW_SQRT:
        return dual_sqrt(a);
    case LAW_LN:
        return dual_log(a);
    case LAW_LOG10:
        return scaled(dual_log(a), 1 / logq(10));
    case LAW_EXP:
        return dual_exp(a);
    default: /* LAW_ABS */
        return a.v < 0 ? scaled(a, -1) : a;
    }
}

static bool is_binary(enum law_operation operation)
{
    return (operation >= LAW_ADD && operation <= LAW_POWER) || operation == LAW_MIN ||
           operation == LAW_MAX;
}

static void law(const struct context *c, const struct dual *x, struct dual *f,
                struct quad_device_state *state)
{
    const struct law_program *program = c->instance->extra;
    struct dual stack[LAW_STACK_LIMIT];
    int top = 0;
    stack[0] = constant(0);
    for (int k = 0; k < program->step_count; k++) {
        const struct law_step *step = &program->steps[k];
        if (step->operation == LAW_CONSTANT) {
            stack[top++] = constant(step->value);
        } else if (step->operation == LAW_INPUT) {
            stack[top++] = x[2 + step->index];
        } else if (is_binary(step->operation)) {
            top--;
            stack[top - 1] = law_binary(step->operation, stack[top - 1], stack[top]);
        } else {
            stack[top - 1] = law_unary(step->operation, stack[top - 1]);
        }
    }
    f[0] = stack[0];
    f[1] = scaled(stack[0], -1);
    state->current = f[0].v;
}

/* Cubic Hermite interpolation, straight outside the data (Fritsch and Carlson 1980). */
static void table(const struct context *c, const struct dual *x, struct dual *f,
                  struct quad_device_state *state)
{
    const struct curve *curve = c->instance->extra;
    const struct dual v = sub(x[0], x[1]);
    const int last = curve->count - 1;
    int k = 0;
    while (k < last - 1 && v.v >= curve->v[k + 1]) {
        k++;
    }
    if (v.v < curve->v[0] || v.v > curve->v[last]) {
        const int end = v.v < curve->v[0] ? 0 : last;
        f[0] = shifted(scaled(shifted(v, -(quad)curve->v[end]), curve->slope[end]), curve->i[end]);
    } else {
        const quad h = (quad)curve->v[k + 1] - (quad)curve->v[k];
        const struct dual t = scaled(shifted(v, -(quad)curve->v[k]), 1 / h);
        const struct dual s = shifted(scaled(t, -1), 1);
        /* i0 s^2 (1 + 2t) + i1 t^2 (1 + 2s) + h t s (m0 s - m1 t) */
        f[0] = add(scaled(mul(mul(s, s), shifted(scaled(t, 2), 1)), curve->i[k]),
                   scaled(mul(mul(t, t), shifted(scaled(s, 2), 1)), curve->i[k + 1]));
        const struct dual bend = sub(scaled(s, curve->slope[k]), scaled(t, curve->slope[k + 1]));
        f[0] = add(f[0], scaled(mul(mul(t, s), bend), h));
    }
    f[1] = scaled(f[0], -1);
    state->current = f[0].v;
}

static struct context context_of(const struct quad_question *question, int instance)
{
    struct context c = {.question = question, .instance = &question->circuit->instances[instance]};
    c.measured = c.instance->model != NULL ? (quad)c.instance->model->measured_kelvin
                                           : (quad)question->circuit->measured_kelvin;
    c.kelvin = on(&c, EFFECT_TEMPERATURE) ? (quad)question->kelvin : c.measured;
    c.ut = thermal_voltage(c.kelvin);
    return c;
}

void quad_evaluate(const struct quad_question *question, int instance, const struct dual *x,
                   struct dual *f, struct quad_device_state *state)
{
    const struct context c = context_of(question, instance);
    const char *word = c.instance->type->word;
    const quad none = not_a_number();
    *state = (struct quad_device_state){none, none, none, none, none, none, none, none};
    if (strcmp(word, "nmos") == 0 || strcmp(word, "pmos") == 0) {
        mos(&c, x, f, state);
    } else if (strcmp(word, "npn") == 0 || strcmp(word, "pnp") == 0) {
        bipolar(&c, x, f, state);
    } else if (strcmp(word, "njfet") == 0 || strcmp(word, "pjfet") == 0) {
        jfet(&c, x, f, state);
    } else if (strcmp(word, "diode") == 0) {
        diode(&c, x, f, state);
    } else if (strcmp(word, "resistor") == 0) {
        resistor(&c, x, f, state);
    } else if (strcmp(word, "series resistance") == 0) {
        branch(x, 0, on(&c, EFFECT_GAIN) ? (quad)c.instance->own[0] : 0, f, state);
    } else if (strcmp(word, "voltage") == 0) {
        branch(x, held_or_own(&c, "voltage"), 0, f, state);
    } else if (strcmp(word, "current") == 0) {
        f[0] = constant(held_or_own(&c, "current"));
        f[1] = scaled(f[0], -1);
        state->current = f[0].v;
    } else if (strcmp(word, "opamp") == 0) {
        opamp(&c, x, f);
    } else if (strcmp(word, "law") == 0) {
        law(&c, x, f, state);
    } else if (strcmp(word, "table") == 0) {
        table(&c, x, f, state);
    } else {
        fprintf(stderr, "the reference knows no device '%s'\n", word);
        abort();
    }
}

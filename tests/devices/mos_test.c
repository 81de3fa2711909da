/*
 * mos_test.c: the MOS transistor against 30-digit values, closed forms and its own derivatives.
 */
#include "device_check.h"

#include "devices/mos.h"

/* ---- 30-digit check values: the authors of the equations, 30 digits ---- */

struct check_value {
    double vg, vd, vs, id, qs, qd, vdsat;
};

enum model_set { SCALABLE, BODY_EARLY, BARE };

static const struct check_value scalable_8u[] = {
    {0.5, 1, 0, 2.995874454321e-7, 0.247661510014, 0.00791584267183, 0.150987228175},
    {0.8, 0.05, 0, 3.0956154502679e-6, 2.67760706461, 2.06930755027, 0.312768115226},
    {0.8, 0.9, 0, 8.945021063362e-6, 2.69122043628, 0.130344353566, 0.313673592501},
    {1.2, 0.9, 0, 4.7554291429049e-5, 7.17987282887, 0.534546904236, 0.611659713566},
    {1.2, 1.7, 0, 4.8162192664113e-5, 7.19445252953, 0.535394983729, 0.612625682797},
    {1.8, 1.8, 0, 0.00016009521710963, 14.4972976846, 1.43342068156, 1.09479186038},
    {1.5, 1.5, 0.6, 7.8767029924702e-6, 2.64241738683, 0.127112437568, 0.310427469085},
    {1.2, -0.3, 0, -6.1393490018715e-5, 11.3607834972, 7.16812344351, 0.888123568752},
    {0.3, 1, 0, 3.671595341878e-9, 0.00360424120647, 0.000109590005719, 0.134721864407},
};

static const struct check_value scalable_0u5[] = {
    {0.5, 1, 0, 1.0187936979454e-7, 0.0433286788434, 0.00192662935432, 0.123010557577},
    {0.8, 0.05, 0, 4.3657363964629e-6, 1.8160594618, 1.26120565816, 0.224292764833},
    {0.8, 0.9, 0, 1.0686505305168e-5, 1.86791806163, 0.156151250419, 0.227299006246},
    {1.2, 0.9, 0, 7.389846500733e-5, 6.33854006818, 0.976181230087, 0.484814555182},
    {1.2, 1.7, 0, 7.7270235363548e-5, 6.39754031064, 0.989561319951, 0.488153814337},
    {1.8, 1.8, 0, 0.00024671734536738, 13.8198097826, 3.00667012373, 0.891124136743},
    {1.5, 1.5, 0.6, 1.0684953194186e-5, 1.97572513353, 0.169570996846, 0.233551408288},
    {1.2, -0.3, 0, -0.00010347286141183, 10.4597301967, 6.29105825194, 0.71293707205},
    {0.3, 1, 0, 9.0962699680926e-10, 0.00038442536087, 1.67528868644e-5, 0.120626732165},
};

static const struct check_value body_early[] = {
    {0.5, 1, 0, 3.9317267849182e-7, 0.856715927988, 5.93570051769e-17, 0.146792800013},
    {0.8, 0.05, 0, 2.0042318782145e-6, 4.74764616752, 3.87602230638, 0.34672886608},
    {0.8, 0.9, 0, 6.5763489978908e-6, 4.74764616752, 3.86440321582e-11, 0.34672886608},
    {1.2, 0.9, 0, 3.0031446447253e-5, 10.8140324648, 1.63596398151e-5, 0.658451085924},
    {1.2, 1.7, 0, 3.0404829168081e-5, 10.8140324648, 4.90895282907e-19, 0.658451085924},
    {1.8, 1.8, 0, 0.00010147959483499, 20.4374297819, 4.32368738463e-12, 1.15295087989},
    {1.5, 1.5, 0.6, 5.818680938251e-6, 4.51654865882, 2.31569862774e-11, 0.334853884026},
    {1.2, -0.3, 0, -3.7246044846402e-5, 16.4427733989, 10.8140324648, 0.947684829529},
    {0.3, 1, 0, 2.4394458055302e-9, 0.00959448787649, 1.22139631096e-19, 0.103263330762},
};

static const struct check_value bare[] = {
    {0.5, 1, 0, 3.8548442756396e-7, 0.98208322451, 8.74331413538e-17, 0.153234818383},
    {0.8, 0.05, 0, 2.1100880703022e-6, 5.92197065005, 5.03050180378, 0.407071715443},
    {0.8, 0.9, 0, 8.117693770908e-6, 5.92197065005, 5.04749184729e-10, 0.407071715443},
    {1.2, 0.9, 0, 3.7672578055676e-5, 13.3017079634, 0.00289706879924, 0.786280685077},
    {1.2, 1.7, 0, 3.7673153431793e-5, 13.3017079634, 8.74331413538e-17, 0.786280685077},
    {1.8, 1.8, 0, 0.00012540383555864, 24.6693958152, 2.47414695303e-8, 1.37041112419},
    {1.5, 1.5, 0.6, 1.3378629773371e-5, 7.73454423192, 2.47414695303e-8, 0.500211095773},
    {1.2, -0.3, 0, -3.7291268620367e-5, 18.9626794563, 13.3017079634, 1.07717060104},
    {0.3, 1, 0, 5.7537611678911e-10, 0.00289706879924, 3.63895185849e-20, 0.102919182823},
};

/* The scalable n set of models/open130.process. */
static void set_scalable(struct subject *it)
{
    static const struct {
        const char *name;
        double value;
    } set[] = {
        {"threshold", 0.5087},
        {"kprime", 0.0005246},
        {"body_effect", 0.4028},
        {"phi", 0.7},
        {"slope_factor", 1.32},
        {"mobility_bulk", 0.9045},
        {"mobility_gate", 0.273},
        {"saturation_knee", 0.8811},
        {"mobility_gate_short", 0.1482},
        {"critical_field", 6.44e6},
        {"early", 3.807},
        {"early_exponent", 0.5},
        {"early_onset", 0.1},
        {"dibl", 0.004336},
        {"dibl_short", 0.02857},
        {"dibl_body", 0.5292},
        {"width_offset", 6.102e-8},
        {"halo_threshold", 0.08608},
        {"halo_body", 0.1399},
    };
    for (size_t k = 0; k < sizeof set / sizeof set[0]; k++) {
        set_value(it, set[k].name, set[k].value);
    }
}

static struct subject transistor(const char *word, enum model_set set, double width, double length)
{
    struct subject it = subject_of(device_find(word));
    if (set == SCALABLE) {
        set_scalable(&it);
    } else {
        set_value(&it, "threshold", 0.45);
        set_value(&it, "kprime", 300e-6);
        if (set == BODY_EARLY) {
            set_value(&it, "body_effect", 0.45);
            set_value(&it, "early", 8);
        }
    }
    set_value(&it, "W", width);
    set_value(&it, "L", length);
    it.conditions.kelvin = it.conditions.measured_kelvin = 298.15;
    prepare(&it);
    return it;
}

static void compare(struct subject *it, const struct check_value *rows, size_t count)
{
    for (size_t k = 0; k < count; k++) {
        const struct check_value *row = &rows[k];
        double p = it->type->polarity;
        double x[MOS_TERMINALS] = {p * row->vd, p * row->vg, p * row->vs, 0};
        double f[MOS_TERMINALS], jac[MOS_TERMINALS * MOS_TERMINALS];
        struct mos_inspection inner;
        it->type->evaluate(it->prepared, x, f, jac);
        mos_inspect((const struct mos_prepared *)(const void *)it->prepared, x, &inner);
        check_relative("id", p * f[MOS_D], row->id, 1e-10);
        check_relative("qs", inner.qs, row->qs, 1e-10);
        check_relative("qd", inner.qd, row->qd, 1e-10);
        check_relative("vdsat", inner.vdsat, row->vdsat, 1e-10);
        long double wide_x[MOS_TERMINALS] = {x[0], x[1], x[2], x[3]};
        long double wide[MOS_TERMINALS], wide_jac[MOS_TERMINALS * MOS_TERMINALS];
        it->type->evaluate_extended(it->prepared, wide_x, wide, wide_jac);
        check_relative("id in long double", p * (double)wide[MOS_D], row->id, 1e-10);
    }
}

#define COMPARE(it, rows) compare(&(it), rows, sizeof(rows) / sizeof((rows)[0]))

static void meets_check_values(void **state)
{
    (void)state;
    static const char *const words[] = {"nmos", "pmos"};
    for (int k = 0; k < 2; k++) {
        struct subject it = transistor(words[k], SCALABLE, 7e-6, 8e-6);
        COMPARE(it, scalable_8u);
        it = transistor(words[k], SCALABLE, 1e-6, 0.5e-6);
        COMPARE(it, scalable_0u5);
        it = transistor(words[k], BODY_EARLY, 4e-6, 8e-6);
        COMPARE(it, body_early);
        it = transistor(words[k], BARE, 4e-6, 8e-6);
        COMPARE(it, bare);
    }
}

/* ---- derivatives and smoothness ---- */

static void check_grid(struct subject *it, struct strictness strict)
{
    static const double drain[] = {-1.8, -0.4, -0.05, -1e-3, 0, 1e-7, 0.02, 0.15, 0.5, 1.1, 2};
    static const double gate[] = {-0.7, 0, 0.31, 0.48, 0.6, 0.9, 1.8};
    static const double source[] = {-0.3, 0, 0.4};
    static const double bulk[] = {-1, 0.05};
    for (size_t d = 0; d < sizeof drain / sizeof drain[0]; d++) {
        for (size_t g = 0; g < sizeof gate / sizeof gate[0]; g++) {
            for (size_t s = 0; s < sizeof source / sizeof source[0]; s++) {
                for (size_t b = 0; b < sizeof bulk / sizeof bulk[0]; b++) {
                    double p = it->type->polarity;
                    double x[MOS_TERMINALS] = {p * (drain[d] + source[s]),
                                               p * (gate[g] + source[s]), p * source[s],
                                               p * bulk[b]};
                    check_bias(it, x, strict);
                }
            }
        }
    }
}

static void derivatives_are_exact(void **state)
{
    (void)state;
    static const char *const words[] = {"nmos", "pmos"};
    for (int k = 0; k < 2; k++) {
        struct subject it = transistor(words[k], SCALABLE, 7e-6, 8e-6);
        check_grid(&it, STRICT);
        it = transistor(words[k], SCALABLE, 1e-6, 0.15e-6);
        check_grid(&it, STRICT);
        it = transistor(words[k], BODY_EARLY, 4e-6, 8e-6);
        check_grid(&it, STRICT);
        it = transistor(words[k], BARE, 4e-6, 8e-6);
        check_grid(&it, STRICT);
        set_value(&it, "junction_leak", 1e-9);
        prepare(&it);
        check_grid(&it, STRICT);
    }
}

static void every_effect_has_exact_derivatives(void **state)
{
    (void)state;
    struct subject it = transistor("nmos", SCALABLE, 1e-6, 0.5e-6);
    set_value(&it, "junction_leak", 1e-9);
    for (unsigned effects = EFFECT_INVERSION; effects <= EFFECTS_FULL; effects++) {
        it.conditions.effects = effects | EFFECT_INVERSION;
        prepare(&it);
        double x[MOS_TERMINALS] = {0.37, 0.71, 0.03, -0.2};
        check_bias(&it, x, STRICT);
    }
    for (unsigned effects = 0; effects <= EFFECTS_FULL; effects++) {
        it.conditions.effects = effects & ~(unsigned)EFFECT_INVERSION;
        prepare(&it); /* away from the joints of max(v, 0) */
        double x[MOS_TERMINALS] = {0.37, 0.91, 0.03, -0.2};
        check_bias(&it, x, STRICT);
    }
}

/* A share w of inversion is the all-region transistor whose thermal voltage is w times smaller:
 * with q = w y, U^2 (q^2 + w q) = (w U)^2 (y^2 + y) and 2 q + w ln(q/w) = v/U becomes 2 y + ln y =
 * v/(w U).
 */
static void way_to_square_law_is_a_colder_transistor(void **state)
{
    (void)state;
    static const double shares[] = {1, 0.5, 0.125, 1.0 / 1024};
    struct subject it = transistor("nmos", BARE, 4e-6, 8e-6);
    struct subject colder = transistor("nmos", BARE, 4e-6, 8e-6);
    it.conditions.effects = colder.conditions.effects = EFFECT_INVERSION;
    for (size_t k = 0; k < sizeof shares / sizeof shares[0]; k++) {
        it.conditions.inversion_cut = 1 - shares[k];
        set_value(&colder, "slope_factor", shares[k]);
        prepare(&it);
        prepare(&colder);
        for (double gate = 0.3; gate < 1.5; gate += 0.1) {
            const double x[MOS_TERMINALS] = {0.2, gate, 0.03, 0};
            double f[MOS_TERMINALS], g[MOS_TERMINALS], jac[MOS_TERMINALS * MOS_TERMINALS];
            it.type->evaluate(it.prepared, x, f, jac);
            colder.type->evaluate(colder.prepared, x, g, jac);
            assert_true(fabs(f[MOS_D] - g[MOS_D]) <= 1e-12 * fabs(g[MOS_D]));
            check_bias(&it, x, STRICT);
        }
    }
}

static void far_voltages_stay_finite(void **state)
{
    (void)state;
    struct subject it = transistor("nmos", SCALABLE, 1e-6, 0.15e-6);
    set_value(&it, "junction_leak", 1e-9);
    for (unsigned effects = 0; effects <= EFFECTS_FULL; effects += 15) {
        it.conditions.effects = effects;
        prepare(&it);
        check_far(&it);
    }
    it.conditions.effects = EFFECTS_FULL;
    prepare(&it);
    check_far(&it);
}

static void drain_and_source_exchange(void **state)
{
    (void)state;
    struct subject it = transistor("pmos", SCALABLE, 1e-6, 0.5e-6);
    set_value(&it, "junction_leak", 1e-9);
    prepare(&it);
    double x[MOS_TERMINALS] = {-0.731, -0.9, -0.217, 0.1};
    double y[MOS_TERMINALS] = {x[MOS_S], x[MOS_G], x[MOS_D], x[MOS_B]};
    double f[MOS_TERMINALS], h[MOS_TERMINALS], jac[MOS_TERMINALS * MOS_TERMINALS];
    it.type->evaluate(it.prepared, x, f, jac);
    it.type->evaluate(it.prepared, y, h, jac);
    assert_true(f[MOS_D] <= h[MOS_S] && f[MOS_D] >= h[MOS_S]);
    assert_true(f[MOS_S] <= h[MOS_D] && f[MOS_S] >= h[MOS_D]);
}

/* Near x = 0 the current is x times a conductance: to the last digits, not only absolutely. */
static void small_drain_voltages_keep_their_digits(void **state)
{
    (void)state;
    struct subject it = transistor("nmos", SCALABLE, 7e-6, 8e-6);
    static const double gate[] = {0.2, 0.5, 0.8, 1.8};
    for (int k = 0; k < 4; k++) {
        for (double vds = 1e-18; vds < 1e-3; vds *= 7) {
            double x[MOS_TERMINALS] = {vds, gate[k], 0, 0};
            long double y[MOS_TERMINALS] = {(long double)vds, (long double)gate[k], 0, 0};
            double f[MOS_TERMINALS], jac[MOS_TERMINALS * MOS_TERMINALS];
            long double h[MOS_TERMINALS], wide_jac[MOS_TERMINALS * MOS_TERMINALS];
            it.type->evaluate(it.prepared, x, f, jac);
            it.type->evaluate_extended(it.prepared, y, h, wide_jac);
            check_relative("id", f[MOS_D], (double)h[MOS_D], 1e-13);
            check_relative("gm", jac[MOS_G], (double)wide_jac[MOS_G], 1e-12);
        }
    }
}

/* Output conductance stays positive (docs/devices.md). */
static void output_conductance_is_positive(void **state)
{
    (void)state;
    static const double lengths[] = {0.15e-6, 0.5e-6, 8e-6};
    for (int k = 0; k < 3; k++) {
        struct subject it = transistor("nmos", SCALABLE, 1e-6, lengths[k]);
        for (double vg = -0.2; vg < 1.9; vg += 0.07) {
            for (double vd = 0; vd < 2; vd += 0.013) {
                double x[MOS_TERMINALS] = {vd, vg, 0, 0};
                double f[MOS_TERMINALS], jac[MOS_TERMINALS * MOS_TERMINALS];
                it.type->evaluate(it.prepared, x, f, jac);
                assert_true(jac[0] > 0);
            }
        }
    }
}

/* ---- closed forms ---- */

/* 2q + ln q = v to the end of either type, by a slow Newton iteration of the test's own. */
static void charge_is_exact(void **state)
{
    (void)state;
    struct subject it = transistor("nmos", BARE, 4e-6, 8e-6);
    const struct mos_prepared *p = (const struct mos_prepared *)(const void *)it.prepared;
    for (double v = -500; v < 3e4; v += v < -60 ? 37.3 : v < 60 ? 0.37 : 0.3 * v) {
        double x[MOS_TERMINALS] = {p->vt + p->U * v + 50, p->vt + p->U * v, 0, 0};
        long double wide_x[MOS_TERMINALS] = {(long double)x[0], (long double)x[1], 0, 0};
        long double exact = ((long double)x[1] - (long double)p->vt) / (long double)p->U;
        long double y = exact > 1 ? logl(exact / 2) : exact; /* ln q */
        for (int step = 0; step < 60; step++) {
            y -= (2 * expl(y) + y - exact) / (2 * expl(y) + 1);
        }
        long double q = expl(y);
        long double f[MOS_TERMINALS], jac[MOS_TERMINALS * MOS_TERMINALS];
        it.type->evaluate_extended(it.prepared, wide_x, f, jac);
        long double scale = 2 * (long double)p->beta * (long double)p->U * (long double)p->U;
        long double error = fabsl(f[MOS_D] / (scale * q * (q + 1)) - 1);
        if (!((double)error <= 1e-18 * (1 + fabs(v)))) {
            complain(&it, x, "charge", 0, 0, (double)f[MOS_D], (double)error);
        }
        struct mos_inspection inner;
        mos_inspect(p, x, &inner);
        check_relative("qs", inner.qs, (double)q, 1e-15 * (2 + fabs(v < 0 ? v : 0)));
    }
}

/* n UT gm/ID = G(IC) = 2/(1 + sqrt(1 + 4 IC)): Enz and Vittoz (2006), Binkley
 * (2008). n is 1 here; slope_factor takes its place. */
static void follows_the_inversion_coefficient(void **state)
{
    (void)state;
    struct subject it = transistor("nmos", BARE, 4e-6, 8e-6);
    static const struct {
        double inversion, G, tolerance;
    } published[] = {
        {0.01, 0.990, 0.0005}, {0.1, 0.916, 0.0005},   {1, 0.618, 0.0005},
        {10, 0.270, 0.0005},   {100, 0.0951, 0.00005},
    };
    double UT = BOLTZMANN_OVER_CHARGE * 298.15;
    for (size_t k = 0; k < sizeof published / sizeof published[0]; k++) {
        double inversion = published[k].inversion;
        double q = (sqrt(1 + 4 * inversion) - 1) / 2;
        double vg = 0.45 + UT * (2 * q + log(q)); /* the charge equation, taken forwards */
        double x[MOS_TERMINALS] = {vg + 1.5, vg, 0, 0};
        check_relative("inversion", quantity(&it, "inversion", x), inversion, 1e-12);
        check_relative("id", quantity(&it, "id", x), 2 * 300e-6 * 0.5 * UT * UT * inversion, 1e-12);
        double G = UT * quantity(&it, "gm_id", x);
        check_absolute("G", G, published[k].G, published[k].tolerance);
        check_relative("G", G, 2 / (1 + sqrt(1 + 4 * inversion)), 1e-12);
        /* Enz and Vittoz: vdsat = UT (2 sqrt(IC + 1/4) + 3) */
        check_relative("vdsat", quantity(&it, "vdsat", x), UT * (2 * sqrt(inversion + 0.25) + 3),
                       1e-12);
        /* M08: weak below 0.1, strong above 10 */
        unsigned wanted = inversion < 0.099  ? REGION_WEAK
                          : inversion > 10.1 ? REGION_STRONG
                                             : REGION_MODERATE;
        if (k != 1 && k != 3) {
            assert_int_equal(region(&it, x) & (REGION_WEAK | REGION_MODERATE | REGION_STRONG),
                             wanted);
        }
    }
}

/* Weak inversion: n slope_factor UT ln 10 per decade. */
static void weak_inversion_has_its_slope(void **state)
{
    (void)state;
    struct subject it = transistor("nmos", BARE, 4e-6, 8e-6);
    set_value(&it, "slope_factor", 1.4);
    prepare(&it);
    double low[MOS_TERMINALS] = {1, -0.40, 0, 0}, high[MOS_TERMINALS] = {1, -0.35, 0, 0};
    double decades = log10(quantity(&it, "id", high) / quantity(&it, "id", low));
    check_relative("V per decade", 0.05 / decades, 1.4 * BOLTZMANN_OVER_CHARGE * 298.15 * log(10.0),
                   1e-8);
}

/* The hand view is the square law, in saturation, triode and off. */
static void hand_view_is_the_square_law(void **state)
{
    (void)state;
    struct subject it = transistor("nmos", SCALABLE, 7e-6, 8e-6);
    it.conditions.effects = EFFECTS_HAND;
    it.conditions.kelvin = 350; /* does not count */
    prepare(&it);
    double K = 0.0005246 * 7 / 8 / 2, vt = 0.5087;
    double saturated[MOS_TERMINALS] = {1.5, 1.1, 0.2, -0.4};
    check_relative("saturated", quantity(&it, "id", saturated), K * pow(0.9 - vt, 2), 1e-13);
    check_relative("vth", quantity(&it, "vth", saturated), vt, 1e-15);
    check_relative("vdsat", quantity(&it, "vdsat", saturated), 0.9 - vt, 1e-13);
    double triode[MOS_TERMINALS] = {0.35, 1.1, 0.2, -0.4};
    check_relative("triode", quantity(&it, "id", triode), K * (2 * (0.9 - vt) * 0.15 - 0.15 * 0.15),
                   1e-13);
    assert_int_equal(region(&it, triode), REGION_STRONG | REGION_TRIODE);
    double off[MOS_TERMINALS] = {1.5, 0.6, 0.2, -0.4};
    check_absolute("off", quantity(&it, "id", off), 0, 0);
    assert_int_equal(region(&it, off), REGION_OFF);
    double reversed[MOS_TERMINALS] = {0.2, 1.1, 1.5, -0.4};
    check_relative("reversed", quantity(&it, "id", reversed), -K * pow(0.9 - vt, 2), 1e-13);
    assert_true((region(&it, reversed) & REGION_REVERSED) != 0);
}

/* One effect on the hand view at a time, each by its textbook formula. */
static void single_effects_follow_their_formula(void **state)
{
    (void)state;
    struct subject it = transistor("nmos", BODY_EARLY, 4e-6, 8e-6);
    double K = 300e-6 * 4 / 8 / 2;
    double x[MOS_TERMINALS] = {3, 2, 0.5, 0};
    it.conditions.effects = EFFECT_MODULATION; /* 8 V at 1 um is 64 V at 8 um; from the knee on */
    prepare(&it);
    double saturated = K * 1.05 * 1.05;
    double ratio = pow(1.05 / 2.5, 12);
    double knee = 1.05 * pow(1 + ratio, -1.0 / 12);
    check_relative("modulation", quantity(&it, "id", x), saturated * (1 + (2.5 - knee) / 64),
                   1e-12);
    it.conditions.effects = EFFECT_BODY;
    prepare(&it);
    double vth = 0.45 + 0.45 * (sqrt(0.8 + 0.5) - sqrt(0.8));
    check_relative("vth", quantity(&it, "vth", x), vth, 1e-12);
    check_relative("overdrive", quantity(&it, "overdrive", x), 1.5 - vth, 1e-12);
    it.conditions.effects = EFFECT_TEMPERATURE;
    it.conditions.kelvin = 358.15;
    prepare(&it);
    check_relative("temperature", quantity(&it, "id", x),
                   K * pow(358.15 / 298.15, -1.5) * pow(1.5 - 0.45 + 0.06, 2), 1e-12);
}

static void hand_transistor_agrees_in_both_views(void **state)
{
    (void)state;
    struct subject it = subject_of(device_find("pmos")->alternative);
    set_value(&it, "conduction", 2e-3);
    set_value(&it, "threshold", 0.7);
    set_value(&it, "early", 40);
    it.conditions.effects = EFFECT_MODULATION;
    prepare(&it);
    double x[MOS_TERMINALS] = {0, 3, 5, 5};
    double wanted = 2e-3 * 1.3 * 1.3 * (1 + 5.0 / 40);
    check_relative("square law", quantity(&it, "id", x), wanted, 1e-13);
    it.conditions.effects = EFFECTS_FULL;
    prepare(&it);
    /* strong inversion: 2q + ln q = v makes q fall short of v/2 by ln(q)/2; 19.3 here */
    check_relative("all regions", quantity(&it, "id", x), wanted, 0.12);
    double v = 1.3 / (1.3 * BOLTZMANN_OVER_CHARGE * 300.15), q = v / 2;
    for (int k = 0; k < 60; k++) {
        q -= (2 * q + log(q) - v) / (2 + 1 / q);
    }
    double U = 1.3 * BOLTZMANN_OVER_CHARGE * 300.15;
    check_relative("charge form", quantity(&it, "id", x),
                   4 * 2e-3 * U * U * (q * q + q) * (1 + 5.0 / 40), 1e-12);
    check_grid(&it, STRICT);
    check_far(&it);
}

/* Off and reverse biased, the drain carries junction_leak W m, grown with temperature by the law
 * of docs/devices.md (emission 1, 1.12 V, cube). */
static void bulk_junctions_leak(void **state)
{
    (void)state;
    struct subject it = transistor("pmos", BARE, 4e-6, 8e-6);
    set_value(&it, "junction_leak", 1e-9);
    set_value(&it, "m", 3);
    it.conditions.kelvin = 398.15;
    prepare(&it);
    double UT = 1.380649e-23 * 398.15 / 1.602176634e-19, ratio = 398.15 / 298.15;
    double leak = 1e-9 * 4e-6 * 3 * pow(ratio, 3) * exp(1.12 / UT * (ratio - 1));
    double x[MOS_TERMINALS] = {-3, 3, -2, 0};
    double f[MOS_TERMINALS], jac[MOS_TERMINALS * MOS_TERMINALS];
    it.type->evaluate(it.prepared, x, f, jac);
    check_relative("drain", f[MOS_D], -leak, 1e-9);
    check_relative("source", f[MOS_S], -leak, 1e-9);
    check_relative("bulk", f[MOS_B], 2 * leak, 1e-9);
    double forward[MOS_TERMINALS] = {0, 0, 0, -0.5}, dx[MOS_TERMINALS] = {0, 0, 0, -3};
    assert_true(it.type->longest_step(it.prepared, forward, dx) < 0.4);
    it.conditions.effects = EFFECTS_HAND;
    prepare(&it);
    it.type->evaluate(it.prepared, x, f, jac);
    check_absolute("hand view", f[MOS_B], 0, 0);
}

static void deviates_have_the_published_pair_sigma(void **state)
{
    (void)state;
    /* Pelgrom, Duinmaijer and Welbers (1989), from memory: 30 mV um and 2.3 % um give 1.5 mV and
     * 0.115 % for 20 um by 20 um */
    struct subject it = transistor("nmos", BARE, 20e-6, 20e-6);
    set_value(&it, "match_threshold", 30e-9);
    set_value(&it, "match_gain", 0.023e-6);
    assert_int_equal(it.type->deviate_count, 2);
    double pair = sqrt(2.0);
    check_relative("threshold", pair * it.type->deviates[0].sigma(values_of(&it)), 1.5e-3, 1e-12);
    check_relative("gain", pair * it.type->deviates[1].sigma(values_of(&it)), 0.00115, 1e-12);
    it.own[it.type->deviates[0].own_parameter] = 0.01;
    it.own[it.type->deviates[1].own_parameter] = 0.05;
    it.conditions.effects = EFFECTS_HAND;
    prepare(&it);
    double x[MOS_TERMINALS] = {2, 1.46, 0, 0};
    check_relative("shifted", quantity(&it, "id", x), 1.05 * 150e-6, 1e-12);
}

static void quantities_are_positive_for_both_polarities(void **state)
{
    (void)state;
    struct subject n = transistor("nmos", SCALABLE, 7e-6, 8e-6);
    struct subject p = transistor("pmos", SCALABLE, 7e-6, 8e-6);
    double x[MOS_TERMINALS] = {1.3, 0.9, 0.1, 0}, y[MOS_TERMINALS] = {-1.3, -0.9, -0.1, 0};
    for (int k = 0; k < n.type->quantity_count; k++) {
        const char *name = n.type->quantities[k].name;
        check_relative(name, quantity(&p, name, y), quantity(&n, name, x), 1e-14);
    }
    check_relative("power", quantity(&n, "power", x), 1.2 * quantity(&n, "id", x), 1e-13);
    check_relative("headroom", quantity(&n, "headroom", x), 1.2 - quantity(&n, "vdsat", x), 1e-13);
    int high, low;
    double volts;
    assert_true(p.type->typical(p.prepared, &high, &low, &volts));
    assert_int_equal(high, MOS_S);
    assert_int_equal(low, MOS_G);
    assert_true(volts > 0.65 && volts < 0.75);
    /* a gate step of 10 V up is cut to 1 + ln 10, down it is not */
    double dx[MOS_TERMINALS] = {0, -10, 0, 0};
    check_relative("step", p.type->longest_step(p.prepared, y, dx), (1 + log(10.0)) / 10, 1e-12);
    dx[MOS_G] = 10;
    check_relative("step", p.type->longest_step(p.prepared, y, dx), 1, 0);
}

static void wrong_geometry_is_told(void **state)
{
    (void)state;
    struct subject it = transistor("nmos", SCALABLE, 7e-6, 8e-6);
    set_value(&it, "W", 50e-9);
    assert_non_null(strstr(complaint(&it), "width_offset"));
    set_value(&it, "W", 1e-6);
    set_value(&it, "length_offset", 9e-6);
    assert_non_null(strstr(complaint(&it), "length_offset"));
    set_value(&it, "length_offset", 0);
    set_value(&it, "L", 10e-9);
    assert_non_null(strstr(complaint(&it), "halo_body"));
    set_value(&it, "L", 8e-6);
    set_value(&it, "narrow_body", 1);
    assert_non_null(strstr(complaint(&it), "narrow_body"));
    set_value(&it, "narrow_body", 0);
    set_value(&it, "narrow_slope", -1);
    assert_non_null(strstr(complaint(&it), "narrow_slope"));
}

/*
 * Short and narrow: halo terms as (sqrt(1 + P/L) - 1)/sqrt(P/1 um), narrow terms as 1 um/W. Values
 * by hand for P = 3 um, L = 1 um (sqrt(4) - 1 = 1 over sqrt(3)), W = 0.5 um, and
 * narrow_slope 0.3 times 2/(1 + 0.5/1) = 4/3, which is 0.4.
 */
static void short_and_narrow_follow_their_laws(void **state)
{
    (void)state;
    struct subject it = transistor("nmos", BODY_EARLY, 0.5e-6, 1e-6);
    const struct mos_prepared *p = (const struct mos_prepared *)(const void *)it.prepared;
    double unit = p->U, body = p->g, halo = 1 / sqrt(3);
    set_value(&it, "halo_threshold", 0.1);
    set_value(&it, "halo_body", 0.2);
    set_value(&it, "halo_length", 3e-6);
    set_value(&it, "narrow_threshold", 0.01);
    set_value(&it, "narrow_body", 0.03);
    set_value(&it, "narrow_slope", 0.3);
    set_value(&it, "narrow_slope_length", 0.5e-6);
    prepare(&it);
    check_relative("vt", p->vt, 0.45 + 0.1 * halo + 0.02, 1e-14);
    check_relative("g", p->g, body * (1 - 0.2 * halo - 0.06), 1e-14);
    check_relative("U", p->U, unit * 1.4, 1e-14);
    /* far below the halo length, and without one: 1/sqrt(L) */
    set_value(&it, "L", 0.25e-6);
    set_value(&it, "halo_length", 1e6);
    prepare(&it);
    check_relative("vt, short", p->vt, 0.45 + 0.1 * 2 + 0.02, 1e-6);
    set_value(&it, "halo_length", PARAMETER_NONE);
    prepare(&it);
    check_relative("vt, no length", p->vt, 0.45 + 0.1 * 2 + 0.02, 1e-14);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(meets_check_values),
        cmocka_unit_test(short_and_narrow_follow_their_laws),
        cmocka_unit_test(derivatives_are_exact),
        cmocka_unit_test(every_effect_has_exact_derivatives),
        cmocka_unit_test(way_to_square_law_is_a_colder_transistor),
        cmocka_unit_test(far_voltages_stay_finite),
        cmocka_unit_test(drain_and_source_exchange),
        cmocka_unit_test(small_drain_voltages_keep_their_digits),
        cmocka_unit_test(output_conductance_is_positive),
        cmocka_unit_test(charge_is_exact),
        cmocka_unit_test(follows_the_inversion_coefficient),
        cmocka_unit_test(weak_inversion_has_its_slope),
        cmocka_unit_test(hand_view_is_the_square_law),
        cmocka_unit_test(single_effects_follow_their_formula),
        cmocka_unit_test(hand_transistor_agrees_in_both_views),
        cmocka_unit_test(bulk_junctions_leak),
        cmocka_unit_test(deviates_have_the_published_pair_sigma),
        cmocka_unit_test(quantities_are_positive_for_both_polarities),
        cmocka_unit_test(wrong_geometry_is_told),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}

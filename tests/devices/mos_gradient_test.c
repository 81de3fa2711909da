/*
 * mos_gradient_test.c: current and derivatives of mos_gradient.c against mos_current.c.
 *
 * The current must be the same one; each derivative is held against fourth-order differences of
 * the extended-precision current in that constant, whose own error is below 1e-11 of the terms.
 */
#include "device_check.h"

#include "devices/mos.h"
#include "devices/mos_gradient.h"

/* A scalable set like that of models/open130.process; every term is in use. */
static struct subject measured_set(const char *word, double width, double length)
{
    static const struct {
        const char *name;
        double value;
    } values[] = {
        {"threshold", 0.5087},
        {"kprime", 524.6e-6},
        {"body_effect", 0.4028},
        {"phi", 0.7},
        {"slope_factor", 1.32},
        {"mobility_bulk", 0.9045},
        {"mobility_gate", 0.273},
        {"early", 3.807},
        {"mobility_gate_short", 0.1482},
        {"critical_field", 6.44e6},
        {"dibl", 0.004336},
        {"saturation_knee", 0.8811},
        {"early_exponent", 0.5},
        {"early_onset", 0.1},
        {"dibl_short", 0.02857},
        {"dibl_body", 0.5292},
        {"halo_body", 0.1399},
        {"width_offset", 61.02e-9},
        {"halo_threshold", 86.08e-3},
    };
    struct subject it = subject_of(device_find(word));
    for (size_t k = 0; k < sizeof values / sizeof values[0]; k++) {
        set_value(&it, values[k].name, values[k].value);
    }
    set_value(&it, "W", width);
    set_value(&it, "L", length);
    prepare(&it);
    return it;
}

/* The place of a constant in the prepared block; phi has its root beside it. */
static double *place(struct mos_prepared *p, int constant)
{
    double *places[MOS_CONSTANTS] = {
        [MOS_U] = &p->U,
        [MOS_VT] = &p->vt,
        [MOS_BODY] = &p->g,
        [MOS_PHI] = &p->phi,
        [MOS_SIGMA] = &p->sigma,
        [MOS_DIBL_BODY] = &p->dibl_body,
        [MOS_BETA] = &p->beta,
        [MOS_LAM] = &p->lam,
        [MOS_KNEE] = &p->knee,
        [MOS_BULK_MOBILITY] = &p->bulk_mobility,
        [MOS_GATE_MOBILITY] = &p->gate_mobility,
        [MOS_INVERSE_EARLY] = &p->inverse_early,
        [MOS_EARLY_ONSET] = &p->early_onset,
    };
    return places[constant];
}

static long double current_at(const struct mos_prepared *p, double vgs, double vds, double vsb)
{
    long double x[4] = {(long double)vds + vsb, (long double)vgs + vsb, vsb, 0};
    long double f[4], jac[16];
    for (int k = 0; k < 4; k++) {
        x[k] *= p->polarity;
    }
    mos_evaluate_extended(p, x, f, jac);
    return p->polarity * f[MOS_D];
}

static long double difference(const struct mos_prepared *from, int constant, double h, double vgs,
                              double vds, double vsb)
{
    static const double steps[4] = {-2, -1, 1, 2}, weights[4] = {1, -8, 8, -1};
    long double sum = 0;
    for (int k = 0; k < 4; k++) {
        struct mos_prepared p = *from;
        double *at = place(&p, constant);
        volatile double moved = *at + steps[k] * h;
        *at = moved;
        p.root_phi = sqrt(p.phi);
        sum += weights[k] * current_at(&p, vgs, vds, vsb);
    }
    return sum / (12 * (long double)h);
}

static void check_point(struct subject *it, double vgs, double vds, double vsb)
{
    const struct mos_prepared *p = (const void *)it->prepared;
    double gradient[MOS_CONSTANTS], constants[MOS_CONSTANTS];
    double current = mos_gradient(p, vgs, vds, vsb, gradient);
    double wanted = (double)current_at(p, vgs, vds, vsb);
    check_relative("current", current, wanted, 2e-13);
    mos_constants(p, constants);
    for (int k = 0; k < MOS_CONSTANTS; k++) {
        double h = 2e-4 * fabs(constants[k]);
        if (k == MOS_U || k == MOS_VT || k == MOS_BODY || k == MOS_PHI) {
            h *= 0.2; /* these stand in exponents */
        }
        double slope = (double)difference(p, k, h, vgs, vds, vsb);
        /* relative to the current a full change of the constant would make */
        double allowed = 2e-9 * fabs(slope) + 1e-11 * fabs(wanted / constants[k]);
        if (!(fabs(gradient[k] - slope) <= allowed)) {
            fail_msg("constant %d at %g %g %g: %.12g, differences say %.12g", k, vgs, vds, vsb,
                     gradient[k], slope);
        }
    }
}

/* Far below threshold the charges are plain exponentials (-50 and below in units of UT). */
static void follows_the_current_far_below(void **state)
{
    (void)state;
    struct subject it = measured_set("nmos", 1e-6, 8e-6);
    check_point(&it, -4, 0.9, 0);
    check_point(&it, -6, 0.05, 0.45);
}

static void follows_the_current(void **state)
{
    (void)state;
    static const double gates[] = {0, 0.3, 0.45, 0.5, 0.6, 0.8, 1.2, 1.8};
    static const double drains[] = {0.005, 0.05, 0.1, 0.3, 0.6, 0.9, 1.8};
    static const double bodies[] = {0, 0.45, 0.9, 1.8};
    static const double lengths[] = {0.15e-6, 0.5e-6, 8e-6};
    for (int type = 0; type < 2; type++) {
        for (int l = 0; l < 3; l++) {
            struct subject it = measured_set(type == 0 ? "nmos" : "pmos", 1e-6, lengths[l]);
            for (int g = 0; g < 8; g++) {
                for (int d = 0; d < 7; d++) {
                    for (int b = 0; b < 4; b++) {
                        check_point(&it, gates[g], drains[d], bodies[b]);
                    }
                }
            }
        }
    }
}

/* Without velocity saturation, body effect and onset the equations take other ways. */
static void follows_the_bare_core(void **state)
{
    (void)state;
    struct subject it = measured_set("nmos", 4e-6, 8e-6);
    set_value(&it, "critical_field", PARAMETER_NONE);
    set_value(&it, "body_effect", 0);
    set_value(&it, "early_onset", PARAMETER_NONE);
    prepare(&it);
    const struct mos_prepared *p = (const void *)it.prepared;
    for (int k = 0; k < 40; k++) {
        double vgs = 0.2 + 0.04 * k, vds = 0.02 + 0.045 * k, gradient[MOS_CONSTANTS];
        double current = mos_gradient(p, vgs, vds, 0.3, gradient);
        check_relative("current", current, (double)current_at(p, vgs, vds, 0.3), 2e-13);
        check_relative("slope in the threshold", gradient[MOS_VT],
                       (double)difference(p, MOS_VT, 1e-5, vgs, vds, 0.3), 1e-8);
        check_relative("slope in beta", gradient[MOS_BETA], current / p->beta, 1e-13);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(follows_the_current),
        cmocka_unit_test(follows_the_current_far_below),
        cmocka_unit_test(follows_the_bare_core),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}

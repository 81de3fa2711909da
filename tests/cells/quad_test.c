/*
 * quad_test.c: the reference itself against the published check values of the transistor model
 * (docs/devices.md: 30-digit arithmetic of its authors), solved from zero.
 */
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <setjmp.h>
#include <cmocka.h>

#include <stdio.h>
#include <string.h>

#include "support/quad.h"

enum { MODEL_COUNT = 4, BIAS_COUNT = 9, TEXT_LIMIT = 8000 };

struct check_value {
    double vg, vd, vs, id, qs, vdsat;
};

static const struct {
    const char *parameters, *geometry;
} models[MODEL_COUNT] = {
#define SCALABLE                                                                                   \
    " threshold = 0.5087\n kprime = 0.0005246\n body_effect = 0.4028\n phi = 0.7\n"                \
    " slope_factor = 1.32\n mobility_bulk = 0.9045\n mobility_gate = 0.273\n"                      \
    " mobility_gate_short = 0.1482\n critical_field = 6.44e+06\n saturation_knee = 0.8811\n"       \
    " early = 3.807\n early_exponent = 0.5\n early_onset = 0.1\n dibl = 0.004336\n"                \
    " dibl_short = 0.02857\n dibl_body = 0.5292\n width_offset = 6.102e-08\n"                      \
    " halo_threshold = 0.08608\n halo_body = 0.1399\n"
    {SCALABLE, "W=7u L=8u"},
    {SCALABLE, "W=1u L=0.5u"},
    {" threshold = 0.45\n kprime = 300e-6\n body_effect = 0.45\n phi = 0.8\n early = 8\n",
     "W=4u L=8u"},
    {" threshold = 0.45\n kprime = 300e-6\n", "W=4u L=8u"},
};

/* VG VD VS ID qs vdsat; VB = 0, T = T0 = 298.15 K */
static const struct check_value values[MODEL_COUNT][BIAS_COUNT] = {
    {{0.5, 1, 0, 2.995874454321e-7, 0.247661510014, 0.150987228175},
     {0.8, 0.05, 0, 3.0956154502679e-6, 2.67760706461, 0.312768115226},
     {0.8, 0.9, 0, 8.945021063362e-6, 2.69122043628, 0.313673592501},
     {1.2, 0.9, 0, 4.7554291429049e-5, 7.17987282887, 0.611659713566},
     {1.2, 1.7, 0, 4.8162192664113e-5, 7.19445252953, 0.612625682797},
     {1.8, 1.8, 0, 0.00016009521710963, 14.4972976846, 1.09479186038},
     {1.5, 1.5, 0.6, 7.8767029924702e-6, 2.64241738683, 0.310427469085},
     {1.2, -0.3, 0, -6.1393490018715e-5, 11.3607834972, 0.888123568752},
     {0.3, 1, 0, 3.671595341878e-9, 0.00360424120647, 0.134721864407}},
    {{0.5, 1, 0, 1.0187936979454e-7, 0.0433286788434, 0.123010557577},
     {0.8, 0.05, 0, 4.3657363964629e-6, 1.8160594618, 0.224292764833},
     {0.8, 0.9, 0, 1.0686505305168e-5, 1.86791806163, 0.227299006246},
     {1.2, 0.9, 0, 7.389846500733e-5, 6.33854006818, 0.484814555182},
     {1.2, 1.7, 0, 7.7270235363548e-5, 6.39754031064, 0.488153814337},
     {1.8, 1.8, 0, 0.00024671734536738, 13.8198097826, 0.891124136743},
     {1.5, 1.5, 0.6, 1.0684953194186e-5, 1.97572513353, 0.233551408288},
     {1.2, -0.3, 0, -0.00010347286141183, 10.4597301967, 0.71293707205},
     {0.3, 1, 0, 9.0962699680926e-10, 0.00038442536087, 0.120626732165}},
    {{0.5, 1, 0, 3.9317267849182e-7, 0.856715927988, 0.146792800013},
     {0.8, 0.05, 0, 2.0042318782145e-6, 4.74764616752, 0.34672886608},
     {0.8, 0.9, 0, 6.5763489978908e-6, 4.74764616752, 0.34672886608},
     {1.2, 0.9, 0, 3.0031446447253e-5, 10.8140324648, 0.658451085924},
     {1.2, 1.7, 0, 3.0404829168081e-5, 10.8140324648, 0.658451085924},
     {1.8, 1.8, 0, 0.00010147959483499, 20.4374297819, 1.15295087989},
     {1.5, 1.5, 0.6, 5.818680938251e-6, 4.51654865882, 0.334853884026},
     {1.2, -0.3, 0, -3.7246044846402e-5, 16.4427733989, 0.947684829529},
     {0.3, 1, 0, 2.4394458055302e-9, 0.00959448787649, 0.103263330762}},
    {{0.5, 1, 0, 3.8548442756396e-7, 0.98208322451, 0.153234818383},
     {0.8, 0.05, 0, 2.1100880703022e-6, 5.92197065005, 0.407071715443},
     {0.8, 0.9, 0, 8.117693770908e-6, 5.92197065005, 0.407071715443},
     {1.2, 0.9, 0, 3.7672578055676e-5, 13.3017079634, 0.786280685077},
     {1.2, 1.7, 0, 3.7673153431793e-5, 13.3017079634, 0.786280685077},
     {1.8, 1.8, 0, 0.00012540383555864, 24.6693958152, 1.37041112419},
     {1.5, 1.5, 0.6, 1.3378629773371e-5, 7.73454423192, 0.500211095773},
     {1.2, -0.3, 0, -3.7291268620367e-5, 18.9626794563, 1.07717060104},
     {0.3, 1, 0, 5.7537611678911e-10, 0.00289706879924, 0.102919182823}},
};

/* One transistor a row, each with its own rails. */
static void compose(int model, char *text)
{
    int n = snprintf(text, TEXT_LIMIT,
                     "temperature 298.15 K\nmeasured_at 298.15 K\nmodel nmos nmos\n%send\n",
                     models[model].parameters);
    for (int k = 0; k < BIAS_COUNT; k++) {
        const struct check_value *v = &values[model][k];
        n += snprintf(text + n, TEXT_LIMIT - (size_t)n,
                      "rail g%d %g V\nrail d%d %g V\nrail s%d %g V\n"
                      "nmos M%d d=d%d g=g%d s=s%d b=gnd %s\n",
                      k, v->vg, k, v->vd, k, v->vs, k, k, k, k, models[model].geometry);
    }
}

static bool is_near(quad got, double want)
{
    return (double)fabsq(got - (quad)want) <= 1e-11 * fabs(want);
}

static void check_bias(const struct quad_question *question, const struct quad_solution *solution,
                       int k, const struct check_value *v)
{
    char name[20];
    snprintf(name, sizeof name, "M%d", k);
    const int instance = circuit_find_instance(question->circuit, name);
    assert_true(instance >= 0);
    const struct quad_device_state state = quad_device(question, solution, instance);
    if (!is_near(state.current, v->id) || !is_near(state.inversion, v->qs * (v->qs + 1)) ||
        !is_near(state.vdsat, v->vdsat)) {
        fail_msg("VG %g VD %g VS %g: ID %.15g wanted %.15g, vdsat %.15g wanted %.15g", v->vg, v->vd,
                 v->vs, (double)state.current, v->id, (double)state.vdsat, v->vdsat);
    }
}

static void reference_meets_check_values(void **state)
{
    const int model = *(const int *)*state;
    static char text[TEXT_LIMIT];
    compose(model, text);
    struct cell *cell = NULL;
    struct circuit *circuit = NULL;
    const struct circuit_settings settings = {.kelvin = NAN};
    assert_int_equal(cell_read("check.cell", text, strlen(text), NULL, 0, &cell), STATUS_OK);
    assert_int_equal(circuit_build(cell, &settings, &cell->diagnostics, &circuit), STATUS_OK);
    const struct quad_question question = {
        .circuit = circuit, .effects = EFFECTS_FULL, .kelvin = circuit->kelvin, .held = -1};
    static struct quad_solution solution;
    assert_true(quad_solve(&question, NULL, NULL, &solution));
    for (int k = 0; k < BIAS_COUNT; k++) {
        check_bias(&question, &solution, k, &values[model][k]);
    }
    circuit_free(circuit);
    cell_free(cell);
}

int main(void)
{
    static int numbers[MODEL_COUNT] = {0, 1, 2, 3};
    const struct CMUnitTest tests[MODEL_COUNT] = {
        {"scalable set, 7 um/8 um", reference_meets_check_values, NULL, NULL, &numbers[0]},
        {"scalable set, 1 um/0.5 um", reference_meets_check_values, NULL, NULL, &numbers[1]},
        {"body effect and early", reference_meets_check_values, NULL, NULL, &numbers[2]},
        {"bare core", reference_meets_check_values, NULL, NULL, &numbers[3]},
    };
    return cmocka_run_group_tests(tests, NULL, NULL) == 0 ? 0 : 1;
}

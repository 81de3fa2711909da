/*
 * recover_test.c: curves made from known values give the values back.
 *
 * Diode, bipolar transistor and resistor are computed here by their published equations (Shockley;
 * Gummel and Poon 1970) from inner to outer voltages, so that no equation has to be solved. MOS
 * curves come from the device equations, which have their own tests against published values.
 */
#include "files.h"

#include "check.h"

#define UT(kelvin) (1.380649e-23 / 1.602176634e-19 * (kelvin))

static void check_value(const struct fit *fit, const char *name, double wanted, double relative)
{
    const struct fitted_value *it = value_of(fit, name);
    if (!(fabs(it->value - wanted) <= relative * fabs(wanted))) {
        fail_msg("%s: found %.9g +- %.2g, wanted %.9g", name, it->value, it->standard, wanted);
    }
}

static void diode_comes_back(void **state)
{
    (void)state;
    const double saturation = 3e-14, emission = 1.3, resistance = 12;
    struct curve_file file;
    begin_file(&file, "v [V],i [mA]");
    for (int k = 0; k < 60; k++) {
        double inner = 0.3 + 0.008 * k;
        double i = saturation * expm1(inner / (emission * UT(300.15)));
        fprintf(file.out, "%.17g,%.17g\n", inner + i * resistance, i * 1e3);
    }
    end_file(&file);
    const struct calibration_file files[] = {{file.path, NULL, NULL, false}};
    struct calibration_request request = {
        .kind = "diode", .files = files, .file_count = 1, .temperature = "27 C"};
    struct calibration *c = calibrate(&request);
    assert_int_equal(c->fit_count, 1);
    check_value(&c->fits[0], "saturation_current", saturation, 1e-5);
    check_value(&c->fits[0], "emission", emission, 1e-6);
    check_value(&c->fits[0], "series_resistance", resistance, 1e-5);
    assert_int_equal(value_of(&c->fits[0], "bandgap")->origin, ORIGIN_DEFAULT);
    assert_int_equal(value_of(&c->fits[0], "breakdown_voltage")->origin, ORIGIN_HELD);
    assert_true(c->comparisons[0].figures.id[FIGURES_SATURATION].rms < 1e-6);
    calibration_free(c);
    remove_file(&file);
}

/* Breakdown: I = -I_Z exp(-(V_Z + V)/(n_Z UT)) with I_Z = 1 mA (docs/devices.md). */
static void breakdown_comes_back(void **state)
{
    (void)state;
    struct curve_file file;
    begin_file(&file, "v,i");
    for (int k = 0; k < 40; k++) {
        double v = -5.0 - 0.02 * k;
        fprintf(file.out, "%.17g,%.17g\n", v, -1e-3 * exp(-(5.6 + v) / (3 * UT(298.15))));
    }
    for (int k = 0; k < 40; k++) {
        double v = 0.3 + 0.01 * k;
        fprintf(file.out, "%.17g,%.17g\n", v, 1e-14 * expm1(v / UT(298.15)));
    }
    end_file(&file);
    const struct calibration_file files[] = {{file.path, NULL, NULL, false}};
    struct calibration_request request = {.kind = "diode", .files = files, .file_count = 1};
    struct calibration *c = calibrate(&request);
    check_value(&c->fits[0], "breakdown_voltage", 5.6, 1e-5);
    check_value(&c->fits[0], "breakdown_emission", 3, 1e-4);
    check_value(&c->fits[0], "emission", 1, 1e-5);
    calibration_free(c);
    remove_file(&file);
}

struct bipolar {
    double saturation, beta, early, knee, leak, leak_emission, rb, re;
};

static const struct bipolar known = {2e-16, 140, 35, 8e-3, 4e-15, 1.7, 300, 2};

/* Gummel and Poon (1970) at inner vbe and vbc; no base current of the collector junction, which is
 * off. */
static void gummel_poon(double vbe, double vbc, double *ic, double *ib)
{
    const struct bipolar *p = &known;
    double ut = UT(298.15), forward = p->saturation * expm1(vbe / ut);
    double reverse = p->saturation * expm1(vbc / ut);
    double q1 = 1 / (1 - vbc / p->early), q2 = forward / p->knee;
    double qb = q1 / 2 * (1 + sqrt(1 + 4 * q2));
    *ic = (forward - reverse) / qb - reverse;
    *ib = forward / p->beta + reverse + p->leak * expm1(vbe / (p->leak_emission * ut));
}

static void bipolar_comes_back(void **state)
{
    (void)state;
    struct curve_file file;
    begin_file(&file, "vbe,vce,ic,ib");
    for (int series = 0; series < 4; series++) {
        for (int k = 0; k < 40; k++) {
            double vbe = 0.42 + 0.011 * k, vbc = vbe - 1 - 1.5 * series, ic, ib;
            gummel_poon(vbe, vbc, &ic, &ib);
            double emitter = known.re * (ic + ib), base = vbe + emitter + known.rb * ib;
            fprintf(file.out, "%.17g,%.17g,%.17g,%.17g\n", base, vbe - vbc + emitter, ic, ib);
        }
    }
    end_file(&file);
    for (int type = 0; type < 2; type++) {
        const struct calibration_file files[] = {{file.path, NULL, NULL, false}};
        struct calibration_request request = {
            .kind = type == 0 ? "npn" : "pnp", .files = files, .file_count = 1, .model = "q"};
        struct calibration *c = calibrate(&request);
        const struct fit *fit = &c->fits[0];
        assert_string_equal(fit->name, "q");
        check_value(fit, "saturation_current", known.saturation, 1e-3);
        check_value(fit, "beta", known.beta, 1e-3);
        check_value(fit, "early", known.early, 1e-3);
        check_value(fit, "knee", known.knee, 1e-2);
        check_value(fit, "leak_emitter", known.leak, 1e-2);
        check_value(fit, "leak_emitter_emission", known.leak_emission, 1e-2);
        check_value(fit, "base_resistance", known.rb, 1e-2);
        check_value(fit, "emitter_resistance", known.re, 1e-2);
        assert_int_equal(value_of(fit, "collector_resistance")->origin, ORIGIN_HELD);
        assert_true(c->comparisons[0].figures.id[FIGURES_SATURATION].rms < 1e-4);
        assert_true(c->comparisons[0].figures.ib.rms < 1e-4);
        calibration_free(c);
    }
    remove_file(&file);
}

/* Output curves at a forced base current tell gain and Early voltage, not the saturation current.
 */
static void output_curves_are_enough_for_beta(void **state)
{
    (void)state;
    struct curve_file file;
    begin_file(&file, "ib (uA),vce,ic (mA)");
    for (int k = 0; k < 20; k++) {
        /* beta 90 times (1 + vce/V_A) about: exact at vbc = 0 reference by the equations */
        for (int step = 1; step <= 3; step++) {
            double ib = 5e-6 * step, vce = 1 + 0.2 * k, ut = UT(298.15), beta = 90, early = 40;
            double saturation = 1e-16, forward = ib * beta, vbe = ut * log1p(forward / saturation);
            double ic = forward * (1 - (vbe - vce) / early);
            fprintf(file.out, "%.17g,%.17g,%.17g\n", ib * 1e6, vce, ic * 1e3);
        }
    }
    end_file(&file);
    const struct calibration_file files[] = {{file.path, NULL, NULL, false}};
    struct calibration_request request = {.kind = "npn", .files = files, .file_count = 1};
    struct calibration *c = calibrate(&request);
    /* the saturation current is the default 1 fA: vbe is 60 mV less, 0.15 % of the Early voltage */
    check_value(&c->fits[0], "beta", 90, 3e-3);
    check_value(&c->fits[0], "early", 40, 3e-3);
    assert_int_equal(value_of(&c->fits[0], "saturation_current")->origin, ORIGIN_HELD);
    calibration_free(c);
    remove_file(&file);
}

static void resistor_comes_back(void **state)
{
    (void)state;
    struct curve_file file;
    begin_file(&file, "v,i,temperature C");
    for (int t = 0; t < 3; t++) {
        double celsius = -40 + 65 * t, away = celsius - 25;
        double r = 4700 * (1 + 1.2e-3 * away + 8e-7 * away * away);
        for (int k = -10; k <= 10; k++) {
            fprintf(file.out, "%.17g,%.17g,%g\n", 0.1 * k, 0.1 * k / r, celsius);
        }
    }
    end_file(&file);
    const struct calibration_file files[] = {{file.path, NULL, NULL, false}};
    struct calibration_request request = {.kind = "resistor", .files = files, .file_count = 1};
    struct calibration *c = calibrate(&request);
    assert_int_equal(c->resistor_count, 1);
    const struct fitted_resistor *it = &c->resistors[0];
    double back = 25 - (it->kelvin - 273.15); /* the law about another temperature */
    double growth = 1 + it->tempco * back + it->tempco2 * back * back;
    check_near(it->ohm * growth, 4700, 1e-6);
    check_near((it->tempco + 2 * it->tempco2 * back) / growth, 1.2e-3, 1e-4);
    check_near(it->tempco2 / growth, 8e-7, 1e-3);
    calibration_free(c);
    remove_file(&file);
}

/* A transistor of known values; which are set. */
struct transistor {
    double width, length;
    double temperatures[2];
    int temperature_count;
};

static const struct {
    const char *name;
    double value;
} mos_values[] = {
    {"threshold", 0.52},     {"kprime", 2.4e-4},       {"body_effect", 0.45},  {"phi", 0.75},
    {"slope_factor", 1.15},  {"mobility_bulk", 0.5},   {"mobility_gate", 0.3}, {"early", 9},
    {"critical_field", 9e6}, {"saturation_knee", 0.8}, {"dibl", 0.012},        {"early_onset", 0.2},
    {"dibl_body", 0.3},      {"early_exponent", 0},
};

static void write_transistor(struct curve_file *file, const struct device_type *type,
                             const struct transistor *it)
{
    double own[8], model[48], prepared[64], f[4], jac[16];
    for (int k = 0; k < type->parameter_count; k++) {
        own[k] = type->parameters[k].standard;
    }
    own[0] = it->width;
    own[1] = it->length;
    for (int k = 0; k < type->model_parameter_count; k++) {
        const struct parameter *row = &type->model_parameters[k];
        model[k] = row->when_absent == DEFAULT_NONE ? PARAMETER_NONE : row->standard;
    }
    for (size_t k = 0; k < sizeof mos_values / sizeof mos_values[0]; k++) {
        model[parameter_find(type->model_parameters, type->model_parameter_count,
                             mos_values[k].name)] = mos_values[k].value;
    }
    struct device_values values = {own, model, NULL, 1};
    begin_file(file, "vgs,vds,vsb,id,temperature");
    for (int t = 0; t < it->temperature_count; t++) {
        struct device_conditions conditions = {it->temperatures[t], 298.15, EFFECTS_FULL};
        type->prepare(&values, &conditions, prepared);
        for (int row = 0; row < 10 * 37; row++) {
            int sweep = row / 37;
            double step = 0.05 * (row % 37), vsb = 0.6 * (sweep % 3);
            bool is_gate = sweep < 6;
            double vgs = is_gate ? step : 0.7 + 0.3 * (sweep - 6), vds = is_gate ? 0.1 : step;
            if (is_gate && sweep >= 3) {
                vds = 1.8;
            }
            double p = type->polarity, x[4] = {p * (vds + vsb), p * (vgs + vsb), p * vsb, 0};
            type->evaluate(prepared, x, f, jac);
            fprintf(file->out, "%.17g,%.17g,%.17g,%.17g,%.17g\n", vgs, vds, vsb, p * f[0],
                    it->temperatures[t]);
        }
    }
    end_file(file);
}

static void transistor_comes_back(void **state)
{
    (void)state;
    const struct transistor it = {10e-6, 1e-6, {298.15, 358.15}, 2};
    for (int type = 0; type < 2; type++) {
        struct curve_file file;
        const char *kind = type == 0 ? "nmos" : "pmos";
        write_transistor(&file, device_find(kind), &it);
        const struct calibration_file files[] = {{file.path, "10u", "1 um", false}};
        struct calibration_request request = {.kind = kind, .files = files, .file_count = 1};
        struct calibration *c = calibrate(&request);
        const struct fit *fit = &c->fits[0];
        assert_int_equal(fit->rank, fit->free_count);
        for (size_t k = 0; k < sizeof mos_values / sizeof mos_values[0]; k++) {
            check_value(fit, mos_values[k].name, mos_values[k].value, 1e-3);
        }
        /* two temperatures tell the temperature terms, whose values here are the defaults */
        assert_int_equal(value_of(fit, "threshold_tempco")->origin, ORIGIN_FITTED);
        check_value(fit, "threshold_tempco", -1e-3, 1e-3);
        check_value(fit, "mobility_exponent", 1.5, 1e-3);
        assert_true(c->comparisons[0].figures.id[FIGURES_SATURATION].rms < 1e-5);
        assert_true(c->comparisons[0].figures.gm.rms < 1e-4);
        assert_true(c->comparisons[0].figures.gds.rms < 1e-3);
        assert_int_equal(c->comparisons[0].figures.gds.count, 8);
        calibration_free(c);
        remove_file(&file);
    }
}

/* Same input, same bits. */
static void runs_are_equal(void **state)
{
    (void)state;
    const struct transistor it = {4e-6, 2e-6, {298.15, 0}, 1};
    struct curve_file file;
    write_transistor(&file, device_find("nmos"), &it);
    const struct calibration_file files[] = {{file.path, "4u", "2u", false}};
    struct calibration_request request = {.kind = "nmos", .files = files, .file_count = 1};
    struct calibration *a = calibrate(&request), *b = calibrate(&request);
    for (int k = 0; k < a->fits[0].value_count; k++) {
        assert_memory_equal(&a->fits[0].values[k].value, &b->fits[0].values[k].value,
                            sizeof(double));
    }
    calibration_free(a);
    calibration_free(b);
    remove_file(&file);
}

/* What cannot be told is held and the reason given: one body voltage, no drain sweep. */
static void holds_what_is_not_told(void **state)
{
    (void)state;
    struct curve_file file;
    begin_file(&file, "vgs,vds,id");
    for (int k = 0; k < 40; k++) { /* the square law with a weak-inversion tail is near enough */
        double vgs = 0.3 + 0.03 * k, soft = 0.04 * log1p(exp((vgs - 0.5) / 0.04));
        fprintf(file.out, "%.17g,0.1,%.17g\n", vgs, 2e-4 * soft * 0.1);
    }
    end_file(&file);
    const struct calibration_file files[] = {{file.path, "5u", "5u", false}};
    struct calibration_request request = {.kind = "nmos", .files = files, .file_count = 1};
    struct calibration *c = calibrate(&request);
    const struct fit *fit = &c->fits[0];
    static const char *const body[] = {"body_effect", "phi"};
    static const char *const drain[] = {"early", "dibl", "saturation_knee"};
    for (int k = 0; k < 2; k++) {
        assert_int_equal(value_of(fit, body[k])->origin, ORIGIN_HELD);
        assert_string_equal(value_of(fit, body[k])->reason, "one body voltage");
    }
    for (int k = 0; k < 3; k++) {
        assert_int_equal(value_of(fit, drain[k])->origin, ORIGIN_HELD);
        assert_string_equal(value_of(fit, drain[k])->reason, "no drain sweep into saturation");
    }
    assert_true(isnan(value_of(fit, "early")->value));
    assert_int_equal(value_of(fit, "threshold_tempco")->origin, ORIGIN_DEFAULT);
    assert_int_equal(value_of(fit, "threshold")->origin, ORIGIN_FITTED);
    bool tells_body = false, tells_temperature = false;
    for (int k = 0; k < c->remark_count; k++) {
        tells_body |= strcmp(c->remarks[k].code, "body") == 0;
        tells_temperature |= strcmp(c->remarks[k].code, "temperature") == 0;
    }
    assert_true(tells_body && tells_temperature);
    calibration_free(c);
    remove_file(&file);
}

/* One reading of ten times too much: found, named with its line, and out only when asked. */
static void finds_an_outlier(void **state)
{
    (void)state;
    struct curve_file file;
    begin_file(&file, "v,i");
    for (int k = 0; k < 40; k++) {
        double v = 0.3 + 0.01 * k, i = 1e-14 * expm1(v / UT(298.15));
        fprintf(file.out, "%.17g,%.17g\n", v, k == 20 ? 10 * i : i);
    }
    end_file(&file);
    for (int robust = 0; robust < 2; robust++) {
        const struct calibration_file files[] = {{file.path, NULL, NULL, false}};
        struct calibration_request request = {
            .kind = "diode", .files = files, .file_count = 1, .is_robust = robust == 1};
        struct calibration *c = calibrate(&request);
        assert_string_equal(c->remarks[0].code, "outlier");
        assert_non_null(strstr(c->remarks[0].text, "line 22:")); /* a heading and 20 rows above */
        double rms = c->comparisons[0].figures.id[FIGURES_SATURATION].rms;
        /* one of 40 readings at -90 %: 0.9/sqrt(40) */
        assert_true(robust == 1 ? rms < 1e-6 : fabs(rms - 0.142) < 1e-3);
        assert_int_equal(value_of(&c->fits[0], "series_resistance")->origin, ORIGIN_HELD);
        calibration_free(c);
    }
    remove_file(&file);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(diode_comes_back),    cmocka_unit_test(breakdown_comes_back),
        cmocka_unit_test(bipolar_comes_back),  cmocka_unit_test(output_curves_are_enough_for_beta),
        cmocka_unit_test(resistor_comes_back), cmocka_unit_test(transistor_comes_back),
        cmocka_unit_test(runs_are_equal),      cmocka_unit_test(holds_what_is_not_told),
        cmocka_unit_test(finds_an_outlier),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}

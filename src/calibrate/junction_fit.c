/* junction_fit.c: least squares between diode or bipolar models and measured currents. */
#include "calibrate/junction_fit.h"

#include <math.h>
#include <string.h>

#include "calibrate/junction_curve.h"

static const struct sought diode_sought[] = {
    {"saturation_current", {1e-24, 1e-2, true}, 1e-14, NAN, INFINITY, 0},
    {"emission", {0.8, 4, false}, 1.1, NAN, INFINITY, 0},
    {"series_resistance", {1e-5, 1e7, true}, 1, NAN, 0.5, 0},
    {"breakdown_voltage", {0.5, 5000, true}, 5, NAN, 0.1, NEED_BREAKDOWN},
    {"breakdown_emission", {0.5, 50, true}, 2, NAN, 0.5, NEED_BREAKDOWN},
    {"bandgap", {0.3, 3.5, false}, 1.12, NAN, 0.2, NEED_TEMPERATURES},
};

static const struct sought bipolar_sought[] = {
    {"saturation_current", {1e-24, 1e-6, true}, 1e-16, NAN, 0.5, NEED_VBE},
    {"beta", {0.1, 1e5, true}, 100, NAN, 0.3, NEED_BASE},
    {"emission", {0.9, 1.6, false}, 1, NAN, 0.05, NEED_VBE},
    {"early", {0.5, 1e4, true}, 50, NAN, 0.5, NEED_COLLECTOR},
    {"knee", {1e-9, 100, true}, 1e-2, NAN, 0.4, NEED_VBE},
    {"leak_emitter", {1e-24, 1e-6, true}, 1e-16, NAN, 0.8, NEED_VBE | NEED_BASE},
    {"leak_emitter_emission", {1.1, 4, false}, 1.8, NAN, 0.3, NEED_VBE | NEED_BASE},
    {"base_resistance", {1e-2, 1e6, true}, 100, NAN, 0.5, NEED_VBE | NEED_BASE},
    {"emitter_resistance", {1e-3, 1e5, true}, 1, NAN, 0.4, NEED_VBE},
    {"collector_resistance", {1e-3, 1e5, true}, 10, NAN, 0.4, NEED_SATURATION},
    {"beta_reverse", {1e-3, 1e4, true}, 1, NAN, 0.5, NEED_SATURATION | NEED_BASE},
    {"bandgap", {0.3, 3.5, false}, 1.12, NAN, 0.2, NEED_TEMPERATURES | NEED_VBE},
    {"beta_exponent", {-5, 10, false}, 1, NAN, 1, NEED_TEMPERATURES | NEED_BASE},
};

/* A reading: the main current of a row, or its base current. */
struct reading {
    int row;
    bool is_base;
    double weight; /* 1/A */
};

struct problem {
    struct fitting base;
    double kelvin;
    const struct measured *data;
    struct reading *readings;
    int reading_count;
    long double *inner;    /* [row_count * JUNCTION_TERMINALS] solutions to start from */
    long double *currents; /* [reading_count] */
};

static enum column main_column(const struct device_type *type)
{
    return type->terminal_count == 2 ? COLUMN_I : COLUMN_IC;
}

/* All currents with model values: [reading_count]. */
static void find_currents(const struct problem *it, const double *model, long double *currents)
{
    const struct measured *data = it->data;
    for (int t = 0; t < data->kelvin_count; t++) {
        struct junction junction;
        long double main = 0, base = 0;
        int last = -1;
        junction_prepare(&junction, it->base.type, model, data->multiplicity, data->kelvins[t],
                         it->kelvin);
        for (int k = 0; k < it->reading_count; k++) {
            const struct measured_row *row = &data->rows[it->readings[k].row];
            if (row->kelvin != t) {
                continue;
            }
            if (it->readings[k].row != last) {
                last = it->readings[k].row;
                junction_currents(&junction, row, it->inner + JUNCTION_TERMINALS * last, &main,
                                  &base);
            }
            currents[k] = it->readings[k].is_base ? base : main;
        }
    }
}

/* Solutions to start from, new for this model. */
static void begin_inner(const struct problem *it)
{
    struct junction junction;
    junction_prepare(&junction, it->base.type, it->base.model, it->data->multiplicity,
                     it->data->kelvins[0], it->kelvin);
    for (int k = 0; k < it->data->row_count; k++) {
        junction_begin(&junction, &it->data->rows[k], it->inner + JUNCTION_TERMINALS * k);
    }
}

static void evaluate(struct fitting *fitting, const double *offsets, double *residuals,
                     double *jacobian)
{
    static const double steps[4] = {-2, -1, 1, 2}, weights[4] = {1, -8, 8, -1};
    const struct problem *it = (const struct problem *)fitting;
    long double *currents = it->currents;
    size_t m = (size_t)it->reading_count;
    (void)offsets;
    begin_inner(it);
    if (residuals != NULL) {
        find_currents(it, fitting->model, currents);
        for (size_t k = 0; k < m; k++) {
            const struct reading *reading = &it->readings[k];
            enum column column = reading->is_base ? COLUMN_IB : main_column(fitting->type);
            double measured = it->data->rows[reading->row].value[column];
            residuals[k] = reading->weight * (double)(currents[k] - measured);
        }
    }
    for (int j = 0; jacobian != NULL && j < fitting->free_count; j++) {
        const struct bounded *bound = &fitting->bounds[j];
        double model[MODEL_VALUE_LIMIT], at = fitting->model[fitting->free_values[j]];
        double h = bound->logarithmic ? 1e-3 * at : 1e-4 * (bound->most - bound->least);
        memcpy(model, fitting->model, sizeof model);
        memset(jacobian + m * (size_t)j, 0, m * sizeof *jacobian);
        for (int s = 0; s < 4; s++) {
            model[fitting->free_values[j]] = at + steps[s] * h;
            find_currents(it, model, currents);
            for (size_t k = 0; k < m; k++) {
                jacobian[k + m * (size_t)j] += it->readings[k].weight * weights[s] *
                                               (double)(currents[k] / (12 * (long double)h));
            }
        }
    }
}

static bool make_readings(struct calibration *calibration, struct problem *it)
{
    const struct measured *data = it->data;
    size_t rows = (size_t)data->row_count;
    it->readings = arena_array(calibration->arena, 2 * rows, sizeof *it->readings);
    it->currents = arena_array(calibration->arena, 2 * rows, sizeof *it->currents);
    it->inner = arena_array(calibration->arena, rows * JUNCTION_TERMINALS, sizeof *it->inner);
    if (it->readings == NULL || it->currents == NULL || it->inner == NULL) {
        return false;
    }
    for (int k = 0; k < data->row_count; k++) {
        const struct measured_row *row = &data->rows[k];
        double main = row->value[main_column(it->base.type)], ib = row->value[COLUMN_IB];
        bool is_bipolar = it->base.type->terminal_count == 3;
        if (row->is_left_out || (is_bipolar && isnan(row->value[COLUMN_VBE]) && !(ib > 0))) {
            continue;
        }
        double error = hypot(calibration->noise, calibration->relative * main);
        it->readings[it->reading_count++] = (struct reading){k, false, 1 / error};
        if (is_bipolar && !isnan(row->value[COLUMN_VBE]) && !isnan(ib)) {
            error = hypot(calibration->noise, calibration->relative * ib);
            it->readings[it->reading_count++] = (struct reading){k, true, 1 / error};
        }
    }
    it->base.residual_count = it->reading_count;
    return true;
}

static unsigned find_abilities(const struct calibration *calibration, const struct problem *it)
{
    const struct measured *data = it->data;
    unsigned found = 0;
    double kelvins[2] = {INFINITY, 0}, collector[2] = {INFINITY, -INFINITY}, least = 0;
    for (int t = 0; t < data->kelvin_count; t++) {
        kelvins[0] = fmin(kelvins[0], data->kelvins[t]);
        kelvins[1] = fmax(kelvins[1], data->kelvins[t]);
    }
    for (int k = 0; k < data->row_count; k++) {
        const struct measured_row *row = &data->rows[k];
        double vce = row->value[COLUMN_VCE], vbe = row->value[COLUMN_VBE];
        least = fmin(least, isnan(row->value[COLUMN_I]) ? 0 : row->value[COLUMN_I]);
        found |= !isnan(vbe) ? NEED_VBE : 0;
        found |= !isnan(row->value[COLUMN_IB]) ? NEED_BASE : 0;
        if (vce > 0.4) {
            collector[0] = fmin(collector[0], vce);
            collector[1] = fmax(collector[1], vce);
        }
        found |= vce < 0.3 && row->value[COLUMN_IC] > 10 * calibration->noise ? NEED_SATURATION : 0;
    }
    found |= collector[1] - collector[0] > 1 ? NEED_COLLECTOR : 0;
    found |= -least > 1e3 * calibration->noise ? NEED_BREAKDOWN : 0;
    found |= kelvins[1] - kelvins[0] > 10 ? NEED_TEMPERATURES : 0;
    return found;
}

/* The exponential part of a characteristic: the readings of least current well above the noise. */
struct exponential {
    double low_v, low_i, high_v, high_i, most_v, most_i;
};

static struct exponential find_exponential(const struct calibration *calibration,
                                           const struct problem *it, enum column voltage,
                                           enum column current)
{
    struct exponential found = {0, INFINITY, 0, INFINITY, 0, 0};
    const struct measured *data = it->data;
    double floor = 30 * calibration->noise;
    for (int pass = 0; pass < 2; pass++) {
        for (int k = 0; k < data->row_count; k++) {
            double v = data->rows[k].value[voltage], i = data->rows[k].value[current];
            if (!(v > 0) || !(i > floor) || data->rows[k].kelvin != 0) {
                continue;
            }
            if (pass == 0 && i < found.low_i) {
                found.low_v = v;
                found.low_i = i;
            }
            if (pass == 1 && i > 8 * found.low_i && i < found.high_i) {
                found.high_v = v;
                found.high_i = i;
            }
            if (i > found.most_i) {
                found.most_v = v;
                found.most_i = i;
            }
        }
    }
    return found;
}

static void start_diode(const struct calibration *calibration, struct problem *it)
{
    const struct measured *data = it->data;
    struct exponential found = find_exponential(calibration, it, COLUMN_V, COLUMN_I);
    double thermal = BOLTZMANN_OVER_CHARGE * data->kelvins[0];
    if (isfinite(found.high_i)) {
        double emission =
            (found.high_v - found.low_v) / (thermal * log(found.high_i / found.low_i));
        emission = fmin(fmax(emission, 0.9), 3);
        double saturation = found.low_i * exp(-found.low_v / (emission * thermal));
        double drop = found.most_v - emission * thermal * log(found.most_i / saturation);
        fitting_start(&it->base, "emission", emission);
        fitting_start(&it->base, "saturation_current", saturation / data->multiplicity);
        fitting_start(&it->base, "series_resistance",
                      fmax(drop, 1e-3) / found.most_i * data->multiplicity);
    }
    /* the reverse voltage at the reading nearest to 1 mA, the default breakdown_current */
    double nearest = INFINITY;
    for (int k = 0; k < data->row_count; k++) {
        double v = data->rows[k].value[COLUMN_V], i = data->rows[k].value[COLUMN_I];
        if (v < 0 && i < -100 * calibration->noise && fabs(log(-i / 1e-3)) < nearest) {
            nearest = fabs(log(-i / 1e-3));
            fitting_start(&it->base, "breakdown_voltage", -v);
        }
    }
}

static void start_bipolar(const struct calibration *calibration, struct problem *it)
{
    const struct measured *data = it->data;
    struct exponential collector = find_exponential(calibration, it, COLUMN_VBE, COLUMN_IC);
    struct exponential base = find_exponential(calibration, it, COLUMN_VBE, COLUMN_IB);
    double thermal = BOLTZMANN_OVER_CHARGE * data->kelvins[0], size = data->multiplicity;
    double beta = 0, most_ic = 1e-6, most_ib = 1e-8;
    for (int k = 0; k < data->row_count; k++) {
        double ic = data->rows[k].value[COLUMN_IC], ib = data->rows[k].value[COLUMN_IB];
        if (ib > 30 * calibration->noise) {
            beta = fmax(beta, ic / ib);
        }
        most_ic = fmax(most_ic, ic);
        most_ib = fmax(most_ib, isnan(ib) ? 0 : ib);
    }
    fitting_start(&it->base, "beta", fmax(beta, 1));
    if (isfinite(collector.low_i)) {
        double saturation = collector.high_i * exp(-collector.high_v / thermal);
        fitting_start(&it->base, "saturation_current", saturation / size);
    }
    if (isfinite(base.low_i)) {
        fitting_start(&it->base, "leak_emitter",
                      0.5 * base.low_i * exp(-base.low_v / (1.8 * thermal)) / size);
    }
    fitting_start(&it->base, "knee", most_ic / size);
    fitting_start(&it->base, "base_resistance", 0.01 / most_ib * size);
    fitting_start(&it->base, "emitter_resistance", 0.005 / most_ic * size);
    fitting_start(&it->base, "collector_resistance", 0.05 / most_ic * size);
}

enum status junction_fit(struct calibration *calibration, const struct calibration_request *request,
                         int device, struct fit *fit)
{
    struct problem *it = arena_new(calibration->arena, struct problem);
    if (it == NULL) {
        return STATUS_MEMORY;
    }
    bool is_diode = fit->type->terminal_count == 2;
    it->base = (struct fitting){
        .request = request,
        .type = fit->type,
        .sought = is_diode ? diode_sought : bipolar_sought,
        .sought_count = (int)(is_diode ? sizeof diode_sought / sizeof diode_sought[0]
                                       : sizeof bipolar_sought / sizeof bipolar_sought[0]),
        .evaluate = evaluate,
    };
    it->kelvin = calibration->measured_kelvin;
    it->data = &calibration->devices[device].data;
    if (!make_readings(calibration, it) ||
        !fitting_begin(calibration, &it->base, fit, &device, 1, find_abilities(calibration, it))) {
        return STATUS_MEMORY;
    }
    if (is_diode) {
        start_diode(calibration, it);
    } else {
        start_bipolar(calibration, it);
    }
    return fitting_solve(calibration, &it->base, fit);
}

void junction_compare(const struct calibration *calibration, const struct calibrated_device *device,
                      const double *model, struct device_figures *figures)
{
    const struct measured *data = &device->data;
    enum column column = main_column(device->type);
    double floor = 10 * calibration->noise;
    memset(figures, 0, sizeof *figures);
    for (int k = 0; k < data->row_count; k++) {
        const struct measured_row *row = &data->rows[k];
        double measured = row->value[column], ib = row->value[COLUMN_IB];
        long double inner[JUNCTION_TERMINALS], main = 0, base = 0;
        struct junction junction;
        bool is_forced = device->type->terminal_count == 3 && isnan(row->value[COLUMN_VBE]);
        if (row->is_left_out || (is_forced && !(ib > 0))) {
            continue;
        }
        junction_prepare(&junction, device->type, model, data->multiplicity,
                         data->kelvins[row->kelvin], calibration->measured_kelvin);
        junction_begin(&junction, row, inner);
        junction_currents(&junction, row, inner, &main, &base);
        if (fabs(measured) > floor) {
            misfit_add(&figures->id[FIGURES_SATURATION], (double)main / measured - 1);
        }
        if (!is_forced && ib > floor) {
            misfit_add(&figures->ib, (double)base / ib - 1);
        }
    }
    for (int k = 0; k < FIGURES_REGIONS; k++) {
        misfit_finish(&figures->id[k]);
    }
    misfit_finish(&figures->gm);
    misfit_finish(&figures->gds);
    misfit_finish(&figures->ib);
}

/* resistor_fit.c: a straight line through the readings of a resistor, and its temperature law. */
#include "calibrate/junction_fit.h"

#include <assert.h>
#include <math.h>
#include <string.h>

/* As many as there are temperatures, at most. */
enum { UNKNOWNS = 3 };

struct problem {
    const struct calibration *calibration;
    const struct measured *data;
    double kelvin;
    int unknowns;
};

/* i = v / (R (1 + tempco t + tempco2 t^2)), t the difference to the temperature of R. */
static void evaluate(void *self, const double *p, double *residuals, double *jacobian)
{
    const struct problem *it = self;
    const struct measured *data = it->data;
    size_t m = (size_t)data->row_count;
    for (int k = 0; k < data->row_count; k++) {
        const struct measured_row *row = &data->rows[k];
        double v = row->value[COLUMN_V], i = row->value[COLUMN_I];
        double t = data->kelvins[row->kelvin] - it->kelvin;
        double weight = 1 / hypot(it->calibration->noise, it->calibration->relative * i);
        double tempco = it->unknowns > 1 ? p[1] : 0, tempco2 = it->unknowns > 2 ? p[2] : 0;
        double growth = 1 + tempco * t + tempco2 * t * t;
        double powers[UNKNOWNS] = {growth / p[0], t, t * t};
        double found = v / (p[0] * growth);
        if (row->is_left_out) {
            weight = 0;
        }
        assert(it->unknowns <= UNKNOWNS);
        if (residuals != NULL) {
            residuals[k] = weight * (found - i);
        }
        for (int j = 0; jacobian != NULL && j < it->unknowns; j++) {
            jacobian[(size_t)k + m * (size_t)j] = -weight * found * powers[j] / growth;
        }
    }
}

static double start_of(const struct measured *data)
{
    double vv = 0, vi = 0;
    for (int k = 0; k < data->row_count; k++) {
        double v = data->rows[k].value[COLUMN_V];
        vv += v * v;
        vi += v * data->rows[k].value[COLUMN_I];
    }
    return vv / vi;
}

enum status resistor_fit(struct calibration *calibration, int device, struct fitted_resistor *it)
{
    const struct measured *data = &calibration->devices[device].data;
    double p[UNKNOWNS] = {start_of(data), 0, 0};
    /* what one and two temperatures cannot tell stays at 0 */
    int unknowns = data->kelvin_count < UNKNOWNS ? data->kelvin_count : UNKNOWNS;
    struct bounded bounds[UNKNOWNS] = {
        {p[0] / 100, p[0] * 100, true}, {-0.02, 0.02, false}, {-1e-4, 1e-4, false}};
    *it = (struct fitted_resistor){
        device, NAN, NAN, NAN, NAN, NAN, NAN, calibration->measured_kelvin, NAN};
    if (!(p[0] > 0) || data->row_count < unknowns) {
        diagnostics_add(&calibration->diagnostics, (struct span){data->file, 0, 0}, NULL,
                        "these readings are not those of a resistor");
        return STATUS_INPUT;
    }
    struct problem problem = {calibration, data, calibration->measured_kelvin, unknowns};
    struct arena *scratch = arena_create();
    struct least_squares_answer answer;
    struct least_squares_problem search = {.parameter_count = unknowns,
                                           .residual_count = data->row_count,
                                           .bounds = bounds,
                                           .evaluate = evaluate,
                                           .self = &problem};
    if (scratch == NULL) {
        return STATUS_MEMORY;
    }
    enum status status = least_squares_solve(scratch, &search, p, &answer);
    if (status == STATUS_OK) {
        double *values[UNKNOWNS] = {&it->ohm, &it->tempco, &it->tempco2};
        double *errors[UNKNOWNS] = {&it->ohm_error, &it->tempco_error, &it->tempco2_error};
        for (int k = 0; k < unknowns; k++) {
            *values[k] = p[k];
            *errors[k] = answer.standard[k];
        }
        it->reduced = answer.reduced;
    }
    arena_destroy(scratch);
    return status;
}

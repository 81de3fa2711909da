/* fitting.c: the search that all fits share, and fixing what the data do not tell. */
#include "calibrate/fitting.h"

#include <math.h>
#include <string.h>

/* Correlations above this are told. */
static const double correlation_told = 0.95;

/* A search ends when the sum of squares falls by no more than this share: far less than any
 * statement about the fit can tell, and values that creep towards a bound end soon. */
static const double least_fall = 1e-8;

/* Threshold offsets stay within this. */
static const struct bounded offset_bound = {-0.5, 0.5, false}; /* V */

static const struct {
    unsigned need;
    const char *text;
} lack_rows[] = {
    {NEED_TEMPERATURES, "one temperature"},
    {NEED_BODY, "one body voltage"},
    {NEED_DRAIN, "no drain sweep into saturation"},
    {NEED_LENGTHS, "one length"},
    {NEED_WIDTHS, "one width"},
    {NEED_SHAPE, "fewer than four lengths"},
    {NEED_SHORT, "no lengths on both sides of 0.3 um"},
    {NEED_BREAKDOWN, "no breakdown in the data"},
    {NEED_COLLECTOR, "one collector voltage"},
    {NEED_BASE, "no base current"},
    {NEED_SATURATION, "no reading in saturation"},
    {NEED_VBE, "no base voltage"},
};

static const char *lack_text(unsigned lack)
{
    for (size_t k = 0; k < sizeof lack_rows / sizeof lack_rows[0]; k++) {
        if ((lack & lack_rows[k].need) != 0) {
            return lack_rows[k].text;
        }
    }
    return NULL;
}

int fitting_place(const struct device_type *type, const char *name)
{
    return parameter_find(type->model_parameters, type->model_parameter_count, name);
}

void fitting_start(struct fitting *fitting, const char *name, double value)
{
    for (int k = 0; k < fitting->sought_count; k++) {
        if (strcmp(fitting->sought[k].name, name) == 0 &&
            fitting->standings[k].origin == ORIGIN_FITTED) {
            fitting->model[fitting_place(fitting->type, name)] = value;
        }
    }
}

static double table_value(const struct parameter *parameter)
{
    return parameter->when_absent == DEFAULT_NONE ? PARAMETER_NONE : parameter->standard;
}

static double held_value(const struct fitting *it, const struct sought *row)
{
    if (!isnan(row->held)) {
        return row->held;
    }
    return table_value(&it->type->model_parameters[fitting_place(it->type, row->name)]);
}

static struct standing standing_of(const struct sought *row, unsigned abilities)
{
    unsigned lack = row->needs & ~abilities;
    if ((lack & NEED_SET) != 0) {
        return (struct standing){ORIGIN_SHAPE, "one geometry"};
    }
    if ((lack & NEED_TEMPERATURES) != 0) {
        return (struct standing){ORIGIN_DEFAULT, lack_text(NEED_TEMPERATURES)};
    }
    return lack != 0 ? (struct standing){ORIGIN_HELD, lack_text(lack)}
                     : (struct standing){ORIGIN_FITTED, NULL};
}

static void widen(double *range, double value)
{
    range[0] = fmin(range[0], value);
    range[1] = fmax(range[1], value);
}

/* The devices and ranges of a fit. */
static bool begin_fit(struct calibration *calibration, struct fit *fit, const int *list, int count)
{
    fit->devices = arena_new_array(calibration->arena, int, count);
    fit->offsets = arena_new_array(calibration->arena, double, count);
    fit->offset_errors = arena_new_array(calibration->arena, double, count);
    if (fit->devices == NULL || fit->offsets == NULL || fit->offset_errors == NULL) {
        return false;
    }
    fit->device_count = count;
    fit->length_range[0] = fit->width_range[0] = fit->kelvin_range[0] = INFINITY;
    for (int p = 0; p < count; p++) {
        const struct measured *data = &calibration->devices[list[p]].data;
        fit->devices[p] = list[p];
        widen(fit->length_range, data->length);
        widen(fit->width_range, data->width);
        for (int t = 0; t < data->kelvin_count; t++) {
            widen(fit->kelvin_range, data->kelvins[t]);
        }
    }
    return true;
}

bool fitting_begin(struct calibration *calibration, struct fitting *fitting, struct fit *fit,
                   const int *list, int count, unsigned abilities)
{
    fitting->standings =
        arena_new_array(calibration->arena, struct standing, fitting->sought_count);
    fitting->ranges = arena_new_array(calibration->arena, struct bounded, fitting->sought_count);
    if (fitting->standings == NULL || fitting->ranges == NULL ||
        !begin_fit(calibration, fit, list, count)) {
        return false;
    }
    for (int k = 0; k < fitting->type->model_parameter_count; k++) {
        fitting->model[k] = table_value(&fitting->type->model_parameters[k]);
    }
    for (int k = 0; k < fitting->sought_count; k++) {
        const struct sought *row = &fitting->sought[k];
        double *value = &fitting->model[fitting_place(fitting->type, row->name)];
        fitting->ranges[k] = row->bound;
        fitting->standings[k] = standing_of(row, abilities);
        if (fitting->standings[k].origin == ORIGIN_FITTED) {
            *value = row->start;
        } else if (fitting->standings[k].origin == ORIGIN_HELD) {
            *value = held_value(fitting, row);
        }
    }
    return true;
}

static void set_free(struct fitting *it, const struct fit *fit, double *parameters)
{
    it->free_count = 0;
    for (int k = 0; k < it->sought_count; k++) {
        int place = fitting_place(it->type, it->sought[k].name);
        if (it->standings[k].origin != ORIGIN_FITTED) {
            continue;
        }
        it->free_rows[it->free_count] = k;
        it->free_values[it->free_count] = place;
        it->bounds[it->free_count] = it->ranges[k];
        parameters[it->free_count++] = it->model[place];
    }
    for (int p = 0; p < it->offset_count; p++) {
        it->bounds[it->free_count + p] = offset_bound;
        parameters[it->free_count + p] = fit->offsets[p];
    }
}

/* A resistance that went to the least of its range, or an Early voltage that went to the most: the
 * effect is not there. */
static bool is_idle_limit(const struct fitting *it, const struct sought *row, bool is_low)
{
    const struct parameter *parameter =
        &it->type->model_parameters[fitting_place(it->type, row->name)];
    if (!row->bound.logarithmic || !isnan(row->held)) {
        return false;
    }
    return is_low ? parameter->when_absent == DEFAULT_VALUE && !(parameter->standard > 0)
                  : parameter->when_absent == DEFAULT_NONE;
}

/*
 * Fixes what came to rest at a bound, else the one value that the data tell least; true when
 * something was fixed, so that the rest must be fitted again.
 */
static bool settle(struct fitting *it, const struct least_squares_answer *answer)
{
    double vaguest = 1;
    int vague = -1;
    bool is_changed = false;
    for (int j = 0; j < it->free_count; j++) {
        const struct sought *row = &it->sought[it->free_rows[j]];
        double *value = &it->model[it->free_values[j]];
        if (answer->at_bound[j]) {
            const struct bounded *bound = &it->bounds[j];
            bool is_low = fabs(*value - bound->least) < fabs(*value - bound->most);
            *value = is_low ? bound->least : bound->most;
            it->standings[it->free_rows[j]] = (struct standing){ORIGIN_LIMIT, "end of its range"};
            if (is_idle_limit(it, row, is_low)) {
                *value = held_value(it, row);
                it->standings[it->free_rows[j]] =
                    (struct standing){ORIGIN_HELD, "too weak to be seen"};
            }
            is_changed = true;
            continue;
        }
        double allowed = row->bound.logarithmic ? row->coarse * *value : row->coarse;
        if (answer->standard[j] / allowed > vaguest) {
            vaguest = answer->standard[j] / allowed;
            vague = j;
        }
    }
    if (!is_changed && vague >= 0) {
        const struct sought *row = &it->sought[it->free_rows[vague]];
        it->model[it->free_values[vague]] = held_value(it, row);
        it->standings[it->free_rows[vague]] =
            (struct standing){ORIGIN_HELD, "the data do not tell it"};
        is_changed = true;
    }
    return is_changed;
}

static bool fill_values(struct calibration *calibration, const struct fitting *it, struct fit *fit)
{
    fit->value_count = it->type->model_parameter_count;
    fit->values = arena_new_array(calibration->arena, struct fitted_value, fit->value_count);
    for (int k = 0; fit->values != NULL && k < fit->value_count; k++) {
        fit->values[k] = (struct fitted_value){&it->type->model_parameters[k], it->model[k], NAN,
                                               ORIGIN_DEFAULT, NULL};
    }
    for (int k = 0; fit->values != NULL && k < it->sought_count; k++) {
        struct fitted_value *value = &fit->values[fitting_place(it->type, it->sought[k].name)];
        value->origin = it->standings[k].origin;
        value->reason = it->standings[k].reason;
    }
    return fit->values != NULL;
}

/* Index of a free value or offset as struct correlated has it. */
static int name_of(const struct fitting *it, const struct fit *fit, int j)
{
    return j < it->free_count ? it->free_values[j] : -1 - fit->devices[j - it->free_count];
}

static bool fill_correlations(struct calibration *calibration, const struct fitting *it,
                              const struct least_squares_answer *answer, struct fit *fit)
{
    int n = it->free_count + it->offset_count, capacity = 0;
    for (int a = 0; a < n; a++) {
        for (int b = 0; b < a; b++) {
            double correlation = answer->correlation[a + n * b];
            if (!(fabs(correlation) > correlation_told)) {
                continue;
            }
            struct correlated *list = arena_grow(calibration->arena, fit->correlations,
                                                 fit->correlation_count, &capacity, sizeof *list);
            if (list == NULL) {
                return false;
            }
            fit->correlations = list;
            list[fit->correlation_count++] =
                (struct correlated){name_of(it, fit, b), name_of(it, fit, a), correlation};
        }
    }
    return true;
}

static bool fill_fit(struct calibration *calibration, const struct fitting *it,
                     const struct least_squares_answer *answer, struct fit *fit)
{
    if (!fill_values(calibration, it, fit) || !fill_correlations(calibration, it, answer, fit)) {
        return false;
    }
    for (int j = 0; j < it->free_count; j++) {
        fit->values[it->free_values[j]].standard = answer->standard[j];
    }
    for (int p = 0; p < it->offset_count; p++) {
        fit->offset_errors[p] = answer->standard[it->free_count + p];
    }
    fit->free_count = it->free_count + it->offset_count;
    fit->rank = answer->rank;
    fit->residual_count = it->residual_count;
    fit->reduced = answer->reduced;
    fit->ended = answer->ended;
    return true;
}

static void respond(void *self, const double *parameters, double *residuals, double *jacobian)
{
    struct fitting *it = self;
    for (int j = 0; j < it->free_count; j++) {
        it->model[it->free_values[j]] = parameters[j];
    }
    it->evaluate(it, parameters + it->free_count, residuals, jacobian);
}

static bool ask_stopped(void *self)
{
    const struct fitting *it = self;
    return it->request->stopped != NULL && it->request->stopped(it->request->stopped_self);
}

enum status fitting_solve(struct calibration *calibration, struct fitting *fitting, struct fit *fit)
{
    double parameters[LEAST_SQUARES_LIMIT];
    struct least_squares_answer answer;
    struct arena *scratch = NULL;
    enum status status = STATUS_OK;
    bool is_settled = false;
    while (status == STATUS_OK && !is_settled) {
        arena_destroy(scratch);
        scratch = arena_create();
        if (scratch == NULL) {
            return STATUS_MEMORY;
        }
        set_free(fitting, fit, parameters);
        struct least_squares_problem problem = {
            .parameter_count = fitting->free_count + fitting->offset_count,
            .residual_count = fitting->residual_count,
            .bounds = fitting->bounds,
            .least_fall = least_fall,
            .evaluate = respond,
            .stopped = ask_stopped,
            .self = fitting,
        };
        status = least_squares_solve(scratch, &problem, parameters, &answer);
        fit->evaluations += answer.evaluations;
        for (int j = 0; j < fitting->free_count; j++) {
            fitting->model[fitting->free_values[j]] = parameters[j];
        }
        for (int p = 0; p < fitting->offset_count; p++) {
            fit->offsets[p] = parameters[fitting->free_count + p];
        }
        is_settled = status == STATUS_OK && !settle(fitting, &answer);
    }
    if (status == STATUS_OK && !fill_fit(calibration, fitting, &answer, fit)) {
        status = STATUS_MEMORY;
    }
    arena_destroy(scratch);
    return status;
}

void fitting_values(const struct fit *fit, double *model)
{
    for (int k = 0; k < fit->value_count; k++) {
        model[k] = fit->values[k].value;
    }
}

void misfit_add(struct misfit *figure, double error)
{
    figure->rms += error * error;
    figure->worst = fabs(error) > fabs(figure->worst) ? error : figure->worst;
    figure->count++;
}

void misfit_finish(struct misfit *figure)
{
    if (figure->count == 0) {
        figure->rms = figure->worst = NAN;
        return;
    }
    figure->rms = sqrt(figure->rms / figure->count);
}

/* mos_fit.c: least squares between a MOS model and measured drain currents. */
#include "calibrate/mos_fit.h"

#include <math.h>
#include <string.h>

#include "devices/mos_gradient.h"

/*
 * A threshold offset of a set is expected to be of the size of random mismatch, which falls with
 * the root of the area (Pelgrom, Duinmaijer and Welbers 1989; 5 mV um is usual at 130 nm), and of
 * what layout adds to it. The curves of a set are met to about five times their stated error, hence
 * the factor. This decides only what the curves leave open, such as how much of a threshold is
 * common to all.
 */
static const double offset_area = 5e-9, offset_layout = 3e-3, offset_factor = 5; /* V m, V, 1 */

/* Below this drain voltage a reading shows the offset of the drain supply. */
static const double drain_least = 1e-3; /* V */

/* Slopes are asked for beyond this drain voltage and this far above threshold, */
static const double slope_drain = 0.4, slope_above = 0.05; /* V */
/* to this share of themselves, as well as the repeatability of readings lets them be known. */
static const double drain_slope_share = 0.1, gate_slope_share = 0.01;
static const double repeatability = 3e-4; /* of a reading, within one sweep */

/* No set follows every device: what it is expected to miss, of the reading. */
static const double set_share = 0.02;

struct row_weight {
    int row;
    double weight; /* 1/A */
};

/* The rise of the current between two rows of one sweep: a slope, which a designer needs as much as
 * the current, and which readings tell better than their common error lets the current be known. */
struct pair {
    int from, to;  /* of part->rows */
    double weight; /* 1/A */
};

/* One device of the problem. */
struct part {
    const struct calibrated_device *device;
    struct row_weight *rows;
    int row_count;
    struct pair *pairs;
    int pair_count;
    int first; /* residual of its first row; those of the pairs follow the rows */
};

struct problem {
    struct fitting base;
    double kelvin; /* at which the model values hold */
    struct part *parts;
    int part_count;
};

void mos_own(const struct calibrated_device *device, double offset, double *own)
{
    const struct device_type *type = device->type;
    for (int k = 0; k < type->parameter_count; k++) {
        own[k] = type->parameters[k].standard;
    }
    own[parameter_find(type->parameters, type->parameter_count, "W")] = device->data.width;
    own[parameter_find(type->parameters, type->parameter_count, "L")] = device->data.length;
    own[parameter_find(type->parameters, type->parameter_count, "m")] = device->data.multiplicity;
    own[parameter_find(type->parameters, type->parameter_count, "threshold_shift")] = offset;
}

static void constants_of(const struct problem *it, const struct part *part, const double *model,
                         double offset, double kelvin, double *prepared, double *constants)
{
    double own[OWN_VALUE_LIMIT];
    mos_own(part->device, offset, own);
    struct device_values values = {own, model, NULL, 1};
    struct device_conditions conditions = {kelvin, it->kelvin, EFFECTS_FULL, 0};
    it->base.type->prepare(&values, &conditions, prepared);
    if (constants != NULL) {
        mos_constants(prepared, constants);
    }
}

/* Slopes of the constants in each free value, by fourth-order differences of the scaling laws:
 * their error is about 1e-12. */
static void scale_slopes(const struct problem *it, const struct part *part, double offset,
                         double kelvin, double (*slopes)[MOS_CONSTANTS])
{
    static const double steps[4] = {-2, -1, 1, 2}, weights[4] = {1, -8, 8, -1};
    double prepared[PREPARED_SIZE_LIMIT], constants[MOS_CONSTANTS], model[MODEL_VALUE_LIMIT];
    for (int j = 0; j < it->base.free_count; j++) {
        const struct bounded *bound = &it->base.bounds[j];
        double at = it->base.model[it->base.free_values[j]];
        double h = 1e-3 * (bound->logarithmic ? at : bound->most - bound->least);
        memcpy(model, it->base.model, sizeof model);
        memset(slopes[j], 0, sizeof slopes[j]);
        for (int s = 0; s < 4; s++) {
            model[it->base.free_values[j]] = at + steps[s] * h;
            constants_of(it, part, model, offset, kelvin, prepared, constants);
            for (int c = 0; c < MOS_CONSTANTS; c++) {
                slopes[j][c] += weights[s] * constants[c] / (12 * h);
            }
        }
    }
}

static double voltage(const struct measured_row *row, enum column column)
{
    return isnan(row->value[column]) ? 0 : row->value[column];
}

/* The rows of one device at one temperature. */
static void evaluate_part(const struct problem *it, const struct part *part, int index,
                          double offset, int kelvin, double *residuals, double *jacobian)
{
    const struct measured *data = &part->device->data;
    double prepared[PREPARED_SIZE_LIMIT], slopes[LEAST_SQUARES_LIMIT][MOS_CONSTANTS];
    size_t m = (size_t)it->base.residual_count;
    constants_of(it, part, it->base.model, offset, data->kelvins[kelvin], prepared, NULL);
    if (jacobian != NULL) {
        scale_slopes(it, part, offset, data->kelvins[kelvin], slopes);
    }
    for (int k = 0; k < part->row_count; k++) {
        const struct measured_row *row = &data->rows[part->rows[k].row];
        double gradient[MOS_CONSTANTS], weight = part->rows[k].weight;
        if (row->kelvin != kelvin) {
            continue;
        }
        double id = mos_gradient(prepared, row->value[COLUMN_VGS], row->value[COLUMN_VDS],
                                 voltage(row, COLUMN_VSB), gradient);
        size_t place = (size_t)part->first + (size_t)k;
        if (residuals != NULL) {
            residuals[place] = weight * (id - row->value[COLUMN_ID]);
        }
        for (int j = 0; jacobian != NULL && j < it->base.free_count; j++) {
            double sum = 0;
            for (int c = 0; c < MOS_CONSTANTS; c++) {
                sum += gradient[c] * slopes[j][c];
            }
            jacobian[place + m * (size_t)j] = weight * sum;
        }
        if (jacobian != NULL && it->base.offset_count > 0) {
            jacobian[place + m * (size_t)(it->base.free_count + index)] = weight * gradient[MOS_VT];
        }
    }
}

/* Residuals of the rises, from those of the rows. */
static void evaluate_pairs(const struct problem *it, const struct part *part, double *residuals,
                           double *jacobian)
{
    size_t m = (size_t)it->base.residual_count;
    int columns = jacobian == NULL ? 0 : it->base.free_count + it->base.offset_count;
    for (int k = 0; k < part->pair_count; k++) {
        const struct pair *pair = &part->pairs[k];
        double to = pair->weight / part->rows[pair->to].weight;
        double from = pair->weight / part->rows[pair->from].weight;
        size_t place = (size_t)part->first + (size_t)part->row_count + (size_t)k;
        size_t place_to = (size_t)part->first + (size_t)pair->to;
        size_t place_from = (size_t)part->first + (size_t)pair->from;
        if (residuals != NULL) {
            residuals[place] = to * residuals[place_to] - from * residuals[place_from];
        }
        for (int j = 0; j < columns; j++) {
            double *column = jacobian + m * (size_t)j;
            column[place] = to * column[place_to] - from * column[place_from];
        }
    }
}

static double offset_weight(const struct part *part)
{
    const struct measured *data = &part->device->data;
    double area = data->width * data->length * data->multiplicity;
    return offset_factor / hypot(offset_layout, offset_area / sqrt(area));
}

/* Residuals of usual values; those of values that are not free are 0. */
static void evaluate_usual(const struct fitting *fitting, size_t first, double *residuals,
                           double *jacobian)
{
    for (int u = 0; u < mos_usual_count; u++) {
        const struct usual *usual = &mos_usual[u];
        size_t place = first + (size_t)u;
        if (residuals != NULL) {
            residuals[place] = 0;
        }
        for (int j = 0; j < fitting->free_count; j++) {
            if (strcmp(fitting->sought[fitting->free_rows[j]].name, usual->name) != 0) {
                continue;
            }
            double value = fitting->model[fitting->free_values[j]];
            double weight = offset_factor / usual->spread;
            double away = usual->logarithmic ? log(value / usual->value) : value - usual->value;
            if (residuals != NULL) {
                residuals[place] = weight * away;
            }
            if (jacobian != NULL) {
                jacobian[place + (size_t)fitting->residual_count * (size_t)j] =
                    usual->logarithmic ? weight / value : weight;
            }
        }
    }
}

static void evaluate(struct fitting *fitting, const double *offsets, double *residuals,
                     double *jacobian)
{
    const struct problem *it = (const struct problem *)fitting;
    size_t m = (size_t)fitting->residual_count;
    int columns = fitting->free_count + fitting->offset_count;
    if (jacobian != NULL) {
        memset(jacobian, 0, m * (size_t)columns * sizeof *jacobian);
    }
    for (int p = 0; p < it->part_count; p++) {
        const struct part *part = &it->parts[p];
        double offset = fitting->offset_count > 0 ? offsets[p] : 0;
        for (int t = 0; t < part->device->data.kelvin_count; t++) {
            evaluate_part(it, part, p, offset, t, residuals, jacobian);
        }
        evaluate_pairs(it, part, residuals, jacobian);
        if (fitting->offset_count == 0) {
            continue;
        }
        size_t place = m - (size_t)(fitting->offset_count - p);
        if (residuals != NULL) {
            residuals[place] = offset_weight(part) * offset;
        }
        if (jacobian != NULL) {
            jacobian[place + m * (size_t)(fitting->free_count + p)] = offset_weight(part);
        }
    }
    if (fitting->offset_count > 0) {
        size_t first = m - (size_t)(fitting->offset_count + mos_usual_count);
        evaluate_usual(fitting, first, residuals, jacobian);
    }
}

static bool make_rows(struct calibration *calibration, bool is_set, struct part *part)
{
    double share = hypot(calibration->relative, is_set ? set_share : 0);
    const struct measured *data = &part->device->data;
    part->rows = arena_new_array(calibration->arena, struct row_weight, data->row_count);
    for (int k = 0; part->rows != NULL && k < data->row_count; k++) {
        const struct measured_row *row = &data->rows[k];
        double id = row->value[COLUMN_ID];
        if (row->is_left_out || !(row->value[COLUMN_VDS] > drain_least)) {
            continue;
        }
        double error = hypot(hypot(calibration->noise, share * id), data->sweeps[row->sweep].doubt);
        part->rows[part->row_count++] = (struct row_weight){k, 1 / error};
    }
    return part->rows != NULL;
}

/* Whether a row lies in the saturated part above threshold, where slopes are asked for. */
static bool has_slope(const struct calibrated_device *device, const struct measured_row *row)
{
    return row->value[COLUMN_VDS] > slope_drain &&
           row->value[COLUMN_VGS] >
               mos_threshold_at(&device->facts, voltage(row, COLUMN_VSB)) + slope_above;
}

/*
 * Pairs of each sweep: in gate sweeps two rows apart; in drain sweeps half of the saturated part
 * apart.
 */
static bool make_pairs(struct calibration *calibration, struct part *part)
{
    const struct calibrated_device *device = part->device;
    const struct measured *data = &device->data;
    part->pairs = arena_new_array(calibration->arena, struct pair, part->row_count);
    for (int a = 0; part->pairs != NULL && a < part->row_count; a++) {
        const struct measured_row *from = &data->rows[part->rows[a].row];
        const struct measured_sweep *sweep = &data->sweeps[from->sweep];
        if (!has_slope(device, from)) {
            continue;
        }
        double share = sweep->moved == COLUMN_VDS ? drain_slope_share : gate_slope_share;
        int apart = 2, last = a;
        while (last + 1 < part->row_count &&
               data->rows[part->rows[last + 1].row].sweep == from->sweep) {
            last++;
        }
        if (sweep->moved == COLUMN_VDS) {
            double reach = (device->facts.drain_most - slope_drain) / 2;
            for (apart = 1; a + apart < last; apart++) {
                const struct measured_row *to = &data->rows[part->rows[a + apart].row];
                if (fabs(to->value[COLUMN_VDS] - from->value[COLUMN_VDS]) > reach) {
                    break;
                }
            }
        }
        int b = a + apart;
        if (b > last || !has_slope(device, &data->rows[part->rows[b].row])) {
            continue;
        }
        double rise = data->rows[part->rows[b].row].value[COLUMN_ID] - from->value[COLUMN_ID];
        double error =
            hypot(hypot(calibration->noise, repeatability * from->value[COLUMN_ID]), share * rise);
        part->pairs[part->pair_count++] = (struct pair){a, b, 1 / error};
    }
    return part->pairs != NULL;
}

static bool make_parts(struct calibration *calibration, struct problem *it, const int *list,
                       int count)
{
    it->parts = arena_new_array(calibration->arena, struct part, count);
    if (it->parts == NULL) {
        return false;
    }
    it->part_count = count;
    for (int p = 0; p < count; p++) {
        struct part *part = &it->parts[p];
        part->device = &calibration->devices[list[p]];
        part->first = it->base.residual_count;
        if (!make_rows(calibration, it->base.offset_count > 0, part) ||
            !make_pairs(calibration, part)) {
            return false;
        }
        it->base.residual_count += part->row_count + part->pair_count;
    }
    return true;
}

/* Lengths that differ by a tenth and more. */
static int count_lengths(const struct calibration *calibration, const int *list, int count)
{
    int found = 0;
    for (int p = 0; p < count; p++) {
        bool is_known = false;
        for (int q = 0; q < p; q++) {
            double ratio = calibration->devices[list[p]].data.length /
                           calibration->devices[list[q]].data.length;
            is_known |= ratio > 1 / 1.1 && ratio < 1.1;
        }
        found += is_known ? 0 : 1;
    }
    return found;
}

/* What the devices together can tell: sum of enum need. */
static unsigned find_abilities(const struct calibration *calibration, const struct fit *fit,
                               const int *list, int count)
{
    unsigned found = fit->is_set ? NEED_SET : 0;
    double kelvins[2] = {INFINITY, 0}, lengths[2] = {INFINITY, 0}, widths[2] = {INFINITY, 0};
    for (int p = 0; p < count; p++) {
        const struct measured *data = &calibration->devices[list[p]].data;
        lengths[0] = fmin(lengths[0], data->length);
        lengths[1] = fmax(lengths[1], data->length);
        widths[0] = fmin(widths[0], data->width);
        widths[1] = fmax(widths[1], data->width);
        for (int t = 0; t < data->kelvin_count; t++) {
            kelvins[0] = fmin(kelvins[0], data->kelvins[t]);
            kelvins[1] = fmax(kelvins[1], data->kelvins[t]);
        }
        const struct mos_facts *facts = &calibration->devices[list[p]].facts;
        int last = facts->body_count - 1;
        found |= facts->body_voltage[last] - facts->body_voltage[0] > 0.3 ? NEED_BODY : 0;
        found |= facts->has_drain_sweep ? NEED_DRAIN : 0;
    }
    found |= lengths[1] > 1.5 * lengths[0] ? NEED_LENGTHS : 0;
    found |= count_lengths(calibration, list, count) >= 4 ? NEED_SHAPE : 0;
    found |= widths[1] > 1.5 * widths[0] ? NEED_WIDTHS : 0;
    found |= lengths[0] < 0.3e-6 && lengths[1] > 0.3e-6 ? NEED_SHORT : 0;
    found |= kelvins[1] - kelvins[0] > 10 ? NEED_TEMPERATURES : 0;
    return found;
}

/* Start values from what the data say; the rest keeps its usual ones. */
static void set_starts(struct problem *it, const struct fit *fit)
{
    double threshold = 0, kprime = 0, slope = 0, early = 0, body = 0;
    for (int p = 0; p < it->part_count; p++) {
        const struct mos_facts *one = &it->parts[p].device->facts;
        double share = 1.0 / it->part_count;
        int last = one->body_count - 1;
        double bend = sqrt(0.8 + one->body_voltage[last]) - sqrt(0.8 + one->body_voltage[0]);
        double rise = one->body_threshold[last] - one->body_threshold[0];
        double scale = fit->is_set ? sqrt(it->parts[p].device->data.length / 1e-6) : 1;
        threshold += share * one->threshold;
        kprime += share * log(one->kprime);
        slope += share * one->slope_factor;
        body += share * (bend > 0.1 ? rise / bend : 0.4);
        early += share * log((one->early > 0 ? one->early : 3) / scale);
    }
    /* the constant current is about a tenth of the specific current: some 3 U below threshold */
    fitting_start(&it->base, "threshold", threshold + 0.08);
    fitting_start(&it->base, "kprime", exp(kprime));
    fitting_start(&it->base, "slope_factor", slope);
    fitting_start(&it->base, "body_effect", fmin(fmax(body, 0.05), 1.5));
    fitting_start(&it->base, "early", fmin(fmax(exp(early), 0.2), 500));
}

/* Widths and slopes stay positive. */
static void narrow_ranges(struct problem *it)
{
    for (int k = 0; k < it->base.sought_count; k++) {
        struct bounded *range = &it->base.ranges[k];
        for (int p = 0; p < it->part_count; p++) {
            const struct measured *data = &it->parts[p].device->data;
            if (strcmp(it->base.sought[k].name, "width_offset") == 0) {
                range->most = fmin(range->most, 0.5 * data->width);
            } else if (strcmp(it->base.sought[k].name, "narrow_slope") == 0) {
                range->least = fmax(range->least, -0.5 * data->width / 1e-6);
            }
        }
    }
}

enum status mos_fit(struct calibration *calibration, const struct calibration_request *request,
                    const int *list, int count, struct fit *fit)
{
    struct problem *it = arena_new(calibration->arena, struct problem);
    if (it == NULL) {
        return STATUS_MEMORY;
    }
    it->base = (struct fitting){.request = request,
                                .type = fit->type,
                                .sought = mos_sought,
                                .sought_count = mos_sought_count,
                                .evaluate = evaluate,
                                .offset_count = fit->is_set ? count : 0};
    it->kelvin = calibration->measured_kelvin;
    if (!make_parts(calibration, it, list, count) ||
        !fitting_begin(calibration, &it->base, fit, list, count,
                       find_abilities(calibration, fit, list, count))) {
        return STATUS_MEMORY;
    }
    it->base.residual_count += fit->is_set ? count + mos_usual_count : 0;
    if (!fit->is_set) { /* the Early voltage of a card is that of its own length */
        it->base.model[fitting_place(fit->type, "early_exponent")] = 0;
    }
    set_starts(it, fit);
    narrow_ranges(it);
    return fitting_solve(calibration, &it->base, fit);
}

/* mos_start.c: what the data of a transistor say before any fit: thresholds, gain, slopes. */
#include <math.h>
#include <stdlib.h>

#include "calibrate/mos_fit.h"

/* Constant-current thresholds: this current times W/L. */
static const double current_n = 100e-9, current_p = 50e-9; /* A */

static const double same_setting = 1e-6, fine_step = 0.11; /* V */

static double value(const struct measured *data, int row, enum column column)
{
    double it = data->rows[row].value[column];
    return isnan(it) ? 0 : it;
}

/* A reading of a gate characteristic. */
struct reading {
    double vgs, id;
};

static int by_gate(const void *a, const void *b)
{
    const struct reading *x = a, *y = b;
    return (x->vgs > y->vgs) - (x->vgs < y->vgs);
}

/* The gate characteristic at one drain and body voltage, from whatever sweep; its length. */
static int gather(const struct measured *data, double vds, double vsb, struct reading *list)
{
    int count = 0;
    for (int k = 0; k < data->row_count; k++) {
        if (!data->rows[k].is_left_out && data->rows[k].kelvin == 0 &&
            fabs(value(data, k, COLUMN_VDS) - vds) < same_setting &&
            fabs(value(data, k, COLUMN_VSB) - vsb) < same_setting) {
            list[count++] = (struct reading){value(data, k, COLUMN_VGS), value(data, k, COLUMN_ID)};
        }
    }
    qsort(list, (size_t)count, sizeof *list, by_gate);
    return count;
}

/* Gate voltage at which the current is crossed, ln id between readings no further apart than `gap`;
 * NAN: never. */
static double crossing(const struct reading *list, int count, double current, double gap)
{
    for (int k = count - 1; k > 0; k--) { /* from above: below, noise may cross it too */
        double low = list[k - 1].id, high = list[k].id;
        if (high >= current && low < current && list[k].vgs - list[k - 1].vgs <= gap) {
            double share =
                low > 0 ? log(current / low) / log(high / low) : (current - low) / (high - low);
            return list[k - 1].vgs + share * (list[k].vgs - list[k - 1].vgs);
        }
    }
    return NAN;
}

static void note_threshold(struct mos_facts *facts, double vsb, double threshold)
{
    int k = facts->body_count;
    if (k == MOS_BODY_LIMIT) {
        return;
    }
    for (; k > 0 && facts->body_voltage[k - 1] > vsb; k--) {
        facts->body_voltage[k] = facts->body_voltage[k - 1];
        facts->body_threshold[k] = facts->body_threshold[k - 1];
    }
    facts->body_voltage[k] = vsb;
    facts->body_threshold[k] = threshold;
    facts->body_count++;
}

/* Steepest transconductance over W/L and the drain voltage that counts in triode operation; the
 * factor is for what mobility reduction takes there. */
static double steepest_gain(const struct measured *data, const struct reading *list, int count,
                            double vds)
{
    double steepest = 0;
    for (int k = 2; k < count; k++) {
        double run = list[k].vgs - list[k - 2].vgs;
        double gm = run > 1e-3 ? (list[k].id - list[k - 2].id) / run : 0;
        steepest = fmax(steepest, gm);
    }
    return 1.5 * steepest / (fmin(vds, 0.3) * data->multiplicity * data->width / data->length);
}

/* dV/d ln I below the threshold over kT/q n with n = 1.3. */
static double weak_slope(const struct measured *data, const struct reading *list, int count,
                         double current)
{
    double upper = crossing(list, count, current, INFINITY);
    double lower = crossing(list, count, current / 5, INFINITY);
    double thermal = BOLTZMANN_OVER_CHARGE * data->kelvins[0];
    double factor = (upper - lower) / log(5) / (1.3 * thermal);
    return isfinite(factor) ? fmin(fmax(factor, 0.9), 2) : 1.2;
}

/* The smallest value of a column above a limit, among rows with that body voltage (NAN: any). */
static double next_value(const struct measured *data, enum column column, double above, double vsb)
{
    double next = INFINITY;
    for (int k = 0; k < data->row_count; k++) {
        double it = value(data, k, column);
        if (it > above + same_setting &&
            (isnan(vsb) || fabs(value(data, k, COLUMN_VSB) - vsb) < same_setting)) {
            next = fmin(next, it);
        }
    }
    return next;
}

/* The threshold at a body voltage from the least drain voltage that shows one. */
static bool find_threshold(const struct measured *data, double vsb, double current, double gap,
                           struct reading *list, struct mos_facts *facts)
{
    for (double vds = next_value(data, COLUMN_VDS, 1e-3, vsb); isfinite(vds);
         vds = next_value(data, COLUMN_VDS, vds, vsb)) {
        int count = gather(data, vds, vsb, list);
        double crossed = count > 3 ? crossing(list, count, current, gap) : NAN;
        if (isnan(crossed)) {
            continue;
        }
        note_threshold(facts, vsb, crossed);
        if (isnan(facts->kprime)) {
            facts->kprime = steepest_gain(data, list, count, vds);
            facts->slope_factor = weak_slope(data, list, count, current);
        }
        return true;
    }
    return false;
}

/* Early voltage at onset 0.1 V from the drain sweep with the most current. */
static void find_early(const struct measured *data, struct mos_facts *facts)
{
    double most = 0;
    for (int s = 0; s < data->sweep_count; s++) {
        const struct measured_sweep *sweep = &data->sweeps[s];
        int last = sweep->first + sweep->count - 1, middle = sweep->first + 2 * sweep->count / 3;
        if (sweep->moved != COLUMN_VDS || sweep->count < 6) {
            continue;
        }
        double high = value(data, last, COLUMN_VDS), low = value(data, middle, COLUMN_VDS);
        double id = value(data, last, COLUMN_ID);
        double rise = id - value(data, middle, COLUMN_ID);
        facts->has_drain_sweep |= high > 0.6;
        if (high > 0.6 && id > most && rise > 0) {
            most = id;
            double beyond = (high + low) / 2 - 0.4;
            facts->early = id * (high - low) / rise * 0.1 / (0.1 + fmax(beyond, 0));
        }
    }
}

bool mos_find_facts(struct arena *arena, const struct measured *data,
                    const struct device_type *type, struct mos_facts *facts)
{
    double current = (type->polarity > 0 ? current_n : current_p) * data->multiplicity *
                     data->width / data->length;
    struct reading *list = arena_new_array(arena, struct reading, data->row_count);
    *facts = (struct mos_facts){
        .threshold = NAN, .kprime = NAN, .early = NAN, .slope_factor = 1.2, .drain_most = 0};
    if (list == NULL) {
        return false;
    }
    for (double vsb = next_value(data, COLUMN_VSB, -INFINITY, NAN); isfinite(vsb);
         vsb = next_value(data, COLUMN_VSB, vsb, NAN)) {
        /* gate sweeps first; the gate steps of drain sweeps are coarse */
        if (!find_threshold(data, vsb, current, fine_step, list, facts)) {
            (void)find_threshold(data, vsb, current, INFINITY, list, facts);
        }
    }
    find_early(data, facts);
    for (int k = 0; k < data->row_count; k++) {
        facts->drain_most = fmax(facts->drain_most, value(data, k, COLUMN_VDS));
    }
    if (facts->body_count == 0 || !(facts->kprime > 0)) {
        return false;
    }
    facts->threshold = facts->body_threshold[0];
    return true;
}

double mos_threshold_at(const struct mos_facts *facts, double vsb)
{
    int last = facts->body_count - 1;
    if (last == 0 || vsb <= facts->body_voltage[0]) {
        return facts->body_threshold[0];
    }
    int k = 1;
    while (k < last && facts->body_voltage[k] < vsb) {
        k++;
    }
    double share =
        (vsb - facts->body_voltage[k - 1]) / (facts->body_voltage[k] - facts->body_voltage[k - 1]);
    return facts->body_threshold[k - 1] +
           share * (facts->body_threshold[k] - facts->body_threshold[k - 1]);
}

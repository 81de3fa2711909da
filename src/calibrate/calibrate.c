/* calibrate.c: the stages: read, screen, cards, set, comparison. */
#include "calibrate/calibrate.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "calibrate/honesty.h"
#include "calibrate/input.h"
#include "calibrate/junction_fit.h"
#include "calibrate/mos_fit.h"
#include "calibrate/screen.h"

/* A set follows its devices when none is further off in saturation, and none needs another
 * threshold. */
static const double set_limit = 0.1, offset_limit = 50e-3; /* relative, V */

/* Devices whose kprime is off the middle one of their length by more than these factors do not have
 * the drawn geometry. */
static const double units_most = 2, units_least = 0.5, same_length = 1.5;

enum { MIDDLE_LEAST = 3 /* fewest devices that have a middle one */ };

const char *const figures_region_names[FIGURES_REGIONS] = {
    [FIGURES_SATURATION] = "saturation",
    [FIGURES_TRIODE] = "triode",
    [FIGURES_WEAK] = "weak",
};

struct run {
    const struct calibration_request *request;
    struct calibration *c;
    int *list; /* [device_count] room for a choice of devices */
};

static bool is_transistor(const struct calibrated_device *device)
{
    return !isnan(device->data.length);
}

static void show_progress(const struct run *run, const char *what, double share)
{
    if (run->request->progress != NULL) {
        run->request->progress(run->request->progress_self, what, share);
    }
}

/* "7", "0p42": micrometres in a name. */
static void write_length(char *text, size_t size, double metre)
{
    number_exact(round(metre * 1e12) / 1e6, text, size);
    for (char *at = text; *at != '\0'; at++) {
        *at = (char)(*at == '.' ? 'p' : *at == '-' ? 'm' : *at);
    }
}

static bool name_taken(const struct calibration *c, const char *name)
{
    for (int k = 0; k < c->fit_count; k++) {
        if (strcmp(c->fits[k].name, name) == 0) {
            return true;
        }
    }
    return false;
}

/* A name nobody has yet: NAME, NAME_2, ... NULL when memory is short. */
static const char *free_name(struct calibration *c, const char *wanted)
{
    const char *name = wanted;
    for (int k = 2; name != NULL && name_taken(c, name); k++) {
        name = arena_format(c->arena, "%s_%d", wanted, k);
    }
    return name;
}

static bool is_one_kind(const struct calibration *c)
{
    for (int k = 1; k < c->device_count; k++) {
        if (strcmp(c->devices[k].channel, c->devices[0].channel) != 0) {
            return false;
        }
    }
    return true;
}

/* The name of the model that a cell takes without asking for a card. */
static const char *plain_name(const struct run *run, const char *kind)
{
    const char *model = run->request->model;
    if (model == NULL) {
        return kind;
    }
    return is_one_kind(run->c) ? model : arena_format(run->c->arena, "%s_%s", model, kind);
}

static const char *card_name(const struct run *run, const struct calibrated_device *device,
                             bool is_only)
{
    char width[64], length[64];
    if (is_only || !is_transistor(device)) {
        return free_name(run->c, plain_name(run, device->channel));
    }
    write_length(width, sizeof width, device->data.width);
    write_length(length, sizeof length, device->data.length);
    const char *letter = device->type->polarity > 0 ? "n" : "p";
    const char *before = run->request->model == NULL ? letter : plain_name(run, device->channel);
    return free_name(run->c, before == NULL
                                 ? NULL
                                 : arena_format(run->c->arena, "%s_%s_%s", before, width, length));
}

static bool prepare_devices(struct run *run)
{
    struct calibration *c = run->c;
    for (int k = 0; k < c->device_count; k++) {
        struct calibrated_device *device = &c->devices[k];
        if (!is_transistor(device)) {
            enum column column = device->data.has_column[COLUMN_IC] ? COLUMN_IC : COLUMN_I;
            if (!screen_readings(c, k, column)) {
                return false;
            }
            continue;
        }
        if (!screen_transistor(c, k)) {
            return false;
        }
        if (!mos_find_facts(c->arena, &device->data, device->type, &device->facts)) {
            diagnostics_add(&c->diagnostics, (struct span){device->data.file, 0, 0},
                            "readings on both sides of 100 nA W/L (n) or 50 nA W/L (p)",
                            "no threshold: the current never crosses the one it is defined by");
        }
    }
    return !arena_failed(c->arena);
}

static enum status fit_one(struct run *run, const int *list, int count, struct fit *fit)
{
    if (count == 1 && !is_transistor(&run->c->devices[list[0]])) {
        return junction_fit(run->c, run->request, list[0], fit);
    }
    return mos_fit(run->c, run->request, list, count, fit);
}

/* Devices of a kind that are fitted; their number. */
static int choose(struct run *run, const char *kind, bool for_set)
{
    int count = 0;
    for (int k = 0; k < run->c->device_count; k++) {
        const struct calibrated_device *device = &run->c->devices[k];
        if (strcmp(device->channel, kind) == 0 && !device->is_held &&
            !(for_set && device->is_out)) {
            run->list[count++] = k;
        }
    }
    return count;
}

static enum status fit_cards(struct run *run, const char *kind)
{
    struct calibration *c = run->c;
    int count = choose(run, kind, false);
    for (int k = 0; k < count; k++) {
        int device = run->list[k];
        show_progress(run, c->devices[device].data.name, (double)device / c->device_count);
        struct fit *fit = &c->fits[c->fit_count];
        memset(fit, 0, sizeof *fit);
        fit->type = c->devices[device].type;
        fit->name = card_name(run, &c->devices[device], count == 1);
        fit->is_written = true;
        if (fit->name == NULL) {
            return STATUS_MEMORY;
        }
        enum status status = fit_one(run, &device, 1, fit);
        if (status != STATUS_OK) {
            return status;
        }
        c->fit_count++;
    }
    return STATUS_OK;
}

/* The card of a device; NULL: none. */
static const struct fit *card_of(const struct calibration *c, int device)
{
    for (int k = 0; k < c->fit_count; k++) {
        if (!c->fits[k].is_set && c->fits[k].alias_of == NULL && c->fits[k].devices[0] == device) {
            return &c->fits[k];
        }
    }
    return NULL;
}

static double value_of(const struct fit *fit, const char *name)
{
    for (int k = 0; k < fit->value_count; k++) {
        if (strcmp(fit->values[k].parameter->name, name) == 0) {
            return fit->values[k].value;
        }
    }
    return NAN;
}

static int by_size(const void *a, const void *b)
{
    const double *x = a, *y = b;
    return (*x > *y) - (*x < *y);
}

/*
 * The middle kprime of the cards of list[count] whose length is near `length`, or of all where
 * there are too few; NAN where even those are too few.
 */
static double middle_kprime(const struct calibration *c, const int *list, int count, double length,
                            double *sorted)
{
    for (int pass = 0; pass < 2; pass++) {
        int found = 0;
        for (int k = 0; k < count; k++) {
            double ratio = c->devices[list[k]].data.length / length;
            if (pass == 1 || (ratio < same_length && ratio > 1 / same_length)) {
                sorted[found++] = value_of(card_of(c, list[k]), "kprime");
            }
        }
        if (found >= MIDDLE_LEAST) {
            qsort(sorted, (size_t)found, sizeof *sorted, by_size);
            return sorted[(found - 1) / 2];
        }
    }
    return NAN;
}

/* Devices that carry another current than their drawn geometry says, by their cards. */
static bool check_units(struct run *run, const char *kind)
{
    struct calibration *c = run->c;
    int count = choose(run, kind, false);
    double *sorted = arena_new_array(c->arena, double, count);
    bool is_good = sorted != NULL;
    for (int k = 0; is_good && k < count; k++) {
        struct calibrated_device *device = &c->devices[run->list[k]];
        device->unit_ratio = value_of(card_of(c, run->list[k]), "kprime") /
                             middle_kprime(c, run->list, count, device->data.length, sorted);
        if (isnan(device->unit_ratio) ||
            (device->unit_ratio < units_most && device->unit_ratio > units_least)) {
            continue;
        }
        device->is_out = true;
        is_good = calibration_remark(
            c, "geometry", run->list[k],
            "its current is %.2g times what W/L and the other devices say; it is left out of the "
            "set (several units in parallel? Column m of a list gives their number)",
            device->unit_ratio);
    }
    return is_good;
}

static bool same_geometry(const struct calibration *c, const int *list, int count)
{
    for (int k = 1; k < count; k++) {
        const struct measured *a = &c->devices[list[0]].data, *b = &c->devices[list[k]].data;
        if (fabs(a->width / b->width - 1) > 1e-3 || fabs(a->length / b->length - 1) > 1e-3) {
            return false;
        }
    }
    return true;
}

/* The largest saturation error of a set over its own devices. */
static double worst_of(const struct calibration *c, const struct fit *fit)
{
    double model[MODEL_VALUE_LIMIT], worst = 0;
    fitting_values(fit, model);
    for (int k = 0; k < fit->device_count; k++) {
        struct device_figures figures;
        mos_compare(c, &c->devices[fit->devices[k]], model, fit->offsets[k], &figures);
        worst = fmax(worst, figures.id[FIGURES_SATURATION].rms);
    }
    return worst;
}

static enum status fit_set(struct run *run, const char *kind)
{
    struct calibration *c = run->c;
    int count = choose(run, kind, true);
    if (count < 2 || same_geometry(c, run->list, count)) {
        return calibration_remark(c, "set", -1, "%s: a set needs devices of different geometry",
                                  kind)
                   ? STATUS_OK
                   : STATUS_MEMORY;
    }
    show_progress(run, "the set", 0.9);
    struct fit *fit = &c->fits[c->fit_count];
    memset(fit, 0, sizeof *fit);
    fit->type = c->devices[run->list[0]].type;
    fit->name = free_name(c, plain_name(run, kind));
    fit->is_set = true;
    enum status status = fit->name == NULL ? STATUS_MEMORY : fit_one(run, run->list, count, fit);
    if (status != STATUS_OK) {
        return status;
    }
    c->fit_count++;
    double worst = worst_of(c, fit);
    int odd = 0; /* the device whose threshold is furthest off */
    for (int k = 1; k < fit->device_count; k++) {
        odd = fabs(fit->offsets[k]) > fabs(fit->offsets[odd]) ? k : odd;
    }
    double offset = fabs(fit->offsets[odd]);
    fit->is_written = worst <= set_limit && offset <= offset_limit;
    if (!fit->is_written) {
        fit->remark = arena_format(
            c->arena,
            "not written: up to %.0f %% off in saturation, the threshold of %s %+.0f mV off, where "
            "a set allows %.0f %% and %.0f mV; these devices differ by more than size (layout "
            "shifts thresholds), take the cards",
            100 * worst, c->devices[fit->devices[odd]].data.name, 1e3 * fit->offsets[odd],
            100 * set_limit, 1e3 * offset_limit);
    }
    return fit->is_written || fit->remark != NULL ? STATUS_OK : STATUS_MEMORY;
}

/* Without a set a cell that names no model gets the card of the longest, then widest device. */
static bool add_alias(struct run *run, const char *kind)
{
    struct calibration *c = run->c;
    int count = choose(run, kind, true), best = -1;
    const char *plain = plain_name(run, kind);
    for (int k = 0; k < c->fit_count; k++) {
        if (c->fits[k].is_set && c->fits[k].is_written && plain != NULL &&
            strcmp(c->fits[k].name, plain) == 0) {
            return true;
        }
    }
    for (int k = 0; k < count; k++) {
        const struct measured *data = &c->devices[run->list[k]].data;
        const struct measured *known = best < 0 ? NULL : &c->devices[best].data;
        if (known == NULL || data->length > known->length ||
            (data->length >= known->length && data->width > known->width)) {
            best = run->list[k];
        }
    }
    const struct fit *card = best < 0 ? NULL : card_of(c, best);
    if (card == NULL || count < 2) {
        return plain != NULL;
    }
    struct fit *fit = &c->fits[c->fit_count];
    *fit = *card;
    fit->alias_of = card->name;
    fit->name = plain;
    fit->remark = "the card of the longest device, for cells that name no model";
    c->fit_count++;
    return plain != NULL;
}

/* Cards are wanted for themselves, and to see which devices fit into a set. */
static enum status fit_kind(struct run *run, const char *kind)
{
    struct calibration *c = run->c;
    int count = choose(run, kind, false), first = c->fit_count;
    if (count == 0) {
        return STATUS_OK;
    }
    bool has_geometry = is_transistor(&c->devices[run->list[0]]);
    enum calibration_form form = run->request->form;
    bool wants_set = has_geometry && form != FORM_CARDS && (count > 1 || form == FORM_SET);
    enum status status = fit_cards(run, kind);
    if (status != STATUS_OK || !has_geometry) {
        return status;
    }
    if (!check_units(run, kind)) {
        return STATUS_MEMORY;
    }
    int after = c->fit_count;
    if (wants_set) {
        status = fit_set(run, kind);
    }
    for (int k = first; k < after && form == FORM_SET && c->fit_count > after; k++) {
        c->fits[k].is_written = false;
        c->fits[k].remark = "not asked for";
    }
    if (status == STATUS_OK && form != FORM_SET && !add_alias(run, kind)) {
        status = STATUS_MEMORY;
    }
    return status;
}

static enum status fit_resistors(struct run *run)
{
    struct calibration *c = run->c;
    int count = choose(run, "resistor", false);
    c->resistors = arena_new_array(c->arena, struct fitted_resistor, count);
    for (int k = 0; k < count && c->resistors != NULL; k++) {
        enum status status = resistor_fit(c, run->list[k], &c->resistors[k]);
        if (status != STATUS_OK) {
            return status;
        }
        c->resistor_count++;
    }
    return c->resistors == NULL ? STATUS_MEMORY : STATUS_OK;
}

static bool add_comparison(struct calibration *c, int device, int fit, double offset)
{
    struct comparison *it = &c->comparisons[c->comparison_count++];
    double model[MODEL_VALUE_LIMIT];
    *it = (struct comparison){
        .device = device, .fit = fit, .is_held = c->devices[device].is_held, .offset = offset};
    fitting_values(&c->fits[fit], model);
    if (is_transistor(&c->devices[device])) {
        mos_compare(c, &c->devices[device], model, offset, &it->figures);
        return mos_error_curve(c, &c->devices[device], model, offset, &it->curve);
    }
    junction_compare(c, &c->devices[device], model, &it->figures);
    return true;
}

/* Distance of two geometries, in factors of length, then width. */
static double distance(const struct measured *a, const struct measured *b)
{
    return isnan(a->length)
               ? 0
               : fabs(log(a->length / b->length)) + 0.1 * fabs(log(a->width / b->width));
}

/* What predicts a device that was not fitted: the sets, else the nearest card. */
static bool compare_held(struct calibration *c, int device)
{
    bool is_good = true;
    int nearest = -1;
    bool has_set = false;
    for (int k = 0; k < c->fit_count; k++) {
        const struct fit *fit = &c->fits[k];
        if (fit->type != c->devices[device].type || fit->alias_of != NULL) {
            continue;
        }
        if (fit->is_set) {
            is_good &= add_comparison(c, device, k, 0);
            has_set = true;
        } else if (nearest < 0 ||
                   distance(&c->devices[fit->devices[0]].data, &c->devices[device].data) <
                       distance(&c->devices[c->fits[nearest].devices[0]].data,
                                &c->devices[device].data)) {
            nearest = k;
        }
    }
    return has_set || nearest < 0 ? is_good : add_comparison(c, device, nearest, 0);
}

static bool compare_all(struct calibration *c)
{
    c->comparisons =
        arena_new_array(c->arena, struct comparison, (c->device_count + 1) * (c->fit_count + 1));
    bool is_good = c->comparisons != NULL;
    for (int k = 0; is_good && k < c->fit_count; k++) {
        const struct fit *fit = &c->fits[k];
        bool is_shown = fit->alias_of == NULL && (fit->is_set || fit->is_written);
        for (int d = 0; d < fit->device_count && is_shown; d++) {
            is_good &= add_comparison(c, fit->devices[d], k, fit->is_set ? fit->offsets[d] : 0);
        }
    }
    for (int d = 0; is_good && d < c->device_count; d++) {
        is_good = !c->devices[d].is_held || compare_held(c, d);
    }
    return is_good;
}

static enum status run_stages(struct run *run)
{
    static const char *const kinds[] = {"nmos", "pmos", "diode", "npn", "pnp"};
    struct calibration *c = run->c;
    enum status status = input_read(run->request, c);
    if (status != STATUS_OK) {
        return status;
    }
    if (!prepare_devices(run)) {
        return STATUS_MEMORY;
    }
    if (c->diagnostics.count > 0) {
        return STATUS_INPUT;
    }
    run->list = arena_new_array(c->arena, int, c->device_count);
    c->fits = arena_new_array(c->arena, struct fit, 2 * c->device_count + 8);
    if (run->list == NULL || c->fits == NULL) {
        return STATUS_MEMORY;
    }
    for (size_t k = 0; k < sizeof kinds / sizeof kinds[0]; k++) {
        status = fit_kind(run, kinds[k]);
        if (status != STATUS_OK) {
            return status;
        }
    }
    status = fit_resistors(run);
    if (status != STATUS_OK) {
        return status;
    }
    if (c->fit_count == 0 && c->resistor_count == 0) {
        diagnostics_add(&c->diagnostics, SPAN_NONE, NULL, "all devices are held: none is fitted");
        return STATUS_INPUT;
    }
    return compare_all(c) && honesty_remarks(c) ? STATUS_OK : STATUS_MEMORY;
}

enum status calibration_run(const struct calibration_request *request, struct calibration **result)
{
    struct calibration *c = calloc(1, sizeof *c);
    *result = c;
    if (c == NULL) {
        return STATUS_MEMORY;
    }
    c->arena = arena_create();
    if (c->arena == NULL) {
        return STATUS_MEMORY;
    }
    c->diagnostics.arena = c->arena;
    struct run run = {request, c, NULL};
    enum status status = run_stages(&run);
    return c->diagnostics.out_of_memory ? STATUS_MEMORY : status;
}

void calibration_free(struct calibration *calibration)
{
    if (calibration != NULL) {
        arena_destroy(calibration->arena);
        free(calibration);
    }
}

/*
 * json_calibration.c: a calibration as one JSON object (RFC 8259), written by jansson: SI units, 17
 * significant digits; a value that does not apply has no key.
 */
#include "report/calibration.h"

#include <jansson.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { SCHEMA_VERSION = 1, JSON_DIGITS = 17, KEY_SIZE = 64 };

/* The functions below add one key; jansson takes a NULL as a refusal, and the writer remembers. */
struct writer {
    bool failed;
};

static void put(struct writer *writer, json_t *object, const char *key, json_t *value)
{
    if (json_object_set_new(object, key, value) != 0) {
        writer->failed = true;
    }
}

static void put_number(struct writer *writer, json_t *object, const char *key, double value)
{
    if (isfinite(value)) {
        put(writer, object, key, json_real(value));
    }
}

/* Bytes that are no UTF-8 (a file name may hold any) become '?'. */
static void put_text(struct writer *writer, json_t *object, const char *key, const char *text)
{
    if (text == NULL) {
        return;
    }
    json_t *value = json_string(text);
    char *plain = value == NULL ? strdup(text) : NULL;
    if (plain != NULL) {
        for (char *at = plain; *at != '\0'; at++) {
            *at = (char)((unsigned char)*at < 0x80 ? *at : '?');
        }
        value = json_string(plain);
        free(plain);
    }
    put(writer, object, key, value);
}

static void put_numbers(struct writer *writer, json_t *object, const char *key,
                        const double *values, int count)
{
    json_t *array = json_array();
    for (int k = 0; k < count; k++) {
        if (json_array_append_new(array, json_real(values[k])) != 0) {
            writer->failed = true;
        }
    }
    put(writer, object, key, array);
}

static json_t *put_list(struct writer *writer, json_t *object, const char *key)
{
    put(writer, object, key, json_array());
    return json_object_get(object, key);
}

static json_t *append_object(struct writer *writer, json_t *array)
{
    json_t *object = json_object();
    if (json_array_append_new(array, object) != 0) {
        writer->failed = true;
        return NULL;
    }
    return object;
}

/* "NAME_rms", "NAME_worst", "NAME_count" */
static void put_figure(struct writer *writer, json_t *object, const char *name,
                       const struct misfit *figure)
{
    char key[KEY_SIZE];
    if (figure->count == 0) {
        return;
    }
    snprintf(key, sizeof key, "%s_rms", name);
    put_number(writer, object, key, figure->rms);
    snprintf(key, sizeof key, "%s_worst", name);
    put_number(writer, object, key, figure->worst);
    snprintf(key, sizeof key, "%s_count", name);
    put(writer, object, key, json_integer(figure->count));
}

static void put_comparison(struct writer *writer, json_t *list, const struct calibration *c,
                           const struct comparison *it)
{
    const struct calibrated_device *device = &c->devices[it->device];
    const struct device_figures *figures = &it->figures;
    json_t *object = append_object(writer, list);
    put_text(writer, object, "file", device->data.name);
    put_text(writer, object, "kind", device->channel);
    put_text(writer, object, "model", c->fits[it->fit].name);
    put(writer, object, "predicted", json_boolean(it->is_held));
    if (isnan(device->data.length)) {
        put_figure(writer, object, device->type->terminal_count == 2 ? "i" : "ic",
                   &figures->id[FIGURES_SATURATION]);
        put_figure(writer, object, "ib", &figures->ib);
        return;
    }
    put_number(writer, object, "W", device->data.width);
    put_number(writer, object, "L", device->data.length);
    put_number(writer, object, "m", device->data.multiplicity);
    put_number(writer, object, "threshold_constant_current", device->facts.threshold);
    put_number(writer, object, "threshold_offset", it->offset);
    for (int k = 0; k < FIGURES_REGIONS; k++) {
        char name[KEY_SIZE];
        snprintf(name, sizeof name, "id_%s", figures_region_names[k]);
        put_figure(writer, object, name, &figures->id[k]);
    }
    put_figure(writer, object, "gm", &figures->gm);
    put_figure(writer, object, "gds", &figures->gds);
    if (it->curve.count > 1) {
        put(writer, object, "error_curve", json_object());
        json_t *curve = json_object_get(object, "error_curve");
        put_numbers(writer, curve, it->curve.voltage, it->curve.x, it->curve.count);
        put_numbers(writer, curve, "error", it->curve.y, it->curve.count);
    }
}

static const char *const origin_words[ORIGIN_COUNT] = {
    [ORIGIN_FITTED] = "fitted", [ORIGIN_LIMIT] = "limit",     [ORIGIN_HELD] = "held",
    [ORIGIN_SHAPE] = "fixed",   [ORIGIN_DEFAULT] = "default",
};

static void put_value(struct writer *writer, json_t *values, const struct fitted_value *it)
{
    char unit[KEY_SIZE];
    put(writer, values, it->parameter->name, json_object());
    json_t *object = json_object_get(values, it->parameter->name);
    dimension_unit(it->parameter->dimension, unit, sizeof unit);
    put_number(writer, object, "value", it->value);
    put_number(writer, object, "standard_error", it->standard);
    put_text(writer, object, "unit", unit);
    put_text(writer, object, "origin", origin_words[it->origin]);
    put_text(writer, object, "reason", it->reason);
}

static void put_name(struct writer *writer, json_t *object, const char *key,
                     const struct calibration *c, const struct fit *fit, int index)
{
    if (index >= 0) {
        put_text(writer, object, key, fit->values[index].parameter->name);
    } else {
        put_text(writer, object, key, c->devices[-1 - index].data.name);
    }
}

static void put_fit(struct writer *writer, json_t *list, const struct calibration *c,
                    const struct fit *fit)
{
    json_t *object = append_object(writer, list);
    put_text(writer, object, "name", fit->name);
    put_text(writer, object, "kind", fit->type->model_kind);
    put_text(writer, object, "form", fit->is_set ? "set" : "card");
    put(writer, object, "written", json_boolean(fit->is_written));
    put_text(writer, object, "same_as", fit->alias_of);
    put_text(writer, object, "remark", fit->remark);
    put(writer, object, "rank", json_integer(fit->rank));
    put(writer, object, "free", json_integer(fit->free_count));
    put(writer, object, "residuals", json_integer(fit->residual_count));
    put(writer, object, "evaluations", json_integer(fit->evaluations));
    put_number(writer, object, "weighted_rms", sqrt(fit->reduced));
    put_text(writer, object, "ended", fit->ended);
    put(writer, object, "parameters", json_object());
    json_t *values = json_object_get(object, "parameters");
    for (int k = 0; k < fit->value_count; k++) {
        put_value(writer, values, &fit->values[k]);
    }
    json_t *correlations = put_list(writer, object, "correlations");
    for (int k = 0; k < fit->correlation_count; k++) {
        const struct correlated *it = &fit->correlations[k];
        json_t *row = append_object(writer, correlations);
        put_name(writer, row, "a", c, fit, it->a);
        put_name(writer, row, "b", c, fit, it->b);
        put_number(writer, row, "correlation", it->value);
    }
}

static void put_resistor(struct writer *writer, json_t *list, const struct calibration *c,
                         const struct fitted_resistor *it)
{
    json_t *object = append_object(writer, list);
    put_text(writer, object, "file", c->devices[it->device].data.name);
    put_number(writer, object, "ohm", it->ohm);
    put_number(writer, object, "ohm_error", it->ohm_error);
    put_number(writer, object, "tempco", it->tempco);
    put_number(writer, object, "tempco_error", it->tempco_error);
    put_number(writer, object, "tempco2", it->tempco2);
    put_number(writer, object, "tempco2_error", it->tempco2_error);
    put_number(writer, object, "measured_at", it->kelvin);
}

static int dump_to_buffer(const char *text, size_t length, void *data)
{
    struct buffer *out = data;
    buffer_put(out, text, length);
    return out->failed ? -1 : 0;
}

void report_json_calibration(const struct calibration *c, const char *version, struct buffer *out)
{
    struct writer writer = {false};
    json_t *root = json_object();
    put_text(&writer, root, "ampstead", version);
    put(&writer, root, "schema", json_integer(SCHEMA_VERSION));
    put_text(&writer, root, "command", "calibrate");
    put_number(&writer, root, "measured_at", c->measured_kelvin);
    put_number(&writer, root, "noise", c->noise);
    put_number(&writer, root, "accuracy", c->relative);
    json_t *devices = put_list(&writer, root, "devices");
    for (int k = 0; k < c->comparison_count; k++) {
        put_comparison(&writer, devices, c, &c->comparisons[k]);
    }
    json_t *fits = put_list(&writer, root, "models");
    for (int k = 0; k < c->fit_count; k++) {
        put_fit(&writer, fits, c, &c->fits[k]);
    }
    json_t *resistors = put_list(&writer, root, "resistors");
    for (int k = 0; k < c->resistor_count; k++) {
        put_resistor(&writer, resistors, c, &c->resistors[k]);
    }
    json_t *remarks = put_list(&writer, root, "remarks");
    for (int k = 0; k < c->remark_count; k++) {
        const struct calibration_remark *it = &c->remarks[k];
        json_t *row = append_object(&writer, remarks);
        put_text(&writer, row, "code", it->code);
        put_text(&writer, row, "file", it->device < 0 ? NULL : c->devices[it->device].data.name);
        put_text(&writer, row, "text", it->text);
    }
    if (writer.failed || root == NULL ||
        json_dump_callback(root, dump_to_buffer, out,
                           JSON_INDENT(1) | JSON_PRESERVE_ORDER |
                               JSON_REAL_PRECISION(JSON_DIGITS)) != 0) {
        out->failed = true;
    }
    buffer_text(out, "\n");
    json_decref(root);
}

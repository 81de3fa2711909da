/* process_text.c: a calibration as a process file, with the error of each value beside it. */
#include "report/calibration.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

enum { NAME_COLUMN = 21, VALUE_COLUMN = 18, DIGITS = 6, HEADING_COLUMNS = 100 };

const char *report_file_name(const struct calibration *calibration, int device)
{
    const char *name = calibration->devices[device].data.name, *slash = strrchr(name, '/');
    return slash == NULL ? name : slash + 1;
}

/* Temperatures this far from the measured ones are still called valid. */
static const double temperature_margin = 5; /* K */

/* A number with six digits, as the language reads it: plain, or with an exponent. */
static void number_text(double value, char *text, size_t size)
{
    char shown[64];
    double rounded = value;
    number_show(value, DIGITS, "", shown, sizeof shown);
    (void)number_parse(shown + (shown[0] == '-' ? 1 : 0), strlen(shown) - (shown[0] == '-' ? 1 : 0),
                       &rounded);
    number_exact(shown[0] == '-' ? -rounded : rounded, text, size);
}

/* A value with its unit in a form that the language reads: a length in nm, 1/V as /V. */
static void value_text(double value, struct dimension dimension, char *text, size_t size)
{
    char unit[64], number[64];
    dimension_unit(dimension, unit, sizeof unit);
    if (dimension_equal(dimension, DIMENSION_LENGTH)) {
        number_text(value * 1e9, number, sizeof number);
        snprintf(text, size, "%s nm", number);
        return;
    }
    if (strcmp(unit, "A/V^2") == 0) {
        number_text(value * 1e6, number, sizeof number);
        snprintf(text, size, "%s uA/V^2", number);
        return;
    }
    number_text(value, number, sizeof number);
    if (strncmp(unit, "1/", 2) == 0) {
        snprintf(text, size, "%s%s", number, unit + 1);
    } else {
        snprintf(text, size, "%s%s%s", number, unit[0] == '\0' ? "" : " ", unit);
    }
}

/* The standard error in the unit of the value, two digits. */
static void error_text(double error, struct dimension dimension, char *text, size_t size)
{
    char unit[64], number[64];
    const char *shown = unit;
    double scale = 1;
    dimension_unit(dimension, unit, sizeof unit);
    if (dimension_equal(dimension, DIMENSION_LENGTH)) {
        scale = 1e9;
        shown = "nm";
    } else if (strcmp(unit, "A/V^2") == 0) {
        scale = 1e6;
        shown = "uA/V^2";
    } else if (strncmp(unit, "1/", 2) == 0) {
        shown = unit + 1;
    }
    number_show(error * scale, 2, "", number, sizeof number);
    snprintf(text, size, "+- %s%s%s", number, shown[0] == '\0' || shown[0] == '/' ? "" : " ",
             shown);
}

/* A value that says nothing new: fixed by the form of a card where the default says the same. */
static bool is_idle(const struct fitted_value *it)
{
    const struct parameter *parameter = it->parameter;
    return isnan(it->value) || it->origin == ORIGIN_DEFAULT ||
           (it->origin == ORIGIN_SHAPE && parameter->when_absent == DEFAULT_VALUE &&
            fabs(it->value - parameter->standard) <= 0);
}

static void write_value(const struct fitted_value *it, struct buffer *out)
{
    char value[160], error[160] = "";
    if (is_idle(it)) {
        return;
    }
    value_text(it->value, it->parameter->dimension, value, sizeof value);
    if (it->origin == ORIGIN_FITTED) {
        error_text(it->standard, it->parameter->dimension, error, sizeof error);
    }
    const char *note = it->origin == ORIGIN_LIMIT   ? "at the end of its range"
                       : it->origin == ORIGIN_HELD  ? "held: "
                       : it->origin == ORIGIN_SHAPE ? "fixed: "
                                                    : error;
    buffer_format(out, "    %-*s = %-*s # %s%s\n", NAME_COLUMN, it->parameter->name, VALUE_COLUMN,
                  value, note,
                  (it->origin == ORIGIN_HELD || it->origin == ORIGIN_SHAPE) && it->reason != NULL
                      ? it->reason
                      : "");
}

/* "# left at defaults, one temperature: a, b" */
static void write_defaults(const struct fit *fit, struct buffer *out)
{
    int count = 0;
    for (int k = 0; k < fit->value_count; k++) {
        const struct fitted_value *it = &fit->values[k];
        if (it->origin == ORIGIN_DEFAULT && it->reason != NULL) {
            buffer_format(out, "%s%s", count++ == 0 ? "    # defaults (one temperature): " : ", ",
                          it->parameter->name);
        }
    }
    buffer_text(out, count > 0 ? "\n" : "");
}

static void write_figure(const char *name, const struct misfit *figure, struct buffer *out)
{
    if (figure->count > 0) {
        buffer_format(out, "%s%.1f %% rms, worst %+.0f %%", name, 100 * figure->rms,
                      100 * figure->worst);
    }
}

/* What the model reaches on each of its devices. */
static void write_reached(const struct calibration *c, int index, struct buffer *out)
{
    for (int k = 0; k < c->comparison_count; k++) {
        const struct comparison *it = &c->comparisons[k];
        const struct device_figures *figures = &it->figures;
        if (it->fit != index) {
            continue;
        }
        buffer_format(out, "#   %s%s: ", report_file_name(c, it->device),
                      it->is_held ? " (not fitted)" : "");
        if (isnan(c->devices[it->device].data.length)) {
            write_figure("", &figures->id[FIGURES_SATURATION], out);
            write_figure("; base ", &figures->ib, out);
        } else {
            write_figure("saturated ", &figures->id[FIGURES_SATURATION], out);
            if (figures->gm.count > 0) {
                buffer_format(out, "; gm %.1f %%", 100 * figures->gm.rms);
            }
            if (figures->gds.count > 0) {
                buffer_format(out, "; gds %.0f %%", 100 * figures->gds.rms);
            }
            if (c->fits[index].is_set && !it->is_held) {
                buffer_format(out, "; threshold %+.1f mV", 1e3 * it->offset);
            }
        }
        buffer_text(out, "\n");
    }
}

static void write_fit(const struct calibration *c, int index, struct buffer *out)
{
    const struct fit *fit = &c->fits[index];
    buffer_text(out, "\n");
    if (fit->alias_of != NULL) {
        buffer_format(out, "# %s: %s\n", fit->alias_of, fit->remark);
    } else if (fit->is_set) {
        buffer_format(out,
                      "# One scalable set over %d geometries, a threshold offset a device left "
                      "free (not part of the model).\n# Drain current against the readings:\n",
                      fit->device_count);
    } else if (!isnan(c->devices[fit->devices[0]].data.length)) {
        const struct measured *data = &c->devices[fit->devices[0]].data;
        char width[64], length[64];
        number_text(data->width * 1e6, width, sizeof width);
        number_text(data->length * 1e6, length, sizeof length);
        buffer_format(out, "# W/L = %s um / %s um, for this size only\n", width, length);
    }
    if (fit->alias_of == NULL) {
        write_reached(c, index, out);
    }
    buffer_format(out, "model %s %s\n", fit->name, fit->type->model_kind);
    for (int k = 0; k < fit->value_count; k++) {
        write_value(&fit->values[k], out);
    }
    write_defaults(fit, out);
    buffer_text(out, "end\n");
}

/* A text as comment lines, broken at spaces. */
static void write_comment(const char *text, const char *hang, struct buffer *out)
{
    const char *before = "# ";
    do {
        const char *next;
        size_t length = text_break(text, HEADING_COLUMNS - (int)strlen(hang) - 2, &next);
        buffer_format(out, "%s%.*s\n", before, (int)length, text);
        before = hang;
        text = next;
    } while (*text != '\0');
}

static void write_range(const char *name, const double *range, struct buffer *out)
{
    char least[64], most[64];
    number_text(range[0] * 1e6, least, sizeof least);
    number_text(range[1] * 1e6, most, sizeof most);
    buffer_format(out, "valid %s from %s um to %s um\n", name, least, most);
}

/* measured_at and the ranges of the written models together. */
static void write_facts(const struct calibration *c, struct buffer *out)
{
    double lengths[2] = {INFINITY, 0}, widths[2] = {INFINITY, 0}, kelvins[2] = {INFINITY, 0};
    char first[64], last[64];
    for (int k = 0; k < c->fit_count; k++) {
        const struct fit *fit = &c->fits[k];
        if (fit->is_written) {
            lengths[0] = fmin(lengths[0], fit->length_range[0]);
            lengths[1] = fmax(lengths[1], fit->length_range[1]);
            widths[0] = fmin(widths[0], fit->width_range[0]);
            widths[1] = fmax(widths[1], fit->width_range[1]);
            kelvins[0] = fmin(kelvins[0], fit->kelvin_range[0]);
            kelvins[1] = fmax(kelvins[1], fit->kelvin_range[1]);
        }
    }
    number_text(c->measured_kelvin - 273.15, first, sizeof first);
    buffer_format(out, "measured_at %s C\n", first);
    number_text(kelvins[0] - temperature_margin - 273.15, first, sizeof first);
    number_text(kelvins[1] + temperature_margin - 273.15, last, sizeof last);
    buffer_format(out, "valid temperature from %s C to %s C\n", first, last);
    if (isfinite(lengths[0])) {
        write_range("L", lengths, out);
        write_range("W", widths, out);
    }
}

void report_process(const struct calibration *c, const char *name, const char *heading,
                    const char *command, struct buffer *out)
{
    if (heading != NULL && heading[0] != '\0') {
        buffer_format(out, "%s\n", heading);
    }
    write_comment("Written by ampstead from measured curves:", "# ", out);
    if (command != NULL) {
        write_comment(command, "#     ", out);
    }
    buffer_format(out,
                  "# +- is one standard error of the fit; it tells how well the curves fix the "
                  "value, not how well\n# the model fits. Readings were taken to be good to %.2g A "
                  "and %.2g %%.\n",
                  c->noise, 100 * c->relative);
    for (int k = 0; k < c->remark_count; k++) {
        const struct calibration_remark *it = &c->remarks[k];
        struct buffer line = BUFFER_EMPTY;
        if (strcmp(it->code, "fit") == 0) {
            continue; /* said at the model */
        }
        buffer_format(&line, "- %s%s%s", it->device < 0 ? "" : report_file_name(c, it->device),
                      it->device < 0 ? "" : ": ", it->text);
        if (line.failed) {
            out->failed = true;
        } else {
            write_comment(line.data, "#   ", out);
        }
        buffer_free(&line);
    }
    buffer_format(out, "\nprocess \"%s\"\n", name);
    write_facts(c, out);
    for (int k = 0; k < c->fit_count; k++) {
        if (c->fits[k].is_written) {
            write_fit(c, k, out);
        }
    }
}

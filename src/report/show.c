/* show.c: values in words. */
#include "report/show.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

enum { VALUE_SIZE = 64 };

/* Less than this is a zero that was rounded outwards by a proof. */
static const double least_shown = 1e-300;

static void append(char *text, const char *more)
{
    const size_t length = strlen(text);
    snprintf(text + length, VALUE_SIZE - length, "%s", more);
}

/* Written without a prefix: a plain number and its unit, if any. */
static void fixed_text(double value, const char *unit, char *text)
{
    number_show(value, SHOW_DIGITS, "", text, VALUE_SIZE / 2);
    if (unit[0] != '\0') {
        append(text, " ");
        append(text, unit);
    }
}

/* Compound units whose first letter takes the SI prefix: "A/V^2", "V/m", "V*m". */
static bool is_prefixed(const char *unit)
{
    return (unit[0] == 'A' || unit[0] == 'V') && (unit[1] == '/' || unit[1] == '*');
}

/* Voltages by or over a length are told in micrometres, as process data are: "4 mV*um", "6 V/um".
 */
static double in_micrometres(const char **unit)
{
    if (strcmp(*unit, "V*m") == 0) {
        *unit = "V*um";
        return 1e6;
    }
    if (strcmp(*unit, "V/m") == 0) {
        *unit = "V/um";
        return 1e-6;
    }
    return 1.0;
}

static void value_text(double value, struct dimension dimension, char *text)
{
    char unit[VALUE_SIZE / 2];
    dimension_unit(dimension, unit, sizeof unit);
    value = fabs(value) < least_shown ? 0.0 : value;
    if (isnan(value)) {
        snprintf(text, VALUE_SIZE, "-");
    } else if (isinf(value)) {
        snprintf(text, VALUE_SIZE, "unlimited");
    } else if (is_prefixed(unit)) {
        const char *shown = unit, first[] = {unit[0], '\0'};
        double factor = in_micrometres(&shown);
        number_show(value * factor, SHOW_DIGITS, first, text, VALUE_SIZE / 2);
        append(text, shown + 1); /* "170.0 uA/V^2" */
    } else if (strpbrk(unit, "/^*") != NULL) {
        fixed_text(value, unit, text); /* "25.10 1/V" */
    } else {
        number_show(value, SHOW_DIGITS, unit, text, VALUE_SIZE);
    }
}

const char *show_value(struct layout *layout, double value, struct dimension dimension)
{
    char text[VALUE_SIZE];
    value_text(value, dimension, text);
    return layout_format(layout, "%s", text);
}

const char *show_signed(struct layout *layout, double value, struct dimension dimension)
{
    char text[VALUE_SIZE];
    value_text(value, dimension, text);
    return layout_format(layout, "%s%s", value > 0.0 && !isinf(value) ? "+" : "", text);
}

const char *show_round(struct layout *layout, double value, struct dimension dimension)
{
    char text[VALUE_SIZE], short_text[VALUE_SIZE];
    value_text(value, dimension, text);
    const char *point = strchr(text, '.');
    size_t end = strspn(text, "-0123456789.");
    if (point == NULL || point >= text + end) {
        return layout_format(layout, "%s", text);
    }
    size_t keep = end;
    while (text[keep - 1] == '0') {
        keep--;
    }
    if (text[keep - 1] == '.') {
        keep--;
    }
    snprintf(short_text, sizeof short_text, "%.*s%s", (int)keep, text, text + end);
    return layout_format(layout, "%s", short_text);
}

const char *show_share(struct layout *layout, double share, const char *per, bool sign)
{
    char text[VALUE_SIZE];
    if (isnan(share)) {
        return "-";
    }
    bool is_small = fabs(share) < 1e-3;
    bool is_kelvin = strcmp(per, "/K") == 0 && fabs(share) < 1e-2;
    bool in_ppm = share != 0.0 && (is_small || is_kelvin);
    number_show(in_ppm ? share * 1e6 : share * 100.0, SHOW_DIGITS, "", text, sizeof text);
    return layout_format(layout, "%s%s %s%s", sign && share > 0.0 ? "+" : "", text,
                         in_ppm ? "ppm" : "%", per);
}

const char *show_celsius(struct layout *layout, double kelvin)
{
    char text[VALUE_SIZE];
    /* rounded to a millikelvin, so that 300.15 K is 27 and not 26.99999999999 */
    number_show(round((kelvin - 273.15) * 1000.0) / 1000.0, 6, "", text, sizeof text);
    char *point = strchr(text, '.');
    if (point != NULL) {
        char *end = text + strlen(text) - 1;
        while (*end == '0') {
            *end-- = '\0';
        }
        if (end == point) {
            *end = '\0';
        }
    }
    return layout_format(layout, "%s %sC", text, layout->style.ascii ? "" : "\xC2\xB0");
}

/* The output quantities that are shares, with what they are counted per. */
static const char *share_per(const struct probe *probe)
{
    if (probe->kind != PROBE_OUTPUT) {
        return NULL;
    }
    switch (probe->quantity) {
    case OUTPUT_FLATNESS:
    case OUTPUT_SIGMA:
        return "";
    case OUTPUT_LINE:
        return "/V";
    case OUTPUT_TEMPCO:
        return "/K";
    default:
        return NULL;
    }
}

const char *show_probe(struct layout *layout, const struct probe *probe, double value)
{
    const char *per = share_per(probe);
    return per != NULL ? show_share(layout, value, per, false)
                       : show_value(layout, value, probe->dimension);
}

const char *show_probe_difference(struct layout *layout, const struct probe *probe, double value)
{
    const char *per = share_per(probe);
    return per != NULL ? show_share(layout, value, per, true)
                       : show_signed(layout, value, probe->dimension);
}

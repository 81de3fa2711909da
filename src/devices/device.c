/*
 * device.c: the list of all devices, and look-ups in their tables.
 */
#include "devices/device.h"

#include <stdio.h>
#include <string.h>

#include "devices/types.h"

const struct device_type *const device_types[] = {
    &device_resistor,  &device_current, &device_voltage,   &device_diode, &device_nmos,
    &device_nmos_hand, &device_pmos,    &device_pmos_hand, &device_npn,   &device_pnp,
    &device_njfet,     &device_pjfet,   &device_opamp,     &device_law,   &device_table,
};

const int device_type_count = ROWS(device_types);

static const char *const effect_names[EFFECT_COUNT] = {
    "channel-length modulation or Early effect",
    "body effect",
    "weak and moderate inversion",
    "mobility reduction and velocity saturation",
    "drain-induced barrier lowering",
    "finite beta and series resistance",
    "leakage",
    "channel offsets and halo",
    "temperature",
};

const char *effect_name(int bit)
{
    return bit >= 0 && bit < EFFECT_COUNT ? effect_names[bit] : "";
}

const struct device_type *device_find(const char *word)
{
    for (int k = 0; k < device_type_count; k++) {
        if (strcmp(device_types[k]->word, word) == 0) {
            return device_types[k];
        }
    }
    return NULL;
}

const struct device_type *device_find_model_kind(const char *kind)
{
    for (int k = 0; k < device_type_count; k++) {
        if (device_types[k]->model_kind != NULL && strcmp(device_types[k]->model_kind, kind) == 0) {
            return device_types[k];
        }
    }
    return NULL;
}

int parameter_find(const struct parameter *parameters, int count, const char *name)
{
    for (int k = 0; k < count; k++) {
        if (strcmp(parameters[k].name, name) == 0) {
            return k;
        }
    }
    return -1;
}

int quantity_find(const struct device_type *type, const char *name)
{
    for (int k = 0; k < type->quantity_count; k++) {
        if (strcmp(type->quantities[k].name, name) == 0) {
            return k;
        }
    }
    return -1;
}

/* The words of a region in the order in which they are said. */
static const struct {
    unsigned region;
    const char *text, *bipolar; /* bipolar transistors have their own word, or NULL */
} region_words[] = {
    {REGION_OFF, "off", NULL},
    {REGION_WEAK, "weak", NULL},
    {REGION_MODERATE, "moderate", NULL},
    {REGION_STRONG, "strong", NULL},
    {REGION_ON, "on", NULL},
    {REGION_SATURATED, "saturated", "active"},
    {REGION_TRIODE, "triode", "out of headroom"},
    {REGION_REVERSED, "reversed", NULL},
    {REGION_BREAKDOWN, "breakdown", NULL},
};

void region_describe(unsigned region, const struct device_type *type, char *text, size_t size)
{
    bool bipolar = type == &device_npn || type == &device_pnp;
    size_t used = 0;
    if (size > 0) {
        text[0] = '\0';
    }
    for (int k = 0; k < ROWS(region_words) && used < size; k++) {
        if ((region & region_words[k].region) == 0) {
            continue;
        }
        const char *word = bipolar && region_words[k].bipolar != NULL ? region_words[k].bipolar
                                                                      : region_words[k].text;
        int written = snprintf(text + used, size - used, "%s%s", used > 0 ? ", " : "", word);
        used += written > 0 ? (size_t)written : 0;
    }
}

/*
 * caution.c: the table of cautions, and adding one.
 */
#include "circuit/caution.h"

#include <string.h>

#include "circuit/circuit.h"

static const struct {
    const char *name, *rule;
} table[CAUTION_COUNT] = {
    [CAUTION_CASE_NAMES] = {"case-names", "common practice, no source: names that differ only in "
                                          "case are read wrongly"},
    [CAUTION_SQUARE_LAW] = {"square-law",
                            "the square law holds above about 2 n UT of overdrive (Gray, Hurst, "
                            "Lewis and Meyer, sec. 1.8, from memory)"},
    [CAUTION_TRIODE] = {"triode",
                        "a mirror holds its current only while vds is above vdsat (Enz and "
                        "Vittoz 2006)"},
    [CAUTION_HEADROOM] = {"headroom", "common practice, no source: keep 50 mV of headroom for "
                                      "process and temperature"},
    [CAUTION_MIRROR_LENGTH] = {"mirror-length",
                               "partners of a mirror share one L, because threshold and Early "
                               "voltage depend on it; ratios are made by W or m (common practice, "
                               "no source)"},
    [CAUTION_MIRROR_VOLTAGE] = {"mirror-voltage",
                                "unequal vds gives a systematic error of about (vds2 - vds1)/VA "
                                "(Gray, Hurst, Lewis and Meyer, sec. 4.2, from memory)"},
    [CAUTION_MODEL_RANGE] = {"model-range", "a fitted model says nothing outside the range of its "
                                            "data"},
    [CAUTION_LEAKAGE] = {"leakage", "below about 1 pA, or above 10 Mohm, junction and surface "
                                    "leakage decide; this model has none (common practice, no "
                                    "source)"},
    [CAUTION_HOT] = {"hot",
                     "junction leakage doubles about every 10 K (common practice, no source)"},
    [CAUTION_TOUCH] = {"touch-voltage",
                       "above 60 V DC a part may be dangerous to touch (limit of IEC 61140 for dry "
                       "conditions, from memory): local codes and licensed practice decide"},
    [CAUTION_DISSIPATION] = {"dissipation",
                             "common practice, no source: 0.25 W for a resistor, 0.5 W for a small "
                             "transistor; the maker's derating decides, and hot parts burn"},
    [CAUTION_ASSUMED_SLOPE] = {"assumed-slope",
                               "a hand transistor without `slope` is given 1.3, the middle of what "
                               "bulk processes show (Enz and Vittoz 2006, from memory)"},
    [CAUTION_OFF_STATE] = {"off-state", "a self-biased cell also rests where no current flows"},
    [CAUTION_LOOP] = {"loop",
                      "two transistors, or an amplifier, in positive feedback can hold more "
                      "than one state (Nielsen and Willson 1980)"},
    [CAUTION_SWEEP] = {"sweep", NULL},
    [CAUTION_CONDITIONING] = {"conditioning", NULL},
    [CAUTION_FORWARD_JUNCTION] =
        {"forward-junction", "a body junction in forward direction injects into the substrate; "
                             "the MOS model leaves that out"},
    [CAUTION_OUTPUT_DIRECTION] = {"output-direction", NULL},
    [CAUTION_MODEL] = {"model", NULL},
};

const char *caution_name(enum caution_code code)
{
    return table[code].name;
}

const char *caution_rule(enum caution_code code)
{
    return table[code].rule;
}

static bool is_quiet(const struct circuit *circuit, const char *code, const char *thing)
{
    for (int k = 0; k < circuit->quiet_count; k++) {
        const struct quiet_line *quiet = &circuit->quiets[k];
        if (strcmp(quiet->code, code) == 0 &&
            (quiet->name == NULL || strcmp(quiet->name, thing) == 0)) {
            return true;
        }
    }
    return false;
}

bool caution_append(struct caution_list *list, const struct caution *caution, bool is_silenced)
{
    struct caution **rows = is_silenced ? &list->silenced : &list->list;
    int *count = is_silenced ? &list->silenced_count : &list->count;
    int *capacity = is_silenced ? &list->silenced_capacity : &list->capacity;
    struct caution *grown = arena_grow(list->arena, *rows, *count, capacity, sizeof *grown);
    if (grown == NULL) {
        return false;
    }
    *rows = grown;
    grown[(*count)++] = *caution;
    return true;
}

bool caution_add(const struct circuit *circuit, struct caution_list *list, enum caution_code code,
                 const char *thing, int line, const char *format, ...)
{
    va_list arguments;
    va_start(arguments, format);
    const char *text = arena_format_list(list->arena, format, arguments);
    va_end(arguments);
    if (text == NULL) {
        return false;
    }
    const struct caution caution = {table[code].name, thing, text, table[code].rule, line};
    return caution_append(list, &caution, is_quiet(circuit, table[code].name, thing));
}

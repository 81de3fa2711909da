/*
 * explain_words.c: an effect in one sentence, with the figures of the device through which most of
 * it goes.
 */
#include <math.h>

#include "analyses/explain.h"

enum { SHOWN = 24 };

struct words {
    const struct circuit *circuit;
    const struct effect_case *it;
    const struct instance *instance;
    struct arena *arena;
};

#define SHOW(text, value, unit)                                                                    \
    char text[SHOWN];                                                                              \
    number_show((value), 4, (unit), text, sizeof text)

static double find(const struct words *w, const double *q, const char *name)
{
    const int k = quantity_find(w->instance->type, name);
    return k < 0 ? NAN : q[k];
}

static double with(const struct words *w, const char *name)
{
    return find(w, w->it->with, name);
}

static double without(const struct words *w, const char *name)
{
    return find(w, w->it->without, name);
}

static bool has(const struct words *w, const char *name)
{
    return isfinite(with(w, name));
}

/* The voltage that a designer thinks of first. */
static const char *main_voltage(const struct words *w)
{
    static const char *const names[] = {"vgs", "vbe", "v"};
    for (size_t k = 0; k < sizeof names / sizeof names[0]; k++) {
        if (has(w, names[k])) {
            return names[k];
        }
    }
    return NULL;
}

/* "M1 carries 20 uA at vgs 810 mV; without it 21 uA at 792 mV": what is always true. */
static const char *plain(const struct words *w, const char *before)
{
    const char *voltage = main_voltage(w);
    const int current = w->instance->type->quantity_current;
    SHOW(i_with, w->it->with[current], "A");
    SHOW(i_without, w->it->without[current], "A");
    if (voltage == NULL) {
        return arena_format(w->arena, "%s%s carries %s; without it %s", before, w->instance->name,
                            i_with, i_without);
    }
    SHOW(v_with, with(w, voltage), "V");
    SHOW(v_without, without(w, voltage), "V");
    return arena_format(w->arena, "%s%s carries %s at %s = %s; without it %s at %s", before,
                        w->instance->name, i_with, voltage, v_with, i_without, v_without);
}

static bool is_about_range(const struct probe *probe)
{
    return (probe->kind == PROBE_OUTPUT && probe->quantity >= OUTPUT_COMPLIANCE &&
            probe->quantity <= OUTPUT_HIGH) ||
           probe->kind == PROBE_ALL;
}

/* Weak and moderate inversion. */
static const char *inversion(const struct words *w)
{
    if (!has(w, "inversion")) {
        return plain(w, "");
    }
    const double overdrive = with(w, "overdrive");
    SHOW(level, with(w, "inversion"), "");
    SHOW(asked, without(w, "overdrive"), "V");
    SHOW(found, fabs(overdrive), "V");
    if (is_about_range(w->it->probe)) {
        SHOW(vdsat, with(w, "vdsat"), "V");
        SHOW(square, without(w, "vdsat"), "V");
        return arena_format(w->arena,
                            "%s runs at inversion %s and needs %s across it to hold its current; "
                            "the square law asks for %s",
                            w->instance->name, level, vdsat, square);
    }
    return arena_format(w->arena,
                        "%s runs at inversion %s; the square law asks for %s of overdrive where "
                        "the device %s %s%s",
                        w->instance->name, level, asked, overdrive < 0 ? "stands" : "has", found,
                        overdrive < 0 ? " below threshold" : "");
}

static const char *modulation(const struct words *w)
{
    const double current = w->it->with[w->instance->type->quantity_current];
    const bool bipolar = has(w, "vce");
    const double v = with(w, bipolar ? "vce" : "vds"), ro = with(w, "ro");
    if (!(isfinite(v) && isfinite(ro) && fabs(current) > 0)) {
        return plain(w, "");
    }
    SHOW(volts, v, "V");
    SHOW(ohm, ro, "ohm");
    SHOW(percent, 100 / fabs(ro * current), "");
    return arena_format(w->arena,
                        "%s has %s = %s across it, and its ro of %s lets the current follow by "
                        "%s %% a volt",
                        w->instance->name, bipolar ? "vce" : "vds", volts, ohm, percent);
}

static const char *threshold(const struct words *w, const char *cause)
{
    if (!has(w, "vth")) {
        return plain(w, cause);
    }
    SHOW(vth_with, with(w, "vth"), "V");
    SHOW(vth_without, without(w, "vth"), "V");
    return arena_format(w->arena, "%sthe threshold of %s is %s instead of %s", cause,
                        w->instance->name, vth_with, vth_without);
}

static const char *body(const struct words *w)
{
    const double vbs = with(w, "vbs");
    if (!(fabs(vbs) > 1e-3)) {
        return plain(w, "the charge under its channel takes a share of the gate's hold: ");
    }
    SHOW(volts, fabs(vbs), "V");
    return threshold(w, arena_format(w->arena, "its source stands %s away from its bulk: ", volts));
}

static const char *mobility(const struct words *w)
{
    if (!has(w, "overdrive")) {
        return plain(w, "");
    }
    SHOW(overdrive, with(w, "overdrive"), "V");
    return plain(w,
                 arena_format(w->arena, "carriers lose speed at an overdrive of %s: ", overdrive));
}

static const char *barrier(const struct words *w)
{
    SHOW(volts, with(w, "vds"), "V");
    return threshold(w, arena_format(w->arena, "with %s at its drain ", volts));
}

static const char *gain(const struct words *w)
{
    if (!has(w, "ib")) {
        return plain(w, "the resistance in its leads counts: ");
    }
    SHOW(base, with(w, "ib"), "A");
    SHOW(beta, with(w, "beta"), "");
    return plain(w, arena_format(w->arena, "the base of %s takes %s (beta %s): ", w->instance->name,
                                 base, beta));
}

static const char *leakage(const struct words *w)
{
    return plain(w, "its junctions leak: ");
}

static const char *geometry(const struct words *w)
{
    return threshold(w, "with its channel offsets and halo ");
}

static const char *temperature(const struct words *w)
{
    SHOW(here, w->it->kelvin - 273.15, "");
    SHOW(there, w->it->measured_kelvin - 273.15, "");
    return plain(w, arena_format(w->arena, "the cell stands at %s C, its values hold at %s C: ",
                                 here, there));
}

/* In the order of enum effect. */
static const char *(*const tellers[EFFECT_COUNT])(const struct words *w) = {
    modulation, body, inversion, mobility, barrier, gain, leakage, geometry, temperature,
};

const char *explain_sentence(const struct circuit *circuit, const struct effect_case *it,
                             struct arena *arena)
{
    const struct words words = {circuit, it, &circuit->instances[it->instance], arena};
    return tellers[it->bit](&words);
}

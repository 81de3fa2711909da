/*
 * remarks.c: the rules that turn a solved cell into cautions. One function a rule; the rule's text
 * and source stand in circuit/caution.c.
 */
#include "analyses/remarks.h"

#include <math.h>
#include <string.h>

#include "solve/measure.h"

struct remarks {
    const struct operating_point *point;
    const struct circuit *circuit;
    struct result *result;
};

enum { SHOWN = 24 };

static int line_of(const struct remarks *m, struct span where)
{
    return source_line(&m->circuit->cell->sources, where);
}

static double quantity(const struct device_result *d, const char *name)
{
    const int k = quantity_find(d->instance->type, name);
    return k < 0 ? NAN : d->q[k];
}

static bool is_mos(const struct device_result *d)
{
    return quantity_find(d->instance->type, "inversion") >= 0;
}

#define SHOW(text, value, unit)                                                                    \
    char text[SHOWN];                                                                              \
    number_show((value), 3, (unit), text, sizeof text)

/* --- one device ------------------------------------------------------------------------------- */

/* The slope factor n of a device at its bias: that of the body (1 + gmb/gm), widened by the model's
 * own. */
static double slope_of(const struct device_result *d)
{
    const struct instance *instance = d->instance;
    const double body = quantity(d, "gmb") / quantity(d, "gm");
    const int own =
        parameter_find(instance->type->parameters, instance->type->parameter_count, "slope");
    double widened = own < 0 ? 1 : instance->own[own];
    if (instance->model != NULL) {
        const int p = parameter_find(instance->type->model_parameters,
                                     instance->type->model_parameter_count, "slope_factor");
        widened = p < 0 ? 1 : instance->model->values[p];
    }
    return (isfinite(body) && body > 0 ? 1 + body : 1) * widened;
}

/* A hand calculation by the square law wants more overdrive than the device has. */
static bool square_law(const struct remarks *m, const struct device_result *d)
{
    const bool has_hand = m->circuit->hand_count > 0;
    const double overdrive = quantity(d, "overdrive");
    const double limit = 2 * slope_of(d) * BOLTZMANN_OVER_CHARGE * m->result->kelvin;
    if (!is_mos(d) || !(has_hand || m->result->view == VIEW_HAND) ||
        (d->region & REGION_OFF) != 0 || !(overdrive < limit)) {
        return true;
    }
    SHOW(found, overdrive, "V");
    SHOW(least, limit, "V");
    return caution_add(m->circuit, &m->result->cautions, CAUTION_SQUARE_LAW, d->instance->name,
                       line_of(m, d->instance->where),
                       "%s has an overdrive of %s; a square-law hand calculation wants at least %s",
                       d->instance->name, found, least);
}

static bool headroom(const struct remarks *m, const struct device_result *d)
{
    const double left = quantity(d, "headroom");
    if (!d->instance->type->is_transistor || (d->region & REGION_OFF) != 0 || !(left < 0.05)) {
        return true;
    }
    SHOW(found, fabs(left), "V");
    const bool lost = left < 0;
    return caution_add(m->circuit, &m->result->cautions, lost ? CAUTION_TRIODE : CAUTION_HEADROOM,
                       d->instance->name, line_of(m, d->instance->where),
                       lost ? "%s is out of headroom by %s" : "%s has only %s of headroom",
                       d->instance->name, found);
}

static bool outside(double value, const double range[2])
{
    return isfinite(range[0]) && isfinite(range[1]) && !isnan(value) &&
           (value < range[0] * (1 - 1e-9) || value > range[1] * (1 + 1e-9));
}

static bool model_range(const struct remarks *m, const struct device_result *d)
{
    const struct instance *instance = d->instance;
    const struct model *model = instance->model;
    if (model == NULL) {
        return true;
    }
    static const char *const sizes[] = {"L", "W"};
    for (int k = 0; k < 2; k++) {
        const double *range = k == 0 ? model->valid_length : model->valid_width;
        const int p =
            parameter_find(instance->type->parameters, instance->type->parameter_count, sizes[k]);
        if (p < 0 || !outside(instance->own[p], range)) {
            continue;
        }
        SHOW(found, instance->own[p], "m");
        SHOW(from, range[0], "m");
        SHOW(to, range[1], "m");
        if (!caution_add(m->circuit, &m->result->cautions, CAUTION_MODEL_RANGE, instance->name,
                         line_of(m, instance->where),
                         "%s has %s = %s; model %s holds from %s to %s", instance->name, sizes[k],
                         found, model->name, from, to)) {
            return false;
        }
    }
    return true;
}

static bool dissipation(const struct remarks *m, const struct device_result *d)
{
    const struct device_type *type = d->instance->type;
    const double power = type->quantity_power < 0 ? NAN : d->q[type->quantity_power];
    const double limit = type->is_transistor ? 0.5 : 0.25;
    if ((!type->is_transistor && !type->is_resistor) || !(power > limit)) {
        return true;
    }
    SHOW(found, power, "W");
    return caution_add(m->circuit, &m->result->cautions, CAUTION_DISSIPATION, d->instance->name,
                       line_of(m, d->instance->where), "%s turns %s into heat", d->instance->name,
                       found);
}

static bool assumed_slope(const struct remarks *m, const struct device_result *d)
{
    const struct instance *instance = d->instance;
    const int p =
        parameter_find(instance->type->parameters, instance->type->parameter_count, "slope");
    if (p < 0 || instance->given[p] || m->result->view == VIEW_HAND) {
        return true;
    }
    return caution_add(m->circuit, &m->result->cautions, CAUTION_ASSUMED_SLOPE, instance->name,
                       line_of(m, instance->where),
                       "%s gives no slope: %.3g is assumed for weak and moderate inversion",
                       instance->name, instance->own[p]);
}

static bool forward_junction(const struct remarks *m, const struct device_result *d)
{
    const double vbs = quantity(d, "vbs");
    if (!is_mos(d) || !(vbs > 0.3)) {
        return true;
    }
    SHOW(found, vbs, "V");
    return caution_add(m->circuit, &m->result->cautions, CAUTION_FORWARD_JUNCTION,
                       d->instance->name, line_of(m, d->instance->where),
                       "the body of %s is %s above its source", d->instance->name, found);
}

/* --- leakage ------------------------------------------------------------------------------------
 */

static bool process_leaks(const struct circuit *c)
{
    for (int k = 0; k < c->instance_count; k++) {
        const struct instance *instance = &c->instances[k];
        const int p = instance->model == NULL
                          ? -1
                          : parameter_find(instance->type->model_parameters,
                                           instance->type->model_parameter_count, "junction_leak");
        if (p >= 0 && instance->model->values[p] > 0) {
            return true;
        }
    }
    return false;
}

static bool leakage(const struct remarks *m, const struct device_result *d)
{
    const struct device_type *type = d->instance->type;
    const bool resistor = type->is_resistor;
    const double current = type->quantity_current < 0 ? NAN : fabs(d->q[type->quantity_current]);
    const double ohm = resistor ? d->instance->own[type->value_parameter] : NAN;
    const bool small = is_mos(d) && current < 1e-12;
    if (!small && !(ohm > 10e6)) {
        return true;
    }
    char found[SHOWN];
    if (small) {
        number_show(current, 3, "A", found, sizeof found);
    } else {
        number_show(ohm, 3, "ohm", found, sizeof found);
    }
    return caution_add(m->circuit, &m->result->cautions, CAUTION_LEAKAGE, d->instance->name,
                       line_of(m, d->instance->where),
                       small ? "%s carries %s, and leakage is not modelled here"
                             : "%s has %s, and leakage is not modelled here",
                       d->instance->name, found);
}

/* --- mirrors ------------------------------------------------------------------------------------
 */

static double parameter_of(const struct instance *instance, const char *name)
{
    const int p = parameter_find(instance->type->parameters, instance->type->parameter_count, name);
    return p < 0 ? NAN : instance->own[p];
}

/* A diode-connected transistor: control terminal (second) joined to the output terminal (first). */
static bool is_diode_connected(const struct instance *instance)
{
    return instance->outer[0] == instance->outer[1];
}

static bool pair_remarks(const struct remarks *m, const struct device_result *in,
                         const struct device_result *out)
{
    const double l_in = parameter_of(in->instance, "L"), l_out = parameter_of(out->instance, "L");
    if (fabs(l_in - l_out) > 1e-9 * fabs(l_in)) {
        SHOW(first, l_in, "m");
        SHOW(second, l_out, "m");
        if (!caution_add(m->circuit, &m->result->cautions, CAUTION_MIRROR_LENGTH,
                         out->instance->name, line_of(m, out->instance->where),
                         "mirror partners %s (L = %s) and %s (L = %s) differ in length",
                         in->instance->name, first, out->instance->name, second)) {
            return false;
        }
    }
    const char *voltage = is_mos(out) ? "vds" : "vce";
    const char *slope = is_mos(out) ? "gds" : "ro";
    const double dv = quantity(out, voltage) - quantity(in, voltage);
    const double conductance = is_mos(out) ? quantity(out, slope) : 1 / quantity(out, slope);
    const double current = out->q[out->instance->type->quantity_current];
    const double error = conductance * dv / current;
    /* The rule is about two saturated devices; a triode has a caution of its own. */
    if (!(fabs(error) > 0.01) || (out->region & in->region & REGION_SATURATED) == 0) {
        return true;
    }
    SHOW(difference, fabs(dv), "V");
    return caution_add(m->circuit, &m->result->cautions, CAUTION_MIRROR_VOLTAGE,
                       out->instance->name, line_of(m, out->instance->where),
                       "%s stands at %s %s %s than its partner %s: about %+.2g %% of current",
                       out->instance->name, difference, dv > 0 ? "more" : "less", voltage,
                       in->instance->name, 100 * error);
}

/*
 * Mirrors: one diode-connected device, partners of the same type with the same gate and source
 * (base and emitter). Transistors are chained by the node of their gate, so that a large tree stays
 * linear.
 */
static bool mirrors(const struct remarks *m)
{
    const struct point_result *point = &m->result->point;
    struct arena *scratch = arena_create();
    int *first = scratch == NULL ? NULL : arena_new_array(scratch, int, m->circuit->node_count);
    int *next = first == NULL ? NULL : arena_new_array(scratch, int, point->device_count);
    bool good = next != NULL;
    for (int b = point->device_count - 1; good && b >= 0; b--) { /* 0 ends a chain: index + 1 */
        const struct instance *out = point->devices[b].instance;
        if (out->type->is_transistor && !is_diode_connected(out)) {
            next[b] = first[out->outer[1] + 1];
            first[out->outer[1] + 1] = b + 1;
        }
    }
    for (int a = 0; good && a < point->device_count; a++) {
        const struct device_result *in = &point->devices[a];
        if (!in->instance->type->is_transistor || !is_diode_connected(in->instance) ||
            (in->region & REGION_OFF) != 0) {
            continue;
        }
        for (int b = first[in->instance->outer[1] + 1]; good && b > 0; b = next[b - 1]) {
            const struct device_result *out = &point->devices[b - 1];
            if (out->instance->type == in->instance->type &&
                out->instance->outer[2] == in->instance->outer[2]) {
                good = pair_remarks(m, in, out);
            }
        }
    }
    arena_destroy(scratch);
    return good;
}

/* --- the cell -----------------------------------------------------------------------------------
 */

static bool whole_cell(const struct remarks *m)
{
    const struct circuit *c = m->circuit;
    struct caution_list *list = &m->result->cautions;
    const double celsius = m->result->kelvin - 273.15;
    if (celsius > 85 && m->result->view == VIEW_FULL &&
        !caution_add(c, list, CAUTION_HOT, "", 0, "at %.4g C junction leakage matters%s", celsius,
                     process_leaks(c) ? "" : ", and this cell's models have none")) {
        return false;
    }
    for (int n = 1; n < c->node_count; n++) {
        const double v = m->result->point.x[n - 1];
        if (!c->nodes[n].is_hidden && fabs(v) > 60) {
            SHOW(found, v, "V");
            if (!caution_add(c, list, CAUTION_TOUCH, c->nodes[n].name,
                             line_of(m, c->nodes[n].where), "node %s stands at %s",
                             c->nodes[n].name, found)) {
                return false;
            }
        }
    }
    return m->result->point.solver.limited_by == NULL ||
           caution_add(c, list, CAUTION_CONDITIONING, "", 0, "the residual is limited by %s",
                       m->result->point.solver.limited_by);
}

static bool model_temperature(const struct remarks *m)
{
    const struct circuit *c = m->circuit;
    for (int k = 0; k < c->model_count; k++) {
        const struct model *model = &c->models[k];
        bool used = false;
        for (int d = 0; d < c->instance_count; d++) {
            used |= c->instances[d].model == model;
        }
        if (used && outside(m->result->kelvin, model->valid_kelvin) &&
            !caution_add(c, &m->result->cautions, CAUTION_MODEL_RANGE, model->name,
                         model->process == NULL ? line_of(m, model->where) : 0,
                         "model %s holds from %.4g C to %.4g C; this is %.4g C", model->name,
                         model->valid_kelvin[0] - 273.15, model->valid_kelvin[1] - 273.15,
                         m->result->kelvin - 273.15)) {
            return false;
        }
    }
    return true;
}

/* What the sweep reaches beyond `at`: dangerous voltages, and heat in the cell. */
static bool far_end(const struct remarks *m, const struct output_result *o)
{
    const int line = line_of(m, o->output->where);
    const double most = fmax(fabs(o->output->from), fabs(o->output->to));
    double power = 0, where = 0;
    for (int k = 0; k < o->curve.count; k++) {
        const double here = fabs(o->curve.v[k] * o->curve.current[k]);
        if (o->is_sink && here > power) {
            power = here;
            where = o->curve.v[k];
        }
    }
    SHOW(volts, most, "V");
    SHOW(heat, power, "W");
    SHOW(at, where, "V");
    return (!(most > 60) ||
            caution_add(m->circuit, &m->result->cautions, CAUTION_TOUCH, o->output->name, line,
                        "the sweep of output %s reaches %s", o->output->name, volts)) &&
           (!(power > 0.5) ||
            caution_add(m->circuit, &m->result->cautions, CAUTION_DISSIPATION, o->output->name,
                        line, "output %s brings %s into the cell at %s", o->output->name, heat,
                        at));
}

static bool outputs(const struct remarks *m)
{
    for (int k = 0; k < m->result->output_count; k++) {
        const struct output_result *o = &m->result->outputs[k];
        const int line = line_of(m, o->output->where);
        for (int e = 0; e < o->event_count; e++) {
            SHOW(at, o->events[e].at, "V");
            if (!caution_add(m->circuit, &m->result->cautions, CAUTION_SWEEP, o->output->name, line,
                             "output %s at %s: %s", o->output->name, at, o->events[e].text)) {
                return false;
            }
        }
        if (o->resistance < 0 &&
            !caution_add(m->circuit, &m->result->cautions, CAUTION_OUTPUT_DIRECTION,
                         o->output->name, line,
                         "output %s has a negative resistance: its current falls as the load "
                         "voltage rises",
                         o->output->name)) {
            return false;
        }
        if (o->current < 1e-12 &&
            !caution_add(m->circuit, &m->result->cautions, CAUTION_OFF_STATE, o->output->name, line,
                         "output %s carries almost no current (%.3g A): the cell rests in its off "
                         "state, or the output is cut off",
                         o->output->name, o->current)) {
            return false;
        }
        if (!far_end(m, o)) {
            return false;
        }
    }
    return true;
}

static bool (*const device_rules[])(const struct remarks *m, const struct device_result *d) = {
    square_law, headroom, model_range, dissipation, assumed_slope, forward_junction,
};

bool remarks_add(const struct operating_point *point, struct result *result)
{
    const struct remarks m = {point, result->circuit, result};
    const struct caution_list *built = &m.circuit->cautions;
    for (int k = 0; k < built->count; k++) {
        if (!caution_append(&result->cautions, &built->list[k], false)) {
            return false;
        }
    }
    for (int k = 0; k < built->silenced_count; k++) {
        if (!caution_append(&result->cautions, &built->silenced[k], true)) {
            return false;
        }
    }
    const bool leaks = process_leaks(m.circuit);
    bool has_mos = false;
    for (int k = 0; k < result->point.device_count; k++) {
        has_mos |= is_mos(&result->point.devices[k]);
    }
    for (int k = 0; k < result->point.device_count; k++) {
        for (size_t r = 0; r < sizeof device_rules / sizeof device_rules[0]; r++) {
            if (!device_rules[r](&m, &result->point.devices[k])) {
                return false;
            }
        }
        if (has_mos && !leaks && !leakage(&m, &result->point.devices[k])) {
            return false;
        }
    }
    return mirrors(&m) && outputs(&m) && model_temperature(&m) && whole_cell(&m);
}

/*
 * judge.c: hand lines compared and requirements judged.
 */
#include "analyses/judge.h"

#include <math.h>

static double output_value(const struct output_result *o, int rail_count, int quantity)
{
    switch (quantity) {
    case OUTPUT_CURRENT:
        return o->current;
    case OUTPUT_RESISTANCE:
        return o->resistance_unlimited ? INFINITY : o->resistance;
    case OUTPUT_COMPLIANCE:
        return o->compliance;
    case OUTPUT_LOW:
        return o->low;
    case OUTPUT_HIGH:
        return o->high;
    case OUTPUT_FLATNESS:
        return o->flatness;
    case OUTPUT_LINE: {
        double worst = rail_count > 0 ? 0 : NAN;
        for (int k = 0; k < rail_count; k++) {
            worst = fabs(o->line[k]) > fabs(worst) ? o->line[k] : worst;
        }
        return worst;
    }
    case OUTPUT_TEMPCO:
        return o->tempco;
    case OUTPUT_SIGMA:
        return o->sigma;
    default:
        return NAN;
    }
}

static const struct device_result *find_device(const struct result *r, int instance)
{
    for (int k = 0; k < r->point.device_count; k++) {
        if (r->point.devices[k].instance == &r->circuit->instances[instance]) {
            return &r->point.devices[k];
        }
    }
    return NULL;
}

double result_value(const struct result *r, const struct probe *probe)
{
    switch (probe->kind) {
    case PROBE_NODE:
        return r->point.x[probe->index];
    case PROBE_RAIL: {
        const struct rail_result *rail = &r->point.rails[probe->index];
        return probe->quantity == RAIL_V         ? rail->v
               : probe->quantity == RAIL_CURRENT ? rail->current
                                                 : rail->power;
    }
    case PROBE_DEVICE: {
        const struct device_result *device = find_device(r, probe->index);
        return device == NULL ? NAN : device->q[probe->quantity];
    }
    case PROBE_OUTPUT:
        return probe->index >= r->output_count
                   ? NAN
                   : output_value(&r->outputs[probe->index], r->circuit->rail_count,
                                  probe->quantity);
    case PROBE_ALL:
        return r->point.least_headroom;
    case PROBE_CELL:
        return r->point.cell_power;
    }
    return NAN;
}

/*
 * A quantity without a value may still decide: a current that holds over the whole sweep has its
 * edge beyond the end of the sweep. Returns the bound, and words for it.
 */
static double bound_of(const struct result *r, const struct probe *probe, enum relation relation,
                       const char **remark)
{
    if (probe->kind != PROBE_OUTPUT || probe->index >= r->output_count) {
        return NAN;
    }
    const struct output_result *o = &r->outputs[probe->index];
    const bool low = probe->quantity == OUTPUT_LOW ||
                     (probe->quantity == OUTPUT_COMPLIANCE && o->compliance_beyond && o->is_sink);
    const bool high = probe->quantity == OUTPUT_HIGH ||
                      (probe->quantity == OUTPUT_COMPLIANCE && o->compliance_beyond && !o->is_sink);
    if (low && relation == RELATION_BELOW) {
        *remark = "holds down to the end of the sweep";
        return o->output->from;
    }
    if (high && relation == RELATION_ABOVE) {
        *remark = "holds up to the end of the sweep";
        return o->output->to;
    }
    return NAN;
}

/* Why a quantity has no value. */
static const char *reason_of(const struct result *r, const struct probe *probe)
{
    if (probe->kind == PROBE_OUTPUT && probe->quantity == OUTPUT_COMPLIANCE &&
        probe->index < r->output_count && r->outputs[probe->index].unheld_device != NULL) {
        return "the device at the output is out of headroom to begin with";
    }
    return "has no value here";
}

/* Load voltages are found to 10 uV: a requirement missed by less stands at its limit, and is met.
 */
static double accuracy_of(const struct probe *probe)
{
    const bool is_edge = probe->kind == PROBE_OUTPUT &&
                         (probe->quantity == OUTPUT_COMPLIANCE || probe->quantity == OUTPUT_LOW ||
                          probe->quantity == OUTPUT_HIGH);
    return is_edge ? 1e-5 : 0;
}

/* Signed quantities that are wanted small in either direction. */
static bool is_judged_by_size(const struct probe *probe)
{
    return probe->kind == PROBE_OUTPUT &&
           (probe->quantity == OUTPUT_LINE || probe->quantity == OUTPUT_TEMPCO);
}

static double margin_of(const struct requirement *q, double value)
{
    const double size =
        is_judged_by_size(&q->probe) && q->relation == RELATION_BELOW ? fabs(value) : value;
    return q->relation == RELATION_BELOW   ? q->value - size
           : q->relation == RELATION_ABOVE ? size - q->value
                                           : q->tolerance - fabs(size - q->value);
}

double judge_margin(const struct result *r, const struct requirement *q, double value)
{
    const char *ignored = NULL;
    return margin_of(q, isnan(value) ? bound_of(r, &q->probe, q->relation, &ignored) : value);
}

bool judge_is_met(const struct requirement *q, double margin)
{
    const double spare = margin + accuracy_of(&q->probe);
    return q->relation == RELATION_WITHIN ? spare >= 0 : spare > 0;
}

static struct requirement_result judge(const struct result *r, const struct requirement *q)
{
    struct requirement_result out = {.requirement = q, .margin = NAN};
    double value = result_value(r, &q->probe);
    out.computed = value;
    if (q->scope != SCOPE_POINT) {
        out.judgement = JUDGED_NOT;
        out.remark = q->scope == SCOPE_EVERYWHERE ? "over all conditions: not judged here"
                                                  : "over mismatch: `ampstead spread` judges it";
        return out;
    }
    if (isnan(value)) {
        value = bound_of(r, &q->probe, q->relation, &out.remark);
    }
    if (isnan(value)) {
        out.judgement = JUDGED_UNKNOWN;
        out.remark = reason_of(r, &q->probe);
        return out;
    }
    out.margin = margin_of(q, value);
    out.judgement = judge_is_met(q, out.margin) ? JUDGED_MET : JUDGED_NOT_MET;
    return out;
}

void judge_verdict(struct result *r)
{
    r->verdict = VERDICT_NO_REQUIREMENTS;
    for (int k = 0; k < r->requirement_count; k++) {
        const enum judgement judgement = r->requirements[k].judgement;
        if (judgement == JUDGED_NOT_MET || judgement == JUDGED_UNKNOWN) {
            r->verdict = VERDICT_NOT_MET;
        } else if (judgement == JUDGED_MET && r->verdict == VERDICT_NO_REQUIREMENTS) {
            r->verdict = VERDICT_MET;
        }
    }
}

bool judge_all(struct result *r)
{
    const struct circuit *c = r->circuit;
    r->hands = arena_new_array(r->arena, struct hand_result, c->hand_count);
    r->requirements = arena_new_array(r->arena, struct requirement_result, c->requirement_count);
    if (r->hands == NULL || r->requirements == NULL) {
        return false;
    }
    for (int k = 0; k < c->hand_count; k++) {
        const double computed = result_value(r, &c->hands[k].probe);
        r->hands[k] =
            (struct hand_result){&c->hands[k], computed, computed - c->hands[k].value, NAN};
    }
    r->hand_count = c->hand_count;
    for (int k = 0; k < c->requirement_count; k++) {
        r->requirements[k] = judge(r, &c->requirements[k]);
    }
    r->requirement_count = c->requirement_count;
    judge_verdict(r);
    return true;
}

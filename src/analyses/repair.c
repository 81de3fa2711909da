/*
 * repair.c: each value that a designer may touch is moved until the requirement is met, and the
 * changed cell is judged as a whole.
 */
#include "analyses/repair.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "analyses/judge.h"
#include "analyses/repair_internal.h"
#include "analyses/spread_result.h"
#include "solve/measure.h"
#include "analyses/output.h"
#include "analyses/quantity.h"
#include "analyses/trial.h"
#include "base/root.h"

/* How far a value may move, as a factor, and how far inside a limit the cell is brought. */
static const double factor_limit = 50, margin_share = 0.01;
enum { STEP_LIMIT = 24, WHOLE_LIMIT = 12, EVERYWHERE_TRIES = 3 };

/* Values that a designer may touch, by the names of the device tables. */
static const char *const touchable[] = {"resistance", "current", "W",         "L",
                                        "m",          "area",    "conduction"};

/* --- candidates ----------------------------------------------------------------------------------
 */

static bool is_touchable(const struct instance *instance, int p)
{
    if (instance->is_hidden) {
        return false;
    }
    const struct parameter *row = &instance->type->parameters[p];
    for (size_t k = 0; k < sizeof touchable / sizeof touchable[0]; k++) {
        if (strcmp(row->name, touchable[k]) == 0) {
            return true;
        }
    }
    return false;
}

static bool add_own(struct repairer *r, int k, int p)
{
    const struct system *s = r->home->system;
    const struct instance *instance = &s->circuit->instances[k];
    const char *name = instance->type->parameters[p].name;
    struct candidate *it = &r->candidates[r->count++];
    *it = (struct candidate){.parameter = derivative_own(s, k, p),
                             .is_whole = strcmp(name, "m") == 0};
    it->parameter.name = p == instance->type->value_parameter
                             ? instance->name
                             : arena_format(r->result->arena, "%s.%s", instance->name, name);
    it->knob = (struct knob){KNOB_VALUE, k, p, it->parameter.name, it->parameter.dimension};
    return it->parameter.name != NULL;
}

/*
 * What a let moves, found by building the cell with it a little larger: values that may be touched,
 * and nothing else; not what a requirement asks for either.
 *
 * moves  [value_count] out: own values of the parts, as r->first counts them
 *
 * Returns how many it moves, 0 when it is no candidate, -1 when memory is short.
 */
static int find_moves(struct repairer *r, const struct knob *knob, bool *moves, bool *is_whole)
{
    static const double little = 1e-3;
    const struct system *s = r->home->system;
    const struct circuit *c = s->circuit;
    const struct setting setting = {knob, knob_value(s, knob) * (1 + little)};
    struct variant variant;
    const enum status status = variant_open(&variant, s, &setting, 1);
    int count = 0;
    bool others = status != STATUS_OK;
    *is_whole = false;
    for (int k = 0; !others && k < c->instance_count; k++) {
        const struct instance *now = &variant.system->circuit->instances[k];
        const struct device_type *type = now->type;
        for (int p = 0; p < type->parameter_count; p++) {
            const double before = s->own[k][p], after = variant.system->own[k][p];
            if (!(after < before || after > before) || now->parent >= 0) {
                continue;
            }
            moves[r->first[k] + p] = true;
            count++;
            *is_whole |= strcmp(type->parameters[p].name, "m") == 0;
            others |= !is_touchable(now, p);
        }
        for (int p = 0; now->model_values != NULL && p < type->model_parameter_count; p++) {
            const double before = c->instances[k].model_values[p], after = now->model_values[p];
            others |= after < before || after > before;
        }
    }
    for (int k = 0; !others && k < c->requirement_count; k++) {
        const struct requirement *own = &c->requirements[k];
        const struct requirement *now = &variant.system->circuit->requirements[k];
        others |= fabs(now->value - own->value) > 0 || fabs(now->tolerance - own->tolerance) > 0;
    }
    variant_close(&variant);
    return status == STATUS_MEMORY ? -1 : others ? 0 : count;
}

/* Whether an own value is varied, or set by a let that is. */
static bool is_varied(const struct repairer *r, const bool *moves, int value)
{
    const struct circuit *c = r->home->system->circuit;
    for (int k = 0; k < c->condition_count; k++) {
        const struct knob *knob = &c->conditions[k].knob;
        if (knob->kind == KNOB_VALUE && r->first[knob->instance] + knob->parameter == value) {
            return true;
        }
        if (knob->kind == KNOB_LET &&
            moves[(size_t)knob->parameter * (size_t)r->value_count + (size_t)value]) {
            return true;
        }
    }
    return false;
}

/* Lets that set values which may be touched; a value that such a let alone sets is turned there. */
static bool list_lets(struct repairer *r, bool *moves, bool *by_let)
{
    const struct circuit *c = r->home->system->circuit;
    for (int k = 0; k < c->let_count; k++) {
        const struct knob knob = {KNOB_LET, -1, k, c->lets[k].name, c->lets[k].value.dimension};
        bool *own = moves + (size_t)k * (size_t)r->value_count;
        bool is_whole, is_free = true;
        if (!(c->lets[k].value.value > 0)) {
            continue;
        }
        const int count = find_moves(r, &knob, own, &is_whole);
        if (count < 0) {
            return false;
        }
        for (int v = 0; v < r->value_count && count > 0; v++) {
            by_let[v] |= own[v] && count == 1;
        }
        for (int i = 0; i < c->condition_count; i++) {
            const struct knob *varied = &c->conditions[i].knob;
            is_free &= !(varied->kind == KNOB_LET && varied->parameter == k) &&
                       !(varied->kind == KNOB_VALUE &&
                         own[r->first[varied->instance] + varied->parameter]);
        }
        if (count > 0) {
            r->candidates[r->count++] =
                (struct candidate){.parameter = derivative_knob(r->home->system, &knob),
                                   .knob = knob,
                                   .is_whole = is_whole,
                                   .is_varied = !is_free};
        }
    }
    return true;
}

static bool list_candidates(struct repairer *r, struct arena *arena)
{
    const struct system *s = r->home->system;
    const struct circuit *c = s->circuit;
    r->value_count = 0;
    r->first = arena_new_array(arena, int, c->instance_count);
    for (int k = 0; r->first != NULL && k < c->instance_count; k++) {
        r->first[k] = r->value_count;
        r->value_count += c->instances[k].type->parameter_count;
    }
    const size_t values = (size_t)r->value_count;
    bool *moves = arena_new_array(arena, bool, values *(size_t)c->let_count);
    bool *by_let = arena_new_array(arena, bool, values);
    r->candidates = arena_new_array(arena, struct candidate, r->value_count + c->let_count);
    if (r->first == NULL || moves == NULL || by_let == NULL || r->candidates == NULL ||
        !list_lets(r, moves, by_let)) {
        return false;
    }
    for (int k = 0; k < c->instance_count; k++) {
        for (int p = 0; p < c->instances[k].type->parameter_count; p++) {
            if (!is_touchable(&c->instances[k], p) || !(s->own[k][p] > 0) ||
                by_let[r->first[k] + p]) {
                continue;
            }
            if (!add_own(r, k, p)) {
                return false;
            }
            r->candidates[r->count - 1].is_varied = is_varied(r, moves, r->first[k] + p);
        }
    }
    return true;
}

static int by_prediction(const void *a, const void *b)
{
    const double x = fabs(((const struct candidate *)a)->predicted);
    const double y = fabs(((const struct candidate *)b)->predicted);
    return x < y ? -1 : x > y ? 1 : 0;
}

/* The middle of a band, a hundredth inside a limit. A drift is wanted small in either direction. */
double repair_aim(const struct requirement *q, double value)
{
    const double margin = margin_share * fabs(q->value);
    const bool by_size = q->probe.kind == PROBE_OUTPUT &&
                         (q->probe.quantity == OUTPUT_LINE || q->probe.quantity == OUTPUT_TEMPCO);
    if (by_size && q->relation == RELATION_BELOW && value < 0) {
        return margin - q->value;
    }
    return q->relation == RELATION_BELOW   ? q->value - margin
           : q->relation == RELATION_ABOVE ? q->value + margin
                                           : q->value;
}

/* One adjoint solve says which way each value has to go, and about how far. */
static enum status predict(struct repairer *r, struct arena *arena)
{
    struct parameter_ref *refs = arena_new_array(arena, struct parameter_ref, r->count);
    double *slopes = arena_new_array(arena, double, r->count);
    if (refs == NULL || slopes == NULL) {
        return STATUS_MEMORY;
    }
    for (int k = 0; k < r->count; k++) {
        refs[k] = r->candidates[k].parameter;
    }
    enum status status =
        quantity_derivative(r->home, &r->probe, refs, r->count, &r->value, slopes, NULL);
    r->aim = repair_aim(r->requirement, r->value);
    r->distance = r->value - r->aim;
    if (status == STATUS_OK && r->everywhere != NULL) {
        r->distance = everywhere_distance(r, NULL, NAN);
        status = r->status;
    }
    for (int k = 0; status == STATUS_OK && k < r->count; k++) {
        const double step = -r->distance / (slopes[k] * refs[k].value);
        const bool acts = fabs(slopes[k] * refs[k].value) > 1e-6 * fabs(r->value);
        r->candidates[k].predicted = acts && isfinite(step) ? step : INFINITY;
    }
    qsort(r->candidates, (size_t)r->count, sizeof *r->candidates, by_prediction);
    return status;
}

/* --- one candidate ---------------------------------------------------------------------------- */

/* Distance of the quantity from the aim with the candidate at exp(x) times its value; NAN where
 * there is none. */
static double distance_at(void *self, double x)
{
    struct repairer *r = self;
    struct trial trial;
    const double at = r->tried->parameter.value * exp(x);
    double value = NAN;
    if (r->everywhere != NULL) {
        return everywhere_distance(r, r->tried, at);
    }
    enum status status = trial_open(&trial, r->home, NULL, &r->tried->parameter, &at, 1);
    if (status == STATUS_OK) {
        status = quantity_values(&trial.point, &r->probe, 1, &value);
    }
    trial_close(&trial);
    if (status == STATUS_MEMORY || status == STATUS_STOPPED) {
        r->status = status;
    }
    return value - r->aim;
}

/* The factor that brings the quantity to the aim, as a logarithm; NAN when there is none in reach.
 */
static double find_factor(struct repairer *r)
{
    const double limit = log(factor_limit);
    double x = 0, distance = r->distance;
    double step = r->tried->predicted * 1.05;
    step = fmax(fmin(step, log(2)), -log(2));
    for (int k = 0; k < STEP_LIMIT && fabs(x) < limit; k++) {
        const double next = x + step, there = distance_at(r, next);
        if (r->status != STATUS_OK || isnan(there)) {
            return NAN;
        }
        if ((there > 0) != (distance > 0)) {
            return root_bracketed(distance_at, r, x, distance, next, there, 1e-6);
        }
        x = next;
        distance = there;
        step = step > 0 ? fmin(1.6 * step, log(2)) : fmax(1.6 * step, -log(2));
    }
    return NAN;
}

static double four_digits(double value)
{
    const double scale = pow(10, 3 - floor(log10(fabs(value))));
    return round(value * scale) / scale;
}

/* --- the verdict on a change ------------------------------------------------------------------ */

static bool needs_curve(const struct circuit *c, int output)
{
    for (int k = 0; k < c->requirement_count; k++) {
        const struct probe *probe = &c->requirements[k].probe;
        if (probe->kind == PROBE_OUTPUT && probe->index == output) {
            return true;
        }
    }
    return false;
}

static enum status judge_point(struct operating_point *point, struct result *scratch)
{
    const struct circuit *c = point->system->circuit;
    if (!measure_point(point, scratch->arena, &scratch->point)) {
        return STATUS_MEMORY;
    }
    scratch->outputs = arena_new_array(scratch->arena, struct output_result, c->output_count);
    if (scratch->outputs == NULL) {
        return STATUS_MEMORY;
    }
    scratch->output_count = c->output_count;
    for (int k = 0; k < c->output_count; k++) {
        enum status status = STATUS_OK;
        if (needs_curve(c, k)) {
            status = analyse_output(point, k, scratch->arena, &scratch->outputs[k]);
            status = status == STATUS_OK ? operating_point_polish(point) : status;
        } else if (!output_at_point(point, k, scratch->arena, &scratch->outputs[k])) {
            status = STATUS_MEMORY;
        }
        if (status != STATUS_OK) {
            return status;
        }
    }
    return judge_all(scratch) ? STATUS_OK : STATUS_MEMORY;
}

/* Whether a requirement that the result meets is lost. An `everywhere` line is judged at the cell's
 * own conditions here, the only ones that were solved again; everywhere_is_met knows the others. */
static bool is_lost(const struct result *scratch, const struct requirement_result *before,
                    const struct requirement_result *now)
{
    if (before->judgement != JUDGED_MET) {
        return false;
    }
    return now->judgement == JUDGED_NOT
               ? !judge_is_met(now->requirement,
                               judge_margin(scratch, now->requirement, now->computed))
               : now->judgement != JUDGED_MET;
}

/* Judges the cell with one value changed: whether the requirement is met, and what breaks. */
static bool is_met_at(struct repairer *r, const struct candidate *it, double to,
                      const char **breaks)
{
    struct trial trial;
    struct result scratch = {.arena = arena_create(), .circuit = r->home->system->circuit};
    enum status status = scratch.arena == NULL ? STATUS_MEMORY : STATUS_OK;
    trial = (struct trial){0};
    if (status == STATUS_OK) {
        status = trial_open(&trial, r->home, NULL, &it->parameter, &to, 1);
    }
    if (status == STATUS_OK) {
        status = judge_point(&trial.point, &scratch);
    }
    bool met = false;
    *breaks = NULL;
    for (int k = 0; status == STATUS_OK && k < scratch.requirement_count; k++) {
        const struct requirement_result *now = &scratch.requirements[k];
        if (now->requirement == r->requirement) {
            met = now->judgement == JUDGED_MET;
        } else if (*breaks == NULL && is_lost(&scratch, &r->result->requirements[k], now)) {
            *breaks = now->requirement->text;
        }
    }
    trial_close(&trial);
    arena_destroy(scratch.arena);
    if (status == STATUS_MEMORY || status == STATUS_STOPPED) {
        r->status = status;
    }
    return met;
}

/* --- the search ------------------------------------------------------------------------------- */

/* Those that break nothing first, then the smaller change. */
static bool is_before(const struct repair *a, const struct repair *b)
{
    if ((a->breaks == NULL) != (b->breaks == NULL)) {
        return a->breaks == NULL;
    }
    return fabs(log(a->to / a->from)) < fabs(log(b->to / b->from));
}

static void keep(struct repair_list *list, const struct repair *it)
{
    int place = list->count;
    while (place > 0 && is_before(it, &list->list[place - 1])) {
        place--;
    }
    if (place >= REPAIR_LIMIT) {
        return;
    }
    const int last = list->count < REPAIR_LIMIT ? list->count : REPAIR_LIMIT - 1;
    for (int k = last; k > place; k--) {
        list->list[k] = list->list[k - 1];
    }
    list->list[place] = *it;
    list->count = last + 1;
}

static void try_value(struct repairer *r, const struct candidate *it, double to,
                      struct repair_list *list, bool *met)
{
    const char *breaks = NULL, *elsewhere = NULL;
    *met = is_met_at(r, it, to, &breaks);
    if (r->everywhere != NULL && r->status == STATUS_OK) {
        *met = everywhere_is_met(r, it, to, &elsewhere);
    }
    if (*met && r->status == STATUS_OK) {
        const double from = it->parameter.value;
        const struct repair found = {
            it->parameter.name,      from,          to,
            it->parameter.dimension, to / from - 1, breaks != NULL ? breaks : elsewhere};
        keep(list, &found);
    }
}

static void try_whole(struct repairer *r, const struct candidate *it, struct repair_list *list)
{
    const double side = it->predicted > 0 ? 1 : -1;
    double to = it->parameter.value;
    bool met = false;
    for (int k = 0; k < WHOLE_LIMIT && !met && r->status == STATUS_OK && to + side >= 1; k++) {
        to = round(to + side);
        if (r->everywhere == NULL || everywhere_may_hold(r, it, to)) {
            try_value(r, it, to, list, &met);
        }
    }
}

/* Over all conditions a change may bring others to the fore: they are taken in, and it is tried
 * again. */
static void try_candidate(struct repairer *r, const struct candidate *it, struct repair_list *list)
{
    bool met = false;
    r->tried = it;
    if (it->is_whole) {
        try_whole(r, it, list);
        return;
    }
    const int tries = r->everywhere == NULL ? 1 : EVERYWHERE_TRIES;
    for (int k = 0; k < tries && !met && r->status == STATUS_OK; k++) {
        if (k > 0) {
            r->distance = everywhere_distance(r, NULL, NAN);
        }
        const double x = find_factor(r);
        if (r->status != STATUS_OK || !isfinite(x)) {
            return;
        }
        try_value(r, it, four_digits(it->parameter.value * exp(x)), list, &met);
    }
}

/* Whether what is left cannot be among the first three: the linearised cell may be wrong by a
 * factor of four. */
static bool is_settled(const struct repair_list *list, const struct candidate *next)
{
    const struct repair *last = &list->list[REPAIR_LIMIT - 1];
    return list->count == REPAIR_LIMIT && last->breaks == NULL &&
           fabs(next->predicted) > 4 * fabs(log(last->to / last->from));
}

static enum status repair_one(struct repairer *r, int index, struct repair_list *list)
{
    const struct requirement *q = &r->home->system->circuit->requirements[index];
    struct arena *arena = arena_create();
    if (arena == NULL) {
        return STATUS_MEMORY;
    }
    r->requirement = q;
    r->probe = q->probe;
    r->count = 0;
    r->everywhere = NULL;
    r->status = STATUS_OK;
    if (q->scope == SCOPE_EVERYWHERE) {
        r->status = everywhere_open(r, index, arena);
    }
    if (r->status == STATUS_OK) {
        r->status = list_candidates(r, arena) ? predict(r, arena) : STATUS_MEMORY;
    }
    for (int k = 0; r->status == STATUS_OK && k < r->count; k++) {
        if (!isfinite(r->candidates[k].predicted) || is_settled(list, &r->candidates[k])) {
            break;
        }
        if (r->options->progress != NULL) {
            r->options->progress(r->options->progress_self, q->text, (double)k / r->count);
        }
        if (r->everywhere != NULL && r->candidates[k].is_varied) {
            continue;
        }
        try_candidate(r, &r->candidates[k], list);
    }
    arena_destroy(arena);
    return r->status == STATUS_UNSOLVED ? STATUS_OK : r->status;
}

/* NULL: a change is looked for. */
static const char *why_not(const struct result *result, const struct requirement *q)
{
    if (q->scope == SCOPE_YIELD) {
        return "a yield takes all samples anew for each value tried";
    }
    if (q->scope == SCOPE_EVERYWHERE && result->conditions == NULL) {
        return "the conditions were not solved";
    }
    return q->scope == SCOPE_EVERYWHERE && result->conditions->point_count > REPAIR_CONDITION_LIMIT
               ? "each value tried would take too many conditions"
               : NULL;
}

enum status repair_find(struct circuit *circuit, struct operating_point *home,
                        const struct analysis_options *options, struct result *result)
{
    struct repairer r = {.circuit = circuit, .home = home, .options = options, .result = result};
    result->repairs = arena_new_array(result->arena, struct repair_list, result->requirement_count);
    if (result->repairs == NULL) {
        return STATUS_MEMORY;
    }
    enum status status = STATUS_OK;
    for (int k = 0; k < result->requirement_count && status == STATUS_OK; k++) {
        const struct requirement_result *row = &result->requirements[k];
        if (row->judgement != JUDGED_NOT_MET && row->judgement != JUDGED_UNKNOWN) {
            continue;
        }
        result->repairs[k].why_not = why_not(result, row->requirement);
        if (result->repairs[k].why_not == NULL) {
            result->repairs[k].looked_for = true;
            status = repair_one(&r, k, &result->repairs[k]);
        }
    }
    return status;
}

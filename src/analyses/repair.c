/*
 * repair.c: each value that a designer may touch is moved until the requirement is met, and the
 * changed cell is judged as a whole.
 */
#include "analyses/repair.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "analyses/judge.h"
#include "solve/measure.h"
#include "analyses/output.h"
#include "analyses/quantity.h"
#include "analyses/trial.h"
#include "base/root.h"

/* How far a value may move, as a factor, and how far inside a limit the cell is brought. */
static const double factor_limit = 50, margin_share = 0.01;
enum { STEP_LIMIT = 24, WHOLE_LIMIT = 12 };

/* Values that a designer may touch, by the names of the device tables. */
static const char *const touchable[] = {"resistance", "current", "W",         "L",
                                        "m",          "area",    "conduction"};

struct candidate {
    struct parameter_ref parameter;
    bool is_whole;    /* m: a count */
    double predicted; /* logarithm of the factor that the linearised cell asks for */
};

struct repairer {
    struct operating_point *home;
    const struct analysis_options *options;
    struct result *result;
    const struct requirement *requirement;
    struct probe probe;
    double value, aim; /* of the quantity: now, wanted */
    struct candidate *candidates;
    int count;
    const struct candidate *tried;
    enum status status;
};

/* --- candidates ----------------------------------------------------------------------------------
 */

static bool is_touchable(const struct instance *instance, int p)
{
    const struct parameter *row = &instance->type->parameters[p];
    for (size_t k = 0; k < sizeof touchable / sizeof touchable[0]; k++) {
        if (strcmp(row->name, touchable[k]) == 0) {
            return !instance->is_hidden;
        }
    }
    return false;
}

static bool list_candidates(struct repairer *r, struct arena *arena)
{
    const struct system *s = r->home->system;
    const struct circuit *c = s->circuit;
    int total = 0;
    for (int k = 0; k < c->instance_count; k++) {
        total += c->instances[k].type->parameter_count;
    }
    r->candidates = arena_new_array(arena, struct candidate, total);
    for (int k = 0; r->candidates != NULL && k < c->instance_count; k++) {
        const struct instance *instance = &c->instances[k];
        for (int p = 0; p < instance->type->parameter_count; p++) {
            if (!is_touchable(instance, p) || !(s->own[k][p] > 0)) {
                continue;
            }
            struct candidate *it = &r->candidates[r->count++];
            const char *name = instance->type->parameters[p].name;
            it->parameter = derivative_own(s, k, p);
            it->is_whole = strcmp(name, "m") == 0;
            it->parameter.name =
                p == instance->type->value_parameter
                    ? instance->name
                    : arena_format(r->result->arena, "%s.%s", instance->name, name);
            if (it->parameter.name == NULL) {
                return false;
            }
        }
    }
    return r->candidates != NULL;
}

static int by_prediction(const void *a, const void *b)
{
    const double x = fabs(((const struct candidate *)a)->predicted);
    const double y = fabs(((const struct candidate *)b)->predicted);
    return x < y ? -1 : x > y ? 1 : 0;
}

/* The middle of a band, a hundredth inside a limit. A drift is wanted small in either direction. */
static double aim_of(const struct requirement *q, double value)
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
    const enum status status =
        quantity_derivative(r->home, &r->probe, refs, r->count, &r->value, slopes, NULL);
    r->aim = aim_of(r->requirement, r->value);
    for (int k = 0; status == STATUS_OK && k < r->count; k++) {
        const double step = (r->aim - r->value) / (slopes[k] * refs[k].value);
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
    double x = 0, distance = r->value - r->aim;
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
 * own conditions here, the only ones that were solved again. */
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
    const char *breaks = NULL;
    *met = is_met_at(r, it, to, &breaks);
    if (*met && r->status == STATUS_OK) {
        const double from = it->parameter.value;
        const struct repair found = {it->parameter.name,      from,          to,
                                     it->parameter.dimension, to / from - 1, breaks};
        keep(list, &found);
    }
}

static void try_candidate(struct repairer *r, const struct candidate *it, struct repair_list *list)
{
    bool met = false;
    r->tried = it;
    if (it->is_whole) {
        const double side = it->predicted > 0 ? 1 : -1;
        double to = it->parameter.value;
        for (int k = 0; k < WHOLE_LIMIT && !met && r->status == STATUS_OK && to + side >= 1; k++) {
            to = round(to + side);
            try_value(r, it, to, list, &met);
        }
        return;
    }
    const double x = find_factor(r);
    if (r->status == STATUS_OK && isfinite(x)) {
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
    r->status = list_candidates(r, arena) ? predict(r, arena) : STATUS_MEMORY;
    for (int k = 0; r->status == STATUS_OK && k < r->count; k++) {
        if (!isfinite(r->candidates[k].predicted) || is_settled(list, &r->candidates[k])) {
            break;
        }
        if (r->options->progress != NULL) {
            r->options->progress(r->options->progress_self, q->text, (double)k / r->count);
        }
        try_candidate(r, &r->candidates[k], list);
    }
    arena_destroy(arena);
    return r->status == STATUS_UNSOLVED ? STATUS_OK : r->status;
}

enum status repair_find(struct operating_point *home, const struct analysis_options *options,
                        struct result *result)
{
    struct repairer r = {.home = home, .options = options, .result = result};
    result->repairs = arena_new_array(result->arena, struct repair_list, result->requirement_count);
    if (result->repairs == NULL) {
        return STATUS_MEMORY;
    }
    enum status status = STATUS_OK;
    for (int k = 0; k < result->requirement_count && status == STATUS_OK; k++) {
        const struct requirement_result *row = &result->requirements[k];
        if (row->requirement->scope != SCOPE_POINT ||
            (row->judgement != JUDGED_NOT_MET && row->judgement != JUDGED_UNKNOWN)) {
            continue;
        }
        result->repairs[k].looked_for = true;
        status = repair_one(&r, k, &result->repairs[k]);
    }
    return status;
}

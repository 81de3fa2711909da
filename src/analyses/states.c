/*
 * states.c: every resting state of a cell. States are first collected by following the open loop,
 * then the search of proof/ finds the rest and proves that there are no more.
 */
#include "analyses/states.h"

#include <math.h>
#include <string.h>

#include "solve/measure.h"
#include "analyses/network_range.h"
#include "analyses/remarks.h"
#include "analyses/result_create.h"
#include "analyses/states_internal.h"

enum { CURVE_POINTS = 160, BRIEF_CURVE_POINTS = 40 };
/* A review looks at so many boxes, fewer where each costs more: the programs grow with the square.
 */
enum { BRIEF_BOXES = 400, BRIEF_WORK = 200000 };

/* --- certificates --------------------------------------------------------------------------- */

enum status states_settle(struct operating_point *p, const double *x)
{
    memcpy(p->x, x, (size_t)p->system->n * sizeof *x);
    const enum newton_status status = operating_point_newton(p);
    if (status == NEWTON_STOPPED || status == NEWTON_MEMORY) {
        return status == NEWTON_STOPPED ? STATUS_STOPPED : STATUS_MEMORY;
    }
    return status == NEWTON_CONVERGED ? operating_point_polish(p) : STATUS_UNSOLVED;
}

/* For the search: from voltages of the network to those of a solution. */
static bool refine(void *self, double *nodes)
{
    struct states_work *w = self;
    memset(w->x, 0, (size_t)w->system->n * sizeof *w->x);
    network_to_system(&w->map, w->system->node_count, nodes, w->x);
    const enum status status = states_settle(w->point, w->x);
    if (status != STATUS_OK) {
        w->broken = status == STATUS_UNSOLVED ? w->broken : status;
        return false;
    }
    network_from_system(&w->map, w->point->x, nodes);
    return true;
}

static bool begin_work(struct states_work *w, struct operating_point *point, struct arena *arena,
                       const struct analysis_options *options)
{
    *w = (struct states_work){
        .point = point, .system = point->system, .arena = arena, .options = options};
    w->is_large = w->system->circuit->instance_count > STATES_PART_LIMIT;
    if (w->is_large) {
        return true;
    }
    if (!network_build(arena, w->system, &w->map)) {
        return false;
    }
    w->is_large = w->map.network->node_count > STATES_NODE_LIMIT;
    w->nodes = arena_new_array(arena, double, w->map.network->node_count);
    w->x = arena_new_array(arena, double, w->system->n);
    return w->nodes != NULL && w->x != NULL;
}

/* Half widths of all nodes from the box of the network. */
static bool put_widths(const struct states_work *w, const struct interval *box,
                       struct state_result *state)
{
    const int count = w->system->node_count;
    double *half = arena_new_array(w->arena, double, count);
    if (half == NULL) {
        return false;
    }
    state->widest = 0;
    for (int k = 0; k < count; k++) {
        const int group = w->map.group[k];
        /* from the rounded voltage shown to the farther end */
        if (group >= 0) {
            const struct interval at = interval_add(box[group], w->map.shift[k]);
            half[k] = interval_up(fmax(at.hi - state->x[k], state->x[k] - at.lo));
        }
        state->widest = fmax(state->widest, half[k]);
    }
    state->half_width = half;
    return true;
}

/* The point at hand as a state. */
static bool put_state(const struct states_work *w, const double *x, struct state_result *state)
{
    const struct circuit *c = w->system->circuit;
    double *copy = arena_new_array(w->arena, double, w->system->n);
    double *outputs = arena_new_array(w->arena, double, c->output_count);
    if (copy == NULL || outputs == NULL) {
        return false;
    }
    memcpy(copy, x, (size_t)w->system->n * sizeof *copy);
    for (int k = 0; k < c->output_count; k++) {
        outputs[k] = fabs(x[system_branch(&c->instances[c->outputs[k].instance])]);
    }
    const struct probe power = {.kind = PROBE_CELL};
    *state = (struct state_result){.x = copy,
                                   .outputs = outputs,
                                   .can_hold = true,
                                   .widest = NAN,
                                   .power = measure_probe(w->system, &power, x)};
    return true;
}

bool states_certify(struct operating_point *p, struct result *result)
{
    struct states_work w;
    const struct analysis_options options = {0};
    struct states_result *found = arena_new(result->arena, struct states_result);
    struct state_result *state = arena_new(result->arena, struct state_result);
    if (found == NULL || state == NULL || !begin_work(&w, p, result->arena, &options)) {
        return false;
    }
    if (!put_state(&w, p->x, state)) {
        return false;
    }
    found->states = state;
    found->state_count = 1;
    found->push = NAN;
    result->states = found;
    if (w.is_large) {
        return true;
    }
    const struct search_options plain = {0};
    struct search *search = search_create(w.map.network, &plain);
    int index;
    if (search == NULL) {
        return false;
    }
    network_from_system(&w.map, p->x, w.nodes);
    if (search_add(search, w.nodes, &index)) {
        const struct search_state *proved = &search_found(search)->states[index];
        state->is_certified = true;
        state->can_hold = proved->determinant > 0;
        if (!put_widths(&w, proved->box, state)) {
            return false;
        }
    }
    return true;
}

/* --- all states ------------------------------------------------------------------------------- */

int states_which(const struct states_result *found, const struct system *system, const double *x)
{
    int best = -1;
    double least = 1e-3;
    for (int k = 0; k < found->state_count; k++) {
        double far = 0;
        for (int i = 0; i < system->node_count; i++) {
            far = fmax(far, fabs(found->states[k].x[i] - x[i]));
        }
        if (far < least) {
            least = far;
            best = k;
        }
    }
    return best;
}

/* States where the curve of the open loop crosses zero. */
static enum status collect_crossings(struct states_work *w, const struct loop_curve *curve)
{
    const size_t n = (size_t)w->system->n;
    for (int k = 0; k + 1 < curve->count; k++) {
        const double a = curve->push[k], b = curve->push[k + 1];
        int index;
        if ((a > 0) == (b > 0)) {
            continue;
        }
        const double share = a / (a - b);
        const double *x = curve->x + (size_t)k * n, *y = x + n;
        for (size_t i = 0; i < n; i++) {
            w->x[i] = x[i] + (y[i] - x[i]) * (share >= 0 && share <= 1 ? share : 0.5);
        }
        const enum status status = states_settle(w->point, w->x);
        if (status == STATUS_MEMORY || status == STATUS_STOPPED) {
            return status;
        }
        if (status == STATUS_OK) {
            network_from_system(&w->map, w->point->x, w->nodes);
            search_add(w->search, w->nodes, &index);
        }
    }
    return STATUS_OK;
}

static int by_power(const struct state_result *a, const struct state_result *b)
{
    return a->power < b->power ? -1 : a->power > b->power;
}

/* The states of the search as results, in rising power. */
static enum status put_states(struct states_work *w, struct states_result *found)
{
    const struct search_result *search = search_found(w->search);
    const int room = search->state_count + 1;
    found->states = arena_new_array(w->arena, struct state_result, room);
    if (found->states == NULL) {
        return STATUS_MEMORY;
    }
    for (int k = 0; k < search->state_count; k++) {
        struct state_result state;
        memcpy(w->nodes, search->states[k].centre,
               (size_t)w->map.network->node_count * sizeof *w->nodes);
        if (!refine(w, w->nodes)) {
            return w->broken == STATUS_OK ? STATUS_UNSOLVED : w->broken;
        }
        if (!put_state(w, w->point->x, &state)) {
            return STATUS_MEMORY;
        }
        state.is_certified = true;
        state.can_hold = search->states[k].determinant > 0;
        if (!put_widths(w, search->states[k].box, &state)) {
            return STATUS_MEMORY;
        }
        int at = found->state_count++;
        for (; at > 0 && by_power(&state, &found->states[at - 1]) < 0; at--) {
            found->states[at] = found->states[at - 1];
        }
        found->states[at] = state;
    }
    return STATUS_OK;
}

static bool put_undecided(const struct states_work *w, struct states_result *found)
{
    const struct search_result *search = search_found(w->search);
    const struct circuit *c = w->system->circuit;
    found->undecided_boxes = search->undecided;
    if (search->undecided == 0) {
        return true;
    }
    const int count = w->map.network->node_count;
    found->undecided = arena_new_array(w->arena, struct undecided_range, count);
    for (int k = 0; k < count && found->undecided != NULL; k++) {
        found->undecided[found->undecided_count++] = (struct undecided_range){
            c->nodes[w->map.node[k] + 1].name, search->rest[k].lo, search->rest[k].hi};
    }
    return found->undecided != NULL;
}

/* The wanted state has no certificate (a singular Jacobian): it is shown all the same. */
static bool put_uncertified(struct states_work *w, struct states_result *found)
{
    found->wanted = states_which(found, w->system, w->wanted);
    if (found->wanted >= 0) {
        return true;
    }
    found->is_complete = false;
    found->wanted = found->state_count;
    return put_state(w, w->wanted, &found->states[found->state_count++]);
}

/* States on the curve of the open loop, from the wanted one. */
static enum status follow_loop(struct states_work *w, struct states_result *found)
{
    struct loop_curve curve = {0};
    const enum status status =
        startup_curve(w, w->is_brief ? BRIEF_CURVE_POINTS : CURVE_POINTS, &curve);
    found->curve_v = curve.v;
    found->curve_push = curve.push;
    found->curve_count = curve.count;
    return status == STATUS_OK ? collect_crossings(w, &curve) : status;
}

/* Where `point` finds none, the state of the largest power that can be held is the wanted one. */
static enum status choose_wanted(struct states_work *w, struct states_result *found)
{
    found->wanted = found->state_count - 1;
    for (int k = 0; k < found->state_count; k++) {
        found->wanted = found->states[k].can_hold ? k : found->wanted;
    }
    if (found->wanted < 0) {
        return STATUS_UNSOLVED;
    }
    w->wanted = found->states[found->wanted].x;
    return follow_loop(w, found);
}

static void put_loop(const struct states_work *w, struct states_result *found)
{
    found->has_loop = w->loop.found;
    found->loop_unsure = w->loop.unsure;
    found->loop_path = w->loop.path;
    found->probe_unknown = w->loop.probe;
    if (w->loop.probe >= 0) {
        found->probe = w->system->circuit->nodes[w->loop.probe + 1].name;
    }
}

static enum status find_states(struct states_work *w, struct states_result *found)
{
    enum status status = STATUS_OK;
    int index;
    if (!loops_find(w->arena, w->system, &w->map, &w->loop)) {
        return STATUS_MEMORY;
    }
    put_loop(w, found);
    if (w->wanted != NULL) {
        network_from_system(&w->map, w->wanted, w->nodes);
        search_add(w->search, w->nodes, &index);
        status = follow_loop(w, found);
    }
    if (status == STATUS_OK) {
        status = search_run(w->search);
        status = w->broken == STATUS_OK ? status : w->broken;
    }
    const struct search_result *search = search_found(w->search);
    found->boxes = search->boxes;
    found->is_complete = status == STATUS_OK && search->complete;
    if (status != STATUS_OK && status != STATUS_STOPPED) {
        return status;
    }
    enum status put = put_states(w, found);
    if (put == STATUS_OK && !put_undecided(w, found)) {
        put = STATUS_MEMORY;
    }
    if (put == STATUS_OK && w->wanted == NULL) {
        put = choose_wanted(w, found);
    } else if (put == STATUS_OK && !put_uncertified(w, found)) {
        put = STATUS_MEMORY;
    }
    return put == STATUS_OK ? status : put;
}

/* Nothing can be proved: the one state known, and why there is no more. */
static bool put_large(const struct states_work *w, struct states_result *found)
{
    found->is_large = true;
    found->startup = STARTUP_AT_RISK;
    found->reasons[found->reason_count++] = "the cell is too large for the proof";
    found->states = arena_new(w->arena, struct state_result);
    found->state_count = 1;
    return found->states != NULL && put_state(w, w->wanted, found->states);
}

/* has_point: the point holds a state; else the search is all there is. */
static enum status work_on(struct states_work *w, bool has_point, struct result *result)
{
    const struct analysis_options *options = w->options;
    struct states_result *found = arena_new(result->arena, struct states_result);
    double *wanted = arena_new_array(result->arena, double, w->system->n);
    if (found == NULL || wanted == NULL) {
        return STATUS_MEMORY;
    }
    memcpy(wanted, w->point->x, (size_t)w->system->n * sizeof *wanted);
    w->wanted = has_point ? wanted : NULL;
    found->push = found->push_at = found->push_off = found->ramp_break = NAN;
    found->ramp_state = -1;
    found->probe_unknown = -1;
    found->push_bound = options->leakage;
    found->box_limit = options->boxes;
    found->is_brief = w->is_brief;
    result->states = found;
    if (w->is_large && !has_point) {
        return STATUS_UNSOLVED;
    }
    if (w->is_large) {
        return put_large(w, found) ? STATUS_OK : STATUS_MEMORY;
    }
    const struct search_options search = {.box_limit = options->boxes,
                                          .refine = refine,
                                          .refine_self = w,
                                          .stopped = options->stopped,
                                          .stopped_self = options->stopped_self,
                                          .progress = options->progress,
                                          .progress_self = options->progress_self};
    if (!network_range(w->arena, w->system, &w->map)) {
        return STATUS_MEMORY;
    }
    w->search = search_create(w->map.network, &search);
    if (w->search == NULL) {
        return STATUS_MEMORY;
    }
    found->low = w->map.low;
    found->high = w->map.high;
    found->is_assumed = w->map.is_assumed;
    enum status status = find_states(w, found);
    if (status == STATUS_OK) {
        status = startup_judge(w, found);
    }
    return status;
}

static enum status work_all(struct operating_point *point, bool has_point,
                            const struct analysis_options *options, struct result *result)
{
    struct states_work w;
    return begin_work(&w, point, result->arena, options) ? work_on(&w, has_point, result)
                                                         : STATUS_MEMORY;
}

/* --- commands -----------------------------------------------------------------------------------
 */

/* The search found what `point` did not: its wanted state becomes the point of the result. */
static enum status adopt_point(struct operating_point *point, const struct states_result *found)
{
    const enum status status = states_settle(point, found->states[found->wanted].x);
    if (status == STATUS_OK) {
        point->solver.method = "search for all states";
        point->solver.trouble = point->solver.advice = NULL;
    }
    return status;
}

static bool put_point(struct operating_point *point, struct result *result)
{
    result_keep_solver(result, &point->solver);
    result->verdict = VERDICT_NO_REQUIREMENTS;
    return measure_point(point, result->arena, &result->point) && remarks_add(point, result);
}

static enum status find_all(struct operating_point *point, const struct analysis_options *options,
                            struct result *result)
{
    enum status status = operating_point_find(point);
    const bool has_point = status == STATUS_OK;
    if (status != STATUS_OK && status != STATUS_UNSOLVED) {
        return status;
    }
    result_keep_solver(result, &point->solver);
    if (has_point && !put_point(point, result)) {
        return STATUS_MEMORY;
    }
    status = work_all(point, has_point, options, result);
    const struct states_result *found = result->states;
    if ((status == STATUS_OK || status == STATUS_STOPPED) && !has_point && found->state_count > 0) {
        const enum status adopted = adopt_point(point, found);
        if (adopted == STATUS_MEMORY || (adopted == STATUS_OK && !put_point(point, result))) {
            return STATUS_MEMORY;
        }
    }
    return status;
}

enum status analysis_states(struct circuit *circuit, const struct analysis_options *options,
                            struct result **result)
{
    struct operating_point point;
    const unsigned effects = options->view == VIEW_HAND ? EFFECTS_HAND : EFFECTS_FULL;
    struct system *system = system_create(circuit, circuit->kelvin, effects);
    *result = result_create(circuit, options->view, "states");
    enum status status = STATUS_MEMORY;
    if (*result != NULL && system != NULL &&
        operating_point_create(&point, system, options->stopped, options->stopped_self)) {
        status = find_all(&point, options, *result);
    }
    const bool texts_failed = system != NULL && arena_failed(system->arena);
    system_free(system);
    if (status == STATUS_MEMORY || texts_failed || *result == NULL ||
        arena_failed((*result)->arena)) {
        result_free(*result);
        *result = NULL;
        return STATUS_MEMORY;
    }
    (*result)->is_stopped = status == STATUS_STOPPED;
    return status;
}

/* --- for the review ----------------------------------------------------------------------------
 */

/* A caution where the verdict is "at risk", with the first reason. */
static bool remark_loop(const struct states_result *found, struct result *result)
{
    if (found->startup == STARTUP_CERTAIN || found->state_count == 0) {
        return true;
    }
    return caution_add(result->circuit, &result->cautions, CAUTION_LOOP,
                       found->probe == NULL ? "" : found->probe, 0,
                       "the loop %s could hold more than one state, and start-up is at risk: %s",
                       found->loop_path, found->reason_count > 0 ? found->reasons[0] : "");
}

static long brief_boxes(const struct network *network)
{
    const long each = (long)network->variable_count * network->variable_count;
    return each * BRIEF_BOXES > BRIEF_WORK ? BRIEF_WORK / each + 1 : BRIEF_BOXES;
}

enum status states_review(struct operating_point *p, const struct analysis_options *options,
                          struct result *result)
{
    struct states_work w;
    struct analysis_options brief = *options;
    if (!begin_work(&w, p, result->arena, &brief)) {
        return STATUS_MEMORY;
    }
    if (w.is_large) {
        return STATUS_OK;
    }
    if (!loops_find(w.arena, w.system, &w.map, &w.loop)) {
        return STATUS_MEMORY;
    }
    if (!w.loop.found) {
        return STATUS_OK;
    }
    double *home = arena_new_array(result->arena, double, p->system->n);
    if (home == NULL) {
        return STATUS_MEMORY;
    }
    memcpy(home, p->x, (size_t)p->system->n * sizeof *home);
    brief.boxes = brief_boxes(w.map.network);
    brief.leakage = options->leakage > 0 ? options->leakage : 1e-9;
    w.is_brief = true;
    enum status status = work_on(&w, true, result);
    if (status == STATUS_OK && !remark_loop(result->states, result)) {
        status = STATUS_MEMORY;
    }
    if (status != STATUS_OK) {
        result->states = NULL; /* half a search says nothing */
        return status == STATUS_UNSOLVED ? STATUS_OK : status;
    }
    const enum status settled = states_settle(p, home); /* others go on from the point */
    return settled == STATUS_UNSOLVED ? STATUS_OK : settled;
}

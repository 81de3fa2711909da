/*
 * search.c: branch and prune (Hansen and Walster, Global Optimization Using Interval Analysis,
 * 2004, chapters 11 and 14).
 *
 * A box is cut down by contraction and by the operator of Krawczyk. It is done with when it is
 * empty, or lies in a region known to hold one known solution only, or is proved to hold at most
 * one and that one is found. Else it is cut in two.
 */
#include "proof/search.h"

#include <string.h>

#include "proof/certify.h"
#include "proof/contract.h"

enum { REPEAT_LIMIT = 4, REGION_HALVINGS = 24 };

struct known_region {
    struct interval *nodes; /* [node_count] holds one solution: that of `state` */
    int state;
};

struct search {
    const struct network *network;
    struct search_options options;
    struct search_result result;
    struct contractor *contractor;
    struct certifier *certifier;
    int size;               /* of a box */
    struct interval *stack; /* [capacity * size] */
    double *share;          /* [capacity] of the start box, for progress */
    int depth, capacity;
    struct known_region *regions;
    int region_count, region_capacity;
    double *trial;         /* [node_count] */
    struct interval *hull; /* [node_count] */
    double done;
    bool memory_short;
};

struct search *search_create(const struct network *network, const struct search_options *options)
{
    struct arena *arena = network->arena;
    struct search *s = arena_new(arena, struct search);
    if (s == NULL) {
        return NULL;
    }
    s->network = network;
    s->options = *options;
    s->size = contract_size(network);
    s->contractor = contractor_create(network);
    s->certifier = certifier_create(network);
    s->trial = arena_new_array(arena, double, network->node_count);
    s->hull = arena_new_array(arena, struct interval, network->node_count);
    s->result.rest = arena_new_array(arena, struct interval, network->node_count);
    if (s->contractor == NULL || s->certifier == NULL || s->trial == NULL || s->hull == NULL ||
        s->result.rest == NULL) {
        return NULL;
    }
    return s;
}

struct search_result *search_found(struct search *s)
{
    return &s->result;
}

static bool overlap(const struct interval *a, const struct interval *b, int n)
{
    for (int k = 0; k < n; k++) {
        if (!(a[k].lo <= b[k].hi && b[k].lo <= a[k].hi)) {
            return false;
        }
    }
    return true;
}

static bool inside(const struct interval *a, const struct interval *b, int n)
{
    for (int k = 0; k < n; k++) {
        if (!interval_inside(a[k], b[k])) {
            return false;
        }
    }
    return true;
}

/* Keeps a region; a failure only costs time. */
static void keep_region(struct search *s, const struct interval *nodes, int state)
{
    const int n = s->network->node_count;
    struct arena *arena = s->network->arena;
    struct known_region *grown =
        arena_grow(arena, s->regions, s->region_count, &s->region_capacity, sizeof *grown);
    struct interval *copy = arena_new_array(arena, struct interval, n);
    if (grown == NULL || copy == NULL) {
        s->memory_short = true;
        return;
    }
    memcpy(copy, nodes, (size_t)n * sizeof *copy);
    s->regions = grown;
    s->regions[s->region_count++] = (struct known_region){copy, state};
}

/* The widest cube around a state that holds no other solution. */
static void find_region(struct search *s, int state)
{
    const int n = s->network->node_count;
    const struct search_state *found = &s->result.states[state];
    double reach = 1;
    for (int k = 0; k < REGION_HALVINGS; k++, reach /= 2) {
        for (int i = 0; i < n; i++) {
            s->hull[i] = (struct interval){found->box[i].lo - reach, found->box[i].hi + reach};
        }
        if (certify_single(s->certifier, s->hull)) {
            keep_region(s, s->hull, state);
            return;
        }
    }
    keep_region(s, found->box, state);
}

/* A certified box that may belong to a known state: its number, else -1. */
static int known_state(struct search *s, const struct interval *box)
{
    const int n = s->network->node_count;
    for (int k = 0; k < s->region_count; k++) {
        if (inside(box, s->regions[k].nodes, n)) {
            return s->regions[k].state;
        }
    }
    for (int k = 0; k < s->result.state_count; k++) {
        if (overlap(box, s->result.states[k].box, n)) {
            return k;
        }
    }
    return -1;
}

bool search_add(struct search *s, const double *nodes, int *index)
{
    const int n = s->network->node_count;
    struct arena *arena = s->network->arena;
    struct interval *box = arena_new_array(arena, struct interval, n);
    *index = -1;
    if (box == NULL) {
        s->memory_short = true;
        return false;
    }
    if (!certify_exactly(s->certifier, nodes, box)) {
        return false;
    }
    *index = known_state(s, box);
    if (*index >= 0) {
        return true;
    }
    struct search_state *grown = arena_grow(arena, s->result.states, s->result.state_count,
                                            &s->result.state_capacity, sizeof *grown);
    double *centre = arena_new_array(arena, double, n);
    if (grown == NULL || centre == NULL) {
        s->memory_short = true;
        return false;
    }
    memcpy(centre, nodes, (size_t)n * sizeof *centre);
    s->result.states = grown;
    *index = s->result.state_count++;
    s->result.states[*index] =
        (struct search_state){centre, box, certify_determinant(s->certifier, centre)};
    find_region(s, *index);
    return true;
}

/* Newton from the middle of a box. */
static bool look_for(struct search *s, const struct interval *box, int *index)
{
    for (int k = 0; k < s->network->node_count; k++) {
        s->trial[k] = interval_middle(box[k]);
    }
    return s->options.refine != NULL && s->options.refine(s->options.refine_self, s->trial) &&
           search_add(s, s->trial, index);
}

/*
 * A box with at most one solution is done with when that one is known: a state whose own box
 * touches it, so that both together still hold at most one.
 */
static bool settled(struct search *s, const struct interval *box)
{
    const int n = s->network->node_count;
    for (int k = 0; k < s->result.state_count; k++) {
        const struct interval *state = s->result.states[k].box;
        if (!overlap(box, state, n)) {
            continue;
        }
        for (int i = 0; i < n; i++) {
            s->hull[i] = interval_hull(box[i], state[i]);
        }
        if (certify_single(s->certifier, s->hull)) {
            keep_region(s, s->hull, k);
            return true;
        }
    }
    return false;
}

static bool in_region(const struct search *s, const struct interval *box)
{
    for (int k = 0; k < s->region_count; k++) {
        if (inside(box, s->regions[k].nodes, s->network->node_count)) {
            return true;
        }
    }
    return false;
}

static double node_size(const struct search *s, const struct interval *box)
{
    double sum = 0;
    for (int k = 0; k < s->network->variable_count; k++) {
        sum += interval_width(box[k]);
    }
    return sum;
}

/* True when the box is done with. */
static bool prune(struct search *s, struct interval *box)
{
    bool single = false;
    for (int round = 0; round < REPEAT_LIMIT; round++) {
        const double before = node_size(s, box);
        if (!contract_propagate(s->contractor, box) || in_region(s, box) ||
            !contract_program(s->contractor, box, true) || in_region(s, box) ||
            !certify_box(s->certifier, box, &single)) {
            return true;
        }
        if (single) {
            break;
        }
        if (!(node_size(s, box) < 0.7 * before)) {
            break;
        }
    }
    int index;
    if (single && settled(s, box)) {
        return true;
    }
    if (single || s->result.boxes % 32 == 1) {
        const int before = s->result.state_count;
        if (look_for(s, box, &index) && (single || s->result.state_count > before)) {
            return (single && settled(s, box)) || in_region(s, box);
        }
    }
    return false;
}

static bool push(struct search *s, const struct interval *box, double share)
{
    if (s->depth == s->capacity) {
        const int wider = s->capacity == 0 ? 64 : 2 * s->capacity;
        struct arena *arena = s->network->arena;
        struct interval *stack = arena_array(arena, (size_t)wider * (size_t)s->size, sizeof *stack);
        double *shares = arena_new_array(arena, double, wider);
        if (stack == NULL || shares == NULL) {
            return false;
        }
        if (s->depth > 0) {
            memcpy(stack, s->stack, (size_t)s->depth * (size_t)s->size * sizeof *stack);
            memcpy(shares, s->share, (size_t)s->depth * sizeof *shares);
        }
        s->stack = stack;
        s->share = shares;
        s->capacity = wider;
    }
    memcpy(s->stack + s->depth * s->size, box, (size_t)s->size * sizeof *box);
    s->share[s->depth++] = share;
    return true;
}

static void leave_undecided(struct search *s, const struct interval *box)
{
    for (int k = 0; k < s->network->node_count; k++) {
        s->result.rest[k] =
            s->result.undecided == 0 ? box[k] : interval_hull(s->result.rest[k], box[k]);
    }
    s->result.undecided++;
}

/* Cuts the box in two; false when memory is short. */
static bool split(struct search *s, struct interval *box, double share)
{
    double at = 0;
    const int k = contract_branch(s->contractor, box, &at);
    if (k < 0 || !(at > box[k].lo && at < box[k].hi)) {
        leave_undecided(s, box);
        return true;
    }
    const struct interval whole = box[k];
    box[k].lo = at;
    if (!push(s, box, share / 2)) {
        return false;
    }
    box[k] = (struct interval){whole.lo, at};
    return push(s, box, share / 2);
}

enum status search_run(struct search *s)
{
    struct arena *arena = s->network->arena;
    struct interval *box = arena_new_array(arena, struct interval, s->size);
    if (box == NULL) {
        return STATUS_MEMORY;
    }
    contract_start(s->network, box);
    s->depth = 0;
    if (!push(s, box, 1)) {
        return STATUS_MEMORY;
    }
    enum status status = STATUS_OK;
    while (s->depth > 0 && s->result.boxes < s->options.box_limit && !s->memory_short) {
        if (s->options.stopped != NULL && s->options.stopped(s->options.stopped_self)) {
            status = STATUS_STOPPED;
            break;
        }
        s->depth--;
        memcpy(box, s->stack + s->depth * s->size, (size_t)s->size * sizeof *box);
        const double share = s->share[s->depth];
        s->result.boxes++;
        if (prune(s, box)) {
            s->done += share;
            if (s->options.progress != NULL) {
                s->options.progress(s->options.progress_self, "proving that no state was missed",
                                    s->done);
            }
        } else if (!split(s, box, share)) {
            return STATUS_MEMORY;
        }
    }
    for (; s->depth > 0; s->depth--) {
        leave_undecided(s, s->stack + (s->depth - 1) * s->size);
    }
    s->result.complete = s->result.undecided == 0;
    return s->memory_short ? STATUS_MEMORY : status;
}

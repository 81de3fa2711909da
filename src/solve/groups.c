/*
 * groups.c: which devices of a cell are alike.
 */
#include "solve/groups.h"

#include <stdint.h>
#include <string.h>

/* Classes beyond the limit stay single. A device that only multiplies is not worth a vector of two.
 */
enum { CLASS_LIMIT = 1024, LINEAR_LEAST = 4, LEAST = 2 };

#ifdef WITH_LANES

extern const struct groups_kind groups_kind_8, groups_kind_4;

static const struct groups_kind *find_kind(void)
{
    return groups_kind_8.is_supported()   ? &groups_kind_8
           : groups_kind_4.is_supported() ? &groups_kind_4
                                          : NULL;
}

#else

static const struct groups_kind *find_kind(void)
{
    return NULL;
}

#endif

static size_t vector_size(const struct groups *g)
{
    return (size_t)g->kind->width * sizeof(double);
}

/* Of a class: its vectors and its block, in whole vectors. */
static size_t block_size(const struct groups *g, size_t prepared_size)
{
    const size_t unit = vector_size(g);
    return GROUP_MOVED * unit + (prepared_size + unit - 1) / unit * unit;
}

static void *aligned(const struct groups *g, char *memory)
{
    const size_t over = (size_t)((uintptr_t)memory % vector_size(g));
    return over == 0 ? memory : memory + (vector_size(g) - over);
}

struct groups *groups_create(struct system *s)
{
    const struct groups_kind *kind = find_kind();
    const struct circuit *c = s->circuit;
    const size_t count = (size_t)c->instance_count;
    struct groups *g = kind == NULL || count < LEAST ? NULL : arena_new(s->arena, struct groups);
    if (g == NULL) {
        return NULL;
    }
    *g = (struct groups){.kind = kind, .system = s};
    size_t largest = 0;
    for (size_t k = 0; k < count; k++) {
        const struct instance *instance = &c->instances[k];
        const size_t size = instance->type->prepared_size;
        largest = size > largest ? size : largest;
        g->longest = instance->local_count > g->longest ? instance->local_count : g->longest;
    }
    const size_t classes = count < CLASS_LIMIT ? count : CLASS_LIMIT, groups = count / LEAST;
    g->classes = arena_new_array(s->arena, struct group_class, classes);
    for (g->table_size = 8; g->table_size < 2 * classes; g->table_size *= 2) {
    }
    g->table = arena_new_array(s->arena, int, g->table_size);
    g->masked = arena_array(s->arena, largest + 1, 1);
    g->groups = arena_new_array(s->arena, struct group, groups);
    g->moved = arena_new_array(s->arena, double, groups *GROUP_MOVED *(size_t)kind->width);
    g->at = arena_new_array(s->arena, int, groups *(size_t)g->longest *(size_t)kind->width);
    g->group_of = arena_new_array(s->arena, int, count);
    g->singles = arena_new_array(s->arena, int, count);
    char *blocks = arena_array(s->arena, classes + 1, block_size(g, largest));
    if (g->classes == NULL || g->table == NULL || g->masked == NULL || g->groups == NULL ||
        g->moved == NULL || g->at == NULL || g->group_of == NULL || g->singles == NULL ||
        blocks == NULL) {
        return NULL;
    }
    g->blocks = aligned(g, blocks);
    return g;
}

/* The block of an instance without what mismatch moves, into g->masked. */
static void mask(struct groups *g, int k, const size_t *moved, int count)
{
    memcpy(g->masked, system_block(g->system, k),
           g->system->circuit->instances[k].type->prepared_size);
    for (int d = 0; d < count; d++) {
        memset(g->masked + moved[d], 0, sizeof(double));
    }
}

static char *block_of(const struct groups *g, const struct group_class *class)
{
    return (char *)class->block + GROUP_MOVED * vector_size(g);
}

/* FNV-1a (Fowler, Noll and Vo), over words. */
static uint64_t hash(const struct device_type *type, const char *block)
{
    uint64_t h = 14695981039346656037u ^ (uint64_t)(uintptr_t)type->evaluate;
    for (size_t k = 0; k + sizeof(uint64_t) <= type->prepared_size; k += sizeof(uint64_t)) {
        uint64_t word;
        memcpy(&word, block + k, sizeof word);
        h = (h ^ word) * 1099511628211u;
        h ^= h >> 29;
    }
    return h;
}

/* The class of an instance, made when it is new; -1: none. */
static int class_of(struct groups *g, int k, char **room)
{
    const struct instance *instance = &g->system->circuit->instances[k];
    const struct device_type *type = instance->type;
    const size_t *moved;
    const int moved_count = g->kind->moved(type, &moved);
    if (moved_count < 0) {
        return -1;
    }
    mask(g, k, moved, moved_count);
    size_t slot = (size_t)hash(type, g->masked) & (g->table_size - 1);
    for (; g->table[slot] > 0; slot = (slot + 1) & (g->table_size - 1)) {
        const struct group_class *class = &g->classes[g->table[slot] - 1];
        if (class->type == type &&
            memcmp(block_of(g, class), g->masked, type->prepared_size) == 0) {
            return g->table[slot] - 1;
        }
    }
    if (g->class_count == CLASS_LIMIT) {
        return -1;
    }
    struct group_class *class = &g->classes[g->class_count];
    *class = (struct group_class){.type = type,
                                  .moved = moved,
                                  .moved_count = moved_count,
                                  .block = *room,
                                  .local_count = instance->local_count,
                                  .open = -1};
    *room += block_size(g, type->prepared_size);
    memcpy(block_of(g, class), g->masked, type->prepared_size);
    g->table[slot] = ++g->class_count;
    return g->class_count - 1;
}

static void copy_moved(struct groups *g, const struct group *group, int lane)
{
    const struct group_class *class = &g->classes[group->class];
    const char *block = system_block(g->system, group->members[lane]);
    double *moved = g->moved + (group - g->groups) * GROUP_MOVED * g->kind->width;
    for (int d = 0; d < class->moved_count; d++) {
        memcpy(&moved[d * g->kind->width + lane], block + class->moved[d], sizeof *moved);
    }
}

/* Puts an instance into the open group of its class. */
static void join(struct groups *g, int k, int number)
{
    struct group_class *class = &g->classes[number];
    const int *local = g->system->circuit->instances[k].local;
    const int width = g->kind->width;
    if (class->open < 0) {
        class->open = g->group_count++;
        g->groups[class->open] = (struct group){.class = number};
        memset(g->at + (ptrdiff_t) class->open * g->longest * width, -1,
               (size_t)g->longest * (size_t)width * sizeof *g->at);
    }
    struct group *group = &g->groups[class->open];
    const int lane = group->count++;
    int *at = g->at + (ptrdiff_t) class->open * g->longest * width;
    group->members[lane] = k;
    for (int l = 0; l < class->local_count; l++) {
        at[l * width + lane] = local[l];
    }
    copy_moved(g, group, lane);
    g->group_of[k] = class->open;
    if (group->count == width) {
        class->open = -1;
    }
}

static int least_members(const struct groups *g, const struct group_class *class)
{
    const int most = g->kind->width / 2;
    return class->type->longest_step != NULL || most < LINEAR_LEAST ? LEAST : most;
}

void groups_make(struct groups *g)
{
    const int count = g->system->circuit->instance_count;
    char *room = g->blocks;
    g->class_count = g->group_count = g->single_count = g->left_out_count = 0;
    memset(g->table, 0, g->table_size * sizeof *g->table);
    for (int k = 0; k < count; k++) {
        g->group_of[k] = class_of(g, k, &room);
        if (g->group_of[k] >= 0) {
            g->classes[g->group_of[k]].members++;
        }
    }
    for (int k = 0; k < count; k++) {
        struct group_class *class = g->group_of[k] < 0 ? NULL : &g->classes[g->group_of[k]];
        /* what is left of a class for its last vector may be too little for one */
        if (class == NULL || (class->open < 0 && class->members < least_members(g, class))) {
            g->singles[g->single_count++] = k;
            g->group_of[k] = -1;
        } else {
            class->members--;
            join(g, k, g->group_of[k]);
        }
    }
}

void groups_update(struct groups *g, int k)
{
    if (g->group_of[k] < 0) {
        return;
    }
    struct group *group = &g->groups[g->group_of[k]];
    const struct group_class *class = &g->classes[group->class];
    int lane = 0;
    while (group->members[lane] != k) {
        lane++;
    }
    mask(g, k, class->moved, class->moved_count);
    const bool is_like = memcmp(block_of(g, class), g->masked, class->type->prepared_size) == 0;
    const unsigned bit = 1u << lane;
    g->left_out_count += !is_like - ((group->left_out & bit) != 0);
    group->left_out = is_like ? group->left_out & ~bit : group->left_out | bit;
    copy_moved(g, group, lane);
}

bool groups_left_out(const struct groups *g, int k)
{
    if (g->group_of[k] < 0) {
        return false;
    }
    const struct group *group = &g->groups[g->group_of[k]];
    int lane = 0;
    while (group->members[lane] != k) {
        lane++;
    }
    return (group->left_out >> lane & 1) != 0;
}

void groups_evaluate(const struct groups *g, const double *x, double *f, double *scale,
                     double *values)
{
    const ptrdiff_t width = g->kind->width;
    for (int k = 0; k < g->group_count; k++) {
        const struct group *group = &g->groups[k];
        g->kind->evaluate(g->system, &g->classes[group->class], group,
                          g->at + k * g->longest * width, g->moved + k * GROUP_MOVED * width, x, f,
                          scale, values);
    }
}

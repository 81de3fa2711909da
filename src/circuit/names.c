/*
 * names.c: an open-addressing hash table of names, kept less than half full.
 */
#include "circuit/names.h"

#include <stdint.h>
#include <string.h>

struct slot {
    const char *name;
    enum name_sort sort;
    int index;
};

/* Names of one sort as they came. */
struct order {
    const char **list;
    int count, capacity;
};

struct names {
    struct arena *arena;
    struct slot *slots; /* [size] in hash order; name NULL: free */
    size_t size, count;
    struct order orders[NAME_SORT_COUNT];
};

enum { FIRST_SIZE = 64 };

struct names *names_create(struct arena *arena)
{
    struct names *names = arena_new(arena, struct names);
    if (names == NULL) {
        return NULL;
    }
    names->arena = arena;
    names->size = FIRST_SIZE;
    names->slots = arena_new_array(arena, struct slot, FIRST_SIZE);
    return names->slots == NULL ? NULL : names;
}

/* FNV-1a (Fowler, Noll and Vo), with the sort mixed in. */
static uint64_t hash(enum name_sort sort, const char *name)
{
    uint64_t h = 14695981039346656037u ^ (uint64_t)sort;
    for (const char *c = name; *c != '\0'; c++) {
        h = (h ^ (uint8_t)*c) * 1099511628211u;
    }
    return h ^ (h >> 29);
}

static struct slot *place(struct slot *slots, size_t size, enum name_sort sort, const char *name)
{
    size_t k = (size_t)hash(sort, name) & (size - 1);
    while (slots[k].name != NULL && (slots[k].sort != sort || strcmp(slots[k].name, name) != 0)) {
        k = (k + 1) & (size - 1);
    }
    return &slots[k];
}

int names_find(const struct names *names, enum name_sort sort, const char *name)
{
    const struct slot *slot = place(names->slots, names->size, sort, name);
    return slot->name == NULL ? -1 : slot->index;
}

static bool widen(struct names *names)
{
    const size_t size = names->size * 2;
    struct slot *slots = arena_new_array(names->arena, struct slot, size);
    if (slots == NULL) {
        return false;
    }
    for (size_t k = 0; k < names->size; k++) {
        const struct slot *old = &names->slots[k];
        if (old->name != NULL) {
            *place(slots, size, old->sort, old->name) = *old;
        }
    }
    arena_give_back(names->arena, names->slots);
    names->slots = slots;
    names->size = size;
    return true;
}

bool names_add(struct names *names, enum name_sort sort, const char *name, int index)
{
    if (2 * (names->count + 1) > names->size && !widen(names)) {
        return false;
    }
    struct order *order = &names->orders[sort];
    const char **list =
        arena_grow(names->arena, order->list, order->count, &order->capacity, sizeof *list);
    if (list == NULL) {
        return false;
    }
    if (list != order->list) {
        arena_give_back(names->arena, order->list);
    }
    order->list = list;
    list[order->count++] = name;
    names->count++;
    *place(names->slots, names->size, sort, name) = (struct slot){name, sort, index};
    return true;
}

int names_list(const struct names *names, enum name_sort sort, const char **list, int limit)
{
    const struct order *order = &names->orders[sort];
    const int count = order->count < limit ? order->count : limit;
    for (int k = 0; k < count; k++) {
        list[k] = order->list[k];
    }
    return count;
}

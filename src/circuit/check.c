/*
 * check.c: the structure of a circuit before any numbers: nodes that touch nothing else, nodes
 * without a DC path to ground, loops of voltage sources, nodes fed only by current sources, names
 * that differ only in case.
 *
 * Paths are followed with a union-find forest (Tarjan 1975), so that large cells stay linear.
 */
#include "circuit/build.h"

#include <ctype.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { TOUCH_SHOWN = 4 };

static int compare_folded(const char *a, const char *b)
{
    for (; *a != '\0' && tolower((unsigned char)*a) == tolower((unsigned char)*b); a++, b++) {
    }
    return tolower((unsigned char)*a) - tolower((unsigned char)*b);
}

static int find_root(int *parent, int k)
{
    while (parent[k] != k) {
        parent[k] = parent[parent[k]];
        k = parent[k];
    }
    return k;
}

/* Joins two trees; false when they were one already. */
static bool unite(int *parent, int a, int b)
{
    a = find_root(parent, a);
    b = find_root(parent, b);
    parent[a > b ? a : b] = a > b ? b : a;
    return a != b;
}

/* What a hidden voltage source stands for. */
static const char *holder_word(const struct circuit *c, int instance)
{
    for (int k = 0; k < c->output_count; k++) {
        if (c->outputs[k].instance == instance) {
            return "the output";
        }
    }
    return "the rail";
}

/* "d of M1 and g of M2", at most TOUCH_SHOWN of them. */
static const char *touching(struct builder *b, int node)
{
    const struct circuit *c = b->circuit;
    struct buffer text = BUFFER_EMPTY;
    int count = 0;
    for (int k = 0; k < c->instance_count; k++) {
        const struct instance *instance = &c->instances[k];
        for (int t = 0; t < instance->type->terminal_count; t++) {
            if (instance->outer[t] != node_unknown(node) || instance->parent >= 0) {
                continue;
            }
            if (count < TOUCH_SHOWN) {
                const char *between = count == 0 ? "" : ", ";
                if (instance->is_hidden) {
                    buffer_format(&text, "%s%s", between, holder_word(c, k));
                } else if (instance->type->form == FORM_ARROW) {
                    buffer_format(&text, "%s%s", between, instance->name);
                } else {
                    buffer_format(&text, "%s%s of %s", between, instance->type->terminals[t].name,
                                  instance->name);
                }
            }
            count++;
        }
    }
    if (count > TOUCH_SHOWN) {
        buffer_format(&text, " and %d more", count - TOUCH_SHOWN);
    }
    const char *kept = arena_copy(b->arena, text.length == 0 ? "nothing" : text.data,
                                  text.length == 0 ? 7 : text.length);
    buffer_free(&text);
    return kept == NULL ? "" : kept;
}

/* How often each node is touched; law inputs and outputs count. */
static void count_touches(const struct circuit *c, int *touches)
{
    for (int k = 0; k < c->instance_count; k++) {
        const struct instance *instance = &c->instances[k];
        const int nodes = instance->local_count - instance->type->branch_count;
        for (int l = 0; l < nodes; l++) {
            const bool is_terminal = l < instance->type->terminal_count;
            const int unknown = is_terminal ? instance->outer[l] : instance->local[l];
            touches[unknown + 1]++;
            if (is_terminal && instance->local[l] != unknown) {
                touches[instance->local[l] + 1]++;
            }
        }
    }
}

static const char *near_node(struct builder *b, const int *touches, int n, int least_touches)
{
    const struct circuit *c = b->circuit;
    int count = 0;
    for (int k = 0; k < c->node_count && count < LIST_LIMIT; k++) {
        if (k != n && (touches[k] >= least_touches || k == 0) && !c->nodes[k].is_hidden) {
            b->known[count++] = c->nodes[k].name;
        }
    }
    return near_name(c->nodes[n].name, b->known, count);
}

static void check_lonely(struct builder *b, const int *touches)
{
    const struct circuit *c = b->circuit;
    for (int n = 1; n < c->node_count; n++) {
        if (touches[n] != 1 || c->nodes[n].is_hidden) {
            continue;
        }
        /* A node that others touch is the likelier one; else another lonely one. */
        const char *near = near_node(b, touches, n, 2);
        near = near != NULL ? near : near_node(b, touches, n, 1);
        if (names_find(c->names, NAME_RAIL, c->nodes[n].name) >= 0) {
            diagnostics_add(b->diagnostics, c->nodes[n].where,
                            near == NULL ? NULL
                                         : arena_format(b->arena, "did you mean '%s'?", near),
                            "rail '%s' feeds nothing", c->nodes[n].name);
            continue;
        }
        diagnostics_add(b->diagnostics, c->nodes[n].where,
                        near == NULL ? arena_format(b->arena, "only %s touches it", touching(b, n))
                                     : arena_format(b->arena, "did you mean '%s'?", near),
                        "no node called '%s' is connected to anything else", c->nodes[n].name);
    }
}

/* Whether only current sources (and terminals that carry no current) touch the nodes of a tree. */
static bool fed_by_current(const struct circuit *c, int *parent, int root)
{
    bool found = false;
    for (int k = 0; k < c->instance_count; k++) {
        const struct instance *instance = &c->instances[k];
        for (int t = 0; t < instance->type->terminal_count; t++) {
            if (find_root(parent, instance->outer[t] + 1) == root) {
                found |= instance->type->is_current_source;
            }
        }
    }
    return found;
}

static void report_island(struct builder *b, int *parent, int root)
{
    const struct circuit *c = b->circuit;
    struct buffer names = BUFFER_EMPTY;
    int first = -1, count = 0;
    for (int n = 1; n < c->node_count; n++) {
        if (find_root(parent, n) == root && !c->nodes[n].is_hidden) {
            first = first < 0 ? n : first;
            if (count < TOUCH_SHOWN) {
                buffer_format(&names, "%s'%s'", count == 0 ? "" : ", ", c->nodes[n].name);
            }
            count++;
        }
    }
    if (count > TOUCH_SHOWN) {
        buffer_format(&names, " and %d more", count - TOUCH_SHOWN);
    }
    if (first >= 0 && names.data != NULL) {
        const char *what = count == 1 ? "node" : "nodes";
        if (fed_by_current(c, parent, root)) {
            diagnostics_add(b->diagnostics, c->nodes[first].where,
                            arena_format(b->arena, "touched by %s", touching(b, first)),
                            "%s %s %s fed only by current sources: nothing sets the voltage", what,
                            names.data, count == 1 ? "is" : "are");
        } else {
            const bool is_ground = compare_folded(c->nodes[first].name, "gnd") == 0;
            diagnostics_add(b->diagnostics, c->nodes[first].where,
                            is_ground ? "did you mean 'gnd'?"
                                      : arena_format(b->arena, "touched by %s", touching(b, first)),
                            "%s %s %s no DC path to gnd", what, names.data,
                            count == 1 ? "has" : "have");
        }
    }
    buffer_free(&names);
}

static const uint32_t path_to_ground = (uint32_t)1 << 31;

/* Joins what a device joins inside. */
static void join_paths(const struct instance *instance, int *parent)
{
    const struct device_type *type = instance->type;
    if (type->is_current_source || type->paths == NULL) {
        return;
    }
    for (int t = 0; t < type->terminal_count; t++) {
        const int node = instance->local[t] + 1;
        if ((type->paths[t] & path_to_ground) != 0) {
            unite(parent, node, 0);
        }
        for (int s = 0; s < t; s++) {
            if ((type->paths[t] & type->paths[s] & ~path_to_ground) != 0) {
                unite(parent, node, instance->local[s] + 1);
            }
        }
    }
}

static void check_paths(struct builder *b, int *parent, const int *touches)
{
    const struct circuit *c = b->circuit;
    for (int n = 0; n < c->node_count; n++) {
        parent[n] = n;
    }
    for (int k = 0; k < c->instance_count; k++) {
        join_paths(&c->instances[k], parent);
    }
    for (int n = 1; n < c->node_count; n++) {
        /* A lonely node was reported already. */
        if (find_root(parent, n) == n && touches[n] != 1) {
            report_island(b, parent, n);
        }
    }
}

static void voltage_ends(const struct instance *instance, int *a, int *z)
{
    const bool to_ground = instance->type->form == FORM_PINS; /* an opamp output against gnd */
    *a = instance->outer[0] + 1;
    *z = to_ground ? 0 : instance->outer[1] + 1;
}

/* "V1", "the rail vdd", "the output tail". */
static const char *source_name(struct builder *b, int k)
{
    const struct instance *instance = &b->circuit->instances[k];
    const char *name =
        instance->is_hidden
            ? arena_format(b->arena, "%s %s", holder_word(b->circuit, k), instance->name)
            : instance->name;
    return name == NULL ? "" : name;
}

/* Names of the voltage-defined devices on the way from a to z, found by widening from a. */
static const char *loop_names(struct builder *b, int closing, int a, int z)
{
    const struct circuit *c = b->circuit;
    int *from = arena_new_array(b->arena, int, c->node_count);
    if (from == NULL) {
        return "";
    }
    for (int n = 0; n < c->node_count; n++) {
        from[n] = -1;
    }
    bool moved = true;
    from[a] = closing;
    while (moved && from[z] < 0) {
        moved = false;
        for (int k = 0; k < closing; k++) {
            int p, q;
            if (!c->instances[k].type->fixes_voltage) {
                continue;
            }
            voltage_ends(&c->instances[k], &p, &q);
            if ((from[p] >= 0) != (from[q] >= 0)) {
                from[from[p] >= 0 ? q : p] = k;
                moved = true;
            }
        }
    }
    struct buffer text = BUFFER_EMPTY;
    int count = 0;
    for (int n = z; n != a && from[n] >= 0 && count < 6; count++) {
        int p, q;
        buffer_format(&text, "%s%s", count == 0 ? "" : ", ", source_name(b, from[n]));
        voltage_ends(&c->instances[from[n]], &p, &q);
        n = n == p ? q : p;
    }
    const char *kept = text.data == NULL ? "" : arena_copy(b->arena, text.data, text.length);
    buffer_free(&text);
    return kept == NULL ? "" : kept;
}

static void check_loops(struct builder *b, int *parent)
{
    const struct circuit *c = b->circuit;
    for (int n = 0; n < c->node_count; n++) {
        parent[n] = n;
    }
    for (int k = 0; k < c->instance_count; k++) {
        const struct instance *instance = &c->instances[k];
        int a, z;
        if (!instance->type->fixes_voltage) {
            continue;
        }
        voltage_ends(instance, &a, &z);
        if (a == z) {
            diagnostics_add(b->diagnostics, instance->where, NULL,
                            "%s joins a node to itself and cannot hold a voltage", instance->name);
        } else if (!unite(parent, a, z)) {
            diagnostics_add(b->diagnostics, instance->where,
                            "remove one of them, or put a resistor between",
                            "%s closes a loop of things that fix a voltage, with %s",
                            source_name(b, k), loop_names(b, k, a, z));
        }
    }
}

/* --- a part called like a rail or an output: 'v.i' and a sweep of 'v' would mean either ------- */

static void check_shared_names(struct builder *b)
{
    const struct circuit *c = b->circuit;
    for (int k = 0; k < c->instance_count; k++) {
        const struct instance *instance = &c->instances[k];
        const bool is_rail = names_find(c->names, NAME_RAIL, instance->name) >= 0;
        if (!instance->is_hidden &&
            (is_rail || names_find(c->names, NAME_OUTPUT, instance->name) >= 0)) {
            diagnostics_add(b->diagnostics, instance->where, "give it another name",
                            "there are two things called '%s': this and %s", instance->name,
                            is_rail ? "a rail" : "an output");
        }
    }
}

/* --- names that differ only in case --------------------------------------------------------- */

struct cased {
    const char *name;
    struct span where;
    int order;
};

static int by_folded_name(const void *a, const void *b)
{
    const struct cased *x = a, *y = b;
    const int order = compare_folded(x->name, y->name);
    return order != 0 ? order : (x->order > y->order) - (x->order < y->order);
}

static bool check_case(struct builder *b)
{
    struct circuit *c = b->circuit;
    const int most = c->node_count + c->instance_count + c->let_count;
    struct cased *list = arena_new_array(b->arena, struct cased, most);
    if (list == NULL) {
        return false;
    }
    int count = 0;
    for (int n = 0; n < c->node_count; n++) { /* gnd, too: 'GND' is another node */
        if (!c->nodes[n].is_hidden) {
            list[count] = (struct cased){c->nodes[n].name, c->nodes[n].where, count};
            count++;
        }
    }
    for (int k = 0; k < c->instance_count; k++) {
        if (!c->instances[k].is_hidden) {
            list[count] = (struct cased){c->instances[k].name, c->instances[k].where, count};
            count++;
        }
    }
    for (int k = 0; k < c->let_count; k++) {
        list[count] = (struct cased){c->lets[k].name, c->lets[k].where, count};
        count++;
    }
    qsort(list, (size_t)count, sizeof *list, by_folded_name);
    for (int k = 1; k < count; k++) {
        if (compare_folded(list[k - 1].name, list[k].name) == 0 &&
            strcmp(list[k - 1].name, list[k].name) != 0 &&
            !caution_add(c, &c->cautions, CAUTION_CASE_NAMES, list[k].name,
                         source_line(&c->cell->sources, list[k].where),
                         "'%s' and '%s' differ only in case", list[k - 1].name, list[k].name)) {
            return false;
        }
    }
    arena_give_back(b->arena, list);
    return true;
}

bool build_checks(struct builder *b)
{
    check_shared_names(b);
    struct circuit *c = b->circuit;
    int *touches = arena_new_array(b->arena, int, c->node_count);
    int *parent = arena_new_array(b->arena, int, c->node_count);
    if (touches == NULL || parent == NULL) {
        return false;
    }
    count_touches(c, touches);
    check_lonely(b, touches);
    check_paths(b, parent, touches);
    check_loops(b, parent);
    arena_give_back(b->arena, touches);
    arena_give_back(b->arena, parent);
    return check_case(b);
}

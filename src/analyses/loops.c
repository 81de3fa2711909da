/* loops.c: loops with a positive sign, by walking the graph of control. */
#include "analyses/loops.h"

#include <string.h>

#include "devices/bipolar.h"
#include "devices/jfet.h"
#include "devices/law.h"
#include "devices/mos.h"
#include "devices/opamp.h"

enum { STEP_LIMIT = 20000, DEPTH_LIMIT = 24 };

/* What of an edge can make a loop hold two states. One transistor alone never can (Nielsen and
 * Willson): the counts of a loop must add up to two, and not all may be followers, which have no
 * voltage gain. */
enum gain { GAIN_NONE, GAIN_FOLLOWER, GAIN_TRANSISTOR, GAIN_AMPLIFIER };
static const int gain_count[] = {0, 1, 1, 2};
enum { GAIN_COUNT_LEAST = 2 };

struct edge {
    int from, to, sign;
    enum gain gain;
    int instance;
};

struct graph {
    struct arena *arena;
    const struct network_map *map;
    struct edge *edges;
    int count, capacity;
    int instance; /* whose edges are being added */
    bool failed;
};

static void add_edge(struct graph *g, int from, int to, int sign, enum gain gain)
{
    if (from < 0 || to < 0) {
        return;
    }
    const int a = g->map->group[from], b = g->map->group[to];
    if (a < 0 || b < 0 || a == b) {
        return;
    }
    struct edge *grown = arena_grow(g->arena, g->edges, g->count, &g->capacity, sizeof *grown);
    if (grown == NULL) {
        g->failed = true;
        return;
    }
    g->edges = grown;
    g->edges[g->count++] = (struct edge){a, b, sign, gain, g->instance};
}

/* A transistor: control, the end that follows it, the end that moves against it. */
static void add_transistor(struct graph *g, int control, int follower, int collector)
{
    add_edge(g, control, collector, -1, GAIN_TRANSISTOR);
    add_edge(g, control, follower, 1, GAIN_FOLLOWER);
    add_edge(g, follower, collector, 1, GAIN_TRANSISTOR);
}

static void add_instance(struct graph *g, const struct instance *instance)
{
    const struct device_type *type = instance->type;
    const int *at = instance->local;
    if (type->evaluate == mos_evaluate) {
        add_transistor(g, at[MOS_G], at[MOS_S], at[MOS_D]);
    } else if (type->evaluate == bipolar_evaluate) {
        add_transistor(g, at[BIPOLAR_B], at[BIPOLAR_E], at[BIPOLAR_C]);
        add_edge(g, at[BIPOLAR_E], at[BIPOLAR_B], 1, GAIN_NONE);
    } else if (type->evaluate == jfet_evaluate) {
        add_transistor(g, at[JFET_G], at[JFET_S], at[JFET_D]);
    } else if (type->evaluate == opamp_evaluate) {
        add_edge(g, at[OPAMP_PLUS], at[OPAMP_OUT], 1, GAIN_AMPLIFIER);
        add_edge(g, at[OPAMP_MINUS], at[OPAMP_OUT], -1, GAIN_AMPLIFIER);
    } else if (type->evaluate == law_evaluate) {
        for (int k = 2; k < instance->local_count; k++) {
            for (int end = 0; end < 2; end++) { /* either sign is possible */
                add_edge(g, at[k], at[end], 1, GAIN_AMPLIFIER);
                add_edge(g, at[k], at[end], -1, GAIN_AMPLIFIER);
            }
        }
        add_edge(g, at[0], at[1], 1, GAIN_NONE);
        add_edge(g, at[1], at[0], 1, GAIN_NONE);
    } else if (type->terminal_count == 2 && !type->is_current_source) {
        add_edge(g, at[0], at[1], 1, GAIN_NONE);
        add_edge(g, at[1], at[0], 1, GAIN_NONE);
    }
}

/* A walk without repeated nodes from `start` back to it. */
struct walk {
    const struct graph *graph;
    int start, steps;
    int path[DEPTH_LIMIT]; /* edges */
    bool *on_path;         /* [groups] */
    int *hits;             /* [groups] positive loops through each */
    int best[DEPTH_LIMIT]; /* the shortest positive loop */
    int best_length;
    bool cut;
};

static void note_loop(struct walk *w, int length)
{
    const struct edge *edges = w->graph->edges;
    int sign = 1, count = 0;
    bool has_gain = false;
    for (int k = 0; k < length; k++) {
        const struct edge *edge = &edges[w->path[k]];
        sign *= edge->sign;
        count += gain_count[edge->gain];
        has_gain = has_gain || edge->gain > GAIN_FOLLOWER;
    }
    if (sign < 0 || !has_gain || count < GAIN_COUNT_LEAST) {
        return;
    }
    for (int k = 0; k < length; k++) {
        w->hits[edges[w->path[k]].from]++;
    }
    if (w->best_length == 0 || length < w->best_length) {
        w->best_length = length;
        memcpy(w->best, w->path, (size_t)length * sizeof w->path[0]);
    }
}

/* A device is passed once: base to emitter and on to the collector is not what base to collector
 * is.
 */
static bool is_used(const struct walk *w, int depth, int instance)
{
    for (int k = 0; k < depth; k++) {
        if (w->graph->edges[w->path[k]].instance == instance) {
            return true;
        }
    }
    return false;
}

/* Depth first without recursion: next[] is the edge to try at each depth. Only loops whose lowest
 * group is `start`, so that each is met once. */
static void walk_from(struct walk *w, int start)
{
    const struct graph *g = w->graph;
    int next[DEPTH_LIMIT] = {0}, at[DEPTH_LIMIT + 1], depth = 0;
    at[0] = start;
    w->on_path[start] = true;
    while (depth >= 0) {
        if (next[depth] == g->count || ++w->steps > STEP_LIMIT) {
            w->cut = w->cut || w->steps > STEP_LIMIT;
            w->on_path[at[depth]] = false;
            depth--;
            continue;
        }
        const int k = next[depth]++;
        const struct edge *edge = &g->edges[k];
        if (edge->from != at[depth] || edge->to < start || is_used(w, depth, edge->instance)) {
            continue;
        }
        w->path[depth] = k;
        if (edge->to == start) {
            note_loop(w, depth + 1);
        } else if (!w->on_path[edge->to]) {
            if (depth + 1 == DEPTH_LIMIT) {
                w->cut = true;
                continue;
            }
            depth++;
            at[depth] = edge->to;
            next[depth] = 0;
            w->on_path[edge->to] = true;
        }
    }
}

static const char *path_text(struct arena *arena, const struct system *s,
                             const struct network_map *map, const struct walk *w)
{
    struct buffer text = BUFFER_EMPTY;
    for (int k = 0; k <= w->best_length; k++) {
        const int group = w->graph->edges[w->best[k % w->best_length]].from;
        const struct node *node = &s->circuit->nodes[map->node[group] + 1];
        if (!node->is_hidden) {
            buffer_format(&text, "%s%s", text.length == 0 ? "" : " -> ", node->name);
        }
    }
    const char *kept =
        text.failed || text.data == NULL ? NULL : arena_copy(arena, text.data, text.length);
    buffer_free(&text);
    return kept;
}

bool loops_find(struct arena *arena, const struct system *s, const struct network_map *map,
                struct loop *loop)
{
    const int groups = map->network->node_count;
    struct graph g = {.arena = arena, .map = map};
    *loop = (struct loop){.probe = -1};
    for (int k = 0; k < s->circuit->instance_count; k++) {
        g.instance = k;
        add_instance(&g, &s->circuit->instances[k]);
    }
    struct walk w = {.graph = &g,
                     .on_path = arena_new_array(arena, bool, groups),
                     .hits = arena_new_array(arena, int, groups)};
    if (g.failed || w.on_path == NULL || w.hits == NULL) {
        return false;
    }
    for (int start = 0; start < groups && !w.cut; start++) {
        walk_from(&w, start);
    }
    loop->unsure = w.cut;
    loop->found = w.best_length > 0;
    if (!loop->found) {
        return true;
    }
    loop->path = path_text(arena, s, map, &w);
    loop->nodes = arena_new_array(arena, int, w.best_length);
    if (loop->path == NULL || loop->nodes == NULL) {
        return false;
    }
    int most = 0;
    for (int k = 0; k < w.best_length; k++) {
        const int group = g.edges[w.best[k]].from;
        const bool is_hidden = s->circuit->nodes[map->node[group] + 1].is_hidden;
        loop->nodes[loop->node_count++] = map->node[group];
        if (!map->driven[group] && !is_hidden && w.hits[group] > most) {
            most = w.hits[group];
            loop->probe = map->node[group];
        }
    }
    return true;
}

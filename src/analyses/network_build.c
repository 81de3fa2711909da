/* network_build.c: groups of nodes, then the elements of each device. */
#include "analyses/network_build.h"

#include <string.h>

#include "analyses/network_law.h"
#include "devices/bipolar.h"
#include "devices/curve.h"
#include "devices/diode.h"
#include "devices/jfet.h"
#include "devices/law.h"
#include "devices/linear.h"
#include "devices/mos.h"
#include "devices/opamp.h"
#include "devices/series_prepared.h"

struct builder {
    struct arena *arena;
    const struct system *system;
    struct network_map *map;
    int *held; /* instances that hold a voltage */
    int held_count;
    bool failed;
};

/* --- groups -------------------------------------------------------------------------------------
 */

/* The voltage that an instance holds between its first two terminals; false when it holds none. */
static bool held_voltage(const struct system *s, int k, double *volts)
{
    const struct device_type *type = s->circuit->instances[k].type;
    const void *block = system_block(s, k);
    if (type->evaluate == voltage_evaluate) {
        *volts = ((const struct linear_prepared *)block)->value;
        return true;
    }
    *volts = 0;
    return type->evaluate == series_evaluate &&
           !(((const struct series_prepared *)block)->resistance > 0);
}

/*
 * Walks from the start node over held voltages and gives every node on the way its shift. `start`
 * -1 is gnd.
 */
static void spread_group(struct builder *b, int start, int group, int *parent)
{
    const struct system *s = b->system;
    struct network_map *map = b->map;
    bool again = true;
    if (start >= 0) {
        parent[start] = group;
        map->shift[start] = interval_point(0);
    }
    while (again) {
        again = false;
        for (int i = 0; i < b->held_count; i++) {
            const int *local = s->circuit->instances[b->held[i]].local;
            double volts = 0;
            held_voltage(s, b->held[i], &volts);
            for (int end = 0; end < 2; end++) {
                const int from = local[end], to = local[1 - end];
                const bool is_in = from < 0 ? group == -1 : parent[from] == group;
                if (!is_in || to < 0 || parent[to] != -2) {
                    continue;
                }
                const struct interval base = from < 0 ? interval_point(0) : map->shift[from];
                const struct interval step = interval_point(end == 0 ? -volts : volts);
                parent[to] = group;
                map->shift[to] = interval_add(base, step);
                again = true;
            }
        }
    }
}

static bool find_groups(struct builder *b, int *count)
{
    const struct system *s = b->system;
    struct network_map *map = b->map;
    map->group = arena_new_array(b->arena, int, s->node_count);
    map->shift = arena_new_array(b->arena, struct interval, s->node_count);
    map->node = arena_new_array(b->arena, int, s->node_count);
    map->driven = arena_new_array(b->arena, bool, s->node_count);
    if (map->group == NULL || map->shift == NULL || map->node == NULL || map->driven == NULL) {
        return false;
    }
    b->held = arena_new_array(b->arena, int, s->circuit->instance_count);
    if (b->held == NULL) {
        return false;
    }
    for (int k = 0; k < s->circuit->instance_count; k++) {
        double volts;
        if (held_voltage(s, k, &volts)) {
            b->held[b->held_count++] = k;
        }
    }
    for (int k = 0; k < s->node_count; k++) {
        map->group[k] = -2;
    }
    spread_group(b, -1, -1, map->group);
    *count = 0;
    for (int k = 0; k < s->node_count; k++) {
        if (map->group[k] == -2) {
            map->node[*count] = k;
            spread_group(b, k, (*count)++, map->group);
        }
    }
    return true;
}

/* --- rows and arguments ----------------------------------------------------------------------- */

static int row_of(const struct builder *b, int node)
{
    return node < 0 ? -1 : b->map->group[node];
}

/* The row that takes currents: none where an amplifier drives. */
static int current_row(const struct builder *b, int node)
{
    const int row = row_of(b, node);
    return row >= 0 && b->map->driven[row] ? -1 : row;
}

static struct argument node_argument(const struct builder *b, int node)
{
    return node < 0 ? network_node(-1, interval_point(0))
                    : network_node(row_of(b, node), b->map->shift[node]);
}

static struct argument difference(struct builder *b, int plus, int minus)
{
    struct argument out;
    if (!network_difference(b->map->network, node_argument(b, plus), node_argument(b, minus),
                            &out)) {
        b->failed = true;
    }
    return out;
}

static void add_term(const struct builder *b, struct element *e, int node, double factor)
{
    const int row = current_row(b, node);
    if (row >= 0 && (factor < 0 || factor > 0)) {
        e->terms[e->term_count++] = (struct element_term){row, factor};
    }
}

static struct element new_element(const struct element_kind *kind, const void *prepared)
{
    struct element e;
    memset(&e, 0, sizeof e);
    e.kind = kind;
    e.prepared = prepared;
    e.forward = e.reverse = -1;
    return e;
}

static int put_element(struct builder *b, const struct element *e, bool needed)
{
    int index = -1;
    if ((e->term_count > 0 || needed) && !network_element(b->map->network, e, &index)) {
        b->failed = true;
    }
    return index;
}

static void add_linear(struct builder *b, int from, int to, double resistance)
{
    const struct interval g = interval_div(interval_point(1), interval_point(resistance));
    struct network *n = b->map->network;
    for (int end = 0; end < 2; end++) {
        const int own = end == 0 ? from : to, other = end == 0 ? to : from;
        const int row = current_row(b, own);
        const struct argument a = node_argument(b, own), o = node_argument(b, other);
        if (row < 0) {
            continue;
        }
        b->failed |= a.variable >= 0 && !network_add(n, row, a.variable, g);
        b->failed |= o.variable >= 0 && !network_add(n, row, o.variable, interval_neg(g));
        network_add_constant(n, row, interval_mul(g, interval_sub(a.shift, o.shift)));
    }
}

/* --- devices ------------------------------------------------------------------------------------
 */

/* coefficient (exp(u/thermal) - 1) from plus to minus in the frame of the polarity. */
static void add_junction(struct builder *b, int plus, int minus, double coefficient, double thermal,
                         double polarity)
{
    struct element e = new_element(&element_junction, NULL);
    if (!(coefficient > 0)) {
        return;
    }
    e.coefficient = coefficient;
    e.thermal = thermal;
    e.argument_count = 1;
    e.arguments[0] = polarity > 0 ? difference(b, plus, minus) : difference(b, minus, plus);
    add_term(b, &e, plus, polarity);
    add_term(b, &e, minus, -polarity);
    put_element(b, &e, false);
}

static void add_diode(struct builder *b, const int *local, const struct diode_prepared *p)
{
    add_junction(b, local[DIODE_A], local[DIODE_K], p->saturation, p->thermal, 1);
    if (p->breakdown > 0) {
        struct element e = new_element(&element_breakdown, NULL);
        e.coefficient = p->breakdown;
        e.thermal = p->breakdown_thermal;
        e.shift = p->breakdown_voltage;
        e.argument_count = 1;
        e.arguments[0] = difference(b, local[DIODE_A], local[DIODE_K]);
        add_term(b, &e, local[DIODE_A], 1);
        add_term(b, &e, local[DIODE_K], -1);
        put_element(b, &e, false);
    }
}

/*
 * IC = T - IR/beta_R - leak_C, IB = IF/beta_F + IR/beta_R + leak_E + leak_C, with T = IF - IR
 * unless Early effect or high injection make it an element of its own.
 */
static void add_bipolar(struct builder *b, const int *local, const struct bipolar_prepared *p)
{
    const int c = local[BIPOLAR_C], base = local[BIPOLAR_B], emitter = local[BIPOLAR_E];
    const double sign = p->polarity;
    const bool plain = !(p->per_early > 0) && !(p->per_early_reverse > 0) && !(p->per_knee > 0) &&
                       !(p->per_knee_reverse > 0);
    struct element f = new_element(&element_junction, NULL), r = f;
    f.coefficient = r.coefficient = p->saturation;
    f.thermal = p->thermal_f;
    r.thermal = p->thermal_r;
    f.argument_count = r.argument_count = 1;
    f.arguments[0] = sign > 0 ? difference(b, base, emitter) : difference(b, emitter, base);
    r.arguments[0] = sign > 0 ? difference(b, base, c) : difference(b, c, base);
    add_term(b, &f, base, sign * p->per_beta);
    add_term(b, &f, emitter, -sign * p->per_beta);
    add_term(b, &r, base, sign * p->per_beta_reverse);
    add_term(b, &r, c, -sign * p->per_beta_reverse);
    if (plain) {
        add_term(b, &f, c, sign);
        add_term(b, &f, emitter, -sign);
        add_term(b, &r, c, -sign);
        add_term(b, &r, emitter, sign);
    }
    const int forward = put_element(b, &f, !plain), reverse = put_element(b, &r, !plain);
    if (!plain) {
        struct element t = new_element(&element_transport, p);
        t.argument_count = 2;
        t.arguments[0] = f.arguments[0];
        t.arguments[1] = r.arguments[0];
        t.forward = forward;
        t.reverse = reverse;
        add_term(b, &t, c, sign);
        add_term(b, &t, emitter, -sign);
        put_element(b, &t, false);
    }
    add_junction(b, base, emitter, p->leak_emitter, p->leak_emitter_thermal, sign);
    add_junction(b, base, c, p->leak_collector, p->leak_collector_thermal, sign);
}

static void add_mos(struct builder *b, const int *local, const struct mos_prepared *p)
{
    static const int ends[3] = {MOS_G, MOS_S, MOS_D};
    struct element e = new_element(&element_channel, p);
    e.argument_count = 3;
    for (int k = 0; k < 3; k++) {
        e.arguments[k] = p->polarity > 0 ? difference(b, local[ends[k]], local[MOS_B])
                                         : difference(b, local[MOS_B], local[ends[k]]);
    }
    add_term(b, &e, local[MOS_D], p->polarity);
    add_term(b, &e, local[MOS_S], -p->polarity);
    put_element(b, &e, false);
    add_junction(b, local[MOS_B], local[MOS_S], p->junction_current, p->junction_ut, p->polarity);
    add_junction(b, local[MOS_B], local[MOS_D], p->junction_current, p->junction_ut, p->polarity);
}

static void add_jfet(struct builder *b, const int *local, const struct jfet_prepared *p)
{
    const int g = local[JFET_G], d = local[JFET_D], s = local[JFET_S];
    struct element e = new_element(&element_jfet, p);
    e.argument_count = 2;
    e.arguments[0] = p->polarity > 0 ? difference(b, g, s) : difference(b, s, g);
    e.arguments[1] = p->polarity > 0 ? difference(b, g, d) : difference(b, d, g);
    add_term(b, &e, d, p->polarity);
    add_term(b, &e, s, -p->polarity);
    put_element(b, &e, false);
    add_junction(b, g, s, p->gate_current, p->gate_thermal, p->polarity);
    add_junction(b, g, d, p->gate_current, p->gate_thermal, p->polarity);
}

static void add_opamp(struct builder *b, const int *local, const struct opamp_prepared *p)
{
    struct network *n = b->map->network;
    const int row = row_of(b, local[OPAMP_OUT]);
    struct element e = new_element(&element_amplifier, p);
    if (row < 0) {
        return;
    }
    e.argument_count = 3;
    e.arguments[0] = difference(b, local[OPAMP_PLUS], local[OPAMP_MINUS]);
    e.arguments[1] = p->high_node ? node_argument(b, local[OPAMP_HIGH])
                                  : network_node(-1, interval_point(p->high));
    e.arguments[2] =
        p->low_node ? node_argument(b, local[OPAMP_LOW]) : network_node(-1, interval_point(p->low));
    e.terms[e.term_count++] = (struct element_term){row, -1};
    b->failed |= !network_add(n, row, row, interval_point(1));
    network_add_constant(n, row, b->map->shift[local[OPAMP_OUT]]);
    put_element(b, &e, false);
}

static struct argument law_argument(struct builder *b, const int *local, const int *input)
{
    return input[1] < 0 ? node_argument(b, local[2 + input[0]])
                        : difference(b, local[2 + input[0]], local[2 + input[1]]);
}

/* slope (shift + sign z), or a constant: a coefficient and a constant at both ends. */
static void add_line(struct builder *b, const int *local, const struct element *e)
{
    const struct argument argument = e->arguments[0];
    struct network *n = b->map->network;
    const struct interval zero = interval_point(0);
    struct interval value, slope = zero;
    e->kind->range(e, &zero, &value, &slope);
    const int at = e->argument_count == 0 ? -1 : argument.variable;
    for (int end = 0; end < 2; end++) {
        const int row = current_row(b, local[end]);
        const struct interval s = end == 0 ? slope : interval_neg(slope);
        if (row < 0) {
            continue;
        }
        if (at >= 0) {
            b->failed |= !network_add(n, row, at, argument.sign > 0 ? s : interval_neg(s));
        }
        network_add_constant(n, row, interval_mul(s, argument.shift));
        network_add_constant(n, row, end == 0 ? value : interval_neg(value)); /* at argument 0 */
    }
}

static void add_law(struct builder *b, const int *local, const struct law_program *program)
{
    struct law_part *parts;
    int count;
    if (!network_law_parts(b->arena, program, &parts, &count)) {
        b->failed = true;
        return;
    }
    for (int k = 0; k < count; k++) {
        struct element e = new_element(&element_law, &parts[k].program);
        e.argument_count = parts[k].program.input_count;
        for (int i = 0; i < e.argument_count; i++) {
            e.arguments[i] = law_argument(b, local, parts[k].inputs[i]);
        }
        if (parts[k].is_linear || parts[k].is_constant) {
            add_line(b, local, &e);
            continue;
        }
        add_term(b, &e, local[0], 1);
        add_term(b, &e, local[1], -1);
        put_element(b, &e, false);
    }
}

static void add_table(struct builder *b, const int *local, const struct curve *curve)
{
    struct element e = new_element(&element_table, curve);
    e.argument_count = 1;
    e.arguments[0] = difference(b, local[0], local[1]);
    add_term(b, &e, local[0], 1);
    add_term(b, &e, local[1], -1);
    put_element(b, &e, false);
}

static void add_current(struct builder *b, const int *local, double amperes)
{
    for (int end = 0; end < 2; end++) {
        const int row = current_row(b, local[end]);
        if (row >= 0) {
            network_add_constant(b->map->network, row,
                                 interval_point(end == 0 ? amperes : -amperes));
        }
    }
}

static void add_instance(struct builder *b, int k)
{
    const struct instance *instance = &b->system->circuit->instances[k];
    const void *block = system_block(b->system, k);
    const int *local = instance->local;
    const struct device_type *type = instance->type;
    double volts;
    if (held_voltage(b->system, k, &volts)) {
        return;
    }
    if (type->evaluate == resistor_evaluate) {
        add_linear(b, local[0], local[1], ((const struct linear_prepared *)block)->value);
    } else if (type->evaluate == series_evaluate) {
        add_linear(b, local[0], local[1], ((const struct series_prepared *)block)->resistance);
    } else if (type->evaluate == current_evaluate) {
        add_current(b, local, ((const struct linear_prepared *)block)->value);
    } else if (type->evaluate == diode_evaluate) {
        add_diode(b, local, block);
    } else if (type->evaluate == bipolar_evaluate) {
        add_bipolar(b, local, block);
    } else if (type->evaluate == mos_evaluate) {
        add_mos(b, local, block);
    } else if (type->evaluate == jfet_evaluate) {
        add_jfet(b, local, block);
    } else if (type->evaluate == opamp_evaluate) {
        add_opamp(b, local, block);
    } else if (type->evaluate == law_evaluate) {
        add_law(b, local, block);
    } else if (type->evaluate == table_evaluate) {
        add_table(b, local, block);
    } else {
        b->failed = true; /* a device that the proofs do not know */
    }
}

bool network_build(struct arena *arena, const struct system *system, struct network_map *map)
{
    struct builder b = {.arena = arena, .system = system, .map = map};
    const struct circuit *circuit = system->circuit;
    int count;
    *map = (struct network_map){0};
    if (!find_groups(&b, &count)) {
        return false;
    }
    map->network = network_create(arena, count);
    if (map->network == NULL) {
        return false;
    }
    for (int k = 0; k < circuit->instance_count; k++) {
        const struct instance *instance = &circuit->instances[k];
        if (instance->type->evaluate == opamp_evaluate && row_of(&b, instance->local[0]) >= 0) {
            map->driven[row_of(&b, instance->local[0])] = true;
        }
    }
    for (int k = 0; k < circuit->instance_count && !b.failed; k++) {
        add_instance(&b, k);
    }
    return !b.failed && network_finish(map->network);
}

void network_from_system(const struct network_map *map, const double *x, double *nodes)
{
    for (int k = 0; k < map->network->node_count; k++) {
        nodes[k] = x[map->node[k]];
    }
}

void network_to_system(const struct network_map *map, int node_count, const double *nodes,
                       double *x)
{
    for (int k = 0; k < node_count; k++) {
        const double base = map->group[k] < 0 ? 0 : nodes[map->group[k]];
        x[k] = base + interval_middle(map->shift[k]);
    }
}

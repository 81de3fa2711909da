/* network_range.c: bounds of all node voltages, by what can push a node beyond the rails. */
#include "analyses/network_range.h"

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
#include "devices/smooth.h"

enum { ROUND_LIMIT = 200, SCAN_LIMIT = 300, HALVINGS = 60, SHELL_HALVINGS = 6, STACK_LIMIT = 64 };
enum { UP, DOWN };

/* Rounding of a bound: far more than a few operations lose. */
static const double slack = 1e-9;
/* How near to its least value a bound by a channel is taken, of itself: each try is a range. */
static const double channel_share = 1e-4;
/* A bound is worth another round while it still moves by this share of itself. */
static const double progress_share = 1e-3;

struct law_parts {
    struct law_part *parts;
    int count;
};

struct ranger {
    struct arena *arena;
    const struct system *system;
    const struct network_map *map;
    int groups;
    struct interval *bound; /* [groups] of the node with shift 0 */
    double *least, *most;   /* [groups] shifts of the nodes of a group */
    bool *pushed[2];        /* [groups] a source acts on the group, upward and downward */
    struct law_parts *laws; /* [instance_count] */
    double spread;          /* V that groups span inside */
    double rail[2];         /* V: highest and lowest held node */
    double drive[2];        /* A: what sources push up, and down */
    bool is_suspect;        /* a device that may pass current upward */
};

/* --- voltages -----------------------------------------------------------------------------------
 */

static int group_of(const struct ranger *r, int node)
{
    return node < 0 ? -1 : r->map->group[node];
}

/* A group whose voltage the sums of currents set. */
static bool is_free(const struct ranger *r, int node)
{
    const int group = group_of(r, node);
    return group >= 0 && !r->map->driven[group];
}

/* The group of node `of` may be set so that `of` lies in `at`; of -2: none is. */
struct setting_of {
    int of;
    struct interval at;
};
static const struct setting_of as_bound = {-2, {0, 0}};

static struct interval shift_of(const struct ranger *r, int node)
{
    return node < 0 ? interval_point(0) : r->map->shift[node];
}

static struct interval node_range(const struct ranger *r, int node, const struct setting_of *set)
{
    const int group = group_of(r, node);
    if (group >= 0 && set->of >= 0 && group == group_of(r, set->of)) {
        return interval_add(set->at, interval_sub(shift_of(r, node), shift_of(r, set->of)));
    }
    return group < 0 ? shift_of(r, node) : interval_add(r->bound[group], shift_of(r, node));
}

static struct interval voltage_between(const struct ranger *r, int plus, int minus,
                                       const struct setting_of *set)
{
    if (group_of(r, plus) == group_of(r, minus)) {
        return interval_sub(shift_of(r, plus), shift_of(r, minus));
    }
    return interval_sub(node_range(r, plus, set), node_range(r, minus, set));
}

/* --- devices of two terminals -------------------------------------------------------------------
 */

static bool has_two_ends(const struct device_type *type)
{
    return type->evaluate == resistor_evaluate || type->evaluate == series_evaluate ||
           type->evaluate == diode_evaluate || type->evaluate == table_evaluate ||
           type->evaluate == law_evaluate;
}

/* Whether an input of a law is one end of it while the other end is held: the voltage across then
 * sets it. */
static bool is_end(const struct ranger *r, const int *local, int node, struct interval across,
                   struct interval *at)
{
    for (int end = 0; end < 2; end++) {
        const int own = local[end], other = local[1 - end];
        if (node == own && group_of(r, other) < 0) {
            const struct interval base = shift_of(r, other);
            *at = end == 0 ? interval_add(base, across) : interval_sub(base, across);
            return true;
        }
    }
    return false;
}

static struct interval law_current(const struct ranger *r, int k, struct interval across)
{
    const int *local = r->system->circuit->instances[k].local;
    struct interval sum = interval_point(0);
    for (int p = 0; p < r->laws[k].count; p++) {
        const struct law_part *part = &r->laws[k].parts[p];
        struct interval x[ELEMENT_ARGUMENT_LIMIT], value, slopes[ELEMENT_ARGUMENT_LIMIT];
        struct element e;
        memset(&e, 0, sizeof e);
        e.prepared = &part->program;
        e.argument_count = part->program.input_count;
        for (int i = 0; i < e.argument_count; i++) {
            const int *input = part->inputs[i];
            const int plus = local[2 + input[0]], minus = input[1] < 0 ? -1 : local[2 + input[1]];
            if (input[1] >= 0 && plus == local[0] && minus == local[1]) {
                x[i] = across;
            } else if (input[1] >= 0 && plus == local[1] && minus == local[0]) {
                x[i] = interval_neg(across);
            } else if (input[1] >= 0) {
                x[i] = voltage_between(r, plus, minus, &as_bound);
            } else if (!is_end(r, local, plus, across, &x[i])) {
                x[i] = node_range(r, plus, &as_bound);
            }
        }
        element_law.range(&e, x, &value, slopes);
        sum = interval_add(sum, value);
    }
    return sum;
}

/* From the first to the second terminal, at a voltage across them. */
static struct interval current_across(const struct ranger *r, int k, struct interval across)
{
    const struct device_type *type = r->system->circuit->instances[k].type;
    const void *block = system_block(r->system, k);
    struct element e;
    struct interval value, slope;
    memset(&e, 0, sizeof e);
    if (type->evaluate == law_evaluate) {
        return law_current(r, k, across);
    }
    if (type->evaluate == table_evaluate) {
        e.prepared = block;
        element_table.range(&e, &across, &value, &slope);
        return value;
    }
    if (type->evaluate == diode_evaluate) {
        const struct diode_prepared *p = block;
        struct interval back = interval_point(0);
        e.coefficient = p->saturation;
        e.thermal = p->thermal;
        element_junction.range(&e, &across, &value, &slope);
        if (p->breakdown > 0) {
            e.coefficient = p->breakdown;
            e.thermal = p->breakdown_thermal;
            e.shift = p->breakdown_voltage;
            element_breakdown.range(&e, &across, &back, &slope);
        }
        return interval_add(value, back);
    }
    return interval_div(across,
                        interval_point(type->evaluate == resistor_evaluate
                                           ? ((const struct linear_prepared *)block)->value
                                           : ((const struct series_prepared *)block)->resistance));
}

/* Current from end `from` to the other, while that end is `across` above it. */
static struct interval current_from(const struct ranger *r, int k, int from, struct interval across)
{
    return from == 0 ? current_across(r, k, across)
                     : interval_neg(current_across(r, k, interval_neg(across)));
}

/* The most that device k pushes from its lower to its higher end, the higher being `from`. */
static double greatest_push(const struct ranger *r, int k, int from, double reach)
{
    struct interval stack[STACK_LIMIT];
    int depth = 0;
    double proved = 0, seen = 0;
    stack[depth++] = (struct interval){0, reach};
    for (int looked = 0; depth > 0; looked++) {
        const struct interval part = stack[--depth];
        const double most = -current_from(r, k, from, part).lo;
        if (most <= seen * (1 + progress_share) + 1e-18) {
            proved = fmax(proved, most);
            continue;
        }
        const double middle = part.lo > 0 && part.hi > 4 * part.lo ? sqrt(part.lo * part.hi)
                              : part.lo > 0                        ? interval_middle(part)
                                                                   : part.hi / 8;
        if (looked > SCAN_LIMIT || depth + 2 > STACK_LIMIT || !(middle > part.lo) ||
            !(middle < part.hi) || part.hi < 1e-15) {
            proved = fmax(proved, most);
            continue;
        }
        seen = fmax(seen, -current_from(r, k, from, interval_point(middle)).hi);
        stack[depth++] = (struct interval){part.lo, middle};
        stack[depth++] = (struct interval){middle, part.hi};
    }
    return proved;
}

static bool carries_more(const struct ranger *r, int k, int from, struct interval across,
                         double drive, int halvings)
{
    if (current_from(r, k, from, across).lo > drive) {
        return true;
    }
    const double middle = interval_middle(across);
    return halvings > 0 && current_from(r, k, from, interval_point(middle)).lo > drive &&
           carries_more(r, k, from, (struct interval){middle, across.hi}, drive, halvings - 1) &&
           carries_more(r, k, from, (struct interval){across.lo, middle}, drive, halvings - 1);
}

/* The voltage beyond which, up to `reach`, device k carries more than the drive. */
static double drop_of(const struct ranger *r, int k, int from, double drive, double reach)
{
    double good = reach, bad = 0;
    if (!(current_from(r, k, from, interval_point(reach)).lo > drive)) {
        return reach;
    }
    for (int n = 0; n < HALVINGS && good > 1e-12; n++) {
        if (!carries_more(r, k, from, (struct interval){good / 2, good}, drive, SHELL_HALVINGS)) {
            bad = good / 2;
            break;
        }
        good /= 2;
    }
    const double top = good;
    for (int n = 0; n < 24 && bad > 0; n++) {
        const double middle = (good + bad) / 2;
        *(carries_more(r, k, from, (struct interval){middle, top}, drive, SHELL_HALVINGS) ? &good
                                                                                          : &bad) =
            middle;
    }
    return good * (1 + slack) + 1e-12;
}

/* --- what pushes --------------------------------------------------------------------------------
 */

static void push_at(struct ranger *r, int way, int node)
{
    if (is_free(r, node)) {
        r->pushed[way][group_of(r, node)] = true;
    }
}

/* `from` is the higher end on the way up, the lower on the way down. */
static void add_source(struct ranger *r, const int *local, double amperes)
{
    const int into = amperes > 0 ? local[1] : local[0], out_of = amperes > 0 ? local[0] : local[1];
    if (group_of(r, into) == group_of(r, out_of) || !(fabs(amperes) > 0)) {
        return;
    }
    r->drive[UP] += is_free(r, into) ? fabs(amperes) : 0;
    r->drive[DOWN] += is_free(r, out_of) ? fabs(amperes) : 0;
    push_at(r, UP, into);
    push_at(r, DOWN, out_of);
}

/* A law, a table, a diode with breakdown (it carries a little at 0 V). */
static void add_own_push(struct ranger *r, int k)
{
    const struct instance *instance = &r->system->circuit->instances[k];
    const int *local = instance->local;
    double most[2] = {0, 0};
    if (group_of(r, local[0]) == group_of(r, local[1])) {
        return;
    }
    for (int end = 0; end < 2; end++) {
        const struct interval across = voltage_between(r, local[end], local[1 - end], &as_bound);
        const double push = across.hi > 0 ? greatest_push(r, k, end, across.hi) : 0;
        most[UP] = is_free(r, local[end]) ? fmax(most[UP], push) : most[UP];
        most[DOWN] = is_free(r, local[1 - end]) ? fmax(most[DOWN], push) : most[DOWN];
    }
    for (int way = UP; way <= DOWN; way++) {
        r->drive[way] += most[way];
        push_at(r, way, local[0]);
        push_at(r, way, local[1]);
    }
}

static void find_pushes(struct ranger *r)
{
    const struct circuit *c = r->system->circuit;
    for (int way = UP; way <= DOWN; way++) {
        r->drive[way] = 0;
        for (int g = 0; g < r->groups; g++) {
            r->pushed[way][g] = false;
        }
    }
    for (int k = 0; k < c->instance_count; k++) {
        const struct instance *instance = &c->instances[k];
        const struct device_type *type = instance->type;
        const void *block = system_block(r->system, k);
        if (type->evaluate == current_evaluate) {
            add_source(r, instance->local, ((const struct linear_prepared *)block)->value);
        } else if (type->evaluate == law_evaluate || type->evaluate == table_evaluate ||
                   (type->evaluate == diode_evaluate &&
                    ((const struct diode_prepared *)block)->breakdown > 0)) {
            add_own_push(r, k);
        }
    }
}

/* --- ways to the rails --------------------------------------------------------------------------
 */

/* The end of the range that is bounded on a way, and its sign. */
static double end_of(int way, struct interval x)
{
    return way == UP ? x.hi : -x.lo;
}

/* Node p lies at most `drop` beyond node q. In mirrored voltages on the way down. */
static void bound_by(struct ranger *r, int way, int p, int q, double drop)
{
    const double base = end_of(way, node_range(r, q, &as_bound));
    const double rail = way == UP ? r->rail[UP] : -r->rail[DOWN];
    const double least = fmax(base + drop, fmax(base, rail) + r->spread);
    const double shift = end_of(way == UP ? DOWN : UP, shift_of(r, p)); /* -shift.lo or shift.hi */
    const double limit = least + shift + slack * fabs(least);
    struct interval *bound = &r->bound[group_of(r, p)];
    if (way == UP) {
        bound->hi = fmin(bound->hi, fmax(limit, bound->lo));
    } else {
        bound->lo = fmax(bound->lo, fmin(-limit, bound->hi));
    }
}

static void cross_two_ends(struct ranger *r, int way, int k)
{
    const int *local = r->system->circuit->instances[k].local;
    for (int end = 0; end < 2; end++) {
        const int p = local[end], q = local[1 - end];
        if (!is_free(r, p) || group_of(r, p) == group_of(r, q)) {
            continue;
        }
        /* the higher end: p on the way up, q on the way down */
        const int from = way == UP ? end : 1 - end;
        const struct interval across = voltage_between(r, local[from], local[1 - from], &as_bound);
        if (across.hi > 0) {
            bound_by(r, way, p, q, drop_of(r, k, from, r->drive[way], across.hi));
        }
    }
}

/* A junction carries coefficient (exp(v/thermal) - 1) at least when it lies across. */
static void cross_junction(struct ranger *r, int way, int plus, int minus, double polarity,
                           double coefficient, double thermal)
{
    const int high = polarity > 0 ? plus : minus, low = polarity > 0 ? minus : plus;
    const int p = way == UP ? high : low, q = way == UP ? low : high;
    const double exponent = log1p(r->drive[way] / coefficient);
    if (coefficient > 0 && exponent < EXPONENT_LIMIT && is_free(r, p) &&
        group_of(r, p) != group_of(r, q)) {
        bound_by(r, way, p, q, thermal * exponent * (1 + slack));
    }
}

static void cross_bipolar(struct ranger *r, int way, const int *local,
                          const struct bipolar_prepared *p)
{
    const int c = local[BIPOLAR_C], b = local[BIPOLAR_B], e = local[BIPOLAR_E];
    const bool plain = !(p->per_early > 0) && !(p->per_early_reverse > 0) && !(p->per_knee > 0) &&
                       !(p->per_knee_reverse > 0);
    const double tied_c = plain && group_of(r, b) == group_of(r, c) ? p->saturation : 0;
    const double tied_e = plain && group_of(r, b) == group_of(r, e) ? p->saturation : 0;
    cross_junction(r, way, b, e, p->polarity, p->saturation * p->per_beta + tied_c, p->thermal_f);
    cross_junction(r, way, b, c, p->polarity, p->saturation * p->per_beta_reverse + tied_e,
                   p->thermal_r);
}

/* Current out of terminal `moving` through the channel, that node being at `at`. */
static struct interval channel_current(const struct ranger *r, int k, int moving,
                                       struct interval at)
{
    static const int ends[3] = {MOS_G, MOS_S, MOS_D};
    const int *local = r->system->circuit->instances[k].local;
    const struct mos_prepared *p = system_block(r->system, k);
    const struct setting_of set = {local[moving], at};
    struct interval x[3], value, slopes[3];
    struct element e;
    memset(&e, 0, sizeof e);
    e.prepared = p;
    e.argument_count = 3;
    for (int i = 0; i < 3; i++) {
        x[i] = voltage_between(r, local[ends[i]], local[MOS_B], &set);
        x[i] = p->polarity > 0 ? x[i] : interval_neg(x[i]);
    }
    element_channel.range(&e, x, &value, slopes);
    return (moving == MOS_D) == (p->polarity > 0) ? value : interval_neg(value);
}

/* Whether the channel carries more than the drive with the moving end anywhere from `at` on. */
static bool channel_carries(const struct ranger *r, int way, int k, int moving, double at,
                            double last)
{
    const struct interval range =
        way == UP ? (struct interval){at, last} : (struct interval){-last, -at};
    const struct interval out = channel_current(r, k, moving, range);
    return (way == UP ? out.lo : -out.hi) > r->drive[way];
}

static void cross_channel(struct ranger *r, int way, int k, int moving)
{
    const int *local = r->system->circuit->instances[k].local;
    const int p = local[moving], q = local[moving == MOS_D ? MOS_S : MOS_D];
    if (!is_free(r, p) || group_of(r, p) == group_of(r, q)) {
        return;
    }
    const double base = end_of(way, node_range(r, q, &as_bound));
    const double last = end_of(way, node_range(r, p, &as_bound));
    const double rail = way == UP ? r->rail[UP] : -r->rail[DOWN];
    double bad = fmax(base, rail), good = last;
    if (!(good > bad) || !channel_carries(r, way, k, moving, good, last)) {
        return;
    }
    const double from = bad;
    for (int n = 0; n < HALVINGS && good - bad > 1e-6 + channel_share * (good - from); n++) {
        const double middle = (good + bad) / 2;
        *(channel_carries(r, way, k, moving, middle, last) ? &good : &bad) = middle;
    }
    bound_by(r, way, p, q, fmax(good - base, 0));
}

static void cross(struct ranger *r, int way, int k)
{
    const struct instance *instance = &r->system->circuit->instances[k];
    const struct device_type *type = instance->type;
    const void *block = system_block(r->system, k);
    const int *local = instance->local;
    if (type->evaluate == series_evaluate &&
        !(((const struct series_prepared *)block)->resistance > 0)) {
        return;
    }
    if (has_two_ends(type)) {
        cross_two_ends(r, way, k);
    } else if (type->evaluate == bipolar_evaluate) {
        cross_bipolar(r, way, local, block);
    } else if (type->evaluate == jfet_evaluate) {
        const struct jfet_prepared *p = block;
        cross_junction(r, way, local[JFET_G], local[JFET_S], p->polarity, p->gate_current,
                       p->gate_thermal);
        cross_junction(r, way, local[JFET_G], local[JFET_D], p->polarity, p->gate_current,
                       p->gate_thermal);
    } else if (type->evaluate == mos_evaluate) {
        const struct mos_prepared *p = block;
        cross_junction(r, way, local[MOS_B], local[MOS_S], p->polarity, p->junction_current,
                       p->junction_ut);
        cross_junction(r, way, local[MOS_B], local[MOS_D], p->polarity, p->junction_current,
                       p->junction_ut);
        cross_channel(r, way, k, MOS_D);
        cross_channel(r, way, k, MOS_S);
    }
}

/* --- all together -------------------------------------------------------------------------------
 */

/* What holds without any current: rails, and amplifiers within their limits. */
static void find_held(struct ranger *r)
{
    const struct circuit *c = r->system->circuit;
    r->rail[UP] = r->rail[DOWN] = 0;
    for (int k = 0; k < c->instance_count; k++) {
        const struct instance *instance = &c->instances[k];
        const int row = group_of(r, instance->local[0]);
        if (instance->type->evaluate != opamp_evaluate || row < 0) {
            continue;
        }
        const struct opamp_prepared *p = system_block(r->system, k);
        const struct interval none = interval_point(0);
        const struct interval high =
            p->high_node ? node_range(r, instance->local[OPAMP_HIGH], &as_bound) : none;
        const struct interval low =
            p->low_node ? node_range(r, instance->local[OPAMP_LOW], &as_bound) : none;
        const double top = p->high_node ? high.hi : p->high, end = p->low_node ? low.lo : p->low;
        const struct interval shift = shift_of(r, instance->local[OPAMP_OUT]);
        r->bound[row].hi = fmin(r->bound[row].hi, fmax(top, end) - shift.lo);
        r->bound[row].lo = fmax(r->bound[row].lo, fmin(top, end) - shift.hi);
    }
    for (int k = 0; k < r->system->node_count; k++) {
        if (!is_free(r, k)) {
            const struct interval at = node_range(r, k, &as_bound);
            r->rail[UP] = fmax(r->rail[UP], at.hi);
            r->rail[DOWN] = fmin(r->rail[DOWN], at.lo);
        }
    }
}

/* No node lies beyond the rails and the groups that are pushed. */
static void bound_all(struct ranger *r)
{
    double top = r->rail[UP], end = r->rail[DOWN];
    for (int g = 0; g < r->groups; g++) {
        top = r->pushed[UP][g] ? fmax(top, r->bound[g].hi + r->most[g]) : top;
        end = r->pushed[DOWN][g] ? fmin(end, r->bound[g].lo + r->least[g]) : end;
    }
    top += r->spread;
    end -= r->spread;
    for (int g = 0; g < r->groups; g++) {
        if (!r->map->driven[g]) {
            r->bound[g].hi = fmin(r->bound[g].hi, fmax(top - r->most[g], r->bound[g].lo));
            r->bound[g].lo = fmax(r->bound[g].lo, fmin(end - r->least[g], r->bound[g].hi));
        }
    }
}

static double total_width(const struct ranger *r)
{
    double sum = 0;
    for (int g = 0; g < r->groups; g++) {
        sum += interval_width(r->bound[g]);
    }
    return sum;
}

/* Whether anything acts on a node: else the rails are all there is. */
static bool is_pushed(const struct ranger *r, int way)
{
    for (int g = 0; g < r->groups; g++) {
        if (r->pushed[way][g]) {
            return true;
        }
    }
    return false;
}

static void narrow(struct ranger *r)
{
    for (int round = 0; round < ROUND_LIMIT; round++) {
        const double before = total_width(r);
        find_held(r);
        find_pushes(r);
        bound_all(r);
        for (int way = UP; way <= DOWN; way++) {
            const int count = is_pushed(r, way) ? r->system->circuit->instance_count : 0;
            for (int k = 0; k < count; k++) {
                cross(r, way, k);
            }
        }
        bound_all(r);
        if (!(total_width(r) < (1 - progress_share) * before)) {
            break;
        }
    }
}

static bool begin(struct ranger *r)
{
    const struct circuit *c = r->system->circuit;
    const int groups = r->groups;
    r->bound = arena_new_array(r->arena, struct interval, groups);
    r->least = arena_new_array(r->arena, double, groups);
    r->most = arena_new_array(r->arena, double, groups);
    r->pushed[UP] = arena_new_array(r->arena, bool, groups);
    r->pushed[DOWN] = arena_new_array(r->arena, bool, groups);
    r->laws = arena_new_array(r->arena, struct law_parts, c->instance_count);
    if (r->bound == NULL || r->least == NULL || r->most == NULL || r->pushed[UP] == NULL ||
        r->pushed[DOWN] == NULL || r->laws == NULL) {
        return false;
    }
    for (int k = 0; k < r->system->node_count; k++) {
        const int g = r->map->group[k];
        if (g >= 0) {
            r->least[g] = fmin(r->least[g], r->map->shift[k].lo);
            r->most[g] = fmax(r->most[g], r->map->shift[k].hi);
        }
    }
    for (int g = 0; g < groups; g++) {
        r->bound[g] = (struct interval){-NETWORK_REACH, NETWORK_REACH};
        r->spread += r->map->driven[g] ? 0 : r->most[g] - r->least[g];
    }
    for (int k = 0; k < c->instance_count; k++) {
        const struct device_type *type = c->instances[k].type;
        const void *block = system_block(r->system, k);
        if (type->evaluate == bipolar_evaluate) {
            /* other slopes forward and backward: current against a small VCE */
            const struct bipolar_prepared *p = block;
            r->is_suspect |= fabs(p->thermal_f - p->thermal_r) > 1e-12 * p->thermal_f;
        } else if (type->evaluate == law_evaluate &&
                   !network_law_parts(r->arena, block, &r->laws[k].parts, &r->laws[k].count)) {
            return false;
        }
    }
    return true;
}

/* A wide choice: 100 V and ten times the rails, and what current sources make of all resistors. */
static double chosen_spread(const struct ranger *r)
{
    const struct circuit *c = r->system->circuit;
    double drive = 0, ohms = 0;
    for (int k = 0; k < c->instance_count; k++) {
        const struct device_type *type = c->instances[k].type;
        const void *block = system_block(r->system, k);
        if (type->evaluate == current_evaluate) {
            drive += fabs(((const struct linear_prepared *)block)->value);
        } else if (type->evaluate == resistor_evaluate) {
            ohms += ((const struct linear_prepared *)block)->value;
        }
    }
    return r->spread + 100 + 10 * (r->rail[UP] - r->rail[DOWN]) + fmin(drive * ohms, 1e3);
}

bool network_range(struct arena *arena, const struct system *system, struct network_map *map)
{
    struct ranger r = {
        .arena = arena, .system = system, .map = map, .groups = map->network->node_count};
    if (!begin(&r)) {
        return false;
    }
    narrow(&r);
    map->is_assumed = r.is_suspect;
    for (int g = 0; g < r.groups; g++) {
        map->is_assumed |= interval_magnitude(r.bound[g]) > NETWORK_REACH / 2;
    }
    const double chosen = map->is_assumed ? chosen_spread(&r) : 0;
    map->low = r.rail[DOWN];
    map->high = r.rail[UP];
    const double rounding = slack * (1 + map->high - map->low); /* not shown as a range */
    for (int g = 0; g < r.groups; g++) {
        struct interval at = {r.rail[DOWN] - chosen, r.rail[UP] + chosen};
        if (!map->is_assumed || (!r.is_suspect && interval_inside(r.bound[g], at))) {
            at = r.bound[g];
        }
        const double least = at.lo + r.least[g], most = at.hi + r.most[g];
        map->low = least < map->low - rounding ? least : map->low;
        map->high = most > map->high + rounding ? most : map->high;
        /* a margin for rounding at the ends */
        map->network->start[g] = (struct interval){at.lo - 1e-6, at.hi + 1e-6};
    }
    return true;
}

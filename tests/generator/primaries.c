/*
 * primaries.c: where the currents of a cell come from: sources, resistors, references that bias
 * themselves, and loops with an amplifier.
 */
#include "generator/stages.h"

/* Evenly over the decades that the technology allows for this cell. */
static double any_current(struct draft *d)
{
    return draw_decades(&d->draw, d->technology->least_current, d->technology->most_current);
}

static enum side any_side(struct draft *d)
{
    return draw_chance(&d->draw, 0.5) ? SIDE_N : SIDE_P;
}

static bool put_source(struct draft *d, struct branches *out)
{
    const enum side side = any_side(d);
    const struct branch in = {draft_node(d), side, any_current(d), 0.9 * d->supply, false};
    double input;
    if (!stage_random(d, &in, out, &input)) {
        return false;
    }
    put_feed(d, side, in.node, in.current);
    return true;
}

static bool put_from_resistor(struct draft *d, struct branches *out)
{
    const enum side side = any_side(d);
    const struct branch in = {draft_node(d), side, any_current(d), 0.85 * d->supply, false};
    double input;
    if (!stage_random(d, &in, out, &input)) {
        return false;
    }
    put_resistor(d, rail_of(opposite(side)), in.node,
                 fmax(d->supply - input, 0.1 * d->supply) / in.current);
    return true;
}

/* Two pairs that feed each other; K times the size and a resistor set the current. */
static bool put_self_biased(struct draft *d, struct branches *out)
{
    const enum side side = any_side(d), other = opposite(side);
    const double current = any_current(d);
    const struct card *card = random_card(d);
    const double k = 2 + draw_index(&d->draw, 8);
    const double budget = 0.8 * d->supply;
    const struct size lower = size_for(d, card, side, current, budget, 0);
    const struct size upper = size_for(d, NULL, other, current, budget, 0);
    const double u = thermal(d);
    double drop = u * log(k);
    if (card->kind != CARD_BIPOLAR) { /* between weak and strong inversion */
        const double over = fmax(lower.least - 3 * u, 0.01);
        drop = d->is_hand || card->kind == CARD_BOARD_MOS
                   ? over * (1 - 1 / sqrt(k)) * (card->kind == CARD_MOS ? 1.3 : 1)
                   : fmax(1.1 * u * log(k), 1.1 * over * (1 - 1 / sqrt(k)));
    }
    if (lower.control + upper.least + 0.1 > d->supply ||
        upper.control + lower.least + drop + 0.1 > d->supply) {
        return false;
    }
    const int a = draft_node(d), b = draft_node(d), end = draft_node(d), node = draft_node(d);
    put_transistor(d, &lower, a, a, rail_of(side), 1);
    put_transistor(d, &lower, b, a, end, k);
    put_resistor(d, end, rail_of(side), drop / current);
    note_loop(d, current);
    put_transistor(d, &upper, a, b, rail_of(other), 1);
    put_transistor(d, &upper, b, b, rail_of(other), 1);
    put_transistor(d, &upper, node, b, rail_of(other), 1);
    branches_add(d, out, node, other, current, upper.least);
    if (draw_chance(&d->draw, 0.4)) {
        const int sink = draft_node(d);
        put_transistor(d, &lower, sink, a, rail_of(side), 1);
        branches_add(d, out, sink, side, current, lower.least);
    }
    return true;
}

/* A control voltage on a resistor: VBE or threshold. */
static bool put_control_reference(struct draft *d, struct branches *out)
{
    const enum side side = any_side(d);
    const double current = any_current(d);
    const struct card *card = random_card(d);
    const struct size first = size_for(d, card, side, current, 0.4 * d->supply, 0);
    const struct size second = size_for(d, card, side, current, 0.5 * d->supply, 1);
    if (first.control + second.control + 0.2 > d->supply) {
        return false;
    }
    const int gate = draft_node(d), sense = draft_node(d), node = draft_node(d);
    put_resistor(d, rail_of(opposite(side)), gate,
                 (d->supply - first.control - second.control) / current);
    put_transistor(d, &first, gate, sense, rail_of(side), 1);
    put_transistor(d, &second, node, gate, sense, 1);
    put_resistor(d, sense, rail_of(side), first.control / current);
    branches_add(d, out, node, side, current, first.control + second.least + 0.2);
    return true;
}

/* A junction FET on its own resistor, half of the time with a second one above it. */
static bool put_jfet(struct draft *d, struct branches *out)
{
    const enum side side = any_side(d);
    const double pinch = 1.5, full = 2e-3;
    const double current = full * draw_decades(&d->draw, 1e-3, 0.7);
    const bool cascode = draw_chance(&d->draw, 0.5);
    const double needed = cascode ? 4.5 : 2.2;
    if (d->supply < needed + 0.5) {
        return false;
    }
    const bool is_n = side == SIDE_N;
    const int rail = rail_of(side), end = draft_node(d), node = draft_node(d);
    const char *kind = is_n ? "njfet" : "pjfet";
    const int number = d->parts += 3;
    draft_write(d,
                "model %s_%d %s\n idss = 2 mA\n pinchoff = %g V\n early = 60 V\n"
                " saturation_current = 5 fA\nend\n",
                kind, number, kind, is_n ? -pinch : pinch);
    int drain = node;
    if (cascode) { /* the upper one pinches off later */
        drain = draft_node(d);
        draft_write(d, "model %s_up%d %s\n idss = 5 mA\n pinchoff = %g V\n early = 60 V\nend\n",
                    kind, number, kind, is_n ? -3.0 : 3.0);
        draft_write(d, "%s J%d d=%s g=%s s=%s model=%s_up%d\n", kind, number - 1, NAME(d, node),
                    NAME(d, rail), NAME(d, drain), kind, number);
        d->devices++;
    }
    draft_write(d, "%s J%d d=%s g=%s s=%s model=%s_%d\n", kind, number, NAME(d, drain),
                NAME(d, rail), NAME(d, end), kind, number);
    d->devices++;
    put_resistor(d, end, rail, pinch * (1 - sqrt(current / full)) / current + 1);
    branches_add(d, out, node, side, current, needed);
    return true;
}

/* The drop of a diode that is fed by a resistor, less one VBE, on the emitter resistor. */
static bool put_diode_reference(struct draft *d, struct branches *out)
{
    const struct card *card = card_of_kind(d, CARD_BIPOLAR);
    const bool zener = d->supply > 8 && draw_chance(&d->draw, 0.6);
    const double drop = zener ? 5.6 : 1.75;
    if (card == NULL || d->supply < drop + 0.8 || d->technology->least_current < 1e-9) {
        return false;
    }
    const enum side side = any_side(d);
    const double current = draw_decades(&d->draw, 20e-6, 10e-3);
    const struct size size = size_for(d, card, side, current, d->supply, 0);
    const int base = draft_node(d), end = draft_node(d), node = draft_node(d);
    const int number = ++d->parts;
    draft_write(d,
                zener ? "model dz%d diode\n saturation_current = 1 fA\n series_resistance = 5 ohm\n"
                        " breakdown_voltage = 5.6 V\n breakdown_current = 5 mA\n"
                        " breakdown_emission = 3\nend\n"
                      : "model dl%d diode\n saturation_current = 6e-18 A\n emission = 1.9\n"
                        " series_resistance = 4 ohm\n bandgap = 1.9 V\nend\n",
                number);
    const bool forward = (side == SIDE_N) != zener; /* from the base to a low rail */
    draft_write(d, "diode D%d %s -> %s model=%s%d\n", number,
                NAME(d, forward ? base : rail_of(side)), NAME(d, forward ? rail_of(side) : base),
                zener ? "dz" : "dl", number);
    d->devices++;
    put_resistor(d, rail_of(opposite(side)), base, (d->supply - drop) / fmax(2e-3, current / 10));
    put_transistor(d, &size, node, base, end, 1);
    put_resistor(d, end, rail_of(side), fmax(drop - size.control, 0.1) / current);
    branches_add(d, out, node, side, current, drop);
    return true;
}

/* An amplifier holds a voltage on a resistor. */
static bool put_regulated_sink(struct draft *d, struct branches *out)
{
    const enum side side = any_side(d);
    const double current = any_current(d), set = draw_between(&d->draw, 0.05, 0.2) * d->supply;
    const struct size size = size_for(d, NULL, side, current, 0.6 * d->supply, 1);
    if (set + size.control + 0.15 > d->supply) {
        return false;
    }
    const int in = draft_node(d), gate = draft_node(d), sense = draft_node(d), node = draft_node(d);
    const int rail = rail_of(side), number = ++d->parts;
    const double offset = draw_between(&d->draw, -2e-3, 2e-3); /* drawn in this order */
    const double gain = draw_decades(&d->draw, 100, 1e6);
    draft_write(d, "voltage V%d %s -> %s %.5g\n", number, NAME(d, side == SIDE_N ? in : rail),
                NAME(d, side == SIDE_N ? rail : in), set);
    draft_write(d, "opamp A%d out=%s plus=%s minus=%s gain=%.4g low=%s high=%s offset=%.3g\n",
                number, NAME(d, gate), NAME(d, in), NAME(d, sense), gain, NAME(d, NODE_LOW),
                NAME(d, NODE_HIGH), offset);
    d->devices += 2;
    put_transistor(d, &size, node, gate, sense, 1);
    put_resistor(d, sense, rail, set / current);
    branches_add(d, out, node, side, current, set + size.least);
    return true;
}

static void put_junction(struct draft *d, int family, int number, int end, double area)
{
    d->devices++;
    draft_write(d, "pnp QV%d c=%s b=%s e=%s area=%g model=vertical%d\n", number, NAME(d, NODE_LOW),
                NAME(d, NODE_LOW), NAME(d, end), area, family);
}

/* Junctions of different density held equal by an amplifier that drives p-channel sources; for low
 * supplies with resistors beside the junctions (Banba et al. 1999). */
static bool put_bandgap(struct draft *d, struct branches *out)
{
    const struct card *card = card_of_kind(d, CARD_MOS);
    const bool low_supply = draw_chance(&d->draw, 0.4);
    if (card == NULL || d->low < 0 || d->supply < 1.2 || (!low_supply && d->supply < 1.7)) {
        return false;
    }
    const double current = draw_decades(&d->draw, 100e-9, 50e-6), u = thermal(d);
    const struct size size = size_for(d, card, SIDE_P, current, d->supply - 0.1, 0);
    const int x = draft_node(d), y = draft_node(d), z = draft_node(d), gate = draft_node(d);
    const int node = draft_node(d), area = 4 + 4 * draw_index(&d->draw, 4), number = d->parts += 4;
    if (size.control > d->supply - 0.05) {
        return false;
    }
    draft_write(d,
                "model vertical%d pnp\n saturation_current = 5e-18 A\n beta = 6\n early = 80 V\n"
                " base_resistance = 80 ohm\nend\n",
                number);
    draft_write(d, "opamp A%d out=%s plus=%s minus=%s gain=%.4g low=%s high=%s\n", number,
                NAME(d, gate), NAME(d, y), NAME(d, x), draw_decades(&d->draw, 500, 1e5),
                NAME(d, NODE_LOW), NAME(d, NODE_HIGH));
    d->devices++;
    put_transistor(d, &size, x, gate, NODE_HIGH, 1);
    put_transistor(d, &size, y, gate, NODE_HIGH, 1);
    put_junction(d, number, number - 2, x, 1);
    put_junction(d, number, number - 1, z, area);
    const double own = low_supply ? current / 2 : current;
    put_resistor(d, y, z, u * log(area) / own);
    note_loop(d, own);
    if (low_supply) {
        put_resistor(d, x, NODE_LOW, 0.7 / own);
        put_resistor(d, y, NODE_LOW, 0.7 / own);
    } else {
        const int reference = draft_node(d), middle = draft_node(d);
        put_transistor(d, &size, reference, gate, NODE_HIGH, 1);
        put_resistor(d, reference, middle, 0.5 / own);
        put_junction(d, number, number, middle, 1);
    }
    put_transistor(d, &size, node, gate, NODE_HIGH, 1);
    branches_add(d, out, node, SIDE_P, current, size.least);
    return true;
}

/* Two transistors of different density with equal collector currents (Brokaw 1974). */
static bool put_brokaw(struct draft *d, struct branches *out)
{
    const struct card *card = card_of_kind(d, CARD_BIPOLAR);
    if (card == NULL || d->supply < 3 || d->technology->least_current < 1e-9) {
        return false;
    }
    const enum side side = any_side(d);
    const double current = draw_decades(&d->draw, 10e-6, 500e-6), u = thermal(d);
    const struct size size = size_for(d, card, side, current, d->supply, 0);
    const int c1 = draft_node(d), c2 = draft_node(d), line = draft_node(d), tail = draft_node(d);
    const int end = draft_node(d), node = draft_node(d), last = draft_node(d);
    const int high = rail_of(opposite(side));
    draft_write(d, "opamp A%d out=%s plus=%s minus=%s gain=%.4g low=%s high=%s\n", ++d->parts,
                NAME(d, line), NAME(d, c2), NAME(d, c1), draw_decades(&d->draw, 1e3, 1e5),
                NAME(d, NODE_LOW), NAME(d, NODE_HIGH));
    d->devices++;
    put_resistor(d, high, c1, 0.3 * d->supply / current);
    put_resistor(d, high, c2, 0.3 * d->supply / current);
    put_transistor(d, &size, c2, line, tail, 1);
    put_transistor(d, &size, c1, line, end, 8);
    put_resistor(d, end, tail, u * log(8) / current);
    put_resistor(d, tail, rail_of(side), 0.5 / (2 * current));
    put_transistor(d, &size, node, line, last, 1);
    put_resistor(d, last, rail_of(side), 0.5 / current);
    branches_add(d, out, node, side, current, 1.0);
    return true;
}

bool primary_random(struct draft *d, struct branches *out)
{
    static bool (*const kinds[])(struct draft *, struct branches *) = {
        put_source,        put_source,          put_from_resistor,
        put_from_resistor, put_self_biased,     put_control_reference,
        put_jfet,          put_diode_reference, put_regulated_sink,
        put_bandgap,       put_brokaw};
    out->count = 0;
    return kinds[draw_index(&d->draw, (int)(sizeof kinds / sizeof kinds[0]))](d, out);
}

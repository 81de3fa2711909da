/*
 * generator.c: conditions, a primary, and stages on stages until the cell is large enough.
 */
#include "generator/generator.h"

#include <stdio.h>
#include <string.h>

#include "generator/stages.h"

/* Round figures of the model files, for sizing only. */
static const struct card n180 = {.kind = CARD_MOS,
                                 .model = {"nmos", "pmos"},
                                 .threshold = {0.45, 0.48},
                                 .kprime = {280e-6, 70e-6},
                                 .least_length = 0.18e-6};
static const struct card n350 = {.kind = CARD_MOS,
                                 .model = {"nmos", "pmos"},
                                 .threshold = {0.55, 0.68},
                                 .kprime = {170e-6, 58e-6},
                                 .least_length = 0.35e-6};
static const struct card open130 = {.kind = CARD_MOS,
                                    .model = {"nmos", "pmos"},
                                    .threshold = {0.56, 1.08},
                                    .kprime = {500e-6, 160e-6},
                                    .least_length = 0.3e-6,
                                    .fixed_width = 7e-6,
                                    .fixed_length = 8e-6};
static const struct card board_mos = {
    .kind = CARD_BOARD_MOS, .threshold = {1.8, 2.1}, .model = {NULL, NULL}};
static const struct card bench = {
    .kind = CARD_BIPOLAR, .model = {"npn", "pnp"}, .saturation = {20e-15, 30e-15}};
static const struct card bench_small = {
    .kind = CARD_BIPOLAR, .model = {"npn_small", "pnp_small"}, .saturation = {2e-15, 3e-15}};
static const struct card chip = {
    .kind = CARD_BIPOLAR, .model = {"qn", "qp"}, .saturation = {2e-17, 1e-17}};

static const char chip_models[] =
    "process \"n350.process\"\n"
    "model qn npn\n saturation_current = 2e-17 A\n beta = 120\n early = 45 V\n"
    " emitter_resistance = 4 ohm\n base_resistance = 300 ohm\n knee = 8 mA\nend\n"
    "model qp pnp\n saturation_current = 1e-17 A\n beta = 50\n early = 30 V\n"
    " emitter_resistance = 6 ohm\n base_resistance = 250 ohm\n knee = 4 mA\nend\n";

static const struct technology technologies[] = {
    {"n180", "process \"n180.process\"\n", {&n180}, 1, 0.6, 1.98, 1e-12, 10e-3, -55, 150},
    {"n350", "process \"n350.process\"\n", {&n350}, 1, 0.9, 3.6, 1e-12, 10e-3, -55, 150},
    {"open130", "process \"open130.process\"\n", {&open130}, 1, 1.5, 1.95, 1e-12, 1e-3, -55, 150},
    {"board MOS", "", {&board_mos}, 1, 3, 60, 1e-9, 10e-3, -55, 150},
    {"bipolar",
     "process \"bench.process\"\n",
     {&bench_small, &bench},
     2,
     1,
     60,
     1e-9,
     10e-3,
     -55,
     150},
    {"bipolar and board MOS",
     "process \"bench.process\"\n",
     {&bench, &board_mos},
     2,
     3,
     60,
     1e-8,
     10e-3,
     -55,
     150},
    {"MOS and bipolar of one chip",
     chip_models,
     {&n350, &chip},
     2,
     1.2,
     3.6,
     1e-10,
     5e-3,
     -55,
     150},
};

/* Leakage grows with the temperature; no designer biases below it. */
static void raise_least_current(struct technology *technology, const struct draft *d)
{
    const double t = d->kelvin / 300.15;
    const double grown = pow(t, 3) * exp(1.12 / 8.617333262e-5 * (1 / 300.15 - 1 / d->kelvin));
    double leak = 3e-15;
    for (int k = 0; k < technology->card_count; k++) {
        leak = fmax(leak, 50 * technology->cards[k]->saturation[SIDE_P]);
    }
    technology->least_current = fmax(technology->least_current, leak * grown);
    technology->least_current = fmin(technology->least_current, technology->most_current / 2);
}

static void draw_conditions(struct draft *d, struct technology *technology)
{
    d->technology = technology;
    d->is_hand = draw_chance(&d->draw, 0.3);
    d->celsius = draw_chance(&d->draw, 0.4)
                     ? 27
                     : rint(draw_between(&d->draw, technology->coldest, technology->hottest));
    d->kelvin = d->is_hand ? 300.15 : d->celsius + 273.15;
    raise_least_current(technology, d);
    d->supply = draw_decades(&d->draw, technology->least_supply, technology->most_supply);
    d->low = draw_chance(&d->draw, 0.15) ? -d->supply / 2 : 0;
    d->device_target = (int)draw_decades(&d->draw, 3, 58);
}

static void write_heading(struct draft *d)
{
    draft_write(d, "%stemperature %g C\nrail vdd %.5g V\n", d->technology->header, d->celsius,
                d->low + d->supply);
    if (d->low < 0) {
        draft_write(d, "rail vss %.5g V\n", d->low);
    }
    put_resistor(d, NODE_HIGH, NODE_LOW, d->supply / 1e-3); /* what else the supply feeds */
}

/* A current ends in a load: a held voltage, a resistor, or a diode-connected transistor. */
static void end_branch(struct draft *d, const struct branch *branch)
{
    enum { OUTPUT_LIMIT = 4 };
    const enum side from = opposite(branch->side);
    const double least = d->supply - branch->room;
    if (branch->held || d->outputs == 0 ||
        (d->outputs < OUTPUT_LIMIT && draw_chance(&d->draw, 0.4))) {
        put_output(d, from, branch->node, draw_between(&d->draw, least, d->supply));
        return;
    }
    if (draw_chance(&d->draw, 0.3)) {
        const struct size size = size_for(d, NULL, branch->side, branch->current, branch->room, 0);
        if (size.control < branch->room) {
            put_transistor(d, &size, branch->node, branch->node, rail_of(branch->side), 1);
            return;
        }
    }
    put_resistor(d, branch->node, rail_of(branch->side),
                 draw_between(&d->draw, 0.1, 0.8) * fmax(branch->room, 0.05) / branch->current);
}

static void compose(struct draft *d)
{
    enum { WAITING_LIMIT = 64 };
    struct branch waiting[WAITING_LIMIT];
    struct branches made;
    int count = 0;
    do { /* a part of what a refused primary drew is lost, which does no harm */
        if (primary_random(d, &made)) {
            for (int k = 0; k < made.count && count < WAITING_LIMIT; k++) {
                waiting[count++] = made.list[k];
            }
        }
    } while (count == 0 || (count < 4 && d->devices < d->device_target / 3));
    while (count > 0) {
        const struct branch branch = waiting[--count];
        const bool wanted = d->devices + 3 * count + 8 < d->device_target;
        double input;
        if (!wanted || branch.held || !(branch.current < 10e-3 && branch.current > 1e-12) ||
            !stage_random(d, &branch, &made, &input)) {
            end_branch(d, &branch);
            continue;
        }
        for (int k = 0; k < made.count; k++) {
            if (count < WAITING_LIMIT) {
                waiting[count++] = made.list[k];
            } else {
                end_branch(d, &made.list[k]);
            }
        }
    }
}

void generator_make(uint64_t seed, uint64_t number, struct generated *cell)
{
    memset(cell, 0, sizeof *cell);
    struct draft d = {.draw = draw_begin(seed, number), .text = cell->text, .cell = cell};
    struct technology technology =
        technologies[draw_index(&d.draw, (int)(sizeof technologies / sizeof technologies[0]))];
    draw_conditions(&d, &technology);
    write_heading(&d);
    compose(&d);
    cell->is_hand = d.is_hand;
    cell->device_count = d.devices;
    cell->technology = technology.name;
}

/*
 * draft.c: writing parts into a cell in the making, and sizing transistors.
 */
#include "generator/draft.h"

#include <stdarg.h>
#include <stdio.h>

/* A cell that would grow beyond the limit is cut, and its test then fails to read it. */
void draft_write(struct draft *d, const char *format, ...)
{
    va_list arguments;
    va_start(arguments, format);
    const size_t room = GENERATOR_TEXT_LIMIT - d->length;
    const int written = vsnprintf(d->text + d->length, room, format, arguments);
    va_end(arguments);
    d->length += written < 0 ? 0 : (size_t)written < room ? (size_t)written : room - 1;
}

int draft_node(struct draft *d)
{
    return ++d->nodes;
}

struct node_name node_name(const struct draft *d, int node)
{
    struct node_name name;
    if (node == NODE_HIGH || (node == NODE_LOW && d->low < 0)) {
        snprintf(name.text, sizeof name.text, "%s", node == NODE_HIGH ? "vdd" : "vss");
    } else if (node == NODE_LOW) {
        snprintf(name.text, sizeof name.text, "gnd");
    } else {
        snprintf(name.text, sizeof name.text, "n%d", node);
    }
    return name;
}

enum side opposite(enum side side)
{
    return side == SIDE_N ? SIDE_P : SIDE_N;
}

int rail_of(enum side side)
{
    return side == SIDE_N ? NODE_LOW : NODE_HIGH;
}

double thermal(const struct draft *d)
{
    return 8.617333262e-5 * d->kelvin;
}

/* --- sizing: coarse on purpose, a designer's pocket formulas -------------------------------- */

/* Gate voltage above threshold, times 1/(2 n UT), at an inversion coefficient. */
static double inverted(double coefficient)
{
    return log(expm1(sqrt(coefficient)));
}

static struct size size_bipolar(const struct draft *d, const struct card *card, enum side side,
                                double current)
{
    struct size size = {.card = card, .side = side, .least = 0.35};
    const double t = d->kelvin / 300.15;
    const double saturation = card->saturation[side] * pow(t, 3) *
                              exp(1.12 / 8.617333262e-5 * (1 / 300.15 - 1 / d->kelvin));
    size.control = fmax(thermal(d) * log(1 + current / saturation), 0.03);
    return size;
}

static struct size size_board_mos(struct draft *d, const struct card *card, enum side side,
                                  double current, double budget)
{
    struct size size = {.card = card, .side = side};
    const double room = budget - card->threshold[side];
    size.least = draw_between(&d->draw, 0.1, 0.6);
    size.least = room > 0.05 && size.least > room ? room : size.least;
    size.conduction = current / (size.least * size.least);
    size.control = card->threshold[side] + size.least;
    return size;
}

static struct size size_mos(struct draft *d, const struct card *card, enum side side,
                            double current, double budget, int level)
{
    struct size size = {.card = card, .side = side};
    const double slope = 1.3, u = thermal(d);
    const double specific = 2 * slope * u * u * card->kprime[side];
    const double threshold =
        card->threshold[side] + 0.15 * level - 1e-3 * (d->kelvin - 300.15) * 1.2;
    double coefficient =
        d->is_hand ? draw_decades(&d->draw, 2, 60) : draw_decades(&d->draw, 0.03, 40);
    while (coefficient > 1e-3 &&
           threshold + 2 * slope * u * inverted(coefficient) > budget - 0.02) {
        coefficient /= 2;
    }
    size.length = draw_decades(&d->draw, card->least_length * 2, 12e-6);
    size.width = size.length * current / (coefficient * specific);
    if (size.width < 0.5e-6) {
        size.length = fmin(size.length * 0.5e-6 / size.width, 18e-6);
        size.width = 0.5e-6;
    }
    if (size.width > 3e-3) {
        size.length = fmax(size.length * 3e-3 / size.width, card->least_length);
        size.width = 3e-3;
    }
    if (side == SIDE_P && card->fixed_width > 0) { /* one geometry, in parallel */
        size.length = card->fixed_length;
        size.width =
            card->fixed_width *
            fmax(1, rint(size.width / size.length * card->fixed_length / card->fixed_width));
    }
    coefficient = current / (specific * size.width / size.length);
    size.control = threshold + (d->is_hand ? 2 * u * slope * sqrt(coefficient)
                                           : 2 * u * slope * inverted(coefficient));
    size.control = fmax(size.control, 0.03);
    size.least = 2 * u * sqrt(coefficient + 0.25) + 3 * u;
    return size;
}

struct size size_for(struct draft *d, const struct card *card, enum side side, double current,
                     double budget, int level)
{
    card = card == NULL ? random_card(d) : card;
    switch (card->kind) {
    case CARD_BIPOLAR:
        return size_bipolar(d, card, side, current);
    case CARD_BOARD_MOS:
        return size_board_mos(d, card, side, current, budget);
    case CARD_MOS:
        break;
    }
    return size_mos(d, card, side, current, budget, level);
}

const struct card *random_card(struct draft *d)
{
    return d->technology->cards[draw_index(&d->draw, d->technology->card_count)];
}

const struct card *card_of_kind(const struct draft *d, enum card_kind kind)
{
    for (int k = 0; k < d->technology->card_count; k++) {
        if (d->technology->cards[k]->kind == kind) {
            return d->technology->cards[k];
        }
    }
    return NULL;
}

/* --- parts ---------------------------------------------------------------------------------- */

static void put_model(struct draft *d, const struct size *size)
{
    const char *model = size->card->model[size->side];
    draft_write(d, model == NULL ? "\n" : " model=%s\n", model == NULL ? "" : model);
}

void put_transistor(struct draft *d, const struct size *size, int out, int control, int end,
                    double ratio)
{
    const bool is_n = size->side == SIDE_N;
    const struct card *card = size->card;
    d->devices++;
    d->parts++;
    if (card->kind == CARD_BIPOLAR) {
        draft_write(d, "%s Q%d c=%s b=%s e=%s area=%.5g", is_n ? "npn" : "pnp", d->parts,
                    NAME(d, out), NAME(d, control), NAME(d, end), ratio);
        put_model(d, size);
        return;
    }
    const int own = rail_of(size->side);
    const int bulk = end != own && draw_chance(&d->draw, 0.25) ? end : own;
    draft_write(d, "%s M%d d=%s g=%s s=%s b=%s ", is_n ? "nmos" : "pmos", d->parts, NAME(d, out),
                NAME(d, control), NAME(d, end), NAME(d, bulk));
    if (card->kind == CARD_BOARD_MOS) {
        draft_write(d, "conduction=%.5g threshold=%.4g early=60\n", size->conduction * ratio,
                    card->threshold[size->side]);
    } else if (!is_n && card->fixed_width > 0) {
        draft_write(d, "W=%.5gu L=%.5gu m=%.0f", 1e6 * card->fixed_width, 1e6 * card->fixed_length,
                    fmax(1, rint(size->width / card->fixed_width * ratio)));
        put_model(d, size);
    } else {
        draft_write(d, "W=%.5gu L=%.5gu m=%.5g", 1e6 * size->width, 1e6 * size->length, ratio);
        put_model(d, size);
    }
}

void put_resistor(struct draft *d, int a, int b, double ohms)
{
    d->devices++;
    draft_write(d, "resistor R%d %s -> %s %.5g\n", ++d->parts, NAME(d, a), NAME(d, b), ohms);
}

void note_loop(struct draft *d, double amperes)
{
    struct generated *cell = d->cell;
    if (cell->loop_count < GENERATOR_LOOP_LIMIT) {
        cell->loops[cell->loop_count++] = (struct self_biased){d->parts, amperes};
    }
}

void put_feed(struct draft *d, enum side side, int node, double amperes)
{
    const int rail = rail_of(opposite(side));
    d->devices++;
    draft_write(d, "current I%d %s -> %s %.5g\n", ++d->parts, NAME(d, side == SIDE_N ? rail : node),
                NAME(d, side == SIDE_N ? node : rail), amperes);
}

void put_output(struct draft *d, enum side side, int node, double volts)
{
    const double v = side == SIDE_N ? d->low + volts : d->low + d->supply - volts;
    d->outputs++;
    draft_write(d, "output %s at %.5g V from %.5g V to %.5g V\n", NAME(d, node), v, d->low,
                d->low + d->supply);
}

/*
 * stages.c: mirrors of all kinds, each for both polarities and for MOS or bipolar transistors.
 */
#include "generator/stages.h"

/* The copy is taken from `node` by transistors of side `from`, which need `least` volts. */
void branches_add(const struct draft *d, struct branches *out, int node, enum side from,
                  double current, double least)
{
    if (out->count < BRANCH_LIMIT) {
        out->list[out->count++] = (struct branch){.node = node,
                                                  .side = opposite(from),
                                                  .current = current,
                                                  .room = d->supply - least - 0.05};
    }
}

/* What most stages share: the input transistor's size and where it stands. */
struct stage {
    struct draft *d;
    const struct branch *in;
    struct branches *out;
    struct size size;
    int rail;
};

static double ratio_of(struct draft *d)
{
    static const double ratios[] = {1, 1, 1, 2, 3, 4, 0.5};
    return ratios[draw_index(&d->draw, (int)(sizeof ratios / sizeof ratios[0]))];
}

static int copies(struct draft *d)
{
    return draw_chance(&d->draw, 0.6) ? 1 : 1 + draw_index(&d->draw, 3);
}

static bool put_simple(struct stage *s, double *input)
{
    struct draft *d = s->d;
    *input = s->size.control;
    put_transistor(d, &s->size, s->in->node, s->in->node, s->rail, 1);
    for (int k = copies(d); k > 0; k--) {
        const int node = draft_node(d);
        const double ratio = ratio_of(d);
        put_transistor(d, &s->size, node, s->in->node, s->rail, ratio);
        branches_add(d, s->out, node, s->in->side, ratio * s->in->current, s->size.least);
    }
    return true;
}

static bool put_degenerated(struct stage *s, double *input)
{
    struct draft *d = s->d;
    const double drop = draw_between(&d->draw, 0.02, 0.4), ratio = ratio_of(d);
    if (s->size.control + drop > s->in->room) {
        return false;
    }
    *input = s->size.control + drop;
    const int left = draft_node(d), right = draft_node(d), node = draft_node(d);
    put_transistor(d, &s->size, s->in->node, s->in->node, left, 1);
    put_transistor(d, &s->size, node, s->in->node, right, ratio);
    put_resistor(d, left, s->rail, drop / s->in->current);
    put_resistor(d, right, s->rail, drop / s->in->current / ratio);
    branches_add(d, s->out, node, s->in->side, ratio * s->in->current, s->size.least + drop);
    return true;
}

/* Two or three transistors on each other; the input column is all diodes. */
static bool put_cascode(struct stage *s, double *input)
{
    struct draft *d = s->d;
    const int levels = draw_chance(&d->draw, 0.8) ? 2 : 3;
    if (levels * (s->size.control + 0.1) > s->in->room) {
        return false;
    }
    const double ratio = ratio_of(d);
    int left = s->rail, right = s->rail;
    for (int level = 1; level <= levels; level++) {
        const int control = level == levels ? s->in->node : draft_node(d);
        const int node = draft_node(d);
        put_transistor(d, &s->size, control, control, left, 1);
        put_transistor(d, &s->size, node, control, right, ratio);
        left = control;
        right = node;
    }
    *input = levels * s->size.control;
    branches_add(d, s->out, right, s->in->side, ratio * s->in->current,
                 (levels - 1) * (s->size.control + 0.1) + s->size.least);
    return true;
}

/* The gate line of the cascodes comes from a narrow diode with a current of its own. */
static bool put_wide_swing(struct stage *s, double *input)
{
    struct draft *d = s->d;
    const double least = 2 * s->size.least + 0.1;
    if (s->size.card->kind != CARD_MOS || s->size.control + 2 * s->size.least > s->in->room ||
        (s->in->side == SIDE_P && s->size.card->fixed_width > 0)) {
        return false;
    }
    struct size narrow = s->size;
    narrow.length *= 6;
    const int line = draft_node(d), a = draft_node(d), b = draft_node(d), node = draft_node(d);
    put_feed(d, s->in->side, line, s->in->current);
    put_transistor(d, &narrow, line, line, s->rail, 1);
    put_transistor(d, &s->size, a, s->in->node, s->rail, 1);
    put_transistor(d, &s->size, s->in->node, line, a, 1);
    put_transistor(d, &s->size, b, s->in->node, s->rail, 1);
    put_transistor(d, &s->size, node, line, b, 1);
    *input = s->size.control;
    branches_add(d, s->out, node, s->in->side, s->in->current, least);
    return true;
}

static bool put_wilson(struct stage *s, double *input)
{
    struct draft *d = s->d;
    if (2 * (s->size.control + 0.1) > s->in->room) {
        return false;
    }
    const bool improved = draw_chance(&d->draw, 0.5);
    const int line = draft_node(d), node = draft_node(d);
    const int left = improved ? draft_node(d) : s->in->node;
    put_transistor(d, &s->size, left, line, s->rail, 1);
    put_transistor(d, &s->size, line, line, s->rail, 1);
    put_transistor(d, &s->size, node, s->in->node, line, 1);
    if (improved) {
        put_transistor(d, &s->size, s->in->node, s->in->node, left, 1);
    }
    *input = 2 * s->size.control;
    branches_add(d, s->out, node, s->in->side, s->in->current,
                 s->size.control + s->size.least + 0.2);
    return true;
}

/* An amplifier of one transistor holds the drain of the copy. */
static bool put_regulated(struct stage *s, double *input)
{
    struct draft *d = s->d;
    if (2 * (s->size.control + 0.1) > s->in->room) {
        return false;
    }
    const int middle = draft_node(d), line = draft_node(d), node = draft_node(d);
    put_transistor(d, &s->size, s->in->node, s->in->node, s->rail, 1);
    put_transistor(d, &s->size, middle, s->in->node, s->rail, 1);
    put_transistor(d, &s->size, node, line, middle, 1);
    put_transistor(d, &s->size, line, middle, s->rail, 1);
    *input = s->size.control;
    branches_add(d, s->out, node, s->in->side, s->in->current,
                 s->size.control + s->size.least + 0.2);
    if (draw_chance(&d->draw, 0.5)) { /* the amplifier needs its current under all conditions */
        put_feed(d, s->in->side, line, s->in->current);
        s->out->list[s->out->count - 1].held = true;
    } else {
        put_resistor(d, rail_of(opposite(s->in->side)), line,
                     fmax(d->supply - 2 * s->size.control, 0.1 * d->supply) / s->in->current);
    }
    return true;
}

/* A follower feeds the base line. */
static bool put_helper(struct stage *s, double *input)
{
    struct draft *d = s->d;
    if (s->size.card->kind != CARD_BIPOLAR || 2 * (s->size.control + 0.05) > s->in->room) {
        return false;
    }
    const int line = draft_node(d);
    put_transistor(d, &s->size, s->in->node, line, s->rail, 1);
    put_transistor(d, &s->size, rail_of(opposite(s->in->side)), s->in->node, line, 1);
    put_resistor(d, line, s->rail, s->size.control / (0.1 * s->in->current));
    for (int k = copies(d); k > 0; k--) {
        const int node = draft_node(d);
        const double ratio = ratio_of(d);
        put_transistor(d, &s->size, node, line, s->rail, ratio);
        branches_add(d, s->out, node, s->in->side, ratio * s->in->current, s->size.least);
    }
    *input = 2 * s->size.control;
    return true;
}

/* A copy that is smaller by the drop on its own resistor. */
static bool put_widlar(struct stage *s, double *input)
{
    struct draft *d = s->d;
    const double share = draw_decades(&d->draw, 0.02, 0.6);
    const int end = draft_node(d), node = draft_node(d);
    const double drop = fmin(1.3 * thermal(d) * log(1 / share) +
                                 (d->is_hand ? s->size.least * (1 - sqrt(share)) : 0),
                             s->size.control / 2);
    put_transistor(d, &s->size, s->in->node, s->in->node, s->rail, 1);
    put_transistor(d, &s->size, node, s->in->node, end, 1);
    put_resistor(d, end, s->rail, drop / (share * s->in->current));
    *input = s->size.control;
    branches_add(d, s->out, node, s->in->side, share * s->in->current, s->size.least + drop);
    return true;
}

/* The voltage of the copy is taken below a resistor of the input branch. */
static bool put_peaking(struct stage *s, double *input)
{
    struct draft *d = s->d;
    if (s->size.card->kind == CARD_BOARD_MOS || (s->size.card->kind == CARD_MOS && d->is_hand)) {
        return false; /* the square law may cut the copy off */
    }
    /* volts for a factor e of the current, I/gm: bipolar, MOS */
    const double u = thermal(d);
    const double fold = s->size.card->kind == CARD_BIPOLAR ? u : 1.3 * (s->size.least - 2 * u) / 2;
    const double drop =
        fold * draw_between(&d->draw, 0.2, s->size.card->kind == CARD_BIPOLAR ? 1.3 : 0.5);
    const int low = draft_node(d), node = draft_node(d);
    const double ratio = 1 + draw_index(&d->draw, 4);
    put_transistor(d, &s->size, low, s->in->node, s->rail, 1);
    put_resistor(d, s->in->node, low, drop / s->in->current);
    put_transistor(d, &s->size, node, low, s->rail, ratio);
    *input = s->size.control;
    branches_add(d, s->out, node, s->in->side, ratio * s->in->current * exp(-drop / thermal(d)),
                 s->size.least);
    return true;
}

bool stage_random(struct draft *d, const struct branch *in, struct branches *out, double *input)
{
    static bool (*const kinds[])(struct stage *, double *) = {
        put_simple, put_simple,    put_degenerated, put_cascode, put_wide_swing,
        put_wilson, put_regulated, put_helper,      put_widlar,  put_peaking};
    enum { TRIALS = 6 };
    struct stage s = {.d = d, .in = in, .out = out, .rail = rail_of(in->side)};
    out->count = 0;
    for (int trial = 0; trial <= TRIALS; trial++) {
        const int kind =
            trial == TRIALS ? 0 : draw_index(&d->draw, (int)(sizeof kinds / sizeof kinds[0]));
        const double share = trial < 3 && kind > 1 ? 0.45 : 0.95;
        s.size = size_for(d, NULL, in->side, in->current, share * in->room, 0);
        if (s.size.control < in->room && kinds[kind](&s, input)) {
            return true;
        }
    }
    return false;
}

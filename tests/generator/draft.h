/*
 * draft.h: a cell in the making: its text, its conditions, its nodes, and transistors sized for a
 * current.
 *
 * Stages are written once for both polarities: voltages are distances from the rail that a side's
 * transistors stand on.
 */
#ifndef GENERATOR_DRAFT_H
#define GENERATOR_DRAFT_H

#include "generator/draw.h"
#include "generator/generator.h"

enum side { SIDE_N, SIDE_P }; /* transistors on the low rail, on the high rail */

/* Nodes that are there from the start; the others count from 1. */
enum { NODE_LOW = -1, NODE_HIGH = -2 };

enum card_kind { CARD_MOS, CARD_BOARD_MOS, CARD_BIPOLAR };

/* What the generator must know of a pair of models to size transistors sensibly. */
struct card {
    enum card_kind kind;
    const char *model[2];             /* by side; NULL: none is named */
    double threshold[2];              /* V */
    double kprime[2];                 /* A/V^2 */
    double saturation[2];             /* A, bipolar */
    double least_length;              /* m */
    double fixed_width, fixed_length; /* of the p side, 0: free */
};

/* A family of cells: model files, supplies and the transistors it has. */
struct technology {
    const char *name;
    const char *header; /* statements in front */
    const struct card *cards[2];
    int card_count;
    double least_supply, most_supply; /* V */
    double least_current, most_current;
    double coldest, hottest; /* C */
};

struct draft {
    struct draw draw;
    char *text; /* [GENERATOR_TEXT_LIMIT] */
    size_t length;
    const struct technology *technology;
    bool is_hand;
    double celsius, kelvin; /* kelvin: what the equations see */
    double supply, low;     /* V between the rails, V of the low rail */
    int nodes, parts, devices, device_target, outputs;
    struct generated *cell; /* the loops are noted there */
};

/* A transistor for a current: what is written, and what voltages it takes. */
struct size {
    const struct card *card;
    enum side side;
    double width, length, conduction;
    double control; /* V between control and its own rail's end, at the current */
    double least;   /* V between output and that end that keeps it saturated */
};

void draft_write(struct draft *d, const char *format, ...) __attribute__((format(printf, 2, 3)));
int draft_node(struct draft *d);
/* Name of a node; several may be used in one call of printf. */
struct node_name {
    char text[16];
};
struct node_name node_name(const struct draft *d, int node);
#define NAME(d, node) (node_name((d), (node)).text)

enum side opposite(enum side side);
int rail_of(enum side side);
double thermal(const struct draft *d);

/* A transistor of a random card (or of `card`) whose control voltage is at most `budget` where the
 * card's limits allow; level counts the transistors below it. */
struct size size_for(struct draft *d, const struct card *card, enum side side, double current,
                     double budget, int level);
const struct card *random_card(struct draft *d);
const struct card *card_of_kind(const struct draft *d, enum card_kind kind);

void put_transistor(struct draft *d, const struct size *size, int out, int control, int end,
                    double ratio);
/* Between `a` and `b`; for a side, current flows from `a` to `b` on the low side and back on the
 * high side. */
void put_resistor(struct draft *d, int a, int b, double ohms);
/* The resistor just put carries `amperes` when the loop around it runs. */
void note_loop(struct draft *d, double amperes);
/* Drives `amperes` from the opposite rail into `node` of a side. */
void put_feed(struct draft *d, enum side side, int node, double amperes);
/* Holds `node` at `volts` from the rail of a side. */
void put_output(struct draft *d, enum side side, int node, double volts);

#endif

/*
 * element.h: the nonlinear parts of the devices as functions with proved ranges.
 *
 * A device is a linear part and a few elements: functions of one to four voltage differences (a
 * law: up to 16), each with the range of its value and of its slopes over a box of arguments. The
 * formulas are those of devices/, in interval arithmetic; what is evaluated is the model itself,
 * not its rounding in double.
 */
#ifndef PROOF_ELEMENT_H
#define PROOF_ELEMENT_H

#include "devices/device.h"
#include "interval/dual.h"

enum { ELEMENT_ARGUMENT_LIMIT = DUAL_LIMIT, ELEMENT_TERM_LIMIT = 6 };

struct element;

struct element_kind {
    const char *name;
    /* Range of the value and of the slopes over the box of arguments. */
    void (*range)(const struct element *element, const struct interval *arguments,
                  struct interval *value, struct interval *slopes);
    int curvature; /* of a function of one argument: 1 convex, -1 concave, 0 neither */
};

/* shift + sign * (variable); variable -1: a constant. */
struct argument {
    int variable;
    double sign;
    struct interval shift;
};

struct element_term {
    int row;       /* of the network */
    double factor; /* what one unit of the value adds there */
};

struct element {
    const struct element_kind *kind;
    const void *prepared;
    double coefficient, thermal, shift; /* junction: coefficient (exp((u + shift)/thermal) - 1) */
    int forward, reverse;               /* transport: the elements of IF and IR, else -1 */
    int argument_count;
    struct argument arguments[ELEMENT_ARGUMENT_LIMIT];
    int term_count;
    struct element_term terms[ELEMENT_TERM_LIMIT];
};

extern const struct element_kind element_junction;  /* coefficient (limited exp - 1) */
extern const struct element_kind element_breakdown; /* -coefficient limited exp(-(u + shift)/..) */
extern const struct element_kind element_transport; /* (VBE, VBC): (IF - IR)/qb */
extern const struct element_kind element_channel;   /* (VG, VS, VD to bulk): current d to s */
extern const struct element_kind element_jfet;      /* (VGS, VGD): current d to s */
extern const struct element_kind element_amplifier; /* (plus - minus, high, low): output voltage */
extern const struct element_kind element_law;       /* (inputs) */
extern const struct element_kind element_table;     /* (v) */

/* The range by slopes and, where slopes have one sign, by corners. */
void element_range(const struct element *element, const struct interval *arguments,
                   struct interval *value, struct interval *slopes);

/* Transport: range of (1/qb) over the arguments. */
struct interval element_transport_share(const struct element *element,
                                        const struct interval *arguments);

#endif

/*
 * network_law.h: a law taken apart into what it is a sum of.
 */
#ifndef ANALYSES_NETWORK_LAW_H
#define ANALYSES_NETWORK_LAW_H

#include "devices/law.h"
#include "proof/network.h"

/* A part of a law: a program of its own over one to all inputs, or a straight line. */
struct law_part {
    struct law_program program;            /* inputs are the arguments below */
    int inputs[ELEMENT_ARGUMENT_LIMIT][2]; /* of the law: one, or the difference of two (else -1) */
    bool is_linear;                        /* slope times its one argument */
    bool is_constant;                      /* no input */
};

/*
 * network_law_parts: the law is the sum of the parts. Terms that look at one voltage alone, or at
 * one difference of two, are kept together: their range is then that of the sum.
 *
 * parts  [*count] out, in the arena
 *
 * False when memory is short.
 */
bool network_law_parts(struct arena *arena, const struct law_program *program,
                       struct law_part **parts, int *count);

#endif

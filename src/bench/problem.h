/*
 * problem.h: a cell from text to a system that can be solved.
 */
#ifndef BENCH_PROBLEM_H
#define BENCH_PROBLEM_H

#include "solve/operating_point.h"

struct problem {
    struct cell *cell;
    struct circuit *circuit;
    struct system *system;
    struct operating_point point;
};

/* Reads, builds and prepares; all effects in force. NULL, or what went wrong. The caller ends with
 * problem_close in any case. */
const char *problem_open(struct problem *problem, const char *text, size_t length);
void problem_close(struct problem *problem);

#endif

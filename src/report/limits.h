/* limits.h: what the `require` lines of a quantity allow, as numbers. Private to report/. */
#ifndef REPORT_LIMITS_H
#define REPORT_LIMITS_H

#include "circuit/circuit.h"

enum { LIMIT_COUNT = 6 };

struct limit {
    double value;
    bool is_upper;
};

/*
 * limits_find: how many limits a quantity has, at most LIMIT_COUNT. Signed slopes are wanted small
 * in either direction.
 *
 * everywhere_only  those of `everywhere` lines
 */
int limits_find(const struct circuit *circuit, const struct probe *probe, bool everywhere_only,
                struct limit *limits);

/* Whether limit k says what one before it says. */
bool limits_seen(const struct limit *limits, int k);

#endif

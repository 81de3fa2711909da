/*
 * judge.h: hand lines compared and requirements judged.
 */
#ifndef ANALYSES_JUDGE_H
#define ANALYSES_JUDGE_H

#include "analyses/operating_point.h"

/* Value of any quantity from a finished result; NAN when it has none. */
double result_value(const struct result *result, const struct probe *probe);

/* Fills in result->hands and result->requirements and the verdict. False when memory is short. */
bool judge_all(struct result *result);

#endif

/*
 * judge.h: hand lines compared and requirements judged.
 */
#ifndef ANALYSES_JUDGE_H
#define ANALYSES_JUDGE_H

#include "analyses/result.h"
#include "solve/operating_point.h"

/* Value of any quantity from a finished result; NAN when it has none. */
double result_value(const struct result *result, const struct probe *probe);

/*
 * judge_margin: distance of a value to the limit, negative when it is missed; NAN when it has none.
 * Where the quantity has no value, what the outputs of the result say about it may decide.
 */
double judge_margin(const struct result *result, const struct requirement *requirement,
                    double value);

/* Whether a margin meets the requirement; NAN does not. */
bool judge_is_met(const struct requirement *requirement, double margin);

/* The verdict from all judged requirements. */
void judge_verdict(struct result *result);

/* Fills in result->hands and result->requirements and the verdict. False when memory is short. */
bool judge_all(struct result *result);

#endif

/*
 * remedies.h: what review adds when it has judged: why, and what to change.
 */
#ifndef ANALYSES_REMEDIES_H
#define ANALYSES_REMEDIES_H

#include "analyses/analysis.h"

/*
 * remedies_add: explanations of the hand lines, and repairs of the requirements that are not met,
 * into a judged result of the full view.
 */
enum status remedies_add(struct circuit *circuit, const struct analysis_options *options,
                         struct result *result);

#endif

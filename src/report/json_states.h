/* json_states.h: private to report/: the keys of `states` and of a certificate. */
#ifndef REPORT_JSON_STATES_H
#define REPORT_JSON_STATES_H

#include "report/json_parts.h"

/* Nothing where the result has no states. */
void json_put_states(struct writer *writer, json_t *root, const struct result *result);

#endif

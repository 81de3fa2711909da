/*
 * json_remedies.h: explanations, repairs, sizes and sensitivities as JSON values. Private to
 * report/. Each makes a new value, NULL when memory is short.
 */
#ifndef REPORT_JSON_REMEDIES_H
#define REPORT_JSON_REMEDIES_H

#include <jansson.h>

#include "analyses/explain.h"
#include "analyses/repair.h"
#include "analyses/sensitivity.h"
#include "analyses/size.h"

json_t *json_shares(const struct explanation *explanation);
json_t *json_hand(const struct explanation *explanation);
json_t *json_repairs(const struct repair_list *repairs);
json_t *json_choices(const struct size_result *size);
json_t *json_sensitivities(const struct sensitivity_table *tables, int count);

#endif

/* limits.c: what the requirements of a quantity allow, as numbers. */
#include "report/limits.h"

#include <math.h>
#include <string.h>

int limits_find(const struct circuit *circuit, const struct probe *probe, bool everywhere_only,
                struct limit *limits)
{
    int count = 0;
    for (int k = 0; k < circuit->requirement_count && count + 2 <= LIMIT_COUNT; k++) {
        const struct requirement *r = &circuit->requirements[k];
        if (strcmp(r->probe.text, probe->text) != 0 ||
            (everywhere_only && r->scope != SCOPE_EVERYWHERE)) {
            continue;
        }
        const bool by_size = probe->kind == PROBE_OUTPUT &&
                             (probe->quantity == OUTPUT_LINE || probe->quantity == OUTPUT_TEMPCO);
        if (by_size && r->relation == RELATION_BELOW) {
            limits[count++] = (struct limit){-r->value, false};
        }
        if (r->relation != RELATION_BELOW) {
            double slack = r->relation == RELATION_WITHIN ? r->tolerance : 0.0;
            limits[count++] = (struct limit){r->value - slack, false};
        }
        if (r->relation != RELATION_ABOVE) {
            double slack = r->relation == RELATION_WITHIN ? r->tolerance : 0.0;
            limits[count++] = (struct limit){r->value + slack, true};
        }
    }
    return count;
}

bool limits_seen(const struct limit *limits, int k)
{
    bool seen = false;
    for (int m = 0; m < k; m++) {
        seen = seen || (limits[m].is_upper == limits[k].is_upper &&
                        fabs(limits[m].value - limits[k].value) <= 1e-9 * fabs(limits[k].value));
    }
    return seen;
}

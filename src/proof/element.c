/* element.c: ranges sharpened by monotonicity. */
#include "proof/element.h"

#include <string.h>

/* Slope of one sign: the range of the value is met at the ends of that argument. */
static int direction(struct interval slope)
{
    return slope.lo >= 0 ? 1 : slope.hi <= 0 ? -1 : 0;
}

void element_range(const struct element *e, const struct interval *arguments,
                   struct interval *value, struct interval *slopes)
{
    const int n = e->argument_count;
    e->kind->range(e, arguments, value, slopes);
    struct interval low[ELEMENT_ARGUMENT_LIMIT], high[ELEMENT_ARGUMENT_LIMIT];
    struct interval unused[ELEMENT_ARGUMENT_LIMIT], end;
    bool any = false;
    for (int k = 0; k < n; k++) {
        const int way = direction(slopes[k]);
        low[k] = high[k] = arguments[k];
        if (way != 0 && arguments[k].hi > arguments[k].lo) {
            low[k] = interval_point(way > 0 ? arguments[k].lo : arguments[k].hi);
            high[k] = interval_point(way > 0 ? arguments[k].hi : arguments[k].lo);
            any = true;
        }
    }
    if (!any || e->kind == &element_junction || e->kind == &element_breakdown) {
        return;
    }
    e->kind->range(e, low, &end, unused);
    if (end.lo > value->lo && end.lo <= value->hi) {
        value->lo = end.lo;
    }
    e->kind->range(e, high, &end, unused);
    if (end.hi < value->hi && end.hi >= value->lo) {
        value->hi = end.hi;
    }
}

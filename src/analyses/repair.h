/*
 * repair.h: for a requirement that is not met, the single changes that meet it.
 */
#ifndef ANALYSES_REPAIR_H
#define ANALYSES_REPAIR_H

#include "analyses/analysis.h"
#include "solve/operating_point.h"

enum { REPAIR_LIMIT = 3, REPAIR_CONDITION_LIMIT = 3000 };

struct repair {
    const char *parameter; /* "RE", "M2.W", a let that sets such values */
    double from, to;       /* SI; `to` is rounded to four digits, and judged as such */
    struct dimension dimension;
    double change;      /* to/from - 1 */
    const char *breaks; /* another requirement that it breaks, as written; NULL: none */
};

struct repair_list {
    bool looked_for;                  /* the requirement is not met, and this was tried */
    const char *why_not;              /* it is not met, and nothing was tried; NULL otherwise */
    struct repair list[REPAIR_LIMIT]; /* smallest change first, those that break nothing before */
    int count;
};

/*
 * repair_find: for every requirement of a judged result that is not met, at the cell's own
 * conditions or (`everywhere`, after analyse_conditions) over all of them; result->repairs out.
 *
 * home  polished; stays so
 *
 * STATUS_OK, STATUS_STOPPED (what was found until then is there) or STATUS_MEMORY.
 */
enum status repair_find(struct circuit *circuit, struct operating_point *home,
                        const struct analysis_options *options, struct result *result);

#endif

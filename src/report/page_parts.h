/* page_parts.h: the parts of the review page, in the order they stand. Private to report/. */
#ifndef REPORT_PAGE_PARTS_H
#define REPORT_PAGE_PARTS_H

#include "report/layout.h"

/* The verdict in one word with the title, what it rests on, and the conditions. */
void page_verdict(struct layout *layout, const struct result *result);
/* Current, resistance, compliance and the other figures of each output, and its curve. */
void page_outputs(struct layout *layout, const struct result *result);
void page_supply(struct layout *layout, const struct result *result);
void page_devices(struct layout *layout, const struct result *result);
void page_requirements(struct layout *layout, const struct result *result);
/* What the paper says against what was computed. */
void page_paper(struct layout *layout, const struct result *result);
void page_cautions(struct layout *layout, const struct result *result);
/* How the point was found and how good it is. */
void page_evidence(struct layout *layout, const struct result *result);
/* What `point --certify` proved. */
void page_certificate(struct layout *layout, const struct result *result);
/* The last line of every text report. */
void page_closing(struct layout *layout);

/* Wording shared with the other text reports. */
void page_unsolved(struct layout *layout, const struct result *result);
void page_event(struct layout *layout, const struct sweep_event *event, struct dimension unit);
/* "met", "NOT MET", "not judged" */
const char *judgement_text(enum judgement judgement);
/* The line as written, without its first word. */
const char *requirement_text(struct layout *layout, const struct requirement *requirement);

#endif

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
/* The effects behind each line of the paper, and what would meet a requirement that is not met;
 * both continue the part at hand. */
void page_why(struct layout *layout, const struct result *result);
void page_repairs(struct layout *layout, const struct result *result);
void page_cautions(struct layout *layout, const struct result *result);
/* How the point was found and how good it is. */
void page_evidence(struct layout *layout, const struct result *result);
/* What `point --certify` proved. */
void page_certificate(struct layout *layout, const struct result *result);
/* The last line of every text report. */
void page_closing(struct layout *layout);

/* Samples, causes and yield. */
void page_mismatch(struct layout *layout, const struct result *result);

/* Wording shared with the other text reports. */
void page_unsolved(struct layout *layout, const struct result *result);
void page_event(struct layout *layout, const struct sweep_event *event, struct dimension unit);
/* "85 °C, vdd 2.7 V, corner slow" */
const char *page_place(struct layout *layout, const struct result *result, const double *at);
/* "98.50 % of 2000 samples" */
const char *yield_text(struct layout *layout, const struct yield_result *yield);
/* "met", "NOT MET", "not judged" */
const char *judgement_text(enum judgement judgement);
/* The line as written, without its first word. */
const char *requirement_text(struct layout *layout, const struct requirement *requirement);

#endif

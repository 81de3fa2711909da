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
/* A value or a change of an explanation, as the quantity itself is shown or as a conductance;
 * whether its share number k is worth a row. */
const char *why_value(struct layout *layout, const struct explanation *e, double value);
const char *why_change(struct layout *layout, const struct explanation *e, double value);
bool why_matters(const struct explanation *e, int k);
void page_repairs(struct layout *layout, const struct result *result);
/* States of a cell with a loop, and whether it starts; nothing where result->states is NULL. */
void page_states(struct layout *layout, const struct result *result);
/* "1 state, and no other: proved", "start-up certain": shared with the HTML page. */
struct states_result;
const char *states_proof_text(struct layout *layout, const struct states_result *found);
const char *states_startup_text(const struct states_result *found);
void page_cautions(struct layout *layout, const struct result *result);
/* Lines of the cell that other verbs answer. */
void page_elsewhere(struct layout *layout, const struct result *result);
/* How the point was found and how good it is. */
void page_evidence(struct layout *layout, const struct result *result);
/* What `point --certify` proved. */
void page_certificate(struct layout *layout, const struct result *result);
/* The last line of every text report. */
void page_closing(struct layout *layout);
extern const char page_sign_off[];

/* Columns of the device tables: each shows the first of its quantities that a device has. */
enum { COLUMN_NAME_LIMIT = 2, TRANSISTOR_COLUMN_COUNT = 8, PART_COLUMN_COUNT = 3 };
struct quantity_column {
    const char *names[COLUMN_NAME_LIMIT];
    int may_drop; /* as in table.h */
};
extern const struct quantity_column transistor_columns[TRANSISTOR_COLUMN_COUNT];
extern const struct quantity_column part_columns[PART_COLUMN_COUNT];
/* Index of the name in the column that this type has, and its quantity; -1 when it has none. */
int column_quantity(const struct quantity_column *column, const struct device_type *type,
                    int *name);
/* "vgs", "vbe" or "vgs, vbe", by what the shown devices have; "" when none has it. */
const char *column_head(struct layout *layout, const struct quantity_column *column,
                        const struct device_result *const *shown, int count);

/* "11 random deviates; 2000 samples of seed 1, each a full solve; 0 without an operating point" */
const char *page_samples(struct layout *layout, const struct mismatch_result *mismatch);
/* The unit that a drift is counted per: only temperatures and voltages have a usual one; else NULL.
 */
const char *drift_unit(const struct knob *knob);

/* Samples, causes and yield. */
void page_mismatch(struct layout *layout, const struct result *result);

/* Wording shared with the other text reports. */
void page_unsolved(struct layout *layout, const struct result *result);
void page_event(struct layout *layout, const struct sweep_event *event, struct dimension unit);
const char *page_verdict_word(const struct layout *layout, const struct result *result);
/* One sentence for what the verdict rests on. */
const char *page_verdict_reason(struct layout *layout, const struct result *result);
/* "tail.cell, full view, 27 °C, corner slow, n180.process" */
const char *page_conditions(struct layout *layout, const struct result *result);
/* What there is to spare, or why it was not judged. */
const char *requirement_margin(struct layout *layout, const struct result *result,
                               const struct requirement_result *row);
/* "85 °C, vdd 2.7 V, corner slow" */
const char *page_place(struct layout *layout, const struct result *result, const double *at);
/* "98.50 % of 2000 samples" */
const char *yield_text(struct layout *layout, const struct yield_result *yield);
/* "met", "NOT MET", "not judged" */
const char *judgement_text(enum judgement judgement);
/* The line as written, without its first word. */
const char *requirement_text(struct layout *layout, const struct requirement *requirement);

#endif

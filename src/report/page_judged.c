/* page_judged.c: requirements with their margin, and the paper against what was computed. */
#include "report/page_parts.h"

#include <math.h>
#include <string.h>

#include "analyses/spread_result.h"
#include "report/show.h"
#include "report/table.h"

const char *judgement_text(enum judgement judgement)
{
    switch (judgement) {
    case JUDGED_MET:
        return "met";
    case JUDGED_NOT:
        return "not judged";
    case JUDGED_NOT_MET:
    case JUDGED_UNKNOWN:
        break;
    }
    return "NOT MET";
}

const char *requirement_text(struct layout *layout, const struct requirement *requirement)
{
    static const char word[] = "require ";
    const char *text = layout_clean(layout, requirement->text);
    return strncmp(text, word, sizeof word - 1) == 0 ? text + sizeof word - 1 : text;
}

static enum tone judgement_tone(enum judgement judgement)
{
    switch (judgement) {
    case JUDGED_MET:
        return TONE_GOOD;
    case JUDGED_NOT:
        return TONE_QUIET;
    case JUDGED_NOT_MET:
    case JUDGED_UNKNOWN:
        break;
    }
    return TONE_BAD;
}

/* "98.50 % of 2000 samples" */
const char *yield_text(struct layout *layout, const struct yield_result *yield)
{
    return layout_format(layout, "%.2f %% of %d samples", 100.0 * yield->share, yield->count);
}

/* Why, where and how sure, after the margin. */
static const char *remark_text(struct layout *layout, const struct result *result,
                               const struct requirement_result *row)
{
    const bool by_yield = row->requirement->scope == SCOPE_YIELD && row->yield != NULL;
    const char *first = by_yield                ? yield_text(layout, row->yield)
                        : row->worst_at != NULL ? page_place(layout, result, row->worst_at)
                                                : "";
    if (*first != '\0' && !by_yield) {
        first = layout_format(layout, "at %s", first);
    }
    if (row->remark == NULL) {
        return first;
    }
    return layout_format(layout, "%s%s%s", first, *first != '\0' ? "; " : "",
                         layout_clean(layout, row->remark));
}

/* "3.600 nA to spare", "too far by 111.2 mV (44.48 %)" */
static const char *margin_text(struct layout *layout, const struct requirement_result *row)
{
    const struct probe *probe = &row->requirement->probe;
    if (row->judgement == JUDGED_NOT) {
        if (row->remark != NULL) {
            return "";
        }
        return row->requirement->scope == SCOPE_YIELD ? "needs mismatch samples"
                                                      : "needs the `vary` conditions";
    }
    if (row->judgement == JUDGED_UNKNOWN || isnan(row->margin)) {
        return "";
    }
    if (isinf(row->margin)) {
        return "no limit near";
    }
    const bool at_limit = fabs(row->margin) <= 1e-9 * fabs(row->requirement->value);
    if (at_limit || (row->judgement == JUDGED_MET && row->margin < 0.0)) {
        return "at the limit";
    }
    const char *size = show_probe(layout, probe, fabs(row->margin));
    double limit = fabs(row->requirement->value);
    const char *share = "";
    if (limit > 0.0 && strstr(size, "%") == NULL) {
        share = layout_format(layout, " (%s)",
                              show_share(layout, fabs(row->margin) / limit, "", false));
    }
    return row->margin >= 0.0 ? layout_format(layout, "%s to spare%s", size, share)
                              : layout_format(layout, "too far by %s%s", size, share);
}

const char *requirement_margin(struct layout *layout, const struct result *result,
                               const struct requirement_result *row)
{
    const char *margin = margin_text(layout, row);
    const char *remark = remark_text(layout, result, row);
    if (*remark != '\0') {
        margin = layout_format(layout, "%s%s%s", margin, *margin != '\0' ? "; " : "", remark);
    }
    return margin;
}

void page_requirements(struct layout *layout, const struct result *result)
{
    struct table table;
    layout_part(layout, "requirements");
    table_begin(&table, layout);
    table_column(&table, (struct table_column){.head = ""});
    table_column(&table, (struct table_column){.head = "", .wraps = true});
    table_column(&table, (struct table_column){.head = "computed", .right = true});
    table_column(&table, (struct table_column){.head = "margin", .wraps = true});
    for (int k = 0; k < result->requirement_count; k++) {
        const struct requirement_result *row = &result->requirements[k];
        table_row(&table, judgement_tone(row->judgement));
        table_cell(&table, 0, judgement_text(row->judgement));
        table_cell(&table, 1, requirement_text(layout, row->requirement));
        table_cell(&table, 2,
                   row->judgement == JUDGED_UNKNOWN
                       ? "no value"
                       : show_probe(layout, &row->requirement->probe, row->computed));
        table_cell(&table, 3, requirement_margin(layout, result, row));
    }
    table_write(&table);
    page_repairs(layout, result);
}

void page_paper(struct layout *layout, const struct result *result)
{
    static const char *const heads[] = {"", "paper", "computed", "differs by", "", "hand view"};
    struct table table;
    layout_part(layout, "paper");
    table_begin(&table, layout);
    for (int c = 0; c < 6; c++) {
        table_column(&table,
                     (struct table_column){.head = heads[c], .right = c > 0, .may_drop = c == 5});
    }
    for (int k = 0; k < result->hand_count; k++) {
        const struct hand_result *row = &result->hands[k];
        const struct probe *probe = &row->hand->probe;
        double share = row->difference / fabs(row->hand->value);
        table_row(&table, TONE_PLAIN);
        table_cell(&table, 0, layout_short(layout, probe->text, 30));
        table_cell(&table, 1, show_probe(layout, probe, row->hand->value));
        table_cell(&table, 2, show_probe(layout, probe, row->computed));
        table_cell(&table, 3, show_probe_difference(layout, probe, row->difference));
        table_cell(&table, 4, isfinite(share) ? show_share(layout, share, "", true) : "");
        table_cell(&table, 5,
                   isnan(row->in_hand_view) ? "" : show_probe(layout, probe, row->in_hand_view));
    }
    table_write(&table);
    page_why(layout, result);
}

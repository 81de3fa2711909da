/* page_remarks.c: cautions with the rule behind each, and the numerical evidence. */
#include "report/page_parts.h"

#include <math.h>
#include <stdbool.h>
#include <string.h>

#include "report/show.h"

static void one_caution(struct layout *layout, const struct caution *caution)
{
    const char *thing = layout_clean(layout, caution->thing);
    const char *text = layout_clean(layout, caution->text);
    if (strncmp(text, thing, strlen(thing)) == 0) {
        thing = ""; /* the text names it already */
    }
    const char *place = "";
    if (caution->line > 0) {
        place = layout_format(layout, ", line %d", caution->line);
    }
    layout_paragraph(layout, TONE_PLAIN, 2,
                     layout_format(layout, "%s %s%s%s  [%s%s]",
                                   layout->style.ascii ? "-" : "\xC2\xB7", thing,
                                   *thing != '\0' ? ": " : "", text, caution->code, place));
}

static bool seen_before(const struct caution_list *cautions, int index)
{
    for (int k = 0; k < index; k++) {
        if (strcmp(cautions->list[k].code, cautions->list[index].code) == 0) {
            return true;
        }
    }
    return false;
}

/* Those of one kind stand together, with the rule behind them said once. */
void page_cautions(struct layout *layout, const struct result *result)
{
    const struct caution_list *cautions = &result->cautions;
    layout_part(layout, "cautions");
    for (int k = 0; k < cautions->count; k++) {
        const struct caution *first = &cautions->list[k];
        if (seen_before(cautions, k)) {
            continue;
        }
        for (int m = k; m < cautions->count; m++) {
            if (strcmp(cautions->list[m].code, first->code) == 0) {
                one_caution(layout, &cautions->list[m]);
            }
        }
        if (first->rule != NULL) {
            layout_paragraph(
                layout, TONE_QUIET, 2,
                layout_format(layout, "  rule: %s", layout_clean(layout, first->rule)));
        }
    }
}

/* "3 `vary` lines (spread)"; "" for none */
static const char *unanswered(struct layout *layout, int count, const char *word, const char *verb)
{
    return count == 0 ? ""
                      : layout_format(layout, "%d `%s` line%s (%s)", count, word,
                                      count == 1 ? "" : "s", verb);
}

void page_elsewhere(struct layout *layout, const struct result *result)
{
    const struct circuit *circuit = result->circuit;
    const char *lines[] = {
        unanswered(layout, circuit->sweep_count, "sweep", "`ampstead sweep`"),
        unanswered(layout, circuit->condition_count, "vary", "`ampstead spread`"),
        unanswered(layout, circuit->choice_count, "choose", "`ampstead size`"),
    };
    const char *text = "";
    for (size_t k = 0; k < sizeof lines / sizeof lines[0]; k++) {
        text = layout_format(layout, "%s%s%s", text, *text != '\0' && *lines[k] != '\0' ? ", " : "",
                             lines[k]);
    }
    if (*text != '\0') {
        layout_part(layout, "elsewhere");
        layout_paragraph(layout, TONE_PLAIN, 0,
                         layout_format(layout, "this cell also has %s", text));
    }
}

void page_evidence(struct layout *layout, const struct result *result)
{
    const struct solver_result *solver = &result->point.solver;
    if (!solver->converged) {
        return;
    }
    layout_part(layout, "evidence");
    layout_paragraph(
        layout, TONE_PLAIN, 0,
        layout_format(layout, "%s, %d Newton iteration%s; worst residual %s of the currents%s%s",
                      solver->method, solver->iterations, solver->iterations == 1 ? "" : "s",
                      show_value(layout, solver->worst_residual, DIMENSION_NONE),
                      solver->worst_name != NULL ? " at " : "",
                      solver->worst_name != NULL ? layout_clean(layout, solver->worst_name) : ""));
    if (solver->limited_by != NULL) {
        layout_paragraph(layout, TONE_WARN, 0,
                         layout_format(layout, "above 1e-12 because of %s",
                                       layout_clean(layout, solver->limited_by)));
    }
}

/* page.c: the review page, its verdict, and what surrounds the figures. */
#include "report/page_parts.h"

#include <math.h>
#include <string.h>

#include "analyses/size.h"
#include "report/show.h"

/* Commands other than `review` may have nothing to judge; their word is that there is a point. */
static bool is_only_solved(const struct result *result)
{
    return result->verdict == VERDICT_NO_REQUIREMENTS && strcmp(result->command, "review") != 0;
}

/* Points of the sweeps, and how many of them have no operating point. */
static int lost_points(const struct result *result, int *all)
{
    int lost = 0;
    *all = 0;
    for (int k = 0; k < result->sweep_count; k++) {
        for (int s = 0; s < result->sweeps[k].series_count; s++) {
            lost += result->sweeps[k].series[s].lost;
            *all += result->sweeps[k].series[s].count;
        }
    }
    return lost;
}

const char *page_verdict_word(const struct layout *layout, const struct result *result)
{
    static const char *const words[] = {
        [VERDICT_MET] = "MET",
        [VERDICT_NOT_MET] = "NOT MET",
        [VERDICT_NO_REQUIREMENTS] = "NO VERDICT",
        [VERDICT_UNSOLVED] = "UNSOLVED",
    };
    if (layout->style.stopped) {
        return "STOPPED";
    }
    int all = 0;
    return !is_only_solved(result)         ? words[result->verdict]
           : lost_points(result, &all) > 0 ? "INCOMPLETE"
                                           : "SOLVED";
}

static enum tone verdict_tone(const struct layout *layout, const struct result *result)
{
    const enum verdict verdict = result->verdict;
    int all = 0;
    if (lost_points(result, &all) > 0) {
        return TONE_WARN;
    }
    if (layout->style.stopped || verdict == VERDICT_NOT_MET || verdict == VERDICT_UNSOLVED) {
        return TONE_BAD;
    }
    return verdict == VERDICT_MET ? TONE_GOOD : TONE_STRONG;
}

static int count_judged(const struct result *result, enum judgement judgement)
{
    int count = 0;
    for (int k = 0; k < result->requirement_count; k++) {
        count += result->requirements[k].judgement == judgement;
    }
    return count;
}

const char *page_verdict_reason(struct layout *layout, const struct result *result)
{
    int total = result->requirement_count, met = count_judged(result, JUDGED_MET);
    int open = count_judged(result, JUDGED_NOT);
    if (layout->style.stopped) {
        return "the work was stopped; what follows is what there was until then";
    }
    if (result->verdict == VERDICT_UNSOLVED) {
        return "no operating point was found, so there are no figures to judge";
    }
    if (result->size != NULL) {
        return result->size->solved
                   ? "all targets of the `choose` lines are met"
                   : "the `choose` lines have no solution inside their ranges; what follows is the "
                     "nearest to it";
    }
    if (result->verdict == VERDICT_NO_REQUIREMENTS) {
        int all = 0, lost = lost_points(result, &all);
        if (is_only_solved(result) && lost > 0) {
            return layout_format(layout, "%d of %d points of the sweep%s have no operating point",
                                 lost, all, result->sweep_count == 1 ? "" : "s");
        }
        return is_only_solved(result) ? ""
                                      : "the cell has no `require` line that can be judged here";
    }
    const char *rest = "";
    if (open > 0) {
        rest = layout_format(layout, "; %d more %s not judged by this command", open,
                             open == 1 ? "is" : "are");
    }
    int judged = total - open;
    if (met == judged) {
        return layout_format(
            layout, judged == 1 ? "%d requirement, and it holds%s" : "all %d requirements hold%s",
            judged, rest);
    }
    if (judged == 1) {
        return layout_format(layout, "the requirement is not met%s", rest);
    }
    return layout_format(layout, "%d of %d requirements %s%s", judged - met, judged,
                         judged - met == 1 ? "is not met" : "are not met", rest);
}

const char *page_conditions(struct layout *layout, const struct result *result)
{
    const struct circuit *circuit = result->circuit;
    const char *text =
        layout_format(layout, "%s, %s, %s", layout_clean(layout, circuit->cell->path),
                      result->view == VIEW_HAND ? "hand view" : "full view",
                      show_celsius(layout, result->kelvin));
    if (circuit->corner != NULL) {
        text = layout_format(layout, "%s, corner %s", text, layout_clean(layout, circuit->corner));
    }
    for (int k = 0; k < circuit->cell->process_count; k++) {
        const char *name = circuit->cell->processes[k].name;
        if (name != NULL && strcmp(name, circuit->cell->path) != 0) {
            text = layout_format(layout, "%s, %s", text, layout_clean(layout, name));
        }
    }
    for (int k = 0; k < circuit->let_count; k++) {
        if (circuit->lets[k].is_set) {
            text = layout_format(
                layout, "%s, %s = %s", text, circuit->lets[k].name,
                show_round(layout, circuit->lets[k].value.value, circuit->lets[k].value.dimension));
        }
    }
    return text;
}

/* The failed requirements once more, right under the verdict, at most three. */
static void name_failures(struct layout *layout, const struct result *result)
{
    enum { NAMED = 3 };
    int named = 0, left = 0;
    for (int k = 0; k < result->requirement_count; k++) {
        const struct requirement_result *row = &result->requirements[k];
        if (row->judgement != JUDGED_NOT_MET && row->judgement != JUDGED_UNKNOWN) {
            continue;
        }
        if (named == NAMED) {
            left++;
            continue;
        }
        named++;
        const char *value =
            row->requirement->scope == SCOPE_YIELD && row->yield != NULL
                ? yield_text(layout, row->yield)
            : row->judgement == JUDGED_UNKNOWN
                ? "it has no value"
                : layout_format(layout, "it is %s",
                                show_probe(layout, &row->requirement->probe, row->computed));
        layout_paragraph(
            layout, TONE_PLAIN, 2,
            layout_format(layout, "%s: %s", requirement_text(layout, row->requirement), value));
    }
    if (left > 0) {
        layout_paragraph(layout, TONE_PLAIN, 2, layout_format(layout, "and %d more", left));
    }
}

void page_verdict(struct layout *layout, const struct result *result)
{
    const char *title = layout_clean(layout, result->circuit->title);
    if (*title == '\0') {
        title = layout_clean(layout, result->circuit->cell->path);
    }
    const char *word = page_verdict_word(layout, result);
    int room = LAYOUT_MARGIN - text_width(word);
    struct buffer *out = layout->out;
    buffer_text(out, layout_tone(layout, verdict_tone(layout, result)));
    buffer_text(out, word);
    buffer_text(out, layout_tone(layout, TONE_PLAIN));
    buffer_repeat(out, ' ', room);
    buffer_text(out, layout_tone(layout, TONE_STRONG));
    buffer_text(out, layout_short(layout, title, layout->width));
    buffer_text(out, layout_tone(layout, TONE_PLAIN));
    buffer_text(out, "\n");
    layout->has_lines = true;
    const char *reason = page_verdict_reason(layout, result);
    if (*reason != '\0') {
        layout_paragraph(layout, TONE_PLAIN, 0, reason);
    }
    if (!layout->style.stopped && result->verdict != VERDICT_UNSOLVED) {
        name_failures(layout, result);
    }
    layout_paragraph(layout, TONE_QUIET, 0, page_conditions(layout, result));
}

void page_unsolved(struct layout *layout, const struct result *result)
{
    const struct solver_result *solver = &result->point.solver;
    if (solver->trouble != NULL) {
        layout_part(layout, "trouble");
        layout_paragraph(layout, TONE_PLAIN, 0, layout_clean(layout, solver->trouble));
    }
    if (solver->advice != NULL) {
        layout_part(layout, "look at");
        layout_paragraph(layout, TONE_PLAIN, 0, layout_clean(layout, solver->advice));
    }
    layout_part(layout, "search");
    const char *residual = "";
    if (isfinite(solver->worst_residual)) {
        residual = layout_format(
            layout, "; the best point left a residual of %s of the currents that meet%s%s",
            show_value(layout, solver->worst_residual, DIMENSION_NONE),
            solver->worst_name != NULL ? " at " : "",
            solver->worst_name != NULL ? layout_clean(layout, solver->worst_name) : "");
    }
    layout_paragraph(layout, TONE_PLAIN, 0,
                     layout_format(layout, "%d Newton iterations%s%s%s", solver->iterations,
                                   solver->method != NULL ? ", last by " : "",
                                   solver->method != NULL ? solver->method : "", residual));
}

void page_event(struct layout *layout, const struct sweep_event *event, struct dimension unit)
{
    layout_paragraph(layout, TONE_WARN, 4,
                     layout_format(layout, "! at %s: %s", show_value(layout, event->at, unit),
                                   layout_clean(layout, event->text)));
}

const char page_sign_off[] =
    "These figures are a model's. Before they are relied on, sign them off "
    "with the foundry's or the maker's own models and data.";

void page_closing(struct layout *layout)
{
    layout_part(layout, "sign-off");
    layout_paragraph(layout, TONE_QUIET, 0, page_sign_off);
}

void report_page(const struct result *result, const struct report_style *style, struct buffer *out)
{
    struct layout layout;
    if (!layout_begin(&layout, style, out)) {
        return;
    }
    page_verdict(&layout, result);
    if (result->point.solver.converged) {
        page_outputs(&layout, result);
        page_supply(&layout, result);
        page_devices(&layout, result);
        page_requirements(&layout, result);
        page_paper(&layout, result);
        page_states(&layout, result);
    } else if (!style->stopped) {
        page_unsolved(&layout, result);
    }
    page_cautions(&layout, result);
    page_elsewhere(&layout, result);
    page_evidence(&layout, result);
    page_closing(&layout);
    layout_end(&layout);
}

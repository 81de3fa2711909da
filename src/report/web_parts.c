/* web_parts.c: verdict, requirements, cautions, the cell and the evidence as HTML. */
#include <math.h>
#include <string.h>

#include "analyses/states.h"
#include "report/markup.h"
#include "report/page_parts.h"
#include "report/show.h"
#include "report/web.h"

void web_text(struct layout *layout, const char *text)
{
    markup_text(layout->out, text);
}

void web_heading(struct layout *layout, const char *id, const char *text)
{
    buffer_format(layout->out, "<h2 id=\"%s\">", id);
    web_text(layout, text);
    buffer_text(layout->out, "</h2>\n");
}

int web_line(const struct result *result, struct span where)
{
    const struct cell *cell = result->circuit->cell;
    return where.file == cell->tree.file ? source_line(&cell->sources, where) : 0;
}

const char *web_units(struct layout *layout, const char *shown)
{
    return markup_units(layout->arena, shown);
}

void web_paragraph(struct layout *layout, const char *classes, const char *text)
{
    buffer_text(layout->out, "<p");
    if (classes[0] != '\0') {
        buffer_format(layout->out, " class=\"%s\"", classes);
    }
    buffer_text(layout->out, ">");
    web_text(layout, text);
    buffer_text(layout->out, "</p>\n");
}

void web_verdict(struct layout *layout, const struct result *result)
{
    const char *title =
        result->circuit->title[0] != '\0' ? result->circuit->title : result->circuit->cell->path;
    bool is_bad = result->verdict == VERDICT_NOT_MET || result->verdict == VERDICT_UNSOLVED ||
                  layout->style.stopped;
    buffer_format(layout->out, "<h1><span class=\"verdict %s\">",
                  is_bad                           ? "bad"
                  : result->verdict == VERDICT_MET ? "good"
                                                   : "quiet");
    web_text(layout, page_verdict_word(layout, result));
    buffer_text(layout->out, "</span>");
    web_text(layout, title);
    buffer_text(layout->out, "</h1>\n<p>");
    web_text(layout, page_verdict_reason(layout, result));
    buffer_text(layout->out, "</p>\n<p class=\"quiet\">");
    web_text(layout, page_conditions(layout, result));
    buffer_text(layout->out, "</p>\n");
    const struct solver_result *solver = &result->point.solver;
    const char *const troubles[] = {solver->trouble, solver->advice};
    for (int k = 0; k < 2 && !solver->converged; k++) {
        if (troubles[k] != NULL) {
            buffer_text(layout->out, "<p>");
            web_text(layout, troubles[k]);
            buffer_text(layout->out, "</p>\n");
        }
    }
}

void web_requirements(struct layout *layout, const struct result *result)
{
    static const char *const heads[] = {"Requirement", "Verdict", "Computed", "Margin"};
    static const bool numbers[] = {false, false, true, false};
    struct web_table table;
    if (result->requirement_count == 0) {
        return;
    }
    web_heading(layout, "requirements", "Requirements");
    web_table_begin(&table, layout->out, "Each requirement with its line in the cell", heads,
                    numbers, 4);
    for (int k = 0; k < result->requirement_count; k++) {
        const struct requirement_result *row = &result->requirements[k];
        bool is_bad = row->judgement == JUDGED_NOT_MET || row->judgement == JUDGED_UNKNOWN;
        web_table_row(&table);
        web_table_name(&table, requirement_text(layout, row->requirement),
                       web_line(result, row->requirement->where));
        buffer_format(layout->out, "<td class=\"%s\"><strong>%s</strong></td>",
                      is_bad                         ? "bad"
                      : row->judgement == JUDGED_MET ? "good"
                                                     : "quiet",
                      judgement_text(row->judgement));
        web_table_value(
            &table, row->computed,
            row->judgement == JUDGED_UNKNOWN
                ? "no value"
                : web_units(layout, show_probe(layout, &row->requirement->probe, row->computed)));
        web_table_text(&table, web_units(layout, requirement_margin(layout, result, row)));
    }
    web_table_end(&table);
}

static void one_caution(struct layout *layout, const struct caution *caution)
{
    struct buffer *out = layout->out;
    buffer_text(out, "<li>");
    if (strncmp(caution->text, caution->thing, strlen(caution->thing)) != 0) {
        web_text(layout, caution->thing);
        buffer_text(out, ": ");
    }
    web_text(layout, caution->text);
    if (caution->line > 0) {
        buffer_format(out, ", <a href=\"#L%d\">line %d</a>", caution->line, caution->line);
    }
    buffer_text(out, "</li>\n");
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
void web_cautions(struct layout *layout, const struct result *result)
{
    const struct caution_list *cautions = &result->cautions;
    struct buffer *out = layout->out;
    if (cautions->count == 0 && cautions->silenced_count == 0) {
        return;
    }
    web_heading(layout, "cautions", "Cautions");
    for (int k = 0; k < cautions->count; k++) {
        const struct caution *first = &cautions->list[k];
        if (seen_before(cautions, k)) {
            continue;
        }
        buffer_text(out, "<p><code>");
        web_text(layout, first->code);
        buffer_text(out, "</code> <span class=\"quiet\">");
        web_text(layout, first->rule != NULL ? first->rule : "");
        buffer_text(out, "</span></p>\n<ul class=\"cautions\">\n");
        for (int m = k; m < cautions->count; m++) {
            if (strcmp(cautions->list[m].code, first->code) == 0) {
                one_caution(layout, &cautions->list[m]);
            }
        }
        buffer_text(out, "</ul>\n");
    }
    if (cautions->silenced_count > 0) {
        web_paragraph(layout, "quiet", "Silenced by `quiet` lines of the cell:");
        buffer_text(out, "<ul class=\"cautions quiet\" id=\"silenced\">\n");
        for (int k = 0; k < cautions->silenced_count; k++) {
            one_caution(layout, &cautions->silenced[k]);
        }
        buffer_text(out, "</ul>\n");
    }
}

void web_cell(struct layout *layout, const struct result *result)
{
    const struct cell *cell = result->circuit->cell;
    struct buffer *out = layout->out;
    if (cell->tree.file >= (uint32_t)cell->sources.count) {
        return;
    }
    const char *at = cell->sources.files[cell->tree.file].text;
    web_heading(layout, "cell", "The cell");
    buffer_text(out, "<ol class=\"cell\">\n");
    for (int line = 1; *at != '\0'; line++) {
        size_t length = strcspn(at, "\r\n");
        char *text = arena_copy(layout->arena, at, length);
        buffer_format(out, "<li id=\"L%d\">", line);
        web_text(layout, text == NULL ? "" : text);
        buffer_text(out, "</li>\n");
        at += length;
        at += *at == '\r';
        at += *at == '\n';
    }
    buffer_text(out, "</ol>\n");
}

void web_evidence(struct layout *layout, const struct result *result)
{
    const struct solver_result *solver = &result->point.solver;
    struct buffer *out = layout->out;
    web_heading(layout, "evidence", "Evidence");
    if (solver->converged) {
        buffer_text(out, "<p>");
        web_text(layout, layout_format(layout,
                                       "%s, %d Newton iterations; worst residual %s of the "
                                       "currents%s%s",
                                       solver->method, solver->iterations,
                                       show_value(layout, solver->worst_residual, DIMENSION_NONE),
                                       solver->worst_name != NULL ? " at " : "",
                                       solver->worst_name != NULL ? solver->worst_name : ""));
        buffer_text(out, "</p>\n");
    }
    buffer_text(out, "<p class=\"quiet\">");
    web_text(layout, page_sign_off);
    buffer_text(out, "</p>\n");
}

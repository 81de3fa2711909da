/*
 * web.c: the review as one HTML file without any outside resource: it opens from a disk, from an
 * attachment, and prints on A4.
 */
#include "report/web.h"

#include "report/markup.h"

/* Nothing is ever fetched; the page's own script and style are all that runs. */
static const char head_start[] =
    "<!DOCTYPE html>\n<html lang=\"en\">\n<head>\n<meta charset=\"utf-8\">\n"
    "<meta name=\"viewport\" content=\"width=device-width, initial-scale=1\">\n"
    "<meta name=\"color-scheme\" content=\"light dark\">\n"
    "<link rel=\"icon\" href=\"data:,\">\n"
    "<meta name=\"generator\" content=\"ampstead ";

static const char closed_policy[] =
    "<meta http-equiv=\"Content-Security-Policy\" content=\"default-src 'none'; "
    "style-src 'unsafe-inline'; script-src 'unsafe-inline'; img-src data:\">\n";

static void put_head(struct layout *layout, const struct result *result, const char *version)
{
    struct buffer *out = layout->out;
    const char *title = result->circuit->title;
    buffer_text(out, head_start);
    web_text(layout, version);
    buffer_text(out, "\">\n");
    buffer_text(out, closed_policy);
    buffer_text(out, "<title>");
    web_text(layout, title[0] != '\0' ? title : result->circuit->cell->path);
    buffer_text(out, "</title>\n<style>\n");
    buffer_text(out, web_style);
    buffer_text(out, "</style>\n</head>\n");
}

/* The more complete judgement leads: that of the spread, where there is one. */
static void put_parts(struct layout *layout, const struct web_results *results)
{
    const struct result *result = results->result;
    const struct result *judged = results->spread != NULL ? results->spread : result;
    buffer_text(layout->out,
                "<body>\n<a class=\"skip\" href=\"#cell\">Skip to the cell</a>\n<header>\n");
    web_verdict(layout, judged);
    buffer_text(layout->out, "</header>\n<main>\n");
    if (result->point.solver.converged) {
        web_requirements(layout, judged);
        web_outputs(layout, result);
        web_paper(layout, result);
        web_devices(layout, result);
        web_spread(layout, judged);
    }
    web_states(layout, results->states != NULL ? results->states : result);
    web_cautions(layout, judged);
    web_cell(layout, result);
    web_evidence(layout, result);
    buffer_text(layout->out, "</main>\n");
}

void report_web(const struct web_results *results, const struct report_style *style,
                const char *version, struct buffer *out)
{
    struct layout layout;
    if (!layout_begin(&layout, style, out)) {
        return;
    }
    put_head(&layout, results->result, version);
    put_parts(&layout, results);
    buffer_text(out, "<script>\n");
    buffer_text(out, web_script);
    buffer_text(out, "</script>\n</body>\n</html>\n");
    layout_end(&layout);
}

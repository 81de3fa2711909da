/*
 * report.h: results as text, JSON and CSV. Nothing here computes a result; a report reads one and
 * shows it.
 *
 * Every function appends to `out`; when memory is short out->failed is set and the text is of no
 * use. The same result gives the same bytes.
 */
#ifndef REPORT_REPORT_H
#define REPORT_REPORT_H

#include "analyses/result.h"
#include "base/buffer.h"

enum { REPORT_COLUMNS = 100, REPORT_COLUMNS_LEAST = 72 };

struct report_style {
    bool color;   /* with ANSI escapes (ECMA-48 SGR) */
    bool ascii;   /* without any character beyond ASCII */
    bool stopped; /* the run was stopped: the result is a part */
    int columns;  /* widest line; kept within REPORT_COLUMNS_LEAST .. REPORT_COLUMNS, 0: the latter
                   */
};

/* The review on one page: verdict, outputs, curves, devices, requirements, paper, cautions. */
void report_page(const struct result *result, const struct report_style *style, struct buffer *out);

/* The operating point alone: nodes, rails, and every quantity of every device. */
void report_point(const struct result *result, const struct report_style *style,
                  struct buffer *out);

/* The sweeps as tables. */
void report_sweep(const struct result *result, const struct report_style *style,
                  struct buffer *out);

/* Every resting state, the proof, and the start-up verdict. */
void report_states(const struct result *result, const struct report_style *style,
                   struct buffer *out);
/* Conditions, mismatch and yield. */
void report_spread(const struct result *result, const struct report_style *style,
                   struct buffer *out);
/* Shares of the effects in what differs from the paper. */
void report_explain(const struct result *result, const struct report_style *style,
                    struct buffer *out);

/* The chosen values and the preferred ones beside them. */
void report_size(const struct result *result, const struct report_style *style, struct buffer *out);

/* Ranked derivatives. */
void report_sensitivity(const struct result *result, const struct report_style *style,
                        struct buffer *out);

/* Every model value in force. */
void report_models(const struct circuit *circuit, const struct report_style *style,
                   struct buffer *out);

/* One JSON object and a line end; keys in docs/data.md. */
void report_json(const struct result *result, const char *version, struct buffer *out);
void report_json_models(const struct circuit *circuit, const char *version, struct buffer *out);

/*
 * report_csv: curves of the outputs (columns output, v in V and current in A), or, when the result
 * has sweeps, one row a point: the swept thing, the family, and each quantity with its SI unit in
 * the header; of a spread, one row a sample. RFC 4180: CRLF, quotes where needed. A value that does
 * not apply is empty.
 */
void report_csv(const struct result *result, struct buffer *out);

/* Curves and bars as one SVG document; nothing when the result has none. */
void report_plot(const struct result *result, struct buffer *out);

/* What a page shows: a result, and beside a review what other verbs found of the same cell; NULL:
 * nothing. */
struct web_results {
    const struct result *result, *spread, *states;
};

/* One self-contained HTML file. */
void report_web(const struct web_results *results, const struct report_style *style,
                const char *version, struct buffer *out);

#endif

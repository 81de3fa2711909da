/* csv_spread.c: the samples of a spread as CSV (RFC 4180), one row a sample. */
#include "report/csv_parts.h"

#include "analyses/spread_result.h"

void csv_samples(const struct result *result, struct buffer *out)
{
    static const char *const states[] = {
        [SAMPLE_OPEN] = "open",
        [SAMPLE_SOLVED] = "solved",
        [SAMPLE_SEARCHED] = "searched",
        [SAMPLE_FAILED] = "failed",
    };
    const struct mismatch_result *r = result->mismatch;
    buffer_text(out, "sample,state");
    for (int q = 0; q < r->quantity_count; q++) {
        buffer_text(out, ",");
        csv_heading(out, r->quantities[q].probe->text, r->quantities[q].probe->dimension);
    }
    buffer_text(out, "\r\n");
    for (int k = 0; k < r->wanted; k++) {
        if (r->states[k] == SAMPLE_OPEN) {
            continue;
        }
        buffer_format(out, "%d,%s", k, states[r->states[k]]);
        for (int q = 0; q < r->quantity_count; q++) {
            buffer_text(out, ",");
            csv_put_number(out, r->values[(size_t)k * (size_t)r->quantity_count + (size_t)q]);
        }
        buffer_text(out, "\r\n");
    }
}

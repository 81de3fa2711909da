/*
 * answer.c: texts that are handed out, and what is said when memory is short for them.
 */
#include "library/answer.h"

const char answer_short_memory[] = "ampstead: memory is short\n";

void answer_begin(struct buffer *buffer)
{
    buffer_free(buffer);
    *buffer = BUFFER_EMPTY;
}

const char *answer_end(const struct buffer *buffer, enum ampstead_status *status)
{
    if (buffer->failed) {
        *status = AMPSTEAD_MACHINE;
        return NULL;
    }
    return buffer->data == NULL ? "" : buffer->data;
}

const char *answer_messages(struct buffer *buffer, const char *trouble,
                            const struct diagnostics *diagnostics, const struct source_set *sources,
                            unsigned flags, enum ampstead_status *status)
{
    answer_begin(buffer);
    if (trouble != NULL) {
        buffer_format(buffer, "ampstead: %s\n", trouble);
    } else if (diagnostics != NULL) {
        diagnostics_print(diagnostics, sources, (flags & AMPSTEAD_COLOR) != 0, buffer);
    }
    if (*status == AMPSTEAD_MACHINE) {
        buffer_text(buffer, answer_short_memory);
    }
    const char *text = answer_end(buffer, status);
    return text == NULL ? answer_short_memory : text;
}

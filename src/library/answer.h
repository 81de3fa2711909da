/*
 * answer.h: texts that a result or a calibration hands out, each in a buffer that it keeps.
 */
#ifndef LIBRARY_ANSWER_H
#define LIBRARY_ANSWER_H

#include "base/buffer.h"
#include "base/diagnostic.h"
#include "library/ampstead.h"

/* Empties the buffer for a new text; what was handed out from it is gone. */
void answer_begin(struct buffer *buffer);

/* The finished text; NULL after a failed allocation, which is then the status too. */
const char *answer_end(const struct buffer *buffer, enum ampstead_status *status);

/*
 * answer_messages: what stderr is to show; never NULL.
 *
 * trouble      of the request, before anything was read; NULL: none
 * diagnostics  of what was read, with its sources; NULL: nothing was
 */
const char *answer_messages(struct buffer *buffer, const char *trouble,
                            const struct diagnostics *diagnostics, const struct source_set *sources,
                            unsigned flags, enum ampstead_status *status);

/* For a result that could not even be made. */
extern const char answer_short_memory[];

#endif

/* markup.h: text and numbers as XML and HTML want them. */
#ifndef REPORT_MARKUP_H
#define REPORT_MARKUP_H

#include "base/arena.h"
#include "base/buffer.h"

/* Text with & < > " ' escaped; control characters, which XML forbids, become spaces. */
void markup_text(struct buffer *out, const char *text);

/* A number with exactly `decimals` (0 to 12) digits behind the point, whatever the locale. */
void markup_fixed(struct buffer *out, double value, int decimals);

/* A number that reads back as the same double; "null" when it is not finite. */
void markup_number(struct buffer *out, double value);

/* A text as a JSON string, safe inside a <script> element. */
void markup_json(struct buffer *out, const char *text);

/* "343.7 Mohm" as "343.7 MΩ", "1.2 uA" as "1.2 µA": for values as show.h makes them. In the arena;
 * "" when memory is short. */
const char *markup_units(struct arena *arena, const char *value);

#endif

/*
 * buffer.h: a growing text. A failed allocation is remembered in `failed` and makes every later
 * call do nothing, so that a writer checks once at its end.
 */
#ifndef BASE_BUFFER_H
#define BASE_BUFFER_H

#include <stdbool.h>
#include <stddef.h>

struct buffer {
    char *data; /* NUL-terminated once anything was written; NULL before */
    size_t length;
    size_t capacity;
    bool failed;
};

#define BUFFER_EMPTY ((struct buffer){NULL, 0, 0, false})

void buffer_put(struct buffer *buffer, const char *text, size_t length);
void buffer_text(struct buffer *buffer, const char *text);
void buffer_format(struct buffer *buffer, const char *format, ...)
    __attribute__((format(printf, 2, 3)));
/* `count` copies of one character; a negative count is 0. */
void buffer_repeat(struct buffer *buffer, char character, int count);
void buffer_free(struct buffer *buffer);

#endif

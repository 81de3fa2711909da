/* buffer.c: a growing text. */
#include "base/buffer.h"

#include <stdarg.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* Room for `more` bytes and the NUL behind them; false (and `failed` set) when there is none. */
static bool reserve(struct buffer *buffer, size_t more)
{
    if (buffer->failed) {
        return false;
    }
    if (buffer->capacity - buffer->length > more) {
        return true;
    }
    size_t capacity = buffer->capacity < 256 ? 256 : buffer->capacity;
    while (capacity - buffer->length <= more) {
        if (capacity > SIZE_MAX / 2) {
            buffer->failed = true;
            return false;
        }
        capacity *= 2;
    }
    char *data = realloc(buffer->data, capacity);
    if (data == NULL) {
        buffer->failed = true;
        return false;
    }
    buffer->data = data;
    buffer->capacity = capacity;
    return true;
}

void buffer_put(struct buffer *buffer, const char *text, size_t length)
{
    if (!reserve(buffer, length)) {
        return;
    }
    if (length > 0) {
        memcpy(buffer->data + buffer->length, text, length);
    }
    buffer->length += length;
    buffer->data[buffer->length] = '\0';
}

void buffer_text(struct buffer *buffer, const char *text)
{
    buffer_put(buffer, text, strlen(text));
}

void buffer_format(struct buffer *buffer, const char *format, ...)
{
    va_list arguments;
    va_start(arguments, format);
    int length = vsnprintf(NULL, 0, format, arguments);
    va_end(arguments);
    if (length < 0) {
        buffer->failed = true;
        return;
    }
    if (!reserve(buffer, (size_t)length)) {
        return;
    }
    va_start(arguments, format);
    (void)vsnprintf(buffer->data + buffer->length, (size_t)length + 1, format, arguments);
    va_end(arguments);
    buffer->length += (size_t)length;
}

void buffer_repeat(struct buffer *buffer, char character, int count)
{
    size_t length = count > 0 ? (size_t)count : 0;
    if (!reserve(buffer, length)) {
        return;
    }
    memset(buffer->data + buffer->length, character, length);
    buffer->length += length;
    buffer->data[buffer->length] = '\0';
}

void buffer_free(struct buffer *buffer)
{
    free(buffer->data);
    *buffer = BUFFER_EMPTY;
}

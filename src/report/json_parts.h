/*
 * json_parts.h: what all JSON writers share: one key at a time. Private to report/json*.c.
 */
#ifndef REPORT_JSON_PARTS_H
#define REPORT_JSON_PARTS_H

#include <jansson.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "analyses/result.h"
#include "base/utf8.h"

/* The functions below add one key. A failed allocation marks the writer and the rest does nothing
 * harmful: jansson takes a NULL as a refusal. */
struct writer {
    bool failed;
};

static inline void put(struct writer *writer, json_t *object, const char *key, json_t *value)
{
    if (json_object_set_new(object, key, value) != 0) {
        writer->failed = true;
    }
}

static inline void append(struct writer *writer, json_t *array, json_t *value)
{
    if (json_array_append_new(array, value) != 0) {
        writer->failed = true;
    }
}

static inline void put_number(struct writer *writer, json_t *object, const char *key, double value)
{
    if (isfinite(value)) {
        put(writer, object, key, json_real(value));
    }
}

static inline bool is_utf8(const char *text)
{
    const size_t length = strlen(text);
    for (size_t at = 0; at < length;) {
        uint32_t character;
        const size_t bytes = utf8_decode(text + at, length - at, &character);
        if (bytes == 0) {
            return false;
        }
        at += bytes;
    }
    return true;
}

/* A string; NULL when memory is short. Of a text that is no UTF-8 (a file name may hold any bytes)
 * all that is not ASCII becomes '?'. */
static inline json_t *make_text(const char *text)
{
    if (is_utf8(text)) {
        return json_string(text);
    }
    const size_t size = strlen(text) + 1;
    char *plain = malloc(size);
    if (plain == NULL) {
        return NULL;
    }
    for (size_t k = 0; k < size; k++) {
        plain[k] = (char)((unsigned char)text[k] < 0x80 ? text[k] : '?');
    }
    json_t *value = json_string(plain);
    free(plain);
    return value;
}

static inline void put_text(struct writer *writer, json_t *object, const char *key,
                            const char *text)
{
    if (text != NULL) {
        put(writer, object, key, make_text(text));
    }
}

static inline void put_numbers(struct writer *writer, json_t *object, const char *key,
                               const double *values, int count, int stride)
{
    json_t *array = json_array();
    for (int k = 0; k < count; k++) {
        double value = values[k * stride];
        append(writer, array, isfinite(value) ? json_real(value) : json_null());
    }
    put(writer, object, key, array);
}

/* An object or array under a key; borrowed by the caller, NULL when memory is short. */
static inline json_t *put_object(struct writer *writer, json_t *object, const char *key)
{
    put(writer, object, key, json_object());
    return json_object_get(object, key);
}

static inline json_t *put_array(struct writer *writer, json_t *object, const char *key)
{
    put(writer, object, key, json_array());
    return json_object_get(object, key);
}

static inline json_t *append_object(struct writer *writer, json_t *array)
{
    append(writer, array, json_object());
    return json_array_get(array, json_array_size(array) - 1);
}

/* Conditions, drift, supply and mismatch of a spread; nothing for other results. */
void json_put_spread(struct writer *writer, json_t *root, const struct result *result);

/* What they say about one requirement: worst_at, yield. */
void json_put_spread_of(struct writer *writer, json_t *object, const struct result *result,
                        const struct requirement_result *row);

#endif

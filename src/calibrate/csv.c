/* csv.c: the fields of a line of comma-separated text. */
#include "calibrate/csv.h"

#include <math.h>
#include <string.h>

#include "base/quantity.h"

static bool is_blank(char c)
{
    return c == ' ' || c == '\t' || c == '\r';
}

static struct csv_field trimmed(const char *text, uint32_t begin, uint32_t end)
{
    while (begin < end && is_blank(text[begin])) {
        begin++;
    }
    while (end > begin && is_blank(text[end - 1])) {
        end--;
    }
    if (end - begin >= 2 && text[begin] == '"' && text[end - 1] == '"') {
        begin++;
        end--;
    }
    return (struct csv_field){begin, end};
}

static int split(const char *text, uint32_t begin, uint32_t end, struct csv_field *fields)
{
    int count = 0;
    bool quoted = false;
    uint32_t first = begin;
    for (uint32_t k = begin; k <= end; k++) {
        if (k < end && text[k] == '"') {
            quoted = !quoted;
        }
        if (k == end || (text[k] == ',' && !quoted)) {
            if (count < CSV_FIELD_LIMIT) {
                fields[count++] = trimmed(text, first, k);
            }
            first = k + 1;
        }
    }
    return count;
}

int csv_line(const struct source_file *file, uint32_t *at, struct csv_field fields[CSV_FIELD_LIMIT])
{
    while (*at < file->length) {
        uint32_t begin = *at, end = begin, first;
        while (end < file->length && file->text[end] != '\n') {
            end++;
        }
        *at = end < file->length ? end + 1 : end;
        for (first = begin; first < end && is_blank(file->text[first]); first++) {
        }
        if (first < end && file->text[first] != '#') {
            return split(file->text, begin, end, fields);
        }
    }
    return 0;
}

const char *csv_text(struct arena *arena, const struct source_file *file, struct csv_field field)
{
    return arena_copy(arena, file->text + field.begin, field.end - field.begin);
}

static char lower(char c)
{
    return c >= 'A' && c <= 'Z' ? (char)(c - 'A' + 'a') : c;
}

bool csv_is(const struct source_file *file, struct csv_field field, const char *word)
{
    uint32_t k = field.begin;
    for (; k < field.end && *word != '\0'; k++, word++) {
        if (lower(file->text[k]) != lower(*word)) {
            return false;
        }
    }
    return k == field.end && *word == '\0';
}

bool csv_number(const struct source_file *file, struct csv_field field, double *value)
{
    uint32_t k = field.begin;
    bool is_negative = k < field.end && file->text[k] == '-';
    if (k < field.end && (file->text[k] == '-' || file->text[k] == '+')) {
        k++;
    }
    /* a fraction without its leading zero is usual in exported files */
    size_t used = 0;
    if (k < field.end && file->text[k] == '.') {
        char padded[64] = "0";
        size_t length = field.end - k;
        if (length + 2 > sizeof padded) {
            return false;
        }
        memcpy(padded + 1, file->text + k, length);
        used = number_parse(padded, length + 1, value);
        used = used > 1 ? used - 1 : 0;
    } else {
        used = number_parse(file->text + k, field.end - k, value);
    }
    if (used == 0 || k + used != field.end || !isfinite(*value)) {
        return false;
    }
    *value = is_negative ? -*value : *value;
    return true;
}

/* markup.c: text and numbers as XML and HTML want them. */
#include "report/markup.h"

#include <math.h>
#include <string.h>

#include "base/quantity.h"

void markup_text(struct buffer *out, const char *text)
{
    /* NULL: memory was short, which the arena tells at the end */
    for (const char *at = text; at != NULL && *at != '\0'; at++) {
        switch (*at) {
        case '&':
            buffer_text(out, "&amp;");
            break;
        case '<':
            buffer_text(out, "&lt;");
            break;
        case '>':
            buffer_text(out, "&gt;");
            break;
        case '"':
            buffer_text(out, "&quot;");
            break;
        case '\'':
            buffer_text(out, "&#39;");
            break;
        default:
            if ((unsigned char)*at < 0x20 || *at == 0x7f) {
                buffer_text(out, " ");
            } else {
                buffer_put(out, at, 1);
            }
        }
    }
}

void markup_fixed(struct buffer *out, double value, int decimals)
{
    long long unit = 1;
    for (int k = 0; k < decimals; k++) {
        unit *= 10;
    }
    if (!(fabs(value) * (double)unit < 9e17)) {
        buffer_text(out, "0");
        return;
    }
    long long scaled = llround(value * (double)unit);
    long long size = scaled < 0 ? -scaled : scaled;
    buffer_format(out, "%s%lld", scaled < 0 ? "-" : "", size / unit);
    if (decimals > 0) {
        buffer_format(out, ".%0*lld", decimals, size % unit);
    }
}

void markup_number(struct buffer *out, double value)
{
    char text[40];
    if (!isfinite(value)) {
        buffer_text(out, "null");
        return;
    }
    number_exact(value, text, sizeof text);
    buffer_text(out, text);
}

void markup_json(struct buffer *out, const char *text)
{
    buffer_text(out, "\"");
    for (const char *at = text; at != NULL && *at != '\0'; at++) { /* NULL as above */
        unsigned char c = (unsigned char)*at;
        if (c < 0x20 || c == '"' || c == '\\' || c == '<' || c == '>' || c == '&' || c == 0x7f) {
            buffer_format(out, "\\u%04x", c);
        } else {
            buffer_put(out, at, 1);
        }
    }
    buffer_text(out, "\"");
}

const char *markup_units(struct arena *arena, const char *value)
{
    static const char micro[] = "\xC2\xB5", omega[] = "\xCE\xA9";
    char *text = arena_array(arena, 2 * strlen(value) + 1, 1);
    char *to = text;
    if (text == NULL) {
        return "";
    }
    for (const char *at = value; *at != '\0';) {
        bool after_space = at > value && at[-1] == ' ';
        if (strncmp(at, "ohm", 3) == 0) {
            memcpy(to, omega, 2);
            to += 2;
            at += 3;
        } else if (after_space && at[0] == 'u' && at[1] != '\0' &&
                   strchr("AVWSKmo", at[1]) != NULL) {
            memcpy(to, micro, 2);
            to += 2;
            at++;
        } else {
            *to++ = *at++;
        }
    }
    return text;
}

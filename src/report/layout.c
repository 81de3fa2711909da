/* layout.c: lines with a margin, tones, and text measured in characters. */
#include "report/layout.h"

#include <stdarg.h>
#include <string.h>

bool layout_begin(struct layout *layout, const struct report_style *style, struct buffer *out)
{
    *layout = (struct layout){.out = out, .style = *style};
    int columns = style->columns;
    if (columns == 0 || columns > REPORT_COLUMNS) {
        columns = REPORT_COLUMNS;
    } else if (columns < REPORT_COLUMNS_LEAST) {
        columns = REPORT_COLUMNS_LEAST;
    }
    layout->width = columns - LAYOUT_MARGIN;
    layout->arena = arena_create();
    if (layout->arena == NULL) {
        out->failed = true;
        return false;
    }
    return true;
}

void layout_end(struct layout *layout)
{
    if (arena_failed(layout->arena)) {
        layout->out->failed = true;
    }
    arena_destroy(layout->arena);
    layout->arena = NULL;
}

void layout_part(struct layout *layout, const char *label)
{
    layout->label = label;
}

static bool is_continuation(char byte)
{
    return ((unsigned char)byte & 0xC0u) == 0x80u;
}

int text_width(const char *text)
{
    int width = 0;
    for (; *text != '\0'; text++) {
        if (!is_continuation(*text)) {
            width++;
        }
    }
    return width;
}

/* Writes the margin: the waiting label on the first line of a part, else spaces. */
static void write_margin(struct layout *layout)
{
    struct buffer *out = layout->out;
    if (layout->label == NULL) {
        buffer_repeat(out, ' ', LAYOUT_MARGIN);
        return;
    }
    if (layout->has_lines) {
        buffer_text(out, "\n");
    }
    buffer_text(out, layout_tone(layout, TONE_QUIET));
    buffer_text(out, layout->label);
    buffer_text(out, layout_tone(layout, TONE_PLAIN));
    buffer_repeat(out, ' ', LAYOUT_MARGIN - text_width(layout->label));
    layout->label = NULL;
}

void layout_line(struct layout *layout, enum tone tone, const char *text)
{
    write_margin(layout);
    if (tone == TONE_PLAIN) {
        buffer_text(layout->out, text);
    } else {
        buffer_text(layout->out, layout_tone(layout, tone));
        buffer_text(layout->out, text);
        buffer_text(layout->out, layout_tone(layout, TONE_PLAIN));
    }
    buffer_text(layout->out, "\n");
    layout->has_lines = true;
}

void layout_gap(struct layout *layout)
{
    if (layout->label == NULL && layout->has_lines) {
        buffer_text(layout->out, "\n");
    }
}

size_t text_break(const char *text, int width, const char **next)
{
    size_t at = 0, last_space = 0;
    int characters = 0;
    while (text[at] != '\0') {
        if (!is_continuation(text[at])) {
            if (characters == width) {
                break;
            }
            characters++;
        }
        if (text[at] == ' ') {
            last_space = at;
        }
        at++;
    }
    size_t length = at;
    if (text[at] != '\0' && text[at] != ' ' && last_space > 0) {
        length = last_space;
    }
    const char *rest = text + length;
    while (*rest == ' ') {
        rest++;
    }
    *next = rest;
    while (length > 0 && text[length - 1] == ' ') {
        length--;
    }
    return length;
}

void layout_paragraph(struct layout *layout, enum tone tone, int hang, const char *text)
{
    int indent = 0;
    do {
        const char *next;
        size_t length = text_break(text, layout->width - indent, &next);
        layout_line(layout, tone, layout_format(layout, "%*s%.*s", indent, "", (int)length, text));
        text = next;
        indent = hang;
    } while (*text != '\0');
}

const char *layout_format(struct layout *layout, const char *format, ...)
{
    va_list arguments;
    va_start(arguments, format);
    const char *text = arena_format_list(layout->arena, format, arguments);
    va_end(arguments);
    return text == NULL ? "" : text;
}

const char *layout_clean(struct layout *layout, const char *text)
{
    if (text == NULL) {
        return "";
    }
    size_t length = strlen(text), used = 0;
    char *clean = arena_copy(layout->arena, text, length);
    if (clean == NULL) {
        return "";
    }
    for (size_t k = 0; k < length; k++) {
        unsigned char byte = (unsigned char)text[k];
        if (byte < 0x20 || byte == 0x7F) {
            clean[used++] = ' ';
        } else if (byte == 0xC2 && (unsigned char)text[k + 1] < 0xA0) {
            clean[used++] = ' '; /* U+0080 to U+009F, the second set of controls */
            k++;
        } else if (byte < 0x80 || !layout->style.ascii) {
            clean[used++] = text[k];
        } else if (!is_continuation(text[k])) {
            clean[used++] = '?';
        }
    }
    clean[used] = '\0';
    return clean;
}

/* Byte offset of character number `index`. */
static size_t character_offset(const char *text, int index)
{
    size_t at = 0;
    for (int seen = 0; text[at] != '\0'; at++) {
        if (!is_continuation(text[at]) && seen++ == index) {
            break;
        }
    }
    return at;
}

const char *layout_short(struct layout *layout, const char *text, int limit)
{
    const char *clean = layout_clean(layout, text);
    int width = text_width(clean);
    if (width <= limit) {
        return clean;
    }
    const char *dots = layout->style.ascii ? ".." : "\xE2\x80\xA6";
    int room = limit - text_width(dots);
    size_t head = character_offset(clean, room / 2);
    size_t tail = character_offset(clean, width - (room - room / 2));
    return layout_format(layout, "%.*s%s%s", (int)head, clean, dots, clean + tail);
}

const char *layout_tone(const struct layout *layout, enum tone tone)
{
    static const char *const escapes[] = {
        [TONE_PLAIN] = "\033[0m",   [TONE_STRONG] = "\033[1m", [TONE_QUIET] = "\033[2m",
        [TONE_GOOD] = "\033[1;32m", [TONE_BAD] = "\033[1;31m", [TONE_WARN] = "\033[33m",
    };
    return layout->style.color ? escapes[tone] : "";
}

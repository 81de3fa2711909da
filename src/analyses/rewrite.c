/*
 * rewrite.c: the text of a cell with chosen values in place of what is written there.
 */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "analyses/size.h"

/* Bytes begin..end of the cell's text become `text`. */
struct edit {
    uint32_t begin, end;
    const char *text;
};

static bool lies_in(struct span inner, struct span outer)
{
    return inner.file == outer.file && inner.begin >= outer.begin && inner.end <= outer.end;
}

/* The statement of the cell's top level that a place lies in; NULL: in a block or another file. */
static const struct statement *statement_at(const struct tree *tree, struct span where)
{
    for (int k = 0; k < tree->count; k++) {
        const struct statement *it = tree->statements[k];
        if (lies_in(where, it->span) && it->kind != STATEMENT_BLOCK && it->kind != STATEMENT_USE) {
            return it;
        }
    }
    return NULL;
}

static const struct expression *assigned(const struct statement *it, const char *key)
{
    for (int k = 0; k < it->assignment_count; k++) {
        if (strcmp(it->assignments[k].key.text, key) == 0) {
            return it->assignments[k].value;
        }
    }
    return NULL;
}

/* Where the value of a part's parameter stands; a parameter that was left out is added at the end
 * of its line. */
static bool place_value(const struct circuit *c, const struct knob *knob, struct edit *edit,
                        const char **before)
{
    const struct instance *instance = &c->instances[knob->instance];
    const struct statement *it = statement_at(&c->cell->tree, instance->where);
    if (it == NULL) {
        return false;
    }
    const char *name = instance->type->parameters[knob->parameter].name;
    const struct expression *e = it->kind == STATEMENT_OUTPUT ? it->at
                                 : knob->parameter == instance->type->value_parameter
                                     ? it->value
                                     : assigned(it, name);
    *edit = e != NULL ? (struct edit){e->span.begin, e->span.end, NULL}
                      : (struct edit){it->span.end, it->span.end, NULL};
    *before = e != NULL ? "" : name;
    return true;
}

static bool place_let(const struct circuit *c, const struct knob *knob, struct edit *edit)
{
    const struct statement *it = statement_at(&c->cell->tree, c->lets[knob->parameter].where);
    if (it == NULL || it->value == NULL) {
        return false;
    }
    *edit = (struct edit){it->value->span.begin, it->value->span.end, NULL};
    return true;
}

static bool place_temperature(const struct circuit *c, uint32_t length, struct edit *edit,
                              const char **before)
{
    *edit = (struct edit){length, length, NULL};
    *before = "temperature";
    for (int k = 0; k < c->cell->tree.count; k++) {
        const struct statement *it = c->cell->tree.statements[k];
        if (it->kind == STATEMENT_TEMPERATURE && it->value != NULL) {
            *edit = (struct edit){it->value->span.begin, it->value->span.end, NULL};
            *before = "";
        }
    }
    return true;
}

/* Nine digits without zeros at the end, in the language's own units. */
static const char *value_text(double value, struct dimension dimension, struct arena *arena)
{
    char unit[40], text[80];
    dimension_unit(dimension, unit, sizeof unit);
    number_show(value, 9, unit, text, sizeof text);
    char *digits = text;
    const size_t whole = strcspn(digits, " e");
    size_t last = whole;
    if (memchr(digits, '.', whole) != NULL) {
        while (last > 0 && digits[last - 1] == '0') {
            last--;
        }
        last -= last > 0 && digits[last - 1] == '.';
    }
    return arena_format(arena, "%.*s%s", (int)last, digits, digits + whole);
}

static int by_place(const void *a, const void *b)
{
    const uint32_t x = ((const struct edit *)a)->begin, y = ((const struct edit *)b)->begin;
    return x < y ? -1 : x > y ? 1 : 0;
}

static bool make_edit(const struct circuit *c, const struct choice *choice, double value,
                      uint32_t length, struct arena *arena, struct edit *edit)
{
    const char *before = "";
    const struct knob *knob = &choice->knob;
    const bool found = knob->kind == KNOB_VALUE ? place_value(c, knob, edit, &before)
                       : knob->kind == KNOB_LET ? place_let(c, knob, edit)
                                                : place_temperature(c, length, edit, &before);
    if (!found) {
        diagnostics_add(
            &c->cell->diagnostics, choice->where, "make it a let of the cell and choose that",
            "%s cannot be written: its value stands in a block or in another file", knob->name);
        return false;
    }
    const char *text = value_text(value, knob->dimension, arena);
    const bool is_line = strcmp(before, "temperature") == 0;
    edit->text = text == NULL || *before == '\0' ? text
                 : is_line                       ? arena_format(arena, "\n%s %s\n", before, text)
                                                 : arena_format(arena, " %s=%s", before, text);
    return edit->text != NULL;
}

const char *size_rewrite(const struct circuit *c, const double *values, struct arena *arena)
{
    const struct source_file *file = &c->cell->sources.files[c->cell->tree.file];
    struct edit *edits = arena_new_array(arena, struct edit, c->choice_count);
    struct buffer out = BUFFER_EMPTY;
    bool good = edits != NULL;
    for (int k = 0; good && k < c->choice_count; k++) {
        good = make_edit(c, &c->choices[k], values[k], file->length, arena, &edits[k]);
    }
    if (!good) {
        return NULL;
    }
    qsort(edits, (size_t)c->choice_count, sizeof *edits, by_place);
    uint32_t at = 0;
    for (int k = 0; k < c->choice_count; k++) {
        buffer_put(&out, file->text + at, edits[k].begin - at);
        buffer_text(&out, edits[k].text);
        at = edits[k].end;
    }
    buffer_put(&out, file->text + at, file->length - at);
    const char *kept = out.failed ? NULL : arena_copy(arena, out.data, out.length);
    buffer_free(&out);
    return kept;
}

/*
 * json_remedies.c: what explain, size, sensitivity and the repairs found, for json.c.
 */
#include "report/json_remedies.h"

#include <math.h>

/* Adds a key; a NULL value marks the object as failed. A number that is not finite has no key. */
static void put(bool *good, json_t *object, const char *key, json_t *value)
{
    *good = json_object_set_new(object, key, value) == 0 && *good;
}

static void number(bool *good, json_t *object, const char *key, double value)
{
    if (isfinite(value)) {
        put(good, object, key, json_real(value));
    }
}

static void text(bool *good, json_t *object, const char *key, const char *value)
{
    if (value != NULL) {
        put(good, object, key, json_string(value));
    }
}

/* The value, or nothing at all. */
static json_t *finished(bool good, json_t *value)
{
    if (!good) {
        json_decref(value);
        return NULL;
    }
    return value;
}

json_t *json_shares(const struct explanation *e)
{
    json_t *array = json_array();
    bool good = array != NULL;
    for (int k = 0; k < e->share_count && good; k++) {
        json_t *row = json_object();
        text(&good, row, "effect", e->shares[k].effect);
        number(&good, row, "share", e->shares[k].share);
        text(&good, row, "sentence", e->shares[k].sentence);
        good = json_array_append_new(array, row) == 0 && good;
    }
    return finished(good, array);
}

json_t *json_hand(const struct explanation *e)
{
    json_t *object = json_object();
    bool good = object != NULL;
    text(&good, object, "quantity", e->hand->probe.text);
    text(&good, object, "as", e->as_conductance ? "conductance" : NULL);
    number(&good, object, "hand", e->paper);
    number(&good, object, "square_law", e->hand_view);
    number(&good, object, "computed", e->computed);
    number(&good, object, "difference", e->computed - e->paper);
    text(&good, object, "trouble", e->trouble);
    text(&good, object, "note", e->note);
    text(&good, object, "first_with", e->first_with);
    put(&good, object, "shares", json_shares(e));
    return finished(good, object);
}

json_t *json_repairs(const struct repair_list *repairs)
{
    json_t *array = json_array();
    bool good = array != NULL;
    for (int k = 0; k < repairs->count && good; k++) {
        const struct repair *it = &repairs->list[k];
        json_t *row = json_object();
        text(&good, row, "parameter", it->parameter);
        number(&good, row, "from", it->from);
        number(&good, row, "to", it->to);
        number(&good, row, "change", it->change);
        text(&good, row, "breaks", it->breaks);
        good = json_array_append_new(array, row) == 0 && good;
    }
    return finished(good, array);
}

static json_t *preferred(const struct size_result *size, int choice)
{
    json_t *object = json_object();
    bool good = object != NULL;
    for (int r = 0; r < size->rounding_count && good; r++) {
        const struct rounding *it = &size->roundings[r];
        json_t *row = json_object();
        number(&good, row, "value", it->values[choice]);
        number(&good, row, "reached", it->reached[choice]);
        put(&good, object, it->name, row);
    }
    return finished(good, object);
}

json_t *json_choices(const struct size_result *size)
{
    json_t *object = json_object();
    bool good = object != NULL;
    for (int k = 0; k < size->count && good; k++) {
        const struct chosen *it = &size->list[k];
        json_t *row = json_object();
        number(&good, row, "before", it->before);
        number(&good, row, "value", it->value);
        text(&good, row, "quantity", it->choice->probe.text);
        number(&good, row, "target", it->choice->value);
        number(&good, row, "reached", it->reached);
        text(&good, row, "stopped_by",
             size->solved || it->bound == BOUND_NONE ? NULL
             : it->bound == BOUND_FROM               ? "from"
                                                     : "to");
        if (size->rounding_count > 0) {
            put(&good, row, "preferred", preferred(size, k));
        }
        put(&good, object, it->choice->knob.name, row);
    }
    return finished(good, object);
}

json_t *json_sensitivities(const struct sensitivity_table *tables, int count)
{
    json_t *array = json_array();
    bool good = array != NULL;
    for (int t = 0; t < count && good; t++) {
        for (int k = 0; k < tables[t].row_count && good; k++) {
            const struct sensitivity_row *it = &tables[t].rows[k];
            json_t *row = json_object();
            text(&good, row, "quantity", tables[t].probe.text);
            text(&good, row, "parameter", it->parameter);
            number(&good, row, "value", it->value);
            number(&good, row, "relative", it->relative);
            number(&good, row, "absolute", it->absolute);
            good = json_array_append_new(array, row) == 0 && good;
        }
    }
    return finished(good, array);
}

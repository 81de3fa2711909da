/* part.c: parts of the samples of a spread, as text and joined. */
#include "library/part.h"

#include <limits.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "analyses/reading.h"
#include "library/ampstead.h"

static const char magic[] = "ampstead-part 1";
static const char state_letters[] = {[SAMPLE_OPEN] = '-',
                                     [SAMPLE_SOLVED] = 's',
                                     [SAMPLE_SEARCHED] = 'c', /* from cold */
                                     [SAMPLE_FAILED] = 'f'};

enum { VALUE_DIGITS = 16 };

bool part_parse(const char *text, int *number, int *parts)
{
    char *end;
    if (text[0] < '1' || text[0] > '9') {
        return false;
    }
    const long first = strtol(text, &end, 10);
    if (*end != '/' || end[1] < '1' || end[1] > '9') {
        return false;
    }
    const long second = strtol(end + 1, &end, 10);
    if (*end != '\0' || second > 1000000 || first > second) {
        return false;
    }
    *number = (int)first;
    *parts = (int)second;
    return true;
}

void part_range(int samples, int number, int parts, int *first, int *count)
{
    const long long before = (long long)samples * (number - 1) / parts;
    *first = (int)before;
    *count = (int)((long long)samples * number / parts - before);
}

static void mix(uint64_t *hash, const char *bytes, size_t length)
{
    for (size_t k = 0; k < length; k++) {
        *hash = (*hash ^ (unsigned char)bytes[k]) * 0x100000001b3u;
    }
}

uint64_t part_fingerprint(const struct cell *cell)
{
    uint64_t hash = 0xcbf29ce484222325u;
    for (int k = 0; k < cell->sources.count; k++) {
        const struct source_file *source = &cell->sources.files[k];
        mix(&hash, source->text, source->length);
        mix(&hash, "", 1); /* where a text ends counts */
    }
    return hash;
}

/* --- writing ------------------------------------------------------------------------------------
 */

static void put_line(struct buffer *out, const char *word, const char *value)
{
    if (value != NULL) {
        buffer_format(out, "%s %s\n", word, value);
    }
}

/* Sixteen digits: the bits of the double, whatever the locale. */
static void put_value(struct buffer *out, double value)
{
    static const char digits[] = "0123456789abcdef";
    char text[VALUE_DIGITS];
    uint64_t bits;
    memcpy(&bits, &value, sizeof bits);
    for (int k = VALUE_DIGITS - 1; k >= 0; k--, bits >>= 4) {
        text[k] = digits[bits & 15];
    }
    buffer_put(out, text, sizeof text);
}

static void put_sample(const struct part *p, int k, struct buffer *out)
{
    buffer_put(out, &state_letters[p->states[k]], 1);
    buffer_text(out, " ");
    for (int q = 0; q < p->requirement_count; q++) {
        buffer_text(out,
                    p->met[(size_t)k * (size_t)p->requirement_count + (size_t)q] != 0 ? "1" : "0");
    }
    buffer_text(out, p->requirement_count == 0 ? "-" : "");
    for (int q = 0; q < p->quantity_count; q++) {
        buffer_text(out, " ");
        put_value(out, p->values[(size_t)k * (size_t)p->quantity_count + (size_t)q]);
    }
    buffer_text(out, "\n");
}

void part_write(const struct part *p, struct buffer *out)
{
    buffer_format(out, "%s\n", magic);
    put_line(out, "version", p->version);
    put_line(out, "cell", p->cell);
    buffer_format(out, "fingerprint %08lx%08lx\n", (unsigned long)(p->fingerprint >> 32),
                  (unsigned long)(p->fingerprint & 0xffffffffu));
    put_line(out, "view", p->view);
    put_line(out, "corner", p->corner);
    put_line(out, "temperature", p->temperature);
    for (int k = 0; k < p->set_count; k++) {
        put_line(out, "set", p->sets[k]);
    }
    buffer_format(out, "seed %llu\nsamples %d\npart %d/%d\nfirst %d\ncount %d\n",
                  (unsigned long long)p->seed, p->samples, p->number, p->parts, p->first, p->count);
    put_line(out, "lanes", p->lanes);
    buffer_format(out, "quantities %d\nrequirements %d\n", p->quantity_count, p->requirement_count);
    for (int k = 0; k < p->count; k++) {
        put_sample(p, k, out);
    }
    buffer_format(out, "end %d\n", p->count);
}

/* --- reading ------------------------------------------------------------------------------------
 */

/* The text from here on. */
struct reader {
    const char *at, *end;
    struct arena *arena;
    bool failed; /* memory */
};

/* The next line without its end; NULL: there is none. */
static const char *next_line(struct reader *r, size_t *length)
{
    const char *line = r->at;
    const char *stop = line == r->end ? NULL : memchr(line, '\n', (size_t)(r->end - line));
    if (stop == NULL) {
        return NULL;
    }
    r->at = stop + 1;
    *length = (size_t)(stop - line);
    if (*length > 0 && line[*length - 1] == '\r') {
        --*length;
    }
    return line;
}

static bool read_whole(const char *text, int base, unsigned long long most,
                       unsigned long long *value)
{
    char *end;
    if (text[0] == '\0' || text[0] == '-' || text[0] == '+' || text[0] == ' ') {
        return false;
    }
    *value = strtoull(text, &end, base);
    return *end == '\0' && *value <= most;
}

static bool read_int(const char *text, int *value)
{
    unsigned long long found;
    const bool good = read_whole(text, 10, INT_MAX, &found);
    *value = good ? (int)found : 0;
    return good;
}

static bool read_fingerprint(const char *text, uint64_t *value)
{
    unsigned long long found;
    const bool good = read_whole(text, 16, UINT64_MAX, &found);
    *value = good ? found : 0;
    return good;
}

static bool read_seed(const char *text, uint64_t *value)
{
    unsigned long long found;
    const bool good = read_whole(text, 10, UINT64_MAX, &found);
    *value = good ? found : 0;
    return good;
}

/* One line of the heading. */
static bool read_heading(struct part *p, const char **sets, const char *word, const char *value)
{
    const struct {
        const char *word;
        const char **text;
        int *number;
    } rows[] = {
        {"version", &p->version, NULL},
        {"cell", &p->cell, NULL},
        {"view", &p->view, NULL},
        {"corner", &p->corner, NULL},
        {"lanes", &p->lanes, NULL},
        {"temperature", &p->temperature, NULL},
        {"samples", NULL, &p->samples},
        {"first", NULL, &p->first},
        {"count", NULL, &p->count},
        {"quantities", NULL, &p->quantity_count},
        {"requirements", NULL, &p->requirement_count},
    };
    for (size_t k = 0; k < sizeof rows / sizeof rows[0]; k++) {
        if (strcmp(rows[k].word, word) == 0) {
            if (rows[k].text != NULL) {
                *rows[k].text = value;
                return true;
            }
            return read_int(value, rows[k].number);
        }
    }
    if (strcmp(word, "set") == 0) {
        sets[p->set_count++] = value;
        return true;
    }
    return strcmp(word, "fingerprint") == 0 ? read_fingerprint(value, &p->fingerprint)
           : strcmp(word, "seed") == 0      ? read_seed(value, &p->seed)
           : strcmp(word, "part") == 0      ? part_parse(value, &p->number, &p->parts)
                                            : false;
}

/* All lines up to "requirements". False: a line is none of a heading, or memory is short. */
static bool read_headings(struct reader *r, struct part *p)
{
    enum { SET_LIMIT = 1000 };
    const char **sets = arena_new_array(r->arena, const char *, SET_LIMIT + 1);
    p->sets = sets;
    if (sets == NULL) {
        r->failed = true;
        return false;
    }
    for (;;) {
        size_t length;
        const char *line = next_line(r, &length);
        const char *space = line == NULL ? NULL : memchr(line, ' ', length);
        if (space == NULL || p->set_count >= SET_LIMIT) {
            return false;
        }
        const char *word = arena_copy(r->arena, line, (size_t)(space - line));
        const char *value = arena_copy(r->arena, space + 1, length - (size_t)(space + 1 - line));
        if (word == NULL || value == NULL) {
            r->failed = true;
            return false;
        }
        if (!read_heading(p, sets, word, value)) {
            return false;
        }
        if (strcmp(word, "requirements") == 0) {
            return true;
        }
    }
}

static bool read_value(const char *at, double *value)
{
    uint64_t bits = 0;
    for (int k = 0; k < VALUE_DIGITS; k++) {
        const char c = at[k];
        if (!(c >= '0' && c <= '9') && !(c >= 'a' && c <= 'f')) {
            return false;
        }
        bits = bits << 4 | (uint64_t)(c <= '9' ? c - '0' : c - 'a' + 10);
    }
    memcpy(value, &bits, sizeof *value);
    return true;
}

static bool read_sample(const char *at, const char *end, const struct part *p, int k,
                        struct sample_rows *rows)
{
    const size_t asked = (size_t)p->requirement_count, flags = asked == 0 ? 1 : asked;
    const char *letter = end - at < 2 ? NULL : memchr(state_letters, at[0], sizeof state_letters);
    if (letter == NULL || at[0] == '-' || at[1] != ' ' || (size_t)(end - at) < 2 + flags) {
        return false;
    }
    rows->states[k] = (unsigned char)(letter - state_letters);
    at += 2;
    for (size_t q = 0; q < flags; q++, at++) {
        if (asked == 0 ? *at != '-' : *at != '0' && *at != '1') {
            return false;
        }
        if (asked > 0) {
            rows->met[(size_t)k * asked + q] = *at == '1';
        }
    }
    for (int q = 0; q < p->quantity_count; q++) {
        double *value = &rows->values[(size_t)k * (size_t)p->quantity_count + (size_t)q];
        if (end - at < 1 + VALUE_DIGITS || *at != ' ' || !read_value(at + 1, value)) {
            return false;
        }
        at += 1 + VALUE_DIGITS;
    }
    return at == end;
}

static bool rows_create(struct arena *arena, int count, int quantities, int requirements,
                        struct sample_rows *rows)
{
    const size_t n = (size_t)count;
    rows->values = arena_new_array(arena, double, n *(size_t)quantities);
    rows->met = arena_new_array(arena, unsigned char, n *(size_t)requirements);
    rows->states = arena_new_array(arena, unsigned char, n);
    return rows->values != NULL && rows->met != NULL && rows->states != NULL;
}

/* Whether the heading is that of a part; the sizes are those of real lines. */
static bool is_whole(const struct part *p, size_t left)
{
    int first = 0, count = 0;
    if (p->version == NULL || p->cell == NULL || p->view == NULL || p->lanes == NULL ||
        p->parts == 0) {
        return false;
    }
    part_range(p->samples, p->number, p->parts, &first, &count);
    return p->first == first && p->count == count && (size_t)p->count <= left &&
           (size_t)p->quantity_count <= left && (size_t)p->requirement_count <= left &&
           (size_t)p->count * ((size_t)p->quantity_count + (size_t)p->requirement_count) <= left;
}

const char *part_read(const char *text, size_t length, struct arena *arena, struct part *p,
                      enum status *status)
{
    struct reader r = {text, text + length, arena, false};
    size_t size;
    const char *line = next_line(&r, &size);
    *status = STATUS_INPUT;
    *p = (struct part){.name = p->name};
    if (line == NULL || size != sizeof magic - 1 || memcmp(line, magic, size) != 0) {
        return "is no part of a spread: `ampstead spread --part 1/2 --write FILE` writes one";
    }
    const bool has_heading = read_headings(&r, p);
    if (r.failed) {
        *status = STATUS_MEMORY;
        return NULL;
    }
    if (!has_heading || !is_whole(p, (size_t)(r.end - r.at))) {
        return "has a damaged heading";
    }
    struct sample_rows rows;
    if (!rows_create(arena, p->count, p->quantity_count, p->requirement_count, &rows)) {
        *status = STATUS_MEMORY;
        return NULL;
    }
    for (int k = 0; k < p->count; k++) {
        line = next_line(&r, &size);
        if (line == NULL || !read_sample(line, line + size, p, k, &rows)) {
            return "has a damaged sample";
        }
    }
    char wanted[24];
    (void)snprintf(wanted, sizeof wanted, "end %d", p->count);
    line = next_line(&r, &size);
    if (line == NULL || size != strlen(wanted) || memcmp(line, wanted, size) != 0 ||
        r.at != r.end) {
        return "does not end where it should";
    }
    p->values = rows.values;
    p->states = rows.states;
    p->met = rows.met;
    *status = STATUS_OK;
    return NULL;
}

/* --- joining ------------------------------------------------------------------------------------
 */

static bool same_text(const char *a, const char *b)
{
    return a == NULL || b == NULL ? a == b : strcmp(a, b) == 0;
}

static bool same_sets(const struct part *a, const struct part *b)
{
    bool same = a->set_count == b->set_count;
    for (int k = 0; same && k < a->set_count; k++) {
        same = strcmp(a->sets[k], b->sets[k]) == 0;
    }
    return same;
}

/* In what a part is not of the run of the first; NULL: it is. */
static const char *difference(const struct part *a, const struct part *b)
{
    return !same_text(a->version, b->version)           ? "version of ampstead"
           : !same_text(a->cell, b->cell)               ? "cell"
           : a->fingerprint != b->fingerprint           ? "content of the cell or of its process"
           : !same_text(a->view, b->view)               ? "--view"
           : !same_text(a->corner, b->corner)           ? "--corner"
           : !same_text(a->temperature, b->temperature) ? "--temperature"
           : !same_sets(a, b)                           ? "--set"
           : a->seed != b->seed                         ? "--seed"
           : a->samples != b->samples                   ? "--samples"
           : a->parts != b->parts                       ? "number of parts"
           : a->quantity_count != b->quantity_count || a->requirement_count != b->requirement_count
               ? "number of quantities"
               : NULL;
}

static bool check(const struct part *parts, int count, const struct part **by_number,
                  struct buffer *trouble)
{
    for (int k = 0; k < count; k++) {
        const struct part *p = &parts[k];
        const char *other = difference(&parts[0], p);
        if (other != NULL) {
            buffer_format(trouble, "%s: is of another run than %s: the %s differs", p->name,
                          parts[0].name, other);
            return false;
        }
        if (by_number[p->number - 1] != NULL) {
            buffer_format(trouble, "%s: is part %d/%d, and so is %s", p->name, p->number, p->parts,
                          by_number[p->number - 1]->name);
            return false;
        }
        by_number[p->number - 1] = p;
    }
    int missing = 0, first = 0;
    for (int k = parts[0].parts - 1; k >= 0; k--) {
        if (by_number[k] == NULL) {
            missing++;
            first = k + 1;
        }
    }
    if (missing > 0) {
        buffer_format(trouble, "%d of %d parts %s missing: part %d/%d", missing, parts[0].parts,
                      missing == 1 ? "is" : "are", first, parts[0].parts);
        buffer_text(trouble, missing == 1 ? "" : " is the first");
        return false;
    }
    return true;
}

enum status part_join(const struct part *parts, int count, struct arena *arena,
                      struct sample_rows *rows, struct buffer *trouble)
{
    const struct part *run = &parts[0];
    const size_t quantities = (size_t)run->quantity_count;
    const size_t requirements = (size_t)run->requirement_count;
    const struct part **by_number = arena_new_array(arena, const struct part *, run->parts);
    if (by_number == NULL) {
        return STATUS_MEMORY;
    }
    if (!check(parts, count, by_number, trouble)) {
        return STATUS_INPUT;
    }
    if (!rows_create(arena, run->samples, run->quantity_count, run->requirement_count, rows)) {
        return STATUS_MEMORY;
    }
    for (int k = 0; k < run->parts; k++) {
        const struct part *p = by_number[k];
        const size_t first = (size_t)p->first, n = (size_t)p->count;
        memcpy(rows->values + first * quantities, p->values, n * quantities * sizeof *rows->values);
        memcpy(rows->met + first * requirements, p->met, n * requirements);
        memcpy(rows->states + first, p->states, n);
    }
    return STATUS_OK;
}

/* --- a merge ------------------------------------------------------------------------------------
 */

static enum status read_parts(const struct ampstead_request *request, const char *version,
                              struct parts *parts)
{
    for (int k = 0; k < request->part_count; k++) {
        const struct ampstead_part *given = &request->parts[k];
        struct part *part = &parts->list[k];
        enum status status;
        part->name = arena_copy(parts->arena, given->name, strlen(given->name));
        if (part->name == NULL) {
            return STATUS_MEMORY;
        }
        const char *wrong = part_read(given->text, given->length, parts->arena, part, &status);
        if (wrong != NULL) {
            buffer_format(&parts->trouble, "%s: %s", part->name, wrong);
        }
        if (status != STATUS_OK) {
            return status;
        }
        if (strcmp(part->version, version) != 0) {
            buffer_format(&parts->trouble, "%s: was made by version %s, and this is %s", part->name,
                          part->version, version);
            return STATUS_INPUT;
        }
    }
    return STATUS_OK;
}

enum status parts_join(const struct ampstead_request *request, const char *version,
                       struct parts *parts, struct ampstead_request *whole)
{
    parts->arena = arena_create();
    parts->list = parts->arena == NULL
                      ? NULL
                      : arena_new_array(parts->arena, struct part, request->part_count);
    if (parts->list == NULL) {
        return STATUS_MEMORY;
    }
    enum status status = read_parts(request, version, parts);
    if (status == STATUS_OK) {
        status = part_join(parts->list, request->part_count, parts->arena, &parts->rows,
                           &parts->trouble);
    }
    if (status != STATUS_OK) {
        return parts->trouble.failed ? STATUS_MEMORY : status;
    }
    const struct part *run = &parts->list[0];
    parts->count = request->part_count;
    for (int k = 1; k < parts->count; k++) {
        if (!same_text(run->lanes, parts->list[k].lanes)) {
            parts->note = "the parts were solved with different vector instructions: the last "
                          "digits may differ from those of one run";
        }
    }
    whole->path = run->cell;
    whole->view = strcmp(run->view, "hand") == 0 ? AMPSTEAD_VIEW_HAND : AMPSTEAD_VIEW_FULL;
    whole->corner = run->corner;
    whole->temperature = run->temperature;
    whole->sets = run->sets;
    whole->set_count = run->set_count;
    whole->seed = run->seed;
    whole->samples = run->samples;
    return STATUS_OK;
}

enum status parts_check(struct parts *parts, const struct cell *cell, const struct circuit *circuit)
{
    const struct part *run = &parts->list[0];
    struct reading_list list;
    if (!reading_list_make(&list, circuit, READING_ALL, parts->arena)) {
        return STATUS_MEMORY;
    }
    if (run->fingerprint != part_fingerprint(cell) || run->quantity_count != list.probe_count ||
        run->requirement_count != circuit->requirement_count) {
        buffer_format(&parts->trouble, "%s: is of another content of %s or of its process",
                      run->name, run->cell);
        return parts->trouble.failed ? STATUS_MEMORY : STATUS_INPUT;
    }
    return STATUS_OK;
}

void parts_free(struct parts *parts)
{
    buffer_free(&parts->trouble);
    arena_destroy(parts->arena);
}

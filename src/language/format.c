/*
 * format.c: statements cut into segments, and segments into columns.
 *
 *     nmos      M1    d=ref  g=ref  s=gnd  W=10u  L=4u
 *     |         |     |      |      ... further segments, aligned in a run of lines of one word
 *     |         name, aligned in a group (no blank line between)
 *     statement word, as wide as the widest of the file
 */
#include "language/format.h"

#include <string.h>

#include "language/lexer.h"

/* WORD_LEAST: as wide as "resistor", so that most cells have the same columns. */
enum { INDENT = 4, GAP = 2, WORD_LEAST = 8 };

enum item_kind { ITEM_BLANK, ITEM_COMMENT, ITEM_CODE };

/* How a statement is cut. */
enum shape {
    SHAPE_LINE,   /* one segment: let, block, model, corner, end */
    SHAPE_TEXT,   /* word and text: title, process */
    SHAPE_VALUE,  /* "name = value" in a model or corner */
    SHAPE_EQUAL,  /* word, name, "= value": hand */
    SHAPE_PHRASE, /* cut before "from", "at", "within", ... */
    SHAPE_PART    /* cut before keys, after the name and after an arrow */
};

static const struct {
    const char *word;
    enum shape shape;
} shapes[] = {
    {"let", SHAPE_LINE},         {"block", SHAPE_LINE},       {"model", SHAPE_LINE},
    {"corner", SHAPE_LINE},      {"end", SHAPE_LINE},         {"quiet", SHAPE_PART},
    {"title", SHAPE_TEXT},       {"process", SHAPE_TEXT},     {"hand", SHAPE_EQUAL},
    {"output", SHAPE_PHRASE},    {"sweep", SHAPE_PHRASE},     {"require", SHAPE_PHRASE},
    {"vary", SHAPE_PHRASE},      {"choose", SHAPE_PHRASE},    {"valid", SHAPE_LINE},
    {"temperature", SHAPE_LINE}, {"measured_at", SHAPE_LINE},
};

static const char *const phrase_words[] = {"at",  "from", "within", "points", "show",
                                           "for", "so",   "below",  "above",  "everywhere"};

struct segment {
    const char *text;
    int width;        /* characters */
    bool after_break; /* begins a continued line */
    bool narrow;      /* one space before it instead of two */
};

struct item {
    enum item_kind kind;
    enum shape shape;
    int depth;
    const char *raw;  /* ITEM_CODE: as it was; ITEM_COMMENT: the comment */
    const char *word; /* the first word */
    struct segment *segments;
    int segment_count;
    bool is_broken;      /* has a continued line */
    const char *comment; /* behind the code; NULL: none */
    int group;           /* items with the same number stand together */
    int columns[2];      /* widths of word and name column */
    int *widths;         /* [segment_count] columns of the other segments */
    int comment_column;  /* 0: two spaces behind the code */
};

struct formatter {
    struct arena *arena;
    const char *text;
    struct item *items;
    int count, capacity, group;
    int depth;
    bool in_values; /* inside model or corner */
    bool failed;
};

static bool is_blank(char c)
{
    return c == ' ' || c == '\t' || c == '\r';
}

static int characters(const char *text)
{
    int count = 0;
    for (; *text != '\0'; text++) {
        count += ((unsigned char)*text & 0xC0u) != 0x80u;
    }
    return count;
}

static const char *trimmed(struct formatter *f, uint32_t begin, uint32_t end)
{
    while (begin < end && (is_blank(f->text[begin]) || f->text[begin] == '\n')) {
        begin++;
    }
    while (end > begin && (is_blank(f->text[end - 1]) || f->text[end - 1] == '\n')) {
        end--;
    }
    const char *copy = arena_copy(f->arena, f->text + begin, end - begin);
    f->failed = f->failed || copy == NULL;
    return copy == NULL ? "" : copy;
}

static struct item *add_item(struct formatter *f, enum item_kind kind)
{
    struct item *items = arena_grow(f->arena, f->items, f->count, &f->capacity, sizeof *items);
    if (items == NULL) {
        f->failed = true;
        return NULL;
    }
    f->items = items;
    items[f->count] = (struct item){.kind = kind, .depth = f->depth, .group = f->group};
    return &items[f->count++];
}

/* Blank lines and whole-line comments between two statements. */
static void add_gap(struct formatter *f, uint32_t begin, uint32_t end, bool at_end)
{
    while (begin < end) {
        const char *newline = memchr(f->text + begin, '\n', end - begin);
        uint32_t stop = newline == NULL ? end : (uint32_t)(newline - f->text);
        const char *line = trimmed(f, begin, stop);
        begin = newline == NULL ? end : stop + 1;
        if (line[0] == '#') {
            struct item *item = add_item(f, ITEM_COMMENT);
            if (item != NULL) {
                item->raw = line;
            }
        } else if (line[0] == '\0' && (newline != NULL || at_end) && f->count > 0 &&
                   f->items[f->count - 1].kind != ITEM_BLANK) {
            (void)add_item(f, ITEM_BLANK);
            f->group++;
        }
    }
}

static bool is_symbol(const struct token *token, char symbol)
{
    return token->kind == TOKEN_SYMBOL && token->symbol == symbol;
}

static bool is_assign(const struct token *token)
{
    return is_symbol(token, '=') || is_symbol(token, 'a') || is_symbol(token, 'm');
}

static bool is_phrase_word(const struct token *token)
{
    for (size_t k = 0; k < sizeof phrase_words / sizeof phrase_words[0]; k++) {
        if (token->kind == TOKEN_NAME && strcmp(token->text, phrase_words[k]) == 0) {
            return true;
        }
    }
    return false;
}

static enum shape shape_of(const struct formatter *f, const struct token *first)
{
    if (f->in_values && strcmp(first->text, "end") != 0) {
        return SHAPE_VALUE;
    }
    for (size_t k = 0; k < sizeof shapes / sizeof shapes[0]; k++) {
        if (strcmp(first->text, shapes[k].word) == 0) {
            return shapes[k].shape;
        }
    }
    return SHAPE_PART;
}

static bool has_newline(const struct formatter *f, const struct token *tokens, int k)
{
    return memchr(f->text + tokens[k - 1].end, '\n', tokens[k].begin - tokens[k - 1].end) != NULL;
}

/* Whether token k begins a segment; `inside` counts open parentheses before it. */
static bool begins_segment(const struct lexer *lexer, enum shape shape, int k, int inside)
{
    const struct token *tokens = lexer->tokens;
    /* what stood together stays together: the code of `quiet mirror-length` */
    bool is_glued = k > 0 && tokens[k].begin == tokens[k - 1].end && !is_assign(&tokens[k]);
    if (inside > 0 || is_glued) {
        return false;
    }
    switch (shape) {
    case SHAPE_VALUE:
        return is_assign(&tokens[k]);
    case SHAPE_TEXT:
        return k == 1;
    case SHAPE_EQUAL:
        return k == 1 || (k == 2 && is_assign(&tokens[k]));
    case SHAPE_PHRASE:
        return k == 1 || is_phrase_word(&tokens[k]);
    case SHAPE_PART:
        return k <= 2 || (tokens[k].kind == TOKEN_NAME && is_assign(&tokens[k + 1])) ||
               (k >= 2 && is_symbol(&tokens[k - 2], '>'));
    default: /* SHAPE_LINE */
        return false;
    }
}

/* Spaces between two tokens of one segment: none, one, or what was there (at most one). */
static bool has_space(const struct token *left, const struct token *right, bool glues_keys)
{
    if (is_assign(left) || is_assign(right)) {
        return !glues_keys;
    }
    if (is_symbol(left, '>') || is_symbol(right, '>') || is_symbol(left, ',')) {
        return true;
    }
    if (is_symbol(right, ',') || is_symbol(right, ')') || is_symbol(left, '(')) {
        return false;
    }
    return right->begin > left->end;
}

/* Cuts the line of the lexer into the item's segments. */
static void cut(struct formatter *f, const struct lexer *lexer, struct item *item)
{
    const struct token *tokens = lexer->tokens;
    int count = lexer->count - 1, inside = 0;
    /* a law's "i = ..." is an equation; everything else of a part is a key */
    bool glues_keys = (item->shape == SHAPE_PART && strcmp(item->word, "law") != 0) ||
                      strcmp(item->word, "block") == 0;
    struct buffer text = BUFFER_EMPTY;
    item->segments = arena_new_array(f->arena, struct segment, count);
    item->widths = arena_new_array(f->arena, int, count);
    if (item->segments == NULL || item->widths == NULL) {
        f->failed = true;
        return;
    }
    for (int k = 0; k < count; k++) {
        bool breaks = k > 0 && has_newline(f, tokens, k);
        struct segment *segment = &item->segments[item->segment_count];
        if (k > 0 && !breaks && !begins_segment(lexer, item->shape, k, inside)) {
            buffer_text(&text, has_space(&tokens[k - 1], &tokens[k], glues_keys) ? " " : "");
            segment--;
        } else {
            buffer_free(&text);
            text = BUFFER_EMPTY;
            item->segment_count++;
            segment->after_break = breaks;
            segment->narrow = is_assign(&tokens[k]) || item->shape == SHAPE_TEXT;
            item->is_broken = item->is_broken || breaks;
        }
        inside += is_symbol(&tokens[k], '(') - is_symbol(&tokens[k], ')');
        buffer_put(&text, f->text + tokens[k].begin, tokens[k].end - tokens[k].begin);
        segment->text = text.failed ? NULL : arena_copy(f->arena, text.data, text.length);
        f->failed = f->failed || segment->text == NULL;
        segment->width = segment->text == NULL ? 0 : characters(segment->text);
    }
    buffer_free(&text);
}

/* The statement that the lexer has just read. */
static void add_code(struct formatter *f, const struct lexer *lexer)
{
    const struct token *first = &lexer->tokens[0], *last = &lexer->tokens[lexer->count - 2];
    bool is_end = first->kind == TOKEN_NAME && strcmp(first->text, "end") == 0 && lexer->count == 2;
    if (is_end && f->depth > 0) {
        f->depth--;
        f->in_values = false;
        f->group++;
    }
    struct item *item = add_item(f, ITEM_CODE);
    if (item == NULL) {
        return;
    }
    const char *comment = memchr(f->text + last->end, '#', lexer->at - last->end);
    uint32_t end = comment == NULL ? last->end : (uint32_t)(comment - f->text);
    item->word = first->kind == TOKEN_NAME ? first->text : "";
    item->shape = first->kind == TOKEN_NAME ? shape_of(f, first) : SHAPE_LINE;
    item->raw = trimmed(f, first->begin, end);
    item->comment = comment == NULL ? NULL : trimmed(f, end, lexer->at);
    cut(f, lexer, item);
    bool opens_values = strcmp(item->word, "model") == 0 || strcmp(item->word, "corner") == 0;
    if (item->shape == SHAPE_LINE && (opens_values || strcmp(item->word, "block") == 0)) {
        f->depth++;
        f->in_values = opens_values;
        f->group++;
    }
}

static bool is_columned(const struct item *item)
{
    return item->kind == ITEM_CODE &&
           (item->shape == SHAPE_PHRASE || item->shape == SHAPE_PART || item->shape == SHAPE_EQUAL);
}

/* Width of the word column at a depth: that of the widest word of the whole file. */
static int word_width(const struct formatter *f, int depth)
{
    int width = depth == 0 ? WORD_LEAST : 0;
    for (int k = 0; k < f->count; k++) {
        const struct item *item = &f->items[k];
        if (is_columned(item) && item->depth == depth && item->segment_count > 1 &&
            item->segments[0].width > width) {
            width = item->segments[0].width;
        }
    }
    return width;
}

static bool is_like(const struct item *a, const struct item *b)
{
    return b->kind == ITEM_CODE && a->group == b->group && a->shape == b->shape &&
           strcmp(a->word, b->word) == 0 && !b->is_broken;
}

/* Items from `from` on that stand together. */
static int group_end(const struct formatter *f, int from)
{
    int end = from;
    while (end < f->count && f->items[end].group == f->items[from].group &&
           f->items[end].kind != ITEM_BLANK) {
        end++;
    }
    return end;
}

static void align_names(struct formatter *f, int from, int end)
{
    int name = 0, word = 0;
    for (int k = from; k < end; k++) {
        const struct item *item = &f->items[k];
        bool has_names = item->kind == ITEM_CODE && item->segment_count > 2;
        if (has_names && is_columned(item) && item->segments[1].width > name) {
            name = item->segments[1].width;
        }
        bool has_word = item->kind == ITEM_CODE && item->segment_count > 1 &&
                        (item->shape == SHAPE_TEXT || item->shape == SHAPE_VALUE);
        if (has_word && item->segments[0].width > word) {
            word = item->segments[0].width;
        }
    }
    for (int k = from; k < end; k++) {
        struct item *item = &f->items[k];
        item->columns[0] = is_columned(item) ? word_width(f, item->depth) : word;
        item->columns[1] = name;
    }
}

static int widest_segment(const struct formatter *f, int from, int end, int s)
{
    int width = 0;
    for (int k = from; k < end; k++) {
        const struct item *item = &f->items[k];
        if (s < item->segment_count && item->segments[s].width > width) {
            width = item->segments[s].width;
        }
    }
    return width;
}

static void align_runs(struct formatter *f, int from, int end)
{
    for (int k = from; k < end;) {
        struct item *first = &f->items[k];
        int stop = k + 1;
        while (first->kind == ITEM_CODE && !first->is_broken && stop < end &&
               is_like(first, &f->items[stop])) {
            stop++;
        }
        for (int i = k; first->kind == ITEM_CODE && !first->is_broken && i < stop; i++) {
            for (int s = 2; s < f->items[i].segment_count; s++) {
                f->items[i].widths[s] = widest_segment(f, k, stop, s);
            }
        }
        k = stop;
    }
}

/* Column widths of each segment; the last one is never padded. */
static int segment_column(const struct item *item, int s)
{
    return s < 2 ? item->columns[s] : item->widths[s];
}

/* One statement without its comment. Returns the characters of its last line. */
static int write_code(const struct item *item, struct buffer *out)
{
    int at = item->depth * INDENT;
    buffer_repeat(out, ' ', at);
    for (int s = 0; s < item->segment_count; s++) {
        const struct segment *segment = &item->segments[s];
        if (segment->after_break) {
            buffer_text(out, " \\\n");
            at = (item->depth + 1) * INDENT + INDENT;
            buffer_repeat(out, ' ', at);
        } else if (s > 0) {
            int column = segment_column(item, s - 1), own = item->segments[s - 1].width;
            int spaces = (column > own ? column - own : 0) + (segment->narrow ? 1 : GAP);
            buffer_repeat(out, ' ', spaces);
            at += spaces;
        }
        buffer_text(out, segment->text);
        at += segment->width;
    }
    return at;
}

static bool same_token(const struct token *a, const struct token *b)
{
    bool same_text = (a->text == NULL) == (b->text == NULL) &&
                     (a->text == NULL || strcmp(a->text, b->text) == 0);
    return a->kind == b->kind && a->symbol == b->symbol && same_text &&
           /* to the bit: NOLINTNEXTLINE(bugprone-suspicious-memory-comparison) */
           memcmp(&a->number.value, &b->number.value, sizeof a->number.value) == 0 &&
           dimension_equal(a->number.dimension, b->number.dimension) &&
           a->number.bare == b->number.bare && a->number.celsius == b->number.celsius;
}

static void start_on(struct lexer *lexer, struct arena *arena, struct source_file *file,
                     const char *text)
{
    *file = (struct source_file){"", text, (uint32_t)strlen(text)};
    struct source_set sources = {file, 1, 1};
    lexer_start(lexer, arena, &sources, 0);
}

/* Whether two texts hold the same tokens in one line. */
static bool reads_the_same(struct formatter *f, const char *left, const char *right)
{
    struct lexer a, b;
    struct source_file left_file, right_file;
    start_on(&a, f->arena, &left_file, left);
    start_on(&b, f->arena, &right_file, right);
    bool same = lexer_next_line(&a) && lexer_next_line(&b) && a.count == b.count &&
                a.error.text == NULL && b.error.text == NULL;
    for (int k = 0; same && k < a.count; k++) {
        same = same_token(&a.tokens[k], &b.tokens[k]);
    }
    return same && !lexer_next_line(&b);
}

/* Makes the text of every statement final, and lines up the comments behind a run of them. */
static void settle(struct formatter *f)
{
    int *width = arena_new_array(f->arena, int, f->count);
    f->failed = f->failed || width == NULL;
    for (int k = 0; k < f->count && !f->failed; k++) {
        struct item *item = &f->items[k];
        if (item->kind != ITEM_CODE) {
            continue;
        }
        struct buffer line = BUFFER_EMPTY;
        width[k] = write_code(item, &line);
        const char *text = line.failed ? NULL : arena_copy(f->arena, line.data, line.length);
        buffer_free(&line);
        f->failed = f->failed || text == NULL;
        const bool same = text != NULL && reads_the_same(f, item->raw, text);
        item->raw = same ? text : item->raw; /* else it stays as it was */
        item->is_broken = item->is_broken || !same;
    }
    for (int k = 0; k < f->count && !f->failed;) {
        int end = k, widest = 0;
        while (end < f->count && f->items[end].comment != NULL && !f->items[end].is_broken) {
            widest = width[end] > widest ? width[end] : widest;
            end++;
        }
        for (int i = k; i < end; i++) {
            f->items[i].comment_column = widest - width[i];
        }
        k = end > k ? end : k + 1;
    }
}

static void write_items(const struct formatter *f, struct buffer *out)
{
    int count = f->count;
    while (count > 0 && f->items[count - 1].kind == ITEM_BLANK) {
        count--;
    }
    for (int k = 0; k < count; k++) {
        const struct item *item = &f->items[k];
        if (item->kind == ITEM_COMMENT) {
            buffer_repeat(out, ' ', item->depth * INDENT);
            buffer_text(out, item->raw);
        } else if (item->kind == ITEM_CODE) {
            buffer_text(out, item->raw);
            if (item->comment != NULL) {
                buffer_repeat(out, ' ', item->comment_column + GAP);
                buffer_text(out, item->comment);
            }
        }
        buffer_text(out, "\n");
    }
}

enum status format_source(struct arena *arena, const struct source_set *sources, uint32_t file,
                          struct buffer *out)
{
    struct formatter f = {.arena = arena, .text = sources->files[file].text};
    struct lexer lexer;
    uint32_t done = 0;
    lexer_start(&lexer, arena, sources, file);
    while (!f.failed && lexer_next_line(&lexer)) {
        if (lexer.error.text != NULL || lexer.count < 2) {
            break; /* the text was not read without errors */
        }
        add_gap(&f, done, lexer.tokens[0].begin, false);
        add_code(&f, &lexer);
        done = lexer.at;
    }
    add_gap(&f, done, sources->files[file].length, true);
    for (int k = 0; k < f.count && !f.failed;) {
        int end = group_end(&f, k);
        align_names(&f, k, end);
        align_runs(&f, k, end);
        k = end > k ? end : k + 1;
    }
    settle(&f);
    write_items(&f, out);
    /* the arena remembers also what only one line was refused, which would stay as it was */
    const bool is_short = f.failed || lexer.out_of_memory || out->failed || arena_failed(arena);
    return is_short ? STATUS_MEMORY : STATUS_OK;
}

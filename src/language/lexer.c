/* lexer.c: characters to tokens. */
#include "language/lexer.h"

#include <math.h>
#include <string.h>

#include "base/utf8.h"
#include "language/expression_unit.h"

static bool is_digit(char c)
{
    return c >= '0' && c <= '9';
}

static bool is_letter(char c)
{
    return (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') || c == '_';
}

static bool is_blank(char c)
{
    return c == ' ' || c == '\t';
}

/* The byte at an offset, NUL past the end. */
static char byte_at(const struct lexer *lexer, uint32_t at)
{
    return at < lexer->length ? lexer->text[at] : '\0';
}

void lexer_start(struct lexer *lexer, struct arena *arena, const struct source_set *sources,
                 uint32_t file)
{
    *lexer = (struct lexer){.arena = arena, .file = file, .line = 1};
    lexer->text = sources->files[file].text;
    lexer->length = sources->files[file].length;
}

/* Notes an error and returns false. `text` comes from the arena: NULL means no memory. */
static bool fail(struct lexer *lexer, uint32_t begin, uint32_t end, const char *hint,
                 const char *text)
{
    if (text == NULL) {
        lexer->out_of_memory = true;
    } else if (lexer->error.text == NULL) {
        lexer->error = (struct lexer_error){{lexer->file, begin, end}, text, hint};
    }
    return false;
}

/* A string in the arena, or NULL with out_of_memory set. */
static const char *copy(struct lexer *lexer, uint32_t begin, uint32_t end)
{
    const char *text = arena_copy(lexer->arena, lexer->text + begin, end - begin);
    if (text == NULL) {
        lexer->out_of_memory = true;
    }
    return text;
}

/* Bytes of a mu, omega or degree sign at `at`, which units may hold; 0 when there is none. */
static uint32_t unit_sign(const struct lexer *lexer, uint32_t at)
{
    static const char *const signs[] = {"\xC2\xB5", "\xCE\xBC", "\xCE\xA9", "\xE2\x84\xA6",
                                        "\xC2\xB0"};
    for (size_t i = 0; i < sizeof signs / sizeof signs[0]; i++) {
        size_t size = strlen(signs[i]);
        if (lexer->length - at >= size && memcmp(lexer->text + at, signs[i], size) == 0) {
            return (uint32_t)size;
        }
    }
    return 0;
}

/* End of the run of letters, digits and unit signs that begins at `at`. */
static uint32_t word_end(const struct lexer *lexer, uint32_t at)
{
    while (at < lexer->length) {
        uint32_t sign = unit_sign(lexer, at);
        if (sign == 0 && !is_letter(lexer->text[at]) && !is_digit(lexer->text[at])) {
            break;
        }
        at += sign > 0 ? sign : 1;
    }
    return at;
}

/* The same for what stands behind a number, where a per cent sign is a word of its own. */
static uint32_t unit_word_end(const struct lexer *lexer, uint32_t at)
{
    return byte_at(lexer, at) == '%' ? at + 1 : word_end(lexer, at);
}

static int power_of_ten(double factor)
{
    return (int)lround(log10(factor));
}

/* Folds a unit or a single prefix into the number at token->begin .. number_end. False when the
 * word is neither. */
static bool apply_word(struct lexer *lexer, struct token *token, uint32_t number_end, uint32_t word,
                       uint32_t end)
{
    const char *number = lexer->text + token->begin;
    size_t length = number_end - token->begin;
    if (end - word == 3 && memcmp(lexer->text + word,
                                  "\xC2\xB0"
                                  "C",
                                  3) == 0) {
        word += 2; /* "27 °C" is 27 C */
    }
    double factor = 0.0;
    struct dimension dimension = DIMENSION_NONE;
    bool celsius = false;
    if (unit_parse(lexer->text + word, end - word, &factor, &dimension, &celsius)) {
        token->has_unit = true;
        token->unit = (struct quantity){factor, dimension, false, celsius};
        token->number = token->unit;
    } else {
        size_t bytes = 0;
        factor = prefix_parse(lexer->text + word, end - word, &bytes);
        if (bytes == 0 || bytes != end - word) {
            return false;
        }
        token->has_prefix = true;
    }
    (void)number_parse_scaled(number, length, power_of_ten(factor), &token->number.value);
    if (celsius) {
        token->number.value = unit_celsius(token->number.value);
    }
    token->end = end;
    return true;
}

/* True for "meg" in any case, alone or before "ohm", which other places use for mega. */
static bool is_meg(const char *word, uint32_t length)
{
    if (length != 3 && !(length == 6 && memcmp(word + 3, "ohm", 3) == 0)) {
        return false;
    }
    return (word[0] == 'm' || word[0] == 'M') && (word[1] == 'e' || word[1] == 'E') &&
           (word[2] == 'g' || word[2] == 'G');
}

static bool wrong_unit(struct lexer *lexer, const struct token *token, uint32_t number_end,
                       uint32_t word, uint32_t end)
{
    const char *text = copy(lexer, word, end);
    if (text == NULL) {
        return false;
    }
    if (is_meg(text, end - word)) {
        const char *hint = arena_format(lexer->arena, "%.*sM%s", (int)(number_end - token->begin),
                                        lexer->text + token->begin, end - word > 3 ? "ohm" : "");
        return fail(lexer, word, end, hint,
                    arena_format(lexer->arena, "there is no '%s'; mega is M", text));
    }
    const char *near = unit_near(text);
    const char *hint = near != NULL ? arena_format(lexer->arena, "did you mean '%s'?", near) : NULL;
    if (near == NULL && strpbrk(text, "0123456789_") != NULL) {
        hint = "a name begins with a letter or _";
    }
    return fail(lexer, word, end, hint,
                arena_format(lexer->arena, "there is no unit '%.60s'", text));
}

/* The power of ten for the letter of an IEC 60062 code; `bytes` is 0 when it is none. K is allowed
 * beside k, as the standard writes it; R stands for ohm itself. */
static int code_letter(const struct lexer *lexer, uint32_t at, size_t *bytes)
{
    char c = byte_at(lexer, at);
    if (c == 'R' || c == 'K') {
        *bytes = 1;
        return c == 'R' ? 0 : 3;
    }
    double factor =
        at < lexer->length ? prefix_parse(lexer->text + at, lexer->length - at, bytes) : 0.0;
    if (!(factor > 0.0)) {
        *bytes = 0;
        return 0;
    }
    return power_of_ten(factor);
}

/* "4k7 ohm": a unit without a prefix may follow a code. */
static void lex_code_unit(struct lexer *lexer, struct token *token)
{
    uint32_t word = token->end;
    while (is_blank(byte_at(lexer, word))) {
        word++;
    }
    uint32_t end = word_end(lexer, word), next = end;
    while (is_blank(byte_at(lexer, next))) {
        next++;
    }
    double factor = 0.0;
    struct dimension dimension = DIMENSION_NONE;
    bool celsius = false;
    if (byte_at(lexer, next) != '=' && byte_at(lexer, end) != '.' &&
        unit_parse(lexer->text + word, end - word, &factor, &dimension, &celsius) &&
        factor == 1.0 && !celsius) {
        token->number.dimension = dimension;
        token->number.bare = false;
        token->count = token->number.value;
        token->unit = (struct quantity){1.0, dimension, false, false};
        token->has_unit = true;
        token->end = end;
    }
}

/* "4k7", "2R2", "470R": the letter stands where the decimal point would (IEC 60062). True when the
 * digits at token->begin .. letter begin such a code; the token is then complete. */
static bool lex_code(struct lexer *lexer, struct token *token, uint32_t letter)
{
    size_t bytes = 0;
    int power = code_letter(lexer, letter, &bytes);
    uint32_t rest = letter + (uint32_t)bytes, end = rest;
    bool ohm = byte_at(lexer, letter) == 'R';
    while (is_digit(byte_at(lexer, end))) {
        end++;
    }
    if (bytes == 0 || (end == rest && !ohm) || word_end(lexer, end) != end) {
        return false;
    }
    int whole = (int)(letter - token->begin), fraction = (int)(end - rest);
    const char *text = arena_format(lexer->arena, "%.*s%s%.*s", whole, lexer->text + token->begin,
                                    fraction > 0 ? "." : "", fraction, lexer->text + rest);
    if (text == NULL) {
        lexer->out_of_memory = true;
        return true;
    }
    (void)number_parse_scaled(text, strlen(text), power, &token->number.value);
    if (ohm) {
        token->number.dimension = DIMENSION_RESISTANCE;
        token->number.bare = false;
    }
    token->end = end;
    if (!ohm) {
        lex_code_unit(lexer, token);
    }
    return true;
}

/* A unit after blanks belongs to the number unless the word is the key of "key = value" or the
 * beginning of a dotted name. */
static void lex_spaced_unit(struct lexer *lexer, struct token *token)
{
    uint32_t number_end = token->end, word = number_end;
    while (is_blank(byte_at(lexer, word))) {
        word++;
    }
    uint32_t end = unit_word_end(lexer, word), next = end;
    if (word == number_end || end == word || is_digit(lexer->text[word])) {
        return;
    }
    while (is_blank(byte_at(lexer, next))) {
        next++;
    }
    if (byte_at(lexer, next) == '=' || byte_at(lexer, end) == '.') {
        return;
    }
    if (!apply_word(lexer, token, number_end, word, end) &&
        is_meg(lexer->text + word, end - word)) {
        (void)wrong_unit(lexer, token, number_end, word, end);
    }
}

static bool finish_number(struct lexer *lexer, const struct token *token)
{
    if (byte_at(lexer, token->end) == '.') {
        return fail(lexer, token->end, token->end + 1, NULL,
                    arena_format(lexer->arena, "this point fits no number; a decimal point stands "
                                               "once, between digits"));
    }
    if (!isfinite(token->number.value)) {
        return fail(lexer, token->begin, token->end, NULL,
                    arena_format(lexer->arena, "this number is too large"));
    }
    return true;
}

static bool lex_number(struct lexer *lexer, struct token *token)
{
    uint32_t begin = token->begin;
    size_t used = number_parse(lexer->text + begin, lexer->length - begin, &token->count);
    uint32_t number_end = begin + (uint32_t)used, digits = begin;
    token->kind = TOKEN_NUMBER;
    token->end = number_end;
    token->number = (struct quantity){token->count, DIMENSION_NONE, true, false};
    while (is_digit(byte_at(lexer, digits))) {
        digits++;
    }
    uint32_t word = unit_word_end(lexer, number_end);
    if (digits == number_end && lex_code(lexer, token, number_end)) {
        return finish_number(lexer, token);
    }
    if (word > number_end) {
        if (!apply_word(lexer, token, number_end, number_end, word)) {
            return wrong_unit(lexer, token, number_end, number_end, word);
        }
    } else {
        lex_spaced_unit(lexer, token);
    }
    return finish_number(lexer, token);
}

static bool check_name_length(struct lexer *lexer, uint32_t begin, uint32_t end)
{
    if (end - begin <= LANGUAGE_NAME_LIMIT) {
        return true;
    }
    return fail(lexer, begin, end, NULL,
                arena_format(lexer->arena, "this name has %lu characters; the limit is %d",
                             (unsigned long)(end - begin), LANGUAGE_NAME_LIMIT));
}

/* A name, with inner names behind dots: "tail", "X1.M2.vgs". Also a unit with a mu or an omega. */
static bool lex_name(struct lexer *lexer, struct token *token)
{
    uint32_t part = token->begin, end = part;
    token->kind = TOKEN_NAME;
    for (;;) {
        while (is_letter(byte_at(lexer, end)) || is_digit(byte_at(lexer, end))) {
            end++;
        }
        if (!check_name_length(lexer, part, end)) {
            return false;
        }
        if (byte_at(lexer, end) != '.' || !is_letter(byte_at(lexer, end + 1))) {
            break;
        }
        token->dotted = true;
        part = ++end;
    }
    uint32_t whole = word_end(lexer, end);
    if (whole > end && !token->dotted) {
        double factor = 0.0;
        struct dimension dimension;
        bool celsius = false;
        if (unit_parse(lexer->text + token->begin, whole - token->begin, &factor, &dimension,
                       &celsius)) {
            end = whole;
        }
    }
    token->end = end;
    token->text = copy(lexer, token->begin, end);
    return token->text != NULL;
}

static bool lex_text(struct lexer *lexer, struct token *token)
{
    uint32_t end = token->begin + 1;
    token->kind = TOKEN_TEXT;
    for (; byte_at(lexer, end) != '"'; end++) {
        unsigned char c = (unsigned char)byte_at(lexer, end);
        if (end >= lexer->length || c == '\n' || c == '\r') {
            return fail(lexer, token->begin, end, "close it with '\"' on the same line",
                        arena_format(lexer->arena, "this text does not end"));
        }
        if (c < 0x20 || c == 0x7F) {
            return fail(lexer, end, end + 1, NULL,
                        arena_format(lexer->arena, "a text holds no tabs or other controls"));
        }
        if (c == '\\' && byte_at(lexer, end + 1) == '"') {
            return fail(lexer, end, end + 2, NULL,
                        arena_format(lexer->arena, "a text cannot hold a quotation mark"));
        }
    }
    token->text = copy(lexer, token->begin + 1, end);
    token->end = end + 1;
    return token->text != NULL;
}

/* What a character that word processors and web pages put in stands for, and its name. */
static const char *foreign_hint(uint32_t character, const char **name)
{
    static const struct {
        uint32_t character;
        const char *name, *hint;
    } table[] = {
        {0x2192, "arrow", "write '->'"},
        {0x21D2, "arrow", "write '->'"},
        {0x2018, "quotation mark", "write '\"'"},
        {0x2019, "quotation mark", "write '\"'"},
        {0x201C, "quotation mark", "write '\"'"},
        {0x201D, "quotation mark", "write '\"'"},
        {0x201E, "quotation mark", "write '\"'"},
        {0x00AB, "quotation mark", "write '\"'"},
        {0x00BB, "quotation mark", "write '\"'"},
        {0x00A0, "no-break space", "write an ordinary space"},
        {0x2009, "thin space", "write an ordinary space"},
        {0x202F, "narrow no-break space", "write an ordinary space"},
        {0x2212, "minus sign", "write '-'"},
        {0x2013, "dash", "write '-'"},
        {0x00D7, "multiplication sign", "write '*'"},
        {0x00B7, "dot", "write '*'"},
    };
    for (size_t i = 0; i < sizeof table / sizeof table[0]; i++) {
        if (table[i].character == character) {
            *name = table[i].name;
            return table[i].hint;
        }
    }
    return NULL;
}

/* A character that begins no token. */
static bool wrong_character(struct lexer *lexer, uint32_t at)
{
    char c = lexer->text[at];
    if (c == '.' && is_digit(byte_at(lexer, at + 1))) {
        uint32_t end = at + 1;
        while (is_digit(byte_at(lexer, end)) && end - at < 20) {
            end++;
        }
        return fail(lexer, at, end,
                    arena_format(lexer->arena, "write '0%.*s'", (int)(end - at), lexer->text + at),
                    arena_format(lexer->arena, "a number begins with a digit"));
    }
    uint32_t character = 0;
    uint32_t bytes = (uint32_t)utf8_decode(lexer->text + at, lexer->length - at, &character);
    bytes = bytes == 0 ? 1 : bytes;
    const char *name = NULL, *hint = foreign_hint(character, &name);
    if (name != NULL) {
        return fail(lexer, at, at + bytes, hint,
                    arena_format(lexer->arena, "the %s U+%04lX has no meaning here", name,
                                 (unsigned long)character));
    }
    if (character < 0x20 || character == 0x7F) {
        return fail(lexer, at, at + bytes, NULL,
                    arena_format(lexer->arena, "the control character U+%04lX has no place here",
                                 (unsigned long)character));
    }
    return fail(lexer, at, at + bytes,
                character > 0x7F ? "names hold the letters a to z, A to Z, digits and _" : NULL,
                arena_format(lexer->arena, "the character '%.*s' has no meaning here", (int)bytes,
                             lexer->text + at));
}

static bool lex_symbol(struct lexer *lexer, struct token *token)
{
    static const struct {
        const char *text;
        char symbol;
    } pairs[] = {{"->", '>'}, {"+=", 'a'}, {"*=", 'm'}};
    token->kind = TOKEN_SYMBOL;
    char c = byte_at(lexer, token->begin), next = byte_at(lexer, token->begin + 1);
    for (size_t i = 0; i < sizeof pairs / sizeof pairs[0]; i++) {
        if (pairs[i].text[0] == c && pairs[i].text[1] == next) {
            token->symbol = pairs[i].symbol;
            token->end = token->begin + 2;
            return true;
        }
    }
    if (c == '\0' || strchr("=+-*/^(),", c) == NULL) {
        return wrong_character(lexer, token->begin);
    }
    token->symbol = c;
    token->end = token->begin + 1;
    return true;
}

static bool add_token(struct lexer *lexer, const struct token *token)
{
    if (lexer->count >= LANGUAGE_TOKEN_LIMIT && token->kind != TOKEN_END) {
        return fail(lexer, token->begin, token->end, NULL,
                    arena_format(lexer->arena,
                                 "this statement has more than %d words and signs, the limit",
                                 LANGUAGE_TOKEN_LIMIT));
    }
    struct token *tokens =
        arena_grow(lexer->arena, lexer->tokens, lexer->count, &lexer->capacity, sizeof *tokens);
    if (tokens == NULL) {
        lexer->out_of_memory = true;
        return false;
    }
    lexer->tokens = tokens;
    tokens[lexer->count++] = *token;
    return true;
}

/* Skips blanks, comments and continued line ends. True at the beginning of a token, false at the
 * end of the logical line, which is consumed, or at an error. */
static bool skip_to_token(struct lexer *lexer)
{
    for (;;) {
        char c = byte_at(lexer, lexer->at);
        if (is_blank(c) || (c == '\r' && byte_at(lexer, lexer->at + 1) == '\n')) {
            lexer->at++;
        } else if (c == '#') {
            while (lexer->at < lexer->length && lexer->text[lexer->at] != '\n') {
                lexer->at++;
            }
        } else if (c == '\\') {
            uint32_t next = lexer->at + 1;
            while (is_blank(byte_at(lexer, next)) || byte_at(lexer, next) == '\r') {
                next++;
            }
            if (next < lexer->length && lexer->text[next] != '\n') {
                return fail(lexer, lexer->at, lexer->at + 1, NULL,
                            arena_format(lexer->arena, "a backslash continues a line and stands at "
                                                       "its end only"));
            }
            lexer->at = next < lexer->length ? next + 1 : next;
            lexer->line++;
        } else if (c == '\n' || lexer->at >= lexer->length) {
            lexer->line += c == '\n' ? 1 : 0;
            lexer->at += c == '\n' ? 1 : 0;
            return false;
        } else {
            return true;
        }
    }
}

/* After an error: to the end of the logical line. */
static void skip_rest(struct lexer *lexer)
{
    bool continued = false;
    while (lexer->at < lexer->length) {
        char c = lexer->text[lexer->at++];
        if (c == '\n') {
            lexer->line++;
            if (!continued) {
                return;
            }
            continued = false;
        } else if (!is_blank(c) && c != '\r') {
            continued = c == '\\';
        }
    }
}

static bool lex_token(struct lexer *lexer, struct token *token)
{
    char c = lexer->text[lexer->at];
    if (is_digit(c)) {
        return lex_number(lexer, token);
    }
    if (is_letter(c) || unit_sign(lexer, lexer->at) > 0) {
        if (lex_name(lexer, token) && token->end > token->begin) {
            return true;
        }
        return lexer->error.text == NULL && !lexer->out_of_memory &&
               wrong_character(lexer, lexer->at);
    }
    return c == '"' ? lex_text(lexer, token) : lex_symbol(lexer, token);
}

/* Tokens of one logical line. */
static void lex_line(struct lexer *lexer)
{
    lexer->count = 0;
    lexer->error = (struct lexer_error){SPAN_NONE, NULL, NULL};
    while (skip_to_token(lexer)) {
        struct token token = {.begin = lexer->at, .end = lexer->at};
        lexer->first_line = lexer->count == 0 ? lexer->line : lexer->first_line;
        if (!lex_token(lexer, &token) || lexer->error.text != NULL || lexer->out_of_memory) {
            break;
        }
        lexer->at = token.end;
        if (!add_token(lexer, &token)) {
            break;
        }
    }
    uint32_t end = lexer->count > 0 ? lexer->tokens[lexer->count - 1].end : lexer->at;
    if (lexer->error.text != NULL) {
        lexer->first_line = lexer->count == 0 ? lexer->line : lexer->first_line;
        skip_rest(lexer);
    }
    struct token last = {.kind = TOKEN_END, .begin = end, .end = end};
    (void)add_token(lexer, &last);
}

bool lexer_next_line(struct lexer *lexer)
{
    while (lexer->at < lexer->length && !lexer->out_of_memory) {
        lex_line(lexer);
        if (lexer->out_of_memory) {
            return false;
        }
        if (lexer->count > 1 || lexer->error.text != NULL) {
            return true;
        }
    }
    return false;
}

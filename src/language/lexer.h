/*
 * lexer.h: characters to tokens, one logical line at a time.
 *
 * Private to the language layer. The parser sees tokens, never characters.
 */
#ifndef LANGUAGE_LEXER_H
#define LANGUAGE_LEXER_H

#include "language/tree.h"

enum token_kind { TOKEN_END, TOKEN_NAME, TOKEN_NUMBER, TOKEN_TEXT, TOKEN_SYMBOL };

struct token {
    enum token_kind kind;
    uint32_t begin, end;    /* bytes of the source */
    char symbol;            /* the character; '>' for "->", 'a' for "+=", 'm' for "*=" */
    const char *text;       /* of a name (with its dots) or between quotes */
    bool dotted;            /* the name has dots */
    struct quantity number; /* with prefix and unit folded in */
    double count;           /* the number alone ... */
    struct quantity unit;   /* ... and one of its unit, when has_unit */
    bool has_unit;          /* a unit word was written, not only a prefix */
    bool has_prefix;        /* a prefix without a unit: "10k" */
};

/* The first error of a line; text NULL when there is none. */
struct lexer_error {
    struct span where;
    const char *text, *hint;
};

struct lexer {
    struct arena *arena;
    uint32_t file;
    const char *text;
    uint32_t length;
    uint32_t at; /* next byte to read */
    int line;    /* number of the line that `at` is in, from 1 */
    struct token *tokens;
    int count, capacity; /* the last token is TOKEN_END */
    int first_line;      /* line of the first token */
    struct lexer_error error;
    bool out_of_memory;
};

void lexer_start(struct lexer *lexer, struct arena *arena, const struct source_set *sources,
                 uint32_t file);

/* Reads the next line that holds a token (continued lines are one). False at the end of the text or
 * when memory is short. A character that fits nowhere sets `error` and ends the line's tokens. */
bool lexer_next_line(struct lexer *lexer);

#endif

/*
 * parser_internal.h: what the parser's own files share. Private to the language layer.
 *
 * Every parse function returns false (or NULL) after it noted an error or memory failed; the first
 * error of a statement is kept, the rest of that statement is skipped.
 */
#ifndef LANGUAGE_PARSER_INTERNAL_H
#define LANGUAGE_PARSER_INTERNAL_H

#include "language/lexer.h"

struct parser {
    struct arena *arena;
    struct diagnostics *diagnostics;
    struct lexer lexer;
    enum tree_role role;
    int at;                   /* token that is looked at */
    struct lexer_error error; /* of this statement; text NULL when there is none */
    bool out_of_memory;
    int depth, terms;  /* of the expression that is read */
    bool line_kept;    /* the current line is to be read again, at the outer level */
    bool end_expected; /* one `end` without an opening is passed over: its opening was wrong */
};

/* A row of the statement table: its word, where it may stand, and its steps in order. */
enum { PARSER_STEPS = 6 };
typedef bool parse_step(struct parser *parser, struct statement *statement);
struct statement_rule {
    const char *word;
    enum statement_kind kind;
    bool in_process, in_block;
    parse_step *steps[PARSER_STEPS]; /* ends at the first NULL */
    enum { BODY_NONE, BODY_VALUES, BODY_STATEMENTS } body;
};

/* The rule of a word, or NULL. */
const struct statement_rule *statement_rule(const char *word);
/* Runs the steps of a rule and wants the end of the line after them. */
bool statement_parse(struct parser *parser, const struct statement_rule *rule,
                     struct statement *statement);
/* "WORD NAME [a -> b] [value] [key = value]...": a part. */
bool statement_parse_part(struct parser *parser, struct statement *statement);
/* "key = value", and in corners "key += value" and "key *= value". */
bool statement_parse_value_line(struct parser *parser, struct statement *statement);

const struct token *parser_peek(const struct parser *parser, int ahead);
bool parser_is_symbol(const struct parser *parser, int ahead, char symbol);
bool parser_is_word(const struct parser *parser, int ahead, const char *word);
struct span parser_span(const struct parser *parser, const struct token *token);
/* Passes over a symbol or word when it stands there. */
bool parser_accept(struct parser *parser, char symbol);
bool parser_accept_word(struct parser *parser, const char *word);
/* The token in a message: "'ref'", "the end of the line". NULL without memory. */
const char *parser_found(struct parser *parser, const struct token *token);
/* "did you mean 'NEAR'?", or NULL when near is NULL. */
const char *parser_hint(struct parser *parser, const char *near);
/* Notes the first error of the statement; always false. */
bool parser_error(struct parser *parser, struct span where, const char *hint, const char *format,
                  ...) __attribute__((format(printf, 4, 5)));
/* Notes that memory failed; always false. */
bool parser_no_memory(struct parser *parser);

/* A whole expression; NULL after an error. */
const struct expression *parser_expression(struct parser *parser);
/* One of a list of expressions without commas: a sum stands in parentheses there. */
const struct expression *parser_list_item(struct parser *parser);

#endif

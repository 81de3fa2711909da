/* parser.c: lines to statements, bodies up to their `end`, errors kept one a statement. */
#include "language/parser.h"

#include <string.h>

#include "language/parser_internal.h"

/* The token `ahead` places on; the ends of the line stand for all beyond. */
const struct token *parser_peek(const struct parser *parser, int ahead)
{
    int at = parser->at + ahead, last = parser->lexer.count - 1;
    return &parser->lexer.tokens[at < 0 ? 0 : at > last ? last : at];
}

bool parser_is_symbol(const struct parser *parser, int ahead, char symbol)
{
    const struct token *token = parser_peek(parser, ahead);
    return token->kind == TOKEN_SYMBOL && token->symbol == symbol;
}

bool parser_is_word(const struct parser *parser, int ahead, const char *word)
{
    const struct token *token = parser_peek(parser, ahead);
    return token->kind == TOKEN_NAME && strcmp(token->text, word) == 0;
}

struct span parser_span(const struct parser *parser, const struct token *token)
{
    return (struct span){parser->lexer.file, token->begin, token->end};
}

bool parser_accept(struct parser *parser, char symbol)
{
    bool found = parser_is_symbol(parser, 0, symbol);
    parser->at += found ? 1 : 0;
    return found;
}

bool parser_accept_word(struct parser *parser, const char *word)
{
    bool found = parser_is_word(parser, 0, word);
    parser->at += found ? 1 : 0;
    return found;
}

bool parser_no_memory(struct parser *parser)
{
    parser->out_of_memory = true;
    return false;
}

const char *parser_found(struct parser *parser, const struct token *token)
{
    enum { SHOWN = 40 };
    const char *text = NULL;
    int length = (int)(token->end - token->begin);
    if (token->kind == TOKEN_END) {
        text = arena_copy(parser->arena, "the end of the line", 19);
    } else if (token->kind == TOKEN_TEXT) {
        text = arena_copy(parser->arena, "a text", 6);
    } else {
        text = arena_format(parser->arena, "'%.*s'", length < SHOWN ? length : SHOWN,
                            parser->lexer.text + token->begin);
    }
    if (text == NULL) {
        (void)parser_no_memory(parser);
    }
    return text;
}

const char *parser_hint(struct parser *parser, const char *near)
{
    return near == NULL ? NULL : arena_format(parser->arena, "did you mean '%s'?", near);
}

bool parser_error(struct parser *parser, struct span where, const char *hint, const char *format,
                  ...)
{
    if (parser->error.text != NULL) {
        return false;
    }
    va_list arguments;
    va_start(arguments, format);
    const char *text = arena_format_list(parser->arena, format, arguments);
    va_end(arguments);
    if (text == NULL) {
        return parser_no_memory(parser);
    }
    parser->error = (struct lexer_error){where, text, hint};
    return false;
}

/* Hands the error of this statement to the diagnostics. True when there was none. */
static bool flush_error(struct parser *parser)
{
    struct lexer_error error = parser->error;
    if (error.text == NULL) {
        return true;
    }
    diagnostics_add(parser->diagnostics, error.where, error.hint, "%s", error.text);
    parser->error.text = NULL;
    return false;
}

/* The next line with a token; false at the end, at the error limit or without memory. */
static bool next_line(struct parser *parser)
{
    if (parser->out_of_memory || parser->diagnostics->out_of_memory) {
        return false;
    }
    if (parser->line_kept) {
        parser->line_kept = false;
        parser->at = 0;
        return true;
    }
    if (!lexer_next_line(&parser->lexer)) {
        parser->out_of_memory = parser->lexer.out_of_memory;
        return false;
    }
    parser->at = 0;
    parser->error = parser->lexer.error;
    return true;
}

/* True, and an error, when so much is wrong that the rest is not worth reading. */
static bool past_limits(struct parser *parser, int errors_before)
{
    struct span where = parser_span(parser, parser_peek(parser, 0));
    if (parser->diagnostics->count - errors_before >= LANGUAGE_ERROR_LIMIT) {
        diagnostics_add(parser->diagnostics, where, NULL,
                        "more than %d errors: the rest of the file was not read",
                        LANGUAGE_ERROR_LIMIT);
        return true;
    }
    return false;
}

static struct statement *create_statement(struct parser *parser, enum statement_kind kind)
{
    struct statement *statement = arena_new(parser->arena, struct statement);
    if (statement == NULL) {
        (void)parser_no_memory(parser);
        return NULL;
    }
    const struct token *first = parser_peek(parser, 0);
    const struct token *last = &parser->lexer.tokens[parser->lexer.count - 1];
    statement->kind = kind;
    statement->first = (struct word){first->text, parser_span(parser, first)};
    statement->span = (struct span){parser->lexer.file, first->begin, last->end};
    return statement;
}

static bool append(struct parser *parser, struct statement ***list, int *count, int *capacity,
                   struct statement *statement)
{
    struct statement **grown =
        arena_grow(parser->arena, *list, *count, capacity, sizeof(struct statement *));
    if (grown == NULL) {
        return parser_no_memory(parser);
    }
    *list = grown;
    grown[(*count)++] = statement;
    return true;
}

/* "model 'NCH'" in a message about the body of a statement. */
static const char *opening(struct parser *parser, const struct statement *statement)
{
    const char *name = statement->name.text;
    const char *text = arena_format(parser->arena, name != NULL ? "%s '%s'" : "this %s",
                                    statement->first.text, name);
    if (text == NULL) {
        (void)parser_no_memory(parser);
        return "";
    }
    return text;
}

/* The line is not for this body, but can begin a statement outside: its `end` is missing. */
static void end_missing(struct parser *parser, const struct statement *statement, int line)
{
    const struct token *first = parser_peek(parser, 0);
    diagnostics_add(parser->diagnostics, parser_span(parser, first),
                    "is an 'end' missing before it?", "'%s' cannot stand in %s of line %d",
                    first->text, opening(parser, statement), line);
    parser->line_kept = true;
    parser->end_expected = true;
}

/* Reads lines of a body until `end`. True when a line is to be read as part of the body. */
static bool next_body_line(struct parser *parser, struct statement *statement, int errors_before)
{
    if (!next_line(parser)) {
        if (!parser->out_of_memory && !parser->diagnostics->out_of_memory) {
            diagnostics_add(parser->diagnostics, statement->first.span,
                            "write 'end' on a line of its own",
                            "%s is not ended before the file ends", opening(parser, statement));
        }
        return false;
    }
    if (past_limits(parser, errors_before)) {
        parser->lexer.at = parser->lexer.length;
        return false;
    }
    if (parser_is_word(parser, 0, "end") && !parser_is_symbol(parser, 1, '=')) {
        const struct token *more = parser_peek(parser, 1);
        if (more->kind != TOKEN_END) {
            (void)parser_error(parser, parser_span(parser, more), NULL,
                               "nothing more is wanted after 'end'");
        }
        (void)flush_error(parser);
        statement->span.end = parser_peek(parser, 0)->end;
        return false;
    }
    return true;
}

/* Whether a line inside a model or corner looks like a statement: a statement word, or the
 * "WORD NAME ..." of a part. */
static bool begins_statement(const struct parser *parser, const struct token *first)
{
    const struct token *second = parser_peek(parser, 1);
    if (first->kind != TOKEN_NAME || first->dotted || second->kind == TOKEN_SYMBOL) {
        return false;
    }
    return statement_rule(first->text) != NULL ||
           (second->kind == TOKEN_NAME && parser_peek(parser, 2)->kind != TOKEN_END);
}

static void parse_values(struct parser *parser, struct statement *statement, int errors_before)
{
    int line = parser->lexer.first_line;
    while (next_body_line(parser, statement, errors_before)) {
        const struct token *first = parser_peek(parser, 0);
        if (begins_statement(parser, first)) {
            end_missing(parser, statement, line);
            return;
        }
        (void)statement_parse_value_line(parser, statement);
        (void)flush_error(parser);
    }
}

static bool parse_line(struct parser *parser, const struct statement_rule *rule,
                       struct statement *statement);

/* A line that was wrong: what it would have made is not to be missed. Lines that ask for something
 * make nothing. */
static void lose_name(struct parser *parser, const struct statement_rule *rule)
{
    const enum statement_kind kind = rule != NULL ? rule->kind : STATEMENT_PART;
    parser->at = 0;
    const struct token *name = parser_peek(parser, kind == STATEMENT_USE ? 2 : 1);
    switch (kind) {
    case STATEMENT_LET:
    case STATEMENT_MODEL:
    case STATEMENT_RAIL:
    case STATEMENT_PART:
    case STATEMENT_BLOCK:
    case STATEMENT_USE:
    case STATEMENT_OUTPUT:
        if (name->kind == TOKEN_NAME) {
            diagnostics_lose(parser->diagnostics, name->text);
        } else if (rule == NULL && name->kind == TOKEN_TEXT) {
            diagnostics_lose(parser->diagnostics, "process"); /* mistyped */
        }
        break;
    case STATEMENT_PROCESS:
        diagnostics_lose(parser->diagnostics, "process");
        break;
    default:
        break;
    }
}

static void parse_block(struct parser *parser, struct statement *block, int errors_before)
{
    int line = parser->lexer.first_line, capacity = 0;
    while (next_body_line(parser, block, errors_before)) {
        const struct token *first = parser_peek(parser, 0);
        const struct statement_rule *rule =
            first->kind == TOKEN_NAME ? statement_rule(first->text) : NULL;
        if (rule != NULL && !rule->in_block) {
            end_missing(parser, block, line);
            return;
        }
        struct statement *inner =
            create_statement(parser, rule != NULL ? rule->kind : STATEMENT_PART);
        if (inner == NULL) {
            return;
        }
        bool read = parse_line(parser, rule, inner);
        if (flush_error(parser) && read) {
            (void)append(parser, &block->body, &block->body_count, &capacity, inner);
        } else {
            lose_name(parser, rule);
        }
    }
}

/* "'reqire' begins no statement", with the near word. Replaces an error found later in the line,
 * but not one of the lexer. */
static bool unknown_word(struct parser *parser, const struct statement *statement, const char *near)
{
    if (parser->lexer.error.text == NULL) {
        parser->error.text = NULL;
    }
    return parser_error(parser, statement->first.span, parser_hint(parser, near),
                        "there is no statement '%s'", statement->first.text);
}

/* A line whose first word is no statement word: a part, or a mistyped word. */
static bool parse_unruled(struct parser *parser, struct statement *statement)
{
    const char *const *words = NULL;
    int count = parser_statement_words(parser->role, &words);
    const char *near = near_name(statement->first.text, words, count);
    parser->at = 1;
    const struct token *second = parser_peek(parser, 0);
    if (parser_is_symbol(parser, 0, '=')) {
        return parser_error(parser, statement->first.span,
                            arena_format(parser->arena,
                                         "write 'let %s = ...', or put it in a model",
                                         statement->first.text),
                            "'%s = ...' is not a statement", statement->first.text);
    }
    if (second->kind != TOKEN_NAME || second->dotted) {
        return unknown_word(parser, statement, near);
    }
    if (parser->role == TREE_PROCESS) {
        return near != NULL ? unknown_word(parser, statement, near)
                            : parser_error(parser, statement->first.span, NULL,
                                           "'%s' belongs in a cell; a process file holds models, "
                                           "corners and lets",
                                           statement->first.text);
    }
    if (!statement_parse_part(parser, statement)) {
        return near != NULL && !parser->out_of_memory && unknown_word(parser, statement, near);
    }
    bool opens_body =
        near != NULL && statement_rule(near) != NULL && statement_rule(near)->body != BODY_NONE;
    if (opens_body && statement->node_from.text == NULL && statement->assignment_count == 0) {
        return unknown_word(parser, statement, near);
    }
    return true;
}

static bool parse_line(struct parser *parser, const struct statement_rule *rule,
                       struct statement *statement)
{
    const struct token *first = parser_peek(parser, 0);
    if (first->kind == TOKEN_END) {
        return false; /* the lexer's error is all there is */
    }
    if (first->kind != TOKEN_NAME || first->dotted) {
        const char *found = parser_found(parser, first);
        return found != NULL &&
               parser_error(parser, parser_span(parser, first), NULL,
                            "a statement begins with a plain word; found %s", found);
    }
    if (rule == NULL) {
        return parse_unruled(parser, statement);
    }
    if (parser->role == TREE_PROCESS && !rule->in_process) {
        (void)parser_error(parser, statement->first.span, NULL,
                           "'%s' belongs in a cell; a process file holds models, corners and lets",
                           rule->word);
    }
    parser->at = 1;
    return statement_parse(parser, rule, statement);
}

/* An `end` that ends nothing. One is passed over after an opening that was wrong. */
static bool stray_end(struct parser *parser)
{
    if (!parser_is_word(parser, 0, "end")) {
        return false;
    }
    if (!parser->end_expected) {
        (void)parser_error(parser, parser_span(parser, parser_peek(parser, 0)), NULL,
                           "there is no model, corner or block here that 'end' could end");
    }
    parser->end_expected = false;
    (void)flush_error(parser);
    return true;
}

/* The rule whose body follows a line, also when its word is mistyped. */
static const struct statement_rule *body_rule(const struct parser *parser,
                                              const struct statement_rule *rule, const char *word)
{
    static const char *const openings[] = {"model", "corner", "block"};
    if (rule == NULL && word != NULL && parser_peek(parser, 1)->kind == TOKEN_NAME) {
        const char *near = near_name(word, openings, 3);
        return near != NULL ? statement_rule(near) : NULL;
    }
    return rule;
}

/* One statement with its body. Added to the tree when it could be read. */
static void parse_statement(struct parser *parser, struct tree *tree, int *capacity,
                            int errors_before)
{
    const struct token *first = parser_peek(parser, 0);
    const struct statement_rule *rule =
        first->kind == TOKEN_NAME ? statement_rule(first->text) : NULL;
    if (stray_end(parser)) {
        return;
    }
    struct statement *statement =
        create_statement(parser, rule != NULL ? rule->kind : STATEMENT_PART);
    if (statement == NULL) {
        return;
    }
    bool read = parse_line(parser, rule, statement);
    bool clean = flush_error(parser);
    if (!clean) {
        parser->at = 0;
        rule = body_rule(parser, rule, statement->first.text);
        statement->kind = rule != NULL ? rule->kind : STATEMENT_PART;
    }
    if (!clean || !read) {
        lose_name(parser, rule);
    }
    if (rule != NULL && rule->body == BODY_VALUES) {
        parse_values(parser, statement, errors_before);
    } else if (rule != NULL && rule->body == BODY_STATEMENTS) {
        enum tree_role role = parser->role;
        parser->role = TREE_CELL; /* a block in a process file is one error, not one a line */
        parse_block(parser, statement, errors_before);
        parser->role = role;
    }
    if (clean && read) {
        (void)append(parser, &tree->statements, &tree->count, capacity, statement);
    }
}

static void start(struct parser *parser, struct arena *arena, const struct source_set *sources,
                  uint32_t file, enum tree_role role, struct diagnostics *diagnostics)
{
    *parser = (struct parser){.arena = arena, .diagnostics = diagnostics, .role = role};
    lexer_start(&parser->lexer, arena, sources, file);
}

enum status parse_source(struct arena *arena, const struct source_set *sources, uint32_t file,
                         enum tree_role role, struct diagnostics *diagnostics, struct tree *tree)
{
    struct parser parser;
    int capacity = 0, errors_before = diagnostics->count;
    start(&parser, arena, sources, file, role, diagnostics);
    *tree = (struct tree){NULL, 0, file};
    while (next_line(&parser)) {
        if (past_limits(&parser, errors_before)) {
            break;
        }
        parse_statement(&parser, tree, &capacity, errors_before);
    }
    if (parser.out_of_memory || diagnostics->out_of_memory || arena_failed(arena)) {
        return STATUS_MEMORY;
    }
    return diagnostics->count > errors_before ? STATUS_INPUT : STATUS_OK;
}

const struct expression *parse_expression(struct arena *arena, const struct source_set *sources,
                                          uint32_t file, struct diagnostics *diagnostics)
{
    struct parser parser;
    start(&parser, arena, sources, file, TREE_CELL, diagnostics);
    const struct expression *expression = NULL;
    if (next_line(&parser)) {
        expression = parser_expression(&parser);
        const struct token *rest = parser_peek(&parser, 0);
        const char *found =
            expression != NULL && rest->kind != TOKEN_END ? parser_found(&parser, rest) : NULL;
        if (found != NULL) {
            (void)parser_error(&parser, parser_span(&parser, rest), NULL,
                               "nothing more is wanted here; found %s", found);
        }
        expression = flush_error(&parser) ? expression : NULL;
        if (expression != NULL && next_line(&parser)) {
            (void)parser_error(&parser, parser_span(&parser, parser_peek(&parser, 0)), NULL,
                               "the value ends with its line");
            expression = flush_error(&parser) ? expression : NULL;
        }
    } else if (!parser.out_of_memory) {
        diagnostics_add(diagnostics, (struct span){file, 0, 0}, NULL, "a value is wanted here");
    }
    if (parser.out_of_memory) {
        diagnostics->out_of_memory = true;
    }
    return parser.out_of_memory ? NULL : expression;
}

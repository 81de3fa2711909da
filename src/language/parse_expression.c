/*
 * parse_expression.c: expressions, by recursive descent. The grammar:
 *
 *   sum     = product { ("+" | "-") product }
 *   product = sign { ("*" | "/") sign }
 *   sign    = ["-" | "+"] sign | power
 *   power   = primary ["^" sign]            right-associative, tighter than a sign before it
 *   primary = NUMBER [unit's "^" exponent] | NAME | NAME "(" sum { "," sum } ")" | "(" sum ")"
 */
#include <math.h>

#include "language/expression.h"
#include "language/parser_internal.h"

#include "language/expression_unit.h"

static struct expression *parse_sum(struct parser *parser);
static struct expression *parse_sign(struct parser *parser);

static struct expression *create(struct parser *parser, enum expression_kind kind, struct span span)
{
    struct expression *expression = arena_new(parser->arena, struct expression);
    if (expression == NULL) {
        (void)parser_no_memory(parser);
        return NULL;
    }
    expression->kind = kind;
    expression->span = span;
    return expression;
}

static struct expression *create_binary(struct parser *parser, enum expression_kind kind,
                                        const struct expression *left,
                                        const struct expression *right)
{
    if (left == NULL || right == NULL) {
        return NULL;
    }
    struct span span = {left->span.file, left->span.begin, right->span.end};
    if (++parser->terms > LANGUAGE_TERM_LIMIT) {
        (void)parser_error(parser, right->span, NULL,
                           "this expression has more than %d operators, the limit",
                           LANGUAGE_TERM_LIMIT);
        return NULL;
    }
    struct expression *expression = create(parser, kind, span);
    if (expression != NULL) {
        expression->left = left;
        expression->right = right;
    }
    return expression;
}

/* Goes one level deeper; false with an error at the limit. Each true is paired with depth--. */
static bool deeper(struct parser *parser, const struct token *token)
{
    if (parser->depth >= LANGUAGE_DEPTH_LIMIT) {
        return parser_error(parser, parser_span(parser, token), NULL,
                            "this expression is nested more than %d deep, the limit",
                            LANGUAGE_DEPTH_LIMIT);
    }
    parser->depth++;
    return true;
}

static bool is_constant(const struct expression *expression)
{
    if (expression == NULL) {
        return true;
    }
    return expression->kind != EXPRESSION_NAME && expression->kind != EXPRESSION_CALL &&
           is_constant(expression->left) && is_constant(expression->right);
}

/* The exponent of a unit, which is folded into the number and so must be known now. */
static bool unit_exponent(struct parser *parser, const struct expression *expression,
                          double *exponent)
{
    if (!is_constant(expression)) {
        return parser_error(parser, expression->span, "put the value in parentheses: (2 V)^N",
                            "the exponent of a unit is a plain number");
    }
    struct diagnostics own = {.arena = parser->arena};
    const struct expression_scope nothing = {.find = NULL};
    struct quantity value;
    if (!expression_value(expression, &nothing, &own, &value)) {
        if (own.count == 0) {
            return parser_no_memory(parser);
        }
        return parser_error(parser, own.list[0].where, own.list[0].hint, "%s", own.list[0].text);
    }
    if (!value.bare) {
        return parser_error(parser, expression->span, NULL,
                            "the exponent of a unit is a plain number");
    }
    *exponent = value.value;
    return true;
}

/* "0.45 V^0.5": the exponent binds to the unit, not to the number before it. */
static struct expression *parse_unit_power(struct parser *parser, const struct token *number,
                                           struct expression *expression)
{
    struct token unit = *number; /* the token list may move while the exponent is read */
    const struct token *mark = parser_peek(parser, 0);
    if (!deeper(parser, mark)) {
        return NULL;
    }
    parser->at++;
    const struct expression *written = parse_sign(parser);
    parser->depth--;
    double exponent = 0.0;
    if (written == NULL || !unit_exponent(parser, written, &exponent)) {
        return NULL;
    }
    struct span span = {expression->span.file, expression->span.begin, written->span.end};
    struct dimension dimension = DIMENSION_NONE;
    double value = unit.count * pow(unit.unit.value, exponent);
    if (unit.unit.celsius) {
        (void)parser_error(parser, span, "write it in K", "a Celsius temperature has no powers");
        return NULL;
    }
    if (!dimension_power(unit.unit.dimension, exponent, &dimension) || !isfinite(value)) {
        (void)parser_error(parser, written->span, NULL, "this exponent is not possible for a unit");
        return NULL;
    }
    expression->span = span;
    expression->number = (struct quantity){value, dimension, false, false};
    return expression;
}

static struct expression *parse_number(struct parser *parser)
{
    const struct token *token = parser_peek(parser, 0);
    struct expression *expression = create(parser, EXPRESSION_NUMBER, parser_span(parser, token));
    if (expression == NULL) {
        return NULL;
    }
    expression->number = token->number;
    if (token->has_prefix) {
        expression->name =
            arena_copy(parser->arena, parser->lexer.text + token->begin, token->end - token->begin);
        if (expression->name == NULL) {
            (void)parser_no_memory(parser);
            return NULL;
        }
    }
    parser->at++;
    if (token->has_unit && parser_is_symbol(parser, 0, '^')) {
        return parse_unit_power(parser, token, expression);
    }
    return expression;
}

/* Passes over the ')' that closes `open`. */
static bool close(struct parser *parser, const struct token *open, uint32_t *end)
{
    const struct token *token = parser_peek(parser, 0);
    if (!parser_is_symbol(parser, 0, ')')) {
        const char *found = parser_found(parser, token);
        int after = (int)(token->begin - open->begin);
        return found != NULL &&
               parser_error(parser, parser_span(parser, token), NULL,
                            "')' is wanted here to close '%.*s'; found %s", after < 12 ? after : 12,
                            parser->lexer.text + open->begin, found);
    }
    *end = token->end;
    parser->at++;
    return true;
}

static struct expression *parse_parentheses(struct parser *parser)
{
    const struct token *open = parser_peek(parser, 0);
    if (!deeper(parser, open)) {
        return NULL;
    }
    parser->at++;
    struct expression *inner = parse_sum(parser);
    parser->depth--;
    uint32_t end = 0;
    if (inner == NULL || !close(parser, open, &end)) {
        return NULL;
    }
    inner->parenthesised = true;
    inner->span.begin = open->begin;
    inner->span.end = end;
    return inner;
}

static bool parse_arguments(struct parser *parser, struct expression *call)
{
    int capacity = 0;
    do {
        const struct expression *argument = parse_sum(parser);
        if (argument == NULL) {
            return false;
        }
        const struct expression **arguments =
            arena_grow(parser->arena, call->arguments, call->argument_count, &capacity,
                       sizeof(const struct expression *));
        if (arguments == NULL) {
            return parser_no_memory(parser);
        }
        call->arguments = arguments;
        arguments[call->argument_count++] = argument;
        if (++parser->terms > LANGUAGE_TERM_LIMIT) {
            return parser_error(parser, argument->span, NULL,
                                "this expression has more than %d operators, the limit",
                                LANGUAGE_TERM_LIMIT);
        }
    } while (parser_accept(parser, ','));
    return true;
}

static struct expression *parse_call(struct parser *parser, struct expression *call)
{
    const struct token *open = parser_peek(parser, 0);
    call->kind = EXPRESSION_CALL;
    if (!deeper(parser, open)) {
        return NULL;
    }
    parser->at++;
    bool read = parser_is_symbol(parser, 0, ')') || parse_arguments(parser, call);
    parser->depth--;
    return read && close(parser, open, &call->span.end) ? call : NULL;
}

static struct expression *parse_name(struct parser *parser)
{
    const struct token *token = parser_peek(parser, 0);
    struct expression *name = create(parser, EXPRESSION_NAME, parser_span(parser, token));
    if (name == NULL) {
        return NULL;
    }
    name->name = token->text;
    parser->at++;
    if (parser_is_symbol(parser, 0, '(') && !token->dotted) {
        return parse_call(parser, name);
    }
    return name;
}

static struct expression *parse_primary(struct parser *parser)
{
    const struct token *token = parser_peek(parser, 0);
    if (token->kind == TOKEN_NUMBER) {
        return parse_number(parser);
    }
    if (token->kind == TOKEN_NAME) {
        return parse_name(parser);
    }
    if (parser_is_symbol(parser, 0, '(')) {
        return parse_parentheses(parser);
    }
    const char *found = parser_found(parser, token);
    if (found != NULL) {
        (void)parser_error(parser, parser_span(parser, token), NULL,
                           "a value is wanted here; found %s", found);
    }
    return NULL;
}

static struct expression *parse_power(struct parser *parser)
{
    struct expression *base = parse_primary(parser);
    if (base == NULL || !parser_is_symbol(parser, 0, '^')) {
        return base;
    }
    if (!deeper(parser, parser_peek(parser, 0))) {
        return NULL;
    }
    parser->at++;
    struct expression *exponent = parse_sign(parser);
    parser->depth--;
    return create_binary(parser, EXPRESSION_POWER, base, exponent);
}

/* "-20 C" is one literal: the sign belongs to the degrees, not to the kelvins. */
static struct expression *parse_cold(struct parser *parser, const struct token *sign)
{
    const struct token *token = parser_peek(parser, 0);
    struct span span = {parser->lexer.file, sign->begin, token->end};
    struct expression *number = create(parser, EXPRESSION_NUMBER, span);
    if (number != NULL) {
        number->number = token->number;
        number->number.value = unit_celsius(-token->count);
        parser->at++;
    }
    return number;
}

static struct expression *parse_sign(struct parser *parser)
{
    const struct token *sign = parser_peek(parser, 0);
    bool minus = parser_is_symbol(parser, 0, '-');
    if (!minus && !parser_is_symbol(parser, 0, '+')) {
        return parse_power(parser);
    }
    if (!deeper(parser, sign)) {
        return NULL;
    }
    parser->at++;
    const struct token *next = parser_peek(parser, 0);
    struct expression *operand = NULL;
    bool cold = minus && next->kind == TOKEN_NUMBER && next->number.celsius &&
                !parser_is_symbol(parser, 1, '^');
    operand = cold ? parse_cold(parser, sign) : parse_sign(parser);
    parser->depth--;
    if (operand == NULL || !minus || cold) {
        return operand;
    }
    struct span span = {parser->lexer.file, sign->begin, operand->span.end};
    struct expression *negative = create(parser, EXPRESSION_NEGATE, span);
    if (negative != NULL) {
        negative->left = operand;
    }
    return negative;
}

static struct expression *parse_product(struct parser *parser)
{
    struct expression *left = parse_sign(parser);
    while (left != NULL && (parser_is_symbol(parser, 0, '*') || parser_is_symbol(parser, 0, '/'))) {
        enum expression_kind kind =
            parser_is_symbol(parser, 0, '*') ? EXPRESSION_MULTIPLY : EXPRESSION_DIVIDE;
        parser->at++;
        left = create_binary(parser, kind, left, parse_sign(parser));
    }
    return left;
}

static struct expression *parse_sum(struct parser *parser)
{
    struct expression *left = parse_product(parser);
    while (left != NULL && (parser_is_symbol(parser, 0, '+') || parser_is_symbol(parser, 0, '-'))) {
        enum expression_kind kind =
            parser_is_symbol(parser, 0, '+') ? EXPRESSION_ADD : EXPRESSION_SUBTRACT;
        parser->at++;
        left = create_binary(parser, kind, left, parse_product(parser));
    }
    return left;
}

const struct expression *parser_expression(struct parser *parser)
{
    parser->depth = 0;
    parser->terms = 0;
    return parse_sum(parser);
}

const struct expression *parser_list_item(struct parser *parser)
{
    parser->depth = 0;
    parser->terms = 0;
    return parse_product(parser);
}

/*
 * parse_statement.c: the statements, each a row of steps in one table.
 *
 * A step reads one phrase ("from A to B") into the statement. To add a statement, add its kind to
 * tree.h and a row to the table.
 */
#include <stdio.h>
#include <string.h>

#include "language/parser.h"
#include "language/parser_internal.h"

#include "language/expression_unit.h"

/* The words inside statements, for near names; the word itself, out of place, is none. */
static const char *near_inner_word(const char *word)
{
    static const char *const words[] = {"from",  "to",     "at",   "within",     "of",  "below",
                                        "above", "points", "show", "everywhere", "for", "so"};
    const char *near = near_name(word, words, (int)(sizeof words / sizeof words[0]));
    return near != NULL && strcmp(near, word) == 0 ? NULL : near;
}

/* "`wanted` is wanted here; found ...". The near name is shown when it is the word wanted. */
static bool want(struct parser *parser, const char *wanted, const char *word)
{
    const struct token *token = parser_peek(parser, 0);
    const char *found = parser_found(parser, token);
    if (found == NULL) {
        return false;
    }
    const char *near =
        token->kind == TOKEN_NAME && word != NULL ? near_name(token->text, &word, 1) : NULL;
    return parser_error(parser, parser_span(parser, token), parser_hint(parser, near),
                        "%s is wanted here; found %s", wanted, found);
}

static bool expect_word(struct parser *parser, const char *word)
{
    char wanted[32];
    if (parser_accept_word(parser, word)) {
        return true;
    }
    snprintf(wanted, sizeof wanted, "'%s'", word);
    return want(parser, wanted, word);
}

static bool read_value(struct parser *parser, const struct expression **value)
{
    *value = parser_expression(parser);
    return *value != NULL;
}

/* A name without dots, or with them where an inner thing may be meant. */
static bool read_word(struct parser *parser, struct word *word, const char *what, bool dots)
{
    const struct token *token = parser_peek(parser, 0);
    if (token->kind == TOKEN_NUMBER) {
        const bool is_ground = token->number.value == 0 && strcmp(what, "a node") == 0;
        return parser_error(parser, parser_span(parser, token),
                            is_ground ? "0 V is called gnd" : "a name begins with a letter or _",
                            "%s is wanted here; found a number", what);
    }
    if (token->kind != TOKEN_NAME) {
        return want(parser, what, NULL);
    }
    if (token->dotted && !dots) {
        return parser_error(parser, parser_span(parser, token), NULL,
                            "%s is wanted here; it has no dots", what);
    }
    *word = (struct word){token->text, parser_span(parser, token)};
    parser->at++;
    return true;
}

static bool at_assignment(const struct parser *parser)
{
    return parser_peek(parser, 0)->kind == TOKEN_NAME && parser_is_symbol(parser, 1, '=');
}

static bool step_text(struct parser *parser, struct statement *statement)
{
    const struct token *token = parser_peek(parser, 0);
    if (token->kind != TOKEN_TEXT) {
        return want(parser, "a text between quotation marks", NULL);
    }
    statement->text = token->text;
    statement->text_span = parser_span(parser, token);
    parser->at++;
    return true;
}

static bool step_name(struct parser *parser, struct statement *statement)
{
    if (statement->kind == STATEMENT_USE && at_assignment(parser)) {
        return parser_error(parser, parser_span(parser, parser_peek(parser, 0)),
                            arena_format(parser->arena, "use %s NAME ...", statement->type.text),
                            "the name of this use is missing");
    }
    return read_word(parser, &statement->name, "a name", false);
}

static bool step_node(struct parser *parser, struct statement *statement)
{
    return read_word(parser, &statement->name, "a node", true);
}

static bool step_thing(struct parser *parser, struct statement *statement)
{
    return read_word(parser, &statement->name, "the name of a value", true);
}

static bool step_type(struct parser *parser, struct statement *statement)
{
    const char *what = statement->kind == STATEMENT_USE ? "the name of a block" : "a model kind";
    return read_word(parser, &statement->type, what, false);
}

static bool read_quantity(struct parser *parser, struct word *word)
{
    const struct token *token = parser_peek(parser, 0);
    if (!read_word(parser, word, "a quantity", true)) {
        return false;
    }
    if (!token->dotted) {
        return parser_error(parser, word->span, NULL,
                            "a quantity is wanted here, written THING.QUANTITY as in "
                            "'tail.current'; found '%s'",
                            word->text);
    }
    return true;
}

static bool step_quantity(struct parser *parser, struct statement *statement)
{
    return read_quantity(parser, &statement->quantity);
}

static bool step_value(struct parser *parser, struct statement *statement)
{
    return read_value(parser, &statement->value);
}

/* The voltage of a rail stands behind its name, without a sign between. */
static bool step_volts(struct parser *parser, struct statement *statement)
{
    const struct token *token = parser_peek(parser, 0);
    if (parser_is_symbol(parser, 0, '=')) {
        const uint32_t end = statement->span.end;
        uint32_t begin = token->end;
        while (begin < end && parser->lexer.text[begin] == ' ') {
            begin++;
        }
        return parser_error(parser, parser_span(parser, token),
                            arena_format(parser->arena, "write 'rail %s %.*s'",
                                         statement->name.text, (int)(end - begin),
                                         parser->lexer.text + begin),
                            "a value is wanted here; found '='");
    }
    return step_value(parser, statement);
}

static bool step_equals(struct parser *parser, struct statement *statement)
{
    return (parser_accept(parser, '=') || want(parser, "'='", NULL)) &&
           step_value(parser, statement);
}

static bool step_range(struct parser *parser, struct statement *statement)
{
    return expect_word(parser, "from") && read_value(parser, &statement->from) &&
           expect_word(parser, "to") && read_value(parser, &statement->to);
}

static bool step_range_unless_process(struct parser *parser, struct statement *statement)
{
    return strcmp(statement->name.text, "process") == 0 || step_range(parser, statement);
}

static bool step_at(struct parser *parser, struct statement *statement)
{
    return expect_word(parser, "at") && read_value(parser, &statement->at);
}

static bool step_within(struct parser *parser, struct statement *statement)
{
    return !parser_accept_word(parser, "within") || read_value(parser, &statement->within);
}

static bool step_points(struct parser *parser, struct statement *statement)
{
    return !parser_accept_word(parser, "points") || read_value(parser, &statement->points);
}

static bool add_word(struct parser *parser, struct statement *statement, int *capacity,
                     struct word word)
{
    struct word *words =
        arena_grow(parser->arena, statement->words, statement->word_count, capacity, sizeof *words);
    if (words == NULL) {
        return parser_no_memory(parser);
    }
    statement->words = words;
    words[statement->word_count++] = word;
    return true;
}

/* "show Q, Q ...": the commas may be left out. */
static bool step_show(struct parser *parser, struct statement *statement)
{
    int capacity = 0;
    bool comma = false;
    if (!expect_word(parser, "show")) {
        return false;
    }
    do {
        struct word word = {NULL, SPAN_NONE};
        if (!read_quantity(parser, &word) || !add_word(parser, statement, &capacity, word)) {
            return false;
        }
        comma = parser_accept(parser, ',');
    } while (comma || parser_peek(parser, 0)->dotted);
    return true;
}

/* "for THING = v1 v2 ..." of a sweep. */
static bool step_for(struct parser *parser, struct statement *statement)
{
    int capacity = 0;
    if (!parser_accept_word(parser, "for")) {
        return true;
    }
    if (!read_word(parser, &statement->thing2, "the name of a value", true) ||
        !(parser_accept(parser, '=') || want(parser, "'='", NULL))) {
        return false;
    }
    do {
        const struct expression *value = parser_list_item(parser);
        if (value == NULL) {
            return false;
        }
        const struct expression **values =
            arena_grow(parser->arena, statement->values, statement->value_count, &capacity,
                       sizeof(const struct expression *));
        if (values == NULL) {
            return parser_no_memory(parser);
        }
        statement->values = values;
        values[statement->value_count++] = value;
    } while (parser_accept(parser, ',') || parser_peek(parser, 0)->kind != TOKEN_END);
    return true;
}

static bool step_so(struct parser *parser, struct statement *statement)
{
    return expect_word(parser, "so") && step_quantity(parser, statement) &&
           step_equals(parser, statement);
}

/* "below V", "above V" or "within P of V". */
static bool step_relation(struct parser *parser, struct statement *statement)
{
    if (parser_accept_word(parser, "below")) {
        statement->relation = RELATION_BELOW;
        return step_value(parser, statement);
    }
    if (parser_accept_word(parser, "above")) {
        statement->relation = RELATION_ABOVE;
        return step_value(parser, statement);
    }
    if (parser_accept_word(parser, "within")) {
        statement->relation = RELATION_WITHIN;
        return read_value(parser, &statement->tolerance) && expect_word(parser, "of") &&
               step_value(parser, statement);
    }
    const struct token *token = parser_peek(parser, 0);
    const char *near = token->kind == TOKEN_NAME ? near_inner_word(token->text) : NULL;
    return want(parser, "'below', 'above' or 'within'", near);
}

static bool step_scope(struct parser *parser, struct statement *statement)
{
    if (parser_accept_word(parser, "everywhere")) {
        statement->scope = SCOPE_EVERYWHERE;
    } else if (parser_accept_word(parser, "for")) {
        statement->scope = SCOPE_YIELD;
        return read_value(parser, &statement->yield);
    }
    return true;
}

/* A caution code may hold hyphens, without blanks around them: "mirror-length". */
static bool step_code(struct parser *parser, struct statement *statement)
{
    struct word word = {NULL, SPAN_NONE};
    if (!read_word(parser, &word, "the code of a caution", false)) {
        return false;
    }
    while (parser_is_symbol(parser, 0, '-') && parser_peek(parser, 1)->kind == TOKEN_NAME &&
           parser_peek(parser, 0)->begin == word.span.end &&
           parser_peek(parser, 1)->begin == word.span.end + 1) {
        word.span.end = parser_peek(parser, 1)->end;
        parser->at += 2;
    }
    word.text = arena_copy(parser->arena, parser->lexer.text + word.span.begin,
                           word.span.end - word.span.begin);
    statement->quantity = word;
    return word.text != NULL || parser_no_memory(parser);
}

static bool step_optional_thing(struct parser *parser, struct statement *statement)
{
    return parser_peek(parser, 0)->kind == TOKEN_END || step_thing(parser, statement);
}

static bool add_assignment(struct parser *parser, struct statement *statement, int *capacity,
                           struct assignment assignment)
{
    struct assignment *list = arena_grow(parser->arena, statement->assignments,
                                         statement->assignment_count, capacity, sizeof *list);
    if (list == NULL) {
        return parser_no_memory(parser);
    }
    statement->assignments = list;
    list[statement->assignment_count++] = assignment;
    return true;
}

/* A power of two that arena_grow would have made room for `count` elements. */
static int capacity_of(int count)
{
    int capacity = count > 0 ? 8 : 0;
    while (capacity < count) {
        capacity *= 2;
    }
    return capacity;
}

/* "key = value"; the key is at the parser's place and '=' was seen behind it. */
static bool read_assignment(struct parser *parser, struct statement *statement, int *capacity)
{
    struct assignment assignment = {.operation = '='};
    if (!read_word(parser, &assignment.key, "a name", false)) {
        return false;
    }
    parser->at++;
    assignment.value = parser_expression(parser);
    return assignment.value != NULL && add_assignment(parser, statement, capacity, assignment);
}

static bool step_assignments(struct parser *parser, struct statement *statement)
{
    int capacity = 0;
    while (at_assignment(parser)) {
        if (!read_assignment(parser, statement, &capacity)) {
            return false;
        }
    }
    return parser_peek(parser, 0)->kind == TOKEN_END || want(parser, "'name = value'", NULL);
}

/* The pins of a block, and the names and defaults of its values. */
static bool step_pins(struct parser *parser, struct statement *statement)
{
    int capacity = 0;
    while (parser_peek(parser, 0)->kind != TOKEN_END && !at_assignment(parser)) {
        struct word pin = {NULL, SPAN_NONE};
        if (!read_word(parser, &pin, "the name of a pin", false) ||
            !add_word(parser, statement, &capacity, pin)) {
            return false;
        }
    }
    return step_assignments(parser, statement);
}

static const struct statement_rule rules[] = {
    {"title", STATEMENT_TITLE, false, false, {step_text}, BODY_NONE},
    {"process", STATEMENT_PROCESS, true, false, {step_text}, BODY_NONE},
    {"let", STATEMENT_LET, true, true, {step_name, step_equals}, BODY_NONE},
    {"temperature", STATEMENT_TEMPERATURE, false, false, {step_value}, BODY_NONE},
    {"measured_at", STATEMENT_MEASURED_AT, true, false, {step_value}, BODY_NONE},
    {"valid", STATEMENT_VALID, true, false, {step_name, step_range}, BODY_NONE},
    {"model", STATEMENT_MODEL, true, false, {step_name, step_type}, BODY_VALUES},
    {"corner", STATEMENT_CORNER, true, false, {step_name}, BODY_VALUES},
    {"rail", STATEMENT_RAIL, false, false, {step_name, step_volts}, BODY_NONE},
    {"block", STATEMENT_BLOCK, false, false, {step_name, step_pins}, BODY_STATEMENTS},
    {"use", STATEMENT_USE, false, true, {step_type, step_name, step_assignments}, BODY_NONE},
    {"output",
     STATEMENT_OUTPUT,
     false,
     false,
     {step_node, step_at, step_range, step_within},
     BODY_NONE},
    {"sweep",
     STATEMENT_SWEEP,
     false,
     false,
     {step_thing, step_range, step_points, step_show, step_for},
     BODY_NONE},
    {"hand", STATEMENT_HAND, false, false, {step_quantity, step_equals}, BODY_NONE},
    {"require",
     STATEMENT_REQUIRE,
     false,
     false,
     {step_quantity, step_relation, step_scope},
     BODY_NONE},
    {"vary", STATEMENT_VARY, false, false, {step_thing, step_range_unless_process}, BODY_NONE},
    {"choose", STATEMENT_CHOOSE, false, false, {step_thing, step_range, step_so}, BODY_NONE},
    {"quiet", STATEMENT_QUIET, false, false, {step_code, step_optional_thing}, BODY_NONE},
};

enum { RULE_COUNT = sizeof rules / sizeof rules[0] };

const struct statement_rule *statement_rule(const char *word)
{
    for (int i = 0; i < RULE_COUNT; i++) {
        if (strcmp(word, rules[i].word) == 0) {
            return &rules[i];
        }
    }
    return NULL;
}

int parser_statement_words(enum tree_role role, const char *const **words)
{
    /* In the order of the table; the first row of each role is checked by a test. */
    static const char *const in_cell[] = {
        "title",   "process", "let",    "temperature", "measured_at", "valid", "model",
        "corner",  "rail",    "block",  "use",         "output",      "sweep", "hand",
        "require", "vary",    "choose", "quiet",       "end"};
    static const char *const in_process[] = {"process", "let",    "measured_at", "valid",
                                             "model",   "corner", "end"};
    *words = role == TREE_CELL ? in_cell : in_process;
    return role == TREE_CELL ? (int)(sizeof in_cell / sizeof in_cell[0])
                             : (int)(sizeof in_process / sizeof in_process[0]);
}

/* Something stands where the statement should end: a wrong unit, a wrong word, or too much. */
static bool surplus(struct parser *parser)
{
    const struct token *token = parser_peek(parser, 0);
    const char *found = parser_found(parser, token);
    if (found == NULL) {
        return false;
    }
    if (token->kind == TOKEN_NAME && parser_peek(parser, -1)->kind == TOKEN_NUMBER) {
        const char *unit = unit_near(token->text);
        if (unit != NULL && strcmp(unit, token->text) != 0) {
            return parser_error(parser, parser_span(parser, token), parser_hint(parser, unit),
                                "there is no unit %s", found);
        }
    }
    if (token->kind == TOKEN_NUMBER && token->number.bare && token->number.value == 1 &&
        parser_is_symbol(parser, 1, '/') && parser_peek(parser, 2)->kind == TOKEN_NAME &&
        parser_peek(parser, -1)->kind == TOKEN_NUMBER) { /* "20 1/V" */
        const struct token *number = parser_peek(parser, -1);
        const char *hint =
            arena_format(parser->arena, "write '%.*s/%s'", (int)(number->end - number->begin),
                         parser->lexer.text + number->begin, parser_peek(parser, 2)->text);
        return parser_error(parser, parser_span(parser, token), hint,
                            "nothing more is wanted here; found %s", found);
    }
    const char *near = token->kind == TOKEN_NAME ? near_inner_word(token->text) : NULL;
    return parser_error(parser, parser_span(parser, token), parser_hint(parser, near),
                        "nothing more is wanted here; found %s", found);
}

bool statement_parse(struct parser *parser, const struct statement_rule *rule,
                     struct statement *statement)
{
    for (int i = 0; i < PARSER_STEPS && rule->steps[i] != NULL; i++) {
        if (!rule->steps[i](parser, statement)) {
            return false;
        }
    }
    return parser_peek(parser, 0)->kind == TOKEN_END || surplus(parser);
}

/* Two names behind the name of a part: its nodes, or more than two pins without their names. */
static bool two_nodes(struct parser *parser, const struct token *first, const struct token *second)
{
    const struct span both = {parser->lexer.file, first->begin, second->end};
    if (parser_peek(parser, 1)->kind == TOKEN_NAME) {
        return parser_error(parser, both,
                            arena_format(parser->arena,
                                         "write '%s -> %s', or PIN=%s for each of its pins",
                                         first->text, second->text, first->text),
                            "an arrow is wanted between two nodes");
    }
    return parser_error(parser, both,
                        arena_format(parser->arena, "write '%s -> %s'", first->text, second->text),
                        "an arrow is wanted between the nodes");
}

/* A second value behind the first: most often an '=' or an arrow was left out between two names. */
static bool second_value(struct parser *parser, const struct statement *statement)
{
    const struct token *token = parser_peek(parser, 0), *before = parser_peek(parser, -1);
    const char *hint = NULL;
    if (before->kind == TOKEN_NUMBER) {
        return surplus(parser);
    }
    if (before->kind == TOKEN_NAME && token->kind == TOKEN_NAME) {
        bool arrow = statement->node_from.text == NULL && statement->assignment_count == 0;
        if (arrow) {
            return two_nodes(parser, before, token);
        }
        hint = arena_format(parser->arena, "write '%s=%s'", before->text, token->text);
    }
    const char *found = parser_found(parser, token);
    return found != NULL &&
           parser_error(parser, parser_span(parser, token), hint,
                        "a second value for '%s'; found %s", statement->name.text, found);
}

/* The value, text and assignments behind the nodes of a part, in any order. */
static bool part_tail(struct parser *parser, struct statement *statement)
{
    int capacity = 0;
    while (parser_peek(parser, 0)->kind != TOKEN_END) {
        bool read = false;
        if (at_assignment(parser)) {
            read = read_assignment(parser, statement, &capacity);
        } else if (statement->value != NULL || statement->text != NULL) {
            read = second_value(parser, statement);
        } else if (parser_peek(parser, 0)->kind == TOKEN_TEXT) {
            read = step_text(parser, statement);
        } else {
            read = step_value(parser, statement);
        }
        if (!read) {
            return false;
        }
    }
    return true;
}

static bool part_nodes(struct parser *parser, struct statement *statement)
{
    if (parser_is_symbol(parser, 0, '>') || parser_is_symbol(parser, 1, '>')) {
        return read_word(parser, &statement->node_from, "a node", true) &&
               (parser_accept(parser, '>') || want(parser, "'->'", NULL)) &&
               read_word(parser, &statement->node_to, "a node", true);
    }
    return true;
}

bool statement_parse_part(struct parser *parser, struct statement *statement)
{
    statement->type = statement->first;
    return read_word(parser, &statement->name, "a name", false) && part_nodes(parser, statement) &&
           part_tail(parser, statement);
}

bool statement_parse_value_line(struct parser *parser, struct statement *statement)
{
    bool corner = statement->kind == STATEMENT_CORNER;
    struct assignment line = {.operation = '='};
    if (!read_word(parser, &line.key, corner ? "MODEL.PARAMETER" : "a parameter", corner)) {
        return false;
    }
    if (corner && parser_accept(parser, 'a')) {
        line.operation = 'a';
    } else if (corner && parser_accept(parser, 'm')) {
        line.operation = 'm';
    } else if (corner) {
        return want(parser, "'+=' or '*='", NULL);
    } else if (!parser_accept(parser, '=')) {
        return want(parser, "'='", NULL);
    }
    int capacity = capacity_of(statement->assignment_count);
    if (!read_value(parser, &line.value) ||
        (parser_peek(parser, 0)->kind != TOKEN_END && !surplus(parser))) {
        return false;
    }
    return add_assignment(parser, statement, &capacity, line);
}

/*
 * blocks.c: uses of blocks, each with its own nodes, parameters and lets.
 */
#include "circuit/build.h"

#include <string.h>

static bool add_use(const struct frame *outer, const struct statement *use);

bool build_body(const struct frame *frame, struct statement *const *body, int count)
{
    struct builder *b = frame->builder;
    for (int k = 0; k < count; k++) {
        const struct statement *statement = body[k];
        if (statement->kind != STATEMENT_PART && statement->kind != STATEMENT_USE) {
            continue;
        }
        if (build_is_over_limit(b, statement->type.span)) {
            break;
        }
        b->placed++;
        if (statement->kind == STATEMENT_PART && !build_part(frame, statement)) {
            return false;
        }
        if (statement->kind == STATEMENT_USE && !add_use(frame, statement)) {
            return false;
        }
    }
    return true;
}

static bool keep_value(struct frame *frame, const char *name, struct quantity value,
                       struct span where)
{
    struct builder *b = frame->builder;
    struct let_value *list = arena_grow(b->arena, frame->values, frame->value_count,
                                        &frame->value_capacity, sizeof *list);
    if (list == NULL) {
        return false;
    }
    frame->values = list;
    list[frame->value_count++] = (struct let_value){.name = name, .value = value, .where = where};
    return true;
}

static const struct assignment *find_assignment(const struct statement *statement, const char *key)
{
    for (int k = 0; k < statement->assignment_count; k++) {
        if (strcmp(statement->assignments[k].key.text, key) == 0) {
            return &statement->assignments[k];
        }
    }
    return NULL;
}

/* Parameters of a block: the defaults, replaced by what the use says; then its lets. */
static bool block_values(struct frame *frame, const struct frame *outer,
                         const struct statement *block, const struct statement *use)
{
    struct builder *b = frame->builder;
    struct expression_scope scope = frame_scope(outer);
    for (int k = 0; k < block->assignment_count; k++) {
        const struct assignment *standard = &block->assignments[k];
        const struct assignment *given = find_assignment(use, standard->key.text);
        const struct expression *e = given != NULL ? given->value : standard->value;
        struct quantity value = {.value = 1, .bare = true};
        expression_value(e, &scope, b->diagnostics, &value);
        if (!keep_value(frame, standard->key.text, value, standard->key.span)) {
            return false;
        }
    }
    struct expression_scope inner = frame_scope(frame);
    for (int k = 0; k < block->body_count; k++) {
        const struct statement *let = block->body[k];
        if (let->kind == STATEMENT_LET) {
            struct quantity value = {.value = 1, .bare = true};
            expression_value(let->value, &inner, b->diagnostics, &value);
            if (!keep_value(frame, let->name.text, value, let->name.span)) {
                return false;
            }
        }
    }
    return true;
}

static bool block_pins(const struct frame *outer, const struct statement *block,
                       const struct statement *use, int *nodes)
{
    struct builder *b = outer->builder;
    for (int k = 0; k < block->word_count; k++) {
        const struct assignment *a = find_assignment(use, block->words[k].text);
        nodes[k] = 0;
        if (a == NULL) {
            diagnostics_add(b->diagnostics, use->name.span,
                            arena_format(b->arena, "add %s=NODE", block->words[k].text),
                            "%s leaves out pin '%s' of block %s", use->name.text,
                            block->words[k].text, block->name.text);
        } else if (a->value->kind != EXPRESSION_NAME) {
            diagnostics_add(b->diagnostics, a->value->span, build_ground_hint(a->value),
                            "pin %s wants the name of a node", a->key.text);
        } else {
            nodes[k] = build_node(outer, a->value->name, a->value->span);
            if (nodes[k] < 0) {
                return false;
            }
        }
    }
    for (int k = 0; k < use->assignment_count; k++) {
        const struct assignment *a = &use->assignments[k];
        bool known = find_assignment(block, a->key.text) != NULL;
        int count = 0;
        for (int p = 0; p < block->word_count && count < LIST_LIMIT; p++) {
            known |= strcmp(block->words[p].text, a->key.text) == 0;
            b->known[count++] = block->words[p].text;
        }
        for (int p = 0; p < block->assignment_count && count < LIST_LIMIT; p++) {
            b->known[count++] = block->assignments[p].key.text;
        }
        if (!known) {
            diagnostics_add(b->diagnostics, a->key.span,
                            hint_near(b->arena, a->key.text, b->known, count,
                                      hint_list(b->arena, "known: ", b->known, count, NULL)),
                            "block %s has no pin or parameter '%s'", block->name.text, a->key.text);
        }
    }
    return true;
}

static const struct statement *find_block(struct builder *b, const struct word *name)
{
    const int index = names_find(b->circuit->names, NAME_BLOCK, name->text);
    if (index >= 0) {
        return b->blocks[index].statement;
    }
    if (diagnostics_has_lost(b->diagnostics, name->text)) {
        return NULL;
    }
    const int count = names_list(b->circuit->names, NAME_BLOCK, b->known, LIST_LIMIT);
    diagnostics_add(b->diagnostics, name->span,
                    hint_near(b->arena, name->text, b->known, count, NULL),
                    "there is no block '%s'", name->text);
    return NULL;
}

static bool add_use(const struct frame *outer, const struct statement *use)
{
    struct builder *b = outer->builder;
    const struct statement *block = find_block(b, &use->type);
    if (block == NULL) {
        return true;
    }
    if (outer->depth >= BLOCK_DEPTH_LIMIT) {
        diagnostics_add(b->diagnostics, use->name.span, NULL,
                        "blocks that use blocks are nested deeper than %d (does %s use itself?)",
                        BLOCK_DEPTH_LIMIT, block->name.text);
        return true;
    }
    struct frame frame = {.builder = b,
                          .outer = outer,
                          .pins = block->words,
                          .pin_count = block->word_count,
                          .depth = outer->depth + 1};
    const char *name = arena_format(b->arena, "%s%s", outer->prefix, use->name.text);
    frame.prefix = name == NULL ? NULL : arena_format(b->arena, "%s.", name);
    int *nodes = arena_new_array(b->arena, int, block->word_count);
    if (frame.prefix == NULL || nodes == NULL) {
        return false;
    }
    const bool is_new = build_name_is_new(b, name, use->name.span);
    if (!block_pins(outer, block, use, nodes)) {
        return false;
    }
    if (!is_new) {
        return true;
    }
    frame.pin_nodes = nodes;
    return names_add(b->circuit->names, NAME_INSTANCE, name, NAME_OF_BLOCK) &&
           block_values(&frame, outer, block, use) &&
           build_body(&frame, block->body, block->body_count);
}

/* Names of a block: pins, parameters and lets. */
static int block_names(const struct statement *block)
{
    int count = block->word_count + block->assignment_count;
    for (int k = 0; k < block->body_count; k++) {
        count += block->body[k]->kind == STATEMENT_LET;
    }
    return count;
}

bool build_blocks(struct builder *b)
{
    for (int k = 0; k < b->cell->tree.count; k++) {
        const struct statement *statement = b->cell->tree.statements[k];
        if (statement->kind != STATEMENT_BLOCK) {
            continue;
        }
        if (names_find(b->circuit->names, NAME_BLOCK, statement->name.text) >= 0) {
            diagnostics_add(b->diagnostics, statement->name.span, "give it another name",
                            "there are two blocks called '%s'", statement->name.text);
            continue;
        }
        if (block_names(statement) > CIRCUIT_NAME_LIMIT) {
            diagnostics_add(b->diagnostics, statement->name.span, NULL,
                            "block '%s' has more than %d pins, parameters and lets, the limit",
                            statement->name.text, CIRCUIT_NAME_LIMIT);
            continue;
        }
        struct block_entry *list =
            arena_grow(b->arena, b->blocks, b->block_count, &b->block_capacity, sizeof *list);
        if (list == NULL ||
            !names_add(b->circuit->names, NAME_BLOCK, statement->name.text, b->block_count)) {
            return false;
        }
        b->blocks = list;
        list[b->block_count++] = (struct block_entry){statement};
    }
    return true;
}

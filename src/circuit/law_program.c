/*
 * law_program.c: the expression of a `law` to a program of postfix steps, with its dimension
 * checked. Subexpressions without a node voltage are computed here, once.
 */
#include "circuit/build.h"

#include <math.h>
#include <string.h>

#include "devices/law.h"

enum { STEP_LIMIT = 4000 };

struct compiler {
    const struct frame *frame;
    struct expression_scope scope;
    struct law_step *steps;
    int step_count, step_capacity;
    int stack, inputs_used;
    int inputs[LAW_INPUT_LIMIT];
    bool failed; /* an error was reported, or memory is short */
};

struct kind {
    struct dimension dimension;
    bool bare;
};

static const struct {
    const char *name;
    enum law_operation operation;
    int arguments; /* -1: two or more */
    bool wants_plain;
} functions[] = {
    {"sqrt", LAW_SQRT, 1, false}, {"ln", LAW_LN, 1, true},     {"log10", LAW_LOG10, 1, true},
    {"exp", LAW_EXP, 1, true},    {"min", LAW_MIN, -1, false}, {"max", LAW_MAX, -1, false},
    {"abs", LAW_ABS, 1, false},
};

static void complain(struct compiler *c, struct span where, const char *hint, const char *text)
{
    diagnostics_add(c->frame->builder->diagnostics, where, hint, "%s", text);
    c->failed = true;
}

static void emit(struct compiler *c, enum law_operation operation, double value, int index,
                 int pops)
{
    struct law_step *list = arena_grow(c->frame->builder->arena, c->steps, c->step_count,
                                       &c->step_capacity, sizeof *list);
    if (list == NULL) {
        c->failed = true;
        return;
    }
    c->steps = list;
    list[c->step_count++] = (struct law_step){operation, value, index};
    c->stack += 1 - pops;
}

/* "ref.v" -> the node's name without ".v", or NULL. */
static const char *voltage_of(struct compiler *c, const struct expression *e)
{
    const size_t length = e->kind == EXPRESSION_NAME ? strlen(e->name) : 0;
    if (length < 3 || strcmp(e->name + length - 2, ".v") != 0) {
        return NULL;
    }
    return arena_copy(c->frame->builder->arena, e->name, length - 2);
}

static bool has_voltage(const struct expression *e)
{
    for (; e != NULL; e = e->left) {
        const size_t length = e->kind == EXPRESSION_NAME ? strlen(e->name) : 0;
        if (length > 2 && strcmp(e->name + length - 2, ".v") == 0) {
            return true;
        }
        for (int k = 0; k < e->argument_count; k++) {
            if (has_voltage(e->arguments[k])) {
                return true;
            }
        }
        if (e->right != NULL && has_voltage(e->right)) {
            return true;
        }
    }
    return false;
}

static struct kind compile(struct compiler *c, const struct expression *e);

/* Whether a name is that of a node and of no value: its voltage was meant. */
static bool is_node(struct compiler *c, const char *name)
{
    const struct frame *frame = c->frame;
    struct quantity ignored;
    struct dimension dimension;
    double factor;
    bool celsius;
    if (c->scope.find(c->scope.self, name, SPAN_NONE, &ignored) ||
        unit_parse(name, strlen(name), &factor, &dimension, &celsius)) {
        return false;
    }
    for (int k = 0; k < frame->pin_count; k++) {
        if (strcmp(frame->pins[k].text, name) == 0) {
            return true;
        }
    }
    const char *full = arena_format(frame->builder->arena, "%s%s", frame->prefix, name);
    return full != NULL && names_find(frame->builder->circuit->names, NAME_NODE, full) >= 0;
}

/* Reports names that no law can have: a node without its ".v", a quantity of a part. */
static void check_names(struct compiler *c, const struct expression *e)
{
    for (; e != NULL && !c->failed; e = e->left) {
        if (e->kind == EXPRESSION_NAME && strchr(e->name, '.') != NULL) {
            complain(c, e->span, "node voltages are written NODE.v",
                     "a law sees node voltages and lets only");
        } else if (e->kind == EXPRESSION_NAME && is_node(c, e->name)) {
            complain(c, e->span,
                     arena_format(c->frame->builder->arena, "its voltage is '%s.v'", e->name),
                     "this is a node, not a value");
        }
        for (int k = 0; k < e->argument_count; k++) {
            check_names(c, e->arguments[k]);
        }
        check_names(c, e->right);
    }
}

static struct kind compile_constant(struct compiler *c, const struct expression *e)
{
    check_names(c, e);
    if (c->failed) {
        return (struct kind){DIMENSION_NONE, true};
    }
    struct quantity value = {.bare = true};
    if (!expression_value(e, &c->scope, c->frame->builder->diagnostics, &value)) {
        c->failed = true;
    }
    emit(c, LAW_CONSTANT, value.value, 0, 0);
    return (struct kind){value.dimension, value.bare};
}

static struct kind compile_input(struct compiler *c, const struct expression *e)
{
    const struct kind kind = {DIMENSION_VOLTAGE, false};
    const char *name = voltage_of(c, e);
    const int node = name == NULL ? -1 : build_node(c->frame, name, e->span);
    if (node < 0) {
        c->failed = true;
        return kind;
    }
    if (node == 0) {
        emit(c, LAW_CONSTANT, 0, 0, 0);
        return kind;
    }
    int k = 0;
    while (k < c->inputs_used && c->inputs[k] != node) {
        k++;
    }
    if (k == LAW_INPUT_LIMIT) {
        diagnostics_add(c->frame->builder->diagnostics, e->span, NULL,
                        "a law may use at most %d node voltages", LAW_INPUT_LIMIT);
        c->failed = true;
        return kind;
    }
    if (k == c->inputs_used) {
        c->inputs[c->inputs_used++] = node;
    }
    emit(c, LAW_INPUT, 0, k, 0);
    return kind;
}

/* The common dimension of two terms; a plain number takes the other's. */
static struct kind common(struct compiler *c, struct kind a, struct kind b, struct span where)
{
    if (dimension_equal(a.dimension, b.dimension)) {
        return (struct kind){a.dimension, a.bare && b.bare};
    }
    if (a.bare || b.bare) {
        return a.bare ? b : a;
    }
    char left[64], right[64];
    dimension_describe(a.dimension, left, sizeof left);
    dimension_describe(b.dimension, right, sizeof right);
    diagnostics_add(c->frame->builder->diagnostics, where, NULL, "%s and %s cannot be added", left,
                    right);
    c->failed = true;
    return a;
}

static bool is_plain(struct kind kind)
{
    return kind.bare || dimension_equal(kind.dimension, DIMENSION_NONE);
}

static struct kind compile_power(struct compiler *c, const struct expression *e)
{
    const struct kind base = compile(c, e->left);
    if (has_voltage(e->right)) {
        const struct kind exponent = compile(c, e->right);
        if (!is_plain(base) || !is_plain(exponent)) {
            complain(c, e->span, "divide by a unit first",
                     "a power with a voltage in its exponent wants plain numbers");
        }
        emit(c, LAW_POWER, 0, 0, 2);
        return (struct kind){DIMENSION_NONE, base.bare};
    }
    double exponent = 1;
    if (!expression_wanted(e->right, &c->scope, DIMENSION_NONE, c->frame->builder->diagnostics,
                           &exponent)) {
        c->failed = true;
    }
    struct kind result = {base.dimension, base.bare};
    if (!dimension_power(base.dimension, exponent, &result.dimension)) {
        complain(c, e->right->span, NULL, "this power has no usable dimension");
    }
    emit(c, LAW_CONSTANT, exponent, 0, 0);
    emit(c, LAW_POWER, 0, 0, 2);
    return result;
}

static struct kind compile_call(struct compiler *c, const struct expression *e)
{
    for (size_t f = 0; f < sizeof functions / sizeof functions[0]; f++) {
        if (strcmp(functions[f].name, e->name) != 0) {
            continue;
        }
        if (functions[f].arguments < 0 ? e->argument_count < 2
                                       : e->argument_count != functions[f].arguments) {
            complain(c, e->span, NULL, "this function has the wrong number of arguments");
            break;
        }
        struct kind kind = compile(c, e->arguments[0]);
        if (functions[f].arguments == 1) {
            emit(c, functions[f].operation, 0, 0, 1);
        }
        for (int k = 1; k < e->argument_count; k++) {
            const struct kind next = compile(c, e->arguments[k]);
            kind = common(c, kind, next, e->span);
            emit(c, functions[f].operation, 0, 0, 2);
        }
        if (functions[f].wants_plain && !is_plain(kind)) {
            complain(c, e->arguments[0]->span, "divide by a unit, such as thermal_voltage",
                     "this function wants a plain number");
        }
        if (functions[f].operation == LAW_SQRT) {
            dimension_power(kind.dimension, 0.5, &kind.dimension);
        }
        return kind;
    }
    if (!c->failed) {
        /* An unknown function: expression_value has the words for it. */
        struct quantity ignored;
        c->failed = !expression_value(e, &c->scope, c->frame->builder->diagnostics, &ignored);
        c->failed = true;
    }
    return (struct kind){DIMENSION_NONE, true};
}

static struct kind compile_product(struct compiler *c, const struct expression *e)
{
    const struct kind left = compile(c, e->left);
    const struct kind right = compile(c, e->right);
    const bool product = e->kind == EXPRESSION_MULTIPLY;
    emit(c, product ? LAW_MULTIPLY : LAW_DIVIDE, 0, 0, 2);
    return (struct kind){product ? dimension_multiply(left.dimension, right.dimension)
                                 : dimension_divide(left.dimension, right.dimension),
                         left.bare && right.bare};
}

/* A sum or product is a chain down its left side; the depth that matters is bounded by the reader.
 */
static struct kind compile(struct compiler *c, const struct expression *e)
{
    if (c->failed) {
        return (struct kind){DIMENSION_NONE, true};
    }
    if (c->stack + 1 >= LAW_STACK_LIMIT || c->step_count >= STEP_LIMIT) {
        diagnostics_add(c->frame->builder->diagnostics, e->span, NULL,
                        "this law is too long: at most %d steps and %d open terms", STEP_LIMIT,
                        LAW_STACK_LIMIT);
        c->failed = true;
        return (struct kind){DIMENSION_NONE, true};
    }
    if (!has_voltage(e)) {
        return compile_constant(c, e);
    }
    switch (e->kind) {
    case EXPRESSION_NAME:
        return compile_input(c, e);
    case EXPRESSION_NEGATE: {
        const struct kind kind = compile(c, e->left);
        emit(c, LAW_NEGATE, 0, 0, 1);
        return kind;
    }
    case EXPRESSION_ADD:
    case EXPRESSION_SUBTRACT: {
        const struct kind left = compile(c, e->left);
        const struct kind right = compile(c, e->right);
        emit(c, e->kind == EXPRESSION_ADD ? LAW_ADD : LAW_SUBTRACT, 0, 0, 2);
        return c->failed ? left : common(c, left, right, e->span);
    }
    case EXPRESSION_MULTIPLY:
    case EXPRESSION_DIVIDE:
        return compile_product(c, e);
    case EXPRESSION_POWER:
        return compile_power(c, e);
    case EXPRESSION_CALL:
    case EXPRESSION_NUMBER: /* has no voltage: done above */
        break;
    }
    return compile_call(c, e);
}

const struct law_program *build_law(const struct frame *frame, const struct expression *expression,
                                    int **inputs)
{
    struct builder *b = frame->builder;
    struct compiler c = {.frame = frame, .scope = frame_scope(frame)};
    const struct kind kind = compile(&c, expression);
    if (!c.failed && !kind.bare && !dimension_equal(kind.dimension, DIMENSION_CURRENT)) {
        char found[64];
        dimension_describe(kind.dimension, found, sizeof found);
        diagnostics_add(b->diagnostics, expression->span, NULL, "a current is wanted; this is %s",
                        found);
        c.failed = true;
    }
    struct law_program *program = c.failed ? NULL : arena_new(b->arena, struct law_program);
    *inputs = arena_new_array(b->arena, int, c.inputs_used);
    if (program == NULL || *inputs == NULL) {
        return NULL;
    }
    memcpy(*inputs, c.inputs, (size_t)c.inputs_used * sizeof(int));
    *program = (struct law_program){c.steps, c.step_count, c.inputs_used};
    return program;
}

/*
 * network_law.c: sums, signs and constant factors at the top of a law's expression are taken apart,
 * so that what is linear in it becomes coefficients, and what depends on one voltage an element of
 * that voltage alone. Constant factors stay as steps of each part: no product of them is rounded
 * here.
 */
#include "analyses/network_law.h"

#include <string.h>

/* What stands around a subexpression, outward. */
struct frame {
    const struct frame *outer;
    enum law_operation operation; /* LAW_NEGATE, or LAW_MULTIPLY and LAW_DIVIDE by `value` */
    double value;
};

struct splitter {
    struct arena *arena;
    const struct law_program *program;
    int *start; /* [step_count] first step of the subexpression that ends at each */
    struct law_part *parts;
    int count, capacity;
    bool failed;
};

static int operands(enum law_operation operation)
{
    switch (operation) {
    case LAW_CONSTANT:
    case LAW_INPUT:
        return 0;
    case LAW_ADD:
    case LAW_SUBTRACT:
    case LAW_MULTIPLY:
    case LAW_DIVIDE:
    case LAW_POWER:
    case LAW_MIN:
    case LAW_MAX:
        return 2;
    default:
        return 1;
    }
}

static void find_starts(struct splitter *s)
{
    for (int k = 0; k < s->program->step_count; k++) {
        const int count = operands(s->program->steps[k].operation);
        s->start[k] = count == 0 ? k : count == 1 ? s->start[k - 1] : s->start[s->start[k - 1] - 1];
    }
}

/* The argument of a part for an input or a pair of them; -1 when it has no room. */
static int argument_of(struct law_part *part, int plus, int minus)
{
    int at = 0;
    while (at < part->program.input_count &&
           (part->inputs[at][0] != plus || part->inputs[at][1] != minus)) {
        at++;
    }
    if (at == ELEMENT_ARGUMENT_LIMIT) {
        return -1;
    }
    if (at == part->program.input_count) {
        part->inputs[at][0] = plus;
        part->inputs[at][1] = minus;
        part->program.input_count++;
    }
    return at;
}

/*
 * Copies steps first..last with inputs renamed to the part's arguments; `a.v - b.v` becomes one
 * argument when `pairs`. Returns the steps written, -1 when the arguments have no room.
 */
static int copy_steps(const struct splitter *s, int first, int last, bool pairs,
                      struct law_step *out, struct law_part *part)
{
    const struct law_step *steps = s->program->steps;
    int count = 0;
    for (int k = first; k <= last; k++) {
        out[count] = steps[k];
        if (steps[k].operation == LAW_INPUT) {
            const bool is_pair = pairs && k + 2 <= last && steps[k + 1].operation == LAW_INPUT &&
                                 steps[k + 2].operation == LAW_SUBTRACT;
            out[count].index = argument_of(part, steps[k].index, is_pair ? steps[k + 1].index : -1);
            if (out[count].index < 0) {
                return -1;
            }
            k += is_pair ? 2 : 0;
        }
        count++;
    }
    return count;
}

/* Appends the steps of `term` to a part that looks at the same one argument. */
static bool join(struct splitter *s, struct law_part *part, const struct law_part *term)
{
    const int a = part->program.step_count, b = term->program.step_count;
    struct law_step *steps = arena_new_array(s->arena, struct law_step, a + b + 1);
    if (steps == NULL) {
        return false;
    }
    memcpy(steps, part->program.steps, (size_t)a * sizeof *steps);
    memcpy(steps + a, term->program.steps, (size_t)b * sizeof *steps);
    steps[a + b] = (struct law_step){.operation = LAW_ADD};
    part->program.steps = steps;
    part->program.step_count = a + b + 1;
    part->is_linear = part->is_linear && term->is_linear;
    return true;
}

static void keep_part(struct splitter *s, const struct law_part *term)
{
    for (int k = 0; k < s->count; k++) {
        struct law_part *part = &s->parts[k];
        const bool alike =
            part->program.input_count == term->program.input_count &&
            term->program.input_count <= 1 &&
            (term->program.input_count == 0 || (part->inputs[0][0] == term->inputs[0][0] &&
                                                part->inputs[0][1] == term->inputs[0][1]));
        if (alike) {
            s->failed = s->failed || !join(s, part, term);
            return;
        }
    }
    struct law_part *grown = arena_grow(s->arena, s->parts, s->count, &s->capacity, sizeof *grown);
    if (grown == NULL) {
        s->failed = true;
        return;
    }
    s->parts = grown;
    s->parts[s->count++] = *term;
}

/* The subexpression that ends at `last`, with what stands around it, as one term. */
static void add_term(struct splitter *s, int last, const struct frame *around)
{
    const int first = s->start[last];
    struct law_part term;
    int room = last - first + 1;
    for (const struct frame *f = around; f != NULL; f = f->outer) {
        room += 2;
    }
    struct law_step *steps = arena_new_array(s->arena, struct law_step, room);
    if (steps == NULL) {
        s->failed = true;
        return;
    }
    memset(&term, 0, sizeof term);
    int count = copy_steps(s, first, last, true, steps, &term);
    if (count < 0) { /* more pairs than arguments: the inputs one by one always fit */
        memset(&term, 0, sizeof term);
        count = copy_steps(s, first, last, false, steps, &term);
    }
    term.is_constant = term.program.input_count == 0;
    term.is_linear = count == 1 && !term.is_constant;
    for (const struct frame *f = around; f != NULL; f = f->outer) {
        if (f->operation != LAW_NEGATE) {
            steps[count++] = (struct law_step){.operation = LAW_CONSTANT, .value = f->value};
        }
        steps[count++] = (struct law_step){.operation = f->operation};
    }
    term.program.steps = steps;
    term.program.step_count = count;
    keep_part(s, &term);
}

/* The difference of two inputs is one argument, not two linear terms. */
static bool is_pair(const struct splitter *s, int last)
{
    const struct law_step *steps = s->program->steps;
    return last >= 2 && steps[last].operation == LAW_SUBTRACT &&
           steps[last - 1].operation == LAW_INPUT && steps[last - 2].operation == LAW_INPUT;
}

static void split(struct splitter *s, int last, const struct frame *around)
{
    const struct law_step *steps = s->program->steps;
    const struct frame minus = {around, LAW_NEGATE, 0};
    for (;;) { /* sums lean to the left: no recursion there */
        const enum law_operation operation = steps[last].operation;
        if ((operation != LAW_ADD && operation != LAW_SUBTRACT) || is_pair(s, last)) {
            break;
        }
        split(s, last - 1, operation == LAW_ADD ? around : &minus);
        last = s->start[last - 1] - 1;
    }
    const enum law_operation operation = steps[last].operation;
    if (operation == LAW_NEGATE) {
        split(s, last - 1, &minus);
        return;
    }
    if (operation == LAW_MULTIPLY || operation == LAW_DIVIDE) {
        const int right = last - 1, left = s->start[right] - 1;
        const bool by_right = steps[right].operation == LAW_CONSTANT;
        const bool by_left = operation == LAW_MULTIPLY && steps[left].operation == LAW_CONSTANT;
        if (by_right || by_left) {
            const struct frame factor = {around, operation, steps[by_right ? right : left].value};
            split(s, by_right ? left : right, &factor);
            return;
        }
    }
    add_term(s, last, around);
}

bool network_law_parts(struct arena *arena, const struct law_program *program,
                       struct law_part **parts, int *count)
{
    struct splitter s = {.arena = arena, .program = program};
    s.start = arena_new_array(arena, int, program->step_count);
    if (s.start == NULL) {
        return false;
    }
    if (program->step_count > 0) {
        find_starts(&s);
        split(&s, program->step_count - 1, NULL);
    }
    *parts = s.parts;
    *count = s.count;
    return !s.failed;
}

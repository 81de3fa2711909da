/*
 * law_current.c: runs the program of a `law` with its derivatives by forward automatic
 * differentiation (Griewank and Walther 2008, chapter 3). How an operation goes on where it has no
 * finite value stands in law.h.
 */
#include "devices/law.h"

#include <assert.h>
#include <stdbool.h>

#include "devices/smooth.h"

/* Largest magnitude of a value or a slope: two of them can be multiplied. */
#define LAW_LARGEST ((real)1e100L)
/* Least argument of sqrt, ln and of the base of a power. */
#define LAW_LEAST ((real)1e-60L)

struct element {
    real value;
    real slope[LAW_INPUT_LIMIT];
};

static real bounded(real value)
{
    if (value <= LAW_LARGEST && value >= -LAW_LARGEST) {
        return value;
    }
    return value > 0 ? LAW_LARGEST : value < 0 ? -LAW_LARGEST : 0;
}

/* out = value with slopes by_u du + by_w dw; out may be u. A value at its bound is flat. */
static void combine(struct element *out, real value, real by_u, const struct element *u, real by_w,
                    const struct element *w, int count)
{
    real kept = bounded(value);
    bool flat = kept > value || kept < value;
    by_u = bounded(by_u);
    by_w = bounded(by_w);
    for (int k = 0; k < count; k++) {
        out->slope[k] = flat ? 0 : bounded(by_u * u->slope[k] + by_w * w->slope[k]);
    }
    out->value = kept;
}

/* Positive and C1 for any u: u itself, and below LAW_LEAST a falling tail. */
static real positive(real u, real *slope)
{
    return floor_positive(u, LAW_LEAST, slope);
}

static real safe_ln(real u, real *slope)
{
    if (u >= LAW_LEAST) {
        *slope = 1 / u;
        return log(u);
    }
    *slope = 1 / (2 * LAW_LEAST - u);
    return 2 * log(LAW_LEAST) - log(2 * LAW_LEAST - u);
}

static bool is_constant(const struct element *e, int count)
{
    for (int k = 0; k < count; k++) {
        if (e->slope[k] < 0 || e->slope[k] > 0) {
            return false;
        }
    }
    return true;
}

static void raise(struct element *u, const struct element *w, int count)
{
    real base = u->value, exponent = w->value;
    bool whole = !(fabs(exponent) > (real)1e15L) && !(floor(exponent) < exponent);
    if (whole && is_constant(w, count)) {           /* any base */
        bool counts = exponent < 0 || exponent > 0; /* u^0 is 1, even at 0 */
        real by_base = counts ? exponent * bounded(pow(base, exponent - 1)) : 0;
        combine(u, pow(base, exponent), by_base, u, 0, w, count);
        return;
    }
    real slope;
    base = positive(base, &slope);
    real value = bounded(pow(base, exponent));
    combine(u, value, exponent * bounded(pow(base, exponent - 1)) * slope, u, value * log(base), w,
            count);
}

/* Operations with two operands: u = u op w. */
static void apply_two(enum law_operation operation, struct element *u, const struct element *w,
                      int count)
{
    real a = u->value, b = w->value;
    switch (operation) {
    case LAW_ADD:
        combine(u, a + b, 1, u, 1, w, count);
        break;
    case LAW_SUBTRACT:
        combine(u, a - b, 1, u, -1, w, count);
        break;
    case LAW_MULTIPLY:
        combine(u, a * b, b, u, a, w, count);
        break;
    case LAW_DIVIDE: {
        const real tiny = (real)1e-200L; /* square of 1e-100 */
        real square = b * b + tiny;
        real inverse = b / square;
        /* d(b/(b^2 + t))/db = (t - b^2)/(b^2 + t)^2 */
        combine(u, a * inverse, inverse, u, a * bounded((tiny - b * b) / square / square), w,
                count);
        break;
    }
    case LAW_POWER:
        raise(u, w, count);
        break;
    case LAW_MIN:
        combine(u, a <= b ? a : b, a <= b ? 1 : 0, u, a <= b ? 0 : 1, w, count);
        break;
    default: /* LAW_MAX */
        combine(u, a >= b ? a : b, a >= b ? 1 : 0, u, a >= b ? 0 : 1, w, count);
        break;
    }
}

/* Operations with one operand. */
static void apply_one(enum law_operation operation, struct element *u, int count)
{
    const real ln10 = (real)2.302585092994045684017991L;
    real a = u->value, slope, value;
    switch (operation) {
    case LAW_NEGATE:
        combine(u, -a, -1, u, 0, u, count);
        break;
    case LAW_SQRT:
        value = sqrt(positive(a, &slope));
        combine(u, value, slope / (2 * value), u, 0, u, count);
        break;
    case LAW_LN:
        value = safe_ln(a, &slope);
        combine(u, value, slope, u, 0, u, count);
        break;
    case LAW_LOG10:
        value = safe_ln(a, &slope);
        combine(u, value / ln10, slope / ln10, u, 0, u, count);
        break;
    case LAW_EXP:
        value = limited_exp(a, &slope);
        combine(u, value, slope, u, 0, u, count);
        break;
    default: /* LAW_ABS */
        combine(u, fabs(a), a < 0 ? -1 : 1, u, 0, u, count);
        break;
    }
}

static void push(struct element *e, real value, int input, int count)
{
    e->value = bounded(value);
    for (int k = 0; k < count; k++) {
        e->slope[k] = k == input ? 1 : 0;
    }
}

/* The value of the program in stack[0]. The circuit layer keeps depth within LAW_STACK_LIMIT. */
static void run(const struct law_program *program, const real *inputs, struct element *stack)
{
    int depth = 0, count = program->input_count;
    push(&stack[0], 0, -1, count);
    for (int k = 0; k < program->step_count; k++) {
        const struct law_step *step = &program->steps[k];
        switch (step->operation) {
        case LAW_CONSTANT:
            push(&stack[depth++], step->value, -1, count);
            break;
        case LAW_INPUT:
            push(&stack[depth++], inputs[step->index], step->index, count);
            break;
        case LAW_NEGATE:
        case LAW_SQRT:
        case LAW_LN:
        case LAW_LOG10:
        case LAW_EXP:
        case LAW_ABS:
            assert(depth >= 1);
            apply_one(step->operation, &stack[depth - 1], count);
            break;
        default:
            assert(depth >= 2);
            depth--;
            apply_two(step->operation, &stack[depth - 1], &stack[depth], count);
            break;
        }
    }
}

void REAL_NAME(law_evaluate)(const void *prepared, const real *x, real *f, real *jac)
{
    const struct law_program *program = prepared;
    struct element stack[LAW_STACK_LIMIT];
    int n = 2 + program->input_count;
    run(program, x + 2, stack);
    for (int k = 0; k < n * n; k++) {
        jac[k] = 0;
    }
    for (int k = 0; k < n; k++) {
        f[k] = 0;
    }
    f[0] = stack[0].value;
    f[1] = -f[0];
    for (int k = 0; k < program->input_count; k++) {
        jac[2 + k] = stack[0].slope[k];
        jac[n + 2 + k] = -stack[0].slope[k];
    }
}

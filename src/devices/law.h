/*
 * law.h: the program of a `law` device: an expression of node voltages as postfix operations.
 *
 * The circuit layer compiles it from a tree; the device runs it with exact derivatives by forward
 * automatic differentiation (Griewank and Walther 2008, chapter 3).
 */
#ifndef DEVICES_LAW_H
#define DEVICES_LAW_H

enum { LAW_STACK_LIMIT = 70, LAW_INPUT_LIMIT = 16 };

enum law_operation {
    LAW_CONSTANT, /* pushes value */
    LAW_INPUT,    /* pushes the voltage of input `index` (0 .. input_count-1), V against gnd */
    LAW_ADD,
    LAW_SUBTRACT,
    LAW_MULTIPLY,
    LAW_DIVIDE,
    LAW_POWER,
    LAW_NEGATE,
    LAW_SQRT,
    LAW_LN,
    LAW_LOG10,
    LAW_EXP,
    LAW_MIN,
    LAW_MAX,
    LAW_ABS
};

struct law_step {
    enum law_operation operation;
    double value;
    int index;
};

/*
 * Inputs are extra local unknowns of the device, after the terminals a and b: the evaluate function
 * of `law` sees x = [v(a), v(b), v(input 0), ...], n = 2 + input_count. An input that is gnd is
 * compiled to the constant 0; the same node twice is one input. Inputs that are a or b may repeat
 * their voltage.
 */
struct law_program {
    const struct law_step *steps;
    int step_count;
    int input_count;
};

/*
 * The evaluate functions of the `law` device; the prepared block is a struct law_program.
 *
 * Everything stays finite. Where an operation has no finite value, or none at all, it goes on so:
 *   a/b        a b/(b^2 + 1e-200): through 0 at b = 0
 *   sqrt, ln   below 1e-60 a positive, falling tail; ln u mirrored: 2 ln(u0) - ln(2 u0 - u); C1
 *   exp        straight above an exponent of 80; C1
 *   u^e        a negative base with an exponent that is not a whole number: base as for sqrt
 *   any        values and slopes end at 1e100
 */
void law_evaluate(const void *prepared, const double *x, double *f, double *jac);
void law_evaluate_extended(const void *prepared, const long double *x, long double *f,
                           long double *jac);

#endif

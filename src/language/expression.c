/*
 * expression.c: values of expressions, with dimensions.
 *
 * A plain number ("bare") takes the dimension that is wanted: beside a unit in a sum it has that
 * unit, in a product it is a factor. A plain number times a ratio stays plain.
 */
#include "language/expression.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#include "language/expression_unit.h"

enum {
    DESCRIPTION = 96, /* bytes of a dimension in words */
    SPINE = 32,       /* operators of a long sum or product that are taken in one call */
    NEAR_LIMIT = 100  /* errors after which near names are no longer searched for */
};

struct evaluation {
    const struct expression_scope *scope;
    struct diagnostics *diagnostics;
};

static bool evaluate(const struct evaluation *run, const struct expression *expression,
                     struct quantity *value);

static struct quantity plain(double value)
{
    return (struct quantity){value, DIMENSION_NONE, true, false};
}

static bool is_ratio(const struct quantity *value)
{
    return dimension_equal(value->dimension, DIMENSION_NONE);
}

/* "a resistance"; a number without unit that is not plain is a ratio, such as 2%. */
static void describe(const struct quantity *value, char *text, size_t size)
{
    dimension_describe(value->dimension, text, size);
    if (is_ratio(value) && !value->bare && size > sizeof "a ratio") {
        (void)snprintf(text, size, "a ratio");
    }
}

/* "10k" for a literal "10K", else NULL. `text` has room for it. */
static const char *kilo_hint(const struct expression *expression, struct dimension wanted,
                             char *text, size_t size)
{
    const struct quantity *number = &expression->number;
    if (expression->kind != EXPRESSION_NUMBER || number->celsius || wanted.kelvin != 0 ||
        !dimension_equal(number->dimension, DIMENSION_TEMPERATURE) || !(number->value >= 0.1)) {
        return NULL;
    }
    char digits[40];
    number_exact(number->value, digits, sizeof digits);
    (void)snprintf(text, size, "K is kelvin; kilo is k: '%sk'", digits);
    return text;
}

static bool fail(const struct evaluation *run, const struct expression *where, const char *hint,
                 const char *text)
{
    diagnostics_add(run->diagnostics, where->span, hint, "%s", text);
    return false;
}

/* Reports two dimensions that do not fit, at the right one. */
static bool misfit(const struct evaluation *run, const struct expression *expression,
                   const struct quantity *left, const struct expression *at,
                   const struct quantity *right, const char *verb)
{
    char first[DESCRIPTION], second[DESCRIPTION], kilo[DESCRIPTION];
    describe(left, first, sizeof first);
    describe(right, second, sizeof second);
    const char *hint = kilo_hint(at, left->dimension, kilo, sizeof kilo);
    const struct expression *where = at;
    if (hint == NULL && expression->left != NULL) {
        hint = kilo_hint(expression->left, right->dimension, kilo, sizeof kilo);
        where = hint != NULL ? expression->left : at;
    }
    diagnostics_add(run->diagnostics, where->span, hint, "%s and %s cannot be %s", first, second,
                    verb);
    return false;
}

/* The common dimension of two values that are added or compared; a plain one takes the other's. */
static bool unite(const struct evaluation *run, const struct expression *expression,
                  const struct expression *at, const struct quantity *left,
                  const struct quantity *right, const char *verb, struct quantity *result)
{
    if (!left->bare && !right->bare && !dimension_equal(left->dimension, right->dimension)) {
        return misfit(run, expression, left, at, right, verb);
    }
    result->dimension = left->bare ? right->dimension : left->dimension;
    result->bare = left->bare && right->bare;
    result->celsius = false;
    return true;
}

static bool finite(const struct evaluation *run, const struct expression *expression,
                   const struct quantity *value)
{
    return isfinite(value->value) ||
           fail(run, expression, NULL, "the result is too large to be a number");
}

static const char celsius_advice[] = "write it in K";

/* Degrees may be moved by kelvins, and their difference is in kelvin; nothing else. */
static bool add_celsius(const struct evaluation *run, const struct expression *expression,
                        bool minus, const struct quantity *left, const struct quantity *right,
                        struct quantity *result)
{
    if (minus && left->celsius && right->celsius) {
        result->celsius = false;
    } else if (left->celsius != right->celsius && !(minus && right->celsius)) {
        result->celsius = true;
    } else {
        return fail(run, expression, celsius_advice,
                    minus ? "a Celsius temperature cannot be taken from a difference"
                          : "two Celsius temperatures cannot be added");
    }
    return true;
}

static bool add(const struct evaluation *run, const struct expression *expression,
                const struct quantity *left, const struct quantity *right, struct quantity *result)
{
    bool minus = expression->kind == EXPRESSION_SUBTRACT;
    if (!unite(run, expression, expression->right, left, right, minus ? "subtracted" : "added",
               result)) {
        return false;
    }
    if ((left->celsius || right->celsius) &&
        !add_celsius(run, expression, minus, left, right, result)) {
        return false;
    }
    result->value = minus ? left->value - right->value : left->value + right->value;
    return finite(run, expression, result);
}

static bool multiply(const struct evaluation *run, const struct expression *expression,
                     const struct quantity *left, const struct quantity *right,
                     struct quantity *result)
{
    bool divide = expression->kind == EXPRESSION_DIVIDE;
    if (left->celsius || right->celsius) {
        return fail(run, left->celsius ? expression->left : expression->right, celsius_advice,
                    "a Celsius temperature cannot be multiplied or divided");
    }
    if (divide && right->value == 0.0) {
        return fail(run, expression->right, NULL, "this is a division by zero");
    }
    result->value = divide ? left->value / right->value : left->value * right->value;
    result->dimension = divide ? dimension_divide(left->dimension, right->dimension)
                               : dimension_multiply(left->dimension, right->dimension);
    result->bare =
        (left->bare && is_ratio(right)) || (right->bare && is_ratio(left)); /* bare: a ratio too */
    result->celsius = false;
    return finite(run, expression, result);
}

static bool raise(const struct evaluation *run, const struct expression *expression,
                  const struct quantity *base, const struct quantity *exponent,
                  struct quantity *result)
{
    if (base->celsius) {
        return fail(run, expression->left, celsius_advice, "a Celsius temperature has no powers");
    }
    if (!is_ratio(exponent)) {
        char text[DESCRIPTION], kilo[DESCRIPTION];
        describe(exponent, text, sizeof text);
        diagnostics_add(run->diagnostics, expression->right->span,
                        kilo_hint(expression->right, DIMENSION_NONE, kilo, sizeof kilo),
                        "an exponent is a plain number; this is %s", text);
        return false;
    }
    if (base->value < 0.0 && floor(exponent->value) != exponent->value) {
        return fail(run, expression, NULL, "a negative number has no such power");
    }
    if (base->value == 0.0 && exponent->value < 0.0) {
        return fail(run, expression, NULL, "this is a division by zero");
    }
    result->bare = base->bare;
    result->celsius = false;
    if (!dimension_power(base->dimension, exponent->value, &result->dimension)) {
        return fail(run, expression->right, NULL, "this exponent is not possible for a unit");
    }
    result->value = pow(base->value, exponent->value);
    return finite(run, expression, result);
}

static bool is_binary(const struct expression *expression)
{
    return expression->kind >= EXPRESSION_ADD && expression->kind <= EXPRESSION_POWER;
}

/* A long sum leans to the left; its operators are taken in a loop, so that the depth of the call
 * stack stays bounded. */
static bool evaluate_binary(const struct evaluation *run, const struct expression *expression,
                            struct quantity *value)
{
    const struct expression *spine[SPINE];
    int count = 0;
    while (count < SPINE && is_binary(expression)) {
        spine[count++] = expression;
        expression = expression->left;
    }
    struct quantity left, right;
    if (!evaluate(run, expression, &left)) {
        return false;
    }
    while (count-- > 0) {
        const struct expression *step = spine[count];
        struct quantity result = plain(0.0);
        if (!evaluate(run, step->right, &right)) {
            return false;
        }
        bool done = step->kind == EXPRESSION_POWER ? raise(run, step, &left, &right, &result)
                    : step->kind == EXPRESSION_ADD || step->kind == EXPRESSION_SUBTRACT
                        ? add(run, step, &left, &right, &result)
                        : multiply(run, step, &left, &right, &result);
        if (!done) {
            return false;
        }
        left = result;
    }
    *value = left;
    return true;
}

static bool evaluate_negative(const struct evaluation *run, const struct expression *expression,
                              struct quantity *value)
{
    if (!evaluate(run, expression->left, value)) {
        return false;
    }
    if (value->celsius) {
        return fail(run, expression, celsius_advice, "a Celsius temperature has no negative");
    }
    value->value = -value->value;
    return true;
}

/* What a function does with its arguments. */
enum function { SQRT, LN, LOG10, EXP, MIN, MAX, ABS };

static const char *const function_names[] = {"sqrt", "ln", "log10", "exp", "min", "max", "abs"};
enum { FUNCTION_COUNT = sizeof function_names / sizeof function_names[0] };

/* min and max of two or more. */
static bool extreme(const struct evaluation *run, const struct expression *call, bool largest,
                    struct quantity *value)
{
    for (int i = 1; i < call->argument_count; i++) {
        const struct expression *argument = call->arguments[i];
        struct quantity next, best = *value;
        if (!evaluate(run, argument, &next) ||
            !unite(run, call, argument, value, &next, "compared", &best)) {
            return false;
        }
        if (value->celsius != next.celsius) {
            return fail(run, argument, celsius_advice,
                        "a Celsius temperature cannot be compared with this");
        }
        best.celsius = value->celsius;
        best.value = (largest ? next.value > value->value : next.value < value->value)
                         ? next.value
                         : value->value;
        *value = best;
    }
    return true;
}

/* ln, log10 and exp, of a number without unit. */
static bool transcend(const struct evaluation *run, const struct expression *call,
                      enum function function, struct quantity *value)
{
    if (!is_ratio(value)) {
        char text[DESCRIPTION];
        describe(value, text, sizeof text);
        diagnostics_add(run->diagnostics, call->arguments[0]->span, "divide it by its unit",
                        "%s wants a plain number; this is %s", call->name, text);
        return false;
    }
    if (function != EXP && !(value->value > 0.0)) {
        diagnostics_add(run->diagnostics, call->arguments[0]->span, NULL,
                        "%s wants a number above 0", call->name);
        return false;
    }
    value->value = function == EXP  ? exp(value->value)
                   : function == LN ? log(value->value)
                                    : log10(value->value);
    return finite(run, call, value);
}

static bool square_root(const struct evaluation *run, const struct expression *call,
                        struct quantity *value)
{
    if (!(value->value >= 0.0)) {
        return fail(run, call->arguments[0], NULL, "a negative number has no square root");
    }
    if (!dimension_power(value->dimension, 0.5, &value->dimension)) {
        return fail(run, call->arguments[0], NULL, "this unit has no square root");
    }
    value->value = sqrt(value->value);
    return true;
}

static bool unknown_function(const struct evaluation *run, const struct expression *call)
{
    struct span where = call->span;
    where.end = where.begin + (uint32_t)strlen(call->name);
    const char *near = near_name(call->name, function_names, FUNCTION_COUNT);
    char hint[64] = "the functions are sqrt ln log10 exp min max abs";
    if (near != NULL) {
        (void)snprintf(hint, sizeof hint, "did you mean '%s'?", near);
    }
    diagnostics_add(run->diagnostics, where, hint, "there is no function '%s'", call->name);
    return false;
}

static bool evaluate_call(const struct evaluation *run, const struct expression *call,
                          struct quantity *value)
{
    int function = 0;
    while (function < FUNCTION_COUNT && strcmp(call->name, function_names[function]) != 0) {
        function++;
    }
    if (function == FUNCTION_COUNT) {
        return unknown_function(run, call);
    }
    bool many = function == MIN || function == MAX;
    if (many ? call->argument_count < 2 : call->argument_count != 1) {
        diagnostics_add(run->diagnostics, call->span, NULL, "%s wants %s; this gives %d",
                        call->name, many ? "two or more values" : "one value",
                        call->argument_count);
        return false;
    }
    if (!evaluate(run, call->arguments[0], value)) {
        return false;
    }
    if (!many && value->celsius) {
        diagnostics_add(run->diagnostics, call->arguments[0]->span, celsius_advice,
                        "%s cannot take a Celsius temperature", call->name);
        return false;
    }
    switch ((enum function)function) {
    case SQRT:
        return square_root(run, call, value);
    case ABS:
        value->value = fabs(value->value);
        return true;
    case MIN:
    case MAX:
        return extreme(run, call, function == MAX, value);
    default:
        return transcend(run, call, (enum function)function, value);
    }
}

void expression_unknown_name(const char *name, struct span where,
                             const struct expression_scope *scope, struct diagnostics *diagnostics)
{
    if (diagnostics_has_lost(diagnostics, name)) {
        return;
    }
    const char *near = NULL;
    if (scope->list != NULL && diagnostics->count < NEAR_LIMIT) {
        const char *const *names = NULL;
        const int count = scope->list(scope->self, &names);
        near = near_name(name, names, count);
    }
    if (near == NULL) {
        static const char *const constants[] = {"pi", "thermal_voltage"};
        near = near_name(name, constants, 2);
        near = near != NULL ? near : unit_near(name);
    }
    char hint[512];
    if (near != NULL) {
        (void)snprintf(hint, sizeof hint, "did you mean '%.400s'?", near);
    }
    diagnostics_add(diagnostics, where, near != NULL ? hint : NULL, "there is no '%s'", name);
}

/* Constants and unit words, for names that the scope does not know. */
static bool find_own(const struct evaluation *run, const char *name, struct quantity *value)
{
    double factor = 0.0;
    struct dimension dimension = DIMENSION_NONE;
    bool celsius = false;
    if (strcmp(name, "pi") == 0) {
        *value = plain(3.14159265358979323846);
    } else if (strcmp(name, "thermal_voltage") == 0) {
        *value = (struct quantity){run->scope->thermal_voltage, DIMENSION_VOLTAGE, false, false};
    } else if (strcmp(name, "m") ==
               0) { /* a factor such as A/m: only behind a number it is milli */
        *value = (struct quantity){1.0, DIMENSION_LENGTH, false, false};
    } else if (unit_parse(name, strlen(name), &factor, &dimension, &celsius)) {
        *value = (struct quantity){factor, dimension, false, celsius};
    } else {
        return false;
    }
    return true;
}

static bool evaluate_name(const struct evaluation *run, const struct expression *expression,
                          struct quantity *value)
{
    const struct expression_scope *scope = run->scope;
    int before = run->diagnostics->count;
    if (scope->find != NULL &&
        scope->find(scope->self, expression->name, expression->span, value)) {
        return true;
    }
    if (run->diagnostics->count > before || run->diagnostics->out_of_memory) {
        return false; /* the scope knows the name and said what is wrong with it */
    }
    if (diagnostics_has_lost(run->diagnostics, expression->name)) {
        return false;
    }
    if (find_own(run, expression->name, value)) {
        return true;
    }
    expression_unknown_name(expression->name, expression->span, scope, run->diagnostics);
    return false;
}

static bool evaluate(const struct evaluation *run, const struct expression *expression,
                     struct quantity *value)
{
    switch (expression->kind) {
    case EXPRESSION_NUMBER:
        *value = expression->number;
        return true;
    case EXPRESSION_NAME:
        return evaluate_name(run, expression, value);
    case EXPRESSION_NEGATE:
        return evaluate_negative(run, expression, value);
    case EXPRESSION_CALL:
        return evaluate_call(run, expression, value);
    default:
        return evaluate_binary(run, expression, value);
    }
}

bool expression_value(const struct expression *expression, const struct expression_scope *scope,
                      struct diagnostics *diagnostics, struct quantity *value)
{
    struct evaluation run = {scope, diagnostics};
    struct quantity result = plain(0.0);
    if (!evaluate(&run, expression, &result)) {
        return false;
    }
    *value = result;
    return true;
}

/* "'10k' is a plain number: write '10kohm'" when a factor of a product was left without the unit
 * that would give it the dimension wanted; else NULL. `text` has room for it. */
static const char *plain_factor_hint(const struct expression *expression, struct dimension found,
                                     struct dimension wanted, char *text, size_t size)
{
    while (expression->kind == EXPRESSION_MULTIPLY || expression->kind == EXPRESSION_DIVIDE) {
        const struct expression *factor = expression->right;
        if (factor->kind == EXPRESSION_NUMBER && factor->number.bare && factor->name != NULL) {
            const struct dimension missing = expression->kind == EXPRESSION_DIVIDE
                                                 ? dimension_divide(found, wanted)
                                                 : dimension_divide(wanted, found);
            char unit[DESCRIPTION];
            dimension_unit(missing, unit, sizeof unit);
            if (strpbrk(unit, "*/^") != NULL || strcmp(unit, "") == 0) {
                return NULL;
            }
            (void)snprintf(text, size, "'%.40s' is a plain number: write '%.40s%s'", factor->name,
                           factor->name, unit);
            return text;
        }
        expression = expression->left;
    }
    return NULL;
}

static bool unwanted(const struct expression *expression, const char *what,
                     const struct quantity *found, struct dimension wanted,
                     struct diagnostics *diagnostics)
{
    char text[DESCRIPTION], kilo[DESCRIPTION], factor[3 * DESCRIPTION];
    describe(found, text, sizeof text);
    const char *hint = kilo_hint(expression, wanted, kilo, sizeof kilo);
    if (hint == NULL) {
        hint = plain_factor_hint(expression, found->dimension, wanted, factor, sizeof factor);
    }
    diagnostics_add(diagnostics, expression->span, hint, "%s is wanted; this is %s", what, text);
    return false;
}

bool expression_wanted(const struct expression *expression, const struct expression_scope *scope,
                       struct dimension wanted, struct diagnostics *diagnostics, double *value)
{
    struct quantity found;
    if (!expression_value(expression, scope, diagnostics, &found)) {
        return false;
    }
    if (!found.bare && !dimension_equal(found.dimension, wanted)) {
        char what[DESCRIPTION];
        dimension_describe(wanted, what, sizeof what);
        return unwanted(expression, what, &found, wanted, diagnostics);
    }
    *value = found.value;
    return true;
}

bool expression_temperature(const struct expression *expression,
                            const struct expression_scope *scope, struct diagnostics *diagnostics,
                            double *kelvin)
{
    /* K; a plain number below the least was meant in C; above the most no device here exists */
    enum { LEAST_PLAIN = 100, MOST = 1000 };
    struct quantity found;
    if (!expression_value(expression, scope, diagnostics, &found)) {
        return false;
    }
    if (!found.bare && !dimension_equal(found.dimension, DIMENSION_TEMPERATURE)) {
        return unwanted(expression, "a temperature", &found, DIMENSION_TEMPERATURE, diagnostics);
    }
    char number[40], hint[64];
    number_exact(found.value, number, sizeof number);
    if (found.bare && !(found.value >= LEAST_PLAIN)) {
        (void)snprintf(hint, sizeof hint, "write '%s C'", number);
        diagnostics_add(diagnostics, expression->span, hint,
                        "a plain number is a temperature in K, and %s K is very cold", number);
        return false;
    }
    if (!(found.value > 0.0)) {
        diagnostics_add(diagnostics, expression->span, NULL,
                        "a temperature lies above absolute zero, 0 K or -273.15 C");
        return false;
    }
    if (!(found.value <= MOST)) {
        diagnostics_add(diagnostics, expression->span, NULL,
                        "no device here works at such a temperature: at most %d K", MOST);
        return false;
    }
    *kelvin = found.value;
    return true;
}

bool expression_share(const struct expression *expression, const struct expression_scope *scope,
                      struct diagnostics *diagnostics, double *share)
{
    struct quantity found;
    if (!expression_value(expression, scope, diagnostics, &found)) {
        return false;
    }
    if (!is_ratio(&found)) {
        return unwanted(expression, "a share such as 2%", &found, DIMENSION_NONE, diagnostics);
    }
    *share = found.value;
    return true;
}

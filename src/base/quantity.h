/*
 * quantity.h: a number with its physical dimension, the units that are written, and the way a
 * number is shown.
 *
 * Dimensions are products of powers of volt, ampere, kelvin and metre; exponents are counted in
 * twelfths so that square and cube roots are exact.
 */
#ifndef BASE_QUANTITY_H
#define BASE_QUANTITY_H

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

enum { DIMENSION_ONE = 12 }; /* exponent 1 */

struct dimension {
    int16_t volt, ampere, kelvin, metre; /* exponents in twelfths */
};

#define DIMENSION_NONE ((struct dimension){0, 0, 0, 0})
#define DIMENSION_VOLTAGE ((struct dimension){12, 0, 0, 0})
#define DIMENSION_CURRENT ((struct dimension){0, 12, 0, 0})
#define DIMENSION_POWER ((struct dimension){12, 12, 0, 0})
#define DIMENSION_RESISTANCE ((struct dimension){12, -12, 0, 0})
#define DIMENSION_CONDUCTANCE ((struct dimension){-12, 12, 0, 0})
#define DIMENSION_TEMPERATURE ((struct dimension){0, 0, 12, 0})
#define DIMENSION_LENGTH ((struct dimension){0, 0, 0, 12})

struct quantity {
    double value; /* SI */
    struct dimension dimension;
    bool bare;    /* a plain number, which takes the dimension wanted where it is used */
    bool celsius; /* written in C: an absolute temperature, already in kelvin */
};

bool dimension_equal(struct dimension a, struct dimension b);
struct dimension dimension_multiply(struct dimension a, struct dimension b);
struct dimension dimension_divide(struct dimension a, struct dimension b);
/* False when the exponent does not stay on the grid or leaves its range. */
bool dimension_power(struct dimension a, double exponent, struct dimension *result);

/* "a voltage", "a resistance", "a plain number", or "a quantity in A/V^2". Into text[size]. */
void dimension_describe(struct dimension dimension, char *text, size_t size);
/* "V", "ohm", "A/V^2", "" for none. Into text[size]. */
void dimension_unit(struct dimension dimension, char *text, size_t size);

/*
 * unit_parse: a whole word as SI prefix and unit: "mV", "kohm", "uA", "um", "K", "%", "ppm", "C".
 *
 * length   bytes of the word
 * factor   out: SI value of one
 * celsius  out: the word is "C" (no prefix allowed); factor is 1 and the dimension kelvin
 *
 * "m" alone is not a unit (a bare m is milli); a metre needs a prefix. False when the word is none.
 */
bool unit_parse(const char *word, size_t length, double *factor, struct dimension *dimension,
                bool *celsius);

/* The factor of an SI prefix character at the start of text ("f p n u µ m k M G T"), 0 when none;
 * bytes out: its length (2 for µ). */
double prefix_parse(const char *text, size_t length, size_t *bytes);

/* Reads digits[.digits][e[+-]digits] with correct rounding whatever the locale. Returns the bytes
 * used, 0 when no number stands there. */
size_t number_parse(const char *text, size_t length, double *value);

/* The same times 10^scale, rounded once: "0.1" with scale -6 has the bits of 1e-7. */
size_t number_parse_scaled(const char *text, size_t length, int scale, double *value);

/*
 * number_show: engineering notation with an SI prefix: "816.4 nA", "1.200 V", "3.1e+13 ohm".
 *
 * digits  significant digits, 1 to 17
 * unit    "V", "A", ... or "" ; "1" powers such as "A/V^2" get no prefix but an exponent
 *
 * Not a number gives "-". The same bits always give the same text, whatever the locale.
 */
void number_show(double value, int digits, const char *unit, char *text, size_t size);

/* Shortest text that reads back as the same double ("%.17g" at most), locale-free. */
void number_exact(double value, char *text, size_t size);

#endif

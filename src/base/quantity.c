/* quantity.c: dimensions, units and SI prefixes. */
#include "base/quantity.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

enum { POWER_LIMIT = 100 * DIMENSION_ONE }; /* nothing physical comes near the hundredth power */

bool dimension_equal(struct dimension a, struct dimension b)
{
    return a.volt == b.volt && a.ampere == b.ampere && a.kelvin == b.kelvin && a.metre == b.metre;
}

/* Saturates: a product of hundreds of hundredth powers stays wrong instead of wrapping. */
static int16_t clamp(int value)
{
    return (int16_t)(value > INT16_MAX ? INT16_MAX : value < -INT16_MAX ? -INT16_MAX : value);
}

struct dimension dimension_multiply(struct dimension a, struct dimension b)
{
    return (struct dimension){clamp(a.volt + b.volt), clamp(a.ampere + b.ampere),
                              clamp(a.kelvin + b.kelvin), clamp(a.metre + b.metre)};
}

struct dimension dimension_divide(struct dimension a, struct dimension b)
{
    return (struct dimension){clamp(a.volt - b.volt), clamp(a.ampere - b.ampere),
                              clamp(a.kelvin - b.kelvin), clamp(a.metre - b.metre)};
}

static bool scale(int16_t part, double exponent, int16_t *result)
{
    double scaled = (double)part * exponent;
    double whole = round(scaled);
    if (!(fabs(scaled - whole) <= 1e-9) || !(fabs(whole) <= POWER_LIMIT)) {
        return false;
    }
    *result = (int16_t)whole;
    return true;
}

bool dimension_power(struct dimension a, double exponent, struct dimension *result)
{
    struct dimension power;
    if (!scale(a.volt, exponent, &power.volt) || !scale(a.ampere, exponent, &power.ampere) ||
        !scale(a.kelvin, exponent, &power.kelvin) || !scale(a.metre, exponent, &power.metre)) {
        return false;
    }
    *result = power;
    return true;
}

/* The dimensions that have a name and a unit of their own. */
struct named_dimension {
    struct dimension dimension;
    const char *description, *unit;
};

static const struct named_dimension *named(struct dimension dimension)
{
    static const struct named_dimension table[] = {
        {{0, 0, 0, 0}, "a plain number", ""},     {{12, 0, 0, 0}, "a voltage", "V"},
        {{0, 12, 0, 0}, "a current", "A"},        {{12, 12, 0, 0}, "a power", "W"},
        {{12, -12, 0, 0}, "a resistance", "ohm"}, {{-12, 12, 0, 0}, "a conductance", "S"},
        {{0, 0, 12, 0}, "a temperature", "K"},    {{0, 0, 0, 12}, "a length", "m"},
    };
    for (size_t i = 0; i < sizeof table / sizeof table[0]; i++) {
        if (dimension_equal(dimension, table[i].dimension)) {
            return &table[i];
        }
    }
    return NULL;
}

/* Appends "*V^2" or "/V^2"; text[size] stays terminated. */
static void append_factor(char *text, size_t size, const char *sign, const char *unit, int twelfths)
{
    char exponent[32] = "";
    if (twelfths != DIMENSION_ONE) {
        char number[24];
        number_show((double)twelfths / DIMENSION_ONE, 4, "", number, sizeof number);
        size_t end = strlen(number);
        while (strchr(number, '.') != NULL && (number[end - 1] == '0' || number[end - 1] == '.')) {
            number[--end] = '\0';
        }
        (void)snprintf(exponent, sizeof exponent, "^%s", number);
    }
    size_t used = strlen(text);
    (void)snprintf(text + used, size - used, "%s%s%s", sign, unit, exponent);
}

void dimension_unit(struct dimension dimension, char *text, size_t size)
{
    const struct named_dimension *known = named(dimension);
    if (known != NULL) {
        (void)snprintf(text, size, "%s", known->unit);
        return;
    }
    const int parts[] = {dimension.volt, dimension.ampere, dimension.kelvin, dimension.metre};
    static const char *const units[] = {"V", "A", "K", "m"};
    char whole[160] = "";
    for (int i = 0; i < 4; i++) {
        if (parts[i] > 0) {
            append_factor(whole, sizeof whole, whole[0] != '\0' ? "*" : "", units[i], parts[i]);
        }
    }
    if (whole[0] == '\0') {
        (void)snprintf(whole, sizeof whole, "1");
    }
    for (int i = 0; i < 4; i++) {
        if (parts[i] < 0) {
            append_factor(whole, sizeof whole, "/", units[i], -parts[i]);
        }
    }
    (void)snprintf(text, size, "%s", whole);
}

void dimension_describe(struct dimension dimension, char *text, size_t size)
{
    const struct named_dimension *known = named(dimension);
    if (known != NULL) {
        (void)snprintf(text, size, "%s", known->description);
        return;
    }
    char unit[160];
    dimension_unit(dimension, unit, sizeof unit);
    (void)snprintf(text, size, "a quantity in %s", unit);
}

double prefix_parse(const char *text, size_t length, size_t *bytes)
{
    static const struct {
        const char *text;
        double factor;
    } table[] =
        {
            {"f", 1e-15}, {"p", 1e-12},       {"n", 1e-9},        {"u", 1e-6},
            {"m", 1e-3},  {"k", 1e3},         {"M", 1e6},         {"G", 1e9},
            {"T", 1e12},  {"\xC2\xB5", 1e-6}, {"\xCE\xBC", 1e-6}, /* micro sign, Greek mu */
        };
    for (size_t i = 0; i < sizeof table / sizeof table[0]; i++) {
        size_t size = strlen(table[i].text);
        if (length >= size && memcmp(text, table[i].text, size) == 0) {
            *bytes = size;
            return table[i].factor;
        }
    }
    *bytes = 0;
    return 0.0;
}

/* A unit without a prefix. */
struct unit {
    const char *word;
    struct dimension dimension;
    double factor;
    bool with_prefix, alone; /* whether it may, or need not, carry a prefix */
};

static const struct unit *find_unit(const char *word, size_t length)
{
    static const struct unit table[] = {
        {"V", {12, 0, 0, 0}, 1.0, true, true},
        {"A", {0, 12, 0, 0}, 1.0, true, true},
        {"W", {12, 12, 0, 0}, 1.0, true, true},
        {"S", {-12, 12, 0, 0}, 1.0, true, true},
        {"ohm", {12, -12, 0, 0}, 1.0, true, true},
        {"\xCE\xA9", {12, -12, 0, 0}, 1.0, true, true},     /* Greek omega */
        {"\xE2\x84\xA6", {12, -12, 0, 0}, 1.0, true, true}, /* ohm sign */
        {"K", {0, 0, 12, 0}, 1.0, true, true},
        {"C", {0, 0, 12, 0}, 1.0, false, true},
        {"m", {0, 0, 0, 12}, 1.0, true, false},
        {"%", {0, 0, 0, 0}, 1e-2, false, true},
        {"ppm", {0, 0, 0, 0}, 1e-6, false, true},
    };
    for (size_t i = 0; i < sizeof table / sizeof table[0]; i++) {
        if (strlen(table[i].word) == length && memcmp(word, table[i].word, length) == 0) {
            return &table[i];
        }
    }
    return NULL;
}

bool unit_parse(const char *word, size_t length, double *factor, struct dimension *dimension,
                bool *celsius)
{
    double prefix = 1.0;
    const struct unit *unit = find_unit(word, length);
    if (unit == NULL || !unit->alone) {
        size_t bytes = 0;
        prefix = prefix_parse(word, length, &bytes);
        unit = bytes > 0 ? find_unit(word + bytes, length - bytes) : NULL;
        if (unit == NULL || !unit->with_prefix) {
            return false;
        }
    }
    *factor = prefix * unit->factor;
    *dimension = unit->dimension;
    *celsius = strcmp(unit->word, "C") == 0;
    return true;
}

/*
 * number.c: numbers to text and back, the same bits whatever the locale.
 *
 * The C library's conversions are used for the rounding only; the decimal point, which depends on
 * the locale, never passes through them.
 */
#include "base/quantity.h"

#include <limits.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* 768 digits decide the rounding of any double (767 for a halfway case in binary64: Hanson 2015);
 * what lies beyond only matters as zero or not zero. */
enum { DIGITS_KEPT = 800, EXPONENT_CLAMP = 100000000 };

static bool is_digit(char c)
{
    return c >= '0' && c <= '9';
}

/* The digits of a number without its point, and the power of ten that the last one counts. */
struct decimal {
    char digits[DIGITS_KEPT + 32];
    int count;
    bool sticky; /* a digit other than 0 was dropped */
    long exponent;
};

static void add_digit(struct decimal *decimal, char digit, bool fraction)
{
    if (decimal->count == 0 && digit == '0') {
        decimal->exponent -= fraction ? 1 : 0;
    } else if (decimal->count < DIGITS_KEPT) {
        decimal->digits[decimal->count++] = digit;
        decimal->exponent -= fraction ? 1 : 0;
    } else {
        decimal->sticky = decimal->sticky || digit != '0';
        decimal->exponent += fraction ? 0 : 1;
    }
}

/* Bytes of an exponent at text, 0 when there is none. */
static size_t read_exponent(const char *text, size_t length, long *exponent)
{
    size_t at = 0;
    if (length < 2 || (text[0] != 'e' && text[0] != 'E')) {
        return 0;
    }
    at++;
    bool negative = text[at] == '-';
    if (text[at] == '-' || text[at] == '+') {
        at++;
    }
    size_t first = at;
    long value = 0;
    for (; at < length && is_digit(text[at]); at++) {
        value = value < EXPONENT_CLAMP ? 10 * value + (text[at] - '0') : value;
    }
    *exponent = negative ? -value : value;
    return at > first ? at : 0;
}

size_t number_parse_scaled(const char *text, size_t length, int scale, double *value)
{
    struct decimal decimal;
    decimal.count = 0;
    decimal.sticky = false;
    decimal.exponent = 0;
    size_t at = 0;
    while (at < length && is_digit(text[at])) {
        add_digit(&decimal, text[at++], false);
    }
    if (at == 0) {
        return 0;
    }
    if (at + 1 < length && text[at] == '.' && is_digit(text[at + 1])) {
        at++;
        while (at < length && is_digit(text[at])) {
            add_digit(&decimal, text[at++], true);
        }
    }
    long exponent = 0;
    at += read_exponent(text + at, length - at, &exponent);
    if (decimal.count == 0) {
        *value = 0.0;
        return at;
    }
    if (decimal.sticky) {
        decimal.digits[decimal.count++] = '1';
        decimal.exponent--;
    }
    (void)snprintf(decimal.digits + decimal.count, 32, "e%ld", decimal.exponent + exponent + scale);
    *value = strtod(decimal.digits, NULL);
    return at;
}

size_t number_parse(const char *text, size_t length, double *value)
{
    return number_parse_scaled(text, length, 0, value);
}

/* Rounds |value| to `count` digits; digits[count] gets them, the return is the power of ten of the
 * first one. */
static int round_digits(double value, int count, char *digits)
{
    char text[64];
    (void)snprintf(text, sizeof text, "%.*e", count - 1, fabs(value));
    const char *mark = strchr(text, 'e');
    int filled = 0;
    for (const char *c = text; c < mark && filled < count; c++) {
        if (is_digit(*c)) { /* skips the point, whatever it looks like */
            digits[filled++] = *c;
        }
    }
    return (int)strtol(mark + 1, NULL, 10);
}

/* digits[count] with the point after digit `whole` (0 or less puts zeros in front). Zeros fill up
 * to the point. Returns the length written to text, which must hold count + |whole| + 3. */
static size_t place_point(const char *digits, int count, int whole, char *text)
{
    size_t at = 0;
    if (whole <= 0) {
        text[at++] = '0';
        text[at++] = '.';
        for (int i = whole; i < 0; i++) {
            text[at++] = '0';
        }
    }
    for (int i = 0; i < count || i < whole; i++) {
        if (i == whole && i > 0) {
            text[at++] = '.';
        }
        /* NOLINTNEXTLINE(clang-analyzer-core.uninitialized.Assign): digits holds count of them */
        text[at++] = i < count ? digits[i] : '0';
    }
    text[at] = '\0';
    return at;
}

/* How a unit is combined with the number. */
enum form { FORM_PREFIX, FORM_FIXED, FORM_EXPONENT };

static enum form form_of(const char *unit)
{
    if (unit[0] == '\0' || strcmp(unit, "C") == 0 || unit[0] == '%' ||
        strncmp(unit, "ppm", 3) == 0) {
        return FORM_FIXED;
    }
    return strpbrk(unit, "^/*") != NULL ? FORM_EXPONENT : FORM_PREFIX;
}

void number_show(double value, int digits, const char *unit, char *text, size_t size)
{
    const char *gap = unit[0] != '\0' ? " " : "";
    if (isnan(value)) {
        (void)snprintf(text, size, "-");
        return;
    }
    const char *sign = value < 0.0 ? "-" : "";
    if (value == 0.0 || isinf(value)) {
        (void)snprintf(text, size, "%s%s%s%s", sign, value == 0.0 ? "0" : "infinite", gap, unit);
        return;
    }
    int count = digits < 1 ? 1 : digits > 17 ? 17 : digits;
    char rounded[17];
    int power = round_digits(value, count, rounded);
    char shown[64];
    enum form form = form_of(unit);
    int group = (power + 300) / 3 - 100; /* floor(power / 3) where it matters */
    if (form == FORM_PREFIX && group >= -5 && group <= 4) {
        static const char prefixes[] = "fpnum\0kMGT";
        char prefix[2] = {prefixes[group + 5], '\0'};
        (void)place_point(rounded, count, power - 3 * group + 1, shown);
        (void)snprintf(text, size, "%s%s%s%s%s", sign, shown, gap, prefix, unit);
    } else if (form == FORM_FIXED && power >= -4 && power < 6) {
        (void)place_point(rounded, count, power + 1, shown);
        (void)snprintf(text, size, "%s%s%s%s", sign, shown, gap, unit);
    } else {
        (void)place_point(rounded, count, 1, shown);
        (void)snprintf(text, size, "%s%se%+03d%s%s", sign, shown, power, gap, unit);
    }
}

void number_exact(double value, char *text, size_t size)
{
    if (!isfinite(value)) {
        (void)snprintf(text, size, "%s", isnan(value) ? "nan" : value < 0.0 ? "-inf" : "inf");
        return;
    }
    const char *sign = signbit(value) ? "-" : "";
    if (value == 0.0) {
        (void)snprintf(text, size, "%s0", sign);
        return;
    }
    char rounded[17];
    char shown[64];
    int power = 0;
    for (int count = 1; count <= 17; count++) {
        power = round_digits(value, count, rounded);
        size_t at = place_point(rounded, count, 1, shown);
        (void)snprintf(shown + at, sizeof shown - at, "e%d", power);
        double back = 0.0;
        (void)number_parse(shown, strlen(shown), &back);
        if (back == fabs(value)) {
            if (power >= -4 && power < 17) {
                (void)place_point(rounded, count, power + 1, shown);
            }
            break;
        }
    }
    (void)snprintf(text, size, "%s%s", sign, shown);
}

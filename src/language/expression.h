/*
 * expression.h: the value of an expression, with its dimension checked.
 */
#ifndef LANGUAGE_EXPRESSION_H
#define LANGUAGE_EXPRESSION_H

#include "language/tree.h"

/*
 * Looks a name up. Returns true and fills *value, or false when there is no such name.
 * Unit words ("um", "V", "kohm"), pi and thermal_voltage are tried by expression_value itself
 * after the lookup failed.
 */
struct expression_scope {
    bool (*find)(void *self, const char *name, struct span where, struct quantity *value);
    void *self;
    /* All names known, for near names: fills *names, returns how many; asked only when a name is
     * unknown. NULL: none. */
    int (*list)(void *self, const char *const **names);
    double thermal_voltage; /* kT/q at the cell's temperature, V */
};

/* Computes an expression. False after an error that was added to the diagnostics. */
bool expression_value(const struct expression *expression, const struct expression_scope *scope,
                      struct diagnostics *diagnostics, struct quantity *value);

/*
 * expression_wanted: the same, and the result must have the dimension wanted (a plain number takes
 * it). The error names both ("a resistance is wanted; this is a current") and, where a kelvin
 * stands for a kilo, suggests it. An unknown name suggests the near one.
 */
bool expression_wanted(const struct expression *expression, const struct expression_scope *scope,
                       struct dimension wanted, struct diagnostics *diagnostics, double *value);

/* An absolute temperature in K. A plain number is kelvin; below 100 K it is an error that suggests
 * C. Never below 0 K, at most 1000 K. */
bool expression_temperature(const struct expression *expression,
                            const struct expression_scope *scope, struct diagnostics *diagnostics,
                            double *kelvin);

/* A relative value: "2%" is 0.02, "300 ppm" is 3e-4; a plain number stays. */
bool expression_share(const struct expression *expression, const struct expression_scope *scope,
                      struct diagnostics *diagnostics, double *share);

/* Adds "there is no 'NAME'" with the near name. For the circuit layer's own lookups too. */
void expression_unknown_name(const char *name, struct span where,
                             const struct expression_scope *scope, struct diagnostics *diagnostics);

#endif

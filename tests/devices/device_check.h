/*
 * device_check.h: what the device tests share: values by name, and the checks that every device
 * must pass at every bias.
 */
#ifndef TESTS_DEVICE_CHECK_H
#define TESTS_DEVICE_CHECK_H

#include <float.h>
#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <string.h>

#include <cmocka.h>

#include "devices/device.h"

enum { VALUE_LIMIT = 48, PREPARED_LIMIT = 64 };

/* One device with its values and its prepared block. */
struct subject {
    const struct device_type *type;
    double own[VALUE_LIMIT], model[VALUE_LIMIT];
    struct device_values values;
    struct device_conditions conditions;
    double prepared[PREPARED_LIMIT]; /* double for the alignment */
};

static inline void set_defaults(const struct parameter *rows, int count, double *values)
{
    assert_true(count <= VALUE_LIMIT);
    for (int k = 0; k < count; k++) {
        bool absent =
            rows[k].when_absent == DEFAULT_NONE || rows[k].when_absent == DEFAULT_REQUIRED;
        values[k] = absent ? PARAMETER_NONE : rows[k].standard;
    }
}

/* A device with all defaults at 27 C under all effects. */
static inline struct subject subject_of(const struct device_type *type)
{
    struct subject it;
    memset(&it, 0, sizeof it);
    it.type = type;
    set_defaults(type->parameters, type->parameter_count, it.own);
    set_defaults(type->model_parameters, type->model_parameter_count, it.model);
    it.values.resistor_factor = 1;
    it.conditions = (struct device_conditions){300.15, 300.15, EFFECTS_FULL, 0};
    assert_true(type->prepared_size <= sizeof it.prepared);
    return it;
}

/* Sets an instance parameter, else a model parameter. */
static inline void set_value(struct subject *it, const char *name, double value)
{
    int k = parameter_find(it->type->parameters, it->type->parameter_count, name);
    if (k >= 0) {
        it->own[k] = value;
        return;
    }
    k = parameter_find(it->type->model_parameters, it->type->model_parameter_count, name);
    if (k < 0) {
        fail_msg("no parameter %s", name);
    }
    it->model[k] = value;
}

/* The values as the device takes them; a subject may have been copied since. */
static inline const struct device_values *values_of(struct subject *it)
{
    it->values.own = it->own;
    it->values.model = it->type->model_kind != NULL ? it->model : NULL;
    return &it->values;
}

/* What the rules between parameters say; NULL: all well. */
static inline const char *complaint(struct subject *it)
{
    return it->type->check != NULL ? it->type->check(values_of(it)) : NULL;
}

static inline void prepare(struct subject *it)
{
    const char *text = complaint(it);
    if (text != NULL) {
        fail_msg("%s", text);
    }
    it->type->prepare(values_of(it), &it->conditions, it->prepared);
}

static inline int size_of(const struct subject *it)
{
    return it->type->local_count != NULL ? it->type->local_count(it->values.extra)
                                         : it->type->terminal_count + it->type->branch_count;
}

/* A quantity by name; outer and inner voltages the same. */
static inline double quantity(struct subject *it, const char *name, const double *x)
{
    double q[32];
    int k = quantity_find(it->type, name);
    if (k < 0) {
        fail_msg("no quantity %s", name);
    }
    it->type->describe(it->prepared, x, x, q);
    return q[k];
}

static inline unsigned region(struct subject *it, const double *x)
{
    double q[32];
    return it->type->describe(it->prepared, x, x, q);
}

static inline void check_relative(const char *what, double found, double wanted, double tolerance)
{
    if (!(fabs(found - wanted) <= tolerance * fabs(wanted))) {
        fail_msg("%s: found %.15g, wanted %.15g (relative difference %.2g, allowed %.2g)", what,
                 found, wanted, fabs(found / wanted - 1), tolerance);
    }
}

static inline void check_absolute(const char *what, double found, double wanted, double tolerance)
{
    if (!(fabs(found - wanted) <= tolerance)) {
        fail_msg("%s: found %.15g, wanted %.15g (difference %.2g, allowed %.2g)", what, found,
                 wanted, fabs(found - wanted), tolerance);
    }
}

struct strictness {
    double step;       /* V, of the central differences */
    double derivative; /* allowed, relative to the row */
    double wide;       /* allowed double against long double, relative to the row */
    double bend;       /* S/V, jump of the second derivative at a seam */
    double noise;      /* A, currents of this size cancel inside */
};

#define STRICT ((struct strictness){.step = 1e-8, .derivative = 1e-8, .wide = 1e-13})

static inline void complain(const struct subject *it, const double *x, const char *what, int row,
                            int column, double found, double wanted)
{
    char text[256] = "";
    for (int k = 0; k < size_of(it); k++) {
        size_t used = strlen(text);
        snprintf(text + used, sizeof text - used, " %.10g", x[k]);
    }
    fail_msg("%s: %s [%d,%d]: %.15g against %.15g at%s", it->type->word, what, row, column, found,
             wanted, text);
}

/*
 * check_bias: at one bias the currents sum to zero, the derivatives are those of the function
 * (central differences of the long double version), the two versions agree, columns that the
 * pattern leaves out are zero, and everything is finite.
 */
static inline void check_bias(struct subject *it, const double *x, struct strictness strict)
{
    int n = size_of(it);
    int terminals = it->type->terminal_count;
    double f[DEVICE_LOCAL_LIMIT], jac[DEVICE_LOCAL_LIMIT * DEVICE_LOCAL_LIMIT];
    long double wide_x[DEVICE_LOCAL_LIMIT], wide[DEVICE_LOCAL_LIMIT];
    long double wide_jac[DEVICE_LOCAL_LIMIT * DEVICE_LOCAL_LIMIT];
    long double up[DEVICE_LOCAL_LIMIT], down[DEVICE_LOCAL_LIMIT];
    static long double unused[DEVICE_LOCAL_LIMIT * DEVICE_LOCAL_LIMIT];
    it->type->evaluate(it->prepared, x, f, jac);
    for (int k = 0; k < n; k++) {
        wide_x[k] = x[k];
    }
    it->type->evaluate_extended(it->prepared, wide_x, wide, wide_jac);

    double sum = 0, sum_of_magnitudes = 0;
    bool conducts_inside = it->type->paths != NULL;
    for (int r = 0; r < n; r++) {
        if (!isfinite(f[r]) || !isfinite((double)wide[r])) {
            complain(it, x, "not finite", r, -1, f[r], (double)wide[r]);
        }
        if (r < terminals) {
            sum += f[r];
            sum_of_magnitudes += fabs(f[r]);
        }
    }
    if (conducts_inside && (it->type->paths[0] & (UINT32_C(1) << 31)) == 0 &&
        !(fabs(sum) <= 4e-16 * sum_of_magnitudes)) {
        complain(it, x, "sum of currents", -1, -1, sum, sum_of_magnitudes);
    }
    double row_size[DEVICE_LOCAL_LIMIT];
    for (int r = 0; r < n; r++) {
        row_size[r] = 0;
        for (int c = 0; c < n; c++) {
            row_size[r] += fabs(jac[n * r + c]);
            if (!isfinite(jac[n * r + c])) {
                complain(it, x, "slope not finite", r, c, jac[n * r + c], 0);
            }
            if (it->type->pattern != NULL && !it->type->pattern[n * r + c] &&
                (jac[n * r + c] < 0 || jac[n * r + c] > 0)) {
                complain(it, x, "slope outside the pattern", r, c, jac[n * r + c], 0);
            }
            double between = fabs(jac[n * r + c] - (double)wide_jac[n * r + c]);
            if (!(between <= 100 * strict.wide * (row_size[r] + strict.noise / 0.03) + 1e-300)) {
                complain(it, x, "slope in long double", r, c, jac[n * r + c],
                         (double)wide_jac[n * r + c]);
            }
        }
        double size = fabs(f[r]) + strict.noise + 0.03 * row_size[r];
        if (!(fabs(f[r] - (double)wide[r]) <= strict.wide * size + 1e-300)) {
            complain(it, x, "long double", r, -1, f[r], (double)wide[r]);
        }
    }
    for (int c = 0; c < n; c++) {
        long double h = (long double)strict.step;
        wide_x[c] = (long double)x[c] + h;
        it->type->evaluate_extended(it->prepared, wide_x, up, unused);
        wide_x[c] = (long double)x[c] - h;
        it->type->evaluate_extended(it->prepared, wide_x, down, unused);
        wide_x[c] = x[c];
        for (int r = 0; r < n; r++) {
            double slope = (double)((up[r] - down[r]) / (2 * h));
            double noise = 8 * (double)(LDBL_EPSILON * (fabsl(wide[r]) + strict.noise) / h);
            if (!(fabs(slope - (double)wide_jac[n * r + c]) <=
                  strict.derivative * row_size[r] + noise + strict.bend * strict.step + 1e-290)) {
                complain(it, x, "slope", r, c, (double)wide_jac[n * r + c], slope);
            }
        }
    }
}

/* Voltages of a search gone astray: everything stays finite in both types. */
static inline void check_far(struct subject *it)
{
    static const double far[] = {-1e6, -1e3, -60, 0, 60, 1e3, 1e6};
    enum { FAR = sizeof far / sizeof far[0] };
    int n = size_of(it);
    int count = 1;
    for (int k = 0; k < n; k++) {
        count *= FAR;
    }
    for (int which = 0; which < count; which++) {
        double x[DEVICE_LOCAL_LIMIT], f[DEVICE_LOCAL_LIMIT];
        double jac[DEVICE_LOCAL_LIMIT * DEVICE_LOCAL_LIMIT];
        long double wide_x[DEVICE_LOCAL_LIMIT], wide[DEVICE_LOCAL_LIMIT];
        long double wide_jac[DEVICE_LOCAL_LIMIT * DEVICE_LOCAL_LIMIT];
        for (int k = 0, rest = which; k < n; k++, rest /= FAR) {
            x[k] = far[rest % FAR];
            wide_x[k] = x[k];
        }
        it->type->evaluate(it->prepared, x, f, jac);
        it->type->evaluate_extended(it->prepared, wide_x, wide, wide_jac);
        for (int r = 0; r < n; r++) {
            bool finite = isfinite(f[r]) && isfinite(wide[r]);
            for (int c = 0; c < n; c++) {
                finite = finite && isfinite(jac[n * r + c]) && isfinite(wide_jac[n * r + c]);
            }
            if (!finite) {
                complain(it, x, "not finite far out", r, -1, f[r], (double)wide[r]);
            }
        }
    }
}

#endif

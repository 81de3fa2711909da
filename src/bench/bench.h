/*
 * bench.h: what the rows of ampstead-bench share. A row measures this program beside a peer, in
 * turns, in one run; what it compares is a ratio, never a time.
 */
#ifndef BENCH_BENCH_H
#define BENCH_BENCH_H

#include <stdbool.h>
#include <stddef.h>

enum { BENCH_FIGURE_LIMIT = 24, BENCH_REPEATS = 15 };

struct bench_options {
    bool quick; /* small sizes and three repeats: only whether everything runs and agrees */
    int repeats;
};

/* A number that a row shows beside its ratio. */
struct bench_figure {
    const char *name; /* a JSON key, string constant */
    double value;
    const char *unit; /* "" for a ratio or a count */
};

enum bench_direction { BENCH_AT_MOST, BENCH_AT_LEAST };

struct bench_result {
    double ratio;
    double least, most; /* of the ratios of the single repeats; NAN: there is one only */
    double difference;  /* largest relative difference between the answers of the peers; NAN: they
                           give none that could be compared */
    double allowed;     /* what difference may be */
    struct bench_figure figures[BENCH_FIGURE_LIMIT];
    int figure_count;
    const char *trouble; /* a string constant; NULL: the row was measured */
};

struct bench_row {
    const char *name;
    const char *what; /* the ratio in words */
    enum bench_direction direction;
    double goal;
    /* Fills in the result, which comes zeroed; trouble when something fails. */
    void (*run)(const struct bench_options *options, struct bench_result *result);
};

void bench_point(const struct bench_options *options, struct bench_result *result);
void bench_iterate(const struct bench_options *options, struct bench_result *result);
void bench_samples(const struct bench_options *options, struct bench_result *result);
void bench_grow(const struct bench_options *options, struct bench_result *result);
void bench_cores(const struct bench_options *options, struct bench_result *result);
void bench_review(const struct bench_options *options, struct bench_result *result);
void bench_tiny(const struct bench_options *options, struct bench_result *result);

/* Adds a figure; beyond the limit it is dropped. */
void bench_add(struct bench_result *result, const char *name, double value, const char *unit);

/* Raises the difference between answers to |a - b| relative to the larger of |b| and `floor`; NaN
 * stays. */
void bench_differs(struct bench_result *result, double a, double b, double floor);

#endif

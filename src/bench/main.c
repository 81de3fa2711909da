/*
 * main.c: ampstead-bench: the rows of docs/performance.md, as a table or as JSON.
 *
 *     ampstead-bench [ROW...] [--json] [--quick] [--repeats N]
 *
 * No row: all of them. Exit status 0 when every row was measured and the answers of the peers agree
 * (whether a goal is met is told, and is no error), 1 when not, 2 for a wrong command line.
 */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "bench/bench.h"
#include "bench/stopwatch.h"

static const struct bench_row rows[] = {
    {"point", "KINSOL+KLU over ampstead, a cold solve of a mirror of 4 MOS", BENCH_AT_LEAST, 10,
     bench_point},
    {"iterate", "a Newton iteration of a bias tree over klu_refactor and klu_solve alone",
     BENCH_AT_MOST, 1.5, bench_iterate},
    {"samples", "mismatch samples of a mirror of 4 MOS, one at a time over side by side (AVX2: 3)",
     BENCH_AT_LEAST, 6, bench_samples},
    {"grow", "exponent of the time of one solve from 1e2 to 1e6 devices", BENCH_AT_MOST, 1.1,
     bench_grow},
    {"cores", "samples and sweeps, one thread over two, the lesser of both", BENCH_AT_LEAST, 1.9,
     bench_cores},
    {"review", "a whole review over a process that does nothing", BENCH_AT_MOST, 5, bench_review},
    {"tiny", "a small system factored and solved over KLU alone, worst of n = 3 to 30",
     BENCH_AT_MOST, 1, bench_tiny},
};
enum { ROW_COUNT = sizeof rows / sizeof rows[0] };

void bench_add(struct bench_result *result, const char *name, double value, const char *unit)
{
    if (result->figure_count < BENCH_FIGURE_LIMIT) {
        result->figures[result->figure_count++] = (struct bench_figure){name, value, unit};
    }
}

void bench_differs(struct bench_result *result, double a, double b, double floor)
{
    const double off = fabs(a - b) / fmax(fabs(b), floor);
    if (isnan(result->difference)) {
        result->difference = 0;
    }
    if (!(off <= result->difference)) {
        result->difference = isnan(off) ? INFINITY : off;
    }
}

static bool is_met(const struct bench_row *row, const struct bench_result *result)
{
    return row->direction == BENCH_AT_MOST ? result->ratio <= row->goal
                                           : result->ratio >= row->goal;
}

static bool is_good(const struct bench_result *result)
{
    return result->trouble == NULL && isfinite(result->ratio) &&
           !(result->difference > result->allowed);
}

static const char *direction_text(const struct bench_row *row)
{
    return row->direction == BENCH_AT_MOST ? "at most" : "at least";
}

static void print_text(const struct bench_row *row, const struct bench_result *result)
{
    printf("%-8s %s\n", row->name, row->what);
    if (result->trouble != NULL) {
        printf("         not measured: %s\n\n", result->trouble);
        return;
    }
    printf("         ratio %.4g", result->ratio);
    if (isfinite(result->least)) {
        printf(" (%.4g to %.4g)", result->least, result->most);
    }
    printf(", goal %s %.4g: %s\n", direction_text(row), row->goal,
           is_met(row, result) ? "met" : "NOT MET");
    if (!isnan(result->difference)) {
        printf("         answers differ by %.2g, allowed %.2g%s\n", result->difference,
               result->allowed, result->difference <= result->allowed ? "" : ": THEY DISAGREE");
    }
    for (int k = 0; k < result->figure_count; k++) {
        const struct bench_figure *f = &result->figures[k];
        printf("         %-28s %.4g%s%s\n", f->name, f->value, *f->unit != '\0' ? " " : "",
               f->unit);
    }
    printf("\n");
}

static void json_number(const char *key, double value)
{
    printf(", \"%s\": ", key);
    if (isfinite(value)) {
        printf("%.6g", value);
    } else {
        printf("null");
    }
}

static void print_json(const struct bench_row *row, const struct bench_result *result, bool first)
{
    printf("%s\n  {\"row\": \"%s\", \"what\": \"%s\"", first ? "" : ",", row->name, row->what);
    const bool measured = result->trouble == NULL;
    json_number("ratio", measured ? result->ratio : NAN);
    json_number("goal", row->goal);
    printf(", \"direction\": \"%s\", \"met\": %s", direction_text(row),
           measured && is_met(row, result) ? "true" : "false");
    json_number("least", measured ? result->least : NAN);
    json_number("most", measured ? result->most : NAN);
    json_number("difference", result->difference);
    json_number("allowed", result->allowed);
    printf(", \"agree\": %s", is_good(result) ? "true" : "false");
    if (!measured) {
        printf(", \"trouble\": \"%s\"", result->trouble);
    }
    printf(", \"figures\": {");
    for (int k = 0; k < result->figure_count; k++) {
        const struct bench_figure *f = &result->figures[k];
        printf("%s\"%s\": {\"value\": ", k > 0 ? ", " : "", f->name);
        if (isfinite(f->value)) {
            printf("%.6g", f->value);
        } else {
            printf("null");
        }
        printf(", \"unit\": \"%s\"}", f->unit);
    }
    printf("}}");
}

static int usage(const char *wrong)
{
    fprintf(stderr,
            "ampstead-bench: '%s'; use: ampstead-bench [ROW...] [--json] [--quick] "
            "[--repeats N], rows:\n",
            wrong);
    for (int k = 0; k < ROW_COUNT; k++) {
        fprintf(stderr, "    %-8s %s\n", rows[k].name, rows[k].what);
    }
    return 2;
}

struct request {
    struct bench_options options;
    bool json;
    bool wanted[ROW_COUNT];
    bool any;
};

/* NULL, or the argument that is wrong. */
static const char *read_arguments(int count, char **arguments, struct request *request)
{
    request->options.repeats = 0;
    for (int a = 1; a < count; a++) {
        const char *text = arguments[a];
        if (strcmp(text, "--json") == 0) {
            request->json = true;
        } else if (strcmp(text, "--quick") == 0) {
            request->options.quick = true;
        } else if (strcmp(text, "--repeats") == 0 && a + 1 < count) {
            text = arguments[++a];
            request->options.repeats = (int)strtol(text, NULL, 10);
            if (request->options.repeats < 1 || request->options.repeats > REPEAT_LIMIT) {
                return text;
            }
        } else {
            bool found = false;
            for (int k = 0; k < ROW_COUNT; k++) {
                if (strcmp(text, rows[k].name) == 0) {
                    found = request->wanted[k] = request->any = true;
                }
            }
            if (!found) {
                return text;
            }
        }
    }
    if (request->options.repeats == 0) {
        request->options.repeats = request->options.quick ? 3 : BENCH_REPEATS;
    }
    return NULL;
}

int main(int count, char **arguments)
{
    struct request request = {.json = false};
    const char *wrong = read_arguments(count, arguments, &request);
    if (wrong != NULL) {
        return usage(wrong);
    }
    bool good = true, first = true;
    if (request.json) {
        printf("{\"repeats\": %d, \"quick\": %s, \"rows\": [", request.options.repeats,
               request.options.quick ? "true" : "false");
    }
    for (int k = 0; k < ROW_COUNT; k++) {
        if (request.any && !request.wanted[k]) {
            continue;
        }
        struct bench_result result = {
            .least = NAN, .most = NAN, .difference = NAN, .allowed = 1e-9};
        rows[k].run(&request.options, &result);
        good = is_good(&result) && good;
        if (request.json) {
            print_json(&rows[k], &result, first);
        } else {
            print_text(&rows[k], &result);
        }
        first = false;
        (void)fflush(stdout); /* only that rows show as they come */
    }
    if (request.json) {
        printf("\n]}\n");
    }
    return fflush(stdout) != 0 || ferror(stdout) || !good ? 1 : 0;
}

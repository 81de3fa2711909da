/* ampstead.c: the public functions: a request is read, built, solved, and kept for its reports. */
#include "library/ampstead.h"

#include <math.h>
#include <stdatomic.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "analyses/analysis.h"
#include "analyses/lanes.h"
#include "analyses/size.h"
#include "library/answer.h"
#include "library/edit.h"
#include "library/part.h"
#include "library/place.h"
#include "library/request.h"
#include "library/value.h"
#include "report/report.h"

enum { REQUEST_SET_LIMIT = 1000 };

enum command {
    COMMAND_REVIEW,
    COMMAND_POINT,
    COMMAND_SWEEP,
    COMMAND_MODELS,
    COMMAND_EXPLAIN,
    COMMAND_SIZE,
    COMMAND_SENSITIVITY,
    COMMAND_SPREAD,
    COMMAND_MERGE,
    COMMAND_STATES,
    COMMAND_CHECK,
    COMMAND_FORMAT,
    COMMAND_COUNT
};

static const char *const command_words[COMMAND_COUNT] = {
    [COMMAND_REVIEW] = "review",
    [COMMAND_POINT] = "point",
    [COMMAND_SWEEP] = "sweep",
    [COMMAND_MODELS] = "models",
    [COMMAND_EXPLAIN] = "explain",
    [COMMAND_SIZE] = "size",
    [COMMAND_SENSITIVITY] = "sensitivity",
    [COMMAND_SPREAD] = "spread",
    [COMMAND_MERGE] = "merge",
    [COMMAND_STATES] = "states",
    [COMMAND_CHECK] = "check",
    [COMMAND_FORMAT] = "format",
};

struct ampstead_result {
    enum ampstead_status status;
    enum command command;
    const char *trouble; /* a wrong request, before any cell was read; NULL otherwise */
    struct cell *cell;
    struct circuit *circuit;
    struct result *found;           /* NULL for `models` and after errors */
    struct result *spread, *states; /* beside a review, for its page; NULL: none */
    struct sweep sweep;             /* the one of the request */
    struct probe wanted;            /* the quantity of the request */
    struct part part;               /* of the request: number and parts; parts 0: the whole */
    struct parts parts;             /* of a merge */
    struct buffer messages, text, json, csv, plot, page, cell_text, part_text;
};

const char *ampstead_version(void)
{
    return AMPSTEAD_VERSION;
}

#if defined(__clang__)
#define COMPILER "clang " __clang_version__
#elif defined(__GNUC__)
#define COMPILER "gcc " __VERSION__
#else
#define COMPILER "another compiler"
#endif

const char *ampstead_build(void)
{
    static const char text[] = AMPSTEAD_KLU_VERSION ", " COMPILER ", " AMPSTEAD_BUILD_TYPE;
    return text;
}

static enum ampstead_status public_status(enum status status)
{
    switch (status) {
    case STATUS_OK:
        return AMPSTEAD_WELL;
    case STATUS_INPUT:
    case STATUS_FILE:
        return AMPSTEAD_INPUT;
    case STATUS_UNSOLVED:
        return AMPSTEAD_UNSOLVED;
    case STATUS_STOPPED:
        return AMPSTEAD_STOPPED;
    case STATUS_MEMORY:
        break;
    }
    return AMPSTEAD_MACHINE;
}

static bool ends_with(const char *text, const char *end)
{
    size_t length = strlen(text), end_length = strlen(end);
    return length >= end_length && strcmp(text + length - end_length, end) == 0;
}

/* `models` of a process file: a cell that names only it. */
static char *process_cell(const char *path)
{
    static const char before[] = "process \"", after[] = "\"\n";
    const char *slash = strrchr(path, '/');
    const char *name = slash == NULL ? path : slash + 1;
    const size_t size = sizeof before + strlen(name) + sizeof after;
    char *text = malloc(size);
    if (text != NULL) {
        snprintf(text, size, "%s%s%s", before, name, after);
    }
    return text;
}

static enum status read_with(const struct ampstead_request *request, const char *installed,
                             struct ampstead_result *result)
{
    const char *folders[3];
    int count = 0;
    if (request->model_folder_count > 0 && request->model_folders != NULL) {
        folders[count++] = request->model_folders[0];
    }
    folders[count++] = installed;
    folders[count++] = AMPSTEAD_SOURCE_MODELS;
    bool takes_process = result->command == COMMAND_MODELS || result->command == COMMAND_CHECK;
    if (takes_process && request->text == NULL && ends_with(request->path, ".process")) {
        char *text = process_cell(request->path);
        if (text == NULL) {
            return STATUS_MEMORY;
        }
        enum status status =
            cell_read(request->path, text, strlen(text), folders, count, &result->cell);
        free(text);
        return status;
    }
    return cell_read(request->path, request->text, request->text_length, folders, count,
                     &result->cell);
}

static enum status read_cell(const struct ampstead_request *request, struct ampstead_result *result)
{
    char *installed = place_models();
    if (installed == NULL) {
        return STATUS_MEMORY;
    }
    enum status status = read_with(request, installed, result);
    free(installed);
    return status;
}

/* Reads the texts of the request, then builds the circuit. Errors of all of them are found. */
static enum status build(const struct ampstead_request *request, struct ampstead_result *result)
{
    struct cell *cell = result->cell;
    struct circuit_settings settings = {.kelvin = NAN, .corner = request->corner};
    int count = request->sets == NULL || request->set_count < 0 ? 0 : request->set_count;
    struct set_value *sets = arena_new_array(cell->arena, struct set_value, count);
    if (sets == NULL) {
        return STATUS_MEMORY;
    }
    enum status worst = STATUS_OK;
    for (int k = 0; k < count && worst != STATUS_MEMORY; k++) {
        enum status status = request_set(cell, request->sets[k], &sets[k]);
        worst = status == STATUS_OK ? worst : status;
    }
    if (worst != STATUS_MEMORY && request->temperature != NULL) {
        enum status status = request_temperature(cell, request->temperature, &settings.kelvin);
        worst = status == STATUS_OK ? worst : status;
    }
    if (worst != STATUS_OK) {
        return worst;
    }
    settings.sets = sets;
    settings.set_count = count;
    return circuit_build(cell, &settings, &cell->diagnostics, &result->circuit);
}

struct hooks {
    const struct ampstead_request *request;
    atomic_bool was_stopped; /* a yes was given: some of the work was left out */
};

static bool ask_stopped(void *self)
{
    struct hooks *hooks = self;
    if (hooks->request->stopped(hooks->request->stopped_self) == 0) {
        return false;
    }
    atomic_store(&hooks->was_stopped, true);
    return true;
}

static struct analysis_options options_of(const struct ampstead_request *request,
                                          struct hooks *hooks)
{
    return (struct analysis_options){
        .view = request->view == AMPSTEAD_VIEW_HAND ? VIEW_HAND : VIEW_FULL,
        .stopped = request->stopped != NULL ? ask_stopped : NULL,
        .stopped_self = hooks,
        .progress = request->progress,
        .progress_self = request->progress_self,
        .certify = request->certify != 0,
        .boxes = request->boxes,
        .leakage = 1e-9,
        .jobs = request->jobs,
        .samples = request->samples,
        .seed = request->seed,
        .lanes = request->lanes,
        .grid = 10e-9,
    };
}

/* What the page of a review shows beside it. That a state was not found there is no failure of the
 * review. */
static enum status analyse_more(const struct ampstead_request *request,
                                struct ampstead_result *result)
{
    struct hooks hooks = {.request = request};
    const struct analysis_options options = options_of(request, &hooks);
    enum status status = analysis_spread(result->circuit, &options, &result->spread);
    if (status != STATUS_MEMORY && status != STATUS_STOPPED) {
        status = analysis_states(result->circuit, &options, &result->states);
    }
    return status == STATUS_MEMORY || status == STATUS_STOPPED ? status : STATUS_OK;
}

static enum status analyse(const struct ampstead_request *request, struct hooks *hooks,
                           struct ampstead_result *result)
{
    struct analysis_options options = options_of(request, hooks);
    switch (result->command) {
    case COMMAND_REVIEW:
        return analysis_review(result->circuit, &options, &result->found);
    case COMMAND_POINT:
        return analysis_point(result->circuit, &options, &result->found);
    case COMMAND_SWEEP:
        if (request->sweep != NULL) {
            enum status status =
                request_sweep(result->cell, result->circuit, request->sweep, &result->sweep);
            if (status != STATUS_OK) {
                return status;
            }
            options.extra_sweep = &result->sweep;
        }
        return analysis_sweep(result->circuit, &options, &result->found);
    case COMMAND_STATES:
        if (request->leakage != NULL) {
            enum status status =
                request_current(result->cell, "--leakage", request->leakage, &options.leakage);
            if (status != STATUS_OK) {
                return status;
            }
        }
        return analysis_states(result->circuit, &options, &result->found);
    case COMMAND_SPREAD:
        if (result->part.parts > 0) {
            part_range(request->samples, result->part.number, result->part.parts, &options.first,
                       &options.count);
            return analysis_samples(result->circuit, &options, &result->found);
        }
        options.sampled = result->parts.count > 0 ? &result->parts.rows : NULL;
        return analysis_spread(result->circuit, &options, &result->found);
    case COMMAND_EXPLAIN:
        return analysis_explain(result->circuit, &options, &result->found);
    case COMMAND_SIZE:
        if (request->grid != NULL) {
            enum status status = request_length(result->cell, request->grid, &options.grid);
            if (status != STATUS_OK) {
                return status;
            }
        }
        return analysis_size(result->circuit, &options, &result->found);
    case COMMAND_SENSITIVITY:
        if (request->of != NULL) {
            enum status status =
                request_probe(result->cell, result->circuit, request->of, &result->wanted);
            if (status != STATUS_OK) {
                return status;
            }
            options.wanted = &result->wanted;
        }
        return analysis_sensitivity(result->circuit, &options, &result->found);
    case COMMAND_MERGE:
    case COMMAND_MODELS:
    case COMMAND_CHECK:
    case COMMAND_FORMAT:
    case COMMAND_COUNT:
        break;
    }
    return STATUS_OK;
}

/* What is wrong with the request itself, or NULL. */
static const char *check_request(const struct ampstead_request *request, enum command *command)
{
    if (request->size != sizeof *request) {
        return "the request was made for another version of the library";
    }
    const bool is_merge = request->command != NULL && strcmp(request->command, "merge") == 0;
    if (request->path == NULL && !is_merge) {
        return "the request names no cell";
    }
    if (is_merge && (request->parts == NULL || request->part_count < 1)) {
        return "the request names no parts";
    }
    if (request->lanes < 0 || request->lanes > LANES_LIMIT) {
        return "the number of lanes must lie between 0 and 8";
    }
    if (request->set_count > REQUEST_SET_LIMIT) {
        return "more than 1000 values are set";
    }
    if (request->sweep != NULL &&
        (request->command == NULL || strcmp(request->command, "sweep") != 0)) {
        return "a sweep is given to a command other than sweep";
    }
    if (request->boxes < 0) {
        return "the number of boxes must not be negative";
    }
    if (request->samples < 0 || request->samples > AMPSTEAD_SAMPLE_LIMIT) {
        return "the number of samples must lie between 0 and 10000000";
    }
    *command = COMMAND_REVIEW;
    for (int k = 0; k < COMMAND_COUNT && request->command != NULL; k++) {
        if (strcmp(request->command, command_words[k]) == 0) {
            *command = (enum command)k;
            return NULL;
        }
    }
    return request->command == NULL ? NULL : "the request has an unknown command";
}

/*
 * A search that is stopped may end as one that found nothing, and a part that failed may be left
 * out: whichever way the work ended after it was told to stop, the result is a stopped one.
 */
static enum status analyse_or_stop(const struct ampstead_request *request,
                                   struct ampstead_result *result)
{
    struct hooks hooks = {.request = request};
    const enum status status = analyse(request, &hooks, result);
    const bool has_ended = status == STATUS_OK || status == STATUS_UNSOLVED;
    if (result->found != NULL && has_ended && atomic_load(&hooks.was_stopped)) {
        result->found->is_stopped = true;
        return STATUS_STOPPED;
    }
    return status;
}

/* What the part says of itself. */
static enum status describe_part(const struct ampstead_request *request,
                                 struct ampstead_result *result)
{
    const struct mismatch_result *r = result->found->mismatch;
    const struct lanes_kind *kind = request->lanes == 1 ? NULL : lanes_find(request->lanes);
    struct part *p = &result->part;
    if (r->states == NULL) {
        result->trouble = "the cell has no mismatch to sample";
        return STATUS_INPUT;
    }
    p->version = AMPSTEAD_VERSION;
    p->cell = result->cell->path;
    p->view = request->view == AMPSTEAD_VIEW_HAND ? "hand" : "full";
    p->lanes = kind == NULL ? "single" : kind->name;
    p->fingerprint = part_fingerprint(result->cell);
    p->seed = request->seed;
    p->samples = request->samples;
    part_range(p->samples, p->number, p->parts, &p->first, &p->count);
    p->quantity_count = r->quantity_count;
    p->requirement_count = result->circuit->requirement_count;
    p->values = r->values;
    p->states = r->states;
    p->met = r->met;
    answer_begin(&result->part_text); /* now: the texts of the request are gone later */
    p->corner = request->corner;
    p->temperature = request->temperature;
    p->sets = request->sets;
    p->set_count = request->sets == NULL || request->set_count < 0 ? 0 : request->set_count;
    part_write(p, &result->part_text);
    return result->part_text.failed ? STATUS_MEMORY : STATUS_OK;
}

/* What only a merge asks of the cell, or a part of the samples. */
static enum status check_parts(const struct ampstead_request *request,
                               struct ampstead_result *result)
{
    if (request->part != NULL) {
        if (result->command != COMMAND_SPREAD ||
            !part_parse(request->part, &result->part.number, &result->part.parts)) {
            result->trouble = "a part is written as 3/16, and goes with the command spread";
            return STATUS_INPUT;
        }
    }
    return STATUS_OK;
}

static enum status run_on_cell(const struct ampstead_request *request,
                               struct ampstead_result *result);

static enum status merge(const struct ampstead_request *request, struct ampstead_result *result)
{
    struct ampstead_request whole = *request;
    enum status status = parts_join(request, AMPSTEAD_VERSION, &result->parts, &whole);
    if (status == STATUS_OK) {
        result->command = COMMAND_SPREAD;
        status = run_on_cell(&whole, result);
    }
    if (status == STATUS_INPUT && result->parts.trouble.length > 0) {
        result->trouble = result->parts.trouble.data;
    }
    return status;
}

static enum status run(const struct ampstead_request *request, struct ampstead_result *result)
{
    result->trouble = check_request(request, &result->command);
    if (result->trouble != NULL) {
        return STATUS_INPUT;
    }
    const enum status status = check_parts(request, result);
    if (status != STATUS_OK) {
        return status;
    }
    return result->command == COMMAND_MERGE ? merge(request, result) : run_on_cell(request, result);
}

static enum status run_on_cell(const struct ampstead_request *request,
                               struct ampstead_result *result)
{
    if (result->command != COMMAND_MODELS && result->command != COMMAND_CHECK &&
        result->command != COMMAND_FORMAT && ends_with(request->path, ".process")) {
        result->trouble = "this is a process file: ampstead models FILE shows it";
        return STATUS_INPUT;
    }
    if (result->command == COMMAND_FORMAT) {
        return edit_format(request->path, request->text, request->text_length, &result->cell,
                           &result->text);
    }
    enum status status = read_cell(request, result);
    /* A cell with errors is built as far as it goes: all that is wrong is told in one run. */
    if (status == STATUS_OK || (status == STATUS_INPUT && result->cell != NULL)) {
        status = build(request, result);
    }
    bool is_process = ends_with(request->path, ".process"); /* which `check` and `models` take */
    if (status == STATUS_OK && result->command != COMMAND_MODELS && !is_process &&
        result->circuit->instance_count == 0) {
        diagnostics_add(&result->cell->diagnostics, SPAN_NONE, NULL, "the cell holds no parts");
        status = STATUS_INPUT;
    }
    if (status == STATUS_OK && result->parts.count > 0) {
        status = parts_check(&result->parts, result->cell, result->circuit);
    }
    if (status == STATUS_OK) {
        status = analyse_or_stop(request, result);
    }
    if (status == STATUS_OK && result->command == COMMAND_REVIEW && request->whole != 0) {
        status = analyse_more(request, result);
    }
    if (status == STATUS_OK && result->part.parts > 0) {
        status = describe_part(request, result);
    }
    if (result->cell != NULL && result->cell->diagnostics.out_of_memory) {
        return STATUS_MEMORY;
    }
    return status;
}

enum ampstead_status ampstead_run(const struct ampstead_request *request,
                                  struct ampstead_result **result)
{
    *result = calloc(1, sizeof **result);
    if (*result == NULL) {
        return AMPSTEAD_MACHINE;
    }
    enum ampstead_status status = public_status(run(request, *result));
    const struct result *found = (*result)->found;
    if (status == AMPSTEAD_WELL && found != NULL && found->verdict == VERDICT_NOT_MET) {
        status = AMPSTEAD_NOT_MET;
    }
    (*result)->status = status;
    return status;
}

void ampstead_result_free(struct ampstead_result *result)
{
    if (result == NULL) {
        return;
    }
    buffer_free(&result->messages);
    buffer_free(&result->text);
    buffer_free(&result->json);
    buffer_free(&result->csv);
    buffer_free(&result->plot);
    buffer_free(&result->page);
    buffer_free(&result->cell_text);
    buffer_free(&result->part_text);
    parts_free(&result->parts);
    result_free(result->found);
    result_free(result->spread);
    result_free(result->states);
    circuit_free(result->circuit);
    cell_free(result->cell);
    free(result);
}

enum ampstead_status ampstead_result_status(const struct ampstead_result *result)
{
    return result == NULL ? AMPSTEAD_MACHINE : result->status;
}

const char *ampstead_result_messages(struct ampstead_result *result, unsigned flags)
{
    if (result == NULL) {
        return answer_short_memory;
    }
    return answer_messages(
        &result->messages, result->trouble == NULL ? result->parts.note : result->trouble,
        result->cell == NULL ? NULL : &result->cell->diagnostics,
        result->cell == NULL ? NULL : &result->cell->sources, flags, &result->status);
}

/* Whether the command came far enough to have something to report. */
static bool has_report(const struct ampstead_result *result)
{
    if (result == NULL || result->circuit == NULL) {
        return false;
    }
    return result->command == COMMAND_MODELS || (result->found != NULL && result->part.parts == 0);
}

const char *ampstead_result_text(struct ampstead_result *result, unsigned flags, int columns)
{
    if (result != NULL && result->command == COMMAND_FORMAT) {
        return result->status == AMPSTEAD_WELL ? answer_end(&result->text, &result->status) : NULL;
    }
    if (result != NULL && result->command == COMMAND_CHECK && result->cell != NULL) {
        answer_begin(&result->text);
        edit_list_errors(result->cell, &result->text);
        return answer_end(&result->text, &result->status);
    }
    if (!has_report(result)) {
        return NULL;
    }
    const struct report_style style = {
        .color = (flags & AMPSTEAD_COLOR) != 0,
        .ascii = (flags & AMPSTEAD_ASCII) != 0,
        .stopped = result->status == AMPSTEAD_STOPPED,
        .columns = columns,
    };
    answer_begin(&result->text);
    switch (result->command) {
    case COMMAND_POINT:
        report_point(result->found, &style, &result->text);
        break;
    case COMMAND_SWEEP:
        report_sweep(result->found, &style, &result->text);
        break;
    case COMMAND_STATES:
        report_states(result->found, &style, &result->text);
        break;
    case COMMAND_SPREAD:
        report_spread(result->found, &style, &result->text);
        break;
    case COMMAND_MODELS:
        report_models(result->circuit, &style, &result->text);
        break;
    case COMMAND_EXPLAIN:
        report_explain(result->found, &style, &result->text);
        break;
    case COMMAND_SIZE:
        report_size(result->found, &style, &result->text);
        break;
    case COMMAND_SENSITIVITY:
        report_sensitivity(result->found, &style, &result->text);
        break;
    case COMMAND_REVIEW:
    case COMMAND_MERGE:
    case COMMAND_CHECK:
    case COMMAND_FORMAT:
    case COMMAND_COUNT:
        report_page(result->found, &style, &result->text);
        break;
    }
    return answer_end(&result->text, &result->status);
}

const char *ampstead_result_json(struct ampstead_result *result)
{
    if (!has_report(result) || result->command == COMMAND_CHECK) {
        return NULL;
    }
    answer_begin(&result->json);
    if (result->command == COMMAND_MODELS) {
        report_json_models(result->circuit, AMPSTEAD_VERSION, &result->json);
    } else {
        report_json(result->found, AMPSTEAD_VERSION, &result->json);
    }
    return answer_end(&result->json, &result->status);
}

const char *ampstead_result_csv(struct ampstead_result *result)
{
    if (!has_report(result) ||
        (result->command != COMMAND_REVIEW && result->command != COMMAND_SWEEP &&
         result->command != COMMAND_SPREAD)) {
        return NULL;
    }
    answer_begin(&result->csv);
    report_csv(result->found, &result->csv);
    return answer_end(&result->csv, &result->status);
}

const char *ampstead_result_part(struct ampstead_result *result)
{
    if (result == NULL || result->part.parts == 0 || result->part_text.data == NULL) {
        return NULL;
    }
    return answer_end(&result->part_text, &result->status);
}

const char *ampstead_result_plot(struct ampstead_result *result)
{
    if (!has_report(result) || result->found == NULL) {
        return NULL;
    }
    answer_begin(&result->plot);
    report_plot(result->found, &result->plot);
    return result->plot.length == 0 && !result->plot.failed
               ? NULL
               : answer_end(&result->plot, &result->status);
}

const char *ampstead_result_page(struct ampstead_result *result)
{
    const bool has_page = has_report(result) &&
                          (result->command == COMMAND_REVIEW || result->command == COMMAND_SPREAD ||
                           result->command == COMMAND_STATES || result->command == COMMAND_EXPLAIN);
    if (!has_page) {
        return NULL;
    }
    const struct report_style style = {.stopped = result->status == AMPSTEAD_STOPPED};
    const struct web_results results = {result->found, result->spread, result->states};
    answer_begin(&result->page);
    report_web(&results, &style, AMPSTEAD_VERSION, &result->page);
    return answer_end(&result->page, &result->status);
}

const char *ampstead_result_file(const struct ampstead_result *result, int index)
{
    if (result == NULL || result->cell == NULL || index < 0) {
        return NULL;
    }
    return index == 0                                ? result->cell->path
           : index - 1 < result->cell->process_count ? result->cell->processes[index - 1].path
                                                     : NULL;
}

/* The values of a rounding by its name, or the exact ones. NULL: there is no such rounding. */
static const double *chosen_values(const struct size_result *size, const char *rounding,
                                   struct arena *arena)
{
    if (rounding == NULL || strcmp(rounding, "exact") == 0) {
        double *values = arena_new_array(arena, double, size->count);
        for (int k = 0; values != NULL && k < size->count; k++) {
            values[k] = size->list[k].value;
        }
        return values;
    }
    for (int k = 0; k < size->rounding_count; k++) {
        if (strcmp(size->roundings[k].name, rounding) == 0) {
            return size->roundings[k].values;
        }
    }
    return NULL;
}

const char *ampstead_result_cell(struct ampstead_result *result, const char *rounding)
{
    if (result == NULL || result->found == NULL || result->found->size == NULL ||
        !result->found->size->solved) {
        return NULL;
    }
    struct arena *arena = arena_create();
    const double *values =
        arena == NULL ? NULL : chosen_values(result->found->size, rounding, arena);
    const char *text = values == NULL ? NULL : size_rewrite(result->circuit, values, arena);
    answer_begin(&result->cell_text);
    if (text != NULL) {
        buffer_text(&result->cell_text, text);
    }
    arena_destroy(arena);
    return text == NULL ? NULL : answer_end(&result->cell_text, &result->status);
}

int ampstead_result_value(const struct ampstead_result *result, const char *name, double *value)
{
    if (result == NULL || result->found == NULL || name == NULL) {
        return 0;
    }
    double found = value_of(result->found, name);
    if (isnan(found)) {
        return 0;
    }
    *value = found;
    return 1;
}

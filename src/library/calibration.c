/* calibration.c: the public functions for calibrations. */
#include "library/ampstead.h"

#include <stdlib.h>
#include <string.h>

#include "language/source.h"
#include "library/answer.h"
#include "report/calibration.h"

struct ampstead_calibration {
    enum ampstead_status status;
    const char *trouble; /* a wrong request; NULL */
    struct calibration *found;
    char *name, *heading, *command; /* of the process file */
    struct buffer messages, text, json, plot, process;
};

static const char *const form_words[] = {
    [FORM_AUTOMATIC] = "", [FORM_CARDS] = "cards", [FORM_SET] = "set", [FORM_BOTH] = "both"};

static enum ampstead_status public_status(enum status status)
{
    switch (status) {
    case STATUS_OK:
        return AMPSTEAD_WELL;
    case STATUS_INPUT:
    case STATUS_FILE:
    case STATUS_UNSOLVED:
        return AMPSTEAD_INPUT;
    case STATUS_STOPPED:
        return AMPSTEAD_STOPPED;
    case STATUS_MEMORY:
        break;
    }
    return AMPSTEAD_MACHINE;
}

/* "models/open130.process" is "open130". */
static char *process_name(const char *target)
{
    static const char end[] = ".process";
    const char *slash = strrchr(target, '/');
    const char *name = slash == NULL ? target : slash + 1;
    size_t length = strlen(name), end_length = sizeof end - 1;
    if (length > end_length && strcmp(name + length - end_length, end) == 0) {
        length -= end_length;
    }
    char *copy = strndup(name, length);
    /* what cannot stand in a quoted text of the language */
    for (char *at = copy; at != NULL && *at != '\0'; at++) {
        *at = (char)(*at == '"' || *at == '\\' || (unsigned char)*at < ' ' ? '_' : *at);
    }
    return copy;
}

/* The comment at the top of an existing file, "" without one; NULL when memory is short. */
static char *old_heading(struct calibration *c, const char *target)
{
    uint32_t file = 0;
    if (!source_exists(target)) {
        return strdup("");
    }
    int count = c->diagnostics.count;
    if (source_read(c->arena, &c->sources, target, NULL, SPAN_NONE, &c->diagnostics, &file) !=
        STATUS_OK) {
        c->diagnostics.count = count; /* it is replaced, whatever it was */
        return strdup("");
    }
    const char *text = c->sources.files[file].text;
    size_t length = 0;
    while (text[length] == '#') {
        const char *end = strchr(text + length, '\n');
        length = end == NULL ? strlen(text) : (size_t)(end - text) + 1;
    }
    /* a heading that this program wrote is written anew */
    static const char own[] = "# Written by ampstead";
    return strncmp(text, own, sizeof own - 1) == 0 ? strdup("") : strndup(text, length);
}

static bool keep_texts(const struct ampstead_calibration_request *request,
                       struct ampstead_calibration *calibration)
{
    const char *target = request->target == NULL ? "curves" : request->target;
    bool is_file = request->target != NULL && strcmp(target, "-") != 0;
    calibration->name = process_name(is_file ? target : "curves");
    calibration->heading = is_file ? old_heading(calibration->found, target) : strdup("");
    calibration->command = request->command == NULL ? strdup("") : strdup(request->command);
    return calibration->name != NULL && calibration->heading != NULL &&
           calibration->command != NULL;
}

struct hooks {
    const struct ampstead_calibration_request *request;
};

static bool ask_stopped(void *self)
{
    const struct hooks *hooks = self;
    return hooks->request->stopped(hooks->request->stopped_self) != 0;
}

static const char *read_form(const struct ampstead_calibration_request *request,
                             enum calibration_form *form)
{
    *form = FORM_AUTOMATIC;
    for (int k = FORM_CARDS; k <= FORM_BOTH && request->form != NULL; k++) {
        if (strcmp(request->form, form_words[k]) == 0) {
            *form = (enum calibration_form)k;
            return NULL;
        }
    }
    return request->form == NULL ? NULL : "the form is cards, set or both";
}

static enum status run(const struct ampstead_calibration_request *request,
                       struct calibration_file *files, struct ampstead_calibration *calibration)
{
    struct hooks hooks = {request};
    struct calibration_request inner = {
        .kind = request->kind,
        .files = files,
        .file_count = request->file_count,
        .list = request->list,
        .size = request->size_text,
        .columns = request->columns,
        .temperature = request->temperature,
        .model = request->model,
        .noise = request->noise,
        .relative = request->accuracy,
        .is_robust = request->robust != 0,
        .stopped = request->stopped == NULL ? NULL : ask_stopped,
        .stopped_self = &hooks,
        .progress = request->progress,
        .progress_self = request->progress_self,
    };
    calibration->trouble = read_form(request, &inner.form);
    if (calibration->trouble != NULL) {
        return STATUS_INPUT;
    }
    for (int k = 0; k < request->file_count; k++) {
        const struct ampstead_curves *file = &request->files[k];
        files[k] =
            (struct calibration_file){file->path, file->width, file->length, file->held != 0};
    }
    enum status status = calibration_run(&inner, &calibration->found);
    if (status == STATUS_OK && request->target != NULL && calibration->found->fit_count == 0) {
        calibration->trouble =
            "a process file holds no resistors: nothing to write; the text shows "
            "the line for a cell";
        return STATUS_INPUT;
    }
    return status == STATUS_OK && !keep_texts(request, calibration) ? STATUS_MEMORY : status;
}

enum ampstead_status ampstead_calibrate(const struct ampstead_calibration_request *request,
                                        struct ampstead_calibration **calibration)
{
    struct ampstead_calibration *it = calloc(1, sizeof *it);
    *calibration = it;
    if (it == NULL) {
        return AMPSTEAD_MACHINE;
    }
    if (request->size != sizeof *request || request->file_count < 0) {
        it->trouble = "the request was made for another version of the library";
        it->status = AMPSTEAD_INPUT;
        return it->status;
    }
    struct calibration_file *files = calloc((size_t)request->file_count + 1, sizeof *files);
    it->status = files == NULL ? AMPSTEAD_MACHINE : public_status(run(request, files, it));
    free(files);
    return it->status;
}

void ampstead_calibration_free(struct ampstead_calibration *calibration)
{
    if (calibration == NULL) {
        return;
    }
    buffer_free(&calibration->messages);
    buffer_free(&calibration->text);
    buffer_free(&calibration->json);
    buffer_free(&calibration->plot);
    buffer_free(&calibration->process);
    free(calibration->name);
    free(calibration->heading);
    free(calibration->command);
    calibration_free(calibration->found);
    free(calibration);
}

const char *ampstead_calibration_messages(struct ampstead_calibration *calibration, unsigned flags)
{
    if (calibration == NULL) {
        return answer_short_memory;
    }
    return answer_messages(&calibration->messages, calibration->trouble,
                           calibration->found == NULL ? NULL : &calibration->found->diagnostics,
                           calibration->found == NULL ? NULL : &calibration->found->sources, flags,
                           &calibration->status);
}

static bool has_report(const struct ampstead_calibration *calibration)
{
    return calibration != NULL && calibration->status == AMPSTEAD_WELL;
}

const char *ampstead_calibration_text(struct ampstead_calibration *calibration, unsigned flags,
                                      int columns)
{
    if (!has_report(calibration)) {
        return NULL;
    }
    const struct report_style style = {
        .color = (flags & AMPSTEAD_COLOR) != 0,
        .ascii = (flags & AMPSTEAD_ASCII) != 0,
        .columns = columns,
    };
    answer_begin(&calibration->text);
    report_calibration(calibration->found, &style, &calibration->text);
    return answer_end(&calibration->text, &calibration->status);
}

const char *ampstead_calibration_json(struct ampstead_calibration *calibration)
{
    if (!has_report(calibration)) {
        return NULL;
    }
    answer_begin(&calibration->json);
    report_json_calibration(calibration->found, AMPSTEAD_VERSION, &calibration->json);
    return answer_end(&calibration->json, &calibration->status);
}

const char *ampstead_calibration_plot(struct ampstead_calibration *calibration)
{
    if (!has_report(calibration)) {
        return NULL;
    }
    answer_begin(&calibration->plot);
    report_plot_calibration(calibration->found, &calibration->plot);
    const char *svg = answer_end(&calibration->plot, &calibration->status);
    return svg == NULL || *svg == '\0' ? NULL : svg;
}

const char *ampstead_calibration_process(struct ampstead_calibration *calibration)
{
    if (!has_report(calibration)) {
        return NULL;
    }
    answer_begin(&calibration->process);
    report_process(calibration->found, calibration->name, calibration->heading,
                   calibration->command[0] == '\0' ? NULL : calibration->command,
                   &calibration->process);
    return answer_end(&calibration->process, &calibration->status);
}

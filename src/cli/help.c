/* help.c: help made from the tables. */
#include <string.h>

#include "cli/options.h"

enum { HELP_COLUMNS = 88, TEXT_COLUMN = 30 };

/* Text from `column` on, broken at spaces, each further line indented to TEXT_COLUMN. */
static void write_wrapped(FILE *out, const char *text, int column)
{
    bool is_first = true;
    while (*text != '\0') {
        size_t length = strcspn(text, " ");
        if (column + (int)length >= HELP_COLUMNS) {
            fprintf(out, "\n%*s", TEXT_COLUMN, "");
            column = TEXT_COLUMN;
            is_first = true;
        }
        fprintf(out, "%s%.*s", is_first ? "" : " ", (int)length, text);
        column += (int)length + 1;
        is_first = false;
        text += length;
        text += strspn(text, " ");
    }
    fputc('\n', out);
}

static void write_option(FILE *out, const struct option_row *row)
{
    char form[96];
    const char *argument = row->argument_name != NULL ? row->argument_name : "";
    const char *before = row->argument == ARGUMENT_OPTIONAL                                   ? " ["
                         : row->argument == ARGUMENT_NEEDED || row->argument == ARGUMENT_MANY ? " "
                                                                                              : "";
    int width = snprintf(form, sizeof form, "  --%s%s%s%s", row->name, before, argument,
                         row->argument == ARGUMENT_OPTIONAL ? "]" : "");
    if (row->letter != 0) {
        width += snprintf(form + width, sizeof form - (size_t)width, ", -%c", row->letter);
    }
    if (width >= TEXT_COLUMN) {
        fprintf(out, "%s\n%*s", form, TEXT_COLUMN, "");
    } else {
        fprintf(out, "%-*s", TEXT_COLUMN, form);
    }
    char text[400];
    snprintf(text, sizeof text, "%s (default: %s)", row->text, row->standard);
    write_wrapped(out, row->argument == ARGUMENT_NONE ? row->text : text, TEXT_COLUMN);
}

static void write_statuses(FILE *out)
{
    fputs("\nExit status:\n", out);
    for (const struct status_row *row = status_rows; row->text != NULL; row++) {
        fprintf(out, "  %-*d%s\n", TEXT_COLUMN - 2, row->status, row->text);
    }
}

void help_general(FILE *out)
{
    fputs("ampstead: the DC operating point of a bias cell, and whether the hand design holds\n\n"
          "  ampstead FILE.cell [options]\n"
          "  ampstead VERB FILE.cell [options]\n\n"
          "FILE may be - for standard input.\n\nVerbs:\n",
          out);
    for (int k = 0; k < VERB_COUNT; k++) {
        char form[64];
        snprintf(form, sizeof form, "  %s %s", verb_rows[k].word, verb_rows[k].argument);
        fprintf(out, "%-*s", TEXT_COLUMN, form);
        write_wrapped(out, verb_rows[k].summary, TEXT_COLUMN);
    }
    fputs("\nOptions:\n", out);
    for (int k = 0; k < OPTION_COUNT; k++) {
        write_option(out, &option_rows[k]);
    }
    write_statuses(out);
}

void help_verb(FILE *out, enum verb verb)
{
    const struct verb_row *row = &verb_rows[verb];
    fprintf(out, "ampstead %s %s: %s\n\n%s\n\nOptions:\n", row->word, row->argument, row->summary,
            row->text);
    for (int k = 0; k < OPTION_COUNT; k++) {
        if ((option_rows[k].verbs & 1u << verb) != 0) {
            write_option(out, &option_rows[k]);
        }
    }
    write_statuses(out);
}

/* options.c: argv to options, by the tables. GNU style: options anywhere, `--` ends them. */
#include "cli/options.h"

#include <stdarg.h>
#include <stdlib.h>
#include <string.h>

#include "base/diagnostic.h"

/* What has been read so far. */
struct reader {
    int argc;
    char **argv;
    int next;
    FILE *errors;
    struct options *options;
    const char *words[2];   /* what is no option: verb and file, or one of them */
    const char *after_json; /* the word behind a --json that took no file, or NULL */
    int word_count;
};

/* "ampstead: 'WORD' ...": the bad word first. Returns false for the caller to return. */
static bool usage_error(const struct reader *reader, const char *word, const char *format, ...)
    __attribute__((format(printf, 3, 4)));

static bool usage_error(const struct reader *reader, const char *word, const char *format, ...)
{
    va_list arguments;
    fprintf(reader->errors, "ampstead: '%s' ", word);
    va_start(arguments, format);
    vfprintf(reader->errors, format, arguments);
    va_end(arguments);
    fputs("\n", reader->errors);
    return false;
}

static const char *near_option(const char *name)
{
    const char *names[OPTION_COUNT];
    for (int k = 0; k < OPTION_COUNT; k++) {
        names[k] = option_rows[k].name;
    }
    return near_name(name, names, OPTION_COUNT);
}

static const char *near_verb(const char *word)
{
    const char *words[VERB_COUNT];
    for (int k = 0; k < VERB_COUNT; k++) {
        words[k] = verb_rows[k].word;
    }
    return near_name(word, words, VERB_COUNT);
}

static int find_verb(const char *word)
{
    for (int k = 0; k < VERB_COUNT; k++) {
        if (strcmp(verb_rows[k].word, word) == 0) {
            return k;
        }
    }
    return -1;
}

static int find_long(const char *name, size_t length)
{
    for (int k = 0; k < OPTION_COUNT; k++) {
        if (strlen(option_rows[k].name) == length &&
            memcmp(option_rows[k].name, name, length) == 0) {
            return k;
        }
    }
    return -1;
}

static bool check_choice(const struct reader *reader, const struct option_row *row,
                         const char *value)
{
    int count = 0;
    for (; row->choices != NULL && row->choices[count] != NULL; count++) {
        if (strcmp(row->choices[count], value) == 0) {
            return true;
        }
    }
    if (row->choices == NULL) {
        return true;
    }
    const char *near = near_name(value, row->choices, count);
    if (near != NULL) {
        return usage_error(reader, value, "is no value of --%s (%s); did you mean '%s'?", row->name,
                           row->argument_name, near);
    }
    return usage_error(reader, value, "is no value of --%s (%s)", row->name, row->argument_name);
}

static bool ends_with_json(const char *word)
{
    static const char end[] = ".json";
    size_t length = strlen(word);
    return length >= sizeof end - 1 && strcmp(word + length - (sizeof end - 1), end) == 0;
}

/* Takes option `index`; `value` is what stood glued to it, or NULL. */
static bool take_option(struct reader *reader, int index, const char *word, const char *value)
{
    const struct option_row *row = &option_rows[index];
    struct options *options = reader->options;
    if (row->argument == ARGUMENT_NONE && value != NULL) {
        return usage_error(reader, word, "takes no value");
    }
    if (value == NULL && reader->next < reader->argc) {
        const char *follower = reader->argv[reader->next];
        if (row->argument == ARGUMENT_NEEDED || row->argument == ARGUMENT_MANY ||
            (row->argument == ARGUMENT_OPTIONAL && ends_with_json(follower))) {
            value = follower;
            reader->next++;
        }
    }
    bool needs_value = row->argument == ARGUMENT_NEEDED || row->argument == ARGUMENT_MANY;
    if (needs_value && (value == NULL || *value == '\0')) {
        return usage_error(reader, word, "wants a value: --%s %s", row->name, row->argument_name);
    }
    if (value != NULL && !check_choice(reader, row, value)) {
        return false;
    }
    if (index == OPTION_JSON && value == NULL && reader->next < reader->argc) {
        reader->after_json = reader->argv[reader->next];
    }
    options->given[index] = true;
    options->values[index] = value;
    if (index == OPTION_SET) {
        options->sets[options->set_count++] = value;
    }
    while (row->argument == ARGUMENT_MANY && value != NULL) {
        options->held[options->held_count++] = value;
        bool goes_on = reader->next < reader->argc && reader->argv[reader->next][0] != '-';
        value = goes_on ? reader->argv[reader->next++] : NULL;
    }
    return true;
}

static bool read_long(struct reader *reader, const char *word)
{
    const char *name = word + 2, *equals = strchr(name, '=');
    size_t length = equals == NULL ? strlen(name) : (size_t)(equals - name);
    int index = find_long(name, length);
    if (index >= 0) {
        return take_option(reader, index, word, equals == NULL ? NULL : equals + 1);
    }
    char plain[32] = "";
    if (length < sizeof plain) {
        memcpy(plain, name, length);
    }
    const char *near = near_option(plain);
    if (near != NULL) {
        return usage_error(reader, word, "is no option; did you mean '--%s'?", near);
    }
    return usage_error(reader, word, "is no option; `ampstead help` lists them");
}

static bool read_short(struct reader *reader, const char *word)
{
    for (int k = 0; k < OPTION_COUNT; k++) {
        if (option_rows[k].letter != 0 && option_rows[k].letter == word[1]) {
            return take_option(reader, k, word, word[2] != '\0' ? word + 2 : NULL);
        }
    }
    const char *near = near_option(word + 1);
    if (near != NULL) {
        return usage_error(reader, word, "is no option; did you mean '--%s'?", near);
    }
    return usage_error(reader, word, "is no option; `ampstead help` lists them");
}

static bool one_too_many(const struct reader *reader, const char *word)
{
    if (word == reader->after_json) {
        return usage_error(reader, word, "is one too many; for a file write --json=%s", word);
    }
    return usage_error(reader, word, "is one too many: one cell a run");
}

static bool take_word(struct reader *reader, const char *word)
{
    struct options *options = reader->options;
    int verb = reader->word_count == 0 ? -1 : find_verb(reader->words[0]);
    options->words[options->word_count++] = word;
    if (reader->word_count == 2 && verb >= 0 && verb_takes_many((enum verb)verb)) {
        return true;
    }
    if (reader->word_count == 2) {
        return one_too_many(reader, word);
    }
    reader->words[reader->word_count++] = word;
    return true;
}

/* Verb and file from the words that are no options. */
static bool settle_words(struct reader *reader)
{
    struct options *options = reader->options;
    const char *first = reader->words[0], *second = reader->words[1];
    int verb = first == NULL ? -1 : find_verb(first);
    if (verb >= 0) {
        options->verb = (enum verb)verb;
        options->file = second;
        return true;
    }
    options->verb = VERB_REVIEW;
    options->file = first;
    if (second == NULL && (first == NULL || strpbrk(first, "./-") != NULL)) {
        return true;
    }
    FILE *probe = second == NULL ? fopen(first, "rb") : NULL;
    if (probe != NULL) {
        (void)fclose(probe); /* only its being there was asked */
        return true;
    }
    if (second != NULL && strpbrk(first, "./-") != NULL) {
        return one_too_many(reader, second);
    }
    const char *near = near_verb(first);
    const char *what = second == NULL ? "is neither a verb nor a file" : "is no verb";
    if (near != NULL) {
        return usage_error(reader, first, "%s; did you mean '%s'?", what, near);
    }
    return usage_error(reader, first, "%s; `ampstead help` lists the verbs", what);
}

/* Every option must go with the verb, and a cell must be named. */
static bool check_together(const struct reader *reader)
{
    const struct options *options = reader->options;
    if (options->given[OPTION_HELP] || options->given[OPTION_VERSION]) {
        return true;
    }
    for (int k = 0; k < OPTION_COUNT; k++) {
        if (options->given[k] && (option_rows[k].verbs & 1u << options->verb) == 0) {
            fprintf(reader->errors, "ampstead: '--%s' does not go with `%s`, only with",
                    option_rows[k].name, verb_rows[options->verb].word);
            const char *between = "";
            for (int v = 0; v < VERB_COUNT; v++) {
                if ((option_rows[k].verbs & 1u << v) != 0) {
                    fprintf(reader->errors, "%s `%s`", between, verb_rows[v].word);
                    between = ",";
                }
            }
            fputs("\n", reader->errors);
            return false;
        }
    }
    if (options->verb == VERB_HELP) {
        if (options->file == NULL || find_verb(options->file) >= 0) {
            return true;
        }
        const char *near = near_verb(options->file);
        if (near != NULL) {
            return usage_error(reader, options->file, "is no verb; did you mean '%s'?", near);
        }
        return usage_error(reader, options->file, "is no verb; `ampstead help` lists them");
    }
    if (options->file == NULL && options->given[OPTION_LIST]) {
        return true;
    }
    if (options->file == NULL) {
        if (reader->word_count == 0) {
            fputs("ampstead: a cell is wanted: ampstead FILE.cell; `ampstead help` tells more\n",
                  reader->errors);
            return false;
        }
        return usage_error(reader, verb_rows[options->verb].word, "wants a file: ampstead %s %s",
                           verb_rows[options->verb].word, verb_rows[options->verb].argument);
    }
    return true;
}

/* "ampstead WORD 'WORD WITH BLANKS' ...", for a shell; NULL when memory is short. */
static char *join_command(int argc, char **argv)
{
    static const char plain[] = "ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789"
                                "_-./=%+,:@";
    size_t size = sizeof "ampstead";
    for (int k = 1; k < argc; k++) {
        size += 4 * strlen(argv[k]) + 3; /* a quote inside quotes takes four characters */
    }
    char *text = calloc(size, 1);
    if (text == NULL) {
        return NULL;
    }
    char *at = text + snprintf(text, size, "ampstead");
    for (int k = 1; k < argc; k++) {
        bool is_plain = argv[k][0] != '\0' && argv[k][strspn(argv[k], plain)] == '\0';
        *at++ = ' ';
        at += is_plain ? sprintf(at, "%s", argv[k]) : sprintf(at, "'");
        for (const char *c = argv[k]; !is_plain && *c != '\0'; c++) {
            /* a line end would leave the comment that the command is written in */
            at += *c == '\''                ? sprintf(at, "'\\''")
                  : (unsigned char)*c < ' ' ? sprintf(at, " ")
                                            : sprintf(at, "%c", *c);
        }
        at += is_plain ? 0 : sprintf(at, "'");
    }
    return text;
}

bool options_parse(int argc, char **argv, FILE *errors, struct options *options,
                   bool *out_of_memory)
{
    struct reader reader = {argc, argv, 1, errors, options, {NULL, NULL}, NULL, 0};
    *options = (struct options){0};
    *out_of_memory = false;
    options->sets = calloc((size_t)argc + 1, sizeof *options->sets);
    options->words = calloc((size_t)argc + 1, sizeof *options->words);
    options->held = calloc((size_t)argc + 1, sizeof *options->held);
    options->command = join_command(argc, argv);
    if (options->command == NULL || options->sets == NULL || options->words == NULL ||
        options->held == NULL) {
        *out_of_memory = true;
        return false;
    }
    bool only_words = false, is_right = true;
    while (is_right && reader.next < argc) {
        const char *word = argv[reader.next++];
        if (only_words || word[0] != '-' || word[1] == '\0') {
            is_right = take_word(&reader, word);
        } else if (strcmp(word, "--") == 0) {
            only_words = true;
        } else {
            is_right = word[1] == '-' ? read_long(&reader, word) : read_short(&reader, word);
        }
    }
    if (options->given[OPTION_VERSION] || (options->given[OPTION_HELP] && reader.word_count == 0)) {
        options->verb = VERB_HELP;
        return is_right;
    }
    return is_right && settle_words(&reader) && check_together(&reader);
}

void options_free(struct options *options)
{
    free(options->command);
    options->command = NULL;
    free(options->sets);
    free(options->words);
    free(options->held);
    options->sets = options->words = options->held = NULL;
}

/* source.c: files into memory, checked to be text. */
#include "language/source.h"

#include <dirent.h>
#include <errno.h>
#include <fcntl.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include "base/utf8.h"

/* Bytes being read, one more than the limit so that a file that is too long is seen. */
struct content {
    char *data;
    size_t length, capacity;
};

static const char *reason(int number)
{
    switch (number) {
    case ENOENT:
    case ENOTDIR:
        return "there is no such file";
    case EACCES:
    case EPERM:
        return "reading it is not allowed";
    case EMFILE:
    case ENFILE:
        return "too many files are open";
    case ENAMETOOLONG:
        return "the name is too long";
    case ELOOP:
        return "its links go round in a circle";
    default:
        return "the system refused";
    }
}

static bool grow(struct content *content)
{
    size_t capacity = content->capacity == 0 ? 16 * 1024 : 4 * content->capacity;
    char *data = realloc(content->data, capacity);
    if (data == NULL) {
        return false;
    }
    content->data = data;
    content->capacity = capacity;
    return true;
}

/* Reads until the end or until the limit is passed. Returns 0, an errno value, or -1 for memory. */
static int read_all(int descriptor, struct content *content)
{
    while (content->length <= LANGUAGE_FILE_LIMIT) {
        if (content->length == content->capacity && !grow(content)) {
            return -1;
        }
        ssize_t got =
            read(descriptor, content->data + content->length, content->capacity - content->length);
        if (got == 0) {
            return 0;
        }
        if (got < 0 && errno != EINTR) {
            return errno;
        }
        content->length += got > 0 ? (size_t)got : 0;
    }
    return 0;
}

/* What keeps a path from being read, NULL when it is a text file or, on the command line only, a
 * pipe: a cell from a stranger must not make the program wait on one. */
static const char *refusal(const struct stat *status, bool from_command_line)
{
    if (S_ISREG(status->st_mode) || (S_ISFIFO(status->st_mode) && from_command_line)) {
        return NULL;
    }
    return S_ISDIR(status->st_mode) ? "it is a folder" : "it is not an ordinary file";
}

/* Opens and reads a path. NULL when done, else why not; *memory when the machine failed. */
static const char *read_path(const char *path, bool from_command_line, struct content *content,
                             bool *memory)
{
    struct stat status;
    if (stat(path, &status) != 0) {
        return reason(errno);
    }
    const char *why = refusal(&status, from_command_line);
    if (why != NULL) {
        return why;
    }
    int descriptor = open(path, O_RDONLY | O_CLOEXEC | O_NOCTTY);
    if (descriptor < 0) {
        return reason(errno);
    }
    int failed = read_all(descriptor, content);
    (void)close(descriptor);
    *memory = failed < 0;
    return failed > 0 ? reason(failed) : NULL;
}

enum status source_read(struct arena *arena, struct source_set *sources, const char *path,
                        const char *shown, struct span where, struct diagnostics *diagnostics,
                        uint32_t *index)
{
    struct content content = {NULL, 0, 0};
    bool memory = false;
    const char *why = NULL;
    const char *name = shown != NULL ? shown : path;
    if (strcmp(path, "-") == 0) {
        int failed = read_all(STDIN_FILENO, &content);
        memory = failed < 0;
        why = failed > 0 ? reason(failed) : NULL;
    } else {
        why = read_path(path, where.file == SPAN_NO_FILE, &content, &memory);
    }
    enum status status = STATUS_MEMORY;
    if (why != NULL) {
        diagnostics_add(diagnostics, where, NULL, "cannot read '%s': %s", name, why);
        status = diagnostics->out_of_memory ? STATUS_MEMORY : STATUS_INPUT;
    } else if (!memory) {
        status =
            source_add_text(arena, sources, name, content.data, content.length, diagnostics, index);
    }
    free(content.data);
    return status;
}

/* Adds an error for the first byte that is not text. */
static bool check_text(const struct source_file *file, uint32_t index,
                       struct diagnostics *diagnostics)
{
    for (uint32_t at = 0; at < file->length;) {
        uint32_t character = 0;
        size_t bytes = utf8_decode(file->text + at, file->length - at, &character);
        struct span where = {index, at, at + 1};
        if (bytes == 0) {
            diagnostics_add(diagnostics, where, "save the file as UTF-8",
                            "the byte 0x%02X is not UTF-8 text",
                            (unsigned)(unsigned char)file->text[at]);
            return false;
        }
        if (character == 0) {
            diagnostics_add(diagnostics, where, NULL, "a NUL byte cannot stand in a text");
            return false;
        }
        at += (uint32_t)bytes;
    }
    return true;
}

enum status source_add_text(struct arena *arena, struct source_set *sources, const char *name,
                            const char *text, size_t length, struct diagnostics *diagnostics,
                            uint32_t *index)
{
    if (length > LANGUAGE_FILE_LIMIT) {
        diagnostics_add(diagnostics, SPAN_NONE, NULL, "'%s' is longer than the limit of %d bytes",
                        name, LANGUAGE_FILE_LIMIT);
        return diagnostics->out_of_memory ? STATUS_MEMORY : STATUS_INPUT;
    }
    if (length >= 3 && memcmp(text, "\xEF\xBB\xBF", 3) == 0) {
        text += 3;
        length -= 3;
    }
    size_t total = length;
    for (int k = 0; k < sources->count; k++) {
        total += sources->files[k].length;
    }
    if (total > LANGUAGE_TOTAL_LIMIT) {
        diagnostics_add(diagnostics, SPAN_NONE, NULL,
                        "with '%s' the files of the cell are longer than the limit of %d bytes",
                        name, LANGUAGE_TOTAL_LIMIT);
        return diagnostics->out_of_memory ? STATUS_MEMORY : STATUS_INPUT;
    }
    struct source_file *files =
        arena_grow(arena, sources->files, sources->count, &sources->capacity, sizeof *files);
    if (files == NULL) {
        return STATUS_MEMORY;
    }
    sources->files = files;
    struct source_file file = {arena_copy(arena, name, strlen(name)),
                               arena_copy(arena, text, length), (uint32_t)length};
    if (file.name == NULL || file.text == NULL) {
        return STATUS_MEMORY;
    }
    *index = (uint32_t)sources->count;
    files[sources->count++] = file;
    if (!check_text(&file, *index, diagnostics)) {
        return diagnostics->out_of_memory ? STATUS_MEMORY : STATUS_INPUT;
    }
    return STATUS_OK;
}

/* The name without its ending when it has that one. */
static const char *copy_stem(struct arena *arena, const char *name, const char *ending)
{
    const char *tail = strrchr(name, '.');
    const bool has_ending = tail != NULL && strcmp(tail, ending) == 0;
    return arena_copy(arena, name, has_ending ? (size_t)(tail - name) : strlen(name));
}

const char *source_near(struct arena *arena, const char *folder, const char *name,
                        const char *ending)
{
    enum { SEEN_LIMIT = 1000 }; /* files of one folder */
    const char *stems[SEEN_LIMIT];
    int count = 0;
    DIR *list = opendir(*folder == '\0' ? "." : folder);
    if (list == NULL) {
        return NULL;
    }
    for (const struct dirent *entry = readdir(list); entry != NULL && count < SEEN_LIMIT;
         entry = readdir(list)) {
        const char *tail = strrchr(entry->d_name, '.');
        if (tail != NULL && strcmp(tail, ending) == 0) {
            stems[count] = copy_stem(arena, entry->d_name, ending);
            count += stems[count] != NULL ? 1 : 0;
        }
    }
    (void)closedir(list);
    const char *wanted = copy_stem(arena, name, ending);
    const char *near = wanted == NULL ? NULL : near_name(wanted, stems, count);
    return near == NULL ? NULL : arena_format(arena, "%s%s", near, ending);
}

bool source_exists(const char *path)
{
    struct stat status;
    return stat(path, &status) == 0 && refusal(&status, false) == NULL && access(path, R_OK) == 0;
}

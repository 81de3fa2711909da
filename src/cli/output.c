/* output.c: texts to files and to standard output. */
#include "cli/output.h"

#include <errno.h>
#include <fcntl.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

static bool complain(const char *path, int error)
{
    fprintf(stderr, "ampstead: %s: cannot be written: %s\n", path, strerror(error));
    return false;
}

/* 0, or the errno of the failure. */
static int write_all(int file, const char *bytes, size_t left)
{
    while (left > 0) {
        ssize_t written = write(file, bytes, left);
        if (written < 0 && errno != EINTR) {
            return errno;
        }
        if (written > 0) {
            bytes += written;
            left -= (size_t)written;
        }
    }
    return 0;
}

static bool write_directly(const char *path, const char *bytes, size_t length)
{
    int file = open(path, O_WRONLY | O_NOCTTY);
    if (file < 0) {
        return complain(path, errno);
    }
    int error = write_all(file, bytes, length);
    if (close(file) != 0 && error == 0) {
        error = errno;
    }
    return error == 0 || complain(path, error);
}

/* Permissions a new file gets: those of the file it replaces, else what the umask leaves. */
static mode_t wanted_mode(const struct stat *old)
{
    if (old != NULL) {
        return old->st_mode & 0777;
    }
    mode_t mask = umask(0);
    umask(mask);
    return 0666 & ~mask;
}

/* "FOLDER/.ampstead-XXXXXX" for a path; NULL when memory is short. */
static char *temporary_name(const char *path)
{
    static const char pattern[] = ".ampstead-XXXXXX";
    const char *slash = strrchr(path, '/');
    size_t folder = slash == NULL ? 0 : (size_t)(slash - path) + 1;
    char *name = malloc(folder + sizeof pattern);
    if (name != NULL) {
        memcpy(name, path, folder);
        memcpy(name + folder, pattern, sizeof pattern);
    }
    return name;
}

/* Writes, synchronises and renames; 0, or the errno of the failure. Nothing is left behind. */
static int write_renamed(const char *path, const char *bytes, size_t length, mode_t mode)
{
    char *name = temporary_name(path);
    if (name == NULL) {
        return ENOMEM;
    }
    int file = mkstemp(name);
    if (file < 0) {
        int error = errno;
        free(name);
        return error;
    }
    int error = write_all(file, bytes, length);
    if (error == 0 && (fchmod(file, mode) != 0 || fsync(file) != 0)) {
        error = errno;
    }
    if (close(file) != 0 && error == 0) {
        error = errno;
    }
    if (error == 0 && rename(name, path) != 0) {
        error = errno;
    }
    if (error != 0) {
        (void)unlink(name);
    }
    free(name);
    return error;
}

bool output_file(const char *path, const char *bytes, size_t length)
{
    struct stat old;
    bool exists = stat(path, &old) == 0;
    if (exists && !S_ISREG(old.st_mode)) {
        return write_directly(path, bytes, length);
    }
    /* a link stays a link: the file behind it is replaced */
    char *target = exists ? realpath(path, NULL) : NULL;
    if (exists && target == NULL) {
        return complain(path, errno);
    }
    int error = write_renamed(target != NULL ? target : path, bytes, length,
                              wanted_mode(exists ? &old : NULL));
    free(target);
    return error == 0 || complain(path, error);
}

bool output_same(const char *path, const char *text)
{
    FILE *file = fopen(path, "rb");
    bool is_same = file != NULL;
    for (; is_same && *text != '\0'; text++) {
        is_same = fgetc(file) == (unsigned char)*text;
    }
    is_same = is_same && fgetc(file) == EOF && !ferror(file);
    if (file != NULL) {
        (void)fclose(file);
    }
    return is_same;
}

void output_text(const char *text)
{
    (void)fputs(text, stdout);
}

bool output_close(void)
{
    int error = 0;
    if (fflush(stdout) != 0 || ferror(stdout)) {
        error = errno != 0 ? errno : EIO;
    }
    if (fclose(stdout) != 0 && error == 0) {
        error = errno;
    }
    if (error == EPIPE) {
        fputs("ampstead: standard output was closed before everything was written\n", stderr);
        return false;
    }
    return error == 0 || complain("standard output", error);
}

bool output_is_stdout(const char *path)
{
    return path == NULL || *path == '\0' || strcmp(path, "-") == 0;
}

bool output_deliver(const char *path, const char *text)
{
    if (text == NULL) {
        fputs("ampstead: memory is short\n", stderr);
        return false;
    }
    if (output_is_stdout(path)) {
        output_text(text);
        return true;
    }
    return output_file(path, text, strlen(text));
}

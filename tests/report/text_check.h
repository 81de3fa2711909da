/* text_check.h: looking into a report's text. */
#ifndef TESTS_REPORT_TEXT_CHECK_H
#define TESTS_REPORT_TEXT_CHECK_H

#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <cmocka.h>

/* Characters of the widest line. */
static inline int widest_line(const char *text)
{
    int widest = 0, width = 0;
    for (; *text != '\0'; text++) {
        if (*text == '\n') {
            width = 0;
        } else if (((unsigned char)*text & 0xC0u) != 0x80u) {
            width++;
        }
        widest = width > widest ? width : widest;
    }
    return widest;
}

/* Each text must stand somewhere after the one before it. Ends with NULL. */
static inline void assert_in_order(const char *text, const char *const *wanted)
{
    const char *at = text;
    for (; *wanted != NULL; wanted++) {
        const char *found = strstr(at, *wanted);
        if (found == NULL) {
            print_error("missing after the one before: \"%s\" in\n%s\n", *wanted, text);
            fail();
        }
        at = found + strlen(*wanted);
    }
}

/* The same words in the same order; spaces and line ends do not count. */
static inline void assert_same_tokens(const char *text, const char *golden)
{
    static const char blanks[] = " \n\r\t";
    for (;;) {
        text += strspn(text, blanks);
        golden += strspn(golden, blanks);
        size_t length = strcspn(text, blanks), wanted = strcspn(golden, blanks);
        if (length != wanted || memcmp(text, golden, length) != 0) {
            print_error("\"%.*s\" where \"%.*s\" is wanted\n", (int)length, text, (int)wanted,
                        golden);
            fail();
        }
        if (length == 0) {
            return;
        }
        text += length;
        golden += length;
    }
}

/* A whole file; freed by the caller. */
static inline char *read_whole(const char *path)
{
    FILE *file = fopen(path, "rb");
    assert_non_null(file);
    assert_int_equal(fseek(file, 0, SEEK_END), 0);
    long size = ftell(file);
    assert_true(size >= 0);
    rewind(file);
    char *text = malloc((size_t)size + 1);
    assert_non_null(text);
    assert_int_equal(fread(text, 1, (size_t)size, file), (size_t)size);
    text[size] = '\0';
    (void)fclose(file);
    return text;
}

#endif

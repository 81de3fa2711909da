/* picture.h: an SVG text as PDF or PNG. */
#ifndef CLI_PICTURE_H
#define CLI_PICTURE_H

#include <stdbool.h>
#include <stddef.h>

enum picture_form { PICTURE_SVG, PICTURE_PDF, PICTURE_PNG, PICTURE_UNKNOWN };

/* By the ending of a path; letter case does not matter. */
enum picture_form picture_form(const char *path);

/* Why a path cannot be drawn to, after "ampstead: 'PATH' "; NULL: it can. */
const char *picture_refused(const char *path);

struct picture {
    char *data; /* owned: picture_free */
    size_t length, capacity;
};

/* What the module exports under the name picture_convert. */
typedef const char *picture_converter(const char *svg, enum picture_form form,
                                      struct picture *picture);
picture_converter picture_convert;

/* Converts; NULL when it went well, else what went wrong. Free the picture in both cases. */
const char *picture_make(const char *svg, enum picture_form form, struct picture *picture);
void picture_free(struct picture *picture);

/* Writes an SVG text to a path in the form that its ending asks for; says what went wrong. NULL is
 * a text that memory was short for. */
bool picture_deliver(const char *path, const char *svg);

#endif

/* picture.c: forms of pictures, and the module that converts them, loaded when it is needed. */
#include "cli/picture.h"

#include <dlfcn.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <strings.h>

#include "cli/output.h"

enum picture_form picture_form(const char *path)
{
    static const char *const endings[] = {".svg", ".pdf", ".png"};
    size_t length = strlen(path);
    for (int k = 0; k < 3; k++) {
        if (length > 4 && strcasecmp(path + length - 4, endings[k]) == 0) {
            return (enum picture_form)k;
        }
    }
    return PICTURE_UNKNOWN;
}

const char *picture_refused(const char *path)
{
    enum picture_form form = picture_form(path);
    if (form == PICTURE_UNKNOWN) {
        return "must end with .svg, .pdf or .png, which says how to draw";
    }
#ifndef AMPSTEAD_PICTURE_MODULE
    if (form != PICTURE_SVG) {
        return "cannot be drawn: this build has no librsvg, so only .svg";
    }
#endif
    return NULL;
}

void picture_free(struct picture *picture)
{
    free(picture->data);
    *picture = (struct picture){NULL, 0, 0};
}

bool picture_deliver(const char *path, const char *svg)
{
    if (svg == NULL || picture_form(path) == PICTURE_SVG) {
        return output_deliver(path, svg);
    }
    struct picture picture = {NULL, 0, 0};
    const char *trouble = picture_make(svg, picture_form(path), &picture);
    bool is_written = false;
    if (trouble != NULL) {
        fprintf(stderr, "ampstead: %s: %s\n", path, trouble);
    } else {
        is_written = output_file(path, picture.data, picture.length);
    }
    picture_free(&picture);
    return is_written;
}

#ifdef AMPSTEAD_PICTURE_MODULE

const char *picture_make(const char *svg, enum picture_form form, struct picture *picture)
{
    /* found by the run path of the program; kept until the end, as its libraries want it */
    void *module = dlopen(AMPSTEAD_PICTURE_MODULE, RTLD_NOW | RTLD_NODELETE);
    void *symbol = module == NULL ? NULL : dlsym(module, "picture_convert");
    picture_converter *convert = NULL;
    if (symbol == NULL) {
        return "the converter for .pdf and .png cannot be loaded; .svg needs none";
    }
    memcpy(&convert, &symbol, sizeof convert); /* POSIX: a symbol may be a function */
    return convert(svg, form, picture);
}

#else

const char *picture_make(const char *svg, enum picture_form form, struct picture *picture)
{
    (void)svg;
    (void)form;
    (void)picture;
    return "this build has no librsvg";
}

#endif

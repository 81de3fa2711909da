/* place.c: where the library lies, so that a moved or packaged installation finds its models. */
#define _GNU_SOURCE /* dladdr, which POSIX has since 2024 */
#include "library/place.h"

#include <dlfcn.h>
#include <stdlib.h>
#include <string.h>

char *place_models(void)
{
    static const char installed[] = AMPSTEAD_MODEL_FOLDER, way[] = AMPSTEAD_MODELS_FROM_LIBRARY;
    /* an object of this library; the address of a function would need a cast that C does not have
     */
    static const char inside = 0;
    Dl_info info;
    const char *slash = NULL;
    if (dladdr(&inside, &info) != 0 && info.dli_fname != NULL) {
        slash = strrchr(info.dli_fname, '/');
    }
    size_t length = slash == NULL ? 0 : (size_t)(slash - info.dli_fname) + 1;
    const char *rest = slash == NULL ? installed : way;
    char *path = malloc(length + strlen(rest) + 1);
    if (path != NULL) {
        memcpy(path, slash == NULL ? "" : info.dli_fname, length);
        memcpy(path + length, rest, strlen(rest) + 1);
    }
    return path;
}

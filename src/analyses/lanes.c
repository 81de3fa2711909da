/*
 * lanes.c: which widths there are.
 */
#include "analyses/lanes.h"

#ifdef WITH_LANES

extern const struct lanes_kind lanes_kind_8, lanes_kind_4;
static const struct lanes_kind *const kinds[] = {&lanes_kind_8, &lanes_kind_4};

const struct lanes_kind *lanes_find(int width)
{
    for (size_t k = 0; k < sizeof kinds / sizeof kinds[0]; k++) {
        if ((width == 0 || kinds[k]->width <= width) && kinds[k]->is_supported()) {
            return kinds[k];
        }
    }
    return NULL;
}

#else

const struct lanes_kind *lanes_find(int width)
{
    (void)width;
    return NULL;
}

#endif

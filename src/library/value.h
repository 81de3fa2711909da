/* value.h: one quantity of a result by its name. Private to library/. */
#ifndef LIBRARY_VALUE_H
#define LIBRARY_VALUE_H

#include "analyses/result.h"

/* NAN when there is no such name or the value does not apply. */
double value_of(const struct result *result, const char *name);

#endif

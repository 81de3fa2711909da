/*
 * expression_unit.h: the unit words by which wrong ones are corrected. Private to the layer.
 */
#ifndef LANGUAGE_EXPRESSION_UNIT_H
#define LANGUAGE_EXPRESSION_UNIT_H

#include <stddef.h>

/* The unit that a wrong word most likely meant, or NULL. */
const char *unit_near(const char *word);

/* 27 degrees Celsius is 300.15 K: the nearest double for up to two decimals. */
double unit_celsius(double celsius);

#endif

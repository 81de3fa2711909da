/*
 * generator.h: valid bias cells by the thousand, each made by its number.
 */
#ifndef GENERATOR_GENERATOR_H
#define GENERATOR_GENERATOR_H

#include <stdbool.h>
#include <stdint.h>

enum { GENERATOR_TEXT_LIMIT = 32768 };

struct generated {
    char text[GENERATOR_TEXT_LIMIT];
    bool is_hand; /* to be solved in the hand view */
    int device_count;
    const char *technology; /* family */
};

/* Cell `number` of the series `seed`; the same on every machine with IEEE arithmetic. */
void generator_make(uint64_t seed, uint64_t number, struct generated *cell);

#endif

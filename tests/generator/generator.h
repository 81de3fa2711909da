/*
 * generator.h: valid bias cells by the thousand, each made by its number.
 */
#ifndef GENERATOR_GENERATOR_H
#define GENERATOR_GENERATOR_H

#include <stdbool.h>
#include <stdint.h>

enum { GENERATOR_TEXT_LIMIT = 32768, GENERATOR_LOOP_LIMIT = 8 };

/* A reference that biases itself: its own resistor tells whether it runs. */
struct self_biased {
    int resistor;   /* R<number> of the text */
    double current; /* A, what it was sized for */
};

struct generated {
    char text[GENERATOR_TEXT_LIMIT];
    bool is_hand; /* to be solved in the hand view */
    int device_count;
    const char *technology; /* family */
    struct self_biased loops[GENERATOR_LOOP_LIMIT];
    int loop_count;
};

/* Cell `number` of the series `seed`; the same on every machine with IEEE arithmetic. */
void generator_make(uint64_t seed, uint64_t number, struct generated *cell);

#endif

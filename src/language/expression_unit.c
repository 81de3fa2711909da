/* expression_unit.c: unit words that are commonly written, for near names. */
#include "language/expression_unit.h"

#include <stdbool.h>
#include <string.h>

#include "base/diagnostic.h"

const char *unit_near(const char *word)
{
    static const char *const common[] = {"V",  "mV", "uV", "kV",  "A",    "mA",   "uA",   "nA",
                                         "pA", "fA", "W",  "mW",  "uW",   "kW",   "nW",   "S",
                                         "mS", "uS", "nS", "ohm", "kohm", "Mohm", "Gohm", "K",
                                         "mK", "C",  "um", "nm",  "mm",   "ppm"};
    const char *near = near_name(word, common, (int)(sizeof common / sizeof common[0]));
    if (near == NULL || strlen(word) >= 3) {
        return near;
    }
    /* Any two letters are near some unit: only a difference of case counts. 0x20 is the bit that
     * tells the cases of an ASCII letter apart. */
    bool by_case = strlen(near) == strlen(word);
    for (size_t i = 0; by_case && word[i] != '\0'; i++) {
        by_case = (word[i] | 0x20) == (near[i] | 0x20);
    }
    return by_case ? near : NULL;
}

double unit_celsius(double celsius)
{
    return (27315.0 + 100.0 * celsius) / 100.0;
}

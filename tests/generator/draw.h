/*
 * draw.h: random numbers that depend on a seed, a cell and a count only, so that any cell can be
 * made again by its number alone (counter-based: Salmon, Moraes, Dror and Shaw 2011; the mixing
 * function is that of Steele, Lea and Flood 2014, section 3).
 */
#ifndef GENERATOR_DRAW_H
#define GENERATOR_DRAW_H

#include <math.h>
#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

struct draw {
    uint64_t key, count;
};

static inline uint64_t draw_mix(uint64_t z)
{
    z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9u;
    z = (z ^ (z >> 27)) * 0x94d049bb133111ebu;
    return z ^ (z >> 31);
}

static inline struct draw draw_begin(uint64_t seed, uint64_t cell)
{
    return (struct draw){draw_mix(seed + 0x9e3779b97f4a7c15u * (cell + 1)), 0};
}

/* In [0, 1). */
static inline double draw_share(struct draw *d)
{
    return (double)(draw_mix(d->key + 0x9e3779b97f4a7c15u * ++d->count) >> 11) * 0x1p-53;
}

static inline double draw_between(struct draw *d, double low, double high)
{
    return low + (high - low) * draw_share(d);
}

/* Evenly over the decades. */
static inline double draw_decades(struct draw *d, double low, double high)
{
    return low * pow(high / low, draw_share(d));
}

/* 0 .. count - 1 */
static inline int draw_index(struct draw *d, int count)
{
    return (int)(draw_share(d) * count);
}

static inline bool draw_chance(struct draw *d, double share)
{
    return draw_share(d) < share;
}

#endif

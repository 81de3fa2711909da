/*
 * random_lanes.h: the deviates of random.h for several samples at once; only with LANES.
 *
 * The same counters, the same approximations: a deviate is that of random_normals but for a few
 * units in the last place.
 */
#ifndef NUMERICS_RANDOM_LANES_H
#define NUMERICS_RANDOM_LANES_H

#include "base/lanes.h"
#include "numerics/random.h"

/* The products of the low halves of 64-bit lanes. */
static inline lanes_bits random_product(lanes_bits a, uint32_t b)
{
    const lanes_bits factor = (lanes_bits){0} + (uint64_t)b;
#if LANES == 8
    return (lanes_bits)_mm512_mul_epu32((__m512i)a, (__m512i)factor);
#else
    return (lanes_bits)_mm256_mul_epu32((__m256i)a, (__m256i)factor);
#endif
}

/* Philox4x32-10 of random.h; each word in the low half of a lane. */
static inline void random_philox_lanes(lanes_bits c[4], uint64_t seed)
{
    uint32_t k0 = (uint32_t)seed, k1 = (uint32_t)(seed >> 32);
    for (int round = 0; round < 10; round++) {
        const lanes_bits a = random_product(c[0], 0xD2511F53u);
        const lanes_bits b = random_product(c[2], 0xCD9E8D57u);
        const lanes_bits low = (lanes_bits){0} + 0xffffffffu;
        c[0] = (b >> 32) ^ c[1] ^ ((lanes_bits){0} + k0);
        c[2] = (a >> 32) ^ c[3] ^ ((lanes_bits){0} + k1);
        c[1] = b & low;
        c[3] = a & low;
        k0 += 0x9E3779B9u;
        k1 += 0xBB67AE85u;
    }
}

/* 53 bits to the middle of one of 2^53 equal parts of (0, 1). */
static inline lanes random_uniform_lanes(lanes_bits high, lanes_bits low)
{
    const lanes_bits bits = (high << 32 | low) >> 11;
    /* to double by halves: each stands in a mantissa of its own, their sum is exact */
    const lanes upper = (lanes)((bits >> 32) | 0x4530000000000000u) - 0x1p84;
    const lanes lower = (lanes)((bits & 0xffffffffu) | 0x4330000000000000u) - 0x1p52;
    return (upper + lower + 0.5) * 0x1p-53;
}

static inline lanes random_ratio_lanes(const double over[8], const double under[8], lanes r)
{
    lanes a = lanes_of(over[7]), b = lanes_of(under[7]);
    for (int k = 6; k >= 0; k--) {
        a = a * r + over[k];
        b = b * r + under[k];
    }
    return a / b;
}

static inline lanes random_quantile_lanes(lanes p)
{
    const struct normal_coefficients *c = &normal_coefficients;
    const lanes q = p - 0.5;
    const lanes middle = q * random_ratio_lanes(c->middle_over, c->middle_under, 0.180625 - q * q);
    const lanes_truth is_tail = lanes_abs(q) > lanes_of(0.425);
    if (lanes_mask(is_tail) == 0) {
        return middle;
    }
    const lanes r = lanes_sqrt(-lanes_log(lanes_choose(q < lanes_of(0), p, 1 - p)));
    lanes tail = random_ratio_lanes(c->tail_over, c->tail_under, r - 1.6);
    const lanes_truth is_far = r > lanes_of(5);
    if (lanes_mask(is_far) != 0) {
        tail = lanes_choose(is_far, random_ratio_lanes(c->far_over, c->far_under, r - 5), tail);
    }
    return lanes_choose(is_tail, lanes_choose(q < lanes_of(0), -tail, tail), middle);
}

/* random_normals for streams `first` to first + LANES - 1, one a lane. */
static inline void random_normals_lanes(uint64_t seed, uint64_t first, int count, lanes *deviates)
{
    lanes_bits stream;
    for (int l = 0; l < LANES; l++) {
        stream[l] = first + (uint64_t)l;
    }
    for (int k = 0; k < count; k += 2) {
        lanes_bits word[4] = {
            (lanes_bits){0} + (uint64_t)(k / 2), {0}, stream & 0xffffffffu, stream >> 32};
        random_philox_lanes(word, seed);
        deviates[k] = random_quantile_lanes(random_uniform_lanes(word[0], word[1]));
        if (k + 1 < count) {
            deviates[k + 1] = random_quantile_lanes(random_uniform_lanes(word[2], word[3]));
        }
    }
}

#endif

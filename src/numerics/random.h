/*
 * random.h: counter-based random numbers: each is a function of (seed, stream, index) alone, so
 * that any order, any number of threads and any split of a run give the same numbers.
 */
#ifndef NUMERICS_RANDOM_H
#define NUMERICS_RANDOM_H

#include <stdint.h>

/*
 * random_philox: four 32-bit words from a counter and a key. Philox4x32-10 of Salmon, Moraes, Dror
 * and Shaw, "Parallel random numbers: as easy as 1, 2, 3" (2011), section 3.
 */
void random_philox(const uint32_t counter[4], const uint32_t key[2], uint32_t out[4]);

/*
 * random_normals: the first `count` standard normal deviates of stream `stream` (a sample).
 *
 * deviates  [count] out; deviate k depends on (seed, stream, k) only
 */
void random_normals(uint64_t seed, uint64_t stream, int count, double *deviates);

/*
 * normal_quantile: z with P(Z < z) = p for 0 < p < 1; -INFINITY and INFINITY at 0 and 1, NAN
 * outside. Relative error below 1e-15. Algorithm AS 241, PPND16, of Wichura (1988).
 */
double normal_quantile(double p);

/* Its coefficients, rising powers: near the middle, in the tails, and far out. */
struct normal_coefficients {
    double middle_over[8], middle_under[8];
    double tail_over[8], tail_under[8];
    double far_over[8], far_under[8];
};
extern const struct normal_coefficients normal_coefficients;

#endif

/*
 * random.c: counter-based random numbers and the normal quantile.
 */
#include "numerics/random.h"

#include <math.h>

enum { ROUNDS = 10 };

/* Multipliers and key increments of Philox4x32: Salmon et al. (2011), table 2 and section 3. */
static const uint32_t multiplier[2] = {0xD2511F53u, 0xCD9E8D57u};
static const uint32_t increment[2] = {0x9E3779B9u, 0xBB67AE85u};

void random_philox(const uint32_t counter[4], const uint32_t key[2], uint32_t out[4])
{
    uint32_t c[4] = {counter[0], counter[1], counter[2], counter[3]};
    uint32_t k[2] = {key[0], key[1]};
    for (int round = 0; round < ROUNDS; round++) {
        const uint64_t a = (uint64_t)multiplier[0] * c[0];
        const uint64_t b = (uint64_t)multiplier[1] * c[2];
        const uint32_t mixed[4] = {(uint32_t)(b >> 32) ^ c[1] ^ k[0], (uint32_t)b,
                                   (uint32_t)(a >> 32) ^ c[3] ^ k[1], (uint32_t)a};
        for (int w = 0; w < 4; w++) {
            c[w] = mixed[w];
        }
        k[0] += increment[0];
        k[1] += increment[1];
    }
    for (int w = 0; w < 4; w++) {
        out[w] = c[w];
    }
}

/* 53 bits to the middle of one of 2^53 equal parts of (0, 1): never 0, never 1. */
static double open_uniform(uint32_t high, uint32_t low)
{
    const uint64_t bits = ((uint64_t)high << 32 | low) >> 11;
    return ((double)bits + 0.5) * 0x1p-53;
}

void random_normals(uint64_t seed, uint64_t stream, int count, double *deviates)
{
    const uint32_t key[2] = {(uint32_t)seed, (uint32_t)(seed >> 32)};
    for (int k = 0; k < count; k += 2) {
        const uint32_t counter[4] = {(uint32_t)(k / 2), 0, (uint32_t)stream,
                                     (uint32_t)(stream >> 32)};
        uint32_t word[4];
        random_philox(counter, key, word);
        deviates[k] = normal_quantile(open_uniform(word[0], word[1]));
        if (k + 1 < count) {
            deviates[k + 1] = normal_quantile(open_uniform(word[2], word[3]));
        }
    }
}

/* Rational approximations of AS 241 (Wichura, Applied Statistics 37 (1988) 477-484): numerator and
 * denominator, rising powers; near the middle, in the tails, and far out. */
const struct normal_coefficients normal_coefficients = {
    .middle_over = {3.3871328727963666080e0, 1.3314166789178437745e+2, 1.9715909503065514427e+3,
                    1.3731693765509461125e+4, 4.5921953931549871457e+4, 6.7265770927008700853e+4,
                    3.3430575583588128105e+4, 2.5090809287301226727e+3},
    .middle_under = {1.0, 4.2313330701600911252e+1, 6.8718700749205790830e+2,
                     5.3941960214247511077e+3, 2.1213794301586595867e+4, 3.9307895800092710610e+4,
                     2.8729085735721942674e+4, 5.2264952788528545610e+3},
    .tail_over = {1.42343711074968357734e0, 4.63033784615654529590e0, 5.76949722146069140550e0,
                  3.64784832476320460504e0, 1.27045825245236838258e0, 2.41780725177450611770e-1,
                  2.27238449892691845833e-2, 7.74545014278341407640e-4},
    .tail_under = {1.0, 2.05319162663775882187e0, 1.67638483018380384940e0,
                   6.89767334985100004550e-1, 1.48103976427480074590e-1, 1.51986665636164571966e-2,
                   5.47593808499534494600e-4, 1.05075007164441684324e-9},
    .far_over = {6.65790464350110377720e0, 5.46378491116411436990e0, 1.78482653991729133580e0,
                 2.96560571828504891230e-1, 2.65321895265761230930e-2, 1.24266094738807843860e-3,
                 2.71155556874348757815e-5, 2.01033439929228813265e-7},
    .far_under = {1.0, 5.99832206555887937690e-1, 1.36929880922735805310e-1,
                  1.48753612908506148525e-2, 7.86869131145613259100e-4, 1.84631831751005468180e-5,
                  1.42151175831644588870e-7, 2.04426310338993978564e-15},
};

static double ratio(const double over[8], const double under[8], double r)
{
    double a = 0, b = 0;
    for (int k = 7; k >= 0; k--) {
        a = a * r + over[k];
        b = b * r + under[k];
    }
    return a / b;
}

double normal_quantile(double p)
{
    if (!(p > 0 && p < 1)) {
        return p == 0 ? -INFINITY : p == 1 ? INFINITY : NAN;
    }
    const struct normal_coefficients *c = &normal_coefficients;
    const double q = p - 0.5;
    if (fabs(q) <= 0.425) {
        return q * ratio(c->middle_over, c->middle_under, 0.180625 - q * q);
    }
    const double r = sqrt(-log(q < 0 ? p : 1 - p));
    const double z = r <= 5 ? ratio(c->tail_over, c->tail_under, r - 1.6)
                            : ratio(c->far_over, c->far_under, r - 5);
    return q < 0 ? -z : z;
}

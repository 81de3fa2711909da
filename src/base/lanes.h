/*
 * lanes.h: a vector of doubles, one lane a sample, and the functions that the equations need of it.
 *
 * For files that the build compiles once a width, with LANES 4 (AVX2 and FMA) or 8 (AVX-512);
 * everything here is inlined into them. A lane never feels its neighbours: whatever is done because
 * SOME lane asks for it must leave the others untouched to the last bit.
 *
 * exp and log are polynomials after an exact reduction of the argument (Muller, Elementary
 * Functions, 2016, chapter 11); tests/base/lanes_test.c holds them to 3 units in the last place.
 */
#ifndef BASE_LANES_H
#define BASE_LANES_H

#include <immintrin.h>
#include <math.h>
#include <stdbool.h>
#include <stdint.h>

#if LANES == 8
typedef double lanes __attribute__((vector_size(64)));
typedef uint64_t lanes_bits __attribute__((vector_size(64)));
typedef int64_t lanes_truth
    __attribute__((vector_size(64))); /* of a comparison: all bits, or none */
#else
typedef double lanes __attribute__((vector_size(32)));
typedef uint64_t lanes_bits __attribute__((vector_size(32)));
typedef int64_t lanes_truth __attribute__((vector_size(32)));
#endif

static inline lanes lanes_of(double value)
{
#if LANES == 8
    return (lanes){value, value, value, value, value, value, value, value};
#else
    return (lanes){value, value, value, value};
#endif
}

static inline lanes lanes_choose(lanes_truth where, lanes yes, lanes no)
{
    return (lanes)(((lanes_truth)yes & where) | ((lanes_truth)no & ~where));
}

/* Bit l is set where lane l holds. */
static inline unsigned lanes_mask(lanes_truth where)
{
#if LANES == 8
    return _mm512_movepi64_mask((__m512i)where);
#else
    return (unsigned)_mm256_movemask_pd((__m256d)where);
#endif
}

static inline lanes lanes_abs(lanes u)
{
    return (lanes)((lanes_bits)u & ((lanes_bits){0} + 0x7fffffffffffffffu));
}

static inline lanes lanes_sqrt(lanes u)
{
#if LANES == 8
    return _mm512_sqrt_pd(u);
#else
    return _mm256_sqrt_pd(u);
#endif
}

static inline lanes lanes_max(lanes u, lanes w)
{
    return lanes_choose(u > w, u, w);
}

/* --- exp ----------------------------------------------------------------------------------------
 */

/* Adding this to a number below 2^51 rounds it to a whole one, which then stands in the low bits.
 */
#define LANES_ROUNDER 0x1.8p52

/* exp(u) = scale (1 + part), scale a power of two, part exact for small u; |u| at most 708. */
static inline lanes lanes_exp_parts(lanes u, lanes *scale)
{
    const lanes shifted = u * 0x1.71547652b82fep0 + LANES_ROUNDER;
    const lanes whole = shifted - LANES_ROUNDER;
    /* ln 2 in two parts, the first of 32 bits: its product with `whole` is exact */
    const lanes r = (u - whole * 0x1.62e42feep-1) - whole * 0x1.a39ef35793c76p-33;
    *scale = (lanes)(((lanes_bits)shifted + 1023) << 52);
    /* Taylor to r^13/13!, |r| <= 0.347: cut off at 4e-18 */
    const lanes r2 = r * r, r4 = r2 * r2;
    const lanes a = r * (1.0 / 6) + 0.5;
    const lanes b = r * (1.0 / 120) + 1.0 / 24;
    const lanes c = r * (1.0 / 5040) + 1.0 / 720;
    const lanes d = r * (1.0 / 362880) + 1.0 / 40320;
    const lanes e = r * (1.0 / 39916800) + 1.0 / 3628800;
    const lanes f = r * (1.0 / 6227020800) + 1.0 / 479001600;
    const lanes low = a + r2 * b, middle = c + r2 * d, high = e + r2 * f;
    return r + r2 * (low + r4 * (middle + r4 * high));
}

static inline lanes lanes_within(lanes u)
{
    const lanes most = lanes_choose(u < lanes_of(709), u, lanes_of(709));
    return lanes_choose(most > lanes_of(-708), most, lanes_of(-708));
}

/* exp(u): 0 below -708, that of 709 above; NaN is NaN (through the comparison with itself). */
static inline lanes lanes_exp(lanes u)
{
    lanes scale;
    const lanes part = lanes_exp_parts(lanes_within(u), &scale);
    const lanes value = scale + scale * part;
    return lanes_choose(
        u > lanes_of(-708), value,
        lanes_choose(u == u, lanes_of(0), u)); /* NOLINT(misc-redundant-expression): NaN */
}

/* Both from one evaluation; returns exp(u) - 1. */
static inline lanes lanes_expm1(lanes u, lanes *exponential)
{
    lanes scale;
    const lanes part = lanes_exp_parts(lanes_within(u), &scale);
    const lanes value = scale + scale * part;
    const lanes tiny =
        lanes_choose(u == u, lanes_of(0), u); /* NOLINT(misc-redundant-expression): NaN */
    *exponential = lanes_choose(u > lanes_of(-708), value, tiny);
    return lanes_choose(u > lanes_of(-708), scale * part + (scale - 1), tiny - 1);
}

/* --- log ----------------------------------------------------------------------------------------
 */

/* ln(u + rest), rest far below an ulp of u; u positive and normal, else NaN. */
static inline lanes lanes_log_sum(lanes u, lanes rest)
{
    /* u = 2^k m, m from sqrt(1/2) to sqrt(2); k + 1024 is positive */
    const lanes_bits bits = (lanes_bits)u;
    const lanes_bits raised = (bits - 0x3fe6a09e667f3bcdu + ((uint64_t)1024 << 52)) >> 52;
    const lanes k = (lanes)(raised | 0x4330000000000000u) - (0x1p52 + 1024);
    const lanes m = (lanes)(bits - ((raised - 1024) << 52));
    const lanes shrink = (lanes)((2047 - raised) << 52); /* 2^-k */
    const lanes f = (m - 1) + rest * shrink;
    /* ln(1 + f) = f - f^2/2 + s (f^2/2 + R), s = f/(2 + f), R = 2 (s^2/3 + s^4/5 + ...) to s^22/23:
     * cut off at 2e-18 */
    const lanes s = f / (f + 2), z = s * s, z2 = z * z, z4 = z2 * z2;
    const lanes a = z * (2.0 / 5) + 2.0 / 3;
    const lanes b = z * (2.0 / 9) + 2.0 / 7;
    const lanes c = z * (2.0 / 13) + 2.0 / 11;
    const lanes d = z * (2.0 / 17) + 2.0 / 15;
    const lanes e = z * (2.0 / 21) + 2.0 / 19;
    const lanes high = (c + z2 * d) + z4 * (e + z2 * (2.0 / 23));
    const lanes R = z * ((a + z2 * b) + z4 * high);
    const lanes half = f * f * 0.5;
    const lanes low = s * (half + R) + k * 0x1.a39ef35793c76p-33;
    const lanes value = k * 0x1.62e42feep-1 + (f - (half - low));
    return lanes_choose((u > lanes_of(0)) & (u < lanes_of(INFINITY)), value, lanes_of(NAN));
}

static inline lanes lanes_log(lanes u)
{
    return lanes_log_sum(u, lanes_of(0));
}

/* ln(1 + u) for u > -1. */
static inline lanes lanes_log1p(lanes u)
{
    const lanes sum = u + 1;
    /* what the sum lost (Knuth, The Art of Computer Programming 2, section 4.2.2, theorem B) */
    const lanes one = sum - u;
    const lanes lost = (u - (sum - one)) + (1 - one);
    return lanes_log_sum(sum, lost);
}

/* --- tanh ---------------------------------------------------------------------------------------
 */

static inline lanes lanes_tanh(lanes u)
{
    lanes exponential;
    const lanes less = lanes_expm1(-2 * lanes_abs(u), &exponential);
    const lanes value = -less / (less + 2);
    return lanes_choose(u < lanes_of(0), -value, value);
}

/* Whether this processor has what the file was compiled for. */
static inline bool lanes_supported(void)
{
#if LANES == 8
    return __builtin_cpu_supports("avx512f") && __builtin_cpu_supports("avx512dq") &&
           __builtin_cpu_supports("fma");
#else
    return __builtin_cpu_supports("avx2") && __builtin_cpu_supports("fma");
#endif
}

#endif

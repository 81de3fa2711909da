/*
 * real.h: the number type that the device equations are compiled for.
 *
 * Files *_current.c hold equations only and are compiled again and again by the build: as they
 * stand for double; with REAL_EXTENDED for long double (the residual of the accepted answer is
 * measured in the wider type, and small differences of large currents are taken in it); with LANES
 * for a vector of samples (base/lanes.h). <tgmath.h> picks the right exp, log and sqrt. REAL_NAME
 * gives each version its own symbol.
 *
 * So that all versions come from one text: REAL(v) makes a number of a constant or a prepared
 * value, INVERSE(v) one over it, CHOOSE is ?: and SOME or EVERY is what an `if` asks of a
 * comparison, because lanes may differ. What is prepared is the same in all lanes and an `if` may
 * ask for it; a value that mismatch moves is read through MOVED.
 */
#ifndef DEVICES_REAL_H
#define DEVICES_REAL_H

#ifdef LANES
#include "base/lanes.h"
#else
#include <stdbool.h>
#include <tgmath.h>
#endif

#if defined LANES

typedef lanes real;
typedef lanes_truth truth;
#if LANES == 8
#define REAL_NAME(name) name##_lanes8
#else
#define REAL_NAME(name) name##_lanes4
#endif
#define REAL(value) lanes_of((double)(value))
#define INVERSE(value) lanes_of(1 / (value))
#define CHOOSE(where, yes, no) lanes_choose(where, yes, no)
#define SOME(where) (lanes_mask(where) != 0)
#define EVERY(where) (lanes_mask(where) == (1u << LANES) - 1)
#define sqrt(u) lanes_sqrt(u)
#define fabs(u) lanes_abs(u)
#define exp(u) lanes_exp(u)
#define log(u) lanes_log(u)
#define log1p(u) lanes_log1p(u)
#define tanh(u) lanes_tanh(u)

static inline real expm1_and_exp(real u, real *exponential)
{
    return lanes_expm1(u, exponential);
}

#else

#ifdef REAL_EXTENDED
typedef long double real;
#define REAL_NAME(name) name##_extended
#else
typedef double real;
#define REAL_NAME(name) name
#endif
typedef bool truth;
#define REAL(value) ((real)(value))
#define INVERSE(value) (1 / (real)(value))
#define CHOOSE(where, yes, no) ((where) ? (yes) : (no))
#define SOME(where) (where)
#define EVERY(where) (where)

/* exp(u) - 1 exact near 0, and exp(u). */
static inline real expm1_and_exp(real u, real *exponential)
{
    *exponential = exp(u);
    return expm1(u);
}

#endif

/* A prepared value that mismatch moves, number `row` of lanes_table.c. Its lanes stand in front of
 * the block. */
enum { MOVED_LIMIT = 2 };
#ifdef LANES
#include "devices/lanes_equations.h"
#define MOVED(p, row, member) (((const real *)(const void *)(p))[(row)-MOVED_LIMIT])
#else
#define MOVED(p, row, member) REAL((p)->member)
#endif

#endif

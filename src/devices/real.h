/*
 * real.h: the number type that the device equations are compiled for.
 *
 * Files *_current.c hold equations only and are compiled twice by the build: as they stand for
 * double, and with REAL_EXTENDED for long double (the residual of the accepted answer is measured
 * in the wider type, and small differences of large currents are taken in it). <tgmath.h> picks
 * the right exp, log and sqrt. REAL_NAME gives each version its own symbol.
 */
#ifndef DEVICES_REAL_H
#define DEVICES_REAL_H

#include <tgmath.h>

#ifdef REAL_EXTENDED
typedef long double real;
#define REAL_NAME(name) name##_extended
#else
typedef double real;
#define REAL_NAME(name) name
#endif

#endif

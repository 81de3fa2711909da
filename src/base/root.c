/*
 * root.c: bracketed root by inverse quadratic interpolation and bisection.
 */
#include "base/root.h"

#include <math.h>
#include <stdbool.h>

enum { CALL_LIMIT = 200 };

double root_bracketed(double (*function)(void *self, double x), void *self, double a, double fa,
                      double b, double fb, double tolerance)
{
    if (fa == 0 || fb == 0) {
        return fa == 0 ? a : b;
    }
    if (!((fa < 0) != (fb < 0)) || isnan(fa) || isnan(fb)) {
        return NAN;
    }
    double t = 0.5;
    for (int k = 0; k < CALL_LIMIT; k++) {
        const double x = a + t * (b - a);
        const double fx = function(self, x);
        if (isnan(fx)) {
            return NAN;
        }
        double c, fc; /* the point given up */
        if ((fx < 0) == (fa < 0)) {
            c = a;
            fc = fa;
        } else {
            c = b;
            fc = fb;
            b = a;
            fb = fa;
        }
        a = x;
        fa = fx;
        const double best = fabs(fa) < fabs(fb) ? a : b;
        const double width = fabs(b - a);
        if (width <= tolerance || fa == 0) {
            return fa == 0 ? a : best;
        }
        const double least = tolerance / 2 / width;
        const double xi = (a - b) / (c - b), phi = (fa - fb) / (fc - fb);
        const bool safe = phi * phi < xi && (1 - phi) * (1 - phi) < 1 - xi;
        t = safe ? fa / (fb - fa) * fc / (fb - fc) +
                       (c - a) / (b - a) * fa / (fc - fa) * fb / (fc - fb)
                 : 0.5;
        t = fmin(fmax(t, least), 1 - least);
    }
    return NAN;
}

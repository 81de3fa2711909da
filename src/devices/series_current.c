/*
 * series_current.c: equation of a lead resistance. Local unknowns: v(a), v(b), i.
 */
#include "devices/real.h"
#include "devices/series_prepared.h"

void REAL_NAME(series_evaluate)(const void *prepared, const real *x, real *f, real *jac)
{
    const struct series_prepared *p = prepared;
    f[0] = x[2];
    f[1] = -x[2];
    f[2] = x[0] - x[1] - REAL(p->resistance) * x[2];
    static const double rows[9] = {0, 0, 1, 0, 0, -1, 1, -1, 0};
    for (int k = 0; k < 9; k++) {
        jac[k] = REAL(rows[k]);
    }
    jac[8] = -REAL(p->resistance);
}

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
    f[2] = x[0] - x[1] - (real)p->resistance * x[2];
    const real rows[9] = {0, 0, 1, 0, 0, -1, 1, -1, -(real)p->resistance};
    for (int k = 0; k < 9; k++) {
        jac[k] = rows[k];
    }
}

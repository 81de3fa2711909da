/*
 * hand_mirror.c: four equations of one mirror, assembled and eliminated line by line: what a person
 * would write who needs this cell and no other.
 *
 *     ref: M1 drain and gate, M2 gate     s1: M1 source, M3 drain
 *     out: M2 drain, load                 s2: M2 source, M4 drain
 */
#include "bench/hand_mirror.h"

#include <math.h>

#include "devices/mos.h"

enum { REF, S1, S2, OUT, ITERATION_LIMIT = 200 };

/* Longest step of an unknown, V: without a limit the first steps leave the range of the model. */
static const double longest = 0.5;

/* Row of the elimination: coefficients and the right side. */
struct row {
    double a[HAND_N], b, size;
};

static void assemble(const struct hand_mirror *m, const double *x, struct row *rows)
{
    double f1[4], j1[16], f2[4], j2[16], f3[4], j3[16], f4[4], j4[16];
    const double x1[4] = {x[REF], x[REF], x[S1], 0}, x2[4] = {x[OUT], x[REF], x[S2], 0};
    const double x3[4] = {x[S1], m->supply, 0, 0}, x4[4] = {x[S2], m->supply, 0, 0};
    mos_evaluate(m->m1, x1, f1, j1);
    mos_evaluate(m->m2, x2, f2, j2);
    mos_evaluate(m->m3, x3, f3, j3);
    mos_evaluate(m->m4, x4, f4, j4);
    const double drop = m->load * (m->supply - x[OUT]);
    rows[REF] = (struct row){
        {j1[0] + j1[1], j1[2], 0, 0}, m->reference - f1[0], fabs(f1[0]) + m->reference};
    rows[S1] = (struct row){
        {j1[8] + j1[9], j1[10] + j3[0], 0, 0}, -f1[2] - f3[0], fabs(f1[2]) + fabs(f3[0])};
    rows[S2] =
        (struct row){{j2[9], 0, j2[10] + j4[0], j2[8]}, -f2[2] - f4[0], fabs(f2[2]) + fabs(f4[0])};
    rows[OUT] =
        (struct row){{j2[1], 0, j2[2], j2[0] + m->load}, drop - f2[0], fabs(f2[0]) + fabs(drop)};
}

/* ref and s1 stand alone; then s2 and out follow from ref. */
static void eliminate(const struct row *r, double *dx)
{
    const double one = r[REF].a[REF] * r[S1].a[S1] - r[REF].a[S1] * r[S1].a[REF];
    dx[REF] = (r[REF].b * r[S1].a[S1] - r[REF].a[S1] * r[S1].b) / one;
    dx[S1] = (r[REF].a[REF] * r[S1].b - r[REF].b * r[S1].a[REF]) / one;
    const double b2 = r[S2].b - r[S2].a[REF] * dx[REF], b3 = r[OUT].b - r[OUT].a[REF] * dx[REF];
    const double two = r[S2].a[S2] * r[OUT].a[OUT] - r[S2].a[OUT] * r[OUT].a[S2];
    dx[S2] = (b2 * r[OUT].a[OUT] - r[S2].a[OUT] * b3) / two;
    dx[OUT] = (r[S2].a[S2] * b3 - b2 * r[OUT].a[S2]) / two;
}

bool hand_mirror_solve(struct hand_mirror *m, double *x)
{
    struct row rows[HAND_N];
    for (m->iterations = 0; m->iterations < ITERATION_LIMIT; m->iterations++) {
        double dx[HAND_N], largest = 0;
        assemble(m, x, rows);
        if (fabs(rows[REF].b) <= m->tolerance * rows[REF].size &&
            fabs(rows[S1].b) <= m->tolerance * rows[S1].size &&
            fabs(rows[S2].b) <= m->tolerance * rows[S2].size &&
            fabs(rows[OUT].b) <= m->tolerance * rows[OUT].size) {
            return true;
        }
        eliminate(rows, dx);
        for (int k = 0; k < HAND_N; k++) {
            largest = fmax(largest, fabs(dx[k]));
        }
        const double share = largest > longest ? longest / largest : 1;
        for (int k = 0; k < HAND_N; k++) {
            x[k] += share * dx[k];
        }
    }
    return false;
}

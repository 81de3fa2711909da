/*
 * peer_gsl.c: GSL's hybrid method with derivatives (hybridj, after Powell 1970), of its solvers the
 * fastest that gets there. The equations are divided by their scale, as its test knows one
 * tolerance only.
 */
#include "bench/peer_gsl.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include <gsl/gsl_multiroots.h>

enum { ITERATION_LIMIT = 1000 };

struct peer_gsl {
    struct system *system;
    gsl_multiroot_fdfsolver *solver;
    gsl_multiroot_function_fdf function;
    gsl_vector *start;
    double tolerance;
    double *f, *size, *values, *scale; /* [n], [n], [nonzeros], [n] */
};

static bool evaluate(struct peer_gsl *p, const gsl_vector *x, gsl_vector *f, gsl_matrix *jac)
{
    struct system *s = p->system;
    if (!s->face.evaluate(s, x->data, p->f, p->size, p->values)) {
        return false;
    }
    for (int k = 0; f != NULL && k < s->n; k++) {
        gsl_vector_set(f, (size_t)k, p->f[k] / p->scale[k]);
    }
    if (jac != NULL) {
        const struct pattern *pattern = s->face.pattern;
        gsl_matrix_set_zero(jac);
        for (int column = 0; column < s->n; column++) {
            for (int k = pattern->start[column]; k < pattern->start[column + 1]; k++) {
                const int row = pattern->row[k];
                gsl_matrix_set(jac, (size_t)row, (size_t)column, p->values[k] / p->scale[row]);
            }
        }
    }
    return true;
}

static int residual(const gsl_vector *x, void *self, gsl_vector *f)
{
    return evaluate(self, x, f, NULL) ? GSL_SUCCESS : GSL_EBADFUNC;
}

static int jacobian(const gsl_vector *x, void *self, gsl_matrix *jac)
{
    return evaluate(self, x, NULL, jac) ? GSL_SUCCESS : GSL_EBADFUNC;
}

static int both(const gsl_vector *x, void *self, gsl_vector *f, gsl_matrix *jac)
{
    return evaluate(self, x, f, jac) ? GSL_SUCCESS : GSL_EBADFUNC;
}

struct peer_gsl *peer_gsl_create(struct system *system, const double *scale, double tolerance)
{
    struct peer_gsl *p = calloc(1, sizeof *p);
    if (p == NULL) {
        return NULL;
    }
    const size_t n = (size_t)system->n;
    gsl_set_error_handler_off();
    p->system = system;
    p->tolerance = tolerance;
    p->solver = gsl_multiroot_fdfsolver_alloc(gsl_multiroot_fdfsolver_hybridj, n);
    p->start = gsl_vector_alloc(n);
    p->f = calloc(3 * n + (size_t)system->nonzeros, sizeof *p->f);
    if (p->solver == NULL || p->start == NULL || p->f == NULL) {
        peer_gsl_destroy(p);
        return NULL;
    }
    p->size = p->f + n;
    p->scale = p->size + n;
    p->values = p->scale + n;
    memcpy(p->scale, scale, n * sizeof *scale);
    p->function = (gsl_multiroot_function_fdf){residual, jacobian, both, n, p};
    return p;
}

void peer_gsl_destroy(struct peer_gsl *p)
{
    if (p == NULL) {
        return;
    }
    if (p->solver != NULL) {
        gsl_multiroot_fdfsolver_free(p->solver);
    }
    if (p->start != NULL) {
        gsl_vector_free(p->start);
    }
    free(p->f);
    free(p);
}

bool peer_gsl_solve(struct peer_gsl *p, const double *start, double *x)
{
    const size_t n = (size_t)p->system->n;
    memcpy(p->start->data, start, n * sizeof *start);
    if (gsl_multiroot_fdfsolver_set(p->solver, &p->function, p->start) != GSL_SUCCESS) {
        return false;
    }
    double worst = INFINITY;
    for (int k = 0; k < ITERATION_LIMIT && !(worst < p->tolerance); k++) {
        if (gsl_multiroot_fdfsolver_iterate(p->solver) != GSL_SUCCESS) {
            break;
        }
        worst = 0;
        for (size_t i = 0; i < n; i++) {
            worst = fmax(worst, fabs(gsl_vector_get(p->solver->f, i)));
        }
    }
    memcpy(x, p->solver->x->data, n * sizeof *x);
    return worst < p->tolerance;
}

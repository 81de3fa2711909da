/*
 * peer_kinsol.c: KINSOL on the functions of a system. One evaluation here gives residual and
 * derivatives together; the derivatives are kept for the Jacobian that KINSOL asks for at the same
 * point, so that the peer pays for no evaluation twice.
 */
#include "bench/peer_kinsol.h"

#include <stdlib.h>
#include <string.h>

#include <kinsol/kinsol.h>
#include <nvector/nvector_serial.h>
#include <sunlinsol/sunlinsol_klu.h>
#include <sunmatrix/sunmatrix_sparse.h>

struct peer_kinsol {
    struct system *system;
    SUNContext context;
    N_Vector x, ones, weights;
    SUNMatrix matrix;
    SUNLinearSolver linear;
    void *solver;
    int strategy;
    double *at, *f, *scale, *values; /* of the last evaluation: [n], [n], [n], [nonzeros] */
};

static int residual(N_Vector u, N_Vector f, void *self)
{
    struct peer_kinsol *p = self;
    struct system *s = p->system;
    double *out = N_VGetArrayPointer(f);
    memcpy(p->at, N_VGetArrayPointer(u), (size_t)s->n * sizeof *p->at);
    return s->face.evaluate(s, p->at, out, p->scale, p->values) ? 0 : 1;
}

static int jacobian(N_Vector u, N_Vector f, SUNMatrix matrix, void *self, N_Vector a, N_Vector b)
{
    (void)f, (void)a, (void)b;
    struct peer_kinsol *p = self;
    struct system *s = p->system;
    const double *at = N_VGetArrayPointer(u);
    if (memcmp(at, p->at, (size_t)s->n * sizeof *at) != 0) {
        memcpy(p->at, at, (size_t)s->n * sizeof *at);
        if (!s->face.evaluate(s, p->at, p->f, p->scale, p->values)) {
            return 1;
        }
    }
    const struct pattern *pattern = s->face.pattern;
    sunindextype *start = SUNSparseMatrix_IndexPointers(matrix);
    sunindextype *row = SUNSparseMatrix_IndexValues(matrix);
    for (int k = 0; k <= s->n; k++) {
        start[k] = pattern->start[k];
    }
    for (int k = 0; k < s->nonzeros; k++) {
        row[k] = pattern->row[k];
    }
    memcpy(SUNSparseMatrix_Data(matrix), p->values, (size_t)s->nonzeros * sizeof *p->values);
    return 0;
}

static bool set_up(struct peer_kinsol *p, const double *scale, double tolerance)
{
    const struct system *s = p->system;
    p->x = N_VNew_Serial(s->n, p->context);
    p->ones = N_VNew_Serial(s->n, p->context);
    p->weights = N_VNew_Serial(s->n, p->context);
    p->matrix = SUNSparseMatrix(s->n, s->n, s->nonzeros, CSC_MAT, p->context);
    p->at = calloc(3 * (size_t)s->n + (size_t)s->nonzeros, sizeof *p->at);
    if (p->x == NULL || p->ones == NULL || p->weights == NULL || p->matrix == NULL ||
        p->at == NULL) {
        return false;
    }
    p->f = p->at + s->n;
    p->scale = p->f + s->n;
    p->values = p->scale + s->n;
    N_VConst(1, p->ones);
    for (int k = 0; k < s->n; k++) {
        N_VGetArrayPointer(p->weights)[k] = 1 / scale[k];
    }
    p->linear = SUNLinSol_KLU(p->x, p->matrix, p->context);
    p->solver = KINCreate(p->context);
    if (p->linear == NULL || p->solver == NULL) {
        return false;
    }
    return KINInit(p->solver, residual, p->x) == 0 && KINSetUserData(p->solver, p) == 0 &&
           KINSetLinearSolver(p->solver, p->linear, p->matrix) == 0 &&
           KINSetJacFn(p->solver, jacobian) == 0 && KINSetFuncNormTol(p->solver, tolerance) == 0 &&
           KINSetScaledStepTol(p->solver, 1e-15) == 0 && KINSetMaxSetupCalls(p->solver, 1) == 0 &&
           KINSetNumMaxIters(p->solver, 1000) == 0;
}

struct peer_kinsol *peer_kinsol_create(struct system *system, const double *scale, double tolerance,
                                       bool searching)
{
    struct peer_kinsol *p = calloc(1, sizeof *p);
    if (p == NULL) {
        return NULL;
    }
    p->system = system;
    p->strategy = searching ? KIN_LINESEARCH : KIN_NONE;
    if (SUNContext_Create(NULL, &p->context) != 0 || !set_up(p, scale, tolerance)) {
        peer_kinsol_destroy(p);
        return NULL;
    }
    return p;
}

void peer_kinsol_destroy(struct peer_kinsol *p)
{
    if (p == NULL) {
        return;
    }
    if (p->solver != NULL) {
        KINFree(&p->solver);
    }
    if (p->linear != NULL) {
        SUNLinSolFree(p->linear);
    }
    if (p->matrix != NULL) {
        SUNMatDestroy(p->matrix);
    }
    N_Vector vectors[] = {p->x, p->ones, p->weights};
    for (size_t k = 0; k < sizeof vectors / sizeof vectors[0]; k++) {
        if (vectors[k] != NULL) {
            N_VDestroy(vectors[k]);
        }
    }
    if (p->context != NULL) {
        SUNContext_Free(&p->context);
    }
    free(p->at);
    free(p);
}

bool peer_kinsol_solve(struct peer_kinsol *p, const double *start, double *x)
{
    const size_t size = (size_t)p->system->n * sizeof *x;
    memcpy(N_VGetArrayPointer(p->x), start, size);
    const int code = KINSol(p->solver, p->x, p->strategy, p->ones, p->weights);
    memcpy(x, N_VGetArrayPointer(p->x), size);
    return code == KIN_SUCCESS || code == KIN_INITIAL_GUESS_OK;
}

int peer_kinsol_iterations(const struct peer_kinsol *p)
{
    long count = -1;
    KINGetNumNonlinSolvIters(p->solver, &count);
    return (int)count;
}

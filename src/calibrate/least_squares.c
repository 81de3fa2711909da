/* least_squares.c: bounded nonlinear least squares by cminpack, the only file that names it. */
#include "calibrate/least_squares.h"

#include <cminpack.h>
#include <math.h>
#include <string.h>

enum { EVALUATION_LIMIT = 400 };

/* Nearer to a bound than this share of the range: at the bound. The sine is flat there. */
static const double bound_share = 1e-5;
/* Start values keep this share of the range from the bounds, so that they can leave them. */
static const double start_share = 1e-3;
/* A scaled column that adds less than this to the ones before it adds nothing. */
static const double rank_tolerance = 1e-7;

/* Angles are counted from here, so that none is near 0: the first step may be a multiple of the
 * size of the start. */
static const double angle_zero = 2;

struct search {
    const struct least_squares_problem *problem;
    double *parameters; /* [n] of the last angle */
    bool was_stopped;
};

static double scaled(const struct bounded *bound, double value)
{
    return bound->logarithmic ? log(value) : value;
}

/* The parameter at an angle; slope: its derivative. */
static double at_angle(const struct bounded *bound, double angle, double *slope)
{
    double least = scaled(bound, bound->least), most = scaled(bound, bound->most);
    double half = (most - least) / 2;
    double value = least + half * (1 + sin(angle - angle_zero));
    *slope = half * cos(angle - angle_zero);
    if (bound->logarithmic) {
        value = exp(value);
        *slope *= value;
    }
    return fmin(fmax(value, bound->least), bound->most);
}

/* Where a parameter stands between its bounds, 0 to 1. */
static double share_of(const struct bounded *bound, double value)
{
    double least = scaled(bound, bound->least), most = scaled(bound, bound->most);
    return (scaled(bound, value) - least) / (most - least);
}

static double angle_of(const struct bounded *bound, double value)
{
    double inside = fmin(fmax(value, bound->least), bound->most);
    double share = share_of(bound, inside);
    share = fmin(fmax(share, start_share), 1 - start_share);
    return angle_zero + asin(2 * share - 1);
}

static int respond(void *self, int m, int n, const double *angles, double *residuals,
                   double *jacobian, int leading, int flag)
{
    struct search *search = self;
    const struct least_squares_problem *problem = search->problem;
    double slopes[LEAST_SQUARES_LIMIT];
    (void)leading;
    if (problem->stopped != NULL && problem->stopped(problem->self)) {
        search->was_stopped = true;
        return -1;
    }
    for (int j = 0; j < n; j++) {
        search->parameters[j] = at_angle(&problem->bounds[j], angles[j], &slopes[j]);
    }
    if (flag == 1) {
        problem->evaluate(problem->self, search->parameters, residuals, NULL);
        return 0;
    }
    problem->evaluate(problem->self, search->parameters, NULL, jacobian);
    for (int j = 0; j < n; j++) {
        for (int k = 0; k < m; k++) {
            jacobian[k + m * j] *= slopes[j];
        }
    }
    return 0;
}

static const char *end_text(int info)
{
    switch (info) {
    case 1:
    case 3:
        return "the sum of squares no longer falls";
    case 2:
        return "the values no longer move";
    case 4:
        return "the gradient is zero";
    case 5:
        return "the limit of evaluations was reached";
    case 6:
    case 7:
    case 8:
        return "rounding error was reached";
    default:
        return "stopped";
    }
}

/* Copies the columns that take part, scaled to unit length, to the front; returns their number. */
static int scale_columns(const struct least_squares_problem *problem, const double *parameters,
                         double *jacobian, struct least_squares_answer *answer, int *kept,
                         double *length)
{
    size_t m = (size_t)problem->residual_count;
    int count = 0;
    for (int j = 0; j < problem->parameter_count; j++) {
        double share = share_of(&problem->bounds[j], parameters[j]);
        answer->at_bound[j] = !(share > bound_share && share < 1 - bound_share);
        answer->standard[j] = answer->at_bound[j] ? NAN : INFINITY;
        double norm = enorm((int)m, jacobian + m * (size_t)j);
        if (answer->at_bound[j] || !(norm > 0)) {
            continue;
        }
        for (size_t k = 0; k < m; k++) {
            jacobian[m * (size_t)count + k] = jacobian[m * (size_t)j + k] / norm;
        }
        length[count] = norm;
        kept[count++] = j;
    }
    return count;
}

/* From the covariance of the scaled columns to the answer. */
static void take_covariance(int n, int count, const double *covariance, const int *kept,
                            const double *length, const bool *is_loose,
                            struct least_squares_answer *answer)
{
    double scale = sqrt(answer->reduced);
    for (int a = 0; a < count; a++) {
        if (is_loose[a]) {
            continue;
        }
        double own = sqrt(covariance[a + count * a]);
        answer->standard[kept[a]] = scale * own / length[a];
        for (int b = 0; b < count; b++) {
            double other = sqrt(covariance[b + count * b]);
            if (!is_loose[b] && own > 0 && other > 0) {
                answer->correlation[kept[a] + n * kept[b]] =
                    covariance[a + count * b] / (own * other);
            }
        }
    }
}

/*
 * Standard errors and correlations from the Jacobian in the parameters themselves. Parameters at a
 * bound take no part.
 */
static bool find_errors(struct arena *arena, const struct least_squares_problem *problem,
                        const double *parameters, double *jacobian, double *residuals,
                        struct least_squares_answer *answer)
{
    int m = problem->residual_count, n = problem->parameter_count;
    double *work = arena_new_array(arena, double, 4 * n);
    double *covariance = arena_new_array(arena, double, (size_t)n *(size_t)n);
    int *order = arena_new_array(arena, int, 2 * n);
    bool *is_loose = arena_new_array(arena, bool, n);
    if (work == NULL || covariance == NULL || order == NULL || is_loose == NULL) {
        return false;
    }
    double *length = work, *diagonal = work + n, *norms = work + 2 * n, *spare = work + 3 * n;
    int *kept = order + n;
    problem->evaluate(problem->self, parameters, residuals, jacobian);
    answer->sum = 0;
    for (int k = 0; k < m; k++) {
        answer->sum += residuals[k] * residuals[k];
    }
    int count = scale_columns(problem, parameters, jacobian, answer, kept, length);
    answer->reduced = answer->sum / fmax(1, m - count);
    answer->rank = 0;
    if (count == 0) {
        return true;
    }
    qrfac(m, count, jacobian, m, 1, order, n, diagonal, norms, spare);
    for (int b = 0; b < count; b++) {
        for (int a = 0; a < b; a++) {
            covariance[a + count * b] = jacobian[(size_t)a + (size_t)m * (size_t)b];
        }
        covariance[b + count * b] = diagonal[b];
        bool is_new = fabs(diagonal[b]) > rank_tolerance * fabs(diagonal[0]);
        answer->rank += is_new ? 1 : 0;
        is_loose[order[b] - 1] = !is_new; /* cminpack counts from 1 */
    }
    covar(count, covariance, count, order, rank_tolerance, spare);
    take_covariance(n, count, covariance, kept, length, is_loose, answer);
    return true;
}

enum status least_squares_solve(struct arena *arena, const struct least_squares_problem *problem,
                                double *parameters, struct least_squares_answer *answer)
{
    int m = problem->residual_count, n = problem->parameter_count;
    memset(answer, 0, sizeof *answer);
    answer->at_bound = arena_new_array(arena, bool, n);
    answer->standard = arena_new_array(arena, double, n);
    answer->correlation = arena_new_array(arena, double, (size_t)n *(size_t)n);
    double *angles = arena_new_array(arena, double, n),
           *work = arena_new_array(arena, double, 5 * n);
    double *residuals = arena_new_array(arena, double, m),
           *more = arena_new_array(arena, double, m);
    double *jacobian = arena_new_array(arena, double, (size_t)m *(size_t)n);
    int *order = arena_new_array(arena, int, n);
    if (arena_failed(arena) || answer->at_bound == NULL || answer->standard == NULL ||
        answer->correlation == NULL || angles == NULL || work == NULL || residuals == NULL ||
        more == NULL || jacobian == NULL || order == NULL) {
        return STATUS_MEMORY;
    }
    answer->ended = "nothing to fit";
    if (n > 0) {
        struct search search = {problem, parameters, false};
        for (int j = 0; j < n; j++) {
            angles[j] = angle_of(&problem->bounds[j], parameters[j]);
        }
        double fall = problem->least_fall > 0 ? problem->least_fall : 1e-10;
        int residual_calls = 0, derivative_calls = 0;
        int info = lmder(respond, &search, m, n, angles, residuals, jacobian, m, fall, 1e-10, 0,
                         EVALUATION_LIMIT, work, 1, 10, 0, &residual_calls, &derivative_calls,
                         order, work + n, work + 2 * n, work + 3 * n, work + 4 * n, more);
        for (int j = 0; j < n; j++) {
            double slope;
            parameters[j] = at_angle(&problem->bounds[j], angles[j], &slope);
        }
        answer->evaluations = residual_calls + derivative_calls;
        answer->ended = end_text(info);
        if (search.was_stopped) {
            return STATUS_STOPPED;
        }
    }
    return find_errors(arena, problem, parameters, jacobian, residuals, answer) ? STATUS_OK
                                                                                : STATUS_MEMORY;
}

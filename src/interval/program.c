/* program.c: bounded-variable simplex in dictionary form. */
#include "interval/program.h"

#include <math.h>
#include <string.h>

enum { PIVOT_LIMIT = 400 };
static const double tiny_pivot = 1e-9;
static const double tolerance = 1e-9;

size_t program_bytes(int rows, int columns)
{
    const size_t r = (size_t)rows, c = (size_t)columns;
    return (r * c + r + c) * sizeof(double) + (r + c) * sizeof(int) + (r + c) * sizeof(bool);
}

void program_place(struct program *p, int rows, int columns, void *block)
{
    const size_t r = (size_t)rows, c = (size_t)columns;
    double *number = block;
    p->rows = rows;
    p->columns = columns;
    p->a = number;
    p->value = p->a + r * c;
    p->cost = p->value + r;
    p->basic = (int *)(void *)(p->cost + c);
    p->nonbasic = p->basic + r;
    p->at_top = (bool *)(void *)(p->nonbasic + c);
    p->equality = p->at_top + c;
}

void program_start(struct program *p)
{
    for (int i = 0; i < p->rows; i++) {
        p->basic[i] = p->columns + i;
    }
    for (int j = 0; j < p->columns; j++) {
        p->nonbasic[j] = j;
        p->at_top[j] = false;
    }
}

/* Slacks start at 0; only that of an equality ends there. */
static double top_of(const struct program *p, int variable)
{
    if (variable < p->columns) {
        return 1;
    }
    return p->equality[variable - p->columns] ? 0 : INFINITY;
}

/* Moves nonbasic j by `step`; all basics follow. */
static void move(struct program *p, int j, double step)
{
    for (int i = 0; i < p->rows; i++) {
        p->value[i] -= p->a[i * p->columns + j] * step;
    }
}

/* Exchanges the basic variable of row r with nonbasic j, whose value is `value`. */
static void exchange(struct program *p, int r, int j, double value)
{
    const int n = p->columns;
    double *row = p->a + r * n;
    const double pivot = row[j];
    for (int k = 0; k < n; k++) {
        row[k] /= pivot;
    }
    row[j] = 1 / pivot;
    for (int i = 0; i < p->rows; i++) {
        double *other = p->a + i * n;
        const double factor = other[j];
        if (i == r || !(fabs(factor) > 0)) {
            continue;
        }
        other[j] = 0;
        for (int k = 0; k < n; k++) {
            other[k] -= factor * row[k];
        }
    }
    const double top = top_of(p, p->basic[r]);
    p->at_top[j] = isfinite(top) && top > 0 && p->value[r] > top / 2;
    const int leaving = p->basic[r];
    p->basic[r] = p->nonbasic[j];
    p->nonbasic[j] = leaving;
    p->value[r] = value;
}

/* -1 below its range, 1 above, 0 inside. */
static int violation(const struct program *p, int i)
{
    return p->value[i] < -tolerance ? -1 : p->value[i] > top_of(p, p->basic[i]) + tolerance ? 1 : 0;
}

/* Entering variable by the largest reduced cost, after many pivots by the lowest number (Bland). */
static int choose_column(const struct program *p, bool lowest)
{
    int best = -1;
    double most = tolerance;
    for (int j = 0; j < p->columns; j++) {
        if (!(top_of(p, p->nonbasic[j]) > 0)) {
            continue; /* the slack of an equality stays at 0 */
        }
        const double gain = p->at_top[j] ? p->cost[j] : -p->cost[j];
        if (gain > most && (best < 0 || !lowest || p->nonbasic[j] < p->nonbasic[best])) {
            best = j;
            most = lowest ? tolerance : gain;
        }
    }
    return best;
}

/*
 * One step along nonbasic j in its improving direction. With `repairs`, a basic variable outside
 * its range goes on to its bound. False when nothing stops it.
 */
static bool step(struct program *p, int j)
{
    const int n = p->columns;
    const double direction = p->at_top[j] ? -1 : 1;
    double most = top_of(p, p->nonbasic[j]), pivot = 0;
    int row = -1;
    for (int i = 0; i < p->rows; i++) {
        const double rate = -p->a[i * n + j] * direction; /* of the basic one */
        if (!(fabs(rate) > tiny_pivot)) {
            continue;
        }
        const double top = top_of(p, p->basic[i]);
        const int outside = violation(p, i);
        double target;
        if (rate > 0) {
            target = outside < 0 ? 0 : outside > 0 ? INFINITY : top;
        } else {
            target = outside > 0 ? top : outside < 0 ? -INFINITY : 0;
        }
        if (isinf(target)) {
            continue;
        }
        const double room = fmax((target - p->value[i]) / rate, 0);
        if (room < most - 1e-12 || (room < most + 1e-12 && row >= 0 && fabs(rate) > pivot)) {
            most = fmin(room, most);
            row = i;
            pivot = fabs(rate);
        }
    }
    if (!isfinite(most)) {
        return false;
    }
    const double start = p->at_top[j] ? top_of(p, p->nonbasic[j]) : 0;
    move(p, j, direction * most);
    if (row < 0) {
        p->at_top[j] = !p->at_top[j];
        return true;
    }
    exchange(p, row, j, start + direction * most);
    return true;
}

/* Multiplier of each row: what its slack costs in the identity behind the objective. */
static void read_multipliers(const struct program *p, const double *basic_cost, double *multipliers)
{
    for (int i = 0; i < p->rows; i++) {
        multipliers[i] = 0;
    }
    for (int i = 0; i < p->rows && basic_cost != NULL; i++) {
        if (p->basic[i] >= p->columns) {
            multipliers[p->basic[i] - p->columns] = -basic_cost[i];
        }
    }
    for (int j = 0; j < p->columns; j++) {
        if (p->nonbasic[j] >= p->columns) {
            multipliers[p->nonbasic[j] - p->columns] = p->cost[j];
        }
    }
}

enum program_status program_feasible(struct program *p, double *multipliers)
{
    const int n = p->columns;
    for (int pivots = 0; pivots < PIVOT_LIMIT; pivots++) {
        bool any = false;
        memset(p->cost, 0, (size_t)n * sizeof *p->cost);
        for (int i = 0; i < p->rows; i++) {
            const int outside = violation(p, i);
            multipliers[i] = outside; /* scratch: cost of the basic one */
            if (outside == 0) {
                continue;
            }
            any = true;
            for (int j = 0; j < n; j++) {
                p->cost[j] -= outside * p->a[i * n + j];
            }
        }
        if (!any) {
            return PROGRAM_DONE;
        }
        const int j = choose_column(p, pivots > PIVOT_LIMIT / 2);
        if (j < 0) {
            /* multipliers[] holds the costs by row of the dictionary: turn them over in place */
            double *costs = p->value; /* the program is at its end: its values are free */
            memcpy(costs, multipliers, (size_t)p->rows * sizeof *costs);
            read_multipliers(p, costs, multipliers);
            return PROGRAM_INFEASIBLE;
        }
        if (!step(p, j)) {
            return PROGRAM_LIMIT;
        }
    }
    return PROGRAM_LIMIT;
}

enum program_status program_least(struct program *p, int column, double sign, double *multipliers)
{
    const int n = p->columns;
    for (int pivots = 0; pivots < PIVOT_LIMIT; pivots++) {
        memset(p->cost, 0, (size_t)n * sizeof *p->cost);
        for (int j = 0; j < n; j++) {
            p->cost[j] = p->nonbasic[j] == column ? sign : 0;
        }
        for (int i = 0; i < p->rows; i++) {
            for (int j = 0; p->basic[i] == column && j < n; j++) {
                p->cost[j] = -sign * p->a[i * n + j];
            }
        }
        const int j = choose_column(p, pivots > PIVOT_LIMIT / 2);
        if (j < 0) {
            read_multipliers(p, NULL, multipliers);
            return PROGRAM_DONE;
        }
        if (!step(p, j)) {
            return PROGRAM_LIMIT;
        }
    }
    return PROGRAM_LIMIT;
}

/*
 * program.h: small linear programs in plain double arithmetic, whose multipliers are then used in a
 * safe bound (Neumaier and Shcherbina, Math. Programming 99 (2004) 283): the answer here need not
 * be exact, since the caller checks with intervals what the multipliers prove.
 *
 * Variables t[columns], each from 0 to 1. Rows: sum a t = b, or sum a t <= b. Bounded-variable
 * simplex in dictionary form (Chvatal, Linear Programming, 1983, chapter 8).
 */
#ifndef INTERVAL_PROGRAM_H
#define INTERVAL_PROGRAM_H

#include <stdbool.h>
#include <stddef.h>

struct program {
    int rows, columns;
    double *a;      /* [rows * columns] dictionary: basic = value - a * nonbasic */
    double *value;  /* [rows] of the basic variables */
    int *basic;     /* [rows] variable in each row: below `columns` a t, else a row's slack */
    int *nonbasic;  /* [columns] */
    bool *at_top;   /* [columns] the nonbasic one is at its upper bound */
    double *cost;   /* [columns] reduced costs, scratch */
    bool *equality; /* [rows] */
};

/* Doubles and ints of workspace for a program of this size. */
size_t program_bytes(int rows, int columns);
/* Lays the arrays of a program into a block of program_bytes, aligned for double. */
void program_place(struct program *program, int rows, int columns, void *block);

/* Starts from a, value (holding b) and equality as the caller filled them in. */
void program_start(struct program *program);

enum program_status { PROGRAM_DONE, PROGRAM_INFEASIBLE, PROGRAM_LIMIT };

/*
 * program_feasible: a point that meets all rows.
 *
 * multipliers  [rows] out when PROGRAM_INFEASIBLE: p, at least 0 for inequalities, so that the sum
 *              of p times the rows contradicts the bounds
 */
enum program_status program_feasible(struct program *program, double *multipliers);

/*
 * program_least: after program_feasible, the least of sign * t[column].
 *
 * multipliers  [rows] out: p so that sign * t[column] + sum p (row) has its least at the answer
 */
enum program_status program_least(struct program *program, int column, double sign,
                                  double *multipliers);

#endif

/*
 * sizer.h: what the files behind size.h share: the `choose` lines in scaled unknowns.
 */
#ifndef ANALYSES_SIZER_H
#define ANALYSES_SIZER_H

#include "analyses/quantity.h"
#include "analyses/size.h"
#include "analyses/trial.h"

struct sizer {
    struct operating_point *home;
    const struct analysis_options *options;
    struct arena *arena;
    const struct choice *choices;
    int n;
    struct parameter_ref *refs; /* [n] */
    struct probe *probes;       /* [n] */
    double *from, *to;          /* [n] bounds in t */
    double *goal;               /* [n] targets in force */
    double *state;              /* [unknowns] near the last good trial */
    double *column, *row;       /* [n] greatest entry of each column and row of all Jacobians */
    int evaluations;
};

/* One place: t, its residual and Jacobian. */
struct place {
    double *t, *q, *r; /* [n] */
    double *jac;       /* [n*n] dr_j/dt_k */
    double cost;       /* half the sum of r^2; INFINITY: no value */
};

/* Scaled unknowns and back, inside the range of the choice. */
double sizer_to_t(const struct choice *choice, double value);
double sizer_from_t(const struct choice *choice, double t);

/* The targets on the way from `begin` [n] to the wanted ones; NULL with share 1: the wanted ones.
 */
void sizer_set_goals(struct sizer *sizer, const double *begin, double share);

/* False when memory is short. */
bool sizer_place_create(const struct sizer *sizer, struct place *place);

/*
 * sizer_search: the place that meets the targets, or the nearest there is.
 *
 * best    out, created; its cost is INFINITY when no place has a state
 * method  out: how it was found
 */
enum status sizer_search(struct sizer *sizer, struct place *best, const char **method);

/* Whether a place meets all targets. */
bool sizer_is_met(const struct sizer *sizer, const struct place *place);

/* size->roundings: the preferred values next to those of size->list, and what they give. */
enum status sizer_round(struct sizer *sizer, struct arena *arena, struct size_result *size);

#endif

/*
 * result.h: what the analyses found, as plain data. Reports read it and compute nothing. A NAN is a
 * value that does not apply. All of a result lives in one arena and borrows the circuit.
 */
#ifndef ANALYSES_RESULT_H
#define ANALYSES_RESULT_H

#include "circuit/circuit.h"
#include "solve/point.h"

enum view { VIEW_FULL, VIEW_HAND };

struct curve_points {
    const double *v, *current; /* [count] rising v; current is the magnitude with the sign of the
                                  direction at `at` positive */
    int count;
};

/* A place where the state jumps or folds while a voltage is swept. */
struct sweep_event {
    double at;        /* swept value */
    const char *text; /* what happened, in circuit words */
};

struct output_result {
    const struct output *output;
    bool is_sink; /* current into the cell at `at` */
    double current;
    double resistance; /* ohm; NAN when unlimited */
    bool resistance_unlimited;
    double compliance; /* V; NAN when nothing lost its headroom within the sweep, or nothing was
                          saturated */
    const char *compliance_device;
    const char *unheld_device; /* at the output, out of headroom at `at` already: no compliance */
    bool compliance_beyond;    /* everything still held at the end of the sweep in that direction */
    double low, high;          /* V; NAN where the band is not left within the sweep */
    double flatness;           /* share */
    const double *line;        /* [rail_count] relative change per volt, 1/V */
    double tempco;             /* 1/K */
    double sigma;              /* share; NAN when no mismatch coefficients are given */
    struct curve_points curve;
    struct sweep_event *events;
    int event_count;
};

struct hand_result {
    const struct hand_line *hand;
    double computed;
    double difference;   /* computed - hand */
    double in_hand_view; /* the same quantity under the square law, NAN when that was not solved */
};

enum judgement {
    JUDGED_MET,
    JUDGED_NOT_MET,
    JUDGED_NOT,    /* scope not judged by this command */
    JUDGED_UNKNOWN /* the quantity has no value; counts as not met */
};

struct requirement_result {
    const struct requirement *requirement;
    double computed;
    enum judgement judgement;
    double margin;      /* distance to the limit in the quantity's unit, negative when not met */
    const char *remark; /* "held down to the end of the sweep", "..." or NULL */
    const double *worst_at;           /* SCOPE_EVERYWHERE: where `computed` is, [axis_count of
                                         result->conditions]; NULL: at the cell's own conditions */
    const struct yield_result *yield; /* NULL: not sampled */
};

enum verdict { VERDICT_MET, VERDICT_NOT_MET, VERDICT_NO_REQUIREMENTS, VERDICT_UNSOLVED };

struct sweep_series {
    double family_value; /* NAN without a family */
    int count;
    const double *knob;   /* [count] */
    const double *values; /* [count * shown_count] row by row */
    struct sweep_event *events;
    int event_count;
    int lost; /* points without an operating point: their values are NAN */
};

struct sweep_table {
    const struct sweep *sweep;
    struct sweep_series *series;
    int series_count;
};

struct states_result; /* states.h */
struct yield_result;
struct conditions_result; /* spread_result.h */
struct mismatch_result;
struct explanation;       /* explain.h */
struct repair_list;       /* repair.h */
struct size_result;       /* size.h */
struct sensitivity_table; /* sensitivity.h */

/* Everything one run found. Parts that a command does not make are empty. */
struct result {
    struct arena *arena;
    const struct circuit *circuit;
    const char *command;
    enum view view;
    double kelvin;
    enum verdict verdict;
    bool is_stopped; /* on request: a part of the work; the verdict is none */
    struct point_result point;
    struct output_result *outputs;
    int output_count;
    struct hand_result *hands;
    int hand_count;
    struct requirement_result *requirements;
    int requirement_count;
    struct sweep_table *sweeps;
    int sweep_count;
    struct caution_list cautions;
    struct states_result *states; /* of `states`, or of one certified point; NULL: none */
    struct conditions_result *conditions;
    struct mismatch_result *mismatch;
    struct explanation *explanations; /* one a hand line */
    int explanation_count;
    struct repair_list *repairs; /* [requirement_count]; NULL: not looked for */
    struct size_result *size;
    struct sensitivity_table *sensitivities;
    int sensitivity_count;
};

#endif

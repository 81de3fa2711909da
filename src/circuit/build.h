/*
 * build.h: what the steps of circuit_build share. Private to this folder.
 */
#ifndef CIRCUIT_BUILD_H
#define CIRCUIT_BUILD_H

#include "circuit/circuit.h"
#include "circuit/names.h"
#include "language/expression.h"

/* Index of a part that was rejected (a second message about it would not help), and of the use of a
 * block, which has a name but no quantities. */
enum { NAME_REJECTED = -2, NAME_OF_BLOCK = -3 };

enum { TERMINAL_LIMIT = 6 }; /* of one part */

enum { LET_DEPTH_LIMIT = 100, BLOCK_DEPTH_LIMIT = 20, LIST_LIMIT = 4000 };

enum let_state { LET_WAITING, LET_VISITING, LET_DONE, LET_WRONG };

/* A `let` of the cell or a process; its value is computed when first asked for. */
struct let_entry {
    const struct expression *expression; /* NULL: the value was set from outside */
    const struct expression *written;    /* in the file; a plain number set from outside takes its
                                            dimension */
    enum let_state state;
};

/* Where names mean what they mean: the cell itself, or one use of a block. */
struct frame {
    struct builder *builder;
    const struct frame *outer; /* NULL: the cell */
    const char *prefix;        /* "" or "X1." */
    const struct word *pins;   /* [pin_count] of the block */
    const int *pin_nodes;      /* [pin_count] node indices */
    int pin_count;
    struct let_value *values; /* parameters and lets of the block */
    int value_count, value_capacity;
    int depth;
};

struct block_entry {
    const struct statement *statement;
};

struct builder {
    struct circuit *circuit;
    struct cell *cell; /* only its list of sources grows, by the files of tables */
    struct diagnostics *diagnostics;
    struct arena *arena;
    const struct circuit_settings *settings;
    struct let_entry *lets; /* parallel to circuit->lets */
    int let_capacity;
    int let_depth;
    double thermal_voltage;
    int placed;           /* parts and uses of blocks so far */
    int errors_before;    /* this build began */
    bool is_over_limit;   /* reported: what is left is not built */
    double sweep_values;  /* of all sweeps */
    bool process_missing; /* a process was not read: its models and corners are unknown */
    struct block_entry *blocks;
    int block_count, block_capacity;
    const char **known; /* scratch for near names */
    bool out_of_memory;
};

/* Each step returns false only when memory is short; wrong input goes to the diagnostics. */
bool build_lets(struct builder *builder);
bool build_models(struct builder *builder);
bool build_rails(struct builder *builder);
bool build_blocks(struct builder *builder); /* definitions only; uses are part of a body */
bool build_outputs(struct builder *builder);
bool build_requests(struct builder *builder);
bool build_checks(struct builder *builder);

/* True once a limit is met: the rest is not built. The first time it is reported at `where`. */
bool build_is_over_limit(struct builder *builder, struct span where);

/* Expression scope of a frame; valid as long as the frame. */
struct expression_scope frame_scope(const struct frame *frame);

/* Node of a name in a frame, made when it is new; -1 when memory is short or the name is wrong. */
int build_node(const struct frame *frame, const char *name, struct span where);

/* "0 V is called gnd" for a 0 where the name of a node is wanted, else NULL. */
static inline const char *build_ground_hint(const struct expression *e)
{
    return e->kind == EXPRESSION_NUMBER && e->number.value == 0 ? "0 V is called gnd" : NULL;
}

/* A node behind a terminal of a part; -1 when memory is short. */
int build_hidden_node(struct builder *builder, const char *part, const char *terminal,
                      struct span where);

/* A new instance with the default values of its type; NULL when memory is short. It moves when the
 * next one is made. */
struct instance *build_instance(struct builder *builder, const char *name,
                                const struct device_type *type, struct span where);

/* The same without values: own and given are the caller's to set. */
struct instance *build_bare_instance(struct builder *builder, const char *name,
                                     const struct device_type *type, struct span where);

/* Gives an instance its unknowns: nodes at its outer terminals, nodes that it sees itself (behind
 * series resistances), and nodes that a law reads. False when memory is short. */
bool build_join(struct builder *builder, struct instance *instance, const int *outer,
                const int *local, const int *inputs, int input_count);

/* Numbers the branches behind the nodes, once all nodes are known. */
void build_finish_unknowns(struct circuit *circuit);

/* Whether a part or use may have this name; an error when it is taken. */
bool build_name_is_new(struct builder *builder, const char *name, struct span where);

/* A hidden voltage source that holds a node at `volts` above gnd (rails, outputs): its index, or -1
 * when memory is short. */
int build_holder(struct builder *builder, const char *name, int node, double volts,
                 struct span where);

/* One part line, and all part and use lines of a body. False when memory is short. */
bool build_part(const struct frame *frame, const struct statement *statement);
bool build_body(const struct frame *frame, struct statement *const *body, int count);

/* Law and curve of a part; NULL after an error or when memory is short. */
const struct law_program *build_law(const struct frame *frame, const struct expression *expression,
                                    int **inputs);
const struct curve *build_curve(const struct frame *frame, const struct statement *statement);

/* Node index (0 is gnd) to unknown. */
static inline int node_unknown(int node)
{
    return node - 1;
}

/* Value of a parameter from an expression: range, dimension, `none`. False after an error. */
bool build_parameter(const struct parameter *parameter, const struct expression *expression,
                     const struct expression_scope *scope, struct diagnostics *diagnostics,
                     double *value);

/* Checks a value against the parameter's range. False after an error. */
bool build_range(const struct parameter *parameter, double value, struct span where,
                 struct diagnostics *diagnostics);

#endif

/*
 * tree.h: a cell or process text as statements and expressions.
 *
 * The tree keeps what was written and where. It knows no device and no node: the first word of a
 * part line ("nmos", "resistor") is kept as text, and the circuit layer asks the device tables
 * what it means. All of a tree lives in the arena that was given to the reader.
 */
#ifndef LANGUAGE_TREE_H
#define LANGUAGE_TREE_H

#include <stdbool.h>

#include "base/diagnostic.h"
#include "base/quantity.h"

/* Limits; each message that meets one prints it. */
enum {
    LANGUAGE_FILE_LIMIT = 4 * 1024 * 1024,   /* bytes of one file */
    LANGUAGE_TOTAL_LIMIT = 16 * 1024 * 1024, /* bytes of a cell and all files it names */
    LANGUAGE_NAME_LIMIT = 100,               /* bytes of one name */
    LANGUAGE_DEPTH_LIMIT = 64,               /* nested parentheses, calls, signs and powers */
    LANGUAGE_TERM_LIMIT = 10000,             /* operators of one expression */
    LANGUAGE_TOKEN_LIMIT = 100000,           /* words, numbers and signs of one statement */
    LANGUAGE_ERROR_LIMIT = 1000              /* errors after which the rest of a file is not read */
};

enum expression_kind {
    EXPRESSION_NUMBER, /* number, with its unit folded in: "47 kohm", "0.45 V^0.5", "4k7" */
    EXPRESSION_NAME,   /* name, possibly with dots: "ITAIL", "ref", "M1.vgs", "tank.v", "um" */
    EXPRESSION_NEGATE, /* left */
    EXPRESSION_ADD,    /* left, right; and so on */
    EXPRESSION_SUBTRACT,
    EXPRESSION_MULTIPLY,
    EXPRESSION_DIVIDE,
    EXPRESSION_POWER, /* right-associative, binds tighter than a sign */
    EXPRESSION_CALL   /* name, arguments */
};

struct expression {
    enum expression_kind kind;
    struct span span;
    struct quantity number;
    const char *name; /* of a number with a prefix and no unit: as written, "10k" */
    const struct expression *left, *right;
    const struct expression **arguments;
    int argument_count;
    bool parenthesised;
};

struct word {
    const char *text; /* NULL when it was left out */
    struct span span;
};

/* "key = value" of a part, a block use or a model line. */
struct assignment {
    struct word key;
    const struct expression *value; /* never NULL */
    char operation;                 /* '=' ; in corners 'a' for += and 'm' for *= */
};

enum statement_kind {
    STATEMENT_TITLE,       /* text */
    STATEMENT_PROCESS,     /* text: a file name in a cell, the process name in a process file */
    STATEMENT_LET,         /* name, value */
    STATEMENT_TEMPERATURE, /* value */
    STATEMENT_MEASURED_AT, /* value */
    STATEMENT_VALID,       /* name ("temperature", "L", ...), from, to */
    STATEMENT_MODEL,       /* name, type (its kind), assignments */
    STATEMENT_CORNER,      /* name, assignments with dotted keys */
    STATEMENT_RAIL,        /* name is the node, value */
    STATEMENT_PART,        /* type is the first word, name, node_from/node_to, value or text,
                              assignments */
    STATEMENT_BLOCK,       /* name, pins, assignments are the defaults, body */
    STATEMENT_USE,         /* type is the block's name, name, assignments */
    STATEMENT_OUTPUT,      /* name is the node, at, from, to, within (may be NULL) */
    STATEMENT_SWEEP,       /* sweep */
    STATEMENT_HAND,        /* quantity, value */
    STATEMENT_REQUIRE,     /* quantity, relation, value, tolerance, scope, yield */
    STATEMENT_VARY,        /* name (or "process" with from == NULL), from, to */
    STATEMENT_CHOOSE,      /* name, from, to, quantity, value */
    STATEMENT_QUIET        /* quantity is the code, name (text NULL when left out) */
};

enum relation { RELATION_BELOW, RELATION_ABOVE, RELATION_WITHIN };

enum scope {
    SCOPE_POINT,      /* at the cell's own conditions */
    SCOPE_EVERYWHERE, /* over all `vary` conditions */
    SCOPE_YIELD       /* for a share of mismatch samples */
};

struct statement {
    enum statement_kind kind;
    struct span span;  /* the whole statement, without comment */
    struct word first; /* the statement word */
    struct word name, type, quantity, thing2;
    struct word node_from, node_to; /* of an arrow; text NULL when there is none */
    const char *text;               /* a quoted string, or NULL */
    struct span text_span;
    const struct expression *value, *from, *to, *at, *within, *tolerance, *yield, *points;
    struct assignment *assignments;
    int assignment_count;
    struct word *words; /* pins of a block; quantities shown by a sweep */
    int word_count;
    const struct expression **values; /* after `for` of a sweep */
    int value_count;
    enum relation relation;
    enum scope scope;
    struct statement **body; /* of a block */
    int body_count;
};

/* Whole statements only: what was wrong is reported and left out. */
struct tree {
    struct statement **statements;
    int count;
    uint32_t file;
};

enum tree_role { TREE_CELL, TREE_PROCESS };

#endif

/* network.c: building a network. */
#include "proof/network.h"

#include <string.h>

struct network *network_create(struct arena *arena, int node_count)
{
    struct network *n = arena_new(arena, struct network);
    if (n == NULL) {
        return NULL;
    }
    n->arena = arena;
    n->node_count = n->variable_count = node_count;
    n->variable_capacity = 2 * node_count + 16;
    n->rows = arena_new_array(arena, struct network_row, n->variable_capacity);
    n->pairs = arena_array(arena, (size_t)n->variable_capacity, sizeof *n->pairs);
    n->start = arena_new_array(arena, struct interval, node_count);
    return n->rows == NULL || n->pairs == NULL || n->start == NULL ? NULL : n;
}

/* Adds to a term that is there, or makes one. */
static bool add_term(struct network *n, int row, int index, struct interval coefficient)
{
    struct network_row *r = &n->rows[row];
    for (int k = 0; k < r->term_count; k++) {
        if (r->terms[k].index == index) {
            r->terms[k].coefficient = interval_add(r->terms[k].coefficient, coefficient);
            return true;
        }
    }
    struct network_term *grown =
        arena_grow(n->arena, r->terms, r->term_count, &r->term_capacity, sizeof *grown);
    if (grown == NULL) {
        return false;
    }
    r->terms = grown;
    r->terms[r->term_count++] = (struct network_term){index, coefficient};
    return true;
}

bool network_add(struct network *n, int row, int variable, struct interval coefficient)
{
    return add_term(n, row, variable, coefficient);
}

void network_add_constant(struct network *n, int row, struct interval value)
{
    n->rows[row].constant = interval_add(n->rows[row].constant, value);
}

struct argument network_node(int node, struct interval shift)
{
    return (struct argument){node, 1, shift};
}

static bool new_pair(struct network *n, int a, int b)
{
    if (n->variable_count == n->variable_capacity) {
        const int wider = 2 * n->variable_capacity;
        struct network_row *rows = arena_new_array(n->arena, struct network_row, wider);
        int(*pairs)[2] = arena_array(n->arena, (size_t)wider, sizeof *pairs);
        if (rows == NULL || pairs == NULL) {
            return false;
        }
        memcpy(rows, n->rows, (size_t)n->variable_count * sizeof *rows);
        memcpy(pairs, n->pairs, (size_t)n->variable_count * sizeof *pairs);
        n->rows = rows;
        n->pairs = pairs;
        n->variable_capacity = wider;
    }
    const int k = n->variable_count++;
    n->pairs[k][0] = a;
    n->pairs[k][1] = b;
    return add_term(n, k, k, interval_point(1)) && add_term(n, k, a, interval_point(-1)) &&
           add_term(n, k, b, interval_point(1));
}

bool network_difference(struct network *n, struct argument a, struct argument b,
                        struct argument *out)
{
    const struct interval shift = interval_sub(a.shift, b.shift);
    *out = (struct argument){-1, 1, shift};
    if (a.variable == b.variable) {
        return true;
    }
    if (b.variable < 0 || a.variable < 0) {
        out->variable = b.variable < 0 ? a.variable : b.variable;
        out->sign = b.variable < 0 ? 1 : -1;
        return true;
    }
    const int low = a.variable < b.variable ? a.variable : b.variable;
    const int high = a.variable < b.variable ? b.variable : a.variable;
    out->sign = a.variable == low ? 1 : -1;
    for (int k = n->node_count; k < n->variable_count; k++) {
        if (n->pairs[k][0] == low && n->pairs[k][1] == high) {
            out->variable = k;
            return true;
        }
    }
    out->variable = n->variable_count;
    return new_pair(n, low, high);
}

bool network_element(struct network *n, const struct element *element, int *index)
{
    struct element *grown =
        arena_grow(n->arena, n->elements, n->element_count, &n->element_capacity, sizeof *grown);
    if (grown == NULL) {
        return false;
    }
    n->elements = grown;
    if (index != NULL) {
        *index = n->element_count;
    }
    n->elements[n->element_count++] = *element;
    return true;
}

bool network_finish(struct network *n)
{
    for (int e = 0; e < n->element_count; e++) {
        const struct element *element = &n->elements[e];
        for (int t = 0; t < element->term_count; t++) {
            const struct element_term *term = &element->terms[t];
            if (term->row >= 0 &&
                !add_term(n, term->row, n->variable_count + e, interval_point(term->factor))) {
                return false;
            }
        }
    }
    for (int r = 0; r < n->variable_count; r++) {
        if (n->rows[r].term_count > n->row_limit) {
            n->row_limit = n->rows[r].term_count;
        }
    }
    return true;
}

void network_arguments(const struct element *e, const struct interval *z,
                       struct interval *arguments)
{
    for (int k = 0; k < e->argument_count; k++) {
        const struct argument *a = &e->arguments[k];
        arguments[k] = a->shift;
        if (a->variable >= 0) {
            const struct interval v = z[a->variable];
            arguments[k] = a->sign > 0 ? interval_add(a->shift, v) : interval_sub(a->shift, v);
        }
    }
}

/*
 * certify.h: boxes that hold exactly one solution, or at most one.
 *
 * With c the middle of X, Y about the inverse of the Jacobian there, and J(X) its range over X:
 *
 *   K(X) = c - Y f(c) + (I - Y J(X))(X - c)
 *
 * holds every solution in X; if K(X) lies inside X there is exactly one (Krawczyk, Computing 4
 * (1969) 187; Moore, SIAM J. Numer. Anal. 14 (1977) 611). If |I - Y J(X)| p < p for some p > 0 then
 * every matrix in J(X) is regular and X holds at most one (Neumaier, Interval Methods for Systems
 * of Equations, 1990, chapters 3 and 5).
 */
#ifndef PROOF_CERTIFY_H
#define PROOF_CERTIFY_H

#include "proof/network.h"

struct certifier;

/* Workspaces, in the arena of the network. NULL when memory is short. */
struct certifier *certifier_create(const struct network *network);

/*
 * certify_exactly: a box around `centre`, as small as it can be proved, that holds exactly one
 * solution.
 *
 * centre  [node_count] near a solution, best its rounding
 * box     [node_count] out
 */
bool certify_exactly(struct certifier *certifier, const double *centre, struct interval *box);

/*
 * certify_box: cuts a box down to K of it.
 *
 * box      [contract_size] only node voltages are changed
 * single   out: it holds at most one solution
 *
 * False when it surely holds none.
 */
bool certify_box(struct certifier *certifier, struct interval *box, bool *single);

/* At most one solution for node voltages in nodes[node_count]? */
bool certify_single(struct certifier *certifier, const struct interval *nodes);

/* Sign of the determinant of the Jacobian at a solution: rows are currents out of the nodes. */
int certify_determinant(struct certifier *certifier, const double *centre);

#endif

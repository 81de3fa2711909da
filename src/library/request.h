/*
 * request.h: the texts of a request as parsed things. Private to library/.
 *
 * Each text becomes a source of the cell's own set, so that a wrong one is shown with a mark like
 * a line of the cell. All return STATUS_OK, STATUS_INPUT (a diagnostic was added) or STATUS_MEMORY.
 */
#ifndef LIBRARY_REQUEST_H
#define LIBRARY_REQUEST_H

#include "circuit/circuit.h"

/* "NAME=expression" */
enum status request_set(struct cell *cell, const char *text, struct set_value *set);

/* "60 C" */
enum status request_temperature(struct cell *cell, const char *text, double *kelvin);

/* "1 nA": a current above 0. `name` of the text for messages. */
enum status request_current(struct cell *cell, const char *name, const char *text, double *amperes);

/* "THING from A to B points N show Q, Q"; the word `sweep` in front is allowed. */
enum status request_sweep(struct cell *cell, const struct circuit *circuit, const char *text,
                          struct sweep *sweep);

/* "tail.resistance" */
enum status request_probe(struct cell *cell, const struct circuit *circuit, const char *text,
                          struct probe *probe);

/* "10 nm", m, above zero */
enum status request_length(struct cell *cell, const char *text, double *length);

#endif

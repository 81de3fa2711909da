/*
 * parser.h: text to tree.
 */
#ifndef LANGUAGE_PARSER_H
#define LANGUAGE_PARSER_H

#include "base/status.h"
#include "language/tree.h"

/*
 * parse_source: reads every statement of a source; a wrong statement is reported and skipped, so
 * that all errors of a file are found in one run.
 *
 * arena        owns the tree
 * sources      the set that holds the text; must outlive the tree
 * file         index into the set
 * role         which statements are allowed
 * diagnostics  errors are added here
 * tree         out: what could be read, also after errors
 *
 * Returns STATUS_OK, STATUS_INPUT (errors were added) or STATUS_MEMORY.
 */
enum status parse_source(struct arena *arena, const struct source_set *sources, uint32_t file,
                         enum tree_role role, struct diagnostics *diagnostics, struct tree *tree);

/* Reads one expression that stands alone (the right side of --set NAME=expr). NULL after an error.
 */
const struct expression *parse_expression(struct arena *arena, const struct source_set *sources,
                                          uint32_t file, struct diagnostics *diagnostics);

/* The statement words, for near names and editors. Returns how many. */
int parser_statement_words(enum tree_role role, const char *const **words);

#endif

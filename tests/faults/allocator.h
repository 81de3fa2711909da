/*
 * allocator.h: memory that fails on demand. The linker leads every call of our own layers here
 * (--wrap), the hooks of KLU and of the JSON library lead theirs; what the C library asks for
 * itself is not counted.
 */
#ifndef FAULTS_ALLOCATOR_H
#define FAULTS_ALLOCATOR_H

#include <stdbool.h>
#include <stddef.h>

/* Leads KLU and the JSON library here; once, before their first use. */
void allocator_install(void);

/* Counts from 0 again; request number `at` (from 1) fails, 0: none. `onward`: all after it too. */
void allocator_fail(long at, bool onward);

/* SIGINT arrives at request number `at` (from 1), 0: never. */
void allocator_interrupt(long at);

/* The same for the blocks that arenas hand out, which are many more than the chunks they ask for.
 */
void allocator_fail_block(long at);
long allocator_blocks(void);

/* Requests since allocator_fail. */
long allocator_requests(void);

/* Whether the one that failed was to change the size of a block, which KLU can do without. */
bool allocator_failed_resize(void);

/* Blocks that are not freed yet. */
long allocator_live(void);

#endif

/*
 * arena.h: memory that lives and dies together.
 *
 * An arena owns every block it hands out; arena_destroy frees them all at once. Blocks are
 * zeroed and aligned for any type. A failed allocation returns NULL, changes nothing, and is
 * remembered (arena_failed), so that a caller may check once at the end of a step.
 */
#ifndef BASE_ARENA_H
#define BASE_ARENA_H

#include <stdarg.h>
#include <stdbool.h>
#include <stddef.h>

struct arena;

/* A new, empty arena, or NULL when memory is short. */
struct arena *arena_create(void);

/* Frees the arena and all of its blocks; NULL is allowed. */
void arena_destroy(struct arena *arena);

/* True once any allocation in this arena has failed. */
bool arena_failed(const struct arena *arena);

/* Bytes handed out so far. */
size_t arena_used(const struct arena *arena);

/* `count` zeroed elements of `size` bytes; NULL on failure or when the product overflows.
 * count 0 gives a valid pointer to nothing. */
void *arena_array(struct arena *arena, size_t count, size_t size);

#define arena_new(arena, type) ((type *)arena_array((arena), 1, sizeof(type)))
#define arena_new_array(arena, type, count)                                                        \
    ((type *)arena_array((arena), (size_t)(count), sizeof(type)))

/* A NUL-terminated copy of `length` bytes, or NULL. */
char *arena_copy(struct arena *arena, const char *text, size_t length);

/* A formatted string, or NULL. */
char *arena_format(struct arena *arena, const char *format, ...)
    __attribute__((format(printf, 2, 3)));
char *arena_format_list(struct arena *arena, const char *format, va_list arguments);

/*
 * arena_grow: room for one more element in a list that lives in an arena.
 *
 * list      the old list, or NULL when *capacity is 0
 * count     elements in use
 * capacity  in and out: elements there is room for
 * size      bytes of one element
 *
 * Returns the list, moved when it had to grow (the old one stays until the arena goes), or NULL.
 */
void *arena_grow(struct arena *arena, void *list, int count, int *capacity, size_t size);

/* arena_give_back: frees a block now when it is large enough to have memory of its own; a smaller
 * one stays until the arena goes. For what has been replaced and nothing points to. NULL is
 * allowed.
 */
void arena_give_back(struct arena *arena, void *block);

#endif

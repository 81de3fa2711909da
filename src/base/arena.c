/* arena.c: zeroed blocks from chunks that are freed together. */
#include "base/arena.h"

#include <limits.h>
#include <stdalign.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { FIRST_CHUNK = 16 * 1024, LARGEST_CHUNK = 1024 * 1024 };

/* The data follow the header; sizeof(struct chunk) keeps them aligned. */
struct chunk {
    alignas(max_align_t) struct chunk *next;
    size_t size, used;
    bool is_own; /* holds one block and takes no other */
};

struct arena {
    struct chunk *chunks; /* the first one is being filled */
    size_t next_size;
    size_t used;
    bool failed;
};

struct arena *arena_create(void)
{
    struct arena *arena = calloc(1, sizeof *arena);
    if (arena != NULL) {
        arena->next_size = FIRST_CHUNK;
    }
    return arena;
}

void arena_destroy(struct arena *arena)
{
    if (arena == NULL) {
        return;
    }
    struct chunk *chunk = arena->chunks;
    while (chunk != NULL) {
        struct chunk *next = chunk->next;
        free(chunk);
        chunk = next;
    }
    free(arena);
}

bool arena_failed(const struct arena *arena)
{
    return arena->failed;
}

size_t arena_used(const struct arena *arena)
{
    return arena->used;
}

/* A chunk with room for `bytes`. A block larger than a quarter of a chunk gets one of its own,
 * behind the chunk that is being filled, so that the rest of that one is not lost. */
static struct chunk *add_chunk(struct arena *arena, size_t bytes)
{
    bool own = bytes > arena->next_size / 4;
    size_t size = own ? bytes : arena->next_size;
    if (size > SIZE_MAX - sizeof(struct chunk)) {
        return NULL;
    }
    struct chunk *chunk = calloc(1, sizeof(struct chunk) + size);
    if (chunk == NULL) {
        return NULL;
    }
    chunk->size = size;
    chunk->is_own = own;
    if (own && arena->chunks != NULL) {
        chunk->next = arena->chunks->next;
        arena->chunks->next = chunk;
    } else {
        chunk->next = arena->chunks;
        arena->chunks = chunk;
    }
    if (!own && arena->next_size < LARGEST_CHUNK) {
        arena->next_size *= 2;
    }
    return chunk;
}

static void *allocate(struct arena *arena, size_t bytes)
{
    const size_t unit = alignof(max_align_t);
    if (bytes > SIZE_MAX - unit) {
        arena->failed = true;
        return NULL;
    }
    size_t rounded = bytes == 0 ? unit : (bytes + unit - 1) / unit * unit;
    struct chunk *chunk = arena->chunks;
    if (chunk == NULL || chunk->size - chunk->used < rounded) {
        chunk = add_chunk(arena, rounded);
    }
    if (chunk == NULL) {
        arena->failed = true;
        return NULL;
    }
    char *block = (char *)(chunk + 1) + chunk->used;
    chunk->used += rounded;
    arena->used += rounded;
    return block;
}

void *arena_array(struct arena *arena, size_t count, size_t size)
{
    if (size != 0 && count > SIZE_MAX / size) {
        arena->failed = true;
        return NULL;
    }
    return allocate(arena, count * size);
}

char *arena_copy(struct arena *arena, const char *text, size_t length)
{
    char *copy = length < SIZE_MAX ? allocate(arena, length + 1) : NULL;
    if (copy != NULL && length > 0) {
        memcpy(copy, text, length);
    }
    return copy;
}

char *arena_format_list(struct arena *arena, const char *format, va_list arguments)
{
    va_list again;
    va_copy(again, arguments);
    int length = vsnprintf(NULL, 0, format, arguments);
    char *text = length < 0 ? NULL : allocate(arena, (size_t)length + 1);
    if (text != NULL) {
        (void)vsnprintf(text, (size_t)length + 1, format, again);
    } else {
        arena->failed = true;
    }
    va_end(again);
    return text;
}

char *arena_format(struct arena *arena, const char *format, ...)
{
    va_list arguments;
    va_start(arguments, format);
    char *text = arena_format_list(arena, format, arguments);
    va_end(arguments);
    return text;
}

void *arena_grow(struct arena *arena, void *list, int count, int *capacity, size_t size)
{
    if (list != NULL && count < *capacity) {
        return list;
    }
    if (*capacity > INT_MAX / 2) {
        arena->failed = true;
        return NULL;
    }
    int larger = *capacity < 4 ? 8 : 2 * *capacity;
    void *moved = arena_array(arena, (size_t)larger, size);
    if (moved == NULL) {
        return NULL;
    }
    if (count > 0) {
        /* NOLINTNEXTLINE(clang-analyzer-core.NonNullParamChecker): an empty list has count 0 */
        memcpy(moved, list, (size_t)count * size);
    }
    *capacity = larger;
    return moved;
}

void arena_give_back(struct arena *arena, void *block)
{
    for (struct chunk **link = &arena->chunks; block != NULL && *link != NULL;
         link = &(*link)->next) {
        struct chunk *chunk = *link;
        if ((void *)(chunk + 1) == block && chunk->is_own) {
            *link = chunk->next;
            arena->used -= chunk->used;
            free(chunk);
            return;
        }
    }
}

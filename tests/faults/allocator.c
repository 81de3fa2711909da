/* allocator.c: see allocator.h. */
#include "allocator.h"

#include <signal.h>
#include <stdint.h>

#include <jansson.h>
#include <suitesparse/SuiteSparse_config.h>

#include "base/arena.h"

/* The functions that are replaced take no context. */
static struct {
    long requests, at, interrupt_at, live;
    long blocks, block_at;
    bool onward, failed_resize;
} state;

void *__real_malloc(size_t size);
void *__real_calloc(size_t count, size_t size);
void *__real_realloc(void *block, size_t size);
void __real_free(void *block);
void *__wrap_malloc(size_t size);
void *__wrap_calloc(size_t count, size_t size);
void *__wrap_realloc(void *block, size_t size);
void __wrap_free(void *block);

void *__real_arena_array(struct arena *arena, size_t count, size_t size);
char *__real_arena_copy(struct arena *arena, const char *text, size_t length);
char *__real_arena_format_list(struct arena *arena, const char *format, va_list arguments);
void *__real_arena_grow(struct arena *arena, void *list, int count, int *capacity, size_t size);
void *__wrap_arena_array(struct arena *arena, size_t count, size_t size);
char *__wrap_arena_copy(struct arena *arena, const char *text, size_t length);
char *__wrap_arena_format(struct arena *arena, const char *format, ...);
char *__wrap_arena_format_list(struct arena *arena, const char *format, va_list arguments);
void *__wrap_arena_grow(struct arena *arena, void *list, int count, int *capacity, size_t size);

static bool must_fail(void)
{
    state.requests++;
    if (state.requests == state.interrupt_at) {
        (void)raise(SIGINT);
    }
    return state.at > 0 &&
           (state.requests == state.at || (state.onward && state.requests > state.at));
}

static void *counted(void *block)
{
    state.live += block != NULL;
    return block;
}

void *__wrap_malloc(size_t size)
{
    return must_fail() ? NULL : counted(__real_malloc(size));
}

void *__wrap_calloc(size_t count, size_t size)
{
    return must_fail() ? NULL : counted(__real_calloc(count, size));
}

void *__wrap_realloc(void *block, size_t size)
{
    if (must_fail()) {
        state.failed_resize = block != NULL;
        return NULL;
    }
    void *moved = __real_realloc(block, size);
    state.live += block == NULL && moved != NULL;
    return moved;
}

void __wrap_free(void *block)
{
    state.live -= block != NULL;
    __real_free(block);
}

void allocator_install(void)
{
    json_set_alloc_funcs(__wrap_malloc, __wrap_free);
#if defined(SUITESPARSE_MAIN_VERSION) && SUITESPARSE_MAIN_VERSION >= 6
    SuiteSparse_config_malloc_func_set(__wrap_malloc);
    SuiteSparse_config_calloc_func_set(__wrap_calloc);
    SuiteSparse_config_realloc_func_set(__wrap_realloc);
    SuiteSparse_config_free_func_set(__wrap_free);
#else
    SuiteSparse_config.malloc_func = __wrap_malloc;
    SuiteSparse_config.calloc_func = __wrap_calloc;
    SuiteSparse_config.realloc_func = __wrap_realloc;
    SuiteSparse_config.free_func = __wrap_free;
#endif
}

/* --- blocks of arenas: a count that overflows is refused, and the arena remembers ---------------
 */

static bool refuses_block(struct arena *arena)
{
    state.blocks++;
    if (state.blocks != state.block_at) {
        return false;
    }
    (void)__real_arena_array(arena, SIZE_MAX, 2);
    return true;
}

void *__wrap_arena_array(struct arena *arena, size_t count, size_t size)
{
    return refuses_block(arena) ? NULL : __real_arena_array(arena, count, size);
}

char *__wrap_arena_copy(struct arena *arena, const char *text, size_t length)
{
    return refuses_block(arena) ? NULL : __real_arena_copy(arena, text, length);
}

char *__wrap_arena_format_list(struct arena *arena, const char *format, va_list arguments)
{
    return refuses_block(arena) ? NULL : __real_arena_format_list(arena, format, arguments);
}

char *__wrap_arena_format(struct arena *arena, const char *format, ...)
{
    va_list arguments;
    va_start(arguments, format);
    char *text = __wrap_arena_format_list(arena, format, arguments);
    va_end(arguments);
    return text;
}

void *__wrap_arena_grow(struct arena *arena, void *list, int count, int *capacity, size_t size)
{
    return refuses_block(arena) ? NULL : __real_arena_grow(arena, list, count, capacity, size);
}

void allocator_fail_block(long at)
{
    state.blocks = 0;
    state.block_at = at;
}

long allocator_blocks(void)
{
    return state.blocks;
}

void allocator_fail(long at, bool onward)
{
    state.requests = 0;
    state.at = at;
    state.onward = onward;
    state.failed_resize = false;
}

void allocator_interrupt(long at)
{
    state.interrupt_at = at;
}

long allocator_requests(void)
{
    return state.requests;
}

bool allocator_failed_resize(void)
{
    return state.failed_resize;
}

long allocator_live(void)
{
    return state.live;
}

/*
 * fuzz_tree.c: bytes to tree: any bytes as a cell or, when the first byte is odd, as a process
 * file, with every message printed; then as an expression that stands alone.
 */
#include <stdlib.h>

#include "language/parser.h"
#include "language/source.h"

int LLVMFuzzerTestOneInput(const uint8_t *bytes, size_t size);

int LLVMFuzzerTestOneInput(const uint8_t *bytes, size_t size)
{
    struct arena *arena = arena_create();
    struct source_set sources = {NULL, 0, 0};
    struct diagnostics diagnostics = {.arena = arena};
    struct buffer text = BUFFER_EMPTY;
    struct tree tree = {0};
    uint32_t file = 0;
    const enum tree_role role = size > 0 && (bytes[0] & 1) != 0 ? TREE_PROCESS : TREE_CELL;
    const size_t skipped = size > 0 ? 1 : 0;
    if (source_add_text(arena, &sources, "fuzz", (const char *)bytes + skipped, size - skipped,
                        &diagnostics, &file) == STATUS_OK) {
        const enum status status = parse_source(arena, &sources, file, role, &diagnostics, &tree);
        if (status == STATUS_MEMORY || (status == STATUS_INPUT) != (diagnostics.count > 0)) {
            abort(); /* an error without a message, or a message without an error */
        }
        (void)parse_expression(arena, &sources, file, &diagnostics);
    }
    diagnostics_print(&diagnostics, &sources, false, &text);
    if (text.failed) {
        abort();
    }
    buffer_free(&text);
    arena_destroy(arena);
    return 0;
}

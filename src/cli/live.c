/* live.c: the page that reloads itself, and the small file that tells it when. */
#include "cli/live.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "cli/output.h"

/* The policy of the page lets the small file in; the place where a reader was is kept. */
static const char policy[] = "script-src 'unsafe-inline'",
                  wider[] = "script-src 'unsafe-inline' file:";
static const char script[] =
    "<script>\n"
    "const ampstead_version = %d;\n"
    "function ampstead_live(version) { if (version !== ampstead_version) { location.reload(); } }\n"
    "setInterval(() => {\n"
    "    const old = document.getElementById('live');\n"
    "    if (old) { old.remove(); }\n"
    "    const ask = document.createElement('script');\n"
    "    ask.id = 'live';\n"
    "    ask.src = location.pathname.split('/').pop() + '.live.js?' + Date.now();\n"
    "    document.head.appendChild(ask);\n"
    "}, 500);\n"
    "</script>\n</body>\n</html>\n";

static char *small_path(const char *path)
{
    static const char ending[] = ".live.js";
    const size_t size = strlen(path) + sizeof ending;
    char *name = malloc(size);
    if (name != NULL) {
        snprintf(name, size, "%s%s", path, ending);
    }
    return name;
}

/* The page with the script at its end; NULL when memory is short. */
static char *with_script(const char *page, int version)
{
    const char *rule = strstr(page, policy), *end = strstr(page, "</body>\n</html>");
    char *text = malloc(strlen(page) + sizeof script + sizeof wider + 16);
    if (text == NULL || rule == NULL || end == NULL || rule > end) {
        free(text);
        return NULL;
    }
    size_t length = (size_t)(rule - page);
    memcpy(text, page, length);
    memcpy(text + length, wider, sizeof wider - 1);
    length += sizeof wider - 1;
    rule += sizeof policy - 1;
    memcpy(text + length, rule, (size_t)(end - rule));
    length += (size_t)(end - rule);
    sprintf(text + length, script, version);
    return text;
}

bool live_write(const char *path, const char *page, int version)
{
    char *name = small_path(path), *text = with_script(page, version), call[40];
    bool is_written = name != NULL && text != NULL;
    if (!is_written) {
        fputs("ampstead: memory is short\n", stderr);
    }
    int length = snprintf(call, sizeof call, "ampstead_live(%d);\n", version);
    /* first the page: when the small file tells of it, it is there */
    is_written = is_written && output_file(path, text, strlen(text)) &&
                 output_file(name, call, (size_t)length);
    free(name);
    free(text);
    return is_written;
}

bool live_end(const char *path, const char *page)
{
    char *name = small_path(path);
    if (name != NULL) {
        (void)unlink(name);
    }
    free(name);
    return output_file(path, page, strlen(page));
}

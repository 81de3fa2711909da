/* utf8.c: decoding of UTF-8. */
#include "base/utf8.h"

size_t utf8_decode(const char *text, size_t length, uint32_t *character)
{
    static const uint32_t least[] = {0, 0, 0x80, 0x800, 0x10000};
    if (length == 0) {
        return 0;
    }
    unsigned char lead = (unsigned char)text[0];
    size_t bytes = lead < 0x80 ? 1 : lead < 0xC0 ? 0 : lead < 0xE0 ? 2 : lead < 0xF0 ? 3 : 4;
    if (bytes == 0 || bytes > length || lead > 0xF4) {
        return 0;
    }
    uint32_t value = bytes == 1 ? lead : lead & (0xFFU >> (bytes + 1));
    for (size_t i = 1; i < bytes; i++) {
        unsigned char next = (unsigned char)text[i];
        if ((next & 0xC0) != 0x80) {
            return 0;
        }
        value = value << 6 | (next & 0x3FU);
    }
    if (value < least[bytes] || value > 0x10FFFF || (value >= 0xD800 && value <= 0xDFFF)) {
        return 0;
    }
    *character = value;
    return bytes;
}

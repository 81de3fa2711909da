/*
 * utf8.h: one character of UTF-8 text at a time.
 */
#ifndef BASE_UTF8_H
#define BASE_UTF8_H

#include <stddef.h>
#include <stdint.h>

/*
 * Decodes the character at the start of text[length]. Returns its bytes (1 to 4), or 0 when no
 * well-formed character stands there: overlong forms, surrogates and values above U+10FFFF are
 * refused (Unicode Standard 15.0, table 3-7).
 */
size_t utf8_decode(const char *text, size_t length, uint32_t *character);

#endif

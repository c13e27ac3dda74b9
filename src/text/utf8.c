/* UTF-8: decoding and the width of a character on a terminal.
 *
 * Decoding follows The Unicode Standard, table 3-7 (well-formed byte
 * sequences).  Widths are the best effort of a short table: combining marks
 * and zero-width characters take no column, the East Asian wide ranges two. */
#include "text/utf8.h"

#include <stdbool.h>

static bool is_continuation(unsigned char byte)
{
    return (byte & 0xC0) == 0x80;
}

int utf8_decode(const char *text, size_t length, uint32_t *code)
{
    static const uint32_t smallest[5] = {0, 0, 0x80, 0x800, 0x10000};
    const unsigned char *byte = (const unsigned char *)text;
    if (length == 0)
        return 0;
    if (byte[0] < 0x80) {
        *code = byte[0];
        return 1;
    }
    int count = byte[0] >= 0xF0 && byte[0] <= 0xF4 ? 4 : byte[0] >= 0xE0 && byte[0] < 0xF0 ? 3
              : byte[0] >= 0xC2 && byte[0] < 0xE0 ? 2 : 0;
    if (count == 0 || (size_t)count > length)
        return 0;
    uint32_t value = byte[0] & (0xFFu >> (count + 1));
    for (int i = 1; i < count; i++) {
        if (!is_continuation(byte[i]))
            return 0;
        value = value << 6 | (byte[i] & 0x3F);
    }
    if (value < smallest[count] || value > 0x10FFFF || (value >= 0xD800 && value <= 0xDFFF))
        return 0;
    *code = value;
    return count;
}

int utf8_width(uint32_t code)
{
    static const struct { uint32_t first, last; int width; } range[] = {
        {0x0300, 0x036F, 0}, {0x1100, 0x115F, 2}, {0x200B, 0x200F, 0}, {0x2E80, 0x303E, 2},
        {0x3041, 0xA4CF, 2}, {0xAC00, 0xD7A3, 2}, {0xF900, 0xFAFF, 2}, {0xFE00, 0xFE0F, 0},
        {0xFE30, 0xFE6F, 2}, {0xFEFF, 0xFEFF, 0}, {0xFF00, 0xFF60, 2}, {0xFFE0, 0xFFE6, 2},
        {0x1F300, 0x1F64F, 2}, {0x1F900, 0x1F9FF, 2}, {0x20000, 0x3FFFD, 2},
    };
    if (code < range[0].first)
        return 1;
    for (size_t i = 0; i < sizeof range / sizeof range[0]; i++)
        if (code >= range[i].first && code <= range[i].last)
            return range[i].width;
    return 1;
}

size_t utf8_count(const char *text, size_t length)
{
    size_t count = 0;
    for (size_t i = 0; i < length; count++) {
        uint32_t code;
        int bytes = utf8_decode(text + i, length - i, &code);
        i += bytes ? (size_t)bytes : 1;
    }
    return count;
}

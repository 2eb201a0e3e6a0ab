/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "server/intake/encoding.h"
#include "base/memory.h"
#include <stdint.h>
#include <string.h>
#include <unistr.h>

enum { PATTERN_BYTES = 4096 };
enum order { ORDER_NONE, ORDER_LITTLE, ORDER_BIG };

/* Windows-1252 above ASCII where it differs from Latin-1 (bytes 80 to 9F); 0 where it defines nothing.
 * Source: the mapping CP1252.TXT of the Unicode Consortium. */
static const uint16_t windows_1252[32] = {
    0x20AC, 0, 0x201A, 0x0192, 0x201E, 0x2026, 0x2020, 0x2021, 0x02C6, 0x2030, 0x0160, 0x2039, 0x0152, 0, 0x017D, 0,
    0, 0x2018, 0x2019, 0x201C, 0x201D, 0x2022, 0x2013, 0x2014, 0x02DC, 0x2122, 0x0161, 0x203A, 0x0153, 0, 0x017E,
    0x0178};

/* Refuses the bytes at `place`, which starts a unit of `width` bytes (2 where `order` says UTF-16). */
static bool refuse(const char *bytes, size_t place, enum order order, const char *name, const char *what,
    struct fault *fault) {
    size_t line = 1, begin = 0, step = order == ORDER_NONE ? 1 : 2;
    size_t low = order == ORDER_BIG ? 1 : 0;
    for (size_t i = 0; i + step <= place; i += step) {
        bool plain = step == 1 || bytes[i + 1 - low] == 0;
        char c = plain ? bytes[i + low] : 'x';
        char next = i + step + low < place && (step == 1 || bytes[i + step + 1 - low] == 0) ? bytes[i + step + low] : 0;
        if (c == '\n' || (c == '\r' && next != '\n')) {
            line++;
            begin = i + step;
        }
    }
    size_t column = place - begin + 1;
    return fault_at(fault, FAULT_INPUT, line, column,
        "%s, line %zu, byte %zu: %s; save the file as UTF-8 and load that", name, line, column, what);
}

static const char *find_beyond_ascii(const char *at, const char *end) {
    for (uint64_t eight; end - at >= 8; at += 8) {
        memcpy(&eight, at, 8);
        if (eight & UINT64_C(0x8080808080808080)) {
            break;
        }
    }
    while (at < end && !(*at & 0x80)) {
        at++;
    }
    return at;
}

/* The first byte that is not UTF-8, NULL where all are. */
static const char *find_not_utf8(const char *bytes, size_t length) {
    const char *end = bytes + length, *at = find_beyond_ascii(bytes, end);
    return (const char *)u8_check((const uint8_t *)at, (size_t)(end - at));
}

/* UTF-16 without its mark: text of the trade is mostly ASCII, so half of its bytes, all on one side, are NUL. */
static enum order recognise_order(const char *bytes, size_t length) {
    size_t sample = length < PATTERN_BYTES ? length : PATTERN_BYTES, nul[2] = {0, 0};
    for (size_t i = 0; i < sample; i++) {
        nul[i % 2] += bytes[i] == 0;
    }
    size_t enough = (sample / 2) * 3 / 4;
    if (length % 2 || enough < 3 || (nul[0] && nul[1])) {
        return ORDER_NONE;
    }
    return nul[1] >= enough ? ORDER_LITTLE : nul[0] >= enough ? ORDER_BIG : ORDER_NONE;
}

static bool read_utf16(struct encoded *encoded, const char *bytes, size_t length, size_t mark, enum order order,
    const char *name, struct fault *fault) {
    if (length % 2) {
        return refuse(bytes, length - 1, order, name, "half a character of UTF-16 at the end of the file", fault);
    }
    size_t units = (length - mark) / 2;
    uint16_t *text = memory_grow(NULL, units + 1, sizeof *text);
    for (size_t i = 0; i < units; i++) {
        unsigned char first = (unsigned char)bytes[mark + 2 * i], second = (unsigned char)bytes[mark + 2 * i + 1];
        text[i] = (uint16_t)(order == ORDER_LITTLE ? first | second << 8 : first << 8 | second);
    }
    const uint16_t *bad = u16_check(text, units);
    if (bad) {
        size_t place = mark + 2 * (size_t)(bad - text);
        memory_free(text);
        return refuse(bytes, place, order, name, "half of a UTF-16 pair without its other half", fault);
    }
    /* A unit gives at most three bytes. */
    size_t room = 3 * units + 1;
    encoded->owned = memory_grow(NULL, room, 1);
    encoded->length = room;
    BUG_IF((char *)u16_to_u8(text, units, (uint8_t *)encoded->owned, &encoded->length) != encoded->owned);
    encoded->text = encoded->owned;
    encoded->word = order == ORDER_LITTLE ? "UTF-16, little-endian" : "UTF-16, big-endian";
    encoded->byte_order_mark = mark > 0;
    memory_free(text);
    return true;
}

const char *encoding_windows_1252(char *out, size_t *written, const char *bytes, size_t length) {
    char *at = out;
    for (size_t i = 0; i < length; i++) {
        unsigned char c = (unsigned char)bytes[i];
        uint32_t point = c >= 0x80 && c < 0xA0 ? windows_1252[c - 0x80] : c;
        if (c >= 0x80 && point == 0) {
            return bytes + i;
        }
        at += c < 0x80 ? (*at = (char)c, 1) : u8_uctomb((uint8_t *)at, point, 3);
    }
    *written = (size_t)(at - out);
    return NULL;
}

static bool read_windows_1252(struct encoded *encoded, const char *bytes, size_t length, const char *name,
    struct fault *fault) {
    encoded->owned = memory_grow(NULL, 3 * length, 1);
    const char *bad = encoding_windows_1252(encoded->owned, &encoded->length, bytes, length);
    if (bad) {
        memory_free(encoded->owned);
        encoded->owned = NULL;
        return refuse(bytes, (size_t)(bad - bytes), ORDER_NONE, name,
            "a byte that neither UTF-8 nor Windows-1252 explains", fault);
    }
    encoded->text = encoded->owned;
    encoded->word = "Windows-1252";
    return true;
}

static bool starts_with(const char *bytes, size_t length, const char *mark, size_t mark_length) {
    return length >= mark_length && !memcmp(bytes, mark, mark_length);
}

bool encoding_read(struct encoded *encoded, const char *bytes, size_t length, const char *name, struct fault *fault) {
    *encoded = (struct encoded){0};
    if (starts_with(bytes, length, "\xFF\xFE", 2)) {
        return read_utf16(encoded, bytes, length, 2, ORDER_LITTLE, name, fault);
    }
    if (starts_with(bytes, length, "\xFE\xFF", 2)) {
        return read_utf16(encoded, bytes, length, 2, ORDER_BIG, name, fault);
    }
    enum order order = recognise_order(bytes, length);
    if (order != ORDER_NONE) {
        return read_utf16(encoded, bytes, length, 0, order, name, fault);
    }
    size_t mark = starts_with(bytes, length, "\xEF\xBB\xBF", 3) ? 3 : 0;
    const char *bad = find_not_utf8(bytes, length);
    if (bad && mark) {
        return refuse(bytes, (size_t)(bad - bytes), ORDER_NONE, name,
            "the file's first bytes say UTF-8, but this byte is not UTF-8", fault);
    }
    if (bad) {
        return read_windows_1252(encoded, bytes, length, name, fault);
    }
    encoded->text = bytes + mark;
    encoded->length = length - mark;
    encoded->word = "UTF-8";
    encoded->byte_order_mark = mark > 0;
    return true;
}

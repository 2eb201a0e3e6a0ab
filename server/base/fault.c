/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/fault.h"
#include <stdarg.h>
#include <stdio.h>
#include <string.h>

void fault_init(struct fault *fault) {
    *fault = (struct fault){0};
}

/* Cuts a half-written UTF-8 character off the end, where a message was longer than its room. */
static void whole_characters(char *message, size_t size) {
    size_t length = strlen(message);
    if (length + 1 < size) {
        return;
    }
    while (length > 0 && ((unsigned char)message[length - 1] & 0xC0) == 0x80) {
        length--;
    }
    message[length > 0 && ((unsigned char)message[length - 1] & 0x80) ? length - 1 : length] = '\0';
}

bool fault_set(struct fault *fault, enum fault_code code, const char *format, ...) {
    if (fault->code == FAULT_NONE) {
        fault->code = code;
        va_list arguments;
        va_start(arguments, format);
        vsnprintf(fault->message, sizeof fault->message, format, arguments);
        va_end(arguments);
        whole_characters(fault->message, sizeof fault->message);
    }
    return false;
}

bool fault_at(struct fault *fault, enum fault_code code, size_t row, size_t column, const char *format, ...) {
    if (fault->code == FAULT_NONE) {
        *fault = (struct fault){.code = code, .row = row, .column = column};
        va_list arguments;
        va_start(arguments, format);
        vsnprintf(fault->message, sizeof fault->message, format, arguments);
        va_end(arguments);
        whole_characters(fault->message, sizeof fault->message);
    }
    return false;
}

void fault_context(struct fault *fault, const char *format, ...) {
    char joined[sizeof fault->message + 256];
    va_list arguments;
    va_start(arguments, format);
    int length = vsnprintf(joined, 256, format, arguments);
    va_end(arguments);
    size_t used = length < 0 ? 0 : length < 256 ? (size_t)length : 255;
    snprintf(joined + used, sizeof joined - used, ": %s", fault->message);
    joined[sizeof fault->message - 1] = '\0';
    memcpy(fault->message, joined, sizeof fault->message);
    whole_characters(fault->message, sizeof fault->message);
}

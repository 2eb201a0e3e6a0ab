/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Zips made in a test, in memory, by libzip. */
#ifndef EVENHAND_TESTS_ZIPPED_H
#define EVENHAND_TESTS_ZIPPED_H
#include "base/text.h"
#include <zip.h>

struct zipped_part {
    const char *name, *content;
    size_t length; /* 0: content is a string */
};

/* Appends the zip of the parts to `out`; store: without packing. Stops the test where libzip cannot. */
static inline void zipped_make(struct text *out, const struct zipped_part *parts, size_t count, bool store) {
    zip_error_t error;
    zip_error_init(&error);
    zip_source_t *source = zip_source_buffer_create(NULL, 0, 0, &error);
    zip_t *zip = source ? zip_open_from_source(source, ZIP_TRUNCATE, &error) : NULL;
    assert_non_null(zip);
    zip_source_keep(source);
    for (size_t i = 0; i < count; i++) {
        size_t length = parts[i].length ? parts[i].length : strlen(parts[i].content);
        zip_int64_t index = zip_file_add(zip, parts[i].name, zip_source_buffer(zip, parts[i].content, length, 0), 0);
        assert_true(index >= 0);
        if (store) {
            zip_set_file_compression(zip, (zip_uint64_t)index, ZIP_CM_STORE, 0);
        }
    }
    assert_int_equal(zip_close(zip), 0);
    assert_int_equal(zip_source_open(source), 0);
    char room[4096];
    for (zip_int64_t got; (got = zip_source_read(source, room, sizeof room)) > 0;) {
        text_append(out, room, (size_t)got);
    }
    zip_source_close(source);
    zip_source_free(source);
}
#endif

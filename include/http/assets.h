/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The files of web/, built into the program by server/http/embed.sh. */
#ifndef EVENHAND_HTTP_ASSETS_H
#define EVENHAND_HTTP_ASSETS_H
#include <stddef.h>

struct web_asset {
    const char *path; /* as asked for: "/app.js"; NULL ends the table */
    const unsigned char *bytes;
    size_t length;
};

extern const struct web_asset web_assets[];
#endif

/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Finding what a request asks for, and the headers every reply bears; for http/ alone. The guards are admit() of
 * routes.h. */
#ifndef EVENHAND_HTTP_GUARDS_H
#define EVENHAND_HTTP_GUARDS_H
#include "http/assets.h"
#include "server/http/state.h"

bool request_reads(const struct request *request);  /* GET or HEAD */
const struct web_asset *asset_of(const char *path); /* a file of web/, index.html for "/"; or NULL */
/* The route for path and method, or NULL; *allowed: the methods that the path does take, NULL where there is none. */
const struct route *route_of(const struct request *request, const char **allowed);
void reply_secure(struct reply *reply); /* adds the security headers, once */
#endif

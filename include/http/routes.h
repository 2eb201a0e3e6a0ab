/* SPDX-License-Identifier: GPL-3.0-or-later */
/* From a request to its reply. The guards stand in one place and run in one order: Host, key or session, Origin and
 * Sec-Fetch-Site, method, size, body. Every reply carries the security headers; data are never stored by a cache.
 *
 *   GET  /                    the page; with ?key=KEY: 303 to the clean address and the session's cookie
 *   GET  /FILE                a file of web/, with an ETag
 *   GET  /agenda.json         the open study's agenda; without one {"study": null, "folder", "studies": [FILE]}
 *   GET  /exhibit/NAME        a fragment of HTML; arguments in the query; meeting=1 for the meeting view
 *   GET  /exhibit/NAME.json   the same as JSON, .csv as CSV, .svg as a figure of its own (meeting=1 too)
 *   POST /decisions           {"version": N, "by": "Name, role", "decisions": [...]} -> {"version": M}
 *                             409 {"fault", "row", "column", "version"} where the study has moved past N;
 *                             otherwise a fault's row is the 1-based entry of the batch
 *   POST /drafts?name=FILE    the bytes of an export -> {"draft": ID, "guess": {...}, "plan": {...}} (see
 *                             trial/guess.h). With draft=ID the file joins those of that draft (one of the same name is
 *                             replaced), and the answer is about all of them; sheet=NAME says which sheet of a
 *                             spreadsheet. A draft is kept in memory until the server ends or newer ones push it out;
 *                             at most 20 files and 512 MB together
 *   POST /guesses             {"draft": ID, "files": [{"name", "layout", "participant", "visit", "codes"}]} guesses
 *                             again with what a person says of each file; only "name" must stand, "layout" is
 *                             participant or visit, "codes" lists the visits in order of time. Files that are not named
 *                             are taken out. Answers as /drafts does
 *   POST /studies             {"draft": ID, "file": "NAME.study", "plan": {...}, "by": "Name, role"} makes the study of
 *                             all the draft's files in the folder and opens it -> 201 {"file", "account"}
 *   POST /open                {"file": "NAME.study"} opens a study of the folder -> {"file"}
 *   POST /close               {} -> {"closed": true}; running requests finish first
 *
 * A fault is {"fault": sentence, "row": N or null, "column": N or null}. Status: 400 the request is wrong, 403 refused
 * (guards, blinding, lock), 404 not there, 405 method, 409 moved on or in use, 413 too large, 500 the machine.
 * "by" is remembered for the session: it is who looks when a look at coded arms is entered ("not said" before). */
#ifndef EVENHAND_HTTP_ROUTES_H
#define EVENHAND_HTTP_ROUTES_H
#include "http/exchange.h"

struct server_state;

struct route {
    const char *method; /* "GET" answers HEAD too */
    const char *path;   /* ends with "/" : everything below it */
    const char *says;
    uint64_t body_limit;
    void (*answer)(struct server_state *state, const struct request *request, struct reply *reply);
};
extern const struct route routes[]; /* ends with a NULL path; files of web/ are not in it */

/* The guards alone, for a request of which only the headers are here: false with the refusal in the reply. */
bool admit(struct server_state *state, const struct request *request, struct reply *reply);
/* Guards and answers. `reply` has been through reply_init. */
void dispatch(struct server_state *state, const struct request *request, struct reply *reply);
#endif

/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A zip of XML parts over received bytes (ISO/IEC 29500-2), read as streams, guarded against files made to exhaust the
 * machine: no document type declarations (29500-2 forbids them), so no entities; limits of size, ratio and depth.
 * Inside intake only. One thread at a time. */
#ifndef EVENHAND_SERVER_INTAKE_PACKAGE_H
#define EVENHAND_SERVER_INTAKE_PACKAGE_H
#include "base/fault.h"
#include <stdint.h>

struct package {
    void *zip;          /* a zip_t */
    const char *name;   /* how sentences call the file */
    uint64_t unpacked;  /* bytes so far, of all parts together */
    struct fault *fault;
};

/* What a reader of one part is told. Names come without their prefix; content of extension lists and alternatives is left
 * out. A function that fills package->fault ends the reading. */
struct part_reader {
    void (*start)(void *of, const char *element, const char **attributes);
    void (*end)(void *of, const char *element);
    void (*text)(void *of, const char *bytes, int length); /* may be NULL; a text may come in pieces */
    void *of;
};

/* Borrows bytes, name and fault until package_close. */
bool package_open(struct package *package, const char *bytes, size_t length, const char *name, struct fault *fault);
void package_close(struct package *package);
bool package_has(const struct package *package, const char *part);
/* False: the fault says which part and why; a part that is not there is one reason. */
bool package_read(struct package *package, const char *part, const struct part_reader *reader);
/* The value of an attribute, whatever its prefix; NULL where it is not there. */
const char *package_attribute(const char **attributes, const char *name);
#endif

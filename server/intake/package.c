/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "server/intake/package.h"
#include "base/memory.h"
#include <expat.h>
#include <string.h>
#include <zip.h>

enum { UNPACKED_LIMIT = 512 << 20, RATIO_FROM = 16 << 20, RATIO_LIMIT = 200, DEPTH_LIMIT = 64, CHUNK = 1 << 16 };

struct reading {
    struct package *package;
    const struct part_reader *reader;
    const char *part;
    XML_Parser parser;
    int depth, skipped_from; /* skipped_from: the depth whose content is left out, 0 where none */
};

bool package_open(struct package *package, const char *bytes, size_t length, const char *name, struct fault *fault) {
    *package = (struct package){.name = name, .fault = fault};
    zip_error_t error;
    zip_error_init(&error);
    zip_source_t *source = zip_source_buffer_create(bytes, length, 0, &error);
    package->zip = source ? zip_open_from_source(source, ZIP_RDONLY, &error) : NULL;
    if (source && !package->zip) {
        zip_source_free(source);
    }
    zip_error_fini(&error);
    return package->zip ||
           fault_set(fault, FAULT_INPUT,
               "%s begins as a spreadsheet (.xlsx) does but is cut short or damaged: it is not a whole zip; copy or export "
               "it again and load that",
               name);
}

void package_close(struct package *package) {
    if (package->zip) {
        zip_discard(package->zip);
    }
    package->zip = NULL;
}

bool package_has(const struct package *package, const char *part) {
    return zip_name_locate(package->zip, part, ZIP_FL_NOCASE) >= 0;
}

const char *package_attribute(const char **attributes, const char *name) {
    for (; *attributes; attributes += 2) {
        const char *colon = strchr(attributes[0], ':');
        if (!strcmp(colon ? colon + 1 : attributes[0], name)) {
            return attributes[1];
        }
    }
    return NULL;
}

static const char *without_prefix(const char *element) {
    const char *colon = strchr(element, ':');
    return colon ? colon + 1 : element;
}

static void stop_at_fault(struct reading *reading) {
    if (reading->package->fault->code != FAULT_NONE) {
        XML_StopParser(reading->parser, XML_FALSE);
    }
}

static void XMLCALL on_start(void *user, const XML_Char *element, const XML_Char **attributes) {
    struct reading *reading = user;
    if (reading->package->fault->code != FAULT_NONE) {
        return;
    }
    element = without_prefix(element);
    if (++reading->depth > DEPTH_LIMIT) {
        fault_set(reading->package->fault, FAULT_INPUT,
            "%s: its part %s nests elements more than 64 deep, which no spreadsheet does; export it again and load that",
            reading->package->name, reading->part);
    } else if (!reading->skipped_from && (!strcmp(element, "extLst") || !strcmp(element, "AlternateContent"))) {
        reading->skipped_from = reading->depth;
    } else if (!reading->skipped_from) {
        reading->reader->start(reading->reader->of, element, attributes);
    }
    stop_at_fault(reading);
}

static void XMLCALL on_end(void *user, const XML_Char *element) {
    struct reading *reading = user;
    if (reading->package->fault->code != FAULT_NONE) {
        return;
    }
    if (!reading->skipped_from) {
        reading->reader->end(reading->reader->of, without_prefix(element));
    } else if (reading->skipped_from == reading->depth) {
        reading->skipped_from = 0;
    }
    reading->depth--;
    stop_at_fault(reading);
}

static void XMLCALL on_text(void *user, const XML_Char *bytes, int length) {
    struct reading *reading = user;
    if (!reading->skipped_from && reading->package->fault->code == FAULT_NONE) {
        reading->reader->text(reading->reader->of, bytes, length);
        stop_at_fault(reading);
    }
}

static void XMLCALL on_document_type(void *user, const XML_Char *name, const XML_Char *system, const XML_Char *public,
    int has_subset) {
    (void)name, (void)system, (void)public, (void)has_subset;
    struct reading *reading = user;
    fault_set(reading->package->fault, FAULT_INPUT,
        "%s: its part %s declares a document type, which the format forbids; export it again and load that",
        reading->package->name, reading->part);
    stop_at_fault(reading);
}

static bool within_limits(struct package *package, const char *part, uint64_t packed, uint64_t unpacked) {
    if (package->unpacked > UNPACKED_LIMIT) {
        return fault_set(package->fault, FAULT_INPUT,
            "%s unpacks to more than 512 MiB, the most a study takes; load a file with fewer columns or records",
            package->name);
    }
    if (unpacked > RATIO_FROM && unpacked / RATIO_LIMIT > packed) {
        return fault_set(package->fault, FAULT_INPUT,
            "%s: its part %s unpacks to more than 200 times its size, as no spreadsheet of a trial does; export it again "
            "and load that",
            package->name, part);
    }
    return true;
}

static bool parse(struct reading *reading, zip_file_t *file, uint64_t packed) {
    struct package *package = reading->package;
    uint64_t unpacked = 0;
    for (;;) {
        void *room = XML_GetBuffer(reading->parser, CHUNK);
        zip_int64_t got = room ? zip_fread(file, room, CHUNK) : -1;
        if (got < 0) {
            return fault_set(package->fault, FAULT_INPUT,
                "%s: its part %s is damaged and cannot be unpacked; copy or export the file again and load that",
                package->name, reading->part);
        }
        unpacked += (uint64_t)got;
        package->unpacked += (uint64_t)got;
        if (!within_limits(package, reading->part, packed, unpacked)) {
            return false;
        }
        if (XML_ParseBuffer(reading->parser, (int)got, got == 0) != XML_STATUS_OK) {
            return fault_set(package->fault, FAULT_INPUT, /* a fault of the reader stands first */
                "%s: its part %s is not well-formed XML (line %lu: %s); export the file again and load that",
                package->name, reading->part, (unsigned long)XML_GetCurrentLineNumber(reading->parser),
                XML_ErrorString(XML_GetErrorCode(reading->parser)));
        }
        if (got == 0) {
            return package->fault->code == FAULT_NONE;
        }
    }
}

static bool read_file(struct package *package, const char *part, const struct part_reader *reader, zip_file_t *file,
    uint64_t packed) {
    struct reading reading = {.package = package, .reader = reader, .part = part, .parser = XML_ParserCreate(NULL)};
    if (!reading.parser) {
        return fault_set(package->fault, FAULT_SYSTEM, "%s: no memory to read it; close other programs and try again",
            package->name);
    }
    XML_SetUserData(reading.parser, &reading);
    XML_SetElementHandler(reading.parser, on_start, on_end);
    XML_SetStartDoctypeDeclHandler(reading.parser, on_document_type);
    if (reader->text) {
        XML_SetCharacterDataHandler(reading.parser, on_text);
    }
    bool done = parse(&reading, file, packed);
    XML_ParserFree(reading.parser);
    return done;
}

bool package_read(struct package *package, const char *part, const struct part_reader *reader) {
    zip_int64_t index = zip_name_locate(package->zip, part, ZIP_FL_NOCASE);
    zip_stat_t facts;
    if (index < 0 || zip_stat_index(package->zip, (zip_uint64_t)index, 0, &facts)) {
        return fault_set(package->fault, FAULT_INPUT,
            "%s: its part %s is missing; export the file again and load that", package->name, part);
    }
    if ((facts.valid & ZIP_STAT_ENCRYPTION_METHOD) && facts.encryption_method != ZIP_EM_NONE) {
        return fault_set(package->fault, FAULT_INPUT,
            "%s is locked with a password; save it without one and load that", package->name);
    }
    zip_file_t *file = zip_fopen_index(package->zip, (zip_uint64_t)index, 0);
    if (!file) {
        return fault_set(package->fault, FAULT_INPUT,
            "%s: its part %s is damaged and cannot be unpacked; copy or export the file again and load that", package->name,
            part);
    }
    bool done = read_file(package, part, reader, file, facts.valid & ZIP_STAT_COMP_SIZE ? facts.comp_size : 0);
    zip_fclose(file);
    return done;
}

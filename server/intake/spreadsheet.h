/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A sheet of a spreadsheet file (.xlsx, ISO/IEC 29500) as cells; see intake/read.h. Inside intake only. */
#ifndef EVENHAND_SERVER_INTAKE_SPREADSHEET_H
#define EVENHAND_SERVER_INTAKE_SPREADSHEET_H
#include "intake/cells.h"

bool spreadsheet_read(struct cells *cells, const char *bytes, size_t length, const char *name, const char *sheet,
    struct fault *fault);
#endif

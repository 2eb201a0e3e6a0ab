/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Received bytes of any format -> text cells. The format is recognised from the bytes, never from the file's name:
 *   .xlsx        spreadsheets: ISO/IEC 29500, transitional and strict
 *   .xpt         the regulators' transport format, versions 5 and 8
 *   .sav .zsav .por .dta .sas7bdat   files of statistical systems, by the ReadStat library
 *   anything else is delimited text (cells_read), or refused by name where it is a format that is not taken.
 * Cells are the texts a person would have typed into delimited text, so that everything downstream is the same:
 *   numbers      the shortest decimal text that reads back as the same number, with a point and without thousands. A
 *                spreadsheet's have 15 significant digits at most, as it shows them; whole numbers below 2^53 keep all
 *   dates, times ISO 8601: "2026-03-14", "2026-03-14T09:30:00", "09:30:00", by the number format of the cell or column.
 *                A day that the calendar does not have (a spreadsheet's 1900-02-29, 1900-01-00) is written as it shows;
 *                what is outside the years 0001 to 9999 stays the number it is
 *   blanks       an absent cell, a system-missing value: ""
 *   missing codes a statistical file's tagged missing value is its code (".A", ".b", "._"), a user-missing value the
 *                number or text it is; both are listed in cells->about
 *   spreadsheets' booleans "TRUE" and "FALSE", errors "#N/A" and the like; formulas give the value last computed
 * Of a spreadsheet the first row with anything in it is the header, and the column count is the header's. */
#ifndef EVENHAND_INTAKE_READ_H
#define EVENHAND_INTAKE_READ_H
#include "intake/cells.h"

/* As cells_read, for every format. `sheet`: the sheet to read, NULL for the only one; where there are several and none
 * is named, the fault lists them; naming one for a file without sheets is a fault. On failure `cells` is empty and the
 * fault is FAULT_INPUT, with row (line, row of the sheet, observation) and column where there is such a place. Borrows all
 * during the call. Thread-safe. Limits beside those of cells_read, against files made to exhaust the machine: 512 MiB
 * unpacked and of text, 64 Mi cells. */
bool read_cells(struct cells *cells, const char *bytes, size_t length, const char *name, const char *sheet,
    struct fault *fault);
#endif

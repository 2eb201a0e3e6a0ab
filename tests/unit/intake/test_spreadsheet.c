/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Spreadsheets -> cells. The XML is written by hand after ISO/IEC 29500-1, clause 18 (SpreadsheetML); clauses stand beside
 * the cases. */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <cmocka.h>
#include "base/memory.h"
#include "base/text.h"
#include "demo/quayside.h"
#include "intake/number.h"
#include "intake/read.h"
#include "server/intake/shown.h"
#include "server/intake/workbook.h"
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include "zipped.h"

#define RELATIONS "<?xml version='1.0'?><Relationships><Relationship Id='r1' Type='x/officeDocument' Target='xl/workbook.xml'/>" \
    "</Relationships>"
#define RELATED "<Relationships><Relationship Id='s1' Type='x/worksheet' Target='worksheets/one.xml'/>" \
    "<Relationship Id='s2' Type='x/worksheet' Target='/xl/worksheets/two.xml'/>" \
    "<Relationship Id='s3' Type='x/chartsheet' Target='charts/c.xml'/>" \
    "<Relationship Id='a' Type='x/styles' Target='./styles.xml'/>" \
    "<Relationship Id='b' Type='x/sharedStrings' Target='../xl/shared.xml'/></Relationships>"
#define ONE "<sheet name='Export' sheetId='1' r:id='s1'/>"
#define BOOK(head, sheets) "<?xml version='1.0'?><workbook>" head "<sheets>" sheets "</sheets></workbook>"
#define PLAIN_BOOK BOOK("", ONE)
/* Cell formats by number: 0 general, 1 built-in date, 2 date and time, 3 own date, 4 quoted letters, 5 [h]:mm, 6 h:mm,
 * 7 colour with d, 8 month alone, 9 built-in 22, 10 two places, 11 the second section alone has dates. */
#define STYLES "<styleSheet><numFmts><numFmt numFmtId='164' formatCode='yyyy\\-mm\\-dd hh:mm'/>" \
    "<numFmt numFmtId='165' formatCode='[$-809]dd\" of \"mmmm'/><numFmt numFmtId='166' formatCode='0\" days\"'/>" \
    "<numFmt numFmtId='167' formatCode='[h]:mm'/><numFmt numFmtId='168' formatCode='[Red]0.00'/>" \
    "<numFmt numFmtId='169' formatCode='mmm'/><numFmt numFmtId='170' formatCode='0;dd'/></numFmts>" \
    "<cellStyleXfs><xf numFmtId='14'/></cellStyleXfs><cellXfs><xf numFmtId='0'/><xf numFmtId='14'/><xf numFmtId='164'/>" \
    "<xf numFmtId='165'/><xf numFmtId='166'/><xf numFmtId='167'/><xf numFmtId='20'/><xf numFmtId='168'/>" \
    "<xf numFmtId='169'/><xf numFmtId='22'/><xf numFmtId='2'/><xf numFmtId='170'/></cellXfs>" \
    "<dxfs><dxf><numFmt numFmtId='0' formatCode='d'/></dxf></dxfs></styleSheet>"
#define SHARED "<sst><si><t>pid</t></si><si><t xml:space='preserve'> F </t></si>" \
    "<si><r><rPr><b/></rPr><t>say \"</t></r><r><t>so\"</t></r><rPh sb='0' eb='1'><t>NO</t></rPh></si><si/>" \
    "<si><t>a_x000D__x000a_b_x005F_x_x0000__xD800_</t></si></sst>"
#define SHEET(rows) "<worksheet><sheetData>" rows "</sheetData></worksheet>"
#define T(text) "<c t='inlineStr'><is><t>" text "</t></is></c>"
#define HEAD "<row>" T("a") T("b") "</row>"

static void make_book(struct text *out, const char *book, const char *sheet, const char *second) {
    struct zipped_part parts[] = {{"[Content_Types].xml", "<Types/>", 0}, {"_rels/.rels", RELATIONS, 0},
        {"xl/workbook.xml", book, 0}, {"xl/_rels/workbook.xml.rels", RELATED, 0}, {"xl/styles.xml", STYLES, 0},
        {"xl/shared.xml", SHARED, 0}, {"xl/worksheets/one.xml", sheet, 0}, {"xl/worksheets/two.xml", second, 0}};
    zipped_make(out, parts, sizeof parts / sizeof *parts - (second == NULL), false);
}

/* The bytes are given in a block of exactly their size, so that the sanitizer sees a read beyond. */
static bool read_exact(struct cells *cells, const char *bytes, size_t length, const char *sheet, struct fault *fault) {
    fault_init(fault);
    char *copy = memory_grow(NULL, length, 1);
    memcpy(copy, bytes, length);
    bool done = read_cells(cells, copy, length, "export.xlsx", sheet, fault);
    memory_free(copy);
    return done;
}

static void show(struct text *text, const struct cells *cells) {
    for (size_t c = 0; c < cells->columns; c++) {
        text_format(text, "%s%s", c ? "|" : "", cells->names[c]);
    }
    for (size_t r = 0; r < cells->records; r++) {
        text_format(text, "/%u:", cells->line[r]);
        for (size_t c = 0; c < cells->columns; c++) {
            text_format(text, "%s%s", c ? "|" : "", cells_at(cells, r, c));
        }
    }
}

static const struct good {
    const char *what, *book, *sheet, *shown;
    size_t blank_rows;
    const char *notes;
} goods[] = {
    {"inline texts and numbers", PLAIN_BOOK, SHEET(HEAD "<row>" T("x, y") "<c><v>12.5</v></c></row>"), "a|b/2:x, y|12.5", 0,
        ""},
    {"shared texts: runs joined, phonetic hints left out, spaces kept (18.4.8)", PLAIN_BOOK,
        SHEET("<row r='1'><c r='A1' t='s'><v>0</v></c><c r='B1' t='inlineStr'><is><r><t>se</t></r><r><t>x </t></r>"
              "<rPh><t>no</t></rPh></is></c></row><row r='2'><c r='A2' t='s'><v>2</v></c><c r='B2' t='s'><v>1</v></c></row>"
              "<row r='3'><c r='A3' t='s'><v>3</v></c><c r='B3' t='s'><v>2</v></c></row>"),
        "pid|sex/2:say \"so\"| F /3:|say \"so\"", 0, ""},
    {"characters written as _xHHHH_ (22.9.2.19)", PLAIN_BOOK, SHEET(HEAD "<row><c t='s'><v>4</v></c><c t='str'><v>_x0041_"
        "</v></c></row>"), "a|b/2:a\r\nb_x_x0000__xD800_|A", 0, ""},
    {"booleans and errors (18.18.11)", PLAIN_BOOK, SHEET("<row>" T("a") T("b") T("c") T("d") "</row><row><c t='b'><v>1</v>"
        "</c><c t='b'><v>0</v></c><c t='e'><v>#N/A</v></c><c t='e'><v>#DIV/0!</v></c></row>"),
        "a|b|c|d/2:TRUE|FALSE|#N/A|#DIV/0!", 0, ""},
    {"numbers have 15 digits at most, as the sheet shows them", PLAIN_BOOK, SHEET("<row>" T("a") T("b") T("c") T("d") T("e")
        T("f") "</row><row><c><v>0.30000000000000004</v></c><c><v>0.10000000000000001</v></c><c><v>1E3</v></c>"
        "<c><v>-1.5E-9</v></c><c><v>9007199254740991</v></c><c><v>27.0</v></c></row><row><c><v>1e21</v></c>"
        "<c><v>123456789012345678</v></c><c><v>-0</v></c><c><v>1.0E-7</v></c><c><v>2.9999999999999998E-2</v></c>"
        "<c s='10'><v>1.005</v></c></row>"),
        "a|b|c|d|e|f/2:0.3|0.1|1000|-1.5e-9|9007199254740991|27/3:1e21|123456789012346000|0|0.0000001|0.03|1.005", 0, ""},
    {"numbers written in other ways than they are shown", PLAIN_BOOK, SHEET("<row>" T("a") T("b") T("c") T("d") T("e") T("f")
        T("g") "</row><row><c><v>007</v></c><c><v>0.50</v></c><c><v>-0.0</v></c><c><v>0</v></c><c><v>12.</v></c><c><v>.5</v></c>"
        "<c><v>-0.000001</v></c></row><row><c><v>0.00000001</v></c><c><v>1234567.123456789</v></c><c><v>00.5</v></c>"
        "<c><v>+5</v></c><c><v> 5 </v></c><c><v>-12.25</v></c><c><v>0.1234567890123456</v></c></row>"),
        "a|b|c|d|e|f|g/2:7|0.5|0|0|12|0.5|-0.000001/3:1e-8|1234567.12345679|0.5|5|5|-12.25|0.123456789012346", 0, ""},
    {"a number cell that holds no number stays as it is", PLAIN_BOOK, SHEET(HEAD "<row><c><v>NaN</v></c><c><v>1 2</v></c>"
        "</row>"), "a|b/2:NaN|1 2", 0, ""},
    {"the 1900 calendar and its day that never was (18.17.4.1)", PLAIN_BOOK, SHEET(HEAD
        "<row><c s='1'><v>1</v></c><c s='1'><v>59</v></c></row><row><c s='1'><v>60</v></c><c s='1'><v>61</v></c></row>"
        "<row><c s='1'><v>39448</v></c><c s='1'><v>0</v></c></row><row><c s='1'><v>2958465</v></c><c s='1'><v>2958466</v>"
        "</c></row><row><c s='1'><v>-1</v></c><c s='99'><v>39448</v></c></row>"),
        "a|b/2:1900-01-01|1900-02-28/3:1900-02-29|1900-03-01/4:2008-01-01|1900-01-00/5:9999-12-31|2958466/6:-1|39448", 0,
        ""},
    {"the 1904 calendar (18.17.4.1)", BOOK("<workbookPr date1904='1'/>", ONE), SHEET(HEAD "<row><c s='1'><v>0</v></c>"
        "<c s='1'><v>37986</v></c></row><row><c s='1'><v>60</v></c><c s='2'><v>60.5</v></c></row>"),
        "a|b/2:1904-01-01|2008-01-01/3:1904-03-01|1904-03-01T12:00:00", 0, ""},
    {"times", PLAIN_BOOK, SHEET(HEAD "<row><c s='2'><v>45000.395833333336</v></c><c s='2'><v>45000</v></c></row>"
        "<row><c s='6'><v>0.39583333333333331</v></c><c s='5'><v>1.1041666666666667</v></c></row>"
        "<row><c s='9'><v>45000.999988425923</v></c><c s='6'><v>45000.25</v></c></row>"
        "<row><c s='1'><v>45000.00000289352</v></c><c s='5'><v>0</v></c></row>"),
        "a|b/2:2023-03-15T09:30:00|2023-03-15/3:09:30:00|26:30:00/4:2023-03-15T23:59:59|2023-03-15T06:00:00/"
        "5:2023-03-15T00:00:00.250|00:00:00", 0, ""},
    {"which formats show dates (18.8.30, 18.8.31)", PLAIN_BOOK, SHEET(HEAD "<row><c s='3'><v>45000</v></c><c s='4'><v>45000"
        "</v></c></row><row><c s='8'><v>45000</v></c><c s='7'><v>45000</v></c></row><row><c s='11'><v>45000</v></c>"
        "<c s='0'><v>45000</v></c></row>"), "a|b/2:2023-03-15|45000/3:2023-03-15|45000/4:45000|45000", 0, ""},
    {"dates as text of the strict form (18.18.11)", PLAIN_BOOK, SHEET(HEAD "<row><c t='d'><v>2023-03-15T00:00:00</v></c>"
        "<c t='d'><v>2023-03-15T09:30:00Z</v></c></row>"), "a|b/2:2023-03-15|2023-03-15T09:30:00Z", 0, ""},
    {"formulas give the value computed last", PLAIN_BOOK, SHEET(HEAD "<row><c><f>1+1</f><v>2</v></c><c t='str'><f>\"\"</f>"
        "<v></v></c></row><row><c t='b'><f>1=1</f><v>1</v></c><c t='e'><f>1/0</f><v>#DIV/0!</v></c></row>"),
        "a|b/2:2|/3:TRUE|#DIV/0!", 0, "Formulas stand in 4 cells: the values computed last are read."},
    {"sparse rows, blank rows, rows of formats alone", PLAIN_BOOK, SHEET("<row r='2'><c r='A2' s='1'/><c r='B2' t='str'><v>"
        "  </v></c></row><row r='3'><c r='A3' t='str'><v>a</v></c><c r='B3' t='str'><v> b </v></c><c r='C3' t='str'><v>c"
        "</v></c><c r='D3' t='str'><v> </v></c></row><row r='5'><c r='C5'><v>3</v></c><c r='F5' s='1'/></row><row r='6'/>"
        "<row r='9'><c r='B9'><v>2</v></c><c r='E9' t='str'><v> </v></c></row><row r='400'><c r='A400' s='1'/></row>"),
        "a|b|c/5:||3/9:|2|", 6, ""},
    {"header alone", PLAIN_BOOK, SHEET(HEAD), "a|b", 0, ""},
    {"names may be numbers and dates where not all are numbers", PLAIN_BOOK, SHEET("<row>" T("pid") "<c><v>2024</v></c>"
        "<c s='1'><v>45000</v></c></row><row><c><v>1</v></c></row>"), "pid|2024|2023-03-15/2:1||", 0, ""},
    {"prefixes, extension lists, alternatives, comments", PLAIN_BOOK, "<x:worksheet xmlns:x='m'><!-- c --><x:extLst><x:row/>"
        "<x:sheetData><x:row><x:c><x:v>9</x:v></x:c></x:row></x:sheetData></x:extLst><x:sheetData><x:row>"
        "<x:c t='str'><x:v>a<![CDATA[&]]>&lt;</x:v></x:c></x:row></x:sheetData></x:worksheet>", "a&<", 0, ""},
    {"merged cells, hidden rows and columns", PLAIN_BOOK, "<worksheet><cols><col min='1' max='1' hidden='1'/><col min='2' "
        "max='16384' hidden='0'/></cols><sheetData>" HEAD "<row hidden='1'>" T("x") "<c><v>1</v></c></row><row><c/><c><v>2"
        "</v></c></row><row hidden='true'/></sheetData><mergeCells><mergeCell ref='A2:A3'/><mergeCell ref='A900:XFD901'/>"
        "</mergeCells></worksheet>", "a|b/2:x|1/3:|2", 0, "1 hidden row and 1 hidden column of the sheet are read like the "
        "others. 2 merges of cells: the first cell of each has the text, the others are blank."},
};

static void reads_what_can_be_read(void **state) {
    (void)state;
    for (size_t i = 0; i < sizeof goods / sizeof *goods; i++) {
        const struct good *good = &goods[i];
        struct text zip, text;
        struct cells cells;
        struct fault fault;
        text_init(&zip);
        text_init(&text);
        make_book(&zip, good->book, good->sheet, NULL);
        if (!read_exact(&cells, zip.data, zip.length, NULL, &fault)) {
            fail_msg("%s: %s", good->what, fault.message);
        }
        show(&text, &cells);
        if (strcmp(text.data, good->shown) || cells.blank_lines != good->blank_rows || strcmp(cells.notes, good->notes)) {
            fail_msg("%s: got %s, %zu blank, %s", good->what, text.data, cells.blank_lines, cells.notes);
        }
        assert_string_equal(cells.encoding, "spreadsheet (.xlsx), sheet \"Export\"");
        assert_string_equal(cells.place, "row");
        for (size_t k = 0; k < cells.records * cells.columns; k++) {
            assert_int_equal(strlen(cells.bytes + cells.start[k]), cells.start[k + 1] - cells.start[k] - 1);
        }
        cells_release(&cells);
        text_release(&text);
        text_release(&zip);
    }
}

#define AT "export.xlsx, sheet \"Export\", "
#define IN "export.xlsx, sheet \"Export\": "
#define AGAIN "; export the file again and load that"
static const struct bad {
    const char *what, *book, *sheet, *named;
    size_t row, column;
    const char *sentence;
} bads[] = {
    {"no rows", PLAIN_BOOK, SHEET(""), NULL, 0, 0, IN "no header, only blank rows; the first row must name the "
        "columns; export the file again and load that"},
    {"empty name", PLAIN_BOOK, SHEET("<row r='4'>" T("a") "<c/>" T("c") "</row>"), NULL, 4, 2, AT "cell B4: this column has "
        "no name in the header; give it one and load again"},
    {"name twice once trimmed", PLAIN_BOOK, SHEET("<row>" T("a") T("sbp") T(" sbp ") "</row>"), NULL, 1, 3, AT "cell C1: the "
        "name sbp stands in column B already; give each column a name of its own and load again"},
    {"numbers for a header", PLAIN_BOOK, SHEET("<row><c><v>1</v></c><c><v>2.5</v></c></row>"), NULL, 1, 1, AT "cell A1: no "
        "header: the first row holds only numbers; put a row with the columns' names above it and load again"},
    {"text beyond the header", PLAIN_BOOK, SHEET(HEAD "<row r='7'><c r='AA7'><v>1</v></c></row>"), NULL, 7, 27,
        AT "cell AA7: it holds text beyond the header, whose last column is B; give the column a name or clear the cell and "
        "load again"},
    {"cells out of order", PLAIN_BOOK, SHEET(HEAD "<row r='2'><c r='B2'><v>1</v></c><c r='A2'><v>1</v></c></row>"), NULL, 2,
        1, AT "cell A2: it stands after a cell further right" AGAIN},
    {"a cell twice", PLAIN_BOOK, SHEET(HEAD "<row r='2'><c r='B2'><v>1</v></c><c r='B2'><v>1</v></c></row>"), NULL, 2, 2,
        AT "cell B2: it stands in the file twice" AGAIN},
    {"a cell in another row", PLAIN_BOOK, SHEET(HEAD "<row r='2'><c r='B3'><v>1</v></c></row>"), NULL, 3, 2, AT "cell B3: it "
        "stands in another row than it says" AGAIN},
    {"a cell nowhere", PLAIN_BOOK, SHEET(HEAD "<row r='2'><c r='XFE2'><v>1</v></c></row>"), NULL, 2, 1, AT "row 2: a cell in "
        "it names a place that no sheet has" AGAIN},
    {"a reference that is none", PLAIN_BOOK, SHEET(HEAD "<row r='2'><c r='2A'><v>1</v></c></row>"), NULL, 2, 1, AT "row 2: a "
        "cell in it names a place that no sheet has" AGAIN},
    {"a row twice", PLAIN_BOOK, SHEET(HEAD "<row r='1'/>"), NULL, 1, 1, AT "row 1: it stands in the file twice" AGAIN},
    {"rows out of order", PLAIN_BOOK, SHEET("<row r='4'/><row r='3'/>"), NULL, 3, 1, AT "row 3: it stands after a row "
        "further down" AGAIN},
    {"a row beyond the sheet", PLAIN_BOOK, SHEET("<row r='1048577'/>"), NULL, 0, 0, IN "a row has a number that no sheet "
        "has" AGAIN},
    {"row zero", PLAIN_BOOK, SHEET("<row r='0'/>"), NULL, 0, 0, IN "a row has a number that no sheet has" AGAIN},
    {"a shared text that is not there", PLAIN_BOOK, SHEET(HEAD "<row><c t='s'><v>5</v></c></row>"), NULL, 2, 1, AT "cell A2: "
        "it points at a shared text that the file does not hold" AGAIN},
    {"a shared text without number", PLAIN_BOOK, SHEET(HEAD "<row><c t='s'><v/></c></row>"), NULL, 2, 1, AT "cell A2: "
        "it points at a shared text that the file does not hold" AGAIN},
    {"an unknown type", PLAIN_BOOK, SHEET(HEAD "<row><c t='q'><v>5</v></c></row>"), NULL, 2, 1, AT "cell A2: its type is "
        "none that the format knows" AGAIN},
    {"a formula never computed", PLAIN_BOOK, SHEET(HEAD "<row><c/><c><f>SUM(A1)</f><v></v></c></row>"), NULL, 2, 2,
        AT "cell B2: it holds a formula whose value was never computed; open the file in a spreadsheet program, save it and "
        "load that"},
    {"text under merged cells", PLAIN_BOOK, "<worksheet><sheetData>" HEAD "<row>" T("x") T("y") "</row></sheetData>"
        "<mergeCells><mergeCell ref='A2:B2'/></mergeCells></worksheet>", NULL, 2, 2, AT "cell B2: it holds text but is "
        "covered by merged cells, so that nobody sees it; unmerge them and load again"},
    {"merged cells that overlap", PLAIN_BOOK, "<worksheet><sheetData>" HEAD "<row>" T("x") "</row></sheetData>"
        "<mergeCells><mergeCell ref='A2:B2'/><mergeCell ref='A2:B2'/></mergeCells></worksheet>", NULL, 0, 0, IN "its merged "
        "cells overlap" AGAIN},
    {"bad XML", PLAIN_BOOK, "<worksheet><sheetData>\n<row></sheetData></worksheet>", NULL, 0, 0, "export.xlsx: its part "
        "xl/worksheets/one.xml is not well-formed XML (line 2: mismatched tag)" AGAIN},
    {"XML cut short", PLAIN_BOOK, "<worksheet><sheetData>" HEAD, NULL, 0, 0, "export.xlsx: its part xl/worksheets/one.xml is "
        "not well-formed XML (line 1: no element found)" AGAIN},
    {"entities", PLAIN_BOOK, "<!DOCTYPE x [<!ENTITY a 'aaaaaaaaaa'><!ENTITY b '&a;&a;&a;&a;'>]><worksheet/>", NULL, 0, 0,
        "export.xlsx: its part xl/worksheets/one.xml declares a document type, which the format forbids; export it again and "
        "load that"},
    {"a sheet whose part is missing", BOOK("", "<sheet name='Export' sheetId='1' r:id='s2'/>"), SHEET(HEAD), NULL, 0, 0,
        "export.xlsx: its part xl/worksheets/two.xml is missing" AGAIN},
    {"a sheet without part", BOOK("", "<sheet name='Export' sheetId='1' r:id='s9'/>"), SHEET(HEAD), NULL, 0, 0, IN "the file "
        "holds no cells for it" AGAIN},
    {"charts alone", BOOK("", "<sheet name='Chart' sheetId='1' r:id='s3'/>"), SHEET(HEAD), NULL, 0, 0, "export.xlsx holds no "
        "sheet of cells; export it again and load that"},
    {"no workbook", "<document/>", SHEET(HEAD), NULL, 0, 0, "export.xlsx holds a document that is no spreadsheet; load the "
        "spreadsheet or delimited text"},
    {"several sheets, none named", BOOK("", ONE "<sheet name='Codes' state='hidden' r:id='s2'/>"), SHEET(HEAD), NULL, 0, 0,
        "export.xlsx holds 2 sheets: \"Export\", \"Codes\" (hidden); name the one to read in the plan, as in files: [{\"id\": "
        "\"\u2026\", \"sheet\": \"Export\"}]"},
    {"a name that no sheet has", PLAIN_BOOK, SHEET(HEAD), "export", 0, 0, "export.xlsx has no sheet \"export\"; it has "
        "\"Export\"; correct the name in the plan's files"},
};

static void refuses_with_its_sentence(void **state) {
    (void)state;
    for (size_t i = 0; i < sizeof bads / sizeof *bads; i++) {
        const struct bad *bad = &bads[i];
        struct text zip;
        struct cells cells;
        struct fault fault;
        text_init(&zip);
        make_book(&zip, bad->book, bad->sheet, NULL);
        if (read_exact(&cells, zip.data, zip.length, bad->named, &fault)) {
            fail_msg("%s: was read", bad->what);
        }
        if (fault.code != FAULT_INPUT || fault.row != bad->row || fault.column != bad->column ||
            strcmp(fault.message, bad->sentence)) {
            fail_msg("%s: got (%zu, %zu) %s", bad->what, fault.row, fault.column, fault.message);
        }
        assert_true(cells.records == 0 && cells.columns == 0 && !cells.bytes);
        text_release(&zip);
    }
}

static void reads_the_sheet_that_is_named(void **state) {
    (void)state;
    static const struct {
        const char *named, *shown;
    } cases[] = {{"Export", "a|b"}, {"Codes & <more>", "code/2:1"}};
    struct text zip;
    text_init(&zip);
    make_book(&zip, BOOK("", ONE "<sheet name='Chart' r:id='s3'/><sheet name='Codes &amp; &lt;more>' r:id='s2'/>"), SHEET(HEAD),
        SHEET("<row>" T("code") "</row><row><c><v>1</v></c></row>"));
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct cells cells;
        struct fault fault;
        struct text text;
        text_init(&text);
        assert_true(read_exact(&cells, zip.data, zip.length, cases[i].named, &fault));
        show(&text, &cells);
        assert_string_equal(text.data, cases[i].shown);
        assert_string_equal(cells.notes, "The file's other sheets (1) are not read.");
        cells_release(&cells);
        text_release(&text);
    }
    text_release(&zip);
}

/* The sentence for one file given as bytes. */
static void refuse_bytes(const char *bytes, size_t length, const char *sentence) {
    struct cells cells;
    struct fault fault;
    assert_false(read_exact(&cells, bytes, length, NULL, &fault));
    assert_string_equal(fault.message, sentence);
}

#define CUT "export.xlsx begins as a spreadsheet (.xlsx) does but is cut short or damaged: it is not a whole zip; copy or " \
    "export it again and load that"

/* Cut anywhere, a zip has no directory at its end. */
static void refuses_a_zip_cut_short(void **state) {
    (void)state;
    struct text zip;
    text_init(&zip);
    make_book(&zip, goods[0].book, goods[0].sheet, NULL);
    for (size_t length = 4; length < zip.length; length++) {
        refuse_bytes(zip.data, length, CUT);
    }
    text_release(&zip);
}

/* Any byte changed: read or refused with a sentence; the check sums catch what changes a part. */
static void stands_any_byte(void **state) {
    (void)state;
    struct text zip;
    text_init(&zip);
    make_book(&zip, goods[1].book, goods[1].sheet, NULL);
    for (size_t at = 4; at < zip.length; at += 2) {
        for (int bit = (int)at % 3; bit < 8; bit += 4) {
            struct cells cells;
            struct fault fault;
            zip.data[at] = (char)(zip.data[at] ^ (1 << bit));
            if (!read_exact(&cells, zip.data, zip.length, NULL, &fault)) {
                assert_true(fault.code == FAULT_INPUT && fault.message[0]);
            }
            cells_release(&cells);
            zip.data[at] = (char)(zip.data[at] ^ (1 << bit));
        }
    }
    text_release(&zip);
}

/* The same with the XML itself changed, by characters that mean something. */
static void stands_any_character(void **state) {
    (void)state;
    for (size_t i = 0; i < sizeof goods / sizeof *goods; i += 3) {
        char *sheet = memory_text(goods[i].sheet);
        for (size_t at = 0, length = strlen(sheet); at < length; at += 13) {
            for (const char *c = "<>/'9A\x80"; *c; c++) {
                struct text zip;
                struct cells cells;
                struct fault fault;
                text_init(&zip);
                sheet[at] = *c;
                make_book(&zip, goods[i].book, sheet, NULL);
                if (!read_exact(&cells, zip.data, zip.length, NULL, &fault)) {
                    assert_true(fault.code == FAULT_INPUT && fault.message[0]);
                }
                cells_release(&cells);
                text_release(&zip);
            }
            sheet[at] = goods[i].sheet[at];
        }
        memory_free(sheet);
    }
}

static void refuses_other_files_by_name(void **state) {
    (void)state;
    static const struct zipped_part word[] = {{"_rels/.rels", "<Relationships/>", 0}};
    static const struct zipped_part open_document[] = {{"mimetype", "m", 0}, {"content.xml", "<c/>", 0}};
    static const struct zipped_part binary[] = {{"_rels/.rels", "<Relationships><Relationship Id='1' "
        "Type='x/officeDocument' Target='xl/workbook.bin'/></Relationships>", 0}};
    static const struct zipped_part escape[] = {{"_rels/.rels", "<Relationships><Relationship Id='1' "
        "Type='x/officeDocument' Target='../../../x/./../none.xml'/></Relationships>", 0}};
    static const struct {
        const struct zipped_part *parts;
        size_t count;
        const char *sentence;
    } cases[] = {
        {word, 1, "export.xlsx is a zip with no spreadsheet in it; unpack it and load the file inside"},
        {&open_document[0], 1, "export.xlsx is a zip with no spreadsheet in it; unpack it and load the file inside"},
        {open_document, 2, "export.xlsx is an OpenDocument file; save it as .xlsx or as delimited text and load that"},
        {binary, 1, "export.xlsx is a spreadsheet in binary form (.xlsb); save it as .xlsx and load that"},
        {escape, 1, "export.xlsx: its part _rels/none.xml.rels is missing; export the file again and load that"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct text zip;
        text_init(&zip);
        zipped_make(&zip, cases[i].parts, cases[i].count, true);
        refuse_bytes(zip.data, zip.length, cases[i].sentence);
        text_release(&zip);
    }
    static const char older[] = "\xD0\xCF\x11\xE0\xA1\xB1\x1A\xE1 and so on";
    static const char locked[] = "\xD0\xCF\x11\xE0\xA1\xB1\x1A\xE1..E\0n\0c\0r\0y\0p\0t\0e\0d\0P\0a\0c\0k\0a\0g\0e\0..";
    refuse_bytes(older, sizeof older, "export.xlsx is a spreadsheet or document of the older kind (.xls); save it as .xlsx or "
        "as delimited text and load that");
    refuse_bytes(locked, sizeof locked, "export.xlsx is locked with a password; save it without one and load that");
    refuse_bytes("%PDF-1.4 ...", 12, "export.xlsx is a document for printing (.pdf); export the data themselves and load those");
    refuse_bytes("\x1F\x8B\x08....", 7, "export.xlsx is packed (.gz); unpack it and load the file inside");
    refuse_bytes("", 0, "export.xlsx, line 1, column 1: the file is empty; export it again and load that");
}

static void reads_delimited_text_as_before(void **state) {
    (void)state;
    struct cells cells;
    struct fault fault;
    assert_true(read_exact(&cells, "pid;sex\n1;F\n", 12, NULL, &fault));
    assert_string_equal(cells.delimiter_word, "semicolon");
    assert_string_equal(cells.format, "delimited text");
    assert_string_equal(cells_at(&cells, 0, 1), "F");
    cells_release(&cells);
    assert_false(read_exact(&cells, "pid;sex\n1;F\n", 12, "Export", &fault));
    assert_string_equal(fault.message, "export.xlsx is a file of delimited text and has no sheets; take sheet \"Export\" out of "
        "the plan's files");
}

/* Files made to exhaust the machine: much text from few bytes, cells beyond number, nesting, a text told over and over. */
static void refuses_what_would_exhaust_the_machine(void **state) {
    (void)state;
    struct text sheet, zip;
    struct cells cells;
    struct fault fault;
    text_init(&sheet);
    text_init(&zip);
    text_literal(&sheet, "<worksheet><sheetData>");
    for (int i = 0; i < 4 << 20; i++) {
        text_literal(&sheet, "        ");
    }
    make_book(&zip, PLAIN_BOOK, sheet.data, NULL);
    assert_false(read_exact(&cells, zip.data, zip.length, NULL, &fault));
    assert_string_equal(fault.message, "export.xlsx: its part xl/worksheets/one.xml unpacks to more than 200 times its size, "
        "as no spreadsheet of a trial does; export it again and load that");

    text_clear(&sheet);
    text_clear(&zip);
    for (int i = 0; i < 100; i++) {
        text_literal(&sheet, "<x>");
    }
    make_book(&zip, PLAIN_BOOK, sheet.data, NULL);
    assert_false(read_exact(&cells, zip.data, zip.length, NULL, &fault));
    assert_string_equal(fault.message, "export.xlsx: its part xl/worksheets/one.xml nests elements more than 64 deep, which no "
        "spreadsheet does; export it again and load that");

    text_clear(&sheet);
    text_clear(&zip);
    text_literal(&sheet, "<worksheet><sheetData><row>");
    for (int i = 0; i < 1999; i++) {
        text_format(&sheet, "<c t='str'><v>v%d</v></c>", i);
    }
    text_literal(&sheet, "</row>");
    for (int i = 0; i < 40000; i++) {
        text_format(&sheet, "<row><c><v>%d</v></c></row>", i);
    }
    text_literal(&sheet, "</sheetData></worksheet>");
    make_book(&zip, PLAIN_BOOK, sheet.data, NULL);
    assert_false(read_exact(&cells, zip.data, zip.length, NULL, &fault));
    assert_string_equal(fault.message, IN "it holds more than 64 Mi cells or 512 MiB of text, the most a study takes; load a "
        "file with fewer columns or records");
    text_release(&sheet);
    text_release(&zip);
}

static void write_text(struct text *out, const char *text) {
    for (; *text; text++) {
        text_string(out, *text == '<' ? "&lt;" : *text == '&' ? "&amp;" : NULL);
        if (*text != '<' && *text != '&') {
            text_char(out, *text);
        }
    }
}

/* As a spreadsheet program would hold what a person typed: numbers where the text is just how a number is shown. */
static void write_cell(struct text *out, const char *text) {
    char shown[SHOWN_ROOM] = "";
    double value;
    if (number_read(text, '.', &value, NULL) == NUMBER_READ) {
        shown_typed(shown, value);
    }
    if (!*text) {
        text_literal(out, "<c/>");
    } else if (!strcmp(shown, text)) {
        text_format(out, "<c><v>%.17g</v></c>", value);
    } else {
        text_literal(out, "<c t='inlineStr'><is><t xml:space='preserve'>");
        write_text(out, text);
        text_literal(out, "</t></is></c>");
    }
}

/* The demonstration trial typed into a spreadsheet gives the cells of its delimited text, text for text. */
static void reads_the_demonstration_the_same(void **state) {
    (void)state;
    struct quayside quayside;
    struct cells wanted, got;
    struct fault fault;
    struct text sheet, zip;
    quayside_make(QUAYSIDE_SEED, &quayside);
    assert_true(read_exact(&wanted, quayside.export_csv.data, quayside.export_csv.length, NULL, &fault));
    text_init(&sheet);
    text_init(&zip);
    text_literal(&sheet, "<worksheet><sheetData><row>");
    for (size_t c = 0; c < wanted.columns; c++) {
        write_cell(&sheet, wanted.names[c]);
    }
    text_literal(&sheet, "</row>");
    for (size_t r = 0; r < wanted.records; r++) {
        text_literal(&sheet, "<row>");
        for (size_t c = 0; c < wanted.columns; c++) {
            write_cell(&sheet, cells_at(&wanted, r, c));
        }
        text_literal(&sheet, "</row>");
    }
    text_literal(&sheet, "</sheetData></worksheet>");
    make_book(&zip, PLAIN_BOOK, sheet.data, NULL);
    if (!read_exact(&got, zip.data, zip.length, NULL, &fault)) {
        fail_msg("%s", fault.message);
    }
    assert_int_equal(got.records, wanted.records);
    assert_int_equal(got.columns, wanted.columns);
    for (size_t c = 0; c < wanted.columns; c++) {
        assert_string_equal(got.names[c], wanted.names[c]);
    }
    for (size_t k = 0; k < wanted.records * wanted.columns; k++) {
        assert_string_equal(got.bytes + got.start[k], wanted.bytes + wanted.start[k]);
    }
    cells_release(&got);
    cells_release(&wanted);
    text_release(&sheet);
    text_release(&zip);
    quayside_release(&quayside);
}

/* Every day from 0001 to 9999 against the calendar's own rule, and numbers against strtod. */
static void shows_days_and_numbers(void **state) {
    (void)state;
    static const int days[] = {31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31};
    int64_t day = days_of(1, 1, 1);
    char got[SHOWN_ROOM], wanted[SHOWN_ROOM];
    for (int year = 1; year <= 9999; year++) {
        for (int month = 1; month <= 12; month++) {
            bool leap = (year % 4 == 0 && year % 100 != 0) || year % 400 == 0;
            int last = days[month - 1] + (month == 2 && leap);
            assert_int_equal(days_of(year, month, last), day + last - 1);
            assert_true(shown_date(got, day));
            snprintf(wanted, sizeof wanted, "%04d-%02d-01", year, month);
            assert_string_equal(got, wanted);
            day += last;
        }
    }
    assert_false(shown_date(got, day));
    assert_int_equal(days_of(1970, 1, 1), 0);
    for (uint64_t i = 0, bits = 88172645463325252u; i < 20000; i++) {
        bits ^= bits << 13, bits ^= bits >> 7, bits ^= bits << 17; /* Marsaglia 2003, "Xorshift RNGs" */
        double value = i % 2 ? (double)(int64_t)bits / 1e15 : ldexp((double)(int64_t)bits, (int)(bits % 1900) - 1000);
        if (!isfinite(value)) {
            continue;
        }
        shown_number(got, value);
        assert_true(fabs(value - strtod(got, NULL)) <= 0);
        float small = (float)value;
        if (isfinite(small)) {
            shown_float(got, small);
            assert_true(fabsf(small - strtof(got, NULL)) <= 0);
        }
    }
    shown_number(got, 0.1);
    assert_string_equal(got, "0.1");
    shown_number(got, 0.1 + 0.2);
    assert_string_equal(got, "0.30000000000000004");
    shown_float(got, 0.1f);
    assert_string_equal(got, "0.1");
    shown_number(got, 5e-324);
    assert_string_equal(got, "4.94065645841247e-324"); /* shorter texts read back too; ours has 15 digits */
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(reads_what_can_be_read),
        cmocka_unit_test(refuses_with_its_sentence),
        cmocka_unit_test(reads_the_sheet_that_is_named),
        cmocka_unit_test(refuses_a_zip_cut_short),
        cmocka_unit_test(stands_any_byte),
        cmocka_unit_test(stands_any_character),
        cmocka_unit_test(refuses_other_files_by_name),
        cmocka_unit_test(reads_delimited_text_as_before),
        cmocka_unit_test(refuses_what_would_exhaust_the_machine),
        cmocka_unit_test(reads_the_demonstration_the_same),
        cmocka_unit_test(shows_days_and_numbers),
    };
    return cmocka_run_group_tests_name("intake/spreadsheet", tests, NULL, NULL);
}

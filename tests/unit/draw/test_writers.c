/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The json, html and csv writers: escaping by table, and JSON read back by cJSON, a parser that is not ours. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>

#include "base/text.h"
#include "draw/csv.h"
#include "draw/html.h"
#include "draw/json.h"
#include "draw/number.h"
#include <cJSON.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

/* Two-character escapes and \u forms as RFC 8259, section 7, has them. */
static const struct {
    const char *value, *json;
} json_strings[] = {
    {"", "\"\""},
    {"plain", "\"plain\""},
    {"a \"quote\" and \\", "\"a \\\"quote\\\" and \\\\\""},
    {"tab\tline\nreturn\r", "\"tab\\tline\\nreturn\\u000d\""},
    {"\x01\x1f\x7f", "\"\\u0001\\u001f\x7f\""},
    {"\u2212 7\u00b71 \U0001F6B6", "\"\u2212 7\u00b71 \U0001F6B6\""},
    {"</script>", "\"</script>\""},
    {NULL, "null"},
};

static void test_json_strings(void **state) {
    (void)state;
    for (size_t i = 0; i < sizeof json_strings / sizeof *json_strings; i++) {
        struct text out;
        text_init(&out);
        struct json json;
        json_init(&json, &out);
        json_string(&json, json_strings[i].value);
        json_finish(&json);
        assert_string_equal(out.data, json_strings[i].json);
        cJSON *read = cJSON_ParseWithOpts(out.data, NULL, 1);
        assert_non_null(read);
        if (json_strings[i].value) {
            assert_string_equal(cJSON_GetStringValue(read), json_strings[i].value);
        } else {
            assert_true(cJSON_IsNull(read));
        }
        cJSON_Delete(read);
        text_release(&out);
    }
}

static const struct {
    double value;
    const char *written;
} numbers[] = {
    {0.0, "0"},
    {-0.0, "0"},
    {1.0, "1"},
    {-41.2, "-41.2"},
    {0.1, "0.1"},
    {0.1 + 0.2, "0.30000000000000004"},
    {1.0 / 3.0, "0.3333333333333333"},
    {100000.0, "100000"},
    {1e15, "1000000000000000"},
    {9007199254740991.0, "9007199254740991"},
    {1e300, "1e+300"},
    {5e-324, "4.94065645841247e-324"},
    {NAN, "null"},
    {INFINITY, "null"},
    {-INFINITY, "null"},
};

static void test_json_numbers(void **state) {
    (void)state;
    for (size_t i = 0; i < sizeof numbers / sizeof *numbers; i++) {
        struct text out;
        text_init(&out);
        struct json json;
        json_init(&json, &out);
        json_number(&json, numbers[i].value);
        json_finish(&json);
        assert_string_equal(out.data, numbers[i].written);
        if (isfinite(numbers[i].value)) {
            assert_true(strtod(out.data, NULL) == numbers[i].value);
        }
        text_release(&out);
    }
}

/* Every double has to come back bit for bit: a walk over magnitudes with a simple congruential generator. */
static void test_numbers_come_back(void **state) {
    (void)state;
    uint64_t seed = 20261201;
    struct text out;
    text_init(&out);
    for (int i = 0; i < 20000; i++) {
        seed = seed * 6364136223846793005u + 1442695040888963407u;
        double value;
        memcpy(&value, &seed, sizeof value);
        if (!isfinite(value)) {
            continue;
        }
        text_clear(&out);
        number_exact(&out, value);
        assert_true(strtod(out.data, NULL) == value);
    }
    text_release(&out);
}

static void test_json_structure(void **state) {
    (void)state;
    struct text out;
    text_init(&out);
    struct json json;
    json_init(&json, &out);
    json_object(&json);
    json_field_string(&json, "exhibit", "effect");
    json_field_integer(&json, "version", INT64_MIN);
    json_field_bool(&json, "locked", false);
    json_field_null(&json, "by");
    json_key_array(&json, "arms");
    for (int i = 0; i < 2; i++) {
        json_object(&json);
        json_field_number(&json, "mean", -4.6 - i);
        json_close(&json);
    }
    json_array(&json);
    json_close(&json);
    json_close(&json);
    json_key_object(&json, "empty");
    json_close(&json);
    json_close(&json);
    json_finish(&json);
    assert_string_equal(out.data,
        "{\"exhibit\":\"effect\",\"version\":-9223372036854775808,\"locked\":false,\"by\":null,"
        "\"arms\":[{\"mean\":-4.6},{\"mean\":-5.6},[]],\"empty\":{}}");
    cJSON *read = cJSON_ParseWithOpts(out.data, NULL, 1);
    assert_non_null(read);
    assert_int_equal(cJSON_GetArraySize(cJSON_GetObjectItemCaseSensitive(read, "arms")), 3);
    cJSON_Delete(read);
    text_release(&out);
}

static const struct {
    const char *value, *text, *attribute;
} escapes[] = {
    {"<b>", "&lt;b&gt;", "&lt;b&gt;"},
    {"Tom & Ann", "Tom &amp; Ann", "Tom &amp; Ann"},
    {"&lt;", "&amp;lt;", "&amp;lt;"},
    {"\" onclick='x", "\" onclick='x", "&quot; onclick=&#39;x"},
    {"a\nb", "a\nb", "a&#10;b"},
    {"a\x01z", "a\uFFFDz", "a\uFFFDz"},
    {"]]>", "]]&gt;", "]]&gt;"},
    {"\u2212 \u00e9", "\u2212 \u00e9", "\u2212 \u00e9"},
};

static void test_html_escapes(void **state) {
    (void)state;
    for (size_t i = 0; i < sizeof escapes / sizeof *escapes; i++) {
        struct text out, want;
        text_init(&out);
        text_init(&want);
        struct html html;
        html_init(&html, &out);
        html_open(&html, "p");
        html_attribute(&html, "title", escapes[i].value);
        html_attribute(&html, "lang", NULL);
        html_text(&html, escapes[i].value);
        html_close(&html);
        html_finish(&html);
        text_format(&want, "<p title=\"%s\">%s</p>", escapes[i].attribute, escapes[i].text);
        assert_string_equal(out.data, want.data);
        text_release(&out);
        text_release(&want);
    }
}

static void test_html_elements(void **state) {
    (void)state;
    struct text out;
    text_init(&out);
    struct html html;
    html_init(&html, &out);
    html_open(&html, "div");
    html_open(&html, "input");
    html_flag(&html, "disabled");
    html_close(&html);
    html_open(&html, "div");
    html_close(&html);
    html_element(&html, "td", "number", "1<2");
    html_open(&html, "svg");
    html_open(&html, "circle");
    html_number_attribute(&html, "cx", 1.0);
    html_number_attribute(&html, "cy", -0.001);
    html_number_attribute(&html, "r", 120.256);
    html_close(&html);
    html_element(&html, "text", NULL, "n");
    html_close(&html);
    html_open(&html, "br");
    html_close(&html);
    html_format(&html, "%d of %s", 61, "72 & more");
    html_number(&html, -0.04, 1, true);
    html_close(&html);
    html_finish(&html);
    assert_string_equal(out.data,
        "<div><input disabled><div></div><td class=\"number\">1&lt;2</td>"
        "<svg><circle cx=\"1\" cy=\"0\" r=\"120.26\"/><text>n</text></svg><br>61 of 72 &amp; more0.0</div>");
    text_release(&out);
}

/* RFC 4180, section 2, rules 5 to 7. */
static const struct {
    const char *value, *field;
} fields[] = {
    {"plain", "plain"},
    {NULL, ""},
    {"", ""},
    {"a,b", "\"a,b\""},
    {"say \"aah\"", "\"say \"\"aah\"\"\""},
    {"two\nlines", "\"two\nlines\""},
    {" edge", "\" edge\""},
    {"edge\t", "\"edge\t\""},
    {"=1+1", "=1+1"},
    {"\u00fc", "\u00fc"},
};

static void test_csv(void **state) {
    (void)state;
    struct text out, want;
    text_init(&out);
    text_init(&want);
    struct csv csv;
    csv_init(&csv, &out);
    for (size_t i = 0; i < sizeof fields / sizeof *fields; i++) {
        csv_string(&csv, fields[i].value);
        csv_integer(&csv, (int64_t)i);
        csv_end(&csv);
        text_format(&want, "%s,%zu\n", fields[i].field, i);
    }
    csv_number(&csv, -0.1);
    csv_number(&csv, NAN);
    csv_number(&csv, 1.0 / 3.0);
    csv_end(&csv);
    text_string(&want, "-0.1,,0.3333333333333333\n");
    assert_string_equal(out.data, want.data);
    text_release(&out);
    text_release(&want);
}

static const struct {
    double step;
    int decimals;
} steps[] = {{5.0, 0}, {20.0, 0}, {1.0, 0}, {0.5, 1}, {0.25, 2}, {0.1, 1}, {0.001, 3}, {0.0, 0}, {-0.02, 2}, {2.5, 1}};

static void test_decimals(void **state) {
    (void)state;
    for (size_t i = 0; i < sizeof steps / sizeof *steps; i++) {
        assert_int_equal(number_decimals(steps[i].step), steps[i].decimals);
    }
}

static const struct {
    double value;
    int decimals;
    bool with_sign;
    const char *shown;
} seen[] = {{-4.649, 1, false, "\u22124.6"}, {2.25, 2, true, "+2.25"}, {-0.04, 1, true, "0.0"},
    {NAN, 1, true, "\u2013"}, {-1e300, 1, false, "\u221210\u00b3\u2070\u2070"},
    {2.5e12, 1, true, "+2.5\u00d710\u00b9\u00b2"}};

static void test_shown(void **state) {
    (void)state;
    for (size_t i = 0; i < sizeof seen / sizeof *seen; i++) {
        struct text out;
        text_init(&out);
        number_shown(&out, seen[i].value, seen[i].decimals, seen[i].with_sign);
        assert_string_equal(out.data, seen[i].shown);
        text_release(&out);
    }
}

/* Widths as Unicode Standard Annex 11 gives them: combining marks none, East Asian wide two. */
static const struct {
    const char *string;
    size_t columns;
} widths[] = {{"", 0}, {"abc", 3}, {"\u2212 4.6", 5}, {"\u00e9", 1}, {"e\u0301", 1}, {"\u6771\u4eac", 4}, {"a\xff", 2}};

static void test_columns(void **state) {
    (void)state;
    for (size_t i = 0; i < sizeof widths / sizeof *widths; i++) {
        assert_int_equal(number_columns(widths[i].string), widths[i].columns);
    }
}

int main(void) {
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_json_strings),
        cmocka_unit_test(test_json_numbers),
        cmocka_unit_test(test_numbers_come_back),
        cmocka_unit_test(test_json_structure),
        cmocka_unit_test(test_html_escapes),
        cmocka_unit_test(test_html_elements),
        cmocka_unit_test(test_csv),
        cmocka_unit_test(test_decimals),
        cmocka_unit_test(test_shown),
        cmocka_unit_test(test_columns),
    };
    return cmocka_run_group_tests_name("draw/writers", tests, NULL, NULL);
}

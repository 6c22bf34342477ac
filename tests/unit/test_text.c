/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/text.h"

#include "../suite.h"

#include <check.h>
#include <stdlib.h>
#include <string.h>

START_TEST(grows)
{
    struct text text = {0};
    text_append(&text, "", 0);
    ck_assert_str_eq(text.bytes, "");
    for (int i = 0; i < 1000; i++)
        text_addf(&text, "%d,", i);
    text_add(&text, "end");
    ck_assert(!text.failed);
    ck_assert_uint_eq(text.length, 10 * 2 + 90 * 3 + 900 * 4 + 3);
    ck_assert_uint_eq(strlen(text.bytes), text.length);
    text_clear(&text);
    ck_assert_uint_eq(text.length, 0);
    ck_assert_str_eq(text.bytes, "");
    text_append(&text, "a\0b", 3);
    ck_assert_mem_eq(text.bytes, "a\0b", 4);
    text_finish(&text);
    ck_assert_ptr_null(text.bytes);
    text_finish(&text);
    text_finish(NULL);
}
END_TEST

START_TEST(remembers_failure)
{
    struct text text = {0};
    text_add(&text, "kept");
    text_append(&text, "", (size_t)-1);
    ck_assert(text.failed);
    text_add(&text, " and more");
    ck_assert_str_eq(text.bytes, "kept");
    text_finish(&text);
}
END_TEST

START_TEST(trims_partial_characters)
{
    static const char *const rows[][2] = {
        {"", ""},
        {"abc", "abc"},
        {"ab\xC3\xA9", "ab\xC3\xA9"},
        {"ab\xC3", "ab"},
        {"ab\xE6\xBC", "ab"},
        {"ab\xE6\xBC\xA2", "ab\xE6\xBC\xA2"},
        {"\xF0\x9F\x94", ""},
        {"a\xF0\x9F\x94\x8C", "a\xF0\x9F\x94\x8C"},
    };
    for (size_t i = 0; i < sizeof rows / sizeof rows[0]; i++) {
        char *text = text_duplicate(rows[i][0]);
        text_trim_partial_character(text);
        ck_assert_str_eq(text, rows[i][1]);
        free(text);
    }
}
END_TEST

/* The limits of the ranges in RFC 3629, section 4. */
START_TEST(knows_utf8)
{
    static const struct {
        const char *bytes;
        int bad; /* −1: none */
    } rows[] = {
        {"", -1},
        {"plain", -1},
        {"\xC2\x80\xDF\xBF", -1},
        {"\xE0\xA0\x80\xED\x9F\xBF\xEE\x80\x80\xEF\xBF\xBF", -1},
        {"\xF0\x90\x80\x80\xF4\x8F\xBF\xBF", -1},
        {"a\x80", 1},
        {"a\xC0\x80", 1},             /* overlong */
        {"ab\xC1\xBF", 2},            /* overlong */
        {"\xE0\x9F\xBF", 0},          /* overlong */
        {"\xED\xA0\x80", 0},          /* surrogate */
        {"\xF0\x8F\xBF\xBF", 0},      /* overlong */
        {"\xF4\x90\x80\x80", 0},      /* beyond U+10FFFF */
        {"\xF5\x80\x80\x80", 0},
        {"x\xFF", 1},
        {"xy\xE2\x82", 2},            /* cut short */
        {"\xE2\x82z", 0},
    };
    for (size_t i = 0; i < sizeof rows / sizeof rows[0]; i++) {
        size_t bad = 99;
        bool good = text_is_utf8(rows[i].bytes, strlen(rows[i].bytes), &bad);
        ck_assert_msg(good == (rows[i].bad < 0), "row %zu", i);
        if (!good)
            ck_assert_int_eq((int)bad, rows[i].bad);
    }
    ck_assert(text_is_utf8("a\0b", 3, NULL));
    ck_assert(!text_is_utf8("\xFF", 1, NULL));
}
END_TEST

START_TEST(counts_columns)
{
    ck_assert_uint_eq(text_columns(""), 0);
    ck_assert_uint_eq(text_columns("P3 to P4"), 8);
    ck_assert_uint_eq(text_columns("0.4 Ω"), 5);
    ck_assert_uint_eq(text_columns("e\xCC\x81t"), 2);   /* a combining acute */
    ck_assert_uint_eq(text_columns("台所"), 4);          /* wide */
    ck_assert_uint_eq(text_columns("a\xFFz"), 3);       /* not UTF-8: one a byte */
}
END_TEST

START_TEST(finds_the_nearest)
{
    static const char *const known[] = {"points", "spurs", "length_accuracy", "l"};
    ck_assert_str_eq(text_nearest("points", known, 4), "points");
    ck_assert_str_eq(text_nearest("ponits", known, 4), "points"); /* changed over: one edit */
    ck_assert_str_eq(text_nearest("spur", known, 4), "spurs");
    ck_assert_str_eq(text_nearest("lenght_acuracy", known, 4), "length_accuracy");
    ck_assert_str_eq(text_nearest("", known, 4), "l");
    ck_assert_ptr_null(text_nearest("zzzzzzzz", known, 4));
    ck_assert_ptr_null(text_nearest("points", known, 0));
    /* Two edits are within reach of a short word, three are not. */
    ck_assert_str_eq(text_nearest("spXYs", known, 2), "spurs");
    ck_assert_ptr_null(text_nearest("sXYZs", known, 2));

    char long_word[200];
    memset(long_word, 'l', sizeof long_word - 1);
    long_word[sizeof long_word - 1] = '\0';
    ck_assert_ptr_null(text_nearest(long_word, known, 4));
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("text");
    TCase *all = tcase_create("text");
    tcase_add_test(all, grows);
    tcase_add_test(all, remembers_failure);
    tcase_add_test(all, trims_partial_characters);
    tcase_add_test(all, knows_utf8);
    tcase_add_test(all, counts_columns);
    tcase_add_test(all, finds_the_nearest);
    suite_add_tcase(suite, all);

    return run_suite(suite);
}

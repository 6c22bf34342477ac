/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Filling to a narrow screen, and cells of a table. */
#include "report/wrap.h"

#include "../suite.h"

#include <check.h>
#include <string.h>

static struct text out;

static void start(void)
{
    out = (struct text){0};
}

static void finish(void)
{
    text_finish(&out);
}

/* Every line within the columns, and how many there are. */
static size_t lines_within(size_t columns)
{
    size_t n = 0;
    for (char *at = out.bytes, *end; (end = strchr(at, '\n')) != NULL; at = end + 1, n++) {
        *end = '\0';
        ck_assert_msg(text_columns(at) <= columns, "too wide: %s", at);
        *end = '\n';
    }
    return n;
}

START_TEST(fills_and_indents)
{
    wrap_words(&out, "- ", "  ", "one  two\nthree");
    ck_assert_str_eq(out.bytes, "- one two three\n");
    text_clear(&out);
    char words[400] = "";
    for (size_t i = 0; i < 40; i++)
        strcat(words, "seven77 ");
    wrap_words(&out, "- ", "  ", words);
    ck_assert_uint_eq(lines_within(REPORT_COLUMNS), 5); /* 8 words of 8 columns behind 2 */
    ck_assert(strncmp(strchr(out.bytes, '\n') + 1, "  seven77", 9) == 0);
}
END_TEST

START_TEST(a_line_is_full_at_72_and_not_before)
{
    char words[80];
    memset(words, 'a', 35);
    words[35] = ' ';
    memset(words + 36, 'b', 36);
    words[72] = '\0';
    wrap_words(&out, "", "", words);
    ck_assert_uint_eq(lines_within(72), 1);
    text_clear(&out);
    words[72] = 'b';
    words[73] = '\0';
    wrap_words(&out, "", "", words);
    ck_assert_uint_eq(lines_within(72), 2);
}
END_TEST

START_TEST(breaks_a_word_wider_than_a_line)
{
    char word[201];
    memset(word, 'x', 200);
    word[200] = '\0';
    wrap_words(&out, "", "", word);
    ck_assert_uint_eq(lines_within(72), 3);
    text_clear(&out);
    wrap_words(&out, "", "",
               "台所台所台所台所台所台所台所台所台所台所台所台所台所台所台所台所台所台所台所台所");
    ck_assert_uint_eq(lines_within(72), 2);
}
END_TEST

/* Written by hand: a character that steers the terminal shows as a question mark; the no-break space
 * holds its words together and prints as a space. */
START_TEST(shows_no_control_characters)
{
    wrap_words(&out, "", "",
               "a\033[31mb \x7f \xc2\x9b"
               "c 5\u00A0%");
    ck_assert_str_eq(out.bytes, "a?[31mb ? ?c 5 %\n");
}
END_TEST

START_TEST(no_break_spaces_hold)
{
    char words[100];
    memset(words, 'a', 69);
    strcpy(words + 69, " 9\u00A0%");
    wrap_words(&out, "", "", words);
    ck_assert_uint_eq(lines_within(72), 2);
    ck_assert_ptr_nonnull(strstr(out.bytes, "\n9 %\n"));
}
END_TEST

START_TEST(cells_fit)
{
    cell_left(&out, "ab", 4);
    cell_right(&out, "Ω", 3);
    cell_left(&out, "abcdef", 4);
    cell_left(&out, "abcd", 4);
    ck_assert_str_eq(out.bytes, "ab    Ωabc…abcd");
    text_clear(&out);
    cell_left(&out, "台所台", 4);
    ck_assert_uint_eq(text_columns(out.bytes), 4);
    text_clear(&out);
    cell_heading(&out, "too long", 4);
    ck_assert_str_eq(out.bytes, "too long\n    ");
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("wrap");
    TCase *cases = tcase_create("wrap");
    suite_add_tcase(suite, cases);
    tcase_add_checked_fixture(cases, start, finish);
    tcase_add_test(cases, fills_and_indents);
    tcase_add_test(cases, a_line_is_full_at_72_and_not_before);
    tcase_add_test(cases, breaks_a_word_wider_than_a_line);
    tcase_add_test(cases, shows_no_control_characters);
    tcase_add_test(cases, no_break_spaces_hold);
    tcase_add_test(cases, cells_fit);
    return run_suite(suite);
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/expected_text.h"

#include "report/words.h"
#include "report/wrap.h"

#include <math.h>

enum { PLACE_COLUMNS = 30, CELL_COLUMNS = 10, READ_COLUMNS = 12 };

static void heading(const struct expected_sheet *sheet, struct text *out)
{
    static const char *const names[N_CONDUCTORS] = {"r1", "rn", "r2"};
    struct text words = {0};
    text_addf(&words, "%s: what a ring wired as recorded would read, Ω. ", rf_job_name(sheet->job));
    text_add(&words, sheet->given_ends
                         ? "Given the end-to-end readings; those themselves by the record. "
                         : "By the recorded lengths and cable. ");
    text_add(&words, "19 of 20 readings lie between from and to.");
    for (size_t i = 0; i < N_CONDUCTORS; i++)
        if (sheet->left_out[i])
            text_addf(&words, " %s does not go with the others and the record: left out.",
                      names[i]);
    if (!words.failed)
        wrap_words(out, "", "", words.bytes);
    out->failed = out->failed || words.failed;
    text_finish(&words);
}

static void set_up_row(size_t setup, struct text *out)
{
    struct text name = {0};
    say_set_up(setup, &name);
    text_add(out, "\n");
    cell_heading(out, name.failed ? "" : name.bytes, PLACE_COLUMNS);
    cell_right(out, "expected", CELL_COLUMNS);
    cell_right(out, "from", CELL_COLUMNS);
    cell_right(out, "to", CELL_COLUMNS);
    cell_right(out, "as read", READ_COLUMNS);
    text_add(out, "\n");
    out->failed = out->failed || name.failed;
    text_finish(&name);
}

static void ohm_cell(struct text *out, double ohms, size_t columns)
{
    struct text words = {0};
    say_ohms(ohms, &words);
    cell_right(out, words.failed ? "" : words.bytes, columns);
    out->failed = out->failed || words.failed;
    text_finish(&words);
}

/* To the display's digits, so that what looks inside is inside. */
static bool outside(const struct expected *expected, const struct reading *reading)
{
    if (reading->open || expected->open)
        return reading->open != expected->open;
    return reading->ohms < round(100 * expected->low) / 100 - 1e-9 ||
           reading->ohms > round(100 * expected->high) / 100 + 1e-9;
}

static void row(const struct expected_sheet *sheet, size_t i, const struct reading *reading,
                struct text *out)
{
    const struct measurement *at = &sheet->measurements[i];
    const struct expected *expected = &sheet->expected[i];
    struct text place = {0};
    text_add(&place, reading != NULL && outside(expected, reading) ? "* " : "  ");
    say_spot(sheet->job, at->spot, at->place, &place);
    if (reading != NULL && reading->repeat > 0)
        text_add(&place, ", again");
    cell_left(out, place.failed ? "" : place.bytes, PLACE_COLUMNS);
    ohm_cell(out, expected->open ? (double)NAN : expected->ohms, CELL_COLUMNS);
    if (expected->open && reading != NULL) {
        cell_right(out, "", 2 * CELL_COLUMNS);
    } else if (!expected->open) {
        ohm_cell(out, expected->low, CELL_COLUMNS);
        ohm_cell(out, expected->high, CELL_COLUMNS);
    }
    if (reading != NULL)
        ohm_cell(out, reading->open ? (double)NAN : reading->ohms, READ_COLUMNS);
    text_add(out, "\n");
    out->failed = out->failed || place.failed;
    text_finish(&place);
}

/* A row for each reading that was taken there, or one without. Answers how many lie outside. */
static size_t rows(const struct expected_sheet *sheet, size_t i, struct text *out)
{
    size_t taken = 0, n_outside = 0;
    for (size_t j = 0; j < sheet->job->n_readings; j++) {
        const struct reading *reading = &sheet->job->readings[j];
        const struct measurement of = {reading->setup, reading->spot, reading->place};
        if (!measurement_equal(&of, &sheet->measurements[i]))
            continue;
        row(sheet, i, reading, out);
        n_outside += outside(&sheet->expected[i], reading);
        taken++;
    }
    if (taken == 0)
        row(sheet, i, NULL, out);
    return n_outside;
}

void report_expected(const struct expected_sheet *sheet, struct text *out)
{
    size_t n_outside = 0;
    heading(sheet, out);
    for (size_t i = 0; i < sheet->n; i++) {
        if (i == 0 || sheet->measurements[i].setup != sheet->measurements[i - 1].setup)
            set_up_row(sheet->measurements[i].setup, out);
        n_outside += rows(sheet, i, out);
    }
    if (n_outside > 0)
        text_add(out, "\n* outside its range: ringfettle diagnose says what may be behind it\n");
}

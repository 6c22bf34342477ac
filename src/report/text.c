/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/report.h"
#include "report/said.h"
#include "report/words.h"
#include "report/wrap.h"

#include <ctype.h>
#include <math.h>

enum { PLACE_COLUMNS = 32, OHM_COLUMNS = 12 };

/* A heading stands in capitals; what is not ASCII in it stays. */
static void text_heading(struct text *out, const char *heading)
{
    struct text capitals = {0};
    text_add(&capitals, heading);
    for (size_t i = 0; i < capitals.length; i++)
        if ((unsigned char)capitals.bytes[i] < 128)
            capitals.bytes[i] = (char)toupper((unsigned char)capitals.bytes[i]);
    text_addf(out, "\n%s\n", capitals.failed ? "" : capitals.bytes);
    out->failed = out->failed || capitals.failed;
    text_finish(&capitals);
}

/* --- sections of lines --- */

/* "  71 %  words", wrapped. */
static void chance_line(double chance, const char *words, struct text *out)
{
    struct text percent = {0}, first = {0};
    say_chance(chance, &percent);
    if (!percent.failed)
        cell_right(&first, percent.bytes, 6);
    text_add(&first, "  ");
    if (percent.failed || first.failed)
        out->failed = true;
    else
        wrap_words(out, first.bytes, "        ", words);
    text_finish(&percent);
    text_finish(&first);
}

/* A section of what is said: plain lines begin with `first` and go on with `rest`. */
static void lines(const char *heading, const char *first, const char *rest, struct said *said,
                  struct text *out)
{
    if (said->n > 0)
        text_heading(out, heading);
    for (size_t i = 0; i < said->n; i++) {
        const struct said_line *line = &said->lines[i];
        if (line->kind == LINE_CHANCE)
            chance_line(line->chance, line->words, out);
        else if (line->kind == LINE_UNDER)
            wrap_words(out, "        ", "        ", line->words);
        else
            wrap_words(out, first, rest, line->words);
    }
    out->failed = out->failed || said->failed;
    said_finish(said);
}

struct lines_section {
    const char *heading;
    void (*say)(const struct rf_diagnosis *diagnosis, struct said *said);
    const char *first, *rest;
};

/* What is needed at once stands first; no table stands before the plan. */
static const struct lines_section before_plan[] = {
    {HEADING_MISFIT, say_misfit, "", ""},     {HEADING_DANGER, say_dangers, "", ""},
    {HEADING_CHECKS, say_checks, "", ""},     {HEADING_WHERE, say_where_first, "", ""},
    {HEADING_FINDINGS, say_findings, "", ""},
};
static const struct lines_section behind_tables[] = {
    {HEADING_FIGURES, say_figures, "", "  "},
    {HEADING_CAUTIONS, say_cautions, "- ", "  "},
};

static void say_sections(const struct lines_section sections[], size_t n,
                         const struct rf_diagnosis *diagnosis, struct text *out)
{
    for (size_t i = 0; i < n; i++) {
        struct said said = {0};
        sections[i].say(diagnosis, &said);
        lines(sections[i].heading, sections[i].first, sections[i].rest, &said, out);
    }
}

/* --- readings --- */

static void ohm_cell(struct text *out, double ohms)
{
    struct text words = {0};
    say_ohms(ohms, &words);
    cell_right(out, words.failed ? "" : words.bytes, OHM_COLUMNS);
    out->failed = out->failed || words.failed;
    text_finish(&words);
}

static void reading_row(const struct rf_diagnosis *diagnosis, size_t i, struct text *out)
{
    const struct reading *reading = &diagnosis->job->readings[i];
    struct text place = {0};
    text_add(&place, is_suspect(diagnosis, i) ? "* " : "  ");
    say_spot(diagnosis->job, reading->spot, reading->place, &place);
    if (reading->repeat > 0)
        text_add(&place, ", again");
    cell_left(out, place.failed ? "" : place.bytes, PLACE_COLUMNS);
    ohm_cell(out, reading->open ? (double)NAN : reading->ohms);
    ohm_cell(out, diagnosis->n_ranked > 0 ? diagnosis->ranked[0].fitted[i] : (double)NAN);
    ohm_cell(out, diagnosis->sound[i]);
    text_add(out, "\n");
    out->failed = out->failed || place.failed;
    text_finish(&place);
}

/* The heading of a set-up's rows; the first carries the columns' names. */
static void set_up_row(size_t setup, bool first, struct text *out)
{
    struct text name = {0};
    say_set_up(setup, &name);
    if (!name.failed && first) {
        cell_heading(out, name.bytes, PLACE_COLUMNS);
        cell_right(out, "as read", OHM_COLUMNS);
        cell_right(out, "fitted", OHM_COLUMNS);
        cell_right(out, "no defect", OHM_COLUMNS);
    } else if (!name.failed) {
        text_add(out, name.bytes);
    }
    text_add(out, "\n");
    out->failed = out->failed || name.failed;
    text_finish(&name);
}

static void text_readings(const struct rf_diagnosis *diagnosis, struct text *out)
{
    const struct rf_job *job = diagnosis->job;
    bool first = true;
    text_heading(out, HEADING_READINGS);
    wrap_words(out, "", "", READINGS_ABOUT);
    for (size_t setup = 0; setup < N_SETUPS; setup++) {
        bool begun = false;
        for (size_t i = 0; i < job->n_readings; i++) {
            if (job->readings[i].setup != setup)
                continue;
            if (!begun)
                set_up_row(setup, first, out);
            begun = true;
            first = false;
            reading_row(diagnosis, i, out);
        }
    }
    if (diagnosis->n_suspects > 0)
        text_add(out, SUSPECT_ABOUT "\n");
}

/* --- the report --- */

static void header(const struct rf_diagnosis *diagnosis, struct text *out)
{
    const struct rf_job *job = diagnosis->job;
    struct text line = {0};
    text_add(&line, rf_job_name(job));
    if (job->date != NULL)
        text_addf(&line, ", %s", job->date);
    text_add(&line, ": ");
    say_ring(job, &line);
    if (!line.failed)
        wrap_words(out, "", "  ", line.bytes);
    out->failed = out->failed || line.failed;
    text_finish(&line);
}

void report_text(const struct rf_diagnosis *diagnosis, const struct rf_advice *advice,
                 struct text *out)
{
    struct said next = {0}, blind = {0};
    header(diagnosis, out);
    say_sections(before_plan, sizeof before_plan / sizeof before_plan[0], diagnosis, out);
    say_next(advice, &next);
    lines(HEADING_NEXT, "", "", &next, out);
    say_blind_spots(diagnosis, advice, &blind);
    lines(HEADING_BLIND, "- ", "  ", &blind, out);
    text_readings(diagnosis, out);
    say_sections(behind_tables, sizeof behind_tables / sizeof behind_tables[0], diagnosis, out);
}

void report_divider(struct text *out)
{
    text_add(out, "\n");
    for (size_t i = 0; i < REPORT_COLUMNS; i++)
        text_add(out, "=");
    text_add(out, "\n\n");
}

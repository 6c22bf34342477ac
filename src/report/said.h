/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef REPORT_SAID_H
#define REPORT_SAID_H

/* What a report says, section by section, whatever it is then written as: each function adds the
 * lines of one section, or none where it has nothing to say. */

#include "advice/advice.h"
#include "diagnosis/diagnosis.h"

enum line_kind {
    LINE_PLAIN,
    LINE_CHANCE, /* with a chance before it */
    LINE_UNDER   /* one of the same list, without a chance */
};

struct said_line {
    enum line_kind kind;
    double chance; /* LINE_CHANCE */
    size_t about;  /* say_findings: which finding; n_findings: what is left over. Else 0 */
    char *words;
};

/* Zeroed is empty and valid; `failed` once memory was short. */
struct said {
    size_t n, capacity;
    struct said_line *lines;
    bool failed;
};
void said_finish(struct said *said); /* takes zeroed */
/* Takes the words over. */
void said_add(struct said *said, enum line_kind kind, double chance, size_t about,
              struct text *words);

void say_misfit(const struct rf_diagnosis *diagnosis, struct said *said);
void say_dangers(const struct rf_diagnosis *diagnosis, struct said *said);
void say_checks(const struct rf_diagnosis *diagnosis, struct said *said);
void say_where_first(const struct rf_diagnosis *diagnosis, struct said *said);
void say_findings(const struct rf_diagnosis *diagnosis, struct said *said);
/* The plan; `advice` NULL: nothing. */
void say_next(const struct rf_advice *advice, struct said *said);
/* Of the first plan, which there must be: its minutes, and those to the find. */
void say_cost(const struct rf_advice *advice, struct said *said);
/* Each with the reading that would lift it; `advice` NULL: without. */
void say_blind_spots(const struct rf_diagnosis *diagnosis, const struct rf_advice *advice,
                     struct said *said);
void say_figures(const struct rf_diagnosis *diagnosis, struct said *said);
void say_cautions(const struct rf_diagnosis *diagnosis, struct said *said);

/* "kitchen, 2026-03-04: ring of 8 points and 1 spur point, 27 readings": the part behind the colon. */
void say_ring(const struct rf_job *job, struct text *out);

/* The headings, which refer to one another. */
#define HEADING_MISFIT "No one defect explains these readings"
#define HEADING_DANGER "Danger if re-energised"
#define HEADING_CHECKS "First, without a screw"
#define HEADING_WHERE "Where"
#define HEADING_FINDINGS "What it may be"
#define HEADING_NEXT "Next"
#define HEADING_BLIND "Blind spots: these readings could not have shown"
#define HEADING_READINGS "Readings, Ω"
#define HEADING_FIGURES "For the schedule of test results"
#define HEADING_CAUTIONS "Cautions"
#define READINGS_ABOUT                                                                             \
    "As read; as the likeliest explanation has them; as this ring would read without it."
#define SUSPECT_ABOUT "* does not fit the likeliest explanation: read it again"

/* Whether the likeliest explanation is that nothing is wrong, and something explains the readings
 * at all. */
bool shows_no_defect(const struct rf_diagnosis *diagnosis);
bool is_suspect(const struct rf_diagnosis *diagnosis, size_t reading);

/* From which chance on a place is told. */
extern const double place_said;

#endif

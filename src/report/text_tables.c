/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/text_parts.h"
#include "report/words.h"
#include "report/wrap.h"

#include <math.h>

enum { PLACE_COLUMNS = 32, OHM_COLUMNS = 12, BLIND_MOST = 12 };

/* --- blind spots --- */

void text_blind(const struct rf_diagnosis *diagnosis, const struct rf_advice *advice,
                struct text *out)
{
    (void)advice;
    if (diagnosis->n_blind == 0)
        return;
    text_heading(out, "BLIND SPOTS: THESE READINGS COULD NOT HAVE SHOWN");
    for (size_t i = 0; i < diagnosis->n_blind && i < BLIND_MOST; i++)
        wrap_words(out, "- ", "  ", diagnosis->blind[i].words);
    if (diagnosis->n_blind > BLIND_MOST)
        text_addf(out, "- and %zu more kinds of fault\n", diagnosis->n_blind - BLIND_MOST);
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

static bool is_suspect(const struct rf_diagnosis *diagnosis, size_t reading)
{
    for (size_t i = 0; i < diagnosis->n_suspects; i++)
        if (diagnosis->suspects[i].reading == reading)
            return true;
    return false;
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

void text_readings(const struct rf_diagnosis *diagnosis, const struct rf_advice *advice,
                   struct text *out)
{
    const struct rf_job *job = diagnosis->job;
    bool first = true;
    (void)advice;
    text_heading(out, "READINGS, Ω");
    wrap_words(
        out, "", "",
        "As read; as the likeliest explanation has them; as a ring without defect would read "
        "by the recorded lengths and cable.");
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
        text_add(out, "* does not fit the likeliest explanation: read it again\n");
}

/* --- the schedule of test results --- */

/* The mean of the finite readings of a spot; NAN where none is. *taken: whether there is any. */
static double mean_reading(const struct rf_job *job, enum spot spot, bool *taken)
{
    double sum = 0;
    size_t n = 0;
    *taken = false;
    for (size_t i = 0; i < job->n_readings; i++) {
        const struct reading *reading = &job->readings[i];
        if (setups[reading->setup].joining != JOIN_NOTHING_END_TO_END || reading->spot != spot)
            continue;
        *taken = true;
        if (!reading->open) {
            sum += reading->ohms;
            n++;
        }
    }
    return n > 0 ? sum / (double)n : (double)NAN;
}

struct end_to_end {
    const char *name;
    enum spot spot;
    bool cpc;
};
static const struct end_to_end end_to_end[N_CONDUCTORS] = {
    {"r1", SPOT_L, false},
    {"rn", SPOT_N, false},
    {"r2", SPOT_E, true},
};

/* Whether all runs of the ring are of the ring's own sizes, so that resistance tells length. */
static bool one_cable(const struct rf_job *job)
{
    for (size_t run = 0; run <= job->n_ring; run++) {
        const struct place *place = &job->places[run_far_end(run)];
        if (place->own_live || place->own_cpc)
            return false;
    }
    return true;
}

static double recorded_metres(const struct rf_job *job)
{
    double metres = 0; /* NAN as soon as one run is not known */
    for (size_t run = 0; run <= job->n_ring; run++)
        metres += job->places[run_far_end(run)].run_m;
    return metres;
}

static void say_resistances(const struct rf_job *job, struct text *out)
{
    size_t n = 0;
    for (size_t i = 0; i < N_CONDUCTORS; i++) {
        bool taken = false;
        double ohms = mean_reading(job, end_to_end[i].spot, &taken);
        if (!taken)
            continue;
        text_addf(out, "%s%s ", n++ > 0 ? ", " : "", end_to_end[i].name);
        say_ohms_unit(ohms, out);
    }
    text_add(out, n > 0 ? ", as read." : "r1, rn and r2: not read.");
}

static void say_lengths(const struct rf_diagnosis *diagnosis, struct text *out)
{
    const struct rf_job *job = diagnosis->job;
    size_t n = 0;
    for (size_t i = 0; i < N_CONDUCTORS && one_cable(job); i++) {
        bool taken = false;
        double ohms = mean_reading(job, end_to_end[i].spot, &taken);
        double mm2 = end_to_end[i].cpc ? job->cpc_mm2 : job->live_mm2;
        double metres = ohms / models_ohm_per_m(diagnosis->models, mm2, job->temperature_c);
        if (!isfinite(metres))
            continue;
        text_addf(out, "%s%.0f m by %s", n++ > 0 ? ", " : "Cable they imply: ", metres,
                  end_to_end[i].name);
    }
    if (n == 0)
        return;
    text_addf(out, ", as %g", job->live_mm2);
    if (!isnan(job->cpc_mm2))
        text_addf(out, "/%g", job->cpc_mm2);
    text_addf(out, " mm² copper at %g °C.", job->temperature_c);
    if (!isnan(recorded_metres(job)))
        text_addf(out, " Recorded: %.0f m.", recorded_metres(job));
}

/* The highest crossed line-CPC reading at a point; NULL where there is none. *points: how many
 * points have one; 0 where only the highest was noted. */
static const struct reading *highest_r1_r2(const struct rf_job *job, size_t *points)
{
    const struct reading *highest = NULL;
    *points = 0;
    for (size_t i = 0; i < job->n_readings; i++) {
        const struct reading *reading = &job->readings[i];
        const struct setup *setup = &setups[reading->setup];
        bool at_point = reading->spot == SPOT_POINT;
        if (setup->joining != JOIN_CROSS || setup->pair != PAIR_LE || reading->open ||
            (!at_point && reading->spot != SPOT_HIGHEST))
            continue;
        *points += at_point && reading->repeat == 0;
        if (highest == NULL || reading->ohms > highest->ohms)
            highest = reading;
    }
    return highest;
}

static void say_r1_r2(const struct rf_diagnosis *diagnosis, struct text *out)
{
    const struct rf_job *job = diagnosis->job;
    size_t points = 0, fronts = 0;
    const struct reading *highest = highest_r1_r2(job, &points);
    for (size_t place = 0; place < job->n_places; place++)
        fronts += place_has_front(job, place);
    if (!shows_no_defect(diagnosis)) {
        text_add(out, "Highest R1+R2: not given while a defect stands.");
    } else if (highest == NULL) {
        text_add(out, "Highest R1+R2: no crossed line-CPC reading at a point.");
    } else {
        text_add(out, "Highest R1+R2 ");
        say_ohms_unit(highest->ohms, out);
        if (highest->spot == SPOT_POINT) {
            text_add(out, ", at ");
            say_spot(job, highest->spot, highest->place, out);
        }
        if (points < fronts && highest->spot == SPOT_POINT)
            text_addf(out, "; only %zu of %zu points were read", points, fronts);
        text_add(out, ".");
    }
}

void text_figures(const struct rf_diagnosis *diagnosis, const struct rf_advice *advice,
                  struct text *out)
{
    (void)advice;
    struct text lines[3] = {{0}};
    say_resistances(diagnosis->job, &lines[0]);
    say_r1_r2(diagnosis, &lines[1]);
    say_lengths(diagnosis, &lines[2]);
    text_heading(out, "FOR THE SCHEDULE OF TEST RESULTS");
    for (size_t i = 0; i < sizeof lines / sizeof lines[0]; i++) {
        if (lines[i].bytes != NULL && !lines[i].failed)
            wrap_words(out, "", "  ", lines[i].bytes);
        out->failed = out->failed || lines[i].failed;
        text_finish(&lines[i]);
    }
}

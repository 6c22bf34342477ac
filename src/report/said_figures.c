/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/said.h"

#include "report/words.h"

#include <math.h>

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
    if (diagnosis->misfit.flag) {
        text_add(out, "Highest R1+R2: not given while nothing explains the readings.");
    } else if (!shows_no_defect(diagnosis)) {
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

void say_figures(const struct rf_diagnosis *diagnosis, struct said *said)
{
    struct text lines[3] = {{0}};
    say_resistances(diagnosis->job, &lines[0]);
    say_r1_r2(diagnosis, &lines[1]);
    say_lengths(diagnosis, &lines[2]);
    for (size_t i = 0; i < sizeof lines / sizeof lines[0]; i++) {
        said->failed = said->failed || lines[i].failed;
        if (lines[i].bytes != NULL)
            said_add(said, LINE_PLAIN, 0, 0, &lines[i]);
        text_finish(&lines[i]);
    }
}

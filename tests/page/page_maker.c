/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A page of a job whose diagnosis is made up, since diagnosing 200 points takes longer than a test
 * may: a joint of three runs, places with chances, readings fitted by nothing. */

#include "report/page.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { MEMBERS = 3 };

static int make(const char *path)
{
    struct rf_error error = {0};
    struct rf_job_reader *reader = NULL;
    struct rf_job *job = NULL;
    struct rf_models *models = NULL;
    struct rf_diagnosis diagnosis = {0};
    struct ranked ranked[MEMBERS];
    size_t members[MEMBERS] = {0, 1, 2};
    char words[] = "made up: a poor joint in one of three runs";
    struct finding finding = {
        .words = words, .confidence = 0.8, .n_members = MEMBERS, .members = members};
    struct place_chance places[2 * MEMBERS];
    struct text out = {0};
    if (rf_job_reader_open(path, &reader, &error) != RF_OK ||
        rf_job_reader_next(reader, &job, &error) != RF_OK || job == NULL ||
        rf_models_load(NULL, RF_RATES_CONSULTED, &models, &error) != RF_OK ||
        wiring_init(&diagnosis.ring, job, models, &error) != RF_OK) {
        fprintf(stderr, "%s\n", error.text);
        return 1;
    }
    size_t d = (size_t)diagnosis.ring.n_parameters + 1;
    double *theta = calloc(d, sizeof *theta), *factor = calloc(d * d, sizeof *factor);
    double *ohms = calloc(job->n_readings, sizeof *ohms);
    if (theta == NULL || factor == NULL || ohms == NULL)
        return 1;
    for (size_t i = 0; i < d; i++)
        factor[i * d + i] = 1;
    for (size_t i = 0; i < MEMBERS; i++) {
        memset(&ranked[i], 0, sizeof ranked[i]);
        ranked[i].hypothesis.n_faults = 1;
        ranked[i].hypothesis.faults[0].family = &fault_family_joint;
        ranked[i].hypothesis.faults[0].run = job->n_ring / 3 + i;
        ranked[i].hypothesis.faults[0].conductor = NEUTRAL;
        ranked[i].confidence = 0.8 / MEMBERS;
        ranked[i].estimates[0].known = true;
        ranked[i].words = words;
        ranked[i].n_parameters = d;
        ranked[i].theta = theta;
        ranked[i].factor = factor;
        ranked[i].fitted = ohms;
        places[2 * i] = (struct place_chance){
            {.kind = LOOK_OPEN, .where = LOOK_AT_PLACE, .index = job->n_ring / 3 + i}, 0.2};
        places[2 * i + 1] = (struct place_chance){
            {.kind = LOOK_OPEN, .where = LOOK_IN_RUN, .index = job->n_ring / 3 + i}, 0.05};
    }
    diagnosis.job = job;
    diagnosis.models = models;
    diagnosis.n_ranked = MEMBERS;
    diagnosis.ranked = ranked;
    diagnosis.n_findings = 1;
    diagnosis.findings = &finding;
    diagnosis.n_places = 2 * MEMBERS;
    diagnosis.places = places;
    diagnosis.sound = ohms;
    enum rf_status status = report_page(&diagnosis, NULL, &out, &error);
    if (status == RF_OK)
        fwrite(out.bytes, 1, out.length, stdout);
    else
        fprintf(stderr, "%s\n", error.text);
    text_finish(&out);
    free(theta);
    free(factor);
    free(ohms);
    wiring_finish(&diagnosis.ring);
    rf_models_destroy(models);
    rf_job_destroy(job);
    rf_job_reader_close(reader);
    return status == RF_OK ? 0 : 1;
}

int main(int argc, char *argv[])
{
    return argc == 2 ? make(argv[1]) : 2;
}

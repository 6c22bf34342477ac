/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "job/job.h"

#include "base/text.h"

#include <cjson/cJSON.h>
#include <stdlib.h>
#include <string.h>

const char *const kind_names[N_KINDS] = {
    [KIND_SOCKET] = "socket",     [KIND_FCU] = "fcu",     [KIND_JUNCTION_BOX] = "junction_box",
    [KIND_ISOLATOR] = "isolator", [KIND_OTHER] = "other",
};

void rf_job_destroy(struct rf_job *job)
{
    if (job == NULL)
        return;
    for (size_t i = 0; job->places != NULL && i < job->n_places; i++) {
        free(job->places[i].id);
        free(job->places[i].label);
    }
    free(job->places);
    free(job->readings);
    free(job->name);
    free(job->date);
    free(job->note);
    free(job->source);
    cJSON_Delete(job->document);
    free(job);
}

const char *rf_job_name(const struct rf_job *job)
{
    return job->name != NULL ? job->name : job->source;
}

size_t rf_job_points(const struct rf_job *job)
{
    return job->n_ring;
}

size_t rf_job_spurs(const struct rf_job *job)
{
    return job->n_spurs;
}

size_t rf_job_readings(const struct rf_job *job)
{
    return job->n_readings;
}

bool rf_job_has_found(const struct rf_job *job)
{
    return job->found != NULL;
}

size_t job_find_place(const struct rf_job *job, const char *id)
{
    for (size_t i = 0; i < job->n_places; i++)
        if (strcmp(job->places[i].id, id) == 0)
            return i;
    return job->n_places;
}

size_t job_find_run(const struct rf_job *job, size_t one, size_t other)
{
    if (one >= job->n_places || other >= job->n_places)
        return n_runs(job);
    if (place_on_ring(job, one) && place_on_ring(job, other)) {
        if (one + 1 == other)
            return one;
        return other + 1 == one ? other : n_runs(job);
    }
    if (!place_on_ring(job, other) && job->places[other].from == one)
        return other - 1;
    if (!place_on_ring(job, one) && job->places[one].from == other)
        return one - 1;
    return n_runs(job);
}

const char *reading_key(const struct rf_job *job, const struct reading *reading)
{
    return reading->spot == SPOT_POINT ? job->places[reading->place].id : spot_keys[reading->spot];
}

/* --- lists of places --- */

enum {
    STRETCH_LEAST = 3, /* so many ids that follow one another are "P1 to P3" */
    ITEMS_MOST = 8     /* entries of a list before it is shortened */
};

/* Splits "P12" into its stem's length and its number; false where it ends in no number, or in one
 * that is too long to count on or begins with 0. */
static bool split_id(const char *id, size_t *stem, unsigned long *number)
{
    size_t length = strlen(id), at = length;
    while (at > 0 && id[at - 1] >= '0' && id[at - 1] <= '9')
        at--;
    if (at == length || length - at > 8 || (id[at] == '0' && length - at > 1))
        return false;
    *stem = at;
    *number = strtoul(id + at, NULL, 10);
    return true;
}

static bool follows(const char *id, const char *next)
{
    size_t stem, next_stem;
    unsigned long number, next_number;
    return split_id(id, &stem, &number) && split_id(next, &next_stem, &next_number) &&
           stem == next_stem && memcmp(id, next, stem) == 0 && next_number == number + 1;
}

/* How many of the places from `first` to `end` are one entry of the list. */
static size_t stretch(const struct rf_job *job, size_t first, size_t end)
{
    size_t n = 1;
    while (first + n < end && follows(job->places[first + n - 1].id, job->places[first + n].id))
        n++;
    return n >= STRETCH_LEAST ? n : 1;
}

static void list_range(const struct rf_job *job, size_t first, size_t end, struct text *out)
{
    size_t items = 0, written = 0;
    for (size_t i = first; i < end; i += stretch(job, i, end))
        items++;
    for (size_t i = first; i < end;) {
        size_t n = stretch(job, i, end);
        if (items > ITEMS_MOST && written == ITEMS_MOST - 1) {
            text_addf(out, " and %zu more", end - i);
            return;
        }
        if (written > 0)
            text_add(out, written + 1 == items ? " and " : ", ");
        text_add(out, job->places[i].id);
        if (n > 1)
            text_addf(out, " to %s", job->places[i + n - 1].id);
        written++;
        i += n;
    }
}

void job_list_places(const struct rf_job *job, bool ring_only, struct text *out)
{
    list_range(job, 1, place_in(job), out);
    if (ring_only || job->n_spurs == 0)
        return;
    text_add(out, job->n_spurs == 1 ? ", and the spur " : ", and the spurs ");
    list_range(job, place_in(job) + 1, job->n_places, out);
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "job/job_parse.h"

#include "base/error.h"
#include "base/memory.h"
#include "base/text.h"

#include <math.h>
#include <string.h>

static const double over_range = 99.9; /* Ω, the most a job file may say */

/* --- readings --- */

/* What may be read in the set-up, for a message: "a point, board or highest". */
static void list_spots(const struct setup *setup, struct text *out)
{
    size_t left = 0;
    for (size_t spot = 0; spot < N_SPOTS; spot++)
        left += (setup->spots >> spot) & 1u;
    for (size_t spot = 0, n = 0; spot < N_SPOTS; spot++) {
        if (((setup->spots >> spot) & 1u) == 0)
            continue;
        if (n++ > 0)
            text_add(out, n == left ? " or " : ", ");
        text_add(out, spot_keys[spot] != NULL ? spot_keys[spot] : "a point");
    }
}

static enum rf_status fail_spot(const struct json_at *at, const struct setup *setup,
                                struct rf_error *error)
{
    struct text text = {0};
    text_addf(&text, "not read in %s; needs ", setup->name);
    list_spots(setup, &text);
    enum rf_status status =
        text.failed ? fail_memory(error) : json_fail(at, error, RF_REFUSED, "%s", text.bytes);
    text_finish(&text);
    return status;
}

/* Where the key says the meter was put; into the reading's setup, spot and place. */
static enum rf_status parse_spot(const struct json_at *at, const struct rf_job *job,
                                 struct reading *reading, struct rf_error *error)
{
    const struct setup *setup = &setups[reading->setup];
    reading->place = 0;
    for (size_t spot = 0; spot < N_SPOTS; spot++)
        if (spot_keys[spot] != NULL && strcmp(spot_keys[spot], at->key) == 0) {
            reading->spot = (enum spot)spot;
            return (setup->spots >> spot & 1u) != 0 ? RF_OK : fail_spot(at, setup, error);
        }

    if ((setup->spots >> SPOT_POINT & 1u) == 0)
        return fail_spot(at, setup, error);
    reading->spot = SPOT_POINT;
    reading->place = job_find_place(job, at->key);
    if (reading->place == job->n_places)
        return job_fail_no_point(at, job, error);
    if (!place_has_front(job, reading->place))
        return json_fail(at, error, RF_REFUSED,
                         "a junction box has no front to read at; needs a point with a front");
    return RF_OK;
}

/* One value: ohms, or "open". */
static enum rf_status parse_value(const struct json_at *at, struct reading *reading,
                                  struct rf_error *error)
{
    const char *needs = "ohms from 0 to 99.9, \"open\" for over range, or a list of these";
    if (reading->spot == SPOT_HIGHEST)
        needs = "ohms from 0 to 99.9, or a list of these";
    else if (cJSON_IsString(at->value) && strcmp(at->value->valuestring, "open") == 0) {
        reading->open = true;
        reading->ohms = 0.0;
        return RF_OK;
    }
    reading->open = false;
    return json_number(at, 0.0, over_range, needs, &reading->ohms, error);
}

/* Takes the value (into `reading`, which says where) and appends it. */
static enum rf_status add_reading(const struct json_at *at, struct reading *reading,
                                  struct rf_job *job, struct rf_error *error)
{
    if (job->n_readings == JOB_MAX_READINGS)
        return json_fail(at, error, RF_LIMIT, "one reading too many; needs at most %d in a job",
                         JOB_MAX_READINGS);
    enum rf_status status = parse_value(at, reading, error);
    if (status == RF_OK)
        job->readings[job->n_readings++] = *reading;
    return status;
}

/* A value or a list of repeats. */
static enum rf_status parse_reading(const struct json_at *at, struct reading *reading,
                                    struct rf_job *job, struct rf_error *error)
{
    enum rf_status status = RF_OK;
    reading->repeat = 0;
    if (!cJSON_IsArray(at->value) || json_count(at) == 0)
        return add_reading(at, reading, job, error);
    JSON_EACH(at, repeat, i) {
        reading->repeat = i;
        status = add_reading(&repeat, reading, job, error);
        if (status != RF_OK)
            break;
    }
    return status;
}

/* Keys are ids here, and the user's to choose; one that begins x_ and is no id is passed over. */
static bool is_passed_over(const struct json_at *at, const struct rf_job *job)
{
    return json_is_private(at->key) && job_find_place(job, at->key) == job->n_places;
}

static enum rf_status parse_setup(const struct json_at *at, struct rf_job *job,
                                  struct rf_error *error)
{
    struct reading reading = {.setup = setup_find(at->key)};
    enum rf_status status = json_object(at, NULL, 0, error);
    if (status != RF_OK)
        return status;
    job->setup_in_place = reading.setup;
    JSON_EACH(at, spot, i) {
        if (is_passed_over(&spot, job))
            continue;
        status = parse_spot(&spot, job, &reading, error);
        if (status == RF_OK)
            status = parse_reading(&spot, &reading, job, error);
        if (status != RF_OK)
            break;
    }
    return status;
}

/* How many values there are at most, up to the limit. */
static size_t count_values(const struct json_at *readings)
{
    size_t n = 0;
    JSON_EACH(readings, setup, i)
        JSON_EACH(&setup, spot, j)
            n += cJSON_IsArray(spot.value) ? json_count(&spot) : 1;
    return n < JOB_MAX_READINGS ? n : JOB_MAX_READINGS;
}

enum rf_status job_parse_readings(const struct json_at *readings, size_t least, struct rf_job *job,
                                  struct rf_error *error)
{
    const char *names[N_SETUPS];
    for (size_t i = 0; i < N_SETUPS; i++)
        names[i] = setups[i].name;

    job->setup_in_place = N_SETUPS;
    if (readings->value == NULL && least == 0)
        return RF_OK;
    enum rf_status status = json_object(readings, names, N_SETUPS, error);
    if (status != RF_OK)
        return status;
    job->readings = NEW_ARRAY(struct reading, count_values(readings));
    if (job->readings == NULL)
        return fail_memory(error);
    JSON_EACH(readings, setup, i) {
        if (json_is_private(setup.key))
            continue;
        status = parse_setup(&setup, job, error);
        if (status != RF_OK)
            return status;
    }
    if (job->n_readings < least)
        return json_fail(readings, error, RF_REFUSED, "no reading in it; needs at least one");
    return RF_OK;
}

/* --- access, opened, checked --- */

static enum rf_status parse_minutes(const struct json_at *at, double *minutes,
                                    struct rf_error *error)
{
    return json_number(at, 0.0, 10000.0, "minutes from 0 to 10000", minutes, error);
}

static enum rf_status parse_access(const struct json_at *at, double *reach_minutes,
                                   double *open_minutes, struct rf_error *error)
{
    static const char *const keys[] = {"reach", "open"};
    if (cJSON_IsNumber(at->value))
        return parse_minutes(at, open_minutes, error);
    if (!cJSON_IsObject(at->value))
        return json_fail_found(at, error,
                               "minutes to open it, or {\"reach\": minutes, \"open\": minutes}");

    struct json_at reach = json_member(at, "reach"), open = json_member(at, "open");
    enum rf_status status = json_object(at, keys, 2, error);
    if (status == RF_OK && reach.value != NULL)
        status = parse_minutes(&reach, reach_minutes, error);
    if (status == RF_OK && open.value != NULL)
        status = parse_minutes(&open, open_minutes, error);
    return status;
}

/* The point of that id; the ends are places of the ring but no points. */
static enum rf_status find_point(const struct json_at *at, const char *id, const struct rf_job *job,
                                 size_t *place, struct rf_error *error)
{
    *place = job_find_place(job, id);
    if (*place == job->n_places)
        return job_fail_no_point(at, job, error);
    if (place_is_end(job, *place))
        return json_fail(at, error, RF_REFUSED,
                         "the ring's ends are at the board; needs a point's id or board");
    return RF_OK;
}

static enum rf_status parse_accesses(const struct json_at *accesses, struct rf_job *job,
                                     struct rf_error *error)
{
    job->board_open_minutes = NAN;
    if (accesses->value == NULL)
        return RF_OK;
    enum rf_status status = json_object(accesses, NULL, 0, error);
    if (status != RF_OK)
        return status;
    JSON_EACH(accesses, at, i) {
        size_t place;
        if (is_passed_over(&at, job))
            continue;
        if (strcmp(at.key, "board") == 0) {
            status = parse_access(&at, &job->board_reach_minutes, &job->board_open_minutes, error);
        } else {
            status = find_point(&at, at.key, job, &place, error);
            if (status == RF_OK)
                status = parse_access(&at, &job->places[place].reach_minutes,
                                      &job->places[place].open_minutes, error);
        }
        if (status != RF_OK)
            return status;
    }
    return RF_OK;
}

/* Sets the mark of one place of `opened` or `checked`; a place twice is refused. */
static enum rf_status set_mark(const struct json_at *at, bool *mark, struct rf_error *error)
{
    if (*mark)
        return json_fail_found(at, error, "every place once");
    *mark = true;
    return RF_OK;
}

static enum rf_status parse_opened(const struct json_at *at, struct rf_job *job,
                                   struct rf_error *error)
{
    const char *id;
    size_t place;
    enum rf_status status = json_string(at, "a point's id or board", &id, error);
    if (status == RF_OK && strcmp(id, "board") == 0)
        return set_mark(at, &job->board_opened, error);
    if (status == RF_OK)
        status = find_point(at, id, job, &place, error);
    return status == RF_OK ? set_mark(at, &job->places[place].opened, error) : status;
}

static enum rf_status parse_checked(const struct json_at *at, struct rf_job *job,
                                    struct rf_error *error)
{
    static const char needs[] = "the id of a point with a front";
    const char *id;
    enum rf_status status = json_string(at, needs, &id, error);
    if (status != RF_OK)
        return status;
    size_t place = job_find_place(job, id);
    if (place == job->n_places && strcmp(id, "board") != 0)
        return job_fail_no_point(at, job, error);
    if (place == job->n_places || !place_has_front(job, place))
        return json_fail_found(at, error, needs);
    return set_mark(at, &job->places[place].checked, error);
}

enum rf_status job_parse_looks(const struct json_at *document, struct rf_job *job,
                               struct rf_error *error)
{
    struct json_at access = json_member(document, "access");
    struct json_at opened = json_member(document, "opened");
    struct json_at checked = json_member(document, "checked");
    size_t most = job->n_places + 1; /* more could only be repeats */

    enum rf_status status = parse_accesses(&access, job, error);
    if (status == RF_OK && opened.value != NULL)
        status = json_array(&opened, 0, most, "a list of ids, each once", error);
    if (status == RF_OK && checked.value != NULL)
        status = json_array(&checked, 0, most, "a list of ids, each once", error);
    if (status != RF_OK)
        return status;
    JSON_EACH(&opened, at, i) {
        status = parse_opened(&at, job, error);
        if (status != RF_OK)
            return status;
    }
    JSON_EACH(&checked, mark, j) {
        status = parse_checked(&mark, job, error);
        if (status != RF_OK)
            return status;
    }
    return RF_OK;
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "job/job_parse.h"

#include "base/error.h"
#include "base/memory.h"
#include "base/text.h"

#include <float.h>
#include <math.h>
#include <string.h>

static const char mm2_needs[] = "a cross-section in mm², above 0";

/* A number that may be absent; *number then stays as it is. */
static enum rf_status parse_optional(const struct json_at *at, double low, double high,
                                     const char *needs, double *number, struct rf_error *error)
{
    return at->value == NULL ? RF_OK : json_number(at, low, high, needs, number, error);
}

static enum rf_status parse_run_m(const struct json_at *at, double *run_m, struct rf_error *error)
{
    *run_m = NAN;
    if (!json_given(at))
        return RF_OK;
    return json_number(at, 0.1, 500.0, "metres from 0.1 to 500, or null where not known", run_m,
                       error);
}

/* live_mm2 and cpc_mm2 of the ring or of one run; what is absent stays as it is. */
static enum rf_status parse_sizes(const struct json_at *at, double *live_mm2, double *cpc_mm2,
                                  struct rf_error *error)
{
    struct json_at live = json_member(at, "live_mm2"), cpc = json_member(at, "cpc_mm2");
    enum rf_status status = parse_optional(&live, DBL_MIN, DBL_MAX, mm2_needs, live_mm2, error);
    if (status != RF_OK)
        return status;
    if (cJSON_IsNull(cpc.value)) {
        *cpc_mm2 = NAN;
        return RF_OK;
    }
    return parse_optional(&cpc, DBL_MIN, DBL_MAX,
                          "a cross-section in mm², above 0, or null where not known", cpc_mm2,
                          error);
}

static bool is_reserved(const char *id)
{
    for (size_t spot = 0; spot < N_SPOTS; spot++)
        if (spot_keys[spot] != NULL && strcmp(spot_keys[spot], id) == 0)
            return true;
    return false;
}

/* C0, DEL, C1. */
static bool has_control_character(const char *id)
{
    for (const unsigned char *at = (const unsigned char *)id; *at != '\0'; at++)
        if (*at < 0x20 || *at == 0x7F || (*at == 0xC2 && at[1] < 0xA0))
            return true;
    return false;
}

/* Takes the id of places[place]; those before it have theirs. */
static enum rf_status parse_id(const struct json_at *point, struct rf_job *job, size_t place,
                               struct rf_error *error)
{
    struct json_at at = json_member(point, "id");
    const char *id;
    enum rf_status status = json_string(&at, "an id in double quotes", &id, error);
    if (status != RF_OK)
        return status;
    if (id[0] == '\0' || strlen(id) > JOB_MAX_ID)
        return json_fail_found(&at, error, "an id of 1 to 64 bytes");
    if (has_control_character(id))
        return json_fail_found(&at, error, "an id without control characters");
    if (is_reserved(id))
        return json_fail_found(&at, error,
                               "another id: out, in, board, highest, l, n and e are reserved");
    for (size_t i = 0; i < place; i++)
        if (job->places[i].id != NULL && strcmp(job->places[i].id, id) == 0)
            return json_fail_found(&at, error, "an id that no other point has");
    job->places[place].id = text_duplicate(id);
    return job->places[place].id != NULL ? RF_OK : fail_memory(error);
}

/* What ring points and spur points have in common. */
static enum rf_status parse_point(const struct json_at *point, struct rf_job *job, size_t index,
                                  struct rf_error *error)
{
    struct place *place = &job->places[index];
    struct json_at label = json_member(point, "label"), kind = json_member(point, "kind");
    struct json_at run_m = json_member(point, "run_m");
    size_t which = KIND_SOCKET;

    enum rf_status status = parse_id(point, job, index, error);
    if (status == RF_OK)
        status = job_parse_words(&label, &place->label, error);
    if (status == RF_OK && kind.value != NULL)
        status = json_choice(&kind, kind_names, N_KINDS, &which, error);
    if (status == RF_OK)
        status = parse_run_m(&run_m, &place->run_m, error);
    if (status == RF_OK)
        status = parse_sizes(point, &place->live_mm2, &place->cpc_mm2, error);
    place->kind = (enum kind)which;
    place->own_live = cJSON_HasObjectItem(point->value, "live_mm2");
    place->own_cpc = cJSON_HasObjectItem(point->value, "cpc_mm2");
    return status;
}

static enum rf_status parse_points(const struct json_at *points, struct rf_job *job,
                                   struct rf_error *error)
{
    static const char *const keys[] = {"id", "label", "kind", "run_m", "live_mm2", "cpc_mm2"};
    enum rf_status status = RF_OK;
    JSON_EACH(points, point, i) {
        status = json_object(&point, keys, sizeof keys / sizeof keys[0], error);
        if (status == RF_OK)
            status = parse_point(&point, job, i + 1, error);
        if (status != RF_OK)
            break;
    }
    return status;
}

static enum rf_status parse_spurs(const struct json_at *spurs, struct rf_job *job,
                                  struct rf_error *error)
{
    static const char *const keys[] = {"id",    "from",     "label",  "kind",
                                       "run_m", "live_mm2", "cpc_mm2"};
    enum rf_status status = RF_OK;
    JSON_EACH(spurs, spur, i) {
        status = json_object(&spur, keys, sizeof keys / sizeof keys[0], error);
        if (status == RF_OK)
            status = parse_point(&spur, job, job->n_ring + 2 + i, error);
        if (status != RF_OK)
            break;
    }
    return status;
}

/* Whether the way back from a spur point reaches the ring; it takes no more steps than there are
 * spurs, else it is a loop. */
static bool reaches_ring(const struct rf_job *job, size_t place)
{
    for (size_t steps = 0; steps <= job->n_spurs; steps++) {
        if (place_on_ring(job, place))
            return true;
        place = job->places[place].from;
    }
    return false;
}

/* A spur may hang on one that is listed later, so this comes when all have their ids. */
static enum rf_status parse_froms(const struct json_at *spurs, struct rf_job *job,
                                  struct rf_error *error)
{
    const char *id;
    JSON_EACH(spurs, spur, i) {
        struct json_at at = json_member(&spur, "from");
        enum rf_status status =
            json_string(&at, "the id of the place the spur hangs on, or out or in", &id, error);
        if (status != RF_OK)
            return status;
        size_t from = job_find_place(job, id);
        if (from == job->n_places)
            return job_fail_no_point(&at, job, error);
        job->places[job->n_ring + 2 + i].from = from;
    }
    JSON_EACH(spurs, looped, j) {
        struct json_at at = json_member(&looped, "from");
        if (!reaches_ring(job, job->n_ring + 2 + j))
            return json_fail_found(&at, error, "a place that leads to the ring: this is a loop");
    }
    return RF_OK;
}

static enum rf_status make_places(struct rf_job *job, size_t n_ring, size_t n_spurs,
                                  struct rf_error *error)
{
    job->places = NEW_ARRAY(struct place, n_ring + n_spurs + 2);
    if (job->places == NULL)
        return fail_memory(error);
    job->n_ring = n_ring;
    job->n_spurs = n_spurs;
    job->n_places = n_ring + n_spurs + 2;
    for (size_t i = 0; i < job->n_places; i++)
        job->places[i] = (struct place){.from = i > 0 && i <= n_ring + 1 ? i - 1 : 0,
                                        .run_m = NAN,
                                        .live_mm2 = job->live_mm2,
                                        .cpc_mm2 = job->cpc_mm2,
                                        .open_minutes = NAN};
    struct place *out = &job->places[0], *in = &job->places[n_ring + 1];
    out->kind = in->kind = KIND_OTHER;
    out->id = text_duplicate("out");
    in->id = text_duplicate("in");
    return out->id != NULL && in->id != NULL ? RF_OK : fail_memory(error);
}

static enum rf_status parse_order(const struct json_at *ring, struct rf_error *error)
{
    static const char needs[] = "\"known\": other orders are reserved";
    struct json_at at = json_member(ring, "order");
    const char *order;
    if (at.value == NULL)
        return RF_OK;
    enum rf_status status = json_string(&at, needs, &order, error);
    if (status == RF_OK && strcmp(order, "known") != 0)
        status = json_fail_found(&at, error, needs);
    return status;
}

/* The ring's own numbers, with the defaults of what is absent. */
static enum rf_status parse_numbers(const struct json_at *ring, struct rf_job *job,
                                    struct rf_error *error)
{
    struct json_at temperature = json_member(ring, "temperature_c");
    struct json_at accuracy = json_member(ring, "length_accuracy");
    job->live_mm2 = 2.5;
    job->cpc_mm2 = 1.5;
    job->temperature_c = 20.0;
    job->length_accuracy = 0.2;

    enum rf_status status = parse_order(ring, error);
    if (status == RF_OK)
        status = parse_sizes(ring, &job->live_mm2, &job->cpc_mm2, error);
    if (status == RF_OK)
        status = parse_optional(&temperature, -40.0, 90.0, "°C from -40 to 90", &job->temperature_c,
                                error);
    if (status == RF_OK)
        status = parse_optional(&accuracy, DBL_MIN, 2.0, "a number above 0 and at most 2",
                                &job->length_accuracy, error);
    return status;
}

enum rf_status job_parse_ring(const struct json_at *ring, struct rf_job *job,
                              struct rf_error *error)
{
    static const char *const keys[] = {"live_mm2", "cpc_mm2",    "temperature_c", "length_accuracy",
                                       "points",   "last_run_m", "spurs",         "order"};
    struct json_at points = json_member(ring, "points"), spurs = json_member(ring, "spurs");
    struct json_at last = json_member(ring, "last_run_m");

    enum rf_status status = json_object(ring, keys, sizeof keys / sizeof keys[0], error);
    if (status == RF_OK)
        status = parse_numbers(ring, job, error);
    if (status == RF_OK)
        status = json_array(&points, 1, JOB_MAX_POINTS, "a list of 1 to 200 points", error);
    if (status == RF_OK && spurs.value != NULL)
        status = json_array(&spurs, 0, JOB_MAX_POINTS, "a list of at most 200 spur points", error);
    if (status == RF_OK)
        status = make_places(job, json_count(&points), json_count(&spurs), error);
    if (status == RF_OK)
        status = parse_points(&points, job, error);
    if (status == RF_OK)
        status = parse_spurs(&spurs, job, error);
    if (status == RF_OK)
        status = parse_froms(&spurs, job, error);
    if (status == RF_OK)
        status = parse_run_m(&last, &job->places[place_in(job)].run_m, error);
    return status;
}

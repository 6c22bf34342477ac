/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "faults/fault.h"

#include "base/error.h"
#include "base/json.h"

#include <math.h>
#include <string.h>

/* What a field is read against. */
struct reading_of {
    const struct rf_job *job;
    const struct rf_models *models;
    const struct fault_family *family;
};

typedef enum rf_status read_field(const struct json_at *at, const struct reading_of *of,
                                  struct fault *fault, struct rf_error *error);
/* A new value; NULL when memory is short. */
typedef cJSON *write_field(const struct fault *fault, const struct rf_job *job);

/* --- places --- */

static enum rf_status read_place(const struct json_at *at, const struct rf_job *job, size_t *place,
                                 struct rf_error *error)
{
    const char *id;
    enum rf_status status = json_string(at, "a place's id", &id, error);
    if (status != RF_OK)
        return status;
    *place = job_find_place(job, id);
    if (*place < job->n_places)
        return RF_OK;
    struct text needs = {0};
    text_add(&needs, "a place of this ring: ");
    job_list_places(job, false, &needs);
    status = needs.failed ? fail_memory(error) : json_fail_found(at, error, needs.bytes);
    text_finish(&needs);
    return status;
}

static enum rf_status read_two_places(const struct json_at *at, const struct rf_job *job,
                                      size_t places[2], struct rf_error *error)
{
    enum rf_status status = json_array(at, 2, 2, "two places in ring order", error);
    JSON_EACH(at, element, i) {
        if (status == RF_OK)
            status = read_place(&element, job, &places[i], error);
    }
    return status;
}

static enum rf_status refuse_order(const struct json_at *at, const struct rf_job *job,
                                   const size_t found[2], struct rf_error *error)
{
    const char *one = job->places[found[0]].id, *other = job->places[found[1]].id;
    return json_fail(at, error, RF_REFUSED,
                     "found [\"%s\", \"%s\"], not in ring order; right would be [\"%s\", \"%s\"]",
                     one, other, other, one);
}

static enum rf_status read_run(const struct json_at *at, const struct reading_of *of,
                               struct fault *fault, struct rf_error *error)
{
    const struct rf_job *job = of->job;
    size_t places[2];
    enum rf_status status = read_two_places(at, job, places, error);
    if (status != RF_OK)
        return status;
    fault->run = job_find_run(job, places[0], places[1]);
    if (fault->run >= n_runs(job))
        return json_fail(at, error, RF_REFUSED,
                         "no run goes from %s to %s; needs two neighbouring places",
                         job->places[places[0]].id, job->places[places[1]].id);
    if (run_near_end(job, fault->run) != places[0])
        return refuse_order(at, job, places, error);
    if ((of->family->fields & FIELD_RING_RUN) != 0 && !run_on_ring(job, fault->run))
        return json_fail(at, error, RF_REFUSED,
                         "the run %s to %s is a spur's; needs a run of the ring",
                         job->places[places[0]].id, job->places[places[1]].id);
    return RF_OK;
}

static cJSON *write_places(const struct rf_job *job, const size_t places[], size_t n)
{
    cJSON *array = cJSON_CreateArray();
    for (size_t i = 0; i < n && array != NULL; i++) {
        cJSON *id = cJSON_CreateString(job->places[places[i]].id);
        if (id == NULL || !cJSON_AddItemToArray(array, id)) {
            cJSON_Delete(id);
            cJSON_Delete(array);
            array = NULL;
        }
    }
    return array;
}

static cJSON *write_run(const struct fault *fault, const struct rf_job *job)
{
    size_t places[2] = {run_near_end(job, fault->run), run_far_end(fault->run)};
    return write_places(job, places, 2);
}

static enum rf_status read_at(const struct json_at *at, const struct reading_of *of,
                              struct fault *fault, struct rf_error *error)
{
    const struct rf_job *job = of->job;
    enum rf_status status = read_place(at, job, &fault->place, error);
    if (status != RF_OK)
        return status;
    if (place_is_end(job, fault->place))
        return json_fail_found(at, error, "a point, not an end of the ring");
    if ((of->family->fields & FIELD_AT) != 0 && !place_has_front(job, fault->place))
        return json_fail(at, error, RF_REFUSED,
                         "%s is a junction box, which has no face; needs a point with one",
                         job->places[fault->place].id);
    return RF_OK;
}

static cJSON *write_at(const struct fault *fault, const struct rf_job *job)
{
    return cJSON_CreateString(job->places[fault->place].id);
}

/* Two places of which no recorded run joins the one to the other. */
static enum rf_status check_ring_pair(const struct json_at *at, const struct rf_job *job,
                                      const size_t places[2], struct rf_error *error)
{
    const char *one = job->places[places[0]].id, *other = job->places[places[1]].id;
    if (!place_on_ring(job, places[0]) || !place_on_ring(job, places[1]))
        return json_fail(at, error, RF_REFUSED, "%s is on a spur; needs two places of the ring",
                         place_on_ring(job, places[0]) ? other : one);
    if (places[0] == place_out() && places[1] == place_in(job))
        return json_fail(at, error, RF_REFUSED,
                         "out and in are both at the board; needs two places apart");
    if (places[1] == places[0] + 1)
        return json_fail(at, error, RF_REFUSED,
                         "%s and %s are neighbours; needs two places of the ring that are not", one,
                         other);
    return RF_OK;
}

static enum rf_status read_between(const struct json_at *at, const struct reading_of *of,
                                   struct fault *fault, struct rf_error *error)
{
    const struct rf_job *job = of->job;
    size_t places[2];
    enum rf_status status = read_two_places(at, job, places, error);
    if (status != RF_OK)
        return status;
    if (places[0] == places[1])
        return json_fail(at, error, RF_REFUSED, "found %s twice; needs two different places",
                         job->places[places[0]].id);
    if (places[0] > places[1])
        return refuse_order(at, job, places, error);
    if ((of->family->fields & FIELD_BETWEEN_RING) != 0)
        status = check_ring_pair(at, job, places, error);
    else if (place_is_end(job, places[0]) || place_is_end(job, places[1]))
        status = json_fail(at, error, RF_REFUSED, "%s is an end of the ring; needs two points",
                           job->places[place_is_end(job, places[0]) ? places[0] : places[1]].id);
    fault->place = places[0];
    fault->other = places[1];
    return status;
}

static cJSON *write_between(const struct fault *fault, const struct rf_job *job)
{
    size_t places[2] = {fault->place, fault->other};
    return write_places(job, places, 2);
}

/* Whether the chain's points follow one another on the ring, one way or the other. */
static bool is_chain(const struct rf_job *job, const struct fault *fault)
{
    for (size_t i = 0; i < fault->chain_length; i++)
        if (place_is_end(job, fault->chain[i]) || !place_on_ring(job, fault->chain[i]))
            return false;
    bool upwards = true, downwards = true;
    for (size_t i = 1; i < fault->chain_length; i++) {
        upwards = upwards && fault->chain[i] == fault->chain[i - 1] + 1;
        downwards = downwards && fault->chain[i] + 1 == fault->chain[i - 1];
    }
    return upwards || downwards;
}

static enum rf_status read_points(const struct json_at *at, const struct reading_of *of,
                                  struct fault *fault, struct rf_error *error)
{
    const struct rf_job *job = of->job;
    enum rf_status status =
        json_array(at, 1, CHAIN_MAX, "1 to 3 points, in order away from the ring", error);
    JSON_EACH(at, element, i) {
        if (status == RF_OK)
            status = read_place(&element, job, &fault->chain[i], error);
    }
    if (status != RF_OK)
        return status;
    fault->chain_length = json_count(at);
    if (!is_chain(job, fault))
        return json_fail_found(at, error,
                               "neighbouring points of the ring, in order away from the tee");
    if (fault->chain_length >= job->n_ring)
        return json_fail(at, error, RF_REFUSED,
                         "found all the ring's points; needs fewer, or no ring is left");
    return RF_OK;
}

static cJSON *write_points(const struct fault *fault, const struct rf_job *job)
{
    return write_places(job, fault->chain, fault->chain_length);
}

/* --- names --- */

static const char *const fault_conductors[] = {"L", "N", "E", "LNE"};
static const char *const poles_names[] = {[POLES_L] = "L", [POLES_LN] = "LN"};
static const char *const end_names[] = {"out", "in"};

static enum rf_status read_conductor(const struct json_at *at, const struct reading_of *of,
                                     struct fault *fault, struct rf_error *error)
{
    size_t n = (of->family->fields & FIELD_ANY_CONDUCTOR) != 0 ? WHOLE_CABLE + 1 : N_CONDUCTORS;
    size_t index = 0;
    enum rf_status status = json_choice(at, fault_conductors, n, &index, error);
    fault->conductor = (int)index;
    return status;
}

static cJSON *write_conductor(const struct fault *fault, const struct rf_job *job)
{
    (void)job;
    return cJSON_CreateString(fault_conductors[fault->conductor]);
}

static enum rf_status read_poles(const struct json_at *at, const struct reading_of *of,
                                 struct fault *fault, struct rf_error *error)
{
    (void)of;
    size_t index = 0;
    enum rf_status status = json_choice(at, poles_names, POLES_LN + 1, &index, error);
    fault->poles = (enum poles)index;
    return status;
}

static cJSON *write_poles(const struct fault *fault, const struct rf_job *job)
{
    (void)job;
    return cJSON_CreateString(poles_names[fault->poles]);
}

static enum rf_status read_pair(const struct json_at *at, const struct reading_of *of,
                                struct fault *fault, struct rf_error *error)
{
    (void)of;
    size_t index = 0;
    enum rf_status status = json_choice(at, pair_names, N_PAIRS, &index, error);
    fault->pair = (enum pair)index;
    return status;
}

static cJSON *write_pair(const struct fault *fault, const struct rf_job *job)
{
    (void)job;
    return cJSON_CreateString(pair_names[fault->pair]);
}

static enum rf_status read_end_of(const struct json_at *at, size_t first, size_t n,
                                  struct fault *fault, struct rf_error *error)
{
    size_t index = 0;
    enum rf_status status = json_choice(at, end_names + first, n, &index, error);
    fault->leg_in = first + index == 1;
    return status;
}

static enum rf_status read_leg(const struct json_at *at, const struct reading_of *of,
                               struct fault *fault, struct rf_error *error)
{
    (void)of;
    return read_end_of(at, 0, 2, fault, error);
}

/* A link's end: of the set-up read before it, where it has links. */
static enum rf_status read_end(const struct json_at *at, const struct reading_of *of,
                               struct fault *fault, struct rf_error *error)
{
    (void)of;
    switch (setups[fault->setup].joining) {
    case JOIN_LINK_OUT:
        return read_end_of(at, 0, 1, fault, error);
    case JOIN_LINK_IN:
        return read_end_of(at, 1, 1, fault, error);
    default:
        return read_end_of(at, 0, 2, fault, error);
    }
}

static cJSON *write_end(const struct fault *fault, const struct rf_job *job)
{
    (void)job;
    return cJSON_CreateString(end_names[fault->leg_in ? 1 : 0]);
}

static enum rf_status read_setup(const struct json_at *at, const struct reading_of *of,
                                 struct fault *fault, struct rf_error *error)
{
    bool crossed_only = (of->family->fields & FIELD_CROSS_SETUP) != 0;
    const char *names[N_SETUPS];
    size_t n = 0, index = 0;
    for (size_t i = 0; i < N_SETUPS; i++)
        if (crossed_only ? setups[i].joining == JOIN_CROSS : setup_has_links(&setups[i]))
            names[n++] = setups[i].name;
    enum rf_status status = json_choice(at, names, n, &index, error);
    if (status == RF_OK)
        fault->setup = setup_find(names[index]);
    return status;
}

static cJSON *write_setup(const struct fault *fault, const struct rf_job *job)
{
    (void)job;
    return cJSON_CreateString(setups[fault->setup].name);
}

static enum rf_status read_open(const struct json_at *at, const struct reading_of *of,
                                struct fault *fault, struct rf_error *error)
{
    (void)of;
    enum rf_status status = json_boolean(at, &fault->open, error);
    if (status == RF_OK && !fault->open)
        status = json_fail_found(at, error, "true, or the key left out");
    return status;
}

static cJSON *write_open(const struct fault *fault, const struct rf_job *job)
{
    (void)job;
    return cJSON_CreateBool(fault->open);
}

/* --- cable --- */

static enum rf_status read_size(const struct json_at *at, const struct reading_of *of, double *mm2,
                                struct rf_error *error)
{
    const struct rf_models *models = of->models;
    enum rf_status status = json_number(at, 0, 1000, "a conductor size in mm²", mm2, error);
    if (status != RF_OK || !isnan(models_ohm_per_m(models, *mm2, of->job->temperature_c)))
        return status;
    struct text needs = {0};
    text_add(&needs, "a conductor size in mm² that is known: ");
    for (size_t i = 0; i < models->n_sizes; i++)
        text_addf(&needs, "%s%g", i > 0 ? ", " : "", models->sizes[i].mm2);
    status = needs.failed ? fail_memory(error) : json_fail_found(at, error, needs.bytes);
    text_finish(&needs);
    return status;
}

static enum rf_status read_live_mm2(const struct json_at *at, const struct reading_of *of,
                                    struct fault *fault, struct rf_error *error)
{
    return read_size(at, of, &fault->live_mm2, error);
}

static bool same_size(double one, double other)
{
    return fabs(one - other) <= 1e-9 * fabs(other);
}

static enum rf_status read_cpc_mm2(const struct json_at *at, const struct reading_of *of,
                                   struct fault *fault, struct rf_error *error)
{
    enum rf_status status = read_size(at, of, &fault->cpc_mm2, error);
    if (status == RF_OK && same_size(fault->live_mm2, of->job->live_mm2) &&
        same_size(fault->cpc_mm2, of->job->cpc_mm2))
        return json_fail(at->parent, error, RF_REFUSED,
                         "%g/%g mm² is what is recorded; needs another cable", fault->live_mm2,
                         fault->cpc_mm2);
    return status;
}

static cJSON *write_live_mm2(const struct fault *fault, const struct rf_job *job)
{
    (void)job;
    return cJSON_CreateNumber(fault->live_mm2);
}

static cJSON *write_cpc_mm2(const struct fault *fault, const struct rf_job *job)
{
    (void)job;
    return cJSON_CreateNumber(fault->cpc_mm2);
}

/* --- faults --- */

/* In the order they are read and written. */
static const struct field {
    unsigned bits; /* a family with any of these carries it */
    const char *key;
    read_field *read;
    write_field *write;
} fields[] = {
    {FIELD_RUN | FIELD_RING_RUN, "run", read_run, write_run},
    {FIELD_AT | FIELD_AT_ANY, "at", read_at, write_at},
    {FIELD_BETWEEN_RING | FIELD_BETWEEN_POINTS, "between", read_between, write_between},
    {FIELD_POINTS, "points", read_points, write_points},
    {FIELD_CONDUCTOR | FIELD_ANY_CONDUCTOR, "conductor", read_conductor, write_conductor},
    {FIELD_POLES, "poles", read_poles, write_poles},
    {FIELD_PAIR, "pair", read_pair, write_pair},
    {FIELD_CABLE, "live_mm2", read_live_mm2, write_live_mm2},
    {FIELD_CABLE, "cpc_mm2", read_cpc_mm2, write_cpc_mm2},
    {FIELD_LEG, "leg", read_leg, write_end},
    {FIELD_CROSS_SETUP | FIELD_LINK_SETUP, "setup", read_setup, write_setup},
    {FIELD_LINK_SETUP, "end", read_end, write_end},
    {FIELD_OPEN, "open", read_open, write_open},
};

enum { N_FIELDS = sizeof fields / sizeof fields[0], OTHER_KEYS = 4 };

static bool carries(const struct fault_family *family, const struct field *field)
{
    return (family->fields & field->bits) != 0;
}

static enum rf_status read_family(const struct json_at *object, const struct fault_family **family,
                                  struct rf_error *error)
{
    const char *names[MODELS_MAX_FAMILIES];
    size_t n = 0, index = 0;
    for (; n < n_fault_families && n < MODELS_MAX_FAMILIES; n++)
        names[n] = fault_families[n]->name;
    struct json_at at = json_member(object, "family");
    enum rf_status status = json_choice(&at, names, n, &index, error);
    *family = status == RF_OK ? fault_families[index] : NULL;
    return status;
}

static enum rf_status refuse_field(const struct json_at *at, const struct fault_family *family,
                                   struct rf_error *error)
{
    struct text carried = {0};
    text_add(&carried, "family");
    for (size_t i = 0; i < N_FIELDS; i++)
        if (carries(family, &fields[i]))
            text_addf(&carried, ", %s", fields[i].key);
    enum rf_status status = carried.failed
                                ? fail_memory(error)
                                : json_fail(at, error, RF_REFUSED,
                                            "a fault of the family %s has no such field; it has %s",
                                            family->name, carried.bytes);
    text_finish(&carried);
    return status;
}

static enum rf_status check_keys(const struct json_at *object, const struct fault_family *family,
                                 struct rf_error *error)
{
    const char *known[N_FIELDS + OTHER_KEYS] = {"family", "also", "ohms", "metres"};
    size_t n = OTHER_KEYS;
    for (size_t i = 0; i < N_FIELDS; i++) {
        struct json_at member = json_member(object, fields[i].key);
        if (carries(family, &fields[i]))
            known[n++] = fields[i].key;
        else if (member.value != NULL)
            return refuse_field(&member, family, error);
    }
    return json_object(object, known, n, error);
}

static enum rf_status read_fault(const struct json_at *object, const struct rf_job *job,
                                 const struct rf_models *models, struct fault *fault,
                                 struct rf_error *error)
{
    *fault = (struct fault){0};
    enum rf_status status = json_object(object, NULL, 0, error);
    if (status == RF_OK)
        status = read_family(object, &fault->family, error);
    if (status == RF_OK)
        status = check_keys(object, fault->family, error);
    const struct reading_of of = {.job = job, .models = models, .family = fault->family};
    for (size_t i = 0; i < N_FIELDS && status == RF_OK; i++) {
        struct json_at member = json_member(object, fields[i].key);
        bool optional = fields[i].bits == FIELD_OPEN && member.value == NULL;
        if (carries(fault->family, &fields[i]) && !optional)
            status = fields[i].read(&member, &of, fault, error);
    }
    return status;
}

enum rf_status fault_from_json(const struct cJSON *object, const struct rf_job *job,
                               const struct rf_models *models, const char *path,
                               struct fault *fault, struct rf_error *error)
{
    /* A step a name between the path's dots; what does not fit stays in the last. */
    enum { STEPS = 4 };
    char names[STEPS][JOB_MAX_ID];
    struct json_at steps[STEPS + 1] = {json_document(object, job->source)};
    size_t n = 0;
    for (; n < STEPS && *path != '\0'; n++) {
        size_t length = strcspn(path, ".");
        size_t kept = length < JOB_MAX_ID ? length : JOB_MAX_ID - 1;
        memcpy(names[n], path, kept);
        names[n][kept] = '\0';
        path += length + (path[length] == '.' ? 1 : 0);
        steps[n + 1] = json_member(&steps[n], names[n]);
        steps[n + 1].value = object;
    }
    return read_fault(&steps[n], job, models, fault, error);
}

/* Adds the second defect of `found`. */
static enum rf_status add_also(const struct json_at *also, const struct rf_job *job,
                               const struct rf_models *models, struct hypothesis *found,
                               struct rf_error *error)
{
    if (found->n_faults == 0)
        return json_fail(also, error, RF_REFUSED,
                         "found beside the family none; needs a defect to stand beside");
    struct fault *second = &found->faults[1];
    enum rf_status status = read_fault(also, job, models, second, error);
    if (status != RF_OK)
        return status;
    struct json_at third = json_member(also, "also");
    if (third.value != NULL)
        return json_fail(&third, error, RF_REFUSED, "found a third defect; needs at most two");
    if (second->family == &fault_family_none)
        return json_fail(also, error, RF_REFUSED,
                         "found the family none; needs a second defect, or the key left out");
    if (fault_equal(second, &found->faults[0]))
        return json_fail(also, error, RF_REFUSED, "found the same defect twice; needs another");
    found->n_faults = 2;
    return RF_OK;
}

enum rf_status hypothesis_from_found(const struct rf_job *job, const struct rf_models *models,
                                     struct hypothesis *found, struct rf_error *error)
{
    struct json_at document = json_document(NULL, job->source);
    struct json_at object = json_member(&document, "found");
    object.value = job->found;
    *found = (struct hypothesis){0};
    enum rf_status status = read_fault(&object, job, models, &found->faults[0], error);
    if (status != RF_OK)
        return status;
    found->n_faults = found->faults[0].family == &fault_family_none ? 0 : 1;
    struct json_at also = json_member(&object, "also");
    return also.value != NULL ? add_also(&also, job, models, found, error) : RF_OK;
}

static bool add_value(cJSON *object, const char *key, cJSON *value)
{
    if (value != NULL && cJSON_AddItemToObject(object, key, value))
        return true;
    cJSON_Delete(value);
    return false;
}

struct cJSON *fault_to_json(const struct fault *fault, const struct rf_job *job)
{
    cJSON *object = cJSON_CreateObject();
    bool good =
        object != NULL && add_value(object, "family", cJSON_CreateString(fault->family->name));
    for (size_t i = 0; i < N_FIELDS && good; i++) {
        bool left_out = fields[i].bits == FIELD_OPEN && !fault->open;
        if (carries(fault->family, &fields[i]) && !left_out)
            good = add_value(object, fields[i].key, fields[i].write(fault, job));
    }
    if (!good) {
        cJSON_Delete(object);
        object = NULL;
    }
    return object;
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * One suite for every family in the list, on several rings: a family added there is tested by all
 * of this. Then readings worked out by hand, counts worked out by hand, and what is refused.
 * All rings are invented.
 */
#include "faults/fault.h"
#include "fit/forward.h"

#include "../rings.h"
#include "../suite.h"

#include <check.h>
#include <cjson/cJSON.h>
#include <stdlib.h>

enum { MOST_FAULTS = 2000, MOST_READINGS = 64, MOST_MEASURED = 600 };

static struct rf_models models;
static struct reading readings[MOST_READINGS];

/* The rows of design's shipped models, by name. */
static void add_row(const char *name, double median, double sigma)
{
    models.families[models.n_families++] =
        (struct family_prior){.name = name, .parameter = {median, sigma}};
}

static struct family_prior *row_of(const char *name)
{
    for (size_t i = 0; i < models.n_families; i++)
        if (strcmp(models.families[i].name, name) == 0)
            return &models.families[i];
    return NULL;
}

static void add_share(const char *family, const char *name, double share)
{
    struct family_prior *row = row_of(family);
    row->shares[row->n_shares].name = name;
    row->shares[row->n_shares++].share = share;
}

static void add_kind(const char *family, const char *name, double share)
{
    struct family_prior *row = row_of(family);
    row->kinds[row->n_kinds].name = name;
    row->kinds[row->n_kinds++].share = share;
}

static void make_models(void)
{
    static const struct {
        const char *name;
        double median, sigma;
    } rows[] = {
        {"none", 0, 0},
        {"break", 0, 0},
        {"joint", 0.5, 1},
        {"contact", 0.4, 1},
        {"switched_off", 0, 0},
        {"load", 30, 0.7},
        {"interconnection", 8, 0.6},
        {"spur", 4, 0.7},
        {"reversal", 0, 0},
        {"transposed", 0, 0},
        {"short", 0.05, 1.5},
        {"parallel", 0.3, 1},
        {"size", 0, 0},
        {"wrong_leg", 0, 0},
        {"not_crossed", 0, 0},
        {"bad_link", 0.2, 1},
        {"not_nulled", 0.15, 0.5},
    };
    models_for_tests(&models);
    static char name[] = "tests";
    models.name = name;
    for (size_t i = 0; i < sizeof rows / sizeof *rows; i++)
        add_row(rows[i].name, rows[i].median, rows[i].sigma);
    static const char *const at_place[] = {
        "contact",  "switched_off", "load",      "interconnection", "spur",     "reversal",
        "parallel", "size",         "wrong_leg", "not_crossed",     "bad_link", "not_nulled"};
    for (size_t i = 0; i < sizeof at_place / sizeof *at_place; i++)
        add_share(at_place[i], "place", 1);
    add_share("break", "end", 0.45);
    add_share("break", "inside", 0.10);
    add_share("break", "whole_end", 0.3);
    add_share("break", "whole_inside", 0.4);
    add_share("joint", "end", 0.45);
    add_share("joint", "inside", 0.10);
    add_share("transposed", "end", 0.5);
    add_share("short", "point", 0.4);
    add_share("short", "runs", 0.6);
    add_kind("contact", "open", 0.3);
    add_kind("contact", "high", 0.7);
    add_kind("bad_link", "open", 0.4);
    add_kind("bad_link", "high", 0.6);
    add_kind("spur", "1", 0.60);
    add_kind("spur", "2", 0.25);
    add_kind("spur", "3", 0.15);
}

/* --- rings --- */

static void add_reading(struct rf_job *job, const char *setup, enum spot spot)
{
    job->readings = readings;
    readings[job->n_readings++] =
        (struct reading){.setup = setup_find(setup), .spot = spot, .ohms = 0.5};
}

static void lay(struct small_ring *ring, size_t n)
{
    static const double run_m[] = {6.5, 4, 9, 3.5, 7, 5, 8, 11, 2, 6, 7.5, 4.5, 10, 3, 5.5};
    ring_lay(ring, n, run_m);
    add_reading(&ring->job, "end_to_end", SPOT_L);
    add_reading(&ring->job, "cross_ln", SPOT_BOARD);
    add_reading(&ring->job, "cross_ln", SPOT_BOARD);
    add_reading(&ring->job, "cross_le", SPOT_BOARD);
}

/* Junction boxes, a spur on a spur, spurs on the ends, and every kind of set-up. */
static void lay_tangled(struct small_ring *ring)
{
    lay(ring, 5);
    ring->places[2].kind = KIND_JUNCTION_BOX;
    size_t spur = ring_add_spur(ring, 2, 3);
    ring_add_spur(ring, spur, 2.5);
    ring_add_spur(ring, place_out(), 4);
    ring_add_spur(ring, place_in(&ring->job), 1.5);
    ring->places[spur + 2].kind = KIND_JUNCTION_BOX;
    ring_add_spur(ring, spur + 2, 2);
    add_reading(&ring->job, "link_out_ln", SPOT_IN);
    add_reading(&ring->job, "link_in_ne", SPOT_OUT);
    add_reading(&ring->job, "apart_ln", SPOT_OUT);
    add_reading(&ring->job, "lead_out_n", SPOT_POINT);
    readings[ring->job.n_readings - 1].place = 1;
}

/* Nothing known but how many points, and sizes of their own. */
static void lay_unknown(struct small_ring *ring)
{
    lay(ring, 3);
    ring_add_spur(ring, 1, NAN);
    ring->job.cpc_mm2 = NAN;
    for (size_t place = 0; place < ring->job.n_places; place++) {
        ring->places[place].run_m = NAN;
        ring->places[place].cpc_mm2 = place == 2 ? 2.5 : NAN;
    }
}

enum { N_RINGS = 5 };
static void lay_ring(struct small_ring *ring, int which)
{
    switch (which) {
    case 0:
        lay(ring, 1);
        break;
    case 1:
        lay(ring, 2);
        ring_add_spur(ring, 2, 4);
        break;
    case 2:
        lay(ring, 4);
        break;
    case 3:
        lay_tangled(ring);
        break;
    default:
        lay_unknown(ring);
        break;
    }
}

/* --- members --- */

struct members {
    struct fault faults[MOST_FAULTS];
    size_t n, most;
};

static bool collect(void *context, const struct fault *fault)
{
    struct members *members = context;
    ck_assert_uint_lt(members->n, MOST_FAULTS);
    members->faults[members->n++] = *fault;
    return members->n < members->most;
}

static struct members members;

static void enumerate_all(const struct rf_job *job)
{
    members.n = 0;
    members.most = MOST_FAULTS;
    for (size_t i = 0; i < n_fault_families; i++)
        fault_families[i]->enumerate(job, &models, collect, &members);
}

static void enumerate_family(const struct fault_family *family, const struct rf_job *job)
{
    members.n = 0;
    members.most = MOST_FAULTS;
    family->enumerate(job, &models, collect, &members);
}

START_TEST(list_is_in_design_order)
{
    static const char *const order[] = {"none",         "break",      "joint",           "contact",
                                        "switched_off", "load",       "interconnection", "spur",
                                        "reversal",     "transposed", "short",           "parallel",
                                        "size",         "wrong_leg",  "not_crossed",     "bad_link",
                                        "not_nulled"};
    ck_assert_uint_eq(n_fault_families, sizeof order / sizeof *order);
    for (size_t i = 0; i < n_fault_families; i++) {
        ck_assert_str_eq(fault_families[i]->name, order[i]);
        ck_assert_ptr_eq(fault_family_find(order[i]), fault_families[i]);
    }
    ck_assert_ptr_null(fault_family_find("joints"));
}
END_TEST

START_TEST(mandatory_callbacks_are_there)
{
    for (size_t i = 0; i < n_fault_families; i++) {
        const struct fault_family *family = fault_families[i];
        ck_assert(family->enumerate != NULL && family->describe != NULL);
        ck_assert(family->describe_kind != NULL);
        ck_assert((family->apply != NULL) == (family != &fault_family_none));
        ck_assert((family->kind != NULL) == (family->n_kinds > 0));
        ck_assert_uint_le(family->n_kinds, MODELS_MAX_KINDS);
        ck_assert_uint_le(family->n_shares, MODELS_MAX_KINDS);
        ck_assert(!(family->ohms && family->metres));
    }
}
END_TEST

START_TEST(members_are_each_themselves_only)
{
    struct small_ring ring;
    lay_ring(&ring, _i);
    enumerate_all(&ring.job);
    for (size_t i = 0; i < members.n; i++)
        for (size_t k = 0; k < members.n; k++)
            ck_assert(fault_equal(&members.faults[i], &members.faults[k]) == (i == k));
}
END_TEST

START_TEST(enumeration_stops_when_told)
{
    struct small_ring ring;
    lay_ring(&ring, 3);
    for (size_t i = 0; i < n_fault_families; i++) {
        members.n = 0;
        members.most = 1;
        fault_families[i]->enumerate(&ring.job, &models, collect, &members);
        ck_assert_uint_eq(members.n, 1);
    }
}
END_TEST

START_TEST(counts_are_those_worked_out_by_hand)
{
    static const struct {
        size_t points, spurs, members;
    } counts[] = {{4, 0, 158}, {5, 0, 197}, {7, 1, 310}, {14, 2, 711}};
    for (size_t i = 0; i < sizeof counts / sizeof *counts; i++) {
        struct small_ring ring;
        lay(&ring, counts[i].points);
        for (size_t k = 0; k < counts[i].spurs; k++)
            ring_add_spur(&ring, k + 1, 3);
        enumerate_all(&ring.job);
        ck_assert_uint_eq(members.n, counts[i].members);
    }
}
END_TEST

/* One point: no interconnection (its ends are neighbours or at the board), no spur, no parallel. */
START_TEST(families_without_members)
{
    struct small_ring ring;
    lay_ring(&ring, 0);
    static const struct fault_family *const empty[] = {&fault_family_interconnection,
                                                       &fault_family_spur, &fault_family_parallel};
    for (size_t i = 0; i < 3; i++) {
        enumerate_family(empty[i], &ring.job);
        ck_assert_uint_eq(members.n, 0);
    }
}
END_TEST

START_TEST(unknown_cpc_leaves_every_cable)
{
    struct small_ring ring;
    lay_ring(&ring, 4);
    enumerate_family(&fault_family_size, &ring.job);
    ck_assert_uint_eq(members.n, models.n_cables);
}
END_TEST

/* --- JSON --- */

START_TEST(members_come_back_from_json)
{
    struct small_ring ring;
    lay_ring(&ring, _i);
    enumerate_all(&ring.job);
    for (size_t i = 0; i < members.n; i++) {
        struct fault back;
        struct rf_error error = {0};
        cJSON *object = fault_to_json(&members.faults[i], &ring.job);
        ck_assert_ptr_nonnull(object);
        ck_assert_str_eq(object->child->string, "family");
        enum rf_status status = fault_from_json(object, &ring.job, &models, "found", &back, &error);
        ck_assert_msg(status == RF_OK, "%s", error.text);
        ck_assert(fault_equal(&members.faults[i], &back));
        cJSON_Delete(object);
    }
}
END_TEST

START_TEST(json_has_the_fields_of_the_table)
{
    struct small_ring ring;
    lay_ring(&ring, 3);
    static const char *const texts[] = {
        "{\"family\":\"none\"}",
        "{\"family\":\"break\",\"run\":[\"P4\",\"P5\"],\"conductor\":\"LNE\"}",
        "{\"family\":\"joint\",\"run\":[\"P2\",\"S1\"],\"conductor\":\"LNE\"}",
        "{\"family\":\"contact\",\"at\":\"P3\",\"conductor\":\"E\",\"open\":true}",
        "{\"family\":\"contact\",\"at\":\"P3\",\"conductor\":\"E\"}",
        "{\"family\":\"switched_off\",\"at\":\"S1\",\"poles\":\"LN\"}",
        "{\"family\":\"interconnection\",\"between\":[\"out\",\"P2\"]}",
        "{\"family\":\"spur\",\"points\":[\"P3\",\"P2\",\"P1\"]}",
        "{\"family\":\"transposed\",\"run\":[\"P5\",\"in\"],\"pair\":\"le\"}",
        "{\"family\":\"parallel\",\"between\":[\"P5\",\"S1\"]}",
        "{\"family\":\"size\",\"live_mm2\":1.5,\"cpc_mm2\":1}",
        "{\"family\":\"wrong_leg\",\"leg\":\"in\"}",
        "{\"family\":\"not_crossed\",\"setup\":\"cross_ne\"}",
        "{\"family\":\"bad_link\",\"setup\":\"link_in_ne\",\"end\":\"in\",\"open\":true}",
    };
    for (size_t i = 0; i < sizeof texts / sizeof *texts; i++) {
        struct fault fault;
        struct rf_error error = {0};
        cJSON *read = cJSON_Parse(texts[i]);
        enum rf_status status = fault_from_json(read, &ring.job, &models, "found", &fault, &error);
        ck_assert_msg(status == RF_OK, "%s", error.text);
        cJSON *written = fault_to_json(&fault, &ring.job);
        char *text = cJSON_PrintUnformatted(written);
        ck_assert_str_eq(text, texts[i]);
        cJSON_free(text);
        cJSON_Delete(written);
        cJSON_Delete(read);
    }
}
END_TEST

static size_t allowed; /* allocations cJSON still gets */
static long held;      /* and has not given back */

static void *allocate_while_allowed(size_t size)
{
    if (allowed == 0)
        return NULL;
    allowed--;
    held++;
    return malloc(size);
}

static void give_back(void *bytes)
{
    held -= bytes != NULL ? 1 : 0;
    free(bytes);
}

/* The process is the test's own, so cJSON's allocator may be replaced. */
START_TEST(writing_survives_every_failed_allocation)
{
    struct small_ring ring;
    lay_ring(&ring, 3);
    enumerate_all(&ring.job);
    cJSON_InitHooks(&(cJSON_Hooks){.malloc_fn = allocate_while_allowed, .free_fn = give_back});
    for (size_t i = 0; i < members.n; i++) {
        cJSON *written = NULL;
        for (size_t most = 0; written == NULL; most++) {
            ck_assert_uint_lt(most, 100);
            allowed = most;
            written = fault_to_json(&members.faults[i], &ring.job);
            ck_assert(written != NULL || held == 0);
        }
        cJSON_Delete(written);
        ck_assert_int_eq(held, 0);
    }
    cJSON_InitHooks(NULL);
}
END_TEST

static const struct {
    const char *text, *says;
} refusals[] = {
    {"[]", "small-ring.json: found: found an empty list; needs an object"},
    {"{}", "found.family: missing"},
    {"{\"family\": \"joints\"}", "joint"},
    {"{\"family\": \"joint\", \"run\": [\"P4\",\"P5\"]}", "found.conductor: missing"},
    {"{\"family\": \"joint\", \"conductor\": \"N\"}", "found.run: missing"},
    {"{\"family\": \"joint\", \"run\": [\"P4\",\"P5\"], \"conductor\": \"Q\"}",
     "found.conductor: found \"Q\""},
    {"{\"family\": \"joint\", \"run\": [\"P4\",\"P5\"], \"conductor\": \"N\", \"at\": \"P4\"}",
     "found.at: a fault of the family joint has no such field; it has family, run, conductor"},
    {"{\"family\": \"load\", \"at\": \"P1\", \"att\": \"P1\"}", "found.att: "},
    {"{\"family\": \"joint\", \"run\": [\"P4\",\"P9\"], \"conductor\": \"N\"}",
     "found.run[1]: found \"P9\"; needs a place of this ring: "},
    {"{\"family\": \"joint\", \"run\": [\"P1\",\"P4\"], \"conductor\": \"N\"}",
     "no run goes from P1 to P4"},
    {"{\"family\": \"joint\", \"run\": [\"P5\",\"P4\"], \"conductor\": \"N\"}",
     "right would be [\"P4\", \"P5\"]"},
    {"{\"family\": \"joint\", \"run\": [\"S1\",\"P2\"], \"conductor\": \"N\"}",
     "right would be [\"P2\", \"S1\"]"},
    {"{\"family\": \"joint\", \"run\": [\"P4\"], \"conductor\": \"N\"}", "two places"},
    {"{\"family\": \"transposed\", \"run\": [\"P2\",\"S1\"], \"pair\": \"ln\"}",
     "needs a run of the ring"},
    {"{\"family\": \"contact\", \"at\": \"P2\", \"conductor\": \"N\"}", "junction box"},
    {"{\"family\": \"contact\", \"at\": \"in\", \"conductor\": \"N\"}", "not an end"},
    {"{\"family\": \"contact\", \"at\": \"P1\", \"conductor\": \"LNE\"}", "found.conductor"},
    {"{\"family\": \"contact\", \"at\": \"P1\", \"conductor\": \"N\", \"open\": false}",
     "found.open"},
    {"{\"family\": \"contact\", \"at\": \"P1\", \"conductor\": \"N\", \"open\": 1}", "found.open"},
    {"{\"family\": \"switched_off\", \"at\": \"P1\", \"poles\": \"N\"}", "found.poles"},
    {"{\"family\": \"interconnection\", \"between\": [\"P1\",\"P2\"]}", "neighbours"},
    {"{\"family\": \"interconnection\", \"between\": [\"out\",\"in\"]}", "both at the board"},
    {"{\"family\": \"interconnection\", \"between\": [\"P1\",\"S1\"]}", "S1 is on a spur"},
    {"{\"family\": \"interconnection\", \"between\": [\"P4\",\"P1\"]}",
     "right would be [\"P1\", \"P4\"]"},
    {"{\"family\": \"interconnection\", \"between\": [\"P4\",\"P4\"]}", "twice"},
    {"{\"family\": \"parallel\", \"between\": [\"S1\",\"P5\"]}", "right would be [\"P5\", \"S1\"]"},
    {"{\"family\": \"parallel\", \"between\": [\"out\",\"P5\"]}", "out is an end of the ring"},
    {"{\"family\": \"spur\", \"points\": []}", "1 to 3 points"},
    {"{\"family\": \"spur\", \"points\": [\"P1\",\"P2\",\"P3\",\"P4\"]}", "1 to 3 points"},
    {"{\"family\": \"spur\", \"points\": [\"P1\",\"P3\"]}", "neighbouring points"},
    {"{\"family\": \"spur\", \"points\": [\"P1\",\"P2\",\"P1\"]}", "neighbouring points"},
    {"{\"family\": \"spur\", \"points\": [\"S1\"]}", "neighbouring points"},
    {"{\"family\": \"spur\", \"points\": [\"out\"]}", "neighbouring points"},
    {"{\"family\": \"short\", \"at\": \"P2\", \"pair\": \"nl\"}", "found.pair"},
    {"{\"family\": \"size\", \"live_mm2\": 2.5, \"cpc_mm2\": 1.5}", "is what is recorded"},
    {"{\"family\": \"size\", \"live_mm2\": 3, \"cpc_mm2\": 1.5}", "1, 1.5, 2.5, 4, 6"},
    {"{\"family\": \"wrong_leg\", \"leg\": \"both\"}", "found.leg"},
    {"{\"family\": \"not_crossed\", \"setup\": \"link_out_ln\"}", "found.setup"},
    {"{\"family\": \"bad_link\", \"setup\": \"end_to_end\", \"end\": \"out\"}", "found.setup"},
    {"{\"family\": \"bad_link\", \"setup\": \"link_out_ln\", \"end\": \"in\"}", "found.end"},
    {"{\"family\": \"bad_link\", \"setup\": \"link_in_ln\", \"end\": \"out\"}", "found.end"},
};
enum { N_REFUSALS = sizeof refusals / sizeof *refusals };

START_TEST(wrong_faults_are_refused)
{
    struct small_ring ring;
    lay_ring(&ring, 3);
    struct fault fault;
    struct rf_error error = {0};
    cJSON *object = cJSON_Parse(refusals[_i].text);
    ck_assert_ptr_nonnull(object);
    enum rf_status status = fault_from_json(object, &ring.job, &models, "found", &fault, &error);
    ck_assert_msg(status == RF_REFUSED, "%s", refusals[_i].text);
    ck_assert_msg(strstr(error.text, refusals[_i].says) != NULL, "%s", error.text);
    ck_assert_msg(strstr(error.text, "small-ring.json: found") == error.text, "%s", error.text);
    cJSON_Delete(object);
}
END_TEST

START_TEST(spur_of_the_whole_ring_is_refused)
{
    struct small_ring ring;
    lay_ring(&ring, 1);
    struct fault fault;
    struct rf_error error = {0};
    cJSON *object = cJSON_Parse("{\"family\": \"spur\", \"points\": [\"P1\", \"P2\"]}");
    ck_assert_int_eq(fault_from_json(object, &ring.job, &models, "found", &fault, &error),
                     RF_REFUSED);
    ck_assert_ptr_nonnull(strstr(error.text, "fewer"));
    cJSON_Delete(object);
}
END_TEST

static enum rf_status read_found(const char *text, struct hypothesis *found, struct rf_error *error)
{
    struct small_ring ring;
    lay_ring(&ring, 3);
    ring.job.found = cJSON_Parse(text);
    ck_assert_ptr_nonnull(ring.job.found);
    enum rf_status status = hypothesis_from_found(&ring.job, &models, found, error);
    cJSON_Delete(ring.job.found);
    return status;
}

START_TEST(found_is_a_set)
{
    struct hypothesis found, turned;
    struct rf_error error = {0};
    ck_assert_int_eq(read_found("{\"family\": \"none\", \"x_by\": 1}", &found, &error), RF_OK);
    ck_assert_uint_eq(found.n_faults, 0);
    ck_assert_int_eq(
        read_found("{\"family\": \"load\", \"at\": \"P1\", \"ohms\": 30}", &found, &error), RF_OK);
    ck_assert_uint_eq(found.n_faults, 1);
    ck_assert_int_eq(read_found("{\"family\": \"load\", \"at\": \"P1\", \"also\": "
                                "{\"family\": \"not_nulled\"}}",
                                &found, &error),
                     RF_OK);
    ck_assert_int_eq(read_found("{\"family\": \"not_nulled\", \"also\": "
                                "{\"family\": \"load\", \"at\": \"P1\"}}",
                                &turned, &error),
                     RF_OK);
    ck_assert_uint_eq(found.n_faults, 2);
    ck_assert(hypothesis_equal(&found, &turned));
    turned.n_faults = 1;
    ck_assert(!hypothesis_equal(&found, &turned));
}
END_TEST

START_TEST(wrong_second_defects_are_refused)
{
    static const struct {
        const char *text, *says;
    } wrong[] = {
        {"{\"family\": \"none\", \"also\": {\"family\": \"not_nulled\"}}", "found.also: "},
        {"{\"family\": \"not_nulled\", \"also\": {\"family\": \"none\"}}", "found.also: "},
        {"{\"family\": \"not_nulled\", \"also\": {\"family\": \"not_nulled\"}}", "twice"},
        {"{\"family\": \"not_nulled\", \"also\": {\"family\": \"load\"}}",
         "found.also.at: missing"},
        {"{\"family\": \"not_nulled\", \"also\": {\"family\": \"load\", \"at\": \"P1\", \"also\": "
         "{}}}",
         "found.also.also: "},
    };
    for (size_t i = 0; i < sizeof wrong / sizeof *wrong; i++) {
        struct hypothesis found;
        struct rf_error error = {0};
        ck_assert_int_eq(read_found(wrong[i].text, &found, &error), RF_REFUSED);
        ck_assert_msg(strstr(error.text, wrong[i].says) != NULL, "%s", error.text);
    }
}
END_TEST

/* --- what it does to the wiring --- */

/* Every spot of every set-up but the highest. */
static size_t measure_all(const struct rf_job *job, struct measurement measured[])
{
    size_t n = 0;
    for (size_t setup = 0; setup < N_SETUPS; setup++)
        for (int spot = 0; spot < N_SPOTS; spot++) {
            if (spot == SPOT_HIGHEST || (setups[setup].spots & 1u << spot) == 0)
                continue;
            for (size_t place = 0; place < (spot == SPOT_POINT ? job->n_places : 1); place++)
                if (spot != SPOT_POINT || place_has_front(job, place)) {
                    ck_assert_uint_lt(n, MOST_MEASURED);
                    measured[n++] = (struct measurement){setup, (enum spot)spot, place};
                }
        }
    return n;
}

struct bench {
    struct small_ring ring;
    struct wiring recorded, changed;
    struct measurement measured[MOST_MEASURED];
    size_t n_measured;
    struct forward *forward;
    double sound[MOST_MEASURED], mean[MOST_MEASURED]; /* Ω; −1: over range */
};

static struct bench bench;

static void read_all(const struct wiring *wiring, double mean[])
{
    double theta[RING_MAX_PLACES + 16] = {0};
    ck_assert_int_le(wiring->n_parameters, RING_MAX_PLACES + 16);
    ck_assert_int_eq(forward_analyse(bench.forward, wiring), RF_OK);
    ck_assert_int_eq(forward_evaluate(bench.forward, theta), RF_OK);
    for (size_t i = 0; i < bench.n_measured; i++)
        mean[i] = forward_reachable(bench.forward, i) ? forward_mean(bench.forward, i) : -1;
}

static void set_bench(void)
{
    const struct rf_job *job = &bench.ring.job;
    ck_assert_int_eq(wiring_init(&bench.recorded, job, &models, NULL), RF_OK);
    ck_assert_int_eq(wiring_init(&bench.changed, job, &models, NULL), RF_OK);
    bench.n_measured = measure_all(job, bench.measured);
    bench.forward = forward_create(&bench.recorded, bench.measured, bench.n_measured);
    ck_assert_ptr_nonnull(bench.forward);
    read_all(&bench.recorded, bench.sound);
}

static void clear_bench(void)
{
    forward_destroy(bench.forward);
    wiring_finish(&bench.recorded);
    wiring_finish(&bench.changed);
}

static void apply_all(const struct hypothesis *hypothesis)
{
    int parameter_of[FAULTS_AT_ONCE];
    wiring_copy(&bench.changed, &bench.recorded);
    hypothesis_apply(hypothesis, &bench.changed, parameter_of);
    int next = bench.recorded.n_parameters;
    for (size_t i = 0; i < hypothesis->n_faults; i++)
        ck_assert_int_eq(parameter_of[i],
                         fault_has_parameter(&hypothesis->faults[i]) ? next++ : NO_PARAMETER);
    ck_assert_int_eq(bench.changed.n_parameters, next);
    ck_assert_int_le(bench.changed.n_nodes,
                     bench.recorded.n_nodes + (int)hypothesis->n_faults * NODES_PER_FAULT);
    ck_assert_uint_le(bench.changed.n_wires,
                      bench.recorded.n_wires + hypothesis->n_faults * WIRES_PER_FAULT);
}

static void apply_one(const struct fault *fault)
{
    apply_all(&(struct hypothesis){.faults = {*fault}, .n_faults = 1});
}

START_TEST(faults_change_what_can_be_read)
{
    lay_ring(&bench.ring, _i);
    set_bench();
    enumerate_all(&bench.ring.job);
    for (size_t i = 0; i < members.n; i++) {
        apply_one(&members.faults[i]);
        read_all(&bench.changed, bench.mean);
        double most = 0;
        for (size_t k = 0; k < bench.n_measured; k++)
            most = fmax(most, fabs(bench.mean[k] - bench.sound[k]));
        ck_assert_msg((most > 1e-6) == (members.faults[i].family != &fault_family_none), "%s",
                      members.faults[i].family->name);
    }
    clear_bench();
}
END_TEST

static bool same_wire(const struct wire *one, const struct wire *other)
{
    return one->a == other->a && one->b == other->b && fabs(one->ohms - other->ohms) <= 0 &&
           one->length_parameter == other->length_parameter && one->run == other->run &&
           one->factor_parameter == other->factor_parameter && one->conductor == other->conductor;
}

/* Whether a recorded wire may change under the fault, by the fields its family carries. */
static bool wire_is_concerned(const struct fault *fault, const struct wire *wire)
{
    unsigned carried = fault->family->fields;
    if (carried & (FIELD_RUN | FIELD_RING_RUN))
        return wire->run == (int)fault->run;
    if (carried & FIELD_POINTS) {
        int near = (int)fault->chain[0], far = (int)fault->chain[fault->chain_length - 1];
        int lowest = near < far ? near : far, highest = near < far ? far : near;
        return wire->run == lowest - 1 || wire->run == highest;
    }
    return (carried & (FIELD_CABLE | FIELD_LEG)) != 0;
}

START_TEST(faults_leave_the_rest_alone)
{
    lay_ring(&bench.ring, _i);
    set_bench();
    enumerate_all(&bench.ring.job);
    const struct wiring *recorded = &bench.recorded, *changed = &bench.changed;
    for (size_t i = 0; i < members.n; i++) {
        const struct fault *fault = &members.faults[i];
        unsigned carried = fault->family->fields;
        apply_one(fault);
        for (size_t k = 0; k < recorded->n_wires; k++)
            if (!wire_is_concerned(fault, &recorded->wires[k]))
                ck_assert(same_wire(&recorded->wires[k], &changed->wires[k]));
        for (size_t k = 0; k < bench.ring.job.n_places * N_CONDUCTORS; k++)
            if (!(carried & FIELD_AT) || k / N_CONDUCTORS != fault->place)
                ck_assert_int_eq(recorded->front[k], changed->front[k]);
        for (size_t k = 0; k < N_SETUPS; k++)
            if (!(carried & (FIELD_CROSS_SETUP | FIELD_LINK_SETUP)) || k != fault->setup)
                ck_assert_mem_eq(&recorded->links[k], &changed->links[k], sizeof(struct links));
    }
    clear_bench();
}
END_TEST

/* Each family's first and last member, twice over and in both orders: solvable, within capacity. */
START_TEST(faults_compose)
{
    lay_ring(&bench.ring, _i);
    set_bench();
    struct fault chosen[64];
    size_t n = 0;
    for (size_t i = 0; i < n_fault_families; i++) {
        enumerate_family(fault_families[i], &bench.ring.job);
        if (members.n > 0) {
            chosen[n++] = members.faults[0];
            chosen[n++] = members.faults[members.n - 1];
        }
    }
    for (size_t i = 0; i < n; i++)
        for (size_t k = 0; k < n; k++) {
            struct hypothesis three = {.faults = {chosen[i], chosen[k], chosen[i]}, .n_faults = 3};
            apply_all(&three);
            three.n_faults = 2;
            apply_all(&three);
            read_all(&bench.changed, bench.mean);
        }
    clear_bench();
}
END_TEST

START_TEST(every_pair_fits)
{
    lay_ring(&bench.ring, _i);
    set_bench();
    enumerate_all(&bench.ring.job);
    for (size_t i = 0; i < members.n; i++)
        for (size_t k = 0; k < members.n; k++)
            apply_all(&(struct hypothesis){.faults = {members.faults[i], members.faults[k]},
                                           .n_faults = 2});
    clear_bench();
}
END_TEST

/* --- readings worked out by hand --- */

/* One ring for all: P1 … P4 with runs of 6.5, 4, 9, 3.5, 7 m, 30 m in all. */
static const double per_m_live = 0.00741, per_m_cpc = 0.0121;

static double reading_of(const char *setup, enum spot spot, size_t place)
{
    struct measurement wanted = {setup_find(setup), spot, place};
    for (size_t i = 0; i < bench.n_measured; i++)
        if (measurement_equal(&bench.measured[i], &wanted))
            return bench.mean[i];
    ck_abort_msg("no such reading: %s", setup);
    return 0;
}

static void hypothesise(size_t n, const struct fault faults[])
{
    struct hypothesis hypothesis = {.n_faults = n};
    for (size_t i = 0; i < n; i++)
        hypothesis.faults[i] = faults[i];
    apply_all(&hypothesis);
    read_all(&bench.changed, bench.mean);
}

#define SUPPOSE(...)                                                                               \
    do {                                                                                           \
        const struct fault supposed[] = {__VA_ARGS__};                                             \
        hypothesise(sizeof supposed / sizeof *supposed, supposed);                                 \
    } while (0)
#define JOINT(of, c)                                                                               \
    {                                                                                              \
        .family = &fault_family_joint, .run = of, .conductor = c                                   \
    }
#define SPUR(...)                                                                                  \
    {                                                                                              \
        .family = &fault_family_spur, .chain = {__VA_ARGS__}, .chain_length = 1                    \
    }
#define READS(setup, spot, place, ohms)                                                            \
    ck_assert_double_eq_tol(reading_of(setup, spot, place), ohms, 1e-12)
#define OPEN -1.0

static void set_ring_of_four(void)
{
    lay_ring(&bench.ring, 2);
    set_bench();
}

START_TEST(joints_and_breaks_read)
{
    double sound = 30 * per_m_live;
    SUPPOSE(JOINT(2, NEUTRAL));
    READS("end_to_end", SPOT_N, 0, sound + 0.5);
    READS("end_to_end", SPOT_L, 0, sound);
    READS("lead_out_n", SPOT_POINT, 2, 10.5 * per_m_live);
    READS("lead_out_n", SPOT_POINT, 3, 19.5 * per_m_live + 0.5);
    SUPPOSE(JOINT(2, WHOLE_CABLE));
    READS("end_to_end", SPOT_L, 0, sound + 0.5);
    READS("end_to_end", SPOT_E, 0, 30 * per_m_cpc + 0.5);
    SUPPOSE(JOINT(2, NEUTRAL), JOINT(2, NEUTRAL));
    READS("end_to_end", SPOT_N, 0, sound + 1);
    SUPPOSE({.family = &fault_family_break, .run = 1, .conductor = LINE});
    READS("end_to_end", SPOT_L, 0, OPEN);
    READS("end_to_end", SPOT_N, 0, sound);
    READS("lead_out_l", SPOT_POINT, 1, 6.5 * per_m_live);
    READS("lead_out_l", SPOT_POINT, 2, OPEN);
    SUPPOSE(JOINT(1, LINE), {.family = &fault_family_break, .run = 1, .conductor = WHOLE_CABLE});
    READS("end_to_end", SPOT_L, 0, OPEN);
    READS("end_to_end", SPOT_E, 0, OPEN);
}
END_TEST

START_TEST(fronts_read)
{
    struct fault contact = {.family = &fault_family_contact, .place = 2, .conductor = LINE};
    struct fault reversal = {.family = &fault_family_reversal, .place = 2, .pair = PAIR_LE};
    SUPPOSE(contact);
    READS("lead_out_l", SPOT_POINT, 2, 10.5 * per_m_live + 0.4);
    READS("lead_out_l", SPOT_POINT, 3, 19.5 * per_m_live);
    contact.open = true;
    SUPPOSE(contact);
    READS("lead_out_l", SPOT_POINT, 2, OPEN);
    READS("lead_out_n", SPOT_POINT, 2, 10.5 * per_m_live);
    SUPPOSE({.family = &fault_family_switched_off, .place = 2, .poles = POLES_LN});
    READS("lead_out_l", SPOT_POINT, 2, OPEN);
    READS("lead_out_n", SPOT_POINT, 2, OPEN);
    READS("lead_out_e", SPOT_POINT, 2, 10.5 * per_m_cpc);
    SUPPOSE(reversal);
    READS("link_out_ln", SPOT_POINT, 2, OPEN);
    READS("link_out_ne", SPOT_POINT, 2, OPEN);
    READS("link_out_le", SPOT_POINT, 2, 10.5 * (per_m_live + per_m_cpc));
    SUPPOSE({.family = &fault_family_load, .place = 2});
    READS("apart_ln", SPOT_OUT, 0, 30 + 2 * 10.5 * per_m_live);
    SUPPOSE({.family = &fault_family_load, .place = 2},
            {.family = &fault_family_switched_off, .place = 2});
    READS("apart_ln", SPOT_OUT, 0, 30 + 2 * 10.5 * per_m_live);
}
END_TEST

START_TEST(further_cable_reads)
{
    double beside = 1 / (1 / (13.0 * per_m_live) + 1 / (8 * per_m_live)); /* P1 to P3 */
    SUPPOSE({.family = &fault_family_interconnection, .place = 1, .other = 3});
    READS("end_to_end", SPOT_L, 0, 17 * per_m_live + beside);
    SUPPOSE({.family = &fault_family_parallel, .place = 1, .other = 3});
    READS("end_to_end", SPOT_E, 0, 17 * per_m_cpc + 1 / (1 / (13 * per_m_cpc) + 1 / 0.3));
    READS("end_to_end", SPOT_L, 0, 30 * per_m_live);
    SUPPOSE({.family = &fault_family_short, .place = 2, .pair = PAIR_NE});
    READS("apart_ne", SPOT_OUT, 0, 10.5 * (per_m_live + per_m_cpc) + 0.05);
    READS("apart_ln", SPOT_OUT, 0, OPEN);
}
END_TEST

START_TEST(spurs_read)
{
    struct fault chain = {.family = &fault_family_spur, .chain = {3, 2}, .chain_length = 2};
    SUPPOSE(SPUR(2));
    READS("end_to_end", SPOT_L, 0, 30 * per_m_live);
    READS("lead_out_l", SPOT_POINT, 2, 14.5 * per_m_live);
    READS("lead_out_l", SPOT_POINT, 3, 19.5 * per_m_live);
    SUPPOSE(chain); /* off the ring: the 9 m between them */
    READS("end_to_end", SPOT_L, 0, 21 * per_m_live);
    READS("lead_out_l", SPOT_POINT, 3, 14.5 * per_m_live);
    READS("lead_out_l", SPOT_POINT, 2, 23.5 * per_m_live);
    READS("lead_in_l", SPOT_POINT, 4, 7 * per_m_live);
}
END_TEST

/* A joint is in the run wherever the run's ends are led, whichever came first. */
START_TEST(joints_go_with_their_runs)
{
    for (int order = 0; order < 2; order++)
        for (size_t run = 1; run <= 2; run++) {
            struct fault joint = JOINT(run, LINE), spur = SPUR(2);
            struct fault set[] = {order == 0 ? joint : spur, order == 0 ? spur : joint};
            hypothesise(2, set);
            READS("end_to_end", SPOT_L, 0, 30 * per_m_live + 0.5);
            READS("lead_out_l", SPOT_POINT, 2, 14.5 * per_m_live + (run == 1 ? 0.5 : 0));
            READS("lead_in_l", SPOT_POINT, 2, 23.5 * per_m_live + (run == 2 ? 0.5 : 0));
        }
}
END_TEST

START_TEST(transposed_runs_read)
{
    struct fault over = {.family = &fault_family_transposed, .run = 1, .pair = PAIR_LE};
    struct fault joint = JOINT(1, CPC);
    SUPPOSE(over);
    READS("end_to_end", SPOT_L, 0, OPEN);
    READS("end_to_end", SPOT_N, 0, 30 * per_m_live);
    READS("lead_out_l", SPOT_POINT, 1, 6.5 * per_m_live);
    READS("lead_out_l", SPOT_POINT, 2, OPEN);
    /* out L to P2 is L's own 10.5 m, but on the CPC's terminal there */
    READS("link_out_le", SPOT_POINT, 2, 10.5 * (per_m_live + per_m_cpc));
    READS("link_out_ne", SPOT_POINT, 2, OPEN);
    for (int order = 0; order < 2; order++) {
        struct fault set[] = {order == 0 ? joint : over, order == 0 ? over : joint};
        hypothesise(2, set);
        READS("link_out_le", SPOT_POINT, 2, 10.5 * (per_m_live + per_m_cpc) + 0.5);
        READS("link_out_le", SPOT_POINT, 1, 6.5 * (per_m_live + per_m_cpc));
        READS("end_to_end", SPOT_E, 0, OPEN);
        READS("lead_in_e", SPOT_POINT, 2, 19.5 * per_m_cpc);
    }
    struct fault spur = SPUR(2);
    for (int order = 0; order < 2; order++) {
        struct fault set[] = {order == 0 ? spur : over, order == 0 ? over : spur};
        hypothesise(2, set);
        READS("link_out_le", SPOT_POINT, 2, 14.5 * (per_m_live + per_m_cpc));
        READS("lead_out_l", SPOT_POINT, 2, OPEN);
        READS("lead_in_l", SPOT_POINT, 2, 23.5 * per_m_live);
    }
}
END_TEST

START_TEST(slips_at_the_board_read)
{
    double live = 30 * per_m_live;
    SUPPOSE({.family = &fault_family_wrong_leg, .leg_in = true});
    READS("end_to_end", SPOT_L, 0, OPEN);
    READS("lead_out_l", SPOT_POINT, 4, 23 * per_m_live);
    READS("lead_in_l", SPOT_POINT, 4, OPEN);
    SUPPOSE({.family = &fault_family_not_crossed, .setup = setup_find("cross_ln")});
    READS("cross_ln", SPOT_BOARD, 0, 0);
    READS("cross_le", SPOT_BOARD, 0, (live * 30 * per_m_cpc) / (live + 30 * per_m_cpc));
    SUPPOSE({.family = &fault_family_bad_link, .setup = setup_find("cross_ln"), .leg_in = true});
    READS("cross_ln", SPOT_BOARD, 0, live * (live + 0.2) / (2 * live + 0.2));
    SUPPOSE({.family = &fault_family_bad_link, .setup = setup_find("cross_ln"), .open = true});
    READS("cross_ln", SPOT_BOARD, 0, live);
    SUPPOSE({.family = &fault_family_not_nulled});
    READS("end_to_end", SPOT_L, 0, live + 0.15);
    SUPPOSE({.family = &fault_family_size, .live_mm2 = 4, .cpc_mm2 = 1.5});
    READS("end_to_end", SPOT_L, 0, 30 * 0.00461);
    READS("end_to_end", SPOT_E, 0, 30 * per_m_cpc);
}
END_TEST

START_TEST(wrong_leg_takes_its_spurs_along)
{
    lay_ring(&bench.ring, 3);
    set_bench();
    SUPPOSE({.family = &fault_family_wrong_leg});
    size_t on_out = bench.ring.job.n_ring + 4, on_in = on_out + 1; /* S3, S4 */
    ck_assert_uint_eq(bench.ring.places[on_out].from, place_out());
    for (size_t i = 0; i < bench.changed.n_wires; i++)
        if (bench.changed.wires[i].run == (int)on_out - 1)
            ck_assert_int_lt(bench.changed.wires[i].a, 0);
    READS("lead_in_l", SPOT_POINT, on_in, 1.5 * per_m_live);
}
END_TEST

/* --- looking, danger, words --- */

struct looked {
    double sum;
    size_t n;
    const struct rf_job *job;
};

static void add_look(void *context, const struct look *look)
{
    struct looked *looked = context;
    looked->sum += look->share;
    looked->n++;
    ck_assert_double_gt(look->share, 0);
    if (look->where == LOOK_AT_PLACE)
        ck_assert(look->index < looked->job->n_places && !place_is_end(looked->job, look->index));
    else
        ck_assert_uint_lt(look->index, n_runs(looked->job));
    if (look->kind == LOOK_CHECK)
        ck_assert(look->where == LOOK_AT_PLACE && place_has_front(looked->job, look->index));
}

START_TEST(shares_are_parts_of_one)
{
    struct small_ring ring;
    lay_ring(&ring, _i);
    enumerate_all(&ring.job);
    for (size_t i = 0; i < members.n; i++) {
        struct looked looked = {.job = &ring.job};
        const struct fault *fault = &members.faults[i];
        fault_looks(fault, &ring.job, &models, add_look, &looked);
        double right = fault->family->each_enough ? (double)looked.n : 1;
        if (fault->family == &fault_family_none)
            right = 0;
        ck_assert_double_eq_tol(looked.sum, right, 1e-12);
    }
}
END_TEST

START_TEST(kinds_spans_and_dangers_are_in_range)
{
    struct small_ring ring;
    lay_ring(&ring, _i);
    enumerate_all(&ring.job);
    for (size_t i = 0; i < members.n; i++) {
        const struct fault *fault = &members.faults[i];
        const struct fault_family *family = fault->family;
        if (family->kind != NULL)
            ck_assert_uint_lt(family->kind(fault), family->n_kinds);
        double share = fault_kind_share(fault, models_family(&models, family->name));
        ck_assert(share > 0 && share <= 1);
        ck_assert_int_lt(fault_danger(fault, &ring.job), N_DANGERS);
        if (family->span == NULL)
            continue;
        size_t from, to;
        family->span(fault, &ring.job, &from, &to);
        ck_assert(from <= to && to < ring.job.n_places);
    }
}
END_TEST

START_TEST(dangers)
{
    struct small_ring ring;
    lay_ring(&ring, 3);
    size_t spur_run = ring.job.n_ring + 1;
    const struct {
        struct fault fault;
        enum danger danger;
    } told[] = {
        {{.family = &fault_family_break, .run = 1, .conductor = LINE}, DANGER_RING_BROKEN},
        {{.family = &fault_family_break, .run = 1, .conductor = CPC}, DANGER_CPC_BROKEN},
        {{.family = &fault_family_break, .run = spur_run, .conductor = CPC}, DANGER_CPC_BROKEN},
        {{.family = &fault_family_break, .run = spur_run, .conductor = LINE}, DANGER_NONE},
        {JOINT(1, NEUTRAL), DANGER_HEAT},
        {{.family = &fault_family_reversal, .place = 1, .pair = PAIR_LE}, DANGER_LINE_ON_CPC},
        {{.family = &fault_family_reversal, .place = 1, .pair = PAIR_LN}, DANGER_REVERSED},
        {{.family = &fault_family_short, .place = 1, .pair = PAIR_LE}, DANGER_LINE_ON_CPC},
        {{.family = &fault_family_transposed, .run = 1, .pair = PAIR_LN}, DANGER_LIVES_SHORTED},
        {{.family = &fault_family_wrong_leg}, DANGER_OTHER_CIRCUIT},
        {{.family = &fault_family_load, .place = 1}, DANGER_NONE},
    };
    for (size_t i = 0; i < sizeof told / sizeof *told; i++)
        ck_assert_int_eq(fault_danger(&told[i].fault, &ring.job), told[i].danger);
}
END_TEST

static char *words_of(const struct fault *fault, const struct rf_job *job)
{
    struct text text = {0};
    if (job != NULL)
        fault->family->describe(fault, job, &text);
    else
        fault->family->describe_kind(fault, &text);
    ck_assert(!text.failed && text.length > 0);
    return text.bytes;
}

static int compare_words(const void *one, const void *other)
{
    return strcmp(*(char *const *)one, *(char *const *)other);
}

START_TEST(words_tell_members_apart)
{
    static char *words[MOST_FAULTS];
    struct small_ring ring;
    lay_ring(&ring, _i);
    enumerate_all(&ring.job);
    for (size_t i = 0; i < members.n; i++) {
        words[i] = words_of(&members.faults[i], &ring.job);
        char *kind = words_of(&members.faults[i], NULL);
        ck_assert_msg(strchr(words[i], '_') == NULL, "%s", words[i]);
        ck_assert_msg(strchr(kind, '_') == NULL, "%s", kind);
        for (size_t place = 0; place < ring.job.n_places; place++)
            if (!place_is_end(&ring.job, place))
                ck_assert_msg(strstr(kind, ring.ids[place]) == NULL, "%s", kind);
        free(kind);
    }
    qsort(words, members.n, sizeof *words, compare_words);
    for (size_t i = 0; i < members.n; i++) {
        if (i > 0)
            ck_assert_msg(strcmp(words[i - 1], words[i]) != 0, "%s", words[i]);
    }
    for (size_t i = 0; i < members.n; i++)
        free(words[i]);
}
END_TEST

START_TEST(words_are_an_electricians)
{
    struct small_ring ring;
    lay_ring(&ring, 3);
    static char label[] = "landing";
    ring.places[4].label = label;
    size_t cross = setup_find("cross_ln"), link_in = setup_find("link_in_ne");
    const struct {
        struct fault fault;
        const char *words, *kind;
    } said[] = {
        {JOINT(3, NEUTRAL), "high-resistance neutral joint in the run P3 to P4 (landing)",
         "high-resistance neutral joint"},
        {{.family = &fault_family_break, .run = 0, .conductor = WHOLE_CABLE},
         "whole cable broken in the run board (outgoing) to P1",
         "whole cable broken"},
        {{.family = &fault_family_contact, .place = 1, .conductor = LINE},
         "line contact at P1 poor",
         "line contact poor"},
        {{.family = &fault_family_contact, .place = 1, .conductor = CPC, .open = true},
         "CPC contact at P1 not made",
         "CPC contact not made"},
        {{.family = &fault_family_switched_off, .place = 1},
         "P1 switched off, or adaptor not home (line)",
         "switched off, or adaptor not home (line)"},
        {{.family = &fault_family_load, .place = 4},
         "something left plugged in at P4 (landing)",
         "something left plugged in"},
        {{.family = &fault_family_interconnection, .place = 2, .other = 6},
         "unrecorded cable from P2 to board (incoming) (interconnection)",
         "unrecorded cable between two places (interconnection)"},
        {{.family = &fault_family_spur, .chain = {3, 2, 1}, .chain_length = 3},
         "P3, P2 and P1 on an unrecorded spur, P3 first",
         "three points on an unrecorded spur"},
        {{.family = &fault_family_reversal, .place = 1, .pair = PAIR_LE},
         "line and CPC changed over at P1",
         "line and CPC changed over"},
        {{.family = &fault_family_transposed, .run = 2, .pair = PAIR_LN},
         "line and neutral change over in the run P2 to P3 and stay so",
         "line and neutral change over in a run and stay so"},
        {{.family = &fault_family_short, .place = 1, .pair = PAIR_LE},
         "line touching CPC at P1",
         "line touching CPC"},
        {{.family = &fault_family_parallel, .place = 2, .other = 7},
         "metalwork joins the CPCs of P2 and S1",
         "metalwork joins the CPCs of two points"},
        {{.family = &fault_family_size, .live_mm2 = 1.5, .cpc_mm2 = 1},
         "whole ring in 1.5/1.0 mm² instead of 2.5/1.5",
         "whole ring in 1.5/1.0 mm²"},
        {{.family = &fault_family_wrong_leg},
         "outgoing leg belongs to another circuit",
         "outgoing leg belongs to another circuit"},
        {{.family = &fault_family_not_crossed, .setup = cross},
         "links not crossed for the line-neutral test",
         "links not crossed for the line-neutral test"},
        {{.family = &fault_family_bad_link, .setup = cross},
         "bad link at the outgoing line end for the crossed line-neutral test",
         "bad link at the outgoing line end for the crossed line-neutral test"},
        {{.family = &fault_family_bad_link, .setup = link_in, .leg_in = true, .open = true},
         "link not made at the incoming neutral end for the neutral-CPC test linked at the "
         "incoming ends",
         "link not made at the incoming neutral end for the neutral-CPC test linked at the "
         "incoming ends"},
        {{.family = &fault_family_not_nulled}, "leads not nulled", "leads not nulled"},
    };
    for (size_t i = 0; i < sizeof said / sizeof *said; i++) {
        char *words = words_of(&said[i].fault, &ring.job), *kind = words_of(&said[i].fault, NULL);
        ck_assert_str_eq(words, said[i].words);
        ck_assert_str_eq(kind, said[i].kind);
        free(words);
        free(kind);
    }
}
END_TEST

/* --- the models' rows --- */

static void check_refused(const char *says)
{
    struct rf_error error = {0};
    ck_assert_int_eq(fault_check_models(&models, &error), RF_REFUSED);
    ck_assert_msg(strstr(error.text, says) != NULL, "%s", error.text);
    make_models();
}

START_TEST(models_rows_are_checked)
{
    ck_assert_int_eq(fault_check_models(&models, NULL), RF_OK);
    row_of("joint")->name = "joints";
    check_refused("tests/faults.json: there is no family \"joints\"; nearest is joint");
    models.n_families--;
    check_refused("no row for the family not_nulled");
    row_of("joint")->parameter.median = 0;
    check_refused("family joint: no parameter; right would be its median in ohms");
    row_of("break")->parameter.median = 1;
    check_refused("family break: found a parameter");
    row_of("contact")->kinds[1].name = "poor";
    check_refused("family contact: found the kinds open, poor; right would be open, high");
    add_kind("joint", "open", 1);
    check_refused("family joint: found the kinds open; right would be none");
    row_of("short")->n_shares--;
    check_refused("tests/effort.json: family short: found the shares point; right would be point, "
                  "runs");
}
END_TEST

static Suite *faults_suite(void)
{
    Suite *suite = suite_create("faults");
    TCase *list = tcase_create("list");
    tcase_add_unchecked_fixture(list, make_models, NULL);
    tcase_add_test(list, list_is_in_design_order);
    tcase_add_test(list, mandatory_callbacks_are_there);
    tcase_add_loop_test(list, members_are_each_themselves_only, 0, N_RINGS);
    tcase_add_test(list, enumeration_stops_when_told);
    tcase_add_test(list, counts_are_those_worked_out_by_hand);
    tcase_add_test(list, families_without_members);
    tcase_add_test(list, unknown_cpc_leaves_every_cable);
    tcase_add_test(list, models_rows_are_checked);
    suite_add_tcase(suite, list);

    TCase *json = tcase_create("json");
    tcase_add_unchecked_fixture(json, make_models, NULL);
    tcase_add_loop_test(json, members_come_back_from_json, 0, N_RINGS);
    tcase_add_test(json, json_has_the_fields_of_the_table);
    tcase_add_test(json, writing_survives_every_failed_allocation);
    tcase_add_loop_test(json, wrong_faults_are_refused, 0, N_REFUSALS);
    tcase_add_test(json, spur_of_the_whole_ring_is_refused);
    tcase_add_test(json, found_is_a_set);
    tcase_add_test(json, wrong_second_defects_are_refused);
    suite_add_tcase(suite, json);

    TCase *wiring = tcase_create("wiring");
    tcase_add_unchecked_fixture(wiring, make_models, NULL);
    tcase_set_timeout(wiring, 60);
    tcase_add_loop_test(wiring, faults_change_what_can_be_read, 0, N_RINGS);
    tcase_add_loop_test(wiring, faults_leave_the_rest_alone, 0, N_RINGS);
    tcase_add_loop_test(wiring, faults_compose, 0, N_RINGS);
    tcase_add_loop_test(wiring, every_pair_fits, 0, N_RINGS);
    suite_add_tcase(suite, wiring);

    TCase *by_hand = tcase_create("by hand");
    tcase_add_unchecked_fixture(by_hand, make_models, NULL);
    tcase_add_checked_fixture(by_hand, set_ring_of_four, clear_bench);
    tcase_add_test(by_hand, joints_and_breaks_read);
    tcase_add_test(by_hand, fronts_read);
    tcase_add_test(by_hand, further_cable_reads);
    tcase_add_test(by_hand, spurs_read);
    tcase_add_test(by_hand, joints_go_with_their_runs);
    tcase_add_test(by_hand, transposed_runs_read);
    tcase_add_test(by_hand, slips_at_the_board_read);
    suite_add_tcase(suite, by_hand);

    TCase *words = tcase_create("words");
    tcase_add_unchecked_fixture(words, make_models, NULL);
    tcase_add_test(words, wrong_leg_takes_its_spurs_along);
    tcase_add_loop_test(words, shares_are_parts_of_one, 0, N_RINGS);
    tcase_add_loop_test(words, kinds_spans_and_dangers_are_in_range, 0, N_RINGS);
    tcase_add_test(words, dangers);
    tcase_add_loop_test(words, words_tell_members_apart, 0, N_RINGS);
    tcase_add_test(words, words_are_an_electricians);
    suite_add_tcase(suite, words);
    return suite;
}

int main(void)
{
    return run_suite(faults_suite());
}

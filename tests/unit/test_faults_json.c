/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Faults of every family written as JSON and read again, and what is refused. */
#include "fault_rings.h"

#include "../suite.h"

#include <cjson/cJSON.h>

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

int main(void)
{
    Suite *suite = suite_create("faults as JSON");
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
    return run_suite(suite);
}

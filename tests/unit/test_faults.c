/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * One suite for every family in the list, on several rings: a family added there is tested by all
 * of this, and by test_faults_json.c and test_faults_wiring.c. Counts worked out by hand.
 */
#include "fault_rings.h"

#include "../suite.h"

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

int main(void)
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

    TCase *words = tcase_create("words");
    tcase_add_unchecked_fixture(words, make_models, NULL);
    tcase_add_loop_test(words, shares_are_parts_of_one, 0, N_RINGS);
    tcase_add_loop_test(words, kinds_spans_and_dangers_are_in_range, 0, N_RINGS);
    tcase_add_test(words, dangers);
    tcase_add_loop_test(words, words_tell_members_apart, 0, N_RINGS);
    tcase_add_test(words, words_are_an_electricians);
    suite_add_tcase(suite, words);
    return run_suite(suite);
}

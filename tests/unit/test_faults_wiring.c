/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What the faults of every family do to the wiring, and readings worked out by hand. */
#include "fault_rings.h"
#include "fit/forward.h"

#include "../suite.h"

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

int main(void)
{
    Suite *suite = suite_create("faults in the wiring");
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

    TCase *legs = tcase_create("legs");
    tcase_add_unchecked_fixture(legs, make_models, NULL);
    tcase_add_test(legs, wrong_leg_takes_its_spurs_along);
    suite_add_tcase(suite, legs);
    return run_suite(suite);
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * The network solver beside ngspice (Debian package `ngspice`; a general-purpose circuit simulator
 * after L. W. Nagel, "SPICE2: A Computer Program to Simulate Semiconductor Circuits", 1975): rings
 * of one to eight points with spurs, spurs on spurs and junction boxes, every set-up, every family
 * of faults, parameters over four decades. The circuits ngspice gets are stated by plain.h, a
 * second reading of the definitions, so that a family which wires something else is seen as well
 * as a wrong sum.
 *
 * Each reading is 1 A into a copy of the circuit whose other probe is ground; a shunt of a known
 * conductance bears the current where there is no path. Rings are random, seeded and invented.
 */
#include "plain.h"

#include "../meter.h"
#include "../suite.h"

#include <stdlib.h>
#include <unistd.h>

enum { BATCH = 120, MEMBERS = 2, MEMBERS_MAX = 2048 };
static const double shunt_siemens = 1e-9, open_ohms = 1e8, tolerance = 1e-6;

struct reading_pair {
    bool open;      /* ours */
    bool joined;    /* the probes are one node: nothing to simulate */
    bool path;      /* by plain.h's resistors */
    double ohms;    /* ours, without offsets */
    double spice;   /* NAN: not read */
    char text[256]; /* what it is a reading of */
};

static struct {
    struct reading_pair pairs[BATCH];
    size_t n;
    char path[256];
    FILE *netlist;
} batch;

static struct {
    size_t readings, open, finite;
    double worst; /* relative difference */
} seen;

/* --- ngspice --- */

static void open_netlist(void)
{
    const char *directory = getenv("TMPDIR");
    snprintf(batch.path, sizeof batch.path, "%s/ringfettle-spice-XXXXXX",
             directory != NULL && strlen(directory) < 200 ? directory : "/tmp");
    int descriptor = mkstemp(batch.path);
    ck_assert_int_ge(descriptor, 0);
    batch.netlist = fdopen(descriptor, "w");
    ck_assert_ptr_nonnull(batch.netlist);
    fputs("ring circuits\n.options reltol=1e-12 abstol=1e-15 vntol=1e-15\n", batch.netlist);
    batch.n = 0;
}

static void run_ngspice(void)
{
    char command[320], line[512];
    fputs(".control\nset numdgt=15\nop\n", batch.netlist);
    for (size_t i = 0; i < batch.n; i++)
        if (!batch.pairs[i].joined)
            fprintf(batch.netlist, "print v(c%zu)\n", i);
    fputs("quit\n.endc\n.end\n", batch.netlist);
    ck_assert_int_eq(fclose(batch.netlist), 0);
    snprintf(command, sizeof command, "ngspice -n -b '%s' 2>&1", batch.path);
    FILE *answer = popen(command, "r");
    ck_assert_ptr_nonnull(answer);
    while (fgets(line, sizeof line, answer) != NULL) {
        char *end;
        if (!begins(line, "v(c"))
            continue;
        size_t i = strtoul(line + 3, &end, 10);
        ck_assert_msg(i < batch.n && begins(end, ") = "), "ngspice wrote %s", line);
        batch.pairs[i].spice = strtod(end + 4, NULL);
    }
    pclose(answer);
    unlink(batch.path);
}

static void compare(struct reading_pair *pair)
{
    ck_assert_msg(pair->path == !pair->open, "%s: ours %s, but the resistors make %s", pair->text,
                  pair->open ? "open" : "a path", pair->path ? "a path" : "none");
    seen.readings++;
    if (pair->joined) {
        ck_assert_msg(pair->ohms <= 0.0, "%s: %g Ω between joined probes", pair->text, pair->ohms);
        return;
    }
    ck_assert_msg(isfinite(pair->spice), "%s: ngspice gave no value", pair->text);
    if (pair->open) {
        ck_assert_msg(pair->spice > open_ohms, "%s: ours open, ngspice %.9g", pair->text,
                      pair->spice);
        seen.open++;
        return;
    }
    double spice = 1.0 / (1.0 / pair->spice - shunt_siemens);
    double difference = fabs(pair->ohms - spice) / spice;
    ck_assert_msg(difference < tolerance, "%s: ours %.12g, ngspice %.12g", pair->text, pair->ohms,
                  spice);
    seen.worst = fmax(seen.worst, difference);
    seen.finite++;
}

static void finish_batch(void)
{
    run_ngspice();
    for (size_t i = 0; i < batch.n; i++)
        compare(&batch.pairs[i]);
}

/* Labels of what hangs together: by resistors of 0 Ω only, or by all. */
static void label_nodes(const struct plain *plain, int label[PLAIN_NODES], bool zero_only)
{
    for (int v = 0; v < PLAIN_NODES; v++)
        label[v] = v;
    for (bool changed = true; changed;) {
        changed = false;
        for (size_t i = 0; i < plain->n_resistors; i++) {
            int *a = &label[plain->resistors[i].a], *b = &label[plain->resistors[i].b];
            if ((zero_only && plain->resistors[i].ohms > 0.0) || *a == *b)
                continue;
            *a = *b = *a < *b ? *a : *b;
            changed = true;
        }
    }
}

/* Writes copy number batch.n: node c<copy> is the probe the current enters, 0 the other. Parts that
 * hang on neither probe carry nothing and are left out. */
static void write_circuit(const struct plain *plain, int a, int b, struct reading_pair *pair)
{
    static int node[PLAIN_NODES], part[PLAIN_NODES];
    label_nodes(plain, node, true);
    label_nodes(plain, part, false);
    pair->joined = node[a] == node[b];
    pair->path = part[a] == part[b];
    if (pair->joined)
        return;
    size_t copy = batch.n;
    fprintf(batch.netlist, "Ic%zu 0 c%zu 1\nRc%zus c%zu 0 %.17g\n", copy, copy, copy, copy,
            1.0 / shunt_siemens);
    for (size_t i = 0; i < plain->n_resistors; i++) {
        int ends[2] = {plain->resistors[i].a, plain->resistors[i].b};
        char names[2][32];
        if (part[ends[0]] != part[a] && part[ends[0]] != part[b])
            continue;
        if (node[ends[0]] == node[ends[1]])
            continue;
        for (int k = 0; k < 2; k++)
            if (node[ends[k]] == node[b])
                strcpy(names[k], "0");
            else if (node[ends[k]] == node[a])
                snprintf(names[k], sizeof names[k], "c%zu", copy);
            else
                snprintf(names[k], sizeof names[k], "c%zun%d", copy, node[ends[k]]);
        fprintf(batch.netlist, "Rc%zu_%zu %s %s %.17g\n", copy, i, names[0], names[1],
                plain->resistors[i].ohms);
    }
}

/* --- cases --- */

struct ring_case {
    struct small_ring *ring;
    struct rf_models *models;
    struct wiring *wiring; /* faults applied */
    const struct hypothesis *faults;
    double value;
    int number;
};

static void read_both(const struct ring_case *c, size_t setup, enum spot spot, size_t place)
{
    struct reading_pair *pair = &batch.pairs[batch.n];
    struct plain plain;
    int a, b;
    const char *name = setups[setup].name, *key = spot == SPOT_POINT ? NULL : spot_keys[spot];
    double ours = read_wiring(c->wiring, name, spot, place);
    *pair = (struct reading_pair){.open = ours < 0.0, .ohms = ours, .spice = NAN};
    size_t written = 0;
    for (size_t i = 0; i < c->faults->n_faults && written < sizeof pair->text; i++) {
        const struct fault *f = &c->faults->faults[i];
        written += (size_t)snprintf(pair->text + written, sizeof pair->text - written,
                                    "%s (run %zu, conductor %d, place %zu, other %zu, pair %d), ",
                                    f->family->name, f->run, f->conductor, f->place, f->other,
                                    (int)f->pair);
    }
    if (written < sizeof pair->text)
        snprintf(pair->text + written, sizeof pair->text - written, "ring %d, value %g, %s %s",
                 c->number, c->value, name, key != NULL ? key : c->ring->places[place].id);
    plain_state(&plain, &c->ring->job, c->models, c->faults, c->value, name);
    plain_probe(&plain, key, place, &a, &b);
    write_circuit(&plain, a, b, pair);
    double offset = c->wiring->offset_parameter != NO_PARAMETER ? c->wiring->offset_ohms : 0.0;
    ck_assert_double_eq_tol(offset, plain_offset(&plain), 1e-12);
    if (++batch.n == BATCH) {
        finish_batch();
        open_netlist();
    }
}

/* A point with a front that the case's fault is about if it can be, else any. */
static size_t choose_point(const struct ring_case *c, uint64_t *seed)
{
    const struct fault *f = &c->faults->faults[0];
    const size_t candidates[] = {f->place, f->run + 1, f->chain[0]};
    const struct rf_job *job = &c->ring->job;
    size_t place = candidates[random_below(seed, 3)];
    bool any = random_unit(seed) < 0.4;
    for (int tries = 0; tries < 100; tries++) {
        if (!any && place < job->n_places && place_has_front(job, place))
            return place;
        any = false;
        place = random_below(seed, job->n_places);
    }
    return job->n_places;
}

static void read_everywhere(const struct ring_case *c, uint64_t *seed)
{
    for (size_t setup = 0; setup < N_SETUPS; setup++) {
        static const enum spot at_board[] = {SPOT_L, SPOT_N, SPOT_E, SPOT_BOARD, SPOT_OUT, SPOT_IN};
        size_t first = random_below(seed, 6), place = choose_point(c, seed);
        bool point =
            (setups[setup].spots & (1u << SPOT_POINT)) != 0 && place < c->ring->job.n_places;
        if (point)
            read_both(c, setup, SPOT_POINT, place);
        /* One of the spots at the board; after a point only now and then. */
        for (size_t i = 0; i < 6; i++) {
            enum spot spot = at_board[(first + i) % 6];
            if ((setups[setup].spots & (1u << spot)) == 0)
                continue;
            if (!point || random_unit(seed) < 0.4)
                read_both(c, setup, spot, 0);
            break;
        }
    }
}

static void lay_random(struct small_ring *ring, size_t n, uint64_t *seed)
{
    static const double sizes[] = {1.5, 2.5, 4.0};
    double run_m[16];
    for (size_t i = 0; i <= n; i++)
        run_m[i] = random_between(seed, 0.1, 60);
    ring_lay(ring, n, run_m);
    ring->job.temperature_c = 5 + 30 * random_unit(seed);
    ring->job.live_mm2 = sizes[random_below(seed, 3)];
    ring->job.cpc_mm2 = random_unit(seed) < 0.25 ? NAN : sizes[random_below(seed, 2)];
    for (size_t spurs = random_below(seed, 4); spurs > 0; spurs--)
        ring_add_spur(ring, random_below(seed, ring->job.n_places), random_between(seed, 0.3, 12));
    if (n >= 3) /* a spur on a spur at least here */
        ring_add_spur(ring, ring_add_spur(ring, 2, 3), 2);
    for (size_t place = 1; place < ring->job.n_places; place++) {
        struct place *p = &ring->places[place];
        bool own = random_unit(seed) < 0.2;
        p->live_mm2 = own ? sizes[random_below(seed, 3)] : ring->job.live_mm2;
        p->cpc_mm2 = own ? sizes[random_below(seed, 3)] : ring->job.cpc_mm2;
        if (random_unit(seed) < 0.1)
            p->run_m = NAN;
        if (place > 1 && place != n + 1 && random_unit(seed) < 0.2)
            p->kind = KIND_JUNCTION_BOX;
    }
}

struct members {
    struct fault faults[MEMBERS_MAX];
    size_t n;
};

static bool collect(void *context, const struct fault *fault)
{
    struct members *members = context;
    ck_assert_uint_lt(members->n, MEMBERS_MAX);
    members->faults[members->n++] = *fault;
    return true;
}

/* Readings of every set-up, so that families which need one have members. */
static void record_setups(struct small_ring *ring, struct reading readings[N_SETUPS])
{
    for (size_t setup = 0; setup < N_SETUPS; setup++) {
        readings[setup] = (struct reading){.setup = setup, .open = true};
        while ((setups[setup].spots & (1u << readings[setup].spot)) == 0)
            readings[setup].spot++;
        readings[setup].place = readings[setup].spot == SPOT_POINT ? 1 : 0;
    }
    ring->job.readings = readings;
    ring->job.n_readings = N_SETUPS;
}

static double next_value(uint64_t *seed, size_t count)
{
    static const double decades[] = {0.01, 0.1, 1, 10};
    return decades[count % 4] * random_between(seed, 1, 10);
}

static void wire_and_read(struct ring_case *c, uint64_t *seed)
{
    struct wiring wiring;
    for (size_t i = 0; i < c->models->n_families; i++)
        c->models->families[i].parameter.median = c->value;
    ck_assert_int_eq(wiring_init(&wiring, &c->ring->job, c->models, NULL), RF_OK);
    hypothesis_apply(c->faults, &wiring, NULL);
    c->wiring = &wiring;
    read_everywhere(c, seed);
    wiring_finish(&wiring);
}

static void name_families(struct rf_models *models)
{
    models_for_tests(models);
    models->n_families = n_fault_families;
    for (size_t i = 0; i < n_fault_families; i++)
        models->families[i] =
            (struct family_prior){.name = fault_families[i]->name, .parameter = {1.0, 1.0}};
}

static struct rf_models models;
static struct small_ring ring;
static struct reading readings[N_SETUPS];
static struct members members;

static void report(void)
{
    printf("%zu readings beside ngspice: %zu finite, worst relative difference %.1e; %zu open\n",
           seen.readings, seen.finite, seen.worst, seen.open);
}

START_TEST(every_set_up_and_family)
{
    uint64_t seed = 2025;
    size_t count = 0, cases_of[MODELS_MAX_FAMILIES] = {0};
    name_families(&models);
    ck_assert_uint_eq(n_fault_families, 17);
    open_netlist();
    for (size_t n = 1; n <= 8; n++) {
        lay_random(&ring, n, &seed);
        record_setups(&ring, readings);
        for (size_t family = 0; family < n_fault_families; family++) {
            members.n = 0;
            fault_families[family]->enumerate(&ring.job, &models, collect, &members);
            for (size_t i = 0; i < MEMBERS && members.n > 0; i++) {
                struct hypothesis faults = {.n_faults = 1};
                faults.faults[0] = members.faults[random_below(&seed, members.n)];
                struct ring_case c = {.ring = &ring,
                                      .models = &models,
                                      .faults = &faults,
                                      .value = next_value(&seed, count++),
                                      .number = (int)n};
                wire_and_read(&c, &seed);
                cases_of[family]++;
                if (members.n == 1)
                    break;
            }
        }
    }
    finish_batch();
    for (size_t family = 0; family < n_fault_families; family++)
        ck_assert_msg(cases_of[family] >= 3, "only %zu cases of %s", cases_of[family],
                      fault_families[family]->name);
    ck_assert_uint_gt(seen.finite, 500);
    ck_assert_uint_gt(seen.open, 100);
    report();
}
END_TEST

/* Two faults of different families, at different places where both are about fronts. */
static bool combines(const struct fault *one, const struct fault *other)
{
    static const char *const fit[] = {
        "break",    "joint", "contact",  "switched_off",    "load",
        "reversal", "short", "parallel", "interconnection", "transposed"};
    int known = 0;
    for (size_t i = 0; i < sizeof fit / sizeof *fit; i++)
        known += is_family(one, fit[i]) + is_family(other, fit[i]);
    return known == 2 && one->family != other->family &&
           (one->place == 0 || one->place != other->place);
}

/* A hypothesis is a set: in either order. */
static void in_either_order(struct ring_case *c, const struct fault *one, const struct fault *other,
                            uint64_t *seed)
{
    const struct hypothesis orders[] = {{.faults = {*one, *other}, .n_faults = 2},
                                        {.faults = {*other, *one}, .n_faults = 2}};
    for (size_t i = 0; i < 2; i++) {
        c->faults = &orders[i];
        wire_and_read(c, seed);
    }
}

START_TEST(two_faults_at_once)
{
    uint64_t seed = 77;
    size_t count = 0;
    name_families(&models);
    memset(&seen, 0, sizeof seen);
    open_netlist();
    for (size_t n = 4; n <= 7; n += 3) {
        lay_random(&ring, n, &seed);
        record_setups(&ring, readings);
        members.n = 0;
        for (size_t family = 0; family < n_fault_families; family++)
            fault_families[family]->enumerate(&ring.job, &models, collect, &members);
        for (size_t found = 0, tries = 0; found < 10 && tries < 20000; tries++) {
            const struct fault *one = &members.faults[random_below(&seed, members.n)];
            const struct fault *other = &members.faults[random_below(&seed, members.n)];
            if (!combines(one, other))
                continue;
            struct ring_case c = {.ring = &ring,
                                  .models = &models,
                                  .value = next_value(&seed, count++),
                                  .number = (int)n};
            in_either_order(&c, one, other, &seed);
            found++;
        }
        /* In one run: a conductor broken, or with a joint, and landed on another's terminal. */
        for (int conductor = 0; conductor < 3; conductor++) {
            const struct fault transposed = {
                .family = &fault_family_transposed, .run = 2, .pair = PAIR_LE};
            struct fault other = {.run = 2, .conductor = conductor};
            other.family = n == 4 ? &fault_family_break : &fault_family_joint;
            struct ring_case c = {.ring = &ring,
                                  .models = &models,
                                  .value = next_value(&seed, count++),
                                  .number = (int)n};
            in_either_order(&c, &transposed, &other, &seed);
        }
    }
    finish_batch();
    ck_assert_uint_eq(count, 2 * 13);
    report();
}
END_TEST

int main(void)
{
    if (system("command -v ngspice >/dev/null 2>&1") != 0) {
        fputs("SKIPPED: ngspice is not installed (Debian package: ngspice)\n", stderr);
        return getenv("CI") != NULL ? EXIT_FAILURE : 77;
    }
    Suite *suite = suite_create("spice");
    TCase *cases = tcase_create("spice");
    suite_add_tcase(suite, cases);
    tcase_set_timeout(cases, 120);
    tcase_add_test(cases, every_set_up_and_family);
    tcase_add_test(cases, two_faults_at_once);
    return run_suite(suite);
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * Bytes as choices that make a valid job, and what must hold of its diagnosis:
 *
 *   it is one: RF_OK, numbers, confidences that add up to one, a p between 0 and 1
 *   screening changes no confidence by more than 0.01
 *   other ids: the very same numbers
 *   readings in another order: the same but for rounding
 *   the ring listed backwards: the same evidence for the same fault. `in` and `out` change over
 *     throughout, so link_out is link_in, lead_out is lead_in. Crossed links stay what they are;
 *     their `board`, the pair's out ends, would be its in ends, which nobody can enter, so it is
 *     not read here. `transposed` is left out: where the two conductors differ, which of them
 *     lands on the other's terminal with its resistance depends on the direction.
 *
 *     So is a job with a `highest`: a fit may settle on another point as the highest one, and
 *     from which side it comes decides.
 *
 * The last two not where the misfit test says that nothing explains the readings: which of them a fit
 * then writes off can hang on the last bit.
 *
 * Reading values are from the bytes, or simulated with a seed from them.
 */

#include "fuzz.h"

#include "diagnosis/diagnosis.h"
#include "simulation/simulation.h"

#include <gsl/gsl_errno.h>
#include <math.h>

enum { MOST_RING = 5, MOST_SPURS = 2, MOST_PLACES = MOST_RING + MOST_SPURS + 2, MOST_READ = 40 };

struct made {
    size_t n_ring, n_spurs;
    unsigned run_dm[MOST_PLACES - 1]; /* [run] 0.1 m; 0: not known */
    bool own_size[MOST_PLACES - 1];   /* [run] 4/1.5 mm² instead of the ring's */
    bool box[MOST_PLACES];
    size_t from[MOST_SPURS]; /* places */
    bool cpc_unknown;
    unsigned accuracy; /* hundredths */
    size_t n_read;
    struct one {
        size_t setup;
        enum spot spot;
        size_t place;
        size_t repeats; /* 1 or 2 */
        bool open[2];
        double ohms[2];
    } read[MOST_READ];
};

struct bytes {
    const uint8_t *at, *end;
};

static unsigned take(struct bytes *bytes, unsigned below)
{
    return bytes->at < bytes->end ? *bytes->at++ % below : 0;
}

static size_t n_places(const struct made *made)
{
    return made->n_ring + made->n_spurs + 2;
}

/* --- making --- */

static void take_value(struct bytes *bytes, bool may_be_open, bool *open, double *ohms)
{
    unsigned byte = take(bytes, 256);
    *open = may_be_open && byte >= 245;
    *ohms = *open ? 0 : byte < 200 ? byte / 100.0 : (byte - 200) * 1.81;
}

static bool is_read(const struct made *made, size_t setup, enum spot spot, size_t place)
{
    for (size_t i = 0; i < made->n_read; i++)
        if (made->read[i].setup == setup && made->read[i].spot == spot &&
            made->read[i].place == place)
            return true;
    return false;
}

/* A reading that may be taken, by a byte for the set-up and one for the spot; or none. */
static void take_reading(struct bytes *bytes, struct made *made)
{
    struct one one = {.setup = take(bytes, N_SETUPS), .spot = SPOT_POINT};
    unsigned where = take(bytes, (unsigned)(N_SPOTS + n_places(made)));
    if (where > SPOT_POINT && where < N_SPOTS) {
        one.spot = (enum spot)where;
    } else {
        one.place = where < N_SPOTS ? 1 : where - N_SPOTS;
        if (one.place == 0 || one.place == made->n_ring + 1 || made->box[one.place])
            return;
    }
    if ((setups[one.setup].spots & 1u << one.spot) == 0 || one.spot == SPOT_BOARD ||
        is_read(made, one.setup, one.spot, one.place))
        return;
    one.repeats = 1 + (take(bytes, 8) == 7);
    for (size_t i = 0; i < one.repeats; i++)
        take_value(bytes, one.spot != SPOT_HIGHEST, &one.open[i], &one.ohms[i]);
    made->read[made->n_read++] = one;
}

static void take_made(struct bytes *bytes, struct made *made)
{
    made->n_ring = 1 + take(bytes, MOST_RING);
    made->n_spurs = take(bytes, MOST_SPURS + 1);
    made->cpc_unknown = take(bytes, 6) == 5;
    made->accuracy = 1 + take(bytes, 200);
    for (size_t run = 0; run + 1 < n_places(made); run++) {
        unsigned byte = take(bytes, 256);
        made->run_dm[run] = byte < 20 ? 0 : byte > 250 ? 5000 : byte - 19;
        /* The last run has no cable of its own, so the first, backwards the last, has none. */
        made->own_size[run] = run > 0 && run != made->n_ring && take(bytes, 8) == 7;
    }
    for (size_t i = 0; i < made->n_spurs; i++)
        made->from[i] = take(bytes, (unsigned)(made->n_ring + 2 + i));
    for (size_t place = 1; place < n_places(made); place++)
        made->box[place] = place != made->n_ring + 1 && take(bytes, 8) == 7;
    made->read[made->n_read++] = (struct one){.spot = SPOT_L, .repeats = 1, .ohms = {0.3}};
    while (bytes->at < bytes->end && made->n_read < MOST_READ)
        take_reading(bytes, made);
}

/* --- writing --- */

struct listing {
    bool renamed, reordered, backwards;
};

static size_t map_place(const struct made *made, const struct listing *as, size_t place)
{
    return as->backwards && place <= made->n_ring + 1 ? made->n_ring + 1 - place : place;
}

static size_t map_run(const struct made *made, const struct listing *as, size_t run)
{
    return as->backwards && run <= made->n_ring ? made->n_ring - run : run;
}

static enum joining other_end(enum joining joining)
{
    switch (joining) {
    case JOIN_LINK_OUT: return JOIN_LINK_IN;
    case JOIN_LINK_IN: return JOIN_LINK_OUT;
    case JOIN_LEAD_OUT: return JOIN_LEAD_IN;
    case JOIN_LEAD_IN: return JOIN_LEAD_OUT;
    default: return joining;
    }
}

static size_t map_setup(const struct listing *as, size_t setup)
{
    for (size_t i = 0; as->backwards && i < N_SETUPS; i++)
        if (setups[i].joining == other_end(setups[setup].joining) &&
            setups[i].pair == setups[setup].pair && setups[i].conductor == setups[setup].conductor)
            return i;
    return setup;
}

static enum spot map_spot(const struct listing *as, enum spot spot)
{
    if (as->backwards && (spot == SPOT_OUT || spot == SPOT_IN))
        return spot == SPOT_OUT ? SPOT_IN : SPOT_OUT;
    return spot;
}

/* The id of a place of `made`, as the listing calls it. */
static void add_id(const struct made *made, const struct listing *as, size_t place,
                   struct text *out)
{
    size_t listed = map_place(made, as, place);
    if (listed == 0 || listed == made->n_ring + 1)
        text_add(out, listed == 0 ? "out" : "in");
    else if (as->renamed)
        text_addf(out, "hall / %zu \xC3\xA9", 97 - place);
    else
        text_addf(out, "P%zu", place);
}

/* The run that leads to the place listed at `listed`, as it was made. */
static void add_run(const struct made *made, const struct listing *as, size_t listed,
                    const char *key, struct text *out)
{
    size_t run = map_run(made, as, listed - 1); /* its own inverse */
    if (made->run_dm[run] > 0)
        text_addf(out, ", \"%s\": %u.%u", key, made->run_dm[run] / 10, made->run_dm[run] % 10);
    if (made->own_size[run])
        text_add(out, ", \"live_mm2\": 4, \"cpc_mm2\": 1.5");
}

static void add_ring(const struct made *made, const struct listing *as, struct text *out)
{
    text_addf(out, "\"ring\": {\"length_accuracy\": %u.%02u, \"cpc_mm2\": %s, \"points\": [",
              made->accuracy / 100, made->accuracy % 100, made->cpc_unknown ? "null" : "1.5");
    for (size_t listed = 1; listed <= made->n_ring; listed++) {
        size_t place = map_place(made, as, listed);
        text_addf(out, "%s{\"id\": \"", listed > 1 ? ", " : "");
        add_id(made, as, place, out);
        text_add(out, made->box[place] ? "\", \"kind\": \"junction_box\"" : "\"");
        add_run(made, as, listed, "run_m", out);
        text_add(out, "}");
    }
    text_add(out, "]");
    add_run(made, as, made->n_ring + 1, "last_run_m", out);
    for (size_t i = 0; i < made->n_spurs; i++) {
        size_t place = made->n_ring + 2 + i;
        text_add(out, i == 0 ? ", \"spurs\": [{\"id\": \"" : ", {\"id\": \"");
        add_id(made, as, place, out);
        text_add(out, "\", \"from\": \"");
        add_id(made, as, made->from[i], out);
        text_add(out, made->box[place] ? "\", \"kind\": \"junction_box\"" : "\"");
        add_run(made, as, place, "run_m", out);
        text_add(out, "}");
    }
    text_add(out, made->n_spurs > 0 ? "]}" : "}");
}

static void add_value(const struct one *one, size_t repeat, struct text *out)
{
    if (one->open[repeat])
        text_add(out, "\"open\"");
    else
        text_addf(out, "%.2f", one->ohms[repeat]);
}

static void add_reading(const struct made *made, const struct listing *as, const struct one *one,
                        struct text *out)
{
    enum spot spot = map_spot(as, one->spot);
    text_add(out, "\"");
    if (spot == SPOT_POINT)
        add_id(made, as, one->place, out);
    else
        text_add(out, spot_keys[spot]);
    text_add(out, one->repeats > 1 ? "\": [" : "\": ");
    add_value(one, as->reordered ? one->repeats - 1 : 0, out);
    if (one->repeats > 1) {
        text_add(out, ", ");
        add_value(one, as->reordered ? 0 : 1, out);
        text_add(out, "]");
    }
}

static void add_readings(const struct made *made, const struct listing *as, struct text *out)
{
    size_t n_setups_written = 0;
    text_add(out, "\"readings\": {");
    for (size_t k = 0; k < N_SETUPS; k++) {
        size_t setup = as->reordered ? N_SETUPS - 1 - k : k, n = 0;
        for (size_t i = 0; i < made->n_read; i++) {
            const struct one *one = &made->read[as->reordered ? made->n_read - 1 - i : i];
            if (map_setup(as, one->setup) != setup)
                continue;
            if (n++ > 0)
                text_add(out, ", ");
            else
                text_addf(out, "%s\"%s\": {", n_setups_written++ > 0 ? ", " : "",
                          setups[setup].name);
            add_reading(made, as, one, out);
        }
        text_add(out, n > 0 ? "}" : "");
    }
    text_add(out, "}");
}

static struct rf_job *list(const struct made *made, const struct listing *as)
{
    struct text text = {0};
    struct rf_error error = {0};
    struct rf_job *job = NULL;
    text_add(&text, "{\"format\": \"ringfettle-job/1\", ");
    add_ring(made, as, &text);
    text_add(&text, ", ");
    add_readings(made, as, &text);
    text_add(&text, "}");
    MUST(!text.failed, "memory");
    MUST(rf_job_parse(text.bytes, text.length, "made", &job, &error) == RF_OK, "%s\n%s", error.text,
         text.bytes);
    if (getenv("FUZZ_SHOW") != NULL)
        fprintf(stderr, "%s\n", text.bytes);
    text_finish(&text);
    return job;
}

/* Puts simulated values in the place of those made. */
static void simulate_values(struct made *made, const struct rf_models *models, uint32_t seed)
{
    const struct listing plain = {0};
    const struct simulation simulation = {.seed = seed, .defects = seed % 3};
    struct rf_job *ring = list(made, &plain);
    struct truth *truth = NULL;
    struct rf_error error = {0};
    MUST(simulate(ring, models, &simulation, &truth, &error) == RF_OK, "%s", error.text);
    for (size_t i = 0; i < truth->job->n_readings; i++) {
        const struct reading *reading = &truth->job->readings[i];
        for (size_t k = 0; k < made->n_read; k++) {
            struct one *one = &made->read[k];
            if (one->setup == reading->setup && one->spot == reading->spot &&
                one->place == reading->place && !(reading->open && one->spot == SPOT_HIGHEST)) {
                one->open[reading->repeat] = reading->open;
                one->ohms[reading->repeat] = reading->ohms;
            }
        }
    }
    truth_destroy(truth);
    rf_job_destroy(ring);
}

/* --- what must hold --- */

static void expect_sane(const struct rf_diagnosis *d)
{
    double sum = 0;
    MUST(d->n_ranked > 0, "nothing ranked of %zu", d->n_hypotheses);
    for (size_t i = 0; i < d->n_ranked; i++) {
        MUST(d->ranked[i].confidence >= confidence_shown && d->ranked[i].confidence <= 1 + 1e-12,
             "%zu: %.17g", i, d->ranked[i].confidence);
        MUST(i == 0 || d->ranked[i].confidence <= d->ranked[i - 1].confidence * (1 + 1e-5), "%zu",
             i);
        MUST(isfinite(d->ranked[i].log_evidence), "%zu: %g", i, d->ranked[i].log_evidence);
        sum += d->ranked[i].confidence;
    }
    MUST(sum <= 1 + 1e-9 && sum + (double)(d->n_hypotheses - d->n_ranked) * confidence_shown >= 1,
         "%.17g of %zu, %zu ranked", sum, d->n_hypotheses, d->n_ranked);
    MUST(d->misfit.p >= 0 && d->misfit.p <= 1, "%g", d->misfit.p);
    for (size_t i = 0; i < d->n_places; i++)
        MUST(d->places[i].chance >= 0 && d->places[i].chance <= 1 + 1e-9, "%g",
             d->places[i].chance);
}

static struct rf_diagnosis *look_into(const struct rf_job *job, const struct rf_models *models,
                                      bool screen)
{
    struct rf_diagnosis *diagnosis = NULL;
    struct rf_error error = {0};
    enum rf_status status = diagnose(job, models, screen, &diagnosis, &error);
    if (status == RF_REFUSED) /* a ring beyond the meter's range */
        return NULL;
    MUST(status == RF_OK, "%s", error.text);
    expect_sane(diagnosis);
    return diagnosis;
}

static const struct ranked *find(const struct rf_diagnosis *d, const struct hypothesis *hypothesis)
{
    for (size_t i = 0; i < d->n_ranked; i++)
        if (hypothesis_equal(&d->ranked[i].hypothesis, hypothesis))
            return &d->ranked[i];
    return NULL;
}

/* Every confidence within `most` of the other's. */
static void expect_near(const struct rf_diagnosis *one, const struct rf_diagnosis *other,
                        double most, const char *what)
{
    for (size_t i = 0; i < one->n_ranked; i++) {
        const struct ranked *twin = find(other, &one->ranked[i].hypothesis);
        double here = one->ranked[i].confidence, there = twin != NULL ? twin->confidence : 0;
        if (twin == NULL && here < confidence_shown + most)
            continue; /* just not listed there */
        MUST(fabs(here - there) <= most, "%s: %s: %.9f, %.9f", what, one->ranked[i].words, here,
             there);
    }
}

static struct hypothesis map_hypothesis(const struct made *made, const struct listing *as,
                                        const struct hypothesis *hypothesis)
{
    struct hypothesis mapped = *hypothesis;
    for (size_t i = 0; i < mapped.n_faults; i++) {
        struct fault *f = &mapped.faults[i];
        unsigned fields = f->family->fields;
        bool points = (fields & (FIELD_AT | FIELD_AT_ANY)) != 0;
        bool between = (fields & (FIELD_BETWEEN_RING | FIELD_BETWEEN_POINTS)) != 0;
        if ((fields & (FIELD_RUN | FIELD_RING_RUN)) != 0)
            f->run = map_run(made, as, f->run);
        if (points || between)
            f->place = map_place(made, as, f->place);
        if (between)
            f->other = map_place(made, as, f->other);
        if (between && f->other < f->place) {
            size_t swap = f->place;
            f->place = f->other;
            f->other = swap;
        }
        for (size_t k = 0; k < f->chain_length; k++)
            f->chain[k] = map_place(made, as, f->chain[k]);
        if ((fields & (FIELD_CROSS_SETUP | FIELD_LINK_SETUP)) != 0)
            f->setup = map_setup(as, f->setup);
        if ((fields & (FIELD_LEG | FIELD_LINK_SETUP)) != 0)
            f->leg_in = !f->leg_in;
    }
    return mapped;
}

static bool is_transposed(const struct ranked *ranked)
{
    return ranked->hypothesis.n_faults > 0 &&
           ranked->hypothesis.faults[0].family == &fault_family_transposed;
}

static void expect_mirrored(const struct made *made, const struct listing *as,
                            const struct rf_diagnosis *one, const struct rf_diagnosis *other)
{
    double transposed = 0;
    for (size_t i = 0; i < other->n_ranked; i++)
        transposed += is_transposed(&other->ranked[i]) ? other->ranked[i].confidence : 0;
    for (size_t i = 0; i < one->n_ranked; i++) {
        const struct ranked *here = &one->ranked[i];
        if (here->confidence < 0.02 || is_transposed(here))
            continue;
        struct hypothesis mapped = map_hypothesis(made, as, &here->hypothesis);
        const struct ranked *there = find(other, &mapped);
        MUST(there != NULL || transposed > 0.5, "%s: %.6f, backwards none", here->words,
             here->confidence);
        MUST(there == NULL || fabs(here->log_evidence - there->log_evidence) < 0.01,
             "%s: log evidence %.9f, backwards %.9f; confidence %.6f, %.6f", here->words,
             here->log_evidence, there->log_evidence, here->confidence, there->confidence);
    }
}

static const struct rf_models *shipped(void)
{
    static struct rf_models *models;
    struct rf_error error = {0};
    if (models == NULL) {
        gsl_set_error_handler_off();
        MUST(rf_models_load(NULL, RF_RATES_CONSULTED, &models, &error) == RF_OK, "%s", error.text);
    }
    return models;
}

static bool reads_highest(const struct made *made)
{
    for (size_t i = 0; i < made->n_read; i++)
        if (made->read[i].spot == SPOT_HIGHEST)
            return true;
    return false;
}

static void compare(const struct made *made,
                    const struct rf_diagnosis *screened, const struct rf_diagnosis *whole,
                    const struct listing *as)
{
    struct rf_job *listed = list(made, as);
    struct rf_diagnosis *other = look_into(listed, shipped(), as->renamed);
    MUST(other != NULL, "refused as listed otherwise");
    /* Of two defects, what has been tried is counted too. */
    MUST(whole->wider.two_defects || other->wider.two_defects ||
             other->n_hypotheses == whole->n_hypotheses,
         "%zu, %zu", other->n_hypotheses, whole->n_hypotheses);
    if (as->renamed)
        expect_near(screened, other, 0, "other ids");
    else if (whole->misfit.flag || other->misfit.flag)
        ;
    else if (as->reordered)
        expect_near(whole, other, 1e-3, "another order");
    else if (!reads_highest(made))
        expect_mirrored(made, as, whole, other);
    rf_diagnosis_destroy(other);
    rf_job_destroy(listed);
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    static const struct listing plain, others[] = {
        {.renamed = true}, {.reordered = true}, {.backwards = true}};
    if (size < 8 || size > 400)
        return 0;
    struct bytes bytes = {data + 2, data + size};
    struct made made = {0};
    take_made(&bytes, &made);
    if (data[0] % 2 == 1)
        simulate_values(&made, shipped(), data[0] * 256u + data[1]);

    struct rf_job *job = list(&made, &plain);
    struct rf_diagnosis *screened = look_into(job, shipped(), true);
    struct rf_diagnosis *whole = look_into(job, shipped(), false);
    MUST((screened == NULL) == (whole == NULL), "refused with screening only, or without only");
    if (whole == NULL) {
        rf_job_destroy(job);
        return 0;
    }
    expect_near(screened, whole, 0.01, "screening");
    expect_near(whole, screened, 0.01, "screening");
    for (size_t i = 0; i < sizeof others / sizeof others[0]; i++)
        compare(&made, screened, whole, &others[i]);
    rf_diagnosis_destroy(screened);
    rf_diagnosis_destroy(whole);
    rf_job_destroy(job);
    return 0;
}

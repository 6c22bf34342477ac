/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "advice/steps.h"

#include "advice/words.h"
#include "base/memory.h"

#include <string.h>

/* What an answer would mean: the hypotheses that then make up this share, together. */
static const double share_meant = 0.8;
/* Of the outcomes, those at least so likely are worth words in the plan. */
static const double chance_told = 0.05;
enum { OUTCOMES_TOLD = 4 };

static void capital(struct text *text)
{
    if (text->bytes != NULL && text->bytes[0] >= 'a' && text->bytes[0] <= 'z')
        text->bytes[0] = (char)(text->bytes[0] - 'a' + 'A');
}

/* The likeliest hypotheses after an outcome, until they make up share_meant of it. */
static size_t likeliest(const double after[], double total, size_t n, size_t members[], bool *taken)
{
    double sum = 0.0;
    size_t count = 0;
    memset(taken, 0, n * sizeof *taken);
    while (count < n && sum < share_meant * total) {
        size_t best = n;
        for (size_t h = 0; h < n; h++)
            if (!taken[h] && (best == n || after[h] > after[best]))
                best = h;
        taken[best] = true;
        members[count++] = best;
        sum += after[best];
    }
    return count;
}

static bool write_meaning(const struct rf_diagnosis *diagnosis, struct outcome *outcome,
                          const double after[], size_t n, size_t members[], bool *taken)
{
    struct text words = {0};
    size_t count = likeliest(after, outcome->chance, n, members, taken);
    bool ok = describe_together(diagnosis, members, count, &words);
    outcome->words = words.bytes;
    return ok && !words.failed && words.bytes != NULL;
}

static void say_outcomes(const struct plan *plan, struct text *out)
{
    size_t told = 0;
    for (size_t o = 0; o < plan->n_outcomes && told < OUTCOMES_TOLD; o++) {
        const struct outcome *outcome = &plan->outcomes[o];
        if (outcome->chance < chance_told && told > 0)
            continue;
        text_add(out, told++ > 0 ? "; " : " ");
        if (outcome->open)
            text_add(out, "over range");
        else
            text_addf(out, "about %.2f Ω", outcome->ohms);
        text_addf(out, ": %s", outcome->words);
    }
    text_add(out, ".");
}

void say_reads(const struct rf_job *job, const struct plan *plan, struct text *out)
{
    if (plan->setup_in_place)
        text_add(out, "With the links as they are, ");
    else {
        text_add(out, "At the board ");
        say_connection(plan->setup, out);
        text_add(out, "; ");
    }
    say_meter(plan->setup, out);
    for (size_t i = 0; i < plan->n_reads; i++) {
        text_add(out, i == 0 ? " " : ", then ");
        say_where(job, &plan->reads[i], out);
    }
    text_add(out, plan->n_reads > 1 ? ", as long as it is not settled." : ".");
}

bool write_read_words(const struct rf_diagnosis *diagnosis, struct plan *plan, size_t n,
                      const double after[])
{
    size_t *members = NEW_ARRAY(size_t, n);
    bool *taken = NEW_ARRAY(bool, n);
    bool ok = members != NULL && taken != NULL;
    for (size_t o = 0; o < plan->n_outcomes && ok; o++)
        ok = write_meaning(diagnosis, &plan->outcomes[o], after + o * n, n, members, taken);
    free(members);
    free(taken);
    struct text words = {0};
    if (ok) {
        say_reads(diagnosis->job, plan, &words);
        text_add(&words, plan->n_reads > 1 ? " First reading:" : " The reading:");
        say_outcomes(plan, &words);
    }
    plan->words = words.bytes;
    return ok && !words.failed && words.bytes != NULL;
}

bool write_look_words(const struct rf_diagnosis *diagnosis, struct plan *plan)
{
    struct text words = {0};
    say_look(diagnosis->job, &plan->look, &words);
    capital(&words);
    text_add(&words, ".");
    plan->words = words.bytes;
    return !words.failed && words.bytes != NULL;
}

bool write_stop_words(struct rf_advice *advice)
{
    struct text words = {0};
    text_addf(&words,
              "Looking or measuring on is not worth it: what is left of all defects together has a "
              "chance of %.1f %%.",
              100.0 * advice->defect_chance);
    advice->stop_words = words.bytes;
    return !words.failed && words.bytes != NULL;
}

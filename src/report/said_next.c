/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/said.h"

#include "report/words.h"

static void add_plain(struct said *said, struct text *words)
{
    said_add(said, LINE_PLAIN, 0, 0, words);
}

/* What it costs, and how far off the find is with it and without. */
void say_cost(const struct rf_advice *advice, struct said *said)
{
    const struct plan *plan = &advice->plans[0];
    struct text words = {0};
    text_add(&words, "About ");
    say_minutes(plan->minutes, &words);
    if (plan->action == ACTION_READ) {
        text_add(&words, "; to the find about ");
        say_minutes(advice->measure_first, &words);
        text_add(&words, " on the average, by looking alone about ");
        say_minutes(advice->look_now, &words);
    } else {
        text_add(&words, "; to the find about ");
        say_minutes(advice->measure_first, &words);
        text_add(&words, advice->measure_first < advice->look_now
                             ? " on the average; if nothing shows there, a reading comes next"
                             : " on the average, and no reading would shorten that by what it "
                               "costs");
    }
    text_add(&words, ".");
    add_plain(said, &words);
}

void say_next(const struct rf_advice *advice, struct said *said)
{
    if (advice == NULL)
        return;
    struct text words = {0};
    if (advice->stop) {
        text_add(&words, advice->stop_words);
        add_plain(said, &words);
        return;
    }
    if (advice->n_plans == 0)
        return;
    if (shows_no_defect(advice->diagnosis))
        text_add(&words, "To go on all the same. ");
    text_add(&words, advice->plans[0].words);
    add_plain(said, &words);
    say_cost(advice, said);
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/connection.h"
#include "report/page_parts.h"
#include "report/said.h"
#include "report/scene_svg.h"
#include "report/words.h"

#include <math.h>

enum { STEPS_MOST = 8 };

/* --- the reading advised --- */

static void outcomes(struct page *page, const struct plan *plan)
{
    struct markup *markup = page->markup;
    if (plan->n_outcomes == 0)
        return;
    markup_element(markup, "h3", NULL, "What the first reading would mean");
    markup_open(markup, "ul");
    markup_attribute(markup, "class", "chances");
    for (size_t i = 0; i < plan->n_outcomes; i++) {
        const struct outcome *outcome = &plan->outcomes[i];
        struct text words = {0};
        if (!outcome->open)
            text_add(&words, "about ");
        say_ohms_unit(outcome->open ? (double)NAN : outcome->ohms, &words);
        text_addf(&words, ": %s", outcome->words != NULL ? outcome->words : "");
        if (words.failed)
            markup->failed = true;
        else
            chance_item(page, outcome->chance, 0, words.bytes);
        text_finish(&words);
    }
    markup_close(markup);
}

static void connection(struct page *page, const struct measurement *read)
{
    struct markup *markup = page->markup;
    struct scene scene = {0};
    connection_drawing(page->diagnosis->job, read, &scene);
    markup_open(markup, "figure");
    scene_svg(markup, &scene, "connect");
    markup_element(markup, "figcaption", NULL,
                   "At the board. Thick: the links; dashed: the meter's leads. Ends not joined "
                   "stay free, off the bars.");
    markup_close(markup);
    scene_finish(&scene);
}

static void cost(struct page *page)
{
    struct said said = {0};
    say_cost(page->advice, &said);
    for (size_t i = 0; i < said.n; i++)
        markup_element(page->markup, "p", "about", said.lines[i].words);
    page->markup->failed = page->markup->failed || said.failed;
    said_finish(&said);
}

/* What to do; of a reading, without what it may say, which gets a list. */
static void what_to_do(struct page *page, const struct plan *plan, bool reads)
{
    struct text words = {0};
    if (shows_no_defect(page->diagnosis))
        text_add(&words, "To go on all the same. ");
    if (reads)
        say_reads(page->diagnosis->job, plan, &words);
    else
        text_add(&words, plan->words != NULL ? plan->words : "");
    markup_element_of(page->markup, "p", "first", &words);
}

static void advised(struct page *page, const struct plan *plan)
{
    struct markup *markup = page->markup;
    bool reads = plan->action == ACTION_READ && plan->n_reads > 0;
    markup_open(markup, "div");
    if (reads)
        markup_attribute(markup, "class", "beside");
    markup_open(markup, "div");
    what_to_do(page, plan, reads);
    cost(page);
    if (reads)
        outcomes(page, plan);
    markup_close(markup);
    if (reads)
        connection(page, &plan->reads[0]);
    markup_close(markup);
}

/* --- looking, and what else there is to do --- */

static void looking_only(struct page *page)
{
    const struct rf_advice *advice = page->advice;
    struct markup *markup = page->markup;
    if (advice->n_steps == 0)
        return;
    markup_element(markup, "h3", NULL, "Looking only, in this order");
    markup_open(markup, "ol");
    for (size_t i = 0; i < advice->n_steps && i < STEPS_MOST; i++) {
        const struct look_step *step = &advice->steps[i];
        struct text words = {0};
        say_look(page->diagnosis->job, &step->look, &words);
        text_add(&words, ": ");
        say_chance(step->chance, &words);
        text_addf(&words, ", %.0f min", step->minutes);
        markup_element_of(markup, "li", NULL, &words);
    }
    markup_close(markup);
    if (advice->n_steps > STEPS_MOST) {
        markup_open(markup, "p");
        markup_textf(markup, "And %zu more.", advice->n_steps - STEPS_MOST);
        markup_close(markup);
    }
}

static void runners_up(struct page *page)
{
    const struct rf_advice *advice = page->advice;
    struct markup *markup = page->markup;
    if (advice->n_plans < 2)
        return;
    markup_open(markup, "details");
    markup_element(markup, "summary", NULL, "What else could come next");
    markup_open(markup, "ul");
    markup_attribute(markup, "class", "dots");
    for (size_t i = 1; i < advice->n_plans; i++) {
        markup_open(markup, "li");
        markup_text(markup, advice->plans[i].words != NULL ? advice->plans[i].words : "");
        markup_textf(markup, " (%.0f min)", advice->plans[i].minutes);
        markup_close(markup);
    }
    markup_close(markup);
    markup_close(markup);
}

void section_next(struct page *page)
{
    const struct rf_advice *advice = page->advice;
    if (advice == NULL)
        return;
    open_section(page, "next", NULL, HEADING_NEXT);
    if (advice->stop && advice->stop_words != NULL)
        markup_element(page->markup, "p", "first", advice->stop_words);
    else if (advice->n_plans > 0)
        advised(page, &advice->plans[0]);
    looking_only(page);
    runners_up(page);
    close_section(page);
}

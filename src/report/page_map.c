/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "faults/places.h"
#include "report/lengths.h"
#include "report/page_parts.h"
#include "report/said.h"
#include "report/scene_svg.h"
#include "report/words.h"

#include <math.h>

/* --- the map --- */

static bool drawn(const struct scene *scene, enum scene_role role)
{
    for (size_t i = 0; i < scene->n; i++)
        if (scene->items[i].role == role)
            return true;
    return false;
}

/* Only what this map shows. */
static void legend(struct page *page, const struct scene *scene)
{
    static const struct {
        enum scene_role role;
        const char *words;
    } entries[] = {
        {ROLE_CHANCE, "Disc and number: the chance that the defect shows there; the likelier, the "
                      "larger."},
        {ROLE_FINDING_1, "A and the unbroken band inside the ring: wherever that finding may lie."},
        {ROLE_FINDING_2, "B and the dashed band: the next; not to be told from A without more "
                         "readings."},
        {ROLE_FINDING_3, "C and the dotted band: the one after that."},
        {ROLE_BRIDGE, "Dashes across the ring: what joins two places."},
        {ROLE_LINE, "Conductors apart, from the outside: line (brown), neutral (blue), CPC (green "
                    "and yellow)."},
        {ROLE_RESISTOR, "Box in a conductor: resistance where there should be none."},
        {ROLE_CUT, "Gap in a conductor: broken."},
        {ROLE_SEEN, "Filled, with a tick: seen to, nothing wrong there."},
    };
    struct markup *markup = page->markup;
    markup_open(markup, "figcaption");
    markup_open(markup, "ul");
    for (size_t i = 0; i < sizeof entries / sizeof entries[0]; i++)
        if (drawn(scene, entries[i].role))
            markup_element(markup, "li", NULL, entries[i].words);
    markup_element(markup, "li", NULL,
                   "Runs in proportion to their fitted lengths; very short ones are drawn longer, "
                   "to be seen.");
    markup_close(markup);
    markup_close(markup);
}

void page_map(struct page *page)
{
    struct scene scene = {0};
    ring_map(page->diagnosis, &scene);
    markup_open(page->markup, "figure");
    scene_svg(page->markup, &scene, "map");
    legend(page, &scene);
    markup_close(page->markup);
    scene_finish(&scene);
}

/* --- the list of places --- */

static void metres_cell(struct markup *markup, const struct page *page, size_t run)
{
    double recorded = page->diagnosis->job->places[run_far_end(run)].run_m;
    markup_open(markup, "td");
    markup_textf(markup, "%.1f", run_metres(page->diagnosis, run));
    markup_close(markup);
    markup_open(markup, "td");
    markup_attribute(markup, "class", "soft");
    if (isnan(recorded))
        markup_text(markup, "\u2013");
    else
        markup_textf(markup, "%g", recorded);
    markup_close(markup);
}

static void state_cell(struct markup *markup, const struct page *page, size_t place)
{
    const struct place *of = &page->diagnosis->job->places[place];
    double chance = chance_at_place(page->diagnosis, place);
    struct text words = {0};
    if (chance >= place_said)
        say_chance(chance, &words);
    if (of->opened || of->checked)
        text_addf(&words, "%s%s", words.length > 0 ? ", " : "",
                  of->opened ? "seen inside" : "face seen to");
    markup_element_of(markup, "td", NULL, &words);
}

static void place_row(struct page *page, size_t place)
{
    struct markup *markup = page->markup;
    const struct rf_job *job = page->diagnosis->job;
    struct text name = {0}, number = {0};
    bool end = place_is_end(job, place);
    if (!end)
        text_addf(&number, "%zu", place_number(job, place));
    if (end)
        text_add(&name, "back at the board");
    else
        say_place(job, place, &name);
    if (!place_on_ring(job, place)) {
        text_add(&name, ", on a spur from ");
        say_place(job, job->places[place].from, &name);
    }
    markup_open(markup, "tr");
    markup_element_of(markup, "td", NULL, &number);
    markup_element_of(markup, "th", "left", &name);
    metres_cell(markup, page, place - 1);
    state_cell(markup, page, place);
    markup_close(markup);
}

void page_places(struct page *page)
{
    static const char *const columns[] = {"No.", "place", "m before", "recorded",
                                          "chance"};
    const struct rf_job *job = page->diagnosis->job;
    struct markup *markup = page->markup;
    markup_open(markup, "details");
    if (ring_map_numbers(job))
        markup_attribute(markup, "open", "open");
    markup_element(markup, "summary", NULL, "All places, in the ring's order");
    markup_open(markup, "table");
    markup_open(markup, "thead");
    markup_open(markup, "tr");
    for (size_t i = 0; i < sizeof columns / sizeof columns[0]; i++)
        markup_element(markup, "th", i == 1 ? "left" : NULL, columns[i]);
    markup_close(markup);
    markup_close(markup);
    markup_open(markup, "tbody");
    for (size_t place = 1; place < job->n_places; place++)
        place_row(page, place);
    markup_close(markup);
    markup_close(markup);
    markup_close(markup);
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/error.h"
#include "faults/places.h"
#include "report/page_parts.h"
#include "report/readings_plot.h"
#include "report/said.h"
#include "report/scene_svg.h"
#include "report/words.h"

#include <math.h>

/* --- plots --- */

static enum rf_status plot(struct page *page, size_t setup, struct rf_error *error)
{
    struct scene scene = {0};
    struct text name = {0};
    enum rf_status status = readings_plot(page->diagnosis, setup, &scene, error);
    if (status == RF_OK) {
        say_set_up(setup, &name);
        markup_open(page->markup, "figure");
        markup_element_of(page->markup, "h3", NULL, &name);
        scene_svg(page->markup, &scene, setups[setup].name);
        markup_close(page->markup);
    }
    scene_finish(&scene);
    return status;
}

static enum rf_status plots(struct page *page, struct rf_error *error)
{
    enum rf_status status = RF_OK;
    markup_open(page->markup, "div");
    markup_attribute(page->markup, "class", "plots");
    for (size_t setup = 0; setup < N_SETUPS && status == RF_OK; setup++)
        if (setup_has_readings(page->diagnosis->job, setup))
            status = plot(page, setup, error);
    markup_close(page->markup);
    return status;
}

/* --- the table --- */

static void ohm_cell(struct markup *markup, double ohms)
{
    struct text words = {0};
    say_ohms(ohms, &words);
    markup_element_of(markup, "td", NULL, &words);
}

static void reading_row(struct page *page, size_t i)
{
    const struct rf_diagnosis *diagnosis = page->diagnosis;
    const struct reading *reading = &diagnosis->job->readings[i];
    struct text name = {0};
    bool again = is_suspect(diagnosis, i);
    if (again)
        text_add(&name, "* ");
    say_spot(diagnosis->job, reading->spot, reading->place, &name);
    if (reading->repeat > 0)
        text_add(&name, ", again");
    markup_open(page->markup, "tr");
    if (again)
        markup_attribute(page->markup, "class", "again");
    markup_element_of(page->markup, "th", NULL, &name);
    ohm_cell(page->markup, reading->open ? (double)NAN : reading->ohms);
    ohm_cell(page->markup, diagnosis->n_ranked > 0 ? diagnosis->ranked[0].fitted[i] : (double)NAN);
    ohm_cell(page->markup, diagnosis->sound[i]);
    markup_close(page->markup);
}

static void setup_rows(struct page *page, size_t setup)
{
    const struct rf_job *job = page->diagnosis->job;
    struct text name = {0};
    markup_open(page->markup, "tbody");
    markup_open(page->markup, "tr");
    markup_open(page->markup, "th");
    markup_attribute(page->markup, "colspan", "4");
    markup_attribute(page->markup, "scope", "rowgroup");
    say_set_up(setup, &name);
    markup_text(page->markup, name.failed ? "" : name.bytes);
    page->markup->failed |= name.failed;
    text_finish(&name);
    markup_close(page->markup);
    markup_close(page->markup);
    for (size_t i = 0; i < job->n_readings; i++)
        if (job->readings[i].setup == setup)
            reading_row(page, i);
    markup_close(page->markup);
}

static void table(struct page *page)
{
    static const char *const columns[] = {"", "as read", "fitted", "no defect"};
    struct markup *markup = page->markup;
    markup_open(markup, "table");
    markup_open(markup, "thead");
    markup_open(markup, "tr");
    for (size_t i = 0; i < sizeof columns / sizeof columns[0]; i++)
        markup_element(markup, i == 0 ? "td" : "th", NULL, columns[i]);
    markup_close(markup);
    markup_close(markup);
    for (size_t setup = 0; setup < N_SETUPS; setup++)
        if (setup_has_readings(page->diagnosis->job, setup))
            setup_rows(page, setup);
    markup_close(markup);
    if (page->diagnosis->n_suspects > 0)
        markup_element(markup, "p", "about", SUSPECT_ABOUT);
}

enum rf_status section_readings(struct page *page, struct rf_error *error)
{
    open_section(page, "readings", NULL, HEADING_READINGS);
    markup_element(page->markup, "p", "about",
                   "Dots: as read; triangles at the top: over range; a ring around one: read it "
                   "again. Unbroken line: as the likeliest explanation has them; dashed: as a ring "
                   "without defect would read by the recorded lengths and cable; each with the "
                   "range in which 19 of 20 readings lie. Along the bottom: the places, and metres "
                   "of cable from the outgoing ends, as fitted.");
    enum rf_status status = plots(page, error);
    if (status == RF_OK)
        table(page);
    close_section(page);
    return status;
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/page.h"

#include "advice/advice.h"
#include "base/error.h"
#include "report/page_parts.h"
#include "report/page_style.h"
#include "report/said.h"
#include "report/words.h"

#include <math.h>

/* --- lists of what is said --- */

void chance_item(struct page *page, double chance, char letter, const char *words)
{
    struct markup *markup = page->markup;
    struct text number = {0};
    markup_open(markup, "li");
    say_chance(chance, &number);
    markup_element_of(markup, "span", "number", &number);
    markup_open(markup, "span");
    markup_attribute(markup, "class", "words");
    if (letter != 0)
        markup_element(markup, "span", "letter", (char[]){letter, '\0'});
    markup_text(markup, words);
    page_bar(markup, chance);
    markup_close(markup);
    markup_close(markup);
}

static void under_item(struct page *page, const char *words)
{
    markup_open(page->markup, "li");
    markup_element(page->markup, "span", "words", words);
    markup_close(page->markup);
}

/* Plain lines as paragraphs, the first of them set large where `lead` is; the others in a list. */
static void said_lines(struct page *page, const struct said *said, bool lead)
{
    struct markup *markup = page->markup;
    bool in_list = false;
    for (size_t i = 0; i < said->n; i++) {
        const struct said_line *line = &said->lines[i];
        bool plain = line->kind == LINE_PLAIN;
        if (in_list && plain)
            markup_close(markup);
        if (!in_list && !plain) {
            markup_open(markup, "ul");
            markup_attribute(markup, "class", "chances");
        }
        in_list = !plain;
        if (plain)
            markup_element(markup, "p", lead ? "first" : NULL, line->words);
        else if (line->kind == LINE_UNDER)
            under_item(page, line->words);
        else
            chance_item(page, line->chance, 0, line->words);
    }
    if (in_list)
        markup_close(markup);
    markup->failed = markup->failed || said->failed;
}

static void dots(struct page *page, const struct said *said)
{
    markup_open(page->markup, "ul");
    markup_attribute(page->markup, "class", "dots");
    for (size_t i = 0; i < said->n; i++)
        markup_element(page->markup, "li", NULL, said->lines[i].words);
    markup_close(page->markup);
    page->markup->failed = page->markup->failed || said->failed;
}

void open_section(struct page *page, const char *id, const char *kind, const char *heading)
{
    markup_open(page->markup, "section");
    markup_attribute(page->markup, "id", id);
    markup_attributef(page->markup, "aria-labelledby", "%s-heading", id);
    if (kind != NULL)
        markup_attribute(page->markup, "class", kind);
    markup_open(page->markup, "h2");
    markup_attributef(page->markup, "id", "%s-heading", id);
    markup_text(page->markup, heading);
    markup_close(page->markup);
}

void close_section(struct page *page)
{
    markup_close(page->markup);
}

/* --- sections of lines alone --- */

static void alarm(struct page *page, const char *id, const char *heading,
                  void (*say)(const struct rf_diagnosis *, struct said *))
{
    struct said said = {0};
    say(page->diagnosis, &said);
    if (said.n > 0 || said.failed) {
        open_section(page, id, "alarm", heading);
        said_lines(page, &said, false);
        close_section(page);
    }
    said_finish(&said);
}

static void section_checks(struct page *page)
{
    struct said said = {0};
    say_checks(page->diagnosis, &said);
    if (said.n > 0 || said.failed) {
        open_section(page, "checks", NULL, HEADING_CHECKS);
        said_lines(page, &said, false);
        close_section(page);
    }
    said_finish(&said);
}

static void findings(struct page *page)
{
    struct said said = {0};
    struct markup *markup = page->markup;
    say_findings(page->diagnosis, &said);
    markup_element(markup, "h3", NULL, HEADING_FINDINGS);
    markup_open(markup, "ul");
    markup_attribute(markup, "class", "chances");
    for (size_t i = 0; i < said.n; i++)
        chance_item(page, said.lines[i].chance,
                    finding_letter(page->diagnosis, said.lines[i].about), said.lines[i].words);
    markup_close(markup);
    markup->failed = markup->failed || said.failed;
    said_finish(&said);
}

static void section_where(struct page *page)
{
    struct said said = {0};
    say_where_first(page->diagnosis, &said);
    open_section(page, "where", NULL, HEADING_WHERE);
    markup_open(page->markup, "div");
    markup_attribute(page->markup, "class", "beside");
    markup_open(page->markup, "div");
    said_lines(page, &said, true);
    findings(page);
    bool beside = ring_map_numbers(page->diagnosis->job);
    if (beside)
        page_places(page);
    markup_close(page->markup);
    page_map(page);
    markup_close(page->markup);
    if (!beside)
        page_places(page);
    close_section(page);
    said_finish(&said);
}

static void section_blind(struct page *page)
{
    struct said said = {0};
    say_blind_spots(page->diagnosis, page->advice, &said);
    if (said.n > 0) {
        open_section(page, "blind", NULL, HEADING_BLIND);
        markup_open(page->markup, "ul");
        markup_attribute(page->markup, "class", "dots");
        for (size_t i = 0; i < said.n; i++) {
            markup_open(page->markup, "li");
            markup_text(page->markup, said.lines[i].words);
            markup_close(page->markup);
        }
        markup_close(page->markup);
        close_section(page);
    }
    page->markup->failed = page->markup->failed || said.failed;
    said_finish(&said);
}

static void section_dots(struct page *page, const char *id, const char *heading,
                         void (*say)(const struct rf_diagnosis *, struct said *))
{
    struct said said = {0};
    say(page->diagnosis, &said);
    open_section(page, id, "keep", heading);
    dots(page, &said);
    close_section(page);
    said_finish(&said);
}

/* --- the page --- */

static void header(struct page *page)
{
    const struct rf_job *job = page->diagnosis->job;
    struct markup *markup = page->markup;
    struct text about = {0};
    if (job->date != NULL)
        text_addf(&about, "%s: ", job->date);
    say_ring(job, &about);
    text_add(&about, ".");
    markup_open(markup, "header");
    markup_element(markup, "h1", NULL, rf_job_name(job));
    markup_element_of(markup, "p", "about", &about);
    if (job->note != NULL && job->note[0] != '\0')
        markup_element(markup, "p", "job-note", job->note);
    markup_close(markup);
}

static void link_to(struct markup *markup, const char *section, const char *words)
{
    markup_open(markup, "li");
    markup_open(markup, "a");
    markup_attribute(markup, "href", section);
    markup_text(markup, words);
    markup_close(markup);
    markup_close(markup);
}

static void navigation(struct page *page)
{
    struct markup *markup = page->markup;
    markup_open(markup, "nav");
    markup_attribute(markup, "aria-label", "on this page");
    markup_open(markup, "ul");
    link_to(markup, "#where", HEADING_WHERE);
    if (page->advice != NULL)
        link_to(markup, "#next", HEADING_NEXT);
    link_to(markup, "#readings", "Readings");
    link_to(markup, "#figures", "Schedule");
    link_to(markup, "#cautions", HEADING_CAUTIONS);
    markup_close(markup);
    markup_close(markup);
}

enum rf_status report_page(const struct rf_diagnosis *diagnosis, const struct rf_advice *advice,
                           struct text *out, struct rf_error *error)
{
    struct markup markup;
    struct page page = {.diagnosis = diagnosis, .advice = advice, .markup = &markup};
    struct text title = {0};
    markup_begin(&markup, out);
    text_addf(&title, "%s: where to look", rf_job_name(diagnosis->job));
    page_head(&markup, title.failed ? "" : title.bytes);
    header(&page);
    navigation(&page);
    markup_open(&markup, "main");
    alarm(&page, "misfit", HEADING_MISFIT, say_misfit);
    alarm(&page, "danger", HEADING_DANGER, say_dangers);
    section_checks(&page);
    section_where(&page);
    section_next(&page);
    section_blind(&page);
    enum rf_status status = section_readings(&page, error);
    section_dots(&page, "figures", HEADING_FIGURES, say_figures);
    section_dots(&page, "cautions", HEADING_CAUTIONS, say_cautions);
    markup_close(&markup);
    page_foot(&markup);
    bool whole = markup_end(&markup) && !title.failed;
    text_finish(&title);
    if (status != RF_OK)
        return status;
    return whole ? RF_OK : fail_memory(error);
}

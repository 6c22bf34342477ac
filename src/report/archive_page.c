/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/archive_page.h"

#include "base/error.h"
#include "report/page_style.h"
#include "report/review_report.h"
#include "report/scene_svg.h"
#include "report/words.h"

/* --- the calibration plot --- */

enum { WIDTH = 340, HEIGHT = 330, LEFT = 52, TOP = 18, SIDE = 264 };

static double across(double share)
{
    return LEFT + share * SIDE;
}

static double up(double share)
{
    return TOP + (1 - share) * SIDE;
}

static void draw_axes(struct scene *scene)
{
    for (int i = 0; i <= 4; i++) {
        double share = i / 4.0;
        struct text words = {0};
        text_addf(&words, "%d %%", 25 * i);
        scene_segment(scene, ROLE_GRID, LEFT, up(share), LEFT + SIDE, up(share));
        scene_label(scene, ROLE_TICK, LEFT - 5, up(share) + 4, ANCHOR_END, 11, LEFT - 6,
                    words.failed ? "" : words.bytes);
        scene_label(scene, ROLE_TICK, across(share), TOP + SIDE + 16, ANCHOR_MIDDLE, 11, 60,
                    words.failed ? "" : words.bytes);
        scene->failed = scene->failed || words.failed;
        text_finish(&words);
    }
    scene_segment(scene, ROLE_AXIS, LEFT, TOP, LEFT, TOP + SIDE);
    scene_segment(scene, ROLE_AXIS, LEFT, TOP + SIDE, LEFT + SIDE, TOP + SIDE);
    scene_segment(scene, ROLE_SOUND, across(0), up(0), across(1), up(1));
    scene_label(scene, ROLE_TICK, LEFT + SIDE / 2.0, TOP + SIDE + 34, ANCHOR_MIDDLE, 11, SIDE,
                "confidence told");
    scene_label(scene, ROLE_TICK, 4, 12, ANCHOR_START, 11, 200, "how often it was so");
}

static void draw_bin(struct scene *scene, const struct calibration_bin *bin)
{
    double low, high, jobs = (double)bin->jobs;
    double said = (double)bin->confidence / PARTS / jobs, was = (double)bin->right / jobs;
    struct text title = {0};
    rf_wilson((size_t)bin->right, (size_t)bin->jobs, review_level, &low, &high);
    scene_segment(scene, ROLE_FIT, across(said), up(low), across(said), up(high));
    scene_segment(scene, ROLE_FIT, across(said) - 4, up(low), across(said) + 4, up(low));
    scene_segment(scene, ROLE_FIT, across(said) - 4, up(high), across(said) + 4, up(high));
    scene_disc(scene, ROLE_READ, across(said), up(was), 4);
    text_addf(&title, "told %.0f %%, was so in %llu of %llu jobs", 100 * said,
              (unsigned long long)bin->right, (unsigned long long)bin->jobs);
    scene_title(scene, &title);
}

void calibration_plot(const struct scorecard *score, struct scene *scene)
{
    struct text title = {0}, about = {0};
    scene->width = WIDTH;
    scene->height = HEIGHT;
    text_add(&title, "Calibration: confidence told, and how often it was so");
    text_add(&about, "Dots near the dashed diagonal: the confidences were kept. The same numbers "
                     "stand in the table beside it.");
    scene_entitle(scene, &title, &about);
    draw_axes(scene);
    for (size_t i = 0; i < CALIBRATION_BINS; i++)
        if (score->calibration[i].jobs > 0)
            draw_bin(scene, &score->calibration[i]);
}

/* --- tables --- */

static void cell(struct markup *markup, const char *format, double number)
{
    struct text words = {0};
    text_addf(&words, "%.0f", number);
    if (format[0] != '\0')
        text_add(&words, format);
    markup_element_of(markup, "td", NULL, &words);
}

static void table_head(struct markup *markup, const char *const columns[], size_t n)
{
    markup_open(markup, "table");
    markup_open(markup, "thead");
    markup_open(markup, "tr");
    for (size_t i = 0; i < n; i++)
        markup_element(markup, "th", NULL, columns[i]);
    markup_close(markup);
    markup_close(markup);
    markup_open(markup, "tbody");
}

static void table_end(struct markup *markup)
{
    markup_close(markup);
    markup_close(markup);
}

static void count_row(struct markup *markup, const char *name, uint64_t count)
{
    markup_open(markup, "tr");
    markup_element(markup, "th", NULL, name);
    cell(markup, "", (double)count);
    markup_close(markup);
}

static void section(struct markup *markup, const char *heading)
{
    markup_open(markup, "section");
    markup_element(markup, "h2", NULL, heading);
}

/* --- sections --- */

static void summary(const struct rf_review *review, struct markup *markup)
{
    static const char *const columns[] = {"", "jobs"};
    section(markup, review->stopped ? "Summary, stopped before the end" : "Summary");
    table_head(markup, columns, 2);
    count_row(markup, "jobs", review->jobs);
    count_row(markup, "show no defect", review->verdicts[VERDICT_NO_DEFECT]);
    count_row(markup, "show a defect", review->verdicts[VERDICT_DEFECT]);
    count_row(markup, "undecided", review->verdicts[VERDICT_UNDECIDED]);
    count_row(markup, "explained by nothing", review->verdicts[VERDICT_UNEXPLAINED]);
    count_row(markup, "refused", review->refused);
    count_row(markup, "record and readings disagree", review->disagree);
    table_end(markup);
    markup_close(markup);
}

static void worst_row(struct markup *markup, const struct review_line *line, const char *page)
{
    struct text chance = {0}, words = {0};
    markup_open(markup, "li");
    say_chance((double)line->confidence / PARTS, &chance);
    markup_element_of(markup, "span", "number", &chance);
    markup_open(markup, "span");
    markup_attribute(markup, "class", "words");
    if (page[0] != '\0') {
        markup_open(markup, "a");
        markup_attribute(markup, "href", page);
        markup_text(markup, line->job);
        markup_close(markup);
    } else {
        markup_element(markup, "b", NULL, line->job);
    }
    text_addf(&words, ": %s", line->verdict == VERDICT_UNEXPLAINED
                                  ? "no one defect explains its readings; the likeliest: "
                                  : "");
    text_add(&words, line->words);
    if (line->found.known)
        text_add(&words, line->found.agrees ? " (as found)" : " (found otherwise)");
    markup_element_of(markup, "span", NULL, &words);
    page_bar(markup, (double)line->confidence / PARTS);
    markup_close(markup);
    markup_close(markup);
}

static void worst(const struct rf_review *review, const struct page_name pages[WORST_SHOWN],
                  struct markup *markup)
{
    section(markup, "Jobs that need a look");
    if (review->n_worst == 0)
        markup_element(markup, "p", NULL, "None shows a defect that nobody wrote down.");
    else
        markup_element(markup, "p", "about", "The most worrying first: what the readings show and "
                                             "nobody wrote down.");
    markup_open(markup, "ul");
    markup_attribute(markup, "class", "chances");
    for (size_t i = 0; i < review->n_worst; i++)
        worst_row(markup, &review->worst[i], pages[i].name);
    markup_close(markup);
    markup_close(markup);
}

static void families(const struct rf_review *review, struct markup *markup)
{
    static const char *const columns[] = {"likeliest defect", "jobs"};
    if (review->verdicts[VERDICT_DEFECT] == 0)
        return;
    section(markup, "Defects, by family and conductor");
    table_head(markup, columns, 2);
    for (size_t family = 0; family < n_sorts(); family++)
        for (size_t kind = 0; kind < N_CONDUCTOR_KINDS; kind++) {
            if (review->defects[family][kind] == 0)
                continue;
            struct text name = {0};
            say_sort(family, &name);
            text_addf(&name, "%s%s", kind > 0 ? ", " : "", conductor_kind_names[kind]);
            count_row(markup, name.failed ? "" : name.bytes, review->defects[family][kind]);
            markup->failed = markup->failed || name.failed;
            text_finish(&name);
        }
    table_end(markup);
    markup_close(markup);
}

static void calibration_table(const struct scorecard *score, struct markup *markup)
{
    static const char *const columns[] = {"told", "jobs", "so", "was", "90 % interval"};
    table_head(markup, columns, 5);
    for (size_t i = 0; i < CALIBRATION_BINS; i++) {
        const struct calibration_bin *bin = &score->calibration[i];
        double low, high, jobs = (double)bin->jobs;
        struct text range = {0};
        if (bin->jobs == 0)
            continue;
        rf_wilson((size_t)bin->right, (size_t)bin->jobs, review_level, &low, &high);
        text_addf(&range, "%.0f to %.0f" NO_BREAK "%%", 100 * low, 100 * high);
        markup_open(markup, "tr");
        cell(markup, NO_BREAK "%", 100 * (double)bin->confidence / PARTS / jobs);
        cell(markup, "", jobs);
        cell(markup, "", (double)bin->right);
        cell(markup, NO_BREAK "%", 100 * (double)bin->right / jobs);
        markup_element_of(markup, "td", NULL, &range);
        markup_close(markup);
    }
    table_end(markup);
}

static void calibration(const struct rf_review *review, struct markup *markup)
{
    const struct scorecard *score = &review->score;
    struct scene scene = {0};
    if (score->confirmed == 0)
        return;
    section(markup, "How well the confidences were kept");
    markup_open(markup, "p");
    markup_textf(markup, "Of %llu jobs that say what was found: ranked first in %llu, among the "
                         "first three in %llu, in the likeliest finding in %llu.",
                 (unsigned long long)score->confirmed, (unsigned long long)score->first,
                 (unsigned long long)score->first_three, (unsigned long long)score->agrees);
    markup_close(markup);
    calibration_plot(score, &scene);
    markup_open(markup, "div");
    markup_attribute(markup, "class", "beside");
    markup_open(markup, "figure");
    scene_svg(markup, &scene, "calibration");
    markup_element(markup, "figcaption", NULL,
                   "Dots: of the likeliest findings told with about that confidence, how many "
                   "were so; with 90 % intervals. On the dashed line they would be kept exactly.");
    markup_close(markup);
    markup_open(markup, "div");
    calibration_table(score, markup);
    markup_close(markup);
    markup_close(markup);
    markup_close(markup);
    scene_finish(&scene);
}

enum rf_status report_archive_page(const struct rf_review *review,
                                   const struct page_name pages[WORST_SHOWN], struct text *out,
                                   struct rf_error *error)
{
    struct markup markup;
    markup_begin(&markup, out);
    page_head(&markup, "Review of past jobs");
    markup_open(&markup, "header");
    markup_element(&markup, "h1", NULL, "Review of past jobs");
    markup_close(&markup);
    markup_open(&markup, "main");
    worst(review, pages, &markup);
    summary(review, &markup);
    families(review, &markup);
    calibration(review, &markup);
    markup_element(&markup, "p", "about",
                   "A review guides where to look again and certifies nothing; BS 7671 or the "
                   "local code and a competent person decide.");
    markup_close(&markup);
    page_foot(&markup);
    return markup_end(&markup) ? RF_OK : fail_memory(error);
}

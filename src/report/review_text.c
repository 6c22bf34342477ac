/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/review_report.h"

#include "base/csv.h"
#include "report/words.h"
#include "report/wrap.h"

#include <stdio.h>
#include <string.h>

enum { JOB_COLUMNS = 22, VERDICT_COLUMNS = 21, NAME_COLUMNS = 26, COUNT_COLUMNS = 8 };

const double review_level = 0.9;

const char *const review_verdict_words[N_VERDICTS] = {
    [VERDICT_NO_DEFECT] = "shows no defect",
    [VERDICT_DEFECT] = "DEFECT",
    [VERDICT_UNDECIDED] = "undecided",
    [VERDICT_UNEXPLAINED] = "NOTHING EXPLAINS IT",
};

/* --- one job --- */

/* Whether it was written down already. */
static const char *agreement(const struct review_line *line)
{
    if (!line->found.known)
        return line->verdict == VERDICT_NO_DEFECT ? "" : " (nothing written down)";
    return line->found.agrees ? " (as found)" : " (found otherwise)";
}

/* What a file says must not steer the terminal. */
static void add_plain(struct text *out, const char *words)
{
    for (; *words != '\0'; words++) {
        unsigned char byte = (unsigned char)*words;
        char shown = byte < 0x20 || byte == 0x7F ? '?' : *words;
        if (byte == 0xC2 && (unsigned char)words[1] == 0xA0) { /* the no-break space */
            shown = ' ';
            words++;
        } else if (byte == 0xC2 && (unsigned char)words[1] >= 0x80 &&
                   (unsigned char)words[1] < 0xA0) { /* control characters again */
            shown = '?';
            words++;
        }
        text_append(out, &shown, 1);
    }
}

static void add_chance(struct text *out, int64_t chance)
{
    struct text words = {0}, plain = {0};
    say_chance((double)chance / PARTS, &words);
    if (words.bytes != NULL && !words.failed) {
        add_plain(&plain, words.bytes);
        for (size_t columns = plain.length; columns < 6; columns++)
            text_add(out, " ");
        text_append(out, plain.bytes, plain.length);
    }
    out->failed = out->failed || words.failed || plain.failed;
    text_finish(&words);
    text_finish(&plain);
}

void report_review_line(const struct review_line *line, struct text *out)
{
    cell_left(out, line->job, JOB_COLUMNS);
    text_add(out, " ");
    cell_left(out, review_verdict_words[line->verdict], VERDICT_COLUMNS);
    add_chance(out, line->confidence);
    text_add(out, "  ");
    add_plain(out, line->words);
    text_addf(out, "%s\n", agreement(line));
}

/* --- parts of the summary --- */

static void heading(struct text *out, const char *words)
{
    text_addf(out, "\n%s\n\n", words);
}

static void add_spaced(struct text *out, const char *name)
{
    for (; *name != '\0'; name++)
        text_append(out, *name == '_' ? " " : name, 1);
}

void say_sort(size_t family, struct text *out)
{
    add_spaced(out, sort_name(family));
}

/* A name and a number, the line not ended. */
static void count_cells(struct text *out, const char *name, uint64_t count)
{
    char digits[32];
    snprintf(digits, sizeof digits, "%llu", (unsigned long long)count);
    text_add(out, "  ");
    cell_left(out, name, NAME_COLUMNS);
    cell_right(out, digits, COUNT_COLUMNS);
}

static void count_line(struct text *out, const char *name, uint64_t count)
{
    count_cells(out, name, count);
    text_add(out, "\n");
}

/* A line for a family, and what of it. */
static void family_line(struct text *out, size_t family, const char *what, uint64_t count)
{
    struct text name = {0};
    say_sort(family, &name);
    text_addf(&name, "%s%s", what[0] != '\0' ? ", " : "", what);
    if (!name.failed)
        count_line(out, name.bytes, count);
    out->failed = out->failed || name.failed;
    text_finish(&name);
}

static void say_worst(const struct rf_review *review, struct text *out)
{
    if (review->n_worst == 0)
        return;
    heading(out, "MOST WORRYING, AND NOT WRITTEN DOWN");
    for (size_t i = 0; i < review->n_worst; i++)
        report_review_line(&review->worst[i], out);
}

static void say_counts(const struct rf_review *review, struct text *out)
{
    heading(out, review->stopped ? "SUMMARY, STOPPED BEFORE THE END" : "SUMMARY");
    count_line(out, "jobs", review->jobs);
    count_line(out, "show no defect", review->verdicts[VERDICT_NO_DEFECT]);
    count_line(out, "show a defect", review->verdicts[VERDICT_DEFECT]);
    count_line(out, "undecided", review->verdicts[VERDICT_UNDECIDED]);
    count_line(out, "explained by nothing", review->verdicts[VERDICT_UNEXPLAINED]);
    count_line(out, "refused", review->refused);
    if (review->failed > 0)
        count_line(out, "arithmetic failed", review->failed);
    if (review->unread > 0)
        count_line(out, "files not read", review->unread);
}

static void say_defects(const struct rf_review *review, struct text *out)
{
    if (review->verdicts[VERDICT_DEFECT] == 0)
        return;
    heading(out, "DEFECTS, BY FAMILY AND CONDUCTOR");
    for (size_t family = 0; family < n_sorts(); family++)
        for (size_t conductor = 0; conductor < N_CONDUCTOR_KINDS; conductor++)
            if (review->defects[family][conductor] > 0)
                family_line(out, family, conductor_kind_names[conductor],
                            review->defects[family][conductor]);
}

static void say_mistakes(const struct rf_review *review, struct text *out)
{
    heading(out, "RECORD AND READINGS DISAGREE");
    count_line(out, "jobs", review->disagree);
    count_line(out, "in what was found", review->disagree_found);
    count_line(out, "in wiring or cable size", review->disagree_wiring);
    count_line(out, "in lengths", review->disagree_lengths);
    heading(out, "MISTAKES IN TESTING");
    for (size_t family = 0; family < n_sorts(); family++)
        if (review->testing[family] > 0)
            family_line(out, family, "", review->testing[family]);
    count_line(out, "readings that fit nothing", review->written_off);
    count_line(out, "of readings", review->readings);
}

/* --- the scorecard --- */

static void share_line(struct text *out, const char *name, uint64_t count, uint64_t of)
{
    double low, high;
    rf_wilson((size_t)count, (size_t)of, review_level, &low, &high);
    count_cells(out, name, count);
    text_addf(out, "  %5.1f %%  (%.1f to %.1f)\n", 100 * (double)count / (double)of, 100 * low,
              100 * high);
}

static void say_calibration(const struct scorecard *score, struct text *out)
{
    heading(out, "CALIBRATION OF THE LIKELIEST FINDING (90 % intervals)");
    text_add(out, "  confidence       jobs   right    said     was   interval\n");
    for (size_t i = 0; i < CALIBRATION_BINS; i++) {
        const struct calibration_bin *bin = &score->calibration[i];
        if (bin->jobs == 0)
            continue;
        double low, high, jobs = (double)bin->jobs;
        rf_wilson((size_t)bin->right, (size_t)bin->jobs, review_level, &low, &high);
        text_addf(out, "  %.1f to %.1f %10llu %7llu   %.3f   %.3f   %.3f to %.3f\n",
                  (double)i / CALIBRATION_BINS, (double)(i + 1) / CALIBRATION_BINS,
                  (unsigned long long)bin->jobs, (unsigned long long)bin->right,
                  (double)bin->confidence / PARTS / jobs, (double)bin->right / jobs, low, high);
    }
    if (score->unexplained > 0)
        text_addf(out, "  left out: %llu jobs that nothing explains\n",
                  (unsigned long long)score->unexplained);
}

static void say_confusion(const struct scorecard *score, struct text *out)
{
    heading(out, "FOUND, AND WHAT RANKED FIRST");
    for (size_t found = 0; found < n_sorts(); found++)
        for (size_t first = 0; first < n_sorts(); first++) {
            if (score->confusion[found][first] == 0)
                continue;
            struct text first_words = {0};
            say_sort(first, &first_words);
            if (!first_words.failed)
                family_line(out, found, found == first ? "the same" : first_words.bytes,
                            score->confusion[found][first]);
            out->failed = out->failed || first_words.failed;
            text_finish(&first_words);
        }
}

static void say_looks(const struct scorecard *score, struct text *out)
{
    static const char *const names[N_LOOK_BINS] = {
        "at the first place", "after 1 other",   "after 2 others",
        "after 3 to 5",       "after 6 or more", "not by the plan",
    };
    double jobs = (double)score->looked;
    if (score->looked == 0)
        return;
    heading(out, "WHAT LOOKING BY THE PLAN WOULD HAVE COST");
    count_line(out, "jobs with one defect", score->looked);
    text_addf(out, "  mean places looked at before the find: %.2f\n",
              (double)score->places / jobs / PARTS);
    for (size_t i = 0; i < N_LOOK_BINS; i++) {
        text_add(out, "  ");
        cell_left(out, names[i], NAME_COLUMNS);
        text_addf(out, "%6.1f %%\n", 100 * (double)score->looks[i] / jobs / PARTS);
    }
}

static void say_score(const struct rf_review *review, struct text *out)
{
    const struct scorecard *score = &review->score;
    if (score->confirmed == 0)
        return;
    heading(out, "SCORECARD, WHERE WHAT WAS FOUND IS KNOWN (90 % intervals)");
    count_line(out, "jobs", score->confirmed);
    share_line(out, "ranked first", score->first, score->confirmed);
    share_line(out, "among the first three", score->first_three, score->confirmed);
    share_line(out, "in the likeliest finding", score->agrees, score->confirmed);
    text_addf(out, "  mean log posterior of what was found: %.4f\n",
              rf_review_mean_log_posterior(review));
    if (score->below > 0)
        text_addf(out, "  (%llu below one in a million, counted as that)\n",
                  (unsigned long long)score->below);
    say_looks(score, out);
    say_calibration(score, out);
    say_confusion(score, out);
}

void report_review_text(const struct rf_review *review, struct text *out)
{
    say_worst(review, out);
    say_counts(review, out);
    say_defects(review, out);
    say_mistakes(review, out);
    say_score(review, out);
    text_add(out, "\n");
    wrap_words(out, "", "",
               "A review guides where to look again and certifies nothing; BS 7671 or the local "
               "code and a competent person decide.");
}

/* --- for a spreadsheet --- */

void report_review_csv_heading(struct text *out)
{
    text_add(out, "job,verdict,confidence,finding,nothing_wrong,danger,family,conductor,found,"
                  "found_family,record_disagrees,readings,written_off\r\n");
}

/* A cell that a spreadsheet would take for a formula gets an apostrophe, which it takes for "this
 * is text": the words are other people's. */
static void add_cell(struct text *out, const char *words)
{
    struct text cell = {0};
    text_addf(&cell, "%s%s", words[0] != '\0' && strchr("=+-@\t\r", words[0]) != NULL ? "'" : "",
              words);
    if (!cell.failed)
        csv_add_cell(out, cell.bytes, cell.length, ',');
    out->failed = out->failed || cell.failed;
    text_finish(&cell);
}

/* In what the record and the readings disagree: "found", "found and lengths", … */
static void add_disagreement(struct text *out, const struct review_line *line)
{
    const char *const names[] = {"found", "wiring", "lengths"};
    const bool holds[] = {line_found_disagrees(line), line->other_wiring, line->other_lengths};
    size_t n = 0;
    for (size_t i = 0; i < sizeof names / sizeof names[0]; i++)
        if (holds[i])
            text_addf(out, "%s%s", n++ > 0 ? " and " : "", names[i]);
}

void report_review_csv(const struct review_line *line, struct text *out)
{
    const char *found = !line->found.known ? "" : line->found.agrees ? "agrees" : "disagrees";
    add_cell(out, line->job);
    text_addf(out, ",%s,%.6f,", verdict_names[line->verdict], (double)line->confidence / PARTS);
    add_cell(out, line->words);
    text_addf(out, ",%.6f,%.6f,%s,%s,%s,%s,", (double)line->none / PARTS,
              (double)line->danger / PARTS, sort_name(line->first.family),
              conductor_kind_names[line->first.conductor], found,
              line->found.known ? sort_name(line->found.sort.family) : "");
    add_disagreement(out, line);
    text_addf(out, ",%llu,%llu\r\n", (unsigned long long)line->readings,
              (unsigned long long)line->written_off);
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The model files: as shipped, replaced by a directory, and refused. */
#include "models/models.h"
#include "models/shipped.h"

#include "../project.h"
#include "../suite.h"

#include <check.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

static struct rf_models *load(const char *directory, enum rf_base_rates rates)
{
    struct rf_models *models;
    struct rf_error error;
    enum rf_status status = rf_models_load(directory, rates, &models, &error);
    ck_assert_msg(status == RF_OK, "%s", status == RF_OK ? "" : error.text);
    return models;
}

/* --- a directory of our own: the shipped files, one text in one of them replaced --- */

static char directory[64];

static void path_of(char path[128], int file)
{
    snprintf(path, 128, "%s/%s", directory, shipped_files[file].name);
}

static void write_file(int file, const char *bytes, size_t length)
{
    char path[128];
    path_of(path, file);
    FILE *out = fopen(path, "wb");
    ck_assert_ptr_nonnull(out);
    ck_assert_uint_eq(fwrite(bytes, 1, length, out), length);
    ck_assert_int_eq(fclose(out), 0);
}

static void make_directory(void)
{
    strcpy(directory, "/tmp/ringfettle-models-XXXXXX");
    ck_assert_ptr_nonnull(mkdtemp(directory));
    for (int i = 0; i < N_MODEL_FILES; i++)
        write_file(i, shipped_files[i].bytes, shipped_files[i].length);
}

static void remove_directory(void)
{
    char path[128];
    for (int i = 0; i < N_MODEL_FILES; i++) {
        path_of(path, i);
        unlink(path);
    }
    rmdir(directory);
}

/* The shipped file with the first `old` in it made `new`. */
static void replace(int file, const char *old, const char *new)
{
    const struct shipped_file *shipped = &shipped_files[file];
    const char *at = strstr(shipped->bytes, old);
    ck_assert_msg(at != NULL, "%s has no %s", shipped->name, old);
    size_t before = (size_t)(at - shipped->bytes);
    size_t size = shipped->length - strlen(old) + strlen(new) + 1;
    char *text = malloc(size);
    ck_assert_ptr_nonnull(text);
    snprintf(text, size, "%.*s%s%s", (int)before, shipped->bytes, new, at + strlen(old));
    write_file(file, text, size - 1);
    free(text);
}

/* --- as shipped --- */

/* The numbers design and README state for the shipped models; the project's own judgement. */
static const struct {
    const char *name;
    double prior, median, sigma;
    bool metres;
} families[] = {
    {"none", .22, 0, 0, false},          {"break", .13, 0, 0, false},
    {"joint", .13, .5, 1, false},        {"spur", .12, 4, .7, true},
    {"contact", .09, .4, 1, false},      {"interconnection", .06, 8, .6, true},
    {"switched_off", .05, 0, 0, false},  {"reversal", .04, 0, 0, false},
    {"short", .03, .05, 1.5, false},     {"transposed", .02, 0, 0, false},
    {"load", .02, 30, .7, false},        {"parallel", .02, .3, 1, false},
    {"size", .02, 0, 0, false},          {"bad_link", .02, .2, 1, false},
    {"wrong_leg", .01, 0, 0, false},     {"not_crossed", .01, 0, 0, false},
    {"not_nulled", .01, .15, .5, false},
};
enum { N_FAMILIES = sizeof families / sizeof families[0] };

START_TEST(shipped_families_are_as_stated)
{
    struct rf_models *models = load(NULL, RF_RATES_CONSULTED);
    ck_assert_str_eq(rf_models_name(models), "shipped");
    ck_assert_uint_eq(models->n_families, N_FAMILIES);
    for (size_t i = 0; i < N_FAMILIES; i++) {
        const struct family_prior *row = models_family(models, families[i].name);
        ck_assert_msg(row != NULL, "no row for %s", families[i].name);
        ck_assert_double_eq(row->prior, families[i].prior);
        ck_assert_double_eq(row->parameter.median, families[i].median);
        ck_assert_double_eq(row->parameter.sigma, families[i].sigma);
        ck_assert_int_eq(row->metres, families[i].metres);
        ck_assert_double_eq(row->count, 0);
    }
    ck_assert_ptr_null(models_family(models, "loose"));
    rf_models_destroy(models);
}
END_TEST

static void assert_kind(const struct family_prior *row, size_t i, const char *name, double share)
{
    ck_assert_uint_lt(i, row->n_kinds);
    ck_assert_str_eq(row->kinds[i].name, name);
    ck_assert_double_eq(row->kinds[i].share, share);
}

START_TEST(shipped_kinds_and_shares_are_as_stated)
{
    struct rf_models *models = load(NULL, RF_RATES_CONSULTED);
    const struct family_prior *contact = models_family(models, "contact");
    assert_kind(contact, 0, "open", .3);
    assert_kind(contact, 1, "high", .7);
    const struct family_prior *link = models_family(models, "bad_link");
    assert_kind(link, 0, "open", .4);
    assert_kind(link, 1, "high", .6);
    const struct family_prior *spur = models_family(models, "spur");
    assert_kind(spur, 0, "1", .60);
    assert_kind(spur, 1, "2", .25);
    assert_kind(spur, 2, "3", .15);
    ck_assert_uint_eq(models_family(models, "joint")->n_kinds, 0);

    const struct family_prior *gap = models_family(models, "break");
    ck_assert_double_eq(family_share(gap, "end"), .45);
    ck_assert_double_eq(family_share(gap, "inside"), .10);
    ck_assert_double_eq(family_share(gap, "whole_end"), .3);
    ck_assert_double_eq(family_share(gap, "whole_inside"), .4);
    ck_assert_double_eq(family_share(gap, "point"), 0);
    ck_assert_double_eq(family_share(models_family(models, "transposed"), "end"), .5);
    ck_assert_double_eq(family_share(models_family(models, "short"), "point"), .4);
    ck_assert_double_eq(family_share(models_family(models, "short"), "runs"), .6);
    ck_assert_double_eq(family_share(contact, "place"), 1);
    ck_assert_uint_eq(models_family(models, "none")->n_shares, 0);
    rf_models_destroy(models);
}
END_TEST

START_TEST(shipped_numbers_are_as_stated)
{
    struct rf_models *models = load(NULL, RF_RATES_CONSULTED);
    const struct instrument_model *meter = &models->instrument;
    const struct effort_model *effort = &models->effort;
    const double pairs[][2] = {
        {models->unknown_length.median, 5},
        {models->unknown_length.sigma, .7},
        {models->conductor_sigma, .02},
        {models->unknown_cpc_mm2, 1.5},
        {models->unknown_cpc_sigma, .7},
        {meter->gain_sigma, .01},
        {meter->lead_sigma, .01},
        {meter->face_sigma, .01},
        {meter->wander_sigma, .03},
        {meter->noise_floor, .015},
        {meter->noise_relative, .015},
        {meter->step, .01},
        {meter->misread, .01},
        {meter->open_wrong, .001},
        {meter->misread_floor, .05},
        {meter->over_range, 99.9},
        {effort->change_of_setup, 4},
        {effort->reading_at_point, 1},
        {effort->reading_at_board, .5},
        {effort->wander_first, 3},
        {effort->wander_next, 1.5},
        {effort->check_face, 1},
        {effort->open_accessory, 6},
        {effort->open_junction_box, 45},
        {effort->open_board, 2},
        {effort->open_run, 90},
        {effort->stop_share, .05},
    };
    for (size_t i = 0; i < sizeof pairs / sizeof pairs[0]; i++)
        ck_assert_msg(pairs[i][0] == pairs[i][1], "row %zu: %g, not %g", i, pairs[i][0],
                      pairs[i][1]);
    ck_assert_uint_eq(models->n_cables, 6);
    ck_assert_double_eq(models->cables[3].live_mm2, 4);
    ck_assert_double_eq(models->cables[3].cpc_mm2, 1.5);
    rf_models_destroy(models);
}
END_TEST

START_TEST(filed_jobs_are_mostly_without_a_defect)
{
    struct rf_models *consulted = load(NULL, RF_RATES_CONSULTED);
    struct rf_models *archive = load(NULL, RF_RATES_ARCHIVE);
    double sum = 0;
    for (size_t i = 0; i < archive->n_families; i++) {
        const struct family_prior *row = &archive->families[i];
        sum += row->prior;
        if (strcmp(row->name, "none") != 0)
            ck_assert_double_eq_tol(row->prior / consulted->families[i].prior, .20 / .78, 1e-12);
    }
    ck_assert_double_eq(models_family(archive, "none")->prior, .80);
    ck_assert_double_eq_tol(sum, 1, 1e-12);
    rf_models_destroy(archive);
    rf_models_destroy(consulted);
}
END_TEST

START_TEST(a_size_not_in_the_table_has_no_resistance)
{
    struct rf_models *models = load(NULL, RF_RATES_CONSULTED);
    ck_assert(isnan(models_ohm_per_m(models, 2.0, 20)));
    ck_assert(isnan(models_ohm_per_m(models, NAN, 20)));
    ck_assert(!isnan(models_ohm_per_m(models, 2.5, 20)));
    rf_models_destroy(models);
    rf_models_destroy(NULL);
}
END_TEST

/* --- a directory --- */

START_TEST(a_directory_replaces_the_shipped_models)
{
    replace(FILE_FAULTS, "\"prior\": 0.13, \"ohm\": 0.5",
            "\"prior\": 0.13, \"count\": 412, \"x_note\": \"kept\", \"ohm\": 0.6");
    struct rf_models *models = load(directory, RF_RATES_CONSULTED);
    ck_assert_str_eq(rf_models_name(models), directory);
    const struct family_prior *joint = models_family(models, "joint");
    ck_assert_double_eq(joint->parameter.median, .6);
    ck_assert_double_eq(joint->count, 412);
    rf_models_destroy(models);
}
END_TEST

START_TEST(the_source_folder_is_what_is_shipped)
{
    for (int i = 0; i < N_MODEL_FILES; i++) {
        char path[PATH_MOST], bytes[16384];
        project_path(path, "models", shipped_files[i].name);
        FILE *in = fopen(path, "rb");
        ck_assert_msg(in != NULL, "%s", path);
        size_t length = fread(bytes, 1, sizeof bytes, in);
        fclose(in);
        ck_assert_uint_eq(length, shipped_files[i].length);
        ck_assert_mem_eq(bytes, shipped_files[i].bytes, length);
    }
}
END_TEST

START_TEST(a_missing_file_is_named)
{
    char path[128];
    struct rf_models *models;
    struct rf_error error;
    path_of(path, FILE_EFFORT);
    unlink(path);
    ck_assert_int_eq(rf_models_load(directory, RF_RATES_CONSULTED, &models, &error), RF_IO);
    ck_assert_ptr_null(models);
    ck_assert_ptr_nonnull(strstr(error.text, path));
    ck_assert_int_eq(rf_models_load(directory, RF_RATES_CONSULTED, &models, NULL), RF_IO);
}
END_TEST

/* --- refusals --- */

/* Which file, what is changed in it, and what the message must have behind the file's name. */
static const struct {
    int file;
    const char *old, *new, *message;
} refusals[] = {
    {FILE_FAULTS, "\"prior\": 0.22", "\"prior\": 0.23",
     ": families.rows: found priors that sum to 1.01; needs 1"},
    {FILE_FAULTS, "\"prior\": 0.22", "\"prior\": 0.220002",
     ": families.rows: found priors that sum to 1.000002; needs 1"},
    {FILE_FAULTS, "\"prior\": 0.22", "\"prior\": 0",
     ": families.rows[0].prior: found 0; needs a share above 0, at most 1"},
    {FILE_FAULTS, "\"prior\": 0.22", "\"weight\": 0.22", ": families.rows[0].weight: "},
    {FILE_FAULTS, "\"prior\": 0.22", "\"x_prior\": 0.22", ": families.rows[0].prior: missing"},
    {FILE_FAULTS, "\"none\", \"prior\"", "\"nothing\", \"prior\"",
     ": families.rows: found no row for none"},
    {FILE_FAULTS, "\"break\"", "\"none\"", ": families.rows[1]: found a second row for none"},
    {FILE_FAULTS, "\"sigma\": 1.0", "\"sigma\": -1.0",
     ": families.rows[2].sigma: found -1; needs a standard deviation of the log from 0 to 5"},
    {FILE_FAULTS, ", \"sigma\": 1.0", "", ": families.rows[2].sigma: missing"},
    {FILE_FAULTS, "\"ohm\": 0.5,", "", ": families.rows[2]: found sigma alone"},
    {FILE_FAULTS, "\"ohm\": 0.5,", "\"ohm\": 0.5, \"metres\": 2,",
     ": families.rows[2]: found ohm and metres; needs one of them"},
    {FILE_FAULTS, "\"open\": 0.3", "\"open\": 0.4",
     ": families.rows[4].kinds: found shares that sum to 1.1; needs 1"},
    {FILE_FAULTS, "{\"open\": 0.3, \"high\": 0.7}", "{}",
     ": families.rows[4].kinds: found no share"},
    {FILE_FAULTS, "{\"open\": 0.3,", "{\"a\":0.1,\"b\":0.1,\"c\":0.1,\"d\":0.1,",
     ": families.rows[4].kinds: found more than 4 shares"},
    {FILE_FAULTS, "\"prior\": 0.22", "\"prior\": 0.22, \"count\": -1",
     ": families.rows[0].count: found -1"},
    {FILE_FAULTS, "\"none\": 0.80", "\"none\": 1", ": archive.none: found 1"},
    {FILE_FAULTS, "\"kind\": \"faults\"", "\"kind\": \"effort\"", ": kind: found \"effort\""},
    {FILE_FAULTS, "ringfettle-models/1", "ringfettle-models/2", ": format: found "},
    {FILE_FAULTS, "{\n", "{,\n", ":1:2: "},
    {FILE_CONDUCTOR, "12.1", "18.1", ": sizes.rows[1]: found 1.5 mm² of 18.1 Ω/km behind"},
    {FILE_CONDUCTOR, "12.1", "\"12.1\"", ": sizes.rows[1].ohm_per_km: found \"12.1\""},
    {FILE_CONDUCTOR, "{\"live_mm2\": 1.5", "{\"live_mm2\": 2",
     ": cables.rows[0].live_mm2: found 2; needs a size that has a row in sizes"},
    {FILE_CONDUCTOR, "{\"live_mm2\": 1.5, ", "{\"live_mm2\": 2.5, ",
     ": cables.rows[1]: found 2.5/1 mm² again"},
    {FILE_CONDUCTOR, "\"mm2\": 1.5,\n", "\"mm2\": 2,\n",
     ": unknown_cpc.mm2: found 2; needs a size that has a row in sizes"},
    {FILE_CONDUCTOR, "\"cables\"", "\"x_cables\"", ": cables: missing"},
    {FILE_INSTRUMENT, "\"lead_ohm\": 0.01", "\"lead_ohm\": -0.01",
     ": offsets.lead_ohm: found -0.01; needs ohms from 0 to 10"},
    {FILE_INSTRUMENT, "\"sigma\": 0.01", "\"sigma\": null", ": gain.sigma: found null"},
    {FILE_INSTRUMENT, "\"source\"", "\"x_source\"", ": gain.source: missing"},
    {FILE_INSTRUMENT, "\"gain\"", "\"gian\"", ": gian: "},
    {FILE_INSTRUMENT, "\"sigma\": 0.01", "\"sigma\": 0.01, \"sigma\": 0.02", ": gain.sigma: "},
    {FILE_EFFORT, "\"family\": \"joint\"", "\"family\": \"solder\"",
     ": shows.rows[1].family: found \"solder\"; needs a family of faults.json, other than none"},
    {FILE_EFFORT, "\"family\": \"joint\"", "\"family\": \"none\"",
     ": shows.rows[1].family: found \"none\""},
    {FILE_EFFORT, "\"family\": \"joint\"", "\"family\": \"break\"",
     ": shows.rows[1]: found a second row for break"},
    {FILE_EFFORT, ",\n      {\"family\": \"not_nulled\", \"shares\": {\"place\": 1}}", "",
     ": shows.rows: found no row for not_nulled"},
    {FILE_EFFORT, "\"point\": 0.4", "\"point\": 1.4", ": shows.rows[7].shares.point: found 1.4"},
    {FILE_EFFORT, "\"open_run\": 90", "\"open_run\": -90",
     ": minutes.open_run: found -90; needs minutes from 0 to 10000"},
};

START_TEST(bad_models_are_refused)
{
    char expected[512];
    struct rf_models *models;
    struct rf_error error;
    replace(refusals[_i].file, refusals[_i].old, refusals[_i].new);
    enum rf_status status = rf_models_load(directory, RF_RATES_ARCHIVE, &models, &error);
    ck_assert_msg(status == RF_REFUSED || status == RF_SYNTAX, "status %d for %s", (int)status,
                  refusals[_i].new);
    ck_assert_ptr_null(models);
    ck_assert_int_eq(error.status, status);
    path_of(expected, refusals[_i].file);
    strcat(expected, refusals[_i].message);
    ck_assert_msg(strncmp(error.text, expected, strlen(expected)) == 0,
                  "the message is\n  %s\nand should begin\n  %s", error.text, expected);
}
END_TEST

static Suite *suite(void)
{
    Suite *made = suite_create("models");
    TCase *shipped = tcase_create("shipped");
    tcase_add_test(shipped, shipped_families_are_as_stated);
    tcase_add_test(shipped, shipped_kinds_and_shares_are_as_stated);
    tcase_add_test(shipped, shipped_numbers_are_as_stated);
    tcase_add_test(shipped, filed_jobs_are_mostly_without_a_defect);
    tcase_add_test(shipped, a_size_not_in_the_table_has_no_resistance);
    tcase_add_test(shipped, the_source_folder_is_what_is_shipped);
    suite_add_tcase(made, shipped);

    TCase *own = tcase_create("directory");
    tcase_add_checked_fixture(own, make_directory, remove_directory);
    tcase_add_test(own, a_directory_replaces_the_shipped_models);
    tcase_add_test(own, a_missing_file_is_named);
    tcase_add_loop_test(own, bad_models_are_refused, 0,
                        (int)(sizeof refusals / sizeof refusals[0]));
    suite_add_tcase(made, own);
    return made;
}

int main(void)
{
    return run_suite(suite());
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Loading models when memory is short: each allocation of the library fails in turn. */
#include <ringfettle/models.h>

#include "../failing.h"
#include "../project.h"
#include "../suite.h"

#include <check.h>

/* The status of loading from `directory` with allocation `failing` refused; *made: how many were
 * asked for. Nothing of Check's runs in between. */
static enum rf_status load_failing(const char *directory, size_t failing, size_t *made,
                                   struct rf_models **models, struct rf_error *error)
{
    allocations = 0;
    fail_at = failing;
    enum rf_status status = rf_models_load(directory, RF_RATES_CONSULTED, models, error);
    fail_at = 0;
    *made = allocations;
    return status;
}

static void assert_each_failure_is_answered(const char *directory)
{
    struct rf_models *models;
    struct rf_error error;
    size_t needed, made;
    ck_assert_int_eq(load_failing(directory, 0, &needed, &models, &error), RF_OK);
    rf_models_destroy(models);
    ck_assert_uint_gt(needed, 10); /* tables, names, four texts and their names */
    for (size_t i = 1; i <= needed; i++) {
        enum rf_status status = load_failing(directory, i, &made, &models, &error);
        ck_assert_msg(status == RF_MEMORY, "allocation %zu: status %d", i, (int)status);
        ck_assert_ptr_null(models);
    }
}

START_TEST(shipped_models_when_memory_is_short)
{
    assert_each_failure_is_answered(NULL);
}
END_TEST

START_TEST(a_directory_when_memory_is_short)
{
    char directory[PATH_MOST];
    project_path(directory, ".", "models");
    assert_each_failure_is_answered(directory);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("models when memory is short");
    TCase *tests = tcase_create("memory");
    tcase_add_test(tests, shipped_models_when_memory_is_short);
    tcase_add_test(tests, a_directory_when_memory_is_short);
    suite_add_tcase(suite, tests);
    return run_suite(suite);
}

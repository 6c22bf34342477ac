/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef TESTS_SUITE_H
#define TESTS_SUITE_H

#include <check.h>
#include <stdlib.h>

/* Runs the suite and frees it; main's exit status. CK_VERBOSITY says how much is told. */
static inline int run_suite(Suite *suite)
{
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_ENV);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}

#endif

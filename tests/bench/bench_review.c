/* SPDX-License-Identifier: GPL-3.0-or-later */
#define _DEFAULT_SOURCE /* wait4 */

/*
 * What reviewing an archive takes: bench_review [JOBS [SEED]], 1000 and 1 if not given. $RINGFETTLE
 * is the program. The archive is invented: random rings, faults and noise drawn from the shipped
 * models at the base rates of filed jobs, so the scorecard measures the method under its own
 * assumptions and nothing else.
 *
 *   rate       jobs a second by the wall clock and by the processor's, of one run on 2 threads,
 *              and of four parts of it one after another on 1 thread
 *   memory     the program's peak (ru_maxrss), the largest part's
 *   same       whether the bytes are: the lines of the one run and of the parts; the summary of
 *              the one run and of the parts merged
 *
 * then the summary with its scorecard.
 */

#include "base/text.h"
#include "simulation/simulation.h"

#include <gsl/gsl_errno.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/resource.h>
#include <sys/time.h>
#include <sys/wait.h>
#include <time.h>
#include <unistd.h>

enum { N_PARTS = 4 };

static _Noreturn void give_up(const char *what)
{
    fprintf(stderr, "bench_review: %s\n", what);
    exit(EXIT_FAILURE);
}

static double now(void)
{
    struct timespec time;
    clock_gettime(CLOCK_MONOTONIC, &time);
    return (double)time.tv_sec + 1e-9 * (double)time.tv_nsec;
}

/* --- the archive --- */

static bool write_job(FILE *file, const struct rf_models *models, uint32_t seed)
{
    const struct simulation simulation = {.seed = seed};
    struct rf_job *ring = NULL;
    struct truth *truth = NULL;
    struct text out = {0};
    bool ok = simulation_random_ring(seed, PLAN_STANDARD, &ring, NULL) == RF_OK &&
              simulate(ring, models, &simulation, &truth, NULL) == RF_OK &&
              truth_write_job(truth, true, &out, NULL) == RF_OK && !out.failed &&
              fprintf(file, "%s%s", out.bytes, out.bytes[out.length - 1] == '\n' ? "" : "\n") > 0;
    text_finish(&out);
    truth_destroy(truth);
    rf_job_destroy(ring);
    return ok;
}

static bool write_archive(unsigned long jobs, uint32_t seed)
{
    char name[32];
    FILE *file = NULL;
    struct rf_models *models;
    bool ok = rf_models_load(NULL, RF_RATES_ARCHIVE, &models, NULL) == RF_OK;
    for (unsigned long i = 0; i < jobs && ok; i++) {
        if (i % ((jobs + N_PARTS - 1) / N_PARTS) == 0) {
            if (file != NULL)
                fclose(file);
            snprintf(name, sizeof name, "part%lu", i / ((jobs + N_PARTS - 1) / N_PARTS));
            file = fopen(name, "wb");
        }
        ok = file != NULL && write_job(file, models, seed + (uint32_t)i);
    }
    return ok && file != NULL && fclose(file) == 0 && system("cat part? >jobs.ndjson") == 0;
}

/* In a process of its own: a child's peak counts from its parent's. */
static void make_archive(unsigned long jobs, uint32_t seed)
{
    int status = 0;
    pid_t child = fork();
    if (child == 0)
        _exit(write_archive(jobs, seed) ? 0 : 1);
    if (child < 0 || waitpid(child, &status, 0) < 0 || status != 0)
        give_up("the archive cannot be made");
}

/* --- the program --- */

struct taken {
    double seconds, processor, megabytes;
};

static double seconds_of(struct timeval time)
{
    return (double)time.tv_sec + 1e-6 * (double)time.tv_usec;
}

/* Runs the program and adds what it took; of memory, the most. */
static void run(const char *arguments, struct taken *taken)
{
    char command[512];
    int status = 0;
    struct rusage usage = {0};
    double start = now();
    pid_t child = fork();
    if (child == 0) {
        snprintf(command, sizeof command, "exec \"$RINGFETTLE\" review %s", arguments);
        execl("/bin/sh", "sh", "-c", command, (char *)NULL);
        _exit(127);
    }
    if (child < 0 || wait4(child, &status, 0, &usage) < 0 || status != 0)
        give_up("the program failed");
    double megabytes = (double)usage.ru_maxrss / 1024;
    taken->seconds += now() - start;
    taken->processor += seconds_of(usage.ru_utime) + seconds_of(usage.ru_stime);
    taken->megabytes = megabytes > taken->megabytes ? megabytes : taken->megabytes;
}

static void say(const char *what, double jobs, const struct taken *taken)
{
    printf("%-22s %8.1f jobs/s, %7.1f jobs per processor second, peak %5.1f MiB\n", what,
           jobs / taken->seconds, jobs / taken->processor, taken->megabytes);
}

static const char *same(const char *comparison)
{
    return system(comparison) == 0 ? "yes" : "NO";
}

static void measure(unsigned long jobs)
{
    struct taken whole = {0}, parts = {0}, merge = {0};
    run("--json --threads 2 jobs.ndjson >whole.out", &whole);
    for (int i = 0; i < N_PARTS; i++) {
        char arguments[64];
        snprintf(arguments, sizeof arguments, "--json --threads 1 part%d >part%d.out", i, i);
        run(arguments, &parts);
    }
    run("--merge --json part?.out >merged.out", &merge);
    printf("%lu jobs\n", jobs);
    say("one run, 2 threads", (double)jobs, &whole);
    say("4 parts, 1 thread", (double)jobs, &parts);
    say("merging the parts", (double)jobs, &merge);
    printf("same lines    %s\n",
           same("for i in 0 1 2 3; do sed '$d' part$i.out; done >lines.out; sed '$d' whole.out | "
                "cmp - lines.out"));
    printf("same summary  %s\n", same("tail -n 1 whole.out | cmp - merged.out"));
    fflush(stdout);
    run("--merge whole.out", &merge);
}

int main(int argc, char *argv[])
{
    unsigned long jobs = argc > 1 ? strtoul(argv[1], NULL, 10) : 1000;
    unsigned long seed = argc > 2 ? strtoul(argv[2], NULL, 10) : 1;
    char folder[] = "/tmp/ringfettle-bench-XXXXXX", command[64];
    gsl_set_error_handler_off();
    if (jobs < N_PARTS || getenv("RINGFETTLE") == NULL)
        give_up("usage: RINGFETTLE=PROGRAM bench_review [JOBS [SEED]], JOBS at least 4");
    if (mkdtemp(folder) == NULL || chdir(folder) != 0)
        give_up("no folder to work in");
    make_archive(jobs, (uint32_t)seed);
    measure(jobs);
    snprintf(command, sizeof command, "rm -r %s", folder);
    return chdir("/") == 0 && system(command) == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}

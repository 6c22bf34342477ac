/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * Runs a target over files, and over the files of folders, that are named: its seeds, as a test
 * with any compiler. Without any, over standard input: for AFL++, over and over in one process
 * where its compiler built this.
 */
#define _DEFAULT_SOURCE
#include "fuzz.h"

#include <dirent.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

enum { MOST_BYTES = 1 << 20 };

static uint8_t bytes[MOST_BYTES];

#ifdef __AFL_FUZZ_TESTCASE_LEN
__AFL_FUZZ_INIT();
#endif

/* How many inputs were run. */
static size_t run_file(const char *path)
{
    FILE *file = fopen(path, "rb");
    if (file == NULL) {
        fprintf(stderr, "%s: cannot be opened\n", path);
        exit(EXIT_FAILURE);
    }
    size_t length = fread(bytes, 1, MOST_BYTES, file);
    fclose(file);
    /* On the heap, in its length: so that reading beyond is noticed. */
    uint8_t *copy = malloc(length > 0 ? length : 1);
    if (copy == NULL)
        abort();
    memcpy(copy, bytes, length);
    LLVMFuzzerTestOneInput(copy, length);
    free(copy);
    return 1;
}

static size_t run_path(const char *path)
{
    struct stat about;
    if (stat(path, &about) != 0 || !S_ISDIR(about.st_mode))
        return run_file(path);
    size_t n = 0;
    DIR *folder = opendir(path);
    if (folder == NULL)
        abort();
    for (struct dirent *entry; (entry = readdir(folder)) != NULL;) {
        char inside[4096];
        if (entry->d_name[0] == '.')
            continue;
        snprintf(inside, sizeof inside, "%s/%s", path, entry->d_name);
        n += run_path(inside);
    }
    closedir(folder);
    return n;
}

static void run_standard_input(void)
{
#ifdef __AFL_FUZZ_TESTCASE_LEN
    __AFL_INIT();
    const uint8_t *shared = __AFL_FUZZ_TESTCASE_BUF;
    while (__AFL_LOOP(1000))
        LLVMFuzzerTestOneInput(shared, (size_t)__AFL_FUZZ_TESTCASE_LEN);
#else
    LLVMFuzzerTestOneInput(bytes, fread(bytes, 1, MOST_BYTES, stdin));
#endif
}

int main(int argc, char **argv)
{
    size_t n = 0;
    if (argc == 1) {
        run_standard_input();
        return EXIT_SUCCESS;
    }
    for (int i = 1; i < argc; i++)
        n += run_path(argv[i]);
    printf("%zu inputs\n", n);
    return n > 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}

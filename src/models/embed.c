/* SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * A program of the build: writes the files named as one C source, in the order named, for
 * models/shipped.h. Bytes one by one, for a string literal longer than 4095 bytes is outside C.
 *     embed OUTPUT FILE...
 */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static const char *file_name(const char *path)
{
    const char *slash = strrchr(path, '/');
    return slash == NULL ? path : slash + 1;
}

/* The file as `bytes_<index>`; 0 where that succeeded. */
static int write_bytes(FILE *out, const char *path, int index)
{
    FILE *in = fopen(path, "rb");
    if (in == NULL)
        return -1;
    fprintf(out, "static const char bytes_%d[] = {", index);
    int byte, column = 0;
    while ((byte = getc(in)) != EOF) {
        /* char may be signed: bytes of UTF-8 beyond ASCII go in as what they become */
        fprintf(out, "%s%d,", column++ % 20 == 0 ? "\n    " : " ", (signed char)byte);
    }
    fprintf(out, "\n    0};\n");
    int failed = ferror(in);
    fclose(in);
    return failed;
}

int main(int argc, char **argv)
{
    if (argc < 3) {
        fprintf(stderr, "embed: needs OUTPUT FILE...\n");
        return EXIT_FAILURE;
    }
    FILE *out = fopen(argv[1], "w");
    if (out == NULL) {
        perror(argv[1]);
        return EXIT_FAILURE;
    }
    fprintf(out, "/* Written by src/models/embed.c. */\n#include \"models/shipped.h\"\n\n");
    for (int i = 2; i < argc; i++) {
        if (write_bytes(out, argv[i], i) != 0) {
            perror(argv[i]);
            fclose(out);
            return EXIT_FAILURE;
        }
    }
    fprintf(out, "\nconst struct shipped_file shipped_files[N_MODEL_FILES] = {\n");
    for (int i = 2; i < argc; i++)
        fprintf(out, "    {\"%s\", bytes_%d, sizeof bytes_%d - 1},\n", file_name(argv[i]), i, i);
    fprintf(out, "};\n");
    int failed = ferror(out);
    return fclose(out) != 0 || failed ? EXIT_FAILURE : EXIT_SUCCESS;
}

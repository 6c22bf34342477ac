/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/error.h"
#include "base/json.h"
#include "base/memory.h"
#include "base/text.h"
#include "models/read.h"

#include <errno.h>
#include <math.h>
#include <stdio.h>
#include <string.h>
#include <sys/stat.h>

enum { FILE_MAX_BYTES = 1024 * 1024 };

/* One model file's text and what messages call it. */
struct source {
    struct text name, bytes;
};

static enum rf_status read_file(struct source *source, struct rf_error *error)
{
    const char *path = source->name.bytes;
    struct stat about;
    if (stat(path, &about) == 0 && !S_ISREG(about.st_mode)) /* a pipe would keep us waiting */
        return fail(error, RF_REFUSED, "%s: found %s; needs a model file", path,
                    S_ISDIR(about.st_mode) ? "a folder" : "a device, pipe or socket");
    FILE *file = fopen(path, "rb");
    if (file == NULL)
        return fail(error, RF_IO, "%s: cannot be opened: %s", path, strerror(errno));
    enum rf_status status = RF_OK;
    char block[4096];
    size_t length;
    while (status == RF_OK && (length = fread(block, 1, sizeof block, file)) > 0) {
        text_append(&source->bytes, block, length);
        if (source->bytes.failed)
            status = fail_memory(error);
        else if (source->bytes.length > FILE_MAX_BYTES)
            status = fail(error, RF_LIMIT, "%s: found more than %d bytes; needs a model file", path,
                          FILE_MAX_BYTES);
    }
    if (status == RF_OK && ferror(file))
        status = fail(error, RF_IO, "%s: cannot be read: %s", path, strerror(errno));
    fclose(file);
    return status;
}

/* The file's text, shipped where `directory` is NULL. */
static enum rf_status get_source(enum model_file file, const char *directory, struct source *source,
                                 struct rf_error *error)
{
    const struct shipped_file *shipped = &shipped_files[file];
    if (directory == NULL) {
        text_addf(&source->name, "shipped %s", shipped->name);
        text_append(&source->bytes, shipped->bytes, shipped->length);
    } else {
        text_addf(&source->name, "%s/%s", directory, shipped->name);
    }
    if (source->name.failed || source->bytes.failed)
        return fail_memory(error);
    return directory == NULL ? RF_OK : read_file(source, error);
}

/* `format` and `kind`, and no key that is not of this kind of file. */
static enum rf_status check_document(const struct json_at *document, enum model_file file,
                                     struct rf_error *error)
{
    static const char *const formats[] = {"ringfettle-models/1"};
    static const char *const kinds[N_MODEL_FILES] = {
        [FILE_CONDUCTOR] = "conductor",
        [FILE_INSTRUMENT] = "instrument",
        [FILE_FAULTS] = "faults",
        [FILE_EFFORT] = "effort",
    };
    const char *keys[2 + 2 * BLOCKS_MAX] = {"format", "kind"};
    size_t n_keys = 2, index;
    for (size_t i = 0; i < n_number_blocks[file]; i++)
        keys[n_keys++] = number_blocks[file][i].name;
    for (size_t i = 0; i < n_row_blocks[file]; i++)
        keys[n_keys++] = row_blocks[file][i].name;

    struct json_at format = json_member(document, "format");
    struct json_at kind = json_member(document, "kind");
    enum rf_status status = json_object(document, keys, n_keys, error);
    if (status == RF_OK)
        status = json_choice(&format, formats, 1, &index, error);
    if (status == RF_OK)
        status = json_choice(&kind, &kinds[file], 1, &index, error);
    return status;
}

/* Reads one file's text into the tables. */
static enum rf_status read_source(enum model_file file, const struct source *source,
                                  struct rf_models *models, struct rf_error *error)
{
    cJSON *tree = NULL;
    const char *bytes = source->bytes.bytes == NULL ? "" : source->bytes.bytes;
    enum rf_status status =
        json_parse(bytes, source->bytes.length, source->name.bytes, JSON_DOCUMENT, &tree, error);
    if (status != RF_OK)
        return status;
    struct json_at document = json_document(tree, source->name.bytes);
    status = check_document(&document, file, error);
    for (size_t i = 0; status == RF_OK && i < n_number_blocks[file]; i++)
        status = read_number_block(&document, &number_blocks[file][i], models, error);
    for (size_t i = 0; status == RF_OK && i < n_row_blocks[file]; i++)
        status = read_row_block(&document, &row_blocks[file][i], models, error);
    if (status == RF_OK && file == FILE_CONDUCTOR &&
        isnan(models_ohm_per_m(models, models->unknown_cpc_mm2, 20))) {
        struct json_at block = json_member(&document, "unknown_cpc");
        struct json_at size = json_member(&block, "mm2");
        status = json_fail_found(&size, error, "a size that has a row in sizes");
    }
    cJSON_Delete(tree);
    return status;
}

/* Where a defect is certain, "none" keeps a trace, so that its logarithm is a number. */
static const double trace = 1e-9;

/* `none` gets another share, the others keep their proportions. */
static void take_rates(struct rf_models *models, double none)
{
    double defects = 1 - models_family(models, "none")->prior;
    for (size_t i = 0; i < models->n_families; i++) {
        struct family_prior *family = &models->families[i];
        if (strcmp(family->name, "none") == 0)
            family->prior = none;
        else
            family->prior *= (1 - none) / defects;
    }
}

enum rf_status rf_models_load(const char *directory, enum rf_base_rates rates,
                              struct rf_models **models, struct rf_error *error)
{
    struct source sources[N_MODEL_FILES] = {0};
    enum rf_status status = RF_OK;
    size_t room = 0;
    *models = NULL;
    struct rf_models *made = NEW(struct rf_models);
    if (made == NULL)
        return fail_memory(error);
    for (int i = 0; status == RF_OK && i < N_MODEL_FILES; i++) {
        status = get_source((enum model_file)i, directory, &sources[i], error);
        room += sources[i].bytes.length;
    }
    if (status == RF_OK) {
        /* a name in a file is longer by its quotes than the name kept with its terminator */
        made->strings = NEW_ARRAY(char, room);
        made->name = text_duplicate(directory == NULL ? "shipped" : directory);
        if (made->strings == NULL || made->name == NULL)
            status = fail_memory(error);
    }
    for (int i = 0; status == RF_OK && i < N_MODEL_FILES; i++)
        status = read_source((enum model_file)i, &sources[i], made, error);
    if (status == RF_OK && rates == RF_RATES_ARCHIVE)
        take_rates(made, made->archive_none);
    if (status == RF_OK && rates == RF_RATES_CERTAIN)
        take_rates(made, trace);
    for (int i = 0; i < N_MODEL_FILES; i++) {
        text_finish(&sources[i].name);
        text_finish(&sources[i].bytes);
    }
    if (status == RF_OK)
        *models = made;
    else
        rf_models_destroy(made);
    return status;
}

const char *rf_models_name(const struct rf_models *models)
{
    return models->name;
}

void rf_models_destroy(struct rf_models *models)
{
    if (models == NULL)
        return;
    free(models->name);
    free(models->strings);
    free(models);
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "models/read.h"

#include <float.h>

#define COUNT(array) (sizeof(array) / sizeof(array)[0])
#define INTO(member) offsetof(struct rf_models, member)

/* Of the log. 5 would say that a factor of a hundred either way surprises nobody. */
#define SIGMA(key, member) {key, 0, 5, "a standard deviation from 0 to 5", INTO(member)}
#define OHM_SIGMA(key, member) {key, 0, 10, "ohms from 0 to 10", INTO(member)}
#define SHARE(key, member)                                                                         \
    {key, DBL_MIN, 1 - DBL_EPSILON, "a share above 0 and below 1", INTO(member)}
#define MINUTES(key, member) {key, 0, 10000, "minutes from 0 to 10000", INTO(member)}

static const struct number_field temperature[] = {
    {"coefficient_per_c", 0, 0.01, "a coefficient from 0 to 0.01 per °C",
     INTO(temperature_coefficient)},
};
static const struct number_field unrecorded_run[] = {
    {"metres", 0.1, 500, "metres from 0.1 to 500", INTO(unknown_length.median)},
    SIGMA("sigma", unknown_length.sigma),
};
static const struct number_field conductor_factor[] = {SIGMA("sigma", conductor_sigma)};
static const struct number_field unknown_cpc[] = {
    {"mm2", 0.1, 1000, "a size in mm²", INTO(unknown_cpc_mm2)},
    SIGMA("sigma", unknown_cpc_sigma),
};
static const struct number_block conductor_blocks[] = {
    {"temperature", COUNT(temperature), temperature},
    {"unrecorded_run", COUNT(unrecorded_run), unrecorded_run},
    {"conductor_factor", COUNT(conductor_factor), conductor_factor},
    {"unknown_cpc", COUNT(unknown_cpc), unknown_cpc},
};

static const struct number_field gain[] = {SIGMA("sigma", instrument.gain_sigma)};
static const struct number_field offsets[] = {
    OHM_SIGMA("lead_ohm", instrument.lead_sigma),
    OHM_SIGMA("face_ohm", instrument.face_sigma),
    OHM_SIGMA("wander_ohm", instrument.wander_sigma),
};
static const struct number_field noise[] = {
    {"floor_ohm", 1e-6, 10, "ohms from 0.000001 to 10", INTO(instrument.noise_floor)},
    {"relative", 0, 1, "a share from 0 to 1", INTO(instrument.noise_relative)},
    OHM_SIGMA("step_ohm", instrument.step),
};
static const struct number_field misread[] = {
    SHARE("share", instrument.misread),
    {"floor_ohm", 1e-6, 5, "ohms from 0.000001 to 5", INTO(instrument.misread_floor)},
};
static const struct number_field over_range[] = {
    {"ohm", 10, 10000, "ohms from 10 to 10000", INTO(instrument.over_range)},
    SHARE("wrong", instrument.open_wrong),
};
static const struct number_block instrument_blocks[] = {
    {"gain", COUNT(gain), gain},
    {"offsets", COUNT(offsets), offsets},
    {"noise", COUNT(noise), noise},
    {"misread", COUNT(misread), misread},
    {"over_range", COUNT(over_range), over_range},
};

static const struct number_field archive[] = {SHARE("none", archive_none)};
static const struct number_block faults_blocks[] = {{"archive", COUNT(archive), archive}};

static const struct number_field minutes[] = {
    MINUTES("change_of_setup", effort.change_of_setup),
    MINUTES("reading_at_point", effort.reading_at_point),
    MINUTES("reading_at_board", effort.reading_at_board),
    MINUTES("wander_first", effort.wander_first),
    MINUTES("wander_next", effort.wander_next),
    MINUTES("check_face", effort.check_face),
    MINUTES("open_accessory", effort.open_accessory),
    MINUTES("open_junction_box", effort.open_junction_box),
    MINUTES("open_board", effort.open_board),
    MINUTES("open_run", effort.open_run),
};
static const struct number_field stop[] = {SHARE("share", effort.stop_share)};
static const struct number_block effort_blocks[] = {
    {"minutes", COUNT(minutes), minutes},
    {"stop", COUNT(stop), stop},
};

const struct number_block *const number_blocks[N_MODEL_FILES] = {
    [FILE_CONDUCTOR] = conductor_blocks,
    [FILE_INSTRUMENT] = instrument_blocks,
    [FILE_FAULTS] = faults_blocks,
    [FILE_EFFORT] = effort_blocks,
};
const size_t n_number_blocks[N_MODEL_FILES] = {
    [FILE_CONDUCTOR] = COUNT(conductor_blocks),
    [FILE_INSTRUMENT] = COUNT(instrument_blocks),
    [FILE_FAULTS] = COUNT(faults_blocks),
    [FILE_EFFORT] = COUNT(effort_blocks),
};

enum rf_status open_block(const struct json_at *document, const char *name,
                          const char *const keys[], size_t n_keys, struct json_at *block,
                          struct rf_error *error)
{
    *block = json_member(document, name);
    enum rf_status status = json_object(block, keys, n_keys, error);
    if (status != RF_OK)
        return status;
    struct json_at source = json_member(block, "source");
    const char *text;
    return json_string(&source, "where the numbers come from, in words", &text, error);
}

enum rf_status read_number_block(const struct json_at *document, const struct number_block *block,
                                 struct rf_models *models, struct rf_error *error)
{
    const char *keys[FIELDS_MAX + 1] = {"source"};
    for (size_t i = 0; i < block->n_fields; i++)
        keys[i + 1] = block->fields[i].key;
    struct json_at at;
    enum rf_status status =
        open_block(document, block->name, keys, block->n_fields + 1, &at, error);
    for (size_t i = 0; status == RF_OK && i < block->n_fields; i++) {
        const struct number_field *field = &block->fields[i];
        struct json_at member = json_member(&at, field->key);
        double *number = (double *)(void *)((char *)models + field->offset);
        status = json_number(&member, field->low, field->high, field->needs, number, error);
    }
    return status;
}

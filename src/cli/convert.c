/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "cli/convert.h"

#include "base/error.h"
#include "base/file.h"
#include "job/job_edit.h"
#include "job/job_write.h"

#include <string.h>

bool read_style(const struct invocation *invocation, struct sheet_style *style)
{
    const char *separator = option_value(invocation, "separator");
    const char *decimal = option_value(invocation, "decimal");
    *style = (struct sheet_style){0};
    if (separator != NULL) {
        style->separator = strcmp(separator, "comma") == 0       ? ','
                           : strcmp(separator, "semicolon") == 0 ? ';'
                           : strcmp(separator, "tab") == 0       ? '\t'
                                                                 : '\0';
        if (style->separator == '\0') {
            complain_usage(invocation->command, "--separator: found %s; needs comma, semicolon "
                           "or tab",
                           separator);
            return false;
        }
    }
    if (decimal != NULL) {
        style->decimal = strcmp(decimal, "point") == 0   ? '.'
                         : strcmp(decimal, "comma") == 0 ? ','
                                                         : '\0';
        if (style->decimal == '\0') {
            complain_usage(invocation->command, "--decimal: found %s; needs point or comma",
                           decimal);
            return false;
        }
    }
    return true;
}

static enum rf_status put_line(void *context, const struct rf_job *job, struct rf_error *error)
{
    struct text line = {0};
    (void)context;
    enum rf_status status = job_write_line(job, &line, error);
    text_add(&line, "\n");
    if (status == RF_OK)
        status = put(&line, error);
    text_finish(&line);
    return status;
}

static enum rf_status write_job(const struct rf_job *job, bool as_sheet,
                                const struct sheet_style *asked, struct text *out,
                                struct rf_error *error)
{
    struct sheet_style style = *asked;
    if (style.separator == '\0') /* a comma would want every decimal comma in quotes */
        style.separator = style.decimal == ',' ? ';' : ',';
    if (style.decimal == '\0')
        style.decimal = '.';
    return as_sheet ? sheet_write(job->document, &style, NULL, 0, out, error)
                    : job_write(job, out, error);
}

static enum rf_status convert_one(const struct invocation *invocation, const char *to,
                                  const struct sheet_style *style, struct rf_error *error)
{
    const char *path = invocation->operands[0];
    const char *output = option_value(invocation, "output");
    struct text bytes = {0}, out = {0};
    struct rf_job *job = NULL;
    struct file_hold *hold = NULL;
    enum rf_status status = file_read(path, JOB_MAX_BYTES, &bytes, error);
    if (status == RF_OK)
        status = job_read_bytes(&bytes, strcmp(path, "-") == 0 ? "standard input" : path, 0, &job,
                                error);
    bool as_sheet = to != NULL ? strcmp(to, "sheet") == 0 : !job_bytes_are_sheet(&bytes);
    if (status == RF_OK)
        status = write_job(job, as_sheet, style, &out, error);
    if (status == RF_OK)
        status = output != NULL ? file_create(output, &out, &hold, error) : put(&out, error);
    file_release(hold);
    rf_job_destroy(job);
    text_finish(&bytes);
    text_finish(&out);
    return status;
}

static enum rf_class run(const struct invocation *invocation)
{
    struct rf_error error;
    struct sheet_style style;
    const struct command *command = invocation->command;
    const char *to = option_value(invocation, "to");
    if (!read_style(invocation, &style))
        return RF_CLASS_INPUT;
    if (to != NULL && strcmp(to, "sheet") != 0 && strcmp(to, "json") != 0 &&
        strcmp(to, "ndjson") != 0)
        return complain_usage(command, "--to: found %s; needs sheet, json or ndjson", to);
    if (option_value(invocation, "long") != NULL) {
        if ((to != NULL && strcmp(to, "ndjson") != 0) || invocation->n_operands > 1)
            return complain_usage(command, "--long reads one table and gives ndjson");
        return convert_long(invocation, &style);
    }
    if (option_value(invocation, "columns") != NULL || option_value(invocation, "rejects") != NULL)
        return complain_usage(command, "--columns and --rejects go with --long");
    if (to != NULL && strcmp(to, "ndjson") == 0) {
        if (option_value(invocation, "output") != NULL)
            return complain_usage(command, "ndjson goes to standard output");
        return each_job(invocation, put_line, NULL);
    }
    if (invocation->n_operands > 1)
        return complain_usage(command, "needs one job; --to ndjson takes several");
    return convert_one(invocation, to, &style, &error) == RF_OK ? RF_CLASS_DONE
                                                                 : complain_of(&error);
}

const struct command command_convert = {
    .name = "convert",
    .summary = "turn a job from JSON into a sheet or back, or a long table into jobs",
    .operands = "JOB…",
    .about =
        "A JSON file becomes a sheet and a sheet a JSON file, with nothing lost: keys of your own, "
        "repeats, what was found, opened and checked. --to ndjson gives one job a line.\n\n"
        "--long reads a table of one reading a row with columns job, setup, place and value, and "
        "where there are any seq, label, kind, metres, from, date, note, live_mm2, cpc_mm2, "
        "temperature_c, length_accuracy and found, and gives one job a line. The rows of a job "
        "stand together, its points in ring order or numbered by seq. A job with a bad row is not "
        "made: each bad row is named on standard error, and all rows of the job go to the file "
        "of --rejects, under the same columns, to be put right and read again.",
    .n_options = 7,
    .options =
        {{"to", "FORMAT", "sheet, json or ndjson (usual: the other of sheet and json)"},
         {"separator", "NAME", "comma, semicolon or tab: of the sheet written, of the table read"},
         {"decimal", "NAME", "point or comma: of the sheet written, of the table read"},
         {"output", "FILE", "write to FILE, which must be new, and not to standard output"},
         {"long", NULL, "read a table of one reading a row"},
         {"columns", "LIST", "what columns are called in the table: job=Ref,value=Ohms"},
         {"rejects", "FILE", "keep rows of jobs that are not made in FILE, which must be new"}},
    .least = 1,
    .most = SEVERAL,
    .needs = "a job file, or - for standard input",
    .run = run,
};

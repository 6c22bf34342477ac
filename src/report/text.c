/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/text_parts.h"
#include "report/wrap.h"

#include <string.h>

static void header(const struct rf_diagnosis *diagnosis, struct text *out)
{
    const struct rf_job *job = diagnosis->job;
    struct text line = {0};
    text_add(&line, rf_job_name(job));
    if (job->date != NULL)
        text_addf(&line, ", %s", job->date);
    text_addf(&line, ": ring of %zu point%s", job->n_ring, job->n_ring == 1 ? "" : "s");
    if (job->n_spurs > 0)
        text_addf(&line, " and %zu spur point%s", job->n_spurs, job->n_spurs == 1 ? "" : "s");
    text_addf(&line, ", %zu reading%s", job->n_readings, job->n_readings == 1 ? "" : "s");
    if (!line.failed)
        wrap_words(out, "", "  ", line.bytes);
    out->failed = out->failed || line.failed;
    text_finish(&line);
}

static void text_cautions(const struct rf_diagnosis *diagnosis, const struct rf_advice *advice,
                          struct text *out)
{
    static const char *const cautions[] = {
        "Dead tests only. Isolate the whole board, lock it off, and prove dead at the conductors "
        "you "
        "disconnect, neutrals too: an interconnection can be live from elsewhere.",
        "Energise nothing while a CPC is off. Put no broken ring back on a 32 A device. Remove "
        "every "
        "link; retest after the repair.",
        "This guides where to look and certifies nothing. BS 7671 or the local code, and a "
        "competent, "
        "licensed person, decide. Low insulation resistance, and faults that show only under load, "
        "are outside this method.",
    };
    (void)diagnosis;
    (void)advice;
    text_heading(out, "CAUTIONS");
    for (size_t i = 0; i < sizeof cautions / sizeof cautions[0]; i++)
        wrap_words(out, "- ", "  ", cautions[i]);
}

/* What is needed at once stands first; no table stands before the plan. */
static report_section *const sections[] = {
    text_misfit, text_danger,   text_checks,  text_where,    text_findings,
    text_blind,  text_readings, text_figures, text_cautions,
};

void report_text(const struct rf_diagnosis *diagnosis, const struct rf_advice *advice,
                 struct text *out)
{
    header(diagnosis, out);
    for (size_t i = 0; i < sizeof sections / sizeof sections[0]; i++)
        sections[i](diagnosis, advice, out);
}

void report_divider(struct text *out)
{
    text_add(out, "\n");
    for (size_t i = 0; i < REPORT_COLUMNS; i++)
        text_add(out, "=");
    text_add(out, "\n\n");
}

void text_heading(struct text *out, const char *heading)
{
    text_addf(out, "\n%s\n", heading);
}

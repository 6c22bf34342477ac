/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef ADVICE_WORDS_H
#define ADVICE_WORDS_H

/* What to do, in words: looks, connections at the board, readings. Imperatives without a capital at
 * the start or a full stop. */

#include "faults/fault.h"
#include "fit/forward.h"

/* "take P4 (landing) off", "take the lid off the junction box P5", "look in the board", "see to the
 * face of P4: …", "look along the cable P3 to P4". */
void say_look(const struct rf_job *job, const struct look *look, struct text *out);

/* "join outgoing line to outgoing neutral, leave the incoming ends free" */
void say_connection(size_t setup, struct text *out);

/* "read line to neutral", "read line from the lead": what the meter is put between … */
void say_meter(size_t setup, struct text *out);
/* … and where: "at P6", "at the outgoing ends". */
void say_where(const struct rf_job *job, const struct measurement *read, struct text *out);

/* A plan's readings, from the connection to the last place, as a sentence. */
struct plan;
void say_reads(const struct rf_job *job, const struct plan *plan, struct text *out);

#endif

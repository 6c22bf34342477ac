/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef REPORT_WORDS_H
#define REPORT_WORDS_H

/* What reports say in the same way everywhere. */

#include "advice/words.h"
#include "faults/fault.h"

/* A space that ends no line; wrap.h writes it as a plain one. */
#define NO_BREAK "\u00A0"

/* "crossed line-neutral", "wander lead from the outgoing line end": how the board is set up. */
void say_set_up(size_t setup, struct text *out);
/* "P3 (landing)", "board", "outgoing ends", "line (r1)": where the meter is put. */
void say_spot(const struct rf_job *job, enum spot spot, size_t place, struct text *out);
/* "0.48", "134", "over range" (NAN): Ω as a meter shows them. With the unit: "0.48 Ω". */
void say_ohms(double ohms, struct text *out);
void say_ohms_unit(double ohms, struct text *out);
/* "1 minute", "6 minutes": whole minutes, at least one. */
void say_minutes(double minutes, struct text *out);
/* "71 %", "<1 %", ">99 %" */
void say_chance(double chance, struct text *out);

#endif

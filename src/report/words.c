/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/words.h"

#include "faults/places.h"

#include <math.h>

void say_set_up(size_t setup, struct text *out)
{
    const struct setup *of = &setups[setup];
    const char *pair = pair_words[of->pair];
    switch (of->joining) {
    case JOIN_NOTHING_END_TO_END:
        text_add(out, "end to end");
        break;
    case JOIN_CROSS:
        text_addf(out, "crossed %s", pair);
        break;
    case JOIN_LINK_OUT:
    case JOIN_LINK_IN:
        text_addf(out, "%s linked at the %s ends", pair, leg_word(of->joining == JOIN_LINK_IN));
        break;
    case JOIN_LEAD_OUT:
    case JOIN_LEAD_IN:
        text_addf(out, "wander lead from the %s %s end", leg_word(of->joining == JOIN_LEAD_IN),
                  conductor_words[of->conductor]);
        break;
    case JOIN_NOTHING_APART:
        text_addf(out, "%s with all ends apart", pair);
        break;
    case N_JOININGS:
        break;
    }
}

void say_spot(const struct rf_job *job, enum spot spot, size_t place, struct text *out)
{
    static const char *const words[N_SPOTS] = {
        [SPOT_BOARD] = "board",       [SPOT_HIGHEST] = "highest of all points",
        [SPOT_OUT] = "outgoing ends", [SPOT_IN] = "incoming ends",
        [SPOT_L] = "line (r1)",       [SPOT_N] = "neutral (rn)",
        [SPOT_E] = "CPC (r2)",
    };
    if (spot == SPOT_POINT)
        say_place(job, place, out);
    else
        text_add(out, words[spot]);
}

void say_ohms(double ohms, struct text *out)
{
    if (isnan(ohms))
        text_add(out, "over range");
    else
        text_addf(out, "%.*f", ohms < 99.995 ? 2 : 0, ohms);
}

void say_ohms_unit(double ohms, struct text *out)
{
    say_ohms(ohms, out);
    if (!isnan(ohms))
        text_add(out, NO_BREAK "Ω");
}

void say_minutes(double minutes, struct text *out)
{
    double whole = fmax(1, round(minutes));
    text_addf(out, "%.0f" NO_BREAK "minute%s", whole, whole == 1 ? "" : "s");
}

void say_chance(double chance, struct text *out)
{
    if (chance < 0.005)
        text_add(out, "<1" NO_BREAK "%");
    else if (chance > 0.995)
        text_add(out, ">99" NO_BREAK "%");
    else
        text_addf(out, "%.0f" NO_BREAK "%%", 100 * chance);
}

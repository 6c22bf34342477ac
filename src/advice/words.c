/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "advice/words.h"

#include "faults/places.h"

void say_look(const struct rf_job *job, const struct look *look, struct text *out)
{
    switch (look->where) {
    case LOOK_AT_BOARD:
        text_add(out, "look in the board");
        break;
    case LOOK_IN_RUN:
        text_add(out, "look along the cable ");
        say_place(job, run_near_end(job, look->index), out);
        text_add(out, " to ");
        say_place(job, run_far_end(look->index), out);
        break;
    case LOOK_AT_PLACE:
        if (look->kind == LOOK_CHECK) {
            text_add(out, "see to the face of ");
            say_place(job, look->index, out);
            text_add(out, ": switched on, probes home, nothing plugged in");
        } else if (job->places[look->index].kind == KIND_JUNCTION_BOX) {
            text_add(out, "take the lid off the junction box ");
            say_place(job, look->index, out);
        } else {
            text_add(out, "take ");
            say_place(job, look->index, out);
            text_add(out, " off");
        }
        break;
    }
}

void say_connection(size_t setup, struct text *out)
{
    const struct setup *s = &setups[setup];
    const char *first = conductor_words[pair_members[s->pair].first];
    const char *second = conductor_words[pair_members[s->pair].second];
    switch (s->joining) {
    case JOIN_CROSS:
        text_addf(out, "join outgoing %s to incoming %s, and outgoing %s to incoming %s", first,
                  second, second, first);
        break;
    case JOIN_LINK_OUT:
    case JOIN_LINK_IN: {
        bool in = s->joining == JOIN_LINK_IN;
        text_addf(out, "join %s %s to %s %s, leave the %s ends free", leg_word(in), first,
                  leg_word(in), second, leg_word(!in));
        break;
    }
    case JOIN_LEAD_OUT:
    case JOIN_LEAD_IN:
        text_addf(out,
                  "leave all ends free and apart, and put a nulled wander lead on the %s %s end",
                  leg_word(s->joining == JOIN_LEAD_IN), conductor_words[s->conductor]);
        break;
    case JOIN_NOTHING_END_TO_END:
    case JOIN_NOTHING_APART:
    case N_JOININGS:
        text_add(out, "leave all ends free and apart");
        break;
    }
}

void say_meter(size_t setup, struct text *out)
{
    const struct setup *s = &setups[setup];
    if (s->joining == JOIN_NOTHING_END_TO_END)
        text_add(out, "read end to end");
    else if (setup_is_pair(s))
        text_addf(out, "read %s to %s", conductor_words[pair_members[s->pair].first],
                  conductor_words[pair_members[s->pair].second]);
    else
        text_addf(out, "read from the lead to %s", conductor_words[s->conductor]);
}

void say_where(const struct rf_job *job, const struct measurement *read, struct text *out)
{
    switch (read->spot) {
    case SPOT_POINT:
        text_add(out, "at ");
        say_place(job, read->place, out);
        break;
    case SPOT_BOARD:
    case SPOT_OUT:
        text_add(out, "at the outgoing ends");
        break;
    case SPOT_IN:
        text_add(out, "at the incoming ends");
        break;
    case SPOT_L:
    case SPOT_N:
    case SPOT_E:
        text_addf(out, "on the %s", conductor_words[read->spot - SPOT_L]);
        break;
    case SPOT_HIGHEST:
    case N_SPOTS:
        break;
    }
}

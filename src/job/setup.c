/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "job/setup.h"

#include <string.h>

const struct pair_members pair_members[N_PAIRS] = {
    [PAIR_LN] = {LINE, NEUTRAL},
    [PAIR_LE] = {LINE, CPC},
    [PAIR_NE] = {NEUTRAL, CPC},
};

const char *const pair_names[N_PAIRS] = {"ln", "le", "ne"};
const char *const pair_words[N_PAIRS] = {"line-neutral", "line-CPC", "neutral-CPC"};
const char *const conductor_names[N_CONDUCTORS] = {"L", "N", "E"};
const char *const conductor_words[N_CONDUCTORS] = {"line", "neutral", "CPC"};

const char *const spot_keys[N_SPOTS] = {
    [SPOT_BOARD] = "board", [SPOT_HIGHEST] = "highest", [SPOT_OUT] = "out", [SPOT_IN] = "in",
    [SPOT_L] = "l",         [SPOT_N] = "n",             [SPOT_E] = "e",
};

#define BIT(spot) (1u << (spot))
#define CROSS(suffix, of)                                                                          \
    {.name = "cross_" suffix, .joining = JOIN_CROSS, .pair = of,                                   \
     .spots = BIT(SPOT_POINT) | BIT(SPOT_BOARD) | BIT(SPOT_HIGHEST)}
#define LINK_OUT(suffix, of)                                                                       \
    {.name = "link_out_" suffix, .joining = JOIN_LINK_OUT, .pair = of,                             \
     .spots = BIT(SPOT_POINT) | BIT(SPOT_IN)}
#define LINK_IN(suffix, of)                                                                        \
    {.name = "link_in_" suffix, .joining = JOIN_LINK_IN, .pair = of,                               \
     .spots = BIT(SPOT_POINT) | BIT(SPOT_OUT)}
#define LEAD(end, suffix, join, of)                                                                \
    {.name = "lead_" end "_" suffix, .joining = join, .conductor = of, .spots = BIT(SPOT_POINT)}
#define APART(suffix, of)                                                                          \
    {.name = "apart_" suffix, .joining = JOIN_NOTHING_APART, .pair = of,                           \
     .spots = BIT(SPOT_OUT) | BIT(SPOT_IN)}

const struct setup setups[N_SETUPS] = {
    {.name = "end_to_end",
     .joining = JOIN_NOTHING_END_TO_END,
     .spots = BIT(SPOT_L) | BIT(SPOT_N) | BIT(SPOT_E)},
    CROSS("ln", PAIR_LN),
    CROSS("le", PAIR_LE),
    CROSS("ne", PAIR_NE),
    LINK_OUT("ln", PAIR_LN),
    LINK_OUT("le", PAIR_LE),
    LINK_OUT("ne", PAIR_NE),
    LINK_IN("ln", PAIR_LN),
    LINK_IN("le", PAIR_LE),
    LINK_IN("ne", PAIR_NE),
    LEAD("out", "l", JOIN_LEAD_OUT, LINE),
    LEAD("out", "n", JOIN_LEAD_OUT, NEUTRAL),
    LEAD("out", "e", JOIN_LEAD_OUT, CPC),
    LEAD("in", "l", JOIN_LEAD_IN, LINE),
    LEAD("in", "n", JOIN_LEAD_IN, NEUTRAL),
    LEAD("in", "e", JOIN_LEAD_IN, CPC),
    APART("ln", PAIR_LN),
    APART("le", PAIR_LE),
    APART("ne", PAIR_NE),
};

size_t setup_find(const char *name)
{
    for (size_t i = 0; i < N_SETUPS; i++)
        if (strcmp(setups[i].name, name) == 0)
            return i;
    return N_SETUPS;
}

bool setup_is_pair(const struct setup *setup)
{
    return setup->joining != JOIN_LEAD_OUT && setup->joining != JOIN_LEAD_IN;
}

bool setup_has_links(const struct setup *setup)
{
    return setup->joining == JOIN_CROSS || setup->joining == JOIN_LINK_OUT ||
           setup->joining == JOIN_LINK_IN;
}

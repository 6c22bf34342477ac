/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef JOB_SETUP_H
#define JOB_SETUP_H

#include <stdbool.h>
#include <stddef.h>

/* Conductors and their pairs. The values index arrays everywhere. */
enum conductor { LINE, NEUTRAL, CPC, N_CONDUCTORS };
enum pair { PAIR_LN, PAIR_LE, PAIR_NE, N_PAIRS };

struct pair_members {
    enum conductor first, second;
};

/* The pair's conductors, first and second as the set-up's name has them. */
extern const struct pair_members pair_members[N_PAIRS];

extern const char *const pair_names[N_PAIRS];           /* "ln" … as files have them */
extern const char *const pair_words[N_PAIRS];           /* "line-neutral" … as reports say */
extern const char *const conductor_names[N_CONDUCTORS]; /* "L" … as files have them */
extern const char *const conductor_words[N_CONDUCTORS]; /* "line", "neutral", "CPC" */

/* How the ends are joined at the board. */
enum joining {
    JOIN_NOTHING_END_TO_END,
    JOIN_CROSS,    /* first's out with second's in; second's out with first's in */
    JOIN_LINK_OUT, /* the pair at out */
    JOIN_LINK_IN,  /* the pair at in */
    JOIN_LEAD_OUT, /* nothing; a nulled wander lead from that conductor's out end */
    JOIN_LEAD_IN,
    JOIN_NOTHING_APART,
    N_JOININGS
};

/* Where the meter is put. */
enum spot {
    SPOT_POINT,   /* a point's front; `place` says which */
    SPOT_BOARD,   /* crossed: the pair's out ends */
    SPOT_HIGHEST, /* the highest at any point, its place not noted */
    SPOT_OUT,     /* the pair's out ends */
    SPOT_IN,      /* the pair's in ends */
    SPOT_L,       /* end to end: that conductor, out to in */
    SPOT_N,
    SPOT_E,
    N_SPOTS
};

/* The key of a spot in a job file, "board", "highest", "out", "in", "l", "n", "e"; NULL for a
 * point, whose key is its id. */
extern const char *const spot_keys[N_SPOTS];

/* One row a set-up; the one list of them. To add one, see DEVELOPERS.md. */
struct setup {
    const char *name; /* as in files: "cross_ln" */
    enum joining joining;
    enum pair pair;           /* of the pair; unused for end_to_end and leads */
    enum conductor conductor; /* of a wander lead */
    unsigned spots;           /* bit 1u << SPOT_…: what may be read */
};

enum { N_SETUPS = 1 + 3 * 6 };
extern const struct setup setups[N_SETUPS];

/* Index of the set-up of that name, or N_SETUPS. */
size_t setup_find(const char *name);

/* Whether the set-up's readings at points are of a pair (not of one conductor's wander lead). */
bool setup_is_pair(const struct setup *setup);
/* Whether the set-up joins ends of a pair, so that a link can be bad or left out. */
bool setup_has_links(const struct setup *setup);

#endif

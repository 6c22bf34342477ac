/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef REPORT_SCENE_H
#define REPORT_SCENE_H

/*
 * What is drawn, in plain numbers: lines, discs, boxes and labels, each with the role it plays, in
 * the order they are laid over one another. How it is drawn is another's affair (scene_svg.h): no
 * colour, pattern or markup is known here, so that another output can be added.
 *
 * Units are px of a screen on which the scene is as wide as it says; y grows downwards.
 */

#include "base/text.h"

/* role, its name for whoever draws it */
#define SCENE_ROLES(X)                                                                             \
    X(ROLE_RING, "ring")           /* cable, one line for all conductors */                        \
    X(ROLE_BED, "bed")             /* what wipes out the line under parted conductors */           \
    X(ROLE_LINE, "line")           /* a conductor by itself */                                     \
    X(ROLE_NEUTRAL, "neutral")                                                                     \
    X(ROLE_CPC, "cpc")                                                                             \
    X(ROLE_CPC_STRIPE, "cpc-stripe")                                                               \
    X(ROLE_CUT, "cut")             /* a gap where a conductor is broken */                         \
    X(ROLE_RESISTOR, "resistor")   /* a box where it is not as good as it was */                   \
    X(ROLE_FINDING_1, "finding-1") /* where a finding lies: a band along the ring, each in its */  \
    X(ROLE_FINDING_2, "finding-2") /* own pattern */                                               \
    X(ROLE_FINDING_3, "finding-3")                                                                 \
    X(ROLE_BRIDGE, "bridge")       /* what joins two places that should not be */                  \
    X(ROLE_LEADER, "leader")       /* from a place to its label */                                 \
    X(ROLE_POINT, "point")                                                                         \
    X(ROLE_SEEN, "seen")           /* a point looked at already */                                 \
    X(ROLE_SEEN_MARK, "seen-mark")                                                                 \
    X(ROLE_CHANCE, "chance")       /* a disc as large as the chance */                             \
    X(ROLE_BOARD, "board")                                                                         \
    X(ROLE_NAME, "name")           /* of a place */                                                \
    X(ROLE_NOTE, "note")           /* what else is said of it */                                   \
    X(ROLE_NUMBER, "number")       /* a chance */                                                  \
    X(ROLE_LETTER, "letter")       /* of a finding */                                              \
    X(ROLE_AXIS, "axis")                                                                           \
    X(ROLE_GRID, "grid")                                                                           \
    X(ROLE_TICK, "tick")                                                                           \
    X(ROLE_SOUND_BAND, "sound-band")                                                               \
    X(ROLE_SOUND, "sound")                                                                         \
    X(ROLE_FIT_BAND, "fit-band")                                                                   \
    X(ROLE_FIT, "fit")                                                                             \
    X(ROLE_READ, "read")                                                                           \
    X(ROLE_SUSPECT, "suspect")                                                                     \
    X(ROLE_METER, "meter")                                                                         \
    X(ROLE_LEAD, "lead")           /* of the meter */                                              \
    X(ROLE_LINK, "link")           /* at the board */                                              \
    X(ROLE_TERMINAL, "terminal")

enum scene_role {
#define SCENE_ROLE(role, name) role,
    SCENE_ROLES(SCENE_ROLE)
#undef SCENE_ROLE
    N_SCENE_ROLES
};
extern const char *const scene_role_names[N_SCENE_ROLES];

enum scene_kind {
    SCENE_LINE,  /* through `n` corners from `first` */
    SCENE_AREA,  /* the same, closed */
    SCENE_DISC,  /* around x, y, of radius w */
    SCENE_BOX,   /* from x, y, of size w, h */
    SCENE_LABEL, /* baseline at y; x is the start, middle or end as `anchor` says */
};
enum scene_anchor { ANCHOR_START, ANCHOR_MIDDLE, ANCHOR_END };

struct scene_corner {
    double x, y;
};
struct scene_item {
    enum scene_kind kind;
    enum scene_role role;
    double x, y, w, h;
    size_t first, n;
    enum scene_anchor anchor;
    double size; /* of a label's letters */
    char *words; /* of a label */
    char *title; /* what it is, in full; NULL: nothing to say */
};

/* Zeroed is empty and valid; `failed` once memory was short. */
struct scene {
    double width, height;
    char *title, *description; /* of the whole, for who cannot see it */
    size_t n, capacity;
    struct scene_item *items;
    size_t n_corners, corners_capacity;
    struct scene_corner *corners;
    bool failed;
};
void scene_finish(struct scene *scene);

/* Takes the words over. */
void scene_entitle(struct scene *scene, struct text *title, struct text *description);

/* Begins a line; corners follow. */
void scene_line(struct scene *scene, enum scene_role role);
void scene_area(struct scene *scene, enum scene_role role);
void scene_corner(struct scene *scene, double x, double y);
void scene_segment(struct scene *scene, enum scene_role role, double x1, double y1, double x2,
                   double y2);
void scene_disc(struct scene *scene, enum scene_role role, double x, double y, double radius);
void scene_box(struct scene *scene, enum scene_role role, double x, double y, double w, double h);
/* Words of at most `room` px: cut with an ellipsis where they are wider; nothing where not even
 * that fits. Answers the width they take. */
double scene_label(struct scene *scene, enum scene_role role, double x, double y,
                   enum scene_anchor anchor, double size, double room, const char *words);
/* What the item added last is, in full. Takes the words over. */
void scene_title(struct scene *scene, struct text *title);

/* An upper estimate of the width of words set in letters of `size`, whatever the typeface. */
double words_width(const char *words, double size);

#endif

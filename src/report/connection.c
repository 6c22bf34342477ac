/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/connection.h"

#include "faults/places.h"
#include "report/words.h"

#include <math.h>

enum { WIDTH = 340, HEIGHT = 262, OUT_X = 96, IN_X = 244, MIDDLE = 170 };
enum { POINT_Y = 158, POINT_H = 28, METER_Y = 228, METER_R = 15 };

static double terminal_y(enum conductor conductor)
{
    return 50 + 30.0 * (double)conductor;
}

static const enum scene_role conductor_roles[N_CONDUCTORS] = {ROLE_LINE, ROLE_NEUTRAL, ROLE_CPC};

/* --- ends and links --- */

static void draw_ends(struct scene *scene)
{
    static const char *const letters[N_CONDUCTORS] = {"L", "N", "E"};
    scene_label(scene, ROLE_NOTE, OUT_X, 26, ANCHOR_MIDDLE, 12, 90, "outgoing");
    scene_label(scene, ROLE_NOTE, IN_X, 26, ANCHOR_MIDDLE, 12, 90, "incoming");
    for (int c = 0; c < N_CONDUCTORS; c++)
        for (int in = 0; in < 2; in++) {
            double x = in == 1 ? IN_X : OUT_X, y = terminal_y((enum conductor)c);
            scene_disc(scene, ROLE_TERMINAL, x, y, 11);
            scene_label(scene, ROLE_NAME, x, y + 4.5, ANCHOR_MIDDLE, 12, 20, letters[c]);
        }
}

static void draw_links(struct scene *scene, const struct setup *setup)
{
    double first = terminal_y(pair_members[setup->pair].first);
    double second = terminal_y(pair_members[setup->pair].second);
    if (setup->joining == JOIN_CROSS) {
        scene_segment(scene, ROLE_LINK, OUT_X + 11, first, IN_X - 11, second);
        scene_segment(scene, ROLE_LINK, OUT_X + 11, second, IN_X - 11, first);
    } else if (setup->joining == JOIN_LINK_OUT || setup->joining == JOIN_LINK_IN) {
        bool in = setup->joining == JOIN_LINK_IN;
        double x = in ? IN_X + 11 : OUT_X - 11, bow = in ? 16 : -16;
        scene_line(scene, ROLE_LINK);
        scene_corner(scene, x, first);
        scene_corner(scene, x + bow, first);
        scene_corner(scene, x + bow, second);
        scene_corner(scene, x, second);
    }
}

/* --- the ring and the point --- */

static void draw_ring(struct scene *scene, const struct rf_job *job,
                      const struct measurement *read)
{
    double y = POINT_Y + POINT_H / 2.0;
    for (int c = 0; c < N_CONDUCTORS; c++) {
        double aside = 4 * (c - 1);
        scene_line(scene, conductor_roles[c]);
        scene_corner(scene, OUT_X + aside, terminal_y(CPC) + 13);
        scene_corner(scene, OUT_X + aside, y - aside);
        scene_corner(scene, IN_X - aside, y - aside);
        scene_corner(scene, IN_X - aside, terminal_y(CPC) + 13);
    }
    if (read->spot != SPOT_POINT)
        return;
    const struct place *place = &job->places[read->place];
    scene_box(scene, ROLE_BOARD, MIDDLE - 50, POINT_Y, 100, POINT_H);
    struct text title = {0};
    say_place(job, read->place, &title);
    scene_title(scene, &title);
    scene_label(scene, ROLE_NAME, MIDDLE, POINT_Y + 18.5, ANCHOR_MIDDLE, 13, 94, place->id);
}

/* --- the meter --- */

static void draw_meter(struct scene *scene, double x, double y)
{
    scene_disc(scene, ROLE_METER, x, y, METER_R);
    scene_label(scene, ROLE_NAME, x, y + 5, ANCHOR_MIDDLE, 14, 2 * METER_R, "Ω");
}

static void meter_across_ends(struct scene *scene, bool in, enum pair pair)
{
    double x = in ? IN_X + 70 : OUT_X - 70, end = in ? IN_X + 11 : OUT_X - 11;
    double first = terminal_y(pair_members[pair].first);
    double second = terminal_y(pair_members[pair].second);
    double y = (first + second) / 2;
    scene_line(scene, ROLE_LEAD);
    scene_corner(scene, end, first);
    scene_corner(scene, x, first);
    scene_corner(scene, x, second);
    scene_corner(scene, end, second);
    draw_meter(scene, x, y);
}

static void meter_end_to_end(struct scene *scene, enum conductor conductor)
{
    double y = terminal_y(conductor);
    scene_segment(scene, ROLE_LEAD, OUT_X + 11, y, IN_X - 11, y);
    draw_meter(scene, MIDDLE, y);
}

static void lead_letter(struct scene *scene, double x, enum conductor conductor, bool left)
{
    scene_label(scene, ROLE_NOTE, x + (left ? -4 : 4), POINT_Y + POINT_H + 15,
                left ? ANCHOR_END : ANCHOR_START, 12, 20, conductor_names[conductor]);
}

static void meter_at_point(struct scene *scene, const struct setup *setup)
{
    double from = POINT_Y + POINT_H;
    bool pair = setup->joining != JOIN_LEAD_OUT && setup->joining != JOIN_LEAD_IN;
    bool in = setup->joining == JOIN_LEAD_IN;
    enum conductor first = pair ? pair_members[setup->pair].first : setup->conductor;
    double near = pair || !in ? 22 : -22;
    scene_segment(scene, ROLE_LEAD, MIDDLE + near, from, MIDDLE + near * 0.5, METER_Y - 8);
    if (pair) {
        scene_segment(scene, ROLE_LEAD, MIDDLE - near, from, MIDDLE - near * 0.5, METER_Y - 8);
        lead_letter(scene, MIDDLE - near, first, true);
        lead_letter(scene, MIDDLE + near, pair_members[setup->pair].second, false);
    } else {
        double far = in ? WIDTH - 24 : 24, end = in ? IN_X + 11 : OUT_X - 11;
        lead_letter(scene, MIDDLE + near, first, in);
        scene_line(scene, ROLE_LEAD);
        scene_corner(scene, MIDDLE, METER_Y);
        scene_corner(scene, far, METER_Y);
        scene_corner(scene, far, terminal_y(first));
        scene_corner(scene, end, terminal_y(first));
        scene_label(scene, ROLE_NOTE, in ? MIDDLE + 24 : MIDDLE - 24, METER_Y + 17,
                    in ? ANCHOR_START : ANCHOR_END, 12, 120, "wander lead");
    }
    draw_meter(scene, MIDDLE, METER_Y);
}

static void place_meter(struct scene *scene, const struct measurement *read)
{
    const struct setup *setup = &setups[read->setup];
    switch (read->spot) {
    case SPOT_POINT:
    case SPOT_HIGHEST:
        meter_at_point(scene, setup);
        break;
    case SPOT_BOARD:
    case SPOT_OUT:
        meter_across_ends(scene, false, setup->pair);
        break;
    case SPOT_IN:
        meter_across_ends(scene, true, setup->pair);
        break;
    case SPOT_L:
    case SPOT_N:
    case SPOT_E:
        meter_end_to_end(scene, (enum conductor)(read->spot - SPOT_L));
        break;
    case N_SPOTS:
        break;
    }
}

void connection_drawing(const struct rf_job *job, const struct measurement *read,
                        struct scene *scene)
{
    struct text title = {0}, about = {0};
    text_add(&title, "How to connect: ");
    say_set_up(read->setup, &title);
    say_connection(read->setup, &about);
    text_add(&about, "; ");
    say_meter(read->setup, &about);
    text_add(&about, " ");
    say_where(job, read, &about);
    text_add(&about, ".");
    scene_entitle(scene, &title, &about);
    bool at_point = read->spot == SPOT_POINT || read->spot == SPOT_HIGHEST;
    scene->width = WIDTH;
    scene->height = at_point ? HEIGHT : POINT_Y + POINT_H / 2.0 + 16;
    draw_ring(scene, job, read);
    draw_links(scene, &setups[read->setup]);
    place_meter(scene, read);
    draw_ends(scene);
}

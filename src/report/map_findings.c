/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/map_findings.h"

#include "base/memory.h"
#include "report/said.h"
#include "report/words.h"

#include <math.h>
#include <stdio.h>

static const double finding_drawn = 0.05; /* confidence */
/* Of a finding's confidence: members below are not drawn. */
static const double member_drawn = 0.02;

/* --- which findings --- */

char finding_letter(const struct rf_diagnosis *diagnosis, size_t finding)
{
    char letter = 'A';
    for (size_t i = 0; i < diagnosis->n_findings && letter < 'A' + FINDINGS_DRAWN; i++) {
        if (diagnosis->findings[i].is_none || diagnosis->findings[i].confidence < finding_drawn)
            continue;
        if (i == finding)
            return letter;
        letter++;
    }
    return 0;
}

/* One fault of a member of a finding that is drawn. */
struct drawn {
    size_t finding; /* counted among those drawn */
    bool best;      /* of the finding's likeliest member */
    const struct fault *fault;
    bool has_value; /* it has a parameter: not simply missing */
};
typedef void drawn_callback(struct map *map, const struct drawn *drawn);

static void each_drawn(struct map *map, drawn_callback *callback)
{
    const struct rf_diagnosis *diagnosis = map->diagnosis;
    for (size_t i = 0; i < diagnosis->n_findings; i++) {
        const struct finding *finding = &diagnosis->findings[i];
        char letter = finding_letter(diagnosis, i);
        for (size_t j = 0; letter != 0 && j < finding->n_members; j++) {
            const struct ranked *ranked = &diagnosis->ranked[finding->members[j]];
            if (j > 0 && ranked->confidence < member_drawn * finding->confidence)
                continue;
            for (size_t k = 0; k < ranked->hypothesis.n_faults; k++) {
                const struct drawn drawn = {
                    .finding = (size_t)(letter - 'A'),
                    .best = j == 0,
                    .fault = &ranked->hypothesis.faults[k],
                    .has_value = ranked->estimates[k].known,
                };
                callback(map, &drawn);
            }
        }
    }
}

static bool has(const struct fault *fault, unsigned fields)
{
    return (fault->family->fields & fields) != 0;
}

static bool in_run(const struct fault *fault)
{
    return has(fault, FIELD_RUN | FIELD_RING_RUN);
}

static bool at_place(const struct fault *fault)
{
    return has(fault, FIELD_AT | FIELD_AT_ANY);
}

static bool between(const struct fault *fault)
{
    return has(fault, FIELD_BETWEEN_RING | FIELD_BETWEEN_POINTS);
}

/* --- lines --- */

void line_along(struct map *map, enum scene_role role, double from, double to, double aside)
{
    const double step = 4;
    scene_line(map->scene, role);
    for (double at = from; at < to; at += step) {
        struct position corner = along_ring(map->layout, at, aside);
        scene_corner(map->scene, corner.x, corner.y);
        /* the rails are straight: on to their end */
        if (at + step < map->layout->rail)
            at = fmax(at, fmin(to, map->layout->rail) - 2 * step);
        else if (at > map->layout->length - map->layout->rail)
            at = to;
    }
    struct position end = along_ring(map->layout, to, aside);
    scene_corner(map->scene, end.x, end.y);
}

/* A line along a run, `aside` px off it. */
static void line_along_run(struct map *map, enum scene_role role, size_t run, double aside)
{
    const struct ring_layout *layout = map->layout;
    const struct rf_job *job = map->diagnosis->job;
    if (run_on_ring(job, run)) {
        line_along(map, role, layout->along[run], layout->along[run + 1], aside);
        return;
    }
    struct position from = layout->mark[run_near_end(job, run)];
    struct position to = layout->mark[run_far_end(run)];
    double length = fmax(hypot(to.x - from.x, to.y - from.y), 1);
    double x = -aside * (to.y - from.y) / length, y = aside * (to.x - from.x) / length;
    scene_segment(map->scene, role, from.x + x, from.y + y, to.x + x, to.y + y);
}

/* --- conductors apart --- */

static void mark_parted(struct map *map, const struct drawn *drawn)
{
    if (in_run(drawn->fault))
        map->parted[drawn->fault->run] = true;
}

void part_conductors(struct map *map)
{
    each_drawn(map, mark_parted);
}

static const double apart[N_CONDUCTORS] = {6, 0, -6};

static void draw_parted(struct map *map)
{
    static const enum scene_role roles[N_CONDUCTORS] = {ROLE_LINE, ROLE_NEUTRAL, ROLE_CPC};
    for (size_t run = 0; run < n_runs(map->diagnosis->job); run++)
        for (int i = 0; map->parted[run] && i < N_CONDUCTORS; i++) {
            line_along_run(map, roles[i], run, apart[i]);
            if (i == CPC)
                line_along_run(map, ROLE_CPC_STRIPE, run, apart[i]);
        }
}

/* The conductors a fault is about, bit 1 << conductor. */
static unsigned conductors_of(const struct fault *fault)
{
    if (has(fault, FIELD_PAIR))
        return 1u << pair_members[fault->pair].first | 1u << pair_members[fault->pair].second;
    if (!has(fault, FIELD_CONDUCTOR | FIELD_ANY_CONDUCTOR))
        return 0;
    return fault->conductor == WHOLE_CABLE ? 7u : 1u << fault->conductor;
}

static struct position middle_of_conductor(const struct map *map, size_t run, double aside)
{
    const struct ring_layout *layout = map->layout;
    const struct rf_job *job = map->diagnosis->job;
    if (run_on_ring(job, run))
        return along_ring(layout, (layout->along[run] + layout->along[run + 1]) / 2, aside);
    struct position from = layout->mark[run_near_end(job, run)];
    struct position to = layout->mark[run_far_end(run)];
    double length = fmax(hypot(to.x - from.x, to.y - from.y), 1);
    return (struct position){(from.x + to.x) / 2 - aside * (to.y - from.y) / length,
                             (from.y + to.y) / 2 + aside * (to.x - from.x) / length};
}

struct position middle_of_run(const struct map *map, size_t run)
{
    return middle_of_conductor(map, run, 0);
}

/* What happens to a conductor in a run: a box where it has too much resistance, a gap where it is
 * broken. */
static void draw_defect(struct map *map, const struct drawn *drawn)
{
    unsigned conductors = conductors_of(drawn->fault);
    if (!in_run(drawn->fault) || has(drawn->fault, FIELD_PAIR))
        return;
    for (int i = 0; i < N_CONDUCTORS; i++) {
        struct position at = middle_of_conductor(map, drawn->fault->run, apart[i]);
        if ((conductors & 1u << i) == 0)
            continue;
        if (drawn->has_value)
            scene_box(map->scene, ROLE_RESISTOR, at.x - 3, at.y - 4.5, 6, 9);
        else
            scene_disc(map->scene, ROLE_CUT, at.x, at.y, 3.6);
    }
}

/* --- bands and bridges --- */

static enum scene_role band_role(size_t finding)
{
    static const enum scene_role roles[FINDINGS_DRAWN] = {ROLE_FINDING_1, ROLE_FINDING_2,
                                                          ROLE_FINDING_3};
    return roles[finding];
}

static double band_aside(size_t finding)
{
    return -13 - 5 * (double)finding;
}

static void band_at_place(struct map *map, enum scene_role role, size_t place, double aside)
{
    const struct ring_layout *layout = map->layout;
    if (place_on_ring(map->diagnosis->job, place)) {
        line_along(map, role, fmax(layout->along[place] - 7, 0),
                   fmin(layout->along[place] + 7, layout->length), aside);
        return;
    }
    struct position at = layout->mark[place];
    scene_segment(map->scene, role, at.x - 7, at.y - aside, at.x + 7, at.y - aside);
}

static void draw_bridge(struct map *map, const struct fault *fault)
{
    struct position one = map->layout->mark[fault->place], other = map->layout->mark[fault->other];
    scene_line(map->scene, ROLE_BRIDGE);
    scene_corner(map->scene, one.x, one.y);
    if ((one.x - map->layout->middle) * (other.x - map->layout->middle) > 0) {
        double inwards = one.x < map->layout->middle ? 30 : -30;
        scene_corner(map->scene, one.x + inwards, one.y);
        scene_corner(map->scene, one.x + inwards, other.y);
    }
    scene_corner(map->scene, other.x, other.y);
}

static void draw_band(struct map *map, const struct drawn *drawn)
{
    const struct fault *fault = drawn->fault;
    enum scene_role role = band_role(drawn->finding);
    double aside = band_aside(drawn->finding);
    if (in_run(fault))
        line_along_run(map, role, fault->run, aside);
    if (at_place(fault))
        band_at_place(map, role, fault->place, aside);
    for (size_t i = 0; i < fault->chain_length; i++)
        band_at_place(map, role, fault->chain[i], aside);
    if (between(fault) && drawn->best) {
        draw_bridge(map, fault);
    } else if (between(fault)) {
        band_at_place(map, role, fault->place, aside);
        band_at_place(map, role, fault->other, aside);
    }
}

void draw_findings(struct map *map)
{
    each_drawn(map, draw_band);
    draw_parted(map);
    each_drawn(map, draw_defect);
}

/* --- letters and numbers inside the ring --- */

struct chip {
    double x, y;
    enum scene_role role;
    bool left;
    char words[16];
};
enum { CHIPS_MOST = 64 };
static const double chip_aside = 26;
struct chips {
    size_t n;
    struct chip list[CHIPS_MOST];
};

static void add_chip(struct chips *chips, const struct map *map, struct position at,
                     enum scene_role role, const char *words)
{
    if (chips->n == CHIPS_MOST)
        return;
    struct chip *chip = &chips->list[chips->n++];
    bool left = at.x <= map->layout->middle;
    double inwards = chip_aside;
    double x = left ? fmax(at.x, map->layout->left) + inwards
                    : fmin(at.x, map->layout->right) - inwards;
    double low = map->layout->top + map->layout->rail;
    *chip = (struct chip){.x = x, .y = at.y, .role = role, .left = left};
    if (at.y > low) /* in the bend the inside is above */
        chip->y = fmax(low, at.y - inwards);
    snprintf(chip->words, sizeof chip->words, "%s", words);
}

static struct position spot_of(const struct map *map, const struct fault *fault)
{
    if (in_run(fault))
        return middle_of_run(map, fault->run);
    return map->layout->mark[fault->chain_length > 0 ? fault->chain[0] : fault->place];
}

/* "A", and the conductors it is about: "A N", "A L-N". */
static void letter_chips(const struct map *map, struct chips *chips)
{
    const struct rf_diagnosis *diagnosis = map->diagnosis;
    for (size_t i = 0; i < diagnosis->n_findings; i++) {
        char letter = finding_letter(diagnosis, i);
        const struct ranked *best = &diagnosis->ranked[diagnosis->findings[i].members[0]];
        for (size_t k = 0; letter != 0 && k < best->hypothesis.n_faults; k++) {
            const struct fault *fault = &best->hypothesis.faults[k];
            if (!in_run(fault) && !at_place(fault) && !between(fault) && fault->chain_length == 0)
                continue;
            char words[] = "A        ";
            size_t n = 2;
            words[0] = letter;
            unsigned conductors = conductors_of(fault);
            for (int c = 0; c < N_CONDUCTORS; c++)
                if ((conductors & 1u << c) != 0)
                    words[n++] = conductor_names[c][0];
            words[n > 2 ? n : 1] = '\0';
            add_chip(chips, map, spot_of(map, fault), ROLE_LETTER, words);
        }
    }
}

static void number_chips(const struct map *map, struct chips *chips)
{
    for (size_t run = 0; run < n_runs(map->diagnosis->job); run++) {
        double chance = chance_in_run(map->diagnosis, run);
        struct text words = {0};
        if (chance < place_said)
            continue;
        say_chance(chance, &words);
        if (words.failed)
            map->scene->failed = true;
        else
            add_chip(chips, map, middle_of_run(map, run), ROLE_NUMBER, words.bytes);
        text_finish(&words);
    }
}

static int by_height(const void *one, const void *other)
{
    double a = ((const struct chip *)one)->y, b = ((const struct chip *)other)->y;
    return (a > b) - (a < b);
}

void draw_inside(struct map *map)
{
    struct chips chips = {0};
    double y[CHIPS_MOST], scratch[2 * CHIPS_MOST];
    letter_chips(map, &chips);
    number_chips(map, &chips);
    qsort(chips.list, chips.n, sizeof chips.list[0], by_height);
    for (int left = 0; left < 2; left++) {
        size_t n = 0, next = 0;
        for (size_t i = 0; i < chips.n; i++)
            if (chips.list[i].left == (left == 1))
                y[n++] = chips.list[i].y;
        spread_apart(y, n, 16, map->layout->top + 10,
                     map->layout->top + map->layout->rail + map->layout->bend - 20, scratch);
        for (size_t i = 0; i < chips.n; i++) {
            const struct chip *chip = &chips.list[i];
            if (chip->left != (left == 1))
                continue;
            scene_label(map->scene, chip->role, chip->x, y[next++] + 4,
                        chip->left ? ANCHOR_START : ANCHOR_END, 12, 60, chip->words);
        }
    }
}

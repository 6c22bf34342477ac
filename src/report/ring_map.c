/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/ring_map.h"

#include "base/memory.h"
#include "faults/places.h"
#include "report/lengths.h"
#include "report/map_findings.h"
#include "report/said.h"
#include "report/words.h"

#include <math.h>
#include <string.h>

static const double name_size = 13, note_size = 11, edge = 4;

/* --- chances --- */

static double chance_of(const struct rf_diagnosis *diagnosis, int where, size_t index)
{
    double sum = 0;
    for (size_t i = 0; i < diagnosis->n_places; i++) {
        const struct look *look = &diagnosis->places[i].look;
        if ((int)look->where == where && look->index == index)
            sum += diagnosis->places[i].chance;
    }
    return fmin(sum, 1);
}

double chance_at_place(const struct rf_diagnosis *diagnosis, size_t place)
{
    return chance_of(diagnosis, LOOK_AT_PLACE, place);
}

double chance_in_run(const struct rf_diagnosis *diagnosis, size_t run)
{
    return chance_of(diagnosis, LOOK_IN_RUN, run);
}

double chance_at_board(const struct rf_diagnosis *diagnosis)
{
    return chance_of(diagnosis, LOOK_AT_BOARD, 0);
}

/* --- which place it is --- */

bool ring_map_numbers(const struct rf_job *job)
{
    return label_style(job) == LABEL_NUMBER;
}

size_t place_number(const struct rf_job *job, size_t place)
{
    return place <= job->n_ring ? place : place - 1;
}

static const char *state_words(const struct place *place)
{
    return place->opened ? "seen inside" : place->checked ? "face seen to" : NULL;
}

static void title_of_place(struct map *map, size_t place)
{
    const struct rf_job *job = map->diagnosis->job;
    double chance = chance_at_place(map->diagnosis, place);
    struct text title = {0};
    say_place(job, place, &title);
    text_addf(&title, ", %.1f m behind ", run_metres(map->diagnosis, place - 1));
    say_place(job, run_near_end(job, place - 1), &title);
    if (state_words(&job->places[place]) != NULL)
        text_addf(&title, "; %s, nothing wrong there", state_words(&job->places[place]));
    if (chance >= place_said) {
        text_add(&title, "; chance that it shows here: ");
        say_chance(chance, &title);
    }
    scene_title(map->scene, &title);
}

/* --- the cable --- */

static void draw_ring_runs(struct map *map)
{
    const struct ring_layout *layout = map->layout;
    for (size_t run = 0; run <= map->diagnosis->job->n_ring; run++)
        if (!map->parted[run])
            line_along(map, ROLE_RING, layout->along[run], layout->along[run + 1], 0);
}

static struct position run_start(const struct map *map, size_t run)
{
    return map->layout->mark[run_near_end(map->diagnosis->job, run)];
}

static void draw_spur_runs(struct map *map)
{
    const struct rf_job *job = map->diagnosis->job;
    for (size_t run = job->n_ring + 1; run < n_runs(job); run++) {
        struct position from = run_start(map, run), to = map->layout->mark[run_far_end(run)];
        if (!map->parted[run])
            scene_segment(map->scene, ROLE_RING, from.x, from.y, to.x, to.y);
    }
}

/* --- how likely, by size --- */

static double disc_radius(double chance)
{
    return 6 + 9 * sqrt(chance);
}

static void draw_chances(struct map *map)
{
    const struct rf_job *job = map->diagnosis->job;
    for (size_t place = 1; place < job->n_places; place++) {
        double chance = chance_at_place(map->diagnosis, place);
        struct position at = map->layout->mark[place];
        if (!place_is_end(job, place) && chance >= place_said)
            scene_disc(map->scene, ROLE_CHANCE, at.x, at.y, disc_radius(chance));
    }
    for (size_t run = 0; run < n_runs(job); run++) {
        double chance = chance_in_run(map->diagnosis, run);
        struct position at = middle_of_run(map, run);
        if (chance >= place_said)
            scene_disc(map->scene, ROLE_CHANCE, at.x, at.y, disc_radius(chance));
    }
}

/* --- points --- */

static void draw_point(struct map *map, size_t place)
{
    const struct place *of = &map->diagnosis->job->places[place];
    struct position at = map->layout->mark[place];
    bool seen = of->opened || of->checked;
    double r = map->layout->style == LABEL_NUMBER ? 3.5 : 5;
    if (of->kind == KIND_JUNCTION_BOX)
        scene_box(map->scene, seen ? ROLE_SEEN : ROLE_POINT, at.x - r, at.y - r, 2 * r, 2 * r);
    else
        scene_disc(map->scene, seen ? ROLE_SEEN : ROLE_POINT, at.x, at.y, r);
    title_of_place(map, place);
    if (!seen)
        return;
    scene_line(map->scene, ROLE_SEEN_MARK);
    scene_corner(map->scene, at.x - 0.55 * r, at.y);
    scene_corner(map->scene, at.x - 0.1 * r, at.y + 0.5 * r);
    scene_corner(map->scene, at.x + 0.6 * r, at.y - 0.5 * r);
}

/* --- labels --- */

/* Where a place's words begin, away from the rail. */
static double label_x(const struct map *map, size_t place)
{
    size_t depth = spur_depth(map->diagnosis->job, place);
    double away = depth > 0 ? fabs(map->layout->mark[place].x - map->layout->middle) + 11
                            : map->layout->bend + 20;
    return map->layout->on_left[place] ? map->layout->middle - away : map->layout->middle + away;
}

static void draw_leader(struct map *map, size_t place, double x)
{
    struct position at = map->layout->mark[place];
    double gap = map->layout->on_left[place] ? 3 : -3;
    bool under = map->layout->style <= LABEL_TWO_LINES;
    if (spur_depth(map->diagnosis->job, place) == 0)
        scene_segment(map->scene, ROLE_LEADER, at.x, at.y, x + gap, map->layout->row[place] - 4 * under);
}

/* A line of a label: the number of a chance next to the ring, then the words. */
static void label_line(struct map *map, size_t place, double x, double y, enum scene_role role,
                       double size, double chance, const char *words)
{
    bool left = map->layout->on_left[place];
    enum scene_anchor anchor = left ? ANCHOR_END : ANCHOR_START;
    double room = left ? x - edge : map->layout->width - edge - x;
    if (chance >= place_said) {
        struct text number = {0};
        say_chance(chance, &number);
        double taken = scene_label(map->scene, ROLE_NUMBER, x, y, anchor, name_size, room,
                                   number.failed ? "" : number.bytes);
        map->scene->failed = map->scene->failed || number.failed;
        text_finish(&number);
        x += left ? -taken - 3 : taken + 3;
        room -= taken + 3;
    }
    if (scene_label(map->scene, role, x, y, anchor, size, room, words) > 0)
        title_of_place(map, place);
}

/* As many of the words as fill a line; what is left begins at the answer. */
static const char *fill_line(const char *words, double room, struct text *line)
{
    size_t kept = strlen(words);
    if (words_width(words, note_size) > room) {
        kept = 0;
        for (size_t i = 0; words[i] != '\0'; i++) {
            if (words[i] != ' ')
                continue;
            text_clear(line);
            text_append(line, words, i);
            if (line->failed || words_width(line->bytes, note_size) > room)
                break;
            kept = i;
        }
    }
    if (kept == 0)
        kept = strlen(words);
    text_clear(line);
    text_append(line, words, kept);
    return words[kept] == ' ' ? words + kept + 1 : words + kept;
}

/* The note under a name, in a line or, where there is room for it, two. */
static void draw_note(struct map *map, size_t place, double x, double y, const char *words)
{
    double room = map->layout->on_left[place] ? x - edge : map->layout->width - edge - x;
    struct text line = {0};
    const char *rest = map->layout->style == LABEL_WRAPPED ? fill_line(words, room, &line) : "";
    if (*rest == '\0') {
        label_line(map, place, x, y, ROLE_NOTE, note_size, 0, words);
    } else if (!line.failed) {
        label_line(map, place, x, y, ROLE_NOTE, note_size, 0, line.bytes);
        label_line(map, place, x, y + 13, ROLE_NOTE, note_size, 0, rest);
    }
    map->scene->failed = map->scene->failed || line.failed;
    text_finish(&line);
}

static void draw_words(struct map *map, size_t place)
{
    const struct place *of = &map->diagnosis->job->places[place];
    double x = label_x(map, place), y = map->layout->row[place];
    double chance = chance_at_place(map->diagnosis, place);
    bool under = map->layout->style == LABEL_WRAPPED || map->layout->style == LABEL_TWO_LINES;
    struct text note = {0}, name = {0};
    const char *state = state_words(of), *label = of->label != NULL ? of->label : "";
    text_addf(&note, "%s%s%s", state != NULL ? state : "",
              state != NULL && *label != '\0' ? ", " : "", label);
    text_add(&name, of->id);
    if (!under && note.length > 0)
        text_addf(&name, " %s", note.bytes);
    draw_leader(map, place, x);
    if (!name.failed && !note.failed) {
        bool alone = !under || note.length == 0;
        label_line(map, place, x, alone ? y + 4.5 : y, ROLE_NAME, name_size, chance, name.bytes);
        if (!alone)
            draw_note(map, place, x, y + 13.5, note.bytes);
    }
    map->scene->failed = map->scene->failed || name.failed || note.failed;
    text_finish(&note);
    text_finish(&name);
}

/* Numbers stand in two columns by turns, beyond the deepest spur. */
static double number_x(const struct map *map, size_t place, size_t column)
{
    const struct rf_job *job = map->diagnosis->job;
    size_t deepest = 0;
    for (size_t spur = job->n_ring + 2; spur < job->n_places; spur++)
        if (spur_depth(job, spur) > deepest)
            deepest = spur_depth(job, spur);
    double away = map->layout->bend + 12 + map->layout->spur_step * (double)fmin((double)deepest, 4) +
                  26 * (double)column;
    return map->layout->on_left[place] ? map->layout->middle - away : map->layout->middle + away;
}

/* How many rows of its side stand above its own. */
static size_t rows_above(const struct map *map, size_t place)
{
    const struct rf_job *job = map->diagnosis->job;
    size_t n = 0;
    for (size_t other = 1; other < job->n_places; other++)
        n += !place_is_end(job, other) && map->layout->on_left[other] == map->layout->on_left[place] &&
             map->layout->row[other] < map->layout->row[place];
    return n;
}

static void draw_number(struct map *map, size_t place)
{
    double x = number_x(map, place, rows_above(map, place) % 2), y = map->layout->row[place];
    bool left = map->layout->on_left[place];
    struct position at = map->layout->mark[place];
    struct text number = {0};
    text_addf(&number, "%zu", place_number(map->diagnosis->job, place));
    scene_segment(map->scene, ROLE_LEADER, at.x, at.y, x + (left ? 2 : -2), y);
    if (!number.failed &&
        scene_label(map->scene, ROLE_NAME, x, y + 4, left ? ANCHOR_END : ANCHOR_START, note_size,
                    40, number.bytes) > 0)
        title_of_place(map, place);
    map->scene->failed = map->scene->failed || number.failed;
    text_finish(&number);
}

/* The chances of numbered places, in a third column: "57: 20 %". */
enum { NUMBERED_CHANCES_MOST = 60 };
static void draw_numbered_chances(struct map *map, bool left)
{
    const struct rf_diagnosis *diagnosis = map->diagnosis;
    size_t places[NUMBERED_CHANCES_MOST], n = 0;
    double y[NUMBERED_CHANCES_MOST], scratch[2 * NUMBERED_CHANCES_MOST];
    for (size_t place = 1; place < diagnosis->job->n_places && n < NUMBERED_CHANCES_MOST; place++) {
        if (place_is_end(diagnosis->job, place) || map->layout->on_left[place] != left ||
            chance_at_place(diagnosis, place) < place_said)
            continue;
        size_t at = n++;
        for (; at > 0 && y[at - 1] > map->layout->row[place]; at--) {
            y[at] = y[at - 1];
            places[at] = places[at - 1];
        }
        y[at] = map->layout->row[place];
        places[at] = place;
    }
    spread_apart(y, n, 15, map->layout->top, map->layout->height - 20, scratch);
    for (size_t i = 0; i < n; i++) {
        struct text words = {0};
        text_addf(&words, "%zu: ", place_number(diagnosis->job, places[i]));
        say_chance(chance_at_place(diagnosis, places[i]), &words);
        double x = number_x(map, places[i], 2);
        if (!words.failed)
            scene_label(map->scene, ROLE_NUMBER, x, y[i] + 4, left ? ANCHOR_END : ANCHOR_START,
                        note_size, left ? x - 2 : map->layout->width - 2 - x, words.bytes);
        map->scene->failed = map->scene->failed || words.failed;
        text_finish(&words);
    }
}

static void draw_labels(struct map *map)
{
    const struct rf_job *job = map->diagnosis->job;
    bool numbers = map->layout->style == LABEL_NUMBER;
    for (size_t place = 1; place < job->n_places; place++) {
        if (place_is_end(job, place))
            continue;
        if (numbers)
            draw_number(map, place);
        else
            draw_words(map, place);
    }
    for (int left = 0; left < 2 && numbers; left++)
        draw_numbered_chances(map, left == 1);
}

/* --- the board --- */

static void draw_board(struct map *map)
{
    const struct rf_diagnosis *diagnosis = map->diagnosis;
    double chance = chance_at_board(diagnosis);
    double x = map->layout->left - 42, w = map->layout->right - map->layout->left + 84;
    struct text words = {0}, title = {0};
    scene_box(map->scene, ROLE_BOARD, x, 8, w, map->layout->top - 8);
    text_add(&title, "board");
    if (chance >= place_said) {
        text_add(&title, "; chance that it shows here: ");
        say_chance(chance, &title);
    }
    scene_title(map->scene, &title);
    text_add(&words, "board");
    if (diagnosis->job->board_opened)
        text_add(&words, ", seen");
    scene_label(map->scene, ROLE_NAME, map->layout->middle, 27, ANCHOR_MIDDLE, name_size, w - 8,
                words.failed ? "" : words.bytes);
    text_clear(&words);
    if (chance >= place_said) {
        say_chance(chance, &words);
        scene_label(map->scene, ROLE_NUMBER, map->layout->middle, 45, ANCHOR_MIDDLE, name_size,
                    60, words.failed ? "" : words.bytes);
    }
    map->scene->failed = map->scene->failed || words.failed;
    text_finish(&words);
    scene_label(map->scene, ROLE_NOTE, map->layout->left, 52, ANCHOR_MIDDLE, note_size, 60, "out");
    scene_label(map->scene, ROLE_NOTE, map->layout->right, 52, ANCHOR_MIDDLE, note_size, 60, "in");
}

/* --- the whole --- */

static void entitle(const struct rf_diagnosis *diagnosis, struct scene *scene)
{
    struct text title = {0}, about = {0};
    text_add(&title, "Map of the ring: ");
    say_ring(diagnosis->job, &title);
    text_add(&about, "From the board down the left side, around, and up the right side back to the "
                     "board.");
    for (size_t i = 0; i < diagnosis->n_places; i++) {
        if (diagnosis->places[i].chance < place_said)
            continue;
        text_add(&about, " ");
        say_look(diagnosis->job, &diagnosis->places[i].look, &about);
        text_add(&about, ": ");
        say_chance(diagnosis->places[i].chance, &about);
        text_add(&about, ".");
    }
    for (size_t i = 0; i < diagnosis->n_findings; i++)
        if (finding_letter(diagnosis, i) != 0)
            text_addf(&about, " %c: %s.", finding_letter(diagnosis, i),
                      diagnosis->findings[i].words);
    scene_entitle(scene, &title, &about);
}

void ring_map(const struct rf_diagnosis *diagnosis, struct scene *scene)
{
    struct ring_layout layout;
    struct map map = {.diagnosis = diagnosis, .scene = scene, .layout = &layout};
    map.parted = NEW_ARRAY(bool, n_runs(diagnosis->job));
    if (map.parted == NULL || !ring_layout_init(&layout, diagnosis)) {
        free(map.parted);
        scene->failed = true;
        return;
    }
    scene->width = layout.width;
    scene->height = layout.height;
    entitle(diagnosis, scene);
    part_conductors(&map);
    draw_chances(&map);
    draw_ring_runs(&map);
    draw_spur_runs(&map);
    draw_findings(&map);
    draw_board(&map);
    for (size_t place = 1; place < diagnosis->job->n_places; place++)
        if (!place_is_end(diagnosis->job, place))
            draw_point(&map, place);
    draw_labels(&map);
    draw_inside(&map);
    free(map.parted);
    ring_layout_finish(&layout);
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/readings_plot.h"

#include "base/error.h"
#include "base/memory.h"
#include "report/bands.h"
#include "report/lengths.h"
#include "report/said.h"
#include "report/words.h"

#include <math.h>
#include <string.h>

enum { WIDTH = 380, LEFT = 46, RIGHT = 368, TOP = 30, OVER = 42, UPPER = 58, LOWER = 216 };
enum { HEIGHT = 262 };
static const double tick_size = 11;

/* A set-up's plot: everything that can be read there, in order along the axis. */
struct plot {
    const struct rf_diagnosis *diagnosis;
    size_t setup;
    struct scene *scene;
    size_t n;
    struct measurement *at;
    double *x; /* px */
    struct band *fitted, *sound;
    double metres, top; /* the axes' ends: m, Ω */
    bool by_place;      /* else one thing beside another: conductors */
};

double axis_step(double range, double steps)
{
    double rough = range / steps, power = pow(10, floor(log10(rough)));
    double times = rough / power;
    return power * (times <= 1 ? 1 : times <= 2 ? 2 : times <= 5 ? 5 : 10);
}

/* --- what is on the axis --- */

static bool was_read(const struct plot *plot, enum spot spot)
{
    const struct rf_job *job = plot->diagnosis->job;
    for (size_t i = 0; i < job->n_readings; i++)
        if (job->readings[i].setup == plot->setup && job->readings[i].spot == spot)
            return true;
    return false;
}

/* Before the ring's points: what is read at the board's outgoing side, and the conductors end to
 * end; behind them what is read at the incoming side. */
static void list_measurements(struct plot *plot)
{
    static const enum spot before[] = {SPOT_BOARD, SPOT_OUT, SPOT_L, SPOT_N, SPOT_E};
    static const enum spot behind[] = {SPOT_IN, SPOT_HIGHEST};
    const struct rf_job *job = plot->diagnosis->job;
    for (size_t i = 0; i < sizeof before / sizeof before[0]; i++)
        if (was_read(plot, before[i]))
            plot->at[plot->n++] = (struct measurement){plot->setup, before[i], 0};
    if (plot->by_place)
        for (size_t place = 1; place < job->n_places; place++)
            if (place_has_front(job, place))
                plot->at[plot->n++] = (struct measurement){plot->setup, SPOT_POINT, place};
    for (size_t i = 0; i < sizeof behind / sizeof behind[0]; i++)
        if (was_read(plot, behind[i]))
            plot->at[plot->n++] = (struct measurement){plot->setup, behind[i], 0};
}

static bool place_along(struct plot *plot)
{
    const struct rf_job *job = plot->diagnosis->job;
    double *distance = NEW_ARRAY(double, job->n_places);
    if (distance == NULL)
        return false;
    place_distances(plot->diagnosis, distance);
    double end = distance[place_in(job)];
    for (size_t place = 0; place < job->n_places; place++)
        end = fmax(end, distance[place]);
    plot->metres = end;
    for (size_t i = 0; i < plot->n; i++) {
        const struct measurement *at = &plot->at[i];
        double share = at->spot == SPOT_POINT ? distance[at->place] / end
                       : at->spot == SPOT_IN || at->spot == SPOT_HIGHEST
                           ? distance[place_in(job)] / end
                           : 0;
        if (!plot->by_place)
            share = ((double)i + 0.5) / (double)plot->n;
        plot->x[i] = LEFT + 8 + share * (RIGHT - LEFT - 16);
    }
    free(distance);
    return true;
}

/* Up to the highest thing in range. */
static void find_top(struct plot *plot)
{
    const struct rf_job *job = plot->diagnosis->job;
    double top = 0.1;
    for (size_t i = 0; i < plot->n; i++) {
        top = fmax(top, isnan(plot->fitted[i].high) ? 0 : plot->fitted[i].high);
        top = fmax(top, isnan(plot->sound[i].high) ? 0 : plot->sound[i].high);
    }
    for (size_t i = 0; i < job->n_readings; i++)
        if (job->readings[i].setup == plot->setup && !job->readings[i].open)
            top = fmax(top, job->readings[i].ohms);
    double step = axis_step(top, 5);
    plot->top = ceil(top / step) * step;
}

static double height_of(const struct plot *plot, double ohms)
{
    return isnan(ohms) ? OVER : LOWER - fmin(ohms / plot->top, 1) * (LOWER - UPPER);
}

/* --- axes --- */

static void draw_ohm_axis(struct plot *plot)
{
    double step = axis_step(plot->top, 5);
    int digits = step < 0.1 ? 2 : step < 1 ? 1 : 0;
    for (double ohms = 0; ohms <= plot->top * 1.0001; ohms += step) {
        struct text words = {0};
        double y = height_of(plot, ohms);
        scene_segment(plot->scene, ROLE_GRID, LEFT, y, RIGHT, y);
        text_addf(&words, "%.*f", digits, ohms);
        scene_label(plot->scene, ROLE_TICK, LEFT - 5, y + 4, ANCHOR_END, tick_size, LEFT - 6,
                    words.failed ? "" : words.bytes);
        plot->scene->failed = plot->scene->failed || words.failed;
        text_finish(&words);
    }
    scene_label(plot->scene, ROLE_TICK, 4, 18, ANCHOR_START, tick_size, 60, "Ω");
    scene_segment(plot->scene, ROLE_GRID, LEFT, OVER, RIGHT, OVER);
    scene_label(plot->scene, ROLE_TICK, RIGHT, TOP - 4, ANCHOR_END, tick_size, 100, "over range");
    scene_segment(plot->scene, ROLE_AXIS, LEFT, TOP, LEFT, LOWER);
    scene_segment(plot->scene, ROLE_AXIS, LEFT, LOWER, RIGHT, LOWER);
}

static void draw_metre_axis(struct plot *plot)
{
    double step = axis_step(plot->metres, 5);
    for (double metres = 0; metres <= plot->metres; metres += step) {
        double x = LEFT + 8 + metres / plot->metres * (RIGHT - LEFT - 16);
        struct text words = {0};
        bool last = metres + step > plot->metres;
        text_addf(&words, "%g%s", metres, last ? " m" : "");
        scene_segment(plot->scene, ROLE_AXIS, x, LOWER, x, LOWER + 4);
        scene_label(plot->scene, ROLE_TICK, x, LOWER + 38, ANCHOR_MIDDLE, tick_size,
                    (RIGHT - LEFT) / 5.0, words.failed ? "" : words.bytes);
        plot->scene->failed = plot->scene->failed || words.failed;
        text_finish(&words);
    }
}

/* The places' names where there is room, in the order of how much they matter. */
static void name_of(const struct plot *plot, size_t i, struct text *out)
{
    const struct measurement *at = &plot->at[i];
    if (at->spot == SPOT_POINT)
        text_add(out, plot->diagnosis->job->places[at->place].id);
    else if (at->spot == SPOT_HIGHEST)
        text_add(out, "highest");
    else
        say_spot(plot->diagnosis->job, at->spot, at->place, out);
}

static void draw_names(struct plot *plot, bool spurs, double taken[], size_t *n_taken)
{
    for (size_t i = 0; i < plot->n; i++) {
        const struct measurement *at = &plot->at[i];
        bool spur = at->spot == SPOT_POINT && !place_on_ring(plot->diagnosis->job, at->place);
        struct text name = {0};
        if (spur != spurs)
            continue;
        name_of(plot, i, &name);
        double room = plot->by_place ? 70 : (RIGHT - LEFT) / (double)plot->n - 6;
        double half = name.failed ? 0 : fmin(words_width(name.bytes, tick_size), room) / 2;
        double x = fmin(fmax(plot->x[i], half + 2), WIDTH - 2 - half);
        bool free_there = true;
        for (size_t j = 0; j < *n_taken; j++)
            free_there &= x + half + 3 < taken[2 * j] || x - half - 3 > taken[2 * j + 1];
        if (free_there && !name.failed) {
            taken[2 * *n_taken] = x - half;
            taken[2 * (*n_taken)++ + 1] = x + half;
            scene_label(plot->scene, ROLE_TICK, x, LOWER + 20, ANCHOR_MIDDLE, tick_size, room,
                        name.bytes);
        }
        scene_segment(plot->scene, ROLE_AXIS, plot->x[i], LOWER,
                      plot->x[i], LOWER + (free_there ? 7 : 4));
        plot->scene->failed |= name.failed;
        text_finish(&name);
    }
}

/* --- curves --- */

static bool on_curve(const struct plot *plot, size_t i)
{
    const struct measurement *at = &plot->at[i];
    return at->spot != SPOT_HIGHEST &&
           (at->spot != SPOT_POINT || place_on_ring(plot->diagnosis->job, at->place));
}

static void one_band(struct plot *plot, enum scene_role role, const struct band bands[], size_t i)
{
    const double w = 7;
    if (!isnan(bands[i].ohms))
        scene_box(plot->scene, role, plot->x[i] - w, height_of(plot, bands[i].high), 2 * w,
                  fmax(height_of(plot, bands[i].low) - height_of(plot, bands[i].high), 1));
}

/* The stretch of ring points from i on that are in range, with neighbours. */
static size_t stretch_end(const struct plot *plot, const struct band bands[], size_t i)
{
    while (i < plot->n && on_curve(plot, i) && !isnan(bands[i].ohms) && plot->by_place)
        i++;
    return i;
}

static void draw_bands(struct plot *plot, enum scene_role role, const struct band bands[])
{
    for (size_t i = 0; i < plot->n;) {
        size_t end = stretch_end(plot, bands, i);
        if (end < i + 2) {
            one_band(plot, role, bands, i++);
            continue;
        }
        scene_area(plot->scene, role);
        for (size_t j = i; j < end; j++)
            scene_corner(plot->scene, plot->x[j], height_of(plot, bands[j].high));
        for (size_t j = end; j-- > i;)
            scene_corner(plot->scene, plot->x[j], height_of(plot, bands[j].low));
        i = end;
    }
}

static void draw_curve(struct plot *plot, enum scene_role role, const struct band bands[])
{
    for (size_t i = 0; i < plot->n;) {
        size_t end = stretch_end(plot, bands, i);
        if (end < i + 2) {
            double y = height_of(plot, bands[i].ohms);
            if (!isnan(bands[i].ohms) || role == ROLE_FIT)
                scene_segment(plot->scene, role, plot->x[i] - 6, y, plot->x[i] + 6, y);
            i++;
            continue;
        }
        scene_line(plot->scene, role);
        for (; i < end; i++)
            scene_corner(plot->scene, plot->x[i], height_of(plot, bands[i].ohms));
    }
}

/* --- readings --- */

static size_t plotted_at(const struct plot *plot, const struct reading *reading)
{
    for (size_t i = 0; i < plot->n; i++)
        if (plot->at[i].spot == reading->spot &&
            (reading->spot != SPOT_POINT || plot->at[i].place == reading->place))
            return i;
    return plot->n;
}

static void draw_readings(struct plot *plot)
{
    const struct rf_job *job = plot->diagnosis->job;
    double r = job->n_ring > 60 ? 2 : 3.2;
    for (size_t i = 0; i < job->n_readings; i++) {
        const struct reading *reading = &job->readings[i];
        size_t at = plotted_at(plot, reading);
        if (reading->setup != plot->setup || at == plot->n)
            continue;
        double ohms = reading->open ? (double)NAN : reading->ohms, y = height_of(plot, ohms);
        if (is_suspect(plot->diagnosis, i))
            scene_disc(plot->scene, ROLE_SUSPECT, plot->x[at], y, 8);
        if (reading->open) {
            scene_area(plot->scene, ROLE_READ);
            scene_corner(plot->scene, plot->x[at], y - 4.5);
            scene_corner(plot->scene, plot->x[at] - 4, y + 3);
            scene_corner(plot->scene, plot->x[at] + 4, y + 3);
        } else {
            scene_disc(plot->scene, ROLE_READ, plot->x[at], y, r);
        }
        struct text title = {0};
        say_spot(job, reading->spot, reading->place, &title);
        text_add(&title, ": ");
        say_ohms_unit(ohms, &title);
        text_add(&title, is_suspect(plot->diagnosis, i) ? " read; read it again" : " read");
        scene_title(plot->scene, &title);
    }
}

/* --- the whole --- */

static void entitle(struct plot *plot)
{
    const struct rf_job *job = plot->diagnosis->job;
    struct text title = {0}, about = {0};
    size_t n = 0, over = 0, suspects = 0;
    for (size_t i = 0; i < job->n_readings; i++)
        if (job->readings[i].setup == plot->setup) {
            n++;
            over += job->readings[i].open;
            suspects += is_suspect(plot->diagnosis, i);
        }
    text_add(&title, "Readings, ");
    say_set_up(plot->setup, &title);
    text_addf(&about, "%zu reading%s", n, n == 1 ? "" : "s");
    if (over > 0)
        text_addf(&about, ", %zu of them over range", over);
    if (suspects > 0)
        text_addf(&about, ", %zu to read again", suspects);
    text_addf(&about, ", %s, 0 to %g Ω, with what fits them and what a ring without defect would "
                      "read. The same numbers stand in the table below.",
              plot->by_place ? "by metres along the ring" : "side by side", plot->top);
    scene_entitle(plot->scene, &title, &about);
}

static void draw(struct plot *plot, double taken[])
{
    size_t n_taken = 0;
    plot->scene->width = WIDTH;
    plot->scene->height = plot->by_place ? HEIGHT : HEIGHT - 16;
    entitle(plot);
    draw_bands(plot, ROLE_SOUND_BAND, plot->sound);
    draw_bands(plot, ROLE_FIT_BAND, plot->fitted);
    draw_ohm_axis(plot);
    if (plot->by_place)
        draw_metre_axis(plot);
    draw_names(plot, false, taken, &n_taken);
    draw_names(plot, true, taken, &n_taken);
    draw_curve(plot, ROLE_SOUND, plot->sound);
    draw_curve(plot, ROLE_FIT, plot->fitted);
    draw_readings(plot);
}

enum rf_status readings_plot(const struct rf_diagnosis *diagnosis, size_t setup,
                             struct scene *scene, struct rf_error *error)
{
    size_t most = diagnosis->job->n_places + N_SPOTS;
    struct plot plot = {
        .diagnosis = diagnosis,
        .setup = setup,
        .scene = scene,
        .at = NEW_ARRAY(struct measurement, most),
        .x = NEW_ARRAY(double, most),
        .fitted = NEW_ARRAY(struct band, most),
        .sound = NEW_ARRAY(struct band, most),
        .by_place = (setups[setup].spots & 1u << SPOT_POINT) != 0,
    };
    double *taken = NEW_ARRAY(double, 2 * most);
    enum rf_status status = RF_OK;
    if (plot.at == NULL || plot.x == NULL || plot.fitted == NULL || plot.sound == NULL ||
        taken == NULL)
        status = fail_memory(error);
    if (status == RF_OK) {
        list_measurements(&plot);
        status = place_along(&plot) ? RF_OK : fail_memory(error);
    }
    if (status == RF_OK)
        status = fitted_bands(diagnosis, plot.at, plot.n, plot.fitted, error);
    if (status == RF_OK)
        status = sound_bands(diagnosis, plot.at, plot.n, plot.sound, error);
    if (status == RF_OK) {
        find_top(&plot);
        draw(&plot, taken);
        status = scene->failed ? fail_memory(error) : RF_OK;
    }
    free(plot.at);
    free(plot.x);
    free(plot.fitted);
    free(plot.sound);
    free(taken);
    return status;
}

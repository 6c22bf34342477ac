/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/ring_layout.h"

#include "base/memory.h"
#include "report/lengths.h"

#include <math.h>
#include <string.h>

enum { WRAPPED_MOST = 14, TWO_LINES_MOST = 24, ONE_LINE_MOST = 60, ONE_LINE_ROWS = 80 };
enum { GAP = 11, RAIL_LEAST = 150, BEND = 62, TOP = 64, WIDTH = 380, SPUR_STEP = 20 };
enum { NARROW_BEND = 48, NARROW_STEP = 6 }; /* where numbers stand in several columns */

static double row_gap(enum label_style style)
{
    static const double gaps[] = {
        [LABEL_WRAPPED] = 48, [LABEL_TWO_LINES] = 34, [LABEL_ONE_LINE] = 19, [LABEL_NUMBER] = 8};
    return gaps[style];
}

enum label_style label_style(const struct rf_job *job)
{
    size_t rows = job->n_ring + job->n_spurs;
    return rows <= WRAPPED_MOST                                       ? LABEL_WRAPPED
           : rows <= TWO_LINES_MOST                                   ? LABEL_TWO_LINES
           : job->n_ring <= ONE_LINE_MOST && rows <= ONE_LINE_ROWS ? LABEL_ONE_LINE
                                                                      : LABEL_NUMBER;
}

/* --- heights moved apart --- */

/* The nearest heights with y[i+1] ≥ y[i] + gap, in the sum of squares: isotonic regression of
 * y[i] − i·gap by pooling neighbours that are out of order (Barlow et al., "Statistical Inference
 * under Order Restrictions", 1972). */
void spread_apart(double y[], size_t n, double gap, double low, double high, double scratch[])
{
    double *mean = scratch, *weight = scratch + n;
    size_t pools = 0;
    for (size_t i = 0; i < n; i++) {
        mean[pools] = y[i] - (double)i * gap;
        weight[pools++] = 1;
        while (pools > 1 && mean[pools - 2] > mean[pools - 1]) {
            double sum = weight[pools - 2] + weight[pools - 1];
            mean[pools - 2] = (mean[pools - 2] * weight[pools - 2] +
                               mean[pools - 1] * weight[pools - 1]) / sum;
            weight[pools - 2] = sum;
            pools--;
        }
    }
    double last = high - gap * (n > 0 ? (double)(n - 1) : 0);
    size_t i = 0;
    for (size_t pool = 0; pool < pools; pool++)
        for (double taken = 0; taken < weight[pool]; taken++, i++)
            y[i] = fmax(fmin(mean[pool], last), low) + (double)i * gap;
}

/* --- along the ring --- */

struct position along_ring(const struct ring_layout *layout, double along, double aside)
{
    double arc = 3.14159265358979 * layout->bend;
    if (along <= layout->rail)
        return (struct position){layout->left - aside, layout->top + along};
    if (along >= layout->rail + arc)
        return (struct position){layout->right + aside,
                                 layout->top + 2 * layout->rail + arc - along};
    double angle = (along - layout->rail) / layout->bend, radius = layout->bend + aside;
    return (struct position){layout->middle - radius * cos(angle),
                             layout->top + layout->rail + radius * sin(angle)};
}

/* Drawn lengths max(GAP, scale · metres) that sum up to the ring's: the scale by bisection. */
static double drawn_length(const struct rf_diagnosis *diagnosis, double scale)
{
    double sum = 0;
    for (size_t run = 0; run <= diagnosis->job->n_ring; run++)
        sum += fmax(GAP, scale * run_metres(diagnosis, run));
    return sum;
}

static void place_ring(struct ring_layout *layout, const struct rf_diagnosis *diagnosis)
{
    const struct rf_job *job = diagnosis->job;
    double low = 0, high = 1;
    while (drawn_length(diagnosis, high) < layout->length && high < 1e9)
        high *= 2;
    for (int i = 0; i < 60; i++) {
        double scale = (low + high) / 2;
        if (drawn_length(diagnosis, scale) < layout->length)
            low = scale;
        else
            high = scale;
    }
    layout->along[0] = 0;
    for (size_t run = 0; run <= job->n_ring; run++)
        layout->along[run + 1] =
            layout->along[run] + fmax(GAP, high * run_metres(diagnosis, run));
    for (size_t place = 0; place < job->n_places; place++) {
        size_t on = ring_place_of(job, place);
        layout->mark[place] = along_ring(layout, layout->along[on], 0);
        layout->on_left[place] = on == place_in(job) ? false
                                 : on == 0           ? true
                                                     : layout->mark[place].x <= layout->middle;
    }
}

/* --- rows of labels --- */

/* The places of one side from above, each with the spurs that hang on it behind it. */
static size_t side_places(const struct ring_layout *layout, const struct rf_job *job, bool left,
                          size_t places[])
{
    size_t n = 0;
    for (size_t i = 0; i < job->n_ring + 2; i++) {
        size_t on = left ? i : job->n_ring + 1 - i;
        if (layout->on_left[on] != left)
            continue;
        if (!place_is_end(job, on))
            places[n++] = on;
        for (size_t spur = job->n_ring + 2; spur < job->n_places; spur++)
            if (ring_place_of(job, spur) == on)
                places[n++] = spur;
    }
    return n;
}

static void place_rows(struct ring_layout *layout, const struct rf_job *job, const size_t places[],
                       size_t n, double scratch[])
{
    double *y = scratch + 2 * n;
    for (size_t i = 0; i < n; i++)
        y[i] = layout->mark[places[i]].y;
    spread_apart(y, n, row_gap(layout->style), layout->top + 8, layout->height - 36, scratch);
    for (size_t i = 0; i < n; i++) {
        size_t place = places[i], depth = spur_depth(job, place);
        double away = layout->spur_step * (double)(depth < 4 ? depth : 4);
        layout->row[place] = y[i];
        if (depth > 0) {
            layout->mark[place].x =
                layout->on_left[place] ? layout->left - away : layout->right + away;
            layout->mark[place].y = y[i];
        }
    }
}

static double side_needs(const struct ring_layout *layout, size_t rows)
{
    return row_gap(layout->style) * (double)rows - layout->bend;
}

/* Long enough for the labels: on a side, and all in all. */
static void lay(struct ring_layout *layout, const struct rf_diagnosis *diagnosis, size_t places[],
                double scratch[])
{
    const struct rf_job *job = diagnosis->job;
    double rows = (double)(job->n_ring + job->n_spurs);
    layout->rail = fmax(RAIL_LEAST, side_needs(layout, (size_t)(rows / 2) + 2));
    layout->rail = fmax(layout->rail, (GAP * (double)(job->n_ring + 1) - 3 * layout->bend) / 2 + 40);
    for (int round = 0; round < 3; round++) {
        layout->length = 2 * layout->rail + 3.14159265358979 * layout->bend;
        place_ring(layout, diagnosis);
        size_t left = side_places(layout, job, true, places);
        size_t right = side_places(layout, job, false, places);
        double needs = side_needs(layout, left > right ? left : right);
        if (needs <= layout->rail)
            break;
        layout->rail = needs;
    }
    layout->length = 2 * layout->rail + 3.14159265358979 * layout->bend;
    layout->height = layout->top + layout->rail + layout->bend + 42;
    place_ring(layout, diagnosis);
    for (int left = 0; left < 2; left++) {
        size_t n = side_places(layout, job, left == 1, places);
        place_rows(layout, job, places, n, scratch);
    }
}

bool ring_layout_init(struct ring_layout *layout, const struct rf_diagnosis *diagnosis)
{
    const struct rf_job *job = diagnosis->job;
    size_t n = job->n_places;
    enum label_style style = label_style(job);
    bool numbers = style == LABEL_NUMBER;
    double bend = numbers ? NARROW_BEND : BEND;
    *layout = (struct ring_layout){
        .style = style,
        .width = WIDTH,
        .middle = WIDTH / 2.0,
        .left = WIDTH / 2.0 - bend,
        .right = WIDTH / 2.0 + bend,
        .top = TOP,
        .bend = bend,
        .spur_step = numbers ? NARROW_STEP : SPUR_STEP,
        .along = NEW_ARRAY(double, job->n_ring + 2),
        .mark = NEW_ARRAY(struct position, n),
        .row = NEW_ARRAY(double, n),
        .on_left = NEW_ARRAY(bool, n),
    };
    size_t *places = NEW_ARRAY(size_t, n);
    double *scratch = NEW_ARRAY(double, 3 * n);
    bool whole = layout->along != NULL && layout->mark != NULL && layout->row != NULL &&
                 layout->on_left != NULL && places != NULL && scratch != NULL;
    if (whole)
        lay(layout, diagnosis, places, scratch);
    free(places);
    free(scratch);
    if (!whole)
        ring_layout_finish(layout);
    return whole;
}

void ring_layout_finish(struct ring_layout *layout)
{
    free(layout->along);
    free(layout->mark);
    free(layout->row);
    free(layout->on_left);
    *layout = (struct ring_layout){0};
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef JOB_JOB_H
#define JOB_JOB_H

/*
 * A job as the other rooms see it: the ring as recorded and the readings as taken. Places and
 * runs are numbered so that a run and the place it leads to go together:
 *
 *   place 0          the ring's out end
 *   places 1 … n     the ring's points, in ring order
 *   place n+1        the ring's in end
 *   places n+2 …     the spur points, in the file's order
 *
 *   run r leads to place r+1: from place r on the ring (r ≤ n), from the spur point's `from` else.
 *
 * Read-only once read; the readers in this room and `job_progress.h` are the only writers.
 */

#include "job/setup.h"

#include <ringfettle/job.h>

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

struct cJSON;

enum {
    JOB_MAX_BYTES = 16 * 1024 * 1024, /* one job */
    JOB_MAX_POINTS = 200,             /* ring points; and as many spur points */
    JOB_MAX_READINGS = 5000,
    JOB_MAX_ID = 64 /* bytes */
};

enum kind { KIND_SOCKET, KIND_FCU, KIND_JUNCTION_BOX, KIND_ISOLATOR, KIND_OTHER, N_KINDS };
extern const char *const kind_names[N_KINDS]; /* as in files */

struct place {
    char *id; /* "out", "in", or the user's */
    char *label; /* NULL: none */
    enum kind kind;
    size_t from;  /* the place at the near end of the run that leads here; unused for place 0 */
    double run_m; /* m, that run's recorded length; NAN: not known */
    double live_mm2, cpc_mm2; /* mm², of that run; the ring's own where the point carries none.
                               * cpc_mm2 NAN: not known */
    bool own_live, own_cpc;   /* the file gave this point its own */
    bool opened, checked;
    double reach_minutes;     /* 0 where not given */
    double open_minutes;      /* NAN where not given */
};

struct reading {
    size_t setup; /* index into setups[] */
    enum spot spot;
    size_t place;  /* SPOT_POINT: the point; else 0 */
    size_t repeat; /* 0 for the first reading there, 1 … for its repeats */
    bool open;     /* over range; `ohms` is then 0 */
    double ohms;   /* Ω, 0 … 99.9 */
};

struct rf_job {
    char *name; /* `job` in the file, or NULL */
    char *date, *note;
    char *source; /* for messages: the file, with the line for NDJSON; never NULL */
    double live_mm2, cpc_mm2; /* mm², recorded for the ring; cpc NAN: not known */
    double temperature_c;
    double length_accuracy; /* 1 σ of the log of a recorded length */
    size_t n_ring;          /* ring points */
    size_t n_spurs;
    size_t n_places; /* n_ring + n_spurs + 2 */
    struct place *places;
    size_t n_readings;
    struct reading *readings; /* in the file's order */
    size_t setup_in_place;    /* the file's last set-up; N_SETUPS where it has none */
    bool board_opened;
    double board_reach_minutes, board_open_minutes; /* as for a place */
    struct cJSON *found;    /* `found` as the file has it, an object; NULL: none. Its meaning is
                             * the faults' room's to read */
    struct cJSON *document; /* the whole job as read, for writing back what this struct does not
                             * hold (keys that begin x_, the order of keys) */
};

static inline size_t place_out(void) { return 0; }
static inline size_t place_in(const struct rf_job *job) { return job->n_ring + 1; }
static inline size_t n_runs(const struct rf_job *job) { return job->n_places - 1; }
static inline size_t run_far_end(size_t run) { return run + 1; }
static inline bool run_on_ring(const struct rf_job *job, size_t run) { return run <= job->n_ring; }
static inline bool place_is_end(const struct rf_job *job, size_t place)
{
    return place == 0 || place == job->n_ring + 1;
}
/* Ring places are out, the ring's points and in; points are everything but the two ends. */
static inline bool place_on_ring(const struct rf_job *job, size_t place)
{
    return place <= job->n_ring + 1;
}
static inline size_t run_near_end(const struct rf_job *job, size_t run)
{
    return run_on_ring(job, run) ? run : job->places[run + 1].from;
}
static inline bool place_has_front(const struct rf_job *job, size_t place)
{
    return !place_is_end(job, place) && job->places[place].kind != KIND_JUNCTION_BOX;
}

/* The place of that id ("out" and "in" are the ends), or n_places. */
size_t job_find_place(const struct rf_job *job, const char *id);
/* The run between two places, in either order, or n_runs(job) where there is none. */
size_t job_find_run(const struct rf_job *job, size_t one, size_t other);

/* The key of a reading's spot in the file: "board", "P3" … */
const char *reading_key(const struct rf_job *job, const struct reading *reading);

/* The ids of the ring's points, and of its spurs unless `ring_only`, for a message: "P1 to P8",
 * "P1, kitchen and P3", "P1 to P8, and the spurs S1 and S2". Long lists are shortened. */
struct text;
void job_list_places(const struct rf_job *job, bool ring_only, struct text *out);

/* Bytes of its file that a reader has gone through, the line read ahead with them. */
uint64_t job_reader_bytes(const struct rf_job_reader *reader);

#endif

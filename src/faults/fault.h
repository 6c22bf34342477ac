/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef FAULTS_FAULT_H
#define FAULTS_FAULT_H

/*
 * A fault, what every family of faults must be able to do, and the one list of families. The
 * engine never asks which family it has: it asks the family.
 */

#include "base/text.h"
#include "job/job.h"
#include "models/models.h"
#include "network/wiring.h"

#include <stdbool.h>
#include <stddef.h>

struct cJSON;

/* Which fields a family's faults carry; the bits of `fault_family.fields`. */
enum fault_field {
    FIELD_RUN = 1u << 0,
    FIELD_RING_RUN = 1u << 1, /* a run of the ring itself */
    FIELD_CONDUCTOR = 1u << 2,
    FIELD_ANY_CONDUCTOR = 1u << 3, /* L, N, E, or LNE for the whole cable */
    FIELD_AT = 1u << 4,            /* a point with a front */
    FIELD_AT_ANY = 1u << 5,        /* any point */
    FIELD_OPEN = 1u << 6,
    FIELD_POLES = 1u << 7,
    FIELD_PAIR = 1u << 8,
    FIELD_BETWEEN_RING = 1u << 9, /* two ring places, not neighbours, not (out, in) */
    FIELD_BETWEEN_POINTS = 1u << 10,
    FIELD_POINTS = 1u << 11,
    FIELD_CABLE = 1u << 12, /* live_mm2 and cpc_mm2 */
    FIELD_LEG = 1u << 13,
    FIELD_CROSS_SETUP = 1u << 14, /* a crossed set-up */
    FIELD_LINK_SETUP = 1u << 15,  /* a set-up with links, and with it the end of a link */
};

enum { WHOLE_CABLE = N_CONDUCTORS }; /* `conductor` "LNE" */
enum poles { POLES_L, POLES_LN };
enum { CHAIN_MAX = 3 };

/*
 * One fault. Fields a family does not carry are zero, so two faults are the same exactly when
 * `fault_equal` says so field by field. A plain value: copied freely, owns nothing.
 */
struct fault {
    const struct fault_family *family;
    size_t run;
    int conductor; /* enum conductor or WHOLE_CABLE */
    size_t place;  /* at; the first of `between`, in ring order, spur points behind the ring */
    size_t other;  /* the second of `between` */
    size_t chain[CHAIN_MAX]; /* `points`, away from the ring */
    size_t chain_length;
    enum pair pair;
    enum poles poles;
    bool open;
    bool leg_in; /* leg "in"; link end "in" */
    size_t setup;
    double live_mm2, cpc_mm2;
};

/* A hypothesis: faults applied one after another; none at all: wired as recorded. */
struct hypothesis {
    struct fault faults[FAULTS_AT_ONCE];
    size_t n_faults;
};

/* Where a fault shows when one looks. */
enum look_kind { LOOK_OPEN, LOOK_CHECK, N_LOOKS };
struct look {
    enum look_kind kind;
    enum { LOOK_AT_PLACE, LOOK_AT_BOARD, LOOK_IN_RUN } where;
    size_t index; /* the place or the run; 0 for the board */
    double share; /* chance that the fault shows there, given it is this fault */
};
/* Each look of `each_enough` families shows it; of the others, shares are parts of one. */
typedef void look_callback(void *context, const struct look *look);

/* Called for each member in enumeration order; false ends the enumeration. */
typedef bool fault_callback(void *context, const struct fault *fault);

/* What could hurt if the circuit were re-energised with the fault in it. */
enum danger {
    DANGER_NONE,
    DANGER_CPC_BROKEN,
    DANGER_LINE_ON_CPC, /* changed over, or in contact */
    DANGER_LIVES_SHORTED,
    DANGER_REVERSED,      /* line and neutral changed over: a switch or fuse left in neutral */
    DANGER_RING_BROKEN,   /* half the ring carries all, on a 32 A device */
    DANGER_OTHER_CIRCUIT, /* can be live from elsewhere */
    DANGER_HEAT,          /* a joint or contact that gets hot under load */
    N_DANGERS
};

struct fault_family {
    const char *name;  /* as in files and models; mandatory */
    unsigned fields;   /* which fields its faults carry */
    bool ohms, metres; /* its parameter is in Ω, in m; both false: some or all have none */
    bool each_enough;  /* every one of its looks shows it whole */

    /* Calls back for every member on this job, in enumeration order. Mandatory; allocates
     * nothing. A family without members on this job drops out of the priors. */
    void (*enumerate)(const struct rf_job *job, const struct rf_models *models,
                      fault_callback *callback, void *context);
    /* The kind, an index into `kind_names`, under which name the models' row has its share
     * (`fault_kind_share`); NULL: one kind. */
    size_t (*kind)(const struct fault *fault);
    const char *const *kind_names; /* n_kinds of them; NULL: one kind */
    size_t n_kinds;
    /* Whether this member has a parameter; NULL: all have, if `ohms` or `metres`. */
    bool (*has_parameter)(const struct fault *fault);
    /* Changes the wiring. `median` and `parameter` are the fault's parameter (Ω or m at θ = 0 and
     * its place in θ), or 0 and NO_PARAMETER. Mandatory but for `none`; allocates nothing. */
    void (*apply)(const struct fault *fault, struct wiring *wiring, double median, int parameter);
    /* Calls back for every look that could show it, shares from the models' row. NULL: never
     * shows. Allocates nothing. */
    void (*looks)(const struct fault *fault, const struct rf_job *job,
                  const struct rf_models *models, look_callback *callback, void *context);
    const char *const *share_names; /* the shares its row in effort.json must have; n_shares */
    size_t n_shares;
    /* The danger if re-energised; NULL: none. A break on a spur is another than on the ring, so it
     * takes the job. */
    enum danger (*danger)(const struct fault *fault, const struct rf_job *job);
    /* In words, with its place ("high-resistance neutral joint in the run P3 to P4"); and without
     * ("high-resistance neutral joint"), so that faults which differ only in the place have the
     * same words. Both mandatory. No capital at the start, no full stop. */
    void (*describe)(const struct fault *fault, const struct rf_job *job, struct text *out);
    void (*describe_kind)(const struct fault *fault, struct text *out);
    /* The places it lies between, in ring order of the first, for "somewhere between": a run's two
     * ends, a point twice. NULL: it has no one spot. */
    void (*span)(const struct fault *fault, const struct rf_job *job, size_t *from, size_t *to);
};

/* The one list; the order is the enumeration's order. Ends at n_fault_families. */
extern const struct fault_family *const fault_families[];
extern const size_t n_fault_families;

/* NULL where there is none of that name. */
const struct fault_family *fault_family_find(const char *name);

bool fault_equal(const struct fault *one, const struct fault *other);
bool fault_has_parameter(const struct fault *fault);

/* The share of the family's prior that goes to this fault's kind, by its name in the models' row;
 * 1 where the family has one kind. */
double fault_kind_share(const struct fault *fault, const struct family_prior *row);

/* The family's own, or nothing where its callback is NULL. */
void fault_looks(const struct fault *fault, const struct rf_job *job,
                 const struct rf_models *models, look_callback *callback, void *context);
enum danger fault_danger(const struct fault *fault, const struct rf_job *job);

/* Whether the job says that somebody has looked there already. */
bool looked_at(const struct rf_job *job, const struct look *look);

/* Checks the models' rows against the list: a row for every family and for nothing else, its kinds
 * and shares named as the family knows them, a parameter exactly where it has one. RF_REFUSED. */
enum rf_status fault_check_models(const struct rf_models *models, struct rf_error *error);

/* Applies the faults in order to a copy of the recorded ring; each one's parameter, if it has one,
 * is appended to the wiring's. parameter_of[i] (may be NULL) gets fault i's, or NO_PARAMETER. */
void hypothesis_apply(const struct hypothesis *hypothesis, struct wiring *wiring,
                      int parameter_of[FAULTS_AT_ONCE]);
bool hypothesis_equal(const struct hypothesis *one, const struct hypothesis *other);

/* --- JSON (fault_json.c): the fields of design 2, for `found`, output, simulate --- */

/* Reads one fault object; `path` ("found", "found.also") and the job's source name it in messages.
 * Keys `also`, `ohms`, `metres` and x_… are passed over. RF_REFUSED. */
enum rf_status fault_from_json(const struct cJSON *object, const struct rf_job *job,
                               const struct rf_models *models, const char *path,
                               struct fault *fault, struct rf_error *error);
/* `found` with its `also`: RF_OK with n_faults = 0 for family none. The job must have it. */
enum rf_status hypothesis_from_found(const struct rf_job *job, const struct rf_models *models,
                                     struct hypothesis *found, struct rf_error *error);
/* A new object, the caller's to delete; NULL when memory is short. */
struct cJSON *fault_to_json(const struct fault *fault, const struct rf_job *job);

/* The families, one file each. */
extern const struct fault_family fault_family_none, fault_family_break, fault_family_joint,
    fault_family_contact, fault_family_switched_off, fault_family_load,
    fault_family_interconnection, fault_family_spur, fault_family_reversal, fault_family_transposed,
    fault_family_short, fault_family_parallel, fault_family_size, fault_family_wrong_leg,
    fault_family_not_crossed, fault_family_bad_link, fault_family_not_nulled;

#endif

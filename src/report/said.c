/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/said.h"

#include "advice/looking.h"
#include "base/memory.h"
#include "report/words.h"

#include <math.h>
#include <stdlib.h>

/* From which chance on something is said, and how many lines of a list. */
static const double danger_said = 0.10, check_said = 0.02, finding_said = 0.01;
const double place_said = 0.02;
/* Ω, what a meter does not show as 0.00 by its noise. */
static const double not_nothing = 0.05;
enum { CHECKS_MOST = 6, PLACES_MOST = 5, FINDINGS_MOST = 6, SUSPECTS_MOST = 6, BLIND_INLINE = 3 };
enum { BLIND_MOST = 12 };

/* --- lines --- */

void said_add(struct said *said, enum line_kind kind, double chance, size_t about,
              struct text *words)
{
    if (said->n == said->capacity && !said->failed) {
        size_t capacity = said->capacity > 0 ? 2 * said->capacity : 16;
        struct said_line *lines = realloc(said->lines, capacity * sizeof *lines);
        if (lines != NULL) {
            said->lines = lines;
            said->capacity = capacity;
        }
    }
    if (words->failed || words->bytes == NULL || said->n == said->capacity) {
        said->failed = true;
        text_finish(words);
        return;
    }
    said->lines[said->n++] =
        (struct said_line){.kind = kind, .chance = chance, .about = about, .words = words->bytes};
    *words = (struct text){0};
}

static void add_chance(struct said *said, double chance, struct text *words)
{
    said_add(said, LINE_CHANCE, chance, 0, words);
}

static void add_plain(struct said *said, struct text *words)
{
    said_add(said, LINE_PLAIN, 0, 0, words);
}

static void add_plain_words(struct said *said, const char *plain)
{
    struct text words = {0};
    text_add(&words, plain);
    add_plain(said, &words);
}

void said_finish(struct said *said)
{
    for (size_t i = 0; i < said->n; i++)
        free(said->lines[i].words);
    free(said->lines);
    *said = (struct said){0};
}

bool shows_no_defect(const struct rf_diagnosis *diagnosis)
{
    return diagnosis->n_findings > 0 && diagnosis->findings[0].is_none && !diagnosis->misfit.flag;
}

bool is_suspect(const struct rf_diagnosis *diagnosis, size_t reading)
{
    for (size_t i = 0; i < diagnosis->n_suspects; i++)
        if (diagnosis->suspects[i].reading == reading)
            return true;
    return false;
}

/* --- nothing explains the readings --- */

/* What would explain them, and what is to be done about it. */
static void say_wider(const struct rf_diagnosis *diagnosis, struct said *said)
{
    struct text words = {0};
    if (diagnosis->wider.face_ohms > 0) {
        text_addf(&words, "Bad contacts at the faces would explain them: some %.2f",
                  diagnosis->wider.face_ohms);
        text_add(&words, NO_BREAK "Ω in each conductor's way to each face, here more, there less. "
                                  "Clean the faces, plug in and out a few times, and read again. "
                                  "All that follows assumes such contacts; ");
    } else if (diagnosis->wider.length_factor > 0) {
        text_addf(&words,
                  "Run lengths about %.0f times as wrong as recorded would explain them. Check the "
                  "recorded lengths, and leave out those that nobody measured. All that follows "
                  "assumes such lengths; ",
                  diagnosis->wider.length_factor);
    } else {
        text_add(&words, "Two at once would explain them, and are compared below, too: the "
                         "likeliest with every other, and what goes best with that; not all pairs. "
                         "Faces, meter and recorded lengths may be to blame all the same; ");
    }
    text_add(&words, diagnosis->wider.two_defects
                         ? "read again before you take anything off."
                         : "two defects, or another wiring than recorded, remain possible.");
    add_plain(said, &words);
}

void say_misfit(const struct rf_diagnosis *diagnosis, struct said *said)
{
    if (!diagnosis->misfit.flag)
        return;
    struct text words = {0};
    text_add(&words, "The likeliest of what was compared fits them badly: of jobs it is true of, ");
    if (diagnosis->misfit.p < 0.001)
        text_add(&words, "fewer than 1 in 1000");
    else if (diagnosis->misfit.p < 0.01)
        text_add(&words, "fewer than 1 in 100");
    else
        text_addf(&words, "about %.0f in 100", 100 * diagnosis->misfit.p);
    text_add(&words, " read so far off. ");
    if (!diagnosis->wider.assumed)
        text_add(&words, "Two defects, another wiring than recorded, or readings that went wrong "
                         "may be behind it. Read again before you take anything off; the chances "
                         "below are worth little.");
    add_plain(said, &words);
    if (diagnosis->wider.assumed)
        say_wider(diagnosis, said);
}

/* --- danger --- */

static int by_chance(const void *one, const void *other)
{
    double a = ((const struct danger_chance *)one)->chance;
    double b = ((const struct danger_chance *)other)->chance;
    return (a < b) - (a > b);
}

void say_dangers(const struct rf_diagnosis *diagnosis, struct said *said)
{
    struct danger_chance dangers[N_DANGERS];
    size_t n = 0;
    for (size_t i = 0; i < N_DANGERS; i++)
        if (i != DANGER_NONE && diagnosis->dangers[i].chance >= danger_said) {
            dangers[n] = diagnosis->dangers[i];
            dangers[n++].danger = (enum danger)i;
        }
    qsort(dangers, n, sizeof dangers[0], by_chance);
    for (size_t i = 0; i < n; i++) {
        struct text words = {0};
        text_add(&words, danger_words[dangers[i].danger]);
        add_chance(said, dangers[i].chance, &words);
    }
}

/* --- checks without a screw --- */

struct board_only {
    size_t at_board, elsewhere;
};

static void count_look(void *context, const struct look *look)
{
    struct board_only *count = context;
    if (look->where == LOOK_AT_BOARD)
        count->at_board++;
    else
        count->elsewhere++;
}

/* Whether a hypothesis is one fault that the board shows and nothing else: links, legs, nulling. */
static bool shows_at_board_only(const struct rf_diagnosis *diagnosis, const struct ranked *ranked)
{
    struct board_only count = {0};
    if (ranked->hypothesis.n_faults != 1)
        return false;
    fault_looks(&ranked->hypothesis.faults[0], diagnosis->job, diagnosis->models, count_look,
                &count);
    return count.at_board > 0 && count.elsewhere == 0;
}

static void check_faces(const struct rf_diagnosis *diagnosis, struct said *said)
{
    size_t n = 0;
    for (size_t i = 0; i < diagnosis->n_places && n < CHECKS_MOST; i++) {
        const struct place_chance *place = &diagnosis->places[i];
        if (place->look.kind != LOOK_CHECK || place->chance < check_said)
            continue;
        struct text words = {0};
        say_look(diagnosis->job, &place->look, &words);
        add_chance(said, place->chance, &words);
        n++;
    }
}

static void check_board(const struct rf_diagnosis *diagnosis, struct said *said)
{
    size_t n = 0;
    for (size_t i = 0; i < diagnosis->n_ranked && n < CHECKS_MOST; i++) {
        const struct ranked *ranked = &diagnosis->ranked[i];
        if (ranked->confidence < check_said || !shows_at_board_only(diagnosis, ranked))
            continue;
        struct text words = {0};
        text_addf(&words, "at the board: %s?", ranked->words);
        add_chance(said, ranked->confidence, &words);
        n++;
    }
}

static void check_readings(const struct rf_diagnosis *diagnosis, struct said *said)
{
    size_t n = diagnosis->n_ranked > 0 ? diagnosis->n_suspects : 0;
    for (size_t i = 0; i < n && i < SUSPECTS_MOST; i++) {
        size_t at = diagnosis->suspects[i].reading;
        const struct reading *reading = &diagnosis->job->readings[at];
        struct text words = {0};
        text_add(&words, "read again: ");
        say_set_up(reading->setup, &words);
        text_add(&words, ", ");
        say_spot(diagnosis->job, reading->spot, reading->place, &words);
        text_add(&words, ": ");
        say_ohms_unit(reading->open ? (double)NAN : reading->ohms, &words);
        text_add(&words, " read, ");
        say_ohms_unit(diagnosis->ranked[0].fitted[at], &words);
        text_add(&words, " would fit");
        said_add(said, LINE_UNDER, 0, 0, &words);
    }
    if (n > SUSPECTS_MOST) {
        struct text words = {0};
        text_addf(&words, "and %zu more, marked * in the table below", n - SUSPECTS_MOST);
        said_add(said, LINE_UNDER, 0, 0, &words);
    }
}

/* What the ring without its fault would show at most, of what has a path; -INFINITY: nothing. */
static double most_of_sound_ring(const struct rf_diagnosis *diagnosis)
{
    double most = -INFINITY;
    for (size_t i = 0; i < diagnosis->job->n_readings; i++)
        most = fmax(most, diagnosis->sound[i]); /* fmax passes over NAN */
    return most;
}

/* A lead that has come off, or probes that touch, make every reading the same, and none of the faults
 * compared is that. Common practice, no source. */
static void check_meter(const struct rf_diagnosis *diagnosis, struct said *said)
{
    const struct rf_job *job = diagnosis->job;
    double most = most_of_sound_ring(diagnosis);
    size_t open = 0, zero = 0;
    for (size_t i = 0; i < job->n_readings; i++) {
        open += job->readings[i].open;
        zero += !job->readings[i].open && job->readings[i].ohms <= 0;
    }
    struct text words = {0};
    if (job->n_readings < 2)
        return;
    if (open == job->n_readings && most > -INFINITY)
        text_add(&words, "prove the meter: every reading is over range. Touch the probes together: "
                         "it must show next to nothing");
    else if (zero == job->n_readings && most >= not_nothing)
        text_add(&words, "prove the meter: every reading is 0.00" NO_BREAK
                         "Ω. Part the probes: it must show over range; and null the leads again");
    else
        return;
    said_add(said, LINE_UNDER, 0, 0, &words);
}

void say_checks(const struct rf_diagnosis *diagnosis, struct said *said)
{
    check_meter(diagnosis, said);
    check_faces(diagnosis, said);
    check_board(diagnosis, said);
    check_readings(diagnosis, said);
}

/* --- where --- */

static void say_no_defect(const struct rf_diagnosis *diagnosis, struct said *said)
{
    struct text words = {0};
    text_add(&words, "These readings show no defect (");
    say_chance(diagnosis->findings[0].confidence, &words);
    text_add(&words, "). ");
    if (diagnosis->n_blind == 0) {
        text_add(&words, "A slight or intermittent fault may still have escaped them.");
    } else {
        text_add(&words, "They could not have shown ");
        for (size_t i = 0; i < diagnosis->n_blind && i < BLIND_INLINE; i++)
            text_addf(&words, "%s%s", i > 0 ? "; " : "", diagnosis->blind[i].words);
        if (diagnosis->n_blind > BLIND_INLINE)
            text_addf(&words, "; and %zu more kinds of fault, below under blind spots",
                      diagnosis->n_blind - BLIND_INLINE);
        text_add(&words, ".");
    }
    add_plain(said, &words);
}

/* Whether a check of some face is likelier to show it than that place. */
static bool face_before(const struct rf_diagnosis *diagnosis, const struct place_chance *place)
{
    for (size_t i = 0; i < diagnosis->n_places; i++)
        if (diagnosis->places[i].look.kind == LOOK_CHECK &&
            diagnosis->places[i].chance > place->chance)
            return true;
    return false;
}

/* "Take P4 off first: 71 %", in a line of its own. */
static void say_first(const struct rf_diagnosis *diagnosis, const struct place_chance *place,
                      struct said *said)
{
    struct text words = {0};
    if (diagnosis->misfit.flag)
        text_add(&words, "If new readings say the same, ");
    else if (shows_no_defect(diagnosis))
        text_add(&words, "If something is wrong all the same, ");
    else if (face_before(diagnosis, place))
        text_add(&words, "If the checks above show nothing, ");
    bool begins = words.length == 0;
    say_look(diagnosis->job, &place->look, &words);
    if (begins && !words.failed)
        words.bytes[0] = (char)(words.bytes[0] - 'a' + 'A');
    text_add(&words, " first: ");
    say_chance(place->chance, &words);
    text_add(&words, ".");
    add_plain(said, &words);
}

static bool is_said(const struct place_chance *place)
{
    return place->look.kind == LOOK_OPEN && place->chance >= place_said;
}

/* What to look at first: the most chance a minute, as the plan has it; n_places where nothing is
 * worth saying. */
static size_t first_place(const struct rf_diagnosis *diagnosis)
{
    const struct rf_job *job = diagnosis->job;
    size_t first = diagnosis->n_places;
    double most = 0;
    for (size_t i = 0; i < diagnosis->n_places; i++) {
        const struct place_chance *place = &diagnosis->places[i];
        double minutes = minutes_of_look(job, &diagnosis->models->effort, &place->look) +
                         minutes_to_reach(job, place_to_reach(job, &place->look));
        if (!is_said(place) || place->chance <= most * fmax(minutes, 1e-9) * (1 + 1e-9))
            continue;
        most = place->chance / fmax(minutes, 1e-9);
        first = i;
    }
    return first;
}

static void say_places(const struct rf_diagnosis *diagnosis, struct said *said)
{
    size_t first = first_place(diagnosis), n = 1;
    if (first == diagnosis->n_places)
        return;
    say_first(diagnosis, &diagnosis->places[first], said);
    for (size_t i = 0; i < diagnosis->n_places && n < PLACES_MOST; i++) {
        const struct place_chance *place = &diagnosis->places[i];
        if (i == first || !is_said(place))
            continue;
        struct text words = {0};
        say_look(diagnosis->job, &place->look, &words);
        add_chance(said, place->chance, &words);
        n++;
    }
}

void say_where_first(const struct rf_diagnosis *diagnosis, struct said *said)
{
    if (shows_no_defect(diagnosis))
        say_no_defect(diagnosis, said);
    say_places(diagnosis, said);
}

/* --- findings --- */

/* Whether all members are of one family, so that the parameter of the best speaks for all. */
static bool one_family(const struct rf_diagnosis *diagnosis, const struct finding *finding)
{
    const struct fault_family *family = NULL;
    for (size_t i = 0; i < finding->n_members; i++) {
        const struct hypothesis *member = &diagnosis->ranked[finding->members[i]].hypothesis;
        if (member->n_faults != 1 || (family != NULL && member->faults[0].family != family))
            return false;
        family = member->faults[0].family;
    }
    return family != NULL;
}

static void say_estimate(const struct estimate *estimate, struct text *out)
{
    if (!estimate->known)
        return;
    if (estimate->metres) {
        text_addf(out, ": %.1f m of cable (90" NO_BREAK "%%: %.1f to %.1f" NO_BREAK "m)",
                  estimate->value, estimate->low, estimate->high);
        return;
    }
    text_add(out, ": ");
    say_ohms_unit(estimate->value, out);
    text_add(out, " (90" NO_BREAK "%: ");
    say_ohms(estimate->low, out);
    text_add(out, " to ");
    say_ohms_unit(estimate->high, out);
    text_add(out, ")");
}

void say_findings(const struct rf_diagnosis *diagnosis, struct said *said)
{
    double told = 0;
    for (size_t i = 0; i < diagnosis->n_findings && i < FINDINGS_MOST; i++) {
        const struct finding *finding = &diagnosis->findings[i];
        if (i > 0 && finding->confidence < finding_said)
            break;
        struct text words = {0};
        text_add(&words, finding->words);
        if (one_family(diagnosis, finding))
            say_estimate(&diagnosis->ranked[finding->members[0]].estimates[0], &words);
        said_add(said, LINE_CHANCE, finding->confidence, i, &words);
        told += finding->confidence;
    }
    if (told < 1 - finding_said) {
        struct text words = {0};
        text_add(&words, "something else");
        said_add(said, LINE_CHANCE, 1 - told, diagnosis->n_findings, &words);
    }
}

/* --- blind spots --- */

static const struct lift *find_lift(const struct rf_advice *advice, size_t blind)
{
    for (size_t i = 0; advice != NULL && i < advice->n_lifts; i++)
        if (advice->lifts[i].blind == blind)
            return &advice->lifts[i];
    return NULL;
}

void say_blind_spots(const struct rf_diagnosis *diagnosis, const struct rf_advice *advice,
                     struct said *said)
{
    for (size_t i = 0; i < diagnosis->n_blind && i < BLIND_MOST; i++) {
        const struct lift *lift = find_lift(advice, i);
        struct text words = {0};
        text_add(&words, diagnosis->blind[i].words);
        if (lift != NULL) {
            text_addf(&words, ". To see it, %s (about ", lift->words);
            say_minutes(lift->minutes, &words);
            text_add(&words, ")");
        }
        add_plain(said, &words);
    }
    if (diagnosis->n_blind > BLIND_MOST) {
        struct text words = {0};
        text_addf(&words, "and %zu more kinds of fault", diagnosis->n_blind - BLIND_MOST);
        add_plain(said, &words);
    }
}

/* --- cautions, the ring --- */

void say_cautions(const struct rf_diagnosis *diagnosis, struct said *said)
{
    static const char *const cautions[] = {
        "Dead tests only. Isolate the whole board, lock it off, and prove dead at the conductors you "
        "disconnect, neutrals too: an interconnection can be live from elsewhere.",
        "Energise nothing while a CPC is off. Put no broken ring back on a 32 A device. Remove every "
        "link; retest after the repair.",
        "This guides where to look and certifies nothing. BS 7671 or the local code, and a competent, "
        "licensed person, decide. Low insulation resistance, and faults that show only under load, "
        "are outside this method.",
    };
    (void)diagnosis;
    for (size_t i = 0; i < sizeof cautions / sizeof cautions[0]; i++)
        add_plain_words(said, cautions[i]);
}

void say_ring(const struct rf_job *job, struct text *out)
{
    text_addf(out, "ring of %zu point%s", job->n_ring, job->n_ring == 1 ? "" : "s");
    if (job->n_spurs > 0)
        text_addf(out, " and %zu spur point%s", job->n_spurs, job->n_spurs == 1 ? "" : "s");
    text_addf(out, ", %zu reading%s", job->n_readings, job->n_readings == 1 ? "" : "s");
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
#define _DEFAULT_SOURCE /* localtime_r */

#include "cli/form.h"

#include "base/error.h"
#include "base/memory.h"
#include "fit/expected.h"
#include "job/sheet_grid.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

enum topic {
    ASK_POINTS,
    ASK_JOB,
    ASK_DATE,
    ASK_LIVE,
    ASK_CPC,
    ASK_TEMPERATURE,
    ASK_SPURS,
    ASK_FROM,   /* index: the spur point */
    ASK_METRES, /* place: of the run to it */
    ASK_SETUPS,
    ASK_READING
};

struct question {
    enum topic topic;
    size_t index;
    size_t setup;
    const char *place; /* a key of readings, or an id; in the document or a constant */
};

struct questions {
    struct question *list;
    size_t n, capacity;
    bool failed;
};

struct asking {
    struct form *form;
    const struct rf_models *models;
    bool points_known;
    struct questions questions;
    struct text line;
    size_t headed; /* the set-up whose heading stands last; N_SETUPS: none */
};

/* --- which questions there are --- */

static void add(struct questions *questions, struct question question)
{
    if (questions->n == questions->capacity) {
        size_t capacity = questions->capacity > 0 ? 2 * questions->capacity : 64;
        struct question *list = realloc(questions->list, capacity * sizeof *list);
        if (list == NULL) {
            questions->failed = true;
            return;
        }
        questions->list = list;
        questions->capacity = capacity;
    }
    questions->list[questions->n++] = question;
}

static const char *text_of(const cJSON *object, const char *key)
{
    const cJSON *value = cJSON_GetObjectItemCaseSensitive(object, key);
    return cJSON_IsString(value) ? value->valuestring : "";
}

/* Calls for every point in the order one walks: a spur's points behind the one they hang on. */
static void walk_spurs(struct questions *questions, const cJSON *spurs, const char *from,
                       struct question question, size_t depth)
{
    const cJSON *spur;
    cJSON_ArrayForEach(spur, spurs)
    {
        if (strcmp(text_of(spur, "from"), from) != 0 || depth > JOB_MAX_POINTS)
            continue;
        question.place = text_of(spur, "id");
        add(questions, question);
        walk_spurs(questions, spurs, question.place, question, depth + 1);
    }
}

static void walk(const struct form *form, struct questions *questions, struct question question)
{
    const cJSON *ring = form_ring(form), *point;
    const cJSON *spurs = cJSON_GetObjectItemCaseSensitive(ring, "spurs");
    walk_spurs(questions, spurs, "out", question, 0);
    cJSON_ArrayForEach(point, cJSON_GetObjectItemCaseSensitive(ring, "points"))
    {
        question.place = text_of(point, "id");
        add(questions, question);
        walk_spurs(questions, spurs, question.place, question, 0);
    }
    if (question.topic == ASK_METRES) {
        question.place = "in";
        add(questions, question);
    }
    walk_spurs(questions, spurs, "in", question, 0);
}

static void list_questions(struct asking *asking)
{
    struct questions *questions = &asking->questions;
    const struct form *form = asking->form;
    questions->n = 0;
    if (!asking->points_known)
        add(questions, (struct question){.topic = ASK_POINTS});
    for (size_t topic = ASK_JOB; topic <= ASK_SPURS; topic++)
        add(questions, (struct question){.topic = (enum topic)topic});
    for (size_t i = 0; i < form->n_spurs; i++)
        add(questions, (struct question){.topic = ASK_FROM, .index = i});
    walk(form, questions, (struct question){.topic = ASK_METRES});
    add(questions, (struct question){.topic = ASK_SETUPS});
    for (size_t i = 0; i < form->n_setups; i++) {
        const struct setup *setup = &setups[form->setups[i]];
        struct question question = {.topic = ASK_READING, .setup = form->setups[i]};
        for (size_t spot = SPOT_BOARD; spot < N_SPOTS; spot++)
            if (spot != SPOT_HIGHEST && (setup->spots >> spot & 1u) != 0) {
                question.place = spot_keys[spot];
                add(questions, question);
            }
        if ((setup->spots & 1u << SPOT_POINT) != 0)
            walk(form, questions, question);
    }
}

/* --- words --- */

static void say(const char *words)
{
    fputs(words, stdout);
}

/* What to do at the board for a set-up. */
static void head_setup(size_t which)
{
    const struct setup *setup = &setups[which];
    printf("\n%s: ", setup->name);
    switch (setup->joining) {
    case JOIN_NOTHING_END_TO_END:
        say("all ends free. Each conductor from its out end to its in end.\n");
        break;
    case JOIN_CROSS:
        printf("join %s out with %s in, and %s out with %s in.\n",
               conductor_words[pair_members[setup->pair].first],
               conductor_words[pair_members[setup->pair].second],
               conductor_words[pair_members[setup->pair].second],
               conductor_words[pair_members[setup->pair].first]);
        break;
    case JOIN_LINK_OUT:
    case JOIN_LINK_IN:
        printf("join %s and %s at their %s ends, nothing else.\n",
               conductor_words[pair_members[setup->pair].first],
               conductor_words[pair_members[setup->pair].second],
               setup->joining == JOIN_LINK_OUT ? "out" : "in");
        break;
    case JOIN_LEAD_OUT:
    case JOIN_LEAD_IN:
        printf("all ends free, the wander lead, nulled, on the %s's %s end.\n",
               conductor_words[setup->conductor],
               setup->joining == JOIN_LEAD_OUT ? "out" : "in");
        break;
    default:
        printf("all ends free. Between %s and %s.\n",
               conductor_words[pair_members[setup->pair].first],
               conductor_words[pair_members[setup->pair].second]);
    }
}

/* The object and key an answer goes under; *key NULL: none (counts, names). */
static cJSON *find_slot(const struct form *form, const struct question *question,
                        const char **key)
{
    cJSON *ring = form_ring(form);
    static const char *const of_job[] = {[ASK_JOB] = "job", [ASK_DATE] = "date"};
    static const char *const of_ring[] = {
        [ASK_LIVE] = "live_mm2", [ASK_CPC] = "cpc_mm2", [ASK_TEMPERATURE] = "temperature_c"};
    *key = NULL;
    switch (question->topic) {
    case ASK_JOB:
    case ASK_DATE: *key = of_job[question->topic]; return form->document;
    case ASK_LIVE:
    case ASK_CPC:
    case ASK_TEMPERATURE: *key = of_ring[question->topic]; return ring;
    case ASK_READING: {
        *key = question->place;
        cJSON *readings = cJSON_GetObjectItemCaseSensitive(form->document, "readings");
        return cJSON_GetObjectItemCaseSensitive(readings, setups[question->setup].name);
    }
    case ASK_METRES: {
        *key = "run_m";
        static const char *const lists[] = {"points", "spurs"};
        for (size_t i = 0; i < 2; i++) {
            cJSON *point;
            cJSON_ArrayForEach(point, cJSON_GetObjectItemCaseSensitive(ring, lists[i]))
            {
                if (strcmp(text_of(point, "id"), question->place) == 0)
                    return point;
            }
        }
        *key = "last_run_m";
        return ring;
    }
    default: return NULL;
    }
}

static void add_value(const cJSON *value, struct text *out)
{
    const cJSON *first = cJSON_IsArray(value) ? value->child : value;
    for (const cJSON *one = first; one != NULL; one = first == value ? NULL : one->next) {
        if (one != first)
            text_add(out, " ");
        if (cJSON_IsString(one))
            text_add(out, one->valuestring);
        else if (cJSON_IsNumber(one))
            text_addf(out, "%.10g", one->valuedouble);
        else
            text_add(out, "unknown");
    }
}

static void today(char out[16])
{
    time_t seconds = time(NULL);
    struct tm local;
    if (localtime_r(&seconds, &local) == NULL || strftime(out, 16, "%Y-%m-%d", &local) == 0)
        out[0] = '\0';
}

static void put_question(const struct asking *asking, const struct question *question)
{
    static const char *const words[] = {
        [ASK_POINTS] = "Points on the ring",
        [ASK_JOB] = "Name of the job",
        [ASK_DATE] = "Date (t: today)",
        [ASK_LIVE] = "Line and neutral, mm² (Enter: 2.5)",
        [ASK_CPC] = "CPC, mm² (Enter: 1.5; ?: not known)",
        [ASK_TEMPERATURE] = "Temperature, °C (Enter: 20)",
        [ASK_SPURS] = "Spur points (Enter: none)",
        [ASK_SETUPS] = "Set-ups to read",
    };
    const char *key;
    const struct form *form = asking->form;
    cJSON *slot = find_slot(form, question, &key);
    struct text old = {0};
    if (key != NULL && slot != NULL)
        add_value(cJSON_GetObjectItemCaseSensitive(slot, key), &old);
    if (question->topic == ASK_SETUPS)
        for (size_t i = 0; i < form->n_setups; i++)
            text_addf(&old, "%s%s", i > 0 ? "," : "", setups[form->setups[i]].name);
    if (question->topic == ASK_POINTS)
        text_addf(&old, "%zu", form->n_points);
    if (question->topic == ASK_FROM)
        printf("S%zu hangs on (P1 …, out, in)", question->index + 1);
    else if (question->topic == ASK_METRES)
        printf("Metres of cable from the place before to %s", question->place);
    else if (question->topic == ASK_READING)
        printf("  %s", question->place);
    else
        say(words[question->topic]);
    if (old.length > 0 && !old.failed)
        printf(" [%s]", old.bytes);
    say(": ");
    fflush(stdout);
    text_finish(&old);
}

/* --- answers --- */

/* Readings as typed, or one number; NULL: there is none in it. *fit: not too long, all words. */
static cJSON *read_values(const char *answer, bool several)
{
    struct text word = {0};
    cJSON *list = cJSON_CreateArray();
    bool good = list != NULL;
    for (const char *at = answer; good && sheet_next_word(&at, &word);) {
        char json[64];
        cJSON *value = NULL;
        if (several && sheet_is_over_range(word.bytes))
            value = cJSON_CreateString("open");
        else if (!word.failed && (sheet_number(word.bytes, '.', json, sizeof json) ||
                                  sheet_number(word.bytes, ',', json, sizeof json)))
            value = cJSON_Parse(json);
        good = value != NULL && cJSON_AddItemToArray(list, value);
    }
    text_finish(&word);
    int n = good ? cJSON_GetArraySize(list) : 0;
    if (n == 1) {
        cJSON *only = cJSON_DetachItemFromArray(list, 0);
        cJSON_Delete(list);
        return only;
    }
    if (n == 0 || !several) {
        cJSON_Delete(list);
        return NULL;
    }
    return list;
}

/* The value an answer stands for; NULL with RF_REFUSED: it stands for none. */
static enum rf_status read_answer(const struct question *question, const char *answer,
                                  cJSON **value, struct rf_error *error)
{
    char day[16];
    *value = NULL;
    if (question->topic == ASK_JOB) {
        *value = cJSON_CreateString(answer);
    } else if (question->topic == ASK_DATE) {
        today(day);
        *value = cJSON_CreateString(strcmp(answer, "t") == 0 ? day : answer);
    } else if ((question->topic == ASK_CPC || question->topic == ASK_METRES) &&
               (strcmp(answer, "?") == 0 || sheet_same_word(answer, "unknown"))) {
        *value = cJSON_CreateNull();
    } else {
        *value = read_values(answer, question->topic == ASK_READING);
        if (*value == NULL)
            return fail(error, RF_REFUSED, "found \"%.40s\"; needs %s", answer,
                        question->topic == ASK_READING
                            ? "ohms from 0 to 99.9, or OL for over range"
                            : "a number");
    }
    return *value != NULL ? RF_OK : fail_memory(error);
}

static enum rf_status set_value(struct form *form, const struct question *question,
                                const char *answer, struct rf_error *error)
{
    const char *key;
    cJSON *value = NULL, *slot;
    bool clears = strcmp(answer, "-") == 0;
    enum rf_status status = clears ? RF_OK : read_answer(question, answer, &value, error);
    if (status != RF_OK)
        return status;
    if (question->topic == ASK_READING && !clears) {
        cJSON *readings = form_object(form->document, "readings");
        if (readings == NULL || form_object(readings, setups[question->setup].name) == NULL) {
            cJSON_Delete(value);
            return fail_memory(error);
        }
    }
    slot = find_slot(form, question, &key);
    cJSON_DeleteItemFromObjectCaseSensitive(slot, key);
    if (!clears && !cJSON_AddItemToObject(slot, key, value)) {
        cJSON_Delete(value);
        return fail_memory(error);
    }
    return RF_OK;
}

static enum rf_status read_count(const char *answer, unsigned long least, size_t *n,
                                 struct rf_error *error)
{
    char *end;
    unsigned long number = strtoul(answer, &end, 10);
    if (answer[0] < '0' || answer[0] > '9' || *end != '\0' || number < least ||
        number > JOB_MAX_POINTS)
        return fail(error, RF_REFUSED, "found \"%.40s\"; needs a number from %lu to %d", answer,
                    least, JOB_MAX_POINTS);
    *n = (size_t)number;
    return RF_OK;
}

static enum rf_status set_spurs(struct form *form, const char *answer, struct rf_error *error)
{
    size_t n = 0;
    enum rf_status status = RF_OK;
    if (strcmp(answer, "-") != 0)
        status = read_count(answer, 0, &n, error);
    if (status != RF_OK)
        return status;
    for (size_t i = n; i < form->n_spurs && status == RF_OK; i++)
        status = form_hang_spur(form, i, NULL, error);
    form->n_spurs = n;
    return status;
}

static enum rf_status take(struct form *form, const struct question *question, const char *answer,
                           struct rf_error *error)
{
    enum rf_status status;
    switch (question->topic) {
    case ASK_POINTS:
        status = read_count(answer, 1, &form->n_points, error);
        return status == RF_OK ? form_lay_points(form, error) : status;
    case ASK_SPURS: return set_spurs(form, answer, error);
    case ASK_FROM:
        return form_hang_spur(form, question->index, strcmp(answer, "-") == 0 ? NULL : answer,
                              error);
    case ASK_SETUPS: return form_choose_setups(form, answer, error);
    default: return set_value(form, question, answer, error);
    }
}

/* Takes the answer and saves; what would make a job that is refused is put back. */
static enum rf_status accept(struct form *form, const struct question *question,
                             const char *answer, struct rf_error *error)
{
    struct form before = *form;
    struct rf_job *job = NULL;
    before.document = cJSON_Duplicate(form->document, true);
    if (before.document == NULL)
        return fail_memory(error);
    enum rf_status status = take(form, question, answer, error);
    if (status == RF_OK)
        status = form_job(form, &job, error);
    rf_job_destroy(job);
    if (status != RF_OK) {
        cJSON_Delete(form->document);
        *form = before;
        return status;
    }
    cJSON_Delete(before.document);
    return form_save(form, error);
}

/* --- a reading that does not fit those before --- */

/* The job's last reading at the question's place, taken out of it; false: none. */
static bool take_out(struct rf_job *job, const struct question *question,
                     struct measurement *measurement, struct reading *taken)
{
    size_t kept = 0;
    bool found = false;
    for (size_t i = 0; i < job->n_readings; i++) {
        const struct reading *reading = &job->readings[i];
        if (reading->setup == question->setup &&
            strcmp(reading_key(job, reading), question->place) == 0) {
            *taken = *reading;
            found = true;
        } else {
            job->readings[kept++] = *reading;
        }
    }
    job->n_readings = kept;
    *measurement = (struct measurement){taken->setup, taken->spot, taken->place};
    return found;
}

static void doubt(const struct asking *asking, const struct question *question)
{
    struct rf_job *job = NULL;
    struct measurement measurement;
    struct reading read = {0};
    struct expected expected;
    struct rf_error error;
    if (form_job(asking->form, &job, &error) == RF_OK &&
        take_out(job, question, &measurement, &read) &&
        expect_next(job, asking->models, &measurement, &expected, &error) == RF_OK) {
        if (expected.open != read.open || (!read.open && (read.ohms < expected.low ||
                                                          read.ohms > expected.high))) {
            printf("    ! %s; from the %s a sound ring would read ",
                   read.open ? "over range" : "this does not fit",
                   job->n_readings > 0 ? "readings before it" : "record");
            if (expected.open)
                say("over range here.");
            else
                printf("%.2f (%.2f to %.2f).", expected.ohms, expected.low, expected.high);
            say(read.spot == SPOT_POINT ? " Probes home, switch on? b reads it again.\n"
                                        : " b reads it again.\n");
        }
    }
    rf_job_destroy(job);
}

/* --- the asking --- */

/* The next line, without its end and the blanks around it; NULL at the end. */
static const char *read_line(struct text *line)
{
    int byte;
    text_clear(line);
    while ((byte = getchar()) != EOF && byte != '\n') {
        char character = (char)byte;
        if (line->length < 4096)
            text_append(line, &character, 1);
    }
    if (byte == EOF && line->length == 0)
        return NULL;
    while (line->length > 0 && strchr(" \t\r", line->bytes[line->length - 1]) != NULL)
        line->bytes[--line->length] = '\0';
    if (line->length == 0)
        return "";
    return line->bytes + strspn(line->bytes, " \t");
}

/* One question: *at moves on, back, or stays; false ends it. */
static enum rf_status ask(struct asking *asking, size_t *at, bool *more, struct rf_error *error)
{
    struct question question = asking->questions.list[*at];
    if (question.topic == ASK_READING && question.setup != asking->headed) {
        head_setup(question.setup);
        asking->headed = question.setup;
    }
    put_question(asking, &question);
    const char *answer = read_line(&asking->line);
    if (asking->line.failed)
        return fail_memory(error);
    *more = answer != NULL && strcmp(answer, "q") != 0;
    if (!*more)
        return RF_OK;
    if (strcmp(answer, "b") == 0) {
        *at -= *at > 0;
        return RF_OK;
    }
    if (answer[0] == '\0' && (question.topic != ASK_POINTS || form_ring(asking->form) != NULL)) {
        ++*at;
        return RF_OK;
    }
    char count[24];
    snprintf(count, sizeof count, "%zu", asking->form->n_points);
    enum rf_status status =
        text_is_utf8(answer, strlen(answer), NULL)
            ? accept(asking->form, &question, answer[0] != '\0' ? answer : count, error)
            : fail(error, RF_REFUSED, "found what is not UTF-8");
    if (rf_status_class(status) == RF_CLASS_INPUT) {
        printf("    %s\n", error->text);
        return RF_OK;
    }
    if (status == RF_OK && question.topic == ASK_READING && strcmp(answer, "-") != 0)
        doubt(asking, &question);
    ++*at;
    return status;
}

enum rf_status form_ask(struct form *form, const struct rf_models *models, bool points_known,
                        struct rf_error *error)
{
    struct asking asking = {
        .form = form, .models = models, .points_known = points_known, .headed = N_SETUPS};
    enum rf_status status = RF_OK;
    bool more = true;
    say("For a circuit that is isolated, locked off and proved dead.\n"
        "Enter skips, b goes back, - takes an answer away, q stops. Saved after each answer.\n\n");
    for (size_t at = 0; status == RF_OK && more;) {
        list_questions(&asking);
        if (asking.questions.failed)
            status = fail_memory(error);
        else if (at >= asking.questions.n)
            break;
        else
            status = ask(&asking, &at, &more, error);
    }
    if (status == RF_OK && form->hold != NULL)
        printf("\nSaved in %s.\n", form->path);
    else if (status == RF_OK)
        say("\nNothing answered, nothing saved.\n");
    if (status == RF_OK && (fflush(stdout) != 0 || ferror(stdout)))
        status = fail(error, RF_IO, "standard output: cannot write");
    free(asking.questions.list);
    text_finish(&asking.line);
    return status;
}

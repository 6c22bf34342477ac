/* SPDX-License-Identifier: GPL-3.0-or-later */
/* new: forms, and its questions asked through a pseudo-terminal as on site. */
#define _GNU_SOURCE /* forkpty */

#include "program.h"

#include <pty.h>
#include <signal.h>
#include <stdbool.h>
#include <termios.h>

/* A session at a terminal: what it has said since the last wait. */
struct session {
    pid_t child;
    int terminal;
    char said[65536];
    size_t length;
};

static void start(struct session *session, const char *file)
{
    struct winsize size = {.ws_row = 24, .ws_col = 80};
    session->length = 0;
    session->child = forkpty(&session->terminal, NULL, NULL, &size);
    ck_assert(session->child >= 0);
    if (session->child == 0) {
        execl(getenv("RINGFETTLE"), "ringfettle", "new", file, (char *)NULL);
        _exit(127);
    }
}

/* Reads until the words have been said. */
static void wait_for(struct session *session, const char *words)
{
    session->length = 0;
    session->said[0] = '\0';
    while (strstr(session->said, words) == NULL) {
        ck_assert_uint_lt(session->length + 1, sizeof session->said);
        ssize_t n = read(session->terminal, session->said + session->length,
                         sizeof session->said - 1 - session->length);
        ck_assert_msg(n > 0, "it ended before \"%s\":\n%s", words, session->said);
        session->length += (size_t)n;
        session->said[session->length] = '\0';
    }
}

static void answer(struct session *session, const char *words)
{
    ck_assert(write(session->terminal, words, strlen(words)) == (ssize_t)strlen(words));
    ck_assert(write(session->terminal, "\n", 1) == 1);
}

static int end(struct session *session)
{
    int status;
    char rest[4096];
    while (read(session->terminal, rest, sizeof rest) > 0)
        ;
    ck_assert(waitpid(session->child, &status, 0) == session->child);
    close(session->terminal);
    return WIFEXITED(status) ? WEXITSTATUS(status) : -1;
}

START_TEST(asked)
{
    static const struct {
        const char *wait, *answer;
    } talk[] = {
        {"Points on the ring [8]: ", "3"},
        {"Name of the job: ", "hall, upstairs"},
        {"Date", "2026-02-30"}, /* refused, asked again */
        {"needs a day of the calendar", "2026-02-11"},
        {"Line and neutral", ""},
        {"CPC", "?"},
        {"Temperature", "b"}, /* back */
        {"CPC, mm² (Enter: 1.5; ?: not known) [unknown]: ", "1.5"},
        {"Temperature", "18,5"},
        {"Spur points", "1"},
        {"S1 hangs on", "P9"},
        {"no such point", "P2"},
        {"before to P1: ", "5"},
        {"before to P2: ", "4"},
        {"before to S1: ", "3"}, /* a spur is walked to from its point */
        {"before to P3: ", "6"},
        {"before to in: ", "7"},
        {"Set-ups to read", "end_to_end, cross_ln"},
        {"Each conductor from its out end to its in end.", "0.17"},
        {"  n: ", "0.17"},
        {"  e: ", ""},
        {"join line out with neutral in", "0.08"},
        {"  P1: ", "0.09"},
        {"  P2: ", "0.9"}, /* does not fit */
        {"! this does not fit; from the readings before it a sound ring would read 0.0", "b"},
        {"  P2 [0.9]: ", "0.08 0.09"},
        {"  S1: ", "OL"},
        {"! over range", ""},
    };
    struct session session;
    enter_folder();
    start(&session, "hall.csv");
    for (size_t i = 0; i < sizeof talk / sizeof talk[0]; i++) {
        wait_for(&session, talk[i].wait);
        /* S1's doubt comes with the next question; Enter there skips P3. */
        if (strcmp(talk[i].wait, "  S1: ") == 0) {
            char *saved = read_whole("hall.csv"); /* what was answered is there already */
            ck_assert(strstr(saved, "0.08 0.09") != NULL);
            free(saved);
        }
        answer(&session, talk[i].answer);
    }
    ck_assert_int_eq(end(&session), 0);
    char *saved = read_whole("hall.csv");
    ck_assert_str_eq(saved, "format,ringfettle-sheet/1\n"
                            "job,\"hall, upstairs\"\n"
                            "date,2026-02-11\n"
                            "cpc_mm2,1.5\n"
                            "temperature_c,18.5\n"
                            "r1,0.17\n"
                            "rn,0.17\n"
                            "r2,\n"
                            "\n"
                            "place,label,metres,from,cross_ln\n"
                            "board,,,,0.08\n"
                            "P1,,5,,0.09\n"
                            "P2,,4,,0.08 0.09\n"
                            "P3,,6,,\n"
                            "in,,7,,\n"
                            "S1,,3,P2,open\n");
    free(saved);
    expect_run("$RINGFETTLE check hall.csv", 0, "3 points, 1 spur point, 7 readings", NULL);
    leave_folder();
}
END_TEST

START_TEST(killed_while_asking)
{
    struct session session;
    int status;
    enter_folder();
    start(&session, "hall.json");
    wait_for(&session, "Points on the ring");
    answer(&session, "4");
    wait_for(&session, "Name of the job");
    answer(&session, "hall");
    wait_for(&session, "Date");
    /* Nobody else may write meanwhile; with it dead, anybody may, and what was answered is there. */
    expect_run("$RINGFETTLE record hall.json cross_ln P1=0.4", 2, NULL, "somebody else is writing");
    kill(session.child, SIGKILL);
    ck_assert(waitpid(session.child, &status, 0) == session.child);
    close(session.terminal);
    expect_run("$RINGFETTLE record hall.json cross_ln P4=0.4", 0, NULL, NULL);
    expect_run("$RINGFETTLE check hall.json", 0, "4 points", NULL);
    expect_run("grep -c '\"job\": \"hall\"' hall.json", 0, "1", NULL);
    leave_folder();
}
END_TEST

START_TEST(plain_lines)
{
    enter_folder();
    expect_run("printf '2\\n' | $RINGFETTLE new a.csv", 0, "Saved in a.csv", NULL);
    expect_run("printf '' | $RINGFETTLE new b.csv; test ! -e b.csv", 0, "nothing saved", NULL);
    expect_run("printf '2\\nq\\n' | $RINGFETTLE new c.csv", 0, "Saved in c.csv", NULL);
    leave_folder();
}
END_TEST

START_TEST(forms)
{
    enter_folder();
    expect_run("$RINGFETTLE new --points 2 --setups end_to_end,link_out_ln,cross_le --decimal comma "
               "a.csv; cat a.csv",
               0,
               "format;ringfettle-sheet/1\nr1;\nrn;\nr2;\n\nplace;label;metres;link_out_ln;cross_le\n"
               "board;;;;\nP1;;;;\nP2;;;;\nin;;;;\n",
               NULL);
    expect_run("$RINGFETTLE new --points 2 a.csv", 2, NULL, "is there already");
    expect_run("$RINGFETTLE new --points 201 b.csv", 2, NULL, "a number from 1 to 200");
    expect_run("$RINGFETTLE new --points 2 --setups cross_nl b.csv", 2, NULL, "did you mean cross_ln");
    expect_run("$RINGFETTLE new --points 2 no/b.csv", 4, NULL, "no/b.csv: cannot be made");
    expect_run("$RINGFETTLE new --points 2 b.json; $RINGFETTLE record b.json cross_ln P1=0.4 P2=0.41; "
               "$RINGFETTLE check b.json",
               0, "2 readings", NULL);
    expect_run("$RINGFETTLE record a.csv link_out_ln in=0.71 P1=0.35; grep in a.csv", 0,
               "in;;;0,71;", NULL);
    expect_run("$RINGFETTLE new --points 200 big.csv; wc -l <big.csv", 0, "208", NULL);
    leave_folder();
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("new");
    TCase *tests = tcase_create("new");
    tcase_set_timeout(tests, 60);
    tcase_add_test(tests, asked);
    tcase_add_test(tests, killed_while_asking);
    tcase_add_test(tests, plain_lines);
    tcase_add_test(tests, forms);
    suite_add_tcase(suite, tests);
    return run_suite(suite);
}

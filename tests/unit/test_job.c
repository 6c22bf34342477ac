/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Reading a job: what is refused, with the whole message, and what is taken. All jobs are invented. */
#include "base/text.h"
#include "job/job.h"
#include "job/job_write.h"

#include "../failing.h"
#include "../suite.h"

#include <check.h>
#include <cjson/cJSON.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#define TOP(x) \
    "{\"format\": \"ringfettle-job/1\", \"ring\": {\"points\": "    \
    "[{\"id\": \"P1\"}, {\"id\": \"P2\"}]}, \"readings\": {\"cross_ln\": "    \
    "{\"P1\": 0.4}}, " x \
    "}"
#define SPURS(x) \
    "{\"format\": \"ringfettle-job/1\", \"ring\": {\"points\": "    \
    "[{\"id\": \"P1\"}, {\"id\": \"P2\"}], \"spurs\": [" x \
    "]}, \"readings\": {\"cross_ln\": {\"P1\": 0.4}}}"
#define POINTS(x) \
    "{\"format\": \"ringfettle-job/1\", \"ring\": {\"points\": "    \
    "[" x \
    "]}, \"readings\": {\"cross_ln\": {\"P1\": 0.4}}}"
#define RING(x) \
    "{\"format\": \"ringfettle-job/1\", \"ring\": " x \
    ", \"readings\": {\"cross_ln\": {\"P1\": 0.4}}}"
#define READINGS(x) \
    "{\"format\": \"ringfettle-job/1\", \"ring\": {\"points\": "    \
    "[{\"id\": \"P1\"}, {\"id\": \"P2\"}, {\"id\": \"P3\"}, "    \
    "{\"id\": \"J1\", \"kind\": \"junction_box\"}], \"spurs\": "    \
    "[{\"id\": \"S1\", \"from\": \"P2\"}]}, \"readings\": " x \
    "}"
#define LOOKS(x) \
    "{\"format\": \"ringfettle-job/1\", \"ring\": {\"points\": "    \
    "[{\"id\": \"P1\"}, {\"id\": \"P2\"}, {\"id\": \"P3\"}, "    \
    "{\"id\": \"J1\", \"kind\": \"junction_box\"}]}, \"readings\": "    \
    "{\"cross_ln\": {\"P1\": 0.4}}, " x \
    "}"

/* One bracket more than JSON_MAX_DEPTH. */
#define EIGHT "[[[[[[[["
#define DEEP EIGHT EIGHT EIGHT EIGHT EIGHT EIGHT EIGHT EIGHT "["

static const struct refusal {
    const char *text;
    enum rf_status status;
    const char *message; /* behind the file's name */
} refusals[] = {
    /* the text */
    {"",
     RF_SYNTAX,
     ":1:1: found the text's end; needs a value"},
    {" \n ",
     RF_SYNTAX,
     ":2:2: found the text's end; needs a value"},
    {"hello",
     RF_SYNTAX,
     ":1:1: found \"hello\"; needs a value"},
    {"{",
     RF_SYNTAX,
     ":1:2: found the text's end; needs a key in double quotes or }"},
    {"{\"format\" 1}",
     RF_SYNTAX,
     ":1:11: found \"1\"; needs a colon"},
    {"{\"format\": tru}",
     RF_SYNTAX,
     ":1:12: found \"tru\"; needs a value"},
    {"{\"format\": \n  01}",
     RF_SYNTAX,
     ":2:3: found \"01\"; needs a number as JSON spells it, such as 0.25 or "
     "3e-2"},
    {"{\"a\": 1.}",
     RF_SYNTAX,
     ":1:7: found \"1.\"; needs a number as JSON spells it, such as 0.25 or "
     "3e-2"},
    {"{\"a\": .5}",
     RF_SYNTAX,
     ":1:7: found \".5\"; needs a value"},
    {"{\"a\": +1}",
     RF_SYNTAX,
     ":1:7: found \"+1\"; needs a value"},
    {"{\"a\": 1e}",
     RF_SYNTAX,
     ":1:7: found \"1e\"; needs a number as JSON spells it, such as 0.25 or "
     "3e-2"},
    {"{\"a\": -}",
     RF_SYNTAX,
     ":1:7: found \"-\"; needs a number as JSON spells it, such as 0.25 or "
     "3e-2"},
    {"{\"a\": NaN}",
     RF_SYNTAX,
     ":1:7: found \"NaN\"; needs a value"},
    {"{\"a\": 0x10}",
     RF_SYNTAX,
     ":1:8: found \"x10\"; needs a comma or the closing bracket"},
    {"{\"a\": 1,}",
     RF_SYNTAX,
     ":1:9: found \"}\"; needs a key in double quotes"},
    {"[1 2]",
     RF_SYNTAX,
     ":1:4: found \"2\"; needs a comma or the closing bracket"},
    {"[1,]",
     RF_SYNTAX,
     ":1:4: found \"]\"; needs a value"},
    {"{'a': 1}",
     RF_SYNTAX,
     ":1:2: found \"'\"; needs a key in double quotes or }"},
    {"{\"a\": \"x\ty\"}",
     RF_SYNTAX,
     ":1:9: found \"\\u0009\"; needs the closing double quote, or control characters "
     "as escapes (\\n, \\t)"},
    {"{\"a\": \"x\ny\"}",
     RF_SYNTAX,
     ":1:9: found the line's end; needs the closing double quote, or control "
     "characters as escapes (\\n, \\t)"},
    {"{\"a\": \"\\q\"}",
     RF_SYNTAX,
     ":1:8: found \"\\q\"; needs one of the escapes \\\" \\\\ \\/ \\b \\f \\n "
     "\\r \\t \\u"},
    {"{\"a\": \"\\u00g0\"}",
     RF_SYNTAX,
     ":1:12: found \"g0\"; needs four hexadecimal digits"},
    {"{\"a\": \"a\\u0000b\"}",
     RF_SYNTAX,
     ":1:9: found \"\\u0000b\"; needs text without the character U+0000"},
    {"{\"a\": \"\\ud800\"}",
     RF_SYNTAX,
     ":1:8: found \"\\ud800\"; needs both halves of a surrogate pair"},
    {"{\"a\": \"\\udc00\\ud800\"}",
     RF_SYNTAX,
     ":1:8: found \"\\udc00\"; needs both halves of a surrogate pair"},
    {"{\"a\": \"é\" 1}",
     RF_SYNTAX,
     ":1:11: found \"1\"; needs a comma or the closing bracket"},
    {"{\"a\": 1}}",
     RF_SYNTAX,
     ":1:9: found \"}\"; needs nothing more behind the closing bracket"},
    {"{\"a\": 1} {\"a\": 1}",
     RF_SYNTAX,
     ":1:10: found \"{\"; needs nothing more behind the closing bracket"},
    {"{\"a\": 1]",
     RF_SYNTAX,
     ":1:8: found \"]\"; needs a comma or the closing bracket"},
    {"{\"a\": 0.1234567890123456789012345678901234567890123456789012345678901}",
     RF_SYNTAX,
     ":1:7: found \"0.123456789012345678\"; needs a number of at most 60 characters"},
    {DEEP,
     RF_SYNTAX,
     ":1:65: found \"[\"; needs brackets nested at most 64 deep"},
    {"{\"a\":\0131}",
     RF_SYNTAX,
     ":1:6: found \"\\u000b\"; needs a value"},
    {"{\"a\": // no\n 1}",
     RF_SYNTAX,
     ":1:7: found \"/\"; needs a value"},
    /* the document */
    {"[]",
     RF_REFUSED,
     ": found an empty list; needs an object in braces { }"},
    {"3",
     RF_REFUSED,
     ": found 3; needs an object in braces { }"},
    {"\"x\"",
     RF_REFUSED,
     ": found \"x\"; needs an object in braces { }"},
    {"null",
     RF_REFUSED,
     ": found null; needs an object in braces { }"},
    {"{}",
     RF_REFUSED,
     ": format: missing; needs \"ringfettle-job/1\""},
    {"{\"format\": 1}",
     RF_REFUSED,
     ": format: found 1; needs \"ringfettle-job/1\""},
    {"{\"format\": \"ringfettle-job/2\"}",
     RF_REFUSED,
     ": format: found \"ringfettle-job/2\"; needs \"ringfettle-job/1\""},
    {"{\"format\": \"ringfettle-job/1\"}",
     RF_REFUSED,
     ": ring: missing; needs an object in braces { }"},
    {"{\"format\": \"ringfettle-job/1\", \"ring\": {\"points\": [{\"id\": \"P1\"}, "
     "{\"id\": \"P2\"}]}}",
     RF_REFUSED,
     ": readings: missing; needs an object in braces { }"},
    {"{\"format\": \"ringfettle-job/1\", \"readings\": {\"cross_ln\": {\"P1\": "
     "0.4}}}",
     RF_REFUSED,
     ": ring: missing; needs an object in braces { }"},
    {TOP("\"raedings\": {}"),
     RF_REFUSED,
     ": raedings: unknown key; did you mean \"readings\"?"},
    {TOP("\"zzzzzzzzzzzz\": 1"),
     RF_REFUSED,
     ": zzzzzzzzzzzz: unknown key; needs format, job, date, note, ring, readings, "
     "access, opened, checked or found; keys of your own begin x_"},
    {"{\"format\": \"ringfettle-job/1\", \"format\": \"ringfettle-job/1\", "
     "\"ring\": {\"points\": [{\"id\": \"P1\"}, {\"id\": \"P2\"}]}, \"readings\": "
     "{\"cross_ln\": {\"P1\": 0.4}}}",
     RF_REFUSED,
     ": format: key given twice; needs it once"},
    {"{\"a\": 1, \"\\u0061\": 2}",
     RF_REFUSED,
     ": a: key given twice; needs it once"},
    {TOP("\"x_own\": {\"a\": 1e999}"),
     RF_REFUSED,
     ": x_own.a: found a number too large; needs a number that is finite"},
    {TOP("\"job\": 7"),
     RF_REFUSED,
     ": job: found 7; needs text in double quotes"},
    {TOP("\"job\": null"),
     RF_REFUSED,
     ": job: found null; needs text in double quotes"},
    {TOP("\"note\": [\"a\"]"),
     RF_REFUSED,
     ": note: found a list of 1; needs text in double quotes"},
    {TOP("\"date\": \"2025-02-29\""),
     RF_REFUSED,
     ": date: found \"2025-02-29\"; needs a day of the calendar as YYYY-MM-DD"},
    {TOP("\"date\": \"11.2.2026\""),
     RF_REFUSED,
     ": date: found \"11.2.2026\"; needs a day of the calendar as YYYY-MM-DD"},
    {TOP("\"date\": \"2026-13-01\""),
     RF_REFUSED,
     ": date: found \"2026-13-01\"; needs a day of the calendar as YYYY-MM-DD"},
    {TOP("\"date\": 20260211"),
     RF_REFUSED,
     ": date: found 20260211; needs text in double quotes"},
    {TOP("\"found\": \"joint\""),
     RF_REFUSED,
     ": found: found \"joint\"; needs an object such as {\"family\": \"none\"}"},
    {TOP("\"found\": null"),
     RF_REFUSED,
     ": found: found null; needs an object such as {\"family\": \"none\"}"},
    {TOP("\"found\": {\"family\": \"joint\", \"also\": {\"family\": "
         "\"joint\", \"family\": \"break\"}}"),
     RF_REFUSED,
     ": found.also.family: key given twice; needs it once"},
    /* the ring */
    {RING("[]"),
     RF_REFUSED,
     ": ring: found an empty list; needs an object in braces { }"},
    {RING("{}"),
     RF_REFUSED,
     ": ring.points: missing; needs a list of 1 to 200 points"},
    {RING("{\"points\": {}}"),
     RF_REFUSED,
     ": ring.points: found an object; needs a list of 1 to 200 points"},
    {POINTS(""),
     RF_REFUSED,
     ": ring.points: found an empty list; needs a list of 1 to 200 points"},
    {RING("{\"points\": [{\"id\": \"P1\"}], \"pionts\": 1}"),
     RF_REFUSED,
     ": ring.pionts: unknown key; did you mean \"points\"?"},
    {RING("{\"points\": [{\"id\": \"P1\"}], \"order\": \"unknown\"}"),
     RF_REFUSED,
     ": ring.order: found \"unknown\"; needs \"known\": other orders are reserved"},
    {RING("{\"points\": [{\"id\": \"P1\"}], \"order\": 1}"),
     RF_REFUSED,
     ": ring.order: found 1; needs \"known\": other orders are reserved"},
    {RING("{\"points\": [{\"id\": \"P1\"}], \"live_mm2\": 0}"),
     RF_REFUSED,
     ": ring.live_mm2: found 0; needs a cross-section in mm², above 0"},
    {RING("{\"points\": [{\"id\": \"P1\"}], \"live_mm2\": null}"),
     RF_REFUSED,
     ": ring.live_mm2: found null; needs a cross-section in mm², above 0"},
    {RING("{\"points\": [{\"id\": \"P1\"}], \"live_mm2\": -2.5}"),
     RF_REFUSED,
     ": ring.live_mm2: found -2.5; needs a cross-section in mm², above 0"},
    {RING("{\"points\": [{\"id\": \"P1\"}], \"cpc_mm2\": \"1.5\"}"),
     RF_REFUSED,
     ": ring.cpc_mm2: found \"1.5\"; needs a cross-section in mm², above 0, "
     "or null where not known"},
    {RING("{\"points\": [{\"id\": \"P1\"}], \"cpc_mm2\": -0}"),
     RF_REFUSED,
     ": ring.cpc_mm2: found -0; needs a cross-section in mm², above 0, or null "
     "where not known"},
    {RING("{\"points\": [{\"id\": \"P1\"}], \"temperature_c\": 90.5}"),
     RF_REFUSED,
     ": ring.temperature_c: found 90.5; needs °C from -40 to 90"},
    {RING("{\"points\": [{\"id\": \"P1\"}], \"temperature_c\": -41}"),
     RF_REFUSED,
     ": ring.temperature_c: found -41; needs °C from -40 to 90"},
    {RING("{\"points\": [{\"id\": \"P1\"}], \"length_accuracy\": 0}"),
     RF_REFUSED,
     ": ring.length_accuracy: found 0; needs a number above 0 and at most 2"},
    {RING("{\"points\": [{\"id\": \"P1\"}], \"length_accuracy\": 2.01}"),
     RF_REFUSED,
     ": ring.length_accuracy: found 2.01; needs a number above 0 and at most "
     "2"},
    {RING("{\"points\": [{\"id\": \"P1\"}], \"length_accuracy\": -0.2}"),
     RF_REFUSED,
     ": ring.length_accuracy: found -0.2; needs a number above 0 and at most "
     "2"},
    {RING("{\"points\": [{\"id\": \"P1\"}], \"last_run_m\": 0.05}"),
     RF_REFUSED,
     ": ring.last_run_m: found 0.05; needs metres from 0.1 to 500, or null "
     "where not known"},
    {RING("{\"points\": [{\"id\": \"P1\"}], \"last_run_m\": \"9\"}"),
     RF_REFUSED,
     ": ring.last_run_m: found \"9\"; needs metres from 0.1 to 500, or null "
     "where not known"},
    {RING("{\"points\": [{\"id\": \"P1\"}], \"spurs\": {}}"),
     RF_REFUSED,
     ": ring.spurs: found an object; needs a list of at most 200 spur points"},
    /* points */
    {POINTS("\"P1\""),
     RF_REFUSED,
     ": ring.points[0]: found \"P1\"; needs an object in braces { }"},
    {POINTS("{\"ID\": \"P1\"}"),
     RF_REFUSED,
     ": ring.points[0].ID: unknown key; did you mean \"id\"?"},
    {POINTS("{\"label\": \"x\"}"),
     RF_REFUSED,
     ": ring.points[0].id: missing; needs an id in double quotes"},
    {POINTS("{\"id\": 1}"),
     RF_REFUSED,
     ": ring.points[0].id: found 1; needs an id in double quotes"},
    {POINTS("{\"id\": \"\"}"),
     RF_REFUSED,
     ": ring.points[0].id: found \"\"; needs an id of 1 to 64 bytes"},
    {POINTS("{\"id\": \"aaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaa"
            "aaaaaa\"}"),
     RF_REFUSED,
     ": ring.points[0].id: found \"aaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaaa"
     "aaaaaaaaa…\"; needs an id of 1 to 64 bytes"},
    {POINTS("{\"id\": \"a\\u0007b\"}"),
     RF_REFUSED,
     ": ring.points[0].id: found \"a\\u0007b\"; needs an id without control "
     "characters"},
    {POINTS("{\"id\": \"a\\u0085b\"}"),
     RF_REFUSED,
     ": ring.points[0].id: found \"a\\u0085b\"; needs an id without control "
     "characters"},
    {POINTS("{\"id\": \"board\"}"),
     RF_REFUSED,
     ": ring.points[0].id: found \"board\"; needs another id: out, in, board, "
     "highest, l, n and e are reserved"},
    {POINTS("{\"id\": \"out\"}"),
     RF_REFUSED,
     ": ring.points[0].id: found \"out\"; needs another id: out, in, board, "
     "highest, l, n and e are reserved"},
    {POINTS("{\"id\": \"e\"}"),
     RF_REFUSED,
     ": ring.points[0].id: found \"e\"; needs another id: out, in, board, highest, "
     "l, n and e are reserved"},
    {POINTS("{\"id\": \"P1\"}, {\"id\": \"P2\"}, {\"id\": \"P1\"}"),
     RF_REFUSED,
     ": ring.points[2].id: found \"P1\"; needs an id that no other point has"},
    {POINTS("{\"id\": \"P1\", \"kind\": \"sokcet\"}"),
     RF_REFUSED,
     ": ring.points[0].kind: found \"sokcet\"; did you mean \"socket\"?"},
    {POINTS("{\"id\": \"P1\", \"kind\": \"cooker unit\"}"),
     RF_REFUSED,
     ": ring.points[0].kind: found \"cooker unit\"; needs socket, fcu, junction_box, "
     "isolator or other"},
    {POINTS("{\"id\": \"P1\", \"kind\": 1}"),
     RF_REFUSED,
     ": ring.points[0].kind: found 1; needs socket, fcu, junction_box, isolator "
     "or other"},
    {POINTS("{\"id\": \"P1\", \"label\": 4}"),
     RF_REFUSED,
     ": ring.points[0].label: found 4; needs text in double quotes"},
    {POINTS("{\"id\": \"P1\", \"run_m\": 0}"),
     RF_REFUSED,
     ": ring.points[0].run_m: found 0; needs metres from 0.1 to 500, or null "
     "where not known"},
    {POINTS("{\"id\": \"P1\", \"run_m\": 500.5}"),
     RF_REFUSED,
     ": ring.points[0].run_m: found 500.5; needs metres from 0.1 to 500, or "
     "null where not known"},
    {POINTS("{\"id\": \"P1\", \"run_m\": -6}"),
     RF_REFUSED,
     ": ring.points[0].run_m: found -6; needs metres from 0.1 to 500, or null "
     "where not known"},
    {POINTS("{\"id\": \"P1\", \"run_m\": \"6 m\"}"),
     RF_REFUSED,
     ": ring.points[0].run_m: found \"6 m\"; needs metres from 0.1 to 500, "
     "or null where not known"},
    {POINTS("{\"id\": \"P1\", \"run_m\": [6]}"),
     RF_REFUSED,
     ": ring.points[0].run_m: found a list of 1; needs metres from 0.1 to 500, "
     "or null where not known"},
    {POINTS("{\"id\": \"P1\", \"live_mm2\": 0}"),
     RF_REFUSED,
     ": ring.points[0].live_mm2: found 0; needs a cross-section in mm², above "
     "0"},
    {POINTS("{\"id\": \"P1\", \"cpc_mm2\": true}"),
     RF_REFUSED,
     ": ring.points[0].cpc_mm2: found true; needs a cross-section in mm², above "
     "0, or null where not known"},
    {POINTS("{\"id\": \"P1\", \"from\": \"out\"}"),
     RF_REFUSED,
     ": ring.points[0].from: unknown key; needs id, label, kind, run_m, live_mm2 "
     "or cpc_mm2; keys of your own begin x_"},
    {POINTS("{\"id\": \"P1\", \"run_m\": 1, \"run_m\": 2}"),
     RF_REFUSED,
     ": ring.points[0].run_m: key given twice; needs it once"},
    /* spurs */
    {SPURS("3"),
     RF_REFUSED,
     ": ring.spurs[0]: found 3; needs an object in braces { }"},
    {SPURS("{\"id\": \"S1\"}"),
     RF_REFUSED,
     ": ring.spurs[0].from: missing; needs the id of the place the spur hangs "
     "on, or out or in"},
    {SPURS("{\"id\": \"S1\", \"from\": 2}"),
     RF_REFUSED,
     ": ring.spurs[0].from: found 2; needs the id of the place the spur hangs "
     "on, or out or in"},
    {SPURS("{\"id\": \"S1\", \"from\": \"P9\"}"),
     RF_REFUSED,
     ": ring.spurs[0].from: found \"P9\"; no such point; the ring has P1 and "
     "P2, and the spur S1"},
    {SPURS("{\"id\": \"S1\", \"from\": \"board\"}"),
     RF_REFUSED,
     ": ring.spurs[0].from: found \"board\"; no such point; the ring has P1 "
     "and P2, and the spur S1"},
    {SPURS("{\"id\": \"S1\", \"from\": \"S1\"}"),
     RF_REFUSED,
     ": ring.spurs[0].from: found \"S1\"; needs a place that leads to the ring: "
     "this is a loop"},
    {SPURS("{\"id\": \"S1\", \"from\": \"S2\"}, {\"id\": \"S2\", \"from\": "
           "\"S1\"}"),
     RF_REFUSED,
     ": ring.spurs[0].from: found \"S2\"; needs a place that leads to the ring: "
     "this is a loop"},
    {SPURS("{\"id\": \"S0\", \"from\": \"S1\"}, {\"id\": \"S1\", \"from\": "
           "\"S2\"}, {\"id\": \"S2\", \"from\": \"S3\"}, {\"id\": \"S3\", "
           "\"from\": \"S1\"}"),
     RF_REFUSED,
     ": ring.spurs[0].from: found \"S1\"; needs a place that leads to the ring: "
     "this is a loop"},
    {SPURS("{\"id\": \"P2\", \"from\": \"P1\"}"),
     RF_REFUSED,
     ": ring.spurs[0].id: found \"P2\"; needs an id that no other point has"},
    {SPURS("{\"id\": \"S1\", \"from\": \"P1\"}, {\"id\": \"S1\", \"from\": "
           "\"P1\"}"),
     RF_REFUSED,
     ": ring.spurs[1].id: found \"S1\"; needs an id that no other point has"},
    {SPURS("{\"id\": \"in\", \"from\": \"P1\"}"),
     RF_REFUSED,
     ": ring.spurs[0].id: found \"in\"; needs another id: out, in, board, highest, "
     "l, n and e are reserved"},
    {SPURS("{\"id\": \"S1\", \"from\": \"P1\", \"run\": 2}"),
     RF_REFUSED,
     ": ring.spurs[0].run: unknown key; did you mean \"run_m\"?"},
    /* readings */
    {READINGS("[]"),
     RF_REFUSED,
     ": readings: found an empty list; needs an object in braces { }"},
    {READINGS("{}"),
     RF_REFUSED,
     ": readings: no reading in it; needs at least one"},
    {READINGS("{\"cross_ln\": {}}"),
     RF_REFUSED,
     ": readings: no reading in it; needs at least one"},
    {READINGS("{\"cross_ln\": 0.4}"),
     RF_REFUSED,
     ": readings.cross_ln: found 0.4; needs an object in braces { }"},
    {READINGS("{\"cross_ln\": null}"),
     RF_REFUSED,
     ": readings.cross_ln: found null; needs an object in braces { }"},
    {READINGS("{\"corss_ln\": {\"P1\": 0.4}}"),
     RF_REFUSED,
     ": readings.corss_ln: unknown key; did you mean \"cross_ln\"?"},
    {READINGS("{\"figure of eight, lives\": {\"P1\": 0.4}}"),
     RF_REFUSED,
     ": readings[\"figure of eight, lives\"]: unknown key; needs end_to_end, "
     "cross_ln, cross_le, cross_ne, link_out_ln, link_out_le, link_out_ne, "
     "link_in_ln, link_in_le, link_in_ne, lead_out_l, lead_out_n, lead_out_e, "
     "lead_in_l, lead_in_n, lead_in_e, apart_ln, apart_le or apart_ne; keys "
     "of your own begin x_"},
    {READINGS("{\"cross_ln\": {\"P9\": 0.4}}"),
     RF_REFUSED,
     ": readings.cross_ln.P9: no such point; the ring has P1 to P3 and J1, "
     "and the spur S1"},
    {READINGS("{\"cross_ln\": {\"my place\": 0.4}}"),
     RF_REFUSED,
     ": readings.cross_ln[\"my place\"]: no such point; the ring has P1 to "
     "P3 and J1, and the spur S1"},
    {READINGS("{\"cross_ln\": {\"J1\": 0.4}}"),
     RF_REFUSED,
     ": readings.cross_ln.J1: a junction box has no front to read at; needs "
     "a point with a front"},
    {READINGS("{\"cross_ln\": {\"out\": 0.4}}"),
     RF_REFUSED,
     ": readings.cross_ln.out: not read in cross_ln; needs a point, board or "
     "highest"},
    {READINGS("{\"cross_ln\": {\"l\": 0.4}}"),
     RF_REFUSED,
     ": readings.cross_ln.l: not read in cross_ln; needs a point, board or "
     "highest"},
    {READINGS("{\"link_out_ln\": {\"out\": 0.4}}"),
     RF_REFUSED,
     ": readings.link_out_ln.out: not read in link_out_ln; needs a point or "
     "in"},
    {READINGS("{\"link_in_ne\": {\"board\": 0.4}}"),
     RF_REFUSED,
     ": readings.link_in_ne.board: not read in link_in_ne; needs a point or "
     "out"},
    {READINGS("{\"lead_out_l\": {\"board\": 0.4}}"),
     RF_REFUSED,
     ": readings.lead_out_l.board: not read in lead_out_l; needs a point"},
    {READINGS("{\"apart_le\": {\"P1\": 0.4}}"),
     RF_REFUSED,
     ": readings.apart_le.P1: not read in apart_le; needs out or in"},
    {READINGS("{\"end_to_end\": {\"P1\": 0.4}}"),
     RF_REFUSED,
     ": readings.end_to_end.P1: not read in end_to_end; needs l, n or e"},
    {READINGS("{\"end_to_end\": {\"L\": 0.4}}"),
     RF_REFUSED,
     ": readings.end_to_end.L: not read in end_to_end; needs l, n or e"},
    {READINGS("{\"cross_ln\": {\"P1\": -0.1}}"),
     RF_REFUSED,
     ": readings.cross_ln.P1: found -0.1; needs ohms from 0 to 99.9, \"open\" "
     "for over range, or a list of these"},
    {READINGS("{\"cross_ln\": {\"P1\": -0}}"),
     RF_REFUSED,
     ": readings.cross_ln.P1: found -0; needs ohms from 0 to 99.9, \"open\" "
     "for over range, or a list of these"},
    {READINGS("{\"cross_ln\": {\"P1\": -0.0}}"),
     RF_REFUSED,
     ": readings.cross_ln.P1: found -0; needs ohms from 0 to 99.9, \"open\" "
     "for over range, or a list of these"},
    {READINGS("{\"cross_ln\": {\"P1\": 99.91}}"),
     RF_REFUSED,
     ": readings.cross_ln.P1: found 99.91; needs ohms from 0 to 99.9, \"open\" "
     "for over range, or a list of these"},
    {READINGS("{\"cross_ln\": {\"P1\": 1e400}}"),
     RF_REFUSED,
     ": readings.cross_ln.P1: found a number too large; needs a number that "
     "is finite"},
    {READINGS("{\"cross_ln\": {\"P1\": \"Open\"}}"),
     RF_REFUSED,
     ": readings.cross_ln.P1: found \"Open\"; needs ohms from 0 to 99.9, \"open\" "
     "for over range, or a list of these"},
    {READINGS("{\"cross_ln\": {\"P1\": \"0.4\"}}"),
     RF_REFUSED,
     ": readings.cross_ln.P1: found \"0.4\"; needs ohms from 0 to 99.9, \"open\" "
     "for over range, or a list of these"},
    {READINGS("{\"cross_ln\": {\"P1\": null}}"),
     RF_REFUSED,
     ": readings.cross_ln.P1: found null; needs ohms from 0 to 99.9, \"open\" "
     "for over range, or a list of these"},
    {READINGS("{\"cross_ln\": {\"P1\": {}}}"),
     RF_REFUSED,
     ": readings.cross_ln.P1: found an object; needs ohms from 0 to 99.9, \"open\" "
     "for over range, or a list of these"},
    {READINGS("{\"cross_ln\": {\"P1\": []}}"),
     RF_REFUSED,
     ": readings.cross_ln.P1: found an empty list; needs ohms from 0 to 99.9, "
     "\"open\" for over range, or a list of these"},
    {READINGS("{\"cross_ln\": {\"P1\": [0.4, -1]}}"),
     RF_REFUSED,
     ": readings.cross_ln.P1[1]: found -1; needs ohms from 0 to 99.9, \"open\" "
     "for over range, or a list of these"},
    {READINGS("{\"cross_ln\": {\"P1\": [0.4, [0.4]]}}"),
     RF_REFUSED,
     ": readings.cross_ln.P1[1]: found a list of 1; needs ohms from 0 to 99.9, "
     "\"open\" for over range, or a list of these"},
    {READINGS("{\"cross_ln\": {\"highest\": \"open\"}}"),
     RF_REFUSED,
     ": readings.cross_ln.highest: found \"open\"; needs ohms from 0 to 99.9, "
     "or a list of these"},
    {READINGS("{\"cross_ln\": {\"highest\": [0.4, \"open\"]}}"),
     RF_REFUSED,
     ": readings.cross_ln.highest[1]: found \"open\"; needs ohms from 0 to "
     "99.9, or a list of these"},
    {READINGS("{\"cross_ln\": {\"P1\": 0.4, \"P1\": 0.4}}"),
     RF_REFUSED,
     ": readings.cross_ln.P1: key given twice; needs it once"},
    {READINGS("{\"cross_ln\": {\"P1\": 0.4}, \"cross_ln\": {\"P2\": 0.4}}"),
     RF_REFUSED,
     ": readings.cross_ln: key given twice; needs it once"},
    /* looks */
    {LOOKS("\"access\": []"),
     RF_REFUSED,
     ": access: found an empty list; needs an object in braces { }"},
    {LOOKS("\"access\": {\"P9\": 3}"),
     RF_REFUSED,
     ": access.P9: no such point; the ring has P1 to P3 and J1"},
    {LOOKS("\"access\": {\"out\": 3}"),
     RF_REFUSED,
     ": access.out: the ring's ends are at the board; needs a point's id or "
     "board"},
    {LOOKS("\"access\": {\"P1\": -3}"),
     RF_REFUSED,
     ": access.P1: found -3; needs minutes from 0 to 10000"},
    {LOOKS("\"access\": {\"P1\": 10001}"),
     RF_REFUSED,
     ": access.P1: found 10001; needs minutes from 0 to 10000"},
    {LOOKS("\"access\": {\"P1\": \"3\"}"),
     RF_REFUSED,
     ": access.P1: found \"3\"; needs minutes to open it, or {\"reach\": minutes, "
     "\"open\": minutes}"},
    {LOOKS("\"access\": {\"P1\": {\"open\": -0}}"),
     RF_REFUSED,
     ": access.P1.open: found -0; needs minutes from 0 to 10000"},
    {LOOKS("\"access\": {\"P1\": {\"reach\": null}}"),
     RF_REFUSED,
     ": access.P1.reach: found null; needs minutes from 0 to 10000"},
    {LOOKS("\"access\": {\"board\": {\"opne\": 1}}"),
     RF_REFUSED,
     ": access.board.opne: unknown key; did you mean \"open\"?"},
    {LOOKS("\"opened\": \"P1\""),
     RF_REFUSED,
     ": opened: found \"P1\"; needs a list of ids, each once"},
    {LOOKS("\"opened\": [\"P1\", \"P9\"]"),
     RF_REFUSED,
     ": opened[1]: found \"P9\"; no such point; the ring has P1 to P3 and J1"},
    {LOOKS("\"opened\": [1]"),
     RF_REFUSED,
     ": opened[0]: found 1; needs a point's id or board"},
    {LOOKS("\"opened\": [\"in\"]"),
     RF_REFUSED,
     ": opened[0]: the ring's ends are at the board; needs a point's id or "
     "board"},
    {LOOKS("\"opened\": [\"board\", \"P1\", \"board\"]"),
     RF_REFUSED,
     ": opened[2]: found \"board\"; needs every place once"},
    {LOOKS("\"checked\": {\"P1\": true}"),
     RF_REFUSED,
     ": checked: found an object; needs a list of ids, each once"},
    {LOOKS("\"checked\": [\"J1\"]"),
     RF_REFUSED,
     ": checked[0]: found \"J1\"; needs the id of a point with a front"},
    {LOOKS("\"checked\": [\"board\"]"),
     RF_REFUSED,
     ": checked[0]: found \"board\"; needs the id of a point with a front"},
    {LOOKS("\"checked\": [\"P7\"]"),
     RF_REFUSED,
     ": checked[0]: found \"P7\"; no such point; the ring has P1 to P3 and "
     "J1"},
    {LOOKS("\"checked\": [\"P1\", \"P1\"]"),
     RF_REFUSED,
     ": checked[1]: found \"P1\"; needs every place once"},
    {LOOKS("\"checked\": [null]"),
     RF_REFUSED,
     ": checked[0]: found null; needs the id of a point with a front"},
};

enum { N_REFUSALS = sizeof refusals / sizeof refusals[0] };

START_TEST(refuses_by_name)
{
    const struct refusal *row = &refusals[_i];
    struct rf_error error = {0};
    struct rf_job *job = (struct rf_job *)&error;
    char message[1100];
    snprintf(message, sizeof message, "kitchen.json%s", row->message);
    ck_assert_int_eq(rf_job_parse(row->text, strlen(row->text), "kitchen.json", &job, &error),
                     row->status);
    ck_assert_ptr_null(job);
    ck_assert_str_eq(error.text, message);
    ck_assert_int_eq(error.status, row->status);
    ck_assert_int_eq(rf_job_parse(row->text, strlen(row->text), "kitchen.json", &job, NULL),
                     row->status);
}
END_TEST

static struct rf_job *read_job(const char *text)
{
    struct rf_error error = {0};
    struct rf_job *job = NULL;
    enum rf_status status = rf_job_parse(text, strlen(text), "kitchen.json", &job, &error);
    ck_assert_msg(status == RF_OK, "%s", error.text);
    return job;
}

/* Refuses bytes that a C string cannot hold. */
static void check_bytes(const char *bytes, size_t length, const char *message)
{
    struct rf_error error = {0};
    struct rf_job *job;
    ck_assert_int_eq(rf_job_parse(bytes, length, "k", &job, &error), RF_SYNTAX);
    ck_assert_str_eq(error.text, message);
}

START_TEST(refuses_bytes)
{
    static const char nul[] = "{\"format\":\0 1}";
    static const char nul_in_string[] = "{\"fo\0rmat\": 1}";
    static const char latin[] = "{\n \"jo\xE9\": 1}";
    check_bytes(nul, sizeof nul - 1, "k:1:11: found a NUL byte; needs a value");
    check_bytes(nul_in_string, sizeof nul_in_string - 1,
                "k:1:5: found a NUL byte; needs the closing double quote, or control characters "
                "as escapes (\\n, \\t)");
    check_bytes(latin, sizeof latin - 1,
                "k:2:5: found byte 0xE9, which is not UTF-8; needs text saved as UTF-8");
    /* What stands behind the length is not read. */
    check_bytes("{}", 1, "k:1:2: found the text's end; needs a key in double quotes or }");
}
END_TEST

START_TEST(takes_the_least)
{
    struct rf_job *job = read_job(RING("{\"points\": [{\"id\": \"P1\"}]}"));
    ck_assert_str_eq(rf_job_name(job), "kitchen.json");
    ck_assert_uint_eq(rf_job_points(job), 1);
    ck_assert_uint_eq(rf_job_spurs(job), 0);
    ck_assert_uint_eq(rf_job_readings(job), 1);
    ck_assert(!rf_job_has_found(job));
    ck_assert_double_eq(job->live_mm2, 2.5);
    ck_assert_double_eq(job->cpc_mm2, 1.5);
    ck_assert_double_eq(job->temperature_c, 20.0);
    ck_assert_double_eq(job->length_accuracy, 0.2);
    ck_assert_uint_eq(job->n_places, 3);
    ck_assert_str_eq(job->places[0].id, "out");
    ck_assert_str_eq(job->places[2].id, "in");
    ck_assert_int_eq(job->places[1].kind, KIND_SOCKET);
    ck_assert(isnan(job->places[1].run_m) && isnan(job->places[2].run_m));
    ck_assert(isnan(job->places[1].open_minutes) && isnan(job->board_open_minutes));
    ck_assert_double_eq(job->places[1].reach_minutes, 0.0);
    ck_assert(!place_has_front(job, 0) && place_has_front(job, 1) && !place_has_front(job, 2));
    rf_job_destroy(job);
}
END_TEST

static const char full[] =
    "{\"format\": \"ringfettle-job/1\", \"job\": \"0417-first-floor\", \"date\": \"2024-02-29\",\n"
    " \"note\": \"free\\ntext\", \"x_more\": {\"points\": []},\n"
    " \"ring\": {\"live_mm2\": 4, \"cpc_mm2\": null, \"temperature_c\": -40,\n"
    "  \"length_accuracy\": 2, \"order\": \"known\", \"x_colour\": \"red\",\n"
    "  \"points\": [{\"id\": \"P1\", \"label\": \"landing\", \"kind\": \"fcu\", \"run_m\": 0.1,\n"
    "    \"x_a\": 1}, {\"id\": \"küche 2\", \"run_m\": null, \"live_mm2\": 2.5,\n"
    "    \"cpc_mm2\": 1.5}, {\"id\": \"L\", \"kind\": \"junction_box\", \"run_m\": 500,\n"
    "    \"cpc_mm2\": null}],\n"
    "  \"last_run_m\": 9.5,\n"
    "  \"spurs\": [{\"id\": \"S1\", \"from\": \"S3\", \"run_m\": 3},\n"
    "   {\"id\": \"S2\", \"from\": \"out\"}, {\"id\": \"S3\", \"from\": \"küche 2\", \"x_b\": 2}]},\n"
    " \"readings\": {\"end_to_end\": {\"l\": 0.61, \"n\": \"open\", \"e\": 0},\n"
    "  \"x_own\": {\"P9\": -1},\n"
    "  \"cross_ln\": {\"board\": 99.9, \"highest\": 0.5, \"küche 2\": [0.4, \"open\", 0.41],\n"
    "   \"S1\": 0.45, \"x_by\": \"me\"},\n"
    "  \"link_in_le\": {\"out\": 1}},\n"
    " \"access\": {\"P1\": {\"reach\": 10, \"open\": 6}, \"S2\": 4, \"board\": {\"reach\": 1.5}},\n"
    " \"opened\": [\"board\", \"L\", \"S2\"], \"checked\": [\"P1\", \"S1\"],\n"
    " \"found\": {\"family\": \"joint\", \"run\": [\"P1\", \"küche 2\"], \"conductor\": \"N\"}}\n";

START_TEST(takes_everything)
{
    struct rf_job *job = read_job(full);
    const struct place *p = job->places;
    ck_assert_str_eq(rf_job_name(job), "0417-first-floor");
    ck_assert_str_eq(job->note, "free\ntext");
    ck_assert_uint_eq(job->n_ring, 3);
    ck_assert_uint_eq(job->n_spurs, 3);
    ck_assert_uint_eq(job->n_places, 8);
    ck_assert(isnan(job->cpc_mm2) && isnan(p[1].cpc_mm2) && !p[1].own_cpc);
    ck_assert_double_eq(p[1].live_mm2, 4.0);
    ck_assert_double_eq(p[2].live_mm2, 2.5);
    ck_assert_double_eq(p[2].cpc_mm2, 1.5);
    ck_assert(p[2].own_live && p[2].own_cpc && p[3].own_cpc && isnan(p[3].cpc_mm2));
    ck_assert_double_eq(p[4].run_m, 9.5);
    ck_assert(place_on_ring(job, 4) && place_is_end(job, 4));
    ck_assert(!place_has_front(job, 3));

    /* Spurs: S1 on S3, which comes later, on the ring's second point; S2 on out. */
    ck_assert_uint_eq(p[5].from, 7);
    ck_assert_uint_eq(p[6].from, 0);
    ck_assert_uint_eq(p[7].from, 2);
    ck_assert_uint_eq(job_find_run(job, 7, 5), 4);
    ck_assert_uint_eq(job_find_run(job, 5, 7), 4);
    ck_assert_uint_eq(job_find_run(job, 0, 6), 5);
    ck_assert_uint_eq(run_near_end(job, 4), 7);
    ck_assert_uint_eq(job_find_run(job, 2, 3), 2);
    ck_assert_uint_eq(job_find_run(job, 4, 3), 3);
    ck_assert_uint_eq(job_find_run(job, 1, 3), n_runs(job));
    ck_assert_uint_eq(job_find_run(job, 1, 1), n_runs(job));
    ck_assert_uint_eq(job_find_run(job, 5, 2), n_runs(job));
    ck_assert_uint_eq(job_find_place(job, "küche 2"), 2);
    ck_assert_uint_eq(job_find_place(job, "kueche"), job->n_places);

    ck_assert_double_eq(p[1].reach_minutes, 10.0);
    ck_assert_double_eq(p[1].open_minutes, 6.0);
    ck_assert_double_eq(p[6].open_minutes, 4.0);
    ck_assert_double_eq(job->board_reach_minutes, 1.5);
    ck_assert(isnan(job->board_open_minutes));
    ck_assert(job->board_opened && p[3].opened && p[6].opened && !p[1].opened);
    ck_assert(p[1].checked && p[5].checked && !p[2].checked);
    ck_assert(rf_job_has_found(job));
    rf_job_destroy(job);
}
END_TEST

START_TEST(keeps_readings_in_order)
{
    static const struct {
        const char *setup, *key;
        size_t repeat;
        bool open;
        double ohms;
    } expected[] = {
        {"end_to_end", "l", 0, false, 0.61},      {"end_to_end", "n", 0, true, 0},
        {"end_to_end", "e", 0, false, 0},         {"cross_ln", "board", 0, false, 99.9},
        {"cross_ln", "highest", 0, false, 0.5},   {"cross_ln", "küche 2", 0, false, 0.4},
        {"cross_ln", "küche 2", 1, true, 0},      {"cross_ln", "küche 2", 2, false, 0.41},
        {"cross_ln", "S1", 0, false, 0.45},       {"link_in_le", "out", 0, false, 1},
    };
    struct rf_job *job = read_job(full);
    ck_assert_uint_eq(job->n_readings, sizeof expected / sizeof expected[0]);
    for (size_t i = 0; i < job->n_readings; i++) {
        const struct reading *reading = &job->readings[i];
        ck_assert_str_eq(setups[reading->setup].name, expected[i].setup);
        ck_assert_str_eq(reading_key(job, reading), expected[i].key);
        ck_assert_uint_eq(reading->repeat, expected[i].repeat);
        ck_assert(reading->open == expected[i].open);
        ck_assert_double_eq(reading->ohms, expected[i].ohms);
    }
    ck_assert_str_eq(setups[job->setup_in_place].name, "link_in_le");
    rf_job_destroy(job);
}
END_TEST

/* A job of so many points, spurs and repeats of one reading. */
static void check_size(size_t points, size_t spurs, size_t repeats, enum rf_status status,
                       const char *message)
{
    struct text text = {0};
    struct rf_error error = {0};
    struct rf_job *job;
    text_add(&text, "{\"format\": \"ringfettle-job/1\", \"ring\": {\"points\": [");
    for (size_t i = 0; i < points; i++)
        text_addf(&text, "%s{\"id\": \"P%zu\"}", i > 0 ? "," : "", i + 1);
    text_add(&text, "], \"spurs\": [");
    for (size_t i = 0; i < spurs; i++) /* each on the next, the last on the ring */
        text_addf(&text, "%s{\"id\": \"S%zu\", \"from\": \"%s%zu\"}", i > 0 ? "," : "", i + 1,
                  i + 1 < spurs ? "S" : "P", i + 1 < spurs ? i + 2 : (size_t)1);
    text_add(&text, "]}, \"readings\": {\"cross_ln\": {\"P1\": [0.4");
    for (size_t i = 1; i < repeats; i++)
        text_add(&text, ", 0.4");
    text_add(&text, "]}}}");
    ck_assert(!text.failed);
    ck_assert_int_eq(rf_job_parse(text.bytes, text.length, "k", &job, &error), status);
    ck_assert_str_eq(error.text, message);
    rf_job_destroy(job);
    text_finish(&text);
}

START_TEST(keeps_to_limits)
{
    check_size(200, 200, 5000, RF_OK, "");
    check_size(201, 0, 1, RF_REFUSED,
               "k: ring.points: found a list of 201; needs a list of 1 to 200 points");
    check_size(1, 201, 1, RF_REFUSED,
               "k: ring.spurs: found a list of 201; needs a list of at most 200 spur points");
    check_size(1, 0, 5001, RF_LIMIT,
               "k: readings.cross_ln.P1[5000]: one reading too many; needs at most 5000 in a job");
}
END_TEST

START_TEST(refuses_too_many_bytes)
{
    struct rf_error error = {0};
    struct rf_job *job;
    char *bytes = calloc(JOB_MAX_BYTES + 1, 1);
    ck_assert_ptr_nonnull(bytes);
    ck_assert_int_eq(rf_job_parse(bytes, JOB_MAX_BYTES + 1, "k", &job, &error), RF_LIMIT);
    ck_assert_str_eq(error.text, "k: found a job of 16777217 bytes; needs one of at most 16 MiB");
    free(bytes);
}
END_TEST

static void check_list(const char *points, const char *expected)
{
    struct text text = {0}, list = {0};
    text_addf(&text, "{\"format\": \"ringfettle-job/1\", \"ring\": {\"points\": [%s]},"
                     " \"readings\": {\"cross_ln\": {\"board\": 0.4}}}", points);
    struct rf_job *job = read_job(text.bytes);
    job_list_places(job, false, &list);
    ck_assert_str_eq(list.bytes, expected);
    rf_job_destroy(job);
    text_finish(&text);
    text_finish(&list);
}

#define ID(x) "{\"id\": \"" x "\"}"

START_TEST(lists_places)
{
    check_list(ID("P1"), "P1");
    check_list(ID("P1") "," ID("P2"), "P1 and P2");
    check_list(ID("P9") "," ID("P10") "," ID("P11"), "P9 to P11");
    check_list(ID("P1") "," ID("hall") "," ID("3"), "P1, hall and 3");
    check_list(ID("1") "," ID("2") "," ID("3") "," ID("x"), "1 to 3 and x");
    check_list(ID("P01") "," ID("P02") "," ID("P03"), "P01, P02 and P03");
    check_list(ID("a") "," ID("b") "," ID("c") "," ID("d") "," ID("e2") "," ID("f") "," ID("g")
                   "," ID("h") "," ID("i"),
               "a, b, c, d, e2, f, g and 2 more");
}
END_TEST

START_TEST(writes_what_it_read)
{
    struct rf_job *job = read_job(full);
    struct text pretty = {0}, line = {0}, again = {0};
    ck_assert_int_eq(job_write(job, &pretty, NULL), RF_OK);
    ck_assert_int_eq(job_write_line(job, &line, NULL), RF_OK);
    ck_assert_ptr_null(strchr(line.bytes, '\n'));
    ck_assert_ptr_nonnull(strstr(line.bytes, "\"x_more\": {\"points\": []}"));
    ck_assert_ptr_nonnull(strstr(pretty.bytes, "\n   {\"id\": \"S2\", \"from\": \"out\"}"));
    rf_job_destroy(job);

    job = read_job(line.bytes);
    ck_assert_int_eq(job_write(job, &again, NULL), RF_OK);
    ck_assert_str_eq(again.bytes, pretty.bytes);
    rf_job_destroy(job);
    text_clear(&again);

    job = read_job(pretty.bytes);
    ck_assert_int_eq(job_write_line(job, &again, NULL), RF_OK);
    ck_assert_str_eq(again.bytes, line.bytes);
    rf_job_destroy(job);
    text_finish(&pretty);
    text_finish(&line);
    text_finish(&again);
}
END_TEST

/* Reads the text with the first, the second … allocation failing until one reading needs no more;
 * every failure must be said and leave nothing behind. */
static void fail_each_allocation(const char *text, enum rf_status at_last)
{
    enum rf_status status = RF_MEMORY;
    lead_cjson_here(true);
    for (size_t n = 1; n < 10000 && status == RF_MEMORY; n++) {
        struct rf_error error = {0};
        struct rf_job *job;
        allocations = 0;
        fail_at = n;
        status = rf_job_parse(text, strlen(text), "kitchen.json", &job, &error);
        fail_at = 0;
        ck_assert_int_eq(error.status, status);
        ck_assert(status == RF_OK || job == NULL);
        rf_job_destroy(job);
    }
    lead_cjson_here(false);
    ck_assert_int_eq(status, at_last);
}

START_TEST(survives_failing_allocations)
{
    fail_each_allocation(full, RF_OK);
    fail_each_allocation(READINGS("{\"cross_ln\": {\"P9\": 0.4}}"), RF_REFUSED);
    fail_each_allocation(READINGS("{\"link_in_ln\": {\"in\": 0.4}}"), RF_REFUSED);
    fail_each_allocation("{", RF_SYNTAX);
}
END_TEST

int main(void)
{
    Suite *suite = suite_create("job");
    TCase *all = tcase_create("job");
    tcase_set_timeout(all, 60);
    tcase_add_loop_test(all, refuses_by_name, 0, N_REFUSALS);
    tcase_add_test(all, refuses_bytes);
    tcase_add_test(all, takes_the_least);
    tcase_add_test(all, takes_everything);
    tcase_add_test(all, keeps_readings_in_order);
    tcase_add_test(all, keeps_to_limits);
    tcase_add_test(all, refuses_too_many_bytes);
    tcase_add_test(all, lists_places);
    tcase_add_test(all, writes_what_it_read);
    tcase_add_test(all, survives_failing_allocations);
    suite_add_tcase(suite, all);

    return run_suite(suite);
}

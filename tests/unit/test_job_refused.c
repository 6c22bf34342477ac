/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Jobs that are refused, with the whole message. All jobs are invented. */
#include "job/job.h"

#include "../suite.h"
#include "job_texts.h"

#include <check.h>
#include <stdio.h>
#include <string.h>

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

int main(void)
{
    Suite *suite = suite_create("job refused");
    TCase *all = tcase_create("refused");
    tcase_set_timeout(all, 60);
    tcase_add_loop_test(all, refuses_by_name, 0, N_REFUSALS);
    tcase_add_test(all, refuses_bytes);
    suite_add_tcase(suite, all);
    return run_suite(suite);
}

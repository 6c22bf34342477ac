/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef TESTS_UNIT_JOB_TEXTS_H
#define TESTS_UNIT_JOB_TEXTS_H

/* Texts of jobs that would be good but for the part put into them. Invented. */

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

#endif

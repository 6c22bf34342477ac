/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef RINGFETTLE_STATUS_H
#define RINGFETTLE_STATUS_H

/*
 * What every call of the library answers, and the message that goes with a refusal.
 *
 * The library never exits, never prints and never aborts. GSL's default error handler does abort:
 * a program that uses this library switches it off once (`gsl_set_error_handler_off()`), as
 * `ringfettle` does; the library itself leaves the handler as it finds it.
 */

#if defined(__GNUC__)
#define RF_API __attribute__((visibility("default")))
#define RF_PRINTF(template, first) __attribute__((format(printf, template, first)))
#else
#define RF_API
#define RF_PRINTF(template, first)
#endif

#ifdef __cplusplus
extern "C" {
#endif

/* Classes of status; their numbers are the exit statuses of the program. */
enum rf_class {
    RF_CLASS_DONE = 0,
    RF_CLASS_INPUT = 2,     /* bad usage, or input that is refused */
    RF_CLASS_NUMERICAL = 3, /* the arithmetic failed on input that was accepted */
    RF_CLASS_SYSTEM = 4     /* out of memory, or input and output failed */
};

/* code, class, text */
#define RF_STATUS_LIST(X)                                                                          \
    X(RF_OK, RF_CLASS_DONE, "done")                                                                \
    X(RF_USAGE, RF_CLASS_INPUT, "the call makes no sense as it stands")                            \
    X(RF_SYNTAX, RF_CLASS_INPUT, "the text is not of the format it should be")                     \
    X(RF_REFUSED, RF_CLASS_INPUT, "the input says something that cannot be")                       \
    X(RF_LIMIT, RF_CLASS_INPUT, "the input is larger than the stated limits")                      \
    X(RF_BUSY, RF_CLASS_INPUT, "somebody else is writing this file")                               \
    X(RF_NUMERICAL, RF_CLASS_NUMERICAL, "the arithmetic did not succeed")                          \
    X(RF_MEMORY, RF_CLASS_SYSTEM, "out of memory")                                                 \
    X(RF_IO, RF_CLASS_SYSTEM, "reading or writing failed")

enum rf_status {
#define RF_STATUS_CODE(code, class, text) code,
    RF_STATUS_LIST(RF_STATUS_CODE)
#undef RF_STATUS_CODE
};

/*
 * A refusal in words: the file, the path in it, what was found and what would be right.
 * The caller holds it, and zeroes it or not: it is written only when a call fails. `text` is
 * UTF-8, one line, always terminated, cut at a character's end if it is too long.
 */
struct rf_error {
    enum rf_status status;
    char text[1024];
};

/* The status's class, which is the program's exit status. */
RF_API enum rf_class rf_status_class(enum rf_status status);

/* A constant text for the status; never NULL. */
RF_API const char *rf_status_text(enum rf_status status);

/* The library's version, "major.minor.patch". */
RF_API const char *rf_version(void);

#ifdef __cplusplus
}
#endif

#endif

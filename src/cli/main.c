/* SPDX-License-Identifier: GPL-3.0-or-later */
#define _GNU_SOURCE /* getopt_long */

#include "cli/command.h"
#include "report/wrap.h"

#include <errno.h>
#include <fcntl.h>
#include <getopt.h>
#include <gsl/gsl_errno.h>
#include <signal.h>
#include <stdio.h>
#include <string.h>
#include <unistd.h>

static const struct command *const commands[] = {
    &command_diagnose, &command_check,   &command_expect, &command_simulate, &command_answer,
    &command_record,   &command_convert, &command_new,    &command_review,
};

enum {
    N_COMMANDS = sizeof commands / sizeof commands[0],
    HELP = 'h',
    FIRST_OPTION = 256 /* getopt's values for a command's own options */
};

static const char *const program_options[] = {"help", "version"};

/* --- help --- */

static enum rf_class put_help(struct text *help)
{
    struct rf_error error;
    enum rf_status status = put(help, &error);
    text_finish(help);
    return status == RF_OK ? RF_CLASS_DONE : complain_of(&error);
}

static void say_usage(struct text *out)
{
    text_add(out, "usage: ringfettle COMMAND [OPTION…] [OPERAND…]\n"
                  "       ringfettle --help | --version\n"
                  "       ringfettle COMMAND --help\n");
}

static enum rf_class help(void)
{
    struct text out = {0};
    say_usage(&out);
    text_add(&out, "\n");
    wrap_words(&out, "", "",
               "Localises defects of a ring final circuit from the resistance readings of its dead "
               "tests.");
    text_add(&out, "\ncommands:\n");
    for (size_t i = 0; i < N_COMMANDS; i++)
        wrap_entry(&out, commands[i]->name, commands[i]->summary);
    text_add(&out, "\noptions:\n");
    wrap_entry(&out, "--help", "say this, or behind a command what that command does");
    wrap_entry(&out, "--version", "say the version");
    text_add(&out, "\n");
    wrap_words(&out, "", "",
               "Exit status: 0 done, whatever the verdict; 2 usage or input refused; 3 the "
               "arithmetic failed; 4 out of memory, or reading or writing failed.");
    text_add(&out, "\n");
    wrap_words(
        &out, "", "",
        "For circuits that are isolated, locked off and proved dead. The results guide where "
        "to look and certify nothing.");
    return put_help(&out);
}

static enum rf_class help_command(const struct command *command)
{
    struct text out = {0};
    struct text usage = {0};
    text_addf(&usage, "ringfettle %s [OPTION…] %s", command->name, command->operands);
    if (!usage.failed)
        wrap_words(&out, "usage: ", "       ", usage.bytes);
    text_add(&out, "\n");
    text_finish(&usage);
    for (const char *at = command->about; *at != '\0';) {
        const char *end = strstr(at, "\n\n");
        size_t length = end != NULL ? (size_t)(end - at) : strlen(at);
        struct text paragraph = {0};
        text_append(&paragraph, at, length);
        if (!paragraph.failed)
            wrap_words(&out, "", "", paragraph.bytes);
        text_add(&out, "\n");
        text_finish(&paragraph);
        at += length + strspn(at + length, "\n");
    }
    text_add(&out, "options:\n");
    for (size_t i = 0; i < command->n_options; i++) {
        const struct command_option *option = &command->options[i];
        struct text name = {0};
        text_addf(&name, "--%s%s%s", option->name, option->argument != NULL ? " " : "",
                  option->argument != NULL ? option->argument : "");
        if (!name.failed)
            wrap_entry(&out, name.bytes, option->help);
        text_finish(&name);
    }
    wrap_entry(&out, "--help", "say this");
    return put_help(&out);
}

static enum rf_class version(void)
{
    struct text out = {0};
    text_addf(&out, "ringfettle %s\n", rf_version());
    return put_help(&out);
}

/* --- a command's arguments --- */

/* Says what is wrong with the argument getopt stopped at. */
static enum rf_class complain_option(const struct command *command, int found, const char *argument)
{
    if (found == ':')
        return complain_usage(command, "%s needs a value", argument);
    if (strncmp(argument, "--", 2) != 0)
        return complain_usage(command, "no option -%c", optopt);
    const char *known[OPTIONS_MAX + 1] = {"help"};
    size_t n = 1;
    for (size_t i = 0; i < command->n_options; i++)
        known[n++] = command->options[i].name;

    const char *word = argument + strspn(argument, "-");
    size_t length = strcspn(word, "=");
    char name[64];
    snprintf(name, sizeof name, "%.*s", (int)(length < sizeof name ? length : sizeof name - 1),
             word);
    for (size_t i = 0; i < n; i++)
        if (word[length] == '=' && strcmp(known[i], name) == 0)
            return complain_usage(command, "--%s takes no value", name);
    const char *nearest = text_nearest(name, known, n);
    if (nearest != NULL)
        return complain_usage(command, "no option %s; did you mean --%s?", argument, nearest);
    return complain_usage(command, "no option %s", argument);
}

static enum rf_class run_command(const struct command *command, int argc, char *argv[])
{
    struct option options[OPTIONS_MAX + 2] = {{"help", no_argument, NULL, HELP}};
    for (size_t i = 0; i < command->n_options; i++)
        options[i + 1] = (struct option){
            .name = command->options[i].name,
            .has_arg = command->options[i].argument != NULL ? required_argument : no_argument,
            .val = FIRST_OPTION + (int)i,
        };

    struct invocation invocation = {.command = command};
    opterr = 0;
    for (;;) {
        int before = optind;
        int found = getopt_long(argc, argv, ":h", options, NULL);
        if (found == -1)
            break;
        if (found == HELP)
            return help_command(command);
        if (found < FIRST_OPTION) {
            const char *argument = argv[optind > before ? optind - 1 : before];
            return complain_option(command, found, argument);
        }
        invocation.values[found - FIRST_OPTION] = optarg != NULL ? optarg : "";
    }
    invocation.n_operands = (size_t)(argc - optind);
    invocation.operands = argv + optind;
    if (invocation.n_operands < command->least)
        return complain_usage(command, "needs %s", command->needs);
    if (command->most != SEVERAL && invocation.n_operands > (size_t)command->most)
        return complain_usage(command, "nothing to do with %s", invocation.operands[command->most]);
    return command->run(&invocation);
}

/* --- the program --- */

static const struct command *find_command(const char *name)
{
    for (size_t i = 0; i < N_COMMANDS; i++)
        if (strcmp(commands[i]->name, name) == 0)
            return commands[i];
    return NULL;
}

static enum rf_class complain_command(const char *name)
{
    const char *names[N_COMMANDS + 2];
    bool is_option = name[0] == '-' && name[1] != '\0';
    size_t n = 0;
    if (is_option)
        for (; n < sizeof program_options / sizeof program_options[0]; n++)
            names[n] = program_options[n];
    else
        for (; n < N_COMMANDS; n++)
            names[n] = commands[n]->name;
    const char *nearest = text_nearest(name + (is_option ? strspn(name, "-") : 0), names, n);
    const char *what = is_option ? "option" : "command";
    if (nearest != NULL)
        complain("no %s %s; did you mean %s%s?", what, name, is_option ? "--" : "", nearest);
    else
        complain("no %s %s; ringfettle --help lists what there is", what, name);
    return RF_CLASS_INPUT;
}

/* A file opened later must not become standard output because somebody closed that: what is
 * closed is opened on /dev/null, the wrong way round, so that its use fails as it should. */
static void occupy_closed(void)
{
    for (int fd = STDIN_FILENO; fd <= STDERR_FILENO; fd++)
        if (fcntl(fd, F_GETFD) == -1 && errno == EBADF)
            (void)!open("/dev/null", fd == STDIN_FILENO ? O_WRONLY : O_RDONLY);
}

static enum rf_class run(int argc, char *argv[])
{
    if (argc < 2) {
        struct text usage = {0};
        say_usage(&usage);
        if (!usage.failed)
            fputs(usage.bytes, stderr);
        text_finish(&usage);
        return RF_CLASS_INPUT;
    }
    if (strcmp(argv[1], "--help") == 0 || strcmp(argv[1], "-h") == 0)
        return help();
    if (strcmp(argv[1], "--version") == 0)
        return version();
    const struct command *command = find_command(argv[1]);
    if (command == NULL)
        return complain_command(argv[1]);
    return run_command(command, argc - 1, argv + 1);
}

int main(int argc, char *argv[])
{
    occupy_closed();
    signal(SIGPIPE, SIG_IGN); /* a closed pipe is a failed write like any other */
    gsl_set_error_handler_off();
    return (int)run(argc, argv);
}

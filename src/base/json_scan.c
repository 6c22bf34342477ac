/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/json_scan.h"

#include "base/json.h"

#include <string.h>

enum { NUMBER_MAX = 60 }; /* characters; cJSON holds 63 */

enum expected { VALUE, VALUE_OR_END, KEY, KEY_OR_END, COLON, COMMA_OR_END, NOTHING };

static const char *const expected_words[] = {
    [VALUE] = "a value",
    [VALUE_OR_END] = "a value or ]",
    [KEY] = "a key in double quotes",
    [KEY_OR_END] = "a key in double quotes or }",
    [COLON] = "a colon",
    [COMMA_OR_END] = "a comma or the closing bracket",
    [NOTHING] = "nothing more behind the closing bracket",
};

struct scanner {
    const char *bytes;
    size_t length, at;
    enum expected expected;
    bool in_object[JSON_MAX_DEPTH];
    size_t depth;
    struct json_scan result;
};

static bool refuse(struct scanner *scanner, size_t where, const char *needs)
{
    scanner->result = (struct json_scan){.bad = where, .needs = needs};
    return false;
}

/* The text ended where more could have come. */
static bool ended(struct scanner *scanner, const char *needs)
{
    scanner->result = (struct json_scan){.good = true, .bad = scanner->length, .needs = needs};
    return false;
}

/* The byte at the cursor, or −1 at the end. */
static int peek(const struct scanner *scanner)
{
    return scanner->at < scanner->length ? (unsigned char)scanner->bytes[scanner->at] : -1;
}

static bool is_digit(int byte)
{
    return byte >= '0' && byte <= '9';
}

static bool scan_digits(struct scanner *scanner, size_t start)
{
    static const char needs[] = "a number as JSON spells it, such as 0.25 or 3e-2";
    if (peek(scanner) < 0)
        return ended(scanner, needs);
    if (!is_digit(peek(scanner)))
        return refuse(scanner, start, needs);
    while (is_digit(peek(scanner)))
        scanner->at++;
    return true;
}

static bool scan_number(struct scanner *scanner)
{
    size_t start = scanner->at;
    if (peek(scanner) == '-')
        scanner->at++;
    if (peek(scanner) == '0')
        scanner->at++;
    else if (!scan_digits(scanner, start))
        return false;
    if (peek(scanner) == '.') {
        scanner->at++;
        if (!scan_digits(scanner, start))
            return false;
    }
    if (peek(scanner) == 'e' || peek(scanner) == 'E') {
        scanner->at++;
        if (peek(scanner) == '+' || peek(scanner) == '-')
            scanner->at++;
        if (!scan_digits(scanner, start))
            return false;
    }
    if (is_digit(peek(scanner)) || peek(scanner) == '.')
        return refuse(scanner, start, "a number as JSON spells it, such as 0.25 or 3e-2");
    if (scanner->at - start > NUMBER_MAX)
        return refuse(scanner, start, "a number of at most 60 characters");
    return true;
}

/* Four hexadecimal digits at the cursor. */
static bool scan_code_unit(struct scanner *scanner, unsigned *unit)
{
    *unit = 0;
    for (int i = 0; i < 4; i++, scanner->at++) {
        int byte = peek(scanner);
        if (byte < 0)
            return ended(scanner, "four hexadecimal digits");
        unsigned digit;
        if (is_digit(byte))
            digit = (unsigned)(byte - '0');
        else if (byte >= 'a' && byte <= 'f')
            digit = (unsigned)(byte - 'a') + 10;
        else if (byte >= 'A' && byte <= 'F')
            digit = (unsigned)(byte - 'A') + 10;
        else
            return refuse(scanner, scanner->at, "four hexadecimal digits");
        *unit = *unit * 16 + digit;
    }
    return true;
}

/* What follows \u: a character, or the two halves of one beyond U+FFFF. */
static bool scan_unicode_escape(struct scanner *scanner, size_t start)
{
    static const char needs[] = "both halves of a surrogate pair";
    unsigned unit;
    if (!scan_code_unit(scanner, &unit))
        return false;
    if (unit == 0)
        return refuse(scanner, start, "text without the character U+0000");
    if (unit < 0xD800 || unit > 0xDFFF)
        return true;
    if (unit > 0xDBFF)
        return refuse(scanner, start, needs);
    for (const char *next = "\\u"; *next != '\0'; next++, scanner->at++) {
        if (peek(scanner) < 0)
            return ended(scanner, needs);
        if (peek(scanner) != *next)
            return refuse(scanner, start, needs);
    }
    if (!scan_code_unit(scanner, &unit))
        return false;
    return (unit >= 0xDC00 && unit <= 0xDFFF) || refuse(scanner, start, needs);
}

static bool scan_escape(struct scanner *scanner)
{
    size_t start = scanner->at++;
    int byte = peek(scanner);
    if (byte < 0)
        return ended(scanner, "an escape");
    if (byte == 0 || strchr("\"\\/bfnrtu", byte) == NULL)
        return refuse(scanner, start, "one of the escapes \\\" \\\\ \\/ \\b \\f \\n \\r \\t \\u");
    scanner->at++;
    return byte != 'u' || scan_unicode_escape(scanner, start);
}

static bool scan_string(struct scanner *scanner)
{
    scanner->at++;
    for (;;) {
        int byte = peek(scanner);
        if (byte < 0)
            return ended(scanner, "the closing double quote");
        if (byte < 0x20)
            return refuse(scanner, scanner->at,
                          "the closing double quote, or control characters as escapes (\\n, \\t)");
        if (byte == '\\') {
            if (!scan_escape(scanner))
                return false;
            continue;
        }
        scanner->at++;
        if (byte == '"')
            return true;
    }
}

static bool scan_word(struct scanner *scanner, const char *word)
{
    size_t start = scanner->at;
    for (; *word != '\0'; word++, scanner->at++) {
        if (peek(scanner) < 0)
            return ended(scanner, expected_words[VALUE]);
        if (peek(scanner) != *word)
            return refuse(scanner, start, expected_words[VALUE]);
    }
    return true;
}

static void value_read(struct scanner *scanner)
{
    scanner->expected = scanner->depth > 0 ? COMMA_OR_END : NOTHING;
}

static bool scan_opening(struct scanner *scanner, bool object)
{
    if (scanner->depth == JSON_MAX_DEPTH)
        return refuse(scanner, scanner->at, "brackets nested at most 64 deep");
    scanner->in_object[scanner->depth++] = object;
    scanner->expected = object ? KEY_OR_END : VALUE_OR_END;
    scanner->at++;
    return true;
}

static bool scan_closing(struct scanner *scanner)
{
    scanner->depth--;
    scanner->at++;
    value_read(scanner);
    return true;
}

static bool scan_value(struct scanner *scanner, int byte)
{
    bool good;
    if (byte == '{' || byte == '[')
        return scan_opening(scanner, byte == '{');
    if (byte == '"')
        good = scan_string(scanner);
    else if (byte == '-' || is_digit(byte))
        good = scan_number(scanner);
    else if (byte == 't')
        good = scan_word(scanner, "true");
    else if (byte == 'f')
        good = scan_word(scanner, "false");
    else if (byte == 'n')
        good = scan_word(scanner, "null");
    else
        good = refuse(scanner, scanner->at, expected_words[scanner->expected]);
    if (good)
        value_read(scanner);
    return good;
}

static bool scan_key(struct scanner *scanner)
{
    scanner->expected = COLON;
    return scan_string(scanner);
}

static bool scan_mark(struct scanner *scanner, enum expected next)
{
    scanner->expected = next;
    scanner->at++;
    return true;
}

/* One step of the grammar from a byte that is no white space. */
static bool scan_step(struct scanner *scanner, int byte)
{
    bool object = scanner->depth > 0 && scanner->in_object[scanner->depth - 1];
    enum expected expected = scanner->expected;

    if ((expected == KEY || expected == KEY_OR_END) && byte == '"')
        return scan_key(scanner);
    if (expected == KEY_OR_END && byte == '}')
        return scan_closing(scanner);
    if (expected == COMMA_OR_END && byte == (object ? '}' : ']'))
        return scan_closing(scanner);
    if (expected == COMMA_OR_END && byte == ',')
        return scan_mark(scanner, object ? KEY : VALUE);
    if (expected == COLON && byte == ':')
        return scan_mark(scanner, VALUE);
    if (expected == VALUE_OR_END && byte == ']')
        return scan_closing(scanner);
    if (expected == VALUE || expected == VALUE_OR_END)
        return scan_value(scanner, byte);
    return refuse(scanner, scanner->at, expected_words[expected]);
}

struct json_scan json_scan_text(const char *bytes, size_t length)
{
    struct scanner scanner = {.bytes = bytes, .length = length, .expected = VALUE};
    for (;;) {
        int byte = peek(&scanner);
        if (byte < 0)
            break;
        if (byte == ' ' || byte == '\t' || byte == '\n' || byte == '\r')
            scanner.at++;
        else if (!scan_step(&scanner, byte))
            return scanner.result;
    }
    return (struct json_scan){.good = true,
                              .complete = scanner.expected == NOTHING,
                              .bad = length,
                              .needs = expected_words[scanner.expected]};
}

size_t json_scan(const char *bytes, size_t length, bool *complete)
{
    struct json_scan scan = json_scan_text(bytes, length);
    if (complete != NULL)
        *complete = scan.complete;
    return scan.bad;
}

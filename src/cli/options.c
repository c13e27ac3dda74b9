/* Reading the command line: one pass finds the command, a second one reads the
 * options that it takes.  `--name value` and `--name=value` are the same. */
#include "cli/options.h"

#include <errno.h>
#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "cli/command.h"

static const option_spec common_options[] = {
    {OPTION_SET, "--set", 0, "NAME=VALUE",
     "replace a number of the file: k2=0.1, [A]=2, [X]0=1e-3, R3.kf=10; may be repeated"},
    {OPTION_JSON, "--json", 0, NULL, "print one JSON object instead of text"},
    {OPTION_SEED, "--seed", 0, "N", "where the sampling starts (0); the same seed gives the same answer"},
    {OPTION_QUIET, "--quiet", 0, NULL, "no warnings, notes or progress"},
    {OPTION_HELP, "--help", 'h', NULL, "show this help"},
};

static const option_spec version_option = {OPTION_VERSION, "--version", 0, NULL, "show the version"};

enum { COMMON_COUNT = sizeof common_options / sizeof *common_options };

const option_spec *options_common(size_t *count)
{
    *count = COMMON_COUNT;
    return common_options;
}

static bool fail(options *o, const char *remedy, const char *format, ...) __attribute__((format(printf, 3, 4)));

/* Record what is wrong, and return false. */
static bool fail(options *o, const char *remedy, const char *format, ...)
{
    o->problem.code = LB_E_ARG;
    va_list list;
    va_start(list, format);
    vsnprintf(o->problem.message, sizeof o->problem.message, format, list);
    va_end(list);
    snprintf(o->problem.remedy, sizeof o->problem.remedy, "%s", remedy ? remedy : "");
    return false;
}

static bool fail_memory(options *o)
{
    fail(o, NULL, "%s", lb_status_text(LB_E_NOMEM));
    o->problem.code = LB_E_NOMEM;
    return false;
}

/* Does the argument name this option?  "--until=60" does; *value is then the text behind "=". */
static bool matches(const option_spec *spec, const char *argument, const char **value)
{
    *value = NULL;
    if (argument[1] != '-') {
        if (argument[1] != spec->letter)
            return false;
        if (argument[2])
            *value = argument + 2;
        return true;
    }
    size_t length = strcspn(argument, "=");
    if (strlen(spec->name) != length || strncmp(spec->name, argument, length) != 0)
        return false;
    if (argument[length] == '=')
        *value = argument + length + 1;
    return true;
}

static const option_spec *find_among(const option_spec *specs, size_t count, const char *argument, const char **value)
{
    for (size_t i = 0; i < count; i++)
        if (matches(&specs[i], argument, value))
            return &specs[i];
    return NULL;
}

/* An option of this command, or one that all have. */
static const option_spec *find_option(const command *c, const char *argument, const char **value)
{
    const option_spec *spec = find_among(c->own, c->own_count, argument, value);
    if (!spec)
        spec = find_among(common_options, COMMON_COUNT, argument, value);
    if (!spec)
        spec = find_among(&version_option, 1, argument, value);
    return spec;
}

/* An option of any command; *owner is the first that has it. */
static const option_spec *find_anywhere(const char *argument, const char **value, const command **owner)
{
    size_t count;
    const command *const *list = command_list(&count);
    for (size_t i = 0; i < count; i++) {
        const option_spec *spec = find_option(list[i], argument, value);
        if (spec) {
            *owner = list[i];
            return spec;
        }
    }
    return NULL;
}

static bool is_option(const char *argument)
{
    return argument[0] == '-' && argument[1] != '\0';
}

/* Index of the first argument that is neither an option nor an option's value; 0: none. */
static int first_word(int argc, char **argv)
{
    for (int i = 1; i < argc; i++) {
        if (strcmp(argv[i], "--") == 0)
            return 0;
        if (!is_option(argv[i]))
            return i;
        const char *value;
        const command *owner;
        const option_spec *spec = find_anywhere(argv[i], &value, &owner);
        if (spec && spec->value && !value)
            i++;
    }
    return 0;
}

static bool add_setting(options *o, const char *text)
{
    const char *equals = strchr(text, '=');
    if (!equals || equals == text || !equals[1])
        return fail(o, "write --set NAME=VALUE, for example --set k2=0.1", "`%s` is not NAME=VALUE", text);
    lb_setting *more = realloc(o->settings, (o->setting_count + 1) * sizeof *more);
    if (!more)
        return fail_memory(o);
    o->settings = more;
    char *name = strndup(text, (size_t)(equals - text));
    if (!name)
        return fail_memory(o);
    o->settings[o->setting_count++] = (lb_setting){.name = name, .value = equals + 1};
    return true;
}

/* A whole number from low on. */
static bool read_whole(options *o, const option_spec *spec, const char *text, uint64_t low, uint64_t *value)
{
    char *end;
    errno = 0;
    unsigned long long number = strtoull(text, &end, 10);
    if (text[0] < '0' || text[0] > '9' || *end || errno || number < low)
        return fail(o, NULL, "%s takes a whole number%s, and `%s` is none", spec->name, low ? " above zero" : "", text);
    *value = number;
    return true;
}

/* A finite number above zero, and at most high. */
static bool read_positive(options *o, const option_spec *spec, const char *text, double high, double *value)
{
    char *end;
    double number = strtod(text, &end);
    if (end == text || *end || !isfinite(number) || number <= 0)
        return fail(o, NULL, "%s takes a number above zero, and `%s` is none", spec->name, text);
    if (number > high)
        return fail(o, NULL, "%s takes at most %g, and `%s` is more", spec->name, high, text);
    *value = number;
    return true;
}

static bool read_scopes(options *o, const char *text)
{
    o->given = o->ranges = false;
    for (const char *word = text;; word++) {
        size_t length = strcspn(word, ",");
        if (length == 5 && strncmp(word, "given", length) == 0)
            o->given = true;
        else if (length == 6 && strncmp(word, "ranges", length) == 0)
            o->ranges = true;
        else
            return fail(o, "write --scope given, --scope ranges or --scope given,ranges",
                        "`%.*s` is not a scope", (int)length, word);
        word += length;
        if (!*word)
            return true;
    }
}

static bool read_solver(options *o, const char *text)
{
    if (strcmp(text, "gsl") == 0)
        o->solver = LB_SOLVER_GSL;
    else if (strcmp(text, "cvodes") == 0)
        o->solver = LB_SOLVER_CVODES;
    else
        return fail(o, "write --for gsl or --for cvodes", "`%s` is not a library that emit knows", text);
    return true;
}

static bool apply(options *o, const option_spec *spec, const char *value)
{
    const double most_seconds = 1e9, most_tolerance = 1e-2;
    uint64_t number = 0;
    switch (spec->id) {
    case OPTION_JSON: o->json = true; return true;
    case OPTION_QUIET: o->quiet = true; return true;
    case OPTION_HELP: o->help = true; return true;
    case OPTION_VERSION: o->version = true; return true;
    case OPTION_SET: return add_setting(o, value);
    case OPTION_SEED: return read_whole(o, spec, value, 0, &o->seed);
    case OPTION_UNTIL: o->until = value; return true;
    case OPTION_EVERY: o->every = value; return true;
    case OPTION_TOLERANCE: return read_positive(o, spec, value, most_tolerance, &o->tolerance);
    case OPTION_OUTPUT: o->output = value; return true;
    case OPTION_NAME: o->name = value; return true;
    case OPTION_FOR: return read_solver(o, value);
    case OPTION_SCOPE: return read_scopes(o, value);
    case OPTION_SAMPLES:
        if (!read_whole(o, spec, value, 1, &number))
            return false;
        o->samples = (size_t)number;
        return true;
    case OPTION_NATIVE: o->native = true; return true;
    case OPTION_ALONG: o->along = value; return true;
    case OPTION_SENSITIVITIES: o->sensitivities = true; return true;
    case OPTION_SECONDS: return read_positive(o, spec, value, most_seconds, &o->seconds);
    }
    return false;
}

/* "limbeck steady", or "limbeck" for the page. */
static void command_words(const command *c, char *text, size_t size)
{
    snprintf(text, size, "limbeck%s%s", *c->name ? " " : "", c->name);
}

static bool fail_unknown_option(options *o, const char *argument)
{
    char words[64], remedy[200];
    const char *value;
    const command *owner = NULL;
    command_words(o->command, words, sizeof words);
    if (find_anywhere(argument, &value, &owner)) {
        char other[64];
        command_words(owner, other, sizeof other);
        snprintf(remedy, sizeof remedy, "it belongs to `%s`", other);
        return fail(o, remedy, "`%s` has no option %.*s", words, (int)strcspn(argument, "="), argument);
    }
    const char *names[32];
    size_t count = 0;
    for (size_t i = 0; i < o->command->own_count; i++)
        names[count++] = o->command->own[i].name;
    for (size_t i = 0; i < COMMON_COUNT; i++)
        names[count++] = common_options[i].name;
    char bare[64];
    snprintf(bare, sizeof bare, "%.*s", (int)strcspn(argument, "="), argument);
    const char *nearest = lb_nearest(bare, names, count);
    if (nearest)
        snprintf(remedy, sizeof remedy, "did you mean %s?", nearest);
    else
        snprintf(remedy, sizeof remedy, "`%s --help` lists the options", words);
    return fail(o, remedy, "`%s` has no option %s", words, bare);
}

/* The option at argv[*i], and its value where that is the next argument. */
static bool read_option(options *o, int argc, char **argv, int *i)
{
    const char *value;
    const option_spec *spec = find_option(o->command, argv[*i], &value);
    if (!spec)
        return fail_unknown_option(o, argv[*i]);
    if (!spec->value && value)
        return fail(o, NULL, "%s takes no value", spec->name);
    if (spec->value && !value) {
        if (*i + 1 >= argc)
            return fail(o, NULL, "%s needs a value: %s %s", spec->name, spec->name, spec->value);
        value = argv[++*i];
    }
    return apply(o, spec, value);
}

static bool is_time_unit(const char *word)
{
    static const char *const units[] = {"ms", "s", "min", "h"};
    for (size_t i = 0; i < sizeof units / sizeof *units; i++)
        if (strcmp(word, units[i]) == 0)
            return true;
    return false;
}

/* A second word: a unit that lost its quotes, a misspelt or misplaced command, or one file too many. */
static bool fail_second_word(options *o, const char *word)
{
    char remedy[200];
    if (!*o->command->name && command_find(word)) {
        snprintf(remedy, sizeof remedy, "the command comes first: limbeck %s %s", word, o->file);
        return fail(o, remedy, "`%s` stands after the file", word);
    }
    if (!*o->command->name && access(o->file, F_OK) != 0) {
        const char *nearest = command_nearest(o->file);
        if (nearest)
            snprintf(remedy, sizeof remedy, "did you mean `limbeck %s %s`?", nearest, word);
        return fail(o, nearest ? remedy : "`limbeck --help` lists the commands", "there is no command `%s`", o->file);
    }
    if ((o->until || o->every) && is_time_unit(word)) {
        snprintf(remedy, sizeof remedy, "quote a time with its unit: --until \"1 %s\"", word);
        return fail(o, remedy, "`%s` stands alone", word);
    }
    return fail(o, NULL, "one mechanism file at a time: `%s` is a second one", word);
}

static bool add_word(options *o, const char *word)
{
    if (o->file)
        return fail_second_word(o, word);
    if (!*word)
        return fail(o, NULL, "the file's name is empty");
    o->file = word;
    return true;
}

/* --json holds for the message about a wrong option too, wherever it stands. */
static bool wants_json(int argc, char **argv)
{
    for (int i = 1; i < argc && strcmp(argv[i], "--") != 0; i++)
        if (strcmp(argv[i], "--json") == 0)
            return true;
    return false;
}

static bool read_arguments(options *o, int argc, char **argv, int command_index)
{
    bool only_words = false;
    for (int i = 1; i < argc; i++) {
        if (i == command_index)
            continue;
        if (!only_words && strcmp(argv[i], "--") == 0)
            only_words = true;
        else if (only_words || !is_option(argv[i])) {
            if (!add_word(o, argv[i]))
                return false;
        } else if (!read_option(o, argc, argv, &i))
            return false;
    }
    return true;
}

bool options_parse(int argc, char **argv, options *o)
{
    memset(o, 0, sizeof *o);
    o->command = &command_page;
    o->given = o->ranges = true;
    o->json = wants_json(argc, argv);
    int index = first_word(argc, argv);
    bool asks_help = index && strcmp(argv[index], "help") == 0;
    const command *named = index ? command_find(argv[index]) : NULL;
    if (named)
        o->command = named;
    if (!read_arguments(o, argc, argv, named || asks_help ? index : 0))
        return false;
    if (asks_help) {
        o->help = true;
        o->topic = o->file;
    }
    if (!o->file && !o->help && !o->version) {
        char words[64];
        command_words(o->command, words, sizeof words);
        return fail(o, "`limbeck --help` shows what there is", "a mechanism file is missing: %s FILE", words);
    }
    return true;
}

void options_clear(options *o)
{
    for (size_t i = 0; i < o->setting_count; i++)
        free((char *)o->settings[i].name);
    free(o->settings);
    o->settings = NULL;
    o->setting_count = 0;
}

/* pages.c: the manual page and the shell completions, made at build time from the tables of the
 * command line: pages man|bash|zsh VERSION. */
#include <ctype.h>
#include <stdlib.h>
#include <string.h>

#include "cli/options.h"

/* roff: backslashes and dashes escaped; no line begins with a dot or an apostrophe. */
static void put_roff(const char *text)
{
    bool at_start = true;
    for (; *text != '\0'; text++) {
        if (at_start && (*text == '.' || *text == '\'')) {
            fputs("\\&", stdout);
        }
        if (*text == '\\') {
            fputs("\\e", stdout);
        } else if (*text == '-') {
            fputs("\\-", stdout);
        } else if (*text != '`') {
            putchar(*text);
        }
        at_start = *text == '\n';
    }
}

static void put_option_roff(const struct option_row *row)
{
    fputs(".TP\n.B ", stdout);
    if (row->letter != 0) {
        printf("\\-%c, ", row->letter);
    }
    printf("\\-\\-%s", row->name);
    if (row->argument != ARGUMENT_NONE) {
        fputs(row->argument == ARGUMENT_OPTIONAL ? " [" : " ", stdout);
        put_roff(row->argument_name);
        fputs(row->argument == ARGUMENT_OPTIONAL ? "]" : "", stdout);
    }
    putchar('\n');
    put_roff(row->text);
    if (row->argument != ARGUMENT_NONE) {
        fputs(" (default: ", stdout);
        put_roff(row->standard);
        putchar(')');
    }
    fputs(". With:", stdout);
    for (int v = 0; v < VERB_COUNT; v++) {
        if ((row->verbs & 1u << v) != 0) {
            printf(" %s", verb_rows[v].word);
        }
    }
    fputs(".\n", stdout);
}

static void write_man(const char *version)
{
    printf(".TH AMPSTEAD 1 \"\" \"ampstead %s\" \"User Commands\"\n", version);
    fputs(
        ".SH NAME\nampstead \\- the DC operating point of a bias cell, and whether the hand design "
        "holds\n.SH SYNOPSIS\n.B ampstead\n.I FILE.cell\n[options]\n.br\n.B ampstead\n.I VERB "
        "FILE\n[options]\n.SH DESCRIPTION\nReads a bias cell that a designer wrote by hand, finds "
        "its operating point, sweeps the load voltage, and tells on one page whether the hand "
        "design holds. FILE may be \\- for standard input.\n.SH VERBS\n",
        stdout);
    for (int v = 0; v < VERB_COUNT; v++) {
        printf(".TP\n.B %s ", verb_rows[v].word);
        put_roff(verb_rows[v].argument);
        putchar('\n');
        put_roff(verb_rows[v].summary);
        fputs(".\n", stdout);
        put_roff(verb_rows[v].text);
        putchar('\n');
    }
    fputs(".SH OPTIONS\n", stdout);
    for (int k = 0; k < OPTION_COUNT; k++) {
        put_option_roff(&option_rows[k]);
    }
    fputs(".SH EXIT STATUS\n", stdout);
    for (const struct status_row *row = status_rows; row->text != NULL; row++) {
        printf(".TP\n.B %d\n%s\n", row->status, row->text);
    }
    fputs(".SH ENVIRONMENT\n.TP\n.B NO_COLOR\nno colour, unless \\-\\-color says otherwise\n"
          ".SH SEE ALSO\n.BR ampstead\\-cell (5),\n.BR ampstead\\-process (5)\n",
          stdout);
}

/* Files that a verb reads, as shell patterns. */
static const char *file_pattern(const struct verb_row *row)
{
    return strncmp(row->argument, "FILE.csv", 8) == 0 ? "csv"
           : strcmp(row->argument, "FILE.cell") == 0  ? "cell"
                                                      : "cell|process";
}

static bool takes_file(const struct option_row *row)
{
    return row->argument != ARGUMENT_NONE && (strncmp(row->argument_name, "FILE", 4) == 0 ||
                                              strstr(row->argument_name, ".csv") != NULL);
}

static void put_words(unsigned verbs)
{
    for (int k = 0; k < OPTION_COUNT; k++) {
        if ((option_rows[k].verbs & verbs) != 0) {
            printf(" --%s", option_rows[k].name);
        }
    }
}

static void put_verbs(void)
{
    for (int v = 0; v < VERB_COUNT; v++) {
        printf("%s%s", v > 0 ? " " : "", verb_rows[v].word);
    }
}

static void write_bash(void)
{
    fputs("# bash completion for ampstead, made from the tables of the program\n"
          "_ampstead_files() {\n"
          "    local IFS=$'\\n'\n"
          "    COMPREPLY+=($(compgen -d -- \"$cur\"))\n"
          "    COMPREPLY+=($(compgen -f -X \"!*.@($1)\" -- \"$cur\"))\n"
          "}\n"
          "_ampstead() {\n"
          "    local cur=${COMP_WORDS[COMP_CWORD]} prev=${COMP_WORDS[COMP_CWORD - 1]} verb= word\n"
          "    COMPREPLY=()\n"
          "    for word in \"${COMP_WORDS[@]:1:COMP_CWORD-1}\"; do\n"
          "        case $word in\n        ",
          stdout);
    for (int v = 0; v < VERB_COUNT; v++) {
        printf("%s%s", v > 0 ? " | " : "", verb_rows[v].word);
    }
    fputs(") [ -z \"$verb\" ] && verb=$word ;;\n        esac\n    done\n    case $prev in\n",
          stdout);
    for (int k = 0; k < OPTION_COUNT; k++) {
        const struct option_row *row = &option_rows[k];
        if (row->choices != NULL) {
            printf("    --%s)\n        COMPREPLY=($(compgen -W \"", row->name);
            for (int c = 0; row->choices[c] != NULL; c++) {
                printf("%s%s", c > 0 ? " " : "", row->choices[c]);
            }
            fputs("\" -- \"$cur\"))\n        return\n        ;;\n", stdout);
        } else if (takes_file(row) && row->argument != ARGUMENT_OPTIONAL) {
            printf("    --%s)\n        COMPREPLY=($(compgen -f -- \"$cur\"))\n        return\n"
                   "        ;;\n",
                   row->name);
        } else if (row->argument == ARGUMENT_NEEDED) {
            printf("    --%s) return ;;\n", row->name);
        }
    }
    fputs("    esac\n    if [[ $cur == -* ]]; then\n        case $verb in\n", stdout);
    for (int v = 0; v < VERB_COUNT; v++) {
        printf("        %s) word=\"", verb_rows[v].word);
        put_words(1u << v);
        fputs("\" ;;\n", stdout);
    }
    fputs("        *) word=\"", stdout);
    put_words(1u << VERB_REVIEW);
    fputs("\" ;;\n        esac\n        COMPREPLY=($(compgen -W \"$word\" -- \"$cur\"))\n"
          "        return\n    fi\n    case $verb in\n",
          stdout);
    fputs("    help) COMPREPLY=($(compgen -W \"", stdout);
    put_verbs();
    fputs("\" -- \"$cur\")) ;;\n    '')\n        COMPREPLY=($(compgen -W \"", stdout);
    put_verbs();
    fputs("\" -- \"$cur\"))\n        _ampstead_files cell\n        ;;\n", stdout);
    for (int v = 0; v < VERB_COUNT; v++) {
        if (v != VERB_HELP) {
            printf("    %s) _ampstead_files '%s' ;;\n", verb_rows[v].word,
                   file_pattern(&verb_rows[v]));
        }
    }
    fputs("    esac\n}\nshopt -s extglob\ncomplete -o filenames -F _ampstead ampstead\n", stdout);
}

/* Text inside a [...] of _arguments inside single quotes. */
static void put_zsh(const char *text)
{
    for (; *text != '\0'; text++) {
        if (strchr("[]:\\", *text) != NULL) {
            putchar('\\');
        }
        if (*text == '\'') {
            fputs("'\\''", stdout);
        } else {
            putchar(*text);
        }
    }
}

/* One line of the list that _arguments reads, under the verbs that take the option. */
static void put_zsh_option(enum option option)
{
    const struct option_row *row = &option_rows[option];
    /* an argument that may be left out must stand in the same word */
    const char *end = row->argument == ARGUMENT_NONE       ? ""
                      : row->argument == ARGUMENT_OPTIONAL ? "=-"
                                                           : "=";
    fputs("    [[ \"", stdout);
    for (int v = 0; v < VERB_COUNT; v++) {
        if ((row->verbs & 1u << v) != 0) {
            printf(" %s", verb_rows[v].word);
        }
    }
    fputs(" \" == *\" $verb \"* ]] && options+=(", stdout);
    const char *often = option == OPTION_SET ? "'*'" : "";
    if (row->letter != 0) {
        printf("%s{-%c,--%s%s}'[", often, row->letter, row->name, end);
    } else {
        printf("'--%s%s[", row->name, end);
    }
    put_zsh(row->text);
    putchar(']');
    if (row->argument != ARGUMENT_NONE) {
        fputs(row->argument == ARGUMENT_OPTIONAL ? "::" : ":", stdout);
        put_zsh(row->argument_name);
        putchar(':');
        if (row->choices != NULL) {
            putchar('(');
            for (int c = 0; row->choices[c] != NULL; c++) {
                printf("%s%s", c > 0 ? " " : "", row->choices[c]);
            }
            putchar(')');
        } else if (takes_file(row)) {
            fputs("_files", stdout);
        }
    }
    fputs("')\n", stdout);
}

static void write_zsh(void)
{
    fputs("#compdef ampstead\n# zsh completion for ampstead, made from the tables of the program\n"
          "_ampstead_first() {\n    _describe verb verbs\n    _files -g '*.cell(-.)'\n}\n"
          "_ampstead_files() {\n    case $verb in\n    help) _describe verb verbs ;;\n",
          stdout);
    for (int v = 0; v < VERB_COUNT; v++) {
        if (v != VERB_HELP) {
            printf("    %s) _files -g '*.(%s)(-.)' ;;\n", verb_rows[v].word,
                   file_pattern(&verb_rows[v]));
        }
    }
    fputs("    esac\n}\n_ampstead() {\n    local -a verbs options\n    local verb=review word\n"
          "    verbs=(\n",
          stdout);
    for (int v = 0; v < VERB_COUNT; v++) {
        printf("        '%s:", verb_rows[v].word);
        put_zsh(verb_rows[v].summary);
        fputs("'\n", stdout);
    }
    fputs("    )\n    for word in \"${(@)words[2,CURRENT-1]}\"; do\n"
          "        if (( ${verbs[(I)$word:*]} )); then\n            verb=$word\n"
          "            break\n        fi\n    done\n",
          stdout);
    for (int k = 0; k < OPTION_COUNT; k++) {
        put_zsh_option((enum option)k);
    }
    fputs("    _arguments -S \"${(@)options}\" '1:verb or cell:_ampstead_first' "
          "'*:file:_ampstead_files'\n}\n_ampstead \"$@\"\n",
          stdout);
}

int main(int argc, char **argv)
{
    const char *what = argc == 3 ? argv[1] : "";
    if (strcmp(what, "man") == 0) {
        write_man(argv[2]);
    } else if (strcmp(what, "bash") == 0) {
        write_bash();
    } else if (strcmp(what, "zsh") == 0) {
        write_zsh();
    } else {
        fputs("pages man|bash|zsh VERSION\n", stderr);
        return EXIT_FAILURE;
    }
    return fflush(stdout) == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}

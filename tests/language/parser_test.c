/* parser_test.c: texts to trees; the files of accept/ and reject/. */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <dirent.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

#include "check.h"
#include "language/expression.h"
#include "language/parser.h"
#include "language/source.h"

struct bench {
    struct arena *arena;
    struct source_set sources;
    struct diagnostics diagnostics;
    struct buffer out;
    struct tree tree;
    uint32_t file;
    enum status status;
};

static void start(struct bench *bench)
{
    memset(bench, 0, sizeof *bench);
    bench->arena = arena_create();
    assert_non_null(bench->arena);
    bench->diagnostics.arena = bench->arena;
}

static void finish(struct bench *bench)
{
    buffer_free(&bench->out);
    arena_destroy(bench->arena);
}

static void parse_text(struct bench *bench, const char *text)
{
    start(bench);
    assert_int_equal(source_add_text(bench->arena, &bench->sources, "cell", text, strlen(text),
                                     &bench->diagnostics, &bench->file),
                     STATUS_OK);
    bench->status = parse_source(bench->arena, &bench->sources, bench->file, TREE_CELL,
                                 &bench->diagnostics, &bench->tree);
}

static bool ends_with(const char *text, const char *end)
{
    size_t length = strlen(text), tail = strlen(end);
    return length >= tail && strcmp(text + length - tail, end) == 0;
}

/* Reads FOLDER/NAME under the name NAME and prints its diagnostics. */
static void parse_file(struct bench *bench, const char *folder, const char *name)
{
    char path[1024];
    enum tree_role role = ends_with(name, ".process") ? TREE_PROCESS : TREE_CELL;
    start(bench);
    (void)snprintf(path, sizeof path, "%s/tests/language/%s/%s", SOURCE_DIR, folder, name);
    bench->status = source_read(bench->arena, &bench->sources, path, name, SPAN_NONE,
                                &bench->diagnostics, &bench->file);
    if (bench->status == STATUS_OK) {
        bench->status = parse_source(bench->arena, &bench->sources, bench->file, role,
                                     &bench->diagnostics, &bench->tree);
    }
    diagnostics_print(&bench->diagnostics, &bench->sources, false, &bench->out);
}

static void check_accepted(const char *name)
{
    struct bench bench;
    parse_file(&bench, "accept", name);
    if (bench.status != STATUS_OK || bench.diagnostics.count != 0) {
        print_error("%s", bench.out.data != NULL ? bench.out.data : name);
        fail();
    }
    assert_true(bench.tree.count > 0);
    finish(&bench);
}

/* The text of NAME.expected beside the file, up to the last dot of NAME. */
static char *expected_text(const char *name)
{
    char path[1024];
    int stem = (int)(strrchr(name, '.') - name);
    (void)snprintf(path, sizeof path, "%s/tests/language/reject/%.*s.expected", SOURCE_DIR, stem,
                   name);
    FILE *file = fopen(path, "rb");
    assert_non_null(file);
    char *text = calloc(1, 65536);
    assert_non_null(text);
    size_t length = fread(text, 1, 65535, file);
    assert_true(length > 0 && length < 65535);
    assert_int_equal(fclose(file), 0);
    return text;
}

static void check_rejected(const char *name)
{
    struct bench bench;
    parse_file(&bench, "reject", name);
    assert_int_equal(bench.status, STATUS_INPUT);
    char *expected = expected_text(name);
    print_message("%s\n", name);
    assert_string_equal(bench.out.data, expected);
    free(expected);
    finish(&bench);
}

static void for_each_file(const char *folder, void (*check)(const char *name), int least)
{
    char path[1024];
    int count = 0;
    (void)snprintf(path, sizeof path, "%s/tests/language/%s", SOURCE_DIR, folder);
    DIR *directory = opendir(path);
    assert_non_null(directory);
    for (const struct dirent *entry = readdir(directory); entry != NULL;
         entry = readdir(directory)) {
        if (ends_with(entry->d_name, ".cell") || ends_with(entry->d_name, ".process")) {
            check(entry->d_name);
            count++;
        }
    }
    assert_int_equal(closedir(directory), 0);
    assert_true(count >= least);
}

static void test_accept(void **state)
{
    (void)state;
    for_each_file("accept", check_accepted, 4);
}

static void test_reject(void **state)
{
    (void)state;
    for_each_file("reject", check_rejected, 9);
}

static double number_of(const struct expression *expression)
{
    assert_non_null(expression);
    assert_int_equal(expression->kind, EXPRESSION_NUMBER);
    return expression->number.value;
}

static const struct statement *statement_at(const struct bench *bench, int index,
                                            enum statement_kind kind)
{
    assert_true(index < bench->tree.count);
    assert_int_equal(bench->tree.statements[index]->kind, kind);
    return bench->tree.statements[index];
}

/* Every phrase of a statement arrives in its field, with the bytes it came from. */
static void test_statements(void **state)
{
    (void)state;
    static const char text[] = "output X1.tail at 1.2 V from 0 V to 3 V within 2%  # comment\n"
                               "require tail.current within 10 nA of 800 nA for 99%\n"
                               "require tail.resistance above 50 Mohm everywhere\n"
                               "require tail.compliance below 250 mV\n"
                               "choose X1.RE from 5k to 500k so tail.current = 800 nA\n"
                               "sweep vbat from 2 V to 3 V points 41 show a.v, b.v c.v "
                               "for temperature = -20 C, 27 C 60 C\n"
                               "vary process\n"
                               "quiet mirror-length M2\n"
                               "quiet triode\n";
    struct bench bench;
    parse_text(&bench, text);
    assert_int_equal(bench.status, STATUS_OK);
    assert_int_equal(bench.tree.count, 9);
    const struct statement *s = statement_at(&bench, 0, STATEMENT_OUTPUT);
    assert_string_equal(s->first.text, "output");
    assert_string_equal(s->name.text, "X1.tail");
    assert_int_equal(s->name.span.begin, 7);
    assert_int_equal(s->name.span.end, 14);
    assert_int_equal(s->span.begin, 0);
    assert_int_equal(s->span.end, strlen("output X1.tail at 1.2 V from 0 V to 3 V within 2%"));
    check_near(number_of(s->at), 1.2, 0.0);
    check_near(number_of(s->to), 3.0, 0.0);
    check_near(number_of(s->within), 0.02, 0.0);
    s = statement_at(&bench, 1, STATEMENT_REQUIRE);
    assert_string_equal(s->quantity.text, "tail.current");
    assert_int_equal(s->relation, RELATION_WITHIN);
    assert_int_equal(s->scope, SCOPE_YIELD);
    check_near(number_of(s->tolerance), 1e-8, 0.0);
    check_near(number_of(s->value), 8e-7, 0.0);
    check_near(number_of(s->yield), 0.99, 0.0);
    s = statement_at(&bench, 2, STATEMENT_REQUIRE);
    assert_int_equal(s->relation, RELATION_ABOVE);
    assert_int_equal(s->scope, SCOPE_EVERYWHERE);
    s = statement_at(&bench, 3, STATEMENT_REQUIRE);
    assert_int_equal(s->relation, RELATION_BELOW);
    assert_int_equal(s->scope, SCOPE_POINT);
    s = statement_at(&bench, 4, STATEMENT_CHOOSE);
    assert_string_equal(s->name.text, "X1.RE");
    assert_string_equal(s->quantity.text, "tail.current");
    check_near(number_of(s->from), 5e3, 0.0);
    s = statement_at(&bench, 5, STATEMENT_SWEEP);
    assert_int_equal(s->word_count, 3);
    assert_string_equal(s->words[2].text, "c.v");
    check_near(number_of(s->points), 41.0, 0.0);
    assert_string_equal(s->thing2.text, "temperature");
    assert_int_equal(s->value_count, 3);
    check_near(number_of(s->values[0]), 253.15, 1e-15);
    check_near(number_of(s->values[2]), 333.15, 1e-15);
    s = statement_at(&bench, 6, STATEMENT_VARY);
    assert_string_equal(s->name.text, "process");
    assert_null(s->from);
    s = statement_at(&bench, 7, STATEMENT_QUIET);
    assert_string_equal(s->quantity.text, "mirror-length");
    assert_string_equal(s->name.text, "M2");
    s = statement_at(&bench, 8, STATEMENT_QUIET);
    assert_null(s->name.text);
    finish(&bench);
}

static void test_parts(void **state)
{
    (void)state;
    struct bench bench;
    parse_text(&bench, "nmos M2 d=tail g=X1.ref s=deg W=16u L=8 m=2\n"
                       "resistor RB vbat -> X1.ref 3.3 Mohm tol = 1% match=N*2\n"
                       "resistor RC a -> b tol=1% 4k7\n"
                       "table T1 a -> gnd \"lamp curve.csv\"\n"
                       "law G1 a -> b i = 1 uA*(a.v/1 V)^2\n"
                       "use MIRROR X1 in=a out=b N=8\n");
    assert_int_equal(bench.status, STATUS_OK);
    const struct statement *s = statement_at(&bench, 0, STATEMENT_PART);
    assert_string_equal(s->type.text, "nmos");
    assert_string_equal(s->name.text, "M2");
    assert_null(s->node_from.text);
    assert_null(s->value);
    assert_int_equal(s->assignment_count, 6);
    assert_string_equal(s->assignments[1].key.text, "g");
    assert_string_equal(s->assignments[1].value->name, "X1.ref");
    check_near(number_of(s->assignments[4].value), 8.0, 0.0); /* "8 m=2" is not eight milli */
    check_near(number_of(s->assignments[5].value), 2.0, 0.0);
    s = statement_at(&bench, 1, STATEMENT_PART);
    assert_string_equal(s->node_from.text, "vbat");
    assert_string_equal(s->node_to.text, "X1.ref");
    check_near(number_of(s->value), 3.3e6, 0.0);
    assert_int_equal(s->assignments[1].value->kind, EXPRESSION_MULTIPLY);
    s = statement_at(&bench, 2, STATEMENT_PART);
    check_near(number_of(s->value), 4700.0, 0.0);
    s = statement_at(&bench, 3, STATEMENT_PART);
    assert_string_equal(s->text, "lamp curve.csv");
    s = statement_at(&bench, 4, STATEMENT_PART);
    assert_string_equal(s->assignments[0].key.text, "i");
    s = statement_at(&bench, 5, STATEMENT_USE);
    assert_string_equal(s->type.text, "MIRROR");
    assert_string_equal(s->name.text, "X1");
    assert_int_equal(s->assignment_count, 3);
    finish(&bench);
}

static void test_bodies(void **state)
{
    (void)state;
    struct bench bench;
    parse_text(&bench, "model NCH nmos\n threshold = 0.45 V\n end = 3\nend\n"
                       "corner slow\n NCH.threshold += 30 mV\n resistor.value *= 1.1\nend\n"
                       "block PAIR a b N=4 R=3k\n let H = N/2\n resistor R1 a -> b R\n"
                       " use OTHER X p=a\nend\n");
    assert_int_equal(bench.status, STATUS_OK);
    const struct statement *s = statement_at(&bench, 0, STATEMENT_MODEL);
    assert_string_equal(s->name.text, "NCH");
    assert_string_equal(s->type.text, "nmos");
    assert_int_equal(s->assignment_count, 2);
    assert_int_equal(s->assignments[0].operation, '=');
    s = statement_at(&bench, 1, STATEMENT_CORNER);
    assert_string_equal(s->assignments[0].key.text, "NCH.threshold");
    assert_int_equal(s->assignments[0].operation, 'a');
    assert_int_equal(s->assignments[1].operation, 'm');
    s = statement_at(&bench, 2, STATEMENT_BLOCK);
    assert_int_equal(s->word_count, 2);
    assert_string_equal(s->words[1].text, "b");
    assert_int_equal(s->assignment_count, 2);
    assert_int_equal(s->body_count, 3);
    assert_int_equal(s->body[0]->kind, STATEMENT_LET);
    assert_int_equal(s->body[1]->kind, STATEMENT_PART);
    assert_int_equal(s->body[2]->kind, STATEMENT_USE);
    finish(&bench);
}

/* A hundred values in one body arrive in order (the list grows as they come). */
static void test_long_body(void **state)
{
    (void)state;
    struct buffer text = BUFFER_EMPTY;
    buffer_text(&text, "model N nmos\n");
    for (int i = 0; i < 100; i++) {
        buffer_format(&text, "p%d = %d\n", i, i);
    }
    buffer_text(&text, "end\n");
    struct bench bench;
    parse_text(&bench, text.data);
    assert_int_equal(bench.status, STATUS_OK);
    const struct statement *s = statement_at(&bench, 0, STATEMENT_MODEL);
    assert_int_equal(s->assignment_count, 100);
    for (int i = 0; i < 100; i++) {
        check_near(number_of(s->assignments[i].value), (double)i, 0.0);
    }
    buffer_free(&text);
    finish(&bench);
}

/* All errors are counted up to a limit, and then the file is left. */
static void test_error_limit(void **state)
{
    (void)state;
    struct buffer text = BUFFER_EMPTY;
    for (int i = 0; i < 3000; i++) {
        buffer_text(&text, "let 3\n");
    }
    struct bench bench;
    parse_text(&bench, text.data);
    assert_int_equal(bench.status, STATUS_INPUT);
    assert_int_equal(bench.diagnostics.count, LANGUAGE_ERROR_LIMIT + 1);
    assert_string_equal(bench.diagnostics.list[LANGUAGE_ERROR_LIMIT].text,
                        "more than 1000 errors: the rest of the file was not read");
    buffer_free(&text);
    finish(&bench);
}

/* A statement of a million words stops at the limit, and the next line is read. */
static void test_token_limit(void **state)
{
    (void)state;
    struct buffer text = BUFFER_EMPTY;
    buffer_text(&text, "block B");
    for (int i = 0; i < 1000000; i++) {
        buffer_text(&text, " p");
    }
    buffer_text(&text, "\nend\nrail vbat 3 V\n");
    struct bench bench;
    parse_text(&bench, text.data);
    assert_int_equal(bench.status, STATUS_INPUT);
    assert_int_equal(bench.diagnostics.count, 1);
    assert_string_equal(bench.diagnostics.list[0].text,
                        "this statement has more than 100000 words and signs, the limit");
    assert_int_equal(bench.tree.count, 1);
    buffer_free(&text);
    finish(&bench);
}

/* Every word that is offered as a near name is one the parser reads. */
static void test_words(void **state)
{
    (void)state;
    for (int role = 0; role < 2; role++) {
        const char *const *words = NULL;
        int count = parser_statement_words(role == 0 ? TREE_CELL : TREE_PROCESS, &words);
        assert_true(count >= 6);
        for (int i = 0; i < count; i++) {
            char text[64];
            (void)snprintf(text, sizeof text, "%s\n", words[i]);
            struct bench bench;
            parse_text(&bench, text);
            assert_int_equal(bench.status, STATUS_INPUT);
            assert_null(strstr(bench.diagnostics.list[0].text, "there is no statement"));
            finish(&bench);
        }
    }
}

/* An empty text, only comments, no newline at the end: all are well. */
static void test_small(void **state)
{
    (void)state;
    static const char *const texts[] = {"", "\n\n", "# only this", " \\\n \\", "\r\n# x\r\n", "\t"};
    struct bench bench;
    for (size_t i = 0; i < sizeof texts / sizeof texts[0]; i++) {
        parse_text(&bench, texts[i]);
        assert_int_equal(bench.status, STATUS_OK);
        assert_int_equal(bench.tree.count, 0);
        finish(&bench);
    }
    parse_text(&bench, "rail vbat 3 V");
    assert_int_equal(bench.tree.count, 1);
    finish(&bench);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_accept),      cmocka_unit_test(test_reject),
        cmocka_unit_test(test_statements),  cmocka_unit_test(test_parts),
        cmocka_unit_test(test_bodies),      cmocka_unit_test(test_long_body),
        cmocka_unit_test(test_error_limit), cmocka_unit_test(test_words),
        cmocka_unit_test(test_small),       cmocka_unit_test(test_token_limit),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}

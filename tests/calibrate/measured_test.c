/*
 * measured_test.c: CSV files of curves: units, names, signs, sweeps, and every kind of wrong row.
 */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <string.h>

#include <cmocka.h>

#include "calibrate/measured.h"
#include "check.h"
#include "language/source.h"

struct fixture {
    struct arena *arena;
    struct source_set sources;
    struct diagnostics diagnostics;
    struct replacement replacements[MEASURED_REPLACEMENT_LIMIT];
    struct measured_context context;
    struct measured device;
};

static uint32_t add(struct fixture *it, const char *name, const char *text)
{
    uint32_t file = 0;
    assert_int_equal(
        source_add_text(it->arena, &it->sources, name, text, strlen(text), &it->diagnostics, &file),
        STATUS_OK);
    return file;
}

static enum status read_transistor(struct fixture *it, const char *text, const char *columns)
{
    static const enum column wanted[] = {COLUMN_VGS, COLUMN_VDS, COLUMN_ID};
    static const enum column optional[] = {COLUMN_VSB, COLUMN_TEMPERATURE};
    memset(it, 0, sizeof *it);
    it->arena = arena_create();
    it->diagnostics.arena = it->arena;
    it->context =
        (struct measured_context){it->arena, &it->sources, &it->diagnostics, it->replacements, 0};
    if (columns != NULL) {
        int count =
            measured_replacements(&it->context, add(it, "--columns", columns), it->replacements);
        it->context.replacement_count = count;
        if (count < 0) {
            return STATUS_INPUT;
        }
    }
    it->device.file = add(it, "curve.csv", text);
    return measured_read(&it->context, &it->device, 300, wanted, 3, optional, 2);
}

/* The text of all errors holds this. */
static void check_error(struct fixture *it, const char *wanted)
{
    struct buffer out = BUFFER_EMPTY;
    diagnostics_print(&it->diagnostics, &it->sources, false, &out);
    if (out.data == NULL || strstr(out.data, wanted) == NULL) {
        fail_msg("'%s' is not in:\n%s", wanted, out.data == NULL ? "(nothing)" : out.data);
    }
    buffer_free(&out);
    arena_destroy(it->arena);
}

static void reads_units_and_names(void **state)
{
    (void)state;
    struct fixture it;
    assert_int_equal(read_transistor(&it,
                                     "# exported\r\n"
                                     "VGS [mV],M1.vds (V),Vbs/mV,id_uA,temperature C,comment\r\n"
                                     "500,1.8,-900,+1.5,27,\"a, b\"\r\n\r\n"
                                     "550, .5 ,0,-2e-3,-40,x\r\n",
                                     NULL),
                     STATUS_OK);
    assert_int_equal(it.device.row_count, 2);
    const double *first = it.device.rows[0].value, *second = it.device.rows[1].value;
    check_near(first[COLUMN_VGS], 0.5, 1e-15);
    check_near(first[COLUMN_VDS], 1.8, 1e-15);
    check_near(first[COLUMN_VSB], 0.9, 1e-15); /* vbs is the other way round */
    check_near(first[COLUMN_ID], 1.5e-6, 1e-15);
    check_near(first[COLUMN_TEMPERATURE], 300.15, 1e-15);
    check_near(second[COLUMN_VDS], 0.5, 1e-15);
    check_near(second[COLUMN_ID], -2e-9, 1e-15);
    assert_int_equal(it.device.kelvin_count, 2);
    check_near(it.device.kelvins[1], 233.15, 1e-15);
    assert_string_equal(it.device.unused, "comment");
    arena_destroy(it.arena);
}

static void maps_columns(void **state)
{
    (void)state;
    struct fixture it;
    assert_int_equal(
        read_transistor(&it, "VG,VD,I(D)\n-1,-2,-3\n", "vgs=-VG, vds = -VD mV, id=-I(D) nA"),
        STATUS_OK);
    check_near(it.device.rows[0].value[COLUMN_VGS], 1, 1e-15);
    check_near(it.device.rows[0].value[COLUMN_VDS], 2e-3, 1e-15);
    check_near(it.device.rows[0].value[COLUMN_ID], 3e-9, 1e-15);
    assert_true(isnan(it.device.rows[0].value[COLUMN_VSB]));
    arena_destroy(it.arena);
    assert_int_equal(read_transistor(&it, "VG,VD,I\n", "vgs=VG A"), STATUS_INPUT);
    check_error(&it, "the unit does not fit this column");
    assert_int_equal(read_transistor(&it, "VG,VD,I\n", "vxs=VG"), STATUS_INPUT);
    check_error(&it, "this column is not known");
    assert_int_equal(read_transistor(&it, "VG,VD,I\n", "vgs"), STATUS_INPUT);
    check_error(&it, "COLUMN=HEADER is wanted here");
}

static void refuses_bad_rows(void **state)
{
    (void)state;
    static const char head[] = "vgs,vds,id\n";
    static const struct {
        const char *row, *error;
    } rows[] = {
        {"0.1,x,1e-9\n", "curve.csv:2:5: a number is wanted for 'vds'"},
        {"0.1,0.2,nan\n", "curve.csv:2:9: a number is wanted for 'id'"},
        {"0.1,0.2,inf\n", "curve.csv:2:9: a number is wanted for 'id'"},
        {"0.1,0.2,1e999\n", "curve.csv:2:9: a number is wanted for 'id'"},
        {"0.1,0.2,3,4\n0.1,0.2\n", "curve.csv:3:1: the value of 'id' is missing"},
        {"0.1,,1e-9\n", "curve.csv:2:1: the value of 'vds' is missing"},
        {"0.1,0.2,1e-9 A\n", "curve.csv:2:9: a number is wanted for 'id'"},
    };
    for (size_t k = 0; k < sizeof rows / sizeof rows[0]; k++) {
        struct fixture it;
        char text[256];
        snprintf(text, sizeof text, "%s%s", head, rows[k].row);
        assert_int_equal(read_transistor(&it, text, NULL), STATUS_INPUT);
        check_error(&it, rows[k].error);
    }
}

static void refuses_bad_headings(void **state)
{
    (void)state;
    struct fixture it;
    assert_int_equal(read_transistor(&it, "", NULL), STATUS_INPUT);
    check_error(&it, "curve.csv:1:1: the file has no rows");
    assert_int_equal(read_transistor(&it, "vgs,vds\n1,2\n", NULL), STATUS_INPUT);
    check_error(&it, "curve.csv:1:1: no column is called 'id'");
    assert_int_equal(read_transistor(&it, "vgs,vds,id,ID\n1,2,3,4\n", NULL), STATUS_INPUT);
    check_error(&it, "curve.csv:1:12: column 'id' is there twice");
    assert_int_equal(read_transistor(&it, "vgs,vds,id [V]\n1,2,3\n", NULL), STATUS_INPUT);
    check_error(&it, "the unit of column 'id' does not fit it");
    assert_int_equal(read_transistor(&it, "vgs,vds,id,temperature C\n1,2,3,-300\n", NULL),
                     STATUS_INPUT);
    check_error(&it, "a temperature is above 0 K");
}

static void finds_sweeps(void **state)
{
    (void)state;
    static const enum column voltages[] = {COLUMN_VGS, COLUMN_VDS, COLUMN_VSB};
    struct fixture it;
    assert_int_equal(read_transistor(&it,
                                     "vgs,vds,id\n"
                                     "0,0.1,0\n0.5,0.1,1\n1,0.1,2\n"  /* gate sweep */
                                     "0,1.8,0\n0.5,1.8,1\n1,1.8,2\n"  /* another */
                                     "0.5,1.8,1\n0,1.8,0\n"           /* back again */
                                     "0.7,0,0\n0.7,0.5,1\n0.7,1,2\n", /* drain sweep */
                                     NULL),
                     STATUS_OK);
    assert_true(measured_find_sweeps(it.arena, &it.device, voltages, 3));
    static const int firsts[] = {0, 3, 6, 8}, counts[] = {3, 3, 2, 3};
    assert_int_equal(it.device.sweep_count, 4);
    for (int k = 0; k < 4; k++) {
        assert_int_equal(it.device.sweeps[k].first, firsts[k]);
        assert_int_equal(it.device.sweeps[k].count, counts[k]);
        assert_int_equal(it.device.sweeps[k].moved, k < 3 ? COLUMN_VGS : COLUMN_VDS);
    }
    arena_destroy(it.arena);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(reads_units_and_names), cmocka_unit_test(maps_columns),
        cmocka_unit_test(refuses_bad_rows),      cmocka_unit_test(refuses_bad_headings),
        cmocka_unit_test(finds_sweeps),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}

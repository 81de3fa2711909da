/* json_test.c: JSON and CSV read back as the same bits, with the keys of the documentation. */
#include "report/text_check.h"

#include <jansson.h>
#include <locale.h>

#include "report/report_fixture.h"

static json_t *read_back(const struct fixture *fixture)
{
    struct buffer out = BUFFER_EMPTY;
    json_error_t error;
    report_json(&fixture->result, "1.0.0", &out);
    assert_false(out.failed);
    json_t *root = json_loads(out.data, JSON_REJECT_DUPLICATES, &error);
    assert_non_null(root);
    buffer_free(&out);
    return root;
}

/* Bits, not values: -0 and the last place count. */
static void assert_bits(const json_t *number, double wanted)
{
    assert_true(json_is_real(number));
    double value = json_real_value(number);
    assert_memory_equal(&value, &wanted, sizeof value);
}

static json_t *at(const json_t *root, const char *a, const char *b, const char *c)
{
    json_t *value = json_object_get(json_object_get(root, a), b);
    return c == NULL ? value : json_object_get(value, c);
}

static void keys_and_bits(void **state)
{
    (void)state;
    struct fixture fixture;
    fixture_make(&fixture);
    json_t *root = read_back(&fixture);
    static const char *const order[] = {"ampstead", "schema",      "command",      "file",
                                        "title",    "temperature", "view",         "verdict",
                                        "solver",   "nodes",       "rails",        "devices",
                                        "outputs",  "hand",        "requirements", "cautions"};
    const char *key;
    json_t *value;
    size_t position = 0;
    json_object_foreach(root, key, value)
    {
        assert_true(position < sizeof order / sizeof order[0]);
        assert_string_equal(key, order[position++]);
    }
    assert_int_equal(position, sizeof order / sizeof order[0]);
    assert_string_equal(json_string_value(json_object_get(root, "verdict")), "not met");
    assert_int_equal(json_integer_value(json_object_get(root, "schema")), 1);
    assert_bits(at(root, "nodes", "tail", "v"), 0.1 + 0.2);
    assert_bits(at(root, "rails", "vbat", "power"), 2.143e-6);
    assert_bits(at(root, "devices", "M1", "gm"), 9.81e-6);
    assert_string_equal(json_string_value(at(root, "devices", "RE", "kind")), "resistor");
    assert_null(at(root, "devices", "RE", "region"));
    assert_bits(json_object_get(at(root, "outputs", "tail", "line"), "vbat"), 0.1234);
    assert_string_equal(json_string_value(at(root, "outputs", "tail", "compliance_device")), "M2");
    json_decref(root);
}

static void curve_bits(void **state)
{
    (void)state;
    struct fixture fixture;
    fixture_make(&fixture);
    json_t *root = read_back(&fixture);
    json_t *curve = at(root, "outputs", "tail", "curve");
    assert_int_equal(json_array_size(json_object_get(curve, "v")), FIXTURE_POINTS);
    for (size_t k = 0; k < FIXTURE_POINTS; k++) {
        assert_bits(json_array_get(json_object_get(curve, "v"), k), fixture.v[k]);
        assert_bits(json_array_get(json_object_get(curve, "current"), k), fixture.current[k]);
    }
    json_decref(root);
}

/* A value that does not apply has no key. */
static void absent_keys(void **state)
{
    (void)state;
    struct fixture fixture;
    fixture_make(&fixture);
    fixture.output_results[0].resistance_unlimited = true;
    fixture.output_results[0].resistance = INFINITY;
    json_t *root = read_back(&fixture);
    assert_null(at(root, "outputs", "tail", "resistance"));
    assert_true(json_is_true(at(root, "outputs", "tail", "resistance_unlimited")));
    assert_null(at(root, "outputs", "tail", "sigma"));
    assert_null(at(root, "outputs", "tail", "high"));
    assert_non_null(at(root, "outputs", "tail", "low"));
    json_t *requirements = json_object_get(root, "requirements");
    json_t *first = json_array_get(requirements, 0), *last = json_array_get(requirements, 3);
    assert_true(json_is_true(json_object_get(first, "met")));
    assert_int_equal(json_integer_value(json_object_get(first, "line")), 3);
    assert_null(json_object_get(last, "met"));
    assert_true(json_is_false(json_object_get(last, "judged")));
    json_decref(root);
}

/* What a requirement asks and how far it is from it; the square law's value; what always holds;
 * what was silenced; lost points. */
static void whole_records(void **state)
{
    (void)state;
    struct fixture fixture;
    fixture_make(&fixture);
    struct caution silenced = {"hot", "M1", "M1 is hot", NULL, 0};
    fixture.requirements[0].tolerance = 20e-9;
    fixture.result.cautions.silenced = &silenced;
    fixture.result.cautions.silenced_count = 1;
    fixture.result.sweep_count = 1;
    fixture.series[0].lost = 2;
    json_t *root = read_back(&fixture);
    json_t *requirements = json_object_get(root, "requirements");
    json_t *within = json_array_get(requirements, 0), *below = json_array_get(requirements, 1);
    assert_string_equal(json_string_value(json_object_get(within, "relation")), "within");
    assert_bits(json_object_get(within, "limit"), 800e-9);
    assert_bits(json_object_get(within, "tolerance"), 20e-9);
    assert_bits(json_object_get(within, "margin"), 3.6e-9);
    assert_string_equal(json_string_value(json_object_get(below, "relation")), "below");
    assert_bits(json_object_get(below, "limit"), 0.15);
    assert_bits(json_object_get(below, "margin"), -0.0303);
    assert_null(json_object_get(below, "tolerance"));
    json_t *hands = json_object_get(root, "hand");
    assert_bits(json_object_get(json_array_get(hands, 0), "square_law"), 790.1e-9);
    assert_null(json_object_get(json_array_get(hands, 1), "square_law"));
    json_t *cautions = json_object_get(root, "cautions");
    assert_int_equal(json_array_size(cautions), 2);
    assert_string_equal(json_string_value(json_object_get(json_array_get(cautions, 1), "code")),
                        "model");
    json_t *record = json_array_get(json_object_get(root, "silenced"), 0);
    assert_string_equal(json_string_value(json_object_get(record, "code")), "hot");
    json_t *sweep = json_array_get(json_object_get(root, "sweeps"), 0);
    json_t *series = json_array_get(json_object_get(sweep, "series"), 0);
    assert_int_equal(json_integer_value(json_object_get(series, "lost")), 2);
    json_decref(root);
}

static void unsolved_keys(void **state)
{
    (void)state;
    struct fixture fixture;
    fixture_make(&fixture);
    fixture.result.verdict = VERDICT_UNSOLVED;
    fixture.result.point.solver =
        (struct solver_result){false, "direct", 4, NAN, NULL, NULL, "stuck at ref", "look at M1"};
    json_t *root = read_back(&fixture);
    assert_string_equal(json_string_value(json_object_get(root, "verdict")), "unsolved");
    assert_string_equal(json_string_value(at(root, "solver", "trouble", NULL)), "stuck at ref");
    assert_string_equal(json_string_value(at(root, "solver", "advice", NULL)), "look at M1");
    assert_null(at(root, "solver", "worst_residual", NULL));
    assert_null(json_object_get(root, "nodes"));
    assert_null(json_object_get(root, "outputs"));
    json_decref(root);
}

static void sweep_keys(void **state)
{
    (void)state;
    struct fixture fixture;
    fixture_make(&fixture);
    fixture.result.sweep_count = 1;
    json_t *root = read_back(&fixture);
    json_t *sweep = json_array_get(json_object_get(root, "sweeps"), 0);
    assert_string_equal(json_string_value(json_object_get(sweep, "knob")), "vbat");
    json_t *series = json_array_get(json_object_get(sweep, "series"), 0);
    json_t *values = json_object_get(json_object_get(series, "values"), "tail.current");
    assert_bits(json_array_get(values, 1), 1.0 / 3.0 * 1e-6);
    values = json_object_get(json_object_get(series, "values"), "M1.inversion");
    assert_true(json_is_null(json_array_get(values, 1))); /* the point stays, its value is none */
    assert_int_equal(json_array_size(json_object_get(series, "events")), 1);
    json_decref(root);
}

/* Twice the same bytes, whatever the locale. */
static void same_bytes(void **state)
{
    (void)state;
    struct fixture fixture;
    struct buffer first = BUFFER_EMPTY, second = BUFFER_EMPTY;
    fixture_make(&fixture);
    report_json(&fixture.result, "1.0.0", &first);
    (void)setlocale(LC_ALL, "de_DE.UTF-8"); /* a comma for the point, where it is installed */
    report_json(&fixture.result, "1.0.0", &second);
    (void)setlocale(LC_ALL, "C");
    assert_string_equal(first.data, second.data);
    buffer_free(&first);
    buffer_free(&second);
}

/* A file name may hold any bytes; the JSON stays UTF-8. */
static void odd_file_name(void **state)
{
    (void)state;
    struct fixture fixture;
    fixture_make(&fixture);
    fixture.cell.path = "t\xFFil.cell";
    json_t *root = read_back(&fixture);
    assert_string_equal(json_string_value(json_object_get(root, "file")), "t?il.cell");
    json_decref(root);
}

static void csv_curves(void **state)
{
    (void)state;
    struct fixture fixture;
    struct buffer out = BUFFER_EMPTY;
    fixture_make(&fixture);
    report_csv(&fixture.result, &out);
    const char *line = out.data;
    assert_memory_equal(line, "output,v [V],current [A]\r\n", 26);
    line += 26;
    for (int k = 0; k < FIXTURE_POINTS; k++) {
        char *end;
        assert_memory_equal(line, "tail,", 5);
        double v = strtod(line + 5, &end);
        assert_int_equal(*end, ',');
        double current = strtod(end + 1, &end);
        assert_memory_equal(end, "\r\n", 2);
        assert_memory_equal(&v, &fixture.v[k], sizeof v);
        assert_memory_equal(&current, &fixture.current[k], sizeof current);
        line = end + 2;
    }
    assert_int_equal(*line, '\0');
    buffer_free(&out);
}

static void csv_sweep(void **state)
{
    (void)state;
    struct fixture fixture;
    struct buffer out = BUFFER_EMPTY;
    fixture_make(&fixture);
    fixture.result.sweep_count = 1;
    report_csv(&fixture.result, &out);
    assert_string_equal(out.data, "sweep,vbat [V],tail.current [A],M1.inversion\r\n"
                                  "1,2,1e-7,0.5\r\n"
                                  "1,2.5,3.333333333333333e-7,\r\n"
                                  "1,3,7e-7,4.25\r\n");
    buffer_free(&out);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(keys_and_bits), cmocka_unit_test(curve_bits),
        cmocka_unit_test(absent_keys),   cmocka_unit_test(whole_records),
        cmocka_unit_test(unsolved_keys), cmocka_unit_test(sweep_keys),
        cmocka_unit_test(same_bytes),    cmocka_unit_test(odd_file_name),
        cmocka_unit_test(csv_curves),    cmocka_unit_test(csv_sweep),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}

/*
 * table_test.c: the tables of all devices are whole and consistent.
 */
#include "device_check.h"

static void check_parameters(const struct parameter *rows, int count)
{
    for (int k = 0; k < count; k++) {
        assert_non_null(rows[k].name);
        assert_true(strlen(rows[k].text) > 0);
        assert_int_equal(parameter_find(rows, count, rows[k].name), k); /* no name twice */
        assert_true(rows[k].least < rows[k].most);
        if (rows[k].when_absent == DEFAULT_VALUE || rows[k].when_absent == DEFAULT_HIDDEN) {
            assert_true(rows[k].standard >= rows[k].least && rows[k].standard <= rows[k].most);
            assert_true(!rows[k].above_least || rows[k].standard > rows[k].least);
        }
    }
    assert_int_equal(parameter_find(rows, count, "no such name"), -1);
}

static void tables_are_whole(void **state)
{
    (void)state;
    for (int k = 0; k < device_type_count; k++) {
        const struct device_type *type = device_types[k];
        assert_true(strlen(type->word) > 0 && strlen(type->summary) > 0);
        assert_false(type->is_resistor && type->is_transistor);
        assert_true(type->terminal_count + type->branch_count <= DEVICE_LOCAL_LIMIT);
        assert_true(type->value_parameter < type->parameter_count);
        check_parameters(type->parameters, type->parameter_count);
        check_parameters(type->model_parameters, type->model_parameter_count);
        assert_true((type->model_kind != NULL) == (type->model_parameter_count > 0));
        for (int j = 0; j < type->quantity_count; j++) {
            assert_int_equal(quantity_find(type, type->quantities[j].name), j);
            assert_true(strlen(type->quantities[j].text) > 0);
        }
        assert_true(type->quantity_current >= 0 && type->quantity_current < type->quantity_count);
        assert_true(type->quantity_headroom < type->quantity_count);
        assert_int_equal(type->quantity_headroom >= 0, type->is_transistor);
        for (int j = 0; j < type->series_count; j++) {
            assert_true(parameter_find(type->model_parameters, type->model_parameter_count,
                                       type->series[j].model_parameter) >= 0);
            assert_true(type->series[j].terminal < type->terminal_count);
        }
        for (int j = 0; j < type->deviate_count; j++) {
            int hidden = type->deviates[j].own_parameter;
            assert_int_equal(type->parameters[hidden].when_absent, DEFAULT_HIDDEN);
        }
        assert_non_null(type->prepare);
        assert_non_null(type->evaluate);
        assert_non_null(type->evaluate_extended);
        assert_non_null(type->describe);
        assert_non_null(type->paths);
        if (type->alternative != NULL) {
            assert_string_equal(type->alternative->word, type->word);
            assert_true(parameter_find(type->alternative->parameters,
                                       type->alternative->parameter_count,
                                       type->alternative_key) >= 0);
        }
    }
}

/* docs/language.md lists the names and their order. */
static void quantities_are_those_of_the_design(void **state)
{
    (void)state;
    static const struct {
        const char *word, *names;
    } design[] = {
        {"nmos",
         "id vgs vds vbs vth overdrive inversion vdsat headroom gm gds gmb ro gm_id power "},
        {"pnp", "ic ib ie vbe vce beta gm ro headroom power "},
        {"njfet", "id vgs vds headroom gm gds ro power "},
        {"resistor", "i v power "},
        {"diode", "i v power "},
        {"law", "i v power "},
        {"table", "i v power "},
        {"current", "i v power "},
        {"voltage", "i v power "},
    };
    for (size_t k = 0; k < sizeof design / sizeof design[0]; k++) {
        const struct device_type *type = device_find(design[k].word);
        assert_non_null(type);
        char names[256] = "";
        for (int j = 0; j < type->quantity_count; j++) {
            strcat(names, type->quantities[j].name);
            strcat(names, " ");
        }
        assert_string_equal(names, design[k].names);
    }
}

static void things_are_found_by_name(void **state)
{
    (void)state;
    assert_null(device_find("valve"));
    assert_null(device_find_model_kind("resistor"));
    assert_ptr_equal(device_find_model_kind("pnp"), device_find("pnp"));
    assert_int_equal(device_find("nmos")->model_kind != NULL, 1); /* the form with a model first */
    assert_int_equal(quantity_find(device_find("nmos"), "beta"), -1);
    assert_string_equal(effect_name(1), "body effect");
    for (int k = 0; k < EFFECT_COUNT; k++) {
        assert_true(strlen(effect_name(k)) > 0);
    }
    assert_string_equal(effect_name(-1), "");
    assert_string_equal(effect_name(EFFECT_COUNT), "");
}

static void regions_are_said_in_words(void **state)
{
    (void)state;
    char text[64];
    region_describe(REGION_MODERATE | REGION_SATURATED, device_find("nmos"), text, sizeof text);
    assert_string_equal(text, "moderate, saturated");
    region_describe(REGION_STRONG | REGION_REVERSED, device_find("pmos"), text, sizeof text);
    assert_string_equal(text, "strong, reversed");
    region_describe(REGION_ON | REGION_TRIODE, device_find("npn"), text, sizeof text);
    assert_string_equal(text, "on, out of headroom");
    region_describe(REGION_ON | REGION_SATURATED, device_find("pnp"), text, sizeof text);
    assert_string_equal(text, "on, active");
    region_describe(REGION_ON | REGION_TRIODE, device_find("njfet"), text, sizeof text);
    assert_string_equal(text, "on, triode");
    region_describe(REGION_NONE, device_find("resistor"), text, sizeof text);
    assert_string_equal(text, "");
    region_describe(REGION_MODERATE | REGION_SATURATED, device_find("nmos"), text, 8);
    assert_string_equal(text, "moderat"); /* cut, never beyond */
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(tables_are_whole),
        cmocka_unit_test(quantities_are_those_of_the_design),
        cmocka_unit_test(things_are_found_by_name),
        cmocka_unit_test(regions_are_said_in_words),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}

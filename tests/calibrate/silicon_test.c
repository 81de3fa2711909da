/*
 * silicon_test.c: measured 130 nm transistors (see models/open130.process for their source), beside
 * the sources or where AMPSTEAD_MEASURED says; left out with a message where absent.
 *
 * Limits are those that docs/calibrate.md promises: saturated current 3 % (p-channel below 0.5
 * um 5.5 %), gm 5 %, gds 30 % where more than one drain sweep shows it; a set 10 %.
 */
#include "files.h"

#include "check.h"

static const char *folder(void)
{
    const char *given = getenv("AMPSTEAD_MEASURED");
    return given != NULL ? given : SOURCE_DIR "/../shared/measured";
}

/* The list, or a skipped test. */
static const char *list_path(char *path, size_t size)
{
    snprintf(path, size, "%s/index.csv", folder());
    if (access(path, R_OK) != 0) {
        print_message("no measured data beside the sources: left out\n");
        skip();
    }
    return path;
}

static void check_cards(const struct calibration *c)
{
    int cards = 0;
    for (int k = 0; k < c->comparison_count; k++) {
        const struct comparison *it = &c->comparisons[k];
        const struct device_figures *figures = &it->figures;
        if (c->fits[it->fit].is_set) {
            continue;
        }
        const struct measured *data = &c->devices[it->device].data;
        bool is_short_p = c->devices[it->device].type->polarity < 0 && data->length < 0.5e-6;
        double saturation = figures->id[FIGURES_SATURATION].rms;
        print_message("%-22s id %.2f %%  gm %.2f %%  gds %.1f %% (%d)\n", data->name,
                      100 * saturation, 100 * figures->gm.rms, 100 * figures->gds.rms,
                      figures->gds.count);
        assert_true(figures->id[FIGURES_SATURATION].count > 100);
        assert_true(saturation <= (is_short_p ? 0.055 : 0.03));
        assert_true(figures->gm.rms <= 0.05);
        assert_true(figures->gds.count < 2 || figures->gds.rms <= 0.3);
        cards++;
    }
    assert_int_equal(cards, 15);
}

static void cards_follow_the_silicon(void **state)
{
    (void)state;
    char path[PATH_SIZE];
    for (int robust = 0; robust < 2; robust++) {
        struct calibration_request request = {
            .list = list_path(path, sizeof path), .form = FORM_CARDS, .is_robust = robust == 1};
        struct calibration *c = calibrate(&request);
        check_cards(c);
        /* constant-current thresholds far above the noise: column vt_cc_v of index.csv */
        check_near(c->devices[0].facts.threshold, 0.441, 2e-3);
        check_near(c->devices[3].facts.threshold, 0.555, 2e-3);
        check_near(c->devices[6].facts.threshold, 0.634, 2e-3);
        /* 25/25: the drain sweep at vgs = 0.36 V reads five times too much (index.csv says so) */
        assert_string_equal(c->remarks[0].code, "outlier");
        assert_string_equal(c->devices[c->remarks[0].device].data.name, "nch_w25u_l25u.csv");
        assert_non_null(strstr(c->remarks[0].text, "vgs = 0.36 V, vsb = 0 V contradicts"));
        int left_out = 0;
        for (int k = 0; k < c->devices[0].data.row_count; k++) {
            left_out += c->devices[0].data.rows[k].is_left_out ? 1 : 0;
        }
        assert_true(robust == 1 ? left_out >= 37 : left_out == 0);
        calibration_free(c);
    }
}

static void one_set_follows_the_n_channel(void **state)
{
    (void)state;
    char path[PATH_SIZE];
    struct calibration_request request = {.list = list_path(path, sizeof path), .kind = "nmos"};
    struct calibration *c = calibrate(&request);
    int members = 0;
    for (int k = 0; k < c->comparison_count; k++) {
        const struct comparison *it = &c->comparisons[k];
        if (!c->fits[it->fit].is_set) {
            continue;
        }
        print_message("%-22s id %.2f %%  offset %+.1f mV\n", c->devices[it->device].data.name,
                      100 * it->figures.id[FIGURES_SATURATION].rms, 1e3 * it->offset);
        assert_true(it->figures.id[FIGURES_SATURATION].rms <= 0.1);
        members++;
    }
    assert_int_equal(members, 7);
    /* structures 2602 carry 3.5 to 4 times their W/L (README of the data): named, not in the set */
    int odd = 0;
    for (int k = 0; k < c->device_count; k++) {
        bool is_odd = strcmp(c->devices[k].data.name, "nch_w1u_l0p5u.csv") == 0 ||
                      strcmp(c->devices[k].data.name, "nch_w3u_l0p15u.csv") == 0;
        assert_int_equal(c->devices[k].is_out, is_odd);
        odd += is_odd ? 1 : 0;
    }
    assert_int_equal(odd, 2);
    calibration_free(c);
}

/* Long devices that were not fitted, one or two at a time; limits as the set stands. 25/25 is not
 * among them alone: without the only wide long one nothing tells wide from narrow there, which a
 * remark says. */
static void held_devices_are_predicted(void **state)
{
    (void)state;
    static const struct {
        const char *held[2];
        double limits[2];
        bool is_told; /* that it is beyond the fitted sizes */
    } splits[] = {
        {{"nch_w0p42u_l25u.csv", NULL}, {0.06, 0}, false},
        {{"nch_w0p42u_l8u.csv", NULL}, {0.06, 0}, false},
        {{"nch_w0p42u_l8u.csv", "nch_w25u_l25u.csv"}, {0.06, INFINITY}, true},
        {{"nch_w0p42u_l25u.csv", "nch_w25u_l25u.csv"}, {0.06, INFINITY}, true},
        {{"nch_w0p42u_l25u.csv", "nch_w0p42u_l8u.csv"}, {0.15, 0.15}, true},
        {{"nch_w7u_l0p15u.csv", NULL}, {0.06, 0}, false},
        {{"nch_w25u_l0p15u.csv", NULL}, {0.06, 0}, false},
    };
    char path[PATH_SIZE];
    for (size_t k = 0; k < sizeof splits / sizeof splits[0]; k++) {
        struct calibration_file held[2];
        int count = splits[k].held[1] == NULL ? 1 : 2;
        for (int h = 0; h < count; h++) {
            held[h] = (struct calibration_file){splits[k].held[h], NULL, NULL, true};
        }
        struct calibration_request request = {.list = list_path(path, sizeof path),
                                              .kind = "nmos",
                                              .form = FORM_SET,
                                              .files = held,
                                              .file_count = count};
        struct calibration *c = calibrate(&request);
        int predicted = 0;
        for (int j = 0; j < c->comparison_count; j++) {
            const struct comparison *it = &c->comparisons[j];
            const char *name = c->devices[it->device].data.name;
            for (int h = 0; it->is_held && h < count; h++) {
                if (strcmp(name, splits[k].held[h]) != 0) {
                    continue;
                }
                double rms = it->figures.id[FIGURES_SATURATION].rms;
                print_message("%-22s predicted to %.2f %%\n", name, 100 * rms);
                predicted++;
                assert_true(c->fits[it->fit].is_set);
                assert_true(it->offset == 0);
                assert_true(rms <= splits[k].limits[h]);
            }
        }
        assert_int_equal(predicted, count);
        bool is_told = false;
        for (int j = 0; j < c->remark_count; j++) {
            is_told |= strcmp(c->remarks[j].code, "beyond") == 0;
        }
        assert_int_equal(is_told, splits[k].is_told);
        calibration_free(c);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(cards_follow_the_silicon),
        cmocka_unit_test(one_set_follows_the_n_channel),
        cmocka_unit_test(held_devices_are_predicted),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}

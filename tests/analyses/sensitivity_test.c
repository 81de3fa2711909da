/*
 * sensitivity_test.c: derivatives of every sort of quantity, against closed forms and against the
 * cell solved again.
 */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <cmocka.h>

#include "analyses/cells.h"
#include "analyses/sensitivity.h"
#include "analyses/solved_cell.h"
#include "analyses/trial.h"

static const double thermal = BOLTZMANN_OVER_CHARGE * 300.15;

/* One row of the ranked table of a quantity. */
static struct sensitivity_row row_of(struct solved_cell *it, const char *quantity,
                                     const char *parameter, double *value)
{
    struct arena *arena = arena_create();
    struct sensitivity_table table;
    const struct probe probe = probe_of(it, quantity);
    struct sensitivity_row found = {.relative = NAN};
    assert_int_equal(sensitivity_find(&it->point, &probe, arena, &table), STATUS_OK);
    assert_null(table.trouble);
    for (int k = 0; k < table.row_count; k++) {
        if (strcmp(table.rows[k].parameter, parameter) == 0) {
            found = table.rows[k];
            found.parameter = NULL;
        }
    }
    *value = table.value;
    arena_destroy(arena);
    return found;
}

static double relative(struct solved_cell *it, const char *quantity, const char *parameter)
{
    double value;
    return row_of(it, quantity, parameter, &value).relative;
}

/* I = 2/(beta R^2) (1 - 1/sqrt K)^2 (M06): -2 in R, -1 in k', +1 in L of M1 and M2 together, and
 * 1/(sqrt K - 1) = 1 in K. */
static void beta_multiplier(void **state)
{
    (void)state;
    struct solved_cell it;
    double value;
    cell_solve_as(&it, BETA_MULTIPLIER, EFFECTS_HAND);
    check_near(row_of(&it, "bias.current", "R", &value).relative, -2, 1e-8);
    check_near(value, 20e-6, 1e-9);
    check_near(relative(&it, "bias.current", "n.kprime"), -1, 1e-8);
    check_near(relative(&it, "bias.current", "M2.m"), 1, 1e-8);
    check_near(relative(&it, "bias.current", "M5.W"), 1, 1e-8);
    check_near(row_of(&it, "bias.current", "R", &value).absolute, -2 * 20e-6 / 5e3, 1e-8);
    cell_close(&it);
}

/* From I R = UT ln(IIN/I): with x = I R/UT, T/I dI/dT = x/(1 + x), R/I dI/dR = -x/(1 + x),
 * IIN/I dI/dIIN = 1/(1 + x) (Gray and Meyer, section 4.4.1.1; B03). */
static void widlar(void **state)
{
    (void)state;
    struct solved_cell it;
    double i;
    cell_solve(&it, WIDLAR("27.5k"));
    const double input = row_of(&it, "out.current", "IIN", &i).relative;
    const double x = i * 27.5e3 / thermal;
    check_near(i * 27.5e3, thermal * log(1e-3 / i), 1e-7);
    check_near(input, 1 / (1 + x), 1e-6);
    check_near(relative(&it, "out.current", "temperature"), x / (1 + x), 1e-6);
    check_near(relative(&it, "out.current", "R2"), -x / (1 + x), 1e-6);
    cell_close(&it);
}

/* dVBE of two junctions at equal currents, areas 1 and 8: slope (k/q) ln 8 = 0.1791924 mV/K (C04).
 */
static void ptat(void **state)
{
    (void)state;
    struct solved_cell it;
    double value;
    cell_solve(&it, "model q npn\n  saturation_current = 1 fA\n  beta = 1e9\nend\n"
                    "rail vcc 5 V\ncurrent I1 vcc -> a 10 uA\ncurrent I2 e -> gnd 10 uA\n"
                    "npn Q1 c=a b=a e=gnd model=q\nnpn Q2 c=vcc b=a e=e area=8 model=q\n");
    check_near(row_of(&it, "e.v", "temperature", &value).absolute, 1.791924076e-4, 1e-6);
    check_near(value, thermal * log(8), 1e-6);
    cell_close(&it);
}

/*
 * Long transistor without body effect: vdsat = UT (2 sqrt(IC + 1/4) + 3) with IC = I/Ispec and
 * Ispec = 2 k' W/L UT^2 (Enz and Vittoz 2006; M08), so the compliance moves by
 * UT/(Ispec sqrt(IC + 1/4)) an ampere of input current, and does not follow the load's own `at`.
 */
static void compliance(void **state)
{
    (void)state;
    struct solved_cell it;
    double value;
    cell_solve(&it, "model n nmos\n  threshold = 0.5 V\n  kprime = 200 uA/V^2\nend\nrail vdd 3 V\n"
                    "current IREF vdd -> ref 10 uA\nnmos M1 d=ref g=ref s=gnd W=5u L=5u model=n\n"
                    "nmos M2 d=out g=ref s=gnd W=5u L=5u model=n\n"
                    "output out at 2 V from 0 V to 3 V\n");
    const double specific = 2 * 200e-6 * thermal * thermal, level = 10e-6 / specific;
    const double slope = thermal / (specific * sqrt(level + 0.25));
    check_near(row_of(&it, "out.compliance", "IREF", &value).absolute, slope, 1e-6);
    check_near(value, thermal * (2 * sqrt(level + 0.25) + 3), 1e-6);
    assert_true(fabs(row_of(&it, "out.compliance", "out", &value).absolute) < 1e-12);
    cell_close(&it);
}

/* --- against the cell solved again ------------------------------------------------------------ */

static const char stiff[] = "process \"n180.process\"\nrail vdd 3 V\n"
                            "current IREF vdd -> ref 5 uA\n"
                            "nmos M1 d=ref g=ref s=gnd W=8u L=2u\n"
                            "nmos M2 d=tail g=ref s=deg W=8u L=2u\n"
                            "resistor RS ref -> gnd 2M\nresistor RV vdd -> ref 3M\n"
                            "resistor RE deg -> gnd 5k match=1%\n"
                            "output tail at 1.5 V from 0 V to 3 V within 2%\n";

/* Relative. The fifth-order term of the differences is then far below the tolerance. */
static const double solved_step = 2e-3, solved_tolerance = 1e-6;

static double solved_again(struct solved_cell *it, const struct probe *probe,
                           const struct parameter_ref *p)
{
    double sum = 0;
    for (int k = 0; k < STENCIL_POINTS; k++) {
        const double at = p->value * (1 + stencil_offset[k] * solved_step);
        double q = NAN;
        struct trial trial;
        assert_int_equal(trial_open(&trial, &it->point, NULL, p, &at, 1), STATUS_OK);
        assert_int_equal(quantity_values(&trial.point, probe, 1, &q), STATUS_OK);
        trial_close(&trial);
        sum += stencil_weight[k] / (solved_step * p->value) * q;
    }
    return sum;
}

static void outputs(void **state)
{
    (void)state;
    static const char *const cases[] = {"tail.resistance", "tail.line",   "tail.compliance",
                                        "tail.low",        "tail.tempco", "tail.sigma",
                                        "tail.flatness"};
    static const char *const names[] = {"IREF",           "RE",         "M2.W", "M1.L", "vdd",
                                        "nmos.threshold", "temperature"};
    struct solved_cell it;
    cell_solve(&it, stiff);
    struct arena *arena = arena_create();
    struct parameter_list list;
    assert_true(derivative_parameters(it.system, arena, &list));
    int compared = 0;
    for (size_t c = 0; c < sizeof cases / sizeof cases[0]; c++) {
        const struct probe probe = probe_of(&it, cases[c]);
        for (int k = 0; k < list.count; k++) {
            const struct parameter_ref *p = &list.list[k];
            bool named = false;
            for (size_t n = 0; n < sizeof names / sizeof names[0]; n++) {
                named |= strcmp(p->name, names[n]) == 0;
            }
            double value, slope;
            if (!named) {
                continue;
            }
            assert_int_equal(quantity_derivative(&it.point, &probe, p, 1, &value, &slope, NULL),
                             STATUS_OK);
            const double wanted = solved_again(&it, &probe, p);
            const double floor = solved_tolerance * 1e-2 * fabs(value / p->value);
            if (!(fabs(slope - wanted) <= solved_tolerance * fabs(wanted) + floor)) {
                print_error("d %s / d %s: %.10g, solved again %.10g\n", probe.text, p->name, slope,
                            wanted);
                fail();
            }
            compared++;
        }
    }
    assert_true(compared == 49);
    arena_destroy(arena);
    cell_close(&it);
}

/* Rows come greatest relative first, those without any effect last and counted. */
static void ranking(void **state)
{
    (void)state;
    struct solved_cell it;
    cell_solve(&it, "rail vcc 3 V\nrail other 5 V\nresistor RA vcc -> mid 10k\n"
                    "resistor RB mid -> gnd 40k\nresistor RX other -> gnd 1k\n");
    struct arena *arena = arena_create();
    struct sensitivity_table table;
    const struct probe probe = probe_of(&it, "mid.v");
    assert_int_equal(sensitivity_find(&it.point, &probe, arena, &table), STATUS_OK);
    assert_string_equal(table.rows[0].parameter, "vcc"); /* 1; then RA and RB with 1/5 */
    check_near(table.rows[0].relative, 1, 1e-10);
    check_near(fabs(table.rows[1].relative), 0.2, 1e-10);
    check_near(table.rows[1].relative, -table.rows[2].relative, 1e-9);
    assert_int_equal(table.idle_count, 3); /* other, RX, temperature */
    assert_int_equal(table.row_count, 6);
    arena_destroy(arena);
    cell_close(&it);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(beta_multiplier), cmocka_unit_test(widlar),  cmocka_unit_test(ptat),
        cmocka_unit_test(compliance),      cmocka_unit_test(outputs), cmocka_unit_test(ranking),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}

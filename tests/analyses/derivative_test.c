/*
 * derivative_test.c: adjoint derivatives against differences of solved cells, and against closed
 * forms.
 */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <cmocka.h>

#include "analyses/derivative.h"
#include "solve/linearised.h"
#include "solve/measure.h"
#include "analyses/solved_cell.h"
#include "solve/variant.h"

/* Every kind of dependence: leads, body effect, modulation, a let, a law, a bipolar, a diode. */
static const char mixed[] = "process \"n180.process\"\n"
                            "let IB = 2 uA\n"
                            "let KF = 1.5\n"
                            "model q npn\n"
                            "  saturation_current = 2 fA\n"
                            "  beta = 80\n"
                            "  early = 40 V\n"
                            "  knee = 1 mA\n"
                            "  emitter_resistance = 40\n"
                            "  base_resistance = 300\n"
                            "end\n"
                            "rail vdd 3 V\n"
                            "current IREF vdd -> ref IB\n"
                            "nmos M1 d=ref g=ref s=gnd W=4u L=2u\n"
                            "nmos M2 d=tail g=ref s=deg W=16u L=2u\n"
                            "resistor RE deg -> gnd 9k tempco=900 ppm/K\n"
                            "pmos M3 d=pb g=pb s=vdd W=8u L=2u\n"
                            "resistor RP pb -> b 200k\n"
                            "npn Q1 c=b b=b e=gnd area=2 model=q\n"
                            "npn Q2 c=col b=b e=gnd area=3 model=q\n"
                            "resistor RC vdd -> col 50k\n"
                            "diode D1 col -> low area=1\n"
                            "law F1 low -> gnd i = KF*10 uA*tanhish\n"
                            "output tail at 1 V from 0 V to 3 V\n";

/* The value of a probe after a new solve, in full precision of the state. */
static double solved_value(struct operating_point *point, const struct probe *probe)
{
    assert_int_equal(operating_point_newton(point), NEWTON_CONVERGED);
    assert_int_equal(operating_point_polish(point), STATUS_OK);
    if (probe->kind == PROBE_DEVICE) {
        return measure_device_quantity(point->system, probe->index, probe->quantity,
                                       point->refined);
    }
    return measure_probe(point->system, probe, point->x);
}

static double conductance(struct operating_point *point, int branch)
{
    assert_int_equal(operating_point_newton(point), NEWTON_CONVERGED);
    assert_int_equal(operating_point_polish(point), STATUS_OK);
    return (double)linearised_conductance(point, branch);
}

/* A quantity, or with probe NULL the conductance of a branch. */
static double value_at(struct operating_point *point, const struct probe *probe, int branch)
{
    return probe != NULL ? solved_value(point, probe) : conductance(point, branch);
}

static double resolved(struct solved_cell *it, const struct parameter_ref *p,
                       const struct probe *probe, int branch)
{
    const double h = p->sort == PARAMETER_KNOB && p->knob.kind == KNOB_TEMPERATURE
                         ? 0.02
                         : 2e-4 * fabs(p->value);
    double sum = 0, values[64];
    for (int k = 0; k < STENCIL_POINTS; k++) {
        const double at = p->value + stencil_offset[k] * h;
        double q;
        if (p->sort == PARAMETER_OWN) {
            system_set(it->system, p->instance, p->index, at);
            q = value_at(&it->point, probe, branch);
            system_set(it->system, p->instance, p->index, p->value);
        } else if (p->sort == PARAMETER_MODEL) {
            int size = 0;
            for (int i = 0; i < it->circuit->instance_count; i++) {
                if (it->circuit->instances[i].model_values == p->model_values) {
                    size = it->circuit->instances[i].type->model_parameter_count;
                }
            }
            memcpy(values, p->model_values, (size_t)size * sizeof *values);
            values[p->index] = at;
            system_swap_model(it->system, p->model_values, values);
            q = value_at(&it->point, probe, branch);
            system_swap_model(it->system, p->model_values, NULL);
        } else {
            const struct setting setting = {&p->knob, at};
            struct variant variant;
            struct operating_point point;
            assert_int_equal(variant_open(&variant, it->system, &setting, 1), STATUS_OK);
            assert_true(operating_point_create(&point, variant.system, NULL, NULL));
            memcpy(point.x, it->point.x, (size_t)variant.system->n * sizeof *point.x);
            q = value_at(&point, probe, branch);
            variant_close(&variant);
        }
        sum += stencil_weight[k] / h * q;
    }
    assert_int_equal(operating_point_newton(&it->point), NEWTON_CONVERGED);
    assert_int_equal(operating_point_polish(&it->point), STATUS_OK);
    return sum;
}

static int compare_all(struct solved_cell *it, const struct parameter_list *list,
                       const double *slopes, const struct probe *probe, int branch, double value,
                       const char *name)
{
    int wrong = 0;
    for (int k = 0; k < list->count; k++) {
        const struct parameter_ref *p = &list->list[k];
        if (!(fabs(p->value) > 0)) {
            continue;
        }
        /* the promised 1e-6, or what is nothing beside the quantity itself */
        const double wanted = resolved(it, p, probe, branch);
        const double floor = 1e-10 * fabs(value / p->value);
        if (!(fabs(slopes[k] - wanted) <= 1e-6 * fabs(wanted) + floor)) {
            print_error("d %s / d %s: %.12g, by solving again %.12g\n", name, p->name, slopes[k],
                        wanted);
            wrong++;
        }
    }
    return wrong;
}

static void against_differences(void **state)
{
    (void)state;
    static const char *const names[] = {"tail.current", "M2.id",      "M2.gm",        "M2.headroom",
                                        "Q2.ic",        "Q1.vbe",     "deg.v",        "vdd.power",
                                        "vdd.current",  "cell.power", "M2.inversion", "D1.i",
                                        "F1.i",         "RE.power",   "all.headroom"};
    char text[sizeof mixed];
    strcpy(text, mixed);
    memcpy(strstr(text, "tanhish"), "low.v/V", 7);
    struct solved_cell it;
    cell_solve(&it, text);
    struct arena *arena = arena_create();
    struct parameter_list list;
    assert_true(derivative_parameters(it.system, arena, &list));
    assert_true(list.count > 40);
    double *slopes = arena_new_array(arena, double, list.count);
    int wrong = 0;
    for (size_t n = 0; n < sizeof names / sizeof names[0]; n++) {
        const struct probe probe = probe_of(&it, names[n]);
        const double value = solved_value(&it.point, &probe);
        assert_int_equal(derivative_probe(&it.point, &probe, list.list, list.count, slopes),
                         STATUS_OK);
        wrong += compare_all(&it, &list, slopes, &probe, -1, value, names[n]);
    }
    const int branch = system_branch(&it.circuit->instances[it.circuit->outputs[0].instance]);
    assert_int_equal(derivative_transfer(&it.point, branch, branch, list.list, list.count, slopes),
                     STATUS_OK);
    for (int k = 0; k < list.count; k++) {
        slopes[k] = -slopes[k]; /* the conductance is minus the transfer, see linearised.c */
    }
    wrong += compare_all(&it, &list, slopes, NULL, branch, conductance(&it.point, branch),
                         "conductance");
    assert_int_equal(wrong, 0);
    arena_destroy(arena);
    cell_close(&it);
}

static double slope_of(struct solved_cell *it, const char *quantity, const char *parameter)
{
    struct arena *arena = arena_create();
    struct parameter_list list;
    const struct probe probe = probe_of(it, quantity);
    assert_true(derivative_parameters(it->system, arena, &list));
    double found = NAN;
    for (int k = 0; k < list.count; k++) {
        if (strcmp(list.list[k].name, parameter) == 0) {
            assert_int_equal(derivative_probe(&it->point, &probe, &list.list[k], 1, &found),
                             STATUS_OK);
        }
    }
    arena_destroy(arena);
    return found;
}

/* A divider: v = V B/(A + B); dv/dA = -V B/(A + B)^2, dv/dB = V A/(A + B)^2, dv/dV = B/(A + B). */
static void divider(void **state)
{
    (void)state;
    struct solved_cell it;
    cell_solve(&it, "let B = 20k\nrail vcc 3 V\nresistor RA vcc -> mid 10k\n"
                    "resistor RB mid -> gnd B\n");
    check_near(slope_of(&it, "mid.v", "RA"), -3 * 20e3 / 9e8, 1e-10);
    check_near(slope_of(&it, "mid.v", "RB"), 3 * 10e3 / 9e8, 1e-10);
    check_near(slope_of(&it, "mid.v", "B"), 3 * 10e3 / 9e8, 1e-10);
    check_near(slope_of(&it, "mid.v", "vcc"), 2.0 / 3, 1e-10);
    cell_close(&it);
}

/* Gray and Meyer, section 4.4.1.1 (references.md B03): the current of a bipolar Widlar source
 * follows its input current with the relative sensitivity 1/(1 + IOUT R2/UT). */
static void widlar(void **state)
{
    (void)state;
    struct solved_cell it;
    cell_solve(&it, "model q npn\n  saturation_current = 1 fA\n  beta = 1e9\nend\n"
                    "rail vcc 30 V\ncurrent IIN vcc -> a 1 mA\n"
                    "npn Q1 c=a b=a e=gnd model=q\nnpn Q2 c=out b=a e=e model=q\n"
                    "resistor R2 e -> gnd 27.5k\noutput out at 15 V from 0 V to 30 V\n");
    const struct probe probe = probe_of(&it, "out.current");
    const double i = solved_value(&it.point, &probe);
    const double ut = BOLTZMANN_OVER_CHARGE * 300.15;
    check_near(slope_of(&it, "out.current", "IIN") * 1e-3 / i, 1 / (1 + i * 27.5e3 / ut), 1e-6);
    cell_close(&it);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(against_differences),
        cmocka_unit_test(divider),
        cmocka_unit_test(widlar),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}

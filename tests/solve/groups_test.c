/*
 * groups_test.c: like devices side by side against every device by itself in long double: currents
 * and derivatives at random points, after values, models, temperature and effects have changed.
 */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <cmocka.h>

#include <math.h>
#include <stdio.h>
#include <string.h>

#include "solve/groups.h"

enum { N = 40, NONZEROS = 400 };

/* S: below this, a device that is off conducts nothing. */
static const long double off_conductance = 1e-15L;

/* Mirrors of each technology, one device of each kind that stands alone, and five like resistors.
 */
static const char text[] = "process \"n180.process\"\n"
                           "rail vdd 5 V\n"
                           "current I1 vdd -> a 10 uA\n"
                           "nmos M1 d=a g=a s=gnd W=10u L=1u\n"
                           "nmos M2 d=b g=a s=s2 W=10u L=1u\n"
                           "nmos M3 d=c g=a s=s3 W=10u L=1u\n"
                           "nmos M4 d=c g=a s=gnd W=20u L=2u\n"
                           "resistor R1 s2 -> gnd 10k\n"
                           "resistor R2 s3 -> gnd 20k\n"
                           "resistor R3 vdd -> b 30k\n"
                           "resistor R4 vdd -> c 40k\n"
                           "resistor R5 vdd -> e 50k tempco=1e-3\n"
                           "resistor R6 vdd -> h 60k\n"
                           "model q npn\n"
                           " saturation_current = 1e-15 A\n"
                           " beta = 100\n"
                           "end\n"
                           "npn Q1 c=e b=e e=gnd model=q\n"
                           "npn Q2 c=f b=e e=gnd area=2 model=q\n"
                           "resistor R7 vdd -> f 10k\n"
                           "nmos H1 d=h g=h s=gnd b=gnd conduction=100u threshold=1\n"
                           "nmos H2 d=i g=h s=gnd b=gnd conduction=200u threshold=1.1\n"
                           "pmos P1 d=i g=i s=vdd b=vdd conduction=50u threshold=1\n"
                           "diode D1 f -> gnd\n";

struct bench {
    struct cell *cell;
    struct circuit *circuit;
    struct system *system;
    uint64_t seed;
};

static double any(struct bench *b)
{
    b->seed = b->seed * 6364136223846793005u + 1442695040888963407u;
    return (double)(b->seed >> 11) / 9007199254740992.0;
}

static void open_bench(struct bench *b)
{
    static const char *const folders[] = {SOURCE_DIR "/models"};
    const struct circuit_settings settings = {.kelvin = NAN};
    *b = (struct bench){.seed = 1};
    assert_int_equal(cell_read("groups.cell", text, strlen(text), folders, 1, &b->cell), STATUS_OK);
    const enum status status =
        circuit_build(b->cell, &settings, &b->cell->diagnostics, &b->circuit);
    for (int k = 0; k < b->cell->diagnostics.count; k++) {
        print_error("%s\n", b->cell->diagnostics.list[k].text);
    }
    assert_int_equal(status, STATUS_OK);
    b->system = system_create(b->circuit, b->circuit->kelvin, EFFECTS_FULL);
    assert_non_null(b->system);
    assert_true(b->system->n <= N && b->system->nonzeros <= NONZEROS);
}

static void close_bench(struct bench *b)
{
    system_free(b->system);
    circuit_free(b->circuit);
    cell_free(b->cell);
}

/* Double against long double, at points as a search meets them. */
static void compare(struct bench *b)
{
    struct system *s = b->system;
    for (int point = 0; point < 200; point++) {
        double x[N], f[N], scale[N], values[NONZEROS];
        long double wide[N], wide_f[N], wide_scale[N], wide_values[NONZEROS], largest[N] = {0};
        for (int k = 0; k < s->n; k++) {
            wide[k] = x[k] = k < s->node_count ? 7 * any(b) - 1 : 1e-3 * (any(b) - 0.5);
        }
        assert_true(s->face.evaluate(s, x, f, scale, values));
        assert_true(s->face.evaluate_extended(s, wide, wide_f, wide_scale, wide_values));
        const struct pattern *p = s->face.pattern;
        for (int k = 0; k < p->start[s->n]; k++) {
            largest[p->row[k]] = fmaxl(largest[p->row[k]], fabsl(wide_values[k]));
        }
        for (int k = 0; k < s->n; k++) {
            assert_true(fabsl(f[k] - wide_f[k]) <= 1e-12L * wide_scale[k]);
            assert_true(scale[k] >= (double)wide_scale[k] * (1 - 1e-9));
        }
        for (int k = 0; k < p->start[s->n]; k++) {
            const long double room = largest[p->row[k]] + off_conductance;
            assert_true(fabsl(values[k] - wide_values[k]) <= 1e-11L * room);
        }
    }
}

static int find(const struct bench *b, const char *name)
{
    const int k = circuit_find_instance(b->circuit, name);
    assert_true(k >= 0);
    return k;
}

static int parameter(const struct bench *b, int k, const char *name)
{
    const struct device_type *type = b->circuit->instances[k].type;
    return parameter_find(type->parameters, type->parameter_count, name);
}

static bool together(const struct bench *b, const char *one, const char *other)
{
    const struct groups *g = b->system->groups;
    const int group = g->group_of[find(b, one)];
    return group >= 0 && group == g->group_of[find(b, other)];
}

static void test_agreement(void **state)
{
    (void)state;
    struct bench b;
    open_bench(&b);
    compare(&b);
    const struct groups *g = b.system->groups;
    if (g != NULL) { /* else this processor has no lanes */
        assert_true(together(&b, "M1", "M2") && together(&b, "M1", "M3"));
        assert_false(together(&b, "M1", "M4"));
        assert_true(together(&b, "H1", "H2")); /* they differ in what mismatch moves */
        assert_true(together(&b, "R1", "R2"));
        assert_int_equal(g->group_of[find(&b, "P1")], -1);
        assert_int_equal(g->left_out_count, 0);
    }
    close_bench(&b);
}

static void test_changes(void **state)
{
    (void)state;
    struct bench b;
    open_bench(&b);
    struct system *s = b.system;
    compare(&b);
    const int m2 = find(&b, "M2"), r2 = find(&b, "R2");
    const int width = parameter(&b, m2, "W"), shift = parameter(&b, m2, "threshold_shift");
    assert_true(width >= 0 && shift >= 0);
    system_set(s, m2, shift, 5e-3); /* stays with the others */
    compare(&b);
    assert_true(s->groups == NULL || s->groups->left_out_count == 0);
    system_set(s, m2, width, 12e-6); /* is now unlike them */
    compare(&b);
    assert_true(s->groups == NULL || s->groups->left_out_count == 1);
    system_set(s, m2, width, 13e-6);
    assert_true(s->groups == NULL || s->groups->left_out_count == 1);
    system_set(s, r2, 0, 21e3);
    compare(&b);
    system_set(s, m2, width, 10e-6); /* and like them again */
    assert_true(s->groups == NULL || s->groups->left_out_count == 0);
    compare(&b);
    system_conditions(s, 350, EFFECTS_FULL);
    compare(&b);
    assert_true(s->groups == NULL || together(&b, "M1", "M2"));
    system_conditions(s, 300, EFFECTS_HAND);
    compare(&b);
    system_conditions(s, 250, EFFECT_INVERSION | EFFECT_TEMPERATURE);
    compare(&b);
    close_bench(&b);
}

/* Values of a model in all its users, and back. */
static void test_model(void **state)
{
    (void)state;
    struct bench b;
    open_bench(&b);
    const struct instance *m1 = &b.circuit->instances[find(&b, "M1")];
    double values[100];
    const int count = m1->type->model_parameter_count;
    assert_true(count <= 100);
    memcpy(values, m1->model_values, (size_t)count * sizeof *values);
    compare(&b);
    values[parameter_find(m1->type->model_parameters, count, "phi")] *= 1.1;
    system_swap_model(b.system, m1->model_values, values);
    compare(&b);
    system_swap_model(b.system, m1->model_values, NULL);
    compare(&b);
    assert_true(b.system->groups == NULL || b.system->groups->left_out_count == 0);
    close_bench(&b);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_agreement),
        cmocka_unit_test(test_changes),
        cmocka_unit_test(test_model),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}

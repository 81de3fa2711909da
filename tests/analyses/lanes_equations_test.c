/*
 * lanes_equations_test.c: the equations of every device over lanes against the same equations for
 * one bias, at random biases and with random values of what mismatch moves; and the random numbers.
 * Compiled once a width.
 */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <cmocka.h>

#include "analyses/solved_cell.h"
#include "analyses/lanes.h"
#include "devices/real.h"
#include "numerics/random.h"
#include "numerics/random_lanes.h"

#undef fabs /* here of numbers again */

/* Every type with its options; lead resistances come from the diode and the power transistor. */
static const char text[] =
    "process \"bench.process\"\n"
    "model n nmos\n threshold = 0.5 V\n kprime = 200 uA/V^2\n body_effect = 0.5 V^0.5\n"
    " mobility_bulk = 0.05/V\n mobility_gate = 0.2/V\n critical_field = 5e6 V/m\n"
    " saturation_knee = 0.9\n early = 20 V\n early_onset = 0.5 V\n dibl = 0.01\n"
    " dibl_body = 0.1/V\n junction_leak = 1 nA/m\n match_threshold = 4 mV*um\n"
    " match_gain = 0.01 um\nend\n"
    "model p pmos\n threshold = 0.6 V\n kprime = 80 uA/V^2\n early = 30 V\n"
    " match_threshold = 5 mV*um\nend\n"
    "rail vdd 3 V\n"
    "nmos M1 d=a g=b s=c W=10u L=1u model=n\n"
    "pmos M2 d=a g=b s=vdd W=10u L=1u model=p\n"
    "nmos M3 d=a g=b s=c b=gnd conduction=1mA/V^2 threshold=0.7V early=50V\n"
    "npn Q1 c=a b=b e=c\n"
    "pnp Q2 c=a b=b e=vdd\n"
    "npn Q3 c=a b=b e=c model=npn_power\n"
    "njfet J1 d=a g=b s=c\n"
    "pjfet J2 d=a g=b s=vdd\n"
    "diode D1 a -> b\n"
    "diode D2 a -> c model=zener_5v6\n"
    "resistor R1 a -> b 10k match=2% tol=1%\n"
    "resistor R2 c -> gnd 1k\n"
    "current I1 vdd -> a 1 mA\n"
    "opamp A1 out=b plus=a minus=c gain=1000 low=gnd high=vdd offset=1mV\n";

enum { ROUNDS = 4000, LOCAL = DEVICE_LOCAL_LIMIT, BLOCK = 64 };

/* What rounding leaves. */
static const double agreement = 1e-12;

static double uniform(uint64_t *state)
{
    *state ^= *state << 13; /* Marsaglia (2003) */
    *state ^= *state >> 7;
    *state ^= *state << 17;
    return (double)(*state >> 11) * 0x1p-53;
}

/* The block of a device with its moved values in front, and a plain copy for each lane. */
struct blocks {
    real lanes[MOVED_LIMIT + BLOCK];
    double single[LANES][BLOCK];
};

static void move(struct blocks *b, const struct device_lanes *it, uint64_t *state)
{
    for (int d = 0; d < it->moved_count; d++) {
        const size_t place = it->moved[d] / sizeof(double);
        const double base = b->single[0][place];
        for (int l = 0; l < LANES; l++) {
            b->single[l][place] = base * (0.8 + 0.4 * uniform(state));
            b->lanes[d][l] = b->single[l][place];
        }
    }
}

static void compare(const char *name, int n, int lane, const real *f, const real *jac,
                    const double *f1, const double *jac1)
{
    for (int r = 0; r < n; r++) {
        double size = fabs(f1[r]), slope = 1e-12; /* S: below, a reversed junction is rounding */
        for (int q = 0; q < n; q++) {
            slope = fmax(slope, fabs(jac1[n * r + q]));
        }
        size += 1e-3 * slope; /* an error of 1e-15 V in a voltage of some volts */
        if (!(fabs(f[r][lane] - f1[r]) <= agreement * size)) {
            print_error("%s: f[%d] is %.17g, wanted %.17g\n", name, r, f[r][lane], f1[r]);
            fail();
        }
        for (int q = 0; q < n; q++) {
            if (!(fabs(jac[n * r + q][lane] - jac1[n * r + q]) <= agreement * slope)) {
                print_error("%s: slope %d %d is %.17g, wanted %.17g\n", name, r, q,
                            jac[n * r + q][lane], jac1[n * r + q]);
                fail();
            }
        }
    }
}

static void check_instance(const struct system *s, int k, const struct device_lanes *it)
{
    const struct instance *instance = &s->circuit->instances[k];
    const int n = instance->local_count;
    uint64_t state = 12345 + (uint64_t)k;
    static struct blocks blocks;
    assert_true(instance->type->prepared_size <= sizeof blocks.single[0]);
    for (int round = 0; round < ROUNDS; round++) {
        real x[LOCAL], f[LOCAL], jac[LOCAL * LOCAL];
        for (int l = 0; l < LANES; l++) {
            memcpy(blocks.single[l], system_block(s, k), instance->type->prepared_size);
        }
        memcpy(blocks.lanes + MOVED_LIMIT, system_block(s, k), instance->type->prepared_size);
        move(&blocks, it, &state);
        for (int q = 0; q < n; q++) {
            for (int l = 0; l < LANES; l++) {
                x[q][l] = (round % 2 == 0 ? 2 : 8) * (uniform(&state) - 0.5);
            }
        }
        it->evaluate(blocks.lanes + MOVED_LIMIT, x, f, jac);
        for (int l = 0; l < LANES; l++) {
            double x1[LOCAL], f1[LOCAL], jac1[LOCAL * LOCAL];
            for (int q = 0; q < n; q++) {
                x1[q] = x[q][l];
            }
            instance->type->evaluate(blocks.single[l], x1, f1, jac1);
            compare(instance->name, n, l, f, jac, f1, jac1);
        }
    }
}

static void check_effects(unsigned effects)
{
    struct solved_cell cell;
    cell_open(&cell, text);
    cell.system = system_create(cell.circuit, cell.circuit->kelvin, effects);
    assert_non_null(cell.system);
    int checked = 0;
    for (int k = 0; k < cell.circuit->instance_count; k++) {
        const struct device_lanes *it = REAL_NAME(device)(cell.circuit->instances[k].type);
        if (it != NULL) {
            check_instance(cell.system, k, it);
            checked++;
        }
    }
    assert_true(checked >= 15); /* rail and leads too */
    cell_close(&cell);
}

static void devices_agree(void **test)
{
    (void)test;
    check_effects(EFFECTS_FULL);
    check_effects(EFFECTS_HAND);
    check_effects(EFFECTS_FULL & ~(unsigned)(EFFECT_MOBILITY | EFFECT_BODY));
}

static void deviates_agree(void **test)
{
    (void)test;
    enum { COUNT = 7, STREAMS = 20000 };
    for (uint64_t first = 0; first < STREAMS; first += LANES) {
        lanes many[COUNT];
        const uint64_t seed = first % 3 == 0 ? 1 : 0x123456789abcdefu, far = first + (1ull << 33);
        random_normals_lanes(seed, far, COUNT, many);
        for (int l = 0; l < LANES; l++) {
            double one[COUNT];
            random_normals(seed, far + (uint64_t)l, COUNT, one);
            for (int k = 0; k < COUNT; k++) {
                check_near(many[k][l], one[k], 1e-14);
            }
        }
    }
}

int main(void)
{
    const struct lanes_kind *kind = lanes_find(LANES);
    if (kind == NULL || kind->width != LANES) {
        print_message("this processor has no such lanes\n");
        return 77;
    }
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(devices_agree),
        cmocka_unit_test(deviates_agree),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}

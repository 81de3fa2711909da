/*
 * repair_test.c: single changes that meet a requirement, verified against the others.
 */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <cmocka.h>

#include "analyses/repair.h"
#include "analyses/solved_cell.h"

static struct result *reviewed(struct solved_cell *it, const char *text)
{
    struct result *result = NULL;
    cell_open(it, text);
    assert_int_equal(analysis_review(it->circuit, &plain_options, &result), STATUS_OK);
    return result;
}

static void close_all(struct solved_cell *it, struct result *result)
{
    result_free(result);
    cell_close(it);
}

/* 3 V over RA + RB: 2 V in the middle wants RB = 2 RA. RB 10k -> 20k (0.3 mW) or RA 10k -> 5k
 * (0.6 mW, beyond the power allowed). */
static void divider(void **state)
{
    (void)state;
    struct solved_cell it;
    struct result *result =
        reviewed(&it, "rail vcc 3 V\nresistor RA vcc -> mid 10k\nresistor RB mid -> gnd 10k\n"
                      "require mid.v within 1% of 2 V\nrequire vcc.power below 0.5 mW\n");
    const struct repair_list *found = &result->repairs[0];
    assert_true(found->looked_for);
    assert_false(result->repairs[1].looked_for);
    assert_int_equal(found->count, 2);
    assert_string_equal(found->list[0].parameter, "RB");
    check_near(found->list[0].from, 10e3, 1e-12);
    check_near(found->list[0].to, 20e3, 1e-12);
    check_near(found->list[0].change, 1, 1e-12);
    assert_null(found->list[0].breaks);
    assert_string_equal(found->list[1].parameter, "RA");
    check_near(found->list[1].to, 5e3, 1e-12);
    assert_string_equal(found->list[1].breaks, "require vcc.power below 0.5 mW");
    close_all(&it, result);
}

/* Nothing that a designer may touch moves a rail. */
static void hopeless(void **state)
{
    (void)state;
    struct solved_cell it;
    struct result *result =
        reviewed(&it, "rail vcc 3 V\nresistor RA vcc -> gnd 10k\nrequire vcc.v below 1 V\n");
    assert_true(result->repairs[0].looked_for);
    assert_int_equal(result->repairs[0].count, 0);
    close_all(&it, result);
}

/* Equal transistors, three times the current wanted: W and m of M2 by 3, and m stays whole; the
 * smallest changes first. Limits are met a hundredth inside. */
static void counts(void **state)
{
    (void)state;
    struct solved_cell it;
    struct result *result = reviewed(
        &it, "model n nmos\n  threshold = 0.5 V\n  kprime = 200 uA/V^2\nend\nrail vdd 3 V\n"
             "current IREF vdd -> ref 10 uA\nnmos M1 d=ref g=ref s=gnd W=6u L=2u\n"
             "nmos M2 d=out g=ref s=gnd W=6u L=2u m=2\noutput out at 2 V from 0 V to 3 V\n"
             "require out.current above 29 uA\n");
    const struct repair_list *found = &result->repairs[0];
    assert_int_equal(found->count, REPAIR_LIMIT);
    for (int k = 0; k < found->count; k++) {
        const struct repair *it_is = &found->list[k];
        const double factor =
            strcmp(it_is->parameter, "M2.m") == 0   ? 1.5
            : strcmp(it_is->parameter, "IREF") == 0 ? 29.29 / 20
            : strstr(it_is->parameter, "M2.W") != NULL || strstr(it_is->parameter, "M1.L") != NULL
                ? 29.29 / 20
                : 20 / 29.29;
        check_near(it_is->to / it_is->from, factor, 1e-3);
    }
    close_all(&it, result);
}

/*
 * 236 mV where 200 mV is wanted: a wider M1 lowers the overdrive of both, and the current of M2
 * with it, which breaks the other requirement; so does every change of one transistor alone.
 */
static void compliance(void **state)
{
    (void)state;
    struct solved_cell it;
    struct result *result = reviewed(
        &it, "process \"n180.process\"\nrail vdd 3 V\ncurrent IREF vdd -> ref 20 uA\n"
             "nmos M1 d=ref g=ref s=gnd W=4u L=1u\nnmos M2 d=out g=ref s=gnd W=4u L=1u\n"
             "output out at 1.5 V from 0 V to 3 V\n"
             "require out.compliance below 200 mV\nrequire out.current within 10% of 22.5 uA\n");
    assert_int_equal(result->requirements[0].judgement, JUDGED_NOT_MET);
    const struct repair_list *found = &result->repairs[0];
    assert_true(found->count >= 1);
    for (int k = 0; k < found->count; k++) {
        assert_non_null(found->list[k].breaks);
    }
    close_all(&it, result);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(divider),
        cmocka_unit_test(hopeless),
        cmocka_unit_test(counts),
        cmocka_unit_test(compliance),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}

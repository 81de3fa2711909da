/*
 * calibrate_memory_test.c: every allocation of a calibration fails once; each time the status says
 * so and nothing is lost (the sanitizer build sees leaks).
 */
#include "files.h"

#include "check.h"

static long countdown = -1; /* allocations until one fails; -1: none fails */

void *__real_malloc(size_t size);
void *__real_calloc(size_t count, size_t size);
void *__real_realloc(void *block, size_t size);
void *__wrap_malloc(size_t size);
void *__wrap_calloc(size_t count, size_t size);
void *__wrap_realloc(void *block, size_t size);

static bool fails(void)
{
    return countdown >= 0 && countdown-- == 0;
}

void *__wrap_malloc(size_t size)
{
    return fails() ? NULL : __real_malloc(size);
}

void *__wrap_calloc(size_t count, size_t size)
{
    return fails() ? NULL : __real_calloc(count, size);
}

void *__wrap_realloc(void *block, size_t size)
{
    return fails() ? NULL : __real_realloc(block, size);
}

static void fail_each(const struct calibration_request *request)
{
    long count = 0;
    for (;; count++) {
        struct calibration *c = NULL;
        countdown = count;
        enum status status = calibration_run(request, &c);
        bool was_used = countdown < 0;
        countdown = -1;
        calibration_free(c);
        if (!was_used) {
            assert_int_equal(status, STATUS_OK);
            break;
        }
        assert_int_equal(status, STATUS_MEMORY);
    }
    assert_true(count > 3);
}

static void every_allocation_may_fail(void **state)
{
    (void)state;
    struct curve_file diode, resistor, transistor;
    begin_file(&diode, "v,i");
    begin_file(&resistor, "v,i");
    begin_file(&transistor, "vgs,vds,id");
    for (int k = 1; k < 40; k++) {
        double v = 0.3 + 0.01 * k, soft = 0.04 * log1p(exp((3 * v - 1.4) / 0.04));
        fprintf(diode.out, "%g,%g\n", v, 1e-14 * expm1(v / 0.0257));
        fprintf(resistor.out, "%g,%g\n", v, v / 1e3);
        fprintf(transistor.out, "%g,0.1,%g\n", 3 * v - 0.9, 1e-5 * soft);
    }
    end_file(&diode);
    end_file(&resistor);
    end_file(&transistor);
    struct calibration_file files[] = {{diode.path, NULL, NULL, false}};
    struct calibration_request request = {
        .kind = "diode", .files = files, .file_count = 1, .temperature = "27 C", .noise = "1 pA"};
    fail_each(&request);
    files[0].path = resistor.path;
    request.kind = "resistor";
    fail_each(&request);
    files[0].path = transistor.path;
    request.kind = "nmos";
    request.size = "5u/5u";
    fail_each(&request);
    remove_file(&diode);
    remove_file(&resistor);
    remove_file(&transistor);
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(every_allocation_may_fail)};
    return cmocka_run_group_tests(tests, NULL, NULL);
}

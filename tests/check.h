/*
 * check.h: comparisons that cmocka lacks.
 */
#ifndef TESTS_CHECK_H
#define TESTS_CHECK_H

#include <math.h>
#include <stdio.h>

/* Fails unless |got - wanted| <= relative * |wanted| (a not-a-number fails; 0 wants exactly 0). */
#define check_near(got, wanted, relative)                                                          \
    do {                                                                                           \
        double check_got = (got), check_wanted = (wanted);                                         \
        if (!(fabs(check_got - check_wanted) <= (relative)*fabs(check_wanted))) {                  \
            print_error("%s is %.17g, wanted %.17g\n", #got, check_got, check_wanted);             \
            fail();                                                                                \
        }                                                                                          \
    } while (0)

#endif

/*
 * cells.h: small cells with closed-form answers, for more than one test.
 */
#ifndef TESTS_ANALYSES_CELLS_H
#define TESTS_ANALYSES_CELLS_H

/*
 * Beta multiplier, references.md M06: beta = k'W/L = 1 mA/V^2, K = 4, R = 5 kohm; under the square
 * law I = 2/(beta R^2) (1 - 1/sqrt K)^2 = 20 uA.
 */
#define BETA_MULTIPLIER                                                                            \
    "model n nmos\n  threshold = 0.5 V\n  kprime = 200 uA/V^2\nend\n"                              \
    "model p pmos\n  threshold = 0.5 V\n  kprime = 100 uA/V^2\nend\n"                              \
    "rail vdd 3 V\n"                                                                               \
    "nmos M1 d=nb g=nb s=gnd W=5u L=1u model=n\n"                                                  \
    "nmos M2 d=pb g=nb s=deg W=5u L=1u m=4 model=n\n"                                              \
    "resistor R deg -> gnd 5k\n"                                                                   \
    "pmos M3 d=nb g=pb s=vdd W=10u L=1u model=p\n"                                                 \
    "pmos M4 d=pb g=pb s=vdd W=10u L=1u model=p\n"                                                 \
    "pmos M5 d=bias g=pb s=vdd W=10u L=1u model=p\n"                                               \
    "output bias at 1 V from 0 V to 3 V\n"

/* Bipolar Widlar source without base currents: IOUT R2 = UT ln(IIN/IOUT), references.md B03. */
#define WIDLAR(R2)                                                                                 \
    "model q npn\n  saturation_current = 1 fA\n  beta = 1e9\nend\n"                                \
    "rail vcc 30 V\ncurrent IIN vcc -> a 1 mA\n"                                                   \
    "npn Q1 c=a b=a e=gnd model=q\nnpn Q2 c=out b=a e=e model=q\n"                                 \
    "resistor R2 e -> gnd " R2 "\noutput out at 15 V from 0 V to 30 V\n"

#endif

/*
 * junction.h: what all pn junctions share outside their equation: temperature, limits, start.
 */
#ifndef DEVICES_JUNCTION_H
#define DEVICES_JUNCTION_H

/*
 * junction_growth: saturation current at `kelvin` over that at `measured`.
 *
 *   (T/T0)^(exponent/emission) exp( bandgap/(emission UT(T)) (T/T0 - 1) )
 *
 * bandgap in V. Sze, Physics of Semiconductor Devices, diffusion current of a junction.
 */
double junction_growth(double kelvin, double measured, double emission, double bandgap,
                       double exponent);

/*
 * junction_share: how much of a step dv a junction at v can bear, 0 < share <= 1.
 *
 * saturation  A;  thermal  n kT/q, V
 *
 * Above the critical voltage of Nagel (1975, appendix 2) and McCalla (1988, section 2.4), thermal
 * ln(thermal/(saturation sqrt 2)), a step up is cut to what raises the current as much as the
 * linearisation says.
 */
double junction_share(double v, double dv, double saturation, double thermal);

/* The forward voltage at `current`, V. */
double junction_voltage(double current, double saturation, double thermal);

#endif

/*
 * junction.c: temperature, step limit and typical voltage of a pn junction.
 */
#include "devices/junction.h"

#include <math.h>

#include "devices/device.h"

double junction_growth(double kelvin, double measured, double emission, double bandgap,
                       double exponent)
{
    double ratio = kelvin / measured;
    double thermal = emission * BOLTZMANN_OVER_CHARGE * kelvin;
    return pow(ratio, exponent / emission) * exp(bandgap / thermal * (ratio - 1));
}

double junction_share(double v, double dv, double saturation, double thermal)
{
    double critical = thermal * log(thermal / (saturation * sqrt(2.0)));
    double wanted = v + dv;
    if (!(wanted > critical) || !(dv > 2 * thermal)) {
        return 1;
    }
    double limited = fmax(critical, v + thermal * log1p(dv / thermal));
    double share = (limited - v) / dv;
    return share < 1 ? share : 1;
}

double junction_voltage(double current, double saturation, double thermal)
{
    return thermal * log1p(current / saturation);
}

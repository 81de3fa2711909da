/* mos_parameters.c: the parameters that a MOS fit looks for, and the ranges they are looked for in.
 *
 * Ranges are wide enough for any silicon process between 50 nm and several micrometres; `held` is a
 * usual value, so that a model remains complete where the data are silent. */
#include <math.h>

#include "calibrate/mos_fit.h"

#define NONE 0

const struct sought mos_sought[] = {
    {"threshold", {-2, 4, false}, 0.5, NAN, INFINITY, NONE},
    {"kprime", {1e-7, 1e-2, true}, 3e-4, NAN, INFINITY, NONE},
    {"body_effect", {0.01, 2, false}, 0.4, 0.4, 0.15, NEED_BODY},
    {"phi", {0.4, 1.2, false}, 0.8, NAN, 0.2, NEED_BODY},
    {"slope_factor", {0.8, 3, false}, 1.2, NAN, 0.3, NONE},
    {"mobility_bulk", {0, 5, false}, 0.4, NAN, 1, NONE},
    {"mobility_gate", {0, 5, false}, 0.3, NAN, 0.5, NONE},
    {"mobility_gate_short", {0, 3, false}, 0.1, NAN, 0.2, NEED_SET | NEED_LENGTHS},
    {"critical_field", {1e6, 1e9, true}, 8e6, 1e7, 0.5, NONE},
    {"saturation_knee", {0.5, 1, false}, 0.85, 0.9, 0.15, NEED_DRAIN},
    {"early", {0.05, 2000, true}, 10, NAN, 0.5, NEED_DRAIN},
    {"early_exponent", {0, 1.5, false}, 0.5, 0.5, 0.3, NEED_SET | NEED_DRAIN | NEED_LENGTHS},
    {"early_onset", {0.01, 5, true}, 0.1, NAN, 1, NEED_DRAIN},
    {"dibl", {0, 0.3, false}, 0.005, NAN, 0.02, NEED_DRAIN},
    {"dibl_short", {0, 0.3, false}, 0.02, NAN, 0.02, NEED_SET | NEED_DRAIN | NEED_SHORT},
    {"dibl_body", {-0.6, 3, false}, 0.2, NAN, 0.4, NEED_DRAIN | NEED_BODY},
    {"width_offset", {-100e-9, 200e-9, false}, 1e-9, NAN, 50e-9, NEED_SET | NEED_WIDTHS},
    {"halo_threshold", {-0.3, 0.5, false}, 0.05, NAN, 0.05, NEED_SET | NEED_LENGTHS},
    {"halo_body", {-1, 2, false}, 0.1, NAN, 0.1, NEED_SET | NEED_LENGTHS | NEED_BODY},
    {"halo_length", {100e-9, 100e-6, true}, 2e-6, 2e-6, 1, NEED_SET | NEED_SHAPE},
    {"narrow_threshold", {-0.2, 0.2, false}, 0.001, NAN, 0.02, NEED_SET | NEED_WIDTHS},
    {"narrow_body", {-0.2, 0.2, false}, 0.01, NAN, 0.05, NEED_SET | NEED_WIDTHS | NEED_BODY},
    {"narrow_slope", {-0.1, 1, false}, 0.01, NAN, 0.1, NEED_SET | NEED_WIDTHS},
    {"narrow_slope_length",
     {0, 20e-6, false},
     1e-6,
     1e-6,
     1e-6,
     NEED_SET | NEED_WIDTHS | NEED_SHAPE},
    {"threshold_tempco", {-10e-3, 5e-3, false}, -1e-3, NAN, 1e-3, NEED_TEMPERATURES},
    {"mobility_exponent", {-1, 4, false}, 1.5, NAN, 0.5, NEED_TEMPERATURES},
};

const int mos_sought_count = (int)(sizeof mos_sought / sizeof mos_sought[0]);

/*
 * What a scalable set keeps near a usual value as far as its devices leave it open: halos of 130 nm
 * processes reach a few tenths of a micrometre to some micrometres, drawn and effective width
 * differ by some 20 nm. Few geometries tell such values; without this the rest of the set follows
 * the mismatch of single devices (Hoerl and Kennard, Technometrics 12 (1970) 55).
 */
const struct usual mos_usual[] = {
    {"halo_length", 2e-6, 0.5, true},
    {"width_offset", 0, 20e-9, false},
    {"narrow_body", 0, 0.03, false},
    {"narrow_slope_length", 1e-6, 0.5e-6, false},
};

const int mos_usual_count = (int)(sizeof mos_usual / sizeof mos_usual[0]);

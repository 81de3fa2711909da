/*
 * mos.c: tables and preparation of the MOS transistor, with a model and as hand transistor.
 * The equations stand in mos_current.c.
 */
#include "devices/mos.h"

#include <string.h>

#include "devices/junction.h"
#include "devices/types.h"

enum { OWN_W, OWN_L, OWN_M, OWN_THRESHOLD_SHIFT, OWN_GAIN_SHIFT };

static const struct parameter own_parameters[] = {
    [OWN_W] = {"W", UNIT_METRE, DEFAULT_REQUIRED, 0, 0, 10e-3, true, "drawn width"},
    [OWN_L] = {"L", UNIT_METRE, DEFAULT_REQUIRED, 0, 0, 10e-3, true, "drawn length"},
    [OWN_M] = {"m", UNIT_NONE, DEFAULT_VALUE, 1, 0, INFINITY, true, "equal devices in parallel"},
    [OWN_THRESHOLD_SHIFT] = {"threshold_shift", UNIT_VOLT, DEFAULT_HIDDEN, 0, -INFINITY, INFINITY,
                             false, "deviate added to the threshold"},
    [OWN_GAIN_SHIFT] = {"gain_shift", UNIT_NONE, DEFAULT_HIDDEN, 0, -INFINITY, INFINITY, false,
                        "relative deviate of the gain"},
};

enum {
    HAND_CONDUCTION,
    HAND_THRESHOLD,
    HAND_EARLY,
    HAND_SLOPE,
    HAND_M,
    HAND_THRESHOLD_SHIFT,
    HAND_GAIN_SHIFT
};

static const struct parameter hand_parameters[] = {
    [HAND_CONDUCTION] = {"conduction", UNIT_AMPERE_PER_VOLT_SQUARED, DEFAULT_REQUIRED, 0, 0,
                         INFINITY, true, "saturated current over overdrive squared"},
    [HAND_THRESHOLD] = {"threshold", UNIT_VOLT, DEFAULT_REQUIRED, 0, -INFINITY, INFINITY, false,
                        "threshold voltage, positive for an enhancement device"},
    [HAND_EARLY] = {"early", UNIT_VOLT, DEFAULT_NONE, 0, 0, INFINITY, true, "Early voltage"},
    [HAND_SLOPE] = {"slope", UNIT_NONE, DEFAULT_VALUE, 1.3, 0, INFINITY, true,
                    "weak-inversion slope over kT/q ln 10 per decade"},
    [HAND_M] = {"m", UNIT_NONE, DEFAULT_VALUE, 1, 0, INFINITY, true, "equal devices in parallel"},
    [HAND_THRESHOLD_SHIFT] = {"threshold_shift", UNIT_VOLT, DEFAULT_HIDDEN, 0, -INFINITY, INFINITY,
                              false, "deviate added to the threshold"},
    [HAND_GAIN_SHIFT] = {"gain_shift", UNIT_NONE, DEFAULT_HIDDEN, 0, -INFINITY, INFINITY, false,
                         "relative deviate of the gain"},
};

enum {
    MODEL_THRESHOLD,
    MODEL_KPRIME,
    MODEL_BODY_EFFECT,
    MODEL_PHI,
    MODEL_SLOPE_FACTOR,
    MODEL_MOBILITY_BULK,
    MODEL_MOBILITY_GATE,
    MODEL_MOBILITY_GATE_SHORT,
    MODEL_CRITICAL_FIELD,
    MODEL_SATURATION_KNEE,
    MODEL_EARLY,
    MODEL_EARLY_EXPONENT,
    MODEL_EARLY_ONSET,
    MODEL_DIBL,
    MODEL_DIBL_SHORT,
    MODEL_SHORT_LENGTH,
    MODEL_SHORT_DECAY,
    MODEL_DIBL_BODY,
    MODEL_LENGTH_OFFSET,
    MODEL_WIDTH_OFFSET,
    MODEL_HALO_THRESHOLD,
    MODEL_HALO_BODY,
    MODEL_HALO_LENGTH,
    MODEL_NARROW_THRESHOLD,
    MODEL_NARROW_BODY,
    MODEL_NARROW_SLOPE,
    MODEL_NARROW_SLOPE_LENGTH,
    MODEL_THRESHOLD_TEMPCO,
    MODEL_MOBILITY_EXPONENT,
    MODEL_JUNCTION_LEAK,
    MODEL_MATCH_THRESHOLD,
    MODEL_MATCH_GAIN
};

static const struct parameter model_parameters[] = {
    [MODEL_THRESHOLD] = {"threshold", UNIT_VOLT, DEFAULT_REQUIRED, 0, -INFINITY, INFINITY, false,
                         "long-channel threshold, positive for an enhancement device"},
    [MODEL_KPRIME] = {"kprime", UNIT_AMPERE_PER_VOLT_SQUARED, DEFAULT_REQUIRED, 0, 0, INFINITY,
                      true, "mobility times oxide capacitance"},
    [MODEL_BODY_EFFECT] = {"body_effect", UNIT_ROOT_VOLT, DEFAULT_VALUE, 0, 0, INFINITY, false,
                           "body-effect coefficient gamma"},
    [MODEL_PHI] = {"phi", UNIT_VOLT, DEFAULT_VALUE, 0.8, 0, INFINITY, true,
                   "surface potential in strong inversion"},
    [MODEL_SLOPE_FACTOR] = {"slope_factor", UNIT_NONE, DEFAULT_VALUE, 1, 0, INFINITY, true,
                            "widens the way from weak to strong inversion"},
    [MODEL_MOBILITY_BULK] = {"mobility_bulk", UNIT_PER_VOLT, DEFAULT_VALUE, 0, 0, INFINITY, false,
                             "mobility reduction by the depletion charge"},
    [MODEL_MOBILITY_GATE] = {"mobility_gate", UNIT_PER_VOLT, DEFAULT_VALUE, 0, 0, INFINITY, false,
                             "mobility reduction by the inversion charge"},
    [MODEL_MOBILITY_GATE_SHORT] = {"mobility_gate_short", UNIT_PER_VOLT, DEFAULT_VALUE, 0, 0,
                                   INFINITY, false, "its part that grows as 1um/L"},
    [MODEL_CRITICAL_FIELD] = {"critical_field", UNIT_VOLT_PER_METRE, DEFAULT_NONE, 0, 0, INFINITY,
                              true, "field of velocity saturation"},
    [MODEL_SATURATION_KNEE] = {"saturation_knee", UNIT_NONE, DEFAULT_VALUE, 1, 0, 1, true,
                               "where modulation sets in, as a share of vdsat"},
    [MODEL_EARLY] = {"early", UNIT_VOLT, DEFAULT_NONE, 0, 0, INFINITY, true,
                     "Early voltage of a channel of 1 um"},
    [MODEL_EARLY_EXPONENT] = {"early_exponent", UNIT_NONE, DEFAULT_VALUE, 1, -INFINITY, INFINITY,
                              false, "power of L that the Early voltage follows"},
    [MODEL_EARLY_ONSET] = {"early_onset", UNIT_VOLT, DEFAULT_NONE, 0, 0, INFINITY, true,
                           "voltage beyond the knee from which modulation goes as a logarithm"},
    [MODEL_DIBL] = {"dibl", UNIT_NONE, DEFAULT_VALUE, 0, 0, INFINITY, false,
                    "drain-induced barrier lowering at 1 um, falls as 1/sqrt(L)"},
    [MODEL_DIBL_SHORT] = {"dibl_short", UNIT_NONE, DEFAULT_VALUE, 0, 0, INFINITY, false,
                          "its short-channel part at short_length"},
    [MODEL_SHORT_LENGTH] = {"short_length", UNIT_METRE, DEFAULT_VALUE, 150e-9, 0, INFINITY, true,
                            "length at which dibl_short holds"},
    [MODEL_SHORT_DECAY] = {"short_decay", UNIT_METRE, DEFAULT_VALUE, 24e-9, 0, INFINITY, true,
                           "length over which dibl_short falls to 1/e"},
    [MODEL_DIBL_BODY] = {"dibl_body", UNIT_PER_VOLT, DEFAULT_VALUE, 0, -INFINITY, INFINITY, false,
                         "growth of barrier lowering with body bias"},
    [MODEL_LENGTH_OFFSET] = {"length_offset", UNIT_METRE, DEFAULT_VALUE, 0, -INFINITY, INFINITY,
                             false, "drawn minus effective length"},
    [MODEL_WIDTH_OFFSET] = {"width_offset", UNIT_METRE, DEFAULT_VALUE, 0, -INFINITY, INFINITY,
                            false, "drawn minus effective width"},
    [MODEL_HALO_THRESHOLD] = {"halo_threshold", UNIT_VOLT, DEFAULT_VALUE, 0, -INFINITY, INFINITY,
                              false, "threshold rise at 1 um, falls as 1/sqrt(L)"},
    [MODEL_HALO_BODY] = {"halo_body", UNIT_NONE, DEFAULT_VALUE, 0, -INFINITY, INFINITY, false,
                         "relative fall of body effect at 1 um, falls as 1/sqrt(L)"},
    [MODEL_HALO_LENGTH] = {"halo_length", UNIT_METRE, DEFAULT_NONE, 0, 0, INFINITY, true,
                           "length beyond which the halo terms fall as 1/L"},
    [MODEL_NARROW_THRESHOLD] = {"narrow_threshold", UNIT_VOLT, DEFAULT_VALUE, 0, -INFINITY,
                                INFINITY, false, "threshold rise at W = 1 um, falls as 1/W"},
    [MODEL_NARROW_BODY] = {"narrow_body", UNIT_NONE, DEFAULT_VALUE, 0, -INFINITY, INFINITY, false,
                           "relative fall of body effect at W = 1 um, falls as 1/W"},
    [MODEL_NARROW_SLOPE] = {"narrow_slope", UNIT_NONE, DEFAULT_VALUE, 0, -INFINITY, INFINITY, false,
                            "relative rise of slope_factor at W = 1 um, falls as 1/W"},
    [MODEL_NARROW_SLOPE_LENGTH] = {"narrow_slope_length", UNIT_METRE, DEFAULT_VALUE, 0, 0, INFINITY,
                                   false, "length below which narrow_slope fades"},
    [MODEL_THRESHOLD_TEMPCO] = {"threshold_tempco", UNIT_VOLT_PER_KELVIN, DEFAULT_VALUE, -1e-3,
                                -INFINITY, INFINITY, false, "threshold change per kelvin"},
    [MODEL_MOBILITY_EXPONENT] = {"mobility_exponent", UNIT_NONE, DEFAULT_VALUE, 1.5, -INFINITY,
                                 INFINITY, false, "kprime falls with this power of temperature"},
    [MODEL_JUNCTION_LEAK] = {"junction_leak", UNIT_AMPERE_PER_METRE, DEFAULT_VALUE, 0, 0, INFINITY,
                             false, "saturation current of a body junction over W"},
    [MODEL_MATCH_THRESHOLD] = {"match_threshold", UNIT_VOLT_METRE, DEFAULT_VALUE, 0, 0, INFINITY,
                               false, "sigma of a pair's threshold difference times sqrt(W L)"},
    [MODEL_MATCH_GAIN] = {"match_gain", UNIT_METRE, DEFAULT_VALUE, 0, 0, INFINITY, false,
                          "sigma of a pair's relative gain difference times sqrt(W L)"},
};

static const struct terminal terminals[] = {
    {"d", "drain", false, NULL},
    {"g", "gate", false, NULL},
    {"s", "source", false, NULL},
    {"b", "bulk", true, NULL},
};

enum {
    ROW_ID,
    ROW_VGS,
    ROW_VDS,
    ROW_VBS,
    ROW_VTH,
    ROW_OVERDRIVE,
    ROW_INVERSION,
    ROW_VDSAT,
    ROW_HEADROOM,
    ROW_GM,
    ROW_GDS,
    ROW_GMB,
    ROW_RO,
    ROW_GM_ID,
    ROW_POWER
};

static const struct quantity_row quantities[] = {
    [ROW_ID] = {"id", UNIT_AMPERE, "drain current"},
    [ROW_VGS] = {"vgs", UNIT_VOLT, "gate-source voltage"},
    [ROW_VDS] = {"vds", UNIT_VOLT, "drain-source voltage"},
    [ROW_VBS] = {"vbs", UNIT_VOLT, "bulk-source voltage"},
    [ROW_VTH] = {"vth", UNIT_VOLT, "threshold voltage at this bias"},
    [ROW_OVERDRIVE] = {"overdrive", UNIT_VOLT, "vgs minus vth"},
    [ROW_INVERSION] = {"inversion", UNIT_NONE, "inversion coefficient"},
    [ROW_VDSAT] = {"vdsat", UNIT_VOLT, "saturation voltage"},
    [ROW_HEADROOM] = {"headroom", UNIT_VOLT, "vds minus vdsat"},
    [ROW_GM] = {"gm", UNIT_SIEMENS, "transconductance from the gate"},
    [ROW_GDS] = {"gds", UNIT_SIEMENS, "output conductance"},
    [ROW_GMB] = {"gmb", UNIT_SIEMENS, "transconductance from the bulk"},
    [ROW_RO] = {"ro", UNIT_OHM, "output resistance, 1/gds"},
    [ROW_GM_ID] = {"gm_id", UNIT_PER_VOLT, "gm over id"},
    [ROW_POWER] = {"power", UNIT_WATT, "dissipated power"},
};

static const bool pattern[MOS_TERMINALS * MOS_TERMINALS] = {
    true,  true,  true,  true,  /* drain */
    false, false, false, false, /* gate */
    true,  true,  true,  true,  /* source */
    true,  false, true,  true,  /* bulk: its junctions */
};

static const uint32_t paths[MOS_TERMINALS] = {1, 0, 1, 0};

/* Lengths of a model as this transistor has them. */
struct geometry {
    double length, width; /* m */
    double h;             /* sqrt(1 um/length) */
    double halo;          /* how halo terms go with length; 0 where they are off */
    double narrow;        /* 1 um/width; 0 where narrow terms are off */
    double narrow_slope;  /* how narrow_slope goes with both */
};

/*
 * Doping that piles up at both ends of the channel weighs more the shorter it is: as sqrt(1 + P/L)
 * - 1 (Cheng and others, IEEE Trans. Electron Devices 44 (1997) 277), here over sqrt(P/1 um), so
 * that without P it is sqrt(1 um/L), which it comes to where L is far below P.
 */
static double halo_shape(double length, double pile)
{
    double h = sqrt(1e-6 / length);
    /* (sqrt(1 + P/L) - 1)/sqrt(P/1 um) without cancellation */
    return isnan(pile) ? h : h / (sqrt(1 + length / pile) + sqrt(length / pile));
}

static struct geometry geometry_of(const struct device_values *values, bool with_offsets)
{
    const double *model = values->model;
    struct geometry it = {values->own[OWN_L], values->own[OWN_W], 0, 0, 0, 0};
    if (with_offsets) {
        it.length -= model[MODEL_LENGTH_OFFSET];
        it.width -= model[MODEL_WIDTH_OFFSET];
    }
    it.h = sqrt(1e-6 / it.length);
    if (with_offsets) {
        it.halo = halo_shape(it.length, model[MODEL_HALO_LENGTH]);
        it.narrow = 1e-6 / it.width;
        it.narrow_slope = it.narrow / (1 + model[MODEL_NARROW_SLOPE_LENGTH] / it.length);
    }
    return it;
}

/* What body_effect and slope_factor are multiplied with. */
static double body_share(const double *model, const struct geometry *it)
{
    return 1 - model[MODEL_HALO_BODY] * it->halo - model[MODEL_NARROW_BODY] * it->narrow;
}

static double slope_share(const double *model, const struct geometry *it)
{
    return 1 + model[MODEL_NARROW_SLOPE] * it->narrow_slope;
}

static const char *check(const struct device_values *values)
{
    struct geometry it = geometry_of(values, true);
    if (!(it.length > 0)) {
        return "L must be larger than the length_offset of the model";
    }
    if (!(it.width > 0)) {
        return "W must be larger than the width_offset of the model";
    }
    if (!(values->model[MODEL_HALO_BODY] * it.halo <= 1)) {
        return "at this L the halo_body of the model makes its body effect negative";
    }
    if (!(body_share(values->model, &it) >= 0)) {
        return "at this W and L halo_body and narrow_body of the model make its body effect "
               "negative";
    }
    if (!(slope_share(values->model, &it) > 0)) {
        return "at this W and L the narrow_slope of the model makes its slope_factor negative";
    }
    return NULL;
}

static void prepare_threshold(const struct device_values *values, unsigned effects,
                              const struct geometry *it, double kelvin, double measured,
                              struct mos_prepared *p)
{
    const double *model = values->model;
    p->vt = model[MODEL_THRESHOLD] + model[MODEL_THRESHOLD_TEMPCO] * (kelvin - measured) +
            values->own[OWN_THRESHOLD_SHIFT] + model[MODEL_HALO_THRESHOLD] * it->halo +
            model[MODEL_NARROW_THRESHOLD] * it->narrow;
    p->phi = model[MODEL_PHI];
    p->root_phi = sqrt(p->phi);
    if ((effects & EFFECT_BODY) != 0) {
        p->g = model[MODEL_BODY_EFFECT] * body_share(model, it);
    }
    if ((effects & EFFECT_BARRIER) != 0) {
        p->sigma = model[MODEL_DIBL] * it->h +
                   model[MODEL_DIBL_SHORT] *
                       exp(-(it->length - model[MODEL_SHORT_LENGTH]) / model[MODEL_SHORT_DECAY]);
        p->dibl_body = model[MODEL_DIBL_BODY];
    }
}

static void prepare_channel(const struct device_values *values, unsigned effects,
                            const struct geometry *it, double kelvin, double measured,
                            struct mos_prepared *p)
{
    const double *model = values->model;
    p->beta = values->own[OWN_M] * model[MODEL_KPRIME] *
              pow(kelvin / measured, -model[MODEL_MOBILITY_EXPONENT]) * it->width / it->length *
              device_share(values->own[OWN_GAIN_SHIFT]);
    p->knee = model[MODEL_SATURATION_KNEE];
    p->knee_share = 1;
    if ((effects & EFFECT_MOBILITY) != 0) {
        if (!isnan(model[MODEL_CRITICAL_FIELD])) {
            p->lam = 2 * p->U / (model[MODEL_CRITICAL_FIELD] * it->length);
        }
        p->bulk_mobility = model[MODEL_MOBILITY_BULK] * p->g;
        p->gate_mobility =
            model[MODEL_MOBILITY_GATE] + model[MODEL_MOBILITY_GATE_SHORT] * (1e-6 / it->length);
    }
    if ((effects & EFFECT_MODULATION) != 0 && !isnan(model[MODEL_EARLY])) {
        p->inverse_early =
            1 / (model[MODEL_EARLY] * pow(it->length / 1e-6, model[MODEL_EARLY_EXPONENT]));
        p->early_onset = isnan(model[MODEL_EARLY_ONSET]) ? 0 : model[MODEL_EARLY_ONSET];
    }
}

static void prepare(const struct device_values *values, const struct device_conditions *conditions,
                    void *prepared, double polarity)
{
    struct mos_prepared *p = prepared;
    memset(p, 0, sizeof *p);
    unsigned effects = conditions->effects;
    double kelvin = device_kelvin(conditions);
    double measured = conditions->measured_kelvin;
    double thermal = BOLTZMANN_OVER_CHARGE * kelvin;
    struct geometry it = geometry_of(values, (effects & EFFECT_GEOMETRY) != 0);
    p->polarity = polarity;
    p->U = values->model[MODEL_SLOPE_FACTOR] * slope_share(values->model, &it) * thermal;
    p->four_ut = 4 * thermal;
    p->w = (effects & EFFECT_INVERSION) != 0 ? 1 - conditions->inversion_cut : 0;
    prepare_threshold(values, effects, &it, kelvin, measured, p);
    prepare_channel(values, effects, &it, kelvin, measured, p);
    if ((effects & EFFECT_LEAKAGE) != 0) {
        p->junction_current = values->model[MODEL_JUNCTION_LEAK] * values->own[OWN_W] *
                              values->own[OWN_M] * junction_growth(kelvin, measured, 1, 1.12, 3);
    }
    p->junction_ut = thermal;
}

static void prepare_n(const struct device_values *values,
                      const struct device_conditions *conditions, void *prepared)
{
    prepare(values, conditions, prepared, 1);
}

static void prepare_p(const struct device_values *values,
                      const struct device_conditions *conditions, void *prepared)
{
    prepare(values, conditions, prepared, -1);
}

/* The square law of a paper design; with EFFECT_INVERSION the same current in strong inversion
 * from the equations for all levels, beta = 2 K. */
static void prepare_hand(const struct device_values *values,
                         const struct device_conditions *conditions, void *prepared,
                         double polarity)
{
    struct mos_prepared *p = prepared;
    memset(p, 0, sizeof *p);
    const double *own = values->own;
    double thermal = BOLTZMANN_OVER_CHARGE * device_kelvin(conditions);
    p->polarity = polarity;
    p->U = own[HAND_SLOPE] * thermal;
    p->four_ut = 4 * thermal;
    p->w = (conditions->effects & EFFECT_INVERSION) != 0 ? 1 - conditions->inversion_cut : 0;
    p->vt = own[HAND_THRESHOLD] + own[HAND_THRESHOLD_SHIFT];
    p->beta = 2 * own[HAND_CONDUCTION] * own[HAND_M] * device_share(own[HAND_GAIN_SHIFT]);
    p->knee = 1;
    if ((conditions->effects & EFFECT_MODULATION) != 0 && !isnan(own[HAND_EARLY])) {
        p->inverse_early = 1 / own[HAND_EARLY];
    }
    p->junction_ut = thermal;
}

static void prepare_hand_n(const struct device_values *values,
                           const struct device_conditions *conditions, void *prepared)
{
    prepare_hand(values, conditions, prepared, 1);
}

static void prepare_hand_p(const struct device_values *values,
                           const struct device_conditions *conditions, void *prepared)
{
    prepare_hand(values, conditions, prepared, -1);
}

/* Weak below 0.1, strong above 10: Enz and Vittoz (2006). Off: a hundred-millionth of the
 * specific current and less. */
static unsigned region_of(const struct mos_prepared *p, const struct mos_inspection *it, double vds)
{
    if (!(it->inversion >= 1e-8) || (p->w <= 0 && !(it->overdrive > 0))) {
        return REGION_OFF;
    }
    unsigned level = it->inversion < 0.1  ? REGION_WEAK
                     : it->inversion > 10 ? REGION_STRONG
                                          : REGION_MODERATE;
    if (vds < 0) {
        return level | REGION_REVERSED;
    }
    return level | (vds >= it->vdsat ? REGION_SATURATED : REGION_TRIODE);
}

static unsigned describe(const void *prepared, const double *outer, const double *inner, double *q)
{
    const struct mos_prepared *p = prepared;
    double f[MOS_TERMINALS], jac[MOS_TERMINALS * MOS_TERMINALS];
    struct mos_inspection it;
    mos_evaluate(p, inner, f, jac);
    mos_inspect(p, inner, &it);
    q[ROW_ID] = p->polarity * f[MOS_D];
    q[ROW_VGS] = p->polarity * (outer[MOS_G] - outer[MOS_S]);
    q[ROW_VDS] = p->polarity * (outer[MOS_D] - outer[MOS_S]);
    q[ROW_VBS] = p->polarity * (outer[MOS_B] - outer[MOS_S]);
    q[ROW_VTH] = it.vth;
    q[ROW_OVERDRIVE] = it.overdrive;
    q[ROW_INVERSION] = it.inversion;
    q[ROW_VDSAT] = it.vdsat;
    q[ROW_HEADROOM] = q[ROW_VDS] - it.vdsat;
    q[ROW_GM] = jac[MOS_TERMINALS * MOS_D + MOS_G];
    q[ROW_GDS] = jac[MOS_TERMINALS * MOS_D + MOS_D];
    q[ROW_GMB] = jac[MOS_TERMINALS * MOS_D + MOS_B];
    q[ROW_RO] = q[ROW_GDS] > 0 || q[ROW_GDS] < 0 ? 1 / q[ROW_GDS] : NAN;
    q[ROW_GM_ID] = q[ROW_ID] > 0 || q[ROW_ID] < 0 ? q[ROW_GM] / q[ROW_ID] : NAN;
    q[ROW_POWER] = 0;
    for (int k = 0; k < MOS_TERMINALS; k++) {
        q[ROW_POWER] += (outer[k] - outer[MOS_S]) * f[k];
    }
    return region_of(p, &it, q[ROW_VDS]);
}

/* A gate step that raises the channel charge is held to 1 V and a logarithm of what is beyond;
 * the drain needs no limit, the current saturates there. A bulk junction has its own limit. */
static double longest_step(const void *prepared, const double *x, const double *dx)
{
    const struct mos_prepared *p = prepared;
    double share = 1;
    for (int end = MOS_D; end <= MOS_S; end += MOS_S - MOS_D) {
        double step = p->polarity * (dx[MOS_G] - dx[end]);
        if (step > 1) {
            share = fmin(share, (1 + log(step)) / step);
        }
        if (p->junction_current > 0) {
            share = fmin(share, junction_share(p->polarity * (x[MOS_B] - x[end]),
                                               p->polarity * (dx[MOS_B] - dx[end]),
                                               p->junction_current, p->junction_ut));
        }
    }
    return share;
}

/* A moderate overdrive of 0.15 V. */
static bool typical(const void *prepared, int *high, int *low, double *volts)
{
    const struct mos_prepared *p = prepared;
    *high = p->polarity > 0 ? MOS_G : MOS_S;
    *low = p->polarity > 0 ? MOS_S : MOS_G;
    *volts = p->vt + 0.2;
    return true;
}

/* Two like devices differ by the coefficient over sqrt(W L); one carries its share 1/sqrt(2).
 * Pelgrom, Duinmaijer and Welbers (1989). */
static double deviate_of(const struct device_values *values, int coefficient)
{
    const double *own = values->own;
    return values->model[coefficient] / sqrt(2 * own[OWN_W] * own[OWN_L] * own[OWN_M]);
}

static double threshold_sigma(const struct device_values *values)
{
    return deviate_of(values, MODEL_MATCH_THRESHOLD);
}

static double gain_sigma(const struct device_values *values)
{
    return deviate_of(values, MODEL_MATCH_GAIN);
}

static const struct deviate deviates[] = {
    [MOS_MOVED_VT] = {"threshold", OWN_THRESHOLD_SHIFT, threshold_sigma, DEVIATE_ADDS,
                      offsetof(struct mos_prepared, vt)},
    [MOS_MOVED_BETA] = {"gain", OWN_GAIN_SHIFT, gain_sigma, DEVIATE_SCALES,
                        offsetof(struct mos_prepared, beta)},
};

#define MOS_COMMON                                                                                 \
    .form = FORM_PINS, .is_transistor = true, .terminals = terminals,                              \
    .terminal_count = MOS_TERMINALS, .value_parameter = -1, .quantities = quantities,              \
    .quantity_count = ROWS(quantities), .quantity_current = ROW_ID,                                \
    .quantity_headroom = ROW_HEADROOM, .quantity_power = ROW_POWER,                                \
    .prepared_size = sizeof(struct mos_prepared), .evaluate = mos_evaluate,                        \
    .evaluate_extended = mos_evaluate_extended, .describe = describe,                              \
    .longest_step = longest_step, .typical = typical, .pattern = pattern, .paths = paths

#define MOS_WITH_MODEL                                                                             \
    MOS_COMMON, .parameters = own_parameters, .parameter_count = ROWS(own_parameters),             \
                .model_parameters = model_parameters,                                              \
                .model_parameter_count = ROWS(model_parameters), .deviates = deviates,             \
                .deviate_count = ROWS(deviates), .check = check, .alternative_key = "conduction"

#define MOS_HAND MOS_COMMON, .parameters = hand_parameters, .parameter_count = ROWS(hand_parameters)

const struct device_type device_nmos = {
    MOS_WITH_MODEL,       .word = "nmos",       .summary = "n-channel MOS transistor",
    .polarity = 1,        .model_kind = "nmos", .alternative = &device_nmos_hand,
    .prepare = prepare_n,
};

const struct device_type device_pmos = {
    MOS_WITH_MODEL,       .word = "pmos",       .summary = "p-channel MOS transistor",
    .polarity = -1,       .model_kind = "pmos", .alternative = &device_pmos_hand,
    .prepare = prepare_p,
};

const struct device_type device_nmos_hand = {
    MOS_HAND,
    .word = "nmos",
    .summary = "n-channel transistor of a paper design, without process or geometry",
    .polarity = 1,
    .prepare = prepare_hand_n,
};

const struct device_type device_pmos_hand = {
    MOS_HAND,
    .word = "pmos",
    .summary = "p-channel transistor of a paper design, without process or geometry",
    .polarity = -1,
    .prepare = prepare_hand_p,
};

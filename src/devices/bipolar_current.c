/*
 * bipolar_current.c: bipolar transistor by integral charge control.
 *
 * Gummel and Poon, Bell System Technical Journal 49 (1970) 827; symbols as there:
 *
 *   IF, IR   forward and reverse transport current      qb   base charge relative to equilibrium
 *   q1       its part by the Early effect               q2   its part by high injection
 */
#include "devices/bipolar.h"

#include "devices/smooth.h"

/* A value with its derivatives in VBE and VBC. */
struct pair {
    real v, be, bc;
};

/* Below this 1 - VBC/V_A - VBE/V_B is near to punch-through: q1 = 1/(...) goes on as its tangent
 * (C1, positive and finite), untouched above. */
#define CHARGE_LEAST (REAL(0.05L))

/* q1 = 1/(1 - VBC/V_A - VBE/V_B) */
static struct pair early_charge(const struct bipolar_prepared *p, real vbe, real vbc)
{
    real a = REAL(p->per_early), b = REAL(p->per_early_reverse);
    real width = 1 - vbc * a - vbe * b;
    truth within = width >= CHARGE_LEAST;
    real inverse = 1 / width;
    real tangent = (2 * CHARGE_LEAST - width) / (CHARGE_LEAST * CHARGE_LEAST);
    real value = CHOOSE(within, inverse, tangent);
    real slope = CHOOSE(within, -inverse * inverse, -1 / (CHARGE_LEAST * CHARGE_LEAST));
    return (struct pair){value, -slope * b, -slope * a};
}

/* qb = (q1/2)(1 + sqrt(1 + 4 q2)) */
static struct pair base_charge(const struct bipolar_prepared *p, real vbe, real vbc, real IF,
                               real IF_slope, real IR, real IR_slope)
{
    struct pair q1 = early_charge(p, vbe, vbc);
    real slope;
    /* kept positive should a knee lie below the saturation current; 1e-20 off elsewhere */
    real inside = smooth_positive(1 + 4 * (IF * REAL(p->per_knee) + IR * REAL(p->per_knee_reverse)),
                                  REAL(1e-10L), &slope);
    real root = sqrt(inside);
    real share = (1 + root) / 2;
    real by_current = q1.v * slope / root; /* q1/2 times d sqrt(1 + 4 q2)/d q2 */
    return (struct pair){q1.v * share, q1.be * share + by_current * IF_slope * REAL(p->per_knee),
                         q1.bc * share + by_current * IR_slope * REAL(p->per_knee_reverse)};
}

/* coefficient (exp(v/thermal) - 1) */
static real junction(real coefficient, double thermal, real v, real *conductance)
{
    real slope;
    real value = coefficient * limited_expm1(v / REAL(thermal), &slope);
    *conductance = coefficient * slope / REAL(thermal);
    return value;
}

void REAL_NAME(bipolar_evaluate)(const void *prepared, const real *x, real *f, real *jac)
{
    const struct bipolar_prepared *p = prepared;
    real polarity = REAL(p->polarity);
    real vbe = polarity * (x[BIPOLAR_B] - x[BIPOLAR_E]);
    real vbc = polarity * (x[BIPOLAR_B] - x[BIPOLAR_C]);
    real IF_slope, IR_slope, leak_e_slope, leak_c_slope;
    real saturation = MOVED(p, BIPOLAR_SATURATION, saturation);
    real IF = junction(saturation, p->thermal_f, vbe, &IF_slope);
    real IR = junction(saturation, p->thermal_r, vbc, &IR_slope);
    real leak_e = junction(REAL(p->leak_emitter), p->leak_emitter_thermal, vbe, &leak_e_slope);
    real leak_c = junction(REAL(p->leak_collector), p->leak_collector_thermal, vbc, &leak_c_slope);
    struct pair qb = base_charge(p, vbe, vbc, IF, IF_slope, IR, IR_slope);

    real transport = (IF - IR) / qb.v;
    real collector_base = IR * REAL(p->per_beta_reverse) + leak_c;
    real collector_base_slope = IR_slope * REAL(p->per_beta_reverse) + leak_c_slope;
    real IC = transport - collector_base;
    real IC_be = (IF_slope - transport * qb.be) / qb.v;
    real IC_bc = (-IR_slope - transport * qb.bc) / qb.v - collector_base_slope;
    real IB = IF * REAL(p->per_beta) + leak_e + collector_base;
    real IB_be = IF_slope * REAL(p->per_beta) + leak_e_slope;
    real IB_bc = collector_base_slope;

    f[BIPOLAR_C] = polarity * IC;
    f[BIPOLAR_B] = polarity * IB;
    f[BIPOLAR_E] = -(f[BIPOLAR_C] + f[BIPOLAR_B]);
    real *c = jac, *b = jac + BIPOLAR_TERMINALS, *e = b + BIPOLAR_TERMINALS;
    c[BIPOLAR_C] = -IC_bc;
    c[BIPOLAR_B] = IC_be + IC_bc;
    c[BIPOLAR_E] = -IC_be;
    b[BIPOLAR_C] = -IB_bc;
    b[BIPOLAR_B] = IB_be + IB_bc;
    b[BIPOLAR_E] = -IB_be;
    for (int k = 0; k < BIPOLAR_TERMINALS; k++) {
        e[k] = -(c[k] + b[k]);
    }
}

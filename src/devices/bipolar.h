/*
 * bipolar.h: what bipolar.c prepares and bipolar_current.c evaluates. Private to devices/.
 */
#ifndef DEVICES_BIPOLAR_H
#define DEVICES_BIPOLAR_H

enum { BIPOLAR_C, BIPOLAR_B, BIPOLAR_E, BIPOLAR_TERMINALS };

/* Row of the deviate. */
enum { BIPOLAR_SATURATION };

/* Currents of the whole area. An effect that is off has its coefficient at 0. */
struct bipolar_prepared {
    double polarity;                                     /* +1 npn, -1 pnp */
    double saturation;                                   /* I_S, A */
    double thermal_f, thermal_r;                         /* n_F kT/q, n_R kT/q, V */
    double per_beta, per_beta_reverse;                   /* 1/beta */
    double per_early, per_early_reverse;                 /* 1/V_A, 1/V_B, 1/V */
    double per_knee, per_knee_reverse;                   /* 1/I_K, 1/I_KR, 1/A */
    double leak_emitter, leak_collector;                 /* A */
    double leak_emitter_thermal, leak_collector_thermal; /* V */
    double saturation_voltage;                           /* V, for the headroom */
};

void bipolar_evaluate(const void *prepared, const double *x, double *f, double *jac);
void bipolar_evaluate_extended(const void *prepared, const long double *x, long double *f,
                               long double *jac);

#endif

/*
 * mos.h: what mos.c prepares and mos_current.c evaluates. Private to devices/.
 */
#ifndef DEVICES_MOS_H
#define DEVICES_MOS_H

enum { MOS_D, MOS_G, MOS_S, MOS_B, MOS_TERMINALS };

/* Rows of the deviates. */
enum { MOS_MOVED_VT, MOS_MOVED_BETA };

/* Constants of one transistor at one temperature under one set of effects. An effect that is off
 * has the value that removes its term. */
struct mos_prepared {
    double polarity;      /* +1 n-channel, -1 p-channel */
    double U;             /* slope_factor kT/q, V */
    double four_ut;       /* 4 kT/q, V */
    double w;             /* 1: all inversion levels; 0: the strong-inversion limit */
    double vt;            /* threshold without drain-induced lowering, V */
    double g;             /* body effect, sqrt(V); 0 off */
    double phi, root_phi; /* V, sqrt(V) */
    double sigma;         /* drain-induced barrier lowering, V/V */
    double dibl_body;     /* 1/V */
    double beta;          /* A/V^2 */
    double lam;           /* velocity saturation, 0 off */
    double knee;          /* saturation_knee */
    double bulk_mobility; /* mobility_bulk g, 1/sqrt(V) */
    double gate_mobility; /* ti, 1/V */
    double inverse_early; /* 1/V; 0 off */
    double early_onset;   /* V; 0: straight */
    double knee_share; /* 1: modulation counts from the knee; 0: from vds = 0 (hand transistor) */
    double junction_current, junction_ut; /* bulk diodes, A (0 off) and V */
};

/* Inner values of one bias, for the report. */
struct mos_inspection {
    double qs, qd;    /* charges at source and drain end */
    double inversion; /* qs^2 + qs */
    double vdsat;     /* V */
    double vth;       /* V */
    double overdrive; /* V, at the end with more charge */
};

void mos_evaluate(const void *prepared, const double *x, double *f, double *jac);
void mos_evaluate_extended(const void *prepared, const long double *x, long double *f,
                           long double *jac);

/* x: terminal voltages as evaluate sees them. */
void mos_inspect(const struct mos_prepared *p, const double *x, struct mos_inspection *out);

#endif

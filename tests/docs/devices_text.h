/*
 * devices_text.h: what the device tables do not say, for docs/devices.md: equations and sources.
 * Family by family, in the order of the page.
 */
#ifndef DOCS_DEVICES_TEXT_H
#define DOCS_DEVICES_TEXT_H

struct family {
    const char *word;   /* the device whose tables are printed */
    const char *mirror; /* the same reflected, or shares all tables; NULL: none */
    const char *heading;
    const char *text; /* Markdown */
};

static const struct family families[] = {
    {"nmos", "pmos", "MOS transistor",
     "Charge-based and continuous in all regions. Core: Enz, Krummenacher and Vittoz (1995) and "
     "the\n"
     "unified charge-control form of Cunha, Schneider and Galup-Montoro (1998). With voltages VG, "
     "VS, VD\n"
     "to the bulk, a = min(VS, VD), x = |VD - VS|, UT = kT/q, and\n"
     "S(x, e) = (x + sqrt(x^2 + 4 e^2))/2, a smooth max(x, 0):\n"
     "\n"
     "    Le = L - length_offset     We = W - width_offset     h = sqrt(1 um/Le)\n"
     "    H = (sqrt(1 + halo_length/Le) - 1)/sqrt(halo_length/1 um), without halo_length H = h\n"
     "    g = body_effect (1 - halo_body H - narrow_body (1 um/We))\n"
     "    U = slope_factor UT (1 + narrow_slope (1 um/We)/(1 + narrow_slope_length/Le))\n"
     "    sigma = dibl h + dibl_short exp(-(Le - short_length)/short_decay)\n"
     "    VA = early (Le/1 um)^early_exponent\n"
     "    beta = m kprime (T/T0)^-mobility_exponent We/Le\n"
     "    xs = sqrt(x^2 + (10 mV)^2) - 10 mV\n"
     "    vt = threshold + threshold_tempco (T - T0) + halo_threshold H\n"
     "         + narrow_threshold (1 um/We) - sigma xs S(1 + dibl_body a, 0.1)\n"
     "    y = S(VG - vt + phi + g sqrt(phi), 1 mV)     s = sqrt(y + g^2/4) - g/2\n"
     "    VP = s^2 - phi     sb = sqrt(s^2 + 4 UT)     n = 1 + g/(2 sb)     (g = 0: VP = VG - vt, "
     "n = 1)\n"
     "    2 q + ln q = v defines q = Q(v)     qs = Q((VP - a)/U)\n"
     "    lam = 2 U/(critical_field Le), 0 when there is none\n"
     "    A = 2 + lam + 2 lam qs     R = sqrt((2 + lam)^2 + 8 lam qs)\n"
     "    qx = 2 lam (qs^2 + qs)/(A + R)\n"
     "    Vx = U (2 (qs - qx) + ln((A + R)/(2 (lam (1 + qs) + 2 exp(-4)))))\n"
     "    xe = x/(1 + (x/(saturation_knee Vx))^12)^(1/12)\n"
     "    qd = Q((VP - a - x')/U), x' = xe where lam > 0, else x\n"
     "    mu = 1 + mobility_bulk g sb + (mobility_gate + mobility_gate_short 1 um/Le) n U (qs + "
     "qd)\n"
     "    M = 1 + (x - xe)/VA, or with early_onset 1 + (early_onset/VA) ln(1 + (x - "
     "xe)/early_onset)\n"
     "    ID = 2 n beta U^2 (qs^2 + qs - qd^2 - qd) M/(mu (1 + lam (qs - qd)))\n"
     "\n"
     "Exchanging drain and source exchanges the sign exactly. `inversion` is qs^2 + qs at the end "
     "with more\n"
     "charge (weak below 0.1, strong above 10: Enz and Vittoz 2006); `vdsat` is Vx, which without "
     "velocity\n"
     "saturation is U (2 sqrt(inversion + 1/4) + 3) (Enz and Vittoz), in the hand view the "
     "overdrive; `vth`\n"
     "is the gate-source voltage at which VP = a. With `junction_leak`, two junctions from the "
     "bulk to source\n"
     "and drain. Hand view: q = max(v, 0)/2 and q^2 for q^2 + q, which is the square law\n"
     "kprime W/(2 L) (vgs - threshold)^2 exactly.\n"
     "\n"
     "The extensions were chosen on measured transistors of an open 130 nm process "
     "(`models/open130.process`\n"
     "says which): one geometry at a time 0.8 to 2.8 % rms error of the drain current in "
     "saturation\n"
     "(p-channel of 0.15 um: 3.6 to 4.9 %). Left out: gate current, charge and noise, impact "
     "ionisation,\n"
     "self-heating, drain-side leakage other than the junctions.\n"},
    {"nmos hand", "pmos hand", "Hand transistor",
     "The transistor of a paper design: `nmos` or `pmos` with `conduction` instead of W and L. "
     "Hand view:\n"
     "I = conduction (vgs - threshold)^2 saturated, conduction (2 (vgs - threshold) vds - vds^2) "
     "in triode\n"
     "(Shichman and Hodges 1968). Full view: the equations above with beta = 2 conduction, no body "
     "effect and\n"
     "slope_factor = `slope`, so that both agree in strong inversion; a slope that was assumed "
     "earns a\n"
     "caution. `early` multiplies by 1 + vds/early in both views.\n"},
    {"diode", NULL, "Diode",
     "    I = area m (I_S (exp(V/(n UT)) - 1) - I_Z exp(-(V_Z + V)/(n_Z UT)))\n"
     "\n"
     "Shockley (1949); the exponential breakdown makes a Zener diode. I_S, n, V_Z, I_Z, n_Z are\n"
     "saturation_current, emission, breakdown_voltage, breakdown_current and breakdown_emission. "
     "The series\n"
     "resistance lies outside. T: I_S (T/T0)^(p/n) exp((E_g/(n UT)) (T/T0 - 1)) with p = "
     "saturation_exponent\n"
     "and E_g = bandgap; V_Z (1 + breakdown_tempco (T - T0)). Exponents above 80 go on as their "
     "tangent, in every\n"
     "device.\n"},
    {"npn", "pnp", "Bipolar transistor",
     "Integral charge control, Gummel and Poon (1970):\n"
     "\n"
     "    IF = I_S (exp(VBE/(n_F UT)) - 1)     IR = I_S (exp(VBC/(n_R UT)) - 1)\n"
     "    q1 = 1/(1 - VBC/V_A - VBE/V_B)     q2 = IF/I_K + IR/I_KR     qb = (q1/2) (1 + sqrt(1 + 4 "
     "q2))\n"
     "    IC = (IF - IR)/qb - IR/beta_R - I_LC (exp(VBC/(n_LC UT)) - 1)\n"
     "    IB = IF/beta_F + IR/beta_R + I_LE (exp(VBE/(n_LE UT)) - 1) + I_LC (exp(VBC/(n_LC UT)) - "
     "1)\n"
     "\n"
     "times area m. V_A, V_B are early and early_reverse; I_K, I_KR the knees; I_LE, n_LE, I_LC, "
     "n_LC the\n"
     "leaks. Ours: where 1 - VBC/V_A - VBE/V_B falls below 0.05 (punch-through), q1 goes on as "
     "its\n"
     "tangent. T: I_S as for the diode with n = 1, both betas (T/T0)^beta_exponent, leaks as I_S "
     "with their own\n"
     "emission over (T/T0)^beta_exponent. Hand view: no base current, Early effect, knee, "
     "resistance or leak; the\n"
     "exponential law stays. Headroom: vce - saturation_voltage. Left out: the substrate junction, "
     "charge,\n"
     "avalanche.\n"},
    {"njfet", "pjfet", "Junction field-effect transistor",
     "Shichman and Hodges (1968), with B = idss/pinchoff^2 and v = vgs - pinchoff:\n"
     "\n"
     "    saturated  ID = B v^2 (1 + vds/early)     triode  ID = B vds (2 v - vds) (1 + "
     "vds/early)\n"
     "\n"
     "Reversed drain and source by symmetry; the gate junctions are diodes. The straight "
     "temperature laws end at a\n"
     "thousandth of idss and of pinchoff.\n"},
    {"resistor", NULL, "Resistor",
     "R(T) = value (1 + tempco (T - T0) + tempco2 (T - T0)^2); corners scale it by "
     "`resistor.value`.\n"
     "`tol` stands for the maker's tolerance.\n"},
    {"current", NULL, "Current source",
     "Ideal: drives its value from the first node to the second through itself, so that the second "
     "node\n"
     "receives it.\n"},
    {"voltage", NULL, "Voltage source", "Ideal: the first node is the value above the second.\n"},
    {"opamp", NULL, "Operational amplifier",
     "    v(out) = mid + half tanh(gain (v(plus) - v(minus) + offset)/half)\n"
     "\n"
     "with mid = (high + low)/2 and half = (high - low)/2. Each limit is a voltage or a node. No "
     "input current, no\n"
     "output resistance.\n"},
    {"law", NULL, "Law",
     "`law NAME a -> b i = EXPRESSION`: the current from a to b as an expression of node voltages "
     "(`node.v`) and\n"
     "lets, with exact derivatives by forward differentiation (Griewank and Walther 2008). At most "
     "16 node\n"
     "voltages.\n"},
    {"table", NULL, "Table",
     "`table NAME a -> b \"file.csv\"`: measured current against voltage, two columns in V and A, "
     "one header line\n"
     "allowed, found beside the cell. Monotone cubic between the points (Fritsch and Carlson "
     "1980), straight\n"
     "beyond the ends.\n"},
};

#endif

/*
 * tree.c: the text of a bias distribution tree: a block for each power of ten of sinks.
 */
#include "bench/tree.h"

enum { TAPS = 10, LEVELS = 6 };

/* A of one sink; V that a wire drops when it carries what was planned. */
static const double sink = 1e-6, drop = 0.5e-3;

/* A trunk of `taps` segments from `in` with a branch block at each tap; `behind`: sinks of one. */
static void write_trunk(struct buffer *out, const char *indent, const char *prefix, int taps,
                        const char *branch, int behind)
{
    for (int k = 1; k <= taps; k++) {
        const double ohms = drop / (sink * behind * (taps - k + 1));
        buffer_format(out, "%sresistor %sW%d %st%d -> ", indent, prefix, k, prefix, k);
        if (k == 1) {
            buffer_text(out, "in");
        } else {
            buffer_format(out, "%st%d", prefix, k - 1);
        }
        buffer_format(out, " %.6g\n%suse %s %sX%d in=%st%d bias=bias top=top\n", ohms, indent,
                      branch, prefix, k, prefix, k);
    }
}

void tree_write(struct buffer *out, int leaves)
{
    buffer_text(out, "process \"n180.process\"\n"
                     "block b0 in bias top\n"
                     "    resistor W s -> in 100\n"
                     "    nmos M d=d g=bias s=s W=5u L=2u\n"
                     "    resistor R top -> d 500k\n"
                     "end\n");
    const char *const names[LEVELS] = {"b0", "b1", "b2", "b3", "b4", "b5"};
    int behind = 1;
    for (int level = 1; level < LEVELS; level++, behind *= TAPS) {
        buffer_format(out, "block %s in bias top\n", names[level]);
        write_trunk(out, "    ", "", TAPS, names[level - 1], behind);
        buffer_text(out, "end\n");
    }
    /* at the root one trunk for each decimal digit of the number of sinks */
    buffer_text(out, "block root in bias top\n");
    for (int level = LEVELS - 1; level >= 0; level--, behind /= TAPS) {
        const char prefix[] = {(char)('a' + level), '\0'};
        write_trunk(out, "    ", prefix, leaves / behind % TAPS, names[level], behind);
    }
    buffer_text(out, "end\n"
                     "rail vdd 1.8 V\n"
                     "current IREF vdd -> bias 1 uA\n"
                     "nmos M d=bias g=bias s=gnd W=5u L=2u\n"
                     "use root T in=gnd bias=bias top=vdd\n");
}

/* sweeps.c: rows in the order of the file to runs in which one voltage moves. */
#include "calibrate/measured.h"

#include <math.h>

/* Voltages that differ by less are the same setting. */
static const double same_setting = 1e-6; /* V */

/* The one voltage that differs between two rows: its index; -1 none, -2 more than one. */
static int moved(const struct measured_row *a, const struct measured_row *b,
                 const enum column *voltages, int count)
{
    int found = -1;
    for (int k = 0; k < count; k++) {
        double from = a->value[voltages[k]], to = b->value[voltages[k]];
        if (fabs(from - to) > same_setting) {
            found = found == -1 ? k : -2;
        }
    }
    return a->kelvin == b->kelvin ? found : -2;
}

bool measured_find_sweeps(struct arena *arena, struct measured *device, const enum column *voltages,
                          int count)
{
    int capacity = 0;
    struct measured_sweep *sweep = NULL;
    double direction = 0;
    int along = -1;
    for (int k = 0; k < device->row_count; k++) {
        struct measured_row *row = &device->rows[k];
        int which = k == 0 ? -2 : moved(&device->rows[k - 1], row, voltages, count);
        double step =
            which < 0 ? 0
                      : row->value[voltages[which]] - device->rows[k - 1].value[voltages[which]];
        bool goes_on = sweep != NULL && which >= 0 &&
                       (sweep->count == 1 || (which == along && step * direction > 0));
        if (!goes_on) {
            struct measured_sweep *list =
                arena_grow(arena, device->sweeps, device->sweep_count, &capacity, sizeof *list);
            if (list == NULL) {
                return false;
            }
            device->sweeps = list;
            sweep = &list[device->sweep_count++];
            *sweep = (struct measured_sweep){.first = k, .moved = voltages[0]};
        } else if (sweep->count == 1) {
            along = which;
            direction = step;
            sweep->moved = voltages[which];
        }
        sweep->count++;
        row->sweep = device->sweep_count - 1;
    }
    return true;
}

/*
 * calibration.h: calibrations as text, JSON and process file. Nothing here computes a fit.
 *
 * Every function appends to `out`; when memory is short out->failed is set and the text is of no
 * use. The same calibration gives the same bytes.
 */
#ifndef REPORT_CALIBRATION_H
#define REPORT_CALIBRATION_H

#include "calibrate/calibrate.h"
#include "report/layout.h"

/* The file of a device without its folder. */
const char *report_file_name(const struct calibration *calibration, int device);

/* The page: fit table, charts, values with errors, correlations, remarks. */
void report_calibration(const struct calibration *calibration, const struct report_style *style,
                        struct buffer *out);

/* One JSON object and a line end; keys in docs/calibrate.md. */
void report_json_calibration(const struct calibration *calibration, const char *version,
                             struct buffer *out);

/* Pictures as one SVG document: readings against the model, and the errors; empty when there is
 * nothing to draw. */
void report_plot_calibration(const struct calibration *calibration, struct buffer *out);

/*
 * The process file.
 *
 * name     of the process
 * heading  comment lines to stand at the top; NULL: none
 * command  that makes the file again; NULL: not told
 */
void report_process(const struct calibration *calibration, const char *name, const char *heading,
                    const char *command, struct buffer *out);

#endif

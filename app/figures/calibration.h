/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_FIGURES_CALIBRATION_H
#define AW_FIGURES_CALIBRATION_H

#include <glib.h>

#include "beam/bead.h"
#include "beam/budget.h"
#include "geometry/markmap.h"
#include "geometry/registration.h"

/* Figures of calibrations, one file each: PNG, SVG or PDF by the ending of `path` (AwCanvas and its errors). */

/* Fractions of a knife edge with binomial bars, the Gaussian and the disc through them, residuals, widths by name.
 * points: AwEdgePoint. */
gboolean aw_figure_edge(const AwEdgeFit *fit, const GArray *points, gboolean counts, char axis, const char *path,
                        GError **error);

/* The degraded fraction over a bead scan, centre with its 95 % ellipse, crosshair (may be NULL). points: AwBeadPoint.
 */
gboolean aw_figure_bead(const AwBeadFit *fit, const GArray *points, const AwBeamPoint *crosshair, const char *path,
                        GError **error);

/* Residuals of a pixel map over the pixels of the mark. views: AwMarkView. */
gboolean aw_figure_pixel(const AwMarkMap *map, const GArray *views, const char *path, GError **error);

/* Borrowed. */
typedef struct {
  const AwRegistration *fit;
  const GArray *pairs;    /* AwMarkPair */
  const GPtrArray *names; /* char * of the marks */
  const GArray *places;   /* AwScanPoint of nuclei; may be NULL */
} AwMarksFigure;

/* Residuals of a relocation at its marks, enlarged. */
gboolean aw_figure_residuals(const AwMarksFigure *figure, const char *path, GError **error);

/* Expected target error, rms per axis and widened, over marks and nuclei in scan coordinates. */
gboolean aw_figure_target_error(const AwMarksFigure *figure, const char *path, GError **error);

/* The aim-error budget as bars; what is assumed is hatched. */
gboolean aw_figure_budget(const AwBudget *budget, const char *path, GError **error);

#endif

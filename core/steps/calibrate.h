/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_STEPS_CALIBRATE_H
#define AW_STEPS_CALIBRATE_H

#include "geometry/markmap.h"
#include "image/marks.h"
#include "steps/calibrated.h"

/* One measurement per call: read, fitted, stored, journalled, undoable. CSV columns: docs/formats.md. */

/* Where a measurement came from. Borrowed. */
typedef struct {
  const char *table;           /* CSV or beam file */
  const AwMarkSettings *marks; /* to look for marks in images that the table names; NULL: the table has positions */
  double at_unix_s;            /* when it was measured; NaN: now */
  /* Called with the filled summary at hand before the action is committed, to draw figures; may be NULL. */
  gboolean (*before_commit)(gpointer data, GError **error);
  gpointer data;
} AwCalibrateSource;

typedef struct {
  GArray *views; /* AwMarkView; owned */
  AwMarkMap fit;
  char *words;        /* flips and turns; owned */
  gboolean segmented; /* nuclei exist that rest on another map */
} AwPixelSummary;

void aw_pixel_summary_clear(AwPixelSummary *summary);
G_DEFINE_AUTO_CLEANUP_CLEAR_FUNC(AwPixelSummary, aw_pixel_summary_clear)

/* C = A of docs/geometry.md from one mark at several readings; holds from the next segmentation on. */
gboolean aw_step_calibrate_pixel(const char *path, const AwCalibrateSource *source, const AwStepContext *context,
                                 AwPixelSummary *summary, GError **error);

typedef struct {
  AwFitKind kind;
  gboolean mirrored;
  double localisation_um; /* 0: from the residuals */
} AwMarksSettings;

typedef struct {
  GArray *pairs;    /* AwMarkPair; owned */
  GPtrArray *names; /* char *: of the marks; owned */
  AwRegistration fit;
  AwMarkCheck check;
  GArray *places;                   /* AwScanPoint of the nuclei; owned */
  double min_um, median_um, max_um; /* expected target error per axis at the nuclei, widened; NaN without nuclei */
} AwMarksSummary;

void aw_marks_summary_clear(AwMarksSummary *summary);
G_DEFINE_AUTO_CLEANUP_CLEAR_FUNC(AwMarksSummary, aw_marks_summary_clear)

/* Relocation T from marks read on both stages; a mirrored fit that is far better is an AW_ERROR_RANGE. */
gboolean aw_step_calibrate_marks(const char *path, const AwCalibrateSource *source, const AwMarksSettings *settings,
                                 const AwStepContext *context, AwMarksSummary *summary, GError **error);

typedef struct {
  GArray *points; /* AwEdgePoint; owned */
  AwEdgeFit fit;
  gboolean counts;
} AwEdgeSummary;

void aw_edge_summary_clear(AwEdgeSummary *summary);
G_DEFINE_AUTO_CLEANUP_CLEAR_FUNC(AwEdgeSummary, aw_edge_summary_clear)

typedef struct {
  char axis; /* 'x' or 'y' */
  gboolean fit_plateaus;
  double crosshair_um; /* reading that puts the edge on the crosshair; NaN: no offset */
} AwEdgeScan;

gboolean aw_step_calibrate_edge(const char *path, const AwCalibrateSource *source, const AwEdgeScan *scan,
                                const AwStepContext *context, AwEdgeSummary *summary, GError **error);

typedef struct {
  gboolean elliptical;
  const AwBeamPoint *crosshair; /* reading that puts the bead on the crosshair; NULL: none, or from the image */
  const char *image;            /* of the bead, taken at `reading`: gives the crosshair reading by A; or NULL */
  AwBeamPoint reading;
} AwBeadScan;

typedef struct {
  GArray *points; /* AwBeadPoint; owned */
  AwBeadFit fit;
  gboolean has_offset;
  AwOffsetCheck offset;
  gboolean has_mark;
  AwMark mark;            /* the bead in its image */
  AwBeamPoint crosshair;  /* used */
  double drift_um2_per_h; /* from this and earlier checks; NaN with fewer than two */
} AwBeadSummary;

void aw_bead_summary_clear(AwBeadSummary *summary);
G_DEFINE_AUTO_CLEANUP_CLEAR_FUNC(AwBeadSummary, aw_bead_summary_clear)

gboolean aw_step_calibrate_bead(const char *path, const AwCalibrateSource *source, const AwBeadScan *scan,
                                const AwStepContext *context, AwBeadSummary *summary, GError **error);

/* Beam and layers from a beam file; `at` gets the beam at the nucleus. */
gboolean aw_step_calibrate_beam(const char *path, const AwCalibrateSource *source, const AwStepContext *context,
                                AwBeamAtNucleus *at, GError **error);

/* Enters a number for one term of the aim-error budget, in aw_term_unit. */
gboolean aw_step_calibrate_error(const char *path, AwTermId term, double value, double at_unix_s,
                                 const AwStepContext *context, GError **error);

/* What is stored and what the aim errs by. */
typedef struct {
  GPtrArray *calibrations; /* AwCalibration, oldest first */
  AwCalibrated now;
  AwBudget budget; /* at the median accepted target, else nucleus */
  gsize n_targets;
  char *origin;
} AwCalibrationView;

void aw_calibration_view_free(AwCalibrationView *view);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwCalibrationView, aw_calibration_view_free)

/* at_unix_s: when the targets are to be visited, which ages are counted to; NaN: now. */
AwCalibrationView *aw_step_calibrations(const char *path, double at_unix_s, GError **error);

#endif

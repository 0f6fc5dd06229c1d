/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_NUCLEI_NUCLEUS_H
#define AW_NUCLEI_NUCLEUS_H

#include <glib.h>

#include "base/point.h"

/* Flags of a nucleus; a set bit is a reason for care. */
typedef enum {
  AW_FLAG_BORDER = 1 << 0,    /* its mask touches the edge of the scanned area: part of it is unseen */
  AW_FLAG_SATURATED = 1 << 1, /* more than 1 % of its pixels stand at the largest recorded value */
  AW_FLAG_DEFOCUSED = 1 << 2, /* its edge is much softer than that of the dish's other nuclei */
  AW_FLAG_TOUCHING = 1 << 3   /* it shares a line with another nucleus */
} AwFlag;

/* One row of a mask: columns x0 <= x < x1 of row y, all in pixels of the best frame. */
typedef struct {
  gint32 y, x0, x1;
} AwRun;

/**
 * AwNucleus: one segmented nucleus. Lengths in um are scan um (through the pixel map of the dish); when no pixel size
 * is known (loose images) the same fields hold pixels and tables say `px` (see aw_feature_name).
 */
typedef struct {
  gint64 id;                /* number within the dish, from 1; 0 before it is given */
  int frame;                /* index of its best frame, from 0 */
  AwPixelPoint centroid_px; /* of the mask, in the best frame */
  AwScanPoint centroid;     /* the same as scan coordinate (loose images: equals centroid_px) */
  double area;              /* um2 */
  double diameter;          /* of the circle of equal area, um */
  double convexity;         /* area over area of the convex hull, 0 ... 1 */
  double major, minor;      /* full axes of the ellipse of equal second moments, um */
  double angle_rad;         /* of the major axis against +x of the scan, -pi/2 ... pi/2 */
  double mean;              /* mean pixel value */
  double background;        /* local background: median of a ring outside every mask */
  double integrated;        /* sum over the mask of value - background */
  double sharpness;         /* steepest mean slope across the outline over (mean - background), 1/um */
  double isolation;         /* shortest distance to another outline, um; infinity when alone */
  double confidence;        /* 0 ... 1, from the segmentation */
  double area_ratio;        /* area over the dish's median area */
  double saturated_frac;    /* part of the pixels at the largest recorded value */
  double spread_um; /* rms radial disagreement of its centroid between the frames it was seen in; 0 when in one */
  int n_views;      /* frames it was seen in */
  guint flags;      /* AwFlag bits */
  AwRun *runs;      /* mask, rows from the top, owned */
  gsize n_runs;
  AwScanPoint *outline; /* closed sub-pixel polygon, first point not repeated, scan um, owned */
  gsize n_outline;
} AwNucleus;

AwNucleus *aw_nucleus_copy(const AwNucleus *nucleus);
void aw_nucleus_free(AwNucleus *nucleus);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwNucleus, aw_nucleus_free)

/* A GPtrArray of AwNucleus that frees its elements. */
GPtrArray *aw_nuclei_new(void);

/**
 * A feature: a number of a nucleus that tables show and gates limit.
 * Names carry their unit: "area_um2" in a dish, "area_px2" for loose images without a pixel size.
 */
typedef struct {
  const char *stem;              /* such as "area" */
  const char *unit_um, *unit_px; /* such as "um2", "px2"; both "" for plain numbers */
  const char *help;              /* one line */
  gsize offset;                  /* of the double in AwNucleus */
} AwFeature;

/* All features in table order; *n gets their number. */
const AwFeature *aw_features(gsize *n);

/* "area_um2" or "area_px2". Free with g_free. */
char *aw_feature_name(const AwFeature *feature, gboolean in_um);

/* The feature of that name (either unit form or the bare stem); NULL and AW_ERROR_NOT_FOUND listing all names. */
const AwFeature *aw_feature_find(const char *name, GError **error);

static inline double aw_feature_value(const AwFeature *feature, const AwNucleus *nucleus)
{
  return *(const double *)(const void *)((const char *)nucleus + feature->offset);
}

/* The set flags as words joined by '+', such as "border+touching"; "" for none. Free with g_free. */
char *aw_flags_text(guint flags);

#endif

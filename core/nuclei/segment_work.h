/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_NUCLEI_SEGMENT_WORK_H
#define AW_NUCLEI_SEGMENT_WORK_H

#include "image/plane.h"
#include "image/runs.h"
#include "nuclei/segment.h"

/*
 * What the files core/nuclei/segment*.c share; nobody else includes this but the fitting programs of tests/reference.
 * R is the typical nucleus radius. "Coarse" is the grid reduced by AwSegmentWork.factor.
 */

/* The numbers of the method, all free of scale: lengths in R, brightness in heights, noise in its deviation. */
typedef struct {
  double blur_px;                   /* first smoothing */
  double coarse_radius;             /* R on the coarse grid is at least this, px */
  double ground_radii;              /* disc of the background opening */
  double height_blur;               /* smoothing before heights are read, R */
  double detect_height;             /* detection level over the typical height ... */
  double detect_noise;              /* ... or over the noise, whichever is higher */
  double blob_scale;                /* width of the blob filter, R */
  double blob_floor;                /* added under the logarithm, over the typical height */
  double zone_saddle;               /* dynamics below which blobs are one zone */
  double zone_level;                /* first outline, part of the zone's plateau */
  double piece_saddle;              /* dynamics below which pieces are one */
  double piece_blur;                /* smoothing of the distance, R */
  double blob_weight;               /* blob against distance in the piece landscape */
  double plain_area, plain_ellipse; /* a component is one nucleus up to this size, when it is this elliptic */
  double line_band, line_distance;
  double merge_bias;         /* added to the merge log-odds */
  double outline_shift;      /* added to the level of every outline */
  double grow_radii;         /* how far the final outline may lie outside the first one, R */
  double ring_from, ring_to; /* ring of the local background, R from the nucleus */
  double ring_quantile;
  double smallest_area;     /* of a nucleus, over pi R^2 */
  double debris_confidence; /* dropped is what is less certain than this ... */
  double debris_area;       /* ... and smaller than this, over pi R^2 */
} AwSegmentRules;

extern const AwSegmentRules aw_segment_rules;

/* A shape by its sums; coordinates are pixel centres. */
typedef struct {
  double n, sx, sy, sxx, sxy, syy;
} AwMoments;

#define AW_MAX_FEATURES 24
#define AW_N_PAIR_FEATURES 14
#define AW_N_OUTLINE_FEATURES 4
#define AW_N_OBJECT_FEATURES 16

/* For fitting the decisions: true labels of every pixel and where to send what was seen. All NULL in normal use. */
typedef struct AwSegmentWork AwSegmentWork;

typedef struct {
  const guint32 *truth;
  gboolean follow_truth; /* merge as the truth says */
  void (*pair)(const double *feature, gboolean same, double n_px, gpointer data);
  void (*outline)(const AwSegmentWork *w, const double *feature, guint32 label, double background, double plateau,
                  gpointer data);
  void (*object)(const double *feature, guint32 label, gpointer data);
  gpointer data;
} AwSegmentProbe;

/* What is known of one label. Brightness in image units, lengths in px of the full grid. */
typedef struct {
  AwRect box;
  double neck;       /* strongest saddle towards a touching neighbour over the lower plateau */
  double split_odds; /* log-odds of being one with a neighbour that it was kept apart from; the largest */
  double merge_odds; /* log-odds of the least certain merge inside */
  double background, plateau, cut;
  double n_px;                        /* pixels; of the first, then of the final outline (0: nothing left) */
  double n_edge, slope, slope_square; /* free edge pixels, and sums over their slopes per px */
  double n_ring, ring_spread;         /* pixels of the background ring, and their 80 % range */
  AwMoments shape;                    /* final outline */
  double confidence;
  double convexity, n_touching; /* of it; its edge pixels beside another label */
} AwObject;

struct AwSegmentWork {
  const AwSegmentRules *rules;
  const AwSegmentSettings *settings;
  const AwSegmentProbe *probe; /* or NULL */
  AwSegmentScale scale;
  int width_px, height_px, factor;
  AwPlane *smooth;  /* the image, lightly smoothed, full grid */
  AwPlane *coarse;  /* the same on the coarse grid */
  AwPlane *ground;  /* background, coarse grid, never above `coarse` */
  AwPlane *blob;    /* blob filter response, coarse grid */
  AwPlane *cut;     /* first threshold per coarse pixel, over zero, image units; huge outside every zone */
  guint8 *mask;     /* full grid, first outline */
  AwLabels *labels; /* full grid, the result */
  GArray *edge;     /* AwSpot: edge pixels of the labels as last counted */
  GArray *objects;  /* AwObject per label; entry 0 unused */
};

/* Fills the scale from the image's own nuclei. */
gboolean aw_segment_measure_scale(AwSegmentWork *w, const AwImage *image, GError **error);

/* Smoothed image and the reduced copy for the scale in w. */
gboolean aw_segment_prepare(AwSegmentWork *w, const AwImage *image, GError **error);

/* Background of a plane whose nuclei have radius_px there; never above the plane. */
AwPlane *aw_segment_ground(const AwPlane *plane, double radius_px, const AwSegmentRules *rules, GError **error);

/* Zones on the coarse grid and the first mask on the full grid. */
gboolean aw_segment_zones(AwSegmentWork *w, GError **error);

/* Mask to labels: parts touching nuclei into pieces and merges what belongs together. */
gboolean aw_segment_pieces(AwSegmentWork *w, GError **error);

/* Background, plateau and outline level of every label. */
gboolean aw_segment_levels(AwSegmentWork *w, GError **error);

/* Lists the edge pixels, counts the free and touching ones of every label and sums the slopes of the free ones. */
void aw_segment_edges(const AwSegmentWork *w);

/* Final outlines; drops what is too small; numbers labels in scan order. Then info and confidence. */
gboolean aw_segment_outlines(AwSegmentWork *w, GError **error);

/* Numbers the labels in scan order, those marked in `drop` (or NULL) removed, the objects along with them. */
void aw_segment_renumber(AwSegmentWork *w, const guint8 *drop);

AwSegmentInfo *aw_segment_infos(AwSegmentWork *w, GError **error);

/* The whole run with other rules and a probe. */
AwSegmentation *aw_segment_run(const AwImage *image, const AwSegmentSettings *settings, const AwSegmentScale *scale,
                               const AwSegmentRules *rules, const AwSegmentProbe *probe, AwProgress *progress,
                               GError **error);

/* Log-odds that the object is one whole nucleus, rightly outlined. */
double aw_object_odds(const double feature[AW_N_OBJECT_FEATURES]);

/* Where between background (0) and plateau (1) the outline is drawn. */
double aw_outline_level(const double feature[AW_N_OUTLINE_FEATURES]);

static inline void aw_moments_add_run(AwMoments *m, double y, double x0, double x1)
{
  double n = x1 - x0, mean = (x0 + x1 - 1) / 2, square = n * mean * mean + n * (n * n - 1) / 12;
  m->n += n;
  m->sx += n * mean;
  m->sy += n * y;
  m->sxx += square;
  m->sxy += n * mean * y;
  m->syy += n * y * y;
}

AwMoments aw_moments_sum(const AwMoments *a, const AwMoments *b);

/* Area over that of the ellipse of equal second moments: 1 for ellipses, less for other shapes. */
double aw_moments_ellipse(const AwMoments *m);

/* Longer over shorter axis of that ellipse. */
double aw_moments_elongation(const AwMoments *m);

typedef struct {
  gint32 x, y;
} AwCorner;

static inline AwObject *aw_segment_object(const AwSegmentWork *w, guint32 label)
{
  return &g_array_index(w->objects, AwObject, label);
}

/* Width of the free edge, what the pixels themselves blur taken off, over R. */
double aw_object_edge_width(const AwSegmentWork *w, const AwObject *o);

/* Slope of the smoothed image at a pixel, image units per px. */
double aw_segment_slope(const AwPlane *plane, gsize at);

/* Convex hull of n points in place; returns the number of corners (Andrew's monotone chain). */
gsize aw_hull(AwCorner *point, gsize n);

/* Pixels over the grid points inside their hull (Pick's theorem): exactly 1 for a digitally convex set. */
double aw_hull_convexity(const AwCorner *hull, gsize n, double n_px);

/* Brightness histogram of a region; values from 0 to `top`. */
#define AW_SHADES 128
typedef struct {
  guint32 count[AW_SHADES];
} AwShades;

/* The plateau: 60th percentile of the pixels above half of the 95th percentile. */
double aw_shades_plateau(const AwShades *s, double top);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_NUCLEI_SEGMENT_PIECES_H
#define AW_NUCLEI_SEGMENT_PIECES_H

#include "nuclei/segment_work.h"

/* One connected part of the mask with its own small copies of what the decisions need; row-major over `box`. */
typedef struct {
  AwRect box;
  int width, height;
  float top;       /* largest brightness above background */
  guint8 *mask;    /* 1 where the part is */
  float *clear;    /* brightness above background */
  float *distance; /* to the part's outside, px */
  float *blob;     /* blob filter */
  float *land;     /* what the pieces are the peaks of */
  guint32 *label;  /* piece of every pixel, from 1 */
  guint32 n_labels;
} AwCluster;

/* One piece, or several merged. */
typedef struct {
  guint32 parent; /* itself, or the piece it was merged into */
  AwRect box;     /* in the cluster, before lines are redrawn */
  AwMoments moments;
  AwCorner *hull;
  gsize n_hull;
  double convexity, ellipse, plateau;
  double merge_odds; /* log-odds of the least certain merge inside; 8 when there was none */
  AwShades shades;
  float distance_peak, blob_peak, land_peak;
  guint32 home; /* true label of most of its pixels, when fitting */
} AwPiece;

/* Where two pieces touch. */
typedef struct {
  guint32 a, b;  /* a < b; a == b once merged */
  double length; /* of the shared line, px (Crofton's estimate) */
  double n, sum; /* pixel pairs across the line, and the lower brightness of each */
  float clear_saddle, distance_saddle, blob_saddle, land_saddle;
  double merge_odds; /* log-odds that both are one nucleus */
} AwLink;

typedef struct {
  AwPiece *piece; /* 1 ... n */
  guint32 n;
  GArray *links; /* AwLink */
  float top;
} AwPieces;

/* The pieces of a cluster with their links; free with aw_pieces_clear. */
void aw_pieces_build(AwPieces *p, const AwCluster *c);
void aw_pieces_clear(AwPieces *p);

/* Merges the likeliest pair until none is likelier than not. */
void aw_pieces_merge(AwPieces *p, const AwSegmentWork *w);

static inline guint32 aw_pieces_root(const AwPieces *p, guint32 i)
{
  while (p->piece[i].parent != i)
    i = p->piece[i].parent;
  return i;
}

/* Features of the pair at a link, and the log-odds of their being one nucleus. */
void aw_pair_features(const AwPieces *p, const AwLink *link, double radius_px, double feature[AW_N_PAIR_FEATURES]);
double aw_pair_merge_odds(const double feature[AW_N_PAIR_FEATURES]);

#endif

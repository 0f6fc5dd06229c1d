/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_IMAGE_OME_MODEL_H
#define AW_IMAGE_OME_MODEL_H

#include "image/ome.h"

/* Between ome.c and ome_read.c alone: the parsed metadata. */

enum { AW_OME_C, AW_OME_Z, AW_OME_T };

typedef struct {
  int ifd;         /* -1: no directory of this file */
  char *elsewhere; /* the other file that holds it, owned by the model's texts; NULL when none */
  gboolean has_position, is_reference_frame;
  AwScanPoint stage;
  double delta_t_s; /* NaN when not said */
} AwOmeModelPlane;

typedef struct {
  int width_px, height_px;
  int size[3];   /* channels, focus positions, times; a channel of several samples counts once */
  int stride[3]; /* of the plane index, from DimensionOrder */
  int n_samples; /* of one channel */
  int significant_bits;
  double pixel_um, pixel_y_um;
  char order[4];    /* the dimensions after XY, fastest first, such as "CZT" */
  GPtrArray *names; /* of the Channel elements, owned */
  GString *acquired;
  AwOmeModelPlane *planes; /* size[0] x size[1] x size[2]; NULL until the channels are known */
} AwOmeModelImage;

typedef struct {
  AwOmeModelImage *image;
  int z, t;
} AwOmeModelPage;

struct AwOme {
  char *path, *file_name, *uuid;
  int n_directories;
  char *first_elsewhere; /* owned by texts */
  GStringChunk *texts;
  GPtrArray *images; /* AwOmeModelImage */
  GArray *pages;     /* AwOmeModelPage */
};

static inline int aw_ome_model_n_planes(const AwOmeModelImage *image)
{
  return image->size[0] * image->size[1] * image->size[2];
}

static inline AwOmeModelPlane *aw_ome_model_plane(const AwOmeModelImage *image, int c, int z, int t)
{
  return &image->planes[c * image->stride[AW_OME_C] + z * image->stride[AW_OME_Z] + t * image->stride[AW_OME_T]];
}

/* Reads the XML into the model; the pages are left to ome.c. */
gboolean aw_ome_model_read(AwOme *ome, const char *xml, GError **error);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_IMAGE_OME_H
#define AW_IMAGE_OME_H

#include "image/image.h"

/**
 * AwOme: what the OME-XML in a TIFF's first ImageDescription says (OME schema 2016-06 and its elders).
 *
 * A page is one pair of focus and time of one Image, Z running fastest, then T, then the Images in file order; only
 * pages with at least one plane in this very file count. A channel is one sample of one OME Channel.
 */
typedef struct AwOme AwOme;

/* TRUE when `description` is OME-XML, well-formed or not. */
gboolean aw_ome_is(const char *description);

/**
 * aw_ome_parse: reads the XML. path: the TIFF file, named in errors and compared with the files the XML lists;
 * n_directories: how many the file has.
 * AW_ERROR_FORMAT for broken XML and impossible numbers, AW_ERROR_UNSUPPORTED when the metadata or every plane is
 * in another file, which is named. Free with aw_ome_free.
 */
AwOme *aw_ome_parse(const char *xml, const char *path, int n_directories, GError **error);
void aw_ome_free(AwOme *ome);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwOme, aw_ome_free)

int aw_ome_n_pages(const AwOme *ome);

/* One plane as the metadata describe it. */
typedef struct {
  int ifd;        /* TIFF directory, from 0 */
  int n_samples;  /* samples of a pixel in that directory */
  int sample;     /* which one; -1 where the directory's only channel is meant */
  int n_channels; /* of the page's Image */
  int width_px, height_px;
  int significant_bits;        /* 0 when not said */
  double pixel_um, pixel_y_um; /* 0 when not said in a unit of length */
  gboolean has_position;       /* in a unit of length */
  gboolean is_reference_frame; /* a position, but in no unit of length */
  AwScanPoint stage;           /* valid when has_position */
  double taken_at_unix_s;      /* AcquisitionDate + DeltaT; NaN when not said or without a time zone */
} AwOmePlane;

/**
 * aw_ome_plane: finds a plane. channel -1 asks for the only one. AW_ERROR_NOT_FOUND for a page or channel that is not
 * there, AW_ERROR_UNSUPPORTED where several channels need a choice or the plane is in another file.
 */
gboolean aw_ome_plane(const AwOme *ome, int page, int channel, AwOmePlane *plane, GError **error);

/* `value` in the OME length unit `unit` as µm; FALSE for "pixel", "reference frame" and unknown units. */
gboolean aw_ome_length_um(double value, const char *unit, double *um);

/* `value` in the OME time unit `unit` as seconds; FALSE for unknown units. */
gboolean aw_ome_time_s(double value, const char *unit, double *s);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_NUCLEI_SEGMENT_MARGIN_H
#define AW_NUCLEI_SEGMENT_MARGIN_H

#include "nuclei/segment.h"

/*
 * Nuclei cut by the edge of an image are judged with their mirror image beside them, so that what is found does not
 * depend on where exactly the edge falls.
 */

#define AW_SEGMENT_MARGIN_PX 8

/* The image with AW_SEGMENT_MARGIN_PX mirrored pixels on every side, the edge pixel repeated. Free with aw_image_free.
 */
AwImage *aw_segment_mirror(const AwImage *image, GError **error);

/* The segmentation of such an image, cut back; labels that lie in the margin alone are gone, the others stay in order.
 */
AwSegmentation *aw_segment_cut_back(const AwSegmentation *wide, GError **error);

#endif

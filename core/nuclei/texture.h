/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_NUCLEI_TEXTURE_H
#define AW_NUCLEI_TEXTURE_H

#include "nuclei/truth.h"

/**
 * AwTexture: the chromatin texture of one object, a smooth random field fixed to the object in scan um, so that every
 * frame shows the same. Interphase nuclei also have one to four nucleoli, which take up less stain.
 */
typedef struct AwTexture AwTexture;

/* From the truth's seed, outline and texture_frac. Free with aw_texture_free. */
AwTexture *aw_texture_new(const AwTruth *truth);
void aw_texture_free(AwTexture *texture);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwTexture, aw_texture_free)

/* The factor on the stain at (dx, dy) um from the truth's centroid, inside its outline; above 0, about 1. */
double aw_texture_at(const AwTexture *texture, double dx_um, double dy_um);

#endif

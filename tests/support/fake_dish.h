/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_TESTS_FAKE_DISH_H
#define AW_TESTS_FAKE_DISH_H

#include "record/record.h"

/* A dish made up in memory for tests and timings of figures and views; pictures follow design rule p = c - A^-1 (q - S)
 * and nothing of the code under test. */
typedef struct {
  int n_across, n_down; /* frames */
  int side_px;          /* of a frame */
  int overview_px;      /* side of the stored pictures; 0 stores none */
  double overlap_frac;  /* between neighbouring frames */
  double um_per_px;     /* size of a pixel */
  double camera_rad;    /* camera rotation */
  gboolean mirrored;    /* A with a negative determinant */
  gsize n_nuclei;       /* scattered at random, at least one diameter apart as far as they fit */
  double nucleus_um;    /* typical diameter */
  guint64 seed;
} FakeDishSettings;

typedef struct {
  AwPixelMap map;
  GPtrArray *frames; /* AwFrame */
  GPtrArray *nuclei; /* AwNucleus, ids from 1 */
  AwState *state;
  GArray *tour; /* gint64, accepted nuclei by nearest neighbour */
} FakeDish;

FakeDishSettings fake_dish_defaults(void);
FakeDish *fake_dish_new(const FakeDishSettings *settings);
void fake_dish_free(FakeDish *dish);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(FakeDish, fake_dish_free)

/* Adds an elliptic nucleus at q with full axes major, minor; before fake_dish_paint. */
AwNucleus *fake_dish_add(FakeDish *dish, AwScanPoint q, double major_um, double minor_um, double angle_rad);

/* Paints the pictures of all frames from the nuclei: background 20, nuclei up to 200, soft edges. */
void fake_dish_paint(FakeDish *dish, int overview_px);

#endif

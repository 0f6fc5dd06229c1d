/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/* Features and outlines of a frame of 2048 x 2048 px with 1500 nuclei; isolation of 100,000 nuclei. */
#include <stdio.h>
#include <time.h>

#include "base/random.h"
#include "nuclei/measure.h"
#include "support/drawn.h"

#define SIDE 2048
#define N_SIDE 39

/* Processor time of this thread: other work on the machine does not count. */
static gint64 cpu_us(void)
{
  struct timespec t;
  clock_gettime(CLOCK_THREAD_CPUTIME_ID, &t);
  return t.tv_sec * 1000000 + t.tv_nsec / 1000;
}

static void draw_frame(AwImage *image, AwLabels *labels)
{
  AwRandom r = aw_random_stream(1, 0);
  double pitch = (double)SIDE / N_SIDE;
  for (guint32 k = 0; k < N_SIDE * N_SIDE; k++) {
    DrawnBlob blob = { (k % N_SIDE + 0.3 + 0.4 * aw_random_unit(&r)) * pitch,
                       (k / N_SIDE + 0.3 + 0.4 * aw_random_unit(&r)) * pitch,
                       20 + 10 * aw_random_unit(&r),
                       18 + 8 * aw_random_unit(&r),
                       3 * aw_random_unit(&r),
                       500,
                       1.2 };
    drawn_blob(image, blob);
    drawn_label(labels, blob, k + 1);
  }
  drawn_noise(image, 20, 3);
}

static GPtrArray *many(const GPtrArray *nuclei, gsize n)
{
  GPtrArray *all = aw_nuclei_new();
  for (gsize i = 0; i < n; i++) {
    AwNucleus *a = aw_nucleus_copy(nuclei->pdata[i % nuclei->len]);
    double dx = SIDE * (double)(i / nuclei->len % 8), dy = SIDE * (double)(i / nuclei->len / 8);
    a->centroid.x_um += dx;
    a->centroid.y_um += dy;
    for (gsize k = 0; k < a->n_outline; k++) {
      a->outline[k].x_um += dx;
      a->outline[k].y_um += dy;
    }
    g_ptr_array_add(all, a);
  }
  return all;
}

static double best_of(int n, const AwImage *image, const AwLabels *labels, GPtrArray **nuclei)
{
  gint64 best = G_MAXINT64;
  AwPlacement loose = aw_placement_loose(SIDE, SIDE);
  for (int i = 0; i < n; i++) {
    g_clear_pointer(nuclei, g_ptr_array_unref);
    gint64 begin = cpu_us();
    *nuclei = aw_measure_masks(image, labels, NULL, aw_saturation_level(image), NULL);
    for (guint k = 0; k < (*nuclei)->len; k++)
      aw_nucleus_place((*nuclei)->pdata[k], &loose);
    best = MIN(best, cpu_us() - begin);
  }
  return (double)best / 1000;
}

int main(void)
{
  AwImage *image = drawn_image(SIDE, SIDE, AW_SAMPLE_U16, 400);
  AwLabels *labels = aw_labels_new(SIDE, SIDE, NULL);
  GPtrArray *nuclei = NULL;
  draw_frame(image, labels);
  double frame_ms = best_of(9, image, labels, &nuclei);
  gsize points = 0, runs = 0;
  for (guint i = 0; i < nuclei->len; i++) {
    const AwNucleus *a = nuclei->pdata[i];
    points += a->n_outline;
    runs += a->n_runs;
  }
  printf("measure: %u nuclei of a 2048 x 2048 px frame in %d us (%d points, %d runs a nucleus)\n", nuclei->len,
         (int)(1000 * frame_ms), (int)(points / nuclei->len), (int)(runs / nuclei->len));
  gint64 took[2];
  for (int k = 0; k < 2; k++) {
    g_autoptr(GPtrArray) all = many(nuclei, k ? 100000 : 10000);
    gint64 begin = cpu_us();
    aw_measure_relations(all);
    took[k] = cpu_us() - begin;
  }
  printf("relations: 10,000 nuclei in %d ms, 100,000 in %d ms\n", (int)(took[0] / 1000), (int)(took[1] / 1000));
  g_ptr_array_unref(nuclei);
  aw_labels_free(labels);
  aw_image_free(image);
  return 0;
}

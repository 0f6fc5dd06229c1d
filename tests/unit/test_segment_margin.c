/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "nuclei/segment_margin.h"
#include "support/drawn.h"

#define M AW_SEGMENT_MARGIN_PX

/* Every pixel of the widened image is that of the mirror it stands in, also when the image is smaller than the margin.
 */
static void check_mirror(int width, int height)
{
  g_autoptr(AwImage) image = drawn_image(width, height, AW_SAMPLE_U16, 0);
  for (int i = 0; i < width * height; i++)
    drawn_set(image, i % width, i / width, 7 * i + 3);
  g_autoptr(AwImage) wide = aw_segment_mirror(image, NULL);
  g_assert_nonnull(wide);
  g_assert_cmpint(wide->width_px, ==, width + 2 * M);
  g_assert_cmpint(wide->height_px, ==, height + 2 * M);
  g_assert_cmpfloat(wide->full_scale, ==, image->full_scale);
  for (int y = 0; y < wide->height_px; y++)
    for (int x = 0; x < wide->width_px; x++) {
      int u = x - M, v = y - M;
      while (u < 0 || u >= width)
        u = u < 0 ? -1 - u : 2 * width - 1 - u;
      while (v < 0 || v >= height)
        v = v < 0 ? -1 - v : 2 * height - 1 - v;
      g_assert_cmpfloat(aw_image_value(wide, x, y), ==, aw_image_value(image, u, v));
    }
}

static void test_mirror(void)
{
  check_mirror(30, 20);
  check_mirror(3, 5);
  check_mirror(1, 1);
}

/* Labels of the margin alone go, the others close ranks with their notes. */
static void test_cut_back(void)
{
  AwSegmentation *wide = g_new0(AwSegmentation, 1);
  wide->labels = aw_labels_new(10 + 2 * M, 6 + 2 * M, NULL);
  wide->info = g_new0(AwSegmentInfo, 4);
  wide->labels->n_labels = 3;
  wide->labels->label[0] = 1;
  for (int k = 2; k <= 3; k++) {
    wide->labels->label[(M + k) * wide->labels->width_px + M + 2 * k] = (guint32)k;
    wide->info[k].confidence = 0.1 * k;
  }
  g_autoptr(AwSegmentation) cut = aw_segment_cut_back(wide, NULL);
  aw_segmentation_free(wide);
  g_assert_cmpuint(cut->labels->n_labels, ==, 2);
  g_assert_cmpint(cut->labels->width_px, ==, 10);
  g_assert_cmpuint(cut->labels->label[2 * 10 + 4], ==, 1);
  g_assert_cmpuint(cut->labels->label[3 * 10 + 6], ==, 2);
  g_assert_cmpfloat(cut->info[1].confidence, ==, 0.1 * 2);
  g_assert_cmpfloat(cut->info[2].confidence, ==, 0.1 * 3);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/nuclei/segment-margin/mirror", test_mirror);
  g_test_add_func("/nuclei/segment-margin/cut-back", test_cut_back);
  return g_test_run();
}

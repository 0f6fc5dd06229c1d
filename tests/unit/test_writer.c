/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "image/writer.h"

#include <signal.h>
#include <string.h>
#include <sys/resource.h>

#include "../support/check.h"
#include "base/output.h"
#include "image/reader.h"

static AwImage *pattern(int width_px, int height_px, AwSample sample)
{
  AwImage *image = aw_image_new(width_px, height_px, sample, NULL);
  for (int i = 0; i < width_px * height_px; i++)
    if (sample == AW_SAMPLE_U8)
      ((guint8 *)image->pixels)[i] = (guint8)(i * 37 + i / 11);
    else if (sample == AW_SAMPLE_U16)
      ((guint16 *)image->pixels)[i] = (guint16)(i * 1237 + i / 7);
    else
      ((float *)image->pixels)[i] = (float)i * 0.37f - 11;
  return image;
}

/* 413 x 701 needs several strips, the last one short. */
static void round_trip(void)
{
  static const AwSample samples[] = { AW_SAMPLE_U8, AW_SAMPLE_U16, AW_SAMPLE_F32 };
  char *folder = aw_scratch_new();
  g_autofree char *path = g_build_filename(folder, "a.tif", NULL);
  for (gsize i = 0; i < G_N_ELEMENTS(samples); i++) {
    g_autoptr(GError) error = NULL;
    AwImageInfo info;
    g_autoptr(AwImage) image = pattern(413, 701, samples[i]);
    g_assert_true(aw_image_write_tiff(image, path, 0.3225, &error));
    g_assert_no_error(error);
    g_autoptr(AwImage) back = aw_image_load(path, 0, -1, &info, &error);
    g_assert_no_error(error);
    g_assert_cmpint(back->sample, ==, samples[i]);
    g_assert_cmpmem(back->pixels, 413 * 701 * aw_sample_bytes(samples[i]), image->pixels,
                    413 * 701 * aw_sample_bytes(samples[i]));
    g_assert_cmpfloat_with_epsilon(info.pixel_um, 0.3225, 1e-7);
    g_assert_cmpfloat(back->full_scale, ==, image->full_scale);
  }
  g_assert_cmpint(aw_scratch_count(folder), ==, 1);
  aw_scratch_remove(folder);
}

static void declared_range(void)
{
  char *folder = aw_scratch_new();
  g_autofree char *path = g_build_filename(folder, "a.tif", NULL);
  AwImageInfo info;
  g_autoptr(AwImage) image = aw_image_new(3, 2, AW_SAMPLE_U16, NULL);
  ((guint16 *)image->pixels)[4] = 4095;
  image->full_scale = 4095;
  g_assert_true(aw_image_write_tiff(image, path, 0, NULL));
  g_autoptr(AwImage) back = aw_image_load(path, 0, -1, &info, NULL);
  g_assert_cmpfloat(back->full_scale, ==, 4095);
  g_assert_cmpfloat(info.pixel_um, ==, 0);
  aw_scratch_remove(folder);
}

static void same_bytes(void)
{
  char *folder = aw_scratch_new();
  g_autofree char *a = g_build_filename(folder, "a.tif", NULL), *b = g_build_filename(folder, "b.tif", NULL);
  g_autoptr(AwImage) image = pattern(100, 90, AW_SAMPLE_U16);
  g_assert_true(aw_image_write_tiff(image, a, 0.5, NULL));
  g_assert_true(aw_image_write_tiff(image, b, 0.5, NULL));
  g_autofree char *hash_a = aw_input_sha256(a, NULL), *hash_b = aw_input_sha256(b, NULL);
  g_assert_cmpstr(hash_a, ==, hash_b);
  aw_scratch_remove(folder);
}

static void labels(void)
{
  char *folder = aw_scratch_new();
  g_autofree char *path = g_build_filename(folder, "labels.tif", NULL);
  g_autoptr(AwLabels) labels = aw_labels_new(5, 3, NULL);
  labels->label[7] = labels->n_labels = 65535;
  labels->label[0] = 3;
  g_assert_true(aw_labels_write_tiff(labels, path, NULL));
  g_autoptr(AwImage) back = aw_image_load(path, 0, -1, NULL, NULL);
  for (int i = 0; i < 15; i++)
    g_assert_cmpuint(((guint16 *)back->pixels)[i], ==, labels->label[i]);
  /* one more needs 32 bits, which are for other programs (tests/reference/test_images.py reads them) */
  GError *error = NULL;
  labels->label[7] = labels->n_labels = 65536;
  g_assert_true(aw_labels_write_tiff(labels, path, &error));
  g_assert_no_error(error);
  g_assert_null(aw_image_load(path, 0, -1, NULL, &error));
  aw_check_error(&error, AW_ERROR_UNSUPPORTED, "32-bit unsigned integer");
  aw_scratch_remove(folder);
}

static void no_folder(void)
{
  GError *error = NULL;
  char *folder = aw_scratch_new();
  g_autofree char *path = g_build_filename(folder, "none", "a.tif", NULL);
  g_autoptr(AwImage) image = pattern(10, 10, AW_SAMPLE_U8);
  g_assert_false(aw_image_write_tiff(image, path, 0, &error));
  aw_check_error(&error, AW_ERROR_NOT_FOUND, "none");
  aw_scratch_remove(folder);
}

static void full_device(void)
{
  GError *error = NULL;
  g_autoptr(AwImage) image = pattern(300, 300, AW_SAMPLE_U16);
  g_autoptr(AwLabels) labels = aw_labels_new(10, 10, NULL);
  g_assert_false(aw_image_write_tiff(image, "/dev/full", 0, &error));
  aw_check_error(&error, AW_ERROR_IO, "/dev/full|No space left on device");
  g_assert_false(aw_labels_write_tiff(labels, "/dev/full", &error));
  aw_check_error(&error, AW_ERROR_IO, "/dev/full|No space left on device");
}

/* A file size limit acts like a full disk; the earlier file stays as it was and nothing is left beside it. */
static void full_disk(void)
{
  GError *error = NULL;
  char *folder = aw_scratch_new(), *text = NULL;
  g_autofree char *path = aw_scratch_write(folder, "a.tif", "earlier");
  g_autoptr(AwImage) image = pattern(300, 300, AW_SAMPLE_U16);
  struct rlimit before, small;
  signal(SIGXFSZ, SIG_IGN);
  getrlimit(RLIMIT_FSIZE, &before);
  small = before;
  small.rlim_cur = 512;
  setrlimit(RLIMIT_FSIZE, &small);
  gboolean ok = aw_image_write_tiff(image, path, 0, &error);
  setrlimit(RLIMIT_FSIZE, &before);
  g_assert_false(ok);
  aw_check_error(&error, AW_ERROR_IO, "a.tif");
  g_assert_true(g_file_get_contents(path, &text, NULL, NULL));
  g_assert_cmpstr(text, ==, "earlier");
  g_assert_cmpint(aw_scratch_count(folder), ==, 1);
  g_free(text);
  aw_scratch_remove(folder);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  aw_check_add("/image/writer/round-trip", round_trip);
  g_test_add_func("/image/writer/declared-range", declared_range);
  g_test_add_func("/image/writer/same-bytes", same_bytes);
  g_test_add_func("/image/writer/labels", labels);
  g_test_add_func("/image/writer/no-folder", no_folder);
  g_test_add_func("/image/writer/full-device", full_device);
  g_test_add_func("/image/writer/full-disk", full_disk);
  return g_test_run();
}

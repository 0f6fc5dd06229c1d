/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/* Arbitrary bytes as an image file, as OME-XML and as an overview kept in a record. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <sys/mman.h>
#include <unistd.h>

#include "fuzz.h"
#include "image/ome.h"
#include "image/overview.h"

#define MAX_PIXELS (1 << 20)

/* Whatever the outcome, an error must say something and a success must be whole. */
static void check(const AwImage *image, GError **error)
{
  if (!image != (*error != NULL))
    abort();
  if (image && !isfinite(aw_image_value(image, image->width_px - 1, image->height_px - 1)))
    abort();
  g_clear_error(error);
}

static void read_all(AwImageReader *reader)
{
  GError *error = NULL;
  const AwImageInfo *info = aw_image_reader_info(reader);
  int w = info->width_px, h = info->height_px;
  AwRect rects[] = { { 0, 0, w, h }, { w / 2, h / 2, w, h }, { 0, h - 1, w, h }, { w / 3, 0, w / 3 + 1, h } };
  for (gsize i = 0; i < G_N_ELEMENTS(rects); i++) {
    AwRect r = rects[i];
    if ((gint64)(r.x1 - r.x0) * (r.y1 - r.y0) > MAX_PIXELS)
      continue;
    g_autoptr(AwImage) image = aw_image_reader_read(reader, r, &error);
    check(image, &error);
  }
}

static void read_file(const char *path, int page, int channel)
{
  g_autoptr(GError) error = NULL;
  g_autoptr(AwImageReader) reader = aw_image_reader_open(path, page, channel, &error);
  if (!reader != (error != NULL))
    abort();
  if (reader)
    read_all(reader);
}

static void as_file(const uint8_t *bytes, size_t n)
{
  int fd = memfd_create("fuzz", MFD_CLOEXEC);
  if (fd < 0 || write(fd, bytes, n) != (ssize_t)n)
    abort();
  g_autofree char *path = g_strdup_printf("/proc/self/fd/%d", fd);
  for (int page = 0; page < 2; page++)
    for (int channel = -1; channel < 2; channel++)
      read_file(path, page, channel);
  close(fd);
}

static void as_ome(const uint8_t *bytes, size_t n)
{
  g_autofree char *xml = g_strndup((const char *)bytes, n);
  AwOmePlane plane;
  if (!aw_ome_is(xml))
    return;
  g_autoptr(AwOme) ome = aw_ome_parse(xml, "a.tif", 3, NULL);
  for (int page = 0; ome && page < MIN(aw_ome_n_pages(ome), 4); page++)
    for (int channel = -1; channel < 3; channel++)
      aw_ome_plane(ome, page, channel, &plane, NULL);
}

static void as_overview(const uint8_t *bytes, size_t n)
{
  g_autoptr(GError) error = NULL;
  g_autoptr(GBytes) png = g_bytes_new(bytes, n);
  g_autoptr(AwImage) image = aw_overview_decode(png, "an overview", &error);
  check(image, &error);
}

void fuzz_image(const uint8_t *bytes, size_t n)
{
  as_file(bytes, n);
  as_ome(bytes, n);
  if (n > 0 && bytes[0] == 0x89)
    as_overview(bytes, n);
}

FUZZ_ENTRY(image)

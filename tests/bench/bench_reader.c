/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/* Reading image files: a plain 16-bit frame against copying its bytes, a Deflate frame against zlib alone, and a tiled
 * BigTIFF of 30,000 x 30,000 px in blocks of 4096 with the memory that takes. Processor time, best of several. */
#include <fcntl.h>
#include <stdio.h>
#include <string.h>
#include <sys/resource.h>
#include <time.h>
#include <unistd.h>
#include <zlib.h>

#include "base/random.h"
#include "image/reader.h"
#include "image/writer.h"
#include "support/check.h"
#include "support/tiff_bytes.h"

#define SIDE 2048
#define BIG 30000
#define TILE 512
#define BLOCK 4096

static gint64 cpu_us(void)
{
  struct timespec t;
  clock_gettime(CLOCK_THREAD_CPUTIME_ID, &t);
  return t.tv_sec * 1000000 + t.tv_nsec / 1000;
}

static AwImage *frame(void)
{
  AwImage *image = aw_image_new(SIDE, SIDE, AW_SAMPLE_U16, NULL);
  AwRandom r = aw_random_stream(1, 0);
  for (int i = 0; i < SIDE * SIDE; i++)
    ((guint16 *)image->pixels)[i] = (guint16)(800 + (i / 64 % 32) * 40 + (int)(aw_random_bits(&r) & 31));
  return image;
}

static gint64 best_load_us(const char *path)
{
  gint64 best = G_MAXINT64;
  for (int i = 0; i < 15; i++) {
    gint64 from = cpu_us();
    g_autoptr(AwImage) image = aw_image_load(path, 0, -1, NULL, NULL);
    best = MIN(best, cpu_us() - from);
  }
  return best;
}

/* What no reader can do without: new memory, and the file's bytes in it. */
static gint64 best_plain_read_us(const char *path)
{
  gint64 best = G_MAXINT64;
  for (int i = 0; i < 15; i++) {
    gint64 from = cpu_us();
    g_autoptr(AwImage) image = aw_image_new(SIDE, SIDE, AW_SAMPLE_U16, NULL);
    int fd = open(path, O_RDONLY);
    gsize n = 2 * SIDE * SIDE;
    if (fd < 0 || read(fd, image->pixels, n) != (gssize)n)
      return 0;
    close(fd);
    best = MIN(best, cpu_us() - from);
  }
  return best;
}

static gint64 best_inflate_us(const AwImage *image)
{
  uLongf n = compressBound(2 * SIDE * SIDE), got = 2 * SIDE * SIDE;
  g_autofree guint8 *packed = g_malloc(n), *back = g_malloc(got);
  gint64 best = G_MAXINT64;
  compress(packed, &n, image->pixels, 2 * SIDE * SIDE);
  for (int i = 0; i < 5; i++) {
    gint64 from = cpu_us();
    uncompress(back, &got, packed, n);
    best = MIN(best, cpu_us() - from);
  }
  return best;
}

static void frames(const char *folder)
{
  g_autoptr(AwImage) image = frame();
  g_autoptr(TiffBytes) t = tiff_bytes_new(FALSE);
  tiff_bytes_grey(t, SIDE, SIDE, 16, image->pixels, 2 * SIDE * SIDE);
  tiff_bytes_end_page(t);
  g_autofree char *plain = tiff_bytes_save(t, folder, "plain.tif", 0);
  g_autofree char *packed = g_build_filename(folder, "deflate.tif", NULL);
  if (!aw_image_write_tiff(image, packed, 0.5, NULL))
    return;
  double read_us = (double)best_load_us(plain), least_us = (double)best_plain_read_us(plain);
  printf("frame 2048 x 2048, 16 bit, plain:   %7.2f ms, %.2f times open + read alone\n", read_us / 1e3,
         read_us / least_us);
  double deflate_us = (double)best_load_us(packed), zlib_us = (double)best_inflate_us(image);
  printf("frame 2048 x 2048, 16 bit, Deflate: %7.2f ms, %.2f times zlib's inflate alone\n", deflate_us / 1e3,
         deflate_us / zlib_us);
}

static void put(GByteArray *out, guint64 value, guint n_bytes)
{
  const guint64 little = GUINT64_TO_LE(value);
  g_byte_array_append(out, (const guint8 *)&little, n_bytes);
}

static void put_tag(GByteArray *out, guint tag, guint type, guint64 n, guint64 value)
{
  put(out, tag, 2);
  put(out, type, 2);
  put(out, n, 8);
  put(out, value, 8);
}

/* The BigTIFF's directory; all its tiles are the same Deflate bytes, so that it fits any disk. */
static gboolean write_big(const char *path)
{
  g_autoptr(GByteArray) out = g_byte_array_new();
  g_autoptr(AwImage) image = frame();
  uLongf n = compressBound(2 * TILE * TILE);
  g_autofree guint8 *packed = g_malloc(n);
  compress(packed, &n, image->pixels, 2 * TILE * TILE);
  guint64 across = (BIG + TILE - 1) / TILE, n_tiles = across * across;
  g_byte_array_append(out, (const guint8 *)"II+\0\x08\0\0\0", 8);
  put(out, 16, 8);
  guint64 lists = 16 + 8 + 10 * 20 + 8, tile_at = lists + 2 * 8 * n_tiles;
  put(out, 10, 8);
  put_tag(out, 256, 4, 1, BIG);
  put_tag(out, 257, 4, 1, BIG);
  put_tag(out, 258, 3, 1, 16);
  put_tag(out, 259, 3, 1, 8);
  put_tag(out, 262, 3, 1, 1);
  put_tag(out, 277, 3, 1, 1);
  put_tag(out, 322, 4, 1, TILE);
  put_tag(out, 323, 4, 1, TILE);
  put_tag(out, 324, 16, n_tiles, lists);
  put_tag(out, 325, 16, n_tiles, lists + 8 * n_tiles);
  put(out, 0, 8);
  for (guint64 i = 0; i < 2 * n_tiles; i++)
    put(out, i < n_tiles ? tile_at : n, 8);
  g_byte_array_append(out, packed, (guint)n);
  return g_file_set_contents(path, (const char *)out->data, out->len, NULL) &&
         truncate(path, (off_t)BIG * BIG * 2 / 1000) == 0;
}

static void big(const char *folder)
{
  g_autofree char *path = g_build_filename(folder, "big.tif", NULL);
  g_autoptr(GError) error = NULL;
  if (!write_big(path))
    return;
  g_autoptr(AwImageReader) reader = aw_image_reader_open(path, 0, -1, &error);
  gint64 from = cpu_us();
  for (int y = 0; reader && y < BIG; y += BLOCK)
    for (int x = 0; x < BIG; x += BLOCK) {
      AwRect rect = { x, y, MIN(x + BLOCK, BIG), MIN(y + BLOCK, BIG) };
      g_autoptr(AwImage) block = aw_image_reader_read(reader, rect, &error);
      if (!block)
        x = y = BIG;
    }
  struct rusage use;
  getrusage(RUSAGE_SELF, &use);
  if (error)
    printf("tiled BigTIFF: %s\n", error->message);
  else
    printf("tiled BigTIFF 30000 x 30000, Deflate: %.1f s, %ld MiB resident at most\n", (double)(cpu_us() - from) / 1e6,
           use.ru_maxrss / 1024);
}

int main(void)
{
  char *folder = aw_scratch_new();
  frames(folder);
  big(folder);
  aw_scratch_remove(folder);
  return 0;
}

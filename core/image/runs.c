/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "image/runs.h"

#include <string.h>

#include "image/plane.h"

/*
 * Components by runs and a union of equivalent labels, two passes over the runs (Rosenfeld and Pfaltz, J. ACM 13:471,
 * 1966).
 */

void aw_mask_runs_free(AwMaskRuns *runs)
{
  if (!runs)
    return;
  g_free(runs->run);
  g_free(runs->part);
  g_free(runs);
}

static guint32 root_of(guint32 *parent, guint32 i)
{
  while (parent[i] != i) {
    parent[i] = parent[parent[i]];
    i = parent[i];
  }
  return i;
}

static void join(guint32 *parent, guint32 a, guint32 b)
{
  a = root_of(parent, a);
  b = root_of(parent, b);
  parent[MAX(a, b)] = MIN(a, b);
}

/* The first column from x on whose byte is (not) `wanted`; eight bytes at a time over long stretches. */
static int skip(const guint8 *row, int x, int width, guint8 wanted, gboolean while_equal)
{
  guint8 alike = while_equal ? wanted : (guint8)!wanted;
  guint64 pattern = alike * G_GUINT64_CONSTANT(0x0101010101010101), word;
  for (; x + 8 <= width; x += 8) {
    memcpy(&word, row + x, sizeof word);
    if (word != pattern)
      break;
  }
  while (x < width && (row[x] == wanted) == while_equal)
    x++;
  return x;
}

static void find_runs(const guint8 *mask, int width, int height, guint8 wanted, GArray *runs)
{
  for (int y = 0; y < height; y++) {
    const guint8 *row = mask + (gsize)y * (gsize)width;
    for (int x = skip(row, 0, width, wanted, FALSE); x < width;) {
      int end = skip(row, x, width, wanted, TRUE);
      AwMaskRun run = { y, x, end, 0 };
      g_array_append_val(runs, run);
      x = skip(row, end, width, wanted, FALSE);
    }
  }
}

static void join_runs(const AwMaskRun *run, gsize n, int reach, guint32 *parent)
{
  for (gsize i = 0, above = 0; i < n; i++) {
    while (above < i &&
           (run[above].y < run[i].y - 1 || (run[above].y == run[i].y - 1 && run[above].x1 + reach <= run[i].x0)))
      above++;
    for (gsize j = above; j < i && run[j].y == run[i].y - 1 && run[j].x0 < run[i].x1 + reach; j++)
      join(parent, (guint32)i, (guint32)j);
  }
}

static void number_parts(AwMaskRuns *r, guint32 *parent)
{
  g_autofree guint32 *number = g_new(guint32, r->n_runs + 1);
  for (gsize i = 0; i < r->n_runs; i++)
    if (root_of(parent, (guint32)i) == i)
      number[i] = r->n_parts++;
  r->part = g_new0(AwMaskPart, r->n_parts + 1);
  for (gsize i = 0; i < r->n_runs; i++) {
    AwMaskRun *run = &r->run[i];
    run->part = number[root_of(parent, (guint32)i)];
    AwMaskPart *p = &r->part[run->part];
    AwRect *b = &p->box;
    *b = p->n_px == 0 ? (AwRect){ run->x0, run->y, run->x1, run->y + 1 }
                      : (AwRect){ MIN(b->x0, run->x0), b->y0, MAX(b->x1, run->x1), run->y + 1 };
    p->n_px += run->x1 - run->x0;
  }
}

AwMaskRuns *aw_mask_runs(const guint8 *mask, int width, int height, guint8 wanted, gboolean diagonal)
{
  GArray *runs = g_array_new(FALSE, FALSE, sizeof(AwMaskRun));
  find_runs(mask, width, height, wanted, runs);
  AwMaskRuns *r = g_new0(AwMaskRuns, 1);
  r->n_runs = runs->len;
  r->run = (AwMaskRun *)(void *)g_array_free(runs, FALSE);
  g_autofree guint32 *parent = g_new(guint32, r->n_runs + 1);
  for (gsize i = 0; i < r->n_runs; i++)
    parent[i] = (guint32)i;
  join_runs(r->run, r->n_runs, diagonal ? 1 : 0, parent);
  number_parts(r, parent);
  return r;
}

static void set_run(guint8 *mask, int width, const AwMaskRun *run, guint8 value)
{
  memset(mask + (gsize)run->y * (gsize)width + run->x0, value, (gsize)(run->x1 - run->x0));
}

void aw_mask_fill_holes(guint8 *mask, int width, int height, gint64 max_px)
{
  g_autoptr(AwMaskRuns) r = aw_mask_runs(mask, width, height, 0, FALSE);
  for (gsize i = 0; i < r->n_runs; i++) {
    const AwMaskPart *p = &r->part[r->run[i].part];
    gboolean outer = p->box.x0 == 0 || p->box.y0 == 0 || p->box.x1 == width || p->box.y1 == height;
    if (!outer && p->n_px <= max_px)
      set_run(mask, width, &r->run[i], 1);
  }
}

gint64 aw_mask_keep_largest(guint8 *mask, int width, int height)
{
  g_autoptr(AwMaskRuns) r = aw_mask_runs(mask, width, height, 1, TRUE);
  guint32 best = 0;
  for (guint32 i = 1; i < r->n_parts; i++)
    if (r->part[i].n_px > r->part[best].n_px)
      best = i;
  for (gsize i = 0; i < r->n_runs && r->n_parts > 1; i++)
    if (r->run[i].part != best)
      set_run(mask, width, &r->run[i], 0);
  return r->n_parts ? r->part[best].n_px : 0;
}

AW_HOT static void erode_row(const guint8 *restrict up, const guint8 *restrict mid, const guint8 *restrict down,
                             guint8 *restrict out, int width)
{
  for (int x = 1; x < width - 1; x++)
    out[x] = up[x] & mid[x] & down[x] & mid[x - 1] & mid[x + 1];
}

AW_HOT static void dilate_row(const guint8 *restrict up, const guint8 *restrict mid, const guint8 *restrict down,
                              guint8 *restrict out, int width)
{
  for (int x = 1; x < width - 1; x++)
    out[x] = up[x] | mid[x] | down[x] | mid[x - 1] | mid[x + 1];
}

static void open_pass(const guint8 *in, guint8 *out, int width, int height, gboolean erode)
{
  gsize w = (gsize)width;
  for (int y = 0; y < height; y++) {
    const guint8 *mid = in + (gsize)y * w, *up = y > 0 ? mid - w : mid, *down = y + 1 < height ? mid + w : mid;
    guint8 *row = out + (gsize)y * w;
    for (int x = 0; x < width; x += MAX(width - 1, 1)) {
      guint8 left = mid[MAX(x - 1, 0)], right = mid[MIN(x + 1, width - 1)];
      row[x] = erode ? up[x] & mid[x] & down[x] & left & right : up[x] | mid[x] | down[x] | left | right;
    }
    (erode ? erode_row : dilate_row)(up, mid, down, row, width);
  }
}

void aw_mask_open(guint8 *mask, int width, int height, guint8 *spare)
{
  open_pass(mask, spare, width, height, TRUE);
  open_pass(spare, mask, width, height, FALSE);
}

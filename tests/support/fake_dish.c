/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "support/fake_dish.h"

#include <math.h>

#include "base/random.h"
#include "image/overview.h"

#define N_OUTLINE 36

FakeDishSettings fake_dish_defaults(void)
{
  return (FakeDishSettings){ .n_across = 3,
                             .n_down = 3,
                             .side_px = 1024,
                             .overview_px = 341,
                             .overlap_frac = 0.1,
                             .um_per_px = 0.65,
                             .camera_rad = 0.07,
                             .n_nuclei = 500,
                             .nucleus_um = 16,
                             .seed = 7 };
}

static void free_frame(gpointer p)
{
  AwFrame *frame = p;
  g_clear_pointer(&frame->overview, g_bytes_unref);
  g_free(frame);
}

static void free_nucleus(gpointer p)
{
  AwNucleus *nucleus = p;
  g_free(nucleus->outline);
  g_free(nucleus);
}

AwNucleus *fake_dish_add(FakeDish *dish, AwScanPoint q, double major_um, double minor_um, double angle_rad)
{
  AwNucleus *n = g_new0(AwNucleus, 1);
  n->id = dish->nuclei->len + 1;
  n->centroid = q;
  n->area = G_PI / 4 * major_um * minor_um;
  n->diameter = sqrt(major_um * minor_um);
  n->major = major_um;
  n->minor = minor_um;
  n->angle_rad = angle_rad;
  n->n_outline = N_OUTLINE;
  n->outline = g_new(AwScanPoint, N_OUTLINE);
  for (int i = 0; i < N_OUTLINE; i++) {
    double t = 2 * G_PI * i / N_OUTLINE, a = major_um / 2 * cos(t), b = minor_um / 2 * sin(t);
    n->outline[i] = (AwScanPoint){ q.x_um + a * cos(angle_rad) - b * sin(angle_rad),
                                   q.y_um + a * sin(angle_rad) + b * cos(angle_rad) };
  }
  g_ptr_array_add(dish->nuclei, n);
  return n;
}

/* A picture as core/image/overview.h defines it: pixel X is the middle of k plane pixels. */
static void paint_nucleus(const FakeDish *dish, const AwFrame *frame, const AwNucleus *n, AwImage *out, int k)
{
  AwPixelPoint c = aw_frame_centre(frame->width_px, frame->height_px);
  AwPixelPoint p = aw_scan_to_pixel(&dish->map, frame->stage, c, n->centroid);
  double reach = n->major / aw_pixel_map_scale(&dish->map) / k + 3, level = 90 + 110 * fmod((double)n->id * 0.618, 1);
  double mx = (p.x_px + 0.5) / k - 0.5, my = (p.y_px + 0.5) / k - 0.5;
  for (int y = MAX(0, (int)(my - reach)); y < MIN(out->height_px, my + reach); y++)
    for (int x = MAX(0, (int)(mx - reach)); x < MIN(out->width_px, mx + reach); x++) {
      AwPixelPoint at = { (x + 0.5) * k - 0.5, (y + 0.5) * k - 0.5 };
      AwScanPoint q = aw_pixel_to_scan(&dish->map, frame->stage, c, at);
      double dx = q.x_um - n->centroid.x_um, dy = q.y_um - n->centroid.y_um;
      double a = (dx * cos(n->angle_rad) + dy * sin(n->angle_rad)) / (n->major / 2);
      double b = (-dx * sin(n->angle_rad) + dy * cos(n->angle_rad)) / (n->minor / 2);
      float *grey = (float *)out->pixels + y * out->width_px + x;
      *grey = (float)MAX((double)*grey, level / (1 + exp((hypot(a, b) - 1) * 12)));
    }
}

static GBytes *picture(const FakeDish *dish, const AwFrame *frame, int max_side_px, guint64 item)
{
  AwRandom r = aw_random_stream(99, item);
  int k = aw_overview_factor(frame->width_px, frame->height_px, max_side_px);
  g_autoptr(AwImage) grey =
      aw_image_new((frame->width_px + k - 1) / k, (frame->height_px + k - 1) / k, AW_SAMPLE_F32, NULL);
  for (guint i = 0; i < dish->nuclei->len; i++)
    paint_nucleus(dish, frame, dish->nuclei->pdata[i], grey, k);
  for (int i = 0; i < grey->width_px * grey->height_px; i++)
    ((float *)grey->pixels)[i] += (float)(20 + 4 * aw_random_normal(&r));
  return aw_image_overview(grey, MAX(grey->width_px, grey->height_px), 0, 255, NULL);
}

void fake_dish_paint(FakeDish *dish, int overview_px)
{
  for (guint i = 0; i < dish->frames->len; i++) {
    AwFrame *frame = dish->frames->pdata[i];
    g_clear_pointer(&frame->overview, g_bytes_unref);
    frame->overview = picture(dish, frame, overview_px, i);
  }
}

static void add_frames(FakeDish *dish, const FakeDishSettings *s)
{
  double step = s->side_px * s->um_per_px * (1 - s->overlap_frac);
  for (int j = 0; j < s->n_down; j++)
    for (int i = 0; i < s->n_across; i++) {
      AwFrame *frame = g_new0(AwFrame, 1);
      frame->width_px = frame->height_px = s->side_px;
      frame->channel = -1;
      frame->stage = (AwScanPoint){ 12000 + i * step, -4000 + j * step };
      g_ptr_array_add(dish->frames, frame);
    }
}

static gboolean is_free(const FakeDish *dish, AwScanPoint q, double distance)
{
  for (guint i = 0; i < dish->nuclei->len; i++) {
    const AwNucleus *n = dish->nuclei->pdata[i];
    if (hypot(n->centroid.x_um - q.x_um, n->centroid.y_um - q.y_um) < distance)
      return FALSE;
  }
  return TRUE;
}

static void scatter(FakeDish *dish, const FakeDishSettings *s)
{
  AwRandom r = aw_random_stream(s->seed, 0);
  double step = s->side_px * s->um_per_px * (1 - s->overlap_frac);
  gboolean crowded = s->n_nuclei > 5000; /* testing every pair would take too long */
  for (gsize tries = 0; dish->nuclei->len < s->n_nuclei && tries < 50 * s->n_nuclei; tries++) {
    AwScanPoint q = { 12000 + (aw_random_unit(&r) * s->n_across - 0.5) * step,
                      -4000 + (aw_random_unit(&r) * s->n_down - 0.5) * step };
    double major = s->nucleus_um * (0.85 + 0.5 * aw_random_unit(&r)), angle = G_PI * aw_random_unit(&r);
    double minor = major * (0.65 + 0.3 * aw_random_unit(&r));
    if (crowded || is_free(dish, q, 1.15 * s->nucleus_um))
      fake_dish_add(dish, q, major, minor, angle);
  }
}

static int by_place(gconstpointer a, gconstpointer b)
{
  const AwNucleus *x = *(AwNucleus *const *)a, *y = *(AwNucleus *const *)b;
  if (x->frame != y->frame)
    return x->frame - y->frame;
  return x->centroid.y_um < y->centroid.y_um ? -1 : x->centroid.y_um > y->centroid.y_um;
}

/* Numbers nuclei as a scan does: frame by frame, row by row. */
static void number(FakeDish *dish, const FakeDishSettings *s)
{
  double step = s->side_px * s->um_per_px * (1 - s->overlap_frac);
  for (guint i = 0; i < dish->nuclei->len; i++) {
    AwNucleus *n = dish->nuclei->pdata[i];
    int column = (int)((n->centroid.x_um - 12000) / step + 0.5), row = (int)((n->centroid.y_um + 4000) / step + 0.5);
    n->frame = row * s->n_across + column;
  }
  g_ptr_array_sort(dish->nuclei, by_place);
  for (guint i = 0; i < dish->nuclei->len; i++)
    ((AwNucleus *)dish->nuclei->pdata[i])->id = i + 1;
}

static void decide(FakeDish *dish, guint64 seed)
{
  AwRandom r = aw_random_stream(seed, 1);
  dish->state = g_new0(AwState, dish->nuclei->len + 1);
  for (guint i = 0; i < dish->nuclei->len; i++) {
    double u = aw_random_unit(&r);
    dish->state[i] = u < 0.45   ? AW_STATE_ACCEPTED
                     : u < 0.65 ? AW_STATE_PROPOSED
                     : u < 0.75 ? AW_STATE_REJECTED
                                : AW_STATE_FOUND;
  }
}

static gint64 nearest(const FakeDish *dish, const gboolean *done, AwScanPoint at)
{
  gint64 best = -1;
  double least = INFINITY;
  for (guint i = 0; i < dish->nuclei->len; i++) {
    const AwNucleus *n = dish->nuclei->pdata[i];
    double dx = n->centroid.x_um - at.x_um, dy = n->centroid.y_um - at.y_um, d = dx * dx + dy * dy;
    if (dish->state[i] == AW_STATE_ACCEPTED && !done[i] && d < least) {
      least = d;
      best = i;
    }
  }
  return best;
}

static void order(FakeDish *dish)
{
  g_autofree gboolean *done = g_new0(gboolean, dish->nuclei->len + 1);
  AwScanPoint at = { 0, 0 };
  for (gint64 i = nearest(dish, done, at); i >= 0; i = nearest(dish, done, at)) {
    const AwNucleus *n = dish->nuclei->pdata[i];
    done[i] = TRUE;
    at = n->centroid;
    g_array_append_val(dish->tour, n->id);
  }
}

FakeDish *fake_dish_new(const FakeDishSettings *s)
{
  FakeDish *dish = g_new0(FakeDish, 1);
  double c = s->um_per_px * cos(s->camera_rad), n = s->um_per_px * sin(s->camera_rad), m = s->mirrored ? -1 : 1;
  dish->map = (AwPixelMap){ { c * m, -n, n * m, c }, AW_ORIGIN_FITTED, 0.2 };
  dish->frames = g_ptr_array_new_with_free_func(free_frame);
  dish->nuclei = g_ptr_array_new_with_free_func(free_nucleus);
  dish->tour = g_array_new(FALSE, FALSE, sizeof(gint64));
  add_frames(dish, s);
  scatter(dish, s);
  number(dish, s);
  if (s->overview_px > 0)
    fake_dish_paint(dish, s->overview_px);
  decide(dish, s->seed);
  order(dish);
  return dish;
}

void fake_dish_free(FakeDish *dish)
{
  if (!dish)
    return;
  g_ptr_array_unref(dish->frames);
  g_ptr_array_unref(dish->nuclei);
  g_array_unref(dish->tour);
  g_free(dish->state);
  g_free(dish);
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "tables.h"

#include "base/text.h"

static void number(GString *out, double value, int decimals)
{
  g_autofree char *text = aw_text_from_double(value, decimals);
  g_string_append_printf(out, ",%s", text);
}

char *sample_scan_table(const SampleDish *dish)
{
  GString *out = g_string_new("file,stage_x_um,stage_y_um,pixel_um,taken_at\n");
  for (int i = 0; i < SAMPLE_N_FRAMES; i++) {
    const SampleFrame *frame = dish->frame + i;
    g_autofree char *time = aw_text_from_time(frame->taken_at_unix_s);
    g_string_append(out, frame->file);
    number(out, frame->reading.x_um, 1);
    number(out, frame->reading.y_um, 1);
    number(out, SAMPLE_NOMINAL_PIXEL_UM, 2);
    g_string_append_printf(out, ",%s\n", time);
  }
  return g_string_free(out, FALSE);
}

/* How an object stands in a frame: not at all, in part, or whole with its margin. */
typedef enum { VIEW_NONE, VIEW_PART, VIEW_WHOLE } View;

static View view_of(const AwTruth *truth, const AwRenderView *view)
{
  g_autofree AwPixelPoint *p = aw_render_outline(truth, view);
  double m = SAMPLE_WHOLE_MARGIN_PX, right = view->width_px - 1, low = view->height_px - 1;
  gsize n_seen = 0, n_deep = 0;
  for (gsize i = 0; i < truth->n_outline; i++) {
    double x = p[i].x_px, y = p[i].y_px;
    n_seen += x >= 0.0 && y >= 0.0 && x <= right && y <= low;
    n_deep += x >= m && y >= m && x <= right - m && y <= low - m;
  }
  return n_deep == truth->n_outline ? VIEW_WHOLE : n_seen ? VIEW_PART : VIEW_NONE;
}

/* Of the pixels whose centre lies inside the outline, the part that stands at the camera's largest count. */
static double clipped_frac(const AwTruth *truth, const AwRenderView *view, const AwImage *image)
{
  AwPixelPoint c = aw_frame_centre(view->width_px, view->height_px);
  AwPixelPoint at = aw_scan_to_pixel(&view->map, view->stage, c, truth->centroid);
  int reach = (int)ceil(truth->reach_um / aw_pixel_map_scale(&view->map)) + 1;
  int x0 = MAX((int)at.x_px - reach, 0), x1 = MIN((int)at.x_px + reach, view->width_px - 1);
  int y0 = MAX((int)at.y_px - reach, 0), y1 = MIN((int)at.y_px + reach, view->height_px - 1);
  int n = 0, n_clipped = 0;
  for (int y = y0; y <= y1; y++)
    for (int x = x0; x <= x1; x++)
      if (aw_truth_contains(truth, aw_pixel_to_scan(&view->map, view->stage, c, (AwPixelPoint){ x, y }))) {
        n++;
        n_clipped += aw_image_value(image, x, y) >= image->full_scale;
      }
  return n ? (double)n_clipped / n : 0.0;
}

static void truth_row(GString *out, const SampleDish *dish, AwImage *const *image, guint index)
{
  const AwTruth *t = dish->truths->pdata[index];
  int n_whole = 0, n_views = 0;
  double clipped = 0.0;
  for (int i = 0; i < SAMPLE_N_FRAMES; i++) {
    View seen = view_of(t, &dish->frame[i].view);
    n_views += seen != VIEW_NONE;
    n_whole += seen == VIEW_WHOLE;
    if (seen != VIEW_NONE)
      clipped = MAX(clipped, clipped_frac(t, &dish->frame[i].view, image[i]));
  }
  if (!n_views)
    return;
  g_string_append_printf(out, "%u,%s", index + 1, aw_truth_kind_name(t->kind));
  number(out, t->centroid.x_um, 3);
  number(out, t->centroid.y_um, 3);
  number(out, t->area_um2, 2);
  number(out, t->major_um, 3);
  number(out, t->minor_um, 3);
  number(out, t->angle_rad, 4);
  number(out, t->light_e, 0);
  number(out, MIN(t->gap_um, SAMPLE_FAR_GAP_UM), 2);
  double free_um = SAMPLE_SEPARATE_GAP_UM + SAMPLE_SEPARATE_BLURS * t->blur_um;
  g_string_append_printf(out, ",%d,%d,%d,%d\n", t->gap_um >= free_um, n_whole, clipped > SAMPLE_SATURATED_FRAC,
                         t->blur_um >= SAMPLE_DEFOCUSED_BLUR_UM);
}

char *sample_truth_table(const SampleDish *dish, AwImage *const *image)
{
  GString *out = g_string_new("id,kind,x_um,y_um,area_um2,major_um,minor_um,angle_rad,light_e,gap_um,separate,n_whole,"
                              "saturated,defocused\n");
  for (guint i = 0; i < dish->truths->len; i++)
    truth_row(out, dish, image, i);
  return g_string_free(out, FALSE);
}

char *sample_views_table(const SampleDish *dish)
{
  GString *out = g_string_new("id,file,x_px,y_px,whole\n");
  for (guint i = 0; i < dish->truths->len; i++)
    for (int k = 0; k < SAMPLE_N_FRAMES; k++) {
      const AwTruth *t = dish->truths->pdata[i];
      const AwRenderView *view = &dish->frame[k].view;
      View seen = view_of(t, view);
      if (seen == VIEW_NONE)
        continue;
      AwPixelPoint centre = aw_frame_centre(view->width_px, view->height_px);
      AwPixelPoint p = aw_scan_to_pixel(&view->map, view->stage, centre, t->centroid);
      g_string_append_printf(out, "%u,%s", i + 1, dish->frame[k].file);
      number(out, p.x_px, 3);
      number(out, p.y_px, 3);
      g_string_append_printf(out, ",%d\n", seen == VIEW_WHOLE);
    }
  return g_string_free(out, FALSE);
}

char *sample_outline_table(const GPtrArray *truths)
{
  GString *out = g_string_new("id,point,x_um,y_um\n");
  for (guint i = 0; i < truths->len; i++) {
    const AwTruth *t = truths->pdata[i];
    for (gsize k = 0; k < t->n_outline; k++) {
      g_string_append_printf(out, "%u,%u", i + 1, (guint)k + 1);
      number(out, t->outline[k].x_um, 3);
      number(out, t->outline[k].y_um, 3);
      g_string_append_c(out, '\n');
    }
  }
  return g_string_free(out, FALSE);
}

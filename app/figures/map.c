/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "figures/map.h"

#include <math.h>
#include <string.h>

#include "base/text.h"
#include "figures/canvas.h"
#include "figures/label.h"
#include "figures/map_parts.h"
#include "figures/scalebar.h"

#define MARGIN 34.0  /* white rim of the page, u */
#define GAP 26.0     /* between panel and explanations, u */
#define BAR_ROW 46.0 /* row of the scale bar under the panel, u */

/* A free rectangle of the page. */
typedef struct {
  double x, y, w, h;
} Room;

AwPixelPoint aw_map_page_point(const AwMapPage *page, AwScanPoint q)
{
  AwPixelPoint p = aw_upright_from_scan(&page->upright, q);
  return (AwPixelPoint){ page->x + (p.x_px - page->box.x0) * page->scale,
                         page->y + (p.y_px - page->box.y0) * page->scale };
}

/* Title and subtitle; takes their height off the room. */
static void draw_heading(const AwMapPage *page, Room *room)
{
  double u = page->u, used = 0;
  AwLabel title = { .size = 30 * u, .bold = TRUE, .ink = aw_ink_text, .max_width = room->w };
  AwLabel subtitle = { .size = 17 * u, .ink = aw_ink_faint, .max_width = room->w };
  if (page->content->title && *page->content->title)
    used += aw_label_draw(page->cr, &title, page->content->title, room->x, room->y) + 2 * u;
  if (page->content->subtitle && *page->content->subtitle)
    used += aw_label_draw(page->cr, &subtitle, page->content->subtitle, room->x, room->y + used);
  used += used > 0 ? 18 * u : 0;
  room->y += used;
  room->h -= used;
}

/* Notes at the foot, from the bottom up and never more than a quarter of the room. */
static void draw_notes(const AwMapPage *page, Room *room)
{
  const char *const *notes = page->content->notes;
  double u = page->u, limit = room->h / 4, used = 0, height;
  AwLabel label = { .size = 12.5 * u, .ink = aw_ink_faint, .max_width = room->w, .max_lines = 2 };
  guint n = 0;
  for (; notes && notes[n]; n++) {
    aw_label_measure(page->cr, &label, notes[n], NULL, &height);
    if (used + height > limit)
      break;
    used += height + 2 * u;
  }
  double y = room->y + room->h - used;
  for (guint i = 0; i < n; i++)
    y += aw_label_draw(page->cr, &label, notes[i], room->x, y) + 2 * u;
  room->h -= used > 0 ? used + 10 * u : 0;
}

static double scale_for(const AwMapPage *page, double width, double height)
{
  return MIN(width / (page->box.x1 - page->box.x0), height / (page->box.y1 - page->box.y0));
}

/* Explanations stand right of the panel, or under it where a wide dish is then drawn larger. Returns TRUE for under. */
static gboolean place_panel(AwMapPage *page, const Room *room)
{
  double u = page->u, side = (AW_MAP_SIDE_WIDTH + GAP) * u;
  double w = MAX(room->w - side, 20 * u), h = MAX(room->h - BAR_ROW * u, 20 * u);
  double h_above = MAX(h - (AW_MAP_SIDE_ROW_HEIGHT + GAP) * u, 20 * u);
  gboolean under = FALSE;
  if (page->placed) {
    under = scale_for(page, room->w, h_above) > 1.1 * scale_for(page, w, h);
    page->scale = under ? scale_for(page, room->w, h_above) : scale_for(page, w, h);
    w = (page->box.x1 - page->box.x0) * page->scale;
    h = (page->box.y1 - page->box.y0) * page->scale;
  }
  page->x = room->x + MAX(0, room->w - w - (under ? 0 : side)) / 2;
  page->y = room->y;
  page->width = w;
  page->height = h;
  return under;
}

static void draw_empty_panel(const AwMapPage *page)
{
  AwLabel label = {
    .size = 22 * page->u, .ink = aw_ink_faint, .align = AW_ALIGN_CENTRE, .max_width = page->width * 0.8, .max_lines = 4
  };
  gboolean any = page->content->frames && page->content->frames->len > 0;
  const char *text = any ? "The frames cannot be placed: the pixel map or the stage readings are not usable."
                         : "No frames yet: this dish has no scan.";
  cairo_rectangle(page->cr, page->x, page->y, page->width, page->height);
  cairo_set_source_rgb(page->cr, 0.95, 0.955, 0.96);
  cairo_fill(page->cr);
  aw_label_draw(page->cr, &label, text, page->x + page->width / 2, page->y + page->height * 0.45);
}

static void draw_dish(const AwMapPage *page)
{
  cairo_save(page->cr);
  cairo_rectangle(page->cr, page->x, page->y, page->width, page->height);
  cairo_clip(page->cr);
  aw_map_draw_pictures(page);
  aw_map_draw_tour_line(page);
  aw_map_draw_nuclei(page);
  aw_map_draw_tour_signs(page);
  cairo_restore(page->cr);
}

/* Under the panel: the scale bar, and what a pixel is. */
static void draw_scale(const AwMapPage *page)
{
  double u = page->u, y = page->y + page->height + 10 * u;
  AwMatrix a = page->upright.um_per_px;
  double um_per_px = hypot(a.xx, a.yx);
  aw_scalebar_draw(page->cr, page->x, y, page->width / 3, page->scale / um_per_px, u);
  AwLabel label = { .size = 13.5 * u, .ink = aw_ink_faint, .align = AW_ALIGN_RIGHT, .max_width = page->width * 0.6 };
  g_autofree char *size = aw_text_from_double(aw_pixel_map_scale(&page->content->map), 4);
  if (g_str_has_suffix(size, "0"))
    size[strlen(size) - 1] = '\0';
  g_autofree char *text = g_strdup_printf("%s µm per pixel, %s", size, aw_origin_name(page->content->map.origin));
  aw_label_draw(page->cr, &label, text, page->x + page->width, y);
}

static void place_dish(AwMapPage *page)
{
  GPtrArray *frames = page->content->frames;
  AwScanPoint q0 = { 0, 0 };
  for (guint i = frames ? frames->len : 0; i > 0; i--) {
    const AwFrame *frame = frames->pdata[i - 1];
    if (aw_scan_point_is_sane(frame->stage))
      q0 = frame->stage;
  }
  page->placed = aw_upright_make(&page->content->map, q0, &page->upright);
  if (page->placed)
    page->box = aw_upright_dish_box(&page->upright, frames, page->content->nuclei);
  page->placed = page->placed && page->box.x1 > page->box.x0 && page->box.y1 > page->box.y0;
}

void aw_map_draw(const AwMapContent *content, cairo_t *cr, double width_px, double height_px)
{
  g_return_if_fail(content && cr && width_px > 0 && height_px > 0);
  AwMapPage page = { .content = content, .cr = cr, .u = aw_style_unit(width_px, height_px) };
  Room room = { MARGIN * page.u, MARGIN * page.u, width_px - 2 * MARGIN * page.u, height_px - 2 * MARGIN * page.u };
  cairo_save(cr);
  cairo_set_source_rgb(cr, 1, 1, 1);
  cairo_paint(cr);
  draw_heading(&page, &room);
  draw_notes(&page, &room);
  place_dish(&page);
  gboolean under = place_panel(&page, &room);
  aw_map_page_measure(&page);
  if (page.placed) {
    draw_dish(&page);
    draw_scale(&page);
  } else {
    draw_empty_panel(&page);
  }
  if (under)
    aw_map_draw_side(&page, room.x, page.y + page.height + (BAR_ROW + GAP) * page.u, room.w, TRUE);
  else
    aw_map_draw_side(&page, page.x + page.width + GAP * page.u, page.y, AW_MAP_SIDE_WIDTH * page.u, FALSE);
  aw_map_page_clear(&page);
  cairo_restore(cr);
}

gboolean aw_map_write(const AwMapContent *content, const char *path, int width_px, int height_px, GError **error)
{
  g_return_val_if_fail(content && path, FALSE);
  g_autoptr(AwCanvas) canvas = aw_canvas_open(path, width_px, height_px, error);
  if (!canvas)
    return FALSE;
  aw_canvas_set_title(canvas, content->title ? content->title : "");
  aw_map_draw(content, aw_canvas_cairo(canvas), width_px, height_px);
  return aw_canvas_commit(canvas, error);
}

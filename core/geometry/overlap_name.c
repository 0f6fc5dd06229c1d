/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/text.h"
#include "geometry/overlap_parts.h"

#define NEAR_TURN_RAD (15 * G_PI / 180)
#define NEAR_SCALE 0.1

/* The eight ways in which two axes can be signed and exchanged, and what each means for stage moves. */
static const struct {
  AwMatrix m;
  const char *text;
} changes[] = {
  { { 1, 0, 0, 1 }, "" },
  { { -1, 0, 0, 1 }, "the x readings of the stage run the other way" },
  { { 1, 0, 0, -1 }, "the y readings of the stage run the other way" },
  { { -1, 0, 0, -1 }, "both readings of the stage run the other way" },
  { { 0, -1, 1, 0 }, "the camera is turned by 90 degrees" },
  { { 0, 1, -1, 0 }, "the camera is turned by -90 degrees" },
  { { 0, 1, 1, 0 }, "the x and y readings of the stage are exchanged" },
  { { 0, -1, -1, 0 }, "the x and y readings of the stage are exchanged and run the other way" },
};

/* The angle by which m turns, after undoing the signed exchange p; pi when it mirrors even then. */
static double turn_after(AwMatrix m, AwMatrix p)
{
  AwMatrix back = { p.xx, p.yx, p.xy, p.yy };
  AwMatrix r = aw_matrix_multiply(back, m);
  return aw_matrix_det(r) > 0 ? atan2(r.yx - r.xy, r.xx + r.yy) : G_PI;
}

static AwMatrix relative(AwMatrix start, AwMatrix fitted, double *scale)
{
  AwMatrix m = aw_matrix_multiply(fitted, aw_matrix_inverse(start));
  *scale = sqrt(fabs(aw_matrix_det(m)));
  return m;
}

gboolean aw_overlap_is_near(AwMatrix start, AwMatrix fitted)
{
  double scale = 0;
  AwMatrix m = relative(start, fitted, &scale);
  return fabs(turn_after(m, changes[0].m)) <= NEAR_TURN_RAD && fabs(log(scale)) <= log1p(NEAR_SCALE);
}

static void add_clause(GString *text, const char *clause)
{
  g_string_append_printf(text, "%s%s", text->len ? " and " : "", clause);
}

char *aw_overlap_name_difference(AwMatrix start, AwMatrix fitted)
{
  double scale = 0, best = INFINITY;
  gsize which = 0;
  AwMatrix m = relative(start, fitted, &scale);
  for (gsize i = 0; i < G_N_ELEMENTS(changes); i++)
    if (fabs(turn_after(m, changes[i].m)) < best) {
      best = fabs(turn_after(m, changes[i].m));
      which = i;
    }
  g_autoptr(GString) text = g_string_new(changes[which].text);
  if (best > NEAR_TURN_RAD / 5) {
    g_autofree char *degrees = aw_text_from_double(turn_after(m, changes[which].m) * 180 / G_PI, 1);
    g_autofree char *clause = g_strdup_printf("the camera is turned by %s degrees%s", degrees, which ? " besides" : "");
    add_clause(text, clause);
  }
  if (fabs(log(scale)) > log1p(NEAR_SCALE) / 5) {
    g_autofree char *is = aw_text_from_double(sqrt(fabs(aw_matrix_det(fitted))), 4);
    g_autofree char *was = aw_text_from_double(sqrt(fabs(aw_matrix_det(start))), 4);
    g_autofree char *times = aw_text_from_double(scale, 2);
    g_autofree char *clause =
        g_strdup_printf("the pixel size is %s um instead of %s um (%s times; binning?)", is, was, times);
    add_clause(text, clause);
  }
  return g_string_free(g_steal_pointer(&text), FALSE);
}

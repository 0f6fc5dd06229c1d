/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <gsl/gsl_cdf.h>
#include <math.h>
#include <string.h>

#include "figures/calibration.h"
#include "support/check.h"

static const AwMarkPair pairs[] = { { { 0, 0 }, { 0.4, 0 } },
                                    { { 9000, 0 }, { 9000, 0.3 } },
                                    { { 0, 8000 }, { -0.2, 8000 } },
                                    { { 9000, 8000 }, { 9000.1, 8000 } } };

static gboolean draw_edge(const char *path, GError **error)
{
  g_autoptr(GArray) points = g_array_new(FALSE, FALSE, sizeof(AwEdgePoint));
  AwEdgeFit fit;
  AwEdgeSettings settings = { 0 };
  for (int i = 0; i < 21; i++) {
    AwEdgePoint p = { .position_um = i, .fraction = gsl_cdf_ugaussian_P((i - 10) / 2.5) };
    g_array_append_val(points, p);
  }
  g_assert_true(aw_edge_fit((const AwEdgePoint *)(const void *)points->data, 21, &settings, &fit, NULL));
  return aw_figure_edge(&fit, points, FALSE, 'x', path, error);
}

static gboolean draw_bead(const char *path, GError **error)
{
  g_autoptr(GArray) points = g_array_new(FALSE, FALSE, sizeof(AwBeadPoint));
  AwBeadFit fit;
  for (int i = 0; i < 49; i++) {
    double x = i % 7 - 3, y = i / 7 - 3, hit = floor(1 + 98 * exp(-(x * x + y * y) / 4));
    AwBeadPoint p = { { x, y }, 100 - hit, hit };
    g_array_append_val(points, p);
  }
  g_assert_true(aw_bead_fit((const AwBeadPoint *)(const void *)points->data, 49, FALSE, &fit, NULL));
  return aw_figure_bead(&fit, points, &(AwBeamPoint){ 1, 1 }, path, error);
}

static gboolean draw_pixel(const char *path, GError **error)
{
  g_autoptr(GArray) views = g_array_new(FALSE, FALSE, sizeof(AwMarkView));
  AwMarkMap map;
  for (int i = 0; i < 4; i++) {
    AwMarkView v = { { 100 * (i % 2) + 0.1 * (i == 3), 100 * (i / 2) }, { 200 * (i % 2), 200 * (i / 2) } };
    g_array_append_val(views, v);
  }
  g_assert_true(aw_mark_map_fit((const AwMarkView *)(const void *)views->data, 4, 0.5, &map, NULL));
  return aw_figure_pixel(&map, views, path, error);
}

static gboolean draw_marks(const char *path, gboolean errors, GError **error)
{
  AwRegistration fit;
  g_autoptr(GArray) list = g_array_new(FALSE, FALSE, sizeof(AwMarkPair));
  g_autoptr(GPtrArray) names = g_ptr_array_new_with_free_func(g_free);
  g_array_append_vals(list, pairs, 4);
  for (int i = 0; i < 4; i++)
    g_ptr_array_add(names, g_strdup_printf("mark %d", i));
  g_assert_true(aw_registration_fit(pairs, 4, AW_FIT_RIGID, FALSE, 0, &fit, NULL));
  AwMarksFigure figure = { &fit, list, names, NULL };
  return errors ? aw_figure_target_error(&figure, path, error) : aw_figure_residuals(&figure, path, error);
}

static gboolean draw_residuals(const char *path, GError **error)
{
  return draw_marks(path, FALSE, error);
}

static gboolean draw_target_error(const char *path, GError **error)
{
  return draw_marks(path, TRUE, error);
}

static gboolean draw_budget(const char *path, GError **error)
{
  AwBudgetInput in = { .um_per_px = { 0.5, 0, 0, 0.5 }, .drift_um2_per_h = NAN, .localisation_um = 0.1 };
  AwBudget budget;
  in.scan_age_s = in.check_age_s = NAN;
  aw_budget_for_dish(&in, NULL, 0, &budget);
  return aw_figure_budget(&budget, path, error);
}

static gboolean (*const figures[])(const char *path,
                                   GError **error) = { draw_edge,      draw_bead,         draw_pixel,
                                                       draw_residuals, draw_target_error, draw_budget };

/* Each figure in each kind: the right kind of file, the same bytes when drawn again, readable text in SVG. */
static void test_files(void)
{
  static const char *const names[] = { "a.png", "a.svg", "a.pdf" }, *const starts[] = { "\x89PNG", "<?xml", "%PDF" };
  char *folder = aw_scratch_new();
  for (gsize f = 0; f < G_N_ELEMENTS(figures); f++)
    for (gsize k = 0; k < G_N_ELEMENTS(names); k++) {
      GError *error = NULL;
      g_autofree char *path = g_build_filename(folder, names[k], NULL), *first = NULL, *second = NULL;
      gsize n_first, n_second;
      g_assert_true(figures[f](path, &error));
      g_assert_true(g_file_get_contents(path, &first, &n_first, NULL));
      g_assert_true(figures[f](path, &error));
      g_assert_true(g_file_get_contents(path, &second, &n_second, NULL));
      g_assert_cmpmem(first, n_first, second, n_second);
      g_assert_cmpmem(first, strlen(starts[k]), starts[k], strlen(starts[k]));
      g_assert_cmpuint(n_first, >, 2000);
    }
  aw_scratch_remove(folder);
}

static void test_refusals(void)
{
  for (gsize f = 0; f < G_N_ELEMENTS(figures); f++) {
    GError *error = NULL;
    g_assert_false(figures[f]("/tmp/a.gif", &error));
    aw_check_error(&error, AW_ERROR_UNSUPPORTED, "a.gif|.png, .svg or .pdf");
    g_assert_false(figures[f]("/no/such/folder/a.png", &error));
    aw_check_error(&error, AW_ERROR_NOT_FOUND, "/no/such/folder");
  }
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  g_test_add_func("/figures/calibration/files", test_files);
  g_test_add_func("/figures/calibration/refusals", test_refusals);
  return g_test_run();
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/* The numbers that matching is held to, on simulated dishes of known truth (any turn and flip, scale within 2 %, 30 %
 * lost, 20 % new, movement 3 um rms per axis), on fields imaged again on the beam stage (half lost), on unrelated
 * dishes, and on the nuclei of open data (centroids of the reference labels of BBBC038, one pixel taken as one um).
 * Lines
 * "# match," are the figures. Prints TAP. */
#include <stdio.h>
#include <string.h>
#include <time.h>

#include "base/text.h"
#include "geometry/match.h"
#include "image/reader.h"
#include "support/pattern.h"

static int n_tests;

static void check(const char *name, double value, const char *relation, double limit)
{
  gboolean good = relation[0] == '>' ? value >= limit : value <= limit;
  g_autofree char *v = aw_text_from_double(value, 4), *l = aw_text_from_double(limit, 4);
  g_print("%s %d - %s: %s %s %s\n", good ? "ok" : "not ok", ++n_tests, name, v, relation, l);
}

static void note(const char *name, double value, int decimals)
{
  g_autofree char *v = aw_text_from_double(value, decimals);
  g_print("# match, %s, %s\n", name, v);
}

/* What many matches of one kind came to. */
typedef struct {
  AwTestScore score;
  guint n, n_sure, n_false;                   /* matches; sure ones; sure ones whose map is wrong */
  double z2, seconds, worst_um, log10_chance; /* the last: the least of all */
} Tally;

static void add(Tally *tally, const AwTestPattern *a, const AwTestPattern *b, const AwTestChange *change)
{
  AwMatchSettings settings;
  aw_match_settings_init(&settings);
  g_auto(AwMatch) match = { 0 };
  g_autoptr(GError) error = NULL;
  AwMatchPattern pa = { a->xy_um, a->n, "the scan" }, pb = { b->xy_um, b->n, "the follow-up" };
  clock_t start = clock();
  if (!aw_match_find(pa, pb, &settings, &match, &error)) {
    g_print("not ok %d - %s\n", ++n_tests, error->message);
    return;
  }
  tally->seconds = MAX(tally->seconds, (double)(clock() - start) / CLOCKS_PER_SEC);
  tally->n++;
  tally->log10_chance = MIN(tally->log10_chance, match.log10_chance);
  if (!match.sure)
    return;
  tally->n_sure++;
  double map_error = change ? aw_test_map_error(&match, a, change) : G_MAXDOUBLE;
  tally->n_false += map_error > 30;
  if (!change || map_error > 30)
    return;
  double z = (match.movement_um - change->movement_um) / match.movement_se_um;
  tally->z2 += z * z;
  tally->worst_um = MAX(tally->worst_um, map_error);
  aw_test_score(&match, b, &tally->score);
}

static double share(gsize part, gsize whole)
{
  return (double)part / (double)MAX(whole, 1);
}

static void report(const char *name, const Tally *t, double least_found, double most_wrong, double least_right)
{
  g_autofree char *sure = g_strdup_printf("%s: sure of the right map", name);
  g_autofree char *found = g_strdup_printf("%s: nuclei in both that are matched", name);
  g_autofree char *wrong = g_strdup_printf("%s: wrong matches", name);
  g_autofree char *right = g_strdup_printf("%s: matches of confidence 0.95 and more that are right", name);
  g_autofree char *map = g_strdup_printf("%s: largest error of the map, um", name);
  g_autofree char *z2 = g_strdup_printf("%s: mean square error of movement over its variance", name);
  g_autofree char *time = g_strdup_printf("%s: longest match, s of one core", name);
  check(sure, share(t->n_sure - t->n_false, t->n), ">=", 1);
  check(found, share(t->score.n_found, t->score.n_true), ">=", least_found);
  check(wrong, share(t->score.n_wrong, t->score.n_wrong + t->score.n_found), "<=", most_wrong);
  check(right, share(t->score.n_high_right, t->score.n_high), ">=", least_right);
  note(map, t->worst_um, 2);
  note(z2, t->z2 / MAX(t->n_sure, 1), 2);
  note(time, t->seconds, 2);
}

/* --- whole dishes --- */

static void try_dish(Tally *tally, guint item, gsize n, double spacing_um, double least_um)
{
  AwRandom random = aw_random_stream(n, item);
  g_auto(AwTestPattern) a = aw_test_dish(&random, n, spacing_um, least_um);
  AwTestChange change = aw_test_change(&random, least_um);
  g_auto(AwTestPattern) b = aw_test_changed(&random, &a, &change);
  add(tally, &a, &b, &change);
}

static void check_dishes(double spacing_um, double least_um, double least_found, double most_wrong)
{
  static const struct {
    gsize n;
    guint trials;
  } rows[] = { { 200, 60 }, { 2000, 8 }, { 20000, 2 } };
  for (gsize r = 0; r < G_N_ELEMENTS(rows); r++) {
    Tally tally = { 0 };
    for (guint k = 0; k < rows[r].trials; k++)
      try_dish(&tally, k, rows[r].n, spacing_um, least_um);
    g_autofree char *name =
        g_strdup_printf("%" G_GSIZE_FORMAT " nuclei %d um apart, %u dishes", rows[r].n, (int)spacing_um, tally.n);
    report(name, &tally, least_found, most_wrong, 0.95);
  }
}

static void check_unrelated(void)
{
  Tally tally = { .log10_chance = 99 };
  for (guint k = 0; k < 200; k++) {
    AwRandom random = aw_random_stream(77, k);
    gsize n = k % 10 == 9 ? 1000 : k % 2 ? 200 : 60;
    double spacing_um = k % 3 ? 40 : 100, least_um = k % 3 == 1 ? 20 : 12;
    g_auto(AwTestPattern) a = aw_test_dish(&random, n, spacing_um, least_um);
    g_auto(AwTestPattern) other = aw_test_dish(&random, n, spacing_um, least_um);
    AwTestChange change = aw_test_change(&random, least_um);
    g_auto(AwTestPattern) b = aw_test_changed(&random, &other, &change);
    add(&tally, &a, &b, NULL);
  }
  check("unrelated dishes that were matched, of 200", tally.n_sure, "<=", 0);
  note("unrelated dishes: least log10 of the expected number of chance maps (sure below -4)", tally.log10_chance, 1);
  note("unrelated dishes: longest time to give up, s of one core", tally.seconds, 2);
}

/* --- parts --- */

/* Where b's point j lies in the first dish, movement aside. */
static AwScanPoint back(const AwTestPattern *b, gsize j, const AwTestChange *c)
{
  double u = b->xy_um[2 * j] - c->shift_x_um, v = b->xy_um[2 * j + 1] - c->shift_y_um;
  double cs = cos(c->angle_rad) / c->scale, sn = sin(c->angle_rad) / c->scale;
  AwScanPoint p = { cs * u + sn * v, cs * v - sn * u };
  if (c->mirrored)
    p.y_um = -p.y_um;
  return p;
}

/* Keeps the points of b that lie in one of n squares of the first dish. */
static void keep_squares(AwTestPattern *b, const AwTestChange *change, const AwScanPoint *corner, gsize n, double side)
{
  gsize kept = 0;
  for (gsize j = 0; j < b->n; j++) {
    AwScanPoint p = back(b, j, change);
    gboolean inside = FALSE;
    for (gsize f = 0; f < n; f++)
      inside |=
          fabs(p.x_um - corner[f].x_um - side / 2) < side / 2 && fabs(p.y_um - corner[f].y_um - side / 2) < side / 2;
    if (!inside)
      continue;
    b->xy_um[2 * kept] = b->xy_um[2 * j];
    b->xy_um[2 * kept + 1] = b->xy_um[2 * j + 1];
    b->truth[kept++] = b->truth[j];
  }
  b->n = kept;
}

/* Three to six fields with room for 43 nuclei each, half of them lost and a fifth new, against a scan of 5000. */
static void check_fields(double spacing_um, double least_um)
{
  Tally tally = { 0 };
  for (guint k = 0; k < 40; k++) {
    AwRandom random = aw_random_stream(33, k);
    g_auto(AwTestPattern) a = aw_test_dish(&random, 5000, spacing_um, least_um);
    AwTestChange change = aw_test_change(&random, least_um);
    change.lost_frac = 0.5;
    g_auto(AwTestPattern) b = aw_test_changed(&random, &a, &change);
    AwScanPoint corner[6];
    double width = spacing_um * sqrt(5000.0), side = spacing_um * sqrt(43.0);
    for (int f = 0; f < 6; f++)
      corner[f] = (AwScanPoint){ 1000 + (width - side) * aw_random_unit(&random),
                                 -3000 + (width - side) * aw_random_unit(&random) };
    keep_squares(&b, &change, corner, 3 + k % 4, side);
    add(&tally, &a, &b, &change);
  }
  g_autofree char *name = g_strdup_printf("3 to 6 fields, %d um apart, half lost, %u scans", (int)spacing_um, tally.n);
  report(name, &tally, spacing_um > 50 ? 0.99 : 0.97, spacing_um > 50 ? 0.02 : 0.06, 0.95);
}

/* --- open data --- */

/* Adds the centroids of a label image's nuclei, moved by (dx, dy). */
static gboolean add_centroids(const char *path, double dx, double dy, GArray *xy)
{
  g_autoptr(GError) error = NULL;
  g_autoptr(AwImage) image = aw_image_load(path, 0, -1, NULL, &error);
  if (!image)
    return FALSE;
  double(*sum)[3] = g_malloc0(65536 * sizeof *sum);
  for (int y = 0; y < image->height_px; y++)
    for (int x = 0; x < image->width_px; x++) {
      guint k = (guint)aw_image_value(image, x, y);
      sum[k][0]++;
      sum[k][1] += x;
      sum[k][2] += y;
    }
  for (guint k = 1; k < 65536; k++)
    if (sum[k][0] > 0) {
      double p[2] = { dx + sum[k][1] / sum[k][0], dy + sum[k][2] / sum[k][0] };
      g_array_append_vals(xy, p, 2);
    }
  g_free(sum);
  return TRUE;
}

/* Image k of a group beside the others in rows of seven; alone when the array is empty. */
static gboolean load_image(const char *folder, const char *group, int k, gboolean tiled, GArray *xy)
{
  g_autofree char *path = g_strdup_printf("%s/nuclei/%s-%03d.labels.tif", folder, group, k);
  double step = group[0] == 'x'   ? 256
                : group[1] == '3' ? 360
                                  : 696,
         rise = group[0] == 'm' && group[1] == '5' ? 520 : step;
  return g_file_test(path, G_FILE_TEST_EXISTS) &&
         add_centroids(path, tiled ? step * (k % 7) : 0, tiled ? rise * (k / 7) : 0, xy);
}

/* Turned, cropped to a square about its middle, thinned, with new nuclei and movement. */
static void try_crop(Tally *tally, guint item, GArray *xy, double side_frac)
{
  AwRandom random = aw_random_stream(55, item);
  AwTestPattern a = { (double *)(void *)xy->data, xy->len / 2, NULL };
  AwTestChange change = aw_test_change(&random, 8);
  g_auto(AwTestPattern) b = aw_test_changed(&random, &a, &change);
  double x1 = 0, y1 = 0;
  for (gsize i = 0; i < a.n; i++) {
    x1 = MAX(x1, a.xy_um[2 * i]);
    y1 = MAX(y1, a.xy_um[2 * i + 1]);
  }
  double side = side_frac * MAX(x1, y1);
  AwScanPoint corner = { (x1 - side) / 2, (y1 - side) / 2 };
  keep_squares(&b, &change, &corner, 1, side);
  add(tally, &a, &b, &change);
}

static void check_tiled(const char *folder, const char *group)
{
  Tally tally = { 0 };
  g_autoptr(GArray) xy = g_array_new(FALSE, FALSE, sizeof(double));
  for (int k = 1; load_image(folder, group, k, TRUE, xy); k++)
    ;
  for (guint k = 0; k < 6; k++)
    try_crop(&tally, k, xy, 0.8);
  g_autofree char *name = g_strdup_printf("open data %s, %u nuclei side by side", group, xy->len / 2);
  report(name, &tally, 0.97, 0.03, 0.95);
}

/* Every image of at least 100 nuclei on its own. */
static void check_single(const char *folder)
{
  Tally tally = { 0 };
  for (int k = 1; k <= 45; k++) {
    g_autoptr(GArray) xy = g_array_new(FALSE, FALSE, sizeof(double));
    if (load_image(folder, "m520", k, FALSE, xy) && xy->len >= 200)
      try_crop(&tally, 100 + (guint)k, xy, 0.9);
  }
  g_autofree char *name = g_strdup_printf("open data m520, %u single images", tally.n);
  report(name, &tally, 0.97, 0.03, 0.95);
}

int main(void)
{
  const char *folder = g_getenv("AIMWELL_OPENDATA");
  folder = folder ? folder : "../shared/opendata";
  check_dishes(100, 20, 0.99, 0.005);
  check_dishes(40, 12, 0.97, 0.03);
  check_fields(40, 12);
  check_fields(100, 20);
  check_unrelated();
  g_autofree char *index = g_strdup_printf("%s/nuclei/index.csv", folder);
  if (g_file_test(index, G_FILE_TEST_EXISTS)) {
    check_tiled(folder, "m520");
    check_tiled(folder, "m360");
    check_tiled(folder, "x256");
    check_single(folder);
  } else
    g_print("ok %d - matching of open data # SKIP no open data at %s\n", ++n_tests, index);
  g_print("1..%d\n", n_tests);
  return 0;
}

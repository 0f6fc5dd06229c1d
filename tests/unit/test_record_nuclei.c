/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/* Nuclei, their shapes as blobs, decisions, gates and tour. */
#include <float.h>
#include <math.h>
#include <string.h>

#include "base/limits.h"
#include "base/random.h"
#include "record/private.h"
#include "support/check.h"
#include "support/dish.h"

typedef struct {
  char *folder;
  AwRecord *record;
} Dish;

static void set_up(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  dish->folder = aw_scratch_new();
  dish->record = aw_test_dish_new(dish->folder);
}

static void tear_down(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  aw_record_free(dish->record);
  aw_scratch_remove(dish->folder);
}

/* --- shapes --- */

/* Runs of random length in random rows, some rows with several runs. */
static gsize random_runs(AwRandom *random, AwRun *runs, gsize most)
{
  gsize n = aw_random_below(random, (guint32)most);
  AwRun at = { 0, 0, 0 };
  for (gsize i = 0; i < n; i++) {
    gboolean same_row = i > 0 && aw_random_below(random, 3) == 0;
    at.y += same_row ? 0 : (gint32)aw_random_below(random, 300) + (i > 0);
    at.x0 = (same_row ? at.x1 : 0) + (gint32)aw_random_below(random, 70000 / (guint32)most);
    at.x1 = at.x0 + 1 + (gint32)aw_random_below(random, 400);
    runs[i] = at;
  }
  return n;
}

static void test_runs(void)
{
  AwRandom random = aw_random_stream(3, 0);
  for (int round = 0; round < 300; round++) {
    AwRun runs[60];
    gsize n = random_runs(&random, runs, 60), n_back = 0;
    GError *error = NULL;
    g_autofree AwRun *back = NULL;
    g_autoptr(GByteArray) blob = aw_shape_pack_runs(runs, n, &error);
    g_assert_no_error(error);
    g_assert_true(aw_shape_unpack_runs(blob->data, blob->len, &back, &n_back, &error));
    g_assert_cmpmem(back, n_back * sizeof *back, runs, n * sizeof *runs);
  }
}

static void test_runs_layout(void)
{
  const AwRun runs[] = { { 5, 300, 301 }, { 5, 303, 310 }, { 7, 299, 420 } };
  /* version 1, 3 runs; +5, +300 = zigzag 600, 1; +0, +3 = 6, 7; +2, -4 = 7, 121 */
  const guint8 expected[] = { 1, 3, 5, 0xd8, 0x04, 1, 0, 6, 7, 2, 7, 121 };
  g_autoptr(GByteArray) blob = aw_shape_pack_runs(runs, 3, NULL);
  g_assert_cmpmem(blob->data, blob->len, expected, sizeof expected);
}

static void test_runs_refused(void)
{
  static const AwRun bad[][2] = { { { 3, 5, 5 }, { 4, 1, 2 } },
                                  { { 3, 5, 9 }, { 2, 1, 2 } },
                                  { { 3, 5, 9 }, { 3, 8, 12 } },
                                  { { -1, 5, 9 }, { 3, 8, 12 } },
                                  { { 3, -5, 9 }, { 4, 8, 12 } },
                                  { { 3, 5, AW_MAX_SIDE_PX + 1 }, { 4, 8, 12 } },
                                  { { 3, 5, 9 }, { AW_MAX_SIDE_PX, 8, 12 } } };
  for (gsize i = 0; i < G_N_ELEMENTS(bad); i++) {
    GError *error = NULL;
    g_assert_null(aw_shape_pack_runs(bad[i], 2, &error));
    aw_check_error(&error, AW_ERROR_RANGE, "out of order");
  }
}

static void test_outline(void)
{
  AwRandom random = aw_random_stream(4, 0);
  for (int round = 0; round < 300; round++) {
    AwScanPoint points[80];
    gsize n = aw_random_below(&random, 80), n_back = 0;
    for (gsize i = 0; i < n; i++)
      points[i] = (AwScanPoint){ (aw_random_unit(&random) - 0.5) * pow(10, round % 10),
                                 (aw_random_unit(&random) - 0.5) * 1000 };
    GError *error = NULL;
    g_autofree AwScanPoint *back = NULL;
    g_autoptr(GByteArray) blob = aw_shape_pack_outline(points, n, &error);
    g_assert_no_error(error);
    g_assert_true(aw_shape_unpack_outline(blob->data, blob->len, &back, &n_back, &error));
    g_assert_cmpuint(n_back, ==, n);
    for (gsize i = 0; i < n; i++) {
      g_assert_cmpfloat(fabs(back[i].x_um - points[i].x_um), <=, 0.5 / 8192);
      g_assert_cmpfloat(fabs(back[i].y_um - points[i].y_um), <=, 0.5 / 8192);
    }
    g_autoptr(GByteArray) again = aw_shape_pack_outline(back, n, &error); /* rounding happens once only */
    g_assert_cmpmem(again->data, again->len, blob->data, blob->len);
  }
}

static void test_outline_layout(void)
{
  const AwScanPoint points[] = { { 0.25, -1.0 / 8192 }, { 0.25, 0 } };
  /* version 1, 2 points; 2048 = zigzag 4096, -1 = 1; 0, +1 = 2 */
  const guint8 expected[] = { 1, 2, 0x80, 0x20, 1, 0, 2 };
  g_autoptr(GByteArray) blob = aw_shape_pack_outline(points, 2, NULL);
  g_assert_cmpmem(blob->data, blob->len, expected, sizeof expected);
}

static void test_outline_refused(void)
{
  static const double bad[] = { NAN, INFINITY, -INFINITY, 1.1e9, DBL_MAX };
  for (gsize i = 0; i < G_N_ELEMENTS(bad); i++) {
    const AwScanPoint points[] = { { 0, 0 }, { 1, bad[i] } };
    GError *error = NULL;
    g_assert_null(aw_shape_pack_outline(points, 2, &error));
    aw_check_error(&error, AW_ERROR_RANGE, "point 1 of the outline");
  }
}

/* Both readings of a damaged blob must fail or give something sane; none may read outside (asan watches). */
static void read_both(const guint8 *bytes, gsize n_bytes, gboolean must_fail)
{
  g_autofree guint8 *exact = g_memdup2(bytes, n_bytes);
  g_autofree AwRun *runs = NULL;
  g_autofree AwScanPoint *points = NULL;
  GError *error = NULL;
  gsize n;
  gboolean ok = aw_shape_unpack_runs(exact, n_bytes, &runs, &n, &error);
  g_assert_true(ok ? !must_fail : error->code == AW_ERROR_FORMAT);
  g_clear_error(&error);
  ok = aw_shape_unpack_outline(exact, n_bytes, &points, &n, &error);
  g_assert_true(ok ? !must_fail : error->code == AW_ERROR_FORMAT);
  g_clear_error(&error);
}

static void test_damaged_blobs(void)
{
  static const guint8 huge[] = { 1, 0xff, 0xff, 0xff, 0xff, 0xff, 0xff, 0xff, 0xff, 0xff, 1 };
  static const guint8 endless[] = { 1, 1, 0x80, 0x80, 0x80, 0x80, 0x80, 0x80, 0x80, 0x80, 0x80, 0x80, 0x80, 1, 1, 1 };
  static const guint8 far[] = { 1, 2, 0xff, 0xff, 0xff, 0xff, 0xff, 0xff, 0xff, 0xff, 0xff, 1, 0, 0, 1 };
  static const guint8 version[] = { 2, 0 }, spare[] = { 1, 0, 0 };
  read_both(NULL, 0, TRUE);
  read_both(huge, sizeof huge, TRUE);
  read_both(endless, sizeof endless, TRUE);
  read_both(far, sizeof far, TRUE);
  read_both(version, sizeof version, TRUE);
  read_both(spare, sizeof spare, TRUE);
  AwRandom random = aw_random_stream(5, 0);
  for (int round = 0; round < 20000; round++) {
    guint8 bytes[24] = { 1 };
    for (gsize i = 1; i < sizeof bytes; i++)
      bytes[i] = (guint8)(aw_random_bits(&random) >> 56) >> aw_random_below(&random, 8);
    read_both(bytes, 1 + aw_random_below(&random, sizeof bytes), FALSE);
  }
}

static void test_cut_blobs(void)
{
  const AwRun runs[] = { { 5, 300, 301 }, { 5, 303, 310 }, { 7, 299, 420 } };
  g_autoptr(GByteArray) blob = aw_shape_pack_runs(runs, 3, NULL);
  for (guint n = 0; n < blob->len; n++) {
    g_autofree guint8 *cut = g_memdup2(blob->data, n);
    g_autofree AwRun *back = NULL;
    GError *error = NULL;
    gsize n_back;
    g_assert_false(aw_shape_unpack_runs(cut, n, &back, &n_back, &error));
    g_assert_cmpint(error->code, ==, AW_ERROR_FORMAT);
    g_clear_error(&error);
  }
}

/* --- nuclei in a record --- */

static gboolean store(AwRecord *record, GPtrArray *nuclei, GError **error)
{
  gboolean ok = aw_record_begin(record, "ada", error) && aw_record_set_nuclei(record, nuclei, error) &&
                aw_record_commit(record, "nuclei", error);
  aw_record_rollback(record);
  return ok;
}

static void test_every_field(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  g_autoptr(GPtrArray) nuclei = aw_nuclei_new();
  AwNucleus *nucleus = g_new0(AwNucleus, 1);
  *nucleus = (AwNucleus){ .id = 12345678901,
                          .frame = 2,
                          .centroid_px = { 1.0 / 3, 2.0 / 3 },
                          .centroid = { -5.0 / 3, 1e6 / 7 },
                          .area = 1.1,
                          .diameter = 2.2,
                          .convexity = 0.33,
                          .major = 4.4,
                          .minor = 5.5,
                          .angle_rad = -0.66,
                          .mean = 7.7,
                          .background = 8.8,
                          .integrated = 9.9,
                          .sharpness = NAN,
                          .isolation = INFINITY,
                          .confidence = 0.11,
                          .area_ratio = 1.2,
                          .saturated_frac = 0.013,
                          .spread_um = 0.14,
                          .n_views = 3,
                          .flags = AW_FLAG_TOUCHING | AW_FLAG_BORDER };
  g_ptr_array_add(nuclei, nucleus);
  g_assert_true(store(dish->record, nuclei, &error));
  g_autoptr(GPtrArray) read = aw_record_nuclei(dish->record, TRUE, &error);
  g_assert_no_error(error);
  g_assert_cmpuint(read->len, ==, 1);
  AwNucleus back = *(AwNucleus *)g_ptr_array_index(read, 0), sent = *nucleus;
  g_assert_true(isnan(back.sharpness));
  back.sharpness = sent.sharpness = 0;
  g_assert_cmpuint(back.n_runs + back.n_outline, ==, 0);
  back.runs = NULL;
  back.outline = NULL;
  g_assert_cmpmem(&back, sizeof back, &sent, sizeof sent);
}

static void test_without_shapes(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  aw_test_dish_segment(dish->record, 3);
  g_autoptr(GPtrArray) bare = aw_record_nuclei(dish->record, FALSE, NULL);
  g_autoptr(GPtrArray) whole = aw_record_nuclei(dish->record, TRUE, NULL);
  const AwNucleus *a = g_ptr_array_index(bare, 1), *b = g_ptr_array_index(whole, 1);
  g_assert_cmpint(a->id, ==, 2);
  g_assert_cmpfloat(a->area, ==, b->area);
  g_assert_cmpuint(a->n_runs, ==, 0);
  g_assert_null(a->outline);
  g_assert_cmpuint(b->n_runs, ==, 21);
  g_assert_cmpuint(b->n_outline, ==, 48);
}

/* Storing what is there already writes no shape again. */
static void test_shapes_once(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  gint64 n_shapes;
  aw_test_dish_segment(dish->record, 20);
  g_autoptr(GPtrArray) nuclei = aw_record_nuclei(dish->record, TRUE, &error);
  AwNucleus *fifth = g_ptr_array_index(nuclei, 4);
  fifth->area = 3;
  g_assert_true(store(dish->record, nuclei, &error));
  g_assert_true(aw_sql_int(dish->record, "SELECT count(*) FROM shape", &n_shapes, &error));
  g_assert_cmpint(n_shapes, ==, 20);
  fifth->outline[3].x_um += 1;
  g_assert_true(store(dish->record, nuclei, &error));
  g_assert_true(aw_sql_int(dish->record, "SELECT count(*) FROM shape", &n_shapes, &error));
  g_assert_cmpint(n_shapes, ==, 21);
}

static void test_vanishing(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  aw_test_dish_segment(dish->record, 9);
  for (gint64 id = 2; id < 9; id += 2)
    aw_test_dish_accept(dish->record, id);
  const gint64 order[] = { 8, 2, 6, 4 };
  g_assert_true(aw_record_begin(dish->record, "ada", &error) && aw_record_set_tour(dish->record, order, 4, &error) &&
                aw_record_commit(dish->record, "route", &error));
  g_autoptr(GPtrArray) nuclei = aw_test_nuclei(7, 3, 3); /* 3 ... 9: 1 and 2 are gone */
  g_ptr_array_remove_index(nuclei, 3);                   /* and 6 */
  g_assert_true(store(dish->record, nuclei, &error));
  g_autoptr(GArray) decisions = aw_record_decisions(dish->record, &error);
  g_autoptr(GArray) tour = aw_record_tour(dish->record, &error);
  g_assert_cmpuint(decisions->len, ==, 2);
  g_assert_cmpint(g_array_index(decisions, AwDecision, 0).nucleus_id, ==, 4);
  g_assert_cmpint(g_array_index(decisions, AwDecision, 1).nucleus_id, ==, 8);
  g_assert_cmpuint(tour->len, ==, 2);
  g_assert_cmpint(g_array_index(tour, gint64, 0), ==, 8);
  g_assert_cmpint(g_array_index(tour, gint64, 1), ==, 4);
  g_assert_true(aw_record_check(dish->record, &error));
}

static void refuse(Dish *dish, GPtrArray *nuclei, const char *text)
{
  GError *error = NULL;
  g_assert_false(store(dish->record, nuclei, &error));
  aw_check_error(&error, AW_ERROR_RANGE, text);
}

static void test_refused(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  aw_test_dish_segment(dish->record, 4);
  g_autofree char *before = aw_test_dish_dump(dish->record);
  g_autoptr(GPtrArray) nuclei = aw_test_nuclei(5, 1, 3);
  AwNucleus *last = g_ptr_array_index(nuclei, 4);
  last->id = 2;
  refuse(dish, nuclei, "nucleus number 2 is given twice");
  last->id = 0;
  refuse(dish, nuclei, "nucleus number 0 is below 1");
  last->id = 5;
  last->frame = 3;
  refuse(dish, nuclei, "nucleus 5 names frame 3, but|has 3 frames");
  last->frame = 0;
  last->runs[2].x1 = last->runs[2].x0;
  refuse(dish, nuclei, "nucleus 5: run 2|out of order");
  last->runs[2].x1++;
  last->outline[7].y_um = NAN;
  refuse(dish, nuclei, "nucleus 5: point 7");
  g_autofree char *after = aw_test_dish_dump(dish->record);
  g_assert_cmpstr(before, ==, after);
}

static void test_damaged_shape(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  aw_test_dish_segment(dish->record, 4);
  g_assert_true(aw_sql_exec(dish->record, "UPDATE shape SET runs = x'0107' WHERE id = 3", &error));
  g_assert_null(aw_record_nuclei(dish->record, TRUE, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "dish.dish is damaged|nucleus 3|shorter than its count");
  g_autoptr(GPtrArray) bare = aw_record_nuclei(dish->record, FALSE, &error);
  g_assert_cmpuint(bare->len, ==, 4);
}

static void test_frames_in_use(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  aw_test_dish_segment(dish->record, 4);
  g_autoptr(GPtrArray) frames = aw_test_frames(2);
  g_assert_true(aw_record_begin(dish->record, "ada", &error));
  g_assert_false(aw_record_set_frames(dish->record, frames, &error));
  aw_check_error(&error, AW_ERROR_STATE, "cannot leave 2 frames|nuclei lie in frame 2");
}

static void test_damaged_frames(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  static const char *const harms[] = { "UPDATE frame SET width_px = 0 WHERE number = 1",
                                       "UPDATE frame SET width_px = 640, stage_x_um = 9e300 WHERE number = 1",
                                       "UPDATE frame SET stage_x_um = 0, file = '' WHERE number = 1",
                                       "UPDATE frame SET file = 'x', number = 7 WHERE number = 1" };
  for (gsize i = 0; i < G_N_ELEMENTS(harms); i++) {
    g_assert_true(aw_sql_exec(dish->record, harms[i], &error));
    g_assert_null(aw_record_frames(dish->record, &error));
    aw_check_error(&error, AW_ERROR_FORMAT, "frame 1 is missing or impossible");
  }
}

/* --- decisions, gates, tour --- */

static void test_decisions(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  const AwDecision some[] = { { 3, AW_STATE_PROPOSED, FALSE },
                              { 1, AW_STATE_REJECTED, TRUE },
                              { 2, AW_STATE_ACCEPTED, TRUE },
                              { 2, AW_STATE_FOUND, FALSE } };
  aw_test_dish_segment(dish->record, 3);
  g_assert_true(aw_record_begin(dish->record, "ada", &error));
  for (gsize i = 0; i < G_N_ELEMENTS(some); i++)
    g_assert_true(aw_record_set_decision(dish->record, &some[i], &error));
  const AwDecision stray = { 4, AW_STATE_ACCEPTED, TRUE };
  g_assert_false(aw_record_set_decision(dish->record, &stray, &error));
  aw_check_error(&error, AW_ERROR_NOT_FOUND, "no nucleus 4");
  g_autoptr(GArray) read = aw_record_decisions(dish->record, &error);
  g_assert_cmpuint(read->len, ==, 2);
  AwDecision first = g_array_index(read, AwDecision, 0), second = g_array_index(read, AwDecision, 1);
  g_assert_true(first.nucleus_id == 1 && first.state == AW_STATE_REJECTED && first.by_hand);
  g_assert_true(second.nucleus_id == 3 && second.state == AW_STATE_PROPOSED && !second.by_hand);
}

/* Who decided what, and when, is found through the journal entry; confirming it does not change that. */
static void test_decision_entry(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  gint64 entry = 0;
  aw_test_dish_segment(dish->record, 3);
  aw_test_dish_accept(dish->record, 2); /* entry 3 */
  aw_test_dish_accept(dish->record, 1);
  aw_test_dish_accept(dish->record, 2);
  g_assert_true(aw_sql_int(dish->record, "SELECT journal FROM decision WHERE nucleus = 2", &entry, NULL));
  g_assert_cmpint(entry, ==, 3);
}

static void test_damaged_decision(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  aw_test_dish_segment(dish->record, 3);
  aw_test_dish_accept(dish->record, 2);
  g_assert_true(
      aw_sql_exec(dish->record, "PRAGMA ignore_check_constraints = ON; UPDATE decision SET state = 9", &error));
  g_assert_null(aw_record_decisions(dish->record, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "nucleus 2 has the unknown state 9");
}

static void test_gates(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  const AwFeature *area = aw_feature_find("area", NULL), *isolation = aw_feature_find("isolation", NULL);
  const AwGateRow gates[] = { { isolation, 0.1, INFINITY }, { area, -INFINITY, 1.0 / 3.0 } };
  const AwGateRow empty = { area, 2.5, 1 };
  g_assert_true(aw_record_begin(dish->record, "ada", &error));
  g_assert_true(aw_record_set_gates(dish->record, gates, 2, &error));
  g_autoptr(GArray) read = aw_record_gates(dish->record, &error);
  g_assert_cmpuint(read->len, ==, 2);
  for (guint i = 0; i < 2; i++) {
    AwGateRow gate = g_array_index(read, AwGateRow, i);
    g_assert_true(gate.feature == gates[i].feature && gate.min == gates[i].min && gate.max == gates[i].max);
  }
  g_assert_false(aw_record_set_gates(dish->record, &empty, 1, &error));
  aw_check_error(&error, AW_ERROR_RANGE, "gate on area lets nothing in|lower limit 2.5 is above the upper 1");
  g_assert_true(aw_sql_exec(dish->record, "INSERT INTO gate VALUES(0, 'beauty', 0, 1)", &error));
  g_assert_null(aw_record_gates(dish->record, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "gate on 'beauty' cannot be read");
}

static void test_tour(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  const gint64 twice[] = { 3, 1, 3 }, stray[] = { 2, 77 }, good[] = { 3, 1, 2 };
  aw_test_dish_segment(dish->record, 3);
  g_assert_true(aw_record_begin(dish->record, "ada", &error));
  g_assert_false(aw_record_set_tour(dish->record, twice, 3, &error));
  aw_check_error(&error, AW_ERROR_RANGE, "nucleus 3 twice");
  g_assert_false(aw_record_set_tour(dish->record, stray, 2, &error));
  aw_check_error(&error, AW_ERROR_NOT_FOUND, "no nucleus 77");
  g_assert_true(aw_record_set_tour(dish->record, good, 3, &error));
  g_autoptr(GArray) read = aw_record_tour(dish->record, &error);
  g_assert_cmpmem(read->data, read->len * sizeof(gint64), good, sizeof good);
  g_assert_true(aw_record_set_tour(dish->record, NULL, 0, &error));
  g_autoptr(GArray) cleared = aw_record_tour(dish->record, &error);
  g_assert_cmpuint(cleared->len, ==, 0);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  aw_test_use_memory();
  g_test_add_func("/record/shape/runs", test_runs);
  g_test_add_func("/record/shape/runs-layout", test_runs_layout);
  g_test_add_func("/record/shape/runs-refused", test_runs_refused);
  g_test_add_func("/record/shape/outline", test_outline);
  g_test_add_func("/record/shape/outline-layout", test_outline_layout);
  g_test_add_func("/record/shape/outline-refused", test_outline_refused);
  g_test_add_func("/record/shape/damaged", test_damaged_blobs);
  g_test_add_func("/record/shape/cut", test_cut_blobs);
#define ADD(name, fn) g_test_add("/record/nuclei/" name, Dish, NULL, set_up, fn, tear_down)
  ADD("every-field", test_every_field);
  ADD("without-shapes", test_without_shapes);
  ADD("shapes-once", test_shapes_once);
  ADD("vanishing", test_vanishing);
  ADD("refused", test_refused);
  ADD("damaged-shape", test_damaged_shape);
  ADD("frames-in-use", test_frames_in_use);
  ADD("damaged-frames", test_damaged_frames);
  ADD("decisions", test_decisions);
  ADD("decision-entry", test_decision_entry);
  ADD("damaged-decision", test_damaged_decision);
  ADD("gates", test_gates);
  ADD("tour", test_tour);
  return g_test_run();
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "record/private.h"
#include "support/check.h"
#include "support/dish.h"

static void add(AwRecord *record, const char *kind, double at, const char *text)
{
  GError *error = NULL;
  char source[] = "scan.csv", hash[] = "ab12";
  g_autofree char *own_kind = g_strdup(kind), *own_text = g_strdup(text);
  AwCalibration c = { 0, own_kind, at, source, hash, AW_ORIGIN_ENTERED, own_text };
  g_assert_true(aw_record_begin(record, "ada", &error) && aw_record_add_calibration(record, &c, &error) &&
                aw_record_commit(record, "calibrate", &error));
}

/* All are kept, the newest by time counts, undo takes one back. */
static void test_newest(void)
{
  GError *error = NULL;
  char *folder = aw_scratch_new();
  AwRecord *record = aw_test_dish_new(folder);
  add(record, "bead", 2000, "second");
  add(record, "bead", 1000, "first");
  add(record, "edge-x", 3000, "other");
  add(record, "bead", 2000, "third");
  g_autoptr(GPtrArray) all = aw_record_calibrations(record, &error);
  g_assert_cmpuint(all->len, ==, 4);
  g_assert_cmpstr(((AwCalibration *)all->pdata[0])->text, ==, "first");
  const AwCalibration *newest = aw_calibration_newest(all, "bead");
  g_assert_cmpstr(newest->text, ==, "third");
  g_assert_cmpstr(newest->source, ==, "scan.csv");
  g_assert_cmpstr(newest->sha256, ==, "ab12");
  g_assert_cmpint(newest->origin, ==, AW_ORIGIN_ENTERED);
  g_assert_cmpfloat(newest->at_unix_s, ==, 2000);
  g_assert_null(aw_calibration_newest(all, "marks"));
  g_assert_true(aw_record_undo(record, "ada", NULL, &error));
  g_autoptr(GPtrArray) left = aw_record_calibrations(record, &error);
  g_assert_cmpstr(aw_calibration_newest(left, "bead")->text, ==, "second");
  g_assert_true(aw_record_redo(record, "ada", NULL, &error));
  g_autoptr(GPtrArray) again = aw_record_calibrations(record, &error);
  g_assert_cmpuint(again->len, ==, 4);
  aw_record_free(record);
  aw_scratch_remove(folder);
}

static void test_damaged(void)
{
  GError *error = NULL;
  char *folder = aw_scratch_new();
  AwRecord *record = aw_test_dish_new(folder);
  add(record, "bead", 2000, "text");
  g_assert_true(aw_sql_exec(record, "PRAGMA ignore_check_constraints = ON; UPDATE calibration SET origin = 7", &error));
  g_assert_null(aw_record_calibrations(record, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "damaged|unknown origin 7");
  aw_record_free(record);
  aw_scratch_remove(folder);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  aw_test_use_memory();
  g_test_add_func("/record/calibrations/newest", test_newest);
  g_test_add_func("/record/calibrations/damaged", test_damaged);
  return g_test_run();
}

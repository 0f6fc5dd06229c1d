/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/* Bringing older records up to date, and the records of every released format under tests/records. */
#include "record/private.h"
#include "support/check.h"
#include "support/dish.h"

typedef struct {
  char *folder, *path, *kept;
  AwRecord *record;
} Dish;

/* Brings a record back to an invented version 1, which had calibrations but no gates. */
static void set_up(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  dish->folder = aw_scratch_new();
  dish->path = g_build_filename(dish->folder, "dish.dish", NULL);
  dish->kept = g_strconcat(dish->path, ".before-v1", NULL);
  dish->record = aw_test_dish_new(dish->folder);
  aw_test_dish_segment(dish->record, 5);
  aw_test_dish_accept(dish->record, 4);
  g_assert_true(aw_sql_exec(dish->record, "DROP TABLE gate; PRAGMA user_version = 1", &error));
}

static void tear_down(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  aw_record_free(dish->record);
  aw_scratch_remove(dish->folder);
  g_free(dish->path);
  g_free(dish->kept);
}

static gboolean add_gates(AwRecord *record, GError **error)
{
  return aw_sql_exec(record,
                     "CREATE TABLE gate(number INTEGER NOT NULL PRIMARY KEY, feature TEXT NOT NULL,"
                     " min REAL NOT NULL, max REAL NOT NULL) STRICT",
                     error);
}

static gboolean add_gates_and_fail(AwRecord *record, GError **error)
{
  return add_gates(record, error) && aw_sql_exec(record, "INSERT INTO no_such_table VALUES(1)", error);
}

static gboolean lose_nuclei(AwRecord *record, GError **error)
{
  return add_gates(record, error) && aw_sql_exec(record, "DELETE FROM nucleus", error);
}

static gint64 version(AwRecord *record)
{
  gint64 found = -1;
  g_assert_true(aw_sql_int(record, "PRAGMA user_version", &found, NULL));
  return found;
}

static gint64 number_of(const char *path, const char *sql)
{
  sqlite3 *db = NULL;
  sqlite3_stmt *statement = NULL;
  g_assert_cmpint(sqlite3_open(path, &db), ==, SQLITE_OK);
  g_assert_cmpint(sqlite3_prepare_v2(db, sql, -1, &statement, NULL), ==, SQLITE_OK);
  g_assert_cmpint(sqlite3_step(statement), ==, SQLITE_ROW);
  gint64 found = sqlite3_column_int64(statement, 0);
  sqlite3_finalize(statement);
  sqlite3_close(db);
  return found;
}

static void test_migrate(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  const AwMigration steps[] = { { 1, add_gates } };
  g_assert_true(aw_migrate(dish->record, 1, 2, steps, 1, &error));
  g_assert_no_error(error);
  g_assert_cmpint(version(dish->record), ==, 2);
  g_assert_true(aw_schema_check(dish->record, &error));
  aw_record_free(dish->record);
  dish->record = aw_record_open(dish->path, AW_RECORD_WRITE, &error);
  g_assert_no_error(error);
  g_autoptr(GPtrArray) nuclei = aw_record_nuclei(dish->record, TRUE, &error);
  g_assert_cmpuint(nuclei->len, ==, 5);
  g_assert_cmpint(number_of(dish->kept, "PRAGMA user_version"), ==, 1);
  g_assert_cmpint(number_of(dish->kept, "SELECT count(*) FROM nucleus"), ==, 5);
  g_assert_cmpint(number_of(dish->kept, "SELECT count(*) FROM sqlite_schema WHERE name = 'gate'"), ==, 0);
  g_assert_cmpint(aw_scratch_count(dish->folder), ==, 3); /* record, its lock, the kept one */
}

/* Foreign keys count again afterwards, the journal tells, and undo does not reach back past the change. */
static void test_after_migration(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  const AwMigration steps[] = { { 1, add_gates } };
  g_assert_true(aw_migrate(dish->record, 1, 2, steps, 1, &error));
  g_autoptr(GPtrArray) journal = aw_record_journal(dish->record, &error);
  const AwJournalEntry *entry = g_ptr_array_index(journal, 3);
  g_assert_cmpstr(entry->action, ==, "Brought the record from format version 1 to 2");
  g_assert_false(aw_record_undo(dish->record, "ada", NULL, &error));
  aw_check_error(&error, AW_ERROR_STATE, "Brought the record from format version 1 to 2|cannot be undone");
  aw_test_dish_accept(dish->record, 1);
  g_assert_true(aw_record_undo(dish->record, "ada", NULL, &error));
  g_assert_false(aw_sql_exec(dish->record, "INSERT INTO tour_stop VALUES(1, 99)", &error));
  aw_check_error(&error, AW_ERROR_STATE, "FOREIGN KEY");
}

static void expect_untouched(Dish *dish)
{
  gint64 n;
  g_assert_cmpint(version(dish->record), ==, 1);
  g_assert_true(aw_sql_int(dish->record, "SELECT count(*) FROM sqlite_schema WHERE name = 'gate'", &n, NULL));
  g_assert_cmpint(n, ==, 0);
  g_assert_true(aw_sql_int(dish->record, "SELECT count(*) FROM nucleus", &n, NULL));
  g_assert_cmpint(n, ==, 5);
}

static void test_failing_step(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  const AwMigration failing[] = { { 1, add_gates_and_fail } }, losing[] = { { 1, lose_nuclei } };
  g_assert_false(aw_migrate(dish->record, 1, 2, failing, 1, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "no such table: no_such_table");
  expect_untouched(dish);
  g_assert_false(aw_migrate(dish->record, 1, 2, losing, 1, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "row 4 of table decision");
  expect_untouched(dish);
}

static void test_missing_step(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  g_assert_true(aw_sql_exec(dish->record, "PRAGMA user_version = 0", &error));
  aw_record_free(g_steal_pointer(&dish->record));
  g_assert_null(aw_record_open(dish->path, AW_RECORD_WRITE, &error));
  aw_check_error(&error, AW_ERROR_UNSUPPORTED, "format version 0, which this Aimwell cannot read");
  g_assert_null(aw_record_open(dish->path, AW_RECORD_READ, &error));
  aw_check_error(&error, AW_ERROR_STATE, "older format version 0|open it once for writing");
  g_assert_cmpint(aw_scratch_count(dish->folder), ==, 1);
}

static void test_nowhere_to_keep(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  const AwMigration steps[] = { { 1, add_gates } };
  g_assert_cmpint(g_mkdir_with_parents(dish->kept, 0777), ==, 0);
  g_assert_false(aw_migrate(dish->record, 1, 2, steps, 1, &error));
  aw_check_error(&error, AW_ERROR_IO, "cannot keep the older version|before-v1");
  expect_untouched(dish);
}

/* --- released formats --- */

/* The actions whose outcome stands in the record of each released format; calibrations came with version 2. */
static void fill(AwRecord *record, int format)
{
  GError *error = NULL;
  const AwGateRow gate = { aw_feature_find("area", NULL), 10.5, 1000 };
  char kind[] = "edge-x", source[] = "edge.csv", hash[] = "abcd", numbers[] = "[edge]\nsigma-um=0.75\n";
  const AwCalibration edge = { 0, kind, 1.9e9, source, hash, AW_ORIGIN_FITTED, numbers };
  const gint64 tour[] = { 3, 1 };
  aw_test_dish_segment(record, 4);
  if (format >= 2)
    g_assert_true(aw_record_begin(record, "ada", &error) && aw_record_add_calibration(record, &edge, &error) &&
                  aw_record_commit(record, "calibrate", &error));
  aw_test_dish_accept(record, 1);
  aw_test_dish_accept(record, 3);
  g_assert_true(aw_record_begin(record, "ada", &error) && aw_record_set_gates(record, &gate, 1, &error) &&
                aw_record_set_tour(record, tour, 2, &error) && aw_record_commit(record, "route", &error));
  aw_test_dish_accept(record, 2);
  g_assert_true(aw_record_undo(record, "ada", NULL, &error));
}

/* A record of the present format can be redone and undone; one brought up to date begins anew. */
static void check_history(AwRecord *old, int format)
{
  GError *error = NULL;
  if (format < AW_RECORD_VERSION) {
    g_assert_false(aw_record_undo(old, "ada", NULL, &error));
    aw_check_error(&error, AW_ERROR_STATE, "format version 1 to 2|cannot be undone");
    return;
  }
  g_assert_true(aw_record_redo(old, "ada", NULL, &error));
  for (int i = 0; i < 6; i++)
    g_assert_true(aw_record_undo(old, "ada", NULL, &error));
  g_autoptr(GPtrArray) calibrations = aw_record_calibrations(old, &error);
  g_assert_cmpuint(calibrations->len, ==, 0);
}

static void test_released(gconstpointer number)
{
  GError *error = NULL;
  g_autofree char *bytes = NULL;
  gsize n_bytes;
  int format = GPOINTER_TO_INT(number);
  char *folder = aw_scratch_new();
  g_autofree char *released = g_strdup_printf("tests/records/v%d.dish", format);
  g_autofree char *other = g_build_filename(folder, "fresh", NULL);
  g_autofree char *path = g_build_filename(folder, "old.dish", NULL);
  g_assert_cmpint(g_mkdir_with_parents(other, 0777), ==, 0);
  AwRecord *fresh = aw_test_dish_new(other);
  fill(fresh, format);
  if (g_getenv("AIMWELL_WRITE_RECORD") && format == AW_RECORD_VERSION) { /* once, before the format was released */
    g_assert_true(g_file_get_contents(aw_record_path(fresh), &bytes, &n_bytes, NULL));
    g_assert_true(g_file_set_contents(released, bytes, (gssize)n_bytes, NULL));
    g_clear_pointer(&bytes, g_free);
  }
  g_assert_true(g_file_get_contents(released, &bytes, &n_bytes, &error));
  g_assert_true(g_file_set_contents(path, bytes, (gssize)n_bytes, NULL));
  AwRecord *old = aw_record_open(path, AW_RECORD_WRITE, &error);
  g_assert_no_error(error);
  g_assert_true(aw_record_check(old, &error));
  g_autofree char *expected = aw_test_dish_dump(fresh);
  g_autofree char *found = aw_test_dish_dump(old);
  g_assert_cmpstr(found, ==, expected);
  check_history(old, format);
  aw_record_free(old);
  aw_record_free(fresh);
  aw_scratch_remove(folder);
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  aw_test_use_memory();
#define ADD(name, fn) g_test_add("/record/versions/" name, Dish, NULL, set_up, fn, tear_down)
  ADD("migrate", test_migrate);
  ADD("after-migration", test_after_migration);
  ADD("failing-step", test_failing_step);
  ADD("missing-step", test_missing_step);
  ADD("nowhere-to-keep", test_nowhere_to_keep);
  g_test_add_data_func("/record/versions/released/1", GINT_TO_POINTER(1), test_released);
  g_test_add_data_func("/record/versions/released/2", GINT_TO_POINTER(2), test_released);
  return g_test_run();
}

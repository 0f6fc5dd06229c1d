/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/* The dish record from outside: creating, opening, what it keeps, what it refuses. */
#include <math.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include "record/private.h"
#include "support/check.h"
#include "support/dish.h"

typedef struct {
  char *folder, *path;
} Place;

static void set_up(Place *place, gconstpointer ignored)
{
  (void)ignored;
  place->folder = aw_scratch_new();
  place->path = g_build_filename(place->folder, "dish.dish", NULL);
}

static void tear_down(Place *place, gconstpointer ignored)
{
  (void)ignored;
  aw_scratch_remove(place->folder);
  g_free(place->path);
}

/* Number of files in the folder, hidden ones too. */
static guint n_files(const char *folder)
{
  guint n = 0;
  g_autoptr(GDir) dir = g_dir_open(folder, 0, NULL);
  while (g_dir_read_name(dir))
    n++;
  return n;
}

static void write_file(const char *path, const char *bytes, gsize n)
{
  g_assert_true(g_file_set_contents(path, bytes, (gssize)n, NULL));
}

/* Runs SQL on the record behind Aimwell's back. */
static void tamper(const char *path, const char *sql)
{
  sqlite3 *db = NULL;
  char *message = NULL;
  g_assert_cmpint(sqlite3_open(path, &db), ==, SQLITE_OK);
  sqlite3_exec(db, sql, NULL, NULL, &message);
  g_assert_cmpstr(message, ==, NULL);
  sqlite3_close(db);
}

static void test_create(Place *place, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  AwRecord *record = aw_record_create(place->path, &error);
  g_assert_no_error(error);
  g_assert_cmpstr(aw_record_path(record), ==, place->path);
  g_assert_false(g_file_test(place->path, G_FILE_TEST_EXISTS));
  g_assert_true(aw_record_begin(record, "ada", &error));
  g_assert_true(aw_record_set_fact(record, "name", "first", &error));
  g_assert_false(g_file_test(place->path, G_FILE_TEST_EXISTS));
  g_assert_true(aw_record_commit(record, "start", &error));
  g_assert_no_error(error);
  g_assert_true(g_file_test(place->path, G_FILE_TEST_EXISTS));
  g_autofree char *name = aw_record_fact(record, "name", &error);
  g_assert_cmpstr(name, ==, "first");
  aw_record_free(record);
  g_assert_cmpuint(n_files(place->folder), ==, 1);
}

static void test_create_abandoned(Place *place, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  AwRecord *record = aw_record_create(place->path, &error);
  g_assert_true(aw_record_begin(record, "ada", &error));
  g_assert_true(aw_record_set_fact(record, "name", "first", &error));
  aw_record_free(record);
  g_assert_cmpuint(n_files(place->folder), ==, 0);
}

static void test_create_over_leftovers(Place *place, gconstpointer ignored)
{
  (void)ignored;
  g_autofree char *draft = g_build_filename(place->folder, ".dish.dish.new", NULL);
  g_autofree char *journal = g_strconcat(draft, "-journal", NULL);
  g_autofree char *lock = g_strconcat(place->path, ".lock", NULL);
  write_file(draft, "half a record", 13);
  write_file(journal, "half a journal", 14);
  write_file(lock, "", 0);
  aw_record_free(aw_test_dish_new(place->folder));
  g_assert_cmpuint(n_files(place->folder), ==, 1);
}

static void test_create_refused(Place *place, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  write_file(place->path, "precious", 8);
  g_assert_null(aw_record_create(place->path, &error));
  aw_check_error(&error, AW_ERROR_STATE, "already exists");
  g_autofree char *nowhere = g_build_filename(place->folder, "no", "dish.dish", NULL);
  g_assert_null(aw_record_create(nowhere, &error));
  aw_check_error(&error, AW_ERROR_NOT_FOUND, "there is no folder");
  g_autofree char *link = g_build_filename(place->folder, "dangling", NULL);
  g_assert_cmpint(symlink("nothing", link), ==, 0);
  g_assert_null(aw_record_create(link, &error));
  aw_check_error(&error, AW_ERROR_STATE, "already exists");
  g_assert_cmpuint(n_files(place->folder), ==, 2);
}

/* Someone else's file appears under the name while the first action runs: it is not replaced. */
static void test_create_overtaken(Place *place, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  AwRecord *record = aw_record_create(place->path, &error);
  g_assert_true(aw_record_begin(record, "ada", &error));
  write_file(place->path, "precious", 8);
  g_assert_false(aw_record_commit(record, "start", &error));
  aw_check_error(&error, AW_ERROR_STATE, "appeared meanwhile");
  g_assert_null(aw_record_fact(record, "name", &error));
  aw_check_error(&error, AW_ERROR_STATE, "no longer open");
  g_assert_false(aw_record_begin(record, "ada", &error));
  aw_check_error(&error, AW_ERROR_STATE, "no longer open");
  aw_record_free(record);
  g_autofree char *bytes = NULL;
  g_assert_true(g_file_get_contents(place->path, &bytes, NULL, NULL));
  g_assert_cmpstr(bytes, ==, "precious");
  g_assert_cmpuint(n_files(place->folder), ==, 1);
}

static void test_keeps_all(Place *place, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  AwRecord *record = aw_test_dish_new(place->folder);
  aw_test_dish_segment(record, 10);
  aw_test_dish_accept(record, 3);
  g_autofree char *written = aw_test_dish_dump(record);
  aw_record_free(record);
  g_autoptr(AwRecord) again = aw_record_open(place->path, AW_RECORD_READ, &error);
  g_assert_no_error(error);
  g_assert_true(aw_record_check(again, &error));
  g_autofree char *read = aw_test_dish_dump(again);
  g_assert_cmpstr(written, ==, read);
  g_autoptr(GPtrArray) frames = aw_record_frames(again, &error);
  const AwFrame *last = g_ptr_array_index(frames, 2);
  g_assert_cmpint(last->mtime_ns, ==, G_GINT64_CONSTANT(1900000000123456791));
  g_assert_null(last->overview);
  g_assert_true(isnan(((AwFrame *)g_ptr_array_index(frames, 1))->taken_at_unix_s));
}

static void test_journal(Place *place, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  double before = (double)g_get_real_time() / 1e6;
  g_autoptr(AwRecord) record = aw_test_dish_new(place->folder);
  g_assert_true(aw_record_begin(record, "grace", &error));
  g_assert_true(aw_record_commit(record, "export \xc2\xb5m to \"a.csv\"", &error));
  g_autoptr(GPtrArray) journal = aw_record_journal(record, &error);
  g_assert_no_error(error);
  g_assert_cmpuint(journal->len, ==, 2);
  const AwJournalEntry *entry = g_ptr_array_index(journal, 1);
  g_assert_cmpint(entry->id, ==, 2);
  g_assert_cmpstr(entry->operator_name, ==, "grace");
  g_assert_cmpstr(entry->action, ==, "export \xc2\xb5m to \"a.csv\"");
  g_assert_cmpfloat(entry->at_unix_s, >=, before - 1e-3);
  g_assert_cmpfloat(entry->at_unix_s, <, before + 60);
  g_assert_false(entry->undone);
  g_assert_cmpint(sqlite3_exec(record->db, "DELETE FROM journal", NULL, NULL, NULL), !=, SQLITE_OK);
  g_assert_cmpint(sqlite3_exec(record->db, "UPDATE journal SET operator = 'x'", NULL, NULL, NULL), !=, SQLITE_OK);
}

static void test_rollback(Place *place, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  g_autoptr(AwRecord) record = aw_test_dish_new(place->folder);
  g_autofree char *before = aw_test_dish_dump(record);
  g_assert_true(aw_record_begin(record, "ada", &error));
  g_assert_true(aw_record_set_fact(record, "name", "changed", &error));
  aw_record_rollback(record);
  g_autofree char *after = aw_test_dish_dump(record);
  g_assert_cmpstr(before, ==, after);
  aw_record_rollback(record); /* nothing begun: nothing happens */
  aw_test_dish_segment(record, 2);
}

static void test_settings(Place *place, gconstpointer ignored)
{
  (void)ignored;
  g_autoptr(AwRecord) record = aw_test_dish_new(place->folder);
  gint64 value;
  g_assert_true(aw_sql_int(record, "PRAGMA application_id", &value, NULL));
  g_assert_cmphex((guint64)value, ==, 0x41696d77);
  g_assert_true(aw_sql_int(record, "PRAGMA user_version", &value, NULL));
  g_assert_cmpint(value, ==, AW_RECORD_VERSION);
  g_assert_true(aw_sql_int(record, "PRAGMA synchronous", &value, NULL));
  g_assert_cmpint(value, >=, 2);
  g_assert_true(aw_sql_int(record, "PRAGMA foreign_keys", &value, NULL));
  g_assert_cmpint(value, ==, 1);
  g_assert_true(aw_sql_int(record, "SELECT journal_mode = 'delete' FROM pragma_journal_mode", &value, NULL));
  g_assert_cmpint(value, ==, 1);
}

static void test_facts(Place *place, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  double value = 0;
  g_autoptr(AwRecord) record = aw_test_dish_new(place->folder);
  g_assert_null(aw_record_fact(record, "absent", &error));
  g_assert_no_error(error);
  g_assert_true(aw_record_fact_double(record, "absent", 7.5, &value, &error));
  g_assert_cmpfloat(value, ==, 7.5);
  g_assert_true(aw_record_begin(record, "ada", &error));
  g_assert_true(aw_record_set_fact_double(record, "third", 1.0 / 3.0, &error));
  g_assert_true(aw_record_fact_double(record, "third", 0, &value, &error));
  g_assert_cmpfloat(value, ==, 1.0 / 3.0);
  g_assert_true(aw_record_set_fact_double(record, "third", NAN, &error));
  g_assert_true(aw_record_fact_double(record, "third", 2, &value, &error));
  g_assert_cmpfloat(value, ==, 2);
  g_assert_true(aw_record_set_fact(record, "third", "3", &error));
  g_assert_true(aw_record_set_fact(record, "third", NULL, &error));
  g_assert_null(aw_record_fact(record, "third", &error));
  g_assert_no_error(error);
  g_assert_false(aw_record_fact_double(record, "name", 0, &value, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "fact name");
}

/* Numbers are kept with a point wherever the user lives. */
static void test_numbers(void)
{
  GError *error = NULL;
  double value = 0;
  char *folder = aw_scratch_new();
  AwRecord *record = aw_test_dish_new(folder);
  const AwGateRow gate = { aw_feature_find("area", NULL), 0.5, 1234.25 };
  g_assert_true(aw_record_begin(record, "ada", &error) && aw_record_set_fact_double(record, "x", 1234.5, &error) &&
                aw_record_set_gates(record, &gate, 1, &error) && aw_record_commit(record, "numbers", &error));
  g_autofree char *text = aw_record_fact(record, "x", &error);
  g_autofree char *a = aw_record_fact(record, "pixel_map.xx_um_per_px", &error);
  g_autoptr(GArray) gates = aw_record_gates(record, &error);
  g_assert_cmpstr(text, ==, "1234.5");
  g_assert_cmpstr(a, ==, "0.65");
  g_assert_true(aw_record_fact_double(record, "x", 0, &value, &error));
  g_assert_cmpfloat(value, ==, 1234.5);
  g_assert_cmpfloat(g_array_index(gates, AwGateRow, 0).max, ==, 1234.25);
  aw_record_free(record);
  aw_scratch_remove(folder);
}

static void test_no_pixel_map(Place *place, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  AwPixelMap map;
  g_autoptr(AwRecord) record = aw_record_create(place->path, &error);
  g_assert_false(aw_record_pixel_map(record, &map, &error));
  aw_check_error(&error, AW_ERROR_STATE, "no pixel map yet");
}

static void test_damaged_pixel_map(Place *place, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  AwPixelMap map;
  g_autoptr(AwRecord) record = aw_test_dish_new(place->folder);
  g_assert_true(aw_record_begin(record, "ada", &error) &&
                aw_record_set_fact(record, "pixel_map.xx_um_per_px", "0", &error) &&
                aw_record_set_fact(record, "pixel_map.xy_um_per_px", NULL, &error));
  g_assert_false(aw_record_pixel_map(record, &map, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "its pixel map has no inverse");
  g_assert_true(aw_record_set_fact(record, "pixel_map.origin", "guessed", &error));
  g_assert_false(aw_record_pixel_map(record, &map, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "unknown origin 'guessed'");
}

static void test_read_only_mode(Place *place, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  aw_record_free(aw_test_dish_new(place->folder));
  g_autoptr(AwRecord) record = aw_record_open(place->path, AW_RECORD_READ, &error);
  g_assert_false(aw_record_begin(record, "ada", &error));
  aw_check_error(&error, AW_ERROR_STATE, "open for reading only");
  g_assert_false(aw_record_undo(record, "ada", NULL, &error));
  aw_check_error(&error, AW_ERROR_STATE, "open for reading only");
  g_assert_true(aw_record_read_begin(record, &error));
  g_autofree char *name = aw_record_fact(record, "name", &error);
  g_assert_cmpstr(name, ==, "dish");
  aw_record_read_end(record);
}

static void expect_refusal(const char *path, int code, const char *text)
{
  GError *error = NULL;
  for (int mode = AW_RECORD_READ; mode <= AW_RECORD_WRITE; mode++) {
    g_assert_null(aw_record_open(path, (AwRecordMode)mode, &error));
    aw_check_error(&error, code, text);
  }
}

static void test_open_foreign(Place *place, gconstpointer ignored)
{
  (void)ignored;
  expect_refusal(place->path, AW_ERROR_NOT_FOUND, "No such file");
  expect_refusal(place->folder, AW_ERROR_FORMAT, "folder");
  write_file(place->path, "", 0);
  expect_refusal(place->path, AW_ERROR_FORMAT, "is not a dish record");
  write_file(place->path, "this is a long enough text that is no database at all", 53);
  expect_refusal(place->path, AW_ERROR_FORMAT, "not a dish record");
  g_assert_cmpint(unlink(place->path), ==, 0);
  tamper(place->path, "CREATE TABLE t(a); PRAGMA application_id = 42");
  expect_refusal(place->path, AW_ERROR_FORMAT, "application_id 0x0000002a");
  g_assert_cmpint(unlink(place->path), ==, 0);
  g_assert_cmpint(mkfifo(place->path, 0600), ==, 0);
  expect_refusal(place->path, AW_ERROR_FORMAT, "pipe or device");
}

static void test_open_newer(Place *place, gconstpointer ignored)
{
  (void)ignored;
  aw_record_free(aw_test_dish_new(place->folder));
  tamper(place->path, "PRAGMA user_version = 77");
  expect_refusal(place->path, AW_ERROR_UNSUPPORTED, "version 77, this one reads up to 2");
}

static void test_open_altered(Place *place, gconstpointer ignored)
{
  (void)ignored;
  aw_record_free(aw_test_dish_new(place->folder));
  tamper(place->path, "CREATE VIEW trap AS SELECT 1");
  expect_refusal(place->path, AW_ERROR_FORMAT, "unexpected view trap");
  tamper(place->path, "DROP VIEW trap; CREATE TRIGGER trap AFTER INSERT ON fact BEGIN SELECT 1; END");
  expect_refusal(place->path, AW_ERROR_FORMAT, "unexpected trigger trap");
  tamper(place->path, "DROP TRIGGER trap; ALTER TABLE gate ADD COLUMN extra TEXT");
  expect_refusal(place->path, AW_ERROR_FORMAT, "unexpected column gate.extra");
  tamper(place->path, "ALTER TABLE gate DROP COLUMN extra; DROP TABLE gate");
  expect_refusal(place->path, AW_ERROR_FORMAT, "missing column gate.feature");
}

/* Overwrites `n` bytes at `offset` of the record. */
static void scribble(const char *path, gsize offset, gsize n)
{
  g_autofree char *bytes = NULL;
  gsize n_bytes;
  g_assert_true(g_file_get_contents(path, &bytes, &n_bytes, NULL));
  g_assert_cmpuint(n_bytes, >, offset + n);
  memset(bytes + offset, 0xa5, n);
  write_file(path, bytes, n_bytes);
}

static void test_damaged(Place *place, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  AwRecord *record = aw_test_dish_new(place->folder);
  aw_test_dish_segment(record, 500);
  aw_record_free(record);
  struct stat st;
  g_assert_cmpint(stat(place->path, &st), ==, 0);
  scribble(place->path, 4096 * 20, 4096 * 20);
  g_autoptr(AwRecord) again = aw_record_open(place->path, AW_RECORD_READ, &error);
  g_assert_no_error(error);
  g_assert_false(aw_record_check(again, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "dish.dish");
  g_assert_null(aw_record_nuclei(again, TRUE, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "malformed");
}

static void test_damaged_header(Place *place, gconstpointer ignored)
{
  (void)ignored;
  aw_record_free(aw_test_dish_new(place->folder));
  scribble(place->path, 100, 3000);
  expect_refusal(place->path, AW_ERROR_FORMAT, "dish.dish");
}

static void test_foreign_keys_checked(Place *place, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  AwRecord *record = aw_test_dish_new(place->folder);
  aw_test_dish_segment(record, 5);
  aw_test_dish_accept(record, 2);
  aw_record_free(record);
  tamper(place->path, "DELETE FROM nucleus WHERE id = 2");
  g_autoptr(AwRecord) again = aw_record_open(place->path, AW_RECORD_READ, &error);
  g_assert_false(aw_record_check(again, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "row 2 of table decision");
}

static void test_share_names(void)
{
  g_assert_cmpstr(aw_lock_share_name(0x6969), ==, "NFS");
  g_assert_cmpstr(aw_lock_share_name(0xff534d42), ==, "CIFS");
  g_assert_cmpstr(aw_lock_share_name(0xfe534d42), ==, "SMB2");
  g_assert_cmpstr(aw_lock_share_name(0x65735546), ==, "FUSE");
  g_assert_null(aw_lock_share_name(0xef53)); /* ext4 */
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
#define ADD(name, fn) g_test_add("/record/record/" name, Place, NULL, set_up, fn, tear_down)
  ADD("create", test_create);
  ADD("create-abandoned", test_create_abandoned);
  ADD("create-over-leftovers", test_create_over_leftovers);
  ADD("create-refused", test_create_refused);
  ADD("create-overtaken", test_create_overtaken);
  ADD("keeps-all", test_keeps_all);
  ADD("journal", test_journal);
  ADD("rollback", test_rollback);
  ADD("settings", test_settings);
  ADD("facts", test_facts);
  ADD("no-pixel-map", test_no_pixel_map);
  ADD("damaged-pixel-map", test_damaged_pixel_map);
  ADD("read-only-mode", test_read_only_mode);
  ADD("open-foreign", test_open_foreign);
  ADD("open-newer", test_open_newer);
  ADD("open-altered", test_open_altered);
  ADD("damaged", test_damaged);
  ADD("damaged-header", test_damaged_header);
  ADD("foreign-keys-checked", test_foreign_keys_checked);
  aw_check_add("/record/record/numbers", test_numbers);
  g_test_add_func("/record/record/share-names", test_share_names);
  return g_test_run();
}

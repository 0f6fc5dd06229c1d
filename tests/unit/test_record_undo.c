/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/* Undo and redo: every kind of action, across processes, and what is refused. */
#include <math.h>

#include "base/random.h"
#include "record/private.h"
#include "support/check.h"
#include "support/dish.h"

typedef struct {
  char *folder, *path;
  AwRecord *record;
} Dish;

static void set_up(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  dish->folder = aw_scratch_new();
  dish->path = g_build_filename(dish->folder, "dish.dish", NULL);
  dish->record = aw_test_dish_new(dish->folder);
}

static void tear_down(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  aw_record_free(dish->record);
  aw_scratch_remove(dish->folder);
  g_free(dish->path);
}

/* Closes and opens again: what another process would see. */
static void reopen(Dish *dish)
{
  GError *error = NULL;
  aw_record_free(dish->record);
  dish->record = aw_record_open(dish->path, AW_RECORD_WRITE, &error);
  g_assert_no_error(error);
}

static void undo(Dish *dish, const char *expected)
{
  GError *error = NULL;
  g_autofree char *what = NULL;
  gboolean ok = aw_record_undo(dish->record, "grace", &what, &error);
  g_assert_no_error(error);
  g_assert_true(ok);
  g_assert_cmpstr(what, ==, expected);
}

static void redo(Dish *dish, const char *expected)
{
  GError *error = NULL;
  g_autofree char *what = NULL;
  gboolean ok = aw_record_redo(dish->record, "grace", &what, &error);
  g_assert_no_error(error);
  g_assert_true(ok);
  g_assert_cmpstr(what, ==, expected);
}

static void refuse_undo(Dish *dish, const char *text)
{
  GError *error = NULL;
  g_assert_false(aw_record_undo(dish->record, "grace", NULL, &error));
  aw_check_error(&error, AW_ERROR_STATE, text);
}

static void refuse_redo(Dish *dish)
{
  GError *error = NULL;
  g_assert_false(aw_record_redo(dish->record, "grace", NULL, &error));
  aw_check_error(&error, AW_ERROR_STATE, "nothing to redo");
}

/* The actions of a day, one of each kind. */
static gboolean change_gates(AwRecord *record, GError **error)
{
  const AwGateRow gates[] = { { aw_feature_find("area", NULL), 20, 200.5 },
                              { aw_feature_find("isolation", NULL), 4, INFINITY } };
  return aw_record_set_gates(record, gates, 2, error);
}

static gboolean change_gates_again(AwRecord *record, GError **error)
{
  const AwGateRow gate = { aw_feature_find("convexity", NULL), 0.9, 1 };
  return aw_record_set_gates(record, &gate, 1, error);
}

static gboolean change_nuclei(AwRecord *record, GError **error)
{
  g_autoptr(GPtrArray) nuclei = aw_test_nuclei(40, 1, 3);
  return aw_record_set_nuclei(record, nuclei, error);
}

static gboolean change_decisions(AwRecord *record, GError **error)
{
  for (gint64 id = 1; id <= 12; id++) {
    const AwDecision decision = { id, id % 2 ? AW_STATE_ACCEPTED : AW_STATE_REJECTED, id % 3 == 0 };
    if (!aw_record_set_decision(record, &decision, error))
      return FALSE;
  }
  return TRUE;
}

static gboolean change_tour(AwRecord *record, GError **error)
{
  const gint64 ids[] = { 11, 3, 5, 1, 9, 7 };
  return aw_record_set_tour(record, ids, G_N_ELEMENTS(ids), error);
}

/* Some nuclei vanish, some move, new ones come; decisions and tour stops of the vanished go too. */
static gboolean change_nuclei_again(AwRecord *record, GError **error)
{
  g_autoptr(GPtrArray) nuclei = aw_test_nuclei(30, 6, 3);
  for (guint i = 0; i < nuclei->len; i += 3) {
    AwNucleus *nucleus = g_ptr_array_index(nuclei, i);
    nucleus->id += 1000;
    nucleus->area = NAN;
    nucleus->outline[0].x_um += 0.5;
  }
  return aw_record_set_nuclei(record, nuclei, error);
}

static gboolean change_facts(AwRecord *record, GError **error)
{
  const AwPixelMap map = { { -0.5, 0, 0, 0.5 }, AW_ORIGIN_ASSUMED, 0 };
  return aw_record_set_pixel_map(record, &map, error) && aw_record_set_fact(record, "name", "new name", error) &&
         aw_record_set_fact(record, "extra", "fact", error);
}

static gboolean change_frames(AwRecord *record, GError **error)
{
  g_autoptr(GPtrArray) frames = aw_test_frames(4);
  AwFrame *first = g_ptr_array_index(frames, 0);
  g_free(first->file);
  first->file = g_strdup("moved/frame_0.tif");
  return aw_record_set_frames(record, frames, error);
}

static gboolean change_nothing_left(AwRecord *record, GError **error)
{
  g_autoptr(GPtrArray) none = aw_nuclei_new();
  return aw_record_set_nuclei(record, none, error);
}

static const struct {
  const char *name;
  gboolean (*change)(AwRecord *record, GError **error);
} actions[] = {
  { "gates", change_gates }, { "nuclei", change_nuclei },           { "decisions", change_decisions },
  { "tour", change_tour },   { "gates again", change_gates_again }, { "nuclei again", change_nuclei_again },
  { "facts", change_facts }, { "frames", change_frames },           { "no nuclei", change_nothing_left }
};
#define N_ACTIONS G_N_ELEMENTS(actions)

static void act(Dish *dish, gsize i)
{
  GError *error = NULL;
  g_assert_true(aw_record_begin(dish->record, "ada", &error));
  gboolean ok = actions[i].change(dish->record, &error);
  g_assert_no_error(error);
  g_assert_true(ok && aw_record_commit(dish->record, actions[i].name, &error));
  g_assert_no_error(error);
}

static void expect_dump(Dish *dish, const char *expected)
{
  g_autofree char *now = aw_test_dish_dump(dish->record);
  g_assert_cmpstr(now, ==, expected);
}

/* All the way back and forth twice, the record closed and opened at every step. */
static void test_every_action(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  char *states[N_ACTIONS + 1];
  states[0] = aw_test_dish_dump(dish->record);
  for (gsize i = 0; i < N_ACTIONS; i++) {
    act(dish, i);
    states[i + 1] = aw_test_dish_dump(dish->record);
    g_assert_cmpstr(states[i + 1], !=, states[i]);
  }
  for (int round = 0; round < 2; round++) {
    for (gsize i = N_ACTIONS; i-- > 0; reopen(dish)) {
      undo(dish, actions[i].name);
      expect_dump(dish, states[i]);
    }
    refuse_undo(dish, "its first action (start) cannot be undone");
    for (gsize i = 0; i < N_ACTIONS; i++, reopen(dish)) {
      redo(dish, actions[i].name);
      expect_dump(dish, states[i + 1]);
    }
    refuse_redo(dish);
  }
  GError *error = NULL;
  g_assert_true(aw_record_check(dish->record, &error));
  for (gsize i = 0; i <= N_ACTIONS; i++)
    g_free(states[i]);
}

/* Every change above is seen by the dump: else the test before proves nothing. */
static void test_journal_marks(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  act(dish, 0);
  act(dish, 1);
  undo(dish, "nuclei");
  undo(dish, "gates");
  redo(dish, "gates");
  g_autoptr(GPtrArray) journal = aw_record_journal(dish->record, &error);
  const char *const texts[] = {
    "start", "gates", "nuclei", "Undid entry 3: nuclei", "Undid entry 2: gates", "Did entry 2 again: gates"
  };
  g_assert_cmpuint(journal->len, ==, G_N_ELEMENTS(texts));
  for (guint i = 0; i < journal->len; i++) {
    const AwJournalEntry *entry = g_ptr_array_index(journal, i);
    g_assert_cmpint(entry->id, ==, i + 1);
    g_assert_cmpstr(entry->action, ==, texts[i]);
    g_assert_cmpint(entry->undone, ==, i == 2);
    g_assert_cmpstr(entry->operator_name, ==, i < 3 ? "ada" : "grace");
  }
}

/* A new action ends what could be redone, for good. */
static void test_branch(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  act(dish, 1);
  act(dish, 2);
  undo(dish, "decisions");
  act(dish, 0);
  refuse_redo(dish);
  undo(dish, "gates");
  redo(dish, "gates"); /* not the decisions that were given up before */
  undo(dish, "gates");
  undo(dish, "nuclei");
  refuse_undo(dish, "nothing left to undo");
  redo(dish, "nuclei");
  redo(dish, "gates");
  refuse_redo(dish);
}

/* An action that changes no data is journalled, not undone, and leaves redo possible. */
static void test_note(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  act(dish, 0);
  act(dish, 1);
  undo(dish, "nuclei");
  g_assert_true(aw_record_begin(dish->record, "ada", &error) && aw_record_commit(dish->record, "export", &error));
  act(dish, 0); /* the same gates again: no change either */
  redo(dish, "nuclei");
  undo(dish, "nuclei");
  undo(dish, "gates");
  refuse_undo(dish, "start");
}

static void test_ids_never_return(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  gint64 id = 0;
  g_assert_true(aw_record_next_nucleus_id(dish->record, &id, &error));
  g_assert_cmpint(id, ==, 1);
  act(dish, 1);
  g_assert_true(aw_record_next_nucleus_id(dish->record, &id, &error));
  g_assert_cmpint(id, ==, 41);
  undo(dish, "nuclei");
  reopen(dish);
  g_assert_true(aw_record_next_nucleus_id(dish->record, &id, &error));
  g_assert_cmpint(id, ==, 41);
}

/* Random walks over actions, undo and redo against a model with two stacks. */
static void test_random_walk(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  AwRandom random = aw_random_stream(8, 1);
  g_autoptr(GPtrArray) past = g_ptr_array_new_with_free_func(g_free);
  g_autoptr(GPtrArray) future = g_ptr_array_new_with_free_func(g_free);
  aw_test_dish_segment(dish->record, 20);
  g_ptr_array_add(past, aw_test_dish_dump(dish->record));
  for (int step = 0; step < 150; step++) {
    guint32 draw = aw_random_below(&random, 10);
    if (draw < 4) {
      aw_test_dish_accept(dish->record, 1 + step % 20);
      g_autofree char *now = aw_test_dish_dump(dish->record);
      if (!g_str_equal(now, g_ptr_array_index(past, past->len - 1))) {
        g_ptr_array_add(past, g_steal_pointer(&now));
        g_ptr_array_set_size(future, 0);
      }
    } else if (draw < 7 && past->len > 1) {
      g_assert_true(aw_record_undo(dish->record, "ada", NULL, NULL));
      g_ptr_array_add(future, g_ptr_array_steal_index(past, past->len - 1));
    } else if (draw >= 7 && future->len > 0) {
      g_assert_true(aw_record_redo(dish->record, "ada", NULL, NULL));
      g_ptr_array_add(past, g_ptr_array_steal_index(future, future->len - 1));
    }
    expect_dump(dish, g_ptr_array_index(past, past->len - 1));
  }
}

static void alter(Dish *dish, const char *sql)
{
  GError *error = NULL;
  g_assert_true(aw_sql_exec(dish->record, sql, &error));
  g_assert_no_error(error);
}

static void refuse_damaged(Dish *dish, const char *text)
{
  GError *error = NULL;
  g_autofree char *before = aw_test_dish_dump(dish->record);
  g_assert_false(aw_record_undo(dish->record, "grace", NULL, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, text);
  expect_dump(dish, before);
  g_autoptr(GPtrArray) journal = aw_record_journal(dish->record, &error);
  g_assert_cmpuint(journal->len, ==, 2);
}

static void test_damaged_change(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  act(dish, 1);
  alter(dish, "UPDATE change SET packed = substr(packed, 1, length(packed) - 5)");
  refuse_damaged(dish, "changes of journal entry 2 cannot be read");
  alter(dish, "UPDATE change SET packed = x'00'");
  refuse_damaged(dish, "changes of journal entry 2 cannot be read");
  alter(dish, "DELETE FROM change");
  refuse_damaged(dish, "changes of journal entry 2 cannot be read");
}

static void test_altered_data(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  act(dish, 1);
  alter(dish, "UPDATE nucleus SET area_um2 = 1 WHERE id = 7");
  refuse_damaged(dish, "do not fit its present contents");
}

static void test_altered_journal(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  GError *error = NULL;
  act(dish, 1);
  alter(dish, "INSERT INTO journal VALUES(3, 0, 'x', 'y', 4, 2)");
  g_assert_false(aw_record_undo(dish->record, "grace", NULL, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "entry 3 does not fit those before it");
  alter(dish, "PRAGMA foreign_keys = OFF; INSERT INTO journal VALUES(4, 0, 'x', 'y', 3, 77); PRAGMA foreign_keys = ON");
  g_assert_null(aw_record_journal(dish->record, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "the journal undoes entry 77, which is not there");
  alter(dish, "INSERT INTO journal VALUES(9, 0, 'x', 'y', 1, NULL)");
  g_assert_null(aw_record_journal(dish->record, &error));
  aw_check_error(&error, AW_ERROR_FORMAT, "journal entry 5 is missing");
}

/* More than one part of packed changes. */
static void test_large(Dish *dish, gconstpointer ignored)
{
  (void)ignored;
  gint64 n_parts = 0;
  g_autofree char *before = aw_test_dish_dump(dish->record);
  GError *error = NULL;
  g_autoptr(GRand) rand = g_rand_new_with_seed(1);
  g_autofree char *noise = g_malloc(6 << 20);
  for (gsize i = 0; i < 6 << 20; i++)
    noise[i] = (char)g_rand_int_range(rand, 1, 127);
  noise[(6 << 20) - 1] = '\0';
  g_assert_true(aw_record_begin(dish->record, "ada", &error) &&
                aw_record_set_fact(dish->record, "noise", noise, &error) &&
                aw_record_commit(dish->record, "noise", &error));
  g_assert_true(aw_sql_int(dish->record, "SELECT count(*) FROM change", &n_parts, &error));
  g_assert_cmpint(n_parts, >, 1);
  undo(dish, "noise");
  expect_dump(dish, before);
  redo(dish, "noise");
  g_autofree char *again = aw_record_fact(dish->record, "noise", &error);
  g_assert_true(g_str_equal(again, noise));
}

int main(int argc, char **argv)
{
  g_test_init(&argc, &argv, NULL);
  aw_test_use_memory();
#define ADD(name, fn) g_test_add("/record/undo/" name, Dish, NULL, set_up, fn, tear_down)
  ADD("every-action", test_every_action);
  ADD("journal-marks", test_journal_marks);
  ADD("branch", test_branch);
  ADD("note", test_note);
  ADD("ids-never-return", test_ids_never_return);
  ADD("random-walk", test_random_walk);
  ADD("damaged-change", test_damaged_change);
  ADD("altered-data", test_altered_data);
  ADD("altered-journal", test_altered_journal);
  ADD("large", test_large);
  return g_test_run();
}

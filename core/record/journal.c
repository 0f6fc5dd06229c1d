/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/error.h"
#include "record/private.h"

gboolean aw_journal_next_id(AwRecord *record, gint64 *id, GError **error)
{
  return aw_sql_int(record, "SELECT ifnull(max(id), 0) + 1 FROM journal", id, error);
}

gboolean aw_journal_append(AwRecord *record, AwEntryKind kind, gint64 target_id, const char *operator_name,
                           const char *action, GError **error)
{
  gint64 id;
  if (!aw_journal_next_id(record, &id, error))
    return FALSE;
  sqlite3_stmt *insert = aw_sql_prepare(record, "INSERT INTO journal VALUES(?, ?, ?, ?, ?, nullif(?, 0))", error);
  if (!insert)
    return FALSE;
  sqlite3_bind_int64(insert, 1, id);
  sqlite3_bind_double(insert, 2, (double)g_get_real_time() / 1e6);
  aw_sql_bind_text(insert, 3, operator_name);
  aw_sql_bind_text(insert, 4, action);
  sqlite3_bind_int(insert, 5, (int)kind);
  sqlite3_bind_int64(insert, 6, target_id);
  return aw_sql_run(record, insert, error);
}

char *aw_journal_action(AwRecord *record, gint64 id, GError **error)
{
  g_autoptr(sqlite3_stmt) get = aw_sql_prepare(record, "SELECT action FROM journal WHERE id = ?", error);
  if (!get)
    return NULL;
  sqlite3_bind_int64(get, 1, id);
  int row = aw_sql_row(record, get, error);
  if (row > 0)
    return aw_sql_text(get, 0);
  if (row == 0)
    aw_record_damaged(record, error, "journal entry %" G_GINT64_FORMAT " is missing", id);
  return NULL;
}

void aw_history_clear(AwHistory *history)
{
  g_clear_pointer(&history->standing, g_array_unref);
  g_clear_pointer(&history->undone, g_array_unref);
}

/* Moves the last id of `from` to `to`, if it is `id`. */
static gboolean move_last(GArray *from, GArray *to, gint64 id)
{
  if (from->len == 0 || g_array_index(from, gint64, from->len - 1) != id)
    return FALSE;
  g_array_set_size(from, from->len - 1);
  g_array_append_val(to, id);
  return TRUE;
}

/* The journal is only ever appended to, so what stands is found by playing it: two stacks, as in any undo. */
static gboolean play_entry(AwHistory *history, AwEntryKind kind, gint64 id, gint64 target_id)
{
  switch (kind) {
  case AW_ENTRY_START:
    g_array_set_size(history->standing, 0);
    g_array_set_size(history->undone, 0);
    return TRUE;
  case AW_ENTRY_DO:
    g_array_append_val(history->standing, id);
    g_array_set_size(history->undone, 0);
    return TRUE;
  case AW_ENTRY_NOTE:
    return TRUE;
  case AW_ENTRY_UNDO:
    return move_last(history->standing, history->undone, target_id);
  case AW_ENTRY_REDO:
    return move_last(history->undone, history->standing, target_id);
  }
  return FALSE;
}

gboolean aw_history_read(AwRecord *record, AwHistory *history, GError **error)
{
  g_autoptr(sqlite3_stmt) entries =
      aw_sql_prepare(record, "SELECT kind, id, ifnull(target, 0) FROM journal ORDER BY id", error);
  history->standing = g_array_new(FALSE, FALSE, sizeof(gint64));
  history->undone = g_array_new(FALSE, FALSE, sizeof(gint64));
  int row = entries ? aw_sql_row(record, entries, error) : -1;
  for (; row > 0; row = aw_sql_row(record, entries, error)) {
    gint64 id = sqlite3_column_int64(entries, 1);
    if (!play_entry(history, (AwEntryKind)sqlite3_column_int(entries, 0), id, sqlite3_column_int64(entries, 2)))
      return aw_record_damaged(record, error, "journal entry %" G_GINT64_FORMAT " does not fit those before it", id);
  }
  return row == 0;
}

static void entry_free(gpointer data)
{
  AwJournalEntry *entry = data;
  g_free(entry->operator_name);
  g_free(entry->action);
  g_free(entry);
}

/* Marks as undone the actions whose last undo was not followed by a redo. */
static gboolean mark_undone(AwRecord *record, GPtrArray *journal, GError **error)
{
  g_autoptr(sqlite3_stmt) moves = aw_sql_prepare(
      record, "SELECT kind, target FROM journal WHERE kind IN (3, 4) AND target IS NOT NULL ORDER BY id", error);
  int row = moves ? aw_sql_row(record, moves, error) : -1;
  for (; row > 0; row = aw_sql_row(record, moves, error)) {
    gint64 at = sqlite3_column_int64(moves, 1) - 1; /* ids count from 1 without gaps */
    if (at < 0 || at >= (gint64)journal->len)
      return aw_record_damaged(record, error, "the journal undoes entry %" G_GINT64_FORMAT ", which is not there",
                               at + 1);
    AwJournalEntry *entry = g_ptr_array_index(journal, at);
    entry->undone = sqlite3_column_int(moves, 0) == (int)AW_ENTRY_UNDO;
  }
  return row == 0;
}

GPtrArray *aw_record_journal(AwRecord *record, GError **error)
{
  g_autoptr(GPtrArray) journal = g_ptr_array_new_with_free_func(entry_free);
  g_autoptr(sqlite3_stmt) get =
      aw_sql_prepare(record, "SELECT id, at_unix_s, operator, action FROM journal ORDER BY id", error);
  int row = get ? aw_sql_row(record, get, error) : -1;
  for (; row > 0; row = aw_sql_row(record, get, error)) {
    AwJournalEntry *entry = g_new0(AwJournalEntry, 1);
    g_ptr_array_add(journal, entry);
    entry->id = sqlite3_column_int64(get, 0);
    entry->at_unix_s = sqlite3_column_double(get, 1);
    entry->operator_name = aw_sql_text(get, 2);
    entry->action = aw_sql_text(get, 3);
    if (entry->id != (gint64)journal->len) {
      aw_record_damaged(record, error, "journal entry %u is missing", journal->len);
      return NULL;
    }
  }
  return row == 0 && mark_undone(record, journal, error) ? g_steal_pointer(&journal) : NULL;
}

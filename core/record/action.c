/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/error.h"
#include "record/private.h"

static gboolean start(AwRecord *record, const char *operator_name, GError **error)
{
  if (record->mode != AW_RECORD_WRITE) {
    g_set_error(error, AW_ERROR, AW_ERROR_STATE, "%s is open for reading only", record->path);
    return FALSE;
  }
  if (!aw_sql_exec(record, "BEGIN IMMEDIATE", error))
    return FALSE;
  record->in_action = TRUE;
  g_free(record->operator_name);
  record->operator_name = g_strdup(operator_name);
  return aw_journal_next_id(record, &record->action_id, error);
}

void aw_record_rollback(AwRecord *record)
{
  if (!record->in_action)
    return;
  aw_changes_unwatch(record);
  if (record->db && !sqlite3_get_autocommit(record->db)) /* some errors have rolled back already */
    sqlite3_exec(record->db, "ROLLBACK", NULL, NULL, NULL);
  record->in_action = FALSE;
}

/* Keeps the error of a failed action while taking the action back. Always FALSE. */
static gboolean abandon(AwRecord *record)
{
  aw_record_rollback(record);
  return FALSE;
}

gboolean aw_record_begin(AwRecord *record, const char *operator_name, GError **error)
{
  g_return_val_if_fail(record && operator_name && !record->in_action, FALSE);
  if (!start(record, operator_name, error))
    return abandon(record);
  /* The first action makes the record; there is nothing to go back to, so its changes are not kept twice. */
  if (record->action_id > 1 && !aw_changes_watch(record, error))
    return abandon(record);
  return TRUE;
}

/* Images found touched but unchanged get their new time with the next action (record/files.h). */
static gboolean store_touched(AwRecord *record, GError **error)
{
  GHashTableIter iter;
  gpointer file, mtime_ns;
  g_hash_table_iter_init(&iter, record->touched);
  while (g_hash_table_iter_next(&iter, &file, &mtime_ns))
    if (!aw_frames_put_time(record, file, *(const gint64 *)mtime_ns, error))
      return FALSE;
  return TRUE;
}

static gboolean finish(AwRecord *record, AwEntryKind kind, gint64 target_id, const char *action, GError **error)
{
  if (!store_touched(record, error) ||
      !aw_journal_append(record, kind, target_id, record->operator_name, action, error) ||
      !aw_sql_exec(record, "COMMIT", error))
    return abandon(record);
  g_hash_table_remove_all(record->touched);
  aw_changes_unwatch(record);
  record->in_action = FALSE;
  return !record->draft_path || aw_draft_publish(record, error);
}

gboolean aw_record_commit(AwRecord *record, const char *action, GError **error)
{
  g_return_val_if_fail(record && action && record->in_action, FALSE);
  gboolean any = FALSE;
  if (record->session && !aw_changes_store(record, record->action_id, &any, error))
    return abandon(record);
  return finish(record, record->action_id == 1 ? AW_ENTRY_START : any ? AW_ENTRY_DO : AW_ENTRY_NOTE, 0, action, error);
}

/* The entry to undo or redo: the last of its stack. An empty stack is refused with the reason. */
static gboolean pick_target(AwRecord *record, gboolean undo, gint64 *target_id, GError **error)
{
  g_auto(AwHistory) history = { NULL, NULL };
  if (!aw_history_read(record, &history, error))
    return FALSE;
  const GArray *stack = undo ? history.standing : history.undone;
  if (stack->len > 0) {
    *target_id = g_array_index(stack, gint64, stack->len - 1);
    return TRUE;
  }
  gint64 first = 0;
  g_autofree char *action = NULL;
  if (undo && (!aw_sql_int(record, "SELECT max(id) FROM journal WHERE kind = 0", &first, error) ||
               !(action = aw_journal_action(record, first, error))))
    return FALSE;
  if (undo)
    g_set_error(error, AW_ERROR, AW_ERROR_STATE, "nothing left to undo in %s: its first action (%s) cannot be undone",
                record->path, action);
  else
    g_set_error(error, AW_ERROR, AW_ERROR_STATE,
                "nothing to redo in %s: no action was undone, or another was done since", record->path);
  return FALSE;
}

static gboolean move_in_history(AwRecord *record, const char *operator_name, gboolean undo, char **what, GError **error)
{
  gint64 target_id = 0;
  if (!start(record, operator_name, error) || !pick_target(record, undo, &target_id, error) ||
      !aw_changes_apply(record, target_id, undo, error))
    return abandon(record);
  g_autofree char *action = aw_journal_action(record, target_id, error);
  if (!action)
    return abandon(record);
  g_autofree char *entry = g_strdup_printf(
      undo ? "Undid entry %" G_GINT64_FORMAT ": %s" : "Did entry %" G_GINT64_FORMAT " again: %s", target_id, action);
  if (!finish(record, undo ? AW_ENTRY_UNDO : AW_ENTRY_REDO, target_id, entry, error))
    return FALSE;
  if (what)
    *what = g_steal_pointer(&action);
  return TRUE;
}

gboolean aw_record_undo(AwRecord *record, const char *operator_name, char **what, GError **error)
{
  g_return_val_if_fail(record && operator_name && !record->in_action, FALSE);
  return move_in_history(record, operator_name, TRUE, what, error);
}

gboolean aw_record_redo(AwRecord *record, const char *operator_name, char **what, GError **error)
{
  g_return_val_if_fail(record && operator_name && !record->in_action, FALSE);
  return move_in_history(record, operator_name, FALSE, what, error);
}

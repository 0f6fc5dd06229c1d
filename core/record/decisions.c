/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/error.h"
#include "base/text.h"
#include "record/private.h"

const char *aw_state_name(AwState state)
{
  static const char *const names[] = { "found", "proposed", "accepted", "rejected" };
  return names[state];
}

static gboolean nucleus_exists(AwRecord *record, gint64 id, GError **error)
{
  g_autoptr(sqlite3_stmt) get = aw_sql_prepare(record, "SELECT 1 FROM nucleus WHERE id = ?", error);
  if (!get)
    return FALSE;
  sqlite3_bind_int64(get, 1, id);
  int row = aw_sql_row(record, get, error);
  if (row == 0)
    g_set_error(error, AW_ERROR, AW_ERROR_NOT_FOUND, "there is no nucleus %" G_GINT64_FORMAT " in %s", id,
                record->path);
  return row > 0;
}

gboolean aw_record_set_decision(AwRecord *record, const AwDecision *decision, GError **error)
{
  g_return_val_if_fail(record->in_action && decision->state <= AW_STATE_REJECTED, FALSE);
  if (!nucleus_exists(record, decision->nucleus_id, error))
    return FALSE;
  /* A decision that stays as it is keeps the entry that made it. */
  static const char put[] = "INSERT INTO decision VALUES(?, ?, ?, ?) ON CONFLICT(nucleus) DO UPDATE SET"
                            " state = excluded.state, by_hand = excluded.by_hand, journal = excluded.journal"
                            " WHERE state <> excluded.state OR by_hand <> excluded.by_hand";
  gboolean decided = decision->state != AW_STATE_FOUND;
  sqlite3_stmt *set = aw_sql_prepare(record, decided ? put : "DELETE FROM decision WHERE nucleus = ?", error);
  if (!set)
    return FALSE;
  sqlite3_bind_int64(set, 1, decision->nucleus_id);
  if (decided) {
    sqlite3_bind_int(set, 2, (int)decision->state);
    sqlite3_bind_int(set, 3, decision->by_hand ? 1 : 0);
    sqlite3_bind_int64(set, 4, record->action_id);
  }
  return aw_sql_run(record, set, error);
}

GArray *aw_record_decisions(AwRecord *record, GError **error)
{
  g_autoptr(GArray) decisions = g_array_new(FALSE, FALSE, sizeof(AwDecision));
  g_autoptr(sqlite3_stmt) get =
      aw_sql_prepare(record, "SELECT nucleus, state, by_hand FROM decision ORDER BY nucleus", error);
  int row = get ? aw_sql_row(record, get, error) : -1;
  for (; row > 0; row = aw_sql_row(record, get, error)) {
    int state = sqlite3_column_int(get, 1);
    AwDecision decision = { sqlite3_column_int64(get, 0), (AwState)state, sqlite3_column_int(get, 2) != 0 };
    if (state <= AW_STATE_FOUND || state > AW_STATE_REJECTED) {
      aw_record_damaged(record, error, "nucleus %" G_GINT64_FORMAT " has the unknown state %d", decision.nucleus_id,
                        state);
      return NULL;
    }
    g_array_append_val(decisions, decision);
  }
  return row == 0 ? g_steal_pointer(&decisions) : NULL;
}

static gboolean gate_is_open(const AwGateRow *gate, GError **error)
{
  if (gate->min <= gate->max)
    return TRUE;
  g_autofree char *min = aw_text_from_double_exact(gate->min);
  g_autofree char *max = aw_text_from_double_exact(gate->max);
  g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
              "the gate on %s lets nothing in: its lower limit %s is above the upper %s", gate->feature->stem, min,
              max);
  return FALSE;
}

gboolean aw_record_set_gates(AwRecord *record, const AwGateRow *gates, gsize n, GError **error)
{
  g_return_val_if_fail(record->in_action, FALSE);
  if (!aw_sql_exec(record, "DELETE FROM gate", error))
    return FALSE;
  for (gsize i = 0; i < n; i++) {
    if (!gate_is_open(&gates[i], error))
      return FALSE;
    sqlite3_stmt *put = aw_sql_prepare(record, "INSERT INTO gate VALUES(?, ?, ?, ?)", error);
    if (!put)
      return FALSE;
    sqlite3_bind_int64(put, 1, (gint64)i);
    aw_sql_bind_text(put, 2, gates[i].feature->stem);
    sqlite3_bind_double(put, 3, gates[i].min);
    sqlite3_bind_double(put, 4, gates[i].max);
    if (!aw_sql_run(record, put, error))
      return FALSE;
  }
  return TRUE;
}

GArray *aw_record_gates(AwRecord *record, GError **error)
{
  g_autoptr(GArray) gates = g_array_new(FALSE, FALSE, sizeof(AwGateRow));
  g_autoptr(sqlite3_stmt) get = aw_sql_prepare(record, "SELECT feature, min, max FROM gate ORDER BY number", error);
  int row = get ? aw_sql_row(record, get, error) : -1;
  for (; row > 0; row = aw_sql_row(record, get, error)) {
    g_autofree char *name = aw_sql_text(get, 0);
    AwGateRow gate = { aw_feature_find(name, NULL), aw_sql_double(get, 1), aw_sql_double(get, 2) };
    if (!gate.feature || !(gate.min <= gate.max)) {
      aw_record_damaged(record, error, "its gate on '%s' cannot be read", name);
      return NULL;
    }
    g_array_append_val(gates, gate);
  }
  return row == 0 ? g_steal_pointer(&gates) : NULL;
}

gboolean aw_record_set_tour(AwRecord *record, const gint64 *ids, gsize n, GError **error)
{
  g_return_val_if_fail(record->in_action, FALSE);
  g_autoptr(GHashTable) seen = g_hash_table_new(g_int64_hash, g_int64_equal);
  if (!aw_sql_exec(record, "DELETE FROM tour_stop", error))
    return FALSE;
  for (gsize i = 0; i < n; i++) {
    gint64 id = ids[i];
    if (!nucleus_exists(record, id, error))
      return FALSE;
    if (g_hash_table_contains(seen, &id)) {
      g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "the tour visits nucleus %" G_GINT64_FORMAT " twice", id);
      return FALSE;
    }
    g_hash_table_add(seen, (gpointer)(guintptr)&ids[i]);
    sqlite3_stmt *put = aw_sql_prepare(record, "INSERT INTO tour_stop VALUES(?, ?)", error);
    if (!put)
      return FALSE;
    sqlite3_bind_int64(put, 1, (gint64)i);
    sqlite3_bind_int64(put, 2, id);
    if (!aw_sql_run(record, put, error))
      return FALSE;
  }
  return TRUE;
}

GArray *aw_record_tour(AwRecord *record, GError **error)
{
  g_autoptr(GArray) tour = g_array_new(FALSE, FALSE, sizeof(gint64));
  g_autoptr(sqlite3_stmt) get = aw_sql_prepare(record, "SELECT nucleus FROM tour_stop ORDER BY number", error);
  int row = get ? aw_sql_row(record, get, error) : -1;
  for (; row > 0; row = aw_sql_row(record, get, error)) {
    gint64 id = sqlite3_column_int64(get, 0);
    g_array_append_val(tour, id);
  }
  return row == 0 ? g_steal_pointer(&tour) : NULL;
}

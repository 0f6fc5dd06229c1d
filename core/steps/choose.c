/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "steps/choose.h"

#include <string.h>

#include "base/error.h"
#include "steps/idlist.h"

#define MAX_PARTICLES 1000000

/* A choice under way. */
typedef struct {
  AwRecord *record;
  GPtrArray *nuclei;
  AwState *states;   /* as they become */
  gboolean *by_hand; /* decided by a person */
  gboolean targets_changed;
} Choice;

static void choice_clear(Choice *c)
{
  g_clear_pointer(&c->nuclei, g_ptr_array_unref);
  g_clear_pointer(&c->states, g_free);
  g_clear_pointer(&c->by_hand, g_free);
  g_clear_pointer(&c->record, aw_record_free);
}
G_DEFINE_AUTO_CLEANUP_CLEAR_FUNC(Choice, choice_clear)

void aw_choose_summary_clear(AwChooseSummary *summary)
{
  g_clear_pointer(&summary->gate_lines, g_ptr_array_unref);
}

static gboolean load(Choice *c, const char *path, const AwStepContext *context, GError **error)
{
  c->record = aw_step_open(path, context, error);
  if (!c->record || !(c->nuclei = aw_record_nuclei(c->record, FALSE, error)) ||
      !(c->states = aw_step_states(c->record, c->nuclei, error)))
    return FALSE;
  if (!c->nuclei->len) {
    g_set_error(error, AW_ERROR, AW_ERROR_EMPTY, "%s has no nuclei yet; find them first (aimwell segment %s)", path,
                path);
    return FALSE;
  }
  g_autoptr(GArray) decisions = aw_record_decisions(c->record, error);
  if (!decisions)
    return FALSE;
  c->by_hand = g_new0(gboolean, c->nuclei->len);
  for (guint i = 0, k = 0; i < c->nuclei->len && k < decisions->len; i++) {
    const AwDecision *d = &g_array_index(decisions, AwDecision, k);
    if (d->nucleus_id != ((const AwNucleus *)c->nuclei->pdata[i])->id)
      continue;
    c->by_hand[i] = d->by_hand;
    k++;
  }
  return TRUE;
}

static gboolean set_state(Choice *c, guint i, AwState state, gboolean by_hand, GError **error)
{
  if (c->states[i] == state && c->by_hand[i] == by_hand)
    return TRUE;
  c->targets_changed |= (c->states[i] == AW_STATE_ACCEPTED) != (state == AW_STATE_ACCEPTED);
  c->states[i] = state;
  c->by_hand[i] = by_hand;
  AwDecision decision = { ((const AwNucleus *)c->nuclei->pdata[i])->id, state, by_hand };
  return aw_record_set_decision(c->record, &decision, error);
}

/* The gates to use: the defaults, each replaced by one given on the same feature, then the others given. */
static GArray *collect_gates(const AwChooseSettings *settings, GError **error)
{
  gsize n = 0;
  g_autofree AwGate *defaults = aw_gates_default(&n);
  g_autoptr(GArray) gates = g_array_new(FALSE, FALSE, sizeof(AwGate));
  if (!settings->no_default_gates)
    g_array_append_vals(gates, defaults, (guint)n);
  for (const char *const *text = settings->gates; text && *text; text++) {
    AwGate gate;
    if (!aw_gate_parse(*text, &gate, error))
      return NULL;
    guint i = 0;
    while (i < gates->len && g_array_index(gates, AwGate, i).feature != gate.feature)
      i++;
    if (i == gates->len)
      g_array_append_val(gates, gate);
    else
      g_array_index(gates, AwGate, i) = gate;
  }
  return g_steal_pointer(&gates);
}

static gboolean store_gates(AwRecord *record, const GArray *gates, GError **error)
{
  g_autofree AwGateRow *rows = g_new0(AwGateRow, gates->len + 1);
  for (guint i = 0; i < gates->len; i++) {
    const AwGate *gate = &g_array_index(gates, AwGate, i);
    rows[i] = (AwGateRow){ gate->feature, gate->min, gate->max };
  }
  return aw_record_set_gates(record, rows, gates->len, error);
}

static GPtrArray *gate_lines(const GArray *gates, guint refused, const AwGateCount *counts)
{
  GPtrArray *lines = g_ptr_array_new_with_free_func(g_free);
  if (refused)
    g_ptr_array_add(
        lines, g_strdup_printf("flagged border, saturated or defocused: %" G_GSIZE_FORMAT " removed", counts[0].first));
  for (guint i = 0; i < gates->len; i++) {
    g_autofree char *text = aw_gate_text(&g_array_index(gates, AwGate, i));
    const AwGateCount *n = &counts[i + 1];
    g_ptr_array_add(lines, g_strdup_printf("gate %s: %" G_GSIZE_FORMAT " removed, %" G_GSIZE_FORMAT " by it alone",
                                           text, n->first, n->alone));
  }
  return lines;
}

/* Gates all nuclei; what a person decided stays. */
static gboolean propose(Choice *c, const AwChooseSettings *settings, AwChooseSummary *summary, GError **error)
{
  g_autoptr(GArray) gates = collect_gates(settings, error);
  if (!gates)
    return FALSE;
  guint refused = settings->no_default_gates ? 0 : AW_GATES_DEFAULT_REFUSED;
  const AwGate *list = (const AwGate *)(const void *)gates->data;
  g_autofree AwGateCount *counts = g_new0(AwGateCount, gates->len + 1);
  g_autofree gboolean *inside = g_new0(gboolean, c->nuclei->len);
  aw_gates_apply(list, gates->len, refused, c->nuclei, counts, inside);
  for (guint i = 0; i < c->nuclei->len; i++)
    if (!c->by_hand[i] && !set_state(c, i, inside[i] ? AW_STATE_PROPOSED : AW_STATE_FOUND, FALSE, error))
      return FALSE;
  summary->gated = TRUE;
  summary->gate_lines = gate_lines(gates, refused, counts);
  return store_gates(c->record, gates, error);
}

static gboolean decide(Choice *c, const char *list, AwState state, gboolean by_hand, GError **error)
{
  if (!list)
    return TRUE;
  g_autoptr(GArray) ids = aw_id_list(list, c->nuclei, c->states, error);
  if (!ids)
    return FALSE;
  for (guint k = 0; k < ids->len; k++)
    if (!set_state(c, g_array_index(ids, guint, k), state, by_hand, error))
      return FALSE;
  return TRUE;
}

/* One nucleus both accepted and rejected in one command is a slip, not an order. */
static gboolean check_apart(const Choice *c, const AwChooseSettings *s, GError **error)
{
  if (!s->accept || !s->reject)
    return TRUE;
  g_autoptr(GArray) a = aw_id_list(s->accept, c->nuclei, c->states, error);
  g_autoptr(GArray) r = a ? aw_id_list(s->reject, c->nuclei, c->states, error) : NULL;
  if (!r)
    return FALSE;
  for (guint i = 0, k = 0; i < a->len && k < r->len;) {
    guint x = g_array_index(a, guint, i), y = g_array_index(r, guint, k);
    if (x == y) {
      g_set_error(error, AW_ERROR, AW_ERROR_STATE, "nucleus %" G_GINT64_FORMAT " stands in both --accept and --reject",
                  ((const AwNucleus *)c->nuclei->pdata[x])->id);
      return FALSE;
    }
    if (x < y)
      i++;
    else
      k++;
  }
  return TRUE;
}

static gboolean set_particles(Choice *c, const gint64 *n_particles, GError **error)
{
  if (!n_particles)
    return TRUE;
  if (*n_particles >= 1 && *n_particles <= MAX_PARTICLES)
    return aw_record_set_fact_double(c->record, AW_FACT_N_PARTICLES, (double)*n_particles, error);
  g_set_error(error, AW_ERROR, AW_ERROR_RANGE, "%" G_GINT64_FORMAT " particles per target is outside 1 to %d",
              *n_particles, MAX_PARTICLES);
  return FALSE;
}

static void summarise(const Choice *c, AwChooseSummary *s)
{
  s->n_nuclei = c->nuclei->len;
  for (guint i = 0; i < c->nuclei->len; i++) {
    s->n_proposed += c->states[i] == AW_STATE_PROPOSED;
    s->n_accepted += c->states[i] == AW_STATE_ACCEPTED;
    s->n_rejected += c->states[i] == AW_STATE_REJECTED;
  }
}

gboolean aw_step_choose(const char *path, const AwChooseSettings *settings, const AwStepContext *context,
                        AwChooseSummary *summary, GError **error)
{
  g_auto(Choice) c = { 0 };
  if (!load(&c, path, context, error) || (settings->propose && !propose(&c, settings, summary, error)) ||
      !check_apart(&c, settings, error) || !decide(&c, settings->accept, AW_STATE_ACCEPTED, TRUE, error) ||
      !decide(&c, settings->reject, AW_STATE_REJECTED, TRUE, error) ||
      !decide(&c, settings->forget, AW_STATE_FOUND, FALSE, error) || !set_particles(&c, settings->n_particles, error) ||
      (c.targets_changed && !aw_record_set_tour(c.record, NULL, 0, error)))
    return FALSE;
  summarise(&c, summary);
  g_autofree char *action =
      g_strdup_printf("%s: %" G_GSIZE_FORMAT " proposed, %" G_GSIZE_FORMAT " accepted, %" G_GSIZE_FORMAT " rejected",
                      settings->propose ? "applied gates" : "decided by hand", summary->n_proposed, summary->n_accepted,
                      summary->n_rejected);
  return aw_record_commit(c.record, action, error);
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_PLAN_GATES_H
#define AW_PLAN_GATES_H

#include "nuclei/nucleus.h"

/* A range on a feature, ends included; infinite ends are open. A value that is NaN is outside every gate. */
typedef struct {
  const AwFeature *feature;
  double min, max;
} AwGate;

/* Flags (AwFlag bits) that keep a nucleus from being proposed by default. */
#define AW_GATES_DEFAULT_REFUSED (AW_FLAG_BORDER | AW_FLAG_SATURATED | AW_FLAG_DEFOCUSED)

/**
 * The default gates: one whole nucleus of usual size and shape, rightly outlined. Their ends were chosen on the open
 * nucleus images by the rule that docs/methods-segmentation.md states. *n gets their number; free with g_free.
 */
AwGate *aw_gates_default(gsize *n);

/**
 * Reads "FEATURE=MIN..MAX"; either end may be left out. FEATURE is the name in um or the bare stem.
 * AW_ERROR_NOT_FOUND for an unknown feature (lists all names), AW_ERROR_FORMAT for a text of another form,
 * AW_ERROR_RANGE when MIN lies above MAX or the feature is named in px.
 */
gboolean aw_gate_parse(const char *text, AwGate *gate, GError **error);

/* The gate as people read it, such as "0.6 <= area_ratio <= 2". Free with g_free. */
char *aw_gate_text(const AwGate *gate);

/* TRUE when the nucleus is inside all n gates and has none of the `refused` flags. */
gboolean aw_gates_pass(const AwGate *gates, gsize n, guint refused, const AwNucleus *nucleus);

/* How many nuclei a gate keeps out. */
typedef struct {
  gsize alone; /* outside this gate, whatever the others say */
  gsize first; /* taken out by this gate after the flags and the gates before it */
} AwGateCount;

/**
 * Applies flags, then gates in order. `counts` has n + 1 entries: entry 0 is the flags, entry i + 1 gate i.
 * inside: one gboolean per nucleus. Returns the number inside.
 */
gsize aw_gates_apply(const AwGate *gates, gsize n, guint refused, GPtrArray *nuclei, AwGateCount *counts,
                     gboolean *inside);

#endif

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <gsl/gsl_statistics_double.h>
#include <stdlib.h>

#include "base/grid.h"
#include "geometry/outline.h"
#include "nuclei/scan_parts.h"

/*
 * Views of different sources (frames, or blocks of one frame) are linked when their outlines share more than LINK_SHARE
 * of the smaller one; a view cut by an edge is a remnant and is linked sooner. Linked views form groups. In the plain
 * case a group is one nucleus seen once in each source. Where sources disagree (one sees two nuclei, another one)
 * choosing view by view could mix both readings, so whole sources speak one after the other: first uncut views, of
 * sources with fewer cut views in the group, of higher mean quality; a view is kept unless it is linked with one that
 * was kept before. Every choice is a maximal set of views without a link, hence never both readings and never none.
 */
#define LINK_SHARE 0.3
#define LINK_SHARE_CUT 0.1
/* Two whole views are views of one nucleus when they share this part of the larger one. */
#define SAME_SHARE 0.5
#define LARGE_REACH_RATIO 4

typedef struct {
  guint a, b;
  double common; /* um2 */
} Link;

typedef struct {
  AwScanView *views;
  guint n;
  double *xy, *reach;
  GArray *links;          /* Link, both directions, sorted by a */
  guint *first_link;      /* of each view, n + 1 entries */
  guint *group;           /* lowest view of the group */
  double *source_quality; /* mean quality of the source's views in the group */
  guint *source_cut;      /* number of cut views of the source in the group */
  gboolean *kept;
} Merge;

void aw_scan_views_free(GArray *views)
{
  for (guint i = 0; i < views->len; i++)
    aw_nucleus_free(g_array_index(views, AwScanView, i).nucleus);
  g_array_unref(views);
}

static void try_link(Merge *m, guint i, guint j)
{
  const AwScanView *p = &m->views[i], *q = &m->views[j];
  double dx = m->xy[2 * i] - m->xy[2 * j], dy = m->xy[2 * i + 1] - m->xy[2 * j + 1], r = m->reach[i] + m->reach[j];
  if (p->source == q->source || dx * dx + dy * dy >= r * r)
    return;
  const AwNucleus *a = p->nucleus, *b = q->nucleus;
  double common = aw_outline_common_area(a->outline, a->n_outline, b->outline, b->n_outline);
  gboolean remnant = (p->edge == AW_VIEW_CUT) != (q->edge == AW_VIEW_CUT);
  if (common <= (remnant ? LINK_SHARE_CUT : LINK_SHARE) * MIN(a->area, b->area))
    return;
  Link forth = { i, j, common }, back = { j, i, common };
  g_array_append_val(m->links, forth);
  g_array_append_val(m->links, back);
}

static int compare_links(gconstpointer a, gconstpointer b)
{
  const Link *p = a, *q = b;
  return p->a != q->a ? (p->a < q->a ? -1 : 1) : p->b < q->b ? -1 : p->b > q->b;
}

/* Tries all pairs whose circles meet; the few nuclei much larger than the rest are tried with all. */
static void find_links(Merge *m)
{
  g_autofree double *sorted = g_memdup2(m->reach, m->n * sizeof *sorted);
  double cap = LARGE_REACH_RATIO * gsl_stats_median(sorted, 1, m->n);
  g_autoptr(AwGrid) grid = aw_grid_new(m->xy, m->n);
  g_autoptr(GArray) hits = g_array_new(FALSE, FALSE, sizeof(AwGridHit));
  for (guint i = 0; i < m->n; i++) {
    if (m->reach[i] > cap) {
      for (guint j = 0; j < m->n; j++)
        if (m->reach[j] <= cap || j > i)
          try_link(m, i, j);
      continue;
    }
    aw_grid_within(grid, m->xy[2 * i], m->xy[2 * i + 1], m->reach[i] + cap, hits);
    for (guint k = 0; k < hits->len; k++) {
      guint j = (guint)g_array_index(hits, AwGridHit, k).index;
      if (j > i && m->reach[j] <= cap)
        try_link(m, i, j);
    }
  }
  g_array_sort(m->links, compare_links);
  for (guint k = 0; k < m->links->len; k++)
    m->first_link[g_array_index(m->links, Link, k).a + 1]++;
  for (guint i = 0; i < m->n; i++)
    m->first_link[i + 1] += m->first_link[i];
}

static guint root_of(guint *group, guint i)
{
  while (group[i] != i)
    i = group[i] = group[group[i]];
  return i;
}

static void find_groups(Merge *m)
{
  for (guint i = 0; i < m->n; i++)
    m->group[i] = i;
  for (guint k = 0; k < m->links->len; k++) {
    Link link = g_array_index(m->links, Link, k);
    guint a = root_of(m->group, link.a), b = root_of(m->group, link.b);
    m->group[MAX(a, b)] = MIN(a, b);
  }
  for (guint i = 0; i < m->n; i++)
    m->group[i] = root_of(m->group, i);
}

static int compare_group(gconstpointer a, gconstpointer b, gpointer data)
{
  const Merge *m = data;
  guint i = *(const guint *)a, j = *(const guint *)b;
  if (m->group[i] != m->group[j])
    return m->group[i] < m->group[j] ? -1 : 1;
  if (m->views[i].source != m->views[j].source)
    return m->views[i].source < m->views[j].source ? -1 : 1;
  return i < j ? -1 : i > j;
}

/* The order in which the views of one group speak. */
static int compare_voice(gconstpointer a, gconstpointer b, gpointer data)
{
  const Merge *m = data;
  guint i = *(const guint *)a, j = *(const guint *)b;
  if (m->group[i] != m->group[j])
    return m->group[i] < m->group[j] ? -1 : 1;
  if (m->views[i].edge != m->views[j].edge)
    return m->views[i].edge < m->views[j].edge ? -1 : 1;
  if (m->source_cut[i] != m->source_cut[j])
    return m->source_cut[i] < m->source_cut[j] ? -1 : 1;
  if (m->source_quality[i] < m->source_quality[j] || m->source_quality[i] > m->source_quality[j])
    return m->source_quality[i] > m->source_quality[j] ? -1 : 1;
  return compare_group(a, b, data);
}

/* `order` is sorted by group and source: every stretch of one source in one group shares its figures. */
static void rate_sources(Merge *m, const guint *order)
{
  for (guint i = 0, end = 0; i < m->n; i = end) {
    double sum = 0;
    guint n_cut = 0;
    for (end = i; end < m->n && m->group[order[end]] == m->group[order[i]] &&
                  m->views[order[end]].source == m->views[order[i]].source;
         end++) {
      sum += m->views[order[end]].quality;
      n_cut += m->views[order[end]].edge != AW_VIEW_FREE;
    }
    for (guint k = i; k < end; k++) {
      m->source_quality[order[k]] = sum / (end - i);
      m->source_cut[order[k]] = n_cut;
    }
  }
}

static gboolean is_contradicted(const Merge *m, guint i)
{
  for (guint k = m->first_link[i]; k < m->first_link[i + 1]; k++)
    if (m->kept[g_array_index(m->links, Link, k).b])
      return TRUE;
  return FALSE;
}

static void choose(Merge *m)
{
  g_autofree guint *order = g_new(guint, m->n);
  for (guint i = 0; i < m->n; i++)
    order[i] = i;
  g_qsort_with_data(order, (gint)m->n, sizeof *order, compare_group, m);
  rate_sources(m, order);
  g_qsort_with_data(order, (gint)m->n, sizeof *order, compare_voice, m);
  for (guint k = 0; k < m->n; k++)
    m->kept[order[k]] = !is_contradicted(m, order[k]);
}

/* A kept nucleus learns from its other views: how many frames saw it and how far apart they put it. */
static void learn_from_views(Merge *m, guint i, AwMergeTally *tally)
{
  AwNucleus *a = m->views[i].nucleus;
  double n = 1, x = 0, y = 0, square = 0;
  gsize last = m->views[i].source;
  for (guint k = m->first_link[i]; k < m->first_link[i + 1]; k++) {
    Link link = g_array_index(m->links, Link, k);
    const AwScanView *other = &m->views[link.b];
    const AwNucleus *b = other->nucleus;
    if (other->source != last)
      a->n_views++;
    last = other->source;
    if (other->edge == AW_VIEW_CUT) {
      tally->n_cut_dropped += m->views[i].edge != AW_VIEW_CUT;
      continue;
    }
    if (m->views[i].edge == AW_VIEW_CUT || link.common <= SAME_SHARE * MAX(a->area, b->area))
      continue;
    double dx = b->centroid.x_um - a->centroid.x_um, dy = b->centroid.y_um - a->centroid.y_um;
    tally->n_pairs++;
    tally->sum_square += dx * dx + dy * dy;
    n++;
    x += dx;
    y += dy;
    square += dx * dx + dy * dy;
  }
  a->spread_um = sqrt(MAX(square / n - (x * x + y * y) / (n * n), 0.0));
}

static GArray *take_kept(Merge *m, AwMergeTally *tally)
{
  GArray *out = g_array_new(FALSE, FALSE, sizeof(AwScanView));
  for (guint i = 0; i < m->n; i++)
    if (m->kept[i])
      learn_from_views(m, i, tally);
  for (guint i = 0; i < m->n; i++)
    if (m->kept[i])
      g_array_append_val(out, m->views[i]);
    else
      aw_nucleus_free(m->views[i].nucleus);
  return out;
}

GArray *aw_scan_merge(GArray *views, AwMergeTally *tally)
{
  guint n = views->len;
  if (n == 0)
    return g_array_new(FALSE, FALSE, sizeof(AwScanView));
  g_autofree double *xy = g_new(double, 2 * n);
  g_autofree double *reach = g_new(double, n);
  g_autofree guint *first_link = g_new0(guint, n + 1);
  g_autofree guint *group = g_new(guint, n);
  g_autofree double *source_quality = g_new(double, n);
  g_autofree guint *source_cut = g_new(guint, n);
  g_autofree gboolean *kept = g_new0(gboolean, n);
  g_autoptr(GArray) links = g_array_new(FALSE, FALSE, sizeof(Link));
  Merge m = {
    (AwScanView *)(void *)views->data, n, xy, reach, links, first_link, group, source_quality, source_cut, kept
  };
  for (guint i = 0; i < n; i++) {
    const AwNucleus *a = m.views[i].nucleus;
    xy[2 * i] = a->centroid.x_um;
    xy[2 * i + 1] = a->centroid.y_um;
    reach[i] = aw_outline_reach(a->outline, a->n_outline, a->centroid);
  }
  find_links(&m);
  find_groups(&m);
  choose(&m);
  GArray *out = take_kept(&m, tally);
  g_array_set_size(views, 0);
  return out;
}

/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
/*
 * dump_segment KIND IMAGE.tif LABELS.tif [ENLARGE]: what the segmentation sees of one image with known labels, one line
 * of numbers each on stdout; for fit_segment.py. KIND: `taught` pairs of pieces while merging follows the truth,
 * `pairs` while it follows the fitted table, `outline` levels, `objects`. ENLARGE repeats every pixel that many times.
 */
#include <stdio.h>
#include <string.h>

#include "base/text.h"
#include "image/reader.h"
#include "nuclei/segment_work.h"

typedef struct {
  AwImage *image;
  guint32 *truth, *home;
  guint32 n_truth;
  double *feature; /* objects: AW_N_OBJECT_FEATURES per label */
} Case;

static void print_numbers(const double *value, int n)
{
  char text[G_ASCII_DTOSTR_BUF_SIZE];
  for (int i = 0; i < n; i++)
    printf(" %s", g_ascii_formatd(text, sizeof text, "%.6g", value[i]));
  putchar('\n');
}

static void on_pair(const double *feature, gboolean same, double n_px, gpointer data)
{
  (void)n_px;
  (void)data;
  printf("%d", same);
  print_numbers(feature, AW_N_PAIR_FEATURES);
}

static void on_object(const double *feature, guint32 label, gpointer data)
{
  Case *c = data;
  c->feature = g_renew(double, c->feature, (label + 1) * AW_N_OBJECT_FEATURES);
  memcpy(c->feature + label * AW_N_OBJECT_FEATURES, feature, AW_N_OBJECT_FEATURES * sizeof *feature);
}

static gsize n_px(const Case *c)
{
  return (gsize)c->image->width_px * (gsize)c->image->height_px;
}

/* Overlap of every label with every true one: both[label * (n_truth + 1) + true]. Areas in the last two. */
static double *overlaps(const Case *c, const AwLabels *labels, double *area, double *area_true)
{
  double *both = g_new0(double, ((gsize)labels->n_labels + 1) * (c->n_truth + 1));
  for (gsize i = 0; i < n_px(c); i++) {
    both[labels->label[i] * (c->n_truth + 1) + c->truth[i]]++;
    area[labels->label[i]]++;
    area_true[c->truth[i]]++;
  }
  return both;
}

static void find_homes(Case *c, const AwLabels *labels)
{
  g_autofree double *area = g_new0(double, (gsize)labels->n_labels + 1);
  g_autofree double *area_true = g_new0(double, (gsize)c->n_truth + 1);
  g_autofree double *both = overlaps(c, labels, area, area_true);
  g_free(c->home);
  c->home = g_new0(guint32, (gsize)labels->n_labels + 1);
  for (guint32 k = 1; k <= labels->n_labels; k++)
    for (guint32 t = 1; t <= c->n_truth; t++) {
      double in = both[k * (c->n_truth + 1) + t];
      if (in > 0.6 * area[k] && in > 0.4 * area_true[t])
        c->home[k] = t;
    }
}

/* Mean brightness along the free edge of the true nucleus, as a level between background and plateau. */
static void on_outline(const AwSegmentWork *w, const double *feature, guint32 label, double background, double plateau,
                       gpointer data)
{
  Case *c = data;
  if (label == 1)
    find_homes(c, w->labels);
  guint32 home = c->home[label];
  double sum = 0, n = 0;
  for (int y = 1; home && y < w->height_px - 1; y++)
    for (int x = 1; x < w->width_px - 1; x++) {
      gsize at = (gsize)y * (gsize)w->width_px + (gsize)x;
      const gsize around[4] = { at - 1, at + 1, at - (gsize)w->width_px, at + (gsize)w->width_px };
      for (int k = 0; k < 4; k++) {
        guint32 a = c->truth[at], b = c->truth[around[k]];
        if ((a == home && b == 0) || (b == home && a == 0)) {
          sum += (double)w->smooth->value[at];
          n++;
        }
      }
    }
  if (n < 16 || plateau <= background)
    return;
  char text[G_ASCII_DTOSTR_BUF_SIZE];
  printf("%s", g_ascii_formatd(text, sizeof text, "%.5f", (sum / n - background) / (plateau - background)));
  print_numbers(feature, AW_N_OUTLINE_FEATURES);
}

/* Per object: whether the scoring rule calls it good with intersection over union above 0.6, then its features. */
static void print_objects(const Case *c, const AwSegmentation *s)
{
  guint32 n = s->labels->n_labels, m = c->n_truth + 1;
  g_autofree double *area = g_new0(double, (gsize)n + 1);
  g_autofree double *area_true = g_new0(double, m);
  g_autofree double *both = overlaps(c, s->labels, area, area_true);
  g_autofree double *sx = g_new0(double, (gsize)n + 1);
  g_autofree double *sy = g_new0(double, (gsize)n + 1);
  g_autofree guint32 *home = g_new0(guint32, (gsize)n + 1);
  g_autofree guint32 *visits = g_new0(guint32, m);
  int width = c->image->width_px;
  for (gsize i = 0; i < n_px(c); i++) {
    sx[s->labels->label[i]] += (double)(i % (gsize)width);
    sy[s->labels->label[i]] += (double)(i / (gsize)width);
  }
  for (guint32 k = 1; k <= n; k++) {
    home[k] = c->truth[(gsize)(sy[k] / area[k] + 0.5) * (gsize)width + (gsize)(sx[k] / area[k] + 0.5)];
    visits[home[k]]++;
  }
  for (guint32 k = 1; k <= n; k++) {
    int covered = 0;
    double best = 0;
    for (guint32 t = 1; t < m; t++) {
      double in = both[k * m + t];
      covered += in > 0.2 * area_true[t];
      best = MAX(best, in / (area[k] + area_true[t] - in));
    }
    printf("%d", home[k] > 0 && covered <= 1 && visits[home[k]] == 1 && best > 0.6);
    print_numbers(c->feature + k * AW_N_OBJECT_FEATURES, AW_N_OBJECT_FEATURES);
  }
}

static gboolean load(Case *c, const char *image_path, const char *labels_path, int enlarge, GError **error)
{
  g_autoptr(AwImage) image = aw_image_load(image_path, 0, -1, NULL, error);
  g_autoptr(AwImage) labels = image ? aw_image_load(labels_path, 0, -1, NULL, error) : NULL;
  if (!labels)
    return FALSE;
  int w = image->width_px * enlarge, h = image->height_px * enlarge;
  c->image = aw_image_new(w, h, AW_SAMPLE_F32, error);
  c->truth = g_new0(guint32, (gsize)w * (gsize)h);
  for (int y = 0; y < h; y++)
    for (int x = 0; x < w; x++) {
      gsize at = (gsize)y * (gsize)w + (gsize)x;
      ((float *)c->image->pixels)[at] = (float)aw_image_value(image, x / enlarge, y / enlarge);
      c->truth[at] = (guint32)aw_image_value(labels, x / enlarge, y / enlarge);
      c->n_truth = MAX(c->n_truth, c->truth[at]);
    }
  return TRUE;
}

int main(int argc, char **argv)
{
  GError *error = NULL;
  Case c = { 0 };
  if (argc < 4 || !load(&c, argv[2], argv[3], argc > 4 ? (int)g_ascii_strtoll(argv[4], NULL, 10) : 1, &error)) {
    fprintf(stderr, "%s\n", error ? error->message : "usage: dump_segment KIND IMAGE.tif LABELS.tif [ENLARGE]");
    return 2;
  }
  gboolean taught = !strcmp(argv[1], "taught"), outline = !strcmp(argv[1], "outline");
  gboolean objects = !strcmp(argv[1], "objects");
  AwSegmentProbe probe = { .truth = c.truth, .follow_truth = taught || outline, .data = &c };
  probe.pair = outline || objects ? NULL : on_pair;
  probe.outline = outline ? on_outline : NULL;
  probe.object = objects ? on_object : NULL;
  g_autoptr(AwSegmentation) s = aw_segment_run(c.image, NULL, NULL, &aw_segment_rules, &probe, NULL, &error);
  if (s && objects)
    print_objects(&c, s);
  return s ? 0 : 1;
}

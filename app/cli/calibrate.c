/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>
#include <string.h>

#include "base/text.h"
#include "cli/calibrate_parts.h"
#include "cli/cli.h"
#include "figures/calibration.h"

/* The options as they were given, and what they mean. */
typedef struct {
  char *at, *fit, *localisation, *axis, *crosshair, *image, *reading, *mark_px, *near, *term, *um, *figure, *map,
      *camera;
  gboolean mirrored, plateaus, elliptical, dark, show, json;
  const char *dish;
  AwMarkSettings marks;
  AwPixelPoint near_px;
  AwBeamPoint crosshair_um;
  AwCalibrateSource source;
} Options;

static void options_clear(Options *o)
{
  char **texts[] = { &o->at,      &o->fit,  &o->localisation, &o->axis, &o->crosshair, &o->image, &o->reading,
                     &o->mark_px, &o->near, &o->term,         &o->um,   &o->figure,    &o->map,   &o->camera };
  for (gsize i = 0; i < G_N_ELEMENTS(texts); i++)
    g_free(*texts[i]);
}
G_DEFINE_AUTO_CLEANUP_CLEAR_FUNC(Options, options_clear)

static gboolean parse(int argc, char **argv, Options *o, CliCommon *common)
{
  const GOptionEntry own[] = {
    { "fit", 0, 0, G_OPTION_ARG_STRING, &o->fit, "marks, fields: rigid, similarity (default) or affine", "KIND" },
    { "mirrored", 0, 0, G_OPTION_ARG_NONE, &o->mirrored, "marks: the stages mirror each other", NULL },
    { "localisation-um", 0, 0, G_OPTION_ARG_STRING, &o->localisation, "marks: rms error per axis of reading one mark",
      "UM" },
    { "map", 0, 0, G_OPTION_ARG_FILENAME, &o->map, "marks, fields: draw the expected target error over the dish",
      "FILE" },
    { "pixel-map", 0, 0, G_OPTION_ARG_STRING, &o->camera,
      "fields: the map AXX,AXY,AYX,AYY of the beam stage's camera, um per px", "A" },
    { "axis", 0, 0, G_OPTION_ARG_STRING, &o->axis, "edge: x or y", "x|y" },
    { "plateaus", 0, 0, G_OPTION_ARG_NONE, &o->plateaus, "edge: fit the levels far from the edge too", NULL },
    { "elliptical", 0, 0, G_OPTION_ARG_NONE, &o->elliptical, "bead: widths in x and y of their own", NULL },
    { "crosshair", 0, 0, G_OPTION_ARG_STRING, &o->crosshair,
      "bead: the reading X,Y that puts the bead on the crosshair; edge: that of its axis", "UM" },
    { "image", 0, 0, G_OPTION_ARG_FILENAME, &o->image, "bead: an image of it instead, taken at --reading", "FILE" },
    { "reading", 0, 0, G_OPTION_ARG_STRING, &o->reading, "bead: the stage reading of --image", "X,Y" },
    { "mark-px", 0, 0, G_OPTION_ARG_STRING, &o->mark_px, "Size of the mark to look for in images", "PX" },
    { "dark", 0, 0, G_OPTION_ARG_NONE, &o->dark, "The mark is darker than the ground", NULL },
    { "near", 0, 0, G_OPTION_ARG_STRING, &o->near, "The mark nearest to that pixel, not the strongest", "X,Y" },
    { "term", 0, 0, G_OPTION_ARG_STRING, &o->term, "error: which term of the budget", "NAME" },
    { "um", 0, 0, G_OPTION_ARG_STRING, &o->um, "error: its rms per axis", "UM" },
    { "at", 0, 0, G_OPTION_ARG_STRING, &o->at,
      "When it was measured, with --show the time to judge ages at (default: now)", "TIME" },
    { "show", 0, 0, G_OPTION_ARG_NONE, &o->show, "List all calibrations and the aim-error budget", NULL },
    { "json", 0, 0, G_OPTION_ARG_NONE, &o->json, "show: print as JSON", NULL },
    { "figure", 0, 0, G_OPTION_ARG_FILENAME, &o->figure, "Draw the fit, or with --show the budget; .png, .svg, .pdf",
      "FILE" },
    { 0 }
  };
  return cli_parse(argc, argv, "NAME.dish WORD [TABLE] [OPTION…]  |  NAME.dish --show",
                   "Turns a measurement into a fit with its errors and keeps it in the record. WORD is one of\n"
                   "  pixel TABLE  pixel map from one mark seen at several stage readings\n"
                   "  marks TABLE  relocation to the beam stage from marks read on both\n"
                   "  fields TABLE relocation from nuclei of fields imaged again on the beam stage\n"
                   "  edge TABLE   beam's centre and width along an axis from a knife edge\n"
                   "  bead TABLE   beam's centre, hence its offset, from a bead scanned on a grid\n"
                   "  beam FILE    particle, energy and layers up to the nucleus\n"
                   "  error        enter a term of the aim-error budget",
                   own, CLI_WHO, common);
}

static gboolean parse_marks(Options *o)
{
  double diameter;
  if (!o->mark_px)
    return TRUE;
  if (!cli_parse_number("calibrate", "--mark-px", o->mark_px, 2, 200, &diameter))
    return FALSE;
  o->marks = (AwMarkSettings){ .dark = o->dark, .diameter_px = diameter };
  o->source.marks = &o->marks;
  if (o->near && !cli_parse_pair("calibrate", "--near", o->near, &o->near_px.x_px, &o->near_px.y_px))
    return FALSE;
  o->marks.near = o->near ? &o->near_px : NULL;
  return TRUE;
}

static gboolean parse_time(Options *o)
{
  g_autoptr(GError) error = NULL;
  o->source.at_unix_s = NAN;
  if (!o->at || aw_text_to_time(o->at, "--at", &o->source.at_unix_s, &error))
    return TRUE;
  cli_usage("calibrate", "%s", error->message);
  return FALSE;
}

/* What a figure is drawn from: the options and the summary under way. */
typedef struct {
  const Options *o;
  void *summary;
  char axis;
} Drawing;

static AwCalibrateSource drawn_by(Drawing *drawing, gboolean (*draw)(gpointer data, GError **error))
{
  AwCalibrateSource source = drawing->o->source;
  source.before_commit = draw;
  source.data = drawing;
  return source;
}

static gboolean draw_pixel(gpointer data, GError **error)
{
  const Drawing *d = data;
  const AwPixelSummary *s = d->summary;
  return !d->o->figure || aw_figure_pixel(&s->fit, s->views, d->o->figure, error);
}

static gboolean draw_marks(gpointer data, GError **error)
{
  const Drawing *d = data;
  const AwMarksSummary *s = d->summary;
  AwMarksFigure figure = { &s->fit, s->pairs, s->names, s->places };
  return (!d->o->figure || aw_figure_residuals(&figure, d->o->figure, error)) &&
         (!d->o->map || aw_figure_target_error(&figure, d->o->map, error));
}

static gboolean draw_edge(gpointer data, GError **error)
{
  const Drawing *d = data;
  const AwEdgeSummary *s = d->summary;
  return !d->o->figure || aw_figure_edge(&s->fit, s->points, s->counts, d->axis, d->o->figure, error);
}

static gboolean draw_bead(gpointer data, GError **error)
{
  const Drawing *d = data;
  const AwBeadSummary *s = d->summary;
  return !d->o->figure || aw_figure_bead(&s->fit, s->points, s->has_offset ? &s->crosshair : NULL, d->o->figure, error);
}

static int do_pixel(const Options *o, const AwStepContext *context, GError **error)
{
  g_auto(AwPixelSummary) s = { 0 };
  Drawing drawing = { .o = o, .summary = &s };
  AwCalibrateSource source = drawn_by(&drawing, draw_pixel);
  if (!aw_step_calibrate_pixel(o->dish, &source, context, &s, error))
    return CLI_FAILED;
  cli_print_pixel(&s, o->dish);
  return CLI_OK;
}

static int do_marks(const Options *o, const AwStepContext *context, GError **error)
{
  g_auto(AwMarksSummary) s = { 0 };
  AwMarksSettings settings = { AW_FIT_SIMILARITY, o->mirrored, 0 };
  if (o->fit && !aw_fit_kind_parse(o->fit, &settings.kind, error))
    return CLI_FAILED;
  if (o->localisation &&
      !cli_parse_number("calibrate", "--localisation-um", o->localisation, 0.001, 1000, &settings.localisation_um))
    return CLI_USAGE;
  Drawing drawing = { .o = o, .summary = &s };
  AwCalibrateSource source = drawn_by(&drawing, draw_marks);
  if (!aw_step_calibrate_marks(o->dish, &source, &settings, context, &s, error))
    return CLI_FAILED;
  cli_print_marks(&s);
  return CLI_OK;
}

static gboolean draw_fields(gpointer data, GError **error)
{
  Drawing marks = *(const Drawing *)data;
  marks.summary = &((AwFieldsSummary *)marks.summary)->marks;
  return draw_marks(&marks, error);
}

static int do_fields(const Options *o, const AwStepContext *context, GError **error)
{
  g_auto(AwFieldsSummary) s = { 0 };
  AwFieldsSettings settings = { AW_FIT_SIMILARITY, NULL };
  AwMatrix camera;
  if (o->fit && !aw_fit_kind_parse(o->fit, &settings.kind, error))
    return CLI_FAILED;
  if (o->camera && !cli_parse_matrix("calibrate", "--pixel-map", o->camera, &camera))
    return CLI_USAGE;
  settings.camera = o->camera ? &camera : NULL;
  Drawing drawing = { .o = o, .summary = &s };
  AwCalibrateSource source = drawn_by(&drawing, draw_fields);
  if (!aw_step_calibrate_fields(o->dish, &source, &settings, context, &s, error))
    return CLI_FAILED;
  cli_print_fields(&s);
  return CLI_OK;
}

static int do_edge(const Options *o, const AwStepContext *context, GError **error)
{
  g_auto(AwEdgeSummary) s = { 0 };
  if (!o->axis || (strcmp(o->axis, "x") != 0 && strcmp(o->axis, "y") != 0))
    return cli_usage("calibrate", "an edge scan needs --axis x or --axis y");
  AwEdgeScan scan = { o->axis[0], o->plateaus, NAN };
  if (o->crosshair && !cli_parse_number("calibrate", "--crosshair", o->crosshair, -1e7, 1e7, &scan.crosshair_um))
    return CLI_USAGE;
  Drawing drawing = { .o = o, .summary = &s, .axis = scan.axis };
  AwCalibrateSource source = drawn_by(&drawing, draw_edge);
  if (!aw_step_calibrate_edge(o->dish, &source, &scan, context, &s, error))
    return CLI_FAILED;
  cli_print_edge(&s, &scan);
  return CLI_OK;
}

static int do_bead(const Options *o, const AwStepContext *context, GError **error)
{
  g_auto(AwBeadSummary) s = { 0 };
  AwBeamPoint crosshair;
  AwBeadScan scan = { .elliptical = o->elliptical, .image = o->image };
  if (o->crosshair && !cli_parse_pair("calibrate", "--crosshair", o->crosshair, &crosshair.bx_um, &crosshair.by_um))
    return CLI_USAGE;
  scan.crosshair = o->crosshair ? &crosshair : NULL;
  if (o->image && (!o->reading || !o->mark_px || o->crosshair))
    return cli_usage("calibrate", "--image needs --reading X,Y and --mark-px PX, and takes the place of --crosshair");
  if (o->reading && !cli_parse_pair("calibrate", "--reading", o->reading, &scan.reading.bx_um, &scan.reading.by_um))
    return CLI_USAGE;
  Drawing drawing = { .o = o, .summary = &s };
  AwCalibrateSource source = drawn_by(&drawing, draw_bead);
  if (!aw_step_calibrate_bead(o->dish, &source, &scan, context, &s, error))
    return CLI_FAILED;
  cli_print_bead(&s);
  return CLI_OK;
}

static int do_beam(const Options *o, const AwStepContext *context, GError **error)
{
  AwBeamAtNucleus at;
  if (o->figure)
    return cli_usage("calibrate", "a beam file has no fit to draw");
  if (!aw_step_calibrate_beam(o->dish, &o->source, context, &at, error))
    return CLI_FAILED;
  cli_print_beam(&at);
  return CLI_OK;
}

static int do_error(const Options *o, const AwStepContext *context, GError **error)
{
  AwTermId term;
  double value;
  if (!o->term || !o->um)
    return cli_usage("calibrate", "error needs --term NAME and --um UM");
  if (!cli_parse_number("calibrate", "--um", o->um, 0, 1000, &value))
    return CLI_USAGE;
  if (!aw_term_parse(o->term, &term, error) ||
      !aw_step_calibrate_error(o->dish, term, value, o->source.at_unix_s, context, error))
    return CLI_FAILED;
  cli_print("Entered for %s: %s %s\n", aw_term_name(term), o->um, aw_term_unit(term));
  return CLI_OK;
}

static int do_show(const Options *o)
{
  GError *error = NULL;
  g_autoptr(AwCalibrationView) view = aw_step_calibrations(o->dish, o->source.at_unix_s, &error);
  if (!view || (o->figure && !aw_figure_budget(&view->budget, o->figure, &error)))
    return cli_fail("calibrate", error);
  if (o->json)
    cli_print_calibrations_json(view);
  else
    cli_print_calibrations(view);
  return CLI_OK;
}

static int run_word(const char *word, const Options *o, const AwStepContext *context, GError **error)
{
  static const struct {
    const char *word;
    int (*run)(const Options *o, const AwStepContext *context, GError **error);
  } words[] = { { "pixel", do_pixel }, { "marks", do_marks }, { "fields", do_fields }, { "edge", do_edge },
                { "bead", do_bead },   { "beam", do_beam },   { "error", do_error } };
  for (gsize i = 0; i < G_N_ELEMENTS(words); i++)
    if (strcmp(word, words[i].word) == 0)
      return words[i].run(o, context, error);
  return cli_usage("calibrate",
                   "there is no measurement \"%s\"; pixel, marks, fields, edge, bead, beam and error are known", word);
}

int cli_calibrate(int argc, char **argv)
{
  g_auto(CliCommon) common = { 0 };
  g_auto(Options) o = { 0 };
  if (!parse(argc, argv, &o, &common) || !parse_marks(&o) || !parse_time(&o))
    return CLI_USAGE;
  if (o.show)
    return cli_need_words("calibrate", &common, 1, "NAME.dish") ? (o.dish = common.words[0], do_show(&o)) : CLI_USAGE;
  if (common.n_words < 2)
    return cli_usage("calibrate", "a dish and a measurement are needed, such as NAME.dish edge scan.csv");
  gboolean entered = strcmp(common.words[1], "error") == 0;
  if (!cli_need_words("calibrate", &common, entered ? 2 : 3, "the table"))
    return CLI_USAGE;
  o.dish = common.words[0];
  o.source.table = common.words[2];
  AwStepContext context;
  GError *error = NULL;
  cli_context_init(&context, &common);
  int status = run_word(common.words[1], &o, &context, &error);
  cli_context_finish(&context);
  return error ? cli_fail("calibrate", error) : status;
}

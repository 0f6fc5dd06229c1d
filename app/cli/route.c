/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "steps/route.h"

#include <stdio.h>

#include "cli/cli.h"
#include "cli/text.h"

typedef struct {
  char *out, *from, *to, *budget;
  gint64 n_steps, seed;
  gboolean closed, json;
} Options;

static void options_clear(Options *o)
{
  g_free(o->out);
  g_free(o->from);
  g_free(o->to);
  g_free(o->budget);
}
G_DEFINE_AUTO_CLEANUP_CLEAR_FUNC(Options, options_clear)

static void report_json(const AwRouteSummary *s, FILE *stream)
{
  g_autoptr(GString) json = g_string_new("{");
  cli_json_int(json, "stops", (gint64)s->n);
  cli_json_number(json, "unsorted_um", s->unsorted);
  cli_json_number(json, "nearest_neighbour_um", s->nearest);
  cli_json_number(json, "two_opt_um", s->two_opt);
  cli_json_number(json, "final_um", s->final);
  cli_json_int(json, "steps", s->n_steps);
  fprintf(stream, "%s}\n", json->str);
}

/* The points themselves may be on stdout; the summary then goes to stderr. */
static FILE *summary_stream(const Options *o)
{
  return o->out && !g_file_test(o->out, G_FILE_TEST_IS_REGULAR) ? stderr : stdout;
}

static void report(const AwRouteSummary *s, FILE *stream)
{
  g_autofree char *unsorted = cli_length(s->unsorted), *nearest = cli_length(s->nearest);
  g_autofree char *two_opt = cli_length(s->two_opt), *final = cli_length(s->final);
  fprintf(stream,
          "%" G_GSIZE_FORMAT " stops. Stage travel: %s unsorted, %s by nearest neighbour, %s after 2-opt, %s final.\n",
          s->n, unsorted, nearest, two_opt, final);
}

static int route_anything(const CliCommon *common, const Options *o, const AwRouteSettings *settings)
{
  const char *path = common->words[0];
  gboolean dish = g_str_has_suffix(path, ".dish");
  if (dish && o->out)
    return cli_usage("route", "-o is for a table of points; a dish keeps its tour itself");
  if (!dish && !o->out)
    return cli_usage("route", "a table of points needs -o ORDERED.csv");
  AwStepContext context;
  AwRouteSummary summary;
  GError *error = NULL;
  cli_context_init(&context, common);
  gboolean ok = dish ? aw_step_route(path, settings, &context, &summary, &error)
                     : aw_step_route_points(path, o->out, settings, &context, &summary, &error);
  cli_context_finish(&context);
  if (!ok)
    return cli_fail("route", error);
  if (o->json)
    report_json(&summary, summary_stream(o));
  else
    report(&summary, summary_stream(o));
  if (dish && !o->json)
    cli_print("Next: aimwell export %s -o targets.csv\n", path);
  return CLI_OK;
}

int cli_route(int argc, char **argv)
{
  g_auto(CliCommon) common = { 0 };
  g_auto(Options) o = { .n_steps = -1, .seed = 1 };
  const GOptionEntry own[] = {
    { "output", 'o', 0, G_OPTION_ARG_FILENAME, &o.out, "Where the ordered points go", "ORDERED.csv" },
    { "closed", 0, 0, G_OPTION_ARG_NONE, &o.closed, "Return to the first stop", NULL },
    { "from", 0, 0, G_OPTION_ARG_STRING, &o.from, "Where the stage stands before the first stop, um", "X,Y" },
    { "to", 0, 0, G_OPTION_ARG_STRING, &o.to, "Where it goes after the last stop, um", "X,Y" },
    { "steps", 0, 0, G_OPTION_ARG_INT64, &o.n_steps, "Improvement steps (default: by the number of stops)", "N" },
    { "budget", 0, 0, G_OPTION_ARG_STRING, &o.budget, "Search this long instead; not repeatable", "SECONDS" },
    { "seed", 0, 0, G_OPTION_ARG_INT64, &o.seed, "Seed of the search (default 1)", "N" },
    { "json", 0, 0, G_OPTION_ARG_NONE, &o.json, "Print the summary as JSON", NULL },
    { 0 }
  };
  if (!cli_parse(argc, argv, "NAME.dish | POINTS.csv -o ORDERED.csv",
                 "Orders the accepted nuclei of a dish, or any points (columns x_um, y_um), to save stage travel.", own,
                 CLI_WHO, &common) ||
      !cli_need_words("route", &common, 1, "NAME.dish or POINTS.csv"))
    return CLI_USAGE;
  AwStop from, to;
  AwRouteSettings settings = { .closed = o.closed, .n_steps = o.n_steps, .seed = (guint64)o.seed };
  if ((o.from && !cli_parse_pair("route", "--from", o.from, &from.x, &from.y)) ||
      (o.to && !cli_parse_pair("route", "--to", o.to, &to.x, &to.y)) ||
      (o.budget && !cli_parse_number("route", "--budget", o.budget, 0.001, 86400, &settings.budget_s)))
    return CLI_USAGE;
  if (o.n_steps < -1 || (o.n_steps >= 0 && o.budget))
    return cli_usage("route", "give --steps of 0 or more, or --budget, not both");
  if (o.closed && (o.from || o.to))
    return cli_usage("route", "--closed and --from or --to exclude each other");
  settings.from = o.from ? &from : NULL;
  settings.to = o.to ? &to : NULL;
  return route_anything(&common, &o, &settings);
}

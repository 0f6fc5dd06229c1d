/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "steps/status.h"

#include "cli/cli.h"
#include "cli/text.h"

static void report_json(const AwStatus *s)
{
  g_autoptr(GString) json = g_string_new("{");
  cli_json_text(json, "name", s->name);
  cli_json_text(json, "created_at", s->created_at);
  cli_json_int(json, "frames", (gint64)s->n_frames);
  cli_json_text(json, "pixel_map_origin", aw_origin_name(s->map.origin));
  cli_json_number(json, "pixel_um", aw_pixel_map_scale(&s->map));
  cli_json_text(json, "position_origin", s->origin);
  cli_json_number(json, "scan_age_s", s->scan_age_s);
  cli_json_int(json, "nuclei", (gint64)s->n_nuclei);
  for (int state = 0; state < 4; state++)
    cli_json_int(json, aw_state_name((AwState)state), (gint64)s->n_state[state]);
  cli_json_texts(json, "gates", s->gates);
  cli_json_int(json, "targets_in_tour", (gint64)s->n_tour);
  cli_json_number(json, "tour_um", s->n_tour ? s->tour_um : NAN);
  cli_json_int(json, "particles", s->n_particles);
  cli_json_text(json, "plan_hash", s->plan_hash);
  cli_json_int(json, "journal_entries", (gint64)s->n_journal);
  cli_json_texts(json, "changed_images", s->changed);
  cli_print("%s}\n", json->str);
}

static void report_scan(const AwStatus *s)
{
  g_autofree char *scale = cli_number(aw_pixel_map_scale(&s->map), 4);
  cli_print("Dish     %s, begun %s\n", s->name, s->created_at);
  cli_print("Scan     %" G_GSIZE_FORMAT " frames, %s um per pixel (%s)\n", s->n_frames, scale,
            aw_origin_name(s->map.origin));
  if (s->map_note)
    cli_print("         %s\n", s->map_note);
  if (s->map_waits)
    cli_print("         a pixel map was calibrated since; segment again to use it\n");
  g_auto(GStrv) line = g_strsplit(s->origin, "\n", 2);
  cli_print("Place    %s\n         %s\n", line[0], line[1]);
  if (s->scan_age_s < 0) {
    cli_print("Age      the frames are dated in the future; check the clocks\n");
  } else if (isfinite(s->scan_age_s)) {
    g_autofree char *hours = cli_number(s->scan_age_s / 3600, 1);
    cli_print("Age      the oldest frame was taken %s h ago; cells move\n", hours);
  }
}

static void report_plan(const AwStatus *s)
{
  cli_print("Nuclei   %" G_GSIZE_FORMAT ": %" G_GSIZE_FORMAT " accepted, %" G_GSIZE_FORMAT " rejected, %" G_GSIZE_FORMAT
            " proposed, %" G_GSIZE_FORMAT " only found\n",
            s->n_nuclei, s->n_state[AW_STATE_ACCEPTED], s->n_state[AW_STATE_REJECTED], s->n_state[AW_STATE_PROPOSED],
            s->n_state[AW_STATE_FOUND]);
  for (guint i = 0; i < s->gates->len; i++)
    cli_print("Gate     %s\n", (const char *)s->gates->pdata[i]);
  if (s->n_tour) {
    g_autofree char *length = cli_length(s->tour_um);
    cli_print("Tour     %" G_GSIZE_FORMAT " targets, %s of stage travel, %" G_GINT64_FORMAT " particles each\n",
              s->n_tour, length, s->n_particles);
    cli_print("Plan     %s\n", s->plan_hash);
  } else {
    cli_print("Tour     none yet\n");
  }
}

static void report(const AwStatus *s, gboolean verified)
{
  report_scan(s);
  report_plan(s);
  cli_print("Journal  %" G_GSIZE_FORMAT " entries\n", s->n_journal);
  for (guint i = 0; i < s->changed->len; i++)
    cli_print("Image    %s\n", (const char *)s->changed->pdata[i]);
  if (!s->changed->len)
    cli_print("Images   %s\n", verified ? "all there, every hash agrees" : "all there, sizes and times agree");
}

int cli_status(int argc, char **argv)
{
  g_auto(CliCommon) common = { 0 };
  g_autofree char *relink = NULL;
  gboolean json = FALSE, verify = FALSE;
  const GOptionEntry own[] = { { "json", 0, 0, G_OPTION_ARG_NONE, &json, "Print as JSON", NULL },
                               { "verify", 0, 0, G_OPTION_ARG_NONE, &verify,
                                 "Hash every image and check the record itself; fails on a difference", NULL },
                               { "relink", 0, 0, G_OPTION_ARG_FILENAME, &relink,
                                 "First look for moved images in FOLDER, by name and hash", "FOLDER" },
                               { 0 } };
  if (!cli_parse(argc, argv, "NAME.dish [--json] [--verify] [--relink FOLDER]", "Shows a dish at a glance.", own,
                 CLI_WHO | CLI_THREADS, &common) ||
      !cli_need_words("status", &common, 1, "NAME.dish"))
    return CLI_USAGE;
  AwStepContext context;
  GError *error = NULL;
  cli_context_init(&context, &common);
  gsize n_relinked = 0;
  gboolean ok = !relink || aw_step_relink(common.words[0], relink, &context, &n_relinked, &error);
  g_autoptr(AwStatus) status = ok ? aw_step_status(common.words[0], verify, &context, &error) : NULL;
  cli_context_finish(&context);
  if (!status)
    return cli_fail("status", error);
  if (relink && !json)
    cli_print("%" G_GSIZE_FORMAT " moved images were found in %s.\n", n_relinked, relink);
  if (json)
    report_json(status);
  else
    report(status, verify);
  return verify && status->changed->len ? CLI_FAILED : CLI_OK;
}

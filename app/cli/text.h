/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_CLI_TEXT_H
#define AW_CLI_TEXT_H

#include <glib.h>

/* A number for people, `decimals` places, "unknown" for NaN. Free with g_free. */
char *cli_number(double value, int decimals);

/* A length in um for people, in mm from 10,000 um on. Free with g_free. */
char *cli_length(double um);

/* Appends "key": number to a JSON object under construction, null for what is not finite. */
void cli_json_number(GString *json, const char *key, double value);
void cli_json_int(GString *json, const char *key, gint64 value);
void cli_json_text(GString *json, const char *key, const char *text); /* NULL gives null */

/* Appends "key": ["text", ...]. */
void cli_json_texts(GString *json, const char *key, GPtrArray *texts);

#endif

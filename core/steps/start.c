/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "steps/start.h"

#include <glib/gstdio.h>

#include "base/error.h"
#include "base/output.h"
#include "base/pool.h"
#include "base/text.h"
#include "image/overview.h"
#include "image/reader.h"
#include "nuclei/scantable.h"
#include "record/files.h"

#define OVERVIEW_SIDE_PX 512

/* One frame on its way into the record. */
typedef struct {
  char *path;      /* absolute */
  const char *place; /* for errors: the table's line or the image itself */
  int page, channel;
  gboolean has_stage;
  AwFrame *frame;
  double low, high; /* contrast range of its pixels */
  AwImage *thumb;   /* shrunk plane, before the common contrast is known */
} Source;

static void source_free(gpointer p)
{
  Source *s = p;
  g_free(s->path);
  aw_frame_free(s->frame);
  aw_image_free(s->thumb);
  g_free(s);
}

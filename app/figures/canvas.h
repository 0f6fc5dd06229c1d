/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef AW_FIGURES_CANVAS_H
#define AW_FIGURES_CANVAS_H

#include <cairo.h>
#include <glib.h>

#define AW_MIN_CANVAS_SIDE 100
#define AW_MAX_CANVAS_SIDE 20000

/**
 * AwCanvas: a page that becomes a PNG, SVG or PDF file by the ending of its name (a pipe or device: PNG).
 *
 * The picture is kept in memory until aw_canvas_commit writes it through AwOutput. Same drawing, same bytes: files
 * carry no dates, and the numbers cairo gives to SVG elements start anew in each file.
 */
typedef struct AwCanvas AwCanvas;

/**
 * A white page of width x height (pixels of a PNG; SVG pixels; PDF points).
 * AW_ERROR_UNSUPPORTED for another ending, AW_ERROR_RANGE for a side outside AW_MIN_CANVAS_SIDE ...
 * AW_MAX_CANVAS_SIDE. Free with aw_canvas_free.
 */
AwCanvas *aw_canvas_open(const char *path, double width, double height, GError **error);

/* The context to draw with; for a further page of a PDF call cairo_show_page. Owned by the canvas. */
cairo_t *aw_canvas_cairo(AwCanvas *canvas);

/* Sets the title that a PDF shows in its window; nothing for other kinds. */
void aw_canvas_set_title(AwCanvas *canvas, const char *title);

/* Ends the drawing and writes the file; the canvas can then only be freed. */
gboolean aw_canvas_commit(AwCanvas *canvas, GError **error);

void aw_canvas_free(AwCanvas *canvas);
G_DEFINE_AUTOPTR_CLEANUP_FUNC(AwCanvas, aw_canvas_free)

#endif

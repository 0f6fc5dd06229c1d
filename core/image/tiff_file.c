/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "image/tiff_file.h"

#include <errno.h>
#include <fcntl.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include "base/limits.h"

void aw_tiff_log_clear(AwTiffLog *log)
{
  g_clear_pointer(&log->complaint, g_free);
}

static void keep_first(AwTiffLog *log, const char *format, va_list args)
{
  if (log->complaint)
    return;
  g_autofree char *text = g_strdup_vprintf(format, args);
  log->complaint = g_utf8_make_valid(g_strstrip(text), -1);
}

static int on_error(TIFF *tif, void *data, const char *module, const char *format, va_list args)
{
  (void)tif;
  (void)module;
  keep_first(data, format, args);
  return 1;
}

/* A tag that lies beyond the file's end is only a warning to libtiff, yet the page would lose its meaning. */
static int on_warning(TIFF *tif, void *data, const char *module, const char *format, va_list args)
{
  (void)tif;
  (void)module;
  AwTiffLog *log = data;
  if (log->keep_warnings || g_str_has_prefix(format, "IO error during reading"))
    keep_first(log, format, args);
  return 1;
}

TIFFOpenOptions *aw_tiff_options(AwTiffLog *log)
{
  TIFFOpenOptions *options = TIFFOpenOptionsAlloc();
  TIFFOpenOptionsSetMaxSingleMemAlloc(options, AW_TIFF_MAX_ALLOC);
  TIFFOpenOptionsSetErrorHandlerExtR(options, on_error, log);
  TIFFOpenOptionsSetWarningHandlerExtR(options, on_warning, log);
  return options;
}

gboolean aw_tiff_fail(const AwTiffFile *file, AwErrorCode code, GError **error, const char *format, ...)
{
  va_list args;
  va_start(args, format);
  g_autofree char *text = g_strdup_vprintf(format, args);
  va_end(args);
  const char *why = file->log.complaint;
  g_set_error(error, AW_ERROR, code, "%s %s%s%s", file->place, text, why ? ": " : "", why ? why : "");
  return FALSE;
}

static int open_regular(const char *path, gint64 *n_bytes, GError **error)
{
  int fd = open(path, O_RDONLY | O_CLOEXEC | O_NONBLOCK | O_NOCTTY);
  struct stat about;
  if (fd >= 0 && fstat(fd, &about) == 0 && S_ISREG(about.st_mode)) {
    *n_bytes = about.st_size;
    return fd;
  }
  int cause = fd < 0 ? errno : S_ISDIR(about.st_mode) ? EISDIR : ESPIPE;
  if (fd >= 0)
    close(fd);
  g_set_error(error, AW_ERROR, cause == ENOENT ? AW_ERROR_NOT_FOUND : AW_ERROR_IO, "%s cannot be read: %s", path,
              g_strerror(cause));
  return -1;
}

/* libtiff's count stops where the chain of directories breaks off or loops; only its complaint or warning tells. */
static gboolean count_directories(AwTiffFile *file, GError **error)
{
  aw_tiff_log_clear(&file->log);
  file->log.keep_warnings = TRUE;
  file->n_directories = (int)MIN(TIFFNumberOfDirectories(file->tif), (tdir_t)G_MAXINT);
  file->log.keep_warnings = FALSE;
  if (!file->log.complaint)
    return TRUE;
  return aw_tiff_fail(file, AW_ERROR_FORMAT, error, "is damaged: its chain of pages breaks off after %d",
                      file->n_directories);
}

gboolean aw_tiff_file_check_size(const AwTiffFile *file, GError **error)
{
  guint32 width = 0, height = 0;
  TIFFGetField(file->tif, TIFFTAG_IMAGEWIDTH, &width);
  TIFFGetField(file->tif, TIFFTAG_IMAGELENGTH, &height);
  if (width >= 1 && height >= 1 && width <= AW_MAX_SIDE_PX && height <= AW_MAX_SIDE_PX &&
      (gint64)width * height <= AW_MAX_PIXELS)
    return TRUE;
  return aw_tiff_fail(file, AW_ERROR_RANGE, error, "claims %u x %u px; the limits are 1 to %d px a side", width, height,
                      AW_MAX_SIDE_PX);
}

/* An impossible size makes libtiff give up as well; it is the clearer reason. */
static gboolean read_directory(AwTiffFile *file, gboolean ok, GError **error)
{
  if (ok && !file->log.complaint)
    return TRUE;
  gboolean has_size = TIFFGetField(file->tif, TIFFTAG_IMAGEWIDTH, &(guint32){ 0 }) &&
                      TIFFGetField(file->tif, TIFFTAG_IMAGELENGTH, &(guint32){ 0 });
  if (has_size && !aw_tiff_file_check_size(file, error))
    return FALSE;
  return aw_tiff_fail(file, AW_ERROR_FORMAT, error, "is damaged or cut off: its directory cannot be read");
}

AwTiffFile *aw_tiff_file_open(const char *path, GError **error)
{
  g_autoptr(AwTiffFile) file = g_new0(AwTiffFile, 1);
  file->path = g_strdup(path);
  file->place = g_strdup(path);
  int fd = open_regular(path, &file->n_bytes, error);
  if (fd < 0)
    return NULL;
  TIFFOpenOptions *options = aw_tiff_options(&file->log);
  /* No memory map ("m"): a file that shrinks while it is read must be an error, not a signal. Strips as they are ("c");
   * the directory is read below ("h"). */
  file->tif = TIFFFdOpenExt(fd, path, "rhmc", options);
  TIFFOpenOptionsFree(options);
  if (!file->tif) {
    close(fd);
    aw_tiff_fail(file, AW_ERROR_FORMAT, error, "is damaged: its header cannot be read");
    return NULL;
  }
  if (!read_directory(file, TIFFReadDirectory(file->tif), error) || !count_directories(file, error))
    return NULL;
  return g_steal_pointer(&file);
}

void aw_tiff_file_free(AwTiffFile *file)
{
  if (!file)
    return;
  if (file->tif)
    TIFFClose(file->tif);
  aw_tiff_log_clear(&file->log);
  g_free(file->place);
  g_free(file->path);
  g_free(file);
}

gboolean aw_tiff_file_bytes(const AwTiffFile *file, gint64 at, void *out, gsize n, GError **error)
{
  guint8 *to = out;
  while (n > 0) {
    gssize got = pread(TIFFFileno(file->tif), to, n, at);
    if (got < 0 && errno == EINTR)
      continue;
    if (got < 0)
      return aw_tiff_fail(file, AW_ERROR_IO, error, "cannot be read: %s", g_strerror(errno));
    if (got == 0)
      return aw_tiff_fail(file, AW_ERROR_FORMAT, error, "is cut off: it ends at byte %" G_GINT64_FORMAT, at);
    to += got;
    at += got;
    n -= (gsize)got;
  }
  return TRUE;
}

gboolean aw_tiff_file_choose(AwTiffFile *file, int directory, int page, GError **error)
{
  g_free(file->place);
  file->place = g_strdup_printf("%s, page %d", file->path, page);
  aw_tiff_log_clear(&file->log);
  if (TIFFCurrentDirectory(file->tif) == (tdir_t)directory)
    return TRUE;
  return read_directory(file, TIFFSetDirectory(file->tif, (tdir_t)directory), error);
}

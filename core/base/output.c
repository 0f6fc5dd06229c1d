/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/output.h"

#include <errno.h>
#include <fcntl.h>
#include <signal.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include "base/error.h"
#include "base/text.h"

#define MAX_LINKS 40
#define READ_STEP ((gsize)1 << 16)

struct AwOutput {
  char *asked;  /* the path as the caller gave it, for messages */
  char *final;  /* links followed; NULL when written directly */
  char *folder; /* of `final` */
  char *temp;   /* where the bytes stand until the commit; NULL when written directly or done */
  FILE *stream;
};

static gboolean fail_errno(GError **error, int number, const char *what, const char *path)
{
  g_set_error(error, AW_ERROR, number == ENOENT ? AW_ERROR_NOT_FOUND : AW_ERROR_IO, "cannot %s %s: %s", what, path,
              g_strerror(number));
  return FALSE;
}

void aw_output_prepare_process(void)
{
  signal(SIGXFSZ, SIG_IGN);
  signal(SIGPIPE, SIG_IGN);
}

/* The descriptor that a path like /dev/stdout stands for, or -1. Opening it anew would cut off what `>>` appends to. */
static int standing_fd(const char *path)
{
  if (!strcmp(path, "/dev/stdout"))
    return STDOUT_FILENO;
  if (!strcmp(path, "/dev/stderr"))
    return STDERR_FILENO;
  const char *number = g_str_has_prefix(path, "/dev/fd/")         ? path + strlen("/dev/fd/")
                       : g_str_has_prefix(path, "/proc/self/fd/") ? path + strlen("/proc/self/fd/")
                                                                  : "";
  gint64 fd = -1;
  return aw_text_to_int(number, path, 0, G_MAXINT, &fd, NULL) ? (int)fd : -1;
}

/* The path with symbolic links followed to the end, also when that does not exist yet. NULL when they never end. */
static char *follow_links(const char *path)
{
  g_autofree char *at = g_strdup(path);
  for (int i = 0; i < MAX_LINKS; i++) {
    g_autofree char *link = g_file_read_link(at, NULL);
    if (!link)
      return g_steal_pointer(&at);
    g_autofree char *folder = g_path_get_dirname(at);
    g_autofree char *next = g_path_is_absolute(link) ? g_strdup(link) : g_build_filename(folder, link, NULL);
    g_free(at);
    at = g_steal_pointer(&next);
  }
  return NULL;
}

static gboolean open_direct(AwOutput *out, GError **error)
{
  int standing = standing_fd(out->asked);
  int fd = standing >= 0 ? fcntl(standing, F_DUPFD_CLOEXEC, 3) : open(out->asked, O_WRONLY | O_NOCTTY | O_CLOEXEC);
  if (fd < 0)
    return fail_errno(error, errno, "write to", out->asked);
  out->stream = fdopen(fd, "w");
  return TRUE;
}

/* A new file beside the final one; its name is short because the final name may be as long as names can be. */
static int create_beside(AwOutput *out)
{
  int fd = -1;
  do {
    g_free(out->temp);
    g_autofree char *name = g_strdup_printf(".aimwell-%08x%08x.part", g_random_int(), g_random_int());
    out->temp = g_build_filename(out->folder, name, NULL);
    fd = open(out->temp, O_RDWR | O_CREAT | O_EXCL | O_CLOEXEC, 0666);
  } while (fd < 0 && errno == EEXIST);
  return fd;
}

static gboolean open_beside(AwOutput *out, const struct stat *old, GError **error)
{
  out->final = follow_links(out->asked);
  if (!out->final)
    return fail_errno(error, ELOOP, "write", out->asked);
  out->folder = g_path_get_dirname(out->final);
  if (!g_file_test(out->folder, G_FILE_TEST_IS_DIR)) {
    g_set_error(error, AW_ERROR, AW_ERROR_NOT_FOUND, "cannot write %s: there is no folder %s", out->asked, out->folder);
    return FALSE;
  }
  int fd = create_beside(out);
  if (fd < 0) {
    int number = errno;
    g_clear_pointer(&out->temp, g_free);
    g_set_error(error, AW_ERROR, AW_ERROR_IO, "cannot write %s: folder %s: %s", out->asked, out->folder,
                g_strerror(number));
    return FALSE;
  }
  if (old && fchmod(fd, old->st_mode & 07777) != 0)
    g_debug("the permissions of %s could not be kept", out->final);
  out->stream = fdopen(fd, "w");
  return TRUE;
}

AwOutput *aw_output_open(const char *path, GError **error)
{
  g_autoptr(AwOutput) out = g_new0(AwOutput, 1);
  struct stat st;
  out->asked = g_strdup(path);
  gboolean exists = stat(path, &st) == 0;
  if (exists && S_ISDIR(st.st_mode)) {
    g_set_error(error, AW_ERROR, AW_ERROR_IO, "cannot write %s: it is a folder", path);
    return NULL;
  }
  gboolean direct = standing_fd(path) >= 0 || (exists && !S_ISREG(st.st_mode));
  if (!(direct ? open_direct(out, error) : open_beside(out, exists ? &st : NULL, error)))
    return NULL;
  return g_steal_pointer(&out);
}

FILE *aw_output_stream(AwOutput *out)
{
  return out->stream;
}

const char *aw_output_path(const AwOutput *out)
{
  return out->temp ? out->temp : out->asked;
}

gboolean aw_output_is_direct(const AwOutput *out)
{
  return !out->final;
}

/* A pipe or device cannot be synced and says EINVAL or the like; that is no failed write. */
static gboolean sync_stream(FILE *stream, gboolean direct)
{
  return fsync(fileno(stream)) == 0 || direct;
}

/* Flushes, syncs and closes; the first failure wins. A write that failed long ago has lost its errno: ENOSPC shows up
 * again in fflush, anything else is called EIO. */
static int close_stream(AwOutput *out)
{
  FILE *stream = g_steal_pointer(&out->stream);
  gboolean failed_before = ferror(stream) != 0;
  int number = 0;
  errno = 0;
  if (fflush(stream) != 0 || failed_before)
    number = errno ? errno : EIO;
  if (!sync_stream(stream, aw_output_is_direct(out)) && !number)
    number = errno;
  if (fclose(stream) != 0 && !number)
    number = errno;
  return number;
}

/* Makes the new name itself survive a power cut. Some file systems cannot sync a folder; the file is whole anyway. */
static void sync_folder(const char *folder)
{
  int fd = open(folder, O_RDONLY | O_DIRECTORY | O_CLOEXEC);
  if (fd < 0)
    return;
  if (fsync(fd) != 0)
    g_debug("folder %s could not be synced", folder);
  close(fd);
}

gboolean aw_output_commit(AwOutput *out, GError **error)
{
  g_return_val_if_fail(out->stream, FALSE);
  int number = close_stream(out);
  if (number)
    return fail_errno(error, number, "write all of", out->asked);
  if (aw_output_is_direct(out))
    return TRUE;
  if (rename(out->temp, out->final) != 0)
    return fail_errno(error, errno, "give its name to", out->asked);
  g_clear_pointer(&out->temp, g_free);
  sync_folder(out->folder);
  return TRUE;
}

void aw_output_free(AwOutput *out)
{
  if (!out)
    return;
  if (out->stream)
    fclose(out->stream);
  if (out->temp)
    unlink(out->temp);
  g_free(out->asked);
  g_free(out->final);
  g_free(out->folder);
  g_free(out->temp);
  g_free(out);
}

gboolean aw_output_write(const char *path, const char *bytes, gsize n_bytes, GError **error)
{
  g_autoptr(AwOutput) out = aw_output_open(path, error);
  if (!out)
    return FALSE;
  if (n_bytes)
    fwrite(bytes, 1, n_bytes, out->stream); /* the commit reports what failed */
  return aw_output_commit(out, error);
}

/* Opens for reading; a folder is an error of its own. Returns -1 on error. */
static int open_input(const char *path, GError **error)
{
  int fd = open(path, O_RDONLY | O_CLOEXEC | O_NOCTTY);
  struct stat st;
  if (fd >= 0 && fstat(fd, &st) == 0 && !S_ISDIR(st.st_mode))
    return fd;
  fail_errno(error, fd < 0 ? errno : EISDIR, "read", path);
  if (fd >= 0)
    close(fd);
  return -1;
}

/* read(2) that goes on after a signal; -1 with `error` set when it fails. */
static gssize read_some(int fd, void *to, gsize n, const char *path, GError **error)
{
  gssize got;
  do
    got = read(fd, to, n);
  while (got < 0 && errno == EINTR);
  if (got < 0)
    fail_errno(error, errno, "read", path);
  return got;
}

/* Reads to the end of `fd` into a growing buffer with one byte to spare. */
static gboolean read_all(int fd, const char *path, gsize max_bytes, char **bytes, gsize *n_bytes, GError **error)
{
  struct stat st;
  gsize room = fstat(fd, &st) == 0 && st.st_size > 0 ? (gsize)st.st_size + 1 : READ_STEP;
  g_autofree char *buffer = NULL;
  gsize n = 0;
  for (gssize got = 1; got > 0; n += (gsize)MAX(got, 0)) {
    if (n > max_bytes || (gsize)MAX(st.st_size, 0) > max_bytes) {
      g_set_error(error, AW_ERROR, AW_ERROR_RANGE,
                  "%s is larger than %" G_GSIZE_FORMAT " bytes, the limit for its kind", path, max_bytes);
      return FALSE;
    }
    if (!buffer || n == room) {
      char *larger = g_try_realloc(buffer, (room = buffer ? room * 2 : room) + 1);
      if (!larger) {
        g_set_error(error, AW_ERROR, AW_ERROR_MEMORY, "not enough memory to read %s", path);
        return FALSE;
      }
      buffer = larger;
    }
    if ((got = read_some(fd, buffer + n, room - n, path, error)) < 0)
      return FALSE;
  }
  buffer[n] = '\0';
  *bytes = g_steal_pointer(&buffer);
  *n_bytes = n;
  return TRUE;
}

gboolean aw_input_read(const char *path, gsize max_bytes, char **bytes, gsize *n_bytes, GError **error)
{
  int fd = open_input(path, error);
  if (fd < 0)
    return FALSE;
  gboolean ok = read_all(fd, path, max_bytes, bytes, n_bytes, error);
  close(fd);
  return ok;
}

char *aw_input_sha256(const char *path, GError **error)
{
  int fd = open_input(path, error);
  if (fd < 0)
    return NULL;
  g_autoptr(GChecksum) sum = g_checksum_new(G_CHECKSUM_SHA256);
  g_autofree guchar *buffer = g_malloc(READ_STEP);
  gssize got;
  while ((got = read_some(fd, buffer, READ_STEP, path, error)) > 0)
    g_checksum_update(sum, buffer, got);
  close(fd);
  return got < 0 ? NULL : g_strdup(g_checksum_get_string(sum));
}

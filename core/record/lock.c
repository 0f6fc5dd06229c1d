/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include <errno.h>
#include <fcntl.h>
#include <string.h>
#include <sys/file.h>
#include <sys/stat.h>
#include <unistd.h>

#include "base/error.h"
#include "record/private.h"

#define HOLDER_BYTES 200

/* f_type values of statfs(2), as its manual page lists them. */
const char *aw_lock_share_name(guint32 f_type)
{
  static const struct {
    guint32 f_type;
    const char *name;
  } shares[] = { { 0x6969, "NFS" },      { 0x517b, "SMB" },        { 0xff534d42, "CIFS" }, { 0xfe534d42, "SMB2" },
                 { 0x65735546, "FUSE" }, { 0x5346414f, "AFS" },    { 0x01021997, "9P" },   { 0x00c36400, "Ceph" },
                 { 0x73757245, "Coda" }, { 0x0bd00bd0, "Lustre" }, { 0x47504653, "GPFS" } };
  for (gsize i = 0; i < G_N_ELEMENTS(shares); i++)
    if (shares[i].f_type == f_type)
      return shares[i].name;
  return NULL;
}

/* A line for the person who is kept out; it is only read for that message. */
static void write_holder(int fd)
{
  g_autofree char *line =
      g_strdup_printf("%s on %s, process %ld\n", g_get_user_name(), g_get_host_name(), (long)getpid());
  if (ftruncate(fd, 0) != 0 || pwrite(fd, line, strlen(line), 0) < 0)
    g_debug("the holder's name could not be written into the lock file");
}

static char *read_holder(int fd)
{
  char line[HOLDER_BYTES];
  gssize n = pread(fd, line, sizeof line - 1, 0);
  line[MAX(n, 0)] = '\0';
  return *line ? g_strstrip(g_utf8_make_valid(line, -1)) : g_strdup("another process");
}

/* A lock file left by a killed process of someone else can often only be read; that suffices for flock. */
static int open_lock_file(const char *path)
{
  int fd = open(path, O_RDWR | O_CREAT | O_CLOEXEC | O_NOFOLLOW | O_NONBLOCK, 0666);
  if (fd >= 0 || errno != EACCES)
    return fd;
  fd = open(path, O_RDONLY | O_CLOEXEC | O_NOFOLLOW | O_NONBLOCK);
  if (fd < 0)
    errno = EACCES;
  return fd;
}

/* TRUE when the locked file is still the one that stands under its name: its last holder removes it. */
static gboolean is_current(int fd, const char *path)
{
  struct stat held, named;
  return fstat(fd, &held) == 0 && stat(path, &named) == 0 && held.st_ino == named.st_ino && held.st_dev == named.st_dev;
}

static gboolean fail_lock(AwRecord *record, int fd, int number, GError **error)
{
  if (fd < 0) {
    g_set_error(error, AW_ERROR, AW_ERROR_IO, "cannot write %s: its folder %s does not take a lock file: %s",
                record->path, record->folder, g_strerror(number));
    return FALSE;
  }
  if (number == EWOULDBLOCK) {
    g_autofree char *holder = read_holder(fd);
    g_set_error(error, AW_ERROR, AW_ERROR_LOCKED, "%s is open for writing elsewhere (%s); it can only be read now",
                record->path, holder);
  } else
    g_set_error(error, AW_ERROR, AW_ERROR_IO, "cannot lock %s: %s", record->path, g_strerror(number));
  close(fd);
  return FALSE;
}

gboolean aw_lock_take(AwRecord *record, GError **error)
{
  g_autofree char *path = g_strconcat(record->real_path, ".lock", NULL);
  for (;;) {
    int fd = open_lock_file(path);
    if (fd < 0 || flock(fd, LOCK_EX | LOCK_NB) != 0)
      return fail_lock(record, fd, errno, error);
    if (is_current(fd, path)) {
      write_holder(fd);
      record->lock_fd = fd;
      record->lock_path = g_steal_pointer(&path);
      return TRUE;
    }
    close(fd);
  }
}

void aw_lock_drop(AwRecord *record)
{
  if (record->lock_fd < 0)
    return;
  unlink(record->lock_path); /* while the lock is held: whoever opened the old file sees that it lost its name */
  close(record->lock_fd);
  record->lock_fd = -1;
  g_clear_pointer(&record->lock_path, g_free);
}

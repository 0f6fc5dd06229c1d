/* Aimwell - SPDX-License-Identifier: GPL-3.0-or-later */
#include "tiff_bytes.h"

#include <string.h>

typedef struct {
  guint16 tag, type;
  guint32 n;
  GByteArray *value; /* in file order */
} Entry;

struct TiffBytes {
  gboolean big_endian;
  GByteArray *bytes;
  GPtrArray *entries;
  guint link_at; /* where the offset of the next directory goes */
};

static void entry_free(gpointer data)
{
  Entry *entry = data;
  g_byte_array_unref(entry->value);
  g_free(entry);
}

static void put(const TiffBytes *t, GByteArray *out, guint64 value, int n_bytes)
{
  for (int i = 0; i < n_bytes; i++) {
    int shift = 8 * (t->big_endian ? n_bytes - 1 - i : i);
    guint8 byte = (guint8)(value >> shift);
    g_byte_array_append(out, &byte, 1);
  }
}

TiffBytes *tiff_bytes_new(gboolean big_endian)
{
  TiffBytes *t = g_new0(TiffBytes, 1);
  t->big_endian = big_endian;
  t->bytes = g_byte_array_new();
  t->entries = g_ptr_array_new_with_free_func(entry_free);
  g_byte_array_append(t->bytes, (const guint8 *)(big_endian ? "MM" : "II"), 2);
  put(t, t->bytes, 42, 2);
  t->link_at = t->bytes->len;
  put(t, t->bytes, 0, 4);
  return t;
}

void tiff_bytes_free(TiffBytes *t)
{
  if (!t)
    return;
  g_byte_array_unref(t->bytes);
  g_ptr_array_unref(t->entries);
  g_free(t);
}

static void pad_to_even(TiffBytes *t)
{
  if (t->bytes->len % 2)
    put(t, t->bytes, 0, 1);
}

guint32 tiff_bytes_data(TiffBytes *t, const void *bytes, gsize n)
{
  pad_to_even(t);
  guint32 at = t->bytes->len;
  g_byte_array_append(t->bytes, bytes, (guint)n);
  return at;
}

void tiff_bytes_drop(TiffBytes *t, guint16 tag)
{
  for (guint i = 0; i < t->entries->len; i++)
    if (((Entry *)g_ptr_array_index(t->entries, i))->tag == tag) {
      g_ptr_array_remove_index(t->entries, i);
      return;
    }
}

static GByteArray *new_entry(TiffBytes *t, guint16 tag, guint16 type, guint32 n)
{
  tiff_bytes_drop(t, tag);
  Entry *entry = g_new0(Entry, 1);
  *entry = (Entry){ tag, type, n, g_byte_array_new() };
  g_ptr_array_add(t->entries, entry);
  return entry->value;
}

void tiff_bytes_set_list(TiffBytes *t, guint16 tag, guint16 type, const guint32 *values, guint32 n)
{
  GByteArray *value = new_entry(t, tag, type, n);
  for (guint32 i = 0; i < n; i++)
    put(t, value, values[i], type == TIFF_BYTE ? 1 : type == TIFF_U16 ? 2 : 4);
}

void tiff_bytes_set(TiffBytes *t, guint16 tag, guint16 type, guint32 value)
{
  tiff_bytes_set_list(t, tag, type, &value, 1);
}

void tiff_bytes_set_text(TiffBytes *t, guint16 tag, const char *text)
{
  guint32 n = (guint32)strlen(text) + 1;
  g_byte_array_append(new_entry(t, tag, TIFF_TEXT, n), (const guint8 *)text, n);
}

void tiff_bytes_set_ratio(TiffBytes *t, guint16 tag, guint32 over, guint32 under)
{
  GByteArray *value = new_entry(t, tag, TIFF_RATIO, 1);
  put(t, value, over, 4);
  put(t, value, under, 4);
}

void tiff_bytes_set_f64(TiffBytes *t, guint16 tag, double number)
{
  guint64 bits;
  memcpy(&bits, &number, sizeof bits);
  put(t, new_entry(t, tag, TIFF_F64, 1), bits, 8);
}

void tiff_bytes_grey(TiffBytes *t, int width_px, int height_px, int bits, const void *pixels, gsize n)
{
  tiff_bytes_set(t, 256, TIFF_U32, (guint32)width_px);
  tiff_bytes_set(t, 257, TIFF_U32, (guint32)height_px);
  tiff_bytes_set(t, 258, TIFF_U16, (guint32)bits);
  tiff_bytes_set(t, 259, TIFF_U16, 1);
  tiff_bytes_set(t, 262, TIFF_U16, 1);
  tiff_bytes_set(t, 273, TIFF_U32, tiff_bytes_data(t, pixels, n));
  tiff_bytes_set(t, 277, TIFF_U16, 1);
  tiff_bytes_set(t, 278, TIFF_U32, (guint32)height_px);
  tiff_bytes_set(t, 279, TIFF_U32, (guint32)n);
}

void tiff_bytes_link(TiffBytes *t, guint32 offset)
{
  g_autoptr(GByteArray) four = g_byte_array_new();
  put(t, four, offset, 4);
  memcpy(t->bytes->data + t->link_at, four->data, 4);
}

static gint by_tag(gconstpointer a, gconstpointer b)
{
  const Entry *left = *(Entry *const *)a, *right = *(Entry *const *)b;
  return (int)left->tag - (int)right->tag;
}

guint32 tiff_bytes_end_page(TiffBytes *t)
{
  g_ptr_array_sort(t->entries, by_tag);
  g_autoptr(GByteArray) table = g_byte_array_new();
  put(t, table, t->entries->len, 2);
  for (guint i = 0; i < t->entries->len; i++) {
    const Entry *entry = g_ptr_array_index(t->entries, i);
    put(t, table, entry->tag, 2);
    put(t, table, entry->type, 2);
    put(t, table, entry->n, 4);
    if (entry->value->len > 4) {
      put(t, table, tiff_bytes_data(t, entry->value->data, entry->value->len), 4);
      continue;
    }
    g_byte_array_append(table, entry->value->data, entry->value->len);
    put(t, table, 0, 4 - (int)entry->value->len);
  }
  guint32 at = tiff_bytes_data(t, table->data, table->len);
  tiff_bytes_link(t, at);
  t->link_at = t->bytes->len;
  put(t, t->bytes, 0, 4);
  g_ptr_array_set_size(t->entries, 0);
  return at;
}

GByteArray *tiff_bytes_all(TiffBytes *t)
{
  return t->bytes;
}

char *tiff_bytes_save(TiffBytes *t, const char *folder, const char *name, gsize n)
{
  char *path = g_build_filename(folder, name, NULL);
  gboolean ok = g_file_set_contents(path, (const char *)t->bytes->data, (gssize)(n ? n : t->bytes->len), NULL);
  g_assert_true(ok);
  return path;
}

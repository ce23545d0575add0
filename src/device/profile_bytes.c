/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The structure of a profile as ICC.1:2022, clause 7 and 10 have it, before a
 * library is let at it. A table that says it has 255^4 entries must have them
 * in the file. */
#include "device/profile_private.h"

#include "base/base_private.h"

#include <stdio.h>
#include <string.h>

enum {
  HEADER_SIZE = 128,
  TAG_SIZE = 12,
  LEAST_SIZE = HEADER_SIZE + 4,
  MOST_TAGS = 100, /* those of lcms2 */
  MOST_CHANNELS = 15
};

typedef struct tag {
  const char *name; /* of the profile */
  char signature[5];
  const unsigned char *bytes;
  size_t size;
} tag;

static size_t u8(const unsigned char *at) {
  return at[0];
}

static size_t u16(const unsigned char *at) {
  return (size_t)at[0] << 8 | at[1];
}

static size_t u32(const unsigned char *at) {
  return u16(at) << 16 | u16(at + 2);
}

static bool is_signature(const unsigned char *at, const char *text) {
  return memcmp(at, text, 4) == 0;
}

/* Four characters; what does not print becomes '?'. */
static void copy_signature(const unsigned char *at, char out[5]) {
  for (int i = 0; i < 4; i++)
    out[i] = at[i] >= 0x20 && at[i] < 0x7f ? (char)at[i] : '?';
  out[4] = '\0';
}

/* ---- Tables ------------------------------------------------------------- */

static ef_status refuse(const tag *t, const char *what, ef_error *error) {
  ef__error_set(error, EF_MALFORMED,
                "%s; the profile is damaged or made to mislead", what);
  ef__error_place(error, t->name, 0, 0, t->signature);
  return EF_MALFORMED;
}

/* True when `needed` = a * b + c without overflow lies in the tag from `at`. */
static bool fits(const tag *t, size_t at, size_t count, size_t bytes_each) {
  size_t needed;
  return ef__size_multiply(count, bytes_each, &needed) && at <= t->size &&
         needed <= t->size - at;
}

/* Entries of a table with grid[i] points along input i; false on overflow. */
static bool count_entries(size_t n_inputs, const unsigned char *grid,
                          bool is_cube, size_t n_outputs, size_t *count) {
  *count = n_outputs;
  for (size_t i = 0; i < n_inputs; i++)
    if (!ef__size_multiply(*count, u8(grid + (is_cube ? 0 : i)), count))
      return false;
  return true;
}

static bool good_channels(size_t n) {
  return n >= 1 && n <= MOST_CHANNELS;
}

/* lut8Type and lut16Type (10.10, 10.11). */
static ef_status check_lut(const tag *t, bool is_wide, ef_error *error) {
  const size_t head = is_wide ? 52 : 48, each = is_wide ? 2 : 1;
  size_t count, whole;
  if (t->size < head)
    return refuse(t, "the table is shorter than its own head", error);
  const size_t n_in = u8(t->bytes + 8), n_out = u8(t->bytes + 9);
  if (!good_channels(n_in) || !good_channels(n_out))
    return refuse(t, "the table has no channels, or more than 15", error);
  const size_t n_curve_in = is_wide ? u16(t->bytes + 48) : 256;
  const size_t n_curve_out = is_wide ? u16(t->bytes + 50) : 256;
  if (n_curve_in < 2 || n_curve_in > 4096 || n_curve_out < 2 ||
      n_curve_out > 4096)
    return refuse(t, "a curve of the table has other than 2 to 4096 entries",
                  error);
  if (!count_entries(n_in, t->bytes + 10, true, n_out, &count) ||
      !ef__size_add(count, n_in * n_curve_in + n_out * n_curve_out, &whole) ||
      !fits(t, head, whole, each))
    return refuse(t, "the table says it is larger than its tag", error);
  return EF_OK;
}

/* The table of lutAToBType and lutBToAType (10.12, 10.13), if there is one. */
static ef_status check_clut(const tag *t, ef_error *error) {
  size_t count;
  if (t->size < 32)
    return refuse(t, "the table is shorter than its own head", error);
  const size_t n_in = u8(t->bytes + 8), n_out = u8(t->bytes + 9);
  const size_t at = u32(t->bytes + 24);
  if (!good_channels(n_in) || !good_channels(n_out))
    return refuse(t, "the table has no channels, or more than 15", error);
  if (at == 0)
    return EF_OK;
  if (!fits(t, at, 20, 1))
    return refuse(t, "the table lies beyond its tag", error);
  const unsigned char *clut = t->bytes + at;
  if ((u8(clut + 16) != 1 && u8(clut + 16) != 2) ||
      !count_entries(n_in, clut, false, n_out, &count) ||
      !fits(t, at + 20, count, u8(clut + 16)))
    return refuse(t, "the table says it is larger than its tag", error);
  return EF_OK;
}

/* Tables among the elements of multiProcessElementsType (10.16). */
static ef_status check_elements(const tag *t, ef_error *error) {
  if (t->size < 16 || !fits(t, 16, u32(t->bytes + 12), 8))
    return refuse(t, "the list of elements is longer than its tag", error);
  const size_t n = u32(t->bytes + 12);
  for (size_t i = 0; i < n; i++) {
    const size_t at = u32(t->bytes + 16 + 8 * i);
    const size_t size = u32(t->bytes + 20 + 8 * i);
    if (!fits(t, at, size, 1) || size < 12)
      return refuse(t, "an element lies beyond its tag", error);
    const unsigned char *element = t->bytes + at;
    if (!is_signature(element, "clut"))
      continue;
    size_t count;
    const tag inner = {t->name, "", element, size};
    if (size < 28 || !good_channels(u16(element + 8)) ||
        !good_channels(u16(element + 10)) ||
        !count_entries(u16(element + 8), element + 12, false, u16(element + 10),
                       &count) ||
        !fits(&inner, 28, count, 4))
      return refuse(t, "a table says it is larger than its element", error);
  }
  return EF_OK;
}

/* curveType (10.6) and parametricCurveType (10.18). */
static ef_status check_curve(const tag *t, ef_error *error) {
  if (t->size < 12 || !fits(t, 12, u32(t->bytes + 8), 2))
    return refuse(t, "the curve says it is longer than its tag", error);
  return EF_OK;
}

static ef_status check_formula(const tag *t, ef_error *error) {
  static const size_t n_parameters[] = {1, 3, 4, 5, 7};
  if (t->size < 12 || u16(t->bytes + 8) > 4)
    return refuse(t, "the curve is of no function type that ICC.1 has", error);
  if (!fits(t, 12, n_parameters[u16(t->bytes + 8)], 4))
    return refuse(t, "the curve has fewer parameters than its function", error);
  return EF_OK;
}

static ef_status check_tag(const tag *t, ef_error *error) {
  if (is_signature(t->bytes, "curv"))
    return check_curve(t, error);
  if (is_signature(t->bytes, "para"))
    return check_formula(t, error);
  if (is_signature(t->bytes, "mft1"))
    return check_lut(t, false, error);
  if (is_signature(t->bytes, "mft2"))
    return check_lut(t, true, error);
  if (is_signature(t->bytes, "mAB ") || is_signature(t->bytes, "mBA "))
    return check_clut(t, error);
  if (is_signature(t->bytes, "mpet"))
    return check_elements(t, error);
  return EF_OK;
}

/* ---- Header and tag table ------------------------------------------------ */

static ef_status refuse_profile(const char *name, ef_error *error) {
  ef__error_place(error, name, 0, 0, NULL);
  return EF_MALFORMED;
}

static ef_status check_header(const char *name, const unsigned char *bytes,
                              size_t length, size_t *size, ef_error *error) {
  if (length < LEAST_SIZE) {
    ef__error_set(error, EF_MALFORMED,
                  "is no ICC profile: it has %zu bytes, expected at least %d",
                  length, LEAST_SIZE);
    return refuse_profile(name, error);
  }
  if (!is_signature(bytes + 36, "acsp")) {
    ef__error_set(error, EF_MALFORMED,
                  "is no ICC profile: 'acsp' does not stand at byte 36");
    return refuse_profile(name, error);
  }
  *size = u32(bytes);
  if (*size > length || *size < LEAST_SIZE) {
    ef__error_set(error, EF_MALFORMED,
                  *size > length
                      ? "is cut off: its header says %zu bytes, found %zu"
                      : "says that it has %zu bytes, found %zu",
                  *size, length);
    return refuse_profile(name, error);
  }
  if (bytes[8] != 2 && bytes[8] != 4) {
    ef__error_set(error, EF_MALFORMED,
                  "is of version %d; profiles of versions 2 and 4 are read",
                  bytes[8]);
    return refuse_profile(name, error);
  }
  return EF_OK;
}

static ef_status check_tags(const char *name, const unsigned char *bytes,
                            size_t size, ef_error *error) {
  const size_t n = u32(bytes + HEADER_SIZE);
  if (n > MOST_TAGS || LEAST_SIZE + n * TAG_SIZE > size) {
    ef__error_set(error, EF_MALFORMED,
                  "says that it has %zu tags; expected at most %d, and no more "
                  "than there is room for",
                  n, MOST_TAGS);
    return refuse_profile(name, error);
  }
  for (size_t i = 0; i < n; i++) {
    const unsigned char *entry = bytes + LEAST_SIZE + i * TAG_SIZE;
    const size_t at = u32(entry + 4), tag_size = u32(entry + 8);
    tag t = {name, "", bytes + at, tag_size};
    copy_signature(entry, t.signature);
    if (at < LEAST_SIZE || tag_size < 8 || at > size || tag_size > size - at) {
      t.bytes = bytes;
      return refuse(&t, "the tag lies outside the profile", error);
    }
    const ef_status status = check_tag(&t, error);
    if (status != EF_OK)
      return status;
  }
  return EF_OK;
}

ef_status ef__profile_check_bytes(const char *name, const unsigned char *bytes,
                                  size_t length, size_t *size,
                                  ef_error *error) {
  const ef_status status = check_header(name, bytes, length, size, error);
  return status == EF_OK ? check_tags(name, bytes, *size, error) : status;
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Some pixels of a spectral image at a time, by positioned reads, turned into
 * pixel after pixel whatever way they lie in the file. */
#include "exchange/cube_private.h"

#include <errno.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "base/base_private.h"

/* Read at a time. Of bsq each band is a read of its own, and those have to be
 * long enough: 1 MiB of 200 bands is 5 kB each, at less than half the speed. */
#define SPAN_BYTES ((size_t)1 << 20)
#define SPAN_BYTES_BSQ ((size_t)8 << 20)

struct ef_cube_window {
  const ef_cube *cube;
  size_t n_bands;
  size_t *band;  /* in the file */
  size_t low, n_span; /* bil: the bands that are read, in one piece */
  size_t value_bytes, most;
  bool is_swapped;
  bool is_adjoining; /* the bands follow each other as in the file */
  bool is_direct;    /* pixels lie as they are handed out */
  size_t first, n; /* pixels read */
  unsigned char *bytes;
};

static bool host_is_big_endian(void) {
  const uint16_t one = 1;
  unsigned char first;
  memcpy(&first, &one, 1);
  return first == 0;
}

static void choose_size(ef_cube_window *w) {
  const ef_cube_head *head = &w->cube->header.head;
  const bool is_bsq = head->interleave == EF_BSQ;
  const size_t span = is_bsq ? SPAN_BYTES_BSQ : SPAN_BYTES;
  size_t n_read = head->n_bands;
  if (is_bsq)
    n_read = w->n_bands;
  else if (head->interleave == EF_BIL)
    n_read = w->n_span;
  w->value_bytes = ef_sample_type_bytes(head->type);
  w->most = span / (n_read * w->value_bytes);
  if (head->interleave == EF_BIL && w->most > head->width)
    w->most -= w->most % head->width; /* whole lines are read in one piece */
  if (w->most == 0)
    w->most = 1;
  const size_t all = head->width * head->height;
  if (w->most > all)
    w->most = all;
}

ef_cube_window *ef_cube_window_new(const ef_cube *cube, size_t n_bands,
                                   const size_t *band, ef_error *error) {
  const ef_cube_head *head = &cube->header.head;
  for (size_t k = 0; k < n_bands; ++k) {
    if (band[k] < head->n_bands)
      continue;
    ef__error_set(error, EF_INVALID, "there is no band %zu among %zu", band[k],
                  head->n_bands);
    return NULL;
  }
  ef_cube_window *w = ef__allocate_zeroed(1, sizeof *w);
  if (w == NULL || n_bands == 0) {
    free(w);
    if (n_bands == 0)
      ef__error_set(error, EF_INVALID, "a window needs a band");
    else
      ef__error_memory(error, "a window");
    return NULL;
  }
  w->cube = cube;
  w->n_bands = n_bands;
  w->band = ef__allocate(n_bands, sizeof *w->band);
  size_t high = band[0];
  w->low = band[0];
  for (size_t k = 0; k < n_bands; ++k) {
    w->low = band[k] < w->low ? band[k] : w->low;
    high = band[k] > high ? band[k] : high;
  }
  w->n_span = high - w->low + 1;
  w->is_swapped = head->is_big_endian != host_is_big_endian();
  choose_size(w);
  w->bytes = ef__allocate(w->most, ef_cube_window_bytes(w) / w->most);
  if (w->band == NULL || w->bytes == NULL) {
    ef_cube_window_free(w);
    ef__error_memory(error, "a window on a spectral image");
    return NULL;
  }
  memcpy(w->band, band, n_bands * sizeof *band);
  w->is_adjoining = true;
  for (size_t k = 0; k < n_bands; ++k)
    w->is_adjoining = w->is_adjoining && band[k] == w->low + k;
  w->is_direct = head->interleave == EF_BIP && w->is_adjoining &&
                 n_bands == head->n_bands;
  return w;
}

void ef_cube_window_free(ef_cube_window *window) {
  if (window == NULL)
    return;
  free(window->band);
  free(window->bytes);
  free(window);
}

size_t ef_cube_window_pixels(const ef_cube_window *window) {
  return window->most;
}

size_t ef_cube_window_bytes(const ef_cube_window *window) {
  const ef_cube_head *head = &window->cube->header.head;
  const size_t n = head->interleave == EF_BSQ   ? window->n_bands
                   : head->interleave == EF_BIL ? window->n_span
                                                : head->n_bands;
  return window->most * n * window->value_bytes;
}

/* ---- Reading ------------------------------------------------------------- */

/* `length` bytes from place `at` of the values. */
static ef_status fetch(const ef_cube_window *w, size_t at, size_t length,
                       unsigned char *to, ef_error *error) {
  const ef_cube *cube = w->cube;
  at += cube->header.head.offset_bytes;
  while (length > 0) {
    const ssize_t got = pread(cube->descriptor, to, length, (off_t)at);
    if (got < 0 && errno == EINTR)
      continue;
    if (got <= 0) {
      if (got == 0)
        ef__error_set(error, EF_MALFORMED,
                      "ends at byte %zu, earlier than when it was opened", at);
      else
        ef__error_set(error, EF_UNREADABLE, "reading failed: %s",
                      strerror(errno));
      return ef__error_place(error, cube->data_name, 0, 0, NULL);
    }
    to += got;
    at += (size_t)got;
    length -= (size_t)got;
  }
  return EF_OK;
}

/* Parts of lines lie one behind the other, each band after band. */
static ef_status fetch_lines(ef_cube_window *w, size_t first, size_t n,
                             ef_error *error) {
  const ef_cube_head *head = &w->cube->header.head;
  const size_t line_values = head->width * head->n_bands;
  unsigned char *to = w->bytes;
  ef_status status = EF_OK;
  while (n > 0 && status == EF_OK) {
    const size_t y = first / head->width, x = first % head->width;
    const size_t left = head->width - x;
    const size_t part = n < left ? n : left;
    const size_t start = y * line_values + w->low * head->width + x;
    if (part == head->width) {
      status = fetch(w, start * w->value_bytes,
                     w->n_span * part * w->value_bytes, to, error);
    } else {
      for (size_t k = 0; k < w->n_span && status == EF_OK; ++k)
        status = fetch(w, (start + k * head->width) * w->value_bytes,
                       part * w->value_bytes,
                       to + k * part * w->value_bytes, error);
    }
    to += w->n_span * part * w->value_bytes;
    first += part;
    n -= part;
  }
  return status;
}

static ef_status fetch_bands(ef_cube_window *w, size_t first, size_t n,
                             ef_error *error) {
  const ef_cube_head *head = &w->cube->header.head;
  const size_t band_values = head->width * head->height;
  ef_status status = EF_OK;
  for (size_t k = 0; k < w->n_bands && status == EF_OK; ++k)
    status = fetch(w, (w->band[k] * band_values + first) * w->value_bytes,
                   n * w->value_bytes, w->bytes + k * n * w->value_bytes,
                   error);
  return status;
}

static void swap_bytes(unsigned char *at, size_t n, size_t size) {
  for (size_t i = 0; i < n; ++i, at += size) {
    for (size_t k = 0; k < size / 2; ++k) {
      const unsigned char kept = at[k];
      at[k] = at[size - 1 - k];
      at[size - 1 - k] = kept;
    }
  }
}

static void swap_values(ef_cube_window *w) {
  const ef_cube_head *head = &w->cube->header.head;
  const size_t n = w->n * (head->interleave == EF_BSQ   ? w->n_bands
                           : head->interleave == EF_BIL ? w->n_span
                                                        : head->n_bands);
  /* The size as a constant makes each a single instruction. */
  if (w->value_bytes == 2)
    swap_bytes(w->bytes, n, 2);
  else if (w->value_bytes == 4)
    swap_bytes(w->bytes, n, 4);
  else if (w->value_bytes == 8)
    swap_bytes(w->bytes, n, 8);
}

ef_status ef_cube_window_read(ef_cube_window *window, size_t first, size_t n,
                              ef_error *error) {
  ef_cube_window *const w = window;
  const ef_cube_head *head = &w->cube->header.head;
  const size_t all = head->width * head->height;
  w->n = 0;
  if (n > w->most || first > all || n > all - first)
    return ef__error_set(error, EF_INVALID,
                         "pixels %zu to %zu are more than the window or the "
                         "image holds",
                         first, first + n);
  ef_status status;
  switch (head->interleave) {
  case EF_BIP:
    status = fetch(w, first * head->n_bands * w->value_bytes,
                   n * head->n_bands * w->value_bytes, w->bytes, error);
    break;
  case EF_BIL:
    status = fetch_lines(w, first, n, error);
    break;
  default:
    status = fetch_bands(w, first, n, error);
  }
  if (status != EF_OK)
    return status;
  w->first = first;
  w->n = n;
  if (w->is_swapped)
    swap_values(w);
  return EF_OK;
}

/* ---- Values -------------------------------------------------------------- */

/* Of bsq and bil: pixels that lie side by side, their bands band_step apart. */
typedef struct run {
  size_t at; /* of the first pixel, in values */
  size_t n;
  size_t band_step;
} run;

/* The run that starts at pixel i of the window, at most n long. */
static run run_at(const ef_cube_window *w, size_t i, size_t n) {
  const ef_cube_head *head = &w->cube->header.head;
  if (head->interleave == EF_BSQ)
    return (run){i, n, w->n};
  /* Of the parts of lines, the one that pixel lies in. */
  const size_t width = head->width;
  const size_t pixel = w->first + i, x = pixel % width;
  const size_t line_first = pixel - x;
  const size_t begin = line_first > w->first ? line_first : w->first;
  const size_t line_end = line_first + width, read_end = w->first + w->n;
  const size_t end = line_end < read_end ? line_end : read_end;
  const size_t left = end - pixel;
  return (run){(begin - w->first) * w->n_span + (pixel - begin),
               n < left ? n : left, end - begin};
}

bool ef_cube_window_plane(const ef_cube_window *window, size_t i,
                          ef_cube_plane *plane) {
  const ef_cube_head *head = &window->cube->header.head;
  if (head->interleave == EF_BIP ||
      (head->interleave == EF_BIL && !window->is_adjoining))
    return false;
  const run r = run_at(window, i, window->n - i);
  *plane = (ef_cube_plane){.value = window->bytes + r.at * window->value_bytes,
                           .n = r.n,
                           .band_step = r.band_step};
  return true;
}

static size_t band_place(const ef_cube_window *w, const run *r, size_t k) {
  const bool is_bsq = w->cube->header.head.interleave == EF_BSQ;
  return (is_bsq ? k : w->band[k] - w->low) * r->band_step;
}

enum { TILE = 32 }; /* pixels whose samples stay in the first-level cache */

/* name(w, i, n, out): values of type FROM as type TO. Pixels that lie side by
 * side are taken in squares, so that both sides are read and written in whole
 * cache lines. */
#define TAKE(name, FROM, TO)                                                   \
  static void name##_run(const ef_cube_window *w, const run *r,                \
                         const FROM *from, TO *out) {                          \
    const size_t n_bands = w->n_bands;                                         \
    for (size_t p = 0; p < r->n; p += TILE) {                                  \
      const size_t stop = r->n - p < TILE ? r->n - p : TILE;                   \
      TO *const to = out + p * n_bands;                                        \
      for (size_t k = 0; k < n_bands; ++k) {                                   \
        const FROM *const column = from + p + band_place(w, r, k);             \
        for (size_t q = 0; q < stop; ++q)                                      \
          to[q * n_bands + k] = (TO)column[q];                                 \
      }                                                                        \
    }                                                                          \
  }                                                                            \
  static void name##_pixels(const ef_cube_window *w, size_t n,                 \
                            const FROM *from, TO *out) {                       \
    const size_t n_bands = w->n_bands, step = w->cube->header.head.n_bands;    \
    for (size_t i = 0; i < n; ++i, from += step, out += n_bands) {             \
      if (w->is_adjoining) {                                                   \
        for (size_t k = 0; k < n_bands; ++k)                                   \
          out[k] = (TO)from[w->low + k];                                       \
      } else {                                                                 \
        for (size_t k = 0; k < n_bands; ++k)                                   \
          out[k] = (TO)from[w->band[k]];                                       \
      }                                                                        \
    }                                                                          \
  }                                                                            \
  static void name(const ef_cube_window *w, size_t i, size_t n, TO *out) {     \
    const ef_cube_head *head = &w->cube->header.head;                          \
    const FROM *const from = (const FROM *)(const void *)w->bytes;             \
    if (head->interleave == EF_BIP) {                                          \
      name##_pixels(w, n, from + i * head->n_bands, out);                      \
      return;                                                                  \
    }                                                                          \
    while (n > 0) {                                                            \
      const run r = run_at(w, i, n);                                           \
      name##_run(w, &r, from + r.at, out);                                     \
      out += r.n * w->n_bands;                                                 \
      i += r.n;                                                                \
      n -= r.n;                                                                \
    }                                                                          \
  }

TAKE(float_of_uint8, uint8_t, float)
TAKE(float_of_int16, int16_t, float)
TAKE(float_of_uint16, uint16_t, float)
TAKE(float_of_int32, int32_t, float)
TAKE(float_of_uint32, uint32_t, float)
TAKE(float_of_float, float, float)
TAKE(float_of_double, double, float)
TAKE(double_of_uint8, uint8_t, double)
TAKE(double_of_int16, int16_t, double)
TAKE(double_of_uint16, uint16_t, double)
TAKE(double_of_int32, int32_t, double)
TAKE(double_of_uint32, uint32_t, double)
TAKE(double_of_float, float, double)
TAKE(double_of_double, double, double)

const float *ef_cube_window_floats(const ef_cube_window *window, size_t i,
                                   size_t n, float *room) {
  const ef_sample_type type = window->cube->header.head.type;
  if (window->is_direct && type == EF_FLOAT32)
    return (const float *)(const void *)window->bytes + i * window->n_bands;
  switch (type) {
  case EF_UINT8:
    float_of_uint8(window, i, n, room);
    break;
  case EF_INT16:
    float_of_int16(window, i, n, room);
    break;
  case EF_UINT16:
    float_of_uint16(window, i, n, room);
    break;
  case EF_INT32:
    float_of_int32(window, i, n, room);
    break;
  case EF_UINT32:
    float_of_uint32(window, i, n, room);
    break;
  case EF_FLOAT32:
    float_of_float(window, i, n, room);
    break;
  case EF_FLOAT64:
    float_of_double(window, i, n, room);
    break;
  }
  return room;
}

const double *ef_cube_window_doubles(const ef_cube_window *window, size_t i,
                                     size_t n, double *room) {
  const ef_sample_type type = window->cube->header.head.type;
  if (window->is_direct && type == EF_FLOAT64)
    return (const double *)(const void *)window->bytes + i * window->n_bands;
  switch (type) {
  case EF_UINT8:
    double_of_uint8(window, i, n, room);
    break;
  case EF_INT16:
    double_of_int16(window, i, n, room);
    break;
  case EF_UINT16:
    double_of_uint16(window, i, n, room);
    break;
  case EF_INT32:
    double_of_int32(window, i, n, room);
    break;
  case EF_UINT32:
    double_of_uint32(window, i, n, room);
    break;
  case EF_FLOAT32:
    double_of_float(window, i, n, room);
    break;
  case EF_FLOAT64:
    double_of_double(window, i, n, room);
    break;
  }
  return room;
}

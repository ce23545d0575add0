/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The distinct colours of a picture: an open hash of their samples. */
#include "image/image_private.h"

#include <stdlib.h>

#include "base/base_private.h"

typedef struct colour {
  uint64_t key; /* three samples of 16 bits, masked */
  uint64_t n_pixels;
  uint32_t x, y; /* of the first pixel */
} colour;

struct ef_distinct {
  int bits; /* that count */
  uint64_t mask; /* of a key */
  size_t most, n, n_pixels;
  size_t room;   /* of the hash, a power of two, at most half full */
  uint32_t *slot; /* 1 + index of the colour, 0: free */
  colour *colour;
  size_t colour_room;
};

static uint64_t mask_of(int bits) {
  const uint64_t one = (uint64_t)0xFFFFu << (16 - bits) & 0xFFFFu;
  return one << 32 | one << 16 | one;
}

static uint64_t key_of(const uint16_t sample[3]) {
  return (uint64_t)sample[0] << 32 | (uint64_t)sample[1] << 16 | sample[2];
}

/* The finaliser of MurmurHash3 (public domain, A. Appleby). */
static uint64_t scatter(uint64_t key) {
  key ^= key >> 33;
  key *= UINT64_C(0xff51afd7ed558ccd);
  key ^= key >> 33;
  key *= UINT64_C(0xc4ceb9fe1a85ec53);
  return key ^ key >> 33;
}

/* The slot that holds the key, or the free one where it belongs. */
static size_t seek(const ef_distinct *d, uint64_t key) {
  size_t at = (size_t)scatter(key) & (d->room - 1);
  while (d->slot[at] != 0 && d->colour[d->slot[at] - 1].key != key)
    at = (at + 1) & (d->room - 1);
  return at;
}

static bool set_room(ef_distinct *d, size_t room) {
  uint32_t *slot = ef__allocate_zeroed(room, sizeof *slot);
  if (slot == NULL)
    return false;
  free(d->slot);
  d->slot = slot;
  d->room = room;
  for (size_t i = 0; i < d->n; ++i)
    slot[seek(d, d->colour[i].key)] = (uint32_t)(i + 1);
  return true;
}

static bool append(ef_distinct *d, const colour *one, size_t at) {
  if (d->n == d->colour_room) {
    const size_t room = 2 * d->colour_room;
    colour *grown = ef__reallocate(d->colour, room, sizeof *grown);
    if (grown == NULL)
      return false;
    d->colour = grown;
    d->colour_room = room;
  }
  d->colour[d->n] = *one;
  d->slot[at] = (uint32_t)++d->n;
  return 2 * d->n <= d->room || set_room(d, 2 * d->room);
}

/* One bit less of every sample: colours that fall together are joined, in the
 * order they came. */
static bool coarsen(ef_distinct *d) {
  const size_t n = d->n;
  colour *old = d->colour;
  d->colour = ef__allocate(d->colour_room, sizeof *old);
  if (d->colour == NULL) {
    d->colour = old;
    return false;
  }
  d->mask = mask_of(--d->bits);
  d->n = 0;
  bool is_good = set_room(d, d->room);
  for (size_t i = 0; is_good && i < n; ++i) {
    colour one = old[i];
    one.key &= d->mask;
    const size_t at = seek(d, one.key);
    if (d->slot[at] != 0)
      d->colour[d->slot[at] - 1].n_pixels += one.n_pixels;
    else
      is_good = append(d, &one, at);
  }
  free(old);
  return is_good;
}

static bool add_row(ef_distinct *d, const uint16_t *sample, size_t width,
                    size_t y) {
  for (size_t x = 0; x < width; ++x) {
    const uint64_t key = key_of(sample + 3 * x) & d->mask;
    const size_t at = seek(d, key);
    if (d->slot[at] != 0) {
      ++d->colour[d->slot[at] - 1].n_pixels;
      continue;
    }
    const colour one = {key, 1, (uint32_t)x, (uint32_t)y};
    if (!append(d, &one, at))
      return false;
    while (d->n > d->most && d->bits > 1) {
      if (!coarsen(d))
        return false;
    }
  }
  d->n_pixels += width;
  return true;
}

static ef_status read_all(ef_distinct *d, ef_picture *picture,
                          ef_error *error) {
  const size_t width = ef_picture_get_head(picture)->width;
  uint16_t *row = ef__allocate(3 * width, sizeof *row);
  if (row == NULL)
    return ef__error_memory(error, "the colours of a picture");
  ef_status status;
  bool has_row = true;
  for (size_t y = 0;; ++y) {
    status = ef_picture_next_row(picture, row, &has_row, error);
    if (status != EF_OK || !has_row)
      break;
    if (!add_row(d, row, width, y)) {
      status = ef__error_memory(error, "the colours of a picture");
      break;
    }
  }
  free(row);
  return status;
}

ef_distinct *ef_distinct_of(ef_picture *picture, size_t most,
                            ef_error *error) {
  enum { FIRST_ROOM = 1 << 12 };
  const int bits = ef_picture_get_head(picture)->bits;
  ef_distinct *d = ef__allocate_zeroed(1, sizeof *d);
  if (d != NULL) {
    d->bits = bits > 8 ? 16 : 8;
    d->mask = mask_of(d->bits);
    d->most = most == 0 || most > EF_DISTINCT_MOST ? EF_DISTINCT_MOST : most;
    d->most = d->most < 8 ? 8 : d->most; /* those of one bit */
    d->colour_room = FIRST_ROOM;
    d->colour = ef__allocate(FIRST_ROOM, sizeof *d->colour);
  }
  if (d == NULL || d->colour == NULL || !set_room(d, 2 * FIRST_ROOM)) {
    ef__error_memory(error, "the colours of a picture");
    ef_distinct_free(d);
    return NULL;
  }
  if (read_all(d, picture, error) == EF_OK)
    return d;
  ef_distinct_free(d);
  return NULL;
}

void ef_distinct_free(ef_distinct *distinct) {
  if (distinct == NULL)
    return;
  free(distinct->slot);
  free(distinct->colour);
  free(distinct);
}

size_t ef_distinct_count(const ef_distinct *distinct) {
  return distinct->n;
}

size_t ef_distinct_pixels(const ef_distinct *distinct) {
  return distinct->n_pixels;
}

int ef_distinct_bits(const ef_distinct *distinct) {
  return distinct->bits;
}

/* With all bits of the picture a sample is itself; with fewer it is the middle
 * of those that fall together. */
static double value_of(const ef_distinct *d, uint64_t key, int shift) {
  const unsigned code = (unsigned)(key >> shift) & 0xFFFFu;
  if (d->bits == 16)
    return code / 65535.0;
  if (d->bits == 8)
    return (code >> 8) / 255.0;
  const unsigned n = 1u << d->bits;
  return ((code >> (16 - d->bits)) + 0.5) / n;
}

void ef_distinct_at(const ef_distinct *distinct, size_t i, double sample[3],
                    size_t *n_pixels, size_t *x, size_t *y) {
  const colour *one = &distinct->colour[i];
  for (int c = 0; c < 3; ++c)
    sample[c] = value_of(distinct, one->key, 32 - 16 * c);
  *n_pixels = (size_t)one->n_pixels;
  *x = one->x;
  *y = one->y;
}

size_t ef_distinct_find(const ef_distinct *distinct,
                        const uint16_t sample[3]) {
  const size_t at = seek(distinct, key_of(sample) & distinct->mask);
  return distinct->slot[at] != 0 ? distinct->slot[at] - 1 : SIZE_MAX;
}

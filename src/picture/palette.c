/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Few colours for a drawing. Most of its pixels are plain ink or paper; the
 * edges between them have all mixtures of two. The commonest colours stay as
 * they are; the others are chosen each as far as may be from those before it
 * (Gonzalez, Theor. Comput. Sci. 38 (1985) 293-306: the largest error is at
 * most twice the least possible), so that no edge is off by much, however
 * rare. */
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"
#include "picture/drawing.h"

/* Distinct colours that are told apart, and those that stay as they are. */
enum { MOST_COLOURS = 16384, SLOTS = 32768, EXACT = 32 };
enum { RGB = 0xFFFFFF, NO_COLOUR = -1 };

typedef struct entry {
  uint32_t rgb;
  uint32_t distance; /* to the nearest of those chosen, squared */
  size_t n;
  unsigned char place;
  bool is_chosen;
} entry;

typedef struct count {
  size_t n;
  entry *entry;      /* MOST_COLOURS */
  int32_t *slot;     /* SLOTS, of entries */
} count;

static size_t slot_of(const count *c, uint32_t rgb) {
  size_t at = (rgb * 2654435761u) % SLOTS;
  while (c->slot[at] != NO_COLOUR && c->entry[c->slot[at]].rgb != rgb)
    at = (at + 1) % SLOTS;
  return at;
}

static bool add(count *c, uint32_t rgb) {
  const size_t at = slot_of(c, rgb);
  if (c->slot[at] == NO_COLOUR) {
    if (c->n == MOST_COLOURS)
      return false;
    c->entry[c->n] = (entry){.rgb = rgb, .distance = UINT32_MAX};
    c->slot[at] = (int32_t)c->n++;
  }
  ++c->entry[c->slot[at]].n;
  return true;
}

static uint32_t distance(uint32_t a, uint32_t b) {
  uint32_t sum = 0;
  for (unsigned shift = 0; shift <= 16; shift += 8) {
    const int gap = (int)(a >> shift & 255u) - (int)(b >> shift & 255u);
    sum += (uint32_t)(gap * gap);
  }
  return sum;
}

static size_t commonest(const count *c) {
  size_t best = 0;
  for (size_t i = 1; i < c->n; ++i) {
    const entry *e = &c->entry[i], *b = &c->entry[best];
    if (!e->is_chosen && (b->is_chosen || e->n > b->n))
      best = i;
  }
  return best;
}

static size_t farthest(const count *c) {
  size_t best = 0;
  for (size_t i = 1; i < c->n; ++i) {
    if (c->entry[i].distance > c->entry[best].distance)
      best = i;
  }
  return best;
}

static void choose(count *c, ef__png_palette *palette) {
  const size_t n = c->n < EF__PNG_COLOURS ? c->n : EF__PNG_COLOURS;
  for (size_t k = 0; k < n; ++k) {
    const size_t which = k < EXACT ? commonest(c) : farthest(c);
    const uint32_t rgb = c->entry[which].rgb;
    c->entry[which].is_chosen = true;
    for (unsigned i = 0; i < 3; ++i)
      palette->rgb[k][i] = (unsigned char)(rgb >> (16 - 8 * i) & 255u);
    for (size_t i = 0; i < c->n; ++i) {
      const uint32_t gap = distance(c->entry[i].rgb, rgb);
      if (gap < c->entry[i].distance) {
        c->entry[i].distance = gap;
        c->entry[i].place = (unsigned char)k;
      }
    }
  }
  palette->n = n;
}

bool ef__palette_of(size_t n, const uint32_t *pixel, ef__png_palette *palette,
                    unsigned char *index) {
  count c = {.entry = ef__allocate(MOST_COLOURS, sizeof *c.entry),
             .slot = ef__allocate(SLOTS, sizeof *c.slot)};
  bool has_few = c.entry != NULL && c.slot != NULL;
  for (size_t i = 0; i < SLOTS && has_few; ++i)
    c.slot[i] = NO_COLOUR;
  for (size_t i = 0; i < n && has_few; ++i)
    has_few = add(&c, pixel[i] & RGB);
  if (has_few) {
    choose(&c, palette);
    for (size_t i = 0; i < n; ++i)
      index[i] = c.entry[c.slot[slot_of(&c, pixel[i] & RGB)]].place;
  }
  free(c.entry);
  free(c.slot);
  return has_few;
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The colours of charts. Each look stands at least 4.5 : 1 against its paper
 * (WCAG 2.2, 1.4.3 and 1.4.11), and the looks differ in lightness and hue as
 * far as that leaves room; marks and dashes do the rest. */
#include "picture/drawing.h"

static const ef__ink inks[EF__INKS] = {
    {"paper", 0xffffff, 0x14181f},  {"text", 0x1b222c, 0xe9edf2},
    {"soft", 0x56606d, 0xa9b3bf},   {"faint", 0xc9cfd6, 0x3f4954},
    {"look-1", 0x1c4fa0, 0x8fb8ff}, {"look-2", 0xb4470a, 0xffa766},
    {"look-3", 0x00705f, 0x5ad6bb}, {"look-4", 0x7d2a86, 0xe6a3e8},
    {"look-5", 0x7d5c00, 0xe3c466}, {"look-6", 0x1f77b0, 0x9ad4f7},
    {"look-7", 0x9c1535, 0xff96a6}, {"look-8", 0x4a4f57, 0xc7ccd3},
};

const ef__ink *ef__ink_at(int ink) {
  return &inks[ink];
}

size_t ef__dash_at(int dash, const double **length) {
  static const double lengths[EF__DASHES][EF__DASH_LENGTHS] = {
      {0}, {5, 3}, {1.5, 2.5}, {7, 2.5, 1.5, 2.5}};
  static const size_t n[EF__DASHES] = {0, 2, 2, 4};
  *length = lengths[dash];
  return n[dash];
}

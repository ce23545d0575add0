/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The colours of charts. Each look stands at least 4.5 : 1 against its paper
 * (WCAG 2.2, 1.4.3 and 1.4.11). Within that they were sought to differ: any two
 * by 18 Delta E*00 for trichromats and by 9 as dichromats are taken to see them
 * (tests/test_chart.c); marks and dashes do the rest. */
#include "picture/drawing.h"

static const ef__ink inks[EF__INKS] = {
    {"paper", 0xffffff, 0x14181f},  {"text", 0x1b222c, 0xe9edf2},
    {"soft", 0x56606d, 0xa9b3bf},   {"faint", 0xc9cfd6, 0x3f4954},
    {"look-1", 0x013395, 0x4f86e8}, {"look-2", 0xb45700, 0xd26e22},
    {"look-3", 0x547d64, 0x87f8c5}, {"look-4", 0xa04fc6, 0xd694b6},
    {"look-5", 0x583d03, 0xf6d651}, {"look-6", 0x056b8a, 0xdbe3ff},
    {"look-7", 0x97053e, 0xfe9181}, {"look-8", 0x333b30, 0x938987},
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

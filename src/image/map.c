/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Maps of where a picture is off: pale grey with lines over it. */
#include "image/image_private.h"

#include <math.h>

int ef_map_class(double units) {
  return !(units > 1.0)             ? 0
         : !(units > EF_MAP_SECOND) ? 1
         : !(units > EF_MAP_THIRD)  ? 2
                                    : 3;
}

const char *ef_map_class_text(int map_class) {
  static const char *const texts[EF_MAP_CLASSES] = {
      "no lines", "lines that fall to the right, one pixel in eight",
      "lines that rise to the right, one pixel in four",
      "level lines, every other pixel"};
  return map_class >= 0 && map_class < EF_MAP_CLASSES ? texts[map_class] : "";
}

/* The lines of the classes run in different directions, so that they are told
 * apart by more than how dense they are. */
static bool is_line(int map_class, size_t x, size_t y) {
  switch (map_class) {
  case 1:
    return (x + 7 * y) % 8 == 0; /* x - y */
  case 2:
    return (x + y) % 4 == 0;
  case 3:
    return y % 2 == 0;
  default:
    return false;
  }
}

/* IEC 61966-2-1 of a lightness. */
static uint16_t grey_of(double L_star) {
  const double f = (L_star + 16.0) / 116.0;
  const double Y = L_star > 8.0 ? f * f * f : L_star / 903.2962962962963;
  const double code =
      Y <= 0.0031308 ? 12.92 * Y : 1.055 * pow(Y, 1.0 / 2.4) - 0.055;
  return (uint16_t)lround(65535.0 * fmin(fmax(code, 0.0), 1.0));
}

uint16_t ef_map_sample(int map_class, double L_star, size_t x, size_t y) {
  if (is_line(map_class, x, y))
    return 0;
  const double within = fmin(fmax(L_star, 0.0), 100.0);
  return grey_of(65.0 + 0.33 * within); /* pale: 65 to 98 */
}

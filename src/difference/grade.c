/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Grades that standards define. */
#include <math.h>
#include <stddef.h>

#include <evenfield/difference.h>

const char *ef_simulator_grade(double mean_index) {
  /* Upper limits, which belong to the better grade. From memory; that of B is
   * confirmed by a second text. */
  static const struct {
    double most;
    const char *grade;
  } rows[] = {{0.25, "A"}, {0.5, "B"}, {1, "C"}, {2, "D"}};
  if (!(mean_index >= 0))
    return NULL;
  for (size_t i = 0; i < sizeof rows / sizeof rows[0]; ++i) {
    if (mean_index <= rows[i].most)
      return rows[i].grade;
  }
  return "E";
}

const char *ef_grey_scale_grade(double delta_e_cielab) {
  /* Halfway between the CIELAB differences of the pairs, 0, 0.8, 1.7, 2.5, 3.4,
   * 4.8, 6.8, 9.6 and 13.6 (ISO 105-A02:1993, 2.4); halfway itself counts as
   * the larger change. */
  static const struct {
    double below;
    const char *grade;
  } rows[] = {{0.4, "5"},  {1.25, "4-5"}, {2.1, "4"}, {2.95, "3-4"},
              {4.1, "3"},  {5.8, "2-3"},  {8.2, "2"}, {11.6, "1-2"}};
  if (!(delta_e_cielab >= 0))
    return NULL;
  for (size_t i = 0; i < sizeof rows / sizeof rows[0]; ++i) {
    if (delta_e_cielab < rows[i].below)
      return rows[i].grade;
  }
  return "1";
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "grades.h"

#include <math.h>
#include <string.h>

/* ISO/CIE 23603: a simulator has a grade only so near to the daylight that it
 * stands for, in CIE 1964 u', v'. */
static const double most_distance = 0.015;

simulator_grade grade_simulator(const compare_scene *s,
                                const compare_count *count, size_t k) {
  const ef_uv a = ef_xyz_to_uv(s->looks.at[0].basis.white);
  const ef_uv b = ef_xyz_to_uv(s->looks.at[k].basis.white);
  simulator_grade g = {
      .mean_difference = count->difference[k] / (double)count->n_differences[k],
      .distance = hypot(a.u_prime - b.u_prime, a.v_prime - b.v_prime)};
  if (g.distance <= most_distance)
    g.grade = ef_simulator_grade(g.mean_difference);
  return g;
}

const char *grade_contrast(const look *l, const outcome *o) {
  const char *light = ef_illuminant_name(l->illuminant);
  return light != NULL && strcmp(light, "D65") == 0
             ? ef_grey_scale_grade(o->cielab)
             : NULL;
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Ellipses and ellipsoids that experiments on surface colours gave, and between
 * their centres. Forms are held in CIELAB; between the centres the logarithms
 * of their matrices are averaged with weights 1 / distance^4 in CIELAB, as for
 * MacAdam's in macadam.c. How well one centre follows from the others is
 * printed by tests/published/pub_experiments.c. */
#include "difference/experiment.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"
#include "difference/difference_private.h"

/* D65 and the CIE 1964 observer (ASTM E308). */
static const ef_xyz white = {94.811, 100, 107.304};

/* Colours nearer than this to a centre are the centre: coordinates that went to
 * X, Y, Z and back come within 1e-12. */
static const double at_center = 1e-9;

typedef struct center {
  const char *name;
  double lab[3];
  double logarithm[9]; /* of the form, in L*, a*, b* */
} center;

/* How one experiment's rows become centres and forms. */
typedef struct maker {
  const char *name, *title, *source, *remark;
  bool is_solid;
  const size_t *n_rows;
  void (*make)(size_t i, center *out, double form[9]);
} maker;

struct ef_experiment {
  const maker *from;
  size_t n;
  center at[];
};

/* An ellipse in a*, b*. What no experiment told, lightness, has no part in a
 * section: any entry will do. */
static void set_plane(const ef_ellipse *e, double form[9]) {
  const double any = (e->g11 + e->g22) / 2;
  const double g[9] = {any, 0, 0, 0, e->g11, e->g12, 0, e->g12, e->g22};
  memcpy(form, g, sizeof g);
}

/* At one luminance, as L* has no other variable: d(a*, b*) / d(x, y). */
static void make_luo_rigg(size_t i, center *out, double form[9]) {
  const ef__luo_rigg *const r = &ef__luo_rigg_rows[i];
  const double x = r->xy[0], y = r->xy[1], Y = r->Y;
  const double major = r->semi_major_1e4 * 1e-4;
  const ef_ellipse in_xy =
      ef_ellipse_of_axes(r->xy, major, major / r->axis_ratio, r->angle_deg);
  const double by_xy[6] = {Y / y, -x * Y / (y * y), 0,
                           0,     -Y / y,           (x - 1) * Y / (y * y)};
  const ef_conditions conditions = {.white = white};
  double by_xyz[9], j[4] = {0, 0, 0, 0};
  const ef_xyz xyz = ef_xyy_to_xyz((ef_xyy){x, y, Y});
  out->name = r->name;
  ef__lab_coordinates(NULL, xyz, &conditions, out->lab);
  ef__lab_jacobian(NULL, xyz, &conditions, by_xyz);
  for (int row = 0; row < 2; ++row) {
    for (int k = 0; k < 3; ++k) {
      j[2 * row] += by_xyz[3 * (row + 1) + k] * by_xy[2 * k];
      j[2 * row + 1] += by_xyz[3 * (row + 1) + k] * by_xy[2 * k + 1];
    }
  }
  const ef_ellipse in_ab = ef_ellipse_carry(&in_xy, out->lab + 1, j);
  set_plane(&in_ab, form);
}

static void make_melgosa(size_t i, center *out, double form[9]) {
  const ef__melgosa *const r = &ef__melgosa_rows[i];
  const double *const g = r->g;
  const double whole[9] = {g[0], g[3], g[4], g[3], g[1],
                           g[5], g[4], g[5], g[2]};
  out->name = r->name;
  memcpy(out->lab, r->lab, sizeof out->lab);
  memcpy(form, whole, sizeof whole);
}

static void make_huang(size_t i, center *out, double form[9]) {
  const ef__huang *const r = &ef__huang_rows[i];
  out->name = r->name;
  memcpy(out->lab, r->lab, sizeof out->lab);
  const ef_ellipse in_ab = ef_ellipse_of_axes(
      r->lab + 1, r->semi_major, r->semi_major / r->axis_ratio, r->angle_deg);
  set_plane(&in_ab, form);
}

/* ---- Functions of a form ----------------------------------------------- */

static void apply(double (*function)(double), const double form[9],
                  double out[9]) {
  double value[3], axis[9];
  ef__symmetric_axes(form, value, axis);
  for (int i = 0; i < 9; ++i)
    out[i] = 0;
  for (int k = 0; k < 3; ++k) {
    const double f = function(value[k]);
    for (int i = 0; i < 9; ++i)
      out[i] += f * axis[3 * k + i / 3] * axis[3 * k + i % 3];
  }
}

/* ---- The experiments --------------------------------------------------- */

static const maker makers[] = {
    {.name = "luo-rigg-1986",
     .title = "Luo and Rigg (1986)",
     .source = "Luo & Rigg, Color Res. Appl. 11 (1986) 25-42, table III, 88 of "
               "132 ellipses",
     .remark = "many studies of surface colours brought to one scale, but not "
               "for Y: the authors draw them 1.5 (Y / 30)^0.2 times as large",
     .n_rows = &ef__n_luo_rigg,
     .make = make_luo_rigg},
    {.name = "rit-dupont-1997",
     .title = "RIT-DuPont ellipsoids",
     .source = "Melgosa, Hita, Poza, Alman & Berns, Color Res. Appl. 22 (1997) "
               "148-155, fitted to the vectors of Berns et al., Color Res. "
               "Appl. 16 (1991) 297-316",
     .remark = "half of the observers found a difference of this size larger "
               "than that of an anchor pair of 1.02 CIELAB: well above the "
               "threshold",
     .is_solid = true,
     .n_rows = &ef__n_melgosa,
     .make = make_melgosa},
    {.name = "huang-2012",
     .title = "Huang et al. (2012)",
     .source = "Huang, Liu, Cui, Luo & Melgosa, J. Opt. Soc. Am. A 29 (2012) "
               "883-891, tables 1 and 6",
     .remark = "thresholds of printed samples; their sizes are in doubt (the "
               "areas in print do not fit the axes), proportions and angles "
               "are not",
     .n_rows = &ef__n_huang,
     .make = make_huang},
};
enum { N_EXPERIMENTS = sizeof makers / sizeof *makers };

size_t ef_experiment_count(void) {
  return N_EXPERIMENTS;
}

const char *ef_experiment_name_at(size_t i) {
  return i < N_EXPERIMENTS ? makers[i].name : NULL;
}

static const maker *find(const char *name, ef_error *error) {
  const char *known[N_EXPERIMENTS];
  for (size_t i = 0; i < N_EXPERIMENTS; ++i) {
    known[i] = makers[i].name;
    if (name != NULL && ef__name_equal(name, known[i]))
      return &makers[i];
  }
  ef__error_unknown(error, "experiment", name != NULL ? name : "", known,
                    N_EXPERIMENTS);
  return NULL;
}

ef_experiment *ef_experiment_new(const char *name, ef_error *error) {
  const maker *const from = find(name, error);
  if (from == NULL)
    return NULL;
  const size_t n = *from->n_rows;
  ef_experiment *const e = ef__allocate(1, sizeof *e + n * sizeof *e->at);
  if (e == NULL) {
    ef__error_memory(error, "an experiment");
    return NULL;
  }
  e->from = from;
  e->n = n;
  for (size_t i = 0; i < n; ++i) {
    double form[9];
    from->make(i, &e->at[i], form);
    apply(log, form, e->at[i].logarithm);
  }
  return e;
}

void ef_experiment_free(ef_experiment *experiment) {
  free(experiment);
}

const char *ef_experiment_title(const ef_experiment *experiment) {
  return experiment->from->title;
}

const char *ef_experiment_source(const ef_experiment *experiment) {
  return experiment->from->source;
}

const char *ef_experiment_remark(const ef_experiment *experiment) {
  return experiment->from->remark;
}

bool ef_experiment_is_solid(const ef_experiment *experiment) {
  return experiment->from->is_solid;
}

size_t ef_experiment_center_count(const ef_experiment *experiment) {
  return experiment->n;
}

const char *ef_experiment_center(const ef_experiment *experiment, size_t i,
                                 ef_lab *lab) {
  if (i >= experiment->n)
    return NULL;
  const center *const c = &experiment->at[i];
  if (lab != NULL)
    *lab = (ef_lab){c->lab[0], c->lab[1], c->lab[2]};
  return c->name;
}

/* ---- Between the centres ----------------------------------------------- */

/* The mean of the logarithms at a colour, and the nearest centre. */
static size_t mean_logarithm(const ef_experiment *e, const double lab[3],
                             size_t left_out, double mean[9],
                             double *distance) {
  size_t nearest = 0;
  double weights = 0, least = (double)INFINITY;
  for (int k = 0; k < 9; ++k)
    mean[k] = 0;
  for (size_t i = 0; i < e->n; ++i) {
    const center *const c = &e->at[i];
    double square = 0;
    if (i == left_out)
      continue;
    for (int k = 0; k < 3; ++k)
      square += (lab[k] - c->lab[k]) * (lab[k] - c->lab[k]);
    if (square < least) {
      least = square;
      nearest = i;
    }
    const double weight = 1 / (square * square);
    for (int k = 0; k < 9; ++k)
      mean[k] += weight * c->logarithm[k];
    weights += weight;
  }
  *distance = sqrt(least) < at_center ? 0 : sqrt(least);
  for (int k = 0; k < 9; ++k)
    mean[k] = *distance == 0 ? e->at[nearest].logarithm[k] : mean[k] / weights;
  return nearest;
}

ef_status ef__experiment_without(const ef_experiment *e, ef_xyz xyz,
                                 const ef_conditions *conditions,
                                 const ef_frame *frame, double size,
                                 size_t left_out, ef_ellipsoid *out,
                                 ef_nearest_center *nearest, ef_error *error) {
  double lab[3], by_xyz[9], mean[9], form[9], distance;
  if (!ef__is_ellipse_size(size, error))
    return EF_INVALID;
  ef__lab_coordinates(NULL, xyz, conditions, lab);
  ef__lab_jacobian(NULL, xyz, conditions, by_xyz);
  if (!isfinite(lab[0] + lab[1] + lab[2])) {
    return ef__error_set(error, EF_INVALID, "X %g, Y %g, Z %g is no colour",
                         xyz.X, xyz.Y, xyz.Z);
  }
  const size_t i = mean_logarithm(e, lab, left_out, mean, &distance);
  apply(exp, mean, form);
  if (nearest != NULL)
    *nearest = (ef_nearest_center){e->at[i].name, distance};
  return ef__ellipsoid_carry(e->from->title, form, by_xyz, size, xyz,
                             conditions, frame, out, error);
}

ef_status ef_experiment_ellipsoid(const ef_experiment *experiment, ef_xyz xyz,
                                  const ef_conditions *conditions,
                                  const ef_frame *frame, double size,
                                  ef_ellipsoid *out, ef_nearest_center *nearest,
                                  ef_error *error) {
  return ef__experiment_without(experiment, xyz, conditions, frame, size,
                                experiment->n, out, nearest, error);
}

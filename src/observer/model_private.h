/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * The cone model behind observers and populations. */
#ifndef EVENFIELD_MODEL_PRIVATE_H
#define EVENFIELD_MODEL_PRIVATE_H

#include <evenfield/observer.h>

/* ---- Templates (templates.c) ------------------------------------------- */

/** Range of the published templates, nm; S has no absorbance above 615. */
#define EF__TEMPLATE_FIRST_NM 390.0
#define EF__TEMPLATE_LAST_NM 830.0
#define EF__TEMPLATE_S_LAST_NM 615.0

enum { EF__CURVE_ROOM = 89 };

/** A cubic spline through even samples whose third derivative does not jump at
 * the second and the last but one sample (with zero curvature at the ends
 * instead, 392 nm would be off by 0.2 %). Goes on as a straight line. */
typedef struct ef__curve {
  size_t n; /**< 5 to EF__CURVE_ROOM */
  double start_nm, step_nm;
  double value[EF__CURVE_ROOM];
  double second[EF__CURVE_ROOM]; /**< second derivatives */
} ef__curve;

void ef__curve_fit(ef__curve *curve, size_t n, double start_nm, double step_nm,
                   const double *value);
double ef__curve_at(const ef__curve *curve, double wavelength_nm);

/** The published templates as curves. Absorbances are log10, by quanta. */
typedef struct ef__templates {
  ef__curve lens;      /**< all ocular media at age 32 */
  ef__curve lens_fixed; /**< the part that age leaves alone */
  ef__curve macular;   /**< for 2 degrees */
  ef__curve log10_absorbance[3];
} ef__templates;

ef_status ef__templates_read(ef__templates *templates, ef_error *error);

/** Optical density of the ocular media that grows with age and of those that
 * does not, and of the macular pigment, at one wavelength of the range. */
typedef struct ef__media {
  double lens_aging, lens_fixed, macular;
} ef__media;
ef__media ef__templates_media(const ef__templates *templates,
                              double wavelength_nm);

/* ---- The model on a grid (cones.c) ------------------------------------- */

/** Templates with their media sampled on one grid, for many models. */
typedef struct ef__cones {
  ef__templates templates;
  size_t n;
  double *wavelength_nm; /* n */
  ef__media *media;      /* n; zero outside the range */
} ef__cones;

/** One block; released with free(). */
ef_status ef__cones_new(const ef_grid *grid, ef__cones **cones,
                        ef_error *error);

/** Fundamentals of a checked model, 3 x n. */
void ef__cones_fundamentals(const ef__cones *cones, const ef_cone_model *model,
                            ef_cone_units units, double *out);

/** ln of the factor by which the model's ocular media pass less light at
 * `wavelength_nm` than those of the mean observer of 32 years; the value at the
 * near end outside the range. */
double ef__cones_lens_change(const ef__templates *templates,
                             const ef_cone_model *model, double wavelength_nm);

/* ---- Colour-matching functions (field.c) ------------------------------- */

/** Matrix of a field and what belongs to it. */
typedef struct ef__field {
  double matrix[9]; /**< l, m, s to x_F, y_F, z_F */
  double k_m;       /**< lm/W */
} ef__field;

/** `field_deg` within 1 to 10. */
ef_status ef__field_find(double field_deg, ef__field *field, ef_error *error);

/** Colour-matching functions, 3 x n, of the fundamentals (3 x n, energy units)
 * of a model with this deficiency; `out` may be `fundamental`. `scale` is that
 * of ef__dichromat_scale. */
void ef__field_tristimulus(const ef__field *field, size_t n,
                           ef_deficiency deficiency, double scale,
                           const double *fundamental, double *out);

/** The grid that sums run over: 390 to 830 nm at 1 nm. */
ef_grid ef__template_grid(void);
enum { EF__TEMPLATE_SAMPLES = 441 };

/** The factor that gives the cones of a dichromat that hold another pigment
 * (tritanope: the y_bar that stands for S) the same sum over the equal-energy
 * spectrum as the normal cones of the same person. `cones` is on
 * ef__template_grid. 1 for trichromats. */
double ef__dichromat_scale(const ef__cones *cones, const ef_cone_model *model,
                           const ef__field *field);

/* ---- Names (model_name.c) ---------------------------------------------- */

/** A name of ef_observer_model_names with or without settings -> model.
 * *is_model false, and EF_OK, when `name` does not begin with one of these. */
ef_status ef__model_parse(const char *name, bool *is_model,
                          ef_cone_model *model, ef_error *error);

/** Room for the name of any model, with the terminator. */
enum { EF__MODEL_NAME = 400 };
/** Shortest name that ef__model_parse reads back to the same model. */
void ef__model_name(const ef_cone_model *model, char name[EF__MODEL_NAME]);

#endif

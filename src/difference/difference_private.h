/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What a difference formula is made of. A new formula is one file that fills
 * one of these tables, and one line in formula.c. Outside this folder formulas
 * are used through the functions of evenfield/difference.h and the two at the
 * end. */
#ifndef EVENFIELD_DIFFERENCE_PRIVATE_H
#define EVENFIELD_DIFFERENCE_PRIVATE_H

#include <evenfield/difference.h>

/** The squared difference around a sample, to second order:
 * square + gradient . d + d' hessian d / 2 for a step d. */
typedef struct ef__expansion {
  double square;
  double gradient[3];
  double hessian[9]; /**< row-major, symmetric, may be indefinite */
} ef__expansion;

/** The most places that `decoys` names. */
enum { EF__MAX_DECOYS = 4 };

/** Samples of `rough` come by so many: their coordinates 0, then 1, then 2. */
enum { EF__METRIC_BLOCK = 8 };

/** The most parameters that a formula has. */
#define EF__MAX_PARAMETERS 5

/** A set of parameters that is published under a name: parameters in the order
 * of the formula's own, NaN where the set leaves one alone. */
typedef struct ef__parameter_set {
  const char *name;
  double value[EF__MAX_PARAMETERS];
} ef__parameter_set;

/** The appearance model that a formula's coordinates stand on. */
typedef enum ef__base_model {
  EF__ON_XYZ,
  EF__ON_CAM02,
  EF__ON_CAM16
} ef__base_model;

/** Divisors of the lightness and of the chromatic plane of a difference that is
 * Euclidean but for them. */
typedef struct ef__scale {
  double lightness, chromatic;
} ef__scale;

/** What lightness, chroma and hue of a difference in CIELAB are divided by. */
typedef struct ef__polar_weights {
  double lightness, chroma, hue;
} ef__polar_weights;

/** A formula. Coordinate 0 is lightness, 1 and 2 span the chromatic plane with
 * the neutral axis at 0. Functions marked optional may be NULL; the wrappers
 * below then do without. Every function gets the formula itself, for its
 * parameters. */
struct ef_metric {
  const char *name;
  const char *title;
  const char *family; /**< title without the values of the parameters, which
                           are then all added; NULL when it has none */
  const char *symbol;
  const char *source;
  ef_jnd jnd;
  ef__base_model base;
  bool asymmetric; /**< the reference's weights count, not the sample's */
  /** All above zero; names NULL after the last. */
  ef_parameter parameter[EF__MAX_PARAMETERS];
  const ef__parameter_set *parameter_set; /**< NULL, or ends with name NULL */
  void (*coordinates)(const ef_metric *self, ef_xyz xyz,
                      const ef_conditions *conditions, double coordinate[3]);
  /** Optional: the same for n colours, n x 3 each, when there is something to
   * prepare once. `coordinate` may be `xyz`. */
  void (*coordinates_of_many)(const ef_metric *self, size_t n,
                              const double *xyz,
                              const ef_conditions *conditions,
                              double *coordinate);
  ef_xyz (*inverse)(const ef_metric *self, const double coordinate[3],
                    const ef_conditions *conditions);
  void (*jacobian)(const ef_metric *self, ef_xyz xyz,
                   const ef_conditions *conditions, double jacobian[9]);
  /** Optional, for coordinates whose slope has no limit on the neutral axis:
   * the Jacobian, but nearer to the axis than `size` units that of the chord
   * from the axis to there. Without it: `jacobian`. */
  void (*chord)(const ef_metric *self, ef_xyz xyz,
                const ef_conditions *conditions, double size,
                double jacobian[9]);
  /** Optional, for the functions of tensor.c: without it 1 and 1. */
  ef__scale (*scale)(const ef_metric *self);
  /** For the functions of polar.c: those at the reference. */
  ef__polar_weights (*weights)(const ef_metric *self,
                               const double reference[3]);
  double (*difference)(const ef_metric *self, const double reference[3],
                       const double sample[3]);
  /** Optional: the differences of n pairs, n x 3 each, to rounding those of
   * `difference`; a pair's must not depend on its neighbours or its place. */
  void (*differences)(const ef_metric *self, size_t n, const double *reference,
                      const double *sample, double *difference);
  /** Optional: the squared differences of one reference to n blocks of samples;
   * the difference is known to 0.002 of 1 + itself. */
  void (*rough)(const ef_metric *self, size_t n, const float reference[3],
                const float *sample, float *square);
  double (*components)(const ef_metric *self, const double reference[3],
                       const double sample[3], ef_components *components);
  void (*tensor)(const ef_metric *self, const double coordinate[3],
                 double tensor[9]);
  /** Optional: the squared difference around `sample`, with respect to the
   * sample. Without it: central differences of `difference`. */
  void (*expand)(const ef_metric *self, const double reference[3],
                 const double sample[3], ef__expansion *out);
  /** Optional: carries an expansion in coordinates to one in XYZ at the colour
   * with these coordinates, the bending of the coordinates included. Without
   * it: the Jacobian alone, which leaves the bending out. */
  void (*carry)(const ef_metric *self, const double coordinate[3],
                const ef_conditions *conditions, const ef__expansion *in,
                ef__expansion *out);
  /** Optional: a value that the difference is not below for any sample with
   * coordinates between `low` and `high`, but for rounding. */
  double (*least)(const ef_metric *self, const double reference[3],
                  const double low[3], const double high[3]);
  /** Optional: points other than the reference around which the difference to
   * it has local minima in the chromatic plane, but for those where it is above
   * `limit`; returns how many. */
  size_t (*decoys)(const ef_metric *self, const double reference[3],
                   double limit, double place[EF__MAX_DECOYS][3]);
  /** The difference has a kink where the sample is neutral. */
  bool kinked_axis;
  /** The difference jumps where the sample's hue is opposite. */
  bool jumps_at_opposite_hue;
};

/* ---- The formulas ------------------------------------------------------ */

extern const ef_metric ef__metric_cielab;    /* lab_based.c */
extern const ef_metric ef__metric_cieluv;    /* luv.c */
extern const ef_metric ef__metric_cie94;     /* cie94.c */
extern const ef_metric ef__metric_cmc;       /* cmc.c */
extern const ef_metric ef__metric_ciede2000; /* ciede2000.c */
extern const ef_metric ef__metric_din99o;    /* din99.c */
extern const ef_metric ef__metric_cam02_ucs; /* ucs.c */
extern const ef_metric ef__metric_cam16_ucs; /* ucs.c */
extern const ef_metric ef__metric_itp;       /* itp.c */

/* ---- Conditions with their defaults (conditions.c) --------------------- */

double ef__white_luminance_cd_m2(const ef_conditions *conditions);
double ef__background_Y(const ef_conditions *conditions);
double ef__adapting_luminance_cd_m2(const ef_conditions *conditions);

/* ---- Shared by formulas on CIELAB (lab_based.c) ------------------------ */

void ef__lab_coordinates(const ef_metric *self, ef_xyz xyz,
                         const ef_conditions *conditions, double coordinate[3]);
void ef__lab_coordinates_of_many(const ef_metric *self, size_t n,
                                 const double *xyz,
                                 const ef_conditions *conditions,
                                 double *coordinate);
ef_xyz ef__lab_inverse(const ef_metric *self, const double coordinate[3],
                       const ef_conditions *conditions);
void ef__lab_jacobian(const ef_metric *self, ef_xyz xyz,
                      const ef_conditions *conditions, double jacobian[9]);
void ef__lab_carry(const ef_metric *self, const double coordinate[3],
                   const ef_conditions *conditions, const ef__expansion *in,
                   ef__expansion *out);

/** Delta H of two points of a chromatic plane with chromas of product
 * `chroma_product`: the side of the hue triangle, positive anticlockwise, and
 * without the cancellation of its usual form where the hues are alike. For
 * exactly opposite hues the sign is that of the hue angles in [0, 360). */
double ef__delta_hue(double a1, double b1, double a2, double b2,
                     double chroma_product);

/* ---- Expansion of CIEDE2000 (ciede2000_expand.c) ----------------------- */

/** Terms of the formula that the expansion needs too. Equation numbers are
 * those of Sharma, Wu & Dalal (2005). */
typedef struct ef__ciede2000 {
  double one_plus_g;                /* eq. 4 */
  double chroma1, chroma2;          /* C'1, C'2, eq. 6 */
  double delta_l, delta_c, delta_h; /* eq. 8, 9, 11 */
  double mean_l, mean_c;            /* eq. 12, 13 */
  double mean_h_deg;                /* eq. 14; 0 where it has no effect */
  double cos_h, sin_h;              /* of the mean hue */
  double hue_weight;                /* T, eq. 15 */
  double s_l, s_c, s_h, r_t;        /* eq. 18 to 21 */
  double turn, sin_turn;            /* 2 Delta theta of eq. 16, radians; set
                                       unless r_t is 0 */
} ef__ciede2000;

void ef__ciede2000_terms(const double reference[3], const double sample[3],
                         ef__ciede2000 *out);
/** sqrt(C^7 / (C^7 + 25^7)) of eq. 4 and 17. */
double ef__ciede2000_saturation(double chroma);
/** T of eq. 15 at the hue with this cosine and sine, and unless NULL its first
 * and second derivative by the hue in radians. */
double ef__ciede2000_hue_weight(double cos_h, double sin_h,
                                double derivative[2]);
void ef__ciede2000_expand(const ef_metric *self, const double reference[3],
                          const double sample[3], ef__expansion *out);

/* ---- Bound of CIEDE2000 (ciede2000_least.c) ----------------------------- */

double ef__ciede2000_least(const ef_metric *self, const double reference[3],
                           const double low[3], const double high[3]);

/* ---- Tools for formulas (tensor.c) ------------------------------------- */

/** For formulas that are the Euclidean distance of their coordinates, but for a
 * `scale` where they have one. */
double ef__euclidean_difference(const ef_metric *self,
                                const double reference[3],
                                const double sample[3]);
double ef__euclidean_components(const ef_metric *self,
                                const double reference[3],
                                const double sample[3],
                                ef_components *components);
void ef__euclidean_differences(const ef_metric *self, size_t n,
                               const double *reference, const double *sample,
                               double *difference);
void ef__euclidean_tensor(const ef_metric *self, const double coordinate[3],
                          double tensor[9]);
void ef__euclidean_expand(const ef_metric *self, const double reference[3],
                          const double sample[3], ef__expansion *out);

double ef__euclidean_least(const ef_metric *self, const double reference[3],
                           const double low[3], const double high[3]);

/* ---- Shared by formulas on CIELAB with weights (polar.c) --------------- */

/** For formulas that fill `weights`: each takes those of the reference. */
double ef__polar_difference(const ef_metric *self, const double reference[3],
                            const double sample[3]);
double ef__polar_components(const ef_metric *self, const double reference[3],
                            const double sample[3], ef_components *components);
void ef__polar_tensor(const ef_metric *self, const double coordinate[3],
                      double tensor[9]);
void ef__polar_expand(const ef_metric *self, const double reference[3],
                      const double sample[3], ef__expansion *out);
double ef__polar_least(const ef_metric *self, const double reference[3],
                       const double low[3], const double high[3]);

/** Local tensor from second differences of the formula: for formulas without a
 * closed form, and to check those that have one. Relative error about 1e-6
 * away from kinks of the formula. */
void ef__numeric_tensor(const ef_metric *metric, const double coordinate[3],
                        double tensor[9]);

/* ---- Forms (ellipsoid.c) ----------------------------------------------- */

/** Eigenvalues of a symmetric 3 x 3 matrix, the smallest first, and as row i of
 * `axis` the unit vector of value i. */
void ef__symmetric_axes(const double form[9], double value[3], double axis[9]);
/** False with its error unless above zero. */
bool ef__is_ellipse_size(double size, ef_error *error);
/** A form in coordinates whose derivatives by X, Y, Z are `jacobian`, taken to
 * a frame. EF_NO_ANSWER, in the name of `name`, where there is no ellipse. */
ef_status ef__ellipsoid_carry(const char *name, const double form[9],
                              const double jacobian[9], double size, ef_xyz xyz,
                              const ef_conditions *conditions,
                              const ef_frame *frame, ef_ellipsoid *out,
                              ef_error *error);

/* ---- Experiments (macadam.c, experiment.c) ----------------------------- */

/** ef_macadam_ellipse as if one of the centres were not there; none for their
 * number. */
ef_status ef__macadam_without(ef_xy at, double size, size_t left_out,
                              ef_ellipse *out, ef_error *error);
/** The same of ef_experiment_ellipsoid. */
ef_status ef__experiment_without(const ef_experiment *e, ef_xyz xyz,
                                 const ef_conditions *conditions,
                                 const ef_frame *frame, double size,
                                 size_t left_out, ef_ellipsoid *out,
                                 ef_nearest_center *nearest, ef_error *error);

/* ---- Tasks (task.c) ----------------------------------------------------- */

/** Share of wrong answers in the triangle test over its chance share 2/3. */
double ef__triangle_miss(double d_prime);

/* ---- By name (formula.c) ----------------------------------------------- */

/** The registered formula whose name is `name[0 .. length)`. */
const ef_metric *ef__metric_find(const char *name, size_t length,
                                 ef_error *error);

/* ---- For solvers (formula.c) ------------------------------------------- */

/** Squared difference around `sample` in the metric's coordinates. */
void ef__metric_expand(const ef_metric *metric, const double reference[3],
                       const double sample[3], ef__expansion *out);
/** The same carried to XYZ, `xyz` being the colour of `sample`. */
void ef__metric_carry(const ef_metric *metric, ef_xyz xyz,
                      const double sample[3], const ef_conditions *conditions,
                      const ef__expansion *in, ef__expansion *out);

#endif

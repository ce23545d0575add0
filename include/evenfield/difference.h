/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Colour differences. A metric is coordinates, a difference between two
 * points in them, and a local tensor; new ones are registered in one place
 * and serve every command. */
#ifndef EVENFIELD_DIFFERENCE_H
#define EVENFIELD_DIFFERENCE_H

#include <evenfield/base.h>
#include <evenfield/colour.h>

#ifdef __cplusplus
extern "C" {
#endif

/** A difference formula, immutable: one of the registered ones, static and
 * never freed, or one with parameters of its own from ef_metric_new. */
typedef struct ef_metric ef_metric;

/** A parametric factor or constant of a formula. */
typedef struct ef_parameter {
  const char *name; /**< "kl"; static */
  double value;
  const char *about; /**< what it does; static */
} ef_parameter;

/** What the eye is adapted to while it compares. Members that are zero stand
 * for the value named, so that the white alone is enough; the members after it
 * matter to cam02-ucs, cam16-ucs and itp only. */
typedef struct ef_conditions {
  ef_xyz white; /**< reference white, on the scale of the colours compared */
  /** Of the white. 0: 1000 / pi, the perfect diffuser under 1000 lx, the
   * illuminance of the reference conditions of CIE 101-1993. */
  double white_luminance_cd_m2;
  /** Luminance factor Y_b of the background, the white's being 100. 0: 20. */
  double background_Y;
  /** L_A of the adapting field. 0: that of the background. */
  double adapting_luminance_cd_m2;
  ef_surround surround; /**< zero is an average surround */
  bool discount_illuminant; /**< complete adaptation to the white */
} ef_conditions;

/** The white and the defaults. */
EF_API ef_conditions ef_conditions_default(ef_xyz white);

/** Lightness, chroma and hue part of a difference, signed (sample minus
 * reference; hue positive anticlockwise), weighted as the formula weights
 * them: their squares sum to the squared difference for formulas without an
 * interaction term. */
typedef struct ef_components {
  double lightness, chroma, hue;
} ef_components;

/** A just-noticeable difference with its provenance. */
typedef struct ef_jnd {
  double value;          /**< in units of the metric; NaN when none published */
  const char *criterion; /**< e.g. "50 % of observers see it"; "" with NaN */
  const char *source;    /**< published source; "" with NaN */
} ef_jnd;

/** The registered formulas. */
EF_API size_t ef_metric_count(void);
EF_API const ef_metric *ef_metric_at(size_t i);
/** "cielab", "cieluv", "cie94" (graphic arts), "cmc" (2:1), "ciede2000",
 * "din99o", "cam02-ucs", "cam16-ucs", "itp"; EF_UNKNOWN_NAME gives the nearest
 * names. */
EF_API const ef_metric *ef_metric_find(const char *name, ef_error *error);
/** A registered formula with parameters: its name, and after a colon what is
 * to differ from the defaults, separated by commas, the later one counting:
 * `ciede2000:kl=2,kc=1.5`, a published set by its name, or, as the trade
 * writes them, the first parameters in order: `ciede2000:2:1:1`. A bare name
 * is fine. Parameters are finite and above zero. A default JND holds for the
 * default parameters only and is NaN with others. Free with ef_metric_free
 * after the last use.
 *
 *     cie94       kl, kc, kh, k1, k2; sets graphic-arts (default), textiles
 *     cmc         l, c; sets acceptability (2:1, default), perceptibility (1:1)
 *     ciede2000   kl, kc, kh
 *     din99o      ke, kch
 *     cam02-ucs, cam16-ucs   kl, c1, c2; sets ucs (default), lcd, scd (for
 *                 large and small differences, published for CIECAM02) */
EF_API ef_metric *ef_metric_new(const char *text, ef_error *error);
EF_API void ef_metric_free(ef_metric *metric);
/** With the parameters that are not the default: "ciede2000:kl=2"; reads back
 * with ef_metric_new. Like the titles it lives as long as the metric. */
EF_API const char *ef_metric_name(const ef_metric *metric);
/** "CIEDE2000", with its symbol "Delta E*00" and its source. */
EF_API const char *ef_metric_title(const ef_metric *metric);
EF_API const char *ef_metric_symbol(const ef_metric *metric);
EF_API const char *ef_metric_source(const ef_metric *metric);
/** Published default; depends on viewing conditions and observers, and outputs
 * say so. */
EF_API ef_jnd ef_metric_jnd(const ef_metric *metric);
/** How many parameters it has, and the i-th (all NULL and NaN beyond). */
EF_API size_t ef_metric_parameter_count(const ef_metric *metric);
EF_API ef_parameter ef_metric_parameter_at(const ef_metric *metric, size_t i);
/** True when reference and sample may change places. Otherwise the reference
 * is the standard and its weights count. */
EF_API bool ef_metric_symmetric(const ef_metric *metric);

/** XYZ to the metric's own coordinates and back: CIELAB for cielab, cie94, cmc
 * and ciede2000, CIELUV, L99o a99o b99o, J' a' b', 720 I, 720 T, 720 P for the
 * others. `conditions->white` must be positive; itp does not adapt to it, so
 * that its neutral axis is that of D65. NaN where an appearance model is not
 * defined (colours far outside the real ones). */
EF_API void ef_metric_coordinates(const ef_metric *metric, ef_xyz xyz,
                                  const ef_conditions *conditions,
                                  double coordinate[3]);
/** n colours, n x 3 each, over up to `jobs` threads (0: all cores); the same
 * digits as single calls, and faster for the appearance models. `coordinate`
 * may be `xyz`. */
EF_API void ef_metric_coordinates_batch(const ef_metric *metric, size_t n,
                                        const double *xyz,
                                        const ef_conditions *conditions,
                                        int jobs, double *coordinate);
EF_API ef_xyz ef_metric_xyz(const ef_metric *metric,
                            const double coordinate[3],
                            const ef_conditions *conditions);
/** d coordinate / d XYZ at `xyz`, row-major. Where there is none: for cieluv at
 * black that along the grey scale; for cam02-ucs and cam16-ucs on the neutral
 * axis see ef_ucs_jacobian; for itp at zero responses that of 1e-8 cd/m2. */
EF_API void ef_metric_jacobian(const ef_metric *metric, ef_xyz xyz,
                               const ef_conditions *conditions,
                               double jacobian[9]);

/** Difference of two points in the metric's coordinates, >= 0. */
EF_API double ef_metric_difference(const ef_metric *metric,
                                   const double reference[3],
                                   const double sample[3]);
/** The same with its parts. */
EF_API double ef_metric_components(const ef_metric *metric,
                                   const double reference[3],
                                   const double sample[3],
                                   ef_components *components);
/** n pairs, n x 3 each, over up to `jobs` threads (0: all cores); results do
 * not depend on `jobs` or `n`. */
EF_API void ef_metric_difference_batch(const ef_metric *metric, size_t n,
                                       const double *reference,
                                       const double *sample, int jobs,
                                       double *difference);
/** Local metric tensor at `coordinate`, row-major symmetric positive definite:
 * a small step d has the difference sqrt(d' G d). */
EF_API void ef_metric_tensor(const ef_metric *metric,
                             const double coordinate[3], double tensor[9]);

/* ---- Discrimination ellipses ------------------------------------------- */

/** A plane to draw an ellipse in, and the third coordinate that goes with it.
 * Contrasts are (response - background) / background. */
typedef enum ef_space {
  EF_SPACE_XY,      /**< x, y; third Y */
  EF_SPACE_UV,      /**< u', v'; third Y */
  EF_SPACE_LAB,     /**< a*, b*; third L* */
  EF_SPACE_MB,      /**< l_MB, s_MB; third the luminance V of the cones */
  EF_SPACE_CONE,    /**< contrasts of the L and S cones; third luminance
                         contrast */
  EF_SPACE_CONE_LM  /**< contrasts of the L and M cones; third that of S */
} ef_space;

/** "xy", "uv", "lab", "mb", "cone", "cone-lm". Static. */
EF_API const char *ef_space_name(ef_space space);
EF_API ef_status ef_space_find(const char *name, ef_space *out,
                               ef_error *error);
/** Name of coordinate 0, 1 or 2: "x", "u_prime", "mb_l", "contrast_l"... */
EF_API const char *ef_space_axis(ef_space space, int i);

/** A space with what it takes to get there. */
typedef struct ef_frame {
  ef_space space;
  /** The last three only: X, Y, Z to cones (ef_observer_cone_matrix), and the
   * factors of luminance and of the MacLeod-Boynton chromaticity. */
  double lms_from_xyz[9];
  ef_mb_scale mb_scale;
  ef_xyz background; /**< of contrasts; all zero: the white of the conditions */
} ef_frame;

/** Fills it. `observer` is needed for the spaces of cones only (else may be
 * NULL); for observers with borrowed cones the matrix is a fit, and outputs
 * say so. */
EF_API ef_status ef_frame_set(ef_space space, const ef_observer *observer,
                              ef_frame *out, ef_error *error);
/** Coordinates of a colour, the third one last, and their derivatives by X, Y,
 * Z (row-major; may be NULL). EF_NO_ANSWER for colours without chromaticity
 * and backgrounds without cone excitation. */
EF_API ef_status ef_frame_coordinates(const ef_frame *frame, ef_xyz xyz,
                                      const ef_conditions *conditions,
                                      double coordinate[3],
                                      double jacobian[9], ef_error *error);

/** g11 dx^2 + 2 g12 dx dy + g22 dy^2 = 1 about a centre. */
typedef struct ef_ellipse {
  double center[2];
  double semi_major, semi_minor;
  double angle_deg; /**< of the major axis from the first coordinate's,
                         anticlockwise, in [0, 180); 0 for a circle */
  double g11, g12, g22;
} ef_ellipse;

/** What a plane figure of a solid is. */
typedef enum ef_ellipse_kind {
  /** The colours of the same third coordinate (same luminance, or S contrast)
   * that differ by the size from the centre. */
  EF_ELLIPSE_SECTION,
  /** The shadow of the whole ellipsoid: all colours it holds, of whatever
   * third coordinate. It contains the section. */
  EF_ELLIPSE_PROJECTION
} ef_ellipse_kind;

/** The colours that differ by `size` from a centre, to second order:
 * d' tensor d = 1 for a step d in the frame's coordinates. */
typedef struct ef_ellipsoid {
  double center[3];
  double tensor[9];    /**< row-major */
  double semi_axis[3]; /**< the longest first */
  double direction[9]; /**< row i: unit vector of axis i */
} ef_ellipsoid;

/** Of a colour under the conditions, which is also the standard of formulas
 * that have one. `size` is a difference in units of the metric: n JND times the
 * JND, or 1. Nearer to the neutral axis than `size`, cam02-ucs and cam16-ucs
 * are taken along the chord (see ef_ucs_jacobian). EF_NO_ANSWER where the
 * metric or the space has no slope (black, colours outside a model). */
EF_API ef_status ef_metric_ellipsoid(const ef_metric *metric, ef_xyz xyz,
                                     const ef_conditions *conditions,
                                     const ef_frame *frame, double size,
                                     ef_ellipsoid *out, ef_error *error);
EF_API ef_status ef_metric_ellipse(const ef_metric *metric, ef_xyz xyz,
                                   const ef_conditions *conditions,
                                   const ef_frame *frame, ef_ellipse_kind kind,
                                   double size, ef_ellipse *out,
                                   ef_error *error);
/** A plane figure of an ellipsoid. */
EF_API ef_ellipse ef_ellipsoid_figure(const ef_ellipsoid *ellipsoid,
                                      ef_ellipse_kind kind);

/** From the form, which must be positive definite (else NaN axes), or from the
 * axes. */
EF_API ef_ellipse ef_ellipse_of_form(const double center[2], double g11,
                                     double g12, double g22);
EF_API ef_ellipse ef_ellipse_of_axes(const double center[2], double semi_major,
                                     double semi_minor, double angle_deg);
/** The same in other coordinates: `jacobian` is d new / d old, row-major 2 x 2.
 */
EF_API ef_ellipse ef_ellipse_carry(const ef_ellipse *ellipse,
                                   const double center[2],
                                   const double jacobian[4]);
/** The boundary, `turn_deg` 0 on the major axis, 90 on the minor one. */
EF_API void ef_ellipse_point(const ef_ellipse *ellipse, double turn_deg,
                             double point[2]);
/** How many ellipses lie between the centre and a point: 1 on the boundary. */
EF_API double ef_ellipse_steps(const ef_ellipse *ellipse,
                               const double point[2]);

/* ---- Ellipses from experiments, and steps of the lighting trade -------- */

/** MacAdam (1942): the 25 observed ellipses in CIE 1931 x, y, one standard
 * deviation of colour matching of one observer, 2 degrees, about 48 cd/m2. */
EF_API size_t ef_macadam_count(void);
/** NaN beyond the last. */
EF_API ef_ellipse ef_macadam_at(size_t i);
/** The same at any chromaticity, at `size` standard deviations (MacAdam takes
 * about three for a just noticeable difference; from memory). Between the
 * centres the logarithms of the matrices in u', v' are averaged with the weights
 * 1 / distance^4 and carried back: MacAdam's own at the centres, smooth, an
 * ellipse everywhere. `between` (may be NULL): inside the polygon around the
 * centres; outside, the ellipse leans on the nearest ones alone. */
EF_API ef_status ef_macadam_ellipse(ef_xy at, double size, ef_ellipse *out,
                                    bool *between, ef_error *error);

/** n-step circle in u', v' about a centre: radius 0.0011 n (CIE TN 001:2014).
 */
EF_API ef_ellipse ef_step_circle(ef_uv center, double n_steps);
/** How many such steps lie between two chromaticities. */
EF_API double ef_step_count(ef_uv center, ef_uv at);

/** A standard colour of lamps (IEC 60081, ANSI C78.376): g11 dx^2 + 2 g12 dx dy
 * + g22 dy^2 = n^2 on the n-step ellipse in CIE 1931 x, y. The coefficients
 * are from memory, not from a printed copy, and outputs say so. */
typedef struct ef_lamp_colour {
  const char *name; /**< "F4000"; static */
  ef_xy center;
  double g11, g12, g22;
} ef_lamp_colour;
EF_API size_t ef_lamp_count(void);
EF_API const ef_lamp_colour *ef_lamp_at(size_t i);
EF_API const ef_lamp_colour *ef_lamp_find(const char *name, ef_error *error);
EF_API ef_ellipse ef_lamp_ellipse(const ef_lamp_colour *lamp, double n_steps);

/* The formulas as plain functions. */

/** CIE 1976 (ISO/CIE 11664-4). */
EF_API double ef_delta_e_cielab(ef_lab reference, ef_lab sample);
/** CIEDE2000 (ISO/CIE 11664-6), parametric factors k_L, k_C, k_H. */
EF_API double ef_delta_e_ciede2000(ef_lab reference, ef_lab sample, double k_l,
                                   double k_c, double k_h);

#ifdef __cplusplus
}
#endif

#endif

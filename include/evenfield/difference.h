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
/** n colours, n x 3 each, over up to `jobs` threads (0: all cores): a colour's
 * result does not depend on `jobs`, `n` or its place, bit for bit, and is that of
 * ef_metric_coordinates to 1e-10. `coordinate` may be `xyz`. */
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
/** n pairs, n x 3 each, over up to `jobs` threads (0: all cores), by the batch
 * kernels: a pair's result does not depend on `jobs`, `n` or its place, bit for
 * bit, and is that of ef_metric_difference to 1e-10. */
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

/* ---- Ellipses of surface colours from experiments ---------------------- */

/** Published ellipses or ellipsoids about colours of surfaces, for D65 and the
 * CIE 1964 observer: "luo-rigg-1986" (88 ellipses), "rit-dupont-1997" (19
 * ellipsoids) and "huang-2012" (17 ellipses). Owns memory. */
typedef struct ef_experiment ef_experiment;

EF_API size_t ef_experiment_count(void);
/** NULL beyond the last. */
EF_API const char *ef_experiment_name_at(size_t i);
/** NULL and EF_UNKNOWN_NAME with the nearest names. Free with
 * ef_experiment_free. */
EF_API ef_experiment *ef_experiment_new(const char *name, ef_error *error);
EF_API void ef_experiment_free(ef_experiment *experiment);
/** "Luo and Rigg (1986)"; where it was published; what its size means. Static.
 */
EF_API const char *ef_experiment_title(const ef_experiment *experiment);
EF_API const char *ef_experiment_source(const ef_experiment *experiment);
EF_API const char *ef_experiment_remark(const ef_experiment *experiment);
/** Ellipsoids: lightness took part. Of the others sections at constant
 * luminance alone have a meaning, and what ef_experiment_ellipsoid says of the
 * third direction has none. */
EF_API bool ef_experiment_is_solid(const ef_experiment *experiment);
EF_API size_t ef_experiment_center_count(const ef_experiment *experiment);
/** Name of a centre (static), and where it lies (`lab` may be NULL); NULL
 * beyond the last. */
EF_API const char *ef_experiment_center(const ef_experiment *experiment,
                                        size_t i, ef_lab *lab);

/** The centre that a colour is next to. */
typedef struct ef_nearest_center {
  const char *name;  /**< static */
  double difference; /**< CIELAB */
} ef_nearest_center;

/** At any colour, `size` times as large as published; `conditions` has the
 * white of D65 for CIE 1964. Between the centres the logarithms of the matrices
 * in CIELAB are averaged with the weights 1 / difference^4: the published ones
 * at the centres, smooth, an ellipsoid everywhere. `nearest` may be NULL; far
 * from all centres the result is little more than a guess. */
EF_API ef_status ef_experiment_ellipsoid(const ef_experiment *experiment,
                                         ef_xyz xyz,
                                         const ef_conditions *conditions,
                                         const ef_frame *frame, double size,
                                         ef_ellipsoid *out,
                                         ef_nearest_center *nearest,
                                         ef_error *error);

/* ---- Metamerism (CIE 015:2018) ----------------------------------------- */

/** An observer and how surfaces are seen. */
typedef struct ef_look {
  const ef_observer *observer; /**< borrowed */
  ef_viewing viewing;          /**< of surfaces */
} ef_look;

/** How the mismatch that a pair has under the reference look is taken out
 * before it is seen under another. */
typedef enum ef_correction {
  /** X, Y, Z of the sample times those of the standard over those of the
   * sample under the reference (CIE 015). */
  EF_CORRECT_MULTIPLICATIVE,
  /** Coordinates of the sample in the formula, plus standard minus sample under
   * the reference: in CIELAB what is told is the change of the difference. */
  EF_CORRECT_ADDITIVE,
  /** The spectrum of the sample, see ef_spectral_correct (Fairman 1987). */
  EF_CORRECT_SPECTRAL,
  EF_CORRECT_NONE
} ef_correction;

/** "multiplicative", "additive", "spectral", "none". Static. */
EF_API const char *ef_correction_name(ef_correction correction);
EF_API ef_status ef_correction_find(const char *name, ef_correction *out,
                                    ef_error *error);

/** A pair as one look shows it. */
typedef struct ef_seen {
  ef_xyz standard, sample;
  ef_conditions conditions;
} ef_seen;

/** Special index of metamerism of one pair: change of illuminant where the two
 * looks differ in the light, change of observer where in the observer. */
typedef struct ef_metamerism {
  double reference_difference; /**< under the reference, as it is */
  double test_difference;      /**< under the test, as it is */
  double index;                /**< under the test, corrected */
  ef_components components;    /**< of the index: sample minus standard */
} ef_metamerism;

/** From tristimulus values. EF_CORRECT_SPECTRAL, which needs spectra, has a NaN
 * index, and so has the multiplicative correction of a sample that has a zero
 * X, Y or Z under the reference where the standard has not the same. */
EF_API ef_metamerism ef_metamerism_of_seen(const ef_metric *metric,
                                           const ef_seen *reference,
                                           const ef_seen *test,
                                           ef_correction correction);

typedef struct ef_metamerism_settings {
  const ef_metric *metric;
  ef_correction correction;
  ef_conditions conditions; /**< but for the white: each look has its own */
} ef_metamerism_settings;

/** CIELAB, multiplicative correction, default conditions: CIE 015. */
EF_API ef_metamerism_settings ef_metamerism_settings_default(void);

/** n pairs of surfaces sampled on `grid` (n x grid->count each), matched under
 * `reference`, seen under each of `test[0 .. n_tests)`; `out` is n x n_tests.
 * The CIE recommends D65 as the reference light and one of A and the
 * fluorescent lamps as test, and CIE 1931 or 1964 as the reference observer.
 * Works in some MB beside its arguments; results do not depend on `jobs` (0:
 * all cores) or `n`. EF_INVALID for values that are not finite and for looks at
 * lights. */
EF_API ef_status ef_metamerism_batch(
    const ef_grid *grid, size_t n, const double *standard,
    const double *sample, const ef_look *reference, size_t n_tests,
    const ef_look *test, const ef_metamerism_settings *settings, int jobs,
    ef_metamerism *out, const ef_notes *notes, ef_error *error);

/** Samples whose spectra are changed as little as it takes (least squares) to
 * have the channel values of their standards: sample + A (A'A)^-1 A' (standard
 * - sample), the columns of A being the rows of `reference`. It is the
 * fundamental of the standard with the metameric black of the sample (Cohen &
 * Kappauf 1982; as a correction Fairman, Color Res. Appl. 12 (1987) 261-265;
 * both from memory).
 * n spectra of the weights' samples each; `corrected` may be `sample`. Values
 * may leave the range of reflectances by a little. EF_NO_ANSWER for channels
 * that depend on each other. */
EF_API ef_status ef_spectral_correct(const ef_weights *reference, size_t n,
                                     const double *standard,
                                     const double *sample, double *corrected,
                                     ef_error *error);

/** How far two spectra are apart whatever the light: general indices. All are
 * zero for identical spectra. */
typedef struct ef_spectral_index {
  double rms;       /**< root mean square of sample - standard */
  double black_rms; /**< the same of the part that the reference does not see,
                         the metameric black: equal to rms for a pair that
                         matches there */
  /** Square root of the sum over samples and channels of the squared weighted
   * differences, in units of the channels; grows with the root of the sampling
   * step. Nimeroff & Yurow, J. Opt. Soc. Am. 55 (1965) 185-190 (from memory).
   */
  double weighted;
} ef_spectral_index;

/** Of n pairs sampled as `reference` was folded for. EF_NO_ANSWER as for
 * ef_spectral_correct. */
EF_API ef_status ef_spectral_index_batch(const ef_weights *reference, size_t n,
                                         const double *standard,
                                         const double *sample,
                                         ef_spectral_index *out,
                                         ef_error *error);

/** Colour inconstancy: one surface under a reference and a test light. The
 * colour under the test light is carried to the reference's white by complete
 * adaptation and told as a difference from the colour there: zero when the
 * surface keeps its colour as far as the eye adapts. Luo, Li, Hunt, Rigg &
 * Smith, Color Res. Appl. 28 (2003) 379-392 (from memory), who take CMCCAT2000
 * and CMC for it. `components` (may be NULL): test minus reference. EF_INVALID
 * as in ef_adaptation_matrix. */
EF_API ef_status ef_inconstancy(const ef_metric *metric,
                                ef_adaptation adaptation, ef_xyz reference,
                                const ef_conditions *reference_conditions,
                                ef_xyz test, ef_xyz test_white, double *index,
                                ef_components *components, ef_error *error);

/* ---- Grades of standards ----------------------------------------------- */

/** Grade of a daylight simulator, "A" to "E", by its mean index over the
 * virtual metamers of ISO/CIE 23603 (CIE S 012), in CIELAB and for CIE 1964:
 * up to 0.25, 0.5, 1, 2 and above. For no other index; the pairs themselves are
 * not part of this library. Limits from memory, that of B confirmed. NULL for
 * an index that is not >= 0. */
EF_API const char *ef_simulator_grade(double mean_index);

/** Step of the grey scale for change in colour, "5" (none), "4-5" ... "1",
 * whose pair is nearest in contrast to a CIELAB difference. Differences of the
 * steps: ISO 105-A02:1993. NULL for a difference that is not >= 0. */
EF_API const char *ef_grey_scale_grade(double delta_e_cielab);

/* ---- Finishes ---------------------------------------------------------- */

/** Constants of whiteness, tint and yellowness for an observer and a light. */
typedef struct ef_white_scale {
  const char *observer;   /**< "cie-1931" or "cie-1964" */
  const char *illuminant; /**< "C", "D50" or "D65" */
  ef_xy white;
  /** Whiteness is Y + per_x (x_n - x) + per_y (y_n - y). */
  double per_x, per_y;
  /** Tint is tint_x (x_n - x) - tint_y (y_n - y). */
  double tint_x, tint_y;
  /** Yellowness is 100 (yellow_x X - yellow_z Z) / Y; NaN with D50. */
  double yellow_x, yellow_z;
  bool is_cie; /**< CIE 015 defines whiteness and tint for D65 alone; with the
                    other lights they are those of ASTM E313 */
} ef_white_scale;

/** EF_NO_ANSWER when none is defined for the two. Static. */
EF_API const ef_white_scale *ef_white_scale_find(const char *observer,
                                                 const char *illuminant,
                                                 ef_error *error);

typedef struct ef_whiteness {
  double whiteness; /**< CIE 015:2018, ASTM E313; 100 for the perfect reflecting
                         diffuser; NaN for black */
  double tint;      /**< above 0 greener, below 0 redder than the reference */
  double yellowness; /**< ASTM E313; NaN where it is not defined */
  /** CIE 015 calls a sample white when its whiteness is above 40 and below
   * 5 Y - 280 and its tint above -4 and below 2 (limits from memory): else the
   * two say nothing. */
  bool is_white;
} ef_whiteness;

/** `xyz` has Y = 100 for the perfect reflecting diffuser and belongs to the
 * observer and the light of `scale`. For samples measured on one instrument at
 * about the same time; fluorescent ones need its ultraviolet share to be that
 * of the light. Coefficients of whiteness and tint from memory. */
EF_API ef_whiteness ef_whiteness_of(ef_xyz xyz, const ef_white_scale *scale);

/** One finish seen at several angles. */
typedef struct ef_angles {
  double worst;       /**< largest difference */
  size_t worst_angle; /**< its index, the first of equal ones */
  double mean;        /**< weighted mean */
  double total;       /**< root of the weighted mean of the squares: the one
                           difference that at all angles would sum to the same.
                           Common practice, no source */
} ef_angles;

/** From the differences at `n` angles with a weight each, not negative and not
 * all 0 (NULL: equal ones). A difference of NaN makes all of it NaN. EF_INVALID
 * names the weight at fault. */
EF_API ef_status ef_angles_combine(size_t n, const double *difference,
                                   const double *weight, ef_angles *out,
                                   ef_error *error);

/** Mean of n readings of `count` values each (n x count), and the standard
 * deviation of one reading (`sd` may be NULL; NaN for one reading). EF_INVALID
 * names the value that is not finite. */
EF_API ef_status ef_readings_mean(size_t n, size_t count, const double *value,
                                  double *mean, double *sd, ef_error *error);

/** What measurement leaves open of a colour: covariance of X, Y, Z, row-major,
 * of one reading. Divide by the number of readings for their mean. */
typedef struct ef_scatter {
  double covariance[9];
} ef_scatter;

/** From n >= 2 readings of one sample, n x 3 tristimulus values: spectral noise
 * with all its correlations, as colour is linear in the spectrum. EF_NO_ANSWER
 * for one reading. */
EF_API ef_status ef_scatter_of_readings(size_t n, const double *xyz,
                                        ef_scatter *out, ef_error *error);
/** From the standard deviation of each sample of the spectrum, independent of
 * each other: V = W diag(sd^2) W'. EF_INVALID for weights that have other than
 * three channels or an sd that is not >= 0. */
EF_API ef_status ef_scatter_of_noise(const ef_weights *weights,
                                     const double *sd, ef_scatter *out,
                                     ef_error *error);

/** A difference between two measured colours with its uncertainty. */
typedef struct ef_uncertain {
  double difference;
  /** Standard uncertainty to first order, sqrt(g' V g) with the slope g of the
   * difference. For equal colours, whose difference has no slope, noise_alone
   * over the root of 3. It holds where it is well below the difference. */
  double sd;
  /** Root mean square difference that the scatter alone makes between two
   * samples of one colour: sqrt(trace(G V)), G being the metric's tensor. A
   * measured difference of this size need not be one. */
  double noise_alone;
} ef_uncertain;

/** Scatters of what was compared (the mean of n readings has a scatter n times
 * less); NULL for none. */
EF_API ef_uncertain ef_metric_uncertainty(const ef_metric *metric,
                                          ef_xyz reference, ef_xyz sample,
                                          const ef_conditions *conditions,
                                          const ef_scatter *reference_scatter,
                                          const ef_scatter *sample_scatter);

/* ---- Tasks ------------------------------------------------------------- */

/** What the observer is asked. */
typedef enum ef_task {
  EF_TASK_YES_NO,         /**< "do you see it?"; positive: yes */
  EF_TASK_2IFC,           /**< which of two holds it; positive: right */
  EF_TASK_SAME_DIFFERENT, /**< "same or different?"; positive: different */
  EF_TASK_TRIANGLE,       /**< which of three is the odd one; positive: right */
  EF_TASK_GREATER_LESS    /**< sample against standard; positive: greater */
} ef_task;

EF_API size_t ef_task_count(void);
/** "yes-no", "2ifc", "same-different", "triangle", "greater-less". Static. */
EF_API const char *ef_task_name(ef_task task);
/** By that name; EF_UNKNOWN_NAME gives the nearest names. */
EF_API ef_status ef_task_find(const char *name, ef_task *task, ef_error *error);
/** What a positive answer is: "yes", "right", "different" ... Static. */
EF_API const char *ef_task_positive(ef_task task);
/** Share of positive answers by guessing: 1/2, 1/3; 0 for greater-less, whose
 * curve begins at 0; NaN for yes-no and same-different, where it is the
 * observer's false-alarm rate. */
EF_API double ef_task_chance(ef_task task);

/** Share of positive answers at sensitivity d' >= 0 (Macmillan & Creelman,
 * Detection Theory, 2nd ed. 2005). `false_alarms` is the share of positive
 * answers where there is no signal, in (0, 1), used by two tasks:
 *   yes-no          Phi(d' + z(F))
 *   2ifc            Phi(d' / sqrt 2)
 *   same-different  Phi((d' - k) / sqrt 2) + Phi((-d' - k) / sqrt 2) with
 *                   k = -sqrt 2 z(F / 2): the differencing model
 *   triangle        1 - 4 T(d' / sqrt 6, sqrt 3), T of Owen 1956; equal to the
 *                   integral of Ennis 1993
 *   greater-less    Phi(d' / sqrt 2), at one d' above the point of equality
 * NaN outside these domains. */
EF_API double ef_task_proportion(ef_task task, double false_alarms,
                                 double d_prime);
/** The inverse. 0 at chance; NaN below chance (greater-less: negative there),
 * and for a proportion of 1, which no finite d' gives. */
EF_API double ef_task_d_prime(ef_task task, double false_alarms,
                              double proportion);
/** Share of right answers of an observer without bias, half the trials of
 * yes-no and same-different without signal: Phi(d'/2); in same-different the
 * largest share that any criterion k gives. Else as ef_task_proportion. */
EF_API double ef_task_best_correct(ef_task task, double d_prime);
/** d' from that share; NaN below chance or at 1. */
EF_API double ef_task_best_d_prime(ef_task task, double correct);
/** Same-different under the model of independent observations instead, for
 * designs with a fixed standard: the largest share of right answers is
 * Phi(d'/2)^2 + Phi(-d'/2)^2, and d' from hit and false-alarm rate is
 * 2 z((1 + sqrt(2 p - 1)) / 2) with p = Phi((z(H) - z(F)) / 2). */
EF_API double ef_independent_best_correct(double d_prime);
EF_API double ef_independent_d_prime(double hits, double false_alarms);

/** At which answer a threshold is taken. */
typedef struct ef_criterion {
  ef_task task;
  double proportion;   /**< of positive answers; ignored when d_prime is set */
  double false_alarms; /**< yes-no and same-different; else ignored */
  double d_prime;      /**< NaN: from the proportion */
} ef_criterion;

/** The proportion that counts as "just noticeable" unless another is named:
 * 75 % right in 2IFC. Its d' is the JND's in every other task. */
#define EF_JND_PROPORTION 0.75
/** sqrt 2 z(0.75) */
#define EF_JND_D_PRIME 0.95387255240893972

/** d' at the criterion; NaN when it has none. */
EF_API double ef_criterion_d_prime(const ef_criterion *criterion);
/** A threshold at one criterion turned into that of another, of the same or
 * another task, for d' proportional to level^exponent: level (d'_to /
 * d'_from)^(1 / exponent). EF_INVALID for a threshold or exponent not above 0;
 * EF_NO_ANSWER when a criterion has no d' above 0. */
EF_API ef_status ef_threshold_convert(double threshold, double exponent,
                                      const ef_criterion *from,
                                      const ef_criterion *to, double *converted,
                                      ef_error *error);

/** A value with its standard error and interval; NaN where not known, infinite
 * where the interval is open on that side. */
typedef struct ef_estimate {
  double value, se, low, high;
} ef_estimate;

/* ---- Just-noticeable differences --------------------------------------- */

/** By a short text: `50%`, `75%`, `84%`, `d-prime:1.2`, or a task and its share
 * of positive answers, `2ifc:80%`, `triangle:60%`, `yes-no:60%:20%` (with the
 * false alarms, which yes-no and same-different need). Of the short ones
 *   75%  is 75 % right in 2IFC, d' 0.954;
 *   84%  is one standard deviation, 84.13 % right in 2IFC, d' 1.414;
 *   50%  is seen by half, or half of the time, with false alarms not known:
 *        taken as 75 % right in 2IFC, which is half of the way from chance
 *        (common practice, no source).
 * EF_INVALID for a share that is not above chance and below 100 %. */
EF_API ef_status ef_criterion_find(const char *text, ef_criterion *out,
                                   ef_error *error);

/** A just-noticeable difference with what it rests on: what a panel's result is
 * kept as, and what predictions of answers start from. A plain value. */
typedef struct ef_jnd_record {
  char metric[64];        /**< name of the formula, as ef_metric_name has it */
  double value;           /**< median over observers, in its unit */
  ef_criterion criterion; /**< what was answered at this difference */
  double exponent;        /**< beta: d' grows with this power of the difference,
                               0.1 to 10; 1 unless it was measured */
  /** Standard deviation over observers of the natural logarithm of the JND, 0
   * to 3: exp of it is the geometric standard deviation. */
  double observer_log_sd;
  double low, high;       /**< 95 % interval of the value; NaN: not known */
  size_t n_observers;     /**< 0: not known */
  char source[256];       /**< publication, or panel and date */
} ef_jnd_record;

/** EF_INVALID names the member that is out of range. */
EF_API ef_status ef_jnd_record_check(const ef_jnd_record *record,
                                     ef_error *error);

/** The metric's published default (ef_metric_jnd) at the criterion 50%, with
 * exponent 1 and, for the spread over observers, the median spread of the
 * judgements of a published experiment: 0.28, the standard deviation over the
 * median tolerance of 147 vectors in Berns et al., Color Res. Appl. 16 (1991)
 * 297-316, Table IV, which holds the scatter of single judgements too. Notes
 * say all of this, and that viewing conditions matter. EF_NO_ANSWER when no JND
 * is published. */
EF_API ef_status ef_jnd_record_default(const ef_metric *metric,
                                       ef_jnd_record *out,
                                       const ef_notes *notes, ef_error *error);

/** The same JND at another criterion, in value and interval. EF_INVALID and
 * EF_NO_ANSWER as ef_threshold_convert. */
EF_API ef_status ef_jnd_record_convert(const ef_jnd_record *record,
                                       const ef_criterion *criterion,
                                       ef_jnd_record *out, ef_error *error);

/* ---- Told apart -------------------------------------------------------- */

/** How uncertainties reach the answer. */
typedef enum ef_propagation {
  EF_PROPAGATE_MONTE_CARLO, /**< by drawing from them */
  EF_PROPAGATE_FIRST_ORDER  /**< by the slope of the answer: quick, for
                                 uncertainties well below the difference */
} ef_propagation;

typedef struct ef_told_apart_settings {
  ef_propagation propagation;
  uint64_t seed;
  size_t n_draws; /**< 100 to 10 000 000 */
} ef_told_apart_settings;

/** Monte Carlo, seed 1, 10 000 draws. */
EF_API ef_told_apart_settings ef_told_apart_settings_default(void);

/** n pairs to be judged. */
typedef struct ef_judged {
  /** In the metric of the JND, not negative; n, or for a population n x
   * n_observers: what each observer sees of each pair (ef_population_spread).
   * NaN for a pair that could not be computed. */
  const double *difference;
  size_t n_observers; /**< 1, or the size of the population */
  /** Standard deviations in the same unit; n each, or NULL for none. What
   * repeated measurement leaves open (ef_metric_uncertainty), and how far the
   * pieces of the batch depart from the one measured. Both move what every
   * observer sees by the same amount. */
  const double *measurement_sd;
  const double *batch_sd;
} ef_judged;

/** What people will say of a pair. Each with its standard deviation and its
 * 95 % interval from the uncertainties of measurement, batch and JND (the last
 * from the record's interval). All NaN for a difference of NaN. */
typedef struct ef_told_apart {
  ef_estimate jnds; /**< difference over JND; for a population its mean */
  /** Of the observer with the median JND: jnds^beta times d' at the JND's
   * criterion. */
  ef_estimate d_prime;
  /** Expected share of right answers over all observers, JNDs being log-normal:
   * 2IFC, same-different by the differencing model with the best criterion and
   * half of the pairs the same, triangle. */
  ef_estimate correct_2ifc, correct_same_different, correct_triangle;
  /** Of observers whose own JND is below the difference that they see. */
  ef_estimate share_of_observers;
  /** Shares of measurement, batch and JND in the variance of ln(jnds), to first
   * order; 0 each when nothing is uncertain. */
  double from_measurement, from_batch, from_jnd;
} ef_told_apart;

/** By d' = (difference / JND)^beta d'(criterion). An uncertain difference is
 * drawn from a normal distribution and cut off at 0, an uncertain JND from a
 * log-normal one. Draw i takes stream i of the seed and serves all pairs, so
 * that results do not depend on n or `jobs` (0: all cores). By first order
 * standard deviations are those of the slope, and the interval is that of the
 * logarithm of the JNDs that would give the answer; NaN for a difference of 0
 * that is uncertain, and for the share of a population without a spread of
 * JNDs, which have no slope. Answers are right to 2e-8 beside that. EF_INVALID
 * for a record that does not pass its check and for differences or standard
 * deviations below 0. */
EF_API ef_status ef_told_apart_batch(const ef_jnd_record *jnd, size_t n,
                                     const ef_judged *judged,
                                     const ef_told_apart_settings *settings,
                                     int jobs, ef_told_apart *out,
                                     ef_error *error);

/** What the answers of a record and settings rest on, made once for any number
 * of batches; owns its memory. NULL for what ef_told_apart_batch refuses. Free
 * with ef_teller_free. */
typedef struct ef_teller ef_teller;
EF_API ef_teller *ef_teller_new(const ef_jnd_record *jnd,
                                const ef_told_apart_settings *settings,
                                ef_error *error);
EF_API void ef_teller_free(ef_teller *teller);
/** As ef_told_apart_batch. */
EF_API ef_status ef_teller_tell(const ef_teller *teller, size_t n,
                                const ef_judged *judged, int jobs,
                                ef_told_apart *out, ef_error *error);

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

/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Colour values and the published transformations between them. Plain values
 * in, plain values out; no files, no tables except where stated.
 *
 * Black has no chromaticity: functions that divide by a sum return NaN fields
 * there, as each says. */
#ifndef EVENFIELD_COLOUR_H
#define EVENFIELD_COLOUR_H

#include <evenfield/base.h>
#include <evenfield/observer.h>
#include <evenfield/spectrum.h>

#ifdef __cplusplus
extern "C" {
#endif

typedef struct ef_xyz { double X, Y, Z; } ef_xyz;
typedef struct ef_xyy { double x, y, Y; } ef_xyy;
typedef struct ef_xy { double x, y; } ef_xy;
typedef struct ef_uv { double u_prime, v_prime; } ef_uv;
typedef struct ef_lab { double L_star, a_star, b_star; } ef_lab;
typedef struct ef_luv { double L_star, u_star, v_star; } ef_luv;
/** Cylindrical form of Lab or Luv; h_deg in [0, 360), 0 on the neutral axis. */
typedef struct ef_lch { double L_star, C_star, h_deg; } ef_lch;
typedef struct ef_lms { double cone_l, cone_m, cone_s; } ef_lms;
/** MacLeod-Boynton chromaticity with the luminance it was divided by. */
typedef struct ef_mb { double mb_l, mb_s, luminance; } ef_mb;

/* ---- XYZ and its chromaticities (CIE 015:2018) ------------------------- */

/** NaN x, y where X + Y + Z is not positive. */
EF_API ef_xyy ef_xyz_to_xyy(ef_xyz xyz);
/** (0, 0, 0) for Y = 0; NaN X, Z for y = 0 with Y not 0. */
EF_API ef_xyz ef_xyy_to_xyz(ef_xyy xyy);
/** u' = 4X / (X + 15Y + 3Z), v' = 9Y / (...); NaN where the sum is not
 * positive. */
EF_API ef_uv ef_xyz_to_uv(ef_xyz xyz);
EF_API ef_uv ef_xy_to_uv(ef_xy xy);
EF_API ef_xy ef_uv_to_xy(ef_uv uv);

/* ---- CIELAB, CIELUV (ISO/CIE 11664-4, -5) ------------------------------ */

/** White components must be positive (else the result is NaN, here and in all
 * that follows); X, Y, Z may have any sign (the linear branch goes on below
 * zero). Exact constants 24/116, 841/108. */
EF_API ef_lab ef_xyz_to_lab(ef_xyz xyz, ef_xyz white);
EF_API ef_xyz ef_lab_to_xyz(ef_lab lab, ef_xyz white);
/** u*, v* are 0 for Y = 0, NaN where u', v' are. */
EF_API ef_luv ef_xyz_to_luv(ef_xyz xyz, ef_xyz white);
EF_API ef_xyz ef_luv_to_xyz(ef_luv luv, ef_xyz white);
EF_API ef_lch ef_lab_to_lch(ef_lab lab);
EF_API ef_lab ef_lch_to_lab(ef_lch lch);
EF_API ef_lch ef_luv_to_lch(ef_luv luv);
/** d(L*, a*, b*) / d(X, Y, Z), row-major 3 x 3. */
EF_API void ef_lab_jacobian(ef_xyz xyz, ef_xyz white, double jacobian[9]);
/** Batch form over n x 3 plain arrays, by the batch kernels: to 1e-12 of each
 * alone, and the same bits whatever n. `lab` may be `xyz`. */
EF_API void ef_xyz_to_lab_batch(size_t n, const double *xyz, ef_xyz white,
                                double *lab);

/* ---- Chromatic adaptation ---------------------------------------------- */

typedef enum ef_adaptation {
  EF_ADAPT_NONE,
  EF_ADAPT_BRADFORD, /**< linear Bradford, as in ICC.1 annex E */
  EF_ADAPT_CAT16     /**< Li et al. 2017, complete adaptation */
} ef_adaptation;

/** "none", "bradford", "cat16". Static. */
EF_API const char *ef_adaptation_name(ef_adaptation adaptation);
EF_API ef_status ef_adaptation_find(const char *name, ef_adaptation *out,
                                    ef_error *error);
/** Row-major 3 x 3 that takes XYZ seen under white `from` to the corresponding
 * XYZ under white `to`; both whites on one scale of Y, else the ratio of their
 * Y is applied too. EF_INVALID when a white has a cone response that is not
 * positive. Complete adaptation (D = 1). */
EF_API ef_status ef_adaptation_matrix(ef_adaptation adaptation, ef_xyz from,
                                      ef_xyz to, double matrix[9],
                                      ef_error *error);
EF_API ef_xyz ef_xyz_transform(const double matrix[9], ef_xyz xyz);

/* ---- Cone spaces ------------------------------------------------------- */

/** l_MB = k_l L / V, s_MB = k_s S / V, V = k_l L + k_m M (CIE 170-2:2015);
 * NaN where V is not positive. */
EF_API ef_mb ef_lms_to_mb(ef_lms lms, ef_mb_scale scale);
EF_API ef_lms ef_mb_to_lms(ef_mb mb, ef_mb_scale scale);

/* ---- Colour appearance (CIE 159:2004, CIE 248:2022) -------------------- */

typedef enum ef_cam_version {
  EF_CAM_02, /**< CIECAM02, CIE 159:2004 */
  EF_CAM_16  /**< CIECAM16 (CAM16), CIE 248:2022; Li et al. 2017 */
} ef_cam_version;

/** Luminance of what surrounds the scene against the scene's white: more than
 * a fifth of it, less, next to none. */
typedef enum ef_surround {
  EF_SURROUND_AVERAGE,
  EF_SURROUND_DIM,
  EF_SURROUND_DARK
} ef_surround;

/** "average", "dim", "dark". Static. */
EF_API const char *ef_surround_name(ef_surround surround);
EF_API ef_status ef_surround_find(const char *name, ef_surround *out,
                                  ef_error *error);

/** Where a colour is seen. */
typedef struct ef_cam_viewing {
  ef_xyz white;     /**< adopted white, on the scale of the colours: Y = 100
                         for the perfect diffuser or a display's white */
  double adapting_luminance_cd_m2; /**< L_A, of the adapting field */
  double background_Y;             /**< Y_b of the background, same scale */
  ef_surround surround;
  bool discount_illuminant; /**< full adaptation, D = 1 */
} ef_cam_viewing;

/** Average surround, Y_b = white.Y / 5, and the adapting luminance of that
 * background under 1000 lx, 200 / pi cd/m2 (the illuminance of the reference
 * conditions of CIE 101-1993). */
EF_API ef_cam_viewing ef_cam_viewing_default(ef_xyz white);

/** A model in one viewing: what does not depend on the colour. A plain value,
 * filled by ef_cam_model_set, not by hand. Symbols as in CIE 159. */
typedef struct ef_cam_model {
  double response[9]; /**< XYZ to adapted responses before compression */
  double stimulus[9]; /**< back */
  double F_L, N_c, N_bb, c, z, A_w, D;
  double chroma_factor; /**< (1.64 - 0.29^n)^0.73 */
} ef_cam_model;

/** Correlates: lightness J, brightness Q, chroma C, colourfulness M,
 * saturation s, hue angle, hue quadrature H in [0, 400). A colour without hue
 * has h_deg = 0. Where the achromatic response is negative (lights far outside
 * the surface colours) J and Q are negative too and s is NaN; outside the cone
 * in which the model defines a chroma, all but J and Q are NaN. */
typedef struct ef_cam {
  double J, Q, C, M, s, h_deg, H;
} ef_cam;

/** EF_INVALID for a white, luminance or background that is not positive. */
EF_API ef_status ef_cam_model_set(ef_cam_version version,
                                  const ef_cam_viewing *viewing,
                                  ef_cam_model *out, ef_error *error);
EF_API ef_cam ef_xyz_to_cam(ef_xyz xyz, const ef_cam_model *model);
/** Back, from J, C and h_deg; the other fields are not looked at. NaN for
 * correlates that no stimulus has. */
EF_API ef_xyz ef_cam_to_xyz(ef_cam cam, const ef_cam_model *model);
/** All correlates from lightness, chroma and hue angle, or from brightness,
 * colourfulness and hue angle. */
EF_API ef_cam ef_cam_from_jch(double J, double C, double h_deg,
                              const ef_cam_model *model);
EF_API ef_cam ef_cam_from_qmh(double Q, double M, double h_deg,
                              const ef_cam_model *model);
/** Hue angle that has this quadrature, any H modulo 400. */
EF_API double ef_cam_hue_deg(double H);

/** Uniform colour space on an appearance model (Luo, Cui & Li 2006):
 * J' = (1 + 100 c1) J / (1 + c1 |J|), M' = ln(1 + c2 M) / c2. */
typedef struct ef_ucs {
  double J_prime, a_prime, b_prime;
} ef_ucs;
typedef struct ef_ucs_shape {
  double c1, c2;
} ef_ucs_shape;

/** CAM02-UCS, and with CAM16 CAM16-UCS: c1 0.007, c2 0.0228. */
EF_API ef_ucs_shape ef_ucs_shape_default(void);
EF_API ef_ucs ef_cam_to_ucs(ef_cam cam, ef_ucs_shape shape);
/** n colours, n x 3 each, by the batch kernels: to 1e-10 of ef_cam_to_ucs of
 * ef_xyz_to_cam, and the same bits whatever n. `ucs` may be `xyz`. */
EF_API void ef_xyz_to_ucs_batch(size_t n, const double *xyz,
                                const ef_cam_model *model, ef_ucs_shape shape,
                                double *ucs);
EF_API ef_cam ef_ucs_to_cam(ef_ucs ucs, ef_ucs_shape shape,
                            const ef_cam_model *model);
/** d(J', a', b') / d(X, Y, Z), row-major, in closed form. M grows as the 0.9th
 * power of the distance from the neutral axis, so that its slope has no limit
 * there: below the colourfulness `secant_M` the slope of a', b' is that of the
 * chord from the axis to `secant_M`, averaged over the hues (0: from 1e-6 on
 * the true slope). Slopes at zero responses are those of 1e-9 of the white's.
 */
EF_API void ef_ucs_jacobian(ef_xyz xyz, const ef_cam_model *model,
                            ef_ucs_shape shape, double secant_M,
                            double jacobian[9]);

/* ---- Correlated colour temperature ------------------------------------- */

typedef struct ef_cct {
  double cct_k; /**< NaN when not defined */
  double duv;   /**< distance in CIE 1960 u, v, positive above the locus; also
                     told beyond 0.05; NaN when the nearest point of the locus
                     is not between the two temperatures */
  bool defined; /**< 1000 K to 100000 K and |duv| <= 0.05 (CIE 015:2018) */
} ef_cct;

/** Nearest Planckian radiator in CIE 1960 u, v (CIE 1931 observer,
 * c2 = 1.4388e-2 m K), found on the computed locus, no isotherm table. */
EF_API ef_cct ef_xy_to_cct(ef_xy xy);
/** Chromaticity of the Planckian radiator at `temperature_k` (500 to 1e6); NaN
 * outside. */
EF_API ef_xy ef_planck_xy(double temperature_k);

/* ---- Dominant wavelength and purity ------------------------------------ */

typedef struct ef_dominant {
  double dominant_nm;  /**< wavelength on the locus; of the complementary
                            colour when `complementary`; NaN at the white */
  bool complementary;  /**< the colour lies towards the purple line */
  double purity;       /**< excitation purity, 0 at white, 1 on the boundary,
                            above 1 for what no light can be */
} ef_dominant;

/** Of `xy` seen against `white` (the equal-energy stimulus for lights by
 * default, the illuminant for surfaces), on the observer's spectrum locus
 * interpolated between 1 nm points, 380 to 780 nm, closed by the line under
 * its two ends. Near the ends, where the last digits of the tables make the
 * locus jitter or turn back, one direction may belong to several wavelengths:
 * the one nearest 560 nm is given. EF_INVALID for a chromaticity that is not
 * finite or a white outside the locus. */
EF_API ef_status ef_xy_to_dominant(ef_xy xy, ef_xy white,
                                   const ef_observer *observer,
                                   ef_dominant *out, ef_error *error);
/** The same of n chromaticities, by up to `jobs` threads (0: all cores); all
 * fields of what has no answer are NaN and false. */
EF_API ef_status ef_xy_to_dominant_batch(size_t n, const ef_xy *xy,
                                         ef_xy white,
                                         const ef_observer *observer, int jobs,
                                         ef_dominant *out, ef_error *error);
/** Spectrum locus of the observer: chromaticities at `n` wavelengths from 360
 * to 830 nm (EF_INVALID outside), linear between 1 nm points; NaN where the
 * observer sees nothing (cie-2015 below 390 nm). */
EF_API ef_status ef_locus_xy(const ef_observer *observer, size_t n,
                             const double *wavelength_nm, ef_xy *out,
                             ef_error *error);

/* ---- Colour rendering (CIE 13.3-1995) ---------------------------------- */

typedef struct ef_rendering {
  double Ra;
  double R[14];         /**< special indices R1 .. R14 */
  double cct_k;         /**< of the light, and of its reference */
  bool reference_is_daylight; /**< from 5000 K up */
  double delta_c;       /**< CIE 1960 u, v distance light to reference */
  bool tolerable;       /**< delta_c below 5.4e-3, else Ra is not meaningful */
} ef_rendering;

/** Of one light sampled on `grid` (any unit). 5 nm sums over 360-830 nm with
 * the CIE 1931 observer; a light with steps below 5 nm is gathered into 5 nm
 * bands first, each sample divided between the two points beside it, so that no
 * line is lost; wider steps are interpolated. Zero outside the samples.
 * EF_NO_ANSWER for a dark light or one without a CCT, or with one above
 * 25000 K, where daylight ends. EF_INVALID for values that are not finite. */
EF_API ef_status ef_rendering_index(const ef_grid *grid, const double *power,
                                    ef_rendering *out, ef_error *error);

#ifdef __cplusplus
}
#endif

#endif

/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Observers: sets of channels (colour-matching functions, cone fundamentals)
 * and the folded weights that turn spectra into what an observer gets. */
#ifndef EVENFIELD_OBSERVER_H
#define EVENFIELD_OBSERVER_H

#include <evenfield/base.h>
#include <evenfield/spectrum.h>

#ifdef __cplusplus
extern "C" {
#endif

/** An observer: immutable once made, owns its memory. */
typedef struct ef_observer ef_observer;

/** Which of an observer's channel sets is meant. */
typedef enum ef_channel_role {
  EF_TRISTIMULUS, /**< x_bar, y_bar, z_bar of the observer */
  EF_CONES,       /**< l_bar, m_bar, s_bar, energy units, unit peak */
  EF_RECEPTORS    /**< the same cones, then rods (CIE 1951) and melanopsin
                       (CIE S 026), energy units, unit peak: in the order of
                       ef_receptor. For observers from a model these two are
                       carried from the lens of age 32 to the model's own */
} ef_channel_role;

/** A view of one channel set: `value` is count x grid.count, row-major. All
 * pointers are borrowed from the observer. Nothing above this interface may
 * assume that count is 3. */
typedef struct ef_channels {
  size_t count;
  const char *const *name;
  ef_grid grid;
  const double *value;
} ef_channels;

/** The tables that ef_observer_new takes by name: `cie-1931`, `cie-1964`,
 * `cie-2015-2`, `cie-2015-10`; static texts. Returns how many. */
EF_API size_t ef_observer_names(const char *const **names);

/** What it takes beside them, made by the cone model: `model`, `protanope`,
 * `deuteranope`, `tritanope`, `protanomalous`, `deuteranomalous`; static texts.
 * Returns how many. */
EF_API size_t ef_observer_model_names(const char *const **names);

/** By name. Those of ef_observer_model_names take settings of the cone model
 * (see ef_cone_model) after a colon, separated by commas:
 * `model:age=45,field=4`, `deuteranope:field=10`, and
 * `protanomalous:shift=12` or `deuteranomalous:shift=12`, which need one
 * (see ef_cone_model_make_anomalous). Settings: `age`, `field` (degrees),
 * `lens`, `macular`, `density-l`, `density-m`, `density-s` (percent more or
 * less), `shift-l`, `shift-m`, `shift-s` (nm), each at most once; what is not
 * set is that of ef_cone_model_default. Case is ignored. EF_UNKNOWN_NAME gives
 * the nearest names, EF_INVALID the setting at fault. Free with
 * ef_observer_free. */
EF_API ef_observer *ef_observer_new(const char *name, ef_error *error);

/** From three measured or computed functions, in the order x_bar, y_bar,
 * z_bar, interpolated to the standard grid and zero outside their range. The
 * cone excitations are those of the CIE 2006 2 degree fundamentals.
 * EF_INVALID unless there are exactly three, not all zero, and independent. */
EF_API ef_observer *ef_observer_from_spectra(const char *name,
                                             const ef_spectra *spectra,
                                             ef_error *error);
EF_API void ef_observer_free(ef_observer *observer);

/** Borrowed until the observer is freed. */
EF_API const char *ef_observer_name(const ef_observer *observer);
/** One sentence with the field of view and the published source. */
EF_API const char *ef_observer_about(const ef_observer *observer);
/** Field size in degrees of the cone fundamentals that go with the observer. */
EF_API double ef_observer_field_deg(const ef_observer *observer);
/** K_m in lm/W: 683 for the 1931 and 1964 observers and for files, 683.358 and
 * 683.599 for cie-2015-2 and cie-2015-10 (CIE 170-2:2015). */
EF_API double ef_observer_k_m(const ef_observer *observer);
/** True when the cones do not belong to the observer's own colour-matching
 * functions but are the CIE 2006 ones of the nearest field (1931, 1964,
 * files): outputs say so. */
EF_API bool ef_observer_cones_borrowed(const ef_observer *observer);
/** Channels on the standard grid; zero where the source has no figures (cones
 * below 390 nm, S above 615 nm, and the cie-2015 tristimulus with them). */
EF_API ef_channels ef_observer_channels(const ef_observer *observer,
                                        ef_channel_role role);

/** Factors of the MacLeod-Boynton chromaticity (CIE 170-2:2015), for cone
 * excitations of unit-peak fundamentals. */
typedef struct ef_mb_scale {
  double k_l, k_m, k_s;
} ef_mb_scale;
EF_API ef_mb_scale ef_observer_mb_scale(const ef_observer *observer);

/** Row-major 3 x 3 that takes the observer's X, Y, Z to its cone excitations:
 * exact where the functions belong together (cie-2015-2, cie-2015-10, models),
 * a least-squares fit over the wavelengths where the cones are borrowed.
 * `residual` (may be NULL) receives the largest deviation of a cone function,
 * whose peak is 1. EF_NO_ANSWER for observers of two dimensions. */
EF_API ef_status ef_observer_cone_matrix(const ef_observer *observer,
                                         double lms_from_xyz[9],
                                         double *residual, ef_error *error);

/** How spectra are seen. */
typedef struct ef_viewing {
  ef_kind kind;
  /** Surfaces: the light they stand in (not NULL). Lights: NULL. Borrowed. */
  const ef_illuminant *illuminant;
  /** Lights: values are W sr^-1 m^-2 nm^-1, so that Y is cd/m^2. Ignored for
   * surfaces, whose Y is 100 for the perfect reflecting diffuser. Lights
   * without absolute values: Y = sum of y_bar * power * step, no factor. */
  bool absolute;
  ef_interpolation interpolation;
  ef_extension extension;
  bool correct_bandpass;
  /** Summation grid; ef_grid_standard() unless a published method asks for
   * another (the CIE 015 white points: 380 to 780 nm at 5 nm). Even. */
  ef_grid working;
} ef_viewing;

/** Surfaces under `illuminant` (lights when NULL), standard grid, automatic
 * rules, no bandpass correction, absolute false. */
EF_API ef_viewing ef_viewing_default(const ef_illuminant *illuminant);

/** Weights from samples on `samples` to the channels of `role`. Tristimulus
 * values of surfaces: k = 100 / sum(S y_bar). Cone excitations of surfaces use
 * the factor that makes their unit the same light: 100 / sum(S V) with the
 * observer's own y_bar. Lights: K_m * step when absolute, else step.
 * When more than 0.1 % of a channel's weight lies outside the samples, a note
 * with the figure goes to `notes` (may be NULL). Free with ef_weights_free. */
EF_API ef_weights *ef_observer_weights(const ef_observer *observer,
                                       ef_channel_role role,
                                       const ef_grid *samples,
                                       const ef_viewing *viewing,
                                       const ef_notes *notes, ef_error *error);

/** Channel values of an illuminant itself, scaled so that the observer's y_bar
 * gives 100 (the white point), summed on `working` (NULL: the standard grid).
 * out: as many values as channels of `role`. */
EF_API ef_status ef_observer_white(const ef_observer *observer,
                                   ef_channel_role role,
                                   const ef_illuminant *illuminant,
                                   const ef_grid *working, double *out,
                                   ef_error *error);

/* ---- Observers by age, field and person (CIE 170-1:2006) --------------- */

/** What is missing from three kinds of cones. */
typedef enum ef_deficiency {
  EF_TRICHROMAT,
  EF_PROTANOPE,   /**< L cones hold the M pigment */
  EF_DEUTERANOPE, /**< M cones hold the L pigment */
  EF_TRITANOPE    /**< no S cones */
} ef_deficiency;

/** "trichromat", "protanope", "deuteranope", "tritanope". Static. */
EF_API const char *ef_deficiency_name(ef_deficiency deficiency);

/** An observer as CIE 170-1:2006 describes one, and how this person departs
 * from the mean. The four kinds of departure are those of Asano, Fairchild &
 * Blonde, PLoS ONE 11 (2016) e0145671: percent of the mean optical density,
 * and a shift along wavelength of a pigment's low-density absorbance. */
typedef struct ef_cone_model {
  double age_years;         /**< 20 to 80 */
  double field_deg;         /**< diameter of the field, 1 to 10 degrees */
  double lens_percent;      /**< of the density of all ocular media, >= -100 */
  double macular_percent;   /**< of the macular pigment's, >= -100 */
  double density_percent[3]; /**< of the peak densities of L, M, S, >= -100 */
  double shift_nm[3];       /**< of L, M, S; positive to longer wavelengths,
                                 at most 40 nm either way */
  ef_deficiency deficiency;
} ef_cone_model;

/** The mean observer of CIE 170-1: 32 years, 2 degrees, nothing added. */
EF_API ef_cone_model ef_cone_model_default(void);

/** EF_INVALID names the quantity that lies outside the ranges above. */
EF_API ef_status ef_cone_model_check(const ef_cone_model *model,
                                     ef_error *error);

/** What a unit of stimulus is when a fundamental is tabulated. */
typedef enum ef_cone_units {
  EF_ENERGY, /**< equal radiant power at each wavelength */
  EF_QUANTAL /**< equal numbers of quanta */
} ef_cone_units;

/** Cone fundamentals at the cornea on `grid`: `out` is 3 x grid->count, l_bar,
 * m_bar, s_bar, each with a peak of 1 to the nearest 0.1 nm, zero outside 390
 * to 830 nm (S: above 615 nm plus its shift), where no template is published.
 * CIE 170-1:2006 with the templates of Stockman, Sharpe & Fach (1999) and
 * Stockman & Sharpe (2000), 5 nm, between them a cubic spline:
 *   e_i = w (1 - 10^(-D_i a_i(w))) 10^(-D_lens(w) - D_mac(w)), without the
 *   first w in quantal units;
 *   D_mac peaks at 0.485 exp(-f / 6.132); D_L = D_M = 0.38 + 0.54
 *   exp(-f / 1.333), D_S = 0.30 + 0.45 exp(-f / 1.333);
 *   D_lens = D1 (1 + 0.02 (A - 32)) + D2 up to 60 years, and D1 (1.56 + 0.0667
 *   (A - 60)) + D2 above, with D2 of Pokorny, Smith & Lutze (1987) at 10 nm
 *   and interpolated between (CIE's own list of D2 was not at hand).
 * At 32 years this is within 0.1 % of the tables of CIE 170-1 at every
 * wavelength from 390 to 700 nm, for 2 and 10 degrees. For a dichromat
 * l_bar equals m_bar, or s_bar is zero. */
EF_API ef_status ef_cone_model_fundamentals(const ef_cone_model *model,
                                            ef_cone_units units,
                                            const ef_grid *grid, double *out,
                                            ef_error *error);

/** Peak optical densities of the L, M and S pigments of this model. */
EF_API ef_status ef_cone_model_peak_densities(const ef_cone_model *model,
                                              double density[3],
                                              ef_error *error);

/** Optical density (log10) of the ocular media and of the macular pigment of
 * this model at each wavelength of `grid`, which must lie within 390 to 830
 * nm. Either output may be NULL. */
EF_API ef_status ef_cone_model_media(const ef_cone_model *model,
                                     const ef_grid *grid, double *lens_density,
                                     double *macular_density, ef_error *error);

/** The matrix that makes x_F, y_F, z_F of the fundamentals of a field, 3 x 3
 * row-major, and K_m in lm/W (`k_m` may be NULL). 2 and 10 degrees: CIE
 * 170-2:2015 as published, in every digit. The CIE gives none for fields
 * between; ours is the linear interpolation of the two in exp(-f / 6.132), the
 * model's own law of the macular pigment, with the rows of x and z then scaled
 * so that the equal-energy spectrum has x = y = 1/3 (to 6e-5, what the
 * templates leave) for the mean observer of the field, which is the condition
 * CIE 170-2 sets for its own two. Fields
 * below 2 degrees: the 2 degree matrix with the same scaling. */
EF_API ef_status ef_cone_xyz_matrix(double field_deg, double matrix[9],
                                    double *k_m, ef_error *error);

/** Cone-fundamental-based colour-matching functions of one person on `grid`:
 * `out` is 3 x grid->count. The matrix of the field (ef_cone_xyz_matrix) times
 * the person's own fundamentals: CIE 170-2 defines it for the mean observer of
 * the field, and keeping it for each individual is the choice of Asano,
 * Fairchild & Blonde (2016). For a dichromat the functions span two dimensions
 * only: the cones that hold another pigment (or, for a tritanope, y_bar in
 * place of the missing S cones) enter scaled so that the equal-energy spectrum
 * gives what the normal cones would give. */
EF_API ef_status ef_cone_model_tristimulus(const ef_cone_model *model,
                                           const ef_grid *grid, double *out,
                                           ef_error *error);

/** An observer made of a model; its name is the text that ef_observer_new
 * reads back to the same observer. Free with ef_observer_free. */
EF_API ef_observer *ef_observer_from_model(const ef_cone_model *model,
                                           ef_error *error);

/** The model that `observer` was made of; false, and `out` left as it is, for
 * tables and files. */
EF_API bool ef_observer_model(const ef_observer *observer, ef_cone_model *out);

/** Trichromats one of whose pigments lies nearer to the other's. */
typedef enum ef_anomaly {
  EF_PROTANOMALOUS,  /**< the L pigment, towards M: to shorter wavelengths */
  EF_DEUTERANOMALOUS /**< the M pigment, towards L: to longer wavelengths */
} ef_anomaly;

/** Shifts that pigment of `model` by `shift_nm`, above 0 and at most 32 nm:
 * there the two templates meet at half height of their long-wave side, and
 * what is left of a third dimension is the difference of their shapes. The
 * shift is what the caller states; nothing is inferred about a person. */
EF_API ef_status ef_cone_model_make_anomalous(ef_cone_model *model,
                                              ef_anomaly anomaly,
                                              double shift_nm, ef_error *error);

/** Colours as they look to a dichromat, for one whose sight is not: Brettel,
 * Vienot & Mollon, J. Opt. Soc. Am. A 14 (1997) 2647-2655. Excitations are
 * moved along the axis of the missing cones onto one of two half planes
 * through the neutral colour: one holds 475 nm, the other 575 nm (tritanopes:
 * 485 and 660 nm), which such observers are taken to see as others do. */
typedef struct ef_dichromat_view {
  ef_deficiency deficiency;
  double neutral[3];       /**< L, M, S */
  double half_plane[2][3]; /**< normals: short-wave side, long-wave side */
} ef_dichromat_view;

/** For excitations of the cones of `observer`, of which the neutral colour
 * (the white of a display, the equal-energy spectrum) has `neutral` (L, M, S,
 * all above zero). EF_INVALID for EF_TRICHROMAT or a dichromat observer. */
EF_API ef_status ef_dichromat_view_make(ef_deficiency deficiency,
                                        const ef_observer *observer,
                                        const double neutral[3],
                                        ef_dichromat_view *out,
                                        ef_error *error);
/** The excitations to show in place of `lms`; `out` may be `lms`. */
EF_API void ef_dichromat_view_apply(const ef_dichromat_view *view,
                                    const double lms[3], double out[3]);

/** How many dimensions the observer's colours have: 3, or 2 for dichromats,
 * whose differences are those of the two dimensions that are left. */
EF_API size_t ef_observer_dimensions(const ef_observer *observer);

/* ---- Rods, melanopsin and alpha-opic quantities ------------------------ */

/** Receptors of the human eye, in the order of EF_RECEPTORS. */
typedef enum ef_receptor {
  EF_L_CONE,
  EF_M_CONE,
  EF_S_CONE,
  EF_ROD,
  EF_MELANOPSIN /**< in the ganglion cells that are sensitive by themselves */
} ef_receptor;
enum { EF_N_RECEPTORS = 5 };

/** "l_cone", "m_cone", "s_cone", "rhodopic", "melanopic". Static. */
EF_API const char *ef_receptor_name(ef_receptor receptor);

/** K'_m = 1700 lm/W: rod-weighted radiant power times this is in scotopic
 * units (CIE 018:2019; V'(lambda) of 1951). */
#define EF_K_M_SCOTOPIC_LM_W 1700.0

/** Alpha-opic quantities of one light (CIE S 026/E:2018), for the standard
 * action spectra whatever the observer. The unit follows the spectrum: for W
 * sr^-1 m^-2 nm^-1 radiances in W m^-2 sr^-1, luminances in cd/m^2 and
 * equivalent daylight luminances in cd/m^2; for W m^-2 nm^-1 irradiances in
 * W m^-2, illuminance in lx and equivalent daylight illuminances in lx. For
 * relative spectra only the last two arrays of ratios mean anything. Arrays
 * are indexed by ef_receptor. */
typedef struct ef_alpha_opic {
  double photopic;                    /**< 683 lm/W times the V-weighted sum */
  double scotopic;                    /**< 1700 lm/W times the rods' sum */
  double quantity[EF_N_RECEPTORS];    /**< alpha-opic radiance or irradiance */
  double equivalent_d65[EF_N_RECEPTORS]; /**< luminance or illuminance of D65
                          with the same quantity (EDL or EDI, eq. 9 there) */
  double efficacy_mw_lm[EF_N_RECEPTORS]; /**< quantity over photopic, mW/lm
                          (alpha-opic ELR); NaN for a dark light */
  double daylight_ratio[EF_N_RECEPTORS]; /**< efficacy over that of D65
                          (alpha-opic DER); NaN for a dark light */
} ef_alpha_opic;

/** Alpha-opic efficacy of luminous radiation of D65 in mW/lm, by ef_receptor:
 * 1.6289, 1.4558, 0.8173, 1.4497, 1.3262 (CIE S 026/E:2018). */
EF_API double ef_alpha_opic_d65_mw_lm(ef_receptor receptor);

/** Channels of ef_alpha_opic_weights: the five receptors and V(lambda). */
enum { EF_ALPHA_OPIC_CHANNELS = EF_N_RECEPTORS + 1 };

/** Weights from samples to what ef_alpha_opic_from takes. Lights: plain sums
 * times the step in nm. Surfaces: as seen in the viewing's illuminant of
 * luminance (or illuminance) 100 for the perfect diffuser. Notes and ownership
 * as for ef_observer_weights. */
EF_API ef_weights *ef_alpha_opic_weights(const ef_grid *samples,
                                         const ef_viewing *viewing,
                                         const ef_notes *notes,
                                         ef_error *error);
/** From one spectrum's EF_ALPHA_OPIC_CHANNELS sums. */
EF_API ef_alpha_opic ef_alpha_opic_from(const double *channel);

/* ---- Populations of individual observers ------------------------------- */

/** Many observers, drawn from a seed; immutable once made. */
typedef struct ef_population ef_population;

enum { EF_POPULATION_MOST = 1000000 };

typedef struct ef_population_settings {
  size_t count;  /**< 1 to EF_POPULATION_MOST */
  uint64_t seed;
  /** Ages are drawn uniformly between these two, 20 to 80 years; equal ones
   * give everybody that age. Not used with an age table. */
  double age_min_years, age_max_years;
  /** Rows of an age table, 0 for none: ages of 20 to 80 years and the share of
   * the population of each, not negative, with a sum of 1 to 0.001. Each
   * person has one of these ages exactly. Borrowed during the call. */
  size_t n_ages;
  const double *age_years;
  const double *share;
  /** What individuals depart from: its field and deficiency are everybody's,
   * its percentages and shifts are added to everybody's; its age is not
   * used. */
  ef_cone_model mean;
  /** Factor of the published standard deviations, 0 to 3. */
  double deviation_scale;
} ef_population_settings;

/** 1000 observers, seed 1, 20 to 70 years, ef_cone_model_default(), the
 * published deviations. */
EF_API ef_population_settings ef_population_settings_default(void);

/** The published standard deviations in the fields of a model: lens 18.7,
 * macular pigment 36.5, densities 9.0, 9.0, 7.4 percent, shifts 2.0, 1.5, 1.3
 * nm; age, field and deficiency are 0. Asano, Fairchild & Blonde, PLoS ONE 11
 * (2016) e0145671 (the eight figures from memory and one second source). */
EF_API ef_cone_model ef_population_deviations(void);

/** EF_INVALID names the setting at fault. Free with ef_population_free. */
EF_API ef_population *ef_population_new(const ef_population_settings *settings,
                                        ef_error *error);
EF_API void ef_population_free(ef_population *population);
EF_API size_t ef_population_count(const ef_population *population);
/** Field that all of them look at, degrees. */
EF_API double ef_population_field_deg(const ef_population *population);

/** Observer `i`, below the count. Depends on the seed and on `i` alone: not on
 * the count, the order of asking or threads. Deviations are independent and
 * normal; one that would take a density below nothing (of the macular pigment
 * for 3 in 1000 people) stops there. */
EF_API ef_cone_model ef_population_member(const ef_population *population,
                                          size_t i);

/** Weights of the observers first .. first + count - 1 in one matrix of 3 x
 * count channels: x_bar, y_bar, z_bar of the first, of the second ... (see
 * ef_cone_model_tristimulus), so that one ef_weights_apply gives what all of
 * them see. Scaled for each person: surfaces have Y = 100 for the perfect
 * reflecting diffuser in that person's eyes; lights K_m of the field times the
 * step when absolute, else the step. Functions are evaluated on the viewing's
 * summation grid with up to `jobs` threads (0: all cores; no effect on the
 * result). Memory: count x 3 x (samples + working grid) doubles; take a large
 * population in parts. Notes and ownership as for ef_observer_weights. */
EF_API ef_weights *ef_population_weights(const ef_population *population,
                                         size_t first, size_t count,
                                         const ef_grid *samples,
                                         const ef_viewing *viewing, int jobs,
                                         const ef_notes *notes,
                                         ef_error *error);

/** Observers that stand for a population: k medoids (1 to 100, at most the
 * count, of a population of at most 100 000) of the fundamentals, stacked as
 * one vector of 3 x 40 values, energy units, unit peak, 390 to 780 nm at 10
 * nm, under the squared Euclidean distance. Voronoi iteration from k-means++
 * seeding (Arthur & Vassilvitskii 2007), the best of five starts; the medoid of
 * a group under this distance is the member nearest to its mean. The same
 * result for a population and seed whatever `jobs`. `index` (k) receives the
 * members, the largest group first; `share` (k, may be NULL) the share of the
 * population in each group. Representing observers by medoids of cone
 * fundamentals is the way of Asano, Fairchild & Blonde (2016). */
EF_API ef_status ef_population_medoids(const ef_population *population,
                                       size_t k, uint64_t seed, int jobs,
                                       size_t *index, double *share,
                                       ef_error *error);

/** A population of the members `index[0 .. n)` alone, in this order; n from 1
 * to EF_POPULATION_MOST. */
EF_API ef_population *ef_population_choose(const ef_population *population,
                                           size_t n, const size_t *index,
                                           ef_error *error);

#ifdef __cplusplus
}
#endif

#endif

/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Devices: n drive values in [0, 1] to a stimulus. And setups: a device seen
 * by an observer, which is what matching, gamut geometry and quantisation
 * work on, whatever the device is.
 *
 * Two steps lead from a drive to a colour. A monotone curve for each channel
 * turns a drive into an amount in [0, 1] (for a display the share of the
 * primary's light); the amounts together make the stimulus. */
#ifndef EVENFIELD_DEVICE_H
#define EVENFIELD_DEVICE_H

#include <evenfield/base.h>
#include <evenfield/colour.h>
#include <evenfield/observer.h>
#include <evenfield/spectrum.h>

#ifdef __cplusplus
extern "C" {
#endif

/** Most drives a device may have. */
#define EF_MAX_DRIVES 8

/* ---- Tone curves ------------------------------------------------------- */

/** A strictly increasing map of [0, 1] onto [0, 1]; immutable, owns its
 * memory. */
typedef struct ef_tone_curve ef_tone_curve;

/** `linear`; `power:G` with 0.1 <= G <= 10; `iec61966-2-1`; `romm` (ISO
 * 22028-2: power 1.8 with a linear toe). EF_UNKNOWN_NAME gives near names. */
EF_API ef_tone_curve *ef_tone_curve_new(const char *name, ef_error *error);
/** Monotone (Steffen 1990) interpolation of a measured ramp: n >= 2 points,
 * drive strictly increasing from 0 to 1, level strictly increasing; levels are
 * scaled so that the ends are 0 and 1. EF_INVALID names the point at fault. */
EF_API ef_tone_curve *ef_tone_curve_from_ramp(size_t n, const double *drive,
                                              const double *level,
                                              ef_error *error);
EF_API ef_tone_curve *ef_tone_curve_copy(const ef_tone_curve *curve,
                                         ef_error *error);
EF_API void ef_tone_curve_free(ef_tone_curve *curve);
EF_API const char *ef_tone_curve_about(const ef_tone_curve *curve);
/** Amount at `drive` (clamped to [0, 1]); its slope too unless NULL (infinite
 * at 0 for a power below 1). NaN gives NaN. */
EF_API double ef_tone_curve_amount(const ef_tone_curve *curve, double drive,
                                   double *slope);
/** Drive that gives `amount` (clamped to [0, 1]): the drive it came from to
 * 1e-14, as far as the slope of the curve lets an amount tell drives apart. The
 * published constants of `iec61966-2-1` leave a gap of 2.3e-9 between its two
 * parts: an amount inside it gives the drive of the joint. */
EF_API double ef_tone_curve_drive(const ef_tone_curve *curve, double amount);

/* ---- Devices ----------------------------------------------------------- */

typedef struct ef_device ef_device;

EF_API void ef_device_free(ef_device *device);
/** "display", "halftone", "mixture", "profile". Static. */
EF_API const char *ef_device_kind(const ef_device *device);
EF_API const char *ef_device_name(const ef_device *device);
EF_API size_t ef_device_n_drives(const ef_device *device);
/** "red" ...; borrowed until the device is freed. */
EF_API const char *ef_device_drive_name(const ef_device *device, size_t i);
/** The limit of channel `i` in words, `high` or low: "red at full drive",
 * "red at zero", "cyan at 100 %", "total loading". Borrowed. */
EF_API const char *ef_device_limit_name(const ef_device *device, size_t i,
                                        bool high);
/** True for what is seen by the light of an illuminant, which ef_setup_new then
 * needs; false for lights. */
EF_API bool ef_device_reflects(const ef_device *device);
/** False for devices known by chromaticities or tristimulus values only. */
EF_API bool ef_device_has_spectra(const ef_device *device);
/** True when tristimulus values are in cd/m^2. */
EF_API bool ef_device_absolute(const ef_device *device);
/** What happens to each drive before the amounts mix; borrowed text. */
EF_API const char *ef_device_curve_about(const ef_device *device, size_t i);
/** Curve of channel `i`, and its inverse; see ef_tone_curve_amount. NaN when
 * there is no such channel. */
EF_API double ef_device_amount(const ef_device *device, size_t i, double drive,
                               double *slope);
EF_API double ef_device_drive(const ef_device *device, size_t i,
                              double amount);
/** Grid of the spectra; count 0 when there are none. */
EF_API const ef_grid *ef_device_grid(const ef_device *device);
/** Stimulus spectrum at `drive[n_drives]` into `spectrum[grid count]`, and
 * unless NULL its Jacobian d spectrum / d drive (count x n_drives). Drives are
 * clamped to [0, 1]; one that is not finite is EF_INVALID. EF_NO_ANSWER when
 * the device has no spectra. */
EF_API ef_status ef_device_spectrum(const ef_device *device,
                                    const double *drive, double *spectrum,
                                    double *jacobian, ef_error *error);

/* ---- Displays ---------------------------------------------------------- */

typedef struct ef_display_settings {
  /** One curve per primary in order, or one for all (n_curves 1), or none
   * (n_curves 0: the encoding's own, else linear with a note). Copied. */
  size_t n_curves;
  const ef_tone_curve *const *curve;
  /** Light falling on the screen: illuminance, the screen's diffuse reflectance
   * (0 to 1) and the light's distribution. 0 lux: dark room. Adds the luminance
   * lux * reflectance / pi to every colour. Needs spectra in W sr^-1 m^-2 nm^-1
   * or tristimulus values in cd/m^2, else EF_INVALID. */
  double ambient_lux;
  double screen_reflectance;
  const ef_illuminant *ambient_illuminant;
  const ef_notes *notes;
} ef_display_settings;

/** No curves, dark room, no notes. */
EF_API ef_display_settings ef_display_settings_default(void);

/** From measured spectra at full drive. A spectrum named `black`, `white` or
 * `ambient` (case ignored) plays that part, all others (3 to EF_MAX_DRIVES)
 * are primaries in file order. Primaries and white are measured in the dark,
 * each with the display's black in it; `ambient`, measured with the display
 * off, is what the screen reflects and is added to every colour (EF_INVALID
 * together with room light in the settings). Without `black` the black is zero
 * and a note says so. `white`, if there, serves the additivity check of
 * ef_display_additivity.
 * EF_INVALID for surfaces, too few or too many primaries, a primary that adds
 * no light to the black, or a white (measured, else the sum of the primaries)
 * that is not lighter than the black. EF_NO_ANSWER for primaries that are
 * linearly dependent to the CIE 1931 observer: a condition number, of unit
 * columns, above 6.7e7 (half of the digits lost), which the message gives. */
EF_API ef_device *ef_display_from_spectra(const char *name,
                                          const ef_spectra *spectra,
                                          const ef_display_settings *settings,
                                          ef_error *error);

/** A published encoding by name: `srgb`, `bt709`, `bt2020`, `p3-d65`,
 * `p3-dci`, `oprgb`, `romm`, `ebu`, `smpte-c`, `ntsc-1953`, `ap0`, `ap1`, ...
 * No spectra; relative (Y of white 1), black zero. */
EF_API ef_device *ef_display_from_encoding(const char *name,
                                           const ef_display_settings *settings,
                                           ef_error *error);
/** A published encoding: chromaticities and its sources. */
typedef struct ef_encoding {
  const char *name;
  const char *standard;
  int h273; /**< ColourPrimaries code point of ITU-T H.273, 0 if none */
  ef_xy red, green, blue, white;
  const char *tone; /**< name of its tone curve */
} ef_encoding;
EF_API size_t ef_encoding_count(void);
EF_API const ef_encoding *ef_encoding_at(size_t i);
EF_API const ef_encoding *ef_encoding_find(const char *name, ef_error *error);
/** Linear RGB to XYZ with Y of white = 1 (SMPTE RP 177), row-major. */
EF_API ef_status ef_encoding_matrix(const ef_encoding *encoding,
                                    double matrix[9], ef_error *error);

/** n pixels of 8-bit codes, red, green and blue each, to CIELAB (n x 3) relative
 * to the encoding's white, as its reference display shows them; by the batch
 * kernels, over up to `jobs` threads (0: all cores): the same bits whatever n
 * and `jobs`. */
EF_API ef_status ef_encoding_codes_to_lab(const ef_encoding *encoding, size_t n,
                                          const uint8_t *rgb, int jobs,
                                          double *lab, ef_error *error);
/** The same of drives as floats (clamped to [0, 1]), to XYZ with Y = 100 for the
 * encoding's white. */
EF_API ef_status ef_encoding_rgb_to_xyz(const ef_encoding *encoding, size_t n,
                                        const float *rgb, int jobs, double *xyz,
                                        ef_error *error);

/** Measured rows of a device: its values and what was measured for them. */
typedef struct ef_measurements {
  size_t n_rows;
  size_t n_drives;
  const double *drive; /**< n_rows x n_drives, 0 to 1 */
  /** Either tristimulus values (n_rows x 3, CIE 1931, cd/m^2 when `absolute`)
   * or spectra (n_rows x grid.count); the other is NULL. */
  const double *xyz;
  const double *spectrum;
  ef_grid grid;
  bool absolute;
  const size_t *line;              /**< of each row in its file, or NULL */
  const char *const *drive_name;   /**< or NULL: red, green, blue, for prints
                                        cyan, magenta, yellow, black */
} ef_measurements;

/** How well the additive model describes one measured row: what was measured,
 * what the model predicts, and the white both are relative to. Any metric then
 * gives the size, e.g. ef_delta_e_ciede2000 of the two in CIELAB with
 * `white`. CIE 1931 observer. */
typedef struct ef_residual {
  size_t row;
  ef_xyz measured, predicted; /**< Y of the white = 100 */
  ef_xyz white; /**< measured with all drives at full, else the model's */
} ef_residual;

/** Derives a display from its measurements in the dark:
 * - black: the rows with all drives 0, averaged (none: zero, with a note);
 * - primaries: single channel at full drive, averaged (none: EF_NO_ANSWER);
 * - tone curves, unless the settings have some: least-squares amounts of the
 *   channel's own ramp, else of the grey ramp, relative to its end (with a
 *   note), else linear (with a note); a repeated drive is averaged, a falling
 *   or flat step pooled with its neighbour (with a note);
 * - the model's prediction for every row that is a mixture of at least two
 *   channels. `residual` may be NULL, else it has room for n_rows, and
 *   *n_residuals receives how many were filled, in row order.
 * Refuses what ef_display_from_spectra refuses, drives outside [0, 1] and
 * values that are not finite, with the line of the row. */
EF_API ef_device *ef_display_from_measurements(
    const char *name, const ef_measurements *measurements,
    const ef_display_settings *settings, ef_residual *residual,
    size_t *n_residuals, ef_error *error);

/** Sum of the primaries against the measured white, both with the black in
 * them and without ambient light, for the CIE 1931 observer. `measured` is the
 * white that a difference between the two is to be taken against. */
typedef struct ef_additivity {
  bool known;          /**< a white was measured; else the rest is NaN */
  double luminance_ratio; /**< measured white over the sum of primaries */
  ef_xyz measured, summed; /**< Y of the measured white = 100 */
} ef_additivity;
EF_API ef_status ef_display_additivity(const ef_device *device,
                                       ef_additivity *out, ef_error *error);

/* ---- Halftone prints --------------------------------------------------- */

/** Shares of the paper that each overprint of n inks (1 to 4) covers when the
 * dots of one ink lie independently of those of the others (Demichel 1924).
 * `share` receives 2^n_inks values, which sum to 1 for areas in [0, 1]; bit i
 * of the index is set where ink i prints. */
EF_API void ef_demichel(size_t n_inks, const double *area, double *share);

/** Coverage of a tint between bare paper and solid from one value measured of
 * each, a reflectance or a tristimulus value:
 * (paper^(1/n) - tint^(1/n)) / (paper^(1/n) - solid^(1/n)), Yule & Nielsen
 * (1951); with n = 1 Murray & Davies (1936). In [0, 1] for what lies between
 * the two. NaN for n below 1, a solid equal to the paper, and values below
 * zero unless n is 1. */
EF_API double ef_tone_value(double paper, double solid, double tint, double n);

typedef struct ef_halftone_settings {
  /** Yule-Nielsen factor, 1 to 10; 1 is Neugebauer's model. 0: fitted to the
   * ramps, 1 where there are no measurements. */
  double n;
  /** Coverage that a drive prints (tone value increase): one curve per ink, one
   * for all (n_curves 1), or none (n_curves 0: fitted to the ramps, linear
   * where there are no measurements). Copied. */
  size_t n_curves;
  const ef_tone_curve *const *curve;
  /** Drive of the fourth ink, 0 to 1, which stays fixed; for measurements with
   * four inks. */
  double black;
  /** Light that tristimulus values were measured under, and residuals are told
   * for; NULL: D50. */
  const ef_illuminant *illuminant;
  const ef_notes *notes;
} ef_halftone_settings;

/** n and curves left open, no black, D50, no notes. */
EF_API ef_halftone_settings ef_halftone_settings_default(void);

/** A three-ink halftone print of its eight Neugebauer primaries, `primary`
 * 8 x width in the order of ef_demichel: spectra on `grid`, or where `grid` is
 * NULL tristimulus values (CIE 1931, Y = 100 for the perfect reflecting
 * diffuser, under the settings' illuminant). Each value R of the stimulus is
 * R^(1/n) = sum over primaries of share * primary^(1/n), with Demichel's shares
 * of the areas that the curves print. Amounts are areas, zero is bare paper.
 * `ink_name` NULL: cyan, magenta, yellow. Values below zero (noise) count as
 * zero, with a note. EF_INVALID for values that are not finite or an ink that
 * does not darken the paper. */
EF_API ef_device *ef_halftone_new(const char *name,
                                  const char *const *ink_name,
                                  const ef_grid *grid, const double *primary,
                                  const ef_halftone_settings *settings,
                                  ef_error *error);

/** How the model describes one row of a characterisation. CIE 1931 observer
 * under the settings' illuminant, Y of `white`, the perfect reflecting
 * diffuser, = 100. */
typedef struct ef_print_residual {
  size_t row;
  /** True when the row had no part in the fit: a mixture of at least two inks
   * that is no primary. */
  bool is_test;
  ef_xyz measured, predicted, white;
  double spectral_rms; /**< over the samples; NaN without spectra */
} ef_print_residual;

/** Derives a halftone print from a characterisation, `drive` 0 to 1 of three
 * inks or of four with black last (`absolute` is not used; tristimulus values
 * have Y = 100 for the perfect reflecting diffuser):
 * - Neugebauer primaries: the rows with every ink at 0 or 1, repeated ones
 *   averaged (a missing one: EF_NO_ANSWER);
 * - Yule-Nielsen n, unless set: least squared error of the ramps (rows with one
 *   ink), in the lightness function of CIELAB of each sample or tristimulus
 *   value, to 1e-4; without ramps 1, with a note;
 * - curves, unless set: the least-squares area of each row of an ink's ramp,
 *   averaged for repeated drives, monotone between (no ramp: linear, with a
 *   note). A ramp that falls by up to 2 % of area is pooled (with a note), one
 *   that falls by more is refused with the row;
 * - with four inks and the black at 0, rows with black are left out (with a
 *   note); with more, the sixteen primaries and the ramp of black are used, and
 *   rows with another black serve no test.
 * `residual` may be NULL, else it has room for n_rows; *n_residuals receives
 * how many were filled: in row order those of the fit and of the test.
 * Refuses what ef_halftone_new refuses, drives outside [0, 1] and values that
 * are not finite, with the line of the row. */
EF_API ef_device *ef_halftone_from_measurements(
    const char *name, const ef_measurements *measurements,
    const ef_halftone_settings *settings, ef_print_residual *residual,
    size_t *n_residuals, ef_error *error);

/** The Yule-Nielsen factor of a halftone; NaN for other devices. */
EF_API double ef_halftone_n(const ef_device *device);

/* ---- Colourants -------------------------------------------------------- */

/* Kubelka & Munk (Zeitschrift fuer technische Physik 12, 593-601 (1931);
 * Kubelka, Journal of the Optical Society of America 38, 448-457 (1948)):
 * diffuse light in a layer with absorption K and scattering S per unit of
 * thickness. Reflectances here are inside the material; ef_surface leads from
 * there to what an instrument outside measures. */

/** K/S = (1 - R)^2 / (2 R) of an opaque layer; infinite for 0, NaN outside
 * [0, 1]. */
EF_API double ef_km_ratio(double reflectance);
/** Reflectance of a layer of that thickness (infinite: opaque, `backing` is
 * then not seen) over a backing of reflectance `backing`. `slope` unless NULL
 * receives d R / d K and d R / d S; where K is below 2.2e-16 S an opaque layer
 * has the slope of that K, as at K = 0 it is infinite. Any S >= 0, K >= 0; a
 * layer with neither is clear, and black when it is opaque. */
EF_API double ef_km_reflectance(double absorption, double scattering,
                                double thickness, double backing,
                                double slope[2]);

/** What a smooth surface does to light on its way in and out (Saunderson,
 * Journal of the Optical Society of America 32, 727-736 (1942)). */
typedef struct ef_surface {
  double k1; /**< share of the light falling on it that it throws back */
  double k2; /**< share of the diffuse light inside that it throws back in */
  /** The instrument sees what k1 throws back (diffuse geometry with the
   * specular component); false for 45/0 and specular excluded. */
  bool specular_included;
} ef_surface;

/** Nothing thrown back. */
EF_API ef_surface ef_surface_none(void);
/** By Fresnel's equations from the refractive index (1 to 3): k1 for light
 * along the normal, ((n - 1) / (n + 1))^2, and k2 = 1 - (1 - r) / n^2 with the
 * reflection r of diffuse light from outside (Walsh's integral; Judd, Journal
 * of Research of the National Bureau of Standards 29, 329-332 (1942)), which
 * goes to `r_diffuse` unless NULL. For 1.5: 0.04, 0.596 and 0.092. */
EF_API ef_status ef_surface_from_index(double refractive_index,
                                       bool specular_included, ef_surface *out,
                                       double *r_diffuse, ef_error *error);
/** R = k1 (if included) + (1 - k1) (1 - k2) r / (1 - k2 r) of a reflectance r
 * inside; `slope` unless NULL receives d R / d r. */
EF_API double ef_surface_outside(const ef_surface *surface, double inside,
                                 double *slope);
/** The inverse. Below what k1 alone throws back it is negative. */
EF_API double ef_surface_inside(const ef_surface *surface, double outside);

/** Most colourants of a set. */
#define EF_MAX_COLOURANTS 16

/** Absorption and scattering of some colourants per unit of concentration, on
 * one grid; immutable, owns its memory. */
typedef struct ef_colourants ef_colourants;

/** n colourants, `absorption` and `scattering` n x grid->count, finite and not
 * below zero (EF_INVALID names the first at fault). `scattering` NULL:
 * single-constant theory, `absorption` holds K/S in units of the scattering of
 * the base. `names` NULL: "1", "2" ... Free with ef_colourants_free. */
EF_API ef_colourants *ef_colourants_new(size_t n, const char *const *names,
                                        const ef_grid *grid,
                                        const double *absorption,
                                        const double *scattering,
                                        ef_error *error);
/** From spectra in pairs named NAME_k and NAME_s, in any order (the colourants
 * in the order of their first), or all named NAME_ks for single-constant
 * theory; case ignored. The kind of the spectra does not matter. EF_MALFORMED
 * names a spectrum without its partner. */
EF_API ef_colourants *ef_colourants_from_spectra(const ef_spectra *spectra,
                                                 ef_error *error);
/** The colourants `index[0 .. n)` of a set. */
EF_API ef_colourants *ef_colourants_pick(const ef_colourants *colourants,
                                         size_t n, const size_t *index,
                                         ef_error *error);
EF_API void ef_colourants_free(ef_colourants *colourants);
EF_API size_t ef_colourants_count(const ef_colourants *colourants);
/** Borrowed until freed, as are the next three. */
EF_API const char *ef_colourants_name(const ef_colourants *colourants,
                                      size_t i);
/** EF_UNKNOWN_NAME lists near names. Case is ignored. */
EF_API ef_status ef_colourants_find(const ef_colourants *colourants,
                                    const char *name, size_t *index,
                                    ef_error *error);
EF_API const ef_grid *ef_colourants_grid(const ef_colourants *colourants);
/** grid count values of colourant i. */
EF_API const double *ef_colourants_absorption(const ef_colourants *colourants,
                                              size_t i);
/** NULL in single-constant theory. */
EF_API const double *ef_colourants_scattering(const ef_colourants *colourants,
                                              size_t i);

/** Samples of known composition from which colourants are fitted. */
typedef struct ef_drawdowns {
  size_t n_drawdowns;
  size_t n_colourants;
  const char *const *name;     /**< of the colourants, or NULL */
  const double *concentration; /**< n_drawdowns x n_colourants, >= 0 */
  const double *thickness;     /**< of each, infinite: opaque; NULL: all are */
  /** Reflectance of what each lies on, n_drawdowns x grid.count, measured
   * like the samples; NULL when all are opaque. */
  const double *backing;
  const double *reflectance;   /**< n_drawdowns x grid.count, measured */
  ef_grid grid;
  const size_t *line;          /**< of each in its file, or NULL */
} ef_drawdowns;

typedef struct ef_colourant_fit_settings {
  bool single_constant; /**< opaque samples only; needs a base */
  size_t base;          /**< index of the base, SIZE_MAX: none */
  ef_surface surface;
  /** Reflectances below this count as this much in relative errors: what the
   * instrument cannot tell from black. */
  double least_reflectance;
} ef_colourant_fit_settings;

/** Two constants, no base, no surface, 0.01. */
EF_API ef_colourant_fit_settings ef_colourant_fit_settings_default(void);

/** The absorption and scattering, none below zero, that make the sum of the
 * squared relative errors of the reflectances least, wavelength by wavelength:
 * Gauss-Newton steps (Levenberg-Marquardt), each a non-negative least-squares
 * problem (Lawson & Hanson 1974), from the linear solution for opaque samples
 * and from several starts for films. Opaque samples alone leave the unit of K
 * and S open: the scattering of the base, or of the first colourant, is then 1
 * at every wavelength. In single-constant theory the base's share is 1 in
 * every sample (its concentrations are not used).
 * `relative_rms` unless NULL receives for each drawdown the root mean square of
 * its relative errors. EF_NO_ANSWER when a colourant stands in too few
 * drawdowns to be told: one for single-constant theory and for what sets the
 * unit, else two. EF_INVALID for values that are not finite or out of range,
 * with the line of the drawdown. */
EF_API ef_colourants *ef_colourants_fit(
    const ef_drawdowns *drawdowns, const ef_colourant_fit_settings *settings,
    double *relative_rms, ef_error *error);

typedef struct ef_mixture_settings {
  size_t base; /**< index of the base, SIZE_MAX: none */
  /** The most that the concentrations of all but the base may sum to. With a
   * base in two-constant theory at most 1: the base is the rest to 1. */
  double total_loading;
  double thickness; /**< of the film; infinite: opaque */
  /** Reflectance of what the film lies on, measured like the mixture: as many
   * values as the colourants' grid has. NULL: opaque. */
  const double *substrate;
  ef_surface surface;
} ef_mixture_settings;

/** No base, loading 1, opaque, no surface. */
EF_API ef_mixture_settings ef_mixture_settings_default(void);

/** A device that mixes the colourants (1 to EF_MAX_DRIVES beside the base):
 * K = sum of concentration * absorption, S likewise, then ef_km_reflectance and
 * ef_surface_outside. Each drive is the share that its colourant takes of the
 * loading left over by those before it, so that the box of drives is exactly
 * the mixtures within the total loading: a drive at zero is none of that
 * colourant, a drive at full is the limit called "total loading". See
 * ef_mixture_concentrations. EF_INVALID for settings out of range, and for
 * opaque mixtures without a base that scatters. */
EF_API ef_device *ef_mixture_new(const char *name,
                                 const ef_colourants *colourants,
                                 const ef_mixture_settings *settings,
                                 ef_error *error);
/** How many colourants are mixed, the base among them, in the order of the
 * set; 0 for other devices. */
EF_API size_t ef_mixture_count(const ef_device *device);
EF_API const char *ef_mixture_name(const ef_device *device, size_t i);
/** Index of the base; SIZE_MAX when there is none. */
EF_API size_t ef_mixture_base(const ef_device *device);
EF_API double ef_mixture_total_loading(const ef_device *device);
/** Concentrations at `drive[n_drives]`: ef_mixture_count values. */
EF_API ef_status ef_mixture_concentrations(const ef_device *device,
                                           const double *drive,
                                           double *concentration,
                                           ef_error *error);
/** Drives of concentrations (that of the base is not used); EF_INVALID for
 * negative ones or more than the total loading by 1e-12 of it. Where nothing
 * of the loading is left the drive is 0. */
EF_API ef_status ef_mixture_drives(const ef_device *device,
                                   const double *concentration, double *drive,
                                   ef_error *error);
/** Sets the concentration of the base to what goes with the others: 1 less
 * their sum, or 1 in single-constant theory; nothing without a base. Returns
 * the slope of it with each of the others: -1, or 0. */
EF_API double ef_mixture_complete(const ef_device *device,
                                  double *concentration);
/** Reflectance of any concentrations >= 0, that of the base as given, and
 * unless NULL its Jacobian d R / d concentration, grid count x
 * ef_mixture_count. */
EF_API ef_status ef_mixture_spectrum(const ef_device *device,
                                     const double *concentration,
                                     double *spectrum, double *jacobian,
                                     ef_error *error);

/* ---- Setups: a device seen by an observer ------------------------------ */

typedef struct ef_setup ef_setup;

/** Folds the device for the observer. Tristimulus values of the setup are
 * scaled so that its white has Y = 100: for lights all drives at full, for
 * devices that reflect the perfect reflecting diffuser. `illuminant` serves
 * devices that reflect and must be NULL for lights (EF_INVALID). The device and
 * the observer must outlive the setup. EF_NO_ANSWER when the device has no
 * spectra and the observer is not the one its values were measured for
 * (cie-1931), or when the white has no luminance. */
EF_API ef_setup *ef_setup_new(const ef_device *device,
                              const ef_observer *observer,
                              const ef_illuminant *illuminant,
                              const ef_notes *notes, ef_error *error);
EF_API void ef_setup_free(ef_setup *setup);
EF_API const ef_device *ef_setup_device(const ef_setup *setup);
EF_API const ef_observer *ef_setup_observer(const ef_setup *setup);
/** White (Y = 100; for lights all amounts 1), and the colour of all amounts 0:
 * for displays black with the room light. */
EF_API ef_xyz ef_setup_white(const ef_setup *setup);
EF_API ef_xyz ef_setup_black(const ef_setup *setup);
/** Luminance of the white in cd/m^2; NaN when the device is not absolute. */
EF_API double ef_setup_luminance_cd_m2(const ef_setup *setup);
/** Factor from the device's own tristimulus unit to the setup's scale. */
EF_API double ef_setup_scale(const ef_setup *setup);
/** What two colours of the setup must differ by, in shares of the white, to be
 * told apart from the rounding that they are computed with: 1e-10, and 1e-4 for
 * profiles with tables of 16 bits. */
EF_API double ef_setup_resolution(const ef_setup *setup);
/** True when XYZ = black + sum of amounts times vectors: every additive
 * device. */
EF_API bool ef_setup_affine(const ef_setup *setup);
/** Colour at `amount[n_drives]` (any reals for affine setups, [0, 1] else),
 * and unless NULL its Jacobian d XYZ / d amount, 3 x n_drives row-major. */
EF_API ef_xyz ef_setup_xyz(const ef_setup *setup, const double *amount,
                           double *jacobian);
/** XYZ of a light spectrum given in the unit of the device's own spectra, on
 * the setup's scale: n spectra on `grid` to n x 3. EF_NO_ANSWER when the device
 * has no spectra. */
EF_API ef_status ef_setup_light_xyz(const ef_setup *setup, const ef_grid *grid,
                                    size_t n, const double *spectrum,
                                    const ef_notes *notes, double *xyz,
                                    ef_error *error);

/* ---- Profiles ----------------------------------------------------------- */

/** Rendering intents, in the order of ICC.1. */
typedef enum ef_intent {
  EF_INTENT_PERCEPTUAL,
  EF_INTENT_RELATIVE,   /**< colours relative to the white of the medium */
  EF_INTENT_SATURATION,
  EF_INTENT_ABSOLUTE    /**< relative, and the white of the medium with it */
} ef_intent;

/** "perceptual", "relative", "saturation", "absolute". Static. */
EF_API const char *ef_intent_name(ef_intent intent);
/** EF_UNKNOWN_NAME gives near names. */
EF_API ef_status ef_intent_find(const char *name, ef_intent *out,
                                ef_error *error);

/** An ICC.1 profile of version 2 or 4; immutable, owns its memory. */
typedef struct ef_profile ef_profile;

/** Reads the `length` bytes of a profile, which are copied; `name` is used in
 * messages. EF_MALFORMED for what is no profile: too short, cut off, without
 * its signature, of another major version, tags beyond its end, tables larger
 * than their tag. Free with ef_profile_free. */
EF_API ef_profile *ef_profile_new(const char *name, const void *bytes,
                                  size_t length, ef_error *error);
EF_API void ef_profile_free(ef_profile *profile);

/** What a profile says of itself. Texts are borrowed from it. */
typedef struct ef_profile_info {
  const char *name;
  const char *description; /**< in ASCII, "" if none */
  /** "display", "output", "input", "colour space", "device link", "abstract",
   * "named colours", "unknown". */
  const char *device_class;
  char space[5];          /**< of device values: "RGB", "CMYK", "Lab" ... */
  char pcs[5];            /**< connection space: "XYZ", "Lab" */
  int major, minor;       /**< version */
  size_t n_channels;      /**< 0 when the space has none that are counted */
  bool is_matrix;         /**< three curves and a matrix, no tables */
  bool has_intent[4];     /**< a table of its own for it; all for a matrix */
  ef_xyz media_white;     /**< `wtpt`, Y of the perfect diffuser = 100 */
  /** Signatures of the tags that ICC.1:2022, clause 8 requires of its class
   * and that are not there, separated by blanks; "" when all are. */
  const char *missing;
} ef_profile_info;
EF_API ef_profile_info ef_profile_get_info(const ef_profile *profile);

typedef struct ef_profile_settings {
  ef_intent intent;
  /** Scale the colours so that the darkest one of the profile is black (not with
   * absolute). Without it the colours are those of the profile, also for
   * perceptual and saturation. */
  bool black_point_compensation;
  double black; /**< drive of the black of CMYK, fixed, 0 to 1 */
  const ef_notes *notes;
} ef_profile_settings;
/** Relative, no compensation, no black. */
EF_API ef_profile_settings ef_profile_settings_default(void);

/** The device that a profile describes: RGB, CMY, or CMYK with its black fixed,
 * of class input, display, output or colour space; EF_NO_ANSWER says why
 * another one cannot serve. Its colours are those of the connection space: CIE
 * 1931 under D50, the white of the medium at D50 unless the intent is absolute.
 * It counts as a light: its setup takes no illuminant, only observer cie-1931,
 * and its white is that of all drives at full for displays, else D50.
 * A matrix profile is an additive device: its curves and columns are read with
 * lcms2 and mixed in double precision, provided that this agrees with lcms2's
 * own transform to 5e-4 of the white on a grid (flat parts of a curve are raised
 * by up to 2e-6, so that it has an inverse). Every other profile is evaluated by
 * lcms2 in single precision, tables of 16 bits as such; its Jacobian is the
 * difference over a step of 1/256 of each drive to both sides (to one where the
 * drive ends). Notes say which it is, and what becomes of white and black. */
EF_API ef_device *ef_profile_device(const ef_profile *profile,
                                    const ef_profile_settings *settings,
                                    ef_error *error);

/** A transform of colours between two profiles, or a profile and the
 * connection space. */
typedef struct ef_transform ef_transform;

typedef struct ef_transform_settings {
  ef_intent intent;
  bool black_point_compensation;
  bool lab; /**< the connection space as L*, a*, b*; else X, Y, Z */
} ef_transform_settings;
/** Relative, no compensation, X, Y, Z. */
EF_API ef_transform_settings ef_transform_settings_default(void);

/** `from` or `to` NULL: the connection space, CIE 1931 and D50, X, Y, Z with
 * Y = 100 for its white, or L*, a*, b*; not both. Any profile but device links,
 * abstract ones and named colours. EF_NO_ANSWER when a profile has no transform
 * in that direction. Free with ef_transform_free. */
EF_API ef_transform *ef_transform_new(const ef_profile *from,
                                      const ef_profile *to,
                                      const ef_transform_settings *settings,
                                      ef_error *error);
EF_API void ef_transform_free(ef_transform *transform);
EF_API size_t ef_transform_inputs(const ef_transform *transform);
EF_API size_t ef_transform_outputs(const ef_transform *transform);
/** n colours, n x inputs to n x outputs: device values in [0, 1] (others are
 * clamped where the profile has tables; results are clamped), colours as above.
 * EF_INVALID for a value that is not finite. Over up to `jobs` threads (0: all
 * cores); results do not depend on them or on n. */
EF_API ef_status ef_transform_apply(const ef_transform *transform, size_t n,
                                    const double *in, int jobs, double *out,
                                    ef_error *error);

/** How well a profile describes measurements of its device (3 or 4 drives as
 * the profile has): in `residual` (room for n_rows) for every row what was
 * measured and what the profile says, both relative to D50. Relative,
 * perceptual and saturation: the measured white goes to D50, of RGB (all drives
 * at full) by linear Bradford, of inks (all at zero) by the ratios of X, Y and
 * Z, as ICC.1 has it for media; EF_NO_ANSWER when no row shows it.
 * Absolute: the measured values are taken as under D50, Y = 100 for the perfect
 * reflecting diffuser. Spectra are refused unless they are lights: for
 * reflectances give X, Y, Z under D50. */
EF_API ef_status ef_profile_check(const ef_profile *profile,
                                  const ef_measurements *measurements,
                                  const ef_profile_settings *settings,
                                  ef_residual *residual, ef_error *error);

/** Bytes of an ICC.1 version 4 matrix profile with one tone curve: display
 * class, XYZ connection space, adapted to D50 by linear Bradford with the
 * `chad` tag; `description` in ASCII. Equal input gives equal bytes: the date
 * is a fixed one. Free with free(). */
EF_API ef_status ef_profile_make_matrix(const char *description,
                                        const ef_encoding *encoding,
                                        unsigned char **bytes, size_t *length,
                                        ef_error *error);

/** The same for a display of three primaries (ef_display_from_measurements and
 * others), for CIE 1931. Its white, black and room light included, goes to D50;
 * the black is laid into the curves, as a matrix profile has no other place for
 * it, as far as the primaries can make it (else a note says what is left). A
 * curve of closed form is kept as such (`para`) where no black is added, else
 * it is 4096 steps of 16 bits. `lumi` tells the luminance of the white where it
 * is known. */
EF_API ef_status ef_profile_make_display(const char *description,
                                         const ef_device *display,
                                         const ef_notes *notes,
                                         unsigned char **bytes, size_t *length,
                                         ef_error *error);

#ifdef __cplusplus
}
#endif

#endif

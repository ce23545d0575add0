/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What the kinds of device share: the table of functions each one fills, the
 * part they have in common, and the colour map a device becomes for an
 * observer. A new kind of device is one file that fills ef__device_class. */
#ifndef EVENFIELD_DEVICE_PRIVATE_H
#define EVENFIELD_DEVICE_PRIVATE_H

#include <evenfield/device.h>

/* ---- Tone curves (tone_curve.c, ramp.c) -------------------------------- */

/** The closed forms, one for all: amount = slope * drive up to the joint,
 * ((drive + offset) / (1 + offset))^gamma from there on. */
typedef struct ef__parametric {
  double gamma;
  double offset;
  double slope;
  double joint; /**< as a drive; 0: no linear part */
} ef__parametric;

/** False when the curve is a measured ramp. */
bool ef__tone_curve_parametric(const ef_tone_curve *curve, ef__parametric *out);

/** Says something else of a curve than what it was made of. */
void ef__tone_curve_describe(ef_tone_curve *curve, const char *about);

/** One point of a measured ramp. */
typedef struct ef__ramp_point {
  double drive, level;
  double weight; /**< how many readings it is the mean of */
} ef__ramp_point;

/** Makes a strictly increasing ramp of readings in any order: sorts them,
 * averages repeated drives, pools falling or equal steps with their neighbours
 * (isotonic regression; a pool becomes one point at its mean drive and level),
 * and leaves out what does not lie between the first and the last level. The
 * first and last drive must occur and stay as they are. Returns the number of
 * points left in `point`; *n_pooled says how many went. */
size_t ef__ramp_make_monotone(size_t n, ef__ramp_point *point,
                              size_t *n_pooled);

/* ---- Colour maps ------------------------------------------------------- */

/** A device as one observer sees it, in the device's own tristimulus unit. */
typedef struct ef__colour_map {
  /** XYZ = origin + vector x amount when `affine`, else `xyz` is called. */
  bool affine;
  double origin[3];
  double vector[3 * EF_MAX_DRIVES]; /**< 3 x n_drives, row-major */
  /** XYZ of the white that the setup scales to Y = 100. */
  double white[3];
  /** Set for maps computed in less than double precision; 0: 1e-10. See
   * ef_setup_resolution. */
  double resolution;
  /** Colour at `amount`, and unless NULL d XYZ / d amount, 3 x n_drives. */
  void (*xyz)(const void *data, const double *amount, double xyz[3],
              double *jacobian);
  void *data; /**< of the callback; NULL when affine */
  void (*release)(void *data);
} ef__colour_map;

/* ---- Kinds of device --------------------------------------------------- */

/** What a kind of device has to answer. `amount` is behind the curves. */
typedef struct ef__device_class {
  const char *kind;
  bool reflects; /**< needs an illuminant to be seen */
  /** Limits in words, low and high, behind the drive's name (" at zero"), or
   * without a blank at the start alone; NULL: at zero, at full drive. */
  const char *limit_text[2];
  /** Frees what the kind added; the common part is freed by the caller. */
  void (*release)(ef_device *device);
  /** Spectrum at `amount` on the device's grid, and unless NULL
   * d spectrum / d amount (count x n_drives). Called with spectra only. */
  void (*spectrum)(const ef_device *device, const double *amount,
                   double *spectrum, double *jacobian);
  /** Folds for an observer into `map`, which is zeroed. */
  ef_status (*see)(const ef_device *device, const ef_observer *observer,
                   const ef_illuminant *illuminant, const ef_notes *notes,
                   ef__colour_map *map, ef_error *error);
} ef__device_class;

/** The common part; first member of every kind's own struct. */
struct ef_device {
  const ef__device_class *kind;
  size_t n_drives;
  bool absolute;
  ef_grid grid; /**< count 0: no spectra */
  const char *name;
  const char *drive_name[EF_MAX_DRIVES];
  const char *limit_name[EF_MAX_DRIVES][2]; /**< at zero, at full drive */
  ef_tone_curve *curve[EF_MAX_DRIVES];
  void *block; /**< the texts and the wavelengths */
};

/** Fills the common part: copies the names and the grid (NULL: no spectra) and
 * the curves, one per drive. `device` must be zeroed; on failure what was
 * allocated stays in it for ef_device_free. */
ef_status ef__device_set_up(ef_device *device, const ef__device_class *kind,
                            const char *name, size_t n_drives,
                            const char *const *drive_name, const ef_grid *grid,
                            const ef_tone_curve *const *curve, ef_error *error);

/* ---- Displays (display.c, ambient.c) ----------------------------------- */

/** What a display is made of, all values `width` numbers: samples of a spectrum
 * on `grid`, or X, Y, Z where `grid` is NULL. Borrowed. */
typedef struct ef__display_parts {
  const char *name;
  size_t n_primaries;
  const char *const *primary_name;
  const ef_grid *grid;
  bool absolute;
  bool imaginary;        /**< primaries may be no colours at all (AP0) */
  const double *black;   /**< or NULL: none */
  const double *primary; /**< n_primaries x width, each with the black in it */
  const double *white;   /**< measured with all at full, or NULL */
  const double *ambient; /**< measured with the display off, or NULL */
  /** The display's own curves, one per primary; NULL: linear, with a note. */
  const ef_tone_curve *const *curve;
} ef__display_parts;

/** Checks the parts and builds the display; see ef_display_from_spectra. */
ef_device *ef__display_new(const ef__display_parts *parts,
                           const ef_display_settings *settings,
                           ef_error *error);

/** Adds the light that the screen reflects to `background` (samples on `grid`,
 * or X, Y, Z where `grid` is NULL). Nothing when there is no such light. */
ef_status ef__ambient_add(const ef_display_settings *settings, bool absolute,
                          const ef_grid *grid, double *background,
                          ef_error *error);

/** Tristimulus values of n lights for the CIE 1931 observer, `width` numbers
 * each as in ef__display_parts, to n x 3. */
ef_status ef__light_xyz_1931(const ef_grid *grid, bool absolute, size_t n,
                             const double *light, double *xyz, ef_error *error);

/* ---- Devices that reflect (reflecting.c) ------------------------------- */

/** Folds `observer` and `illuminant` for samples on `grid`: 3 x count weights
 * that give XYZ with Y = 100 for the perfect reflecting diffuser, and the XYZ
 * of that diffuser. Free with ef_weights_free. */
ef_weights *ef__reflecting_weights(const ef_observer *observer,
                                   const ef_illuminant *illuminant,
                                   const ef_grid *grid, const ef_notes *notes,
                                   double white[3], ef_error *error);

/** EF_INVALID unless both constants lie in [0, 1). */
ef_status ef__surface_check(const ef_surface *surface, ef_error *error);

/* ---- Halftone prints (halftone.c, halftone_fit.c) ---------------------- */

enum { EF__INKS = 3, EF__OVERPRINTS = 8, EF__MOST_INKS = 4 };

/** What a print is made of. Borrowed. */
typedef struct ef__halftone_parts {
  const char *name;
  const char *const *ink_name;
  const ef_grid *grid; /**< NULL: X, Y, Z */
  const char *illuminant; /**< name, of tristimulus values */
  double n;
  const double *root; /**< width x 8, primary^(1/n) */
  const ef_tone_curve *const *curve;
} ef__halftone_parts;

ef_device *ef__halftone_build(const ef__halftone_parts *parts,
                              ef_error *error);
/** Checks n, curves and black. */
ef_status ef__halftone_check(const ef_halftone_settings *settings,
                             ef_error *error);
/** One value of the print: (sum share * root)^n. */
double ef__halftone_mix(double n, size_t n_primaries, const double *share,
                        const double *root);

#endif

/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Sampled spectra, built-in tables, illuminants, and folded weights.
 *
 * Interpolation, end rules, bandpass correction and the sum over wavelength
 * are linear in the samples. For one sampling grid, one set of channels and
 * one illuminant they fold into a matrix, channels x samples, computed once;
 * everything spectral afterwards is that matrix times the samples. */
#ifndef EVENFIELD_SPECTRUM_H
#define EVENFIELD_SPECTRUM_H

#include <evenfield/base.h>

#ifdef __cplusplus
extern "C" {
#endif

/* ---- Sampling grids ---------------------------------------------------- */

/** Wavelengths of samples. Even: `wavelength_nm` NULL, sample i at
 * start_nm + i * step_nm. Uneven: `wavelength_nm[0 .. count)`, strictly
 * increasing, borrowed; start_nm and step_nm are then ignored. */
typedef struct ef_grid {
  size_t count;
  double start_nm;
  double step_nm;
  const double *wavelength_nm;
} ef_grid;

/** The working grid on which weights are summed unless stated otherwise:
 * 360 to 830 nm at 1 nm, 471 samples. */
EF_API ef_grid ef_grid_standard(void);

/** Wavelength of sample `i`, nm. */
EF_API double ef_grid_wavelength(const ef_grid *grid, size_t i);

/** Checks count >= 1, finite increasing positive wavelengths, steps above
 * zero. EF_INVALID names the first sample at fault. */
EF_API ef_status ef_grid_check(const ef_grid *grid, ef_error *error);

/** True when both list the same wavelengths to 1e-9 relative. */
EF_API bool ef_grid_equal(const ef_grid *a, const ef_grid *b);

/** An even grid equal to `grid` where its steps are even to 1e-6 of a step;
 * `grid` itself otherwise. */
EF_API ef_grid ef_grid_simplify(const ef_grid *grid);

/* ---- Sets of spectra --------------------------------------------------- */

/** What the numbers of a spectrum are. */
typedef enum ef_kind {
  EF_SURFACE, /**< radiance factor, 1 = perfect reflecting diffuser */
  EF_LIGHT    /**< spectral power or radiance, any one unit for all samples */
} ef_kind;

/** n named spectra on one grid; owns its memory. */
typedef struct ef_spectra ef_spectra;

/** Copies `names` (NULL: "1", "2", ...), `grid` and `value` (n x count).
 * EF_INVALID for a bad grid or a value that is not finite. Free with
 * ef_spectra_free. */
EF_API ef_spectra *ef_spectra_new(size_t n, const char *const *names,
                                  const ef_grid *grid, ef_kind kind,
                                  const double *value, ef_error *error);
EF_API void ef_spectra_free(ef_spectra *spectra);
EF_API size_t ef_spectra_count(const ef_spectra *spectra);
EF_API ef_kind ef_spectra_kind(const ef_spectra *spectra);
/** True when the values are known to be W sr^-1 m^-2 nm^-1, so that luminance
 * in cd/m^2 follows from them. False after ef_spectra_new. */
EF_API bool ef_spectra_absolute(const ef_spectra *spectra);
EF_API void ef_spectra_set_absolute(ef_spectra *spectra, bool absolute);
/** Borrowed until the set is freed. */
EF_API const ef_grid *ef_spectra_grid(const ef_spectra *spectra);
EF_API const char *ef_spectra_name(const ef_spectra *spectra, size_t i);
/** n x count, row-major, borrowed until the set is freed. */
EF_API const double *ef_spectra_values(const ef_spectra *spectra);
/** Index of the spectrum of that name; EF_UNKNOWN_NAME lists near names. */
EF_API ef_status ef_spectra_find(const ef_spectra *spectra, const char *name,
                                 size_t *index, ef_error *error);

/* ---- Built-in tables --------------------------------------------------- */

/** A published table compiled into the library. All pointers are static. */
typedef struct ef_table {
  const char *name;   /**< "cie-1931", "cie-d65", ... */
  const char *group;  /**< folder it stands in: cmf, cones, illuminants ... */
  const char *title;
  const char *source; /**< the published source */
  const char *quantity;
  const char *note;   /**< what to mind, one remark a line, "" if nothing */
  const char *rights; /**< licence and attribution, "" if none is known */
  size_t n_rows;
  size_t n_columns;
  const char *const *column; /**< names; column 0 is "wavelength_nm", those of
                                  illuminants are "D65", "FL3.1", "LED-B1" */
  const double *value; /**< by column: value[c * n_rows + r]; 0 where the
                            source has no figure, as `note` then says */
} ef_table;

EF_API size_t ef_table_count(void);
/** Sorted by group, then name. `i` below ef_table_count(). */
EF_API const ef_table *ef_table_at(size_t i);
/** EF_UNKNOWN_NAME gives the nearest names. Case is ignored. */
EF_API const ef_table *ef_table_find(const char *name, ef_error *error);
/** Column number of `column`, or SIZE_MAX. Case is ignored. */
EF_API size_t ef_table_column(const ef_table *table, const char *column);
/** Grid of a table's rows; borrowed from the table. */
EF_API ef_grid ef_table_grid(const ef_table *table);

/* ---- Interpolation and ends -------------------------------------------- */

typedef enum ef_interpolation {
  EF_INTERPOLATE_AUTO, /**< Sprague for even steps and 6 samples or more,
                            natural spline from 3 samples, linear below */
  EF_INTERPOLATE_SPRAGUE, /**< CIE 167:2005; even steps, 6 samples or more */
  EF_INTERPOLATE_SPLINE,  /**< natural cubic spline; 3 samples or more */
  EF_INTERPOLATE_LINEAR
} ef_interpolation;

typedef enum ef_extension {
  EF_EXTEND_AUTO, /**< hold for surfaces (CIE 015), zero for lights */
  EF_EXTEND_HOLD, /**< the end value goes on */
  EF_EXTEND_ZERO
} ef_extension;

/** Interpolates n spectra on `from` (n x from->count) to `to` (n x to->count).
 * The rule is resolved per `interpolation`; EF_INVALID when it needs more
 * samples or even steps than there are. Automatic ends hold: there is no kind
 * to choose by. A value at a sample is that sample, to the bit. */
EF_API ef_status ef_resample(const ef_grid *from, size_t n, const double *value,
                             const ef_grid *to, ef_interpolation interpolation,
                             ef_extension extension, double *out,
                             ef_error *error);

/* ---- Illuminants ------------------------------------------------------- */

/** A relative spectral power distribution with a name; owns its memory. */
typedef struct ef_illuminant ef_illuminant;

/** `name`: A, C, D50, D55, D65, D75, E, FL1 .. FL12, FL3.1 .. FL3.15, HP1,
 * LED-B1 .. LED-V2; `daylight:T` with 4000 <= T <= 25000 K; `planck:T` with
 * 500 <= T <= 100000 K (c2 = 1.4388e-2 m K); case ignored. EF_UNKNOWN_NAME
 * gives the nearest names. Free with ef_illuminant_free. */
EF_API ef_illuminant *ef_illuminant_new(const char *name, ef_error *error);
/** From spectrum `i` of a set of lights. */
EF_API ef_illuminant *ef_illuminant_from_spectra(const ef_spectra *spectra,
                                                 size_t i, ef_error *error);
EF_API void ef_illuminant_free(ef_illuminant *illuminant);
/** Borrowed until the illuminant is freed. */
EF_API const char *ef_illuminant_name(const ef_illuminant *illuminant);
/** Power at each wavelength of `grid`: by the formula for A, E, daylight and
 * Planckian lights; by linear interpolation for tables, as the CIE prescribes
 * for daylight and as keeps the band sums of the line spectra; automatic for
 * spectra from files. Zero outside the table. */
EF_API ef_status ef_illuminant_sample(const ef_illuminant *illuminant,
                                      const ef_grid *grid, double *power,
                                      ef_error *error);
/** Names that ef_illuminant_new takes as they stand (without the two forms
 * with a temperature); static texts. */
EF_API size_t ef_illuminant_names(const char *const **names);

/* ---- Folded weights ---------------------------------------------------- */

typedef struct ef_fold_settings {
  ef_grid working;           /**< summation grid */
  ef_interpolation interpolation;
  ef_extension extension;    /**< EF_EXTEND_AUTO is resolved by `kind` */
  ef_kind kind;
  bool correct_bandpass;     /**< Stearns & Stearns (1988): triangular bandpass
                                  as wide as the (even) sampling step */
} ef_fold_settings;

/** Standard grid, automatic interpolation and ends, surface, no correction. */
EF_API ef_fold_settings ef_fold_settings_default(void);

/** A matrix channels x samples that turns samples into channel values. */
typedef struct ef_weights ef_weights;

/** Folds `n_channels` functions given on the working grid
 * (n_channels x working.count) with the light `illuminant` on that grid (NULL:
 * none), times `scale[channel]`, for spectra sampled on `samples`:
 * out_c = scale_c * sum over working grid of channel_c * illuminant * spectrum.
 * No step width is applied: put it into `scale`. Free with ef_weights_free. */
EF_API ef_weights *ef_weights_fold(const ef_grid *samples, size_t n_channels,
                                   const double *channel,
                                   const double *illuminant,
                                   const double *scale,
                                   const ef_fold_settings *settings,
                                   ef_error *error);
EF_API void ef_weights_free(ef_weights *weights);
EF_API size_t ef_weights_channels(const ef_weights *weights);
EF_API size_t ef_weights_samples(const ef_weights *weights);
/** n_channels x n_samples, row-major; borrowed until freed. */
EF_API const double *ef_weights_matrix(const ef_weights *weights);
/** Share (0 to 1) of the channel's whole weight, by absolute value, that lies
 * outside the sampled range and so rests on the end rule. Above 0.001 it is
 * worth a warning. */
EF_API double ef_weights_outside(const ef_weights *weights, size_t channel);
/** Wavelengths of the samples the weights were folded for; borrowed. */
EF_API const ef_grid *ef_weights_grid(const ef_weights *weights);

/** out[i * channels + c] = sum_s matrix[c][s] * sample[i * samples + s] for n
 * spectra. Uses up to `jobs` threads (0: as many as there are cores); results
 * do not depend on `jobs` or on `n`, bit for bit. Allocates nothing per
 * spectrum. */
EF_API ef_status ef_weights_apply(const ef_weights *weights, size_t n,
                                  const double *sample, int jobs, double *out,
                                  ef_error *error);
/** The same of samples kept as floats (spectral images, which they halve);
 * products and sums are those of the same values as doubles. */
EF_API ef_status ef_weights_apply_float(const ef_weights *weights, size_t n,
                                        const float *sample, int jobs,
                                        double *out, ef_error *error);

#ifdef __cplusplus
}
#endif

#endif

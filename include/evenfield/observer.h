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
  EF_CONES        /**< l_bar, m_bar, s_bar, energy units, unit peak */
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

/** Names that ef_observer_new takes: `cie-1931`, `cie-1964`, `cie-2015-2`,
 * `cie-2015-10`; static texts. Returns how many. */
EF_API size_t ef_observer_names(const char *const **names);

/** By name. EF_UNKNOWN_NAME gives the nearest names. Free with
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

#ifdef __cplusplus
}
#endif

#endif

/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Matching a target colour with a setup: exact amounts, limits, the nearest
 * colour the setup can show, code values, and the gamut itself. Written for
 * every device; nothing here knows what a display is. */
#ifndef EVENFIELD_MATCH_H
#define EVENFIELD_MATCH_H

#include <evenfield/base.h>
#include <evenfield/colour.h>
#include <evenfield/device.h>
#include <evenfield/difference.h>

#ifdef __cplusplus
extern "C" {
#endif

typedef struct ef_match_settings {
  const ef_metric *metric; /**< measures every gap; default CIEDE2000 */
  int bits;                /**< 1 to 16: code values; 0: none */
  bool hue_kept;           /**< also find the colour with hue and lightness
                                kept (costs about as much as the nearest) */
  double jnd;              /**< unit of `jnds`; NaN: the metric's default */
} ef_match_settings;

/** CIEDE2000, 8 bits, hue kept, default JND. */
EF_API ef_match_settings ef_match_settings_default(void);

/** A colour the setup can show. */
typedef struct ef_shown {
  double amount[EF_MAX_DRIVES];
  double drive[EF_MAX_DRIVES];
  ef_xyz xyz;
  double difference;        /**< from the target, in the metric */
  double jnds;              /**< difference / JND; NaN without a JND */
  ef_components components; /**< shown minus target: the direction */
  bool found;               /**< false: no such colour (see hue_kept) */
} ef_shown;

/** The answer for one target. Tristimulus values on the setup's scale. */
typedef struct ef_match {
  ef_xyz target;
  /** Amounts that match exactly; for additive setups outside the gamut the
   * signed ones: a negative amount is to be added to the target's side. NaN
   * when a setup that is not additive cannot reach the target. */
  double amount[EF_MAX_DRIVES];
  bool in_gamut;            /**< exactly when every amount lies in [0, 1] */
  uint32_t below;           /**< bit i: amount i is below 0 */
  uint32_t above;           /**< bit i: amount i is above 1 */
  /** The target itself when in gamut, else the globally nearest colour. */
  ef_shown nearest;
  /** Same hue angle and lightness in the metric's coordinates, the chroma
   * reduced as little as it takes; where the lightness itself cannot be shown
   * at that hue the nearest lightness on the neutral axis side, so `found` is
   * false only when the hue plane misses the gamut. Equal to `nearest` when in
   * gamut. Left zero with found false when not asked for. */
  ef_shown hue_kept;
  /** Limits that hold the nearest colour: bit i of low/high. */
  uint32_t held_low, held_high;
  uint32_t code[EF_MAX_DRIVES]; /**< lattice point of least difference */
  ef_shown coded;           /**< what those codes show; found false: bits 0 */
  double rounded_difference; /**< with plainly rounded codes instead */
} ef_match;

/** Matches n targets (n x 3 tristimulus values, finite, on the setup's scale)
 * over up to `jobs` threads (0: all cores). Results do not depend on `jobs` or
 * `n`. Setups with exactly three drives; others are EF_INVALID.
 * EF_NO_ANSWER when the primaries are linearly dependent. */
EF_API ef_status ef_match_batch(const ef_setup *setup, size_t n,
                                const double *xyz,
                                const ef_match_settings *settings, int jobs,
                                ef_match *out, ef_error *error);

/** The gamut of a setup. */
typedef struct ef_gamut {
  ef_xy primary[EF_MAX_DRIVES]; /**< each at full drive, black included */
  ef_xy white;
  double area_xy;      /**< area of the primaries' polygon in x, y */
  double area_uv;      /**< and in u', v' */
  double locus_share_xy; /**< of the area inside the spectrum locus, 0 to 1 */
  double locus_share_uv;
  double volume_lab;   /**< volume in CIELAB relative to the setup's white */
  double solid_share;  /**< share of the object-colour solid's CIELAB volume
                            under `illuminant` that the setup can show */
  double contrast;     /**< Y of white over Y of black; infinite for 0 */
} ef_gamut;

/** Measures it. `illuminant` lights the object-colour solid, whose white is
 * adapted to the setup's by `adaptation`. Volumes to 0.1 %. */
EF_API ef_status ef_gamut_measure(const ef_setup *setup,
                                  const ef_illuminant *illuminant,
                                  ef_adaptation adaptation, int jobs,
                                  ef_gamut *out, ef_error *error);

/** CIELAB volume of the object-colour solid (optimal colours) of an illuminant
 * for an observer, 380 to 780 nm at 1 nm, relative to the illuminant. */
EF_API ef_status ef_object_solid_volume(const ef_observer *observer,
                                        const ef_illuminant *illuminant,
                                        double *volume, ef_error *error);

#ifdef __cplusplus
}
#endif

#endif

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

enum { EF_MATCH_MOST_STEPS = 65535 };

typedef struct ef_match_settings {
  const ef_metric *metric; /**< measures every gap; default CIEDE2000 */
  int bits;                /**< 1 to 16: code values; 0: none */
  /** Instead of bits: the codes are 0 to n_steps, and a drive is a code over
   * n_steps (100: whole percents); at most EF_MATCH_MOST_STEPS, 0: none. */
  int n_steps;
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
  ef_shown coded;           /**< what those codes show; found false: none */
  double rounded_difference; /**< with plainly rounded codes instead */
} ef_match;

/** Matches n targets (n x 3 tristimulus values, finite, on the setup's scale)
 * over up to `jobs` threads (0: all cores). Results do not depend on `jobs` or
 * `n`. Setups with exactly three drives; others are EF_INVALID.
 * EF_NO_ANSWER when the primaries are linearly dependent. For observers of two
 * dimensions see ef_match_flat_batch, which this then calls without `near`. */
EF_API ef_status ef_match_batch(const ef_setup *setup, size_t n,
                                const double *xyz,
                                const ef_match_settings *settings, int jobs,
                                ef_match *out, ef_error *error);

/** The same for observers of two dimensions (dichromats), for whom what matches
 * a target is a line of amounts: of its part in [0, 1] the point nearest to
 * `near`, n x 3 amounts (such as those that match for the trichromat with the
 * same eyes: where no adaptation comes in between, they lie on the line), or
 * its middle where `near` is NULL.
 * `amount` of a target out of gamut is the point of the line that leaves [0, 1]
 * least; the nearest colour is the least difference on the hexagon of the
 * colours that the setup can show; `hue_kept` is not found there, for such
 * colours have no third dimension to give up. Codes are the best of the four
 * nearest of each channel. EF_INVALID for observers of three dimensions and for
 * targets off the plane of the observer's colours. EF_NO_ANSWER for setups whose
 * colours do not add, and for primaries that differ in brightness only. A
 * tritanope's colours have one of two opposite hues, where CIEDE2000 jumps by
 * some percent: between a reddish and a greenish one rounding decides. */
EF_API ef_status ef_match_flat_batch(const ef_setup *setup, size_t n,
                                     const double *xyz, const double *near,
                                     const ef_match_settings *settings,
                                     int jobs, ef_match *out, ef_error *error);

/** Row-major 3 x 3 that carries an observer's X, Y, Z from white to white:
 * ef_adaptation_matrix; for dichromats by von Kries (each of the two kinds of
 * cones scaled to the new white, whatever `adaptation` is unless EF_ADAPT_NONE),
 * since the others would lead off the plane of their colours. */
EF_API ef_status ef_match_adaptation(const ef_observer *observer,
                                     ef_adaptation adaptation, ef_xyz from,
                                     ef_xyz to, double matrix[9],
                                     ef_error *error);

/** The gamut of a setup. Two-dimensional observers (dichromats) have areas and
 * volumes of 0 and no shares. */
typedef struct ef_gamut {
  ef_xy primary[EF_MAX_DRIVES]; /**< each at full drive, black included; NaN
                                     beyond the drives there are */
  ef_xy white;
  /** Area in x, y and in u', v' of the convex hull of the primaries; where
   * colours do not add (prints) of all mixtures of full and no amounts. */
  double area_xy;
  double area_uv;
  /** Of the area inside the spectrum locus, 380 to 780 nm at 1 nm, closed by
   * the line between its ends: 0 to 1, NaN without such an area. */
  double locus_share_xy;
  double locus_share_uv;
  /** Volume in CIELAB relative to the setup's white. NaN for setups whose
   * colours do not add with other than three drives. */
  double volume_lab;
  /** Share of the object-colour solid's CIELAB volume under `illuminant` that
   * the setup can show, 0 to 1. NaN where there is no volume_lab, and for an
   * observer whose solid has no answer in ef_object_solid_volume. */
  double solid_share;
  /** Y of white over Y of black; where colours do not add, of the lightest over
   * the darkest of the mixtures above. Infinite for a black of 0. */
  double contrast;
} ef_gamut;

/** Measures it. `illuminant` lights the object-colour solid, whose white is
 * adapted to the setup's by `adaptation`. Additive setups may have any number
 * of drives: their solid is the zonohedron of the primaries. Volumes and shares
 * to 0.1 % (reached for displays: 0.005 %). Results do not depend on `jobs` (0:
 * all cores). EF_INVALID when the observer sees nothing of the illuminant, or
 * for whites that cannot be adapted. */
EF_API ef_status ef_gamut_measure(const ef_setup *setup,
                                  const ef_illuminant *illuminant,
                                  ef_adaptation adaptation, int jobs,
                                  ef_gamut *out, ef_error *error);

/** The gamut at one lightness: its outlines, corner after corner, in CIELAB
 * relative to the setup's white. One for most devices and lightnesses. */
typedef struct ef_gamut_section {
  size_t n_loops;  /**< 0: the setup shows nothing that light or dark */
  size_t *n;       /**< corners of each; owned */
  ef_lab *point;   /**< of one after the other, each to be closed; owned */
} ef_gamut_section;

/** Cuts the surface that the mixtures with one amount at 0 or 1 make: the
 * gamut's own where colours add, and nearly so where they do not. Corners lie
 * at L_star to 1e-9; slices of a display have its volume to 0.01 %. EF_INVALID unless there are three drives.
 * Release with ef_gamut_section_free in every case. */
EF_API ef_status ef_gamut_section_new(const ef_setup *setup, double L_star,
                                      ef_gamut_section *out, ef_error *error);
EF_API void ef_gamut_section_free(ef_gamut_section *section);

/** CIELAB volume of the object-colour solid (optimal colours) of an illuminant
 * for an observer, 380 to 780 nm at 1 nm, relative to the illuminant. The
 * boundary are the rectangular spectra. EF_NO_ANSWER for an observer whose
 * spectrum locus is not convex, where they are not all of it; EF_INVALID when
 * the observer sees nothing of the illuminant. */
EF_API ef_status ef_object_solid_volume(const ef_observer *observer,
                                        const ef_illuminant *illuminant,
                                        double *volume, ef_error *error);

/* ---- What other observers see ------------------------------------------ */

/** One side of n pairs of stimuli. */
typedef struct ef_side {
  ef_grid grid;
  const double *sample; /**< n x grid.count, finite */
  ef_viewing viewing;
  /** The white this side is judged against, grid.count samples: a display's
   * white, a lamp. NULL for surfaces: the perfect reflecting diffuser in the
   * viewing's illuminant. */
  const double *white;
} ef_side;

typedef struct ef_spread_settings {
  const ef_metric *metric;
  /** From the target's white to the match's, complete; as for the match
   * itself (see ef_match_adaptation). */
  ef_adaptation adaptation;
  /** Difference from which on the two are told apart, in the metric's unit;
   * NaN: the metric's default JND. */
  double threshold;
  /** Weight of each observer of a population of at most 1000, above 0, with a
   * sum of 1 to 0.001 (the shares of ef_population_medoids). NULL: all alike,
   * any number. With weights the 95th percentile is the least difference that
   * at least 95 % of the weight do not exceed. */
  const double *weight;
} ef_spread_settings;

/** CIEDE2000, CAT16, default JND, all observers alike. */
EF_API ef_spread_settings ef_spread_settings_default(void);

/** The difference of one pair as a population sees it, in the metric's unit. */
typedef struct ef_spread {
  double mean; /**< over the observers: observer metamerism index of the pair */
  double p95;  /**< 95th percentile, linear between neighbouring observers (for
                    N observers, place 0.95 (N - 1) of the sorted values,
                    counted from 0) */
  double share_of_observers; /**< above the threshold, 0 to 1; NaN without
                                  one */
} ef_spread;

/** What each observer of `population` sees of n pairs. For every observer, of
 * their own functions and on their own: tristimulus values of both sides and
 * both whites; each side scaled so that its white has Y = 100; the target
 * carried from its white to the match's by `adaptation`; the difference of the
 * two with the match's white as reference white. Where both whites are one to
 * the last bit nothing is carried. The tristimulus functions of individuals
 * are treated like the standard ones, as is usual with individual
 * colour-matching functions (Asano, Fairchild & Blonde 2016).
 *
 * `out` receives n results, `difference` (may be NULL) n x count differences.
 * Tristimulus values come from one product per block of observers
 * (ef_weights_apply); results do not depend on `jobs` (0: all cores). Works in
 * some 110 MB at most beside its arguments. EF_INVALID for a sample that is not finite,
 * for lights without a white, for a white that is dark, and for weights that
 * are none. */
EF_API ef_status ef_population_spread(const ef_population *population,
                                      size_t n, const ef_side *target,
                                      const ef_side *match,
                                      const ef_spread_settings *settings,
                                      int jobs, ef_spread *out,
                                      double *difference,
                                      const ef_notes *notes, ef_error *error);

/** A population before two sides, for pairs that come in many blocks: weights
 * are folded once and held, up to 64 MB of them. Opaque. */
typedef struct ef_crowd ef_crowd;
/** Sides and settings as for ef_population_spread; the samples of the sides are
 * not looked at. The population and what sides and settings point to is
 * borrowed until ef_crowd_free, `notes` too. NULL and the error otherwise. */
EF_API ef_crowd *ef_crowd_new(const ef_population *population,
                              const ef_side *target, const ef_side *match,
                              const ef_spread_settings *settings,
                              const ef_notes *notes, ef_error *error);
EF_API void ef_crowd_free(ef_crowd *crowd);
/** What each of them sees of n pairs, whose samples are `target` and `match`:
 * the same digits as ef_population_spread gives. One call at a time. */
EF_API ef_status ef_crowd_spread(ef_crowd *crowd, size_t n,
                                 const double *target, const double *match,
                                 int jobs, ef_spread *out, double *difference,
                                 ef_error *error);

/** Where each of them sees n pairs: n x count colours of both sides, on the
 * match's white, which is `white` (count, Y = 100) for each of them. Each
 * colour is one of the observer's own functions. */
EF_API ef_status ef_crowd_colours(ef_crowd *crowd, size_t n,
                                  const double *target, const double *match,
                                  int jobs, ef_xyz *seen_target,
                                  ef_xyz *seen_match, ef_xyz *white,
                                  ef_error *error);

/** A whole setup by its pairs. */
typedef struct ef_spread_index {
  double mean;  /**< mean of the pairs' means: the setup's observer metamerism
                     index, after Fairchild & Wyble, Proc. 15th Color Imaging
                     Conf. (2007) 151-156 (definition from memory), who compare
                     display primaries by the mean difference over observers
                     and colours */
  double p95;   /**< mean of the pairs' 95th percentiles */
  double share_of_observers; /**< mean of the pairs' shares */
  size_t worst; /**< pair with the largest 95th percentile, the first of equal
                     ones */
} ef_spread_index;

/** NaN and 0 for n = 0. */
EF_API ef_spread_index ef_spread_index_of(size_t n, const ef_spread *spread);

/* ---- Recipes ------------------------------------------------------------ */

/** Most lights of a recipe, and most colourants with the base. */
#define EF_MAX_LIGHTS 8
#define EF_MAX_RECIPE (EF_MAX_DRIVES + 1)

/** What is to be matched: a spectrum, or where `grid` is NULL tristimulus
 * values in the first light (Y = 100 for the perfect reflecting diffuser). */
typedef struct ef_standard {
  const ef_grid *grid;
  const double *spectrum;
  ef_xyz xyz;
} ef_standard;

typedef struct ef_recipe_settings {
  const ef_metric *metric;
  const ef_observer *observer;
  /** 1 to EF_MAX_LIGHTS lights that the recipe is told for. */
  size_t n_lights;
  const ef_illuminant *const *light;
  /** How much each light counts for the match; 0: it is only told. NULL: the
   * first counts alone. */
  const double *weight;
  /** Concentrations of `stepped` are multiples of this, 0: none. */
  double quantum;
} ef_recipe_settings;

/** CIEDE2000, no steps; observer and lights are the caller's to set. */
EF_API ef_recipe_settings ef_recipe_settings_default(void);

/** Standard and mixture in one light. */
typedef struct ef_recipe_view {
  ef_xyz white;              /**< Y = 100 */
  ef_xyz standard, mixture;  /**< NaN for a standard not known in this light */
  double difference;         /**< in the metric */
  ef_components components;  /**< mixture minus standard */
} ef_recipe_view;

typedef struct ef_recipe {
  bool found; /**< false: not asked for, or no spectrum to match */
  double concentration[EF_MAX_RECIPE]; /**< in the order of ef_mixture_name */
  uint32_t at_zero;      /**< bit i: none of colourant i */
  bool at_total_loading; /**< more of the colourants would be wanted */
  /** Root of the weighted mean of the squared differences in the lights. */
  double difference;
  /** Of the reflectances, over the samples of the colourants; NaN without a
   * spectrum. */
  double spectral_rms;
  /** The difference to be expected (root of the mean square) in a light that is
   * not known: one of the lights (each counts the same), its power at every
   * wavelength off by chance by as much as it is itself, in peaks of 10 nm, the
   * white with it. It holds what errors of reflectance do to the eye, together
   * and each alone, to second order around the standard; NaN without a
   * spectrum. */
  double unknown_light;
  ef_recipe_view view[EF_MAX_LIGHTS];
  /** How far the mixture's colour in the first light moves, in the metric, when
   * 1 % more of colourant i is weighed in and all else stays. */
  double sensitivity[EF_MAX_RECIPE];
} ef_recipe;

typedef struct ef_recipes {
  ef_recipe colour;   /**< the least `difference` */
  /** The least `unknown_light`: the least metameric. A plain sum of squared
   * errors of reflectance knows nothing of the eye; its least has left colours
   * off by several JND. Only for standards with a spectrum. */
  ef_recipe spectral;
  /** The least `difference` that was found with whole steps: among all
   * roundings up and down of `colour`, then by moves of one step in one or two
   * colourants. Of the total loading whole steps count as well. */
  ef_recipe stepped;
} ef_recipes;

/** Concentrations of a mixture's colourants (ef_mixture_new) that match a
 * standard: none below zero, their sum at most the total loading, the base the
 * rest. Gauss-Newton steps (Levenberg-Marquardt) with these limits kept in each
 * step, from several starts; the least of what they end at is taken. A standard
 * with a spectrum is interpolated to the samples of the colourants (its ends
 * held). EF_INVALID for other devices and for settings that make no sense, for
 * instance several lights that count and a standard without a spectrum. */
EF_API ef_status ef_recipe_find(const ef_device *device,
                                const ef_standard *standard,
                                const ef_recipe_settings *settings,
                                ef_recipes *out, ef_error *error);
/* ---- Metamer mismatch bodies ------------------------------------------- */

/** All colours that surfaces which match under one look (or several) may have
 * under another: how wrong a match can go. Reflectances range over two limits,
 * independently at each sample and linear between, so the set of metamers and
 * the body of their colours are convex (Finlayson & Morovic, J. Opt. Soc. Am. A
 * 22 (2005) 810-819; Logvinenko, Funt & Godau, IEEE Trans. Image Process. 23
 * (2014) 34-43). Its boundary is found by sampling the sphere of directions and
 * solving a linear programme in each, after Mackiewicz, Rivertz & Finlayson, J.
 * Opt. Soc. Am. A 36 (2019) 96-104 (references from memory); here the
 * directions are those in which to go from the centre, which gives points and
 * supporting planes at once. Owns its memory. */
typedef struct ef_metamer_set ef_metamer_set;

typedef struct ef_metamer_settings {
  ef_grid grid;     /**< of the reflectances, at most 1000 samples */
  double low, high; /**< limits of the reflectance, 0 <= low < high */
  /** 10 4^level + 2 directions: 0 to 5. */
  int level;
  const ef_notes *notes;
} ef_metamer_settings;

/** 380 to 780 nm at 5 nm, reflectances of 0 to 1, level 3 (642 directions), no
 * notes. Finer samples leave more metamers: from 5 to 1 nm the volume of a grey
 * grows by some 5 % (D65 to A). */
EF_API ef_metamer_settings ef_metamer_settings_default(void);

/** Looks that a metamer must match under: at most this many. */
enum { EF_METAMER_LOOKS = 4 };

/** Surfaces that have the colours `xyz[0 .. n_references)` under the looks
 * `reference` (1 to EF_METAMER_LOOKS), seen under `test`. The interpolation
 * and the ends of the looks' viewings are not used. Results do not depend on
 * `jobs` (0: all cores). EF_NO_ANSWER when no surface has these colours;
 * EF_INVALID for settings outside their ranges and looks at lights. Free with
 * ef_metamer_set_free. */
EF_API ef_metamer_set *ef_metamer_set_new(size_t n_references,
                                          const ef_look *reference,
                                          const ef_xyz *xyz,
                                          const ef_look *test,
                                          const ef_metamer_settings *settings,
                                          int jobs, ef_error *error);
EF_API void ef_metamer_set_free(ef_metamer_set *set);

/** The body as a whole, in X, Y, Z of the test look. */
typedef struct ef_metamer_body {
  /** No volume: the metamers are all alike (white, black, optimal colours), or
   * differ in one or two ways only (few samples, a test look that is nearly the
   * reference). The points are then where planes of all directions touch. */
  bool is_flat;
  ef_xyz center;     /**< a colour inside; where directions start */
  ef_xyz white;      /**< of the test look */
  double volume_low; /**< of the mesh of points: no more than the body's */
  double volume_high; /**< of the supporting planes: no less; infinite where
                           directions are too few to enclose it */
  double volume_lab;  /**< of the mesh in CIELAB of the test look */
} ef_metamer_body;
EF_API ef_metamer_body ef_metamer_set_body(const ef_metamer_set *set);

/** Points on the boundary, and the surface that reaches each: reflectances on
 * the settings' grid, borrowed until the set is freed. */
EF_API size_t ef_metamer_set_count(const ef_metamer_set *set);
EF_API ef_xyz ef_metamer_set_point(const ef_metamer_set *set, size_t i);
EF_API const double *ef_metamer_set_spectrum(const ef_metamer_set *set,
                                             size_t i);
/** Triangles between the points, three indices each, outside counterclockwise
 * in right-handed X, Y, Z; none for a flat body. Borrowed. */
EF_API size_t ef_metamer_set_triangles(const ef_metamer_set *set,
                                       const size_t **corner);

/** How far, in X, Y, Z, a colour lies outside the supporting plane it is most
 * outside of; not above zero (but for rounding, some 1e-9) for every colour of
 * a metamer. */
EF_API double ef_metamer_set_outside(const ef_metamer_set *set, ef_xyz xyz);

/** The metamer that differs most from `from`, say from the colour of the sample
 * itself under the test look: two samples that match under the reference may
 * differ by this much. `conditions` but for the white, which is the test
 * look's, may be NULL for the default ones. Searched from the boundary points
 * towards the corners of the body between them. */
EF_API ef_status ef_metamer_set_farthest(const ef_metamer_set *set,
                                         const ef_metric *metric,
                                         const ef_conditions *conditions,
                                         ef_xyz from, ef_xyz *farthest_xyz,
                                         double *difference, ef_error *error);
/** The two metamers that differ most from each other: the standard is then not
 * known either. Looks at all pairs of boundary points first. */
EF_API ef_status ef_metamer_set_widest(const ef_metamer_set *set,
                                       const ef_metric *metric,
                                       const ef_conditions *conditions,
                                       int jobs, ef_xyz *standard,
                                       ef_xyz *sample, double *difference,
                                       ef_error *error);

#ifdef __cplusplus
}
#endif

#endif

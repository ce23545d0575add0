/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Stimuli that change the receptors they are meant to change and leave the
 * others alone: modulations of the primaries of a display, what other
 * observers and the code values make of them, frames in space and time, what
 * reaches the eye, and cautions.
 *
 * Amounts are shares of a primary's light at full drive, 0 to 1, in front of
 * the tone curve (ef_device_amount, ef_device_drive). The contrast of a
 * receptor is the change of its excitation over its excitation by the
 * background, with the display's black and the room light in both. Arrays of
 * receptors stand in the order of ef_receptor. */
#ifndef EVENFIELD_STIMULUS_H
#define EVENFIELD_STIMULUS_H

#include <evenfield/base.h>
#include <evenfield/device.h>
#include <evenfield/observer.h>

#ifdef __cplusplus
extern "C" {
#endif

/* ---- Receptors of a display's primaries --------------------------------- */

/** "L", "M", "S", "rod", "mel". Static. */
EF_API const char *ef_receptor_symbol(ef_receptor receptor);
/** By symbol, case ignored. EF_UNKNOWN_NAME lists the symbols. */
EF_API ef_status ef_receptor_find(const char *symbol, ef_receptor *out,
                                  ef_error *error);

/** A display as the receptors of one observer get it; owns its memory. */
typedef struct ef_stimulator ef_stimulator;

/** Of a display with spectra, whose amounts add. `luminance_weight` (3, may be
 * NULL): personal weights of L, M and S in luminance, as flicker photometry
 * gives them, for excitations by fundamentals of unit peak in energy units
 * (EF_CONES); only their ratios matter. NULL: k_l, k_m, 0 of CIE 170-2:2015
 * for the observer's cones. Where the cones are borrowed (ef_observer_cones_
 * borrowed) a note says so. The device and the observer must outlive it.
 * EF_NO_ANSWER for a device without spectra or one that reflects, EF_INVALID
 * for weights below zero. Free with ef_stimulator_free. */
EF_API ef_stimulator *ef_stimulator_new(const ef_device *device,
                                        const ef_observer *observer,
                                        const double *luminance_weight,
                                        const ef_notes *notes, ef_error *error);
EF_API void ef_stimulator_free(ef_stimulator *stimulator);
EF_API const ef_device *ef_stimulator_device(const ef_stimulator *stimulator);
EF_API const ef_observer *
ef_stimulator_observer(const ef_stimulator *stimulator);
EF_API size_t ef_stimulator_n_primaries(const ef_stimulator *stimulator);
/** Weights of L, M and S in luminance, scaled to a sum of 1; borrowed. */
EF_API const double *
ef_stimulator_luminance_weights(const ef_stimulator *stimulator);
/** Excitations by each primary at full drive without the black, EF_N_RECEPTORS
 * x n_primaries, in the units of ef_observer_weights; borrowed. */
EF_API const double *ef_stimulator_matrix(const ef_stimulator *stimulator);
/** Excitations at `amount[n_primaries]`, any reals. */
EF_API void ef_stimulator_excitations(const ef_stimulator *stimulator,
                                      const double *amount,
                                      double excitation[EF_N_RECEPTORS]);
/** Luminance at `amount` by the observer's own y_bar; NaN when the device's
 * spectra are not absolute. */
EF_API double ef_stimulator_luminance_cd_m2(const ef_stimulator *stimulator,
                                            const double *amount);

/* ---- Directions --------------------------------------------------------- */

/** What is wanted of a receptor. */
typedef enum ef_receptor_role {
  EF_RECEPTOR_IGNORED, /**< whatever comes of it */
  EF_RECEPTOR_SILENT,
  EF_RECEPTOR_CHANGED
} ef_receptor_role;

typedef enum ef_direction_kind {
  EF_DIRECTION_CONTRAST, /**< `contrast` of each receptor that changes */
  /** An angle in the isoluminant plane of DKL coordinates: 0 degrees red-green
   * (L up, M down, S silent), 90 degrees tritan (S up). */
  EF_DIRECTION_ISOLUMINANT,
  EF_DIRECTION_DKL,
  /** Steps of l_MB and s_MB at constant luminance, both of CIE 170-2:2015
   * whatever the personal weights. */
  EF_DIRECTION_MB
} ef_direction_kind;

/** Which receptors change, by how much in relation to each other, and which
 * must not. A plain value; fill it with ef_direction_parse or by hand. */
typedef struct ef_direction {
  ef_direction_kind kind;
  /** For other kinds than contrasts the cones' roles are those of the
   * direction, and only rods and melanopsin are looked at. */
  ef_receptor_role role[EF_N_RECEPTORS];
  double contrast[EF_N_RECEPTORS]; /**< where the role is changed */
  double angle_deg;                /**< EF_DIRECTION_ISOLUMINANT */
  double dkl[3];                   /**< achromatic, red-green, tritan */
  double mb[2];                    /**< steps of l_MB and s_MB */
} ef_direction;

/** Reads:
 * - receptors that change, by 1, or by the number behind `=`, with or without
 *   sign: `S`, `L,-M`, `L=0.1,M=-0.05,mel=0.2`. The other cones are silent,
 *   rods and melanopsin ignored;
 * - `luminance`: L, M and S by 1 each;
 * - `isoluminant red-green`, `isoluminant tritan`, `isoluminant:DEGREES`;
 * - `dkl:ACHROMATIC,RED-GREEN,TRITAN` (see ef_dkl_space);
 * - `macleod-boynton:L,S`, steps of l_MB and s_MB.
 * Case is ignored. EF_UNKNOWN_NAME or EF_INVALID name what is at fault. */
EF_API ef_status ef_direction_parse(const char *text, ef_direction *out,
                                    ef_error *error);
/** Gives `role` (silent or ignored) to the receptors of a list such as
 * `L,M,rod`. EF_INVALID for a receptor that is to change, and for cones where
 * the direction itself says what they do. */
EF_API ef_status ef_direction_set_role(ef_direction *direction,
                                       const char *list, ef_receptor_role role,
                                       ef_error *error);

/** Cone-opponent coordinates around a background (Derrington, Krauskopf &
 * Lennie, J. Physiol. 357 (1984) 241-265), linear in the contrasts of L, M, S.
 * Mechanisms: achromatic, the luminance contrast C_lum by the stimulator's
 * luminance weights; red-green, C_L - C_M; tritan, C_S - C_lum. Unit: each axis
 * is the stimulus that only its own mechanism sees, with a root of summed
 * squares of the three cone contrasts of 1 (as in Brainard 1996); achromatic
 * is L, M, S equally up, red-green has L up, tritan S up. */
typedef struct ef_dkl_space {
  double to_dkl[9];   /**< row-major, from contrasts of L, M, S */
  double from_dkl[9]; /**< columns: contrasts of the three axes */
} ef_dkl_space;
/** For the excitations of L, M, S by the background. EF_INVALID unless all are
 * above zero, EF_NO_ANSWER when only one of L and M has luminance weight, so
 * that no red-green axis is left. */
EF_API ef_status ef_dkl_space_make(const ef_stimulator *stimulator,
                                   const double excitation[3],
                                   ef_dkl_space *out, ef_error *error);

/** The direction at a background: roles, and the contrast that one unit along
 * it gives each receptor (0 where silent or ignored). Cones that the direction
 * leaves at zero are silent. EF_INVALID for a direction that changes nothing,
 * for numbers that are not finite, and for a receptor with a role that the
 * background does not excite. */
EF_API ef_status ef_direction_resolve(const ef_stimulator *stimulator,
                                      const ef_direction *direction,
                                      const double excitation[EF_N_RECEPTORS],
                                      ef_receptor_role role[EF_N_RECEPTORS],
                                      double contrast[EF_N_RECEPTORS],
                                      ef_error *error);

/* ---- Isolation ---------------------------------------------------------- */

typedef enum ef_background_rule {
  EF_BACKGROUND_GIVEN,
  /** Any amounts with the same L, M, S excitations as the given background
   * (a metamer of it; more than three primaries), chosen for the largest
   * contrast. */
  EF_BACKGROUND_SAME_CONES,
  /** Any amounts that give at least `least_share` of what all primaries at full
   * drive give, in luminance and in each receptor that changes: what the eye
   * is adapted to does not go dark for the sake of contrast. */
  EF_BACKGROUND_FREE
} ef_background_rule;

typedef enum ef_modulation {
  EF_SYMMETRIC, /**< background plus and minus the modulation */
  EF_PULSE      /**< background, and background plus the modulation */
} ef_modulation;

typedef struct ef_isolate_settings {
  ef_background_rule background_rule;
  double background[EF_MAX_DRIVES]; /**< amounts; not used when free */
  double least_share;               /**< above 0 to below 1; when free */
  ef_modulation modulation;
  /** How far to go along the direction, above 0; NaN: as far as the gamut
   * allows. */
  double contrast;
} ef_isolate_settings;

/** Background given, half of each primary; share 0.5; symmetric; NaN. */
EF_API ef_isolate_settings ef_isolate_settings_default(void);

/** A modulation of the primaries and what the receptors get of it. */
typedef struct ef_isolation {
  size_t n_primaries;
  ef_modulation modulation_kind;
  ef_receptor_role role[EF_N_RECEPTORS];
  double direction[EF_N_RECEPTORS];  /**< contrasts of one unit along it */
  double background[EF_MAX_DRIVES];  /**< amounts */
  double modulation[EF_MAX_DRIVES];  /**< amounts to add */
  double excitation[EF_N_RECEPTORS]; /**< by the background */
  double contrast[EF_N_RECEPTORS];   /**< of every receptor; NaN for one that
                                          the background does not excite */
  double pooled_contrast;            /**< root of summed squares over L, M, S */
  double along;                      /**< how far along the direction */
  double largest; /**< how far the gamut allows; the modulation for it
                       is this one times largest / along */
  /** Limits that hold the largest modulation: bit i for primary i at zero and
   * at full drive (ef_device_limit_name). */
  uint32_t held_low, held_high;
  double luminance_cd_m2;  /**< of the background; NaN unless absolute */
  double luminance_change; /**< contrast of luminance by the stimulator's
                                weights */
  /** Of the matrix from amounts to the contrasts that the directions fixes
   * (2-norm, dependent rows left out). Errors of the spectra grow by up to
   * this factor. */
  double condition_number;
  size_t n_controlled; /**< receptors that are to change or to stay silent */
  size_t rank;         /**< how many of them are independent */
} ef_isolation;

/** The modulation along `direction` and the largest that the gamut holds. With
 * as many primaries as receptors that are controlled, in closed form; with
 * more, by a linear programme for the largest contrast, of which any smaller
 * one is a part, so that contrast grows in proportion up to the edge.
 * Silent receptors get less than 1e-12.
 *
 * A background that is chosen is the middle of those for which the largest
 * contrast is largest, to a millionth. Where the direction itself depends on
 * the background (isoluminant, DKL and MacLeod-Boynton directions with a free
 * background) the choice is repeated until the direction agrees with the
 * background that comes of it, at most 30 times; that is a good background and
 * not always the best.
 *
 * EF_INVALID for a background outside the gamut or numbers that break the
 * settings' ranges. EF_NO_ANSWER when the primaries cannot separate the
 * receptors (the message has the rank, or a condition number above 6.7e7 with
 * which half of the digits are lost), and when the wanted contrast is above the
 * largest (which the message tells, with the limit by name). */
EF_API ef_status ef_isolate(const ef_stimulator *stimulator,
                            const ef_direction *direction,
                            const ef_isolate_settings *settings,
                            ef_isolation *out, ef_error *error);

/* ---- Other observers ---------------------------------------------------- */

/** What the members of a population get in one receptor, against what was
 * intended for it: 0 where it is silent, the contrast that was to be where it
 * changes, what the stimulator's observer gets where it is ignored. */
typedef struct ef_receptor_spread {
  double intended;
  double mean;   /**< contrast over the members */
  double rms;    /**< root mean square of contrast minus intended */
  double p95;    /**< 95th percentile of its absolute value, linear between
                      neighbouring members (place 0.95 (n - 1) of the sorted
                      values, counted from 0) */
  double worst;  /**< the largest absolute value */
  size_t member; /**< who gets that, for ef_population_member */
} ef_receptor_spread;

/** The modulation as a population gets it, each member against the background
 * as that member sees it: `out` by ef_receptor, and unless NULL all contrasts,
 * count x EF_N_RECEPTORS. Cones are those of the member's own fundamentals;
 * rods and melanopsin are carried to the member's ocular media, as for an
 * observer from a model. A receptor that a member does not have (S of a
 * tritanope) gets 0. Uses up to `jobs` threads (0: all cores), which changes
 * nothing. A note tells when the population looks at another field than the
 * stimulator's observer. */
EF_API ef_status ef_isolation_spread(const ef_stimulator *stimulator,
                                     const ef_isolation *isolation,
                                     const ef_population *population, int jobs,
                                     ef_receptor_spread out[EF_N_RECEPTORS],
                                     double *contrast, const ef_notes *notes,
                                     ef_error *error);

/** Like ef_isolate, at its background and contrast, but with the modulation
 * that leaves least in the silent receptors of a whole population: of all
 * modulations in gamut that give the stimulator's observer the wanted contrast
 * in the receptors that change, the one with the least mean over members of
 * the summed squares of the silent receptors' contrasts (and 1e-9 of the mean
 * square weight times the squared length of the modulation, which decides where
 * that is the same). A convex quadratic programme. The observer's own silent
 * receptors then get what `contrast` says; `largest` and its limits remain
 * those of ef_isolate. EF_INVALID when no receptor is silent. */
EF_API ef_status ef_isolate_robust(const ef_stimulator *stimulator,
                                   const ef_direction *direction,
                                   const ef_isolate_settings *settings,
                                   const ef_population *population, int jobs,
                                   ef_isolation *out, const ef_notes *notes,
                                   ef_error *error);

/* ---- Code values --------------------------------------------------------- */

typedef struct ef_codes_settings {
  int bits; /**< 1 to 16 */
  /** How much more an error of contrast counts in a receptor that is to be
   * silent than in one that changes; 1 or more. */
  double quiet_weight;
  /** The smallest step is one whose departure from the direction, in every
   * controlled receptor, is at most this share of its largest contrast; above
   * 0 to 1. */
  double step_purity;
} ef_codes_settings;

/** 8 bits, weight 10, purity 0.1. */
EF_API ef_codes_settings ef_codes_settings_default(void);

/** What the codes of a display make of a modulation. Contrasts are against the
 * background that the codes give. */
typedef struct ef_coded {
  int bits;
  uint32_t background[EF_MAX_DRIVES];      /**< nearest to the amounts wanted */
  uint32_t high[EF_MAX_DRIVES];            /**< background plus modulation */
  uint32_t low[EF_MAX_DRIVES];             /**< and minus it; for a pulse the
                                                background */
  double background_error[EF_N_RECEPTORS]; /**< of excitations, as a share of
                                                those wanted */
  double contrast_high[EF_N_RECEPTORS];
  double contrast_low[EF_N_RECEPTORS];
  double along_high, along_low; /**< least-squares distance along the direction
                                     in the receptors that change */
  double residual; /**< largest absolute contrast in a silent receptor, high or
                        low; 0 when none is silent */
  double rounded_residual; /**< the same with plainly rounded codes */
  /** The smallest step up from the background along the direction that was
   * found within 12 codes in each primary, and its codes; NaN when there is
   * none of the purity asked for. */
  double smallest_contrast;
  uint32_t smallest[EF_MAX_DRIVES];
  bool below_resolution; /**< the wanted contrast is below the smallest step, or
                              there is none */
} ef_coded;

/** Codes for the background and for the extremes of a modulation. Those of the
 * extremes are not rounded but searched for (Fincke & Pohst 1985): of all codes
 * the ones with the least sum of squared errors of contrast, silent receptors
 * counting `quiet_weight` times. Where there are more primaries than controlled
 * receptors, many codes are all but equal, and each code away from the wanted
 * amount counts besides, a twentieth of what one code changes. The search gives
 * up after 20000 places; it then has what is best so far. EF_INVALID for
 * settings outside their ranges. */
EF_API ef_status ef_isolation_codes(const ef_stimulator *stimulator,
                                    const ef_isolation *isolation,
                                    const ef_codes_settings *settings,
                                    ef_coded *out, ef_error *error);

/* ---- Waveforms ----------------------------------------------------------- */

typedef enum ef_waveform_kind {
  EF_WAVEFORM_STEADY, /**< 1 throughout */
  EF_WAVEFORM_SINUSOID,
  EF_WAVEFORM_SQUARE
} ef_waveform_kind;

/** A modulation in time. */
typedef struct ef_waveform {
  ef_waveform_kind kind;
  double frequency_hz; /**< above 0 unless steady */
  double phase_deg;    /**< 0: sine, rising through 0 at the start; square: up
                            from the start */
  double duty;         /**< of a square: share of the cycle that is up, between
                            0 and 1 */
  double duration_s;   /**< 0: a single frame that stands */
  double ramp_s;       /**< raised-cosine rise and fall at the ends, inside the
                            duration */
} ef_waveform;

/** Steady, 1 Hz, duty 0.5, a single frame, no ramps. */
EF_API ef_waveform ef_waveform_default(void);
/** "steady", "sinusoid", "square". Static. */
EF_API const char *ef_waveform_name(ef_waveform_kind kind);
EF_API ef_status ef_waveform_find(const char *name, ef_waveform_kind *out,
                                  ef_error *error);
/** Frames that the duration takes, to the nearest, at least 1. */
EF_API size_t ef_waveform_frames(const ef_waveform *waveform,
                                 double frame_rate_hz);
/** EF_INVALID names the number at fault; a frequency above half the frame rate
 * is one. A note tells when a cycle is not a whole number of frames. */
EF_API ef_status ef_waveform_check(const ef_waveform *waveform,
                                   double frame_rate_hz, const ef_notes *notes,
                                   ef_error *error);
/** The wave itself at a time, -1 to 1. */
EF_API double ef_waveform_at(const ef_waveform *waveform, double time_s);
/** Share that the ramps leave of it, 0 to 1; 0 before and after. 1 for a frame
 * that stands. */
EF_API double ef_waveform_ramp(const ef_waveform *waveform, double time_s);

/* ---- Frames ---------------------------------------------------------------
 */

/** Angles on a flat screen seen straight ahead from `distance_mm`: what lies x
 * from the middle is seen at atan(x / distance). */
EF_API double ef_degrees_to_pixels(double angle_deg, double distance_mm,
                                   double pixels_per_mm);
EF_API double ef_pixels_to_degrees(double pixels, double distance_mm,
                                   double pixels_per_mm);

typedef enum ef_pattern {
  EF_PATTERN_UNIFORM, /**< the whole frame */
  EF_PATTERN_DISC,
  EF_PATTERN_ANNULUS,
  EF_PATTERN_GRATING, /**< in a disc, or over the whole frame */
  EF_PATTERN_GABOR    /**< a grating in a Gaussian */
} ef_pattern;

/** "uniform", "disc", "annulus", "grating", "gabor". Static. */
EF_API const char *ef_pattern_name(ef_pattern pattern);
EF_API ef_status ef_pattern_find(const char *name, ef_pattern *out,
                                 ef_error *error);

typedef enum ef_dither {
  EF_DITHER_NONE, /**< each place has the codes that keep silent receptors
                       quiet (ef_isolation_codes; above 10 bits rounded ones) */
  /** Each primary is rounded up or down against a threshold that runs through
   * 64 values over 8 x 8 pixels and moves on by the golden section from frame
   * to frame, so that their mean is the amount wanted. */
  EF_DITHER_ORDERED
} ef_dither;

typedef struct ef_frame_settings {
  size_t width_px, height_px; /**< 1 to 32768 each */
  double distance_mm;         /**< from the eye to the screen */
  double pixels_per_mm;
  ef_pattern pattern;
  double size_deg;  /**< diameter of the disc or annulus at half its edge, of
                         the disc that a grating is cut to (0: not cut) */
  double hole_deg;  /**< inner diameter of the annulus */
  double edge_deg;  /**< width of the raised-cosine edges, centred on these */
  double sigma_deg; /**< standard deviation of a Gabor's Gaussian */
  double cycles_per_deg;
  double orientation_deg; /**< direction in which the grating changes,
                               counterclockwise; 0: to the right */
  double phase_deg;       /**< 0: a peak in the middle */
  double drift_hz;        /**< cycles a second that the grating moves in its
                               direction; negative: against it */
  double centre_x_deg, centre_y_deg; /**< right of and above the middle */
  ef_waveform waveform;
  double frame_rate_hz;
  int bits; /**< 8, 10 or 16 */
  ef_dither dither;
  uint64_t seed;     /**< of the thresholds */
  double most_bytes; /**< of all frames together, uncompressed */
} ef_frame_settings;

/** 1920 x 1080 pixels of 0.25 mm at 700 mm; a disc of 2 degrees with edges of
 * 0.2; 2 cycles a degree, sigma 0.5; the default waveform at 60 Hz; 8 bits, no
 * dithering, seed 1, 4e9 bytes. */
EF_API ef_frame_settings ef_frame_settings_default(void);

/** Frames of a modulation, made row by row; immutable, owns its memory. At each
 * place the modulation is multiplied by a level: window x ramp x w, with w the
 * grating times the waveform, and for a pulse (1 + w) / 2, so that it stays on
 * its side. A frame shows the waveform at the middle of its time. */
typedef struct ef_frames ef_frames;

/** The stimulator must outlive the frames. EF_INVALID for settings outside
 * their ranges, for a grating finer than two pixels a cycle in the middle, for
 * a frequency above half the frame rate, and for more bytes than allowed; each
 * message has the figure. Notes: a pattern that does not fit into the frame,
 * codes that are rounded. Free with ef_frames_free. */
EF_API ef_frames *ef_frames_new(const ef_stimulator *stimulator,
                                const ef_isolation *isolation,
                                const ef_frame_settings *settings,
                                const ef_notes *notes, ef_error *error);
EF_API void ef_frames_free(ef_frames *frames);
EF_API size_t ef_frames_count(const ef_frames *frames);
/** As given; borrowed until freed. */
EF_API const ef_frame_settings *ef_frames_settings(const ef_frames *frames);
/** Bytes of all frames, uncompressed: one a code for 8 bits, else two, with
 * primaries in pictures of three. */
EF_API double ef_frames_bytes(const ef_frames *frames);
/** Levels of row `y` (0: the top) of a frame, `width_px` values, -1 to 1. */
EF_API void ef_frames_levels(const ef_frames *frames, size_t frame, size_t y,
                             double *level);
/** Codes of that row, width_px x n_primaries, 0 to 2^bits - 1. */
EF_API void ef_frames_row(const ef_frames *frames, size_t frame, size_t y,
                          uint16_t *code);
/** A code as a 16-bit sample of a picture: 257 times one of 8 bits; ten bits in
 * the upper ten with the upper six repeated below; 16 bits as they are. */
EF_API uint16_t ef_code_to_sample(int bits, uint32_t code);

/** How much of the frame the pattern takes where its window is at least one
 * half. */
typedef struct ef_frame_area {
  double solid_angle_sr;
  /** The most of it in any circle of 10 degrees (on a lattice of at most 48 x
   * 48 blocks of the frame, rounded up by half a block). */
  double in_ten_deg_sr;
  double share_of_frame; /**< of its pixels */
  double frame_solid_angle_sr;
} ef_frame_area;
EF_API ef_frame_area ef_frames_area(const ef_frames *frames);

/** What dithering does to a modulation at full level. */
typedef struct ef_dither_effect {
  /** Contrast of the mean over 8 x 8 pixels and 16 frames against the mean of
   * the background over the same. */
  double contrast[EF_N_RECEPTORS];
  double residual;         /**< largest absolute one in a silent receptor */
  double rounded_residual; /**< the same with plainly rounded codes */
  /** Noise that the pixels pay for it: standard deviation of a pixel's contrast
   * in one frame. */
  double noise[EF_N_RECEPTORS];
} ef_dither_effect;

/** Measured on the codes that ef_frames_row would give. `bits` 8, 10 or 16. */
EF_API ef_status ef_isolation_dither(const ef_stimulator *stimulator,
                                     const ef_isolation *isolation, int bits,
                                     uint64_t seed, ef_dither_effect *out,
                                     ef_error *error);

/* ---- At the eye -----------------------------------------------------------
 */

typedef enum ef_pupil_formula {
  EF_PUPIL_GIVEN,
  EF_PUPIL_MOON_SPENCER,   /**< 4.9 - 3 tanh(0.4 lg L) */
  EF_PUPIL_STANLEY_DAVIES, /**< with the area of the adapting field */
  EF_PUPIL_WATSON_YELLOTT  /**< with age and the number of eyes besides */
} ef_pupil_formula;

/** "given", "moon-spencer", "stanley-davies", "watson-yellott". Static. */
EF_API const char *ef_pupil_name(ef_pupil_formula formula);
EF_API ef_status ef_pupil_find(const char *name, ef_pupil_formula *out,
                               ef_error *error);
/** The publication (constants of all three from memory). Static. */
EF_API const char *ef_pupil_source(ef_pupil_formula formula);

typedef struct ef_pupil {
  ef_pupil_formula formula;
  double diameter_mm; /**< when given, 1 to 10 */
  double age_years;   /**< 20 to 83, of Watson & Yellott */
  double field_deg2;  /**< area of the adapting field, square degrees */
  bool both_eyes;     /**< light in both; one eye counts a tenth */
} ef_pupil;

/** Watson & Yellott, 32 years, a disc of 2 degrees, both eyes. */
EF_API ef_pupil ef_pupil_default(void);
/** Diameter at a luminance above 0. EF_INVALID names the number at fault. */
EF_API ef_status ef_pupil_diameter(const ef_pupil *pupil,
                                   double luminance_cd_m2, double *diameter_mm,
                                   ef_error *error);

/** What reaches the eye of a uniform disc. */
typedef struct ef_retinal {
  double luminance_cd_m2;
  double pupil_diameter_mm, pupil_area_mm2;
  double photopic_td, scotopic_td; /**< trolands: luminance times area */
  ef_alpha_opic radiance;          /**< alpha-opic radiances (CIE S 026) */
  /** At the cornea, of the disc seen straight ahead: radiance times pi sin^2
   * of half its diameter. */
  double irradiance_w_m2[EF_N_RECEPTORS];
  double equivalent_d65_lx[EF_N_RECEPTORS]; /**< alpha-opic EDI */
} ef_retinal;

/** At `amount` of the primaries. EF_NO_ANSWER unless the device's spectra are
 * absolute. */
EF_API ef_status ef_retinal_measure(const ef_stimulator *stimulator,
                                    const double *amount, const ef_pupil *pupil,
                                    double field_diameter_deg,
                                    const ef_notes *notes, ef_retinal *out,
                                    ef_error *error);

/* ---- Cautions -------------------------------------------------------------
 */

/** The sentence that stands under every caution: these figures are no
 * clearance. Static. */
EF_API const char *ef_caution_deferral(void);

/** A place of the stimulus in time, where it changes most. */
typedef struct ef_flash_input {
  size_t n; /**< frames */
  double frame_rate_hz;
  const double *xyz;     /**< n x 3, CIE 1931, Y of the display's white = 1 */
  double white_cd_m2;    /**< luminance of that white; NaN: not known */
  double solid_angle_sr; /**< that changes together */
  double share_of_frame; /**< 0 to 1 */
  double in_ten_deg_sr;  /**< most of it in any circle of 10 degrees; 0: all */
  bool is_fine;          /**< a balanced pattern finer than 0.1 degree */
} ef_flash_input;

/** Flashes: pairs of opposing changes, the most in any second. All limits from
 * memory.
 * WCAG 2.3.1: changes of at least 0.10 of relative luminance with the darker
 * below 0.80; at most 3 in a second unless all together stay within 0.006 sr of
 * any field of 10 degrees. A balanced pattern of squares or stripes finer than
 * 0.1 degree does not count.
 * ITU-R BT.1702: changes of at least 20 cd/m2 where the darker is below 160,
 * above it those of a Michelson contrast of at least 1/17 (which is the same at
 * 160); at most 3 in a second over more than 25 % of the picture; more than 5
 * seconds of flashing may be a risk even so.
 * Saturated red (WCAG 2.2): changes of more than 0.2 in u'v' of which one side
 * has R / (R + G + B) of at least 0.8 in linear sRGB. */
typedef struct ef_flash {
  size_t n_general, n_television, n_red;
  bool has_luminance; /**< false: n_television is not known and 0 */
  double solid_angle_sr, share_of_frame, in_ten_deg_sr;
  bool is_fine;
  bool is_long; /**< there are flashes, and frames for more than 5 s */
  bool exceeds_general, exceeds_television, exceeds_red;
} ef_flash;

/** EF_INVALID without frames or for a colour that is not finite. */
EF_API ef_status ef_flash_count(const ef_flash_input *input, ef_flash *out,
                                ef_error *error);
/** Of frames: the place with the full window and the pattern's area. */
EF_API ef_status ef_frames_flash(const ef_frames *frames, ef_flash *out,
                                 ef_error *error);

/** Regular stripes, which may do harm without a flash (guidance for television
 * in the United Kingdom, from which ITU-R BT.1702 comes; from memory): more
 * than five light-dark pairs, the light ones of 50 cd/m2 or more, over more
 * than 40 % of the picture where they stand or drift, 25 % where they flicker
 * or reverse. Stripes count as discernible where the change from one to the
 * next would count as a flash (common practice, no source). */
typedef struct ef_stripes {
  double pairs;          /**< across the pattern at half its window; 0: none */
  bool has_luminance;    /**< false: the next three are not known, NaN, false */
  double light_cd_m2, dark_cd_m2;
  bool is_discernible;
  double share_of_frame;
  bool flickers;         /**< its contrast changes in time */
  bool exceeds;
} ef_stripes;

/** Of gratings and Gabors; of other patterns `pairs` is 0. */
EF_API ef_status ef_frames_stripes(const ef_frames *frames, ef_stripes *out,
                                   ef_error *error);

/** Blue-light hazard (IEC 62471:2006, ICNIRP 2013), with the weights B of the
 * built-in table "retinal-hazard" (from memory, supported by one published
 * worked value), 300 to 700 nm. */
typedef struct ef_blue_light {
  double radiance_w_m2_sr; /**< L_B */
  bool is_small;           /**< seen under less than 0.011 rad */
  double irradiance_w_m2;  /**< E_B, for a disc of that size */
  double exposure_s;
  double limit_s; /**< 1e6 J m-2 sr-1 / L_B, for small sources 100 J m-2 / E_B;
                       infinite below 100 W m-2 sr-1 (1 W m-2) */
  bool exceeds;   /**< exposure above the limit */
} ef_blue_light;

/** Of a spectral radiance in W sr-1 m-2 nm-1; one measurement held for all of
 * the exposure. */
EF_API ef_status ef_blue_light_measure(const ef_grid *grid,
                                       const double *radiance,
                                       double angular_subtense_rad,
                                       double exposure_s, ef_blue_light *out,
                                       ef_error *error);

enum { EF_MOST_CAUTIONS = 6, EF_CAUTION_TEXT = 400 };

/** Cautions in words, one a line: flashes, saturated red, stripes, blue light
 * where they apply (each may be NULL), and always, last, the deferral. Returns
 * how many. */
EF_API size_t ef_cautions(const ef_flash *flash, const ef_stripes *stripes,
                          const ef_blue_light *blue,
                          char text[EF_MOST_CAUTIONS][EF_CAUTION_TEXT]);

#ifdef __cplusplus
}
#endif

#endif

/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Pictures whose colours are known, and spectral images: read, judged,
 * converted and rendered row by row. */
#ifndef EVENFIELD_IMAGE_H
#define EVENFIELD_IMAGE_H

#include <evenfield/base.h>
#include <evenfield/colour.h>
#include <evenfield/device.h>
#include <evenfield/difference.h>
#include <evenfield/exchange.h>
#include <evenfield/observer.h>

#ifdef __cplusplus
extern "C" {
#endif

/* ---- Pictures with colours --------------------------------------------- */

/** What the tags of a picture say of its colours. */
typedef struct ef_picture_colours {
  ef_png_source source; /**< the tag that counts; EF_PNG_UNTAGGED: `assumed` */
  bool is_assumed;      /**< the settings' profile stands for the tags */
  char about[240];      /**< in words: "chunk sRGB: IEC 61966-2-1" ... */
} ef_picture_colours;

typedef struct ef_picture_settings {
  /** Taken in the place of the picture's own tags; NULL: the tags. Must outlive
   * the picture. */
  const ef_profile *assumed;
  ef_png_settings png;
} ef_picture_settings;
/** The picture's own tags. */
EF_API ef_picture_settings ef_picture_settings_default(void);

/** An open picture whose samples have a profile. */
typedef struct ef_picture ef_picture;

/** Opens a PNG picture and takes its colours from its tags in the order of PNG
 * third edition, 4.3: cICP, iCCP, sRGB, gAMA with cHRM; one that cannot be
 * followed (a curve that is not relative to a white, narrow range, a damaged
 * profile) gives way to the next, with a note. gAMA alone means the primaries
 * of ITU-R BT.709, cHRM alone the curve of IEC 61966-2-1, with a note. The video
 * curves of ITU-T H.273 (codes 1, 6, 14, 15) are shown per ITU-R BT.1886, as a
 * power of 2.4. EF_NO_ANSWER for a picture without tags, or with none that can
 * be followed: nothing is guessed. Free with ef_picture_free. */
EF_API ef_picture *ef_picture_open(const char *path,
                                   const ef_picture_settings *settings,
                                   ef_error *error);
EF_API ef_picture *ef_picture_from_bytes(const char *name, const void *bytes,
                                         size_t length,
                                         const ef_picture_settings *settings,
                                         ef_error *error);
EF_API void ef_picture_free(ef_picture *picture);
EF_API const ef_png_head *ef_picture_get_head(const ef_picture *picture);
EF_API const ef_picture_colours *
ef_picture_get_colours(const ef_picture *picture);
/** Borrowed. Its device values are the samples; of a grey profile there is one,
 * and a row has it three times. */
EF_API const ef_profile *ef_picture_get_profile(const ef_picture *picture);
/** ef_png_next_row. */
EF_API ef_status ef_picture_next_row(ef_picture *picture, uint16_t *sample,
                                     bool *has_row, ef_error *error);

/* ---- How many of which colour ------------------------------------------ */

/** The distinct colours of a picture, each with its count and its first pixel.
 * A picture with more than `most` of them is taken with fewer bits, from the
 * most significant, until there are no more than that. */
typedef struct ef_distinct ef_distinct;

/** The most colours that are told apart unless `most` says otherwise. */
enum { EF_DISTINCT_MOST = 1 << 21 };

/** Reads the picture to its end. `most` 0: EF_DISTINCT_MOST; at
 * least 8. Free with
 * ef_distinct_free. */
EF_API ef_distinct *ef_distinct_of(ef_picture *picture, size_t most,
                                   ef_error *error);
EF_API void ef_distinct_free(ef_distinct *distinct);
EF_API size_t ef_distinct_count(const ef_distinct *distinct);
EF_API size_t ef_distinct_pixels(const ef_distinct *distinct);
/** Bits of a sample that count, at most those of the picture. */
EF_API int ef_distinct_bits(const ef_distinct *distinct);
/** Colour i: its samples (0 to 1), how many pixels have it, and the first of
 * them. */
EF_API void ef_distinct_at(const ef_distinct *distinct, size_t i,
                           double sample[3], size_t *n_pixels, size_t *x,
                           size_t *y);
/** Index of the colour of a pixel of the picture; SIZE_MAX when no pixel had
 * it. */
EF_API size_t ef_distinct_find(const ef_distinct *distinct,
                               const uint16_t sample[3]);

/* ---- Conversion --------------------------------------------------------- */

typedef struct ef_picture_conversion {
  ef_intent intent;
  bool black_point_compensation;
  int bits; /**< 8 or 16 of the picture written; 0: 16 where the picture read
                 has 16, else 8 */
  int jobs;
  bool overwrite;
  const char *profile_name;      /**< for the iCCP chunk */
  const unsigned char *profile;  /**< bytes of the profile `to`, for iCCP */
  size_t profile_length;
} ef_picture_conversion;

/** Converts the rest of the picture to the RGB profile `to` and writes it as PNG
 * with that profile in its iCCP chunk. EF_NO_ANSWER for profiles of other
 * spaces: PNG holds RGB. Nothing is left behind on failure. */
EF_API ef_status ef_picture_convert(ef_picture *picture, const ef_profile *to,
                                    const char *path,
                                    const ef_picture_conversion *settings,
                                    ef_error *error);

/* ---- Maps of where ------------------------------------------------------ */

/** How far a pixel is off, in four classes by multiples of a unit. A map shows
 * the picture in pale grey, with lines over it that get denser from class to
 * class: none, one pixel in eight, in four, in two. It is read without colour
 * vision. */
enum { EF_MAP_CLASSES = 4 };
/** Class 0 to 3 of a size in units: up to 1, up to `EF_MAP_SECOND`, up to
 * `EF_MAP_THIRD`, above. */
enum { EF_MAP_SECOND = 3, EF_MAP_THIRD = 6 };
EF_API int ef_map_class(double units);
/** "no mark" "lines one pixel in eight" ... Static. */
EF_API const char *ef_map_class_text(int map_class);
/** Grey sample in 16-bit range of pixel x, y with lightness L* of the
 * picture. */
EF_API uint16_t ef_map_sample(int map_class, double L_star, size_t x,
                              size_t y);

/* ---- Spectral images ----------------------------------------------------- */

/** What the values of a cube are: `choice` unless that is EF_KIND_AUTO, else
 * what the header says, else, with a note, surfaces when the values of a line in
 * its middle lie in -0.02 to 2 and lights otherwise. */
EF_API ef_status ef_cube_find_kind(const ef_cube *cube, ef_kind_choice choice,
                                   const ef_notes *notes, ef_kind *kind,
                                   ef_error *error);

typedef struct ef_render_settings {
  ef_channel_role role; /**< EF_TRISTIMULUS or EF_CONES */
  ef_viewing viewing;
  int jobs; /**< threads, 0: all cores; results do not depend on it */
  const ef_notes *notes;
} ef_render_settings;
/** Tristimulus values; ef_viewing_default(illuminant). */
EF_API ef_render_settings
ef_render_settings_default(const ef_illuminant *illuminant);

/** Channel values of a spectral image, pixel after pixel along the lines. */
typedef struct ef_render ef_render;

/** Folds the observer's weights for the bands of the cube and gets ready to
 * read. Bands of which no channel gets more than 1e-12 of its weight (those
 * beyond what eyes see) are left out, with a note. The next pixels are read
 * while those before are in use, by a thread of its own unless `jobs` is 1.
 * The memory held does not depend on the size of the image
 * (ef_render_get_info). The cube must outlive it. Free with ef_render_free. */
EF_API ef_render *ef_render_new(const ef_cube *cube,
                                const ef_observer *observer,
                                const ef_render_settings *settings,
                                ef_error *error);
EF_API void ef_render_free(ef_render *render);
EF_API size_t ef_render_channels(const ef_render *render);

/** The next pixels, n x channels, borrowed until the next call; n = 0 at the
 * end. A pixel without data has NaN in all channels: one with the value that the
 * header says to ignore, or one that is not a number, in any band used. After an
 * error nothing more comes. */
EF_API ef_status ef_render_next(ef_render *render, size_t *n,
                                const double **value, ef_error *error);

typedef struct ef_render_info {
  size_t n_bands;          /**< that are used */
  double shortest_nm, longest_nm; /**< of those */
  size_t n_without_weight; /**< bands left out as no channel needs them */
  size_t bytes;            /**< that it holds for pixels */
  /* Of the pixels handed out so far: */
  size_t n_pixels;
  size_t n_ignored;        /**< with the ignored value */
  size_t n_not_numbers;    /**< NaN or infinite */
} ef_render_info;
EF_API ef_render_info ef_render_get_info(const ef_render *render);

/** Colours to codes of a published encoding. */
typedef struct ef_encoder ef_encoder;

/** `white` (Y > 0) becomes the encoding's white, by `adaptation`; `bits` 8 or
 * 16. Free with ef_encoder_free. */
EF_API ef_encoder *ef_encoder_new(const ef_encoding *encoding, ef_xyz white,
                                  ef_adaptation adaptation, int bits,
                                  ef_error *error);
EF_API void ef_encoder_free(ef_encoder *encoder);

/** How many colours lie outside an encoding. */
typedef struct ef_clipped {
  size_t n;        /**< by more than half a code in any channel */
  size_t n_bright; /**< of those, with a channel above full */
} ef_clipped;

/** n colours to n x 3 samples in 16-bit range (of 8 bits: codes times 257), each
 * the nearest code; what lies outside is clipped channel by channel, and
 * counted; NaN becomes black. `clipped` is added to. */
EF_API void ef_encoder_apply(const ef_encoder *encoder, size_t n,
                             const double *xyz, uint16_t *sample,
                             ef_clipped *clipped);

/** Renders what is left to a PNG picture in the encoder's encoding, tagged with
 * a matrix profile of it (iCCP) and, where ITU-T H.273 has code points for
 * primaries and curve, cICP. The picture is there whole or not at all. */
EF_API ef_status ef_render_write_png(ef_render *render,
                                     const ef_encoder *encoder,
                                     const char *path, bool overwrite,
                                     ef_clipped *clipped, ef_error *error);
/** The same as a cube of floats, a band each channel (ef_cube_out_open). */
EF_API ef_status ef_render_write_cube(ef_render *render, const char *path,
                                      bool overwrite, const char *description,
                                      ef_error *error);

/* ---- Two pictures -------------------------------------------------------- */

typedef struct ef_comparison_settings {
  const ef_metric *metric; /**< must outlive the comparison */
  double jnd;              /**< pixels above it are counted */
  double tolerance;        /**< and above this */
  int jobs;                /**< threads, 0: all cores */
} ef_comparison_settings;
/** Tolerance of one JND, all cores. */
EF_API ef_comparison_settings
ef_comparison_settings_default(const ef_metric *metric, double jnd);

/** Two pictures of one size while they are compared, pixel by pixel. */
typedef struct ef_comparison ef_comparison;

/** Both pictures, borrowed, are read from here on, row by row; memory does not
 * grow with their height. Their colours go to the connection space by relative
 * intent, each white to D50, and the metric's differences are those seen against
 * it. EF_MALFORMED for pictures of two sizes. Free with ef_comparison_free. */
EF_API ef_comparison *ef_comparison_new(ef_picture *reference,
                                        ef_picture *sample,
                                        const ef_comparison_settings *settings,
                                        ef_error *error);
EF_API void ef_comparison_free(ef_comparison *comparison);
/** The differences of the next row, borrowed until the next call; NULL behind
 * the last one. NaN where a formula is not defined. */
EF_API ef_status ef_comparison_next_row(ef_comparison *comparison,
                                        const double **difference,
                                        ef_error *error);

/** Of the rows read so far, which come in bands: after the last row, all. */
typedef struct ef_comparison_totals {
  double jnd, tolerance;
  size_t n_pixels;    /**< with a difference */
  size_t n_undefined; /**< without */
  size_t n_above_jnd, n_above_tolerance;
  double mean, largest;
  size_t largest_x, largest_y; /**< the first pixel with it, from 0 */
} ef_comparison_totals;
EF_API ef_comparison_totals
ef_comparison_get_totals(const ef_comparison *comparison);
/** Quantile p (0 to 1) of the differences, to 0.05 % of its value; NaN when
 * there are none. */
EF_API double ef_comparison_quantile(const ef_comparison *comparison, double p);
/** All differences, from the smallest, to 0.05 % of their value: how many pixels
 * have each. `cursor` starts at 0; false at the end. */
EF_API bool ef_comparison_next_cell(const ef_comparison *comparison,
                                    size_t *cursor, double *value,
                                    size_t *n_pixels);

#ifdef __cplusplus
}
#endif

#endif

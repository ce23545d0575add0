/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * The options of all commands: one table drives parsing, checks, help and the
 * nearest names. */
#ifndef COMMAND_OPTION_H
#define COMMAND_OPTION_H

#include <stdbool.h>
#include <stddef.h>
#include <stdio.h>

#include "exit.h"
#include "kept.h"

/** Commands, as bits of the sets in which options are known. */
typedef enum command_bit {
  COMMAND_DESCRIBE = 1,
  COMMAND_MATCH = 2,
  COMMAND_SWATCH = 4,
  COMMAND_TABLES = 8,
  COMMAND_ELLIPSE = 16,
  COMMAND_OBSERVER = 32,
  COMMAND_COMPARE = 64,
  COMMAND_PANEL = 128,
  COMMAND_ISOLATE = 256,
  COMMAND_PROFILE = 4096,
  COMMAND_IMAGE = 8192
} command_bit;

typedef enum output_format {
  FORMAT_TEXT,
  FORMAT_CSV,
  FORMAT_JSON,
  FORMAT_CGATS /**< of match and profile convert */
} output_format;

/** Values of an option that may be given more than once. */
typedef struct text_list {
  size_t n;
  const char **text; /**< owned; the texts are those of argv */
} text_list;

/** Options as they were given, in their order; `value` NULL for a flag. */
typedef struct given_options {
  size_t n;
  const char **name, **value; /**< owned; the texts are those of argv */
} given_options;

/** What was asked for. Texts are NULL, numbers NaN and integers -1 when not
 * given, unless option.c states a default. The format of `observer`, whose
 * default depends on what it is asked for, is -1 when not given. */
typedef struct command_options {
  const char *display, *inks, *tone, *observer, *illuminant, *metric,
      *adaptation;
  const char *ambient_illuminant, *pictures, *output, *ages, *chart, *report;
  const char *space, *contrast_from, *surround;
  const char *jnd_text, *criterion, *tolerance_text; /**< of compare, ellipse */
  const char *pairs, *task, *correction, *angle_weights;
  const char *change, *silence, *ignore, *background; /**< of isolate */
  const char *luminance_weights, *pupil, *frames, *replay;
  const char *frame_size, *centre;
  double contrast, exposure_s, size_deg;
  /* Of frames. */
  double cycles_per_deg, hole_deg, edge_deg, sigma_deg, orientation_deg;
  double phase_deg, drift_hz, distance_mm, pixels_per_mm, frame_rate_hz;
  double frequency_hz, time_phase_deg, duty, duration_s, ramp_s, most_gb;
  double step_percent, yule_nielsen, black_percent; /**< of inks */
  const char *colourants, *weighed, *base, *use, *substrate;
  double total_loading, film, refractive_index; /**< of colourants */
  double batch_g, step_g;
  int aim;      /**< a recipe_aim */
  int specular; /**< 0 included, 1 excluded */
  bool single_constant;
  const char *profile; /**< of match and swatch */
  const char *assume, *data; /**< of image */
  double white_level;        /**< likewise */
  const char *from, *to, *intent, *description; /**< of profile */
  bool scale_black;                             /**< likewise */
  double ambient_lux, reflectance, luminance_cd_m2, jnd, tolerance, device_max;
  double magnification; /**< of ellipses on a chart */
  double lightness;     /**< of a section of the gamut on a chart */
  double size, steps, white_cd_m2, background_Y;
  double exponent, spread, batch_sd, samples;
  const char *exponent_text, *save; /**< of panel, as what follows */
  const char *levels;               /**< how many, or a file */
  double lapse, expected_jnd, other_jnd, precision, false_alarms, most;
  int model;                          /**< an ef_shape, -1 not given */
  int axis;                           /**< an ef_axis */
  int intervals;                      /**< an ef_interval_method */
  double population, seed, field_deg; /**< the first two are whole */
  int kind;                           /**< 0 surface, 1 light, -1 not given */
  int figure;                         /**< of enum ellipse_figure */
  int basis;                          /**< of enum ellipse_basis */
  int seen_by;                        /**< EF_PROTANOPE - 1 ..., -1 not given */
  int units;                          /**< an ef_cone_units */
  int modulation;                     /**< an ef_modulation */
  int plane;                          /**< a diagram_plane, -1 not given */
  int pattern;     /**< an ef_pattern, -1 not given */
  int time_course; /**< an ef_waveform_kind, -1 not given */
  int dither;      /**< an ef_dither */
  int format;
  int bits;       /**< of isolate */
  int match_bits; /**< of match and swatch; -1: what the device has */
  int swatch_bits, jobs, categories;
  const char *part;     /**< K/N; of describe, match, compare */
  const char *boundary; /**< where its points go */
  bool skip_bad, check, worst_case, grade_simulators, robust, force, quiet;
  bool help, version;
  text_list at, lights, observers;
  const char *command; /**< its name */
  command_bit bit;
  size_t n_arguments;
  char *const *arguments; /**< what followed the name */
  size_t n_files;
  const char **files; /**< owned; the texts are those of argv */
  given_options given;
  kept_files *kept; /**< borrowed; NULL: files are read as they come */
} command_options;

/** Reads the arguments after the command's name. EXIT_DONE, or EXIT_USAGE with
 * the message already written. Free with options_free in both cases. */
exit_code options_parse(command_options *options, const char *command,
                        command_bit bit, int argc, char *const *argv);
void options_free(command_options *options);
/** Calls `take` with every argument that may name a file to be read: operands,
 * and values of options that are texts and name no output. */
void options_each_input(const command_options *options,
                        void (*take)(void *cookie, const char *value),
                        void *cookie);
/** The options a command knows, one a line with its meaning. */
void options_help(FILE *out, command_bit bit);

#endif

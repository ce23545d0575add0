/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * How well a profile describes its device: what `profile check` tells, and
 * `profile make` of what it has made. */
#ifndef COMMAND_PROFILE_FIT_H
#define COMMAND_PROFILE_FIT_H

#include <evenfield/difference.h>

#include "display.h"
#include "profile_file.h"
#include "rows.h"
#include "tally.h"

/** Differences as the options want them. */
typedef struct measure {
  ef_metric *metric; /**< owned */
  double jnd;
  ef_jnd published; /**< of the metric */
  bool own_jnd;     /**< --jnd, not the published one */
  double tolerance; /**< --tolerance, else one JND */
} measure;

/** --metric, --jnd and --tolerance. Free with measure_free in every case. */
ef_status measure_load(measure *m, const command_options *options,
                       ef_error *error);
void measure_free(measure *m);
/** The line of "What this rests on" that tells it. */
void measure_label(const measure *m, text *out);

/** One row of measurements against the profile. */
typedef struct fit_row {
  ef_xyz measured, predicted, white;
  double difference;
  ef_components components; /**< the profile's less the measured colour */
} fit_row;

typedef struct profile_fit {
  const command_options *options;
  const char *path; /**< of the profile */
  ef_profile *profile;
  ef_profile_info info;
  ef_profile_settings settings;
  measure measure;
  const char *source; /**< file of the measurements; NULL: none */
  bool from_model;    /**< the rows are the display's model, not measured */
  bool has_names;     /**< of the file */
  const char *about;  /**< "X,Y,Z" ... of the measurements; static */
  rows rows;
  fit_row *row; /**< rows.n; NULL without measurements */
  tally tally;
  size_t n_beyond; /**< the tolerance */
  /* Of `make`: */
  bool is_made;
  display display;
  size_t n_bytes;
} profile_fit;

/** `profile check PROFILE [MEASUREMENTS]`. Free with profile_fit_free in every
 * case. */
ef_status profile_check_load(profile_fit *f, const command_options *options,
                             const ef_notes *notes, ef_error *error);
/** `profile make`: the profile of --display, its bytes too (free with free()).
 */
ef_status profile_make_load(profile_fit *f, const command_options *options,
                            const ef_notes *notes, unsigned char **bytes,
                            ef_error *error);
void profile_fit_free(profile_fit *f);
/** True when --check finds something out of tolerance. */
bool profile_fit_fails(const profile_fit *f);

#endif

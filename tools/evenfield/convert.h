/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * `profile convert` of a list of colours: rows of a file from a profile, or
 * from the colours they are, to another profile or to X, Y, Z or L*, a*, b*. */
#ifndef COMMAND_CONVERT_H
#define COMMAND_CONVERT_H

#include "colours.h"
#include "profile_fit.h"

typedef enum convert_to {
  CONVERT_TO_DEVICE,
  CONVERT_TO_XYZ,
  CONVERT_TO_LAB
} convert_to;

typedef struct conversion {
  const command_options *options;
  const char *file;
  measure measure;
  ef_profile_settings settings;
  ef_profile *from, *to; /**< NULL: colours */
  ef_profile_info from_info, to_info;
  convert_to target;
  ef_reader *reader;
  ef_content content; /**< of the file, as far as it is used */
  colours colours;
  ef_observer *observer;
  ef_illuminant *illuminant; /**< of the file's colours */
  double adapt[9];           /**< from it to D50 */
  bool is_light;
  ef_transform *convert, *asked, *given; /**< the last two NULL: no judgement */
  size_t n_in, n_out;
  const char *in_name[EF_MAX_DRIVES], *out_name[EF_MAX_DRIVES];
} conversion;

/** One colour. */
typedef struct converted {
  const char *name;
  size_t line;
  double in[EF_MAX_DRIVES], out[EF_MAX_DRIVES];
  double
      difference; /**< of what comes out from what was asked; NaN: not told */
} converted;

typedef struct convert_summary {
  size_t n, n_skipped;
  size_t n_judged, n_noticed, n_beyond; /**< above a JND, the tolerance */
  double mean, worst;
  char worst_name[200];
} convert_summary;

/** Who receives the rows. */
typedef struct convert_sink {
  void *self;
  ef_status (*rows)(void *self, const conversion *c, size_t n,
                    const converted *row, ef_error *error);
} convert_sink;

/** Free with conversion_free in every case. */
ef_status conversion_load(conversion *c, const command_options *options,
                          const ef_notes *notes, ef_error *error);
void conversion_free(conversion *c);
ef_status conversion_stream(conversion *c, const convert_sink *sink,
                            convert_summary *sum, ef_error *error);

/** --to. `out` stays NULL for xyz and lab. */
ef_status convert_target(const char *name, convert_to *target, ef_profile **out,
                         ef_error *error);

#endif

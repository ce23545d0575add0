/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * --jnd, --criterion, --exponent and --spread: the just-noticeable difference
 * that predictions start from. */
#ifndef COMMAND_JND_H
#define COMMAND_JND_H

#include <evenfield/difference.h>
#include <evenfield/exchange.h>

#include "option.h"
#include "text.h"

#define JND_ROOM 128

typedef struct jnd {
  bool is_known; /**< false: none is published for the metric */
  bool is_own;   /**< from --jnd */
  bool spread_is_assumed;
  ef_jnd_record record;
  char criterion[JND_ROOM]; /**< "75%" or what was typed */
  char published[JND_ROOM]; /**< criterion of the published one in words */
  char converted[JND_ROOM]; /**< "0.8, at which ", to go before that */
} jnd;

/** The formula: --metric, else the one of a record that --jnd names, else
 * CIEDE2000. Free with ef_metric_free. NULL and the error else. */
ef_metric *jnd_metric(const command_options *options, const ef_notes *notes,
                      ef_error *error);
/** --jnd VALUE, VALUE:CRITERION or a file with a record (columns metric, value,
 * criterion, and exponent, observer_log_sd, low, high, n_observers, source
 * where they are known), else the published one, which is not known for every
 * metric. Converted to --criterion when that is given. */
ef_status jnd_load(const command_options *options, const ef_metric *metric,
                   const ef_notes *notes, jnd *out, ef_error *error);

/** Says what was assumed: the published JND with its source, how people
 * differ. */
void jnd_note(const jnd *j, const ef_metric *metric, const ef_notes *notes);

/** "0.8 Delta E*00: 50 % of observers see it (...)": value, criterion and
 * source. */
void jnd_add(text *out, const jnd *j, const ef_metric *metric);
/** A record as the table that --jnd reads; `criterion` in the words of
 * ef_criterion_find. */
void jnd_write_csv(ef_csv *csv, const ef_jnd_record *record,
                   const char *criterion);
/** The same as an object of the document. */
void jnd_write(ef_json *json, const jnd *j);

#endif

/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * A folder of split fields and a sheet of all. */
#ifndef COMMAND_PICTURES_H
#define COMMAND_PICTURES_H

#include <evenfield/picture.h>

#include "match.h"

/** Most pairs that are drawn. */
#define PICTURES_MOST 1000

/** One pair; `file` is its picture's path once that is written. */
typedef struct picture_pair {
  char *name, *file;
  ef_xyz target, match;
  bool shown;
  double difference;
  /* What is drawn: the above, or with --seen-by as a dichromat sees it. */
  ef_swatch drawn;
} picture_pair;

/** For whom and on what the colours are. */
typedef struct picture_eyes {
  const ef_observer *observer;
  ef_xyz white;
  const ef_metric *metric;
  double jnd; /**< NaN: not known */
} picture_eyes;

typedef struct pictures {
  const char *folder;
  const ef_notes *notes;
  size_t n, room;
  picture_pair *pair;
  char *sheet;      /**< path of the sheet */
  size_t n_clipped; /**< halves outside the pictures' own encoding */
  bool labelled;
} pictures;

/** Into `folder`, with notes about what could not be drawn. */
pictures pictures_new(const char *folder, const ef_notes *notes);
void pictures_free(pictures *p);
/** Copies the name. EF_INVALID beyond PICTURES_MOST. */
ef_status pictures_add(pictures *p, const char *name, ef_xyz target,
                       ef_xyz match, bool shown, double difference,
                       ef_error *error);
/** Draws all of them. Refuses before it draws when a file is there that may not
 * be overwritten. */
ef_status pictures_write(pictures *p, const picture_eyes *eyes,
                         const command_options *options, ef_error *error);
/** EF_NO_ANSWER for colours of two dimensions, which are no colours to those
 * who look at pictures. */
ef_status pictures_check(const ef_observer *observer, ef_error *error);

/** A sink that collects a pair for every target and draws at the end. */
match_sink pictures_sink(pictures *p);

#endif

/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What dichromats and anomalous trichromats see of matches that were made for
 * somebody else; for reports. */
#ifndef COMMAND_OTHER_EYES_H
#define COMMAND_OTHER_EYES_H

#include "match.h"
#include "report.h"

/** The mean eye, three dichromats, two anomalous trichromats. */
enum { OTHER_EYES = 6, OTHER_EYES_MOST_ROWS = 24 };

typedef struct other_eyes_row {
  char name[128];
  double difference[OTHER_EYES], worst;
} other_eyes_row;

typedef struct other_eyes {
  ef_population *population[OTHER_EYES]; /**< of one; owned */
  ef_crowd *crowd[OTHER_EYES];           /**< owned; NULL before any block */
  size_t n_seen, n_within[OTHER_EYES];   /**< of all targets: within a JND */
  size_t n_rows; /**< those of the largest differences, in their order */
  other_eyes_row row[OTHER_EYES_MOST_ROWS];
} other_eyes;

void other_eyes_free(other_eyes *e);
/** Looks at a block; nothing without spectra, or for an observer of two
 * dimensions. */
ef_status other_eyes_look(other_eyes *e, const match_scene *s,
                          const match_rows *rows, ef_error *error);
/** A section of the page; none when nothing was looked at. */
void other_eyes_report(const other_eyes *e, const match_scene *s,
                       const report *page);

#endif

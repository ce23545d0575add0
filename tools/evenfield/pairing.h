/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Which sample is held against which standard, block by block. */
#ifndef COMMAND_PAIRING_H
#define COMMAND_PAIRING_H

#include "judge.h"

/** Receives a block of pairs; their finishes are good during the call. */
typedef struct pairing_sink {
  void *self;
  ef_status (*block)(void *self, size_t n, const pair *pairs, ef_error *error);
} pairing_sink;

/** All pairs of the scene, in the order of the batch (or of the list), then the
 * standards without a sample. Sets `pairing` of the scene where the standards
 * decide it. */
ef_status pairing_stream(compare_scene *s, const pairing_sink *sink,
                         ef_error *error);

#endif

/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * An invented display of three to eight narrow primaries for tests, some 300
 * cd/m2 at full drive, and its stimulator. */
#ifndef EVENFIELD_TESTS_INVENTED_STIMULATOR_H
#define EVENFIELD_TESTS_INVENTED_STIMULATOR_H

#include <evenfield/stimulus.h>

typedef struct invented {
  ef_device *device;
  ef_observer *observer;
  ef_stimulator *stimulator;
} invented;

/** Absolute spectra on the grid of invented_grid, with a faint black; primaries
 * "blue", "green", "red", "cyan", "amber", "violet", "deep red", "teal"; power
 * 2.2. Fails the test on any error. */
ef_device *invented_primaries(size_t n);

/** The same seen by `observer`; release with invented_free. */
invented invented_new(size_t n, const char *observer);
void invented_free(invented *i);

/** A direction of ef_direction_parse with receptors to silence besides ("" for
 * none). */
ef_direction invented_direction(const char *text, const char *silent);

/** Pixels of 0.5 mm seen from 1 m, so that 200 x 120 are 5.72 x 3.44
 * degrees. */
ef_frame_settings invented_frame(size_t width_px, size_t height_px);

/** Frames along `way`; free with ef_frames_free. Fails the test on any
 * error. */
ef_frames *invented_frames(const invented *i, const ef_isolation *way,
                           const ef_frame_settings *settings);

#endif

/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Objects that a test cannot go on without: each call fails the test with the
 * library's words, and the caller frees what it gets. */
#ifndef EVENFIELD_TESTS_MUST_H
#define EVENFIELD_TESTS_MUST_H

#include <evenfield/match.h>

#include "near.h"

static inline ef_observer *must_observer(const char *name) {
  ef_error error;
  ef_observer *const observer = ef_observer_new(name, &error);
  if (observer == NULL)
    fail_msg("%s", error.message);
  return observer;
}

/** `device` seen by `observer`, under what a setup takes by default. */
static inline ef_setup *must_setup(const ef_device *device,
                                   const ef_observer *observer) {
  ef_error error;
  ef_setup *const setup = ef_setup_new(device, observer, NULL, NULL, &error);
  if (setup == NULL)
    fail_msg("%s", error.message);
  return setup;
}

/** Tristimulus weights of samples on `grid`, linear between them. */
static inline ef_weights *must_weights(const ef_look *look,
                                       const ef_grid *grid) {
  ef_error error;
  ef_viewing viewing = look->viewing;
  viewing.interpolation = EF_INTERPOLATE_LINEAR;
  ef_weights *const weights = ef_observer_weights(
      look->observer, EF_TRISTIMULUS, grid, &viewing, NULL, &error);
  if (weights == NULL)
    fail_msg("%s", error.message);
  return weights;
}

/** Under D65, adapted by Bradford, on all processors. */
static inline ef_gamut must_gamut(const ef_setup *setup) {
  ef_gamut out;
  ef_error error;
  ef_illuminant *const d65 = ef_illuminant_new("D65", NULL);
  if (ef_gamut_measure(setup, d65, EF_ADAPT_BRADFORD, 0, &out, &error) != EF_OK)
    fail_msg("%s", error.message);
  ef_illuminant_free(d65);
  return out;
}

#endif

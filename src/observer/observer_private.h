/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What an observer holds, for the files that make one. */
#ifndef EVENFIELD_OBSERVER_PRIVATE_H
#define EVENFIELD_OBSERVER_PRIVATE_H

#include <evenfield/observer.h>

/** Channels on the standard grid. */
typedef struct ef__channel_set {
  size_t count;
  const char *const *name; /**< static */
  double *value;           /**< count x samples of the standard grid */
} ef__channel_set;

/** One block of memory, released with free(). */
struct ef_observer {
  char *name;
  char *about;
  double field_deg;
  double k_m;
  bool cones_borrowed;
  ef_mb_scale mb_scale;
  ef__channel_set set[2]; /**< by ef_channel_role */
};

/** x_bar, y_bar, z_bar and l_bar, m_bar, s_bar. */
extern const char *const ef__tristimulus_names[3];
extern const char *const ef__cone_names[3];

/** An observer with room for its texts (copied) and three channels of each
 * role, all zero; the rest is to be filled. NULL without memory. */
ef_observer *ef__observer_allocate(const char *name, const char *about,
                                   ef_error *error);

/** Number and names of the tabulated observers (cmf.c). */
size_t ef__tabulated_names(const char *const **names);
/** The i-th of them. */
ef_observer *ef__tabulated_new(size_t i, ef_error *error);

#endif

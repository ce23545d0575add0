/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What a population keeps. */
#ifndef EVENFIELD_POPULATION_PRIVATE_H
#define EVENFIELD_POPULATION_PRIVATE_H

#include "observer/model_private.h"

/** One block of memory, released with free(). Members are not kept but drawn
 * when they are asked for, unless they were chosen from another population. */
struct ef_population {
  ef_population_settings settings; /* its two arrays are not used */
  size_t n_ages;
  double *age_years;    /* n_ages */
  double *cumulative;   /* n_ages: share up to and with this row; last is 1 */
  ef_cone_model *member; /* settings.count when chosen, else NULL */
  ef__field field;
};

#endif

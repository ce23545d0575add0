/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "worst_case.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>

#define NONE ((double)NAN)

static size_t looks_with_other(const looks *l) {
  return l->n + (l->has_other ? 1 : 0);
}

size_t worst_case_count(const looks *l, const finish *standard) {
  return standard->n * looks_with_other(l);
}

static ef_look look_of(const look *l) {
  return (ef_look){l->observer, ef_viewing_default(l->illuminant)};
}

static ef_xyz xyz_under(const specimen *at, size_t k) {
  return (ef_xyz){at->xyz[3 * k], at->xyz[3 * k + 1], at->xyz[3 * k + 2]};
}

/* A standard without metamers, or one that no surface has (fluorescence), is an
 * answer. */
static ef_status find_one(const looks *l, const specimen *standard, size_t k,
                          const ef_metric *metric, bool keeps_set, int jobs,
                          worst_case *out, ef_error *error) {
  *out = (worst_case){.angle_deg = standard->angle_deg};
  if (k == 0)
    return EF_OK;
  const ef_look reference = look_of(&l->at[0]), test = look_of(&l->at[k]);
  const ef_xyz xyz = xyz_under(standard, 0);
  out->standard = xyz_under(standard, k);
  const ef_metamer_settings settings = ef_metamer_settings_default();
  ef_metamer_set *set =
      ef_metamer_set_new(1, &reference, &xyz, &test, &settings, jobs, error);
  ef_status status = set == NULL ? error->status : EF_OK;
  if (status == EF_OK) {
    ef_xyz farthest;
    out->volume_lab = ef_metamer_set_body(set).volume_lab;
    status = ef_metamer_set_farthest(set, metric, &l->at[k].conditions,
                                     out->standard, &farthest, &out->difference,
                                     error);
  }
  if (keeps_set && status == EF_OK)
    out->set = set;
  else
    ef_metamer_set_free(set);
  if (status == EF_OK || status == EF_NO_MEMORY)
    return status;
  out->difference = out->volume_lab = NONE;
  snprintf(out->reason, sizeof out->reason, "%.199s", error->message);
  return EF_OK;
}

ef_status worst_case_find(const looks *l, const finish *standard,
                          const ef_metric *metric, bool keeps_sets, int jobs,
                          worst_case *out, ef_error *error) {
  const size_t n = looks_with_other(l);
  ef_status status = EF_OK;
  for (size_t a = 0; a < standard->n && status == EF_OK; ++a) {
    for (size_t k = 0; k < n && status == EF_OK; ++k) {
      status = find_one(l, &standard->at[a], k, metric, keeps_sets, jobs,
                        &out[a * n + k], error);
    }
  }
  return status;
}

void worst_case_free(worst_case *all, size_t n) {
  for (size_t i = 0; i < n; ++i)
    ef_metamer_set_free(all[i].set);
  free(all);
}

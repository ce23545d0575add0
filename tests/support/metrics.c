/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "metrics.h"

#include "near.h"

static const char *const with_parameters[] = {
    "ciede2000:kl=2,kc=1.5,kh=0.8", "cie94:textiles", "cmc:1:1",
    "din99o:ke=0.7,kch=1.3", "cam16-ucs:scd", "cam02-ucs:lcd",
};
enum { N_MORE = sizeof with_parameters / sizeof *with_parameters };

size_t every_metric_count(void) {
  return ef_metric_count() + N_MORE;
}

const ef_metric *every_metric(size_t i) {
  static ef_metric *more[N_MORE];
  if (i < ef_metric_count())
    return ef_metric_at(i);
  i -= ef_metric_count();
  assert_true(i < N_MORE);
  if (more[i] == NULL) {
    more[i] = ef_metric_new(with_parameters[i], NULL);
    assert_non_null(more[i]);
  }
  return more[i];
}

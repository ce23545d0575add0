/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "residuals.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "message.h"
#include "rows.h"
#include "words.h"

double residuals_difference(const ef_metric *metric, ef_xyz white, ef_xyz a,
                            ef_xyz b) {
  const ef_conditions conditions = ef_conditions_default(white);
  double p[3], q[3];
  ef_metric_coordinates(metric, a, &conditions, p);
  ef_metric_coordinates(metric, b, &conditions, q);
  return ef_metric_difference(metric, p, q);
}

ef_status residuals_of(residuals *out, const ef_metric *metric, size_t n,
                       const ef_residual *residual, const rows *r,
                       ef_error *error) {
  *out = (residuals){.n = n, .n_drives = r->n_device};
  double *difference = malloc((n + 1) * sizeof *difference);
  if (difference == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for residuals");
  for (size_t i = 0; i < n; ++i) {
    const ef_residual *x = &residual[i];
    difference[i] =
        residuals_difference(metric, x->white, x->measured, x->predicted);
    out->mean += difference[i] / (double)n;
    if (i > 0 && difference[i] <= out->worst)
      continue;
    out->worst = difference[i];
    out->worst_line = r->line[x->row];
    if (r->n_device == 0)
      snprintf(out->worst_name, sizeof out->worst_name, "%s", r->name[x->row]);
    if (r->n_device == 0)
      continue;
    memcpy(out->worst_drive, r->device + x->row * r->n_device,
           r->n_device * sizeof *r->device);
  }
  if (n > 0)
    out->p95 = ef_quantile(n, difference, 0.95);
  free(difference);
  return EF_OK;
}

void residuals_add(text *t, const residuals *r, const ef_metric *metric) {
  char mean[EF_NUMBER_TEXT], p95[EF_NUMBER_TEXT], worst[EF_NUMBER_TEXT];
  words_amount(r->mean, mean);
  words_amount(r->p95, p95);
  words_amount(r->worst, worst);
  text_format(t,
              "by %s %s on average, 95 %% of them by less than %s, at worst by "
              "%s (",
              mean, ef_metric_symbol(metric), p95, worst);
  if (r->n_drives == 0)
    text_format(t, "%s", r->worst_name);
  else
    text_format(t, "line %zu, drive", r->worst_line);
  for (size_t i = 0; i < r->n_drives; ++i) {
    char drive[EF_NUMBER_TEXT];
    ef_number_format_fixed(100.0 * r->worst_drive[i], 0, drive);
    text_format(t, "%s %s %%", i == 0 ? "" : ",", drive);
  }
  text_add(t, ")");
}

void residuals_write(ef_json *json, const char *key, const residuals *r) {
  if (r->n == 0)
    return;
  ef_json_begin_object(json, key);
  ef_json_integer(json, "count", (int64_t)r->n);
  ef_json_number(json, "mean", r->mean);
  ef_json_number(json, "p95", r->p95);
  ef_json_number(json, "worst", r->worst);
  ef_json_integer(json, "worst_line", (int64_t)r->worst_line);
  ef_json_end_object(json);
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Tensors: the Euclidean one, and a numeric one for formulas without a closed
 * form. */
#include "difference/difference_private.h"

#include <math.h>

#include "difference/range.h"
#include "kernel/kernels.h"

static ef__scale scale_of(const ef_metric *self) {
  return self->scale != NULL ? self->scale(self) : (ef__scale){1, 1};
}

double ef__euclidean_difference(const ef_metric *self,
                                const double reference[3],
                                const double sample[3]) {
  const ef__scale scale = scale_of(self);
  const double d0 = (sample[0] - reference[0]) / scale.lightness;
  const double d1 = (sample[1] - reference[1]) / scale.chromatic;
  const double d2 = (sample[2] - reference[2]) / scale.chromatic;
  return sqrt(d0 * d0 + d1 * d1 + d2 * d2);
}

void ef__euclidean_differences(const ef_metric *self, size_t n,
                               const double *reference, const double *sample,
                               double *difference) {
  const ef__scale scale = scale_of(self);
  const double factor[2] = {scale.lightness, scale.chromatic};
  ef__kernels()->distance(n, reference, sample, factor, difference);
}

double ef__euclidean_components(const ef_metric *self,
                                const double reference[3],
                                const double sample[3],
                                ef_components *components) {
  const ef__scale scale = scale_of(self);
  const double c1 =
      sqrt(reference[1] * reference[1] + reference[2] * reference[2]);
  const double c2 = sqrt(sample[1] * sample[1] + sample[2] * sample[2]);
  components->lightness = (sample[0] - reference[0]) / scale.lightness;
  components->chroma = (c2 - c1) / scale.chromatic;
  components->hue = ef__delta_hue(reference[1], reference[2], sample[1],
                                  sample[2], c1 * c2) /
                    scale.chromatic;
  return ef__euclidean_difference(self, reference, sample);
}

void ef__euclidean_tensor(const ef_metric *self, const double coordinate[3],
                          double tensor[9]) {
  const ef__scale scale = scale_of(self);
  (void)coordinate;
  for (int i = 1; i < 8; ++i) tensor[i] = 0;
  tensor[0] = 1 / (scale.lightness * scale.lightness);
  tensor[4] = tensor[8] = 1 / (scale.chromatic * scale.chromatic);
}

void ef__euclidean_expand(const ef_metric *self, const double reference[3],
                          const double sample[3], ef__expansion *out) {
  double tensor[9];
  ef__euclidean_tensor(self, reference, tensor);
  out->square = 0;
  for (int i = 0; i < 3; ++i) {
    const double d = sample[i] - reference[i], weight = tensor[4 * i];
    out->square += weight * d * d;
    out->gradient[i] = 2 * weight * d;
  }
  for (int i = 0; i < 9; ++i) out->hessian[i] = 2 * tensor[i];
}

double ef__euclidean_least(const ef_metric *self, const double reference[3],
                           const double low[3], const double high[3]) {
  double nearest[3];
  for (int i = 0; i < 3; ++i) {
    nearest[i] =
        ef__range_nearest((ef__range){low[i], high[i]}, reference[i]);
  }
  return ef__euclidean_difference(self, reference, nearest);
}

/* Squared difference of two points placed symmetrically, so that what depends
 * on their mean stays put and the error is of fourth order in the step; of a
 * formula that takes its weights from the reference the mean of both orders. */
static double square_across(const ef_metric *metric,
                            const double coordinate[3], const double step[3]) {
  double before[3], after[3];
  for (int i = 0; i < 3; ++i) {
    before[i] = coordinate[i] - step[i] / 2;
    after[i] = coordinate[i] + step[i] / 2;
  }
  const double d = metric->difference(metric, before, after);
  if (!metric->asymmetric) return d * d;
  const double back = metric->difference(metric, after, before);
  return (d * d + back * back) / 2;
}

/* The polarisation identity turns squared lengths into the form itself. The
 * step makes truncation (step^2) and rounding (epsilon / step) alike. */
void ef__numeric_tensor(const ef_metric *metric, const double coordinate[3],
                        double tensor[9]) {
  const double step = 1e-4;
  double square[3];
  for (int i = 0; i < 3; ++i) {
    double d[3] = {0, 0, 0};
    d[i] = step;
    square[i] = square_across(metric, coordinate, d);
    tensor[4 * i] = square[i] / (step * step);
  }
  for (int i = 0; i < 3; ++i) {
    for (int k = i + 1; k < 3; ++k) {
      double d[3] = {0, 0, 0};
      d[i] = d[k] = step;
      const double sum = square_across(metric, coordinate, d);
      d[k] = -step;
      const double difference = square_across(metric, coordinate, d);
      tensor[3 * i + k] = tensor[3 * k + i] =
          (sum - difference) / (4 * step * step);
    }
  }
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What is the panel's just-noticeable difference? Answers of a two-interval
 * forced choice at six differences; the threshold with its interval. */
#include <stdio.h>

#include <evenfield.h>

int main(void) {
  const double difference[] = {0.2, 0.4, 0.7, 1.1, 1.6, 2.2}; /* Delta E*00 */
  const size_t shown[] = {40, 40, 40, 40, 40, 40};
  const size_t right[] = {21, 24, 28, 34, 38, 39};
  const ef_responses answers = {.n_rows = 6,
                                .level = difference,
                                .shown = shown,
                                .positive = right};
  ef_fit_settings settings = ef_fit_settings_default(EF_TASK_2IFC);
  settings.shape = EF_SHAPE_WEIBULL;
  settings.axis = ef_shape_axis(settings.shape);
  const ef_interval_settings how = ef_interval_settings_default();
  ef_error error = {.status = EF_OK};
  ef_fit fit;
  ef_goodness goodness;
  if (ef_fit_responses(&answers, &settings, &fit, &error) != EF_OK ||
      ef_fit_intervals(&answers, &settings, &how, &fit, &goodness, &error) !=
          EF_OK) {
    fprintf(stderr, "%s\n", error.message);
    return 1;
  }
  printf("75 %% right at %.3f Delta E*00 (95 %% interval %.3f to %.3f)\n",
         fit.threshold.value, fit.threshold.low, fit.threshold.high);
  printf("lapse rate %.3f\n", fit.curve.lapse);
  return 0;
}

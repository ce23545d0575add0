/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Who will tell two finishes apart? A standard and a delivery as CIELAB of
 * daylight; the difference, and the share of observers who see it. */
#include <stdio.h>

#include <evenfield.h>

int main(void) {
  ef_error error = {.status = EF_OK};
  const ef_metric *metric = ef_metric_find("ciede2000", &error);
  ef_jnd_record jnd;
  if (metric == NULL ||
      ef_jnd_record_default(metric, &jnd, NULL, &error) != EF_OK) {
    fprintf(stderr, "%s\n", error.message);
    return 1;
  }
  const double standard[3] = {41.3, -22.6, -18.9};
  const double delivery[3] = {41.9, -22.1, -19.8};
  ef_components parts;
  const double difference =
      ef_metric_components(metric, standard, delivery, &parts);
  const double repeatability = 0.1; /* of the instrument, in the same unit */
  const ef_judged judged = {.difference = &difference,
                            .n_observers = 1,
                            .measurement_sd = &repeatability};
  const ef_told_apart_settings settings = ef_told_apart_settings_default();
  ef_told_apart told;
  if (ef_told_apart_batch(&jnd, 1, &judged, &settings, 0, &told, &error) !=
      EF_OK) {
    fprintf(stderr, "%s\n", error.message);
    return 1;
  }
  printf("%.2f %s: %.0f %% of observers see it (95 %% interval %.0f to %.0f "
         "%%)\n",
         difference, ef_metric_symbol(metric),
         100 * told.share_of_observers.value, 100 * told.share_of_observers.low,
         100 * told.share_of_observers.high);
  printf("lighter by %.2f, chroma %+.2f, hue %+.2f\n", parts.lightness,
         parts.chroma, parts.hue);
  printf("one JND is %.2f: %s\n", jnd.value, jnd.source);
  return 0;
}

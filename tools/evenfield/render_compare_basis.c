/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "render_compare.h"

#include <math.h>
#include <string.h>

#include "grades.h"
#include "text.h"
#include "viewing.h"
#include "words.h"

static void add_samples(text *out, const compare_scene *s,
                        const compare_count *n) {
  text line = {0};
  text_format(&line, "%s against %s, ", s->batch_source, s->standard_source);
  switch (s->pairing) {
  case PAIR_ONE:
    text_add(&line, "each sample against the one standard");
    break;
  case PAIR_NAMES:
    text_add(&line, "each sample against the standard of its name");
    break;
  case PAIR_LIST:
    text_format(&line, "paired by %s", s->options->pairs);
    break;
  }
  if (n->has_repeats)
    text_add(&line, "; rows of one name are readings of one sample, which are "
                    "averaged");
  if (n->has_angles)
    text_add(&line, "; rows of one name with several angles are one finish");
  text_label(out, "Samples", &line);
}

static void add_lights(text *out, const compare_scene *s) {
  text line = {0};
  for (size_t i = 0; i < s->looks.n_lights && i < s->looks.n; ++i) {
    text_format(&line, "%s%s", i == 0 ? "" : ", ",
                ef_illuminant_name(s->looks.at[i].illuminant));
  }
  if (s->looks.n > 1)
    text_format(&line, "; the pair should match under %s",
                ef_illuminant_name(s->looks.at[0].illuminant));
  text_label(out, s->looks.n_lights > 1 ? "Lights" : "Light", &line);
}

static void add_observers(text *out, const compare_scene *s) {
  text line = {0};
  for (size_t i = 0; i < s->looks.n; i += s->looks.n_lights) {
    const ef_observer *o = s->looks.at[i].observer;
    text_format(&line, "%s: %s", ef_observer_name(o), ef_observer_about(o));
    if (ef_observer_dimensions(o) < 3)
      text_format(&line, "; %s", words_two_dimensions);
    text_label(out, i == 0 ? "Observer" : "", &line);
  }
  if (s->people.population == NULL)
    return;
  people_add(&line, &s->people);
  text_add(&line, ": who sees what, each with the eyes of their own, and from "
                  "which difference on are both in what is told apart");
  text_label(out, "People", &line);
}

static void add_metric(text *out, const compare_scene *s) {
  text line = {0};
  text_format(&line, "%s (%s)", ef_metric_title(s->metric),
              ef_metric_source(s->metric));
  if (viewing_matters(s->metric)) {
    char conditions[200];
    viewing_words(&s->looks.at[0].conditions, conditions);
    text_format(&line, "; for %s", conditions);
  }
  text_label(out, "Difference", &line);
}

static void add_jnd(text *out, const compare_scene *s) {
  text line = {0};
  if (!s->jnd.is_known) {
    text_add(&line, "none is published for this formula, so nothing is said of "
                    "who would notice; --jnd gives one");
    text_label(out, "JND", &line);
    return;
  }
  char factor[EF_NUMBER_TEXT];
  jnd_add(&line, &s->jnd, s->metric);
  ef_number_format_fixed(exp(s->jnd.record.observer_log_sd), 2, factor);
  text_format(&line, "; two of three people have one within a factor of %s",
              factor);
  text_label(out, "JND", &line);
}

static void add_uncertainty(text *out, const compare_scene *s,
                            const compare_count *n) {
  text line = {0};
  char number[EF_NUMBER_TEXT];
  if (n->has_repeats) {
    text_add(&line, "the scatter of repeated readings; a sample read once is "
                    "taken to scatter like its counterpart");
  } else {
    text_add(&line, "every sample was read once, so the scatter of measurement "
                    "is not known and not in the intervals");
  }
  if (!isnan(s->options->batch_sd)) {
    ef_number_format(s->options->batch_sd, number);
    text_format(&line, "; pieces of a batch scatter by %s %s (--batch-sd)",
                number, ef_metric_symbol(s->metric));
  }
  if (s->jnd.is_known && !isnan(s->jnd.record.low))
    text_add(&line, "; the interval of the JND");
  if (s->jnd.is_known && isnan(s->jnd.record.low))
    text_add(&line, "; how uncertain the JND itself is, is not known");
  text_label(out, "Uncertainty", &line);
  if (!s->jnd.is_known)
    return;
  if (s->told.propagation == EF_PROPAGATE_FIRST_ORDER) {
    text_add(&line, "95 %, by first order");
  } else {
    ef_number_format_fixed((double)s->told.seed, 0, number);
    text_format(&line, "95 %%, by %zu draws with seed %s%s", s->told.n_draws,
                number,
                s->always_draws ? ""
                                : ", by first order where the uncertainty is "
                                  "below a twentieth of the difference");
  }
  text_label(out, "Intervals", &line);
}

void compare_tolerance_words(const compare_scene *s,
                             char words[EF_NUMBER_TEXT]) {
  ef_number_format(s->tolerance, words);
  if (strlen(words) > 6)
    words_amount(s->tolerance, words);
}

static void add_tolerance(text *out, const compare_scene *s) {
  if (isnan(s->tolerance))
    return;
  char value[EF_NUMBER_TEXT];
  text line = {0};
  compare_tolerance_words(s, value);
  text_format(
      &line,
      "%s %s%s, to be kept in every light; a question mark stands where "
      "the 95 %% interval of a difference reaches over it",
      value, ef_metric_symbol(s->metric), s->own_tolerance ? "" : ", one JND");
  text_label(out, "Tolerance", &line);
}

static void add_grades(text *out, const compare_scene *s) {
  text line = {0};
  const outcome alike = {.cielab = 0.0};
  if (grade_contrast(&s->looks.at[0], &alike) != NULL) {
    text_add(&line, "ISO 105-A02:1993: the step whose pair is nearest in "
                    "CIELAB; the standard itself has eyes compare them");
    text_label(out, "Grey scale", &line);
  }
  if (!s->options->grade_simulators)
    return;
  text_add(&line, "ISO/CIE 23603 (limits from memory, that of B confirmed): "
                  "mean CIELAB difference over the virtual metamers, which the "
                  "pairs are taken to be; none beyond 0.015 in u', v' from the "
                  "light stood for. The ultraviolet is not graded; where a "
                  "certificate hangs on it, let an accredited laboratory "
                  "measure with the pairs of the standard");
  text_label(out, "Simulators", &line);
}

static void add_metamerism(text *out, const compare_scene *s) {
  static const char *const words[] = {
      [EF_CORRECT_MULTIPLICATIVE] =
          "after the sample's X, Y, Z were brought to "
          "the standard's by factors",
      [EF_CORRECT_ADDITIVE] = "after what the two differ by in the reference "
                              "light was taken off",
      [EF_CORRECT_SPECTRAL] = "after the sample's spectrum was brought to the "
                              "standard's colour",
      [EF_CORRECT_NONE] =
          "without any correction of what they differ by there"};
  if (s->looks.n < 2)
    return;
  text line = {0};
  text_format(&line,
              "special index: the difference under another light or to another "
              "observer, %s (CIE 015:2018)",
              words[s->correction]);
  text_label(out, "Metamerism", &line);
}

void compare_basis(text *out, const compare_scene *s,
                   const compare_count *count) {
  text_add(out, "\nWhat this rests on:\n");
  add_samples(out, s, count);
  add_lights(out, s);
  add_observers(out, s);
  add_metric(out, s);
  add_jnd(out, s);
  add_uncertainty(out, s, count);
  add_tolerance(out, s);
  add_grades(out, s);
  add_metamerism(out, s);
}

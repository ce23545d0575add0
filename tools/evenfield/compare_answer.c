/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "compare_kept.h"

#include <math.h>

#include "grades.h"
#include "words.h"

/* ---- The answer -------------------------------------------------------- */

/* The outcome under look `k` that most people tell apart, or that is largest
 * where nobody is asked. */
static const outcome *worst_under(const compare_scene *s, const compared *c,
                                  size_t k) {
  const outcome *worst = &c->outcome[k];
  for (size_t a = 1; a < c->n_angles; ++a) {
    const outcome *o = &c->outcome[a * s->looks.n + k];
    if (o->difference > worst->difference)
      worst = o;
  }
  return worst;
}

/* The look to set beside the worst: the reference, or where that is the worst
 * the one under which the pair is least apart. */
static size_t other_look(const compare_scene *s, const compared *c,
                         size_t worst) {
  size_t least = 0;
  if (worst != 0)
    return 0;
  for (size_t k = 0; k < s->looks.n; ++k) {
    if (k != worst &&
        (least == worst || worst_under(s, c, k)->difference <
                               worst_under(s, c, least)->difference)) {
      least = k;
    }
  }
  return least;
}

/* The first light of the user's own that is not told of yet; SIZE_MAX if
 * none. */
static size_t own_look(const compare_scene *s, size_t worst, size_t other) {
  for (size_t k = 0; k < s->looks.n; ++k) {
    if (s->looks.at[k].is_own && k != worst && k != other)
      return k;
  }
  return SIZE_MAX;
}

static void add_told_under(text *out, const compare_scene *s, const compared *c,
                           size_t k) {
  text_add(out, ", ");
  compare_add_share(out, worst_under(s, c, k)->told.share_of_observers.value,
                    "", "");
  text_format(out, " %s", s->looks.at[k].words);
}

static void add_told_answer(text *out, const compare_scene *s,
                            const compared *c) {
  const size_t worst = c->worst_told % s->looks.n;
  const size_t other = other_look(s, c, worst);
  const size_t own = own_look(s, worst, other);
  compare_add_share(out,
                    c->outcome[c->worst_told].told.share_of_observers.value,
                    "about ", " customers");
  text_format(out, " would tell these apart %s", s->looks.at[worst].words);
  if (own != SIZE_MAX)
    add_told_under(out, s, c, own);
  if (other != worst)
    add_told_under(out, s, c, other);
}

static void add_plain_answer(text *out, const compare_scene *s,
                             const compared *c) {
  const size_t worst = c->worst % s->looks.n;
  const size_t other = other_look(s, c, worst);
  text_add(out, "differs from the standard by ");
  compare_add_difference(out, s, c->outcome[c->worst].difference);
  text_format(out, " %s", s->looks.at[worst].words);
  if (other == worst)
    return;
  text_add(out, ", by ");
  compare_add_difference(out, s, worst_under(s, c, other)->difference);
  text_format(out, " %s", s->looks.at[other].words);
}

/* "booth.csv is a daylight simulator of grade B for D65: mean difference 0.37
 * CIELAB over 5 pairs." */
static void add_simulator(text *out, const compare_scene *s,
                          const compare_count *n, size_t k) {
  const simulator_grade g = grade_simulator(s, n, k);
  const char *light = ef_illuminant_name(s->looks.at[k].illuminant);
  const char *stands_for = ef_illuminant_name(s->looks.at[0].illuminant);
  char mean[EF_NUMBER_TEXT], distance[EF_NUMBER_TEXT], pairs[WORDS_ROOM];
  text line = {0};
  words_count(n->n_differences[k], "pair", "pairs", pairs);
  ef_number_format_fixed(g.mean_difference, 2, mean);
  ef_number_format_fixed(g.distance, 4, distance);
  if (g.grade != NULL) {
    text_format(&line,
                "%s as a simulator of %s has grade %s: mean difference %s "
                "CIELAB over %s, %s from it in u', v'.",
                light, stands_for, g.grade, mean, pairs, distance);
  } else {
    text_format(&line,
                "%s as a simulator of %s has no grade: it is %s from it in u', "
                "v', more than 0.015 (mean difference %s CIELAB over "
                "%s).",
                light, stands_for, distance, mean, pairs);
  }
  text_paragraph(out, &line, 0);
}

/* Virtual metamers match in the light that is stood for. */
static void add_simulators(text *out, const compare_scene *s,
                           const compare_count *n) {
  const double mean = n->difference[0] / (double)n->n_differences[0];
  char amount[EF_NUMBER_TEXT];
  if (!s->options->grade_simulators)
    return;
  for (size_t k = 1; k < s->looks.n; ++k)
    add_simulator(out, s, n, k);
  if (mean < 0.05)
    return;
  words_amount(mean, amount);
  text line = {0};
  text_format(&line,
              "But the pairs differ by %s CIELAB on average under %s itself: "
              "those of the standard match there.",
              amount, ef_illuminant_name(s->looks.at[0].illuminant));
  text_paragraph(out, &line, 0);
}

static void add_first_line(text *out, const compared *c, const compare_scene *s,
                           const compare_count *n) {
  compare_add_names(out, s, c);
  if (n->n_computed > 1)
    text_format(out, ", the most different of %zu", n->n_computed);
  text_add(out, s->jnd.is_known ? ": " : n->n_computed > 1 ? ", " : " ");
  if (s->jnd.is_known) {
    add_told_answer(out, s, c);
  } else {
    add_plain_answer(out, s, c);
  }
  text_add(out, ".\n");
}

static void add_tolerance(text *out, const compare_scene *s,
                          const compare_count *n) {
  if (isnan(s->tolerance))
    return;
  char tolerance[EF_NUMBER_TEXT];
  text line = {0};
  compare_tolerance_words(s, tolerance);
  text_format(&line, "%zu of %zu %s within %s %s%s%s; ", n->n_within, n->n,
              n->n == 1          ? "pair is"
              : n->n_within == 1 ? "pairs is"
                                 : "pairs are",
              tolerance, ef_metric_symbol(s->metric),
              s->own_tolerance ? "" : " (one JND)",
              s->looks.n > 1 ? " in every light" : "");
  if (n->n_beyond == 0) {
    text_add(&line, "none is beyond it");
  } else {
    text_format(&line, "%zu %s beyond it", n->n_beyond,
                n->n_beyond == 1 ? "is" : "are");
  }
  const size_t n_open = n->n - n->n_within - n->n_beyond;
  if (n_open > 0) {
    text_format(&line, ", and %zu could not be told, for the reasons below",
                n_open);
  }
  text_add(&line, ".");
  text_paragraph(out, &line, 0);
}

static void add_second_lines(text *out, const compare_scene *s,
                             const compare_count *n) {
  add_tolerance(out, s, n);
  if (s->is_demo) {
    text_wrap(
        out,
        s->options->lights.n == 0
            ? "No files were named, so this is the built-in demo: deck "
              "seats of two suppliers (demo:seats-deliveries) against the "
              "agreed standard (demo:seats-standard), also in the light "
              "of the ticket hall (demo:shop-light)."
            : "No files were named, so this is the built-in demo: deck "
              "seats of two suppliers (demo:seats-deliveries) against the "
              "agreed standard (demo:seats-standard).",
        0);
  }
  if (n->n_skipped > 0)
    text_format(out, "%zu rows were at fault and are left out.\n",
                n->n_skipped);
}

void compare_add_answer(text *out, const compared *worst,
                        const compare_scene *s, const compare_count *n) {
  add_simulators(out, s, n);
  add_first_line(out, worst, s, n);
  add_second_lines(out, s, n);
}

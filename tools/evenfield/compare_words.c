/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "compare_kept.h"

#include <math.h>

#include "grades.h"
#include "words.h"

enum { MOST_READINGS = 12 };

/* ---- Words ------------------------------------------------------------- */

const ef_estimate *compare_correct(const compare_scene *s,
                                   const ef_told_apart *told) {
  switch (s->task) {
  case EF_TASK_SAME_DIFFERENT:
    return &told->correct_same_different;
  case EF_TASK_TRIANGLE:
    return &told->correct_triangle;
  default:
    return &told->correct_2ifc;
  }
}

/* "about 38 % of customers", "hardly any", "nearly all": no false precision. */
void compare_add_share(text *out, double share, const char *about,
                       const char *of) {
  char number[EF_NUMBER_TEXT];
  ef_number_format_fixed(100.0 * share, 0, number);
  if (share < 0.005) {
    text_format(out, "hardly any%s", of);
  } else if (share >= 0.995) {
    text_format(out, "nearly all%s", of);
  } else {
    text_format(out, "%s%s %%%s%s", about, number, of[0] != '\0' ? " of" : "",
                of);
  }
}

static void add_percent(text *out, double share) {
  char number[EF_NUMBER_TEXT];
  ef_number_format_fixed(100.0 * share, 0, number);
  text_add(out, number);
}

/* " (81 to 87)" where that is more than one whole number. */
static void add_interval(text *out, const ef_estimate *e) {
  if (isnan(e->low) || round(100.0 * e->low) == round(100.0 * e->high))
    return;
  text_add(out, " (");
  add_percent(out, e->low);
  text_add(out, " to ");
  add_percent(out, e->high);
  text_add(out, ")");
}

/* "84 % (81 to 87)" */
static void add_estimate(text *out, const ef_estimate *e) {
  add_percent(out, e->value);
  text_add(out, " %");
  add_interval(out, e);
}

/* "1.52 Delta E*00 (1.9 JND)" */
void compare_add_difference(text *out, const compare_scene *s, double value) {
  char amount[EF_NUMBER_TEXT], jnds[EF_NUMBER_TEXT];
  words_amount(value, amount);
  text_format(out, "%s %s", amount, ef_metric_symbol(s->metric));
  if (!s->jnd.is_known)
    return;
  ef_number_format_fixed(value / s->jnd.record.value, 1, jnds);
  text_format(out, " (%s JND)", jnds);
}

static void add_angle(text *out, const compared *c, size_t angle) {
  if (isnan(c->angle_deg[angle]))
    return;
  char number[EF_NUMBER_TEXT];
  ef_number_format(c->angle_deg[angle], number);
  text_format(out, " at %s degrees", number);
}

void compare_add_names(text *out, const compare_scene *s, const compared *c) {
  text_add(out, c->sample[0] != '\0' ? c->sample : c->standard);
  if (s->pairing == PAIR_LIST)
    text_format(out, " against %s", c->standard);
}

/* ---- Pair by pair ------------------------------------------------------ */

/* "in daylight (D65) 0.31 Delta E*00 (0.4 JND), darker by 0.2" */
static void add_outcome(text *out, const compare_scene *s, const compared *c,
                        size_t i) {
  const look *l = compare_look_of(s, i);
  const outcome *o = &c->outcome[i];
  char direction[WORDS_ROOM];
  const ef_lab lab = ef_xyz_to_lab(o->standard, l->basis.white);
  words_direction(o->components, ef_lab_to_lch(lab).h_deg, direction);
  text_add(out, l->words);
  add_angle(out, c, compare_angle_of(s, i));
  text_add(out, " ");
  compare_add_difference(out, s, o->difference);
  text_format(out, ", %s", direction);
}

static void add_told(text *out, const outcome *o) {
  const ef_told_apart *t = &o->told;
  text_add(out, ". There ");
  compare_add_share(out, t->share_of_observers.value, "", " customers");
  add_interval(out, &t->share_of_observers);
  text_add(out, " would tell it from the standard; a panel would be right in ");
  add_estimate(out, &t->correct_2ifc);
  text_add(out, " of trials with two intervals, ");
  add_estimate(out, &t->correct_same_different);
  text_add(out, " of same-different trials and ");
  add_estimate(out, &t->correct_triangle);
  text_add(out, " of triangle tests");
}

/* Below half a JND a mismatch is nothing to tell of. */
static bool is_metameric(const compare_scene *s, double index) {
  return index > (s->jnd.is_known ? 0.5 * s->jnd.record.value : 0.0);
}

static void add_metamerism(text *out, const compare_scene *s,
                           const compared *c) {
  size_t worst = 0;
  char number[EF_NUMBER_TEXT];
  const char *reference = ef_illuminant_name(s->looks.at[0].illuminant);
  for (size_t i = 0; i < c->n_angles * s->looks.n; ++i) {
    const double index = c->outcome[i].metamerism;
    if (index > 0.0 && (worst == 0 || index > c->outcome[worst].metamerism))
      worst = i;
  }
  if (worst == 0 || !is_metameric(s, c->outcome[worst].metamerism))
    return;
  words_amount(c->outcome[worst].metamerism, number);
  text_format(out, ". Were the two alike under %s, they would differ by %s %s",
              reference, number, compare_look_of(s, worst)->words);
  if (!s->looks.has_other || !is_metameric(s, c->other_observer[0]))
    return;
  words_amount(c->other_observer[0], number);
  text_format(out, ", and under %s itself by %s to observer %s", reference,
              number, ef_observer_name(s->looks.at[s->looks.n].observer));
}

static void add_finish(text *out, const compare_scene *s, const compared *c) {
  if (c->n_angles < 2)
    return;
  char total[EF_NUMBER_TEXT];
  const size_t k = c->worst % s->looks.n;
  words_amount(c->finish[k].total, total);
  text_format(out, ". Over its %zu angles together %s %s %s", c->n_angles,
              total, ef_metric_symbol(s->metric), s->looks.at[k].words);
}

/* In the first light; for no finish of several angles. */
static void add_contrast(text *out, const compare_scene *s, const compared *c) {
  const char *step = grade_contrast(&s->looks.at[0], &c->outcome[0]);
  char cielab[EF_NUMBER_TEXT];
  if (step == NULL || c->n_angles > 1)
    return;
  words_amount(c->outcome[0].cielab, cielab);
  text_format(out,
              ". Its contrast %s, %s CIELAB, is nearest to step %s of the "
              "grey scale for change in colour",
              s->looks.at[0].words, cielab, step);
}

static void add_people(text *out, const compare_scene *s, const outcome *o) {
  if (s->people.population == NULL)
    return;
  char mean[EF_NUMBER_TEXT], p95[EF_NUMBER_TEXT];
  words_amount(o->population_mean, mean);
  words_amount(o->population_p95, p95);
  text_format(out,
              ". The people see %s %s on average, and 95 %% of them less than "
              "%s",
              mean, ef_metric_symbol(s->metric), p95);
}

static void add_reading(text *out, const compare_scene *s, const compared *c) {
  text line = {0};
  const size_t at = s->jnd.is_known ? c->worst_told : c->worst;
  compare_add_names(&line, s, c);
  text_add(&line, ": ");
  if (at % s->looks.n != 0) {
    add_outcome(&line, s, c, at / s->looks.n * s->looks.n);
    text_add(&line, "; ");
  }
  add_outcome(&line, s, c, at);
  if (s->jnd.is_known)
    add_told(&line, &c->outcome[at]);
  add_people(&line, s, &c->outcome[at]);
  add_finish(&line, s, c);
  add_contrast(&line, s, c);
  add_metamerism(&line, s, c);
  text_add(&line, ".");
  text_add(out, "  ");
  text_paragraph(out, &line, 4);
}

/* Told of in words: what is not within the tolerance; of pairs that all are,
 * the most different one. */
void compare_add_readings(text *out, const compare_text *t,
                          const compare_scene *s, const compare_count *n) {
  const size_t n_worst = n->n_within < n->n_computed && !isnan(s->tolerance)
                             ? n->n_computed - n->n_within
                             : 1;
  size_t n_told = 0;
  text_add(out, n_worst == 1 ? "\nIn words:\n"
                             : "\nIn words, from the most different on:\n");
  for (size_t i = 0; i < t->n_rows && n_told < MOST_READINGS; ++i) {
    const compared *c = &t->row[i].pair;
    if (c->within && n_told > 0)
      continue;
    add_reading(out, s, c);
    if (++n_told == n_worst)
      break;
  }
  if (n_told < n_worst) {
    text_format(out, "  %zu more (--format csv or json gives all)\n",
                n_worst - n_told);
  }
}

/* ---- How wrong a match can go ------------------------------------------ */

static void add_worst_case(text *out, const compare_scene *s, size_t k,
                           const worst_case *w) {
  const look *l = &s->looks.at[k];
  text line = {0};
  text_add(&line, l->words);
  if (k == s->looks.n)
    text_format(&line, " to observer %s", ef_observer_name(l->observer));
  if (!isnan(w->angle_deg)) {
    char number[EF_NUMBER_TEXT];
    ef_number_format(w->angle_deg, number);
    text_format(&line, " at %s degrees", number);
  }
  text_add(&line, " ");
  if (isnan(w->difference)) {
    text_format(&line, "not known: %s", w->reason);
  } else {
    compare_add_difference(&line, s, w->difference);
  }
  text_add(out, "  ");
  text_paragraph(out, &line, 4);
}

void compare_add_worst_cases(text *out, const compare_scene *s) {
  if (s->n_worst_cases == 0)
    return;
  const size_t n = s->looks.n + (s->looks.has_other ? 1 : 0);
  text line = {0};
  text_format(
      &line,
      "How wrong a match can go: of all surfaces, of any spectrum, that "
      "match the standard under %s, the one that parts from it most "
      "differs by",
      ef_illuminant_name(s->looks.at[0].illuminant));
  text_add(out, "\n");
  text_paragraph(out, &line, 0);
  for (size_t i = 0; i < s->n_worst_cases; ++i) {
    if (i % n != 0)
      add_worst_case(out, s, i % n, &s->worst_case[i]);
  }
}

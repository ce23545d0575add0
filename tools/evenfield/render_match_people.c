/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What the people of --population see. */
#include "render_match.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "words.h"

static void add_percent(text *t, double share) {
  char number[EF_NUMBER_TEXT];
  ef_number_format_fixed(100.0 * share, 0, number);
  text_format(t, "%s %%", number);
}

static void add_amount(text *t, const match_scene *s, double value) {
  char amount[EF_NUMBER_TEXT];
  words_amount(value, amount);
  text_format(t, "%s %s", amount, ef_metric_symbol(s->metric));
}

/* ---- The answer -------------------------------------------------------- */

static void add_told_apart(text *t, const match_scene *s,
                           const match_summary *sum) {
  if (isnan(s->jnd.value)) {
    text_add(t, "target and match differ by ");
    add_amount(t, s, sum->all.mean);
    text_add(t, " on average");
    return;
  }
  if (sum->n == 1) {
    add_percent(t, sum->all.share_of_observers);
    text_format(t, " would tell %s from what is shown", sum->worst_seen_name);
    return;
  }
  add_percent(t, sum->all.share_of_observers);
  text_add(t, " on average would tell a target from what is shown");
}

void render_match_people_answer(text *out, const match_scene *s,
                                const match_summary *sum) {
  if (s->seen.people.population == NULL)
    return;
  text t = {0};
  text_add(&t, "Of ");
  people_add_who(&t, &s->seen.people);
  if (s->seen.people.n_chosen > 0)
    text_format(&t, " (by %zu who stand for all)", s->seen.people.n_chosen);
  text_add(&t, ", ");
  add_told_apart(&t, s, sum);
  if (sum->n > 1) {
    text_format(&t, "; the worst seen is %s, with ", sum->worst_seen_name);
    add_amount(&t, s, sum->worst_seen.p95);
    text_add(&t,
             s->seen.people.settings.count < 20 || s->seen.people.n_chosen > 0
                 ? " at the 95th percentile"
                 : " or more for one person in twenty");
  }
  text_add(&t, ".");
  text_wrap(out, t.bytes != NULL ? t.bytes : "", 0);
  out->failed = out->failed || t.failed;
  text_free(&t);
}

/* ---- The table --------------------------------------------------------- */

static int by_p95(const void *a, const void *b) {
  const kept_row *p = a, *q = b;
  if (p->spread.p95 != q->spread.p95)
    return p->spread.p95 < q->spread.p95 ? 1 : -1;
  return (p->order > q->order) - (p->order < q->order);
}

static void add_row(text_table *t, const match_scene *s, const kept_row *row) {
  const ef_match *m = &row->match;
  table_cell(t, row->name);
  table_cell(t, m->in_gamut ? "yes" : "no");
  table_number(t, match_achieved(s, m)->difference, 2);
  table_number(t, row->spread.mean, 2);
  table_number(t, row->spread.p95, 2);
  table_number(t, 100.0 * row->spread.share_of_observers, 0);
}

static void add_table(text *out, const match_scene *s, size_t n_rows,
                      const kept_row *sorted) {
  char differences[80];
  snprintf(differences, sizeof differences, "Off by, %s",
           ef_metric_symbol(s->metric));
  text_table t = table_new();
  table_column(&t, "Target", "", true);
  table_column(&t, "In", "gamut", true);
  table_column(&t, differences, "observer", false);
  table_column(&t, NULL, "people, mean", false);
  table_column(&t, NULL, "95th percentile", false);
  table_column(&t, "Told apart", "by, %", false);
  for (size_t k = 0; k < n_rows; ++k)
    add_row(&t, s, &sorted[k]);
  table_finish(&t, out);
}

static void add_index(text *out, const match_scene *s,
                      const match_summary *sum) {
  text t = {0};
  if (sum->n_in_gamut == 0) {
    text_add(&t, "This setup has no observer metamerism index here: it is the "
                 "mean over targets in gamut, and there is none.");
  } else {
    text_add(&t, "Observer metamerism index of this setup: ");
    add_amount(&t, s, sum->in_gamut.mean);
    char n[WORDS_ROOM];
    words_count(sum->n_in_gamut, "target", "targets", n);
    text_format(&t,
                ", the mean over people and the %s in gamut; the mean of "
                "the 95th percentiles is ",
                n);
    add_amount(&t, s, sum->in_gamut.p95);
    text_add(&t, ".");
  }
  text_add(out, "  ");
  text_wrap(out, t.bytes != NULL ? t.bytes : "", 2);
  out->failed = out->failed || t.failed;
  text_free(&t);
}

void render_match_people(text *out, const match_scene *s,
                         const match_summary *sum, size_t n_rows,
                         const kept_row *row) {
  if (s->seen.people.population == NULL)
    return;
  kept_row *sorted = malloc((n_rows + 1) * sizeof *sorted);
  if (sorted == NULL) {
    out->failed = true;
    return;
  }
  memcpy(sorted, row, n_rows * sizeof *sorted);
  qsort(sorted, n_rows, sizeof *sorted, by_p95);
  text_add(out, "\nWhat these people would see, the worst first:\n");
  add_table(out, s, n_rows, sorted);
  add_index(out, s, sum);
  free(sorted);
}

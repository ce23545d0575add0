/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "compare_kept.h"

#include <math.h>
#include <stdio.h>

/* ---- Tables ------------------------------------------------------------ */

/* What a table shows of an outcome. */
typedef enum quantity { DIFFERENCE, SHARE, METAMERISM } quantity;

static void add_cell(text_table *t, const compare_scene *s, const compared *c,
                     size_t a, size_t k, quantity what) {
  const outcome *o = &c->outcome[a * s->looks.n + k];
  switch (what) {
  case DIFFERENCE:
    table_number(t, o->difference, 2);
    break;
  case SHARE:
    table_number(t, 100.0 * o->told.share_of_observers.value, 0);
    break;
  case METAMERISM:
    table_number(t, o->metamerism, 2);
    break;
  }
}

static const char *verdict_word(const compared *c) {
  if (c->within)
    return c->is_certain ? "within" : "within?";
  if (c->beyond)
    return c->is_certain ? "beyond" : "beyond?";
  return "not told";
}

static void light_head(const compare_scene *s, size_t k, char head[64]) {
  const look *l = &s->looks.at[k];
  snprintf(head, 64, "%.40s", ef_illuminant_name(l->illuminant));
}

/* The columns of the looks from `first` on, under one head. */
static void add_look_columns(text_table *t, const compare_scene *s,
                             size_t first, const char *title,
                             char (*heads)[64]) {
  for (size_t k = first; k < s->looks.n; ++k) {
    light_head(s, k, heads[k]);
    const bool many = s->looks.n_observers > 1;
    const bool is_first_light = k % s->looks.n_lights == 0;
    const char *above = !many ? (k == first ? title : NULL)
                        : is_first_light || k == first
                            ? ef_observer_name(s->looks.at[k].observer)
                            : NULL;
    table_column(t, above, heads[k], false);
  }
}

static void add_row_names(text_table *t, const compare_scene *s,
                          const compared *c, size_t a, bool has_angles) {
  char number[EF_NUMBER_TEXT];
  if (s->pairing == PAIR_LIST)
    table_cell(t, a == 0 ? c->standard : "");
  table_cell(t, a == 0 ? c->sample : "");
  if (!has_angles)
    return;
  ef_number_format(c->angle_deg[a], number);
  table_cell(t, isnan(c->angle_deg[a]) ? "-" : number);
}

static void add_table(text *out, const compare_text *m, const compare_scene *s,
                      const compare_count *n, const char *title,
                      quantity what) {
  char heads[LOOKS_MOST][64];
  const size_t first = what == METAMERISM ? 1 : 0;
  const bool with_verdict = what == DIFFERENCE && !isnan(s->tolerance);
  text_table t = table_new();
  if (s->pairing == PAIR_LIST)
    table_column(&t, "Standard", "", true);
  table_column(&t, "Sample", "", true);
  if (n->has_angles)
    table_column(&t, "Angle", "deg", false);
  add_look_columns(&t, s, first, title, heads);
  if (with_verdict)
    table_column(&t, "Tolerance", "", true);
  if (s->looks.n_observers > 1)
    text_format(out, "%s:\n", title);
  for (size_t i = 0; i < m->n_rows; ++i) {
    const compared *c = &m->row[i].pair;
    for (size_t a = 0; a < c->n_angles; ++a) {
      add_row_names(&t, s, c, a, n->has_angles);
      for (size_t k = first; k < s->looks.n; ++k)
        add_cell(&t, s, c, a, k, what);
      if (with_verdict)
        table_cell(&t, a == 0 ? verdict_word(c) : "");
    }
  }
  table_finish(&t, out);
}

void compare_add_tables(text *out, const compare_text *m,
                        const compare_scene *s, const compare_count *n) {
  char title[100];
  text_add(out, "\n");
  if (m->worst_only) {
    text_format(out,
                "The %zu most different of %zu (--format csv gives "
                "all):\n",
                m->n_rows, n->n_computed);
  }
  snprintf(title, sizeof title, "Difference, %s", ef_metric_symbol(s->metric));
  add_table(out, m, s, n, title, DIFFERENCE);
  if (s->jnd.is_known) {
    text_add(out, "\n");
    add_table(out, m, s, n, "Told apart by, % of customers", SHARE);
  }
  if (s->looks.n < 2)
    return;
  snprintf(title, sizeof title, "Metamerism, %s", ef_metric_symbol(s->metric));
  text_add(out, "\n");
  add_table(out, m, s, n, title, METAMERISM);
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The linear programme of an isolation, 4 to 8 primaries and as many receptors
 * to hold as leave some freedom, beside GLPK with one object that keeps its
 * rows and columns from programme to programme. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>

#include <glpk.h>

#include "bench.h"
#include "gen.h"
#include "stimulus/stimulus_private.h"

enum { PROGRAMMES = 2000 };

typedef struct contest {
  size_t n_rows, n_columns;
  const ef__table *table;
  ef__simplex *simplex;
  glp_prob *glpk;
  double *value; /* optima, NaN without one */
} contest;

/* Silenced receptors are rows that sum to zero, drives have room on both sides
 * of a background; the last column is the contrast, that is made large. */
static void fill(gen *g, size_t m, size_t n, ef__table *p) {
  *p = (ef__table){.n_rows = m, .n_columns = n};
  gen_fill(g, m * n, 0, 1, p->row);
  for (size_t j = 0; j + 1 < n; ++j) {
    const double background = gen_between(g, 0.2, 0.8);
    p->low[j] = -background;
    p->high[j] = 1 - background;
  }
  for (size_t i = 0; i < m; ++i) p->row[i * n + n - 1] = i == 0 ? -1 : 0;
  p->high[n - 1] = 100;
  p->gain[n - 1] = 1;
}

static void run_ours(void *context) {
  contest *const c = context;
  for (size_t k = 0; k < PROGRAMMES; ++k) {
    double x[EF_MAX_DRIVES + 1];
    if (ef__table_solve(&c->table[k], c->simplex, x, &c->value[k]) !=
        EF__SIMPLEX_BEST) {
      c->value[k] = (double)NAN;
    }
  }
}

static void run_glpk(void *context) {
  contest *const c = context;
  const size_t m = c->n_rows, n = c->n_columns;
  glp_smcp settings;
  glp_init_smcp(&settings);
  settings.msg_lev = GLP_MSG_OFF;
  for (size_t k = 0; k < PROGRAMMES; ++k) {
    const ef__table *const p = &c->table[k];
    for (size_t j = 0; j < n; ++j) {
      int row[EF_MAX_DRIVES + 2];
      double column[EF_MAX_DRIVES + 2];
      for (size_t i = 0; i < m; ++i) {
        row[i + 1] = (int)i + 1;
        column[i + 1] = p->row[i * n + j];
      }
      glp_set_mat_col(c->glpk, (int)j + 1, (int)m, row, column);
      glp_set_col_bnds(c->glpk, (int)j + 1, GLP_DB, p->low[j], p->high[j]);
      glp_set_obj_coef(c->glpk, (int)j + 1, p->gain[j]);
    }
    for (size_t i = 0; i < m; ++i)
      glp_set_row_bnds(c->glpk, (int)i + 1, GLP_FX, p->right[i], p->right[i]);
    glp_std_basis(c->glpk);
    c->value[k] = glp_simplex(c->glpk, &settings) == 0 &&
                          glp_get_status(c->glpk) == GLP_OPT
                      ? glp_get_obj_val(c->glpk)
                      : (double)NAN;
  }
}

static void bench_primaries(size_t n_primaries) {
  const size_t m = n_primaries < 5 ? 3 : 4, n = n_primaries + 1;
  ef__table *const table = bench_allocate(PROGRAMMES, sizeof *table);
  double *const ours = bench_allocate(PROGRAMMES, sizeof *ours);
  double *const theirs = bench_allocate(PROGRAMMES, sizeof *theirs);
  gen g = gen_new(n_primaries);
  for (size_t k = 0; k < PROGRAMMES; ++k) fill(&g, m, n, &table[k]);
  glp_prob *const glpk = glp_create_prob();
  glp_set_obj_dir(glpk, GLP_MAX);
  glp_add_rows(glpk, (int)m);
  glp_add_cols(glpk, (int)n);
  ef__simplex *const simplex = ef__simplex_new(m, n);
  if (simplex == NULL) exit(1);
  contest a = {m, n, table, simplex, glpk, theirs}, b = a;
  b.value = ours;
  char name[2][64], what[96];
  snprintf(name[0], sizeof name[0], "isolation%zu_glpk", n_primaries);
  snprintf(name[1], sizeof name[1], "isolation%zu", n_primaries);
  bench_entry entry[] = {{name[0], run_glpk, &a, false, 0},
                         {name[1], run_ours, &b, false, 0}};
  bench_run(2, entry);
  bench_per_item(2, entry, PROGRAMMES);
  snprintf(what, sizeof what,
           "isolation by linear programme, %zu primaries, %zu rows",
           n_primaries, m);
  bench_row(what, "GLPK, object reused", &entry[1], &entry[0], 10);
  double largest = 0;
  for (size_t k = 0; k < PROGRAMMES; ++k) {
    const double off = fabs(ours[k] - theirs[k]) / fmax(1, fabs(theirs[k]));
    if (!(off <= largest)) largest = off;
  }
  snprintf(what, sizeof what, "isolation%zu_error", n_primaries);
  bench_value(what, largest, "relative, of the optimum");
  ef__simplex_free(simplex);
  glp_delete_prob(glpk);
  free(table);
  free(ours);
  free(theirs);
}

int main(void) {
  for (size_t n = 4; n <= EF_MAX_DRIVES; ++n) bench_primaries(n);
  return 0;
}

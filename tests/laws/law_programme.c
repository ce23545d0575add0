/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Linear programmes of the sizes that isolation makes, on random problems:
 * against all corners one by one and, where it is on the machine, against GLPK
 * (a general library for linear programmes). */
#include <stdlib.h>

#include "gen.h"
#include "near.h"
#include "stimulus/stimulus_private.h"

#ifdef WITH_GLPK
#include <glpk.h>
#endif

enum { ROWS = 5, COLUMNS = 9 };

/* With a point inside the bounds that keeps the rows, so that there is an
 * answer; or, without, most likely none. */
static void fill(gen *g, size_t m, size_t n, bool feasible, ef__table *p) {
  *p = (ef__table){.n_rows = m, .n_columns = n};
  gen_fill(g, m * n, -1, 1, p->row);
  gen_fill(g, n, -1, 1, p->gain);
  for (size_t j = 0; j < n; j++) {
    p->low[j] = gen_between(g, -2, 0);
    p->high[j] = p->low[j] + gen_between(g, 0, 2);
    if (gen_unit(g) < 0.1)
      p->high[j] = p->low[j]; /* no room */
  }
  for (size_t i = 0; i < m; i++) {
    p->right[i] = feasible ? 0 : gen_between(g, -3, 3);
    if (gen_unit(g) < 0.3) /* zeros make for ties; rows stay independent */
      for (size_t j = 0; j < n; j++)
        if (j != i && gen_unit(g) < 0.5)
          p->row[i * n + j] = 0;
  }
  for (size_t j = 0; j < n && feasible; j++) {
    /* often at a bound: more ties */
    const double share = gen_unit(g) < 0.5 ? 0 : gen_unit(g);
    const double x = p->low[j] + share * (p->high[j] - p->low[j]);
    for (size_t i = 0; i < m; i++)
      p->right[i] += p->row[i * n + j] * x;
  }
}

static void rows_and_bounds_hold(const ef__table *p, const double *x) {
  const size_t m = p->n_rows, n = p->n_columns;
  for (size_t j = 0; j < n; j++) {
    assert_true(x[j] >= p->low[j]);
    assert_true(x[j] <= p->high[j]);
  }
  for (size_t i = 0; i < m; i++) {
    double sum = -p->right[i];
    for (size_t j = 0; j < n; j++)
      sum += p->row[i * n + j] * x[j];
    assert_near(sum, 0, 1e-12);
  }
}

/* By itself and as one of a series. */
static ef__simplex_end solve(const ef__table *p, double *x, double *value) {
  double y[EF__TABLE_COLUMNS], other;
  ef__simplex *simplex = ef__simplex_new(p->n_rows, p->n_columns);
  assert_non_null(simplex);
  assert_int_equal(ef__table_solve_next(p, simplex, y, &other),
                   ef__table_solve(p, simplex, x, value));
  const ef__simplex_end end = ef__table_solve_next(p, simplex, y, &other);
  ef__simplex_free(simplex);
  if (end == EF__SIMPLEX_BEST) {
    rows_and_bounds_hold(p, y);
    assert_near(other, *value, 1e-11);
  }
  return end;
}

/* ---- All corners -------------------------------------------------------- */

/* Largest gain with the columns of `basis` free and each other one at one of
 * its bounds, or -infinity. */
static double best_of_basis(const ef__table *p, const bool *basic) {
  const size_t m = p->n_rows, n = p->n_columns;
  double best = -INFINITE;
  for (unsigned sides = 0; sides < 1u << (n - m); sides++) {
    double a[ROWS * ROWS], x[COLUMNS], right[ROWS];
    unsigned rest = sides;
    size_t k = 0, column[ROWS];
    for (size_t j = 0; j < n; j++) {
      if (basic[j]) {
        column[k++] = j;
        continue;
      }
      x[j] = rest & 1 ? p->high[j] : p->low[j];
      rest >>= 1;
    }
    for (size_t i = 0; i < m; i++) {
      right[i] = p->right[i];
      for (size_t j = 0; j < n; j++)
        if (!basic[j])
          right[i] -= p->row[i * n + j] * x[j];
      for (size_t c = 0; c < m; c++)
        a[i * m + c] = p->row[i * n + column[c]];
    }
    /* Elimination without scaling; corners of flat bases are left out, which
     * are limits of others. */
    bool whole = true;
    for (size_t s = 0; s < m && whole; s++) {
      size_t pivot = s;
      for (size_t i = s + 1; i < m; i++)
        if (fabs(a[i * m + s]) > fabs(a[pivot * m + s]))
          pivot = i;
      whole = fabs(a[pivot * m + s]) > 1e-9;
      for (size_t c = 0; c < m && whole; c++) {
        const double kept = a[s * m + c];
        a[s * m + c] = a[pivot * m + c];
        a[pivot * m + c] = kept;
      }
      const double kept = right[s];
      right[s] = right[pivot];
      right[pivot] = kept;
      for (size_t i = 0; i < m && whole; i++) {
        if (i == s)
          continue;
        const double share = a[i * m + s] / a[s * m + s];
        for (size_t c = 0; c < m; c++)
          a[i * m + c] -= share * a[s * m + c];
        right[i] -= share * right[s];
      }
    }
    double value = 0;
    for (size_t c = 0; c < m && whole; c++) {
      const size_t j = column[c];
      x[j] = right[c] / a[c * m + c];
      whole = x[j] >= p->low[j] - 1e-9 && x[j] <= p->high[j] + 1e-9;
    }
    for (size_t j = 0; j < n && whole; j++)
      value += p->gain[j] * x[j];
    if (whole && value > best)
      best = value;
  }
  return best;
}

static double best_of_all(const ef__table *p) {
  const size_t m = p->n_rows, n = p->n_columns;
  double best = -INFINITE;
  for (unsigned set = 0; set < 1u << n; set++) {
    bool basic[COLUMNS];
    size_t count = 0;
    for (size_t j = 0; j < n; j++) {
      basic[j] = set >> j & 1;
      count += basic[j];
    }
    if (count == m)
      best = fmax(best, best_of_basis(p, basic));
  }
  return best;
}

static void no_corner_is_better(void **state) {
  (void)state;
  gen g = gen_new(41);
  ef__table p;
  double x[COLUMNS], value;
  for (int k = 0; k < 300; k++) {
    const size_t m = 1 + gen_below(&g, 3);
    const size_t n = m + 1 + gen_below(&g, 4);
    fill(&g, m, n, true, &p);
    assert_int_equal(solve(&p, x, &value), EF__SIMPLEX_BEST);
    rows_and_bounds_hold(&p, x);
    assert_near(value, best_of_all(&p), 1e-8);
  }
}

static void problems_without_answer_are_told(void **state) {
  (void)state;
  gen g = gen_new(42);
  ef__table p;
  double x[COLUMNS], value;
  int n_empty = 0;
  for (int k = 0; k < 300; k++) {
    const size_t m = 1 + gen_below(&g, 3);
    const size_t n = m + 1 + gen_below(&g, 3);
    fill(&g, m, n, false, &p);
    const ef__simplex_end end = solve(&p, x, &value);
    const double best = best_of_all(&p);
    assert_int_equal(end, isfinite(best) ? EF__SIMPLEX_BEST
                                         : EF__SIMPLEX_INFEASIBLE);
    n_empty += end == EF__SIMPLEX_INFEASIBLE;
  }
  printf("# %d of 300 have no answer\n", n_empty);
  assert_true(n_empty > 50 && n_empty < 290);
}

/* ---- GLPK --------------------------------------------------------------- */

#ifdef WITH_GLPK
/* False when there is no answer. */
static bool peer_solve(const ef__table *p, double *value) {
  const size_t m = p->n_rows, n = p->n_columns;
  glp_prob *lp = glp_create_prob();
  glp_set_obj_dir(lp, GLP_MAX);
  glp_add_rows(lp, (int)m);
  glp_add_cols(lp, (int)n);
  for (size_t i = 0; i < m; i++)
    glp_set_row_bnds(lp, (int)i + 1, GLP_FX, p->right[i], p->right[i]);
  for (size_t j = 0; j < n; j++) {
    int row[EF__TABLE_ROWS + 1];
    double column[EF__TABLE_ROWS + 1];
    for (size_t i = 0; i < m; i++) {
      row[i + 1] = (int)i + 1;
      column[i + 1] = p->row[i * n + j];
    }
    glp_set_mat_col(lp, (int)j + 1, (int)m, row, column);
    glp_set_col_bnds(lp, (int)j + 1, p->low[j] < p->high[j] ? GLP_DB : GLP_FX,
                     p->low[j], p->high[j]);
    glp_set_obj_coef(lp, (int)j + 1, p->gain[j]);
  }
  glp_smcp settings;
  glp_init_smcp(&settings);
  settings.msg_lev = GLP_MSG_OFF;
  settings.tol_bnd = settings.tol_dj = 1e-11;
  settings.tol_piv = 1e-11;
  assert_int_equal(glp_simplex(lp, &settings), 0);
  const bool solved = glp_get_status(lp) == GLP_OPT;
  *value = glp_get_obj_val(lp);
  glp_delete_prob(lp);
  return solved;
}

static void check_peer(size_t largest_m, size_t largest_n, int n_problems) {
  gen g = gen_new(43 + largest_n);
  ef__table p;
  double x[EF__TABLE_COLUMNS], value, other;
  deviation d = {0};
  for (int k = 0; k < n_problems; k++) {
    char where[32];
    const size_t m = 1 + gen_below(&g, largest_m);
    const size_t n = m + 1 + gen_below(&g, largest_n - m);
    fill(&g, m, n, true, &p);
    assert_int_equal(solve(&p, x, &value), EF__SIMPLEX_BEST);
    rows_and_bounds_hold(&p, x);
    assert_true(peer_solve(&p, &other));
    snprintf(where, sizeof where, "%zu x %zu, problem %d", m, n, k);
    deviation_add(&d, value, other, where);
  }
  deviation_print(&d, "optimum against GLPK");
  assert_near(d.largest, 0, 1e-9);
}

static void optimum_is_that_of_glpk(void **state) {
  (void)state;
  check_peer(5, 9, 3000);  /* a given background */
  check_peer(8, 18, 3000); /* a background to choose */
  check_peer(EF__TABLE_ROWS, EF__TABLE_COLUMNS, 1000);
}
#endif

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(no_corner_is_better),
      cmocka_unit_test(problems_without_answer_are_told),
#ifdef WITH_GLPK
      cmocka_unit_test(optimum_is_that_of_glpk),
#endif
  };
#ifndef WITH_GLPK
  printf("# without GLPK, the comparison with it is left out\n");
#endif
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}

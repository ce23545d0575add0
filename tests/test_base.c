/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <float.h>
#include <pthread.h>
#include <stdatomic.h>
#include <stdlib.h>
#include <sys/wait.h>
#include <unistd.h>

#include <gsl/gsl_errno.h>

#include "base/base_private.h"
#include "fail_alloc.h"
#include "gen.h"
#include "near.h"

/* ---- Errors and notes -------------------------------------------------- */

static void status_texts_are_distinct(void **state) {
  (void)state;
  for (int i = EF_OK; i <= EF_EXISTS; ++i) {
    for (int j = EF_OK; j < i; ++j) {
      assert_string_not_equal(ef_status_text((ef_status)i),
                              ef_status_text((ef_status)j));
    }
  }
  assert_string_equal(ef_status_text((ef_status)99), "unknown status");
}

static void version_is_the_builds(void **state) {
  (void)state;
  int major = -1, minor = -1, patch = -1;
  assert_int_equal(sscanf(ef_version(), "%d.%d.%d", &major, &minor, &patch), 3);
  assert_true(major >= 0 && minor >= 0 && patch >= 0);
}

static void error_is_set_and_placed(void **state) {
  (void)state;
  ef_error error;
  memset(&error, 0x55, sizeof error);
  assert_int_equal(
      ef__error_set(&error, EF_MALFORMED, "'%s' is no number", "4o0"),
      EF_MALFORMED);
  assert_int_equal(error.line, 0);
  assert_string_equal(error.file, "");
  assert_int_equal(ef__error_place(&error, "in.csv", 17, 3, NULL),
                   EF_MALFORMED);
  char text[300];
  ef_error_describe(&error, text, sizeof text);
  assert_string_equal(text, "in.csv:17: column 3: '4o0' is no number");
  ef__error_place(&error, NULL, 0, 0, "400");
  ef_error_describe(&error, text, sizeof text);
  assert_string_equal(text, "in.csv:17: field 400: '4o0' is no number");
  assert_int_equal(error.column, 3);
}

static void error_description_leaves_out_what_is_unknown(void **state) {
  (void)state;
  ef_error error;
  char text[300];
  ef__error_set(&error, EF_INVALID, "count is 0");
  ef_error_describe(&error, text, sizeof text);
  assert_string_equal(text, "count is 0");
  ef__error_place(&error, NULL, 4, 0, NULL);
  ef_error_describe(&error, text, sizeof text);
  assert_string_equal(text, "line 4: count is 0");
  ef__error_set(&error, EF_UNREADABLE, "no such file");
  ef__error_place(&error, "a.csv", 0, 0, NULL);
  ef_error_describe(&error, text, sizeof text);
  assert_string_equal(text, "a.csv: no such file");
  const ef_error bare = {.status = EF_NO_MEMORY};
  ef_error_describe(&bare, text, sizeof text);
  assert_string_equal(text, "out of memory");
}

static void error_may_be_null(void **state) {
  (void)state;
  assert_int_equal(ef__error_set(NULL, EF_INVALID, "x"), EF_INVALID);
  assert_int_equal(ef__error_place(NULL, "f", 1, 1, "x"), EF_OK);
  assert_int_equal(ef__error_unknown(NULL, "table", "x", NULL, 0),
                   EF_UNKNOWN_NAME);
  assert_int_equal(ef__error_memory(NULL, "x"), EF_NO_MEMORY);
}

static void error_message_is_one_line_of_whole_characters(void **state) {
  (void)state;
  ef_error error;
  ef__error_set(&error, EF_MALFORMED, "%s", "a\nb\x1b[0m");
  assert_string_equal(error.message, "a?b?[0m");
  /* 510 letters leave one byte for a character of two, then of three. */
  char wide[600];
  const char *const character[] = {"\xC3\xA9", "\xE2\x82\xAC",
                                   "\xF0\x9F\x99\x82"};
  for (size_t i = 0; i < 3; ++i) {
    memset(wide, 'x', 510);
    strcpy(wide + 510, character[i]);
    ef__error_set(&error, EF_MALFORMED, "%s", wide);
    assert_int_equal(strlen(error.message), 510);
  }
  memset(wide, 'x', 509);
  strcpy(wide + 509, "\xC3\xA9");
  ef__error_set(&error, EF_MALFORMED, "%s", wide);
  assert_int_equal(strlen(error.message), 511);
  memset(wide, 'n', 599);
  wide[599] = '\0';
  ef__error_place(&error, wide, 0, 0, wide);
  assert_int_equal(strlen(error.file), 255);
  assert_int_equal(strlen(error.field), 63);
}

static void description_fits_any_buffer(void **state) {
  (void)state;
  ef_error error;
  ef__error_set(&error, EF_INVALID, "message");
  ef__error_place(&error, "file", 12, 0, "field");
  char whole[64];
  ef_error_describe(&error, whole, sizeof whole);
  for (size_t size = 1; size <= strlen(whole) + 1; ++size) {
    char *const text = malloc(size); /* exact, for the sanitizer */
    assert_non_null(text);
    ef_error_describe(&error, text, size);
    assert_int_equal(strlen(text), size - 1);
    assert_memory_equal(text, whole, size - 1);
    free(text);
  }
}

static void keep_note(void *cookie, const char *line) {
  snprintf(cookie, 80, "%s", line);
}

static void notes_reach_their_sink(void **state) {
  (void)state;
  char kept[80] = "";
  const ef_notes notes = {keep_note, kept};
  ef__note(&notes, "taken as %s: %d of %d", "percent", 3, 7);
  assert_string_equal(kept, "taken as percent: 3 of 7");
  ef__note(NULL, "nobody hears");
  const ef_notes deaf = {NULL, kept};
  ef__note(&deaf, "nobody hears");
  assert_string_equal(kept, "taken as percent: 3 of 7");
}

/* ---- Memory ------------------------------------------------------------ */

static void sizes_do_not_overflow(void **state) {
  (void)state;
  size_t size = 7;
  assert_true(ef__size_multiply(SIZE_MAX / 3, 3, &size));
  assert_int_equal(size, SIZE_MAX / 3 * 3);
  assert_false(ef__size_multiply(SIZE_MAX / 3 + 1, 3, &size));
  assert_true(ef__size_multiply(SIZE_MAX, 0, &size));
  assert_int_equal(size, 0);
  assert_true(ef__size_add(SIZE_MAX - 5, 5, &size));
  assert_int_equal(size, SIZE_MAX);
  assert_false(ef__size_add(SIZE_MAX - 5, 6, &size));
  assert_null(ef__allocate(SIZE_MAX / 2, 3));
  assert_null(ef__allocate_zeroed(SIZE_MAX / 2, 3));
  assert_null(ef__reallocate(NULL, SIZE_MAX / 2, 3));
  assert_null(ef__copy_text("", SIZE_MAX));
  void *const empty[] = {ef__allocate(0, 8), ef__allocate_zeroed(8, 0),
                         ef__reallocate(NULL, 0, 8)};
  for (size_t i = 0; i < 3; ++i) {
    assert_non_null(empty[i]);
    free(empty[i]);
  }
}

static void block_holds_aligned_zeroed_arrays(void **state) {
  (void)state;
  char *name = NULL;
  double *value = NULL;
  size_t *index = NULL;
  const ef__part part[] = {{&name, 3, sizeof *name},
                           {&value, 5, sizeof *value},
                           {&index, 0, sizeof *index}};
  void *const block = ef__allocate_block(3, part);
  assert_non_null(block);
  assert_ptr_equal(name, block);
  assert_true((uintptr_t)value % _Alignof(max_align_t) == 0);
  assert_true((char *)value >= name + 3);
  assert_true((char *)index >= (char *)(value + 5));
  for (size_t i = 0; i < 5; ++i)
    assert_near(value[i], 0, 0);
  free(block);
  const ef__part huge[] = {{&name, SIZE_MAX, 1}, {&value, SIZE_MAX / 8, 8}};
  assert_null(ef__allocate_block(2, huge));
  assert_null(ef__allocate_block(1, &huge[1]));
}

static void text_is_copied(void **state) {
  (void)state;
  char *const copy = ef__copy_text("daylight:6500", 8);
  assert_string_equal(copy, "daylight");
  free(copy);
}

static bool allocate_thrice(void *context) {
  (void)context;
  void *const a = ef__allocate(4, 4);
  void *const b = ef__allocate_zeroed(4, 4);
  char *const c = ef__copy_text("c", 1);
  void *const d = a != NULL ? ef__reallocate(a, 8, 4) : NULL;
  const bool all = b != NULL && c != NULL && d != NULL;
  free(d != NULL ? d : a);
  free(b);
  free(c);
  return all;
}

static void each_allocation_can_be_made_to_fail(void **state) {
  (void)state;
  assert_int_equal(fail_alloc_each(allocate_thrice, NULL), 4);
}

/* ---- Linear algebra ---------------------------------------------------- */

static void mat3_products_and_inverse(void **state) {
  (void)state;
  const double m[9] = {2, -1, 0.5, 3, 4, -2, 0.25, 1, 5};
  assert_near(ef__mat3_determinant(m), 60.5, 1e-13); /* by hand */
  double inverse[9], product[9];
  assert_true(ef__mat3_inverse(m, inverse));
  ef__mat3_multiply(m, inverse, product);
  for (size_t i = 0; i < 9; ++i) {
    assert_near(product[i], i % 4 == 0 ? 1 : 0, 4 * DBL_EPSILON);
  }
  double v[3] = {1, 10, 100};
  ef__mat3_apply(m, v, v); /* in place */
  const double expected[3] = {42, -157, 510.25};
  assert_same_bits(v, expected, 3);
  double t[9];
  memcpy(t, m, sizeof t);
  ef__mat3_transpose(t, t);
  const double transposed[9] = {2, 3, 0.25, -1, 4, 1, 0.5, -2, 5};
  assert_same_bits(t, transposed, 9);
  double square[9], in_place[9];
  ef__mat3_multiply(m, m, square);
  memcpy(in_place, m, sizeof m);
  ef__mat3_multiply(in_place, in_place, in_place);
  assert_same_bits(in_place, square, 9);
}

static void singular_mat3_has_no_inverse(void **state) {
  (void)state;
  double out[9] = {37.23};
  const double dependent[9] = {0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.5, 0.7, 0.9};
  assert_false(ef__mat3_inverse(dependent, out));
  const double zero[9] = {0};
  assert_false(ef__mat3_inverse(zero, out));
  double bad[9] = {1, 0, 0, 0, 1, 0, 0, 0, NOT_A_NUMBER};
  assert_false(ef__mat3_inverse(bad, out));
  bad[8] = INFINITE;
  assert_false(ef__mat3_inverse(bad, out));
  assert_near(out[0], 37.23, 0);
  /* Scale alone does not make a matrix singular. */
  const double tiny[9] = {1e-80, 0, 0, 0, 2e-80, 0, 0, 0, 4e-80};
  assert_true(ef__mat3_inverse(tiny, out));
  assert_near_relative(out[8], 0.25e80, 4 * DBL_EPSILON);
}

static void solve_returns_the_solution(void **state) {
  (void)state;
  gen g = gen_new(11);
  for (int trial = 0; trial < 200; ++trial) {
    enum { LARGEST = 8 };
    const size_t n = 1 + gen_below(&g, LARGEST);
    double a[LARGEST * LARGEST], kept[LARGEST * LARGEST];
    double x[LARGEST * 2], b[LARGEST * 2] = {0};
    gen_fill(&g, n * n, -1, 1, a);
    gen_fill(&g, n * 2, -1, 1, x);
    /* Rows of very different scale must not matter. */
    for (size_t i = 0; i < n; ++i) {
      const double scale = pow(10, gen_between(&g, -8, 8));
      for (size_t j = 0; j < n; ++j)
        a[i * n + j] *= scale;
    }
    memcpy(kept, a, sizeof a);
    for (size_t i = 0; i < n; ++i) {
      for (size_t j = 0; j < n; ++j) {
        b[2 * i] += a[i * n + j] * x[2 * j];
        b[2 * i + 1] += a[i * n + j] * x[2 * j + 1];
      }
    }
    assert_true(ef__solve(n, a, 2, b));
    /* Backward stable: the residual, not the error, is small. */
    for (size_t i = 0; i < n; ++i) {
      double residual = 0, size = 0;
      for (size_t j = 0; j < n; ++j) {
        residual += kept[i * n + j] * (x[2 * j] - b[2 * j]);
        size += fabs(kept[i * n + j]) * (fabs(x[2 * j]) + fabs(b[2 * j]));
      }
      assert_near(residual, 0, 100 * DBL_EPSILON * size);
    }
  }
}

static void solve_refuses_singular_systems(void **state) {
  (void)state;
  double a[9] = {1, 2, 3, 4, 5, 6, 7, 8, 9};
  double b[3] = {1, 2, 3};
  assert_false(ef__solve(3, a, 1, b));
  double zero_row[4] = {1, 2, 0, 0};
  assert_false(ef__solve(2, zero_row, 1, b));
  double nan_row[4] = {1, 2, NOT_A_NUMBER, NOT_A_NUMBER};
  assert_false(ef__solve(2, nan_row, 1, b));
}

static void condition_of(size_t n_rows, size_t n_columns, const double *a,
                         double *singular, double *condition) {
  double scratch[64];
  assert_true(ef__condition_scratch(n_rows, n_columns) <= 64);
  assert_int_equal(
      ef__condition(n_rows, n_columns, a, scratch, singular, condition, NULL),
      EF_OK);
}

static void condition_is_ratio_of_singular_values(void **state) {
  (void)state;
  /* Rotation x diag(5, 2, 0.5) x rotation. */
  const double c = cos(0.7), s = sin(0.7);
  const double left[9] = {c, -s, 0, s, c, 0, 0, 0, 1};
  const double middle[9] = {5, 0, 0, 0, 0.5, 0, 0, 0, 2};
  const double right[9] = {1, 0, 0, 0, c, s, 0, -s, c};
  double m[9], singular[3], condition;
  ef__mat3_multiply(left, middle, m);
  ef__mat3_multiply(m, right, m);
  condition_of(3, 3, m, singular, &condition);
  assert_near(singular[0], 5, 1e-14);
  assert_near(singular[1], 2, 1e-14);
  assert_near(singular[2], 0.5, 1e-14);
  assert_near(condition, 10, 1e-13);
  const double wide[6] = {3, 0, 0, 0, 0, 4};
  condition_of(2, 3, wide, singular, &condition);
  assert_near(condition, 4.0 / 3, 1e-15);
  condition_of(3, 2, wide, NULL, &condition); /* rows (3,0) (0,0) (0,4) */
  assert_near(condition, 4.0 / 3, 1e-15);
  const double dependent[6] = {1, 2, 2, 4, 3, 6};
  condition_of(3, 2, dependent, NULL, &condition);
  assert_true(isinf(condition));
  ef_error error;
  double nothing[1];
  assert_int_equal(ef__condition(0, 3, m, nothing, NULL, &condition, &error),
                   EF_INVALID);
  assert_error(&error, EF_INVALID, "empty matrix");
}

/* ---- Loops ------------------------------------------------------------- */

typedef struct loop_record {
  atomic_int visits[1000];
  size_t begin_of[1000];
  atomic_int n_calls;
} loop_record;

static void record_range(void *ctx, size_t begin, size_t end) {
  loop_record *const r = ctx;
  atomic_fetch_add(&r->n_calls, 1);
  for (size_t i = begin; i < end; ++i) {
    atomic_fetch_add(&r->visits[i], 1);
    r->begin_of[i] = begin;
  }
}

static void loop_visits_each_index_once_in_fixed_chunks(void **state) {
  (void)state;
  const int jobs[] = {0, 1, 2, 5, 300, -3};
  const size_t size[] = {1, 7, 64, 65, 999, 1000};
  const size_t chunk[] = {0, 1, 7, 64, 5000};
  for (size_t a = 0; a < 6; ++a) {
    for (size_t b = 0; b < 6; ++b) {
      for (size_t c = 0; c < 5; ++c) {
        static loop_record r;
        memset(&r, 0, sizeof r);
        ef_parallel_for(size[b], chunk[c], jobs[a], record_range, &r);
        const size_t step = chunk[c] == 0 ? 1 : chunk[c];
        for (size_t i = 0; i < size[b]; ++i) {
          assert_int_equal(r.visits[i], 1);
          assert_int_equal(r.begin_of[i], i / step * step);
        }
        assert_int_equal(r.n_calls, (size[b] + step - 1) / step);
      }
    }
  }
  ef_parallel_for(0, 4, 0, record_range, NULL); /* nothing to call */
}

enum { OUTER = 40, INNER = 50 };

static void count_inner(void *ctx, size_t begin, size_t end) {
  atomic_fetch_add((atomic_size_t *)ctx, end - begin);
}

static void run_inner(void *ctx, size_t begin, size_t end) {
  for (size_t i = begin; i < end; ++i)
    ef_parallel_for(INNER, 3, 3, count_inner, ctx);
}

static void *run_outer(void *cookie) {
  for (int i = 0; i < 20; ++i)
    ef_parallel_for(OUTER, 1, 4, run_inner, cookie);
  return NULL;
}

/* Each waits for its own pieces and for no other's. */
static void loops_run_within_and_beside_each_other(void **state) {
  (void)state;
  enum { CALLERS = 5 };
  pthread_t caller[CALLERS];
  atomic_size_t visits[CALLERS];
  for (int i = 0; i < CALLERS; ++i) {
    atomic_init(&visits[i], 0);
    assert_int_equal(pthread_create(&caller[i], NULL, run_outer, &visits[i]),
                     0);
  }
  for (int i = 0; i < CALLERS; ++i) {
    pthread_join(caller[i], NULL);
    assert_int_equal(visits[i], 20 * OUTER * INNER);
  }
}

/* A copy of the process has none of its parked threads, and starts its own. */
static void loops_run_in_a_copy_of_the_process(void **state) {
  (void)state;
  atomic_size_t visits;
  atomic_init(&visits, 0);
  run_outer(&visits);
  const pid_t copy = fork();
  assert_true(copy >= 0);
  if (copy == 0) {
    run_outer(&visits);
    if (atomic_load(&visits) != 40 * OUTER * INNER) _exit(1);
    execlp("true", "true", NULL); /* ends without a look for lost memory */
    _exit(2);
  }
  int status = -1;
  assert_int_equal(waitpid(copy, &status, 0), copy);
  assert_int_equal(status, 0);
}

/* ---- GSL --------------------------------------------------------------- */

static void gsl_codes_become_ours(void **state) {
  (void)state;
  ef__gsl_ready();
  ef__gsl_ready();
  ef_error error;
  assert_int_equal(ef__gsl_status(GSL_SUCCESS, "x", &error), EF_OK);
  assert_int_equal(ef__gsl_status(GSL_ENOMEM, "x", &error), EF_NO_MEMORY);
  assert_int_equal(ef__gsl_status(GSL_EDOM, "x", &error), EF_INVALID);
  assert_int_equal(ef__gsl_status(GSL_EMAXITER, "fitting", &error),
                   EF_NO_ANSWER);
  assert_error(&error, EF_NO_ANSWER, "fitting: ");
  /* With its default handler this call would end the process. */
  gsl_error("trial", __FILE__, __LINE__, GSL_EDOM);
}

/* ---- Names ------------------------------------------------------------- */

static const char *const flags[] = {"cie-1931",    "cie-1964", "cie-2015-2",
                                    "cie-2015-10", "bt709",    "D65"};

static void near_names_come_nearest_first(void **state) {
  (void)state;
  size_t index[6];
  assert_int_equal(ef_nearest_names("cie-1934", flags, 6, 6, index), 2);
  assert_int_equal(index[0], 0); /* one edit each: in order of the list */
  assert_int_equal(index[1], 1);
  assert_int_equal(ef_nearest_names("CIE-2015-1", flags, 6, 6, index), 2);
  assert_int_equal(index[0], 2);
  assert_int_equal(index[1], 3);
  assert_int_equal(ef_nearest_names("d65", flags, 6, 6, index), 1);
  assert_int_equal(index[0], 5);
  assert_int_equal(ef_nearest_names("cie", flags, 6, 2, index), 2);
  assert_int_equal(index[1], 1);
  assert_int_equal(ef_nearest_names("bt790", flags, 6, 6, index), 1);
  assert_int_equal(index[0], 4); /* two letters swapped */
  assert_int_equal(ef_nearest_names("bt7x0", flags, 6, 6, index), 0);
  assert_int_equal(ef_nearest_names("bt70", flags, 6, 6, index), 1);
  assert_int_equal(ef_nearest_names("", flags, 6, 6, index), 0);
  assert_int_equal(ef_nearest_names("cie-1934", flags, 6, 0, NULL), 0);
  char endless[400];
  memset(endless, 'c', sizeof endless - 1);
  endless[sizeof endless - 1] = '\0';
  assert_int_equal(ef_nearest_names(endless, flags, 6, 6, index), 0);
}

static void unknown_name_is_answered_with_near_ones(void **state) {
  (void)state;
  ef_error error;
  ef__error_unknown(&error, "observer", "cie-1913", flags, 6);
  assert_error(&error, EF_UNKNOWN_NAME,
               "no observer is called 'cie-1913'; near names: cie-1931");
  ef__error_unknown(&error, "observer", "zzz", flags, 6);
  assert_error(&error, EF_UNKNOWN_NAME, "known: cie-1931, cie-1964, ");
  assert_true(ef__name_equal("CIE-D65", "cie-d65"));
  assert_false(ef__name_equal("cie-d65", "cie-d6"));
  assert_false(ef__name_equal("cie-d6", "cie-d65"));
}

/* ---- Quantiles ---------------------------------------------------------- */

static int by_value(const void *a, const void *b) {
  const double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

static void quantile_by_hand(void **state) {
  (void)state;
  double value[] = {7.0, 1.0, 3.0, 2.0};
  assert_near(ef_quantile(4, value, 0.0), 1.0, 0.0);
  assert_near(ef_quantile(4, value, 0.5), 2.5, 0.0);
  assert_near(ef_quantile(4, value, 0.75), 4.0, 0.0);
  assert_near(ef_quantile(4, value, 1.0), 7.0, 0.0);
  double one = 37.23;
  assert_near(ef_quantile(1, &one, 0.3), 37.23, 0.0);
}

/* The definition on sorted values, whatever the order and however many are
 * equal. */
static void quantile_is_that_of_sorted_values(void **state) {
  (void)state;
  gen g = gen_new(20261201);
  for (int round = 0; round < 300; ++round) {
    double value[40], sorted[40];
    const size_t n = 1 + (size_t)(gen_unit(&g) * 39.99);
    const double grain = gen_unit(&g) < 0.5 ? 4.0 : 1e6;
    for (size_t i = 0; i < n; ++i)
      value[i] = sorted[i] = floor(grain * gen_unit(&g));
    qsort(sorted, n, sizeof *sorted, by_value);
    const double p = gen_unit(&g);
    const double at = p * (double)(n - 1);
    const size_t k = (size_t)at;
    const double next = k + 1 < n ? sorted[k + 1] : sorted[k];
    assert_near(ef_quantile(n, value, p),
                sorted[k] + (at - (double)k) * (next - sorted[k]), 0.0);
    qsort(value, n, sizeof *value, by_value); /* none is lost */
    assert_memory_equal(value, sorted, n * sizeof *value);
  }
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(status_texts_are_distinct),
      cmocka_unit_test(version_is_the_builds),
      cmocka_unit_test(error_is_set_and_placed),
      cmocka_unit_test(error_description_leaves_out_what_is_unknown),
      cmocka_unit_test(error_may_be_null),
      cmocka_unit_test(error_message_is_one_line_of_whole_characters),
      cmocka_unit_test(description_fits_any_buffer),
      cmocka_unit_test(notes_reach_their_sink),
      cmocka_unit_test(sizes_do_not_overflow),
      cmocka_unit_test(block_holds_aligned_zeroed_arrays),
      cmocka_unit_test(text_is_copied),
      cmocka_unit_test(each_allocation_can_be_made_to_fail),
      cmocka_unit_test(mat3_products_and_inverse),
      cmocka_unit_test(singular_mat3_has_no_inverse),
      cmocka_unit_test(solve_returns_the_solution),
      cmocka_unit_test(solve_refuses_singular_systems),
      cmocka_unit_test(condition_is_ratio_of_singular_values),
      cmocka_unit_test(quantile_by_hand),
      cmocka_unit_test(quantile_is_that_of_sorted_values),
      cmocka_unit_test(loop_visits_each_index_once_in_fixed_chunks),
      cmocka_unit_test(loops_run_within_and_beside_each_other),
      cmocka_unit_test(loops_run_in_a_copy_of_the_process),
      cmocka_unit_test(gsl_codes_become_ours),
      cmocka_unit_test(near_names_come_nearest_first),
      cmocka_unit_test(unknown_name_is_answered_with_near_ones),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}

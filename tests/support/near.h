/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * Comparisons of doubles for tests, each with its tolerance at the call, and a
 * record of the largest deviation for the published checks. */
#ifndef EVENFIELD_TESTS_NEAR_H
#define EVENFIELD_TESTS_NEAR_H

#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <string.h>

#include <cmocka.h>

#include <evenfield/base.h>

/* The macros of math.h are float. */
#define NOT_A_NUMBER ((double)NAN)
#define INFINITE ((double)INFINITY)

static inline void near_fail(double actual, double expected, double tolerance,
                             const char *expression, const char *file,
                             int line) {
  print_error("%s is %.17g, expected %.17g, off by %.3g, allowed %.3g\n",
              expression, actual, expected, fabs(actual - expected), tolerance);
  _fail(file, line);
}

static inline void near_check(double actual, double expected, double tolerance,
                              const char *expression, const char *file,
                              int line) {
  /* Written so that NaN fails. */
  if (fabs(actual - expected) <= tolerance)
    return;
  near_fail(actual, expected, tolerance, expression, file, line);
}

/** |actual - expected| <= absolute. */
#define assert_near(actual, expected, absolute)                                \
  near_check((actual), (expected), (absolute), #actual, __FILE__, __LINE__)

/** |actual - expected| <= relative * |expected|. */
#define assert_near_relative(actual, expected, relative)                       \
  near_check((actual), (expected), (relative)*fabs(expected), #actual,         \
             __FILE__, __LINE__)

static inline void same_bits_check(const double *actual, const double *expected,
                                   size_t n, const char *expression,
                                   const char *file, int line) {
  for (size_t i = 0; i < n; ++i) {
    if (memcmp(&actual[i], &expected[i], sizeof *actual) == 0)
      continue;
    print_error("%s[%zu] is %.17g (%a), expected %.17g (%a) to the bit\n",
                expression, i, actual[i], actual[i], expected[i], expected[i]);
    _fail(file, line);
  }
}

/** Both arrays of n doubles are equal bit for bit. */
#define assert_same_bits(actual, expected, n)                                  \
  same_bits_check((actual), (expected), (n), #actual, __FILE__, __LINE__)

static inline void error_check(const ef_error *error, ef_status status,
                               const char *part, const char *file, int line) {
  if (error->status == status && strstr(error->message, part) != NULL)
    return;
  print_error("error is \"%s\" (%s), expected \"...%s...\" (%s)\n",
              error->message, ef_status_text(error->status), part,
              ef_status_text(status));
  _fail(file, line);
}

/** The error has this status and `part` stands in its message. */
#define assert_error(error, status, part)                                      \
  error_check((error), (status), (part), __FILE__, __LINE__)

/** The largest deviation seen in a check, and where. */
typedef struct deviation {
  double largest;
  char where[96];
} deviation;

static inline void deviation_add(deviation *d, double actual, double expected,
                                 const char *where) {
  const double off = fabs(actual - expected);
  if (off <= d->largest)
    return; /* NaN goes on and is kept */
  d->largest = off;
  snprintf(d->where, sizeof d->where, "%.95s", where);
}

/** As a TAP comment line. */
static inline void deviation_print(const deviation *d, const char *what) {
  printf("# %s: largest deviation %.3g at %s\n", what, d->largest,
         d->where[0] != '\0' ? d->where : "-");
}

#endif

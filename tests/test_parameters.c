/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Formulas with parameters, by text. */
#include "difference/difference_private.h"

#include <stdlib.h>

#include "fail_alloc.h"
#include "gen.h"
#include "near.h"

static void a_bare_name_is_the_registered_formula(void **state) {
  (void)state;
  for (size_t i = 0; i < ef_metric_count(); ++i) {
    const ef_metric *const plain = ef_metric_at(i);
    ef_metric *const same = ef_metric_new(ef_metric_name(plain), NULL);
    assert_non_null(same);
    assert_string_equal(ef_metric_name(same), ef_metric_name(plain));
    const double jnd = ef_metric_jnd(plain).value;
    assert_same_bits(&(double){ef_metric_jnd(same).value}, &jnd, 1);
    ef_metric_free(same);
    const size_t n = ef_metric_parameter_count(plain);
    for (size_t k = 0; k < n; ++k) {
      const ef_parameter p = ef_metric_parameter_at(plain, k);
      assert_true(p.value > 0 && strlen(p.name) > 0 && strlen(p.about) > 0);
    }
    assert_null(ef_metric_parameter_at(plain, n).name);
  }
  ef_metric_free(NULL);
}

static void factors_are_those_of_the_formula(void **state) {
  (void)state;
  ef_metric *const metric = ef_metric_new("ciede2000:kl=2,kc=1.5,kh=0.8", NULL);
  ef_metric *const trade = ef_metric_new("CIEDE2000:2:1.5:0.8", NULL);
  assert_non_null(metric);
  assert_non_null(trade);
  gen g = gen_new(1);
  for (int i = 0; i < 1000; ++i) {
    const double a[3] = {gen_between(&g, 0, 100), gen_between(&g, -90, 90),
                         gen_between(&g, -90, 90)};
    const double b[3] = {gen_between(&g, 0, 100), gen_between(&g, -90, 90),
                         gen_between(&g, -90, 90)};
    const double d = ef_delta_e_ciede2000(
        (ef_lab){a[0], a[1], a[2]}, (ef_lab){b[0], b[1], b[2]}, 2, 1.5, 0.8);
    assert_true(ef_metric_difference(metric, a, b) == d);
    assert_true(ef_metric_difference(trade, a, b) == d);
  }
  ef_metric_free(metric);
  ef_metric_free(trade);
}

static void names_tell_what_differs_and_read_back(void **state) {
  (void)state;
  ef_metric *const metric =
      ef_metric_new("Ciede2000:kl=1,kh=0.8,kc=3,kc=1.5", NULL);
  assert_non_null(metric);
  assert_string_equal(ef_metric_name(metric), "ciede2000:kc=1.5,kh=0.8");
  assert_string_equal(ef_metric_title(metric), "CIEDE2000 with kc=1.5, kh=0.8");
  assert_string_equal(ef_metric_symbol(metric), "Delta E*00");
  /* The published threshold is one of the default parameters. */
  assert_true(isnan(ef_metric_jnd(metric).value));
  assert_string_equal(ef_metric_jnd(metric).source, "");
  ef_metric *const again = ef_metric_new(ef_metric_name(metric), NULL);
  assert_non_null(again);
  assert_string_equal(ef_metric_name(again), ef_metric_name(metric));
  assert_true(ef_metric_parameter_at(again, 1).value == 1.5);
  ef_metric_free(again);
  ef_metric_free(metric);
}

static void published_sets_have_names(void **state) {
  (void)state;
  ef_metric *const textiles = ef_metric_new("cie94:textiles", NULL);
  ef_metric *const cmc = ef_metric_new("CMC:1:1", NULL);
  ef_metric *const same = ef_metric_new("cmc:perceptibility", NULL);
  ef_metric *const mixed = ef_metric_new("cie94:textiles,kl=1", NULL);
  assert_string_equal(ef_metric_name(textiles), "cie94:kl=2,k1=0.048,k2=0.014");
  assert_string_equal(ef_metric_title(textiles),
                      "CIE94 with kl=2, k1=0.048, k2=0.014");
  assert_string_equal(ef_metric_name(cmc), "cmc:l=1");
  assert_string_equal(ef_metric_title(cmc), "CMC(l:c) with l=1, c=1");
  assert_string_equal(ef_metric_title(same), ef_metric_title(cmc));
  assert_string_equal(ef_metric_name(mixed), "cie94:k1=0.048,k2=0.014");
  ef_metric_free(textiles);
  ef_metric_free(cmc);
  ef_metric_free(same);
  ef_metric_free(mixed);
  ef_error error = {0};
  assert_null(ef_metric_new("cie94:textile", &error));
  assert_error(&error, EF_UNKNOWN_NAME, "textiles");
}

static void bad_texts_are_explained(void **state) {
  (void)state;
  const struct {
    const char *text;
    ef_status status;
    const char *part;
  } bad[] = {
      {"ciede:kl=2", EF_UNKNOWN_NAME, "ciede2000"},
      {":kl=2", EF_UNKNOWN_NAME, "difference formula"},
      {"", EF_UNKNOWN_NAME, "difference formula"},
      {NULL, EF_UNKNOWN_NAME, "difference formula"},
      {"ciede2000:kk=2", EF_UNKNOWN_NAME, "parameter of ciede2000"},
      {"ciede2000:=2", EF_UNKNOWN_NAME, "kl"},
      {"ciede2000:kl=0", EF_INVALID, "kl of ciede2000 is 0"},
      {"ciede2000:kl=-1", EF_INVALID, "above zero"},
      {"ciede2000:kl=", EF_INVALID, "no number"},
      {"ciede2000:kl=two", EF_INVALID, "'two'"},
      {"ciede2000:kl=nan", EF_INVALID, "no number"},
      {"ciede2000:kl=1e999", EF_INVALID, "no number"},
      {"ciede2000:", EF_INVALID, "empty"},
      {"ciede2000:kl=2,", EF_INVALID, "empty"},
      {"ciede2000:2:1:1:1", EF_INVALID, "more values"},
      {"ciede2000:2::1", EF_INVALID, "no number"},
      {"ciede2000:textiles", EF_UNKNOWN_NAME, "set of ciede2000"},
      {"cielab:kl=2", EF_INVALID, "cielab has no parameters"},
  };
  for (size_t i = 0; i < sizeof bad / sizeof *bad; ++i) {
    ef_error error = {0};
    assert_null(ef_metric_new(bad[i].text, &error));
    assert_error(&error, bad[i].status, bad[i].part);
  }
}

static bool attempt(void *context) {
  (void)context;
  ef_error error = {0};
  ef_metric *const metric = ef_metric_new("ciede2000:2", &error);
  if (metric == NULL)
    assert_error(&error, EF_NO_MEMORY, "difference formula");
  ef_metric_free(metric);
  return metric != NULL;
}

static void memory_may_run_out(void **state) {
  (void)state;
  assert_int_equal(fail_alloc_each(attempt, NULL), 1);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(a_bare_name_is_the_registered_formula),
      cmocka_unit_test(factors_are_those_of_the_formula),
      cmocka_unit_test(names_tell_what_differs_and_read_back),
      cmocka_unit_test(published_sets_have_names),
      cmocka_unit_test(bad_texts_are_explained),
      cmocka_unit_test(memory_may_run_out),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}

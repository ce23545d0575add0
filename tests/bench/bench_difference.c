/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Differences of a million pairs, the kernels of every target beside lcms2's
 * functions and the plain formulas with libm. lcms2's CIE94 is not the standard
 * one: of that only the speed compares. */
#include <math.h>
#include <stdio.h>
#include <string.h>

#include <lcms2.h>

#include "bench.h"
#include "gen.h"
#include "kernel/kernels.h"
#include "plain_formulas.h"

enum { N = 1000000 };

static double *reference, *sample, *out;
static volatile double sum;
/* 10^6 pairs once, or 10^4, which stay in the caches, a hundred times. */
static size_t n_pairs = N, n_times = 1;

typedef double plain_formula(const double r[3], const double s[3]);
typedef cmsFloat64Number peer_formula(const cmsCIELab *r, const cmsCIELab *s);
typedef void kernel_formula(size_t n, const double *r, const double *s,
                            const double *factor, double *difference);

/* Called as a user would call it: cmsCIELab is three doubles. */
static cmsFloat64Number lcms_ciede2000(const cmsCIELab *r,
                                       const cmsCIELab *s) {
  return cmsCIE2000DeltaE(r, s, 1, 1, 1);
}
static cmsFloat64Number lcms_cmc(const cmsCIELab *r, const cmsCIELab *s) {
  return cmsCMCdeltaE(r, s, 2, 1);
}

static void run_peer(void *context) {
  peer_formula *const formula = *(peer_formula *const *)context;
  for (size_t k = 0; k < n_times; ++k) {
    for (size_t i = 0; i < n_pairs; ++i) {
      const cmsCIELab *const r = (const cmsCIELab *)(reference + 3 * i);
      const cmsCIELab *const s = (const cmsCIELab *)(sample + 3 * i);
      out[i] = formula(r, s);
    }
  }
}

static void run_plain(void *context) {
  plain_formula *const formula = *(plain_formula *const *)context;
  for (size_t i = 0; i < N; ++i)
    out[i] = formula(reference + 3 * i, sample + 3 * i);
}

typedef struct kernel_run {
  kernel_formula *formula;
  const double *factor;
} kernel_run;

static void run_kernel(void *context) {
  const kernel_run *const run = context;
  for (size_t k = 0; k < n_times; ++k)
    run->formula(n_pairs, reference, sample, run->factor, out);
}

/* One formula: what each target, the peer and the plain one take. */
static void bench_formula(const char *name, const char *title,
                          size_t place, /* in the table of kernels */
                          const double *factor, peer_formula *peer,
                          plain_formula *plain, double wanted,
                          double wanted_baseline) {
  enum { PEER, PLAIN, FIRST };
  char names[BENCH_MOST_ENTRIES][64], what[128];
  bench_entry entry[BENCH_MOST_ENTRIES] = {
      [PEER] = {"lcms2", run_peer, &peer, false, 0},
      [PLAIN] = {"libm", run_plain, &plain, false, 0}};
  kernel_run run[BENCH_MOST_ENTRIES];
  size_t n = FIRST;
  const ef__kernel_table *k;
  for (size_t t = 0; (k = ef__kernels_at(t)) != NULL; ++t, ++n) {
    memcpy(&run[n].formula, (const char *)k + place, sizeof run[n].formula);
    run[n].factor = factor;
    snprintf(names[n], sizeof names[n], "%s_%s", name, k->target);
    entry[n] = (bench_entry){names[n], run_kernel, &run[n], false, 0};
  }
  bench_run(n, entry);
  for (size_t i = 0; i < n; ++i) {
    if (i >= FIRST) continue;
    snprintf(names[i], sizeof names[i], "%s_%s", name, entry[i].name);
    entry[i].name = names[i];
  }
  bench_per_item(n, entry, N);
  for (size_t i = FIRST; i < n; ++i) {
    const bool is_baseline = i == n - 1;
    const double least = is_baseline ? wanted_baseline : wanted;
    snprintf(what, sizeof what, "%s, 10^6 pairs, %s", title,
             ef__kernels_at(i - FIRST)->target);
    if (least > 0) bench_row(what, "lcms2", &entry[i], &entry[PEER], least);
    else bench_detail(&entry[i], &entry[PEER]);
    bench_detail(&entry[i], &entry[PLAIN]);
  }
}

/* As fast as one thread reads both colours of every pair. */
static void run_reading(void *context) {
  (void)context;
  sum = bench_sum(3 * N, reference) + bench_sum(3 * N, sample);
}

/* Why no formula of 10^6 pairs can be faster: the memory. The same from the
 * caches, and the share of the speed of reading. */
static void bench_memory(const double *factor) {
  peer_formula *peer = cmsDeltaE;
  kernel_run run = {ef__kernels()->distance, factor};
  bench_entry entry[] = {{"cie76", run_kernel, &run, false, 0},
                         {"cie76_reading", run_reading, NULL, false, 0}};
  bench_run(2, entry);
  bench_row("the same, of the speed of reading", "sum of all numbers",
            &entry[0], &entry[1], 0);
  n_pairs = 10000;
  n_times = N / n_pairs;
  bench_entry near[] = {{"cie76_in_cache", run_kernel, &run, false, 0},
                        {"cie76_in_cache_lcms2", run_peer, &peer, false, 0}};
  bench_run(2, near);
  bench_row("the same, 10^4 pairs, which stay in the caches", "lcms2", &near[0],
            &near[1], 0);
  n_pairs = N;
  n_times = 1;
}

/* Largest deviation from the plain formula. */
static void report_error(const char *name, kernel_formula *formula,
                         const double *factor, plain_formula *plain) {
  double largest = 0;
  char text[64];
  formula(N, reference, sample, factor, out);
  for (size_t i = 0; i < N; ++i) {
    const double off = fabs(out[i] - plain(reference + 3 * i, sample + 3 * i));
    if (!(off <= largest)) largest = off;
  }
  snprintf(text, sizeof text, "%s_error", name);
  bench_value(text, largest, "units");
}

#define PLACE(member) offsetof(ef__kernel_table, member)

int main(void) {
  static const double ones[5] = {1, 1, 1, 0.045, 0.015};
  static const double two_one[2] = {2, 1};
  reference = bench_allocate(3 * N, sizeof *reference);
  sample = bench_allocate(3 * N, sizeof *sample);
  out = bench_allocate(N, sizeof *out);
  gen g = gen_new(1);
  for (size_t i = 0; i < 3 * N; ++i) {
    const bool is_lightness = i % 3 == 0;
    const double low = is_lightness ? 0 : -100;
    reference[i] = gen_between(&g, low, 100);
    sample[i] = gen_between(&g, low, 100);
  }
  const ef__kernel_table *const best = ef__kernels();
  bench_formula("ciede2000", "CIEDE2000", PLACE(ciede2000), ones,
                lcms_ciede2000, plain_ciede2000, 9, 3);
  report_error("ciede2000", best->ciede2000, ones, plain_ciede2000);
  bench_formula("cie94", "CIE94", PLACE(cie94), ones, cmsCIE94DeltaE,
                plain_cie94, 20, 0);
  report_error("cie94", best->cie94, ones, plain_cie94);
  bench_formula("cmc", "CMC(2:1)", PLACE(cmc), two_one, lcms_cmc, plain_cmc, 10,
                0);
  report_error("cmc", best->cmc, two_one, plain_cmc);
  bench_formula("cie76", "CIE 1976 L*a*b*", PLACE(distance), ones, cmsDeltaE,
                plain_cielab, 6, 0);
  bench_memory(ones);
  report_error("cie76", best->distance, ones, plain_cielab);
  return 0;
}

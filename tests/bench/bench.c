/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "bench.h"

#include <stdio.h>
#include <stdlib.h>
#include <time.h>

static double read_clock(clockid_t which) {
  struct timespec t;
  clock_gettime(which, &t);
  return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

double bench_wall_s(void) {
  return read_clock(CLOCK_MONOTONIC);
}

double bench_busy_s(void) {
  return read_clock(CLOCK_THREAD_CPUTIME_ID);
}

/* Threads of OpenBLAS go on turning for some hundredths of a second after a
 * call, in case another follows: what comes next would lack their processor. */
static void let_threads_rest(void) {
  const struct timespec pause = {.tv_nsec = 150 * 1000 * 1000};
  nanosleep(&pause, NULL);
}

static double time_of(const bench_entry *entry) {
  let_threads_rest();
  const double start = entry->by_wall ? bench_wall_s() : bench_busy_s();
  entry->run(entry->context);
  return (entry->by_wall ? bench_wall_s() : bench_busy_s()) - start;
}

static int by_size(const void *a, const void *b) {
  const double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

void bench_run(size_t n, bench_entry *entry) {
  double taken[BENCH_MOST_ENTRIES][BENCH_ROUNDS];
  for (size_t i = 0; i < n; ++i) entry[i].run(entry[i].context);
  for (size_t round = 0; round < BENCH_ROUNDS; ++round) {
    for (size_t i = 0; i < n; ++i) taken[i][round] = time_of(&entry[i]);
  }
  for (size_t i = 0; i < n; ++i) {
    qsort(taken[i], BENCH_ROUNDS, sizeof taken[i][0], by_size);
    entry[i].seconds = taken[i][BENCH_ROUNDS / 2];
  }
}

void bench_value(const char *name, double value, const char *unit) {
  printf("%s %.4g %s\n", name, value, unit);
}

void bench_per_item(size_t n, const bench_entry *entry, double n_items) {
  for (size_t i = 0; i < n; ++i) {
    printf("%s_ns %.4g ns\n", entry[i].name, entry[i].seconds / n_items * 1e9);
  }
}

static double print_ratio(const bench_entry *ours, const bench_entry *peer) {
  const double ratio = peer->seconds / ours->seconds;
  printf("%s_over_%s %.4g times\n", ours->name, peer->name, ratio);
  return ratio;
}

void bench_row(const char *what, const char *peer_title,
               const bench_entry *ours, const bench_entry *peer,
               double wanted) {
  const double ratio = print_ratio(ours, peer);
  const int digits = ratio < 1 ? 2 : ratio < 10 ? 1 : 0;
  printf("| %s | %s | %.*f times |", what, peer_title, digits, ratio);
  if (wanted > 0) printf(" %g |\n", wanted);
  else printf(" - |\n");
}

void bench_detail(const bench_entry *ours, const bench_entry *peer) {
  (void)print_ratio(ours, peer);
}

/* Eight sums that do not wait for each other. */
double bench_sum(size_t n, const double *value) {
  typedef double wide __attribute__((vector_size(16)));
  const wide *const x = (const wide *)value;
  wide sum[8] = {{0}};
  for (size_t i = 0; i + 8 <= n / 2; i += 8) {
    sum[0] += x[i];
    sum[1] += x[i + 1];
    sum[2] += x[i + 2];
    sum[3] += x[i + 3];
    sum[4] += x[i + 4];
    sum[5] += x[i + 5];
    sum[6] += x[i + 6];
    sum[7] += x[i + 7];
  }
  double all = 0;
  for (int k = 0; k < 8; ++k) all += sum[k][0] + sum[k][1];
  return all;
}

void *bench_allocate(size_t count, size_t size) {
  void *const block = malloc(count * size);
  if (block != NULL) return block;
  fprintf(stderr, "no memory for %zu items of %zu bytes\n", count, size);
  exit(1);
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * What the benches share: contestants in turn in one process, the median of
 * several rounds, one thread by its processor time (other work on the machine
 * does not disturb it), more threads by the wall.
 *
 * A bench prints lines "name value unit", and for each row of the table that
 * tools/bench gathers a line that begins with "|". */
#ifndef EVENFIELD_TESTS_BENCH_H
#define EVENFIELD_TESTS_BENCH_H

#include <stdbool.h>
#include <stddef.h>

/** One way to do the work. */
typedef struct bench_entry {
  const char *name; /**< "ciede2000_avx2" */
  void (*run)(void *context);
  void *context;
  bool by_wall;   /**< more than one thread */
  double seconds; /**< filled: median of the rounds */
} bench_entry;

enum { BENCH_ROUNDS = 7, BENCH_MOST_ENTRIES = 16 };

/** Fills the medians. One round before them warms caches and tables. */
void bench_run(size_t n, bench_entry *entry);

/** "name value unit", to four digits. */
void bench_value(const char *name, double value, const char *unit);
/** name_ns: nanoseconds an item, of each entry. */
void bench_per_item(size_t n, const bench_entry *entry, double n_items);

/** One row of the table: how many times faster `ours` is than `peer`, and what
 * is wanted of it (0: nothing). Prints "OURS_over_PEER value times" too. */
void bench_row(const char *what, const char *peer_title,
               const bench_entry *ours, const bench_entry *peer,
               double wanted);

/** Wall time, and processor time of this thread, now, s. */
double bench_wall_s(void);
double bench_busy_s(void);

/** The line alone, for what is no row of the table. */
void bench_detail(const bench_entry *ours, const bench_entry *peer);

/** The sum of all numbers but some of the last, as fast as they can be read.
 * `value` as malloc aligns it. */
double bench_sum(size_t n, const double *value);

/** malloc, or the end with a word about it. */
void *bench_allocate(size_t count, size_t size);

#endif

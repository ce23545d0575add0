/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What a loop on two threads costs beside threads started for it, and how long
 * a loop must be to gain by the second thread. Wall time. */
#include <pthread.h>
#include <stdatomic.h>
#include <stdio.h>

#include <evenfield/base.h>

#include "bench.h"

enum { LOOPS = 500, CHUNKS = 8, STEPS_A_US = 500 };

typedef struct loop {
  double chunk_us; /* about */
  int jobs;
  atomic_size_t next;
} loop;

static void work(void *context, size_t begin, size_t end) {
  const loop *const l = context;
  (void)begin;
  (void)end;
  volatile double sum = 1;
  double x = 1;
  const int n = (int)(l->chunk_us * STEPS_A_US);
  for (int i = 0; i < n; ++i) x = 0.5 * x + 1; /* each waits for the last */
  sum = x;
  (void)sum;
}

static void run_ours(void *context) {
  loop *const l = context;
  for (int i = 0; i < LOOPS; ++i)
    ef_parallel_for(CHUNKS, 1, l->jobs, work, context);
}

static void *take_chunks(void *context) {
  loop *const l = context;
  size_t i;
  while ((i = atomic_fetch_add(&l->next, 1)) < CHUNKS) work(context, i, i + 1);
  return NULL;
}

/* The same with a thread of its own for each loop. */
static void run_started(void *context) {
  loop *const l = context;
  for (int i = 0; i < LOOPS; ++i) {
    pthread_t other;
    atomic_store(&l->next, 0);
    const bool has_other = pthread_create(&other, NULL, take_chunks, l) == 0;
    take_chunks(l);
    if (has_other) pthread_join(other, NULL);
  }
}

int main(void) {
  static const double loop_us[] = {0, 100, 400};
  for (size_t i = 0; i < sizeof loop_us / sizeof *loop_us; ++i) {
    char name[3][64], what[96];
    loop one = {.chunk_us = loop_us[i] / CHUNKS, .jobs = 1}, two = one;
    two.jobs = 2;
    snprintf(name[0], sizeof name[0], "loop%.0fus_one", loop_us[i]);
    snprintf(name[1], sizeof name[1], "loop%.0fus_started", loop_us[i]);
    snprintf(name[2], sizeof name[2], "loop%.0fus", loop_us[i]);
    bench_entry entry[] = {{name[0], run_ours, &one, true, 0},
                           {name[1], run_started, &two, true, 0},
                           {name[2], run_ours, &two, true, 0}};
    bench_run(3, entry);
    bench_per_item(3, entry, LOOPS);
    if (loop_us[i] == 0) {
      bench_detail(&entry[2], &entry[1]);
      continue;
    }
    snprintf(what, sizeof what, "a loop of %.0f us on two threads, wall",
             loop_us[i]);
    bench_row(what, "a thread started for each", &entry[2], &entry[1], 0);
    bench_detail(&entry[2], &entry[0]);
  }
  return 0;
}

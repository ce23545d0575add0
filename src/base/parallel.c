/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/base_private.h"

#include <pthread.h>
#include <stdatomic.h>
#include <unistd.h>

enum { MAX_THREADS = 256 };

typedef struct work {
  size_t n;
  size_t chunk;
  size_t n_chunks;
  atomic_size_t next; /* first chunk nobody has taken yet */
  void (*body)(void *ctx, size_t begin, size_t end);
  void *ctx;
} work;

static void run_chunk(const work *w, size_t index) {
  const size_t begin = index * w->chunk;
  const size_t end = w->n - begin > w->chunk ? begin + w->chunk : w->n;
  w->body(w->ctx, begin, end);
}

static void *take_chunks(void *cookie) {
  work *const w = cookie;
  for (;;) {
    const size_t index =
        atomic_fetch_add_explicit(&w->next, 1, memory_order_relaxed);
    if (index >= w->n_chunks)
      return NULL;
    run_chunk(w, index);
  }
}

static size_t thread_count(int jobs, size_t n_chunks) {
  size_t count = jobs > 0 ? (size_t)jobs : 1;
  if (jobs == 0) {
    const long online = sysconf(_SC_NPROCESSORS_ONLN);
    if (online > 0)
      count = (size_t)online;
  }
  if (count > n_chunks)
    count = n_chunks;
  return count < MAX_THREADS ? count : MAX_THREADS;
}

void ef__parallel_for(size_t n, size_t chunk, int jobs,
                      void (*body)(void *ctx, size_t begin, size_t end),
                      void *ctx) {
  if (n == 0)
    return;
  if (chunk == 0)
    chunk = 1;
  work w = {.n = n,
            .chunk = chunk,
            .n_chunks = n / chunk + (n % chunk != 0),
            .body = body,
            .ctx = ctx};
  atomic_init(&w.next, 0);
  pthread_t thread[MAX_THREADS];
  size_t n_started = 0;
  const size_t n_threads = thread_count(jobs, w.n_chunks);
  /* The calling thread is one of them. */
  while (n_started + 1 < n_threads) {
    if (pthread_create(&thread[n_started], NULL, take_chunks, &w) != 0)
      break;
    ++n_started;
  }
  take_chunks(&w);
  for (size_t i = 0; i < n_started; ++i)
    pthread_join(thread[i], NULL);
}

void ef_parallel_for(size_t n, size_t chunk, int jobs,
                     void (*body)(void *ctx, size_t begin, size_t end),
                     void *ctx) {
  ef__parallel_for(n, chunk, jobs, body, ctx);
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Threads are started at the first loop that can use them and then parked until
 * the next one: to wake one costs a fraction of starting it. A loop is offered
 * to the parked threads while its caller works on it like they do; those that
 * come too late find nothing left, and the caller waits for none but those that
 * took a piece. So loops may be nested and may run at once, and no loop depends
 * on a thread that is busy elsewhere. */
#if defined(__linux__)
#define _GNU_SOURCE /* sched_getaffinity */
#endif
#include "base/base_private.h"

#include <pthread.h>
#include <signal.h>
#include <stdatomic.h>
#include <unistd.h>
#if defined(__linux__)
#include <sched.h>
#endif

enum { MAX_THREADS = 256 };

/* One call of ef__parallel_for, on its caller's stack. */
typedef struct loop {
  size_t n;
  size_t chunk;
  size_t n_chunks;
  atomic_size_t next; /* first chunk nobody has taken yet */
  void (*body)(void *ctx, size_t begin, size_t end);
  void *ctx;
  /* Of the pool, under its lock. */
  struct loop *older;
  size_t n_wanted;  /* threads that may still join in */
  size_t n_helping; /* those that did and are not done */
} loop;

static struct pool {
  pthread_mutex_t lock;
  pthread_cond_t offered; /* a loop, or the end */
  pthread_cond_t left;    /* a thread has left its loop */
  loop *newest;           /* of those that want threads */
  size_t n_threads;
  size_t n_free; /* those in no loop */
  bool is_closed;
  pthread_t thread[MAX_THREADS];
} pool = {.lock = PTHREAD_MUTEX_INITIALIZER,
          .offered = PTHREAD_COND_INITIALIZER,
          .left = PTHREAD_COND_INITIALIZER};

static void take_chunks(loop *w) {
  for (;;) {
    const size_t index =
        atomic_fetch_add_explicit(&w->next, 1, memory_order_relaxed);
    if (index >= w->n_chunks)
      return;
    const size_t begin = index * w->chunk;
    const size_t end = w->n - begin > w->chunk ? begin + w->chunk : w->n;
    w->body(w->ctx, begin, end);
  }
}

/* ---- The threads ------------------------------------------------------- */

static void withdraw(const loop *w) {
  for (loop **at = &pool.newest; *at != NULL; at = &(*at)->older) {
    if (*at == w) {
      *at = w->older;
      return;
    }
  }
}

static void *help(void *cookie) {
  (void)cookie;
  pthread_mutex_lock(&pool.lock);
  while (!pool.is_closed) {
    loop *const w = pool.newest;
    if (w == NULL) {
      pthread_cond_wait(&pool.offered, &pool.lock);
      continue;
    }
    if (--w->n_wanted == 0)
      withdraw(w);
    ++w->n_helping;
    --pool.n_free;
    pthread_mutex_unlock(&pool.lock);
    take_chunks(w);
    pthread_mutex_lock(&pool.lock);
    ++pool.n_free;
    if (--w->n_helping == 0)
      pthread_cond_broadcast(&pool.left);
  }
  pthread_mutex_unlock(&pool.lock);
  return NULL;
}

/* One more, which leaves all signals to the threads of the program. */
static bool start_thread(void) {
  sigset_t all, before;
  sigfillset(&all);
  pthread_sigmask(SIG_SETMASK, &all, &before);
  const int failure =
      pthread_create(&pool.thread[pool.n_threads], NULL, help, NULL);
  pthread_sigmask(SIG_SETMASK, &before, NULL);
  if (failure != 0)
    return false;
  ++pool.n_threads;
  ++pool.n_free;
  return true;
}

/* ---- Copies of the process, and its end -------------------------------- */

static void before_fork(void) {
  pthread_mutex_lock(&pool.lock);
}

static void after_fork(void) {
  pthread_mutex_unlock(&pool.lock);
}

/* The copy has none of the threads; it starts its own. */
static void in_the_copy(void) {
  pthread_mutex_init(&pool.lock, NULL);
  pthread_cond_init(&pool.offered, NULL);
  pthread_cond_init(&pool.left, NULL);
  pool.newest = NULL;
  pool.n_threads = pool.n_free = 0;
}

static void watch_forks(void) {
  pthread_atfork(before_fork, after_fork, in_the_copy);
}

/* The code that the threads run may be about to be unloaded. They are not
 * waited for if one of them is at work: then the process ends around it. */
__attribute__((destructor)) static void close_pool(void) {
  pthread_mutex_lock(&pool.lock);
  pool.is_closed = true;
  const bool all_free = pool.n_free == pool.n_threads;
  pthread_cond_broadcast(&pool.offered);
  pthread_mutex_unlock(&pool.lock);
  for (size_t i = 0; all_free && i < pool.n_threads; ++i)
    pthread_join(pool.thread[i], NULL);
}

/* ---- Loops ------------------------------------------------------------- */

/* Processors this process may use: a batch system can leave it fewer than the
 * machine has. */
static size_t processor_count(void) {
  static atomic_size_t known;
  size_t count = atomic_load_explicit(&known, memory_order_relaxed);
  if (count > 0)
    return count;
  long found = sysconf(_SC_NPROCESSORS_ONLN);
#if defined(__linux__)
  cpu_set_t allowed;
  if (sched_getaffinity(0, sizeof allowed, &allowed) == 0)
    found = CPU_COUNT(&allowed);
#endif
  count = found > 0 ? (size_t)found : 1;
  atomic_store_explicit(&known, count, memory_order_relaxed);
  return count;
}

static size_t thread_count(int jobs, size_t n_chunks) {
  size_t count = jobs > 0 ? (size_t)jobs : 1;
  if (jobs == 0)
    count = processor_count();
  if (count > n_chunks)
    count = n_chunks;
  return count < MAX_THREADS ? count : MAX_THREADS;
}

/* Asks for `n_wanted` helpers. */
static void offer(loop *w, size_t n_wanted) {
  static pthread_once_t once = PTHREAD_ONCE_INIT;
  pthread_once(&once, watch_forks);
  const size_t n_others = processor_count() - 1;
  const size_t useful = n_wanted > n_others ? n_wanted : n_others;
  const size_t most = useful < MAX_THREADS ? useful : MAX_THREADS;
  pthread_mutex_lock(&pool.lock);
  while (pool.n_free < n_wanted && pool.n_threads < most && !pool.is_closed) {
    if (!start_thread())
      break;
  }
  w->n_wanted = n_wanted;
  w->older = pool.newest;
  pool.newest = w;
  pthread_mutex_unlock(&pool.lock);
  for (size_t i = 0; i < n_wanted; ++i) pthread_cond_signal(&pool.offered);
}

static void finish(loop *w) {
  pthread_mutex_lock(&pool.lock);
  withdraw(w);
  while (w->n_helping > 0) pthread_cond_wait(&pool.left, &pool.lock);
  pthread_mutex_unlock(&pool.lock);
}

void ef__parallel_for(size_t n, size_t chunk, int jobs,
                      void (*body)(void *ctx, size_t begin, size_t end),
                      void *ctx) {
  if (n == 0)
    return;
  if (chunk == 0)
    chunk = 1;
  loop w = {.n = n,
            .chunk = chunk,
            .n_chunks = n / chunk + (n % chunk != 0),
            .body = body,
            .ctx = ctx};
  atomic_init(&w.next, 0);
  /* The calling thread is one of them. */
  const size_t n_threads = thread_count(jobs, w.n_chunks);
  if (n_threads > 1)
    offer(&w, n_threads - 1);
  take_chunks(&w);
  if (n_threads > 1)
    finish(&w);
}

void ef_parallel_for(size_t n, size_t chunk, int jobs,
                     void (*body)(void *ctx, size_t begin, size_t end),
                     void *ctx) {
  ef__parallel_for(n, chunk, jobs, body, ctx);
}

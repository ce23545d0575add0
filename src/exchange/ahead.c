/* SPDX-License-Identifier: GPL-3.0-or-later */
/* One thread that does one piece of work at a time while its owner does
 * something else. */
#include "exchange/exchange_private.h"

#include <pthread.h>
#include <signal.h>
#include <stdlib.h>

#include "base/base_private.h"

struct ef__ahead {
  pthread_t thread;
  pthread_mutex_t lock;
  pthread_cond_t changed;
  bool is_asked, is_ending; /* under the lock */
  void (*work)(void *cookie);
  void *cookie;
};

static void *serve(void *cookie) {
  ef__ahead *const a = cookie;
  pthread_mutex_lock(&a->lock);
  for (;;) {
    while (!a->is_asked && !a->is_ending)
      pthread_cond_wait(&a->changed, &a->lock);
    if (a->is_ending) break;
    pthread_mutex_unlock(&a->lock);
    a->work(a->cookie);
    pthread_mutex_lock(&a->lock);
    a->is_asked = false;
    pthread_cond_broadcast(&a->changed);
  }
  pthread_mutex_unlock(&a->lock);
  return NULL;
}

/* Signals are for the threads that the caller knows of. */
static bool start(ef__ahead *a) {
  sigset_t all, before;
  sigfillset(&all);
  pthread_sigmask(SIG_SETMASK, &all, &before);
  const bool has_started = pthread_create(&a->thread, NULL, serve, a) == 0;
  pthread_sigmask(SIG_SETMASK, &before, NULL);
  return has_started;
}

ef__ahead *ef__ahead_new(void (*work)(void *cookie), void *cookie) {
  ef__ahead *const a = ef__allocate_zeroed(1, sizeof *a);
  if (a == NULL) return NULL;
  a->work = work;
  a->cookie = cookie;
  pthread_mutex_init(&a->lock, NULL);
  pthread_cond_init(&a->changed, NULL);
  if (start(a)) return a;
  pthread_cond_destroy(&a->changed);
  pthread_mutex_destroy(&a->lock);
  free(a);
  return NULL;
}

void ef__ahead_ask(ef__ahead *ahead) {
  pthread_mutex_lock(&ahead->lock);
  ahead->is_asked = true;
  pthread_cond_broadcast(&ahead->changed);
  pthread_mutex_unlock(&ahead->lock);
}

void ef__ahead_wait(ef__ahead *ahead) {
  pthread_mutex_lock(&ahead->lock);
  while (ahead->is_asked) pthread_cond_wait(&ahead->changed, &ahead->lock);
  pthread_mutex_unlock(&ahead->lock);
}

void ef__ahead_free(ef__ahead *ahead) {
  if (ahead == NULL) return;
  ef__ahead_wait(ahead);
  pthread_mutex_lock(&ahead->lock);
  ahead->is_ending = true;
  pthread_cond_broadcast(&ahead->changed);
  pthread_mutex_unlock(&ahead->lock);
  pthread_join(ahead->thread, NULL);
  pthread_cond_destroy(&ahead->changed);
  pthread_mutex_destroy(&ahead->lock);
  free(ahead);
}

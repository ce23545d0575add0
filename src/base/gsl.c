/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "base/base_private.h"

#include <pthread.h>

#include <gsl/gsl_errno.h>

static pthread_once_t once = PTHREAD_ONCE_INIT;

static void switch_handler_off(void) {
  gsl_set_error_handler_off();
}

void ef__gsl_ready(void) {
  pthread_once(&once, switch_handler_off);
}

static ef_status translate(int code) {
  switch (code) {
  case GSL_SUCCESS:
    return EF_OK;
  case GSL_ENOMEM:
    return EF_NO_MEMORY;
  case GSL_EDOM:
  case GSL_EINVAL:
  case GSL_EBADLEN:
  case GSL_ENOTSQR:
    return EF_INVALID;
  default:
    return EF_NO_ANSWER; /* no convergence, singular, range ... */
  }
}

ef_status ef__gsl_status(int code, const char *purpose, ef_error *error) {
  const ef_status status = translate(code);
  if (status == EF_OK)
    return EF_OK;
  return ef__error_set(error, status, "%s: %s", purpose, gsl_strerror(code));
}

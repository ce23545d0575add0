/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The elementary functions over arrays. */
#include "kernel/mathematics.h"

#include "kernel/target.h"

/* Where the last, short vector is filled up: with 1, which every function
 * takes. */
EF__INLINE v_double load_some(const double *from, size_t n) {
  if (n >= EF__LANES)
    return v_load(from);
  v_double x = v_all(1);
  memcpy(&x, from, n * sizeof *from);
  return x;
}

EF__INLINE void store_some(double *to, size_t n, v_double x) {
  memcpy(to, &x, (n < EF__LANES ? n : EF__LANES) * sizeof *to);
}

void EF__KERNEL(cube_root)(size_t n, const double *x, double *out) {
  for (size_t i = 0; i < n; i += EF__LANES) {
    store_some(out + i, n - i, v_cube_root(load_some(x + i, n - i)));
  }
}

void EF__KERNEL(near_cube_root)(size_t n, const double *x, double *out) {
  for (size_t i = 0; i < n; i += EF__LANES) {
    const v_double a = load_some(x + i, n - i);
    v_double seed, spare;
    v_widen(v_near_cube_root_seed(a, a), &seed, &spare);
    store_some(out + i, n - i, v_near_cube_root(a, seed));
  }
}

void EF__KERNEL(exp)(size_t n, const double *x, double *out) {
  for (size_t i = 0; i < n; i += EF__LANES) {
    store_some(out + i, n - i, v_exp(load_some(x + i, n - i)));
  }
}

void EF__KERNEL(log)(size_t n, const double *x, double *out) {
  for (size_t i = 0; i < n; i += EF__LANES) {
    store_some(out + i, n - i, v_log(load_some(x + i, n - i)));
  }
}

void EF__KERNEL(power)(size_t n, const double *x, double y, double *out) {
  for (size_t i = 0; i < n; i += EF__LANES) {
    store_some(out + i, n - i,
               v_exp(v_power_log(load_some(x + i, n - i), v_all(y))));
  }
}

void EF__KERNEL(share_power)(size_t n, const double *x, double y, double *out) {
  for (size_t i = 0; i < n; i += EF__LANES) {
    store_some(out + i, n - i,
               v_share_power(v_share_log(load_some(x + i, n - i), v_all(y))));
  }
}

void EF__KERNEL(sin_cos)(size_t n, const double *x, double *sine,
                         double *cosine) {
  for (size_t i = 0; i < n; i += EF__LANES) {
    v_double s, c;
    v_sin_cos(load_some(x + i, n - i), &s, &c);
    store_some(sine + i, n - i, s);
    store_some(cosine + i, n - i, c);
  }
}

void EF__KERNEL(atan2)(size_t n, const double *y, const double *x,
                       double *out) {
  for (size_t i = 0; i < n; i += EF__LANES) {
    store_some(out + i, n - i,
               v_atan2(load_some(y + i, n - i), load_some(x + i, n - i)));
  }
}

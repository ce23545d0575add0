/* SPDX-License-Identifier: GPL-3.0-or-later */
/* XYZ to J', a', b' on CIECAM02 and CIECAM16 (CIE 159:2004, CIE 248:2022; M. R.
 * Luo, G. Cui, C. Li, Color Res. Appl. 31 (2006) 320-330). What is not explained
 * here is in src/colour/cam.c and cam_ucs.c. */
#include "kernel/mathematics.h"
#include "kernel/pairs.h"
#include "kernel/target.h"

#define COS_2 (-0.41614683654714241) /* of 2 rad */
#define SIN_2 0.90929742682568171
#define NOISE 0.305

/* 400 p^0.42 / (p^0.42 + 27.13), odd about zero (CIE 159, 5.3). */
EF__INLINE void compress(size_t n, double *response) {
  double power[V_COLOURS];
  for (size_t i = 0; i < n; i += EF__LANES)
    v_store(power + i, v_power_log(v_abs(v_load(response + i)), v_all(0.42)));
  for (size_t i = 0; i < n; i += EF__LANES) {
    const v_double q = v_exp(v_load(power + i));
    v_store(response + i,
            v_copysign(400 * q / (q + 27.13), v_load(response + i)));
  }
}

/* What goes from stage to stage. */
typedef struct terms {
  v_double a, b, r; /* opponent responses and their length */
  v_double sum;     /* of the achromatic response */
  v_double level;   /* |J| / 100 */
  v_double t;       /* e_t r / u; NaN outside the cone with a chroma */
} terms;

/* CIE 159, 5.4, from compressed responses. */
EF__INLINE void set_terms(v_point p, terms *t) {
  t->a = p.x - (12.0 / 11) * p.y + (1.0 / 11) * p.z;
  t->b = (1.0 / 9) * p.x + (1.0 / 9) * p.y - (2.0 / 9) * p.z;
  t->sum = 2 * p.x + p.y + (1.0 / 20) * p.z;
  const v_double u = p.x + p.y + (21.0 / 20) * p.z + NOISE;
  /* e_t r with e_t = (cos(h + 2) + 3.8) / 4 and r cos h = a, r sin h = b. */
  t->r = v_sqrt(t->a * t->a + t->b * t->b);
  const v_double e_r = 0.25 * (COS_2 * t->a - SIN_2 * t->b + 3.8 * t->r);
  t->t = v_select(u > 0, e_r / u, v_all(__builtin_nan("")));
}

EF__INLINE v_point ucs_of(const terms *t, const double *constant) {
  const double c1 = constant[EF__UCS_C1], c2 = constant[EF__UCS_C2];
  const v_double J = 100 * v_copysign(t->level, t->sum);
  const v_double M = constant[EF__UCS_CHROMA] * v_sqrt(t->level) * t->t;
  const v_double below = v_select(t->r == 0, v_all(1), t->r);
  const v_double m_over_r = v_log(1 + c2 * M) / (c2 * below);
  return (v_point){(1 + 100 * c1) * J / (1 + c1 * v_abs(J)), m_over_r * t->a,
                   m_over_r * t->b};
}

static void ucs_block(size_t n, const double *xyz, const double *constant,
                      double *ucs) {
  v_colours block;
  terms t[V_BLOCK];
  const size_t vectors = (n + EF__LANES - 1) / EF__LANES;
  v_take_colours(n, xyz, &block);
  for (size_t i = 0; i < n; i += EF__LANES)
    v_colours_set(&block, i, v_transform(constant, v_colours_at(&block, i)));
  for (size_t c = 0; c < 3; ++c) compress(n, block.part[c]);
  for (size_t i = 0; i < vectors; ++i)
    set_terms(v_colours_at(&block, EF__LANES * i), &t[i]);
  for (size_t i = 0; i < vectors; ++i) {
    t[i].level = v_power_log(v_abs(constant[EF__UCS_SHARE] * t[i].sum),
                             v_all(constant[EF__UCS_POWER]));
    t[i].t = v_power_log(t[i].t, v_all(0.9));
  }
  for (size_t i = 0; i < vectors; ++i) {
    t[i].level = v_exp(t[i].level);
    t[i].t = v_exp(t[i].t);
  }
  for (size_t i = 0; i < vectors; ++i)
    v_give(n, EF__LANES * i, ucs_of(&t[i], constant), ucs);
}

/* What `constant` holds: EF__UCS_CONSTANTS of kernels.h. */
void EF__KERNEL(xyz_to_ucs)(size_t n, const double *xyz, const double *constant,
                            double *ucs) {
  for (size_t i = 0; i < n; i += V_COLOURS)
    ucs_block(v_block_size(n, i), xyz + 3 * i, constant, ucs + 3 * i);
}

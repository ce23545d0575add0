/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What holds for every layer of Kubelka & Munk, every mixture of colourants and
 * every fit of them. */
#include <float.h>
#include <stdlib.h>

#include "device/device_private.h"
#include "gen.h"
#include "invented_paint.h"
#include "near.h"

enum { N = PAINT_SAMPLES, TRIALS = 4000 };

/* Sizes from far below to far above 1, sometimes nothing at all. */
static double random_size(gen *g) {
  return gen_below(g, 12) == 0 ? 0 : pow(10, gen_between(g, -6, 2));
}

typedef struct layer {
  double k, s, x, backing;
} layer;

static layer random_layer(gen *g) {
  layer l = {random_size(g), random_size(g), pow(10, gen_between(g, -3, 1.5)),
             gen_unit(g)};
  return l;
}

static double reflect(layer l) {
  return ef_km_reflectance(l.k, l.s, l.x, l.backing, NULL);
}

/* ---- Layers ------------------------------------------------------------- */

static void reflectances_stay_inside(void **state) {
  (void)state;
  gen g = gen_new(3301);
  for (int trial = 0; trial < TRIALS; trial++) {
    layer l = random_layer(&g);
    const double film = reflect(l);
    assert_true(film >= -1e-15 && film <= 1 + 1e-15);
    l.x = INFINITE;
    const double opaque = reflect(l);
    assert_true(opaque >= 0 && opaque <= 1);
    const ef_surface surface = {gen_between(&g, 0, 0.2),
                                gen_between(&g, 0, 0.9), gen_below(&g, 2) == 0};
    const double outside = ef_surface_outside(&surface, film, NULL);
    assert_true(outside >= -1e-15 && outside <= 1 + 1e-15);
    assert_near(ef_surface_inside(&surface, outside), film, 1e-14);
  }
}

/* Two layers one on the other are one layer of both thicknesses. */
static void layers_stack(void **state) {
  (void)state;
  gen g = gen_new(3302);
  deviation off = {0};
  for (int trial = 0; trial < TRIALS; trial++) {
    const layer whole = random_layer(&g);
    const double share = gen_unit(&g);
    layer lower = whole, upper = whole;
    lower.x = share * whole.x;
    upper.x = (1 - share) * whole.x;
    upper.backing = reflect(lower);
    deviation_add(&off, reflect(upper), reflect(whole), "a stack");
  }
  deviation_print(&off, "two layers against one");
  assert_near(off.largest, 0, 1e-13);
}

/* No film is the backing, a thick one the opaque layer; and what absorbs or
 * scatters alone has closed forms of its own. */
static void layers_at_their_limits(void **state) {
  (void)state;
  gen g = gen_new(3303);
  for (int trial = 0; trial < TRIALS; trial++) {
    layer l = random_layer(&g);
    layer thin = l, thick = l;
    thin.x = 1e-18;
    assert_near(reflect(thin), l.backing, 1e-14);
    const double root = sqrt(l.k * (l.k + 2 * l.s));
    if (root > 0) {
      thick.x = 60 / root;
      assert_near(reflect(thick),
                  ef_km_reflectance(l.k, l.s, INFINITE, 0.5, NULL), 1e-13);
    }
    const double clear = ef_km_reflectance(l.k, 0, l.x, l.backing, NULL);
    assert_near(clear, l.backing * exp(-2 * l.k * l.x), 1e-14);
    /* Kubelka & Munk: S X / (1 + S X) over black. */
    const double white = ef_km_reflectance(0, l.s, l.x, 0, NULL);
    assert_near(white, l.s * l.x / (1 + l.s * l.x), 1e-14);
    if (l.s > 0 && l.k > 0) {
      const double r = ef_km_reflectance(l.k, l.s, INFINITE, 0, NULL);
      assert_near_relative(ef_km_ratio(r), l.k / l.s,
                           1e-14 * (1 + 2 / (1 - r) + 1 / r));
    }
  }
}

/* Slopes against central differences with a step of 1e-5 of each constant: by
 * that the difference is wrong by some 1e-10 of the curvature, and by rounding
 * over the step. */
static void layer_slopes_are_derivatives(void **state) {
  (void)state;
  gen g = gen_new(3304);
  deviation off = {0};
  for (int trial = 0; trial < TRIALS; trial++) {
    layer l = random_layer(&g);
    l.k = fmax(l.k, 1e-4);
    l.s = fmax(l.s, 1e-4);
    if (trial % 3 == 0)
      l.x = INFINITE;
    double slope[2];
    ef_km_reflectance(l.k, l.s, l.x, l.backing, slope);
    for (int i = 0; i < 2; i++) {
      layer up = l, down = l;
      const double step = 1e-5 * (i == 0 ? l.k : l.s);
      *(i == 0 ? &up.k : &up.s) += step;
      *(i == 0 ? &down.k : &down.s) -= step;
      const double size = i == 0 ? l.k : l.s;
      deviation_add(&off, size * slope[i],
                    size * (reflect(up) - reflect(down)) / (2 * step),
                    i == 0 ? "K" : "S");
    }
  }
  deviation_print(&off, "slopes with the logarithms of K and S");
  assert_near(off.largest, 0, 1e-9);
}

/* At K = 0 a film has slopes like elsewhere. */
static void slopes_without_absorption(void **state) {
  (void)state;
  gen g = gen_new(3305);
  for (int trial = 0; trial < TRIALS; trial++) {
    layer l = random_layer(&g);
    double slope[2], near_by[2];
    l.x = fmin(l.x, 3);
    l.s = fmin(l.s, 5);
    ef_km_reflectance(0, l.s, l.x, l.backing, slope);
    ef_km_reflectance(1e-9, l.s, l.x, l.backing, near_by);
    assert_near(slope[0], near_by[0], 1e-6 * (1 + fabs(slope[0])));
    assert_near(slope[1], near_by[1], 1e-6 * (1 + fabs(slope[1])));
    ef_km_reflectance(0, l.s, INFINITE, 0, slope);
    assert_true(isfinite(slope[0]) && isfinite(slope[1]));
  }
}

/* ---- Mixtures ----------------------------------------------------------- */

static ef_device *random_mixture(gen *g, int trial) {
  double substrate[N];
  ef_mixture_settings settings = ef_mixture_settings_default();
  ef_colourants *set = paint_colourants(trial % 4 != 3);
  paint_substrate(trial % 2 != 0, substrate);
  settings.base = PAINT_WHITE;
  settings.total_loading = gen_between(g, 0.05, 1);
  settings.surface = (ef_surface){gen_between(g, 0, 0.1),
                                  gen_between(g, 0, 0.7), gen_below(g, 2) == 0};
  if (trial % 4 == 1) {
    settings.substrate = substrate;
    settings.thickness = gen_between(g, 0.1, 2);
  } else if (trial % 4 == 2) {
    settings.base = SIZE_MAX;
    settings.substrate = substrate;
    settings.thickness = gen_between(g, 0.1, 2);
    settings.total_loading = gen_between(g, 0.2, 5);
  }
  ef_error error;
  ef_device *device = ef_mixture_new("paint", set, &settings, &error);
  if (device == NULL)
    fail_msg("%s", error.message);
  ef_colourants_free(set);
  return device;
}

static double loading_of(const ef_device *device, const double *concentration) {
  double sum = 0;
  for (size_t i = 0; i < ef_mixture_count(device); i++)
    sum += i == ef_mixture_base(device) ? 0 : concentration[i];
  return sum;
}

/* The box of drives is the simplex of concentrations, one to one inside; a
 * drive at full is the total loading, nothing at all is the base. */
static void drives_are_concentrations(void **state) {
  (void)state;
  gen g = gen_new(3306);
  for (int trial = 0; trial < 400; trial++) {
    ef_device *device = random_mixture(&g, trial);
    const size_t n = ef_device_n_drives(device);
    const double most = ef_mixture_total_loading(device);
    double drive[8], back[8], c[9];
    gen_fill(&g, n, 0, 1, drive);
    assert_int_equal(ef_mixture_concentrations(device, drive, c, NULL), EF_OK);
    assert_true(loading_of(device, c) <= most * (1 + 1e-15));
    assert_int_equal(ef_mixture_drives(device, c, back, NULL), EF_OK);
    for (size_t j = 0; j < n; j++)
      assert_near(back[j], drive[j], 1e-12); /* what the last has left */
    drive[gen_below(&g, n)] = 1;
    ef_mixture_concentrations(device, drive, c, NULL);
    assert_near_relative(loading_of(device, c), most, 4 * DBL_EPSILON);
    memset(drive, 0, sizeof drive);
    ef_mixture_concentrations(device, drive, c, NULL);
    assert_near(loading_of(device, c), 0, 0);
    if (ef_mixture_base(device) != SIZE_MAX)
      assert_near(c[ef_mixture_base(device)], 1, DBL_EPSILON);
    ef_device_free(device);
  }
}

static void mixture_jacobians_are_derivatives(void **state) {
  (void)state;
  gen g = gen_new(3307);
  deviation drives = {0}, concentrations = {0}, same = {0};
  const double step = 1e-5;
  for (int trial = 0; trial < 400; trial++) {
    ef_device *device = random_mixture(&g, trial);
    const size_t n = ef_device_n_drives(device), m = ef_mixture_count(device);
    double drive[8], c[9], jacobian[N * 9], r[N], up[N], down[N], other[9];
    gen_fill(&g, n, 0.05, 0.9, drive);
    ef_device_spectrum(device, drive, r, jacobian, NULL);
    for (size_t j = 0; j < n; j++) {
      memcpy(other, drive, sizeof drive);
      other[j] = drive[j] + step;
      ef_device_spectrum(device, other, up, NULL, NULL);
      other[j] = drive[j] - step;
      ef_device_spectrum(device, other, down, NULL, NULL);
      for (size_t s = 0; s < N; s++)
        deviation_add(&drives, jacobian[s * n + j],
                      (up[s] - down[s]) / (2 * step), "a sample");
    }
    ef_mixture_concentrations(device, drive, c, NULL);
    ef_mixture_spectrum(device, c, up, jacobian, NULL);
    for (size_t s = 0; s < N; s++)
      deviation_add(&same, up[s], r[s], "a sample");
    for (size_t i = 0; i < m; i++) {
      const double own = step * fmax(c[i], 0.01);
      memcpy(other, c, sizeof c);
      other[i] = c[i] + own;
      ef_mixture_spectrum(device, other, up, NULL, NULL);
      other[i] = c[i] - own;
      ef_mixture_spectrum(device, other, down, NULL, NULL);
      for (size_t s = 0; s < N; s++)
        deviation_add(&concentrations, c[i] * jacobian[s * m + i],
                      c[i] * (up[s] - down[s]) / (2 * own), "a sample");
    }
    ef_device_free(device);
  }
  deviation_print(&drives, "d R / d drive");
  deviation_print(&concentrations, "d R / d ln concentration");
  deviation_print(&same, "drives against concentrations");
  /* Third derivatives with drives reach some 1e3 where one has little room. */
  assert_near(drives.largest, 0, 1e-6);
  assert_near(concentrations.largest, 0, 1e-8);
  assert_near(same.largest, 0, 1e-14);
}

static void mixture_is_seen(void **state) {
  (void)state;
  gen g = gen_new(3308);
  deviation off = {0}, slope = {0};
  const double step = 1e-5;
  ef_observer *observer = ef_observer_new("cie-1964", NULL);
  ef_illuminant *light = ef_illuminant_new("A", NULL);
  const ef_grid grid = paint_grid();
  const ef_viewing viewing = ef_viewing_default(light);
  ef_weights *weights = ef_observer_weights(observer, EF_TRISTIMULUS, &grid,
                                            &viewing, NULL, NULL);
  for (int trial = 0; trial < 200; trial++) {
    ef_device *device = random_mixture(&g, trial);
    const size_t n = ef_device_n_drives(device);
    ef_setup *setup = ef_setup_new(device, observer, light, NULL, NULL);
    double drive[8], r[N], seen[3], jacobian[3 * 8], other[8];
    gen_fill(&g, n, 0.05, 0.9, drive);
    ef_device_spectrum(device, drive, r, NULL, NULL);
    ef_weights_apply(weights, 1, r, 1, seen, NULL);
    const ef_xyz xyz = ef_setup_xyz(setup, drive, jacobian);
    deviation_add(&off, xyz.X, seen[0], "X");
    deviation_add(&off, xyz.Y, seen[1], "Y");
    deviation_add(&off, xyz.Z, seen[2], "Z");
    for (size_t j = 0; j < n; j++) {
      memcpy(other, drive, sizeof drive);
      other[j] = drive[j] + step;
      const double up = ef_setup_xyz(setup, other, NULL).Y;
      other[j] = drive[j] - step;
      const double down = ef_setup_xyz(setup, other, NULL).Y;
      deviation_add(&slope, jacobian[n + j], (up - down) / (2 * step), "Y");
    }
    assert_near(ef_setup_white(setup).Y, 100, 0);
    ef_setup_free(setup);
    ef_device_free(device);
  }
  deviation_print(&off, "XYZ of the setup against XYZ of the spectrum");
  deviation_print(&slope, "d Y / d drive");
  assert_near(off.largest, 0, 1e-12);
  assert_near(slope.largest, 0, 1e-5);
  ef_weights_free(weights);
  ef_illuminant_free(light);
  ef_observer_free(observer);
}

/* ---- Fits --------------------------------------------------------------- */

enum { MOST_ROWS = 40 };

typedef struct panel {
  size_t n;
  double concentration[MOST_ROWS * PAINTS];
  double thickness[MOST_ROWS];
  double backing[MOST_ROWS * N];
  double reflectance[MOST_ROWS * N];
} panel;

/* Mixes by the library's own layer, which other laws hold to account. */
static void paint_row(panel *p, const double *k, const double *sc,
                      const ef_surface *surface) {
  const size_t r = p->n++;
  for (size_t s = 0; s < N; s++) {
    double sum_k = 0, sum_s = 0;
    for (size_t i = 0; i < PAINTS; i++) {
      sum_k += p->concentration[r * PAINTS + i] * k[i * N + s];
      sum_s += p->concentration[r * PAINTS + i] * sc[i * N + s];
    }
    const double under = ef_surface_inside(surface, p->backing[r * N + s]);
    p->reflectance[r * N + s] = ef_surface_outside(
        surface, ef_km_reflectance(sum_k, sum_s, p->thickness[r], under, NULL),
        NULL);
  }
}

static ef_drawdowns view(const panel *p) {
  const ef_drawdowns d = {.n_drawdowns = p->n,
                          .n_colourants = PAINTS,
                          .name = paint_names,
                          .concentration = p->concentration,
                          .thickness = p->thickness,
                          .backing = p->backing,
                          .reflectance = p->reflectance,
                          .grid = paint_grid()};
  return d;
}

/* Opaque: mass tones, tints with white, and some mixtures; the unit is open, so
 * the truth is told in units of the white's scattering. */
static void fit_returns_what_made_opaque_drawdowns(void **state) {
  (void)state;
  gen g = gen_new(3309);
  deviation off = {0};
  for (int trial = 0; trial < 20; trial++) {
    panel p = {0};
    double k[PAINTS * N], sc[PAINTS * N], rms[MOST_ROWS];
    const ef_surface surface = {0.04, trial % 2 ? 0.6 : 0, trial % 3 != 0};
    paint_constants(k, sc);
    for (size_t i = 0; i < PAINTS; i++)
      for (int tint = 0; tint < 3; tint++) {
        double *c = p.concentration + p.n * PAINTS;
        c[i] = tint == 0 ? 1 : gen_between(&g, 0.02, 0.4);
        c[PAINT_WHITE] += 1 - c[i];
        p.thickness[p.n] = INFINITE;
        paint_row(&p, k, sc, &surface);
      }
    const ef_drawdowns d = view(&p);
    ef_colourant_fit_settings settings = ef_colourant_fit_settings_default();
    settings.base = PAINT_WHITE;
    settings.surface = surface;
    ef_error error;
    ef_colourants *found = ef_colourants_fit(&d, &settings, rms, &error);
    if (found == NULL)
      fail_msg("%s", error.message);
    for (size_t i = 0; i < PAINTS; i++)
      for (size_t s = 0; s < N; s++) {
        const double unit = sc[PAINT_WHITE * N + s];
        deviation_add(&off, ef_colourants_absorption(found, i)[s] * unit,
                      k[i * N + s], paint_names[i]);
        deviation_add(&off, ef_colourants_scattering(found, i)[s] * unit,
                      sc[i * N + s], paint_names[i]);
      }
    for (size_t r = 0; r < p.n; r++)
      assert_near(rms[r], 0, 1e-12);
    ef_colourants_free(found);
  }
  deviation_print(&off, "constants of opaque drawdowns");
  assert_near(off.largest, 0, 1e-9);
}

/* Films over a light and a dark card: the unit is that of the thickness. */
static void fit_returns_what_made_films(void **state) {
  (void)state;
  gen g = gen_new(3310);
  deviation off = {0};
  for (int trial = 0; trial < 5; trial++) {
    panel p = {0};
    double k[PAINTS * N], sc[PAINTS * N];
    const ef_surface surface = ef_surface_none();
    paint_constants(k, sc);
    for (size_t i = 0; i < PAINTS; i++)
      for (int card = 0; card < 6; card++) {
        p.concentration[p.n * PAINTS + i] = gen_between(&g, 0.2, 1);
        p.thickness[p.n] = gen_between(&g, 0.2, 1.5);
        paint_substrate(card % 2 == 0, p.backing + p.n * N);
        paint_row(&p, k, sc, &surface);
      }
    const ef_drawdowns d = view(&p);
    ef_error error;
    ef_colourants *found = ef_colourants_fit(&d, NULL, NULL, &error);
    if (found == NULL)
      fail_msg("%s", error.message);
    for (size_t i = 0; i < PAINTS; i++)
      for (size_t s = 0; s < N; s++) {
        deviation_add(&off, ef_colourants_absorption(found, i)[s], k[i * N + s],
                      paint_names[i]);
        deviation_add(&off, ef_colourants_scattering(found, i)[s],
                      sc[i * N + s], paint_names[i]);
      }
    ef_colourants_free(found);
  }
  deviation_print(&off, "constants of films");
  /* Where a film absorbs nearly all, its constants are poorly determined. */
  assert_near(off.largest, 0, 1e-7);
}

/* Noise of half a percent: nothing negative, and constants near the truth. */
static void fit_bears_noise(void **state) {
  (void)state;
  gen g = gen_new(3311);
  panel p = {0};
  double k[PAINTS * N], sc[PAINTS * N], rms[MOST_ROWS];
  const ef_surface surface = ef_surface_none();
  paint_constants(k, sc);
  for (size_t i = 0; i < PAINTS; i++)
    for (int tint = 0; tint < 8; tint++) {
      double *c = p.concentration + p.n * PAINTS;
      c[i] = tint == 0 ? 1 : 0.05 * tint;
      c[PAINT_WHITE] += 1 - c[i];
      p.thickness[p.n] = INFINITE;
      paint_row(&p, k, sc, &surface);
    }
  for (size_t j = 0; j < p.n * N; j++)
    p.reflectance[j] = fmin(p.reflectance[j] * (1 + 0.005 * gen_normal(&g)), 1);
  const ef_drawdowns d = view(&p);
  ef_colourant_fit_settings settings = ef_colourant_fit_settings_default();
  settings.base = PAINT_WHITE;
  ef_colourants *found = ef_colourants_fit(&d, &settings, rms, NULL);
  assert_non_null(found);
  double sum = 0;
  for (size_t r = 0; r < p.n; r++)
    sum += rms[r] / (double)p.n;
  printf("# noise of 0.005: relative errors left %.4f\n", sum);
  assert_true(sum > 0.003 && sum < 0.006);
  for (size_t i = 1; i < PAINTS; i++)
    for (size_t s = 0; s < N; s++) {
      const double unit = sc[PAINT_WHITE * N + s];
      const double found_k = ef_colourants_absorption(found, i)[s] * unit;
      assert_true(found_k >= 0);
      assert_true(ef_colourants_scattering(found, i)[s] >= 0);
      /* 0.5 % of the light of a tint is some 0.01 of K for a tenth of it. */
      assert_near(found_k, k[i * N + s], 0.03 + 0.1 * k[i * N + s]);
    }
  ef_colourants_free(found);
}

static void fit_of_single_constants(void **state) {
  (void)state;
  gen g = gen_new(3312);
  panel p = {0};
  double k[PAINTS * N], sc[PAINTS * N];
  paint_constants(k, sc);
  for (size_t j = 0; j < PAINTS * N; j++)
    sc[j] = j < N ? 1 : 0; /* all of the scattering is the base's */
  const ef_surface surface = ef_surface_none();
  for (int row = 0; row < 12; row++) {
    double *c = p.concentration + p.n * PAINTS;
    gen_fill(&g, PAINTS, 0, 0.3, c);
    c[PAINT_WHITE] = 1;
    p.thickness[p.n] = INFINITE;
    paint_row(&p, k, sc, &surface);
    c[PAINT_WHITE] = 0.37; /* not looked at */
  }
  ef_drawdowns d = view(&p);
  d.thickness = NULL;
  d.backing = NULL;
  ef_colourant_fit_settings settings = ef_colourant_fit_settings_default();
  settings.base = PAINT_WHITE;
  settings.single_constant = true;
  ef_error error;
  ef_colourants *found = ef_colourants_fit(&d, &settings, NULL, &error);
  if (found == NULL)
    fail_msg("%s", error.message);
  assert_null(ef_colourants_scattering(found, 1));
  for (size_t i = 0; i < PAINTS; i++)
    for (size_t s = 0; s < N; s++)
      assert_near(ef_colourants_absorption(found, i)[s], k[i * N + s], 1e-10);
  ef_colourants_free(found);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(reflectances_stay_inside),
      cmocka_unit_test(layers_stack),
      cmocka_unit_test(layers_at_their_limits),
      cmocka_unit_test(layer_slopes_are_derivatives),
      cmocka_unit_test(slopes_without_absorption),
      cmocka_unit_test(drives_are_concentrations),
      cmocka_unit_test(mixture_jacobians_are_derivatives),
      cmocka_unit_test(mixture_is_seen),
      cmocka_unit_test(fit_returns_what_made_opaque_drawdowns),
      cmocka_unit_test(fit_returns_what_made_films),
      cmocka_unit_test(fit_bears_noise),
      cmocka_unit_test(fit_of_single_constants),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A halftone print from a characterisation: primaries, Yule-Nielsen n, tone
 * curves, and what the model says about all rows. */
#include "device/device_private.h"

#include "base/base_private.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static const char *const default_inks[EF__MOST_INKS] = {"cyan", "magenta",
                                                        "yellow", "black"};
enum { MOST_PRIMARIES = 1 << EF__MOST_INKS };

/* An ink's ramp may fall by this much of area before it is refused: what two
 * readings of one patch may differ by (common practice, no source). */
static const double tolerated_fall = 0.02;

typedef struct fit {
  const ef_measurements *table;
  const char *name;
  const ef_halftone_settings *settings;
  const char *ink_name[EF__MOST_INKS];
  size_t n_inks;       /* of the table */
  size_t n_used;       /* 4 when black is fixed above zero, else 3 */
  size_t width;        /* samples, or 3: X, Y, Z */
  const ef_grid *grid; /* NULL without spectra */
  const double *row;   /* n_rows x width */
  const ef_illuminant *illuminant;
  double white[3]; /* what tristimulus values are told against */
  void *block;
  double *primary;       /* 16 x width */
  double *root;          /* 16 x width, primary^(1/n) */
  double *mixed;         /* width x 8, as the device takes them */
  double *value;         /* width: a predicted row */
  ef__ramp_point *point; /* n_rows + 2 */
  double *ramp;          /* 2 x (n_rows + 2) */
  double *xyz;           /* n_rows x 3 */
  ef_weights *weights;   /* of spectra, for residuals */
  double n;
  const ef_tone_curve *curve[EF__MOST_INKS]; /* NULL: not known yet */
  ef_tone_curve *own[EF__MOST_INKS];
} fit;

static const double *drives(const fit *f, size_t row) {
  return f->table->drive + row * f->n_inks;
}

/* ---- Checks ------------------------------------------------------------- */

static ef_status at_row(const fit *f, size_t row, ef_status status,
                        ef_error *error) {
  if (f->table->line != NULL)
    ef__error_place(error, NULL, f->table->line[row], 0, NULL);
  return status;
}

static ef_status check_rows(const fit *f, ef_error *error) {
  for (size_t r = 0; r < f->table->n_rows; r++) {
    for (size_t i = 0; i < f->n_inks; i++) {
      const double drive = drives(f, r)[i];
      if (!(drive >= 0.0 && drive <= 1.0))
        return at_row(f, r,
                      ef__error_set(error, EF_INVALID,
                                    "row %zu: ink value %g of %s, expected 0 "
                                    "to 1",
                                    r + 1, drive, f->ink_name[i]),
                      error);
    }
    for (size_t s = 0; s < f->width; s++)
      if (!isfinite(f->row[r * f->width + s]))
        return at_row(f, r,
                      ef__error_set(error, EF_INVALID,
                                    "row %zu: measured value %zu is not finite",
                                    r + 1, s + 1),
                      error);
  }
  return EF_OK;
}

static ef_status check_table(const ef_measurements *table,
                             const ef_halftone_settings *settings,
                             ef_error *error) {
  if (table->n_rows == 0 || table->drive == NULL)
    return ef__error_set(error, EF_INVALID, "a characterisation without rows");
  if ((table->xyz == NULL) == (table->spectrum == NULL))
    return ef__error_set(error, EF_INVALID,
                         "measurements are either tristimulus values or "
                         "spectra; found %s",
                         table->xyz == NULL ? "neither" : "both");
  if (table->n_drives != EF__INKS && table->n_drives != EF__MOST_INKS)
    return ef__error_set(error, EF_INVALID,
                         "found %zu ink values a row; a halftone print has 3, "
                         "or 4 with the last one fixed",
                         table->n_drives);
  if (settings->black > 0.0 && table->n_drives != EF__MOST_INKS)
    return ef__error_set(error, EF_INVALID,
                         "black is fixed at %g, but the rows have no black",
                         settings->black);
  return table->spectrum != NULL ? ef_grid_check(&table->grid, error) : EF_OK;
}

/* ---- Kinds of rows ------------------------------------------------------ */

/* True for rows that the model speaks of: no ink beyond those in use. */
static bool is_used(const fit *f, size_t row) {
  return f->n_used == f->n_inks || drives(f, row)[f->n_used] == 0.0;
}

/* The only ink of the row above 0, or n_used. */
static size_t single_ink(const fit *f, size_t row) {
  size_t found = f->n_used;
  for (size_t i = 0; i < f->n_used; i++) {
    if (drives(f, row)[i] == 0.0)
      continue;
    if (found < f->n_used)
      return f->n_used;
    found = i;
  }
  return found;
}

/* The Neugebauer primary that the row is, or MOST_PRIMARIES. */
static size_t primary_of(const fit *f, size_t row) {
  size_t set = 0;
  for (size_t i = 0; i < f->n_used; i++) {
    const double drive = drives(f, row)[i];
    if (drive == 1.0)
      set |= (size_t)1 << i;
    else if (drive != 0.0)
      return MOST_PRIMARIES;
  }
  return set;
}

/* A row between zero and full of one ink alone. */
static bool is_ramp(const fit *f, size_t row) {
  return is_used(f, row) && single_ink(f, row) < f->n_used &&
         primary_of(f, row) == MOST_PRIMARIES;
}

static size_t n_primaries(const fit *f) {
  return (size_t)1 << f->n_used;
}

/* ---- Primaries ---------------------------------------------------------- */

/* "cyan and yellow at 100 %", "no ink". */
static void describe_set(const fit *f, size_t set, char *text, size_t size) {
  size_t used = 0, n_left = 0;
  text[0] = '\0';
  for (size_t i = 0; i < f->n_used; i++)
    n_left += set >> i & 1;
  if (n_left == 0)
    snprintf(text, size, "bare paper (all inks at 0 %%)");
  for (size_t i = 0; i < f->n_used && used < size; i++) {
    if (!(set >> i & 1))
      continue;
    n_left--;
    used += (size_t)snprintf(text + used, size - used, "%s%s", f->ink_name[i],
                             n_left > 1   ? ", "
                             : n_left > 0 ? " and "
                                          : " alone at 100 %");
  }
}

static ef_status read_primaries(fit *f, ef_error *error) {
  size_t found[MOST_PRIMARIES] = {0};
  size_t n_below = 0;
  for (size_t r = 0; r < f->table->n_rows; r++) {
    const size_t set = is_used(f, r) ? primary_of(f, r) : MOST_PRIMARIES;
    if (set == MOST_PRIMARIES)
      continue;
    found[set]++;
    for (size_t s = 0; s < f->width; s++)
      f->primary[set * f->width + s] += f->row[r * f->width + s];
  }
  for (size_t set = 0; set < n_primaries(f); set++) {
    if (found[set] == 0) {
      char text[160];
      describe_set(f, set, text, sizeof text);
      return ef__error_set(error, EF_NO_ANSWER,
                           "a Neugebauer primary is missing: no row shows %s; "
                           "the model needs all %zu of them",
                           text, n_primaries(f));
    }
    for (size_t s = 0; s < f->width; s++) {
      double *value = &f->primary[set * f->width + s];
      *value /= (double)found[set];
      n_below += *value < 0.0;
      *value = fmax(*value, 0.0);
    }
  }
  if (n_below > 0)
    ef__note(f->settings->notes,
             "%s: %zu values of primaries below zero count as zero", f->name,
             n_below);
  return EF_OK;
}

static ef_status check_solids(const fit *f, ef_error *error) {
  double paper = 0.0;
  for (size_t s = 0; s < f->width; s++)
    paper += f->primary[s];
  for (size_t i = 0; i < f->n_used; i++) {
    double solid = 0.0;
    for (size_t s = 0; s < f->width; s++)
      solid += f->primary[((size_t)1 << i) * f->width + s];
    if (!(solid < paper))
      return ef__error_set(error, EF_INVALID,
                           "%s at 100 %% is not darker than the paper",
                           f->ink_name[i]);
  }
  return EF_OK;
}

static void take_roots(fit *f, double n) {
  f->n = n;
  for (size_t k = 0; k < n_primaries(f) * f->width; k++)
    f->root[k] = pow(f->primary[k], 1.0 / n);
}

/* ---- Areas -------------------------------------------------------------- */

/* Least-squares area of ink i in a row of that ink alone, for the present n:
 * root of the row = root of the paper + area (root of the solid - paper). */
static double fitted_area(const fit *f, size_t row, size_t i) {
  const double *paper = f->root;
  const double *solid = f->root + ((size_t)1 << i) * f->width;
  double product = 0.0, square = 0.0;
  for (size_t s = 0; s < f->width; s++) {
    const double value = fmax(f->row[row * f->width + s], 0.0);
    const double step = solid[s] - paper[s];
    product += step * (pow(value, 1.0 / f->n) - paper[s]);
    square += step * step;
  }
  return product / square;
}

static double area_of(const fit *f, size_t row, size_t i) {
  return f->curve[i] != NULL
             ? ef_tone_curve_amount(f->curve[i], drives(f, row)[i], NULL)
             : fitted_area(f, row, i);
}

/* ---- Yule-Nielsen n ----------------------------------------------------- */

/* The lightness function of CIELAB (ISO/CIE 11664-4), so that an error counts
 * about as much in a dark value as in a light one. */
static double lightness(double ratio) {
  const double joint = 24.0 / 116.0;
  return ratio > joint * joint * joint ? cbrt(ratio)
                                       : 841.0 / 108.0 * ratio + 16.0 / 116.0;
}

/* Squared error of all ramps for factor n. */
static double ramp_error(fit *f, double n) {
  double sum = 0.0;
  take_roots(f, n);
  for (size_t r = 0; r < f->table->n_rows; r++) {
    if (!is_ramp(f, r))
      continue;
    const size_t i = single_ink(f, r);
    const double area = area_of(f, r, i);
    const double share[2] = {1.0 - area, area};
    const double *solid = f->root + ((size_t)1 << i) * f->width;
    for (size_t s = 0; s < f->width; s++) {
      const double root[2] = {f->root[s], solid[s]};
      const double unit = f->grid != NULL ? 1.0 : f->white[s];
      const double predicted = share[0] * root[0] + share[1] * root[1] > 0.0
                                   ? ef__halftone_mix(n, 2, share, root)
                                   : 0.0;
      const double off = lightness(predicted / unit) -
                         lightness(f->row[r * f->width + s] / unit);
      sum += off * off;
    }
  }
  return sum;
}

/* The least error over 1 <= n <= 10, sought in 1 / n, in which it is smooth:
 * steps of 0.05 first, then golden section around the least of them. */
static double best_n(fit *f) {
  enum { STEPS = 18 };
  const double low = 0.1, step = 0.05;
  int best = 0;
  double least = HUGE_VAL;
  for (int k = 0; k <= STEPS; k++) {
    const double error = ramp_error(f, 1.0 / (low + k * step));
    if (error < least) {
      least = error;
      best = k;
    }
  }
  double a = low + step * (best > 0 ? best - 1 : 0);
  double b = low + step * (best < STEPS ? best + 1 : STEPS);
  const double golden = 0.5 * (sqrt(5.0) - 1.0);
  double x = b - golden * (b - a), y = a + golden * (b - a);
  double at_x = ramp_error(f, 1.0 / x), at_y = ramp_error(f, 1.0 / y);
  /* n to 1e-5 where it is 10: 1 / n to 1e-7. */
  while (b - a > 1e-7) {
    if (at_x <= at_y) {
      b = y;
      y = x;
      at_y = at_x;
      x = b - golden * (b - a);
      at_x = ramp_error(f, 1.0 / x);
    } else {
      a = x;
      x = y;
      at_x = at_y;
      y = a + golden * (b - a);
      at_y = ramp_error(f, 1.0 / y);
    }
  }
  const double n = 2.0 / (a + b);
  /* The ends of the range themselves, where the least lies there. */
  const double end = best == STEPS ? 1.0 : best == 0 ? 10.0 : n;
  return ramp_error(f, end) <= ramp_error(f, n) ? end : n;
}

static void fit_n(fit *f) {
  if (f->settings->n > 0.0) {
    take_roots(f, f->settings->n);
    return;
  }
  for (size_t r = 0; r < f->table->n_rows; r++) {
    if (!is_ramp(f, r))
      continue;
    const double n = best_n(f);
    take_roots(f, n);
    if (n == 10.0)
      ef__note(f->settings->notes,
               "%s: the ramps ask for a Yule-Nielsen factor of 10 or more; 10 "
               "is taken",
               f->name);
    return;
  }
  ef__note(f->settings->notes,
           "%s: no row shows one ink between 0 and 100 %%, so nothing tells "
           "the Yule-Nielsen factor; it is taken as 1",
           f->name);
  take_roots(f, 1.0);
}

/* ---- Curves ------------------------------------------------------------- */

/* Points of ink i between paper and solid; their number. */
static size_t collect(fit *f, size_t i) {
  size_t n = 0;
  f->point[n++] = (ef__ramp_point){0.0, 0.0, 1.0};
  for (size_t r = 0; r < f->table->n_rows; r++)
    if (is_ramp(f, r) && single_ink(f, r) == i)
      f->point[n++] =
          (ef__ramp_point){drives(f, r)[i], fitted_area(f, r, i), 1.0};
  f->point[n++] = (ef__ramp_point){1.0, 1.0, 1.0};
  return n;
}

/* The point farthest above a later one of the ramp tells where it falls. */
static ef_status check_rise(const fit *f, size_t i, size_t n, ef_error *error) {
  for (size_t r = 0; r < f->table->n_rows; r++) {
    if (!is_ramp(f, r) || single_ink(f, r) != i)
      continue;
    const double drive = drives(f, r)[i], area = fitted_area(f, r, i);
    for (size_t k = 0; k < n; k++) {
      const ef__ramp_point *p = &f->point[k];
      if (p->drive <= drive && p->level - area <= tolerated_fall)
        continue;
      if (p->drive > drive && area - p->level <= tolerated_fall)
        continue;
      return at_row(f, r,
                    ef__error_set(error, EF_INVALID,
                                  "row %zu: the ramp of %s goes backwards: "
                                  "%.1f %% of area at %g %%, and %.1f %% at "
                                  "%g %%; measure it again",
                                  r + 1, f->ink_name[i], 100.0 * area,
                                  100.0 * drive, 100.0 * p->level,
                                  100.0 * p->drive),
                    error);
    }
  }
  return EF_OK;
}

static ef_status fit_curve(fit *f, size_t i, ef_error *error) {
  size_t n_pooled;
  size_t n = collect(f, i);
  if (n == 2)
    ef__note(f->settings->notes,
             "%s: no row shows %s between 0 and 100 %%, so its curve is taken "
             "as linear",
             f->name, f->ink_name[i]);
  const ef_status status = check_rise(f, i, n, error);
  if (status != EF_OK)
    return status;
  n = ef__ramp_make_monotone(n, f->point, &n_pooled);
  if (n_pooled > 0)
    ef__note(f->settings->notes,
             "%s: the ramp of %s does not rise everywhere; points pooled with "
             "a neighbour: %zu",
             f->name, f->ink_name[i], n_pooled);
  double *drive = f->ramp, *level = f->ramp + n;
  for (size_t k = 0; k < n; k++) {
    drive[k] = f->point[k].drive;
    level[k] = f->point[k].level;
  }
  f->own[i] = ef_tone_curve_from_ramp(n, drive, level, error);
  f->curve[i] = f->own[i];
  return f->own[i] != NULL ? EF_OK : EF_NO_MEMORY;
}

static void take_given_curves(fit *f) {
  const size_t n = f->settings->n_curves;
  for (size_t i = 0; i < f->n_used; i++) {
    if (n == 1)
      f->curve[i] = f->settings->curve[0];
    else if (i < n)
      f->curve[i] = f->settings->curve[i];
  }
}

static ef_status fit_curves(fit *f, ef_error *error) {
  ef_status status = EF_OK;
  for (size_t i = 0; status == EF_OK && i < f->n_used; i++)
    if (f->curve[i] == NULL)
      status = fit_curve(f, i, error);
  return status;
}

/* ---- The device --------------------------------------------------------- */

/* The roots as the device takes them, black printed at its fixed area. */
static void mix_black(fit *f) {
  double black = 0.0;
  if (f->n_used == EF__MOST_INKS)
    black = ef_tone_curve_amount(f->curve[EF__INKS], f->settings->black, NULL);
  for (size_t s = 0; s < f->width; s++) {
    for (size_t k = 0; k < EF__OVERPRINTS; k++) {
      double root = f->root[k * f->width + s];
      if (black > 0.0)
        root += black * (f->root[(k + EF__OVERPRINTS) * f->width + s] - root);
      f->mixed[s * EF__OVERPRINTS + k] = root;
    }
  }
}

static ef_device *build(fit *f, ef_error *error) {
  mix_black(f);
  const ef__halftone_parts parts = {
      .name = f->name,
      .ink_name = f->ink_name,
      .grid = f->grid,
      .illuminant = ef_illuminant_name(f->illuminant),
      .n = f->n,
      .root = f->mixed,
      .curve = f->curve,
  };
  return ef__halftone_build(&parts, error);
}

/* ---- Residuals ---------------------------------------------------------- */

static void predict(const fit *f, size_t row, double *value) {
  double area[EF__MOST_INKS], share[MOST_PRIMARIES], root[MOST_PRIMARIES];
  for (size_t i = 0; i < f->n_used; i++)
    area[i] = ef_tone_curve_amount(f->curve[i], drives(f, row)[i], NULL);
  ef_demichel(f->n_used, area, share);
  for (size_t s = 0; s < f->width; s++) {
    for (size_t k = 0; k < n_primaries(f); k++)
      root[k] = f->root[k * f->width + s];
    value[s] = ef__halftone_mix(f->n, n_primaries(f), share, root);
  }
}

static ef_xyz xyz_of(const fit *f, const double *value) {
  double xyz[3] = {value[0], value[1], value[2]};
  if (f->weights != NULL) {
    const double *weight = ef_weights_matrix(f->weights);
    for (size_t c = 0; c < 3; c++) {
      xyz[c] = 0.0;
      for (size_t s = 0; s < f->width; s++)
        xyz[c] += weight[c * f->width + s] * value[s];
    }
  }
  return (ef_xyz){xyz[0], xyz[1], xyz[2]};
}

static double rms(size_t n, const double *a, const double *b) {
  double sum = 0.0;
  for (size_t s = 0; s < n; s++)
    sum += (a[s] - b[s]) * (a[s] - b[s]);
  return sqrt(sum / (double)n);
}

/* Rows with the black of the settings, those of the fit among them. */
static bool has_residual(const fit *f, size_t row) {
  return is_used(f, row) && (f->n_used < EF__MOST_INKS || is_ramp(f, row) ||
                             primary_of(f, row) < MOST_PRIMARIES ||
                             drives(f, row)[EF__INKS] == f->settings->black);
}

static void read_residuals(fit *f, ef_print_residual *residual,
                           size_t *n_residuals) {
  size_t n = 0;
  for (size_t r = 0; r < f->table->n_rows; r++) {
    if (!has_residual(f, r))
      continue;
    const double *measured = f->row + r * f->width;
    predict(f, r, f->value);
    residual[n++] = (ef_print_residual){
        .row = r,
        .is_test = !is_ramp(f, r) && primary_of(f, r) == MOST_PRIMARIES,
        .measured = xyz_of(f, measured),
        .predicted = xyz_of(f, f->value),
        .white = {f->white[0], f->white[1], f->white[2]},
        .spectral_rms =
            f->grid != NULL ? rms(f->width, measured, f->value) : nan(""),
    };
  }
  *n_residuals = n;
}

static void note_left_out(const fit *f) {
  size_t n = 0;
  for (size_t r = 0; r < f->table->n_rows; r++)
    n += !has_residual(f, r);
  if (n > 0)
    ef__note(f->settings->notes,
             "%s: black is fixed at %g %%; %zu rows with another black are "
             "left out",
             f->name, 100.0 * f->settings->black, n);
}

/* ---- Construction ------------------------------------------------------- */

static ef_status allocate(fit *f, ef_error *error) {
  const size_t n_rows = f->table->n_rows;
  const ef__part parts[] = {
      {&f->primary, f->width, MOST_PRIMARIES * sizeof(double)},
      {&f->root, f->width, MOST_PRIMARIES * sizeof(double)},
      {&f->mixed, f->width, EF__OVERPRINTS * sizeof(double)},
      {&f->value, f->width, sizeof(double)},
      {&f->point, n_rows + 2, sizeof(ef__ramp_point)},
      {&f->ramp, n_rows + 2, 2 * sizeof(double)},
  };
  f->block = ef__allocate_block(sizeof parts / sizeof parts[0], parts);
  return f->block != NULL ? EF_OK
                          : ef__error_memory(error, "a characterisation");
}

/* White and, for spectra, the weights that residuals are told with. */
static ef_status look(fit *f, ef_error *error) {
  ef_error own;
  if (error == NULL)
    error = &own;
  ef_observer *observer = ef_observer_new("cie-1931", error);
  if (observer == NULL)
    return error->status;
  ef_status status = EF_OK;
  if (f->grid != NULL) {
    f->weights = ef__reflecting_weights(observer, f->illuminant, f->grid, NULL,
                                        f->white, error);
    if (f->weights == NULL)
      status = error->status;
  } else {
    status = ef_observer_white(observer, EF_TRISTIMULUS, f->illuminant, NULL,
                               f->white, error);
  }
  ef_observer_free(observer);
  return status;
}

static ef_device *run(fit *f, ef_print_residual *residual, size_t *n_residuals,
                      ef_error *error) {
  take_given_curves(f);
  if (check_rows(f, error) != EF_OK || allocate(f, error) != EF_OK ||
      look(f, error) != EF_OK || read_primaries(f, error) != EF_OK ||
      check_solids(f, error) != EF_OK)
    return NULL;
  note_left_out(f);
  fit_n(f);
  if (fit_curves(f, error) != EF_OK)
    return NULL;
  ef_device *device = build(f, error);
  if (device != NULL && residual != NULL)
    read_residuals(f, residual, n_residuals);
  return device;
}

static void clear(fit *f) {
  for (size_t i = 0; i < EF__MOST_INKS; i++)
    ef_tone_curve_free(f->own[i]);
  ef_weights_free(f->weights);
  free(f->block);
}

static ef_device *fit_table(fit *f, ef_print_residual *residual,
                            size_t *n_residuals, ef_error *error) {
  ef_illuminant *d50 = NULL;
  f->illuminant = f->settings->illuminant;
  if (f->illuminant == NULL) {
    d50 = ef_illuminant_new("D50", error);
    if (d50 == NULL)
      return NULL;
    f->illuminant = d50;
  }
  ef_device *device = run(f, residual, n_residuals, error);
  clear(f);
  ef_illuminant_free(d50);
  return device;
}

ef_device *ef_halftone_from_measurements(const char *name,
                                         const ef_measurements *measurements,
                                         const ef_halftone_settings *settings,
                                         ef_print_residual *residual,
                                         size_t *n_residuals, ef_error *error) {
  const ef_halftone_settings plain = ef_halftone_settings_default();
  if (settings == NULL)
    settings = &plain;
  if (name == NULL || measurements == NULL ||
      (residual != NULL && n_residuals == NULL)) {
    ef__error_set(error, EF_INVALID,
                  "a print needs a name and measurements, and residuals a "
                  "place for their number");
    return NULL;
  }
  if (ef__halftone_check(settings, error) != EF_OK ||
      check_table(measurements, settings, error) != EF_OK)
    return NULL;
  const bool spectral = measurements->spectrum != NULL;
  fit f = {
      .table = measurements,
      .name = name,
      .settings = settings,
      .n_inks = measurements->n_drives,
      .n_used = settings->black > 0.0 ? EF__MOST_INKS : EF__INKS,
      .width = spectral ? measurements->grid.count : 3,
      .grid = spectral ? &measurements->grid : NULL,
      .row = spectral ? measurements->spectrum : measurements->xyz,
  };
  for (size_t i = 0; i < f.n_inks; i++)
    f.ink_name[i] = measurements->drive_name != NULL
                        ? measurements->drive_name[i]
                        : default_inks[i];
  return fit_table(&f, residual, n_residuals, error);
}

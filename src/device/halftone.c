/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Halftone prints of three inks: Neugebauer's primaries (Zeitschrift fuer
 * wissenschaftliche Photographie 36, 73-89 (1937)) with the shares of Demichel
 * (Le Procede 26, 17-21 (1924)), mixed as Yule & Nielsen have it (Proceedings
 * of the Technical Association of the Graphic Arts 3, 65-76 (1951); for spectra
 * Viggiano, ibid. 37, 647-661 (1985)). */
#include "device/device_private.h"

#include "base/base_private.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const char *const default_inks[EF__INKS] = {"cyan", "magenta", "yellow"};

static const double least_n = 1.0;
static const double greatest_n = 10.0;

typedef struct halftone {
  ef_device device;
  size_t width; /* samples of a spectrum, or 3: X, Y, Z */
  double n;
  void *block;
  double *root;     /* width x 8: primary^(1/n) */
  char *illuminant; /* of tristimulus values */
} halftone;

static const halftone *as_halftone(const ef_device *device) {
  return (const halftone *)device;
}

/* ---- Formulas ----------------------------------------------------------- */

void ef_demichel(size_t n_inks, const double *area, double *share) {
  share[0] = 1.0;
  for (size_t i = 0; i < n_inks; i++) {
    const size_t n = (size_t)1 << i;
    for (size_t k = 0; k < n; k++) {
      share[n + k] = share[k] * area[i];
      share[k] *= 1.0 - area[i];
    }
  }
}

double ef_tone_value(double paper, double solid, double tint, double n) {
  if (!(n >= 1.0) ||
      (n > 1.0 && !(paper >= 0.0 && solid >= 0.0 && tint >= 0.0)))
    return nan("");
  const double exponent = 1.0 / n;
  const double from = n > 1.0 ? pow(paper, exponent) : paper;
  const double to = n > 1.0 ? pow(solid, exponent) : solid;
  const double at = n > 1.0 ? pow(tint, exponent) : tint;
  return from != to ? (from - at) / (from - to) : nan("");
}

double ef__halftone_mix(double n, size_t n_primaries, const double *share,
                        const double *root) {
  double sum = 0.0;
  for (size_t k = 0; k < n_primaries; k++)
    sum += share[k] * root[k];
  return pow(sum, n);
}

/* Demichel's shares and their slopes d share / d area, 8 x 3. */
typedef struct cover {
  double share[EF__OVERPRINTS];
  double slope[EF__OVERPRINTS][EF__INKS];
} cover;

static void fill_cover(const double *area, bool with_slopes, cover *out) {
  ef_demichel(EF__INKS, area, out->share);
  if (!with_slopes)
    return;
  for (size_t k = 0; k < EF__OVERPRINTS; k++) {
    for (size_t i = 0; i < EF__INKS; i++) {
      double product = k >> i & 1 ? 1.0 : -1.0;
      for (size_t j = 0; j < EF__INKS; j++)
        if (j != i)
          product *= k >> j & 1 ? area[j] : 1.0 - area[j];
      out->slope[k][i] = product;
    }
  }
}

/* Value `s` of the print, and unless NULL its slopes with the areas. */
static double mix_value(const halftone *h, const cover *c, size_t s,
                        double *slope) {
  const double *root = h->root + s * EF__OVERPRINTS;
  double sum = 0.0;
  for (size_t k = 0; k < EF__OVERPRINTS; k++)
    sum += c->share[k] * root[k];
  const double power = pow(sum, h->n - 1.0);
  if (slope == NULL)
    return power * sum;
  for (size_t i = 0; i < EF__INKS; i++) {
    double along = 0.0;
    for (size_t k = 0; k < EF__OVERPRINTS; k++)
      along += c->slope[k][i] * root[k];
    slope[i] = h->n * power * along;
  }
  return power * sum;
}

/* ---- What every kind of device answers ---------------------------------- */

static void release(ef_device *device) {
  free(((halftone *)device)->block);
}

static void spectrum(const ef_device *device, const double *amount, double *out,
                     double *jacobian) {
  const halftone *h = as_halftone(device);
  cover c;
  fill_cover(amount, jacobian != NULL, &c);
  for (size_t s = 0; s < h->width; s++)
    out[s] =
        mix_value(h, &c, s, jacobian != NULL ? jacobian + s * EF__INKS : NULL);
}

/* A print as an observer sees it. */
typedef struct seen {
  const halftone *print;
  ef_weights *weights; /* NULL: the values are X, Y, Z */
} seen;

static void release_seen(void *data) {
  seen *view = data;
  ef_weights_free(view->weights);
  free(view);
}

static void xyz_of_values(const halftone *h, const cover *c, double xyz[3],
                          double *jacobian) {
  for (size_t k = 0; k < 3; k++)
    xyz[k] =
        mix_value(h, c, k, jacobian != NULL ? jacobian + k * EF__INKS : NULL);
}

static void xyz_of(const void *data, const double *amount, double xyz[3],
                   double *jacobian) {
  const seen *view = data;
  const halftone *h = view->print;
  cover c;
  fill_cover(amount, jacobian != NULL, &c);
  if (view->weights == NULL) {
    xyz_of_values(h, &c, xyz, jacobian);
    return;
  }
  const double *weight = ef_weights_matrix(view->weights);
  for (size_t k = 0; k < 3; k++)
    xyz[k] = 0.0;
  for (size_t k = 0; jacobian != NULL && k < 3 * EF__INKS; k++)
    jacobian[k] = 0.0;
  for (size_t s = 0; s < h->width; s++) {
    double slope[EF__INKS];
    const double value = mix_value(h, &c, s, jacobian != NULL ? slope : NULL);
    for (size_t k = 0; k < 3; k++) {
      const double w = weight[k * h->width + s];
      xyz[k] += w * value;
      for (size_t i = 0; jacobian != NULL && i < EF__INKS; i++)
        jacobian[k * EF__INKS + i] += w * slope[i];
    }
  }
}

static ef_status check_view(const halftone *h, const ef_observer *observer,
                            const ef_illuminant *illuminant, ef_error *error) {
  if (strcmp(ef_observer_name(observer), "cie-1931") == 0 &&
      ef__name_equal(ef_illuminant_name(illuminant), h->illuminant))
    return EF_OK;
  return ef__error_set(
      error, EF_NO_ANSWER,
      "'%s' is known by tristimulus values of the observer cie-1931 under %s "
      "only; observer %s under %s needs the spectra of its patches",
      h->device.name, h->illuminant, ef_observer_name(observer),
      ef_illuminant_name(illuminant));
}

static ef_status fill_map(const halftone *h, const ef_observer *observer,
                          const ef_illuminant *illuminant,
                          const ef_notes *notes, seen *view,
                          ef__colour_map *map, ef_error *error) {
  ef_error own; /* the status of a constructor stands in its error */
  if (error == NULL)
    error = &own;
  if (h->device.grid.count == 0) {
    const ef_status status = check_view(h, observer, illuminant, error);
    return status != EF_OK
               ? status
               : ef_observer_white(observer, EF_TRISTIMULUS, illuminant, NULL,
                                   map->white, error);
  }
  view->weights = ef__reflecting_weights(observer, illuminant, &h->device.grid,
                                         notes, map->white, error);
  return view->weights != NULL ? EF_OK : error->status;
}

static ef_status see(const ef_device *device, const ef_observer *observer,
                     const ef_illuminant *illuminant, const ef_notes *notes,
                     ef__colour_map *map, ef_error *error) {
  seen *view = ef__allocate_zeroed(1, sizeof *view);
  if (view == NULL)
    return ef__error_memory(error, "a setup");
  view->print = as_halftone(device);
  const ef_status status =
      fill_map(view->print, observer, illuminant, notes, view, map, error);
  if (status != EF_OK) {
    release_seen(view);
    return status;
  }
  map->xyz = xyz_of;
  map->data = view;
  map->release = release_seen;
  return EF_OK;
}

static const ef__device_class halftone_class = {
    .kind = "halftone",
    .reflects = true,
    .limit_text = {" at 0 %", " at 100 %"},
    .release = release,
    .spectrum = spectrum,
    .see = see,
};

double ef_halftone_n(const ef_device *device) {
  return device->kind == &halftone_class ? as_halftone(device)->n : nan("");
}

/* ---- Construction ------------------------------------------------------- */

ef_halftone_settings ef_halftone_settings_default(void) {
  const ef_halftone_settings settings = {
      .n = 0.0,
      .n_curves = 0,
      .curve = NULL,
      .black = 0.0,
      .illuminant = NULL,
      .notes = NULL,
  };
  return settings;
}

ef_status ef__halftone_check(const ef_halftone_settings *settings,
                             ef_error *error) {
  if (settings->n != 0.0 &&
      !(settings->n >= least_n && settings->n <= greatest_n))
    return ef__error_set(error, EF_INVALID,
                         "Yule-Nielsen factor %g; expected 1 to 10, or 0 to "
                         "have it fitted",
                         settings->n);
  if (settings->n_curves > 1 && settings->n_curves != EF__INKS)
    return ef__error_set(error, EF_INVALID,
                         "%zu tone curves for %d inks; give one for each, one "
                         "for all, or none",
                         settings->n_curves, EF__INKS);
  for (size_t i = 0; i < settings->n_curves; i++)
    if (settings->curve == NULL || settings->curve[i] == NULL)
      return ef__error_set(error, EF_INVALID, "tone curve %zu is missing",
                           i + 1);
  if (!(settings->black >= 0.0 && settings->black <= 1.0))
    return ef__error_set(error, EF_INVALID,
                         "black fixed at %g; expected a drive from 0 to 1",
                         settings->black);
  return EF_OK;
}

static ef_status copy_values(halftone *h, const ef__halftone_parts *parts,
                             ef_error *error) {
  const size_t n_roots = h->width * EF__OVERPRINTS;
  const char *name = parts->illuminant != NULL ? parts->illuminant : "";
  const size_t length = strlen(name) + 1;
  const ef__part arrays[] = {{&h->root, n_roots, sizeof(double)},
                             {&h->illuminant, length, 1}};
  h->block = ef__allocate_block(2, arrays);
  if (h->block == NULL)
    return ef__error_memory(error, "a print");
  memcpy(h->root, parts->root, n_roots * sizeof(double));
  memcpy(h->illuminant, name, length);
  return EF_OK;
}

ef_device *ef__halftone_build(const ef__halftone_parts *parts,
                              ef_error *error) {
  halftone *h = ef__allocate_zeroed(1, sizeof *h);
  if (h == NULL) {
    ef__error_memory(error, "a print");
    return NULL;
  }
  h->width = parts->grid != NULL ? parts->grid->count : 3;
  h->n = parts->n;
  ef_status status = ef__device_set_up(
      &h->device, &halftone_class, parts->name, EF__INKS,
      parts->ink_name != NULL ? parts->ink_name : default_inks, parts->grid,
      parts->curve, error);
  if (status == EF_OK)
    status = copy_values(h, parts, error);
  if (status == EF_OK)
    return &h->device;
  ef_device_free(&h->device);
  return NULL;
}

/* ---- From primaries ----------------------------------------------------- */

static const char *ink_name(const char *const *names, size_t i) {
  return names != NULL ? names[i] : default_inks[i];
}

/* The sum of the values: a solid must be darker than the paper. */
static ef_status check_primaries(const char *const *names, size_t width,
                                 const double *primary, ef_error *error) {
  double sum[EF__OVERPRINTS];
  for (size_t k = 0; k < EF__OVERPRINTS; k++) {
    sum[k] = 0.0;
    for (size_t s = 0; s < width; s++) {
      const double value = primary[k * width + s];
      if (!isfinite(value))
        return ef__error_set(error, EF_INVALID,
                             "Neugebauer primary %zu: value %zu is not finite",
                             k + 1, s + 1);
      sum[k] += value;
    }
  }
  for (size_t i = 0; i < EF__INKS; i++)
    if (!(sum[(size_t)1 << i] < sum[0]))
      return ef__error_set(error, EF_INVALID,
                           "%s at 100 %% is not darker than the paper",
                           ink_name(names, i));
  return EF_OK;
}

/* Roots by value, and how many values were below zero. */
static size_t take_roots(size_t width, const double *primary, double n,
                         double *root) {
  size_t n_below = 0;
  for (size_t k = 0; k < EF__OVERPRINTS; k++) {
    for (size_t s = 0; s < width; s++) {
      const double value = primary[k * width + s];
      n_below += value < 0.0;
      root[s * EF__OVERPRINTS + k] = pow(fmax(value, 0.0), 1.0 / n);
    }
  }
  return n_below;
}

/* With all arguments checked. */
static ef_device *new_print(const char *name, const char *const *names,
                            const ef_grid *grid, const double *primary,
                            const ef_halftone_settings *settings, double *root,
                            ef_error *error) {
  const size_t width = grid != NULL ? grid->count : 3;
  const double n = settings->n > 0.0 ? settings->n : 1.0;
  ef_tone_curve *linear = NULL;
  const ef_tone_curve *curve[EF__INKS];
  if (settings->n_curves == 0) {
    linear = ef_tone_curve_new("linear", error);
    if (linear == NULL)
      return NULL;
  }
  for (size_t i = 0; i < EF__INKS; i++)
    curve[i] = linear != NULL ? linear
                              : settings->curve[settings->n_curves > 1 ? i : 0];
  const size_t n_below = take_roots(width, primary, n, root);
  if (n_below > 0)
    ef__note(settings->notes,
             "%s: %zu values of primaries below zero count as zero", name,
             n_below);
  const ef__halftone_parts parts = {
      .name = name,
      .ink_name = names,
      .grid = grid,
      .illuminant = settings->illuminant != NULL
                        ? ef_illuminant_name(settings->illuminant)
                        : "D50",
      .n = n,
      .root = root,
      .curve = curve,
  };
  ef_device *device = ef__halftone_build(&parts, error);
  ef_tone_curve_free(linear);
  return device;
}

ef_device *ef_halftone_new(const char *name, const char *const *ink_names,
                           const ef_grid *grid, const double *primary,
                           const ef_halftone_settings *settings,
                           ef_error *error) {
  const ef_halftone_settings plain = ef_halftone_settings_default();
  if (settings == NULL)
    settings = &plain;
  if (name == NULL || primary == NULL) {
    ef__error_set(error, EF_INVALID, "a print needs a name and primaries");
    return NULL;
  }
  if (grid != NULL && ef_grid_check(grid, error) != EF_OK)
    return NULL;
  const size_t width = grid != NULL ? grid->count : 3;
  if (ef__halftone_check(settings, error) != EF_OK ||
      check_primaries(ink_names, width, primary, error) != EF_OK)
    return NULL;
  double *root = ef__allocate(width, EF__OVERPRINTS * sizeof *root);
  if (root == NULL) {
    ef__error_memory(error, "a print");
    return NULL;
  }
  ef_device *device =
      new_print(name, ink_names, grid, primary, settings, root, error);
  free(root);
  return device;
}

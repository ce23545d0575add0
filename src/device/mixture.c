/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Mixtures of colourants as a device. */
#include "device/device_private.h"

#include "base/base_private.h"

#include <float.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

typedef struct mixture {
  ef_device device;
  size_t n;    /* colourants, the base among them */
  size_t base; /* SIZE_MAX: none */
  bool two_constant;
  double total_loading;
  double thickness;
  ef_surface surface;
  void *block;
  double *absorption; /* count x n: by sample */
  double *scattering; /* the same; unused in single-constant theory */
  double *backing;    /* count, inside */
  char *base_name;
  const char *name[EF_MAX_DRIVES + 1];
} mixture;

static const mixture *as_mixture(const ef_device *device) {
  return (const mixture *)device;
}

/* ---- One sample --------------------------------------------------------- */

/* Reflectance at sample s of some concentrations, and unless NULL its slopes
 * with them. */
static double mix_sample(const mixture *m, const double *concentration,
                         size_t s, double *slope) {
  const double *k_i = m->absorption + s * m->n;
  const double *s_i = m->scattering + s * m->n;
  double k = 0.0, sc = m->two_constant ? 0.0 : 1.0;
  for (size_t i = 0; i < m->n; i++) {
    k += concentration[i] * k_i[i];
    if (m->two_constant)
      sc += concentration[i] * s_i[i];
  }
  double along[2], outer;
  const double inside = ef_km_reflectance(k, sc, m->thickness, m->backing[s],
                                          slope != NULL ? along : NULL);
  const double r = ef_surface_outside(&m->surface, inside, &outer);
  for (size_t i = 0; slope != NULL && i < m->n; i++) {
    const double change =
        along[0] * k_i[i] + (m->two_constant ? along[1] * s_i[i] : 0.0);
    slope[i] = outer * change;
  }
  return r;
}

/* ---- Drives and concentrations ------------------------------------------ */

/* Slopes d concentration / d drive, n x n_drives. */
typedef double loading_slopes[(EF_MAX_DRIVES + 1) * EF_MAX_DRIVES];

static void load(const mixture *m, const double *amount, double *concentration,
                 double *slope) {
  const size_t n_drives = m->device.n_drives;
  double left = m->total_loading, left_slope[EF_MAX_DRIVES] = {0.0};
  size_t drive = 0;
  for (size_t i = 0; i < m->n; i++) {
    if (i == m->base)
      continue;
    concentration[i] = left * amount[drive];
    for (size_t j = 0; slope != NULL && j < n_drives; j++) {
      const double own = j == drive ? left : 0.0;
      slope[i * n_drives + j] = left_slope[j] * amount[drive] + own;
    }
    left *= 1.0 - amount[drive];
    for (size_t j = 0; slope != NULL && j < n_drives; j++)
      left_slope[j] -= slope[i * n_drives + j];
    drive++;
  }
  if (m->base == SIZE_MAX)
    return;
  /* The base is diluted, or in single-constant theory what all is told
   * against. 1 - total_loading + left: exact where nothing is loaded. */
  concentration[m->base] =
      m->two_constant ? (1.0 - m->total_loading) + left : 1.0;
  for (size_t j = 0; slope != NULL && j < n_drives; j++)
    slope[m->base * n_drives + j] = m->two_constant ? left_slope[j] : 0.0;
}

/* Slopes with concentrations to slopes with drives. */
static void chain(const mixture *m, const double *of_concentration,
                  const double *loading, double *of_drive) {
  const size_t n_drives = m->device.n_drives;
  for (size_t j = 0; j < n_drives; j++) {
    of_drive[j] = 0.0;
    for (size_t i = 0; i < m->n; i++)
      of_drive[j] += of_concentration[i] * loading[i * n_drives + j];
  }
}

/* ---- What every kind of device answers ---------------------------------- */

static void release(ef_device *device) {
  mixture *m = (mixture *)device;
  free(m->base_name);
  free(m->block);
}

static void spectrum(const ef_device *device, const double *amount, double *out,
                     double *jacobian) {
  const mixture *m = as_mixture(device);
  double concentration[EF_MAX_DRIVES + 1], slope[EF_MAX_DRIVES + 1];
  loading_slopes loading;
  load(m, amount, concentration, loading);
  for (size_t s = 0; s < device->grid.count; s++) {
    out[s] = mix_sample(m, concentration, s, jacobian != NULL ? slope : NULL);
    if (jacobian != NULL)
      chain(m, slope, loading, jacobian + s * device->n_drives);
  }
}

typedef struct seen {
  const mixture *mixture;
  ef_weights *weights;
} seen;

static void release_seen(void *data) {
  seen *view = data;
  ef_weights_free(view->weights);
  free(view);
}

static void xyz_of(const void *data, const double *amount, double xyz[3],
                   double *jacobian) {
  const seen *view = data;
  const mixture *m = view->mixture;
  const size_t count = m->device.grid.count;
  const double *weight = ef_weights_matrix(view->weights);
  double concentration[EF_MAX_DRIVES + 1], slope[EF_MAX_DRIVES + 1];
  double sum[3 * (EF_MAX_DRIVES + 1)] = {0.0};
  loading_slopes loading;
  load(m, amount, concentration, loading);
  for (size_t c = 0; c < 3; c++)
    xyz[c] = 0.0;
  for (size_t s = 0; s < count; s++) {
    const double r =
        mix_sample(m, concentration, s, jacobian != NULL ? slope : NULL);
    for (size_t c = 0; c < 3; c++) {
      const double w = weight[c * count + s];
      xyz[c] += w * r;
      for (size_t i = 0; jacobian != NULL && i < m->n; i++)
        sum[c * m->n + i] += w * slope[i];
    }
  }
  for (size_t c = 0; jacobian != NULL && c < 3; c++)
    chain(m, sum + c * m->n, loading, jacobian + c * m->device.n_drives);
}

static ef_status see(const ef_device *device, const ef_observer *observer,
                     const ef_illuminant *illuminant, const ef_notes *notes,
                     ef__colour_map *map, ef_error *error) {
  ef_error own; /* the status of a constructor stands in its error */
  if (error == NULL)
    error = &own;
  seen *view = ef__allocate_zeroed(1, sizeof *view);
  if (view == NULL)
    return ef__error_memory(error, "a setup");
  view->mixture = as_mixture(device);
  view->weights = ef__reflecting_weights(observer, illuminant, &device->grid,
                                         notes, map->white, error);
  if (view->weights == NULL) {
    free(view);
    return error->status;
  }
  map->xyz = xyz_of;
  map->data = view;
  map->release = release_seen;
  return EF_OK;
}

static const ef__device_class mixture_class = {
    .kind = "mixture",
    .reflects = true,
    .limit_text = {" at zero", "total loading"},
    .release = release,
    .spectrum = spectrum,
    .see = see,
};

/* ---- Questions ---------------------------------------------------------- */

static bool is_mixture(const ef_device *device) {
  return device->kind == &mixture_class;
}

size_t ef_mixture_count(const ef_device *device) {
  return is_mixture(device) ? as_mixture(device)->n : 0;
}

const char *ef_mixture_name(const ef_device *device, size_t i) {
  return i < ef_mixture_count(device) ? as_mixture(device)->name[i] : NULL;
}

size_t ef_mixture_base(const ef_device *device) {
  return is_mixture(device) ? as_mixture(device)->base : SIZE_MAX;
}

double ef_mixture_total_loading(const ef_device *device) {
  return is_mixture(device) ? as_mixture(device)->total_loading : nan("");
}

double ef_mixture_complete(const ef_device *device, double *concentration) {
  if (!is_mixture(device) || as_mixture(device)->base == SIZE_MAX)
    return 0.0;
  const mixture *m = as_mixture(device);
  double sum = 0.0;
  for (size_t i = 0; m->two_constant && i < m->n; i++)
    sum += i != m->base ? concentration[i] : 0.0;
  concentration[m->base] = fmax(1.0 - sum, 0.0);
  return m->two_constant ? -1.0 : 0.0;
}

static ef_status check_kind(const ef_device *device, ef_error *error) {
  return is_mixture(device)
             ? EF_OK
             : ef__error_set(error, EF_INVALID, "'%s' (%s) is no mixture",
                             device->name, device->kind->kind);
}

ef_status ef_mixture_concentrations(const ef_device *device,
                                    const double *drive, double *concentration,
                                    ef_error *error) {
  if (check_kind(device, error) != EF_OK)
    return EF_INVALID;
  double amount[EF_MAX_DRIVES];
  for (size_t j = 0; j < device->n_drives; j++) {
    amount[j] = ef_device_amount(device, j, drive[j], NULL);
    if (isnan(amount[j]))
      return ef__error_set(error, EF_INVALID, "the drive of %s is not finite",
                           device->drive_name[j]);
  }
  load(as_mixture(device), amount, concentration, NULL);
  return EF_OK;
}

static ef_status check_concentrations(const mixture *m,
                                      const double *concentration,
                                      bool with_base, ef_error *error) {
  for (size_t i = 0; i < m->n; i++) {
    const double c = concentration[i];
    if ((i == m->base && !with_base) || (c >= 0.0 && isfinite(c)))
      continue;
    return ef__error_set(error, EF_INVALID,
                         "the concentration of %s is %g; expected zero or more",
                         m->name[i], c);
  }
  return EF_OK;
}

ef_status ef_mixture_drives(const ef_device *device,
                            const double *concentration, double *drive,
                            ef_error *error) {
  if (check_kind(device, error) != EF_OK)
    return EF_INVALID;
  const mixture *m = as_mixture(device);
  ef_status status = check_concentrations(m, concentration, false, error);
  if (status != EF_OK)
    return status;
  const double least = 1e-12 * m->total_loading;
  double left = m->total_loading;
  size_t j = 0;
  for (size_t i = 0; i < m->n; i++) {
    if (i == m->base)
      continue;
    if (concentration[i] > left + least)
      return ef__error_set(error, EF_INVALID,
                           "the colourants sum to more than the total loading "
                           "of %g",
                           m->total_loading);
    drive[j++] = left > 0.0 ? fmin(concentration[i] / left, 1.0) : 0.0;
    left = fmax(left - concentration[i], 0.0);
  }
  return EF_OK;
}

ef_status ef_mixture_spectrum(const ef_device *device,
                              const double *concentration, double *out,
                              double *jacobian, ef_error *error) {
  if (check_kind(device, error) != EF_OK)
    return EF_INVALID;
  const mixture *m = as_mixture(device);
  const ef_status status = check_concentrations(m, concentration, true, error);
  for (size_t s = 0; status == EF_OK && s < device->grid.count; s++)
    out[s] = mix_sample(m, concentration, s,
                        jacobian != NULL ? jacobian + s * m->n : NULL);
  return status;
}

/* ---- Checks ------------------------------------------------------------- */

ef_mixture_settings ef_mixture_settings_default(void) {
  const ef_mixture_settings settings = {
      .base = SIZE_MAX,
      .total_loading = 1.0,
      .thickness = HUGE_VAL,
      .substrate = NULL,
      .surface = ef_surface_none(),
  };
  return settings;
}

static ef_status check_substrate(const ef_grid *grid,
                                 const ef_mixture_settings *settings,
                                 ef_error *error) {
  const bool is_film = !isinf(settings->thickness);
  if (is_film != (settings->substrate != NULL))
    return ef__error_set(error, EF_INVALID,
                         is_film ? "a film needs the reflectance of what it "
                                   "lies on"
                                 : "an opaque layer hides what it lies on; "
                                   "give the thickness of the film");
  for (size_t s = 0; is_film && s < grid->count; s++)
    if (!(settings->substrate[s] >= 0.0 && settings->substrate[s] <= 1.0))
      return ef__error_set(error, EF_INVALID,
                           "the substrate reflects %g at %g nm; expected 0 to "
                           "1",
                           settings->substrate[s], ef_grid_wavelength(grid, s));
  return EF_OK;
}

/* What is under the other colourants when there is little of them must have a
 * reflectance of its own. */
static ef_status check_base(const ef_colourants *colourants,
                            const ef_mixture_settings *settings,
                            ef_error *error) {
  const double *scattering =
      ef_colourants_scattering(colourants, settings->base);
  const ef_grid *grid = ef_colourants_grid(colourants);
  const bool has_base = settings->base != SIZE_MAX;
  const bool two_constant = ef_colourants_scattering(colourants, 0) != NULL;
  if (!has_base && (!two_constant || isinf(settings->thickness)))
    return ef__error_set(error, EF_INVALID,
                         "%s need a base, which the others are added to",
                         two_constant ? "opaque mixtures"
                                      : "mixtures in single-constant theory");
  for (size_t s = 0;
       isinf(settings->thickness) && two_constant && s < grid->count; s++)
    if (!(scattering[s] > 0.0))
      return ef__error_set(error, EF_INVALID,
                           "the base '%s' does not scatter at %g nm, so an "
                           "opaque layer of it has no reflectance",
                           ef_colourants_name(colourants, settings->base),
                           ef_grid_wavelength(grid, s));
  return EF_OK;
}

static ef_status check(const ef_colourants *colourants,
                       const ef_mixture_settings *settings, ef_error *error) {
  const bool has_base = settings->base != SIZE_MAX;
  const size_t n = ef_colourants_count(colourants);
  if (has_base && settings->base >= n)
    return ef__error_set(error, EF_INVALID, "the base is colourant %zu of %zu",
                         settings->base + 1, n);
  const size_t n_drives = n - (has_base ? 1 : 0);
  if (n_drives < 1 || n_drives > EF_MAX_DRIVES)
    return ef__error_set(error, EF_INVALID,
                         "%zu colourants beside the base; a mixture has 1 to "
                         "%d",
                         n_drives, EF_MAX_DRIVES);
  const bool is_diluted =
      has_base && ef_colourants_scattering(colourants, 0) != NULL;
  if (!(settings->total_loading > 0.0 && isfinite(settings->total_loading)) ||
      (is_diluted && settings->total_loading > 1.0))
    return ef__error_set(
        error, EF_INVALID, "total loading %g; expected a number above zero%s",
        settings->total_loading,
        is_diluted ? " and at most 1, as the base is the rest" : "");
  if (!(settings->thickness > 0.0))
    return ef__error_set(error, EF_INVALID,
                         "film thickness %g; expected a number above zero",
                         settings->thickness);
  ef_status status = ef__surface_check(&settings->surface, error);
  if (status == EF_OK)
    status = check_substrate(ef_colourants_grid(colourants), settings, error);
  return status == EF_OK ? check_base(colourants, settings, error) : status;
}

/* ---- Construction ------------------------------------------------------- */

static ef_status copy_values(mixture *m, const ef_colourants *colourants,
                             const ef_mixture_settings *settings,
                             ef_error *error) {
  const size_t count = m->device.grid.count;
  const ef__part parts[] = {{&m->absorption, m->n * count, sizeof(double)},
                            {&m->scattering, m->n * count, sizeof(double)},
                            {&m->backing, count, sizeof(double)}};
  m->block = ef__allocate_block(3, parts);
  if (m->block == NULL)
    return ef__error_memory(error, "a mixture");
  for (size_t s = 0; s < count; s++) {
    for (size_t i = 0; i < m->n; i++) {
      m->absorption[s * m->n + i] = ef_colourants_absorption(colourants, i)[s];
      if (m->two_constant)
        m->scattering[s * m->n + i] =
            ef_colourants_scattering(colourants, i)[s];
    }
    if (settings->substrate != NULL)
      /* Noise around black may lie below what the surface alone reflects. */
      m->backing[s] =
          fmax(ef_surface_inside(&m->surface, settings->substrate[s]), 0.0);
  }
  return EF_OK;
}

static ef_status set_up(mixture *m, const char *name,
                        const ef_colourants *colourants, ef_error *error) {
  const char *drive_name[EF_MAX_DRIVES];
  const ef_tone_curve *curve[EF_MAX_DRIVES];
  size_t n_drives = 0;
  ef_tone_curve *linear = ef_tone_curve_new("linear", error);
  if (linear == NULL)
    return EF_NO_MEMORY;
  for (size_t i = 0; i < m->n; i++) {
    if (i == m->base)
      continue;
    drive_name[n_drives] = ef_colourants_name(colourants, i);
    curve[n_drives++] = linear;
  }
  const ef_status status =
      ef__device_set_up(&m->device, &mixture_class, name, n_drives, drive_name,
                        ef_colourants_grid(colourants), curve, error);
  ef_tone_curve_free(linear);
  return status;
}

/* Names in the order of the set; the device keeps those of its drives. */
static ef_status keep_names(mixture *m, const ef_colourants *colourants,
                            ef_error *error) {
  size_t drive = 0;
  for (size_t i = 0; i < m->n; i++) {
    if (i != m->base) {
      m->name[i] = m->device.drive_name[drive++];
      continue;
    }
    const char *name = ef_colourants_name(colourants, i);
    m->base_name = ef__copy_text(name, strlen(name));
    if (m->base_name == NULL)
      return ef__error_memory(error, "a mixture");
    m->name[i] = m->base_name;
  }
  return EF_OK;
}

ef_device *ef_mixture_new(const char *name, const ef_colourants *colourants,
                          const ef_mixture_settings *settings,
                          ef_error *error) {
  const ef_mixture_settings plain = ef_mixture_settings_default();
  if (settings == NULL)
    settings = &plain;
  if (name == NULL || colourants == NULL) {
    ef__error_set(error, EF_INVALID, "a mixture needs a name and colourants");
    return NULL;
  }
  if (check(colourants, settings, error) != EF_OK)
    return NULL;
  mixture *m = ef__allocate_zeroed(1, sizeof *m);
  if (m == NULL) {
    ef__error_memory(error, "a mixture");
    return NULL;
  }
  m->device.kind = &mixture_class;
  m->n = ef_colourants_count(colourants);
  m->base = settings->base;
  m->two_constant = ef_colourants_scattering(colourants, 0) != NULL;
  m->total_loading = settings->total_loading;
  m->thickness = settings->thickness;
  m->surface = settings->surface;
  ef_status status = set_up(m, name, colourants, error);
  if (status == EF_OK)
    status = keep_names(m, colourants, error);
  if (status == EF_OK)
    status = copy_values(m, colourants, settings, error);
  if (status == EF_OK)
    return &m->device;
  ef_device_free(&m->device);
  return NULL;
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Cone fundamentals of CIE 170-1:2006 for any age, field and person. */
#include <math.h>
#include <stdlib.h>

#include "base/base_private.h"
#include "observer/model_private.h"

#define LN_10 2.302585092994045684

static double power_of_ten(double x) {
  return exp(LN_10 * x);
}

/* ---- The model --------------------------------------------------------- */

ef_cone_model ef_cone_model_default(void) {
  return (ef_cone_model){.age_years = 32, .field_deg = 2};
}

const char *ef_deficiency_name(ef_deficiency deficiency) {
  switch (deficiency) {
  case EF_PROTANOPE: return "protanope";
  case EF_DEUTERANOPE: return "deuteranope";
  case EF_TRITANOPE: return "tritanope";
  case EF_TRICHROMAT: break;
  }
  return "trichromat";
}

/* How far a quantity of the model may go. */
typedef struct limit {
  const char *what;
  double value;
  double low, high;
  const char *unit;
} limit;

ef_status ef_cone_model_check(const ef_cone_model *model, ef_error *error) {
  enum { MOST_PERCENT = 400, MOST_NM = 40 };
  const double *const density = model->density_percent;
  const double *const shift = model->shift_nm;
  const limit limits[] = {
      {"age", model->age_years, 20, 80, "years"},
      {"field", model->field_deg, 1, 10, "degrees"},
      {"lens density", model->lens_percent, -100, MOST_PERCENT, "%"},
      {"macular density", model->macular_percent, -100, MOST_PERCENT, "%"},
      {"L pigment density", density[0], -100, MOST_PERCENT, "%"},
      {"M pigment density", density[1], -100, MOST_PERCENT, "%"},
      {"S pigment density", density[2], -100, MOST_PERCENT, "%"},
      {"L pigment shift", shift[0], -MOST_NM, MOST_NM, "nm"},
      {"M pigment shift", shift[1], -MOST_NM, MOST_NM, "nm"},
      {"S pigment shift", shift[2], -MOST_NM, MOST_NM, "nm"},
  };
  for (size_t i = 0; i < sizeof limits / sizeof *limits; ++i) {
    const limit *const at = &limits[i];
    if (at->value >= at->low && at->value <= at->high) continue;
    return ef__error_set(error, EF_INVALID,
                         "the %s is %g %s; the observer model takes %g to %g",
                         at->what, at->value, at->unit, at->low, at->high);
  }
  if (model->deficiency < EF_TRICHROMAT || model->deficiency > EF_TRITANOPE) {
    return ef__error_set(error, EF_INVALID, "there is no deficiency number %d",
                         (int)model->deficiency);
  }
  return EF_OK;
}

/* ---- One person's eye -------------------------------------------------- */

enum { NO_PIGMENT = 3 };

/* What the equations of CIE 170-1 need of a model. */
typedef struct eye {
  double lens_aging, lens_fixed; /* factors of the two parts of the template */
  double macular;                /* factor of the 2 degree template */
  struct {
    size_t template; /* 0 to 2 for the pigment of L, M, S, or NO_PIGMENT */
    double density;  /* peak optical density */
    double shift_nm;
  } pigment[3];      /* of each kind of cone */
} eye;

/* Pokorny, Smith & Lutze (1987), as CIE 170-1 takes it over. */
static double aging_factor(double age_years) {
  return age_years <= 60 ? 1 + 0.02 * (age_years - 32)
                         : 1.56 + 0.0667 * (age_years - 60);
}

static double fraction(double percent) {
  return 1 + percent / 100;
}

static void find_densities(const ef_cone_model *model, double density[3]) {
  const double spread = exp(-model->field_deg / 1.333); /* CIE 170-1:2006 */
  const double mean[3] = {0.38 + 0.54 * spread, 0.38 + 0.54 * spread,
                          0.30 + 0.45 * spread};
  for (size_t i = 0; i < 3; ++i) {
    density[i] = mean[i] * fraction(model->density_percent[i]);
  }
}

/* Kind of pigment in the cones that stand in place `cone`. In a protanope the
 * cones that would be L hold the M pigment, in a deuteranope those that would
 * be M hold the L pigment: the replacement model, in which no cones are
 * missing (Vos & Walraven, Vision Res. 11 (1971) 799; Smith & Pokorny, Vision
 * Res. 15 (1975) 161; both references from memory). S cones have no such
 * neighbour: a tritanope is without them. */
static size_t pigment_of(ef_deficiency deficiency, size_t cone) {
  enum { L, M, S };
  if (deficiency == EF_PROTANOPE && cone == L) return M;
  if (deficiency == EF_DEUTERANOPE && cone == M) return L;
  if (deficiency == EF_TRITANOPE && cone == S) return NO_PIGMENT;
  return cone;
}

static eye find_eye(const ef_cone_model *model) {
  const double lens = fraction(model->lens_percent);
  /* Peak 0.485 exp(-f / 6.132) at 460 nm, where the template has 0.35. */
  const double macular_peak = 0.485 * exp(-model->field_deg / 6.132);
  eye e = {.lens_aging = lens * aging_factor(model->age_years),
           .lens_fixed = lens,
           .macular = macular_peak / 0.35 * fraction(model->macular_percent)};
  double density[3];
  find_densities(model, density);
  for (size_t cone = 0; cone < 3; ++cone) {
    const size_t kind = pigment_of(model->deficiency, cone);
    e.pigment[cone].template = kind;
    if (kind == NO_PIGMENT) continue;
    e.pigment[cone].density = density[kind];
    e.pigment[cone].shift_nm = model->shift_nm[kind];
  }
  return e;
}

static double media_density(const eye *e, const ef__media *media) {
  return e->lens_aging * media->lens_aging + e->lens_fixed * media->lens_fixed +
         e->macular * media->macular;
}

static bool in_range(double wavelength_nm) {
  return wavelength_nm >= EF__TEMPLATE_FIRST_NM &&
         wavelength_nm <= EF__TEMPLATE_LAST_NM;
}

/* Share of the quanta that the pigment absorbs; below the template's range a
 * shifted pigment goes on in a straight line of its logarithm. */
static double absorbed(const ef__templates *templates, const eye *e,
                       size_t cone, double wavelength_nm) {
  enum { S = 2 };
  const size_t kind = e->pigment[cone].template;
  const double at = wavelength_nm - e->pigment[cone].shift_nm;
  if (kind == NO_PIGMENT) return 0;
  if (kind == S && at > EF__TEMPLATE_S_LAST_NM) return 0;
  const double absorbance =
      power_of_ten(ef__curve_at(&templates->log10_absorbance[kind], at));
  return -expm1(-LN_10 * e->pigment[cone].density * absorbance);
}

static double sensitivity(const ef__templates *templates, const eye *e,
                          size_t cone, ef_cone_units units,
                          double wavelength_nm) {
  const ef__media media = ef__templates_media(templates, wavelength_nm);
  const double quantal = absorbed(templates, e, cone, wavelength_nm) *
                         power_of_ten(-media_density(e, &media));
  return units == EF_ENERGY ? wavelength_nm * quantal : quantal;
}

/* ---- Peaks ------------------------------------------------------------- */

/* The highest of the values at multiples of 0.1 nm. Coarse steps of 5 nm find
 * the summit (no pigment has a second one so near), halving finds the top. */
static double find_peak(const ef__templates *templates, const eye *e,
                        size_t cone, ef_cone_units units) {
  enum { TENTHS_FIRST = 3900, TENTHS_LAST = 6800, COARSE = 50 };
  int top = TENTHS_FIRST;
  double highest = 0;
  for (int tenths = TENTHS_FIRST; tenths <= TENTHS_LAST; tenths += COARSE) {
    const double value =
        sensitivity(templates, e, cone, units, tenths / 10.0);
    if (value > highest) {
      highest = value;
      top = tenths;
    }
  }
  int low = top - COARSE < TENTHS_FIRST ? TENTHS_FIRST : top - COARSE;
  int high = top + COARSE;
  while (low < high) { /* the slope at `middle` tells the side */
    const int middle = (low + high) / 2;
    const double here = sensitivity(templates, e, cone, units, middle / 10.0);
    const double next =
        sensitivity(templates, e, cone, units, (middle + 1) / 10.0);
    if (next > here) {
      low = middle + 1;
    } else {
      high = middle;
    }
  }
  return sensitivity(templates, e, cone, units, low / 10.0);
}

/* ---- On a grid --------------------------------------------------------- */

ef_status ef__cones_new(const ef_grid *grid, ef__cones **out,
                        ef_error *error) {
  ef__templates templates;
  ef_status status = ef_grid_check(grid, error);
  if (status == EF_OK) status = ef__templates_read(&templates, error);
  if (status != EF_OK) return status;
  ef__cones *cones = NULL;
  double *wavelength_nm = NULL;
  ef__media *media = NULL;
  const ef__part parts[] = {{&cones, 1, sizeof *cones},
                            {&wavelength_nm, grid->count, sizeof(double)},
                            {&media, grid->count, sizeof *media}};
  if (ef__allocate_block(sizeof parts / sizeof *parts, parts) == NULL) {
    return ef__error_memory(error, "cone fundamentals");
  }
  cones->templates = templates;
  cones->n = grid->count;
  cones->wavelength_nm = wavelength_nm;
  cones->media = media;
  for (size_t i = 0; i < cones->n; ++i) {
    wavelength_nm[i] = ef_grid_wavelength(grid, i);
    if (in_range(wavelength_nm[i])) {
      media[i] = ef__templates_media(&templates, wavelength_nm[i]);
    }
  }
  *out = cones;
  return EF_OK;
}

void ef__cones_fundamentals(const ef__cones *cones, const ef_cone_model *model,
                            ef_cone_units units, double *out) {
  const eye e = find_eye(model);
  double inverse_peak[3];
  for (size_t cone = 0; cone < 3; ++cone) {
    const double peak = find_peak(&cones->templates, &e, cone, units);
    inverse_peak[cone] = peak > 0 ? 1 / peak : 0; /* no pigment: zero */
  }
  for (size_t i = 0; i < cones->n; ++i) {
    const double nm = cones->wavelength_nm[i];
    const bool inside = in_range(nm);
    const double passed =
        inside ? power_of_ten(-media_density(&e, &cones->media[i])) : 0;
    const double weight = units == EF_ENERGY ? nm * passed : passed;
    for (size_t cone = 0; cone < 3; ++cone) {
      out[cone * cones->n + i] =
          inside ? weight * inverse_peak[cone] *
                       absorbed(&cones->templates, &e, cone, nm)
                 : 0;
    }
  }
}

double ef__cones_lens_change(const ef__templates *templates,
                             const ef_cone_model *model, double wavelength_nm) {
  const ef_cone_model mean = ef_cone_model_default();
  const eye own = find_eye(model);
  const eye reference = find_eye(&mean);
  const double at =
      fmin(fmax(wavelength_nm, EF__TEMPLATE_FIRST_NM), EF__TEMPLATE_LAST_NM);
  const ef__media media = ef__templates_media(templates, at);
  return -LN_10 * ((own.lens_aging - reference.lens_aging) * media.lens_aging +
                   (own.lens_fixed - reference.lens_fixed) * media.lens_fixed);
}

/* ---- Public ------------------------------------------------------------ */

ef_status ef_cone_model_fundamentals(const ef_cone_model *model,
                                     ef_cone_units units, const ef_grid *grid,
                                     double *out, ef_error *error) {
  ef__cones *cones = NULL;
  ef_status status = ef_cone_model_check(model, error);
  if (status == EF_OK) status = ef__cones_new(grid, &cones, error);
  if (status != EF_OK) return status;
  ef__cones_fundamentals(cones, model, units, out);
  free(cones);
  return EF_OK;
}

ef_status ef_cone_model_peak_densities(const ef_cone_model *model,
                                       double density[3], ef_error *error) {
  const ef_status status = ef_cone_model_check(model, error);
  if (status != EF_OK) return status;
  const eye e = find_eye(model);
  for (size_t i = 0; i < 3; ++i) density[i] = e.pigment[i].density;
  return EF_OK;
}

ef_status ef_cone_model_media(const ef_cone_model *model, const ef_grid *grid,
                              double *lens_density, double *macular_density,
                              ef_error *error) {
  ef__templates templates;
  ef_status status = ef_cone_model_check(model, error);
  if (status == EF_OK) status = ef_grid_check(grid, error);
  if (status == EF_OK) status = ef__templates_read(&templates, error);
  if (status != EF_OK) return status;
  const double first = ef_grid_wavelength(grid, 0);
  const double last = ef_grid_wavelength(grid, grid->count - 1);
  if (!in_range(first) || !in_range(last)) {
    return ef__error_set(error, EF_INVALID,
                         "the densities of the eye are known from %g to %g nm; "
                         "the grid goes from %g to %g",
                         EF__TEMPLATE_FIRST_NM, EF__TEMPLATE_LAST_NM, first,
                         last);
  }
  const eye e = find_eye(model);
  for (size_t i = 0; i < grid->count; ++i) {
    const ef__media media =
        ef__templates_media(&templates, ef_grid_wavelength(grid, i));
    if (lens_density != NULL) {
      lens_density[i] =
          e.lens_aging * media.lens_aging + e.lens_fixed * media.lens_fixed;
    }
    if (macular_density != NULL) macular_density[i] = e.macular * media.macular;
  }
  return EF_OK;
}

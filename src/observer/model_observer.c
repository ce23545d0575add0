/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Observers made of a cone model. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"
#include "observer/model_private.h"
#include "observer/observer_private.h"

static const char *departure(ef_deficiency deficiency) {
  switch (deficiency) {
  case EF_PROTANOPE: return ", protanope: the L cones hold the M pigment";
  case EF_DEUTERANOPE: return ", deuteranope: the M cones hold the L pigment";
  case EF_TRITANOPE: return ", tritanope: no S cones";
  case EF_TRICHROMAT: break;
  }
  return "";
}

static bool has_departures(const ef_cone_model *model) {
  double total = fabs(model->lens_percent) + fabs(model->macular_percent);
  for (size_t i = 0; i < 3; ++i) {
    total += fabs(model->density_percent[i]) + fabs(model->shift_nm[i]);
  }
  return total > 0;
}

static void describe(const ef_cone_model *model, size_t size, char *text) {
  char age[EF_NUMBER_TEXT], field[EF_NUMBER_TEXT];
  ef_number_format(model->age_years, age);
  ef_number_format(model->field_deg, field);
  snprintf(text, size, "observer of %s years, %s degree field (CIE 170-1:2006, "
           "CIE 170-2:2015)%s%s", age, field, departure(model->deficiency),
           has_departures(model)
               ? ", with departures from the mean eye as stated in its name"
               : "");
}

/* l_bar, m_bar, s_bar on their own grid -> rows on the standard grid. */
static void place(const ef_grid *from, size_t n_rows, const double *value,
                  double *out) {
  const ef_grid to = ef_grid_standard();
  const size_t first = (size_t)lround(from->start_nm - to.start_nm);
  for (size_t r = 0; r < n_rows; ++r) {
    memcpy(out + r * to.count + first, value + r * from->count,
           from->count * sizeof *out);
  }
}

/* Factors of MacLeod and Boynton's diagram: those of y_F, and the largest s_MB
 * is 1 (CIE 170-2:2015); 0 without S cones. */
static ef_mb_scale find_mb_scale(const ef__field *field, size_t n,
                                 const double *cone) {
  ef_mb_scale scale = {.k_l = field->matrix[3], .k_m = field->matrix[4]};
  double largest = 0;
  for (size_t i = 0; i < n; ++i) {
    const double v = scale.k_l * cone[i] + scale.k_m * cone[n + i];
    if (v > 0) largest = fmax(largest, cone[2 * n + i] / v);
  }
  scale.k_s = largest > 0 ? 1 / largest : 0;
  return scale;
}

/* `work` has room for 6 x grid->count. */
static void fill(const ef__cones *cones, const ef_grid *grid,
                 const ef_cone_model *model, const ef__field *field,
                 double *work, ef_observer *observer) {
  const size_t n = grid->count;
  double *const cone = work, *const xyz_bar = work + 3 * n;
  const double scale = ef__dichromat_scale(cones, model, field);
  ef__cones_fundamentals(cones, model, EF_ENERGY, cone);
  ef__field_tristimulus(field, n, model->deficiency, scale, cone, xyz_bar);
  place(grid, 3, cone, observer->set[EF_CONES].value);
  place(grid, 3, xyz_bar, observer->set[EF_TRISTIMULUS].value);
  observer->mb_scale = find_mb_scale(field, n, cone);
  observer->field_deg = model->field_deg;
  observer->k_m = field->k_m;
  observer->dimensions = model->deficiency == EF_TRICHROMAT ? 3 : 2;
  observer->has_model = true;
  observer->model = *model;
}

ef_observer *ef__observer_from_model(const char *name,
                                     const ef_cone_model *model,
                                     ef_error *error) {
  const ef_grid grid = ef__template_grid();
  char about[320];
  ef__field field;
  ef__cones *cones = NULL;
  ef_observer *observer = NULL;
  if (ef__field_find(model->field_deg, &field, error) != EF_OK) return NULL;
  if (ef__cones_new(&grid, &cones, error) != EF_OK) return NULL;
  double *const work = ef__allocate(6 * grid.count, sizeof *work);
  describe(model, sizeof about, about);
  if (work == NULL) {
    ef__error_memory(error, "observer");
  } else {
    observer = ef__observer_allocate(name, about, error);
  }
  if (observer != NULL) {
    fill(cones, &grid, model, &field, work, observer);
    if (ef__observer_set_receptors(observer, model, error) != EF_OK) {
      ef_observer_free(observer);
      observer = NULL;
    }
  }
  free(work);
  free(cones);
  return observer;
}

ef_observer *ef_observer_from_model(const ef_cone_model *model,
                                    ef_error *error) {
  char name[EF__MODEL_NAME];
  if (ef_cone_model_check(model, error) != EF_OK) return NULL;
  ef__model_name(model, name);
  return ef__observer_from_model(name, model, error);
}

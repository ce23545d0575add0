/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Observers from tables: the built-in ones, and colour-matching functions of
 * the user's own. The cone fundamentals have no values below 390 nm and S none
 * above 615 nm; they count as zero there, and so do the colour-matching
 * functions made of them. */
#include <math.h>
#include <stdlib.h>

#include "base/base_private.h"
#include "observer/observer_private.h"

const ef__cone_field ef__cone_field_2 = {
    .table = "cie-2006-2",
    .field_deg = 2,
    .k_m = 683.358,                                    /* CIE 170-2:2015 */
    .mb_scale = {0.68990272, 0.34832189, 0.0371597},   /* CIE 170-2:2015 */
    .to_xyz = {1.94735469, -1.41445123, 0.36476327,    /* CIE 170-2:2015 */
               0.68990272, 0.34832189,  0,
               0,          0,           1.93485343}};
const ef__cone_field ef__cone_field_10 = {
    .table = "cie-2006-10",
    .field_deg = 10,
    .k_m = 683.599,                                    /* CIE 170-2:2015 */
    .mb_scale = {0.69283932, 0.34967567, 0.0554786},   /* CIE 170-2:2015 */
    .to_xyz = {1.93986443, -1.34664359, 0.43044935,    /* CIE 170-2:2015 */
               0.69283932, 0.34967567,  0,
               0,          0,           2.14687945}};

enum { K_M = 683 }; /* lm/W for V(lambda) of 1924, CIE 018:2019 */

/* A built-in observer. */
typedef struct tabulated {
  const char *about;
  const char *table; /* NULL: cones times their `to_xyz` and `k_m` */
  const ef__cone_field *cones;
} tabulated;

static const char *const names[] = {"cie-1931", "cie-1964", "cie-2015-2",
                                    "cie-2015-10"};
enum { N_TABULATED = sizeof names / sizeof *names };

static const tabulated known[N_TABULATED] = {
    {"CIE 1931 standard colorimetric observer, 2 degree field "
     "(ISO/CIE 11664-1:2019)",
     "cie-1931", &ef__cone_field_2},
    {"CIE 1964 standard colorimetric observer, 10 degree field "
     "(ISO/CIE 11664-1:2019)",
     "cie-1964", &ef__cone_field_10},
    {"CIE 2015 cone-fundamental-based observer, 2 degree field "
     "(CIE 170-2:2015)",
     NULL, &ef__cone_field_2},
    {"CIE 2015 cone-fundamental-based observer, 10 degree field "
     "(CIE 170-2:2015)",
     NULL, &ef__cone_field_10},
};

size_t ef__tabulated_names(const char *const **list) {
  if (list != NULL) *list = names;
  return N_TABULATED;
}

/* The first three columns of a table with 1 nm rows, by wavelength; zero where
 * the table has no row. */
static ef_status read_table(const char *table_name, double *value,
                            ef_error *error) {
  const ef_table *const table = ef_table_find(table_name, error);
  if (table == NULL) return EF_UNKNOWN_NAME;
  const ef_grid grid = ef_grid_standard();
  for (size_t row = 0; row < table->n_rows; ++row) {
    const double place =
        (table->value[row] - grid.start_nm) / grid.step_nm;
    const double whole = round(place);
    if (place != whole || whole < 0 || whole >= (double)grid.count) continue;
    for (size_t c = 0; c < 3; ++c) {
      value[c * grid.count + (size_t)whole] =
          table->value[(c + 1) * table->n_rows + row];
    }
  }
  return EF_OK;
}

static void multiply_cones(const double matrix[9], size_t n,
                           const double *cones, double *out) {
  for (size_t i = 0; i < n; ++i) {
    const double lms[3] = {cones[i], cones[n + i], cones[2 * n + i]};
    double xyz[3];
    ef__mat3_apply(matrix, lms, xyz);
    for (size_t c = 0; c < 3; ++c) out[c * n + i] = xyz[c];
  }
}

static ef_status set_cones(ef_observer *observer, const ef__cone_field *cones,
                           bool borrowed, ef_error *error) {
  observer->field_deg = cones->field_deg;
  observer->mb_scale = cones->mb_scale;
  observer->cones_borrowed = borrowed;
  const ef_status status =
      read_table(cones->table, observer->set[EF_CONES].value, error);
  if (status != EF_OK) return status;
  return ef__observer_set_receptors(observer, NULL, error);
}

ef_observer *ef__tabulated_new(size_t i, ef_error *error) {
  const tabulated *const source = &known[i];
  ef_observer *const observer =
      ef__observer_allocate(names[i], source->about, error);
  if (observer == NULL) return NULL;
  const bool borrowed = source->table != NULL;
  observer->k_m = borrowed ? K_M : source->cones->k_m;
  double *const xyz_bar = observer->set[EF_TRISTIMULUS].value;
  if (set_cones(observer, source->cones, borrowed, error) != EF_OK) goto fail;
  if (source->table == NULL) {
    multiply_cones(source->cones->to_xyz, ef_grid_standard().count,
                   observer->set[EF_CONES].value, xyz_bar);
  } else if (read_table(source->table, xyz_bar, error) != EF_OK) {
    goto fail;
  }
  return observer;
fail:
  ef_observer_free(observer);
  return NULL;
}

/* Functions that depend on each other see fewer than three dimensions. */
static ef_status check_independent(const char *name, const double *xyz_bar,
                                   ef_error *error) {
  const size_t n = ef_grid_standard().count;
  double *const scratch =
      ef__allocate(ef__condition_scratch(3, n), sizeof *scratch);
  if (scratch == NULL) return ef__error_memory(error, "observer");
  double condition;
  ef_status status =
      ef__condition(3, n, xyz_bar, scratch, NULL, &condition, error);
  free(scratch);
  if (status == EF_OK && !isfinite(condition)) {
    status = ef__error_set(error, EF_INVALID,
                           "the functions of observer '%s' are zero or depend "
                           "on each other between 360 and 830 nm; three "
                           "independent ones are needed",
                           name);
  }
  return status;
}

ef_observer *ef_observer_from_spectra(const char *name,
                                      const ef_spectra *spectra,
                                      ef_error *error) {
  if (ef_spectra_count(spectra) != 3) {
    ef__error_set(error, EF_INVALID,
                  "observer '%s' has %zu functions; x_bar, y_bar, z_bar are "
                  "needed, in this order",
                  name, ef_spectra_count(spectra));
    return NULL;
  }
  ef_observer *const observer = ef__observer_allocate(
      name, "colour-matching functions of the user's own, cones of CIE "
            "170-1:2006 for 2 degrees", error);
  if (observer == NULL) return NULL;
  observer->k_m = K_M;
  double *const xyz_bar = observer->set[EF_TRISTIMULUS].value;
  const ef_grid grid = ef_grid_standard();
  const ef_grid from = ef_grid_simplify(ef_spectra_grid(spectra));
  if (set_cones(observer, &ef__cone_field_2, true, error) != EF_OK ||
      ef_resample(&from, 3, ef_spectra_values(spectra), &grid,
                  EF_INTERPOLATE_AUTO, EF_EXTEND_ZERO, xyz_bar,
                  error) != EF_OK ||
      check_independent(name, xyz_bar, error) != EF_OK) {
    ef_observer_free(observer);
    return NULL;
  }
  return observer;
}

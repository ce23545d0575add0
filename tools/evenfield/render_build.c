/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "render_build.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

/* Text shows the functions at these steps. */
enum { TEXT_STEP_NM = 10 };

static const char *units_text(const build *b) {
  return b->options->units == EF_QUANTAL ? "quantal" : "energy";
}

static double value_at(const build *b, size_t k, size_t function, size_t i) {
  return b->one[k].value[function * b->grid.count + i];
}

/* "x_bar", or "x_bar_3" of several observers. */
static void column_name(const build *b, size_t k, size_t function,
                        char name[32]) {
  if (b->n == 1) {
    snprintf(name, 32, "%s", build_function_name(function));
  } else {
    snprintf(name, 32, "%s_%zu", build_function_name(function), k + 1);
  }
}

/* ---- What is to be known of them --------------------------------------- */

static void add_cones(text *t, const build *b, size_t k) {
  const ef_observer *observer = b->one[k].observer;
  if (ef_observer_cones_borrowed(observer)) {
    char field[EF_NUMBER_TEXT];
    ef_number_format(ef_observer_field_deg(observer), field);
    text_format(t,
                "those of CIE 170-1:2006 for %s degrees, since this observer "
                "has none of its own; ",
                field);
  }
  text_format(t, "%s units, peak 1, 0 where nothing is published",
              units_text(b));
}

/* Densities that make an eye: pigments at their peak, media. */
typedef struct densities {
  double pigment[3], lens_400, macular_460;
} densities;

static ef_status find_densities(const built_observer *one, densities *out,
                                ef_error *error) {
  const double wavelength_nm[2] = {400, 460};
  const ef_grid grid = {.count = 2, .wavelength_nm = wavelength_nm};
  double lens[2], macular[2];
  ef_status status =
      ef_cone_model_peak_densities(&one->model, out->pigment, error);
  if (status == EF_OK)
    status = ef_cone_model_media(&one->model, &grid, lens, macular, error);
  out->lens_400 = lens[0];
  out->macular_460 = macular[1];
  return status;
}

/* ---- CSV --------------------------------------------------------------- */

static void comment(ef_csv *csv, text *t) {
  ef_csv_comment(csv, t->bytes != NULL ? t->bytes : "");
  text_free(t);
}

static void head_of_one(const build *b, ef_csv *csv) {
  const ef_observer *observer = b->one[0].observer;
  char k_m[EF_NUMBER_TEXT];
  text t = {0};
  text_format(&t, "title: functions of observer %s",
              ef_observer_name(observer));
  comment(csv, &t);
  text_format(&t, "source: %s", ef_observer_about(observer));
  comment(csv, &t);
  text_add(&t, "quantity: colour-matching functions x_bar, y_bar, z_bar (equal "
               "power) and cone fundamentals l_bar, m_bar, s_bar");
  comment(csv, &t);
  text_add(&t, "cones: ");
  add_cones(&t, b, 0);
  comment(csv, &t);
  ef_number_format(ef_observer_k_m(observer), k_m);
  text_format(&t, "K_m: %s lm/W", k_m);
  comment(csv, &t);
}

static void head_of_many(const build *b, ef_csv *csv) {
  text t = {0};
  text_format(&t, "title: %zu observers who stand for ", b->n);
  people_add(&t, &b->people);
  comment(csv, &t);
  text_add(&t, "source: medoids of the cone fundamentals of individual "
               "observers after Asano, Fairchild & Blonde (2016)");
  comment(csv, &t);
  text_add(&t, "quantity: colour-matching functions x_bar_N, y_bar_N, z_bar_N "
               "(equal power) and cone fundamentals l_bar_N, m_bar_N, s_bar_N");
  comment(csv, &t);
  text_add(&t, "cones: ");
  add_cones(&t, b, 0);
  comment(csv, &t);
  for (size_t k = 0; k < b->n; ++k) {
    char share[EF_NUMBER_TEXT];
    ef_number_format(b->one[k].share, share);
    text_format(&t, "observer %zu: share %s, --observer %s", k + 1, share,
                ef_observer_name(b->one[k].observer));
    comment(csv, &t);
  }
}

static ef_status write_csv(const build *b, ef_output *output, ef_error *error) {
  ef_csv *csv = ef_csv_new(output, error);
  if (csv == NULL)
    return error->status;
  if (b->options->categories > 0)
    head_of_many(b, csv);
  else
    head_of_one(b, csv);
  ef_csv_text(csv, "wavelength_nm");
  for (size_t c = 0; c < b->n * BUILD_FUNCTIONS; ++c) {
    char name[32];
    column_name(b, c / BUILD_FUNCTIONS, c % BUILD_FUNCTIONS, name);
    ef_csv_text(csv, name);
  }
  ef_csv_end_row(csv);
  for (size_t i = b->first; i <= b->last; ++i) {
    ef_csv_number(csv, ef_grid_wavelength(&b->grid, i));
    for (size_t c = 0; c < b->n * BUILD_FUNCTIONS; ++c) {
      ef_csv_number(csv,
                    value_at(b, c / BUILD_FUNCTIONS, c % BUILD_FUNCTIONS, i));
    }
    ef_csv_end_row(csv);
  }
  return ef_csv_finish(csv, error);
}

/* ---- JSON -------------------------------------------------------------- */

static void write_three(ef_json *j, const char *key, const double value[3]) {
  static const char *const names[3] = {"l", "m", "s"};
  ef_json_begin_object(j, key);
  for (size_t i = 0; i < 3; ++i)
    ef_json_number(j, names[i], value[i]);
  ef_json_end_object(j);
}

static ef_status write_model(ef_json *j, const built_observer *one,
                             ef_error *error) {
  const ef_cone_model *m = &one->model;
  densities d;
  if (!one->has_model)
    return EF_OK;
  const ef_status status = find_densities(one, &d, error);
  if (status != EF_OK)
    return status;
  ef_json_number(j, "age_years", m->age_years);
  ef_json_text(j, "deficiency", ef_deficiency_name(m->deficiency));
  ef_json_number(j, "lens_percent", m->lens_percent);
  ef_json_number(j, "macular_percent", m->macular_percent);
  write_three(j, "density_percent", m->density_percent);
  write_three(j, "shift_nm", m->shift_nm);
  write_three(j, "peak_density", d.pigment);
  ef_json_number(j, "lens_density_400_nm", d.lens_400);
  ef_json_number(j, "macular_density_460_nm", d.macular_460);
  return EF_OK;
}

static ef_status write_observer(const build *b, size_t k, ef_json *j,
                                ef_error *error) {
  const built_observer *one = &b->one[k];
  ef_json_begin_object(j, NULL);
  ef_json_text(j, "name", ef_observer_name(one->observer));
  ef_json_text(j, "about", ef_observer_about(one->observer));
  if (!isnan(one->share))
    ef_json_number(j, "share", one->share);
  ef_json_number(j, "field_deg", ef_observer_field_deg(one->observer));
  ef_json_number(j, "k_m", ef_observer_k_m(one->observer));
  ef_json_boolean(j, "cones_borrowed",
                  ef_observer_cones_borrowed(one->observer));
  const ef_status status = write_model(j, one, error);
  for (size_t f = 0; f < BUILD_FUNCTIONS; ++f) {
    ef_json_begin_array(j, build_function_name(f));
    for (size_t i = b->first; i <= b->last; ++i)
      ef_json_number(j, NULL, value_at(b, k, f, i));
    ef_json_end_array(j);
  }
  ef_json_end_object(j);
  return status;
}

static ef_status write_json(const build *b, ef_output *output,
                            ef_error *error) {
  ef_json *j = ef_json_new(output, error);
  if (j == NULL)
    return error->status;
  ef_status status = EF_OK;
  ef_json_begin_object(j, NULL);
  ef_json_text(j, "cone_units", units_text(b));
  if (b->people.population != NULL) {
    ef_json_begin_object(j, "population");
    people_write(j, &b->people);
    ef_json_end_object(j);
  }
  ef_json_begin_array(j, "wavelength_nm");
  for (size_t i = b->first; i <= b->last; ++i)
    ef_json_number(j, NULL, ef_grid_wavelength(&b->grid, i));
  ef_json_end_array(j);
  ef_json_begin_array(j, "observers");
  for (size_t k = 0; k < b->n && status == EF_OK; ++k)
    status = write_observer(b, k, j, error);
  ef_json_end_array(j);
  ef_json_end_object(j);
  ef_error late;
  const ef_status finished = ef_json_finish(j, status == EF_OK ? error : &late);
  return status != EF_OK ? status : finished;
}

/* ---- Text -------------------------------------------------------------- */

/* Wavelength of the largest sample. */
static double peak_nm(const build *b, size_t function) {
  size_t top = b->first;
  for (size_t i = b->first; i <= b->last; ++i) {
    if (value_at(b, 0, function, i) > value_at(b, 0, function, top))
      top = i;
  }
  return ef_grid_wavelength(&b->grid, top);
}

static ef_status add_eye(text *out, const built_observer *one,
                         ef_error *error) {
  densities d;
  const ef_status status = find_densities(one, &d, error);
  if (status != EF_OK)
    return status;
  const double value[5] = {d.pigment[0], d.pigment[1], d.pigment[2], d.lens_400,
                           d.macular_460};
  char number[5][EF_NUMBER_TEXT];
  for (size_t i = 0; i < 5; ++i)
    ef_number_format_fixed(value[i], 3, number[i]);
  text t = {0};
  text_format(&t, "pigments L %s, M %s", number[0], number[1]);
  if (one->model.deficiency != EF_TRITANOPE)
    text_format(&t, ", S %s", number[2]);
  text_format(&t,
              " at their peaks; ocular media %s at 400 nm; macular pigment %s "
              "at 460 nm",
              number[3], number[4]);
  text_label(out, "Densities", &t);
  return EF_OK;
}

static void add_functions(text *out, const build *b) {
  static const char *const heads[BUILD_FUNCTIONS] = {"x", "y", "z",
                                                     "l", "m", "s"};
  text_table t = table_new();
  table_column(&t, "nm", "", false);
  for (size_t f = 0; f < BUILD_FUNCTIONS; ++f) {
    table_column(&t,
                 f == 0   ? "Colour matching"
                 : f == 3 ? "Cone fundamentals"
                          : NULL,
                 heads[f], false);
  }
  for (size_t i = b->first; i <= b->last; ++i) {
    const double nm = ef_grid_wavelength(&b->grid, i);
    if (fmod(nm, TEXT_STEP_NM) != 0.0)
      continue;
    table_number(&t, nm, 0);
    for (size_t f = 0; f < BUILD_FUNCTIONS; ++f)
      table_number(&t, value_at(b, 0, f, i), 5);
  }
  text_add(out, "\n");
  table_finish(&t, out);
}

static ef_status text_of_one(const build *b, text *out, ef_error *error) {
  const built_observer *one = &b->one[0];
  char k_m[EF_NUMBER_TEXT], peak[3][EF_NUMBER_TEXT];
  text t = {0};
  text_format(&t, "%s: %s.", ef_observer_name(one->observer),
              ef_observer_about(one->observer));
  text_wrap(out, t.bytes != NULL ? t.bytes : "", 0);
  text_free(&t);
  text_add(out, "\n");
  add_cones(&t, b, 0);
  text_label(out, "Cones", &t);
  for (size_t c = 0; c < 3; ++c)
    ef_number_format(peak_nm(b, 3 + c), peak[c]);
  text_format(&t, "L at %s nm, M at %s nm", peak[0], peak[1]);
  if (one->model.deficiency != EF_TRITANOPE)
    text_format(&t, ", S at %s nm", peak[2]);
  text_label(out, "Peaks", &t);
  ef_number_format(ef_observer_k_m(one->observer), k_m);
  text_format(&t, "%s lm/W", k_m);
  text_label(out, "K_m", &t);
  const ef_status status = one->has_model ? add_eye(out, one, error) : EF_OK;
  add_functions(out, b);
  text_format(out, "\nEvery nm with all digits: --format csv.\n");
  return status;
}

static void start_people(text_table *t) {
  static const char *const cones[3] = {"L", "M", "S"};
  table_column(t, "Observer", "", false);
  table_column(t, "Share", "%", false);
  table_column(t, "Age", "years", false);
  table_column(t, "Lens", "%", false);
  table_column(t, "Macular", "%", false);
  for (size_t c = 0; c < 3; ++c)
    table_column(t, c == 0 ? "Density, %" : NULL, cones[c], false);
  for (size_t c = 0; c < 3; ++c)
    table_column(t, c == 0 ? "Shift, nm" : NULL, cones[c], false);
}

static void text_of_many(const build *b, text *out) {
  text t = {0};
  text_format(&t, "%zu %s for ", b->n,
              b->n == 1 ? "observer stands" : "observers stand");
  people_add(&t, &b->people);
  text_add(&t, ".");
  text_wrap(out, t.bytes != NULL ? t.bytes : "", 0);
  text_free(&t);
  text_add(out, "\n");
  text_table table = table_new();
  start_people(&table);
  for (size_t k = 0; k < b->n; ++k) {
    const ef_cone_model *m = &b->one[k].model;
    table_format(&table, "%zu", k + 1);
    table_number(&table, 100.0 * b->one[k].share, 1);
    table_number(&table, m->age_years, 1);
    table_number(&table, m->lens_percent, 0);
    table_number(&table, m->macular_percent, 0);
    for (size_t c = 0; c < 3; ++c)
      table_number(&table, m->density_percent[c], 0);
    for (size_t c = 0; c < 3; ++c)
      table_number(&table, m->shift_nm[c], 1);
  }
  table_finish(&table, out);
  text_add(out, "\n");
  text_wrap(out,
            "Share: of the people who are nearer to this observer than to the "
            "others. Lens, macular pigment and pigment densities are more or "
            "less than the mean of that age, shifts are towards longer "
            "wavelengths. Chosen as medoids of the cone fundamentals at 10 nm; "
            "individual eyes vary as in Asano, Fairchild & Blonde (2016). "
            "--format csv gives their functions, and the name of each for "
            "--observer.",
            0);
}

static ef_status write_text(const build *b, ef_output *output,
                            ef_error *error) {
  text out = {0};
  ef_status status = EF_OK;
  if (b->options->categories > 0)
    text_of_many(b, &out);
  else
    status = text_of_one(b, &out, error);
  if (status == EF_OK)
    status = text_write(&out, output, error);
  text_free(&out);
  return status;
}

ef_status render_build(const build *b, int format, ef_output *output,
                       ef_error *error) {
  switch (format) {
  case FORMAT_TEXT:
    return write_text(b, output, error);
  case FORMAT_JSON:
    return write_json(b, output, error);
  default:
    return write_csv(b, output, error);
  }
}

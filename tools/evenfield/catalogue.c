/* SPDX-License-Identifier: GPL-3.0-or-later */
/* The lists of what is built in. */
#include "render_tables.h"

#include <stdio.h>
#include <string.h>

#include <evenfield/colour.h>
#include <evenfield/device.h>
#include <evenfield/difference.h>

static ef_status fill_tables(listing *l, ef_error *error) {
  (void)error;
  listing_text_column(l, "group", "Group", "");
  listing_text_column(l, "name", "Name", "");
  listing_number_column(l, "columns", "Spectra", "", 0);
  listing_number_column(l, "from_nm", "From", "nm", 0);
  listing_number_column(l, "to_nm", "To", "nm", 0);
  listing_number_column(l, "rows", "Rows", "", 0);
  listing_text_column(l, "title", "What it is", "");
  listing_text_column(l, "source", NULL, NULL);
  listing_text_column(l, "rights", NULL, NULL);
  for (size_t i = 0; i < ef_table_count(); ++i) {
    const ef_table *t = ef_table_at(i);
    listing_text(l, t->group);
    listing_text(l, t->name);
    listing_number(l, (double)(t->n_columns - 1));
    listing_number(l, t->value[0]);
    listing_number(l, t->value[t->n_rows - 1]);
    listing_number(l, (double)t->n_rows);
    listing_text(l, t->title);
    listing_text(l, t->source);
    listing_text(l, t->rights);
  }
  return EF_OK;
}

/* A name of the cone model as --observer takes it. */
typedef struct model_row {
  const char *name, *about;
} model_row;

static const model_row models[] = {
    {"model:age=45,field=4", "Mean observer of any age (20 to 80 years) and "
                             "field (1 to 10 degrees), by "
                             "the cone model of CIE 170-1:2006"},
    {"protanope", "The same with M pigment in the L cones"},
    {"deuteranope", "The same with L pigment in the M cones"},
    {"tritanope", "The same without S cones"},
    {"protanomalous:shift=12",
     "The same with the L pigment shifted towards M, by up to 32 nm"},
    {"deuteranomalous:shift=12",
     "The same with the M pigment shifted towards L, by up to 32 nm"},
};

static ef_status add_models(listing *l, ef_error *error) {
  for (size_t i = 0; i < sizeof models / sizeof models[0]; ++i) {
    ef_observer *observer = ef_observer_new(models[i].name, error);
    if (observer == NULL)
      return error->status;
    listing_text(l, models[i].name);
    listing_number(l, ef_observer_field_deg(observer));
    listing_number(l, ef_observer_k_m(observer));
    listing_text(l, models[i].about);
    ef_observer_free(observer);
  }
  return EF_OK;
}

static ef_status fill_observers(listing *l, ef_error *error) {
  listing_text_column(l, "name", "Name", "");
  listing_number_column(l, "field_deg", "Cone field", "deg", 0);
  listing_number_column(l, "k_m", "K_m", "lm/W", 3);
  listing_text_column(l, "about", "What it is", "");
  const char *const *names;
  const size_t n = ef_observer_names(&names);
  for (size_t i = 0; i < n; ++i) {
    ef_observer *observer = ef_observer_new(names[i], error);
    if (observer == NULL)
      return error->status;
    listing_text(l, names[i]);
    listing_number(l, ef_observer_field_deg(observer));
    listing_number(l, ef_observer_k_m(observer));
    listing_text(l, ef_observer_about(observer));
    ef_observer_free(observer);
  }
  return add_models(l, error);
}

static ef_status add_illuminant(listing *l, const ef_observer *observer,
                                const char *name, ef_error *error) {
  ef_illuminant *light = ef_illuminant_new(name, error);
  if (light == NULL)
    return error->status;
  const ef_grid working = ef_grid_standard();
  double white[3];
  const ef_status status = ef_observer_white(observer, EF_TRISTIMULUS, light,
                                             &working, white, error);
  ef_illuminant_free(light);
  if (status != EF_OK)
    return status;
  const ef_xyy c = ef_xyz_to_xyy((ef_xyz){white[0], white[1], white[2]});
  const ef_cct cct = ef_xy_to_cct((ef_xy){c.x, c.y});
  listing_text(l, name);
  listing_number(l, c.x);
  listing_number(l, c.y);
  listing_number(l, cct.cct_k);
  listing_number(l, cct.duv);
  return EF_OK;
}

static ef_status fill_illuminants(listing *l, ef_error *error) {
  listing_text_column(l, "name", "Name", "");
  listing_number_column(l, "x", "CIE 1931", "x", 5);
  listing_number_column(l, "y", NULL, "y", 5);
  listing_number_column(l, "cct_k", "CCT", "K", 0);
  listing_number_column(l, "duv", "Duv", "", 4);
  ef_observer *observer = ef_observer_new("cie-1931", error);
  if (observer == NULL)
    return error->status;
  const char *const *names;
  const size_t n = ef_illuminant_names(&names);
  ef_status status = EF_OK;
  for (size_t i = 0; i < n && status == EF_OK; ++i) {
    status = add_illuminant(l, observer, names[i], error);
  }
  ef_observer_free(observer);
  return status;
}

/* Their names, which stand behind the metric's after a colon. */
static void add_parameters(listing *l, const ef_metric *metric) {
  char names[200] = "";
  size_t length = 0;
  const size_t n = ef_metric_parameter_count(metric);
  for (size_t i = 0; i < n && length < sizeof names; ++i) {
    length += (size_t)snprintf(names + length, sizeof names - length, "%s%s",
                               i == 0 ? "" : ",",
                               ef_metric_parameter_at(metric, i).name);
  }
  listing_text(l, names);
}

static ef_status fill_metrics(listing *l, ef_error *error) {
  (void)error;
  listing_text_column(l, "name", "Name", "");
  listing_text_column(l, "symbol", "Unit", "");
  listing_number_column(l, "jnd", "JND", "in units", 2);
  listing_text_column(l, "jnd_criterion", "Criterion of the JND", "");
  listing_text_column(l, "parameters", "Parameters", "");
  listing_text_column(l, "title", "What it is", "");
  listing_text_column(l, "source", NULL, NULL);
  listing_text_column(l, "jnd_source", NULL, NULL);
  for (size_t i = 0; i < ef_metric_count(); ++i) {
    const ef_metric *metric = ef_metric_at(i);
    const ef_jnd jnd = ef_metric_jnd(metric);
    listing_text(l, ef_metric_name(metric));
    listing_text(l, ef_metric_symbol(metric));
    listing_number(l, jnd.value);
    listing_text(l, jnd.criterion);
    add_parameters(l, metric);
    listing_text(l, ef_metric_title(metric));
    listing_text(l, ef_metric_source(metric));
    listing_text(l, jnd.source);
  }
  return EF_OK;
}

static void xy_columns(listing *l, const char *x, const char *y,
                       const char *head) {
  listing_number_column(l, x, head, "x", 4);
  listing_number_column(l, y, NULL, "y", 4);
}

static void add_xy(listing *l, ef_xy xy) {
  listing_number(l, xy.x);
  listing_number(l, xy.y);
}

static ef_status fill_encodings(listing *l, ef_error *error) {
  (void)error;
  listing_text_column(l, "name", "Name", "");
  xy_columns(l, "red_x", "red_y", "Red");
  xy_columns(l, "green_x", "green_y", "Green");
  xy_columns(l, "blue_x", "blue_y", "Blue");
  xy_columns(l, "white_x", "white_y", "White");
  listing_text_column(l, "tone", "Tone curve", "");
  listing_text_column(l, "standard", "Standard", "");
  listing_number_column(l, "h273", NULL, NULL, 0);
  for (size_t i = 0; i < ef_encoding_count(); ++i) {
    const ef_encoding *e = ef_encoding_at(i);
    listing_text(l, e->name);
    add_xy(l, e->red);
    add_xy(l, e->green);
    add_xy(l, e->blue);
    add_xy(l, e->white);
    listing_text(l, e->tone);
    listing_text(l, e->standard);
    listing_number(l, e->h273);
  }
  return EF_OK;
}

/* The rest of the line `# title: ...` of a demo file. */
static void title_of(const char *file, size_t length, char title[200]) {
  static const char key[] = "# title: ";
  title[0] = '\0';
  if (length < sizeof key || memcmp(file, key, sizeof key - 1) != 0)
    return;
  const char *start = file + sizeof key - 1;
  const char *end = memchr(start, '\n', length - (sizeof key - 1));
  const size_t n = end != NULL ? (size_t)(end - start) : 0;
  snprintf(title, 200, "%.*s", (int)(n < 199 ? n : 199), start);
}

static ef_status fill_demo(listing *l, ef_error *error) {
  (void)error;
  listing_text_column(l, "name", "Name", "");
  listing_text_column(l, "title", "What it is", "");
  for (size_t i = 0; i < ef_demo_count(); ++i) {
    size_t length;
    const char *file = ef_demo_text(i, &length);
    char name[100], title[200];
    snprintf(name, sizeof name, "demo:%s", ef_demo_name(i));
    title_of(file, length, title);
    listing_text(l, name);
    listing_text(l, title);
  }
  return EF_OK;
}

static const catalogue catalogues[] = {
    {"tables", "tables are built in",
     "`evenfield tables NAME` prints one, with its source and all digits. More "
     "lists: `evenfield tables observers`, illuminants, metrics, encodings, "
     "demo.",
     fill_tables},
    {"observers", "observers are built in",
     "For --observer; or a file with three colour-matching functions. Where an "
     "observer has no cone fundamentals of its own, those of the CIE 2006 "
     "observer with the field named here are used. Those below the tables come "
     "from a model and take settings after a colon, as shown: age (default "
     "32), "
     "field (default 2); in percent more or less than the mean lens, macular, "
     "density-l, density-m, density-s; in nm shift-l, shift-m, shift-s. "
     "`evenfield observer build NAME` writes the functions of any of them.",
     fill_observers},
    {"illuminants", "illuminants are built in",
     "For --illuminant; also daylight:K (4000 to 25000) and planck:K (500 to "
     "100000), a FILE with one light, or FILE:COLUMN.",
     fill_illuminants},
    {"metrics", "difference metrics are built in",
     "For --metric, as they stand or with parameters: ciede2000:kl=2,kc=1.5. A "
     "JND depends on viewing conditions and people; --jnd puts another in its "
     "place, and with parameters there is none without it.",
     fill_metrics},
    {"encodings", "published display encodings are built in",
     "For --display; --tone puts another curve in place of the one named here.",
     fill_encodings},
    {"demo", "files make up the built-in scenario, a small ferry company",
     "They serve wherever a file does; `evenfield tables demo:NAME` prints one "
     "as it stands. All of it is invented.",
     fill_demo},
};

const catalogue *catalogue_find(const char *name) {
  for (size_t i = 0; i < sizeof catalogues / sizeof catalogues[0]; ++i) {
    if (strcmp(catalogues[i].name, name) == 0)
      return &catalogues[i];
  }
  return NULL;
}

size_t catalogue_all(const catalogue **out) {
  *out = catalogues;
  return sizeof catalogues / sizeof catalogues[0];
}

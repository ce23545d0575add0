/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Reading tables: what a file may look like and what is made of it. How it is
 * read is in test_reader.c, broken files in test_broken.c. */
#include <evenfield/exchange.h>

#include "exchange/exchange_private.h"
#include "heard.h"
#include "near.h"

/* ---- Helpers ----------------------------------------------------------- */

static ef_reader *open_with(const char *text, const ef_reader_settings *set) {
  ef_error error = {0};
  ef_reader *const reader =
      ef_reader_from_text("t.csv", text, strlen(text), set, &error);
  if (reader == NULL) fail_msg("%s", error.message);
  return reader;
}

/* Opens a text and hears its notes. */
static ef_reader *open_heard(const char *text, heard *h) {
  const ef_notes notes = heard_notes(h);
  ef_reader_settings settings = ef_reader_settings_default();
  settings.notes = &notes;
  *h = (heard){0};
  ef_reader *const reader = open_with(text, &settings);
  reader->settings.notes = NULL; /* `notes` ends here */
  reader->table.notes = NULL;
  return reader;
}

static ef_block next(ef_reader *reader, size_t max_rows) {
  ef_block block;
  ef_error error = {0};
  if (ef_reader_next(reader, max_rows, &block, &error) != EF_OK) {
    fail_msg("%s", error.message);
  }
  return block;
}

static void refuse(const char *text, const char *part) {
  ef_error error = {0};
  assert_null(ef_reader_from_text("t.csv", text, strlen(text), NULL, &error));
  assert_error(&error, EF_MALFORMED, part);
  assert_string_equal(error.file, "t.csv");
}

/* ---- Spectra ----------------------------------------------------------- */

static void wide_spectra(void **state) {
  (void)state;
  heard h;
  ef_reader *const reader = open_heard("# title: deck paints\n"
                                       "# quantity: reflectance\n"
                                       "name,400,410nm,nm420,nm_430,440 NM\n"
                                       "grey,0.1875,0.25,0.3125,0.375,0.4375\n"
                                       "# a remark\n"
                                       "buff,0.5,0.53,0.59,0.61,0.67\n",
                                       &h);
  const ef_reader_head *const head = ef_reader_get_head(reader);
  assert_string_equal(head->file, "t.csv");
  assert_string_equal(head->title, "deck paints");
  assert_int_equal(head->content, EF_CONTENT_SPECTRA);
  assert_int_equal(head->width, 5);
  assert_int_equal(head->kind, EF_SURFACE);
  assert_true(head->has_names);
  assert_false(head->absolute);
  assert_int_equal(head->n_device, 0);
  assert_null(head->grid.wavelength_nm);
  assert_int_equal(head->grid.count, 5);
  assert_near(head->grid.start_nm, 400, 0);
  assert_near(head->grid.step_nm, 10, 0);
  const ef_block block = next(reader, 10);
  const double expected[] = {0.1875, 0.25, 0.3125, 0.375, 0.4375,
                             0.5,    0.53, 0.59,   0.61,  0.67};
  assert_int_equal(block.n, 2);
  assert_same_bits(block.value, expected, 10);
  assert_string_equal(block.name[0], "grey");
  assert_string_equal(block.name[1], "buff");
  assert_int_equal(block.line[0], 4);
  assert_int_equal(block.line[1], 6);
  assert_null(block.device);
  assert_int_equal(next(reader, 10).n, 0);
  assert_int_equal(next(reader, 10).n, 0);
  assert_int_equal(h.n, 0);
  ef_reader_free(reader);
}

static void long_spectra(void **state) {
  (void)state;
  heard h;
  ef_reader *const reader =
      open_heard("# quantity: spectral radiance of light, W sr^-1 m^-2 nm^-1\n"
                 "Wavelength_nm,red,green\n"
                 "400,0.001,0.5\n401.5,0.002,0.375\n405,0.0035,0.1\n",
                 &h);
  const ef_reader_head *const head = ef_reader_get_head(reader);
  assert_int_equal(head->content, EF_CONTENT_SPECTRA);
  assert_int_equal(head->kind, EF_LIGHT);
  assert_true(head->absolute);
  assert_true(head->has_names);
  const double wavelengths_nm[] = {400, 401.5, 405};
  assert_int_equal(head->grid.count, 3);
  assert_same_bits(head->grid.wavelength_nm, wavelengths_nm, 3);
  const ef_block first = next(reader, 1);
  const double red[] = {0.001, 0.002, 0.0035};
  assert_int_equal(first.n, 1);
  assert_same_bits(first.value, red, 3);
  assert_string_equal(first.name[0], "red");
  assert_int_equal(first.line[0], 2); /* column */
  const ef_block second = next(reader, 9);
  const double green[] = {0.5, 0.375, 0.1};
  assert_int_equal(second.n, 1);
  assert_same_bits(second.value, green, 3);
  assert_string_equal(second.name[0], "green");
  assert_int_equal(second.line[0], 3);
  assert_int_equal(next(reader, 9).n, 0);
  assert_int_equal(h.n, 0);
  ef_reader_free(reader);
}

static void a_single_wavelength_is_a_spectrum(void **state) {
  (void)state;
  ef_reader *const reader =
      open_with("# quantity: light\nwavelength_nm,laser\n546.1,37.23\n", NULL);
  assert_int_equal(ef_reader_get_head(reader)->width, 1);
  assert_near(ef_grid_wavelength(&ef_reader_get_head(reader)->grid, 0), 546.1,
              0);
  assert_near(next(reader, 1).value[0], 37.23, 0);
  ef_reader_free(reader);
}

/* ---- Colours and device values ----------------------------------------- */

static void colour_sets(void **state) {
  (void)state;
  static const struct {
    const char *text;
    ef_content content;
    double value[3];
  } cases[] = {
      {"name,L,a,b\ndeck,52.5,-3.25,17.75\n",
       EF_CONTENT_LAB,
       {52.5, -3.25, 17.75}},
      {"b,name,L,a\n17.75,deck,52.5,-3.25\n",
       EF_CONTENT_LAB,
       {52.5, -3.25, 17.75}},
      {"X,Y,Z,name\n20.25,21.5,8.125,deck\n",
       EF_CONTENT_XYZ,
       {20.25, 21.5, 8.125}},
      {"name,x,y,Y\ndeck,0.3127,0.329,37.25\n",
       EF_CONTENT_XYY,
       {0.3127, 0.329, 37.25}},
      {"name,X,Y,Z\nimaginary,-1.5,21.5,-0.25\n",
       EF_CONTENT_XYZ,
       {-1.5, 21.5, -0.25}},
  };
  for (size_t i = 0; i < sizeof cases / sizeof *cases; ++i) {
    heard h;
    ef_reader *const reader = open_heard(cases[i].text, &h);
    const ef_reader_head *const head = ef_reader_get_head(reader);
    assert_int_equal(head->content, cases[i].content);
    assert_int_equal(head->width, 3);
    assert_int_equal(head->grid.count, 0);
    assert_same_bits(next(reader, 5).value, cases[i].value, 3);
    assert_int_equal(h.n, 0);
    ef_reader_free(reader);
  }
}

static void content_has_a_text(void **state) {
  (void)state;
  assert_string_equal(ef_content_text(EF_CONTENT_SPECTRA), "spectra");
  assert_string_equal(ef_content_text(EF_CONTENT_LAB), "L,a,b");
  assert_string_equal(ef_content_text(EF_CONTENT_XYZ), "X,Y,Z");
  assert_string_equal(ef_content_text(EF_CONTENT_XYY), "x,y,Y");
  assert_string_equal(ef_content_text(EF_CONTENT_DEVICE), "device values");
}

/* Device values of the one row of a text, and the note about their maximum. */
static void check_device(const char *text, double asked, const char *note,
                         const char *first_name, const double expected[3]) {
  heard h = {0};
  const ef_notes notes = heard_notes(&h);
  ef_reader_settings settings = ef_reader_settings_default();
  settings.notes = &notes;
  settings.device_max = asked;
  ef_reader *const reader = open_with(text, &settings);
  const ef_reader_head *const head = ef_reader_get_head(reader);
  assert_int_equal(head->n_device, 3);
  assert_string_equal(head->device_name[0], first_name);
  const ef_block block = next(reader, 5);
  for (int i = 0; i < 3; ++i) assert_near(block.device[i], expected[i], 0);
  assert_string_equal(h.text, note);
  ef_reader_free(reader);
}

static void device_values_run_from_0_to_1(void **state) {
  (void)state;
  const double by_255[] = {0, 51.0 / 255.0, 1};
  const double by_1023[] = {0, 51.0 / 1023.0, 255.0 / 1023.0};
  const double percent[] = {0.1, 0.25, 0.5};
  const double fraction[] = {0, 0.25, 1};
  check_device("# device_max: 255\nR,G,B\n0,51,255\n", 0, "", "red", by_255);
  check_device("# device_max: 255\nR,G,B\n0,51,255\n", 1023, "", "red",
               by_1023);
  check_device("R,G,B,X,Y,Z\n0,51,255,7.5,8.25,9.75\n", 0,
               "t.csv: R,G,B read as 0 to 255: a value of its rows is above "
               "1, and no '# device_max:' line says otherwise\n",
               "red", by_255);
  check_device("C,M,Y,L,a,b\n10,25,50,72.5,8.25,9.75\n", 0,
               "t.csv: C,M,Y read as 0 to 100: a value of its rows is above "
               "1, and no '# device_max:' line says otherwise\n",
               "cyan", percent);
  check_device("red,green,blue,400,410\n0,0.25,1,0.5,0.25\n", 0,
               "t.csv: read as surfaces (ratios): no '# quantity:' line says "
               "what the values are, and those of its rows lie in 0.25 to 0.5; "
               "for lights add '# quantity: light'\n"
               "t.csv: R,G,B read as 0 to 1: no value of its rows is above 1, "
               "and no '# device_max:' line says otherwise\n",
               "red", fraction);
  check_device("# device_max: 100,0,,,,\n"
               "cyan,magenta,yellow,X,Y,Z\n10,25,50,20.5,21.5,8.5\n",
               100, "", "cyan", percent);
  check_device("# device_max: 100\nCyan,MAGENTA,yellow,X,Y,Z\n"
               "10,25,50,20.5,21.5,8.5\n",
               100, "", "cyan", percent);
}

static void device_values_alone(void **state) {
  (void)state;
  ef_reader *const reader =
      open_with("# device_max: 255\nname,R,G,B\nmast,51,0,255\n", NULL);
  assert_int_equal(ef_reader_get_head(reader)->content, EF_CONTENT_DEVICE);
  assert_int_equal(ef_reader_get_head(reader)->width, 0);
  const ef_block block = next(reader, 5);
  assert_int_equal(block.n, 1);
  assert_string_equal(block.name[0], "mast");
  assert_near(block.device[0], 0.2, 0);
  ef_reader_free(reader);
}

static void unused_columns_are_noted(void **state) {
  (void)state;
  heard h;
  ef_reader *const reader =
      open_heard("no,L,a,b,X,Y,Z,x,y,checked by\n"
                 "7,52.5,-3.25,17.75,20.25,21.5,8.125,0.4,0.4,nobody\n",
                 &h);
  assert_int_equal(ef_reader_get_head(reader)->content, EF_CONTENT_XYZ);
  assert_false(ef_reader_get_head(reader)->has_names);
  const ef_block block = next(reader, 5);
  assert_near(block.value[0], 20.25, 0);
  assert_string_equal(block.name[0], "row 1");
  assert_string_equal(h.text,
                      "t.csv:1: X,Y,Z taken; 7 columns are not used: 'no', "
                      "'L', 'a', 'b', 'x', 'y', 'checked by'\n");
  ef_reader_free(reader);
}

static void many_unused_columns_are_cut_short(void **state) {
  (void)state;
  char text[2048] = "L,a,b";
  heard h;
  size_t used = strlen(text);
  for (int i = 0; i < 20; ++i) {
    used += (size_t)sprintf(text + used, ",a remark that is long%c", 'A' + i);
  }
  strcat(text, "\n1,2,3");
  for (int i = 0; i < 20; ++i) strcat(text, ",x");
  ef_reader *const reader = open_heard(text, &h);
  assert_string_equal(
      h.text, "t.csv:1: L,a,b taken; 20 columns are not used: "
              "'a remark that is longA', 'a remark that is longB', "
              "'a remark that is longC', 'a remark that is longD', "
              "'a remark that is longE', 'a remark that is longF', "
              "'a remark that is longG', ...\n");
  ef_reader_free(reader);
}

static void found_text_is_cut_between_characters(void **state) {
  (void)state;
  char text[256] = "L,a,b\n1,2,";
  for (int i = 0; i < 57; ++i) strcat(text, "x");
  strcat(text, "\xE2\x82\xAC\xE2\x82\xAC\n");
  char expected[128] = "found '";
  for (int i = 0; i < 57; ++i) strcat(expected, "x");
  strcat(expected, "...', expected");
  refuse(text, expected);
}

static void spectra_come_before_colours(void **state) {
  (void)state;
  heard h;
  ef_reader *const reader =
      open_heard("# quantity: reflectance\nname,L,400,410,a,b\n"
                 "deck,52.5,0.25,0.375,-3.25,17.75\n",
                 &h);
  assert_int_equal(ef_reader_get_head(reader)->content, EF_CONTENT_SPECTRA);
  assert_near(next(reader, 5).value[1], 0.375, 0);
  assert_string_equal(h.text, "t.csv:2: spectra taken; 3 columns are not used: "
                              "'L', 'a', 'b'\n");
  ef_reader_free(reader);
}

/* ---- Dialects ---------------------------------------------------------- */

static void dialects_mean_the_same(void **state) {
  (void)state;
  static const char *const texts[] = {
      "name,L,a,b\ndeck grey,52.5,-3.25,17.75\nrail,49,0.5,1e1\n",
      "name,L,a,b\r\ndeck grey,52.5,-3.25,17.75\r\nrail,49,0.5,1E+1",
      "\xEF\xBB\xBFname,L,a,b\ndeck grey,52.5,-3.25,17.75\nrail,49,0.5,10\n",
      "\xEF\xBB\xBF# title: x\r\nname;L;a;b\r\ndeck grey;52,5;-3,25;17,75\r\n"
      "rail;49;0,5;10\r\n",
      "name;L;a;b\ndeck grey;52.5;-3.25;17.75\nrail;49;.5;10.\n",
      "name\tL\ta\tb\ndeck grey\t52,5\t-3,25\t17,75\nrail\t49\t,5\t10\n",
      "name\tL\ta\tb\ndeck grey\t52.5\t-3.25\t17.75\nrail\t49\t0.5\t10\n",
      "\n \n# one\n\"name\",\"L\",\"a\",\"b\"\n\n"
      "\"deck grey\",\"52.5\",\"-3.25\",\"17.75\"\n  # two, \"three\n"
      "rail,49,0.5,10\n,,,\n, ,,\n",
      " name , L , a , b \n  deck grey ,\t52.5 , -3.25, 17.75\t\n"
      " \"rail\" , \"49\" ,0.5,+10\n",
      "name;L;a;b;\"c;d\"\ndeck grey;52.5;-3.25;17.75;\";\"\nrail;49;0.5;10;\n",
  };
  const double expected[] = {52.5, -3.25, 17.75, 49, 0.5, 10};
  for (size_t i = 0; i < sizeof texts / sizeof *texts; ++i) {
    ef_reader *const reader = open_with(texts[i], NULL);
    const ef_block block = next(reader, 5);
    assert_int_equal(block.n, 2);
    assert_same_bits(block.value, expected, 6);
    assert_string_equal(block.name[0], "deck grey");
    assert_string_equal(block.name[1], "rail");
    ef_reader_free(reader);
  }
}

static void decimal_commas_are_noted(void **state) {
  (void)state;
  heard h;
  ef_reader *const reader =
      open_heard("# quantity: reflectance\nname;380,5;381\ndeck;0;0,25\n", &h);
  assert_near(ef_reader_get_head(reader)->grid.start_nm, 380.5, 0);
  assert_near(next(reader, 5).value[1], 0.25, 0);
  assert_string_equal(h.text,
                      "t.csv: numbers are read with a decimal comma\n");
  ef_reader_free(reader);
}

static void quoted_fields_hold_anything(void **state) {
  (void)state;
  ef_reader *const reader = open_with("\"name\",L,a,b\n"
                                      "\"mast, \"\"old\"\"\n lamp\",1,2,3\n"
                                      "5\" pipe,4,5,6\n"
                                      "\"#7\",7,8,9\n"
                                      "\"\"\"\",10,11,12\n"
                                      "\"\",13,14,15\n",
                                      NULL);
  const ef_block block = next(reader, 9);
  assert_int_equal(block.n, 5);
  assert_string_equal(block.name[0], "mast, \"old\"\n lamp");
  assert_int_equal(block.line[0], 2);
  assert_string_equal(block.name[1], "5\" pipe");
  assert_int_equal(block.line[1], 4);
  assert_string_equal(block.name[2], "#7");
  assert_string_equal(block.name[3], "\"");
  assert_string_equal(block.name[4], "row 5");
  assert_near(block.value[9], 10, 0);
  ef_reader_free(reader);
}

/* ---- Remarks and rules ------------------------------------------------- */

static void quantities_say_the_kind(void **state) {
  (void)state;
  static const struct {
    const char *text;
    int kind;
  } cases[] = {
      {"reflectance", 1},
      {"Radiance Factor, D65 light", 1},
      {"spectral transmittance", 1},
      {"spectral radiance", -1},
      {"relative spectral power of light", -1},
      {"Irradiance at the deck", -1},
      {"lightness of samples", 0},
      {"absorption and scattering", 0},
      {"powers of ten", 0},
      {"", 0},
  };
  for (size_t i = 0; i < sizeof cases / sizeof *cases; ++i) {
    assert_int_equal(ef__quantity_kind(cases[i].text), cases[i].kind);
  }
}

static void units_in_their_spellings(void **state) {
  (void)state;
  static const char *const radiance[] = {
      "W sr^-1 m^-2 nm^-1",
      "W sr-1 m-2 nm-1",
      "W\xC2\xB7m\xE2\x81\xBB\xC2\xB2 sr\xE2\x88\x92\xC2\xB9 nm-\xC2\xB9",
      "W/(m2 sr nm)",
      "W/(sr m^2 nm)",
      "W/sr/m\xC2\xB2/nm",
      "radiance in W m-2 sr-1 nm-1, dark room"};
  static const char *const other[] = {
      "",          "mW sr^-1 m^-2 nm^-1", "\xC2\xB5W sr^-1 m^-2 nm^-1",
      "W m-2 nm-1", "cd/m2",               "counts"};
  for (size_t i = 0; i < sizeof radiance / sizeof *radiance; ++i) {
    assert_true(ef__unit_is_radiance(radiance[i]));
    assert_false(ef__unit_is_luminance(radiance[i]));
  }
  for (size_t i = 0; i < sizeof other / sizeof *other; ++i) {
    assert_false(ef__unit_is_radiance(other[i]));
  }
  assert_true(ef__unit_is_luminance("X, Y, Z of light, cd/m2"));
  assert_true(ef__unit_is_luminance("cd m^-2"));
  assert_true(ef__unit_is_luminance("cd/m\xC2\xB2"));
  assert_false(ef__unit_is_luminance("kcd/m2"));
  assert_false(ef__unit_is_luminance("cd"));
}

static void absolute_colours(void **state) {
  (void)state;
  ef_reader *reader = open_with("# unit: cd/m2\nX,Y,Z\n20.5,21.5,8.5\n", NULL);
  assert_true(ef_reader_get_head(reader)->absolute);
  ef_reader_free(reader);
  reader = open_with("X,Y,Z\n20.5,21.5,8.5\n", NULL);
  assert_false(ef_reader_get_head(reader)->absolute);
  ef_reader_free(reader);
}

/* Kind and notes of two samples of a text. */
static void check_kind(const char *text, ef_kind_choice asked, ef_kind kind,
                       const char *said) {
  heard h = {0};
  const ef_notes notes = heard_notes(&h);
  ef_reader_settings settings = ef_reader_settings_default();
  settings.notes = &notes;
  settings.kind = asked;
  ef_reader *const reader = open_with(text, &settings);
  assert_int_equal(ef_reader_get_head(reader)->kind, kind);
  assert_string_equal(h.text, said);
  ef_reader_free(reader);
}

static double first_value(const char *text, ef_kind_choice asked, size_t i,
                          ef_status expected, ef_error *error) {
  ef_reader_settings settings = ef_reader_settings_default();
  settings.kind = asked;
  ef_reader *const reader =
      ef_reader_from_text("t.csv", text, strlen(text), &settings, error);
  ef_block block = {0};
  ef_status status = error->status;
  if (reader != NULL) status = ef_reader_next(reader, 1, &block, error);
  assert_int_equal(status, expected);
  const double value = status == EF_OK ? block.value[i] : 0;
  ef_reader_free(reader);
  return value;
}

/* An instrument's noise below zero is kept, by row or by file. */
static void lights_may_be_noisy(void **state) {
  (void)state;
  ef_error error;
  const double kept = first_value("name,400,410,420\na,37.25,-0.037,1\n",
                                  EF_KIND_LIGHT, 1, EF_OK, &error);
  assert_true(kept == -0.037);
  first_value("name,400,410,420\na,37.25,-0.038,1\n", EF_KIND_LIGHT, 1,
              EF_MALFORMED, &error);
  assert_string_equal(error.message,
                      "found -0.038 for a light, expected zero or more, noise "
                      "of 0.1 % of the largest value apart; check the dark "
                      "reading");
  const char *const by_file =
      "wavelength_nm,black,white\n400,-0.002,3\n410,0.25,2.75\n";
  assert_true(first_value(by_file, EF_KIND_LIGHT, 0, EF_OK, &error) == -0.002);
  const char *const too_low =
      "wavelength_nm,black,white\n400,-0.0031,3\n410,0.25,2.75\n";
  first_value(too_low, EF_KIND_LIGHT, 0, EF_MALFORMED, &error);
  assert_int_equal(error.line, 2);
  assert_string_equal(error.field, "black");
}

static void functions_have_any_sign(void **state) {
  (void)state;
  ef_error error;
  const char *const text =
      "wavelength_nm,r,g,b\n400,-0.5,250,3\n410,0.25,-2.75,1\n";
  assert_true(first_value(text, EF_KIND_FUNCTION, 0, EF_OK, &error) == -0.5);
  first_value(text, EF_KIND_LIGHT, 0, EF_MALFORMED, &error);
}

static void kind_rule(void **state) {
  (void)state;
  check_kind(
      "name,400,410\nd,0.5,2\nr,-0.02,0\n", EF_KIND_AUTO, EF_SURFACE,
      "t.csv: read as surfaces (ratios): no '# quantity:' line says what "
      "the values are, and those of its rows lie in -0.02 to 2; for "
      "lights add '# quantity: light'\n");
  check_kind(
      "wavelength_nm,d\n400,37.25\n410,1.5\n", EF_KIND_AUTO, EF_LIGHT,
      "t.csv: read as lights: no '# quantity:' line says what the values "
      "are, and those of its rows lie in 1.5 to 37.25; for reflectances in "
      "percent add '# quantity: reflectance' and '# unit: percent'\n");
  check_kind("name,400,410\nd,0.5,0.25\n", EF_KIND_LIGHT, EF_LIGHT, "");
  check_kind("# quantity: light\nname,400,410\nd,0.5,0.25\n", EF_KIND_SURFACE,
             EF_SURFACE,
             "t.csv: read as surfaces as asked, though the file says light\n");
  check_kind("# quantity: reflectance\n# Quantity: light\nname,400,410\n"
             "d,0.5,0.25\n",
             EF_KIND_AUTO, EF_SURFACE,
             "t.csv:2: a second '# quantity:' line is not used\n");
  check_kind("# unit: W/(m2 sr nm)\nname,400,410\nd,0.5,0.25\n", EF_KIND_AUTO,
             EF_LIGHT, "");
  check_kind("# quantity: power\n# unit: counts\nname,400,410\nd,0.5,0.25\n",
             EF_KIND_AUTO, EF_LIGHT,
             "t.csv: values are relative: the unit 'counts' is not W sr^-1 "
             "m^-2 nm^-1\n");
}

/* Where the file says so: wide, long, with a decimal comma. */
static void percent_becomes_ratios(void **state) {
  (void)state;
  static const char *const texts[] = {
      "# quantity: reflectance\n# unit: percent\nname,400,410\nd,23.1,0.75\n",
      "# unit: reflectance in percent\nname,400,410\nd,23.1,0.75\n",
      "# quantity: radiance factor\n# unit: %\nname;400;410\nd;23,1;0,75\n",
      "# quantity: reflectance\n# unit: %\nwavelength_nm,d\n400,23.1\n410,0.75\n"};
  for (size_t i = 0; i < sizeof texts / sizeof *texts; ++i) {
    ef_reader *const reader = open_with(texts[i], NULL);
    assert_int_equal(ef_reader_get_head(reader)->kind, EF_SURFACE);
    const ef_block block = next(reader, 5);
    assert_int_equal(block.n, 1);
    assert_near(block.value[0], 0.231, 0);
    assert_near(block.value[1], 0.0075, 0);
    ef_reader_free(reader);
  }
  /* Not of lights, and not of colours; a quantity may speak of other columns. */
  ef_reader *reader = open_with(
      "# quantity: light\n# unit: %\nname,400,410\nd,23.1,100\n", NULL);
  assert_near(next(reader, 5).value[1], 100, 0);
  ef_reader_free(reader);
  reader = open_with("# quantity: inks in percent and reflectance\n"
                     "# device_max: 100\nC,M,Y,400,410\n10,0,0,0.75,1\n",
                     NULL);
  assert_near(next(reader, 5).value[0], 0.75, 0);
  ef_reader_free(reader);
  reader = open_with("# unit: percent\nname,X,Y,Z\nd,23.1,25,20\n", NULL);
  assert_near(next(reader, 5).value[1], 25, 0);
  ef_reader_free(reader);
}

/* What instruments write for a name and for CIELAB. */
static void other_words_for_columns(void **state) {
  (void)state;
  static const char *const texts[] = {
      "Sample,L*,a*,b*\nrun 1,52.5,-8.25,-20.5\n",
      "ID;L;a;b\nrun 1;52,5;-8,25;-20,5\n",
      "sample name,L*,a*,b*\nrun 1,52.5,-8.25,-20.5\n",
      "name,id,L,a,b\nrun 1,77,52.5,-8.25,-20.5\n"};
  for (size_t i = 0; i < sizeof texts / sizeof *texts; ++i) {
    ef_reader *const reader = open_with(texts[i], NULL);
    assert_int_equal(ef_reader_get_head(reader)->content, EF_CONTENT_LAB);
    assert_true(ef_reader_get_head(reader)->has_names);
    const ef_block block = next(reader, 5);
    assert_string_equal(block.name[0], "run 1");
    assert_near(block.value[0], 52.5, 0);
    assert_near(block.value[2], -20.5, 0);
    ef_reader_free(reader);
  }
}

/* Nothing is assumed about colours: of lights where somebody says so. */
static void kind_of_colours(void **state) {
  (void)state;
  const char *const said = "# quantity: x, y and Y of light\n"
                           "# unit: percent\nx,y,Y\n0.25,0.5,20.5\n";
  const char *const unsaid = "X,Y,Z\n20.5,21.5,8.5\n";
  check_kind(said, EF_KIND_AUTO, EF_LIGHT, "");
  check_kind(said, EF_KIND_SURFACE, EF_SURFACE, "");
  check_kind(unsaid, EF_KIND_AUTO, EF_SURFACE, "");
  check_kind(unsaid, EF_KIND_LIGHT, EF_LIGHT, "");
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(wide_spectra),
      cmocka_unit_test(long_spectra),
      cmocka_unit_test(a_single_wavelength_is_a_spectrum),
      cmocka_unit_test(colour_sets),
      cmocka_unit_test(content_has_a_text),
      cmocka_unit_test(device_values_run_from_0_to_1),
      cmocka_unit_test(device_values_alone),
      cmocka_unit_test(unused_columns_are_noted),
      cmocka_unit_test(many_unused_columns_are_cut_short),
      cmocka_unit_test(found_text_is_cut_between_characters),
      cmocka_unit_test(spectra_come_before_colours),
      cmocka_unit_test(dialects_mean_the_same),
      cmocka_unit_test(decimal_commas_are_noted),
      cmocka_unit_test(quoted_fields_hold_anything),
      cmocka_unit_test(quantities_say_the_kind),
      cmocka_unit_test(units_in_their_spellings),
      cmocka_unit_test(absolute_colours),
      cmocka_unit_test(kind_rule),
      cmocka_unit_test(lights_may_be_noisy),
      cmocka_unit_test(functions_have_any_sign),
      cmocka_unit_test(kind_of_colours),
      cmocka_unit_test(percent_becomes_ratios),
      cmocka_unit_test(other_words_for_columns),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, NULL, NULL);
}

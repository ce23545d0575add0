/* SPDX-License-Identifier: GPL-3.0-or-later */
/* How tables are read: faulty rows left out, memory and limits, sources, and
 * what happens when something is missing. */
#include <stdlib.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <unistd.h>

#include <evenfield/exchange.h>

#include "exchange/exchange_private.h"
#include "fail_alloc.h"
#include "gen.h"
#include "heard.h"
#include "near.h"
#include "scratch.h"

/* ---- Helpers ----------------------------------------------------------- */

static ef_reader *open_with(const char *text, const ef_reader_settings *set) {
  ef_error error = {0};
  ef_reader *const reader =
      ef_reader_from_text("t.csv", text, strlen(text), set, &error);
  if (reader == NULL)
    fail_msg("%s", error.message);
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

/* ---- Skipping ---------------------------------------------------------- */

/* 300 rows of which every 20th is at fault: above 2, or text, in turn. */
static char *faulty_text(void) {
  char *const text = malloc(300 * 32);
  assert_non_null(text);
  size_t used = (size_t)sprintf(text, "# quantity: reflectance\n400,410\n");
  for (int i = 1; i <= 300; ++i) {
    const char *const value = i % 20 != 0   ? "0.625"
                              : i % 40 != 0 ? "62.5"
                                            : "high";
    used += (size_t)sprintf(text + used, "0.25,%s\n", value);
  }
  return text;
}

static void faulty_rows(bool ahead) {
  heard h = {0};
  const ef_notes notes = heard_notes(&h);
  ef_reader_settings settings = ef_reader_settings_default();
  settings.notes = &notes;
  settings.skip_bad = true;
  settings.reads_ahead = ahead;
  char *const text = faulty_text();
  ef_reader *const reader = open_with(text, &settings);
  size_t n = 0;
  for (;;) {
    const ef_block block = next(reader, 37);
    if (block.n == 0)
      break;
    for (size_t i = 0; i < block.n; ++i) {
      char name[32];
      /* A name counts the rows of the file: two lines stand above them. */
      snprintf(name, sizeof name, "row %zu", block.line[i] - 2);
      assert_string_equal(block.name[i], name);
      assert_true((block.line[i] - 2) % 20 != 0);
      assert_near(block.value[2 * i + 1], 0.625, 0);
      ++n;
    }
  }
  assert_int_equal(n, 285);
  assert_int_equal(ef_reader_skipped(reader), 15);
  assert_int_equal(h.n, 11); /* the first ten, and the count */
  assert_non_null(strstr(h.text, "t.csv:42: field 410: found 'high', expected "
                                 "a number; row left out\n"));
  assert_non_null(strstr(h.text, "t.csv:22: field 410: found 62.5 for a"));
  assert_non_null(strstr(h.text, "\nt.csv: 15 rows left out as faulty\n"));
  ef_reader_free(reader);
  free(text);
}

static void faulty_rows_are_left_out(void **state) {
  (void)state;
  faulty_rows(false);
}

/* The same in the same order; a fault comes behind the rows before it, and what
 * has been read ahead may be left. */
static void rows_are_read_ahead(void **state) {
  (void)state;
  faulty_rows(true);
  ef_reader_settings settings = ef_reader_settings_default();
  settings.reads_ahead = true;
  char text[4096] = "L,a,b\n";
  for (int i = 0; i < 200; ++i)
    strcat(text, i == 171 ? "50,x,3\n" : "50,2,3\n");
  ef_reader *reader = open_with(text, &settings);
  for (size_t n = 0; n < 170; n += 10)
    assert_int_equal(next(reader, 10).n, 10);
  ef_block block;
  ef_error error = {0};
  assert_int_equal(ef_reader_next(reader, 10, &block, &error), EF_MALFORMED);
  assert_int_equal(error.line, 173);
  assert_int_equal(next(reader, 10).n, 0);
  ef_reader_free(reader);
  reader = open_with(text, &settings);
  assert_int_equal(next(reader, 100).n, 100);
  assert_int_equal(next(reader, 10).n, 10);
  ef_reader_free(reader);
}

static void faulty_wavelengths_are_left_out(void **state) {
  (void)state;
  heard h = {0};
  const ef_notes notes = heard_notes(&h);
  ef_reader_settings settings = ef_reader_settings_default();
  settings.notes = &notes;
  settings.skip_bad = true;
  ef_reader *const reader =
      open_with("# quantity: light\nwavelength_nm,lamp\n400,1.5\n410,x\n"
                "400,9\n420,2.5\n430,-1\n440,3.5\n",
                &settings);
  const double wavelengths_nm[] = {400, 420, 440};
  const double values[] = {1.5, 2.5, 3.5};
  const ef_grid *const grid = &ef_reader_get_head(reader)->grid;
  assert_int_equal(grid->count, 3);
  for (size_t i = 0; i < 3; ++i) {
    assert_near(ef_grid_wavelength(grid, i), wavelengths_nm[i], 0);
  }
  assert_same_bits(next(reader, 5).value, values, 3);
  assert_int_equal(next(reader, 5).n, 0);
  assert_int_equal(ef_reader_skipped(reader), 3);
  assert_int_equal(h.n, 4);
  ef_reader_free(reader);
}

static void good_rows_may_come_late(void **state) {
  (void)state;
  ef_reader_settings settings = ef_reader_settings_default();
  settings.skip_bad = true;
  char text[4096] = "# quantity: reflectance\n400,410\n";
  for (int i = 0; i < 150; ++i)
    strcat(text, "0.25,37\n");
  strcat(text, "0.25,0.625\n");
  ef_reader *const reader = open_with(text, &settings);
  const ef_block block = next(reader, 5);
  assert_int_equal(block.n, 1);
  assert_int_equal(block.line[0], 153);
  assert_int_equal(ef_reader_skipped(reader), 150);
  ef_reader_free(reader);
}

/* Beside a quoted name, which takes the careful way, and past rows that are
 * left out; long spectra have columns of that name, not angles. */
static void measuring_angles(void **state) {
  (void)state;
  ef_reader_settings settings = ef_reader_settings_default();
  settings.skip_bad = true;
  ef_reader *reader = open_with("# quantity: reflectance\n"
                                "name,angle_deg,400,410\n"
                                "sea,15,0.5,0.25\nsea,25,37,0.25\n"
                                "\"sea, deep\",-15.5,0.125,0.25\n"
                                "sea,110,0.5,0.75\n",
                                &settings);
  const double angles[] = {15, -15.5, 110};
  const double values[] = {0.5, 0.25, 0.125, 0.25, 0.5, 0.75};
  assert_true(ef_reader_get_head(reader)->has_angles);
  const ef_block block = next(reader, 9);
  assert_int_equal(block.n, 3);
  assert_same_bits(block.angle_deg, angles, 3);
  assert_same_bits(block.value, values, 6);
  assert_string_equal(block.name[1], "sea, deep");
  ef_reader_free(reader);
  reader = open_with("Angle,L,a,b,R,G,B\n45,50,1,2,0,0.5,1\n", &settings);
  assert_near(next(reader, 1).angle_deg[0], 45, 0);
  ef_reader_free(reader);
  reader = open_with("wavelength_nm,angle\n400,0.5\n410,0.5\n", &settings);
  assert_false(ef_reader_get_head(reader)->has_angles);
  assert_null(next(reader, 1).angle_deg);
  ef_reader_free(reader);
}

static void yellow_and_luminance_are_two_columns(void **state) {
  (void)state;
  static const struct {
    const char *text;
    size_t n_device;
    double value[3], device[4];
  } plan[] = {
      {"# device_max: 100\nC,M,Y,X,Y,Z\n10,20,30,40,50,60\n",
       3,
       {40, 50, 60},
       {0.1, 0.2, 0.3}},
      {"# device_max: 100\nx,y,Y,C,M,Y,K\n0.3,0.4,50,10,20,30,80\n",
       4,
       {0.3, 0.4, 50},
       {0.1, 0.2, 0.3, 0.8}},
      {"# device_max: 100\nC,M,Y,K,L,a,b\n10,20,30,80,40,-5,6\n",
       4,
       {40, -5, 6},
       {0.1, 0.2, 0.3, 0.8}},
      {"# device_max: 100\nblack,L,yellow,a,cyan,b,magenta\n80,40,30,-5,10,6,20"
       "\n",
       4,
       {40, -5, 6},
       {0.1, 0.2, 0.3, 0.8}},
  };
  for (size_t i = 0; i < sizeof plan / sizeof plan[0]; i++) {
    ef_reader *const reader = open_with(plan[i].text, NULL);
    const ef_reader_head *const head = ef_reader_get_head(reader);
    assert_int_equal(head->n_device, plan[i].n_device);
    assert_string_equal(head->device_name[2], "yellow");
    if (head->n_device == 4)
      assert_string_equal(head->device_name[3], "black");
    const ef_block block = next(reader, 9);
    assert_int_equal(block.n, 1);
    assert_same_bits(block.value, plan[i].value, 3);
    assert_same_bits(block.device, plan[i].device, plan[i].n_device);
    ef_reader_free(reader);
  }
}

static void faulty_device_values_are_left_out(void **state) {
  (void)state;
  ef_reader_settings settings = ef_reader_settings_default();
  settings.skip_bad = true;
  ef_reader *const reader = open_with("# device_max: 255\nR,G,B,X,Y,Z\n"
                                      "0,256,0,1,2,3\n51,0,255,4,5,6\n"
                                      "-1,0,0,1,2,3\n255,0,51,7,8,9\n",
                                      &settings);
  const double device[] = {0.2, 0, 1, 1, 0, 0.2};
  const double value[] = {4, 5, 6, 7, 8, 9};
  const ef_block block = next(reader, 9);
  assert_int_equal(block.n, 2);
  assert_same_bits(block.device, device, 6);
  assert_same_bits(block.value, value, 6);
  assert_string_equal(block.name[1], "row 4");
  ef_reader_free(reader);
}

/* ---- Size -------------------------------------------------------------- */

/* `n` rows of L,a,b with the row's number in each. */
static char *many_rows(size_t n) {
  char *const text = malloc(n * 48 + 32);
  assert_non_null(text);
  size_t used = (size_t)sprintf(text, "name,L,a,b\n");
  for (size_t i = 0; i < n; ++i) {
    used +=
        (size_t)sprintf(text + used, "sample %zu,37.5,%zu.25,-%zu\n", i, i, i);
  }
  return text;
}

/* Blocks of any size cut the same rows, and once the first is there no memory
 * is taken any more. */
static void rows_stream_in_bounded_memory(void **state) {
  (void)state;
  enum { N_ROWS = 30000 };
  char *const text = many_rows(N_ROWS);
  ef_reader *const reader = open_with(text, NULL);
  gen g = gen_new(5);
  size_t n = next(reader, 512).n;
  n += next(reader, 512).n;
  n += next(reader, 512).n;
  fail_alloc_at(1);
  for (;;) {
    const ef_block block = next(reader, 1 + gen_below(&g, 512));
    if (block.n == 0)
      break;
    for (size_t i = 0; i < block.n; ++i, ++n) {
      assert_near(block.value[3 * i + 1], (double)n + 0.25, 0);
      assert_near(block.value[3 * i + 2], -(double)n, 0);
      assert_int_equal(block.line[i], n + 2);
    }
  }
  assert_false(fail_alloc_stop()); /* nothing was asked for */
  assert_int_equal(n, N_ROWS);
  ef_reader_free(reader);
  free(text);
}

static void limits(void **state) {
  (void)state;
  char *const text = malloc(EF__LONGEST_RECORD + 64);
  assert_non_null(text);
  /* One line of a record too long, in the header and in a row. */
  memset(text, 'n', EF__LONGEST_RECORD + 32);
  strcpy(text + EF__LONGEST_RECORD - 5, ",L,a,b\n");
  refuse(text, "the line is longer than 4194304 bytes");
  const char header[] = "name,L,a,b\n";
  memcpy(text, header, sizeof header - 1);
  memset(text + EF__LONGEST_RECORD - 5, 'n', 8);
  char *const row = text + sizeof header - 1;
  strcpy(row + EF__LONGEST_RECORD - 5, ",1,2,3\n");
  refuse(text, "the line is longer than 4194304 bytes");
  /* Just as long as allowed. */
  strcpy(row + EF__LONGEST_RECORD - 6, ",1,2,3\n");
  ef_reader *const reader = open_with(text, NULL);
  assert_int_equal(strlen(next(reader, 1).name[0]), EF__LONGEST_RECORD - 6);
  ef_reader_free(reader);
  /* A quote that swallows too much, with line ends in it. */
  memset(text, '\n', EF__LONGEST_RECORD);
  memcpy(text, header, sizeof header - 1);
  text[sizeof header - 1] = '"';
  strcpy(text + EF__LONGEST_RECORD, "\",1,2,3\n");
  refuse(text, "a quote is opened and not closed within 65536 bytes");
  /* Columns. */
  size_t used = (size_t)sprintf(text, "L,a,b");
  for (size_t i = 3; i < EF__MOST_COLUMNS + 1; ++i) {
    used += (size_t)sprintf(text + used, ",%zu", i);
  }
  strcpy(text + used, "\n1,2,3\n");
  refuse(text, "the header row has 16385 columns; at most 16384 are read");
  free(text);
}

static void long_spectra_have_a_limit(void **state) {
  (void)state;
  ef_error error = {0};
  ef_reader_settings settings = ef_reader_settings_default();
  const char text[] = "# quantity: light\nwavelength_nm,lamp\n"
                      "400,1.5\n410,2.5\n420,3.5\n";
  settings.max_bytes = sizeof text - 1;
  ef_reader_free(open_with(text, &settings));
  settings.max_bytes = sizeof text - 9;
  assert_null(
      ef_reader_from_text("t.csv", text, sizeof text - 1, &settings, &error));
  assert_error(&error, EF_MALFORMED, "the file goes on after 53 bytes");
  assert_int_equal(error.line, 5);
}

/* ---- Sources ----------------------------------------------------------- */

static void places_that_are_no_table(void **state) {
  (void)state;
  ef_error error = {0};
  assert_null(ef_reader_open("/", NULL, &error));
  assert_error(&error, EF_UNREADABLE, "is a directory; name a file in it");
  assert_string_equal(error.file, "/");
  assert_null(ef_reader_open("/no/such.csv", NULL, &error));
  assert_error(&error, EF_UNREADABLE, "there is no such file; check the path");
  assert_null(ef_reader_open("demo:livry", NULL, &error));
  assert_error(&error, EF_UNKNOWN_NAME, "near names: livery");
  assert_null(ef_reader_open("/no/such.csv", NULL, NULL));
  assert_null(ef_reader_open("/dev/null/a.csv", NULL, &error));
  assert_error(&error, EF_UNREADABLE, "cannot be opened: Not a directory");
  /* Its first page is never mapped. */
  assert_null(ef_reader_open("/proc/self/mem", NULL, &error));
  assert_error(&error, EF_UNREADABLE, "reading failed: ");
  assert_string_equal(error.file, "/proc/self/mem");
}

/* Root may read everything, so it becomes nobody for the moment. */
static void a_file_without_permission(void **state) {
  (void)state;
  char path[SCRATCH_PATH];
  ef_error error = {0};
  const bool is_root = geteuid() == 0;
  scratch_write("a.csv", "L,a,b\n1,2,3\n", 12);
  scratch_path("a.csv", path);
  assert_int_equal(chmod(path, 0), 0);
  if (is_root)
    assert_int_equal(seteuid(65534), 0);
  assert_null(ef_reader_open(path, NULL, &error));
  if (is_root)
    assert_int_equal(seteuid(0), 0);
  assert_error(&error, EF_UNREADABLE, "may not be read by this user");
}

/* Standard input is a pipe that `text` goes into byte by byte. */
static void through_standard_input(const char *text, size_t length) {
  int ends[2];
  assert_int_equal(pipe(ends), 0);
  const pid_t writer = fork();
  assert_true(writer >= 0);
  if (writer == 0) {
    close(ends[0]);
    for (size_t i = 0; i < length; ++i) {
      if (write(ends[1], text + i, 1) != 1)
        _exit(1);
    }
    _exit(0);
  }
  close(ends[1]);
  const int saved = dup(STDIN_FILENO);
  assert_true(dup2(ends[0], STDIN_FILENO) >= 0);
  close(ends[0]);
  ef_error error = {0};
  ef_reader *const reader = ef_reader_open("-", NULL, &error);
  if (reader == NULL)
    fail_msg("%s", error.message);
  assert_string_equal(ef_reader_get_head(reader)->file, "standard input");
  const ef_block block = next(reader, 5);
  assert_int_equal(block.n, 1);
  assert_string_equal(block.name[0], "deck");
  assert_near(block.value[2], 17.75, 0);
  assert_int_equal(next(reader, 5).n, 0);
  ef_reader_free(reader);
  assert_true(dup2(saved, STDIN_FILENO) >= 0);
  close(saved);
  int status = -1;
  assert_int_equal(waitpid(writer, &status, 0), writer);
  assert_int_equal(status, 0);
}

static void standard_input(void **state) {
  (void)state;
  const char text[] = "\xEF\xBB\xBFname,L,a,b\ndeck,52.5,-3.25,17.75";
  through_standard_input(text, sizeof text - 1);
}

static void demo_files_open(void **state) {
  (void)state;
  assert_true(ef_demo_count() >= 11);
  for (size_t i = 0; i < ef_demo_count(); ++i) {
    size_t length;
    const char *const text = ef_demo_text(i, &length);
    assert_int_equal(strlen(text), length);
    assert_null(strchr(ef_demo_name(i), '.'));
    char path[64];
    snprintf(path, sizeof path, "demo:%s", ef_demo_name(i));
    ef_error error = {0};
    ef_reader *const reader = ef_reader_open(path, NULL, &error);
    /* What a panel answers, sets and is shown are no colours; all others are
     * read. */
    if (strstr(ef_demo_name(i), "-settings") != NULL ||
        strstr(ef_demo_name(i), "-responses") != NULL ||
        strstr(ef_demo_name(i), "-answers") != NULL ||
        strstr(ef_demo_name(i), "-pairs") != NULL) {
      assert_null(reader);
      assert_error(&error, EF_MALFORMED, "no known set of columns");
      continue;
    }
    assert_non_null(reader);
    assert_string_equal(ef_reader_get_head(reader)->file, path);
    assert_true(next(reader, 500).n > 0);
    ef_reader_free(reader);
  }
  assert_null(ef_demo_name(ef_demo_count()));
  assert_null(ef_demo_text(ef_demo_count(), NULL));
}

static void all_spectra_of_a_file(void **state) {
  (void)state;
  ef_error error = {0};
  ef_spectra *spectra = ef_spectra_read("demo:kiosk-primaries", NULL, &error);
  assert_non_null(spectra);
  assert_int_equal(ef_spectra_count(spectra), 5);
  assert_int_equal(ef_spectra_kind(spectra), EF_LIGHT);
  assert_true(ef_spectra_absolute(spectra));
  assert_string_equal(ef_spectra_name(spectra, 2), "blue");
  assert_int_equal(ef_spectra_grid(spectra)->count, 201);
  ef_spectra_free(spectra);
  /* Wide, repeated names, from a file name with its ending. */
  spectra = ef_spectra_read("demo:seats-deliveries.csv", NULL, &error);
  assert_non_null(spectra);
  assert_int_equal(ef_spectra_count(spectra), 24);
  assert_int_equal(ef_spectra_kind(spectra), EF_SURFACE);
  assert_false(ef_spectra_absolute(spectra));
  ef_spectra_free(spectra);
  assert_null(ef_spectra_read("demo:signal-colours", NULL, &error));
  assert_error(&error, EF_MALFORMED, "holds x,y,Y, expected spectra");
  ef_reader_settings settings = ef_reader_settings_default();
  settings.max_bytes = 31 * 8 * 23;
  assert_null(ef_spectra_read("demo:seats-deliveries", &settings, &error));
  assert_error(&error, EF_MALFORMED, "the spectra fill more than 5704 bytes");
}

/* ---- Arguments and memory ---------------------------------------------- */

static void bad_arguments(void **state) {
  (void)state;
  ef_error error = {0};
  ef_reader_settings settings = ef_reader_settings_default();
  settings.device_max = -1;
  assert_null(ef_reader_open("demo:livery", &settings, &error));
  assert_error(&error, EF_INVALID, "device value of full drive");
  settings.device_max = NOT_A_NUMBER;
  assert_null(ef_reader_from_text("t", "", 0, &settings, &error));
  assert_error(&error, EF_INVALID, "device value of full drive");
  ef_reader *const reader = ef_reader_open("demo:livery", NULL, &error);
  ef_block block;
  assert_int_equal(ef_reader_next(reader, 0, &block, &error), EF_INVALID);
  ef_reader_free(reader);
  ef_reader_free(NULL);
}

static void an_error_ends_the_rows(void **state) {
  (void)state;
  char *const text = many_rows(400);
  *strstr(text, "sample 300,37") = '\t';
  strstr(text, "300,37.5")[4] = 'x';
  ef_reader *const reader = open_with(text, NULL);
  ef_block block;
  ef_error error = {0};
  assert_int_equal(next(reader, 150).n, 100);
  assert_int_equal(next(reader, 150).n, 150);
  assert_int_equal(ef_reader_next(reader, 150, &block, &error), EF_MALFORMED);
  assert_error(&error, EF_MALFORMED, "found 'x7.5', expected a number");
  assert_int_equal(error.line, 302);
  assert_int_equal(error.column, 2);
  assert_string_equal(error.field, "L");
  assert_int_equal(block.n, 0);
  assert_int_equal(next(reader, 150).n, 0);
  ef_reader_free(reader);
  free(text);
}

static bool read_in_short_memory(void *context) {
  const char *const text = context;
  ef_error error = {0};
  ef_reader *const reader =
      ef_reader_from_text("t.csv", text, strlen(text), NULL, &error);
  if (reader == NULL) {
    assert_int_equal(error.status, EF_NO_MEMORY);
    return false;
  }
  ef_block block;
  ef_status status;
  do {
    status = ef_reader_next(reader, 300, &block, &error);
  } while (status == EF_OK && block.n > 0);
  ef_reader_free(reader);
  return status == EF_OK;
}

static bool collect_in_short_memory(void *context) {
  ef_error error = {0};
  ef_spectra *const spectra = ef_spectra_read(context, NULL, &error);
  if (spectra == NULL)
    assert_int_equal(error.status, EF_NO_MEMORY);
  ef_spectra_free(spectra);
  return spectra != NULL;
}

static void memory_may_run_out(void **state) {
  (void)state;
  char *const rows = many_rows(1000);
  char quotes[] = "# title: t\n# quantity: light\n\"name\",400,410\n"
                  "\"a\nb\",1,2\n";
  char columns[] = "# quantity: light\nwavelength_nm,a,b\n400,1,2\n410,3,4\n";
  assert_true(fail_alloc_each(read_in_short_memory, rows) > 10);
  assert_true(fail_alloc_each(read_in_short_memory, quotes) > 10);
  assert_true(fail_alloc_each(read_in_short_memory, columns) > 10);
  char wide[] = "demo:seats-deliveries";
  char turned[] = "demo:livery";
  assert_true(fail_alloc_each(collect_in_short_memory, wide) > 10);
  assert_true(fail_alloc_each(collect_in_short_memory, turned) > 10);
  free(rows);
}

/* ---- Files of bytes ------------------------------------------------------ */

static void whole_files_of_bytes(void **state) {
  (void)state;
  enum { N = 200001 };
  static unsigned char bytes[N];
  char path[SCRATCH_PATH];
  unsigned char *read = NULL;
  size_t length = 0;
  ef_error error = {0};
  for (size_t i = 0; i < N; ++i) bytes[i] = (unsigned char)(i * 37 % 251);
  scratch_write("b.bin", bytes, N);
  scratch_path("b.bin", path);
  assert_int_equal(ef_bytes_read(path, N, &read, &length, &error), EF_OK);
  assert_int_equal(length, N);
  assert_memory_equal(read, bytes, N);
  free(read);
  assert_int_equal(ef_bytes_read(path, N - 1, &read, &length, &error),
                   EF_MALFORMED);
  assert_string_equal(error.message, "has more than 200000 bytes");
  scratch_write("b.bin", bytes, 0);
  assert_int_equal(ef_bytes_read(path, N, &read, &length, &error),
                   EF_MALFORMED);
  assert_string_equal(error.message, "is an empty file");
  unlink(path);
  assert_int_equal(ef_bytes_read(path, N, &read, &length, &error),
                   EF_UNREADABLE);
  assert_string_equal(error.message,
                      "there is no such file; check the path");
  assert_int_equal(ef_bytes_read("/", N, &read, &length, NULL), EF_UNREADABLE);
  assert_int_equal(ef_bytes_read(NULL, N, &read, &length, NULL), EF_INVALID);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(faulty_rows_are_left_out),
      cmocka_unit_test(rows_are_read_ahead),
      cmocka_unit_test(faulty_wavelengths_are_left_out),
      cmocka_unit_test(yellow_and_luminance_are_two_columns),
      cmocka_unit_test(faulty_device_values_are_left_out),
      cmocka_unit_test(good_rows_may_come_late),
      cmocka_unit_test(measuring_angles),
      cmocka_unit_test(rows_stream_in_bounded_memory),
      cmocka_unit_test(limits),
      cmocka_unit_test(long_spectra_have_a_limit),
      cmocka_unit_test(places_that_are_no_table),
      cmocka_unit_test(a_file_without_permission),
      cmocka_unit_test(standard_input),
      cmocka_unit_test(demo_files_open),
      cmocka_unit_test(all_spectra_of_a_file),
      cmocka_unit_test(bad_arguments),
      cmocka_unit_test(an_error_ends_the_rows),
      cmocka_unit_test(memory_may_run_out),
      cmocka_unit_test(whole_files_of_bytes),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, scratch_make, scratch_remove);
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Charts are read back from their SVG: what is drawn where is taken from the
 * ticks and their texts, as a reader would, not from the code that drew it. */
#include <float.h>
#include <setjmp.h>
#include <stdlib.h>

#include "base/base_private.h"
#include "fail_alloc.h"
#include "gen.h"
#include "near.h"
#include "picture/chart_private.h"
#include "scratch.h"

#include <evenfield/difference.h>
#include <evenfield/observer.h>

/* ---- Reading back ------------------------------------------------------ */

/* Where the group with this title begins. */
static const char *group(const char *svg, const char *title) {
  char text[200];
  snprintf(text, sizeof text, "<g><title>%s</title>", title);
  const char *found = strstr(svg, text);
  if (found == NULL)
    fail_msg("the chart has no group %s", title);
  return found;
}

/* The next number at *at, which moves behind it. */
static double number(const char **at) {
  while (**at != '\0' && strchr("0123456789.-", **at) == NULL)
    ++*at;
  const size_t length = strspn(*at, "0123456789.-");
  double value;
  assert_true(ef_number_parse(*at, length, '.', &value));
  *at += length;
  return value;
}

/* Value and px of the tick whose text comes next; `from` moves behind it. */
static double tick(const char **from, size_t coordinate, double *px) {
  const char *at = strstr(*from, "<path");
  assert_non_null(at);
  at = strstr(at, " d=\"M");
  assert_non_null(at);
  at += 5;
  const double first = number(&at);
  *px = coordinate == 0 ? first : number(&at);
  at = strstr(at, "<text");
  assert_non_null(at);
  at = strchr(at, '>') + 1;
  /* U+2212 stands for minus. */
  const bool is_negative = strncmp(at, "\xE2\x88\x92", 3) == 0;
  const char *digits = is_negative ? at + 3 : at;
  const double value = number(&digits);
  *from = digits;
  return is_negative ? -value : value;
}

/* value = a px + b along an axis, from its first and its last tick. */
typedef struct scale {
  double a, b;
} scale;

static scale scale_of(const char *svg, size_t coordinate) {
  const char *at = group(svg, coordinate == 0 ? "x axis" : "y axis");
  const char *end = strstr(at, "</g>");
  at = strstr(at, "/>"); /* the line of the axis itself */
  double px, last_px = 0.0;
  const double first = tick(&at, coordinate, &px);
  double last = first;
  for (const char *next = strstr(at, "<path"); next != NULL && next < end;
       next = strstr(at, "<path"))
    last = tick(&at, coordinate, &last_px);
  const double a = (last - first) / (last_px - px);
  return (scale){a, first - a * px};
}

static double value_at(scale s, double px) {
  return s.a * px + s.b;
}

typedef struct sheet_scales {
  scale x, y;
} sheet_scales;

static sheet_scales scales_of(const char *svg) {
  return (sheet_scales){scale_of(svg, 0), scale_of(svg, 1)};
}

/* The next point of a path, in units of the axes. */
static void point(const char **at, sheet_scales s, double out[2]) {
  out[0] = value_at(s.x, number(at));
  out[1] = value_at(s.y, number(at));
}

/* ---- Making ------------------------------------------------------------ */

static ef_chart *new_chart(const char *title, bool equal_scales) {
  ef_chart_settings settings = ef_chart_settings_default();
  settings.title = title;
  settings.equal_scales = equal_scales;
  settings.x_title = "x";
  settings.y_title = "y";
  ef_chart *chart = ef_chart_new(&settings, NULL);
  assert_non_null(chart);
  return chart;
}

static void add(ef_chart *chart, const ef_series *series) {
  ef_error error = {0};
  if (ef_chart_add(chart, series, &error) != EF_OK)
    fail_msg("%s", error.message);
}

static char *draw(ef_chart *chart, const char *name, ef_chart_report *report) {
  char path[SCRATCH_PATH];
  scratch_path(name, path);
  ef_error error = {0};
  if (ef_chart_write(chart, path, report, &error) != EF_OK)
    fail_msg("%s", error.message);
  ef_chart_free(chart);
  size_t length;
  char *text = scratch_read(name, &length);
  remove(path);
  return text;
}

/* ---- Published coordinates --------------------------------------------- */

/* The 25 ellipses of MacAdam (1942) as listed in Wyszecki & Stiles, Color
 * Science, 2nd ed. (1982), table 2(5.4.1), drawn ten times as large: the ends
 * of the eight curves lie on the published ellipses. Coordinates have three
 * decimals of a px, one px is some 0.0013; ticks the same. */
static void test_macadam_ellipses_land(void **state) {
  (void)state;
  enum { N = 25 };
  double x[N], y[N], a[N], b[N], turn[N];
  assert_int_equal(ef_macadam_count(), N);
  for (size_t i = 0; i < N; ++i) {
    const ef_ellipse e = ef_macadam_at(i);
    x[i] = e.center[0];
    y[i] = e.center[1];
    a[i] = e.semi_major;
    b[i] = e.semi_minor;
    turn[i] = e.angle_deg;
  }
  ef_series s = ef_series_default(EF_SERIES_ELLIPSES);
  s.name = "MacAdam 1942";
  s.n = N;
  s.x = x;
  s.y = y;
  s.semi_major = a;
  s.semi_minor = b;
  s.angle_deg = turn;
  s.magnification = 10.0;
  ef_chart *chart = new_chart("ellipses", true);
  add(chart, &s);
  char *svg = draw(chart, "a.svg", NULL);
  assert_non_null(strstr(svg, "MacAdam 1942, drawn 10 times as large"));
  const sheet_scales scales = scales_of(svg);
  /* First, twelfth and last of the table: x, y, 1000 a, 1000 b, angle. */
  static const struct {
    size_t i;
    double x, y, a, b, angle_deg;
  } published[] = {{0, 0.160, 0.057, 0.85, 0.35, 62.5},
                   {3, 0.150, 0.680, 9.60, 2.30, 105.0},
                   {12, 0.305, 0.323, 2.30, 0.90, 58.0},
                   {24, 0.365, 0.153, 3.60, 0.95, 40.0}};
  const char *at = group(svg, "MacAdam 1942");
  size_t k = 0;
  for (size_t i = 0; i < N; ++i) {
    at = strstr(at, " d=\"M") + 5;
    double end[8][2], skipped[2];
    point(&at, scales, skipped);
    for (size_t j = 0; j < 8; ++j) {
      point(&at, scales, skipped);
      point(&at, scales, skipped);
      point(&at, scales, end[j]);
    }
    at = strstr(at, "/>"); /* the mark of the centre is passed over */
    at = strstr(at, " d=\"M") + 5;
    if (k == 4 || published[k].i != i)
      continue;
    const double t = published[k].angle_deg * acos(-1.0) / 180.0;
    for (size_t j = 0; j < 8; ++j) {
      const double dx = end[j][0] - published[k].x;
      const double dy = end[j][1] - published[k].y;
      const double u = (dx * cos(t) + dy * sin(t)) / (published[k].a * 1e-2);
      const double v = (dy * cos(t) - dx * sin(t)) / (published[k].b * 1e-2);
      /* 3e-6 of x, y against the smallest half axis of 3.5e-3. */
      assert_near(hypot(u, v), 1.0, 1e-3);
    }
    ++k;
  }
  assert_int_equal(k, 4);
  free(svg);
}

/* Chromaticities of monochromatic stimuli for the CIE 1931 observer: CIE
 * 15:2004, table T.4 (four decimals). */
static void test_locus_lands(void **state) {
  (void)state;
  static const double published[][3] = {
      {460, 0.1440, 0.0297}, {480, 0.0913, 0.1327}, {500, 0.0082, 0.5384},
      {520, 0.0743, 0.8338}, {560, 0.3731, 0.6245}, {600, 0.6270, 0.3725},
      {700, 0.7347, 0.2653}};
  enum { N = sizeof published / sizeof *published };
  double nm[N], x[N], y[N];
  ef_xy xy[N];
  for (size_t i = 0; i < N; ++i)
    nm[i] = published[i][0];
  ef_observer *observer = ef_observer_new("cie-1931", NULL);
  assert_int_equal(ef_locus_xy(observer, N, nm, xy, NULL), EF_OK);
  ef_observer_free(observer);
  for (size_t i = 0; i < N; ++i) {
    x[i] = xy[i].x;
    y[i] = xy[i].y;
  }
  ef_series line = ef_series_default(EF_SERIES_LINE);
  line.name = "locus";
  line.n = N;
  line.x = x;
  line.y = y;
  ef_chart *chart = new_chart("locus", true);
  add(chart, &line);
  char *svg = draw(chart, "a.svg", NULL);
  const sheet_scales scales = scales_of(svg);
  const char *at = strstr(group(svg, "locus"), " d=\"M") + 5;
  for (size_t i = 0; i < N; ++i) {
    double found[2];
    point(&at, scales, found);
    /* Half of the last published digit, and thousandths of a px. */
    assert_near(found[0], published[i][1], 5.2e-5);
    assert_near(found[1], published[i][2], 5.2e-5);
  }
  free(svg);
}

/* ---- Rows -------------------------------------------------------------- */

/* Names from the top, marks and bars beside them; a limit that is infinite runs
 * to the end of the field, and a row without a value keeps its name. */
static void test_rows_have_names(void **state) {
  (void)state;
  enum { N = 4 };
  static const char *const row[N] = {
      "anna", "ben",
      "a name that is far too long for the room that names may take beside it",
      "none"};
  static const double x[N] = {1.5, 2.5, 3.0, NOT_A_NUMBER};
  static const double y[N] = {0, 1, 2, 3};
  static const double low[N] = {1.0, 2.25, -INFINITE, NOT_A_NUMBER};
  static const double high[N] = {2.0, INFINITE, 3.5, NOT_A_NUMBER};
  ef_chart_settings settings = ef_chart_settings_default();
  settings.x_title = "JND";
  settings.n_rows = N;
  settings.row = row;
  settings.x_from = 0.5;
  settings.x_to = 4.5;
  ef_chart *chart = ef_chart_new(&settings, NULL);
  assert_non_null(chart);
  ef_series s = ef_series_default(EF_SERIES_SPANS);
  s.name = "people";
  s.n = N;
  s.x = x;
  s.y = y;
  s.low = low;
  s.high = high;
  add(chart, &s);
  ef_chart_report report;
  char *svg = draw(chart, "a.svg", &report);
  assert_int_equal(report.n_drawn, 3);
  const scale scale_x = scale_of(svg, 0);
  /* Heights of the ticks beside which the names stand. */
  double height[N];
  const char *at = strstr(group(svg, "y axis"), "/>");
  for (size_t i = 0; i < N; ++i) {
    at = strstr(at, " d=\"M") + 5;
    number(&at);
    height[i] = number(&at);
    at = strchr(strstr(at, "<text"), '>') + 1;
    if (i == 2) {
      assert_memory_equal(at, "a name that is far", 18);
      const char *end = strchr(at, '<');
      assert_memory_equal(end - 3, "\xE2\x80\xA6", 3);
    } else {
      assert_memory_equal(at, row[i], strlen(row[i]));
    }
    assert_near(height[i] - height[0], 22.0 * (double)i, 1e-9);
  }
  /* Bars from low to high, caps at the ends that are known. */
  const double end[3][2] = {{1.0, 2.0}, {2.25, 4.5}, {0.5, 3.5}};
  const size_t n_caps[3] = {2, 1, 1};
  at = group(svg, "people");
  for (size_t i = 0; i < 3; ++i) {
    at = strstr(at, " d=\"M") + 5;
    const char *stop = strchr(at, '"');
    assert_near(value_at(scale_x, number(&at)), end[i][0], 1e-4);
    assert_near(number(&at), height[i], 1e-3);
    at = strpbrk(at, "HL");
    assert_near(value_at(scale_x, number(&at)), end[i][1], 1e-4);
    size_t n = 0;
    for (const char *k = at; k < stop; ++k)
      n += *k == 'M';
    assert_int_equal(n, n_caps[i]);
    at = strstr(stop, "<path"); /* the mark is passed over */
    if (at == NULL)
      break;
    at = strstr(at, "/>");
  }
  free(svg);

  settings.row = NULL;
  ef_error error = {0};
  assert_null(ef_chart_new(&settings, &error));
  assert_error(&error, EF_INVALID, "4 rows of a chart have no names");
}

/* ---- Axes -------------------------------------------------------------- */

static void test_ticks_are_readable(void **state) {
  (void)state;
  gen g = gen_new(771);
  for (size_t k = 0; k < 20000; ++k) {
    const double size = pow(10.0, gen_between(&g, -8.0, 8.0));
    const double from = size * gen_between(&g, -3.0, 3.0);
    const double to = from + size * gen_between(&g, 0.01, 5.0);
    const double length = gen_between(&g, 100.0, 2000.0);
    const ef__axis axis = ef__axis_of(from, to, length, 60.0);
    const int m = axis.mantissa;
    assert_true(m == 1 || m == 2 || m == 5);
    double last = 0.0;
    for (size_t i = 0; i < axis.n; ++i) {
      char text[EF__TICK_TEXT];
      const double value = ef__axis_tick(&axis, i, text);
      const bool is_negative = strncmp(text, "\xE2\x88\x92", 3) == 0;
      const char *digits = is_negative ? text + 3 : text;
      double read;
      assert_true(ef_number_parse(digits, strlen(digits), '.', &read));
      assert_true((is_negative ? -read : read) == value);
      const double slack = 1e-6 * (to - from);
      assert_true(value >= from - slack && value <= to + slack);
      if (i > 0)
        assert_true((value - last) / (to - from) * length >= 59.99);
      last = value;
    }
    /* Not so coarse that another step would have been better: 2.5 is the
     * largest ratio of neighbouring steps, 3 leaves room for the ends. */
    assert_true((double)(axis.n + 1) * 60.0 * 2.5 >= length - 60.0 * 2.5);
  }
}

/* ---- Labels ------------------------------------------------------------ */

static bool apart(ef__area a, ef__area b) {
  return a.left >= b.right || b.left >= a.right || a.top >= b.bottom ||
         b.top >= a.bottom;
}

static void test_labels_never_collide(void **state) {
  (void)state;
  gen g = gen_new(31);
  size_t n_placed = 0;
  for (size_t k = 0; k < 60; ++k) {
    enum { N = 40 };
    const ef__area field = {0.0, 0.0, gen_between(&g, 150.0, 800.0),
                            gen_between(&g, 150.0, 600.0)};
    ef__chart_label label[N] = {{0}};
    ef__area block[N];
    for (size_t i = 0; i < N; ++i) {
      const ef__point at = {gen_between(&g, 0.0, field.right),
                            gen_between(&g, 0.0, field.bottom)};
      label[i] = (ef__chart_label){.text = "name",
                                   .at = at,
                                   .outward = {gen_normal(&g), gen_normal(&g)},
                                   .gap_px = 5.0,
                                   .width_px = gen_between(&g, 10.0, 120.0)};
      block[i] = (ef__area){at.x - 4, at.y - 4, at.x + 4, at.y + 4};
    }
    ef__place(N, label, 14.0, field, N, block, 0, NULL);
    for (size_t i = 0; i < N; ++i) {
      if (!label[i].placed)
        continue;
      ++n_placed;
      const ef__area box = label[i].box;
      assert_true(box.left >= 0.0 && box.right <= field.right);
      assert_true(box.top >= 0.0 && box.bottom <= field.bottom);
      for (size_t j = 0; j < N; ++j) {
        assert_true(apart(box, block[j]));
        assert_true(i == j || !label[j].placed || apart(box, label[j].box));
      }
    }
  }
  assert_true(n_placed > 60 * 20); /* and most find a place */
}

/* A place that hides a line is taken only where there is no better one. */
static void test_labels_keep_off_lines(void **state) {
  (void)state;
  const ef__area field = {0, 0, 400, 300};
  ef__chart_label label = {.text = "name",
                           .at = {200, 150},
                           .outward = {1, 0},
                           .gap_px = 5,
                           .width_px = 60};
  const ef__segment line = {{230, 0}, {230, 300}};
  ef__place(1, &label, 14.0, field, 0, NULL, 1, &line);
  assert_true(label.placed);
  assert_true(label.box.right < 230 || label.box.left > 230);
}

/* ---- Text -------------------------------------------------------------- */

static void test_markup_is_escaped(void **state) {
  (void)state;
  const double x[] = {1.0, 2.0}, y[] = {1.0, 3.0};
  const char *const label[] = {"<script>alert(\"1\")</script>",
                               "a & b\x01 \xC3\x28 \xED\xA0\x80"};
  ef_series s = ef_series_default(EF_SERIES_MARKS);
  s.name = "</g> & \"all\"";
  s.n = 2;
  s.x = x;
  s.y = y;
  s.label = label;
  ef_chart *chart = new_chart("<b>title</b>", false);
  add(chart, &s);
  char *svg = draw(chart, "a.svg", NULL);
  assert_null(strstr(svg, "<script"));
  assert_null(strstr(svg, "<b>"));
  assert_non_null(
      strstr(svg, "&lt;script&gt;alert(&quot;1&quot;)&lt;/script&gt;"));
  assert_non_null(strstr(svg, "&lt;b&gt;title&lt;/b&gt;"));
  assert_non_null(strstr(svg, "&lt;/g&gt; &amp; &quot;all&quot;"));
  /* Control characters become blanks, bytes that are no text question marks. */
  assert_non_null(strstr(svg, "a &amp; b  ?( ??"
                              "?<"));
  free(svg);
}

static void test_text_is_cleaned(void **state) {
  (void)state;
  static const char *const pair[][2] = {
      {"plain", "plain"},
      {"\xCE\x94 E*", "\xCE\x94 E*"},
      {"\xC0\xAF", "??"},      /* overlong */
      {"\xE0\x80\xAF", "???"}, /* overlong */
      {"\xEF\xBF\xBE", "???"}, /* U+FFFE */
      {"\xF0\x9F\x9A\xA2", "\xF0\x9F\x9A\xA2"},
      {"\xF4\x90\x80\x80", "????"}, /* beyond U+10FFFF */
      {"tab\there", "tab here"},
      {"cut \xE2\x82", "cut ??"},
  };
  for (size_t i = 0; i < sizeof pair / sizeof *pair; ++i) {
    char out[40];
    ef__text_clean(out, pair[i][0]);
    assert_string_equal(out, pair[i][1]);
  }
}

static void test_lines_fit(void **state) {
  (void)state;
  static const char text[] = "a display of a ticket kiosk, as measured, with "
                             "oneveryverylongwordthatfitsnowhere in it";
  for (double width = 20.0; width < 700.0; width += 7.0) {
    const char *at = text;
    while (*at != '\0') {
      const size_t length = ef__text_line(at, 13.0, true, width);
      assert_true(length > 0);
      char line[200];
      memcpy(line, at, length);
      line[length] = '\0';
      assert_true(length == 1 || ef__text_width(line, 13.0, true) <= width);
      at += length;
      while (*at == ' ')
        ++at;
    }
  }
}

/* ---- Many points ------------------------------------------------------- */

static void test_a_million_points_are_thinned(void **state) {
  (void)state;
  enum { N = 1000000 };
  double *x = malloc(2 * N * sizeof *x);
  assert_non_null(x);
  double *y = x + N;
  gen g = gen_new(5);
  for (size_t i = 0; i < N; ++i) {
    x[i] = gen_normal(&g);
    y[i] = gen_normal(&g);
  }
  x[7] = NOT_A_NUMBER;
  y[9] = INFINITE;
  static const ef_series_kind kinds[] = {EF_SERIES_CLOUD, EF_SERIES_MARKS,
                                         EF_SERIES_PAIRS};
  for (size_t k = 0; k < 3; ++k) {
    ef_series s = ef_series_default(kinds[k]);
    s.name = "people";
    s.n = N;
    s.x = s.to_x = x;
    s.y = s.to_y = y;
    ef_chart *chart = new_chart("many", false);
    add(chart, &s);
    ef_chart_report report;
    char *svg = draw(chart, "a.svg", &report);
    assert_int_equal(report.n_points, N);
    assert_true(report.n_drawn > 300);
    assert_true(report.n_drawn <= (k == 0 ? 6000 : 1500));
    char text[80];
    snprintf(text, sizeof text, "Drawn: %zu of 1000000 points", report.n_drawn);
    assert_non_null(strstr(svg, text));
    assert_true(strlen(svg) < 600000);
    free(svg);
  }
  free(x);
}

/* What stays covers what was there: each point has one that stays nearby. */
static void test_thinning_leaves_no_hole(void **state) {
  (void)state;
  enum { N = 3000 };
  gen g = gen_new(12);
  ef__point at[N];
  bool stays[N];
  const ef__area area = {0, 0, 300, 200};
  for (size_t i = 0; i < N; ++i)
    at[i] = (ef__point){gen_between(&g, -10, 310), gen_between(&g, -10, 210)};
  const size_t kept = ef__thin(N, at, area, 4.0, N, stays);
  size_t n = 0;
  for (size_t i = 0; i < N; ++i) {
    n += stays[i];
    if (at[i].x < 0 || at[i].x > 300 || at[i].y < 0 || at[i].y > 200) {
      assert_false(stays[i]);
      continue;
    }
    bool is_near = false;
    for (size_t j = 0; j < N && !is_near; ++j)
      is_near = stays[j] && fabs(at[j].x - at[i].x) <= 4.0 &&
                fabs(at[j].y - at[i].y) <= 4.0;
    assert_true(is_near);
  }
  assert_int_equal(n, kept);
  assert_true(kept < N);
  assert_true(ef__thin(N, at, area, 0.0, 100, stays) <= 100);
}

/* ---- Files ------------------------------------------------------------- */

static ef_chart *small_chart(void) {
  static const double x[] = {1.0, 2.0, 4.0}, y[] = {1.0, 3.0, 2.5};
  static const double low[] = {0.5, 2.0, 2.0}, high[] = {1.5, 3.5, 2.7};
  static const double half[] = {0.3, 0.2, 0.1}, turn[] = {10, 20, 30};
  static const char *const label[] = {"one", NULL, "three"};
  ef_chart *chart = new_chart("all kinds", false);
  for (int kind = EF_SERIES_LINE; kind <= EF_SERIES_CLOUD; ++kind) {
    ef_series s = ef_series_default((ef_series_kind)kind);
    s.look = kind;
    s.name = "series";
    s.n = 3;
    s.x = x;
    s.y = y;
    s.to_x = y;
    s.to_y = x;
    s.low = low;
    s.high = high;
    s.semi_major = s.semi_minor = half;
    s.angle_deg = turn;
    s.label = label;
    add(chart, &s);
  }
  return chart;
}

/* The same chart makes the same bytes, in every kind of file. */
static void test_bytes_are_the_same(void **state) {
  (void)state;
  static const char *const names[] = {"a.svg", "a.pdf", "a.png", "a.PNG"};
  static const char *const start[] = {"<?xml", "%PDF", "\x89PNG", "\x89PNG"};
  for (size_t k = 0; k < 4; ++k) {
    char path[SCRATCH_PATH];
    scratch_path(names[k], path);
    char *bytes[2];
    size_t length[2];
    for (size_t i = 0; i < 2; ++i) {
      ef_chart *chart = small_chart();
      ef_chart_report report;
      assert_int_equal(ef_chart_write(chart, path, &report, NULL), EF_OK);
      ef_chart_free(chart);
      bytes[i] = scratch_read(names[k], &length[i]);
      remove(path);
    }
    assert_int_equal(length[0], length[1]);
    assert_memory_equal(bytes[0], bytes[1], length[0]);
    assert_memory_equal(bytes[0], start[k], strlen(start[k]));
    free(bytes[0]);
    free(bytes[1]);
  }
}

static uint32_t colour_at(const ef__png_palette *palette, size_t place) {
  const unsigned char *rgb = palette->rgb[place];
  return (uint32_t)rgb[0] << 16 | (uint32_t)rgb[1] << 8 | rgb[2];
}

static int colour_gap(uint32_t a, uint32_t b) {
  int sum = 0;
  for (unsigned shift = 0; shift <= 16; shift += 8) {
    const int gap = (int)(a >> shift & 255u) - (int)(b >> shift & 255u);
    sum += gap * gap;
  }
  return sum;
}

/* Gonzalez 1985: each colour chosen lies at least as far from those before it as
 * any colour lies from its own, so that no choice of as many errs by less than
 * half of that. Few colours stay exactly, and the commonest of many. */
static void test_palettes(void **state) {
  (void)state;
  enum { N = 20000, FEW = 256, COMMON = 0xB4470A, EXACT = 32 };
  gen g = gen_new(31);
  uint32_t *pixel = malloc(N * sizeof *pixel);
  unsigned char *index = malloc(N);
  assert_true(pixel != NULL && index != NULL);
  for (size_t n_colours = 1; n_colours <= 4096; n_colours *= 4) {
    for (size_t i = 0; i < N; ++i) {
      const uint32_t k = (uint32_t)(i % n_colours);
      pixel[i] = i % 3 == 0 ? COMMON : 0xFF000000u | (k * 2654435761u) >> 8;
    }
    ef__png_palette palette;
    assert_true(ef__palette_of(N, pixel, &palette, index));
    assert_true(palette.n <= EF__PNG_COLOURS);
    assert_int_equal(colour_at(&palette, index[0]), COMMON);
    int worst = 0;
    for (size_t i = 0; i < N; ++i) {
      assert_true(index[i] < palette.n);
      const int gap =
          colour_gap(pixel[i] & 0xFFFFFF, colour_at(&palette, index[i]));
      worst = gap > worst ? gap : worst;
    }
    if (n_colours < FEW)
      assert_int_equal(worst, 0);
    for (size_t k = EXACT; k < palette.n; ++k) {
      for (size_t j = 0; j < k; ++j)
        assert_true(colour_gap(colour_at(&palette, k),
                               colour_at(&palette, j)) >= worst);
    }
  }
  /* Too many to be a drawing. */
  for (size_t i = 0; i < N; ++i)
    pixel[i] = (uint32_t)(gen_unit(&g) * 0xFFFFFF);
  ef__png_palette palette;
  assert_false(ef__palette_of(N, pixel, &palette, index));
  free(pixel);
  free(index);
}

/* A chart as PNG has a palette, says its encoding, and its paper is white. */
static void test_a_chart_as_pixels(void **state) {
  (void)state;
  char path[SCRATCH_PATH];
  scratch_path("a.png", path);
  ef_chart *chart = small_chart();
  assert_int_equal(ef_chart_write(chart, path, NULL, NULL), EF_OK);
  ef_chart_free(chart);
  const ef_png_settings settings = ef_png_settings_default();
  ef_png *png = ef_png_open(path, &settings, NULL);
  assert_non_null(png);
  const ef_png_head *head = ef_png_get_head(png);
  assert_string_equal(head->layout, "palette");
  assert_true(head->has_cicp && head->primaries == 1 && head->transfer == 13);
  assert_int_equal(head->width, 1440);
  uint16_t *row = malloc(head->width * 3 * sizeof *row);
  bool has_row, has_ink = false;
  const uint32_t ink = ef__ink_at(EF__INK_LOOK)->light;
  size_t n = 0;
  while (ef_png_next_row(png, row, &has_row, NULL) == EF_OK && has_row) {
    assert_int_equal(row[0], 65535);
    for (size_t i = 0; i < 3 * head->width; i += 3)
      has_ink = has_ink || (row[i] == (ink >> 16 & 255u) * 257u &&
                            row[i + 1] == (ink >> 8 & 255u) * 257u &&
                            row[i + 2] == (ink & 255u) * 257u);
    ++n;
  }
  assert_int_equal(n, head->height);
  assert_true(has_ink);
  free(row);
  ef_png_free(png);
  remove(path);
}

static void test_refusals(void **state) {
  (void)state;
  ef_error error = {0};
  char path[SCRATCH_PATH];
  ef_chart *chart = small_chart();
  scratch_path("a.gif", path);
  assert_int_equal(ef_chart_write(chart, path, NULL, &error), EF_INVALID);
  assert_error(&error, EF_INVALID,
               "is no kind of chart; expected a name that ends in .svg, .pdf "
               "or .png");
  assert_false(ef_chart_knows(".svg"));
  assert_true(ef_chart_knows("a.Svg"));
  scratch_path("none/a.svg", path);
  assert_int_equal(ef_chart_write(chart, path, NULL, &error), EF_UNWRITABLE);
  scratch_write("a.svg", "mine", 4);
  scratch_path("a.svg", path);
  assert_int_equal(ef_chart_write(chart, path, NULL, &error), EF_EXISTS);
  scratch_expect("a.svg", "mine");
  remove(path);
  ef_series s = ef_series_default(EF_SERIES_PAIRS);
  s.n = 1;
  s.x = s.y = &(double){1.0};
  assert_int_equal(ef_chart_add(chart, &s, &error), EF_INVALID);
  assert_error(&error, EF_INVALID, "lacks an array that its kind needs");
  s.look = EF_LOOKS;
  assert_int_equal(ef_chart_add(chart, &s, &error), EF_INVALID);
  assert_error(&error, EF_INVALID, "a look of a chart is -1 to 7, not 8");
  ef_chart_free(chart);

  chart = new_chart("nothing", false);
  s = ef_series_default(EF_SERIES_LINE);
  s.n = 1;
  s.x = s.y = &(double){NOT_A_NUMBER};
  add(chart, &s);
  assert_int_equal(ef_chart_write(chart, path, NULL, &error), EF_INVALID);
  assert_error(&error, EF_INVALID, "there is nothing to draw");
  ef_chart_free(chart);
  ef_chart_settings settings = ef_chart_settings_default();
  settings.width_px = 100;
  assert_null(ef_chart_new(&settings, &error));
  assert_error(&error, EF_INVALID, "240 to 4000 px wide, not 100");
  assert_int_equal(scratch_count(), 0);
}

/* One point, points on one spot, huge and tiny ranges: all can be drawn. */
static void test_odd_ranges(void **state) {
  (void)state;
  static const double values[][2] = {{5.0, 5.0},     {0.0, 0.0},
                                     {1e-12, 2e-12}, {-1e15, 1e15},
                                     {1e9, 1e9 + 1}, {-3.0, -2.9}};
  for (size_t i = 0; i < sizeof values / sizeof *values; ++i) {
    for (int equal = 0; equal <= 1; ++equal) {
      ef_series s = ef_series_default(EF_SERIES_LINE);
      s.n = 2;
      s.x = s.y = values[i];
      ef_chart *chart = new_chart(NULL, equal);
      add(chart, &s);
      char *svg = draw(chart, "a.svg", NULL);
      assert_null(strstr(svg, "nan"));
      assert_null(strstr(svg, "inf"));
      free(svg);
    }
  }
}

static bool try_chart(void *context) {
  (void)context;
  ef_chart_settings settings = ef_chart_settings_default();
  static const char *const row[] = {NULL, "upper", "lower", "lowest"};
  settings.title = "title";
  settings.n_rows = 4;
  settings.row = row;
  ef_chart *chart = ef_chart_new(&settings, NULL);
  if (chart == NULL)
    return false;
  const double x[] = {1.0, 2.0}, y[] = {1.0, 3.0};
  const char *const label[] = {"one", "two"};
  ef_series s = ef_series_default(EF_SERIES_PAIRS);
  s.name = "pairs";
  s.n = 2;
  s.x = s.to_y = x;
  s.y = s.to_x = y;
  s.label = label;
  bool done = ef_chart_add(chart, &s, NULL) == EF_OK;
  if (done) {
    ef__page page;
    ef_chart_report report;
    done = ef__chart_draw(chart, &page, &report, NULL) == EF_OK;
    ef__page_free(&page);
  }
  ef_chart_free(chart);
  return done;
}

static void test_without_memory(void **state) {
  (void)state;
  assert_true(fail_alloc_each(try_chart, NULL) > 10);
}

/* ---- Inks -------------------------------------------------------------- */

/* IEC 61966-2-1: the curve, and the primaries with the white of D65 to four
 * decimals; Y = 100 for white. */
static ef_xyz ink_xyz(uint32_t rgb) {
  double v[3];
  for (unsigned i = 0; i < 3; ++i) {
    const double code = (rgb >> (16 - 8 * i) & 255u) / 255.0;
    v[i] = code <= 0.04045 ? code / 12.92 : pow((code + 0.055) / 1.055, 2.4);
  }
  return (ef_xyz){100 * (0.4124 * v[0] + 0.3576 * v[1] + 0.1805 * v[2]),
                  100 * (0.2126 * v[0] + 0.7152 * v[1] + 0.0722 * v[2]),
                  100 * (0.0193 * v[0] + 0.1192 * v[1] + 0.9505 * v[2])};
}

static uint32_t ink_on(int ink, bool is_dark) {
  return is_dark ? ef__ink_at(ink)->dark : ef__ink_at(ink)->light;
}

/* WCAG 2.2, "contrast ratio" and "relative luminance", whose step of the curve
 * at 0.03928 parts no code of 8 bits from the one above. */
static double contrast(uint32_t a, uint32_t b) {
  const double first = ink_xyz(a).Y / 100, second = ink_xyz(b).Y / 100;
  return (fmax(first, second) + 0.05) / (fmin(first, second) + 0.05);
}

/* Text 4.5 : 1 (WCAG 2.2, 1.4.3), that of the body 7 : 1 (1.4.6); marks, which
 * also have names in their ink, as much. An area's ink over the paper takes a
 * little of it from what stands on the area. */
static void test_inks_stand_out(void **state) {
  (void)state;
  assert_near(contrast(0xFFFFFF, 0), 21, 1e-9);
  /* A published pair: #767676 is the lightest grey of 4.5 : 1 on white. */
  assert_true(contrast(0xFFFFFF, 0x767676) >= 4.5);
  assert_true(contrast(0xFFFFFF, 0x777777) < 4.5);
  for (int dark = 0; dark < 2; ++dark) {
    const uint32_t paper = ink_on(EF__INK_PAPER, dark == 1);
    double least = INFINITE;
    assert_true(contrast(paper, ink_on(EF__INK_TEXT, dark == 1)) >= 7);
    for (int ink = EF__INK_SOFT; ink < EF__INKS; ++ink) {
      if (ink != EF__INK_FAINT)
        least = fmin(least, contrast(paper, ink_on(ink, dark == 1)));
    }
    printf("# least contrast on %s paper: %.2f : 1\n",
           dark == 1 ? "dark" : "light", least);
    assert_true(least >= 4.5);
  }
}

/* What a dichromat is taken to see of an ink on its paper, in CIELAB. */
static ef_lab seen_ink(const ef_observer *observer, ef_deficiency kind,
                       uint32_t ink) {
  const ef_xyz white = ink_xyz(0xFFFFFF);
  if (kind == EF_TRICHROMAT)
    return ef_xyz_to_lab(ink_xyz(ink), white);
  double to_cones[9], back[9], lms[3];
  assert_int_equal(ef_observer_cone_matrix(observer, to_cones, NULL, NULL),
                   EF_OK);
  assert_true(ef__mat3_inverse(to_cones, back));
  const ef_xyz neutral = ef_xyz_transform(to_cones, white);
  const ef_xyz cones = ef_xyz_transform(to_cones, ink_xyz(ink));
  ef_dichromat_view view;
  assert_int_equal(
      ef_dichromat_view_make(
          kind, observer, (double[3]){neutral.X, neutral.Y, neutral.Z}, &view,
          NULL),
      EF_OK);
  ef_dichromat_view_apply(&view, (double[3]){cones.X, cones.Y, cones.Z}, lms);
  return ef_xyz_to_lab(
      ef_xyz_transform(back, (ef_xyz){lms[0], lms[1], lms[2]}), white);
}

/* Any two looks differ by many just-noticeable differences for everybody; what
 * their marks and dashes add is not counted. */
static void test_looks_differ_for_dichromats(void **state) {
  (void)state;
  static const ef_deficiency kind[] = {EF_TRICHROMAT, EF_PROTANOPE,
                                       EF_DEUTERANOPE, EF_TRITANOPE};
  ef_observer *observer = ef_observer_new("cie-1931", NULL);
  const ef_metric *metric = ef_metric_find("ciede2000", NULL);
  for (size_t k = 0; k < 8; ++k) {
    const bool is_dark = k >= 4;
    double lab[EF_LOOKS][3], least = INFINITE;
    for (int i = 0; i < EF_LOOKS; ++i) {
      const ef_lab at =
          seen_ink(observer, kind[k % 4], ink_on(EF__INK_LOOK + i, is_dark));
      lab[i][0] = at.L_star;
      lab[i][1] = at.a_star;
      lab[i][2] = at.b_star;
      for (int j = 0; j < i; ++j)
        least = fmin(least, ef_metric_difference(metric, lab[i], lab[j]));
    }
    printf("# least difference on %s paper, %s: %.1f Delta E*00\n",
           is_dark ? "dark" : "light",
           kind[k % 4] == EF_TRICHROMAT ? "trichromat"
                                        : ef_deficiency_name(kind[k % 4]),
           least);
    assert_true(least >= (kind[k % 4] == EF_TRICHROMAT ? 18 : 9));
  }
  ef_observer_free(observer);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(test_macadam_ellipses_land),
      cmocka_unit_test(test_locus_lands),
      cmocka_unit_test(test_rows_have_names),
      cmocka_unit_test(test_ticks_are_readable),
      cmocka_unit_test(test_labels_never_collide),
      cmocka_unit_test(test_labels_keep_off_lines),
      cmocka_unit_test(test_markup_is_escaped),
      cmocka_unit_test(test_text_is_cleaned),
      cmocka_unit_test(test_lines_fit),
      cmocka_unit_test(test_a_million_points_are_thinned),
      cmocka_unit_test(test_thinning_leaves_no_hole),
      cmocka_unit_test(test_bytes_are_the_same),
      cmocka_unit_test(test_palettes),
      cmocka_unit_test(test_a_chart_as_pixels),
      cmocka_unit_test(test_refusals),
      cmocka_unit_test(test_odd_ranges),
      cmocka_unit_test(test_without_memory),
      cmocka_unit_test(test_inks_stand_out),
      cmocka_unit_test(test_looks_differ_for_dichromats),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, scratch_make, scratch_remove);
}

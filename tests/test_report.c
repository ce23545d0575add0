/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Reports as files: what is in them, how markup is kept out, and that they
 * appear whole or not at all; and the digests they carry. */
#include <setjmp.h>
#include <stdlib.h>
#include <unistd.h>

#include "near.h"
#include "scratch.h"

#include <evenfield/exchange.h>
#include <evenfield/picture.h>

/* ---- Digests ----------------------------------------------------------- */

static void digest_is(const char *bytes, size_t length, const char *expected) {
  char path[SCRATCH_PATH], text[EF_DIGEST_TEXT];
  scratch_write("a", bytes, length);
  scratch_path("a", path);
  assert_int_equal(ef_digest_file(path, text, NULL), EF_OK);
  assert_string_equal(text, expected);
  remove(path);
}

/* NIST's examples of SHA-256 with one and with two blocks (FIPS 180-2,
 * appendix B.1 to B.3: the third is a million times "a"), and of nothing. */
static void test_published_digests(void **state) {
  (void)state;
  digest_is("", 0,
            "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855");
  digest_is("abc", 3,
            "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
  digest_is("abcdbcdecdefdefgefghfghighijhijkijkljklmklmnlmnomnopnopq", 56,
            "248d6a61d20638b8e5c026930c3e6039a33ce45964ff2167f6ecedd419db06c1");
  enum { MILLION = 1000000 };
  char *many = malloc(MILLION);
  assert_non_null(many);
  memset(many, 'a', MILLION);
  digest_is(many, MILLION,
            "cdc76e5c9914fb9281a1c7e284d73e67f1809a48a497200e046d39ccc7112cd0");
  free(many);
}

/* Of every length about the ends of blocks: a file and the same bytes of the
 * built-in scenario have one digest, and no two lengths share one. */
static void test_digest_laws(void **state) {
  (void)state;
  char path[SCRATCH_PATH], built_in[EF_DIGEST_TEXT], copy[EF_DIGEST_TEXT];
  size_t length;
  for (size_t i = 0; i < ef_demo_count(); ++i) {
    char name[80];
    const char *text = ef_demo_text(i, &length);
    snprintf(name, sizeof name, "demo:%.60s", ef_demo_name(i));
    assert_int_equal(ef_digest_file(name, built_in, NULL), EF_OK);
    digest_is(text, length, built_in);
  }
  char last[EF_DIGEST_TEXT] = "";
  const char zeros[200] = {0};
  scratch_path("b", path);
  for (size_t n = 0; n < sizeof zeros; ++n) {
    scratch_write("b", zeros, n);
    assert_int_equal(ef_digest_file(path, copy, NULL), EF_OK);
    assert_int_equal(strlen(copy), 64);
    assert_string_not_equal(copy, last);
    memcpy(last, copy, sizeof last);
  }
  remove(path);
  ef_error error = {0};
  assert_int_equal(ef_digest_file(path, copy, &error), EF_UNREADABLE);
  assert_error(&error, EF_UNREADABLE, "cannot be read: No such file");
  assert_int_equal(ef_digest_file("demo:none", copy, &error), EF_UNKNOWN_NAME);
}

/* ---- Pages ------------------------------------------------------------- */

static const ef_report_halves halves = {"target", "what is shown", "no match"};

static ef_chart *small_chart(void) {
  static const double x[] = {1.0, 2.0}, y[] = {1.0, 3.0};
  static const char *const label[] = {"<one>", "two"};
  ef_chart_settings settings = ef_chart_settings_default();
  settings.title = "a \"chart\"";
  settings.description = "what & where";
  settings.width_px = 400;
  ef_chart *chart = ef_chart_new(&settings, NULL);
  if (chart == NULL)
    return NULL;
  ef_series s = ef_series_default(EF_SERIES_REGION);
  s.n = 2;
  s.x = x;
  s.y = y;
  s.label = label;
  if (ef_chart_add(chart, &s, NULL) == EF_OK)
    return chart;
  ef_chart_free(chart);
  return NULL;
}

/* Two sections with one part of each kind. */
static ef_status write_page(const char *path, ef_error *error) {
  static const ef_report_column column[] = {
      {"Target", "", true}, {"Amount", "red", false}, {NULL, "blue", false}};
  static const char *const cell[] = {"hull <navy>", "2.3", "15.2",
                                     "rail & mast", "98",  "3"};
  const ef_swatch swatch = {.name = "<i>paint</i>",
                            .target = {20.0, 20.0, 20.0},
                            .match = {20.0, 21.0, 20.0},
                            .difference = 1.234};
  ef_swatch_settings settings = ef_swatch_settings_default();
  settings.width = 64;
  settings.difference_symbol = "Delta E*00";
  ef_report *r = ef_report_open(path, "asked <here>", false, error);
  if (r == NULL)
    return EF_UNWRITABLE;
  ef_report_answer(r, "Yes & no.");
  ef_report_paragraph(r, "Before all <b>sections</b>.");
  ef_report_section(r, "First");
  ef_report_term(r, "Display", "a kiosk");
  ef_report_term(r, "", "and more of it");
  ef_report_term_code(r, "Command", "evenfield 'x'");
  ef_report_swatches(r, 1, &swatch, &settings, &halves, NULL);
  ef_chart *chart = small_chart();
  if (chart == NULL) {
    ef_report_discard(r);
    return EF_NO_MEMORY;
  }
  ef_report_chart(r, chart);
  ef_report_chart(r, chart);
  ef_chart_free(chart);
  ef_report_section(r, "Second");
  ef_report_table(r, "Second", 3, column, 2, cell);
  ef_report_caution(r, "Care is taken.");
  ef_report_front(r, "In front");
  return ef_report_close(r, error);
}

/* Every element that is opened is closed, in order; elements of HTML without an
 * end apart. */
static void assert_balanced(const char *html) {
  static const char *const empty[] = {"meta", "link", "br", "img"};
  char open[64][16];
  size_t n = 0;
  for (const char *at = html; (at = strchr(at, '<')) != NULL; ++at) {
    if (at[1] == '!')
      continue;
    const bool ends = at[1] == '/';
    char name[16];
    const char *from = at + (ends ? 2 : 1);
    const size_t length = strcspn(from, " >/\n");
    assert_true(length > 0 && length < sizeof name);
    memcpy(name, from, length);
    name[length] = '\0';
    const char *close = strchr(at, '>');
    assert_non_null(close);
    bool is_empty = close[-1] == '/';
    for (size_t i = 0; i < 4; ++i)
      is_empty = is_empty || strcmp(name, empty[i]) == 0;
    if (ends) {
      assert_true(n > 0);
      assert_string_equal(open[--n], name);
    } else if (!is_empty) {
      assert_true(n < 64);
      memcpy(open[n++], name, sizeof name);
    }
  }
  assert_int_equal(n, 0);
}

static size_t count(const char *text, const char *piece) {
  size_t n = 0;
  for (const char *at = text; (at = strstr(at, piece)) != NULL; ++at)
    ++n;
  return n;
}

static char *page(void) {
  char path[SCRATCH_PATH];
  scratch_path("page.html", path);
  ef_error error = {0};
  if (write_page(path, &error) != EF_OK)
    fail_msg("%s", error.message);
  size_t length;
  char *html = scratch_read("page.html", &length);
  remove(path);
  return html;
}

static void test_a_page_is_sound(void **state) {
  (void)state;
  char *html = page();
  assert_balanced(html);
  assert_int_equal(strncmp(html, "<!DOCTYPE html>\n", 16), 0);
  /* Nothing runs, nothing is fetched: no address but the name of SVG. */
  assert_null(strstr(html, "<script"));
  assert_int_equal(count(html, "http"),
                   count(html, "http://www.w3.org/2000/svg") +
                       count(html, "http-equiv"));
  assert_int_equal(count(html, "src="), count(html, "src=\"data:image/png"));
  /* One of each landmark, one heading of the page. */
  static const char *const once[] = {
      "<header>",          "<nav ", "<main>",
      "<footer>",          "<h1>",  "<title>asked",
      "<html lang=\"en\">"};
  for (size_t i = 0; i < sizeof once / sizeof *once; ++i)
    assert_int_equal(count(html, once[i]), 1);
  assert_non_null(strstr(html, "<h1>Yes &amp; no.</h1>"));
  assert_non_null(strstr(html, "prefers-color-scheme:dark"));
  free(html);
}

static void test_markup_is_escaped(void **state) {
  (void)state;
  char *html = page();
  assert_null(strstr(html, "<i>"));
  assert_null(strstr(html, "<b>"));
  assert_null(strstr(html, "<one>"));
  assert_non_null(strstr(html, "asked &lt;here&gt;"));
  assert_non_null(strstr(html, "hull &lt;navy&gt;"));
  assert_non_null(strstr(html, "alt=\"&lt;i&gt;paint&lt;/i&gt;: target"));
  assert_non_null(strstr(html, "aria-label=\"a &quot;chart&quot;\""));
  free(html);
}

static void test_parts_say_what_they_are(void **state) {
  (void)state;
  char *html = page();
  assert_non_null(
      strstr(html, "<tr><th class=\"t\" rowspan=\"2\" scope=\"col\">Target</th>"
                   "<th class=\"g\" colspan=\"2\" scope=\"colgroup\">Amount</th>"
                   "</tr>\n<tr><th scope=\"col\" class=\"g\">red</th>"
                   "<th scope=\"col\">blue</th>"
                   "</tr>"));
  assert_non_null(strstr(html, "<tr><th scope=\"row\" class=\"t\">rail &amp; "
                               "mast</th><td class=\"g\">98</td><td>3</td></tr>"));
  assert_non_null(strstr(html, "<dt>Display</dt>\n<dd>a kiosk<br>\nand more of "
                               "it</dd>\n<dt>Command</dt>"));
  const char *front = strstr(html, ">In front</h2>");
  assert_true(front != NULL && front < strstr(html, ">First</h2>"));
  assert_non_null(strstr(html, "&gt;: target left, what is shown right; no "
                               "match\""));
  assert_non_null(strstr(html, "<br>1.23 Delta E*00</figcaption>"));
  assert_non_null(strstr(html, "<figcaption>what &amp; where</figcaption>"));
  assert_int_equal(count(html, "<svg "), 2);
  /* Ids of two charts differ. */
  assert_int_equal(count(html, "id=\"c1-clip1\""), 1);
  assert_int_equal(count(html, "id=\"c2-clip1\""), 1);
  free(html);
}

/* The picture in the page is the one that the library writes to a file. */
static void test_pictures_survive(void **state) {
  (void)state;
  char *html = page();
  const char *at = strstr(html, "base64,") + 7;
  const size_t digits = strcspn(at, "\"");
  assert_int_equal(digits % 4, 0);
  unsigned char *bytes = malloc(digits);
  size_t n = 0;
  static const char digit[] = "ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuv"
                              "wxyz0123456789+/";
  uint32_t bits = 0;
  for (size_t i = 0; i < digits && at[i] != '='; ++i) {
    bits = bits << 6 | (uint32_t)(strchr(digit, at[i]) - digit);
    if (i % 4 != 0)
      bytes[n++] = (unsigned char)(bits >> (6 - 2 * (i % 4)));
  }
  free(html);
  const ef_swatch swatch = {
      .name = "", .target = {20.0, 20.0, 20.0}, .match = {20.0, 21.0, 20.0}};
  ef_swatch_settings settings = ef_swatch_settings_default();
  settings.width = 64;
  char path[SCRATCH_PATH];
  scratch_path("a.png", path);
  ef_swatch_report report;
  assert_int_equal(ef_swatch_write(path, &swatch, &settings, &report, NULL),
                   EF_OK);
  size_t length;
  char *file = scratch_read("a.png", &length);
  remove(path);
  assert_int_equal(n, length);
  assert_memory_equal(bytes, file, length);
  free(file);
  free(bytes);
}

/* ---- Whole or not at all ----------------------------------------------- */

static void test_nothing_is_left_behind(void **state) {
  (void)state;
  char path[SCRATCH_PATH];
  ef_error error = {0};
  scratch_path("page.html", path);
  ef_report *r = ef_report_open(path, "title", false, &error);
  assert_non_null(r);
  ef_report_section(r, "begun");
  ef_report_discard(r);
  assert_int_equal(scratch_count(), 0);
  scratch_write("page.html", "mine", 4);
  assert_null(ef_report_open(path, "title", false, &error));
  assert_int_equal(error.status, EF_EXISTS);
  scratch_expect("page.html", "mine");
  remove(path);
  /* A picture that cannot be: the first error is told, no page appears. */
  r = ef_report_open(path, "title", false, &error);
  assert_non_null(r);
  const ef_swatch swatch = {.name = "bad", .target = {NOT_A_NUMBER, 1.0, 1.0}};
  const ef_swatch_settings settings = ef_swatch_settings_default();
  ef_report_swatches(r, 1, &swatch, &settings, &halves, NULL);
  ef_report_paragraph(r, "after it");
  assert_int_equal(ef_report_close(r, &error), EF_INVALID);
  assert_error(&error, EF_INVALID, "the pair bad has a tristimulus value");
  assert_int_equal(scratch_count(), 0);
}

static void test_a_full_disk(void **state) {
  (void)state;
  if (access("/dev/full", W_OK) != 0) {
    print_message("# /dev/full is not here: not tested\n");
    return;
  }
  ef_error error = {0};
  ef_report *r = ef_report_open("/dev/full", "title", false, &error);
  assert_non_null(r);
  for (size_t i = 0; i < 20000; ++i)
    ef_report_paragraph(r, "some text that fills the buffer");
  assert_int_equal(ef_report_close(r, &error), EF_UNWRITABLE);
  assert_error(&error, EF_UNWRITABLE, "no space is left");
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(test_published_digests),
      cmocka_unit_test(test_digest_laws),
      cmocka_unit_test(test_a_page_is_sound),
      cmocka_unit_test(test_markup_is_escaped),
      cmocka_unit_test(test_parts_say_what_they_are),
      cmocka_unit_test(test_pictures_survive),
      cmocka_unit_test(test_nothing_is_left_behind),
      cmocka_unit_test(test_a_full_disk),
  };
  cmocka_set_message_output(CM_OUTPUT_TAP);
  return cmocka_run_group_tests(tests, scratch_make, scratch_remove);
}

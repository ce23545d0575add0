/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "render_match.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "dichromat.h"
#include "message.h"
#include "text.h"
#include "words.h"

/* A person reads so many rows; of a longer list the worst are shown. */
enum { MOST_ROWS = 200, WORST_ROWS = 50, MOST_READINGS = 12 };

struct match_text {
  ef_output *output;
  kept_row *row; /* MOST_ROWS + 1 */
  size_t n_rows, n_seen;
  bool worst_only;
};

/* ---- Which rows are kept ----------------------------------------------- */

static int by_difference(const void *a, const void *b) {
  const kept_row *p = a, *q = b;
  if (p->difference != q->difference) {
    return p->difference < q->difference ? 1 : -1;
  }
  return (p->order > q->order) - (p->order < q->order);
}

/* By how far the target lies outside the gamut, the codes apart. */
static int by_miss(const void *a, const void *b) {
  const kept_row *p = a, *q = b;
  const double x = p->match.nearest.difference;
  const double y = q->match.nearest.difference;
  if (x != y)
    return x < y ? 1 : -1;
  return (p->order > q->order) - (p->order < q->order);
}

static void kept_row_free(kept_row *row) {
  free(row->name);
  free(row->view);
  free(row->recipe);
}

/* Keeps the worst once there are more than a person reads. */
static void thin(match_text *t) {
  t->worst_only = true;
  qsort(t->row, t->n_rows, sizeof *t->row, by_difference);
  while (t->n_rows > WORST_ROWS)
    kept_row_free(&t->row[--t->n_rows]);
}

/* Views and recipes of row `i`, as far as there are any. */
static bool copy_more(kept_row *row, const match_scene *s,
                      const match_rows *rows, size_t i) {
  const size_t n = s->lights.n;
  if (rows->view != NULL) {
    row->view = malloc(n * sizeof *row->view);
    if (row->view == NULL)
      return false;
    memcpy(row->view, rows->view + i * n, n * sizeof *row->view);
  }
  if (rows->recipe != NULL) {
    row->recipe = malloc(sizeof *row->recipe);
    if (row->recipe == NULL)
      return false;
    *row->recipe = rows->recipe[i];
  }
  return true;
}

static ef_status keep(void *self, const match_scene *s, const match_rows *rows,
                      ef_error *error) {
  match_text *t = self;
  for (size_t i = 0; i < rows->n; ++i) {
    const ef_match *match = &rows->match[i];
    const ef_spread spread =
        rows->spread != NULL ? rows->spread[i] : (ef_spread){0};
    const double difference = rows->spread != NULL
                                  ? spread.p95
                                  : match_achieved(s, match)->difference;
    const size_t order = t->n_seen++;
    if (t->worst_only && t->n_rows >= WORST_ROWS &&
        difference <= t->row[WORST_ROWS - 1].difference) {
      continue;
    }
    kept_row *row = &t->row[t->n_rows++];
    *row = (kept_row){.name = strdup(rows->name[i]),
                      .order = order,
                      .match = *match,
                      .spread = spread,
                      .difference = difference};
    if (row->name == NULL || !copy_more(row, s, rows, i))
      return message_fail(error, EF_NO_MEMORY, "out of memory for the rows");
    if (t->n_rows > MOST_ROWS)
      thin(t);
  }
  return EF_OK;
}

/* ---- The answer -------------------------------------------------------- */

static double hue_of(const match_scene *s, ef_xyz xyz) {
  const ef_lab lab = ef_xyz_to_lab(xyz, ef_setup_white(s->setup));
  return ef_lab_to_lch(lab).h_deg;
}

static bool is_flat(const match_scene *s) {
  return ef_observer_dimensions(s->observer) < 3;
}

static const device_words *words_of(const match_scene *s) {
  return &s->device.kind->words;
}

/* "This display can show", or whom it is for when that is not everybody. */
static void add_device(text *t, const match_scene *s, const char *can) {
  ef_cone_model model;
  if (is_flat(s) && ef_observer_model(s->observer, &model)) {
    text_format(t, "To a %s this", ef_deficiency_name(model.deficiency));
  } else {
    text_add(t, "This");
  }
  text_format(t, " %s %s %s ", words_of(s)->noun, can, words_of(s)->shows);
}

/* "8-bit codes", "steps of 1 %". */
static void codes_text(const match_scene *s, char out[40]) {
  if (s->device.bits > 0)
    snprintf(out, 40, "%d-bit codes", s->device.bits);
  else
    snprintf(out, 40, "steps of %s", s->device.step);
}

/* Of colours in two dimensions lightness and chroma are all there is to say. */
static void add_direction(const match_scene *s, ef_components parts,
                          ef_xyz target, char direction[WORDS_ROOM]) {
  if (is_flat(s))
    parts.hue = 0.0;
  words_direction(parts, hue_of(s, target), direction);
}

/* "5.32 Delta E*00 (5.3 JND)" */
static void add_difference(text *t, const match_scene *s, double value) {
  char amount[EF_NUMBER_TEXT], jnds[EF_NUMBER_TEXT];
  words_amount(value, amount);
  text_format(t, "%s %s", amount, ef_metric_symbol(s->metric));
  if (isnan(s->jnd.value))
    return;
  ef_number_format_fixed(value / s->jnd.value, 1, jnds);
  text_format(t, " (%s JND)", jnds);
}

static void add_answer_for_one(text *t, const match_scene *s,
                               const match_summary *sum) {
  if (sum->n_in_gamut == 1) {
    add_device(t, s, "can");
    text_add(t, sum->worst_name);
    if (s->device.bits > 0)
      text_format(t, "; its best %d-bit code is off by ", s->device.bits);
    else if (device_is_quantised(&s->device))
      text_format(t, "; in steps of %s it is off by ", s->device.step);
    if (device_is_quantised(&s->device))
      add_difference(t, s, sum->worst);
    return;
  }
  char direction[WORDS_ROOM];
  add_direction(s, sum->worst_miss_parts, sum->worst_miss_target, direction);
  add_device(t, s, "cannot");
  text_format(t, "%s: the nearest colour it has is off by ", sum->worst_name);
  add_difference(t, s, sum->worst_miss);
  text_format(t, ", %s", direction);
}

static void add_answer_for_all(text *t, const match_scene *s,
                               const match_summary *sum) {
  add_device(t, s, "can");
  text_format(t, "all %zu targets", sum->n);
  if (!device_is_quantised(&s->device))
    return;
  char codes[40];
  codes_text(s, codes);
  text_format(t, "; %s %s the worst, %s, is off by ",
              s->device.bits > 0 ? "as" : "in", codes, sum->worst_name);
  add_difference(t, s, sum->worst);
}

static void add_answer_for_some(text *t, const match_scene *s,
                                const match_summary *sum) {
  const size_t n_out = sum->n - sum->n_in_gamut;
  add_device(t, s, "can");
  if (sum->n_in_gamut == 0) {
    text_format(t, "none of the %zu targets", sum->n);
  } else {
    text_format(t, "%zu of the %zu targets", sum->n_in_gamut, sum->n);
  }
  if (sum->n_near > 0) {
    text_format(t, "%s%zu more to within one JND",
                sum->n_in_gamut == 0 ? ", " : " and ", sum->n_near);
  }
  if (n_out == 1) {
    text_format(t, "; it misses %s by ", sum->worst_miss_name);
  } else {
    text_format(t, "; the worst miss is %s, by ", sum->worst_miss_name);
  }
  add_difference(t, s, sum->worst_miss);
  if (device_is_quantised(&s->device) && sum->worst_in_gamut > s->jnd.value) {
    char codes[40];
    codes_text(s, codes);
    text_format(t, ". %c%s put others off by up to ",
                codes[0] == 's' ? 'S' : codes[0], codes + 1);
    add_difference(t, s, sum->worst_in_gamut);
  }
}

/* The first line: how many targets can be shown, and the worst miss. */
static void add_answer(text *t, const match_scene *s,
                       const match_summary *sum) {
  if (sum->n == 1) {
    add_answer_for_one(t, s, sum);
  } else if (sum->n_in_gamut == sum->n) {
    add_answer_for_all(t, s, sum);
  } else {
    add_answer_for_some(t, s, sum);
  }
  text_add(t, ".\n");
}

static void add_second_lines(text *t, const match_scene *s,
                             const match_summary *sum) {
  const chosen_device *d = &s->device;
  if (s->demo_targets && d->is_demo) {
    text_format(t,
                "No files were named, so this is the built-in demo: a ferry's "
                "painted colours\n(demo:livery) %s (%s).\n",
                d->kind->demo_story, d->source);
  } else if (s->demo_targets) {
    text_add(t, "No targets were named, so these are the demo's painted "
                "colours (demo:livery).\n");
  } else if (d->is_demo) {
    text_format(t, "No %s was named, so this is %s (%s).\n",
                d->kind->words.noun, d->kind->demo_device, d->source);
  }
  if (s->options->check) {
    char tolerance[EF_NUMBER_TEXT];
    ef_number_format(s->tolerance, tolerance);
    text_format(t,
                "Check: %zu of %zu targets differ by more than the "
                "tolerance of %s %s.\n",
                sum->n_beyond, sum->n, tolerance, ef_metric_symbol(s->metric));
  }
  if (sum->n_skipped > 0) {
    text_format(t, "%zu rows were at fault and are left out.\n",
                sum->n_skipped);
  }
}

/* ---- The table --------------------------------------------------------- */

static void start_table(text_table *t, const match_scene *s,
                        const char *codes) {
  const ef_device *device = s->device.device;
  const size_t n = ef_device_n_drives(device);
  table_column(t, "Target", "", true);
  table_column(t, "In", "gamut", true);
  if (render_match_mixes(s))
    render_match_recipe_columns(t, s);
  for (size_t i = 0; i < n && !render_match_mixes(s); ++i) {
    table_column(t, i == 0 ? words_of(s)->amounts : NULL,
                 ef_device_drive_name(device, i), false);
  }
  for (size_t i = 0; i < n && s->device.bits > 0; ++i) {
    table_column(t, i == 0 ? codes : NULL, ef_device_drive_name(device, i),
                 false);
  }
  table_column(t, "Off by", ef_metric_symbol(s->metric), false);
  if (!isnan(s->jnd.value))
    table_column(t, NULL, "JND", false);
}

static const char *in_gamut_word(const match_scene *s, const ef_match *m) {
  if (m->in_gamut)
    return "yes";
  return m->nearest.difference <= s->jnd.value ? "nearly" : "no";
}

/* Of drives in whole steps as many as the step has, and two else. */
static int decimals_of(const match_scene *s) {
  if (s->device.n_steps == 0)
    return 2;
  const double step = 100.0 / s->device.n_steps;
  int decimals = 0;
  for (double x = step; decimals < 4 && fabs(x - round(x)) > 1e-9; x *= 10)
    ++decimals;
  return decimals;
}

/* Of a subtractive device the drives, which are what is printed from; else the
 * amounts, which are what is seen. */
static double amount_of(const match_scene *s, const ef_shown *shown, size_t i) {
  return 100.0 *
         (s->device.is_subtractive ? shown->drive[i] : shown->amount[i]);
}

static void add_table(text *out, const match_text *m, const match_scene *s) {
  text_table t = table_new();
  const size_t n = ef_device_n_drives(s->device.device);
  const int decimals = decimals_of(s);
  char codes[40];
  snprintf(codes, sizeof codes, "Code, %d bit", s->device.bits);
  start_table(&t, s, codes);
  for (size_t k = 0; k < m->n_rows; ++k) {
    const ef_match *match = &m->row[k].match;
    const ef_shown *shown = match_achieved(s, match);
    table_cell(&t, m->row[k].name);
    table_cell(&t, in_gamut_word(s, match));
    if (render_match_mixes(s))
      render_match_recipe_cells(&t, s, &m->row[k]);
    for (size_t i = 0; i < n && !render_match_mixes(s); ++i) {
      table_number(&t, amount_of(s, shown, i), decimals);
    }
    for (size_t i = 0; i < n && s->device.bits > 0; ++i) {
      table_format(&t, "%u", (unsigned)match->code[i]);
    }
    table_number(&t, shown->difference, 2);
    if (!isnan(s->jnd.value))
      table_number(&t, shown->jnds, 1);
  }
  text_add(out, "\n");
  if (m->worst_only) {
    text_format(out, "The %zu worst of %zu targets (--format csv gives all):\n",
                m->n_rows, m->n_seen);
  }
  table_finish(&t, out);
}

/* ---- Out of gamut ------------------------------------------------------ */

/* "a, b and c" piece by piece: what goes before piece `i` of `n`. */
static const char *joint(size_t i, size_t n) {
  return i == 0 ? "" : i + 1 == n ? " and " : ", ";
}

static void add_limits(text *t, const ef_device *device, const ef_match *m) {
  const char *name[2 * EF_MAX_DRIVES];
  size_t n = 0;
  for (size_t i = 0; i < ef_device_n_drives(device); ++i) {
    const uint32_t bit = (uint32_t)1 << i;
    if (m->held_low & bit)
      name[n++] = ef_device_limit_name(device, i, false);
    if (m->held_high & bit)
      name[n++] = ef_device_limit_name(device, i, true);
  }
  for (size_t i = 0; i < n; ++i) {
    text_format(t, "%s%s", joint(i, n), name[i]);
  }
}

static void add_percent(text *t, double amount) {
  char number[EF_NUMBER_TEXT];
  ef_number_format_fixed(100.0 * amount, 1, number);
  text_format(t, "%s %%", number);
}

/* How far amount `i` lies outside its limits. */
static double excess(const ef_match *m, size_t i) {
  const double a = m->amount[i];
  return a < 0.0 ? -a : a > 1.0 ? a - 1.0 : 0.0;
}

/* Below a twentieth of a percent, which the figures do not show. */
static bool is_slight(double share) {
  return share < 0.0005;
}

/* "3.2 % of blue would have to be added to the target's side" */
static void add_negative(text *t, const ef_device *device, const ef_match *m,
                         size_t n, const size_t *which) {
  for (size_t k = 0; k < n; ++k) {
    text_add(t, joint(k, n));
    add_percent(t, excess(m, which[k]));
    text_format(t, " of %s", ef_device_drive_name(device, which[k]));
  }
  text_add(t, " would have to be added to the target's side");
}

/* "more red and green is needed than full drive gives" */
static void add_strong(text *t, const ef_device *device, size_t n,
                       const size_t *which) {
  text_add(t, "more ");
  for (size_t k = 0; k < n; ++k) {
    text_format(t, "%s%s", joint(k, n), ef_device_drive_name(device, which[k]));
  }
  text_add(t, " is needed than full drive gives");
}

/* The classical reading of the signed amounts: a negative one is light of that
 * primary added to the target, as in the matching experiments. */
static void add_reading(text *t, const ef_device *device, const ef_match *m) {
  const size_t n = ef_device_n_drives(device);
  size_t below[EF_MAX_DRIVES], above[EF_MAX_DRIVES];
  size_t n_below = 0, n_above = 0;
  for (size_t i = 0; i < n; ++i) {
    if (is_slight(excess(m, i)))
      continue;
    if (m->amount[i] < 0.0)
      below[n_below++] = i;
    else
      above[n_above++] = i;
  }
  if (n_below + n_above == 0) {
    text_add(t, " An exact match is less than 0.1 % of full drive away.");
    return;
  }
  text_add(t, " An exact match takes ");
  for (size_t i = 0; i < n; ++i) {
    text_format(t, "%s%s ", joint(i, n), ef_device_drive_name(device, i));
    add_percent(t, m->amount[i]);
  }
  text_add(t, ": ");
  if (n_below > 0)
    add_negative(t, device, m, n_below, below);
  if (n_below > 0 && n_above > 0)
    text_add(t, ", and ");
  if (n_above > 0)
    add_strong(t, device, n_above, above);
  text_add(t, ".");
}

static void add_miss(text *out, const match_scene *s, const kept_row *row) {
  const ef_match *m = &row->match;
  const ef_device *device = s->device.device;
  text t = {0};
  char direction[WORDS_ROOM], amount[EF_NUMBER_TEXT];
  add_direction(s, m->nearest.components, m->target, direction);
  text_format(&t, "%s: the nearest colour is off by ", row->name);
  add_difference(&t, s, m->nearest.difference);
  text_format(&t, ", %s; in the way: ", direction);
  add_limits(&t, device, m);
  text_add(&t, ".");
  if (m->hue_kept.found) {
    words_amount(m->hue_kept.difference, amount);
    text_format(&t, " With hue and lightness kept it is off by %s %s.", amount,
                ef_metric_symbol(s->metric));
  }
  if (ef_setup_affine(s->setup))
    add_reading(&t, device, m);
  text_add(out, "  ");
  text_wrap(out, t.bytes != NULL ? t.bytes : "", 4);
  out->failed = out->failed || t.failed;
  text_free(&t);
}

/* Too little to tell about: the two decimals of the table show nothing. */
static bool is_told(const kept_row *row) {
  return !row->match.in_gamut && row->match.nearest.difference >= 0.005;
}

static void add_misses(text *out, const match_text *m, const match_scene *s,
                       const match_summary *sum) {
  const size_t n_out = sum->n - sum->n_in_gamut;
  if (n_out == 0)
    return;
  kept_row *sorted = malloc(m->n_rows * sizeof *sorted);
  if (sorted == NULL) {
    out->failed = true;
    return;
  }
  memcpy(sorted, m->row, m->n_rows * sizeof *sorted);
  qsort(sorted, m->n_rows, sizeof *sorted, by_miss);
  size_t n_told = 0;
  text_format(out, "\nOut of this %s's gamut, the worst first:\n",
              words_of(s)->noun);
  for (size_t k = 0; k < m->n_rows && n_told < MOST_READINGS; ++k) {
    if (!is_told(&sorted[k]))
      continue;
    add_miss(out, s, &sorted[k]);
    ++n_told;
  }
  if (n_told < n_out) {
    const char *more = n_told > 0 ? " more" : "";
    if (n_told < MOST_READINGS) {
      text_format(out, "  %zu%s by less than 0.005 %s\n", n_out - n_told, more,
                  ef_metric_symbol(s->metric));
    } else {
      text_format(out, "  %zu%s (--format csv or json gives all)\n",
                  n_out - n_told, more);
    }
  }
  free(sorted);
}

static void add_pictures(text *out, const match_scene *s) {
  if (s->options->pictures == NULL)
    return;
  text t = {0};
  text_format(&t,
              "Pictures are in %.900s: a split field of each target (left the "
              "target, right what is %s%s), and all of them on sheet.png.",
              s->options->pictures, words_of(s)->shown,
              s->options->seen_by < 0
                  ? ", a striped corner where that is no exact match"
                  : "");
  if (s->options->seen_by >= 0) {
    text_format(&t,
                " They are drawn as a %s is taken to see them (Brettel, Vienot "
                "& Mollon 1997): a picture of a model, which tells nothing "
                "about the eyes of any one person. The striped corner tells "
                "where the halves then still differ by more than one JND.",
                dichromat_name(s->options->seen_by));
  }
  text_add(out, "\n");
  text_wrap(out, t.bytes != NULL ? t.bytes : "", 0);
  out->failed = out->failed || t.failed;
  text_free(&t);
}

static const char closing[] =
    "These figures hold for the observer named above. People differ from that "
    "observer and from each other, and what they see changes with the size of "
    "the field, its surround, brightness and glare: read a JND as a guide, and "
    "let eyes decide where it matters.";

/* ---- The sink ---------------------------------------------------------- */

static ef_status begin(void *self, const match_scene *s, ef_error *error) {
  (void)self;
  (void)s;
  (void)error;
  return EF_OK;
}

void match_text_answer(match_text *m, text *out, const match_scene *s,
                       const match_summary *sum) {
  if (m->worst_only)
    thin(m);
  add_answer(out, s, sum);
  render_match_people_answer(out, s, sum);
  add_second_lines(out, s, sum);
}

void match_text_rest(match_text *m, text *out, const match_scene *s,
                     const match_summary *sum) {
  text_section(out, "Targets and what is shown");
  add_table(out, m, s);
  render_match_people(out, s, sum, m->n_rows, m->row);
  render_match_lights(out, s, m->n_rows, m->row);
  add_misses(out, m, s, sum);
  add_pictures(out, s);
  render_match_basis(out, s, sum);
  text_add(out, "\n");
  text_section(out, "What to keep in mind");
  text_wrap(out, closing, 0);
}

size_t match_text_rows(const match_text *m, const kept_row **row) {
  *row = m->row;
  return m->n_rows;
}

static ef_status end(void *self, const match_scene *s, const match_summary *sum,
                     ef_error *error) {
  match_text *m = self;
  text out = {0};
  match_text_answer(m, &out, s, sum);
  match_text_rest(m, &out, s, sum);
  const ef_status status = text_write(&out, m->output, error);
  text_free(&out);
  return status;
}

match_text *match_text_new(ef_output *output) {
  match_text *t = calloc(1, sizeof *t);
  if (t == NULL)
    return NULL;
  t->output = output;
  t->row = malloc((MOST_ROWS + 1) * sizeof *t->row);
  if (t->row == NULL) {
    free(t);
    return NULL;
  }
  return t;
}

void match_text_free(match_text *t) {
  if (t == NULL)
    return;
  for (size_t i = 0; i < t->n_rows; ++i)
    kept_row_free(&t->row[i]);
  free(t->row);
  free(t);
}

match_sink match_text_sink(match_text *t) {
  return (match_sink){.self = t, .begin = begin, .rows = keep, .end = end};
}

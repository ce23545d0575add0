/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "command.h"

#include <math.h>
#include <string.h>

#include "diagram.h"
#include "message.h"
#include "panel_adjust.h"
#include "panel_calibrate.h"
#include "panel_calibrate_chart.h"
#include "panel_chart.h"
#include "panel_fit.h"
#include "panel_flicker.h"
#include "panel_next.h"
#include "panel_next_chart.h"
#include "panel_plan.h"
#include "panel_plan_chart.h"
#include "render_panel_calibrate.h"
#include "render_panel_fit.h"
#include "result.h"

typedef enum verb {
  VERB_FIT = 1,
  VERB_CALIBRATE = 2,
  VERB_NEXT = 4,
  VERB_PLAN = 8,
  VERB_FLICKER = 16,
  VERB_ADJUST = 32,
  VERB_ANSWERS = 15 /* all that are about answers */
} verb;

/* ---- Which options belong to which verb -------------------------------- */

typedef struct use {
  const char *option;
  bool is_given;
  unsigned verbs;
} use;

static exit_code check_uses(const char *name, verb v, size_t n,
                            const use *uses) {
  for (size_t i = 0; i < n; ++i) {
    if (uses[i].is_given && !(uses[i].verbs & (unsigned)v)) {
      return message_usage("--%s is not for `panel %s` (evenfield panel --help "
                           "says what it is for)",
                           uses[i].option, name);
    }
  }
  return EXIT_DONE;
}

static exit_code check_options(const command_options *o, const char *name,
                               verb v) {
  const use uses[] = {
      {"criterion", o->criterion != NULL, VERB_FIT | VERB_NEXT},
      {"chart", o->chart != NULL, VERB_ANSWERS},
      {"report", o->report != NULL, VERB_ANSWERS | VERB_FLICKER},
      {"model", o->model >= 0, VERB_FIT | VERB_NEXT},
      {"axis", o->axis >= 0, VERB_FIT | VERB_NEXT},
      {"lapse", !isnan(o->lapse), VERB_ANSWERS},
      {"seed", !isnan(o->seed), VERB_FIT | VERB_CALIBRATE | VERB_PLAN},
      {"samples", !isnan(o->samples), VERB_FIT | VERB_CALIBRATE | VERB_PLAN},
      {"levels", o->levels != NULL, VERB_NEXT | VERB_PLAN},
      {"precision", !isnan(o->precision), VERB_NEXT | VERB_PLAN},
      {"most", !isnan(o->most), VERB_NEXT},
      {"false-alarms", !isnan(o->false_alarms), VERB_NEXT | VERB_PLAN},
      {"expected-jnd", !isnan(o->expected_jnd), VERB_PLAN},
      {"other-jnd", !isnan(o->other_jnd), VERB_PLAN},
      {"spread", !isnan(o->spread), VERB_PLAN},
      {"pairs", o->pairs != NULL, VERB_CALIBRATE},
      {"metric", o->metric != NULL, VERB_CALIBRATE},
      {"exponent", o->exponent_text != NULL, VERB_CALIBRATE},
      {"save", o->save != NULL, VERB_CALIBRATE},
      {"observer", o->observer != NULL, VERB_CALIBRATE | VERB_FLICKER},
      {"task", o->task != NULL, VERB_ANSWERS},
      {"illuminant", o->illuminant != NULL, VERB_CALIBRATE},
      {"intervals", o->intervals >= 0, VERB_FIT},
  };
  return check_uses(name, v, sizeof uses / sizeof uses[0], uses);
}

/* ---- panel fit --------------------------------------------------------- */

static exit_code run_fit(const command_options *o) {
  message_sink sink = {.quiet = o->quiet};
  const ef_notes notes = message_notes(&sink);
  ef_error error = {0};
  panel_fits p;
  ef_output *output = NULL;
  ef_status status = panel_fits_load(&p, o, &notes, &error);
  if (status == EF_OK) {
    output = result_open(o, &error);
    if (output == NULL)
      status = error.status;
  }
  if (status == EF_OK && o->chart != NULL)
    status = panel_chart_write(&p, &notes, &error);
  if (status == EF_OK && o->report != NULL)
    status = panel_report_write(&p, &notes, &error);
  if (status == EF_OK) {
    status = o->format == FORMAT_TEXT
                 ? render_panel_fit_text(&p, output, &error)
                 : render_panel_fit_data(&p, output, &error);
  }
  panel_fits_free(&p);
  return result_close(output, status, &error);
}

/* ---- panel calibrate --------------------------------------------------- */

static exit_code check_calibrate(const command_options *o) {
  if (o->n_files < 2 && o->pairs != NULL)
    return message_usage("--pairs needs the file with the answers");
  if (o->n_files > 2 && o->pairs == NULL) {
    return message_usage("the samples of \"%.200s\" need --pairs, which says "
                         "which of them were shown together",
                         o->files[2]);
  }
  return EXIT_DONE;
}

static ef_status save_jnd(const panel_calibration *c, ef_error *error) {
  const command_options *o = c->options;
  if (o->save == NULL)
    return EF_OK;
  ef_output *output = ef_output_open(o->save, o->force, error);
  if (output == NULL) {
    if (error->status != EF_EXISTS)
      return error->status;
    message_fail(error, EF_EXISTS,
                 "is there already; --force overwrites it, or name another "
                 "file with --save");
    return message_place(error, o->save);
  }
  const ef_status status = render_panel_jnd(c, output, error);
  if (status == EF_OK)
    return ef_output_commit(output, error);
  ef_output_discard(output);
  return status;
}

static exit_code run_calibrate(const command_options *o) {
  const exit_code code = check_calibrate(o);
  if (code != EXIT_DONE)
    return code;
  message_sink sink = {.quiet = o->quiet};
  const ef_notes notes = message_notes(&sink);
  ef_error error = {0};
  panel_calibration c;
  ef_output *output = NULL;
  ef_status status = panel_calibration_load(&c, o, &notes, &error);
  if (status == EF_OK) {
    output = result_open(o, &error);
    if (output == NULL)
      status = error.status;
  }
  if (status == EF_OK)
    status = save_jnd(&c, &error);
  if (status == EF_OK && o->chart != NULL)
    status = panel_calibration_chart_write(&c, &notes, &error);
  if (status == EF_OK && o->report != NULL)
    status = panel_calibration_report_write(&c, &notes, &error);
  if (status == EF_OK)
    status = render_panel_calibrate(&c, output, &error);
  panel_calibration_free(&c);
  return result_close(output, status, &error);
}

/* ---- panel next -------------------------------------------------------- */

static exit_code run_next(const command_options *o) {
  if (o->n_files < 2 && o->levels != NULL) {
    return message_usage("--levels needs the file with the answers so far; its "
                         "header alone will do");
  }
  message_sink sink = {.quiet = o->quiet};
  const ef_notes notes = message_notes(&sink);
  ef_error error = {0};
  panel_next p;
  ef_output *output = NULL;
  ef_status status = panel_next_load(&p, o, &notes, &error);
  if (status == EF_OK) {
    output = result_open(o, &error);
    if (output == NULL)
      status = error.status;
  }
  if (status == EF_OK && o->chart != NULL)
    status = panel_next_chart_write(&p, &notes, &error);
  if (status == EF_OK && o->report != NULL)
    status = panel_next_report_write(&p, &notes, &error);
  if (status == EF_OK)
    status = render_panel_next(&p, output, &error);
  panel_next_free(&p);
  return result_close(output, status, &error);
}

/* ---- panel plan -------------------------------------------------------- */

static exit_code run_plan(const command_options *o) {
  if (isnan(o->expected_jnd)) {
    return message_usage("panel plan needs --expected-jnd, the JND to expect: "
                         "a published one (evenfield tables metrics), or that "
                         "of a pilot panel");
  }
  message_sink sink = {.quiet = o->quiet};
  const ef_notes notes = message_notes(&sink);
  ef_error error = {0};
  panel_plan p;
  ef_output *output = NULL;
  ef_status status = panel_plan_make(&p, o, &error);
  if (status == EF_OK) {
    output = result_open(o, &error);
    if (output == NULL)
      status = error.status;
  }
  if (status == EF_OK && o->chart != NULL)
    status = panel_plan_chart_write(&p, &notes, &error);
  if (status == EF_OK && o->report != NULL)
    status = panel_plan_report_write(&p, &notes, &error);
  if (status == EF_OK)
    status = render_panel_plan(&p, output, &error);
  return result_close(output, status, &error);
}

/* ---- panel flicker ----------------------------------------------------- */

static exit_code run_flicker(const command_options *o) {
  message_sink sink = {.quiet = o->quiet};
  const ef_notes notes = message_notes(&sink);
  ef_error error = {0};
  panel_flicker p;
  ef_output *output = NULL;
  ef_status status = panel_flicker_load(&p, o, &notes, &error);
  if (status == EF_OK) {
    output = result_open(o, &error);
    if (output == NULL)
      status = error.status;
  }
  if (status == EF_OK && o->report != NULL)
    status = panel_flicker_report_write(&p, &notes, &error);
  if (status == EF_OK)
    status = render_panel_flicker(&p, output, &error);
  panel_flicker_free(&p);
  return result_close(output, status, &error);
}

/* ---- panel adjust ------------------------------------------------------ */

static exit_code run_adjust(const command_options *o) {
  if (o->n_files < 2) {
    return message_usage("panel adjust needs the file with the settings: a "
                         "column setting, and standard and observer where "
                         "they are known");
  }
  message_sink sink = {.quiet = o->quiet};
  const ef_notes notes = message_notes(&sink);
  ef_error error = {0};
  panel_adjust p;
  ef_output *output = NULL;
  ef_status status = panel_adjust_load(&p, o, &notes, &error);
  if (status == EF_OK) {
    output = result_open(o, &error);
    if (output == NULL)
      status = error.status;
  }
  if (status == EF_OK)
    status = render_panel_adjust(&p, output, &error);
  panel_adjust_free(&p);
  return result_close(output, status, &error);
}

/* ---- Which verb -------------------------------------------------------- */

static const struct {
  const char *name;
  verb verb;
  size_t most_files;
  exit_code (*run)(const command_options *options);
} verbs[] = {
    {"fit", VERB_FIT, 1, run_fit},
    {"calibrate", VERB_CALIBRATE, 2, run_calibrate},
    {"next", VERB_NEXT, 1, run_next},
    {"plan", VERB_PLAN, 0, run_plan},
    {"flicker", VERB_FLICKER, 2, run_flicker},
    {"adjust", VERB_ADJUST, 1, run_adjust},
};
enum { N_VERBS = sizeof verbs / sizeof verbs[0] };

exit_code command_panel(const command_options *options) {
  const command_options *o = options;
  if (o->n_files == 0) {
    return message_usage("panel needs to know what to do: `evenfield panel "
                         "fit` shows the demo (evenfield panel --help lists "
                         "the rest)");
  }
  for (size_t i = 0; i < N_VERBS; ++i) {
    if (strcmp(o->files[0], verbs[i].name) != 0)
      continue;
    if (o->n_files > 1 + verbs[i].most_files) {
      return message_usage("too many files: \"%.200s\" is not expected",
                           o->files[1 + verbs[i].most_files]);
    }
    exit_code code = check_options(o, verbs[i].name, verbs[i].verb);
    if (code == EXIT_DONE)
      code = diagram_check_usage(o);
    return code == EXIT_DONE ? verbs[i].run(o) : code;
  }
  return message_usage("panel does not know \"%.100s\": it is fit, "
                       "calibrate, next, plan, flicker or adjust", o->files[0]);
}

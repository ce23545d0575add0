/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "panel_words.h"

#include <math.h>

#include "words.h"

enum { DIGITS = 3 };

const char panel_caution[] =
    "A threshold holds for the people, the light, the field and the time of "
    "looking that it was measured with. Where money or safety hangs on it, "
    "plan the panel before (evenfield panel plan), keep observers who cannot "
    "know what is shown, and repeat it.";

/* ---- Numbers ----------------------------------------------------------- */

/* Three digits of the smallest of a few. */
static int decimals_of(ef_estimate e) {
  const double width = e.high - e.low;
  const double size = isfinite(width) && width > 0.0
                          ? fmin(fabs(e.value), width)
                          : fabs(e.value);
  const int decimals = words_decimals(size, DIGITS);
  return decimals > 6 ? 6 : decimals;
}

void panel_add_number(text *out, double value, int decimals) {
  char number[EF_NUMBER_TEXT];
  ef_number_format_fixed(value, decimals, number);
  text_add(out, number);
}

void panel_add_limits(text *out, ef_estimate e, int decimals) {
  /* The interval of a size that reaches down to nothing is open below. */
  const bool is_open = isinf(e.low) || (e.low == 0.0 && e.value > 0.0);
  if (is_open && isinf(e.high)) {
    text_add(out, "any value");
  } else if (isinf(e.high)) {
    text_add(out, "at least ");
    panel_add_number(out, e.low, decimals);
  } else if (is_open) {
    text_add(out, "at most ");
    panel_add_number(out, e.high, decimals);
  } else {
    panel_add_number(out, e.low, decimals);
    text_add(out, " to ");
    panel_add_number(out, e.high, decimals);
  }
}

void panel_add_estimate(text *out, ef_estimate e, const char *unit) {
  const int decimals = decimals_of(e);
  panel_add_number(out, e.value, decimals);
  if (unit[0] != '\0')
    text_format(out, " %s", unit);
  if (isnan(e.low) || isnan(e.high))
    return;
  text_add(out, " (95 % interval ");
  panel_add_limits(out, e, decimals);
  text_add(out, ")");
}

void panel_add_jnd_words(text *out, ef_task task) {
  char percent[EF_NUMBER_TEXT];
  switch (task) {
  case EF_TASK_2IFC:
    text_add(out, "75 % right answers");
    break;
  case EF_TASK_TRIANGLE:
    ef_number_format_fixed(
        100.0 * ef_task_proportion(task, (double)NAN, EF_JND_D_PRIME), 1,
        percent);
    text_format(out, "%s %% right answers, which is the d' of 75 %% in 2IFC",
                percent);
    break;
  case EF_TASK_GREATER_LESS:
    text_add(out, "half of the way from 25 % to 75 % \"greater\"");
    break;
  default:
    text_add(out, "d' = 0.954 above the false alarms, the d' of 75 % right in "
                  "2IFC");
  }
}

void panel_chance_cell(text_table *t, double p) {
  if (p < 0.001)
    table_cell(t, "< 0.001");
  else
    table_number(t, p, 3);
}

void panel_add_factor(text *out, double log_sd) {
  char factor[EF_NUMBER_TEXT];
  if (exp(log_sd) < 1.005) {
    text_add(out, "no difference between people shows");
    return;
  }
  ef_number_format_fixed(exp(log_sd), 2, factor);
  text_format(out, "two of three people have one within a factor of %s of it",
              factor);
}

void panel_limit_cell(text_table *t, double value, int decimals) {
  if (isinf(value))
    table_cell(t, value < 0.0 ? "-" : "open");
  else
    table_number(t, value, decimals);
}

bool panel_is_open(ef_task task) {
  return isnan(ef_task_chance(task));
}

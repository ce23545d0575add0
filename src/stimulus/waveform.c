/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Modulations in time. */
#include <math.h>

#include "stimulus/stimulus_private.h"

#define PI 3.14159265358979323846

static const char *const names[] = {"steady", "sinusoid", "square"};
enum { N_KINDS = sizeof names / sizeof names[0] };

ef_waveform ef_waveform_default(void) {
  return (ef_waveform){
      .kind = EF_WAVEFORM_STEADY, .frequency_hz = 1, .duty = 0.5};
}

const char *ef_waveform_name(ef_waveform_kind kind) {
  return names[kind];
}

ef_status ef_waveform_find(const char *name, ef_waveform_kind *out,
                           ef_error *error) {
  for (size_t k = 0; k < N_KINDS; ++k) {
    if (!ef__name_equal(name, names[k]))
      continue;
    *out = (ef_waveform_kind)k;
    return EF_OK;
  }
  return ef__error_unknown(error, "waveform", name, names, N_KINDS);
}

size_t ef_waveform_frames(const ef_waveform *waveform, double frame_rate_hz) {
  const double n = round(waveform->duration_s * frame_rate_hz);
  return n > 1 ? (size_t)n : 1;
}

/* ---- Checks -------------------------------------------------------------- */

static ef_status check_numbers(const ef_waveform *w, double frame_rate_hz,
                               ef_error *error) {
  if (!(frame_rate_hz > 0 && frame_rate_hz <= 1e5)) {
    return ef__error_set(error, EF_INVALID,
                         "a frame rate of %g Hz; expected more than 0 and at "
                         "most 100000",
                         frame_rate_hz);
  }
  if (!(w->duration_s >= 0 && w->duration_s <= 1e6)) {
    return ef__error_set(error, EF_INVALID,
                         "a duration of %g s; expected 0 to 1000000",
                         w->duration_s);
  }
  if (!(w->ramp_s >= 0 && 2 * w->ramp_s <= w->duration_s)) {
    return ef__error_set(
        error, EF_INVALID,
        "ramps of %g s at the ends of %g s; expected 0 to half "
        "of the duration",
        w->ramp_s, w->duration_s);
  }
  if (!isfinite(w->phase_deg)) {
    return ef__error_set(error, EF_INVALID,
                         "a phase of %g degrees; expected a finite number",
                         w->phase_deg);
  }
  return EF_OK;
}

static ef_status check_cycle(const ef_waveform *w, double frame_rate_hz,
                             ef_error *error) {
  if (!(w->frequency_hz > 0)) {
    return ef__error_set(error, EF_INVALID,
                         "a frequency of %g Hz; expected more than 0",
                         w->frequency_hz);
  }
  if (w->frequency_hz > frame_rate_hz / 2) {
    return ef__error_set(error, EF_INVALID,
                         "%g Hz cannot be shown with %g frames a second; "
                         "expected at most %g Hz",
                         w->frequency_hz, frame_rate_hz, frame_rate_hz / 2);
  }
  if (w->kind == EF_WAVEFORM_SQUARE && !(w->duty > 0 && w->duty < 1)) {
    return ef__error_set(error, EF_INVALID,
                         "a square wave that is up for %g of its cycle; "
                         "expected more than 0 and less than 1",
                         w->duty);
  }
  if (w->duration_s > 0)
    return EF_OK;
  return ef__error_set(error, EF_INVALID,
                       "a %s of %g Hz needs a duration above 0",
                       ef_waveform_name(w->kind), w->frequency_hz);
}

ef_status ef_waveform_check(const ef_waveform *waveform, double frame_rate_hz,
                            const ef_notes *notes, ef_error *error) {
  ef_status status = check_numbers(waveform, frame_rate_hz, error);
  if (status != EF_OK || waveform->kind == EF_WAVEFORM_STEADY)
    return status;
  status = check_cycle(waveform, frame_rate_hz, error);
  if (status != EF_OK)
    return status;
  const double frames = frame_rate_hz / waveform->frequency_hz;
  if (fabs(frames - round(frames)) > 1e-9 * frames) {
    ef__note(notes,
             "a cycle of %g Hz takes %.6g frames at %g Hz: no two cycles are "
             "sampled alike",
             waveform->frequency_hz, frames, frame_rate_hz);
  }
  return EF_OK;
}

/* ---- Values -------------------------------------------------------------- */

double ef_waveform_at(const ef_waveform *waveform, double time_s) {
  const double cycles =
      waveform->frequency_hz * time_s + waveform->phase_deg / 360;
  const double part = cycles - floor(cycles);
  switch (waveform->kind) {
  case EF_WAVEFORM_SINUSOID:
    return sin(2 * PI * part);
  case EF_WAVEFORM_SQUARE:
    return part < waveform->duty ? 1 : -1;
  case EF_WAVEFORM_STEADY:
    break;
  }
  return 1;
}

double ef_waveform_ramp(const ef_waveform *waveform, double time_s) {
  if (!(waveform->duration_s > 0))
    return 1;
  if (!(time_s >= 0 && time_s < waveform->duration_s))
    return 0;
  const double edge = fmin(time_s, waveform->duration_s - time_s);
  if (edge >= waveform->ramp_s)
    return 1;
  return (1 - cos(PI * edge / waveform->ramp_s)) / 2;
}

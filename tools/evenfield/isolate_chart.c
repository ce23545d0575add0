/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "isolate_chart.h"

#include <math.h>
#include <stdlib.h>

#include <evenfield/picture.h>

#include "diagram.h"
#include "isolate_contrast.h"
#include "message.h"
#include "text.h"

enum { N_STATES = 3 };

/* The codes of a state. */
static const uint32_t *codes_of(const isolate_result *r, int state) {
  return state == 0   ? r->coded.background
         : state == 1 ? r->coded.high
                      : r->coded.low;
}

static ef_status add_state(ef_chart *chart, const isolate_scene *s,
                           const isolate_result *r, int state,
                           const double *wavelength, double *radiance,
                           ef_error *error) {
  static const char *const names[2][N_STATES] = {{"background", "high", "low"},
                                                 {"background", "pulse", NULL}};
  const ef_device *device = s->display.device;
  const double most = ldexp(1.0, r->coded.bits) - 1.0;
  const bool is_pulse = r->way.modulation_kind == EF_PULSE;
  double drive[EF_MAX_DRIVES];
  if (names[is_pulse][state] == NULL)
    return EF_OK;
  for (size_t i = 0; i < r->way.n_primaries; ++i)
    drive[i] = (double)codes_of(r, state)[i] / most;
  const ef_status status =
      ef_device_spectrum(device, drive, radiance, NULL, error);
  if (status != EF_OK)
    return status;
  ef_series line = ef_series_default(EF_SERIES_LINE);
  line.look = state;
  line.name = names[is_pulse][state];
  line.n = ef_device_grid(device)->count;
  line.x = wavelength;
  line.y = radiance;
  return ef_chart_add(chart, &line, error);
}

static ef_status add_states(ef_chart *chart, const isolate_scene *s,
                            const isolate_result *r, ef_error *error) {
  const ef_grid *grid = ef_device_grid(s->display.device);
  double *wavelength = malloc(2 * grid->count * sizeof *wavelength);
  if (wavelength == NULL)
    return message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  double *radiance = wavelength + grid->count;
  for (size_t k = 0; k < grid->count; ++k)
    wavelength[k] = ef_grid_wavelength(grid, k);
  ef_status status = EF_OK;
  for (int state = 0; state < N_STATES && status == EF_OK; ++state)
    status = add_state(chart, s, r, state, wavelength, radiance, error);
  free(wavelength);
  return status;
}

ef_status isolate_spectra_draw(const isolate_scene *s, const isolate_result *r,
                               ef_chart_settings settings, ef_chart **out,
                               ef_error *error) {
  settings.x_title = "wavelength, nm";
  settings.y_title = ef_device_absolute(s->display.device)
                         ? "spectral radiance, W sr\u207b\u00b9 "
                           "m\u207b\u00b2 nm\u207b\u00b9"
                         : "spectral radiance, relative";
  settings.y_from = 0.0;
  *out = ef_chart_new(&settings, error);
  return *out != NULL ? add_states(*out, s, r, error) : error->status;
}

ef_status isolate_chart_write(const isolate_scene *s, const isolate_result *r,
                              const ef_notes *notes, ef_error *error) {
  const int plane = s->options->plane;
  ef_chart_settings settings = ef_chart_settings_default();
  text title = {0}, subtitle = {0};
  text_format(&title, "What changes along %s", s->direction_text);
  text_format(&subtitle, "%s; observer %s; %d-bit codes",
              ef_device_name(s->display.device), ef_observer_name(s->observer),
              r->coded.bits);
  settings.title = title.bytes;
  settings.subtitle = subtitle.bytes;
  settings.overwrite = s->options->force;
  diagram d = {0};
  ef_status status = EF_OK;
  if (title.failed || subtitle.failed)
    status = message_fail(error, EF_NO_MEMORY, "out of memory for the chart");
  else if (plane >= 0)
    status = isolate_contrast_draw(s, r, (contrast_plane)plane, settings,
                                   &d.chart, error);
  else
    status = isolate_spectra_draw(s, r, settings, &d.chart, error);
  if (status == EF_OK)
    status = diagram_write(&d, s->options->chart, notes, error);
  diagram_free(&d);
  text_free(&title);
  text_free(&subtitle);
  return status;
}

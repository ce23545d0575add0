/* SPDX-License-Identifier: GPL-3.0-or-later */
/** \file
 * --chart of `match`: targets, and what is shown for them. */
#ifndef COMMAND_MATCH_CHART_H
#define COMMAND_MATCH_CHART_H

#include "cloud.h"
#include "diagram.h"
#include "match.h"
#include "text.h"

/** Collects the colours and draws them at the end. */
typedef struct match_chart match_chart;
/** To the file of --chart. NULL without memory. */
match_chart *match_chart_new(const char *path, const ef_notes *notes);
void match_chart_free(match_chart *c);
match_sink match_chart_sink(match_chart *c);

/** What a chart shows of the collected colours. */
typedef struct match_view {
  diagram_plane plane;
  double L_star;   /**< that of a section of the gamut; NaN: all of it */
  bool has_people; /**< with how they see the pairs, if they were asked */
} match_view;

/** For reports. Free with diagram_free in every case. */
ef_status match_chart_draw(const match_chart *c, const match_scene *s,
                           const ef_chart_settings *settings, match_view view,
                           diagram *out, ef_error *error);
/** How what is shown differs from the target for the people asked, of the pairs
 * in which they see most; needs them. Free with diagram_free in every case. */
ef_status match_chart_draw_people(match_chart *c, const match_scene *s,
                                  const ef_chart_settings *settings,
                                  diagram *out, ef_error *error);
/** Which of very many targets are drawn; nothing where all are. */
void match_chart_thinned_words(text *about, const match_chart *c);
/** What that of people shows, in words. */
void match_chart_people_words(text *about);
/** Targets within so many units of lightness stand beside a section. */
#define MATCH_SECTION_REACH 5.0

#endif

/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What a population sees of pairs. Observers go in blocks: one product gives
 * the tristimulus values of a block of pairs for a block of observers, then the
 * differences are taken pair by pair. Those of some pairs and all observers
 * are kept until their percentile is known. The weights of the first blocks are
 * held from call to call, those of a very large population folded anew. */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

#include "match/match_private.h"

enum {
  OBSERVERS = 128,    /* in a block: their weights fit into a cache of 2 MB */
  PAIRS = 512,        /* in a block: tristimulus values in 3 MB a side */
  KEPT = 4 * 1000000, /* differences kept at a time: 32 MB */
  HELD = 64 << 20,    /* bytes of weights that stay from call to call */
  CHUNK = 4           /* pairs a thread takes: half a thousand differences */
};

enum { TARGET, MATCH };

ef_spread_settings ef_spread_settings_default(void) {
  return (ef_spread_settings){.metric = ef_metric_find("ciede2000", NULL),
                              .adaptation = EF_ADAPT_CAT16,
                              .threshold = (double)NAN};
}

/* A block of observers and how each normalises what it sees. */
typedef struct eyes {
  size_t first, count; /* 0: not opened yet */
  ef_weights *weights[2]; /* of both sides; one and the same when they agree */
  struct {
    double target[9];  /* XYZ of the target's side -> on the match's white */
    bool is_scale;     /* target[0] alone does it: both whites are one */
    double match;      /* factor of the match's side */
    ef_conditions conditions;
  } own[OBSERVERS];
} eyes;

/* Everything a call needs. */
struct ef_crowd {
  const ef_population *population;
  ef_spread_settings settings;
  ef_side side[2];
  bool sides_agree;  /* in grid and viewing: weights are shared */
  ef_deficiency deficiency;
  double field_matrix[9]; /* cones to X, Y, Z of everybody's field */
  size_t n_observers;
  double threshold;
  eyes *held; /* n_held of them, and one more for the blocks that are not */
  size_t n_held;
  bool is_noted; /* what lies outside the samples: the same for all */
  const ef_notes *notes;
  double *white[2]; /* samples of both whites */
  void *block;      /* of held and white */
  /* Of one call. */
  const double *sample[2];
  eyes *open;        /* the block of observers at hand */
  double *xyz[2];    /* PAIRS x 3 OBSERVERS */
  size_t first_pair; /* of the pairs kept, first in xyz */
  double *kept;      /* n_kept x n_observers */
  ef_spread *out;    /* of the first pair kept */
  ef_xyz *seen[2];   /* n x n_observers where colours are asked for, else NULL */
  size_t pair;       /* of n, that is the first in xyz */
};
typedef ef_crowd work;

/* ---- Checks ------------------------------------------------------------ */

static const char *const side_names[2] = {"target", "match"};

static ef_status check_finite(size_t n, const double *value, size_t row,
                              const char *what, ef_error *error) {
  for (size_t i = 0; i < n; ++i) {
    if (isfinite(value[i])) continue;
    return ef__error_set(error, EF_INVALID,
                         "sample %zu of %s %zu is not a finite number",
                         i % row + 1, what, i / row + 1);
  }
  return EF_OK;
}

static ef_status check_side(const ef_side *side, const char *name,
                            ef_error *error) {
  const ef_status status = ef_grid_check(&side->grid, error);
  if (status != EF_OK) return status;
  if (side->white == NULL && side->viewing.kind == EF_LIGHT) {
    return ef__error_set(error, EF_INVALID,
                         "the %s's side shows lights: the white they are "
                         "judged against is needed",
                         name);
  }
  const size_t count = side->grid.count;
  if (side->white == NULL) return EF_OK;
  return check_finite(count, side->white, count, "white", error);
}

static ef_status check_weights(const double *weight, size_t n,
                               ef_error *error) {
  enum { MOST = 1000 };       /* the percentile compares all with all */
  const double rounding = 0.001; /* of shares printed with some decimals */
  double sum = 0;
  if (weight == NULL) return EF_OK;
  if (n > MOST) {
    return ef__error_set(error, EF_INVALID,
                         "weights for %zu observers; at most %d have some", n,
                         MOST);
  }
  for (size_t i = 0; i < n; ++i) {
    if (!(weight[i] > 0)) {
      return ef__error_set(error, EF_INVALID,
                           "the weight of observer %zu is %g; it must be above "
                           "0",
                           i + 1, weight[i]);
    }
    sum += weight[i];
  }
  if (fabs(sum - 1) <= rounding) return EF_OK;
  return ef__error_set(error, EF_INVALID,
                       "the weights of the observers sum to %g; they must sum "
                       "to 1",
                       sum);
}

static bool agree(const ef_side *a, const ef_side *b) {
  const ef_viewing *const v = &a->viewing, *const u = &b->viewing;
  return ef_grid_equal(&a->grid, &b->grid) && v->kind == u->kind &&
         v->illuminant == u->illuminant && v->absolute == u->absolute &&
         v->interpolation == u->interpolation &&
         v->extension == u->extension &&
         v->correct_bandpass == u->correct_bandpass &&
         ef_grid_equal(&v->working, &u->working);
}

/* ---- A block of observers ---------------------------------------------- */

static void forget_eyes(eyes *block) {
  if (block->weights[MATCH] != block->weights[TARGET]) {
    ef_weights_free(block->weights[MATCH]);
  }
  ef_weights_free(block->weights[TARGET]);
  block->weights[TARGET] = block->weights[MATCH] = NULL;
}

static ef_status make_weights(work *w, int jobs, const ef_notes *notes,
                              ef_error *error) {
  eyes *const block = w->open;
  for (size_t s = 0; s < 2; ++s) {
    if (s == MATCH && w->sides_agree) {
      block->weights[MATCH] = block->weights[TARGET];
      continue;
    }
    ef_error why;
    block->weights[s] = ef_population_weights(
        w->population, block->first, block->count, &w->side[s].grid,
        &w->side[s].viewing, jobs, notes, &why);
    if (block->weights[s] != NULL) continue;
    if (error != NULL) *error = why;
    return why.status;
  }
  return EF_OK;
}

/* Factors of both sides and the way from white to white of one observer. */
static ef_status normalise(work *w, size_t i, double white[2][3],
                           ef_error *error) {
  for (size_t s = 0; s < 2; ++s) {
    if (white[s][1] > 0 && isfinite(100 / white[s][1])) continue;
    return ef__error_set(error, EF_INVALID,
                         "the white of the %s's side is dark for observer %zu",
                         side_names[s], w->open->first + i + 1);
  }
  const double factor[2] = {100 / white[TARGET][1], 100 / white[MATCH][1]};
  const bool is_same = memcmp(white[TARGET], white[MATCH],
                              sizeof white[TARGET]) == 0;
  const ef_xyz from = {factor[TARGET] * white[TARGET][0], 100,
                       factor[TARGET] * white[TARGET][2]};
  const ef_xyz to = {factor[MATCH] * white[MATCH][0], 100,
                     factor[MATCH] * white[MATCH][2]};
  double *const matrix = w->open->own[i].target;
  w->open->own[i].match = factor[MATCH];
  w->open->own[i].conditions.white = to;
  w->open->own[i].is_scale =
      is_same || w->settings.adaptation == EF_ADAPT_NONE;
  if (w->open->own[i].is_scale) {
    matrix[0] = factor[TARGET];
    return EF_OK;
  }
  const ef_status status =
      w->deficiency == EF_TRICHROMAT
          ? ef_adaptation_matrix(w->settings.adaptation, from, to, matrix,
                                 error)
          : ef__dichromat_adaptation(w->deficiency, w->field_matrix, from, to,
                                     matrix, error);
  for (size_t k = 0; k < 9; ++k) matrix[k] *= factor[TARGET];
  return status;
}

/* The block of observers that starts with `first`: held, or folded now. */
static ef_status open_eyes(work *w, size_t first, int jobs, ef_error *error) {
  const size_t number = first / OBSERVERS;
  const bool is_held = number < w->n_held;
  eyes *const block = &w->held[is_held ? number : w->n_held];
  double xyz[2][3 * OBSERVERS];
  w->open = block;
  if (is_held && block->count > 0) return EF_OK;
  forget_eyes(block);
  const size_t left = w->n_observers - first;
  block->first = first;
  block->count = left < OBSERVERS ? left : OBSERVERS;
  ef_status status =
      make_weights(w, jobs, w->is_noted ? NULL : w->notes, error);
  w->is_noted = true;
  for (size_t s = 0; s < 2 && status == EF_OK; ++s) {
    status = ef_weights_apply(block->weights[s], 1, w->white[s], 1, xyz[s],
                              error);
  }
  for (size_t i = 0; i < block->count && status == EF_OK; ++i) {
    double white[2][3];
    for (size_t s = 0; s < 2; ++s) {
      memcpy(white[s], xyz[s] + 3 * i, sizeof white[s]);
    }
    status = normalise(w, i, white, error);
  }
  if (status != EF_OK) block->count = 0;
  return status;
}

/* ---- Differences ------------------------------------------------------- */

/* Both sides as observer i of the block sees them, of pair p in xyz, on the
 * white of the match. */
static inline void see(const work *w, size_t p, size_t i, ef_xyz seen[2]) {
  const eyes *const block = w->open;
  const double *const t = w->xyz[TARGET] + (p * block->count + i) * 3;
  const double *const m = w->xyz[MATCH] + (p * block->count + i) * 3;
  const double *const to = block->own[i].target;
  const double factor = block->own[i].match;
  const ef_xyz target = {t[0], t[1], t[2]};
  seen[TARGET] = block->own[i].is_scale
                     ? (ef_xyz){to[0] * t[0], to[0] * t[1], to[0] * t[2]}
                     : ef_xyz_transform(to, target);
  seen[MATCH] = (ef_xyz){factor * m[0], factor * m[1], factor * m[2]};
}

/* Pairs [begin, end) of the block in xyz, for the block of observers. */
static void keep_colours(void *context, size_t begin, size_t end) {
  const work *const w = context;
  for (size_t p = begin; p < end; ++p) {
    const size_t row = (w->pair + p) * w->n_observers + w->open->first;
    for (size_t i = 0; i < w->open->count; ++i) {
      ef_xyz seen[2];
      see(w, p, i, seen);
      w->seen[TARGET][row + i] = seen[TARGET];
      w->seen[MATCH][row + i] = seen[MATCH];
    }
  }
}

static void compare(void *context, size_t begin, size_t end) {
  const work *const w = context;
  const eyes *const block = w->open;
  const ef_metric *const metric = w->settings.metric;
  double reference[3 * OBSERVERS], sample[3 * OBSERVERS];
  for (size_t p = begin; p < end; ++p) {
    for (size_t i = 0; i < block->count; ++i) {
      ef_xyz seen[2];
      see(w, p, i, seen);
      ef_metric_coordinates(metric, seen[TARGET], &block->own[i].conditions,
                            reference + 3 * i);
      ef_metric_coordinates(metric, seen[MATCH], &block->own[i].conditions,
                            sample + 3 * i);
    }
    ef_metric_difference_batch(
        metric, block->count, reference, sample, 1,
        w->kept + (w->first_pair + p) * w->n_observers + block->first);
  }
}

/* `pair` is the number of the first pair kept among all. */
static ef_status see_pairs(work *w, size_t pair, size_t n_kept, int jobs,
                           ef_error *error) {
  for (size_t first = 0; first < n_kept; first += PAIRS) {
    const size_t left = n_kept - first;
    const size_t n = left < PAIRS ? left : PAIRS;
    for (size_t s = 0; s < 2; ++s) {
      const size_t row = w->side[s].grid.count;
      const ef_status status = ef_weights_apply(
          w->open->weights[s], n, w->sample[s] + (pair + first) * row, jobs,
          w->xyz[s], error);
      if (status != EF_OK) return status;
    }
    w->first_pair = first;
    w->pair = pair + first;
    ef__parallel_for(n, CHUNK, jobs,
                     w->seen[TARGET] != NULL ? keep_colours : compare, w);
  }
  return EF_OK;
}

/* ---- Statistics -------------------------------------------------------- */

/* Of one pair; changes the order of `value`. */
static ef_spread summarise_alike(const work *w, double *value) {
  const size_t n = w->n_observers;
  double sum = 0;
  size_t n_above = 0;
  for (size_t i = 0; i < n; ++i) {
    sum += value[i];
    n_above += value[i] > w->threshold;
  }
  return (ef_spread){.mean = sum / (double)n,
                     .p95 = ef_quantile(n, value, 0.95),
                     .share_of_observers = (double)n_above / (double)n};
}

/* The least value of those that at least 95 % of the weight do not exceed. For
 * a handful of observers: every value is tried. */
static double weighted_percentile_95(size_t n, const double *value,
                                     const double *weight, double whole) {
  double least = (double)INFINITY;
  for (size_t k = 0; k < n; ++k) {
    double up_to = 0;
    for (size_t i = 0; i < n; ++i) {
      if (value[i] <= value[k]) up_to += weight[i];
    }
    if (up_to >= 0.95 * whole && value[k] < least) least = value[k];
  }
  return least;
}

static ef_spread summarise_weighted(const work *w, const double *value) {
  const size_t n = w->n_observers;
  const double *const weight = w->settings.weight;
  double sum = 0, above = 0, whole = 0;
  for (size_t i = 0; i < n; ++i) {
    whole += weight[i];
    sum += weight[i] * value[i];
    if (value[i] > w->threshold) above += weight[i];
  }
  return (ef_spread){
      .mean = sum / whole,
      .p95 = weighted_percentile_95(n, value, weight, whole),
      .share_of_observers = above / whole};
}

static void summarise(void *context, size_t begin, size_t end) {
  const work *const w = context;
  const size_t n = w->n_observers;
  for (size_t p = begin; p < end; ++p) {
    double *const value = w->kept + p * n;
    const double none = (double)NAN;
    bool is_finite = true;
    for (size_t i = 0; i < n; ++i) is_finite = is_finite && isfinite(value[i]);
    if (!is_finite) {
      w->out[p] = (ef_spread){none, none, none};
      continue;
    }
    w->out[p] = w->settings.weight == NULL ? summarise_alike(w, value)
                                            : summarise_weighted(w, value);
    if (isnan(w->threshold)) w->out[p].share_of_observers = none;
  }
}

/* ---- The call ---------------------------------------------------------- */

static size_t least(size_t a, size_t b) {
  return a < b ? a : b;
}

/* All observers, pairs [pair, pair + n_kept). */
static ef_status spread_of(work *w, size_t pair, size_t n_kept, int jobs,
                           ef_error *error) {
  ef_status status = EF_OK;
  for (size_t o = 0; o < w->n_observers && status == EF_OK; o += OBSERVERS) {
    status = open_eyes(w, o, jobs, error);
    if (status == EF_OK) status = see_pairs(w, pair, n_kept, jobs, error);
  }
  return status;
}

static ef_status allocate_call(work *w, size_t n, size_t *n_kept, void **block,
                               ef_error *error) {
  const size_t fitting = KEPT / w->n_observers;
  *n_kept = least(n, fitting > 0 ? fitting : 1);
  const size_t n_xyz = least(*n_kept, PAIRS) * 3 * OBSERVERS;
  const ef__part parts[] = {
      {&w->xyz[TARGET], n_xyz, sizeof(double)},
      {&w->xyz[MATCH], n_xyz, sizeof(double)},
      {&w->kept, *n_kept * w->n_observers, sizeof(double)}};
  *block = ef__allocate_block(sizeof parts / sizeof *parts, parts);
  if (*block == NULL) return ef__error_memory(error, "what a population sees");
  return EF_OK;
}

static ef_status check_samples(work *w, size_t n, const double *target,
                               const double *match, ef_error *error) {
  ef_status status = EF_OK;
  w->sample[TARGET] = target;
  w->sample[MATCH] = match;
  for (size_t s = 0; s < 2 && status == EF_OK; ++s) {
    const size_t count = w->side[s].grid.count;
    status = check_finite(n * count, w->sample[s], count, side_names[s], error);
  }
  return status;
}

ef_status ef_crowd_spread(ef_crowd *crowd, size_t n, const double *target,
                          const double *match, int jobs, ef_spread *out,
                          double *difference, ef_error *error) {
  work *const w = crowd;
  size_t n_kept;
  void *block = NULL;
  ef_status status = check_samples(w, n, target, match, error);
  if (status == EF_OK) status = allocate_call(w, n, &n_kept, &block, error);
  if (status != EF_OK) return status;
  for (size_t pair = 0; pair < n && status == EF_OK; pair += n_kept) {
    const size_t n_here = least(n - pair, n_kept);
    status = spread_of(w, pair, n_here, jobs, error);
    if (status != EF_OK) break;
    if (difference != NULL) {
      memcpy(difference + pair * w->n_observers, w->kept,
             n_here * w->n_observers * sizeof *difference);
    }
    w->out = out + pair;
    ef__parallel_for(n_here, CHUNK, jobs, summarise, w);
  }
  free(block);
  return status;
}

static void collect_whites(work *w, ef_xyz *white) {
  for (size_t i = 0; i < w->open->count; ++i)
    white[w->open->first + i] = w->open->own[i].conditions.white;
}

ef_status ef_crowd_colours(ef_crowd *crowd, size_t n, const double *target,
                           const double *match, int jobs, ef_xyz *seen_target,
                           ef_xyz *seen_match, ef_xyz *white, ef_error *error) {
  work *const w = crowd;
  size_t n_kept;
  void *block = NULL;
  ef_status status = check_samples(w, n, target, match, error);
  if (status == EF_OK) status = allocate_call(w, n, &n_kept, &block, error);
  w->seen[TARGET] = seen_target;
  w->seen[MATCH] = seen_match;
  for (size_t o = 0; o < w->n_observers && status == EF_OK; o += OBSERVERS) {
    status = open_eyes(w, o, jobs, error);
    if (status == EF_OK) collect_whites(w, white);
    for (size_t i = 0; i < n && status == EF_OK; i += n_kept)
      status = see_pairs(w, i, least(n - i, n_kept), jobs, error);
  }
  w->seen[TARGET] = w->seen[MATCH] = NULL;
  free(block);
  return status;
}

/* ---- A crowd ----------------------------------------------------------- */

static void set_white(const ef_side *side, double *white) {
  for (size_t i = 0; i < side->grid.count; ++i) {
    white[i] = side->white != NULL ? side->white[i] : 1;
  }
}

static ef_status allocate(work *w, ef_error *error) {
  const size_t n_blocks = (w->n_observers + OBSERVERS - 1) / OBSERVERS;
  const size_t n_samples = w->side[TARGET].grid.count +
                           (w->sides_agree ? 0 : w->side[MATCH].grid.count);
  const size_t size =
      sizeof(eyes) + 3 * OBSERVERS * n_samples * sizeof(double);
  w->n_held = least(n_blocks, HELD / size);
  const ef__part parts[] = {
      {&w->white[TARGET], w->side[TARGET].grid.count, sizeof(double)},
      {&w->white[MATCH], w->side[MATCH].grid.count, sizeof(double)},
      {&w->held, w->n_held + 1, sizeof *w->held}};
  w->block = ef__allocate_block(sizeof parts / sizeof *parts, parts);
  if (w->block == NULL)
    return ef__error_memory(error, "what a population sees");
  for (size_t i = 0; i <= w->n_held; ++i) {
    w->held[i].count = 0;
    w->held[i].weights[TARGET] = w->held[i].weights[MATCH] = NULL;
  }
  return EF_OK;
}

static ef_status check(const work *w, ef_error *error) {
  ef_status status = EF_OK;
  for (size_t s = 0; s < 2 && status == EF_OK; ++s) {
    status = check_side(&w->side[s], side_names[s], error);
  }
  if (status == EF_OK) {
    status = check_weights(w->settings.weight, w->n_observers, error);
  }
  return status;
}

ef_crowd *ef_crowd_new(const ef_population *population, const ef_side *target,
                       const ef_side *match,
                       const ef_spread_settings *settings,
                       const ef_notes *notes, ef_error *error) {
  ef_crowd *const w = ef__allocate_zeroed(1, sizeof *w);
  if (w == NULL) {
    ef__error_memory(error, "what a population sees");
    return NULL;
  }
  w->population = population;
  w->settings = *settings;
  w->side[TARGET] = *target;
  w->side[MATCH] = *match;
  w->sides_agree = agree(target, match);
  w->n_observers = ef_population_count(population);
  w->deficiency = ef_population_member(population, 0).deficiency;
  w->threshold = isnan(settings->threshold)
                     ? ef_metric_jnd(settings->metric).value
                     : settings->threshold;
  w->notes = notes;
  ef_status status = check(w, error);
  if (status == EF_OK) {
    status = ef_cone_xyz_matrix(ef_population_field_deg(population),
                                w->field_matrix, NULL, error);
  }
  if (status == EF_OK) status = allocate(w, error);
  if (status != EF_OK) {
    ef_crowd_free(w);
    return NULL;
  }
  for (size_t s = 0; s < 2; ++s) set_white(&w->side[s], w->white[s]);
  return w;
}

void ef_crowd_free(ef_crowd *crowd) {
  if (crowd == NULL) return;
  for (size_t i = 0; crowd->block != NULL && i <= crowd->n_held; ++i) {
    forget_eyes(&crowd->held[i]);
  }
  free(crowd->block);
  free(crowd);
}

void ef__crowd_hold(ef_crowd *crowd, size_t n_blocks) {
  crowd->n_held = least(crowd->n_held, n_blocks);
}

ef_status ef_population_spread(const ef_population *population, size_t n,
                               const ef_side *target, const ef_side *match,
                               const ef_spread_settings *settings, int jobs,
                               ef_spread *out, double *difference,
                               const ef_notes *notes, ef_error *error) {
  ef_error why = {0};
  ef_crowd *const crowd =
      ef_crowd_new(population, target, match, settings, notes, &why);
  if (crowd == NULL) {
    if (error != NULL) *error = why;
    return why.status;
  }
  const ef_status status = ef_crowd_spread(
      crowd, n, target->sample, match->sample, jobs, out, difference, error);
  ef_crowd_free(crowd);
  return status;
}

ef_spread_index ef_spread_index_of(size_t n, const ef_spread *spread) {
  ef_spread_index index = {0};
  for (size_t i = 0; i < n; ++i) {
    index.mean += spread[i].mean;
    index.p95 += spread[i].p95;
    index.share_of_observers += spread[i].share_of_observers;
    if (spread[i].p95 > spread[index.worst].p95) index.worst = i;
  }
  index.mean /= (double)n; /* 0 / 0 is NaN */
  index.p95 /= (double)n;
  index.share_of_observers /= (double)n;
  return index;
}

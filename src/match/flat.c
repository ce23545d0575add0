/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Matches for observers of two dimensions. Colours lie on a plane through
 * black, three primaries on it are one too many, and what matches a target is a
 * straight line of amounts. Where it misses the unit box the nearest colour
 * lies on the hexagon that the box makes on the plane. */
#include "match/match_private.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

/* The plane of an observer's colours and the primaries in it. */
typedef struct plane {
  double axis[2][3];    /* orthonormal, in X, Y, Z */
  double vector[2][3];  /* the primaries along the axes */
  double inverse[3][2]; /* least amounts that give a colour of the plane */
  double along[3];      /* unit vector of amounts that change nothing */
} plane;

typedef struct job {
  ef__batch batch;
  plane plane;
  const double *near; /* n x 3, or NULL */
} job;

/* ---- The plane --------------------------------------------------------- */

static double dot(const double a[3], const double b[3]) {
  return a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
}

/* `v` without what it has along the first `n` axes; returns its length. */
static double reduce(const plane *p, int n, double v[3]) {
  for (int k = 0; k < n; ++k) {
    const double share = dot(p->axis[k], v);
    for (int i = 0; i < 3; ++i) v[i] -= share * p->axis[k][i];
  }
  return sqrt(dot(v, v));
}

/* The k-th axis along the primary that sticks out most of those before. */
static bool add_axis(const double primary[9], int k, plane *p) {
  /* Half of the digits: what is left of primaries that look alike. */
  const double least = 1e-8;
  double longest = 0;
  for (int c = 0; c < 3; ++c) {
    double v[3];
    memcpy(v, primary + 3 * c, sizeof v);
    const double whole = sqrt(dot(v, v));
    const double length = reduce(p, k, v);
    if (!(length > longest) || !(length > least * whole)) continue;
    longest = length;
    for (int i = 0; i < 3; ++i) p->axis[k][i] = v[i] / length;
  }
  return longest > 0;
}

static ef_status find_plane(const ef__mixing *mixing, plane *p,
                            ef_error *error) {
  double primary[9]; /* one a row */
  ef__mat3_transpose(mixing->vector, primary);
  if (!add_axis(primary, 0, p) || !add_axis(primary, 1, p)) {
    return ef__error_set(error, EF_NO_ANSWER,
                         "to this observer the primaries differ in brightness "
                         "only: take primaries of two different colours");
  }
  for (int k = 0; k < 2; ++k) {
    for (int c = 0; c < 3; ++c) {
      p->vector[k][c] = dot(p->axis[k], primary + 3 * c);
    }
  }
  const double *const v = p->vector[0], *const w = p->vector[1];
  const double vv = dot(v, v), vw = dot(v, w), ww = dot(w, w);
  const double determinant = vv * ww - vw * vw;
  for (int c = 0; c < 3; ++c) {
    p->inverse[c][0] = (ww * v[c] - vw * w[c]) / determinant;
    p->inverse[c][1] = (vv * w[c] - vw * v[c]) / determinant;
  }
  const double n[3] = {v[1] * w[2] - v[2] * w[1], v[2] * w[0] - v[0] * w[2],
                       v[0] * w[1] - v[1] * w[0]};
  const double length = sqrt(dot(n, n));
  for (int c = 0; c < 3; ++c) p->along[c] = n[c] / length;
  return EF_OK;
}

/* Every target is a colour of the plane to 1e-6 of the white. */
static ef_status check_targets(const job *j, size_t n, ef_error *error) {
  const ef__mixing *const mixing = &j->batch.mixing;
  const double limit = 1e-6 * mixing->conditions.white.Y;
  for (size_t t = 0; t < n; ++t) {
    double light[3];
    for (int i = 0; i < 3; ++i) {
      light[i] = j->batch.xyz[3 * t + (size_t)i] - mixing->black[i];
    }
    const double size = sqrt(dot(light, light));
    const double off = reduce(&j->plane, 2, light);
    if (off <= fmax(limit, 1e-8 * size)) continue;
    return ef__error_set(error, EF_INVALID,
                         "target %zu lies %.3g off the plane of the colours "
                         "that this observer sees",
                         t + 1, off);
  }
  return EF_OK;
}

/* ---- The line of amounts that match ------------------------------------ */

/* amount = start + place * along. */
typedef struct line {
  double start[3];
  const double *along;
} line;

static void point_of(const line *l, double place, double amount[3]) {
  for (int c = 0; c < 3; ++c) amount[c] = l->start[c] + place * l->along[c];
}

static line line_to(const job *j, ef_xyz target) {
  const double *const black = j->batch.mixing.black;
  const double light[3] = {target.X - black[0], target.Y - black[1],
                           target.Z - black[2]};
  const plane *const p = &j->plane;
  const double at[2] = {dot(p->axis[0], light), dot(p->axis[1], light)};
  line l = {.along = p->along};
  for (int c = 0; c < 3; ++c) {
    l.start[c] = p->inverse[c][0] * at[0] + p->inverse[c][1] * at[1];
  }
  return l;
}

static double excess(const line *l, double place) {
  double amount[3], most = -(double)INFINITY;
  point_of(l, place, amount);
  for (int c = 0; c < 3; ++c) {
    most = fmax(most, fmax(-amount[c], amount[c] - 1));
  }
  return most;
}

/* Where the line is farthest inside the box, or least outside: there two of the
 * six distances from its sides are equal, one falling and one growing. */
static double least_excess(const line *l, double *place) {
  double side[6], slope[6];
  double least = (double)INFINITY;
  for (int c = 0; c < 3; ++c) {
    side[2 * c] = -l->start[c];
    slope[2 * c] = -l->along[c];
    side[2 * c + 1] = l->start[c] - 1;
    slope[2 * c + 1] = l->along[c];
  }
  for (int i = 0; i < 6; ++i) {
    for (int k = 0; k < i; ++k) {
      if (slope[i] == slope[k]) continue;
      const double at = (side[k] - side[i]) / (slope[i] - slope[k]);
      const double here = excess(l, at);
      if (!(here < least)) continue;
      least = here;
      *place = at;
    }
  }
  return least;
}

/* The part of the line inside the box, which `inside` is a place of. */
static void limit(const line *l, double inside, double *low, double *high) {
  *low = -(double)INFINITY;
  *high = (double)INFINITY;
  for (int c = 0; c < 3; ++c) {
    if (l->along[c] == 0) continue;
    const double zero = -l->start[c] / l->along[c];
    const double one = (1 - l->start[c]) / l->along[c];
    *low = fmax(*low, fmin(zero, one));
    *high = fmin(*high, fmax(zero, one));
  }
  *low = fmin(*low, inside);
  *high = fmax(*high, inside);
}

static double nearest_place(const line *l, const double near[3], double low,
                            double high) {
  double way[3];
  if (near == NULL) return low + (high - low) / 2;
  for (int c = 0; c < 3; ++c) way[c] = near[c] - l->start[c];
  return ef__clamp(dot(way, l->along), low, high);
}

/* ---- Outside: along the hexagon ---------------------------------------- */

typedef struct edge {
  double from[3];
  int channel; /* that runs from 0 to 1 */
} edge;

static double value_on(ef__search *search, const edge *e, double share) {
  double amount[3];
  memcpy(amount, e->from, sizeof amount);
  amount[e->channel] = share;
  return ef__search_value(search, amount);
}

/* The least value between two shares, by golden section. */
static double golden(ef__search *search, const edge *e, double low,
                     double high) {
  const double part = 0.61803398874989485; /* (sqrt(5) - 1) / 2 */
  double a = high - part * (high - low), b = low + part * (high - low);
  double at_a = value_on(search, e, a), at_b = value_on(search, e, b);
  /* Half the digits of a share: all that a minimum tells. */
  while (high - low > 1e-9) {
    if (at_a <= at_b) {
      high = b;
      b = a;
      at_b = at_a;
      a = high - part * (high - low);
      at_a = value_on(search, e, a);
    } else {
      low = a;
      a = b;
      at_a = at_b;
      b = low + part * (high - low);
      at_b = value_on(search, e, b);
    }
  }
  return at_a <= at_b ? a : b;
}

/* A coarse look first: differences may have more than one valley. */
static void search_edge(ef__search *search, const edge *e, double *least,
                        double amount[3]) {
  enum { PIECES = 16 };
  double best = (double)INFINITY;
  int at = 0;
  for (int i = 0; i <= PIECES; ++i) {
    const double value = value_on(search, e, (double)i / PIECES);
    if (!(value < best)) continue;
    best = value;
    at = i;
  }
  const double low = fmax(at - 1, 0) / PIECES;
  const double high = fmin(at + 1, PIECES) / PIECES;
  const double tried[3] = {golden(search, e, low, high), low, high};
  for (int i = 0; i < 3; ++i) {
    const double value = value_on(search, e, tried[i]);
    if (!(value < *least)) continue;
    *least = value;
    memcpy(amount, e->from, sizeof e->from);
    amount[e->channel] = tried[i];
  }
}

/* Along each side of the hexagon one amount runs from 0 to 1, and the others
 * are 0 or 1, whichever leads away from the side opposite. */
static void nearest_on_hexagon(const plane *p, ef__search *search,
                               double amount[3]) {
  double least = (double)INFINITY;
  for (int c = 0; c < 3; ++c) {
    for (int sign = -1; sign <= 1; sign += 2) {
      edge e = {.channel = c};
      for (int k = 0; k < 3; ++k) {
        const double out = p->vector[0][k] * p->vector[1][c] -
                           p->vector[1][k] * p->vector[0][c];
        e.from[k] = k != c && sign * out > 0 ? 1 : 0;
      }
      search_edge(search, &e, &least, amount);
    }
  }
}

/* ---- Codes ------------------------------------------------------------- */

/* Codes of one channel about an amount: the two below it and the two above. */
static size_t codes_about(const ef__lattice *lattice, int channel,
                          double amount, uint32_t code[4]) {
  const double *const amounts = lattice->amount[channel];
  size_t low = 0, high = lattice->n_codes, n = 0;
  while (low < high) {
    const size_t middle = low + (high - low) / 2;
    if (amounts[middle] < amount) {
      low = middle + 1;
    } else {
      high = middle;
    }
  }
  for (size_t i = low > 1 ? low - 2 : 0; i < low + 2; ++i) {
    if (i < lattice->n_codes) code[n++] = (uint32_t)i;
  }
  return n;
}

/* Farther codes along the line may differ less still, but lead away from the
 * match that was chosen. */
static void find_codes(const ef__batch *batch, ef__search *search,
                       ef_match *m) {
  uint32_t code[3][4];
  size_t n[3];
  double least = (double)INFINITY;
  for (int c = 0; c < 3; ++c) {
    n[c] = codes_about(&batch->lattice, c, m->nearest.amount[c], code[c]);
  }
  for (size_t i = 0; i < n[0] * n[1] * n[2]; ++i) {
    const uint32_t tried[3] = {code[0][i % n[0]], code[1][i / n[0] % n[1]],
                               code[2][i / (n[0] * n[1])]};
    double amount[3];
    for (int c = 0; c < 3; ++c) {
      amount[c] = batch->lattice.amount[c][tried[c]];
    }
    const double square = ef__search_value(search, amount);
    if (!(square < least)) continue;
    least = square;
    memcpy(m->code, tried, sizeof tried);
  }
}

/* ---- The call ---------------------------------------------------------- */

static void match_one(const job *j, size_t t) {
  const ef__batch *const batch = &j->batch;
  const double *const xyz = batch->xyz + 3 * t;
  ef__search search = {.mixing = &batch->mixing,
                       .metric = batch->settings->metric};
  ef_match *const m = &batch->out[t];
  memset(m, 0, sizeof *m);
  m->target = (ef_xyz){xyz[0], xyz[1], xyz[2]};
  ef_metric_coordinates(search.metric, m->target, &batch->mixing.conditions,
                        search.target);
  const line l = line_to(j, m->target);
  double place = 0, low, high, amount[3];
  if (least_excess(&l, &place) <= 0) {
    limit(&l, place, &low, &high);
    place = nearest_place(&l, j->near != NULL ? j->near + 3 * t : NULL, low,
                          high);
  }
  point_of(&l, place, amount);
  ef__fill_amounts(amount, m);
  if (m->in_gamut) {
    ef__fill_exact(batch, amount, m->target, &m->nearest);
    if (batch->settings->hue_kept) m->hue_kept = m->nearest;
  } else {
    nearest_on_hexagon(&j->plane, &search, amount);
    ef__fill_shown(batch, &search, amount, &m->nearest);
  }
  ef__fill_held(m);
  if (batch->max_code <= 0) return;
  find_codes(batch, &search, m);
  ef__fill_coded(batch, &search, m);
}

static void match_range(void *context, size_t begin, size_t end) {
  for (size_t i = begin; i < end; ++i) match_one(context, i);
}

static ef_status check_setup(const ef_setup *setup, const ef__mixing *mixing,
                             ef_error *error) {
  const ef_observer *const observer = ef_setup_observer(setup);
  if (ef_observer_dimensions(observer) != 2) {
    return ef__error_set(error, EF_INVALID,
                         "observer %s sees three dimensions: ef_match_batch "
                         "finds matches",
                         ef_observer_name(observer));
  }
  if (mixing->affine) return EF_OK;
  return ef__error_set(error, EF_NO_ANSWER,
                       "'%s' does not mix by adding lights: matches for an "
                       "observer of two dimensions are found for setups that "
                       "do",
                       ef_device_name(ef_setup_device(setup)));
}

ef_status ef_match_flat_batch(const ef_setup *setup, size_t n,
                              const double *xyz, const double *near,
                              const ef_match_settings *settings, int jobs,
                              ef_match *out, ef_error *error) {
  enum { CHUNK = 64 };
  job j = {.near = near};
  double *block;
  ef_status status = ef__batch_start(&j.batch, setup, n, xyz, settings, jobs,
                                     out, &block, error);
  if (status == EF_OK) {
    status = ef__mixing_copy(setup, &j.batch.mixing, error);
  }
  if (status == EF_OK) status = check_setup(setup, &j.batch.mixing, error);
  if (status == EF_OK) {
    status = find_plane(&j.batch.mixing, &j.plane, error);
  }
  if (status == EF_OK) status = check_targets(&j, n, error);
  if (status == EF_OK) ef__parallel_for(n, CHUNK, jobs, match_range, &j);
  free(block);
  return status;
}

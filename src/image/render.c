/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Spectral images through folded weights. The image is taken in chunks, each
 * read and summed by one thread, and handed out in batches of some chunks in
 * their order; the next batch is made while the last one is in use. */
#include "image/image_private.h"

#include <math.h>
#include <pthread.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "base/base_private.h"
#include "kernel/kernels.h"

enum {
  MOST_CHUNK = 32768, /* pixels, for what comes out of many narrow ones */
  CHUNKS_A_THREAD = 4,
  MOST_THREADS = 64,
  MOST_TILE = 256, /* pixels that go through the kernel at a time */
  LEAST_TILE = 8
};
/* Samples of a tile: they stay in the second-level cache. */
#define TILE_BYTES ((size_t)128 << 10)
/* Share of a channel's weight below which a band is left out: far below what
 * floats hold. */
#define LEAST_SHARE 1e-12

/* What a thread needs while it has a chunk. */
typedef struct workspace {
  ef_cube_window *window;
  void *tile;
} workspace;

/* What came of a chunk. */
typedef struct outcome {
  size_t n_ignored, n_not_numbers;
  ef_error error;
} outcome;

typedef struct batch {
  size_t first, n; /* pixels */
  double *value;
  outcome *outcome; /* of each chunk */
} batch;

struct ef_render {
  const ef_cube *cube;
  ef_channel_role role;
  size_t n_channels, n_bands, n_pixels;
  size_t *band;
  double *matrix;   /* n_channels x n_bands, of stored values */
  double *constant; /* n_channels */
  bool has_constant, is_double;
  size_t chunk, n_chunks, tile;
  int jobs;
  size_t n_workspaces;
  workspace *workspace;
  workspace **idle; /* n_idle that no thread has */
  size_t n_idle;
  pthread_mutex_t lock; /* of the idle ones */
  bool has_lock;
  batch batch[2];
  int front;          /* of the two, the one in use */
  size_t next_pixel;  /* of the batch to be made next */
  bool is_started, is_over;
  pthread_t thread;   /* that makes the batch behind */
  bool has_thread;
  ef_render_info info;
};

ef_render_settings
ef_render_settings_default(const ef_illuminant *illuminant) {
  return (ef_render_settings){.role = EF_TRISTIMULUS,
                              .viewing = ef_viewing_default(illuminant)};
}

/* ---- Weights ------------------------------------------------------------- */

static bool is_needed(const ef_weights *weights, const double *whole,
                      size_t k) {
  const size_t n_channels = ef_weights_channels(weights);
  const size_t n_samples = ef_weights_samples(weights);
  const double *matrix = ef_weights_matrix(weights);
  for (size_t c = 0; c < n_channels; ++c) {
    if (fabs(matrix[c * n_samples + k]) > LEAST_SHARE * whole[c])
      return true;
  }
  return false;
}

static void note_left_out(const ef_render *r, const ef_notes *notes) {
  const ef_cube_head *head = ef_cube_get_head(r->cube);
  const size_t n = r->info.n_without_weight;
  if (n > 0)
    ef__note(notes, "%s: %zu of its bands lie where the observer sees nothing; "
                    "%zu from %g to %g nm are used",
             head->file, n, r->n_bands, r->info.shortest_nm,
             r->info.longest_nm);
}

/* Of the bands that count, weights of what is stored. */
static ef_status take_weights(ef_render *r, const ef_weights *weights,
                              ef_error *error) {
  const ef_cube_head *head = ef_cube_get_head(r->cube);
  const size_t n = head->n_used;
  const double *matrix = ef_weights_matrix(weights);
  r->n_channels = ef_weights_channels(weights);
  r->band = ef__allocate(n, sizeof *r->band);
  r->matrix = ef__allocate(r->n_channels * n, sizeof *r->matrix);
  r->constant = ef__allocate_zeroed(r->n_channels, sizeof *r->constant);
  double *whole = ef__allocate_zeroed(r->n_channels, sizeof *whole);
  size_t *kept = ef__allocate(n, sizeof *kept);
  if (r->band == NULL || r->matrix == NULL || r->constant == NULL ||
      whole == NULL || kept == NULL) {
    free(whole);
    free(kept);
    return ef__error_memory(error, "the weights of a spectral image");
  }
  for (size_t c = 0; c < r->n_channels; ++c) {
    for (size_t k = 0; k < n; ++k)
      whole[c] += fabs(matrix[c * n + k]);
  }
  for (size_t k = 0; k < n; ++k) {
    if (is_needed(weights, whole, k))
      kept[r->n_bands++] = k;
  }
  for (size_t i = 0; i < r->n_bands; ++i) {
    const size_t k = kept[i];
    r->band[i] = head->band[k];
    for (size_t c = 0; c < r->n_channels; ++c) {
      const double weight = matrix[c * n + k];
      r->matrix[c * r->n_bands + i] = weight * head->gain[k];
      r->constant[c] += weight * head->offset[k];
      r->has_constant = r->has_constant || r->constant[c] < 0.0 ||
                        r->constant[c] > 0.0;
    }
  }
  r->info.n_bands = r->n_bands;
  r->info.n_without_weight = n - r->n_bands;
  if (r->n_bands > 0) {
    r->info.shortest_nm = ef_grid_wavelength(&head->grid, kept[0]);
    r->info.longest_nm =
        ef_grid_wavelength(&head->grid, kept[r->n_bands - 1]);
  }
  free(whole);
  free(kept);
  if (r->n_bands > 0)
    return EF_OK;
  ef__error_set(error, EF_NO_ANSWER,
                "none of its %zu bands, %g to %g nm, lies where the observer "
                "sees anything",
                n, ef_grid_wavelength(&head->grid, 0),
                ef_grid_wavelength(&head->grid, n - 1));
  return ef__error_place(error, head->file, 0, 0, NULL);
}

/* ---- Room ---------------------------------------------------------------- */

static size_t count_threads(int jobs) {
  const long online = jobs == 0 ? sysconf(_SC_NPROCESSORS_ONLN) : jobs;
  return online < 1              ? 1
         : online < MOST_THREADS ? (size_t)online
                                 : MOST_THREADS;
}

static bool has_doubles(ef_sample_type type) {
  return type == EF_FLOAT64 || type == EF_INT32 || type == EF_UINT32;
}

static ef_status make_workspaces(ef_render *r, ef_error *error) {
  const size_t sample = r->is_double ? sizeof(double) : sizeof(float);
  r->tile = TILE_BYTES / (r->n_bands * sample);
  r->tile = r->tile > MOST_TILE ? MOST_TILE : r->tile < LEAST_TILE
                                                  ? LEAST_TILE
                                                  : r->tile;
  r->n_workspaces = (size_t)r->jobs;
  r->workspace = ef__allocate_zeroed(r->n_workspaces, sizeof *r->workspace);
  r->idle = ef__allocate(r->n_workspaces, sizeof *r->idle);
  if (r->workspace == NULL || r->idle == NULL)
    return ef__error_memory(error, "pixels");
  for (size_t i = 0; i < r->n_workspaces; ++i) {
    workspace *w = &r->workspace[i];
    w->window = ef_cube_window_new(r->cube, r->n_bands, r->band, error);
    if (w->window == NULL)
      return error->status;
    w->tile = ef__allocate(r->tile * r->n_bands, sample);
    if (w->tile == NULL)
      return ef__error_memory(error, "pixels");
    r->idle[r->n_idle++] = w;
    r->info.bytes += ef_cube_window_bytes(w->window) +
                     r->tile * r->n_bands * sample;
  }
  return EF_OK;
}

static ef_status make_batches(ef_render *r, ef_error *error) {
  r->chunk = ef_cube_window_pixels(r->workspace[0].window);
  if (r->chunk > MOST_CHUNK)
    r->chunk = MOST_CHUNK;
  r->n_chunks = CHUNKS_A_THREAD * (size_t)r->jobs;
  const size_t n = r->chunk * r->n_chunks;
  for (int i = 0; i < 2; ++i) {
    r->batch[i].value =
        ef__allocate(n, r->n_channels * sizeof *r->batch[i].value);
    r->batch[i].outcome =
        ef__allocate_zeroed(r->n_chunks, sizeof *r->batch[i].outcome);
    if (r->batch[i].value == NULL || r->batch[i].outcome == NULL)
      return ef__error_memory(error, "pixels");
    r->info.bytes += n * r->n_channels * sizeof *r->batch[i].value;
  }
  return EF_OK;
}

static ef_status build(ef_render *r, const ef_observer *observer,
                       const ef_render_settings *settings, ef_error *error) {
  const ef_cube_head *head = ef_cube_get_head(r->cube);
  ef_weights *weights =
      ef_observer_weights(observer, settings->role, &head->grid,
                          &settings->viewing, settings->notes, error);
  if (weights == NULL)
    return error->status;
  ef_status status = take_weights(r, weights, error);
  ef_weights_free(weights);
  if (status != EF_OK)
    return status;
  note_left_out(r, settings->notes);
  r->n_pixels = head->width * head->height;
  r->is_double = has_doubles(head->type);
  r->jobs = (int)count_threads(settings->jobs);
  if (pthread_mutex_init(&r->lock, NULL) != 0)
    return ef__error_memory(error, "a lock");
  r->has_lock = true;
  status = make_workspaces(r, error);
  return status == EF_OK ? make_batches(r, error) : status;
}

ef_render *ef_render_new(const ef_cube *cube, const ef_observer *observer,
                         const ef_render_settings *settings, ef_error *error) {
  ef_error own = {0}; /* the status stands in the error */
  if (error == NULL)
    error = &own;
  ef_render *r = ef__allocate_zeroed(1, sizeof *r);
  if (r == NULL) {
    ef__error_memory(error, "a spectral image");
    return NULL;
  }
  r->cube = cube;
  r->role = settings->role;
  if (settings->role != EF_TRISTIMULUS && settings->role != EF_CONES)
    ef__error_set(error, EF_INVALID, "pixels have X, Y, Z or L, M, S");
  else if (build(r, observer, settings, error) == EF_OK)
    return r;
  ef_render_free(r);
  return NULL;
}

void ef_render_free(ef_render *render) {
  if (render == NULL)
    return;
  if (render->has_thread)
    pthread_join(render->thread, NULL);
  if (render->has_lock)
    pthread_mutex_destroy(&render->lock);
  for (size_t i = 0; render->workspace != NULL && i < render->n_workspaces;
       ++i) {
    ef_cube_window_free(render->workspace[i].window);
    free(render->workspace[i].tile);
  }
  for (int i = 0; i < 2; ++i) {
    free(render->batch[i].value);
    free(render->batch[i].outcome);
  }
  free(render->workspace);
  free(render->idle);
  free(render->band);
  free(render->matrix);
  free(render->constant);
  free(render);
}

const ef_cube_head *ef__render_head(const ef_render *render) {
  return ef_cube_get_head(render->cube);
}

ef_channel_role ef__render_role(const ef_render *render) {
  return render->role;
}

size_t ef_render_channels(const ef_render *render) {
  return render->n_channels;
}

ef_render_info ef_render_get_info(const ef_render *render) {
  return render->info;
}

/* ---- A chunk ------------------------------------------------------------- */

static workspace *borrow(ef_render *r) {
  pthread_mutex_lock(&r->lock);
  workspace *const w = r->idle[--r->n_idle]; /* as many as threads */
  pthread_mutex_unlock(&r->lock);
  return w;
}

static void give_back(ef_render *r, workspace *w) {
  pthread_mutex_lock(&r->lock);
  r->idle[r->n_idle++] = w;
  pthread_mutex_unlock(&r->lock);
}

/* Equal, without a comparison that compilers warn of. */
#define IS_SAME(a, b) (!((a) < (b)) && !((a) > (b)))

static bool has_ignored_float(const float *sample, size_t n, float ignored) {
  bool is_there = false;
  for (size_t k = 0; k < n; ++k)
    is_there = is_there || (IS_SAME(sample[k], ignored) && !isnan(sample[k]));
  return is_there;
}

static bool has_ignored_double(const double *sample, size_t n,
                               double ignored) {
  bool is_there = false;
  for (size_t k = 0; k < n; ++k)
    is_there = is_there || (IS_SAME(sample[k], ignored) && !isnan(sample[k]));
  return is_there;
}

#define MARK_IGNORED(TYPE)                                                     \
  {                                                                            \
    const TYPE *const from = (const TYPE *)plane->value;                       \
    const TYPE wanted = (TYPE)head->ignored;                                   \
    for (size_t k = 0; k < r->n_bands; ++k) {                                  \
      for (size_t i = 0; i < n; ++i)                                           \
        mark[i] |= IS_SAME(from[k * plane->band_step + i], wanted);            \
    }                                                                          \
  }

/* Which of n pixels of a plane hold the ignored value. */
static void mark_ignored(const ef_render *r, const ef_cube_plane *plane,
                         size_t n, unsigned char *mark) {
  const ef_cube_head *head = ef_cube_get_head(r->cube);
  const double ignored = head->ignored;
  memset(mark, 0, n);
  if (!head->has_ignored)
    return;
  switch (head->type) {
  case EF_FLOAT32:
    for (size_t k = 0; k < r->n_bands; ++k) {
      const float *from = (const float *)plane->value + k * plane->band_step;
      for (size_t i = 0; i < n; ++i)
        mark[i] |= IS_SAME(from[i], (float)ignored) && !isnan(from[i]);
    }
    break;
  case EF_INT16:
    if (ignored >= INT16_MIN && ignored <= INT16_MAX &&
        IS_SAME(ignored, floor(ignored)))
      MARK_IGNORED(int16_t)
    break;
  default:
    if (ignored >= 0.0 && ignored <= UINT16_MAX &&
        IS_SAME(ignored, floor(ignored)))
      MARK_IGNORED(uint16_t)
  }
}

/* Counts pixels without data and makes them NaN; adds the constants. */
static void finish_tile(const ef_render *r, size_t n,
                        const unsigned char *mark, double *value, outcome *o) {
  const size_t n_channels = r->n_channels;
  for (size_t i = 0; i < n; ++i, value += n_channels) {
    const bool is_ignored = mark[i] != 0;
    bool is_finite = true;
    for (size_t c = 0; c < n_channels; ++c) {
      is_finite = is_finite && isfinite(value[c]);
      value[c] += r->constant[c];
    }
    if (!is_ignored && is_finite)
      continue;
    o->n_ignored += is_ignored;
    o->n_not_numbers += !is_ignored;
    for (size_t c = 0; c < n_channels; ++c)
      value[c] = (double)NAN;
  }
}

/* Which of n pixels, one after another, hold the ignored value. */
static void mark_samples(const ef_render *r, size_t n, const void *sample,
                         unsigned char *mark) {
  const ef_cube_head *head = ef_cube_get_head(r->cube);
  memset(mark, 0, n);
  for (size_t i = 0; head->has_ignored && i < n; ++i) {
    const size_t at = i * r->n_bands;
    mark[i] = r->is_double
                  ? has_ignored_double((const double *)sample + at, r->n_bands,
                                       head->ignored)
                  : has_ignored_float((const float *)sample + at, r->n_bands,
                                      (float)head->ignored);
  }
}

static void sum_tile(const ef_render *r, const workspace *w, size_t i,
                     size_t n, double *value, outcome *o) {
  unsigned char mark[MOST_TILE];
  if (r->is_double) {
    const double *values = ef_cube_window_doubles(w->window, i, n, w->tile);
    ef__kernels()->apply(r->n_bands, r->n_channels, r->matrix, n, values,
                         value);
    mark_samples(r, n, values, mark);
  } else {
    const float *values = ef_cube_window_floats(w->window, i, n, w->tile);
    ef__kernels()->apply_float(r->n_bands, r->n_channels, r->matrix, n, values,
                               value);
    mark_samples(r, n, values, mark);
  }
  finish_tile(r, n, mark, value, o);
}

static bool has_plane_kernel(ef_sample_type type) {
  return type == EF_FLOAT32 || type == EF_INT16 || type == EF_UINT16;
}

/* As many pixels of a plane as a tile takes. */
static size_t sum_plane(const ef_render *r, const ef_cube_plane *plane,
                        size_t most, double *value, outcome *o) {
  unsigned char mark[MOST_TILE];
  size_t n = plane->n < most ? plane->n : most;
  n = n < MOST_TILE ? n : MOST_TILE;
  switch (ef_cube_get_head(r->cube)->type) {
  case EF_FLOAT32:
    ef__kernels()->bands_float(r->n_bands, r->matrix, n, plane->value,
                               plane->band_step, value);
    break;
  case EF_INT16:
    ef__kernels()->bands_int16(r->n_bands, r->matrix, n, plane->value,
                               plane->band_step, value);
    break;
  default:
    ef__kernels()->bands_uint16(r->n_bands, r->matrix, n, plane->value,
                                plane->band_step, value);
  }
  mark_ignored(r, plane, n, mark);
  finish_tile(r, n, mark, value, o);
  return n;
}

/* n pixels of a window, in the way that their layout allows. */
static void sum_pixels(const ef_render *r, const workspace *w, size_t n,
                       double *value, outcome *o) {
  const bool by_planes =
      r->n_channels == 3 && has_plane_kernel(ef_cube_get_head(r->cube)->type);
  for (size_t i = 0; i < n;) {
    ef_cube_plane plane;
    size_t some = n - i < r->tile ? n - i : r->tile;
    if (by_planes && ef_cube_window_plane(w->window, i, &plane))
      some = sum_plane(r, &plane, n - i, value + i * r->n_channels, o);
    else
      sum_tile(r, w, i, some, value + i * r->n_channels, o);
    i += some;
  }
}

/* Chunk `index` of the batch behind. */
static void make_chunk(ef_render *r, size_t index) {
  const batch *b = &r->batch[1 - r->front];
  const size_t first = index * r->chunk;
  const size_t n = b->n - first < r->chunk ? b->n - first : r->chunk;
  outcome *o = &b->outcome[index];
  *o = (outcome){0};
  workspace *const w = borrow(r);
  if (ef_cube_window_read(w->window, b->first + first, n, &o->error) == EF_OK)
    sum_pixels(r, w, n, b->value + first * r->n_channels, o);
  give_back(r, w);
}

/* ---- Batches ------------------------------------------------------------- */

static void make_chunks(void *cookie, size_t begin, size_t end) {
  for (size_t i = begin; i < end; ++i)
    make_chunk(cookie, i);
}

static void *make_batch(void *cookie) {
  ef_render *const r = cookie;
  const size_t n = r->batch[1 - r->front].n;
  ef__parallel_for((n + r->chunk - 1) / r->chunk, 1, r->jobs, make_chunks, r);
  return NULL;
}

/* Lays out the batch behind and has it made, by a thread of its own where there
 * may be more than one. */
static void start_batch(ef_render *r) {
  batch *const b = &r->batch[1 - r->front];
  const size_t left = r->n_pixels - r->next_pixel;
  const size_t most = r->chunk * r->n_chunks;
  b->first = r->next_pixel;
  b->n = left < most ? left : most;
  r->next_pixel += b->n;
  r->has_thread = r->jobs > 1 && b->n > 0 &&
                  pthread_create(&r->thread, NULL, make_batch, r) == 0;
}

static ef_status take_outcomes(ef_render *r, const batch *b, ef_error *error) {
  for (size_t i = 0; i * r->chunk < b->n; ++i) {
    const outcome *o = &b->outcome[i];
    if (o->error.status != EF_OK) {
      *error = o->error;
      return error->status;
    }
    r->info.n_ignored += o->n_ignored;
    r->info.n_not_numbers += o->n_not_numbers;
  }
  r->info.n_pixels += b->n;
  return EF_OK;
}

ef_status ef_render_next(ef_render *render, size_t *n, const double **value,
                         ef_error *error) {
  ef_render *const r = render;
  ef_error own = {0};
  *n = 0;
  *value = NULL;
  if (r->is_over)
    return EF_OK;
  if (!r->is_started)
    start_batch(r);
  r->is_started = true;
  if (r->has_thread)
    pthread_join(r->thread, NULL);
  else
    make_batch(r);
  r->has_thread = false;
  r->front = 1 - r->front;
  const batch *b = &r->batch[r->front];
  const ef_status status = take_outcomes(r, b, error != NULL ? error : &own);
  r->is_over = status != EF_OK || b->n == 0;
  if (r->is_over)
    return status;
  start_batch(r);
  *n = b->n;
  *value = b->value;
  return EF_OK;
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
/* A few observers that stand for many: k medoids of the fundamentals. Under the
 * squared Euclidean distance the sum of distances from a member m to a group is
 * n |m - mean|^2 plus the same for all m, so the medoid of a group is the
 * member nearest to its mean, and a round of Voronoi iteration costs no more
 * than one of k-means. */
#include <float.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"
#include "observer/population_private.h"

enum {
  WAVELENGTHS = 40, /* 390 to 780 nm at 10 nm */
  SIZE = 3 * WAVELENGTHS,
  MOST_MEDOIDS = 100,
  MOST_MEMBERS = 100000,
  STARTS = 5,
  ROUNDS = 100,     /* far above the some ten that are seen */
  CHUNK = 256
};

typedef struct grouping {
  const ef_population *population;
  const ef__cones *cones;
  size_t n, k;
  double *vector;   /* n x SIZE */
  size_t *group;    /* n: number of the nearest medoid */
  double *distance; /* n: squared, to it */
  double *mean;     /* k x SIZE */
  size_t *size;     /* k */
  size_t *medoid;   /* k: members */
  size_t *best;     /* k: of the best start */
} grouping;

static void make_vectors(void *context, size_t begin, size_t end) {
  const grouping *const g = context;
  for (size_t i = begin; i < end; ++i) {
    const ef_cone_model model = ef_population_member(g->population, i);
    ef__cones_fundamentals(g->cones, &model, EF_ENERGY, g->vector + i * SIZE);
  }
}

static double squared(const double *restrict a, const double *restrict b) {
  double part[4] = {0};
  for (size_t j = 0; j < SIZE; j += 4) {
    for (size_t s = 0; s < 4; ++s) {
      const double off = a[j + s] - b[j + s];
      part[s] += off * off;
    }
  }
  return (part[0] + part[1]) + (part[2] + part[3]);
}

/* Nearest medoid of each member, the first of equal ones. */
static void assign(void *context, size_t begin, size_t end) {
  const grouping *const g = context;
  for (size_t i = begin; i < end; ++i) {
    g->distance[i] = DBL_MAX;
    for (size_t m = 0; m < g->k; ++m) {
      const double d =
          squared(g->vector + i * SIZE, g->vector + g->medoid[m] * SIZE);
      if (d >= g->distance[i]) continue;
      g->distance[i] = d;
      g->group[i] = m;
    }
  }
}

static double total_distance(const grouping *g) {
  double total = 0;
  for (size_t i = 0; i < g->n; ++i) total += g->distance[i];
  return total;
}

/* k-means++: each further medoid is drawn with a chance in proportion to its
 * squared distance from those there are. */
static void seed_medoids(grouping *g, ef__random *random) {
  g->medoid[0] = (size_t)(ef__random_unit(random) * (double)g->n);
  for (size_t i = 0; i < g->n; ++i) {
    g->distance[i] =
        squared(g->vector + i * SIZE, g->vector + g->medoid[0] * SIZE);
  }
  for (size_t m = 1; m < g->k; ++m) {
    double left = ef__random_unit(random) * total_distance(g);
    size_t chosen = 0;
    while (chosen + 1 < g->n && left >= g->distance[chosen]) {
      left -= g->distance[chosen];
      ++chosen;
    }
    g->medoid[m] = chosen;
    for (size_t i = 0; i < g->n; ++i) {
      const double d =
          squared(g->vector + i * SIZE, g->vector + chosen * SIZE);
      if (d < g->distance[i]) g->distance[i] = d;
    }
  }
}

static void find_means(grouping *g) {
  memset(g->mean, 0, g->k * SIZE * sizeof *g->mean);
  memset(g->size, 0, g->k * sizeof *g->size);
  for (size_t i = 0; i < g->n; ++i) {
    double *const mean = g->mean + g->group[i] * SIZE;
    for (size_t j = 0; j < SIZE; ++j) mean[j] += g->vector[i * SIZE + j];
    ++g->size[g->group[i]];
  }
  for (size_t m = 0; m < g->k; ++m) {
    if (g->size[m] == 0) continue; /* members that coincide; keeps its medoid */
    for (size_t j = 0; j < SIZE; ++j) {
      g->mean[m * SIZE + j] /= (double)g->size[m];
    }
  }
}

static void distance_to_mean(void *context, size_t begin, size_t end) {
  const grouping *const g = context;
  for (size_t i = begin; i < end; ++i) {
    g->distance[i] =
        squared(g->vector + i * SIZE, g->mean + g->group[i] * SIZE);
  }
}

/* The member of each group nearest to its mean, the first of equal ones. True
 * when a medoid moved. */
static bool move_medoids(grouping *g, int jobs) {
  double nearest[MOST_MEDOIDS];
  size_t before[MOST_MEDOIDS];
  find_means(g);
  ef__parallel_for(g->n, CHUNK, jobs, distance_to_mean, g);
  for (size_t m = 0; m < g->k; ++m) {
    before[m] = g->medoid[m];
    nearest[m] = DBL_MAX;
  }
  for (size_t i = 0; i < g->n; ++i) {
    const size_t m = g->group[i];
    if (g->distance[i] >= nearest[m]) continue;
    nearest[m] = g->distance[i];
    g->medoid[m] = i;
  }
  return memcmp(before, g->medoid, g->k * sizeof *before) != 0;
}

/* One start; returns the sum of squared distances. */
static double iterate(grouping *g, ef__random *random, int jobs) {
  seed_medoids(g, random);
  ef__parallel_for(g->n, CHUNK, jobs, assign, g);
  for (int round = 0; round < ROUNDS; ++round) {
    if (!move_medoids(g, jobs)) break;
    ef__parallel_for(g->n, CHUNK, jobs, assign, g);
  }
  ef__parallel_for(g->n, CHUNK, jobs, assign, g);
  return total_distance(g);
}

/* Largest group first, then by member. */
static void report(grouping *g, size_t *index, double *share) {
  memset(g->size, 0, g->k * sizeof *g->size);
  for (size_t i = 0; i < g->n; ++i) ++g->size[g->group[i]];
  for (size_t m = 0; m < g->k; ++m) {
    size_t place = 0;
    for (size_t o = 0; o < g->k; ++o) {
      const bool is_before =
          g->size[o] > g->size[m] ||
          (g->size[o] == g->size[m] && g->medoid[o] < g->medoid[m]) ||
          (g->size[o] == g->size[m] && g->medoid[o] == g->medoid[m] && o < m);
      if (is_before) ++place;
    }
    index[place] = g->medoid[m];
    if (share != NULL) share[place] = (double)g->size[m] / (double)g->n;
  }
}

static void group_members(grouping *g, uint64_t seed, int jobs) {
  double least = DBL_MAX;
  ef__parallel_for(g->n, CHUNK, jobs, make_vectors, g);
  for (uint64_t start = 0; start < STARTS; ++start) {
    ef__random random = ef__random_stream(seed, start);
    const double total = iterate(g, &random, jobs);
    if (total >= least) continue;
    least = total;
    memcpy(g->best, g->medoid, g->k * sizeof *g->best);
  }
  memcpy(g->medoid, g->best, g->k * sizeof *g->medoid);
  ef__parallel_for(g->n, CHUNK, jobs, assign, g);
}

static ef_status check(const ef_population *population, size_t k,
                       ef_error *error) {
  const size_t n = ef_population_count(population);
  if (n > MOST_MEMBERS) {
    return ef__error_set(error, EF_INVALID,
                         "medoids of %zu observers; a population of at most "
                         "%d will do",
                         n, MOST_MEMBERS);
  }
  const size_t most = n < MOST_MEDOIDS ? n : MOST_MEDOIDS;
  if (k >= 1 && k <= most) return EF_OK;
  return ef__error_set(error, EF_INVALID,
                       "%zu medoids of %zu observers; 1 to %zu are possible", k,
                       n, most);
}

ef_status ef_population_medoids(const ef_population *population, size_t k,
                                uint64_t seed, int jobs, size_t *index,
                                double *share, ef_error *error) {
  const ef_grid grid = {.count = WAVELENGTHS, .start_nm = 390, .step_nm = 10};
  ef__cones *cones = NULL;
  ef_status status = check(population, k, error);
  if (status == EF_OK) status = ef__cones_new(&grid, &cones, error);
  if (status != EF_OK) return status;
  const size_t n = ef_population_count(population);
  grouping g = {.population = population, .cones = cones, .n = n, .k = k};
  const ef__part parts[] = {{&g.vector, n * SIZE, sizeof *g.vector},
                            {&g.group, n, sizeof *g.group},
                            {&g.distance, n, sizeof *g.distance},
                            {&g.mean, k * SIZE, sizeof *g.mean},
                            {&g.size, k, sizeof *g.size},
                            {&g.medoid, k, sizeof *g.medoid},
                            {&g.best, k, sizeof *g.best}};
  void *const block =
      ef__allocate_block(sizeof parts / sizeof *parts, parts);
  if (block == NULL) {
    status = ef__error_memory(error, "medoids of a population");
  } else {
    group_members(&g, seed, jobs);
    report(&g, index, share);
  }
  free(block);
  free(cones);
  return status;
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
/* SHA-256: FIPS 180-4, sections 4.1.2, 5 and 6.2. */
#include <errno.h>
#include <fcntl.h>
#include <stdint.h>
#include <string.h>
#include <unistd.h>

#include "base/base_private.h"
#include "exchange/exchange_private.h"

enum { BLOCK_BYTES = 64, ROUNDS = 64, READ_BYTES = 1 << 16 };

typedef struct sha256 {
  uint32_t state[8];
  uint64_t n_bytes;
  unsigned char block[BLOCK_BYTES];
} sha256;

/* The first 32 bits of the fractional parts of the cube roots of the first 64
 * primes (4.2.2). */
static const uint32_t constant[ROUNDS] = {
    0x428a2f98, 0x71374491, 0xb5c0fbcf, 0xe9b5dba5, 0x3956c25b, 0x59f111f1,
    0x923f82a4, 0xab1c5ed5, 0xd807aa98, 0x12835b01, 0x243185be, 0x550c7dc3,
    0x72be5d74, 0x80deb1fe, 0x9bdc06a7, 0xc19bf174, 0xe49b69c1, 0xefbe4786,
    0x0fc19dc6, 0x240ca1cc, 0x2de92c6f, 0x4a7484aa, 0x5cb0a9dc, 0x76f988da,
    0x983e5152, 0xa831c66d, 0xb00327c8, 0xbf597fc7, 0xc6e00bf3, 0xd5a79147,
    0x06ca6351, 0x14292967, 0x27b70a85, 0x2e1b2138, 0x4d2c6dfc, 0x53380d13,
    0x650a7354, 0x766a0abb, 0x81c2c92e, 0x92722c85, 0xa2bfe8a1, 0xa81a664b,
    0xc24b8b70, 0xc76c51a3, 0xd192e819, 0xd6990624, 0xf40e3585, 0x106aa070,
    0x19a4c116, 0x1e376c08, 0x2748774c, 0x34b0bcb5, 0x391c0cb3, 0x4ed8aa4a,
    0x5b9cca4f, 0x682e6ff3, 0x748f82ee, 0x78a5636f, 0x84c87814, 0x8cc70208,
    0x90befffa, 0xa4506ceb, 0xbef9a3f7, 0xc67178f2};

static uint32_t turn(uint32_t x, unsigned n) {
  return x >> n | x << (32u - n);
}

/* One block (6.2.2). */
static void mix(sha256 *s) {
  uint32_t w[ROUNDS];
  for (size_t t = 0; t < 16; ++t) {
    const unsigned char *b = s->block + 4 * t;
    w[t] = (uint32_t)b[0] << 24 | (uint32_t)b[1] << 16 | (uint32_t)b[2] << 8 |
           b[3];
  }
  for (size_t t = 16; t < ROUNDS; ++t) {
    const uint32_t a = w[t - 15], b = w[t - 2];
    w[t] = w[t - 16] + (turn(a, 7) ^ turn(a, 18) ^ a >> 3) + w[t - 7] +
           (turn(b, 17) ^ turn(b, 19) ^ b >> 10);
  }
  uint32_t v[8];
  memcpy(v, s->state, sizeof v);
  for (size_t t = 0; t < ROUNDS; ++t) {
    const uint32_t first =
        v[7] + (turn(v[4], 6) ^ turn(v[4], 11) ^ turn(v[4], 25)) +
        ((v[4] & v[5]) ^ (~v[4] & v[6])) + constant[t] + w[t];
    const uint32_t second = (turn(v[0], 2) ^ turn(v[0], 13) ^ turn(v[0], 22)) +
                            ((v[0] & v[1]) ^ (v[0] & v[2]) ^ (v[1] & v[2]));
    memmove(v + 1, v, 7 * sizeof *v);
    v[4] += first;
    v[0] = first + second;
  }
  for (size_t i = 0; i < 8; ++i)
    s->state[i] += v[i];
}

static void add(sha256 *s, const unsigned char *bytes, size_t length) {
  while (length > 0) {
    const size_t used = (size_t)(s->n_bytes % BLOCK_BYTES);
    const size_t room = BLOCK_BYTES - used;
    const size_t taken = length < room ? length : room;
    memcpy(s->block + used, bytes, taken);
    s->n_bytes += taken;
    bytes += taken;
    length -= taken;
    if (taken == room)
      mix(s);
  }
}

/* Padding (5.1.1), and the digest as text. */
static void finish(sha256 *s, char text[EF_DIGEST_TEXT]) {
  static const unsigned char padding[BLOCK_BYTES] = {0x80};
  static const char digit[] = "0123456789abcdef";
  const uint64_t n_bits = s->n_bytes * 8u;
  const size_t used = (size_t)(s->n_bytes % BLOCK_BYTES);
  add(s, padding, used < 56 ? 56 - used : 120 - used);
  unsigned char length[8];
  for (unsigned i = 0; i < 8; ++i)
    length[i] = (unsigned char)(n_bits >> (56u - 8u * i));
  add(s, length, sizeof length);
  for (size_t i = 0; i < EF_DIGEST_TEXT - 1; ++i)
    text[i] = digit[s->state[i / 8] >> (28u - 4u * (i % 8)) & 15u];
  text[EF_DIGEST_TEXT - 1] = '\0';
}

static ef_status add_file(sha256 *s, const char *path, ef_error *error) {
  const int file = open(path, O_RDONLY | O_CLOEXEC);
  int reason = file < 0 ? errno : 0;
  unsigned char bytes[READ_BYTES];
  while (reason == 0) {
    const ssize_t length = read(file, bytes, sizeof bytes);
    if (length > 0)
      add(s, bytes, (size_t)length);
    else if (length == 0)
      break;
    else if (errno != EINTR)
      reason = errno;
  }
  if (file >= 0)
    close(file);
  if (reason == 0)
    return EF_OK;
  ef__error_set(error, EF_UNREADABLE, "cannot be read: %s", strerror(reason));
  return ef__error_place(error, path, 0, 0, NULL);
}

ef_status ef_digest_file(const char *path, char text[EF_DIGEST_TEXT],
                         ef_error *error) {
  /* The first 32 bits of the fractional parts of the square roots of the first
   * eight primes (5.3.3). */
  sha256 s = {.state = {0x6a09e667, 0xbb67ae85, 0x3c6ef372, 0xa54ff53a,
                        0x510e527f, 0x9b05688c, 0x1f83d9ab, 0x5be0cd19}};
  ef__span demo;
  ef_status status = EF_OK;
  switch (ef__demo_find(path, &demo, error)) {
  case EF__DEMO_FOUND:
    add(&s, (const unsigned char *)demo.text, demo.length);
    break;
  case EF__DEMO_UNKNOWN:
    return EF_UNKNOWN_NAME;
  case EF__DEMO_NONE:
    status = add_file(&s, path, error);
  }
  if (status == EF_OK)
    finish(&s, text);
  return status;
}

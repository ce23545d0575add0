/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What people write into quantity and unit lines. */
#include "exchange/exchange_private.h"

#include <string.h>

static char lower(char c) {
  return c >= 'A' && c <= 'Z' ? (char)(c - 'A' + 'a') : c;
}

static bool is_letter(char c) {
  return lower(c) >= 'a' && lower(c) <= 'z';
}

/* True when `word` (lower case) stands in the text as a word of its own. */
static bool has_word(const char *text, const char *word) {
  const size_t length = strlen(word);
  for (const char *at = text; *at != '\0'; ++at) {
    if (at > text && is_letter(at[-1])) continue;
    size_t n = 0;
    while (n < length && lower(at[n]) == word[n]) ++n;
    if (n == length && !is_letter(at[n])) return true;
  }
  return false;
}

static bool has_any(const char *text, const char *const *words) {
  for (; *words != NULL; ++words) {
    if (has_word(text, *words)) return true;
  }
  return false;
}

int ef__quantity_kind(const char *text) {
  static const char *const surface[] = {
      "reflectance",   "reflectances",   "reflectivity",
      "reflection",    "radiance factor", "radiance factors",
      "transmittance", "transmittances", "transmission", NULL};
  static const char *const light[] = {
      "radiance", "irradiance", "power", "light", "lights", "emission",
      "radiant",  "flux",       "exitance", NULL};
  /* A radiance factor names radiance too, and reflectances are measured in
   * some light: surfaces first. */
  if (has_any(text, surface)) return 1;
  return has_any(text, light) ? -1 : 0;
}

bool ef__unit_is_percent(const char *text) {
  return strchr(text, '%') != NULL || has_word(text, "percent");
}

/* ---- Units ------------------------------------------------------------- */

/* Signs of one byte for those that people write with several: superscripts and
 * the raised dot of UTF-8 (and Latin-1's two). */
typedef struct sign {
  const char *bytes;
  char plain; /* '\0': left out */
} sign;

static const sign signs[] = {
    {"\xC2\xB2", '2'},     {"\xC2\xB9", '1'}, {"\xE2\x81\xBB", '-'},
    {"\xE2\x88\x92", '-'}, {"\xC2\xB7", 0},   {"\xE2\x8B\x85", 0},
    {"\xB2", '2'},         {"\xB9", '1'},     {"^", 0},
    {" ", 0},              {"\t", 0},         {"*", 0},
    {"(", 0},              {")", 0},          {".", 0},
};

/* Copies the text without blanks, carets, dots and brackets. */
static void simplify(const char *text, size_t size, char *out) {
  size_t n = 0;
  while (*text != '\0' && n + 1 < size) {
    const sign *found = NULL;
    for (size_t i = 0; i < sizeof signs / sizeof *signs && !found; ++i) {
      const size_t length = strlen(signs[i].bytes);
      if (strncmp(text, signs[i].bytes, length) == 0) found = &signs[i];
    }
    if (found == NULL) {
      out[n++] = *text++;
    } else {
      if (found->plain != '\0') out[n++] = found->plain;
      text += strlen(found->bytes);
    }
  }
  out[n] = '\0';
}

/* True when one of the spellings stands in the text, with no letter before it
 * that would make it another unit (mW ...). Blanks are gone, so the letter
 * before is looked up in the text as it was written. */
static bool has_unit(const char *text, const char *const *spellings) {
  for (const char *at = text; *at != '\0'; ++at) {
    if (at > text && (is_letter(at[-1]) || at[-1] == '\xB5' ||
                      at[-1] == '\xBC')) {
      continue; /* inside a word; micro signs */
    }
    char simple[64];
    simplify(at, sizeof simple, simple);
    for (const char *const *s = spellings; *s != NULL; ++s) {
      if (strncmp(simple, *s, strlen(*s)) == 0) return true;
    }
  }
  return false;
}

bool ef__unit_is_radiance(const char *text) {
  static const char *const spellings[] = {
      "Wsr-1m-2nm-1", "Wm-2sr-1nm-1", "Wm-2nm-1sr-1", "Wsr-1nm-1m-2",
      "Wnm-1sr-1m-2", "Wnm-1m-2sr-1", "W/srm2nm",     "W/m2srnm",
      "W/m2nmsr",     "W/srnmm2",     "W/sr/m2/nm",   "W/m2/sr/nm",
      "W/m2/nm/sr",   "W/sr/nm/m2",   NULL};
  return has_unit(text, spellings);
}

bool ef__unit_is_luminance(const char *text) {
  static const char *const spellings[] = {"cd/m2", "cdm-2", NULL};
  return has_unit(text, spellings);
}

/* SPDX-License-Identifier: GPL-3.0-or-later */
/* Headers of spectral images: `key = value` lines behind a line ENVI. */
#include "exchange/exchange_private.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/base_private.h"

enum { MOST_BANDS = 65536, MOST_KEY = 64 };
#define MOST_SIDE 2147483647.0
/* Above this no wavelength that an eye gets anything from is in micrometres. */
#define MICROMETRES_BELOW 100.0

/* ---- Keys ---------------------------------------------------------------- */

typedef enum key {
  KEY_SAMPLES,
  KEY_LINES,
  KEY_BANDS,
  KEY_OFFSET,
  KEY_FILE_TYPE,
  KEY_DATA_TYPE,
  KEY_INTERLEAVE,
  KEY_BYTE_ORDER,
  KEY_WAVELENGTH,
  KEY_UNITS,
  KEY_SCALE,
  KEY_GAIN,
  KEY_DATA_OFFSET,
  KEY_IGNORED,
  KEY_BAD_BANDS,
  KEY_DESCRIPTION,
  KEY_COMPRESSION,
  KEY_MAJOR_FRAMES,
  KEY_MINOR_FRAMES,
  N_KEYS
} key;

static const char *const key_names[N_KEYS] = {
    "samples",          "lines",
    "bands",            "header offset",
    "file type",        "data type",
    "interleave",       "byte order",
    "wavelength",       "wavelength units",
    "reflectance scale factor", "data gain values",
    "data offset values", "data ignore value",
    "bbl",              "description",
    "file compression", "major frame offsets",
    "minor frame offsets"};

/* A header as it is read: what each key that counts says, and in which line. */
typedef struct header_text {
  const char *name;
  const char *at, *end;
  size_t line; /* of what `at` points to, from 1 */
  const ef_notes *notes;
  ef__span value[N_KEYS];
  size_t value_line[N_KEYS]; /* 0: not there */
} header_text;

static ef_status fault_at(const header_text *h, key k, ef_error *error) {
  return ef__error_place(error, h->name, h->value_line[k], 0, key_names[k]);
}

static bool is_space(char c) {
  return c == ' ' || c == '\t' || c == '\n' || c == '\r';
}

static ef__span trim(ef__span s) {
  while (s.length > 0 && is_space(s.text[0])) {
    ++s.text;
    --s.length;
  }
  while (s.length > 0 && is_space(s.text[s.length - 1]))
    --s.length;
  return s;
}

static char lower(char c) {
  return c >= 'A' && c <= 'Z' ? (char)(c - 'A' + 'a') : c;
}

/* Equal but for case, and for how many blanks stand between words. */
static bool is_word(ef__span s, const char *word) {
  size_t i = 0;
  while (i < s.length) {
    const bool is_blank = is_space(s.text[i]);
    if (*word == '\0' || (is_blank ? ' ' : lower(s.text[i])) != *word)
      return false;
    ++word;
    ++i;
    while (is_blank && i < s.length && is_space(s.text[i]))
      ++i;
  }
  return *word == '\0';
}

static key find_key(ef__span name) {
  int k = 0;
  while (k < N_KEYS && !is_word(name, key_names[k]))
    ++k;
  return (key)k;
}

/* ---- Lines --------------------------------------------------------------- */

/* The next line without its end; false behind the last. */
static bool next_line(header_text *h, ef__span *line) {
  if (h->at >= h->end)
    return false;
  const size_t left = (size_t)(h->end - h->at);
  const char *const stop = memchr(h->at, '\n', left);
  const size_t length = stop != NULL ? (size_t)(stop - h->at) : left;
  *line = (ef__span){h->at, length};
  h->at += stop != NULL ? length + 1 : length;
  ++h->line;
  return true;
}

/* A value in braces goes on to the brace that closes it. */
static ef_status take_braces(header_text *h, const char *open, ef__span name,
                             ef__span *value, ef_error *error) {
  const size_t first_line = h->line;
  const char *const close = memchr(open, '}', (size_t)(h->end - open));
  char quoted[EF__QUOTED];
  if (close == NULL) {
    ef__error_set(error, EF_MALFORMED,
                  "the brace of %s does not close; expected a '}'",
                  ef__quote(name, quoted));
    return ef__error_place(error, h->name, first_line, 0, NULL);
  }
  *value = trim((ef__span){open + 1, (size_t)(close - open - 1)});
  for (const char *at = h->at; at < close; ++at)
    h->line += *at == '\n';
  const char *stop = h->at;
  if (close >= h->at) { /* in a later line */
    ef__span rest;
    h->at = close + 1;
    (void)next_line(h, &rest);
    stop = h->at;
  }
  const char *c = close + 1;
  while (c < stop && is_space(*c))
    ++c;
  if (c == stop)
    return EF_OK;
  ef__error_set(error, EF_MALFORMED,
                "text stands behind the '}' of %s; expected the next key in a "
                "line of its own",
                ef__quote(name, quoted));
  return ef__error_place(error, h->name, h->line, 0, NULL);
}

static ef_status take_line(header_text *h, ef__span line, ef_error *error) {
  const ef__span whole = trim(line);
  char quoted[EF__QUOTED];
  if (whole.length == 0 || whole.text[0] == ';')
    return EF_OK;
  const char *const equals = memchr(whole.text, '=', whole.length);
  if (equals == NULL) {
    ef__error_set(error, EF_MALFORMED, "found %s, expected 'key = value'",
                  ef__quote(whole, quoted));
    return ef__error_place(error, h->name, h->line, 0, NULL);
  }
  const ef__span name =
      trim((ef__span){whole.text, (size_t)(equals - whole.text)});
  ef__span value = trim((ef__span){
      equals + 1, whole.length - (size_t)(equals - whole.text) - 1});
  const size_t at_line = h->line;
  if (value.length > 0 && value.text[0] == '{') {
    const ef_status status =
        take_braces(h, value.text, name, &value, error);
    if (status != EF_OK)
      return status;
  }
  const key k = find_key(name);
  if (k == N_KEYS)
    return EF_OK;
  if (h->value_line[k] != 0) {
    ef__error_set(error, EF_MALFORMED,
                  "is given a second time, first in line %zu",
                  h->value_line[k]);
    return ef__error_place(error, h->name, at_line, 0, key_names[k]);
  }
  h->value[k] = value;
  h->value_line[k] = at_line;
  return EF_OK;
}

static ef_status take_lines(header_text *h, ef_error *error) {
  ef__span line = {h->at, 0};
  char quoted[EF__QUOTED];
  if (!next_line(h, &line) || !is_word(trim(line), "envi")) {
    ef__error_set(error, EF_MALFORMED,
                  "is no header of a spectral image: its first line is %s, "
                  "expected ENVI",
                  ef__quote(trim(line), quoted));
    return ef__error_place(error, h->name, 1, 0, NULL);
  }
  ef_status status = EF_OK;
  while (status == EF_OK && next_line(h, &line))
    status = take_line(h, line, error);
  return status;
}

/* ---- Values -------------------------------------------------------------- */

static ef_status need(const header_text *h, key k, const char *why,
                      ef_error *error) {
  if (h->value_line[k] != 0)
    return EF_OK;
  ef__error_set(error, EF_MALFORMED, "has no line '%s = ...', which %s",
                key_names[k], why);
  return ef__error_place(error, h->name, 0, 0, NULL);
}

static ef_status take_whole(const header_text *h, key k, double least,
                            double most, double *out, ef_error *error) {
  char quoted[EF__QUOTED], to[EF_NUMBER_TEXT];
  double value;
  if (ef__decimal_read(h->value[k], '.', &value) == EF__DECIMAL_GOOD &&
      value >= least && value <= most && value == floor(value)) {
    *out = value;
    return EF_OK;
  }
  ef_number_format(most, to);
  ef__error_set(error, EF_MALFORMED,
                "is %s, expected a whole number from %.0f to %s",
                ef__quote(h->value[k], quoted), least, to);
  return fault_at(h, k, error);
}

static ef_status take_size(const header_text *h, key k, double most,
                           size_t *out, ef_error *error) {
  double value = 0.0;
  ef_status status = need(h, k, "says how large the image is", error);
  if (status == EF_OK)
    status = take_whole(h, k, 1.0, most, &value, error);
  *out = (size_t)value;
  return status;
}

/* A list of n numbers, one for each band. */
static ef_status take_list(const header_text *h, key k, size_t n, double *out,
                           ef_error *error) {
  const char *at = h->value[k].text;
  const char *const end = at + h->value[k].length;
  char quoted[EF__QUOTED];
  size_t count = 0;
  while (at < end) {
    const char *const comma = memchr(at, ',', (size_t)(end - at));
    const char *const stop = comma != NULL ? comma : end;
    const ef__span item = trim((ef__span){at, (size_t)(stop - at)});
    double value;
    if (ef__decimal_read(item, '.', &value) != EF__DECIMAL_GOOD) {
      ef__error_set(error, EF_MALFORMED, "number %zu is %s, expected a number",
                    count + 1, ef__quote(item, quoted));
      return fault_at(h, k, error);
    }
    if (count < n)
      out[count] = value;
    ++count;
    at = comma != NULL ? comma + 1 : end;
  }
  if (count == n)
    return EF_OK;
  ef__error_set(error, EF_MALFORMED,
                "has %zu number%s, expected one for each of the %zu bands",
                count, count == 1 ? "" : "s", n);
  return fault_at(h, k, error);
}

/* ---- Layout of the file --------------------------------------------------- */

size_t ef_sample_type_bytes(ef_sample_type type) {
  switch (type) {
  case EF_UINT8:
    return 1;
  case EF_INT16:
  case EF_UINT16:
    return 2;
  case EF_INT32:
  case EF_UINT32:
  case EF_FLOAT32:
    return 4;
  case EF_FLOAT64:
    return 8;
  }
  return 0;
}

const char *ef_sample_type_text(ef_sample_type type) {
  switch (type) {
  case EF_UINT8:
    return "8-bit unsigned integers";
  case EF_INT16:
    return "16-bit integers";
  case EF_UINT16:
    return "16-bit unsigned integers";
  case EF_INT32:
    return "32-bit integers";
  case EF_UINT32:
    return "32-bit unsigned integers";
  case EF_FLOAT32:
    return "32-bit floating-point numbers";
  case EF_FLOAT64:
    return "64-bit floating-point numbers";
  }
  return "";
}

static const char *const interleaves[] = {"bsq", "bil", "bip"};

const char *ef_interleave_text(ef_interleave interleave) {
  return interleaves[interleave];
}

static ef_status take_type(const header_text *h, ef_cube_head *head,
                           ef_error *error) {
  double code = 0.0;
  ef_status status = need(h, KEY_DATA_TYPE, "says what its numbers are", error);
  if (status == EF_OK)
    status = take_whole(h, KEY_DATA_TYPE, 1.0, 255.0, &code, error);
  if (status != EF_OK)
    return status;
  head->type = (ef_sample_type)code;
  if (ef_sample_type_bytes(head->type) > 0)
    return EF_OK;
  ef__error_set(error, EF_MALFORMED,
                "is %.0f, which is not read; expected 1, 2, 3, 4, 5, 12 or 13 "
                "(integers of 8, 16, 32 bits, floating-point of 32, 64 bits, "
                "unsigned integers of 16, 32 bits)",
                code);
  return fault_at(h, KEY_DATA_TYPE, error);
}

static ef_status take_interleave(const header_text *h, ef_cube_head *head,
                                 ef_error *error) {
  const ef_status status =
      need(h, KEY_INTERLEAVE, "says how its numbers follow each other", error);
  if (status != EF_OK)
    return status;
  char quoted[EF__QUOTED];
  for (int i = 0; i < 3; ++i) {
    head->interleave = (ef_interleave)i;
    if (is_word(h->value[KEY_INTERLEAVE], interleaves[i]))
      return EF_OK;
  }
  ef__error_set(error, EF_MALFORMED, "is %s, expected bsq, bil or bip",
                ef__quote(h->value[KEY_INTERLEAVE], quoted));
  return fault_at(h, KEY_INTERLEAVE, error);
}

static ef_status take_order(const header_text *h, ef_cube_head *head,
                            ef_error *error) {
  double order = 0.0;
  ef_status status = EF_OK;
  if (h->value_line[KEY_BYTE_ORDER] != 0)
    status = take_whole(h, KEY_BYTE_ORDER, 0.0, 1.0, &order, error);
  else if (ef_sample_type_bytes(head->type) > 1)
    ef__note(h->notes, "%s: has no byte order; the lowest byte is taken to "
                       "come first (0)",
             h->name);
  head->is_big_endian = order > 0.0;
  return status;
}

/* What would make all values wrong if it were passed over. */
static ef_status refuse_layouts(const header_text *h, ef_error *error) {
  char quoted[EF__QUOTED];
  const ef__span type = h->value[KEY_FILE_TYPE];
  if (h->value_line[KEY_FILE_TYPE] != 0 && !is_word(type, "envi standard") &&
      !is_word(type, "envi")) {
    ef__error_set(error, EF_MALFORMED,
                  "is %s, expected ENVI Standard: plain values in a file",
                  ef__quote(type, quoted));
    return fault_at(h, KEY_FILE_TYPE, error);
  }
  static const key zeros[] = {KEY_COMPRESSION, KEY_MAJOR_FRAMES,
                              KEY_MINOR_FRAMES};
  for (size_t i = 0; i < sizeof zeros / sizeof *zeros; ++i) {
    const key k = zeros[i];
    bool is_zero = true;
    for (size_t j = 0; j < h->value[k].length; ++j)
      is_zero = is_zero && strchr("0, \t\r\n", h->value[k].text[j]) != NULL;
    if (is_zero)
      continue;
    ef__error_set(error, EF_MALFORMED,
                  "is %s, expected 0: values follow each other without "
                  "compression and without gaps",
                  ef__quote(h->value[k], quoted));
    return fault_at(h, k, error);
  }
  return EF_OK;
}

size_t ef__cube_header_bytes(const ef_cube_head *head) {
  return head->width * head->height * head->n_bands *
         ef_sample_type_bytes(head->type);
}

static ef_status take_layout(const header_text *h, ef_cube_head *head,
                             ef_error *error) {
  double offset = 0.0;
  ef_status status = refuse_layouts(h, error);
  if (status == EF_OK)
    status = take_size(h, KEY_SAMPLES, MOST_SIDE, &head->width, error);
  if (status == EF_OK)
    status = take_size(h, KEY_LINES, MOST_SIDE, &head->height, error);
  if (status == EF_OK)
    status = take_size(h, KEY_BANDS, MOST_BANDS, &head->n_bands, error);
  if (status == EF_OK && h->value_line[KEY_OFFSET] != 0)
    status = take_whole(h, KEY_OFFSET, 0.0, 9007199254740991.0, &offset, error);
  head->offset_bytes = (size_t)offset;
  if (status == EF_OK)
    status = take_type(h, head, error);
  if (status == EF_OK)
    status = take_interleave(h, head, error);
  if (status == EF_OK)
    status = take_order(h, head, error);
  if (status != EF_OK)
    return status;
  size_t n = head->width;
  if (ef__size_multiply(n, head->height, &n) &&
      ef__size_multiply(n, head->n_bands, &n) &&
      ef__size_multiply(n, ef_sample_type_bytes(head->type), &n) &&
      ef__size_add(n, head->offset_bytes, &n) && n <= INT64_MAX)
    return EF_OK;
  ef__error_set(error, EF_MALFORMED,
                "says %zu x %zu pixels of %zu bands, more than a file can hold",
                head->width, head->height, head->n_bands);
  return ef__error_place(error, h->name, 0, 0, NULL);
}

/* ---- Bands --------------------------------------------------------------- */

/* Of all bands of the file. */
typedef struct bands {
  size_t n;
  double *nm, *gain, *offset, *is_good;
  size_t *order; /* by wavelength, those to be used first */
} bands;

static ef_status take_wavelengths(const header_text *h, bands *b,
                                  ef_error *error) {
  const ef__span units = h->value[KEY_UNITS];
  char quoted[EF__QUOTED];
  ef_status status =
      need(h, KEY_WAVELENGTH, "lists the wavelength of each band", error);
  if (status == EF_OK)
    status = take_list(h, KEY_WAVELENGTH, b->n, b->nm, error);
  if (status != EF_OK)
    return status;
  double largest = 0.0;
  for (size_t i = 0; i < b->n; ++i)
    largest = fmax(largest, b->nm[i]);
  bool is_micrometres = largest < MICROMETRES_BELOW;
  if (units.length == 0 || is_word(units, "unknown")) {
    ef__note(h->notes, "%s: does not say the unit of its wavelengths; they are "
                       "taken as %s",
             h->name, is_micrometres ? "micrometres" : "nm");
  } else if (is_word(units, "micrometers") || is_word(units, "micrometres") ||
             is_word(units, "micrometer") || is_word(units, "microns") ||
             is_word(units, "um") || is_word(units, "\xC2\xB5m") ||
             is_word(units, "\xCE\xBCm")) {
    is_micrometres = true;
  } else if (is_word(units, "nanometers") || is_word(units, "nanometres") ||
             is_word(units, "nanometer") || is_word(units, "nm")) {
    is_micrometres = false;
  } else {
    ef__error_set(error, EF_MALFORMED, "is %s, expected nm or micrometres",
                  ef__quote(units, quoted));
    return fault_at(h, KEY_UNITS, error);
  }
  for (size_t i = 0; i < b->n; ++i) {
    /* 0.55 micrometres are 550 nm and no last digit more. */
    const double nm =
        is_micrometres ? round(b->nm[i] * 1e9) / 1e6 : b->nm[i];
    if (nm >= EF__SHORTEST_NM && nm <= EF__LONGEST_NM) {
      b->nm[i] = nm;
      continue;
    }
    char given[EF_NUMBER_TEXT];
    ef_number_format(b->nm[i], given);
    ef__error_set(error, EF_MALFORMED,
                  "number %zu is %s %s, expected wavelengths from %.0f to %.0f "
                  "nm",
                  i + 1, given, is_micrometres ? "micrometres" : "nm",
                  EF__SHORTEST_NM, EF__LONGEST_NM);
    return fault_at(h, KEY_WAVELENGTH, error);
  }
  return EF_OK;
}

/* value = (gain * stored + offset) / scale. */
static ef_status take_scales(const header_text *h, bands *b, ef_error *error) {
  double scale = 1.0;
  char quoted[EF__QUOTED];
  if (h->value_line[KEY_SCALE] != 0 &&
      (ef__decimal_read(h->value[KEY_SCALE], '.', &scale) !=
           EF__DECIMAL_GOOD ||
       !(scale > 0.0))) {
    ef__error_set(error, EF_MALFORMED, "is %s, expected a number above 0",
                  ef__quote(h->value[KEY_SCALE], quoted));
    return fault_at(h, KEY_SCALE, error);
  }
  for (size_t i = 0; i < b->n; ++i)
    b->gain[i] = b->is_good[i] = 1.0;
  ef_status status = EF_OK;
  if (h->value_line[KEY_GAIN] != 0)
    status = take_list(h, KEY_GAIN, b->n, b->gain, error);
  if (status == EF_OK && h->value_line[KEY_DATA_OFFSET] != 0)
    status = take_list(h, KEY_DATA_OFFSET, b->n, b->offset, error);
  if (status == EF_OK && h->value_line[KEY_BAD_BANDS] != 0)
    status = take_list(h, KEY_BAD_BANDS, b->n, b->is_good, error);
  for (size_t i = 0; i < b->n; ++i) {
    b->gain[i] /= scale;
    b->offset[i] /= scale;
  }
  return status;
}

static ef_status take_ignored(const header_text *h, ef_cube_head *head,
                              ef_error *error) {
  char quoted[EF__QUOTED];
  if (h->value_line[KEY_IGNORED] == 0)
    return EF_OK;
  switch (ef__decimal_read(h->value[KEY_IGNORED], '.', &head->ignored)) {
  case EF__DECIMAL_GOOD:
    head->has_ignored = true;
    return EF_OK;
  case EF__DECIMAL_ENDLESS: /* pixels without numbers are known anyway */
    return EF_OK;
  default:
    ef__error_set(error, EF_MALFORMED, "is %s, expected a number",
                  ef__quote(h->value[KEY_IGNORED], quoted));
    return fault_at(h, KEY_IGNORED, error);
  }
}

/* Shell sort: stable order is restored by the index. */
static bool comes_before(const bands *b, size_t i, size_t k) {
  if (b->nm[i] < b->nm[k] || b->nm[i] > b->nm[k])
    return b->nm[i] < b->nm[k];
  return i < k;
}

static void sort_bands(const bands *b, size_t n) {
  size_t gap = 1;
  while (gap < n / 3)
    gap = 3 * gap + 1;
  for (; gap > 0; gap /= 3) {
    for (size_t i = gap; i < n; ++i) {
      const size_t moved = b->order[i];
      size_t k = i;
      for (; k >= gap && comes_before(b, moved, b->order[k - gap]); k -= gap)
        b->order[k] = b->order[k - gap];
      b->order[k] = moved;
    }
  }
}

/* Good bands by wavelength, each wavelength once. */
static size_t choose_bands(bands *b, ef_cube_head *head) {
  size_t n = 0, kept = 0;
  for (size_t i = 0; i < b->n; ++i) {
    if (b->is_good[i] > 0.0)
      b->order[n++] = i;
  }
  head->n_marked_bad = b->n - n;
  head->is_sorted = true;
  for (size_t i = 1; i < n; ++i)
    head->is_sorted = head->is_sorted &&
                      !comes_before(b, b->order[i], b->order[i - 1]);
  sort_bands(b, n);
  for (size_t i = 0; i < n; ++i) {
    /* As near as grids count as equal. */
    const double nm = b->nm[b->order[i]];
    if (kept > 0 && nm - b->nm[b->order[kept - 1]] <= 1e-9 * nm)
      continue;
    b->order[kept++] = b->order[i];
  }
  head->n_repeated = n - kept;
  return kept;
}

static ef_status keep_bands(const header_text *h, const bands *b, size_t n,
                            ef__cube_header *out, ef_error *error) {
  size_t *band = NULL;
  double *nm = NULL, *gain = NULL, *offset = NULL;
  const ef__part parts[] = {{&band, n, sizeof *band},
                            {&nm, n, sizeof *nm},
                            {&gain, n, sizeof *gain},
                            {&offset, n, sizeof *offset}};
  out->block = ef__allocate_block(4, parts);
  if (out->block == NULL)
    return ef__error_memory(error, "the bands of a spectral image");
  for (size_t i = 0; i < n; ++i) {
    band[i] = b->order[i];
    nm[i] = b->nm[band[i]];
    gain[i] = b->gain[band[i]];
    offset[i] = b->offset[band[i]];
  }
  ef_cube_head *const head = &out->head;
  head->n_used = n;
  head->band = band;
  head->gain = gain;
  head->offset = offset;
  const ef_grid listed = {.count = n, .wavelength_nm = nm};
  head->grid = ef_grid_simplify(&listed);
  if (!head->is_sorted)
    ef__note(h->notes, "%s: its bands do not stand in order of wavelength; "
                       "they are taken in that order",
             h->name);
  if (head->n_repeated > 0)
    ef__note(h->notes, "%s: %zu band%s of a wavelength that another has; the "
                       "first of each is used",
             h->name, head->n_repeated, head->n_repeated == 1 ? " is" : "s are");
  if (head->n_marked_bad > 0)
    ef__note(h->notes, "%s: %zu band%s marked as bad (bbl) and left out",
             h->name, head->n_marked_bad,
             head->n_marked_bad == 1 ? " is" : "s are");
  return EF_OK;
}

static ef_status take_bands(const header_text *h, ef__cube_header *out,
                            ef_error *error) {
  bands b = {.n = out->head.n_bands};
  const ef__part parts[] = {{&b.nm, b.n, sizeof *b.nm},
                            {&b.gain, b.n, sizeof *b.gain},
                            {&b.offset, b.n, sizeof *b.offset},
                            {&b.is_good, b.n, sizeof *b.is_good},
                            {&b.order, b.n, sizeof *b.order}};
  void *block = ef__allocate_block(5, parts);
  if (block == NULL)
    return ef__error_memory(error, "the bands of a spectral image");
  ef_status status = take_wavelengths(h, &b, error);
  if (status == EF_OK)
    status = take_scales(h, &b, error);
  if (status == EF_OK) {
    const size_t n = choose_bands(&b, &out->head);
    if (n == 0) {
      ef__error_set(error, EF_MALFORMED, "marks every band as bad");
      status = fault_at(h, KEY_BAD_BANDS, error);
    } else {
      status = keep_bands(h, &b, n, out, error);
    }
  }
  free(block);
  return status;
}

/* ---- The whole ----------------------------------------------------------- */

static ef_status take_words(const header_text *h, ef__cube_header *out,
                            ef_error *error) {
  const ef__span about = h->value[KEY_DESCRIPTION];
  out->description = ef__copy_text(about.text != NULL ? about.text : "",
                                   about.length);
  if (out->description == NULL)
    return ef__error_memory(error, "a header");
  for (char *c = out->description; *c != '\0'; ++c) {
    if (is_space(*c))
      *c = ' ';
  }
  out->head.description = out->description;
  const int kind = h->value_line[KEY_SCALE] != 0
                       ? 1
                       : ef__quantity_kind(out->description);
  out->head.kind = kind > 0   ? EF_KIND_SURFACE
                   : kind < 0 ? EF_KIND_LIGHT
                              : EF_KIND_AUTO;
  return EF_OK;
}

ef_status ef__cube_header_read(const char *name, const char *text,
                               size_t length, const ef_notes *notes,
                               ef__cube_header *header, ef_error *error) {
  *header = (ef__cube_header){.head = {.file = name}};
  header_text h = {
      .name = name, .at = text, .end = text + length, .notes = notes};
  ef_status status = take_lines(&h, error);
  if (status == EF_OK)
    status = take_layout(&h, &header->head, error);
  if (status == EF_OK)
    status = take_ignored(&h, &header->head, error);
  if (status == EF_OK)
    status = take_bands(&h, header, error);
  if (status == EF_OK)
    status = take_words(&h, header, error);
  return status;
}

void ef__cube_header_clear(ef__cube_header *header) {
  free(header->description);
  free(header->block);
  *header = (ef__cube_header){0};
}

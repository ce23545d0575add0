# SPDX-License-Identifier: GPL-3.0-or-later
# Compares two texts: equal but for numbers, which may differ by 1e-9 of their
# size or by 1e-9, so that another machine's last digits do no harm. Prints the
# first lines that differ and ends with 1.
#   awk -f same.awk WANTED FOUND

# The next number of `text` from `at` on: sets RSTART and RLENGTH.
function next_number(text) {
  return match(text, /[0-9]+(\.[0-9]+)?([eE][-+]?[0-9]+)?/)
}

function near(a, b, size) {
  size = a < 0 ? -a : a
  return (a - b <= 1e-9 + 1e-9 * size) && (b - a <= 1e-9 + 1e-9 * size)
}

function same(a, b, before_a, before_b, number_a, number_b) {
  while (1) {
    if (a == b) return 1
    if (!next_number(a)) return 0
    before_a = substr(a, 1, RSTART - 1)
    number_a = substr(a, RSTART, RLENGTH)
    a = substr(a, RSTART + RLENGTH)
    if (!next_number(b)) return 0
    before_b = substr(b, 1, RSTART - 1)
    number_b = substr(b, RSTART, RLENGTH)
    b = substr(b, RSTART + RLENGTH)
    # Noise about zero has either sign.
    if (before_a != before_b) {
      sub(/-$/, "", before_a)
      sub(/-$/, "", before_b)
      if (before_a != before_b || !near(number_a + number_b, 0)) return 0
    } else if (!near(number_a + 0, number_b + 0)) {
      return 0
    }
  }
}

function tell(wanted, found) {
  if (++n_told > 5) return
  print "line " n
  print "  wanted: " wanted
  print "  found:  " found
}

BEGIN {
  while (1) {
    ++n
    got_a = (getline a < ARGV[1]) > 0
    got_b = (getline b < ARGV[2]) > 0
    if (!got_a && !got_b) break
    if (!got_a) tell("(nothing)", b)
    else if (!got_b) tell(a, "(nothing)")
    else if (!same(a, b)) tell(a, b)
  }
  exit n_told > 0
}

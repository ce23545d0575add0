#!/bin/bash
# SPDX-License-Identifier: GPL-3.0-or-later
# Runs what the README shows. In a fenced block a line `$ COMMAND` is run and
# what follows up to the next one must be what it prints; a line `...` stands
# for any lines left out. A block whose lines begin with `evenfield` is run line
# by line and must succeed. All in one folder, from top to bottom, so that
# files made by one block serve the next. Then the pictures: each has words that
# stand for it and is there, all are small, and none lies there for nothing.
#
#   readme.sh EVENFIELD README
set -u
evenfield=$(cd "$(dirname "$1")" && pwd)/$(basename "$1")
readme=$(cd "$(dirname "$2")" && pwd)/$(basename "$2")
scratch=$(mktemp -d) || exit 1
trap 'rm -rf "$scratch"' EXIT
PATH=$(dirname "$evenfield"):$PATH
export PATH LC_ALL=C COLUMNS=80
mkdir "$scratch/work" "$scratch/blocks"

# One file a command: its line, then what is expected; .only for the others.
awk -v folder="$scratch/blocks" '
  function name() { return sprintf("%s/%03d", folder, ++n) }
  /^```/ { inside = !inside; file = ""; next }
  inside && /^\$ / { file = name(); print substr($0, 3) >file; next }
  inside && file != "" { print >file; next }
  inside && /^evenfield / {
    only = name() ".only"
    sub(/  +[^ ].*$/, "") # the meaning beside it
    print >only
    close(only)
  }' "$readme"

# Wanted against found, `...` for any lines.
ef_same() {
  awk '
    FNR == NR { if (FNR > 1) wanted[++w] = $0; next }
    { found[++f] = $0 }
    END {
      while (w > 0 && wanted[w] == "") --w
      while (f > 0 && found[f] == "") --f
      i = j = 1
      while (i <= w) {
        if (wanted[i] == "...") {
          if (++i > w) exit 0
          while (j <= f && found[j] != wanted[i]) ++j
        }
        if (j > f || found[j] != wanted[i]) {
          printf "# README: %s\n# prints: %s\n", wanted[i], \
            j <= f ? found[j] : "(nothing)"
          exit 1
        }
        ++i; ++j
      }
      if (j <= f) {
        printf "# prints more: %s\n", found[j]
        exit 1
      }
    }' "$1" "$2"
}

number=0
failed=0
for block in "$scratch"/blocks/*; do
  number=$((number + 1))
  line=$(head -n 1 "$block")
  (cd "$scratch/work" && bash -c "$line") >"$scratch/found" \
    2>"$scratch/said" </dev/null
  status=$?
  good=yes
  case $block in
  *.only) [ $status = 0 ] || good=no ;;
  *)
    [ $status -le 1 ] || good=no
    ef_same "$block" "$scratch/found" || good=no
    ;;
  esac
  if [ $good = yes ]; then
    echo "ok $number - $line"
  else
    failed=$((failed + 1))
    sed 's/^/# /' "$scratch/said"
    echo "not ok $number - $line"
  fi
done
# One line a picture: its file, a blank, its words.
top=$(dirname "$readme")
awk '{ text = text " " $0 }
  END {
    while (match(text, /!\[[^]]*\]\([^)]*\)/)) {
      one = substr(text, RSTART + 2, RLENGTH - 3)
      text = substr(text, RSTART + RLENGTH)
      file = words = one
      sub(/.*\]\(/, "", file)
      sub(/\]\(.*/, "", words)
      print file " " words
    }
  }' "$readme" >"$scratch/pictures"
total=0
while read -r file words; do
  number=$((number + 1))
  size=$(wc -c <"$top/$file") && [ ${#words} -ge 30 ] &&
    [ "$(head -c 4 "$top/$file" | tail -c 3)" = PNG ] || size=none
  if [ "$size" != none ]; then
    echo "ok $number - $file, $size bytes"
    total=$((total + size))
  else
    failed=$((failed + 1))
    echo "not ok $number - $file is no PNG, or has no words"
  fi
done <"$scratch/pictures"
number=$((number + 1))
if [ "$(cut -d ' ' -f 1 "$scratch/pictures" | sort)" = \
  "$(cd "$top" && ls tools/pictures/*.png)" ] && [ $total -lt 307200 ]; then
  echo "ok $number - all pictures, $total bytes of 307200"
else
  failed=$((failed + 1))
  echo "not ok $number - pictures that are not shown, or $total bytes of 307200"
fi
echo "1..$number"
[ $failed = 0 ] && [ $number -gt 0 ]

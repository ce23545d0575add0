#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# What `compare` does with files that are too long to be held: parts, readings
# that fall on both sides of a cut, names that come again far away, standards
# read in step with their samples, and results that depend on no thread count.
#
#   long_files.sh EVENFIELD
. "$(dirname "$0")/tap.sh"

# 130000 rows; every third sample is read twice, one name comes again at the
# end, and a sample of many readings lies across the first 100000 rows.
awk 'BEGIN {
  print "name,L,a,b"
  for (i = 1; i <= 130000; ++i) {
    if (i > 99990 && i <= 100010) { print "across,60," i - 100000 ",-20"; continue }
    printf "s%d,%.2f,-8,-20\n", i, 60 + i % 7 / 100
    if (i % 3 == 0) printf "s%d,%.2f,-8,-20\n", i, 60.02 + i % 7 / 100
  }
  print "s5,61,-8,-20"
}' > batch.csv
printf 'name,L,a,b\nstandard,60,-8,-20\n' > standard.csv

"$evenfield" compare standard.csv batch.csv --quiet --samples 0 \
  --format csv --output all.csv || exit 1
ef_check "one row a sample, none dropped" "$(wc -l < all.csv | tr -d ' ')" \
  129983
ef_check "readings on both sides of a cut are one sample" \
  "$(grep '^standard,across,' all.csv | cut -d, -f3-5)" "133322,1,20"
# In X, Y, Z, whose mean lies at a* 0.601, not at that of a*, 0.5.
ef_check "their mean counts" "$(awk -F, '
  NR == 1 { for (i = 1; i <= NF; ++i) if ($i == "sample_colour_a_star") a = i }
  $2 == "across" { gsub(/"[^"]*"/, "words"); print ($a > 0.6 && $a < 0.605) }
  ' all.csv)" 1
ef_check "a name that comes again far away is told" \
  "$(grep -c 'other readings of s5 stand far from these' all.csv)" 1
ef_check "samples near each other are averaged" \
  "$(grep '^standard,s9,' all.csv | cut -d, -f5)" 2

"$evenfield" compare batch.csv batch.csv --quiet --samples 0 --illuminant D65 \
  --format csv --output step.csv || exit 1
ef_check "long files in step: each finds its standard" \
  "$(awk -F, 'NR > 1 && $10 == "0"' step.csv | wc -l | tr -d ' ')" 129981
ef_check "and what does not is told" \
  "$(grep -c 'not computed' step.csv)" 1

"$evenfield" compare --quiet --format csv --samples 500 --jobs 1 --output 1.csv
"$evenfield" compare --quiet --format csv --samples 500 --jobs 3 --output 3.csv
ef_check "threads change nothing" "$(cmp 1.csv 3.csv && echo same)" same
head -20000 batch.csv > many.csv
for format in csv json; do
  for jobs in 1 3; do
    "$evenfield" compare standard.csv many.csv --quiet --samples 500 \
      --format $format --jobs $jobs --output $jobs.$format --force
  done
  ef_check "nor in the order of many rows, $format" \
    "$(cmp 1.$format 3.$format && echo same)" same
done

# The points of the boundary: none farther than the worst case, some nearly so.
"$evenfield" compare demo:seats-standard demo:seats-deliveries --quiet \
  --illuminant D65 --illuminant FL11 --boundary points.csv --format json \
  --output boundary.json || exit 1
ef_check "642 points under each other look" "$(awk -F, '
  NR > 1 { ++n[$1 "," $2] } END { for (i in n) print i, n[i] }' points.csv |
  sort | tr '\n' ';')" "D65,cie-1964 642;FL11,cie-1931 642;"
worst=$(awk '/"worst_case"/ { on = 1 } on && /"difference"/ {
  gsub(/[^0-9.]/, ""); print; exit }' boundary.json)
ef_check "none farther than the worst case" "$(awk -F, -v worst="$worst" '
  $1 == "FL11" && $NF > most { most = $NF }
  END { print (most <= worst * 1.000001 && most > 0.9 * worst) }
  ' points.csv)" 1
ef_end

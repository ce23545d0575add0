#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# Charts and reports of the built command, judged by other programs: an XML
# parser and a reader of PDF where they are on the machine (skipped else), and
# a place that cannot be written.
#
#   charts.sh EVENFIELD
. "$(dirname "$0")/tap.sh"

has() {
  command -v "$1" >/dev/null 2>&1
}

printf 'name,L,a,b\n</text><b>&amp;"bow",40,5,-40\nred\001light,50,110,70\n' >t.csv

# Each plane as each kind of file.
for plane in uv xy ab lc; do
  for kind in svg pdf; do
    "$evenfield" match t.csv --quiet --plane $plane --chart $plane.$kind >/dev/null
    ef_check "match --plane $plane --chart .$kind" $? 0
  done
  if has xmllint; then
    ef_check "$plane.svg is XML" "$(xmllint --noout $plane.svg 2>&1)" ""
  else
    ef_skip "$plane.svg is XML" xmllint
  fi
  if has pdfinfo; then
    ef_check "$plane.pdf has a page" \
      "$(pdfinfo $plane.pdf 2>&1 | sed -n 's/^Pages: *//p')" 1
    ef_check "$plane.pdf has its title" \
      "$(pdfinfo $plane.pdf 2>&1 | sed -n 's/^Title: *//p')" \
      "1 of 2 targets are in gamut"
  else
    ef_skip "$plane.pdf has a page" pdfinfo
    ef_skip "$plane.pdf has its title" pdfinfo
  fi
done

# Every other chart there is.
ef_chart() {
  name=$1
  shift
  "$evenfield" "$@" --quiet --chart $name.svg >/dev/null 2>message
  ef_check "chart of $name: status" "$? $(cat message)" "0 "
  if has xmllint; then
    ef_check "chart of $name is XML" "$(xmllint --noout $name.svg 2>&1)" ""
  else
    ef_skip "chart of $name is XML" xmllint
  fi
}
ef_chart people match --population 30 --plane people
ef_chart people-ab match --population 30 --plane ab
for device in '--display demo:kiosk-measurements' '--inks demo:leaflet-press' \
  '--colourants demo:livery-colourants --plane ab'; do
  # shellcheck disable=SC2086
  ef_chart section match $device --lightness 40 --force
  ef_check "one outline a section" \
    "$(grep -c '<title>gamut at L\* 40.0</title>' section.svg)" 1
done
ef_chart compare-people compare --population 30
ef_check "clouds of people" "$(grep -c 'people</title>' compare-people.svg)" 3
for wrong in '--lightness 40' '--lightness 40 --plane uv --chart a.svg' \
  '--plane people --chart a.svg'; do
  # shellcheck disable=SC2086
  "$evenfield" match $wrong --quiet >out 2>message
  ef_check "match $wrong: $(cat message)" "$? $(wc -l <message)" "2 1"
done
ef_chart compare compare
ef_chart compare-lc compare --plane lc --format csv
for space in xy uv lab mb cone cone-lm; do
  ef_chart ellipse-$space ellipse demo:signal-colours --space $space
done
grep -q 'drawn 12.5 times as large' ellipse-xy.svg
ef_check "ellipses as large as chosen" $? 1
ef_chart ellipse-times ellipse demo:signal-colours --magnification 12.5
grep -q 'drawn 12.5 times as large' ellipse-times.svg
ef_check "ellipses as large as asked" $? 0
ef_chart spectra isolate
ef_chart lm isolate --plane lm
ef_chart opponent isolate --plane opponent --format json
ef_chart panel panel fit --samples 100
ef_chart calibrate panel calibrate --samples 20
ef_chart next panel next
ef_chart plan panel plan --expected-jnd 0.9 --samples 40 --precision 0.3
ef_chart power panel plan --expected-jnd 0.9 --samples 40 --precision 0.3 \
  --other-jnd 1.3
grep -q 'By adaptive levels: [0-9]* at 40' power.svg
ef_check "plan: the chart says its figures" $? 0
for plane in uv xy ab lc; do
  ef_chart describe-$plane describe demo:livery --plane $plane
done
ef_chart lamp describe demo:lab-display

# The same command makes the same bytes.
for kind in svg pdf png; do
  "$evenfield" match t.csv --quiet --chart one.$kind >/dev/null
  "$evenfield" match t.csv --quiet --chart two.$kind >/dev/null
  cmp -s one.$kind two.$kind
  ef_check "two $kind are alike" $? 0
done

# A full disk: nothing is left, and the exit status says so.
if [ -c /dev/full ]; then
  for kind in svg pdf png; do
    ln -s /dev/full full.$kind
    "$evenfield" match t.csv --quiet --chart full.$kind >out 2>message
    ef_check "full disk, $kind: status" $? 5
    ef_check "full disk, $kind: message" "$(cat message)" \
      "evenfield: full.$kind: no space is left to write it; free some or name another place"
    ef_check "full disk, $kind: nothing is told" "$(cat out)" ""
  done
else
  ef_skip "full disk" /dev/full
fi
# A disk that is full in the middle of a file, by a limit on its size: what was
# written before stays as it was, and nothing half-written is left.
mkdir limited
echo mine | tee limited/b.svg limited/b.pdf limited/b.png >limited/b.html
for kind in svg pdf png html; do
  option=--chart
  [ $kind = html ] && option=--report
  (
    cd limited && ulimit -f 4 &&
      "$evenfield" match --quiet --force $option b.$kind >../out 2>../message
  )
  ef_check "no room, $kind" "$? $(cat out message limited/b.$kind)" \
    "5 evenfield: b.$kind: cannot be written: File too large
mine"
done
ef_check "no room: nothing is left" "$(cd limited && ls -A | tr '\n' ' ')" \
  "b.html b.pdf b.png b.svg "
"$evenfield" match t.csv --quiet --chart none/a.svg >out 2>message
ef_check "no folder: status" $? 5
ef_check "no folder: message" "$(cat message)" \
  "evenfield: none/a.svg: its folder does not exist; create it or name another"

# Reports: an HTML validator, the same bytes twice, a full disk, a file that is
# there.
# ef_report NAME ARGUMENT...
ef_report() {
  name=$1
  shift
  "$evenfield" "$@" --quiet --report $name.html >out 2>message
  ef_check "report of $name: status" "$? $(cat message)" "0 "
  "$evenfield" "$@" --quiet --report $name.html --force >/dev/null
  cp $name.html $name.second
  "$evenfield" "$@" --quiet --report $name.html --force >/dev/null
  cmp -s $name.html $name.second
  ef_check "report of $name: the same bytes" $? 0
  if has tidy; then
    ef_check "report of $name: HTML" "$(tidy -q -e $name.html 2>&1)" ""
  else
    ef_skip "report of $name: HTML" tidy
  fi
  grep -q "<h1>$(head -n 1 out | cut -c 1-30 | sed 's/&/\&amp;/g')" $name.html
  ef_check "report of $name: begins with the answer" $? 0
  if [ -c /dev/full ]; then
    ln -sf /dev/full full.html
    "$evenfield" "$@" --quiet --report full.html >out 2>message
    ef_check "report of $name, full disk" "$? $(cat out message)" \
      "5 evenfield: full.html: no space is left to write it; free some or name another place"
  else
    ef_skip "report of $name, full disk" /dev/full
  fi
  echo mine >there.html
  "$evenfield" "$@" --quiet --report there.html >out 2>message
  ef_check "report of $name, there already" "$? $(cat out message there.html)" \
    "5 evenfield: there.html: is there already; --force overwrites it, or name another file with --report
mine"
}
ef_report match match t.csv
ef_report people match --population 20 --seed 3
ef_report compare compare
ef_report ellipse ellipse demo:signal-colours
ef_report one-ellipse ellipse --at lab:60,10,20 --space cone
ef_report isolate isolate
ef_report panel panel fit --samples 100
ef_report calibrate panel calibrate --samples 20
ef_report next panel next
ef_report flicker panel flicker
ef_report plan panel plan --expected-jnd 0.9 --samples 40 --precision 0.3
ef_check "report: input and digest" \
  "$(sed -n 's/.*t.csv, SHA-256 \([0-9a-f]*\).*/\1/p' match.html)" \
  "$(sha256sum t.csv | cut -d ' ' -f 1)"
grep -q '<dt>Seed</dt>' people.html
ef_check "report: seed" $? 0
for name in panel calibrate plan; do
  grep -q '<dt>Seed</dt>' $name.html
  ef_check "report of $name: seed" $? 0
done

# Other eyes: those the match was made for see what the text says they do, and
# there is no such section without spectra.
"$evenfield" match --display demo:kiosk-primaries --observer \
  model:age=32,field=2 --report eyes.html --quiet >out
ef_check "the mean eye sees what the match says" \
  "$(sed -n '/other eyes would see of this match<\/h2>/,/<\/table>/s/.*scope="row" class="t">[^<]*<\/th><td[^>]*>\([0-9.]*\).*/\1/p' eyes.html)" \
  "$(awk 'FNR >= 6 && FNR <= 15 { print $(NF - 1) }' out)"
ef_check "ten rows of it" "$(sed -n '/other eyes would see of this match<\/h2>/,/<\/table>/p' eyes.html | grep -c 'scope="row"')" 10
grep -q 'other eyes' match.html
ef_check "no other eyes without spectra" $? 1

# Very many targets: chart and report say what they leave out, and stay small.
awk 'BEGIN { print "name,L,a,b"; for (i = 0; i < 50000; ++i)
  print "t" i "," 40 + i % 40 "," i % 97 - 48 "," i % 89 - 44 }' >many.csv
"$evenfield" match many.csv --chart many.svg --report many.html --format csv \
  >/dev/null 2>message
ef_check "many targets: status" $? 0
grep -q 'many.svg: [0-9]* of [0-9]* points are drawn' message
ef_check "many targets: note" $? 0
grep -q '>Drawn: [0-9]* of [0-9]* points' many.svg
ef_check "many targets: on the chart" $? 0
grep -q 'of [0-9]* targets in gamut one in 2 is taken' many.svg
ef_check "many targets: which ones" $? 0
grep -q '<p>Of [0-9]* targets in gamut one in 2 is taken' many.html
ef_check "many targets: in the report" $? 0
[ "$(cat many.svg many.html | wc -c)" -lt 2000000 ]
ef_check "many targets: small files" $? 0

ef_end

#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# --part K/N: the parts of a job, joined by cat, are the whole answer to the
# byte, wherever rows, quotes, comments and readings of one name are cut; and
# what cannot be shared out is refused.
#
#   parts.sh EVENFIELD
. "$(dirname "$0")/tap.sh"

# ef_join NAME PARTS ARGUMENT...
ef_join() {
  name=$1
  parts=$2
  shift 2
  "$evenfield" "$@" --quiet --format csv > whole || return
  k=1
  : > joined
  while [ "$k" -le "$parts" ]; do
    "$evenfield" "$@" --quiet --format csv --part "$k/$parts" >> joined ||
      break
    k=$((k + 1))
  done
  cmp whole joined
  ef_tell "$name" $?
}

# ef_refuse EXPECTED ARGUMENT...
ef_refuse() {
  expected=$1
  shift
  "$evenfield" "$@" > output 2> message
  [ $? -eq 2 ] && [ ! -s output ] && [ "$(cat message)" = "$expected" ]
  ef_tell "refused: $*" $?
}

# Line ends of both kinds, a comment and a blank line between rows, names with
# separators, quotes and line ends in them, no line end at the end.
printf 'name,L,a,b\r\none,52,-8,-20\r\n# "half way\n"two,\n2",61,10,4\n\n' \
  > odd.csv
printf '"say ""3""",33.25,20,-14\r\n"#4",70,0,0\nfive,24,6,-31' >> odd.csv
# Readings of one sample, one after the other and, within what is held, apart.
printf 'name,angle_deg,L,a,b\na,15,60,1,2\na,15,60.5,1,2\na,45,50,1,2\n' \
  > batch.csv
printf 'b,15,61,1,2\nb,45,51,2,2\nc,15,40,0,0\na,15,60.2,1,1\nz,15,1,0,0\n' \
  >> batch.csv
printf 'name,angle_deg,L,a,b\nb,15,60,1,2\nb,45,50,1,2\nextra,15,9,9,9\n' \
  > standards.csv
printf 'c,15,41,0,0\na,15,60,1,2\na,45,50,1,2\n' >> standards.csv
printf 'reference,sample\na,b\nb,a\n"c",nobody\na,c\n' > list.csv

ef_join "odd rows, one at a time" 5 describe odd.csv
ef_join "more parts than rows" 9 describe odd.csv
ef_join "several files and forms" 3 describe odd.csv demo:livery \
  demo:kiosk-primaries demo:kiosk-measurements
ef_join "matches" 4 match odd.csv
ef_join "matches for people drawn by a seed" 2 match demo:livery \
  --population 20 --seed 5
ef_join "readings of one sample stay together" 4 compare standards.csv \
  batch.csv
ef_join "pairs of a list" 3 compare standards.csv batch.csv --pairs list.csv
ef_join "the demo, with draws" 3 compare --samples 200 --batch-sd 0.3

# As the manual page has it for an array of tasks, and for GNU parallel.
"$evenfield" match demo:livery --quiet --format csv > whole
for SLURM_ARRAY_TASK_ID in 1 2 3; do
  "$evenfield" match demo:livery --quiet --format csv \
    --part "$SLURM_ARRAY_TASK_ID/3" --output "part-$SLURM_ARRAY_TASK_ID.csv"
done
cat $(seq -f part-%.0f.csv 3) > joined
cmp whole joined
ef_tell "an array of tasks, a file each" $?
parallel='xargs -I{}'
command -v parallel > /dev/null && parallel='parallel -k'
seq 3 | $parallel "$evenfield" match demo:livery --quiet --format csv \
  --jobs 1 --part {}/3 > joined
cmp whole joined
ef_tell "all of a list of parts, by ${parallel%% *}" $?

# A fault is told by the part that it is in.
sed 's/^"#4",70/"#4",x/' odd.csv > faulty.csv
"$evenfield" describe --skip-bad --format csv faulty.csv 2> notes.whole |
  cat > whole
: > joined
: > notes
for k in 1 2 3; do
  "$evenfield" describe --skip-bad --format csv --part $k/3 faulty.csv \
    >> joined 2>> notes
done
cmp whole joined && cmp notes.whole notes
ef_tell "notes of a part are about that part" $?

how='--part is K/N, such as 2/8 for the second of eight parts (K from 1 to N, N up to 1000000)'
ef_refuse "evenfield: $how, not \"4/3\"" \
  describe odd.csv --format csv --part 4/3
ef_refuse "evenfield: $how, not \"0/3\"" match odd.csv --format csv --part 0/3
ef_refuse "evenfield: $how, not \"3\"" compare --format csv --part 3
ef_refuse "evenfield: $how, not \"1/1000001\"" \
  match --format csv --part 1/1000001
ef_refuse "evenfield: --part goes with --format csv: parts of other formats \
cannot be joined" match --part 1/2 --format json
ef_refuse "evenfield: --chart shows all rows, and --part reads some; ask for \
it without --part" describe odd.csv --part 1/2 --format csv --chart c.png
ef_refuse "evenfield: --part needs files that every part can read: save \
standard input in one" describe - --part 1/2 --format csv

ef_end

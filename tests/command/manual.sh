#!/bin/bash
# SPDX-License-Identifier: GPL-3.0-or-later
# Help, manual pages and completion: every option of the help stands in the
# manual, the formatter finds no fault in a page, every example runs, and
# completion offers what the command knows.
#
#   manual.sh EVENFIELD ROOT
root=$(cd "$2" && pwd)
. "$(dirname "$0")/tap.sh"
PATH=$(dirname "$evenfield"):$PATH
export PATH
. "$root/tools/completion.bash"

commands=$(evenfield | awk '/^Commands:$/ { on = 1; next } /^$/ { on = 0 }
  on { print $1 }')
[ "$(echo "$commands" | wc -l)" -ge 8 ]
ef_tell "the first screen lists the commands" $?

ef_options() { evenfield "$1" --help | awk '/^  --/ { print $1 }'; }

# A page without options that the help has, or with faults of its own.
ef_page() {
  [ -s "$(dirname "$evenfield")/evenfield-$1.1" ] ||
    { echo "# tools/evenfield/meson.build makes no page of $1"; return 1; }
  page=$scratch/$1.1
  "$root/tools/make_manual" "$evenfield" 0 "$1" > "$page" || return 1
  for option in $(ef_options "$1"); do
    grep -q "^\.B $(echo "$option" | sed 's/-/\\\\-/g')" "$page" ||
      { echo "# $1: $option is not in the manual"; return 1; }
  done
  command -v groff >/dev/null || return 0
  faults=$(groff -man -Tascii -ww -z "$page" 2>&1)
  [ -z "$faults" ] || { echo "# $faults"; return 1; }
}

ef_examples() {
  evenfield "$1" --help | sed -n '/^To try/,$s/^  evenfield/evenfield/p'
}

# Words as a shell reads them. 1 is the answer of --check.
ef_run() {
  mkdir -p "$scratch/run" && cd "$scratch/run" || return 1
  bash -c "$1" > ../answer 2> ../said < /dev/null
  status=$?
  cd "$root" || return 1
  case $1$status in
  *0) [ -s "$scratch/answer" ] ;;
  *--check*1) [ -s "$scratch/answer" ] ;;
  *) sed 's/^/# /' "$scratch/said"; return 1 ;;
  esac
}

for command in $commands; do
  ef_page "$command"
  ef_tell "manual page of $command" $?
  [ -n "$(ef_examples "$command")" ]
  ef_tell "$command has examples" $?
  while IFS= read -r line; do
    ef_run "$line"
    ef_tell "$line" $?
  done < <(ef_examples "$command")
done
"$root/tools/make_manual" "$evenfield" 0 > "$scratch/all.1"
for command in $commands; do
  grep -q "evenfield\\\\-$command (1)" "$scratch/all.1"
  ef_tell "the page of evenfield names $command" $?
done

# ef_offers WANTED WORD...: what is offered for the last word.
ef_offers() {
  wanted=$1
  shift
  words=("$@")
  cword=$(($# - 1))
  _evenfield
  [[ " ${COMPREPLY[*]} " == *" $wanted "* ]]
  ef_tell "completion offers $wanted for $*" $?
}

ef_offers match evenfield ma
ef_offers --format evenfield match --fo
ef_offers json evenfield match --format ''
ef_offers ciede2000 evenfield match --metric cie
ef_offers cie-1964 evenfield match --observer cie
ef_offers demo:lab-display evenfield match --display demo:
ef_offers demo:livery evenfield describe demo:li
words=(evenfield match --no-such)
cword=2
_evenfield
[ ${#COMPREPLY[@]} = 0 ]
ef_tell "completion offers nothing for --no-such" $?

ef_end

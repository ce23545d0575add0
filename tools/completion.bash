# SPDX-License-Identifier: GPL-3.0-or-later
# Completion for bash. What can be typed is asked of the command itself, so
# this file knows no option by name but those whose values are listed by
# `evenfield tables` and `evenfield observer list`.

_evenfield_listed() {
  evenfield "$@" --format csv --quiet 2>/dev/null |
    awk -F, 'NR > 1 { print $1 }'
}

_evenfield_values() {
  case $1 in
  --observer) _evenfield_listed observer list ;;
  --illuminant) _evenfield_listed tables illuminants ;;
  --metric) _evenfield_listed tables metrics ;;
  --display)
    _evenfield_listed tables encodings
    _evenfield_listed tables demo
    ;;
  --adaptation) printf '%s\n' cat16 bradford none ;;
  *) # Choices stand in the help, as in --format text|csv|json.
    evenfield "$2" --help 2>/dev/null | awk -v option="$1" '
      $1 == option && $2 ~ /^[a-z0-9-]+(\|[a-z0-9-]+)+$/ {
        gsub(/\|/, "\n", $2)
        print $2
      }'
    ;;
  esac
}

_evenfield() {
  local word=${words[cword]} before=${words[cword - 1]}
  local command=${words[1]} known
  COMPREPLY=()
  if [ "$cword" = 1 ]; then
    known=$(evenfield 2>/dev/null | awk '
      /^Commands:$/ { on = 1; next }
      /^$/ { on = 0 }
      on { print $1 }')
    known="$known --help --version"
  elif [[ $before == --* ]] &&
    known=$(_evenfield_values "$before" "$command") && [ -n "$known" ]; then
    : # a value of the option before
  elif [[ $word == -* ]]; then
    known=$(evenfield "$command" --help 2>/dev/null |
      awk '/^  --/ { print $1 }')
  else
    known=$(_evenfield_listed tables demo)
    mapfile -t COMPREPLY < <(compgen -f -- "$word")
  fi
  mapfile -t -O "${#COMPREPLY[@]}" COMPREPLY < <(compgen -W "$known" -- "$word")
}

# Names such as demo:livery and model:age=45 have colons: bash then completes
# the part behind the last one.
_evenfield_complete() {
  local words=("${COMP_WORDS[@]}") cword=$COMP_CWORD cut i
  ! declare -F _get_comp_words_by_ref >/dev/null ||
    _get_comp_words_by_ref -n : -w words -i cword
  _evenfield
  cut=${words[cword]}
  [[ $cut == *:* && $COMP_WORDBREAKS == *:* ]] || return 0
  cut=${cut%"${cut##*:}"}
  for i in "${!COMPREPLY[@]}"; do COMPREPLY[i]=${COMPREPLY[i]#"$cut"}; done
}
complete -o filenames -F _evenfield_complete evenfield

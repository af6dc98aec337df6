# Tries the commands of a list on copies of the files of a folder here, and prints the list anew with what came of each:
#
#     sh try.sh FOLDER LIST
#
# Below a refused command stand its message and exit code, and whether it left anything behind. Below an accepted one
# stand what the summary says of data and places, the rows set aside, and the first command with the very same map.
# Files that no command names are told at the end.
list=$PWD/$2
mkdir tried && cp -R "${0%/*}/$1/." tried && cd tried || exit 1
files=$(ls)
maps=

# told runs a command and prints what it complains of, and whether anything is left where it should not be.
told() {
  before=$(echo * .[!.]*)
  eval "drumlin $1" >../said 2>../complaint
  code=$?
  while IFS= read -r said; do printf '%s\n' "$said"; done <../complaint
  [ $code -eq 0 ] && return
  echo "exit $code"
  [ -s ../said ] && echo "something is on standard output"
  [ "$(echo * .[!.]*)" = "$before" ] || echo "something was written"
  return 1
}

# taken prints what a summary says of data and places, and the rows set aside.
taken() {
  [ -f new/map/set-aside.csv ] && set -- ../said new/map/set-aside.csv || set -- ../said
  awk '
    function flush() { if (part != "") { sub(/; mapped on .*/, "", part); print part; part = "" } }
    FILENAME ~ /csv$/ { if (FNR > 1) print "aside    " $0; next }
    /^[a-z]/ { flush(); keep = /^(data|joined|places) / }
    keep { sub(/^ +/, " "); part = part $0 }
    /^written/ { flush() }' "$@"
}

while IFS= read -r line; do
  case $line in
  '$ map '*)
    printf '%s\n' "$line"
    told "${line#??} --write csv --cells-across 8 --max-knots 6 --out new/map" || continue
    taken
    sum=$(cksum <new/map/surface.csv)
    case $maps in
    *"#$sum:"*)
      same=${maps#*"#$sum:"}
      echo "the map of ${same%%#*}"
      ;;
    *) maps="$maps#$sum:${line#??map }#" ;;
    esac
    rm -r new
    ;;
  '$ inspect '*)
    printf '%s\n' "$line"
    told "${line#??}" && sed -n '/^To look at/,/^$/ { /^$/d; p; }; /^  drumlin map/p; /^No map/p' ../said
    ;;
  '#'* | '')
    printf '%s\n' "$line"
    ;;
  esac
done <"$list"

for file in $files; do
  grep -qF -e " $file" "$list" || echo "not tried: $file"
done

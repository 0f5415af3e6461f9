#!/bin/sh
# One part of a sweep, for a machine of many: part INDEX of COUNT, as a file in DIR.
#
#   sweep-part.sh SCENARIO DIR COUNT INDEX [option of the sweep]...
#
# INDEX is 1 to COUNT, or the name of a variable of the environment that holds it, as a batch scheduler sets one for each
# job of an array; a scheduler that counts from 0 is told apart by FIRST=0. The options are the same for all parts:
# --samples N, --seed S, --draw KIND, --threads N. STILLGATE names the program, if it is not on the path.
#
# A part that is there already is not swept again, and one that was killed goes on where it was: a job that failed may
# simply be run once more.
set -eu

if [ "$#" -lt 4 ]; then
    echo "usage: sweep-part.sh SCENARIO DIR COUNT INDEX [option of the sweep]..." >&2
    exit 2
fi
scenario=$1 dir=$2 count=$3 index=$4
shift 4
program=${STILLGATE:-stillgate}

case $index in
    '' | *[!A-Za-z0-9_]*)
        echo "sweep-part.sh: \`$index\` is no index and no name of a variable" >&2
        exit 2
        ;;
    [0-9]*) ;;
    *)
        # the name of a variable, checked above
        eval "value=\${$index:-}"
        if [ -z "$value" ]; then
            echo "sweep-part.sh: the variable $index is not set" >&2
            exit 2
        fi
        index=$value
        ;;
esac
index=$((index - ${FIRST:-1} + 1))

# a folder for each part: jobs do not meet, and what a killed one left is found again
own=$dir/part-$index-of-$count
mkdir -p "$own"
for done in "$own"/part-*.stillgate-part; do
    [ -e "$done" ] || continue
    echo "$done is there already"
    exit 0
done
for begun in "$own"/unfinished-*.stillgate-part; do
    [ -e "$begun" ] || continue
    exec "$program" sweep --continue "$begun" --keep-every "${KEEP_EVERY:-100000}"
done
exec "$program" sweep "$scenario" --part "$index/$count" --out "$own" --keep-every "${KEEP_EVERY:-100000}" "$@"

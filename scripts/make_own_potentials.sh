#!/bin/sh
# Make input/data/own-potentials.csv: the depletion potentials of the built-in baseline, as `skymend potency` finds them
# (half a minute on one core).

usage() {
    cat <<END
Usage: scripts/make_own_potentials.sh SKYMEND [YEAR]

Writes input/data/own-potentials.csv with the program SKYMEND and the data in input/data, for the air of YEAR
(default 2020). Run it from the project's folder, anew whenever mechanism, tables or schedule have changed.
END
}

case ${1-} in
-h | --help)
    usage
    exit 0
    ;;
'' | -*)
    usage >&2
    exit 2
    ;;
esac
program=$1
year=${2:-2020}
table=input/data/own-potentials.csv
made=$(mktemp -d) || exit 2
trap 'rm -rf "$made"' EXIT
SKYMEND_DATA=input/data "$program" potency --year "$year" --quiet --csv "$made/potency.csv" || exit
{
    echo "# title: Skymend's own depletion potentials, built-in baseline, air of $year"
    sed -n 1p "$made/potency.csv"
    echo "# source: $("$program" --version), skymend potency --year $year --csv, $(date -u +%Y-%m-%d)"
    echo "# made by: scripts/make_own_potentials.sh, on the data of the same day"
    echo "# note: odp is the potential, odp_noise its numerical noise. One near-global column: no polar chemistry, no loss to ocean and soil (so CH3Br is too high), and a gas that lives less than half a year is not mixed well enough for it"
    sed 1d "$made/potency.csv"
} >"$made/table.csv" && mv "$made/table.csv" "$table" && echo "written: $table"

#!/bin/sh
# What skymend settle says and refuses: tables, CSV, sensitivities, the same bits for any number of threads.
#
# Environment: see checks.sh.
# Prints "ok NAME" or "not ok NAME" per check. Every expected text is this program's own contract (README.md).

. "$(dirname "$0")/checks.sh"
verb=settle

cat >coarse.cfg <<'END'
title = "coarse";
years = { first = 1980; last = 1990; };
grid = { top_km = 60; spacing_km = 4; };
day = { mode = "mean"; };
END

refused "unknown option" "did you mean --year?" coarse.cfg --yaer 1990
refused "year without a value" "needs a value" coarse.cfg --year
refused "rows of nothing" "add --sensitivity" coarse.cfg --rows 5
refused "overwrite of nothing" "add --json or -o" coarse.cfg --overwrite
refused "year no number" "is no number" coarse.cfg --year soon
refused "year not whole" "no whole number" coarse.cfg --year 1990.5
refused "year outside the schedule" "CFC-11 has values for" coarse.cfg --year 2300
refused "of without sensitivity" "add --sensitivity" coarse.cfg --of column
refused "unknown answer" "is no answer" coarse.cfg --sensitivity --of columm
refused "unknown gas" "did you mean N2O?" coarse.cfg --sensitivity --of lifetime:N20
refused "altitude outside the grid" "reach from" coarse.cfg --sensitivity --of O3@70
refused "flux of a gas that the ground does not keep" "keeps no value of O3" coarse.cfg --sensitivity --of flux:O3
refused "two cases" "name one" coarse.cfg other.cfg
refused "no such case" "nowhere.cfg" nowhere.cfg

"$SKYMEND" settle --help >output 2>errors
truth "help" eval '[ $? -eq 0 ] && grep -q "usage: skymend settle" output && [ ! -s errors ]'

"$SKYMEND" settle coarse.cfg --year 2000 >output 2>errors
status=$?
truth "settles" eval '[ $status -eq 0 ] && [ ! -s errors ]'
truth "prints the column" grep -q 'ozone column  *[23][0-9][0-9]\.[0-9]* DU' output
truth "prints lifetimes" grep -q '^  N2O  *[0-9.]*  *3\.1[0-9]*e+05 ppt' output
"$SKYMEND" settle coarse.cfg --csv >first.csv 2>errors
truth "the first year of the case by default" grep -q '^solution,year,1980,' first.csv

"$SKYMEND" settle coarse.cfg --year 2000 --sensitivity --of lifetime:CFC-11 --rows 5 >output 2>errors
status=$?
truth "sensitivities" eval '[ $status -eq 0 ] && grep -q "What the laboratory does not know" output'
# light takes CFC-11: nothing does more to its lifetime than its own photolysis, mixing and the light's absorbers
truth "what matters for CFC-11 is there" grep -q 'J-CFC-11' output

"$SKYMEND" settle coarse.cfg --year 2000 -o settled.nc >output 2>errors
status=$?
truth "writes a file" eval '[ $status -eq 0 ] && ncdump -v ozone_column settled.nc | grep -q "ozone_column = [23]"'
refused "keeps a file that is there" "exists already" coarse.cfg -o settled.nc

"$SKYMEND" settle coarse.cfg --year 2000 --sensitivity --csv --json settled.json >settled.csv 2>errors
status=$?
truth "writes JSON beside the CSV" eval '[ $status -eq 0 ] && "${PYTHON:-/usr/bin/python3}" -m json.tool settled.json >/dev/null'
truth "JSON and CSV say the same" "${PYTHON:-/usr/bin/python3}" -c '
import csv, json, math
data = json.load(open("settled.json"))
rows = list(csv.reader(line for line in open("settled.csv") if not line.startswith("#")))
values = {(r[0], r[1]): r[2] for r in rows}
assert data["year"] == 2000 and data["sensitivity"]["of"] == "column"
assert math.isclose(float(values["answer", "column"]), data["ozone_column_DU"], rel_tol=1e-8)
for name, gas in data["gases"].items():
    assert math.isclose(float(values["answer", "lifetime:" + name]), gas["lifetime_years"], rel_tol=1e-5), name
entries = data["sensitivity"]["reactions"] + data["sensitivity"]["borders_and_mixing"]
assert len(entries) == sum(r[0].startswith("d ") for r in rows) > 250
for e in entries:
    assert math.isclose(float(values["d column / d ln " + e["kind"], e["name"]]), e["per_ln"], rel_tol=1e-6), e
effects = [abs(e.get("effect", 0)) for e in data["sensitivity"]["reactions"]]
assert effects == sorted(effects, reverse=True)'
refused "keeps a JSON file that is there" "exists already" coarse.cfg --json settled.json

for threads in 1 2; do
    "$SKYMEND" settle coarse.cfg --year 2000 --csv --sensitivity --threads $threads >threads$threads.csv 2>errors
done
truth "the same bits for any number of threads" cmp -s threads1.csv threads2.csv
truth "every row of the CSV has six cells" eval \
    '[ "$(grep -v "^#" threads1.csv | awk -F, "NF != 6" | wc -l)" -eq 0 ] && [ "$(wc -l <threads1.csv)" -gt 250 ]'

exit $((failures > 0))

#!/bin/sh
# skymend potency from the command line: what it prints and writes, that its forms say the same, what it
# refuses, an interrupt; a gas that a user adds.
#
# Environment: see checks.sh.
# Prints "ok NAME" or "not ok NAME" per check. Every expected text is this program's own contract (README.md).

. "$(dirname "$0")/checks.sh"
verb=potency

cat >coarse.cfg <<'END'
title = "a \"coarse\" case \\ with signs that JSON must escape";
years = { first = 1980; last = 1990; };
grid = { top_km = 60; spacing_km = 4; };
END

refused "unknown option" "did you mean --year?" coarse.cfg --yaer 1990
refused "year not whole" "no whole number" coarse.cfg --year 1990.5
refused "year outside the schedule" "CFC-11 has values for" coarse.cfg --year 2300
refused "reference that is no such gas" "did you mean CFC-11?" coarse.cfg --reference CFC-1l
refused "reference that feeds no family" "feeds a catalytic family" coarse.cfg --reference CO2
refused "two cases" "name one" coarse.cfg other.cfg
printf 'x\n' >there.csv
refused "keeps a file that is there" "exists already" coarse.cfg --csv there.csv
printf 'sun = { kind = "season"; latitude_deg = 45; };\n' >season.cfg
refused "a sun with seasons has no column at rest" "never at rest" season.cfg --year 2000

"$SKYMEND" potency --help >output 2>errors
truth "help" eval '[ $? -eq 0 ] && grep -q "usage: skymend potency" output && [ ! -s errors ]'

"$SKYMEND" potency coarse.cfg --year 2000 --csv p.csv --json p.json >output 2>errors
status=$?
truth "it succeeds" [ "$status" -eq 0 ]
truth "prints the table" grep -q '^  CFC-11 .* 1  *0.0e+00  *1 ' output
truth "no line is wider than 120 characters" awk 'length > 120 { exit 1 }' output
truth "JSON for json.tool" "$python" -m json.tool p.json

cat >compare.py <<'PY'
import csv
import json
import math

with open("p.json", encoding="utf-8") as source:
    data = json.load(source)
with open("p.csv", encoding="utf-8", newline="") as source:
    rows = {r["gas"]: r for r in csv.DictReader(line for line in source if not line.startswith("#"))}
assert data["title"] == 'a "coarse" case \\ with signs that JSON must escape', data["title"]
assert data["year"] == 2000 and data["reference"] == "CFC-11"
assert set(rows) == set(data["gases"]) and len(rows) > 20
reference = data["gases"]["CFC-11"]
for name, gas in data["gases"].items():
    row = rows[name]
    # the same digits in both
    for key in ("odp", "odp_frozen", "odp_noise", "DU_per_Gg_year", "lifetime_years", "nonlinearity"):
        assert float(row[key]) == gas[key], (name, key)
    # the definition: change of the column per mass, over that of the reference; nine digits are written
    assert math.isclose(gas["odp"], gas["DU_per_Gg_year"] / reference["DU_per_Gg_year"], rel_tol=1e-7), name
    assert math.isclose(gas["lifetime_years"], gas["burden_cm-2"] / sum(gas["loss_cm-2_s-1"].values()) / 31557600.0,
                        rel_tol=1e-7), name
    parts = [float(row[k]) for k in row if k.startswith("loss_")]
    assert len(parts) == 5 and abs(sum(parts) - 100.0) < 1e-5, name
    assert 0 <= gas["odp_noise"] < 0.02 * abs(gas["odp"]), name
assert reference["odp"] == 1 and reference["DU_per_Gg_year"] < 0
PY
truth "CSV and JSON agree and keep to the definition" "$python" compare.py

for threads in 1 2; do
    "$SKYMEND" potency coarse.cfg --year 2000 --threads $threads --quiet --json threads$threads.json >output 2>errors
done
truth "quiet" eval '[ ! -s output ] && [ ! -s errors ]'
truth "the same bits for any number of threads" cmp threads1.json threads2.json

"$SKYMEND" potency coarse.cfg --year 2000 --adjoint --quiet --csv adjoint.csv >output 2>errors
truth "the quick way gives the frozen column of the long one" "$python" -c '
import csv
read = lambda p: {r["gas"]: r for r in csv.DictReader(l for l in open(p) if not l.startswith("#"))}
a, b = read("adjoint.csv"), read("p.csv")
assert all(a[g]["odp"] == "" and a[g]["odp_frozen"] == b[g]["odp_frozen"] for g in b) and len(a) == len(b)'

# ---- a gas that a user adds: a twin of CFC-115 under another name, of which there is little ----

"$python" - <<'PY'
import os
import re

data = os.environ["SKYMEND_DATA"]
text = open(os.path.join(data, "mechanism.cfg"), encoding="utf-8").read()
text, species = re.subn(r'(\{ name = "CFC-115"; formula = "C2ClF5"; \})', r'\1, { name = "TWIN-115"; formula = "C2ClF5"; }', text)
entry = re.compile(r"^    \{ id = .*?\},?$(?=\n(?:    \{|\);| *//|\n))", re.M | re.S)
blocks = [e for e in entry.findall(text) if "CFC-115" in re.search(r'eq = "([^"]*)"', e).group(1).replace('"', " ").split()]
for block in blocks:
    equation = re.search(r'eq = "([^"]*)"', block).group(1)
    twin = block.replace(equation, re.sub(r"\bCFC-115\b", "TWIN-115", equation)).replace('id = "', 'id = "twin-')
    text = text.replace(block, twin.rstrip(",") + ",\n" + block)
assert species == 1 and len(blocks) >= 3, (species, len(blocks))
open("twin-mechanism.cfg", "w", encoding="utf-8").write(text)
PY
cat >twin.cfg <<'END'
title = "twin";
years = { first = 2000; last = 2000; };
grid = { top_km = 60; spacing_km = 4; };
files = { mechanism = "twin-mechanism.cfg"; };
surface = { bounds = (
    { species = "TWIN-115"; kind = "fixed"; mole_fraction = 1e-15; },
END
"$SKYMEND" check coarse.cfg >resolved 2>errors
"$python" - <<'PY'
import re

text = open("resolved", encoding="utf-8").read()
bounds = re.search(r"bounds *= *\((.*?)\);", text, re.S).group(1)
with open("twin.cfg", "a", encoding="utf-8") as out:
    out.write(bounds + "); };\n")
PY
"$SKYMEND" potency twin.cfg --quiet --csv twin.csv >output 2>errors
status=$?
truth "a case with a gas of the user's own" [ "$status" -eq 0 ]
# two gases with the same formula, reactions and light have the same potential, to the noise of the factors (told to be
# below 0.2 %), where there is so little of either that it does not shorten its own life: with CFC-12 the two are 1 % apart
truth "its potential is that of its twin, CFC-115" "$python" -c '
import csv
rows = {r["gas"]: r for r in csv.DictReader(l for l in open("twin.csv") if not l.startswith("#"))}
a, b = rows["TWIN-115"], rows["CFC-115"]
assert abs(float(a["odp"]) / float(b["odp"]) - 1) < 4e-3
assert abs(float(a["odp_frozen"]) / float(b["odp_frozen"]) - 1) < 1e-3
assert abs(float(a["lifetime_years"]) / float(b["lifetime_years"]) - 1) < 1e-6'

# ---- an interrupt ----

printf 'title = "full";\n' >full.cfg
"$SKYMEND" potency full.cfg --year 2000 --csv never.csv >output 2>errors </dev/null &
pid=$!
sleep 3
kill -INT $pid
wait $pid
status=$?
truth "interrupted: 130, nothing written" eval '[ $status -eq 130 ] && [ ! -e never.csv ] && [ ! -s output ]'
truth "and says so" grep -q "interrupted" errors

exit $((failures > 0))

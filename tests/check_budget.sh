#!/bin/sh
# skymend budget from the command line: what it prints and writes, that its three forms say the same, and
# what it does with bad requests.
#
# Environment: SKYMEND the program, SKYMEND_DATA the folder of the data, TEST_DIR a scratch folder.
# Prints "ok NAME" or "not ok NAME" per check, with "# ..." lines that say why. Expected texts are this
# program's own contract (README.md); no outside values.

: "${SKYMEND:?path of the program}" "${SKYMEND_DATA:?folder of the data}" "${TEST_DIR:?scratch folder}"
SKYMEND=$(cd "$(dirname "$SKYMEND")" && pwd)/$(basename "$SKYMEND")
SKYMEND_DATA=$(cd "$SKYMEND_DATA" && pwd)
export SKYMEND_DATA
python=${PYTHON:-/usr/bin/python3}
cd "$TEST_DIR" || exit 1
failures=0

# check NAME TEST...: a plain condition
check() {
    name=$1
    shift
    if "$@" >said 2>&1; then
        printf 'ok %s\n' "$name"
    else
        printf 'not ok %s\n' "$name"
        sed 's/^/#   /' said | head -n 5
        failures=$((failures + 1))
    fi
}

# run ARGUMENT...: skymend budget; status, file "output", file "errors"
run() {
    "$SKYMEND" budget "$@" >output 2>errors </dev/null
    status=$?
}

# refused NAME STATUS PIECE...: after run; one line on standard error that holds every piece, nothing printed
refused() {
    name=$1
    wanted=$2
    shift 2
    why=
    [ "$status" -eq "$wanted" ] || why="exit status $status, wanted $wanted"
    [ "$(wc -l <errors)" -eq 1 ] || why="$(wc -l <errors) lines on standard error"
    [ ! -s output ] || why="something was printed"
    for piece in "$@"; do
        grep -qF -e "$piece" errors || why="the message lacks: $piece"
    done
    if [ -z "$why" ]; then
        printf 'ok %s\n' "$name"
    else
        printf 'not ok %s\n# %s\n' "$name" "$why"
        sed 's/^/#   stderr: /' errors | head -n 3
        failures=$((failures + 1))
    fi
}

cat >quick.cfg <<'END'
title = "a \"quick\" case \\ with signs that JSON must escape";
grid = { top_km = 80; spacing_km = 4; };
day = { mode = "mean"; };
END

# ---- what it writes ----

run quick.cfg --year 1990 --csv b.csv --json b.json -o b.nc --threads 1
check "it succeeds" [ "$status" -eq 0 ]
check "the CSV, the JSON and the NetCDF file are there" [ -s b.csv -a -s b.json -a -s b.nc ]
for text in 'Odd oxygen by family' 'Shares in the loss of odd oxygen' 'Chain lengths' 'What families are made of' \
    'Lifetimes of the source gases' 'Atoms in the active species' 'CFC-11' 'ClONO2'; do
    check "printed: $text" grep -qF "$text" output
done
check "no line is wider than 120 characters" awk 'length > 120 { exit 1 }' output
check "JSON for json.tool" "$python" -m json.tool b.json

cat >compare.py <<'PY'
import csv
import json
import math

import netCDF4
import numpy as np

with open("b.json", encoding="utf-8") as source:
    data = json.load(source)
with open("b.csv", encoding="utf-8", newline="") as source:
    rows = list(csv.DictReader(source))
file = netCDF4.Dataset("b.nc")
case = 'a "quick" case \\ with signs that JSON must escape'
assert data["title"] == case, data["title"]
assert data["year"] == 1990.5 and data["explicit_days"] == 0
ox = data["odd_oxygen"]

# the three forms agree: nine digits are written, so to 5e-9 of the file's sixteen
for name, values in {**ox["production"], **ox["loss"]}.items():
    side = "production" if name in ox["production"] else "loss"
    table = [float(r["value"]) for r in rows if (r["table"], r["name"], r["part"]) == ("odd oxygen", side, name)]
    variable = f"odd_oxygen_{side}_by_" + name.replace(" ", "_")
    stored = file[variable][0].filled(np.nan)
    assert table == values and np.allclose(stored, values, rtol=6e-9, atol=0), name
for name, gas in data["gases"].items():
    row = [r for r in rows if (r["table"], r["name"], r["part"]) == ("lifetime", name, "all")]
    assert len(row) == 1 and math.isclose(float(row[0]["value"]), gas["lifetime_years"], rel_tol=1e-8), name
    loss = sum(gas["loss_cm-2_s-1"].values())
    assert math.isclose(gas["burden_cm-2"] / loss / 31557600.0, gas["lifetime_years"], rel_tol=1e-8), name
assert math.isclose(file["lifetime_N2O"][0], data["gases"]["N2O"]["lifetime_years"], rel_tol=1e-8)

# with more CO2 than in 1980 the stratopause is colder, and the file says by how much
change = file["temperature_change"][0]
assert not np.ma.is_masked(change) and -5.0 < change[12] < -0.1, change

# the books close in what is written; shares sum to one; every layer is there
layers = len(data["altitude_km"])
net = sum(np.array(v) for v in ox["production"].values()) - sum(np.array(v) for v in ox["loss"].values())
gross = sum(np.abs(v) for v in ox["production"].values()) + sum(np.abs(v) for v in ox["loss"].values())
assert layers == 20 and (np.abs(net - ox["net"]) < 1e-7 * gross).all(), "odd oxygen does not close"
for name, family in data["partition"].items():
    assert np.allclose(sum(np.array(v) for v in family["share"].values()), 1.0, rtol=0, atol=1e-7), name
weights = {r["id"]: r["weight"] for r in ox["reactions"]}
assert weights["NO2+O"] == -2 and weights["NO+HO2"] == 1 and "NO+O3" not in weights
print(layers)
PY
check "CSV, JSON and NetCDF agree, books close, shares sum to one" "$python" compare.py
check "the JSON is the same again, with another number of threads" sh -c \
    "'$SKYMEND' budget quick.cfg --year 1990 --json again.json --quiet --threads 2 && cmp b.json again.json"

printf 'title = "courses"; grid = { top_km = 80; spacing_km = 4; }; output = { moments = "all"; };\n' >course.cfg
run course.cfg --year 1990 -o course.nc --quiet
check "with moments the file holds them" "$python" -c 'import netCDF4, numpy
no = netCDF4.Dataset("course.nc")["NO_course"][0]
assert no.shape == (4, 20) and not numpy.ma.is_masked(no) and no[2, 8] > 1e-10 > 1e3 * no[0, 8], no'

run quick.cfg --year 1990 --quiet
check "--quiet prints nothing" [ "$status" -eq 0 -a ! -s output -a ! -s errors ]
run quick.cfg --year 1990 --at 21,33.5 --at 41 --reactions
check "--at names the altitudes" grep -q '^altitude, km  *21  *33.5  *41  *column$' output
check "--reactions prints the table of weights" grep -q 'shared *OH+O3 -1' output
check "--reactions lists the odd oxygen" grep -qF '2 NO3 + 3 N2O5' output

printf 'grid = { top_km = 40; spacing_km = 4; }; day = { mode = "mean"; };\n' >low.cfg
run low.cfg --year 1990
check "a lower grid has fewer altitudes" grep -q '^altitude, km  *15  *20  *25  *30  *35  *40  *column$' output
sed 's/"mean"/"explicit"/; s/spacing_km = 4/spacing_km = 5/' quick.cfg >days.cfg
run days.cfg --year 1990 --quiet --json days.json
check "with explicit days" [ "$status" -eq 0 ]
check "which it says" grep -q '"explicit_days": 30' days.json

# ---- bad requests ----

run quick.cfg
refused "no year" 2 "--year"
run quick.cfg --year 1990.5
refused "half a year" 2 "--year" "whole number"
run quick.cfg --year 1990 --at 15,high
refused "an altitude that is none" 2 "--at" "high"
run quick.cfg --year 1990 --at 99
refused "an altitude above the top" 2 "99" "80 km"
printf 'sun = { kind = "season"; latitude_deg = 45; };\n' | cat quick.cfg - >season.cfg
run season.cfg --year 1990
refused "a sun with seasons" 2 "season" "never at rest" "skymend project"
run quick.cfg --year 1990 --jsn x
refused "a slip in an option" 2 "--jsn" "did you mean --json"
run quick.cfg --year 1600
refused "a year that no schedule has" 2 "--year"
run none.cfg --year 1990
refused "a case that is not there" 2 "none.cfg"
for form in --csv --json -o; do
    echo kept >there
    run quick.cfg --year 1990 $form there
    refused "$form: a file that is there" 2 "there" "--overwrite"
    check "$form: and stays" grep -q kept there
    run quick.cfg --year 1990 $form nowhere/b --quiet
    refused "$form: a folder that is not there" 4 "nowhere/b"
done
run quick.cfg --year 1990 --csv one --json one
refused "one file for two forms" 2 "--csv and --json" "one"
check "one file for two forms: none is written" [ ! -e one ]
run quick.cfg --year 1990 --csv there --overwrite --quiet
check "--overwrite replaces" [ "$status" -eq 0 -a "$(grep -c kept there)" -eq 0 ]
if [ -w /dev/full ]; then
    run quick.cfg --year 1990 --json /dev/full --overwrite --quiet
    refused "a full disk" 4 "/dev/full"
fi

# a mechanism without the photolysis of O2
sed 's/special = "O2";/special = "O2-O1D";/' "$SKYMEND_DATA/mechanism.cfg" >dark.cfg
printf 'files = { mechanism = "dark.cfg"; };\n' | cat quick.cfg - >dark-case.cfg
run dark-case.cfg --year 1990
refused "a mechanism without the photolysis of O2" 2 "dark.cfg" "photolysis of O2"

[ "$failures" -eq 0 ]

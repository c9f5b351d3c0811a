#!/bin/sh
# skymend answers from the command line: what it prints and writes, that its forms say the same as the file itself read
# with other tools, what it refuses, one file against another, finer numerics.
#
# Environment: see checks.sh.
# Prints "ok NAME" or "not ok NAME" per check. Every expected text is this program's own contract (README.md); figures
# are worked out anew from the file by numpy.

. "$(dirname "$0")/checks.sh"
verb=answers

# made NAME LINE...: a coarse case of 1996 to 1999 and its file
made() {
    base=$1
    shift
    {
        # shellcheck disable=SC2028 # the case reads the backslashes
        echo 'title = "a \"coarse\" case, with signs that JSON and CSV must escape";'
        echo 'grid = { top_km = 80; spacing_km = 4; };'
        printf '%s\n' "$@"
    } >"$base.cfg"
    "$SKYMEND" project "$base.cfg" -o "$base.nc" --threads 1 >"$base.out" 2>"$base.errors" </dev/null
    truth "project runs $base" eval "[ $? -eq 0 ] && [ -s $base.out ]"
}

four='years = { first = 1996; last = 1999; }; output = { per_year = 4; };'
mean='day = { mode = "mean"; };'
start='numerics = { start = "spinup"; spinup_years = 0;'
made own "$four" "$mean" "$start };"
made other "$four" "$mean" "$start }; surface = { tropopause_km = 12; washout_per_day = 0.3; };"
made finer "$four" "$mean" "$start outer_step_days = 3.8; };"
made finer-other "$four" "$mean" "$start outer_step_days = 3.8; }; surface = { washout_per_day = 0.3; };"
made later 'years = { first = 2010; last = 2011; }; output = { per_year = 4; };' "$mean" "$start };"
made yearly 'years = { first = 1996; last = 1999; };' "$mean" "$start };"

# ---- requests ----

refused "no file" "no file named"
refused "unknown option" "did you mean --against?" own.nc --aganst other.nc
refused "two files" "name one" own.nc other.nc
refused "missing file" "none.nc" none.nc
refused "missing reference" "none.nc" own.nc --against none.nc
refused "what is no NetCDF" "own.cfg" own.cfg
refused "benchmark that is no year" "soon" own.nc --benchmark soon
refused "benchmark that is not whole" "no whole number" own.nc --benchmark 1996.5
refused "window of no length" "--smooth" own.nc --smooth 0
refused "two limits" "three altitudes" own.nc --limits 12,24
refused "four limits" "three altitudes" own.nc --limits 12,24,32,40
refused "limits that do not increase" "do not increase" own.nc --limits 12,32,24
refused "limits that are no numbers" "no number" own.nc --limits 12,high,32
refused "finer run without its reference" "--finer-against" own.nc --against other.nc --finer finer.nc
refused "finer reference without a reference" "--against" own.nc --finer-against finer.nc
refused "no time in common" "no time in common" own.nc --against later.nc
refused "different intervals" "different intervals" own.nc --against yearly.nc
refused "a finer run that is another case" "another case" own.nc --finer other.nc
refused "a finer run that is none" "same numerics" own.nc --finer own.nc
printf 'x\n' >there.csv
refused "keeps a file that is there" "exists already" own.nc --csv there.csv
refused "one file for two forms" "both name" own.nc --csv a --json a
cp own.nc same.nc
refused "over the file itself" "same.nc, which is read" same.nc --csv same.nc --overwrite
refused "over the reference by another name" "./same.nc, which is read" own.nc --against same.nc --json ./same.nc --overwrite
truth "and leaves it as it is" cmp own.nc same.nc
rm same.nc
echo old >half.csv
(
    trap '' XFSZ
    ulimit -f 2 # blocks: far less than the answers take
    "$SKYMEND" answers own.nc --quiet --csv half.csv --overwrite 2>errors
    echo $? >code
    "$SKYMEND" answers own.nc --quiet --csv half-new.csv 2>errors
    echo $? >>code
)
truth "a file that cannot be written whole" eval '[ "$(echo $(cat code))" = "4 4" ] && [ "$(cat half.csv)" = old ] && [ ! -e half-new.csv ] && ! ls half*.part*'
"$SKYMEND" answers own.nc --csv nowhere/a.csv >output 2>errors </dev/null
truth "a folder that is not there: exit 4" eval "[ $? -eq 4 ] && grep -q nowhere errors"
"$SKYMEND" answers --help >output 2>errors
truth "help" eval '[ $? -eq 0 ] && grep -q "usage: skymend answers" output && [ ! -s errors ]'

# ---- one file ----

"$SKYMEND" answers own.nc --benchmark 1996 --smooth 2 --csv own.csv --json own.json >output 2>errors
truth "it succeeds" eval "[ $? -eq 0 ] && [ ! -s errors ]"
truth "the table has its parts, its caution and a word on the season" eval \
    'grep -q "12-24 km" output && grep -q "competent authority" output && grep -q "hold the season" output'
"$SKYMEND" answers own.nc --quiet --csv own.csv --overwrite >output 2>errors
truth "quiet is silent, and overwrites when told to" eval "[ $? -eq 0 ] && [ ! -s errors ] && [ ! -s output ]"
"$SKYMEND" answers own.nc --benchmark 1996 --smooth 2 --csv own.csv --overwrite --quiet
truth "project says the same as answers" eval 'lines=$(grep -c "^  199" own.out) && "$SKYMEND" answers own.nc >again &&
    [ "$(grep "^  199" own.out)" = "$(grep "^  199" again)" ] && [ "$lines" -eq 8 ]' # two tables by year

cat >forms.py <<'PY'
import csv
import json

import netCDF4
import numpy as np

with open("own.json", encoding="utf-8") as text:
    told = json.load(text)
with open("own.csv", encoding="utf-8") as text:
    rows = {row["id"]: row for row in csv.DictReader(line for line in text if not line.startswith("#"))}
assert told["title"] == 'a "coarse" case, with signs that JSON and CSV must escape', told["title"]
answers = told["answers"]
assert list(rows) == list(answers) and len(rows) > 60, len(rows)
for name, row in rows.items():
    answer = answers[name]
    assert None not in row and row["method"] == answer["method"] != "", row
    assert row["unit"] == answer["unit"] and row["note"] == answer["note"], name
    for key, cell in (("value", row["value"]), ("numerical_error", row["numerical_error"])):
        assert (cell == "") == (answer[key] is None), (name, key)
        assert cell == "" or float(cell) == answer[key], (name, key)
    assert answer["value"] is not None or answer["note"], name + " is none and does not say why"

data = netCDF4.Dataset("own.nc")
column, ozone = data["ozone_column"][:], data["O3"][:]
edge, air = data["altitude_edge"][:], data["air_number_density"][:]
layer = ozone * air * np.diff(edge) * 1e5 / 2.6867e16
tropopause = float(data["tropopause_altitude"][...])
assert tropopause == 12.0
parts = [layer[:, (edge[:-1] >= low) & (edge[:-1] < high)].sum(axis=1)
         for low, high in ((0, 12), (12, 24), (24, 32), (32, 80))]  # layers of 4 km end at the limits
parts[3] += ozone[:, -1] * float(data["air_column_above_top"][...]) / 2.6867e16
assert np.allclose(sum(parts), column, rtol=1e-12)
names = ["ozone_column"] + ["ozone_column_" + part for part in ("troposphere", "lower_stratosphere",
                                                                  "middle_stratosphere", "upper_stratosphere")]


def near(name, value, relative=2e-8):  # nine digits are written
    got = answers[name]["value"]
    assert abs(got - value) <= relative * abs(value), (name, got, value)


for name, values in zip(names, [column] + parts):
    near(name + "_lowest", values.min())
    near(name + "_benchmark", values[:4].mean())
    near(name + "_lowest_year", 1996.125 + 0.25 * values.argmin(), 1e-7)
    near(name + "_change", values.min() - values[:4].mean(), 1e-6)
    near(name + "_last_change", values[-4:].mean() - values[:4].mean(), 1e-6)
    # two years centred on an interval: seven whole ones and half of the two at the ends
    smooth = np.convolve(values, [0.5] + 7 * [1.0] + [0.5], "valid") / 8.0
    near(name + "_lowest_smoothed", smooth.min())
    assert np.allclose(told["calendar_year_means"][name], values.reshape(4, 4).mean(axis=1), rtol=1e-8), name
assert told["calendar_year_means"]["year"] == [1996, 1997, 1998, 1999]
near("ozone_column_share_above_tropopause", 100.0 * (1.0 - parts[0][:4].mean() / column[:4].mean()))
PY
truth "CSV, JSON and the file itself agree" "$python" forms.py

# ---- stored in the file ----

cat >stored.py <<'PY'
import json
import subprocess
import os
import re
import warnings

import netCDF4
import numpy as np
import xarray as xr

assert netCDF4.__version__
warnings.simplefilter("error")
subprocess.run([os.environ["SKYMEND"], "answers", "own.nc", "--json", "default.json", "--quiet"], check=True)
with open("default.json", encoding="utf-8") as text:
    told = json.load(text)
with xr.open_dataset("own.nc") as data:
    assert data.attrs["answers_numerical_error"] == told["errors"]
    stored = [name[len("answer_"):] for name in data.data_vars if name.startswith("answer_")]
    # emissions by gas and line are told, not stored: the file holds what they are made of
    detail = re.compile(r"emission_\w+_total|odp_emission_(own|treaty)_(line_\d+|\w*\d\w*|CH\w+)_(total|largest)")
    assert stored == [name for name in told["answers"] if not detail.fullmatch(name)], "not the same answers"
    for name, answer in told["answers"].items():
        if name not in stored:
            continue
        variable = data["answer_" + name]
        assert variable.dims == (), name
        attributes = variable.attrs
        assert attributes["units"] == answer["unit"] and attributes["long_name"] == answer["label"], name
        assert attributes["method"] == answer["method"] and attributes.get("note", "") == answer["note"], name
        value = float(variable)
        assert np.isnan(value) if answer["value"] is None else np.isclose(value, answer["value"], rtol=1e-8), name
        error = answer["numerical_error"]
        assert ("numerical_error" in attributes) == (error is not None), name
        assert error is None or np.isclose(attributes["numerical_error"], error, rtol=1e-8), name
    assert float(data["answer_ozone_column_lowest"]) == float(data["ozone_column"].min())
PY
truth "project stores the answers; xarray opens the file" env SKYMEND="$SKYMEND" "$python" stored.py

# ---- against, finer ----

"$SKYMEND" answers own.nc --against other.nc --benchmark 1996 --json pair.json >output 2>errors
truth "against another file" eval "[ $? -eq 0 ] && [ ! -s errors ] && grep -q 'against other.nc' output"
"$SKYMEND" answers own.nc --against own.nc --json self.json --quiet
"$SKYMEND" answers own.nc --against other.nc --benchmark 1996 --finer finer.nc --finer-against finer-other.nc \
    --limits 12,24,32 --json fine.json --quiet
truth "against another file, both with finer twins" [ $? -eq 0 ]
cat >pair.py <<'PY'
import json

import netCDF4
import numpy as np


def answers(name):
    with open(name, encoding="utf-8") as text:
        return json.load(text)["answers"]


def column(name):
    return netCDF4.Dataset(name)["ozone_column"][:].filled()


pair, itself, fine = answers("pair.json"), answers("self.json"), answers("fine.json")
less = column("other.nc") - column("own.nc")
assert (less != 0.0).any()
assert np.isclose(pair["ozone_column_integrated_depletion"]["value"], 0.25 * less.sum(), rtol=1e-6, atol=1e-9)
assert np.isclose(pair["ozone_column_integrated_depletion_where_less"]["value"], 0.25 * less[less > 0].sum(),
                  rtol=1e-6, atol=1e-9)
most = abs(less).argmax()
assert np.isclose(pair["ozone_column_difference_largest"]["value"], -less[most], rtol=1e-6)
assert abs(pair["ozone_column_difference_largest_year"]["value"] - (1996.125 + 0.25 * most)) < 1e-6
for name, answer in itself.items():
    if "integrated" in name or "difference" in name or "delay" in name:
        assert answer["value"] in (0.0, None), name
finer = column("finer-other.nc") - column("finer.nc")
assert np.isclose(fine["ozone_column_integrated_depletion"]["numerical_error"], abs(0.25 * (less - finer).sum()),
                  rtol=1e-5, atol=1e-9)
assert np.isclose(fine["ozone_column_lowest"]["numerical_error"], abs(column("own.nc").min() - column("finer.nc").min()),
                  rtol=1e-6)
PY
truth "differences, integrals and errors are those of the files" "$python" pair.py

# ---- emissions in ODP-tonnes ----

# CFC-11 and N2O by lines from 1998 on, the latter as mass of nitrogen
printf '%s\n' 'change,year,gas,kind,amount,unit,line' ',1998-1999,CFC-11,emission,70,kt/yr,"made up, leak"' \
    ',1998,CFC-11,emission,5,kt/yr,made up - foam' ',1998-1999,N2O,emission,15,Tg N/yr,made up - soils' \
    ',1998-1999,CH3Br,emission,60,kt/yr,made up - all' >lines.csv
made lines "$four" "$mean" "$start };" 'files = { schedule_layers = [ "lines.csv" ]; };'
printf '%s\n' 'gas,odp,odp_noise,odp_frozen' CFC-11,1,0,1 CH3Br,2,0.5,2 N2O,0.125,0.25,0.1 CH4,-1,0,-1 >mine.csv
"$SKYMEND" answers lines.nc --against own.nc --benchmark 1996 --potentials mine.csv --json lines.json --csv lines-rows.csv \
    >output 2>errors
truth "emissions by line, with potentials of one's own" eval \
    '[ $? -eq 0 ] && [ ! -s errors ] && grep -q "^  made up, leak *CFC-11 *140" output && grep -q "mine.csv" output'
"$SKYMEND" answers own.nc --benchmark 1996 --json plain.json --quiet
cat >odp.py <<'PY'
import csv
import json
import os

import netCDF4
import numpy as np


def told(name):
    with open(name, encoding="utf-8") as text:
        return json.load(text)


def table(name):
    with open(name, encoding="utf-8") as text:
        return list(csv.DictReader(line for line in text if not line.startswith("#")))


def emissions(name):  # Gg by calendar year
    data = netCDF4.Dataset(name)
    return {data[n[9:]].species: data[n][:].filled().reshape(4, 4).mean(axis=1)
            for n in data.variables if n.startswith("emission_")}


def near(got, want):  # nine digits are written
    assert np.allclose(got, want, rtol=2e-8, atol=1e-6), (got, want)


folder = os.environ["SKYMEND_DATA"]
treaty = {row["gas"]: float(row["potential"]) for row in table(folder + "/treaty-potentials.csv") if row["potential"] != "none"}
own = {row["gas"]: float(row["odp"]) for row in table(folder + "/own-potentials.csv")}
nature = {row["gas"] for row in table(folder + "/natural-sources.csv")}
plain, lines = told("plain.json"), told("lines.json")

# no lines: what nature gives off too is apart altogether
gas = emissions("own.nc")
counted = sum(1e3 * p * gas[g] for g, p in treaty.items() if g in gas and g not in nature)
assert plain["odp_emission"]["year"] == [1996, 1997, 1998, 1999] and counted.min() > 1e5
near(plain["odp_emission"]["treaty"]["counted"], counted)
near(plain["odp_emission"]["treaty"]["natural_implied"], 600.0 * gas["CH3Br"])
near(plain["odp_emission"]["own"]["counted"],
     sum(1e3 * own[g] * value for g, value in gas.items() if g in own and g not in nature))
near(plain["odp_emission"]["own"]["nitrogen"], 1e3 * own["N2O"] * gas["N2O"])
answers = plain["answers"]
near(answers["odp_emission_treaty_total"]["value"], counted.sum())
near(answers["odp_emission_treaty_largest"]["value"], counted.max())
assert answers["odp_emission_treaty_largest_year"]["value"] == 1996.5 + counted.argmax()
assert answers["odp_emission_treaty_total"]["numerical_error"] is None
assert 0.0 < answers["odp_emission_own_total"]["numerical_error"] < 2e-3 * answers["odp_emission_own_total"]["value"]

# lines: CH3Br counts from 1998 on; potentials of one's own
more, answers = emissions("lines.nc"), lines["answers"]
near(more["CFC-11"][2:], [75.0, 70.0])
near(more["N2O"][2:], 15000.0 * 44.013 / 28.014)
near(lines["odp_emission"]["own"]["counted"], 1e3 * (more["CFC-11"] + 2.0 * np.array([0.0, 0.0, 60.0, 60.0])))
near(lines["odp_emission"]["own"]["natural_implied"], 2e3 * more["CH3Br"] * [1.0, 1.0, 0.0, 0.0])
near(answers["odp_emission_own_line_1_total"]["value"], 140e3)
near(answers["odp_emission_own_nitrogen_total"]["numerical_error"], 250.0 * more["N2O"].sum())
difference = 1e3 * (more["CFC-11"] - gas["CFC-11"] + 2.0 * (more["CH3Br"] - gas["CH3Br"]))
assert abs(difference[2:]).min() > 100.0 and abs(difference[:2]).max() < 1e-6
near(lines["odp_emission"]["own"]["difference"], difference)
near(answers["odp_emission_own_difference_total"]["value"], difference.sum())
assert [line["label"] for line in lines["odp_emission"]["line"]][:2] == ["made up, leak", "made up - foam"]
assert lines["odp_emission"]["line"][1]["emission_Gg_year"] == [0, 0, 5, 0]
rows = {row["id"]: row for row in table("lines-rows.csv")}
near(float(rows["odp_emission_treaty_line_2_total"]["value"]), 5e3)
near(float(rows["emission_CFC_11_total"]["value"]), more["CFC-11"].sum())
PY
truth "ODP-tonnes are those of the file and the tables" "$python" odp.py
refused "potentials that are none" "no column" own.nc --potentials "$SKYMEND_DATA/treaty-potentials.csv"
refused "potentials that are not there" "none.csv" own.nc --potentials none.csv

[ "$failures" -eq 0 ]

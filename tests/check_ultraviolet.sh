#!/bin/sh
# skymend sunlight --ultraviolet from the command line: that its forms agree with each other and with the file
# of a projection, the change against a benchmark year, what it refuses.
#
# Environment: see checks.sh.
# Prints "ok NAME" or "not ok NAME" per check. Every expected text is this program's own contract (README.md).

. "$(dirname "$0")/checks.sh"
verb=sunlight

# light FILE OPTION...: skymend sunlight --ultraviolet into FILE
light() {
    to=$1
    shift
    "$SKYMEND" sunlight "$@" --ultraviolet >"$to" 2>errors
    status=$?
    truth "succeeds: $*" eval '[ $status -eq 0 ] && [ ! -s errors ]'
}

cat >coarse.cfg <<'END_CASE'
years = { first = 1980; last = 1990; };
grid = { top_km = 80; spacing_km = 4; };
day = { mode = "mean"; };
ultraviolet = { latitude_deg = -33.9; day_of_year = 355; };
END_CASE

refused "--spectrum alone" "add that" coarse.cfg --spectrum
refused "--benchmark alone" "add that" coarse.cfg --benchmark 1980
refused "moment" "leave --moment out" coarse.cfg --ultraviolet --moment noon
refused "benchmark without a file" "add --state" coarse.cfg --ultraviolet --benchmark 1980
refused "benchmark that is no year" "--benchmark" coarse.cfg --ultraviolet --benchmark 19x0
refused "benchmark and spectrum" "leave --benchmark out" coarse.cfg --ultraviolet --benchmark 1980 --spectrum
refused "option misspelt" "did you mean --ultraviolet?" coarse.cfg --ultravoilet
printf 'lower_nm,upper_nm\n210,280\n280,316\n316,400\n' >bins.csv
printf 'files = { ultraviolet_bins = "bins.csv"; };\n' | cat coarse.cfg - >bins.cfg
refused "bins without a limit" "bins.csv: no bin begins or ends at 315 nm" bins.cfg --ultraviolet
"$SKYMEND" check bins.cfg >output 2>errors
status=$?
truth "check sees it too" eval '[ $status -eq 2 ] && grep -q "at 315 nm" errors'

"$SKYMEND" project coarse.cfg -o run.nc --quiet
truth "a projection" [ $? -eq 0 ]
light year.csv coarse.cfg --state run.nc --year 1990
light change.csv coarse.cfg --state run.nc --year 1990 --benchmark 1980
light spectrum.csv coarse.cfg --state run.nc --year 1990 --spectrum
printf 'ultraviolet = { latitude_deg = 85; day_of_year = 355; };\n' >night.cfg
light night.csv night.cfg
light overhead.csv --cosine 1
refused "a year that the file has not" "no record in 2050" coarse.cfg --ultraviolet --state run.nc --year 1990 --benchmark 2050
truth "carries the caution" grep -q "^# caution: .*no guide to personal exposure.*competent authority" year.csv
truth "names the sun" grep -q "^# sun: noon at latitude -33.9 on day 355" year.csv
truth "says that it is night" grep -q "below the horizon at noon" night.csv

cat >compare.py <<'PY'
import csv
import math

import netCDF4


def read(path):
    with open(path, encoding="utf-8") as source:
        return list(csv.DictReader(line for line in source if not line.startswith("#")))


def check(name, passed):
    print(("ok " if passed else "not ok ") + name)


def near(one, two, relative=1e-5):
    return math.isclose(float(one), float(two), rel_tol=relative)


year = {(row["quantity"], row["unit"]): row["value"] for row in read("year.csv")}
plain = {name: value for (name, unit), value in year.items() if unit != "SED day-1"}
run = netCDF4.Dataset("run.nc")
names = [
    "surface_uva_irradiance_noon", "surface_uvb_irradiance_noon", "surface_erythemal_irradiance_noon",
    "uv_index_noon", "erythemal_daily_dose", "erythemal_amplification_factor",
]
# 1990 is the last record; its O3, NO2 and temperature are those of the table
for name in names:
    check("table and file agree: " + name, near(plain[name], run[name][-1]))
    check("the file has its unit: " + name, (name, run[name].units) in year)
check("standard erythemal doses", near(year["erythemal_daily_dose", "SED day-1"],
                                        float(plain["erythemal_daily_dose"]) / 100))

change = [row for row in read("change.csv") if row["unit"] != "SED day-1"]
for row in change:
    if row["quantity"] not in names:
        continue
    then, now = float(run[row["quantity"]][0]), float(run[row["quantity"]][-1])
    check("benchmark of " + row["quantity"], near(row["benchmark"], then) and near(row["value"], now))
    check("change of " + row["quantity"], abs(float(row["change_percent"]) - 100 * (now / then - 1)) < 1e-4)
check("ozone fell and ultraviolet rose",
      run["ozone_column"][-1] < run["ozone_column"][0] and run["uv_index_noon"][-1] > run["uv_index_noon"][0])

spectrum = [{key: float(value) for key, value in row.items()} for row in read("spectrum.csv")]


def integral(column, low, high, weight=None):
    return sum((row["upper_nm"] - row["lower_nm"]) * row[column] * (row[weight] if weight else 1)
               for row in spectrum if row["lower_nm"] >= low and row["upper_nm"] <= high)


check("spectrum adds up to UV-B", near(integral("ground", 280, 315), plain["surface_uvb_irradiance_noon"]))
check("spectrum adds up to UV-A", near(integral("ground", 315, 400), plain["surface_uva_irradiance_noon"]))
check("spectrum above adds up to UV-B",
      near(integral("above_atmosphere", 280, 315), plain["uvb_irradiance_above_atmosphere"]))
check("spectrum adds up to the erythemal irradiance",
      near(integral("ground", 100, 400, "erythemal_weight"), plain["surface_erythemal_irradiance_noon"]))
night = {row["quantity"]: row["value"] for row in read("night.csv")}
check("no ultraviolet in polar night", float(night["uv_index_noon"]) == 0 and float(night["erythemal_daily_dose"]) == 0)
check("no factor in polar night", night["erythemal_amplification_factor"] == "")
overhead = [row["quantity"] for row in read("overhead.csv")]
check("one sun has no day", "uv_index" in overhead and "erythemal_daily_dose" not in overhead)
PY
"$python" compare.py
truth "the comparison ran to its end" [ $? -eq 0 ]
[ "$failures" -eq 0 ]

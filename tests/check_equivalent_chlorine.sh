#!/bin/sh
# skymend project stores equivalent chlorine, and refuses a bad table of fractional release before the run.
# Finds SKYMEND, SKYMEND_DATA and TEST_DIR in its environment. PYTHON names the interpreter.
. "$(dirname "$0")/checks.sh"

printf '%s\n' 'years: { first = 1990; last = 1995; };' 'grid: { spacing_km = 4.0; };' \
    'day: { mode = "mean"; };' 'numerics: { start = "spinup"; spinup_years = 0.25; };' >short.cfg

truth "project with the data's own table" "$SKYMEND" project short.cfg -o short.nc --quiet --threads 1

# Worked out anew from the file's own values at the ground, with another quadrature: 40000 steps of 0.01 years, of
# which the sum is good to some 1e-6 (the spectrum beyond 400 years is below 1e-30).
cat >anew.py <<'END'
import csv, re, sys
import numpy as np, xarray as xr

data = xr.open_dataset("short.nc", decode_times=False)
day = data.time.values
year = 1990.5 + np.arange(len(day))
table = [row for row in csv.DictReader(line for line in open(sys.argv[1]) if not line.startswith("#"))]
for name, mean in (("equivalent_chlorine_3yr", 3.0), ("equivalent_chlorine_55yr", 5.5)):
    values = {row["of"]: float(row["value"]) for row in table if float(row["mean_age_year"]) == mean}
    alpha = values.pop("Br")
    age = np.arange(0.005, 400.0, 0.01)
    width = mean / 2
    weight = np.sqrt(mean**3 / (4 * np.pi * width**2 * age**3)) * np.exp(-mean * (age - mean) ** 2 / (4 * width**2 * age))
    weight /= weight.sum()
    total = np.zeros(len(year))
    for variable in data.data_vars.values():
        if variable.dims != ("time", "altitude") or variable.attrs.get("species") not in values:
            continue
        atoms = dict.fromkeys(("Cl", "Br"), 0)
        for symbol, count in re.findall(r"([A-Z][a-z]?)(\d*)", variable.attrs["formula"]):
            if symbol in atoms:
                atoms[symbol] += int(count or 1)
        factor = values[variable.attrs["species"]] * (atoms["Cl"] + alpha * atoms["Br"])
        ground = variable.values[:, 0]
        total += factor * np.array([weight @ np.interp(t - age, year, ground) for t in year]) * 1e12
    stored = data[name].values
    assert data[name].attrs["units"] == "1e-12" and total.min() > 1000, (name, total)
    assert np.abs(stored / total - 1).max() < 1e-5, (name, stored, total)
END
truth "stored values are those of another quadrature" "$python" anew.py "$SKYMEND_DATA/fractional-release.csv"

# a table of one's own, in a data folder of one's own
mkdir own && cp -R "$SKYMEND_DATA"/. own/
sed 's/^3,release,CFC-11,0.47$/3,release,CFC-11,4.7/' "$SKYMEND_DATA/fractional-release.csv" >own/fractional-release.csv
line=$(grep -n '^3,release,CFC-11,' own/fractional-release.csv | cut -d: -f1)
SKYMEND_DATA=$TEST_DIR/own "$SKYMEND" project short.cfg -o refused.nc --quiet >said 2>&1
status=$?
truth "a bad table ends with 2" [ $status -eq 2 ]
SKYMEND_DATA=$TEST_DIR/own "$SKYMEND" project short.cfg -o refused.nc --quiet >words 2>&1
truth "and names file, line and range" grep -q "fractional-release.csv:$line: the fractional release is 4.7; it must lie between 0 and 1" words
truth "and nothing was run" [ ! -e refused.nc ]

[ $failures -eq 0 ]

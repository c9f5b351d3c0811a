#!/bin/sh
# Reads a Skymend file with the programs its users have: ncdump, cdo, nco (ncks) and xarray.
# usage: tests/check_readback.sh [FILE.nc]      exit code 0: all agree; 1: one does not; 2: wrong use or a tool is missing
# Without a file it has SKYMEND make one from a short coarse case in TEST_DIR.
# What one tool reads is compared with what another reads, not only looked for. PYTHON names the interpreter.
set -u
course=

if [ $# -eq 0 ] && [ -n "${SKYMEND-}" ] && [ -n "${TEST_DIR-}" ]; then
    printf '%s\n' 'years: { first = 1978; last = 1983; };' 'grid: { spacing_km = 4.0; };' \
        'day: { mode = "mean"; };' 'numerics: { start = "spinup"; spinup_years = 0.5; };' >"$TEST_DIR/readback.cfg"
    "$SKYMEND" project "$TEST_DIR/readback.cfg" -o "$TEST_DIR/readback.nc" --quiet || exit 2
    set -- "$TEST_DIR/readback.nc"
    # the same gases by time of day
    printf '%s\n' 'years: { first = 2000; last = 2001; };' 'grid: { spacing_km = 4.0; };' \
        'numerics: { spinup_years = 0.5; };' 'output: { moments = "all"; };' >"$TEST_DIR/course.cfg"
    "$SKYMEND" project "$TEST_DIR/course.cfg" -o "$TEST_DIR/course.nc" --quiet || exit 2
    course=$TEST_DIR/course.nc
fi
if [ $# -ne 1 ] || [ ! -r "$1" ]; then
    echo "usage: $0 [FILE.nc] (a readable file)" >&2
    exit 2
fi
file=$1
python=${PYTHON:-/usr/bin/python3}
for tool in ncdump cdo ncks "$python"; do
    if ! command -v "$tool" >/dev/null 2>&1; then
        echo "$0: $tool is not installed" >&2
        exit 2
    fi
done
work=$(mktemp -d) || exit 2
trap 'rm -rf "$work"' EXIT
failures=0

ok() { echo "ok $1"; }
bad() {
    failures=$((failures + 1))
    echo "not ok $1"
}

# check NAME COMMAND...: the command succeeds and says nothing that sounds like trouble
check() {
    name=$1
    shift
    if ! "$@" >"$work/out" 2>"$work/err"; then
        bad "$name"
        sed 's/^/        /' "$work/err"
    elif grep -qiE 'warning|error|unsupported|inconsistent' "$work/err"; then
        bad "$name (complains)"
        sed 's/^/        /' "$work/err"
    else
        ok "$name"
    fi
}

# same NAME GOT WANT
same() {
    if [ -n "$2" ] && [ "$2" = "$3" ]; then
        ok "$1: $2"
    else
        bad "$1: got '$2', wanted '$3'"
    fi
}

# ---- ncdump: the shape of the file ----
check "ncdump -h" ncdump -h "$file"
cp "$work/out" "$work/header"
for line in 'time = UNLIMITED' ':Conventions = "CF-1.10"' 'time:units = "days since 1950-01-01 00:00:00"' \
    'time:calendar = "standard"' 'time:bounds = "time_bnds"' 'altitude:bounds = "altitude_bnds"' \
    'altitude:positive = "up"' 'double O3(time, altitude)' 'O3:standard_name = "mole_fraction_of_ozone_in_air"' \
    'ozone_column:units = "DU"' ':history = ' ':source = "Skymend' ':resolved_case = ' ':caution = '; do
    if grep -qF "$line" "$work/header"; then ok "header has $line"; else bad "header has $line"; fi
done
records=$(sed -n 's/.*time = UNLIMITED ; \/\/ (\([0-9]*\) currently).*/\1/p' "$work/header")
layers=$(sed -n 's/^[[:space:]]*altitude = \([0-9]*\) ;.*/\1/p' "$work/header")
check "ncdump -t (dates)" ncdump -t -v time_bnds "$file"

# ---- xarray: decodes it, and what CF asks of the values holds; writes the figures to compare ----
cat >"$work/read.py" <<'PY'
import sys
import warnings

import netCDF4  # first: what it warns of on being loaded is no fault of the file
import numpy as np
import xarray as xr

assert netCDF4.__version__
warnings.simplefilter("error")
with xr.open_dataset(sys.argv[1]) as data:
    time, bounds = data["time"], data["time_bnds"].values
    assert time.dtype.kind == "M", f"time is not decoded: {time.dtype}"
    assert (np.diff(time.values) > np.timedelta64(0)).all(), "time does not increase"
    assert (bounds[:, 0] < time.values).all() and (time.values < bounds[:, 1]).all(), "time outside its bounds"
    assert (bounds[1:, 0] == bounds[:-1, 1]).all(), "intervals do not follow each other"
    altitude, layer = data["altitude"].values, data["altitude_bnds"].values
    assert (np.diff(altitude) > 0).all() and altitude[-1] < 200.0, "altitude in km does not ascend"
    assert (layer[:, 0] < altitude).all() and (altitude < layer[:, 1]).all(), "altitude outside its bounds"
    assert (layer[1:, 0] == layer[:-1, 1]).all(), "layers do not follow each other"
    layered = [v for v in data.data_vars.values() if v.dims == ("time", "altitude")]
    fields = [v for v in layered if v.name != "temperature_change"]
    for field in layered:
        odd_oxygen = field.name.startswith("odd_oxygen_")
        assert "species" in field.attrs or odd_oxygen or field.name == "temperature_change", field.name
        if field.name == "temperature_change":
            assert field.attrs["units"] == "K" and np.isfinite(field.values).all(), field.name
    assert fields, "no mole fractions"
    for field in fields:
        unit = "cm-3 s-1" if field.name.startswith("odd_oxygen_") else "mol mol-1"
        assert np.isfinite(field.values).all(), f"{field.name} has missing or non-finite values"
        assert field.attrs["units"] == unit and field.attrs["long_name"], field.name
    if "odd_oxygen_net_source" in data:  # the books of odd oxygen close in the file
        sign = {"production": 1.0, "loss": -1.0}
        parts = {f.name: sign[f.name.split("_")[2]] * f.values for f in fields if "_by_" in f.name}
        gross = sum(np.abs(part) for part in parts.values())
        left = sum(parts.values()) - data["odd_oxygen_net_source"].values
        assert len(parts) == 9 and (np.abs(left) <= 1e-12 * gross).all(), "odd oxygen does not close"
        assert data["lifetime_N2O"].attrs["units"] == "year" and (data["lifetime_N2O"] > 10.0).all(), "lifetime"
    column = data["ozone_column"]
    assert column.dims == ("time",) and np.isfinite(column.values).all(), "ozone_column"
    assert ((column > 1.0) & (column < 2000.0)).all(), "ozone_column is not in DU"
    print("records", time.size)
    print("layers", altitude.size)
    print("fields", len(fields))
    print("first", time.dt.strftime("%Y-%m-%d").values[0])
    print("last", time.dt.strftime("%Y-%m-%d").values[-1])
    print("column", f"{float(column[-1]):.6f}")
    print("mean", f"{float(column.mean()):.4f}")
    print("ozone", f"{float(data['O3'][-1].max()):.6e}")
PY
check "xarray" "$python" "$work/read.py" "$file"
cp "$work/out" "$work/figures"
figure() { sed -n "s/^$1 //p" "$work/figures"; }
same "records, ncdump and xarray" "$records" "$(figure records)"
same "layers, ncdump and xarray" "$layers" "$(figure layers)"

# ---- cdo: reads time, altitude and every field; computes with them ----
check "cdo sinfon" cdo -s sinfon "$file"
check "cdo ntime" cdo -s ntime "$file"
same "records, cdo and xarray" "$(tr -d ' \n' <"$work/out")" "$(figure records)"
check "cdo showdate" cdo -s showdate "$file"
same "first date, cdo and xarray" "$(tr -s ' ' '\n' <"$work/out" | sed -n '/./{p;q;}')" "$(figure first)"
same "last date, cdo and xarray" "$(tr -s ' ' '\n' <"$work/out" | sed -n '/./h;${x;p;}')" "$(figure last)"
check "cdo selname" cdo -s -selname,O3 "$file" "$work/o3.nc"
check "cdo showlevel" cdo -s showlevel "$work/o3.nc"
same "levels, cdo and xarray" "$(wc -w <"$work/out" | tr -d ' ')" "$(figure layers)"
check "cdo timmean" cdo -s timmean -selname,ozone_column "$file" "$work/mean.nc"
check "cdo outputf" cdo -s outputf,%.4f "$work/mean.nc"
same "mean column, cdo and xarray" "$(tr -d ' \n' <"$work/out")" "$(figure mean)"
check "cdo vertmax" cdo -s outputf,%.6e -vertmax -seltimestep,-1 "$work/o3.nc"
same "highest ozone, cdo and xarray" "$(tr -d ' \n' <"$work/out")" "$(figure ozone)"

# ---- nco: cuts a record out, and the cut is still the same file ----
check "ncks last record" ncks -O -d time,-1 "$file" "$work/last.nc"
check "ncks values" ncks -H -C -s '%.6f\n' -v ozone_column "$work/last.nc"
same "last column, nco and xarray" "$(sed -n '/[0-9]/{p;q;}' "$work/out" | tr -d ' ')" "$(figure column)"
check "ncks metadata" ncks -m -v O3 "$file"
check "xarray reads what ncks cut" "$python" "$work/read.py" "$work/last.nc"

# ---- the course of the day ----
if [ -n "$course" ]; then
    cat >"$work/course.py" <<'PY'
import sys
import warnings

import netCDF4  # first: what it warns of on being loaded is no fault of the file
import numpy as np
import xarray as xr

assert netCDF4.__version__
warnings.simplefilter("error")
with xr.open_dataset(sys.argv[1]) as data:
    hours = data["local_time"]
    assert hours.dims == ("local_time",) and (hours.values == [0.0, 6.0, 12.0, 18.0]).all(), hours
    assert hours.attrs["flag_meanings"] == "midnight sunrise noon sunset" and hours.attrs["units"] == "h"
    courses = [name for name in data.data_vars if name.endswith("_course")]
    assert "N2O_course" not in courses and "CFC_11_course" not in courses, "a source gas has no course"
    for name in courses:
        course, mean = data[name], data[name[: -len("_course")]]
        assert course.dims == ("time", "local_time", "altitude"), f"{name}: {course.dims}"
        assert np.isfinite(course.values).all(), f"{name} has missing or non-finite values"
        assert course.attrs["units"] == "mol mol-1" and course.attrs["species"] == mean.attrs["species"], name
        assert course.attrs.get("standard_name") == mean.attrs.get("standard_name"), name
        assert course.attrs["cell_methods"] == "time: mean local_time: point altitude: mean", name
    at = {"method": "nearest", "altitude": 32.0}
    no, mean = data["NO_course"].sel(**at), data["NO"].sel(**at)
    assert (no.sel(local_time=12) > 1.5 * mean).all(), "NO at noon"
    assert (abs(no.sel(local_time=0)) < 1e-3 * mean).all(), "NO at midnight"
    print("courses", len(courses))
    print("noon", f"{float(data['NO_course'].sel(local_time=12)[-1].max()):.6e}")
    print("layers", data["altitude"].size)
PY
    check "xarray, course of the day" "$python" "$work/course.py" "$course"
    cp "$work/out" "$work/figures"
    check "the other checks of xarray on it" "$python" "$work/read.py" "$course"
    check "cdo sinfon, course of the day" cdo -s sinfon "$course"
    check "cdo showname" cdo -s showname "$course"
    same "courses, cdo and xarray" "$(tr -s ' ' '\n' <"$work/out" | grep -c _course)" "$(figure courses)"
    check "cdo reads a course" cdo -s outputf,%.6e -selgridcell,3 -vertmax -seltimestep,-1 \
        -selname,NO_course "$course"
    same "NO at noon, cdo and xarray" "$(tr -d ' \n' <"$work/out")" "$(figure noon)"
    check "ncks noon" ncks -O -d local_time,12.0 -v NO_course "$course" "$work/noon.nc"
    check "ncks values of noon" ncks -H -C -s '%.6e\n' -d time,-1 -v NO_course "$work/noon.nc"
    same "layers at noon, nco and xarray" "$(grep -c '[0-9]' "$work/out")" "$(figure layers)"
fi

if [ "$failures" -ne 0 ]; then
    echo "$failures checks failed on $file"
    exit 1
fi
echo "all checks passed on $file"

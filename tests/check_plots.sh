#!/bin/sh
# scripts/plot_cases.py: every kind of figure in every form, what the figures hold, what is refused, and that a picture
# is written whole or not at all.
#
# Environment: see checks.sh.
# Prints "ok NAME" or "not ok NAME" per check. The runs are short and coarse and their schedule is invented; expected
# values are those of the files drawn, or of `skymend answers`.

. "$(dirname "$0")/checks.sh"
scripts=$(cd "$tests/../scripts" && pwd)
MPLCONFIGDIR=$TEST_DIR/matplotlib
export MPLCONFIGDIR PYTHONDONTWRITEBYTECODE=1

plot() {
    "$python" "$scripts/plot_cases.py" "$@" >output 2>errors </dev/null
}

# refused NAME CODE PIECE OPTION...: that exit code, the piece in the last line on standard error, no output file, and
# nothing left in the folder that was not there
refused() {
    name=$1
    code=$2
    piece=$3
    shift 3
    ls -A >before
    plot "$@"
    status=$?
    ls -A >after
    truth "refused: $name" eval '[ $status -eq "$code" ] && tail -n 1 errors | grep -qF -e "$piece" && cmp -s before after'
}

cat >late.csv <<'END'
# title: INVENTED example, no forecast
year,gas,kind,amount,unit,line
1985-1992,CFC-11,emission,400,kt,"INVENTED <b>""foam"" & $x_1$"
1985-1992,CFC-11,emission,50,kt,INVENTED leakage
END
cat >base.cfg <<'END'
title = "Baseline, coarse";
years = { first = 1979; last = 1992; };
grid = { top_km = 80; spacing_km = 4; };
day = { mode = "mean"; };
END
sed 's/Baseline, coarse/INVENTED <i>late<\/i> \& $m_2$/' base.cfg >late.cfg
echo 'files = { schedule_layers = [ "late.csv" ]; };' >>late.cfg
"$SKYMEND" project base.cfg -o base.nc --quiet && "$SKYMEND" project late.cfg -o late.nc --quiet
truth "two projections" [ $? -eq 0 ]

# The column of a run put in place of a made-up one whose benchmark, lowest value and return are known: 300 DU in 1979,
# down by 4 DU a year to 280 in 1984, then up by 3: back at 300 a share 2/3 of the way from 1990.5 to 1991.5.
cp base.nc known.nc
"$python" - <<'PY'
import netCDF4
import numpy as np
with netCDF4.Dataset("known.nc", "a") as data:
    year = np.arange(14)
    data["ozone_column"][:] = np.where(year <= 5, 300.0 - 4.0 * year, 280.0 + 3.0 * (year - 5))
with netCDF4.Dataset("masked.nc", "w") as out, netCDF4.Dataset("base.nc") as data:
    for name, dimension in data.dimensions.items():
        out.createDimension(name, len(dimension))
    for name in ("time", "time_bnds", "altitude", "altitude_bnds", "O3", "air_number_density", "ozone_column"):
        made = out.createVariable(name, "f8", data[name].dimensions)
        made.setncatts({key: data[name].getncattr(key) for key in data[name].ncattrs() if key != "_FillValue"})
        made[:] = data[name][:]
    out["ozone_column"][3] = np.ma.masked
with netCDF4.Dataset("other.nc", "w") as out:
    out.createDimension("x", 2)
    out.createVariable("t", "f8", ("x",))[:] = 1.0
PY
head -c 3000 base.nc >cut.nc
touch before after output errors said
echo "no NetCDF" >text.nc

for kind in page column ozone anomaly gases ultraviolet loss emissions; do
    for form in png svg; do
        plot late.nc base.nc -o "$kind.$form" --figure "$kind" --benchmark 1980
        status=$?
        truth "$kind as $form" eval '[ $status -eq 0 ] && [ ! -s errors ] && [ -s "$kind.$form" ]'
    done
done
plot late.nc base.nc -o page.pdf --benchmark 1980
truth "a page as pdf" eval '[ "$(head -c 5 page.pdf)" = %PDF- ]'
for kind in page column emissions; do
    plot base.nc -o "one-$kind.svg" --figure "$kind" --label 'one $ <file>'
    status=$?
    truth "$kind of one file" eval '[ $status -eq 0 ] && [ ! -s errors ]'
done
plot known.nc -o known.svg --figure column --benchmark 1979
truth "the made-up column" [ $? -eq 0 ]
"$SKYMEND" answers known.nc --benchmark 1979 --json known.json --quiet
truth "answers of the made-up column" [ $? -eq 0 ]
plot late.nc base.nc -o again.svg --figure gases --benchmark 1980
truth "the same picture twice is the same to the byte" cmp gases.svg again.svg
plot base.nc -o fraction.svg --figure ozone --quantity fraction
truth "ozone as mole fraction" eval 'grep -qF "O₃ mole fraction / 10⁻⁶ mol mol⁻¹" fraction.svg'

cp column.png kept.png
refused "a file that is not there" 2 "none.nc" none.nc -o x.png
refused "a file that is no NetCDF" 2 "text.nc" text.nc -o x.png
refused "a file cut off" 2 "cut.nc" cut.nc -o x.png
refused "a NetCDF file of another kind" 2 "is it a Skymend file?" other.nc -o x.png
refused "missing values" 2 "ozone_column has missing" masked.nc -o x.png --figure column
refused "no losses in the file" 2 "" masked.nc -o x.png --figure loss
refused "a benchmark outside the file" 2 "does not cover that year" base.nc -o x.png --figure anomaly --benchmark 1950
refused "a year outside the file" 2 "does not cover that year" base.nc -o x.png --figure loss --year 2050
refused "another form" 2 "ends in .png, .svg or .pdf" base.nc -o x.gif
refused "another kind" 2 "invalid choice" base.nc -o x.png --figure pie
refused "labels for some files" 2 "one for each or none" base.nc late.nc -o x.png --label one
refused "too many files" 2 "6 at most" base.nc base.nc base.nc base.nc base.nc base.nc base.nc -o x.png --figure column
refused "no file" 2 "required" -o x.png
refused "a bad file over a good picture" 2 "text.nc" text.nc -o column.png
truth "which stays as it was" cmp column.png kept.png
refused "a folder that is not there" 4 "cannot write none/x.png" base.nc -o none/x.png --figure column
mkdir folder.png
refused "a folder in place of a file" 4 "cannot write folder.png" base.nc -o folder.png --figure column
if [ -w /dev/full ]; then
    ln -s /dev/full full.png
    refused "a full device" 4 "cannot write full.png" base.nc -o full.png --figure column
fi

cat >look.py <<'PY'
"""What the pictures hold."""
import json
import re
import sys
import xml.etree.ElementTree as ET

import matplotlib.image
import netCDF4
import numpy as np

sys.path.insert(0, sys.argv[1])
SVG = "{http://www.w3.org/2000/svg}"
KINDS = ("page", "column", "ozone", "anomaly", "gases", "ultraviolet", "loss", "emissions")


def check(name, passed, told=""):
    print(("ok " if passed else "not ok ") + name)
    if not passed:
        print(f"# {told}")


def words(path):
    return [re.sub(r"\s+", " ", "".join(element.itertext())).strip()
            for element in ET.parse(path).getroot().iter(SVG + "text")]


def curves(path):
    """Colour, dashes and points [count][2] of every path of lines alone."""
    found = []
    for element in ET.parse(path).getroot().iter(SVG + "path"):
        style = element.get("style", "")
        numbers = [float(n) for n in re.findall(r"-?\d+\.?\d*", element.get("d", ""))]
        if "fill: none" in style and set(re.findall("[A-Za-z]", element.get("d", ""))) == {"M", "L"}:
            found.append((re.search(r"stroke: (#\w+)", style), "stroke-dasharray" in style,
                          np.array(numbers).reshape(-1, 2)))
    return [(colour.group(1).lower(), dashed, points) for colour, dashed, points in found if colour]


def off_line(one, two):
    """How far two is from a linear function of one, at most."""
    slope, start = np.polyfit(one, two, 1)
    return np.abs(slope * one + start - two).max()


base, late = netCDF4.Dataset("base.nc"), netCDF4.Dataset("late.nc")
for kind in KINDS:
    image = matplotlib.image.imread(kind + ".png")
    # 7.1 inches at 200 dots; a blank picture has one colour
    check(f"{kind}.png is wide and no blank", image.shape[1] == 1420 and
          len(np.unique((image.reshape(-1, image.shape[2])[::7] * 255).astype(int), axis=0)) > 100, image.shape)
    told = words(kind + ".svg")
    foot = " ".join(told)
    check(f"{kind}.svg names source and caution", "Source: Skymend" in foot and "late.nc, base.nc" in foot and
          "competent authority" in foot, foot[-300:])
    check(f"{kind}.svg names both cases", any("INVENTED <i>late</i>" in t for t in told) and
          any("Baseline, coarse" in t for t in told), told)
for kind in ("page", "column"):
    check(f"one-{kind}.svg has the label as it was given", any("one $ <file>" in t for t in words(f"one-{kind}.svg")),
          words(f"one-{kind}.svg"))
for kind in ("page", "ultraviolet"):
    check(f"{kind} says what its ultraviolet is not", "no guide to personal exposure" in
          " ".join(words(kind + ".svg")))
    check(f"{kind} says under which sun", any("45° north" in t for t in words(kind + ".svg")))

# the curve is the column: as many points as records, both axes linear; two decimals of a point are written
column = netCDF4.Dataset("known.nc")["ozone_column"][:]
year = np.arange(14) + 1979.5
lines = [points for colour, _, points in curves("known.svg") if colour == "#0072b2" and len(points) == column.size]
check("one curve has every record", len(lines) == 1, len(lines))
check("it is the column", off_line(column, lines[0][:, 1]) < 0.01 and lines[0][np.argmin(column), 1] ==
      lines[0][:, 1].max(), lines[0][:3])
# years are calendar years, 365 or 366 days, the records' middles those of years of 365.25: a thousandth of a year
check("over its years", off_line(year, lines[0][:, 0]) < 0.05, off_line(year, lines[0][:, 0]))
told = words("known.svg")
answers = json.load(open("known.json", encoding="utf-8"))["answers"]
back = answers["ozone_column_return_year"]["value"]
check("answers agree with the known return", abs(back - (1990.5 + 2.0 / 3.0)) < 2e-3, back)
check("the key names lowest and return", any(t.endswith(f"lowest 280.00 DU in 1984.5; back in {back:.1f}")
                                             for t in told), told)
check("the return stands at its mark", told.count(f"{back:.1f}") == 1, told)
check("the benchmark is named", "1979: 300.00 DU" in told, told)

drawn = curves("column.svg")
solid = [p for colour, dashed, p in drawn if colour == "#0072b2" and len(p) == 14 and not dashed]
dashes = [p for colour, dashed, p in drawn if colour == "#d55e00" and len(p) == 14 and dashed]
check("two cases differ by dashes, not by colour alone", len(solid) == 1 and len(dashes) == 1, len(drawn))
both = np.concatenate([late["ozone_column"][:], base["ozone_column"][:]])
check("on one scale", off_line(both, np.concatenate([solid[0][:, 1], dashes[0][:, 1]])) < 0.01)

told = words("gases.svg")
for name in ("CFC-11", "HCFC-22", "CCl₄", "CH₃Br", "halon-1301", "N₂O", "CH₄", "CO₂", "3 years", "5.5 years",
             "equivalent chlorine / ppt", "mole fraction / ppt"):
    check(f"gases.svg names {name}", name in told, told)
cfc = np.concatenate([late["CFC_11"][:, 0], base["CFC_11"][:, 0]])
pairs = [points for colour, _, points in curves("gases.svg") if colour == "#0072b2" and len(points) == 14]
check("CFC-11 of both cases on one scale", any(off_line(cfc, np.concatenate([a[:, 1], b[:, 1]])) < 0.01
                                               for a in pairs for b in pairs if a is not b))

told = words("emissions.svg")
check("lines by their own labels", 'INVENTED <b>"foam" & $x_1$' in told and "INVENTED leakage" in told, told)
check("with their unit", "CFC-11 / Gg per year" in told, told)
told = words("anomaly.svg")
check("anomaly and difference", "O₃ change against 1980 / %" in told and "O₃ difference / %" in told and
      any(t.startswith("difference: ") for t in told), told)
told = words("loss.svg")
for name in ("Ox", "HOx", "NOx", "ClOx", "BrOx", "loss of odd oxygen / cm⁻³ s⁻¹", "altitude / km"):
    check(f"loss.svg names {name}", name in told, told)

# ---- the functions ----
import matplotlib.pyplot as plt
import skymend_figures as figures
import skymend_sheet as sheets
from skymend_files import read_case, return_year

case = read_case("late.nc")
with plt.rc_context(sheets.STYLE):
    sheet = figures.draw("loss", [case], 1980, 1985)
    left, right = sheet.axes[:2]
    # five families and their sum on the left
    rates = np.array([line.get_xdata() for line in left.lines])
    check("the families add up", rates.shape == (6, 20) and np.allclose(rates[:5].sum(axis=0), rates[5], rtol=1e-12))
    check("they are those of the file", np.allclose(rates[3], late["odd_oxygen_loss_by_ClOx"][6], rtol=1e-12))
    check("shares add up to 100 %", np.allclose(sum(line.get_xdata() for line in right.lines), 100.0, rtol=1e-12))
    sheet = figures.draw("anomaly", [case], 1980)
    field = sheet.axes[0].collections[0].get_array().reshape(20, 14)
    ozone = np.ma.getdata(late["O3"][:])
    check("the anomaly is the change in per cent", np.allclose(field, (100.0 * (ozone / ozone[1] - 1.0)).T, atol=1e-9))
    check("its colours are as far up as down", sheet.axes[0].collections[0].get_clim()[0] ==
          -sheet.axes[0].collections[0].get_clim()[1])
    sheet = figures.draw("gases", [case, read_case("base.nc")], 1980)
    sheet.canvas.draw()
    for axes in sheet.axes:
        # of the text alone, not of the line that leads to it
        boxes = sorted((matplotlib.text.Text.get_window_extent(text) for text in axes.texts if text.xyann[0] > 1.0),
                       key=lambda box: box.y0)
        check(f"names at the ends lie apart: {axes.get_title('left') or axes.get_ylabel()}",
              all(a.y1 <= b.y0 + 1.0 for a, b in zip(boxes, boxes[1:])))
plt.close("all")

seed = np.random.default_rng(20261201)
good = True
for _ in range(300):
    wanted = np.sort(seed.uniform(0, 100, seed.integers(1, 9)))
    place = np.array(sheets.spread(wanted, 5.0, 0.0, 100.0))
    good &= bool((np.diff(place) > 5.0 - 1e-9).all() and place[0] > -1e-9 and place[-1] < 100 + 1e-9)
    far = wanted.size == 1 or np.diff(wanted).min() >= 5.0
    good &= not far or np.allclose(place, wanted)
check("names spread: gaps kept, within the axes, unmoved where there is room", good)
# two names wanted at one place lie half a gap to each side: the least sum of squares
check("names spread evenly about one place", np.allclose(sheets.spread([50, 50], 6, 0, 100), [47, 53]))
check("a rise back from above", abs(return_year(np.arange(5.0), np.array([1.0, 3.0, 4.0, 2.0, 0.0]), 0, 1.0, False) -
                                    3.5) < 1e-12)
check("elements are not mistaken", figures.atoms("CCl3F", "Cl") and not figures.atoms("CCl4", "C" + "r") and
      not figures.atoms("CBrF3", "B") and figures.atoms("CH3Br", "H"))
PY
"$python" look.py "$scripts"
truth "the look ran to its end" [ $? -eq 0 ]
[ "$failures" -eq 0 ]

#!/usr/bin/python3
"""Measure the numerical errors that `skymend answers` quotes, and write the table of them.

    scripts/measure_errors.py [--program build/skymend] [-o input/data/numerical-error.csv] [--threads N] [--keep FOLDER]

Runs the baseline as it is, with finer time and with finer layers; 2020 to 2049 of the baseline and of the invented
demonstration schedule, which part in 2026, in the same three ways; and two pairs of years with explicit days beside
diurnal factors. Compares the means of calendar years of every series the files hold. --keep leaves the files in FOLDER
and takes those that are there already (remove them when the program has changed). About 10 minutes on one idle thread.
Only the core of Python is used.

What is compared with what (a cause each; their errors add up):
  time  outer step and refreshes of light and factors a quarter of the default, solver tolerance a hundredth
  grid  layers of 0.5 km in place of 1 km
  day   explicit days in place of diurnal factors through 1980-1981 and 2000-2001 from the same settled column; the
        second year counts
What of it is written:
  level            largest difference of any year
  change           the same of the change against 1980
  difference       largest of any year of 2020 to 2049 of demonstration less baseline
  mean_difference  the mean of those years, each taken positive: no less than the error of the mean
"""

import argparse
import json
import os
import subprocess
import sys
import tempfile

YEARS = "years = { first = 1955; last = 2100; };"
SOME_YEARS = "years = { first = 2020; last = 2049; };"
FINE_TIME = ("numerics = { outer_step_days = 1.90234375; relative_tolerance = 1e-4; };"
             " day = { refresh_column = 0.000375; refresh_state = 0.0075; refresh_years = 0.125; };")
FINE_GRID = "grid = { top_km = 80; spacing_km = 0.5; };"
EXPLICIT = 'day = { mode = "explicit"; };'
DEMO = 'files = { schedule = "demo-schedule.csv"; };'


def means(program, folder, name, case, threads):
    """Means of calendar years by series, and the units of those, of a case of that text."""
    base = os.path.join(folder, name)
    if not os.path.exists(base + ".nc"):
        with open(base + ".cfg", "w", encoding="ascii") as out:
            out.write(case + "\n")
        print(f"running {name}", file=sys.stderr)
        subprocess.run([program, "project", base + ".cfg", "-o", base + ".part.nc", "--overwrite", "--quiet",
                        "--threads", str(threads)], check=True)
        os.rename(base + ".part.nc", base + ".nc")
    subprocess.run([program, "answers", base + ".nc", "--json", base + ".json", "--overwrite", "--quiet"],
                   check=True)
    with open(base + ".json", encoding="utf-8") as text:
        told = json.load(text)
    units = {series: told["answers"][series + "_benchmark"]["unit"]
             for series in told["calendar_year_means"] if series != "year"}
    return told["calendar_year_means"], units


def largest(values):
    return max(abs(value) for value in values)


def less(a, b):
    return [x - y for x, y in zip(a, b)]


def change(means_of, series):
    at = means_of["year"].index(1980)
    return [value - means_of[series][at] for value in means_of[series]]


def main():
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--program", default="build/skymend")
    parser.add_argument("-o", "--output", default="input/data/numerical-error.csv")
    parser.add_argument("--threads", type=int, default=1)
    parser.add_argument("--keep")
    arguments = parser.parse_args()
    with tempfile.TemporaryDirectory() as made:
        folder = arguments.keep or made
        os.makedirs(folder, exist_ok=True)
        measure(arguments, folder)


def measure(arguments, folder):
    """Every run and the table."""

    def run(name, *pieces):
        return means(arguments.program, folder, name, " ".join(pieces), arguments.threads)

    base, units = run("baseline", YEARS)
    later, _ = run("later", SOME_YEARS)
    demo, _ = run("demo", SOME_YEARS, DEMO)
    rows = []
    for cause, setting in (("time", FINE_TIME), ("grid", FINE_GRID)):
        fine, _ = run("baseline-" + cause, YEARS, setting)
        fine_later, _ = run("later-" + cause, SOME_YEARS, setting)
        fine_demo, _ = run("demo-" + cause, SOME_YEARS, DEMO, setting)
        for series in units:
            moved = less(less(fine_demo[series], fine_later[series]), less(demo[series], later[series]))
            rows += [(series, "level", cause, largest(less(fine[series], base[series]))),
                     (series, "change", cause, largest(less(change(fine, series), change(base, series)))),
                     (series, "difference", cause, largest(moved)),
                     (series, "mean_difference", cause, sum(abs(value) for value in moved) / len(moved))]
    day = {}
    for first in (1980, 2000):
        years = f"years = {{ first = {first}; last = {first + 1}; }};"
        factors, _ = run(f"factors-{first}", years)
        explicit, _ = run(f"explicit-{first}", years, EXPLICIT)
        for series in units:
            day.setdefault(series, []).append(explicit[series][1] - factors[series][1])
    for series, moved in day.items():
        rows += [(series, "level", "day", largest(moved)), (series, "change", "day", abs(moved[1] - moved[0]))]

    how = {"time": "outer step and refreshes a quarter; relative tolerance 1e-4",
           "grid": "layers of 0.5 km",
           "day": "explicit days; second year of 1980-1981 and of 2000-2001"}
    years = {"level": "1955-2100; ", "change": "1955-2100; ", "difference": "2020-2049; ",
             "mean_difference": "2020-2049; "}
    with open(arguments.output, "w", encoding="ascii") as out:
        out.write("# quantity: numerical error of the answers\n"
                  "# unit: in each row\n"
                  "# source: measured on the baseline of this version; differences of cases on the invented demonstration\n"
                  "# source: schedule less the baseline; the causes of one series add up\n"
                  "# made by: scripts/measure_errors.py, which says what is compared with what\n"
                  "series,of,cause,error,unit,how\n")
        for series, of, cause, error in sorted(rows):
            out.write(f"{series},{of},{cause},{error:.2g},{units[series]},"
                      f"{'' if cause == 'day' else years[of]}{how[cause]}\n")


if __name__ == "__main__":
    main()

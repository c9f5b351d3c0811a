#!/usr/bin/python3
"""Write input/data/baseline-schedule.csv and demo-schedule.csv from the reference tables.

    scripts/make_baseline_schedule.py REFERENCE_FOLDER [--output FOLDER]

REFERENCE_FOLDER holds ods-surface-abundance-1955-2100.csv (16 gases, ppt) and
global-annual-abundance-1750-2024.csv (CO2 in ppm, CH4 and N2O in ppb, CH2Cl2 and CHCl3 in ppt). Figures
of the tables go over digit for digit. CH4, N2O and CO2 after 2024 follow a middle pathway through the decade values below.
The demonstration schedule alters some gases after 2025 by invented amounts.
"""
import argparse
import csv
import math
from pathlib import Path

from scipy.interpolate import PchipInterpolator

FIRST, LAST = 1955, 2100
LAST_OBSERVED_ODS = 2022  # the assessment's table is observed to about here, a projection after
LAST_OBSERVED = 2024      # end of the table of annual means

# SSP2-4.5, global annual mean at the surface, after Meinshausen et al. (2020); decade values typed
# from memory, good to about 1 % (CO2, N2O) and 3 % (CH4).
PATHWAY_YEARS = [2030, 2040, 2050, 2060, 2070, 2080, 2090, 2100]
PATHWAY = {
    "CO2": ("ppm", [438.0, 473.0, 507.0, 537.0, 561.0, 580.0, 594.0, 603.0]),
    "CH4": ("ppb", [1965.0, 1985.0, 1965.0, 1925.0, 1870.0, 1805.0, 1742.0, 1683.0]),
    "N2O": ("ppb", [343.5, 350.5, 356.5, 362.0, 367.0, 371.0, 374.3, 377.0]),
}
# Short-lived bromine gases, held constant: global means at the marine surface, WMO/UNEP 2018 and
# 2022, from memory.
CONSTANT = {"CH2Br2": "0.9", "CHBr3": "1.1"}
# Short-lived chlorine gases: annual means to LAST_OBSERVED, held at that year's value afterwards. They live
# months and no agreement limits them, so a later course would be a guess either way (WMO/UNEP 2022, chapter 1).
SHORT_LIVED = ("CH2Cl2", "CHCl3")

OBSERVED_ODS = "WMO 2022 baseline - observed"
PROJECTED_ODS = "WMO 2022 baseline - projection"
OBSERVED = "annual means - observed"
PROJECTED = "SSP2-4.5 - decade values from memory"
HELD = "short-lived bromine - constant from memory"
KEPT = "short-lived chlorine - 2024 value kept"

BASELINE_HEADER = """\
# title: baseline schedule of source gases 1955-2100
# quantity: mole fraction in dry air at the surface; global mean at mid-year
# unit: in each row
# source: CFCs, HCFCs, halons, CCl4, CH3CCl3, CH3Br, CH3Cl: WMO/UNEP Scientific Assessment of Ozone Depletion 2022, chapter 7 baseline; observed to about 2022, projection after
# source: CH4, N2O, CO2 to 2024: Indicators of Global Climate Change (Forster et al., Earth Syst. Sci. Data), licence CC-BY-4.0; figures unchanged
# source: CH4, N2O, CO2 after 2024: SSP2-4.5 after Meinshausen et al., Geosci. Model Dev. 13, 3571-3605, 2020
# source: CH2Cl2, CHCl3 to 2024: Indicators of Global Climate Change, as CH4; kept at the 2024 value afterwards, a choice: no agreement limits them
# source: CH2Br2, CHBr3: WMO/UNEP 2018 and 2022, chapter 1; global mean at the sea surface
# basis: tables as published; SSP2-4.5 decade values from memory, about 1 % (CO2, N2O) and 3 % (CH4); CH2Br2 and CHBr3 from memory, about 20 %
# method: between the 2020-2024 observations and the decade values a monotone cubic (Fritsch and Carlson 1980), so the join at 2024 is smooth
# made by: scripts/make_baseline_schedule.py
"""

DEMO_HEADER = """\
# title: INVENTED demonstration schedule
# quantity: mole fraction in dry air at the surface; global mean at mid-year
# unit: in each row
# warning: INVENTED. It describes no forecast, plan, country or company. It shows what a schedule looks like and what a delayed phase-out would do.
# source: the project's baseline schedule, altered by invented amounts after 2025
# basis: invented: CFC-11 and CFC-12 leak until 2045 (up to 40 and 30 ppt more, then decaying with lifetimes of 52 and 102 years); HCFC-22 phased out 10 years later; CCl4 held at its 2025 value until 2050, then decaying with a lifetime of 44 years; halon-1301 up to 0.6 ppt more
# made by: scripts/make_baseline_schedule.py
"""


def read_table(path):
    """Columns of a reference table as {name: {year: text}}."""
    with open(path, newline="", encoding="utf-8") as stream:
        rows = list(csv.DictReader(stream))
    names = [name for name in rows[0] if name != "year"]
    return {name: {int(row["year"]): row[name] for row in rows} for name in names}


def pathway_values(gas, observed):
    """{year: text} after LAST_OBSERVED along the pathway."""
    unit, values = PATHWAY[gas]
    known = list(range(LAST_OBSERVED - 4, LAST_OBSERVED + 1))
    curve = PchipInterpolator(known + PATHWAY_YEARS, [float(observed[y]) for y in known] + values)
    return {year: f"{float(curve(year)):.2f}" for year in range(LAST_OBSERVED + 1, LAST + 1)}


def baseline_rows(ods, means):
    """Rows (year, gas, kind, amount, unit, line) of the baseline, gas by gas."""
    rows = []
    years = range(FIRST, LAST + 1)
    for gas, series in ods.items():
        for year in years:
            label = OBSERVED_ODS if year <= LAST_OBSERVED_ODS else PROJECTED_ODS
            rows.append((year, gas, "abundance", series[year], "ppt", label))
    for gas, (unit, _) in PATHWAY.items():
        later = pathway_values(gas, means[gas])
        for year in years:
            observed = year <= LAST_OBSERVED
            amount = means[gas][year] if observed else later[year]
            rows.append((year, gas, "abundance", amount, unit, OBSERVED if observed else PROJECTED))
    for gas, amount in CONSTANT.items():
        rows += [(year, gas, "abundance", amount, "ppt", HELD) for year in years]
    for gas in SHORT_LIVED:
        for year in years:
            label = OBSERVED if year <= LAST_OBSERVED else KEPT
            rows.append((year, gas, "abundance", means[gas][min(year, LAST_OBSERVED)], "ppt", label))
    return rows


def leak(year, most, lifetime):
    """Invented excess: linear from 2025 to `most` in 2045, then an exponential decay."""
    if year <= 2045:
        return most * (year - 2025) / 20.0
    return most * math.exp(-(year - 2045) / lifetime)


def demo_amount(gas, year, series):
    """Invented (amount, reason) of gas in a year after 2025, or None where it is left alone."""
    value = float(series[year])
    if gas == "CFC-11":
        return value + leak(year, 40.0, 52.0), "CFC-11 leak until 2045"
    if gas == "CFC-12":
        return value + leak(year, 30.0, 102.0), "CFC-12 leak until 2045"
    if gas == "halon-1301":
        return value + leak(year, 0.6, 72.0), "halon-1301 leak until 2045"
    if gas == "HCFC-22":
        # The baseline's course from 2025, ten years late.
        return max(value, float(series[max(2025, year - 10)])), "HCFC-22 phased out ten years later"
    if gas == "CCl4":
        return max(value, float(series[2025]) * math.exp(-max(0, year - 2050) / 44.0)), "CCl4 feedstock until 2050"
    return None


def demo_rows(rows, ods):
    result = []
    for year, gas, kind, amount, unit, _ in rows:
        label = "INVENTED demo - baseline figure kept"
        changed = demo_amount(gas, year, ods[gas]) if gas in ods and year > 2025 else None
        if changed:
            amount, label = f"{changed[0]:.2f}", "INVENTED demo - " + changed[1]
        result.append((year, gas, kind, amount, unit, label))
    return result


def write(path, header, rows):
    with open(path, "w", newline="", encoding="utf-8") as stream:
        stream.write(header)
        writer = csv.writer(stream, lineterminator="\n")
        writer.writerow(["year", "gas", "kind", "amount", "unit", "line"])
        writer.writerows(rows)
    print(f"{path}: {len(rows)} rows")


def main():
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("reference", type=Path, help="folder of the reference tables")
    parser.add_argument("--output", type=Path, help="folder to write to (default: input/data)",
                        default=Path(__file__).resolve().parent.parent / "input" / "data")
    arguments = parser.parse_args()
    ods = read_table(arguments.reference / "ods-surface-abundance-1955-2100.csv")
    means = read_table(arguments.reference / "global-annual-abundance-1750-2024.csv")
    rows = baseline_rows(ods, means)
    write(arguments.output / "baseline-schedule.csv", BASELINE_HEADER, rows)
    write(arguments.output / "demo-schedule.csv", DEMO_HEADER, demo_rows(rows, ods))


if __name__ == "__main__":
    main()

"""Figures of Skymend files: each function draws one kind for one or more cases and gives a matplotlib figure."""

import textwrap

import matplotlib.pyplot as plt
import numpy as np
from matplotlib.lines import Line2D
from matplotlib.ticker import FuncFormatter, LogLocator, NullFormatter
from skymend_fields import draw_change, figure_anomaly, figure_ozone
from skymend_files import Wrong, interval_edges, return_year, year_mean
from skymend_sheet import (BEHIND, BLACK, BLUE, CASE_STYLES, CAUTION, COLOURS, FAMILY_COLOURS, GREY, SMALL, WIDTH,
                           Sheet, key_above, key_of_sheet, power_of_ten, short, subscripts, years_axis)

# ---- series against a benchmark ----


def benchmark_facts(case, values, year, falls):
    """(benchmark or None, index of the extreme, year of return or None, what to say where there is none)."""
    known = np.where(np.isfinite(values), values, np.inf if falls else -np.inf)
    extreme = int(np.argmin(known) if falls else np.argmax(known))
    benchmark = year_mean(case.time, values, year)
    if benchmark is None or not np.isfinite(benchmark):
        return None, extreme, None, f"{year} is not covered: no benchmark"
    back = return_year(case.time, known, year, benchmark, falls)
    after = known[case.time >= year + 1]
    beyond = after < benchmark if falls else after > benchmark
    word = "below" if falls else "above"
    note = f"no return to {year} in the file" if beyond.any() else f"never {word} {year} afterwards"
    return benchmark, extreme, back, note if back is None else ""


def draw_series(sheet, axes, name, year, falls, form, unit, key=True, names=True):
    """A series of every case, its benchmark and its return."""
    drawn, handles = [], []
    for i, (case, (colour, style)) in enumerate(zip(sheet.cases, CASE_STYLES)):
        values = case.series_or_wrong(name)
        axes.plot(case.time, values, color=colour, linestyle=style)
        benchmark, extreme, back, note = benchmark_facts(case, values, year, falls)
        axes.plot(case.time[extreme], values[extreme], "v" if falls else "^", color=colour, markersize=5)
        said = f"{short(case.label)}: {'lowest' if falls else 'highest'} {values[extreme]:{form}}{unit} in " \
               f"{case.time[extreme]:.1f}; " + (note or f"back in {back:.1f}")
        handles.append(Line2D([], [], color=colour, linestyle=style, label=said))
        if benchmark is not None and not any(abs(benchmark - other) < 1.5e-4 * abs(other) for other in drawn):
            axes.axhline(benchmark, color=GREY if not drawn else colour, linestyle=(0, (2, 2)), linewidth=1.0)
            # at the extreme the curve is on the other side of its benchmark
            axes.annotate(f"{year}: {benchmark:{form}}{unit}", (case.time[extreme], benchmark),
                          xytext=(75 * len(drawn), 2 if falls else -2), textcoords="offset points", fontsize=SMALL,
                          color=colour if drawn else GREY, ha="center", va="bottom" if falls else "top",
                          bbox=BEHIND)
            drawn.append(benchmark)
        if back is not None:
            axes.axvline(back, color=colour, linestyle=style, linewidth=0.7, zorder=1)
            axes.plot(back, benchmark, "o", color=colour, markersize=5, markeredgecolor="white")
            axes.annotate(f"{back:.1f}", (back, 0 if falls else 1), xycoords=("data", "axes fraction"),
                          xytext=(2, 3 + 9 * i if falls else -9 - 9 * i), textcoords="offset points", fontsize=SMALL,
                          color=colour, bbox=BEHIND)
        if names and len(sheet.cases) > 1:
            sheet.name_end(axes, case.time[-1], values[-1], short(case.label, 24), colour)
    axes.margins(y=0.12)
    axes.ticklabel_format(axis="y", useOffset=False)
    years_axis(axes, sheet.cases)
    if key:
        key_above(axes, handles, handlelength=3.5)


def panel_column(sheet, axes, year, names=True):
    draw_series(sheet, axes, "ozone_column", year, True, ".2f", " DU", names=names)
    axes.set_ylabel("ozone column / DU")


def figure_column(cases, year):
    """The ozone column with its benchmark and year of return."""
    sheet = Sheet(cases, 4.2 + 0.15 * len(cases))
    panel_column(sheet, sheet.figure.subplots(), year)
    return sheet.finish()


# ---- source gases and equivalent chlorine ----


def atoms(formula, element):
    """Whether a formula has an element: Cl is no C, Br no B."""
    at = formula.find(element)
    while at >= 0:
        if not formula[at + len(element):at + len(element) + 1].islower():
            return True
        at = formula.find(element, at + 1)
    return False


def gas_group(gas):
    """The panel of a gas, its unit and its factor."""
    if atoms(gas.formula, "Br"):
        return "bromine gases", "ppt", 1e12
    if atoms(gas.formula, "Cl"):
        return "chlorine gases " + ("with hydrogen" if atoms(gas.formula, "H") else "without hydrogen"), "ppt", 1e12
    if gas.name == "CO2":
        return gas.name, "ppm", 1e6
    return gas.name, "ppb", 1e9


def panels_of(cases):
    """Group -> gases by name of the first case that has them, with unit and factor."""
    groups = {}
    for case in cases:
        for gas in case.gases:
            group, unit, factor = gas_group(gas)
            groups.setdefault(group, (unit, factor, []))[2].append(gas.name)
    for group, (unit, factor, names) in groups.items():
        groups[group] = (unit, factor, list(dict.fromkeys(names)))
    order = ("chlorine gases without hydrogen", "chlorine gases with hydrogen", "bromine gases", "N2O", "CH4")
    return {group: groups[group] for group in sorted(groups, key=lambda g: order.index(g) if g in order else 9)}


def draw_gases(sheet, axes, names, values_of):
    """Curves of gases, colour by gas, style by case, named at the end."""
    for i, name in enumerate(names):
        colour = COLOURS[i % len(COLOURS)]
        named = False
        for case, (_, style) in zip(sheet.cases, CASE_STYLES):
            for gas in case.gases:
                if gas.name != name:
                    continue
                values = values_of(gas)
                axes.plot(case.time, values, color=colour, linestyle=style, linewidth=1.3)
                if not named:
                    sheet.name_end(axes, case.time[-1], values[-1], subscripts(name), colour)
                    named = True
    axes.set_ylim(bottom=min(0.0, axes.get_ylim()[0]))
    axes.ticklabel_format(axis="y", useOffset=False, style="plain")


def panel_chlorine(sheet, axes, year, label=True):
    """Equivalent chlorine for both ages of air, pale where the file does not reach back far enough."""
    for case, (colour, style) in zip(sheet.cases, CASE_STYLES):
        for i, (age, name) in enumerate((("3", "equivalent_chlorine_3yr"), ("5.5", "equivalent_chlorine_55yr"))):
            values = case.series_or_wrong(name)
            known = case.series_or_wrong(name + "_known") >= 0.99
            axes.plot(case.time, values, color=colour, linestyle=style, alpha=0.35)
            axes.plot(case.time, np.where(known, values, np.nan), color=colour, linestyle=style)
            benchmark, _, back, _ = benchmark_facts(case, values, year, False)
            if benchmark is not None and case is sheet.cases[0]:
                axes.axhline(benchmark, color=GREY, linestyle=(0, (2, 2)), linewidth=0.8)
            if back is not None:
                axes.plot(back, benchmark, "o", color=colour, markersize=5, markeredgecolor="white")
                axes.annotate(f"{back:.1f}", (back, benchmark), xytext=(0, 4 + 9 * sheet.cases.index(case)),
                              textcoords="offset points", fontsize=SMALL, color=colour, bbox=BEHIND,
                              ha="center" if i == 0 else "left")
            if case is sheet.cases[0]:
                sheet.name_end(axes, case.time[-1], values[-1], f"{age} years", BLACK)
    axes.set_ylim(bottom=0.0)
    axes.set_ylabel("equivalent chlorine / ppt")
    axes.set_title("equivalent chlorine by age of air")
    years_axis(axes, sheet.cases, label)


def figure_gases(cases, year):
    """Source gases in the lowest layer and equivalent chlorine."""
    groups = panels_of(cases)
    if not groups:
        raise Wrong(f"{cases[0].path} has no source gases with emissions; run skymend project anew")
    chlorine = all("equivalent_chlorine_3yr" in case.series for case in cases)
    count = len(groups) + chlorine
    rows = (count + 1) // 2
    sheet = Sheet(cases, 0.9 + 2.25 * rows)
    axes = list(sheet.figure.subplots(rows, 2, squeeze=False).flat)
    for spare in axes[count:]:
        spare.set_axis_off()
    if chlorine:
        panel_chlorine(sheet, axes[0], year, False)
    for place, (group, (unit, factor, names)) in zip(axes[chlorine:], groups.items()):
        draw_gases(sheet, place, names, lambda gas, factor=factor: factor * gas.surface)
        if len(names) == 1:
            place.set_ylim(auto=True)
            place.relim()
            place.autoscale(axis="y")
        place.set_title(subscripts(group))
        place.set_ylabel(f"mole fraction / {unit}")
        years_axis(place, cases, place in axes[-2:])
    key_of_sheet(sheet)
    return sheet.finish()


# ---- ultraviolet ----


def light_title(case):
    sun = case.ultraviolet
    if not sun:
        return ""
    side = "north" if sun["latitude_deg"] >= 0 else "south"
    return f"clear sky, {abs(sun['latitude_deg']):g}° {side}, day {sun['day_of_year']:g} of the year, " \
           f"surface albedo {sun['surface_albedo']:g}"


def figure_ultraviolet(cases, year):
    """UV index at noon and erythemal dose of the day."""
    sheet = Sheet(cases, 6.0 + 0.3 * len(cases), light=True)
    upper, lower = sheet.figure.subplots(2, 1)
    draw_series(sheet, upper, "uv_index_noon", year, False, ".3f", "")
    upper.set_ylabel("UV index at noon")
    draw_series(sheet, lower, "erythemal_daily_dose", year, False, ".0f", " J m⁻²")
    lower.set_ylabel("erythemal dose of a day / J m⁻²")
    suns = list(dict.fromkeys(light_title(case) for case in cases))
    sheet.figure.suptitle("Ultraviolet at the ground: " + " | ".join(suns), fontsize=8.5, x=0.01, ha="left")
    return sheet.finish()


# ---- loss of odd oxygen by family ----


def draw_loss(sheet, axes, year, share):
    for case, (_, style) in zip(sheet.cases, CASE_STYLES):
        if not case.loss:
            raise Wrong(f"{case.path} has no loss of odd oxygen by family")
        profiles = {family: year_mean(case.time, values, year) for family, values in case.loss.items()}
        if any(profile is None for profile in profiles.values()):
            raise Wrong(f"{case.path}: no loss by family for {year}: the file does not cover that year; "
                        "name another with --year")
        total = sum(profiles.values())
        for family, profile in profiles.items():
            values = 100.0 * profile / total if share else profile
            axes.plot(values, case.middles, color=FAMILY_COLOURS[family], linestyle=style, linewidth=1.4)
        if not share:
            axes.plot(total, case.middles, color="0.6", linestyle=style, linewidth=1.0)
    if share:
        axes.set_xlim(0, 100)
        axes.set_xlabel("share of the catalytic loss / %")
    else:
        axes.set_xscale("log")
        largest = max(sum(case.loss.values()).max() for case in sheet.cases)
        axes.set_xlim(largest * 1e-5, largest * 2)
        axes.xaxis.set_major_locator(LogLocator(numticks=12))
        axes.xaxis.set_major_formatter(FuncFormatter(power_of_ten))
        axes.xaxis.set_minor_formatter(NullFormatter())
        axes.set_xlabel("loss of odd oxygen / cm⁻³ s⁻¹")
    axes.set_ylim(0, min(70.0, max(case.edges[-1] for case in sheet.cases)))
    axes.set_ylabel("altitude / km")


def name_families(axes, case, year):
    """Each family named where its share is largest."""
    profiles = {family: year_mean(case.time, values, year) for family, values in case.loss.items()}
    total = sum(profiles.values())
    top = axes.get_ylim()[1]
    for family, profile in profiles.items():
        share = np.where((case.middles > 0.1 * top) & (case.middles < 0.93 * top), 100.0 * profile / total, -1.0)
        at = int(np.argmax(share))
        right = share[at] < 85.0  # there is room to the right of the curve
        axes.annotate(family, (share[at], case.middles[at]), xytext=(3 if right else -4, 0),
                      textcoords="offset points", ha="left" if right else "right", va="center", fontsize=8,
                      fontweight="bold", color=FAMILY_COLOURS[family], bbox=BEHIND)


def panels_loss(sheet, left, right, year):
    """Rates on the left, shares with their names on the right, a key above."""
    draw_loss(sheet, left, year, False)
    draw_loss(sheet, right, year, True)
    name_families(right, sheet.cases[0], year)
    handles = [Line2D([], [], color=colour, label=family) for family, colour in FAMILY_COLOURS.items()]
    key_above(right, handles + [Line2D([], [], color="0.6", label="all")], ncols=6, fontsize=SMALL,
              handlelength=1.1, columnspacing=0.8, handletextpad=0.4)
    left.set_title(f"loss of odd oxygen by family, {year}")


def figure_loss(cases, year):
    """Loss of odd oxygen by catalytic family against altitude, in one year: rates and shares."""
    sheet = Sheet(cases, 4.6 + 0.15 * len(cases))
    left, right = sheet.figure.subplots(1, 2, sharey=True)
    panels_loss(sheet, left, right, year)
    right.set_ylabel("")
    key_of_sheet(sheet)
    return sheet.finish()


# ---- emissions ----


def line_groups(cases):
    """(gas, mass of) -> labels, in the order of the files."""
    groups = {}
    for case in cases:
        for line in case.lines:
            groups.setdefault((line.gas, line.mass_of), []).append(line.label)
    return {key: list(dict.fromkeys(labels)) for key, labels in groups.items()}


def draw_steps(axes, case, values, **how):
    """Means of intervals as what they are, from their beginnings to their ends."""
    axes.stairs(values, interval_edges(case), baseline=None, **how)


def draw_lines(sheet, axes, gas, mass_of, labels):
    for i, label in enumerate(labels):
        named = False
        for case, (_, style) in zip(sheet.cases, CASE_STYLES):
            for line in case.lines:
                if (line.gas, line.mass_of, line.label) != (gas, mass_of, label):
                    continue
                colour = COLOURS[i % len(COLOURS)]
                given = np.flatnonzero(line.emission > 0.0)
                if not given.size:
                    continue
                shown = line.emission.copy()
                shown[:given[0]] = shown[given[-1] + 2:] = np.nan  # the zeros outside hide other lines
                draw_steps(axes, case, shown, color=colour, linestyle=style, linewidth=1.4, zorder=3)
                if not named:
                    sheet.name_end(axes, case.bounds[given[-1], 1], line.emission[given[-1]], short(label, 36), colour)
                    named = True
    if gas == mass_of:
        for case, (_, style) in zip(sheet.cases, CASE_STYLES):
            for found in (g for g in case.gases if g.name == gas):
                draw_steps(axes, case, found.emission, color="0.6", linestyle=style, linewidth=1.0, zorder=1)
    axes.set_ylabel(f"{subscripts(gas)} / Gg {'' if gas == mass_of else mass_of + ' '}per year")
    axes.set_ylim(bottom=min(0.0, axes.get_ylim()[0]))


def figure_emissions(cases, _year):
    """The lines of the schedule by gas; where there are none, the emissions that keep the abundances."""
    groups = line_groups(cases)
    if not groups:
        return figure_implied(cases)
    sheet = Sheet(cases, 0.9 + 2.4 * len(groups))
    axes = np.atleast_1d(sheet.figure.subplots(len(groups), 1, sharex=True))
    for place, ((gas, mass_of), labels) in zip(axes, groups.items()):
        draw_lines(sheet, place, gas, mass_of, labels)
    axes[0].set_title("emissions by line; grey: the whole gas, and what keeps the abundance where that is given")
    years_axis(axes[-1], cases)
    key_of_sheet(sheet)
    return sheet.finish()


def figure_implied(cases):
    groups = {group: facts for group, facts in panels_of(cases).items() if len(facts[2]) > 1}
    if not groups:
        raise Wrong(f"{cases[0].path} has neither lines of emission nor chlorine or bromine gases")
    sheet = Sheet(cases, 0.9 + 2.4 * len(groups))
    axes = np.atleast_1d(sheet.figure.subplots(len(groups), 1, sharex=True))
    for place, (group, (_, _, names)) in zip(axes, groups.items()):
        draw_gases(sheet, place, names, lambda gas: gas.emission)
        place.set_ylabel("emission / Gg per year")
        place.set_title(group + ": emission that keeps the abundance given")
    years_axis(axes[-1], cases)
    key_of_sheet(sheet)
    return sheet.finish()


# ---- a page ----


def telling_year(cases, benchmark_year):
    """The calendar year in which the columns of the first two cases differ most; of one case alone, or where they do
    not, that of the lowest column after the benchmark year."""
    case = cases[0]
    if len(cases) > 1:
        both, mine, other = np.intersect1d(np.round(case.time, 6), np.round(cases[1].time, 6), return_indices=True)
        apart = np.abs(case.column[mine] - cases[1].column[other])
        if both.size and apart.max() > 0.0:
            return int(both[np.argmax(apart)])
    after = np.flatnonzero(case.time >= benchmark_year + 1)
    after = after if after.size else np.arange(case.time.size)
    return int(case.time[after[np.argmin(case.column[after])]])


def panel_light(sheet, axes, year):
    draw_series(sheet, axes, "uv_index_noon", year, False, ".2f", "", key=False, names=False)
    axes.set_ylabel("UV index at noon")
    axes.margins(y=0.2)
    axes.set_title(light_title(sheet.cases[0]).replace(" of the year", ""), fontsize=SMALL).set_in_layout(False)


def figure_page(cases, year, loss_year):
    """One page: column, change by altitude and time, and what the files have of equivalent chlorine (finished runs
    only), ultraviolet and loss by family."""
    light = all("uv_index_noon" in case.series for case in cases)
    small = [panel_chlorine] * all("equivalent_chlorine_3yr" in case.series for case in cases) + [panel_light] * light
    loss = all(case.loss and all(year_mean(case.time, values, loss_year) is not None for values in case.loss.values())
               for case in cases)
    heights = [3.0, 2.6] + [2.5] * bool(small) + [3.2] * loss
    sheet = Sheet(cases, 0.9 * sum(heights), light=light)
    grid = sheet.figure.add_gridspec(len(heights), 2, height_ratios=heights)
    panel_column(sheet, sheet.figure.add_subplot(grid[0, :]), year, names=False)
    draw_change(sheet, sheet.figure.add_subplot(grid[1, :]), year)
    for i, panel in enumerate(small):
        panel(sheet, sheet.figure.add_subplot(grid[2, i] if len(small) == 2 else grid[2, :]), year)
    if loss:
        panels_loss(sheet, sheet.figure.add_subplot(grid[-1, 0]), sheet.figure.add_subplot(grid[-1, 1]), loss_year)
    return sheet.finish()


# ---- a bar chart of what lines cost ----


def figure_bars(names, values, errors, label, source):
    """Horizontal bars, largest at the top, with errors where they are known (NaN: not)."""
    height = 1.0 + 0.34 * len(names)
    figure = plt.figure(figsize=(WIDTH, height))
    axes = figure.subplots()
    place = np.arange(len(names))[::-1]
    axes.barh(place, values, color=BLUE, height=0.62, edgecolor="black", linewidth=0.5)
    known = np.isfinite(errors)
    axes.errorbar(np.array(values)[known], place[known], xerr=np.array(errors)[known], fmt="none", ecolor="black",
                  capsize=2.5, elinewidth=1.0)
    reach = max(max(abs(v) for v in values), 1e-30)
    for y, value, error in zip(place, values, np.where(known, errors, 0.0)):
        axes.annotate(f"{value:.3g}", (max(value + error, 0.0) + 0.015 * reach, y), fontsize=8, va="center",
                      bbox=BEHIND)
    axes.set_yticks(place, [short(name, 48) for name in names])
    axes.set_xlabel(label)
    axes.axvline(0.0, color="black", linewidth=0.8)
    axes.margins(x=0.12)
    axes.grid(axis="y", visible=False)
    figure.supxlabel("\n".join(textwrap.wrap(f"Source: {source}. {CAUTION}", int(21 * WIDTH))), fontsize=6.3,
                     color=GREY, x=0.01, ha="left")
    return figure


FIGURES = {"column": figure_column, "ozone": figure_ozone, "anomaly": figure_anomaly, "gases": figure_gases,
           "ultraviolet": figure_ultraviolet, "loss": figure_loss, "emissions": figure_emissions}


def draw(kind, cases, year, loss_year=None, quantity="density"):
    """The figure of a kind; "page" is all on one. Wrong where the files do not have it."""
    loss_year = loss_year if loss_year is not None else telling_year(cases, year)
    if kind == "page":
        return figure_page(cases, year, loss_year)
    if kind == "loss":
        return figure_loss(cases, loss_year)
    if kind == "ozone":
        return figure_ozone(cases, year, quantity)
    return FIGURES[kind](cases, year)

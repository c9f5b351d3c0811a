"""Figures of Skymend files: each function draws one kind for one or more cases and gives a matplotlib figure.

A case has a line style of its own besides its colour, and curves are named at their ends, so that nothing hangs on
colour alone. Colours: Okabe and Ito (2008), a palette that colour-blind readers can tell apart; cividis (Nunez et
al. 2018, PLoS ONE 13, e0199239) was made for the same purpose; PuOr is a diverging scheme of Brewer's safe for them.
"""

import io
import textwrap

import matplotlib

matplotlib.use("Agg")
import matplotlib.pyplot as plt
import numpy as np
from matplotlib import patheffects
from matplotlib.lines import Line2D
from matplotlib.ticker import FuncFormatter, LogLocator, MaxNLocator, NullFormatter
from skymend_files import FAMILIES, Wrong, interval_edges, return_year, year_mean

BLACK, ORANGE, SKY, GREEN = "#000000", "#E69F00", "#56B4E9", "#009E73"
BLUE, VERMILLION, PURPLE = "#0072B2", "#D55E00", "#CC79A7"
COLOURS = (BLUE, VERMILLION, GREEN, PURPLE, BLACK, ORANGE, SKY)
FAMILY_COLOURS = dict(zip(FAMILIES, (BLACK, SKY, VERMILLION, GREEN, PURPLE)))
FIELD_COLOURS, CHANGE_COLOURS = "cividis", "PuOr"
CASE_STYLES = ((BLUE, "-"), (VERMILLION, (0, (5, 2))), (GREEN, (0, (5, 1.5, 1, 1.5))), (PURPLE, (0, (1, 1.2))),
               (BLACK, (0, (8, 2, 1, 2, 1, 2))), (ORANGE, (0, (2, 2))))
MOST_CASES = len(CASE_STYLES)
GREY = "0.35"
SMALL = 7.0
WIDTH = 7.1  # inches, the type area of A4

# Titles are text, not formulas: a dollar sign in a case's title is one. Text stays text in SVG and PDF.
STYLE = {
    "font.family": "sans-serif", "font.sans-serif": ["DejaVu Sans"], "font.size": 8.5, "text.parse_math": False,
    "axes.titlesize": 9, "axes.titlelocation": "left", "axes.labelsize": 8.5, "axes.spines.top": False,
    "axes.spines.right": False, "axes.linewidth": 0.8, "axes.axisbelow": True, "axes.grid": True,
    "grid.color": "0.88", "grid.linewidth": 0.5, "legend.fontsize": 8, "legend.frameon": False,
    "lines.linewidth": 1.6, "lines.solid_capstyle": "butt", "xtick.labelsize": 8, "ytick.labelsize": 8,
    "svg.fonttype": "none", "svg.hashsalt": "skymend", "pdf.fonttype": 42, "figure.constrained_layout.use": True,
}
HALO = [patheffects.withStroke(linewidth=2.0, foreground="white")]
# behind text: a halo would make outlines of it, which nobody can search, hear or copy
BEHIND = {"facecolor": "white", "alpha": 0.75, "edgecolor": "none", "pad": 0.5}

CAUTION = ("One near-global column without polar winter, ozone hole or change of circulation; a planning figure. "
           "Defer to the competent authority.")
CAUTION_LIGHT = "Clear sky, level ground at sea level; no guide to personal exposure. "


def short(text, most=44):
    """Text cut to what a figure has room for."""
    return text if len(text) <= most else text[:most - 1].rstrip() + "…"


def subscripts(name):
    """A name that is a formula with its digits set low; CFC-11 is none."""
    return name if "-" in name or " " in name else name.translate(str.maketrans("0123456789", "₀₁₂₃₄₅₆₇₈₉"))


def power_of_ten(value, _position=None):
    """A tick of a logarithmic axis."""
    return "10" + str(round(np.log10(value))).translate(str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹"))


# ---- names at the ends of curves ----


def spread(wanted, gap, low, high):
    """Places in ascending order at least gap apart, as near to the wanted ones (ascending) as can be, least squares:
    pool adjacent violators; shifted into low..high as far as they fit."""
    pools = []  # [sum, count] of wanted less index * gap
    for i, place in enumerate(wanted):
        pools.append([place - i * gap, 1])
        while len(pools) > 1 and pools[-2][0] / pools[-2][1] > pools[-1][0] / pools[-1][1]:
            total, count = pools.pop()
            pools[-1][0] += total
            pools[-1][1] += count
    bases = [total / count for total, count in pools for _ in range(count)]
    room = max(high - gap * (len(wanted) - 1), low)
    return [min(max(base, low), room) + i * gap for i, base in enumerate(bases)]


class Sheet:
    """A figure under way: what is named at the end of which axes, and the lines at its foot."""

    def __init__(self, cases, height, width=WIDTH, light=False):
        if len(cases) > MOST_CASES:
            raise Wrong(f"{len(cases)} files are too many to tell apart in one figure; give {MOST_CASES} at most")
        self.figure = plt.figure(figsize=(width, height))
        self.cases, self.light, self.ends = cases, light, []

    def name_end(self, axes, x, y, text, colour):
        """Name a curve at its right end."""
        if np.isfinite(x) and np.isfinite(y):
            self.ends.append((axes, x, y, text, colour))

    def foot(self, width):
        names = ", ".join(dict.fromkeys(case.path.rsplit("/", 1)[-1] for case in self.cases))
        tools = ", ".join(dict.fromkeys(case.source for case in self.cases))
        text = f"Source: {tools}; {names}. Sources of the input: attribute “references” of the file. "
        text += (CAUTION_LIGHT if self.light else "") + CAUTION
        return "\n".join(textwrap.wrap(text, int(width * 21)))

    def finish(self):
        """Put the names where none covers another; the limits of the axes stay as they are from here on."""
        figure = self.figure
        figure.supxlabel(self.foot(figure.get_figwidth()), fontsize=6.3, color=GREY, x=0.01, ha="left")
        texts = {}
        for axes, x, y, text, colour in self.ends:
            axes.set_ylim(axes.get_ylim())
            texts.setdefault(axes, []).append((axes.annotate(
                text, (x, y), xytext=(1.03, y), textcoords=("axes fraction", "data"), fontsize=SMALL, color=colour,
                va="center", annotation_clip=False,
                arrowprops={"arrowstyle": "-", "linewidth": 0.5, "color": colour, "shrinkA": 0, "shrinkB": 0,
                            "relpos": (0, 0.5)}), y))
        figure.get_layout_engine().set(rect=(0, 0, 0.985, 1))
        figure.draw_without_rendering()
        for axes, named in texts.items():
            gap = 1.18 * SMALL * figure.dpi / 72
            place = [(axes.transData.transform((1, y))[1], text) for text, y in named]
            place.sort(key=lambda entry: entry[0])
            box = axes.bbox
            for (_, text), at in zip(place, spread([p for p, _ in place], gap, box.y0, box.y1)):
                text.xyann = (1.03, axes.transData.inverted().transform((box.x0, at))[1])
        return figure


def key_above(axes, handles, **options):
    """A legend above the axes. Its height is kept free by an empty title, and its width left out of the layout, which
    would else make the axes narrower."""
    rows = -(-len(handles) // options.get("ncols", 1))
    axes.set_title("\n".join([" "] * rows), fontsize=10)
    axes.legend(handles=handles, loc="lower left", bbox_to_anchor=(0, 1.0), borderaxespad=0.1,
                **options).set_in_layout(False)


def key_of_sheet(sheet):
    """The line styles of the cases, at the head of the figure, where there is more than one."""
    if len(sheet.cases) > 1:
        handles = [Line2D([], [], color=BLACK, linestyle=style, label=short(case.label, 90))
                   for case, (_, style) in zip(sheet.cases, CASE_STYLES)]
        sheet.figure.legend(handles=handles, loc="upper left", handlelength=3.5).set_in_layout(False)
        sheet.figure.suptitle("\n".join([" "] * len(handles)), fontsize=11.5)  # keeps its height free


def years_axis(axes, cases, label=True):
    axes.set_xlim(min(case.bounds[0, 0] for case in cases), max(case.bounds[-1, 1] for case in cases))
    axes.xaxis.set_major_locator(MaxNLocator(8, steps=(1, 2, 5, 10), integer=True))
    if label:
        axes.set_xlabel("year")


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


# ---- fields by altitude and time ----


def contours(axes, case, values, low, high):
    """Lines of equal value, so that a field can be read without its colours."""
    levels = [level for level in MaxNLocator(9).tick_values(low, high) if values.min() < level < values.max()]
    if not levels:
        return
    lines = axes.contour(case.time, case.middles, values.T, levels=levels, colors="black", linewidths=0.6)
    for collection in getattr(lines, "collections", [lines]):  # one artist from matplotlib 3.8 on
        collection.set_path_effects(HALO)
    for text in axes.clabel(lines, fmt="%g", fontsize=SMALL):
        text.set_bbox(BEHIND)


def draw_field(axes, case, values, colours, low, high):
    mesh = axes.pcolormesh(interval_edges(case), case.edges, values.T, cmap=colours, vmin=low, vmax=high,
                           rasterized=True)
    contours(axes, case, values, low, high)
    axes.set_ylabel("altitude / km")
    axes.set_ylim(case.edges[0], case.edges[-1])
    axes.grid(False)
    return mesh


def change(case, year):
    """Ozone against the mean of a year, %, [records][layers]."""
    before = year_mean(case.time, case.fraction, year)
    if before is None:
        raise Wrong(f"{case.path}: no change against {year}: the file does not cover that year; "
                    "name another with --benchmark")
    if not (before > 0.0).all():
        raise Wrong(f"{case.path}: no change against {year}: ozone is not positive everywhere")
    return 100.0 * (case.fraction / before - 1.0)


def difference(case, reference):
    """Ozone of a case less that of a reference, % of it, over the records both have; the case cut to these."""
    if not (np.array_equal(case.edges, reference.edges)):
        return None
    both, mine, other = np.intersect1d(np.round(case.time, 6), np.round(reference.time, 6), return_indices=True)
    if both.size < 2 or (np.diff(mine) != 1).any():
        return None
    return mine, 100.0 * (case.fraction[mine] / reference.fraction[other] - 1.0)


def cut(case, records):
    """A case with some of its records, for drawing a field."""
    part = type("Part", (), {})()
    part.time, part.bounds, part.edges, part.middles = (case.time[records], case.bounds[records], case.edges,
                                                        case.middles)
    return part


def figure_anomaly(cases, year):
    """Ozone by altitude and time as change against the benchmark year; of two cases also their difference."""
    changes = [change(case, year) for case in cases]
    differ = difference(cases[0], cases[1]) if len(cases) == 2 else None
    panels = len(cases) + (differ is not None)
    sheet = Sheet(cases, 0.7 + 2.7 * panels)
    axes = np.atleast_1d(sheet.figure.subplots(panels, 1, sharex=True))
    most = max(np.abs(values).max() for values in changes) or 1.0
    for place, case, values in zip(axes, cases, changes):
        mesh = draw_field(place, case, values, CHANGE_COLOURS, -most, most)
        place.set_title(short(case.label, 80))
    sheet.figure.colorbar(mesh, ax=list(axes[:len(cases)]), label=f"O₃ change against {year} / %", pad=0.01)
    if differ is not None:
        records, values = differ
        most = np.abs(values).max() or 1.0
        mesh = draw_field(axes[-1], cut(cases[0], records), values, CHANGE_COLOURS, -most, most)
        axes[-1].set_title("difference: " + short(f"{cases[0].label} less {cases[1].label}", 90))
        sheet.figure.colorbar(mesh, ax=axes[-1], label="O₃ difference / %", pad=0.01)
    years_axis(axes[-1], cases)
    return sheet.finish()


def figure_ozone(cases, _year, quantity="density"):
    """Ozone by altitude and time, as number density or mole fraction."""
    sheet = Sheet(cases, 0.7 + 2.9 * len(cases))
    axes = np.atleast_1d(sheet.figure.subplots(len(cases), 1, sharex=True))
    if quantity == "density":
        fields = [case.fraction * case.air / 1e12 for case in cases]
        label = "O₃ number density / 10¹² cm⁻³"
    else:
        fields = [case.fraction * 1e6 for case in cases]
        label = "O₃ mole fraction / 10⁻⁶ mol mol⁻¹"
    most = max(values.max() for values in fields)
    for place, case, values in zip(axes, cases, fields):
        mesh = draw_field(place, case, values, FIELD_COLOURS, 0.0, most)
        place.set_title(short(case.label, 80))
    sheet.figure.colorbar(mesh, ax=list(axes), label=label, pad=0.01)
    years_axis(axes[-1], cases)
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


def draw_change(sheet, axes, year):
    """Of two cases the difference of their ozone, else the change of the first against the benchmark year; where the file
    does not cover that, ozone itself."""
    case = sheet.cases[0]
    differ = difference(*sheet.cases) if len(sheet.cases) == 2 else None
    colours, low = CHANGE_COLOURS, None
    if differ is not None:
        values, part = differ[1], cut(case, differ[0])
        title, label = f"O₃: {short(case.label, 40)} less {short(sheet.cases[1].label, 40)}", "difference / %"
    elif year_mean(case.time, case.fraction, year) is not None:
        values, part = change(case, year), case
        title, label = f"O₃: {short(case.label, 70)}", f"change against {year} / %"
    else:
        values, part = case.fraction * case.air / 1e12, case
        title, label = f"O₃: {short(case.label, 70)}", "number density / 10¹² cm⁻³"
        colours, low = FIELD_COLOURS, 0.0
    most = np.abs(values).max() or 1.0
    mesh = draw_field(axes, part, values, colours, -most if low is None else low, most)
    sheet.figure.colorbar(mesh, ax=axes, label=label, pad=0.01)
    axes.set_title(title).set_in_layout(False)
    years_axis(axes, sheet.cases, False)


def panel_light(sheet, axes, year):
    draw_series(sheet, axes, "uv_index_noon", year, False, ".2f", "", key=False, names=False)
    axes.set_ylabel("UV index at noon")
    axes.margins(y=0.2)
    axes.set_title(light_title(sheet.cases[0]).replace(" of the year", ""), fontsize=SMALL).set_in_layout(False)


def figure_page(cases, year, loss_year):
    """One page: column, change by altitude and time, and what the files have of equivalent chlorine (finished runs only),
    ultraviolet and loss by family."""
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


def picture(figure, form, title, dpi=200):
    """The bytes of a figure in a form (png, svg, pdf), without a date, so that they repeat."""
    stream = io.BytesIO()
    keep = {"png": {"Title": title}, "svg": {"Title": title, "Date": None, "Creator": "Skymend"},
            "pdf": {"Title": title, "CreationDate": None}}[form]
    figure.savefig(stream, format=form, dpi=dpi, metadata=keep)
    plt.close(figure)
    return stream.getvalue()

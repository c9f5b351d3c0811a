#!/usr/bin/python3
"""Plot a Skymend file: ozone by altitude and time above, the ozone column with its benchmark below.

usage: plot_column.py FILE.nc -o FILE.png [--benchmark 1980] [--quantity density|fraction|change]

The return year is found as `skymend answers` finds it: the benchmark is the mean of the intervals of the
benchmark year, and the return is the first upward crossing, linear between intervals, after the lowest interval
that follows that year. Exit code 2: the file or the request is wrong; 4: the picture could not be written.
"""

import argparse
import sys

import matplotlib

matplotlib.use("Agg")
import matplotlib.pyplot as plt
import netCDF4
import numpy as np
from matplotlib import patheffects
from matplotlib.ticker import MaxNLocator

# Okabe and Ito (2008), a palette that colour-blind readers can tell apart; cividis (Nunez et al. 2018, PLoS ONE 13,
# e0199239) was made for the same purpose; PuOr is a diverging scheme of Brewer's that is safe for them.
BLUE, VERMILLION, GREEN = "#0072B2", "#D55E00", "#009E73"
FIELD_COLOURS, CHANGE_COLOURS = "cividis", "PuOr"


class Wrong(Exception):
    """The file or the request is wrong; the text says how."""


def decimal_years(time):
    """Dates of a time variable as year plus the fraction of that calendar year that has passed."""
    calendar = getattr(time, "calendar", "standard")
    days = netCDF4.num2date(time[:], time.units, calendar, only_use_cftime_datetimes=True)
    result = []
    for date in days:
        start = date.replace(month=1, day=1, hour=0, minute=0, second=0, microsecond=0)
        end = start.replace(year=date.year + 1)
        result.append(date.year + (date - start).total_seconds() / (end - start).total_seconds())
    return np.array(result)


def read(path):
    """The series and fields of a file, masked values refused."""
    try:
        data = netCDF4.Dataset(path)
    except OSError as error:
        raise Wrong(f"{path}: {error.strerror or error}") from error
    with data:
        for name in ("time", "time_bnds", "altitude", "altitude_bnds", "O3", "air_number_density", "ozone_column"):
            if name not in data.variables:
                raise Wrong(f"{path} has no variable {name}: is it a Skymend file?")
        if data["ozone_column"].units != "DU" or data["altitude"].units != "km":
            raise Wrong(f"{path}: ozone_column in DU and altitude in km are wanted")
        time = decimal_years(data["time"])
        if time.size < 2:
            raise Wrong(f"{path} holds {time.size} records; a plot needs two")
        layers = data["altitude_bnds"][:]
        columns = {
            "time": time,
            "column": data["ozone_column"][:],
            "edges": np.append(layers[:, 0], layers[-1, 1]),
            "middles": data["altitude"][:],
            "fraction": data["O3"][:],
            "air": data["air_number_density"][:],
        }
        for name, values in columns.items():
            if np.ma.is_masked(values) or not np.isfinite(values).all():
                raise Wrong(f"{path}: {name} has missing or non-finite values")
        columns = {name: np.ma.getdata(values) for name, values in columns.items()}
        columns["title"] = getattr(data, "title", "") or path
        columns["source"] = getattr(data, "source", "").split(",")[0]
    return columns


def year_mean(time, column, year):
    """Mean over the first axis of the intervals of a calendar year, None unless they fill it."""
    inside = np.floor(time) == year
    if not inside.any():
        return None
    steps = np.diff(time)
    near = inside[:-1] | inside[1:]
    if steps[near].size and inside.sum() * steps[near].min() < 0.99:
        return None
    return column[inside].mean(axis=0)


def return_year(time, column, benchmark_year, benchmark):
    """First upward crossing of benchmark after the lowest interval that follows benchmark_year, None if there is none."""
    after = np.flatnonzero(time >= benchmark_year + 1)
    if not after.size:
        return None
    low = after[np.argmin(column[after])]
    for i in range(low + 1, time.size):
        if column[i - 1] < benchmark <= column[i]:
            share = (benchmark - column[i - 1]) / (column[i] - column[i - 1])
            return time[i - 1] + share * (time[i] - time[i - 1])
    return None


def interval_edges(time):
    """Edges of cells around the middles of intervals, for pcolormesh."""
    inner = 0.5 * (time[1:] + time[:-1])
    return np.concatenate(([2 * time[0] - inner[0]], inner, [2 * time[-1] - inner[-1]]))


def field_of(data, quantity, benchmark_year):
    """The values of a quantity [time][altitude], its label, colours and limits."""
    density = data["fraction"] * data["air"]
    if quantity == "density":
        return density / 1e12, "O$_3$ number density / $10^{12}$ cm$^{-3}$", FIELD_COLOURS, (0.0, density.max() / 1e12)
    if quantity == "fraction":
        fraction = data["fraction"] * 1e6
        return fraction, "O$_3$ mole fraction / $10^{-6}$ mol mol$^{-1}$", FIELD_COLOURS, (0.0, fraction.max())
    before = year_mean(data["time"], density, benchmark_year)
    if before is None or not (before > 0.0).all():
        raise Wrong(f"no change against {benchmark_year}: the file does not cover that year")
    change = 100.0 * (density / before - 1.0)
    most = np.abs(change).max() or 1.0
    return change, f"O$_3$ change against {benchmark_year} / %", CHANGE_COLOURS, (-most, most)


def plot_field(axes, data, quantity, benchmark_year):
    """The altitude-time field; returns what a colour bar is drawn from and its label."""
    values, label, colours, (low, high) = field_of(data, quantity, benchmark_year)
    mesh = axes.pcolormesh(interval_edges(data["time"]), data["edges"], values.T, cmap=colours, vmin=low, vmax=high,
                           rasterized=True)
    # lines of equal value, so that the field can be read without its colours
    levels = [level for level in MaxNLocator(8).tick_values(low, high) if values.min() < level < values.max()]
    if levels:
        lines = axes.contour(data["time"], data["middles"], values.T, levels=levels, colors="black", linewidths=0.7)
        halo = [patheffects.withStroke(linewidth=2.2, foreground="white")]
        for collection in getattr(lines, "collections", [lines]):  # one artist from matplotlib 3.8 on
            collection.set_path_effects(halo)
        for text in axes.clabel(lines, fmt="%g", fontsize=8):
            text.set_path_effects(halo)
    axes.set_ylabel("altitude / km")
    return mesh, label


def plot_column(axes, data, benchmark_year):
    """The column series, with the benchmark, the lowest interval and the return."""
    time, column = data["time"], data["column"]
    axes.plot(time, column, color=BLUE, linewidth=1.8, label="ozone column")
    low = int(np.argmin(column))
    axes.plot(time[low], column[low], "v", color=BLUE, markersize=8,
              label=f"lowest interval: {column[low]:.2f} DU in {time[low]:.1f}")
    benchmark = year_mean(time, column, benchmark_year)
    if benchmark is None:
        note = f"{benchmark_year} is not covered by the file: no benchmark"
    else:
        axes.axhline(benchmark, color=VERMILLION, linestyle="--", linewidth=1.4,
                     label=f"mean of {benchmark_year}: {benchmark:.2f} DU")
        found = return_year(time, column, benchmark_year, benchmark)
        note = f"no return to {benchmark_year} within the file"
        if not (column[time >= benchmark_year + 1] < benchmark).any():
            note = f"never below {benchmark_year} afterwards"
        if found is not None:
            note = None
            axes.axvline(found, color=GREEN, linestyle=":", linewidth=1.8)
            axes.plot(found, benchmark, "o", color=GREEN, markersize=8, label=f"return to {benchmark_year}: {found:.1f}")
    if note:
        axes.plot([], [], " ", label=note)
    axes.set_ylabel("ozone column / DU")
    axes.set_xlabel("year")
    axes.grid(color="0.85", linewidth=0.6)
    axes.margins(y=0.1)
    axes.legend(loc="best", fontsize=9, framealpha=0.9)


def draw(data, benchmark_year, quantity, path):
    figure, (upper, lower) = plt.subplots(2, 1, sharex=True, figsize=(9.0, 8.0), height_ratios=(3, 2),
                                          layout="constrained")
    mesh, label = plot_field(upper, data, quantity, benchmark_year)
    figure.colorbar(mesh, ax=upper, label=label, pad=0.01)
    plot_column(lower, data, benchmark_year)
    edges = interval_edges(data["time"])
    lower.set_xlim(edges[0], edges[-1])
    lower.ticklabel_format(axis="y", useOffset=False)
    upper.set_title(data["title"])
    figure.supxlabel(f"{data['source']}: one near-global column without polar winter, ozone hole or change of circulation; a planning figure. "
                     "Defer to the competent authority.", fontsize=7, color="0.35")
    figure.savefig(path, dpi=150)
    plt.close(figure)


def main():
    parser = argparse.ArgumentParser(description=__doc__.split("\n\n", maxsplit=1)[0])
    parser.add_argument("file", metavar="FILE.nc")
    parser.add_argument("-o", "--output", metavar="FILE.png", required=True)
    parser.add_argument("--benchmark", metavar="YEAR", type=int, default=1980, help="benchmark year (1980)")
    parser.add_argument("--quantity", choices=("density", "fraction", "change"), default="density",
                        help="ozone as number density (the default), mole fraction, or change since the benchmark year")
    options = parser.parse_args()
    if not options.output.lower().endswith((".png", ".pdf", ".svg")):
        parser.error(f"{options.output}: the picture's name ends in .png (or .pdf, .svg)")
    try:
        draw(read(options.file), options.benchmark, options.quantity, options.output)
    except Wrong as error:
        print(f"plot_column.py: {error}", file=sys.stderr)
        return 2
    except OSError as error:
        print(f"plot_column.py: cannot write {options.output}: {error.strerror or error}", file=sys.stderr)
        return 4
    return 0


if __name__ == "__main__":
    sys.exit(main())

"""What the plots and the report share: reading a Skymend file, benchmark and return, writing a file as a whole.

Shapes: time [records], altitude [layers]; a field is [records][layers]. Units are those of the file.
"""

import os
import tempfile
from dataclasses import dataclass, field

import netCDF4
import numpy as np

# Families of odd-oxygen loss in the file, washout aside: it is no chemistry and small.
FAMILIES = ("Ox", "HOx", "NOx", "ClOx", "BrOx")
# Series by time alone that a figure or a table may want; not every file has them.
SERIES = ("ozone_column", "equivalent_chlorine_3yr", "equivalent_chlorine_3yr_known", "equivalent_chlorine_55yr",
          "equivalent_chlorine_55yr_known", "uv_index_noon", "erythemal_daily_dose", "surface_uvb_irradiance_noon")
DAYS_OF_YEAR = 365.25  # of the year of emissions and lifetimes in the file


class Wrong(Exception):
    """The file or the request is wrong; the text says how. Exit code 2."""


class Unwritten(Exception):
    """The output could not be written. Exit code 4."""


@dataclass
class Line:
    """A line of emission of the schedule."""

    label: str
    gas: str
    mass_of: str  # the gas, or the element whose mass the figures are
    emission: np.ndarray  # [records] Gg year-1


@dataclass
class Gas:
    """A source gas: one that the schedule gives."""

    name: str
    formula: str
    surface: np.ndarray  # [records] mole fraction in the lowest layer
    emission: np.ndarray  # [records] Gg year-1; where an abundance is given, what keeps it there
    lifetime: np.ndarray  # [records] years, NaN where there is none


@dataclass
class Case:
    """A finished or interrupted run."""

    path: str
    title: str
    label: str
    source: str
    time: np.ndarray  # [records] decimal years, middles
    bounds: np.ndarray  # [records][2] decimal years
    edges: np.ndarray  # [layers + 1] km
    middles: np.ndarray  # [layers] km
    fraction: np.ndarray  # O3, mol mol-1
    air: np.ndarray  # [layers] cm-3
    series: dict  # name -> [records], masked values as NaN
    loss: dict  # family -> field, cm-3 s-1; empty where the file has no budget
    gases: list
    lines: list
    ultraviolet: dict = field(default_factory=dict)  # latitude_deg, day_of_year, surface_albedo
    attributes: dict = field(default_factory=dict)

    @property
    def column(self):
        """Ozone column, DU."""
        return self.series["ozone_column"]

    def series_or_wrong(self, name):
        """A series that a figure cannot do without."""
        if name not in self.series:
            raise Wrong(f"{self.path} has no variable {name}; run skymend project anew")
        return self.series[name]


def clean(text):
    """Text without control characters, which neither XML nor a page can hold; line ends stay."""
    return "".join(c if c in "\n\t" or (c.isprintable() and not 0xD800 <= ord(c) < 0xE000) or c == "\u00a0"
                   else "\ufffd" for c in str(text))


def one_line(text):
    """Text on one line."""
    return " ".join(clean(text).split())


def decimal_years(dates, units, calendar):
    """Dates as year plus the fraction of that calendar year that has passed; any shape."""
    found = netCDF4.num2date(np.ravel(dates), units, calendar, only_use_cftime_datetimes=True)
    result = []
    for date in found:
        start = date.replace(month=1, day=1, hour=0, minute=0, second=0, microsecond=0)
        end = start.replace(year=date.year + 1)
        result.append(date.year + (date - start).total_seconds() / (end - start).total_seconds())
    return np.array(result).reshape(np.shape(dates))


def whole(path, name, values):
    """Values without a mask; one that is masked or not finite is refused."""
    if np.ma.is_masked(values) or not np.isfinite(values).all():
        raise Wrong(f"{path}: {name} has missing or non-finite values")
    return np.ma.getdata(values)


def gaps(values):
    """Values with NaN where they are masked."""
    return np.ma.filled(np.ma.asarray(values, dtype=float), np.nan)


def expect(path, data, name, units):
    if data[name].units != units:
        raise Wrong(f"{path}: {name} in {units} is wanted, it is in {data[name].units}")


def read_gases(path, data):
    """The source gases, in the order of the file: those with an emission."""
    result = []
    for name in data.variables:
        if not name.startswith("emission_"):
            continue
        variable = name[len("emission_"):]
        if variable not in data.variables:
            raise Wrong(f"{path} has {name} and no {variable}: is it a Skymend file?")
        expect(path, data, name, "Gg year-1")
        expect(path, data, variable, "mol mol-1")
        life = "lifetime_" + variable
        gas = data[variable]
        result.append(Gas(one_line(getattr(gas, "species", variable)), one_line(getattr(gas, "formula", "")),
                          whole(path, variable, gas[:, 0]), gaps(data[name][:]),
                          gaps(data[life][:]) if life in data.variables else np.full(gas.shape[0], np.nan)))
    return result


def read_lines(path, data):
    if "line_emission" not in data.variables:
        return []
    expect(path, data, "line_emission", "Gg year-1")
    amount = gaps(data["line_emission"][:])
    return [Line(one_line(label), one_line(gas), one_line(mass_of), amount[:, i])
            for i, (label, gas, mass_of) in enumerate(zip(data["line_label"][:], data["line_gas"][:],
                                                          data["line_mass_of"][:]))]


def read_case(path, label=None):
    """A file, or Wrong with what is amiss. label: how figures call it, the file's title where there is none."""
    try:
        data = netCDF4.Dataset(path)
    except OSError as error:
        raise Wrong(f"{path}: {error.strerror or error}") from error
    try:
        with data:
            return gather(path, data, label)
    except (RuntimeError, AttributeError, IndexError, KeyError, ValueError, TypeError) as error:
        # netCDF4 gives these for a damaged file and for attributes or dimensions that are not there
        raise Wrong(f"{path} cannot be read as a Skymend file: {error}") from error


def gather(path, data, label):
    for name in ("time", "time_bnds", "altitude", "altitude_bnds", "O3", "air_number_density", "ozone_column"):
        if name not in data.variables:
            raise Wrong(f"{path} has no variable {name}: is it a Skymend file?")
    for name, units in (("ozone_column", "DU"), ("altitude", "km"), ("O3", "mol mol-1"),
                        ("air_number_density", "cm-3")):
        expect(path, data, name, units)
    clock = data["time"]
    if clock.size < 2:
        raise Wrong(f"{path} holds {clock.size} records; a plot needs two")
    calendar = getattr(clock, "calendar", "standard")
    layers = whole(path, "altitude_bnds", data["altitude_bnds"][:])
    loss = {}
    for family in FAMILIES:
        name = "odd_oxygen_loss_by_" + family
        if name in data.variables:
            expect(path, data, name, "cm-3 s-1")
            loss[family] = whole(path, name, data[name][:])
    if loss and len(loss) < len(FAMILIES):
        raise Wrong(f"{path} has only some of the losses of odd oxygen by family")
    ultraviolet = {}
    if "uv_index_noon" in data.variables:
        sun = data["uv_index_noon"]
        ultraviolet = {key: float(getattr(sun, key)) for key in ("latitude_deg", "day_of_year", "surface_albedo")
                       if hasattr(sun, key)}
    attributes = {name: clean(data.getncattr(name)) for name in data.ncattrs()}
    title = one_line(attributes.get("title", "")) or os.path.basename(path)
    column = whole(path, "ozone_column", data["ozone_column"][:])
    series = {name: gaps(data[name][:]) for name in SERIES if name in data.variables}
    series["ozone_column"] = column
    return Case(
        path=path, title=title, label=one_line(label) if label else title,
        source=one_line(attributes.get("source", "")).split(",")[0] or "Skymend",
        time=decimal_years(whole(path, "time", clock[:]), clock.units, calendar),
        bounds=decimal_years(whole(path, "time_bnds", data["time_bnds"][:]), clock.units, calendar),
        edges=np.append(layers[:, 0], layers[-1, 1]), middles=whole(path, "altitude", data["altitude"][:]),
        fraction=whole(path, "O3", data["O3"][:]),
        air=whole(path, "air_number_density", data["air_number_density"][:]),
        series=series, loss=loss, gases=read_gases(path, data), lines=read_lines(path, data),
        ultraviolet=ultraviolet, attributes=attributes)


# ---- benchmark and return, as `skymend answers` finds them unsmoothed ----


def year_mean(time, values, year):
    """Mean over the first axis of the intervals of a calendar year, None unless they fill it."""
    inside = np.floor(time) == year
    if not inside.any():
        return None
    steps = np.diff(time)
    near = inside[:-1] | inside[1:]
    if steps[near].size and inside.sum() * steps[near].min() < 0.99:
        return None
    return values[inside].mean(axis=0)


def return_year(time, values, benchmark_year, benchmark, falls=True):
    """First time at which the values are back at the benchmark after their extreme later than benchmark_year,
    linear between intervals; None if there is none. falls: the extreme is the lowest, else the highest."""
    sign = 1.0 if falls else -1.0
    after = np.flatnonzero(time >= benchmark_year + 1)
    if not after.size:
        return None
    extreme = after[np.argmin(sign * values[after])]
    for i in range(extreme + 1, time.size):
        if sign * values[i - 1] < sign * benchmark <= sign * values[i]:
            share = (benchmark - values[i - 1]) / (values[i] - values[i - 1])
            return time[i - 1] + share * (time[i] - time[i - 1])
    return None


def interval_edges(case):
    """Edges of the intervals, for pcolormesh."""
    return np.append(case.bounds[:, 0], case.bounds[-1, 1])


# ---- writing ----


def write_whole(path, content):
    """Put bytes at path by way of a file beside it: what stands there is whole, the old or the new."""
    folder = os.path.dirname(path) or "."
    try:
        if os.path.exists(path) and not os.path.isfile(path):  # a device or a pipe is no file to put another over
            with open(path, "wb") as out:
                out.write(content)
            return
        handle, beside = tempfile.mkstemp(dir=folder, prefix="." + os.path.basename(path) + ".")
    except OSError as error:
        raise Unwritten(f"cannot write {path}: {error.strerror or error}") from error
    try:
        with os.fdopen(handle, "wb") as out:
            out.write(content)
            out.flush()
            os.fsync(out.fileno())
        mask = os.umask(0)
        os.umask(mask)
        os.chmod(beside, 0o666 & ~mask)
        os.replace(beside, path)
    except OSError as error:
        raise Unwritten(f"cannot write {path}: {error.strerror or error}") from error
    finally:
        if os.path.exists(beside):
            os.unlink(beside)

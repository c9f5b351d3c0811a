"""Figures of ozone by altitude and time."""

import numpy as np
from matplotlib.ticker import MaxNLocator
from skymend_files import Wrong, interval_edges, year_mean
from skymend_sheet import BEHIND, CHANGE_COLOURS, FIELD_COLOURS, HALO, SMALL, Sheet, short, years_axis


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


def draw_change(sheet, axes, year):
    """Of two cases the difference of their ozone, else the change of the first against the benchmark year; where the
    file does not cover that, ozone itself."""
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

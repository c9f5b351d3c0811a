"""What every figure is made on: style, colours, the names at the ends of curves, keys, the lines at the foot.

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
from matplotlib.ticker import MaxNLocator
from skymend_files import FAMILIES, Wrong

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


# ---- out of the house ----


def picture(figure, form, title, dpi=200):
    """The bytes of a figure in a form (png, svg, pdf), without a date, so that they repeat."""
    stream = io.BytesIO()
    keep = {"png": {"Title": title}, "svg": {"Title": title, "Date": None, "Creator": "Skymend"},
            "pdf": {"Title": title, "CreationDate": None}}[form]
    figure.savefig(stream, format=form, dpi=dpi, metadata=keep)
    plt.close(figure)
    return stream.getvalue()

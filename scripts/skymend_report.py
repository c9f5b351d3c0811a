"""The sections of a report, as HTML. What is asked of other programs and files comes in as read data."""

import csv
import difflib
import hashlib
import os
import re

import numpy as np
from skymend_files import DAYS_OF_YEAR, Wrong, one_line, year_mean
from skymend_page import figure, minus, number, plain, table, text

UNITS = {"percent": "%", "1e-12": "ppt", "1": "", "year": "year"}
MOST_ROWS = 60  # of a schedule file shown whole


def unit_text(unit):
    """A unit as people write it: the file's 1e-12 is ppt."""
    return UNITS.get(unit, unit.replace("1e-12", "ppt").replace("m-2", "m⁻²").replace("day-1", "d⁻¹").replace("year-1", "year⁻¹"))


# ---- answers ----


class Answers:
    """What skymend answers --json said."""

    def __init__(self, told):
        try:
            self.all = told["answers"]
            self.benchmark = int(told["benchmark_year"])
            self.smooth, self.errors = told["smooth_years"], told["errors"]
            self.series = [key[:-len("_benchmark")] for key in self.all if key.endswith("_benchmark")]
            for answer in self.all.values():
                for key in ("label", "value", "unit", "numerical_error", "note", "method"):
                    answer[key]  # pylint: disable=pointless-statement
        except (KeyError, TypeError, AttributeError) as error:
            raise Wrong(f"skymend answers gave JSON without {error}; program and scripts are of different versions") \
                from error

    def get(self, key):
        """An answer, or one that says nothing."""
        return self.all.get(key, {"label": "", "value": None, "unit": "", "numerical_error": None, "note": "",
                                  "method": ""})

    def cell(self, key):
        answer = self.get(key)
        return number(answer["value"], answer["numerical_error"])

    def name(self, series):
        answer = self.get(series + "_benchmark")
        unit = unit_text(answer["unit"])
        return answer["label"].split(": ")[0] + (", " + unit if unit else "")


def extreme(answers, series):
    return "lowest" if series + "_lowest" in answers.all else "highest"


def short_answers(answers, cases):
    """The few sentences that most readers come for."""
    said = []
    column, year = "ozone_column", answers.benchmark
    known = answers.get("ozone_column_benchmark")["value"] is not None
    if column in answers.series and not known:
        said.append(f"The ozone column is lowest in {answers.cell('ozone_column_lowest_year')} at "
                    f"{answers.cell('ozone_column_lowest')} DU. <strong>No change against {year} and no year of "
                    f"return</strong>: {text(answers.get('ozone_column_return_year')['note'])}.")
    elif column in answers.series:
        said.append(f"The ozone column, {answers.cell('ozone_column_benchmark')} DU in {year}, is lowest in "
                    f"{answers.cell('ozone_column_lowest_year')} at {answers.cell('ozone_column_lowest')} DU, "
                    f"{answers.cell('ozone_column_change_percent')} % against {year}.")
        back = answers.get("ozone_column_return_year")
        said.append(f"<strong>It is back at its value of {year} in {answers.cell('ozone_column_return_year')}</strong>"
                    + (f" (running mean of {answers.smooth:g} years: "
                       f"{answers.cell('ozone_column_return_year_smoothed')})." if back["value"] is not None else
                       f": {text(back['note'])}."))
    if "uv_index_noon" in answers.series:
        said.append(f"The UV index at noon under a clear sky is at most {answers.cell('uv_index_noon_highest')}"
                    + (f", {answers.cell('uv_index_noon_change_percent')} % against {year}" if known else "") + ".")
    if len(cases) > 1:
        delay = answers.get("ozone_column_return_delay")
        said.append(f"Against <em>{text(cases[1].label)}</em> it costs "
                    f"<strong>{answers.cell('ozone_column_integrated_depletion')} DU year</strong> of ozone and delays "
                    f"the return by <strong>{answers.cell('ozone_column_return_delay')} years</strong>"
                    + (f" ({text(delay['note'])})" if delay["note"] else "") + ".")
    return '<div class="box">' + "".join(f"<p>{part}</p>" for part in said) + "</div>\n"


def notes_of(answers, keys, begun):
    """Remarks of answers as a list; begun: note -> its mark."""
    for key in keys:
        note = answers.get(key)["note"]
        if note:
            begun.setdefault(note, len(begun) + 1)
    marks = sorted({begun[answers.get(key)["note"]] for key in keys if answers.get(key)["note"]})
    return f"<sup>{', '.join(map(str, marks))}</sup>" if marks else ""


def told_notes(begun):
    return "<p class=\"small\">" + "; ".join(f"<sup>{mark}</sup> {text(note)}" for note, mark in begun.items()) + \
        "</p>\n" if begun else ""


def table_of_series(answers, ending, caption):
    """A row per series: benchmark, extreme, change, end, return."""
    rows, begun = [], {}
    for series in answers.series:
        if series.endswith("_smoothed") or series + "_change" + ending not in answers.all:
            continue
        far = f"{series}_{extreme(answers, series)}"
        keys = [f"{series}_benchmark{ending}", f"{far}{ending}", f"{far}_year{ending}", f"{series}_change{ending}",
                f"{series}_change_percent{ending}", f"{series}_last_change{ending}", f"{series}_return_year{ending}"]
        rows.append([text(answers.name(series)) + notes_of(answers, keys, begun)] + [answers.cell(k) for k in keys])
    head = ["series, unit", f"mean of {answers.benchmark}", "extreme", "in", "extreme less benchmark", "the same, %",
            "last year less benchmark", "back at the benchmark in"]
    return table(caption, head, rows, range(1, 8), kind="series") + told_notes(begun)


def table_against(answers, case, reference):
    rows, begun = [], {}
    for series in answers.series:
        integral = next((k for k in (series + "_integrated_depletion", series + "_integrated_excess")
                         if k in answers.all), None)
        if not integral:
            continue
        keys = [integral, f"{series}_difference_mean", f"{series}_difference_largest",
                f"{series}_difference_largest_year", f"{series}_return_delay", f"{series}_return_delay_smoothed"]
        kind = "depletion" if integral.endswith("depletion") else "excess"
        rows.append([text(f"{answers.name(series)}: {kind}") + notes_of(answers, keys, begun)] +
                    [answers.cell(k) for k in keys])
    head = ["series, unit", "integral over time, unit × year", "mean difference", "largest difference", "in",
            "delay of the return, years", "the same, running mean"]
    return table(f"{case.label} against {reference.label}. Difference: the first less the second; depletion and excess "
                 "count what the first makes worse as positive.", head, rows, range(1, 7),
                 kind="series") + told_notes(begun)


def section_answers(answers, cases):
    parts = ["<h2 id=\"answers\">Answers</h2>\n"]
    if len(cases) > 1:
        parts.append(table_against(answers, *cases))
    parts.append(table_of_series(answers, "", f"{cases[0].label}: means of the intervals of the file, unsmoothed. "
                                              "±: numerical error alone."))
    parts.append(table_of_series(answers, "_smoothed", f"The same from the running mean of {answers.smooth:g} years, "
                                                       "in which a whole solar cycle cancels."))
    return "".join(parts)


def appendix_answers(answers):
    """All answers in full; methods and remarks, which many share, stand in lists of their own."""
    methods, remarks, rows = {}, {}, []
    for key, a in answers.all.items():
        full = "" if a["value"] is None else minus(format(a["value"], ".9g"))
        value = f'<data value="{a["value"]!r}">{full}</data>' if full else "–"
        rows.append([f'<code class="keep">{text(key)}</code>', value,
                     f'<span class="keep">{text(unit_text(a["unit"]))}</span>',
                     "–" if a["numerical_error"] is None else f'{a["numerical_error"]:.2g}',
                     str(methods.setdefault(a["method"], len(methods) + 1)),
                     str(remarks.setdefault(a["note"], len(remarks) + 1)) if a["note"] else ""])
    lists = "".join(f"<h3>{name}</h3>\n<ol class=\"sources\">{''.join(f'<li>{text(line)}</li>' for line in lines)}</ol>\n"
                    for name, lines in (("Methods", methods), ("Remarks", remarks)) if lines)
    return "<h2 id=\"all\">Appendix: every answer and how it is found</h2>\n" + table(
        "In full, as skymend answers gives them; methods and remarks are listed below.",
        ["id", "value", "unit", "numerical error", "method", "remark"], rows,
        (1, 3, 4, 5), kind="small") + \
        lists


# ---- the schedule ----


def setting(case, key):
    """The text behind a key of the resolved case."""
    found = re.search(rf"^\s*{key} = (.*?);$", case.attributes.get("resolved_case", ""), re.MULTILINE)
    return found.group(1).strip() if found else ""


def lengths(case):
    """Lengths of the intervals in years of 365.25 days."""
    return np.diff(case.bounds, axis=1)[:, 0] * 365.2425 / DAYS_OF_YEAR


def span(case, emission):
    """First and last calendar year of an emission, None where there is none."""
    given = np.flatnonzero(emission > 0.0)
    return (int(case.bounds[given[0], 0] + 1e-6), int(case.time[given[-1]])) if given.size else None


def driven(case, gas):
    """What drives a gas: its emission is that of its lines from the year on from which the two are one."""
    lines = [line for line in case.lines if line.gas == gas.name]
    if not lines:
        return "its abundance"
    if any(line.mass_of != gas.name for line in lines):
        return "see its lines"
    count = f"{len(lines)} line" + ("s" if len(lines) > 1 else "")
    total = sum(line.emission for line in lines)
    same = np.isclose(gas.emission, total, rtol=1e-6, atol=1e-9)
    first = int(np.flatnonzero(~same)[-1]) + 1 if not same.all() else 0
    if first >= case.time.size:
        return f"its abundance; {count} beside it"
    from_when = f"its abundance, from {int(case.time[first])} on " if first else ""
    return f"{from_when}emissions, {count}"


def table_lines(case, answers=None):
    """answers: those of the case, for the ODP-tonnes of its lines; they number the lines in the order of the file."""
    rows, years = [], lengths(case)
    for count, line in enumerate(case.lines, 1):
        of = line.gas + ("" if line.mass_of == line.gas else f", mass of {line.mass_of}")
        when = span(case, line.emission)
        most = int(np.argmax(line.emission))
        rows.append([text(line.label), text(of), f"{when[0]}–{when[1]}" if when else "–",
                     number(float((line.emission * years).sum())), number(float(line.emission[most])),
                     str(int(case.time[most])) if when else "–"] +
                    ([answers.cell(f"odp_emission_{kind}_line_{count}_total") for kind in ("treaty", "own")]
                     if answers else []))
    if not rows:
        return "<p>The schedule has no line of emission: every gas follows the abundance given for it.</p>\n"
    return table(f"Lines of emission of {case.label}, within the years of the run.",
                 ["line", "gas", "years", "total / Gg", "largest / Gg per year", "in"] +
                 (["ODP-tonnes, treaty's potentials", "ODP-tonnes, Skymend's"] if answers else []), rows,
                 range(3, 8))


def table_tonnes(answers, cases):
    """Totals in ODP-tonnes, implied emissions of gases that follow an abundance among them."""
    if "odp_emission_treaty_total" not in answers.all:
        return ""
    rows, begun = [], {}
    for name, part in ((cases[0].label, ""), ("the same less the reference", "_difference")):
        keys = [f"odp_emission_{kind}{part}_total" for kind in ("treaty", "own")]
        if keys[0] in answers.all:
            rows.append([text(name) + notes_of(answers, keys, begun)] + [answers.cell(key) for key in keys])
    return table("Emissions of all gases over the years of the run in ODP-tonnes, those that keep an abundance given "
                 "included.", ["emissions", "by the treaty's potentials", "by Skymend's own"], rows, (1, 2)) + \
        told_notes(begun)


def table_gases(case, benchmark):
    rows, years = [], lengths(case)
    for gas in case.gases:
        unit, factor = ("ppm", 1e6) if gas.name == "CO2" else ("ppb", 1e9) if gas.name in ("CH4", "N2O") else \
            ("ppt", 1e12)
        then = year_mean(case.time, gas.surface, benchmark)
        life = gas.lifetime[np.isfinite(gas.lifetime)]
        rows.append([f'<span class="keep">{text(gas.name)}</span>', text(driven(case, gas)),
                     number(factor * float(gas.surface[0])),
                     number(None if then is None else factor * float(then)), number(factor * float(gas.surface[-1])),
                     unit, number(float(np.nansum(gas.emission * years)) / 1e3),
                     number(float(life[-1])) if life.size else "–"])
    return table("Source gases: mole fraction in the lowest layer; emission, where an abundance is given, is what "
                 "keeps it there; lifetime against loss in the column in the last interval that has one.",
                 ["gas", "driven by", f"{case.time[0]:.1f}",
                  f"mean of {benchmark}", f"{case.time[-1]:.1f}", "unit", "emission over the run / Tg",
                  "lifetime / years"], rows, (2, 3, 4, 6, 7))


def schedule_file(path):
    """A file of the schedule: its head, its sum, its rows (all, or the first ones)."""
    try:
        with open(path, "rb") as source:
            content = source.read()
        lines = content.decode("utf-8-sig").splitlines()
    except OSError as error:
        raise Wrong(f"{path}: {error.strerror}") from error
    except UnicodeDecodeError as error:
        raise Wrong(f"{path} is no text in UTF-8") from error
    head = [line.lstrip("# ") for line in lines if line.startswith("#")]
    rows = [row for row in csv.reader(line for line in lines if line and not line.startswith("#")) if any(row)]
    if len(rows) < 2 or "gas" not in [cell.strip() for cell in rows[0]]:
        raise Wrong(f"{path} is no schedule: it has no column gas or no rows")
    width = len(rows[0])
    shown = rows[1:1 + MOST_ROWS]
    more = len(rows) - 1 - len(shown)
    made = f"<h3>{text(os.path.basename(path))}</h3>\n<p class=\"small\">" + "<br>".join(text(line) for line in head)
    made += f"<br>{len(rows) - 1} rows; SHA-256 {hashlib.sha256(content).hexdigest()}</p>\n"
    made += table(f"Rows of {os.path.basename(path)}" + (f", the first {MOST_ROWS}; {more} more are in the file"
                                                          if more > 0 else ""),
                  rows[0], [[text(cell) for cell in (row + [""] * width)[:width]] for row in shown], kind="small")
    return made


def section_schedule(cases, answers, files):
    parts = ["<h2 id=\"schedule\">Schedule</h2>\n"]
    for case in cases:
        layers = setting(case, "schedule_layers").strip("[] ")
        parts.append(f"<p><strong>{text(case.label)}</strong> ({text(os.path.basename(case.path))}): "
                     f"{int(case.bounds[0, 0])} to {int(case.bounds[-1, 1] - 1e-6)}, schedule "
                     f"{text(setting(case, 'schedule') or 'not named in the file')}"
                     + (f", over it {text(layers)}" if layers else "") + f"; layers of "
                     f"{plain(float(np.diff(case.edges).min()))} to {plain(float(np.diff(case.edges).max()))} km, "
                     f"temperature.mode {text(setting(case, 'mode') or 'not known')}.</p>\n")
    for case in cases:
        if case.lines or case is cases[0]:
            parts.append(table_lines(case, answers if case is cases[0] else None))
    parts.append(table_tonnes(answers, cases))
    parts.append(table_gases(cases[0], answers.benchmark))
    parts.extend(schedule_file(path) for path in files)
    return "".join(parts)


# ---- what the lines cost ----


def apportion_rows(told, path):
    """Names, lost, errors, and the rows of the table of skymend apportion --json."""
    try:
        quick = "derivatives_of_years" in told
        names, lost, errors, rows = [], [], [], []
        for item in told["items"]:
            names.append(", ".join(part for part in (item["line"], item["gas"]) if part))
            value, error = (item["all_time_DU_years"], item["all_time_error"]) if quick else \
                (item["lost_DU_years"], item["lost_error"])
            lost.append(float(value))
            errors.append(np.nan if error is None else float(error))
            row = [text(names[-1]), number(item["emitted_t"] / 1e3), number(value, error)]
            if quick:
                row.append(number(item["within_DU_years"]))
            else:
                row += [number(item["percent_of_all"]), f"{number(item['largest_DU'])} in {item['largest_year']:g}",
                        {"found": "", "at least": "at least "}.get(item["delay_kind"], text(item["delay_kind"]) + " ")
                        + (number(item["delay_months"], item["delay_error"]) if item["delay_months"] is not None
                           else "")]
            rows.append(row)
        foot = [["sum", "", number(told["sum_all_time_DU_years"], told["sum_all_time_error"]),
                 number(told["sum_within_DU_years"])]] if quick else \
            [["sum", "", number(told["sum_DU_years"], told["sum_error"]), "", "", ""],
             ["all of them off", "", number(told["all"]["lost_DU_years"], told["all"]["lost_error"]), "100", "", ""],
             ["remainder (all less sum)", "", number(told["remainder_DU_years"], told["remainder_error"]),
              number(told["remainder_percent_of_all"]), "", ""]]
    except (KeyError, TypeError, ValueError) as error:
        raise Wrong(f"{path} is not what skymend apportion --json writes: {error}") from error
    if not rows:
        raise Wrong(f"{path} has no items")
    return quick, names, lost, errors, rows, foot


# DU. The runs of an apportionment refresh the light at times of their own, which moved the column by up to 0.06 DU in a
# run of 86 years; another case differs by more somewhere, or hardly matters.
SAME_COLUMN = 0.2


def same_run(told, case):
    """Whether the columns of an apportionment are those of the file; None where it cannot be said."""
    try:
        first, columns = int(told["first_year"]), told["column_DU"]
        pairs = [(year_mean(case.time, case.column, first + i), value) for i, value in enumerate(columns)]
    except (KeyError, TypeError, ValueError):
        return None
    pairs = [(mine, float(value)) for mine, value in pairs if mine is not None and value is not None]
    return bool(max(abs(mine - value) for mine, value in pairs) < SAME_COLUMN) if pairs else None


def section_apportion(told, path, case, bars, number_of_figure):
    quick, names, lost, errors, rows, foot = apportion_rows(told, path)
    label = "ozone lost, for all time / DU year" if quick else "ozone lost within the run / DU year"
    picture = bars(names, lost, np.array(errors), label, os.path.basename(path))
    head = ["line or gas", "emitted / Gg", "lost / DU year"] + (
        ["of it within the run / DU year"] if quick else
        ["share of all / %", "largest loss / DU", "delay of the return / months"])
    parts = ["<h2 id=\"lines\">What each line costs</h2>\n"]
    if same_run(told, case) is False:
        parts.append(f'<p class="box caution">The apportionment {text(os.path.basename(path))} was made of a run whose '
                     "ozone column is not that of the file of this report. Make it anew from the same case.</p>\n")
    ways = "By the derivative of the settled column, which adds up: for all time, and an estimate of the part that " \
           "falls within the run." if quick else \
        "By runs without the line: the column without it less the column of the whole, summed over the years. The " \
        "remainder is by how much the lines together do otherwise than each alone."
    parts.append(table(ways + " ±: numerical error.", head, rows, range(1, len(head)), foot))
    parts.append(figure(picture, "bars-", "Bar chart: " + label + ": " + "; ".join(
        f"{name} {value:.3g}" for name, value in zip(names, lost)), f"Figure {number_of_figure}. Ozone lost by line."))
    if told.get("lines_kept"):
        parts.append(f"<p class=\"small\">Lines kept in every run: {text(told['lines_kept'])}.</p>\n")
    if told.get("not_apportioned"):
        parts.append("<p class=\"small\">Not taken apart, since driven by their abundance: "
                     f"{text(', '.join(map(str, told['not_apportioned'])))}.</p>\n")
    return "".join(parts)


# ---- how sure ----


def read_status(path):
    """Head (key -> text) and rows of validation-status.csv."""
    try:
        with open(path, encoding="utf-8", newline="") as source:
            lines = source.read().splitlines()
    except OSError as error:
        raise Wrong(f"{path}: {error.strerror}") from error
    head = dict(line[1:].strip().split(": ", 1) for line in lines if line.startswith("#") and ": " in line)
    rows = list(csv.DictReader(line for line in lines if not line.startswith("#")))
    if not rows or not {"kind", "id", "quantity", "verdict", "reason"} <= set(rows[0]) or "date" not in head:
        raise Wrong(f"{path} is not what make validate writes")
    return head, rows


def figures(value):
    """A number of a table as people read it."""
    try:
        return minus(f"{float(value):.4g}")
    except (TypeError, ValueError):
        return text(value or "–")


def status_rows(rows):
    return [[text(row["quantity"] or row["id"]) + (f", {text(row['conditions'])}" if row["conditions"] else ""),
             figures(row["value"]), f"{figures(row['low'])} to {figures(row['high'])}" if row["low"] else
             f"at most {figures(row['high'])}", text(row["unit"]), text(row["reason"])] for row in rows]


def section_validation(status):
    if status is None:
        return "<p>No validation status lies with the program's data (<code>validation-status.csv</code>), so this " \
               "report cannot say how the program stands against published values; <code>make validate</code> finds " \
               "out.</p>\n"
    head, rows = status
    parts = []
    for kind, what in (("published", "published values"), ("numerics", "limits of numerical error")):
        of_kind = [row for row in rows if row["kind"] == kind]
        count = {verdict: sum(row["verdict"] == verdict for row in of_kind) for verdict in ("in", "out", "later", "-")}
        out = [row for row in of_kind if row["verdict"] == "out"]
        if not of_kind:
            parts.append(f"<p>Not measured when that was last asked: {what}.</p>\n")
            continue
        more = (f", {count['later']} not computed by the program" if count["later"] else "") + \
            (f", {count['-']} without a limit" if count["-"] else "")
        parts.append(f"<p>{what.capitalize()}: <strong>{count['in']} in range, {count['out']} out</strong>{more}, for "
                     f"the program's baseline, {text(head.get('program', ''))}, {text(head['date'])}. These are not "
                     "figures of the run of this report.</p>\n")
        if out:
            parts.append(table(f"Out of range among the {what}, and why.", ["quantity", "found", "range", "unit",
                                                                           "reason"], status_rows(out), (1,),
                               kind="small"))
    return "".join(parts)


def section_sure(answers, cases, status):
    parts = ["<h2 id=\"sure\">How sure</h2>\n", f"<p>Numerical errors (±): {text(answers.errors)}. They hold nothing "
             "of the uncertainty of chemistry, mixing, temperature or schedule, which is larger.</p>\n"]
    rows = []
    for case in cases:
        closure = {key[len("run_closure_"):]: value for key, value in case.attributes.items()
                   if key.startswith("run_closure_")}
        if not closure:
            rows.append([text(case.label), "the run did not come to its end"])
            continue
        rows.append([text(case.label), text(", ".join(f"{element} {float(value):.1e}"
                                                      for element, value in closure.items()))])
    parts.append(table("Atoms unaccounted for over the run, relative to those there are: round-off if the books are "
                       "right.", ["run", "element and share"], rows))
    parts.append("<h3>Against published values</h3>\n" + section_validation(status))
    return "".join(parts)


# ---- where it comes from ----


def section_sources(case):
    groups, current = [], None
    for line in case.attributes.get("references", "").splitlines():
        if not line.strip():
            continue
        begun = re.match(r"^([a-z][a-zA-Z0-9 ]{2,40}): (.*)$", line)
        if begun and begun.group(1) not in ("title", "quantity", "unit", "source", "basis", "method", "note",
                                            "warning", "made by"):
            current = [begun.group(1), [begun.group(2)]]
            groups.append(current)
        elif current is None:
            current = ["", [line]]
            groups.append(current)
        else:
            current[1].append(line)
    if not groups:
        return "<h2 id=\"sources\">Sources</h2>\n<p>The file names none.</p>\n"
    shown = "".join(f"<li><strong>{text(name)}</strong>: {'<br>'.join(text(local_name(line)) for line in lines)}</li>"
                    for name, lines in groups)
    return "<h2 id=\"sources\">Sources of the input</h2>\n<p class=\"meta\">As the file has them in its attribute " \
           f"<code>references</code>; “from memory” marks what was typed without the page at hand.</p>\n" \
           f"<ul class=\"sources\">{shown}</ul>\n"


def local_name(line):
    """A citation without the folder of a table in front of it, which says nothing to another reader."""
    return re.sub(r"^(?:/[^:/]+)+/([^:/]+: )", r"\1", line)


def section_caution(case):
    parts = ["<h2 id=\"caution\">Caution</h2>\n<div class=\"box caution\">"]
    parts.append(f"<p>{text(case.attributes.get('caution', ''))}</p>")
    parts.append("<p>Ultraviolet is that of a clear sky over level ground at sea level: a planning figure, no guide to "
                 "personal exposure. Decisions about health, regulation or policy defer to the competent authority "
                 "and its own methods.</p></div>\n")
    return "".join(parts)


def section_again(cases):
    parts = ["<h2 id=\"again\">To compute it again</h2>\n"]
    for case in cases:
        resolved, caption = case.attributes.get("resolved_case", ""), ""
        if case is not cases[0]:
            resolved = "\n".join(line for line in difflib.unified_diff(
                cases[0].attributes.get("resolved_case", "").splitlines(), resolved.splitlines(), lineterm="", n=0)
                if not line.startswith(("---", "+++", "@@"))) or "(no difference)"
            caption = "<br>Its case against that above, line by line (−: there, +: here):"
        parts.append(f"<h3>{text(case.label)}</h3>\n<p class=\"small\">{text(case.attributes.get('source', ''))}<br>"
                     f"{text(one_line(case.attributes.get('history', '')))}{caption}</p>\n"
                     f"<pre>{text(resolved)}</pre>\n")
    return "".join(parts)

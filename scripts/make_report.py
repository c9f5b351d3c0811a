#!/usr/bin/python3
"""Write one self-contained HTML report of a Skymend run, or of two compared.

The answers are those of `skymend answers`, which this script runs: the program named by SKYMEND, else the one beside
this script or in its repository, else the one in PATH. The page loads nothing and holds its figures as SVG. Exit code
2: a file or the request is wrong; 4: the report could not be written; that of skymend where it failed.
"""

import argparse
import json
import os
import shutil
import subprocess
import sys
import tempfile
import time

import skymend_report as section
from skymend_files import Unwritten, Wrong, one_line, read_case, write_whole
from skymend_page import figure, page, text

# Kind, what it shows; the order of the report.
FIGURES = (("column", "Ozone column with its benchmark and the year of return"),
           ("anomaly", "Ozone by altitude and time, change against the benchmark year"),
           ("gases", "Source gases in the lowest layer and equivalent chlorine"),
           ("emissions", "Emissions"),
           ("ultraviolet", "Ultraviolet at the ground"),
           ("loss", "Loss of odd oxygen by catalytic family against altitude"))


class Failed(Exception):
    """skymend failed; it has said why."""

    def __init__(self, code):
        super().__init__(code)
        self.code = code


def find_program():
    """The program, by the rule in the head of this file."""
    named = os.environ.get("SKYMEND")
    if named:
        if not os.access(named, os.X_OK):
            raise Wrong(f"SKYMEND names {named}, which is no program")
        return named
    called, real = os.path.abspath(sys.argv[0]), os.path.realpath(__file__)
    for place in (os.path.join(os.path.dirname(called), "skymend"),
                  os.path.join(os.path.dirname(real), "..", "build", "skymend"),
                  os.path.join(os.path.dirname(real), "..", "..", "bin", "skymend")):
        if os.path.isfile(place) and os.access(place, os.X_OK):
            return place
    found = shutil.which("skymend")
    if not found:
        raise Wrong("no program skymend: build it, put it in PATH, or name it by SKYMEND")
    return found


def find_status(program):
    """The validation status among the program's data, where it looks for them; None where there is none."""
    beside = os.path.dirname(os.path.realpath(program))
    folders = [os.environ["SKYMEND_DATA"]] if os.environ.get("SKYMEND_DATA") else \
        [os.path.join(beside, "..", "share", "skymend"), os.path.join(beside, "..", "input", "data")]
    for folder in folders:
        path = os.path.join(folder, "validation-status.csv")
        if os.path.isfile(path):
            return path
    return None


def read_json(path):
    try:
        with open(path, encoding="utf-8") as source:
            told = json.load(source)
    except OSError as error:
        raise Wrong(f"{path}: {error.strerror}") from error
    except ValueError as error:
        raise Wrong(f"{path} is no JSON: {error}") from error
    if not isinstance(told, dict):
        raise Wrong(f"{path} is not what skymend writes")
    return told


def ask_answers(program, options):
    """skymend answers of the files, as data."""
    with tempfile.TemporaryDirectory() as folder:
        path = os.path.join(folder, "answers.json")
        command = [program, "answers", options.file, "--benchmark", str(options.benchmark), "--json", path, "--quiet"]
        if options.against:
            command += ["--against", options.against]
        ran = subprocess.run(command, stdin=subprocess.DEVNULL, stdout=subprocess.DEVNULL, check=False)
        if ran.returncode:
            raise Failed(ran.returncode if ran.returncode > 0 else 3)
        return read_json(path)


def drawn(cases, options):
    """Kind -> picture of every figure that the files have, and kind -> why not of the others."""
    import matplotlib.pyplot as plt
    import skymend_figures
    import skymend_sheet
    pictures, absent = {}, {}
    with plt.rc_context(skymend_sheet.STYLE):
        for kind, _ in FIGURES:
            try:
                made = skymend_figures.draw(kind, cases, options.benchmark, options.year)
                pictures[kind] = skymend_sheet.picture(made, "svg", kind)
            except Wrong as error:
                absent[kind] = str(error)
                plt.close("all")
    return pictures, absent


def bars(*facts):
    import matplotlib.pyplot as plt
    import skymend_figures
    import skymend_sheet
    with plt.rc_context(skymend_sheet.STYLE):
        return skymend_sheet.picture(skymend_figures.figure_bars(*facts), "svg", "bars")


def section_figures(cases, pictures, absent, first):
    parts = ["<h2 id=\"figures\">Figures</h2>\n"]
    names = " and ".join(case.label for case in cases)
    for count, kind in enumerate(pictures, first):
        what = dict(FIGURES)[kind]
        parts.append(figure(pictures[kind], kind + "-", f"{what}: {names}", f"Figure {count}. {text(what)}: "
                                                                            f"{text(names)}."))
    for kind, why in absent.items():
        parts.append(f"<p class=\"small\">Not drawn: {text(dict(FIGURES)[kind].lower())}: {text(why)}</p>\n")
    return "".join(parts)


def report(options):
    """The page as text."""
    cases = [read_case(options.file)] + ([read_case(options.against)] if options.against else [])
    told = read_json(options.apportion) if options.apportion else None
    program = find_program()
    status_path = options.validation or find_status(program)
    status = section.read_status(status_path) if status_path else None
    answers = section.Answers(ask_answers(program, options))
    pictures, absent = drawn(cases, options)
    question = one_line(options.question or f"What does this schedule do to the ozone layer, and when is the ozone "
                                            f"column back at its value of {options.benchmark}?")
    day = time.strftime("%Y-%m-%d", time.gmtime(int(os.environ.get("SOURCE_DATE_EPOCH", time.time()))))
    contents = [("answers", "Answers"), ("schedule", "Schedule")] + ([("lines", "What each line costs")] if told else
                                                                     []) + \
        [("figures", "Figures"), ("sure", "How sure"), ("caution", "Caution"), ("sources", "Sources"),
         ("again", "To compute it again"), ("all", "Every answer")]
    body = [f"<h1>{text(cases[0].title)}</h1>\n<p class=\"meta\">Report of {text(os.path.basename(options.file))}"
            + (f" against {text(os.path.basename(options.against))}" if options.against else "")
            + f", {text(cases[0].source)}, written {day}</p>\n",
            "<nav class=\"meta\" aria-label=\"Contents\">" + " · ".join(f'<a href="#{key}">{name}</a>'
                                                                       for key, name in contents) + "</nav>\n",
            f"<h2 id=\"question\">Question</h2>\n<p>{text(question)}</p>\n",
            section.short_answers(answers, cases),
            f"<p class=\"small\">{text(cases[0].attributes.get('caution', ''))}</p>\n",
            section.section_answers(answers, cases),
            section.section_schedule(cases, answers, options.schedule)]
    if told:
        body.append(section.section_apportion(told, options.apportion, cases[0], bars, 1))
    body += [section_figures(cases, pictures, absent, 2 if told else 1), section.section_sure(answers, cases, status),
             section.section_caution(cases[0]), section.section_sources(cases[0]),
             section.section_again(cases), section.appendix_answers(answers)]
    return page(cases[0].title, "<main>\n" + "".join(body) + "</main>\n")


def parse():
    parser = argparse.ArgumentParser(description=__doc__.split("\n\n", maxsplit=1)[0])
    parser.add_argument("file", metavar="FILE.nc", help="file of skymend project")
    parser.add_argument("-o", "--output", metavar="REPORT.html", required=True)
    parser.add_argument("--against", metavar="REF.nc", help="the case without what is in question")
    parser.add_argument("--apportion", metavar="FILE.json", help="what skymend apportion --json wrote of the case")
    parser.add_argument("--question", metavar="TEXT", help="the question that the report answers")
    parser.add_argument("--schedule", metavar="FILE.csv", nargs="+", default=[],
                        help="files of the schedule, to be shown with their heads and rows")
    parser.add_argument("--benchmark", metavar="YEAR", type=int, default=1980, help="benchmark year (1980)")
    parser.add_argument("--year", metavar="YEAR", type=int,
                        help="year of the loss by family (that in which the columns of the two files differ most, or "
                             "of the lowest column)")
    parser.add_argument("--validation", metavar="FILE.csv",
                        help="validation status (validation-status.csv of the data)")
    options = parser.parse_args()
    if not options.output.lower().endswith((".html", ".htm")):
        parser.error(f"{options.output}: the report's name ends in .html")
    return options


def main():
    options = parse()
    name = os.path.basename(sys.argv[0])
    try:
        write_whole(options.output, report(options).encode())
    except Wrong as error:
        print(f"{name}: {error}", file=sys.stderr)
        return 2
    except Unwritten as error:
        print(f"{name}: {error}", file=sys.stderr)
        return 4
    except Failed as error:
        return error.code
    return 0


if __name__ == "__main__":
    sys.exit(main())

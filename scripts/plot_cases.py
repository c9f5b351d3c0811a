#!/usr/bin/python3
"""Plot Skymend files, one or several laid over each other; the pages of README.md, "Seeing it".

The year of return is found as `skymend answers` finds it unsmoothed. Exit code 2: a file or the request is wrong; 4:
the picture could not be written.
"""

import argparse
import os
import sys

from skymend_files import Unwritten, Wrong, read_case, write_whole

FORMS = ("png", "svg", "pdf")


def parse():
    parser = argparse.ArgumentParser(description=__doc__.split("\n\n", maxsplit=1)[0])
    parser.add_argument("files", metavar="FILE.nc", nargs="+", help="files of skymend project")
    parser.add_argument("-o", "--output", metavar="FILE", required=True, help="its name ends in .png, .svg or .pdf")
    parser.add_argument("--figure", default="page", metavar="KIND",
                        choices=("page", "column", "ozone", "anomaly", "gases", "ultraviolet", "loss", "emissions"),
                        help="page (the default: the main ones together), column, ozone, anomaly, gases, "
                             "ultraviolet, loss or emissions")
    parser.add_argument("--benchmark", metavar="YEAR", type=int, default=1980, help="benchmark year (1980)")
    parser.add_argument("--year", metavar="YEAR", type=int,
                        help="year of the loss by family (that of the first file's lowest column)")
    parser.add_argument("--quantity", choices=("density", "fraction"), default="density",
                        help="of --figure ozone: number density (the default) or mole fraction")
    parser.add_argument("--label", metavar="TEXT", action="append", default=[],
                        help="what to call a file in place of its title; once for each file, in their order")
    options = parser.parse_args()
    if not options.output.lower().endswith(tuple("." + form for form in FORMS)):
        parser.error(f"{options.output}: the picture's name ends in .png, .svg or .pdf")
    if options.label and len(options.label) != len(options.files):
        parser.error(f"{len(options.label)} --label for {len(options.files)} files; give one for each or none")
    return options


def main():
    options = parse()
    name = os.path.basename(sys.argv[0])
    try:
        import matplotlib.pyplot as plt
        import skymend_figures
        import skymend_sheet
        cases = [read_case(path, label) for path, label
                 in zip(options.files, options.label or [None] * len(options.files))]
        with plt.rc_context(skymend_sheet.STYLE):
            figure = skymend_figures.draw(options.figure, cases, options.benchmark, options.year, options.quantity)
            form = options.output.lower().rsplit(".", 1)[1]
            content = skymend_sheet.picture(figure, form, f"{options.figure}: {cases[0].title}")
        write_whole(options.output, content)
    except Wrong as error:
        print(f"{name}: {error}", file=sys.stderr)
        return 2
    except Unwritten as error:
        print(f"{name}: {error}", file=sys.stderr)
        return 4
    return 0


if __name__ == "__main__":
    sys.exit(main())

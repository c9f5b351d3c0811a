#!/usr/bin/python3
"""Write input/data/validation-status.csv: how the baseline stood against published values when last asked.

    scripts/make_validation_status.py VALIDATION.csv -o STATUS.csv --program "Skymend 0.1.0"     (make validate)

VALIDATION.csv is what build/tests/validate --csv wrote. The report of a run (scripts/make_report.py) tells from the table
what was compared, what was out of its range and why. SOURCE_DATE_EPOCH sets the date. Exit code 2: an input is wrong;
4: the table could not be written.
"""

import argparse
import csv
import io
import os
import sys
import time

from skymend_files import Unwritten, Wrong, write_whole

PUBLISHED = ("tests/published-values.csv", "tests/published-more.csv")
COLUMNS = ("kind", "id", "quantity", "conditions", "value", "low", "high", "unit", "verdict", "reason")


def rows_of(path):
    try:
        with open(path, encoding="utf-8", newline="") as source:
            rows = list(csv.DictReader(source))
    except OSError as error:
        raise Wrong(f"{path}: {error.strerror}") from error
    if not rows or "id" not in rows[0]:
        raise Wrong(f"{path} is no table with a column id")
    return rows


def status(validation, program):
    """The table as text."""
    published = {row["id"]: row for path in PUBLISHED for row in rows_of(path)}
    out = io.StringIO()
    day = time.gmtime(int(os.environ.get("SOURCE_DATE_EPOCH", time.time())))
    out.write("# quantity: the baseline beside published values, and its numerical errors\n# unit: in each row\n"
              "# source: of the published values: tests/published-values.csv, tests/published-more.csv\n"
              f"# date: {time.strftime('%Y-%m-%d', day)}\n# program: {program}\n# made by: make validate\n")
    table = csv.writer(out, lineterminator="\n")
    table.writerow(COLUMNS)
    seen = set()
    for row in rows_of(validation):
        missing = {"value", "low", "high", "unit", "verdict", "reason"} - {k for k, v in row.items() if v is not None}
        if missing:
            raise Wrong(f"{validation}: row {row['id']} lacks {', '.join(sorted(missing))}")
        numerics = row["id"].startswith("numerics-")
        if not numerics and row["id"] not in published:
            raise Wrong(f"{validation}: row {row['id']} is in none of {', '.join(PUBLISHED)}")
        about = published.get(row["id"], {"quantity": "", "conditions": row.get("note", "")})
        seen.add(row["id"])
        table.writerow(["numerics" if numerics else "published", row["id"], about["quantity"], about["conditions"]] +
                       [row[name] for name in COLUMNS[4:]])
    if set(published) - seen:
        raise Wrong(f"{validation} lacks {', '.join(sorted(set(published) - seen)[:5])}; run make validate to its end")
    return out.getvalue()


def main():
    parser = argparse.ArgumentParser(description=__doc__.split("\n\n", maxsplit=1)[0])
    parser.add_argument("validation", metavar="VALIDATION.csv")
    parser.add_argument("-o", "--output", metavar="STATUS.csv", required=True)
    parser.add_argument("--program", metavar="TEXT", required=True, help="name and version of the program asked")
    options = parser.parse_args()
    try:
        write_whole(options.output, status(options.validation, options.program).encode())
    except Wrong as error:
        print(f"make_validation_status.py: {error}", file=sys.stderr)
        return 2
    except Unwritten as error:
        print(f"make_validation_status.py: {error}", file=sys.stderr)
        return 4
    return 0


if __name__ == "__main__":
    sys.exit(main())

#!/bin/sh
# scripts/make_report.py: one page that loads nothing, with the answers of `skymend answers`, figures, lines, validation
# status and sources; that text of files stays text; what is refused.
#
# Environment: see checks.sh.
# Prints "ok NAME" or "not ok NAME" per check. The runs are short and coarse, schedule and apportionment are invented;
# expected values are those of the files and of `skymend answers`.

. "$(dirname "$0")/checks.sh"
scripts=$(cd "$tests/../scripts" && pwd)
MPLCONFIGDIR=$TEST_DIR/matplotlib
export MPLCONFIGDIR PYTHONDONTWRITEBYTECODE=1
touch before after output errors said

report() {
    "$python" "$scripts/make_report.py" "$@" >output 2>errors </dev/null
}

# refused NAME CODE PIECE OPTION...: that exit code, the piece in the last line on standard error, nothing written
refused() {
    name=$1
    code=$2
    piece=$3
    shift 3
    ls -A >before
    report "$@"
    status=$?
    ls -A >after
    truth "refused: $name" eval '[ $status -eq "$code" ] && tail -n 1 errors | grep -qF -e "$piece" && cmp -s before after'
}

cat >late.csv <<'END'
# title: INVENTED example <script>alert(1)</script>
# source: invented
year,gas,kind,amount,unit,line
1985-1992,CFC-11,emission,400,kt,"INVENTED </td><script>alert(2)</script> ""foam"" & $x_1$"
1985-1992,CFC-11,emission,50,kt,INVENTED leakage
1985-1992,NO,emission,3,kt N per km,INVENTED - fleet,10,12
END
sed -i 's/^year,gas,kind,amount,unit,line$/&,from_km,to_km/; s/\$x_1\$"$/&,,/; s/leakage$/&,,/' late.csv
cat >base.cfg <<'END'
title = "Baseline, coarse";
years = { first = 1979; last = 1992; };
grid = { top_km = 80; spacing_km = 4; };
day = { mode = "mean"; };
END
sed 's/Baseline, coarse/INVENTED <img src=\\"http:\/\/example.org\/x\\"> late/' base.cfg >late.cfg
echo 'files = { schedule_layers = [ "late.csv" ]; };' >>late.cfg
"$SKYMEND" project base.cfg -o base.nc --quiet && "$SKYMEND" project late.cfg -o late.nc --quiet
truth "two projections" [ $? -eq 0 ]
"$SKYMEND" answers late.nc --against base.nc --json answers.json --quiet
truth "answers" [ $? -eq 0 ]

cat >status.csv <<'END'
# date: 2001-02-03
# program: Made-up 9
kind,id,quantity,conditions,value,low,high,unit,verdict,reason
published,a,height of a <hill>,in spring,12,1,10,m,out,It grew & grew
published,b,depth,,5,1,10,m,in,
published,c,width,,,1,10,m,later,
numerics,numerics-x,,halved step,0.5,,0.1,DU,out,Too coarse
numerics,numerics-y,,tolerance,0.05,,0.1,DU,in,
END
"$python" - <<'PY'
import json
import netCDF4
import numpy as np
with netCDF4.Dataset("late.nc") as data:
    column = [float(v) for v in data["ozone_column"][:]]
item = {"line": "INVENTED <b>x</b>", "gas": None, "emitted_t": 3.2e6, "first_year": 1985, "lost_DU_years": 1.25,
        "lost_error": 0.03, "percent_of_all": 62.5, "largest_DU": 0.4, "largest_error": 0.01, "largest_year": 1992,
        "last_year_DU": 0.4, "last_year_error": 0.01, "delay_kind": "at least", "delay_months": 7.5,
        "delay_error": None, "return_year": None}
all_ = dict(item, lost_DU_years=2.0)
told = {"title": "t", "by": "line", "first_year": 1979, "column_DU": column, "not_apportioned": ["CFC-12"],
        "items": [item, dict(item, line="INVENTED two", lost_DU_years=0.7, lost_error=None)], "all": all_,
        "sum_DU_years": 1.95, "sum_error": 0.05, "remainder_DU_years": 0.05, "remainder_error": 0.06,
        "remainder_percent_of_all": 2.5}
json.dump(told, open("runs.json", "w"))
quick = {"title": "t", "by": "gas", "first_year": 1979, "column_DU": [v + 1.0 for v in column], "not_apportioned": [],
         "derivatives_of_years": [1985, 1988, 1992], "sum_all_time_DU_years": 6.5, "sum_all_time_error": 0.1,
         "sum_within_DU_years": 2.0,
         "items": [{"line": None, "gas": "CFC-11", "emitted_t": 3.6e6, "first_year": 1985, "all_time_DU_years": 6.5,
                    "all_time_error": 0.1, "within_DU_years": 2.0}]}
json.dump(quick, open("quick.json", "w"))
json.dump({"items": [{}]}, open("wrong.json", "w"))
PY

report late.nc --against base.nc --apportion runs.json --schedule late.csv --validation status.csv \
    --question 'What do <i>leaks</i> cost?' -o full.html
status=$?
truth "a comparison" eval '[ $status -eq 0 ] && [ ! -s errors ]'
report base.nc -o plain.html
status=$?
truth "one run" eval '[ $status -eq 0 ] && [ ! -s errors ]'
report late.nc --apportion quick.json --validation status.csv -o quick.html
truth "with derivatives, of another run" [ $? -eq 0 ]
mkdir bare && cp "$SKYMEND_DATA"/*.csv bare && rm bare/validation-status.csv
SKYMEND_DATA=$TEST_DIR/bare "$python" "$scripts/make_report.py" base.nc -o bare.html >output 2>errors
truth "data without validation status: it says so" eval 'grep -q "No validation status lies with" bare.html'
rm -rf bare

report base.nc --benchmark 2050 -o unknown.html
truth "a benchmark outside the file: it says so, and the anomaly is not drawn" eval '
    grep -q "No change against 2050 and no year of return</strong>: the file does not cover" unknown.html &&
    grep -q "Not drawn: ozone by altitude and time.*: .*no change against 2050" unknown.html'

cp plain.html kept.html
refused "a file that is not there" 2 "none.nc" none.nc -o x.html
refused "a file that is no NetCDF" 2 "late.csv" late.csv -o x.html
refused "a reference that is not there" 2 "none.nc" base.nc --against none.nc -o x.html
refused "another form" 2 "ends in .html" base.nc -o x.pdf
refused "an apportionment that is not there" 2 "none.json" late.nc --apportion none.json -o x.html
refused "an apportionment that is no JSON" 2 "is no JSON" late.nc --apportion late.csv -o x.html
refused "an apportionment of another kind" 2 "not what skymend apportion" late.nc --apportion wrong.json -o x.html
refused "a schedule that is not there" 2 "none.csv" late.nc --schedule none.csv -o x.html
refused "a schedule that is none" 2 "is no schedule" late.nc --schedule status.csv -o x.html
refused "a validation status that is none" 2 "make validate" late.nc --validation late.csv -o x.html
refused "a bad file over a good report" 2 "late.csv" late.csv -o plain.html
truth "which stays as it was" cmp plain.html kept.html
refused "a folder that is not there" 4 "cannot write none/x.html" base.nc -o none/x.html
SKYMEND=$TEST_DIR/none
refused "a program that is not there" 2 "SKYMEND names" base.nc -o x.html
printf '#!/bin/sh\necho "skymend: it failed" >&2\nexit 3\n' >failing
chmod +x failing
SKYMEND=$TEST_DIR/failing
refused "a program that fails: its code and message" 3 "skymend: it failed" base.nc -o x.html

cat >look.py <<'PY'
"""What the pages hold."""
import csv
import hashlib
import html
import html.parser
import json
import os
import re
import xml.etree.ElementTree as ET

import netCDF4
import numpy as np

VOID = {"meta", "br", "img", "link", "hr"}


def check(name, passed, told=""):
    print(("ok " if passed else "not ok ") + name)
    if not passed:
        print(f"# {str(told)[:400]}")


class Page(html.parser.HTMLParser):
    """Elements, their nesting, the text, the data elements by row."""

    def __init__(self, path):
        super().__init__(convert_charrefs=True)
        self.source = open(path, encoding="utf-8").read()
        self.open, self.faults, self.tags, self.words, self.rows, self.row = [], [], [], [], [], None
        self.feed(self.source)
        self.close()
        self.text = re.sub(r"\s+", " ", "".join(self.words))

    def handle_starttag(self, tag, attrs):
        self.tags.append((tag, dict(attrs)))
        if tag not in VOID:
            self.open.append(tag)
        if tag == "tr":
            self.row = {"data": [], "text": ""}
            self.rows.append(self.row)
        if tag == "data" and self.row is not None:
            self.row["data"].append(float(dict(attrs)["value"]))

    def handle_startendtag(self, tag, attrs):
        self.tags.append((tag, dict(attrs)))

    def handle_endtag(self, tag):
        if not self.open or self.open.pop() != tag:
            self.faults.append(tag)
        if tag == "tr":
            self.row = None

    def handle_data(self, data):
        self.words.append(data)
        if self.row is not None:
            self.row["text"] += data

    def row_of(self, begin):
        return next((row for row in self.rows if row["text"].startswith(begin)), {"data": [], "text": ""})


pages = {name: Page(name + ".html") for name in ("full", "plain", "quick")}
for name, page in pages.items():
    check(f"{name}: elements are closed in order", not page.faults and not page.open, page.faults[:3])
    ids = [attrs["id"] for _, attrs in page.tags if "id" in attrs]
    check(f"{name}: no id twice", len(ids) == len(set(ids)) and len(ids) > 100, len(ids))
    links = [value for _, attrs in page.tags for key, value in attrs.items()
             if key in ("src", "href", "xlink:href", "data", "srcset", "action", "poster")]
    check(f"{name}: nothing is loaded", links and all(v.startswith(("#", "data:image/png;base64,")) for v in links),
          [v[:60] for v in links if not v.startswith(("#", "data:"))])
    check(f"{name}: links lead somewhere", all(v[1:] in ids for v in links if v.startswith("#")),
          [v for v in links if v.startswith("#") and v[1:] not in ids][:3])
    clips = re.findall(r"url\(([^)]*)\)", page.source)
    check(f"{name}: styles refer to the page alone", clips and all(v[0] == "#" and v[1:] in ids for v in clips),
          [v for v in clips if v[1:] not in ids][:3])
    check(f"{name}: no script, frame, style sheet or picture from elsewhere",
          not {"script", "link", "iframe", "object", "embed", "img"} & {tag for tag, _ in page.tags} and
          "@import" not in page.source)
    check(f"{name}: no attribute runs code", not [key for _, attrs in page.tags for key in attrs
                                                  if key.startswith("on")])
    pictures = re.findall(r"<svg.*?</svg>", page.source, re.DOTALL)
    for picture in pictures:
        ET.fromstring(picture)  # raises where it is not well-formed
    named = [attrs for tag, attrs in page.tags if tag == "svg"]
    check(f"{name}: every figure has a role and a name", len(named) == len(pictures) >= 6 and
          all(attrs.get("role") == "img" and len(attrs.get("aria-label", "")) > 10 for attrs in named))
    check(f"{name}: tables have headers of columns and rows and a caption",
          page.source.count("<table") == page.source.count("<caption>") and
          all(attrs.get("scope") in ("col", "row") for tag, attrs in page.tags if tag == "th"))
    check(f"{name}: made for paper", "@page" in page.source and "@media print" in page.source)
    check(f"{name}: defers to the competent authority and is no guide to exposure",
          "defer to the competent authority" in page.text and "no guide to personal exposure" in page.text)

full = pages["full"]
answers = json.load(open("answers.json", encoding="utf-8"))["answers"]
lost = [key for key, answer in answers.items() if answer["value"] is not None and
        full.row_of(key + format(answer["value"], ".9g").replace("-", "\u2212"))["data"] != [answer["value"]]]
check("every answer, to the last digit", len(answers) > 50 and not lost, lost[:5])
check("their methods", all(answer["method"] in full.text for answer in answers.values()))
remarks = re.findall("<li>(.*?)</li>", full.source[full.source.index("<h3>Remarks</h3>"):])
lost = [key for key, answer in answers.items() if answer["note"] and not any(
    row["text"].startswith(key + ("–" if answer["value"] is None else format(answer["value"], ".9g").replace(
        "-", "\u2212"))) and row["text"].endswith(str(remarks.index(html.escape(answer["note"])) + 1))
    for row in full.rows)]
check("their remarks", not lost and any(answer["note"] for answer in answers.values()), lost[:5])
row = full.row_of("ozone column, DU")
check("the comparison", row["data"][0] == answers["ozone_column_integrated_depletion"]["value"], row)
lowest = answers["ozone_column_lowest"]
digits = max(1 - int(np.floor(np.log10(lowest["numerical_error"]))), 0)
check("value and error, digits by the error",
      f"{lowest['value']:.{digits}f} ± {lowest['numerical_error']:.{digits}f}" in full.text, digits)
check("where the errors come from", json.load(open("answers.json", encoding="utf-8"))["errors"] in full.text)

# text of files stays text
check("the question as it was put", "What do <i>leaks</i> cost?" in full.text)
check("a title with a tag", '<img src="http://example.org/x"> late' in full.text)
check("a line with tags", 'INVENTED </td><script>alert(2)</script> "foam" & $x_1$' in full.text)
check("a comment with tags", "INVENTED example <script>alert(1)</script>" in full.text)
check("an item with tags", "INVENTED <b>x</b>" in full.text)

# lines: 400 and 50 Gg in each of eight years; 3 kt of N for each of 2 km
check("what a line gives off", np.allclose(full.row_of("INVENTED leakage")["data"][:2], [400.0, 50.0], rtol=1e-3),
      full.row_of("INVENTED leakage"))
# CFC-11 has a potential of 1 by the treaty (annex A) and by definition
check("ODP-tonnes of a line", np.allclose(full.row_of("INVENTED leakage")["data"][2:], 4e5, rtol=1e-3),
      full.row_of("INVENTED leakage"))
check("ODP-tonnes of all", full.row_of("the same less the reference")["data"] == [
    answers[f"odp_emission_{kind}_difference_total"]["value"] for kind in ("treaty", "own")],
      full.row_of("the same less the reference"))
check("the years of a line", "1985–1992" in full.row_of("INVENTED leakage")["text"], full.row_of("INVENTED leakage"))
check("mass of an element", "NO, mass of N" in full.row_of("INVENTED - fleet")["text"] and
      np.allclose(full.row_of("INVENTED - fleet")["data"][:2], [48.0, 6.0], rtol=1e-3), full.row_of("INVENTED - fleet"))
check("what drives a gas", "its abundance, from 1985 on emissions, 2 lines" in full.row_of("CFC-11")["text"] and
      "its abundance" in full.row_of("CFC-12")["text"], full.row_of("CFC-11"))
late = netCDF4.Dataset("late.nc")
check("its mole fractions", np.allclose(full.row_of("CFC-11")["data"][:3],
                                        1e12 * np.ma.getdata(late["CFC_11"][:, 0])[[0, 1, -1]], rtol=1e-9),
      full.row_of("CFC-11"))
check("the file of the schedule", hashlib.sha256(open("late.csv", "rb").read()).hexdigest() in full.text)
check("the layer of the schedule", "late.csv" in full.text and "schedule_layers" in full.text)

# validation status
check("validation status, counted", "1 in range, 1 out, 1 not computed by the program, for the program's baseline, "
      "Made-up 9, 2001-02-03" in full.text and full.text.count("1 in range, 1 out") == 2)
check("why a row is out", "It grew & grew" in full.text and "Too coarse" in full.text and
      "height of a <hill>, in spring" in full.text)
own = os.path.join(os.environ["SKYMEND_DATA"], "validation-status.csv")
rows = list(csv.DictReader(line for line in open(own, encoding="utf-8", newline="") if not line.startswith("#")))
count = {v: sum(r["verdict"] == v and r["kind"] == "published" for r in rows) for v in ("in", "out")}
check("that of the data", f"{count['in']} in range, {count['out']} out" in pages["plain"].text and count["in"] > 50 and
      all(" ".join(r["reason"].split()) in pages["plain"].text for r in rows if r["verdict"] == "out"), count)

# apportionment
check("what a line costs", full.row_of("INVENTED <b>x</b>")["data"][1] == 1.25 and
      "at least 7.5" in full.row_of("INVENTED <b>x</b>")["text"], full.row_of("INVENTED <b>x</b>"))
check("sum and remainder", full.row_of("sum")["data"] == [1.95] and
      full.row_of("remainder")["data"] == [0.05, 2.5], full.row_of("remainder"))
check("what is not taken apart", "driven by their abundance: CFC-12." in full.text)
check("a bar for each", 'id="bars-' in full.source and "Bar chart" in full.source)
check("by derivative", pages["quick"].row_of("CFC-11")["text"] and "for all time" in pages["quick"].text)
check("an apportionment of another run is noticed", "is not that of the file" in pages["quick"].text and
      "is not that of the file" not in full.text)

# sources
check("sources", all(re.sub(r"^\S*/", "", line.split(": ", 1)[-1]).strip()[:80] in full.text
                     for line in late.references.splitlines() if len(line) > 30), "")
check("no folder of this machine", os.environ["SKYMEND_DATA"] not in full.text)
check("the resolved case", "outer_step_days" in full.text and 'schedule = "baseline-schedule.csv";' in full.text)
PY
"$python" look.py
truth "the look ran to its end" [ $? -eq 0 ]

if command -v chromium >/dev/null; then
    # as root it starts without its sandbox only; the page is the project's own
    chrome() {
        HOME=$TEST_DIR timeout 180 chromium --headless --no-sandbox --disable-gpu --disable-dev-shm-usage \
            --user-data-dir="$TEST_DIR/chrome" "$@" 2>errors
    }
    chrome --dump-dom "file://$TEST_DIR/full.html" >dom.html
    truth "Chromium: as many figures and tables as the page has" eval '
        [ "$(grep -o "<svg" dom.html | wc -l)" -eq "$(grep -o "<svg" full.html | wc -l)" ] &&
        [ "$(grep -o "<table" dom.html | wc -l)" -eq "$(grep -o "<table" full.html | wc -l)" ] &&
        ! grep -q "<script" dom.html'
    chrome --print-to-pdf=paper.pdf --no-pdf-header-footer "file://$TEST_DIR/full.html" >output
    truth "Chromium: it goes onto paper, 8 to 25 pages" eval '
        pages=$(grep -ac "/Type /Page$" paper.pdf); [ "$pages" -ge 8 ] && [ "$pages" -le 25 ]'
else
    echo "skip the report in Chromium, which is not installed (scripts/install-packages.sh look)"
fi
[ "$failures" -eq 0 ]

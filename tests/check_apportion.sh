#!/bin/sh
# skymend apportion from the command line: what it prints and writes, that its forms say the same, what it
# refuses, an interrupt.
#
# Environment: see checks.sh.
# Prints "ok NAME" or "not ok NAME" per check. Every expected text is this program's own contract (README.md); the schedule
# is INVENTED.

. "$(dirname "$0")/checks.sh"
verb=apportion

cat >lines.csv <<'END'
# source: INVENTED
year,gas,kind,amount,unit,line
1990-1993,CFC-11,emission,300,kt,"banks, foam and ""other"""
1994-2000,CFC-11,emission,20,kt,"banks, foam and ""other"""
1990-2000,CFC-12,emission,30,kt,refrigeration
1990-1993,CFC-12,emission,300,kt,refrigeration late
1990-2000,CCl4,emission,0,kt,idle
END
cat >aloft.csv <<'END'
# source: INVENTED
year,gas,kind,amount,unit,line,from_km,to_km
1992-1997,HCl,emission,1,kt,rockets,20,30
END
cat >coarse.cfg <<'END'
title = "a \"coarse\" case \\ with signs that JSON must escape";
years = { first = 1989; last = 1997; };
grid = { top_km = 60; spacing_km = 4; };
files = { schedule_layers = [ "lines.csv", "aloft.csv" ]; };
END

refused "unknown option" "did you mean --benchmark?" coarse.cfg --benchmrak 1990
refused "no such way" "none of line, gas and both" coarse.cfg --by sector
refused "part of nothing" "outside 0.0001 to 100" coarse.cfg --part 0
refused "quick and a part" "leave out --part" coarse.cfg --quick --part 10
refused "quick and no error" "leave out --no-error" coarse.cfg --quick --no-error
refused "a label to keep that is none" 'did you mean "refrigeration"?' coarse.cfg --keep refrigeratoin
refused "two cases" "name one" coarse.cfg other.cfg
refused "two outputs of one name" "give each a file of its own" coarse.cfg --csv a --json a
printf 'x\n' >there.csv
refused "every line kept" "--keep: no other line gives anything off from 1989 to 1997" coarse.cfg --keep refrigeration \
    --keep "refrigeration late" --keep rockets --keep 'banks, foam and "other"'
refused "keeps a file that is there" "exists already" coarse.cfg --csv there.csv
printf 'years = { first = 1980; last = 1981; };\n' >none.cfg
refused "a case without emissions" "nothing to apportion" none.cfg
printf 'sun = { kind = "season"; latitude_deg = 45; };\n' | cat coarse.cfg - >season.cfg
refused "the quick way under a sun with seasons" "never at rest" season.cfg --quick --quiet

"$SKYMEND" apportion --help >output 2>errors
truth "help" eval '[ $? -eq 0 ] && grep -q "usage: skymend apportion" output && [ ! -s errors ]'

"$SKYMEND" apportion coarse.cfg --by both --benchmark 1990 --csv a.csv --json a.json >output 2>errors
status=$?
truth "it succeeds" [ "$status" -eq 0 ]
truth "prints the table" grep -q '^  refrigeration, CFC-12 ' output
truth "says how far the sum is from the whole" grep -q '^  remainder (all less sum) ' output
truth "names what it cannot take apart" grep -q 'Driven by their abundance, .*: .*CH4, N2O' output
truth "no line is wider than 120 characters but that of the names" \
    awk 'length > 120 && !/Driven by/ { exit 1 }' output
truth "JSON for json.tool" "$python" -m json.tool a.json

cat >compare.py <<'PY'
import csv
import json
import math

with open("a.json", encoding="utf-8") as source:
    data = json.load(source)
with open("a.csv", encoding="utf-8", newline="") as source:
    rows = list(csv.DictReader(line for line in source if not line.startswith("#")))
items = [r for r in rows if r["row"] == "item"]
assert data["title"] == 'a "coarse" case \\ with signs that JSON must escape', data["title"]
assert [(i["line"], i["gas"]) for i in data["items"]] == [(r["line"], r["gas"]) for r in items] and len(items) == 5
assert 'banks, foam and "other"' in [i["line"] for i in data["items"]]
number = lambda text: None if text == "" else float(text)
for row, item in zip(items + [r for r in rows if r["row"] == "all"], data["items"] + [data["all"]]):
    for column, key in (("lost_DU_years", "lost_DU_years"), ("lost_error", "lost_error"), ("largest_DU", "largest_DU"),
                        ("largest_year", "largest_year"), ("last_year_DU", "last_year_DU"),
                        ("delay_months", "delay_months"), ("return_year", "return_year")):
        assert number(row[column]) == item[key], (row, key)
    # the definition: without it less the whole, summed over the years; nine digits are written
    difference = [a - b for a, b in zip(item["column_without_DU"], data["column_DU"])]
    assert len(difference) == 9 and abs(sum(difference) - item["lost_DU_years"]) < 2e-5
    assert max(difference, key=abs) == 0 or abs(max(difference, key=abs) - item["largest_DU"]) < 2e-6
    assert difference[0] == 0  # before any line begins
by_label = {i["line"]: i for i in data["items"]}
assert by_label["idle"]["lost_DU_years"] == 0 and by_label["idle"]["first_year"] is None
assert by_label["rockets"]["lost_DU_years"] > 0 and by_label["rockets"]["first_year"] == 1992
assert math.isclose(by_label["refrigeration"]["emitted_t"], 240e3) and by_label["refrigeration"]["lost_error"] > 0
total = sum(i["lost_DU_years"] for i in data["items"])
assert math.isclose(total, data["sum_DU_years"], abs_tol=1e-6)
assert math.isclose(data["all"]["lost_DU_years"] - total, data["remainder_DU_years"], abs_tol=1e-6)
assert "CFC-11" not in data["not_apportioned"] and "CH4" in data["not_apportioned"] and "HCl" not in data["not_apportioned"]
PY
truth "CSV and JSON agree and keep to the definition" "$python" compare.py

sed "s/last = 1997/last = 1993/" coarse.cfg >short.cfg
for threads in 1 3; do
    "$SKYMEND" apportion short.cfg --no-error --threads $threads --quiet --json threads$threads.json >output 2>errors
done
truth "quiet" eval '[ ! -s output ] && [ ! -s errors ]'
truth "the same bits for any number of threads" cmp threads1.json threads3.json
truth "without errors there are none" "$python" -c '
import json
d = json.load(open("threads1.json"))
assert all(i["lost_error"] is None for i in d["items"]) and d["sum_error"] is None'

# with all but one label kept, all items off is that item off: the same run
"$SKYMEND" apportion short.cfg --no-error --quiet --json one.json --keep idle --keep refrigeration \
    --keep "refrigeration late" --keep 'banks, foam and "other"' >output 2>errors
truth "lines to keep are in every run" "$python" -c '
import json
d = json.load(open("one.json"))
whole = json.load(open("threads1.json"))
assert [i["line"] for i in d["items"]] == ["rockets"] and d["lines_kept"] == 4
assert d["all"]["column_without_DU"] == d["items"][0]["column_without_DU"] and d["remainder_DU_years"] == 0
assert d["column_DU"] == whole["column_DU"]
assert d["items"][0]["column_without_DU"] == [i for i in whole["items"] if i["line"] == "rockets"][0]["column_without_DU"]'

"$SKYMEND" apportion coarse.cfg --quick --csv q.csv --json q.json >output 2>errors
truth "the quick way" eval '[ $? -eq 0 ] && grep -q "all time" output && "$python" -m json.tool q.json'
truth "the quick way: forms agree, nothing for what is given off aloft" "$python" -c '
import csv, json
rows = {r["line"]: r for r in csv.DictReader(l for l in open("q.csv") if not l.startswith("#")) if r["row"] == "item"}
items = {i["line"]: i for i in json.load(open("q.json"))["items"]}
assert set(rows) == set(items) and rows["rockets"]["all_time_DU_years"] == "" and items["rockets"]["all_time_DU_years"] is None
for line in set(rows) - {"rockets"}:
    assert float(rows[line]["all_time_DU_years"]) == items[line]["all_time_DU_years"], line
    assert 0 <= items[line]["within_DU_years"] <= items[line]["all_time_DU_years"], line
assert items["refrigeration"]["within_DU_years"] > 0'

# ---- an interrupt ----

"$SKYMEND" apportion coarse.cfg --csv stopped.csv --quiet >output 2>errors &
child=$!
sleep 2
kill -INT "$child"
wait "$child"
status=$?
truth "an interrupt ends it with 130 and leaves nothing" eval '[ $status -eq 130 ] && [ ! -e stopped.csv ] && grep -q interrupted errors'

exit $((failures > 0))
